"""Run a study: from a checked study to its record (layer 8)."""

from __future__ import annotations

import datetime
import platform
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np

import benchmark
from benchmark import constants
from benchmark.decide.assess import RequirementResult, assess
from benchmark.decide.closed_form import closed_form_differences, delay_factor
from benchmark.decide.compare import Comparison, Outcome, choice_of
from benchmark.decide.curves import Envelope, Swept, advantage_against_time, crossings, pair_outcomes, scan_nodes, swept
from benchmark.decide.elasticity import elasticities
from benchmark.decide.error_bands import advantage_band, band_warnings, side_bands
from benchmark.decide.flips import with_flips
from benchmark.decide.moves import InputMove, move_inputs
from benchmark.decide.notices import result_warnings
from benchmark.decide.policies import DIAGNOSTIC, own_limit
from benchmark.decide.requirements import functional_margins
from benchmark.decide.self_checks import self_checks
from benchmark.decide.steps import node_steps
from benchmark.decide.verdict import Verdict, judge
from benchmark.errors import InputRefused, Problem
from benchmark.evaluate.anchors import anchor_results
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.search import SideRun
from benchmark.record.criteria import criteria_row
from benchmark.record.draws import draw_rows
from benchmark.record.findings import findings
from benchmark.record.ledger import ledger_rows, option_rows, technologies
from benchmark.record.outlook import outlook_rows
from benchmark.record.results import (
    clean,
    envelope_rows,
    error_band_row,
    outcome_row,
    requirement_rows,
    swept_rows,
    verdict_row,
)
from benchmark.record.statements import CAUTIONS, NOT_MODELLED, conventions
from benchmark.record.strength import ladder_rows, mitigation_conventions, robustness_row, side_choices
from benchmark.record.topology import circuit_assumptions, same_netlist_rows, side_circuit, topology_convention
from benchmark.sets.library import Library
from benchmark.sets.study import Choice, DrawSettings, Study

__all__ = ["RECORD_SCHEMA", "Progress", "run_study"]

RECORD_SCHEMA = 1
#: told the name of each step and the share done
Progress = Callable[[str, float], None]


def _silent(step: str, share: float) -> None:
    return None


@dataclass(frozen=True)
class _Primary:
    """The primary policy at the headline pair."""

    comparison: Comparison
    outcome: Outcome
    requirements: list[RequirementResult]
    curves: dict[str, list[tuple[SideRun, Swept]]]
    relaxed: Outcome | None  # with the hard requirements set aside, when the candidate has no permitted point

    @property
    def frozen(self) -> dict[str, Choice]:
        """What each side chose at the best estimate; its frozen parts are kept wherever inputs are moved."""
        return self.comparison.frozen_choices(self.outcome)


def _refuse_free_operations(study: Study, outcome: Outcome) -> None:
    """Refuse a study in which an operation costs a side no energy at all: nothing is charged, and no ratio has a sense.

    Raises
    ------
    InputRefused
        Naming every such side.
    """
    free = [side.id for side in (outcome.candidate, *outcome.contenders) if side.found[0] and side.energy[0] == 0.0]
    if free:
        what, hint = "one operation costs no energy, so nothing can be compared", "state what the circuit charges"
        found, allowed = ", ".join(free), "a load: driven inputs, wires, terminal capacitances"
        raise InputRefused([Problem(study.file, 0, "value", what, found, allowed, hint)])


def _primary(study: Study) -> _Primary:
    pair = study.pair(study.headline)
    comparison = Comparison(study, pair, Batch.best_estimate())
    outcome = comparison.outcome(study.policy.primary)
    _refuse_free_operations(study, outcome)
    strongest = outcome.strongest_side
    ratio = None
    if strongest is not None and outcome.candidate.found[0]:
        ratio = float(outcome.candidate.area[0] / strongest.area[0])
    run = comparison.candidate
    functional = functional_margins(run)
    relaxed = None
    optimum = outcome.candidate.optimum if outcome.candidate.found[0] else None
    if optimum is None:
        relaxed = comparison.outcome(study.policy.primary, enforce=False)
    aside = relaxed.candidate.optimum if relaxed is not None and relaxed.candidate.found[0] else None
    within = own_limit(study.policy.primary, comparison.policy_inputs())
    requirements = assess(run, optimum, ratio, functional, within, aside)
    curves: dict[str, list[tuple[SideRun, Swept]]] = {}
    for key, side_run in {"candidate": run, **comparison.contenders}.items():
        margins = functional if key == "candidate" else functional_margins(side_run)
        curves[key] = [
            (side_run, swept(side_run, combination, margins[combination])) for combination in side_run.combinations
        ]
    return _Primary(comparison, outcome, requirements, curves, relaxed)


