"""``evenload batch``: every study of a folder after an edit, one table; failures stay with their study."""

from __future__ import annotations

import csv
import hashlib
import io
import json
import os
import shutil
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from benchmark.api.batch import batch, studies_in
from benchmark.api.batch_files import files_read, input_files
from benchmark.api.session import load_study
from benchmark.cli.batch import _Told
from benchmark.sets.library import shipped_nodes
from tests.cli.conftest import Ran, read
from tests.five_studies import five_studies

Run = Callable[..., Ran]
pytestmark = pytest.mark.usefixtures("quick")
TIME = ("--freeze-time", "2026-01-31T00:00:00Z")


def only(folder: Path, *names: str, coefficient: str = "200.0") -> None:
    """Write some of the five studies."""
    five_studies(folder, coefficient)
    for place in folder.glob("s*.toml"):
        if place.stem not in names:
            place.unlink()


def test_one_edit_five_studies(evenload: Run, tmp_path: Path):
    """Coefficient 200 -> 170: advantage 2.000 -> 1.445; M = 1.2 moves, 1.5 flips, 3.0 moves, the other switch stays."""
    five_studies(tmp_path / "all")
    first = evenload("batch", "all", "--out", "records", *TIME)
    assert first.status == 0, first.err
    assert first.out.count("no earlier record") == 5 + 1
    again = evenload("batch", "all", "--out", "records", *TIME)
    assert again.status == 0
    assert "5 studies: 5 unchanged;" in again.out
    five_studies(tmp_path / "all", "170.0")
    ran = evenload("batch", "all", "--since", "records", "--format", "json")
    assert ran.status == 20, ran.err
    rows = json.loads(ran.out)["studies"]
    assert [row["study"] for row in rows] == [f"s{i}.toml" for i in range(1, 6)]
    assert [row["state"] for row in rows] == ["moved", "flipped", "moved", "unchanged", "unchanged"]
    assert [row["advantage_old"] for row in rows] == pytest.approx([2.0] * 5, rel=1e-6)
    assert [row["advantage_new"] for row in rows] == pytest.approx([1.445] * 3 + [2.0] * 2, rel=1e-6)
    distances = [1.445 / 1.2, 1.445 / 1.5, 1.445 / 3.0, 2.0 / 1.5, 2.0 / 3.0]
    assert [row["distance"] for row in rows] == pytest.approx(distances, rel=1e-6)
    assert [bool(row["results_moved"]) for row in rows] == [True] * 3 + [False] * 2
    text = evenload("batch", "all", "--since", "records")
    assert "5 studies: 2 moved, 1 flipped, 2 unchanged;" in text.out
    assert "x 0.9633" in text.out
    assert all(len(line) <= 100 for line in text.out.splitlines())
    table = list(csv.DictReader(io.StringIO(evenload("batch", "all", "--format", "csv").out)))
    assert [row["state"] for row in table] == ["no earlier record"] * 5


def test_a_broken_study_does_not_stop_the_others(evenload: Run, tmp_path: Path):
    five_studies(tmp_path / "all")
    for name in ("s1", "s4", "s5"):
        (tmp_path / "all" / f"{name}.toml").unlink()
    bad = tmp_path / "all" / "s2.toml"
    bad.write_text(bad.read_text(encoding="utf-8").replace("film-switch", "film-swich"), encoding="utf-8")
    ran = evenload("batch", "all")
    assert ran.status == 3
    assert "2 studies: 1 failed, 1 no earlier record;" in ran.out
    assert "did you mean 'film-switch'" in ran.out


def test_an_internal_fault_stays_with_its_study(tmp_path: Path, monkeypatch: pytest.MonkeyPatch):
    five_studies(tmp_path)

    def fault(*_: object, **__: object) -> None:
        raise ZeroDivisionError

    monkeypatch.setattr("benchmark.record.run.ladder_rows", fault)
    found = batch(tmp_path)
    assert [row.state for row in found.rows] == ["failed"] * 5
    assert found.status == 3
    assert found.rows[0].message.startswith("internal fault (ZeroDivisionError")


