"""``evenload changes``: records, reports, studies, sets and revisions; text, csv, json; every message."""

from __future__ import annotations

import csv
import html
import io
import json
import re
import shutil
import subprocess
from collections.abc import Callable
from pathlib import Path

import pytest

from benchmark.record.changes import read_any_record
from benchmark.report.folder import fill_folder
from benchmark.report.page import embedded_record
from tests.cli.conftest import Ran, read
from tests.fixed_displacement import fixed_displacement

Run = Callable[..., Ran]
SET = "old/nodes/technologies/film-switch.toml"
_WHOLE = fill_folder
pytestmark = pytest.mark.usefixtures("quick")


@pytest.fixture
def two(tmp_path: Path) -> tuple[Path, Path]:
    """Two studies that differ in the coefficient."""
    old = fixed_displacement().write(tmp_path / "old")
    return old, fixed_displacement(coefficient=("170.0", "0.05")).write(tmp_path / "new")


@pytest.fixture
def records(evenload: Run, two: tuple[Path, Path], tmp_path: Path) -> tuple[Path, Path]:
    for name, study in zip(("a", "b"), two, strict=True):
        ran = evenload("run", study, "--out", name, "--quiet", "--freeze-time", "2026-01-31T00:00:00Z")
        assert ran.status == 0, ran.err
    return tmp_path / "a", tmp_path / "b"


def test_records_reports_and_studies_say_the_same(evenload: Run, two, records, tmp_path: Path):
    first = evenload("changes", *records, "--format", "json")
    assert first.status == 0, first.err
    found = json.loads(first.out)
    assert found["attribution"][0]["total"] == pytest.approx(-0.32504, abs=5e-6)
    for folder in records:
        script = f'<script type="application/json" id="record">{embedded_record(read(folder, "record.json"))}</script>'
        (tmp_path / f"{folder.name}.html").write_text(f"<html>{script}</html>", encoding="utf-8")
    reports = json.loads(evenload("changes", "a.html", "b.html", "--format", "json").out)
    studies = json.loads(evenload("changes", *two, "--format", "json").out)
    for other in (reports, studies):
        for name in ("inputs", "attribution", "chain", "results", "identical", "verdict"):
            assert other[name] == found[name], name


def test_text_names_inputs_parts_chain_and_what_is_identical(evenload: Run, records):
    ran = evenload("changes", *records, "--additive")
    assert ran.status == 0, ran.err
    words = " ".join(ran.out.split())
    for text in (
        "Verdict flipped: conditional go -> not decidable on this evidence",
        "film-switch.actuator_coefficient",
        "-0.32504 (x 0.7225)",
        "+69.13 aJ",
        "new inputs at the old supply",
        "251.2 kohm",
        "Why now (1)",
        "Why now (2)",
    ):
        assert text in words, text
    same = len(json.loads(evenload("changes", *records, "--format", "json").out)["identical"])
    assert same > 10
    assert f"Results identical to the last bit: {same}." in ran.out, "their names are in csv and json"
    assert "contender stated-reference: energy" not in words
    assert all(len(line) <= 100 for line in ran.out.splitlines())


def test_csv_has_the_same_numbers_with_all_digits(evenload: Run, records):
    rows = list(csv.DictReader(io.StringIO(evenload("changes", *records, "--format", "csv").out)))
    found = json.loads(evenload("changes", *records, "--format", "json").out)
    parts = [row for row in rows if row["section"] == "part, logarithm" and row["node"] == "advantage"]
    assert {row["name"]: float(row["part"]) for row in parts} == found["attribution"][0]["parts"] | {
        "total": found["attribution"][0]["total"]
    }
    assert [row["name"] for row in rows if row["section"] == "identical"] == found["identical"]
    assert [row["name"] for row in rows if row["section"] == "input"] == [row["key"] for row in found["inputs"]]


def test_draws_on_both_sides_are_split(evenload: Run, two):
    ran = evenload("changes", *two, "--draws", "32")
    assert ran.status == 0, ran.err
    assert "part of the moved best estimates" in ran.out


