"""Path currents: every sub-circuit in ngspice against the current law of the record it stands for."""

from __future__ import annotations

import numpy as np
import pytest

from benchmark.devices import model
from benchmark.devices.model import ModelInputs
from benchmark.evaluate.deck import switch_texts
from benchmark.physics import virtual_source as vs
from benchmark.record.load import load_technology
from tests.ngspice.benches import bench, current_grid
from tests.unit.test_device_given import BASE as GIVEN
from tests.unit.test_stress_gated import ACTIVATED, BASE, HAND, LOG_SLOPE

pytestmark = pytest.mark.spice

KNOBS = {"threshold_shift": np.zeros((1, 1, 1))}


def _record_current(switch, controls, paths):
    volts, across = np.meshgrid(controls, paths, indexing="ij")
    cube = (1, 1, 1, -1)
    return np.asarray(switch.current(volts.reshape(cube), across.reshape(cube))).reshape(volts.shape)


def _worst(found, wanted, noise=0.0):
    """Largest relative difference beyond an absolute noise."""
    return float((np.maximum(np.abs(found - wanted) - noise, 0.0) / np.abs(wanted)).max())


def _rounding(technology, node, supply):
    """Current that the last bit of a node voltage makes in the access resistance [A], twice."""
    values = load_technology(technology).at(node)
    resistance = values["access_resistance"].si[0] / values["unit_width"].si[0]
    return 2.0 * np.finfo(float).eps * supply / resistance


@pytest.mark.parametrize("edge", ["down", "up"])
@pytest.mark.parametrize(
    ("technology", "node", "supply", "kelvin"),
    [
        ("open-7nm-regular", "n7", 0.7, None),
        ("open-7nm-regular", "n7", 0.7, 398.15),
        ("silicon-45nm-high-performance", "n45", 1.0, None),
    ],
)
def test_virtual_source_over_gate_drain_and_source(technology, node, supply, kelvin, edge):
    """To 1e-6 on a grid of gate x drain x source voltages, down to the rounding of the node voltages (1e-19 A)."""
    noise = _rounding(technology, node, supply)
    one = bench(technology, node, supply, kelvin=kelvin)
    switch, text = getattr(one.pair, edge), one.texts.of(edge).driven
    gates, paths = np.linspace(0.0, supply, 11), np.linspace(0.02 * supply, supply, 15)
    for lift in (0.0, 0.07 * supply, 0.4 * supply):
        found = current_grid(text, gates, paths, up=edge == "up", lift=lift)
        assert _worst(found, _record_current(switch, gates - lift, paths), noise) < 1e-6


def test_virtual_source_carries_nothing_at_zero_and_is_odd_in_its_ends():
    one = bench("silicon-45nm-high-performance", "n45", 1.0)
    noise = _rounding("silicon-45nm-high-performance", "n45", 1.0)
    text = one.texts.of("down").driven
    gates, paths = np.linspace(0.0, 1.0, 6), np.linspace(-0.8, 0.8, 17)
    found = current_grid(text, gates, paths, lift=0.8)
    assert np.abs(found[:, 8]).max() <= noise
    # with source and drain exchanged the control counts from the lower end
    for column in range(8):
        end = 0.8 + paths[column]
        wanted = _record_current(one.pair.down, gates - end, -paths[column : column + 1])
        assert _worst(-found[:, column : column + 1], wanted, noise) < 1e-6


def test_virtual_source_agrees_with_the_physics_function_itself():
    """A transistor of our own, one access resistance left out, against ``drain_current``."""
    t = vs.Transistor(
        width=1e-6, length=25e-9, inversion_capacitance=0.024, source_resistance=90e-6, drain_resistance=0.0,
        velocity=1.1e5, mobility=0.02, threshold=0.4, slope_factor=1.2, barrier_lowering=0.08, fermi_width=3.5,
        saturation_exponent=1.8, thermal_voltage=vs.thermal_voltage(330.0),
    )  # fmt: skip
    from benchmark.devices.netlist.virtual_source import transistor_text

    gates, paths = np.linspace(0.0, 1.0, 21), np.linspace(0.025, 1.0, 40)
    found = current_grid(transistor_text(t, "down", 0.0, 0.0).driven, gates, paths)
    assert _worst(found, vs.drain_current(t, gates[:, None], paths[None, :])) < 1e-6


