"""Why a side has no permitted point under a policy, with the nearest it can reach (layer 7)."""

from __future__ import annotations

import numpy as np

from benchmark.decide.requirements import cheap_condition, functional_condition, functional_mask
from benchmark.evaluate.points import Points
from benchmark.evaluate.search import Condition, SideRun, minimise
from benchmark.evaluate.side import SideProblem

__all__ = ["why_infeasible"]


def why_infeasible(policy: str, run: SideRun, required_time: float | None, required_energy: float | None) -> str:
    """Return one sentence for the best estimate (row 0): the nearest permitted point, or what is missing.

    Parameters
    ----------
    policy : str
    run : SideRun
    required_time : float or None [s]
    required_energy : float or None [J]
    """
    costly: Condition | None = functional_mask if functional_condition(run.problem.study) else None

    def nearest(attribute: str) -> tuple[float, float] | None:
        def objective(problem: SideProblem, points: Points) -> np.ndarray:
            return np.asarray(getattr(points, attribute))

        best = minimise(run, objective, cheap_condition, costly)
        return (float(best.value[0]), float(best.points.supply[0, 0])) if best.found[0] else None

    fastest = nearest("time")
    if fastest is None:
        return _nothing_permitted(run)
    if policy in ("iso-delay", "minimum-energy") and required_time is not None and fastest[0] > required_time:
        return (
            f"cannot reach {required_time:.4g} s per operation; "
            f"fastest permitted point {fastest[0]:.4g} s at {fastest[1]:.4g} V"
        )
    if policy == "iso-energy" and required_energy is not None:
        frugal = nearest("energy")
        if frugal is not None:
            return (
                f"cannot reach {required_energy:.4g} J per operation; "
                f"least permitted energy {frugal[0]:.4g} J at {frugal[1]:.4g} V"
            )
    return "the prescribed supply is not a permitted point"


def _nothing_permitted(run: SideRun) -> str:
    """Name the commonest reason that makes points unusable, or the requirements."""
    counts: dict[str, int] = {}
    for combination in run.combinations:
        for reason, mask in run.grid(combination).infeasible.items():
            counts[reason] = counts.get(reason, 0) + int(np.asarray(mask)[0].sum())
    points = sum(run.grid(combination).energy.shape[1] for combination in run.combinations)
    if counts and max(counts.values()) == points:
        return f"no permitted point: {max(counts, key=lambda name: counts[name])}"
    return "no point of the supply range meets all hard requirements"
