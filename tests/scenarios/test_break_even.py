"""Break-evens and required values of the hand scenarios: every number by hand arithmetic, all inputs invented."""

from __future__ import annotations

import dataclasses
import math
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from benchmark.decide.axes import find_axis, known_axes
from benchmark.decide.break_even import Need, find_needs
from benchmark.decide.compare import Comparison
from benchmark.decide.gap import Perfected, gap_rows, improvements
from benchmark.decide.need_words import need_rows, need_text
from benchmark.decide.opportunity import map_rows, opportunity_map
from benchmark.decide.profile import Line, label_changes
from benchmark.decide.specification import sheet_rows, specification
from benchmark.decide.trade import trade_curve, trade_rows
from benchmark.decide.trials import Trials
from benchmark.errors import UsageError
from benchmark.evaluate.batch import Batch
from benchmark.record.load import load_study
from tests.near import near
from tests.studies import hub, mixed

DATA = Path(__file__).parent.parent / "data"


def needs_of(trials: Trials, name: str, *levels: float, **options: Any) -> list[Need]:
    return find_needs(trials.study, trials.pair, [find_axis(trials, name)], levels, trials=trials, **options)


def hub_trials(folder: Path, **choices: Any) -> Trials:
    study, _ = load_study(hub(**choices).write(folder))
    return Trials(study, study.pair("n1"))


def hand_trials(name: str, overrides: dict[str, str] | None = None, **policy: Any) -> Trials:
    study, _ = load_study(DATA / name / "study.toml", overrides=overrides or {})
    study = dataclasses.replace(study, policy=dataclasses.replace(study.policy, **policy))
    return Trials(study, study.pair("hand"))


# -- always-on hub: fJ per gate and cycle, fast 0.36 a + 0.600, low-leakage 0.49 a + 0.007, relay 2 a ----------------


@pytest.mark.parametrize(
    ("contender", "by_hand", "digits"),
    [("fast", 0.600 / (2.0 - 0.36), 0.3659), ("low-leakage", 0.007 / (2.0 - 0.49), 0.004636)],
)
def test_the_break_even_activity_of_each_flavour(contender, by_hand, digits, tmp_path):
    trials = hub_trials(tmp_path, contenders=(contender,))
    (need,) = needs_of(trials, "activity", 1.0)
    (crossing,) = need.crossings
    assert crossing.x == near(by_hand, rel=1e-12)
    assert crossing.x == near(digits, rel=1.5e-4)
    assert crossing.kind == "root"
    assert crossing.above_below
    (row,) = need_rows([need])
    assert row["factor"] == near(by_hand / 0.02, rel=1e-12)
    assert "the candidate is better below" in row["words"]


def test_idle_break_even_against_the_sleep_switch(tmp_path):
    trials = hub_trials(tmp_path, activity="0.05", idle="gated", contenders=("low-leakage",))
    (need,) = needs_of(trials, "idle_time", 1.0)
    by_hand = (100.0 - 24.5 - 7.0 - 1.47) / 0.035 * 1e-3
    assert [crossing.x for crossing in need.crossings] == near([by_hand], rel=1e-12)
    assert by_hand == near(1.915, rel=1e-4)
    assert not need.crossings[0].above_below  # the candidate is better above
    # the same as a share of the time: 10 ms awake
    (share,) = needs_of(trials, "awake_share", 1.0)
    assert share.crossings[0].x == near(0.01 / (by_hand + 0.01), rel=1e-12)


def test_against_a_perfect_sleep_switch_there_is_none(tmp_path):
    trials = hub_trials(
        tmp_path, activity="0.05", idle="gated", residual="0.0", wake="0.0", contenders=("low-leakage",)
    )
    (need,) = needs_of(trials, "idle_time", 1.0)
    assert need.kind == "no effect"
    assert need.crossings == ()
    assert need.highest == near(31.5 / 100.0, rel=1e-12)
    assert "none" in need_text(need)


