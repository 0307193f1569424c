"""Comparison policies: what each side is allowed to choose, and what it is judged by (layer 7).

declared-point         x = the declared supply; nothing is optimised
iso-delay              min E subject to T <= n T*
iso-energy             min T subject to E <= E*
minimum-energy         min E subject to T <= n T_max (when a required time is given)
minimum-energy-delay   min E T^m
same-supply            the reference's declared supply for both sides (diagnostic, not a verdict)

T is the path delay; n parallel copies take turns, so each may take n times the required time. Where T itself is made
small, copies do not help.

A side that cannot reach T* or E* is infeasible; it is never given a number.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchmark.decide.requirements import FunctionalFloor, functional_condition, hard_conditions
from benchmark.evaluate.points import Points, design_points
from benchmark.evaluate.search import (
    All,
    Condition,
    Objective,
    Optimum,
    SideRun,
    hold_to,
    least,
    minimise,
    same_silicon,
)
from benchmark.evaluate.side import SideProblem
from benchmark.sets.study import Choice

__all__ = [
    "DIAGNOSTIC",
    "PRESCRIBED",
    "PolicyInputs",
    "floor_only_raises",
    "hold_to_floor",
    "metric_of",
    "optimum",
    "own_limit",
    "prescribed",
    "roughly",
]

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]
#: policies that never give a verdict
DIAGNOSTIC = frozenset({"same-supply"})
#: policies that leave no supply to choose
PRESCRIBED = frozenset({"declared-point", "same-supply"})


@dataclass(frozen=True)
class PolicyInputs:
    """What a policy needs beyond the side itself: arrays (1 or row of the whole batch, 1)."""

    required_time: Array | None = None
    required_energy: float | None = None
    exponent: float = 1.0
    same_supply: Array | None = None
    enforce_requirements: bool = True


def _energy(problem: SideProblem, points: Points) -> Array:
    return points.energy


def _time(problem: SideProblem, points: Points) -> Array:
    return points.time


def metric_of(name: str, points: Points) -> Array:
    """Return the metric X of the study (row, supply); all four are costs."""
    return {
        "energy-per-operation": points.energy,
        "time-per-operation": points.time,
        "area": points.area,
        "leakage-power": points.leakage_power,
    }[name]


@dataclass(frozen=True)
class Within(Condition):
    """The limit of a policy: ``attribute`` (interval or energy) at most ``limit``, (1 or row of the whole batch, 1)."""

    attribute: str
    limit: Array

    def margin(self, run: SideRun, points: Points, among: Mask) -> Array:
        """Return limit over value."""
        return np.asarray(run.problem.batch.own(self.limit) / getattr(points, self.attribute))

    def judge(self, run: SideRun, points: Points, among: Mask) -> tuple[Mask, Array]:
        """Compare the numbers themselves, without the rounding of a quotient; an unknown limit admits nothing."""
        inside = getattr(points, self.attribute) <= run.problem.batch.own(self.limit)
        return np.asarray(inside), self.margin(run, points, among)


class Nowhere(Condition):
    """Admits no point of a range."""

    def margin(self, run: SideRun, points: Points, among: Mask) -> Array:
        """Return minus infinity."""
        return np.full(points.energy.shape, -np.inf)


def own_limit(name: str, inputs: PolicyInputs) -> Condition:
    """Return the condition that the policy itself puts on the supplies of a range; a prescribed supply admits none."""
    if name in PRESCRIBED:
        return Nowhere()
    if name in ("iso-delay", "minimum-energy") and inputs.required_time is not None:
        return Within("interval", inputs.required_time)
    if name == "iso-energy":
        return Within("energy", np.asarray([[inputs.required_energy]], dtype=np.float64))
    return All()


def prescribed(name: str, run: SideRun, inputs: PolicyInputs, frozen: Choice | None = None) -> Points:
    """Return the points of a policy that prescribes the supply; the first frozen choice unless one is given."""
    problem = run.problem
    supply = problem.declared_supply[:, 0, :]
    if name == "same-supply":
        if inputs.same_supply is None:
            message = "same-supply needs the reference's declared supply"
            raise ValueError(message)
        supply = problem.batch.own(inputs.same_supply)
    return design_points(problem, supply, *(frozen or run.combinations[0]))


def _fixed(run: SideRun, points: Points, condition: Condition, costly: Condition | None) -> Optimum:
    """Judge one given point per row."""
    problem = run.problem
    found = (points.able & condition(run, points, points.able))[:, 0]
    low, high = problem.side.supply
    inside = (points.supply[:, 0] >= low * (1 - 1e-12)) & (points.supply[:, 0] <= high * (1 + 1e-12))
    found = found & inside
    if costly is not None and found.any():
        found = found & costly(run, points, found[:, None])[:, 0]
    nothing = np.zeros(found.shape, dtype=bool)
    return Optimum(points, points.energy[:, 0], found, nothing, nothing, nothing)


def _parts(name: str, run: SideRun, inputs: PolicyInputs) -> tuple[Objective, Condition, Condition | None]:
    """What a policy makes small, and the cheap and the costly conditions on it."""
    hard: Condition = hard_conditions(run.problem.study) if inputs.enforce_requirements else All()
    costly: Condition | None = (
        FunctionalFloor() if inputs.enforce_requirements and functional_condition(run.problem.study) else None
    )
    objective: Objective = _energy
    if name == "iso-energy":
        objective = _time
    elif name == "minimum-energy-delay":
        objective = lambda problem, points: points.energy * points.time**inputs.exponent  # noqa: E731
    return objective, All.of(hard, own_limit(name, inputs)) if name not in PRESCRIBED else hard, costly


def optimum(
    name: str,
    run: SideRun,
    inputs: PolicyInputs,
    frozen: Choice | None = None,
    *,
    floor: bool = True,
) -> Optimum:
    """Return each row's choice under a policy.

    Rows without any permitted point have ``found`` False. ``floor=False`` leaves the functional floor for
    ``hold_to_floor``: what is found then is at least as good.
    """
    objective, cheap, costly = _parts(name, run, inputs)
    if not floor:
        costly = None
    if name in PRESCRIBED:
        return _fixed(run, prescribed(name, run, inputs, frozen), cheap, costly)
    return minimise(run, objective, cheap, costly, frozen)


def roughly(name: str, run: SideRun, inputs: PolicyInputs, choice: Choice) -> Array:
    """Return the least of what the policy makes small over a few supplies, (row,), whatever conditions say.

    Infinite where no point has a value.
    """
    objective, _, _ = _parts(name, run, inputs)
    found = [least(run, other, objective) for other in same_silicon(run, choice)]
    return np.broadcast_to(np.min(found, axis=0), (run.problem.batch.rows,))


def hold_to_floor(name: str, run: SideRun, inputs: PolicyInputs, frozen: Choice, without: Optimum) -> Optimum:
    """Return the choice that meets the functional floor too, from the ``optimum`` found with ``floor=False``."""
    objective, cheap, costly = _parts(name, run, inputs)
    if costly is None:
        return without
    if name in PRESCRIBED:
        return _fixed(run, without.points, cheap, costly)
    return hold_to(run, frozen, objective, cheap, costly, without)


def floor_only_raises(name: str, metric: str) -> bool:
    """Tell whether a metric can only rise when the functional floor is added: it is what the policy makes small."""
    return name in PRESCRIBED or (name, metric) in (
        ("iso-delay", "energy-per-operation"),
        ("minimum-energy", "energy-per-operation"),
        ("iso-energy", "time-per-operation"),
    )
