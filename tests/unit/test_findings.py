"""Findings: only numbers of the record, each with a section of the report that exists."""

from __future__ import annotations

import math
import re
from pathlib import Path

import pytest

from benchmark.api.result import Result
from benchmark.record.findings import findings
from benchmark.record.load import load_study
from benchmark.record.ratio_only import ratio_only
from benchmark.record.run import run_study
from benchmark.record.text import probability, uncertainty_words
from benchmark.report.blocks import Paragraph
from benchmark.report.section_uncertainty import uncertainty
from benchmark.sets.study import DrawSettings
from tests.fixed_displacement import fixed_displacement
from tests.studies import hub

NUMBER = re.compile(r"(?<![\w.-])\d+(?:\.\d+)?(?:e[+-]?\d+)?")


@pytest.fixture(scope="module")
def record(tmp_path_factory: pytest.TempPathFactory):
    path = fixed_displacement().write(tmp_path_factory.mktemp("study"))
    study, library = load_study(path)
    return run_study(study, library, created="2026-01-31T00:00:00Z", draws=DrawSettings(256))


def test_three_to_six_sentences_with_their_place(record, tmp_path: Path):
    found = record["findings"]
    assert 3 <= len(found) <= 6
    Result(record).report(tmp_path / "report.html")
    page = (tmp_path / "report.html").read_text(encoding="utf-8")
    assert all(f'<section id="{row["at"]}"' in page for row in found)
    assert all(row["text"].endswith(".") for row in found)


def test_a_finding_leads_to_the_row_of_its_numbers(record, tmp_path: Path):
    Result(record).report(tmp_path / "report.html")
    page = (tmp_path / "report.html").read_text(encoding="utf-8")
    table = page.partition('<section id="findings"')[2].partition("</section>")[0]
    links = re.findall(r'href="#([^"]+)"', table)
    assert all(f'id="{link}"' in page for link in links)
    assert {"point-candidate-advantage", "point-candidate-time", "point-candidate-energy"} <= set(links)
    told = " ".join(row["text"] for row in record["findings"] if row["at"] in ("moves", "next-measurement"))
    named = {place for place, row in enumerate(record["ledger"], start=1) if row["key"] in told}
    assert named
    assert {f"value-{place}" for place in named} <= set(links)


def _numbers(node) -> set[float]:
    """Every number of a record, the lengths of its lists, and the numbers inside its names."""
    if isinstance(node, dict):
        return set().union(*map(_numbers, node.values())) if node else set()
    if isinstance(node, list):
        return {float(len(node))}.union(*map(_numbers, node))
    if isinstance(node, bool) or node is None:
        return set()
    if isinstance(node, str):
        return {float(found) for found in NUMBER.findall(node)}
    return {abs(float(node)), 100.0 * abs(float(node))}


def _strays(texts, record) -> list[str]:
    """Numbers of sentences that no number of the record rounds to, at the digits they are printed with."""
    held = [number for number in _numbers(record) if math.isfinite(number)]
    printed = [word for text in texts for word in NUMBER.findall(text)]
    digits = [len(word.partition("e")[0].replace(".", "").lstrip("0")) or 1 for word in printed]
    decimals = [len(word.partition(".")[2]) for word in printed]
    return [
        word
        for word, some, places in zip(printed, digits, decimals, strict=True)
        if not any(float(f"{n:.{some}g}") == float(word) or round(n, places) == float(word) for n in held)
    ]


def test_every_number_is_one_of_the_record(record):
    texts = [row["text"] for row in record["findings"]]
    rest = {key: value for key, value in record.items() if key != "findings"}
    assert _strays(texts, rest) == []
    assert len([word for text in texts for word in NUMBER.findall(text)]) >= 12
    assert _strays(["an advantage of 2.718281828"], rest) == ["2.718281828"]
    text = " ".join(texts)
    assert "is 2 (reference / candidate), which reaches the required 1.5" in text
    assert not re.search(r"\btimes (less|more|lower|better)\b", text)


def _bare(record, without: bool):
    """The record as it is when no side or not the candidate has a permitted point, and nothing was drawn."""
    primary = record["policies"][0]
    contenders = [{**side, "point": None if without else side["point"]} for side in primary["contenders"]]
    gone = {**primary, "candidate": {**primary["candidate"], "point": None}, "contenders": contenders, "strongest": ""}
    more = {"verdict": {**record["verdict"], "advantage": None, "moves": []}, "policies": [gone]}
    return {**record, **more, "uncertainty": None, "ladder": [], "nodes": [], "requirements": []}


