"""Built-in circuits: hand counts, an independent simulation of the register, refusals."""

from __future__ import annotations

import itertools
import random

import numpy as np
import pytest

from benchmark.circuits.adder import ripple_adder, ripple_adder_activity
from benchmark.circuits.circuit import Circuit, Net, Wires
from benchmark.circuits.library import BUILT_IN, build
from benchmark.circuits.netlist import Gate, Netlist, loads, longest_path, rising_probability, settle
from benchmark.circuits.operation import estimate
from benchmark.circuits.register import FLIP_FLOP, register_facts
from benchmark.errors import UsageError
from tests.factories import ohmic_pair
from tests.near import near

NO_WIRE = Wires(0.0, 0.0)
LN2 = np.log(2.0)


def _flip_flop_cycles(data: list[bool]) -> tuple[dict[str, int], list[bool]]:
    """Own simulation of the six gates, written out: relaxation one gate after the other, rising edges counted."""
    net = {"clock": False, "data": data[0], "m": data[0], "s": True, "r": True, "p": not data[0], "q": data[0]}
    net["q_bar"] = not data[0]
    rises = dict.fromkeys(["m", "s", "r", "p", "q", "q_bar"], 0)
    stored = []

    def relax():
        for _ in range(20):
            old = dict(net)
            new = {
                "m": not (old["p"] and old["s"]),
                "s": not (old["m"] and old["clock"]),
                "r": not (old["s"] and old["clock"] and old["p"]),
                "p": not (old["r"] and old["data"]),
                "q": not (old["s"] and old["q_bar"]),
                "q_bar": not (old["q"] and old["r"]),
            }
            for name, value in new.items():
                rises[name] += value and not old[name]
            net.update(new)
            if all(net[name] == old[name] for name in new):
                return
        raise AssertionError("no rest")

    for value in data[1:]:
        for name, level in (("data", value), ("clock", True), ("clock", False)):
            net[name] = level
            relax()
            if name == "clock" and level:
                stored.append(net["q"])
                net["data"] = not net["data"]  # edge-triggered: data moving while the clock is high changes nothing
                before = net["q"]
                snapshot, counted = dict(net), dict(rises)
                relax()
                assert net["q"] == before
                net.update(snapshot)
                rises.update(counted)
                net["data"] = value
                relax()
    return rises, stored


def test_the_register_stores_at_the_rising_edge_and_its_activity_is_that_of_random_data():
    source = random.Random(7)
    toggle, cycles = 0.3, 20000
    data = [False]
    for _ in range(cycles):
        data.append(data[-1] ^ (source.random() < toggle))
    rises, stored = _flip_flop_cycles(data)
    assert stored == data[1:]
    facts = register_facts()
    for name, count in rises.items():
        expected = facts.rising_quiet[name] * (1 - toggle) + facts.rising_toggle[name] * toggle
        assert count / cycles == near(expected, abs=4 * 0.5 / np.sqrt(cycles))


def test_register_timing_is_two_and_three_gates():
    facts = register_facts()
    assert facts.setup == ("p", "m")
    assert facts.clock_to_output == ("r", "q_bar", "q")
    assert len(loads(FLIP_FLOP, "clock")) == 2


def test_register_circuit_bill():
    scenario = {"fan_out": 2.0, "activity": 0.1}
    pair = ohmic_pair(on_resistance=1e4, input_capacitance=0.5e-15)  # one fF per cell input
    found = estimate(build("register", scenario), pair, NO_WIRE, "step", short_circuit=False)
    # rising per cycle: s, r 1/2; m, p, q, q_bar 0.2 x 1/2; inputs: s 3, r 2, m 1, p 2, q 1 + 2, q_bar 1
    register = 0.5 * (3 + 2) + 0.1 * (1 + 2 + 3 + 1)
    assert float(found.dynamic_energy_by_group["register"]) == near(register * 1e-15)
    assert float(found.dynamic_energy_by_group["clock"]) == near(2e-15)
    assert float(found.dynamic_energy_by_group["logic"]) == near(0.1 * 1e-15)
    assert float(found.busiest_rising_per_operation) == 1.0
    # path p (2 inputs), m (1), r (2, stack of 3 falling), q_bar (1), q (3): falling 2R or 3R, rising R
    rc = LN2 * 1e4 * 1e-15
    assert float(found.path_delay) == near(rc * (1.5 * (2 + 1 + 1 + 3) + 2.0 * 2))
    assert float(found.switch_count) == 5 * 4 + 6 + 2 + 2


