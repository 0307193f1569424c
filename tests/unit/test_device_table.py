"""A switch known by its curves: the hand scenario, both sweeps, temperatures, and what is refused."""

from __future__ import annotations

import math
import pickle

import numpy as np
import pytest

from benchmark.devices.model import ModelInputs
from benchmark.devices.table import MODEL
from benchmark.measured import MeasuredTable
from tests.switch_contract import check_pair

ROOM = 298.15
VOLTS = [0.0, 0.1, 0.2, 0.3]
# invented: 50 mV/decade, A/m (1e-12 A/um = 1e-6 A/m)
FORWARD = [1e-6, 1e-4, 1e-2, 1.0]
BASE = {
    "reference_temperature": ROOM,
    "declared_supply": 0.30,
    "saturation_voltage": 0.060,
    "unit_width": 1e-6,
    "terminal_capacitance_per_width": 0.10e-9,
    "gate_capacitance_total": 1e-9,
    "transit_time": 0.0,
}


def current_table(rows, columns=("sweep", "control_voltage", "path_voltage", "temperature", "current"), floor=None):
    """Rows in the order of ``columns``; the current in A/m."""
    where = {name: position for position, name in enumerate(columns)}
    data = {
        ("path_current_per_width" if name == "current" else name): np.array([row[at] for row in rows], dtype=float)
        for name, at in where.items()
        if name != "sweep"
    }
    labels = {"sweep": tuple(row[where["sweep"]] for row in rows)} if "sweep" in where else {}
    floors = {} if floor is None else {"path_current_per_width": floor}
    return MeasuredTable(
        "current", data, labels, "path_current_per_width", "control_voltage", "log", "monotone", floors
    )


def sweep(name: str, currents, volts=VOLTS, path=0.3, temperature=ROOM):
    return [(name, v, path, temperature, i) for v, i in zip(volts, currents, strict=True)]


def charge_table(volts, farads, temperature=ROOM):
    columns = {
        "control_voltage": np.array(volts, dtype=float),
        "temperature": np.full(len(volts), temperature),
        "input_capacitance_per_width": np.array(farads, dtype=float),
    }
    return MeasuredTable("charge", columns, {}, "input_capacitance_per_width", "control_voltage", "linear", "charge")


def inputs(table=None, charge=None, options=None, drop=(), **values):
    merged = {name: value for name, value in {**BASE, **values}.items() if name not in drop}
    tables = {"current": table if table is not None else current_table(sweep("forward", FORWARD))}
    if charge is not None:
        tables["charge"] = charge
        merged.pop("gate_capacitance_total", None)
    return ModelInputs({name: np.asarray(v, dtype=float) for name, v in merged.items()}, options or {}, tables)


def pair_of(given_inputs: ModelInputs, supply=0.3, temperature=ROOM):
    knobs = {"threshold_shift": np.zeros(())}
    return MODEL.switch(MODEL.prepare(given_inputs), np.asarray(supply, float), np.asarray(temperature, float), knobs)


def at(pair, control: float, path: float) -> float:
    return float(pair.down.current(np.array([control]), np.array([path]))[..., 0])


def refused(given_inputs: ModelInputs) -> list[str]:
    return [f"{f.name}: {f.what}" for f in MODEL.check(given_inputs) if f.level == "refuse"]


def test_hand_scenario_currents_and_resistance():
    pair = pair_of(inputs())
    assert at(pair, 0.15, 0.3) == pytest.approx(1e-9, rel=1e-12)  # not 5.05e-9, the linear reading
    assert pair.down.on_current == pytest.approx(1e-6, rel=1e-12)
    assert pair.down.resistance == pytest.approx(300e3, rel=1e-12)
    assert math.log(2.0) * pair.down.resistance * 1e-15 * 1e12 == pytest.approx(207.9, abs=0.05)
    assert pair.down.off_current_path == pytest.approx(1e-12, rel=1e-12)
    assert pair.down.switching_level == pytest.approx(1.0 - 0.050 * math.log10(2.0) / 0.3, rel=1e-9)
    assert pair.down.resistance_kind == "path"
    check_pair(pair)


def test_width_scales_current_and_charge():
    one, two = pair_of(inputs()), pair_of(inputs(unit_width=2e-6))
    assert two.down.on_current == pytest.approx(2.0 * float(one.down.on_current), rel=1e-14)
    assert two.down.input_charge == pytest.approx(2.0 * float(one.down.input_charge), rel=1e-14)
    assert two.down.terminal_capacitance == pytest.approx(0.2e-15, rel=1e-14)
    assert two.down.switching_level == one.down.switching_level


