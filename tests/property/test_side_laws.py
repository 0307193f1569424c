"""Copies, bias, gating, costs, caps and perfect terms of a side, over random sets (31, 37, 38, 40, 41, 45, 47, 48)."""

from __future__ import annotations

import copy
import itertools
from decimal import Decimal as D
from typing import Any

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

from benchmark.decide.gap import improvements
from benchmark.decide.trials import Trials
from benchmark.decide.verdict import WORDS
from tests import comparisons as cmp
from tests.comparisons import advantage, compare, load, number, side, study
from tests.near import near
from tests.profiles import costly
from tests.random_sets import RANGE, factor, lines, plain, published, side_of, switches, transistor, two
from tests.studies import Inputs, v

GO, CONDITIONAL, FAILED, NOT_BETTER, UNDECIDED = WORDS
few = costly(6)
CLOCKED: dict[str, Any] = {
    "timing": "clocked",
    "accounting": "period",
    "requirements": {"deadline": {"limit": "cycle", "kind": "hard"}},
}
MITIGATION = {"routing_overhead": "0.1", "repeated_share": "1.0", "area_share": "1.0", "body_factor": "0.1"}


def clock(megahertz: float, **more: Any) -> dict[str, Any]:
    return {"clock_frequency": v(number(megahertz), "MHz"), **more}


def idle_values(milliseconds: float) -> dict[str, Any]:
    return clock(1.0, idle_time=v(number(milliseconds), "ms"), active_cycles=v(100))


def with_choices(table: Any, copies: list[int] | None = None, biases: list[float] | None = None, **costs: float) -> Any:
    """A side that may be built as copies, or back-biased [V]."""
    found = copy.deepcopy(table)
    found["mitigation"] = {}
    stated = {**{name: D(text) for name, text in MITIGATION.items()}, **{k: number(x) for k, x in costs.items()}}
    if copies:
        found["knobs"]["copies"] = {"values": copies}
        found["mitigation"] |= {k: v(stated[k]) for k in ("routing_overhead", "repeated_share", "area_share")}
    if biases:
        found["knobs"]["back_bias"] = {"values": [number(bias) for bias in biases], "unit": "V"}
        found["mitigation"] |= {"body_factor": v(stated["body_factor"])}
        found["mitigation"] |= {"back_bias_power": v(number(costs.get("back_bias_power", 0.0)), "nW")}
    return found


def optimum(inputs: Inputs, which: str = "candidate") -> Any:
    outcome = compare(load(inputs))
    return outcome.candidate if which == "candidate" else outcome.contenders[0]


# -- 31: idle all the time -------------------------------------------------------------------------------------------


@few
@given(plain("a"), plain("b"))
def test_idle_nearly_all_the_time_the_ranking_is_that_of_standing_power(a: Any, b: Any):
    values = clock(1.0, idle_time=v(D("1.0e5"), "s"), active_cycles=v(1))
    inputs = two(a, b, idle="ungated", values=values, **CLOCKED | {"requirements": {}})
    inputs.study["policy"] = {"primary": "declared-point"}
    found = compare(load(inputs))
    power = [float(s.optimum.points.standing_power[0, 0]) for s in (found.contenders[0], found.candidate)]
    assert found.advantage[0] == near(power[0] / power[1], rel=1e-6)


# -- 37: cap on power density ----------------------------------------------------------------------------------------


