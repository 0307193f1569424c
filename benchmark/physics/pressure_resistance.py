"""Resistance of a channel against pressure and temperature (layer 3).

Three laws: log-linear with floor and ceiling and soft corners (default), activated conduction whose barrier falls
with pressure, and a plain exponential for hand estimates. Pressure is compression, positive [Pa].
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from benchmark.constants import BOLTZMANN

__all__ = [
    "activated_resistance",
    "activated_slope",
    "activation_energy",
    "activation_energy_fall",
    "arrhenius_resistance",
    "contact_resistance",
    "exponential_resistance",
    "floor_pressure",
    "log_slope_resistance",
    "softplus",
]

Array = NDArray[np.float64]
LN10 = float(np.log(10.0))


def _float(value: ArrayLike) -> Array:
    return np.asarray(value, dtype=np.float64)


def softplus(x: ArrayLike) -> Array:
    """Return ln(1 + e^x) without overflow: a ramp with a rounded corner of width about 1 at x = 0."""
    return np.asarray(np.logaddexp(0.0, _float(x)))


def floor_pressure(unstressed: ArrayLike, floor: ArrayLike, onset: ArrayLike, slope: ArrayLike) -> Array:
    """Return p2 = p1 + log10(R_off/R_on)/s [Pa], the pressure where the slope meets the floor.

    ``unstressed``, ``floor`` [ohm]; ``onset`` p1 [Pa]; ``slope`` s [decade/Pa].
    """
    return np.asarray(_float(onset) + np.log10(_float(unstressed) / _float(floor)) / _float(slope))


def log_slope_resistance(
    pressure: ArrayLike,
    unstressed: ArrayLike,
    floor: ArrayLike,
    onset: ArrayLike,
    saturation: ArrayLike,
    width: ArrayLike,
) -> Array:
    """Return the channel resistance of the log-linear law with floor, ceiling and soft corners.

    log10 R = log10 R_off - s w [sp((p - p1)/w) - sp((p - p2)/w)], s = log10(R_off/R_on)/(p2 - p1), sp = softplus.

    Parameters
    ----------
    pressure : array_like
        p [Pa].
    unstressed, floor : array_like
        R_off and R_on [ohm]: the limits far below p1 and far above p2.
    onset, saturation : array_like
        p1 and p2 [Pa], see `floor_pressure`.
    width : array_like
        w of both corners [Pa].

    Returns
    -------
    ndarray
        R [ohm], smooth and falling.

    Notes
    -----
    Own smooth law. Its shape, an exponential fall followed by a pressure-independent metal, is what TmTe shows
    (Phys. Rev. Lett. 78, 1138 (1997), abstract). At p = 0 the corner already lowers R by s w sp(-p1/w) decades.
    The slope must hold for the strain state of the channel: hydrostatic coefficients need conversion.
    """
    p, r_off, r_on = _float(pressure), _float(unstressed), _float(floor)
    p1, p2, w = _float(onset), _float(saturation), _float(width)
    slope = np.log10(r_off / r_on) / (p2 - p1)
    fallen = slope * w * (softplus((p - p1) / w) - softplus((p - p2) / w))
    return np.asarray(10.0 ** (np.log10(r_off) - fallen))


def exponential_resistance(pressure: ArrayLike, unstressed: ArrayLike, slope: ArrayLike) -> Array:
    """Return R_0 10^(-s p) [ohm]: no floor, no corner; for hand estimates and far from the floor only.

    ``pressure`` [Pa], ``unstressed`` R_0 [ohm], ``slope`` s [decade/Pa].
    """
    return np.asarray(_float(unstressed) * 10.0 ** (-_float(slope) * _float(pressure)))


def arrhenius_resistance(
    resistance: ArrayLike, energy: ArrayLike, temperature: ArrayLike, reference_temperature: ArrayLike
) -> Array:
    """Return R exp[(E/k)(1/T - 1/T_ref)] [ohm]: an activated resistance known at T_ref.

    ``resistance`` at T_ref [ohm], ``energy`` E [J], ``temperature`` and ``reference_temperature`` [K].
    Prefactor taken as independent of temperature.
    """
    inverse = 1.0 / _float(temperature) - 1.0 / _float(reference_temperature)
    return np.asarray(_float(resistance) * np.exp(_float(energy) / BOLTZMANN * inverse))


def activation_energy(pressure: ArrayLike, unstressed: ArrayLike, fall: ArrayLike, width: ArrayLike) -> Array:
    """Return E_a = w_E sp((E_0 - gamma p)/w_E) [J]: falls linearly and closes softly, never negative.

    ``pressure`` [Pa]; ``unstressed`` E_0 [J]; ``fall`` gamma [J/Pa]; ``width`` w_E [J].
    """
    w = _float(width)
    return np.asarray(w * softplus((_float(unstressed) - _float(fall) * _float(pressure)) / w))


def activation_energy_fall(energy: ArrayLike, closing_pressure: ArrayLike) -> Array:
    """Return gamma = E_0/p_close [J/Pa] of a barrier E_0 [J] that has vanished at ``closing_pressure`` [Pa]."""
    return np.asarray(_float(energy) / _float(closing_pressure))


def activated_slope(fall: ArrayLike, temperature: ArrayLike) -> Array:
    """Return gamma/(k T ln 10) [decade/Pa], the slope of log10 R that a falling barrier gives.

    ``fall`` gamma [J/Pa], ``temperature`` [K]. 110 meV/GPa at 300 K: 1.848 decades per GPa.
    """
    return np.asarray(_float(fall) / (BOLTZMANN * _float(temperature) * LN10))


def activated_resistance(
    energy: ArrayLike,
    temperature: ArrayLike,
    prefactor: ArrayLike,
    metallic: ArrayLike,
    leakage_conductance: ArrayLike = 0.0,
) -> Array:
    """Return 1/R = 1/[R_00 exp(E_a/kT) + R_met] + G_leak as R [ohm].

    Parameters
    ----------
    energy : array_like
        E_a at the pressure in question, `activation_energy` [J].
    temperature : array_like
        T [K].
    prefactor : array_like
        R_00 [ohm].
    metallic : array_like
        R_met at this temperature, R_met0 (1 + alpha_m (T - T_ref)) [ohm].
    leakage_conductance : array_like
        G_leak parallel to the channel [S].

    Notes
    -----
    A barrier that falls linearly with pressure is reported for SmB6 (Beille et al., Phys. Rev. B 28, 7397 (1983),
    abstract). Decades available: E_0/(k T ln 10), falling as 1/T.
    """
    activated = _float(prefactor) * np.exp(_float(energy) / (BOLTZMANN * _float(temperature)))
    return np.asarray(1.0 / (1.0 / (activated + _float(metallic)) + _float(leakage_conductance)))


def contact_resistance(resistivity: ArrayLike, area: ArrayLike) -> Array:
    """Return 2 rho_c/A [ohm]: two faces in series, rho_c [ohm m2] per face, area A [m2] of the channel."""
    return np.asarray(2.0 * _float(resistivity) / _float(area))
