"""``evenload run``: exit status, what-if, and a record folder that is whole or not there."""

from __future__ import annotations

import errno
import filecmp
import os
import re
import signal
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest

from benchmark.cli.app import GATE
from benchmark.decide.verdict import WORDS
from tests.cli.conftest import Run, read
from tests.studies import Inputs, hub, mixed

ROOT = Path(__file__).resolve().parents[2]


def _decided() -> Inputs:
    """The mixed study with every value a decision of somebody, so that nothing caps the word."""
    inputs = mixed()
    for data in (inputs.study, *inputs.sets.values()):
        data["default"] = {**data["default"], "evidence": "choice", "source": "team-choice"}
    for table in inputs.value_tables():
        table.pop("evidence", None)
    inputs.study["demonstration"] = False
    return inputs


def _undecidable() -> Inputs:
    inputs = mixed()
    inputs.study["requirements"]["retention"] = {"limit": {"value": 1, "unit": "s"}, "kind": "report"}
    return inputs


# -- exit status -----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("inputs", "word", "status"),
    [
        (_decided(), "go", 0),
        (mixed(), "conditional go", 10),
        (hub(relay_delay="600"), "no-go, requirement failed", 11),
        (hub(), "no-go, not better", 12),
        (_undecidable(), "not decidable on this evidence", 13),
    ],
)
@pytest.mark.usefixtures("quick")
def test_the_status_tells_the_verdict_only_when_asked(
    inputs: Inputs, word: str, status: int, tmp_path: Path, evenload: Run
):
    inputs.write(tmp_path)
    asked, plain = evenload("run", "study.toml", "--gate", "--quiet"), evenload("run", "study.toml", "--quiet")
    assert read(tmp_path / f"evenload-{inputs.study['id']}")["verdict"] == word
    assert asked.status == status
    assert plain.status == 0
    assert asked.err == plain.err == ""
    assert word in asked.out


def test_every_word_of_a_verdict_has_a_status():
    assert set(GATE) == set(WORDS)
    assert len(set(GATE.values())) == len(WORDS)


def test_a_refused_study_is_status_3_with_or_without_the_gate(tmp_path: Path, evenload: Run):
    inputs = mixed()
    inputs.study["value"]["activity"]["value"] = 2
    inputs.write(tmp_path)
    for arguments in (["--gate"], []):
        ran = evenload("run", "study.toml", *arguments)
        assert (ran.status, ran.out) == (3, "")
        assert ran.err == (
            "evenload: input refused, 1 problem(s); nothing was run\n"
            "  study.toml:28: value.activity.value: is out of its domain; found 2; allowed: between 0 and 1\n"
        )
    assert sorted(path.name for path in tmp_path.iterdir()) == ["nodes", "study.toml"]


@pytest.mark.parametrize("name", ["none.toml", ".", "/dev/null", "Größe.toml"])
def test_what_is_no_study(name: str, evenload: Run):
    ran = evenload("run", name)
    assert ran.status == 3
    assert ran.err.startswith("evenload: input refused, 1 problem(s); nothing was run\n")


# -- what-if ---------------------------------------------------------------------------------------------------


@pytest.mark.usefixtures("quick")
def test_what_if_changes_the_result_and_is_recorded(tmp_path: Path, evenload: Run):
    hub().write(tmp_path)
    evenload("run", "study.toml", "--out", "as-stated")
    ran = evenload(
        "run", "study.toml", "--out", "what-if", "--set", "activity=0.001", "--set", "low-leakage.closing_delay = 0.2"
    )
    assert ran.status == 0
    assert read(tmp_path / "as-stated")["advantage"] == pytest.approx(0.42, rel=1e-9)
    assert read(tmp_path / "what-if")["advantage"] == pytest.approx(3.745, rel=1e-9)
    record = read(tmp_path / "what-if", "record.json")
    assert record["what_if"] == {"activity": "0.001", "low-leakage.closing_delay": "0.2"}
    assert read(tmp_path / "as-stated", "record.json")["what_if"] == {}


@pytest.mark.parametrize(
    ("pairs", "status", "message"),
    [
        (["activity"], 2, "evenload: --set needs NAME=NUMBER, found 'activity'\n"),
        (["=3"], 2, "evenload: --set needs NAME=NUMBER, found '=3'\n"),
        (["activity="], 2, "evenload: --set needs NAME=NUMBER, found 'activity='\n"),
        (["activity=0.1", "activity=0.2"], 2, "evenload: --set names 'activity' twice\n"),
        (
            ["activity=lots"],
            3,
            "evenload: input refused, 1 problem(s); nothing was run\n  --set: activity: needs a number; found 'lots'\n",
        ),
    ],
)
def test_what_if_that_means_nothing(pairs: list[str], status: int, message: str, tmp_path: Path, evenload: Run):
    hub().write(tmp_path)
    ran = evenload("run", "study.toml", *(word for pair in pairs for word in ("--set", pair)))
    assert (ran.status, ran.out, ran.err) == (status, "", message)


# -- the record folder -----------------------------------------------------------------------------------------


def _tree(folder: Path) -> dict[str, bytes]:
    return {str(path.relative_to(folder)): path.read_bytes() for path in sorted(folder.rglob("*")) if path.is_file()}


