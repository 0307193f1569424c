"""A batch that is stopped from the keyboard: exit status 130, no traceback, no half-written record, no process left."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from tests.five_studies import five_studies

EVENLOAD = Path(sys.executable).parent / "evenload"
#: seconds after which the processes have begun to draw, and those after which all must have ended
BEGUN, PATIENCE = 8.0, 60.0


@pytest.mark.parametrize("to_all", [True, False])
@pytest.mark.parametrize("after", [2.0, BEGUN])
def test_an_interrupt_ends_all_processes_and_leaves_nothing(tmp_path: Path, after: float, to_all: bool):
    """While processes start or while they draw; to all of them, as a terminal sends it, or to the first alone."""
    five_studies(tmp_path / "all")
    words = [EVENLOAD, "batch", "all", "--jobs", "2", "--draws", str(2**20), "--out", "records"]
    started = subprocess.Popen(
        words, cwd=tmp_path, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, start_new_session=True
    )
    try:
        time.sleep(after)
        (os.killpg if to_all else os.kill)(started.pid, signal.SIGINT)
        out, said = started.communicate(timeout=PATIENCE)  # until the last process has let go of its output
    except subprocess.TimeoutExpired:
        os.killpg(started.pid, signal.SIGKILL)
        started.communicate()
        raise
    assert started.returncode == 130
    assert "stopped; nothing half-written" in said
    assert "Traceback" not in said
    assert out == ""
    assert [path for path in tmp_path.rglob("*") if path.name == "record.json" or ".evenload-" in path.name] == []