def test_draws_that_only_one_side_has_are_a_setting_and_no_result(evenload: Run, two, tmp_path: Path):
    assert evenload("run", two[0], "--out", "a", "--quiet", "--draws", "32", "--seed", "5").status == 0
    assert evenload("run", two[0], "--out", "b", "--quiet", "--draws", "0").status == 0
    ran = evenload("changes", "a", "b")
    assert ran.status == 0, ran.err
    rows = [line.split() for line in ran.out.splitlines() if line.startswith("  draws ")]
    assert ["draws", "draws", "32", "none"] in rows
    assert ["draws", "seed", "5", "none"] in rows
    found = json.loads(evenload("changes", "a", "b", "--format", "json").out)
    drawn = {row["result"]: (row["old"], row["new"]) for row in found["results"] if row["result"].startswith("draws")}
    assert "draws: reaches" in drawn
    assert all(old is not None and new is None for old, new in drawn.values())


def test_another_question(evenload: Run, records, tmp_path: Path):
    fixed_displacement(required="2.0").write(tmp_path / "other")
    refused = evenload("changes", records[0], "other/study.toml")
    assert refused.status == 2
    assert "answer different questions (required advantage: 1.5 -> 2); --anyway" in refused.err
    asked = evenload("changes", records[0], "other/study.toml", "--anyway")
    assert asked.status == 0
    words = " ".join(asked.out.split())
    assert "Note: the criteria of the answer changed: required advantage (first used on 2026-01-31" in words


def test_two_sets(evenload: Run, tmp_path: Path):
    for name, case in (("old", {}), ("new", {"coefficient": ("170.0", "0.05")})):
        fixed_displacement(**case).write(tmp_path / name)
    place = "nodes/technologies/film-switch.toml"
    ran = evenload("changes", f"old/{place}", f"new/{place}", "--format", "json")
    assert ran.status == 0, ran.err
    found = json.loads(ran.out)
    assert [row["key"] for row in found["inputs"]] == ["actuator_coefficient", "declared_supply"]
    assert "attribution" not in found
    assert "Inputs that changed" in evenload("changes", f"old/{place}", f"new/{place}").out
    same = evenload("changes", f"old/{place}", f"old/{place}")
    assert "Inputs: none changed." in same.out
    mixed = evenload("changes", f"old/{place}", "new/study.toml")
    assert mixed.status == 2
    assert "one is a set of values, the other a study or its record" in mixed.err


def _git(*arguments: str) -> None:
    names = ["-c", "user.name=nobody", "-c", "user.email=nobody@example.invalid"]
    subprocess.run(["git", *names, *arguments], check=True, capture_output=True)


@pytest.mark.skipif(shutil.which("git") is None, reason="git is not installed")
def test_a_revision_of_a_set(evenload: Run, tmp_path: Path):
    fixed_displacement().write(tmp_path)
    _git("init", "-q")
    _git("add", ".")
    _git("commit", "-q", "-m", "first")
    fixed_displacement(coefficient=("170.0", "0.05")).write(tmp_path)
    place = "nodes/technologies/film-switch.toml"
    ran = evenload("changes", f"HEAD:{place}", place, "--format", "json")
    assert ran.status == 0, ran.err
    row = json.loads(ran.out)["inputs"][0]
    assert (row["key"], row["old"], row["new"]) == ("actuator_coefficient", 200.0, 170.0)
    absent = evenload("changes", f"HEAD:{place}x", place)
    assert absent.status == 3
    assert "there is no such file at HEAD" in absent.err
    unknown = evenload("changes", f"no-such:{place}", place)
    assert unknown.status == 3
    assert "git cannot give this revision" in unknown.err
    study = evenload("changes", "HEAD:study.toml", place)
    assert study.status == 3
    assert "is a study; of a revision only a set of values can be compared" in study.err


def test_without_git(evenload: Run, tmp_path: Path, monkeypatch: pytest.MonkeyPatch):
    fixed_displacement().write(tmp_path)
    monkeypatch.setenv("PATH", str(tmp_path))
    ran = evenload("changes", "HEAD:nodes/technologies/film-switch.toml", "nodes/technologies/film-switch.toml")
    assert ran.status == 2
    assert "git is not installed; give a file instead" in ran.err


