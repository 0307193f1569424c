"""Parallel copies, power gating and back bias: arithmetic, neutral settings bit for bit, limits, what they never do."""

from __future__ import annotations

import dataclasses
import itertools
from decimal import Decimal as D
from typing import Any

import numpy as np
import pytest

from benchmark.cli.trace_point import trace_point
from benchmark.decide.compare import Comparison
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.points import Points, design_points
from benchmark.sets.study import Choice, Study
from tests.comparisons import compare, comparison, given, load, moved, number, side, steep, study
from tests.near import near
from tests.studies import Table, v

CLOCK = {"clock_frequency": v(D("1.0"), "MHz")}
IDLE = {"idle_time": v(D("0.002"), "s"), "active_cycles": v(500)}
GATE = {"residual_leakage": v(D("0.05")), "wake_energy_cycles": v(D("3.0"))}
OVERHEAD = {"supply_efficiency": v(D("0.8")), "overhead_power": v(D("2.0"), "nW")}
DEADLINE = {"deadline": {"limit": "cycle", "kind": "hard"}}


def with_copies(name: str, low: Any, high: Any, copies: list[int], routing=0.1, repeated=1.0, area=1.0, **more: Any):
    """A side that may be built as parallel copies."""
    found = side(name, low, high, **more)
    found["knobs"]["copies"] = {"values": copies}
    costs = {"routing_overhead": routing, "repeated_share": repeated, "area_share": area}
    found.setdefault("mitigation", {}).update({key: v(number(value)) for key, value in costs.items()})
    return found


def with_bias(found: Table, volts: list[float], factor: Any = 0.1, power: Any = 0.5) -> Table:
    """Give a side back biases [V] with body factor [V/V] and standing power [nW]."""
    found["knobs"]["back_bias"] = {"values": [number(bias) for bias in volts], "unit": "V"}
    costs = {"body_factor": v(number(factor)), "back_bias_power": v(number(power), "nW")}
    found.setdefault("mitigation", {}).update(costs)
    return found


def loaded(first: Table, **options: Any) -> Study:
    """A clocked study of two like transistors; the candidate as given."""
    chosen = {"timing": "clocked", "accounting": "period", "values": CLOCK, "requirements": DEADLINE} | options
    gated = {"gating": GATE} if chosen.get("idle") == "gated" else {}
    return load(study(first, [side("b", 0.2, 0.9, **gated)], [steep("a"), steep("b")], **chosen))


def at(found: Study, supply: float, *choice: float) -> Points:
    """One design point of the candidate."""
    return design_points(comparison(found).candidate.problem, np.array([[supply]]), *choice)


def value(array: Any) -> float:
    return float(np.asarray(array).ravel()[0])


def same(one: Points, other: Points) -> bool:
    """Tell whether two sets of points have the same bits in every array."""
    names = ("time", "interval", "energy", "leakage_power", "standing_power", "idle_energy", "area", "power_density")
    return all(np.array_equal(getattr(one, name), getattr(other, name), equal_nan=True) for name in names)


# -- neutral settings -------------------------------------------------------------------------------------------


def test_one_copy_and_no_bias_are_the_study_without_them_bit_for_bit():
    offered = with_bias(with_copies("a", 0.2, 0.9, [1], 0.3, 0.7, 2.4, costs=OVERHEAD), [0.0], 0.2, 9.0)
    supplies = np.linspace(0.2, 0.9, 15)[None, :]
    found = [
        design_points(comparison(loaded(first)).candidate.problem, supplies, 1.0, 0.0, 1.0, 0.0)
        for first in (offered, side("a", 0.2, 0.9, costs=OVERHEAD))
    ]
    assert same(*found)
    assert set(found[0].energy_parts) == set(found[1].energy_parts)
    outcomes = [compare(loaded(first)) for first in (offered, side("a", 0.2, 0.9, costs=OVERHEAD))]
    assert outcomes[0].advantage[0] == outcomes[1].advantage[0]


def test_copies_that_repeat_and_add_nothing_change_no_energy():
    """Also overheads of further copies vanish here, for there are none."""
    first = with_copies("a", 0.2, 0.9, [4], 0.0, 0.0, 0.0)
    one, four = (at(loaded(first), 0.5, 1.0, 0.0, copies) for copies in (1.0, 4.0))
    for name in ("time", "energy", "leakage_power", "area"):
        assert value(getattr(four, name)) == value(getattr(one, name))
    assert value(four.interval) == value(one.time) / 4.0


