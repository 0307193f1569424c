"""Closed forms against circuit simulation: the stored bands, and a few of them measured again."""

from __future__ import annotations

import csv

import pytest

from tests.ngspice.measure_bands import PATH, RATIOS, SETS, STAGES, measure

Row = dict[str, str]


def _rows() -> list[Row]:
    with PATH.open(newline="", encoding="utf-8") as stream:
        return list(csv.DictReader(stream))


ROWS = _rows()


def _band(ratio: str, cell: str, pin: str) -> tuple[float, float]:
    values = [float(row[ratio]) for row in ROWS if (row["cell"], row["input"]) == (cell, pin)]
    return min(values), max(values)


def test_every_set_supply_and_stage_is_there():
    expected = sum(round((declared - 0.2) / 0.1) + 1 for _, _, declared in SETS) * len(STAGES)
    assert len(ROWS) == expected
    assert len({(row["technology"], row["supply_V"], row["cell"], row["input"]) for row in ROWS}) == expected


@pytest.mark.parametrize(
    ("cell", "pin", "ratio", "low", "high"),
    [
        # worst at 0.2 V for planar sets, and near 0.5 V for the 14 nm set
        ("inverter", "a", "delay", 0.90, 1.09),
        ("inverter", "a", "energy", 0.98, 1.06),
        ("inverter", "a", "leakage", 1.00, 1.002),
        # the closed form counts the input next to the rail as the last to switch, every internal node over the full
        # swing, and the stack by what it carries with all gates together
        ("nand2", "b", "delay", 1.06, 1.20),
        ("nand2", "b", "energy", 0.94, 1.08),
        ("nand2", "a", "delay", 1.15, 1.31),
        ("nand2", "a", "energy", 1.05, 1.21),
        # a closed n switch at the output passes less than the supply to the open one below it
        ("nand2", "a", "leakage", 1.00, 1.08),
    ],
)
def test_bands_of_the_closed_forms(cell, pin, ratio, low, high):
    """What the closed forms are worth for virtual-source transistors from 0.2 V to the declared supply."""
    least, most = _band(ratio, cell, pin)
    assert low <= least
    assert most <= high
    assert most - least > 0.5 * (high - low)  # no band wider than twice what was measured


@pytest.mark.spice
@pytest.mark.parametrize(
    ("technology", "supply", "cell", "pin"),
    [
        ("open-7nm-regular", "0.3", "inverter", "a"),
        ("silicon-14nm-finfet", "0.7", "nand2", "b"),
        ("silicon-45nm-high-performance", "1", "inverter", "a"),
        ("silicon-32nm-high-performance", "0.5", "nand2", "a"),
    ],
)
def test_measured_again(technology, supply, cell, pin):
    (row,) = (
        row
        for row in ROWS
        if (row["technology"], row["supply_V"], row["cell"], row["input"]) == (technology, supply, cell, pin)
    )
    found = measure(technology, row["node"], float(supply), cell, pin, float(row["fan_out"]))
    for name, value in found.items():
        assert value == pytest.approx(float(row[name]), rel=2e-3), name
    assert set(RATIOS) < set(found)