@few
@given(switches("a"), switches("b"), factor(0.3, 3.0), factor(1e-3, 1.0))
def test_the_cap_binds_exactly_where_energy_over_area_and_cycle_reaches_it(a: Any, b: Any, k: float, megahertz: float):
    """Permitted up to f = cap A / E at a fixed point; a cap that does not bind changes nothing."""
    assume(k != 1.0)  # there rounding decides
    base = two(a, b, **CLOCKED | {"requirements": {}}, values=clock(megahertz))
    base.study["candidate"]["knobs"]["supply"] |= {"low": D("0.3"), "high": D("0.3")}
    free = compare(load(base))
    point = free.candidate.optimum.points
    lasts = max(1e-6 / megahertz, float(point.time[0, 0]))
    density = float(point.energy[0, 0]) / lasts / float(point.area[0, 0])
    assert float(point.power_density[0, 0]) == near(density, rel=1e-9)
    for cap, permitted in ((density * k, k >= 1.0), (density * 1e9, True)):
        capped = copy.deepcopy(base)
        limit = {"value": number(cap), "unit": "W/m^2"}
        capped.study["requirements"] = {"power_density": {"limit": limit, "kind": "hard"}}
        found = compare(load(capped))
        assert bool(found.candidate.found[0]) == permitted
        if permitted:
            assert found.candidate.energy[0] == free.candidate.energy[0]


# -- 38: one term perfect --------------------------------------------------------------------------------------------


@few
@given(plain("a"), plain("b"), factor(0.01, 1.0), factor(0.01, 5.0))
def test_a_perfect_term_gains_one_over_what_it_leaves(a: Any, b: Any, shifter: float, standing: float):
    """1 / (1 - share), at one design point."""
    costs = {"level_shifter_energy": v(number(shifter), "fJ"), "overhead_power": v(number(standing), "nW")}
    for metric in ("energy-per-operation", "time-per-operation"):
        sides = side("a", 0.5, 0.5, costs=costs), [side("b", 0.5, 0.5)], [a, b]
        inputs = study(*sides, policy={"primary": "declared-point", "metric": metric}, points=5)
        loaded = load(inputs)
        trials = Trials(loaded, loaded.pair(loaded.headline))
        point = compare(loaded).candidate.optimum.points
        parts = point.energy_parts if metric.startswith("energy") else point.time_parts
        share = {name: float(part[0, 0]) / sum(float(p[0, 0]) for p in parts.values()) for name, part in parts.items()}
        found = {item.name: item.advantage / float(trials.best.advantage[0]) for item in improvements(trials)}
        terms = (
            {
                "level shifters": "level_shifters",
                "standing overheads": "bias_and_overheads",
                "leakage and bias": "leakage",
            }
            if metric.startswith("energy")
            else {"transit": "transit"}
        )
        for term, part in terms.items():
            gain = 1.0 / (1.0 - share[part])
            assert found[term] == near(gain, rel=1e-9), term
        assert found["losses beyond charge"] == near(1.0, rel=1e-12)


# -- 40: neutral settings --------------------------------------------------------------------------------------------


@few
@given(switches("a"), switches("b"), factor(0.01, 2.0), factor(0.01, 1e3), st.sampled_from(["ungated", "gated"]))
def test_neutral_settings_are_the_study_without_them_bit_for_bit(
    a: Any, b: Any, cost: float, idle_ms: float, idle: str
):
    """One copy, no bias, no shifter, efficiency 1: whatever their costs. Residual 1: gating off."""
    rows = []
    for offered in (False, True):
        first, second = side_of(a), side_of(b)
        if offered:
            first = with_choices(first, [1], routing_overhead=cost, repeated_share=min(cost, 1.0), area_share=cost)
            if a["model"] == "steep-swing":
                biased = with_choices(first, None, [0.0], body_factor=0.2, back_bias_power=cost)
                first["knobs"] |= biased["knobs"]
                first["mitigation"] |= biased["mitigation"]
            first["overhead"]["level_shifter_delay"] = v(D("0.0"), "ns")
        off = {"residual_leakage": v(D("1.0")), "wake_energy_cycles": v(number(cost))}
        gated = offered and idle == "gated"
        for one in (first, second):
            if gated:
                one["gating"] = off
        options = CLOCKED | {
            "requirements": {},
            "idle": "gated" if gated else "ungated",
            "values": idle_values(idle_ms),
        }
        rows.append(compare(load(study(first, [second], [a, b], points=9, refine=1e-7, **options))))
    plain_, neutral = rows
    assert neutral.advantage[0] == plain_.advantage[0]
    for name in ("energy", "time", "area", "supply"):
        assert getattr(neutral.candidate, name)[0] == getattr(plain_.candidate, name)[0], name


