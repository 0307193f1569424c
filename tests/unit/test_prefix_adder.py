"""Prefix graphs and adders: every carry covers every bit below it, sums are sums, counts and activity by hand."""

from __future__ import annotations

import numpy as np
import pytest

from benchmark.circuits.built_in import burden
from benchmark.circuits.circuit import Wires
from benchmark.circuits.library import build
from benchmark.circuits.netlist import longest_path, rising_probability
from benchmark.circuits.operation import estimate
from benchmark.circuits.patterns import high_shares, patterns, simulate
from benchmark.circuits.prefix import PREFIX_KINDS, prefix_counts, prefix_delay, prefix_graph
from benchmark.circuits.prefix_adder import prefix_adder
from benchmark.errors import UsageError
from tests.factories import ohmic_pair
from tests.near import near

KINDS = PREFIX_KINDS[1:]


@pytest.mark.parametrize("kind", PREFIX_KINDS)
def test_every_bit_ends_with_all_bits_below_it_and_cells_join_neighbours(kind):
    for bits in range(1, 70):
        low = list(range(bits))
        for level in prefix_graph(kind, bits).levels:
            before = list(low)
            for cell in level:
                assert before[cell.bit] == cell.partner + 1
                assert cell.low == before[cell.partner]
                low[cell.bit] = cell.low
        assert low == [0] * bits


def test_closed_forms_of_the_counts():
    for power in range(1, 9):
        bits = 2**power
        found = {kind: prefix_counts(prefix_graph(kind, bits)) for kind in PREFIX_KINDS}
        assert found["serial"].cells == found["serial"].levels == bits - 1
        assert found["kogge-stone"].cells == bits * power - bits + 1
        assert found["sklansky"].cells == bits // 2 * power
        assert found["brent-kung"].cells == 2 * bits - 2 - power
        assert [found[kind].levels for kind in KINDS] == [power, power, 2 * power - 1]
        assert found["kogge-stone"].tracks == bits // 2
        assert found["sklansky"].fan_out == bits // 2 + 1
        assert all(counts.gray == bits - 1 for counts in found.values())


def test_only_the_drawing_of_brent_and_kung_is_longer_than_its_longest_path():
    for kind in PREFIX_KINDS:
        graph = prefix_graph(kind, 64)
        shorter = prefix_delay(graph, 4.0, 3.0, 4.0, as_drawn=True) - prefix_delay(graph, 4.0, 3.0, 4.0)
        assert shorter == (3.0 if kind == "brent-kung" else 0.0)


def test_graphs_that_mean_nothing_are_refused():
    with pytest.raises(UsageError, match="known are serial"):
        prefix_graph("kogge", 4)
    with pytest.raises(UsageError, match="at least one bit"):
        prefix_graph("sklansky", 0)


def _numbers(values, names, place):
    """Read the words of a simulation as integers, from one bit place of each machine word."""
    bits = [((values[name] >> np.uint64(place)) & np.uint64(1)).astype(object) for name in names]
    return sum(bit << i for i, bit in enumerate(bits))


@pytest.mark.parametrize("kind", PREFIX_KINDS)
@pytest.mark.parametrize("bits", [1, 2, 3, 4, 5, 6, 7, 13, 24, 64])
def test_the_adder_adds(kind, bits):
    netlist = prefix_adder(kind, bits).netlist
    values = simulate(netlist, patterns(netlist.inputs))
    for place in range(64):
        a, b = (_numbers(values, [f"{word}{i}" for i in range(bits)], place) for word in "ab")
        carry = _numbers(values, ["carry_in"], place)
        assert (_numbers(values, netlist.outputs, place) == a + b + carry).all()


def test_the_adder_adds_at_the_ends_of_the_range():
    """Long carries are rare among scattered operands: all ones plus one, and every single propagated bit."""
    bits = 64
    ones = (1 << bits) - 1
    cases = [(ones, 0, 1), (ones, ones, 1), (0, 0, 1), *((ones ^ ((1 << i) - 1), 1 << i, 0) for i in range(bits))]
    for kind in KINDS:
        netlist = prefix_adder(kind, bits).netlist
        words = {"carry_in": [case[2] for case in cases]}
        for i in range(bits):
            for position, word in enumerate("ab"):
                words[f"{word}{i}"] = [case[position] >> i & 1 for case in cases]
        values = simulate(netlist, {name: np.array(bits_, dtype=np.uint64) for name, bits_ in words.items()})
        total = _numbers(values, netlist.outputs, 0)
        assert list(total) == [a + b + c for a, b, c in cases]


@pytest.mark.parametrize("kind", KINDS)
def test_stated_probabilities_are_those_of_all_operands(kind):
    for bits in (1, 2, 3, 4, 5):
        adder = prefix_adder(kind, bits)
        exhaustive = rising_probability(adder.netlist)
        assert adder.activity.keys() == exhaustive.keys()
        for net, value in adder.activity.items():
            assert value == near(exhaustive[net], rel=1e-12)
    wide = prefix_adder(kind, 24)
    sampled = high_shares(wide.netlist)
    # 3.8 standard errors of 2^16 patterns: about one net in 7000 by chance
    assert all(abs(sampled[net] - p) < 3.8 * 0.5 / 256 for net, p in wide.high.items())


