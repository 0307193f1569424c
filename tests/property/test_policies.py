"""Laws of whole comparisons over random small technologies: identities, scalings, limits, orders, frontiers.

Exact equality where a law is exact to rounding, else a relative 1e-9 or the stated resolution of the search.
"""

from __future__ import annotations

import copy
import dataclasses
import itertools
from decimal import Decimal as D
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from benchmark.decide.verdict import WORDS
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.points import cycles_demanded, design_points
from tests import comparisons as cmp
from tests.comparisons import advantage, compare, comparison, load, moved, number, planar, pressed, side, steep, study
from tests.near import near
from tests.profiles import costly
from tests.studies import Inputs, v

GO, CONDITIONAL, FAILED, NOT_BETTER, UNDECIDED = WORDS
few = costly()
EXACT = 1e-9


def factor(low: float, high: float) -> st.SearchStrategy[float]:
    """A factor, even on a log scale."""
    return st.floats(np.log(low), np.log(high)).map(lambda x: float(f"{np.exp(x):.6g}"))


@st.composite
def plain(draw: Any, name: str, transit: bool = True) -> Any:
    """A switch stated directly."""
    on = draw(factor(1.0, 200.0))
    delay = draw(factor(1e-3, 1.0)) if transit else 0.0
    return cmp.given(
        name,
        on_resistance=on,
        off_resistance=on * 1e-3 * draw(factor(1e3, 1e9)),
        input_capacitance=draw(factor(0.02, 2.0)),
        switching_level=round(draw(st.floats(0.3, 0.8)), 3),
        closing_delay=delay,
        opening_delay=delay,
        footprint=draw(factor(0.01, 1.0)),
    )


@st.composite
def transistor(draw: Any, name: str) -> Any:
    """A transistor with swing, ceiling and floor."""
    return steep(
        name,
        subthreshold_swing=draw(factor(35.0, 90.0)),
        on_current=draw(factor(50.0, 500.0)),
        off_current=draw(factor(1e-3, 1.0)),
        gate_capacitance_total=draw(factor(0.3, 2.0)),
        drain_capacitance_share=round(draw(st.floats(0.0, 0.5)), 2),
    )


@st.composite
def column(draw: Any, name: str) -> Any:
    """A stress-gated switch."""
    return pressed(
        name,
        actuator_coefficient=draw(factor(200.0, 500.0)),
        resistance_slope=draw(factor(1.5, 2.5)),
        stack_thickness=draw(factor(40.0, 100.0)),
        input_capacitance=draw(factor(0.02, 0.2)),
        breakdown_field=20.0,
    )


RANGE = {"given": (0.25, 0.8), "steep-swing": (0.12, 0.9), "stress-gated": (0.08, 0.38), "virtual-source": (0.3, 1.1)}


def side_of(technology: Any, **more: Any) -> Any:
    """A side over the usual supplies of the model."""
    return side(technology["id"], *RANGE[technology["model"]], **more)


def two(first: Any, second: Any, **options: Any) -> Inputs:
    """Compare two technologies."""
    return study(side_of(first), [side_of(second)], [first, second], **{"points": 9, "refine": 1e-7} | options)


def switches(name: str) -> st.SearchStrategy[Any]:
    """Any of three models."""
    return st.one_of(plain(name), transistor(name), column(name))


POLICIES: dict[str, dict[str, Any]] = {
    "declared-point": {},
    "minimum-energy": {},
    "minimum-energy-delay": {"exponent": D("1.0")},
    "iso-delay": {"required_time": v(D("1.0"), "us")},
    "iso-energy": {"required_energy": v(D("1.0"), "pJ")},
}


def with_policy(inputs: Inputs, name: str) -> Inputs:
    """The same study under another policy; limits that any side meets."""
    inputs.study["policy"] = {"primary": name, **POLICIES[name]}
    if name == "iso-energy":
        inputs.study["policy"]["metric"] = "time-per-operation"
    return inputs


def published(inputs: Inputs) -> Inputs:
    """Say that every number is published."""
    for data in (inputs.study, *inputs.sets.values()):
        data["default"]["evidence"] = "published"
    inputs.study["demonstration"] = False
    return inputs


# -- identities (3 to 6) -------------------------------------------------------------------------------------------


