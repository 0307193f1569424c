"""Where a falling transfer curve has slope -1, and its steepest point, by repeated refinement (layer 5).

A curve is seen as its nodes: position u and output y, both fractions of the supply, with the steepness
s = |dy/du| of each interval. A *corner* is the first u at which s reaches 1; it is bracketed by three nodes, the first
interval less steep than 1, the second at least 1 (by the mean value theorem the point of slope 1 lies within). The
*peak* is the steepest interval with the steeper of its neighbours.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from benchmark.devices.record import Array, BoolArray

__all__ = ["corner", "corner_start", "peak_start", "steepness", "triple"]

Index = NDArray[np.intp]

_FLAT = 1e-12


def steepness(u: Array, y: Array) -> Array:
    """Return |dy/du| of the intervals along the last axis."""
    return np.asarray(np.abs(np.diff(y, axis=-1)) / np.diff(u, axis=-1))


def corner_start(s: Array) -> tuple[Index, BoolArray, BoolArray]:
    """Return the first node of the corner's triple, whether there is a corner, whether it lies before the first node.

    ``s`` has the intervals on its last axis (at least 2).
    """
    steep = s >= 1.0
    first = np.argmax(steep, axis=-1)
    exists: BoolArray = np.asarray(steep.any(axis=-1))
    start: Index = np.clip(first - 1, 0, s.shape[-1] - 2)
    at_edge: BoolArray = np.asarray(exists & (first == 0))
    return start, exists, at_edge


def peak_start(s: Array) -> Index:
    """Return the first node of the triple that holds the steepest interval and the steeper of its neighbours."""
    best = np.argmax(s, axis=-1)
    last = s.shape[-1] - 1

    def at(index: Index) -> Array:
        inside = (index >= 0) & (index <= last)
        value = np.take_along_axis(s, np.clip(index, 0, last)[..., None], axis=-1)[..., 0]
        return np.asarray(np.where(inside, value, -1.0))

    return np.asarray(np.where(at(best - 1) >= at(best + 1), best - 1, best))


def triple(values: Array, start: Index) -> Array:
    """Return the three nodes from ``start`` on: shape of ``start`` plus (3,)."""
    index = start[..., None] + np.arange(3)
    return np.asarray(np.take_along_axis(values, index, axis=-1))


def corner(u: Array, y: Array) -> tuple[Array, Array]:
    """Return u and y of slope 1 inside a triple.

    ln s is taken as straight between the middles of the two intervals; y is carried from the middle node with that
    steepness, so a jump of y in the second interval does not spoil it.
    """
    log_s = np.log(np.maximum(steepness(u, y), _FLAT))
    middle = 0.5 * (u[..., :-1] + u[..., 1:])
    width = middle[..., 1] - middle[..., 0]
    rise = np.maximum(log_s[..., 1] - log_s[..., 0], _FLAT)
    share = np.clip(-log_s[..., 0] / rise, 0.0, 1.0)
    position = middle[..., 0] + share * width
    halfway = 0.5 * (position + u[..., 1])
    local = log_s[..., 0] + rise * (halfway - middle[..., 0]) / width
    direction = np.sign(y[..., 2] - y[..., 0])
    output = y[..., 1] + direction * np.exp(np.minimum(local, 0.0)) * (position - u[..., 1])
    return np.asarray(position), np.asarray(output)
