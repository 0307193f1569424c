"""The shipped sets that state a switch directly, by a blend, by curves or by stage results; and the hand scenarios."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from benchmark.circuits.cells import cell
from benchmark.circuits.circuit import Circuit, Net, Wires
from benchmark.circuits.functional import functional
from benchmark.circuits.library import build
from benchmark.circuits.operation import estimate
from benchmark.devices import MODEL_NAMES, model
from benchmark.devices.model import ModelInputs
from benchmark.devices.record import SwitchPair
from benchmark.errors import Problem
from benchmark.sets.library import Library, shipped_nodes
from benchmark.sets.parameters import ParameterSet
from benchmark.sets.problems import Collector
from tests.switch_contract import check_pair

LN2 = math.log(2.0)
NAMES = (
    "demo-given",
    "demo-steep-swing",
    "demo-table",
    "demo-stage-table",
    "hand-hub-fast",
    "hand-hub-low-leakage",
    "hand-hub-relay",
    "hand-line-reference",
    "hand-line-new",
)


def load(name: str) -> tuple[ParameterSet, Collector]:
    collector = Collector()
    library = Library(model, MODEL_NAMES, (shipped_nodes(),), collector)
    loaded = library.load(name, "technologies", Problem("test", 0, "technology", "asked"))
    assert collector.problems == []
    assert loaded is not None
    return loaded, collector


def inputs_of(loaded: ParameterSet, node: str) -> ModelInputs:
    values = {name: value.si.reshape(1, 1, 1) for name, value in loaded.at(node).items()}
    tables = {name: table.table for name, table in loaded.tables.items()}
    if loaded.rows:
        tables["rows"] = loaded.rows[node]
    return ModelInputs(values, loaded.options, tables)


def declared_pair(name: str, node: str | None = None, kelvin: float = 298.15) -> SwitchPair:
    loaded, _ = load(name)
    node = node or loaded.nodes[0]
    given = inputs_of(loaded, node)
    device = model(loaded.model)
    knobs = {"threshold_shift": np.zeros((1, 1, 1))}
    supply = given.values["declared_supply"]
    return device.switch(device.prepare(given), supply, np.full((1, 1, 1), kelvin), knobs)


@pytest.mark.parametrize("name", NAMES)
def test_sets_load_pass_their_check_and_keep_the_contract(name: str):
    loaded, collector = load(name)
    assert collector.warnings == []
    for node in loaded.nodes:
        assert [f for f in model(loaded.model).check(inputs_of(loaded, node)) if f.level != "note"] == []
        pair = declared_pair(name, node)
        assert pair.down.outside == {}
        check_pair(pair)


@pytest.mark.parametrize("name", NAMES)
def test_every_value_may_be_an_array_of_draws(name: str):
    """Three draws of every value, two temperatures, two supplies: shapes broadcast, and draws stay apart."""
    loaded, _ = load(name)
    device = model(loaded.model)
    given = inputs_of(loaded, loaded.nodes[0])
    draws = {k: np.broadcast_to(v, (3, 1, 1)).copy() for k, v in given.values.items()}
    supply = given.values["declared_supply"] * np.array([1.0, 0.95]).reshape(1, 1, 2)
    temperature = np.array([298.15, 358.15]).reshape(1, 2, 1)
    knobs = {"threshold_shift": np.zeros((1, 1, 1))}
    pair = device.switch(device.prepare(replace(given, values=draws)), supply, temperature, knobs)
    alone = device.switch(device.prepare(given), supply, temperature, knobs)
    control = np.linspace(0.0, 1.0, 5) * supply[..., None]
    got = pair.down.current(control, supply[..., None])
    assert np.broadcast_shapes(got.shape, (3, 2, 2, 5)) == (3, 2, 2, 5)
    one = np.broadcast_to(alone.down.current(control, supply[..., None]), got.shape)
    assert np.array_equal(got, one, equal_nan=True)
    for field in ("resistance", "stack_on", "stack_off", "input_charge", "terminal_capacitance"):
        value, single = getattr(pair.down, field), getattr(alone.down, field)
        np.broadcast_shapes(value.shape, (3, 2, 2, value.shape[-1]) if field.startswith("stack") else (3, 2, 2))
        assert np.array_equal(value, np.broadcast_to(single, value.shape), equal_nan=True), field
    check_pair(pair)


@pytest.mark.parametrize("name", NAMES)
def test_sets_make_working_logic(name: str):
    found = functional(declared_pair(name), fan_in=1)
    assert (found.gain > 2.0).all()
    assert (found.noise_margin > 0.10).all()


CHAIN = {"fan_out": 1.0, "logic_depth": 20.0}
CYCLE = 10e-6


def hub(name: str, activity: float):
    """Energy per gate and cycle [fJ] by period accounting, and the path delay [s]; step rule."""
    circuit = build("inverter-chain", {**CHAIN, "activity": activity})
    found = estimate(circuit, declared_pair(name), Wires(0.0, 0.0), "step", short_circuit=False)
    energy = (found.dynamic_energy + found.leakage_power * CYCLE) / 20.0
    return float(energy.ravel()[0]) * 1e15, float(found.path_delay.ravel()[0])


@pytest.mark.parametrize("activity", [1e-4, 1e-3, 0.02, 0.3659])
def test_hub_scenario_is_exact(activity: float):
    assert hub("hand-hub-fast", activity)[0] == pytest.approx(0.36 * activity + 0.600, rel=1e-9)
    assert hub("hand-hub-low-leakage", activity)[0] == pytest.approx(0.49 * activity + 0.007, rel=1e-9)
    assert hub("hand-hub-relay", activity)[0] == pytest.approx(2.0 * activity, rel=1e-9)


def test_hub_scenario_advantages_and_break_even():
    relay, fast, low = (
        (lambda a, n=n: hub(n, a)[0]) for n in ("hand-hub-relay", "hand-hub-fast", "hand-hub-low-leakage")
    )
    assert fast(0.02) / relay(0.02) == pytest.approx(15.2, abs=0.05)
    assert low(0.02) / relay(0.02) == pytest.approx(0.42, abs=0.005)
    assert low(1e-3) / relay(1e-3) == pytest.approx(3.745, rel=1e-9)
    assert low(1e-4) / relay(1e-4) == pytest.approx(35.245, rel=1e-9)
    assert fast(0.600 / 1.64) == pytest.approx(relay(0.600 / 1.64), rel=1e-9)
    assert low(0.007 / 1.51) == pytest.approx(relay(0.007 / 1.51), rel=1e-9)
    delay = hub("hand-hub-relay", 0.02)[1]
    assert delay == pytest.approx(20 * (100e-9 + LN2 * 1e4 * 0.5e-15), rel=1e-9)
    assert delay < CYCLE


def word_line(name: str):
    """Delay [s] and energy per access [J] of the line at activity one half."""
    net = Net(
        "line",
        cell("inverter"),
        wire_length=500e-6,
        swing=1.8,
        rising_per_operation=0.5,
        on_critical_path=1.0,
    )
    circuit = Circuit("word-line", "word line", "one row access", (net,))
    found = estimate(circuit, declared_pair(name), Wires(20e6, 0.2e-9), "step", short_circuit=False)
    return float(found.path_delay.ravel()[0]), float(found.dynamic_energy.ravel()[0])


def test_word_line_scenario():
    wire = (0.1 + 0.4 * LN2) * 10e3 * 100e-15  # 0.377 r c L^2 in the factor of the step rule
    reference, energy = word_line("hand-line-reference")
    new, energy_new = word_line("hand-line-new")
    assert reference == pytest.approx(LN2 * 2e3 * 100e-15 + wire, rel=1e-9)
    assert new == pytest.approx(15e-12 + LN2 * 200.0 * 100e-15 + wire, rel=1e-9)
    assert reference * 1e12 == pytest.approx(515.6, abs=0.4)
    assert new * 1e12 == pytest.approx(405.9, abs=0.4)
    assert reference / new == pytest.approx(1.270, abs=0.0006)
    # the swing is fixed by the cell: 324 fJ per rising line on both sides
    assert energy / 0.5 * 1e15 == pytest.approx(324.0, rel=1e-9)
    assert energy_new == pytest.approx(energy, rel=1e-12)


def test_demo_table_has_the_hand_scenario_curves():
    pair = declared_pair("demo-table")
    assert float(pair.down.resistance.ravel()[0]) == pytest.approx(300e3, rel=1e-9)
    assert float(pair.down.off_current_path.ravel()[0]) == pytest.approx(6.3e-12, rel=1e-9)
    assert float(pair.down.input_charge.ravel()[0]) == pytest.approx((0.3 + 0.5 * 0.09) * 1e-15, rel=1e-9)
    warm = declared_pair("demo-table", kelvin=358.15)
    assert set(warm.down.outside) == {
        "beyond the measured table (measured at 25 degC only)",
        "beyond the measured charge (measured at 25 degC only)",
    }


def test_demo_stage_table_gives_back_its_rows_through_the_circuit():
    circuit = build("inverter-chain", {"fan_out": 4.0, "logic_depth": 1.0, "activity": 1.0})
    for kelvin, delay, leakage in ((298.15, 15.0e-12, 20e-12), (358.15, 14.6e-12, 250e-12)):
        found = estimate(
            circuit, declared_pair("demo-stage-table", kelvin=kelvin), Wires(0.0, 0.0), "step", short_circuit=False
        )
        assert float(found.path_delay.ravel()[0]) == pytest.approx(delay, rel=1e-9)
        assert float(found.dynamic_energy.ravel()[0]) == pytest.approx(0.75e-15, rel=1e-9)
        assert float(found.leakage_power.ravel()[0]) == pytest.approx(leakage, rel=1e-9)
        assert found.unable == {}


def test_a_hidden_stage_cannot_be_used_elsewhere():
    loaded, _ = load("demo-stage-table")
    given = inputs_of(loaded, "g1")
    columns = dict(given.tables["rows"].columns)
    for name in ("drive_resistance", "input_capacitance", "area"):
        columns[name] = np.full_like(columns[name], np.nan)
    table = type(given.tables["rows"])("rows", columns, {}, "delay", "supply", "log", "monotone")
    device = model("stage-table")
    prepared = device.prepare(ModelInputs(given.values, given.options, {"rows": table}))
    pair = device.switch(prepared, np.full((1, 1, 1), 0.5), np.full((1, 1, 1), 298.15), {})
    right = build("inverter-chain", {"fan_out": 4.0, "logic_depth": 1.0, "activity": 1.0})
    wrong = build("inverter-chain", {"fan_out": 3.0, "logic_depth": 1.0, "activity": 1.0})
    assert estimate(right, pair, Wires(0.0, 0.0), "step").unable == {}
    assert any("known only at one stage" in reason for reason in estimate(wrong, pair, Wires(0.0, 0.0), "step").unable)
