"""Integral delay rule against the transient, its limits and its scaling."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from benchmark.circuits.integral import integral_delay, integral_factors
from benchmark.circuits.rules import EdgeInputs, rule_by_name
from benchmark.circuits.transient import ChainLoad, chain_transient
from tests.factories import ohmic_pair
from tests.soft_window import C_NODE, R_ON, RC, soft_pair, two_pole

NODE = ChainLoad(C_NODE)
LOAD = np.asarray(C_NODE)


@pytest.mark.parametrize("window", [(0.2, 0.8), (0.35, 0.65), (0.1, 0.5), (0.5, 0.9)])
@pytest.mark.parametrize("decades", [2.0, 5.0])
@pytest.mark.parametrize(("ratio", "quality"), [(0.1, 0.7), (1.0, 0.5), (3.0, 0.7), (10.0, 1.0), (100.0, 0.7)])
def test_chain_with_actuator_is_within_the_stated_error_of_the_transient(window, decades, ratio, quality):
    pair = soft_pair(decades, *window, **two_pole(ratio, quality))
    found = integral_delay(pair.down, pair.supply, LOAD, opening=pair.up)
    transient = chain_transient(pair, NODE).delay
    assert -0.034 <= float(found) / transient - 1.0 <= 0.037


@pytest.mark.parametrize("decades", [2.0, 4.0, 6.0])
@pytest.mark.parametrize(("ratio", "low", "high"), [(0.0, -0.12, -0.08), (1.0, -0.2, -0.04), (10.0, 0.01, 0.04)])
def test_windows_that_fill_the_swing_have_the_stated_error(decades, ratio, low, high):
    pair = soft_pair(decades, 0.0, 1.0, **(two_pole(ratio, 1.0) if ratio > 0.0 else {}))
    found = float(integral_delay(pair.down, pair.supply, LOAD, opening=pair.up))
    assert low <= found / chain_transient(pair, NODE).delay - 1.0 <= high


def test_opening_switch_matters_for_slow_actuators_of_few_decades():
    pair = soft_pair(2.0, 0.2, 0.8, **two_pole(100.0, 0.7))
    transient = chain_transient(pair, NODE).delay
    assert float(integral_delay(pair.down, pair.supply, LOAD)) / transient - 1.0 == pytest.approx(-0.355, abs=0.01)


@pytest.mark.parametrize(("ratio", "quality"), [(0.1, 0.5), (1.0, 1.0), (30.0, 3.0)])
def test_step_is_the_transient_of_one_stage(ratio, quality):
    pair = soft_pair(4.0, 0.35, 0.65, **two_pole(ratio, quality))
    found = integral_delay(pair.down, pair.supply, LOAD, opening=pair.up, drive="step")
    assert float(found) == pytest.approx(chain_transient(pair, NODE, drive="step").delay, rel=3e-3)


def test_step_without_actuator_is_ln_two_after_the_transit():
    pair = ohmic_pair(on_resistance=R_ON, off_resistance=1e12, closing_time=3.0 * RC, window=(0.35, 0.65))
    found = integral_delay(pair.down, pair.supply, LOAD, drive="step")
    assert float(found) == pytest.approx((3.0 + math.log(2.0)) * RC, rel=1e-9)
    given_transit = integral_delay(pair.down, pair.supply, LOAD, transit=np.asarray(5.0 * RC), drive="step")
    assert float(given_transit) == pytest.approx((5.0 + math.log(2.0)) * RC, rel=1e-9)


def test_effective_resistance_already_holds_the_input_slope():
    pair = ohmic_pair(on_resistance=R_ON, closing_time=2.0 * RC, resistance_kind="effective")
    assert float(integral_delay(pair.down, pair.supply, LOAD)) == pytest.approx((2.0 + math.log(2.0)) * RC)


def test_no_switching_is_nan():
    pair = ohmic_pair(on_resistance=R_ON, off_resistance=R_ON * np.array([1.0, 1e6]), switching_level=0.5)
    found = integral_delay(pair.down, pair.supply, LOAD, opening=pair.up)
    assert np.isnan(found).tolist() == [True, False]


def test_many_points_are_each_their_own():
    frequency, quality = np.array([[1e10], [1e11], [np.nan]]), np.array([0.5, 2.0])
    off = np.array([1e8, 1e10])

    def delay(f, q, o):
        pair = ohmic_pair(on_resistance=R_ON, off_resistance=o, natural_frequency=f, quality=q, closing_time=RC)
        return integral_delay(pair.down, pair.supply, LOAD, opening=pair.up)

    together = delay(*np.broadcast_arrays(frequency, quality, off))
    for i in range(3):
        for j in range(2):
            alone = delay(np.asarray(frequency[i, 0]), np.asarray(quality[j]), off[j])
            assert float(alone) == together[i, j]


def test_factors_add_up_and_are_the_marginal_delay():
    pair = soft_pair(4.0, 0.35, 0.65, **two_pole(10.0, 0.7))
    found = integral_factors(pair.down, pair.supply, LOAD, opening=pair.up)
    assert found.transit + found.factor * RC == pytest.approx(found.delay, rel=1e-12)
    more = integral_delay(pair.down, pair.supply, 1.02 * LOAD, opening=pair.up)
    assert float(more - found.delay) == pytest.approx(float(found.factor) * 0.02 * RC, rel=0.03)
    plain = soft_pair(4.0, 0.35, 0.65, closing_time=7.0 * RC)
    found = integral_factors(plain.down, plain.supply, LOAD, opening=plain.up)
    assert found.transit == pytest.approx(7.0 * RC, rel=1e-9)
    assert found.factor == pytest.approx(0.976, abs=0.002)


def test_rule_of_a_stage_gives_the_same_delay():
    pair = soft_pair(4.0, 0.2, 0.8, **two_pole(3.0, 0.7))
    edge = EdgeInputs(pair.down, pair.up, pair.supply, 2.0 * pair.down.resistance, LOAD, pair.down.closing_time)
    found = rule_by_name("integral")(edge)
    delay = integral_delay(pair.down, pair.supply, LOAD, resistance=2.0 * pair.down.resistance, opening=pair.up)
    assert found.transit + found.factor * edge.resistance * LOAD == pytest.approx(delay, rel=1e-12)
    assert found.wire_factor == pytest.approx(0.1 + 0.4 * found.factor)


@settings(deadline=None, max_examples=15)
@given(st.floats(0.05, 50.0), st.floats(0.4, 2.0), st.floats(1e-3, 1e3))
def test_all_times_scale_together(ratio, quality, scale):
    pair = soft_pair(5.0, 0.2, 0.7, **two_pole(ratio, quality))
    slower = soft_pair(5.0, 0.2, 0.7, **two_pole(ratio * scale, quality))
    found = integral_delay(pair.down, pair.supply, LOAD, opening=pair.up)
    scaled = integral_delay(slower.down, slower.supply, scale * LOAD, opening=slower.up)
    assert float(scaled) == pytest.approx(scale * float(found), rel=1e-9)