def test_progress_tells_the_studies_done_and_the_time_left(monkeypatch: pytest.MonkeyPatch):
    """On a terminal; 2 of 8 studies took 30 s, so the other 6 take 90 s."""
    terminal = io.StringIO()
    monkeypatch.setattr(terminal, "isatty", lambda: True)
    monkeypatch.setattr("sys.stderr", terminal)
    clock = iter([100.0, 100.0, 130.0, 220.0])
    monkeypatch.setattr("benchmark.cli.batch.time.perf_counter", lambda: next(clock))
    told = _Told()
    for done in (0, 2, 8):
        told(done, 8)
    lines = terminal.getvalue().split("\r\x1b[K")
    assert lines == ["", "0 of 8 studies", "2 of 8 studies, about 2 min left", ""]


def test_studies_are_told_as_they_are_done(tmp_path: Path):
    only(tmp_path, "s1", "s2")
    said: list[tuple[int, int]] = []
    batch(tmp_path, told=lambda done, of: said.append((done, of)))
    assert said == [(0, 2), (1, 2), (2, 2)]


def test_several_processes_change_no_digit(tmp_path: Path):
    five_studies(tmp_path)
    for name in ("s1", "s2", "s4"):
        (tmp_path / f"{name}.toml").unlink()
    alone, together = batch(tmp_path), batch(tmp_path, jobs=2)
    assert [(row.study, row.advantage_new, row.verdict_new) for row in alone.rows] == [
        (row.study, row.advantage_new, row.verdict_new) for row in together.rows
    ]
    assert list(alone.frame["study"]) == ["s3.toml", "s5.toml"]


def test_watching_runs_again_after_an_edit(evenload: Run, tmp_path: Path, monkeypatch: pytest.MonkeyPatch):
    """The pause is taken by an edit, then by an interrupt."""
    five_studies(tmp_path / "all")
    for name in ("s1", "s3", "s4", "s5"):
        (tmp_path / "all" / f"{name}.toml").unlink()
    pauses = []

    def pause(_: float) -> None:
        pauses.append(1)
        if len(pauses) > 1:
            raise KeyboardInterrupt
        five_studies(tmp_path / "all", "170.0")
        for name in ("s1", "s3", "s4", "s5"):
            (tmp_path / "all" / f"{name}.toml").unlink()

    monkeypatch.setattr("benchmark.cli.batch.time.sleep", pause)
    ran = evenload("batch", "all", "--out", "records", "--watch", *TIME)
    assert ran.status == 130
    assert "1 study: 1 no earlier record;" in ran.out
    assert "1 study: 1 flipped;" in ran.out


@pytest.mark.parametrize("place", ["shipped", "linked", "data"])
def test_watching_sees_what_a_study_reads_outside_the_folder(
    evenload: Run, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, place: str
):
    """Shipped sets, sets behind a link, and data that a number was read off; an edit of each runs it again."""
    only(tmp_path / "all", "s2")
    sets = tmp_path / "all" / "nodes"
    edited = tmp_path / "other" / "nodes" / "technologies" / "film-switch.toml"
    if place == "data":
        edited = tmp_path / "data" / "points.xyz"
        edited.parent.mkdir()
        edited.write_text("1 2\n", encoding="utf-8")
        digest = hashlib.sha256(edited.read_bytes()).hexdigest()
        switch = sets / "technologies" / "film-switch.toml"
        said = f'extracted_from = {{ file = "../../../data/points.xyz", digest = "{digest}" }}'
        text = switch.read_text(encoding="utf-8")
        head = "[value.stack_thickness]\n"
        assert head in text
        switch.write_text(text.replace(head, f"{head}{said}\n"), encoding="utf-8")
    else:
        shutil.move(sets, tmp_path / "other" / "nodes")
        if place == "linked":
            sets.symlink_to(tmp_path / "other" / "nodes")
        else:
            shutil.copy(shipped_nodes() / "sources.toml", tmp_path / "other" / "nodes")
            monkeypatch.setattr("benchmark.sets.library._shipped", lambda name, _: tmp_path / "other" / name)
    pauses = []

    def pause(_: float) -> None:
        pauses.append(1)
        if len(pauses) > 1:
            raise KeyboardInterrupt
        os.utime(edited, ns=(1, 1))

    monkeypatch.setattr("benchmark.cli.batch.time.sleep", pause)
    ran = evenload("batch", "all", "--watch")
    assert ran.status == 130
    assert ran.out.count("1 study: 1 no earlier record;") == 2, ran.out + ran.err


