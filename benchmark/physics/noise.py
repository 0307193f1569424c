"""Errors that thermal noise causes at a node (layer 3); the noise voltage itself is in ``limits``.

A node of capacitance C that reaches equilibrium holds a noise voltage of sqrt(k T / C), whatever resistance feeds
it. A logic decision fails when that noise passes the threshold left after level degradation. White noise through
one pole is assumed; supply noise, crosstalk and telegraph noise come on top.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import erfc

__all__ = ["crossing_rate", "pole_frequency", "sampled_error", "threshold_for_rate"]

Array = NDArray[np.float64]


def _array(value: ArrayLike) -> Array:
    return np.asarray(value, dtype=np.float64)


def pole_frequency(resistance: ArrayLike, capacitance: ArrayLike) -> Array:
    """Return the noise bandwidth f_c = 1 / (2 pi R C) [Hz] of a node; R [ohm], C [F] (Kish 2004, eq. 2)."""
    return _array(1.0 / (2.0 * math.pi * _array(resistance) * _array(capacitance)))


def crossing_rate(threshold_over_noise: ArrayLike, frequency: ArrayLike) -> Array:
    """Return how often noise passes a threshold: (2 / sqrt 3) exp(-(U_th/U_n)^2 / 2) f_c.

    Parameters
    ----------
    threshold_over_noise : array_like
        U_th / U_n [1]: noise margin after level degradation over the noise voltage sqrt(k T / C).
    frequency : array_like
        f_c [Hz] of ``pole_frequency``.

    Returns
    -------
    ndarray
        Rate of threshold crossings of one node [1/s].

    References
    ----------
    Rice formula for noise of bandwidth f_c as in L. B. Kish, IEE Proc. Circuits Devices Syst. 151, 190 (2004),
    eqs. 2 and 3.
    """
    ratio = _array(threshold_over_noise)
    return _array(2.0 / math.sqrt(3.0) * np.exp(-0.5 * ratio * ratio) * _array(frequency))


def threshold_for_rate(rate: ArrayLike, frequency: ArrayLike) -> Array:
    """Return the threshold over noise at which ``crossing_rate`` is ``rate``: sqrt(2 ln(2 f_c / (sqrt 3 rate))).

    Parameters
    ----------
    rate : array_like
        Allowed crossings of one node [1/s], > 0; N nodes and one error in a time t: 1 / (N t).
    frequency : array_like
        f_c [Hz].

    Returns
    -------
    ndarray
        U_th / U_n [1]; 0 where the rate is allowed even without any threshold.
    """
    excess = np.log(2.0 / math.sqrt(3.0) * _array(frequency) / _array(rate))
    return _array(np.sqrt(2.0 * np.maximum(excess, 0.0)))


def sampled_error(threshold_over_noise: ArrayLike) -> Array:
    """Return the chance that one sampled decision is wrong, Q(U_th/U_n) = erfc(x / sqrt 2) / 2 [1] (exact)."""
    return _array(0.5 * erfc(_array(threshold_over_noise) / math.sqrt(2.0)))