@pytest.mark.parametrize(
    ("arguments", "status", "message"),
    [
        (("absent", "absent.toml"), 3, "absent: does not exist\nabsent.toml: does not exist"),
        (("other.html", "nix"), 3, "nix: does not exist"),
        (("other.htm", "nix"), 3, "other.htm: does not exist; did you mean 'other.html'?\nnix: does not exist"),
        ((":", "other.html"), 2, ": and other.html cannot be compared: one is a set of values"),
        ((":", ":"), 3, ":: does not exist; a revision of a set is written REVISION:path"),
        (("empty.html", "empty.html"), 3, "empty.html: holds no record; a report.html written by evenload run does"),
        (("gone.html", "gone.html"), 3, "gone.html: does not exist"),
        (("other.html", "other.html"), 3, "other.html: record schema 7 is not the one this version reads (1)"),
        (("ratio.json", "ratio.json"), 3, "ratio.json: holds ratios only"),
        (("a", "b", "--format", "pdf"), 2, "--format: 'pdf' is not one of text, csv, json"),
    ],
)
def test_messages(evenload: Run, tmp_path: Path, arguments, status: int, message: str):
    (tmp_path / "empty.html").write_text("<html></html>", encoding="utf-8")
    (tmp_path / "other.html").write_text('<script id="record">{"schema": 7}</script>', encoding="utf-8")
    (tmp_path / "ratio.json").write_text('{"schema": 1, "ratio_only": "yes"}', encoding="utf-8")
    ran = evenload("changes", *arguments)
    assert ran.status == status
    assert message in ran.err


def test_a_whole_report_gives_its_record_back(records, tmp_path: Path):
    from benchmark.report.folder import report_page

    record = read(records[0], "record.json")
    (tmp_path / "page.html").write_text(report_page(record), encoding="utf-8")
    assert read_any_record(tmp_path / "page.html") == record


@pytest.fixture
def drawn(quick: None, monkeypatch: pytest.MonkeyPatch) -> None:
    """Undo the leaving out of charts and reports."""
    from benchmark.report import folder

    monkeypatch.setattr("benchmark.report.folder.fill_folder", _WHOLE)
    assert folder.fill_folder is _WHOLE


@pytest.mark.usefixtures("drawn")
def test_a_run_since_an_earlier_record_says_what_changed(evenload: Run, two, tmp_path: Path):
    """As a folder and as a report; the comparison is the one of ``changes``, and it can be exported."""
    time = ("--freeze-time", "2026-01-31T00:00:00Z", "--quiet")
    assert evenload("run", two[0], "--out", "a", *time).status == 0
    ran = evenload("run", two[1], "--out", "b", "--since", "a", *time)
    assert ran.status == 0, ran.err
    tail = ran.out[ran.out.index("Since a:") :].splitlines()
    assert tail[1] == ("  Verdict flipped: conditional go -> not decidable on this evidence; advantage 2 -> 1.445.")
    assert tail[2] == "  Most of it by film-switch.actuator_coefficient (x 0.7225)."
    assert evenload("run", two[1], "--out", "c", "--since", "a/report.html", *time).status == 0
    change, again = (read(tmp_path / name, "record.json")["change"] for name in "bc")
    assert change["old"] | {"shown": ""} == again["old"] | {"shown": ""}
    assert [change[key] for key in change if key != "old"] == [again[key] for key in again if key != "old"]
    found = json.loads(evenload("changes", "a", "b", "--format", "json").out)
    for name in ("inputs", "attribution", "chain", "results", "identical", "verdict", "points", "other"):
        assert change[name] == found[name], name
    page = (tmp_path / "b" / "report.html").read_text(encoding="utf-8")
    assert '<section id="change"' in page
    assert '<figure id="chart-change-picture">' in page
    assert evenload("export", "b", "--figures", "figures").status == 0
    assert (tmp_path / "figures" / "change-picture-180mm.pdf").is_file()
    assert "Operating points before and after" in (tmp_path / "figures" / "change-picture-88mm.txt").read_text("utf-8")