def _verdict(study: Study, primary: _Primary) -> Verdict:
    pair = study.pair(study.headline)
    policy = study.policy.primary
    moves: list[InputMove] = []
    if primary.outcome.candidate.found[0] and primary.outcome.strongest[0] >= 0:
        _, moves = move_inputs(study, pair, policy, primary.frozen)
        moves = with_flips(study, pair, policy, primary.frozen, moves)
    return judge(study, primary.outcome, primary.requirements, moves, primary.relaxed)


def _software() -> dict[str, str]:
    from importlib.metadata import version

    names = ("numpy", "scipy", "pandas", "pydantic", "pint", "altair", "vl-convert-python")
    return {
        "evenload": benchmark.__version__,
        "python": platform.python_version(),
        **{name: version(name) for name in names},
    }


def _constants() -> dict[str, float]:
    """Physical constants by name, SI: with other ones, other results are not the work of an input."""
    return {name: value for name, value in vars(constants).items() if name.isupper()}


def _files(study: Study, library: Library) -> list[dict[str, str]]:
    """Every input file with its text, so that the record alone can be run again."""
    rows = [{"name": study.file, "kind": "study", "sha256": study.sha256, "text": study.text}]
    rows += [
        {"name": spec.file, "kind": "circuit", "sha256": spec.sha256, "text": spec.text} for spec in study.circuit_specs
    ]
    for item in (*study.wires_sets, *technologies(study)):
        rows.append({"name": item.file, "kind": item.kind, "sha256": item.sha256, "text": item.text})
        for table in item.tables.values():
            rows.append({"name": table.file, "kind": "table", "sha256": table.sha256, "text": table.raw})
            sidecar = table.file.rsplit(".", 1)[0] + ".toml"
            rows.append(
                {
                    "name": sidecar,
                    "kind": "table description",
                    "sha256": table.sidecar_sha256,
                    "text": table.sidecar_raw,
                }
            )
    return rows


