"""One ngspice batch job: deck in, printed numbers and written tables out, an exception on any doubt.

The exit status is no evidence: ngspice leaves with 0 after a failed measurement, an unknown vector or a division by
zero, and with 1 after some good runs. So the numbers asked for must be there, by name, and be finite; a table must be
there with the names asked for. A missing ngspice fails the test that needs it, it does not skip it.

Every job has a folder of its own as working directory and home, so no start-up file of the user takes part, and runs on
one thread: with two, Debian's build spins them against each other.
"""

from __future__ import annotations

import os
import re
import shutil
import signal
import subprocess
import tempfile
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path

import numpy as np

__all__ = ["SpiceError", "SpiceRun", "run_deck"]

#: lines of the log that are shown when something is wrong
_TAIL = 40
_NUMBER = re.compile(r"^\s*([A-Za-z_]\w*)\s*=\s*([-+]?(?:\d+\.?\d*(?:[eE][-+]?\d+)?|inf|nan))\b", re.MULTILINE)


class SpiceError(AssertionError):
    """The job did not give what was asked for."""


@dataclass(frozen=True)
class SpiceRun:
    """``numbers`` by name as printed (the last one of a name), ``tables`` by file name, the whole log."""

    numbers: dict[str, float]
    tables: dict[str, dict[str, np.ndarray]]
    log: str


def _program() -> str:
    found = shutil.which("ngspice")
    if found is None:
        message = "ngspice is not installed; these tests need it (Debian package: ngspice)"
        raise SpiceError(message)
    return found


def _execute(folder: Path, timeout: float) -> str:
    environment = {"PATH": os.environ.get("PATH", ""), "HOME": str(folder), "LC_ALL": "C", "OMP_NUM_THREADS": "1"}
    with subprocess.Popen(
        [_program(), "-b", "deck.sp"],
        cwd=folder,
        env=environment,
        stdin=subprocess.DEVNULL,
        stdout=subprocess.PIPE,
        stderr=subprocess.STDOUT,
        start_new_session=True,
    ) as job:
        try:
            output, _ = job.communicate(timeout=timeout)
        except subprocess.TimeoutExpired as error:
            os.killpg(job.pid, signal.SIGKILL)
            job.wait()
            message = f"ngspice did not finish within {timeout:g} s"
            raise SpiceError(message) from error
    return output.decode("utf-8", errors="replace")


def _tail(log: str) -> str:
    return "\n".join(log.splitlines()[-_TAIL:])


def _table(path: Path, names: Iterable[str], log: str) -> dict[str, np.ndarray]:
    if not path.is_file():
        message = f"ngspice wrote no {path.name}\n{_tail(log)}"
        raise SpiceError(message)
    lines = path.read_text(encoding="utf-8").splitlines()
    found = lines[0].split() if lines else []
    missing = [name for name in names if name not in found]
    if missing or len(lines) < 2:
        message = f"{path.name} has the columns {found}, without {missing}, and {len(lines) - 1} rows\n{_tail(log)}"
        raise SpiceError(message)
    values = np.array([[float(word) for word in line.split()] for line in lines[1:]])
    if values.shape[1] != len(found) or not np.isfinite(values).all():
        message = f"{path.name} is not a table of finite numbers\n{_tail(log)}"
        raise SpiceError(message)
    return {name: values[:, found.index(name)] for name in names}


def run_deck(
    deck: str,
    numbers: Iterable[str] = (),
    tables: dict[str, tuple[str, ...]] | None = None,
    timeout: float = 60.0,
) -> SpiceRun:
    """Run a deck.

    Parameters
    ----------
    deck : str
        The whole deck with its control block.
    numbers : iterable of str
        Names that must be printed as ``name = value``.
    tables : dict, optional
        File name of a ``wrdata`` (with ``wr_singlescale`` and ``wr_vecnames``) -> column names that must be in it.
    timeout : float
        Seconds.

    Raises
    ------
    SpiceError
        If ngspice is missing or too slow, or anything asked for is absent or not finite.
    """
    asked = tuple(numbers)
    if not asked and not tables:
        message = "a run that is asked for nothing proves nothing"
        raise SpiceError(message)
    with tempfile.TemporaryDirectory(prefix="ngspice-") as name:
        folder = Path(name)
        (folder / "deck.sp").write_text(deck, encoding="ascii")
        (folder / ".spiceinit").write_text("set num_threads=1\n", encoding="ascii")
        log = _execute(folder, timeout)
        found = {match[1].lower(): float(match[2]) for match in _NUMBER.finditer(log)}
        bad = [name for name in asked if not np.isfinite(found.get(name, np.nan))]
        if bad:
            message = f"ngspice did not print a finite {', '.join(bad)}\n{_tail(log)}"
            raise SpiceError(message)
        read = {file: _table(folder / file, columns, log) for file, columns in (tables or {}).items()}
    return SpiceRun({name: found[name] for name in asked}, read, log)
