"""The value of one input at which the advantage equals the required one (layer 7)."""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from benchmark.catalogue import QUANTITIES
from benchmark.decide.compare import Comparison
from benchmark.decide.moves import InputMove, permitted_advantage, range_of, reaches
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.side import values_by_key
from benchmark.sets.study import Choice, NodePair, Study
from benchmark.units import from_si, parse_unit

__all__ = ["with_flips"]

#: log advantage that stands for "infeasible" in the search: far below any finite one
INFEASIBLE = -700.0
#: relative tolerance of a flip value
TOLERANCE = 1.0e-6


def with_flips(
    study: Study, pair: NodePair, policy: str, frozen: Mapping[str, Choice], moves: Sequence[InputMove]
) -> list[InputMove]:
    """Fill in the flips of every straddling input, all of them searched at once.

    Each input is moved alone from its best estimate towards every end of its range that lies on the other side of
    the required advantage; both sides are re-optimised at every step. Bracketed root finding on the logarithm of the
    advantage (scipy.optimize.elementwise.find_root). Where the advantage jumps because a side becomes infeasible,
    the flip is the last value before the jump.
    """
    from scipy.optimize import elementwise

    values = values_by_key(study, pair)
    wanted: list[tuple[str, str, float, float]] = []  # key, field, best, end
    for move in moves:
        if not move.straddles:
            continue
        best = float(values[move.key].si[0])
        ends = range_of(values[move.key]) or (best, best)
        for name, advantage, end in zip(
            ("flip_low", "flip_high"), (move.advantage_low, move.advantage_high), ends, strict=True
        ):
            if reaches(advantage, study.required_advantage) != move.best_reaches:
                wanted.append((move.key, name, best, end))
    if not wanted:
        return list(moves)
    target = float(np.log(study.required_advantage))

    def difference(x: NDArray[np.float64], index: NDArray[np.int64]) -> NDArray[np.float64]:
        x, index = np.broadcast_arrays(x, index)
        shape, flat, which = x.shape, x.ravel(), index.ravel().astype(int)
        batch = Batch.one_at_a_time(
            (wanted[i][0], wanted[i][2], float(moved)) for i, moved in zip(which, flat, strict=True)
        )
        comparison = Comparison(study, pair, batch, frozen=frozen)
        advantage = permitted_advantage(comparison, comparison.outcome(policy))[1:]
        with np.errstate(divide="ignore"):
            log = np.log(np.where(advantage > 0.0, advantage, 1.0))
        found = np.where(advantage > 0.0, np.clip(log, INFEASIBLE, -INFEASIBLE), INFEASIBLE)
        return np.asarray(found - target).reshape(shape)

    result = elementwise.find_root(
        difference,
        (np.array([item[2] for item in wanted]), np.array([item[3] for item in wanted])),
        args=(np.arange(len(wanted)),),
        tolerances={"xrtol": TOLERANCE, "fatol": 1e-9},
        maxiter=60,
    )
    flips: dict[str, dict[str, float]] = {}
    for (key, name, _, _), x, ok in zip(wanted, result.x, result.success, strict=True):
        unit = parse_unit(QUANTITIES[values[key].name].unit)
        flips.setdefault(key, {})[name] = from_si(float(x), unit) if ok else float("nan")
    return [
        dataclasses.replace(
            move,
            flip_low=flips.get(move.key, {}).get("flip_low", move.flip_low),
            flip_high=flips.get(move.key, {}).get("flip_high", move.flip_high),
        )
        for move in moves
    ]
