"""What a built-in circuit declares, and what builders share: net lengths, whole numbers, nets of netlists (layer 5).

Two ways of stating a length in the same circuit would be two answers, so ``one_of`` and ``at_most_one_of`` name groups
of values that exclude each other.
"""

from __future__ import annotations

import math
from collections import Counter
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any, Final

import numpy as np

from benchmark.circuits.cells import Cell, cell
from benchmark.circuits.circuit import Circuit, Load, Net, Value
from benchmark.circuits.netlist import Gate, Netlist, all_loads
from benchmark.errors import UsageError

__all__ = [
    "LENGTH_NAMES",
    "BuiltIn",
    "Planned",
    "Scenario",
    "burden",
    "first",
    "netlist_nets",
    "plan_nets",
    "plan_operands",
    "single",
    "wire",
    "wire_remark",
    "wired",
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


@dataclass(frozen=True)
class Planned:
    """A net without its wire, and the bit pitches it spans beyond the average net; free of any scenario."""

    net: Net
    reach: float = 0.0


def wired(plan: Sequence[Planned], scenario: Scenario) -> tuple[Net, ...]:
    """Return the nets of a plan with the lengths of a scenario."""
    return tuple(replace(planned.net, **wire(scenario, planned.reach)) for planned in plan)


def plan_nets(
    netlist: Netlist,
    activity: Mapping[str, float],
    path: tuple[str, ...],
    reader: Cell,
    reach: Mapping[str, float] | None = None,
    *,
    average: bool = False,
) -> tuple[Planned, ...]:
    """Return the nets of a netlist, alike ones merged; outputs drive one input of ``reader`` each.

    Parameters
    ----------
    netlist, activity, path
        Nets, rising transitions of each per operation, and the driven nets of the critical path.
    reader
        Cell behind every output.
    reach
        Bit pitches that a net spans, by net; 0 where it is not named.
    average
        Nets that differ in activity alone become one of the mean activity (the energy stays the same), whose busiest
        is the busiest of them. Without it every activity keeps its own net.
    """
    driven_by, outputs = all_loads(netlist), set(netlist.outputs)
    on_path = Counter(path)
    alike: dict[tuple[Any, ...], list[Gate]] = {}
    for gate in netlist.gates:
        driven = driven_by.get(gate.output, ()) + ((Load(reader, "a"),) if gate.output in outputs else ())
        if average:
            driven = _counted(driven)
        apart = () if average else (round(activity[gate.output], 12),)
        key = (gate.cell, driven, (reach or {}).get(gate.output, 0.0), apart)
        alike.setdefault(key, []).append(gate)
    plan = []
    for key, gates in alike.items():
        rising = [activity[gate.output] for gate in gates]
        net = Net(
            gates[0].output,
            gates[0].which,
            loads=key[1],
            rising_per_operation=math.fsum(rising) / len(rising) if average else rising[0],
            busiest_per_operation=max(rising) if average else None,
            count=float(len(gates)),
            on_critical_path=float(sum(on_path[gate.output] for gate in gates)),
        )
        plan.append(Planned(net, key[2]))
    return tuple(plan)


def netlist_nets(
    netlist: Netlist, activity: Mapping[str, float], path: tuple[str, ...], reader: Cell, scenario: Scenario
) -> tuple[Net, ...]:
    """Return the nets of a netlist with the average net of a scenario; see ``plan_nets``."""
    return wired(plan_nets(netlist, activity, path, reader), scenario)


def _counted(driven: tuple[Load, ...]) -> tuple[Load, ...]:
    """Return alike loads as one with a count, in a fixed order."""
    counts = Counter(driven)
    return tuple(
        replace(load, count=float(number))
        for load, number in sorted(counts.items(), key=lambda item: (item[0].cell.name, item[0].input))
    )


def plan_operands(
    netlist: Netlist, activity: Mapping[str, float], reach: Mapping[str, float] | None = None
) -> tuple[Planned, ...]:
    """Return the nets of the primary inputs, each driven by an inverter, alike ones merged; none is on the path."""
    driven_by, inverter = all_loads(netlist), cell("inverter")
    alike: dict[tuple[Any, ...], list[str]] = {}
    for name in netlist.inputs:
        driven = _counted(driven_by.get(name, ()))
        alike.setdefault((driven, (reach or {}).get(name, 0.0), round(activity[name], 12)), []).append(name)
    return tuple(
        Planned(
            Net(
                f"operand {names[0]}",
                inverter,
                loads=key[0],
                rising_per_operation=activity[names[0]],
                count=float(len(names)),
            ),
            key[1],
        )
        for key, names in alike.items()
    )
