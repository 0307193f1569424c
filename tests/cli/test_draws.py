"""Draws on the command line: options, what is printed, refusals, an interrupt."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from benchmark.cli.commands import time_left
from tests.fixed_displacement import fixed_displacement

EVENLOAD = Path(sys.executable).parent / "evenload"


def evenload(*words: str, folder: Path) -> subprocess.CompletedProcess[str]:
    return subprocess.run([EVENLOAD, *words], cwd=folder, capture_output=True, text=True, check=False)


def test_probability_in_text_summary_tables_and_record(tmp_path: Path):
    fixed_displacement().write(tmp_path)
    done = evenload(
        "run", "study.toml", "--draws", "256", "--seed", "3", "--jobs", "2", "--out", "out", folder=tmp_path
    )
    assert done.returncode == 0, done.stderr
    assert "Under the stated ranges (256 draws, seed 3): an advantage of 1.5 is" in done.stdout
    assert "Most worth measuring: film-switch.actuator_coefficient" in done.stdout
    summary = json.loads((tmp_path / "out" / "summary.json").read_text(encoding="utf-8"))
    assert summary["probability"]["draws"] == 256
    assert 0.6 < summary["probability"]["reaches"]["value"] < 0.9
    tables = tmp_path / "out" / "tables"
    assert "probability of the required advantage" in (tables / "uncertainty.csv").read_text(encoding="utf-8")
    assert "film-switch.actuator_coefficient" in (tables / "uncertainty_inputs.csv").read_text(encoding="utf-8")


def test_without_draws_no_probability_is_claimed(tmp_path: Path):
    fixed_displacement().write(tmp_path)
    done = evenload("run", "study.toml", "--out", "out", folder=tmp_path)
    assert done.returncode == 0, done.stderr
    assert "probability" not in done.stdout
    assert json.loads((tmp_path / "out" / "summary.json").read_text(encoding="utf-8"))["probability"] is None


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (("--draws", "1000"), "draws: 1000 is no number of draws; allowed: 0 for none, or a power of two from 16"),
        (("--draws", "64", "--seed", "-1"), "seed: -1 is negative; allowed: 0 or above"),
        (("--draws", "64", "--jobs", "0"), "jobs: 0 processes cannot work; allowed: 1 or more"),
    ],
)
def test_what_cannot_be_is_refused_in_words(words: tuple[str, ...], said: str, tmp_path: Path):
    fixed_displacement().write(tmp_path)
    done = evenload("run", "study.toml", "--out", "out", *words, folder=tmp_path)
    assert done.returncode == 2
    assert said in done.stderr
    assert "Traceback" not in done.stderr
    assert not (tmp_path / "out").exists()


def test_an_interrupt_stops_all_processes_and_leaves_nothing(tmp_path: Path):
    fixed_displacement().write(tmp_path)
    words = [EVENLOAD, "run", "study.toml", "--draws", str(2**22), "--jobs", "2", "--out", "out"]
    started = subprocess.Popen(
        words, cwd=tmp_path, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, start_new_session=True
    )
    time.sleep(8.0)
    os.killpg(started.pid, signal.SIGINT)
    _, said = started.communicate(timeout=60)
    assert started.returncode == 130
    assert "stopped; nothing half-written" in said
    assert "Traceback" not in said
    assert not (tmp_path / "out").exists()


@pytest.mark.parametrize(
    ("elapsed", "share", "words"),
    [
        (10.0, 0.05, ""),
        (1.0, 0.5, ""),
        (30.0, 0.5, ", about 30 s left"),
        (300.0, 0.5, ", about 5 min left"),
        (9.0, 1.0, ""),
    ],
)
def test_time_left(elapsed: float, share: float, words: str):
    assert time_left(elapsed, share) == words
