"""Equivalent circuits of a piezoelectric bar driven along its length (layer 3).

`bar_impedance` is the exact bar with free faces (what Mason's circuit of 1948 gives there); `motional_branch` is
the single-mode branch (Butterworth, Van Dyke) of a column on a fixed base that pushes against a spring.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = ["MotionalBranch", "bar_impedance", "motional_branch", "parallel_resonance", "series_resonance"]

Array = NDArray[np.float64]


def _float(value: ArrayLike) -> Array:
    return np.asarray(value, dtype=np.float64)


def bar_impedance(
    frequency: ArrayLike, blocked: ArrayLike, coupling: ArrayLike, length: ArrayLike, wave_speed: ArrayLike
) -> NDArray[np.complex128]:
    """Return Z = [1 - k33^2 tan(X)/X]/(j w C_0), X = w L/(2 v_D) [ohm], of a lossless bar with free faces.

    Parameters
    ----------
    frequency : array_like
        f, above 0 [Hz].
    blocked : array_like
        C_0 = C_T (1 - k33^2) [F].
    coupling : array_like
        k33 [1].
    length, wave_speed : array_like
        L [m] and open-circuit bar speed v_D [m/s].

    Notes
    -----
    Source: IEEE Std 176-1987 (from memory). Towards low frequency it tends to 1/(j w C_T).
    """
    omega = 2.0 * np.pi * _float(frequency)
    x = 0.5 * omega * _float(length) / _float(wave_speed)
    z = (1.0 - _float(coupling) ** 2 * np.tan(x) / x) / (1j * omega * _float(blocked))
    return np.asarray(z, dtype=np.complex128)


class MotionalBranch(NamedTuple):
    """Single mode: transduction eta [N/V], C_0 and C_m [F], L_m [H]."""

    transduction: Array
    blocked: Array
    motional_capacitance: Array
    motional_inductance: Array


def motional_branch(
    layers: ArrayLike,
    coefficient: ArrayLike,
    column: ArrayLike,
    free: ArrayLike,
    coupling: ArrayLike,
    blocking: ArrayLike,
    mass: ArrayLike,
) -> MotionalBranch:
    """Return the single-mode circuit of a column on a fixed base pushing against a spring.

    eta = n d33/C_aE, C_0 = C_T (1 - k^2), C_m = C_T k^2 (1 - kappa), L_m = m/eta^2; C_0 + C_m is the slow input
    capacitance C_T (1 - k^2 kappa).

    Parameters
    ----------
    layers, coefficient : array_like
        n [1] and d33 [m/V].
    column : array_like
        C_aE [m/N].
    free : array_like
        C_T [F].
    coupling, blocking : array_like
        k33 and kappa [1].
    mass : array_like
        Effective mass at the tip [kg], 4 M/pi^2 for a quarter wave.

    Notes
    -----
    Derived here; single mode, so only near the fundamental.
    """
    k2, c_t = _float(coupling) ** 2, _float(free)
    eta = np.asarray(_float(layers) * _float(coefficient) / _float(column))
    return MotionalBranch(
        eta,
        np.asarray(c_t * (1.0 - k2)),
        np.asarray(c_t * k2 * (1.0 - _float(blocking))),
        np.asarray(_float(mass) / eta**2),
    )


def series_resonance(inductance: ArrayLike, capacitance: ArrayLike) -> Array:
    """Return f_s = 1/(2 pi sqrt(L_m C_m)) [Hz] from L_m [H] and C_m [F]."""
    return np.asarray(1.0 / (2.0 * np.pi * np.sqrt(_float(inductance) * _float(capacitance))))


def parallel_resonance(series: ArrayLike, capacitance: ArrayLike, blocked: ArrayLike) -> Array:
    """Return f_p = f_s sqrt(1 + C_m/C_0) [Hz] from f_s [Hz], C_m and C_0 [F]."""
    return np.asarray(_float(series) * np.sqrt(1.0 + _float(capacitance) / _float(blocked)))
