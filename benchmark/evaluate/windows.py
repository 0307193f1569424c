"""Between which points of a grid of supplies a window of permitted ones may be hidden (layer 6).

Where one condition refuses a point of the grid and another one the next, each may let go before the other takes hold:
too slow here, ringing there, and a window between. Margins are close to exponentials, so their logarithms are taken as
straight lines between the two points.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

__all__ = ["hidden_windows"]

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]
#: places looked at between two points
PLACES = np.arange(1, 16) / 16.0
#: what the straight line may be short of a margin of 1, because a margin is only close to an exponential
SHORT = 0.05


def hidden_windows(margins: Sequence[Array], able: Mask) -> Mask:
    """Return where a window may lie between a point and the next, both refused.

    Parameters
    ----------
    margins : sequence of array (row, supply)
        Margin of each condition: below 1 it is missed, nan where it is not known (which is no failure).
    able : array of bool (row, supply)
        Points at which the numbers mean something.

    Returns
    -------
    array of bool (row, supply - 1)
    """
    lines = []
    for margin in margins:
        with np.errstate(divide="ignore", invalid="ignore"):
            log = np.log(np.broadcast_to(margin, able.shape))
        # what is not known does not refuse; what has no logarithm is far below 1
        lines.append(np.where(np.isnan(margin), np.inf, np.where(np.isnan(log), -np.inf, log)))
    if not lines:
        return np.zeros((able.shape[0], able.shape[1] - 1), dtype=bool)
    lowest = np.min(lines, axis=0)
    beside = able[:, :-1] & able[:, 1:] & (lowest[:, :-1] < 0.0) & (lowest[:, 1:] < 0.0)
    rows, places = np.nonzero(beside)
    highest = np.full((rows.size, PLACES.size), np.inf)
    for log in lines:
        here, there = log[rows, places, None], log[rows, places + 1, None]
        with np.errstate(invalid="ignore"):
            between = here + (there - here) * PLACES
        # a line that comes from or goes to infinity says nothing against a window
        highest = np.fmin(highest, np.where(np.isfinite(here) & np.isfinite(there), between, np.fmax(here, there)))
    found = np.zeros(beside.shape, dtype=bool)
    found[rows, places] = highest.max(axis=1) > -SHORT
    return found
