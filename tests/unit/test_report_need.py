"""What would change the answer, in a record and its report: the same numbers as ``need`` gives."""

from __future__ import annotations

from pathlib import Path

from benchmark import api
from tests.fixed_displacement import fixed_displacement


def test_answers_stand_in_the_record_and_the_report(tmp_path: Path):
    view = api.load_study(fixed_displacement().write(tmp_path))
    result = api.run(view, created="2026-01-31T00:00:00Z", need=True)
    blocks = {row["key"]: row for row in result.record["need"]}
    # self-timed: no deadline to map
    assert list(blocks) == ["break-evens", "sheet", "joint-sheet", "trade", "improve", "flips"]
    sheet = api.sheet(view)
    assert [fact[1] for fact in blocks["sheet"]["facts"]] == [text for _, text in sheet.facts]
    result.report(tmp_path / "report.html")
    page = (tmp_path / "report.html").read_text(encoding="utf-8")
    assert '<section id="need-sheet"' in page
    # d = 200 pm/V sqrt(1.5 / 2) = 173.2 pm/V: A = 1.5 there
    assert "173.2" in page


def test_without_asking_the_report_says_how_to_ask(tmp_path: Path):
    result = api.run(fixed_displacement().write(tmp_path), created="2026-01-31T00:00:00Z")
    assert "need" not in result.record
    result.report(tmp_path / "report.html")
    assert "Not worked out in this record: run with --need" in (tmp_path / "report.html").read_text(encoding="utf-8")
