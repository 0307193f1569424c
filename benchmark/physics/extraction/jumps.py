"""Pull-in and pull-out voltages of a switch that jumps, and cycles until a limit is crossed (layer 3)."""

from __future__ import annotations

import math

import numpy as np

from benchmark.physics.extraction.points import Points
from benchmark.physics.extraction.result import (
    SETTING,
    SPACING,
    Accuracy,
    CannotExtract,
    Extracted,
    Part,
    Told,
    gathered,
    half_width,
    listed,
)

__all__ = ["cycles_to_failure", "jump_voltage"]


def jump_voltage(
    points: Points, factor: float | None = None, step: float | None = None, accuracy: Accuracy | None = None
) -> Extracted:
    """Return the control voltage at which a sweep jumps [V].

    Parameters
    ----------
    points : Points
        Current, or displacement [m], along control voltage [V]: the rising sweep gives the pull-in voltage, the falling
        one the pull-out voltage.
    factor : float
        A change by this factor or more between neighbouring points is part of the jump (currents).
    step : float
        A change by this much or more is part of the jump (displacements).
    accuracy : Accuracy
        Stated accuracies; only that of the voltage matters.

    Returns
    -------
    Extracted
        Middle of the two neighbouring points that bracket the jump; neighbouring large changes are one jump. Half the
        bracket is a half width. A reading at the floor counts as the floor, so a jump may be larger than it looks.

    Raises
    ------
    CannotExtract
        No change is large enough, or large changes are found at several places.
    """
    if factor is not None:
        if not np.all(points.y > 0.0):
            wrong = points.place[~(points.y > 0.0)]
            what = "a current that is not above 0 has no factor to its neighbour"
            raise CannotExtract(what, hint="declare the noise floor, or state a step", at=wrong)
        changes, least = np.abs(np.diff(np.log(points.y))), math.log(factor)
    else:
        changes, least = np.abs(np.diff(points.y)), float(step or 0.0)
    large = np.flatnonzero(changes >= least)
    if not large.size:
        biggest = int(np.argmax(changes))
        size = float(changes[biggest])
        shown = f"at most a factor {math.exp(size):.4g}" if factor is not None else Told("at most {}", "y", (size,))
        what = "the sweep has no jump of the stated size"
        raise CannotExtract(what, shown, at=points.place[[biggest, biggest + 1]])
    runs = np.split(large, np.flatnonzero(np.diff(large) > 1) + 1)
    if len(runs) > 1:
        what = "the sweep jumps at several places"
        found = listed("x", (0.5 * (points.x[run[0]] + points.x[run[-1] + 1]) for run in runs), "at ")
        raise CannotExtract(
            what, found, "one jump", "state a larger size of the jump", at=[int(points.place[run[0]]) for run in runs]
        )
    left, right = int(large[0]), int(large[-1]) + 1
    low, high = float(points.x[left]), float(points.x[right])
    parts = gathered(
        (Part(SPACING, half_width(0.5 * (high - low))), Part(SETTING, accuracy.setting if accuracy else 0.0))
    )
    return Extracted(
        0.5 * (low + high),
        parts,
        right - left + 1,
        (low, high),
        line_x=np.array([low, high]),
        line_y=points.y[[left, right]],
        used=points.place[left : right + 1],
    )


def cycles_to_failure(points: Points, limit: float) -> Extracted:
    """Return the number of switching cycles at which a column first crosses a limit [1].

    Parameters
    ----------
    points : Points
        What decides (resistance, current) along the number of cycles, above 0.
    limit : float
        The limit; the side of the first point counts as good.

    Returns
    -------
    Extracted
        Geometric middle of the last good and the first failed count, with half the distance in the logarithm as half
        width. Without a failure: a lower bound, the last count. A later return to the good side is remarked.

    Raises
    ------
    CannotExtract
        A count is not above 0, or the first point stands on the limit.
    """
    if not points.x[0] > 0.0:
        what = "a number of cycles must be above 0"
        raise CannotExtract(what, f"{points.x[0]:g}", at=[int(points.place[0])])
    side = np.sign(points.y - limit)
    if side[0] == 0.0:
        what = "the first point stands on the limit, so no side is good"
        raise CannotExtract(what, at=[int(points.place[0])])
    failed = np.flatnonzero(side != side[0])
    if not failed.size:
        last = float(points.x[-1])
        return Extracted(
            last, (), points.x.size, (float(points.x[0]), last), "at-least",
            np.array([last]), points.y[-1:], points.place, ("no failure within the data",),
        )  # fmt: skip
    right = int(failed[0])
    good, bad = float(points.x[right - 1]), float(points.x[right])
    value = math.sqrt(good * bad)
    returns = bool(np.any(side[right:] == side[0]))
    return Extracted(
        value,
        gathered((Part(SPACING, value * half_width(0.5 * math.log(bad / good))),)),
        2,
        (good, bad),
        line_x=np.array([good, bad]),
        line_y=points.y[[right - 1, right]],
        used=points.place[[right - 1, right]],
        remarks=("the column returns to the good side later",) if returns else (),
    )
