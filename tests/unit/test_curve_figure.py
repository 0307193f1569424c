"""Every quantity has its line or its cross drawn over the measured points, where it was read."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path
from typing import Any, get_args

import numpy as np
import pytest

from benchmark.curves.extraction import extract_all
from benchmark.curves.quantities import QuantityName
from benchmark.curves.read import read_curves
from benchmark.physics.extraction.points import Points
from benchmark.physics.extraction.threshold import extrapolated_threshold
from benchmark.report.curve_figure import FIT, POINT, curve_figures
from benchmark.sets.problems import Collector
from tests.near import near
from tests.unit.test_curve_requests import CHOSEN, HEAD, TRANSFER, V, columns, current, transfer_rows, write

Place = tuple[float, float]


@dataclass(frozen=True)
class Case:
    """A request, the file it is read from, and the places its drawing passes, in the units of the file.

    ``lines``: first and last place of each line; ``crosses``: places read at.
    """

    asked: str
    columns: str = TRANSFER
    rows: Sequence[str] = ()
    head: str = HEAD
    lines: tuple[tuple[Place, Place], ...] = ()
    crosses: tuple[Place, ...] = ()


def along(axis: str, more: str = "") -> str:
    return HEAD.replace('"control_voltage"', f'"{axis}"') + more


CAPACITANCE = columns(("V", "control_voltage", "axis", "mV"), ("C", "input_capacitance_per_width", "value", "fF/um"))
FLAT = ["V,C", *(f"{100 * k},{0.8 + 0.01 * k}" for k in range(8))]
CONTACTS = columns(("L", "contact_spacing", "axis", "um"), ("RW", "resistance_width", "value", "kohm um"))
LENGTHS = ["L,RW", *(f"{length},{0.24 + 0.06 * length!r}" for length in (2, 4, 8, 16, 32))]
PRESSED = columns(("p", "pressure", "axis", "MPa"), ("R", "path_resistance", "value", "Mohm"))
FALLING = ["p,R", *(f"{100 * k},{1000.0 * 10.0 ** (-0.2 * k)!r}" for k in range(8))]
RELAY = columns(
    ("V", "control_voltage", "axis", "V"),
    ("u", "displacement", "value", "nm"),
    ("R", "path_resistance", "value", "kohm"),
)
UP = [(v, 1.0 if v < 0.32 else 20.0) for v in V]
DOWN = [(v, 1.0 if v < 0.12 else 20.0) for v in V[::-1]][1:]
MOVES = ["V,u,R", *(f"{v},{u},{1.5 if u > 10 else 900.0}" for v, u in [*UP, *DOWN])]
TURNS = along("control_voltage", 'turns = ["forward", "backward"]\n')
STEP = 'step = { value = 10, unit = "nm" }\n'
WORN = columns(("N", "switching_cycles", "axis", "1"), ("R", "path_resistance", "value", "kohm"))
CYCLES = ["N,R", *(f"1e{6 + k},{1.0 if k < 3 else 50.0}" for k in range(5))]
BENT = columns(("V", "control_voltage", "axis", "V"), ("I", "path_current", "value", "A"))
#: straight from 0.2 to 0.4 V, meets zero at 0.175 V
ROUNDED = [1e-9, 2e-9, 4e-9, 1e-8, 5e-7, 1.5e-6, 2.5e-6, 3.5e-6, 4.5e-6, 5e-6, 5.3e-6, 5.5e-6, 5.6e-6]
ON = ["V,I", *(f"{v},{i!r}" for v, i in zip(V, ROUNDED, strict=True))]


def at(control: float, path: float = 0.6) -> Place:
    return control, current("A1", "forward", control, path)


SPAN = 'span = { low = 10, high = 1000, unit = "pA" }\n' + CHOSEN
WIDE = 'span = { low = 10, high = 100000, unit = "pA" }\n' + CHOSEN
SWING_OF_CHARGE = 'span = { low = 0.05, high = 0.65, unit = "V" }\n'
CHARGE = Case(SWING_OF_CHARGE, CAPACITANCE, FLAT, HEAD, lines=(((50.0, 0.805), (650.0, 0.865)),))
LINE = Case("", CONTACTS, LENGTHS, along("contact_spacing"), lines=(((0.0, 0.24), (32.0, 2.16)),))
SLOPE = Case("", PRESSED, FALLING, along("pressure"), lines=(((0.0, 1000.0), (700.0, 1000.0 * 10.0**-1.4)),))
CASES: dict[str, Case] = {
    "average_swing": Case(SPAN, lines=((at(0.06), at(0.18)),)),
    "minimum_swing": Case(WIDE + "points = 4\n", lines=((at(0.1), at(0.25)),)),
    "fitted_swing": Case(WIDE, lines=((at(0.1), at(0.3)),)),
    "threshold_at_current": Case('level = { value = 1, unit = "nA" }\n' + CHOSEN, crosses=(at(0.18),)),
    "threshold_extrapolated": Case(
        'half_path_voltage = "kept"\n', BENT, ON, lines=(((math.nan, math.nan), (0.3, 2.5e-6)),)
    ),
    "current": Case('at = { value = 0.43, unit = "V" }\n' + CHOSEN, crosses=(at(0.43),)),
    "resistance": Case(
        'at = { value = 0.6, unit = "V" }\nsweep = "forward"\n', RELAY, MOVES, TURNS,
        crosses=((0.6, 1.5),),
    ),
    "effective_current": Case(
        'supply = { value = 0.6, unit = "V" }\nover = "A1"\nsweep = "forward"\n', crosses=(at(0.6, 0.3), at(0.3))
    ),
    "switching_charge": CHARGE,
    "switching_capacitance": CHARGE,
    "hysteresis_window": Case(
        'level = { value = 1, unit = "nA" }\nover = "A1"\npath_voltage = { value = 0.6, unit = "V" }\n',
        lines=(((0.14, 1e-9), (0.18, 1e-9)),),
    ),
    "contact_resistance": LINE,
    "contact_resistivity": LINE,
    "sheet_resistance": LINE,
    "transfer_length": LINE,
    "resistance_slope": SLOPE,
    "log_resistance_slope": SLOPE,
    "pull_in_voltage": Case(STEP, RELAY, MOVES, TURNS, lines=(((0.3, 1.0), (0.35, 20.0)),)),
    "pull_out_voltage": Case(STEP, RELAY, MOVES, TURNS, lines=(((0.1, 1.0), (0.15, 20.0)),)),
    "cycles_to_failure": Case(
        'level = { value = 10, unit = "kohm" }\n', WORN, CYCLES, along("switching_cycles"),
        lines=(((1e8, 1.0), (1e9, 50.0)),),
    ),
}  # fmt: skip


def layers(drawing: dict[str, Any], kind: str, color: str) -> list[list[Place]]:
    """Return the places of every layer of a kind of mark and a colour."""
    return [
        [(row["a"], row["b"]) for row in layer["data"]["values"]]
        for layer in drawing["layer"]
        if layer["mark"]["type"] == kind and layer["mark"].get("color") == color
    ]


def test_every_quantity_has_its_case():
    assert tuple(CASES) == get_args(QuantityName)


@pytest.mark.parametrize("quantity", CASES)
def test_what_was_read_is_drawn_over_the_points_where_it_was_read(quantity: str, tmp_path: Path):
    case = CASES[quantity]
    asked = f'[[extract]]\nquantity = "{quantity}"\n{case.asked}'
    path = write(tmp_path, asked, case.columns, case.rows or transfer_rows(), case.head)
    collector = Collector()
    curves = read_curves(path, collector, frozenset({"invented"}), "raw.toml")
    assert curves is not None
    found = extract_all(curves, collector)
    assert collector.problems == []
    (chart,) = curve_figures(curves, found).values()
    drawing = chart.spec or {}
    positions = [number for number, layer in enumerate(drawing["layer"]) if layer["mark"].get("color") in (POINT, FIT)]
    colors = [drawing["layer"][number]["mark"]["color"] for number in positions]
    assert colors.index(FIT) > max(k for k, color in enumerate(colors) if color == POINT)  # over the points
    (points,) = layers(drawing, "point", POINT)
    assert len(points) == len(chart.points)
    lines, crosses = layers(drawing, "line", FIT), layers(drawing, "point", FIT)
    assert len(lines) == len(case.lines)
    for drawn, (first, last) in zip(lines, case.lines, strict=True):
        if math.isnan(first[0]):  # it meets zero, which a logarithmic axis does not hold
            assert 0.175 < drawn[0][0] < 0.19
            assert len(drawn) > 10
            assert all(b == near((a - 0.175) * 2e-5) for a, b in drawn)
        else:
            assert drawn[0] == (near(first[0]), near(first[1]))
        assert drawn[-1] == (near(last[0]), near(last[1]))
        assert all(one[0] < two[0] for one, two in pairwise(drawn))
    assert sorted(place for drawn in crosses for place in drawn) == [
        (near(a), near(b)) for a, b in sorted(case.crosses)
    ]


def test_the_line_of_an_extrapolated_threshold_meets_zero_exactly():
    """Left to rounding, one line in a few would end above zero, and a logarithmic axis could not bend it down."""
    for shift in np.linspace(0.0, 1.0, 50):
        found = extrapolated_threshold(Points.of(np.array(V) + shift, np.array(ROUNDED)))
        assert found.line_y[0] == 0.0
        assert found.line_x[0] == near(0.175 + shift)