@pytest.mark.parametrize("edge", ["down", "up"])
@pytest.mark.parametrize(
    ("technology", "node", "supply", "kelvin"),
    [
        ("demo-stress-gated", "g1", 0.6, None),
        ("demo-stress-gated", "g3", 0.45, 263.15),
        ("demo-steep-swing", "g1", 0.3, None),
        ("demo-given", "g1", 0.5, None),
        ("hand-stress-gated", "hand", 0.25, None),
    ],
)
def test_sets_of_the_other_models(technology, node, supply, kelvin, edge):
    one = bench(technology, node, supply, kelvin=kelvin)
    gates, paths = np.linspace(0.0, supply, 25), np.linspace(0.05 * supply, supply, 10)
    found = current_grid(one.texts.of(edge).driven, gates, paths, up=edge == "up")
    assert _worst(found, _record_current(getattr(one.pair, edge), gates, paths)) < 1e-6


@pytest.mark.parametrize(
    ("name", "values", "options"),
    [
        ("stress-gated", BASE | ACTIVATED, {"mechanics": "force-balance", "pressure_law": "activated"}),
        ("stress-gated", BASE | LOG_SLOPE, {"mechanics": "force-balance", "pressure_law": "exponential"}),
        # a gap of 40 pm closes on the way: no pressure below
        (
            "stress-gated",
            BASE | LOG_SLOPE | {"built_in_interference": -40e-12},
            {"mechanics": "force-balance", "pressure_law": "log-slope"},
        ),
        ("stress-gated", HAND, {"mechanics": "stated-pressure", "pressure_law": "exponential"}),
        ("given", GIVEN, {"off_state": "none"}),
        ("given", GIVEN | {"open_state_current": 1e-12}, {"off_state": "current"}),
        ("given", GIVEN | {"switching_level": 0.98}, {}),
    ],
)
def test_laws_and_options_that_no_shipped_set_uses(name, values, options):
    device = model(name)
    chosen = {item.name: item.default for item in device.options} | options
    inputs = ModelInputs({key: np.full((1, 1, 1), value) for key, value in values.items()}, chosen, {})
    supply = 0.5
    volts, kelvin = np.full((1, 1, 1), supply), np.full((1, 1, 1), 320.0)
    prepared = device.prepare(inputs)
    pair = device.switch(prepared, volts, kelvin, KNOBS)
    text = switch_texts(device, prepared, pair, KNOBS).down.driven
    gates, paths = np.linspace(0.0, supply, 26), np.linspace(0.05, supply, 10)
    found, wanted = current_grid(text, gates, paths), _record_current(pair.down, gates, paths)
    open_ = wanted == 0.0
    assert np.abs(found[open_]).max(initial=0.0) == 0.0
    assert _worst(found[~open_], wanted[~open_]) < 1e-6


def test_a_law_without_closed_form_is_a_table_as_good_as_it_says():
    """``demo-table``: 161 x 25 points; the note in the deck says 0.08 %, and no more than that is seen."""
    one = bench("demo-table", "g1", 0.3)
    (note,) = one.texts.notes
    promised = float(note.split("good to ")[1].split(" %")[0]) / 100.0
    assert promised < 1e-3
    gates, paths = np.linspace(0.0, 0.3, 47), np.linspace(0.011, 0.3, 18)
    for edge in ("down", "up"):
        found = current_grid(one.texts.of(edge).driven, gates, paths, up=edge == "up")
        assert _worst(found, _record_current(getattr(one.pair, edge), gates, paths)) < 1.1 * promised
