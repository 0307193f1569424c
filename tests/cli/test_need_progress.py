"""Progress of needs in a run, and a clean stop: exit status 130, no traceback, no half-written record."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from benchmark import api
from benchmark.errors import UsageError
from benchmark.sets.library import shipped_reports
from tests.cli.conftest import Run
from tests.studies import hub

EVENLOAD = Path(sys.executable).parent / "evenload"


def test_every_question_is_told_with_the_comparisons_made(tmp_path: Path):
    told: list[tuple[str, float]] = []
    result = api.run(hub().write(tmp_path), need=True, progress=lambda step, share: told.append((step, share)))
    shares = [share for _, share in told]
    assert shares == sorted(shares)
    assert told[-1] == ("done", 1.0)
    for block in result.record["need"]:
        counted = [step for step, _ in told if step.startswith(f"{block['title']}: ") and step.endswith(" comparisons")]
        assert counted, block["title"]
    before = [share for step, share in told if "comparisons" not in step and step != "done"]
    assert min(before) == 0.0


def test_a_question_without_an_answer_leaves_the_others(tmp_path: Path, monkeypatch: pytest.MonkeyPatch):
    words = "sets of 2 of 300 inputs need 179400 comparisons; at most 20000"

    def too_many(*arguments: object, **named: object) -> None:
        raise UsageError(words)

    monkeypatch.setattr("benchmark.api.need_blocks.flips", too_many)
    result = api.run(hub().write(tmp_path), need=True)
    by_key = {block["key"]: block for block in result.record["need"]}
    assert by_key["flips"]["facts"] == [["not answered", words]]
    assert by_key["break-evens"]["rows"]
    result.report(tmp_path / "report.html")
    assert words in (tmp_path / "report.html").read_text(encoding="utf-8")


def test_a_study_without_an_advantage_still_answers_what_it_can(tmp_path: Path):
    record = api.run(hub(relay_delay="600").write(tmp_path), need=True).record  # 12 us in a cycle of 10 us
    assert record["verdict"]["advantage"] is None
    keys = [block["key"] for block in record["need"]]
    assert keys == ["break-evens", "improve", "flips", "map-activity"]
    clock = next(row for row in record["need"][0]["rows"] if row["name"] == "study.clock_frequency")
    assert clock["advantage_today"] is None


def test_an_interrupt_during_needs_leaves_no_record(
    evenload: Run, tmp_path: Path, quick: None, monkeypatch: pytest.MonkeyPatch
):
    hub().write(tmp_path / "hub")

    def stop(*arguments: object, **named: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr("benchmark.api.need_blocks.improve", stop)
    ran = evenload("run", "hub/study.toml", "--need", "--out", "out")
    assert ran.status == 130
    assert "stopped; nothing half-written" in ran.err
    assert ran.out == ""
    assert sorted(path.name for path in tmp_path.iterdir()) == ["hub"]


def test_an_interrupt_of_a_question_is_clean(tmp_path: Path):
    study = shipped_reports() / "always-on-hub" / "study.toml"
    started = subprocess.Popen(
        [EVENLOAD, "need", study], cwd=tmp_path, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True,
        start_new_session=True,
    )  # fmt: skip
    time.sleep(6.0)
    os.killpg(started.pid, signal.SIGINT)
    out, said = started.communicate(timeout=60)
    assert started.returncode == 130
    assert "stopped; nothing half-written" in said
    assert "Traceback" not in said
    assert out == ""
    assert list(tmp_path.iterdir()) == []
