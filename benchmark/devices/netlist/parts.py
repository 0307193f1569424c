"""What every sub-circuit of a switch is made of: its nodes, number format, control and helper expressions (layer 4).

A switch is a four-terminal element with the nodes ``d`` (towards the output), ``g`` (gate), ``s`` (towards the rail)
and ``p`` (the rail itself, to which a reference plate is tied), and the parameter ``size``: that many unit switches
side by side. The element lines are written for ngspice; B-sources carry the current law, everything is SI.

Control. The voltage that acts is ``v(g,p)`` of the pull-down switch and ``v(p,g)`` of the pull-up switch, so both are
positive when the switch closes. On its way it passes

- nothing,
- a lossless matched line for a pure transport delay (two lines where closing and opening differ: the later copy on
  each edge, as in the transient of ``benchmark.circuits``), or
- a series L-R-C for a two-pole actuator, u'' + w0 u'/Q + w0^2 u = w0^2 input.

A helper node is never a divisor: it is zero at the first iteration of the simulator.
"""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Final, Literal

import numpy as np

from benchmark.devices.record import Array, Switch

__all__ = [
    "Polarity",
    "SubCircuits",
    "SwitchText",
    "across",
    "control_path",
    "held",
    "named",
    "number",
    "scalar",
    "softplus",
]

Polarity = Literal["down", "up"]

#: impedance level of the L-R-C that stands for an actuator [ohm]; it drives nothing, so any value does
_LEVEL: Final = 1.0e3


@dataclass(frozen=True)
class SwitchText:
    """One polarity as element lines between the nodes d, g, s and p.

    driven
        Conduction and actuator, the gate drawing nothing: the caller adds constant capacitances.
    charged
        The same with the charges of the device itself at gate, drain and source; None: the model has none beyond
        constants.
    terminal [F]
        Capacitance to ground of one conducting terminal of unit size that belongs to ``charged``; terminals that
        meet inside a stack share it, so the cell places it.
    """

    driven: tuple[str, ...]
    charged: tuple[str, ...] | None
    terminal: float


@dataclass(frozen=True)
class SubCircuits:
    """Both polarities at one design point; ``notes``: what the text leaves out or approximates, one sentence each."""

    down: SwitchText
    up: SwitchText
    notes: tuple[str, ...] = ()

    def of(self, polarity: Polarity) -> SwitchText:
        """Return one polarity."""
        return self.down if polarity == "down" else self.up


def scalar(value: float | Array) -> float:
    """Return the one element of an array."""
    return float(np.asarray(value, dtype=np.float64).reshape(-1)[0])


def number(value: float | Array) -> str:
    """Return a number that reads back as the same double."""
    found = scalar(value)
    if not math.isfinite(found):
        message = f"no netlist with the number {found}"
        raise ValueError(message)
    return repr(found)


def across(polarity: Polarity, first: str, second: str) -> str:
    """Return the voltage between two nodes in the sense of the switch."""
    return f"v({first},{second})" if polarity == "down" else f"v({second},{first})"


def named(lines: Iterable[str], note: str) -> tuple[str, ...]:
    """Return element lines under a comment."""
    return (f"* {note}", *lines)


def softplus(x: str) -> str:
    """Return ln(1 + e^x) of an expression: no overflow, and no cancellation where it is small."""
    small = f"exp(-abs({x}))"
    return f"(max({x},0)+2*atanh({small}/(2+{small})))"


def held(control: str, supply: float) -> str:
    """Return a control voltage held between zero and the supply, as the record is rated."""
    return f"min(max({control},0),{number(supply)})"


def _line(name: str, source: str, target: str, delay: float) -> tuple[str, ...]:
    """Return a matched lossless line; without the tolerances every kink of the input would make a breakpoint."""
    return (
        f"T{name} {source} 0 {target} 0 Z0=1 TD={number(delay)} rel=2 abs=1e14",
        f"R{name} {target} 0 1",
    )


def control_path(switch: Switch, polarity: Polarity) -> tuple[tuple[str, ...], str]:
    """Return element lines and the expression of the control that acts on the channel [V].

    The gate draws no current: an E-source copies its voltage.
    """
    direct = across(polarity, "g", "p")
    copied = f"Econtrol gate 0 {'g p' if polarity == 'down' else 'p g'} 1"
    frequency = scalar(switch.natural_frequency)
    closing, opening = scalar(switch.closing_time), scalar(switch.opening_time)
    if math.isfinite(frequency):
        quality = scalar(switch.quality)
        lines = (
            copied,
            f"Lcontrol gate m1 {number(_LEVEL / frequency)}",
            f"Rcontrol m1 u {number(_LEVEL / quality)}",
            f"Ccontrol u 0 {number(1.0 / (_LEVEL * frequency))}",
        )
        return named(lines, "two-pole actuator: u'' + w0 u'/Q + w0^2 u = w0^2 (gate voltage)"), "v(u)"
    if closing == opening == 0.0:
        return (), direct
    if closing == opening:
        return named((copied, *_line("late", "gate", "u", closing)), "transport delay of the control"), "v(u)"
    both = [copied]
    ends = []
    for name, delay in (("on", closing), ("off", opening)):
        both += _line(name, "gate", f"u{name}", delay) if delay > 0.0 else (f"E{name} u{name} 0 gate 0 1",)
        ends.append(f"v(u{name})")
    pick = "min" if closing > opening else "max"
    note = "transport delay of the control, closing and opening apart: the later copy on each edge"
    return named(both, note), f"{pick}({ends[0]},{ends[1]})"
