"""Device model virtual-source: record, knobs, temperature, options, findings."""

from __future__ import annotations

import pickle
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

from benchmark.devices import model
from benchmark.devices.model import Finding, ModelInputs
from benchmark.devices.record import SwitchPair
from benchmark.physics import virtual_source as vs
from tests.switch_contract import check_pair

MODEL = model("virtual-source")
#: SI values in the manner of the open 7 nm kit
VALUES: dict[str, Any] = {
    "reference_temperature": 298.15,
    "declared_supply": 0.7,
    "footprint": 0.0219e-12,
    "unit_width": 211.5e-9,
    "gate_length": 21e-9,
    "on_current": 537.0,
    "on_current_p": 466.0,
    "off_current": 0.27e-3,
    "off_current_p": 0.32e-3,
    "effective_current_p": 200.0,
    "channel_mobility": 0.02,
    "subthreshold_swing": 0.0603,
    "drain_barrier_lowering": 0.0213,
    "gate_capacitance_total": 0.756e-9,
    "overlap_capacitance": 0.16e-9,
    "access_resistance": 140e-6,
    "saturation_exponent": 1.8,
    "fermi_width": 2.0,
    "threshold_temperature_slope": -0.7e-3,
    "mobility_temperature_exponent": -1.2,
    "velocity_temperature_exponent": -0.4,
}
ONLY_P = ("on_current_p", "off_current_p", "effective_current_p")


def _inputs(*without: str, option: str = "own", **changed: Any) -> ModelInputs:
    values = {name: value for name, value in {**VALUES, **changed}.items() if name not in without}
    return ModelInputs(
        {name: np.asarray(value, dtype=np.float64).reshape(-1, 1, 1) for name, value in values.items()},
        {"partner": option},
        {},
    )


def _pair(inputs: ModelInputs, supply: Any = 0.7, kelvin: Any = 298.15, shift: float = 0.0) -> SwitchPair:
    return MODEL.switch(
        MODEL.prepare(inputs),
        np.asarray(supply, dtype=np.float64).reshape(1, 1, -1),
        np.asarray(kelvin, dtype=np.float64).reshape(1, -1, 1),
        {"threshold_shift": np.full((1, 1, 1), shift)},
    )


def _refusals(inputs: ModelInputs) -> list[Finding]:
    return [item for item in MODEL.check(inputs) if item.level == "refuse"]


def test_record_keeps_the_contract():
    rng = np.random.default_rng(5)
    inputs = _inputs(on_current=537.0 * rng.lognormal(0.0, 0.02, 4))
    check_pair(_pair(inputs, np.linspace(0.1, 0.9, 17), [233.15, 298.15, 398.15]))


def test_resistance_is_that_of_the_effective_current():
    pair = _pair(_inputs())
    for switch in (pair.down, pair.up):
        control, path = np.array([0.7, 0.35]), np.array([0.35, 0.7])
        effective = switch.current(control, path).mean()
        assert switch.resistance == pytest.approx(0.7 / (2.0 * np.log(2.0) * effective), rel=1e-12)
        assert switch.resistance_kind == "effective"
        assert switch.switching_level == 0.5


def test_targets_come_back_from_the_record():
    pair = _pair(_inputs())
    width = VALUES["unit_width"]
    assert pair.down.on_current == pytest.approx(537.0 * width, rel=1e-9)
    assert pair.down.off_current_path == pytest.approx(0.27e-3 * width, rel=1e-9)
    assert pair.up.on_current == pytest.approx(466.0 * width, rel=1e-9)
    assert pair.up.intermediates["effective current"][0] == pytest.approx(200.0 * width, rel=1e-9)


def test_charges_by_hand():
    pair = _pair(_inputs(terminal_capacitance_per_width=0.05e-9))
    width, edge = VALUES["unit_width"], VALUES["overlap_capacitance"]
    # the published total counts the drain edge twice: channel = total - 3 edges
    channel = VALUES["gate_capacitance_total"] - 3.0 * edge
    assert pair.down.input_charge == pytest.approx((channel + 2.5 * edge) * width * 0.7, rel=1e-9)
    weight = pair.down.intermediates["drain-edge weight in delay"][0].item()
    assert pair.down.input_capacitance_delay == pytest.approx((channel + (1.0 + weight) * edge) * width, rel=1e-9)
    assert pair.down.terminal_capacitance == pytest.approx((1.5 * edge + 0.05e-9) * width, rel=1e-12)
    assert pair.down.terminal_capacitance_delay == pytest.approx((2.0 * edge + 0.05e-9) * width, rel=1e-12)


def test_a_switch_has_half_of_the_inverter_footprint():
    pair = _pair(_inputs())
    assert pair.down.area + pair.up.area == pytest.approx(0.0219e-12, rel=1e-15)


def test_threshold_shift_moves_leakage_by_the_swing():
    low, high = _pair(_inputs()), _pair(_inputs(), shift=0.0603)
    for a, b in ((low.down, high.down), (low.up, high.up)):
        assert a.off_current_path / b.off_current_path == pytest.approx(10.0, rel=0.02)
        assert b.on_current < a.on_current


