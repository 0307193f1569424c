"""Properties of transfer curves and noise margins that hold for any pair."""

from __future__ import annotations

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from benchmark.circuits.transfer import functional, largest_square, transfer_curve
from tests.factories import ohmic_pair
from tests.profiles import examples

QUICK = settings(max_examples=examples(16))
DECADES = st.floats(0.1, 12.0)
LOW = st.floats(0.0, 0.45)
HIGH = st.floats(0.55, 1.0)


def pair_of(decades, low, high, supply=1.0, resistance=1e4, skew=1.0):
    ratio = 10.0**decades
    return ohmic_pair(
        on_resistance=resistance,
        off_resistance=resistance * ratio,
        window=(low, high),
        supply=supply,
        up={"on_resistance": skew * resistance, "off_resistance": skew * resistance * ratio},
    )


@QUICK
@given(DECADES, LOW, HIGH, st.floats(0.1, 10.0), st.integers(1, 4), st.integers(1, 4))
def test_curves_fall(decades, low, high, skew, fan_in_down, fan_in_up):
    curve = transfer_curve(pair_of(decades, low, high, skew=skew), fan_in_down, fan_in_up, 33)
    assert np.all(np.diff(curve.v_out) <= 1e-12)
    assert np.all((curve.v_out >= 0.0) & (curve.v_out <= 1.0))


@QUICK
@given(DECADES, st.floats(0.01, 0.49))
def test_symmetric_pair_switches_at_half_the_supply_and_margins_stay_below_it(decades, half):
    pair = pair_of(decades, 0.5 - half, 0.5 + half, supply=0.8)
    assert abs(transfer_curve(pair, points=65).switching_voltage - 0.4) < 1e-9
    found = functional(pair)
    assert found.noise_margin < 0.5
    assert abs(found.noise_margin_low - found.noise_margin_high) <= 0.8 * 4.0 * found.error
    assert found.single_margin >= found.noise_margin - 2.0 * found.error


@QUICK
@given(DECADES, LOW, HIGH, st.floats(0.2, 5.0), st.integers(1, 4))
def test_fast_is_within_twice_its_error_of_accurate(decades, low, high, skew, fan_in):
    pair = pair_of(decades, low, high, skew=skew)
    fast, accurate = functional(pair, fan_in), functional(pair, fan_in, "accurate")
    if accurate.gain > 1.1 and not accurate.regenerates:  # a failure, and no number to trust
        assert fast.noise_margin <= max(2.0 * fast.error, 2e-3)
    if accurate.gain > 1.1 and accurate.regenerates:
        assert abs(fast.noise_margin - accurate.noise_margin) <= max(2.0 * fast.error, 2e-3)
    if abs(accurate.gain - 1.0) > 0.02 and abs(accurate.noise_margin) > 2e-3:
        assert fast.regenerates == accurate.regenerates


@QUICK
@given(st.floats(0.5, 8.0), LOW, HIGH, st.floats(1e-3, 1e3), st.floats(1e-2, 1e2))
def test_scaling_resistance_and_supply_changes_only_the_unit(decades, low, high, resistance, supply):
    reference = functional(pair_of(decades, low, high), 2)
    scaled = functional(pair_of(decades, low, high, supply=supply, resistance=1e4 * resistance), 2)
    assert abs(scaled.noise_margin - reference.noise_margin) < 1e-6
    assert abs(scaled.v_oh / supply - reference.v_oh) < 1e-9
    assert abs(scaled.gain / reference.gain - 1.0) < 1e-6


@QUICK
@given(LOW, HIGH, st.integers(1, 5))
def test_margin_rises_with_the_ratio_and_falls_with_the_inputs(low, high, fan_in):
    ratio = np.logspace(0.5, 9.0, 9)
    pair = ohmic_pair(on_resistance=1e4, off_resistance=1e4 * ratio, window=(low, high))
    few, many = functional(pair, fan_in), functional(pair, fan_in + 1)
    slack = 2.0 * (few.error.max() + many.error.max())
    assert np.all(np.diff(few.noise_margin) >= -slack)
    assert np.all(many.noise_margin <= few.noise_margin + slack)
    swing = (few.v_oh - few.v_ol)[few.regenerates]  # elsewhere the chain falls into its other state or none
    assert np.all(np.diff(swing) >= -1e-6)
    assert np.all(np.diff(few.regenerates.astype(int)) >= 0)


@QUICK
@given(LOW, HIGH, st.integers(1, 4), st.floats(0.2, 5.0))
def test_ratio_towards_one_always_fails(low, high, fan_in, skew):
    found = functional(pair_of(1e-9, low, high, skew=skew), fan_in)
    assert not found.regenerates
    assert found.noise_margin <= 1e-6
    square = transfer_curve(pair_of(1e-9, low, high, skew=skew))
    assert largest_square(square.v_in, square.v_out) < 1e-6


@QUICK
@given(st.floats(2.0, 8.0), st.floats(0.0, 0.25))
def test_hysteresis_never_helps(decades, window):
    fields = {"on_resistance": 1e4, "off_resistance": 1e4 * 10.0**decades, "window": (0.3, 0.7)}
    plain = functional(ohmic_pair(**fields))
    moved = functional(ohmic_pair(**fields, closing_voltage=np.asarray(0.5), opening_voltage=np.asarray(0.5 - window)))
    slack = 2.0 * (plain.error + moved.error)
    assert moved.noise_margin <= plain.noise_margin + slack
    assert moved.noise_margin >= plain.noise_margin - window - slack - 1e-3
