"""Losses of an actuator that are not part of charge times voltage, and cycles demanded of it (layer 3)."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = [
    "cycles_demanded",
    "dielectric_loss_bipolar",
    "dielectric_loss_unipolar",
    "loop_loss",
    "resonant_mechanical_loss",
]

Array = NDArray[np.float64]


def _float(value: ArrayLike) -> Array:
    return np.asarray(value, dtype=np.float64)


def dielectric_loss_unipolar(capacitance: ArrayLike, voltage: ArrayLike, loss_tangent: ArrayLike) -> Array:
    """Return (pi/4) C V^2 tan delta [J] per cycle of a swing 0..V.

    Parameters
    ----------
    capacitance : array_like
        C [F].
    voltage : array_like
        V, full swing [V].
    loss_tangent : array_like
        tan delta at the field in use [1]; small-signal values are up to ten times too low (common practice,
        no source).

    Notes
    -----
    W = pi C tan delta (V/2)^2: elliptical loop of amplitude V/2. From memory. Prefer a measured loop, `loop_loss`.
    """
    return np.asarray(0.25 * np.pi * _float(capacitance) * _float(voltage) ** 2 * _float(loss_tangent))


def dielectric_loss_bipolar(capacitance: ArrayLike, voltage: ArrayLike, loss_tangent: ArrayLike) -> Array:
    """Return pi C V^2 tan delta [J] per cycle of a swing -V..+V; arguments as in `dielectric_loss_unipolar`."""
    return np.asarray(np.pi * _float(capacitance) * _float(voltage) ** 2 * _float(loss_tangent))


def loop_loss(voltage: ArrayLike, charge: ArrayLike) -> Array:
    """Return the closed integral of V dQ [J] of a measured loop, points along the last axis, by the trapezium rule.

    The loop is closed from the last point to the first. Positive for a lossy loop traversed in time order.
    """
    v, q = _float(voltage), _float(charge)
    v_next, q_next = np.roll(v, -1, axis=-1), np.roll(q, -1, axis=-1)
    return np.asarray(np.sum(0.5 * (v + v_next) * (q_next - q), axis=-1))


def resonant_mechanical_loss(energy: ArrayLike, quality: ArrayLike) -> Array:
    """Return 2 pi U/Q [J] per cycle at resonance with stored energy U [J] and mechanical quality Q [1].

    Definition of Q. Hard-switched logic already pays it inside charge times voltage: do not add it there.
    """
    return np.asarray(2.0 * np.pi * _float(energy) / _float(quality))


def cycles_demanded(frequency: ArrayLike, activity: ArrayLike, time: ArrayLike) -> Array:
    """Return f a t [1]: cycles of the net with activity a [cycles per clock] at clock f [Hz] during t [s] in use."""
    return np.asarray(_float(frequency) * _float(activity) * _float(time))