@pytest.mark.usefixtures("quick")
def test_a_record_replaces_a_record_and_nothing_else(tmp_path: Path, evenload: Run):
    hub().write(tmp_path)
    (tmp_path / "mine").mkdir()
    (tmp_path / "mine" / "thesis.txt").write_text("years of work")
    (tmp_path / "file").write_text("a file")
    (tmp_path / "empty").mkdir()
    for out in ("mine", "file"):
        ran = evenload("run", "study.toml", "--out", out)
        assert (ran.status, ran.out) == (3, "")
        assert ran.err == f"evenload: {out}: exists and is not a record folder; nothing was written\n"
    assert (tmp_path / "mine" / "thesis.txt").read_text() == "years of work"
    assert (tmp_path / "file").read_text() == "a file"
    assert evenload("run", "study.toml", "--out", "empty").status == 0
    (tmp_path / "empty" / "left over").write_text("from the old record")
    assert evenload("run", "study.toml", "--out", "empty").status == 0
    assert sorted(_tree(tmp_path / "empty")) == ["record.json", "report.html", "summary.json"]
    assert not [path for path in tmp_path.iterdir() if path.name.startswith(".")]


@pytest.mark.usefixtures("quick")
def test_a_place_that_cannot_be_written(tmp_path: Path, evenload: Run):
    hub().write(tmp_path)
    (tmp_path / "file").write_text("a file")
    ran = evenload("run", "study.toml", "--out", "file/record")
    assert (ran.status, ran.out) == (3, "")
    assert ran.err == f"evenload: {tmp_path}/file/record: cannot be written (File exists); nothing was written\n"


@pytest.mark.parametrize(
    ("fault", "status", "message"),
    [
        (
            OSError(errno.ENOSPC, "No space left on device"),
            3,
            "cannot be written (No space left on device); nothing was written\n",
        ),
        (KeyboardInterrupt(), 130, "evenload: stopped; nothing half-written\n"),
    ],
)
@pytest.mark.usefixtures("quick")
def test_a_run_that_breaks_while_writing_leaves_the_old_record(
    fault: BaseException, status: int, message: str, tmp_path: Path, evenload: Run, monkeypatch: pytest.MonkeyPatch
):
    hub().write(tmp_path)
    assert evenload("run", "study.toml", "--out", "record").status == 0
    before = _tree(tmp_path / "record")

    def breaks(place: Path, record: dict[str, Any]) -> None:
        (place / "record.json").write_text("{half")
        raise fault

    monkeypatch.setattr("benchmark.report.folder.fill_folder", breaks)
    for out in ("record", "other"):
        ran = evenload("run", "study.toml", "--out", out, "--set", "activity=0.1")
        assert ran.status == status
        assert ran.err.endswith(message)
    assert _tree(tmp_path / "record") == before
    assert sorted(path.name for path in tmp_path.iterdir()) == ["nodes", "record", "study.toml"]


KILLED = """
import os, signal, sys
from pathlib import Path
import benchmark.report.folder as folder
import benchmark.record.run as run
run.closed_form_differences = lambda *_: []
def killed(place, record):
    (place / "record.json").write_text("{half")
    os.kill(os.getpid(), signal.SIGKILL)
folder.fill_folder = killed
sys.argv = ["evenload", "run", "study.toml", "--out", "record"]
from benchmark.cli import main
main()
"""


@pytest.mark.usefixtures("quick")
def test_a_killed_run_leaves_the_old_record(tmp_path: Path, evenload: Run):
    hub().write(tmp_path)
    assert evenload("run", "study.toml", "--out", "record").status == 0
    before = _tree(tmp_path / "record")
    done = subprocess.run(
        [sys.executable, "-c", KILLED],
        cwd=tmp_path,
        env={**os.environ, "PYTHONPATH": str(ROOT)},
        timeout=60,
        check=False,
    )
    assert done.returncode == -signal.SIGKILL
    assert _tree(tmp_path / "record") == before
    # the next run is not disturbed by what the killed one could not clear away
    assert evenload("run", "study.toml", "--out", "record").status == 0


@pytest.mark.usefixtures("quick")
def test_the_default_folder_is_named_after_the_study(tmp_path: Path, evenload: Run):
    hub().write(tmp_path / "deep")
    ran = evenload("run", "deep/study.toml")
    assert (tmp_path / "evenload-hub" / "record.json").exists()
    said = r"\nRecord:  evenload-hub \(written in \d+\.\d s\)\nReport:  evenload-hub/report\.html \((\d+\.\d) MB\)\n"
    assert re.search(f"{said}\\Z", ran.out)
    quiet = evenload("run", "deep/study.toml", "--quiet")
    assert "Record:" not in quiet.out
    assert ran.out.startswith(quiet.out)


def _in_both(tmp_path: Path, *arguments: str) -> None:
    """Run a command in two processes, two places and two time zones at once."""
    running = []
    for name, zone in (("one", "UTC"), ("two", "Asia/Tokyo")):
        environment = {**os.environ, "PYTHONPATH": str(ROOT), "TZ": zone, "PYTHONHASHSEED": str(len(running))}
        command = [sys.executable, "-m", "benchmark", *arguments]
        running.append(subprocess.Popen(command, cwd=tmp_path / name, env=environment, stdout=subprocess.DEVNULL))
    assert [process.wait(timeout=120) for process in running] == [0, 0]


def test_the_same_inputs_write_the_same_folders_byte_for_byte(tmp_path: Path):
    """Record folder with charts and report, figures for print in every format, tables; only the time stamp is given."""
    for name in ("one", "two"):
        hub().write(tmp_path / name)
    _in_both(tmp_path, "run", "study.toml", "--out", "record", "--freeze-time", "then")
    _in_both(tmp_path, "export", "record", "--figures", "figures", "--tables", "tables", "--format", "latex")
    one, two = tmp_path / "one", tmp_path / "two"
    names = _tree(one).keys()
    assert names == _tree(two).keys()
    assert len(names) > 80
    assert {Path(name).suffix for name in names} >= {".html", ".json", ".csv", ".svg", ".png", ".pdf", ".tex", ".txt"}
    _, different, odd = filecmp.cmpfiles(one, two, list(names), shallow=False)
    assert (different, odd) == ([], [])
    assert read(one / "record", "record.json")["created"] == "then"