def test_a_deadline_is_an_edge_and_no_root(tmp_path):
    # twenty stages of 100 ns and ln 2 x 1 kohm x 0.5 fF each
    trials = hub_trials(tmp_path)
    (need,) = needs_of(trials, "clock_frequency", 1.0)
    (edge,) = need.edges
    assert edge.x == near(1.0 / (20 * (100e-9 + math.log(2.0) * 0.5e-12)), rel=2e-6)
    assert edge.defined_below
    assert "relay" in edge.why
    assert "deadline" in edge.why
    # 0.007 fJ at 10 us: 1.51 a fJ are 0.7 pW x T
    assert [crossing.x for crossing in need.crossings] == near([0.7e-12 / (1.51e-15 * 0.02)], rel=1e-12)


def test_a_contender_that_drops_out_makes_a_jump_and_no_root(tmp_path):
    # low-leakage with 300 ns per stage misses the cycle above 166.7 kHz; then fast is the strongest, at 9.2 times
    inputs = hub()
    for name in ("closing_delay", "opening_delay"):
        inputs.sets["technologies/low-leakage"]["value"][name]["value"] = 300
    study, _ = load_study(inputs.write(tmp_path))
    trials = Trials(study, study.pair("n1"))
    (need,) = needs_of(trials, "clock_frequency", 1.0)
    root, jump = need.crossings
    assert (root.kind, root.above_below) == ("root", True)
    assert (jump.kind, jump.above_below) == ("jump", False)
    slowest = 20 * (300e-9 + math.log(2.0) * 1e-12)
    assert jump.x == near(1.0 / slowest, rel=1e-9)
    before, after = (0.49 * 0.02 + 0.7e3 * slowest) / 0.04, (0.36 * 0.02 + 60e3 * slowest) / 0.04
    assert jump.why == (
        f"the advantage jumps from {before:.4g} to {after:.4g}: low-leakage has a permitted point only below"
    )
    assert "no root but a jump at 0.1667 MHz" in need_text(need)


# -- stress-gated switch: p = b d V, R = 1e9 ohm x 10^(-2 p/GPa), t = 15 ps + ln 2 R C ------------------------------

COEFFICIENT = "hand-stress-gated.actuator_coefficient"
SUPPLY = "hand-stress-gated.declared_supply"
#: d V [m] at which a stage takes 25 ps: R = 10 ps / (ln 2 x 0.1 fF)
D_V_25 = math.log10(1e9 / (10e-12 / (math.log(2.0) * 0.1e-15))) / 2.0 * 1e9 / (2.0e9 / (300e-12 * 0.25))


def level_of(trials: Trials, stage: float) -> float:
    """Advantage in time at which one of the twenty stages takes so long."""
    reference = Comparison(trials.study, trials.pair, Batch.best_estimate()).outcome(trials.policy).contenders[0]
    return float(reference.time[0]) / (20 * stage)


def test_transit_equals_resistance_times_capacitance_at_274_9():
    trials = hand_trials("stress-hand")
    changes = label_changes(trials, Line(find_axis(trials, COEFFICIENT)))
    delay = [change for change in changes if change.of == "delay"]
    by_hand = math.log10(1e9 / (15e-12 / (math.log(2.0) * 0.1e-15))) / 2.0 * 1e9 / (2.0e9 / 300e-12)
    assert [change.x for change in delay] == near([by_hand], rel=1e-9)
    assert by_hand == near(274.9e-12, rel=2e-4)
    assert (delay[0].below, delay[0].above) == ("device RC", "transit")


@pytest.mark.parametrize(("supply", "digits"), [("0.25", 288.1e-12), ("0.40", 180.0e-12)])
def test_coefficient_for_25_ps_per_stage(supply, digits):
    trials = hand_trials("stress-hand", {SUPPLY: supply}, metric="time-per-operation")
    (need,) = needs_of(trials, COEFFICIENT, level_of(trials, 25e-12))
    assert [crossing.x for crossing in need.crossings] == near([D_V_25 / float(supply)], rel=1e-9)
    assert need.crossings[0].x == near(digits, rel=3e-4)
    assert near(72.02e-12, rel=1e-4) == D_V_25


# -- word line: reference 0.6931 x 2 kohm x 100 fF + 0.377 ns; new 15 ps + 0.6931 R 100 fF + 0.377 ns ----------------

RESISTANCE = "hand-line-new.on_resistance"
REFERENCE_TIME = math.log(2.0) * 2e3 * 100e-15 + 0.377e-9


