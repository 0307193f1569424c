"""Every branch of the verdict table, with outcomes, requirements and moved inputs made by hand."""

from __future__ import annotations

import itertools
from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest

from benchmark.catalogue import EVIDENCE
from benchmark.decide.assess import RequirementResult, state_of
from benchmark.decide.compare import Outcome, SideOutcome
from benchmark.decide.moves import InputMove
from benchmark.decide.verdict import WORDS, judge
from benchmark.decide.wording import apart, beyond

GO, CONDITIONAL, FAILED, NOT_BETTER, UNDECIDED = WORDS
NAN = float("nan")


def side(name: str, metric: float | None, why: str = "") -> SideOutcome:
    """A side with one number; None: no permitted point."""
    value = np.array([NAN if metric is None else metric])
    optimum: Any = None
    return SideOutcome(name, optimum, value, ~np.isnan(value), value, value, value, value, why)


def outcome(advantage: float, *, why: str = "", rivals: bool = True, unknown: tuple[str, ...] = ()) -> Outcome:
    """Candidate cost 1 against a rival of cost ``advantage``; nan: the candidate has no permitted point."""
    infeasible = np.isnan(advantage) and rivals and not unknown
    candidate = side("new", None if infeasible else 1.0, why)
    rival = side("old", advantage if rivals and not np.isnan(advantage) else (1.0 if rivals else None))
    return Outcome(
        "minimum-energy", candidate, (rival,), np.array([0 if rivals else -1]), np.array([advantage]), unknown
    )


def requirement(state: str, name: str = "endurance", margin: float = 2.0, **more: Any) -> RequirementResult:
    fields = {"kind": "report", "passes_somewhere": False, "note": "", **more}
    return RequirementResult(
        name, fields["kind"], state, 1.0, 1.0, margin, "1", "", fields["passes_somewhere"], fields["note"]
    )  # type: ignore[arg-type]


def move(
    low: float,
    high: float,
    *,
    best: float = 3.0,
    evidence: str = "published",
    ranged: bool = True,
    matters: bool = True,
    required: float = 2.0,
    name: str = "new.on_resistance",
    flips: tuple[float, float] = (NAN, NAN),
) -> InputMove:
    """An input whose ends give the advantages ``low`` and ``high``."""
    reach = [bool(a >= required) for a in (low, best, high)]
    return InputMove(
        name,
        "on_resistance",
        "kohm",
        evidence,
        10.0,
        5.0 if ranged else NAN,
        20.0 if ranged else NAN,
        low,
        high,
        ranged,
        ranged and len(set(reach)) > 1,
        matters,
        reach[1],
        *flips,
    )


def decide(advantage: float, moves: Any = (), requirements: Any = (), *, invented: str = "support", **more: Any) -> Any:
    study: Any = SimpleNamespace(required_advantage=2.0, invented_inputs=invented)
    relaxed = more.pop("relaxed", None)
    return judge(study, outcome(advantage, **more), list(requirements), list(moves), relaxed)


# -- requirements first --------------------------------------------------------------------------------------------


def test_every_failed_requirement_is_listed_with_the_missing_advantage():
    found = decide(
        1.5,
        [move(1.0, 3.0, best=1.5)],
        [
            requirement("pass", "deadline"),
            requirement("fail", "endurance", 0.016),
            requirement("unknown", "retention", NAN, note="not stated in the parameter set"),
            requirement("fail", "process_temperature", 0.82),
        ],
    )
    assert found.word == FAILED
    assert len(found.reasons) == 3
    assert found.reasons[0].startswith("requirement endurance failed (margin 0.016")
    assert found.reasons[1].startswith("requirement process_temperature failed")
    assert found.reasons[2] == "advantage 1.5 is below the required 2"


def test_a_failure_comes_before_any_advantage():
    assert decide(100.0, [move(50.0, 200.0, best=100.0)], [requirement("fail")]).word == FAILED


def test_a_side_that_cannot_reach_the_required_time_is_infeasible_and_says_why():
    relaxed = outcome(0.5)
    found = decide(NAN, why="cannot reach 1e-09 s per operation; fastest 2e-09 s at 0.4 V", relaxed=relaxed)
    assert found.word == FAILED
    assert found.reasons[0].startswith("cannot reach")
    assert found.reasons[1] == ("with the hard requirements set aside the advantage would be 0.5, below the required 2")
    assert np.isnan(found.advantage)


