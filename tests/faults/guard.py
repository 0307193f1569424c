"""One mutant through the loader and the check, and what must hold whatever is in its files."""

from __future__ import annotations

import random
import re
import resource
import signal
import time
import warnings
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from types import FrameType

from benchmark.errors import Problem
from benchmark.record.check import CheckResult, check_paths
from tests.faults.mutate import mutate
from tests.faults.seeds import Seed

__all__ = ["KEY", "SLOWEST", "Folder", "Mutant", "faults_of", "mutants"]

#: the fixed key of all random choices
KEY = "evenload faults 1"
#: processor time [s] one mutant may take, and resident memory [MB] it may add to the peak of the process
SLOWEST, LARGEST = 4.0, 150.0
#: a line of a message longer than this is not read by anybody
LONGEST = 6000
#: wall time [s] after which a mutant counts as hung
HUNG = 30
#: what ends a line of a raw file; old instruments write carriage returns alone
_LINE_END = re.compile(rb"\r\n|\r|\n")


class Hung(BaseException):
    """A mutant did not come back."""


@dataclass(frozen=True)
class Mutant:
    """A seed with one file spoiled."""

    name: str
    seed: str
    file: str
    raw: bytes
    how: str


def mutants(name: str, seed: Seed, count: int, key: str = KEY) -> Iterator[Mutant]:
    """The first ``count`` mutants of a seed; each depends on the key, the seed's name and its number alone."""
    for number in range(count):
        rng = random.Random(f"{key}/{name}/{number}")
        file = rng.choice(seed.spoiled)
        raw, how = mutate(seed.files[file], file.endswith(".csv"), rng)
        yield Mutant(f"{name}/{number}", name, file, raw, how)


class Folder:
    """The files of a seed on disk; one of them is spoiled at a time."""

    def __init__(self, place: Path, seed: Seed) -> None:
        self.place, self.files = place, seed.files
        self.checked = place / next(iter(seed.files))
        for name, text in seed.files.items():
            self._write(name, text.encode())

    def _write(self, name: str, raw: bytes) -> None:
        path = self.place / name
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_bytes(raw)

    @contextmanager
    def spoiled(self, mutant: Mutant) -> Iterator[Path]:
        """Hold the mutant's file on disk; yields the file to check."""
        self._write(mutant.file, mutant.raw)
        try:
            yield self.checked
        finally:
            self._write(mutant.file, self.files[mutant.file].encode())


@dataclass
class Seen:
    """What happened to one mutant."""

    faults: list[str] = field(default_factory=list)
    result: CheckResult | None = None
    seconds: float = 0.0
    grown: float = 0.0


def _peak() -> float:
    """Largest resident memory of the process so far [MB]."""
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024.0


@contextmanager
def _not_for_ever() -> Iterator[None]:
    def stop(signum: int, frame: FrameType | None) -> None:
        raise Hung

    before = signal.signal(signal.SIGALRM, stop)
    signal.alarm(HUNG)
    try:
        yield
    finally:
        signal.alarm(0)
        signal.signal(signal.SIGALRM, before)


def faults_of(path: Path, root: Path, changed: Mapping[str, bytes]) -> Seen:
    """Check a file and list what must not happen: exceptions, warnings, unusable messages, too much time or memory.

    Parameters
    ----------
    path : Path
        The file to check.
    root : Path
        Folder of all files of the seed.
    changed : mapping
        Name in the folder -> content, of the spoiled files: lines named in messages must exist there.
    """
    seen = Seen()
    peak, start = _peak(), time.process_time()
    with warnings.catch_warnings(record=True) as escaped:
        warnings.simplefilter("always")
        try:
            with _not_for_ever():
                seen.result = check_paths([path])
        except Hung:
            seen.faults.append(f"did not come back within {HUNG} s")
        except BaseException as error:  # whatever it is, it must not come out
            seen.faults.append(f"let out {type(error).__name__}: {str(error)[:200]}")
    seen.seconds, seen.grown = time.process_time() - start, _peak() - peak
    seen.faults += [f"warned {item.category.__name__}: {str(item.message)[:200]}" for item in escaped]
    if seen.seconds > SLOWEST:
        seen.faults.append(f"took {seen.seconds:.1f} s")
    if seen.grown > LARGEST:
        seen.faults.append(f"took {seen.grown:.0f} MB more than any before")
    if seen.result is not None:
        for problem in (*seen.result.problems, *seen.result.warnings):
            seen.faults += _unusable(problem, root, changed)
    return seen


def _unusable(problem: Problem, root: Path, changed: Mapping[str, bytes]) -> list[str]:
    """What is wrong with a message: it must name a file there is, a line of it, and say something readable."""
    found, text = [], str(problem)
    if not problem.file or not problem.what:
        found.append(f"says no file or no reason: {text[:200]!r}")
    if len(text) > LONGEST:
        found.append(f"has a message of {len(text)} characters: {text[:100]!r}")
    name = problem.file.replace(f"{root}/", "")
    for spoiled, raw in changed.items():
        lines = len(_LINE_END.findall(raw)) + 1
        if (name == spoiled or spoiled.endswith(f"/{name}")) and problem.line > lines:
            found.append(f"names line {problem.line} of {lines}: {text[:200]!r}")
    known = any(name == there or there.endswith(name) or name.endswith(there) for there in _names(root))
    if not known and not problem.what.startswith(("does not exist", "cannot be read", "is a folder", "is not a")):
        found.append(f"names a file that is not there: {text[:200]!r}")
    if "Traceback" in text or " object at 0x" in text:
        found.append(f"shows the inside of the program: {text[:200]!r}")
    return found


def _names(root: Path) -> list[str]:
    return [str(path.relative_to(root)) for path in root.rglob("*") if path.is_file()]
