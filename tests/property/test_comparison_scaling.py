"""Laws of whole comparisons over random small technologies: what scales with what.

Exact equality where a law is exact to rounding, else a relative 1e-9 or the stated resolution of the search.
"""

from __future__ import annotations

import copy
import itertools
from decimal import Decimal as D
from typing import Any

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from benchmark.decide.verdict import WORDS
from benchmark.evaluate.points import design_points
from tests import comparisons as cmp
from tests.comparisons import compare, comparison, load, number, side, steep, study
from tests.near import near
from tests.profiles import costly
from tests.random_sets import (
    EXACT,
    RANGE,
    WIRED,
    column,
    factor,
    lines,
    plain,
    published,
    scaled,
    switches,
    transistor,
    two,
    with_policy,
)
from tests.studies import v

GO, CONDITIONAL, FAILED, NOT_BETTER, UNDECIDED = WORDS
few = costly(6)


# -- scaling laws (11 to 20, 22 to 26) -----------------------------------------------------------------------------


@few
@given(plain("a"), plain("b"), factor(0.3, 3.0), st.sampled_from(["minimum-energy", "minimum-energy-delay"]))
def test_impedance_all_resistances_up_all_capacitances_down(a: Any, b: Any, k: float, policy: str):
    """Delays unchanged, energies and powers / k, advantages, supplies and verdict unchanged with the cap / k."""
    cap = 1.0e4
    before = with_policy(published(two(a, b, **WIRED, line=lines(30.0, 0.2, 20.0))), policy)
    change = {"on_resistance": k, "off_resistance": k, "input_capacitance": 1 / k}
    after = with_policy(
        published(two(scaled(a, **change), scaled(b, **change), **WIRED, line=lines(30.0 * k, 0.2 / k, 20.0 / k))),
        policy,
    )
    for inputs, limit in ((before, cap), (after, cap / k)):
        inputs.study["requirements"] = {
            "power_density": {"limit": {"value": number(limit), "unit": "W/cm^2"}, "kind": "hard"}
        }
    one, other = (compare(load(inputs)) for inputs in (before, after))
    assert list(other.candidate.found) == list(one.candidate.found)
    assert cmp.verdict(before).word == cmp.verdict(after).word
    if one.candidate.found[0] and one.strongest[0] >= 0:
        assert other.advantage[0] == near(one.advantage[0], rel=1e-6)
        for mine, theirs in ((one.candidate, other.candidate), (one.contenders[0], other.contenders[0])):
            assert theirs.time[0] == near(mine.time[0], rel=1e-6)
            assert theirs.energy[0] * k == near(mine.energy[0], rel=1e-6)
            assert theirs.supply[0] == near(mine.supply[0], rel=1e-6)
            power = mine.optimum.points.leakage_power[0, 0], theirs.optimum.points.leakage_power[0, 0]
            assert power[1] * k == near(power[0], rel=1e-6)


@few
@given(plain("a"), plain("b"), factor(0.3, 3.0))
def test_time_capacitances_transits_and_periods_together(a: Any, b: Any, k: float):
    """Energies x k, powers and the verdict against an unchanged power-density cap unchanged."""
    change = {"input_capacitance": k, "closing_delay": k, "opening_delay": k}
    options = {"timing": "clocked", "accounting": "period"}
    found = []
    for x, y, f in ((a, b, 1.0), (scaled(a, **change), scaled(b, **change), k)):
        values = {**WIRED["values"], "clock_frequency": v(number(100.0 / f), "kHz")}
        inputs = two(x, y, **options, values=values, line=lines(0.0, 0.2 * f, 20.0 * f))
        inputs.study["requirements"] = {
            "deadline": {"limit": "cycle", "kind": "hard"},
            "power_density": {"limit": {"value": D("100.0"), "unit": "W/cm^2"}, "kind": "hard"},
        }
        found.append(compare(load(inputs)))
    one, other = found
    assert list(other.candidate.found) == list(one.candidate.found)
    if one.candidate.found[0] and one.strongest[0] >= 0:
        assert other.advantage[0] == near(one.advantage[0], rel=EXACT)
        assert other.candidate.energy[0] == near(k * one.candidate.energy[0], rel=EXACT)
        before, after = one.candidate.optimum.points, other.candidate.optimum.points
        assert after.leakage_power[0, 0] == near(before.leakage_power[0, 0], rel=EXACT)
        assert after.power_density[0, 0] == near(before.power_density[0, 0], rel=EXACT)