@pytest.mark.parametrize("policy", POLICIES)
@pytest.mark.parametrize("make", [cmp.given, steep, pressed, planar])
def test_a_technology_against_itself_is_exactly_one_in_every_row(make: Any, policy: str):
    item = make("a")
    inputs = study(
        side_of(item),
        [side_of(item, id="self-comparison")],
        [item],
        points=9,
        refine=1e-5,
        line=("20.0", "0.2", "10.0"),
        values={"average_net_length": v(D("2.0"), "um")},
        short_circuit="estimated",
        rule="chain",
    )
    loaded = load(with_policy(inputs, policy))
    keys = sorted(loaded.candidate.technology.values)
    moves = []
    for key in keys:
        best = float(loaded.candidate.technology.values[key].si[0])
        if key not in ("reference_temperature", "declared_supply", "series_switches_max") and best != 0.0:
            moves.append((f"a.{key}", best, best * 1.01))
    activity = float(loaded.values["activity"].si[0])
    rows = compare(loaded, policy, Batch.one_at_a_time([*moves, ("study.activity", activity, 2 * activity)])).advantage
    assert rows[0] == 1.0
    assert rows[-1] == 1.0
    assert np.all(rows[np.isfinite(rows)] == 1.0)


@few
@given(switches("a"), st.sampled_from(sorted(POLICIES)), factor(1.0001, 100.0))
def test_a_technology_against_itself_is_never_go_for_m_above_one(item: Any, policy: str, required: float):
    inputs = study(
        side_of(item), [side_of(item, id="self-comparison")], [item], required=required, points=7, refine=1e-4
    )
    assert cmp.verdict(with_policy(published(inputs), policy)).word == NOT_BETTER


@few
@given(switches("a"), switches("b"), st.sampled_from(sorted(POLICIES)))
def test_swapped_sides_give_the_reciprocal_and_the_opposite_word(first: Any, second: Any, policy: str):
    there = with_policy(published(two(first, second, required=1.0)), policy)
    back = with_policy(published(two(second, first, required=1.0)), policy)
    one, other = cmp.verdict(there), cmp.verdict(back)
    assert abs(one.advantage * other.advantage - 1.0) <= np.finfo(float).eps
    if one.advantage != 1.0:
        assert {one.word, other.word} == {GO, NOT_BETTER}


@few
@given(switches("a"), switches("b"), switches("c"), st.sampled_from(sorted(POLICIES)))
def test_advantages_multiply_along_a_chain(a: Any, b: Any, c: Any, policy: str):
    ab, bc, ac = (advantage(with_policy(two(x, y), policy)) for x, y in ((a, b), (b, c), (a, c)))
    assert ac == near(ab * bc, rel=1e-12)


@few
@given(switches("a"), switches("b"), switches("c"), st.sampled_from(sorted(POLICIES)))
def test_a_third_technology_changes_no_pairwise_number(a: Any, b: Any, c: Any, policy: str):
    pair = load(with_policy(two(a, b), policy))
    three = two(a, b)
    three.study["contender"].insert(0, side_of(c))
    three.sets["technologies/c"] = c
    triple = load(with_policy(three, policy))
    best = float(pair.values["activity"].si[0])
    batch = Batch.one_at_a_time([("study.activity", best, best * 3), ("a.footprint", 1e-14, 2e-14)])
    alone, together = compare(pair, None, batch), compare(triple, None, batch)
    assert together.advantage_over(1) == alone.advantage_over(0) == alone.advantage[0]
    assert np.array_equal(together.candidate.metric, alone.candidate.metric)
    assert np.array_equal(together.contenders[1].metric, alone.contenders[0].metric)
    # the strongest reference is the one that leaves the least advantage
    assert together.advantage[0] == min(together.advantage_over(0), together.advantage_over(1))


# -- scaling laws (11 to 20, 22 to 26) -----------------------------------------------------------------------------


def scaled(technology: Any, **factors: float) -> Any:
    """The technology with some values multiplied."""
    item = copy.deepcopy(technology)
    for name, k in factors.items():
        table = item["value"][name]
        table["value"] = number(float(table["value"]) * k)
    return item


WIRED: dict[str, Any] = {"values": {"average_net_length": v(D("5.0"), "um")}}


def lines(resistance: float, capacitance: float, pin: float) -> tuple[str, str, str]:
    return repr(resistance), repr(capacitance), repr(pin)


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
def test_the_same_normalisation_of_both_sides_cancels(a: Any, b: Any, depth: int):
    """Energy of n stages in place of one: depth multiplies both sides at fixed points."""
    policy = {"primary": "declared-point"}
    one, many = (compare(load(two(a, b, policy=policy, values={"logic_depth": v(n)}))) for n in (1, depth))
    for mine, theirs in ((one.candidate, many.candidate), (one.contenders[0], many.contenders[0])):
        dynamic = [side.optimum.points.energy_parts["input"][0, 0] for side in (mine, theirs)]
        assert dynamic[1] == near(depth * dynamic[0], rel=EXACT)
        assert theirs.time[0] == near(depth * mine.time[0], rel=EXACT)


