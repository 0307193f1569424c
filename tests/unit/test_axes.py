"""What can be moved, over which range, and what the engine answers there, against single runs of a changed study."""

from __future__ import annotations

import dataclasses
import math
from decimal import Decimal as D
from typing import Any

import numpy as np
import pytest

from benchmark.decide.axes import DEADLINE, Axis, find_axis, known_axes, usual_axes
from benchmark.decide.break_even import find_needs, ideal_ways
from benchmark.decide.need_words import need_text
from benchmark.decide.profile import Line, profiles
from benchmark.decide.trials import REQUIRED_TIME, TEMPERATURE, Trials, study_at
from benchmark.errors import UsageError
from tests.comparisons import advantage, given, load, moved, planar, side, steep, study
from tests.near import near
from tests.studies import v


def trials_of(inputs: Any, drop: tuple[str, ...] = ()) -> Trials:
    loaded = load(inputs, drop)
    return Trials(loaded, loaded.pair(loaded.headline))


def transistors(**more: Any) -> Trials:
    chosen = {
        "policy": {"primary": "iso-delay", "required_time": v(D("2.0"), "ns")},
        "temperatures": (0.0, 85.0),
        **more,
    }
    return trials_of(
        study(
            side("a", 0.2, 0.6),
            [side("b", 0.3, 1.0)],
            [steep("a", options={"conduction": "thermionic"}), planar("b")],
            **chosen,
        )
    )


def simple(**values: Any) -> Trials:
    return trials_of(study(side("a", 0.5, 0.5), [side("b", 0.5, 0.5)], [given("a", **values), given("b")]))


# -- ranges ----------------------------------------------------------------------------------------------------------


def test_the_range_is_the_stated_spread_else_the_open_side_of_a_bound_else_the_usual_one():
    spread = v(D("20.0"), "kohm", spread={"shape": "uniform", "low": D("15.0"), "high": D("30.0")})
    bound = v(D("0.05"), "fF", bound="at-most")
    trials = simple(on_resistance=spread, terminal_capacitance=bound)
    stated, open_side = find_axis(trials, "a.on_resistance"), find_axis(trials, "a.terminal_capacitance")
    usual = find_axis(trials, "a.input_capacitance")
    assert (stated.low, stated.high, stated.origin) == (near(15e3), near(30e3), "stated range")
    assert (open_side.low, open_side.high) == (near(0.05e-18), near(0.05e-15))
    assert open_side.origin == "open side of a bound"
    assert (usual.low, usual.high) == (near(1e-18), near(1e-12))
    assert usual.origin == "usual range of the catalogue"


def test_a_value_outside_its_usual_range_widens_it_and_says_so():
    trials = simple(terminal_capacitance=v(D("0.0"), "fF"))
    axis = find_axis(trials, "a.terminal_capacitance")
    assert axis.low == 0.0
    assert axis.origin == "usual range of the catalogue, widened to today's value"
    assert axis.logarithmic
    assert axis.grid(5)[:2] == near(np.array([0.0, 1e-18]))


def test_names_are_found_by_key_by_name_and_refused_in_words():
    trials = simple()
    assert find_axis(trials, "activity").name == "study.activity"
    assert find_axis(trials, "a.on_resistance").name == "a.on_resistance"
    with pytest.raises(UsageError, match=r"several owners; name one of a\.on_resistance, b\.on_resistance"):
        find_axis(trials, "on_resistance")
    with pytest.raises(UsageError, match="there is no value 'resistence' in this study"):
        find_axis(trials, "resistence")


def test_whole_numbers_that_shape_the_netlist_are_another_study():
    inputs = study(
        side("a", 0.5, 0.5),
        [side("b", 0.5, 0.5)],
        [given("a"), given("b")],
        circuit="ring",
        values={"stage_count": v(11)},
    )
    trials = trials_of(inputs, ("activity", "logic_depth"))
    assert "study.stage_count" not in known_axes(trials)
    with pytest.raises(UsageError, match="shapes the netlist"):
        find_axis(trials, "stage_count")


# -- axes that are no value of a file --------------------------------------------------------------------------------