@few
@given(transistor("a"), transistor("b"), factor(0.3, 3.0))
def test_all_capacitances_of_both_sides_cancel_without_transit(a: Any, b: Any, k: float):
    """Self-timed, minimum energy: advantage and supplies unchanged, energies x k."""
    change = {"gate_capacitance_total": k, "terminal_capacitance_per_width": k}
    one = compare(load(two(a, b, **WIRED, line=lines(0.0, 0.2, 20.0))))
    other = compare(load(two(scaled(a, **change), scaled(b, **change), **WIRED, line=lines(0.0, 0.2 * k, 20.0 * k))))
    assert other.advantage[0] == near(one.advantage[0], rel=EXACT)
    assert other.candidate.supply[0] == near(one.candidate.supply[0], rel=1e-6)
    assert other.candidate.energy[0] == near(k * one.candidate.energy[0], rel=EXACT)


@few
@given(transistor("a"), transistor("b"), factor(0.3, 3.0))
def test_width_of_one_side_divides_or_multiplies_the_advantage(a: Any, b: Any, k: float):
    base = two(a, b)
    one = compare(load(base))
    for widened, expected in (("candidate", 1 / k), ("contender", k)):
        inputs = copy.deepcopy(base)
        knobs = inputs.study["candidate"] if widened == "candidate" else inputs.study["contender"][0]
        knobs["knobs"]["size"] = {"values": [number(k)]}
        other = compare(load(inputs))
        assert other.advantage[0] == near(expected * one.advantage[0], rel=EXACT)
        # the supply of a flat optimum is known to the resolution of the search only
        assert other.candidate.time[0] == near(one.candidate.time[0], rel=1e-5)
    wide = copy.deepcopy(base)
    wide.study["candidate"]["knobs"]["size"] = {"values": [number(k)]}
    before, after = (compare(load(x)).candidate.optimum.points for x in (base, wide))
    assert after.leakage_power[0, 0] == near(k * before.leakage_power[0, 0], rel=1e-5)
    assert after.area[0, 0] == near(k * before.area[0, 0], rel=EXACT)


@few
@given(plain("a"), factor(1.1, 2.0))
def test_wider_devices_on_a_wire_tend_to_the_unloaded_delay(a: Any, k: float):
    inputs = two(a, cmp.given("b"), values={"average_net_length": v(D("50.0"), "um")}, line=lines(0.0, 0.2, 0.0))
    problem = comparison(load(inputs)).candidate.problem
    bare = comparison(load(two(a, cmp.given("b")))).candidate.problem
    supply = np.array([[0.5]])
    times = [design_points(problem, supply, size).time[0, 0] for size in (1.0, k, k * k, 1e9)]
    assert all(later < sooner for sooner, later in itertools.pairwise(times))
    assert times[-1] == near(design_points(bare, supply).time[0, 0], rel=1e-5)


@few
@given(plain("a"), factor(0.5, 2.0))
def test_fixed_resistance_supply_times_k(a: Any, k: float):
    problem = comparison(load(two(a, cmp.given("b")))).candidate.problem
    one, other = (design_points(problem, np.array([[0.4 * f]])) for f in (1.0, k))
    assert other.time[0, 0] == near(one.time[0, 0], rel=EXACT)
    assert other.leakage_power[0, 0] == near(k * k * one.leakage_power[0, 0], rel=EXACT)
    assert other.energy_parts["input"][0, 0] == near(k * k * one.energy_parts["input"][0, 0], rel=EXACT)


@few
@given(column("a"), factor(0.5, 2.0))
def test_coefficient_over_k_and_supply_times_k(a: Any, k: float):
    one, other = (
        design_points(comparison(load(two(item, cmp.given("b")))).candidate.problem, np.array([[0.2 * f]]))
        for item, f in ((a, 1.0), (scaled(a, actuator_coefficient=1 / k), k))
    )
    assert other.time[0, 0] == near(one.time[0, 0], rel=EXACT)
    assert other.energy_parts["input"][0, 0] == near(k * k * one.energy_parts["input"][0, 0], rel=EXACT)
    share = [p.energy_parts["leakage"][0, 0] / p.energy_parts["input"][0, 0] for p in (one, other)]
    assert share[1] == near(share[0], rel=EXACT)