def test_tables_beside_the_folder_of_a_set_are_among_the_files_read(tmp_path: Path):
    """A set beside its study names tables/...csv beside the folder of both, outside the folder of the batch."""
    only(tmp_path / "all", "s2")
    shutil.copy(shipped_nodes() / "technologies" / "demo-table.toml", tmp_path / "all")
    shutil.copytree(shipped_nodes() / "tables", tmp_path / "tables")
    study = tmp_path / "all" / "s2.toml"
    text = study.read_text(encoding="utf-8").replace('technology = "film-switch"', 'technology = "demo-table"')
    text = text.replace('candidate = "n1"', 'candidate = "g1"').replace(
        "low = 0.05, high = 1.0", "low = 0.3, high = 0.3"
    )
    study.write_text(text, encoding="utf-8")
    found = {
        path.relative_to(tmp_path).as_posix() for path in files_read(load_study(study)) if tmp_path in path.parents
    }
    assert found == {
        "all/s2.toml",
        "all/demo-table.toml",
        "all/nodes/technologies/stated-reference.toml",
        "all/nodes/wires/no-wires.toml",
        *(f"tables/demo-{name}.{end}" for name in ("charge", "current") for end in ("csv", "toml")),
    }


def test_watching_does_not_wake_up_by_its_own_records(evenload: Run, tmp_path: Path, monkeypatch: pytest.MonkeyPatch):
    """Records written inside the folder of the studies hold tables, which are no inputs."""
    only(tmp_path / "all", "s2")
    monkeypatch.setattr("benchmark.report.folder.fill_folder", _with_tables)
    pauses = []

    def pause(_: float) -> None:
        pauses.append(1)
        raise KeyboardInterrupt

    monkeypatch.setattr("benchmark.cli.batch.time.sleep", pause)
    ran = evenload("batch", "all", "--out", "all/records", "--watch", *TIME)
    assert ran.status == 130
    assert (tmp_path / "all" / "records" / "s2" / "tables" / "parts.csv").is_file()
    assert len(pauses) == 1, "it waits"
    assert ran.out.count("1 study:") == 1


def _with_tables(place: Path, record: dict[str, Any]) -> None:
    (place / "record.json").write_text(json.dumps(record), encoding="utf-8")
    (place / "tables").mkdir()
    (place / "tables" / "parts.csv").write_text("no rows\n", encoding="utf-8")


def test_a_record_that_moved_says_what_changed_and_why(evenload: Run, tmp_path: Path):
    for coefficient in ("200.0", "170.0"):
        only(tmp_path / "all", "s2", "s4", coefficient=coefficient)
        evenload("batch", "all", "--out", "records", *TIME)
    change = read(tmp_path / "records" / "s2", "record.json")["change"]
    assert change["verdict"]["flipped"]
    parts = change["attribution"][0]["parts"]
    assert parts == {"film-switch.actuator_coefficient": pytest.approx(-0.32504, abs=5e-6)}
    assert "change" not in read(tmp_path / "records" / "s4", "record.json"), "unchanged"


def test_another_required_advantage_is_a_flip_with_its_reason(evenload: Run, tmp_path: Path):
    only(tmp_path / "all", "s2")
    assert evenload("batch", "all", "--out", "records", *TIME).status == 0
    study = tmp_path / "all" / "s2.toml"
    study.write_text(study.read_text(encoding="utf-8").replace("advantage = 1.5", "advantage = 3.0"), encoding="utf-8")
    ran = evenload("batch", "all", "--out", "records", *TIME)
    assert ran.status == 20
    assert "s2.toml: required advantage was 1.5" in ran.out
    record = read(tmp_path / "records" / "s2", "record.json")
    assert any("the criteria of the answer changed: required advantage" in text for text in record["change"]["banners"])
    assert [row["fixed"] for row in record["criteria"]["earlier"]] == ["2026-01-31T00:00:00Z"]


def test_an_earlier_record_with_ratios_only_cannot_say_why(evenload: Run, tmp_path: Path):
    only(tmp_path / "all", "s2")
    ran = evenload("run", "all/s2.toml", "--out", "records/s2", "--ratio-only", "--quiet", *TIME)
    assert ran.status == 0, ran.err
    only(tmp_path / "all", "s2", coefficient="170.0")
    ran = evenload("batch", "all", "--out", "records", "--format", "json", *TIME)
    row = json.loads(ran.out)["studies"][0]
    assert (ran.status, row["state"]) == (20, "flipped")
    assert row["message"].startswith("what changed cannot be said: the earlier record: holds ratios only")
    assert "change" not in read(tmp_path / "records" / "s2", "record.json")


