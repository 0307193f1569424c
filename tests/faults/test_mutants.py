"""Ten thousand spoiled files through the loader and the check, and some of them through the command line.

Whatever stands in a file: no exception but the refusal, no warning, no half result, a message with file and place, in
bounded time and memory. The mutants are the same in every run. A longer run, for example ten times as many with other
random choices:

    EVENLOAD_MUTANTS=100000 EVENLOAD_MUTANTS_KEY=tuesday .venv/bin/pytest tests/faults/test_mutants.py
"""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from tests.faults.children import Children
from tests.faults.guard import KEY, Folder, Mutant, Seen, faults_of, mutants
from tests.faults.seeds import seeds

TOTAL = int(os.environ.get("EVENLOAD_MUTANTS", "10000"))
CHOSEN_KEY = os.environ.get("EVENLOAD_MUTANTS_KEY", KEY)
#: of so many mutants one also goes through the command line
ONE_OF = 50
SHARES = {name: seed.share for name, seed in seeds().items()}


def count_of(name: str) -> int:
    """How many mutants of a seed: the shares add up to at least the total."""
    return -int(-TOTAL * SHARES[name] // sum(SHARES.values()))


def test_there_are_enough_mutants_and_no_two_are_the_same():
    assert sum(map(count_of, SHARES)) >= TOTAL
    assert sum(len(range(0, count_of(name), ONE_OF)) for name in SHARES) * 10_000 >= 150 * TOTAL
    some = [mutant.raw for name, seed in seeds().items() for mutant in mutants(name, seed, 20)]
    again = [mutant.raw for name, seed in seeds().items() for mutant in mutants(name, seed, 20)]
    other = [mutant.raw for name, seed in seeds().items() for mutant in mutants(name, seed, 20, "other key")]
    assert some == again
    assert len(set(some) & set(other)) < len(some) / 5


@pytest.mark.parametrize("name", SHARES)
def test_a_seed_is_fine(name: str, tmp_path: Path):
    folder = Folder(tmp_path, seeds()[name])
    seen = faults_of(folder.checked, tmp_path, {})
    assert seen.faults == []
    assert seen.result is not None
    assert seen.result.problems == ()


@pytest.mark.parametrize("name", SHARES)
def test_mutants(name: str, tmp_path: Path, evenload: Children):
    seed, faults, refused, changed = seeds()[name], [], 0, 0
    folder = Folder(tmp_path, seed)
    for number, mutant in enumerate(mutants(name, seed, count_of(name), CHOSEN_KEY)):
        with folder.spoiled(mutant) as path:
            seen = faults_of(path, tmp_path, {mutant.file: mutant.raw})
            if number % ONE_OF == 0:
                seen.faults += _faults_of_command_line(evenload, tmp_path, path, mutant, seen)
        changed += mutant.raw != seed.files[mutant.file].encode()
        refused += bool(seen.result and seen.result.problems)
        faults += [f"{mutant.name} ({mutant.how}): {fault}" for fault in seen.faults]
    assert faults == []
    # the mutants are worth something: nearly all are changed, and most of those are refused
    assert changed > 0.9 * count_of(name) - 5
    assert refused > 0.6 * count_of(name) - 5


def _faults_of_command_line(evenload: Children, root: Path, path: Path, mutant: Mutant, seen: Seen) -> list[str]:
    """The same in a process of its own: status, standard error, and no file that was not there."""
    before = sorted(root.rglob("*"))
    study = path.name == "study.toml" and seen.result is not None and seen.result.problems
    words = ["run", path, "--out", root / "record"] if study else ["check", path]
    died = evenload.run(root, *words)
    faults = []
    wanted = 3 if seen.result is None or seen.result.problems else 0
    if died.status != wanted:
        faults.append(f"status {died.status} instead of {wanted}: {died.err[:300]!r}")
    lines = died.err.splitlines()
    if wanted == 3 and not any(line.startswith("evenload: input refused, ") for line in lines):
        faults.append(f"is not refused in words: {died.err[:300]!r}")
    if wanted == 0 and any(not line.startswith("warning: ") for line in lines):
        faults.append(f"says more than warnings: {died.err[:300]!r}")
    if "Traceback" in died.err or "Warning:" in died.err:
        faults.append(f"shows the inside of the program: {died.err[:300]!r}")
    if sorted(root.rglob("*")) != before:
        faults.append("left a file behind")
    return faults