# -- limits (27 to 35) ---------------------------------------------------------------------------------------------


@few
@given(plain("a"), plain("b"))
def test_an_infinite_on_off_ratio_leaves_the_dynamic_energy(a: Any, b: Any):
    tight = scaled(a, off_resistance=1.0)
    tight["value"]["off_resistance"]["value"] = D("1.0e15")
    options: dict[str, Any] = {"timing": "clocked", "accounting": "period", "idle": "ungated"}
    found = []
    for idle, depth in (("0.001", 5), ("100.0", 5), ("0.001", 20)):
        values = {
            "clock_frequency": v(D("1.0"), "MHz"),
            "idle_time": v(D(idle), "s"),
            "active_cycles": v(1000),
            "logic_depth": v(depth),
        }
        found.append(compare(load(two(tight, b, **options, values=values))).candidate)
    dynamic = found[0].optimum.points.energy_parts["input"][0, 0]
    assert found[0].energy[0] == near(dynamic, rel=1e-4)
    assert found[1].energy[0] == near(dynamic, rel=1e-2)
    assert found[2].energy[0] == near(4 * dynamic, rel=1e-4)


def test_an_on_off_ratio_of_one_fails_the_noise_margin_and_is_never_go():
    for ratio in (1.0001, 1.01, 2.0, 5.0):
        weak = cmp.given("a", on_resistance=20.0, off_resistance=20e-3 * ratio, input_capacitance=0.002)
        inputs = two(
            weak,
            cmp.given("b"),
            requirements={"noise_margin": {"limit": {"value": D("0.05"), "unit": "1"}, "kind": "hard", "fan_in": 1}},
            required=1.0,
        )
        found = cmp.verdict(published(inputs))
        assert found.word == FAILED
        assert "requirement noise_margin failed" in found.reasons[0]


@few
@given(plain("a"), plain("b"))
def test_leakage_of_a_dead_clock_leaves_the_ratio_of_leakages(a: Any, b: Any):
    """Activity -> 0 at a fixed cycle: the advantage tends to the ratio of leakage powers; large: to that of C V^2."""
    options: dict[str, Any] = {"timing": "clocked", "accounting": "period"}
    policy = {"primary": "declared-point"}

    def at(activity: str, clock: str, first: Any, second: Any) -> Any:
        values = {"clock_frequency": v(D(clock), "kHz"), "activity": v(D(activity), unusual=True)}
        return compare(load(two(first, second, **options, policy=policy, values=values)))

    quiet = at("1.0e-9", "1.0", a, b)
    leak = [side.optimum.points.leakage_power[0, 0] for side in (quiet.contenders[0], quiet.candidate)]
    assert quiet.advantage[0] == near(leak[0] / leak[1], rel=1e-2)
    tight = [copy.deepcopy(item) for item in (a, b)]
    for item in tight:
        item["value"]["off_resistance"]["value"] = D("1.0e13")
    busy = at("1.0", "1000.0", *tight)
    charge = [side.optimum.points.energy_parts["input"][0, 0] for side in (busy.contenders[0], busy.candidate)]
    assert busy.advantage[0] == near(charge[0] / charge[1], rel=1e-4)


@few
@given(plain("b"))
def test_a_leakage_free_switch_gains_as_one_over_the_activity(b: Any):
    free = cmp.given("a", options={"off_state": "none"}, off_resistance=None, closing_delay=1.0)
    options: dict[str, Any] = {"timing": "clocked", "accounting": "period", "policy": {"primary": "declared-point"}}
    products = []
    for activity in ("1.0e-7", "1.0e-8"):
        values = {"clock_frequency": v(D("1.0"), "kHz"), "activity": v(D(activity), unusual=True)}
        products.append(advantage(two(free, b, **options, values=values)) * float(activity))
    assert products[1] == near(products[0], rel=0.2)
    assert products[0] > 0.0
    # idle most of the time: the leakage-free switch wins whatever its delay, deadline permitting
    values = {
        "clock_frequency": v(D("1.0"), "kHz"),
        "idle_time": v(D("1.0e5"), "s"),
        "active_cycles": v(1),
    }
    assert advantage(two(free, b, **options, idle="ungated", values=values)) > 1.0


