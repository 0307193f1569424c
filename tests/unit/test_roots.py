"""Bracketed elementwise roots."""

from __future__ import annotations

import numpy as np
import pytest

from benchmark.physics.roots import falling_root

ROOTS = np.linspace(0.0, 5.0, 101)


@pytest.mark.parametrize(
    "function",
    [
        lambda x: ROOTS - x,
        lambda x: np.exp(-x) - np.exp(-ROOTS),
        lambda x: ROOTS**3 - x**3,
        lambda x: np.where(x < ROOTS, 1.0, -1.0),
        lambda x: np.maximum(ROOTS - x, -1e-3) * 1e6,
    ],
)
def test_roots_are_found_to_rounding(function):
    found = falling_root(function, np.full_like(ROOTS, -1.0), np.full_like(ROOTS, 9.0))
    np.testing.assert_allclose(found, ROOTS, atol=2e-14)


def test_an_element_does_not_depend_on_its_neighbours():
    def solve(k: np.ndarray) -> np.ndarray:
        return falling_root(lambda x: np.exp(-3.0 * x) - k, np.zeros_like(k), np.ones_like(k))

    k = np.linspace(0.06, 0.9, 37)
    together = solve(k)
    alone = np.array([float(solve(item)) for item in k])
    np.testing.assert_array_equal(together, alone)


def test_smooth_functions_take_few_evaluations():
    calls = []

    def function(x: np.ndarray) -> np.ndarray:
        calls.append(1)
        return np.exp(-x) - np.exp(-ROOTS[1:])

    falling_root(function, np.zeros(100), np.full(100, 10.0))
    assert len(calls) < 20


def test_no_bracket_and_nan_come_back_without_a_warning():
    found = falling_root(lambda x: np.array([1.0, np.nan]) + 0.0 * x, np.zeros(2), np.ones(2))
    assert found.shape == (2,)