def test_draws_seed_and_needs_are_those_of_the_earlier_record(evenload: Run, tmp_path: Path):
    """Given to the earlier run beside its study: with nothing edited, nothing may move and nothing may be lost."""
    only(tmp_path / "all", "s2")
    ran = evenload(
        "run", "all/s2.toml", "--draws", "64", "--seed", "3", "--need", "--out", "records/s2", "--quiet", *TIME
    )
    assert ran.status == 0, ran.err
    before = read(tmp_path / "records" / "s2", "record.json")
    ran = evenload("batch", "all", "--out", "records", "--format", "json", *TIME)
    row = json.loads(ran.out)["studies"][0]
    assert (ran.status, row["state"], row["results_moved"]) == (0, "unchanged", 0)
    assert row["message"] == "64 draws, seed 3, questions of need as in the earlier record"
    after = read(tmp_path / "records" / "s2", "record.json")
    assert after["uncertainty"] == before["uncertainty"]
    assert after["need"] == before["need"]
    only(tmp_path / "all", "s2", coefficient="190.0")
    assert evenload("batch", "all", "--out", "records", "--draws", "32", *TIME).status == 0
    after = read(tmp_path / "records" / "s2", "record.json")
    assert (after["uncertainty"]["draws"], after["uncertainty"]["seed"]) == (32, 3), "what is given goes first"


def _with_draws(study: Path, draws: int) -> None:
    text = study.read_text(encoding="utf-8").partition("\n[uncertainty]")[0]
    study.write_text(f"{text}\n[uncertainty]\ndraws = {draws}\nseed = 5\n", encoding="utf-8")


def test_draws_that_a_study_states_are_its_own(evenload: Run, tmp_path: Path):
    """An edit of their number in the study is followed; none given to the earlier run stays none."""
    only(tmp_path / "all", "s2")
    study, record = tmp_path / "all" / "s2.toml", tmp_path / "records" / "s2"
    _with_draws(study, 64)
    assert evenload("batch", "all", "--out", "records", *TIME).status == 0
    _with_draws(study, 32)
    ran = evenload("batch", "all", "--out", "records", *TIME)
    assert "as in the earlier record" not in ran.out
    assert read(record, "record.json")["uncertainty"]["draws"] == 32
    assert evenload("batch", "all", "--out", "records", "--draws", "0", *TIME).status == 0
    assert read(record, "record.json")["uncertainty"] is None
    ran = evenload("batch", "all", "--out", "records", *TIME)
    assert "1 study: 1 unchanged;" in ran.out
    assert "s2.toml: 0 draws as in the earlier record" in ran.out


def test_what_an_earlier_record_was_run_with_and_a_batch_is_not_is_said(evenload: Run, tmp_path: Path):
    only(tmp_path / "all", "s2")
    ran = evenload("run", "all/s2.toml", "--set", "activity=0.4", "--out", "records/s2", "--quiet", *TIME)
    assert ran.status == 0, ran.err
    said = " ".join(evenload("batch", "all", "--since", "records").out.split())
    assert "run with --set activity=0.4, this one without" in said


def test_files_are_told_apart_by_time_and_size(tmp_path: Path):
    (tmp_path / "a.toml").write_text("x = 1", encoding="utf-8")
    (tmp_path / "a.png").write_text("no input", encoding="utf-8")
    first = input_files([tmp_path])
    assert list(first) == [str(tmp_path / "a.toml")]
    os.utime(tmp_path / "a.toml", ns=(1, 1))
    assert input_files([tmp_path]) != first


def test_study_files_are_found_at_any_depth(tmp_path: Path):
    five_studies(tmp_path / "one" / "two")
    assert [path.name for path in studies_in(tmp_path)] == [f"s{i}.toml" for i in range(1, 6)]