@pytest.mark.parametrize("without", [False, True])
def test_three_findings_also_where_no_advantage_exists(record, without: bool):
    bare = _bare(record, without)
    found = findings(bare)
    assert 3 <= len(found) <= 6
    assert _strays([row["text"] for row in found], bare) == [] or not without
    side = "no side has" if without else "the candidate has no"
    assert found[0]["text"].startswith(f"No advantage exists: {side}")
    unknown = [{**record["requirements"][0], "state": "unknown"}] if record["requirements"] else []
    assert 3 <= len(findings({**bare, "requirements": unknown})) <= 6
    old = {key: value for key, value in bare.items() if key != "robustness"}
    assert len(findings(old)) == 3


def test_a_required_time_that_nothing_meets_gives_three_findings(tmp_path: Path):
    path = hub().write(tmp_path)
    policy = 'primary = "iso-delay"\nrequired_time = { value = 1, unit = "fs" }'
    path.write_text(path.read_text(encoding="utf-8").replace('primary = "minimum-energy"', policy), encoding="utf-8")
    study, library = load_study(path)
    made = run_study(study, library, created="2026-01-31T00:00:00Z")
    assert made["verdict"]["advantage"] is None
    assert (
        made["findings"][0]["text"] == "No advantage exists: no side has a permitted point under the policy iso-delay."
    )
    assert 3 <= len(made["findings"]) <= 6


@pytest.mark.parametrize(
    ("without", "words"),
    [
        (0, "every input that moves the result has one"),
        (1, "1 input without a range stays at its value and counts as decisive"),
        (7, "7 inputs without a range stay at their value and each counts as decisive"),
    ],
)
def test_a_probability_says_what_was_not_drawn_in_its_sentence(record, without, words):
    changed = {**record, "verdict": {**record["verdict"], "inputs_without_range": without}}
    claimed = next(row["text"] for row in findings(changed) if "probability" in row["text"])
    assert f"(under the stated ranges; {words})" in claimed
    answer = uncertainty_words(changed)[0]
    assert answer.startswith("Under the stated ranges")
    assert words in answer.partition(". The ranges of")[0]
    drawn = {
        **changed["uncertainty"],
        "reaches_at_open_ends": {"value": 0.5, "error": 0.01},
        "bounds": [{"key": "a.b"}],
    }
    bounded = {**changed, "uncertainty": drawn}
    section = uncertainty(bounded, Paragraph("figure"))
    said = [block.text for block in section.blocks if isinstance(block, Paragraph) and "probability is" in block.text]
    assert said == [f"a.b; at their open ends the probability is 0.500 ± 0.010 (under the stated ranges; {words})."]
    assert f"(under the stated ranges; {words})" in uncertainty_words(bounded)[2 if drawn["without_candidate"] else 1]


def test_they_follow_the_record(record):
    """Another number in the record gives another sentence: nothing is remembered."""
    changed = {**record, "verdict": {**record["verdict"], "advantage": 1.2}}
    assert "is 1.2 (reference / candidate), which does not reach the required 1.5" in findings(changed)[0]["text"]
    failed = [{**record["requirements"][0], "state": "fail"}]
    assert findings({**record, "requirements": failed})[0]["text"].startswith("The candidate fails 1 requirement(s)")
    stop = {**record, "uncertainty": {**record["uncertainty"], "stop": True}, "ladder": [], "nodes": []}
    assert findings(stop)[-1]["text"] == "No measurement of these inputs can change the answer within their ranges."


def test_a_record_without_absolute_values_has_the_same_findings(record):
    assert [row["at"] for row in ratio_only(record)["findings"]] == [row["at"] for row in record["findings"]]


@pytest.mark.parametrize(
    ("found", "words"),
    [
        ({"value": 0.0, "error": 0.0}, "0 (none of 256 draws; at most 0.012 at 95 %)"),
        ({"value": 1.0, "error": 0.0}, "1 (all of 256 draws; at least 0.9883 at 95 %)"),
        ({"value": 0.5, "error": 0.0}, "0.5 (the same in all scrambles)"),
        ({"value": 0.73912, "error": 0.0051}, "0.7391 ± 0.0051"),
        ({"value": 0.25, "error": 0.03}, "0.250 ± 0.030"),
    ],
)
def test_a_probability_is_printed_with_what_bounds_it(found, words):
    assert probability(found, 256) == words
