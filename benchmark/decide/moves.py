"""Each input moved alone over its range, both sides re-optimised, and what that does to the answer (layer 7).

An input without a range is moved a little both ways, only to see whether anything rests on it. A number stated as a
bound (instrument floor, no failure so far) is moved far to its open side, so that the answer is had at both ends.
Where a moved input makes the candidate miss a listed requirement, the advantage there counts as none, as where it has
no permitted point.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchmark.catalogue import EVIDENCE, QUANTITIES
from benchmark.circuits.library import BUILT_IN
from benchmark.decide.compare import Comparison, Outcome
from benchmark.decide.policies import PRESCRIBED
from benchmark.decide.requirements import STANDING, misses, standing
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.side import values_by_key
from benchmark.sets.study import Choice, NodePair, Study
from benchmark.sets.values import Value
from benchmark.units import from_si, parse_unit

__all__ = ["InputMove", "move_inputs", "permitted_advantage", "range_of", "reaches"]

Array = NDArray[np.float64]
#: relative step by which an input without a range is moved to see whether it matters at all
PROBE = 0.01
#: a smaller relative change of the advantage than this counts as none (rounding)
NO_EFFECT = 1.0e-9
#: factor by which a one-sided number is moved to its open side: three decades stand for "much less" or "much more"
OPEN = 1000.0
#: however coarse the search, a larger change than this counts
COARSEST = 1.0e-5


@dataclass(frozen=True)
class InputMove:
    """One input moved alone. Advantages are nan where a side becomes infeasible or a requirement is missed.

    ``best``, ``low``, ``high``: in the catalogue's unit (nan when no range is stated), so that a respelled unit in
    a file changes nothing. ``flip_low``, ``flip_high``: values between an end and the best estimate at which the
    advantage equals M; nan towards an end that lies on the same side of M. Measured tables and stage results, which
    cannot be moved, have no numbers at all.
    """

    key: str
    name: str
    unit: str
    evidence: str
    best: float
    low: float
    high: float
    advantage_low: float
    advantage_high: float
    ranged: bool
    straddles: bool
    matters: bool
    best_reaches: bool
    flip_low: float = float("nan")
    flip_high: float = float("nan")

    @property
    def flip(self) -> float:
        """The flip value; with two of them, the one on the low side."""
        return self.flip_low if np.isfinite(self.flip_low) else self.flip_high

    @property
    def decisive(self) -> bool:
        """Straddles M over its range, or moves the result and has no range."""
        return self.straddles or (not self.ranged and self.matters)


def reaches(advantage: float, required: float) -> bool:
    """Tell whether an advantage is at least the required one; nan (infeasible) is not."""
    return bool(advantage >= required)


def _probes(value: Value) -> list[float]:
    """SI values to which an input without range is moved; none when its evidence carries any verdict."""
    si = float(value.si[0])
    domain = QUANTITIES[value.name].domain
    if si == 0.0 or EVIDENCE.get(value.evidence, EVIDENCE["assumed"]).support == "go":
        return []
    if domain == "count":
        return [si - 1.0, si + 1.0] if si > 1.0 else [si + 1.0]
    # a share is moved down: above it may lie a limit of its own (data of a register rise at most every other cycle)
    if domain in ("fraction", "share"):
        return [si * (1.0 - PROBE)]
    return sorted([si * (1.0 - PROBE), si * (1.0 + PROBE)])


def range_of(value: Value) -> tuple[float, float] | None:
    """Return the range (SI) over which an input is moved: the stated one, or the open side of a bound; else None."""
    if value.spread is not None:
        return float(value.spread.low[0]), float(value.spread.high[0])
    si = float(value.si[0])
    if not value.bound or si == 0.0:
        return None
    if value.bound == "at-most":
        return (max(1.0, si / OPEN) if QUANTITIES[value.name].domain == "count" else si / OPEN), si
    share = QUANTITIES[value.name].domain in ("fraction", "share")
    return si, (1.0 if share else si * OPEN)


def _moves_of(values: Mapping[str, Value], shaping: Sequence[str]) -> list[tuple[str, float, float]]:
    """List what is moved; counts that shape the netlist stay, for another netlist is another study."""
    moves: list[tuple[str, float, float]] = []
    for key, value in values.items():
        if value.name in shaping:
            continue
        moves += [(key, float(value.si[0]), end) for end in range_of(value) or _probes(value)]
    return moves


def permitted_advantage(comparison: Comparison, outcome: Outcome) -> Array:
    """Return the advantage of every row; nan where the candidate misses a listed requirement."""
    run = comparison.candidate
    missed = comparison.widen(run, misses(run, outcome.candidate.optimum.points).astype(np.float64)) > 0.0
    area = comparison.study.requirements.get("area")
    if area is not None and area.limit is not None:
        table = np.stack([side.area for side in outcome.contenders])
        rival = table[np.maximum(outcome.strongest, 0), np.arange(table.shape[1])]
        missed = missed | (outcome.candidate.area > area.limit * rival)
    return np.asarray(np.where(missed, np.nan, outcome.advantage))


def _standing_margins(comparison: Comparison, outcome: Outcome) -> list[Array]:
    """Margins (row,) of the requirements that rest on one stated number."""
    run = comparison.candidate
    listed = [item for item in comparison.study.requirements.values() if item.name in STANDING and item.name != "area"]
    points = outcome.candidate.optimum.points
    return [comparison.widen(run, standing(run.problem, points, item).margin) for item in listed]


def _differ(moved: float, best: float, tolerance: float = NO_EFFECT) -> bool:
    """Tell whether a number changed; becoming no number is a change."""
    if moved == best or (np.isnan(moved) and np.isnan(best)):
        return False
    return not abs(moved - best) <= tolerance * abs(best)


def _tolerance(study: Study, policy: str, name: str) -> float:
    """Largest relative change that counts as none: what the resolution of a searched supply cannot tell from none."""
    if policy in PRESCRIBED:
        return NO_EFFECT
    # a declared supply is a point of the supply grid, so it moves an optimum within that resolution
    widest = (4.0, 1.0e-3) if name == "declared_supply" else (2.0, COARSEST)
    return max(NO_EFFECT, min(widest[0] * study.refine_relative, widest[1]))


def move_inputs(
    study: Study, pair: NodePair, policy: str, frozen: Mapping[str, Choice]
) -> tuple[Outcome, list[InputMove]]:
    """Move every input alone over its range, both sides re-optimised in each row (frozen choices kept)."""
    values = values_by_key(study, pair)
    names = {study.circuit, *(study.circuit_of(side)[0] for side in study.sides)}
    shaping = {name for circuit in names if circuit in BUILT_IN for name in BUILT_IN[circuit].whole}
    moves = _moves_of(values, tuple(shaping))
    comparison = Comparison(study, pair, Batch.one_at_a_time(moves), frozen=frozen)
    outcome = comparison.outcome(policy)
    advantage = permitted_advantage(comparison, outcome)
    margins = _standing_margins(comparison, outcome)
    rows: dict[str, list[int]] = {}
    for row, (key, _, _) in enumerate(moves, start=1):
        rows.setdefault(key, []).append(row)
    found = []
    for key, positions in rows.items():
        value = values[key]
        tolerance = _tolerance(study, policy, value.name)
        changed = any(_differ(advantage[row], advantage[0], tolerance) for row in positions)
        rests = any(_differ(margin[row], margin[0]) for margin in margins for row in positions)
        ends = [float(advantage[row]) for row in positions]
        found.append(_move(study, key, value, float(advantage[0]), ends, changed or rests))
    best_reaches = reaches(float(advantage[0]), study.required_advantage)
    return outcome, [*found, *_unmovable(study, pair, best_reaches)]


def _move(study: Study, key: str, value: Value, best: float, ends: Sequence[float], matters: bool) -> InputMove:
    unit = parse_unit(QUANTITIES[value.name].unit)
    span = range_of(value)
    ranged = span is not None
    low, high = (from_si(end, unit) for end in span) if span is not None else (float("nan"), float("nan"))
    required = study.required_advantage
    best_reaches = reaches(best, required)
    straddles = ranged and any(reaches(end, required) != best_reaches for end in ends)
    return InputMove(
        key,
        value.name,
        unit.text,
        value.evidence,
        from_si(float(value.si[0]), unit),
        low,
        high,
        ends[0],
        ends[-1],
        ranged,
        straddles,
        matters,
        best_reaches,
    )


def _unmovable(study: Study, pair: NodePair, best_reaches: bool) -> list[InputMove]:
    """Measured tables and stage results: the answer rests on them, and they have no range."""
    nan = float("nan")
    found: dict[tuple[str, str], InputMove] = {}
    for side in (study.candidate, *(side for side in study.contenders if side.id in pair.reference)):
        item = side.technology
        listed = [(f"{item.id}.table.{name}", "measured table", table.evidence) for name, table in item.tables.items()]
        listed += [(f"{item.id}.row", "stage results", evidence) for evidence, _ in item.rows_rest_on]
        for key, name, evidence in sorted(listed):
            if EVIDENCE.get(evidence, EVIDENCE["assumed"]).support != "go":
                found[key, evidence] = InputMove(
                    key, name, "", evidence, nan, nan, nan, nan, nan, False, False, True, best_reaches
                )
    return list(found.values())
