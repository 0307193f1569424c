"""Switching charge from a capacitance or charge curve (layer 3)."""

from __future__ import annotations

import dataclasses
import math

import numpy as np

from benchmark.physics.extraction.points import LEAST, Points, jumps_in, read_at
from benchmark.physics.extraction.result import (
    READING,
    SCATTER,
    SETTING,
    SPACING,
    Accuracy,
    Array,
    CannotExtract,
    Extracted,
    Part,
    gathered,
    half_width,
)

__all__ = ["charge_between", "charge_from_capacitance", "over_swing", "scatter_of"]

#: four neighbours bear on each third difference: so many differences count as one that is independent
_OVERLAP = 1.0 + 2.0 * (0.75**2 + 0.3**2 + 0.05**2)


def scatter_of(x: Array, y: Array) -> tuple[float, float]:
    """Return the standard deviation of a reading about a smooth curve, and its degrees of freedom.

    Parameters
    ----------
    x, y : array, shape (points,)
        Rising abscissa and readings; four points or more.

    Returns
    -------
    tuple of float
        Root mean square of the third divided differences, each normalised to the variance of one reading: a cubic has
        none. Differences across a jump are left out. Neighbouring differences share points; at equal steps their
        correlations -0.75, 0.3 and -0.05 leave 1 in 2.3 of them independent.

    Raises
    ------
    CannotExtract
        Jumps leave no four points beside each other.
    """
    across = np.zeros(x.size - 1, dtype=np.bool_)
    across[jumps_in(x, y, "linear")] = True
    whole = ~np.lib.stride_tricks.sliding_window_view(across, 3).any(axis=-1)
    if not whole.any():
        what = "the curve jumps so often that no four neighbouring points tell their scatter"
        raise CannotExtract(what, allowed="four points without a jump between them", hint="measure more points")
    x4, y4 = (np.lib.stride_tricks.sliding_window_view(one, 4)[whole] for one in (x, y))
    apart = x4[:, :, None] - x4[:, None, :]
    apart[:, range(4), range(4)] = 1.0
    weights = 1.0 / apart.prod(axis=-1)
    weights /= np.sqrt((weights**2).sum(axis=-1, keepdims=True))
    differences = (weights * y4).sum(axis=-1)
    size = float(np.sqrt(np.mean(differences**2)))
    rounding = 8.0 * np.finfo(np.float64).eps * float(np.max(np.abs(y)))
    return (size if size > rounding else 0.0), max(1.0, int(whole.sum()) / _OVERLAP)


def charge_from_capacitance(points: Points, low: float, high: float, accuracy: Accuracy | None = None) -> Extracted:
    """Return the integral of a capacitance over a swing of its voltage [C or C/m].

    Parameters
    ----------
    points : Points
        Differential capacitance [F or F/m] along voltage [V].
    low, high : float
        The swing, within the data.
    accuracy : Accuracy
        Stated accuracies: that of the readings is common to all of them.

    Returns
    -------
    Extracted
        Trapezium rule over the points, with the ends of the swing on the straight lines between points. Its error is
        a third of the difference to every second point (L. F. Richardson, 1911, from memory), taken as a half width.

    Raises
    ------
    CannotExtract
        The swing leaves the data, has fewer than four points with its ends, or holds bounds.
    """
    stated = accuracy or Accuracy()
    first, last = read_at(points, low, "linear"), read_at(points, high, "linear")
    chosen = np.flatnonzero((points.x > low) & (points.x < high))
    if chosen.size + 2 < LEAST:
        what = "the swing has too few points, with its two ends"
        raise CannotExtract(what, str(chosen.size + 2), f"{LEAST} or more", at=points.place[chosen])
    if first.bound or last.bound or not np.all(points.trusted[chosen]):
        what = "the swing holds readings at the floor or the compliance"
        raise CannotExtract(what, at=points.place[chosen][~points.trusted[chosen]])
    x = np.concatenate([[low], points.x[chosen], [high]])
    y = np.concatenate([[first.value], points.y[chosen], [last.value]])
    value = float(np.trapezoid(y, x))
    every_second = np.unique(np.concatenate([np.arange(0, x.size, 2), [x.size - 1]]))
    coarse = float(np.trapezoid(y[every_second], x[every_second]))
    sure = points.trusted
    size, freedom = scatter_of(points.x[sure], points.y[sure])
    weights = 0.5 * np.concatenate([[x[1] - x[0]], x[2:] - x[:-2], [x[-1] - x[-2]]])
    parts = (
        Part(SCATTER, size * math.sqrt(float(np.sum(weights**2))), freedom),
        Part(SPACING, half_width((value - coarse) / 3.0)),
        Part(READING, stated.reading * abs(value)),
        Part(SETTING, stated.setting * math.hypot(first.value, last.value)),
    )
    return Extracted(value, gathered(parts), x.size, (low, high), line_x=x, line_y=y, used=points.place[chosen])


def charge_between(points: Points, low: float, high: float, accuracy: Accuracy | None = None) -> Extracted:
    """Return the difference of a charge between the two ends of a swing [C or C/m].

    Parameters
    ----------
    points : Points
        Charge [C or C/m] along voltage [V].
    low, high : float
        The swing, within the data.
    accuracy : Accuracy
        Stated accuracies; the two ends count as independent.

    Returns
    -------
    Extracted
        Q(high) - Q(low) on the straight lines between points.

    Raises
    ------
    CannotExtract
        The swing leaves the data, or an end rests on a bound.
    """
    first, last = read_at(points, low, "linear", accuracy), read_at(points, high, "linear", accuracy)
    if first.bound or last.bound:
        what = "an end of the swing is a reading at the floor or the compliance"
        raise CannotExtract(what, at=np.unique(np.concatenate([first.used, last.used])))
    return Extracted(
        last.value - first.value,
        gathered((*first.parts, *last.parts)),
        first.points + last.points,
        (low, high),
        line_x=np.array([low, high]),
        line_y=np.array([first.value, last.value]),
        used=np.unique(np.concatenate([first.used, last.used])),
    )


def over_swing(charge: Extracted) -> Extracted:
    """Return a charge over the swing it was read for: the capacitance that counts for energy [F or F/m]."""
    swing = charge.span[1] - charge.span[0]
    return dataclasses.replace(charge, value=charge.value / swing, parts=gathered(charge.parts, 1.0 / swing))
