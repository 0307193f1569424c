"""The closed-form delay beside the transient of the same switches, at the points a verdict rests on (layer 7)."""

from __future__ import annotations

from benchmark.circuits.operation import estimate
from benchmark.decide.compare import SideOutcome
from benchmark.evaluate.search import SideRun

__all__ = ["delay_factor"]


def delay_factor(run: SideRun, side: SideOutcome) -> float:
    """Return the factor F of the delay rule at a side's optimum (mean of both edges of the first critical net)."""
    problem = run.problem
    points = side.optimum.points
    pair = problem.switches(points.supply[:1], points.threshold_shift)
    metrics = estimate(problem.circuit, pair, problem.wires, problem.study.delay_rule, size=points.size)
    stage = metrics.stages[0]
    return float(0.5 * (stage.falling.factor.ravel()[0] + stage.rising.factor.ravel()[0]))