def run_study(
    study: Study,
    library: Library,
    *,
    created: str | None = None,
    progress: Progress = _silent,
    draws: DrawSettings | None = None,
    jobs: int = 1,
) -> dict[str, Any]:
    """Run a study and return its record as plain data.

    Parameters
    ----------
    study, library
        From ``load_study``.
    created : str, optional
        Time stamp to write instead of the clock (for byte-identical records).
    progress : callable
        Told each step and the share done.
    draws : DrawSettings, optional
        Instead of those of the study.
    jobs : int
        Processes for the draws; their number changes no digit.
    """
    progress("evaluating the headline pair", 0.0)
    primary = _primary(study)
    progress("moving every input alone", 0.2)
    verdict = _verdict(study, primary)
    progress("other policies", 0.6)
    outcomes = {study.policy.primary: primary.outcome}
    outcomes |= {name: primary.comparison.outcome(name) for name in study.policy.also}
    policies = [outcome_row(outcome, name in DIAGNOSTIC) for name, outcome in outcomes.items()]
    policies += same_netlist_rows(study)
    progress("strength of the reference and robustness", 0.65)
    rungs = ladder_rows(primary.comparison, primary.outcome)
    by_pair = pair_outcomes(study, study.policy.primary, {study.headline: primary.outcome})
    known = {(label, study.policy.primary): outcome for label, outcome in by_pair.items()}
    cells = robustness_row(study, known | {(study.headline, name): outcome for name, outcome in outcomes.items()})
    progress("required times and nodes", 0.75)
    envelope = advantage_against_time(study, primary.curves)
    nodes = scan_nodes(study, study.policy.primary, by_pair)
    steps = node_steps(study, study.policy.primary, nodes)
    progress("checking the reference and the method", 0.8)
    anchors = [result for item in technologies(study) if item.model for result in anchor_results(item)]
    checks = self_checks(study, primary.outcome)
    bands = side_bands(primary.comparison, primary.outcome)
    banded = advantage_band(primary.comparison, primary.outcome, envelope, bands)
    progress("elasticities", 0.8)
    effective = [move.key for move in verdict.moves if move.matters]
    slopes = elasticities(study, study.pair(study.headline), primary.outcome, primary.frozen, effective)
    drawn = draw_rows(
        study,
        primary.frozen,
        draws or study.draws,
        jobs,
        lambda share: progress("drawing all ranges together", 0.82 + 0.13 * share),
        [move.key for move in verdict.moves if move.matters and move.advantage_low != move.advantage_high],
    )
    progress("writing the record", 0.95)
    sources = library.sources
    used = _used_sources(study)
    made = created or datetime.datetime.now(datetime.UTC).strftime("%Y-%m-%dT%H:%M:%SZ")
    record = {
        "schema": RECORD_SCHEMA,
        "software": _software(),
        "constants": _constants(),
        "created": made,
        "study": _study_row(study),
        "criteria": criteria_row(study, made),
        "verdict": verdict_row(verdict),
        "requirements": requirement_rows(primary.requirements),
        "policies": policies,
        "sides": _side_rows(study),
        "elasticities": [vars(row) for row in slopes],
        "uncertainty": drawn,
        "ladder": rungs,
        "robustness": cells,
        "outlook": outlook_rows(study),
        "curves": _curve_rows(primary),
        "advantage_against_time": envelope_rows(envelope),
        "crossings": _crossings(study, envelope),
        "nodes": [vars(row) for row in nodes],
        "node_steps": [vars(step) for step in steps],
        "node_crossings": _node_crossings(study, [row.advantage for row in nodes]),
        "anchors": [vars(row) for row in anchors],
        "closed_form": closed_form_differences(primary.comparison, primary.outcome),
        "error_bands": error_band_row(bands, banded),
        "self_checks": checks,
        "ledger": ledger_rows(study, verdict.moves, sources),
        "options": option_rows(study),
        "sources": {
            key: vars(sources[key]) | {"citation": sources[key].citation} for key in sorted(used) if key in sources
        },
        "conventions": conventions(study, _factors(primary))
        + topology_convention(study)
        + mitigation_conventions(study),
        "circuit_assumptions": circuit_assumptions(primary.comparison),
        "not_modelled": list(NOT_MODELLED),
        "cautions": list(CAUTIONS),
        "notes": [str(note) for note in sorted(set(library.collector.notes))],
        "warnings": [str(warning) for warning in sorted(set(library.collector.warnings))]
        + result_warnings(primary.comparison, primary.outcome, verdict)
        + band_warnings(study, bands, banded),
        "files": _files(study, library),
    }
    progress("done", 1.0)
    cleaned: dict[str, Any] = clean(record)
    return {**cleaned, "findings": findings(cleaned)}


def _study_row(study: Study) -> dict[str, Any]:
    pair = study.pair(study.headline)
    policy = study.policy
    return {
        "id": study.id,
        "title": study.title,
        "declared": study.declared,
        "owner": study.owner,
        "note": study.note,
        "demonstration": study.demonstration,
        "product_class": study.product_class,
        "product": study.product,
        "operation": study.operation,
        "circuit": study.circuit,
        "timing": study.timing,
        "leakage_accounting": study.leakage_accounting,
        "idle": study.idle,
        "temperatures": list(study.temperatures),
        "delay_rule": study.delay_rule,
        "short_circuit": study.short_circuit,
        "guard_band_delay": study.guard_band_delay,
        "guard_band_leakage": study.guard_band_leakage,
        "wires": [item.id for item in study.wires_sets],
        "primary_policy": policy.primary,
        "also": list(policy.also),
        "metric": policy.metric,
        "required_time": policy.required_time,
        "required_energy": policy.required_energy,
        "exponent": policy.exponent,
        "required_advantage": study.required_advantage,
        "headline": study.headline,
        "headline_nodes": {
            "candidate": pair.candidate,
            "reference": dict(pair.reference),
            "wires": f"{pair.wires.id} {pair.wires_node}",
        },
        "supply_points": study.supply_points,
        "refine_relative": study.refine_relative,
        "sha256": study.sha256,
    }


