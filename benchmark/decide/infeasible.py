"""Why a side has no permitted point under a policy, with the nearest it can reach (layer 7)."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from benchmark.decide.policies import PRESCRIBED, PolicyInputs, prescribed
from benchmark.decide.requirements import (
    FunctionalFloor,
    HardLimits,
    Meets,
    functional_at,
    functional_condition,
    hard_conditions,
)
from benchmark.decide.wording import apart
from benchmark.evaluate.points import Points
from benchmark.evaluate.search import Condition, SideRun, minimise
from benchmark.evaluate.side import SideProblem

__all__ = ["why_infeasible"]

Mask = NDArray[np.bool_]


def why_infeasible(policy: str, run: SideRun, inputs: PolicyInputs) -> str:
    """Return one sentence for the best estimate (row 0): the nearest permitted point, or what is missing.

    Parameters
    ----------
    policy : str
    run : SideRun
    inputs : PolicyInputs
        What the policy asked for.
    """
    if policy in PRESCRIBED:
        return _prescribed(policy, run, inputs)
    study = run.problem.study
    costly: Condition | None = FunctionalFloor() if functional_condition(study) else None

    def nearest(attribute: str) -> tuple[float, float] | None:
        def objective(problem: SideProblem, points: Points) -> np.ndarray:
            return np.asarray(getattr(points, attribute))

        best = minimise(run, objective, hard_conditions(study), costly)
        return (float(best.value[0]), float(best.points.supply[0, 0])) if best.found[0] else None

    fastest = nearest("interval")
    if fastest is None:
        return _nothing_permitted(run)
    if policy in ("iso-delay", "minimum-energy") and inputs.required_time is not None:
        required = float(run.problem.batch.own(inputs.required_time)[0, 0])
        if np.isnan(required):
            return ""  # nothing is wrong with this side: the required time itself is not known
        if fastest[0] > required:
            reached, asked = apart(fastest[0], required)
            return f"cannot reach {asked} s per operation; fastest permitted point {reached} s at {fastest[1]:.4g} V"
    if policy == "iso-energy" and inputs.required_energy is not None:
        frugal = nearest("energy")
        if frugal is not None and frugal[0] > inputs.required_energy:
            reached, asked = apart(frugal[0], inputs.required_energy)
            return f"cannot reach {asked} J per operation; least permitted energy {reached} J at {frugal[1]:.4g} V"
    return "no permitted point was found"


def _prescribed(policy: str, run: SideRun, inputs: PolicyInputs) -> str:
    """Everything that speaks against the one point of the policy."""
    points = prescribed(policy, run, inputs)
    volts = float(points.supply[0, 0])
    low, high = run.problem.side.supply
    if not np.isfinite(volts):
        return "no supply is declared"
    reasons = [reason for reason, mask in points.infeasible.items() if np.asarray(mask)[0, 0]]
    if not low * (1 - 1e-12) <= volts <= high * (1 + 1e-12):
        reasons.append(f"outside the supply range of the study, {low:.4g} to {high:.4g} V")
    if points.able[0, 0]:
        reasons += _unmet(run, points)
    listed = "; ".join(reasons) or "cannot be evaluated"
    return f"the prescribed supply of {volts:.4g} V is not a permitted point: {listed}"


def _unmet(run: SideRun, points: Points) -> list[str]:
    """Hard conditions that no able point of row 0 meets."""
    able = points.able
    found = [
        part.label
        for part in hard_conditions(run.problem.study).parts
        if isinstance(part, (Meets, HardLimits)) and not (able & part(run, points, able))[0].any()
    ]
    wanted = [
        requirement
        for requirement in run.problem.study.requirements.values()
        if requirement.kind == "hard" and requirement.name in ("noise_margin", "voltage_gain")
    ]
    for name, margin in functional_at(run.problem, points, wanted).items():
        if not (margin[0][able[0]] >= 1.0).any():
            found.append(f"requirement {name}")
    return found


def _nothing_permitted(run: SideRun) -> str:
    """Name what makes every point unusable, or the requirements that no point meets."""
    grids = [run.grid(combination) for combination in run.combinations]
    if not any(grid.able[0].any() for grid in grids):
        counts: dict[str, int] = {}
        for grid in grids:
            for reason, mask in grid.infeasible.items():
                counts[reason] = counts.get(reason, 0) + int(np.asarray(mask)[0].sum())
        worst = max(counts, key=lambda name: counts[name], default="no supply can be evaluated")
        return f"no permitted point: {worst}"
    unmet = [set(_unmet(run, grid)) for grid in grids if grid.able[0].any()]
    everywhere = sorted(set.intersection(*unmet))
    if everywhere:
        return f"no point of the supply range meets {', '.join(everywhere)}"
    return "no point of the supply range meets all hard requirements together"
