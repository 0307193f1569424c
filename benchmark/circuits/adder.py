"""Ripple-carry adder of nine-NAND full adders, as a netlist (layer 5). (The full adder: common practice, no source.)"""

from __future__ import annotations

from functools import lru_cache

from benchmark.circuits.netlist import Gate, Netlist, rising_probability
from benchmark.errors import UsageError

__all__ = ["full_adder", "ripple_adder", "ripple_adder_activity"]


def _slice(bit: int, carry_in: str) -> tuple[Gate, ...]:
    def at(name: str) -> str:
        return f"{name}{bit}"

    a, b, c = at("a"), at("b"), carry_in
    pairs = {
        "n1": (a, b),
        "n2": (a, at("n1")),
        "n3": (b, at("n1")),
        "n4": (at("n2"), at("n3")),
        "n5": (at("n4"), c),
        "n6": (at("n4"), at("n5")),
        "n7": (c, at("n5")),
        "sum": (at("n6"), at("n7")),
        "carry": (at("n1"), at("n5")),
    }
    return tuple(Gate(at(name), "nand2", inputs) for name, inputs in pairs.items())


def ripple_adder(bits: int) -> Netlist:
    """Return the adder of two words of ``bits`` bits and a carry input."""
    if bits < 1:
        message = f"an adder has at least one bit, not {bits}"
        raise UsageError(message)
    gates: list[Gate] = []
    carry = "carry_in"
    for bit in range(bits):
        gates += _slice(bit, carry)
        carry = f"carry{bit}"
    inputs = ("carry_in", *(f"{word}{bit}" for bit in range(bits) for word in "ab"))
    return Netlist(f"{bits}-bit ripple adder", inputs, tuple(gates), (*(f"sum{i}" for i in range(bits)), carry))


def full_adder() -> Netlist:
    """Return the one-bit adder."""
    return ripple_adder(1)


@lru_cache(maxsize=1)
def _bit_activity() -> dict[str, float]:
    return rising_probability(full_adder())


def ripple_adder_activity(bits: int) -> dict[str, float]:
    """Return a01 of every net for uniform independent operand pairs and carry inputs, no hazards.

    Exact: the carry into every bit is independent of the operand bits there and high half of the time (the majority
    of three fair bits is fair), so every bit is the exhaustive one-bit adder.
    """
    one = _bit_activity()
    found = {"carry_in": one["carry_in"]}
    for bit in range(bits):
        found |= {f"{net[:-1]}{bit}": value for net, value in one.items() if net != "carry_in"}
    return found
