"""The steep-swing transistor: blend, temperature, stacks and refusals."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import brentq

from benchmark.devices.model import ModelInputs
from benchmark.devices.steep_swing import MODEL
from benchmark.physics import steep_swing
from tests.switch_contract import check_pair

BASE = {
    "reference_temperature": 298.15,
    "declared_supply": 0.30,
    "subthreshold_swing": 0.040,
    "on_current": 60.0,
    "off_current": 5e-6,
    "saturation_voltage": 0.060,
    "gate_capacitance_total": 0.60e-9,
    "drain_capacitance_share": 0.80,
    "terminal_capacitance_per_width": 0.10e-9,
    "transit_time": 0.0,
    "unit_width": 200e-9,
    "swing_temperature_coefficient": 0.0,
    "footprint": 2e-14,
}
LN2 = math.log(2.0)


def inputs(conduction: str = "tunnelling", drop: tuple[str, ...] = (), **values: object) -> ModelInputs:
    merged = {name: value for name, value in {**BASE, **values}.items() if name not in drop}
    return ModelInputs(
        {name: np.asarray(value, dtype=float) for name, value in merged.items()}, {"conduction": conduction}, {}
    )


def pair_of(given_inputs: ModelInputs, supply: object = 0.3, temperature: object = 298.15, shift: object = 0.0):
    knobs = {"threshold_shift": np.asarray(shift, float)}
    prepared = MODEL.prepare(given_inputs)
    return MODEL.switch(prepared, np.asarray(supply, float), np.asarray(temperature, float), knobs)


def by_hand(control: float, path: float, swing: float = 0.040, off: float = 1e-12, on: float = 12e-6) -> float:
    """The blend written as in the reference, for control above 0."""
    rise = 10.0 ** (control / swing) - 1.0
    blend = off + 1.0 / (1.0 / on + (1.0 / (off * rise) if rise else math.inf))
    return blend * (1.0 - math.exp(-path / 0.060))


def test_contract_holds_over_draws_temperatures_and_supplies():
    supply = np.array([0.01, 0.05, 0.3, 0.5, 2.0]).reshape(1, 1, 5)
    temperature = np.array([233.15, 298.15, 398.15]).reshape(1, 3, 1)
    swing = np.array([0.030, 0.040, 0.080]).reshape(3, 1, 1)
    for shift in (-0.05, 0.0, 0.05):
        given_inputs = inputs(subthreshold_swing=swing, swing_temperature_coefficient=1e-4, series_switches_max=3.0)
        check_pair(pair_of(given_inputs, supply, temperature, shift))


def test_currents_resistance_and_charge_by_hand():
    pair = pair_of(inputs())
    assert pair.down.on_current == pytest.approx(by_hand(0.3, 0.3), rel=1e-12)
    assert pair.down.off_current_path == pytest.approx(by_hand(0.0, 0.3), rel=1e-12)
    effective = 0.5 * (by_hand(0.3, 0.15) + by_hand(0.15, 0.3))
    assert pair.down.resistance == pytest.approx(0.3 / (2.0 * LN2 * effective), rel=1e-12)
    # the 50 % step of a current source: ln 2 R C = C V / (2 I)
    assert LN2 * pair.down.resistance * 1e-15 == pytest.approx(1e-15 * 0.3 / (2.0 * effective), rel=1e-12)
    assert pair.down.switching_level == 0.5
    gate, coupled = 0.60e-9 * 200e-9, 0.80 * 0.60e-9 * 200e-9
    assert pair.down.input_charge == pytest.approx(0.3 * (gate + 0.5 * coupled), rel=1e-12)
    assert pair.down.input_capacitance_delay == pytest.approx(gate + coupled, rel=1e-12)
    assert pair.down.terminal_capacitance == pytest.approx(0.10e-9 * 200e-9 + 1.5 * coupled, rel=1e-12)
    assert pair.down.terminal_capacitance_delay == pytest.approx(0.10e-9 * 200e-9 + 2.0 * coupled, rel=1e-12)


def test_current_law_is_the_blend_times_the_drain_factor():
    law = pair_of(inputs(), [0.3, 0.5]).down.current
    got = law(np.array([[0.1], [0.45]]), np.array([[0.02], [0.5]]))[:, 0]
    assert got == pytest.approx([by_hand(0.1, 0.02), by_hand(0.45, 0.5)], rel=1e-12)


def test_threshold_shift_moves_the_control_voltage_and_leakage_by_the_swing():
    plain, shifted = pair_of(inputs()), pair_of(inputs(), shift=0.02)
    assert shifted.down.on_current == pytest.approx(by_hand(0.28, 0.3), rel=1e-12)
    ratio = shifted.down.off_current_path / plain.down.off_current_path
    assert ratio == pytest.approx(10.0 ** (-0.02 / 0.040), rel=1e-12)
    lowered = pair_of(inputs(), shift=-0.02)
    assert lowered.down.off_current_path == pytest.approx(by_hand(0.02, 0.3), rel=1e-12)


def test_blend_continues_smoothly_below_zero_and_never_overflows():
    step = 1e-9
    low, mid, high = (float(steep_swing.blend_current(v, 0.02, 1e-4, 1e-11)) for v in (-step, 0.0, step))
    assert mid == 1e-11
    assert (mid - low) / step == pytest.approx((high - mid) / step, rel=1e-5)
    assert steep_swing.blend_current(100.0, 1e-4, 1e-4, 1e-11) == pytest.approx(1e-4, rel=1e-6)
    assert steep_swing.blend_current(-100.0, 1e-4, 1e-4, 1e-11) == 0.0


def test_law_derivatives_by_differences():
    law = steep_swing.blend_law(0.04, 12e-6, 1e-12, 0.06)
    for control in (-0.03, 0.01, 0.15, 0.29, 0.4):
        for path in (0.005, 0.1, 0.3):
            at = (np.asarray(control), np.asarray(path))
            current, by_control, by_path = law(*at)
            h = 1e-6
            assert by_control == pytest.approx(
                float(law(at[0] + h, at[1])[0] - law(at[0] - h, at[1])[0]) / (2 * h), rel=1e-6
            )
            assert by_path == pytest.approx(
                float(law(at[0], at[1] + h)[0] - law(at[0], at[1] - h)[0]) / (2 * h), rel=1e-6, abs=1e-8 * current
            )


def _open_stack(count: int, swing: float, saturation: float, supply: float) -> float:
    """Leakage of k open switches over one, by shooting from the rail."""

    def across(current: float) -> float:
        node = 0.0
        for _ in range(count):
            share = current * math.exp(node * math.log(10.0) / swing)
            if share >= 1.0:
                return 1e9
            node -= saturation * math.log1p(-share)
        return node - supply

    one = -math.expm1(-supply / saturation)
    return brentq(across, 0.0, one, xtol=1e-18, rtol=1e-14) / one


@pytest.mark.parametrize("count", [2, 3])
def test_open_stack_balances_the_currents(count: int):
    pair = pair_of(inputs(), [0.05, 0.3])
    reference = [_open_stack(count, 0.040, 0.060, v) for v in (0.05, 0.3)]
    assert pair.down.stack_off[..., count - 1] == pytest.approx(reference, rel=1e-9)


def test_closed_stack_of_two_balances_the_currents():
    pair = pair_of(inputs(), 0.3)

    def stacked(control: float, across: float) -> float:
        def mismatch(node: float) -> float:
            return by_hand(control, node) - by_hand(control - node, across - node)

        node = brentq(mismatch, 1e-9, min(across, control) - 1e-12, xtol=1e-16)
        return by_hand(control, node)

    single = by_hand(0.3, 0.15) + by_hand(0.15, 0.3)
    ratio = single / (stacked(0.3, 0.15) + stacked(0.15, 0.3))
    assert pair.down.stack_on[..., 1] == pytest.approx(ratio, rel=1e-8)


def test_temperature_keeps_the_threshold():
    given_inputs = inputs(swing_temperature_coefficient=1e-4)
    cold, warm = pair_of(given_inputs, temperature=298.15), pair_of(given_inputs, temperature=398.15)
    assert warm.down.intermediates["swing"][0] == pytest.approx(0.050)
    window = 0.040 * math.log10(60.0 / 5e-6)
    expected = by_hand(0.0, 0.3, off=12e-6 * 10.0 ** (-window / 0.050))
    assert warm.down.off_current_path == pytest.approx(expected, rel=1e-12)
    assert warm.down.off_current_path > cold.down.off_current_path
    flat = pair_of(inputs(), temperature=[250.0, 400.0])
    assert flat.down.off_current_path[0] == flat.down.off_current_path[1]


def test_thermionic_swing_defaults_to_proportional_and_is_refused_below_the_limit():
    fine = inputs("thermionic", ("swing_temperature_coefficient",), subthreshold_swing=0.070)
    assert [f.level for f in MODEL.check(fine)] == ["note"]
    pair = pair_of(fine, temperature=[298.15, 2 * 298.15])
    assert pair.down.intermediates["swing"][0] == pytest.approx([0.070, 0.140])
    assert pair.down.outside == {}
    refused = [f for f in MODEL.check(inputs("thermionic", subthreshold_swing=0.059)) if f.level == "refuse"]
    assert [f.name for f in refused] == ["value.subthreshold_swing"]
    assert "59.16 mV/decade" in refused[0].allowed
    assert [f for f in MODEL.check(inputs("tunnelling", subthreshold_swing=0.030)) if f.level == "refuse"] == []


def test_thermionic_swing_without_temperature_law_is_outside_when_hot():
    fixed = inputs("thermionic", subthreshold_swing=0.065)
    pair = pair_of(fixed, temperature=[298.15, 358.15])
    assert pair.down.outside["swing below the thermionic limit at this temperature"].tolist() == [False, True]


def test_a_swing_that_falls_to_zero_is_outside_and_gives_no_number():
    pair = pair_of(inputs(swing_temperature_coefficient=1e-3), temperature=[250.0, 298.15])
    assert pair.down.outside["swing not above 0 at this temperature"].tolist() == [True, False]
    assert np.isnan(pair.down.resistance).tolist() == [True, False]


def test_floor_above_ceiling_is_refused():
    assert [f.name for f in MODEL.check(inputs(off_current=70.0)) if f.level == "refuse"] == ["value.off_current"]


def test_ceiling_of_the_supply_is_reported():
    (limit,) = pair_of(inputs(supply_ceiling=0.5), [0.25, 1.0]).down.limits
    assert limit.margin == pytest.approx([2.0, 0.5])


@settings(deadline=None, max_examples=40)
@given(
    swing=st.floats(0.01, 0.1),
    decades=st.floats(2.0, 9.0),
    supply=st.floats(0.05, 1.0),
    scale=st.floats(0.2, 5.0),
    shift=st.floats(-0.05, 0.1),
)
def test_all_voltages_times_k_leave_currents_and_scale_resistance(swing, decades, supply, scale, shift):
    def at(k: float):
        given_inputs = inputs(
            subthreshold_swing=swing * k,
            saturation_voltage=0.06 * k,
            off_current=60.0 / 10.0**decades,
            series_switches_max=2.0,
        )
        return pair_of(given_inputs, supply * k, shift=shift * k).down

    one, scaled = at(1.0), at(scale)
    assert scaled.on_current == pytest.approx(float(one.on_current), rel=1e-9)
    assert scaled.off_current_path == pytest.approx(float(one.off_current_path), rel=1e-9)
    assert scaled.resistance == pytest.approx(float(one.resistance) * scale, rel=1e-9)
    assert scaled.stack_off == pytest.approx(one.stack_off, rel=1e-8)


@settings(deadline=None, max_examples=40)
@given(width=st.floats(0.2, 5.0), supply=st.floats(0.05, 1.0))
def test_width_times_k_divides_resistance_and_multiplies_the_rest(width, supply):
    one = pair_of(inputs(), supply).down
    wide = pair_of(inputs(unit_width=200e-9 * width), supply).down
    assert wide.resistance == pytest.approx(float(one.resistance) / width, rel=1e-12)
    for name in ("input_charge", "input_capacitance_delay", "terminal_capacitance", "off_current_path", "on_current"):
        assert getattr(wide, name) == pytest.approx(float(getattr(one, name)) * width, rel=1e-12)
