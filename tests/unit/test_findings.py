"""Findings: only numbers of the record, each with a section of the report that exists."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from benchmark.api.result import Result
from benchmark.record.findings import findings
from benchmark.record.load import load_study
from benchmark.record.ratio_only import ratio_only
from benchmark.record.run import run_study
from benchmark.record.text import probability
from benchmark.sets.study import DrawSettings
from tests.fixed_displacement import fixed_displacement


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


def test_every_number_is_one_of_the_record(record):
    text = " ".join(row["text"] for row in record["findings"])
    assert "is 2 (reference / candidate), which reaches the required 1.5" in text
    assert f"probability of {record['uncertainty']['reaches']['value']:.3f}"[:19] in text
    assert not re.search(r"\btimes (less|more|lower|better)\b", text)


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
