"""Steps between neighbouring nodes, split by cause: bars of factors on the advantage (layer 9)."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

from benchmark.report.drawing import Canvas, Words
from benchmark.report.figure import Chart, Row, checked
from benchmark.report.placing import Box, cut, hatch, text_width
from benchmark.report.spots import Spots
from benchmark.report.style import INK, LinearAxis, spec
from benchmark.report.words import is_number, listed, number

__all__ = ["node_steps", "step_rows"]

Record = Mapping[str, Any]
WIDTH, LEFT = 470.0, 216.0
ROW, BAR, TOP = 22.0, 13.0, 6.0
#: parts smaller than this in ln units are not drawn and stand in the table
SMALL = 5e-4


def step_rows(record: Record) -> list[Row]:
    """One row per step and cause; the parts in ln units add up to the total."""
    return [
        {"from": step["before"], "to": step["after"], "cause": cause, "ln_factor": value, "factor": math.exp(value)}
        for step in record.get("node_steps", ())
        for cause, value in [*step["parts"].items(), ("total", step["total"])]
        if is_number(value)
    ]


def _axis(rows: list[Row], width: float) -> LinearAxis:
    reach = max(0.1, 0.1, *(abs(row["ln_factor"]) for row in rows))
    low = min([0.0, *(row["ln_factor"] for row in rows)]) - 0.35 * reach
    high = max([0.0, *(row["ln_factor"] for row in rows)]) + 0.35 * reach
    near = (0.001, 0.01, 0.1, 0.2, 0.5, 0.7, 0.8, 0.9, 0.95, 1, 1.05, 1.1, 1.2, 1.5, 2, 5, 10, 100, 1000)
    apart = max(0.1, 36.0 / width) * (high - low)
    ticks: list[tuple[float, str]] = [(0.0, "×1")]
    for factor in sorted(near, key=lambda value: abs(math.log(value))):
        place = math.log(factor)
        if low <= place <= high and all(abs(place - other) > apart for other, _ in ticks):
            ticks.append((place, f"×{number(factor, 3)}"))
    return LinearAxis(low, high, width, "factor on the advantage (log scale)", tuple(sorted(ticks)))


def _words(step: Mapping[str, Any]) -> str:
    if step["note"]:
        return f"{step['before']} to {step['after']}: not split, {step['note']}."
    largest = sorted(step["parts"].items(), key=lambda item: -abs(item[1]))[:3]
    parts = [f"{cause} ×{number(math.exp(value), 3)}" for cause, value in largest if abs(value) >= SMALL]
    total = f"{step['before']} to {step['after']}: advantage ×{number(math.exp(step['total']), 3)}"
    return f"{total}, most by {listed(parts)}." if parts else f"{total}."


def node_steps(record: Record, width: float = WIDTH, left: float = LEFT) -> tuple[Chart, ...]:
    """Draw each step between neighbouring nodes as bars of its causes and its total, all on one scale.

    The first has the key ``node-steps``, the others ``node-steps-2``, ``node-steps-3`` ...
    """
    steps = record.get("node_steps", ())
    if not steps:
        words = "Not drawn: there is no step between two nodes."
        return (Chart("node-steps", "Step between nodes by cause", None, words, words),)
    axis = _axis(step_rows(record), width)
    return tuple(
        _chart(record, step, axis, left, "node-steps" if position == 1 else f"node-steps-{position}")
        for position, step in enumerate(steps, start=1)
    )


def _chart(record: Record, step: Mapping[str, Any], axis: LinearAxis, left: float, key: str) -> Chart:
    """Draw one step."""
    head = f"{step['before']} to {step['after']}"
    title, said = f"Step from {head} by cause", _words(step)
    if step["note"]:
        return Chart(key, title, None, f"Not drawn: {said}", f"Not drawn: {said}")
    points = tuple(row for row in step_rows(record) if (row["from"], row["to"]) == (step["before"], step["after"]))
    shown = [(cause, value) for cause, value in step["parts"].items() if abs(value) >= SMALL]
    bars = [*sorted(shown, key=lambda item: -abs(item[1])), ("total", step["total"])]
    height = ROW * len(bars) + 8.0
    canvas = Canvas(axis, LinearAxis(height, 0.0, height, vertical=True))
    canvas.frame()
    zero = axis.pixel(0.0)
    canvas.rules([(zero, 0.0, zero, height)], color=INK, strokeWidth=1.2)
    places = {row["cause"]: position for position, row in enumerate(points)}
    spots = Spots(left, TOP)
    for position, (cause, value) in enumerate(bars):
        y = 4.0 + ROW * position
        _bar(canvas, axis, cause, value, y + 0.5 * ROW)
        name = cut(cause, left - 12.0, bold=cause == "total")
        canvas.words([Words(name, -10.0, y + 0.5 * ROW, "right", bold=cause == "total")])
        words = f"{head}, {cause}: factor {number(math.exp(value), 3)} on the advantage"
        spots.bar(Box(0.0, y, axis.size, y + ROW), places[cause], words)
    drawing = checked(spec(canvas.layers, axis.size, height, (left, TOP, 20.0, 48.0)))
    caption = (
        "What the values of the next node do to the advantage, group by group, both sides re-optimised: mean of "
        f"putting the groups in place in one order and in the opposite one. The factors multiply to the total. {said}"
    )
    return Chart(key, title, drawing, caption, f"{title}. {said}", points, spots.found())


def _bar(canvas: Canvas, axis: LinearAxis, cause: str, value: float, middle: float) -> None:
    """Draw one cause, or the total, with its factor beside it."""
    zero, end, total = axis.pixel(0.0), axis.pixel(value), cause == "total"
    box = Box(min(zero, end), middle - 0.5 * BAR, max(zero, end, min(zero, end) + 1.0), middle + 0.5 * BAR)
    colour = "#8a8a8a" if total else "#bcd7ea" if value >= 0.0 else "white"
    canvas.boxes([box], color=colour, stroke=INK, strokeWidth=0.8)
    if value < 0.0 and not total:
        canvas.rules(hatch(box, 5.0), color="#a34800", strokeWidth=0.8)
    text = f"×{number(math.exp(value), 3)}"
    before = end < zero
    place = end - 5.0 if before else end + 5.0
    if not before and place + text_width(text) > axis.size:
        place = axis.size - text_width(text)
    canvas.words([Words(text, place, middle, "right" if before else "left", bold=total)], back=True)
