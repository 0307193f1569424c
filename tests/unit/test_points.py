"""Design points against hand arithmetic: leakage and idle accounting, power density, cycles, knobs, temperatures."""

from __future__ import annotations

from decimal import Decimal as D

import numpy as np
import pytest

from benchmark.decide.requirements import standing
from benchmark.evaluate.points import cycles_demanded, design_points
from tests.comparisons import comparison, given, load, planar, side, steep, study
from tests.near import near
from tests.studies import v

LN2 = float(np.log(2.0))
#: one given switch: R 20 kohm, R_off 200 Gohm, 0.2 fF per switch, so 0.4 fF per inverter input
C, R, R_OFF = 0.4e-15, 20e3, 2e11
CLOCK = {"clock_frequency": v(D("1.0"), "MHz")}
IDLE = {"idle_time": v(D("0.002"), "s"), "active_cycles": v(500)}


def points(supply=0.5, candidate=None, switch=None, **options):
    first = candidate or side("a", 0.2, 0.9)
    loaded = load(study(first, [side("b", 0.2, 0.9)], [switch or given("a"), given("b")], **options))
    problem = comparison(loaded).candidate.problem
    return problem, design_points(problem, np.array([[supply]]))


def value(array):
    return float(np.asarray(array)[0, 0])


def test_self_timed_chain():
    _, p = points()
    dynamic = 20 * 0.05 * C * 0.5**2
    leakage = 20 * 0.5 * 0.5 / (R + R_OFF)
    time = 20 * LN2 * R * C
    assert value(p.time) == near(time, rel=1e-12)
    assert value(p.leakage_power) == near(leakage, rel=1e-12)
    assert value(p.energy_parts["input"]) == near(dynamic, rel=1e-12)
    assert value(p.energy_parts["leakage"]) == near(leakage * time, rel=1e-12)
    assert value(p.energy) == near(dynamic + leakage * time, rel=1e-12)
    assert value(p.cycle) == value(p.time)
    assert value(p.area) == near(20 * 2 * 0.02e-12, rel=1e-12)
    assert value(p.power_density) == near(value(p.energy) / time / value(p.area), rel=1e-12)


@pytest.mark.parametrize("accounting", ["period", "operation"])
def test_leakage_is_charged_over_the_period_or_the_path(accounting):
    _, p = points(timing="clocked", accounting=accounting, values=CLOCK)
    over = 1e-6 if accounting == "period" else value(p.time)
    assert value(p.energy_parts["leakage"]) == near(value(p.leakage_power) * over, rel=1e-12)
    # power is per clock period in both cases
    assert value(p.power_density) == near(value(p.energy) / 1e-6 / value(p.area), rel=1e-12)


def test_a_path_longer_than_the_clock_period_leaks_as_long_as_it_takes():
    """No deadline is required here, so nothing forbids the point; but an operation lasts as long as its path."""
    _, p = points(timing="clocked", accounting="period", values={"clock_frequency": v(D("10.0"), "GHz")})
    assert value(p.time) > 1e-10
    assert value(p.cycle) == value(p.time)
    assert value(p.energy_parts["leakage"]) == near(value(p.leakage_power) * value(p.time), rel=1e-12)
    assert value(p.power_density) == near(value(p.energy) / value(p.time) / value(p.area), rel=1e-12)


COSTS = {
    "level_shifter_energy": v(D("0.3"), "fJ"),
    "level_shifter_delay": v(D("40.0"), "ps"),
    "supply_efficiency": v(D("0.8")),
    "overhead_power": v(D("2.0"), "nW"),
}
#: 40 switches of 5 pW
BIAS = 40 * 5e-12


def test_overheads_bias_efficiency_and_shifters():
    cost = side("a", 0.2, 0.9, costs=COSTS)
    _, p = points(
        candidate=cost, switch=given("a", bias_power=5.0), timing="clocked", accounting="period", values=CLOCK
    )
    _, bare = points(timing="clocked", accounting="period", values=CLOCK)
    core = value(bare.energy) + (BIAS + 2e-9) * 1e-6
    assert value(p.energy) == near(core / 0.8 + 0.3e-15, rel=1e-12)
    assert value(p.energy_parts["supply_loss"]) == near(core * 0.25, rel=1e-12)
    assert value(p.energy_parts["bias_and_overheads"]) == near((BIAS + 2e-9) * 1e-6, rel=1e-12)
    assert sum(value(part) for part in p.energy_parts.values()) == near(value(p.energy), rel=1e-12)
    assert value(p.time) == near(value(bare.time) + 40e-12, rel=1e-12)
    assert value(p.time_parts["level_shifter"]) == 40e-12


