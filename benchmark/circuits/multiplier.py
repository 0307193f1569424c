"""Array multiplier of unsigned words: AND gates, half and full adders in ripple rows (layer 5).

Row j adds the partial product of bit j of the second word to what the row above left, shifted by one place; carries
ripple along the row. Row 1 adds the first two partial products. N x N: N^2 AND gates, N (N - 2) full adders, N half
adders. (Braun 1963 in its ripple-row form, Rabaey, Chandrakasan, Nikolic 2e, 11.4, from memory.)

AND: NAND2 and an inverter. Full adder: nine NAND2. Half adder: a four-NAND exclusive or, whose first gate and an
inverter give the carry.
"""

from __future__ import annotations

from collections import Counter
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
from benchmark.circuits.patterns import EXHAUSTIVE, SAMPLED, activity

__all__ = ["ARRAY_MULTIPLIER", "ArrayCell", "array_cells", "array_counts", "array_delay", "array_multiplier"]

WIDEST: Final = 64


@dataclass(frozen=True)
class ArrayCell:
    """A cell of the array: ``kind`` and, half, full; the signals it reads, and the sum and carry it gives.

    An AND gate gives only a sum, its product bit.
    """

    kind: str
    reads: tuple[str, ...]
    sum: str
    carry: str = ""


@lru_cache(maxsize=16)
def array_cells(multiplicand: int, multiplier: int) -> tuple[ArrayCell, ...]:
    """Return the cells of a multiplicand of M bits times a multiplier of N bits (both at least 2), inputs first.

    Signals: ``x0``.. and ``y0``.. of the words, ``pp{i}_{j}`` products of bits, ``s{j}_{i}`` and ``c{j}_{i}`` of row j.
    The result is ``pp0_0``, the first sum of each row, then the last row.
    """
    wide, rows = multiplicand, multiplier
    cells = [ArrayCell("and", (f"x{i}", f"y{j}"), f"pp{i}_{j}") for j in range(rows) for i in range(wide)]
    above = [f"pp{i}_0" for i in range(1, wide)]  # what the next row adds to, lowest place first
    for j in range(1, rows):
        carry, sums = "", []
        for i in range(wide):
            terms = [f"pp{i}_{j}", *above[i : i + 1], *([carry] if carry else [])]
            kind = {2: "half", 3: "full"}[len(terms)]
            cells.append(ArrayCell(kind, tuple(terms), f"s{j}_{i}", f"c{j}_{i}"))
            carry = f"c{j}_{i}"
            sums.append(f"s{j}_{i}")
        above = [*sums[1:], carry]
    return tuple(cells)


def array_counts(multiplicand: int, multiplier: int) -> dict[str, int]:
    """Return the number of AND gates, full adders and half adders."""
    found = Counter(which.kind for which in array_cells(multiplicand, multiplier))
    return {kind: found[kind] for kind in ("and", "full", "half")}


def array_delay(multiplicand: int, multiplier: int, product: float, sum_: float, carry: float) -> float:
    """Return the longest path of cells with fixed delays, found by walking the array.

    ``product`` of an AND gate, ``sum_`` and ``carry`` of the outputs of every adder, full or half. For a carry no
    slower than a sum it is [(M - 1) + (N - 2)] carry + (N - 1) sum + product (Rabaey 2e, 11.4, from memory).
    """
    ready = {f"{word}{i}": 0.0 for word, bits in (("x", multiplicand), ("y", multiplier)) for i in range(bits)}
    for which in array_cells(multiplicand, multiplier):
        start = max(ready[net] for net in which.reads)
        ready[which.sum] = start + (product if which.kind == "and" else sum_)
        if which.carry:
            ready[which.carry] = start + carry
    return max(ready.values())


def _gates(which: ArrayCell) -> tuple[Gate, ...]:
    """Return the gates of a cell; inner nets are named after its sum."""
    at = which.sum
    if which.kind == "and":
        return Gate(f"{at}_not", "nand2", which.reads), Gate(at, "inverter", (f"{at}_not",))
    a, b = which.reads[:2]
    n1, n2, n3 = f"{at}_n1", f"{at}_n2", f"{at}_n3"
    first = (Gate(n1, "nand2", (a, b)), Gate(n2, "nand2", (a, n1)), Gate(n3, "nand2", (b, n1)))
    if which.kind == "half":
        return (*first, Gate(at, "nand2", (n2, n3)), Gate(which.carry, "inverter", (n1,)))
    c, n4, n5, n6, n7 = which.reads[2], f"{at}_n4", f"{at}_n5", f"{at}_n6", f"{at}_n7"
    return (
        *first,
        Gate(n4, "nand2", (n2, n3)),
        Gate(n5, "nand2", (n4, c)),
        Gate(n6, "nand2", (n4, n5)),
        Gate(n7, "nand2", (c, n5)),
        Gate(at, "nand2", (n6, n7)),
        Gate(which.carry, "nand2", (n1, n5)),
    )


@lru_cache(maxsize=16)
def array_multiplier(multiplicand: int, multiplier: int) -> Netlist:
    """Return the netlist; outputs from the lowest bit of the result to the highest."""
    wide, rows = multiplicand, multiplier
    inputs = (*(f"x{i}" for i in range(wide)), *(f"y{j}" for j in range(rows)))
    gates = tuple(gate for which in array_cells(wide, rows) for gate in _gates(which))
    last = rows - 1
    outputs = ("pp0_0", *(f"s{j}_0" for j in range(1, rows)), *(f"s{last}_{i}" for i in range(1, wide)))
    return Netlist(f"{wide} x {rows} array multiplier", inputs, gates, (*outputs, f"c{last}_{wide - 1}"))


@lru_cache(maxsize=16)
def _plan(bits: int) -> tuple[Planned, ...]:
    netlist = array_multiplier(bits, bits)
    rising = activity(netlist)
    path = longest_path(netlist, burden=burden(netlist))
    return (*plan_operands(netlist, rising), *plan_nets(netlist, rising, path, cell("inverter"), average=True))


def _circuit(which: BuiltIn, scenario: Scenario) -> Circuit:
    bits = single(scenario, "word_length", 2, WIDEST)
    counts = array_counts(bits, bits)
    how = (
        "every pair of operands once"
        if 2 * bits <= EXHAUSTIVE
        else f"{SAMPLED} fixed pairs of operands (standard error of a probability 0.002)"
    )
    return Circuit(
        which.name,
        which.title,
        which.operation,
        wired(_plan(bits), scenario),
        assumptions=(
            f"Ripple-row array, unsigned: {counts['and']} AND gates, {counts['full']} nine-NAND full adders, "
            f"{counts['half']} half adders.",
            f"Operands change once per operation, independent and uniform; activity from {how}. Hazards are not "
            "counted: in an array of this kind they can exceed the transitions that are counted.",
            "An inverter drives every operand bit, every result bit drives one; the path starts where the operands "
            "have arrived and is the one of most gates, among equals the one that drives most inputs.",
            *wire_remark(scenario),
        ),
    )


ARRAY_MULTIPLIER: Final = BuiltIn(
    "array-multiplier",
    "Array multiplier of two unsigned words",
    "one multiplication of two words",
    _circuit,
    ("word_length",),
    whole=("word_length",),
    function="product of two unsigned words of word_length bits",
)