@few
@given(plain("a"), plain("b"), factor(0.3, 0.8), factor(0.3, 0.8))
def test_a_very_long_wire_leaves_only_the_supplies(a: Any, b: Any, first: float, second: float):
    a["value"]["declared_supply"]["value"], b["value"]["declared_supply"]["value"] = number(first), number(second)
    for resistance in ("0.0", "100.0"):
        values = {"average_net_length": v(D("1.0e6"), "um", unusual=True), "activity": v(D("0.5"))}
        inputs = study(
            side("a", 0.2, 0.9),
            [side("b", 0.2, 0.9)],
            [scaled(a, off_resistance=1e6), scaled(b, off_resistance=1e6)],
            policy={"primary": "declared-point", "metric": "energy-per-operation"},
            values=values,
            line=(resistance, "0.2", "0.0"),
        )
        found = compare(load(inputs))
        assert found.advantage[0] == near((second / first) ** 2, rel=1e-2)
        times = found.contenders[0].time[0] / found.candidate.time[0]
        on = [float(item["value"]["on_resistance"]["value"]) for item in (b, a)]
        expected = 1.0 if resistance != "0.0" else on[0] / on[1]
        assert times == near(expected, rel=5e-2)


@few
@given(plain("a"))
def test_fan_out_transit_and_resistance_limits(a: Any):
    """Fan-out -> infinity: t/F -> kappa R C, E/F -> C V^2. Transit -> 0: pure R C. R -> 0: t -> transit."""
    supply = np.array([[0.5]])
    r, c = float(a["value"]["on_resistance"]["value"]) * 1e3, float(a["value"]["input_capacitance"]["value"]) * 2e-15

    def at(item: Any, **values: Any) -> Any:
        return design_points(comparison(load(two(item, cmp.given("b"), values=values))).candidate.problem, supply)

    many = at(a, fan_out=v(D("1.0e9"), unusual=True))
    assert many.time[0, 0] / 20 / 1e9 == near(np.log(2.0) * r * c, rel=1e-4)
    assert many.energy_parts["input"][0, 0] / 1e9 == near(20 * 0.05 * c * 0.25, rel=EXACT)
    quick = copy.deepcopy(a)
    for name in ("closing_delay", "opening_delay"):
        quick["value"][name]["value"] = D("0.0")
    assert at(quick).time[0, 0] == near(20 * np.log(2.0) * r * c, rel=EXACT)
    delay = float(a["value"]["closing_delay"]["value"]) * 1e-9
    strong = [at(scaled(a, on_resistance=k)).time[0, 0] for k in (1e-9, 1e-10)]
    assert strong[0] == near(20 * delay, rel=1e-4)
    assert strong[1] == near(strong[0], rel=1e-4)


# -- monotone relations (43 to 49) ---------------------------------------------------------------------------------


def test_raising_the_supply_speeds_up_until_the_current_saturates():
    problem = comparison(load(two(planar("a"), cmp.given("b")))).candidate.problem
    found = design_points(problem, np.linspace(0.45, 1.1, 14)[None, :])
    assert np.all(np.diff(found.time[0]) < 0.0)
    assert np.all(np.diff(found.energy_parts["input"][0]) > 0.0)
    saturated = steep("a", on_current=50.0, off_current=1.0, subthreshold_swing=35.0, saturation_voltage=20.0)
    problem = comparison(load(two(saturated, cmp.given("b")))).candidate.problem
    found = design_points(problem, np.array([[0.8, 0.9]]))
    assert found.time[0, 1] > found.time[0, 0]


@few
@given(transistor("a"), factor(1.2, 5.0))
def test_what_raises_the_share_of_leakage(a: Any, k: float):
    def share(item: Any, supply: float = 0.35, **options: Any) -> float:
        inputs = two(item, cmp.given("b"), **options)
        found = design_points(comparison(load(inputs)).candidate.problem, np.array([[supply]]))
        return float(found.energy_parts["leakage"][0, 0] / found.energy[0, 0])

    base = share(a)
    assert share(a, values={"logic_depth": v(round(20 * k))}) > base
    assert share(a, values={"activity": v(number(0.05 / k))}) > base
    hot = copy.deepcopy(a)
    hot["value"]["swing_temperature_coefficient"] = v(D("0.2"), "mV/decade/K")
    assert share(hot, temperatures=(75.0,)) > share(hot)


