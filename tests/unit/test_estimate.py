"""Stages and circuits against hand arithmetic, closed forms and independent quadrature."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.integrate import quad

from benchmark.circuits.cells import cell
from benchmark.circuits.circuit import Circuit, Layer, Load, Net, Wires
from benchmark.circuits.library import build
from benchmark.circuits.operation import estimate
from benchmark.circuits.rules import EdgeFactors
from benchmark.circuits.sized import Sized
from benchmark.errors import UsageError
from tests.factories import ohmic_pair
from tests.near import near

LN2 = np.log(2.0)
INVERTER = cell("inverter")
NO_WIRE = Wires(0.0, 0.0)
PS, FS = 1e-12, 1e-15


def _one(net: Net, pair, wires: Wires = NO_WIRE, rule="step", **options):
    return estimate(Circuit("one", "", "", (net,)), pair, wires, rule, **options)


def test_word_line_driver():
    """500 um, 20 ohm/um, 0.2 fF/um at a fixed swing of 1.8 V: the wire decides, a ten times better driver does not."""
    line = Net(
        "line",
        INVERTER,
        wire_length=500e-6,
        layer="word-line",
        swing=1.8,
        rising_per_operation=1.0,
        on_critical_path=1.0,
    )
    circuit = Circuit("word line", "", "one row access", (line,), {"word-line": Layer(20e6, 0.2e-9)})
    reference = estimate(circuit, ohmic_pair(on_resistance=2e3), NO_WIRE, "step", short_circuit=False)
    candidate = estimate(
        circuit,
        ohmic_pair(supply=0.25, on_resistance=200.0, closing_time=15 * PS),
        NO_WIRE,
        "step",
        short_circuit=False,
    )
    assert float(reference.path_delay) / PS == near(515.6, abs=0.05)
    assert float(candidate.path_delay) / PS == near(405.9, abs=0.05)
    assert float(reference.path_delay / candidate.path_delay) == near(1.270, abs=5e-4)
    assert float(reference.dynamic_energy) / FS == near(324.0, rel=1e-12)
    assert float(candidate.dynamic_energy) == float(reference.dynamic_energy)  # never (1.8/0.25)^2
    with_shifters = (float(reference.dynamic_energy) + 5 * FS) / (float(candidate.dynamic_energy) + 20 * FS)
    assert with_shifters == near(0.956, abs=5e-4)
    perfect, with_transit = (
        estimate(circuit, ohmic_pair(on_resistance=1e-6, closing_time=t), NO_WIRE, "step") for t in (0.0, 15 * PS)
    )
    assert float(reference.path_delay / perfect.path_delay) == near(1.368, abs=5e-4)
    assert float(reference.path_delay / with_transit.path_delay) == near(1.315, abs=5e-4)
    needed = estimate(circuit, ohmic_pair(on_resistance=543.8, closing_time=15 * PS), NO_WIRE, "step")
    assert float(reference.path_delay / needed.path_delay) == near(1.2, abs=5e-5)


@pytest.mark.parametrize(
    ("supply", "resistance", "rc", "delay", "energy", "leakage"),
    [
        (0.25, 1e5, 6.931, 21.93, 6.25, 0.0877),
        (0.25, 1e7, 693.1, 708.1, 6.25, 2.833),
        (0.50, 1e5, 6.931, 21.93, 25.0, 0.0877),
        (0.40, 10**5.8, 43.73, 58.73, 16.0, 0.235),
    ],
)
def test_stress_gated_switch_by_hand(supply, resistance, rc, delay, energy, leakage):
    """0.10 fF, 15 ps of transit, R_0 = 1 Gohm, depth 20, activity 0.05: RC, t [ps], C V^2 [aJ], leakage share."""
    pair = ohmic_pair(
        supply=supply, on_resistance=resistance, off_resistance=1e9, input_capacitance=0.05 * FS, closing_time=15 * PS
    )
    chain = build("inverter-chain", {"logic_depth": 20.0, "fan_out": 1.0, "activity": 0.05})
    found = estimate(chain, pair, NO_WIRE, "step", short_circuit=False)
    stage = found.stages[0]
    assert float(stage.delay_parts["input"]) / PS == near(rc, rel=2e-4)
    assert float(stage.delay) / PS == near(delay, rel=4e-4)
    assert float(stage.energy) / 1e-18 == near(energy, rel=1e-9)
    share = float(found.leakage_power * found.path_delay / found.dynamic_energy)
    assert share == near(leakage, rel=2e-3)


def test_always_on_hub_by_hand():
    """Energy per 10 us cycle and gate, fJ, at activity 0.02: 0.6072, 0.0168, 0.0400; break-evens 0.3659, 0.004636."""
    cycle = 10e-6

    def per_gate(capacitance, supply, off_resistance):
        # one gate's own energy and leakage: the chain's, over its depth
        pair = ohmic_pair(supply=supply, input_capacitance=capacitance / 2, off_resistance=off_resistance)
        chain = build("inverter-chain", {"logic_depth": 20.0, "fan_out": 1.0, "activity": 1.0})
        found = estimate(chain, pair, NO_WIRE, "step", short_circuit=False)
        return float(found.dynamic_energy) / 20, float(found.leakage_power) * cycle / 20

    fast, low, new = per_gate(1 * FS, 0.6, 6e9), per_gate(1 * FS, 0.7, 700e9), per_gate(0.5 * FS, 2.0, 1e30)
    energies = [(0.02 * swing + leak) / FS for swing, leak in (fast, low, new)]
    assert energies == near([0.6072, 0.0168, 0.0400], abs=5e-5)
    assert (fast[1] - new[1]) / (new[0] - fast[0]) == near(0.3659, abs=5e-5)
    assert (low[1] - new[1]) / (new[0] - low[0]) == near(0.004636, abs=5e-7)


def test_every_term_of_the_stage_delay():
    """t = t_int + F [R (C_self + cL + C_in + C_fixed) + r L (C_in + C_fixed)] + W r c L^2, by hand, chain rule."""
    w, r, c, length, pin = 0.7, 5e7, 2e-10, 1e-5, 3e-17
    pair = ohmic_pair(
        on_resistance=1e4,
        input_capacitance=1e-15,
        input_capacitance_delay=2e-16,
        terminal_capacitance=9e-16,
        terminal_capacitance_delay=1e-16,
        closing_time=3 * PS,
        opening_time=4 * PS,
        switching_level=w,
        extra_energy=1e-17,
    )
    net = Net(
        "n",
        INVERTER,
        loads=(Load(INVERTER, "a", 3.0),),
        fixed_load=5e-16,
        wire_length=length,
        on_critical_path=2.0,
        rising_per_operation=0.25,
        count=10.0,
    )
    found = _one(net, pair, Wires(r, c, pin), "chain", short_circuit=False)
    factor = np.log(1.0 / (1.0 - w))
    own, wire, driven, pins, fixed = 2 * 1e-16, c * length, 3 * 2 * 2e-16, 4 * pin, 5e-16
    far = driven + 3 * pin + fixed
    expected = (
        4 * PS
        + factor * (1e4 * (own + wire + driven + pins + fixed) + r * length * far)
        + (0.1 + 0.4 * factor) * r * c * length**2
    )
    assert float(found.stages[0].delay) == near(expected, rel=1e-12)
    assert float(found.path_delay) == near(2 * expected, rel=1e-12)
    parts = found.stages[0].delay_parts
    assert float(parts["layout"]) == near(factor * 1e4 * pins, rel=1e-12)
    assert float(parts["input"]) == near(factor * 1e4 * driven, rel=1e-12)
    energy = (2 * 9e-16 + wire + 3 * 2e-15 + pins + fixed) + 3 * 2 * 1e-17
    assert float(found.stages[0].energy) == near(energy, rel=1e-12)
    assert float(found.dynamic_energy) == near(2.5 * energy, rel=1e-12)


def test_unequal_edges():
    pair = ohmic_pair(on_resistance=1e4, up={"on_resistance": 3e4, "closing_time": 2 * PS})
    net = Net("n", INVERTER, fixed_load=1e-15, on_critical_path=1.0)
    found = _one(net, pair)
    stage = found.stages[0]
    assert float(stage.falling.delay) == near(LN2 * 1e-11)
    assert float(stage.rising.delay) == near(LN2 * 3e-11 + 2 * PS)
    assert float(found.path_delay) == near(LN2 * 2e-11 + 1 * PS)
    assert float(found.worst_edge_path_delay) == near(LN2 * 3e-11 + 2 * PS)


def test_an_edge_waits_for_the_switch_it_closes_in_the_next_stage():
    pair = ohmic_pair(switching_level=0.5, up={"switching_level": 0.9})
    stage = _one(Net("n", INVERTER, fixed_load=1e-15), pair, rule="chain").stages[0]
    assert float(stage.falling.factor) == near(np.log(10.0))  # a falling output closes a pull-up switch
    assert float(stage.rising.factor) == near(LN2)


def test_gate_pitches_follow_the_technology():
    net = Net("n", cell("nand2"), wire_length=8.0, length_unit="gate_pitch")
    pair = ohmic_pair(area=np.array([1e-14, 4e-14]))
    found = _one(net, pair, Wires(0.0, 1e-10))
    np.testing.assert_allclose(found.gate_pitch, np.sqrt([4e-14, 16e-14]))
    np.testing.assert_allclose(found.stages[0].wire_length, 8.0 * found.gate_pitch)


@pytest.mark.parametrize("window", [(0.0, 1.0), (0.2, 0.8), (0.1, 0.5)])
def test_short_circuit_charge_against_adaptive_quadrature(window):
    pair = ohmic_pair(supply=0.8, on_resistance=1e4, off_resistance=1e8, window=window, up={"on_resistance": 2e4})
    net = Net("n", INVERTER, fixed_load=2e-15)
    stage = _one(net, pair, rule="chain").stages[0]
    ramp = 2.0 * float(stage.delay - stage.delay_parts["transit"])

    def crossing(switch):
        def at(u):
            return float(switch.current(np.array([(1 - u) * 0.8]), np.array([(u - 0.5) * 0.8]))[0])

        corners = [1 - window[1], 1 - window[0]]
        return quad(at, 0.5, 1.0, points=[x for x in corners if 0.5 < x < 1.0] or None, epsrel=1e-10)[0]

    expected = 0.8 * ramp * (crossing(pair.down) + crossing(pair.up))
    kinked = window != (0.0, 1.0)
    assert float(stage.energy_parts["short_circuit"]) == near(expected, rel=2e-3 if kinked else 1e-10)


def test_short_circuit_is_small_for_a_window_that_does_not_overlap():
    """Own simulation of chains at tau/RC <= 1: crow-bar below 0.004 C V^2 at 4 decades, window 0.2 to 0.8."""
    chain = build("inverter-chain", {"logic_depth": 1.0, "fan_out": 1.0, "activity": 1.0})
    found = estimate(chain, ohmic_pair(on_resistance=1e4, off_resistance=1e8), NO_WIRE, "chain")
    share = found.dynamic_energy_parts["short_circuit"] / found.dynamic_energy
    assert 0.0 < float(share) < 0.004


def test_overlap_of_a_switch_that_opens_late():
    pair = ohmic_pair(on_resistance=1e4, off_resistance=1e30, closing_time=1 * PS, opening_time=4 * PS)
    net = Net("n", INVERTER)
    energy = float(_one(net, pair).stages[0].energy_parts["short_circuit"])
    assert energy == near(2 * 1.0**2 / (2 * 1e4) * 3 * PS, rel=1e-9)
    early = ohmic_pair(on_resistance=1e4, off_resistance=1e30, closing_time=4 * PS, opening_time=1 * PS)
    assert float(_one(net, early).stages[0].energy_parts["short_circuit"]) == 0.0


def test_points_that_mean_nothing_are_named():
    level = np.array([0.7, np.nan, 0.7])
    pair = ohmic_pair(supply=np.array([1.0, 0.1, 0.5]), switching_level=level)
    pair = replace(pair, down=replace(pair.down, outside={"supply outside the data": np.array([False, False, True])}))
    found = _one(Net("n", INVERTER, fixed_load=1e-15, on_critical_path=1.0), pair, rule="chain")
    assert set(found.unable) == {"does not switch at this supply", "supply outside the data"}
    np.testing.assert_array_equal(found.unable["does not switch at this supply"], [False, True, False])
    np.testing.assert_array_equal(found.unable["supply outside the data"], [False, False, True])
    assert np.isfinite(found.path_delay).tolist() == [True, False, True]


def test_a_level_that_is_never_reached_does_not_switch():
    found = _one(
        Net("n", INVERTER, fixed_load=1e-15, on_critical_path=1.0), ohmic_pair(switching_level=1.0), rule="chain"
    )
    assert found.unable["does not switch at this supply"].all()


def test_an_infinite_resistance_does_not_switch():
    pair = ohmic_pair(supply=np.array([0.5, 1.0]), resistance=np.array([1e4, np.inf]))
    for rule in ("chain", "step"):
        found = _one(Net("n", INVERTER, loads=(Load(INVERTER, "a"),)), pair, rule=rule)
        np.testing.assert_array_equal(found.unable["does not switch at this supply"], [False, True])


def test_single_polarity_and_single_stage_technologies_are_refused():
    net = Net("n", INVERTER)
    assert any("complementary" in reason for reason in _one(net, ohmic_pair(partner="none")).unable)
    known = ohmic_pair(stage_only="inverter, fan-out 4, no wire")
    assert any("known only" in reason for reason in _one(net, known).unable)
    chain = {"logic_depth": 10.0, "activity": 0.1}
    assert not estimate(build("inverter-chain", {**chain, "fan_out": 4.0}), known, NO_WIRE).unable
    assert estimate(build("inverter-chain", {**chain, "fan_out": 3.0}), known, NO_WIRE).unable
    wired = build("inverter-chain", {**chain, "fan_out": 4.0, "average_net_length": 1e-6})
    assert estimate(wired, known, NO_WIRE).unable


def test_stacks_beyond_the_record_are_refused():
    found = _one(Net("n", cell("nand4"), on_critical_path=1.0), ohmic_pair(k_max=3))
    assert found.unable["4 switches in series are more than the technology states"].all()
    assert np.isnan(found.path_delay)


def test_unknown_rule_and_layer_are_refused():
    with pytest.raises(UsageError, match="did you mean 'chain'"):
        _one(Net("n", INVERTER), ohmic_pair(), rule="chian")
    with pytest.raises(UsageError, match="no wire layer"):
        _one(Net("n", INVERTER, layer="metal"), ohmic_pair())


def test_a_rule_of_ones_own():
    def rule(edge):
        np.testing.assert_allclose(edge.capacitance, 1e-15)
        return EdgeFactors(edge.transit + PS, np.asarray(2.0), np.asarray(0.0))

    found = _one(Net("n", INVERTER, fixed_load=1e-15, on_critical_path=1.0), ohmic_pair(), rule=rule)
    assert float(found.path_delay) == near(PS + 2e-11)


def test_guard_bands_multiply_delay_and_leakage_only():
    net = Net("n", INVERTER, fixed_load=1e-15, on_critical_path=1.0, rising_per_operation=1.0)
    plain = _one(net, ohmic_pair(input_leakage=1e-12))
    guarded = _one(net, ohmic_pair(input_leakage=1e-12), guard_delay=1.3, guard_leakage=1.5)
    assert float(guarded.path_delay / plain.path_delay) == near(1.3)
    assert float(guarded.leakage_power / plain.leakage_power) == near(1.5)
    assert guarded.dynamic_energy == plain.dynamic_energy


def test_thermal_noise_takes_the_worst_net():
    nets = (Net("small", INVERTER, fixed_load=1e-16), Net("large", INVERTER, fixed_load=1e-14))
    found = estimate(Circuit("two", "", "", nets), ohmic_pair(supply=0.1, temperature=300.0), NO_WIRE)
    # 0.1 fF at 300 K: 6.4358 mV (Kish 2004); half of 0.1 V is 7.77 of it
    assert float(found.half_swing_over_noise) == near(0.05 / 6.4358e-3, rel=1e-4)


def test_scenario_arrays_broadcast_with_the_records():
    pair = ohmic_pair(supply=np.linspace(0.3, 1.0, 5)[None, None, :], on_resistance=np.array([1e4, 2e4])[None, :, None])
    activity = np.array([0.1, 0.2, 0.3])[:, None, None]
    scenario = {"logic_depth": 10.0, "fan_out": 2.0, "activity": activity}
    found = estimate(build("inverter-chain", scenario), pair, NO_WIRE)
    for name in (
        "path_delay",
        "dynamic_energy",
        "leakage_power",
        "busiest_rising_per_operation",
        "half_swing_over_noise",
    ):
        assert getattr(found, name).shape == (3, 2, 5)
    np.testing.assert_allclose(found.dynamic_energy[2], 3.0 * found.dynamic_energy[0])


def test_equal_drive_makes_stacks_as_fast_and_larger():
    net = Net("n", cell("nand3"), fixed_load=1e-14, on_critical_path=1.0)
    unit, equal = (_one(net, ohmic_pair(), sizing=sizing) for sizing in ("unit", "equal-drive"))
    assert float(unit.stages[0].falling.delay) == near(3 * float(equal.stages[0].falling.delay))
    assert float(equal.area / unit.area) == near((3 * 3 + 3) / 6)


def test_internal_nodes_count_in_delay_and_energy():
    pair = ohmic_pair(on_resistance=1e4, terminal_capacitance=1e-16)
    net = Net("n", cell("nand2"), on_critical_path=1.0, rising_per_operation=1.0)
    outside, inside = (_one(net, pair, internal_nodes=flag, short_circuit=False) for flag in (False, True))
    assert float(inside.dynamic_energy - outside.dynamic_energy) == near(1e-16)
    stages = inside.stages[0], outside.stages[0]
    assert float(stages[0].falling.delay - stages[1].falling.delay) == near(LN2 * 2e4 * 0.5e-16)
    assert float(stages[0].rising.delay - stages[1].rising.delay) == near(LN2 * 1e4 * 1e-16)


def test_the_size_of_a_width_scales_terminals_and_leakage():
    made = Sized(ohmic_pair(terminal_capacitance=1e-16, off_resistance=1e9), size=5.0)
    assert float(made.output_capacitance(INVERTER, "energy", "down")) == near(10e-16)
    assert float(made.leakage_current(INVERTER)["path"]) == near(5e-9)