@pytest.mark.parametrize(("level", "digits"), [(1.2, 543.8), (1.3, 66.9)])
def test_required_on_resistance(level, digits):
    trials = hand_trials("word-line")
    (need,) = needs_of(trials, RESISTANCE, level)
    by_hand = (REFERENCE_TIME / level - 0.377e-9 - 15e-12) / (math.log(2.0) * 100e-15)
    assert [crossing.x for crossing in need.crossings] == near([by_hand], rel=1e-9)
    assert by_hand == near(digits, rel=5e-4)


def test_an_advantage_of_1_5_is_unreachable():
    trials = hand_trials("word-line")
    (need,) = needs_of(trials, RESISTANCE, 1.5)
    assert need.kind == "unreachable"
    assert need.reach is not None
    assert need.reach.advantage == near(REFERENCE_TIME / 392e-12, rel=1e-9)
    assert need.reach.advantage == near(1.315, rel=5e-4)
    assert need.reach.end == "towards 0"
    assert need.reach.settled
    assert need.reach.limit == "wire"
    text = need_text(need)
    assert "nreachable: even at the ideal limit (towards 0) the advantage is 1.315, limited by wire" in text


# -- trade curve, specification sheet, map ---------------------------------------------------------------------------


def test_coefficient_against_supply_is_a_hyperbola_cut_at_the_field_limit():
    trials = hand_trials("stress-hand", metric="time-per-operation")
    first = find_axis(trials, COEFFICIENT).over(100e-12, 1000e-12)
    second = find_axis(trials, SUPPLY).over(0.05, 1.0)
    curve = trade_curve(trials, first, second, level_of(trials, 25e-12), 9)
    today, *rows = trade_rows(curve)
    assert (today["answer"], today["first_value"], today["second_value"]) == ("today", near(300.0), near(0.25))
    on_curve = [row for row in rows if row["answer"] == "root"]
    assert len(on_curve) == 7
    for row in on_curve:
        assert row["first_value"] * row["second_value"] == near(72.02, rel=1e-4)
        assert row["second_value"] < 0.4002
        assert row["at_or_above_level"] == "above"
    # below 180 pm/V the supply would have to lie above the field limit: 6.67 MV/m over 60 nm
    cut = [row for row in rows if row["answer"] == "never"]
    assert [row["first_value"] < 180.0 for row in cut] == [True] * 3
    for row in cut:
        assert row["second_high"] == near(0.4002, rel=1e-6)
        assert "above 0.4002 V" in row["cut_by"]
        assert "device_limits" in row["cut_by"]


def test_a_trade_needs_two_different_values():
    trials = hand_trials("stress-hand")
    axis = find_axis(trials, COEFFICIENT)
    with pytest.raises(UsageError, match="two different values"):
        trade_curve(trials, axis, axis, 2.0)


def test_values_of_the_sheet_put_back_give_the_required_advantage():
    trials = hand_trials("stress-hand")
    sheet = specification(trials, 2.0)
    assert sheet.advantage > 2.0
    rows = {row["name"].rpartition(".")[2]: row for row in sheet_rows(sheet)}
    assert rows["actuator_coefficient"]["bound"] == "at least"
    assert rows["input_capacitance"]["bound"] == "at most"
    assert rows["stack_sound_speed"]["reachable"] == "met over the whole range"
    solved = 0
    for need in sheet.needs:
        for crossing in need.crossings:
            put_back = trials([need.axis.place(crossing.x, {})]).advantage[0]
            assert put_back == near(2.0, rel=1e-9)
            solved += 1
    assert solved >= 6


def test_the_sheet_of_the_word_line_says_what_is_out_of_reach():
    rows = {row["name"]: row for row in sheet_rows(specification(hand_trials("word-line"), 1.5))}
    assert rows[RESISTANCE]["reachable"] == "no"
    assert "1.315" in rows[RESISTANCE]["words"]
    assert "hand-line-new.endurance_cycles" not in rows  # moves a requirement, not the advantage