def _side_rows(study: Study) -> list[dict[str, Any]]:
    rows = []
    for side, role in [(study.candidate, "candidate"), *((side, "contender") for side in study.contenders)]:
        item = side.technology
        rows.append(
            {
                "id": side.id,
                "role": role,
                "technology": item.id,
                "title": item.title,
                "flavour": item.flavour,
                "ambition": item.ambition,
                "model": item.model,
                "note": item.note,
                **side_circuit(study, side),
                "supply": list(side.supply),
                "sizes": list(side.sizes),
                "threshold_shifts": list(side.threshold_shifts),
                **side_choices(study, side),
                "sha256": item.sha256,
            }
        )
    return rows


def _shown_curves(primary: _Primary, key: str, curves: list[tuple[SideRun, Swept]]) -> list[tuple[SideRun, Swept]]:
    """One curve for each size and threshold shift: with copies and back bias as chosen, else the first."""
    contenders = {side.id: side for side in primary.outcome.contenders}
    chosen = choice_of(primary.outcome.candidate if key == "candidate" else contenders[key])
    found: dict[tuple[float, float], tuple[SideRun, Swept]] = {}
    for run, curve in curves:
        points = curve.points
        place = (points.size, points.threshold_shift)
        own = Choice(*place, points.copies, float(points.back_bias[0, 0]))
        if place not in found or own == chosen:
            found[place] = (run, curve)
    return list(found.values())


def _curve_rows(primary: _Primary) -> list[dict[str, Any]]:
    rows = []
    for key, curves in primary.curves.items():
        for run, curve in _shown_curves(primary, key, curves):
            rows.append(
                {
                    "side": curve.id,
                    "role": "candidate" if key == "candidate" else "contender",
                    "size": curve.points.size,
                    "threshold_shift": curve.points.threshold_shift,
                    "technology": run.problem.side.technology.id,
                    "points": swept_rows(curve),
                }
            )
    return rows


def _crossings(study: Study, envelope: Envelope) -> list[dict[str, float]]:
    levels = dict.fromkeys([1.0, study.required_advantage])
    return [
        {"level": level, "time": time}
        for level in levels
        for time in crossings(envelope.time, envelope.advantage, level)
    ]


def _node_crossings(study: Study, advantages: list[float]) -> list[dict[str, Any]]:
    """Neighbouring node pairs between which the advantage passes M or 1."""
    labels = [pair.label for pair in study.pairs]
    found = []
    for level in dict.fromkeys([1.0, study.required_advantage]):
        for i in range(len(labels) - 1):
            a, b = advantages[i], advantages[i + 1]
            if np.isfinite(a) and np.isfinite(b) and (a >= level) != (b >= level):
                found.append({"level": level, "between": [labels[i], labels[i + 1]], "advantages": [a, b]})
    return found


def _factors(primary: _Primary) -> dict[str, Any]:
    """Delay factor F of each side at its optimum, from the estimator's own stage detail."""
    found = {}
    for side, run in [
        (primary.outcome.candidate, primary.comparison.candidate),
        *zip(primary.outcome.contenders, primary.comparison.contenders.values(), strict=True),
    ]:
        found[side.id] = f"{delay_factor(run, side):.4g}" if side.found[0] else "no permitted point"
    return found


def _used_sources(study: Study) -> set[str]:
    values = [*study.values.values(), *(value for item in study.wires_sets for value in item.values.values())]
    used: set[str] = set()
    for side in (study.candidate, *study.contenders):
        values += [*side.overhead.values(), *side.gating.values(), *side.mitigation.values()]
    for item in technologies(study):
        values += item.values.values()
        used |= {table.source for table in item.tables.values()} | {anchor.source for anchor in item.anchors}
        used |= {source for _, source in item.rows_rest_on}
    if study.circuit_spec is not None:
        values += [value for table in study.circuit_spec.layers.values() for value in table.values()]
    return used | {value.source for value in values if value.source}
