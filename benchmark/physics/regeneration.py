"""Closed forms of level restoration: the gain and the swing a chain of logic stages keeps (layer 3).

Levels are fractions of the supply, rho is the on/off ratio R_off / R_on. These forms check the numeric transfer curve
of the circuits and draw limit lines; the engine's functional floor is computed from each device's own current law.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from benchmark.constants import BOLTZMANN, ELEMENTARY_CHARGE

__all__ = [
    "loaded_high_level",
    "log_linear_gain",
    "log_linear_levels",
    "log_linear_minimum_ratio",
    "log_linear_noise_margin",
    "log_linear_output",
    "ratio_for_fan_in",
    "resistor_load_levels",
    "stacked_high_level",
    "subthreshold_gain",
    "subthreshold_minimum_supply",
]

Array = NDArray[np.float64]


def _array(value: ArrayLike) -> Array:
    return np.asarray(value, dtype=np.float64)


def resistor_load_levels(ratio: ArrayLike) -> tuple[Array, Array]:
    """Return (V_OL, V_OH) / V of one switch against its best load resistor, R_L = sqrt(R_on R_off). Divider.

    1/(1 + sqrt rho) and sqrt rho/(1 + sqrt rho): the switch needs rho^2 to do what a complementary pair does.
    """
    root = np.sqrt(_array(ratio))
    return _array(1.0 / (1.0 + root)), _array(root / (1.0 + root))


def ratio_for_fan_in(fan_in: ArrayLike, level_loss: ArrayLike) -> Array:
    """Return the on/off ratio k^2 (1/eps - 1) at which a k-input gate loses eps of the swing at one level [1]."""
    k = _array(fan_in)
    return _array(k * k * (1.0 / _array(level_loss) - 1.0))


def stacked_high_level(fan_in: ArrayLike, ratio: ArrayLike) -> Array:
    """Return V_OH / V = 1/(1 + k^2/rho) of a k-input gate: k closed in series feed k open in parallel.

    By symmetry also 1 - V_OL / V. Ohmic switches, ideal inputs. Divider of k R_on and R_off / k.
    """
    k = _array(fan_in)
    return _array(1.0 / (1.0 + k * k / _array(ratio)))


def loaded_high_level(
    supply: ArrayLike,
    driving_resistance: ArrayLike,
    input_resistance: ArrayLike,
    input_voltage: ArrayLike,
    fan_out: ArrayLike,
) -> Array:
    """Return the high level of an output whose inputs draw current: (V + N g V_in)/(1 + N g), g = R_drive/R_in [V].

    Parameters
    ----------
    supply, driving_resistance : array_like
        V [V] behind R_drive [ohm].
    input_resistance, input_voltage : array_like
        Each of the N inputs holds R_in [ohm] to V_in [V].
    fan_out : array_like
        N [1].

    References
    ----------
    J. M. Rabaey, Digital Integrated Circuits, 1st ed. (1996), example 3.12 (resistor-transistor logic).
    """
    loading = _array(fan_out) * _array(driving_resistance) / _array(input_resistance)
    return _array((_array(supply) + loading * _array(input_voltage)) / (1.0 + loading))


def log_linear_output(level: ArrayLike, ratio: ArrayLike) -> Array:
    """Return the output / V of a complementary pair with R = R_on rho^(1 - v/V): 1/(1 + rho^(2 v - 1)).

    Parameters
    ----------
    level : array_like
        Input as a fraction of the supply v [1].
    ratio : array_like
        rho over the full swing [1].
    """
    return _array(0.5 * (1.0 - np.tanh(0.5 * np.log(_array(ratio)) * (2.0 * _array(level) - 1.0))))


def log_linear_gain(ratio: ArrayLike, window: ArrayLike = 1.0) -> Array:
    """Return the mid-rail gain |dV_out/dV_in| = ln(rho) / (2 s) of a complementary log-linear pair [1].

    Parameters
    ----------
    ratio : array_like
        rho [1]; D decades are rho = 10^D.
    window : array_like
        Part s of the swing, centred, over which the resistance changes [1], 0 < s <= 1.
    """
    return _array(np.log(_array(ratio)) / (2.0 * _array(window)))


def log_linear_minimum_ratio(window: ArrayLike = 1.0) -> Array:
    """Return the smallest on/off ratio that regenerates (mid-rail gain 1): e^(2 s) [1]; window s as above."""
    return _array(np.exp(2.0 * _array(window)))


def _restored(half_log: Array) -> Array:
    """Largest m with m = tanh(m L): the swing a long chain keeps; 0 for L <= 1. Newton from above, monotone."""
    regenerates = half_log > 1.0
    slope = np.where(regenerates, half_log, 2.0)
    m = np.ones_like(slope)
    for _ in range(80):
        output = np.tanh(m * slope)
        # slope of m - tanh(m L): positive above the root, 0 only where m is already 0
        m = m - (m - output) / np.maximum(1.0 - slope * (1.0 - output * output), 1e-12)
    return np.where(regenerates, m, 0.0)


def log_linear_levels(ratio: ArrayLike) -> tuple[Array, Array]:
    """Return the levels (V_OL, V_OH) / V that a chain of complementary log-linear pairs reaches.

    (1 - m)/2 and (1 + m)/2 with the swing m = tanh(m ln(rho)/2). A ratio of e^2 or less keeps no swing: 1/2, 1/2.
    """
    m = _restored(0.5 * np.log(_array(ratio)))
    return _array(0.5 * (1.0 - m)), _array(0.5 * (1.0 + m))


def log_linear_noise_margin(ratio: ArrayLike) -> Array:
    """Return the noise margin / V of a chain of complementary log-linear pairs (low and high are equal).

    At the two points of unity gain the output swing is m_o = sqrt(1 - 1/L) and the input swing
    m_i = atanh(m_o)/L, L = ln(rho)/2; the margin between them is (m_o - m_i)/2. It is the noise that every stage of a
    chain bears at once, equal to the largest square between the curve and its mirror image. One disturbed stage
    among quiet ones bears more: (m - m_i)/2 with the swing m of ``log_linear_levels``. 0 for rho <= e^2.
    """
    half_log = 0.5 * np.log(_array(ratio))
    regenerates = half_log > 1.0
    slope = np.where(regenerates, half_log, 2.0)
    output = np.sqrt(1.0 - 1.0 / slope)
    return _array(np.where(regenerates, 0.5 * (output - np.arctanh(output) / slope), 0.0))


def subthreshold_gain(supply: ArrayLike, slope_factor: ArrayLike, temperature: ArrayLike) -> Array:
    """Return the mid-rail gain (e^(V / 2 phi) - 1)/n of a subthreshold CMOS inverter [1], phi = k T/q.

    Parameters
    ----------
    supply : array_like
        V [V], below threshold.
    slope_factor : array_like
        n = S / (phi ln 10) [1], >= 1.
    temperature : array_like
        T [K].

    References
    ----------
    R. M. Swanson and J. D. Meindl, IEEE J. Solid-State Circuits 7, 146 (1972); from memory, rederived. No barrier
    lowering by the drain.
    """
    phi = BOLTZMANN * _array(temperature) / ELEMENTARY_CHARGE
    return _array(np.expm1(_array(supply) / (2.0 * phi)) / _array(slope_factor))


def subthreshold_minimum_supply(slope_factor: ArrayLike, temperature: ArrayLike) -> Array:
    """Return the supply 2 phi ln(1 + n) [V] at which ``subthreshold_gain`` is 1 (35.8 mV at 300 K, n = 1).

    References
    ----------
    J. D. Meindl and J. A. Davis, IEEE J. Solid-State Circuits 35, 1515 (2000); from memory, rederived.
    """
    phi = BOLTZMANN * _array(temperature) / ELEMENTARY_CHARGE
    return _array(2.0 * phi * np.log1p(_array(slope_factor)))
