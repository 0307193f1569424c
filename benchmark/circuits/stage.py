"""One stage: delay of both edges, energy per rising transition, leakage (layer 5). The same for every technology.

Delay of one edge [s]::

    t = t_int + F [R (C_self + c L + sum C_in + C_fixed) + r L (sum C_in + C_fixed)] + W r c L^2

R: worst driving path; t_int = max(closing time of the stack that closes, opening time of the switch that opens);
F and W by the delay rule (``rules.py``); loads at the far end of the wire. The stage delay is the mean of the falling
and the rising edge; the slower edge is kept beside it.

Energy per rising transition of the output, that is per full cycle, drawn from the rail [J]::

    E = V_rail V_swing (C_self + C_wire + C_fixed + C_layout) + V_rail Q_in V_swing / V + E_extra + E_short

Q_in is the charge of the driven inputs over the full supply swing V; at another swing it is scaled in proportion to
the swing (exact for constant capacitances only). V_rail = V_swing = V unless the net has a swing of its own.

Short circuit, own form: while the input ramps, the opening switch still carries current over the part of the output
swing already made. With the input ramp of duration t_r = 2 x (R C part of the stage delay) and the output following
in the second half of the ramp::

    Q = t_r integral_{1/2}^{1} I_open((1 - u) V, (u - 1/2) V) du        per edge
    E_short = V (Q_falling + Q_rising) + sum over edges V^2 / (R_closing + R_opening) max(0, t_opening - t_closing)

The second part is the overlap of a switch that opens later than its partner closes (V^2 / 2R for equal resistances).
Range: alike stages, ramps no slower than about 10 R C; beyond, the transient rule is the reference. Switches with
actuators that are slow against R C add the charge of ``motion.py``, both edges.

Two kinds of net are no complementary gate:

Discharged from outside (``Net.discharge``): a current I at the far end pulls the near end, where the loads C_near
stand, down by V_swing. On the steady ramp (exact once the line's own R C has passed; derived from the diffusion
equation)::

    t = (C_line + C_near) V_swing / I + r L C_line (C_line / 6 + C_near / 2) / (C_line + C_near)

That is its delay; restoring it costs energy but no time on the path. No short circuit.

Latch (``Net.latch_from``): see ``latch.py``; no short circuit beyond the charge of its nodes.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np

from benchmark.circuits.cells import Edge
from benchmark.circuits.circuit import Discharge, Layer, Net, Value, Wires
from benchmark.circuits.latch import latch
from benchmark.circuits.motion import lagging
from benchmark.circuits.rules import EdgeInputs, StageRule
from benchmark.circuits.sized import EDGES, OTHER, Sized
from benchmark.devices.record import Array, BoolArray, SwitchPair

__all__ = [
    "DELAY_PARTS",
    "ENERGY_PARTS",
    "LEAKAGE_PARTS",
    "EdgeDetail",
    "StageDetail",
    "StageSettings",
    "short_circuit_currents",
    "stage",
]

#: transit: load-independent; self: own terminals; input: driven inputs; fixed_load; layout: parasitic of pins;
#: wire: every term with the wire's r or c
DELAY_PARTS = ("transit", "self", "input", "fixed_load", "layout", "wire")
#: input: charge of the driven inputs; self: own terminals; extra: losses of the driven switches beyond their charge
ENERGY_PARTS = ("input", "self", "wire", "fixed_load", "layout", "extra", "short_circuit")
LEAKAGE_PARTS = ("path", "input", "body")

_NODES, _WEIGHTS = np.polynomial.legendre.leggauss(16)
#: quadrature on [1/2, 1]
_RAMP = 0.75 + 0.25 * _NODES
_RAMP_WEIGHTS = 0.25 * _WEIGHTS


@dataclass(frozen=True)
class EdgeDetail:
    """One output edge. ``falling`` is driven by the pull-down, ``rising`` by the pull-up network.

    resistance [ohm] of the driving path; factor and wire_factor [1] of the rule; delay [s]; parts [s] add up to it.
    """

    resistance: Array
    factor: Array
    wire_factor: Array
    delay: Array
    parts: Mapping[str, Array]


@dataclass(frozen=True)
class StageDetail:
    """Everything computed about one net, per single net (not multiplied by its count).

    delay [s] is the mean of the edges, worst_delay the slower of the two; energy [J] per rising transition;
    node_capacitance [F] energy-averaged, without extra and short circuit; swing [V]; wire_length [m];
    input_capacitance [F] of the driven inputs (energy); leakage_power [W] of the driver in parts; area [m^2] and
    bias_power [W] of the driver. ``unable``: reason -> mask of the points where the delay means nothing.
    """

    net: Net
    falling: EdgeDetail
    rising: EdgeDetail
    delay: Array
    delay_parts: Mapping[str, Array]
    worst_delay: Array
    energy: Array
    energy_parts: Mapping[str, Array]
    node_capacitance: Array
    input_capacitance: Array
    swing: Array
    wire_length: Array
    leakage_power: Array
    leakage_power_parts: Mapping[str, Array]
    bias_power: Array
    area: Array
    unable: Mapping[str, BoolArray] = field(default_factory=dict)


@dataclass(frozen=True)
class StageSettings:
    """What all stages of one estimate share.

    ``gate_pitch`` [m]: unit of net lengths stated in gate pitches. ``short_circuit``: the current integrals of
    ``short_circuit_currents`` by opening edge, or None to leave the short-circuit energy out (hand equations).
    ``motion``: the charges of ``motion_charges`` by closing edge; empty with it.
    """

    sized: Sized
    wires: Wires
    layers: Mapping[str, Layer]
    rule: StageRule
    gate_pitch: Array
    short_circuit: Mapping[Edge, Array] | None
    motion: Mapping[Edge, Array] = field(default_factory=dict)


def short_circuit_currents(pair: SwitchPair) -> dict[Edge, Array]:
    """Return integral_{1/2}^{1} I((1-u) V, (u-1/2) V) du [A] of one unit switch, by the polarity that opens.

    Gauss-Legendre with 16 nodes (smooth currents: to rounding; a kinked log-linear window: about 1e-4).
    """
    supply = np.asarray(pair.supply)[..., None]
    control, path = (1.0 - _RAMP) * supply, (_RAMP - 0.5) * supply
    found: dict[Edge, Array] = {}
    for edge in EDGES:
        switch = pair.down if edge == "down" else pair.up
        found[edge] = np.asarray((switch.current(control, path) * _RAMP_WEIGHTS).sum(axis=-1))
    return found


@dataclass(frozen=True)
class _Burden:
    """Capacitances [F] at one net; ``far_pins`` of the driven inputs, ``near_pin`` of the driver; wire r L [ohm].

    ``spread``: fixed loads along the wire.
    """

    inputs: Array
    far_pins: Array
    near_pin: Array
    fixed: Array
    spread: Array
    wire: Array
    wire_resistance: Array
    length: Array

    @property
    def line(self) -> Array:
        """Return the capacitance along the wire, its own and that of what stands along it."""
        return np.asarray(self.wire + self.spread)

    @property
    def far(self) -> Array:
        """Return the capacitance at the end where the loads stand."""
        return np.asarray(self.inputs + self.far_pins + self.fixed)


def _burden(net: Net, settings: StageSettings) -> _Burden:
    pin = np.asarray(settings.wires.layout_capacitance_per_pin, dtype=np.float64)
    inputs: Array = np.asarray(0.0)
    pins: Array = np.asarray(0.0)
    for load in net.loads:
        inputs = inputs + load.count * settings.sized.input_capacitance(load.cell, load.input)
        pins = pins + load.count * pin
    length = np.asarray(net.wire_length, dtype=np.float64)
    if net.length_unit == "gate_pitch":
        length = length * settings.gate_pitch
    layer = settings.wires.layer(net.layer, settings.layers)
    return _Burden(
        inputs=np.asarray(inputs),
        far_pins=np.asarray(pins),
        near_pin=np.asarray(pin * net.copies),
        fixed=np.asarray(net.fixed_load, dtype=np.float64),
        spread=np.asarray(net.load_per_length * length),
        wire=np.asarray(layer.capacitance_per_length * length),
        wire_resistance=np.asarray(layer.resistance_per_length * length),
        length=np.asarray(length),
    )


def _edge(net: Net, edge: Edge, burden: _Burden, settings: StageSettings) -> EdgeDetail:
    sized = settings.sized
    resistance = np.asarray(sized.path_resistance(net.driver, edge) / net.copies)
    own = sized.output_capacitance(net.driver, "delay", edge) * net.copies
    far = burden.far
    answer = settings.rule(
        EdgeInputs(
            closing=sized.switch(edge),
            opening=sized.switch(OTHER[edge]),
            supply=sized.pair.supply,
            resistance=resistance,
            capacitance=np.asarray(own + burden.near_pin + burden.line + far),
            transit=sized.transit(net.driver, edge),
        )
    )
    charging = answer.factor * resistance
    through_wire = answer.factor * burden.wire_resistance * far
    parts = {
        "transit": answer.transit,
        "self": charging * own,
        "input": charging * burden.inputs,
        "fixed_load": charging * (burden.fixed + burden.spread),
        "layout": charging * (burden.near_pin + burden.far_pins),
        "wire": charging * burden.wire + through_wire + answer.wire_factor * burden.wire_resistance * burden.line,
    }
    return EdgeDetail(resistance, answer.factor, answer.wire_factor, _total(parts), parts)


def _discharged(net: Net, discharge: Discharge, burden: _Burden, settings: StageSettings) -> EdgeDetail:
    """Return the falling edge of a net that a constant current discharges; see the module docstring."""
    own = settings.sized.output_capacitance(net.driver, "delay", "down") * net.copies
    near = own + burden.near_pin + burden.far
    swing = np.asarray(net.swing, dtype=np.float64)
    slope = np.asarray(swing / np.asarray(discharge.current, dtype=np.float64))  # seconds per farad
    whole = burden.line + near
    lag = np.asarray((burden.line / 6.0 + near / 2.0) / np.where(whole > 0.0, whole, 1.0))
    parts = {
        "transit": np.asarray(0.0),
        "self": slope * own,
        "input": slope * burden.inputs,
        "fixed_load": slope * (burden.fixed + burden.spread),
        "layout": slope * (burden.near_pin + burden.far_pins),
        "wire": slope * burden.wire + lag * burden.wire_resistance * burden.line,
    }
    return EdgeDetail(slope, np.asarray(1.0), lag, _total(parts), parts)


def _latched(
    net: Net, start: Value, burden: _Burden, settings: StageSettings
) -> tuple[EdgeDetail, Mapping[str, BoolArray]]:
    """Return the edge of a cross-coupled inverter that regenerates, and why it cannot."""
    sized = settings.sized
    own = 0.5 * sum(sized.output_capacitance(net.driver, "delay", edge) for edge in EDGES) * net.copies
    pins = burden.near_pin + burden.far_pins
    whole = np.asarray(own + burden.near_pin + burden.line + burden.far)
    transit = np.maximum(sized.transit(net.driver, "down"), sized.transit(net.driver, "up"))
    found = latch(sized.pair, start, whole / (net.copies * sized.size), transit)
    each = np.asarray(found.charging / np.where(whole > 0.0, whole, 1.0))  # seconds per farad
    parts = {
        "transit": found.waiting,
        "self": each * own,
        "input": each * burden.inputs,
        "fixed_load": each * (burden.fixed + burden.spread),
        "layout": each * pins,
        "wire": each * burden.wire,
    }
    one = np.asarray(1.0)
    return EdgeDetail(each, one, one, _total(parts), parts), found.unable


def _total(parts: Mapping[str, Array]) -> Array:
    total: Array = np.asarray(0.0)
    for value in parts.values():
        total = total + value
    return np.asarray(total)


def _short_circuit(net: Net, edges: Mapping[Edge, EdgeDetail], settings: StageSettings, node: Array) -> Array:
    """Return the short-circuit energy of one full output cycle [J]; ``node``: C V [C]. See the module docstring."""
    if settings.short_circuit is None:
        return np.asarray(0.0)
    sized = settings.sized
    supply = sized.pair.supply
    ramp = edges["down"].delay + edges["up"].delay - edges["down"].parts["transit"] - edges["up"].parts["transit"]
    energy: Array = np.asarray(0.0)
    for edge in EDGES:
        closing, opening = sized.switch(edge), sized.switch(OTHER[edge])
        # current of the opening path: the unit switch's, scaled by how much better the path conducts
        scale = opening.resistance / edges[OTHER[edge]].resistance
        energy = energy + supply * ramp * scale * settings.short_circuit[OTHER[edge]]
        overlap = np.maximum(0.0, opening.opening_time - closing.closing_time)
        paths = edges[edge].resistance + edges[OTHER[edge]].resistance
        energy = energy + supply**2 / paths * overlap
        if settings.motion:
            with np.errstate(invalid="ignore"):  # a switch that never conducts carries no charge
                share = np.where(np.isfinite(paths), (closing.resistance + opening.resistance) / paths, 0.0)
            energy = energy + supply * lagging(settings.motion[edge] * share, node)
    return np.asarray(energy)


def stage(net: Net, settings: StageSettings) -> StageDetail:
    """Return delay, energy, leakage and area of one net and its driver; see the module docstring."""
    sized = settings.sized
    supply = np.asarray(sized.pair.supply)
    burden = _burden(net, settings)
    unable: Mapping[str, BoolArray] = {}
    edges: dict[Edge, EdgeDetail] = {"up": _edge(net, "up", burden, settings)}
    if net.discharge is not None:
        edges["down"] = _discharged(net, net.discharge, burden, settings)
    elif net.latch_from is not None:
        edges["down"], unable = _latched(net, net.latch_from, burden, settings)
    else:
        edges["down"] = _edge(net, "down", burden, settings)
    timed = (edges["down"], edges["up"]) if net.gated else (edges["down"], edges["down"])
    delay_parts = {name: np.asarray(0.5 * (timed[0].parts[name] + timed[1].parts[name])) for name in DELAY_PARTS}

    swing = supply if net.swing is None else np.asarray(net.swing, dtype=np.float64)
    rail = swing if net.swing_from == "own-rail" else supply
    if net.discharge is not None:
        rail = np.asarray(net.discharge.rail, dtype=np.float64)
    own = sized.output_capacitance(net.driver, "energy", "down") * net.copies
    charge: Array = np.asarray(0.0)
    extra: Array = np.asarray(0.0)
    for load in net.loads:
        charge = charge + load.count * sized.input_charge(load.cell, load.input)
        extra = extra + load.count * sized.extra_energy(load.cell, load.input)
    inputs = np.asarray(charge / np.where(supply > 0.0, supply, np.nan))
    pins = burden.near_pin + burden.far_pins
    per_farad = rail * swing
    energy_parts = {
        "input": np.asarray(per_farad * inputs),
        "self": np.asarray(per_farad * own),
        "wire": np.asarray(per_farad * burden.wire),
        "fixed_load": np.asarray(per_farad * (burden.fixed + burden.spread)),
        "layout": np.asarray(per_farad * pins),
        "extra": np.asarray(extra),
    }
    node = np.asarray(_total(energy_parts) / np.where(supply > 0.0, supply, np.nan))
    energy_parts["short_circuit"] = _short_circuit(net, edges, settings, node) if net.gated else np.asarray(0.0)
    leakage = {
        name: np.asarray(supply * value * net.copies) for name, value in sized.leakage_current(net.driver).items()
    }
    return StageDetail(
        net=net,
        falling=edges["down"],
        rising=edges["up"],
        delay=_total(delay_parts),
        delay_parts=delay_parts,
        worst_delay=np.asarray(np.maximum(timed[0].delay, timed[1].delay)),
        energy=_total(energy_parts),
        energy_parts=energy_parts,
        node_capacitance=np.asarray(inputs + own + burden.wire + (burden.fixed + burden.spread) + pins),
        input_capacitance=inputs,
        swing=np.asarray(swing),
        wire_length=burden.length,
        leakage_power=_total(leakage),
        leakage_power_parts=leakage,
        bias_power=np.asarray(sized.bias_power(net.driver) * net.copies),
        area=np.asarray(sized.area(net.driver) * net.copies),
        unable=unable,
    )
