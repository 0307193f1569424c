"""Elasticities of the advantage: at the points the verdict rests on, and with both sides re-optimised (layer 7).

    e = d ln A / d ln x, from a step of half a per cent to each side

At the point, supplies and choices stay those of the best estimate; re-optimised, each side finds its best supply again,
and a contender that was not the strongest may become so. The two differ where an optimum sits on a limit. A third and a
fourth number are the elasticities of time and energy of the side the input belongs to, at the point (of the candidate,
for inputs both sides share). None of them says how much an input matters: that depends on its range.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchmark.catalogue import QUANTITIES
from benchmark.decide.compare import Comparison, Outcome
from benchmark.decide.policies import metric_of
from benchmark.decide.strongest import strongest_outcome
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.points import Points, design_points
from benchmark.evaluate.search import SideRun
from benchmark.evaluate.side import keys_of, values_by_key
from benchmark.sets.study import Choice, NodePair, Study
from benchmark.sets.values import Value

__all__ = ["STEP", "Elasticity", "elasticities"]

Array = NDArray[np.float64]
#: relative step to each side
STEP = 0.005


@dataclass(frozen=True)
class Elasticity:
    """Elasticities of one input; nan where a step has no permitted point or number."""

    key: str
    at_point: float
    reoptimised: float
    of_time: float
    of_energy: float


def elasticities(
    study: Study, pair: NodePair, outcome: Outcome, frozen: Mapping[str, Choice], keys: Sequence[str]
) -> list[Elasticity]:
    """Return the elasticities of some inputs at the best estimate.

    Parameters
    ----------
    study : Study
    pair : NodePair
    outcome : Outcome
        Of the primary policy; its row 0 is the best estimate.
    frozen : mapping
        Choices that are kept.
    keys : sequence of str
        Ledger keys. Counts, values of 0, and values of contenders that are not the strongest are left out.
    """
    strongest = outcome.strongest_side
    if strongest is None or not outcome.candidate.found[0]:
        return []
    if 0.0 in (strongest.metric[0], outcome.candidate.metric[0]):
        return []  # a side that costs nothing has no ratio
    values = values_by_key(study, pair)
    listed = [key for key in keys if key in values and _has(study, pair, strongest.id, key, values[key])]
    if not listed:
        return []
    moves = [(key, float(values[key].si[0]), float(values[key].si[0]) * (1.0 + s)) for key in listed for s in _STEPS]
    comparison = Comparison(study, pair, Batch.one_at_a_time(moves), frozen=frozen)
    rival = comparison.contenders[strongest.id]
    mine, theirs = (
        _at_point(comparison, run, points, frozen)
        for run, points in (
            (comparison.candidate, outcome.candidate.optimum.points),
            (rival, strongest.optimum.points),
        )
    )
    metric = study.policy.metric
    fixed = comparison.widen(rival, metric_of(metric, theirs)) / comparison.widen(
        comparison.candidate, metric_of(metric, mine)
    )
    moved = strongest_outcome(comparison, outcome.policy).advantage
    candidate_time, candidate_energy = (comparison.widen(comparison.candidate, a) for a in (mine.time, mine.energy))
    rival_time, rival_energy = (comparison.widen(rival, a) for a in (theirs.time, theirs.energy))
    concerns = keys_of(pair, study.candidate, "candidate")
    found = []
    for position, key in enumerate(listed):
        rows = (1 + 2 * position, 2 + 2 * position)
        time, energy = (candidate_time, candidate_energy) if concerns(key) else (rival_time, rival_energy)
        found.append(
            Elasticity(
                key,
                _slope(fixed[:, 0], rows),
                _slope(moved, rows),
                _slope(time[:, 0], rows),
                _slope(energy[:, 0], rows),
            )
        )
    return found


_STEPS = (-STEP, STEP)


def _has(study: Study, pair: NodePair, strongest: str, key: str, value: Value) -> bool:
    """Tell whether an input can have an elasticity here."""
    si = float(value.si[0])
    quantity = QUANTITIES[value.name]  # a layer of a circuit file calls it otherwise
    if si == 0.0 or quantity.domain == "count" or not quantity.allows(si * (1.0 + STEP)):
        return False
    sides = [side for side in study.contenders if side.id == strongest]
    return keys_of(pair, study.candidate, "candidate")(key) or keys_of(pair, sides[0], "contender")(key)


def _at_point(comparison: Comparison, run: SideRun, points: Points, frozen: Mapping[str, Choice]) -> Points:
    """Every row of a side at the supply of the best estimate."""
    return design_points(run.problem, points.supply[:1], *frozen[comparison.key(run)])


def _slope(values: Array, rows: tuple[int, int]) -> float:
    low, high = float(values[rows[0]]), float(values[rows[1]])
    if not (np.isfinite(low) and np.isfinite(high) and low > 0.0 and high > 0.0):
        return float("nan")
    return float((np.log(high) - np.log(low)) / (np.log1p(STEP) - np.log1p(-STEP)))
