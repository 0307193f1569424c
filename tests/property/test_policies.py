"""Laws of whole comparisons over random small technologies: identities, frontiers, sums, fairness.

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
from tests.random_sets import (
    POLICIES,
    RANGE,
    factor,
    lines,
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
