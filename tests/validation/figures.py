"""Error bands of the closed forms, drawn: ratio closed over simulated against supply, or transit over R C."""

from __future__ import annotations

import itertools
from collections.abc import Callable, Sequence
from dataclasses import dataclass

from benchmark.report.blocks import Cell, Figure, Table, plain
from benchmark.report.drawing import Canvas, Words
from benchmark.report.figure import Chart, checked, to_svg
from benchmark.report.style import LinearAxis, LogAxis, Row, spec
from benchmark.report.svg import inline_svg
from benchmark.report.words import number, plural
from tests.ngspice.band_table import TidyPoint, tidy_points

__all__ = ["blocks"]

WIDTH, HEIGHT = 560.0, 280.0
MARGINS = (64.0, 34.0, 14.0, 46.0)
LOOKS = (("#0072B2", "circle"), ("#D55E00", "triangle-up"), ("#009E73", "diamond"))
Chosen = Callable[[TidyPoint], bool]


@dataclass(frozen=True)
class Series:
    """Points of one name."""

    name: str
    chosen: Chosen


def _rows(series: Series, axis: str) -> list[Row]:
    return [
        {"x": point.facts[axis], "y": point.ratio}
        for point in tidy_points()
        if not point.flag and series.chosen(point) and point.facts.get(axis, 0.0) > 0.0
    ]


def _drawn(
    key: str, title: str, axis: str, x_title: str, series: Sequence[Series], caption: str
) -> list[Figure | Table]:
    found = [_rows(one, axis) for one in series]
    every = [row for rows in found for row in rows]
    if axis == "supply":
        ticks = tuple((t / 10, f"{t / 10:g} V") for t in range(2, 11, 2))
        x: LinearAxis | LogAxis = LinearAxis(0.15, 1.05, WIDTH, x_title, ticks)
    else:
        x = LogAxis.around([row["x"] for row in every], WIDTH, "1", x_title)
    heights = [row["y"] for row in every]
    low, high = min(*heights, 0.9), max(*heights, 1.1)
    step = 0.1 if high - low < 1.0 else 0.25 if high - low < 2.5 else 0.5
    marks = tuple((round(k * step, 3), number(k * step, 3)) for k in range(int(low / step), int(high / step) + 2))
    y = LinearAxis(marks[0][0], marks[-1][0], HEIGHT, "closed form / simulation", marks, vertical=True)
    canvas = Canvas(x, y)
    canvas.frame()
    canvas.rules([(0.0, y.pixel(1.0), WIDTH, y.pixel(1.0))], strokeWidth=1.4, color="#1a1a1a")
    place, words = 6.0, []
    for one, rows, (colour, shape) in zip(series, found, LOOKS, strict=False):
        canvas.marks(rows, "x", "y", shape=shape, size=34, color=colour)
        canvas.symbols([(place, -14.0)], shape=shape, size=50, color=colour)
        words.append(Words(one.name, place + 10.0, -14.0))
        place += 30.0 + 8.0 * len(one.name)
    canvas.words(words)
    spans = "; ".join(
        f"{one.name} {number(min(r['y'] for r in rows), 3)} to {number(max(r['y'] for r in rows), 3)}"
        for one, rows in zip(series, found, strict=True)
    )
    drawing = checked(spec(canvas.layers, WIDTH, HEIGHT, MARGINS))
    chart = Chart(key, title, drawing, caption, f"Ratio closed over simulated against {x_title}: {spans}.")
    svg = inline_svg(to_svg(drawing), key, chart.alternative, title)
    return [Figure(chart, svg, None), _table(key, title, x_title, series, found)]


def _table(key: str, title: str, x_title: str, series: Sequence[Series], found: Sequence[list[Row]]) -> Table:
    """Smallest and largest ratio by interval of the horizontal axis."""
    supply = x_title.startswith("supply")
    edges = [0.2, 0.3, 0.5, 0.7, 1.0] if supply else [1e-6, 0.1, 1.0, 10.0, 1e3]
    rows = []
    for low, high in itertools.pairwise(edges):
        name = f"{low:g} to {high:g} V" if supply else f"up to {high:g}" if low < 1e-3 else f"{low:g} to {high:g}"
        if not supply and high > 100.0:
            name = f"above {low:g}"
        cells: list[Cell] = [Cell(name)]
        for points in found:
            inside = [row["y"] for row in points if low * 0.999 <= row["x"] <= high * 1.001]
            text = f"{number(min(inside), 3)} to {number(max(inside), 3)}" if inside else "none"
            cells.append(Cell(text, small=plural(len(inside), "point") if inside else ""))
        rows.append(cells)
    return plain(f"{key}-bands", f"{title}: smallest and largest ratio", (x_title, *(one.name for one in series)), rows)


def _usual(point: TidyPoint) -> bool:
    """Virtual-source points at room temperature under the rule in use."""
    return point.model == "virtual-source" and point.rule == "chain"


def blocks() -> list[Figure | Table]:
    """Every drawing with its table."""
    cells = (("inverter", "inverter"), ("nand2", "NAND2"), ("nand3", "NAND3"))

    def of_transistors(quantity: str) -> list[Series]:
        return [
            Series(word, lambda p, cell=cell, q=quantity: _usual(p) and p.cell == cell and p.quantity == q)
            for cell, word in cells
        ]

    rules = [
        Series(
            f"rule {rule}",
            lambda p, rule=rule: (p.model, p.cell, p.quantity, p.rule) == ("stress-gated", "inverter", "delay", rule),
        )
        for rule in ("chain", "integral")
    ]
    shared = "Four reference sets, -40 to 125 degC, fan-out 1 to 4 with and without a fixed load"
    return [
        *_drawn(
            "band-delay",
            "Delay of transistor stages",
            "supply",
            "supply",
            of_transistors("delay"),
            f"{shared}. What limits it: one effective current for a curve, weights of the drain edge that fall where "
            "the drive is slow, and stacks counted by what they carry with all gates together: a NAND with one input "
            "moving is faster than said.",
        ),
        *_drawn(
            "band-energy",
            "Energy of transistor stages",
            "supply",
            "supply",
            of_transistors("energy"),
            f"{shared}; one full cycle without leakage. What limits it: charge below threshold that follows the gate, "
            "internal nodes of a stack counted over the full swing, "
            "and coupling where an output drives one input only (the lowest inverter).",
        ),
        *_drawn(
            "band-stress",
            "Delay of stress-gated inverters",
            "transit_over_rc",
            "transit over R C",
            rules,
            "An invented switch, on/off ratio 1e2 to 1e8, quality 0.5 to 3, supply 0.8 to 2.5 closing voltages. "
            "What limits it: the rule chain adds transit and R C as if one followed the other; the rule integral "
            "follows the actuator, and misses where it rings. Points beyond the ringing limit have no band and are "
            "not drawn.",
        ),
    ]
