"""Current of a switch known by its swing, ceiling and floor: harmonic blend times drain factor (layer 3).

All functions are elementwise over broadcast arrays in SI. Symbols: S swing [V/decade], I_on ceiling and I_off
floor of the blend [A], V_sat drain voltage scale [V].
"""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = [
    "blend_current",
    "blend_law",
    "drain_factor",
    "minimum_supply",
    "off_current_at_swing",
]

Array = NDArray[np.float64]

LN10: Final = math.log(10.0)


def _array(value: ArrayLike) -> Array:
    return np.asarray(value, dtype=np.float64)


def minimum_supply(swing: ArrayLike, ratio: ArrayLike) -> Array:
    """Return the smallest supply that gives an on/off ratio with a constant swing, S log10(ratio).

    Parameters
    ----------
    swing : array_like
        Subthreshold swing [V/decade].
    ratio : array_like
        On/off ratio [1].

    Returns
    -------
    ndarray
        Supply [V].
    """
    return _array(swing) * np.log10(_array(ratio))


def blend_current(control: ArrayLike, swing: ArrayLike, ceiling: ArrayLike, floor: ArrayLike) -> Array:
    """Return the saturated current of a switch that rises log-linearly from its floor to its ceiling.

    ``I = I_off + [1 / I_on + 1 / (I_off (10^(V/S) - 1))]^-1`` for V >= 0, so that I(0) = I_off and the current
    tends to I_on + I_off. For V < 0 (reached only through a threshold shift or in a stack) the exponential
    simply goes on, ``I = I_off 10^(V/S)``; value and slope are continuous at 0.

    Parameters
    ----------
    control : array_like
        Control voltage V [V].
    swing : array_like
        Swing S [V/decade], above 0.
    ceiling : array_like
        I_on, saturated ceiling of the blend [A], above 0.
    floor : array_like
        I_off, current at zero control [A], above 0.

    Returns
    -------
    ndarray
        Current [A], without the drain factor.

    Notes
    -----
    Own form (harmonic blend): it has the stated swing, floor and ceiling and nothing else. It holds no
    statement on the physics of conduction and none on the slope above 0 close to the floor.
    """
    return _blend(control, swing, ceiling, floor)[0]


def _blend(control: ArrayLike, swing: ArrayLike, ceiling: ArrayLike, floor: ArrayLike) -> tuple[Array, Array]:
    """Return the blend [A] and its derivative by the control voltage [S]."""
    per_volt = LN10 / _array(swing)
    exponent = per_volt * _array(control)
    on, off = _array(ceiling), _array(floor)
    rising = np.maximum(exponent, 0.0)
    decay = np.exp(-rising)
    # the harmonic blend multiplied through by 10^(-V/S): no overflow at any voltage
    gated = off * -np.expm1(-rising)
    both = gated + on * decay
    above = off + on * gated / both
    slope_above = on * off * decay * (on / both) / both
    below = off * np.exp(np.minimum(exponent, 0.0))
    high = exponent >= 0.0
    return np.where(high, above, below), per_volt * np.where(high, slope_above, below)


def drain_factor(path_voltage: ArrayLike, saturation_voltage: ArrayLike) -> Array:
    """Return the factor by which the path voltage limits the current, 1 - exp(-V_DS / V_sat).

    Parameters
    ----------
    path_voltage : array_like
        Voltage across the path V_DS [V], 0 or above.
    saturation_voltage : array_like
        Scale of saturation V_sat [V], above 0 (k T / q for drift-free thermionic current).

    Returns
    -------
    ndarray
        Factor [1]: 0 at 0, 1 in saturation. No output conductance beyond saturation.
    """
    return -np.expm1(-_array(path_voltage) / _array(saturation_voltage))


def blend_law(
    swing: ArrayLike, ceiling: ArrayLike, floor: ArrayLike, saturation_voltage: ArrayLike
) -> Callable[[Array, Array], tuple[Array, Array, Array]]:
    """Return the law ``(control, path) -> I, dI/dcontrol, dI/dpath`` of `blend_current` times `drain_factor`.

    Parameters
    ----------
    swing, ceiling, floor : array_like
        As for `blend_current`.
    saturation_voltage : array_like
        As for `drain_factor`.

    Returns
    -------
    callable
        Current [A] and its derivatives [S], for the balance of currents in a stack.
    """
    scale = _array(saturation_voltage)

    def law(control: Array, path: Array) -> tuple[Array, Array, Array]:
        saturated, slope = _blend(control, swing, ceiling, floor)
        factor = drain_factor(path, scale)
        return saturated * factor, slope * factor, saturated * np.exp(-path / scale) / scale

    return law


def off_current_at_swing(floor: ArrayLike, ceiling: ArrayLike, swing: ArrayLike, swing_then: ArrayLike) -> Array:
    """Return the floor of the blend when the swing changes and the threshold stays.

    The window of control voltage between floor and ceiling, ``S log10(I_on / I_off)``, is kept, so that
    ``I_off' = I_off 10^(V_w (1/S - 1/S'))``: a larger swing leaks more.

    Parameters
    ----------
    floor, ceiling : array_like
        I_off and I_on at the swing ``swing`` [A].
    swing, swing_then : array_like
        Swing S at which the currents hold and new swing S' [V/decade].

    Returns
    -------
    ndarray
        New floor [A]; exactly ``floor`` when the swing does not change.
    """
    before, then = _array(swing), _array(swing_then)
    window = minimum_supply(before, _array(ceiling) / _array(floor))
    return np.asarray(_array(floor) * 10.0 ** (window * (1.0 / before - 1.0 / then)), dtype=np.float64)