def test_random_logic_bill():
    scenario = {
        "logic_depth": 20.0,
        "fan_out": 3.0,
        "activity": 0.05,
        "busiest_activity": 0.8,
        "gate_count": 4000.0,
        "register_count": 0.0,
        "average_net_pitches": 8.0,
    }
    pair = ohmic_pair(on_resistance=1e4, input_capacitance=0.5e-15, area=1e-14, off_resistance=1e9)
    wires = Wires(0.0, 2e-10)
    found = estimate(build("random-logic", scenario), pair, wires, "step", short_circuit=False)
    pitch = np.sqrt(4e-14)
    node = 3e-15 + 8 * pitch * 2e-10
    assert float(found.dynamic_energy) == near(4000 * 0.05 * node)
    assert float(found.path_delay) == near(20 * LN2 * 1.5e4 * node)
    assert float(found.leakage_power) == near(4000 * 1.125e-9)
    assert float(found.area) == near(4000 * 4e-14)
    assert float(found.busiest_rising_per_operation) == 0.8
    clocked = estimate(build("random-logic", {**scenario, "register_count": 500.0}), pair, wires, "step")
    assert float(clocked.busiest_rising_per_operation) == 1.0
    assert float(clocked.cell_count) == 4000 + 500 * 7
    assert clocked.path_delay > found.path_delay
    assert set(clocked.dynamic_energy_by_group) == {"logic", "register", "clock"}


def test_ring_of_thirty_one():
    """31 stages at tau = 3 ps, p = 1, fan-out 1: 2.688 GHz (Weste & Harris); P = N C V^2 f."""
    pair = ohmic_pair(on_resistance=3e-12 / (LN2 * 2e-15), input_capacitance=1e-15, terminal_capacitance=1e-15)
    found = estimate(build("ring", {"stage_count": 31.0, "fan_out": 1.0}), pair, NO_WIRE, "step", short_circuit=False)
    assert 1.0 / float(found.path_delay) == near(2.688e9, rel=2e-4)
    assert float(found.dynamic_energy / found.path_delay) == near(31 * 4e-15 * 2.688e9, rel=2e-4)


def test_adder_adds():
    bits = 3
    netlist = ripple_adder(bits)
    state = dict.fromkeys(netlist.inputs, False)
    for gate in netlist.gates:  # written in the order of the signals
        state[gate.output] = not all(state[net] for net in gate.inputs)
    for a, b, c in itertools.product(range(8), range(8), range(2)):
        values = {"carry_in": bool(c)}
        for bit in range(bits):
            values |= {f"a{bit}": bool(a >> bit & 1), f"b{bit}": bool(b >> bit & 1)}
        state = dict(settle(netlist, state, values).values)
        total = sum(int(state[f"sum{bit}"]) << bit for bit in range(bits))
        assert total + (int(state[f"carry{bits - 1}"]) << bits) == a + b + c


def test_adder_activity_by_slices_is_the_exhaustive_count():
    exhaustive = rising_probability(ripple_adder(4))
    for name, value in ripple_adder_activity(4).items():
        assert value == near(exhaustive[name], rel=1e-12)
    biased = rising_probability(
        Netlist("g", ("x", "y"), (Gate("o", "nand2", ("x", "y")),), ("o",)), {"x": 0.2, "y": 0.5}
    )
    assert biased["o"] == near(0.1 * 0.9)


def test_adder_path_is_the_carry():
    path = longest_path(ripple_adder(8))
    assert len(path) == 3 + 2 * 7 + 3
    assert [net for net in path if net.startswith("carry")] == [f"carry{bit}" for bit in range(7)]
    found = estimate(build("ripple-adder", {"word_length": 8.0}), ohmic_pair(), NO_WIRE)
    assert float(found.cell_count) == 72 + 17
    assert len(found.stages) < 12  # alike nets are merged


def test_netlists_that_mean_nothing_are_refused():
    with pytest.raises(UsageError, match="driven twice"):
        Netlist("n", ("a",), (Gate("a", "inverter", ("a",)),), ())
    with pytest.raises(UsageError, match="do not fit"):
        Netlist("n", ("a",), (Gate("b", "nand2", ("a",)),), ())
    with pytest.raises(UsageError, match="not a net"):
        Netlist("n", ("a",), (), ("z",))
    ring = Netlist("ring", ("e",), (Gate("x", "nand2", ("e", "x")),), ("x",))
    with pytest.raises(UsageError, match="does not settle"):
        settle(ring, {"e": False, "x": True}, {"e": True})
    with pytest.raises(UsageError, match="not at rest"):
        settle(
            Netlist("n", ("a", "b"), (Gate("x", "inverter", ("a",)),), ("x",)),
            {"a": True, "b": True, "x": True},
            {"b": False},
        )
    with pytest.raises(UsageError, match="feedback"):
        longest_path(ring)


