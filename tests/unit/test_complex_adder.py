"""Adder of complex gates: sums, one mechanical delay per group, stacks, leakage over the states that occur."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest

from benchmark.circuits.cells import Cell, Parallel, Series, Switched, conducts, inverter
from benchmark.circuits.circuit import Circuit, Net, Wires
from benchmark.circuits.complex_adder import MOST_GROUP_BITS, carry_cell, complex_gate_adder, sum_cell
from benchmark.circuits.library import build
from benchmark.circuits.operation import estimate
from benchmark.circuits.patterns import patterns, simulate
from benchmark.errors import UsageError
from tests.factories import ohmic_pair
from tests.near import near

NO_WIRE = Wires(0.0, 0.0)


def _simulated(bits, group):
    netlist = complex_gate_adder(bits, group)
    words = patterns([name for name in netlist.inputs if not name.endswith("_not")])
    return netlist, simulate(netlist, words | {f"{name}_not": ~value for name, value in words.items()})


@pytest.mark.parametrize(("bits", "group"), [(1, 1), (2, 1), (4, 4), (5, 2), (7, 3), (8, 5), (16, 4), (32, 3)])
def test_the_adder_adds(bits, group):
    netlist, values = _simulated(bits, group)

    def number(names, place):
        return sum(((values[n] >> np.uint64(place)) & np.uint64(1)).astype(object) << i for i, n in enumerate(names))

    for place in range(64):
        a, b = (number([f"{word}{i}" for i in range(bits)], place) for word in "ab")
        assert (number(netlist.outputs, place) == a + b + number(["carry_in"], place)).all()
    for net, word in values.items():  # both rails of a carry are complements, and every net is high half of the time
        if net.endswith("_not"):
            assert (word == ~values[net.removesuffix("_not")]).all()
        if 2 * bits + 1 <= 16:
            assert np.bitwise_count(word).sum() == 32 * word.size


def test_gates_by_hand():
    """One bit: carry ab + (a + b)c, 5 switches a side, stack of 2; sum of three, 10 a side, stack of 3."""
    carry, one = carry_cell(1), sum_cell(0)
    assert (carry.switch_count, carry.depth("down"), carry.depth("up")) == (10, 2, 2)
    assert (one.switch_count, one.depth("down"), one.depth("up")) == (20, 3, 3)
    for state in carry.states():
        assert carry.output({name: name in state for name in carry.inputs}) == (len(state) < 2)
    for state in one.states():
        high = {name for name in state if not name.endswith("_not")}
        assert one.output({name: name in state for name in one.inputs}) == (len(high) % 2 == 1)
    assert len(list(one.states())) == 8
    assert sum_cell(MOST_GROUP_BITS - 1).depth("down") == MOST_GROUP_BITS + 2


def test_complements_leave_only_states_that_occur():
    a, a_not = Switched("a"), Switched("a_not")
    # conducts in neither state, so the other network must conduct in both
    never, always = Series((a, a_not)), Parallel((a, a_not))
    pair = (("a", "a_not"),)
    which = Cell("constant", ("a", "a_not"), never, always, pair)
    assert [sorted(state) for state in which.states()] == [["a_not"], ["a"]]
    assert not any(conducts(never, state) for state in which.states())
    with pytest.raises(UsageError, match="not the dual"):
        Cell("both", ("a", "a_not"), always, always, pair)
    for wrong in ((("a", "a"),), (("a", "b"),), (("a", "a_not"), ("a_not", "a"))):
        with pytest.raises(UsageError, match="pairs of different inputs"):
            Cell("pairs", ("a", "a_not"), never, always, wrong)


def _resistance(network, closed):
    """Own walk of a network: closed switches are shorts, open ones count 1."""
    if isinstance(network, Switched):
        return 0.0 if network.input in closed else 1.0
    parts = [_resistance(part, closed) for part in network.parts]
    if isinstance(network, Series):
        return sum(parts)
    return 0.0 if 0.0 in parts else 1.0 / sum(1.0 / part for part in parts)


def test_leakage_is_the_mean_over_the_eight_states_that_occur():
    which, leak = sum_cell(0), 1e9
    pair = ohmic_pair(supply=1.0, on_resistance=1.0, off_resistance=leak)
    found = float(estimate(Circuit("s", "", "", (Net("s", which),)), pair, NO_WIRE).leakage_power) * leak
    total = 0.0
    for high in which.states():
        low = frozenset(which.inputs) - high
        total += 1.0 / (_resistance(which.up, low) if conducts(which.down, high) else _resistance(which.down, high))
    assert found == near(total / 8.0, rel=1e-12)


def test_one_mechanical_delay_per_group():
    slow = ohmic_pair(on_resistance=1.0, input_capacitance=1e-19, closing_time=1e-9, opening_time=1e-9)

    def delay(pair, bits, group):
        circuit = build("complex-gate-adder", {"word_length": float(bits), "group_bits": float(group)})
        return float(estimate(circuit, pair, NO_WIRE, "step", short_circuit=False).path_delay)

    assert delay(slow, 4, 4) == near(1e-9, rel=1e-6)
    assert delay(slow, 16, 4) == near(4e-9, rel=1e-6)
    assert delay(slow, 17, 4) == near(5e-9, rel=1e-6)
    # switches that wait for each other along a stack: every gate of the path takes its depth
    waiting = dataclasses.replace(
        slow, **{edge: dataclasses.replace(getattr(slow, edge), stack_time="sequential") for edge in ("down", "up")}
    )
    assert delay(waiting, 4, 4) == near(6e-9, rel=1e-6)


def test_a_stack_beyond_the_technology_is_unable_not_a_number():
    pair = ohmic_pair(stack_on=np.array([1.0, 2.0, 3.0]), stack_off=np.array([1.0, 0.5, 1.0 / 3.0]))
    circuit = build("complex-gate-adder", {"word_length": 4.0, "group_bits": 2.0})
    found = estimate(circuit, pair, NO_WIRE)
    assert any("4 switches in series" in reason for reason in found.unable)
    fits = estimate(build("complex-gate-adder", {"word_length": 4.0, "group_bits": 1.0}), pair, NO_WIRE)
    assert not fits.unable


def test_circuit_bill():
    bits, group = 5, 2
    pair = ohmic_pair(on_resistance=1e4, input_capacitance=0.5e-15)
    scenario = {"word_length": float(bits), "group_bits": float(group)}
    found = estimate(build("complex-gate-adder", scenario), pair, NO_WIRE, "step", short_circuit=False)
    netlist = complex_gate_adder(bits, group)
    pins = sum(
        sum(len(widths) for widths in gate.which.input_widths(name, "unit").values())
        for gate in netlist.gates
        for name in gate.which.inputs
    )
    pins += 2 * len(netlist.outputs)
    assert float(found.dynamic_energy) == near(0.25 * pins * 0.5e-15, rel=1e-12)
    assert float(found.switch_count) == sum(gate.which.switch_count for gate in netlist.gates) + 2 * len(netlist.inputs)
    assert len(netlist.gates) == 5 + 2 + 2 + 1
    assert inverter().switch_count == 2


@pytest.mark.parametrize(("bits", "group"), [(4.0, 5.0), (16.0, 6.0), (8.0, 0.0), (1.0, 1.0)])
def test_groups_that_cannot_be_made_are_refused(bits, group):
    with pytest.raises(UsageError, match=r"group_bits|word_length"):
        build("complex-gate-adder", {"word_length": bits, "group_bits": group})