# -- 41: copies without end ------------------------------------------------------------------------------------------


@few
@given(transistor("a"), factor(30.0, 300.0))
def test_free_copies_without_end_end_at_the_lowest_supply(a: Any, megahertz: float):
    """C V^2 at the lowest supply and what one block leaks there; repeated leakage keeps their number finite."""
    low = RANGE["steep-swing"][0]

    def best(copies: list[int], share: float) -> Any:
        first = with_choices(side_of(a), copies, routing_overhead=0.0, repeated_share=share, area_share=0.0)
        sides = first, [side("b", 0.25, 0.8)], [a, cmp.given("b")]
        return optimum(study(*sides, points=17, refine=1e-7, values=clock(megahertz), **CLOCKED))

    many = [best([2**n], 0.0) for n in (0, 4, 8, 30)]
    energies = [float(found.energy[0]) for found in many if found.found[0]]
    assert all(later <= sooner * (1.0 + 1e-7) for sooner, later in itertools.pairwise(energies))
    point = many[-1].optimum.points
    floor = sum(float(part[0, 0]) for part in point.dynamic_parts.values())
    assert many[-1].optimum.at_lower[0]
    assert float(many[-1].supply[0]) == near(low, rel=1e-9)
    leaked = float(point.leakage_power[0, 0]) * 1e-6 / megahertz
    assert energies[-1] == near(floor + leaked, rel=1e-9)
    repeated = best([2**n for n in range(0, 31, 3)], 1.0)
    assert repeated.optimum.points.copies < 2**30  # leakage of all copies keeps their number finite


# -- 45: costs and demands on the new side ---------------------------------------------------------------------------


@few
@given(switches("a"), switches("b"), factor(1.1, 20.0))
def test_more_area_never_helps_the_new_side(a: Any, b: Any, k: float):
    """As a cost it counts in full; through wires in gate pitches it costs energy."""
    larger = copy.deepcopy(a)
    larger["value"]["footprint"]["value"] = number(float(a["value"]["footprint"]["value"]) * k)
    by_area = [advantage(two(item, b, policy={"primary": "declared-point", "metric": "area"})) for item in (a, larger)]
    assert by_area[1] == near(by_area[0] / k, rel=1e-12)
    pitches = {"gate_count": v(100), "register_count": v(0), "average_net_pitches": v(D("3.0"))}
    found = []
    for item in (a, larger):
        for one in (item, b):
            if "series_switches_max" in one["value"]:
                one["value"]["series_switches_max"]["value"] = D(4)
        found.append(advantage(two(item, b, circuit="random-logic", values=pitches, line=lines(10.0, 0.2, 5.0))))
    assert found[1] < found[0]


@few
@given(plain("a"), plain("b"), factor(1e-3, 1e3), factor(1.1, 100.0))
def test_a_longer_life_never_turns_a_no_go_into_a_go(a: Any, b: Any, margin: float, k: float):
    words = []
    for years in (5.0, 5.0 * k):
        item = copy.deepcopy(a)
        demanded = 1e6 * 5.0 * 3.15576e7
        item["value"]["endurance_cycles"] = v(number(demanded * margin), "1", unusual=True)
        rival = copy.deepcopy(b)
        rival["value"]["endurance_cycles"] = v(D("1.0e30"), "1", unusual=True)
        values = clock(1.0, busiest_activity=v(D("1.0")), duty=v(D("1.0")))
        requirements = {"endurance": {"life": {"value": number(years), "unit": "year"}, "kind": "hard"}}
        options = CLOCKED | {"requirements": requirements}
        words.append(cmp.verdict(published(two(item, rival, values=values, **options))).word)
    assert not (words[0].startswith("no-go") and words[1] in (GO, CONDITIONAL))
    assert (words[0] == FAILED) == (margin < 1.0)
    assert (words[1] == FAILED) == (margin < k)