@few
@given(switches("a"), switches("b"), factor(1.1, 10.0))
def test_costs_on_the_new_side_never_help_it(a: Any, b: Any, k: float):
    options: dict[str, Any] = {
        "timing": "clocked",
        "accounting": "period",
        "idle": "gated",
        "values": {
            "clock_frequency": v(D("100.0"), "kHz"),
            "idle_time": v(D("0.01"), "s"),
            "active_cycles": v(100),
        },
        "requirements": {"deadline": {"limit": "cycle", "kind": "hard"}},
    }

    def at(residual: float = 0.05, wake: float = 1.0, guard: tuple[float, float] = (1.0, 1.0), **costs: Any) -> float:
        gates = [
            {"residual_leakage": v(number(share)), "wake_energy_cycles": v(number(energy))}
            for share, energy in ((residual, wake), (0.05, 1.0))
        ]
        inputs = study(
            side_of(a, gating=gates[0], costs=costs),
            [side_of(b, gating=gates[1])],
            [a, b],
            points=9,
            refine=1e-7,
            guard=guard,
            **options,
        )
        return advantage(inputs)

    base = at()
    assert at(level_shifter_energy=v(number(0.1 * k), "fJ")) < base
    assert at(level_shifter_delay=v(number(k), "ns")) <= base
    assert at(overhead_power=v(number(k), "nW")) < base
    assert at(supply_efficiency=v(number(1 / k))) < base
    assert at(residual=min(0.05 * k, 1.0)) <= base
    assert at(wake=k) < base


@few
@given(switches("a"), factor(1.1, 3.0))
def test_a_longer_deadline_never_costs_energy_under_operation_accounting(a: Any, k: float):
    def least(period: float, accounting: str) -> Any:
        values = {"clock_frequency": v(number(1.0 / period), "Hz")}
        requirements = {"deadline": {"limit": "cycle", "kind": "hard"}}
        inputs = two(
            a, cmp.given("b"), timing="clocked", accounting=accounting, values=values, requirements=requirements
        )
        return compare(load(inputs)).candidate

    longest = least(1e-3, "operation")
    for period in (5e-8, 2e-7, 1e-6):
        short, long = least(period, "operation"), least(k * period, "operation")
        if short.found[0]:
            assert long.found[0]
            assert long.energy[0] <= short.energy[0] * (1 + 2e-7)
            assert longest.energy[0] <= long.energy[0] * (1 + 2e-7)
        # period accounting, at one design: exactly the leakage power times the added time
        sooner, later = (least(p, "period") for p in (period, k * period))
        if sooner.found[0]:
            problem = comparison(
                load(
                    two(
                        a,
                        cmp.given("b"),
                        timing="clocked",
                        accounting="period",
                        values={"clock_frequency": v(number(1.0 / (k * period)), "Hz")},
                    )
                )
            ).candidate.problem
            same = design_points(problem, sooner.supply[:1, None])
            added = same.leakage_power[0, 0] * (k * period - period)
            assert same.energy[0, 0] - sooner.energy[0] == near(added, rel=1e-6, abs=1e-12 * sooner.energy[0])
            assert later.energy[0] <= same.energy[0, 0] * (1 + 2e-7)


@few
@given(transistor("a"), transistor("b"), column("c"), st.sampled_from(["minimum-energy", "minimum-energy-delay"]))
def test_a_further_flavour_knob_or_grid_point_never_weakens_a_side(a: Any, b: Any, c: Any, policy: str):
    base = with_policy(two(a, b), policy)
    inputs = copy.deepcopy(base)
    inputs.study["policy"].pop("exponent", None)
    first = compare(load(base))
    for change in ("flavour", "shift", "size", "range", "grid"):
        more = copy.deepcopy(base)
        rival = more.study["contender"][0]
        if change == "flavour":
            more.study["contender"].append(side_of(c))
            more.sets["technologies/c"] = c
        elif change == "shift":
            rival["knobs"]["threshold_shift"] = {"values": [D("0"), D("30"), D("-30")], "unit": "mV"}
        elif change == "size":
            rival["knobs"]["size"] = {"values": [D("1"), D("0.5"), D("2")]}
        elif change == "range":
            rival["knobs"]["supply"] |= {"low": D("0.1"), "high": D("0.95")}
        else:
            more.study["search"]["supply_points"] = 17
        found = compare(load(more))
        assert found.contenders[0].optimum.value[0] <= first.contenders[0].optimum.value[0] * (1 + 1e-9), change
        if policy == "minimum-energy":
            assert found.advantage[0] <= first.advantage[0] * (1 + 1e-9), change
        # the same for the new side
        if change in ("shift", "size", "range"):
            mirror = copy.deepcopy(base)
            mirror.study["candidate"]["knobs"] = copy.deepcopy(rival["knobs"])
            own = compare(load(mirror)).candidate.optimum
            assert own.value[0] <= first.candidate.optimum.value[0] * (1 + 1e-9), change


