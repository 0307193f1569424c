"""Step response of a two-pole (mass, spring, damper) actuator (layer 3)."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from benchmark.physics.roots import falling_root

__all__ = ["overshoot", "step_response", "time_to_level"]

Array = NDArray[np.float64]


def _float(value: ArrayLike) -> Array:
    return np.asarray(value, dtype=np.float64)


def overshoot(quality: ArrayLike) -> Array:
    """Return exp(-pi/sqrt(4 Q^2 - 1)) [1], the first overshoot over the static value; 0 for Q <= 0.5.

    ``quality`` Q [1]. Textbook form, from memory. Infinite Q gives 1.
    """
    q = _float(quality)
    with np.errstate(divide="ignore", invalid="ignore"):
        value = np.exp(-np.pi / np.sqrt(4.0 * q**2 - 1.0))
    return np.asarray(np.where(q > 0.5, value, np.where(np.isnan(q), np.nan, 0.0)))


def step_response(phase: ArrayLike, quality: ArrayLike) -> Array:
    """Return y(theta) of y'' + y'/Q + y = 1 from rest, theta = w0 t.

    Parameters
    ----------
    phase : array_like
        theta = w0 t [rad], not negative.
    quality : array_like
        Q [1], positive and finite.

    Returns
    -------
    ndarray
        y [1], 1 is the static value. Exact solution of the linear equation in all three damping regimes.
    """
    theta, q = np.broadcast_arrays(_float(phase), _float(quality))
    zeta = 0.5 / q
    gap = np.sqrt(np.abs(zeta**2 - 1.0))
    ringing = zeta < 1.0
    # below critical damping: 1 - y = e^(-zeta theta) [cos(g theta) + zeta sin(g theta)/g]
    swing = np.cos(gap * theta) + zeta * theta * np.sinc(gap * theta / np.pi)
    under = np.exp(-np.where(ringing, zeta * theta, 0.0)) * swing
    # from critical damping on: 1 - y = e^(-s1 theta) [1 + s1 (1 - e^(-(s2 - s1) theta))/(s2 - s1)]
    slow = 1.0 / (zeta + gap)
    spread = 2.0 * gap * theta
    with np.errstate(divide="ignore", invalid="ignore"):
        mean = np.where(spread > 0.0, -np.expm1(-spread) / spread, 1.0)
    over = np.exp(-slow * theta) * (1.0 + slow * theta * mean)
    return np.asarray(1.0 - np.where(ringing, under, over))


def time_to_level(level: ArrayLike, natural_frequency: ArrayLike, quality: ArrayLike) -> Array:
    """Return the time a step-driven two-pole actuator needs to reach a level for the first time.

    Parameters
    ----------
    level : array_like
        Fraction w of the static value, 0 <= w < 1 [1]; elsewhere (and for nan) nan.
    natural_frequency : array_like
        w0 [rad/s].
    quality : array_like
        Q [1].

    Returns
    -------
    ndarray
        Time [s].

    Notes
    -----
    The response rises monotonically up to its first maximum at pi/(w0 sqrt(1 - 1/(4 Q^2))), and 1 - y stays below
    (1 + x) e^-x with x the decay rate times t; the smaller of the two bounds brackets the root, which is bisected.
    """
    w, omega, q = np.broadcast_arrays(_float(level), _float(natural_frequency), _float(quality))
    usable = (w >= 0.0) & (w < 1.0) & (q > 0.0)
    w_safe, q_safe = np.where(usable, w, 0.5), np.where(usable, q, 1.0)
    zeta = 0.5 / q_safe
    square = 1.0 - zeta**2
    with np.errstate(divide="ignore", invalid="ignore"):
        peak = np.where(square > 0.0, np.pi / np.sqrt(square), np.inf)
    rate = np.where(square > 0.0, zeta, 1.0 / (zeta + np.sqrt(np.abs(square))))
    bound = 2.0 * (1.0 - np.log1p(-w_safe)) / rate
    phase = falling_root(lambda x: w_safe - step_response(x, q_safe), np.zeros(w.shape), np.minimum(peak, bound))
    return np.asarray(np.where(usable, phase / omega, np.nan))