def test_two_bits_by_hand():
    """Bit 0: NAND, NOR, half sum (1), sum (2), carry OAI21 over an inverter; bit 1: the same and the last carry."""
    netlist = prefix_adder("sklansky", 2).netlist
    cells = sorted(gate.which.name for gate in netlist.gates)
    assert cells.count("nand2") + cells.count("nor2") == 4 + 2
    assert cells.count("aoi21") + cells.count("oai21") == 2 + 2 + 2
    assert len(longest_path(netlist)) == 4


@pytest.mark.parametrize("kind", KINDS)
def test_the_path_has_one_gate_per_level(kind):
    for bits in (8, 16, 64):
        adder = prefix_adder(kind, bits)
        levels = len(prefix_graph(kind, bits).levels) - (kind == "brent-kung")
        path = longest_path(adder.netlist, burden=burden(adder.netlist, adder.reach))
        assert len(path) == 1 + levels + 2
        # an inverter may only stand at the start, where it turns the carry in
        assert not any(gate.cell == "inverter" for gate in adder.netlist.gates if gate.output in path[1:])


def test_a_net_reaches_as_far_as_its_farthest_reader():
    adder = prefix_adder("kogge-stone", 16)
    longest = max(adder.reach.values())
    assert longest == 8.0
    assert sum(value == 8.0 for value in adder.reach.values()) >= 8
    # Brent-Kung: the carry into the upper half goes to the middle of it
    assert max(prefix_adder("brent-kung", 16).reach.values()) == 8.0
    assert adder.reach["sum3"] == 0.0


@pytest.mark.parametrize("kind", KINDS)
def test_circuit_energy_is_that_of_every_net_on_its_own(kind):
    """C = c (reach x pitch) per net and input pins; energy = sum of activity x C V^2 over all nets one by one."""
    bits, pitch, pin, per_length = 8, 2e-6, 0.5e-15, 1e-10
    adder = prefix_adder(kind, bits)
    pair = ohmic_pair(on_resistance=1e4, input_capacitance=pin)
    scenario = {"word_length": float(bits), "bit_pitch": pitch}
    found = estimate(build(f"{kind}-adder", scenario), pair, Wires(0.0, per_length), "step", short_circuit=False)
    driven = dict.fromkeys(adder.high, 0)
    for gate in adder.netlist.gates:
        for net in gate.inputs:
            driven[net] += 2  # one switch in each network
    for net in adder.netlist.outputs:
        driven[net] += 2
    expected = sum(
        adder.activity[net] * (driven[net] * pin + adder.reach[net] * pitch * per_length) for net in adder.high
    )
    assert float(found.dynamic_energy) == near(expected, rel=1e-12)
    assert float(found.cell_count) == len(adder.netlist.gates) + 2 * bits + 1
    assert float(found.busiest_rising_per_operation) == 0.25


def test_lengths_of_different_kinds_are_refused_together():
    with pytest.raises(UsageError, match="different kinds"):
        build("sklansky-adder", {"word_length": 8.0, "bit_pitch": 1e-6, "average_net_pitches": 3.0})
    with pytest.raises(UsageError, match="different kinds"):
        build("sklansky-adder", {"word_length": 8.0, "bit_gate_pitches": 3.0, "average_net_length": 1e-6})
    with pytest.raises(UsageError, match="at most 256"):
        build("sklansky-adder", {"word_length": 512.0, "bit_pitch": 1e-6})


def test_which_adder_is_fastest_depends_on_what_delay_is_made_of():
    """Without wires a slow actuator counts gates: prefix beats ripple; with costly wires Kogge-Stone loses its lead."""
    slow = ohmic_pair(on_resistance=1.0, input_capacitance=1e-18, closing_time=1e-9, opening_time=1e-9)
    scenario = {"word_length": 32.0, "bit_pitch": 1e-6}
    delays = {
        name: float(estimate(build(name, scenario), slow, Wires(0.0, 0.0), "step", short_circuit=False).path_delay)
        for name in ("ripple-adder", "kogge-stone-adder", "sklansky-adder", "brent-kung-adder")
    }
    assert delays["kogge-stone-adder"] == near(8e-9, rel=1e-3)
    assert delays["sklansky-adder"] == near(8e-9, rel=1e-3)
    assert delays["brent-kung-adder"] == near(11e-9, rel=1e-3)
    assert delays["ripple-adder"] == near(68e-9, rel=1e-3)
    wires = Wires(0.0, 2e-10)
    energies = {
        name: float(estimate(build(name, scenario), ohmic_pair(), wires, "step", short_circuit=False).dynamic_energy)
        for name in ("kogge-stone-adder", "brent-kung-adder")
    }
    assert energies["kogge-stone-adder"] > 1.5 * energies["brent-kung-adder"]
