"""Adders with parallel-prefix carries, as netlists of inverting cells (layer 5).

Same interface as the ripple adder: two words, a carry in, the sum and a carry out. Bit 0 of the prefix graph is the
carry in, bit i + 1 holds operand bit i, so an adder of N bits has the graph of N bits and one more cell for the carry
out.

Cells. Generate and propagate start inverted, NAND2 and NOR2 of the operand bits. A prefix cell that reads inverted
signals gives true ones (OAI21 for generate, NOR2 for propagate), one that reads true signals gives inverted ones
(AOI21, NAND2); an inverter is added, once per signal, where a signal is needed in its other polarity. Of the two
polarities a cell takes the one that is ready first. The half sum is NOR2 and AOI21, the sum NOR2 and AOI21 or NAND2
and OAI21 by the polarity of its carry. (Alternating polarity: common practice, no source.)
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache
from typing import Final

from benchmark.circuits.built_in import (
    BuiltIn,
    Planned,
    Scenario,
    burden,
    plan_nets,
    plan_operands,
    single,
    wire_remark,
    wired,
)
from benchmark.circuits.cells import cell
from benchmark.circuits.circuit import Circuit
from benchmark.circuits.netlist import Gate, Netlist, longest_path
from benchmark.circuits.prefix import prefix_counts, prefix_graph
from benchmark.errors import UsageError

__all__ = ["ADDITION", "PREFIX_ADDERS", "PrefixAdder", "prefix_adder"]

#: what every adder here computes; circuits of one function may stand against each other
ADDITION: Final = "sum of two words of word_length bits and a carry, with carry out"
WIDEST: Final = 256

#: a signal: "g" or "p", highest and lowest bit of its group
_Signal = tuple[str, int, int]


@dataclass(frozen=True)
class PrefixAdder:
    """A netlist with what its construction knows.

    high [1]
        Probability that each net is high for uniform independent operands and carry in, exact: a carry is high half of
        the time, a generate signal of n bits without carry in (1 - 2^-n)/2, a propagate signal (3/4)^n.
    reach [bit pitches]
        Distance along the word from the driver of each net to its farthest reader, one wire per net.
    """

    netlist: Netlist
    high: Mapping[str, float]
    reach: Mapping[str, float]

    @property
    def activity(self) -> dict[str, float]:
        """Return a01 = p (1 - p) of every net, independent operands in every operation, no hazards."""
        return {net: p * (1.0 - p) for net, p in self.high.items()}


def _chance(signal: _Signal) -> float:
    """Return the probability that a generate or propagate signal is 1."""
    kind, high, low = signal
    bits = high - low + 1
    if kind == "p":
        return float(0.75**bits)
    return 0.5 if low == 0 else float(0.5 * (1.0 - 0.5**bits))


class _Maker:
    """Collects gates; knows the nets of each signal by polarity, and after how many stages a net is ready."""

    def __init__(self) -> None:
        self.gates: list[Gate] = []
        self.high: dict[str, float] = {}
        self.column: dict[str, int] = {}
        self.stage: dict[str, int] = {}
        self.known: dict[tuple[_Signal, bool], str] = {}

    def place(self, net: str, column: int, high: float, stage: int = 0) -> str:
        """Note a net at a bit of the graph."""
        self.high[net], self.column[net], self.stage[net] = high, column, stage
        return net

    def gate(self, net: str, kind: str, inputs: tuple[str, ...], column: int, high: float) -> str:
        """Add a gate at a bit of the graph."""
        self.gates.append(Gate(net, kind, inputs))
        return self.place(net, column, high, 1 + max(self.stage[name] for name in inputs))

    def make(self, signal: _Signal, true: bool, kind: str, inputs: tuple[str, ...]) -> None:
        """Add the gate that makes a signal in one polarity."""
        name = "{}{}_{}".format(*signal) + ("" if true else "_not")
        p = _chance(signal)
        self.known[signal, true] = self.gate(name, kind, inputs, signal[1], p if true else 1.0 - p)

    def ready(self, signal: _Signal, true: bool) -> int:
        """Return the stages after which a signal is there in a polarity, through an inverter if it must be."""
        if (signal, true) in self.known:
            return self.stage[self.known[signal, true]]
        return 1 + self.stage[self.known[signal, not true]]

    def take(self, signal: _Signal, true: bool) -> str:
        """Return the net of a signal in a polarity; adds an inverter when it is not there."""
        if (signal, true) not in self.known:
            self.make(signal, true, "inverter", (self.known[signal, not true],))
        return self.known[signal, true]

    def better(self, signals: list[_Signal]) -> bool:
        """Return the polarity in which all signals are ready first; among equals the one with fewer inverters."""

        def cost(true: bool) -> tuple[int, int]:
            missing = sum((signal, true) not in self.known for signal in signals)
            return max(self.ready(signal, true) for signal in signals), missing

        return cost(True) < cost(False)

    def combine(self, bit: int, middle: int, low: int) -> None:
        """Make the group bit..low of bit..middle and middle - 1..low: generate, and propagate above bit 0."""
        upper_g, upper_p = ("g", bit, middle), ("p", bit, middle)
        lower_g, lower_p = ("g", middle - 1, low), ("p", middle - 1, low)
        true = self.better([upper_g, upper_p, lower_g, *([lower_p] if low > 0 else [])])
        inputs = (self.take(upper_p, true), self.take(lower_g, true), self.take(upper_g, true))
        self.make(("g", bit, low), not true, "aoi21" if true else "oai21", inputs)
        if low > 0:
            both = (self.take(upper_p, true), self.take(lower_p, true))
            self.make(("p", bit, low), not true, "nand2" if true else "nor2", both)

    def sum(self, i: int) -> None:
        """Make sum bit i of the half sum and the carry into the bit."""
        column, pair, carry = i + 1, (f"a{i}", f"b{i}"), ("g", i, 0)
        half = self.gate(f"half{i}", "aoi21", (*pair, self.take(("p", i + 1, i + 1), False)), column, 0.5)
        true = self.better([carry])
        net = self.take(carry, true)
        inner = self.gate(f"inner{i}", "nor2" if true else "nand2", (half, net), column, 0.25 if true else 0.75)
        self.gate(f"sum{i}", "aoi21" if true else "oai21", (half, net, inner), column, 0.5)


def _reaches(netlist: Netlist, column: Mapping[str, int]) -> dict[str, float]:
    """Return the distance from each driver to its farthest reader."""
    found = dict.fromkeys(column, 0.0)
    for gate in netlist.gates:
        for net in gate.inputs:
            found[net] = max(found[net], float(abs(column[gate.output] - column[net])))
    return found


@lru_cache(maxsize=64)
def prefix_adder(kind: str, bits: int) -> PrefixAdder:
    """Return the adder of two words of ``bits`` bits with the carries of a prefix graph.

    Raises
    ------
    UsageError
        If there is no such graph or no bit.
    """
    graph = prefix_graph(kind, bits)
    made = _Maker()
    inputs = ("carry_in", *(f"{word}{i}" for i in range(bits) for word in "ab"))
    for name in inputs:
        made.place(name, 0 if name == "carry_in" else int(name[1:]) + 1, 0.5)
    made.known[("g", 0, 0), True] = "carry_in"
    for i in range(bits):
        for signal, gate in (("g", "nand2"), ("p", "nor2")):
            made.make((signal, i + 1, i + 1), False, gate, (f"a{i}", f"b{i}"))
    for level in graph.levels:
        for which in level:
            made.combine(which.bit, which.partner + 1, which.low)
    made.combine(bits, bits, 0)
    carry_out = made.take(("g", bits, 0), True)
    for i in range(bits):
        made.sum(i)
    outputs = (*(f"sum{i}" for i in range(bits)), carry_out)
    netlist = Netlist(f"{bits}-bit {kind} adder", inputs, tuple(made.gates), outputs)
    return PrefixAdder(netlist, made.high, _reaches(netlist, made.column))


@lru_cache(maxsize=64)
def _plan(kind: str, bits: int) -> tuple[Planned, ...]:
    adder = prefix_adder(kind, bits)
    netlist, activity, reach = adder.netlist, adder.activity, adder.reach
    path = longest_path(netlist, burden=burden(netlist, reach))
    return (
        *plan_operands(netlist, activity, reach),
        *plan_nets(netlist, activity, path, cell("inverter"), reach, average=True),
    )


def _circuit(which: BuiltIn, scenario: Scenario) -> Circuit:
    kind = which.name.removesuffix("-adder")
    bits = single(scenario, "word_length", 2, WIDEST)
    _same_unit(which, scenario)
    counts = prefix_counts(prefix_graph(kind, bits))
    local = wire_remark({name: value for name, value in scenario.items() if not name.startswith("bit_")})
    return Circuit(
        which.name,
        which.title,
        which.operation,
        wired(_plan(kind, bits), scenario),
        assumptions=(
            f"Prefix graph of {bits} bits: {counts.cells} cells in {counts.levels} levels, {counts.wire} bit pitches "
            f"of wire, at most {counts.tracks} side by side.",
            "Cells alternate polarity (NAND2, NOR2, AOI21, OAI21), with inverters where a signal is needed in both.",
            "A net runs along the word from its driver to its farthest reader, once for all its readers; bits stand "
            "one bit pitch apart.",
            "An inverter drives every operand bit, every sum bit and the carry out drive one; operands change once per "
            "operation, independent and uniform (activity exact); hazards are not counted.",
            "The path starts where the operands have arrived and is the one of most gates, among equals the one that "
            "drives most inputs and wire.",
            *(("No wire inside a bit: only the wires along the word are counted.",) if local else ()),
        ),
    )


def _same_unit(which: BuiltIn, scenario: Scenario) -> None:
    """Refuse a bit pitch in one unit and an average net in the other: a net has one length."""
    for pitch, average in (("bit_pitch", "average_net_pitches"), ("bit_gate_pitches", "average_net_length")):
        if pitch in scenario and average in scenario:
            message = f"circuit {which.name!r}: {pitch} and {average} are lengths of different kinds; state both alike"
            raise UsageError(message)


PREFIX_ADDERS: Final = tuple(
    BuiltIn(
        f"{kind}-adder",
        title,
        "one addition of two words",
        _circuit,
        ("word_length",),
        one_of=(("bit_pitch", "bit_gate_pitches"),),
        whole=("word_length",),
        function=ADDITION,
    )
    for kind, title in (
        ("kogge-stone", "Parallel-prefix adder of Kogge and Stone: fewest levels, fan-out 2, most wire"),
        ("sklansky", "Parallel-prefix adder of Sklansky: fewest levels, large fan-out, little wire"),
        ("brent-kung", "Parallel-prefix adder of Brent and Kung: fewest cells, more levels"),
    )
)
