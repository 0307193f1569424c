"""The switch stated directly: hand scenarios and the meaning of every option."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from benchmark.devices.given import MODEL, STATED_ONLY
from benchmark.devices.model import ModelInputs
from tests.switch_contract import check_pair

BASE = {
    "reference_temperature": 298.15,
    "declared_supply": 0.5,
    "on_resistance": 144e3,
    "off_resistance": 2e12,
    "switching_level": 0.7,
    "input_capacitance": 0.5e-15,
    "terminal_capacitance": 0.05e-15,
    "closing_delay": 1e-7,
    "opening_delay": 2e-7,
    "extra_energy_per_cycle": 1e-18,
    "footprint": 5e-14,
}


def inputs(options: dict[str, str] | None = None, drop: tuple[str, ...] = (), **values: object) -> ModelInputs:
    merged = {name: value for name, value in {**BASE, **values}.items() if name not in drop}
    return ModelInputs({name: np.asarray(value, dtype=float) for name, value in merged.items()}, options or {}, {})


def pair_of(stated: ModelInputs, supply: object = 0.5, temperature: object = 298.15):
    zero = {"threshold_shift": np.zeros(())}
    return MODEL.switch(MODEL.prepare(stated), np.asarray(supply, float), np.asarray(temperature, float), zero)


def test_contract_holds_for_every_option():
    supply = np.array([0.4, 0.5, 0.7]).reshape(1, 1, 3)
    temperature = np.array([273.15, 358.15]).reshape(1, 2, 1)
    draws = np.array([100e3, 144e3, 200e3, 1e6]).reshape(4, 1, 1)
    for off_state, drop, more in (
        ("resistance", (), {}),
        ("current", ("off_resistance",), {"open_state_current": 1e-12}),
        ("none", ("off_resistance",), {}),
    ):
        stated = inputs(
            {"off_state": off_state, "supply_dependence": "constant-resistance"}, drop, on_resistance=draws, **more
        )
        check_pair(pair_of(stated, supply, temperature))


def test_off_resistance_leaks_through_the_series_of_open_and_closed():
    pair = pair_of(inputs())
    assert pair.down.off_current_path == pytest.approx(0.5 / (2e12 + 144e3), rel=1e-14)
    assert pair.down.on_current == pytest.approx(0.5 / 144e3, rel=1e-14)
    assert pair.down.input_charge == pytest.approx(0.25e-15, rel=1e-14)
    assert pair.down.closing_time == 1e-7
    assert pair.up.opening_time == 2e-7


def test_off_current_holds_at_the_declared_supply_and_follows_the_supply_ohmically():
    options = {"off_state": "current", "supply_dependence": "constant-resistance"}
    stated = inputs(options, ("off_resistance",), open_state_current=1e-10)
    pair = pair_of(stated, [0.5, 1.0])
    assert pair.down.off_current_path == pytest.approx([1e-10, 2e-10], rel=1e-14)


def test_no_leakage_is_exactly_none():
    pair = pair_of(inputs({"off_state": "none"}, ("off_resistance",)))
    assert pair.down.off_current_path == 0.0
    assert pair.down.current(np.zeros(1), np.full(1, 0.5)) == 0.0


@pytest.mark.parametrize("level", [0.3, 0.5, 0.7, 0.9, 0.97, 0.995])
@pytest.mark.parametrize("off_state", ["resistance", "none"])
def test_resistance_is_doubled_at_the_switching_level(level: float, off_state: str):
    drop = () if off_state == "resistance" else ("off_resistance",)
    pair = pair_of(inputs({"off_state": off_state}, drop, switching_level=level))
    control, path = np.array([level * 0.5, 0.5]), np.full(2, 0.5)
    doubled, closed = pair.down.current(control, path)
    assert closed / doubled == pytest.approx(2.0, rel=1e-9)
    assert closed == pytest.approx(0.5 / 144e3, rel=1e-14)


def test_a_fixed_point_refuses_other_supplies_and_tolerates_rounding():
    pair = pair_of(inputs(), [0.5, 0.5 * (1 + 1e-14), 0.51])
    assert pair.down.outside[STATED_ONLY].tolist() == [False, False, True]
    open_pair = pair_of(inputs({"supply_dependence": "constant-resistance"}), [0.5, 0.51])
    assert open_pair.down.outside == {}


def test_stated_closing_voltage_does_not_move_with_the_supply():
    stated = inputs({"supply_dependence": "constant-resistance"}, closing_voltage=0.35, opening_voltage=0.30)
    pair = pair_of(stated, [0.3, 0.5, 0.7])
    assert pair.down.switching_level == pytest.approx([np.nan, 0.7, 0.5], nan_ok=True)
    assert pair.down.outside["supply does not exceed the closing voltage"].tolist() == [True, False, False]
    assert pair.down.closing_voltage == 0.35
    assert pair.up.opening_voltage == 0.30
    check_pair(pair)


def test_without_closing_voltage_there_is_no_hysteresis():
    pair = pair_of(inputs({"supply_dependence": "constant-resistance"}), [0.5, 1.0])
    assert pair.down.closing_voltage == pytest.approx([0.35, 0.70])
    assert pair.down.opening_voltage == pytest.approx([0.35, 0.70])
    assert [f.level for f in MODEL.check(inputs())] == ["note"]


@pytest.mark.parametrize(
    ("options", "drop", "values", "name"),
    [
        ({}, (), {"off_resistance": 144e3}, "value.off_resistance"),
        ({"off_state": "current"}, ("off_resistance",), {"open_state_current": 0.0}, "value.open_state_current"),
        ({"off_state": "current"}, ("off_resistance",), {"open_state_current": 2e-6}, "value.open_state_current"),
        ({}, (), {"switching_level": 1.0}, "value.switching_level"),
        ({}, (), {"switching_level": 0.0}, "value.switching_level"),
        ({}, (), {"closing_voltage": 0.35, "opening_voltage": 0.36}, "value.opening_voltage"),
        ({}, (), {"closing_voltage": 0.35, "opening_voltage": -0.2}, "value.opening_voltage"),
        ({}, (), {"opening_voltage": 0.2}, "value.opening_voltage"),
    ],
)
def test_contradictions_are_refused(options, drop, values, name):
    findings = [f for f in MODEL.check(inputs(options, drop, **values)) if f.level == "refuse"]
    assert [f.name for f in findings] == [name]


def test_a_draw_without_ratio_is_outside():
    pair = pair_of(inputs(off_resistance=np.array([1e4, 2e12])))
    assert pair.down.outside["open resistance not above twice the closed one"].tolist() == [True, False]


def test_stack_depth_is_what_the_file_states():
    pair = pair_of(inputs(series_switches_max=3.0))
    assert pair.down.stack_on.tolist() == [1.0, 2.0, 3.0]
    assert pair.down.stack_off == pytest.approx([1.0, 1 / 2, 1 / 3])
    assert pair_of(inputs()).down.stack_on.size == 4


def test_unknown_stays_unknown_and_stated_capabilities_are_carried():
    pair = pair_of(inputs(drop=("footprint",), endurance_cycles=1e14, process_temperature=823.15))
    assert math.isnan(pair.down.area)
    assert math.isnan(pair.down.retention)
    assert pair.down.capabilities["endurance_cycles"].value == 1e14
    assert pair.down.capabilities["process_temperature"].unit == "K"
    assert set(pair_of(inputs()).down.capabilities) == set()


def test_supply_ceiling_is_a_hard_limit():
    pair = pair_of(inputs({"supply_dependence": "constant-resistance"}, supply_ceiling=1.0), [0.5, 2.0])
    (limit,) = pair.down.limits
    assert limit.margin == pytest.approx([2.0, 0.5])
    assert limit.kind == "hard"


# Hand scenario "always-on hub": energy per cycle and gate by E = a C V^2 + I_leak V T, deadline 10 us
HUB = {
    "fast": (
        {"off_state": "current"},
        {"declared_supply": 0.60, "open_state_current": 100e-12, "input_capacitance": 0.5e-15},
    ),
    "low leakage": (
        {"off_state": "current"},
        {"declared_supply": 0.70, "open_state_current": 1e-12, "input_capacitance": 0.5e-15},
    ),
    "relay": ({"off_state": "none"}, {"declared_supply": 2.0, "input_capacitance": 0.25e-15}),
}


@pytest.mark.parametrize(
    ("side", "slope", "rest"), [("fast", 0.36, 0.600), ("low leakage", 0.49, 0.007), ("relay", 2.0, 0.0)]
)
def test_hub_by_hand(side: str, slope: float, rest: float):
    options, values = HUB[side]
    drop = ("off_resistance", "terminal_capacitance")
    stated = inputs(options, drop, on_resistance=1e4, switching_level=0.5, **values)
    supply = values["declared_supply"]
    pair = pair_of(stated, supply)
    switched = supply * (pair.down.input_charge + pair.up.input_charge)
    leaked = supply * 0.5 * (pair.down.off_current_path + pair.up.off_current_path) * 10e-6
    assert switched * 1e15 == pytest.approx(slope, rel=1e-12)
    assert leaked * 1e15 == pytest.approx(rest, rel=1e-12, abs=0.0)


@settings(deadline=None, max_examples=60)
@given(k=st.floats(0.1, 10.0), level=st.floats(0.2, 0.95))
def test_impedance_times_k_leaves_products_and_divides_currents(k: float, level: float):
    one = pair_of(inputs(switching_level=level)).down
    scaled = pair_of(
        inputs(
            switching_level=level,
            on_resistance=144e3 * k,
            off_resistance=2e12 * k,
            input_capacitance=0.5e-15 / k,
            terminal_capacitance=0.05e-15 / k,
        )
    ).down
    for name in ("input_capacitance_delay", "terminal_capacitance_delay"):
        product = scaled.resistance * getattr(scaled, name)
        assert product == pytest.approx(float(one.resistance * getattr(one, name)), rel=1e-9)
    control, path = np.linspace(0.0, 0.5, 11), np.full(11, 0.5)
    assert scaled.current(control, path) * k == pytest.approx(one.current(control, path), rel=1e-9)
    assert scaled.off_current_path * k == pytest.approx(float(one.off_current_path), rel=1e-9)


@settings(deadline=None, max_examples=60)
@given(k=st.floats(0.2, 5.0))
def test_supply_times_k_at_fixed_resistance(k: float):
    constant = inputs({"supply_dependence": "constant-resistance"})
    one, scaled = pair_of(constant, 0.5).down, pair_of(constant, 0.5 * k).down
    assert scaled.resistance == one.resistance
    assert scaled.switching_level == one.switching_level
    assert scaled.input_charge * k * 0.5 == pytest.approx(float(one.input_charge) * 0.5 * k**2, rel=1e-9)
    assert scaled.off_current_path * k * 0.5 == pytest.approx(float(one.off_current_path) * 0.5 * k**2, rel=1e-9)
