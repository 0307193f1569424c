"""``evenload need``: what is printed, in every form, and what is refused."""

from __future__ import annotations

import csv
import io
import json
from pathlib import Path

import pytest

from benchmark import api
from benchmark.errors import UsageError
from tests.cli.conftest import Run
from tests.fixed_displacement import fixed_displacement
from tests.near import near
from tests.studies import hub

DATA = Path(__file__).parent.parent / "data"
WORD_LINE = DATA / "word-line" / "study.toml"
STRESS = DATA / "stress-hand" / "study.toml"


@pytest.fixture
def study(tmp_path: Path) -> Path:
    return hub().write(tmp_path / "hub")


def words(text: str) -> str:
    """The text without its line breaks."""
    return " ".join(text.split())


def rows(text: str) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(text)))


def test_one_value_in_words(evenload: Run, study: Path):
    ran = evenload("need", study, "activity")
    assert ran.status == 0
    text = words(ran.out)
    assert "advantage today 0.42 in energy-per-operation against low-leakage" in text
    assert (
        "Break-even (advantage 1) at 0.004636 (0.2318 times today's 0.02, -0.01536): the candidate is better below"
        in text
    )


def test_without_names_the_usual_values_and_the_required_advantage(evenload: Run, study: Path):
    found = rows(evenload("need", study, "--format", "csv").out)
    assert [row["name"] for row in found] == [
        "study.activity",
        "study.fan_out",
        "study.logic_depth",
        "study.clock_frequency",
        "temperature",
        "required_advantage",
    ]
    assert float(found[-1]["value"]) == near(0.42, rel=1e-12)
    assert found[-1]["words"] == "met up to 0.42 (0.42 times the 1 asked for), missed above"
    assert found[2]["answer"] == "no effect"
    assert found[2]["value"] == ""


def test_the_forms_say_the_same_numbers_as_the_python_interface(evenload: Run, study: Path):
    table = rows(evenload("need", study, "activity", "--advantage", "2", "--format", "csv").out)
    listed = json.loads(evenload("need", study, "activity", "--advantage", "2", "--format", "json").out)["rows"]
    found = api.need(study, ["activity"], advantage=2.0)
    values = list(found.frame["value"])
    assert [float(row["value"]) for row in table] == [row["value"] for row in listed] == values
    assert values == near([0.007 / 1.51, 0.007 / 3.51], rel=1e-12)
    assert list(found.frame.columns) == list(found.columns)
    assert "study.activity" in found.text
    assert repr(found) == "Needed(1 answers, 2 rows)"
    assert listed[0]["standard_deviations"] is None
    shown = found._repr_html_()
    assert "<table" in shown
    assert "the candidate is better below" in shown
    assert "<script" not in shown


def test_a_range_of_ones_own_and_a_what_if(evenload: Run, study: Path):
    (row,) = rows(evenload("need", study, "activity", "--over", "0.01..0.3", "--format", "csv").out)
    assert (row["low"], row["high"], row["range"]) == ("0.01", "0.3", "as asked for")
    assert row["answer"] == "beyond"
    assert float(row["value"]) == near(0.007 / 1.51, rel=1e-12)
    text = words(evenload("need", study, "activity", "--set", "clock_frequency=200").out)
    assert "What-if: clock_frequency = 200" in text
    assert "at 0.002318" in text


def test_unreachable_is_said_with_the_limit(evenload: Run):
    text = words(evenload("need", WORD_LINE, "hand-line-new.on_resistance", "--pair", "hand").out)
    assert (
        "Advantage 1.5: unreachable: even at the ideal limit (towards 0) the advantage is 1.315, limited by wire"
        in text
    )
    assert "No advantage above 66.48 kohm (hand-line-new: " in text


def test_a_record_folder_will_do(evenload: Run, study: Path, quick: None):
    evenload("run", study, "--out", "record", "--quiet")
    assert "at 0.004636" in words(evenload("need", "record", "activity").out)


