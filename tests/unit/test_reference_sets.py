"""The shipped reference transistors: they load, meet their targets, and predict what was never fitted."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

from benchmark.devices import MODEL_NAMES, model
from benchmark.devices.model import ModelInputs
from benchmark.devices.record import SwitchPair
from benchmark.errors import Problem
from benchmark.evaluate.anchors import fan_out_4
from benchmark.evaluate.batch import Batch, resolve
from benchmark.sets.library import Library, shipped_nodes
from benchmark.sets.parameters import ParameterSet
from benchmark.sets.problems import Collector
from tests.switch_contract import check_pair

MODEL = model("virtual-source")
NODES = {
    **{f"open-7nm-{flavour}": ("n7",) for flavour in ("super-low", "low", "regular", "low-leakage")},
    "silicon-45nm-high-performance": ("n45",),
    "silicon-45nm-low-power": ("n45",),
    "silicon-32nm-high-performance": ("n32",),
    "silicon-32nm-low-power": ("n32",),
    "silicon-22nm-tri-gate": ("n22",),
    "silicon-14nm-finfet": ("n14",),
    "roadmap-2022-high-performance": ("n3", "n2", "n1p5", "n1", "n0p7", "n0p5"),
    "roadmap-2022-high-density": ("n3", "n2", "n1p5", "n1", "n0p7", "n0p5"),
}
CASES = [(name, node) for name, nodes in NODES.items() for node in nodes]
WIRES = ("wires-45nm", "wires-32nm", "wires-22nm", "wires-14nm", "wires-7nm", "wires-roadmap-2022")


def _load(name: str, folder: str = "technologies") -> ParameterSet:
    collector = Collector()
    library = Library(model, MODEL_NAMES, (shipped_nodes(),), collector)
    found = library.load(name, folder, Problem("test", 0, name, ""))
    assert not collector.problems
    assert found is not None
    return found


def _inputs(technology: ParameterSet, node: str) -> ModelInputs:
    return ModelInputs(resolve(technology.id, technology.at(node), Batch.best_estimate()), technology.options, {})


def _pair(technology: ParameterSet, node: str, supply: np.ndarray, kelvin: float = 298.15) -> SwitchPair:
    prepared = MODEL.prepare(_inputs(technology, node))
    knobs = {"threshold_shift": np.zeros((1, 1, 1))}
    return MODEL.switch(prepared, supply.reshape(1, 1, -1), np.full((1, 1, 1), kelvin), knobs)


def _series() -> dict[str, dict[float, dict[str, str]]]:
    path = Path(__file__).parent.parent / "data" / "fo4-open-7nm.csv"
    found: dict[str, dict[float, dict[str, str]]] = {}
    with path.open(newline="", encoding="utf-8") as stream:
        for row in csv.DictReader(stream):
            found.setdefault(row["flavour"], {})[float(row["supply_V"])] = row
    return found


SERIES = _series()
FULL_SERIES = ("regular", "super-low", "low")


@pytest.mark.parametrize("name", NODES)
def test_set_loads_with_its_nodes(name: str):
    assert _load(name).nodes == NODES[name]


@pytest.mark.parametrize("name", WIRES)
def test_wires_load(name: str):
    wires = _load(name, "wires")
    for node in wires.nodes:
        assert wires.at(node)["layout_capacitance_per_pin"].si[0] == 0.0
        assert wires.at(node)["layout_capacitance_per_pin"].spread is not None


@pytest.mark.parametrize(("name", "node"), CASES)
def test_targets_are_met_and_nothing_is_refused_or_warned_about(name: str, node: str):
    technology = _load(name)
    assert {item.level for item in MODEL.check(_inputs(technology, node))} <= {"note"}
    values = technology.at(node)
    width = values["unit_width"].si[0]
    pair = _pair(technology, node, values["declared_supply"].si)
    assert pair.down.on_current.item() / width == pytest.approx(values["on_current"].si[0], rel=1e-9)
    assert pair.down.off_current_path.item() / width == pytest.approx(values["off_current"].si[0], rel=1e-9)
    assert pair.up.on_current.item() / width == pytest.approx(values["on_current_p"].si[0], rel=1e-9)
    assert pair.up.off_current_path.item() / width == pytest.approx(values["off_current_p"].si[0], rel=1e-9)
    if "effective_current_p" in values:
        effective = pair.up.intermediates["effective current"][0].item() / width
        assert effective == pytest.approx(values["effective_current_p"].si[0], rel=1e-9)


@pytest.mark.parametrize(("name", "node"), CASES)
def test_record_keeps_the_contract_over_the_valid_range(name: str, node: str):
    technology = _load(name)
    low, high = technology.valid["supply"]
    coldest, hottest = technology.valid["temperature"]
    for kelvin in (coldest, 298.15, hottest):
        check_pair(_pair(technology, node, np.linspace(low, high, 9), kelvin))


@pytest.mark.parametrize(("name", "node"), CASES)
def test_solved_parameters_are_plausible(name: str, node: str):
    pair = _pair(_load(name), node, np.array([0.5]))
    for switch in (pair.down, pair.up):
        # silicon channels: 0.5e7 to 2e7 cm/s, 15 to 36 fF/um^2
        assert 0.5e5 < switch.intermediates["injection velocity"][0].item() < 2.0e5
        assert 0.015 < switch.intermediates["inversion capacitance"][0].item() < 0.036


@pytest.mark.parametrize(("name", "node"), CASES)
def test_almost_every_draw_has_a_solution(name: str, node: str):
    technology = _load(name)
    rng = np.random.default_rng(11)
    values = {}
    for key, value in technology.at(node).items():
        spread = value.spread
        low, high = (value.si[0], value.si[0]) if spread is None else (spread.low[0], spread.high[0])
        values[key] = rng.uniform(low, high, (500, 1, 1))
    prepared = MODEL.prepare(ModelInputs(values, technology.options, {}))
    for _, solved in prepared["transistors"].values():
        assert np.mean(solved) > 0.98


@pytest.mark.parametrize("flavour", FULL_SERIES)
def test_fan_out_4_delay_agrees_with_circuit_simulation_of_the_cards(flavour: str):
    technology = _load(f"open-7nm-{flavour}")
    for supply, row in SERIES[flavour].items():
        if 0.3 <= supply <= 0.7:
            delay, _ = fan_out_4(_pair(technology, "n7", np.array([supply])), "chain")
            assert delay * 1e12 == pytest.approx(float(row["delay_ps"]), rel=0.10), supply


def test_fan_out_4_delay_of_the_low_leakage_flavour():
    row = SERIES["low-leakage"][0.7]
    delay, _ = fan_out_4(_pair(_load("open-7nm-low-leakage"), "n7", np.array([0.7])), "chain")
    assert delay * 1e12 == pytest.approx(float(row["delay_ps"]), rel=0.10)


@pytest.mark.parametrize("flavour", FULL_SERIES)
def test_fan_out_4_energy_agrees_with_circuit_simulation_of_the_cards(flavour: str):
    technology = _load(f"open-7nm-{flavour}")
    for supply, row in SERIES[flavour].items():
        if 0.3 <= supply <= 0.7:
            _, energy = fan_out_4(_pair(technology, "n7", np.array([supply])), "chain")
            expected = float(row["energy_per_cycle_without_leakage_fJ"])
            assert energy * 1e15 == pytest.approx(expected, rel=0.10), supply


@pytest.mark.parametrize("flavour", FULL_SERIES)
def test_effective_currents_explain_the_delays(flavour: str):
    """Second measurement: current apart from capacitance. n is predicted at every supply, p below 0.7 V.

    At 0.7 V within 4 %; towards 0.3 V n is low by up to 17 % and p between -10 and +9 %, which is what the 3 to 6 %
    too long delays are made of.
    """
    technology = _load(f"open-7nm-{flavour}")
    for supply, row in SERIES[flavour].items():
        if not 0.3 <= supply <= 0.7:
            continue
        pair = _pair(technology, "n7", np.array([supply]))
        for switch, key in ((pair.down, "effective_current_n_uA"), (pair.up, "effective_current_p_uA")):
            ratio = switch.intermediates["effective current"][0].item() * 1e6 / float(row[key])
            low, high = (0.96, 1.04) if supply == 0.7 else (0.83, 1.09)
            assert low < ratio < high, (supply, key)


def test_layout_parasitic_carries_the_schematic_delay_to_the_extracted_library():
    """The high end of the layout capacitance of the 7 nm wires: 18.3 ps in the kit's extracted library, 0.7 V."""
    from benchmark.circuits.cells import cell
    from benchmark.circuits.circuit import Circuit, Load, Net, Wires
    from benchmark.circuits.operation import estimate

    pin = _load("wires-7nm", "wires").at("n7")["layout_capacitance_per_pin"].spread.high[0]
    inverter = cell("inverter")
    net = Net("stage", inverter, loads=(Load(inverter, "a", 4.0),), rising_per_operation=1.0, on_critical_path=1.0)
    circuit = Circuit("fan-out-4", "fan-out 4", "one cycle", (net,))
    metrics = estimate(circuit, _pair(_load("open-7nm-regular"), "n7", np.array([0.7])), Wires(0.0, 0.0, pin), "chain")
    assert metrics.path_delay.item() * 1e12 == pytest.approx(18.3, rel=0.05)


def test_more_leakage_buys_speed_across_the_flavours():
    delays, leaks = [], []
    for flavour in ("super-low", "low", "regular", "low-leakage"):
        pair = _pair(_load(f"open-7nm-{flavour}"), "n7", np.array([0.7]))
        delays.append(fan_out_4(pair, "chain")[0])
        leaks.append(pair.down.off_current_path.item())
    assert delays == sorted(delays)
    assert leaks == sorted(leaks, reverse=True)
