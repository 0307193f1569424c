"""Elementwise root of a falling function, bracketed (layer 3)."""

from __future__ import annotations

from collections.abc import Callable
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = ["falling_root"]

Array = NDArray[np.float64]

#: bisection alone would need 50 steps to the tolerance; superlinear steps need 6 to 12 on smooth functions
MOST_STEPS: Final = 100
#: a root is done when its bracket is this small against the starting bracket
TOLERANCE: Final = 1.0e-15
EPSILON: Final = float(np.finfo(np.float64).eps)


def falling_root(function: Callable[[Array], Array], low: ArrayLike, high: ArrayLike) -> Array:
    """Return x with function(x) = 0 for a function that falls through zero once between low and high.

    Parameters
    ----------
    function : callable
        Elementwise and continuous, positive at ``low`` and not positive at ``high``. Nearly straight functions
        (a logarithm rather than an exponential) take the fewest steps.
    low, high : array_like
        Bracket, finite; the function decides the shape of the result together with it.

    Returns
    -------
    ndarray
        The root. An element whose bracket does not hold, or whose function is nan, is not a root: the caller masks it.

    Notes
    -----
    Chandrupatla's method (Advances in Engineering Software 28, 145 (1997), from memory): inverse quadratic
    interpolation where three points are monotone enough, bisection elsewhere. A finished element is frozen, so its
    value does not depend on the elements computed beside it.
    """
    a, b = np.broadcast_arrays(np.asarray(high, dtype=np.float64), np.asarray(low, dtype=np.float64))
    f_a, f_b = function(a), function(b)
    a, b, f_a, f_b = (np.array(item) for item in np.broadcast_arrays(a, b, f_a, f_b))
    least = TOLERANCE * np.abs(b - a)
    # at an end already, or no bracket (also when nan)
    a, f_a = np.where(f_b == 0.0, b, a), np.where(f_b == 0.0, 0.0, f_a)
    active = f_a * f_b < 0.0
    step = np.full(a.shape, 0.5)
    for _ in range(MOST_STEPS):
        if not active.any():
            break
        x = a + np.where(active, step * (b - a), 0.0)
        f_x = function(x)
        same = np.sign(f_x) == np.sign(f_a)
        c, f_c = np.where(same, a, b), np.where(same, f_a, f_b)
        turn = active & ~same
        b, f_b = np.where(turn, a, b), np.where(turn, f_a, f_b)
        a, f_a = np.where(active, x, a), np.where(active, f_x, f_a)
        span = np.abs(b - a)
        reach = np.maximum(least, 4.0 * EPSILON * np.abs(a))
        active = active & (f_a != 0.0) & (span > reach) & ~np.isnan(f_a)
        edge = 0.5 * np.minimum(1.0, reach / np.where(active, span, 1.0))
        step = np.clip(_next_step(a, b, c, f_a, f_b, f_c), edge, 1.0 - edge)
    return np.asarray(a, dtype=np.float64)


def _next_step(a: Array, b: Array, c: Array, f_a: Array, f_b: Array, f_c: Array) -> Array:
    """Fraction of the way from a to b: inverse quadratic interpolation if it is safe, one half otherwise."""
    with np.errstate(divide="ignore", invalid="ignore"):
        xi, phi = (a - b) / (c - b), (f_a - f_b) / (f_c - f_b)
        safe = (phi**2 < xi) & ((1.0 - phi) ** 2 < 1.0 - xi)
        inverse = f_a / (f_b - f_a) * f_c / (f_b - f_c) + (c - a) / (b - a) * f_a / (f_c - f_a) * f_b / (f_c - f_b)
    return np.asarray(np.where(safe & np.isfinite(inverse), inverse, 0.5))
