"""Relations between the constants of a piezoelectric material (layer 3).

Axis 3 is the poling axis and the load axis. s: compliance, c: stiffness, d: charge coefficient, e: stress
coefficient, eps: absolute permittivity [F/m] (relative value times the permittivity of vacuum). Superscripts of
the literature are spelled: E constant field, D constant displacement, T constant stress, S constant strain.
All relations are linear and lossless; ageing and high-field growth of the constants are outside them.

Source of the forms: IEEE Std 176-1987, Standard on Piezoelectricity (from memory).
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray

from benchmark.physics.roots import falling_root

__all__ = [
    "StrainForm",
    "bar_wave_speed",
    "compliance_constant_displacement",
    "constrained_modulus",
    "coupling_factor",
    "coupling_from_resonance",
    "cubic_axis_modulus",
    "frequency_constant",
    "permittivity_clamped",
    "permittivity_length_clamped",
    "plate_stiffened_modulus",
    "plate_wave_speed",
    "resonance_ratio",
    "strain_form",
    "thickness_coupling",
]

Array = NDArray[np.float64]


def _float(value: ArrayLike) -> Array:
    return np.asarray(value, dtype=np.float64)


def coupling_factor(coefficient: ArrayLike, compliance: ArrayLike, permittivity: ArrayLike) -> Array:
    """Return the coupling factor k33 that three material constants imply.

    k33^2 = d33^2 / (s33E eps33T). A value of 1 or above is unphysical: the three constants do not belong together.

    Parameters
    ----------
    coefficient : array_like
        d33 [C/N = m/V].
    compliance : array_like
        s33E at constant field [m2/N].
    permittivity : array_like
        eps33T at constant stress [F/m].

    Returns
    -------
    ndarray
        k33 [1].

    Notes
    -----
    Source: IEEE Std 176-1987 (from memory). PZT-5H: 0.7512 against 0.75 published (Erturk & Inman 2011, table E.1).
    """
    d, s, eps = _float(coefficient), _float(compliance), _float(permittivity)
    return np.asarray(np.abs(d) / np.sqrt(s * eps), dtype=np.float64)


def compliance_constant_displacement(compliance: ArrayLike, coupling: ArrayLike) -> Array:
    """Return s33D = s33E (1 - k33^2) [m2/N]; not positive when k33 >= 1 (unphysical).

    Parameters
    ----------
    compliance : array_like
        s33E [m2/N].
    coupling : array_like
        k33 [1].

    Notes
    -----
    Bar with free sides (T1 = T2 = 0). Source: IEEE Std 176-1987 (from memory).
    """
    return np.asarray(_float(compliance) * (1.0 - _float(coupling) ** 2))


def bar_wave_speed(density: ArrayLike, compliance: ArrayLike) -> Array:
    """Return the length-wave speed of a bar, v = 1/sqrt(rho s) [m/s]; nan where the compliance is not positive.

    Parameters
    ----------
    density : array_like
        rho [kg/m3].
    compliance : array_like
        s33D for waves along the field with electrodes on the ends (open-circuit speed v_D: D is uniform and no
        charge can enter inside the bar), s33E for the short-circuit speed v_E [m2/N].
    """
    s = _float(compliance)
    with np.errstate(invalid="ignore", divide="ignore"):
        speed = 1.0 / np.sqrt(_float(density) * s)
    return np.asarray(np.where(s > 0.0, speed, np.nan))


def plate_stiffened_modulus(stiffness: ArrayLike, stress_coefficient: ArrayLike, permittivity: ArrayLike) -> Array:
    """Return c33D = c33E + e33^2/eps33S of a laterally clamped plate [Pa].

    Parameters
    ----------
    stiffness : array_like
        c33E [Pa].
    stress_coefficient : array_like
        e33 [C/m2].
    permittivity : array_like
        eps33S at constant strain [F/m].

    Notes
    -----
    S1 = S2 = 0. Source: Auld, Acoustic Fields and Waves in Solids (1973), from memory.
    """
    return np.asarray(_float(stiffness) + _float(stress_coefficient) ** 2 / _float(permittivity))


def plate_wave_speed(density: ArrayLike, modulus: ArrayLike) -> Array:
    """Return v = sqrt(c/rho) [m/s] for a modulus c [Pa] of a laterally clamped medium and density rho [kg/m3]."""
    return np.asarray(np.sqrt(_float(modulus) / _float(density)))


def thickness_coupling(stress_coefficient: ArrayLike, stiffened: ArrayLike, permittivity: ArrayLike) -> Array:
    """Return kt = e33/sqrt(c33D eps33S) [1] of a laterally clamped plate.

    Parameters
    ----------
    stress_coefficient : array_like
        e33 [C/m2].
    stiffened : array_like
        c33D [Pa].
    permittivity : array_like
        eps33S [F/m].

    Notes
    -----
    Source: IEEE Std 176-1987 (from memory).
    """
    return np.asarray(np.abs(_float(stress_coefficient)) / np.sqrt(_float(stiffened) * _float(permittivity)))


def permittivity_length_clamped(permittivity: ArrayLike, coupling: ArrayLike) -> Array:
    """Return eps33T (1 - k33^2), the permittivity at S3 = 0 with free sides, in the unit of ``permittivity``.

    Source: IEEE Std 176-1987 (from memory).
    """
    return np.asarray(_float(permittivity) * (1.0 - _float(coupling) ** 2))


def permittivity_clamped(permittivity: ArrayLike, planar: ArrayLike, thickness: ArrayLike) -> Array:
    """Return eps33S = eps33T (1 - kp^2)(1 - kt^2), all strains zero, in the unit of ``permittivity``.

    ``planar``: kp [1]; ``thickness``: kt [1]. Source: IEEE Std 176-1987 (from memory).
    """
    return np.asarray(_float(permittivity) * (1.0 - _float(planar) ** 2) * (1.0 - _float(thickness) ** 2))


def coupling_from_resonance(ratio: ArrayLike) -> Array:
    """Return k33 of a length-extensional bar from its series over parallel resonance.

    k33^2 = (pi/2)(f_s/f_p) tan[(pi/2)(f_p - f_s)/f_p], field along the length.

    Parameters
    ----------
    ratio : array_like
        f_s/f_p [1], between 0 and 1.

    Returns
    -------
    ndarray
        k33 [1].

    Notes
    -----
    Source: IEEE Std 176-1987 (from memory). f_p = v_D/(2 L).
    """
    r = _float(ratio)
    return np.asarray(np.sqrt(0.5 * np.pi * r * np.tan(0.5 * np.pi * (1.0 - r))))


def resonance_ratio(coupling: ArrayLike) -> Array:
    """Return f_s/f_p [1] of a length-extensional bar: the inverse of `coupling_from_resonance`.

    Parameters
    ----------
    coupling : array_like
        k33 [1], between 0 and 1 (outside: nan).

    Notes
    -----
    With y = (pi/2) f_s/f_p the relation reads k^2 = y/tan(y), which falls from 1 to 0 as y goes from 0 to pi/2:
    one root, bisected.
    """
    k = _float(coupling)
    y = falling_root(lambda y: y / np.tan(y) - k**2, np.full_like(k, 1.0e-9), np.full_like(k, 0.5 * np.pi))
    return np.asarray(np.where((k > 0.0) & (k < 1.0), y / (0.5 * np.pi), np.nan))


def frequency_constant(coupling: ArrayLike, wave_speed: ArrayLike) -> Array:
    """Return N33 = f_s L = (f_s/f_p) v_D/2 [Hz m], the series frequency constant of a length-extensional bar.

    ``coupling``: k33 [1]; ``wave_speed``: open-circuit bar speed v_D [m/s]. Source: IEEE Std 176-1987 (from memory).
    """
    return np.asarray(resonance_ratio(coupling) * 0.5 * _float(wave_speed))


def cubic_axis_modulus(c11: ArrayLike, c12: ArrayLike) -> Array:
    """Return Young's modulus along a cube axis, E100 = c11 - 2 c12^2/(c11 + c12) [Pa]; exact for cubic symmetry."""
    a, b = _float(c11), _float(c12)
    return np.asarray(a - 2.0 * b**2 / (a + b))


