"""Functional floor at design points: noise margin and gain, worst over the study's temperatures (layer 6)."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchmark.circuits.functional import functional
from benchmark.evaluate.points import Points
from benchmark.evaluate.side import SideProblem

__all__ = ["FunctionalPoints", "functional_points"]

Array = NDArray[np.float64]
#: design points evaluated at once, to keep the working set small
BLOCK_POINTS = 2048


@dataclass(frozen=True)
class FunctionalPoints:
    """Worst noise margin (fraction of the supply), gain, levels over temperatures; shape (row, supply)."""

    noise_margin: Array
    gain: Array
    output_low: Array
    output_high: Array
    error: Array


def functional_points(problem: SideProblem, points: Points, fan_in: int) -> FunctionalPoints:
    """Evaluate the functional floor of ``fan_in``-input gates.

    nan where the pair does not switch, and everywhere when the technology states fewer switches in series than the
    gate needs: such a gate cannot be built, so it meets no floor.
    """
    rows, supplies = points.supply.shape
    step = max(1, BLOCK_POINTS // (max(rows, problem.batch.rows) * len(problem.study.temperatures)))
    shift = problem.device_shift(points.threshold_shift, points.back_bias)
    pieces = []
    for start in range(0, supplies, step):
        part = points.supply[:, start : start + step]
        pair = problem.switches(part, shift if np.ndim(shift) == 0 else np.asarray(shift)[:, start : start + step])
        shape = (rows, len(problem.study.temperatures), part.shape[1])
        if fan_in > min(pair.down.stack_on.shape[-1], pair.up.stack_on.shape[-1]):
            pieces.append([np.full(shape, np.nan)] * 5)
            continue
        found = functional(pair, fan_in)
        pieces.append(
            [
                np.broadcast_to(array, shape)
                for array in (
                    found.noise_margin,
                    found.gain,
                    found.v_ol / found.supply,
                    found.v_oh / found.supply,
                    found.error,
                )
            ]
        )
    margin, gain, low, high, error = (np.concatenate(arrays, axis=2) for arrays in zip(*pieces, strict=True))
    return FunctionalPoints(
        np.asarray(margin.min(axis=1)),
        np.asarray(gain.min(axis=1)),
        np.asarray(low.max(axis=1)),
        np.asarray(high.min(axis=1)),
        np.asarray(error.max(axis=1)),
    )
