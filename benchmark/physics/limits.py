"""Fundamental limits of switching: thermal noise, erasure, thermionic swing, quantum speed (layer 3).

Every function is elementwise and takes and returns SI values. The limits belong to an equilibrium node with
white noise and a decision threshold at half the supply; they are overlay lines, never part of a device.
"""

from __future__ import annotations

import math
from typing import Final

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy import special

from benchmark.constants import BOLTZMANN, ELEMENTARY_CHARGE, PLANCK, SPEED_OF_LIGHT

__all__ = [
    "boltzmann_swing",
    "error_probability",
    "heisenberg_time",
    "landauer_energy",
    "light_transit_time",
    "margolus_levitin_time",
    "sound_transit_time",
    "switching_energy_for_error",
    "thermal_noise_voltage",
]

Array = NDArray[np.float64]

LN10: Final = math.log(10.0)
LN2: Final = math.log(2.0)


def _array(value: ArrayLike) -> Array:
    return np.asarray(value, dtype=np.float64)


def landauer_energy(temperature: ArrayLike) -> Array:
    """Return the least heat of erasing one bit, k T ln 2.

    Parameters
    ----------
    temperature : array_like
        Temperature [K], above 0.

    Returns
    -------
    ndarray
        Energy [J].

    References
    ----------
    R. Landauer, IBM J. Res. Dev. 5, 183 (1961) (from memory).
    """
    return BOLTZMANN * _array(temperature) * LN2


def boltzmann_swing(temperature: ArrayLike) -> Array:
    """Return the thermionic limit of the subthreshold swing, ln(10) k T / q.

    Parameters
    ----------
    temperature : array_like
        Temperature [K], above 0.

    Returns
    -------
    ndarray
        Gate voltage per decade of current [V/decade]. A current carried over a barrier by thermionic emission
        cannot be switched with a smaller swing; tunnelling or mechanical switches can.
    """
    return LN10 * BOLTZMANN * _array(temperature) / ELEMENTARY_CHARGE


def thermal_noise_voltage(capacitance: ArrayLike, temperature: ArrayLike) -> Array:
    """Return the standard deviation of the voltage on a node at equilibrium, sqrt(k T / C).

    Parameters
    ----------
    capacitance : array_like
        Total capacitance of the node [F], above 0.
    temperature : array_like
        Temperature [K], above 0.

    Returns
    -------
    ndarray
        Standard deviation [V] (equipartition; exact for a linear capacitor).
    """
    return np.sqrt(BOLTZMANN * _array(temperature) / _array(capacitance))


def error_probability(capacitance: ArrayLike, supply: ArrayLike, temperature: ArrayLike) -> Array:
    """Return the chance that thermal noise carries a node across half the supply, at one sample.

    ``P = erfc(V / (2 sqrt(2) sigma)) / 2`` with ``sigma = sqrt(k T / C)``.

    Parameters
    ----------
    capacitance : array_like
        Total capacitance of the node [F].
    supply : array_like
        Swing of the node [V]; the threshold lies at half of it.
    temperature : array_like
        Temperature [K].

    Returns
    -------
    ndarray
        Probability [1], for one node and one sample: a system rate multiplies it by nodes and samples.
        Real noise margins are smaller than half the supply, so this is a lower bound.
    """
    sigma = thermal_noise_voltage(capacitance, temperature)
    return np.asarray(0.5 * special.erfc(_array(supply) / (2.0 * math.sqrt(2.0) * sigma)), dtype=np.float64)


def switching_energy_for_error(probability: ArrayLike, temperature: ArrayLike) -> Array:
    """Return the smallest C V^2 that keeps the error per node and sample at ``probability``.

    ``C V^2 = 4 k T x^2`` with ``x`` the upper normal quantile of the probability (the inverse of
    `error_probability`). C V^2 is what one full cycle draws from the supply; half of it is stored.

    Parameters
    ----------
    probability : array_like
        Error probability [1], above 0 and below one half.
    temperature : array_like
        Temperature [K].

    Returns
    -------
    ndarray
        Energy per cycle [J].
    """
    quantile = special.ndtri(_array(probability))
    return np.asarray(4.0 * BOLTZMANN * _array(temperature) * quantile**2, dtype=np.float64)


def sound_transit_time(length: ArrayLike, speed: ArrayLike) -> Array:
    """Return the time sound needs across a body, L / v: nothing mechanical answers sooner.

    Parameters
    ----------
    length : array_like
        Path length [m].
    speed : array_like
        Wave speed [m/s], above 0.

    Returns
    -------
    ndarray
        Time [s].
    """
    return _array(length) / _array(speed)


def light_transit_time(length: ArrayLike, relative_permittivity: ArrayLike) -> Array:
    """Return the time of flight along a lossless line, L sqrt(eps_r) / c.

    Parameters
    ----------
    length : array_like
        Length of the line [m].
    relative_permittivity : array_like
        Of the insulator around the line [1], at least 1.

    Returns
    -------
    ndarray
        Time [s].
    """
    return _array(length) * np.sqrt(_array(relative_permittivity)) / SPEED_OF_LIGHT


def margolus_levitin_time(energy: ArrayLike) -> Array:
    """Return the least time to reach an orthogonal state, h / (4 E).

    Parameters
    ----------
    energy : array_like
        Mean energy above the ground state [J], above 0.

    Returns
    -------
    ndarray
        Time [s].

    References
    ----------
    N. Margolus and L. B. Levitin, Physica D 120, 188 (1998) (from memory).
    """
    return PLANCK / (4.0 * _array(energy))


def heisenberg_time(energy: ArrayLike) -> Array:
    """Return the time of the energy-time uncertainty relation, hbar / (2 E).

    Parameters
    ----------
    energy : array_like
        Energy spread [J], above 0.

    Returns
    -------
    ndarray
        Time [s].
    """
    return PLANCK / (4.0 * math.pi * _array(energy))
