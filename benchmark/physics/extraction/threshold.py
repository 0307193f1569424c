"""Threshold voltage and hysteresis window of a transfer curve (layer 3)."""

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
    SPACING,
    Accuracy,
    CannotExtract,
    Extracted,
    Part,
    Told,
    gathered,
    half_width,
)

__all__ = ["extrapolated_threshold", "hysteresis_window", "threshold_at_current"]

#: slopes this close to the largest count as equal to it: rounding only
ROUNDING = 1e-9
#: a slope this many standard errors of the difference below the largest may have been chosen by scatter alone
CHOICE = 2.0


def _read(points: Points, one: Crossing, level: float) -> Extracted:
    return Extracted(
        one.x,
        one.parts,
        one.right - one.left + 1,
        (float(points.x[one.left]), float(points.x[one.right])),
        line_x=np.array([one.x]),
        line_y=np.array([level]),
        used=points.place[one.left : one.right + 1],
        remarks=one.remarks,
    )


def threshold_at_current(points: Points, level: float, accuracy: Accuracy | None = None) -> Extracted:
    """Return the control voltage at which the current reaches a stated level [V].

    Parameters
    ----------
    points : Points
        Current [A or A/m] along control voltage [V].
    level : float
        The constant-current criterion, in the unit of the current.
    accuracy : Accuracy
        Stated accuracies.

    Returns
    -------
    Extracted
        On the straight line in log current between two neighbouring points.

    Raises
    ------
    CannotExtract
        The level is reached nowhere within the data or more than once.
    """
    return _read(points, crossing(points, level, "log", accuracy), level)


def extrapolated_threshold(
    points: Points, neighbours: int = 3, path_voltage: float = 0.0, accuracy: Accuracy | None = None
) -> Extracted:
    """Return where the line of largest slope through neighbouring points meets zero current [V].

    Parameters
    ----------
    points : Points
        Current [A or A/m] along control voltage [V], at one path voltage.
    neighbours : int
        Points the slope is taken over, 3 or more.
    path_voltage : float
        Half of it is subtracted, as for curves at a small path voltage; 0 for none [V].
    accuracy : Accuracy
        Stated accuracies; a common error of all readings does not move the result.

    Returns
    -------
    Extracted
        V_T = V_m - I_m/g_m - V_path/2, with the least-squares line through the neighbours whose slope g_m is largest.
        Linear extrapolation at the largest transconductance, D. K. Schroder, Semiconductor Material and Device
        Characterization (2006), section 4.8; from memory. The uncertainty holds the scatter of those points about the
        line and half the distance to the farthest of what the neighbouring lines give, and the lines whose slope is
        less than the largest by no more than 2 standard errors of the difference: scatter alone may choose between
        them. That scatter is the larger of those about the line and about a parabola through the 7 nearest points.

    Raises
    ------
    CannotExtract
        Fewer points than four; or the slope is still growing at an end of the data, so its largest value is not in it.
    """
    stated = accuracy or Accuracy()
    usable = np.flatnonzero(points.trusted)
    least = max(LEAST, neighbours + 1)
    if usable.size < least or neighbours < 3:
        what = "the largest slope needs more points that are readings, not bounds"
        raise CannotExtract(what, str(usable.size), f"{least} or more, and 3 or more for each slope", at=points.place)
    x, y = points.x[usable], points.y[usable]
    windows_x, windows = sliding_window_view(x, neighbours), sliding_window_view(y, neighbours)
    dx = windows_x - windows_x.mean(axis=-1, keepdims=True)
    dy = windows - windows.mean(axis=-1, keepdims=True)
    spread = (dx**2).sum(axis=-1)
    slopes = (dx * dy).sum(axis=-1) / spread
    sizes = slopes if y[-1] > y[0] else -slopes
    if not sizes.max() > 0.0:
        what = "the current does not change along the sweep, so no line meets zero current"
        raise CannotExtract(what, at=points.place[usable])
    best = int(np.flatnonzero(sizes >= sizes.max() * (1.0 - ROUNDING))[0])
    if best in (0, slopes.size - 1):
        what = "the transconductance is largest at an end of the data"
        raise CannotExtract(
            what,
            Told("{}", "x", (float(windows_x[best].mean()),)),
            "a largest value inside the data",
            "use a longer sweep, or a constant-current criterion",
            at=points.place[usable[best : best + neighbours]],
        )
    fit = line_fit(windows_x[best], windows[best])
    value, error = (float(one) for one in fit.zero())
    middle = float(windows_x[best].mean())
    # the largest of slopes that scatter is chosen by the scatter: all that could be it count for the uncertainty
    near = nearby(points, middle, "linear", span=(float(windows_x[best][0]), float(windows_x[best][-1])))
    noise = max(near.scatter, float(fit.residual))
    unsure = CHOICE * noise * np.sqrt(1.0 / spread + 1.0 / spread[best])
    rivals = np.flatnonzero((sizes > 0.0) & (sizes + unsure >= sizes[best]))
    rivals = np.union1d(rivals, [best - 1, best + 1])
    rivals = rivals[slopes[rivals] != 0.0]
    beside = windows_x[rivals].mean(axis=-1) - windows[rivals].mean(axis=-1) / slopes[rivals]
    parts = (
        Part(SCATTER, error, fit.freedom),
        Part(SPACING, half_width(0.5 * float(np.max(np.abs(beside - value), initial=0.0)))),
        Part(READING, stated.reading * abs(middle - value) / math.sqrt(neighbours)),
        Part(SETTING, stated.setting),
    )
    line = np.array([value, float(windows_x[best][-1 if middle > value else 0])])
    told = "half the path voltage subtracted" if path_voltage else "nothing subtracted for the path voltage"
    return Extracted(
        value - 0.5 * path_voltage,
        gathered(parts),
        neighbours,
        (float(windows_x[best][0]), float(windows_x[best][-1])),
        line_x=line,
        line_y=np.array([0.0, float(fit.intercept + fit.slope * line[1])]),
        used=points.place[usable[best : best + neighbours]],
        remarks=(
            f"largest of {slopes.size} slopes, each over {neighbours} neighbouring points; scatter makes a largest "
            f"slope too large and the threshold too high; {told}",
        ),
    )


def hysteresis_window(forward: Points, backward: Points, level: float, accuracy: Accuracy | None = None) -> Extracted:
    """Return the control voltage of the forward sweep minus that of the backward sweep at one current [V].

    Parameters
    ----------
    forward, backward : Points
        Current along control voltage [V], the control rising and falling.
    level : float
        The current.
    accuracy : Accuracy
        Stated accuracies; the two sweeps count as independent.

    Returns
    -------
    Extracted
        Positive where the switch closes at a higher voltage than it opens. ``used`` are places in the forward sweep.

    Raises
    ------
    CannotExtract
        The level is reached nowhere or twice in one of the sweeps.
    """
    rising, falling = (crossing(one, level, "log", accuracy) for one in (forward, backward))
    ends = np.array([falling.x, rising.x])
    return Extracted(
        rising.x - falling.x,
        gathered((*rising.parts, *falling.parts)),
        rising.right - rising.left + falling.right - falling.left + 2,
        (float(ends.min()), float(ends.max())),
        line_x=ends,
        line_y=np.array([level, level]),
        used=forward.place[rising.left : rising.right + 1],
        remarks=tuple(dict.fromkeys((*rising.remarks, *falling.remarks))),
    )