@few
@given(column("a"), factor(1.05, 2.0))
def test_a_better_coefficient_never_hurts_when_the_supply_is_chosen_again(a: Any, k: float):
    for policy in ("minimum-energy", "minimum-energy-delay", "iso-delay"):
        one, other = (
            compare(load(with_policy(two(item, cmp.given("b")), policy))).candidate.optimum
            for item in (a, scaled(a, actuator_coefficient=k))
        )
        at_lower = bool(other.at_lower[0])  # the range ends before the better one has used its coefficient
        assert other.value[0] <= one.value[0] * (1 + 1e-6) or at_lower
    # at a fixed supply nothing is gained for free: the field limit does not move with the coefficient
    problems = [
        comparison(load(two(item, cmp.given("b")))).candidate.problem for item in (a, scaled(a, actuator_coefficient=k))
    ]
    fields = [design_points(p, np.array([[0.38]])).margins["actuator field"][0, 0] for p in problems]
    assert fields[0] == fields[1]


@few
@given(transistor("a"), transistor("b"), factor(0.5, 5.0), factor(1.1, 10.0))
def test_a_larger_m_never_turns_a_no_go_into_a_go(a: Any, b: Any, required: float, k: float):
    words = [cmp.verdict(published(two(a, b, required=m))).word for m in (required, required * k)]
    assert not (words[0].startswith("no-go") and words[1] in (GO, CONDITIONAL))


@few
@given(switches("a"), switches("b"))
def test_a_requirement_on_the_new_side_never_turns_a_no_go_into_a_go(a: Any, b: Any):
    """One that the reference meets anyhow; one that only the reference misses may well help the new side."""
    base = published(two(a, b, required=1.0))
    first = compare(load(base))
    word = cmp.verdict(base).word
    rival = first.contenders[0].optimum.points
    limits = {
        "deadline": (float(first.contenders[0].time[0]) * (1 + 1e-9), "s"),
        "leakage_power": (float(rival.leakage_power[0, 0]) * (1 + 1e-9), "W"),
        "power_density": (float(rival.power_density[0, 0]) * (1 + 1e-9), "W/m^2"),
    }
    for name, (limit, unit) in limits.items():
        more = copy.deepcopy(base)
        more.study["requirements"] = {name: {"limit": {"value": number(limit), "unit": unit}, "kind": "hard"}}
        found = cmp.verdict(more)
        assert not (word.startswith("no-go") and found.word in (GO, CONDITIONAL)), name
        if np.isfinite(found.advantage):
            assert found.advantage <= first.advantage[0] * (1 + 1e-6)


# -- frontiers (51 to 57) ------------------------------------------------------------------------------------------


def envelope(loaded: Any, count: int = 400) -> tuple[Any, Any, Any]:
    problem = comparison(loaded).candidate.problem
    low, high = problem.side.supply
    dense = design_points(problem, np.linspace(low, high, count)[None, :])
    return dense.time[0][dense.able[0]], dense.energy[0][dense.able[0]], problem


@few
@given(switches("a"), factor(1.5, 30.0))
def test_policies_lie_on_one_frontier(a: Any, k: float):
    """E_minE <= E(min E T^m), E rising and T falling in m; iso-delay at T(min E T) returns E(min E T)."""
    inputs = with_policy(two(a, cmp.given("b"), points=41, refine=1e-9), "minimum-energy-delay")
    loaded = load(inputs)
    times, energies, _ = envelope(loaded)
    found = []
    for m in (0.5, 1.0, 2.0):
        loaded_m = dataclasses.replace(loaded, policy=dataclasses.replace(loaded.policy, exponent=m))
        found.append(compare(loaded_m).candidate)
    least = compare(loaded, "minimum-energy").candidate
    series = [least, *found]
    for before, after in itertools.pairwise(series):
        assert after.energy[0] >= before.energy[0] * (1 - 1e-7)
        assert after.time[0] <= before.time[0] * (1 + 1e-7)
    for point in series:  # nothing on the dense curve is better in both
        dominated = (times < point.time[0] * (1 - 1e-6)) & (energies < point.energy[0] * (1 - 1e-6))
        assert not dominated.any()

    def iso(name: str, value: float) -> Any:
        kind = {"iso-delay": "required_time", "iso-energy": "required_energy"}[name]
        policy = dataclasses.replace(loaded.policy, **{kind: value})
        return compare(dataclasses.replace(loaded, policy=policy), name).candidate

    middle = found[1]
    again = iso("iso-delay", float(middle.time[0]))
    assert again.energy[0] == near(middle.energy[0], rel=1e-6)
    # iso-energy inverts iso-delay where the frontier falls strictly
    slower = iso("iso-delay", float(middle.time[0]) * k)
    assert slower.energy[0] <= again.energy[0] * (1 + 1e-9)
    inverse = iso("iso-energy", float(slower.energy[0]) * (1 + 1e-9))
    assert inverse.time[0] <= slower.time[0] * (1 + 1e-6)
    back = iso("iso-delay", float(inverse.time[0]) * (1 + 1e-9))
    assert back.energy[0] == near(slower.energy[0], rel=1e-6)


