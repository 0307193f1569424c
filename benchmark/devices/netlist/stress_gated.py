"""Stress-gated switch as a sub-circuit: actuator, pressure, channel (layer 4).

The control acts between the gate and the reference plate (node ``p``), whatever the path does. It is held between zero
and the supply, as the record is rated (an actuator that swings beyond would only shorten the delay).

``driven``: the gate draws nothing; the actuator is the two-pole of the record, or a pure transport delay where it has
none. ``charged``: the single-mode circuit of a piezoelectric column between gate and plate, C_0 beside a series
L_m-R_m-C_m (Butterworth, Van Dyke; ``benchmark.physics.resonator``); the voltage across C_m is the control, so the
motion acts back on the gate. C_0 + C_m is the slow input capacitance, 1/sqrt(L_m C_m) the natural frequency of the
record; beside it the leakage resistance of the film. The dielectric loss of the film is not in it.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

from benchmark.constants import BOLTZMANN
from benchmark.devices.netlist.parts import (
    Polarity,
    SwitchText,
    across,
    control_path,
    held,
    named,
    number,
    scalar,
    softplus,
)
from benchmark.devices.record import Array, Switch
from benchmark.devices.stress_gated_channel import Channel

__all__ = ["Gate", "switch_text"]

_GIGA = 1.0e-9


@dataclass(frozen=True)
class Gate:
    """What acts between gate and plate, beyond the record.

    slope [Pa/V], offset [Pa]
        Pressure on the channel = slope x control + offset, not below zero.
    blocked [F]
        C_0, capacitance before the column has moved; None, or no actuator in the record: a plain capacitor.
    leakage_resistance [ohm]
        Of the film; None: not part of the model.
    """

    slope: float
    offset: float
    blocked: float | None
    leakage_resistance: float | None


def switch_text(switch: Switch, polarity: Polarity, channel: Channel, gate: Gate, supply: float | Array) -> SwitchText:
    """Return one stress-gated switch as text at one design point."""
    volts = scalar(supply)
    lines, control = control_path(switch, polarity)
    driven = lines + _channel(channel, gate, held(control, volts))
    capacitance = scalar(switch.input_charge) / volts
    leak = () if gate.leakage_resistance is None else (f"Rfilm g p r={{{number(gate.leakage_resistance)}/size}}",)
    if gate.blocked is None or not math.isfinite(scalar(switch.natural_frequency)):
        own = (f"Cgate g p {{{number(capacitance)}*size}}", *leak)
        charged = driven + named(own, "input capacitance")
    else:
        branch, moved = _column(switch, polarity, gate.blocked, capacitance)
        charged = named((*branch, *leak), "column: C_0 beside its motional branch; film leakage")
        charged += _channel(channel, gate, held(moved, volts))
    return SwitchText(driven, charged, scalar(switch.terminal_capacitance))


def _column(switch: Switch, polarity: Polarity, blocked: float, capacitance: float) -> tuple[tuple[str, ...], str]:
    motional = capacitance - blocked
    omega, quality = scalar(switch.natural_frequency), scalar(switch.quality)
    inductance = 1.0 / (omega**2 * motional)
    lines = (
        f"Cblocked g p {{{number(blocked)}*size}}",
        f"Lmotion g m1 {{{number(inductance)}/size}}",
        f"Rmotion m1 m2 {{{number(omega * inductance / quality)}/size}}",
        f"Cmotion m2 p {{{number(motional)}*size}}",
    )
    return lines, across(polarity, "m2", "p")


def _channel(channel: Channel, gate: Gate, control: str) -> tuple[str, ...]:
    pressure = f"max({number(gate.slope * _GIGA)}*{control}+{number(gate.offset * _GIGA)},0)"
    write = {"log-slope": _log_slope, "activated": _activated, "exponential": _exponential}[channel.kind]
    contact = number(channel.contact)
    resistance = f"({write(channel.parameters, pressure)}+{contact})"
    line = f"Bpath d s I={{size}}*v(d,s)/{resistance}"
    return named((line,), f"channel ({channel.kind} in the pressure, in GPa) and contacts")


def _log_slope(p: Mapping[str, Array], pressure: str) -> str:
    top, floor = scalar(p["unstressed"]), scalar(p["floor"])
    onset, saturation, width = (scalar(p[name]) * _GIGA for name in ("onset", "saturation", "width"))
    slope = math.log(top / floor) / (saturation - onset) * width
    start, end = (softplus(f"(({pressure}-{number(x)})/{number(width)})") for x in (onset, saturation))
    return f"exp({number(math.log(top))}-{number(slope)}*({start}-{end}))"


def _activated(p: Mapping[str, Array], pressure: str) -> str:
    thermal = BOLTZMANN * scalar(p["temperature"])
    width = scalar(p["width"]) / thermal
    closed = softplus(f"({number(scalar(p['energy']) / thermal / width)}"
                      f"-{number(scalar(p['fall']) / _GIGA / thermal / width)}*{pressure})")  # fmt: skip
    series = f"({number(p['prefactor'])}*exp({number(width)}*{closed})+{number(p['metallic'])})"
    return f"1/(1/{series}+{number(p['leakage_conductance'])})"


def _exponential(p: Mapping[str, Array], pressure: str) -> str:
    per_giga = math.log(10.0) * scalar(p["slope"]) / _GIGA
    return f"{number(p['unstressed'])}*exp(-{number(per_giga)}*{pressure})"
