"""Thermal noise and level restoration against their sources, inverses and limits."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy.optimize import brentq

from benchmark.physics import noise, regeneration


def test_crossing_rate_is_the_published_one():
    # Kish, IEE Proc. CDS 151 (2004) 190, eqs. 2-3: 8 U_n on 0.1 fF behind 10 kohm, row NOISE-rate
    rate = noise.crossing_rate(8.0, noise.pole_frequency(1.0e4, 0.1e-15))
    assert rate == pytest.approx(0.0023274, rel=1e-4)


def test_sampled_error_is_the_gaussian_tail():
    # row NOISE-Q, exact
    assert noise.sampled_error(7.0) == pytest.approx(1.2798e-12, rel=1e-4)
    assert noise.sampled_error(0.0) == 0.5


def test_threshold_inverts_the_rate():
    frequency = noise.pole_frequency(5.0e3, np.array([1e-17, 1e-16, 1e-15]))
    rate = np.array([1e-9, 1e-3, 1.0])
    assert noise.crossing_rate(noise.threshold_for_rate(rate, frequency), frequency) == pytest.approx(rate, rel=1e-9)
    assert noise.threshold_for_rate(1e30, frequency) == pytest.approx(np.zeros(3))


def test_restored_levels_are_fixed_points_and_the_margin_lies_at_unity_gain():
    for ratio in (8.0, 10.0, 1e2, 1e4, 1e8):
        low, high = regeneration.log_linear_levels(ratio)
        assert regeneration.log_linear_output(low, ratio) == pytest.approx(high, abs=1e-12)
        assert regeneration.log_linear_output(high, ratio) == pytest.approx(low, abs=1e-12)

        def slope(v, ratio=ratio):
            out = float(regeneration.log_linear_output(v, ratio))
            return out * (1.0 - out) * 2.0 * math.log(ratio) - 1.0

        v_il = brentq(slope, 0.0, 0.5)
        margin = v_il - regeneration.log_linear_output(1.0 - v_il, ratio)
        assert regeneration.log_linear_noise_margin(ratio) == pytest.approx(margin, abs=1e-12)


def test_ratio_at_or_below_the_minimum_keeps_no_level():
    ratio = np.array([1.0, 2.0, float(regeneration.log_linear_minimum_ratio())])
    assert np.all(regeneration.log_linear_levels(ratio)[0] == 0.5)
    assert np.all(regeneration.log_linear_noise_margin(ratio) == 0.0)
    assert regeneration.log_linear_gain(ratio[-1]) == pytest.approx(1.0)


def test_stacked_level_is_the_hand_equation():
    # 4 inputs at an on/off ratio of 144 keep 0.9 V; a ratio of 1 leaves half the supply
    assert regeneration.stacked_high_level(4.0, 144.0) == pytest.approx(0.9)
    assert regeneration.stacked_high_level(1.0, 1.0) == 0.5
    assert regeneration.ratio_for_fan_in(4.0, 0.1) == pytest.approx(144.0)


def test_subthreshold_gain_is_one_at_the_minimum_supply():
    for n in (1.0, 1.2, 1.5):
        supply = regeneration.subthreshold_minimum_supply(n, 350.0)
        assert regeneration.subthreshold_gain(supply, n, 350.0) == pytest.approx(1.0, rel=1e-12)
