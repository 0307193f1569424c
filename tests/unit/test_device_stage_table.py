"""A technology known by stage results: exact at its rows, nothing between conditions it does not state."""

from __future__ import annotations

import math

import numpy as np
import pytest

from benchmark.devices.model import ModelInputs
from benchmark.devices.stage_table import MODEL
from benchmark.measured import MeasuredTable
from tests.switch_contract import check_pair

LN2 = math.log(2.0)
ROOM, HOT = 298.15, 358.15
NAMES = (
    "supply",
    "temperature",
    "delay",
    "energy_per_cycle",
    "leakage_power",
    "drive_resistance",
    "input_capacitance",
    "area",
)
NAN = math.nan
# invented rows: V, K, s, J, W, ohm, F, m^2
BARE = [
    (0.4, ROOM, 30e-12, 0.20e-15, 10e-12, NAN, NAN, NAN),
    (0.5, ROOM, 15e-12, 0.31e-15, 20e-12, NAN, NAN, NAN),
    (0.7, ROOM, 8e-12, 0.60e-15, 45e-12, NAN, NAN, NAN),
]
WARM = [(v, HOT, t * 0.9, e, p * 15.0, r, c, a) for v, _, t, e, p, r, c, a in BARE]
LOADED = [
    (0.5, ROOM, 15e-12, 0.75e-15, 20e-12, 7.2e3, 0.60e-15, 0.022e-12),
    (0.7, ROOM, 8e-12, 1.47e-15, 45e-12, 3.84e3, 0.60e-15, 0.022e-12),
]
STAGE = "inverter, fan-out 4, no wire"


def inputs(rows, options=None, **values) -> ModelInputs:
    columns = {name: np.array([row[at] for row in rows]) for at, name in enumerate(NAMES)}
    table = MeasuredTable("rows", columns, {}, "delay", "supply", "log", "monotone")
    merged = {"reference_temperature": ROOM, "declared_supply": 0.5, **values}
    return ModelInputs({k: np.asarray(v, float) for k, v in merged.items()}, options or {}, {"rows": table})


def pair_of(given_inputs, supply=0.5, temperature=ROOM):
    knobs = {"threshold_shift": np.zeros(())}
    return MODEL.switch(MODEL.prepare(given_inputs), np.asarray(supply, float), np.asarray(temperature, float), knobs)


def refused(given_inputs) -> list[str]:
    return [f.what for f in MODEL.check(given_inputs) if f.level == "refuse"]


def stage_of(pair, fan_out=0.0):
    """Delay, energy and leakage of an inverter that drives ``fan_out`` inverters, from the record alone."""
    down, up = pair.down, pair.up
    own = down.terminal_capacitance_delay + up.terminal_capacitance_delay
    load = fan_out * (down.input_capacitance_delay + up.input_capacitance_delay)
    energy = pair.supply**2 * (down.terminal_capacitance + up.terminal_capacitance)
    energy = energy + pair.supply * fan_out * (down.input_charge + up.input_charge)
    leakage = pair.supply * 0.5 * (down.off_current_path + up.off_current_path)
    return LN2 * down.resistance * (own + load), energy, leakage


def test_bare_rows_come_back_and_only_the_stated_stage_is_known():
    pair = pair_of(inputs(BARE), [0.4, 0.5, 0.7])
    delay, energy, leakage = stage_of(pair, fan_out=4.0)
    assert delay == pytest.approx([30e-12, 15e-12, 8e-12], rel=1e-12)
    assert energy == pytest.approx([0.20e-15, 0.31e-15, 0.60e-15], rel=1e-12)
    assert leakage == pytest.approx([10e-12, 20e-12, 45e-12], rel=1e-12)
    assert pair.down.stage_only == pair.up.stage_only == STAGE
    assert math.isnan(pair.down.area)
    assert refused(inputs(BARE)) == []
    check_pair(pair)


def test_between_rows_every_column_is_monotone_and_bracketed():
    supply = np.linspace(0.4, 0.7, 61)
    delay, energy, leakage = stage_of(pair_of(inputs(BARE), supply))
    assert (np.diff(delay) < 0.0).all()
    assert (np.diff(energy) > 0.0).all()
    assert (np.diff(leakage) > 0.0).all()


