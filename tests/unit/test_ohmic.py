"""The log-linear window of a switch of which only two resistances and a level are known."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from benchmark.physics.ohmic import conduction_window, log_linear_conductance, perfect_conductance


@settings(deadline=None, max_examples=200)
@given(st.floats(0.02, 0.995), st.floats(0.35, 14.0))
def test_window_meets_the_level_and_lies_inside_the_swing(level, decades):
    start, end = conduction_window(level, decades)
    assert 0.0 <= start < end <= 1.0
    g = log_linear_conductance([level, 1.0, end, 0.0], 1e4, decades, start, end)
    assert g[1] / g[0] == pytest.approx(2.0, rel=1e-9)
    assert g[1] == g[2] == 1e-4
    assert g[3] == pytest.approx(1e-4 * 10.0**-decades, rel=1e-12)
    # the widest window: it touches one of the rails
    assert start == 0.0 or end == 1.0


def test_window_is_continuous_where_it_reaches_the_full_swing():
    decades = 6.0
    edge = 1.0 - np.log10(2.0) / decades
    start, end = conduction_window(np.array([edge - 1e-12, edge + 1e-12]), decades)
    assert start == pytest.approx([0.0, 0.0], abs=1e-9)
    assert end == pytest.approx([1.0, 1.0], abs=1e-9)


@settings(deadline=None, max_examples=100)
@given(st.floats(0.05, 0.99))
def test_a_perfect_switch_is_open_at_zero_closed_at_full_and_half_at_its_level(level):
    g = perfect_conductance(np.array([0.0, level, 1.0]), 1e4, level)
    assert g[0] == 0.0
    assert g[1] == pytest.approx(0.5e-4, rel=1e-9)
    assert g[2] == 1e-4
    assert (np.diff(perfect_conductance(np.linspace(0.0, 1.0, 200), 1e4, level)) >= 0.0).all()
