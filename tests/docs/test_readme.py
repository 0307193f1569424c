"""The README's commands work in an empty folder, and what it quotes is what the program says."""

from __future__ import annotations

import json
import os
import re
import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest

from benchmark import api
from benchmark.record.text import answer_sentence

ROOT = Path(__file__).resolve().parents[2]
README = (ROOT / "README.md").read_text(encoding="utf-8")
BLOCKS = re.findall(r"```(\w+)\n(.*?)```", README, flags=re.S)
#: set-up commands: run by .ci/run on a bare machine, as they stand
SETUP = ("python3 -m venv", "python3 tests/run.py")


def test_first_paragraph_states_the_job_and_two_commands_follow():
    assert "worth it against scaled CMOS" in README.split("\n\n")[1]
    shell = [text.strip() for kind, text in BLOCKS if kind == "sh"]
    assert shell[0].endswith("evenload demo")
    assert shell[1] == "python3 tests/run.py"
    runner = (ROOT / ".ci" / "run").read_text(encoding="utf-8")
    assert "evenload demo" in runner
    assert "python3 tests/run.py" in runner


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder where the commands of the README have been run in order."""
    place = tmp_path_factory.mktemp("readme")
    commands = [
        line.strip()
        for kind, text in BLOCKS
        if kind == "sh"
        for line in text.splitlines()
        if line.strip() and not line.strip().startswith(SETUP)
    ]
    assert len(commands) >= 5
    for command in commands:
        words = command.split()
        assert words[0] == ".venv/bin/evenload"
        done = _python(place, "-m", "benchmark", *words[1:])
        assert done.returncode == 0, f"{command}\n{done.stdout}\n{done.stderr}"
        assert "Traceback" not in done.stderr
    return place


def _python(place: Path, *words: str) -> subprocess.CompletedProcess[str]:
    environment = {**os.environ, "NO_COLOR": "1", "COLUMNS": "100"}
    return subprocess.run([sys.executable, *words], cwd=place, env=environment, capture_output=True, text=True)


def test_every_other_command_runs(folder: Path):
    assert (folder / "my-record" / "report.html").is_file()
    assert (folder / "what-if" / "report.html").is_file()


def undated(record: Any) -> dict[str, Any]:
    """A record without the times of its run."""
    return {**record, "created": "", "criteria": {**record["criteria"], "fixed": ""}}


def test_python_runs_and_agrees_with_the_commands(folder: Path):
    blocks = [text for kind, text in BLOCKS if kind == "python"]
    assert blocks
    for text in blocks:
        done = _python(folder, "-W", "error", "-c", text)
        assert done.returncode == 0, f"{text}\n{done.stdout}\n{done.stderr}"
    record = api.load_result(folder / "my-record")
    assert record.text in done.stdout
    assert "effective_current_p" in done.stdout
    page = (folder / "what-if.html").read_text(encoding="utf-8")
    changed = _embedded(page)
    what_if = api.load_result(folder / "what-if").record  # evenload run --set activity=0.1
    assert undated(changed) == undated(what_if)
    assert changed["what_if"] == {"activity": "0.1"}


def _embedded(page: str) -> dict[str, Any]:
    record = re.search(r'<script[^>]*type="application/json"[^>]*>(.*?)</script>', page, flags=re.S)
    assert record is not None
    found = json.loads(record.group(1))
    assert isinstance(found, dict)
    return found


def test_quoted_answer_is_the_current_one():
    quoted = next(text for kind, text in BLOCKS if kind == "text").strip()
    kept = json.loads((ROOT / "reports" / "always-on-hub" / "summary.json").read_text(encoding="utf-8"))
    page = (ROOT / "reports" / "always-on-hub" / "report.html").read_text(encoding="utf-8")
    assert kept["verdict"] in quoted
    assert f"advantage {kept['advantage']:.2g}" in quoted
    assert answer_sentence(_embedded(page)).startswith(quoted)


def test_contributor_notes_name_existing_files():
    text = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
    for name in re.findall(r"`((?:benchmark|tests|nodes)/[\w./-]+)`", text):
        assert (ROOT / name).exists(), name