def test_loaded_rows_work_under_any_load():
    pair = pair_of(inputs(LOADED), [0.5, 0.7])
    delay, energy, _ = stage_of(pair, fan_out=4.0)
    assert delay == pytest.approx([15e-12, 8e-12], rel=1e-12)
    assert energy == pytest.approx([0.75e-15, 1.47e-15], rel=1e-12)
    alone = stage_of(pair, fan_out=1.0)[0]
    own = 15e-12 / (LN2 * 7.2e3) - 4.0 * 0.60e-15
    assert alone[0] == pytest.approx(LN2 * 7.2e3 * (own + 0.60e-15), rel=1e-12)
    assert pair.down.stage_only == ""
    assert pair.down.input_capacitance_delay == pytest.approx([0.30e-15, 0.30e-15])
    assert pair.down.area == pytest.approx(0.011e-12)
    check_pair(pair)


def test_fan_out_of_the_stated_stage_is_read_from_the_option():
    one = pair_of(inputs(LOADED, {"stage": "inverter, fan-out 2, no wire"}))
    assert stage_of(one, fan_out=2.0)[0] == pytest.approx(15e-12, rel=1e-12)
    assert stage_of(one, fan_out=4.0)[0] > 15e-12


def test_nothing_outside_the_rows():
    pair = pair_of(inputs(BARE), [0.39, 0.5, 0.71])
    assert pair.down.outside["beyond the stated rows (known 0.4 to 0.7 V)"].tolist() == [True, False, True]
    assert np.isnan(pair.down.resistance).tolist() == [True, False, True]
    warm = pair_of(inputs(BARE), 0.5, [ROOM, HOT])
    assert warm.down.outside["beyond the stated rows (known at 25 degC only)"].tolist() == [False, True]
    single = pair_of(inputs(BARE[1:2]), [0.5, 0.5 * (1 + 1e-13), 0.5001])
    assert single.down.outside["beyond the stated rows (known at 0.5 V only)"].tolist() == [False, False, True]
    assert stage_of(pair_of(inputs(BARE[1:2])))[0] == pytest.approx(15e-12, rel=1e-12)


def test_temperatures_between_the_stated_ones_are_straight_in_inverse_temperature():
    temperature = np.array([ROOM, 320.0, HOT]).reshape(3, 1)
    pair = pair_of(inputs(BARE + WARM), np.array([0.5, 0.7]), temperature)
    leakage = stage_of(pair)[2]
    share = (1.0 / ROOM - 1.0 / 320.0) / (1.0 / ROOM - 1.0 / HOT)
    assert leakage[:, 0] == pytest.approx([20e-12, 20e-12 * 15.0**share, 300e-12], rel=1e-9)
    assert pair.down.outside == {}
    check_pair(pair)


def test_no_leakage_is_exactly_none():
    rows = [(*row[:4], 0.0, *row[5:]) for row in BARE]
    pair = pair_of(inputs(rows))
    assert pair.down.off_current_path == 0.0
    assert pair.down.current(np.zeros(1), np.full(1, 0.5)) == 0.0
    assert refused(inputs(rows)) == []


def changed(rows, at: int, column: str, value: float):
    copy = [list(row) for row in rows]
    copy[at][NAMES.index(column)] = value
    return [tuple(row) for row in copy]


@pytest.mark.parametrize(
    ("given_inputs", "message"),
    [
        (inputs(changed(BARE, 0, "delay", 0.0)), "has a delay at or below 0"),
        (inputs(changed(BARE, 0, "leakage_power", 0.0)), "has a leakage_power that is negative or 0 in some rows only"),
        (inputs(changed(LOADED, 0, "drive_resistance", NAN)), "states drive_resistance or input_capacitance in part"),
        (inputs(changed(LOADED, 0, "area", 1e-14)), "states different areas at one node"),
        (
            inputs([*BARE, changed(BARE, 1, "delay", 16e-12)[1]]),
            "states delay twice at one supply and temperature, differently",
        ),
        (inputs(BARE, declared_supply=0.8), "lies outside the stated rows"),
        (
            inputs(changed(LOADED, 1, "drive_resistance", 6e3)),
            "leaves a negative own capacitance: delay / (ln 2 drive_resistance) is below the stated load",
        ),
        (
            inputs(changed(LOADED, 0, "energy_per_cycle", 0.27e-15)),
            "leaves a negative own capacitance: energy_per_cycle / supply^2 is below the stated load",
        ),
        (inputs(changed(BARE, 0, "leakage_power", 1e-5)), "leaks more than half of what the closed switch carries"),
    ],
)
def test_refusals(given_inputs, message):
    assert refused(given_inputs) == [message]


def test_the_assumed_current_law_is_said():
    levels = {f.level for f in MODEL.check(inputs(BARE))}
    assert levels == {"note"}
    slower = inputs(changed(BARE, 2, "delay", 16e-12))
    assert any(f.what == "the delay rises with the supply somewhere" for f in MODEL.check(slower))
