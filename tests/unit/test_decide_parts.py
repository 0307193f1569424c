"""Margins, curves, limiting terms, anchors and self-checks against hand arithmetic."""

from __future__ import annotations

import dataclasses
from decimal import Decimal as D
from typing import Any

import numpy as np
import pytest

from benchmark.circuits.functional import functional
from benchmark.decide import compare as compare_module
from benchmark.decide.curves import advantage_against_time, crossings, scan_nodes, swept
from benchmark.decide.limiting import DELAY_GROUPS, ENERGY_GROUPS, groups_of, limiting
from benchmark.decide.requirements import HardLimits, functional_margins, hard_conditions, margins_at, misses
from benchmark.decide.self_checks import self_checks
from benchmark.evaluate.anchors import fan_out_4
from benchmark.evaluate.points import design_points
from benchmark.sets.study import Choice, Requirement
from tests.comparisons import compare, comparison, given, load, planar, pressed, record, side, steep, study
from tests.near import near
from tests.studies import mixed, v


def run_of(technology: Any, low: float = 0.2, high: float = 0.9, **options: Any) -> Any:
    other = given("b")
    return comparison(
        load(study(side("a", low, high), [side("b", 0.3, 0.7)], [technology, other], **options))
    ).candidate


def wanted(name: str, limit: float | None, kind: str = "hard", fan_in: int = 1) -> Requirement:
    return Requirement(name, limit, "", kind, fan_in, 0.0)


def test_margins_are_limit_over_used_or_offered_over_limit():
    run = run_of(given("a", supply=0.5, closing_voltage=0.25, opening_voltage=0.2, supply_ceiling=0.6))
    points = design_points(run.problem, np.array([[0.5, 0.8]]))

    def margin(name: str, limit: float) -> Any:
        return margins_at(run.problem, points, wanted(name, limit))

    assert margin("deadline", 1e-9) == near(1e-9 / points.time, rel=1e-15)
    assert margin("thermal_noise", 12.0) == near(points.noise_ratio / 12.0, rel=1e-15)
    assert margin("hysteresis_window", 0.3)[0] == near(0.3 / np.array([0.1, 0.05 / 0.8]), rel=1e-12)
    assert margin("device_limits", 1.0)[0] == near(np.array([0.6 / 0.5, 0.6 / 0.8]), rel=1e-12)
    assert margin("power_density", 5.0) == near(5.0 / points.power_density, rel=1e-15)
    assert margin("leakage_power", 1e-12) == near(1e-12 / points.leakage_power, rel=1e-15)
    assert margins_at(run.problem, points, wanted("deadline", None)) is not None
    assert np.all(np.isinf(margins_at(run.problem, points, wanted("deadline", None))))
    assert margins_at(run.problem, points, wanted("area", 1.0)) is None
    hard = HardLimits()(run, points, points.able)
    assert list(hard[0]) == [True, False]


def test_nothing_used_and_nothing_leaked_is_an_infinite_margin():
    free = given("a", options={"off_state": "none"}, off_resistance=None)
    run = run_of(free)
    points = design_points(run.problem, np.array([[0.5]]))
    for name in ("hysteresis_window", "device_limits", "leakage_power"):
        assert np.isinf(margins_at(run.problem, points, wanted(name, 1.0))).all()


def test_an_unknown_device_margin_counts_only_where_it_could_be_the_smallest():
    run = run_of(given("a"))
    points = design_points(run.problem, np.array([[0.5]]))
    for known, unknown, expected in ((0.5, True, 0.5), (2.0, True, np.nan), (2.0, False, 2.0)):
        margins = {"known": np.array([[known]])} | ({"unknown": np.array([[np.nan]])} if unknown else {})
        some = dataclasses.replace(points, margins=margins, hard_limits=frozenset(margins))
        found = margins_at(run.problem, some, wanted("device_limits", 1.0))
        assert np.array_equal(found, [[expected]], equal_nan=True)
        # an unknown is no failure of the search
        assert HardLimits()(run, some, points.able)[0, 0] == (known >= 1.0)


