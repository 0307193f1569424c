"""The README's commands work in an empty folder, and what it quotes is what the program says."""

from __future__ import annotations

import json
import os
import re
import subprocess
import sys
from pathlib import Path

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


def test_every_other_command_runs(tmp_path: Path):
    commands = [
        line.strip()
        for kind, text in BLOCKS
        if kind == "sh"
        for line in text.splitlines()
        if line.strip() and not line.strip().startswith(SETUP)
    ]
    assert len(commands) >= 5
    environment = {**os.environ, "NO_COLOR": "1", "COLUMNS": "100"}
    for command in commands:
        words = command.split()
        assert words[0] == ".venv/bin/evenload"
        done = subprocess.run(
            [sys.executable, "-m", "benchmark", *words[1:]],
            cwd=tmp_path,
            env=environment,
            capture_output=True,
            text=True,
        )
        assert done.returncode == 0, f"{command}\n{done.stdout}\n{done.stderr}"
        assert "Traceback" not in done.stderr


def test_quoted_answer_is_the_current_one():
    quoted = next(text for kind, text in BLOCKS if kind == "text").strip()
    kept = json.loads((ROOT / "reports" / "always-on-hub" / "summary.json").read_text(encoding="utf-8"))
    page = (ROOT / "reports" / "always-on-hub" / "report.html").read_text(encoding="utf-8")
    assert kept["verdict"] in quoted
    assert f"advantage {kept['advantage']:.2g}" in quoted
    record = re.search(r'<script[^>]*type="application/json"[^>]*>(.*?)</script>', page, flags=re.S)
    assert record is not None
    assert answer_sentence(json.loads(record.group(1))).startswith(quoted)


def test_contributor_notes_name_existing_files():
    text = (ROOT / "DEVELOPERS.md").read_text(encoding="utf-8")
    for name in re.findall(r"`((?:benchmark|tests|nodes)/[\w./-]+)`", text):
        assert (ROOT / name).exists(), name
