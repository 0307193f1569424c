"""Array multiplier: products, counts, longest path, activity."""

from __future__ import annotations

import numpy as np
import pytest

from benchmark.circuits.circuit import Wires
from benchmark.circuits.library import build
from benchmark.circuits.multiplier import array_cells, array_counts, array_delay, array_multiplier
from benchmark.circuits.netlist import longest_path, rising_probability
from benchmark.circuits.operation import estimate
from benchmark.circuits.patterns import activity, patterns, simulate
from benchmark.errors import UsageError
from tests.factories import ohmic_pair
from tests.near import near


def _numbers(values, names, place):
    bits = [((values[name] >> np.uint64(place)) & np.uint64(1)).astype(object) for name in names]
    return sum(bit << i for i, bit in enumerate(bits))


@pytest.mark.parametrize(("wide", "rows"), [(2, 2), (3, 3), (4, 4), (5, 3), (2, 7), (7, 2), (8, 8), (13, 12), (24, 24)])
def test_the_multiplier_multiplies(wide, rows):
    netlist = array_multiplier(wide, rows)
    assert len(netlist.outputs) == wide + rows
    values = simulate(netlist, patterns(netlist.inputs))
    for place in range(0, 64, 3):
        x = _numbers(values, [f"x{i}" for i in range(wide)], place)
        y = _numbers(values, [f"y{j}" for j in range(rows)], place)
        assert (_numbers(values, netlist.outputs, place) == x * y).all()


def test_largest_operands():
    bits = 16
    netlist = array_multiplier(bits, bits)
    ones = {name: np.array([2**64 - 1], dtype=np.uint64) for name in netlist.inputs}
    assert _numbers(simulate(netlist, ones), netlist.outputs, 0)[0] == (2**bits - 1) ** 2


def test_closed_forms_of_counts_and_path():
    for bits in range(2, 12):
        assert array_counts(bits, bits) == {"and": bits**2, "full": bits * (bits - 2), "half": bits}
        for wide in range(2, 9):
            for carry, total in ((2.0, 3.0), (1.0, 1.0), (1.0, 8.0)):
                path = ((wide - 1) + (bits - 2)) * carry + (bits - 1) * total + 1.0
                assert array_delay(wide, bits, 1.0, total, carry) == path
    assert array_delay(4, 4, 1.0, 2.0, 3.0) > 5 * 3.0 + 3 * 2.0 + 1.0  # the last carry is the slower output
    assert len(array_cells(4, 4)) == 28


def test_gate_path_follows_the_carries_and_sums():
    """AND (2), half adder to its carry (2), then two NANDs per carry, six from a new sum term to the next sum."""
    netlist = array_multiplier(8, 8)
    path = longest_path(netlist)
    assert path[0].startswith("pp")
    assert len(path) == 68
    assert len(netlist.gates) == 64 * 2 + 48 * 9 + 8 * 5


def test_activity_is_exhaustive_for_small_words():
    netlist = array_multiplier(3, 3)
    exact, found = rising_probability(netlist), activity(netlist)
    assert found.keys() == exact.keys()
    for net, value in found.items():
        assert value == near(exact[net], rel=1e-12, abs=1e-15)


def test_sampled_activity_is_within_its_error():
    """Product bits are high in a quarter of all cases, in words of any width."""
    from benchmark.circuits.patterns import high_shares

    shares = high_shares(array_multiplier(12, 12))
    products = [shares[f"pp{i}_{j}"] for i in range(12) for j in range(12)]
    assert max(abs(share - 0.25) for share in products) < 4.0 * np.sqrt(0.25 * 0.75 / 2**16)
    assert np.mean(products) == near(0.25, abs=5e-4)


def test_circuit_bill():
    pair = ohmic_pair(on_resistance=1e4, input_capacitance=0.5e-15)
    found = estimate(
        build("array-multiplier", {"word_length": 4.0}), pair, Wires(0.0, 0.0), "step", short_circuit=False
    )
    netlist = array_multiplier(4, 4)
    rising = rising_probability(netlist)
    driven = dict.fromkeys(rising, 0.0)
    for gate in netlist.gates:
        for net in gate.inputs:
            driven[net] += 1e-15
    for net in netlist.outputs:
        driven[net] += 1e-15
    assert float(found.dynamic_energy) == near(sum(rising[net] * driven[net] for net in rising), rel=1e-12)
    assert float(found.cell_count) == len(netlist.gates) + 8
    assert float(found.busiest_rising_per_operation) == near(max(rising.values()), rel=1e-12)
    assert len(found.stages) < 20  # nets that differ in activity alone are merged
    assert any(
        "Hazards are not counted" in text for text in build("array-multiplier", {"word_length": 4.0}).assumptions
    )


@pytest.mark.parametrize("bits", [1.0, 65.0, 4.5])
def test_widths_that_cannot_be_made_are_refused(bits):
    with pytest.raises(UsageError, match="word_length"):
        build("array-multiplier", {"word_length": bits})
