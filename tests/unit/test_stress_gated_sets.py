"""The shipped stress-gated sets load, are consistent, and give the numbers they promise."""

from __future__ import annotations

import itertools
import math

import numpy as np
import pytest

from benchmark.circuits.circuit import Wires
from benchmark.circuits.library import build
from benchmark.circuits.operation import estimate
from benchmark.devices import MODEL_NAMES, model
from benchmark.devices.model import ModelInputs
from benchmark.devices.record import Switch, SwitchPair
from benchmark.errors import Problem
from benchmark.evaluate.links import link_rows
from benchmark.sets.library import Library, shipped_nodes
from benchmark.sets.parameters import ParameterSet
from benchmark.sets.problems import Collector
from benchmark.sets.sources import Source

MODEL = model("stress-gated")
INVENTED = Source("invented", "invented", ("project",), 2026, "Invented", "", "", "original", "", "")


def _load(name: str) -> tuple[ParameterSet, Collector]:
    collector = Collector()
    library = Library(model, MODEL_NAMES, (shipped_nodes(),), collector)
    library.sources.setdefault("invented", INVENTED)
    loaded = library.load(name, "technologies", Problem("test", 0, "technology", "asked"))
    assert collector.problems == []
    assert loaded is not None
    return loaded, collector


def _inputs(loaded: ParameterSet, node: str, **changed: float) -> ModelInputs:
    values = {name: value.si.copy() for name, value in loaded.at(node).items()}
    values |= {name: np.array([value]) for name, value in changed.items()}
    return ModelInputs(values, loaded.options, {})


def _pair(loaded: ParameterSet, node: str, supply: float, kelvin: float = 298.15, **changed: float) -> SwitchPair:
    prepared = MODEL.prepare(_inputs(loaded, node, **changed))
    knobs = {"threshold_shift": np.zeros(1)}
    return MODEL.switch(prepared, np.array([supply]), np.array([kelvin]), knobs)


def _switch(loaded: ParameterSet, node: str, supply: float, kelvin: float = 298.15, **changed: float) -> Switch:
    return _pair(loaded, node, supply, kelvin, **changed).down


@pytest.mark.parametrize("name", ["demo-stress-gated", "hand-stress-gated"])
def test_sets_load_without_warnings_and_pass_the_model_check(name: str):
    loaded, collector = _load(name)
    assert collector.warnings == []
    for node in loaded.nodes:
        assert MODEL.check(_inputs(loaded, node)) == []


@pytest.mark.parametrize("node", ["g1", "g2", "g3"])
@pytest.mark.parametrize("kelvin", [298.15, 358.15])
def test_demo_is_coherent_at_its_declared_supply(node: str, kelvin: float):
    loaded, _ = _load("demo-stress-gated")
    values = {name: float(value.si[0]) for name, value in loaded.at(node).items()}
    switch = _switch(loaded, node, values["declared_supply"], kelvin)
    assert {row.state for row in link_rows(loaded)} == {"fits"}
    assert all(float(np.min(item.margin)) >= 1.0 for item in switch.limits)
    assert not any(mask.any() for mask in switch.outside.values())
    assert 0.0 < float(switch.switching_level[0]) < 1.0
    assert float((switch.on_current / switch.off_current_path)[0]) > 1e3


def test_demo_scales_as_its_header_says():
    loaded, _ = _load("demo-stress-gated")
    switches = [_switch(loaded, node, float(loaded.at(node)["declared_supply"].si[0])) for node in ("g1", "g2", "g3")]
    for name, sign in (("input_charge", -1), ("closing_time", -1), ("resistance", 1), ("area", -1)):
        numbers = [float(np.ravel(getattr(switch, name))[0]) for switch in switches]
        assert all(sign * (b - a) > 0.0 for a, b in itertools.pairwise(numbers)), (name, numbers)


@pytest.mark.parametrize(
    ("picometre_per_volt", "supply", "gpa", "delay", "aj", "field_allowed"),
    [
        (300.0, 0.25, 2.0, 21.93, 6.25, True),
        (150.0, 0.25, 1.0, 708.1, 6.25, True),
        (150.0, 0.50, 2.0, 21.93, 25.0, False),
        (150.0, 0.40, 1.6, 58.73, 16.0, True),
    ],
)
def test_hand_set_gives_the_pocket_calculator_numbers(
    picometre_per_volt: float, supply: float, gpa: float, delay: float, aj: float, field_allowed: bool
):
    """Step-driven inverter with one like load, no wire, no self-load: transit + ln 2 R C, energy C V^2."""
    loaded, _ = _load("hand-stress-gated")
    switch = _switch(loaded, "hand", supply, actuator_coefficient=picometre_per_volt * 1e-12)
    load = 2.0 * float(switch.input_capacitance_delay[0])
    obtained = float(switch.closing_time[0]) + math.log(2.0) * float(switch.resistance[0]) * load
    assert float(switch.intermediates["pressure"][0][0]) / 1e9 == pytest.approx(gpa, rel=1e-12)
    assert obtained * 1e12 == pytest.approx(delay, abs=0.005 if delay < 100.0 else 0.05)
    assert 2.0 * float(switch.input_charge[0]) * supply * 1e18 == pytest.approx(aj, rel=1e-12)
    field = next(item for item in switch.limits if item.name == "actuator field")
    assert bool(field.margin[0] >= 1.0) is field_allowed


@pytest.mark.parametrize(
    ("picometre_per_volt", "supply", "delay", "aj", "leakage_over_dynamic"),
    [
        (300.0, 0.25, 21.93, 6.25, 0.0877),
        (150.0, 0.25, 708.1, 6.25, 2.833),
        (150.0, 0.50, 21.93, 25.0, 0.0877),
        (150.0, 0.40, 58.73, 16.0, 0.235),
    ],
)
def test_hand_set_through_the_circuit_estimate(
    picometre_per_volt: float, supply: float, delay: float, aj: float, leakage_over_dynamic: float
):
    """Depth 20, activity 0.05, self-timed, step rule: N t/(a R_0 C) for the leakage over the dynamic energy."""
    loaded, _ = _load("hand-stress-gated")
    pair = _pair(loaded, "hand", supply, actuator_coefficient=picometre_per_volt * 1e-12)
    circuit = build("inverter-chain", {"fan_out": 1.0, "activity": 0.05, "logic_depth": 20.0})
    metrics = estimate(circuit, pair, Wires(0.0, 0.0), "step", short_circuit=False)
    assert float(metrics.path_delay[0]) / 20.0 * 1e12 == pytest.approx(delay, abs=0.005 if delay < 100.0 else 0.05)
    assert float(metrics.dynamic_energy[0]) * 1e18 == pytest.approx(aj, rel=1e-12)
    share = float((metrics.leakage_power * metrics.path_delay / metrics.dynamic_energy)[0])
    assert share == pytest.approx(leakage_over_dynamic, abs=5e-5 if leakage_over_dynamic < 0.1 else 5e-4)