def test_charge_energy_of_a_rising_capacitance():
    # C = 1 fF (1 + v/1 V) at 1 V: 1.5 fJ, not 2.0 (C(V) V^2) and not 1.0 (C(0) V^2)
    table = current_table(sweep("forward", [1e-6, 1.0], [0.0, 1.0], path=1.0))
    given_inputs = inputs(table, charge_table([0.0, 0.5, 1.0], [1e-9, 1.5e-9, 2e-9]))
    pair = pair_of(given_inputs, 1.0)
    assert pair.down.input_charge == pytest.approx(1.5e-15, rel=1e-12)
    assert pair.down.input_capacitance_delay == pytest.approx(1.5e-15, rel=1e-12)
    half = pair_of(given_inputs, 0.5)
    assert half.down.input_charge == pytest.approx(0.625e-15, rel=1e-12)


def test_rows_in_any_order_give_identical_bytes():
    rows = sweep("forward", FORWARD) + sweep("backward", [i * 6.3 for i in FORWARD[:3]] + [1.0])
    shuffled = [rows[k] for k in (5, 2, 7, 0, 3, 6, 1, 4)]
    one, two = pair_of(inputs(current_table(rows)), [0.1, 0.25]), pair_of(inputs(current_table(shuffled)), [0.1, 0.25])
    for name in ("resistance", "switching_level", "on_current", "off_current_path", "closing_voltage"):
        assert np.array_equal(getattr(one.down, name), getattr(two.down, name)), name


def test_nothing_is_extrapolated():
    pair = pair_of(inputs(), [0.05, 0.3, 0.3 * (1 + 1e-12), 0.35], ROOM)
    assert pair.down.outside == {
        "beyond the measured table (ends at 0.3 V)": pytest.approx(np.array([False, False, False, True]))
    }
    assert np.isnan(pair.down.resistance).tolist() == [False, False, False, True]
    warm = pair_of(inputs(), 0.3, [ROOM, 358.15])
    assert warm.down.outside["beyond the measured table (measured at 25 degC only)"].tolist() == [False, True]
    assert np.isnan(warm.down.on_current).tolist() == [False, True]


def test_a_supply_above_the_measured_path_voltage_is_outside():
    table = current_table(sweep("forward", FORWARD, path=0.05))
    pair = pair_of(inputs(table), [0.05, 0.1])
    assert pair.down.outside["beyond the measured table (ends at 0.05 V)"].tolist() == [False, True]


def test_charge_table_ends_before_the_current_table():
    pair = pair_of(inputs(charge=charge_table([0.0, 0.2], [1e-9, 1.2e-9])), [0.2, 0.3])
    assert pair.down.outside["beyond the measured charge (ends at 0.2 V)"].tolist() == [False, True]
    assert np.isnan(pair.down.input_charge).tolist() == [False, True]
    cold = pair_of(inputs(charge=charge_table([0.0, 0.3], [1e-9, 1e-9], 300.0)))
    assert list(cold.down.outside) == ["beyond the measured charge (measured at 26.85 degC only)"]


SHIFTED = 10.0 ** (0.040 / 0.050)  # second sweep shifted by 40 mV at 50 mV/decade


def test_pessimistic_branch_takes_the_worse_of_both_ends():
    assert pytest.approx(6.31, abs=0.005) == SHIFTED
    rows = sweep("forward", FORWARD) + sweep("backward", [i * SHIFTED for i in FORWARD])
    worst = pair_of(inputs(current_table(rows)))
    forward = pair_of(inputs(current_table(rows), options={"branch": "forward"}))
    backward = pair_of(inputs(current_table(rows), options={"branch": "backward"}))
    assert worst.down.on_current == pytest.approx(float(forward.down.on_current), rel=1e-12)
    assert worst.down.off_current_path == pytest.approx(SHIFTED * float(forward.down.off_current_path), rel=1e-12)
    assert backward.down.on_current == pytest.approx(SHIFTED * float(forward.down.on_current), rel=1e-12)
    for pair in (worst, forward, backward):
        check_pair(pair)
        width = pair.down.closing_voltage - pair.down.opening_voltage
        assert width == pytest.approx(0.040, rel=1e-9)


def test_one_sweep_has_no_hysteresis_and_says_so():
    pair = pair_of(inputs())
    assert pair.down.closing_voltage == pair.down.opening_voltage
    # half of the on-current, 50 mV/decade below 0.3 V
    assert pair.down.closing_voltage == pytest.approx(0.3 - 0.050 * math.log10(2.0), rel=1e-9)
    assert any("hysteresis is unknown" in f.what for f in MODEL.check(inputs()) if f.level == "note")


