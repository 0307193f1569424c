"""Swept curves, advantage against required time, and the node scan (layer 7)."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchmark.decide.compare import Comparison, Outcome
from benchmark.decide.requirements import FUNCTIONAL, HardLimits, Meets, margins_at
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.points import Points, with_cycle
from benchmark.evaluate.search import SideRun
from benchmark.sets.study import Choice, Study

__all__ = ["Envelope", "Swept", "advantage_against_time", "crossings", "pair_outcomes", "scan_nodes", "swept"]

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]
#: required times per decade in the advantage curve
TIMES_PER_DECADE = 24


@dataclass(frozen=True)
class Swept:
    """One technology over its supply range, at one frozen choice: all arrays (supply,)."""

    id: str
    role: str
    points: Points
    feasible: Mask
    reasons: tuple[tuple[str, ...], ...]  # why each point is not feasible


def swept(run: SideRun, combination: Choice, functional: Mapping[str, Array]) -> Swept:
    """Judge every grid point of one frozen choice, with all reasons."""
    points = run.grid(combination)
    problem = run.problem
    reasons: list[list[str]] = [[] for _ in range(points.energy.shape[1])]

    def mark(bad: Mask, text: str) -> None:
        for column in np.flatnonzero(bad):
            reasons[int(column)].append(text)

    for reason, mask in points.infeasible.items():
        mark(np.asarray(mask[0]), reason)
    mark(~(np.isfinite(points.energy[0]) & np.isfinite(points.time[0])), "cannot be evaluated")
    limits = HardLimits()
    listed_limits = problem.study.requirements.get("device_limits")
    if listed_limits is None or listed_limits.kind != "hard":
        mark(~limits(run, points, points.able)[0], limits.label)
    for requirement in problem.study.requirements.values():
        if requirement.kind != "hard":
            continue
        if requirement.name in FUNCTIONAL:
            margin = functional[requirement.name]
        else:
            found = margins_at(problem, points, requirement)
            if found is None:
                continue
            margin = found
        mark(np.broadcast_to(margin, points.energy.shape)[0] < 1.0, f"requirement {requirement.name}")
    listed = tuple(tuple(item) for item in reasons)
    return Swept(problem.side.id, problem.role, points, np.array([not item for item in listed]), listed)


@dataclass(frozen=True)
class Envelope:
    """Advantage against required time. nan: one side has no permitted point at that time."""

    time: Array
    candidate_energy: Array
    reference_energy: Array
    strongest: tuple[str, ...]
    advantage: Array


#: requirements whose margin depends on the required time: judged anew at every time
_WITH_TIME = frozenset({"requirement deadline", "requirement power_density"})


def _whatever_time(curve: Swept) -> Mask:
    """Points that are feasible, or could be at another required time (which takes the place of the deadline)."""
    return np.array([_WITH_TIME.issuperset(item) for item in curve.reasons])


def advantage_against_time(study: Study, runs: Mapping[str, list[tuple[SideRun, Swept]]]) -> Envelope:
    """Least energy of both sides for a range of required times (iso-delay at every time).

    ``runs``: side key -> swept curves of its frozen choices; the key of the candidate is "candidate". In a clocked
    study the required time is also the clock period. Values come from the supply grid, so they are never better than
    the optimum of the primary policy.
    """
    spans = []
    for curves in runs.values():
        for _, curve in curves:
            mask = _whatever_time(curve)
            if mask.any():
                spans.append((curve.points.interval[0][mask].min(), curve.points.interval[0][mask].max()))
    if not spans:
        empty = np.zeros(0)
        return Envelope(empty, empty, empty, (), empty)
    low, high = min(span[0] for span in spans), max(span[1] for span in spans)
    exponents = np.arange(np.floor(TIMES_PER_DECADE * np.log10(low)), np.ceil(TIMES_PER_DECADE * np.log10(high)) + 1)
    times = 10.0 ** (exponents / TIMES_PER_DECADE)
    energies = {key: _least_energy(study, curves, times) for key, curves in runs.items()}
    candidate = energies.pop("candidate")
    names = list(energies)
    table = np.stack([energies[name] for name in names])
    best = np.argmin(table, axis=0)
    reference = table[best, np.arange(times.size)]
    defined = np.isfinite(candidate) & np.isfinite(reference)
    advantage = np.full(times.shape, np.nan)
    advantage[defined] = reference[defined] / candidate[defined]
    strongest = tuple(names[int(i)] if np.isfinite(reference[k]) else "" for k, i in enumerate(best))
    return Envelope(times, candidate, reference, strongest, advantage)


def _least_energy(study: Study, curves: list[tuple[SideRun, Swept]], times: Array) -> Array:
    least = np.full(times.shape, np.inf)
    cap = study.requirements.get("power_density")
    cap = cap if cap is not None and cap.kind == "hard" else None
    for run, curve in curves:
        mask = _whatever_time(curve)
        delay = curve.points.interval[0]
        for position, time in enumerate(times):  # a few hundred times, each vectorised over the supplies
            period = np.asarray([[time]]) if study.timing == "clocked" else None
            points = with_cycle(run.problem, curve.points, period)
            allowed = mask & (delay <= time)
            if cap is not None:
                allowed &= Meets(cap)(run, points, allowed[None, :])[0]
            if allowed.any():
                least[position] = min(least[position], float(points.energy[0][allowed].min()))
    return least


def crossings(x: Array, y: Array, level: float) -> list[float]:
    """Return every x at which y crosses ``level`` (interpolated on log scales between neighbours)."""
    found = []
    for i in range(len(x) - 1):
        a, b = y[i], y[i + 1]
        if not (np.isfinite(a) and np.isfinite(b)):
            continue
        if (a >= level) != (b >= level):
            share = (np.log(level) - np.log(a)) / (np.log(b) - np.log(a))
            found.append(float(np.exp(np.log(x[i]) + share * (np.log(x[i + 1]) - np.log(x[i])))))
    return found


@dataclass(frozen=True)
class NodeResult:
    """Primary policy at one node pair."""

    label: str
    candidate_node: str
    advantage: float
    strongest: str
    candidate_energy: float
    candidate_time: float
    candidate_supply: float
    reference_energy: float
    reference_time: float
    reference_supply: float
    note: str


def pair_outcomes(study: Study, policy: str, known: Mapping[str, Outcome]) -> dict[str, Outcome]:
    """Return the outcome of a policy at every node pair by label; ``known``: those that have been evaluated already."""
    return {
        pair.label: known[pair.label]
        if pair.label in known
        else Comparison(study, pair, Batch.best_estimate()).outcome(policy)
        for pair in study.pairs
    }


def scan_nodes(study: Study, policy: str, known: Mapping[str, Outcome] | None = None) -> list[NodeResult]:
    """Run the primary policy at every node pair; ``known``: outcomes that have been evaluated already, by label."""
    outcomes = pair_outcomes(study, policy, known or {})
    results = []
    for pair in study.pairs:
        outcome = outcomes[pair.label]
        candidate, reference = outcome.candidate, outcome.strongest_side
        note = ""
        if not candidate.found[0]:
            note = "candidate infeasible"
        elif reference is None:
            note = "no contender feasible"
        nan = float("nan")
        ok = bool(candidate.found[0])
        results.append(
            NodeResult(
                pair.label,
                pair.candidate,
                float(outcome.advantage[0]),
                reference.id if reference else "",
                float(candidate.energy[0]) if ok else nan,
                float(candidate.time[0]) if ok else nan,
                float(candidate.supply[0]) if ok else nan,
                float(reference.energy[0]) if reference else nan,
                float(reference.time[0]) if reference else nan,
                float(reference.supply[0]) if reference else nan,
                note,
            )
        )
    return results