def test_trade_curve(evenload: Run):
    ran = evenload(
        "need", STRESS, "--trade", "actuator_coefficient", "hand-stress-gated.declared_supply", "--advantage", "4",
        "--over", "100..600", "--over", "0.1..1", "--points", "4", "--format", "csv",
    )  # fmt: skip
    found = rows(ran.out)
    assert (found[0]["answer"], found[0]["first_value"], found[0]["second_value"]) == ("today", "300.0", "0.25")
    roots = [row for row in found if row["answer"] == "root"]
    assert roots
    assert all(float(row["advantage"]) == near(4.0, rel=1e-9) for row in roots)
    text = words(evenload("need", STRESS, "actuator_coefficient", "stack_thickness", "--trade", "--points", "3").out)
    assert "any value will do" in text or "or more" in text


def test_sheet(evenload: Run):
    found = rows(evenload("need", STRESS, "--sheet", "--points", "5", "--format", "csv").out)
    assert {row["bound"] for row in found} >= {"at least", "at most"}
    text = words(evenload("need", WORD_LINE, "--sheet", "--points", "5").out)
    assert "hand-line-new.on_resistance decisive; reachable: no. Advantage 1.5: unreachable" in text
    named = rows(evenload("need", WORD_LINE, "--sheet", "hand-line-new.closing_delay",
                          "--points", "5", "--format", "csv").out)  # fmt: skip
    assert [row["name"] for row in named] == ["hand-line-new.closing_delay"]


def test_sheet_with_a_probability(evenload: Run, tmp_path: Path):
    path = fixed_displacement().write(tmp_path / "film")
    ran = evenload("need", path, "--sheet", "--probability", "0.9", "--draws", "64", "--points", "3", "--format", "csv")
    by_name = {row["name"]: row for row in rows(ran.out)}
    row = by_name["film-switch.actuator_coefficient"]
    assert float(row["required"]) < 200.0 < float(row["required_at_probability"])
    assert row["probability"] == "0.9"
    text = words(evenload("need", path, "--sheet", "--probability", "0.9", "--draws", "64", "--points", "3").out)
    assert "Drawn: today P = " in text


def test_map(evenload: Run, study: Path):
    found = rows(evenload("need", study, "--map", "activity", "--points", "3", "--format", "csv").out)
    boundary = [row for row in found if row["kind"] == "boundary"]
    assert {row["level"] for row in boundary} == {"0.5", "1.0", "10.0"}
    for row in boundary:
        by_hand = 0.7e3 * float(row["deadline_s"]) / (2.0 * float(row["level"]) - 0.49)
        assert float(row["value"]) == near(by_hand, rel=1e-9)
    text = words(evenload("need", study, "--map", "activity", "--points", "3").out)
    assert "boundary of advantage 1" in text
    assert "share of the map" in text