def test_the_map_passes_through_the_exact_break_evens(tmp_path):
    trials = hub_trials(tmp_path)
    found = opportunity_map(trials, "activity", (1.0, 2.0), 7)
    assert found.advantage.shape == (len(found.values), len(found.deadlines))
    for level in (1.0, 2.0):
        points = found.boundary[level]
        assert len(points) >= 6
        for deadline, activity in points:  # low-leakage: 0.49 a + 0.7 pW x T against 2 a
            assert activity == near(0.7e3 * deadline / (2.0 * level - 0.49), rel=1e-9)
    assert [activity for deadline, activity in found.boundary[1.0] if deadline == 1e-5] == near([0.004636], rel=1e-4)
    # the relay needs 2 us; every other point has a number
    for k, i in np.ndindex(*found.advantage.shape):
        missed = found.deadlines[i] < 2e-6
        assert np.isnan(found.advantage[k, i]) == missed
        assert found.states[k][i] == ("the candidate has no permitted point" if missed else "")
    rows = map_rows(found)
    assert {row["kind"] for row in rows} == {"today", "point", "boundary", "class"}
    boxes = {row["product_class"]: row for row in rows if row["kind"] == "class"}
    assert boxes["always-on hub"]["deadline_to_s"] == near(1.0 / 32e3)
    assert boxes["always-on hub"]["state"] == "common practice, no source"


def test_a_contender_that_drops_out_bounds_a_region_of_the_map_by_a_jump(tmp_path):
    """Twenty stages of 300 ns: low-leakage is there from 6 us on, and the fast flavour alone before."""
    study, _ = load_study(hub(low_leakage_delay="300.0").write(tmp_path))
    found = opportunity_map(Trials(study, study.pair("n1")), "activity", (1.0, 2.0), 9)
    start = 20.0 * (300e-9 + math.log(2.0) * 1e3 * 1e-15)  # delay and ln 2 R C of every stage
    for level in (1.0, 2.0):
        # fast: 0.36 a + 60 pW x T, low-leakage: 0.49 a + 0.7 pW x T, both against 2 a
        lowest, highest = (leak * start / (2.0 * level - charge) for leak, charge in ((0.7e3, 0.49), (60e3, 0.36)))
        jumped = [value for value in found.values if lowest < value < highest]
        assert len(jumped) >= 3
        assert sorted(value for _, value in found.jumps[level]) == jumped
        assert [deadline for deadline, _ in found.jumps[level]] == near([start] * len(jumped), rel=1e-9)
    rows = [row for row in map_rows(found) if row["kind"] == "jump"]
    assert {(row["level"], row["deadline_s"], row["value"]) for row in rows} == {
        (level, *place) for level, places in found.jumps.items() for place in places
    }
    assert opportunity_map(hub_trials(tmp_path / "both"), "activity", (1.0,), 5).jumps == {1.0: ()}


def test_the_map_over_duty_passes_through_the_idle_break_even(tmp_path):
    trials = hub_trials(tmp_path, activity="0.05", idle="gated", contenders=("low-leakage",))
    found = opportunity_map(trials, "duty", (1.0,), 5)
    idle = (100.0 - 24.5 - 7.0 - 1.47) / 0.035 * 1e-3
    at_study = [share for deadline, share in found.boundary[1.0] if deadline == 1e-5]
    assert at_study == near([0.01 / (0.01 + idle)], rel=1e-9)
    with pytest.raises(UsageError, match="idle scheme"):
        opportunity_map(hub_trials(tmp_path / "none"), "duty")
    with pytest.raises(UsageError, match="clocked study"):
        opportunity_map(hand_trials("stress-hand", required_time=""), "activity")


# -- who must improve -----------------------------------------------------------------------------------------------


def test_a_perfect_driver_of_the_word_line_gives_at_most_1_368():
    trials = hand_trials("word-line")
    rows = {row["perfected"]: row for row in gap_rows(improvements(trials), 1.5)}
    assert rows["resistance and transit"]["advantage"] == near(REFERENCE_TIME / 0.377e-9, rel=1e-9)
    assert rows["resistance and transit"]["advantage"] == near(1.368, rel=5e-4)
    assert rows["device resistance"]["advantage"] == near(REFERENCE_TIME / 392e-12, rel=1e-9)
    assert rows["device resistance"]["advantage"] == near(1.315, rel=5e-4)
    without_transit = math.log(2.0) * 200 * 100e-15 + 0.377e-9
    assert rows["transit"]["advantage"] == near(REFERENCE_TIME / without_transit, rel=1e-9)
    assert rows["level shifters"]["advantage"] == near(trials.best.advantage[0], rel=1e-15)  # the metric is time
    assert {row["reaches"] for row in rows.values()} == {"no"}
    assert rows["everything of the candidate"]["share_of_gap"] == near(1.0)
    # without the line the reference would be at once, the candidate has its transit time
    assert rows["wire"]["advantage"] == 0.0
    assert math.isnan(rows["wire"]["share_of_gap"])