def test_free_gate_with_residual_zero_is_no_leakage_while_idle():
    free = {"residual_leakage": v(D("0.0")), "wake_energy_cycles": v(D("0.0"))}
    sides = [side("a", 0.2, 0.9, gating=free), [side("b", 0.2, 0.9, gating=free)], [steep("a"), steep("b")]]
    found = load(study(*sides, timing="clocked", accounting="period", idle="gated", values=CLOCK | IDLE))
    point = at(found, 0.5)
    assert value(point.idle_energy) == 0.0
    assert bool(value(point.gated))


# -- arithmetic -------------------------------------------------------------------------------------------------


def test_arithmetic_of_copies():
    found = loaded(
        with_copies("a", 0.2, 0.9, [1, 3], 0.1, 0.5, 1.2, costs=OVERHEAD), idle="ungated", values=CLOCK | IDLE
    )
    one, three = (at(found, 0.4, 1.0, 0.0, copies) for copies in (1.0, 3.0))
    leak, dynamic = value(one.leakage_power), sum(value(part) for part in one.dynamic_parts.values())
    assert value(three.time) == value(one.time)  # one operation takes as long as before
    assert value(three.interval) == value(one.time) / 3.0
    assert value(three.leakage_power) == near(2.0 * leak, rel=1e-12)
    assert value(three.area) == near(3.4 * value(one.area), rel=1e-12)
    assert value(three.energy_parts["copies"]) == near(0.2 * dynamic, rel=1e-12)
    standing = 2.0 * leak + 3.0 * 2e-9
    core = 1.2 * dynamic + standing * (1e-6 + 0.002 / 500)
    assert value(three.energy) == near(core / 0.8, rel=1e-12)
    assert sum(value(part) for part in three.energy_parts.values()) == near(value(three.energy), rel=1e-12)


def test_copies_leak_over_the_path_they_share_under_operation_accounting():
    found = loaded(
        with_copies("a", 0.2, 0.9, [1, 2]), timing="self-timed", accounting="operation", values={}, requirements={}
    )
    one, two = (at(found, 0.4, 1.0, 0.0, copies) for copies in (1.0, 2.0))
    # twice the leakage over half the time: what one copy leaks while it works
    assert value(two.energy_parts["leakage"]) == near(value(one.energy_parts["leakage"]), rel=1e-12)


def test_waking_up_charges_what_the_copies_repeat():
    first = with_copies("a", 0.2, 0.9, [1, 3], 0.0, 0.5, 0.0, gating=GATE | {"residual_leakage": v(D("0.0"))})
    found = loaded(first, idle="gated", values=CLOCK | IDLE | {"idle_time": v(D("10.0"), "s")})
    one, three = (at(found, 0.4, 1.0, 0.0, copies) for copies in (1.0, 3.0))
    assert value(three.idle_energy) == near(2.0 * value(one.idle_energy), rel=1e-12)


def test_a_back_bias_is_a_threshold_shift_with_standing_power():
    biased = loaded(with_bias(side("a", 0.2, 0.9), [0.0, 0.4], 0.1, 0.5))
    shifted = loaded(side("a", 0.2, 0.9, shifts=[-40.0], costs={"overhead_power": v(D("0.5"), "nW")}))
    here, there = at(biased, 0.4, 1.0, 0.0, 1.0, 0.4), at(shifted, 0.4, 1.0, -0.04)
    for name in ("time", "energy", "leakage_power"):
        assert value(getattr(here, name)) == near(value(getattr(there, name)), rel=1e-12)
    assert value(here.time) < value(at(biased, 0.4).time)
    assert value(here.leakage_power) > value(at(biased, 0.4).leakage_power)


def test_gating_is_used_only_where_it_pays():
    def idle_energy(idle: str, time: str) -> Points:
        gate = {"gating": GATE} if idle == "gated" else {}
        values = CLOCK | IDLE | {"idle_time": v(D(time), "s")}
        return at(loaded(side("a", 0.2, 0.9, **gate), idle=idle, values=values), 0.5)

    for time in ("0.000001", "10.0"):
        gated, on = idle_energy("gated", time), idle_energy("ungated", time)
        assert bool(value(gated.gated)) == (time == "10.0")
        if time == "10.0":
            assert value(gated.idle_energy) < value(on.idle_energy)
        else:
            assert value(gated.idle_energy) == value(on.idle_energy)


# -- what copies may use ----------------------------------------------------------------------------------------


def _slow(copies: list[int], deadline: Any = "cycle", policy: Table | None = None) -> Study:
    """A candidate whose path takes 1.5 clock periods."""
    lazy = given("a", on_resistance=1.5e-6 / (20 * float(np.log(2.0)) * 0.4e-15) / 1e3)
    first = with_copies("a", 0.2, 0.9, copies, 0.1)
    requirement = {"deadline": {"limit": deadline, "kind": "hard"}}
    sides = (first, [side("b", 0.2, 0.9)], [lazy, given("b")])
    options: Table = {"timing": "clocked", "accounting": "period", "values": CLOCK, "policy": policy or {}}
    return load(study(*sides, requirements=requirement, **options))


