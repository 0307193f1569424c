"""Verdicts of whole runs: which input or requirement carries them, and what the named values are worth."""

from __future__ import annotations

import copy
from decimal import Decimal as D
from typing import Any

import numpy as np
import pytest

from benchmark.catalogue import EVIDENCE, QUANTITIES
from benchmark.decide.verdict import WORDS
from benchmark.units import parse_unit, to_si
from tests.comparisons import compare, given, load, moved, number, pressed, record, side, steep, study, verdict
from tests.near import near
from tests.studies import Inputs, technology, v

GO, CONDITIONAL, FAILED, NOT_BETTER, UNDECIDED = WORDS
LIFE = {"life": {"value": D("10.0"), "unit": "year"}, "kind": "report"}


def published(inputs: Inputs) -> Inputs:
    """Say that every number is published, so that no evidence stands in the way."""
    for data in (inputs.study, *inputs.sets.values()):
        data["default"]["evidence"] = "published"
    inputs.study["demonstration"] = False
    return inputs


def pair(
    candidate: dict[str, Any] | None = None, rival: dict[str, Any] | None = None, required: Any = 2.0, **options: Any
) -> Inputs:
    """Two given switches; the rival has four times the capacitance, so the advantage in energy is 4."""
    first = given("new", **{"off_resistance": 1.0e9} | (candidate or {}))
    second = given("old", **{"input_capacitance": 0.8, "off_resistance": 1.0e9} | (rival or {}))
    sides = side("new", 0.5, 0.5), [side("old", 0.5, 0.5)]
    return published(study(*sides, [first, second], required=required, **options))


def test_published_numbers_give_go_or_not_better():
    found = verdict(pair())
    assert (found.word, found.advantage) == (GO, near(4.0, rel=1e-4))
    assert verdict(pair(required=4.1)).word == NOT_BETTER
    exactly = float(found.advantage)
    assert verdict(pair(required=exactly)).word == GO
    assert verdict(pair(required=np.nextafter(exactly, 9.0))).word == NOT_BETTER


@pytest.mark.parametrize("evidence", EVIDENCE)
def test_evidence_of_one_decisive_input_caps_the_word(evidence: str):
    caps = {"go": GO, "conditional": CONDITIONAL, "none": UNDECIDED, "demonstration": GO}
    more = {"formula": "terminal_capacitance * 2"} if evidence == "derived" else {}
    half = v(D("0.1"), "fF", evidence="defined")
    stated = v(D("0.2"), "fF", evidence=evidence, note="why", conditions="at use", **more)
    inputs = pair({"input_capacitance": stated, "terminal_capacitance": half}, required=1.5)
    inputs.study["demonstration"] = evidence == "invented"
    found = verdict(inputs)
    assert found.word == caps[EVIDENCE[evidence].support]
    named = found.conditions + found.measure_next
    assert bool(named) == (found.word != GO)
    assert all(text.startswith("new.input_capacitance stays at 0.2 fF") for text in named)


def test_measured_to_target_turns_go_into_conditional_go_and_nothing_else():
    before = record(pair({"input_capacitance": v(D("0.2"), "fF", evidence="measured", conditions="at use")}))
    after = record(pair({"input_capacitance": v(D("0.2"), "fF", evidence="target")}))
    assert before["verdict"]["word"] == GO
    assert after["verdict"]["word"] == CONDITIONAL
    for key in ("policies", "curves", "requirements", "advantage_against_time", "nodes", "crossings"):
        assert before[key] == after[key]
    changed = {key for key in before["verdict"] if before["verdict"][key] != after["verdict"][key]}
    # a measured value without range is not moved at all, a target is
    assert changed == {
        "word", "reasons", "conditions", "moves", "inputs_with_effect", "inputs_without_range"
    }  # fmt: skip


