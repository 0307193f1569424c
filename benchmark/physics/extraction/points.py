"""The points of one sweep, where they cross a level, and what they read between two of them (layer 3).

Between two neighbouring points a curve is a straight line on its scale: linear, or the logarithm of the measured
column. How far the true curve may lie from it is taken from a parabola through the nearest points: its curvature gives
the error of the straight line, its residuals the scatter of a reading. The parabola is used for the uncertainty alone,
and never reaches across a jump.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

import numpy as np

from benchmark.physics.extraction.result import (
    READING,
    SCATTER,
    SETTING,
    SPACING,
    Accuracy,
    Array,
    BoolArray,
    Bound,
    CannotExtract,
    Extracted,
    IntArray,
    Part,
    Told,
    gathered,
    half_width,
    listed,
)

__all__ = ["LEAST", "Crossing", "Nearby", "Points", "Scale", "crossing", "crossings", "jumps_in", "nearby", "read_at"]

Scale = Literal["linear", "log"]

#: fewer points say nothing about their own uncertainty
LEAST = 4
#: points whose parabola gives scatter and curvature at a place
NEAREST = 7
#: a change between neighbouring points is a jump when it exceeds that of the steps beside it this many times
JUMP = 5.0
#: steps on either side of a change that it is compared with
BESIDE = 3
BRACKETED = (
    "the level lies between a reading and a bound: the middle of the two places, give or take half their distance"
)


@dataclass(frozen=True)
class Points:
    """One sweep with rising abscissa; build it with `of`.

    ``place``: where each point stood in the arrays handed in. ``at_floor``: the reading is only an upper bound (then
    ``y`` is the floor, where one is stated); ``at_compliance``: only a lower one.
    """

    x: Array
    y: Array
    place: IntArray
    at_floor: BoolArray
    at_compliance: BoolArray

    @classmethod
    def of(
        cls,
        x: Array,
        y: Array,
        at_floor: BoolArray | None = None,
        at_compliance: BoolArray | None = None,
        floor: float | None = None,
    ) -> Points:
        """Take one sweep in the order it was measured.

        Parameters
        ----------
        x, y : array, shape (points,)
            Abscissa, rising or falling strictly, and readings.
        at_floor, at_compliance : array of bool, shape (points,)
            Marks; none if left out.
        floor : float
            Bound of the readings at the floor; their own value if left out.

        Raises
        ------
        CannotExtract
            Shapes differ, a number is not finite, there are fewer than four points, or the abscissa turns back.
        """
        x, y = np.asarray(x, dtype=np.float64), np.asarray(y, dtype=np.float64)
        none = np.zeros(x.shape, dtype=np.bool_)
        low = none if at_floor is None else np.asarray(at_floor, dtype=np.bool_)
        high = none if at_compliance is None else np.asarray(at_compliance, dtype=np.bool_)
        if x.ndim != 1 or any(one.shape != x.shape for one in (y, low, high)):
            what = "abscissa, readings and marks differ in shape"
            raise CannotExtract(what)
        lost = np.flatnonzero(~(np.isfinite(x) & np.isfinite(y)))
        if lost.size:
            what = "a point is not a number"
            raise CannotExtract(what, at=lost)
        if x.size < LEAST:
            what = "a curve has too few points"
            raise CannotExtract(what, str(x.size), f"{LEAST} or more", at=range(x.size))
        steps = np.diff(x)
        turned = np.flatnonzero(steps * np.sign(x[-1] - x[0]) <= 0.0)
        if turned.size:
            what = "the abscissa of a curve turns back or stands still"
            raise CannotExtract(what, allowed="a sweep that rises or falls all along", at=turned + 1)
        order = np.argsort(x, kind="stable").astype(np.int64)
        if floor is not None:
            y = np.where(low, floor, y)
        return cls(x[order], y[order], order, low[order], high[order])

    @property
    def trusted(self) -> BoolArray:
        """Points that are readings, not bounds."""
        return ~(self.at_floor | self.at_compliance)

    def bound(self, *indices: int) -> Bound:
        """Say what a number is that rests on these points.

        Raises
        ------
        CannotExtract
            One point is an upper and another a lower bound.
        """
        chosen = list(indices)
        low, high = bool(self.at_floor[chosen].any()), bool(self.at_compliance[chosen].any())
        if low and high:
            what = "the points on both sides are bounds, one at the floor and one at the compliance"
            raise CannotExtract(what, at=self.place[chosen])
        return "at-most" if low else "at-least" if high else ""


@dataclass(frozen=True)
class Nearby:
    """Parabola through the trusted points nearest to a place.

    ``curvature``: of the parabola, second derivative over 2. ``scatter``: standard deviation of one reading about it,
    on the scale; ``freedom``: degrees of freedom of that.
    """

    curvature: float
    scatter: float
    freedom: int


def jumps_in(x: Array, y: Array, scale: Scale) -> IntArray:
    """Find where readings jump between two neighbouring points.

    Parameters
    ----------
    x, y : array, shape (points,)
        Rising abscissa, and readings on the scale (logarithms for "log").
    scale : str
        "log" or "linear".

    Returns
    -------
    array of int
        Left point of every jump: a change by a factor of 2 or more (linear: by half of the larger reading or more) that
        is, as a step and as a slope, more than 5 times the largest of the up to 3 steps on either side. There must be a
        step on either side. A curve that is steep over several points has such a neighbour at its side, so it has no
        jump; nor has a transition that is measured with a point inside it.
    """
    steps, slopes = np.abs(np.diff(y)), np.abs(np.diff(y) / np.diff(x))
    if steps.size < 3:
        return np.zeros(0, dtype=np.int64)
    least = math.log(2.0) if scale == "log" else 0.5 * np.maximum(np.abs(y[:-1]), np.abs(y[1:]))
    stands_out = (steps > 0.0) & (steps >= least)
    for sizes in (steps, slopes):
        padded = np.pad(sizes, BESIDE)
        before = np.lib.stride_tricks.sliding_window_view(padded, BESIDE).max(axis=-1)
        stands_out &= sizes > JUMP * np.maximum(before[: steps.size], before[BESIDE + 1 :])
    stands_out[[0, -1]] = False
    return np.asarray(np.flatnonzero(stands_out), dtype=np.int64)


def _unbroken(x: Array, jumps: IntArray, low: float, high: float) -> slice:
    """Return the points around a span that no jump parts from it; a jump inside the span parts nothing."""
    start = max((int(left) + 1 for left in jumps if x[left + 1] <= low), default=0)
    stop = min((int(left) + 1 for left in jumps if x[left] >= high), default=x.size)
    return slice(start, stop)


def nearby(
    points: Points, at: float, scale: Scale, most: int = NEAREST, span: tuple[float, float] | None = None
) -> Nearby:
    """Fit a parabola to the trusted points nearest to a place, on its side of any jump.

    Parameters
    ----------
    points : Points
        The sweep.
    at : float
        Place on the abscissa.
    scale : str
        "log": the natural logarithm of the readings is fitted.
    most : int
        Number of points.
    span : tuple of float
        What the number rests on; the place alone if left out. A jump inside of it belongs to the curve: a place between
        the two points of a jump has both sides for its neighbours, so that its scatter spans the jump.

    Returns
    -------
    Nearby
        Curvature [scale per abscissa squared], scatter [scale], degrees of freedom: points minus 3.

    Raises
    ------
    CannotExtract
        Fewer than four points can be used.
    """
    usable = points.trusted & ((points.y > 0.0) if scale == "log" else np.ones(points.x.shape, dtype=np.bool_))
    x, y, place = points.x[usable], points.y[usable], points.place[usable]
    if x.size < LEAST:
        what = "a curve has too few points that are readings, not bounds"
        raise CannotExtract(what, str(x.size), f"{LEAST} or more", at=points.place)
    y = np.log(y) if scale == "log" else y
    side = _unbroken(x, jumps_in(x, y, scale), *(span or (at, at)))
    x, y, place = x[side], y[side], place[side]
    if x.size < LEAST:
        what = "the curve jumps, and the side of the jump that is read has too few points to tell their scatter"
        raise CannotExtract(what, str(x.size), f"{LEAST} or more", "measure more points on that side", at=place)
    chosen = np.argsort(np.abs(x - at), kind="stable")[:most]
    x, y = x[chosen], y[chosen]
    size = float(np.max(np.abs(x - at)))
    rows = np.vander((x - at) / size, 3, increasing=True)
    found = np.linalg.lstsq(rows, y, rcond=None)[0]
    freedom = x.size - 3
    left = float(np.sqrt(np.sum((y - rows @ found) ** 2) / freedom))
    rounding = 8.0 * np.finfo(np.float64).eps * float(np.max(np.abs(y), initial=0.0))
    bend = float(found[2])
    return Nearby(bend / size**2 if abs(bend) > rounding else 0.0, left if left > rounding else 0.0, freedom)


@dataclass(frozen=True)
class Crossing:
    """Where a curve crosses a level: abscissa, parts of its uncertainty, and the two points it lies between.

    ``bracketed``: one of the two is only a bound, so the crossing may lie anywhere between them.
    """

    x: float
    parts: tuple[Part, ...]
    left: int
    right: int
    rising: bool
    bracketed: bool = False

    @property
    def remarks(self) -> tuple[str, ...]:
        """What a reader must know about the place."""
        return (BRACKETED,) if self.bracketed else ()


def _hidden(points: Points, level: float) -> IntArray:
    """Lines between a reading and a bound that must reach the level somewhere: the left of their two points."""
    y, sure = points.y, points.trusted
    low, high = points.at_floor & (y < level), points.at_compliance & (y > level)
    above, below = (sure & (y > level)) | high, (sure & (y < level)) | low
    passes = (above[:-1] & below[1:]) | (below[:-1] & above[1:])
    return np.asarray(np.flatnonzero(passes & ~(sure[:-1] & sure[1:])))


def _on_scale(y: Array, scale: Scale) -> Array:
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.asarray(np.log(y) if scale == "log" else y)


def crossings(points: Points, level: float, scale: Scale, accuracy: Accuracy | None = None) -> list[Crossing]:
    """Find every place where the straight lines between neighbouring points reach a level.

    Parameters
    ----------
    points : Points
        The sweep.
    level : float
        Level, in the unit of the readings; above 0 on a log scale.
    scale : str
        Scale on which the lines are straight.
    accuracy : Accuracy
        Stated accuracies.

    Returns
    -------
    list of Crossing
        In rising order of the abscissa. A line with a bound at one of its ends is not used: where it crosses is not
        known.
    """
    stated = accuracy or Accuracy()
    y, wanted = _on_scale(points.y, scale), (math.log(level) if scale == "log" else level)
    above = np.sign(y - wanted)
    sure = points.trusted & np.isfinite(y)
    exact = np.flatnonzero(sure & (above == 0.0))
    between = np.flatnonzero(sure[:-1] & sure[1:] & (above[:-1] * above[1:] < 0.0))
    found = []
    for left, right in [*((int(i), int(i)) for i in exact), *((int(i), int(i) + 1) for i in between)]:
        found.append(_crossing(points, y, wanted, left, right, scale, stated))
    return sorted(found, key=lambda one: one.x)


def _crossing(
    points: Points, y: Array, wanted: float, left: int, right: int, scale: Scale, stated: Accuracy
) -> Crossing:
    """Interpolate one crossing; on a point itself the slope is that of the steeper of its two lines."""
    x = points.x
    if left == right:
        ends = [(max(left - 1, 0), left), (left, min(left + 1, x.size - 1))]
        slopes = [(y[b] - y[a]) / (x[b] - x[a]) for a, b in ends if a != b and np.isfinite(y[a] + y[b])]
        slope = max(slopes, key=abs, default=0.0)
        share, at = 0.0, float(x[left])
    else:
        share = float((wanted - y[left]) / (y[right] - y[left]))
        at = float(x[left] + share * (x[right] - x[left]))
        slope = (y[right] - y[left]) / (x[right] - x[left])
    near = nearby(points, at, scale)
    if slope == 0.0:
        what = "the curve is flat where it reaches the level"
        raise CannotExtract(what, at=points.place[[left, right]])
    reading = stated.reading if scale == "log" else stated.reading * abs(wanted)
    parts = gathered(
        (
            Part(SCATTER, near.scatter * math.hypot(share, 1.0 - share) / abs(slope), near.freedom),
            Part(SPACING, half_width(near.curvature * (at - x[left]) * (x[right] - at) / slope)),
            Part(READING, reading / abs(slope)),
            Part(SETTING, stated.setting),
        )
    )
    return Crossing(at, parts, left, right, bool(slope > 0.0))


def crossing(points: Points, level: float, scale: Scale, accuracy: Accuracy | None = None) -> Crossing:
    """Return the one place where a curve reaches a level.

    Parameters
    ----------
    points, level, scale, accuracy
        As in `crossings`.

    Returns
    -------
    Crossing
        On the straight line between two readings. Where the level is passed between a reading and a bound beyond it (a
        switch that jumps out of the noise), the middle of the two, with half their distance as half width.

    Raises
    ------
    CannotExtract
        The level is not above 0 on a log scale; it is reached nowhere within the data, or more than once.
    """
    if scale == "log" and not level > 0.0:
        what = "a level on a logarithmic scale must be above 0"
        raise CannotExtract(what, Told("{}", "y", (level,)))
    found, hidden = crossings(points, level, scale, accuracy), _hidden(points, level)
    if len(found) + hidden.size > 1:
        what = "the curve reaches the level more than once"
        raise CannotExtract(
            what,
            listed("x", sorted([*(one.x for one in found), *points.x[hidden]]), "at "),
            "a level that is reached once",
            "choose another level or sweep",
            at=[*(int(points.place[one.left]) for one in found), *(int(i) for i in points.place[hidden])],
        )
    if hidden.size == 1:
        return _bracket(points, int(hidden[0]), accuracy or Accuracy())
    if not found:
        raise _not_reached(points, level, scale)
    return found[0]


def _bracket(points: Points, left: int, stated: Accuracy) -> Crossing:
    low, high = float(points.x[left]), float(points.x[left + 1])
    parts = gathered((Part(SPACING, half_width(0.5 * (high - low))), Part(SETTING, stated.setting)))
    rising = bool(points.y[left + 1] > points.y[left])
    return Crossing(0.5 * (low + high), parts, left, left + 1, rising, bracketed=True)


def _not_reached(points: Points, level: float, scale: Scale) -> CannotExtract:
    """Say why a level is reached nowhere: beyond the readings, or where they are bounds."""
    sure = points.trusted & np.isfinite(_on_scale(points.y, scale))
    if not sure.any():
        return CannotExtract("no reading of the curve can be used", at=points.place)
    low, high = float(points.y[sure].min()), float(points.y[sure].max())
    found, allowed = Told("{}", "y", (level,)), Told("{} to {}, without extrapolation", "y", (low, high))
    if level < low and points.at_floor.any():
        return CannotExtract(
            "the level lies below the readings above the noise floor", found, allowed, at=points.place[points.at_floor]
        )
    if level > high and points.at_compliance.any():
        what = "the level lies above the readings below the compliance"
        return CannotExtract(what, found, allowed, at=points.place[points.at_compliance])
    return CannotExtract("the curve does not reach the level", found, allowed)


def read_at(points: Points, at: float, scale: Scale, accuracy: Accuracy | None = None) -> Extracted:
    """Read a curve at a place of its abscissa, on the straight line between the two points beside it.

    Parameters
    ----------
    points : Points
        The sweep.
    at : float
        Place, within the data.
    scale : str
        "log": the logarithm of the readings is interpolated; readings must then be above 0.
    accuracy : Accuracy
        Stated accuracies.

    Returns
    -------
    Extracted
        In the unit of the readings. A reading at the floor makes it an upper, one at the compliance a lower bound.

    Raises
    ------
    CannotExtract
        The place lies outside the data, or readings beside it are not above 0 on a log scale.
    """
    stated = accuracy or Accuracy()
    x, y = points.x, points.y
    if not x[0] <= at <= x[-1]:
        what = "the place to read at lies outside the data"
        allowed = Told("{} to {}, without extrapolation", "x", (float(x[0]), float(x[-1])))
        raise CannotExtract(what, Told("{}", "x", (at,)), allowed)
    right = int(np.searchsorted(x, at, side="left"))
    left = right if x[right] == at else right - 1
    ends = [left] if left == right else [left, right]
    if scale == "log" and not np.all(y[ends] > 0.0):
        what = "a reading beside the place is not above 0, so its logarithm cannot be interpolated"
        raise CannotExtract(what, listed("y", y[ends]), "readings above 0", at=points.place[ends])
    bound = points.bound(*ends)
    share = 0.0 if left == right else float((at - x[left]) / (x[right] - x[left]))
    on = _on_scale(y, scale)
    middle = float((1.0 - share) * on[left] + share * on[right])
    value = float(y[left]) if left == right else math.exp(middle) if scale == "log" else middle
    parts: tuple[Part, ...] = ()
    if not bound:
        parts = _reading_parts(points, at, left, right, share, on, value, scale, stated)
    return Extracted(
        value, parts, len(ends), (float(x[left]), float(x[right])), bound, np.array([at]), np.array([value]),
        points.place[ends],
    )  # fmt: skip


def _seen_jumps(points: Points, on: Array, scale: Scale) -> IntArray:
    """Return the left point of every jump, as an index among all points; readings that are bounds have none."""
    usable = np.flatnonzero(points.trusted & np.isfinite(on))
    found = usable[jumps_in(points.x[usable], on[usable], scale)]
    return np.asarray(found[np.isin(found + 1, usable)], dtype=np.int64)


def _reading_parts(
    points: Points,
    at: float,
    left: int,
    right: int,
    share: float,
    on: Array,
    value: float,
    scale: Scale,
    stated: Accuracy,
) -> tuple[Part, ...]:
    """Parts of the uncertainty of one reading; on a log scale they are relative until multiplied by the value."""
    near = nearby(points, at, scale)
    x = points.x
    side = _unbroken(x, _seen_jumps(points, on, scale), at, at)
    first, last = max(left - (left == right), side.start), min(right + (left == right), side.stop - 1)
    slope = (on[last] - on[first]) / (x[last] - x[first]) if np.isfinite(on[last] - on[first]) else 0.0
    parts = (
        Part(SCATTER, near.scatter * math.hypot(share, 1.0 - share), near.freedom),
        Part(SPACING, half_width(near.curvature * (at - x[left]) * (x[right] - at))),
        Part(READING, stated.reading if scale == "log" else stated.reading * abs(value)),
        Part(SETTING, stated.setting * abs(float(slope))),
    )
    return gathered(parts, value if scale == "log" else 1.0)
