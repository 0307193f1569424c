"""Built-in circuits, made from the scenario values of a study (layer 5). The same nets for every technology.

``BUILT_IN`` maps a name to its builder, the scenario values it needs and those it may use. Values are SI floats or
arrays by catalogue name. A net length comes as ``average_net_length`` [m] or ``average_net_pitches`` [gate pitches],
never as both. Counts that shape a netlist (``stage_count``, ``word_length``) must be single numbers.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace
from types import MappingProxyType
from typing import Final

import numpy as np
from numpy.typing import NDArray

from benchmark.circuits.adder import ripple_adder, ripple_adder_activity
from benchmark.circuits.built_in import LENGTH_NAMES, BuiltIn, Scenario, netlist_nets, single, wire, wire_remark
from benchmark.circuits.cells import Cell, cell
from benchmark.circuits.circuit import Circuit, Load, Net, Value
from benchmark.circuits.complex_adder import COMPLEX_GATE_ADDER
from benchmark.circuits.memory import SRAM_READ, SRAM_WORD_LINE
from benchmark.circuits.multiplier import ARRAY_MULTIPLIER
from benchmark.circuits.net_length import average_net_pitches, length_convention
from benchmark.circuits.netlist import loads, longest_path
from benchmark.circuits.prefix_adder import ADDITION, PREFIX_ADDERS
from benchmark.circuits.register import FLIP_FLOP, register_facts
from benchmark.circuits.repeaters import REPEATED_LINE
from benchmark.errors import UsageError, nearest

__all__ = ["BUILT_IN", "BuiltIn", "build", "netlist_nets"]


def build(name: str, scenario: Scenario) -> Circuit:
    """Return the built-in circuit of that name for these scenario values.

    Raises
    ------
    UsageError
        If there is no such circuit, a value it needs is missing, or a value cannot mean anything.
    """
    if name not in BUILT_IN:
        message = f"no built-in circuit {name!r}; known are {', '.join(BUILT_IN)}; {nearest(name, BUILT_IN)}"
        raise UsageError(message)
    return BUILT_IN[name].build(scenario)


def _stage_text(scenario: Scenario) -> NDArray[np.str_]:
    """Return the text of the one stage, row by row; compared with that of a technology known at one stage only."""
    fan_out = np.asarray(scenario["fan_out"])
    if wire(scenario):
        return np.array("")
    return np.array([f"inverter, fan-out {x:.12g}, no wire" for x in fan_out.ravel()]).reshape(fan_out.shape)


def _inverter_chain(which: BuiltIn, scenario: Scenario) -> Circuit:
    inverter = cell("inverter")
    net = Net(
        "stage",
        inverter,
        loads=(Load(inverter, "a", scenario["fan_out"]),),
        rising_per_operation=scenario["activity"],
        busiest_per_operation=scenario.get("busiest_activity"),
        count=scenario["logic_depth"],
        on_critical_path=scenario["logic_depth"],
        **wire(scenario),
    )
    return Circuit(
        which.name,
        which.title,
        which.operation,
        (net,),
        assumptions=("Every stage is alike; the loads beyond the chain are inputs only.", *wire_remark(scenario)),
        stage=_stage_text(scenario),
    )


def _ring(which: BuiltIn, scenario: Scenario) -> Circuit:
    inverter = cell("inverter")
    count = single(scenario, "stage_count", 3)
    if count % 2 == 0:
        message = f"a ring of inverters needs an odd stage_count, not {count}"
        raise UsageError(message)
    net = Net(
        "stage",
        inverter,
        loads=(Load(inverter, "a", scenario["fan_out"]),),
        rising_per_operation=1.0,
        count=float(count),
        on_critical_path=2.0 * count,
        **wire(scenario),
    )
    return Circuit(
        which.name,
        which.title,
        which.operation,
        (net,),
        assumptions=("Frequency = 1 / time per operation = 1 / (2 N t).", *wire_remark(scenario)),
        stage=_stage_text(scenario),
    )


def _toggle_share(scenario: Scenario) -> Value:
    """Return the share of cycles in which data changes: twice its rising transitions per cycle."""
    share = 2.0 * np.asarray(scenario["activity"], dtype=np.float64)
    if np.any(share > 1.0):
        message = "activity of a register's data cannot exceed 0.5 rising transitions per cycle"
        raise UsageError(message)
    return share


def _register_nets(scenario: Scenario, reader: Cell, count: Value) -> list[Net]:
    """Return the nets of ``count`` registers with their local clock drivers; ``q`` drives the fan-out and the wire."""
    facts = register_facts()
    toggling = _toggle_share(scenario)
    path = (*facts.setup, *facts.clock_to_output)
    nets = []
    for gate in FLIP_FLOP.gates:
        name = gate.output
        net = Net(
            f"register {name}",
            cell(gate.cell),
            loads=loads(FLIP_FLOP, name),
            rising_per_operation=facts.rising_quiet[name] * (1.0 - toggling) + facts.rising_toggle[name] * toggling,
            busiest_per_operation=max(facts.rising_quiet[name], facts.rising_toggle[name]),
            count=count,
            on_critical_path=float(path.count(name)),
            group="register",
        )
        if name == "q":
            net = replace(net, loads=(*net.loads, Load(reader, "a", scenario["fan_out"])), **wire(scenario))
        nets.append(net)
    clock = Net(
        "clock",
        cell("inverter"),
        loads=loads(FLIP_FLOP, "clock"),
        rising_per_operation=1.0,
        count=count,
        group="clock",
        **wire(scenario),
    )
    return [*nets, clock]


REGISTER_ASSUMPTIONS: Final = (
    "Register: edge-triggered flip-flop of six NAND gates; setup and clock-to-output stages and internal activity "
    "come from its netlist.",
    "Data changes at most once per cycle, while the clock is low.",
    "Clock: one local inverter per register with one average net of wire and one rising edge per cycle; the tree "
    "above the local inverters is outside the block.",
)


def _register(which: BuiltIn, scenario: Scenario) -> Circuit:
    inverter = cell("inverter")
    data = Net(
        "data",
        inverter,
        loads=loads(FLIP_FLOP, "data"),
        rising_per_operation=scenario["activity"],
        busiest_per_operation=scenario.get("busiest_activity"),
        group="logic",
        **wire(scenario),
    )
    return Circuit(
        which.name,
        which.title,
        which.operation,
        (data, *_register_nets(scenario, inverter, 1.0)),
        assumptions=(*REGISTER_ASSUMPTIONS, *wire_remark(scenario)),
    )


def _random_logic(which: BuiltIn, scenario: Scenario) -> Circuit:
    convention: tuple[str, ...] = ()
    if "rent_exponent" in scenario:
        convention = (length_convention(scenario),)
        scenario = {**scenario, "average_net_pitches": average_net_pitches(scenario)}
    gate = cell("nand2")
    logic = Net(
        "logic",
        gate,
        loads=(Load(gate, "a", scenario["fan_out"]),),
        rising_per_operation=scenario["activity"],
        busiest_per_operation=scenario.get("busiest_activity"),
        count=scenario["gate_count"],
        on_critical_path=scenario["logic_depth"],
        **wire(scenario),
    )
    nets = [logic]
    registers = scenario["register_count"]
    assumptions: tuple[str, ...] = (
        "Every logic gate is a NAND2 and drives fan_out NAND2 inputs over one average net; register data inputs are "
        "among them.",
        *convention,
    )
    if np.any(np.asarray(registers) > 0.0):
        nets += _register_nets(scenario, gate, registers)
        assumptions += REGISTER_ASSUMPTIONS
    else:
        assumptions += ("No registers and no clock: an upper bound of what clocked circuits reach.",)
    return Circuit(which.name, which.title, which.operation, tuple(nets), assumptions=assumptions)


def _ripple_adder(which: BuiltIn, scenario: Scenario) -> Circuit:
    bits = single(scenario, "word_length", 1)
    netlist, activity, inverter = ripple_adder(bits), ripple_adder_activity(bits), cell("inverter")
    operands = Net(
        "operand",
        inverter,
        loads=loads(netlist, netlist.inputs[0]),
        rising_per_operation=activity[netlist.inputs[0]],
        count=float(len(netlist.inputs)),
        **wire(scenario),
    )
    nets = (operands, *netlist_nets(netlist, activity, longest_path(netlist), inverter, scenario))
    return Circuit(
        which.name,
        which.title,
        which.operation,
        nets,
        assumptions=(
            "Nine-NAND full adders; an inverter drives every operand bit, every sum bit and the last carry drive one; "
            "operands change once per operation, independent and uniform; hazards are not counted; the path starts "
            "where the operands have arrived.",
            *wire_remark(scenario),
        ),
    )


BUILT_IN: Final[Mapping[str, BuiltIn]] = MappingProxyType(
    {
        which.name: which
        for which in (
            BuiltIn(
                "inverter-chain",
                "Chain of alike inverters",
                "one clock cycle of the chain",
                _inverter_chain,
                ("logic_depth", "fan_out", "activity"),
                ("busiest_activity",),
            ),
            BuiltIn(
                "ring",
                "Ring of inverters",
                "one period of the ring",
                _ring,
                ("stage_count", "fan_out"),
                whole=("stage_count",),
            ),
            BuiltIn(
                "register",
                "Edge-triggered register with its clock driver",
                "one clock cycle of one register",
                _register,
                ("fan_out", "activity"),
                ("busiest_activity",),
            ),
            BuiltIn(
                "random-logic",
                "Block of random logic between registers",
                "one clock cycle of the block, registers and clock net included",
                _random_logic,
                ("logic_depth", "fan_out", "activity", "gate_count", "register_count"),
                ("busiest_activity",),
                one_of=((*LENGTH_NAMES, "rent_exponent"),),
                at_most_one_of=(),
            ),
            BuiltIn(
                "ripple-adder",
                "Ripple-carry adder",
                "one addition of two words",
                _ripple_adder,
                ("word_length",),
                whole=("word_length",),
                function=ADDITION,
            ),
            *PREFIX_ADDERS,
            COMPLEX_GATE_ADDER,
            ARRAY_MULTIPLIER,
            SRAM_WORD_LINE,
            SRAM_READ,
            REPEATED_LINE,
        )
    }
)
