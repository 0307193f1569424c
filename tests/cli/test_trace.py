"""``evenload trace``: a reader recombines every printed result from the printed numbers alone."""

from __future__ import annotations

import copy
import json
import math
import re
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pytest

from benchmark.cli.arithmetic import Sheet
from benchmark.decide.compare import Comparison
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.points import design_points
from benchmark.record.load import load_study
from tests.cli.conftest import Run
from tests.refusals import CIRCUIT
from tests.studies import Inputs, hub, mixed, v

#: six significant digits: half a unit of the sixth digit is 5e-6, and a line may combine a dozen numbers
ROUNDING = 6e-5
NUMBER = r"-?(?:\d+(?:\.\d+)?(?:e[+-]?\d+)?|inf)"


@dataclass(frozen=True)
class Line:
    """symbol = formula = numbers = result unit; the first two are empty where a number is given."""

    symbol: str
    formula: str
    numbers: str
    result: str
    unit: str


def _logical_lines(text: str) -> list[str]:
    """Join what was broken before an equals sign."""
    found: list[str] = []
    for line in text.splitlines():
        if re.match(r" +=", line):
            found[-1] += " " + line.strip()
        else:
            found.append(line)
    return found


def _parse(text: str) -> list[Line]:
    found = []
    for line in _logical_lines(text):
        match = re.fullmatch(r"  (\w+) = (.*)", line)
        if match is None:
            continue
        body = match.group(2).split("    ")[0]
        *middle, last = body.split(" = ")
        result = re.fullmatch(rf"({NUMBER})(?: (\S.*))?", last)
        assert result is not None, line
        formula = middle[0] if middle else ""
        found.append(
            Line(match.group(1), formula, middle[-1] if middle else "", result.group(1), result.group(2) or "")
        )
    return found


def _recombine(lines: list[Line]) -> dict[str, str]:
    """Check every line; returns the last printed number of every symbol."""
    printed: dict[str, str] = {}
    calculated = 0
    for line in lines:
        if line.formula:
            names = set(re.findall(r"[A-Za-z_]\w*", line.formula)) - {"max", "ln"}
            # the numbers are those printed before, put in one by one
            put_in = re.sub(r"[A-Za-z_]\w*", lambda name: printed.get(name.group(), name.group()), line.formula)
            assert put_in == line.numbers, line.symbol
            assert names <= set(printed), line.symbol
            value = eval(line.numbers, {"__builtins__": {}}, {"max": max, "ln": math.log})
            assert math.isclose(value, float(line.result), rel_tol=ROUNDING, abs_tol=0.0), line
            calculated += 1
        printed[line.symbol] = line.result
    assert calculated > 20
    return printed


def _hub(**choices: Any) -> Inputs:
    return hub(activity="0.05", contenders=("low-leakage",), **choices)


def _block() -> Inputs:
    """Registers, NAND stacks, nets in gate pitches, a size knob and the chain rule, at two temperatures."""
    inputs = mixed()
    inputs.study["workload"]["circuit"] = "random-logic"
    values = inputs.study["value"]
    del values["average_net_length"]
    values |= {"gate_count": v(100), "register_count": v(10), "average_net_pitches": v(5)}
    inputs.study["candidate"]["knobs"]["size"] = {"values": [2]}
    inputs.study["contender"][0]["knobs"]["size"] = {"values": [3]}
    return inputs


def _word_line() -> Inputs:
    """A circuit of the user's own: a swing from outside, a layer of its own, a fixed load."""
    inputs = hub()
    inputs.study["workload"]["circuit"] = "word-line"
    for name in ("activity", "logic_depth", "fan_out"):
        del inputs.study["value"][name]
    inputs.texts["word-line.toml"] = CIRCUIT + '[[net]]\nname = "end"\ndriver = "nor3"\nrising_per_operation = 0.1\n'
    return inputs


STUDIES: dict[str, tuple[Inputs, str]] = {
    "hub": (hub(), "fast"),
    "hub without leakage": (hub(), "candidate"),
    "hub, gated": (_hub(idle="gated"), "low-leakage"),
    "hub, ungated": (_hub(idle="ungated"), "low-leakage"),
    "mixed, overheads": (mixed(), "candidate"),
    "mixed, two temperatures": (mixed(), "old-switch"),
    "block of copies": (_block(), "candidate"),
    "block of widths": (_block(), "old-switch"),
    "word line": (_word_line(), "candidate"),
}