def test_copies_share_the_clock_cycle():
    assert not compare(_slow([1])).candidate.found[0]
    chosen = compare(_slow([1, 2, 4])).candidate.optimum.points
    assert chosen.copies == 2.0  # enough, and the fewest


def test_copies_share_the_required_time_of_a_policy():
    late = {"value": D("2.0"), "unit": "us"}
    policy = {"primary": "iso-delay", "required_time": {"value": D("1.0"), "unit": "us"}}
    assert not compare(_slow([1], late, policy)).candidate.found[0]
    assert compare(_slow([1, 2], late, policy)).candidate.optimum.points.copies == 2.0


def test_copies_do_not_shorten_a_stated_deadline():
    stated = {"value": D("1.0"), "unit": "us"}
    assert not compare(_slow([1, 2, 4], stated)).candidate.found[0]


def test_copies_do_not_help_where_the_delay_itself_is_made_small():
    found = loaded(
        with_copies("a", 0.2, 0.9, [1, 2, 4]), policy={"primary": "minimum-energy-delay", "exponent": D("1.0")}
    )
    assert compare(found).candidate.optimum.points.copies == 1.0


# -- a published example ----------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("form", "copies", "capacitance", "supply", "area", "power"),
    [
        ("parallel", 2, 2.15, "2.9", 3.4, 0.36),
        ("pipelined", 2, 1.15, "2.9", 1.3, 0.39),
        ("both", 4, 2.5, "2.0", 3.7, 0.20),
    ],
)
def test_power_at_equal_throughput_of_the_published_adder_and_comparator(
    form: str, copies: int, capacitance: float, supply: str, area: float, power: float
):
    """Chandrakasan, Sheng, Brodersen, JSSC 27 (1992) 473, from memory: 5 V; C times, f/2, V, area times, P over P.

    Two parallel copies run at half the clock: capacitance per operation is half of what is stated. Two pipeline stages
    run at the full clock; both together at half. The delay at the lower supply is 2 (4) times that at 5 V.
    """
    per_operation = capacitance * (1.0 if form == "pipelined" else 0.5)
    path = 0.9e-6  # at 5 V, in a cycle of 1 us
    ohms = path / (20 * float(np.log(2.0)) * 0.4e-15)
    quick = given("b", supply="5.0", on_resistance=ohms / 1e3, off_resistance=1e12)
    slow = given("a", supply=supply, on_resistance=copies * ohms / 1e3, off_resistance=1e12)
    further = copies - 1
    first = with_copies(
        "a", D(supply), D(supply), [1, copies], (per_operation - 1) / further, 1.0, (area - 1) / further
    )
    found = load(
        study(
            first, [side("b", D("5.0"), D("5.0"))], [slow, quick],
            timing="clocked", accounting="period", values=CLOCK, requirements=DEADLINE,
        )
    )  # fmt: skip
    outcome = compare(found)
    assert outcome.candidate.optimum.points.copies == copies  # one copy misses the cycle
    volts = float(supply) / 5.0
    assert 1.0 / float(outcome.advantage[0]) == near(per_operation * volts**2, rel=1e-6)
    assert 1.0 / float(outcome.advantage[0]) == near(power, rel=0.015)  # two digits are published
    assert float(outcome.candidate.area[0] / outcome.contenders[0].area[0]) == near(area, rel=1e-9)


# -- limits and monotone relations ------------------------------------------------------------------------------

FAST = {"clock_frequency": v(D("400.0"), "MHz")}


def test_many_free_copies_end_at_the_lowest_supply():
    """Without overhead and repeated leakage: C V^2 at the floor of the supply, and what one block leaks there."""
    few = [1, 2, 4, 8, 16, 32, 4096]
    outcomes = []
    for copies in few:
        first = with_copies("a", 0.2, 0.9, [copies], 0.0, 0.0, 0.0)
        options: Table = {"timing": "clocked", "accounting": "period", "values": FAST, "requirements": DEADLINE}
        found = load(study(first, [side("b", 0.2, 0.9)], [steep("a"), steep("b")], **options))
        outcomes.append(compare(found).candidate)
    energies = [float(outcome.energy[0]) for outcome in outcomes]
    assert all(b <= a * (1.0 + 1e-9) for a, b in itertools.pairwise(energies))
    assert energies[0] > 1.5 * energies[-1]
    assert bool(outcomes[-1].optimum.at_lower[0])
    lowest = at(found, 0.2)
    charge = sum(value(part) for part in lowest.dynamic_parts.values())
    assert energies[-1] == near(charge + value(lowest.leakage_power) / 400e6, rel=1e-9)