def test_functional_margins_are_those_of_the_gates():
    table = {"limit": {"value": D("0.1"), "unit": "1"}, "kind": "hard", "fan_in": 2}
    gain = {"limit": {"value": D("2.0"), "unit": "1"}, "kind": "report", "fan_in": 1}
    run = run_of(
        steep("a"), 0.2, 0.6, points=3, requirements={"noise_margin": table, "voltage_gain": gain},
        temperatures=(0.0, 80.0),
    )  # fmt: skip
    found = functional_margins(run)[Choice(1.0, 0.0)]
    supply = run.grid(Choice(1.0, 0.0)).supply
    pair = run.problem.switches(supply, 0.0)
    assert found["noise_margin"][0] == near(functional(pair, 2).noise_margin.min(axis=1)[0] / 0.1, rel=1e-12)
    assert found["voltage_gain"][0] == near(functional(pair, 1).gain.min(axis=1)[0] / 2.0, rel=1e-12)


def test_hard_conditions_leave_out_what_only_reports_and_what_stands():
    base = mixed()
    loaded = load(base)
    names = [getattr(part, "label", "") for part in hard_conditions(loaded).parts]
    assert names == [
        "hard limits of the device",
        "requirement deadline",
        "requirement thermal_noise",
        "requirement device_limits",
        "requirement power_density",
    ]


def test_misses_sees_report_requirements_and_stated_numbers():
    values = {"busiest_activity": v(D("0.5")), "duty": v(D("1.0"))}
    endurance = {"endurance": {"life": {"value": D("10.0"), "unit": "year"}, "kind": "report"}}
    for cycles, bound, missed in ((1e30, "", False), (1e3, "", True), (1e3, "at-least", False), (1e3, "at-most", True)):
        more = {"bound": bound} if bound else {}
        run = run_of(
            given("a", endurance_cycles=v(D(repr(cycles)), "1", unusual=True, **more)),
            requirements=endurance,
            values=values,
        )
        assert misses(run, design_points(run.problem, np.array([[0.5]])))[0] == missed
    for kind in ("report", "hard"):
        late = {"deadline": {"limit": {"value": D("1.0"), "unit": "ps"}, "kind": kind}}
        run = run_of(given("a"), requirements=late)
        # a hard one bounds the search instead
        assert misses(run, design_points(run.problem, np.array([[0.5]])))[0] == (kind == "report")


# -- curves --------------------------------------------------------------------------------------------------------


def envelope_of(inputs: Any) -> Any:
    loaded = load(inputs)
    whole = comparison(loaded)
    runs: dict[str, Any] = {"candidate": whole.candidate, **whole.contenders}
    curves = {}
    for key, run in runs.items():
        margins = functional_margins(run)
        curves[key] = [(run, swept(run, choice, margins[choice])) for choice in run.combinations]
    return loaded, curves, advantage_against_time(loaded, curves)


def test_curve_against_required_time_is_iso_delay_at_every_time_and_never_better():
    inputs = study(
        side("a", 0.15, 0.8, shifts=[0.0, 40.0]),
        [side("b", 0.3, 1.1), side("c", 0.2, 0.8)],
        [steep("a"), planar("b"), steep("c", subthreshold_swing=90.0)],
        policy={"primary": "iso-delay", "required_time": v(D("1.0"), "ns")},
        points=241,
        refine=1e-7,
    )
    loaded, _, found = envelope_of(inputs)
    assert found.time.size > 40
    for index in range(0, found.time.size, 7):
        time = float(found.time[index])
        policy = dataclasses.replace(loaded.policy, required_time=time)
        at = compare(dataclasses.replace(loaded, policy=policy))
        assert bool(np.isfinite(found.candidate_energy[index])) <= bool(at.candidate.found[0])
        if np.isfinite(found.advantage[index]):
            assert found.candidate_energy[index] >= at.candidate.energy[0] * (1 - 1e-6)
            assert found.candidate_energy[index] == near(at.candidate.energy[0], rel=2e-2)
            assert found.reference_energy[index] == near(
                min(s.energy[0] for s in at.contenders if s.found[0]), rel=2e-2
            )
            assert found.advantage[index] == found.reference_energy[index] / found.candidate_energy[index]
            assert found.strongest[index] in ("b", "c")
    fell = np.diff(found.candidate_energy[np.isfinite(found.candidate_energy)])
    assert np.all(fell <= 0.0)


