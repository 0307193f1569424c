"""Decks as text: topology of cells, what is refused, and that no text of a file becomes a command."""

from __future__ import annotations

import dataclasses
import re

import numpy as np
import pytest

from benchmark.circuits.cells import cell
from benchmark.circuits.circuit import Load, Net, Wires
from benchmark.circuits.deck import Pace, chain_deck, deck_stage, ring_deck
from benchmark.circuits.deck_cells import cell_lines, inner_levels, side_inputs, switch_lines
from benchmark.circuits.sized import Sized
from benchmark.devices.netlist.ohmic import ohmic_text
from benchmark.devices.netlist.parts import SubCircuits, control_path, number
from benchmark.devices.netlist.tabulated import tabulated
from benchmark.errors import UsageError
from tests.factories import ohmic_pair

CELLS = ("inverter", "nand2", "nand4", "nor3", "aoi21", "oai22", "aoi221")
NONE = Wires(0.0, 0.0)
PACE = Pace(1e-11, 1e-5)


def _texts(pair) -> SubCircuits:
    def one(switch, polarity):
        return ohmic_text(switch, polarity, 1.0, np.asarray(1e4), np.asarray(1e10), switch.switching_level)

    return SubCircuits(one(pair.down, "down"), one(pair.up, "up"), ("A note.",))


def _stage(name="inverter", capacitances="delay", **how):
    pair = ohmic_pair(terminal_capacitance=1e-16)
    which = cell(name)
    net = Net("stage", which, loads=(Load(which, which.inputs[-1], 3.0),), **how)
    return deck_stage(net, Sized(pair), _texts(pair), NONE, {}, 1.0, capacitances), _texts(pair)


@pytest.mark.parametrize("sizing", ["unit", "equal-drive"])
@pytest.mark.parametrize("name", CELLS)
def test_cells_have_every_switch_once_with_its_width_and_every_internal_terminal(name, sizing):
    which = cell(name)
    lines = cell_lines(which, sizing, {"down": 1.0, "up": 2.0})
    for edge, kind, weight in (("down", "pull_down", 1.0), ("up", "pull_up", 2.0)):
        widths = sorted(float(re.search(r"size=\{([\d.]+)\*", line)[1]) for line in lines if f" {kind} " in line)
        assert widths == sorted(which.widths(edge, sizing))
        inner = [float(re.search(r"\{([\d.]+)\*size", line)[1]) for line in lines if line.startswith(f"C{edge[0]}m")]
        assert inner == [weight * node.width for node in which.internal_nodes(edge, sizing)]
    # every input reaches as many gates as the cell has switches on it
    for pin in which.inputs:
        on_pin = sum(len(widths) for widths in which.input_widths(pin, sizing).values())
        assert sum(line.startswith("x") and line.split()[2] == pin for line in lines) == on_pin


@pytest.mark.parametrize("name", CELLS)
def test_side_inputs_let_the_output_follow_and_internal_nodes_have_first_guesses(name):
    which = cell(name)
    for pin in which.inputs:
        sides = side_inputs(which, pin)
        assert which.output({**sides, pin: False})
        assert not which.output({**sides, pin: True})
        for high in (False, True):
            levels = inner_levels(which, {**sides, pin: high})
            assert len(levels) == sum(len(which.internal_nodes(edge, "unit")) for edge in ("down", "up"))


def test_internal_nodes_follow_what_they_are_connected_to():
    nand = cell("nand2")
    # a is at the output: with b closed the node is at ground, with a alone closed it is at the output
    assert inner_levels(nand, {"a": False, "b": True}) == {"dm1": False}
    assert inner_levels(nand, {"a": True, "b": False}) == {"dm1": True}
    assert inner_levels(cell("nor2"), {"a": True, "b": False}) == {"um1": True}


def test_no_text_becomes_a_command():
    stage, texts = _stage()
    hostile = "title\n.control\nshell rm -rf x\n.endc\u2028.include /etc/passwd\x00µ"
    for deck in (
        chain_deck([hostile], stage, texts, 1.0, PACE),
        ring_deck([hostile, "second"], stage, texts, 1.0, PACE, 3),
    ):
        lines = deck.splitlines()
        assert deck.isascii()
        assert lines[0] == "* title?.control?shell rm -rf x?.endc?.include /etc/passwd??"
        assert sum(line == ".control" for line in lines) == 1
        assert not any("shell" in line or "include" in line for line in lines[1:])
        assert lines[-1] == ".end"


