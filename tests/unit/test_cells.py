"""Cells: what walking a topology finds, against hand counts and closed forms."""

from __future__ import annotations

import itertools

import numpy as np
import pytest

from benchmark.circuits.cells import Cell, Series, Switched, cell, dual
from benchmark.circuits.sized import Sized
from benchmark.errors import UsageError
from tests.factories import ohmic_pair
from tests.near import near

A, B = Switched("a"), Switched("b")


@pytest.mark.parametrize(
    ("name", "truth"),
    [
        ("inverter", lambda a: not a),
        ("nand3", lambda a, b, c: not (a and b and c)),
        ("nor2", lambda a, b: not (a or b)),
        ("aoi21", lambda a, b, c: not ((a and b) or c)),
        ("oai22", lambda a, b, c, d: not ((a or b) and (c or d))),
    ],
)
def test_truth_tables(name, truth):
    which = cell(name)
    for values in itertools.product((False, True), repeat=len(which.inputs)):
        assert which.output(dict(zip(which.inputs, values, strict=True))) == truth(*values)


@pytest.mark.parametrize(
    ("name", "switches", "down", "up"),
    [("inverter", 2, 1, 1), ("nand3", 6, 3, 1), ("nor4", 8, 1, 4), ("aoi22", 8, 2, 2), ("aoi31", 8, 3, 2)],
)
def test_counts(name, switches, down, up):
    which = cell(name)
    assert (which.switch_count, which.depth("down"), which.depth("up")) == (switches, down, up)


def test_networks_that_are_not_dual_are_refused():
    with pytest.raises(UsageError, match="not the dual"):
        Cell("wrong", ("a", "b"), Series((A, B)), Series((A, B)))
    with pytest.raises(UsageError, match="inputs"):
        Cell("wrong", ("a",), Series((A, B)), dual(Series((A, B))))


@pytest.mark.parametrize("name", ["nand1", "xor2", "nand9", "aoi", "INVERTER", "nand2 "])
def test_unknown_names_are_refused(name):
    with pytest.raises(UsageError, match="no cell"):
        cell(name)


@pytest.mark.parametrize("mu", [0.5, 1.0, 1.7, 2.0, 3.0])
@pytest.mark.parametrize("n", [2, 3, 4, 5])
def test_logical_effort_follows_from_the_topology(n, mu):
    """g_NAND = (n + mu)/(1 + mu), g_NOR = (1 + n mu)/(1 + mu); p = n (Sutherland, Sproull, Harris 1999)."""
    made = Sized(
        ohmic_pair(
            terminal_capacitance=1e-15, up={"input_capacitance": mu * 1e-15, "terminal_capacitance": mu * 1e-15}
        ),
        sizing="equal-drive",
        internal_nodes=False,
    )
    inverter = made.input_capacitance(cell("inverter"), "a")
    for kind, effort in (("nand", (n + mu) / (1 + mu)), ("nor", (1 + n * mu) / (1 + mu))):
        which = cell(f"{kind}{n}")
        for name in which.inputs:
            assert made.input_capacitance(which, name) / inverter == near(effort, rel=1e-12)
        for edge in ("down", "up"):
            assert made.path_resistance(which, edge) == near(1e4, rel=1e-12)
        own = made.output_capacitance(which, "delay", "down") / made.output_capacitance(
            cell("inverter"), "delay", "down"
        )
        assert own == near(n, rel=1e-12)  # series side n wide once, parallel side n times: n at any mu


def test_and_or_invert_effort():
    """AOI21 at mu = 2: g = 2, 2, 5/3 and p = 7/3 (Weste & Harris, from memory)."""
    made = Sized(
        ohmic_pair(terminal_capacitance=1e-15, up={"input_capacitance": 2e-15, "terminal_capacitance": 2e-15}),
        sizing="equal-drive",
        internal_nodes=False,
    )
    which, inverter = cell("aoi21"), made.input_capacitance(cell("inverter"), "a")
    efforts = [float(made.input_capacitance(which, name) / inverter) for name in which.inputs]
    assert efforts == near([2.0, 2.0, 5.0 / 3.0])
    own = made.output_capacitance(which, "delay", "down") / made.output_capacitance(cell("inverter"), "delay", "down")
    assert float(own) == near(7.0 / 3.0)


def test_nand3_elmore_with_internal_nodes():
    """Falling NAND3 driving h of itself: (12 + 5 h) R C (Weste & Harris, from memory); widths 3 down, 2 up."""
    unit = 1e-15
    made = Sized(
        ohmic_pair(
            input_capacitance=unit,
            terminal_capacitance=unit,
            up={"input_capacitance": 2 * unit, "terminal_capacitance": 2 * unit},
        ),
        sizing="equal-drive",
    )
    which = cell("nand3")
    own = made.output_capacitance(which, "delay", "down")
    assert float(own / unit) == near(12.0)
    assert float(made.input_capacitance(which, "b") / unit) == near(5.0)


