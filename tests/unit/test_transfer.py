"""Transfer curve, levels and noise margins of gates."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest

from benchmark.circuits.balance import gate_balance
from benchmark.circuits.transfer import functional, largest_square, transfer_curve
from benchmark.devices.record import SwitchPair
from benchmark.errors import UsageError
from benchmark.physics import regeneration
from benchmark.physics.limits import thermal_noise_voltage
from benchmark.physics.virtual_source import Transistor, drain_current
from tests.factories import ohmic_pair

RATIOS = np.array([3.0, 8.0, 10.0, 100.0, 1e3, 1e4, 1e6, 1e12])


def log_linear(ratio, **fields):
    return ohmic_pair(on_resistance=1e4, off_resistance=1e4 * np.asarray(ratio), window=(0.0, 1.0), **fields)


def transistor_pair(supply) -> SwitchPair:
    """Invented virtual-source transistors, unequal, with a leak of 1 pS."""

    def law(threshold, velocity):
        t = Transistor(
            width=1e-6,
            length=30e-9,
            inversion_capacitance=2.5e-2,
            source_resistance=75e-6,
            drain_resistance=75e-6,
            velocity=velocity,
            mobility=0.02,
            threshold=threshold,
            slope_factor=1.4,
            barrier_lowering=0.12,
            fermi_width=3.5,
            saturation_exponent=1.8,
            thermal_voltage=0.025852,
        )
        return lambda control, path: drain_current(t, control, path) + 1e-12 * path

    pair = ohmic_pair(supply=supply)
    return dataclasses.replace(
        pair,
        down=dataclasses.replace(pair.down, current=law(0.45, 1e5)),
        up=dataclasses.replace(pair.up, current=law(0.43, 6e4)),
    )


@pytest.mark.parametrize(("accuracy", "gain_error", "margin_error"), [("fast", 5e-4, 2e-6), ("accurate", 1e-7, 1e-6)])
def test_log_linear_pair_is_the_closed_form(accuracy, gain_error, margin_error):
    found = functional(log_linear(RATIOS), 1, accuracy)
    assert found.gain == pytest.approx(regeneration.log_linear_gain(RATIOS), rel=gain_error)
    assert found.noise_margin == pytest.approx(regeneration.log_linear_noise_margin(RATIOS), abs=margin_error)
    low, high = regeneration.log_linear_levels(RATIOS)
    chosen = RATIOS != 8.0  # the level of 8, near the least ratio e^2, settles over more stages than are followed
    assert found.v_ol[chosen] == pytest.approx(low[chosen], abs=1e-6)
    assert found.v_oh[chosen] == pytest.approx(high[chosen], abs=1e-6)
    assert found.regenerates.tolist() == [False] + 7 * [True]


def test_single_disturbed_stage_has_the_margin_from_the_reached_levels():
    low, _ = regeneration.log_linear_levels(RATIOS[2:])
    found = functional(log_linear(RATIOS[2:]), 1, "accurate")
    assert found.single_margin == pytest.approx(found.v_il - low, abs=1e-6)
    assert np.all(found.single_margin >= found.noise_margin)


def test_largest_square_is_the_unity_gain_margin_of_symmetric_curves():
    curve = transfer_curve(log_linear(RATIOS), points=257)
    assert largest_square(curve.v_in, curve.v_out) == pytest.approx(
        regeneration.log_linear_noise_margin(RATIOS), abs=1e-4
    )
    for fan_in in (2, 4):
        first, second = (
            transfer_curve(log_linear(RATIOS), fan_in, 1, 257),
            transfer_curve(log_linear(RATIOS), 1, fan_in, 257),
        )
        expected = np.maximum(functional(log_linear(RATIOS), fan_in, "accurate").noise_margin, 0.0)
        found = largest_square(first.v_in, first.v_out, second.v_out)
        assert found == pytest.approx(expected, abs=2e-4)


def test_unrestricted_square_would_be_wrong():
    # at an on/off ratio of 10 the area outside the eyes holds a larger square: 0.091 against 0.016 of the supply
    curve = transfer_curve(log_linear(10.0), points=257)
    assert largest_square(curve.v_in, curve.v_out) == pytest.approx(0.0163, abs=1e-4)
    corner = float(curve.v_out[-1])
    assert corner == pytest.approx(1.0 / 11.0, rel=1e-9)


def test_levels_of_a_gate_are_the_hand_equation():
    # narrow window: inputs at the reached levels are fully open or closed; 4 inputs at rho = 144 keep 0.9 V
    pair = ohmic_pair(on_resistance=1e4, off_resistance=144e4, window=(0.45, 0.55), supply=0.7)
    found = functional(pair, 4)
    assert found.v_oh == pytest.approx(0.9 * 0.7, rel=1e-9)
    assert found.v_ol == pytest.approx(0.1 * 0.7, rel=1e-9)
    ratio = np.array([1e2, 1e4, 1e9])
    found = functional(ohmic_pair(on_resistance=1e4, off_resistance=1e4 * ratio, window=(0.45, 0.55)), 2)
    assert 1.0 - found.v_oh == pytest.approx(1.0 / (1.0 + ratio / 4.0), rel=1e-6)
    assert found.v_ol == pytest.approx(1.0 / (1.0 + ratio / 4.0), rel=1e-9)


def test_equal_resistances_leave_half_the_supply_and_fail():
    pair = ohmic_pair(on_resistance=1e4, off_resistance=1e4 * (1.0 + 1e-9), supply=0.6)
    found = functional(pair)
    assert found.v_oh == pytest.approx(0.3, rel=1e-6)
    assert found.v_ol == pytest.approx(0.3, rel=1e-6)
    assert not found.regenerates
    assert found.noise_margin < 1e-6
    assert not functional(pair, 3).regenerates


def test_half_swing_over_noise():
    # 0.1 fF at 300 K: 6.44 mV; half of a 0.1 V swing is 7.8 of it
    pair = ohmic_pair(supply=0.1, on_resistance=1e4, off_resistance=1e12, temperature=300.0)
    assert functional(pair).half_swing_over_noise(np.asarray(1e-16)) == pytest.approx(7.77, abs=0.01)
    assert thermal_noise_voltage(1e-16, 300.0) == pytest.approx(6.44e-3, abs=1e-5)


def test_hysteresis_is_taken_from_the_margin():
    step = (0.6, 0.6001)
    plain = ohmic_pair(on_resistance=1e4, off_resistance=1e10, window=(0.5, 0.5001))
    levels = {"closing_voltage": np.asarray(0.6), "opening_voltage": np.asarray(0.4)}
    relay = ohmic_pair(on_resistance=1e4, off_resistance=1e10, window=step, **levels)
    ideal, found = functional(plain, 1), functional(relay, 1)
    assert ideal.noise_margin == pytest.approx(0.5, abs=2e-3)
    assert found.v_il == pytest.approx(0.4, abs=2e-3)
    assert found.v_ih == pytest.approx(0.6, abs=2e-3)
    assert found.noise_margin == pytest.approx(0.4, abs=2e-3)
    assert found.regenerates
    wide = dataclasses.replace(relay.down, opening_voltage=np.asarray(-0.1))
    never = functional(dataclasses.replace(relay, down=wide), 1)
    assert not never.regenerates  # the pull-down never opens again


def test_outside_currents_are_nan_and_do_not_regenerate():
    supply = np.array([0.5, 0.7, 0.9])
    pair = ohmic_pair(supply=supply)
    inner = pair.down.current

    def tabulated(control, path):
        return np.where(supply[:, None] > 0.8, np.nan, inner(control, path))

    found = functional(dataclasses.replace(pair, down=dataclasses.replace(pair.down, current=tabulated)))
    assert np.isnan(found.noise_margin).tolist() == [False, False, True]
    assert np.isnan(found.gain).tolist() == [False, False, True]
    assert found.regenerates.tolist() == [True, True, False]


@pytest.mark.parametrize("fan_in", [1, 3])
@pytest.mark.parametrize("window", [(0.2, 0.8), (0.35, 0.65), (0.1, 0.5), (0.5, 0.9), (0.49, 0.51), (0.5, 0.5001)])
def test_fast_agrees_with_accurate_within_its_error(fan_in, window):
    ratio = np.array([10.0, 1e2, 1e3, 1e4, 1e6, 1e10])
    pair = ohmic_pair(on_resistance=1e4, off_resistance=1e4 * ratio, window=window)
    fast, accurate = functional(pair, fan_in), functional(pair, fan_in, "accurate")
    assert np.all(np.abs(fast.noise_margin - accurate.noise_margin) <= 1e-3)
    assert np.all(np.abs(fast.noise_margin - accurate.noise_margin) <= 2.0 * fast.error)
    assert fast.v_ol == pytest.approx(accurate.v_ol, abs=1e-9)
    assert fast.v_oh == pytest.approx(accurate.v_oh, abs=1e-9)
    assert np.all(fast.gain <= accurate.gain * (1.0 + 1e-6))
    assert fast.regenerates.tolist() == accurate.regenerates.tolist()


@pytest.mark.parametrize("fan_in", [1, 2, 4])
def test_fast_agrees_with_accurate_for_transistors(fan_in):
    pair = transistor_pair(np.array([0.1, 0.2, 0.3, 0.5, 0.7, 1.0]))
    fast, accurate = functional(pair, fan_in), functional(pair, fan_in, "accurate")
    assert fast.noise_margin == pytest.approx(accurate.noise_margin, abs=1e-5)
    assert fast.gain == pytest.approx(accurate.gain, rel=2e-3)
    assert fast.v_ol == pytest.approx(accurate.v_ol, abs=1e-9)
    assert fast.v_ih == pytest.approx(accurate.v_ih, abs=1e-5)
    assert fast.regenerates.tolist() == accurate.regenerates.tolist()


def test_subthreshold_transistors_have_the_closed_form_gain():
    # far below threshold, no barrier lowering: (e^(V/2 phi) - 1)/n; own law, exact exponentials
    n, phi = 1.5, 0.0258520

    def law(control, path):
        return 1e-9 * np.exp(control / (n * phi)) * -np.expm1(-path / phi)

    supply = np.array([0.06, 0.1, 0.15])
    pair = ohmic_pair(supply=supply, current=law)
    found = functional(pair, 1, "accurate")
    temperature = phi * 1.602176634e-19 / 1.380649e-23
    assert found.gain == pytest.approx(regeneration.subthreshold_gain(supply, n, temperature), rel=1e-6)


def test_curve_of_a_mirrored_pair_and_its_points():
    curve = transfer_curve(ohmic_pair(on_resistance=1e4, off_resistance=1e9, supply=np.array([0.3, 1.0])))
    assert curve.switching_voltage == pytest.approx(np.array([0.15, 0.5]), rel=1e-9)
    assert curve.v_out + curve.v_out[..., ::-1] == pytest.approx(np.broadcast_to([[0.3], [1.0]], (2, 65)))
    assert np.all(np.diff(curve.v_out, axis=-1) <= 0.0)


def test_more_inputs_than_the_device_states_are_refused():
    with pytest.raises(UsageError, match="fan-in must be 1 to 6"):
        gate_balance(ohmic_pair(), 7, 1)
    with pytest.raises(UsageError, match="accuracy"):
        functional(ohmic_pair(), 1, "exact")  # type: ignore[arg-type]
