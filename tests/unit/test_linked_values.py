"""A derived value follows the values its formula names, in every row of a batch."""

from __future__ import annotations

import numpy as np

from benchmark.evaluate.batch import Batch, resolve
from benchmark.sets.values import Value
from tests.near import near


def value(name: str, si: float, formula: str = "") -> Value:
    return Value(name, np.array([si]), "1", None, "derived" if formula else "measured", "s", formula=formula)


VALUES = {"a": value("a", 3.0), "b": value("b", 4.0), "c": value("c", 0.75, "a / b"), "d": value("d", 2.2, "c * a")}


def flat(found: dict[str, np.ndarray], name: str) -> list[float]:
    return [float(x) for x in np.ravel(found[name])]


def test_nothing_moved_nothing_computed():
    found = resolve("set", VALUES, Batch.best_estimate())
    assert flat(found, "c") == [0.75]
    assert flat(found, "d") == [2.2]  # as stated, although the formula gives 2.25


def test_a_moved_input_moves_what_follows_from_it_and_only_that():
    found = resolve("set", VALUES, Batch(3, {"set.b": np.array([4.0, 2.0, 8.0])}))
    assert flat(found, "a") == [3.0]
    assert flat(found, "c") == near([0.75, 1.5, 0.375], rel=1e-15)
    assert flat(found, "d") == near([2.2, 4.4, 1.1], rel=1e-15)
    assert flat(found, "d")[0] == 2.2  # row 0 is the file, to the bit


def test_a_value_moved_itself_does_not_follow():
    batch = Batch(2, {"set.b": np.array([4.0, 2.0]), "set.c": np.array([0.75, 0.9])})
    found = resolve("set", VALUES, batch)
    assert flat(found, "c") == [0.75, 0.9]
    assert flat(found, "d") == near([2.2, 2.2 * 0.9 / 0.75], rel=1e-15)


def test_a_part_of_a_batch_gives_the_same_rows():
    whole = Batch(3, {"set.b": np.array([4.0, 2.0, 8.0])})
    part = resolve("set", VALUES, whole.take(np.array([2, 1])))
    assert flat(part, "d") == flat(resolve("set", VALUES, whole), "d")[:0:-1]


def test_overheads_follow_values_of_the_study():
    overhead = {"e": value("e", 6.0, "2 * a")}
    found = resolve("candidate.overhead", overhead, Batch(2, {"study.a": np.array([3.0, 5.0])}), {"a": VALUES["a"]})
    assert list(found) == ["e"]
    assert flat(found, "e") == near([6.0, 10.0], rel=1e-15)
