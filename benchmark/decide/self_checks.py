"""Checks executed on the study's own data, printed in every report (layer 7)."""

from __future__ import annotations

import dataclasses
import math
from typing import Any

import numpy as np

from benchmark.decide.compare import Comparison, Outcome
from benchmark.evaluate.batch import Batch
from benchmark.sets.study import NodePair, Side, Study

__all__ = ["self_checks"]


def _with_sides(
    study: Study, candidate: Side, contender: Side, candidate_node: str, contender_node: str
) -> tuple[Study, NodePair]:
    contender = dataclasses.replace(contender, id="self-check contender")
    pair = study.pair(study.headline)
    pair = NodePair(pair.label, candidate_node, {contender.id: contender_node}, pair.wires, pair.wires_node)
    policy = study.policy
    if isinstance(policy.required_time, str) and policy.required_time.startswith("contender:"):
        policy = dataclasses.replace(policy, required_time=f"contender:{contender.id}")
    return dataclasses.replace(study, candidate=candidate, contenders=(contender,), policy=policy, pairs=(pair,)), pair


def _self_comparison(study: Study, side: Side, node: str) -> dict[str, Any]:
    pretend, pair = _with_sides(study, side, side, node, node)
    outcome = Comparison(pretend, pair, Batch.best_estimate()).outcome(study.policy.primary)
    advantage = float(outcome.advantage[0])
    if not outcome.candidate.found[0]:
        return {
            "name": f"self-comparison of {side.id}",
            "expected": "1 exactly",
            "obtained": "no permitted point",
            "passed": True,
        }
    return {
        "name": f"self-comparison of {side.id}",
        "expected": "1 exactly",
        "obtained": f"{advantage!r}",
        "passed": advantage == 1.0,
    }


def _swap(study: Study, outcome: Outcome) -> dict[str, Any] | None:
    strongest = outcome.strongest_side
    required = study.policy.required_time
    if (
        strongest is None
        or not outcome.candidate.found[0]
        or (isinstance(required, str) and required.startswith("contender:"))
    ):
        return None
    if 0.0 in (strongest.metric[0], outcome.candidate.metric[0]):
        return None  # a side that costs nothing has no ratio to turn round
    side = next(side for side in study.contenders if side.id == strongest.id)
    pair = study.pair(study.headline)
    pretend, swapped = _with_sides(study, side, study.candidate, pair.reference[side.id], pair.candidate)
    again = Comparison(pretend, swapped, Batch.best_estimate()).outcome(study.policy.primary)
    forward = float(strongest.metric[0] / outcome.candidate.metric[0])
    product = float(again.advantage[0]) * forward
    passed = abs(product - 1.0) <= np.finfo(float).eps
    return {
        "name": f"swap with {side.id}",
        "expected": "reciprocal within one unit in the last place",
        "obtained": f"product {product!r}",
        "passed": bool(passed),
    }


def _finer_grid(study: Study, outcome: Outcome) -> dict[str, Any] | None:
    if not np.isfinite(outcome.advantage[0]):
        return None
    finer = dataclasses.replace(study, supply_points=2 * study.supply_points - 1)
    again = Comparison(finer, study.pair(study.headline), Batch.best_estimate()).outcome(study.policy.primary)
    old, new = float(outcome.advantage[0]), float(again.advantage[0])
    change = 0.0 if new == old else new / old - 1.0 if old != 0.0 else math.inf  # a reference may cost nothing
    tolerance = min(max(1e-4, 100.0 * study.refine_relative), 1e-2)  # a coarse search must not excuse itself
    return {
        "name": "supply grid twice as fine",
        "expected": f"advantage unchanged within {tolerance:g}",
        "obtained": f"relative change {change:.3g}",
        "passed": abs(change) <= tolerance,
    }


def _parts(outcome: Outcome) -> dict[str, Any]:
    worst = 0.0
    for side in (outcome.candidate, *outcome.contenders):
        if side.found[0]:
            points = side.optimum.points
            energy = sum(float(part[0, 0]) for part in points.energy_parts.values())
            time = sum(float(part[0, 0]) for part in points.time_parts.values())
            worst = max(
                worst, abs(energy / float(points.energy[0, 0]) - 1.0), abs(time / float(points.time[0, 0]) - 1.0)
            )
    return {
        "name": "parts of energy and delay add up to the totals",
        "expected": "within 1e-12",
        "obtained": f"worst difference {worst:.2g}",
        "passed": worst <= 1e-12,
    }


def self_checks(study: Study, outcome: Outcome) -> list[dict[str, Any]]:
    """Run the checks at the headline pair under the primary policy."""
    pair = study.pair(study.headline)
    checks = [_self_comparison(study, study.candidate, pair.candidate)]
    checks += [
        _self_comparison(study, side, pair.reference[side.id]) for side in study.contenders if side.id in pair.reference
    ]
    checks += [check for check in (_swap(study, outcome), _finer_grid(study, outcome)) if check is not None]
    return [*checks, _parts(outcome)]
