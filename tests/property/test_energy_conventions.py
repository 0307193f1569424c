"""Edges against cycles, charge against capacitance, and one constant for both sides (properties 25 and 26)."""

from __future__ import annotations

from decimal import Decimal as D
from typing import Any

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.integrate import solve_ivp

from benchmark.circuits.cells import cell
from benchmark.circuits.circuit import Circuit, Load, Net, Wires
from benchmark.circuits.multiplier import array_multiplier
from benchmark.circuits.operation import estimate
from benchmark.circuits.patterns import activity, patterns, simulate
from benchmark.circuits.prefix_adder import prefix_adder
from tests import comparisons as cmp
from tests.comparisons import compare, load
from tests.factories import ohmic_pair
from tests.near import near
from tests.profiles import costly, examples
from tests.random_sets import EXACT, POLICIES, factor, lines, published, switches, two, with_policy
from tests.studies import v

few = costly()

# -- 25: one edge dissipates half of a cycle ---------------------------------------------------------------------------


def dissipated(switch: Any, supply: float, charge: Any) -> float:
    """Heat in the closed path of one edge [J]: the current law of the switch empties (or fills) a node in time.

    ``charge``: charge of the node over its way x from 0 to 1, and its slope.
    """
    capacitance = charge(1.0) / supply

    def slope(t: float, y: Any) -> list[float]:
        left = max(supply * (1.0 - float(y[0])), 0.0)
        current = float(np.ravel(switch.current(np.array([supply]), np.array([left])))[0])
        return [current / charge.slope(float(y[0])), current * left / (capacitance * supply)]

    scale = float(np.ravel(switch.resistance)[0]) * capacitance
    found = solve_ivp(slope, (0.0, 60.0 * scale), [0.0, 0.0], method="LSODA", rtol=1e-9, atol=1e-12)
    assert found.y[0, -1] == near(1.0, rel=1e-6)
    return float(found.y[1, -1]) * capacitance * supply


class Charge:
    """Q(x) = C V (x + bend x (1 - x)): a capacitance that changes along the way, total C V."""

    def __init__(self, total: float, bend: float) -> None:
        self.total, self.bend = total, bend

    def __call__(self, x: float) -> float:
        return self.total * (x + self.bend * x * (1.0 - x))

    def slope(self, x: float) -> float:
        return self.total * (1.0 + self.bend * (1.0 - 2.0 * x))

    def reversed(self) -> Charge:
        """The same charge on the way back."""
        return Charge(self.total, -self.bend)


@settings(max_examples=examples(8))
@given(factor(0.1, 2.0), factor(1e3, 1e6), factor(1e2, 1e8), factor(1e-17, 1e-15), st.floats(-0.8, 0.8))
def test_a_cycle_dissipates_the_supply_times_the_charge_and_an_edge_half_of_it(
    supply: float, on: float, ratio: float, capacitance: float, bend: float
):
    """E of the engine is per rising transition, that is per full cycle: twice the mean heat of an edge."""
    pair = ohmic_pair(supply=supply, on_resistance=on, off_resistance=on * ratio, input_capacitance=capacitance)
    net = Net("n", cell("inverter"), loads=(Load(cell("inverter"), "a"),), rising_per_operation=1.0)
    found = estimate(Circuit("c", "", "", (net,)), pair, Wires(0.0, 0.0), "step", short_circuit=False)
    straight, curved = Charge(2.0 * capacitance * supply, 0.0), Charge(2.0 * capacitance * supply, bend)
    edge = dissipated(pair.up, supply, straight)
    assert float(found.dynamic_energy) == near(2.0 * edge, rel=1e-5)
    # not half and half where the capacitance changes along the way, but supply times charge over the cycle
    rising, falling = dissipated(pair.up, supply, curved), dissipated(pair.down, supply, curved.reversed())
    assert float(found.dynamic_energy) == near(rising + falling, rel=1e-5)
    if abs(bend) > 0.1:
        assert abs(rising - falling) > 0.01 * (rising + falling)


@settings(max_examples=examples(20))
@given(factor(0.1, 2.0), factor(1e-17, 1e-15), factor(0.2, 5.0), factor(0.2, 5.0))
def test_energy_counts_the_charge_whatever_the_capacitance_of_the_delay(
    supply: float, capacitance: float, k: float, j: float
):
    """A nonlinear capacitance: V times charge, not V^2 times the capacitance in the switching window."""
    net = Net("n", cell("inverter"), loads=(Load(cell("inverter"), "a"),), rising_per_operation=1.0)

    def energy(**more: Any) -> float:
        pair = ohmic_pair(supply=supply, input_capacitance=capacitance, **more)
        found = estimate(Circuit("c", "", "", (net,)), pair, Wires(0.0, 0.0), "step", short_circuit=False)
        return float(found.dynamic_energy)

    charge = k * capacitance * supply
    assert energy(input_charge=np.asarray(charge)) == near(2.0 * supply * charge, rel=1e-12)
    assert energy(input_capacitance_delay=j * capacitance) == near(energy(), rel=1e-12)


@settings(max_examples=examples(8))
@given(st.sampled_from(["kogge-stone", "brent-kung", "sklansky", "multiplier"]), st.integers(2, 3))
def test_activity_is_half_of_the_edges_of_all_pairs_of_vectors(kind: str, bits: int):
    """Every ordered pair of input vectors: as many rising as falling edges on each net; activity counts the rising."""
    netlist = array_multiplier(bits, 2) if kind == "multiplier" else prefix_adder(kind, bits).netlist
    counted = activity(netlist)
    states = 2 ** len(netlist.inputs)
    for net, words in simulate(netlist, patterns(netlist.inputs)).items():
        bits_of = np.unpackbits(words.view(np.uint8), bitorder="little").astype(bool)
        levels = bits_of[: max(states, 64)]
        rising = np.count_nonzero(~levels[:, None] & levels[None, :])
        falling = np.count_nonzero(levels[:, None] & ~levels[None, :])
        assert rising == falling
        assert counted[net] == near(0.5 * (rising + falling) / levels.size**2, rel=1e-12)


# -- 26: the same constant on both sides -------------------------------------------------------------------------------


@few
@given(switches("a"), switches("b"), st.integers(2, 50), st.sampled_from(sorted(POLICIES)))
def test_results_per_block_and_per_block_of_many_have_the_same_advantage(a: Any, b: Any, count: int, policy: str):
    """Per gate, per block or per n blocks: both sides n times the energy, leakage and area at the same time."""
    found, words = [], []
    for k in (1, count):
        for item in (a, b):
            if "series_switches_max" in item["value"]:
                item["value"]["series_switches_max"]["value"] = D(4)
        values = {"gate_count": v(100 * k), "register_count": v(0), "average_net_length": v(D("2.0"), "um")}
        inputs = published(two(a, b, circuit="random-logic", values=values, line=lines(10.0, 0.2, 5.0)))
        with_policy(inputs, policy)
        if policy == "iso-energy":
            inputs.study["policy"]["required_energy"] = v(D(k), "pJ")
        found.append(compare(load(inputs)))
        words.append(cmp.verdict(inputs).word)
    one, many = found
    assert words[0] == words[1]
    assert list(one.candidate.found) == list(many.candidate.found)
    if one.candidate.found[0] and one.strongest[0] >= 0:
        assert many.advantage[0] == near(one.advantage[0], rel=1e-7)
        assert many.candidate.time[0] == near(one.candidate.time[0], rel=1e-5)
        assert many.candidate.energy[0] == near(count * one.candidate.energy[0], rel=1e-5)
        assert many.candidate.area[0] == near(count * one.candidate.area[0], rel=EXACT)