def test_temperature_is_the_highest_of_the_study_and_ends_where_a_set_is_valid():
    trials = transistors()
    axis = find_axis(trials, TEMPERATURE)
    assert (axis.low, axis.high, axis.best) == (near(233.15), near(398.15), near(358.15))
    for kelvin in (300.0, 380.0, 250.0):
        changed = study_at(trials.study, kelvin)
        # the lower of the two temperatures is left out when it would be the higher one
        assert changed.temperatures == ((273.15, kelvin) if kelvin > 273.15 else (kelvin,))
        assert trials([axis.place(kelvin, {})]).advantage[0] == near(advantage(changed), rel=1e-9)
    sides = trials.study.candidate
    narrow = dataclasses.replace(
        sides, technology=dataclasses.replace(sides.technology, valid={"temperature": (270.0, 360.0)})
    )
    other = dataclasses.replace(trials.study, candidate=narrow)
    found = find_axis(Trials(other, other.pair(other.headline)), TEMPERATURE)
    assert (found.low, found.high, found.origin) == (270.0, 360.0, "range in which every set is valid")


def test_required_time_differs_from_row_to_row():
    trials = transistors()
    axis = find_axis(trials, REQUIRED_TIME)
    times = [2e-9, 1e-9, 4e-9]
    found = trials([axis.place(time, {}) for time in times])
    for time, row in zip(times, found.advantage, strict=True):
        policy = dataclasses.replace(trials.study.policy, required_time=time)
        assert row == near(advantage(dataclasses.replace(trials.study, policy=policy)), rel=1e-9)
    deadline = find_axis(trials, DEADLINE)  # self-timed: the required time
    assert deadline.place(3e-9, {}) == axis.place(3e-9, {})
    clocked = simple()
    assert DEADLINE not in known_axes(clocked)
    assert REQUIRED_TIME not in known_axes(clocked)


@pytest.mark.parametrize(
    ("options", "values", "ratio"),
    [
        ({}, {}, (20e3 + 2e11) / 20e3),
        ({"off_state": "current"}, {"off_resistance": None, "open_state_current": 3.0}, 0.5 / (20e3 * 3e-12)),
    ],
)
def test_the_on_off_ratio_moves_the_open_state_alone(options, values, ratio):
    trials = simple(options=options, **values)
    axis = find_axis(trials, "on_off_ratio")
    assert axis.best == near(ratio, rel=1e-12)
    (key,) = axis.place(ratio, {})
    assert axis.place(ratio, {})[key] == near(trials.best_values[key], rel=1e-9)
    # leakage through one open switch of each pair: V^2/(R_on ratio)
    for target in (1e3, 1e5):
        there = trials([axis.place(target, {})]).advantage[0]
        si = axis.place(target, {})[key]
        assert there == near(advantage(moved(trials.study, key, si)), rel=1e-12)
    assert trials([axis.place(1e3, {})]).advantage[0] < trials.best.advantage[0]


def test_the_on_off_ratio_of_a_transistor_is_by_its_off_current():
    axis = find_axis(transistors(), "on_off_ratio")
    assert axis.best == near(200e-6 / 0.1e-9, rel=1e-12)
    assert axis.place(1e5, {}) == {"a.off_current": near(200.0 / 1e5, rel=1e-12)}
    # with the on-current moved too, the ratio stays the one asked for
    assert axis.place(1e5, {"a.on_current": 400.0})["a.off_current"] == near(400.0 / 1e5, rel=1e-12)


def test_usual_axes_are_those_the_study_has():
    assert [axis.name for axis in usual_axes(transistors())] == [
        "study.activity",
        "study.fan_out",
        "study.logic_depth",
        "required_time",
        "temperature",
        "on_off_ratio",
    ]
    loaded = load(study(side("a", 0.5, 0.5), [side("b", 0.5, 0.5)], [given("a"), given("b")],
                        policy={"primary": "declared-point"}))  # fmt: skip
    names = [axis.name for axis in usual_axes(Trials(loaded, loaded.pair(loaded.headline)))]
    assert names[-2:] == ["a.declared_supply", "b.declared_supply"]


# -- trials ----------------------------------------------------------------------------------------------------------


