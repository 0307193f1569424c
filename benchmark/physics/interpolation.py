"""Monotone, shape-preserving interpolation of measured points that never leaves the data (layer 3).

Piecewise cubic Hermite interpolation with the slopes of F. N. Fritsch and J. Butland, SIAM J. Sci. Stat. Comput. 5, 300
(1984) (weighted harmonic mean, zero at a turning point): it passes through the points, stays between neighbours and
is monotone where the data are. It is the flavour of scipy; other libraries follow F. N. Fritsch and R. E. Carlson,
SIAM J. Numer. Anal. 17, 238 (1980), and differ slightly between points. Outside the data the answer is nan: nothing is
extrapolated. A point inserted on the interpolant leaves it unchanged where the data are straight on their scale;
elsewhere the neighbouring slopes, and so the curve, move a little.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.interpolate import PchipInterpolator

__all__ = [
    "Curve",
    "charge_curve",
    "conflicting_points",
    "curve",
    "hermite_across",
    "interpolate",
    "inverse_temperature_weights",
    "outside",
]

Array = NDArray[np.float64]
BoolArray = NDArray[np.bool_]
Scale = Literal["linear", "log"]

#: a query this close to an end of the data (relative to the larger of span and end) counts as the end: rounding only
ROUNDING = 1.0e-9
#: a temperature this close to a given one counts as that one [K]
SAME_TEMPERATURE = 1.0e-6


def _slack(low: float, high: float) -> float:
    return ROUNDING * max(high - low, abs(low), abs(high))


def outside(query: ArrayLike, low: float, high: float) -> BoolArray:
    """Return where ``query`` lies outside the closed range, apart from rounding; nan counts as outside."""
    q = np.asarray(query, dtype=np.float64)
    slack = _slack(low, high)
    return ~((q >= low - slack) & (q <= high + slack))


@dataclass(frozen=True)
class Curve:
    """A monotone interpolant through points (``x`` rising, ``y``); build it with `curve`.

    ``scale`` log: interpolates log(y) along x. A curve of one point answers at that point only.
    """

    x: Array
    y: Array
    scale: Scale
    _fit: PchipInterpolator | None

    @property
    def low(self) -> float:
        """First abscissa."""
        return float(self.x[0])

    @property
    def high(self) -> float:
        """Last abscissa."""
        return float(self.x[-1])

    def outside(self, query: ArrayLike) -> BoolArray:
        """Return where the query leaves the data."""
        return outside(query, self.low, self.high)

    def __call__(self, query: ArrayLike) -> Array:
        """Return the interpolated value: exactly y at a point, nan outside the data."""
        q = np.asarray(query, dtype=np.float64)
        beyond = self.outside(q)
        inside = np.clip(np.where(beyond, self.low, q), self.low, self.high)
        index = np.minimum(np.searchsorted(self.x, inside), self.x.size - 1)
        value = self.y[index]
        if self._fit is not None:
            fitted = np.asarray(self._fit(inside), dtype=np.float64)
            fitted = np.exp(fitted) if self.scale == "log" else fitted
            value = np.where(self.x[index] == inside, value, fitted)
        return np.asarray(np.where(beyond, np.nan, value), dtype=np.float64)


def conflicting_points(x: ArrayLike, y: ArrayLike) -> Array:
    """Return the abscissas that occur with different ordinates (repeated equal points are no conflict)."""
    abscissa, ordinate = np.asarray(x, dtype=np.float64), np.asarray(y, dtype=np.float64)
    order = np.lexsort((ordinate, abscissa))
    a, b = abscissa[order], ordinate[order]
    return np.unique(a[1:][(a[1:] == a[:-1]) & (b[1:] != b[:-1])])


def curve(x: ArrayLike, y: ArrayLike, scale: Scale) -> Curve:
    """Return the monotone interpolant through the points, in any order; equal points may repeat.

    Parameters
    ----------
    x, y : array_like
        Points of one curve, shape (n,), finite; y above 0 when ``scale`` is log.
    scale : {"linear", "log"}
        Whether y or log(y) is interpolated along x.

    Raises
    ------
    ValueError
        No point, a point that is not finite, two ordinates at one abscissa, y not above 0 on a log scale.
    """
    abscissa, ordinate = np.asarray(x, dtype=np.float64), np.asarray(y, dtype=np.float64)
    if abscissa.size == 0 or not (np.isfinite(abscissa).all() and np.isfinite(ordinate).all()):
        problem = "a curve needs at least one point, and finite points only"
        raise ValueError(problem)
    if conflicting_points(abscissa, ordinate).size:
        problem = "two different ordinates at one abscissa"
        raise ValueError(problem)
    if scale == "log" and not (ordinate > 0.0).all():
        problem = "a log scale needs ordinates above 0"
        raise ValueError(problem)
    first = np.unique(abscissa, return_index=True)[1]
    xs, ys = abscissa[first], ordinate[first]
    fit = PchipInterpolator(xs, np.log(ys) if scale == "log" else ys) if xs.size > 1 else None
    return Curve(xs, ys, scale, fit)


def interpolate(x: ArrayLike, y: ArrayLike, scale: Scale, query: ArrayLike) -> Array:
    """Return `curve` (x, y, scale) at ``query``; nan outside the data."""
    return curve(x, y, scale)(query)


def charge_curve(voltage: ArrayLike, capacitance: ArrayLike) -> Curve:
    """Return Q(V), the charge from 0 to V, for a capacitance measured against voltage.

    The capacitance is taken as straight between its points, so the charge at each of them is the trapezoid sum; the
    charge itself is then interpolated (monotone).

    Parameters
    ----------
    voltage : array_like
        Voltages [V], shape (n,), covering 0.
    capacitance : array_like
        Differential capacitance dQ/dV [F, or F/m per width], above 0.

    Returns
    -------
    Curve
        Charge [C, or C/m], 0 at 0 V.

    Raises
    ------
    ValueError
        The voltages do not cover 0, or `curve` refuses the points.
    """
    points = curve(voltage, capacitance, "linear")
    if points.outside(0.0):
        problem = "the capacitance must be known from 0 V on"
        raise ValueError(problem)
    volts = np.union1d(points.x, [0.0])
    farads = np.interp(volts, points.x, points.y)
    charge = np.concatenate(([0.0], np.cumsum(0.5 * (farads[1:] + farads[:-1]) * np.diff(volts))))
    return curve(volts, charge - charge[volts == 0.0], "linear")


def hermite_across(knots: Array, values: Array, query: Array) -> Array:
    """Return the monotone interpolant across few knots whose ordinates differ from element to element.

    The same interpolant as `curve`, for ordinates that are arrays.

    Parameters
    ----------
    knots : ndarray
        Rising abscissas, shape (n,), n at least 2.
    values : ndarray
        Ordinates, shape (n, ...).
    query : ndarray
        Abscissa of each element, broadcasting against ``values[0]``; must lie within the knots.

    Returns
    -------
    ndarray
        Interpolated values.
    """
    step = np.diff(knots)
    wide = step.reshape(-1, *(1,) * (values.ndim - 1))
    secant = np.diff(values, axis=0) / wide
    slopes = _slopes(step, secant)
    index = np.clip(np.searchsorted(knots, query, side="right") - 1, 0, knots.size - 2)
    shape = np.broadcast_shapes(values.shape[1:], query.shape)
    index = np.broadcast_to(index, shape)[None]

    def pick(array: Array) -> Array:
        full = np.broadcast_to(array, (array.shape[0], *shape))
        return np.asarray(np.take_along_axis(full, index, axis=0)[0], dtype=np.float64)

    h = step[index[0]]
    t = (query - knots[index[0]]) / h
    u = 1.0 - t
    y0, y1, d0, d1 = pick(values[:-1]), pick(values[1:]), pick(slopes[:-1]), pick(slopes[1:])
    return np.asarray(u * u * ((1.0 + 2.0 * t) * y0 + t * h * d0) + t * t * ((3.0 - 2.0 * t) * y1 - u * h * d1))


def _slopes(step: Array, secant: Array) -> Array:
    """Return the slopes at all knots: weighted harmonic mean inside, shape-preserving three-point rule at the ends."""
    if step.size == 1:
        return np.concatenate((secant, secant))
    inner = []
    for left in range(step.size - 1):
        w1, w2 = 2.0 * step[left + 1] + step[left], step[left + 1] + 2.0 * step[left]
        a, b = secant[left], secant[left + 1]
        same = a * b > 0.0
        safe_a, safe_b = np.where(same, a, 1.0), np.where(same, b, 1.0)
        inner.append(np.where(same, (w1 + w2) / (w1 / safe_a + w2 / safe_b), np.where(np.isnan(a * b), np.nan, 0.0)))
    first = _end_slope(float(step[0]), float(step[1]), secant[0], secant[1])
    last = _end_slope(float(step[-1]), float(step[-2]), secant[-1], secant[-2])
    return np.stack([first, *inner, last])


def _end_slope(near: float, far: float, secant_near: Array, secant_far: Array) -> Array:
    slope = ((2.0 * near + far) * secant_near - near * secant_far) / (near + far)
    wrong = np.sign(slope) != np.sign(secant_near)
    steep = (np.sign(secant_near) != np.sign(secant_far)) & (np.abs(slope) > 3.0 * np.abs(secant_near))
    return np.where(wrong, 0.0 * secant_near, np.where(steep, 3.0 * secant_near, slope))


def inverse_temperature_weights(temperature: ArrayLike, given: Array) -> tuple[Array, BoolArray]:
    """Return the weights of given temperatures for interpolation that is straight in 1/T.

    Parameters
    ----------
    temperature : array_like
        Wanted temperatures [K].
    given : ndarray
        Rising temperatures of the data [K], shape (n,).

    Returns
    -------
    weights : ndarray
        Shape (n, ...): at most two differ from 0 and they sum to 1; exactly 1 at a given temperature.
    outside : ndarray of bool
        Where the temperature leaves the data. With one given temperature every other one is outside.
    """
    wanted = np.asarray(temperature, dtype=np.float64)
    beyond = ~((wanted >= given[0] - SAME_TEMPERATURE) & (wanted <= given[-1] + SAME_TEMPERATURE))
    inside = np.where(beyond, given[0], wanted)
    for value in given:
        inside = np.where(np.abs(inside - value) <= SAME_TEMPERATURE, value, inside)
    inverse, knots = 1.0 / inside, 1.0 / given
    weights = []
    for position in range(given.size):
        unit = np.zeros(given.size)
        unit[position] = 1.0
        weights.append(np.interp(-inverse, -knots, unit))
    return np.stack(weights), beyond