@few
@given(transistor("a"), factor(0.6, 1.8))
def test_swing_times_k_moves_the_minimum_by_k_and_its_energy_by_k_squared(a: Any, k: float):
    found = []
    for item, f in ((a, 1.0), (scaled(a, subthreshold_swing=k, saturation_voltage=k, declared_supply=k), k)):
        low, high = RANGE["steep-swing"]
        inputs = study(side("a", low * f, high * f), [side("b", 0.3, 0.8)], [item, steep("b")], points=21, refine=1e-9)
        found.append(compare(load(inputs)).candidate)
    one, other = found
    assert other.energy[0] == near(k * k * one.energy[0], rel=EXACT)
    assert other.supply[0] == near(k * one.supply[0], rel=1e-6)
    shares = [c.optimum.points.energy_parts["leakage"][0, 0] / c.energy[0] for c in found]
    assert shares[1] == near(shares[0], rel=1e-5)


@few
@given(factor(40.0, 80.0), st.integers(-80, 80))
def test_a_threshold_shift_leaves_the_minimum_energy_of_an_exponential_drive(swing: float, shift: int):
    """No ceiling near: the minimum does not know the threshold; the delay does, by 10^(dV/S)."""
    item = steep("a", subthreshold_swing=swing, on_current=5.0e6, off_current=1.0e-5)
    found = []
    for knob in (0, shift):
        inputs = study(
            side("a", 0.1, 0.7, shifts=[knob]), [side("b", 0.3, 0.8)], [item, steep("b")], points=31, refine=1e-9
        )
        found.append(compare(load(inputs)).candidate)
    one, other = found
    assert other.energy[0] == near(one.energy[0], rel=1e-5)
    assert other.supply[0] == near(one.supply[0], rel=1e-3)
    assert other.time[0] / one.time[0] == near(10 ** (shift / swing), rel=5e-3)


@few
@given(switches("a"), st.integers(2, 50))
def test_more_alike_blocks_change_no_density_and_chains_add(a: Any, count: int):
    """random-logic with n times the gates: energy per operation and area x n, time and power density unchanged."""

    def block(gates: int) -> Any:
        values = {
            "gate_count": v(gates),
            "register_count": v(0),
            "average_net_length": v(D("2.0"), "um"),
        }
        item = copy.deepcopy(a)
        if "series_switches_max" in item["value"]:
            item["value"]["series_switches_max"]["value"] = D(4)
        inputs = two(item, cmp.given("b"), circuit="random-logic", values=values, line=lines(10.0, 0.2, 5.0))
        problem = comparison(load(inputs)).candidate.problem
        return design_points(problem, np.array([[0.3]]))

    one, many = block(100), block(100 * count)
    assert many.energy[0, 0] == near(count * one.energy[0, 0], rel=EXACT)
    assert many.leakage_power[0, 0] == near(count * one.leakage_power[0, 0], rel=EXACT)
    assert many.time[0, 0] == near(one.time[0, 0], rel=EXACT)
    assert many.power_density[0, 0] == near(one.power_density[0, 0], rel=EXACT)


@few
@given(plain("a", transit=False), st.integers(2, 9))
def test_fan_out_of_c_is_fan_out_one_of_f_times_c(a: Any, fan_out: int):
    many = two(a, cmp.given("b"), values={"fan_out": v(fan_out)})
    big = two(scaled(a, input_capacitance=fan_out), cmp.given("b"))
    one, other = (design_points(comparison(load(x)).candidate.problem, np.array([[0.5]])) for x in (many, big))
    assert one.time[0, 0] == near(other.time[0, 0], rel=EXACT)
    assert one.energy[0, 0] == near(other.energy[0, 0], rel=EXACT)


@few
@given(switches("a"), switches("b"), st.integers(2, 40))
def test_depth_multiplies_charges_and_delays_of_both_sides(a: Any, b: Any, depth: int):
    """Energy of n stages in place of one, at fixed points."""
    policy = {"primary": "declared-point"}
    one, many = (compare(load(two(a, b, policy=policy, values={"logic_depth": v(n)}))) for n in (1, depth))
    for mine, theirs in ((one.candidate, many.candidate), (one.contenders[0], many.contenders[0])):
        dynamic = [side.optimum.points.energy_parts["input"][0, 0] for side in (mine, theirs)]
        assert dynamic[1] == near(depth * dynamic[0], rel=EXACT)
        assert theirs.time[0] == near(depth * mine.time[0], rel=EXACT)