def test_an_input_that_moves_nothing_may_be_a_guess():
    """Delay is worth nothing below the deadline: an assumed closing delay does no harm, until it breaks it."""
    options: dict[str, Any] = {
        "timing": "clocked",
        "accounting": "period",
        "values": {"clock_frequency": v(D("1.0"), "MHz")},
        "requirements": {"deadline": {"limit": "cycle", "kind": "hard"}},
    }
    guess = {"closing_delay": v(D("20.0"), "ns", evidence="assumed", note="a guess")}
    found = verdict(pair(guess, **options))
    assert found.word == GO
    assert not next(move for move in found.moves if move.key == "new.closing_delay").matters
    # one per cent more breaks the deadline: 20 x 49.9 ns
    guess = {"closing_delay": v(D("49.95"), "ns", evidence="assumed", note="a guess")}
    found = verdict(pair(guess, **options))
    assert found.word == UNDECIDED
    assert found.measure_next[0].startswith("new.closing_delay")


WIDE = {"shape": "loguniform", "low": D("0.1"), "high": D("0.9")}


@pytest.mark.parametrize(
    ("evidence", "word"), [("target", CONDITIONAL), ("measured", UNDECIDED), ("assumed", UNDECIDED)]
)
def test_a_straddling_input_is_named_with_the_value_it_must_reach(evidence: str, word: str):
    inputs = pair(
        {"input_capacitance": v(D("0.2"), "fF", evidence=evidence, note="why", conditions="at use", spread=WIDE)}
    )
    found = verdict(inputs)
    assert found.word == word
    named = (found.conditions + found.measure_next)[0]
    # energy is proportional to the capacitance but for the leakage: twice 0.2 fF halves 4 to 2
    assert named.startswith("new.input_capacitance at most 0.4")
    move = next(item for item in found.moves if item.key == "new.input_capacitance")
    assert move.straddles
    assert np.isnan(move.flip_low)
    si = to_si(number(move.flip), parse_unit(QUANTITIES[move.name].unit))
    assert float(compare(moved(load(inputs), move.key, si)).advantage[0]) == near(2.0, rel=1e-5)


def test_below_m_with_a_range_that_reaches_it_is_not_decidable():
    inputs = pair({"input_capacitance": v(D("0.5"), "fF", spread=WIDE)})
    found = verdict(inputs)
    assert found.advantage < 2.0
    assert found.word == UNDECIDED
    assert found.measure_next[0].startswith("new.input_capacitance at most 0.4 fF")
    assert any("is below the required 2" in reason for reason in found.reasons)


FLIPPING = {
    "subthreshold_swing": v(D("40.0"), "mV/decade", spread={"shape": "lognormal", "factor": D("2.0")}),
    "on_current": v(D("200.0"), "uA/um", spread={"shape": "lognormal", "factor": D("30.0")}),
    "gate_capacitance_total": v(D("0.4"), "fF/um", spread={"shape": "lognormal", "factor": D("4.0")}),
    "supply_ceiling": v(D("0.5"), "V", spread={"shape": "uniform", "low": D("0.1"), "high": D("0.6")}),
}


@pytest.mark.parametrize("policy", ["iso-delay", "minimum-energy-delay", "declared-point"])
def test_flip_values_put_back_give_the_required_advantage(policy: str):
    """Both sides re-optimised; a value where the candidate stops working gives no advantage just beyond it."""
    inputs = study(
        side("new", 0.08, 0.7),
        [side("old", 0.2, 0.9)],
        [steep("new", supply=0.3, **FLIPPING), steep("old", supply=0.6)],
        values={"activity": v(D("0.05"), "1", spread={"shape": "loguniform", "low": D("1e-4"), "high": D("0.5")})},
        policy={"primary": policy, "exponent": D("1.0"), "required_time": v(D("2.0"), "ns")}
        if policy != "declared-point"
        else {"primary": policy},
        requirements={"device_limits": {"limit": {"value": D("1.0"), "unit": "1"}, "kind": "hard"}},
        required=1.0,
        points=13,
        refine=1e-7,
    )
    if policy == "iso-delay":
        del inputs.study["policy"]["exponent"]
    elif policy == "minimum-energy-delay":
        del inputs.study["policy"]["required_time"]
    best = verdict(inputs).advantage
    inputs.study["verdict"]["required_advantage"] = number(0.7 * best)
    loaded = load(inputs)
    found = verdict(loaded)
    flipped = [move for move in found.moves if move.straddles]
    assert len(flipped) >= 2
    frozen_free = compare(loaded)
    assert found.advantage == frozen_free.advantage[0]
    for move in flipped:
        unit = parse_unit(QUANTITIES[move.name].unit)
        for flip, end, advantage in (
            (move.flip_low, move.low, move.advantage_low),
            (move.flip_high, move.high, move.advantage_high),
        ):
            crossing = (advantage >= 0.7 * best) != move.best_reaches
            assert np.isfinite(flip) == crossing
            if not crossing:
                continue
            assert min(move.best, end) <= flip <= max(move.best, end)
            at = float(compare(moved(loaded, move.key, to_si(number(flip), unit))).advantage[0])
            if np.isfinite(advantage):
                assert at == near(0.7 * best, rel=1e-5), (move.key, flip)
            else:
                past = flip + 1e-4 * (end - flip)
                assert np.isnan(compare(moved(loaded, move.key, to_si(number(past), unit))).advantage[0])


