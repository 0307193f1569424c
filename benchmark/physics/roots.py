"""Elementwise root of a monotone function by bisection with a fixed number of halvings (layer 3)."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = ["falling_root"]

Array = NDArray[np.float64]


def falling_root(function: Callable[[Array], Array], low: ArrayLike, high: ArrayLike, halvings: int = 48) -> Array:
    """Return x with function(x) = 0 for a function that falls through zero once between low and high.

    Parameters
    ----------
    function : callable
        Elementwise, positive at ``low`` and not positive at ``high``.
    low, high : array_like
        Bracket; the shapes decide the shape of the result together with that of the function.
    halvings : int
        The bracket shrinks by 2**-halvings (48: 3.6e-15 of the bracket).

    Returns
    -------
    ndarray
        The root. Elements whose bracket does not hold (or is nan) end at one of its ends: the caller masks them.
    """
    a, b = np.asarray(low, dtype=np.float64), np.asarray(high, dtype=np.float64)
    for _ in range(halvings):
        middle = 0.5 * (a + b)
        above = function(middle) > 0.0
        a, b = np.where(above, middle, a), np.where(above, b, middle)
    return np.asarray(0.5 * (a + b), dtype=np.float64)
