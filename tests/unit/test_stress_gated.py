"""The stress-gated model as a whole: record against formulas written out, options, limits, checks."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

import numpy as np
import pytest

from benchmark.constants import BOLTZMANN, ELEMENTARY_CHARGE, VACUUM_PERMITTIVITY
from benchmark.devices import model
from benchmark.devices.links import judged
from benchmark.devices.model import ModelInputs
from benchmark.devices.record import Switch, SwitchPair
from benchmark.physics import acoustics, two_pole
from tests.stress_column import COLUMN as BASE
from tests.stress_column import T_REF

MODEL = model("stress-gated")
EV = ELEMENTARY_CHARGE
LOG_SLOPE = {
    "resistance_unstressed": 1e10,
    "resistance_floor": 5e4,
    "resistance_slope": 4e-9,
    "onset_pressure": 0.1e9,
    "corner_width": 0.03e9,
    "unstressed_activation_energy": 0.45 * EV,
}
ACTIVATED = {
    "unstressed_activation_energy": 0.45 * EV,
    "activation_energy_slope": 0.25e-9 * EV,
    "activation_corner_width": 0.01 * EV,
    "resistance_prefactor": 1e3,
    "metallic_resistance": 2e4,
    "metallic_temperature_coefficient": 0.001,
    "parallel_leakage_conductance": 1e-13,
}
# p = b d V with 2 GPa at 300 pm/V and 0.25 V; 0.10 fF per inverter, so half of it per switch
HAND: dict[str, float] = {
    "reference_temperature": T_REF,
    "actuator_coefficient": 300e-12,
    "pressure_per_coefficient_voltage": 2.0e9 / (300e-12 * 0.25),
    "input_capacitance": 0.05e-15,
    "stack_thickness": 60e-9,
    "stack_sound_speed": 4000.0,
    "resistance_unstressed": 1e9,
    "resistance_slope": 2e-9,
    "actuator_loss_tangent": 0.0,
    "terminal_capacitance": 0.0,
    "footprint": 0.01e-12,
    "breakdown_field": 6.67e6,
}


def inputs(values: Mapping[str, Any], **options: str) -> ModelInputs:
    chosen = {option.name: options.get(option.name, option.default) for option in MODEL.options}
    return ModelInputs({name: np.asarray(value, dtype=float) for name, value in values.items()}, chosen, {})


def pair(values: Mapping[str, Any], supply: Any = 0.5, temperature: Any = T_REF, **options: str) -> SwitchPair:
    prepared = MODEL.prepare(inputs(values, **options))
    knobs = {"threshold_shift": np.zeros(())}
    return MODEL.switch(prepared, np.asarray(supply, dtype=float), np.asarray(temperature, dtype=float), knobs)


def down(
    values: Mapping[str, Any] | None = None, supply: Any = 0.5, temperature: Any = T_REF, **options: str
) -> Switch:
    return pair({**BASE, **LOG_SLOPE, **(values or {})}, supply, temperature, **options).down


def hand(supply: float, coefficient: float = 300e-12, **values: float) -> Switch:
    stated = {**HAND, "actuator_coefficient": coefficient, **values}
    return pair(stated, supply, mechanics="stated-pressure", pressure_law="exponential").down


def limit(switch: Switch, start: str) -> Any:
    return next(item for item in switch.limits if item.name.startswith(start))


def test_pressure_written_out():
    b = BASE
    column = b["actuator_compliance"] * b["actuator_height"] / b["actuator_area"]
    channel = b["channel_thickness"] / (b["channel_modulus"] * b["channel_area"])
    radius = math.sqrt(b["channel_area"] / math.pi)
    punch = 2 * (1 - 0.2**2) / (2 * b["punch_modulus"] * radius)
    total = column + channel + punch + b["frame_compliance"]
    force = b["actuator_coefficient"] * 0.5 / total
    switch = down()
    shown = switch.intermediates
    assert float(shown["clamp force"][0]) == pytest.approx(force, rel=1e-12)
    assert float(shown["pressure"][0]) == pytest.approx(force / b["channel_area"], rel=1e-12)
    assert float(shown["back pressure"][0]) == pytest.approx(force / b["actuator_area"], rel=1e-12)
    assert float(shown["blocking ratio"][0]) == pytest.approx(column / total, rel=1e-12)
    assert float(shown["compliance of the punch"][0]) == pytest.approx(punch, rel=1e-12)
    free = b["actuator_permittivity"] * VACUUM_PERMITTIVITY * b["actuator_area"] / b["actuator_height"]
    assert float(switch.input_charge) == pytest.approx(free * 0.5 - b["actuator_coefficient"] * force, rel=1e-12)
    assert float(switch.input_capacitance_delay) == pytest.approx(float(switch.input_charge) / 0.5, rel=1e-12)
    assert float(shown["capacitance in contact"][0]) == pytest.approx(float(switch.input_charge) / 0.5, rel=1e-12)
    loss = math.pi / 4 * 0.02 * float(switch.input_charge) * 0.5
    assert float(switch.extra_energy) == pytest.approx(loss, rel=1e-12)


def test_resistance_has_the_contacts_in_series():
    contact = 2 * BASE["contact_resistivity"] / BASE["channel_area"]
    switch = down(supply=5.0)
    assert float(switch.resistance) == pytest.approx(LOG_SLOPE["resistance_floor"] + contact, rel=1e-9)
    shown = switch.intermediates
    assert float(shown["contact resistance"][0]) == pytest.approx(contact, rel=1e-12)
    assert float(shown["channel resistance, closed"][0]) == pytest.approx(5e4, rel=1e-9)


@pytest.mark.parametrize("law", ["log-slope", "activated", "exponential"])
def test_currents_agree_with_the_resistances(law: str):
    values = {**BASE, **{"log-slope": LOG_SLOPE, "activated": ACTIVATED}.get(law, LOG_SLOPE)}
    supply = np.array([[0.3], [0.45]])
    switch = pair(values, supply, np.array([298.15, 358.15]), pressure_law=law).down
    control = np.stack([np.zeros_like(supply), 0.5 * supply, supply], axis=-1)
    current = np.broadcast_to(switch.current(control, supply[..., None]), (2, 2, 3))
    np.testing.assert_allclose(current[..., 2], np.broadcast_to(switch.on_current, (2, 2)), rtol=1e-12)
    np.testing.assert_allclose(current[..., 0], np.broadcast_to(switch.off_current_path, (2, 2)), rtol=1e-12)
    assert np.all((current[..., 1] > current[..., 0]) & (current[..., 1] < current[..., 2]))
    assert np.all(switch.current(control, np.zeros((1, 1, 1))) == 0.0)
    half = np.broadcast_to(switch.current(control, 0.5 * supply[..., None]), (2, 2, 3))
    np.testing.assert_allclose(half, 0.5 * current, rtol=1e-12)


@pytest.mark.parametrize("law", ["log-slope", "activated", "exponential"])
def test_switching_level_is_where_the_resistance_doubles(law: str):
    values = {**BASE, **(ACTIVATED if law == "activated" else LOG_SLOPE)}
    supply = np.array([0.2, 0.4, 0.8])
    switch = pair(values, supply, pressure_law=law).down
    control = (switch.switching_level * supply)[:, None]
    doubled = supply / switch.current(control, supply[:, None])[:, 0]
    np.testing.assert_allclose(doubled, 2.0 * switch.resistance, rtol=1e-9)
    np.testing.assert_array_equal(switch.closing_voltage, switch.switching_level * supply)
    np.testing.assert_array_equal(switch.closing_voltage, switch.opening_voltage)


def test_a_switch_that_never_halves_its_resistance_does_not_switch():
    assert np.isnan(down(supply=0.01).switching_level)
    assert not np.isnan(down(supply=0.3).switching_level)


def test_transit_brackets_and_the_chosen_wave_speed():
    open_circuit, short_circuit = down(), down(wave_speed="short-circuit")
    d, s, eps = (BASE[name] for name in ("actuator_coefficient", "actuator_compliance", "actuator_permittivity"))
    k2 = d**2 / (s * eps * VACUUM_PERMITTIVITY)
    passive = BASE["channel_thickness"] / BASE["channel_sound_speed"]
    v_e = 1.0 / math.sqrt(BASE["actuator_density"] * s)
    v_d = v_e / math.sqrt(1.0 - k2)
    assert float(open_circuit.closing_time) == pytest.approx(60e-9 / v_d + passive, rel=1e-12)
    assert float(short_circuit.closing_time) == pytest.approx(60e-9 / v_e + passive, rel=1e-12)
    for switch in (open_circuit, short_circuit):
        shown = switch.intermediates
        assert float(shown["transit, open-circuit speed"][0]) == float(open_circuit.closing_time)
        assert float(shown["transit, short-circuit speed"][0]) == float(short_circuit.closing_time)
        assert float(switch.opening_time) == float(switch.closing_time)
    assert short_circuit.closing_time > open_circuit.closing_time
    # everything that is no wave stays the same
    np.testing.assert_array_equal(short_circuit.resistance, open_circuit.resistance)
    np.testing.assert_array_equal(short_circuit.input_charge, open_circuit.input_charge)


def test_electrodes_add_their_transit():
    plain, coated = down(), down({"electrode_thickness": 10e-9, "electrode_sound_speed": 5000.0})
    assert float(coated.closing_time - plain.closing_time) == pytest.approx(2e-12, rel=1e-9)


def test_natural_frequency_lies_between_the_quarter_and_the_half_wave():
    switch = down()
    passive = BASE["channel_thickness"] / BASE["channel_sound_speed"]
    quarter = 0.5 * math.pi / (float(switch.closing_time) - passive)
    assert quarter < float(switch.natural_frequency) < 2.0 * quarter
    assert float(switch.quality) == 1.0


def test_limits_know_what_is_used():
    switch = down(supply=np.array([0.3, 0.6]))
    shown = switch.intermediates
    np.testing.assert_allclose(limit(switch, "actuator field").used, np.array([0.3, 0.6]) / 60e-9)
    np.testing.assert_array_equal(limit(switch, "back pressure").used, shown["back pressure"][0])
    peak = shown["pressure"][0] * (1.0 + math.exp(-math.pi / math.sqrt(3.0)))
    np.testing.assert_allclose(limit(switch, "peak channel pressure").used, peak, rtol=1e-12)
    half = limit(switch, "half the Curie")
    assert float(half.limit) == pytest.approx(273.15 + 165.0)
    assert half.kind == "soft"
    assert float(limit(switch, "Curie").limit) == 603.15
    assert {item.source for item in switch.limits} <= {item.name for item in MODEL.inputs}


def test_ringing_limit_follows_the_switching_level():
    """A late switch (level near 1) re-opens on a small undershoot; the record says which quality is too high."""
    supply = np.array([0.2, 0.3, 0.5, 0.8])
    switch = down({"mechanical_quality": 3.0}, supply=supply)
    ringing = limit(switch, "ringing")
    np.testing.assert_array_equal(ringing.limit, acoustics.quality_limit(switch.switching_level))
    np.testing.assert_array_equal(ringing.margin >= 1.0, ringing.limit >= 3.0)
    assert (ringing.margin < 1.0).any()
    # at the limit itself the first undershoot of a step-driven actuator just touches the level
    late = switch.switching_level[0]
    q = float(acoustics.quality_limit_undershoot(late))
    lowest = 2.0 * math.pi / math.sqrt(1.0 - 1.0 / (4.0 * q**2))
    assert float(two_pole.step_response(lowest, q)) == pytest.approx(float(late), rel=1e-9)


def test_a_gap_that_does_not_close_is_outside():
    supply = np.array([0.1, 0.3, 0.5])
    switch = down({"built_in_interference": -0.2 * BASE["actuator_coefficient"]}, supply=supply)
    mask = next(mask for reason, mask in switch.outside.items() if "gap" in reason)
    assert mask.tolist() == [True, False, False]
    # the charge is that of the free column while the gap is open
    free = float(switch.intermediates["capacitance with free ends"][0])
    assert float(switch.input_charge[0]) == pytest.approx(free * 0.1, rel=1e-12)
    assert float(switch.input_charge[2]) < free * 0.5


def test_draws_with_impossible_constants_are_outside_and_do_not_warn():
    d = np.array([350e-12, 520e-12]).reshape(-1, 1, 1)
    switch = down({"actuator_coefficient": d}, supply=np.array([0.3, 0.5]).reshape(1, 1, -1))
    mask = next(mask for reason, mask in switch.outside.items() if "coupling factor" in reason)
    assert mask.ravel().tolist() == [False, True]
    assert np.isnan(switch.closing_time[1]).all()


def test_draws_without_contrast_are_outside():
    floor = np.array([5e4, 1e11]).reshape(-1, 1, 1)
    switch = down({"resistance_floor": floor}, supply=np.array([0.3, 0.5]).reshape(1, 1, -1))
    mask = next(mask for reason, mask in switch.outside.items() if "floor" in reason)
    assert mask.ravel().tolist() == [False, True]


def test_broadcast_over_draw_temperature_and_supply():
    d = np.array([300e-12, 350e-12]).reshape(-1, 1, 1)
    temperature = np.array([298.15, 328.15, 358.15]).reshape(1, -1, 1)
    supply = np.array([0.3, 0.4, 0.5, 0.6]).reshape(1, 1, -1)
    switch = down({"actuator_coefficient": d}, supply, temperature)
    assert switch.resistance.shape == (2, 3, 4)
    one = down({"actuator_coefficient": 300e-12}, 0.4, 358.15)
    assert float(switch.resistance[0, 2, 1]) == pytest.approx(float(one.resistance), rel=1e-14)
    assert float(switch.switching_level[0, 2, 1]) == pytest.approx(float(one.switching_level), rel=1e-12)
    grid = switch.current(np.linspace(0.0, 1.0, 5) * supply[..., None], supply[..., None])
    assert grid.shape == (2, 3, 4, 5)
    for item in switch.limits:
        np.broadcast_shapes(np.shape(item.used), np.shape(item.limit), (2, 3, 4))


def test_hotter_leaks_more_by_the_activation_energy_and_keeps_its_floor():
    cold, hot = down(temperature=T_REF), down(temperature=358.15)
    expected = 0.45 * EV / BOLTZMANN * (1 / T_REF - 1 / 358.15)
    contact = 2 * BASE["contact_resistivity"] / BASE["channel_area"]
    corner = down(temperature=T_REF).intermediates["resistance, open"][0]
    assert math.log(float(cold.intermediates["resistance, open"][0] / hot.intermediates["resistance, open"][0])) == (
        pytest.approx(expected, rel=0.01)  # the soft corner at zero pressure takes the rest
    )
    assert float(corner) < 1e10 + contact
    far = [float(down(supply=5.0, temperature=t).resistance) for t in (T_REF, 358.15)]
    assert far[0] == pytest.approx(far[1], rel=1e-9)


def test_log_slope_keeps_the_pressure_of_the_floor_when_hot():
    """Half way down the slope only half of the barrier is left."""
    values = {**BASE, **LOG_SLOPE, "contact_resistivity": 0.0, "corner_width": 1e5}
    saturation = 0.1e9 + math.log10(1e10 / 5e4) / 4e-9
    middle = 0.5 * (0.1e9 + saturation)
    per_volt = float(pair(values).down.intermediates["pressure per volt"][0])
    cold, hot = (float(pair(values, middle / per_volt, t).down.resistance) for t in (T_REF, 358.15))
    whole = 0.45 * EV / BOLTZMANN * (1 / T_REF - 1 / 358.15)
    assert math.log(cold / hot) == pytest.approx(0.5 * whole, rel=1e-6)


def test_activated_law_falls_with_temperature_and_pressure():
    values = {**BASE, **ACTIVATED}
    switch = pair(values, np.array([0.2, 0.4]), np.array([[298.15], [358.15]]), pressure_law="activated").down
    r = switch.resistance
    assert np.all(r[:, 1] < r[:, 0])
    assert np.all(r[1] < r[0])
    open_cold = float(np.broadcast_to(switch.intermediates["resistance, open"][0], (2, 2))[0, 0])
    contact = 2 * BASE["contact_resistivity"] / BASE["channel_area"]
    barrier = 1e3 * math.exp(0.45 * EV / (BOLTZMANN * T_REF)) + 2e4
    assert open_cold == pytest.approx(1.0 / (1.0 / barrier + 1e-13) + contact, rel=1e-9)


def test_stacks_are_ohmic_and_simultaneous():
    switch = down()
    np.testing.assert_array_equal(switch.stack_on * switch.stack_off, np.ones(8))
    assert switch.stack_on[2] == 3.0
    assert switch.stack_time == "simultaneous"
    assert switch.input_scales_with_size


def test_input_leaks_only_when_high():
    switch = down()
    assert float(switch.off_current_input_high) == pytest.approx(0.5 / 1e14)
    assert float(switch.off_current_input_low) == 0.0
    assert float(switch.off_current_body) == 0.0


@pytest.mark.parametrize("complement", ["own", "mirrored-plate", "none"])
def test_both_polarities_are_the_same_switch(complement: str):
    both = pair({**BASE, **LOG_SLOPE}, complement=complement)
    assert (both.down.polarity, both.up.polarity) == ("down", "up")
    assert both.down.partner == both.up.partner == complement
    assert float(both.down.resistance) == float(both.up.resistance)


def test_capabilities_are_what_the_file_states():
    assert down().capabilities == {}
    stated = down({"endurance_cycles": 1e12, "process_temperature": 693.15}).capabilities
    assert float(stated["endurance_cycles"].value) == 1e12
    assert stated["process_temperature"].unit == "K"


@pytest.mark.parametrize(
    ("coefficient", "supply", "resistance", "allowed"),
    [
        (300e-12, 0.25, 1e5, True),
        (150e-12, 0.25, 1e7, True),
        (150e-12, 0.50, 1e5, False),
        (150e-12, 0.40, 6.31e5, True),
    ],
)
def test_hand_law_gives_the_hand_calculation(coefficient: float, supply: float, resistance: float, allowed: bool):
    switch = hand(supply, coefficient)
    assert float(switch.resistance) == pytest.approx(resistance, rel=1e-3)
    assert float(switch.closing_time) == pytest.approx(15e-12, rel=1e-12)
    assert 2.0 * float(switch.input_charge) * supply == pytest.approx(0.10e-15 * supply**2, rel=1e-12)
    assert float(switch.off_current_path) == pytest.approx(supply / 1e9, rel=1e-12)
    assert float(switch.extra_energy) == 0.0
    assert bool(limit(switch, "actuator field").margin >= 1.0) is allowed
    assert np.isnan(switch.natural_frequency)


def test_hand_law_elasticity_of_delay_to_the_coefficient():
    """-(RC/t) ln(10) s p = -2.911 at the first point and -4.508 at the second (hand calculation)."""
    for coefficient, expected in ((300e-12, -2.911), (150e-12, -4.508)):
        delays = []
        for factor in (1 - 1e-6, 1 + 1e-6):
            switch = hand(0.25, coefficient * factor)
            delays.append(float(switch.closing_time) + math.log(2) * float(switch.resistance) * 0.10e-15)
        assert math.log(delays[1] / delays[0]) / 2e-6 == pytest.approx(expected, abs=5e-4)


def test_hand_law_required_coefficients():
    """d where RC equals the transit (274.9 pm/V), and for 25 ps at 0.25 V (288.1) and 0.40 V (180.0)."""

    def delay(coefficient: float, supply: float) -> float:
        switch = hand(supply, coefficient)
        return float(switch.closing_time) + math.log(2) * float(switch.resistance) * 0.10e-15

    assert delay(274.9e-12, 0.25) == pytest.approx(30e-12, rel=2e-3)
    assert delay(288.1e-12, 0.25) == pytest.approx(25e-12, rel=1e-3)
    assert delay(180.0e-12, 0.40) == pytest.approx(25e-12, rel=1e-3)


# --- consistency checks ---------------------------------------------------------------------------------------------


def findings(values: Mapping[str, Any], **options: str) -> dict[tuple[str, str], str]:
    given = inputs(values, **options)
    found = {(item.level, item.name): item.found for item in MODEL.check(given)}
    for item in judged(MODEL.links, given.values, given.options):
        for level, where in (("warn", item.warned), ("refuse", item.refused)):
            if np.any(where):
                worst = float(np.ravel(item.deviation)[np.argmax(np.abs(item.deviation))])
                found[level, f"value.{item.link.place}"] = f"{100.0 * worst:+.1f} %"
    return found


def test_a_consistent_set_has_no_findings():
    assert findings({**BASE, **LOG_SLOPE}) == {}


@pytest.mark.parametrize(("published", "level"), [(0.70, None), (0.66, "warn"), (0.50, "refuse")])
def test_coupling_factor_is_compared_with_the_published_one(published: float, level: str | None):
    found = findings({**BASE, **LOG_SLOPE, "actuator_coupling_factor": published})
    assert set(found) == (set() if level is None else {(level, "value.actuator_coupling_factor")})


def test_one_bad_node_is_enough():
    d = np.array([350e-12, 290e-12])
    found = findings({**BASE, **LOG_SLOPE, "actuator_coefficient": d})
    assert found[("warn", "value.actuator_coupling_factor")].startswith("-")


def test_impossible_coupling_factor_is_refused():
    assert ("refuse", "value.actuator_coefficient") in findings({**BASE, **LOG_SLOPE, "actuator_coefficient": 700e-12})


def test_unpublished_coupling_factor_is_noted():
    values = {**BASE, **LOG_SLOPE}
    del values["actuator_coupling_factor"]
    assert ("note", "value.actuator_coupling_factor") in findings(values)


@pytest.mark.parametrize(
    ("change", "expected"),
    [
        ({"actuator_height": 20e-9}, ("warn", "value.actuator_height")),
        ({"channel_area": 3000e-18}, ("warn", "value.channel_area")),
        ({"channel_thickness": 1.5e-9}, ("note", "value.channel_thickness")),
        ({"built_in_interference": -1e-12}, ("note", "value.built_in_interference")),
        ({"electrode_thickness": 5e-9}, ("refuse", "value.electrode_thickness")),
        ({"resistance_floor": 2e10}, ("refuse", "value.resistance_floor")),
    ],
)
def test_geometry_and_contrast_findings(change: dict[str, float], expected: tuple[str, str]):
    assert expected in findings({**BASE, **LOG_SLOPE, **change})


def test_hand_set_has_no_findings():
    assert findings(HAND, mechanics="stated-pressure", pressure_law="exponential") == {}