# -- 47 and 48: limits and choices -----------------------------------------------------------------------------------


@few
@given(switches("a"), factor(1.0, 30.0), factor(1.0, 30.0))
def test_a_relaxed_limit_never_costs_a_side_anything(a: Any, k: float, room: float):
    base = two(a, cmp.given("b"), values=clock(1.0), **CLOCKED | {"requirements": {}})
    point = optimum(base).optimum.points
    limits = {
        "deadline": (float(point.time[0, 0]) * 0.5 * room, "s"),
        "leakage_power": (float(point.leakage_power[0, 0]) * 0.7 * room, "W"),
        "power_density": (float(point.power_density[0, 0]) * 0.9 * room, "W/m^2"),
    }
    for name, (limit, unit) in limits.items():
        found = []
        for relaxed in (1.0, k):
            bound = copy.deepcopy(base)
            table = {"limit": {"value": number(limit * relaxed), "unit": unit}, "kind": "hard"}
            bound.study["requirements"] = {name: table}
            found.append(optimum(bound))
        tight, loose = found
        assert bool(loose.found[0]) >= bool(tight.found[0]), name
        if tight.found[0]:
            assert loose.optimum.value[0] <= tight.optimum.value[0] * (1.0 + 2e-7), name


@few
@given(transistor("a"), transistor("b"), factor(1.0, 300.0), st.sampled_from(["candidate", "contender"]))
def test_copies_bias_and_a_gate_never_weaken_the_side_that_may_use_them(a: Any, b: Any, megahertz: float, which: str):
    values = clock(megahertz, idle_time=v(D("1.0"), "ms"), active_cycles=v(1000))

    def best(change: Any, idle: str = "ungated", gate: Any = None) -> Any:
        sides = {"candidate": side_of(a), "contender": side_of(b)}
        sides[which] = change(sides[which])
        if idle == "gated":
            for name, table in sides.items():
                table["gating"] = gate if name == which else {
                    "residual_leakage": v(D("1.0")), "wake_energy_cycles": v(D("0.0"))
                }  # fmt: skip
        options = {"points": 9, "refine": 1e-7, "values": values, "idle": idle, **CLOCKED}
        return optimum(study(sides["candidate"], [sides["contender"]], [a, b], **options), which)

    base = best(lambda table: table)
    gate = {"residual_leakage": v(D("0.05")), "wake_energy_cycles": v(D("3.0"))}
    changed = {
        "copies": best(lambda table: with_choices(table, [1, 2, 4])),
        "bias": best(lambda table: with_choices(table, None, [-0.3, 0.0, 0.3], back_bias_power=0.01)),
        "gate": best(lambda table: table, "gated", gate),
    }
    for name, found in changed.items():
        assert bool(found.found[0]) >= bool(base.found[0]), name
        if base.found[0]:
            assert found.optimum.value[0] <= base.optimum.value[0] * (1.0 + 2e-7), name


@pytest.mark.parametrize("which", ["candidate", "contender"])
def test_a_choice_that_pays_is_taken(which: str):
    """The comparison above can fail to be empty: copies lower the energy of a fast clock."""
    item = cmp.steep("a")
    rows = []
    for copies in ([1], [1, 2, 4]):
        sides = {"candidate": side("a", 0.2, 0.9), "contender": side("b", 0.2, 0.9)}
        sides[which] = with_choices(sides[which], copies, routing_overhead=0.0)
        inputs = study(
            sides["candidate"],
            [sides["contender"]],
            [item, cmp.steep("b")],
            points=9,
            refine=1e-6,
            values=clock(400.0),
            **CLOCKED,
        )
        rows.append(float(np.asarray(optimum(inputs, which).energy)[0]))
    assert rows[1] < 0.9 * rows[0]
