"""Transistor known by swing, ceiling and floor as a sub-circuit: ``benchmark.physics.steep_swing`` (layer 4).

The control counts from the lower end of the path (the larger of the voltages from the gate to both ends) and passes
the transit of the device as a pure delay. The blend is written without a branch: above zero control
I_off + I_on g / (g + I_on e^-x) with g = I_off (1 - e^-x), below zero the plain exponential; the first term is
I_off e^min(x, 0) in both. Charges (``charged``): the gate capacitance split between source and drain.
"""

from __future__ import annotations

import math

from benchmark.devices.netlist.parts import Polarity, SwitchText, across, control_path, named, number, scalar
from benchmark.devices.record import Array, Switch

__all__ = ["blend_text"]


def blend_text(
    switch: Switch,
    polarity: Polarity,
    parts: tuple[Array, Array, Array, Array, Array],
    gate: tuple[float | Array, float | Array],
    terminal: float | Array,
) -> SwitchText:
    """Return one steep-swing transistor as text.

    Parameters
    ----------
    switch : Switch
        The record at the same point: its times delay the control.
    polarity : {"down", "up"}
        n sense or p sense.
    parts : tuple of array_like
        Swing [V/decade], ceiling and floor [A], saturation voltage [V], threshold shift [V].
    gate : tuple of array_like
        Capacitance from the gate to source and to drain [F].
    terminal : array_like
        Capacitance of one conducting terminal beside its coupling to the gate [F].
    """
    swing, ceiling, floor, saturation, shift = (scalar(part) for part in parts)
    delay, rail_control = control_path(switch, polarity)
    lifted = f"max({across(polarity, 'p', 's')},{across(polarity, 'p', 'd')})"
    control = f"({rail_control}+{lifted}-{number(shift)})"
    x = f"({number(math.log(10.0) / swing)}*{control})"
    decay = f"exp(-max({x},0))"
    gated = f"({number(floor)}*(1-{decay}))"
    on = number(ceiling)
    blend = f"({number(floor)}*exp(min({x},0))+{on}*{gated}/({gated}+{on}*{decay}))"
    half = number(2.0 * saturation)
    # 1 - e^-z = 2 tanh(z/2) / (1 + tanh(z/2)), odd in the path voltage
    factor = f"(2*tanh(v(d,s)/{half})/(1+tanh(abs(v(d,s))/{half})))"
    driven = delay + named((f"Bpath d s I={{size}}*{blend}*{factor}",), "current: blend times drain factor")
    ends = [(end, scalar(value)) for end, value in zip(("s", "d"), gate, strict=True)]
    edges = [f"Cgate{end} g {end} {{{number(value)}*size}}" for end, value in ends if value > 0.0]
    return SwitchText(driven, driven + named(edges, "gate capacitance, split"), scalar(terminal))
