"""Requirements: margins, and the conditions they put on a search (layer 7).

A margin is a factor: above 1 passes, whatever the direction of the requirement; nan: cannot be judged. A point whose
margin is unknown stays in the search, for an unknown is no failure; it is no pass either, and the verdict says so.
Hard limits that a device reports (field, strength, supply ceiling) bind every search, whether or not the study lists
``device_limits``.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchmark.evaluate.functional import functional_points
from benchmark.evaluate.points import Points, cycle_time, cycles_demanded
from benchmark.evaluate.search import All, Condition, SideRun, take_columns
from benchmark.evaluate.side import SideProblem
from benchmark.sets.study import Choice, Requirement, Study

__all__ = [
    "FUNCTIONAL",
    "STANDING",
    "FunctionalFloor",
    "HardLimits",
    "Meets",
    "Standing",
    "functional_condition",
    "functional_margin",
    "functional_margins",
    "hard_conditions",
    "margins_at",
    "misses",
    "standing",
]

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]
#: expensive: from the transfer curves of the gates
FUNCTIONAL = ("noise_margin", "voltage_gain")
#: judged once per technology, not per design point
STANDING = ("endurance", "process_temperature", "retention", "area")
_CAPABILITY = {"endurance": "endurance_cycles", "process_temperature": "process_temperature", "retention": "retention"}


def deadline(problem: SideProblem, requirement: Requirement) -> Array:
    """Return the latest allowed time (row or 1, 1) [s]; infinite when there is none."""
    if requirement.limit is None:
        period = cycle_time(problem)
        return np.asarray([[np.inf]]) if period is None else period
    return np.asarray([[requirement.limit]])


def margins_at(problem: SideProblem, points: Points, requirement: Requirement) -> Array | None:
    """Return the margin (row, supply) of a point-wise requirement that costs nothing extra; None for the others."""
    limit = requirement.limit
    with np.errstate(divide="ignore", invalid="ignore"):
        if requirement.name == "deadline":
            # a clock cycle is the time between operations, which copies share; a stated limit is a latency
            lasts = points.interval if limit is None else points.time
            return np.asarray(deadline(problem, requirement) / lasts)
        if limit is None:
            return None
        if requirement.name == "thermal_noise":
            return np.asarray(points.noise_ratio / limit)
        if requirement.name == "hysteresis_window":
            return np.asarray(np.where(points.hysteresis > 0.0, limit / points.hysteresis, np.inf))
        if requirement.name == "device_limits":
            return _worst(points, points.margins, limit)
        if requirement.name == "power_density":
            return np.asarray(limit / points.power_density)
        if requirement.name == "leakage_power":
            return np.asarray(np.where(points.leakage_power > 0.0, limit / points.leakage_power, np.inf))
    return None


def _worst(points: Points, names: object, limit: float) -> Array:
    """Smallest of some device margins over the limit; unknown where an unknown one could be the smallest."""
    worst = np.full(points.energy.shape, np.inf)
    unknown = np.zeros(points.energy.shape, dtype=bool)
    for name in names:  # type: ignore[attr-defined]
        margin = points.margins[name]
        worst = np.fmin(worst, margin)
        unknown |= np.isnan(margin)
    with np.errstate(divide="ignore"):
        margin = np.asarray(worst / limit)
    return np.where(unknown & ~(margin < 1.0), np.nan, margin)


@dataclass(frozen=True)
class Meets(Condition):
    """One hard point-wise requirement."""

    requirement: Requirement

    @property
    def label(self) -> str:
        """What is asked, for messages."""
        return f"requirement {self.requirement.name}"

    def margin(self, run: SideRun, points: Points, among: Mask) -> Array:
        """Return the margin of the requirement."""
        margin = margins_at(run.problem, points, self.requirement)
        return np.broadcast_to(np.inf if margin is None else margin, points.energy.shape)


@dataclass(frozen=True)
class HardLimits(Condition):
    """The hard limits that the device reports."""

    label: str = "hard limits of the device"

    def margin(self, run: SideRun, points: Points, among: Mask) -> Array:
        """Return the smallest hard margin."""
        return _worst(points, points.hard_limits, 1.0)


def hard_conditions(study: Study) -> All:
    """Hard point-wise requirements and hard limits of the device; without the functional floor."""
    listed = [
        Meets(requirement)
        for requirement in study.requirements.values()
        if requirement.kind == "hard" and requirement.name not in (*FUNCTIONAL, *STANDING)
    ]
    return All((HardLimits(), *listed))


def functional_margin(offered: Array, limit: float | None) -> Array:
    """Return noise margin or gain over the limit; a pair that does not switch (nan) misses it."""
    return np.asarray(np.where(np.isnan(offered), -np.inf, offered) / (limit or 1.0))


def functional_condition(study: Study) -> bool:
    """Tell whether the study has a hard functional floor."""
    return any(name in study.requirements and study.requirements[name].kind == "hard" for name in FUNCTIONAL)


def functional_at(problem: SideProblem, points: Points, wanted: list[Requirement]) -> dict[str, Array]:
    """Return the margins (row, supply) of functional requirements at some points (expensive)."""
    margins: dict[str, Array] = {}
    for fan_in in sorted({requirement.fan_in for requirement in wanted}):
        found = functional_points(problem, points, fan_in)
        for requirement in wanted:
            if requirement.fan_in == fan_in:
                offered = found.noise_margin if requirement.name == "noise_margin" else found.gain
                margins[requirement.name] = functional_margin(offered, requirement.limit)
    return margins


def _functional(study: Study, kind: str = "") -> list[Requirement]:
    listed = [study.requirements[name] for name in FUNCTIONAL if name in study.requirements]
    return [requirement for requirement in listed if kind in ("", requirement.kind)]


@dataclass(frozen=True)
class FunctionalFloor(Condition):
    """The hard functional requirements (expensive: supplies that are not asked about are not evaluated)."""

    def margin(self, run: SideRun, points: Points, among: Mask) -> Array:
        """Return the smallest functional margin; minus infinity at supplies nobody asked about."""
        asked = np.flatnonzero(among.any(axis=0))
        worst = np.full(points.energy.shape, -np.inf)
        if asked.size:
            some = take_columns(points, asked)
            margins = functional_at(run.problem, some, _functional(run.problem.study, "hard"))
            worst[:, asked] = np.min([*margins.values()], axis=0)
        return worst


def functional_margins(run: SideRun) -> dict[Choice, dict[str, Array]]:
    """Evaluate the functional requirements over every grid of a side: frozen choice -> name -> (row, supply)."""
    wanted = _functional(run.problem.study)
    return {choice: functional_at(run.problem, run.grid(choice), wanted) for choice in run.combinations}


@dataclass(frozen=True)
class Standing:
    """A requirement judged on one stated number per technology; arrays (row,). nan: not stated."""

    demanded: Array
    offered: Array
    margin: Array
    bound: str
    at_most: bool


def standing(problem: SideProblem, points: Points, requirement: Requirement) -> Standing:
    """Judge endurance, process temperature or retention at points of one supply per row.

    The margin of a temperature is the ratio on the kelvin scale.
    """
    rows = points.energy.shape[0]
    if requirement.name == "endurance":
        demanded = cycles_demanded(problem, points, requirement.life)[:, 0]
    else:
        demanded = np.full(rows, requirement.limit or 0.0)
    demanded = np.broadcast_to(demanded, (rows,))
    at_most = requirement.name == "process_temperature"
    capability = points.capability.get(_CAPABILITY[requirement.name])
    if capability is None:
        unknown = np.full(rows, np.nan)
        return Standing(demanded, unknown, unknown, "", at_most)
    offered = np.broadcast_to(capability[0].reshape(-1), (rows,))
    with np.errstate(divide="ignore", invalid="ignore"):
        margin = demanded / offered if at_most else np.where(demanded > 0.0, offered / demanded, np.inf)
    return Standing(demanded, offered, np.asarray(margin), capability[1], at_most)


def misses(run: SideRun, points: Points) -> Mask:
    """Return the rows whose point fails a listed requirement that did not bound the search; an unknown is no failure.

    The area ratio is not among them: it needs the other side.
    """
    problem = run.problem
    missed = np.zeros(points.energy.shape[0], dtype=bool)
    for requirement in problem.study.requirements.values():
        if requirement.name == "area":
            continue
        if requirement.name in STANDING:
            found = standing(problem, points, requirement)
            short = found.margin < 1.0
            # a one-sided number that falls short on its open side is unknown
            missed |= short & (found.bound != ("at-most" if found.at_most else "at-least"))
        elif requirement.kind == "report" and requirement.name not in FUNCTIONAL:
            margin = margins_at(problem, points, requirement)
            if margin is not None:
                missed |= np.broadcast_to(margin < 1.0, points.energy.shape)[:, 0]
    for margin in functional_at(problem, points, _functional(problem.study, "report")).values():
        missed |= margin[:, 0] < 1.0
    return missed