@pytest.mark.usefixtures("drawn")
def test_the_report_of_a_change_can_be_dropped_back(evenload: Run, two, tmp_path: Path):
    """Report of A against report of B: the same change report as from the folders; and from the change report."""
    for name, study in zip("ab", two, strict=True):
        assert evenload("run", study, "--out", name, "--quiet").status == 0
    ran = evenload("changes", "a", "b", "--report", "change.html")
    assert ran.status == 0, ran.err
    assert "Report: change.html (" in ran.out
    first = evenload("changes", "a", "b", "--format", "csv").out
    assert evenload("changes", "a/report.html", "b/report.html", "--format", "csv").out == first
    assert evenload("changes", "a/report.html", "change.html", "--format", "csv").out == first
    kept = read_any_record(tmp_path / "change.html")["change"]
    assert kept["attribution"] == json.loads(evenload("changes", "a", "b", "--format", "json").out)["attribution"]
    # and the report of the way back, from the studies themselves
    assert evenload("changes", two[1], two[0], "--report", "back.HTML", "--draws", "16").status == 0
    back = read_any_record(tmp_path / "back.HTML")["change"]
    parts = [row["attribution"][0]["parts"]["film-switch.actuator_coefficient"] for row in (kept, back)]
    assert parts[0] == pytest.approx(-parts[1], rel=1e-9)
    assert back["probability"]["how"].startswith("16 draws")


def test_since_into_the_same_folder_compares_with_what_was_there(evenload: Run, two, tmp_path: Path):
    assert evenload("run", two[0], "--out", "a", "--quiet").status == 0
    ran = evenload("run", two[1], "--out", "a", "--since", "a", "--quiet")
    assert ran.status == 0, ran.err
    assert "advantage 2 -> 1.445" in ran.out
    assert read(tmp_path / "a", "record.json")["change"]["old"]["shown"] == "a"


def test_since_a_record_that_answers_another_question(evenload: Run, records, tmp_path: Path):
    other = fixed_displacement(required="2.0").write(tmp_path / "other")
    refused = evenload("run", other, "--out", "c", "--since", records[0])
    assert refused.status == 2
    assert "answer different questions (required advantage: 1.5 -> 2); --anyway" in refused.err
    assert not (tmp_path / "c").exists()
    ran = evenload("run", other, "--out", "c", "--since", records[0], "--anyway")
    assert ran.status == 0, ran.err
    assert "Note: the criteria of the answer changed: required advantage (first used on 2026-01-31" in ran.out
    assert read(tmp_path / "c", "record.json")["change"]["other"][0] == {
        "kind": "criteria",
        "name": "required advantage",
        "old": "1.5",
        "new": "2",
    }


def test_other_constants_are_no_change_of_an_input(evenload: Run, records, tmp_path: Path):
    record = read(records[0], "record.json")
    assert record["constants"]["BOLTZMANN"] == 1.380649e-23
    record["constants"]["BOLTZMANN"] = 1.38e-23
    (tmp_path / "old.json").write_text(json.dumps(record), encoding="utf-8")
    found = json.loads(evenload("changes", "old.json", records[1], "--format", "json").out)
    assert "physical constants of the program changed: BOLTZMANN" in found["banners"]
    assert {"kind": "constant", "name": "BOLTZMANN", "old": "1.38e-23", "new": "1.380649e-23"} in found["other"]
    assert set(found["attribution"][0]["parts"]) == {"film-switch.actuator_coefficient"}
    del record["constants"]  # an older record does not state them
    (tmp_path / "old.json").write_text(json.dumps(record), encoding="utf-8")
    assert json.loads(evenload("changes", "old.json", records[1], "--format", "json").out)["banners"] == []