@pytest.mark.parametrize("idle", ["ungated", "gated"])
def test_what_stands_goes_on_while_idle(idle):
    """Leakage, bias and overheads; a gate leaves the residual share of the block, not of what lies outside it."""
    gate = {"gating": {"residual_leakage": v(D("0.05")), "wake_energy_cycles": v(D("3.0"))}} if idle == "gated" else {}
    cost = side("a", 0.2, 0.9, costs=COSTS, **gate)
    rival = side("b", 0.2, 0.9, **gate)
    loaded = load(
        study(
            cost,
            [rival],
            [given("a", bias_power=5.0), given("b")],
            timing="clocked",
            accounting="period",
            idle=idle,
            values=CLOCK | IDLE,
        )
    )
    problem = comparison(loaded).candidate.problem
    p = design_points(problem, np.array([[0.5]]))
    leak = value(p.leakage_power)
    if idle == "ungated":
        expected = (leak + BIAS + 2e-9) * 0.002 / 500
    else:
        expected = ((0.05 * (leak + BIAS) + 2e-9) * 0.002 + 3 * 20 * C * 0.5**2) / 500
    assert value(p.energy_parts["idle"]) == near(expected, rel=1e-12)
    assert sum(value(part) for part in p.energy_parts.values()) == near(value(p.energy), rel=1e-12)
    # the power density is that of the block at work
    at_work = value(p.energy) - expected / 0.8
    assert value(p.power_density) == near(at_work / 1e-6 / value(p.area), rel=1e-12)


def test_gate_with_residual_one_and_free_wake_is_no_gate():
    gate = {"residual_leakage": v(D("1.0")), "wake_energy_cycles": v(D("0.0"))}
    both = []
    for idle, gating in (("ungated", {}), ("gated", {"gating": gate})):
        loaded = load(
            study(
                side("a", 0.2, 0.9, costs=COSTS, **gating),
                [side("b", 0.2, 0.9, **gating)],
                [steep("a", bias_power=5.0), steep("b")],
                timing="clocked",
                accounting="period",
                idle=idle,
                values=CLOCK | IDLE,
            )
        )
        both.append(design_points(comparison(loaded).candidate.problem, np.array([[0.4]])))
    assert value(both[0].energy) == value(both[1].energy)


def test_guard_bands_multiply_delay_and_leakage_only():
    _, plain = points()
    _, p = points(guard=(1.25, 3.0))
    assert value(p.time) == near(1.25 * value(plain.time), rel=1e-12)
    assert value(p.leakage_power) == near(3.0 * value(plain.leakage_power), rel=1e-12)
    assert value(p.energy_parts["input"]) == value(plain.energy_parts["input"])


ENDURANCE = {"endurance": {"life": {"value": D("10.0"), "unit": "year"}, "kind": "report"}}
LIFE = 3.15576e8


def test_cycles_of_the_busiest_net():
    """f a_max duty life, ten Julian years (needs no energy policy)."""
    problem, p = points(
        timing="clocked",
        values=CLOCK | {"busiest_activity": v(D("0.5")), "duty": v(D("0.01"))},
        requirements=ENDURANCE,
    )
    assert value(cycles_demanded(problem, p, LIFE)) == near(1e6 * 0.5 * 0.01 * LIFE, rel=1e-12)
    problem, p = points(
        timing="clocked",
        idle="ungated",
        values=CLOCK | IDLE | {"busiest_activity": v(D("0.5"))},
        requirements=ENDURANCE,
    )
    awake = 500e-6
    assert value(cycles_demanded(problem, p, LIFE)) == near(1e6 * 0.5 * awake / (awake + 0.002) * LIFE, rel=1e-12)


def test_a_self_timed_block_runs_all_the_time_unless_a_rate_is_stated():
    values = {"busiest_activity": v(D("0.5")), "duty": v(D("0.1"))}
    problem, p = points(values=values, requirements=ENDURANCE)
    assert value(cycles_demanded(problem, p, LIFE)) == near(0.5 * 0.1 * LIFE / value(p.time), rel=1e-12)
    problem, p = points(values=values | CLOCK, requirements=ENDURANCE)
    assert value(cycles_demanded(problem, p, LIFE)) == near(0.5 * 0.1 * LIFE * 1e6, rel=1e-12)