def test_a_row_is_the_study_with_that_value_and_rows_do_not_mix():
    trials = transistors()
    keys = {"a.gate_capacitance_total": 1.2e-9, "b.overlap_capacitance": 0.5e-9, "study.activity": 0.3}
    rows = [{}, *({key: si} for key, si in keys.items()), {TEMPERATURE: 330.0}, {REQUIRED_TIME: 1e-9}]
    together = trials(rows)
    for k, row in enumerate(rows):
        assert trials([row]).advantage[0] == together.advantage[k]
    for k, (key, si) in enumerate(keys.items(), start=1):
        assert together.advantage[k] == near(advantage(moved(trials.study, key, si)), rel=1e-9)
    assert together.advantage[0] == trials.best.advantage[0] == near(advantage(trials.study), rel=1e-12)
    whole = trials.whole(rows)
    assert np.array_equal(whole.advantage, together.advantage)


def test_values_the_model_refuses_are_named_and_the_others_are_evaluated():
    # a thermionic switch cannot be steeper than (kT/q) ln 10: 59.2 mV/decade at 25 degC
    trials = transistors()
    key = "a.subthreshold_swing"
    found = trials([{key: 70e-3}, {key: 20e-3}, {key: 80e-3}])
    assert np.isnan(found.advantage[1])
    assert np.isfinite(found.advantage[[0, 2]]).all()
    assert found.state(0) == found.state(2) == ""
    assert "subthreshold_swing" in found.state(1)
    assert "subthreshold_swing" in trials.why({key: 20e-3})
    axis = find_axis(trials, key).over(40e-3, 90e-3)
    (profile,) = profiles(trials, [Line(axis)], [1.0], 9)
    edge = profile.edges[0]
    assert not edge.defined_below
    assert edge.x == near(1.380649e-23 * 298.15 / 1.602176634e-19 * math.log(10.0), rel=2e-3)
    assert "subthreshold_swing" in edge.why


def test_what_a_circuit_refuses_ends_the_range_too():
    # data of a register cannot rise more than every other cycle
    values = {
        "clock_frequency": v(100, "MHz"),
        "gate_count": v(20),
        "register_count": v(4),
        "average_net_length": v(D("1.0"), "um"),
    }
    inputs = study(side("a", 0.5, 0.5), [side("b", 0.5, 0.5)], [given("a"), given("b")], circuit="random-logic",
                   timing="clocked", values=values)  # fmt: skip
    trials = trials_of(inputs)
    (need,) = find_needs(trials.study, trials.pair, [find_axis(trials, "activity")], [0.5], trials=trials)
    assert need.edges[-1].x == near(0.5, rel=2e-6)
    assert "cannot exceed 0.5 rising transitions per cycle" in need.edges[-1].why
    assert "No advantage above 0.5 (cannot be evaluated: " in need_text(need)


def test_why_names_the_candidate_alone_unless_no_contender_is_left():
    late = {"deadline": {"limit": {"value": D("1.0"), "unit": "ns"}, "kind": "hard"}}
    sets = [given("a"), given("b"), given("c", closing_delay=1.0, opening_delay=1.0)]
    contenders = [side("b", 0.5, 0.5), side("c", 0.5, 0.5)]
    trials = trials_of(study(side("a", 0.5, 0.5), contenders, sets, requirements=late))
    # c misses the deadline as it is; a slow candidate is the reason, not c
    slow = trials.why({"a.closing_delay": 1e-9, "a.opening_delay": 1e-9})
    assert slow == "a: no point of the supply range meets requirement deadline"
    slow = trials.why({"b.closing_delay": 1e-9, "b.opening_delay": 1e-9})
    assert slow.startswith("b: no point")
    assert "; c: no point" in slow
    assert trials.why({}) == ("c: no point of the supply range meets requirement deadline")


def test_a_share_with_a_limit_of_its_own_is_not_followed_to_1():
    trials = simple()
    for name, follows in (("a.switching_level", False), ("study.activity", True)):
        axis = find_axis(trials, name)
        ends = [end for end, _ in ideal_ways(axis.over(axis.low, 0.9 * axis.high))]
        assert ("towards 1" in ends) == follows


def test_a_level_at_an_end_of_the_range_is_on_the_bound():
    trials = simple()
    axis: Axis = find_axis(trials, "a.input_capacitance")
    today = float(trials.best.advantage[0])
    (need,) = find_needs(trials.study, trials.pair, [axis.over(axis.best, 10 * axis.best)], [today], trials=trials)
    assert need.on_bound == "low"
