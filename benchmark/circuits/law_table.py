"""A current law at one design point as fast scalar functions, for the transient solver (layer 5).

The record's ``current`` works on arrays; an ODE solver asks for one value at a time, some ten thousand times. The law
is tabulated once as ln(I / path) over the control voltage (monotone cubic) and sqrt(path) (cubic spline), both as
fractions of the supply. ``error`` compares table and law at the middles of all cells.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from math import exp, sqrt

import numpy as np
from scipy.interpolate import CubicSpline, PchipInterpolator

from benchmark.devices.record import Array, Switch

__all__ = ["LARGEST_TABLE_ERROR", "ScalarLaw", "scalar_law"]

#: beyond this the table is not used; a jump of the law always ends up here
LARGEST_TABLE_ERROR = 0.01

_CONTROLS = 1025
_PATHS = 33
_FIRST = 0.01  # sqrt of the first path node; below it the conductance is constant
_NO_CURRENT = 1e-300


@dataclass(frozen=True)
class ScalarLaw:
    """I [A] of control and path, both as fractions of the supply in [0, 1]; ``error`` of ln I; tabulated or direct."""

    current: Callable[[float, float], float]
    error: float
    tabulated: bool


def _log_conductance(switch: Switch, supply: float, level: Array, path: Array) -> Array:
    """Return ln(I/path) on the product of two axes, shape (levels, paths)."""
    control, across = np.repeat(level, len(path)), np.tile(path, len(level))
    current = np.asarray(switch.current(control * supply, across * supply), dtype=np.float64)
    value = np.log(np.maximum(current, _NO_CURRENT) / across)
    return np.asarray(value.reshape(len(level), len(path)))


def _direct(switch: Switch, supply: float) -> Callable[[float, float], float]:
    law = switch.current

    def current(level: float, path: float) -> float:
        # beyond the rails by a rounding of the solver: the conductance at the rail
        inside = min(max(path, 1e-12), 1.0)
        value = law(np.array([level * supply]), np.array([inside * supply]))
        return float(np.asarray(value).ravel()[0]) * path / inside

    return current


def _tabulated(value: Array, by_level: Array, by_root: Array) -> Callable[[float, float], float]:
    """Return the bicubic law; the derivatives come multiplied by the spacing of their axis."""
    v, dl, dr = value.tolist(), by_level.tolist(), by_root.tolist()
    rows, columns = len(v) - 1, len(v[0]) - 1
    scale = columns / (1.0 - _FIRST)

    def current(level: float, path: float) -> float:
        x = level * rows
        i = min(int(x), rows - 1)
        x -= i
        root = sqrt(path) if path > 0.0 else 0.0
        y = (min(max(root, _FIRST), 1.0) - _FIRST) * scale
        j = min(int(y), columns - 1)
        y -= j
        y2 = y * y
        y3 = y2 * y
        h01 = 3.0 * y2 - 2.0 * y3
        h10 = y - 2.0 * y2 + y3
        h11 = y3 - y2
        a, b, da, db = v[i], v[i + 1], dr[i], dr[i + 1]
        p = a[j] + h01 * (a[j + 1] - a[j]) + h10 * da[j] + h11 * da[j + 1]
        q = b[j] + h01 * (b[j + 1] - b[j]) + h10 * db[j] + h11 * db[j + 1]
        ma, mb = dl[i], dl[i + 1]
        m = ma[j] + y * (ma[j + 1] - ma[j])
        n = mb[j] + y * (mb[j + 1] - mb[j])
        x2 = x * x
        x3 = x2 * x
        log = p + (3.0 * x2 - 2.0 * x3) * (q - p) + (x - 2.0 * x2 + x3) * m + (x3 - x2) * n
        return exp(log) * path

    return current


def scalar_law(switch: Switch, supply: float) -> ScalarLaw:
    """Return the law of one switch at one design point; the table where it is good to 1 %, else the law itself."""
    level = np.linspace(0.0, 1.0, _CONTROLS)
    root = np.linspace(_FIRST, 1.0, _PATHS)
    value = _log_conductance(switch, supply, level, root**2)
    by_level = np.asarray(PchipInterpolator(level, value, axis=0).derivative()(level)) / (_CONTROLS - 1)
    by_root = np.asarray(CubicSpline(root, value, axis=1).derivative()(root)) * (root[1] - root[0])
    table = _tabulated(value, by_level, by_root)

    middle_level = 0.5 * (level[:-1] + level[1:])
    middle_path = (0.5 * (root[:-1] + root[1:])) ** 2
    true = _log_conductance(switch, supply, middle_level, middle_path)
    a, b = value[:-1], value[1:]
    rough = _middle(a, by_root[:-1]), _middle(b, by_root[1:])
    slopes = 0.5 * (by_level[:, :-1] + by_level[:, 1:])
    found = 0.5 * (rough[0] + rough[1]) + 0.125 * (slopes[:-1] - slopes[1:])
    error = float(np.abs(found - true).max())
    if error <= LARGEST_TABLE_ERROR:
        return ScalarLaw(table, error, True)
    return ScalarLaw(_direct(switch, supply), 0.0, False)


def _middle(value: Array, slope: Array) -> Array:
    """Return cubic Hermite values at the middles along the last axis."""
    mean = 0.5 * (value[:, :-1] + value[:, 1:])
    return np.asarray(mean + 0.125 * (slope[:, :-1] - slope[:, 1:]))