def test_a_clock_net_in_the_circuit_is_busier_than_the_stated_activity():
    loaded = load(
        study(
            side("a", 0.3, 0.9),
            [side("b", 0.3, 0.9)],
            [steep("a", endurance_cycles=1e15, series_switches_max=3), steep("b", series_switches_max=3)],
            circuit="register",
            timing="clocked",
            accounting="period",
            values=CLOCK | {"busiest_activity": v(D("0.2")), "duty": v(D("0.1")), "fan_out": v(2)},
            requirements=ENDURANCE,
        ),
        drop=("logic_depth",),
    )
    problem = comparison(loaded).candidate.problem
    p = design_points(problem, np.array([[0.5]]))
    assert value(cycles_demanded(problem, p, LIFE)) == near(1e6 * 1.0 * 0.1 * LIFE, rel=1e-12)
    found = standing(problem, p, loaded.requirements["endurance"])
    assert found.margin[0] == near(1e15 / (1e5 * LIFE), rel=1e-12)


def test_positive_threshold_shift_leaks_less_and_is_slower():
    for make, supply in ((steep, 0.3), (planar, 0.6)):
        loaded = load(study(side("a", 0.2, 0.9, shifts=[0.0, 60.0]), [side("b", 0.2, 0.9)], [make("a"), make("b")]))
        problem = comparison(loaded).candidate.problem
        low, high = (design_points(problem, np.array([[supply]]), 1.0, shift) for shift in (0.0, 0.06))
        assert value(high.leakage_power) < value(low.leakage_power)
        assert value(high.time) > value(low.time)
    # 60 mV at 90 mV/decade and some: between 10^(60/95) and 10^(60/85)
    assert 10 ** (60 / 95) < value(low.leakage_power) / value(high.leakage_power) < 10 ** (60 / 85)


def test_size_divides_resistance_and_multiplies_everything_else():
    for make in (given, steep, planar):
        loaded = load(study(side("a", 0.4, 0.9), [side("b", 0.4, 0.9)], [make("a"), make("b")]))
        problem = comparison(loaded).candidate.problem
        one, two = (design_points(problem, np.array([[0.6]]), size) for size in (1.0, 2.0))
        assert value(two.time) == near(value(one.time), rel=1e-12)
        assert value(two.energy) == near(2 * value(one.energy), rel=1e-12)
        assert value(two.leakage_power) == near(2 * value(one.leakage_power), rel=1e-12)
        assert value(two.area) == near(2 * value(one.area), rel=1e-12)
        assert value(two.power_density) == near(value(one.power_density), rel=1e-12)


def test_delay_at_the_slowest_temperature_leakage_at_the_hottest():
    """Near threshold the transistor is slowest when cold, at high supply when hot."""

    def at(temperatures, supply):
        loaded = load(
            study(
                side("a", 0.2, 1.2),
                [side("b", 0.2, 1.2)],
                [planar("a", velocity_temperature_exponent=-0.8), planar("b")],
                temperatures=temperatures,
            )
        )
        return design_points(comparison(loaded).candidate.problem, np.array([[supply]]))

    for supply, slowest in ((0.3, 0), (1.2, 2)):
        all_three = at((85.0, -20.0, 25.0), supply)  # the order of the list does not matter
        alone = [at((t,), supply) for t in (-20.0, 25.0, 85.0)]
        assert int(all_three.slowest_temperature[0, 0]) == slowest
        assert value(all_three.time) == max(value(p.time) for p in alone) == value(alone[slowest].time)
        assert value(all_three.leakage_power) == value(alone[2].leakage_power)
        for name, part in all_three.dynamic_parts.items():
            assert value(part) == value(alone[2].dynamic_parts[name])
        assert value(all_three.noise_ratio) == min(value(p.noise_ratio) for p in alone)
        assert value(all_three.time) == near(sum(value(part) for part in all_three.time_parts.values()), rel=1e-12)


def test_hysteresis_is_the_window_over_the_supply():
    switch = given("a", supply=0.5, closing_voltage=0.25, opening_voltage=0.15)
    for supply in (0.4, 0.5, 0.8):
        _, p = points(supply, switch=switch)
        assert value(p.hysteresis) == near(0.1 / supply, rel=1e-12)
    assert value(points()[1].hysteresis) == 0.0


def test_noise_ratio_is_half_the_swing_over_root_kt_c():
    """0.1 fF at 300 K: sqrt(kT/C) = 6.436 mV (equipartition); half of 0.1 V is 7.8 sigma."""
    loaded = load(
        study(
            side("a", 0.05, 0.9),
            [side("b", 0.2, 0.9)],
            [given("a", input_capacitance=0.05), given("b")],
            temperatures=(26.85,),
        )
    )
    p = design_points(comparison(loaded).candidate.problem, np.array([[0.1]]))
    assert value(p.noise_ratio) == near(0.05 / 6.436e-3, rel=1e-3)