def test_a_bound_is_used_at_both_ends():
    """A leakage at the instrument floor is an upper bound: much less of it helps its side, so both ends must agree."""
    options: dict[str, Any] = {
        "timing": "clocked",
        "accounting": "period",
        "values": {"clock_frequency": v(D("10.0"), "kHz")},
    }
    leaks = {"options": {"off_state": "current"}, "off_resistance": None}
    floor = v(D("1.0"), "pA", bound="at-most", evidence="measured", conditions="instrument floor")
    # 14 with the leakage as stated, 4 without
    found = verdict(pair({"off_resistance": 1e12}, leaks | {"open_state_current": floor}, required=8.0, **options))
    assert found.advantage > 8.0
    assert found.word == UNDECIDED
    assert found.measure_next[0].startswith("old.open_state_current at least")
    move = next(item for item in found.moves if item.key == "old.open_state_current")
    assert (move.low, move.high) == (near(0.001, rel=1e-12), near(1.0, rel=1e-12))
    assert move.advantage_low < 8.0 < move.advantage_high
    # on the candidate's side an upper bound is the worse end already
    new = verdict(pair(leaks | {"open_state_current": floor}, {"off_resistance": 1e6}, required=0.5, **options))
    assert (new.word, new.advantage_low) == (GO, new.advantage)
    # stated as a number, the same leakage is believed
    plain = v(D("1.0"), "pA")
    sure = verdict(pair({"off_resistance": 1e12}, leaks | {"open_state_current": plain}, required=8.0, **options))
    assert sure.word == GO


# -- requirements --------------------------------------------------------------------------------------------------


def test_all_failures_are_listed_in_one_run():
    inputs = pair(
        {"endurance_cycles": 1e10, "process_temperature": 550.0, "retention_time": v(1, "s"), "supply_ceiling": 0.4},
        values={"busiest_activity": v(D("0.5")), "duty": v(D("0.1"))},
        requirements={
            "endurance": LIFE,
            "process_temperature": {"limit": {"value": D("400.0"), "unit": "degC"}, "kind": "report"},
            "retention": {"limit": {"value": D("10.0"), "unit": "s"}, "kind": "report"},
            "area": {"limit": {"value": D("0.5"), "unit": "1"}, "kind": "report"},
            "power_density": {"limit": {"value": D("1.0"), "unit": "W/cm^2"}, "kind": "hard"},
            "device_limits": {"limit": {"value": D("1.0"), "unit": "1"}, "kind": "hard"},
        },
        required=5.0,
    )
    found = verdict(inputs)
    assert found.word == FAILED
    text = " | ".join(found.reasons)
    for name in ("endurance", "process_temperature", "retention", "power_density", "device_limits"):
        assert f"requirement {name} failed" in text
    assert "requirement area" not in text  # no area ratio without a permitted point: unknown, not failed
    assert "below the required 5" in text


