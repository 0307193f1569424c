"""Requirements: conditions of the search, and pass, fail or unknown with a margin (layer 7).

A margin is a factor: above 1 passes, whatever the direction of the requirement. An unknown is not a pass.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from benchmark.evaluate.functional import functional_points
from benchmark.evaluate.points import Points, cycle_time, cycles_demanded
from benchmark.evaluate.search import Optimum, SideRun, take_columns
from benchmark.evaluate.side import SideProblem
from benchmark.sets.study import REQUIREMENTS, Requirement, Study

__all__ = ["RequirementResult", "assess", "cheap_condition", "functional_condition", "margins_at"]

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]
FUNCTIONAL = ("noise_margin", "voltage_gain")
#: requirements judged once per technology, not per design point
STANDING = ("endurance", "process_temperature", "retention", "area")


@dataclass(frozen=True)
class RequirementResult:
    """One row of the requirements table.

    ``state`` is judged at the optimum of the primary policy, or, when there is none, at the best permitted point.
    ``passes_somewhere``: some permitted point of the candidate meets it.
    """

    name: str
    kind: str
    state: Literal["pass", "fail", "unknown"]
    demanded: float
    offered: float
    margin: float
    unit: str
    meaning: str
    passes_somewhere: bool
    note: str


def _deadline(problem: SideProblem, requirement: Requirement) -> Array:
    if requirement.limit is None:
        period = cycle_time(problem)
        return np.asarray([[np.inf]]) if period is None else period
    return np.asarray([[requirement.limit]])


def margins_at(problem: SideProblem, points: Points, requirement: Requirement) -> Array | None:
    """Return the margin (row, supply) of a point-wise requirement that costs nothing extra; None for the others."""
    limit = requirement.limit
    with np.errstate(divide="ignore", invalid="ignore"):
        if requirement.name == "deadline":
            return np.asarray(_deadline(problem, requirement) / points.time)
        if limit is None:
            return None
        if requirement.name == "thermal_noise":
            return np.asarray(points.noise_ratio / limit)
        if requirement.name == "hysteresis_window":
            return np.asarray(np.where(points.hysteresis > 0.0, limit / points.hysteresis, np.inf))
        if requirement.name == "device_limits":
            worst = np.full(points.energy.shape, np.inf)
            for margin in points.margins.values():
                worst = np.minimum(worst, margin)
            return np.asarray(worst / limit)
        if requirement.name == "power_density":
            return np.asarray(limit / points.power_density)
        if requirement.name == "leakage_power":
            return np.asarray(np.where(points.leakage_power > 0.0, limit / points.leakage_power, np.inf))
    return None


def cheap_condition(run: SideRun, points: Points, among: Mask) -> Mask:
    """Hard point-wise requirements, except the functional floor."""
    problem = run.problem
    mask = np.ones(points.energy.shape, dtype=bool)
    for requirement in problem.study.requirements.values():
        if requirement.kind == "hard":
            margin = margins_at(problem, points, requirement)
            if margin is not None:
                mask &= margin >= 1.0
    return mask


def _functional_margin(problem: SideProblem, points: Points, requirement: Requirement) -> Array:
    found = functional_points(problem, points, requirement.fan_in)
    offered = found.noise_margin if requirement.name == "noise_margin" else found.gain
    limit = requirement.limit
    return np.asarray(np.where(np.isfinite(offered), offered, -np.inf) / (limit or 1.0))


def functional_condition(study: Study) -> bool:
    """Tell whether the study has a hard functional floor."""
    return any(name in study.requirements and study.requirements[name].kind == "hard" for name in FUNCTIONAL)


def functional_mask(run: SideRun, points: Points, among: Mask) -> Mask:
    """Hard functional requirements at the points asked about (expensive: other supplies are not evaluated)."""
    asked = np.flatnonzero(among.any(axis=0))
    mask = np.zeros(points.energy.shape, dtype=bool)
    if not asked.size:
        return mask
    some = take_columns(points, asked)
    allowed = np.ones(some.energy.shape, dtype=bool)
    wanted = [run.problem.study.requirements[name] for name in FUNCTIONAL if name in run.problem.study.requirements]
    hard = [requirement for requirement in wanted if requirement.kind == "hard"]
    for fan_in in sorted({requirement.fan_in for requirement in hard}):
        found = functional_points(run.problem, some, fan_in)
        for requirement in hard:
            if requirement.fan_in == fan_in:
                offered = found.noise_margin if requirement.name == "noise_margin" else found.gain
                allowed &= np.where(np.isnan(offered), -np.inf, offered) >= (requirement.limit or 0.0)
    mask[:, asked] = allowed
    return mask


def _standing(
    run: SideRun, requirement: Requirement, points: Points, area_ratio: float | None
) -> tuple[float, float, float, str, str]:
    """Return demanded, offered, margin, bound, note of a requirement judged once; nan offered means not stated."""
    problem = run.problem
    if requirement.name == "area":
        limit = requirement.limit or np.nan
        offered = np.nan if area_ratio is None else area_ratio
        return limit, offered, limit / offered if np.isfinite(offered) else np.nan, "", ""
    name = {"endurance": "endurance_cycles", "process_temperature": "process_temperature", "retention": "retention"}[
        requirement.name
    ]
    capability = points.capability.get(name)
    demanded = (
        float(cycles_demanded(problem, points, requirement.life)[0, 0])
        if requirement.name == "endurance"
        else float(requirement.limit or 0.0)
    )
    if capability is None:
        return demanded, np.nan, np.nan, "", "not stated in the parameter set"
    offered = float(capability[0].reshape(-1)[0])
    if requirement.name == "process_temperature":
        return demanded, offered, _temperature_margin(offered, demanded), capability[1], ""
    return demanded, offered, offered / demanded if demanded > 0 else np.inf, capability[1], ""


def _temperature_margin(offered: float, limit: float) -> float:
    """A factor that is 1 at the limit, on the kelvin scale."""
    return limit / offered


def _state(margin: float, bound: str, direction: str) -> tuple[Literal["pass", "fail", "unknown"], str]:
    """Judge a margin; one-sided values can only pass or stay unknown (or only fail)."""
    if np.isnan(margin):
        return "unknown", ""
    if bound == "at-least" and direction == "at-least" and margin < 1.0:
        return "unknown", "shown only up to the stated number; more was not tested"
    if bound == "at-most" and direction == "at-least" and margin >= 1.0:
        return "unknown", "the stated number is an upper bound"
    return ("pass" if margin >= 1.0 else "fail"), ""


def assess(
    run: SideRun,
    optimum: Optimum | None,
    area_ratio: float | None,
    functional_grid: Mapping[tuple[float, float], Mapping[str, Array]],
) -> list[RequirementResult]:
    """Judge every requirement of the study for one side, at row 0.

    Parameters
    ----------
    run : SideRun
    optimum : Optimum or None
        Of the primary policy; None when no permitted point meets the hard requirements.
    area_ratio : float or None
        Area over the strongest contender's area.
    functional_grid : mapping
        Frozen choice -> requirement name -> margins over the supply grid (row 0).
    """
    problem = run.problem
    results = []
    for requirement in problem.study.requirements.values():
        if requirement.name in STANDING:
            results.append(_assess_standing(run, requirement, optimum, area_ratio))
        else:
            results.append(_assess_pointwise(run, requirement, optimum, functional_grid))
    return results


def _assess_standing(
    run: SideRun, requirement: Requirement, optimum: Optimum | None, area_ratio: float | None
) -> RequirementResult:
    unit, meaning = REQUIREMENTS[requirement.name]
    points = optimum.points if optimum is not None else _middle(run)
    demanded, offered, margin, bound, note = _standing(run, requirement, points, area_ratio)
    state, why = _state(margin, bound, "at-least" if requirement.name in ("endurance", "retention") else "at-most")
    return RequirementResult(
        requirement.name,
        requirement.kind,
        state,
        demanded,
        offered,
        margin,
        unit,
        meaning,
        state != "fail",
        note or why,
    )


def _middle(run: SideRun) -> Points:
    grid = run.grid(run.combinations[0])
    able = np.flatnonzero(grid.able[0])
    column = int(able[len(able) // 2]) if len(able) else 0
    return take_columns(grid, np.array([column]))


def _assess_pointwise(
    run: SideRun,
    requirement: Requirement,
    optimum: Optimum | None,
    functional_grid: Mapping[tuple[float, float], Mapping[str, Array]],
) -> RequirementResult:
    problem = run.problem
    best, able_anywhere = -np.inf, False
    for combination in run.combinations:
        grid = run.grid(combination)
        margin = (
            functional_grid[combination][requirement.name]
            if requirement.name in FUNCTIONAL
            else margins_at(problem, grid, requirement)
        )
        if margin is None:
            continue
        able = grid.able[0]
        able_anywhere |= bool(able.any())
        if able.any():
            best = max(best, float(np.nanmax(np.where(able, margin[0], -np.inf))))
    at = best
    if optimum is not None:
        found = (
            _functional_margin(problem, optimum.points, requirement)
            if requirement.name in FUNCTIONAL
            else margins_at(problem, optimum.points, requirement)
        )
        at = float(found[0, 0]) if found is not None else np.nan
    elif requirement.kind == "hard" and not able_anywhere:
        at = np.nan
    unit, meaning = REQUIREMENTS[requirement.name]
    demanded = (
        float(_deadline(problem, requirement)[0, 0])
        if requirement.name == "deadline"
        else float(requirement.limit or 0.0)
    )
    at_most = requirement.name in ("deadline", "hysteresis_window", "power_density", "leakage_power")
    offered = demanded / at if at_most and at > 0 else demanded * at
    state: Literal["pass", "fail", "unknown"] = "unknown" if np.isnan(at) else ("pass" if at >= 1.0 else "fail")
    note = "" if optimum is not None else "at the most favourable permitted point"
    if np.isnan(at):
        note = "no point of the range can be evaluated"
    return RequirementResult(
        requirement.name, requirement.kind, state, demanded, offered, at, unit, meaning, best >= 1.0, note
    )


def functional_margins(run: SideRun) -> dict[tuple[float, float], dict[str, Array]]:
    """Evaluate the functional requirements over every grid of a side (row 0 only)."""
    study = run.problem.study
    wanted: Sequence[Requirement] = [study.requirements[name] for name in FUNCTIONAL if name in study.requirements]
    found: dict[tuple[float, float], dict[str, Array]] = {}
    for combination in run.combinations:
        grid = run.grid(combination)
        margins: dict[str, Array] = {}
        for fan_in in sorted({requirement.fan_in for requirement in wanted}):
            points = functional_points(run.problem, grid, fan_in)
            for requirement in wanted:
                if requirement.fan_in == fan_in:
                    offered = points.noise_margin if requirement.name == "noise_margin" else points.gain
                    margins[requirement.name] = np.where(np.isnan(offered), -np.inf, offered) / (
                        requirement.limit or 1.0
                    )
        found[combination] = margins
    return found
