"""Decks for ngspice: a chain or a ring of alike stages that measures itself, from sub-circuit texts (layer 5).

A deck runs by itself (``ngspice -b FILE``) and prints ``name = value`` lines. Capacitances:

``delay``, ``energy``
    The constants of the switch record (switching window, or charge over the full swing), lumped at the nodes as the
    closed rules and the transient of this program use them; gates draw nothing. This compares solvers, not models.
``device``
    The charges of the device itself: coupling from input to output, and charge that changes with the voltages.

A chain with constants repeats one stage. With ``device`` every stage is the fan-out times as large as the one before,
so each drives exactly its own kind; the measured one has size 1. The energy is then the power into the
measured stage through supply, input and output: the supply alone would miss what coupling carries.

Wires are a ladder of three pi sections, as in ``benchmark.circuits.transient``; a stage reaches from the far end of one
wire to the far end of the next. Terminals at internal nodes of a cell stand where they are.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from benchmark.circuits.cells import Cell, Edge, Sizing
from benchmark.circuits.circuit import Layer, Net, Value, Wires
from benchmark.circuits.deck_cells import Capacitances, cell_lines, inner_levels, side_inputs, switch_lines
from benchmark.circuits.deck_control import ChainProbe, chain_control, ring_control
from benchmark.circuits.sized import EDGES, Sized
from benchmark.devices.netlist.parts import SubCircuits, number, scalar
from benchmark.errors import UsageError

__all__ = ["Capacitances", "DeckStage", "Pace", "chain_deck", "deck_stage", "ring_deck"]

SECTIONS: Final = 3
#: stages up to and including the measured one, and all stages
_LENGTH: Final[Mapping[Capacitances, tuple[int, int]]] = {"delay": (6, 6), "energy": (6, 6), "device": (5, 7)}
#: steps a period may have at most; the simulator refines them by itself
_MOST_STEPS: Final = 40_000


@dataclass(frozen=True)
class DeckStage:
    """One stage: a driver and what its net carries, all for one net of the circuit.

    driver, pin
        Cell and its driven input.
    size, sizing
        Size of the cell's switches, parallel copies included, and the sizing rule.
    near, far [F]
        Capacitance at the output and at the far end of the wire, beside what the sub-circuits hold themselves.
    wire_resistance [ohm], wire_capacitance [F]
        Of the whole wire, loads along it included.
    inner [F]
        One terminal of unit width at an internal node, by network.
    fan_out [1]
        Driven inputs over copies of the driver; only ``device`` uses it, the constants are in ``far``.
    """

    driver: Cell
    pin: str
    size: float
    sizing: Sizing
    near: float
    far: float
    wire_resistance: float
    wire_capacitance: float
    inner: Mapping[Edge, float]
    fan_out: float
    capacitances: Capacitances


@dataclass(frozen=True)
class Pace:
    """Scales that set steps, lengths and tolerances; none of them is a result.

    delay [s], current [A]
        Estimate of the stage delay; on-current of a unit switch.
    ring_down [s]
        Time the ringing of an actuator takes to die.
    half [s]
        Half the period of the pulses; None: from the others.
    """

    delay: float
    current: float
    ring_down: float = 0.0
    half: float | None = None

    def half_period(self, stages: int) -> float:
        """Return half the period: all stages have answered and settled, even if the estimate is half the truth."""
        if self.half is not None:
            return self.half
        return (2.0 * stages + 16.0) * self.delay + self.ring_down

    def step(self, length: float) -> float:
        """Return the largest time step."""
        return max(self.delay / 30.0, length / _MOST_STEPS)


def deck_stage(
    net: Net,
    sized: Sized,
    texts: SubCircuits,
    wires: Wires,
    layers: Mapping[str, Layer],
    gate_pitch: Value,
    capacitances: Capacitances,
) -> DeckStage:
    """Return a net of a circuit as a stage of a deck, at one design point.

    Raises
    ------
    UsageError
        If the net has a swing of its own or is no gate's output, or ``device`` is asked for and it drives another cell
        than its own kind.
    """
    if net.swing is not None or not net.gated:
        message = f"net {net.name!r} does not swing from rail to rail by a gate: there is no chain of such stages"
        raise UsageError(message)
    own = [load for load in net.loads if load.cell == net.driver]
    pin = own[0].input if own else net.driver.inputs[0]
    device = capacitances == "device"
    if device and (len(own) != len(net.loads) or len({load.input for load in own}) > 1):
        message = f"net {net.name!r} drives other cells or inputs than its own: only the capacitances delay or energy"
        raise UsageError(message)
    inner = {edge: _terminal(sized, texts, edge, capacitances) for edge in EDGES}
    size = scalar(sized.size) * scalar(net.copies)
    near = sum(inner[edge] * net.driver.output_width(edge, sized.sizing) for edge in EDGES) * size
    per_pin = scalar(wires.layout_capacitance_per_pin)
    pins = sum(scalar(load.count) for load in net.loads)
    far = per_pin * pins + scalar(net.fixed_load)
    if not device:
        far += sum(scalar(load.count) * _input(sized, load.cell, load.input, capacitances) for load in net.loads)
    length = scalar(net.wire_length) * (scalar(gate_pitch) if net.length_unit == "gate_pitch" else 1.0)
    layer = wires.layer(net.layer, layers)
    return DeckStage(
        driver=net.driver,
        pin=pin,
        size=size,
        sizing=sized.sizing,
        near=near + per_pin * scalar(net.copies),
        far=far,
        wire_resistance=scalar(layer.resistance_per_length) * length,
        wire_capacitance=(scalar(layer.capacitance_per_length) + scalar(net.load_per_length)) * length,
        inner=inner,
        fan_out=pins / scalar(net.copies),
        capacitances=capacitances,
    )


def _terminal(sized: Sized, texts: SubCircuits, edge: Edge, capacitances: Capacitances) -> float:
    switch = sized.switch(edge)
    if capacitances == "device":
        return texts.of(edge).terminal
    return scalar(switch.terminal_capacitance_delay if capacitances == "delay" else switch.terminal_capacitance)


def _input(sized: Sized, cell: Cell, pin: str, capacitances: Capacitances) -> float:
    if capacitances == "delay":
        return scalar(sized.input_capacitance(cell, pin))
    return scalar(sized.input_charge(cell, pin)) / scalar(sized.pair.supply)


def _stage_lines(stage: DeckStage) -> list[str]:
    """Return the sub-circuit ``stage``: cell, capacitances and wire; ports ``in far vdd``, parameter ``scale``."""
    sides = side_inputs(stage.driver, stage.pin)
    pins = ["in" if name == stage.pin else ("vdd" if sides[name] else "0") for name in stage.driver.inputs]
    wired = stage.wire_resistance > 0.0
    output = "out" if wired else "far"
    lines = [
        ".subckt stage in far vdd scale=1",
        f"xcell {output} vdd {' '.join(pins)} {stage.driver.name} size={{{number(stage.size)}*scale}}",
    ]
    nodes = [output]
    caps = [stage.near + stage.wire_capacitance + stage.far]
    if wired:
        share = stage.wire_capacitance / SECTIONS
        nodes = [output, *(f"w{k}" for k in range(1, SECTIONS)), "far"]
        caps = [stage.near + 0.5 * share, *[share] * (SECTIONS - 1), stage.far + 0.5 * share]
        each = number(stage.wire_resistance / SECTIONS)
        lines += [f"Rwire{k} {nodes[k]} {nodes[k + 1]} r={{{each}/scale}}" for k in range(SECTIONS)]
    lines += [f"C{node} {node} 0 {{{number(c)}*scale}}" for node, c in zip(nodes, caps, strict=True) if c > 0.0]
    return [*lines, ".ends"]


def _head(comments: Sequence[str], stage: DeckStage, texts: SubCircuits, supply: float) -> list[str]:
    """Return everything before the instances. The first line of a deck is its title, never a command."""
    return [
        *(f"* {_one_line(comment)}" for comment in comments),
        *(f"* {_one_line(note)}" for note in texts.notes),
        *switch_lines(texts, stage.capacitances),
        *cell_lines(stage.driver, stage.sizing, stage.inner),
        *_stage_lines(stage),
        f"Vdd vdd 0 {number(supply)}",
    ]


def _one_line(text: str) -> str:
    """Return a text that stays one line of plain letters, so that no title becomes a command."""
    return "".join(letter if " " <= letter <= "~" else "?" for letter in text)


def _options(smallest: float) -> str:
    """Return the options; the smallest charge that counts follows the smallest capacitance."""
    charge = number(1.0e-7 * smallest)
    # an open switch is no singular row: its conductance may be far below the smallest pivot accepted by default
    return f".options method=trap trtol=1 chgtol={charge} gmin=1e-18 pivtol=1e-30 itl1=1000 itl2=1000 itl4=200"


def chain_deck(
    comments: Sequence[str], stage: DeckStage, texts: SubCircuits, supply: float | np.ndarray, pace: Pace
) -> str:
    """Return the deck of a chain of alike stages, pulsed once.

    Parameters
    ----------
    comments : sequence of str
        What the reader should know, at least one line.
    stage : DeckStage
        The stage that is repeated.
    texts : SubCircuits
        The switches.
    supply : array_like
        V [V].
    pace : Pace
        Time scales.

    Returns
    -------
    str
        Prints the names of ``STATIC_RESULTS`` and ``CHAIN_RESULTS`` of ``benchmark.circuits.deck_control``.
    """
    volts = scalar(supply)
    measured, stages = _LENGTH[stage.capacitances]
    device = stage.capacitances == "device"
    growth = stage.fan_out if device else 1.0
    half = pace.half_period(stages)
    start, rise = pace.delay, 2.0 * pace.delay
    lines = _head(comments, stage, texts, volts)
    lines += [
        f"Vmeas meas 0 {number(volts)}",
        f"Vin n0 0 dc 0 pulse(0 {number(volts)} {number(start)} {number(rise)} {number(rise)} "
        f"{number(half - rise)} {number(2.0 * half)})",
    ]
    lines += [
        "Vstatic sin 0 0",
        f"Vrail srail 0 {number(volts)}",
        "xstatic sin sout srail stage scale=1",
    ]
    guesses = [_guess(stage, "xstatic", "sout", volts, False)]
    power = f"-i(vmeas)*{number(volts)}"
    for k in range(1, stages + 1):
        scale = growth ** (k - measured)
        into, out = f"n{k - 1}", f"n{k}"
        if k == measured and device:
            lines += [f"Vsource {into} {into}i 0", f"Voutput {out}o {out} 0"]
            power += f"+v({into})*i(vsource)-v({out})*i(voutput)"
            into, out = f"{into}i", f"{out}o"
        rail = "meas" if k == measured else "vdd"
        lines.append(f"x{k} {into} {out} {rail} stage scale={number(scale)}")
        guesses.append(_guess(stage, f"x{k}", f"n{k}", volts, k % 2 == 0))
    if device:
        last = stages + 1
        lines.append(f"x{last} n{stages} n{last} vdd stage scale={number(growth ** (last - measured))}")
        guesses.append(_guess(stage, f"x{last}", f"n{last}", volts, last % 2 == 0))
    lines += guesses
    probe = ChainProbe(
        source=f"n{measured - 1}",
        output=f"n{measured}",
        falls_first=measured % 2 == 1,
        power=power,
        supply=volts,
        current=pace.current,
        step=pace.step(2.0 * half),
        start=start,
        period=2.0 * half,
    )
    lines += [_options(_smallest(stage)), *chain_control(probe)]
    return "\n".join(lines) + "\n"


def _guess(stage: DeckStage, instance: str, output: str, supply: float, high: bool) -> str:
    """Return first guesses of one stage at rest; ``high``: its input is high.

    Without them Newton's method jumps between the two saturated sides of every stage.
    """
    levels = inner_levels(stage.driver, {**side_inputs(stage.driver, stage.pin), stage.pin: high})
    nodes = {output: not high, **{f"{instance}.xcell.{node}": level for node, level in levels.items()}}
    return ".nodeset " + " ".join(f"v({node})={number(supply if level else 0.0)}" for node, level in nodes.items())


def _smallest(stage: DeckStage) -> float:
    return max(min(c for c in (stage.near, stage.far, 1.0e-15) if c > 0.0), 1.0e-19)


def ring_deck(
    comments: Sequence[str],
    stage: DeckStage,
    texts: SubCircuits,
    supply: float | np.ndarray,
    pace: Pace,
    stages: int,
) -> str:
    """Return the deck of a ring of ``stages`` (odd) alike stages. Parameters as for ``chain_deck``.

    With ``device`` a fan-out above 1 hangs on every output as one more cell of that size, which drives a cell of its
    own kind; the ring itself closes over the first input.

    Returns
    -------
    str
        Prints the names of ``RING_RESULTS`` of ``benchmark.circuits.deck_control``.
    """
    if stages < 3 or stages % 2 == 0:
        message = f"a ring needs an odd number of stages, 3 or more, not {stages}"
        raise UsageError(message)
    volts = scalar(supply)
    lines = _head(comments, stage, texts, volts)
    levels = []
    extra = stage.fan_out - 1.0 if stage.capacitances == "device" else 0.0
    for k in range(stages):
        lines.append(f"x{k} n{k} n{(k + 1) % stages} vdd stage scale=1")
        levels.append(f"v(n{k})={number(volts if k % 2 else 0.0)}")
        if extra > 0.0:
            lines.append(f"xload{k} n{k} load{k} vload stage scale={number(extra)}")
            lines.append(f"xmore{k} load{k} more{k} vload stage scale={number(extra * stage.fan_out)}")
    if extra > 0.0:
        lines.append(f"Vload vload 0 {number(volts)}")
    length = 24.0 * stages * pace.delay + pace.ring_down
    lines += [f".ic {' '.join(levels)}", _options(_smallest(stage))]
    lines += ring_control("n0", stages, volts, pace.current, pace.step(length), length)
    return "\n".join(lines) + "\n"
