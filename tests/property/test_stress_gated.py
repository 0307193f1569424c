"""Scaling laws and limits of the stress-gated switch."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from benchmark.devices.record import Switch
from tests.unit.test_stress_gated import BASE, HAND, LOG_SLOPE, limit, pair

factors = st.floats(0.5, 2.0)
supplies = st.floats(0.15, 0.8)


def full(supply: float, wave_speed: str = "open-circuit", **values: Any) -> Switch:
    return pair({**BASE, **LOG_SLOPE, **values}, supply, wave_speed=wave_speed).down


def hand(supply: float, **values: Any) -> Switch:
    return pair({**HAND, **values}, supply, mechanics="stated-pressure", pressure_law="exponential").down


def cycle_energy(switch: Switch, supply: float) -> float:
    return float(switch.input_charge) * supply + float(switch.extra_energy)


@given(factors, st.floats(0.1, 0.4))
def test_only_the_product_of_coefficient_and_voltage_enters(k: float, supply: float):
    """Coefficient / k and supply x k: resistance, delay and level stay, energy goes as k^2, leakage share stays."""
    before, after = hand(supply), hand(k * supply, actuator_coefficient=HAND["actuator_coefficient"] / k)
    np.testing.assert_allclose(after.resistance, before.resistance, rtol=1e-9)
    np.testing.assert_allclose(after.closing_time, before.closing_time, rtol=1e-14)
    np.testing.assert_allclose(after.switching_level, before.switching_level, rtol=1e-9)
    np.testing.assert_allclose(cycle_energy(after, k * supply), k**2 * cycle_energy(before, supply), rtol=1e-9)
    shares = [float(s.off_current_path) * v / cycle_energy(s, v) for s, v in ((before, supply), (after, k * supply))]
    np.testing.assert_allclose(shares[1], shares[0], rtol=1e-9)


@given(st.floats(0.8, 2.0), supplies)
def test_the_product_rules_the_full_force_balance_too(k: float, supply: float):
    """With the short-circuit speed nothing else sees the coefficient but the charge held back by the force."""
    d = BASE["actuator_coefficient"]
    before = full(supply, "short-circuit")
    after = full(k * supply, "short-circuit", actuator_coefficient=d / k)
    np.testing.assert_allclose(after.resistance, before.resistance, rtol=1e-9)
    np.testing.assert_allclose(after.switching_level, before.switching_level, rtol=1e-7)
    np.testing.assert_allclose(after.closing_time, before.closing_time, rtol=1e-14)
    free = float(before.intermediates["capacitance with free ends"][0])
    held = d * float(before.intermediates["clamp force"][0])
    np.testing.assert_allclose(after.input_charge, free * k * supply - held / k, rtol=1e-9)


@given(st.floats(1.0, 1.3), st.floats(0.2, 0.5))
def test_a_better_coefficient_never_hurts_when_the_supply_follows_it(k: float, supply: float):
    d = BASE["actuator_coefficient"]
    before, after = full(supply), full(supply / k, actuator_coefficient=d * k)
    np.testing.assert_allclose(after.resistance, before.resistance, rtol=1e-9)
    assert after.closing_time <= before.closing_time
    assert cycle_energy(after, supply / k) <= cycle_energy(before, supply)
    assert limit(after, "actuator field").margin >= limit(before, "actuator field").margin


@given(st.floats(1.05, 1.3), st.floats(0.3, 0.8))
def test_a_better_coefficient_at_fixed_supply_eats_the_pressure_margins(k: float, supply: float):
    before, after = full(supply), full(supply, actuator_coefficient=BASE["actuator_coefficient"] * k)
    for name in ("back pressure", "peak channel pressure"):
        np.testing.assert_allclose(limit(after, name).margin * k, limit(before, name).margin, rtol=1e-9)
    assert limit(after, "actuator field").margin == limit(before, "actuator field").margin


@given(st.floats(0.0, 1.0), st.floats(0.2, 0.5))
def test_thin_stack_leaves_pure_resistance_and_capacitance(thinner: float, supply: float):
    """Stack thickness scales the transit and nothing else that the hand law delays with."""
    before = hand(supply)
    after = hand(supply, stack_thickness=HAND["stack_thickness"] * max(thinner, 1e-12))
    np.testing.assert_allclose(after.closing_time, before.closing_time * max(thinner, 1e-12), rtol=1e-12)
    assert float(after.resistance) == float(before.resistance)


@given(st.floats(3.0, 30.0))
def test_pressure_without_end_leaves_floor_and_contacts(supply: float):
    contact = 2 * BASE["contact_resistivity"] / BASE["channel_area"]
    np.testing.assert_allclose(full(supply).resistance, LOG_SLOPE["resistance_floor"] + contact, rtol=1e-6)
    bare = pair({**BASE, **LOG_SLOPE}, supply, pressure_law="exponential").down
    np.testing.assert_allclose(bare.resistance, contact, rtol=1e-6)


@given(supplies, st.floats(1.01, 1.5))
def test_more_supply_closes_harder_and_costs_more(supply: float, k: float):
    low, high = full(supply), full(k * supply)
    assert high.resistance < low.resistance
    assert high.input_charge > low.input_charge
    assert high.extra_energy > low.extra_energy
    assert high.off_current_path > low.off_current_path


@given(supplies, st.floats(250.0, 400.0), st.floats(1.0, 60.0))
def test_hotter_conducts_more(supply: float, temperature: float, rise: float):
    values = {**BASE, **LOG_SLOPE}
    cold, hot = (pair(values, supply, t).down for t in (temperature, temperature + rise))
    assert hot.off_current_path > cold.off_current_path
    assert hot.resistance <= cold.resistance * (1 + 1e-12)
    assert hot.on_current / hot.off_current_path < cold.on_current / cold.off_current_path


@given(st.sampled_from(["frame_compliance", "punch_faces", "channel_thickness"]), st.floats(1.1, 5.0), supplies)
def test_a_softer_loop_presses_less(name: str, k: float, supply: float):
    stiff, soft = full(supply), full(supply, **{name: BASE[name] * k})
    assert soft.intermediates["pressure"][0] < stiff.intermediates["pressure"][0]
    assert soft.resistance > stiff.resistance


@given(supplies, st.floats(0.0, 1.5), st.floats(0.0, 1.5))
def test_path_current_is_ohmic_and_rises_with_control(supply: float, a: float, b: float):
    switch = full(supply)
    low, high = min(a, b) * supply, max(a, b) * supply
    at = switch.current(np.array([low, high]), np.array([supply, supply]))
    assert at[0] <= at[1]
    np.testing.assert_allclose(switch.current(np.array([high]), np.array([0.25 * supply]))[0], 0.25 * at[1], rtol=1e-12)


@given(st.integers(1, 20), supplies)
def test_layers_in_parallel_trade_supply_for_charge(layers: int, supply: float):
    """n layers at V/n: same force and field, same energy."""
    one, many = full(supply), full(supply / layers, layer_count=float(layers))
    np.testing.assert_allclose(many.resistance, one.resistance, rtol=1e-9)
    np.testing.assert_allclose(limit(many, "actuator field").used, limit(one, "actuator field").used, rtol=1e-12)
    energies = [cycle_energy(one, supply), cycle_energy(many, supply / layers)]
    assert math.isclose(energies[0], energies[1], rel_tol=1e-9)
