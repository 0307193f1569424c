"""Current law of a switch of which only two resistances and a switching level are known (layer 3).

The path is ohmic at every control voltage; log10 R falls linearly with the control voltage inside a window and is
constant outside it. The window is fixed by the switching level w, the control level (over the supply) at which the
resistance is twice the on value. All functions are elementwise over broadcast arrays.
"""

from __future__ import annotations

from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = ["PERFECT_DECADES", "conduction_window", "log_linear_conductance", "perfect_conductance"]

Array = NDArray[np.float64]

#: Decades that a switch without any leakage runs through inside its window; a convention (own choice). It
#: shapes only the transfer curve between the two states: its conductance at zero control is exactly zero.
PERFECT_DECADES: Final = 12.0


def _array(value: ArrayLike) -> Array:
    return np.asarray(value, dtype=np.float64)


def conduction_window(level: ArrayLike, decades: ArrayLike) -> tuple[Array, Array]:
    """Return the control levels between which log10 R falls, so that R(w) = 2 R_on and R(1) = R_on.

    The window starts at zero control whenever it can, ``w2 = w / (1 - log10(2) / D)``; for levels so high that w2
    would lie beyond the full swing it ends there and starts late, ``w1 = 1 - (1 - w) D / log10(2)``.

    Parameters
    ----------
    level : array_like
        Switching level w over the supply [1], above 0 and below 1.
    decades : array_like
        Decades D between open and closed resistance [1], above log10(2).

    Returns
    -------
    start, end : ndarray
        w1 and w2 over the supply [1]: open at and below w1, closed at and above w2.

    Notes
    -----
    Own form. The switching level alone does not fix where a switch begins to conduct; the widest window that
    agrees with it is taken, because it gives the smallest voltage gain and noise margin.
    """
    w, d = _array(level), _array(decades)
    octave = np.log10(2.0)
    late = w >= 1.0 - octave / d
    end = np.where(late, 1.0, w * d / np.where(late, d, d - octave))
    start = np.where(late, 1.0 - (1.0 - w) * d / octave, 0.0)
    return start, end


def _position(control: ArrayLike, start: ArrayLike, end: ArrayLike) -> Array:
    """Return how far the control level has come through the window: 0 open, 1 closed."""
    first = _array(start)
    return np.clip((_array(control) - first) / (_array(end) - first), 0.0, 1.0)


def log_linear_conductance(
    control: ArrayLike, on_resistance: ArrayLike, decades: ArrayLike, start: ArrayLike, end: ArrayLike
) -> Array:
    """Return the conductance of the path, 1/R with ``log10 R = log10 R_on + D (1 - x)``.

    Parameters
    ----------
    control : array_like
        Control level over the supply [1]; x is its position inside the window, 0 to 1.
    on_resistance : array_like
        R_on [ohm].
    decades : array_like
        D = log10(R_open / R_on) [1].
    start, end : array_like
        Window of `conduction_window` [1].

    Returns
    -------
    ndarray
        Conductance [S]: exactly 1/R_on at and above the end of the window.
    """
    open_part = 1.0 - _position(control, start, end)
    return np.asarray(10.0 ** (-_array(decades) * open_part) / _array(on_resistance), dtype=np.float64)


def perfect_conductance(control: ArrayLike, on_resistance: ArrayLike, level: ArrayLike) -> Array:
    """Return the conductance of a switch whose open state carries exactly nothing.

    ``G = (10^(D x) - 1) / (10^D - 1) / R_on`` with D = `PERFECT_DECADES` and x the position inside the window that
    makes G(w) = 1 / (2 R_on).

    Parameters
    ----------
    control : array_like
        Control level over the supply [1].
    on_resistance : array_like
        R_on [ohm].
    level : array_like
        Switching level w over the supply [1].

    Returns
    -------
    ndarray
        Conductance [S]: exactly 0 at zero control, exactly 1/R_on at full control.
    """
    start, end = conduction_window(level, PERFECT_DECADES)
    rate = np.log(10.0) * PERFECT_DECADES
    x = _position(control, start, end)
    return np.asarray(np.expm1(rate * x) / np.expm1(rate) / _array(on_resistance), dtype=np.float64)