def constrained_modulus(modulus: ArrayLike, poisson_ratio: ArrayLike) -> Array:
    """Return E(1 - nu)/((1 + nu)(1 - 2 nu)) [Pa], the uniaxial-strain modulus of an isotropic medium.

    Use it for a channel much thinner than wide: its sides cannot move. ``poisson_ratio`` below 0.5.
    """
    nu = _float(poisson_ratio)
    return np.asarray(_float(modulus) * (1.0 - nu) / ((1.0 + nu) * (1.0 - 2.0 * nu)))


class StrainForm(NamedTuple):
    """Constants of the strain-charge form: sE (..., 6, 6) [m2/N], d (..., 3, 6) [C/N], epsT (..., 3, 3) [F/m]."""

    compliance: Array
    coefficient: Array
    permittivity: Array


def strain_form(stiffness: ArrayLike, stress_coefficient: ArrayLike, permittivity: ArrayLike) -> StrainForm:
    """Turn stress-form constants into the strain-charge form: sE = cE^-1, d = e sE, epsT = epsS + d e^T.

    Parameters
    ----------
    stiffness : array_like
        cE, shape (..., 6, 6), Voigt order 11 22 33 23 13 12 [Pa].
    stress_coefficient : array_like
        e, shape (..., 3, 6) [C/m2].
    permittivity : array_like
        epsS, shape (..., 3, 3) [F/m].

    Notes
    -----
    Tensor algebra, exact. Index 2 is axis 3 of the crystal.
    """
    e = _float(stress_coefficient)
    s = np.asarray(np.linalg.inv(_float(stiffness)), dtype=np.float64)
    d = e @ s
    return StrainForm(s, d, np.asarray(_float(permittivity) + d @ np.swapaxes(e, -1, -2)))
