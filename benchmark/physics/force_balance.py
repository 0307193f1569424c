"""Force, pressure, charge and elastic energy of a piezoelectric column that presses on a thin channel (layer 3).

One-dimensional, linear, quasi-static. The column (height L_a, area A_a, n layers electrically in parallel) pushes
through a stiff frame onto the channel (thickness L_c, area A_c). Everything in the force loop is a compliance in
series: column C_aE = s33E L_a/A_a, channel, frame, spreading under the punch. F is the clamp force, compression
counted positive. Derived here from the strain-charge form S3 = s33E T3 + d33 E3, D3 = d33 T3 + eps33T E3
(IEEE Std 176-1987, from memory) with free sides (T1 = T2 = 0).

Valid: column at least as high as wide, back pressure below the depoling stress, F >= 0 (a contact cannot pull).
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = [
    "blocking_ratio",
    "clamped_beam_compliance",
    "column_compliance",
    "contact_force",
    "elastic_energy",
    "elastic_share",
    "elastic_share_largest",
    "flat_punch_compliance",
    "free_capacitance",
    "input_capacitance",
    "length_blocked_capacitance",
    "post_compliance",
    "pressure_bound",
    "pressure_per_volt",
    "spring_force",
    "supply_for_decades",
    "supported_beam_compliance",
    "terminal_charge",
]

Array = NDArray[np.float64]


def _float(value: ArrayLike) -> Array:
    return np.asarray(value, dtype=np.float64)


# --- compliances -------------------------------------------------------------------------------------------------


def column_compliance(compliance: ArrayLike, height: ArrayLike, area: ArrayLike) -> Array:
    """Return C_aE = s33E L_a/A_a [m/N] from s33E [m2/N], L_a [m] and A_a [m2]: short-circuited column."""
    return np.asarray(_float(compliance) * _float(height) / _float(area))


def post_compliance(modulus: ArrayLike, length: ArrayLike, area: ArrayLike) -> Array:
    """Return L/(E A) [m/N]: a post, or a channel layer with its laterally constrained modulus.

    ``modulus`` [Pa]; ``length`` along the load [m]; ``area`` [m2].
    """
    return np.asarray(_float(length) / (_float(modulus) * _float(area)))


def flat_punch_compliance(modulus: ArrayLike, poisson_ratio: ArrayLike, radius: ArrayLike) -> Array:
    """Return (1 - nu^2)/(2 E r) [m/N]: rigid flat round punch on an elastic half-space.

    Parameters
    ----------
    modulus : array_like
        E of the half-space [Pa].
    poisson_ratio : array_like
        nu of the half-space [1].
    radius : array_like
        r of the punch [m].

    Notes
    -----
    Source: Johnson, Contact Mechanics (1985), F = 2 r E* delta, from memory. It keeps the pressure finite when
    the channel area goes to zero. Valid when the supporting body is several radii wide and deep.
    """
    return np.asarray((1.0 - _float(poisson_ratio) ** 2) / (2.0 * _float(modulus) * _float(radius)))


def clamped_beam_compliance(modulus: ArrayLike, length: ArrayLike, moment: ArrayLike) -> Array:
    """Return L^3/(192 E I) [m/N]: cross-bar clamped at both ends, load in the middle.

    ``modulus`` E [Pa], ``length`` L [m], ``moment`` second moment of area I [m4]. Source: Roark's Formulas for
    Stress and Strain, from memory. Slender beam; shear adds to it when L is below about ten times its depth.
    """
    return np.asarray(_float(length) ** 3 / (192.0 * _float(modulus) * _float(moment)))


def supported_beam_compliance(modulus: ArrayLike, length: ArrayLike, moment: ArrayLike) -> Array:
    """Return L^3/(48 E I) [m/N]: cross-bar simply supported at both ends, load in the middle.

    Arguments, source and range as in `clamped_beam_compliance`.
    """
    return np.asarray(_float(length) ** 3 / (48.0 * _float(modulus) * _float(moment)))


def blocking_ratio(column: ArrayLike, total: ArrayLike) -> Array:
    """Return kappa = C_aE/Sigma [1]: 0 free column, 1 fully blocked. Both compliances in m/N."""
    return np.asarray(_float(column) / _float(total))


# --- force and pressure ------------------------------------------------------------------------------------------


def spring_force(
    layers: ArrayLike, coefficient: ArrayLike, voltage: ArrayLike, interference: ArrayLike, total: ArrayLike
) -> Array:
    """Return (n d33 V + u_pre)/Sigma [N], negative where a bonded loop would pull.

    Parameters
    ----------
    layers : array_like
        n, layers electrically in parallel [1].
    coefficient : array_like
        d33 [m/V].
    voltage : array_like
        V across each layer, positive along the poling [V].
    interference : array_like
        u_pre, built in at V = 0; negative is a gap [m].
    total : array_like
        Sigma, the sum of all compliances in the loop [m/N].
    """
    stroke = _float(layers) * _float(coefficient) * _float(voltage)
    return np.asarray((stroke + _float(interference)) / _float(total))


def contact_force(force: ArrayLike) -> tuple[Array, NDArray[np.bool_]]:
    """Return the force a contact can bear [N] and the mask of lost contact.

    A dry contact pushes and does not pull: where the spring force is negative the faces have parted, the force
    is zero and the mask is true. The caller reports the mask.
    """
    f = _float(force)
    lost = np.asarray(f < 0.0)
    return np.asarray(np.where(lost, 0.0, f)), lost


def pressure_per_volt(layers: ArrayLike, coefficient: ArrayLike, total: ArrayLike, channel_area: ArrayLike) -> Array:
    """Return dp_c/dV = n d33/(A_c Sigma) [Pa/V] while in contact; arguments as in `spring_force`, A_c [m2].

    Written out: n d33/[a s33E L_a + L_c/Y_c + A_c (C_f + C_x)] with a = A_c/A_a.
    """
    return np.asarray(_float(layers) * _float(coefficient) / (_float(channel_area) * _float(total)))


def pressure_bound(coefficient: ArrayLike, compliance: ArrayLike, field: ArrayLike, area_ratio: ArrayLike) -> Array:
    """Return the highest channel pressure of any frame, (d33/s33E) E/a [Pa].

    Parameters
    ----------
    coefficient, compliance : array_like
        d33 [m/V] and s33E [m2/N].
    field : array_like
        n V/L_a [V/m].
    area_ratio : array_like
        a = A_c/A_a [1].

    Notes
    -----
    Rigid frame, channel and punch of no compliance. PZT-5H: 28.65 Pa per V/m before the area ratio.
    """
    return np.asarray(_float(coefficient) / _float(compliance) * _float(field) / _float(area_ratio))


def supply_for_decades(decades: ArrayLike, slope: ArrayLike, per_volt: ArrayLike) -> Array:
    """Return V = D/(slope dp/dV) [V] for D decades at ``slope`` [decade/Pa] and ``per_volt`` [Pa/V]."""
    return np.asarray(_float(decades) / (_float(slope) * _float(per_volt)))


# --- charge and energy -------------------------------------------------------------------------------------------


def free_capacitance(layers: ArrayLike, permittivity: ArrayLike, area: ArrayLike, height: ArrayLike) -> Array:
    """Return C_T = n^2 eps33T A_a/L_a [F]: the column with free ends.

    ``permittivity`` is absolute [F/m]; ``height`` is that of the whole column, n layers of L_a/n each [m].
    """
    return np.asarray(_float(layers) ** 2 * _float(permittivity) * _float(area) / _float(height))


def input_capacitance(free: ArrayLike, coupling: ArrayLike, blocking: ArrayLike) -> Array:
    """Return C_in = C_T (1 - k33^2 kappa) [F]: slow charge over voltage of the loaded column in contact."""
    return np.asarray(_float(free) * (1.0 - _float(coupling) ** 2 * _float(blocking)))


def length_blocked_capacitance(free: ArrayLike, coupling: ArrayLike) -> Array:
    """Return C_0 = C_T (1 - k33^2) [F]: what the driver sees before the column has moved."""
    return np.asarray(_float(free) * (1.0 - _float(coupling) ** 2))


def terminal_charge(
    free: ArrayLike, voltage: ArrayLike, layers: ArrayLike, coefficient: ArrayLike, force: ArrayLike
) -> Array:
    """Return Q = C_T V - n d33 F [C]: free charge less what the clamp force holds back.

    ``free`` [F], ``voltage`` [V], ``layers`` [1], ``coefficient`` d33 [m/V], ``force`` [N] (zero without contact).
    Exact in the linear model, also across loss of contact.
    """
    return np.asarray(_float(free) * _float(voltage) - _float(layers) * _float(coefficient) * _float(force))


def elastic_energy(force: ArrayLike, compliance: ArrayLike) -> Array:
    """Return F^2 C/2 [J] stored in a compliance [m/N] by a force [N].

    It is part of the input charge times voltage: never add it to that.
    """
    return np.asarray(0.5 * _float(force) ** 2 * _float(compliance))


def elastic_share(coupling: ArrayLike, blocking: ArrayLike) -> Array:
    """Return lambda = k^2 kappa (1 - kappa)/(1 - k^2 kappa) [1].

    Elastic energy in everything but the column over C_in V^2/2, without built-in interference. ``coupling`` k33
    [1], ``blocking`` kappa [1].
    """
    k2, kappa = _float(coupling) ** 2, _float(blocking)
    return np.asarray(k2 * kappa * (1.0 - kappa) / (1.0 - k2 * kappa))


def elastic_share_largest(coupling: ArrayLike) -> tuple[Array, Array]:
    """Return the largest elastic share over kappa and the kappa where it occurs, both [1].

    lambda_max = [1/k - sqrt(1/k^2 - 1)]^2 at kappa = (1 - sqrt(1 - k^2))/k^2.
    Source: Uchino, Ferroelectric Devices (2000), from memory; also by maximising `elastic_share`.
    """
    k = _float(coupling)
    root = np.sqrt(1.0 - k**2)
    return np.asarray(((1.0 - root) / k) ** 2), np.asarray((1.0 - root) / k**2)
