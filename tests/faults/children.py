"""The command line in processes of their own, many in little time: one process has everything imported and forks.

Every child is a whole run of ``evenload`` with its own standard output, exit status and death; what a child is told
beyond its arguments (limits, when to be killed) concerns the system under it, not the program.
"""

from __future__ import annotations

import json
import os
import subprocess
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any

__all__ = ["Children", "Died", "children"]

ROOT = Path(__file__).resolve().parents[2]

#: what the forking process does; it speaks JSON, one line per child
PROGRAM = """
import contextlib, json, os, resource, signal, sys, threading, time
import numpy, pandas, scipy.optimize, scipy.interpolate, pydantic, typer
import benchmark.cli.app, benchmark.cli.commands, benchmark.api.session, benchmark.record.run, benchmark.report.folder
import benchmark.record.check, benchmark.record.load, benchmark.record.write, benchmark.record.text
import benchmark.report.folder as folder
from benchmark.units import parse_unit
parse_unit("V")
seen = {"now": 0, "counts": False}
COUNTED = ("open", "os.mkdir", "os.rename", "os.chmod", "os.remove", "os.rmdir", "shutil.rmtree", "ctypes.dlsym")

def limit(task):
    if task.get("file_size"):
        signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
        resource.setrlimit(resource.RLIMIT_FSIZE, (task["file_size"], task["file_size"]))
    if task.get("no_exchange"):
        benchmark.record.write._exchange = lambda one, two: False
    if task.get("undrawn"):
        folder.charts = lambda record: {}
        folder.page = lambda record, drawn, drawings: "<!doctype html>" + "x" * 200000
        benchmark.record.run.closed_form_differences = lambda *_: []
    if task.get("known"):
        with open(task["known"], encoding="utf-8") as file:
            record = json.load(file)
        benchmark.api.run = lambda study, **told: benchmark.api.result.Result(record)
    if task.get("kill_at"):
        def hook(event, arguments):  # told of every step in the file system, before it is done
            if event == "tempfile.mkdtemp":
                seen["counts"] = True
            if seen["counts"] and event in COUNTED:
                seen["now"] += 1
                if seen["now"] == task["kill_at"]:
                    os.kill(os.getpid(), signal.SIGKILL)
        sys.addaudithook(hook)

def child(task):
    os.chdir(task["folder"])
    for number, name in ((1, task["out"]), (2, task["err"])):
        place = os.open(name, os.O_WRONLY | os.O_CREAT | os.O_TRUNC)
        os.dup2(place, number)
        os.close(place)
    limit(task)
    sys.argv = ["evenload", *task["arguments"]]
    try:
        benchmark.cli.app.main()
        status = 0
    except SystemExit as stopped:
        status = stopped.code if isinstance(stopped.code, int) else 0 if stopped.code is None else 1
    except BaseException:
        import traceback
        traceback.print_exc()
        status = 70
    for stream in (sys.stdout, sys.stderr):
        with contextlib.suppress(OSError, ValueError):
            stream.flush()
    os.write(task["steps"], str(seen["now"]).encode())
    os._exit(status)

for line in sys.stdin:
    task = json.loads(line)
    start = time.perf_counter()
    steps, task["steps"] = os.pipe()
    number = os.fork()
    if number == 0:
        child(task)
    if task.get("kill_after") is not None:
        timer = threading.Timer(task["kill_after"], os.kill, (number, signal.SIGKILL))
        timer.start()
        _, status = os.waitpid(number, 0)
        timer.cancel()
        timer.join()
    else:
        _, status = os.waitpid(number, 0)
    os.close(task["steps"])
    made = int(os.read(steps, 20) or 0)
    os.close(steps)
    seconds = time.perf_counter() - start
    print(json.dumps({"steps": made, "status": os.waitstatus_to_exitcode(status), "seconds": seconds}), flush=True)
"""


@dataclass(frozen=True)
class Died:
    """How a child ended: exit status (negative: the signal that killed it), what it printed, wall time [s].

    ``steps``: steps in the file system it made while writing a record, when they were counted.
    """

    status: int
    out: str
    err: str
    seconds: float
    steps: int


class Children:
    """Starts children one after another."""

    def __init__(self, process: subprocess.Popen[str], said: Path) -> None:
        self._process, self._said = process, said

    def run(self, folder: Path, *arguments: object, **told: Any) -> Died:
        """Run ``evenload`` with arguments in a folder.

        What may be told: ``file_size`` (largest file [bytes]), ``kill_at`` (the step in the file system, counted from
        the first one of the record folder, before which it is killed), ``kill_after`` (seconds), ``no_exchange`` (the
        system cannot exchange two folders), ``undrawn`` (no charts, a page without content), ``known`` (a
        ``record.json`` taken for the result instead of running the study).
        """
        place = {name: str(self._said / name) for name in ("out", "err")}
        task = {"folder": str(folder), "arguments": [str(word) for word in arguments], **place, **told}
        assert self._process.stdin is not None
        assert self._process.stdout is not None
        self._process.stdin.write(json.dumps(task) + "\n")
        self._process.stdin.flush()
        died = json.loads(self._process.stdout.readline())
        out, err = ((self._said / name).read_text(encoding="utf-8", errors="replace") for name in ("out", "err"))
        return Died(died["status"], out, err, died["seconds"], died["steps"])


@contextmanager
def children(said: Path) -> Iterator[Children]:
    """Hold the forking process; ``said``: a folder for what the children print."""
    environment = {**os.environ, "PYTHONPATH": str(ROOT), "OMP_NUM_THREADS": "1", "NO_COLOR": "1", "TERM": "dumb"}
    process = subprocess.Popen(
        [sys.executable, "-c", PROGRAM],
        stdin=subprocess.PIPE,
        stdout=subprocess.PIPE,
        text=True,
        env={**environment, "COLUMNS": "200"},
    )
    try:
        yield Children(process, said)
    finally:
        assert process.stdin is not None
        process.stdin.close()
        process.wait(timeout=60)
        assert process.stdout is not None
        process.stdout.close()