@pytest.mark.parametrize("copies", [1.0, 5.0])
def test_capacitances_of_a_stage_are_those_of_the_estimate(copies):
    """The delay rule with everything lumped at the node, and the energy C V^2, from what the deck places."""
    from benchmark.circuits.circuit import Circuit
    from benchmark.circuits.operation import estimate

    pair = ohmic_pair(
        input_capacitance=1e-15, input_capacitance_delay=0.8e-15, terminal_capacitance=1e-16,
        terminal_capacitance_delay=2e-16,
    )  # fmt: skip
    inverter = cell("inverter")
    wires = Wires(1e8, 2e-10, 0.05e-15)
    net = Net(
        "stage", inverter, loads=(Load(inverter, "a", 3.0),), fixed_load=0.4e-15, wire_length=1e-5, copies=copies,
        load_per_length=1e-11, rising_per_operation=1.0, on_critical_path=1.0,
    )  # fmt: skip
    metrics = estimate(Circuit("c", "c", "c", (net,)), pair, wires, "step", size=2.0, short_circuit=False)
    delay, energy = (
        deck_stage(net, Sized(pair, 2.0), _texts(pair), wires, {}, 1.0, which) for which in ("delay", "energy")
    )
    assert delay.size == 2.0 * copies
    assert delay.fan_out == 3.0 / copies
    assert energy.near + energy.far + energy.wire_capacitance == pytest.approx(metrics.dynamic_energy.item(), rel=1e-12)
    resistance = pair.down.resistance.item() / (2.0 * copies)
    lumped = resistance * (delay.near + delay.far + delay.wire_capacitance) + delay.wire_resistance * delay.far
    wire = 0.377 * delay.wire_resistance * delay.wire_capacitance
    assert np.log(2.0) * lumped + wire == pytest.approx(metrics.path_delay.item(), rel=1e-12)


def test_what_cannot_be_a_chain_is_refused():
    with pytest.raises(UsageError, match="from rail to rail"):
        _stage(swing=0.2)
    inverter, nand = cell("inverter"), cell("nand2")
    pair = ohmic_pair()
    mixed = Net("data", inverter, loads=(Load(nand, "a", 1.0),))
    with pytest.raises(UsageError, match="drives other cells"):
        deck_stage(mixed, Sized(pair), _texts(pair), NONE, {}, 1.0, "device")
    assert deck_stage(mixed, Sized(pair), _texts(pair), NONE, {}, 1.0, "delay").far == pytest.approx(2e-15)
    stage, texts = _stage()
    for stages in (1, 4):
        with pytest.raises(UsageError, match="odd number"):
            ring_deck(["t"], stage, texts, 1.0, PACE, stages)


def test_charges_that_a_model_does_not_have_are_refused():
    pair = ohmic_pair(window=(0.0, 1.0), on_resistance=1e4, off_resistance=1e8)
    table = tabulated(pair)
    assert "table of 161 by 25 points" in table.notes[0]
    assert switch_lines(table, "delay")
    with pytest.raises(UsageError, match="no charges of the device"):
        switch_lines(table, "device")


def test_a_law_that_jumps_is_not_written_as_a_table():
    with pytest.raises(UsageError, match="as a table it would be off"):
        tabulated(ohmic_pair(on_resistance=1e4, off_resistance=1e12, window=(0.5, 0.501)))
    unknown = ohmic_pair()
    lost = dataclasses.replace(unknown.down, current=lambda control, path: control * path * np.nan)
    with pytest.raises(UsageError, match="not known over the whole swing"):
        tabulated(dataclasses.replace(unknown, down=lost))


def test_control_paths():
    def path(polarity="down", **fields):
        return control_path(getattr(ohmic_pair(**fields), polarity), polarity)

    assert path() == ((), "v(g,p)")
    assert path("up") == ((), "v(p,g)")
    lines, control = path(closing_time=1e-9, opening_time=1e-9)
    assert control == "v(u)"
    assert any("TD=1e-09" in line for line in lines)
    lines, control = path(closing_time=2e-9, opening_time=1e-9)
    assert control == "min(v(uon),v(uoff))"
    lines, control = path(closing_time=0.0, opening_time=1e-9)
    assert control == "max(v(uon),v(uoff))"
    assert sum(line.startswith("T") for line in lines) == 1
    omega, quality = 1e11, 0.8
    lines, control = path(natural_frequency=np.asarray(omega), quality=np.asarray(quality))
    value = {line[0]: float(line.split()[-1]) for line in lines if line[0] in "LRC"}
    assert 1.0 / np.sqrt(value["L"] * value["C"]) == pytest.approx(omega)
    assert np.sqrt(value["L"] / value["C"]) / value["R"] == pytest.approx(quality)


def test_numbers_read_back_and_nothing_else_is_written():
    assert float(number(0.1 + 0.2)) == 0.1 + 0.2
    for bad in (np.nan, np.inf):
        with pytest.raises(ValueError, match="no netlist with the number"):
            number(bad)