def test_unit_sizing_stacks_resistance():
    made = Sized(ohmic_pair(on_resistance=1e4))
    assert float(made.path_resistance(cell("nand3"), "down")) == near(3e4)
    assert float(made.path_resistance(cell("nand3"), "up")) == near(1e4)
    assert float(made.path_resistance(cell("aoi21"), "down")) == near(2e4)


def test_stack_on_is_used_and_its_end_is_nan():
    stacked = np.array([1.0, 2.5])
    made = Sized(ohmic_pair(on_resistance=1e4, stack_on=stacked))
    assert float(made.path_resistance(cell("nand2"), "down")) == near(2.5e4)
    assert np.isnan(made.path_resistance(cell("nand3"), "down"))
    wide = Sized(ohmic_pair(on_resistance=1e4, stack_on=stacked), sizing="equal-drive")
    assert float(wide.path_resistance(cell("nand2"), "down")) == near(1.25e4)


def _hand_leakage(name: str, states: dict[str, float]) -> None:
    found = Sized(ohmic_pair(off_resistance=1e9)).leakage_current(cell(name))["path"] * 1e9
    assert float(found) == near(sum(states.values()) / len(states), rel=1e-12)


def test_state_averaged_leakage_by_hand():
    _hand_leakage("inverter", {"0": 1, "1": 1})
    _hand_leakage("nand2", {"00": 1 / 2, "01": 1, "10": 1, "11": 2})
    _hand_leakage("nor2", {"00": 2, "01": 1, "10": 1, "11": 1 / 2})
    _hand_leakage("nand3", {"000": 1 / 3, **dict.fromkeys("abc", 1 / 2), **dict.fromkeys("def", 1), "111": 3})
    # a.b + c: pull-down open in 000, 100, 010 (1/2 + 1, 1 + 1, 1 + 1); pull-up open in the others,
    # (a parallel b) in series with c: 110: 2; 001, 101, 011: c alone open: 1; 111: 2 and 1 in series: 2/3
    _hand_leakage("aoi21", {"000": 1.5, "100": 2, "010": 2, "110": 2, "001": 1, "101": 1, "011": 1, "111": 2 / 3})


def test_stack_off_is_used():
    steep = np.array([1.0, 0.1])
    found = Sized(ohmic_pair(off_resistance=1e9, stack_off=steep)).leakage_current(cell("nand2"))["path"] * 1e9
    assert float(found) == near((0.1 + 1 + 1 + 2) / 4)


def test_input_and_body_leakage_of_every_switch():
    pair = ohmic_pair(input_leakage=1e-12, body_leakage=1e-13)
    found = Sized(pair, size=3.0).leakage_current(cell("nand2"))
    assert float(found["input"]) == near(4 * 3 * 0.5e-12)
    assert float(found["body"]) == near(4 * 3 * 1e-13)


def test_an_actuator_apart_keeps_its_charge_unless_the_size_means_copies():
    pair = ohmic_pair(input_scales_with_size=False, bias_power=1e-12, extra_energy=1e-18)
    single, wide, copies = Sized(pair), Sized(pair, 4.0), Sized(pair, 4.0, "copies")
    which = cell("nand2")
    for method in (Sized.input_capacitance, Sized.input_charge, Sized.extra_energy):
        assert method(wide, which, "a") == method(single, which, "a")
        assert method(copies, which, "a") == 4.0 * method(single, which, "a")
    assert copies.bias_power(which) == 4.0 * wide.bias_power(which)
    assert wide.path_resistance(which, "down") == copies.path_resistance(which, "down")
    assert float(Sized(pair, sizing="equal-drive").input_capacitance(which, "a")) == near(2e-15)


def test_transit_of_stacks():
    fields = {"closing_time": 2e-12, "opening_time": 5e-12}
    together = Sized(ohmic_pair(**fields))
    assert float(together.transit(cell("nand3"), "down")) == 5e-12
    in_turn = Sized(ohmic_pair(**fields, stack_time="sequential"))
    assert float(in_turn.transit(cell("nand3"), "down")) == near(6e-12)
    assert float(in_turn.transit(cell("nand3"), "up")) == 5e-12


def test_an_input_the_cell_does_not_have_is_refused():
    with pytest.raises(UsageError, match="no input"):
        Sized(ohmic_pair()).input_capacitance(cell("inverter"), "b")
