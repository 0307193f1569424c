"""Criteria locked at the first run into a folder: a later change of them is said with both dates."""

from __future__ import annotations

import functools
import json
import tempfile
from pathlib import Path
from typing import Any

import pytest

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


def test_a_page_of_a_first_run_says_nothing():
    assert "Criteria changed" not in report_page(made("1.5", FIRST))


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


def test_ratios_only_leave_the_limits_out():
    assert "criteria" not in ratio_only(made("1.5", FIRST))
