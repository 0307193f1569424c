"""What to say loudly about a result that is no problem of the files (layer 7)."""

from __future__ import annotations

import math

import numpy as np

from benchmark.circuits.operation import estimate
from benchmark.decide.compare import Comparison, Outcome, SideOutcome
from benchmark.decide.policies import PRESCRIBED
from benchmark.decide.requirements import STANDING, functional_condition, margins_at, standing
from benchmark.decide.verdict import Verdict
from benchmark.evaluate.search import SideRun

__all__ = ["result_warnings"]

#: half swing over sqrt(kT/C) at which C V^2 equals k T ln 2: C V^2 = 4 x^2 k T (Landauer's least heat of erasing a bit)
ERASURE_RATIO = 0.5 * math.sqrt(math.log(2.0))
#: relative difference that is rounding
ROUNDING = 1.0e-9


def result_warnings(comparison: Comparison, outcome: Outcome, verdict: Verdict) -> list[str]:
    """Return the warnings of the headline pair, one sentence each."""
    study = comparison.study
    sides = [(outcome.candidate, comparison.candidate)]
    sides += [(side, comparison.contenders[side.id]) for side in outcome.contenders]
    found = []
    for side, run in sides:
        if side.found[0]:
            found += _of_side(side, run)
    for side, run in sides[1:]:
        if side.found[0]:
            found += _kept(side, run)
    searched = any(run.problem.side.supply[0] < run.problem.side.supply[1] for _, run in sides)
    if searched and outcome.policy not in PRESCRIBED and not functional_condition(study):
        found.append(
            "no hard noise margin or voltage gain bounds the search of the supply: what is found may not work as logic"
        )
    if np.isfinite(verdict.advantage) and not 1e-3 <= verdict.advantage <= 1e3:
        found.append(f"the advantage is {verdict.advantage:.3g}: check units first")
    decisive = [move for move in verdict.moves if move.decisive]
    weak = [move for move in decisive if move.evidence in ("target", "projected", "assumed")]
    if decisive and len(weak) * 3 > len(decisive):
        found.append(f"{len(weak)} of {len(decisive)} decisive inputs are targets, projections or assumptions")
    return found


def _of_side(side: SideOutcome, run: SideRun) -> list[str]:
    found = []
    best = side.optimum
    if best.at_lower[0] or best.at_upper[0]:
        end = "lower" if best.at_lower[0] else "upper"
        found.append(f"{side.id}: the optimum lies on the {end} end of its supply range")
    if best.points.noise_ratio[0, 0] < ERASURE_RATIO:
        found.append(f"{side.id}: C V^2 of a net is below k T ln 2, the least heat of erasing a bit")
    if _ahead_of_sound(side, run):
        found.append(
            f"{side.id}: a stage is faster than sound crosses the moving body of its switch; the two-pole of the delay "
            "rule answers before the wave arrives"
        )
    return found


def _ahead_of_sound(side: SideOutcome, run: SideRun) -> bool:
    """Tell whether an edge on the path is faster than the switch that makes it can be: h / v of its moving body.

    Closed-form rules add the time of flight; rules that follow the actuator as a two-pole do not know it.
    """
    problem, best = run.problem, side.optimum.points
    supply, shift = best.supply[:1], problem.device_shift(best.threshold_shift, best.back_bias[:1])
    pair = problem.switches(supply, shift, depth=problem.circuit_depth)
    if not any(np.isfinite(switch.natural_frequency).any() for switch in (pair.down, pair.up)):
        return False
    metrics = estimate(
        problem.circuit_at(supply, best.size, shift),
        pair,
        problem.wires,
        problem.study.delay_rule,
        size=best.size,
        size_as=problem.size_as,
        short_circuit=False,
    )
    return any(
        bool(np.any(edge.delay < switch.closing_time * (1.0 - ROUNDING)))
        for stage in metrics.stages
        if np.any(np.asarray(stage.net.on_critical_path) > 0.0)
        for edge, switch in ((stage.falling, pair.down), (stage.rising, pair.up))
    )


def _kept(side: SideOutcome, run: SideRun) -> list[str]:
    """Requirements that a contender is not known to meet: it stays a rival, so that the reference is not weakened."""
    found = []
    for requirement in run.problem.study.requirements.values():
        if requirement.name in STANDING:
            if requirement.name != "area" and standing(run.problem, side.optimum.points, requirement).margin[0] < 1.0:
                found.append(f"contender {side.id} does not meet {requirement.name} as stated; it stays a rival")
            continue
        margin = margins_at(run.problem, side.optimum.points, requirement)
        if margin is not None and np.isnan(margin).any():
            found.append(f"contender {side.id} cannot be judged on {requirement.name}; it stays a rival")
    return found
