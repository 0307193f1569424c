"""Criteria locked at the first run into a folder: a later change of them is said with both dates."""

from __future__ import annotations

import functools
import json
import tempfile
from pathlib import Path
from typing import Any

import pytest

from benchmark import api
from benchmark.api import Result
from benchmark.record.criteria import criteria_words, with_earlier
from benchmark.record.ratio_only import ratio_only
from benchmark.report.folder import report_page
from tests import studies
from tests.fixed_displacement import fixed_displacement

FIRST, SECOND, THIRD = "2026-01-12T00:00:00Z", "2026-02-20T00:00:00Z", "2026-03-01T00:00:00Z"


@functools.cache
def _record(required: str) -> dict[str, Any]:
    with tempfile.TemporaryDirectory() as folder:
        return studies.run(fixed_displacement(required=required), Path(folder)) | {"what_if": {}}


def made(required: str, date: str) -> dict[str, Any]:
    """A record as if it had been made on a date."""
    record = _record(required)
    return {**record, "created": date, "criteria": {**record["criteria"], "fixed": date}}


def saved(folder: Path, record: dict[str, Any]) -> dict[str, Any]:
    """What a run into a folder writes, without drawings."""
    written = dict(Result(record).after(folder).record)
    folder.mkdir(exist_ok=True)
    (folder / "record.json").write_text(json.dumps(written), encoding="utf-8")
    return written


def test_the_first_run_fixes_them(tmp_path: Path):
    record = saved(tmp_path / "a", made("1.5", FIRST))
    criteria = record["criteria"]
    assert (criteria["fixed"], criteria["earlier"]) == (FIRST, [])
    assert criteria["stated"]["required advantage"] == 1.5
    assert criteria["stated"]["requirement deadline"].startswith("hard, limit 1e-06 s")
    assert criteria_words(record) == ""


def test_a_later_run_with_the_same_keeps_the_first_date(tmp_path: Path):
    saved(tmp_path / "a", made("1.5", FIRST))
    again = saved(tmp_path / "a", made("1.5", SECOND))
    assert (again["created"], again["criteria"]["fixed"]) == (SECOND, FIRST)
    assert criteria_words(again) == ""


def test_edit_the_required_advantage_after_a_run_and_the_report_says_so(tmp_path: Path):
    saved(tmp_path / "a", made("1.5", FIRST))
    later = saved(tmp_path / "a", made("2.0", SECOND))
    words = f"those of this run were first used on {SECOND}; before: used on {FIRST}, required advantage 1.5 -> 2."
    assert criteria_words(later) == words
    page = report_page(later)
    start, question = page.index('id="answer"'), page.index('id="question"')
    assert start < page.index("Criteria changed after results:") < question
    assert words.replace(">", "&gt;") in page
    # a third run with the changed ones still says so, with the date of the second
    third = saved(tmp_path / "a", made("2.0", THIRD))
    assert criteria_words(third) == words
    # and a fourth with others again lists both
    fourth = saved(tmp_path / "a", made("3.0", THIRD))
    assert f"used on {FIRST}, required advantage 1.5 -> 3" in criteria_words(fourth)
    assert f"used on {SECOND}, required advantage 2 -> 3" in criteria_words(fourth)


def test_a_page_of_a_first_run_says_since_when_they_are_locked_and_no_more():
    record = made("1.5", FIRST)
    page = report_page(record)
    assert "Criteria changed" not in page
    assert f"; locked at the first run with them, {FIRST}, by sha256 {record['criteria']['digest']}</dd>" in page


def test_other_studies_and_new_folders_change_nothing(tmp_path: Path):
    other = made("1.5", FIRST)
    saved(tmp_path / "a", {**other, "study": {**other["study"], "id": "another"}})
    assert Result(made("2.0", SECOND)).after(tmp_path / "a").record == made("2.0", SECOND)
    assert Result(made("2.0", SECOND)).after(tmp_path / "b").record == made("2.0", SECOND)


def test_asking_twice_is_asking_once(tmp_path: Path):
    saved(tmp_path / "a", made("1.5", FIRST))
    once = Result(made("2.0", SECOND)).after(tmp_path / "a")
    assert once.after(tmp_path / "a").record == once.record


@pytest.mark.parametrize(
    ("text", "note"),
    [
        ("{", "could not be read"),
        ('{"schema": 9}', "could not be read"),
        (None, "do not have the digest stated there"),
    ],
)
def test_what_cannot_be_trusted_is_named(tmp_path: Path, text: str | None, note: str):
    if text is None:  # the earlier required advantage was edited in the record
        record = made("1.5", FIRST)
        record["criteria"] = {
            **record["criteria"],
            "stated": {**record["criteria"]["stated"], "required advantage": 2.0},
        }
        text = json.dumps(record)
    (tmp_path / "record.json").write_text(text, encoding="utf-8")
    found = Result(made("2.0", SECOND)).after(tmp_path).record
    assert note in found["criteria"]["note"]
    assert note in criteria_words(found)


def test_a_record_without_criteria_counts_as_none(tmp_path: Path):
    old = {name: value for name, value in made("1.5", FIRST).items() if name != "criteria"}
    saved(tmp_path / "a", old)
    assert saved(tmp_path / "a", made("2.0", SECOND))["criteria"]["earlier"] == []
    assert with_earlier(made("2.0", SECOND)["criteria"], None) == made("2.0", SECOND)["criteria"]


def test_ratios_only_tell_the_change_and_its_dates_and_leave_the_limits_out(tmp_path: Path):
    saved(tmp_path / "a", made("1.5", FIRST))
    later = made("2.0", SECOND)
    stated = later["criteria"]["stated"] | {"requirement deadline": "hard, limit 7.7777e-07 s"}
    later["criteria"] = later["criteria"] | {"stated": stated, "digest": "0" * 64}
    later = dict(Result(later).after(tmp_path / "a").record)
    record = ratio_only(later)
    words = criteria_words(record)
    assert f"first used on {SECOND}; before: used on {FIRST}, required advantage 1.5 -> 2; " in words
    assert "requirement deadline [left out] -> [left out]" in words
    assert "Criteria changed after results:" in report_page(record)
    text = json.dumps(record["criteria"])
    assert later["criteria"]["digest"] not in text
    assert made("1.5", FIRST)["criteria"]["digest"] not in text
    assert "limit" not in text
    assert "7.7777" not in text
    assert record["criteria"]["stated"]["required advantage"] == 2.0
    # it is made of a record that has been continued, and stays as it is
    assert Result(record).after(tmp_path / "a").record == record
    # what was written with ratios only cannot tell whether the criteria of the next run are the same
    saved(tmp_path / "b", record)
    note = "the earlier record holds ratios only, so whether its criteria were the same is not known"
    assert Result(made("2.0", THIRD)).after(tmp_path / "b").record["criteria"]["note"] == note


def test_an_earlier_record_elsewhere_counts_when_it_is_named(tmp_path: Path):
    """Another folder does not make changed criteria the first ones: the record that is compared with has the date."""
    old = api.run(fixed_displacement().write(tmp_path / "old"), created=FIRST)
    new = fixed_displacement(required="2.0").write(tmp_path / "new")
    result = api.run(new, created=SECOND, since=old, anyway=True)
    words = f"those of this run were first used on {SECOND}; before: used on {FIRST}, required advantage 1.5 -> 2."
    assert criteria_words(result.record) == words
    same = api.run(new, created=THIRD, since=result)
    assert same.record["criteria"]["fixed"] == SECOND
    assert criteria_words(same.record) == words