def test_in_a_clocked_study_the_required_time_is_the_period_and_power_is_judged_at_it():
    """What breaks the power density at the study's clock may be permitted at a slower one, and the reverse."""

    def at(clock: str) -> Any:
        return envelope_of(
            study(
                side("a", 0.2, 0.2),
                [side("b", 0.3, 0.3)],
                [given("a", closing_delay=0.0), given("b")],
                timing="clocked",
                accounting="period",
                values={"clock_frequency": v(D(clock), "MHz")},
                requirements={"power_density": {"limit": {"value": D("0.1"), "unit": "W/cm^2"}, "kind": "hard"}},
            )
        )

    _, fast_curves, fast = at("5000.0")
    _, slow_curves, slow = at("1.0")
    assert fast_curves["candidate"][0][1].reasons == (("requirement power_density",),)
    assert slow_curves["candidate"][0][1].reasons == ((),)
    assert np.array_equal(fast.time, slow.time)
    assert np.array_equal(fast.candidate_energy, slow.candidate_energy)


def test_crossings_on_log_scales():
    x = np.array([1.0, 10.0, 100.0, 1000.0])
    assert crossings(x, np.array([0.5, 2.0, 2.0, 0.5]), 1.0) == [near(10**0.5, rel=1e-12), near(10**2.5, rel=1e-12)]
    assert crossings(x, np.array([2.0, 3.0, np.nan, 0.5]), 1.0) == []
    assert crossings(x, np.array([0.1, 1.0, 4.0, 4.0]), 1.0) == [near(10.0, rel=1e-12)]


def test_swept_points_carry_every_reason():
    run = run_of(
        pressed("a"),
        0.1,
        0.5,
        points=5,
        requirements={"deadline": {"limit": {"value": D("0.35"), "unit": "ns"}, "kind": "hard"}},
    )
    curve = swept(run, Choice(1.0, 0.0), {})
    assert curve.points.supply[0][[0, -1]] == near(np.array([0.1, 0.5]), rel=1e-12)
    assert curve.reasons[0] == ("requirement deadline",)
    assert curve.reasons[-1] == ("hard limits of the device",)
    assert curve.feasible.any()
    assert list(curve.feasible) == [not item for item in curve.reasons]


def test_node_scan_is_the_primary_policy_at_every_pair():
    loaded = load(mixed())
    rows = scan_nodes(loaded, loaded.policy.primary)
    assert [row.label for row in rows] == [pair.label for pair in loaded.pairs]
    for row, pair in zip(rows, loaded.pairs, strict=True):
        found = compare(dataclasses.replace(loaded, headline=pair.label))
        assert row.advantage == found.advantage[0]
        assert row.candidate_energy == found.candidate.energy[0]
        assert row.note == ""


# -- limiting terms ------------------------------------------------------------------------------------------------


def test_shares_add_up_and_the_largest_is_named():
    run = run_of(pressed("a"))
    slow, fast = (limiting(design_points(run.problem, np.array([[volts]]))) for volts in (0.15, 0.35))
    for found in (slow, fast):
        assert sum(found.delay_shares.values()) == near(1.0, rel=1e-12)
        assert sum(found.energy_shares.values()) == near(1.0, rel=1e-12)
        assert found.delay_shares[found.delay_limit] == max(found.delay_shares.values())
    assert (slow.delay_limit, fast.delay_limit) == ("device RC", "transit")
    assert (slow.energy_limit, fast.energy_limit) == ("leakage", "device")


def test_a_part_without_a_group_is_an_error():
    with pytest.raises(KeyError, match="mystery"):
        groups_of({"mystery": np.ones((1, 1))}, DELAY_GROUPS)
    run = run_of(given("a"))
    points = design_points(run.problem, np.array([[0.5]]))
    assert {name for names in ENERGY_GROUPS.values() for name in names} >= set(points.energy_parts)
    assert {name for names in DELAY_GROUPS.values() for name in names} >= set(points.time_parts)


# -- anchors -------------------------------------------------------------------------------------------------------