def test_improve_and_flips(evenload: Run, study: Path):
    text = words(evenload("need", WORD_LINE, "--improve").out)
    assert "resistance and transit at most 1.368, then limited by wire; 1.5 not reached" in text
    text = words(evenload("need", study, "--flips", "2").out)
    assert "no pair of inputs changes that inside the 0 ranges" in text
    assert rows(evenload("need", study, "--flips", "1", "--format", "csv").out) == []


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (["activty"], "there is no value 'activty' in this study; did you mean 'activity'?"),
        (["on_resistance"], "'on_resistance' is a value of several owners; name one of"),
        (["activity", "--pair", "n2"], "there is no node pair 'n2'; known are n1"),
        (["activity", "--over", "0.1"], "--over needs LOW..HIGH in the unit of the value, found '0.1'"),
        (["activity", "--over", "0.3..0.1"], "the range needs its low end below its high end"),
        (["activity", "--over", "0.3..many"], "study.activity: 'many' is not a number in 1"),
        (["activity", "--over", "0.3..2"], "study.activity: 2 is out of its domain; allowed: between 0 and 1"),
        (["activity", "--over", "0.1..0.2", "--over", "0.1..0.2"], "2 ranges for 1 value(s)"),
        (["activity", "--advantage", "0"], "an advantage above 0 is needed, found 0"),
        (["activity", "--format", "xml"], "--format: 'xml' is not one of text, csv, json"),
        (["activity", "--points", "1"], "--points needs 2 or more"),
        (["--trade", "activity"], "--trade needs exactly two names, found 1"),
        (["--trade", "activity", "activity"], "a trade curve needs two different values"),
        (["--sheet", "--improve"], "--sheet and --improve are different questions; ask one at a time"),
        (["--improve", "activity"], "--improve takes no names"),
        (["--sheet", "--over", "0.1..0.2"], "--sheet takes no --over"),
        (["--map", "speed"], "a map over 'speed' is not known; known are activity, duty"),
        (["--map", "duty"], "a map over duty needs a study that states an idle scheme"),
        (["activity", "--probability", "0.9"], "--probability belongs to --sheet"),
        (["--sheet", "--probability", "1"], "a probability above 0 and below 1 is needed, found 1"),
        (["--sheet", "--probability", "0.9", "--draws", "10"], "draws must be a power of two"),
        (["--flips", "4"], "sets of 1, 2 or 3 inputs can be looked for, found 4"),
    ],
)
def test_wrong_use_is_answered_in_words(arguments: list[str], message: str, evenload: Run, study: Path):
    ran = evenload("need", study, *arguments)
    assert ran.status == 2
    assert message in words(ran.err)
    assert ran.out == ""


def test_sheet_of_values_together(evenload: Run, tmp_path: Path):
    path = fixed_displacement().write(tmp_path / "film")
    ran = evenload("need", path, "--sheet", "--together", "--probability", "0.9", "--draws", "64", "--seed", "2")
    text = words(ran.out)
    assert "one standard deviation of a value counts as hard as halving its spread" in text
    # ln(1.5 / 2) / 0.6 steps at the best estimates
    assert "1.5 is met exactly where 0.4795 steps may be given up (today 2)" in text
    assert "with probability 0.9" in text
    assert "film-switch.declared_supply follows by its formula: " in text
    found = rows(evenload("need", path, "actuator_coefficient", "film-switch.input_capacitance", "--sheet",
                          "--together", "--format", "csv").out)  # fmt: skip
    assert float(found[0]["required"]) == near(200.0 * 0.75 ** (1.0 / 3.0), rel=1e-6)
    assert found[0]["spread_today"] == "lognormal, ln_sd = 0.2"
    assert found[0]["spread_at_probability"] == ""


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (["activity", "--draws", "64"], "--draws without --probability: nothing would be drawn"),
        (["--sheet", "--draws", "64", "--seed", "1"], "--draws and --seed without --probability: nothing would be"),
        (["--together"], "--together belongs to --sheet"),
        (["--improve", "--together"], "--improve takes no --together"),
        (["--improve", "--probability", "0.9"], "--improve takes no --probability"),
        (["--flips", "0"], "sets of 1, 2 or 3 inputs can be looked for, found 0"),
        (["--flips", "1", "--points", "5"], "--flips takes no --points"),
        (["--over", "0.1..0.2"], "--over needs the names of the values whose ranges it states"),
        (["required_advantage", "activity", "--over", "1..2"], "required_advantage takes no range"),
        (["--sheet", "--together"], "a joint sheet needs values with a stated spread"),
    ],
)
def test_an_option_without_effect_is_refused(arguments: list[str], message: str, evenload: Run, study: Path):
    ran = evenload("need", study, *arguments)
    assert ran.status == 2
    assert message in words(ran.err)
    assert ran.out == ""


def test_draws_without_a_probability_are_refused_in_python_too(study: Path):
    for asked in (api.sheet, api.joint_sheet):
        with pytest.raises(UsageError, match="seed given without a probability, so nothing would be drawn"):
            asked(study, seed=1)
