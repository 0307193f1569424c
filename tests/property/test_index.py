"""Which test holds which property of a correct engine: ``tests/data/property-index.csv``, read and checked here.

Columns: number of the property, what it says in short, the tests that hold it (file::function below ``tests``), and a
note: what the tests leave open, or why the property does not concern what the program does.
"""

from __future__ import annotations

import ast
import csv
import functools
from pathlib import Path

import pytest

TESTS = Path(__file__).resolve().parent.parent
INDEX = TESTS / "data" / "property-index.csv"
NUMBERS = range(1, 75)

Row = dict[str, str]


def rows() -> list[Row]:
    with INDEX.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


@functools.cache
def defined_in(name: str) -> frozenset[str]:
    """Names of the tests that a file defines; none when there is no such file."""
    path = TESTS / name
    if not path.is_file():
        return frozenset()
    tree = ast.parse(path.read_text(encoding="utf-8"))
    return frozenset(
        item.name for item in tree.body if isinstance(item, ast.FunctionDef) and item.name.startswith("test_")
    )


def problems(listed: list[Row]) -> list[str]:
    """Everything wrong with an index, a line each."""
    found = []
    numbers = [int(row["number"]) for row in listed]
    found += [f"property {number} is missing" for number in NUMBERS if number not in numbers]
    found += [
        f"property {number} stands {numbers.count(number)} times" for number in {*numbers} if numbers.count(number) > 1
    ]
    found += [f"property {number} is not known" for number in numbers if number not in NUMBERS]
    for row in listed:
        named = row["tests"].split()
        if not row["property"]:
            found.append(f"property {row['number']} does not say what it is")
        if not named and not row["note"]:
            found.append(f"property {row['number']} has neither a test nor a reason")
        for test in named:
            file, _, name = test.partition("::")
            if name not in defined_in(file):
                found.append(f"property {row['number']}: there is no test {test}")
    return found


def test_every_property_names_tests_that_exist_or_says_why_not():
    assert problems(rows()) == []
    assert sum(bool(row["tests"]) for row in rows()) >= 69


@pytest.mark.parametrize(
    ("change", "message"),
    [
        (lambda listed: listed[:-1], "property 74 is missing"),
        (lambda listed: [*listed, listed[0]], "property 1 stands 2 times"),
        (lambda listed: [*listed, listed[0] | {"number": "75"}], "property 75 is not known"),
        (
            lambda listed: [listed[0] | {"tests": "", "note": ""}, *listed[1:]],
            "property 1 has neither a test nor a reason",
        ),
        (lambda listed: [listed[0] | {"property": ""}, *listed[1:]], "property 1 does not say what it is"),
        (
            lambda listed: [listed[0] | {"tests": "property/test_index.py::test_gone"}, *listed[1:]],
            "property 1: there is no test property/test_index.py::test_gone",
        ),
        (
            lambda listed: [listed[0] | {"tests": "property/test_gone.py::test_index"}, *listed[1:]],
            "property 1: there is no test property/test_gone.py::test_index",
        ),
    ],
)
def test_a_wrong_index_is_noticed(change, message):
    assert problems(change(rows())) == [message]
