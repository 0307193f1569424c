"""Adder of complex gates: one gate per sum bit and one per carry, all its switches moved at once (layer 5).

For switches whose closing time does not depend on the load and does not add up along a stack, one large gate is as
fast as a small one. The word is cut into groups of ``group_bits`` bits m. Inside a group every sum bit is one gate of
the operand bits up to it and the carry into the group; the carry out of the group is one more gate. A word of one group
is added in one mechanical delay, one of G groups in G of them.

Networks. The carry out of bit i, from c the carry into the group::

    M_0 = c,   M_(i+1) = a_i b_i + (a_i + b_i) M_i          (stack of i + 2 switches, c at the output)

Majority is its own dual, so pull-up and pull-down networks are alike (the mirror form). A gate inverts: from true
signals it gives the complement of the carry, from complements the carry; both rails are made, at the same time. The sum
needs both rails of everything, so operands and carry in come in both polarities::

    sum_i is low when  M_i (a_i xor b_i) + not M_i not (a_i xor b_i)       (stack of i + 3 switches)

The largest stack is m + 2. (Complementary mirror gates: common practice, no source. Relay adders share the switches of
one pass network between all sums instead: fewer switches, the same mechanical delay; F. Chen and others, ICCAD 2008,
from memory.)
"""

from __future__ import annotations

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
from benchmark.circuits.cells import Cell, Network, Parallel, Series, Switched, cell
from benchmark.circuits.circuit import Circuit
from benchmark.circuits.netlist import Gate, Netlist, longest_path
from benchmark.circuits.prefix_adder import ADDITION

__all__ = ["COMPLEX_GATE_ADDER", "MOST_GROUP_BITS", "carry_cell", "complex_gate_adder", "sum_cell"]

#: every input state of a gate is looked at, so groups are bounded: 2^(2 m + 1) states
MOST_GROUP_BITS: Final = 5
WIDEST: Final = 256


def _other(name: str) -> str:
    """Return the name of the complement of a signal."""
    return name.removesuffix("_not") if name.endswith("_not") else f"{name}_not"


def _carry(bits: int, rail: str) -> Network:
    """Return M_bits of the inputs a0, b0, .. and c, or of their complements when ``rail`` is "_not"."""
    found: Network = Switched(f"c{rail}")
    for i in range(bits):
        a, b = Switched(f"a{i}{rail}"), Switched(f"b{i}{rail}")
        found = Parallel((Series((a, b)), Series((found, Parallel((a, b))))))
    return found


def _inputs(bits: int) -> tuple[str, ...]:
    return (*(f"{word}{i}" for i in range(bits) for word in "ab"), "c")


@lru_cache(maxsize=MOST_GROUP_BITS)
def carry_cell(bits: int) -> Cell:
    """Return the gate of the carry out of ``bits`` bits: inputs a0, b0, .. and c, output inverted."""
    network = _carry(bits, "")
    return Cell(f"carry{bits}", _inputs(bits), network, network)


@lru_cache(maxsize=MOST_GROUP_BITS)
def sum_cell(bit: int) -> Cell:
    """Return the gate of sum bit ``bit`` (from 0) of a group: inputs a0, a0_not, b0, .., c, c_not, output true."""
    a, b, a_not, b_not = (Switched(f"{word}{bit}{rail}") for rail in ("", "_not") for word in "ab")
    differ = Parallel((Series((a, b_not)), Series((a_not, b))))
    alike = Parallel((Series((a, b)), Series((a_not, b_not))))
    network = Parallel((Series((_carry(bit, ""), differ)), Series((_carry(bit, "_not"), alike))))
    pairs = tuple((name, f"{name}_not") for name in _inputs(bit + 1))
    return Cell(f"sum{bit + 1}", tuple(name for pair in pairs for name in pair), network, network, pairs)


@lru_cache(maxsize=32)
def complex_gate_adder(bits: int, group_bits: int) -> Netlist:
    """Return the adder of two words of ``bits`` bits in groups of ``group_bits``, the last one with what is left.

    Primary inputs are the operand bits and the carry in, each followed by its complement ``.._not``.
    """
    primary = ("carry_in", *(f"{word}{i}" for i in range(bits) for word in "ab"))
    gates = []
    carry = "carry_in"
    for start in range(0, bits, group_bits):
        stop = min(start + group_bits, bits)
        operands = [f"{word}{i}" for i in range(start, stop) for word in "ab"]
        for i in range(start, stop):
            known = [*operands[: 2 * (i - start + 1)], carry]
            rails = tuple(rail for name in known for rail in (name, _other(name)))
            gates.append(Gate(f"sum{i}", sum_cell(i - start), rails))
        reads, out = (*operands, carry), f"carry{stop - 1}"
        gates.append(Gate(out, carry_cell(stop - start), tuple(_other(name) for name in reads)))
        if stop < bits:  # the last carry leaves in one polarity
            gates.append(Gate(_other(out), carry_cell(stop - start), reads))
        carry = out
    inputs = tuple(rail for name in primary for rail in (name, _other(name)))
    return Netlist(f"{bits}-bit complex-gate adder", inputs, tuple(gates), (*(f"sum{i}" for i in range(bits)), carry))


@lru_cache(maxsize=32)
def _plan(bits: int, group_bits: int) -> tuple[Planned, ...]:
    netlist = complex_gate_adder(bits, group_bits)
    # every sum and every carry is high for half of all operands, and so is its complement
    activity = dict.fromkeys([*netlist.inputs, *(gate.output for gate in netlist.gates)], 0.25)
    path = longest_path(netlist, burden=burden(netlist))
    return (*plan_operands(netlist, activity), *plan_nets(netlist, activity, path, cell("inverter")))


def _circuit(which: BuiltIn, scenario: Scenario) -> Circuit:
    bits = single(scenario, "word_length", 2, WIDEST)
    group = single(scenario, "group_bits", 1, min(bits, MOST_GROUP_BITS))
    groups = -(-bits // group)
    return Circuit(
        which.name,
        which.title,
        which.operation,
        wired(_plan(bits, group), scenario),
        assumptions=(
            f"{groups} groups of up to {group} bits; one complementary gate per sum bit and per rail of a carry, "
            f"stacks of up to {group + 2} switches; {groups} gates on the path.",
            "Operands and carry in arrive in both polarities, as registers deliver them; an inverter drives each rail, "
            "every sum bit and the carry out drive one.",
            "Operands change once per operation, independent and uniform (activity exact); hazards are not counted.",
            "The path starts where the operands have arrived and is the one of most gates, among equals the one of the "
            "deepest stacks and most driven inputs.",
            *wire_remark(scenario),
        ),
    )


COMPLEX_GATE_ADDER: Final = BuiltIn(
    "complex-gate-adder",
    "Adder of one complex gate per sum and carry, in groups of bits",
    "one addition of two words",
    _circuit,
    ("word_length", "group_bits"),
    whole=("word_length", "group_bits"),
    function=ADDITION,
)
