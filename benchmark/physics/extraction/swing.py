"""Subthreshold swing over a stated span of currents: average, smallest and fitted (layer 3).

S = dV/d(log10 I) [V/decade]. The sign of the slope is left out: a curve that falls with the control voltage has the
swing of its mirror image.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.lib.stride_tricks import sliding_window_view

from benchmark.physics.extraction.lines import line_fit
from benchmark.physics.extraction.points import LEAST, Crossing, Points, crossing, nearby
from benchmark.physics.extraction.result import (
    READING,
    SCATTER,
    SETTING,
    Accuracy,
    Array,
    CannotExtract,
    Extracted,
    IntArray,
    Part,
    Told,
    gathered,
)

__all__ = ["average_swing", "fitted_swing", "minimum_swing"]

LN10 = math.log(10.0)


def _ends(points: Points, low: float, high: float, accuracy: Accuracy) -> tuple[Crossing, Crossing]:
    """Return where the two currents are crossed, the smaller voltage first; too few points between them are refused."""
    if not 0.0 < low < high:
        what = "a span of currents needs two different currents above 0"
        raise CannotExtract(what, Told("{} to {}", "y", (low, high)))
    found = sorted((crossing(points, level, "log", accuracy) for level in (low, high)), key=lambda one: one.x)
    first, last = found
    counted = last.right - first.left + 1
    if counted < LEAST:
        what = "the span of currents has too few points, with the ones just outside it"
        raise CannotExtract(what, str(counted), f"{LEAST} or more", at=points.place[first.left : last.right + 1])
    inside = slice(first.left, last.right + 1)
    if not np.all(points.trusted[inside]):
        what = "the span of currents holds readings at the floor or the compliance"
        raise CannotExtract(what, at=points.place[inside][~points.trusted[inside]])
    if not np.all(points.y[inside] > 0.0):
        what = "the span of currents holds readings that are not above 0"
        raise CannotExtract(what, hint="declare the noise floor", at=points.place[inside][points.y[inside] <= 0.0])
    return first, last


def _end_parts(voltage: float, decades: float, accuracy: Accuracy) -> tuple[Part, ...]:
    """Stated accuracies of a slope, as if its two ends were read independently (in two ranges of an instrument)."""
    relative = math.sqrt(2.0) * accuracy.reading / (LN10 * decades)
    return (
        Part(READING, voltage / decades * relative),
        Part(SETTING, math.sqrt(2.0) * accuracy.setting / decades),
    )


def average_swing(points: Points, low: float, high: float, accuracy: Accuracy | None = None) -> Extracted:
    """Return the voltage between two currents over the decades between them [V/decade].

    Parameters
    ----------
    points : Points
        Current [A or A/m] along control voltage [V].
    low, high : float
        The span of currents, in the unit of the current.
    accuracy : Accuracy
        Stated accuracies; the two ends count as independent.

    Returns
    -------
    Extracted
        (V2 - V1)/log10(high/low); the two voltages from the straight line in log current between neighbouring points.
        The uncertainty holds scatter and spacing of the points at both ends and the stated accuracies.

    Raises
    ------
    CannotExtract
        A current is reached nowhere or twice, or fewer than four points bear on the span.
    """
    stated = accuracy or Accuracy()
    first, last = _ends(points, low, high, stated)
    decades = math.log10(high / low)
    value = (last.x - first.x) / decades
    ends = np.array([low, high] if first.rising or last.rising else [high, low])
    return Extracted(
        value,
        gathered((*first.parts, *last.parts), 1.0 / decades),
        last.right - first.left + 1,
        (first.x, last.x),
        line_x=np.array([first.x, last.x]),
        line_y=ends,
        used=points.place[first.left : last.right + 1],
    )


def _inside(points: Points, first: Crossing, last: Crossing, least: int) -> tuple[Array, Array, IntArray]:
    """Return voltages, log10 currents and places of the points between the two crossings."""
    chosen = np.flatnonzero((points.x >= first.x) & (points.x <= last.x))
    if chosen.size < least:
        what = "the span of currents holds too few points"
        raise CannotExtract(what, str(chosen.size), f"{least} or more", at=points.place[chosen])
    return points.x[chosen], np.log10(points.y[chosen]), points.place[chosen]


def minimum_swing(
    points: Points, low: float, high: float, neighbours: int = 2, accuracy: Accuracy | None = None
) -> Extracted:
    """Return the smallest local swing within a span of currents [V/decade].

    Parameters
    ----------
    points : Points
        Current along control voltage [V].
    low, high : float
        The span of currents.
    neighbours : int
        Points that each local slope is taken over: 2 is the line between two neighbours, more a least-squares line.
    accuracy : Accuracy
        Stated accuracies.

    Returns
    -------
    Extracted
        The smallest of all slopes; ``points`` is the number of points of one slope. The scatter of the points makes a
        smallest value too small; the remark says how many slopes it was chosen from.

    Raises
    ------
    CannotExtract
        As for `average_swing`; or the span holds fewer points than four or than ``neighbours``.
    """
    stated = accuracy or Accuracy()
    first, last = _ends(points, low, high, stated)
    v, decades, place = _inside(points, first, last, max(LEAST, neighbours))
    windows_v, windows = sliding_window_view(v, neighbours), sliding_window_view(decades, neighbours)
    dv = windows_v - windows_v.mean(axis=-1, keepdims=True)
    spread = (dv**2).sum(axis=-1)
    slopes = (dv * windows).sum(axis=-1) / spread
    best = int(np.argmax(slopes * (1.0 if last.rising else -1.0)))
    slope = abs(float(slopes[best]))
    middle = float(windows_v[best].mean())
    near = nearby(points, middle, "log", span=(float(windows_v[best][0]), float(windows_v[best][-1])))
    error = near.scatter / LN10 / math.sqrt(float(spread[best]))
    width, rise = float(np.ptp(windows_v[best])), abs(float(slopes[best])) * float(np.ptp(windows_v[best]))
    parts = gathered((Part(SCATTER, error / slope**2, near.freedom), *_end_parts(width, rise, stated)))
    log_line = windows[best].mean() + slopes[best] * (windows_v[best][[0, -1]] - middle)
    return Extracted(
        1.0 / slope,
        parts,
        neighbours,
        (float(windows_v[best][0]), float(windows_v[best][-1])),
        line_x=windows_v[best][[0, -1]],
        line_y=10.0**log_line,
        used=place[best : best + neighbours],
        remarks=(
            f"smallest of {slopes.size} local slopes, each over {neighbours} neighbouring points; scatter makes a "
            "smallest value too small",
        ),
    )


def fitted_swing(points: Points, low: float, high: float, accuracy: Accuracy | None = None) -> Extracted:
    """Return the swing of the least-squares line through log10 of the current over the voltage [V/decade].

    Parameters
    ----------
    points : Points
        Current along control voltage [V].
    low, high : float
        The span of currents; points between the two crossing voltages are used.
    accuracy : Accuracy
        Stated accuracies; the two ends of the span count as independent.

    Returns
    -------
    Extracted
        1/slope; its standard error from the residuals, u(S) = S^2 u(slope), holds scatter and bending of the curve.

    Raises
    ------
    CannotExtract
        As for `average_swing`; or fewer than four points lie in the span.
    """
    stated = accuracy or Accuracy()
    first, last = _ends(points, low, high, stated)
    v, decades, place = _inside(points, first, last, LEAST)
    fit = line_fit(v, decades)
    value = 1.0 / abs(float(fit.slope))
    parts = (
        Part(SCATTER, value**2 * float(fit.slope_error), fit.freedom),
        *_end_parts(float(np.ptp(v)), float(np.ptp(v)) / value, stated),
    )
    ends = v[[0, -1]]
    return Extracted(
        value,
        gathered(parts),
        v.size,
        (float(v[0]), float(v[-1])),
        line_x=ends,
        line_y=10.0 ** (fit.intercept + fit.slope * ends),
        used=place,
    )
