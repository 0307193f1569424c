"""Sound transit, resonance, reflection and ringing of a column on a base (layer 3)."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from benchmark.physics.roots import falling_root

__all__ = [
    "footing_damping",
    "footing_stiffness",
    "half_wave_frequency",
    "loaded_bar_root",
    "lumped_mass",
    "quality_from_reflection",
    "quality_limit",
    "quality_limit_chain",
    "quality_limit_undershoot",
    "quarter_wave_frequency",
    "reflection",
    "residual_after_exponential",
    "residual_after_ramp",
    "step_peak",
    "transit_time",
]

Array = NDArray[np.float64]


def _float(value: ArrayLike) -> Array:
    return np.asarray(value, dtype=np.float64)


# --- transit and resonance ---------------------------------------------------------------------------------------


def transit_time(length: ArrayLike, speed: ArrayLike) -> Array:
    """Return L/v [s]; add the transits of all parts of a stack. ``length`` [m], ``speed`` [m/s]."""
    return np.asarray(_float(length) / _float(speed))


def quarter_wave_frequency(length: ArrayLike, speed: ArrayLike) -> Array:
    """Return v/(4 L) [Hz]: fundamental of a bar with one end fixed and one free."""
    return np.asarray(_float(speed) / (4.0 * _float(length)))


def half_wave_frequency(length: ArrayLike, speed: ArrayLike) -> Array:
    """Return v/(2 L) [Hz]: fundamental of a bar with both ends free, or both fixed."""
    return np.asarray(_float(speed) / (2.0 * _float(length)))


def loaded_bar_root(stiffness_ratio: ArrayLike, mass_ratio: ArrayLike = 0.0) -> Array:
    """Return x = omega L/v of the fundamental of a bar with fixed base and loaded tip.

    x cot x = -K_L/K_a + (m_L/M_a) x^2, one root between 0 and pi.

    Parameters
    ----------
    stiffness_ratio : array_like
        K_L/K_a, stiffness of the load to ground over the static stiffness A/(s L) of the bar [1], not negative.
    mass_ratio : array_like
        m_L/M_a, mass at the tip over the mass rho A L of the bar [1], not negative.

    Returns
    -------
    ndarray
        x [1]: pi/2 when free, towards pi when the tip is blocked.

    Notes
    -----
    Textbook form, from memory. With x in (0, pi): x cos x + (K_L/K_a) sin x - (m_L/M_a) x^2 sin x falls through zero
    once.
    """
    beta, mu = np.broadcast_arrays(_float(stiffness_ratio), _float(mass_ratio))
    return falling_root(
        lambda x: x * np.cos(x) + (beta - mu * x**2) * np.sin(x),
        np.full(beta.shape, 1.0e-9),
        np.full(beta.shape, np.pi),
    )


def lumped_mass(mass: ArrayLike) -> Array:
    """Return 4 M/pi^2 [kg], the tip mass that gives a fixed-free bar its quarter-wave frequency.

    The low-frequency (Rayleigh) value M/3 is 10 % high in frequency. ``mass`` M = rho A L [kg].
    """
    return np.asarray(4.0 / np.pi**2 * _float(mass))


# --- base --------------------------------------------------------------------------------------------------------


def footing_stiffness(shear_modulus: ArrayLike, poisson_ratio: ArrayLike, radius: ArrayLike) -> Array:
    """Return k = 4 G r0/(1 - nu) [N/m]: round rigid footing on a half-space, much smaller than the wavelength.

    ``shear_modulus`` G [Pa], ``poisson_ratio`` nu [1], ``radius`` r0 [m].
    Source: Lysmer & Richart, J. Soil Mech. Found. Div. ASCE 92 (1966), from memory.
    """
    return np.asarray(4.0 * _float(shear_modulus) * _float(radius) / (1.0 - _float(poisson_ratio)))


def footing_damping(shear_modulus: ArrayLike, poisson_ratio: ArrayLike, density: ArrayLike, radius: ArrayLike) -> Array:
    """Return c = 3.4 r0^2 sqrt(rho G)/(1 - nu) [N s/m]: radiation damping of the same footing.

    ``density`` rho [kg/m3]; the other arguments and the source as in `footing_stiffness`.
    """
    root = np.sqrt(_float(density) * _float(shear_modulus))
    return np.asarray(3.4 * _float(radius) ** 2 * root / (1.0 - _float(poisson_ratio)))


def reflection(bar_impedance: ArrayLike, base_impedance: ArrayLike) -> Array:
    """Return r = (Z_s - Z_a)/(Z_s + Z_a) [1] for plane waves; impedances rho v [kg/(m2 s)], both areas equal.

    For a footing much smaller than the wavelength use `footing_stiffness` and `footing_damping` instead.
    """
    z_a, z_s = _float(bar_impedance), _float(base_impedance)
    return np.asarray((z_s - z_a) / (z_s + z_a))


# --- ringing -----------------------------------------------------------------------------------------------------


def quality_from_reflection(reflected: ArrayLike) -> Array:
    """Return Q = (pi/2)/ln(1/|r|) [1] of a quarter-wave bar that loses 1 - |r| per round trip.

    Derived here: amplitude times |r| every 2 L/v. 0 at r = 0 (no ringing at all), infinite at |r| = 1.
    """
    with np.errstate(divide="ignore"):
        loss = np.log(1.0 / np.abs(_float(reflected)))
        return np.asarray(0.5 * np.pi / loss)


def step_peak(reflected: ArrayLike) -> Array:
    """Return the peak over the static tip displacement after a voltage step [1]: 1 + r for r > 0, 1 otherwise.

    Derived here: the tip slope changes every L/v as 1, r, -r, -r^2, r^2 ... times v S0; the static value is first
    reached after one transit and the peak after two.
    """
    return np.asarray(1.0 + np.maximum(_float(reflected), 0.0))


def residual_after_exponential(natural_frequency: ArrayLike, time_constant: ArrayLike) -> Array:
    """Return 1/sqrt(1 + (w0 R C)^2) [1]: vibration left over static stroke after an exponential drive.

    ``natural_frequency`` w0 [rad/s], ``time_constant`` R C [s]. Derived here for an undamped resonator.
    """
    return np.asarray(1.0 / np.sqrt(1.0 + (_float(natural_frequency) * _float(time_constant)) ** 2))


def residual_after_ramp(natural_frequency: ArrayLike, ramp_time: ArrayLike) -> Array:
    """Return |sin(w0 t_r/2)/(w0 t_r/2)| [1]: the same after a linear ramp of duration t_r [s].

    Zero when the ramp lasts a whole number of periods. From memory.
    """
    return np.asarray(np.abs(np.sinc(_float(natural_frequency) * _float(ramp_time) / (2.0 * np.pi))))


def quality_limit_undershoot(level: ArrayLike) -> Array:
    """Return the Q below which the first undershoot after closing stays above the switching level.

    1 - exp(-2 pi/sqrt(4 Q^2 - 1)) > w, that is Q < 0.5 sqrt(1 + [2 pi/ln(1/(1 - w))]^2).

    Parameters
    ----------
    level : array_like
        Switching level w as a fraction of the supply [1], 0 < w < 1; nan gives nan.

    Notes
    -----
    Derived here for a step-driven two-pole actuator.
    """
    with np.errstate(divide="ignore", invalid="ignore"):
        waited = -np.log1p(-_float(level))
        return np.asarray(0.5 * np.sqrt(1.0 + (2.0 * np.pi / waited) ** 2))


def quality_limit_chain(level: ArrayLike) -> Array:
    """Return min(4.5, 0.8 pi/ln(1/w)) [1], the Q that never re-switched in chains of stages.

    Parameters
    ----------
    level : array_like
        Switching level w = V_on/V, 0 < w <= 1 [1]; nan gives nan.

    Notes
    -----
    Own circuit simulation of two-way coupled chains (ngspice), 0.4 to 0.9 V with R = 2 R_on at 0.36 V; first bad
    Q between 3 and 14. A safe rule, not a boundary; it is the opposite switch reopening that it guards against.
    """
    w = _float(level)
    with np.errstate(divide="ignore", invalid="ignore"):
        rule = -0.8 * np.pi / np.log(w)
    return np.asarray(np.where(w >= 1.0, 4.5, np.minimum(4.5, rule)))


def quality_limit(level: ArrayLike) -> Array:
    """Return the smaller of `quality_limit_undershoot` and `quality_limit_chain` [1] at a switching level w [1].

    Above it a closed-form delay is not valid: the first crossing is early, the last one can be many times later.
    """
    return np.asarray(np.minimum(quality_limit_undershoot(level), quality_limit_chain(level)))