def test_fan_out_of_four_by_hand():
    """R 20 kohm, 0.4 fF per inverter input, no own capacitance: ln 2 x R x 4 C; C V^2 of 1.6 fF at 0.5 V."""
    run = run_of(given("a"))
    delay, energy = fan_out_4(run.problem.switches(np.array([[0.5]]), 0.0), "step")
    assert delay == near(np.log(2.0) * 20e3 * 1.6e-15, rel=1e-12)
    assert energy >= 1.6e-15 * 0.25
    assert energy == near(1.6e-15 * 0.25, rel=0.2)  # short circuit on top


# -- self-checks ---------------------------------------------------------------------------------------------------


def checks_of(inputs: Any) -> dict[str, Any]:
    loaded = load(inputs)
    return {item["name"]: item for item in self_checks(loaded, compare(loaded))}


def pair_of_transistors() -> Any:
    return study(
        side("a", 0.2, 0.8),
        [side("b", 0.2, 0.8)],
        [steep("a"), steep("b", subthreshold_swing=90.0)],
        policy={"primary": "minimum-energy-delay", "exponent": D("1.0")},
        points=31,
        refine=1e-6,
    )


def test_self_checks_pass():
    found = checks_of(pair_of_transistors())
    assert all(item["passed"] for item in found.values()), found
    assert {"self-comparison of a", "self-comparison of b", "swap with b", "supply grid twice as fine"} <= set(found)


@pytest.mark.parametrize(("name", "spoilt"), [("self-comparison of a", "candidate"), ("swap with b", "candidate")])
def test_self_checks_notice_a_side_that_is_treated_differently(monkeypatch: pytest.MonkeyPatch, name: str, spoilt: str):
    """A bonus of one part in a million for the candidate is seen."""
    true = compare_module.Comparison.side_outcome

    def unfair(self: Any, policy: str, run: Any, inputs: Any) -> Any:
        found = true(self, policy, run, inputs)
        if run.problem.role != spoilt:
            return found
        return dataclasses.replace(found, metric=found.metric * (1 - 1e-6))

    monkeypatch.setattr(compare_module.Comparison, "side_outcome", unfair)
    assert not checks_of(pair_of_transistors())[name]["passed"]


def test_parts_check_notices_a_missing_part(monkeypatch: pytest.MonkeyPatch):
    loaded = load(pair_of_transistors())
    found = compare(loaded)
    points = found.candidate.optimum.points
    parts = {key: part for key, part in points.energy_parts.items() if key != "leakage"}
    broken = dataclasses.replace(
        found,
        candidate=dataclasses.replace(
            found.candidate,
            optimum=dataclasses.replace(
                found.candidate.optimum, points=dataclasses.replace(points, energy_parts=parts)
            ),
        ),
    )
    name = "parts of energy and delay add up to the totals"
    assert next(item for item in self_checks(loaded, found) if item["name"] == name)["passed"]
    assert not next(item for item in self_checks(loaded, broken) if item["name"] == name)["passed"]


def test_coarse_search_is_noticed():
    """Three supplies and no refinement: the finer grid gives another answer, and the check says so."""
    coarse = pair_of_transistors()
    coarse.study["search"] = {"supply_points": 3, "refine_relative": D("1.0")}
    assert not checks_of(coarse)["supply grid twice as fine"]["passed"]


# -- notices -------------------------------------------------------------------------------------------------------


def test_notices():
    bare = study(side("a", 0.2, 0.8), [side("b", 0.2, 0.8)], [steep("a"), steep("b")], points=9, refine=1e-4)
    text = " | ".join(record(bare)["warnings"])
    assert "no hard noise margin or voltage gain bounds the search" in text
    tiny = study(
        side("a", 0.001, 0.001),
        [side("b", 0.5, 0.5)],
        [given("a", supply=v(D("1.0"), "mV", unusual=True)["value"] / 1000, input_capacitance=0.02), given("b")],
    )
    tiny.sets["technologies/a"]["value"]["declared_supply"]["unusual"] = True
    text = " | ".join(record(tiny)["warnings"])
    assert "a: C V^2 of a net is below k T ln 2" in text
    assert "check units first" in text
    assert "bounds the search" not in text
