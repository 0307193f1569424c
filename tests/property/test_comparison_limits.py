"""Laws of whole comparisons over random small technologies: limits, and what may only rise or fall.

Exact equality where a law is exact to rounding, else a relative 1e-9 or the stated resolution of the search.
"""

from __future__ import annotations

import copy
from decimal import Decimal as D
from typing import Any

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from benchmark.decide.verdict import WORDS
from benchmark.evaluate.points import design_points
from tests import comparisons as cmp
from tests.comparisons import advantage, compare, comparison, load, number, planar, side, steep, study
from tests.near import near
from tests.profiles import costly
from tests.random_sets import (
    EXACT,
    column,
    factor,
    plain,
    published,
    scaled,
    side_of,
    switches,
    transistor,
    two,
    with_policy,
)
from tests.studies import v

GO, CONDITIONAL, FAILED, NOT_BETTER, UNDECIDED = WORDS
few = costly(6)


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
    assert at(wake=k) <= base  # a block is gated where that pays: a dear one may stay on


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