def test_an_unstated_number_is_unknown_and_not_a_pass():
    values = {"busiest_activity": v(D("0.5")), "duty": v(D("0.1"))}
    for name, table in {
        "endurance": LIFE,
        "process_temperature": {"limit": {"value": D("400.0"), "unit": "degC"}, "kind": "hard"},
        "retention": {"limit": {"value": D("1.0"), "unit": "s"}, "kind": "hard"},
    }.items():
        used = values if name == "endurance" else {}
        found = verdict(pair(requirements={name: table}, values=used))
        assert found.word == UNDECIDED, name
        assert found.measure_next == (f"{name}: not stated in the parameter set",)


@pytest.mark.parametrize("kind", ["hard", "report"])
def test_power_density_without_a_footprint_is_unknown_not_failed(kind: str):
    limit = {"power_density": {"limit": {"value": D("1.0e4"), "unit": "W/cm^2"}, "kind": kind}}
    assert verdict(pair(requirements=limit)).word == GO
    found = verdict(pair({"footprint": None}, requirements=limit))
    assert found.word == UNDECIDED
    assert found.advantage == near(4.0, rel=1e-4)
    assert found.measure_next[0].startswith("power_density: cannot be judged")


def test_a_rival_whose_requirement_is_unknown_or_missed_as_stated_stays_a_rival():
    limits = {
        "power_density": {"limit": {"value": D("1.0e4"), "unit": "W/cm^2"}, "kind": "hard"},
        "process_temperature": {"limit": {"value": D("400.0"), "unit": "degC"}, "kind": "hard"},
    }
    inputs = pair(
        {"process_temperature": 350.0},
        {"footprint": None, "process_temperature": 1000.0},
        requirements=limits,
    )
    done = record(inputs)
    assert done["verdict"]["word"] == GO
    assert done["policies"][0]["strongest"] == "old"
    text = " | ".join(done["warnings"])
    assert "contender old cannot be judged on power_density; it stays a rival" in text
    assert "contender old does not meet process_temperature as stated; it stays a rival" in text


@pytest.mark.parametrize(("bound", "word"), [("", FAILED), ("at-least", UNDECIDED), ("at-most", FAILED)])
def test_a_one_sided_number_short_of_the_demand(bound: str, word: str):
    more = {"bound": bound} if bound else {}
    values = {"busiest_activity": v(D("0.5")), "duty": v(D("0.1"))}
    found = verdict(
        pair({"endurance_cycles": v(D("1e12"), "1", **more)}, requirements={"endurance": LIFE}, values=values)
    )
    assert found.word == word
    kept = verdict(
        pair(
            {"retention_time": v(D("1.0"), "s", **more)},
            requirements={"retention": {"limit": {"value": D("2.0"), "unit": "s"}, "kind": "report"}},
        )
    )
    assert kept.word == word


def test_a_requirement_that_rests_on_a_target_is_a_condition():
    """Nothing but the endurance requirement reads the endurance, so no advantage moves with it."""
    values = {"busiest_activity": v(D("0.5")), "duty": v(D("1e-6")), "clock_frequency": v(D("1.0"), "MHz")}
    options: dict[str, Any] = {"requirements": {"endurance": LIFE}, "values": values}
    for evidence, word in (("published", GO), ("target", CONDITIONAL), ("assumed", UNDECIDED)):
        cycles = v(D("1e12"), "1", evidence=evidence, note="why", conditions="at use")
        found = verdict(pair({"endurance_cycles": cycles}, **options))
        assert found.word == word
        named = found.conditions + found.measure_next
        assert all(text.startswith("new.endurance_cycles stays at 1e+12") for text in named)
    # without the requirement nothing rests on it
    unused = pair({"endurance_cycles": v(D("1e12"), "1", evidence="assumed", note="why")})
    assert verdict(unused).word == GO


