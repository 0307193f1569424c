"""The parts of a change as a waterfall: from the advantage before, cause by cause, to the advantage after (layer 9)."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import Any

from benchmark.report.drawing import Canvas, Words
from benchmark.report.figure import Chart, Row, checked
from benchmark.report.placing import LINE_HEIGHT, Box, fitted, hatch, text_width
from benchmark.report.spots import Spots
from benchmark.report.style import INK, LinearAxis, spec
from benchmark.report.words import listed, number

__all__ = ["change_parts"]

Record = Mapping[str, Any]
KEY, TITLE = "change-parts", "Parts of the change of the advantage"
WIDTH, LEFT, RIGHT = 380.0, 210.0, 120.0
ROW, BAR, TOP = 29.0, 14.0, 6.0
#: parts smaller than this in ln units are not drawn and stand in the table
SMALL = 5.0e-4


def change_parts(record: Record, width: float = WIDTH, left: float = LEFT, right: float = RIGHT) -> Chart:
    """Draw one bar per cause, each beginning where the one before it ends, then the total; in ln units."""
    split = next(row for row in record["change"]["attribution"] if row["quantity"] == "advantage")
    if split["note"] or not split["parts"]:
        why = split["note"] or "no changed value moves the advantage"
        words = f"Not drawn: {why}."
        return Chart(KEY, TITLE, None, words, words)
    points = _rows(split)
    drawn = [row for row in points if abs(row["ln_factor"]) >= SMALL or row["cause"] == "total"]
    required = record["change"]["new"]["required_advantage"]
    axis, level = _axis(drawn, math.log(required / split["before"]), width)
    head = 0.0 if level is None else 16.0
    height = head + ROW * len(drawn) + 8.0
    canvas = Canvas(axis, LinearAxis(height, 0.0, height, vertical=True))
    canvas.frame()
    zero = axis.pixel(0.0)
    canvas.rules([(zero, head, zero, height)], color=INK, strokeWidth=1.2)
    if level is not None:
        _required(canvas, axis, level, required, height)
    spots = Spots(left, TOP)
    for position, row in enumerate(drawn):
        y = head + 4.0 + ROW * position
        _bar(canvas, axis, row, y + 0.5 * ROW)
        if position + 2 < len(drawn):  # the next cause begins where this one ends
            end = axis.pixel(row["ln_after"])
            canvas.rules([(end, y + 0.5 * (ROW + BAR), end, y + ROW + 0.5 * (ROW - BAR))], strokeDash=[2, 2])
        bold = row["cause"] == "total"
        canvas.words([Words(_said(row), width + 8.0, y + 0.5 * ROW, bold=bold)])
        lines = fitted(row["cause"], left - 14.0, 2, bold=bold)
        for line, name in enumerate(lines):
            shift = LINE_HEIGHT * (line - 0.5 * (len(lines) - 1))
            canvas.words([Words(name, -10.0, y + 0.5 * ROW + shift, "right", bold=bold)])
        spots.bar(Box(0.0, y, axis.size, y + ROW), points.index(row), f"{row['cause']}: {_said(row)}")
    drawing = checked(spec(canvas.layers, axis.size, height, (left, TOP, right, 48.0)))
    said = _words(split, points)
    caption = (
        "Logarithm of the advantage over what it was before, cause by cause: each bar is the mean of what the change "
        "of its input does over all orders in which the changes can be made, both sides re-optimised each time; "
        f"hatched where it lowers the advantage. The parts add up to the total. {said}"
    )
    if len(drawn) < len(points):
        caption += f" {len(points) - len(drawn)} smaller than {number(SMALL)} only in the table."
    if level is None:
        caption += f" The required advantage {number(required, 3)} lies outside the axis."
    return Chart(KEY, TITLE, drawing, caption, f"{TITLE}. {said}", tuple(points), spots.found())


def _rows(split: Record) -> list[Row]:
    """Return the causes, the largest first, each from where the one before it ends; then the total."""
    rows: list[Row] = []
    reached = 0.0
    for cause, part in sorted(split["parts"].items(), key=lambda item: -abs(item[1])):
        row = {"cause": cause, "ln_factor": part, "factor": math.exp(part)}
        rows.append({**row, "ln_before": reached, "ln_after": reached + part})
        reached += part
    total = {"cause": "total", "ln_factor": split["total"], "factor": math.exp(split["total"])}
    return [*rows, {**total, "ln_before": 0.0, "ln_after": split["total"]}]


def _axis(rows: Sequence[Row], required: float, width: float) -> tuple[LinearAxis, float | None]:
    """Return the axis, and the place of the required advantage where it is near enough to be on it."""
    ends = [0.0, *(row["ln_after"] for row in rows)]
    span = max(max(ends) - min(ends), 0.01)
    near = min(ends) - span <= required <= max(ends) + span
    ends += [required] if near else []
    span = max(ends) - min(ends) or 0.01
    low, high = min(ends) - 0.06 * span, max(ends) + 0.06 * span
    step = _step(high - low, width)
    first, last = math.ceil(low / step), math.floor(high / step)
    ticks = tuple((k * step, number(k * step, 4)) for k in range(first, last + 1))
    return LinearAxis(low, high, width, "ln(advantage / advantage before)", ticks), required if near else None


def _step(span: float, width: float) -> float:
    """Return a round distance of ticks that stand at least 46 pixels apart."""
    least = 46.0 / width * span
    power = 10.0 ** math.floor(math.log10(least))
    return next(m * power for m in (1.0, 2.0, 5.0, 10.0) if m * power >= least * (1.0 - 1e-9))


def _said(row: Row) -> str:
    sign = "+" if row["ln_factor"] > 0.0 else ""
    return f"{sign}{number(row['ln_factor'], 3)} (×{number(row['factor'], 4)})"


def _bar(canvas: Canvas, axis: LinearAxis, row: Row, middle: float) -> None:
    """Draw one cause, or the total."""
    start, end = axis.pixel(row["ln_before"]), axis.pixel(row["ln_after"])
    total, falls = row["cause"] == "total", row["ln_factor"] < 0.0
    box = Box(min(start, end), middle - 0.5 * BAR, max(start, end, min(start, end) + 1.0), middle + 0.5 * BAR)
    canvas.boxes([box], color="#8a8a8a" if total else "white" if falls else "#bcd7ea", stroke=INK, strokeWidth=0.8)
    if falls and not total:
        canvas.rules(hatch(box, 5.0), color="#a34800", strokeWidth=0.8)


def _required(canvas: Canvas, axis: LinearAxis, level: float, required: float, height: float) -> None:
    """Draw the required advantage down the chart and name it at the top."""
    x, words = axis.pixel(level), f"required advantage {number(required, 3)}"
    canvas.rules([(x, 15.0, x, height)], color=INK, strokeWidth=1.6, strokeDash=[6, 3])
    half = 0.5 * text_width(words, bold=True)
    place = min(max(x, half + 3.0), axis.size - half - 3.0)
    canvas.words([Words(words, place, 8.0, "center", bold=True)], back=True)


def _words(split: Record, rows: Sequence[Row]) -> str:
    parts = [f"{row['cause']} {_said(row)}" for row in rows[:-1] if abs(row["ln_factor"]) >= SMALL]
    ends = f"Advantage {number(split['before'], 4)} before, {number(split['after'], 4)} after"
    most = f", most by {listed(parts[:3])}" if parts else ""
    return f"{ends}: total {_said(rows[-1])}{most}."
