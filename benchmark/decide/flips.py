"""The value of one input at which the advantage equals the required one (layer 7)."""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from benchmark.catalogue import QUANTITIES
from benchmark.decide.compare import Comparison
from benchmark.decide.verdict import InputMove
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.side import values_by_key
from benchmark.sets.study import NodePair, Study
from benchmark.units import from_si, parse_unit

__all__ = ["with_flips"]

#: log advantage that stands for "infeasible" in the search: far below any finite one
INFEASIBLE = -700.0
#: relative tolerance of a flip value
TOLERANCE = 1.0e-6


def with_flips(
    study: Study, pair: NodePair, policy: str, frozen: Mapping[str, tuple[float, float]], moves: Sequence[InputMove]
) -> list[InputMove]:
    """Fill in ``flip`` of every straddling input, all of them searched at once.

    Each input is moved alone from its best estimate towards the end of its range that lies on the other side of
    the required advantage; both sides are re-optimised at every step. Bracketed root finding on the logarithm of the
    advantage (scipy.optimize.elementwise.find_root). Where the advantage jumps because a side becomes infeasible,
    the flip is the last value before the jump.
    """
    from scipy.optimize import elementwise

    straddling = [move for move in moves if move.straddles]
    if not straddling:
        return list(moves)
    values = values_by_key(study, pair)
    best = np.array([float(values[move.key].si[0]) for move in straddling])
    ends = np.array([_far_end(move, values, study.required_advantage) for move in straddling])
    target = float(np.log(study.required_advantage))

    def difference(x: NDArray[np.float64], index: NDArray[np.int64]) -> NDArray[np.float64]:
        x, index = np.broadcast_arrays(x, index)
        shape, flat, which = x.shape, x.ravel(), index.ravel().astype(int)
        batch = Batch.one_at_a_time(
            (straddling[i].key, float(best[i]), float(moved)) for i, moved in zip(which, flat, strict=True)
        )
        advantage = Comparison(study, pair, batch, frozen=frozen).outcome(policy).advantage[1:]
        with np.errstate(invalid="ignore"):
            found = np.where(
                np.isfinite(advantage), np.log(np.where(np.isfinite(advantage), advantage, 1.0)), INFEASIBLE
            )
        return np.asarray(found - target).reshape(shape)

    result = elementwise.find_root(
        difference,
        (best, ends),
        args=(np.arange(len(straddling)),),
        tolerances={"xrtol": TOLERANCE, "fatol": 1e-9},
        maxiter=60,
    )
    flips = {
        move.key: from_si(float(x), parse_unit(QUANTITIES[move.name].unit)) if ok else float("nan")
        for move, x, ok in zip(straddling, result.x, result.success, strict=True)
    }
    return [dataclasses.replace(move, flip=flips.get(move.key, move.flip)) for move in moves]


def _far_end(move: InputMove, values: Mapping[str, object], required: float) -> float:
    """SI value of the end of the range on the other side of M than the best estimate."""
    spread = values[move.key].spread  # type: ignore[attr-defined]
    low_reaches = move.advantage_low >= required
    high_reaches = move.advantage_high >= required
    # one end differs from the best estimate, or both do: take the nearer one in advantage
    if low_reaches == high_reaches:
        return float(spread.low[0])
    return float(spread.low[0] if low_reaches != move.best_reaches else spread.high[0])
