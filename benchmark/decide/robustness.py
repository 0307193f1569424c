"""Robustness: the best estimate under every policy, list of contenders, node pair and list of temperatures (layer 7).

The policies are those of the study without its diagnostics; the lists are all contenders, all but one, and each alone;
the temperatures are all of the study, and each alone. One cell was fixed before the run: it carries the verdict. The
required time and energy of a policy stay as they are in every cell, also where the contender that sets the required
time is not on the list.

Sides are optimised once per policy, pair and temperatures; lists only choose among them. What has not been evaluated
for another part of the answer is searched to ``COARSE`` at best: an optimum between two limits is flat, so its energy
is off by the square of that; on a limit it is off by a few times that.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

import numpy as np

from benchmark.decide.compare import Comparison, Outcome, ratio
from benchmark.decide.infeasible import why_infeasible
from benchmark.decide.moves import reaches
from benchmark.decide.policies import DIAGNOSTIC, PolicyInputs, metric_of, optimum
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.search import SideRun
from benchmark.sets.study import NodePair, Study

__all__ = ["Cell", "Robustness", "robustness"]

#: relative step of the supply search in cells that no other part of the answer needs
COARSE = 1.0e-4
Level = Literal["reaches", "better", "not better", "infeasible"]


@dataclass(frozen=True)
class Cell:
    """One combination at the best estimate.

    ``temperatures`` [K]; ``level``: the advantage reaches M, is better (above 1, below M), not better, or infeasible
    with the reason in ``why``; ``declared``: the combination fixed before the run.
    """

    policy: str
    contenders: str
    pair: str
    temperatures: tuple[float, ...]
    advantage: float
    level: Level
    strongest: str
    why: str
    declared: bool


@dataclass(frozen=True)
class Robustness:
    """All cells, how many reach M and are better than 1, and the worst cell with a number (None: there is none)."""

    cells: tuple[Cell, ...]
    reaching: int
    better: int
    infeasible: int
    worst: Cell | None


@dataclass(frozen=True)
class _Costs:
    """Metric of every side under one policy, pair and list of temperatures; nan without a permitted point."""

    candidate: float
    contenders: Mapping[str, float]
    why: str


def contender_lists(names: list[str]) -> dict[str, tuple[str, ...]]:
    """Name and members of every list: all, all but one, each alone; equal lists once."""
    found: dict[tuple[str, ...], str] = {tuple(names): "all"}
    for name in names:
        found.setdefault(tuple(other for other in names if other != name), f"without {name}")
    for name in names:
        found.setdefault((name,), f"only {name}")
    return {label: members for members, label in found.items() if members}


def robustness(study: Study, known: Mapping[tuple[str, str], Outcome]) -> Robustness:
    """Evaluate all cells.

    Parameters
    ----------
    study : Study
    known : mapping
        (pair, policy) -> outcome at all temperatures of the study, where it has been evaluated already.
    """
    policies = [name for name in (study.policy.primary, *study.policy.also) if name not in DIAGNOSTIC]
    alone = [(kelvin,) for kelvin in study.temperatures if len(study.temperatures) > 1]
    cells: list[Cell] = []
    for pair in study.pairs:
        for temperatures in (study.temperatures, *alone):
            everywhere = temperatures == study.temperatures
            already = {name: known[pair.label, name] for name in policies if everywhere and (pair.label, name) in known}
            costs = _costs(study, pair, temperatures, policies, already)
            answer = everywhere and pair.label == study.headline
            for policy in policies:
                for label, members in contender_lists(list(costs[policy].contenders)).items():
                    declared = answer and policy == study.policy.primary and label == "all"
                    cells.append(_cell(study, policy, (label, members), pair, temperatures, costs[policy], declared))
    numbers = [cell for cell in cells if cell.level != "infeasible"]
    return Robustness(
        tuple(cells),
        sum(cell.level == "reaches" for cell in cells),
        sum(cell.advantage > 1.0 for cell in numbers),
        len(cells) - len(numbers),
        min(numbers, key=lambda cell: cell.advantage) if numbers else None,
    )


def _costs(
    study: Study,
    pair: NodePair,
    temperatures: tuple[float, ...],
    policies: list[str],
    known: Mapping[str, Outcome],
) -> dict[str, _Costs]:
    """Optimise every side under every policy, each distinct question once."""
    found = {name: _of_outcome(known[name]) for name in policies if name in known}
    missing = [name for name in policies if name not in found]
    if not missing:
        return found
    coarse = dataclasses.replace(study, temperatures=temperatures, refine_relative=max(study.refine_relative, COARSE))
    comparison = Comparison(coarse, pair, Batch.best_estimate())
    inputs = comparison.policy_inputs()
    asked: dict[str, _Costs] = {}
    for name in missing:
        # with a required time these two ask the same
        question = "iso-delay" if name == "minimum-energy" and inputs.required_time is not None else name
        if question not in asked:
            asked[question] = _optimised(name, comparison, inputs)
        found[name] = asked[question]
    return found


def _of_outcome(outcome: Outcome) -> _Costs:
    metrics = [
        float(side.metric[0]) if side.found[0] else float("nan") for side in (outcome.candidate, *outcome.contenders)
    ]
    names = [side.id for side in outcome.contenders]
    return _Costs(metrics[0], dict(zip(names, metrics[1:], strict=True)), outcome.candidate.why)


def _optimised(policy: str, comparison: Comparison, inputs: PolicyInputs) -> _Costs:
    def metric(run: SideRun) -> float:
        best = optimum(policy, run, inputs)
        return float(metric_of(comparison.study.policy.metric, best.points)[0, 0]) if best.found[0] else float("nan")

    candidate = metric(comparison.candidate)
    why = why_infeasible(policy, comparison.candidate, inputs) if np.isnan(candidate) else ""
    return _Costs(candidate, {name: metric(run) for name, run in comparison.contenders.items()}, why)


def _cell(
    study: Study,
    policy: str,
    contenders: tuple[str, tuple[str, ...]],
    pair: NodePair,
    temperatures: tuple[float, ...],
    costs: _Costs,
    declared: bool,
) -> Cell:
    label, members = contenders
    rivals = {name: costs.contenders[name] for name in members if not np.isnan(costs.contenders[name])}
    strongest = min(rivals, key=lambda name: rivals[name], default="")
    advantage, why = float("nan"), ""
    level: Level = "infeasible"
    if np.isnan(costs.candidate):
        why = f"candidate: {costs.why or 'no permitted point'}"
    elif not strongest:
        why = "no listed contender has a permitted point"
    else:
        advantage = float(ratio(np.asarray(rivals[strongest]), np.asarray(costs.candidate)))
        level = "not better" if advantage <= 1.0 else "better"
        if reaches(advantage, study.required_advantage):
            level = "reaches"
    return Cell(policy, label, pair.label, temperatures, advantage, level, strongest, why, declared)
