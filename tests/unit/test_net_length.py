"""Net length of a block from Rent's exponent: against the pair sum written out, between squares, and as a circuit."""

from __future__ import annotations

import itertools

import numpy as np
import pytest

from benchmark.circuits.circuit import Wires
from benchmark.circuits.library import build
from benchmark.circuits.net_length import average_net_pitches, length_convention, mean_wire
from benchmark.circuits.operation import estimate
from benchmark.errors import UsageError
from benchmark.physics.wire_lengths import davis_discrete
from tests.factories import ohmic_pair
from tests.near import near


def _pair_by_pair(side: int, p: float) -> float:
    """Every pair of places with its expected number of wires."""
    weight = length = 0.0
    places = list(itertools.product(range(side), repeat=2))
    for (ax, ay), (bx, by) in itertools.combinations(places, 2):
        distance = abs(ax - bx) + abs(ay - by)
        near_, at = distance * (distance - 1.0), 2.0 * distance
        expected = ((1 + near_) ** p + (near_ + at) ** p - (1 + near_ + at) ** p - near_**p) / at
        weight, length = weight + expected, length + expected * distance
    return length / weight


@pytest.mark.parametrize("side", [2, 3, 5, 9])
@pytest.mark.parametrize("p", [0.3, 0.5, 0.72])
def test_the_mean_is_the_sum_over_all_pairs(side, p):
    assert mean_wire(float(side**2), p) == near(_pair_by_pair(side, p), rel=1e-12)


def test_between_squares_the_length_is_monotone_and_meets_both_ends():
    sizes = np.array([900.0, 930.0, 961.0, 961.5, 1000.0, 1024.0])
    means = [mean_wire(size, 0.6) for size in sizes]
    assert (np.diff(means) > 0.0).all()
    assert means[0] == near(davis_discrete(900, 0.6, 4.0, 3.0)[1], rel=1e-14)
    assert means[-1] == near(davis_discrete(1024, 0.6, 4.0, 3.0)[1], rel=1e-14)


def test_neither_coefficient_nor_fan_out_changes_the_mean_wire():
    assert davis_discrete(400, 0.6, 4.0, 3.0)[1] == near(davis_discrete(400, 0.6, 0.9, 1.0)[1], rel=1e-13)


def test_arrays_of_scenarios_are_taken_element_by_element():
    gates = np.array([900.0, 1024.0, 1024.0]).reshape(3, 1, 1)
    exponent = np.array([0.6, 0.6, 0.7]).reshape(3, 1, 1)
    found = average_net_pitches({"gate_count": gates, "rent_exponent": exponent, "fan_out": 3.0})
    assert found.shape == (3, 1, 1)
    expected = [3.0 * 4.0 / 6.0 * mean_wire(n, p) for n, p in ((900, 0.6), (1024, 0.6), (1024, 0.7))]
    assert found.ravel().tolist() == near(expected, rel=1e-13)


SCENARIO = {
    "logic_depth": 20.0,
    "fan_out": 3.0,
    "activity": 0.05,
    "gate_count": 1.0e6,
    "register_count": 0.0,
}


def test_the_block_with_an_exponent_is_the_block_with_its_length():
    pair, wires = ohmic_pair(on_resistance=1e4, input_capacitance=0.5e-15, area=1e-14), Wires(1e7, 2e-10)
    derived = build("random-logic", {**SCENARIO, "rent_exponent": 0.6})
    stated = build("random-logic", {**SCENARIO, "average_net_pitches": 2.0 * mean_wire(1e6, 0.6)})
    one, other = (estimate(circuit, pair, wires, "step", short_circuit=False) for circuit in (derived, stated))
    assert float(one.dynamic_energy) == float(other.dynamic_energy)
    assert float(one.path_delay) == float(other.path_delay)
    text = next(text for text in derived.assumptions if "Rent" in text)
    assert "12.37 gate pitches" in text  # RLB-net: 12.366
    assert "9.76 by the continuous form" in text
    assert "13.2 by hierarchical placement" in text
    assert not any("Rent" in text for text in stated.assumptions)


def test_at_one_half_only_the_discrete_form_is_named():
    text = length_convention({**SCENARIO, "rent_exponent": 0.5})
    assert "continuous" not in text


@pytest.mark.parametrize(
    ("change", "match"),
    [
        ({"rent_exponent": 1.0}, "between 0 and 1"),
        ({"gate_count": 3.0}, "at least 4"),
        ({"average_net_length": 1e-6}, "needs one of"),
    ],
)
def test_lengths_that_mean_nothing_are_refused(change, match):
    with pytest.raises(UsageError, match=match):
        build("random-logic", {**SCENARIO, "rent_exponent": 0.6, **change})