@few
@given(switches("a"), switches("b"))
def test_one_design_point_per_side_makes_all_policies_agree(a: Any, b: Any):
    def alone(technology: Any) -> Any:
        supply = float(technology["value"]["declared_supply"]["value"])
        return side(technology["id"], supply, supply)

    inputs = study(alone(a), [alone(b)], [a, b])
    found = [advantage(with_policy(copy.deepcopy(inputs), policy)) for policy in POLICIES if policy != "iso-energy"]
    assert len(set(found)) == 1


@few
@given(transistor("a"), factor(0.2, 0.9), factor(0.2, 1.0))
def test_a_dominated_technology_is_preferred_by_no_policy(a: Any, less: float, leak: float):
    """Less capacitance and less leakage at the same current: better in energy and time at every supply."""
    better = scaled(a, gate_capacitance_total=less, off_current=1.0)
    better["id"] = "better"
    for policy in POLICIES:
        assert advantage(with_policy(two(better, a), policy)) >= 1.0


@few
@given(switches("a"), st.lists(factor(0.2, 5.0), min_size=2, max_size=4), st.sampled_from(sorted(POLICIES)))
def test_the_strongest_reference_leaves_the_least_advantage(a: Any, costs: list[float], policy: str):
    rivals = [cmp.given(f"r{index}", input_capacitance=0.2 * cost) for index, cost in enumerate(costs)]
    inputs = study(side_of(a), [side_of(r) for r in rivals], [a, *rivals], points=7, refine=1e-6)
    found = compare(load(with_policy(inputs, policy)))
    listed = [found.advantage_over(index) for index in range(len(rivals))]
    assert found.advantage[0] == min(listed)
    assert found.strongest[0] == int(np.argmin(listed))
    assert found.strongest_side is not None
    assert found.strongest_side.id == f"r{int(np.argmin(listed))}"


# -- cycles, parts, grid (71, 72, 74) ------------------------------------------------------------------------------


@few
@given(plain("a"), factor(0.1, 10.0), factor(0.1, 1.0), factor(1e-4, 1.0), factor(0.5, 20.0))
def test_endurance_demanded_is_linear_in_each_factor(a: Any, clock: float, busiest: float, duty: float, years: float):
    values = {
        "clock_frequency": v(number(clock), "MHz"),
        "busiest_activity": v(number(busiest)),
        "duty": v(number(duty)),
    }
    requirements = {"endurance": {"life": {"value": number(years), "unit": "year"}, "kind": "report"}}
    inputs = two(a, cmp.given("b"), timing="clocked", values=values, requirements=requirements)
    loaded = load(inputs)
    problem = comparison(loaded).candidate.problem
    found = design_points(problem, np.array([[0.3, 0.7]]))
    demanded = cycles_demanded(problem, found, loaded.requirements["endurance"].life)
    expected = clock * 1e6 * max(busiest, 0.05) * duty * years * 3.15576e7
    assert np.allclose(demanded, expected, rtol=1e-12, atol=0.0)


@few
@given(switches("a"), st.sampled_from(["chain", "step"]), st.sampled_from(["estimated", "none"]))
def test_parts_add_up_to_the_totals(a: Any, rule: str, short: str):
    costs = {"supply_efficiency": v(D("0.7")), "level_shifter_energy": v(D("0.2"), "fJ")}
    inputs = study(
        side_of(a, costs=costs | {"level_shifter_delay": v(D("5.0"), "ps"), "overhead_power": v(D("1.0"), "nW")}),
        [side("b", 0.3, 0.7)],
        [a, cmp.given("b")],
        rule=rule,
        short_circuit=short,
        values={"average_net_length": v(D("3.0"), "um")},
        line=lines(20.0, 0.2, 10.0),
        temperatures=(0.0, 60.0),
    )
    problem = comparison(load(inputs)).candidate.problem
    found = design_points(problem, np.linspace(*RANGE[a["model"]], 5)[None, :])
    able = found.able
    assert able.any()
    assert np.allclose(sum(found.energy_parts.values())[able], found.energy[able], rtol=1e-12, atol=0.0)
    assert np.allclose(sum(found.time_parts.values())[able], found.time[able], rtol=1e-12, atol=0.0)