def test_drain_dependence_without_and_with_a_path_column():
    pair = pair_of(inputs())

    def factor(path: float) -> float:
        return 1.0 - math.exp(-path / 0.060)

    assert at(pair, 0.2, 0.1) == pytest.approx(1e-8 * factor(0.1) / factor(0.3), rel=1e-12)
    bare = current_table(
        [row[:2] + row[3:] for row in sweep("forward", FORWARD)], ("sweep", "control_voltage", "temperature", "current")
    )
    assert pair_of(inputs(bare)).down.resistance == pytest.approx(300e3, rel=1e-12)
    ohmic = sweep("forward", FORWARD, path=0.1) + sweep("forward", [3.0 * i for i in FORWARD], path=0.3)
    several = pair_of(inputs(current_table(ohmic), drop=("saturation_voltage",)), 0.3)
    assert several.down.resistance_kind == "effective"
    assert at(several, 0.2, 0.3) == pytest.approx(3e-8, rel=1e-12)
    for path in (0.0, 0.03, 0.1, 0.2, 0.3):  # an ohmic table stays ohmic, also below its first path voltage
        assert at(several, 0.2, path) == pytest.approx(1e-7 * path, rel=1e-12)
    effective = 0.5 * (3e-6 * 0.5 + at(several, 0.15, 0.3))
    assert several.down.resistance == pytest.approx(0.3 / (2.0 * math.log(2.0) * effective), rel=1e-12)
    assert several.down.stack_off == pytest.approx([1.0, 1 / 2, 1 / 3, 1 / 4], rel=1e-12)
    check_pair(several)


def test_temperatures_are_straight_in_inverse_temperature():
    energy = 0.3 * 1.602176634e-19 / 1.380649e-23
    rows = []
    for kelvin in (273.15, 323.15, 398.15):
        scale = math.exp(-energy * (1.0 / kelvin - 1.0 / ROOM))
        rows += sweep("forward", [i * scale for i in FORWARD], temperature=kelvin)
    wanted = np.array([273.15, 300.0, 358.15, 398.15])
    pair = pair_of(inputs(current_table(rows)), 0.3, wanted)
    expected = 1e-6 * np.exp(-energy * (1.0 / wanted - 1.0 / ROOM))
    assert pair.down.on_current == pytest.approx(expected, rel=1e-9)
    assert pair.down.outside == {}
    beyond = pair_of(inputs(current_table(rows)), 0.3, [272.0, 399.0])
    assert beyond.down.outside["beyond the measured table (measured at 0 to 125 degC)"].all()


def test_rows_at_the_floor_are_marked_upper_bounds():
    table = current_table(sweep("forward", [-3e-8, 1e-4, 1e-2, 1.0]), floor=1e-7)
    given_inputs = inputs(table)
    assert refused(given_inputs) == []
    assert any("upper bounds" in f.what for f in MODEL.check(given_inputs))
    pair = pair_of(given_inputs)
    assert pair.down.off_current_path == pytest.approx(1e-13, rel=1e-12)
    mark, unit = pair.down.intermediates["off-current is an upper bound"]
    assert (mark, unit) == (1.0, "1")
    clean = pair_of(inputs(current_table(sweep("forward", FORWARD), floor=1e-7)))
    assert clean.down.intermediates["off-current is an upper bound"][0] == 0.0


def test_drain_share_counts_at_input_and_output_and_constant_capacitance_is_accepted():
    coupled = pair_of(inputs(drain_capacitance_share=0.5)).down
    assert coupled.input_charge == pytest.approx(0.3 * 1.25e-15, rel=1e-12)
    assert coupled.input_capacitance_delay == pytest.approx(1.5e-15, rel=1e-12)
    assert coupled.terminal_capacitance == pytest.approx(0.1e-15 + 0.75e-15, rel=1e-12)
    assert coupled.terminal_capacitance_delay == pytest.approx(0.1e-15 + 1.0e-15, rel=1e-12)
    assert any("favours this switch" in f.what for f in MODEL.check(inputs()) if f.level == "warn")
    absolute = inputs(drop=("gate_capacitance_total",), input_capacitance=2e-15)
    assert pair_of(absolute).down.input_charge == pytest.approx(0.6e-15, rel=1e-12)