@pytest.mark.parametrize("name", STUDIES)
def test_every_printed_result_recombines_from_the_printed_numbers(name: str, tmp_path: Path, evenload: Run):
    inputs, side = STUDIES[name]
    study, _ = load_study(inputs.write(tmp_path))
    ran = evenload("trace", "study.toml", "--side", side)
    assert (ran.status, ran.err) == (0, "")
    printed = _recombine(_parse(ran.out))
    # ... and what comes out is what the program itself says
    comparison = Comparison(study, study.pair(study.headline), Batch.best_estimate())
    run = comparison.candidate if side == "candidate" else comparison.contenders[side]
    best = comparison.side_outcome(study.policy.primary, run, comparison.policy_inputs()).optimum.points
    expected = {"E": best.energy, "T_path": best.time, "P_leak": best.leakage_power, "V": best.supply}
    for symbol, value in expected.items():
        assert float(printed[symbol]) == pytest.approx(float(value[0, 0]), rel=1e-5), symbol
    assert ran.out.count("; agrees") == 3
    assert "DISAGREES" not in ran.out


def test_the_parser_notices_a_wrong_result(tmp_path: Path, evenload: Run):
    hub().write(tmp_path)
    text = evenload("trace", "study.toml").out
    wrong = text.replace("E_core/eta + E_ls = 8e-16/1 + 0 = 8e-16", "E_core/eta + E_ls = 8e-16/1 + 0 = 9e-16")
    assert wrong != text
    with pytest.raises(AssertionError):
        _recombine(_parse(wrong))


def test_a_supply_asked_for(tmp_path: Path, evenload: Run):
    study, _ = load_study(mixed().write(tmp_path))
    ran = evenload("trace", "study.toml", "--side", "old-switch", "--supply", "0.55")
    printed = _recombine(_parse(ran.out))
    assert printed["V"] == "0.55"
    assert "Point: supply 0.55 V as asked for, frozen choices of the optimum under iso-delay" in ran.out
    import numpy as np

    comparison = Comparison(study, study.pair("g1"), Batch.best_estimate())
    points = design_points(comparison.contenders["old-switch"].problem, np.array([[0.55]]))
    assert float(printed["E"]) == pytest.approx(float(points.energy[0, 0]), rel=1e-5)


def test_a_node_pair_asked_for(tmp_path: Path, evenload: Run):
    mixed().write(tmp_path)
    one, two = (evenload("trace", "study.toml", "--node", label).out for label in ("g1", "g2"))
    assert "node g2 of pair g2" in two
    assert evenload("trace", "study.toml").out == one
    assert _recombine(_parse(two))["R_down"] == "40000"
    assert _recombine(_parse(one))["R_down"] == "50000"


def test_what_if_numbers_are_said_and_used(tmp_path: Path, evenload: Run):
    hub().write(tmp_path)
    ran = evenload("trace", "study.toml", "--set", "activity=0.1")
    assert "What-if: activity = 0.1\n" in ran.out
    assert _recombine(_parse(ran.out))["a_1"] == "0.1"


def test_a_point_that_cannot_be_used_says_why(tmp_path: Path, evenload: Run):
    hub().write(tmp_path)
    ran = evenload("trace", "study.toml", "--supply", "1.5")
    assert ran.status == 0
    assert "Not usable here: stated at one supply only." in ran.out


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (
            ["--side", "fasst"],
            "--side: there is no 'fasst' at pair n1; known are candidate, fast, low-leakage; did you mean 'fast'?",
        ),
        (["--side", ""], "--side: there is no '' at pair n1; known are candidate, fast, low-leakage"),
        (["--node", "n2"], "--node: there is no pair 'n2'; known are n1"),
        (["--supply", "0"], "--supply needs a positive number of volts, found 0"),
        (["--supply", "nan"], "--supply needs a positive number of volts, found nan"),
        (["--supply=-1"], "--supply needs a positive number of volts, found -1"),
        (["--nodes", "none"], "--nodes: none is not a folder"),
    ],
)
def test_wrong_usage(arguments: list[str], message: str, tmp_path: Path, evenload: Run):
    hub().write(tmp_path)
    ran = evenload("trace", "study.toml", *arguments)
    assert (ran.status, ran.out, ran.err) == (2, "", f"evenload: {message}\n")


def test_a_side_without_a_permitted_point_needs_a_supply(tmp_path: Path, evenload: Run):
    hub(relay_delay="600").write(tmp_path)
    ran = evenload("trace", "study.toml")
    assert (ran.status, ran.out) == (2, "")
    assert ran.err == (
        "evenload: candidate has no permitted design point under minimum-energy; name one with --supply\n"
    )
    asked = evenload("trace", "study.toml", "--supply", "2.0")
    assert float(_recombine(_parse(asked.out))["T_path"]) == pytest.approx(12e-6, rel=1e-4)


# -- from a record ---------------------------------------------------------------------------------------------


