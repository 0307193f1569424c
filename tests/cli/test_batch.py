"""``evenload batch``: every study of a folder after an edit, one table; failures stay with their study."""

from __future__ import annotations

import copy
import csv
import io
import json
import os
from collections.abc import Callable
from decimal import Decimal as D
from pathlib import Path

import pytest

from benchmark.api.batch import batch, input_files, studies_in
from tests.cli.conftest import Ran
from tests.fixed_displacement import fixed_displacement
from tests.studies import toml

Run = Callable[..., Ran]
pytestmark = pytest.mark.usefixtures("quick")
TIME = ("--freeze-time", "2026-01-31T00:00:00Z")


def write(folder: Path, coefficient: str = "200.0") -> None:
    """Five studies of two switches that share their sets; the second switch has a fixed coefficient."""
    inputs = fixed_displacement(coefficient=(coefficient, "0.05"))
    other = copy.deepcopy(fixed_displacement().sets["technologies/film-switch"]) | {"id": "other-switch"}
    inputs.sets["technologies/other-switch"] = other
    for position, (required, switch) in enumerate(
        [("1.2", "film"), ("1.5", "film"), ("3.0", "film"), ("1.5", "other"), ("3.0", "other")], start=1
    ):
        study = copy.deepcopy(inputs.study) | {"id": f"study-{position}"}
        study["verdict"]["required_advantage"] = D(required)
        study["candidate"]["technology"] = f"{switch}-switch"
        inputs.texts[f"s{position}.toml"] = toml(study)
    for name, text in inputs.files().items():
        if name != "study.toml":
            place = folder / name
            place.parent.mkdir(parents=True, exist_ok=True)
            place.write_text(text, encoding="utf-8")


def test_one_edit_five_studies(evenload: Run, tmp_path: Path):
    """Coefficient 200 -> 170: advantage 2.000 -> 1.445; M = 1.2 moves, 1.5 flips, 3.0 moves, the other switch stays."""
    write(tmp_path / "all")
    first = evenload("batch", "all", "--out", "records", *TIME)
    assert first.status == 0, first.err
    assert first.out.count("no earlier record") == 5 + 1
    again = evenload("batch", "all", "--out", "records", *TIME)
    assert again.status == 0
    assert "5 studies: 5 unchanged;" in again.out
    write(tmp_path / "all", "170.0")
    ran = evenload("batch", "all", "--since", "records", "--format", "json", *TIME)
    assert ran.status == 20, ran.err
    rows = json.loads(ran.out)["studies"]
    assert [row["study"] for row in rows] == [f"s{i}.toml" for i in range(1, 6)]
    assert [row["state"] for row in rows] == ["moved", "flipped", "moved", "unchanged", "unchanged"]
    assert [row["advantage_old"] for row in rows] == pytest.approx([2.0] * 5, rel=1e-6)
    assert [row["advantage_new"] for row in rows] == pytest.approx([1.445] * 3 + [2.0] * 2, rel=1e-6)
    distances = [1.445 / 1.2, 1.445 / 1.5, 1.445 / 3.0, 2.0 / 1.5, 2.0 / 3.0]
    assert [row["distance"] for row in rows] == pytest.approx(distances, rel=1e-6)
    assert [bool(row["results_moved"]) for row in rows] == [True] * 3 + [False] * 2
    text = evenload("batch", "all", "--since", "records", *TIME)
    assert "5 studies: 2 moved, 1 flipped, 2 unchanged;" in text.out
    assert "x 0.9633" in text.out
    assert all(len(line) <= 100 for line in text.out.splitlines())
    table = list(csv.DictReader(io.StringIO(evenload("batch", "all", "--format", "csv", *TIME).out)))
    assert [row["state"] for row in table] == ["no earlier record"] * 5


def test_a_broken_study_does_not_stop_the_others(evenload: Run, tmp_path: Path):
    write(tmp_path / "all")
    for name in ("s1", "s4", "s5"):
        (tmp_path / "all" / f"{name}.toml").unlink()
    bad = tmp_path / "all" / "s2.toml"
    bad.write_text(bad.read_text(encoding="utf-8").replace("film-switch", "film-swich"), encoding="utf-8")
    ran = evenload("batch", "all")
    assert ran.status == 3
    assert "2 studies: 1 failed, 1 no earlier record;" in ran.out
    assert "did you mean 'film-switch'" in ran.out


def test_an_internal_fault_stays_with_its_study(tmp_path: Path, monkeypatch: pytest.MonkeyPatch):
    write(tmp_path)

    def fault(*_: object, **__: object) -> None:
        raise ZeroDivisionError

    monkeypatch.setattr("benchmark.record.run.ladder_rows", fault)
    found = batch(tmp_path)
    assert [row.state for row in found.rows] == ["failed"] * 5
    assert found.status == 3
    assert found.rows[0].message.startswith("internal fault (ZeroDivisionError")


def test_several_processes_change_no_digit(tmp_path: Path):
    write(tmp_path)
    for name in ("s1", "s2", "s4"):
        (tmp_path / f"{name}.toml").unlink()
    alone, together = batch(tmp_path), batch(tmp_path, jobs=2)
    assert [(row.study, row.advantage_new, row.verdict_new) for row in alone.rows] == [
        (row.study, row.advantage_new, row.verdict_new) for row in together.rows
    ]
    assert list(alone.frame["study"]) == ["s3.toml", "s5.toml"]


def test_watching_runs_again_after_an_edit(evenload: Run, tmp_path: Path, monkeypatch: pytest.MonkeyPatch):
    """The pause is taken by an edit, then by an interrupt."""
    write(tmp_path / "all")
    for name in ("s1", "s3", "s4", "s5"):
        (tmp_path / "all" / f"{name}.toml").unlink()
    pauses = []

    def pause(_: float) -> None:
        pauses.append(1)
        if len(pauses) > 1:
            raise KeyboardInterrupt
        write(tmp_path / "all", "170.0")
        for name in ("s1", "s3", "s4", "s5"):
            (tmp_path / "all" / f"{name}.toml").unlink()

    monkeypatch.setattr("benchmark.cli.batch.time.sleep", pause)
    ran = evenload("batch", "all", "--out", "records", "--watch", *TIME)
    assert ran.status == 130
    assert "1 study: 1 no earlier record;" in ran.out
    assert "1 study: 1 flipped;" in ran.out


def test_files_are_told_apart_by_time_and_size(tmp_path: Path):
    (tmp_path / "a.toml").write_text("x = 1", encoding="utf-8")
    (tmp_path / "a.png").write_text("no input", encoding="utf-8")
    first = input_files([tmp_path])
    assert list(first) == [str(tmp_path / "a.toml")]
    os.utime(tmp_path / "a.toml", ns=(1, 1))
    assert input_files([tmp_path]) != first


def test_study_files_are_found_at_any_depth(tmp_path: Path):
    write(tmp_path / "one" / "two")
    (tmp_path / "one" / "broken.toml").write_text("x = ", encoding="utf-8")
    assert [path.name for path in studies_in(tmp_path)] == [f"s{i}.toml" for i in range(1, 6)]


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
    write(tmp_path / "all")
    (tmp_path / "empty").mkdir()
    (tmp_path / "twice" / "a").mkdir(parents=True)
    for name in ("a.toml", "a/study.toml"):
        (tmp_path / "twice" / name).write_bytes((tmp_path / "all" / "s1.toml").read_bytes())
    ran = evenload("batch", *arguments)
    assert ran.status == 2
    assert message in ran.err