@pytest.mark.parametrize("advantage", [2.0, 5.0])
def test_an_unknown_requirement_is_no_pass(advantage: float):
    found = decide(advantage, [move(advantage, advantage, best=advantage)], [requirement("unknown", note="not stated")])
    assert found.word == UNDECIDED
    assert found.measure_next == ("endurance: not stated",)


def test_an_unknown_requirement_cannot_rescue_what_is_below_m_everywhere():
    found = decide(1.5, [move(1.2, 1.9, best=1.5)], [requirement("unknown", note="not stated")])
    assert found.word == NOT_BETTER
    assert "cannot change the answer" in found.reasons[1]
    # but where some input could lift the advantage to M it could
    assert decide(1.5, [move(1.2, 2.0, best=1.5)], [requirement("unknown")]).word == UNDECIDED


def test_no_contender_is_not_decidable():
    found = decide(NAN, rivals=False)
    assert found.word == UNDECIDED
    assert "no contender" in found.reasons[0]


def test_an_unknown_metric_is_not_decidable():
    found = decide(NAN, unknown=("new: its area is not known",))
    assert found.word == UNDECIDED
    assert found.reasons == ("new: its area is not known",)


# -- ranges --------------------------------------------------------------------------------------------------------


def test_all_ends_at_or_above_m_is_go():
    found = decide(3.0, [move(2.0, 4.0), move(3.0, 3.0, matters=False, name="new.height")])
    assert found.word == GO
    assert (found.advantage_low, found.advantage_high) == (2.0, 4.0)
    assert found.inputs_with_effect == 1


def test_all_ends_below_m_is_not_better():
    found = decide(1.9, [move(1.5, 1.999, best=1.9)])
    assert found.word == NOT_BETTER
    assert found.reasons == ("advantage 1.9 is below the required 2",)


@pytest.mark.parametrize("evidence", [name for name, item in EVIDENCE.items() if item.support == "conditional"])
def test_straddling_with_conditional_evidence_names_input_and_value(evidence: str):
    found = decide(3.0, [move(4.0, 1.5, evidence=evidence, flips=(NAN, 14.32))])
    assert found.word == CONDITIONAL
    assert found.conditions == (f"new.on_resistance at most 14.32 kohm ({evidence})",)


@pytest.mark.parametrize("evidence", [name for name, item in EVIDENCE.items() if item.support in ("go", "none")])
def test_straddling_with_other_evidence_asks_for_a_measurement(evidence: str):
    found = decide(3.0, [move(4.0, 1.5, evidence=evidence, flips=(NAN, 14.32))])
    assert found.word == UNDECIDED
    assert found.measure_next == (f"new.on_resistance at most 14.32 kohm ({evidence})",)


def test_straddling_below_m_is_not_decidable_whatever_the_evidence():
    for evidence in EVIDENCE:
        found = decide(1.5, [move(2.5, 1.0, best=1.5, evidence=evidence, flips=(7.0, NAN))])
        assert found.word == UNDECIDED
        assert found.measure_next[0].startswith("new.on_resistance at most 7 kohm")
        assert "advantage 1.5 is below the required 2" in found.reasons


def test_an_infeasible_end_straddles():
    found = decide(3.0, [move(NAN, 4.0, evidence="target", flips=(5.5, NAN))])
    assert found.word == CONDITIONAL
    assert found.conditions == ("new.on_resistance at least 5.5 kohm (target)",)


def test_both_ends_on_the_other_side_give_two_limits():
    inside = decide(3.0, [move(1.0, 1.5, evidence="target", flips=(6.0, 15.0))])
    assert inside.conditions == ("new.on_resistance at least 6 and at most 15 kohm (target)",)
    outside = decide(1.0, [move(3.0, 2.5, best=1.0, evidence="target", flips=(6.0, 15.0))])
    assert outside.measure_next == ("new.on_resistance at most 6 or at least 15 kohm (target)",)


def test_largest_swing_is_measured_first():
    few = move(1.9, 3.2, name="new.a")
    many = move(0.2, 30.0, name="new.b")
    gone = move(NAN, 3.0, name="new.c")
    found = decide(3.0, [few, many, gone])
    assert [text.split(" ")[0] for text in found.measure_next] == ["new.c", "new.b", "new.a"]


# -- evidence ------------------------------------------------------------------------------------------------------

CAPS = {"go": GO, "conditional": CONDITIONAL, "none": UNDECIDED, "demonstration": GO}