@pytest.mark.parametrize("study", [True, False])
def test_a_file_that_cannot_be_read_and_may_be_a_study_fails(evenload: Run, tmp_path: Path, study: bool):
    """A stray assignment in a study, and a file of which nothing says that it is none."""
    only(tmp_path / "all", "s1", "s2")
    broken = tmp_path / "all" / "s2.toml"
    lines = broken.read_text(encoding="utf-8").splitlines()
    broken.write_text("\n".join(["x = ", *lines] if study else ["x = "]), encoding="utf-8")
    ran = evenload("batch", "all", "--format", "json")
    assert ran.status == 3
    rows = json.loads(ran.out)["studies"]
    assert [(row["study"], row["state"]) for row in rows] == [("s1.toml", "no earlier record"), ("s2.toml", "failed")]
    assert rows[1]["message"].startswith("s2.toml:1: is not TOML: Invalid value")


def test_an_empty_file_and_a_link_to_nowhere_fail(tmp_path: Path):
    only(tmp_path, "s1")
    (tmp_path / "s2.toml").touch()
    (tmp_path / "s3.toml").symlink_to("absent.toml")
    found = batch(tmp_path)
    assert [(row.study, row.message) for row in found.rows[1:]] == [
        ("s2.toml", "s2.toml: is empty"),
        ("s3.toml", "s3.toml: does not exist"),
    ]
    assert found.status == 3


@pytest.mark.parametrize("form", ["text", "csv", "json"])
def test_other_files_that_cannot_be_read_are_told(evenload: Run, tmp_path: Path, form: str):
    """Sets, sources and descriptions that can be read are skipped, as is no study in a folder of sets."""
    only(tmp_path / "all", "s1")
    spoiled = tmp_path / "all" / "nodes" / "technologies" / "unused.toml"
    spoiled.write_text('model = "given"\nx = ', encoding="utf-8")
    ran = evenload("batch", "all", "--format", form)
    assert ran.status == 0
    told = ran.err if form == "csv" else ran.out
    assert "nodes/technologies/unused.toml cannot be read: unused.toml:2: is not TOML" in " ".join(told.split())
    if form == "json":
        assert [row["study"] for row in json.loads(ran.out)["studies"]] == ["s1.toml"]


def test_a_record_without_its_study_is_named(evenload: Run, tmp_path: Path):
    only(tmp_path / "all", "s1", "s2")
    assert evenload("batch", "all", "--out", "records", *TIME).status == 0
    (tmp_path / "all" / "s2.toml").unlink()
    ran = evenload("batch", "all", "--since", "records")
    assert ran.status == 0
    assert "s2: there is a record in records/s2, and no study for it" in ran.out
    assert "2 studies: 1 unchanged, 1 study missing;" in ran.out
    (tmp_path / "records" / "s2" / "record.json").write_text("{", encoding="utf-8")
    row = batch("all", since="records").rows[1]
    assert (row.study, row.state, row.verdict_old) == ("s2", "study missing", "")
    assert "is not a readable record" in row.message


def test_a_study_that_is_no_toml_is_refused_as_a_study(evenload: Run, tmp_path: Path):
    """Not as a set of values that cannot be compared with a study."""
    only(tmp_path, "s1", "s2")
    broken = tmp_path / "s2.toml"
    broken.write_text("x = \n" + broken.read_text(encoding="utf-8"), encoding="utf-8")
    ran = evenload("changes", "s1.toml", "s2.toml")
    assert ran.status == 3
    assert "s2.toml:1: is not TOML" in ran.err


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (("absent",), "absent is not a folder of studies"),
        (("empty",), "empty: holds no study; a study file is a TOML file with [workload] and [[contender]]"),
        (("all", "--since", "absent"), "absent is not a folder of records"),
        (("all", "--format", "pdf"), "--format: 'pdf' is not one of text, csv, json"),
        (("all", "--jobs", "0"), "jobs: 0 processes cannot work"),
        (("twice",), "would have one record folder, a; rename one of them"),
    ],
)
def test_messages(evenload: Run, tmp_path: Path, arguments, message: str):
    five_studies(tmp_path / "all")
    (tmp_path / "empty").mkdir()
    (tmp_path / "twice" / "a").mkdir(parents=True)
    for name in ("a.toml", "a/study.toml"):
        (tmp_path / "twice" / name).write_bytes((tmp_path / "all" / "s1.toml").read_bytes())
    ran = evenload("batch", *arguments)
    assert ran.status == 2
    assert message in ran.err
