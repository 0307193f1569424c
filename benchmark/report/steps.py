"""Steps between neighbouring nodes, split by cause: bars of factors on the advantage (layer 9)."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

from benchmark.report.drawing import Canvas, Words
from benchmark.report.figure import Chart, Row, checked
from benchmark.report.placing import Box, cut, hatch, text_width
from benchmark.report.style import INK, LinearAxis, spec
from benchmark.report.words import is_number, listed, number

__all__ = ["node_steps", "step_rows"]

Record = Mapping[str, Any]
WIDTH, LEFT = 470.0, 216.0
ROW, BAR, HEAD = 22.0, 13.0, 24.0
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


def _axis(rows: list[Row]) -> LinearAxis:
    reach = max(0.1, *(abs(row["ln_factor"]) for row in rows))
    low = min([0.0, *(row["ln_factor"] for row in rows)]) - 0.35 * reach
    high = max([0.0, *(row["ln_factor"] for row in rows)]) + 0.35 * reach
    near = (0.001, 0.01, 0.1, 0.2, 0.5, 0.7, 0.8, 0.9, 0.95, 1, 1.05, 1.1, 1.2, 1.5, 2, 5, 10, 100, 1000)
    ticks: list[tuple[float, str]] = [(0.0, "×1")]
    for factor in sorted(near, key=lambda value: abs(math.log(value))):
        place = math.log(factor)
        if low <= place <= high and all(abs(place - other) > 0.1 * (high - low) for other, _ in ticks):
            ticks.append((place, f"×{number(factor, 3)}"))
    return LinearAxis(low, high, WIDTH, "factor on the advantage (log scale)", tuple(sorted(ticks)))


def _words(record: Record) -> list[str]:
    said = []
    for step in record.get("node_steps", ()):
        if step["note"]:
            said.append(f"{step['before']} to {step['after']}: not split, {step['note']}.")
            continue
        largest = sorted(step["parts"].items(), key=lambda item: -abs(item[1]))[:3]
        parts = [f"{cause} ×{number(math.exp(value), 3)}" for cause, value in largest if abs(value) >= SMALL]
        total = f"{step['before']} to {step['after']}: advantage ×{number(math.exp(step['total']), 3)}"
        said.append(f"{total}, most by {listed(parts)}." if parts else f"{total}.")
    return said


def node_steps(record: Record) -> Chart:
    """Draw every step between neighbouring nodes as bars of its causes and its total."""
    key, title = "node-steps", "Steps between nodes by cause"
    rows = step_rows(record)
    said = " ".join(_words(record))
    if not rows or all(step["note"] for step in record["node_steps"]):
        words = f"Not drawn: {said or 'there is no step between two nodes.'}"
        return Chart(key, title, None, words, words)
    axis = _axis(rows)
    blocks = []
    for step in record["node_steps"]:
        if not step["note"]:
            shown = [(cause, value) for cause, value in step["parts"].items() if abs(value) >= SMALL]
            shown.sort(key=lambda item: -abs(item[1]))
            blocks.append((f"{step['before']} to {step['after']}", [*shown, ("total", step["total"])]))
    height = sum(HEAD + ROW * len(bars) for _, bars in blocks) + 8.0
    canvas = Canvas(axis, LinearAxis(height, 0.0, height, vertical=True))
    canvas.frame()
    zero, y = axis.pixel(0.0), 4.0
    canvas.rules([(zero, 0.0, zero, height)], color=INK, strokeWidth=1.2)
    for head, bars in blocks:
        canvas.words([Words(cut(head, LEFT - 12.0, bold=True), -10.0, y + 0.5 * HEAD, "right", bold=True)])
        y += HEAD
        for cause, value in bars:
            end, middle = axis.pixel(value), y + 0.5 * ROW
            box = Box(min(zero, end), middle - 0.5 * BAR, max(zero, end, min(zero, end) + 1.0), middle + 0.5 * BAR)
            total = cause == "total"
            canvas.boxes(
                [box], color="#8a8a8a" if total else "#bcd7ea" if value >= 0.0 else "white", stroke=INK, strokeWidth=0.8
            )
            if value < 0.0 and not total:
                canvas.rules(hatch(box, 5.0), color="#a34800", strokeWidth=0.8)
            text = f"×{number(math.exp(value), 3)}"
            left = end < zero
            place = end - 5.0 - (0.0 if left else -10.0)
            if not left and place + text_width(text) > axis.size:
                place = axis.size - text_width(text)
            canvas.words([Words(text, place, middle, "right" if left else "left", bold=total)], back=True)
            canvas.words([Words(cut(cause, LEFT - 12.0, bold=total), -10.0, middle, "right", bold=total)])
            y += ROW
    drawing = checked(spec(canvas.layers, WIDTH, height, (LEFT, 6.0, 20.0, 48.0)))
    caption = (
        "What the values of the next node do to the advantage, group by group, both sides re-optimised: mean of "
        f"putting the groups in place in one order and in the opposite one. The factors multiply to the total. {said}"
    )
    return Chart(key, title, drawing, caption, f"{title}. {said}", tuple(rows))