SCENARIO = {
    "logic_depth": 20.0,
    "fan_out": 3.0,
    "activity": 0.05,
    "gate_count": 100.0,
    "register_count": 10.0,
    "stage_count": 5.0,
    "word_length": 4.0,
    "group_bits": 2.0,
    "row_count": 64.0,
    "column_count": 32.0,
    "memory_cell_width": 1e-6,
    "memory_cell_height": 5e-7,
    "memory_cell_word_line_load": 1e-16,
    "memory_cell_bit_line_load": 8e-17,
    "memory_cell_read_current": 2e-5,
    "memory_cell_supply": 0.8,
    "bit_line_swing": 0.1,
    "driver_copies": 8.0,
    "line_length": 2e-3,
    "average_net_length": 1e-6,
}
#: one way of stating each thing, and the other ways
CHOICES = {"average_net_length": 1e-6, "bit_pitch": 2e-6}
OTHER_CHOICES = {"average_net_pitches": 7.0, "bit_gate_pitches": 4.0, "rent_exponent": 0.6}


def _bill(name, scenario):
    found = estimate(build(name, scenario), ohmic_pair(terminal_capacitance=1e-16, area=1e-14), Wires(1e7, 1e-10))
    bill = [float(found.path_delay), float(found.dynamic_energy), float(found.leakage_power)]
    assert np.isfinite(bill).all()
    assert not found.unable
    return bill


@pytest.mark.parametrize("name", list(BUILT_IN))
def test_every_circuit_needs_exactly_what_it_says_and_uses_it(name):
    which = BUILT_IN[name]
    chosen = {value: CHOICES[value] for value in which.choices if value in CHOICES}
    needed = {value: SCENARIO[value] for value in which.required} | chosen
    base = _bill(name, needed)
    for value in (*which.required, *chosen):
        step = 2.0 if value == "stage_count" else 1.0 if value in ("word_length", "group_bits") else 0.5 * needed[value]
        assert _bill(name, {**needed, value: needed[value] + step}) != base, value
    for value in which.required:
        with pytest.raises(UsageError, match=value):
            build(name, {other: number for other, number in needed.items() if other != value})
    assert _bill(name, {**needed, "duty": 0.5, "clock_frequency": 1e9}) == base  # what is not read changes nothing


@pytest.mark.parametrize("name", list(BUILT_IN))
def test_every_other_way_of_stating_a_length_is_used_and_excludes_the_first(name):
    which = BUILT_IN[name]
    needed = {value: SCENARIO[value] for value in which.required}
    first = {value: CHOICES[value] for value in which.choices if value in CHOICES}
    other = {value: OTHER_CHOICES[value] for value in which.choices if value in OTHER_CHOICES}
    if not which.choices:
        return
    kept = dict(list(other.items())[:1]) if "rent_exponent" in other else other
    assert _bill(name, needed | kept) != _bill(name, needed | first)
    for value, number in other.items():
        for rival in first:
            if any({value, rival} <= set(group) for group in (*which.one_of, *which.at_most_one_of)):
                with pytest.raises(UsageError, match="needs one of"):
                    build(name, {**needed, **first, value: number})
    for group in which.one_of:
        with pytest.raises(UsageError, match="needs one of"):
            build(name, needed | {value: number for value, number in first.items() if value not in group})


@pytest.mark.parametrize(
    ("name", "change", "match"),
    [
        ("ring", {"stage_count": 4.0}, "odd"),
        ("ring", {"stage_count": 1.0}, "at least 3"),
        ("ring", {"stage_count": 5.5}, "whole number"),
        ("ripple-adder", {"word_length": 0.0}, "at least 1"),
        ("ripple-adder", {"word_length": np.array([4.0, 8.0])}, "one whole number"),
        ("register", {"activity": 0.6}, "cannot exceed 0.5"),
        ("random-logic", {"average_net_pitches": 5.0}, "needs one of"),
        ("inverter-chains", {}, "did you mean 'inverter-chain'"),
    ],
)
def test_scenarios_that_mean_nothing_are_refused(name, change, match):
    with pytest.raises(UsageError, match=match):
        build(name, {**SCENARIO, **change})


def test_random_logic_without_a_net_length_is_refused():
    with pytest.raises(UsageError, match="needs one of"):
        build("random-logic", {k: v for k, v in SCENARIO.items() if k != "average_net_length"})


def test_circuits_that_mean_nothing_are_refused():
    net = build("ring", SCENARIO).nets[0]
    with pytest.raises(UsageError, match="no net"):
        Circuit("c", "", "", ())
    with pytest.raises(UsageError, match="twice"):
        Circuit("c", "", "", (net, Net("stage", net.driver)))