@pytest.fixture
def record(tmp_path: Path, evenload: Run, quick: None) -> Path:
    """A record folder whose inputs are gone."""
    inputs = copy.deepcopy(mixed())
    inputs.texts["nodes/sources.toml"] = (
        'schema = 1\n[own]\nkind = "measurement"\nauthors = ["team"]\nyear = 2026\ntitle = "Own"\nread = "original"\n'
    )
    inputs.sets["technologies/old-switch"]["value"]["off_current"]["source"] = "own"
    inputs.write(tmp_path / "inputs")
    assert evenload("run", "inputs/study.toml", "--out", "record", "--set", "activity=0.04").status == 0
    (tmp_path / "before.txt").write_text(evenload("trace", "inputs/study.toml", "--set", "activity=0.04").out)
    (tmp_path / "inputs").rename(tmp_path / "elsewhere")
    return tmp_path / "record"


def test_a_record_is_traced_from_its_own_inputs(record: Path, evenload: Run):
    before = (record.parent / "before.txt").read_text()
    assert evenload("trace", "record").out == before
    assert evenload("trace", "record/record.json").out == before
    assert _recombine(_parse(before))["a_1"] == "0.04"
    changed = evenload("trace", "record", "--set", "activity=0.06").out  # on top of what the record was made with
    assert _recombine(_parse(changed))["a_1"] == "0.06"


def _spoil(record: Path, **changes: Any) -> None:
    path = record / "record.json"
    data = json.loads(path.read_text(encoding="utf-8"))
    data["files"][0] |= changes
    path.write_text(json.dumps(data), encoding="utf-8")


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"text": "schema = 1\n"}, "the record's copy of study.toml does not have the digest the record states"),
        ({"name": "../study.toml"}, "the record names an input file outside its folder: '../study.toml'"),
        ({"name": "/other/study.toml"}, "the record names an input file outside its folder: '/other/study.toml'"),
        ({"name": "C:study.toml"}, "the record names an input file outside its folder: 'C:study.toml'"),
        ({"name": ""}, "the record names an input file outside its folder: ''"),
        ({"kind": "wires"}, "the record holds no study file"),
        (
            {"text": 5},
            "the record lacks what is needed to run it again (AttributeError: 'int' object has no attribute 'encode')",
        ),
    ],
)
def test_a_record_that_was_tampered_with(changes: dict[str, Any], message: str, record: Path, evenload: Run):
    _spoil(record, **changes)
    ran = evenload("trace", "record")
    assert (ran.status, ran.out, ran.err) == (3, "", f"evenload: {message}\n")
    assert not (record.parent / "study.toml").exists()


@pytest.mark.parametrize(
    ("text", "message"),
    [
        (None, "does not exist"),
        ("{half", "is not a readable record (JSONDecodeError)"),
        ("[1]", "record schema 'list' is not the one this version reads (1)"),
        ('{"schema": 2}', "record schema 2 is not the one this version reads (1)"),
        ('{"schema": 1}', "the record lacks what is needed to run it again (KeyError: 'files')"),
        ("[" * 100_000, "is not a readable record (RecursionError)"),
    ],
)
def test_a_folder_that_is_no_record(text: str | None, message: str, tmp_path: Path, evenload: Run):
    (tmp_path / "record").mkdir()
    if text is not None:
        (tmp_path / "record" / "record.json").write_text(text)
    ran = evenload("trace", "record")
    assert (ran.status, ran.out) == (3, "")
    assert ran.err.endswith(f"{message}\n")
    assert ran.err.count("\n") == 1


# -- the sheet -------------------------------------------------------------------------------------------------


def test_a_sheet_prints_what_it_computes():
    sheet = Sheet()
    sheet.given("a", 2.0, "V", "meaning")
    sheet.given("b", -3.0, "1", "meaning")
    assert sheet.result("c", "max(a, b)*a**2 + ln(a) - b/a", "V^2", "said") == pytest.approx(8 + math.log(2) + 1.5)
    assert sheet.lines == [
        "  a = 2 V    meaning",
        "  b = -3    meaning",
        "  c = max(a, b)*a**2 + ln(a) - b/a = max(2, (-3))*2**2 + ln(2) - (-3)/2 = 10.1931 V^2    said",
    ]


def test_what_is_no_number_stays_none():
    sheet = Sheet()
    sheet.given("a", math.nan, "V", "unknown")
    sheet.given("zero", 0.0, "1", "nothing")
    for formula in ("max(1, a)", "1/zero", "ln(zero)", "a + 1"):
        assert math.isnan(sheet.result("x", formula, "1"))
    assert sheet.lines[0] == "  a = not-a-number V    unknown"


@pytest.mark.parametrize("formula", ["a if a else a", "[a]", "a % a", "__import__('os')"])
def test_a_sheet_knows_only_arithmetic(formula: str):
    sheet = Sheet()
    sheet.given("a", 2.0, "V", "meaning")
    with pytest.raises((ValueError, KeyError)):
        sheet.result("x", formula, "1")
