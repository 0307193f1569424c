"""Ohmic path with a log-linear window as a sub-circuit: ``benchmark.devices.ohmic_law`` (layer 4)."""

from __future__ import annotations

import math

import numpy as np

from benchmark.devices.netlist.parts import Polarity, SwitchText, control_path, named, number, scalar
from benchmark.devices.record import Array, Switch
from benchmark.physics.ohmic import PERFECT_DECADES, conduction_window

__all__ = ["ohmic_text"]


def ohmic_text(
    switch: Switch, polarity: Polarity, supply: float | Array, on: Array, opened: Array | None, level: Array
) -> SwitchText:
    """Return one switch stated by two resistances and a switching level.

    Parameters
    ----------
    switch : Switch
        The record at the same point: times of the control, capacitances.
    polarity : {"down", "up"}
        Pull-down or pull-up.
    supply : array_like
        V [V].
    on, opened : array_like
        Resistance at full and at zero control [ohm]; ``opened`` None: exactly no current.
    level : array_like
        Switching level w [1].
    """
    delay, control = control_path(switch, polarity)
    decades = PERFECT_DECADES if opened is None else float(np.log10(scalar(opened) / scalar(on)))
    start, end = (scalar(x) for x in conduction_window(scalar(level), decades))
    x = f"min(max(({control}/{number(supply)}-{number(start)})/{number(end - start)},0),1)"
    rate = math.log(10.0) * decades
    share = (
        f"((exp({number(rate)}*{x})-1)/{number(math.expm1(rate))})"
        if opened is None
        else f"exp({number(rate)}*({x}-1))"
    )
    path = named((f"Bpath d s I={{size}}*v(d,s)*{share}/{number(on)}",), "ohmic path, log-linear window")
    driven = delay + path
    gate = (f"Cgate g p {{{number(switch.input_capacitance_delay)}*size}}",)
    charged = driven + named(gate, "input capacitance")
    return SwitchText(driven, charged, scalar(switch.terminal_capacitance))