def test_a_range_that_reaches_below_the_demand_is_a_condition_with_its_value():
    """Demand 1 MHz x 0.5 x 1e-6 x 3.15576e8 s = 1.57788e8 cycles."""
    values = {"busiest_activity": v(D("0.5")), "duty": v(D("1e-6")), "clock_frequency": v(D("1.0"), "MHz")}
    cycles = v(D("1e9"), "1", evidence="target", spread={"shape": "loguniform", "low": D("1e7"), "high": D("1e11")})
    found = verdict(pair({"endurance_cycles": cycles}, requirements={"endurance": LIFE}, values=values))
    assert found.word == CONDITIONAL
    move = next(item for item in found.moves if item.key == "new.endurance_cycles")
    assert move.straddles
    assert move.flip_low == near(1.57788e8, rel=1e-5)
    assert move.flip_low >= 1.57788e8 * (1 - 1e-9)
    assert found.conditions[0].startswith("new.endurance_cycles at least 1.578e+08")
    # the duty, a choice of the scenario, can break it as well: then its range must be settled, not hoped for
    values["duty"] = v(D("1e-6"), "1", spread={"shape": "loguniform", "low": D("1e-7"), "high": D("1e-4")})
    sure = v(D("1e9"), "1")
    found = verdict(pair({"endurance_cycles": sure}, requirements={"endurance": LIFE}, values=values))
    assert found.word == UNDECIDED
    assert found.measure_next[0].startswith("study.duty at most 6.33")


def test_hard_limits_of_a_device_bind_without_being_listed():
    inputs = published(
        study(
            side("new", 0.1, 0.6),
            [side("old", 0.3, 0.3)],
            [pressed("new"), given("old")],
            policy={"primary": "iso-energy", "required_energy": v(D("1.0"), "pJ")},
        )
    )
    fastest = compare(load(inputs)).candidate
    ceiling = 6.67e6 * 60e-9
    assert fastest.supply[0] <= ceiling
    assert fastest.supply[0] == near(ceiling, rel=1e-8)
    inputs.study["candidate"]["knobs"]["supply"]["low"] = D("0.5")
    none = verdict(inputs)
    assert none.word == FAILED
    assert none.reasons[0] == "no point of the supply range meets hard limits of the device"


def test_requirements_that_exclude_each_other_are_not_called_failed_one_by_one():
    """The field limit is met below 0.40 V, the deadline above 0.43 V: each somewhere, never together."""
    inputs = published(
        study(
            side("new", 0.1, 0.6),
            [side("old", 0.3, 0.3)],
            [pressed("new", supply=0.3), given("old", supply=0.3)],
            requirements={
                "device_limits": {"limit": {"value": D("1.0"), "unit": "1"}, "kind": "hard"},
                "deadline": {"limit": {"value": D("300.3"), "unit": "ps"}, "kind": "hard"},
            },
        )
    )
    done = record(inputs)
    assert done["verdict"]["word"] == FAILED
    assert done["verdict"]["reasons"][0] == "no point of the supply range meets all hard requirements together"
    assert {row["state"] for row in done["requirements"]} == {"pass"}
    assert {row["note"] for row in done["requirements"]} == {"at the most favourable point of the range"}
    assert not any(row["passes_somewhere"] for row in done["requirements"])


def test_the_prescribed_point_says_what_it_misses():
    inputs = pair(
        {"supply_ceiling": 0.4},
        requirements={"deadline": {"limit": {"value": D("1.0"), "unit": "ps"}, "kind": "hard"}},
        policy={"primary": "declared-point"},
    )
    why = compare(load(inputs)).candidate.why
    assert why.startswith("the prescribed supply of 0.5 V is not a permitted point: ")
    assert "hard limits of the device" in why
    assert "requirement deadline" in why
    outside = copy.deepcopy(pair(policy={"primary": "declared-point"}))
    outside.study["candidate"]["knobs"]["supply"] = {"low": D("0.6"), "high": D("0.7"), "unit": "V"}
    assert "outside the supply range of the study, 0.6 to 0.7 V" in compare(load(outside)).candidate.why


def test_a_report_requirement_missed_at_the_optimum_but_met_elsewhere_says_so():
    inputs = published(
        study(
            side("new", 0.2, 0.7),
            [side("old", 0.3, 0.7)],
            [steep("new", subthreshold_swing=40.0), steep("old")],
            requirements={"deadline": {"limit": {"value": D("1.0"), "unit": "ns"}, "kind": "report"}},
        )
    )
    found = verdict(inputs)
    assert found.word == FAILED
    assert "make it hard to bound the search" in found.reasons[0]
    inputs.study["requirements"]["deadline"]["kind"] = "hard"
    assert verdict(inputs).word in (GO, NOT_BETTER)