def test_heat_raises_leakage_and_lowers_strong_current():
    cold, hot = _pair(_inputs()), _pair(_inputs(), kelvin=358.15)
    assert 10.0 < (hot.down.off_current_path / cold.down.off_current_path).item() < 60.0
    # weak inversion wins from the falling threshold; with the threshold held, strong inversion loses velocity
    assert _pair(_inputs(), 0.3, 358.15).down.on_current > 2.0 * _pair(_inputs(), 0.3).down.on_current
    held = _inputs(threshold_temperature_slope=0.0)
    assert _pair(held, 0.9, 358.15).down.on_current < _pair(held, 0.9).down.on_current


def test_stacks_against_hand_limits():
    pair = _pair(_inputs())
    # small barrier lowering and an almost ideal swing: close to 1/k; closed: near k, less by velocity saturation
    np.testing.assert_allclose(pair.down.stack_off.ravel(), [1.0, 0.385, 0.24, 0.174], atol=0.02)
    assert 1.6 < pair.down.stack_on.ravel()[1] < 2.4
    assert pair.down.stack_on.shape[-1] == 4
    assert _pair(_inputs(series_switches_max=2.0)).down.stack_on.shape[-1] == 2


def test_mirrored_partner_needs_no_p_values():
    inputs = _inputs(*ONLY_P, option="mirrored")
    assert _refusals(inputs) == []
    pair = _pair(inputs)
    assert pair.up.partner == "mirrored"
    assert pair.up.resistance == pair.down.resistance


def test_p_type_is_like_n_where_not_stated_and_says_so():
    inputs = _inputs("effective_current_p", on_current_p=537.0, off_current_p=0.27e-3)
    pair = _pair(inputs)
    assert pair.up.resistance == pytest.approx(float(pair.down.resistance[0, 0, 0]), rel=1e-12)
    notes = {item.name for item in MODEL.check(inputs) if item.level == "note"}
    assert notes == {
        "value.subthreshold_swing_p",
        "value.drain_barrier_lowering_p",
        "value.saturation_exponent_p",
        "value.channel_mobility_p",
    }
    own = _inputs("effective_current_p", saturation_exponent_p=1.4, channel_mobility_p=0.01)
    assert "value.channel_mobility_p" not in {item.name for item in MODEL.check(own)}
    assert not np.allclose(_pair(own).up.resistance, _pair(_inputs("effective_current_p")).up.resistance, rtol=1e-3)


@pytest.mark.parametrize(
    ("inputs", "name"),
    [
        (_inputs(effective_current=257.0), "value.effective_current"),
        (_inputs(channel_mobility_p=0.01), "value.effective_current_p"),
        (_inputs(inversion_capacitance=0.025), "value.gate_capacitance_total"),
        (_inputs("channel_mobility"), "value.channel_mobility"),
        (_inputs("gate_capacitance_total"), "value.inversion_capacitance"),
        (_inputs(gate_length_correction=21e-9), "value.gate_length_correction"),
        (_inputs(off_current_p=500.0), "value.off_current_p"),
        (_inputs(subthreshold_swing=0.0585), "value.subthreshold_swing"),
        (_inputs(on_current=5000.0), "value.on_current"),
        (_inputs(effective_current_p=420.0), "value.on_current_p"),
    ],
)
def test_impossible_inputs_are_refused(inputs: ModelInputs, name: str):
    found = _refusals(inputs)
    assert name in {item.name for item in found}
    assert all(item.allowed for item in found)


def test_no_solution_is_refused_with_the_numbers():
    (found,) = _refusals(_inputs(on_current=5000.0))
    assert "5000" in found.found
    assert "0.00027" in found.found


def test_absurd_velocity_is_warned_about():
    levels = {
        item.level for item in MODEL.check(_inputs("effective_current_p", on_current=1000.0, channel_mobility=0.05))
    }
    assert "warn" in levels


def test_draws_without_solution_are_outside_and_the_others_are_not():
    pair = _pair(_inputs(on_current=[537.0, 5000.0]), [0.4, 0.7])
    mask = pair.down.outside["no threshold and velocity meet the stated currents"]
    np.testing.assert_array_equal(np.ravel(mask), [False, True])
    assert np.isfinite(pair.down.resistance[0]).all()
    assert np.isnan(pair.down.resistance[1]).all()


def test_temperature_range_of_the_laws():
    pair = _pair(_inputs(), kelvin=[150.0, 298.15, 430.0])
    (name,) = (text for text in pair.down.outside if "temperature" in text)
    np.testing.assert_array_equal(np.ravel(pair.down.outside[name]), [True, False, True])
    assert pair.down.outside.keys() == pair.up.outside.keys()
    assert not _pair(_inputs()).down.outside


def test_record_can_be_pickled():
    pair = pickle.loads(pickle.dumps(_pair(_inputs())))
    assert pair.down.current(np.array([0.7]), np.array([0.7])) == pytest.approx(float(pair.down.on_current[0, 0, 0]))


def test_current_is_that_of_the_physics():
    pair = _pair(_inputs())
    prepared = MODEL.prepare(_inputs())
    transistor = replace(prepared["transistors"]["n"][0])
    expected = vs.drain_current(transistor, np.float64(0.5), np.float64(0.3))
    assert pair.down.current(np.array([0.5]), np.array([0.3])).ravel() == pytest.approx(expected.ravel(), rel=1e-14)
