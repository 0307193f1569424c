"""Drive and charge of a virtual-source inverter: effective current, delay weight, gate charge (layer 3).

Needs the current law and charge of ``virtual_source``; voltages and signs as there. SI.
"""

from __future__ import annotations

from typing import Final

import numpy as np

from benchmark.physics.virtual_source import Array, Number, Transistor, channel_state

__all__ = [
    "ENERGY_WEIGHT",
    "OUTPUT_WEIGHT",
    "charge_partition",
    "drive_delay",
    "effective_current",
    "gate_charge",
    "miller_weight",
    "switching_capacitance",
]

#: weight of the drain edge in energy, at the input and at the output alike: 1.40 to 1.56 in circuit simulations
ENERGY_WEIGHT: Final = 1.5
#: weight of the drain edge in delay, at the output: swung by input and output in full
OUTPUT_WEIGHT: Final = 2.0


def effective_current(high: Number, low: Number) -> Number:
    """Return I_eff = (I_H + I_L)/2 [A] with I_H = I(V, V/2) and I_L = I(V/2, V).

    Na, Nowak, Haensch and Cai, "The effective drive current in CMOS inverters", IEDM 2002 (abstract read).
    """
    return 0.5 * (high + low)


def miller_weight(ratio: Number) -> Number:
    """Return the weight m of a driven input's drain edge in delay [1]: 2.32 - 2.82 min(r, 0.52).

    r = I(3V/4, 3V/4) / I(V, V/2) [1]: small below threshold, where the driven stage answers while its input still
    moves (m near 2), large in strong inversion (m = 0.85; the weight then also makes up for the effective current,
    which alone overstates the delay of a constant load by 10 to 14 %). Own fit, single weight for both faults: 45
    fan-out-of-four chains of virtual-source inverters with nonlinear gate charge (six n/p pairs of the 45, 32 and
    7 nm class, 0.3 to 1.0 V, solved as differential equations) come out within -5 to +6 % of C V / (2 I_eff).
    """
    strong: Number = np.minimum(ratio, 0.52)
    return 2.32 - 2.82 * strong


def drive_delay(capacitance: Number, supply: Number, current: Number) -> Number:
    """Return the stage delay C V / (2 I_eff) [s]; constant load: -5 to +14 % against a chain of inverters (own)."""
    return capacitance * supply / (2.0 * current)


def charge_partition(x: Number) -> tuple[Number, Number]:
    """Return the shares of the channel charge Q L W at source and drain [1]; x = 1 - F_s,q.

    x = 1 (no drain voltage): one half each. x = 0 (saturation): 6/15 and 4/15.
    """
    below = 15.0 * (1.0 + x) ** 2
    source = (6.0 + x * (12.0 + x * (8.0 + 4.0 * x))) / below
    drain = (4.0 + x * (8.0 + x * (12.0 + 6.0 * x))) / below
    return source, drain


def gate_charge(t: Transistor, control: Array, path: Array) -> Array:
    """Return the channel charge seen by the gate [C], access resistances neglected.

    L W Q times the two shares of ``charge_partition``; the charge saturates at
    V_dsat,q = sqrt(F_f (alpha phi)^2 + (Q/C_inv)^2).
    """
    state = channel_state(t, control, path)
    wide = t.fermi_width * t.thermal_voltage
    v_dsat = np.sqrt(state.fermi * wide**2 + (state.charge / t.inversion_capacitance) ** 2)
    r = np.asarray(path) / v_dsat
    saturation = r * np.power(1.0 + np.power(r, t.saturation_exponent), -1.0 / np.asarray(t.saturation_exponent))
    source, drain = charge_partition(1.0 - saturation)
    return np.asarray(t.width * t.length * state.charge * (source + drain))


def switching_capacitance(t: Transistor, supply: Array, edge: Number, miller: Number = 2.0) -> Array:
    """Return the input capacitance over the full swing [F]: (L Q(V, 0)/V + (1 + m) C_edge) W.

    Parameters
    ----------
    t : Transistor
    supply : array_like
        Supply V [V], > 0.
    edge : array_like
        Overlap plus fringe capacitance of one edge per width [F/m].
    miller : array_like
        Weight m of the drain edge [1]; 2: the drain moves the whole swing the other way.
    """
    voltage = np.asarray(supply, dtype=np.float64)
    channel = channel_state(t, voltage, np.zeros_like(voltage)).charge * t.length / voltage
    return np.asarray((channel + (1.0 + miller) * edge) * t.width)