# -- metrics that are not known, nothing, or infinite --------------------------------------------------------------


def test_a_metric_that_needs_an_unstated_number_is_not_decidable():
    policy = {"primary": "minimum-energy", "metric": "area"}
    assert verdict(pair({"footprint": 0.005}, policy=policy)).advantage == near(4.0, rel=1e-12)
    for candidate, rival in (({"footprint": None}, {}), ({}, {"footprint": None})):
        found = verdict(pair(candidate, rival, policy=policy))
        assert found.word == UNDECIDED
        assert "its area is not known" in found.reasons[0]


def test_no_leakage_against_some_is_infinite_and_against_none_a_tie():
    policy = {"primary": "minimum-energy", "metric": "leakage-power"}
    free = {"options": {"off_state": "none"}, "off_resistance": None}
    found = verdict(pair(free, policy=policy, required=10.0))
    assert (found.word, found.advantage) == (GO, np.inf)
    assert verdict(pair(free, free, policy=policy, required=1.0)).advantage == 1.0
    assert verdict(pair(free, free, policy=policy, required=1.0)).word == GO
    assert verdict(pair(free, free, policy=policy, required=1.1)).word == NOT_BETTER
    lost = verdict(pair({}, free, policy=policy, required=0.1))
    assert (lost.word, lost.advantage) == (NOT_BETTER, 0.0)


def test_a_required_time_that_is_not_known_is_not_decidable():
    """At 85 degC the contender that sets the time would swing below the thermionic limit: it has no time to give."""
    rival = steep(
        "old",
        supply=0.5,
        options={"conduction": "thermionic"},
        subthreshold_swing=60.0,
        swing_temperature_coefficient=v(D("0.0"), "mV/decade/K"),
    )
    policy = {"primary": "iso-delay", "required_time": "contender:old"}
    sides = side("new", 0.3, 0.6), [side("old", 0.3, 0.6)]
    quick = given("new", on_resistance=2.0)
    cold = published(study(*sides, [quick, rival], policy=policy))
    assert verdict(cold).word == GO
    hot = published(study(*sides, [quick, rival], policy=policy, temperatures=(25.0, 85.0)))
    found = verdict(hot)
    assert found.word == UNDECIDED
    assert found.reasons == ("the required time is not known: old cannot be evaluated at its declared supply",)


def test_stage_results_without_range_count_as_decisive():
    rows = [
        {
            "node": "n1",
            "supply": v(D(volts), "V"),
            "temperature": v(D("25.0"), "degC"),
            "delay": v(D(delay), "ps"),
            "energy_per_cycle": v(D(energy), "fJ"),
            "leakage_power": v(D("1.0"), "pW"),
        }
        for volts, delay, energy in (("0.4", "30.0", "0.16"), ("0.5", "20.0", "0.25"))
    ]
    for evidence, word in (("published", GO), ("simulated", CONDITIONAL), ("assumed", UNDECIDED)):
        known = technology("new", "stage-table", ["n1"], {"stage": "inverter, fan-out 1, no wire"}, {}, row=rows)
        known["value"] = {"declared_supply": v(D("0.5"), "V")}
        inputs = published(
            study(
                side("new", 0.5, 0.5),
                [side("old", 0.5, 0.5)],
                [known, given("old", input_capacitance=3.2)],
                required=2.0,
            )
        )
        inputs.sets["technologies/new"]["default"]["evidence"] = evidence
        inputs.sets["technologies/new"]["default"]["note"] = "why"
        for table in known["value"].values():
            table["evidence"] = "published"
        found = verdict(inputs)
        assert found.word == word, evidence
        named = found.conditions + found.measure_next
        assert all(text.startswith("new.row as stated") for text in named)
    assert record(inputs)["verdict"]["word"] == word