@pytest.mark.parametrize("evidence", EVIDENCE)
def test_an_input_without_range_that_matters_caps_the_word(evidence: str):
    found = decide(3.0, [move(3.01, 2.99, evidence=evidence, ranged=False)])
    assert found.word == CAPS[EVIDENCE[evidence].support]
    named = found.conditions + found.measure_next
    assert bool(named) == (found.word != GO)
    assert all("new.on_resistance stays at 10 kohm" in text for text in named)


@pytest.mark.parametrize("evidence", EVIDENCE)
def test_an_input_without_range_that_moves_nothing_does_no_harm(evidence: str):
    assert decide(3.0, [move(3.0, 3.0, evidence=evidence, ranged=False, matters=False)]).word == GO


@pytest.mark.parametrize("evidence", EVIDENCE)
def test_a_range_that_stays_at_or_above_m_does_no_harm(evidence: str):
    assert decide(3.0, [move(2.0, 5.0, evidence=evidence)]).word == GO


def test_evidence_list_is_the_agreed_one():
    by_support = {
        support: {name for name, item in EVIDENCE.items() if item.support == support}
        for support in ("go", "conditional", "none", "demonstration")
    }
    assert by_support == {
        "go": {"defined", "measured", "published", "choice"},
        "conditional": {"extracted", "simulated", "derived", "projected", "target"},
        "none": {"assumed"},
        "demonstration": {"invented"},
    }


def test_measured_to_target_turns_go_into_conditional_go_and_nothing_else():
    others = [move(2.5, 3.5, name="new.b"), move(3.01, 2.99, ranged=False, name="new.c", evidence="measured")]
    before = decide(3.0, [*others, move(3.1, 2.9, ranged=False, evidence="measured")])
    after = decide(3.0, [*others, move(3.1, 2.9, ranged=False, evidence="target")])
    assert (before.word, after.word) == (GO, CONDITIONAL)
    assert after.conditions == ("new.on_resistance stays at 10 kohm (target, no range stated)",)
    for name in ("advantage", "advantage_low", "advantage_high", "unranged", "inputs_with_effect"):
        assert getattr(before, name) == getattr(after, name)


def test_assumed_beside_a_straddling_target_is_not_a_conditional_go():
    straddling = move(1.0, 4.0, evidence="target", flips=(7.0, NAN))
    guess = move(3.1, 2.9, ranged=False, evidence="assumed", name="new.guess")
    assert decide(3.0, [straddling]).word == CONDITIONAL
    found = decide(3.0, [straddling, guess])
    assert found.word == UNDECIDED
    assert any(text.startswith("new.guess") for text in found.measure_next)


def test_invented_inputs_can_be_refused():
    plain = move(3.1, 2.9, ranged=False, evidence="invented")
    assert decide(3.0, [plain]).word == GO
    assert decide(3.0, [plain], invented="refuse").word == UNDECIDED
    straddling = move(1.0, 4.0, evidence="invented", flips=(7.0, NAN))
    assert decide(3.0, [straddling]).word == CONDITIONAL
    assert decide(3.0, [straddling], invented="refuse").word == UNDECIDED


def test_tables_without_numbers_are_named():
    table = InputMove(
        "new.table.current", "measured table", "", "simulated", NAN, NAN, NAN, NAN, NAN, False, False, True, True
    )
    found = decide(3.0, [table])
    assert found.word == CONDITIONAL
    assert found.conditions == ("new.table.current as stated (simulated, no range stated)",)
    assert (found.advantage_low, found.advantage_high) == (3.0, 3.0)


def test_counts():
    moves = [
        move(3.1, 2.9, ranged=False, evidence="assumed", name="new.a"),
        move(2.5, 3.5, evidence="invented", name="new.b"),
        move(3.0, 3.0, evidence="assumed", matters=False, name="new.c"),
    ]
    found = decide(3.0, moves)
    assert (found.inputs_with_effect, found.unranged, found.judgement) == (2, 1, 2)


# -- laws ----------------------------------------------------------------------------------------------------------


def every_case() -> Any:
    advantages = (0.5, 1.9999, 2.0, 3.0, np.inf)
    ends = [(1.0, 1.5), (1.0, 4.0), (2.0, 4.0), (NAN, 4.0), (2.5, np.inf)]
    evidence = ("published", "target", "assumed", "invented")
    states: tuple[tuple[str, ...], ...] = ((), ("pass",), ("unknown",), ("fail",), ("fail", "unknown"))
    return itertools.product(advantages, ends, evidence, (True, False), states)