def test_a_table_for_the_unit_switch_needs_no_width():
    table = current_table(sweep("forward", FORWARD))
    columns = {("path_current" if k == "path_current_per_width" else k): v for k, v in table.columns.items()}
    absolute = MeasuredTable("current", columns, table.labels, "path_current", "control_voltage", "log", "monotone")
    drop = ("unit_width", "terminal_capacitance_per_width", "gate_capacitance_total")
    given_inputs = inputs(absolute, drop=drop, input_capacitance=1e-15, terminal_capacitance=1e-16)
    assert refused(given_inputs) == []
    assert pair_of(given_inputs).down.on_current == pytest.approx(1.0, rel=1e-12)
    assert refused(inputs(absolute, drop=drop[1:], input_capacitance=1e-15, terminal_capacitance=1e-16)) == [
        "value.unit_width: has no effect: nothing is stated per width"
    ]


def test_interpolant_passes_through_its_points_exactly_enough():
    volts, currents = [0.0, 0.07, 0.1, 0.22, 0.3], [3e-7, 2e-6, 4e-5, 0.3, 1.1]
    pair = pair_of(inputs(current_table(sweep("forward", currents, volts))))
    for v, i in zip(volts, currents, strict=True):
        assert at(pair, v, 0.3) == pytest.approx(i * 1e-6, rel=1e-13)


def test_records_can_be_pickled():
    pair = pickle.loads(pickle.dumps(pair_of(inputs())))
    assert at(pair, 0.15, 0.3) == pytest.approx(1e-9, rel=1e-12)


REPEAT = [*sweep("forward", FORWARD), ("forward", 0.1, 0.3, ROOM, 2e-4)]
TWO_PATHS = sweep("forward", FORWARD, path=0.1) + sweep("forward", FORWARD, path=0.3)


@pytest.mark.parametrize(
    ("given_inputs", "message"),
    [
        (inputs(current_table(REPEAT)), "table.current: has two different currents at the same control voltage"),
        (
            inputs(current_table(sweep("forward", [-1e-6, 1e-4, 1e-2, 1.0]))),
            "table.current: has currents at or below 0",
        ),
        (
            inputs(current_table(sweep("forward", FORWARD, [0.05, 0.1, 0.2, 0.3]))),
            "table.current: does not reach zero control voltage",
        ),
        (inputs(current_table(sweep("forward", [1e-6], [0.0]))), "table.current: has fewer than 2 points on a curve"),
        (inputs(current_table(sweep("forward", FORWARD, path=0.0))), "table.current: has path voltages at or below 0"),
        (inputs(current_table(sweep("up", FORWARD))), "table.current: has an unknown sweep"),
        (inputs(options={"branch": "backward"}), "option.branch: names a sweep that the table does not have"),
        (
            inputs(drop=("saturation_voltage",)),
            "value.saturation_voltage: is missing: the table has one path voltage only",
        ),
        (
            inputs(current_table(TWO_PATHS)),
            "value.saturation_voltage: has no effect: the table has several path voltages",
        ),
        (inputs(drop=("unit_width",)), "value.unit_width: is missing: something is stated per width"),
        (
            inputs(drop=("terminal_capacitance_per_width",)),
            "value.terminal_capacitance_per_width: needs exactly one statement",
        ),
        (
            inputs(drop=("gate_capacitance_total",)),
            "table.charge: needs exactly one statement of the input capacitance",
        ),
        (inputs(input_capacitance=1e-15), "table.charge: needs exactly one statement of the input capacitance"),
        (inputs(charge=charge_table([0.1, 0.3], [1e-9, 1e-9])), "table.charge: does not reach zero control voltage"),
        (inputs(charge=charge_table([0.0, 0.3], [1e-9, 0.0])), "table.charge: has capacitances at or below 0"),
        (
            inputs(
                current_table(sweep("forward", FORWARD, path=0.1) + sweep("backward", FORWARD, path=0.3)),
                drop=("saturation_voltage",),
            ),
            "table.current: has different temperatures or path voltages in its sweeps",
        ),
    ],
)
def test_refusals(given_inputs, message):
    assert refused(given_inputs) == [message]


def test_warnings_are_not_refusals():
    flat = inputs(current_table(sweep("forward", [1e-6, 1.0, 1.0, 1.0])))
    assert refused(flat) == []
    assert any("flat top" in f.what for f in MODEL.check(flat) if f.level == "warn")
    dip = inputs(current_table(sweep("forward", [1e-6, 1e-7, 1e-2, 1.0])))
    assert any("falls somewhere" in f.what for f in MODEL.check(dip) if f.level == "warn")