@few
@given(switches("a"), st.sampled_from(["minimum-energy", "minimum-energy-delay", "iso-delay"]))
def test_a_finer_grid_is_never_worse_and_changes_less_than_the_printed_tolerance(a: Any, policy: str):
    loaded = load(with_policy(two(a, cmp.given("b"), points=11, refine=1e-7), policy))
    values = [compare(dataclasses.replace(loaded, supply_points=n)).candidate.optimum.value[0] for n in (11, 21, 41)]
    assert values[1] <= values[0] * (1 + 2e-7)
    assert values[2] <= values[1] * (1 + 2e-7)
    assert values[2] == near(values[0], rel=1e-4)


# -- fairness ------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("accounting", ["period", "operation"])
def test_what_is_shared_reaches_both_sides(accounting: str):
    """Wires, layout parasitic, delay rule, guard-bands, temperatures, scenario: change one and both sides move."""
    base: dict[str, Any] = {
        "line": ("20.0", "0.2", "10.0"),
        "values": {"average_net_length": v(D("5.0"), "um"), "clock_frequency": v(D("10.0"), "MHz")},
        "timing": "clocked",
        "accounting": accounting,
        "policy": {"primary": "minimum-energy-delay", "exponent": D("1.0")},
        "temperatures": (25.0,),
    }

    def at(**change: Any) -> Any:
        options = copy.deepcopy(base)
        for key, item in change.items():
            options[key] = {**options[key], **item} if isinstance(options.get(key), dict) else item
        sets = [steep("a", subthreshold_swing=40.0), planar("b")]
        return compare(load(study(side("a", 0.15, 0.8), [side("b", 0.3, 1.1)], sets, points=9, refine=1e-6, **options)))

    first = at()
    changes: dict[str, dict[str, Any]] = {
        "wire resistance": {"line": ("2000.0", "0.2", "10.0")},
        "wire capacitance": {"line": ("20.0", "0.4", "10.0")},
        "layout": {"line": ("20.0", "0.2", "100.0")},
        "rule": {"rule": "chain"},
        "guard-band of delay": {"guard": (1.2, 1.0)},
        "guard-band of leakage": {"guard": (1.0, 100.0)},
        "short circuit": {"short_circuit": "estimated"},
        "net length": {"values": {"average_net_length": v(D("10.0"), "um")}},
        "activity": {"values": {"activity": v(D("0.3"))}},
        "fan-out": {"values": {"fan_out": v(3)}},
        "depth": {"values": {"logic_depth": v(40)}},
    }
    for name, change in changes.items():
        found = at(**change)
        for mine, theirs in ((first.candidate, found.candidate), (first.contenders[0], found.contenders[0])):
            assert theirs.optimum.value[0] != mine.optimum.value[0], (name, mine.id)
    # a clock only moves what leaks over its period
    slow = at(values={"clock_frequency": v(D("0.1"), "MHz")})
    for mine, theirs in ((first.candidate, slow.candidate), (first.contenders[0], slow.contenders[0])):
        assert (theirs.optimum.value[0] != mine.optimum.value[0]) == (accounting == "period")


@pytest.mark.parametrize(
    ("name", "limit"),
    [
        ("noise_margin", ("0.3", "1")),
        ("voltage_gain", ("12.0", "1")),
        ("thermal_noise", ("60.0", "1")),
        ("deadline", ("0.3", "ns")),
        ("leakage_power", ("1.0e-15", "W")),
        ("power_density", ("1.0e-3", "W/cm^2")),
    ],
)
def test_every_hard_requirement_binds_both_sides(name: str, limit: tuple[str, str]):
    sets = [steep("a"), steep("b", subthreshold_swing=60.0)]
    table = {"limit": {"value": D(limit[0]), "unit": limit[1]}, "kind": "hard"}
    free, bound = (
        compare(
            load(
                study(
                    side("a", 0.12, 0.9),
                    [side("b", 0.12, 0.9)],
                    sets,
                    points=9,
                    refine=1e-4,
                    requirements=wanted,
                    values={"activity": v(D("0.9"))},
                )
            )
        )
        for wanted in ({}, {name: table})
    )
    for mine, theirs in ((free.candidate, bound.candidate), (free.contenders[0], bound.contenders[0])):
        assert not theirs.found[0] or theirs.energy[0] > mine.energy[0], mine.id


def test_moving_one_value_of_a_side_leaves_the_other_untouched():
    loaded = load(two(steep("a"), planar("b")))
    first = compare(loaded)
    best = float(loaded.candidate.technology.values["on_current"].si[0])
    other = compare(moved(loaded, "a.on_current", best * 1.5))
    assert other.candidate.metric[0] != first.candidate.metric[0]
    assert other.contenders[0].metric[0] == first.contenders[0].metric[0]