def test_leakage_and_routing_leave_an_inner_best_number_of_copies():
    many = [1, 2, 3, 4, 6, 8, 16, 32, 64]
    chosen = compare(loaded(with_copies("a", 0.1, 0.9, many, 0.02, 1.0, 1.0), values=FAST)).candidate.optimum.points
    assert 1.0 < chosen.copies < 64.0


@pytest.mark.parametrize(
    "cost", ["routing_overhead", "repeated_share", "back_bias_power", "wake_energy_cycles", "residual_leakage"]
)
def test_dearer_mitigations_never_help(cost: str):
    energies = []
    for level in (0.0, 0.2, 0.5, 1.0):
        first = with_bias(
            with_copies("a", 0.2, 0.9, [1, 2, 4], 0.1, 0.5, gating=dict(GATE)), [-0.3, 0.0, 0.3], 0.1, 0.01
        )
        table = first["gating"] if cost in GATE else first["mitigation"]
        table[cost] = v(number(level), "nW" if cost == "back_bias_power" else "")
        found = loaded(first, idle="gated", values=FAST | IDLE)
        energies.append(float(compare(found).candidate.energy[0]))
    assert all(b >= a * (1.0 - 1e-9) for a, b in itertools.pairwise(energies))
    assert energies[-1] >= energies[0]


def test_more_choices_never_cost_energy():
    plain = float(compare(loaded(side("a", 0.2, 0.9), values=FAST)).candidate.energy[0])
    copied = float(compare(loaded(with_copies("a", 0.2, 0.9, [1, 2, 4]), values=FAST)).candidate.energy[0])
    biased = float(compare(loaded(with_bias(side("a", 0.2, 0.9), [-0.3, 0.0, 0.3]), values=FAST)).candidate.energy[0])
    assert copied <= plain
    assert biased <= plain
    assert min(copied, biased) < plain


# -- scope of the knobs -----------------------------------------------------------------------------------------


def test_the_bias_is_chosen_row_by_row_and_copies_are_kept():
    found = loaded(with_bias(with_copies("a", 0.2, 0.9, [1, 2]), [-0.4, 0.0, 0.4], 0.15, 0.0), values=FAST)
    best = found.values["clock_frequency"].si[0]
    slow, quick = best / 1000.0, best * 2.5
    moves = [("study.clock_frequency", best, end) for end in (slow, quick)]
    rows = Comparison(found, found.pair("n1"), Batch.one_at_a_time(moves)).outcome("minimum-energy").candidate
    points = rows.optimum.points
    biases = points.back_bias[:, 0]
    assert len(set(biases)) > 1
    for row, clock in enumerate((best, slow, quick)):
        own = moved(found, "study.clock_frequency", float(clock))
        kept = dataclasses.replace(own, candidate=dataclasses.replace(own.candidate, copies=(points.copies,)))
        alone = compare(kept).candidate
        assert float(alone.energy[0]) == float(rows.energy[row])  # bit for bit
        assert value(alone.optimum.points.back_bias) == biases[row]


def test_the_body_factor_moves_the_threshold_in_its_own_row():
    found = loaded(with_bias(side("a", 0.4, 0.4), [0.4], 0.1, 0.0))
    moves = [("candidate.mitigation.body_factor", 0.1, 0.2)]
    rows = Comparison(found, found.pair("n1"), Batch.one_at_a_time(moves)).outcome("minimum-energy").candidate
    for row, factor in enumerate((0.1, 0.2)):
        own = at(loaded(with_bias(side("a", 0.4, 0.4), [0.4], factor, 0.0)), 0.4, 1.0, 0.0, 1.0, 0.4)
        assert float(rows.time[row]) == near(value(own.time), rel=1e-12)


# -- trace ------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("choice", [Choice(1.0, 0.0, 2.0, 0.3), Choice(1.0, 0.0, 4.0), Choice(1.0, -0.02, 1.0, -0.3)])
@pytest.mark.parametrize("idle_time", ["0.000001", "0.5"])
def test_the_arithmetic_shown_is_that_of_the_program(choice: Choice, idle_time: str):
    first = with_bias(
        with_copies("a", 0.2, 0.9, [1, 2, 4], gating=GATE, costs=OVERHEAD, shifts=[-20.0, 0.0]), [0.0, 0.3, -0.3]
    )
    values = CLOCK | IDLE | {"idle_time": v(D(idle_time), "s")}
    problem = comparison(loaded(first, idle="gated", values=values)).candidate.problem
    text = trace_point(problem, 0.45, *choice)
    assert sum("agrees" in line for line in text) == 3
    assert not any("DISAGREES" in line for line in text)
    assert any("gating would not pay" in line for line in text) == (idle_time != "0.5")
