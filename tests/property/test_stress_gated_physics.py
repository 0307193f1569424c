"""Laws that must hold for any piezoelectric column, channel and base."""

from __future__ import annotations

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from benchmark.physics import acoustics, force_balance, piezo, pressure_resistance, two_pole

unit = st.floats(0.01, 0.99)
pressures = st.floats(0.0, 2e10)


@given(unit, unit)
def test_capacitance_is_between_blocked_and_free(k: float, kappa: float):
    loaded = float(force_balance.input_capacitance(1.0, k, kappa))
    assert float(force_balance.length_blocked_capacitance(1.0, k)) <= loaded <= 1.0


@given(unit, unit)
def test_elastic_share_is_below_its_maximum(k: float, kappa: float):
    largest, where = force_balance.elastic_share_largest(k)
    assert 0.0 <= float(force_balance.elastic_share(k, kappa)) <= float(largest) * (1 + 1e-12)
    assert float(force_balance.elastic_share(k, where)) >= float(largest) * (1 - 1e-9)


@given(
    st.floats(1e-12, 1e-9),
    st.floats(1e-12, 1e-10),
    st.floats(1e-9, 1e-6),
    st.floats(1e-17, 1e-12),
    unit,
    st.floats(0.0, 1.0),
    st.floats(0.01, 5.0),
)
def test_pressure_stays_below_its_bound(
    d: float, s: float, height: float, area: float, ratio: float, other: float, volts: float
):
    column = float(force_balance.column_compliance(s, height, area))
    force = force_balance.spring_force(1, d, volts, 0.0, column * (1 + other))
    bound = force_balance.pressure_bound(d, s, volts / height, ratio)
    assert float(force) / (ratio * area) <= float(bound) * (1 + 1e-12)
    per_volt = force_balance.pressure_per_volt(1, d, column * (1 + other), ratio * area)
    np.testing.assert_allclose(per_volt * volts, force / (ratio * area), rtol=1e-12)


@given(pressures, pressures, st.floats(3.0, 14.0), st.floats(0.0, 3e9), st.floats(1e-10, 1e-8), st.floats(1e6, 1e9))
def test_resistance_falls_with_pressure_between_floor_and_ceiling(
    p: float, q: float, decades: float, onset: float, slope: float, width: float
):
    ceiling = 10.0 ** (3.0 + decades)
    saturation = pressure_resistance.floor_pressure(ceiling, 1e3, onset, slope)
    low, high = (
        float(pressure_resistance.log_slope_resistance(x, ceiling, 1e3, onset, saturation, width))
        for x in (max(p, q), min(p, q))
    )
    assert 1e3 * (1 - 1e-9) <= low <= high * (1 + 1e-12) <= ceiling * (1 + 1e-9)


@given(st.floats(1e-3, 0.999), st.floats(0.1, 50.0), st.floats(1e6, 1e12))
def test_two_pole_reaches_the_level_at_the_time_to_level(level: float, quality: float, omega: float):
    time = two_pole.time_to_level(level, omega, quality)
    assert abs(float(two_pole.step_response(time * omega, quality)) - level) < 1e-9
    assert float(two_pole.time_to_level(level * 0.5, omega, quality)) < float(time)


@given(st.floats(0.0, 100.0), st.floats(0.0, 100.0))
def test_load_raises_and_mass_lowers_the_fundamental(stiffness: float, mass: float):
    x = float(acoustics.loaded_bar_root(stiffness, mass))
    assert 0.0 < x < np.pi
    assert float(acoustics.loaded_bar_root(stiffness + 1.0, mass)) > x
    assert float(acoustics.loaded_bar_root(stiffness, mass + 1.0)) < x


@given(st.floats(0.02, 0.999), st.floats(0.02, 0.999))
def test_ringing_limits_fall_or_rise_with_the_level_as_stated(a: float, b: float):
    low, high = min(a, b), max(a, b)
    assert acoustics.quality_limit_undershoot(low) >= acoustics.quality_limit_undershoot(high)
    assert acoustics.quality_limit_chain(low) <= acoustics.quality_limit_chain(high)
    assert acoustics.quality_limit(low) <= 4.5


@given(st.floats(1e-12, 2e-9), st.floats(5e-12, 5e-11), st.floats(10.0, 1e4), st.floats(2e3, 1e4))
def test_open_circuit_speed_is_above_the_short_circuit_speed(d: float, s: float, relative: float, rho: float):
    k = piezo.coupling_factor(d, s, relative * 8.854e-12)
    stiff = piezo.bar_wave_speed(rho, piezo.compliance_constant_displacement(s, k))
    soft = piezo.bar_wave_speed(rho, s)
    if k >= 1.0:
        assert np.isnan(stiff)
    else:
        assert stiff >= soft
        np.testing.assert_allclose((soft / stiff) ** 2, 1.0 - k**2, rtol=1e-9)
