"""Circuits a user writes: numbers in SI, and cell names that the library of cells has."""

from __future__ import annotations

import itertools
from pathlib import Path

import pytest

from benchmark.circuits.cells import cell
from benchmark.errors import UsageError
from benchmark.record.load import open_library
from benchmark.sets.circuit_file import CircuitSpec, cell_inputs, read_circuit
from tests.refusals import CIRCUIT


def _read(folder: Path, text: str) -> CircuitSpec:
    path = folder / "word-line.toml"
    path.write_text(text, encoding="utf-8")
    library = open_library(folder)
    spec = read_circuit(path, library, library.collector)
    assert spec is not None, library.collector.problems
    return spec


def test_a_circuit_in_si(tmp_path: Path):
    spec = _read(tmp_path, CIRCUIT)
    (net,) = spec.nets
    assert (spec.id, spec.operation, spec.file) == ("word-line", "one row access", "word-line.toml")
    assert (net.name, net.driver, net.fixed_load) == ("line", "inverter", 1e-15)
    assert (net.wire_length, net.length_unit, net.layer) == (500e-6, "m", "upper")
    assert (net.swing, net.swing_reason) == (1.8, "set by the cell")
    assert [(load.cell, load.input, load.count) for load in net.loads] == [("nand2", "a", 2.0)]
    assert (net.rising_per_operation, net.busiest_per_operation, net.count, net.on_critical_path) == (
        0.5,
        0.5,
        1.0,
        1.0,
    )
    assert spec.layers["upper"]["resistance_per_length"].si.tolist() == [20e6]
    assert spec.layers["upper"]["capacitance_per_length"].si.tolist() == [0.2e-9]


def test_lengths_in_gate_pitches_have_no_unit_of_length(tmp_path: Path):
    (net,) = _read(tmp_path, CIRCUIT.replace('length_unit = "um"', 'length_unit = "gate-pitch"')).nets
    assert (net.wire_length, net.length_unit) == (500.0, "gate_pitch")


def test_silent_nets_have_no_load_no_wire_and_the_full_swing(tmp_path: Path):
    text = CIRCUIT + '[[net]]\nname = "bare"\ndriver = "aoi21"\nrising_per_operation = 0.1\n'
    bare = _read(tmp_path, text).nets[1]
    assert (bare.loads, bare.fixed_load, bare.wire_length, bare.layer, bare.swing) == ((), 0.0, 0.0, "local", None)
    assert (bare.count, bare.on_critical_path, bare.busiest_per_operation) == (1.0, 0.0, 0.1)


def _names() -> list[str]:
    digits = ["".join(choice) for size in (2, 3, 4) for choice in itertools.product("1234", repeat=size)]
    plain = ["inverter", *(f"{kind}{count}" for kind in ("nand", "nor") for count in range(12)), "nand", "xor2", ""]
    return plain + [f"{kind}{digit}" for kind in ("aoi", "oai") for digit in digits] + ["aoi5", "aoi1", "aoi123456"]


def test_a_file_may_name_exactly_the_cells_there_are():
    """The files layer knows no circuits; its list of cells must still be that of the library."""
    for name in _names():
        try:
            inputs = cell(name).inputs
        except UsageError:
            inputs = ()
        assert cell_inputs(name) == inputs, name


@pytest.mark.parametrize("name", ["nand2", "aoi21", "inverter"])
def test_the_list_holds_what_it_should(name: str):
    assert cell_inputs(name) == cell(name).inputs != ()