def test_go_needs_m_at_the_best_estimate_and_at_every_end():
    for best, (low, high), evidence, ranged, states in every_case():
        moved = move(low, high, best=best, evidence=evidence, ranged=ranged)
        found = decide(best, [moved], [requirement(state) for state in states])
        assert found.word in WORDS
        if found.word in (GO, CONDITIONAL):
            assert best >= 2.0
            assert not {"fail", "unknown"} & set(states)
        if found.word == GO and ranged:
            assert low >= 2.0
            assert high >= 2.0
        if found.word == GO and not ranged:
            assert evidence != "assumed"
        if found.word == CONDITIONAL:
            assert found.conditions
        if found.word == UNDECIDED:
            assert found.measure_next


def test_a_larger_m_or_one_more_requirement_never_turns_a_no_go_into_a_go():
    rank = {NOT_BETTER: 0, FAILED: 0, UNDECIDED: 1, CONDITIONAL: 2, GO: 3}
    for best, (low, high), evidence, ranged, states in every_case():
        words = []
        for required in (0.4, 1.0, 2.0, 2.5, 5.0, 50.0):
            study: Any = SimpleNamespace(required_advantage=required, invented_inputs="support")
            moved = move(low, high, best=best, evidence=evidence, ranged=ranged, required=required)
            words.append(judge(study, outcome(best), [requirement(s) for s in states], [moved]).word)
        assert not any(a.startswith("no-go") and b in (GO, CONDITIONAL) for a, b in itertools.pairwise(words))
        moved = move(low, high, best=best, evidence=evidence, ranged=ranged)
        before = decide(best, [moved], [requirement(s) for s in states]).word
        for state in ("pass", "unknown", "fail"):
            after = decide(best, [moved], [*(requirement(s) for s in states), requirement(state, "retention")]).word
            assert rank[after] <= rank[before]


# -- states and digits ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("margin", "bound", "at_most", "state"),
    [
        (2.0, "", False, "pass"),
        (1.0, "", False, "pass"),
        (np.nextafter(1.0, 0.0), "", False, "fail"),
        (NAN, "", False, "unknown"),
        # "no failure until 1e12 cycles": enough passes, too little is unknown
        (2.0, "at-least", False, "pass"),
        (0.5, "at-least", False, "unknown"),
        # "fails at 1e12 cycles at the latest": too little fails, enough is unknown
        (2.0, "at-most", False, "unknown"),
        (0.5, "at-most", False, "fail"),
        # "needs at most 400 degC": within the limit passes, beyond it is unknown
        (2.0, "at-most", True, "pass"),
        (0.5, "at-most", True, "unknown"),
        # "needs at least 400 degC": beyond the limit fails, within it is unknown
        (2.0, "at-least", True, "unknown"),
        (0.5, "at-least", True, "fail"),
    ],
)
def test_state_of_a_margin(margin: float, bound: str, at_most: bool, state: str):
    found, note = state_of(margin, bound, at_most)
    assert found == state
    assert bool(note) == (state == "unknown" and bool(bound))


def test_rounding_never_turns_a_miss_into_a_pass():
    close = np.nextafter(2.0, 0.0)
    found = decide(close, [move(1.0, 1.5, best=close)])
    assert found.word == NOT_BETTER
    shown = float(found.reasons[0].split(" ")[1])
    assert shown < 2.0
    assert decide(2.0).word == GO
    failed = decide(3.0, [], [requirement("fail", margin=0.99996)])
    assert "margin 0.99996" in failed.reasons[0]


def test_apart_and_beyond():
    assert apart(1.23456, 1.5) == ("1.235", "1.5")
    assert apart(1.99999, 2.0) == ("1.99999", "2")
    assert apart(2.0, 2.0) == ("2", "2")
    assert apart(np.inf, 2.0) == ("inf", "2")
    for number in (14.3249, 0.000123451, 9.99999e22, -3.14159, 5.0):
        assert float(beyond(number, up=True)) >= number >= float(beyond(number, up=False))
        assert float(beyond(number, up=True)) == pytest.approx(number, rel=1e-3)
    assert beyond(5.0, up=True) == beyond(5.0, up=False) == "5"
    assert beyond(0.0, up=True) == "0"


def test_a_limit_in_a_condition_is_rounded_to_the_safe_side():
    least = decide(3.0, [move(1.0, 4.0, evidence="target", flips=(7.00001, NAN))])
    assert least.conditions == ("new.on_resistance at least 7.001 kohm (target)",)
    most = decide(3.0, [move(4.0, 1.0, evidence="target", flips=(NAN, 7.00099))])
    assert most.conditions == ("new.on_resistance at most 7 kohm (target)",)
