"""Every message of the files layer, read whole: each case spoils one valid file at one place."""

from __future__ import annotations

import ast
import re
from pathlib import Path

import pytest

import benchmark.curves
import benchmark.sets
from tests import refusals
from tests.refusals import Case, cases, check, files

CASES = dict(cases())
KINDS = ["technology", "stages", "wires", "circuit", "sources", "table", "curves", "requests", "side-by-side", "study"]
#: messages that need more than a spoiled file; the tests that read them are named
ELSEWHERE = {
    "is a folder, a file is needed": "test_files.py",
    "is not a regular file": "test_files.py",
    "is too large": "test_files.py",
    "cannot be read (": "test_files.py",
    "is not a usable path": "test_files.py",
    "is not UTF-8 text": "test_files.py",
    "starts with a byte order mark": "test_files.py",
    "is not usable TOML (": "test_files.py",
    "is nested too deeply": "test_files.py",
    "is binary": "test_measured_tables.py",
    "has too many rows": "test_measured_tables.py",
    "has too many columns": "test_mended.py",
    "has a byte order mark of another encoding": "test_curves.py",
    "is not utf-8 text": "test_curves.py",
    "looks like logarithms, and the description does not say so": "test_curves.py",
    "(further rows alike are not listed)": "test_curves.py",
    "is absolute beside numbers per width, but no width is stated": "test_curves.py",
    "is beyond the range of the program with this width": "test_curves.py",
    "there is no such set": "test_sets_library.py",
    "is not a value of the set": "test_sets_library.py",
    "compares two nodes of ": "test_study.py",
    "leaves out the contender that sets the required time": "test_study.py",
    " needs declared_supply in the set ": "test_study.py",
    "must be true: a table of an input set is invented": "test_study.py",
    "must be true: stage results of a set are invented": "test_study.py",
    "is not a wires set": "test_study.py",
    "is a wires set": "test_study.py",
    "is not possible: the number shapes the netlist of the circuit": "test_study.py",
    "there is no such circuit": "test_study.py",
    "is used with workload.topology = own-best only": "test_study.py",
    "is own-best, and no side names a circuit other than the common one": "test_study.py",
    "does not say its function, so no other circuit can stand for it": "test_study.py",
    "has another function than the common circuit": "test_study.py",
    "is not UTF-8 text; no change was written": "test_change_line.py",
    "cannot be used (": "test_change_line.py",
    "is not a known column": "test_sheet.py",
    "does not begin with ": "test_sheet.py",
    " as an exported sheet does": "test_sheet.py",
    "stands twice": "test_sheet.py",
    "is a column that stands twice": "test_sheet.py",
    "lacks its first rows (set, digest, change) or the row of column names": "test_sheet.py",
    "lacks a column that is needed": "test_sheet.py",
    "stands in a column without a name": "test_sheet.py",
    "is not readable as cells (": "test_sheet.py",
    "stands in a layout that cannot be edited; edit it by hand": "test_supersede.py",
    "does not say from which day its old number held, so its past": "test_supersede.py",
    "); nothing was written": "test_change_line.py",
    "has a history without dates": "test_history.py",
    "has no number yet on that day": "test_history.py",
    " is not older than what follows": "test_history.py",
    "has superseded numbers but no date of its own": "test_history.py",
    "states wire layers of its own; only the common circuit may": "test_study.py",
    "is not a set of the candidate's model": "test_outlook.py",
    "belongs to the candidate alone": "test_outlook.py",
}


@pytest.mark.parametrize("kind", KINDS)
def test_the_files_the_cases_start_from_are_fine(kind: str, tmp_path: Path):
    said = check(tmp_path, dict(files(kind)))
    assert said.refused == []
    assert said.warned == []


@pytest.mark.parametrize("name", CASES)
def test_a_spoiled_file_is_refused_with_exactly_these_words(name: str, tmp_path: Path):
    case: Case = CASES[name]
    said = check(tmp_path, case.spoiled())
    assert said.refused == list(case.refused)
    assert said.warned == list(case.warned)


# -- no message without a case ---------------------------------------------------------------------------------


def _constant_parts(node: ast.expr) -> list[str]:
    """The fixed words of a message: a string, the fixed parts of an f-string, or of both branches of a choice."""
    if isinstance(node, ast.Constant) and isinstance(node.value, str):
        return [node.value]
    if isinstance(node, ast.JoinedStr):
        fixed = [part.value for part in node.values if isinstance(part, ast.Constant) and isinstance(part.value, str)]
        return [part for part in fixed if len(part) > 3]
    if isinstance(node, ast.IfExp):
        return _constant_parts(node.body) + _constant_parts(node.orelse)
    return []


def _messages(path: Path) -> set[str]:
    """Fixed words of the ``what`` of every problem a module can report."""
    position = {"problem": 1, "refuse": 1, "Problem": 3}
    found: set[str] = set()
    tree = ast.parse(path.read_text(encoding="utf-8"))
    for node in ast.walk(tree):
        if not isinstance(node, ast.Call):
            continue
        name = node.func.attr if isinstance(node.func, ast.Attribute) else getattr(node.func, "id", "")
        at = position.get(name)
        if path.name == "values.py" and name == "refuse":
            at = 0  # the local function of a spread, which knows its place
        if at is not None and len(node.args) > at:
            found.update(_constant_parts(node.args[at]))
    return {part for part in found if part}


MODULES = sorted(
    path for package in (benchmark.sets, benchmark.curves) for path in Path(str(package.__file__)).parent.glob("*.py")
)


@pytest.mark.parametrize("path", MODULES, ids=lambda path: path.stem)
def test_every_message_stands_in_a_case(path: Path):
    read = "\n".join(line for case in CASES.values() for line in (*case.refused, *case.warned))
    missing = {part for part in _messages(path) if part not in read and not _elsewhere(part)}
    assert missing == set()


def _elsewhere(part: str) -> bool:
    return any(part.strip() and (part in known or known in part) for known in ELSEWHERE)


def test_the_scan_for_messages_finds_them():
    """The scan above can fail: it sees the messages of a module that is known to have some."""
    found = _messages(Path(benchmark.sets.__file__).parent / "study_policy.py")
    assert "must be above 0" in found
    assert len(found) >= 12


@pytest.mark.parametrize(("message", "module"), sorted(ELSEWHERE.items()))
def test_messages_read_elsewhere_stand_in_the_test_that_is_named(message: str, module: str):
    (place,) = Path(refusals.__file__).parent.glob(f"*/{module}")
    text = place.read_text(encoding="utf-8")
    assert re.sub(r"\s+", " ", message).strip() in re.sub(r"\s+", " ", text)
