"""Every requirement of a study judged for the candidate: pass, fail or unknown with a margin (layer 7)."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from benchmark.decide.requirements import (
    FUNCTIONAL,
    STANDING,
    deadline,
    functional_at,
    hard_conditions,
    margins_at,
    standing,
)
from benchmark.evaluate.points import Points
from benchmark.evaluate.search import Condition, Optimum, SideRun, take_columns
from benchmark.sets.study import REQUIREMENTS, Choice, Requirement

__all__ = ["RequirementResult", "assess", "state_of"]

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]
State = Literal["pass", "fail", "unknown"]
NOT_STATED = "cannot be judged: a value it needs is not stated"
AT_MOST = ("deadline", "hysteresis_window", "power_density", "leakage_power")


@dataclass(frozen=True)
class RequirementResult:
    """One row of the requirements table.

    ``state`` is judged at the optimum of the primary policy. Without a permitted point a requirement is judged at the
    point that meets it best, among those that the policy itself admits: it fails when none meets it.
    ``passes_somewhere``: some point that meets the hard requirements, and that the policy admits, meets it too.
    """

    name: str
    kind: str
    state: State
    demanded: float
    offered: float
    margin: float
    unit: str
    meaning: str
    passes_somewhere: bool
    note: str


def state_of(margin: float, bound: str = "", at_most: bool = False) -> tuple[State, str]:
    """Judge a margin. A one-sided number is exact on one side only.

    ``at_most``: the requirement wants the number small (a temperature), otherwise large (cycles, time).
    """
    if np.isnan(margin):
        return "unknown", ""
    passes = margin >= 1.0
    if bound == "at-least":
        if passes and at_most:
            return "unknown", "the stated number is a lower bound"
        if not passes and not at_most:
            return "unknown", "shown only up to the stated number; more was not tested"
    if bound == "at-most":
        if passes and not at_most:
            return "unknown", "the stated number is an upper bound"
        if not passes and at_most:
            return "unknown", "the stated number is an upper bound; less may be enough"
    return ("pass" if passes else "fail"), ""


@dataclass(frozen=True)
class _OnGrid:
    """Margins over one grid, and the points that work, that the policy admits, that meet the hard requirements too."""

    margin: Array
    able: Mask
    admitted: Mask
    permitted: Mask


@dataclass(frozen=True)
class _Scope:
    """Where a requirement is judged: the optimum, or the points that the policy admits."""

    run: SideRun
    optimum: Optimum | None
    relaxed: Optimum | None
    within: Condition
    functional: Mapping[Choice, Mapping[str, Array]]

    def margin_at(self, points: Points, requirement: Requirement) -> float:
        """Margin of row 0 at points of one supply."""
        problem = self.run.problem
        if requirement.name in FUNCTIONAL:
            return float(functional_at(problem, points, [requirement])[requirement.name][0, 0])
        found = margins_at(problem, points, requirement)
        return float("nan") if found is None else float(np.broadcast_to(found, points.energy.shape)[0, 0])

    def grid_margins(self, requirement: Requirement) -> list[_OnGrid]:
        """Frozen choice by frozen choice, over the grid (row 0)."""
        found = []
        run = self.run
        hard = hard_conditions(run.problem.study)
        for choice in run.combinations:
            grid = run.grid(choice)
            margin = (
                self.functional[choice][requirement.name]
                if requirement.name in FUNCTIONAL
                else margins_at(run.problem, grid, requirement)
            )
            if margin is None:
                continue
            admitted = grid.able & self.within(run, grid, grid.able)
            permitted = admitted & hard(run, grid, admitted)
            for name, other in self.functional[choice].items():
                if run.problem.study.requirements[name].kind == "hard":
                    permitted = permitted & (other >= 1.0)
            whole = np.broadcast_to(margin, grid.energy.shape)
            found.append(_OnGrid(whole[0], grid.able[0], admitted[0], permitted[0]))
        return found

    def best_margin(self, requirement: Requirement) -> tuple[float, str]:
        """Largest margin among the points the policy admits, and a note on where; nan when none can be judged."""
        listed = self.grid_margins(requirement)
        values = [on.margin[on.admitted] for on in listed]
        if self.relaxed is not None and self.relaxed.found[0]:
            values.append(np.array([self.margin_at(self.relaxed.points, requirement)]))
        if not any(item.size for item in values):  # the policy admits no point at all: the whole range counts
            values = [on.margin[on.able] for on in listed]
        every = np.concatenate([*values, np.zeros(0)])
        known = every[~np.isnan(every)]
        if not every.size:
            return float("nan"), "no point of the range can be evaluated"
        if known.size and (known.max() >= 1.0 or known.size == every.size):
            return float(known.max()), "at the most favourable point of the range"
        return float("nan"), NOT_STATED


def assess(
    run: SideRun,
    optimum: Optimum | None,
    area_ratio: float | None,
    functional: Mapping[Choice, Mapping[str, Array]],
    within: Condition,
    relaxed: Optimum | None = None,
) -> list[RequirementResult]:
    """Judge every requirement of the study for one side, at row 0.

    Parameters
    ----------
    run : SideRun
    optimum : Optimum or None
        Of the primary policy; None when no permitted point meets the hard requirements.
    area_ratio : float or None
        Area over the strongest contender's area.
    functional : mapping
        Frozen choice -> requirement name -> margins over the supply grid (``functional_margins``).
    within : Condition
        Points that the policy itself admits (``policies.own_limit``).
    relaxed : Optimum, optional
        Of the primary policy with the hard requirements set aside, when there is no ``optimum``.
    """
    scope = _Scope(run, optimum, relaxed, within, functional)
    return [
        _standing(scope, requirement, area_ratio) if requirement.name in STANDING else _pointwise(scope, requirement)
        for requirement in run.problem.study.requirements.values()
    ]


def _standing(scope: _Scope, requirement: Requirement, area_ratio: float | None) -> RequirementResult:
    unit, meaning = REQUIREMENTS[requirement.name]
    if requirement.name == "area":
        demanded = requirement.limit or 0.0
        offered = float("nan") if area_ratio is None else area_ratio
        margin, bound, at_most = demanded / offered, "", True
        missing = "no area ratio: a footprint is not stated, or a side has no permitted point"
    else:
        chosen = scope.optimum or scope.relaxed
        found = standing(scope.run.problem, chosen.points if chosen is not None else _middle(scope.run), requirement)
        demanded, offered, margin = float(found.demanded[0]), float(found.offered[0]), float(found.margin[0])
        bound, at_most, missing = found.bound, found.at_most, "not stated in the parameter set"
    state, why = state_of(margin, bound, at_most)
    note = missing if np.isnan(offered) else why
    return RequirementResult(
        requirement.name, requirement.kind, state, demanded, offered, margin, unit, meaning, state == "pass", note
    )


def _middle(run: SideRun) -> Points:
    grid = run.grid(run.combinations[0])
    able = np.flatnonzero(grid.able[0])
    column = int(able[len(able) // 2]) if len(able) else 0
    return take_columns(grid, np.array([column]))


def _pointwise(scope: _Scope, requirement: Requirement) -> RequirementResult:
    note = ""
    if scope.optimum is not None:
        at = scope.margin_at(scope.optimum.points, requirement)
        if np.isnan(at):
            note = NOT_STATED
    else:
        at, note = scope.best_margin(requirement)
    passes = any(bool(np.any(on.margin[on.permitted] >= 1.0)) for on in scope.grid_margins(requirement))
    state, _ = state_of(at)
    unit, meaning = REQUIREMENTS[requirement.name]
    demanded = (
        float(deadline(scope.run.problem, requirement)[0, 0])
        if requirement.name == "deadline"
        else float(requirement.limit or 0.0)
    )
    offered = _offered(demanded, at, requirement.name in AT_MOST)
    return RequirementResult(
        requirement.name,
        requirement.kind,
        state,
        demanded,
        offered,
        at,
        unit,
        meaning,
        passes or (scope.optimum is not None and state == "pass"),
        note,
    )


def _offered(demanded: float, margin: float, at_most: bool) -> float:
    """What the side offers, from the margin; nan where a limit of 0 hides it."""
    with np.errstate(divide="ignore", invalid="ignore"):
        offered = np.float64(demanded) / margin if at_most else np.float64(demanded) * margin
    return float(offered)