def test_perfecting_leakage_leaves_the_charges_and_perfect_charges_leave_the_leakage():
    trials = hand_trials("stress-hand")
    rows = {row["perfected"]: row for row in gap_rows(improvements(trials), 2.0)}
    assert rows["leakage and bias"]["advantage"] == near(36.0 / 6.25, rel=1e-9)
    # leakage of one pass at the transit time alone: N V^2/(R_0 + R_on) x N t_tr, against 36 aJ x N a
    leakage = 20 * 0.25**2 / (1e9 + 1e5) * 20 * 15e-12
    assert rows["device capacitance"]["advantage"] == near(36e-18 * 20 * 0.05 / leakage, rel=1e-4)
    assert rows["device capacitance"]["limit"] == "leakage"
    # the supply is prescribed, so without resistance only the leakage of the transit time is left
    assert rows["the whole switch"]["advantage"] == math.inf
    assert rows["the whole switch"]["state"] == "grows without limit"
    assert math.isnan(rows["transit"]["share_of_gap"])


def test_perfecting_nothing_changes_no_bit(tmp_path):
    study, _ = load_study(mixed().write(tmp_path))
    trials = Trials(study, study.pair(study.headline))
    again = Trials(study, trials.pair, alter=Perfected((), 1.0))
    assert again.best.advantage[0] == trials.best.advantage[0]
    assert again.best.energy_shares.keys() == trials.best.energy_shares.keys()


def test_a_perfect_term_never_hurts(tmp_path):
    study, _ = load_study(mixed().write(tmp_path))
    trials = Trials(study, study.pair(study.headline))
    found = improvements(trials)
    assert len(found) > 8
    for item in found:
        if item.name != "wire":
            assert item.advantage >= found[0].advantage * (1.0 - 1e-6)


# -- property 60: put a value back; property 61: stricter level, stricter value -------------------------------------


@pytest.mark.parametrize("level", [0.9, 1.0, 1.1, 1.25])
def test_a_value_put_back_gives_the_level_and_parts_the_sides(level):
    trials = hand_trials("word-line")
    axes = [axis for name, axis in known_axes(trials).items() if name != "temperature"]
    solved = 0
    for need in find_needs(trials.study, trials.pair, axes, [level], trials=trials, ideal=False):
        line = Line(need.axis)
        for crossing in need.crossings:
            at, below, above = trials(
                [line.trial(crossing.x * factor) for factor in (1.0, 1.0 - 1e-6, 1.0 + 1e-6)]
            ).advantage
            assert at == near(level, rel=1e-9)
            assert (below > level) == crossing.above_below
            assert (above < level) == crossing.above_below
            solved += 1
    assert solved >= 4


def test_no_answer_without_a_change_of_sign_and_none_with_one():
    trials = hand_trials("word-line")
    axes = list(known_axes(trials).values())
    for need in find_needs(trials.study, trials.pair, axes, [1.0, 1.25], trials=trials, ideal=False):
        sides = need.lowest >= need.level, need.highest >= need.level
        assert bool(need.crossings) == (sides[0] != sides[1])
        assert (need.kind == "crossings") == bool(need.crossings)


def test_a_stricter_level_asks_for_a_stricter_value_until_it_is_unreachable():
    trials = hand_trials("word-line")
    levels = [1.0, 1.1, 1.2, 1.3, 1.315, 1.316, 1.4]
    needs = needs_of(trials, RESISTANCE, *levels)
    kinds = [need.kind for need in needs]
    limit = REFERENCE_TIME / 392e-12
    assert [kind == "unreachable" for kind in kinds] == [level > limit for level in levels]
    values = [need.crossings[0].x for need in needs if need.crossings]
    assert values == sorted(values, reverse=True)
    assert len(values) == 5
