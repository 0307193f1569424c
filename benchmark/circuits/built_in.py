"""What a built-in circuit declares, and what builders share: net lengths, whole numbers, nets of netlists (layer 5).

Two ways of stating a length in the same circuit would be two answers, so ``one_of`` and ``at_most_one_of`` name groups
of values that exclude each other.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from typing import Any, Final

import numpy as np

from benchmark.circuits.cells import Cell, cell
from benchmark.circuits.circuit import Circuit, Load, Net, Value
from benchmark.circuits.netlist import Netlist, all_loads
from benchmark.errors import UsageError

__all__ = [
    "LENGTH_NAMES",
    "BuiltIn",
    "Scenario",
    "burden",
    "first",
    "netlist_nets",
    "operand_nets",
    "single",
    "wire",
    "wire_remark",
]

Scenario = Mapping[str, Value]
LENGTH_NAMES: Final = ("average_net_length", "average_net_pitches")


@dataclass(frozen=True)
class BuiltIn:
    """A built-in circuit.

    required, optional
        Scenario values it needs, and those it may use.
    one_of, at_most_one_of
        Groups of values that state the same thing: exactly one of each group, or at most one.
    whole
        Counts that shape the netlist, so they have one value and no spread.
    function
        What the circuit computes, with its interface; circuits of the same function may stand against each other.
    """

    name: str
    title: str
    operation: str
    builder: Callable[[BuiltIn, Scenario], Circuit]
    required: tuple[str, ...]
    optional: tuple[str, ...] = ()
    one_of: tuple[tuple[str, ...], ...] = ()
    at_most_one_of: tuple[tuple[str, ...], ...] = (LENGTH_NAMES,)
    whole: tuple[str, ...] = ()
    function: str = ""

    @property
    def choices(self) -> tuple[str, ...]:
        """Return the names of all groups."""
        return tuple(name for group in (*self.one_of, *self.at_most_one_of) for name in group)

    @property
    def reads(self) -> frozenset[str]:
        """Return every scenario name that can change this circuit."""
        return frozenset((*self.required, *self.optional, *self.choices))

    def build(self, scenario: Scenario) -> Circuit:
        """Return the circuit for these scenario values.

        Raises
        ------
        UsageError
            If a value it needs is missing, two state the same thing, or a value cannot mean anything.
        """
        scenario = {value: scenario[value] for value in scenario if value in self.reads}
        missing = [value for value in self.required if value not in scenario]
        if missing:
            message = f"circuit {self.name!r} needs the values {', '.join(missing)}"
            raise UsageError(message)
        for group in (*self.one_of, *self.at_most_one_of):
            stated = [value for value in group if value in scenario]
            if len(stated) > 1 or (group in self.one_of and not stated):
                message = f"circuit {self.name!r} needs one of {' and '.join(group)}, not {len(stated)} of them"
                raise UsageError(message)
        return self.builder(self, scenario)


def wire(scenario: Scenario, reach: float = 0.0) -> dict[str, Any]:
    """Return the length of a net as arguments of ``Net``: the average net plus ``reach`` bit pitches."""
    if "bit_gate_pitches" in scenario:
        local = scenario.get("average_net_pitches", 0.0)
        return {"wire_length": local + reach * scenario["bit_gate_pitches"], "length_unit": "gate_pitch"}
    if "bit_pitch" in scenario:
        local = scenario.get("average_net_length", 0.0)
        return {"wire_length": local + reach * scenario["bit_pitch"], "length_unit": "m"}
    if "average_net_length" in scenario:
        return {"wire_length": scenario["average_net_length"], "length_unit": "m"}
    if "average_net_pitches" in scenario:
        return {"wire_length": scenario["average_net_pitches"], "length_unit": "gate_pitch"}
    return {}


def wire_remark(scenario: Scenario) -> tuple[str, ...]:
    """Return the remark a circuit without any wire needs."""
    return () if wire(scenario) else ("No wire on any net: an upper bound of what circuits reach.",)


def first(value: Value) -> float:
    """Return the first number: the best estimate of a scenario value."""
    return float(np.asarray(value, dtype=np.float64).reshape(-1)[0])


def single(scenario: Scenario, name: str, least: int, most: int | None = None) -> int:
    """Return a value that must be one whole number within limits."""
    value = np.asarray(scenario[name])
    if value.size != 1 or first(value) != round(first(value)):
        message = f"{name} must be one whole number for this circuit"
        raise UsageError(message)
    number = round(first(value))
    if number < least:
        message = f"{name} must be at least {least}, not {number}"
        raise UsageError(message)
    if most is not None and number > most:
        message = f"{name} must be at most {most} for this circuit, not {number}"
        raise UsageError(message)
    return number


def burden(netlist: Netlist, reach: Mapping[str, float] | None = None) -> dict[str, float]:
    """Return what a net asks of its driver [1]: series depth x (1 + driven switches / 2 + reach in bit pitches).

    Technology-free; it only tells which of several paths of equally many stages is the slow one.
    """
    driven = all_loads(netlist)
    found = {}
    for gate in netlist.gates:
        inputs = [load.cell.input_widths(load.input, "unit") for load in driven.get(gate.output, ())]
        pins = sum(len(widths) for both in inputs for widths in both.values())
        depth = 0.5 * (gate.which.depth("down") + gate.which.depth("up"))
        found[gate.output] = depth * (1.0 + 0.5 * pins + (reach or {}).get(gate.output, 0.0))
    return found


def netlist_nets(
    netlist: Netlist,
    activity: Mapping[str, float],
    path: tuple[str, ...],
    reader: Cell,
    scenario: Scenario,
    reach: Mapping[str, float] | None = None,
) -> tuple[Net, ...]:
    """Return the nets of a netlist, alike ones merged; outputs drive one input of ``reader`` each.

    ``reach``: bit pitches that a net spans beyond the average net, by net; 0 where it is not named.
    """
    driven_by, outputs = all_loads(netlist), set(netlist.outputs)
    on_path = {name: float(path.count(name)) for name in path}
    merged: dict[tuple[Any, ...], Net] = {}
    for gate in netlist.gates:
        name = gate.output
        driven = driven_by.get(name, ()) + ((Load(reader, "a"),) if name in outputs else ())
        spans = (reach or {}).get(name, 0.0)
        key = (gate.cell, driven, round(activity[name], 12), spans)
        times = on_path.get(name, 0.0)
        if key in merged:
            known = merged[key]
            merged[key] = replace(known, count=known.count + 1.0, on_critical_path=known.on_critical_path + times)
        else:
            merged[key] = Net(
                name,
                gate.which,
                loads=driven,
                rising_per_operation=activity[name],
                count=1.0,
                on_critical_path=times,
                **wire(scenario, spans),
            )
    return tuple(merged.values())


def operand_nets(
    netlist: Netlist, activity: Mapping[str, float], scenario: Scenario, reach: Mapping[str, float] | None = None
) -> tuple[Net, ...]:
    """Return the nets of the primary inputs, each driven by an inverter, alike ones merged; none is on the path."""
    driven_by, inverter = all_loads(netlist), cell("inverter")
    merged: dict[tuple[Any, ...], Net] = {}
    for name in netlist.inputs:
        driven, spans = driven_by.get(name, ()), (reach or {}).get(name, 0.0)
        key = (driven, round(activity[name], 12), spans)
        if key in merged:
            merged[key] = replace(merged[key], count=merged[key].count + 1.0)
        else:
            merged[key] = Net(
                f"operand {name}",
                inverter,
                loads=driven,
                rising_per_operation=activity[name],
                **wire(scenario, spans),
            )
    return tuple(merged.values())
