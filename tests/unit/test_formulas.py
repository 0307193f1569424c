"""Formulas of derived values: arithmetic over names, never code."""

from __future__ import annotations

import numpy as np
import pytest

from benchmark.sets.formulas import FormulaError, evaluate_formula, names_in

VALUES = {"a": np.array([2.0, 3.0]), "b": np.array([4.0]), "zero": np.array([0.0]), "big": np.array([1e300])}


@pytest.mark.parametrize(
    ("formula", "result"),
    [
        ("a + b", [6.0, 7.0]),
        ("a - b", [-2.0, -1.0]),
        ("-a", [-2.0, -3.0]),
        ("a * b / 2", [4.0, 6.0]),
        ("2 * a ** 2 + 1.5e0", [9.5, 19.5]),
        ("(a + b) * (a - b)", [-12.0, -7.0]),
        ("7", [7.0]),
    ],
)
def test_arithmetic_node_by_node(formula: str, result: list[float]):
    assert evaluate_formula(formula, VALUES).tolist() == result


@pytest.mark.parametrize(
    ("formula", "message"),
    [
        ("c + 1", "uses 'c', which the set does not have"),
        ("sqrt(a)", "may use only names, numbers and + - * / **"),
        ("a.real", "may use only names, numbers and + - * / **"),
        ("a[0]", "may use only names, numbers and + - * / **"),
        ("a if b else a", "may use only names, numbers and + - * / **"),
        ("a < b", "may use only names, numbers and + - * / **"),
        ("a % b", "may use only names, numbers and + - * / **"),
        ("'text'", "may use only names, numbers and + - * / **"),
        ("True", "may use only names, numbers and + - * / **"),
        ("1j", "may use only names, numbers and + - * / **"),
        ("__import__('os').getcwd()", "may use only names, numbers and + - * / **"),
        ("lambda: 0", "may use only names, numbers and + - * / **"),
        ("a +", "is not an arithmetic expression"),
        ("a; b", "is not an arithmetic expression"),
        ("", "is not an arithmetic expression"),
        ("\0", "is not an arithmetic expression"),
        ("(" * 300, "is not an arithmetic expression"),
        ("a / zero", "cannot be computed with these values"),
        ("big * big", "cannot be computed with these values"),
        ("zero / zero", "cannot be computed with these values"),
        ("9 ** 9 ** 9 ** 9", "cannot be computed with these values"),
        ("a + " * 100 + "a", "is longer than 400 characters"),
    ],
)
def test_anything_else_is_refused_in_words(formula: str, message: str):
    with pytest.raises(FormulaError) as caught:
        evaluate_formula(formula, VALUES)
    assert str(caught.value) == message


def test_names_of_a_formula():
    assert names_in("2 * a ** b - c") == {"a", "b", "c"}
    assert names_in("a +") == frozenset()