@pytest.mark.parametrize(
    ("arguments", "status", "message"),
    [
        (("run", "old/study.toml", "--since", "absent"), 3, "absent: does not exist"),
        (("run", "old/study.toml", "--since", "old/study.toml"), 3, "study.toml: is not a readable record"),
        (("run", "old/study.toml", "--since", "a", "--ratio-only"), 2, "--since needs absolute values of both runs"),
        (("run", "old/study.toml", "--anyway"), 2, "--anyway says how to compare with an earlier record; give --since"),
        (("changes", "a", "b", "--report", "x.pdf"), 2, "--report: x.pdf must end in .html, so that changes can read"),
        (
            ("changes", SET, SET, "--report", "x.html"),
            2,
            "two sets of values have no report; compare two studies or their records",
        ),
        (("changes", "old/study.toml", "old/study.toml", "--report", "no/x.html"), 3, "no/x.html: cannot be written"),
    ],
)
def test_messages_of_since_and_report(evenload: Run, two, arguments, status: int, message: str):
    ran = evenload(*arguments)
    assert ran.status == status
    assert message in ran.err


def test_other_criteria_in_the_same_folder_are_said_with_both_dates(evenload: Run, tmp_path: Path):
    for required, date in (("1.5", "2026-01-12"), ("2.0", "2026-02-20")):
        study = fixed_displacement(required=required).write(tmp_path / "study")
        ran = evenload("run", study, "--out", "a", "--quiet", "--freeze-time", f"{date}T00:00:00Z")
        assert ran.status == 0, ran.err
        assert ("Criteria changed after results" in ran.out) == (required == "2.0")
    assert "first used on 2026-02-20T00:00:00Z; before: used on 2026-01-12T00:00:00Z" in ran.out
    assert "required advantage 1.5 -> 2." in ran.out
    assert [row["fixed"] for row in read(tmp_path / "a", "record.json")["criteria"]["earlier"]] == [
        "2026-01-12T00:00:00Z"
    ]


@pytest.mark.usefixtures("drawn")
def test_criteria_are_locked_at_the_first_run_and_a_later_change_heads_the_page(evenload: Run, tmp_path: Path):
    """The required advantage is edited in the study file after a run; then a limit; then all is as at first again."""
    study = fixed_displacement().write(tmp_path)
    first = study.read_text(encoding="utf-8")
    higher = first.replace("required_advantage = 1.5", "required_advantage = 2.0")
    later = higher.replace('limit = { value = 1.0, unit = "us" }', 'limit = { value = 2.0, unit = "us" }')
    assert len({first, higher, later}) == 3

    def head(text: str, date: str, *more: str) -> str:
        """Run, and return what stands on the page before the question."""
        study.write_text(text, encoding="utf-8")
        ran = evenload("run", "study.toml", "--out", "a", "--quiet", "--freeze-time", f"2026-{date}T00:00:00Z", *more)
        assert ran.status == 0, ran.err
        page = (tmp_path / "a" / "report.html").read_text(encoding="utf-8")
        start = page[page.index('<section id="answer"') : page.index("<nav")]
        assert ("Criteria changed after results" in ran.out) == ("Criteria changed after results:" in start)
        return html.unescape(re.sub("<[^>]*>", "", start))

    assert "Criteria changed" not in head(first, "01-12")
    digest = read(tmp_path / "a", "record.json")["criteria"]["digest"]
    assert "Criteria changed" not in head(first, "01-20"), "the same again"
    said = head(higher, "02-20")
    assert said.split("\n")[2].startswith("Demonstration:"), "the answer begins with its notices"
    assert (
        "Criteria changed after results: those of this run were first used on 2026-02-20T00:00:00Z; "
        "before: used on 2026-01-12T00:00:00Z, required advantage 1.5 -> 2." in said
    )
    said = head(later, "03-01")
    assert "used on 2026-01-12T00:00:00Z, required advantage 1.5 -> 2; requirement deadline hard, limit 1e-06 s" in said
    assert "used on 2026-02-20T00:00:00Z, requirement deadline hard, limit 1e-06 s" in said
    said = head(first, "04-01")
    assert "used on 2026-02-20T00:00:00Z, required advantage 2 -> 1.5" in said, "going back does not hide it"
    assert read(tmp_path / "a", "record.json")["criteria"]["digest"] == digest
    said = head(higher, "05-01", "--ratio-only")
    assert "required advantage 1.5 -> 2" in said
    assert "requirement deadline [left out] -> [left out]" in said
    assert "1e-06" not in said
