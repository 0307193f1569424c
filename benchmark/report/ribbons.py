"""What limits each side along its curve: two patterned strips per side on the time axis of the curves (layer 9).

The strips stand beneath the energy-delay chart on the same axis, not on the curves: five curves with two strips each
would hide one another, and eleven-pixel words do not fit a strip that follows a curve.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from benchmark.report.advantage import stretches
from benchmark.report.drawing import Canvas, Words
from benchmark.report.energy_delay import FEASIBLE, MARGINS, WIDTH, chosen_curves, plane_of, side_name
from benchmark.report.figure import Chart, Row, checked
from benchmark.report.parts import FILLS
from benchmark.report.placing import Box, fitted, hatch, text_width
from benchmark.report.spots import Spots
from benchmark.report.style import GREY, INK, LinearAxis, LogAxis, positive, spec
from benchmark.report.words import amount, listed, volts

__all__ = ["limits_along_supply"]

Record = Mapping[str, Any]
NAME, STRIP, ROW = 17.0, 15.0, 58.0
#: field of a swept point -> what it says
_SAID = {"delay_limit": "delay", "energy_limit": "energy"}


@dataclass(frozen=True)
class _Run:
    """Neighbouring swept points with one mechanism; runs meet half-way between their points."""

    name: str
    low: float
    high: float
    fast: float
    slow: float


def _runs(rows: Sequence[Row], field: str) -> list[_Run]:
    """Return the runs of rows in order of supply [V], with the times [s] they cover."""
    groups = stretches(rows, field)
    found = []
    for position, (name, group) in enumerate(groups):
        low, high = group[0]["supply_V"], group[-1]["supply_V"]
        times = [row["time_s"] for row in group]
        if position:
            other = groups[position - 1][1][-1]
            low = 0.5 * (low + other["supply_V"])
            times.append(math.sqrt(group[0]["time_s"] * other["time_s"]))
        if position < len(groups) - 1:
            other = groups[position + 1][1][0]
            high = 0.5 * (high + other["supply_V"])
            times.append(math.sqrt(group[-1]["time_s"] * other["time_s"]))
        found.append(_Run(name, low, high, min(times), max(times)))
    return found


def _extent(axis: LogAxis, fast: float, slow: float) -> tuple[float, float] | None:
    """Return begin and end of a span of times on the axis; None where it lies outside."""
    if slow < axis.low or fast > axis.high:
        return None
    left = axis.pixel(max(fast, axis.low))
    return left, max(axis.pixel(min(slow, axis.high)), left + 2.0)


def _strip(canvas: Canvas, axis: LogAxis, runs: Sequence[_Run], top: float) -> list[tuple[int, Box]]:
    """Draw one strip; the pattern is that of the bars of parts, words stand where they fit. Returns what is drawn."""
    words, drawn = [], []
    for position, run in enumerate(runs):
        ends = _extent(axis, run.fast, run.slow)
        if ends is None:
            continue
        fill, lined = FILLS.get(run.name, ("#ffffff", False))
        box = Box(ends[0], top, ends[1], top + STRIP)
        drawn.append((position, box))
        canvas.boxes([box], color=fill, stroke=INK, strokeWidth=0.8)
        if lined and box.right - box.left > 3.0:
            canvas.rules(hatch(box, 6.0), color="#a8a8a8", strokeWidth=0.8)
        if text_width(run.name) + 8.0 <= box.right - box.left:
            words.append(Words(run.name, 0.5 * (box.left + box.right), top + 0.5 * STRIP, "center"))
    canvas.words(words, back=True)
    return drawn


def _states(canvas: Canvas, axis: LogAxis, rows: Sequence[Row], y: float) -> None:
    """Draw the line above the strips: through where every hard requirement holds, dotted where one fails."""
    for state, group in stretches(rows, "state"):
        times = [row["time_s"] for row in group]
        ends = _extent(axis, min(times), max(times))
        if ends is not None:
            holds = state == FEASIBLE
            mark = {"color": INK, "strokeWidth": 2.4} if holds else {"color": GREY, "strokeDash": [1.5, 3.5]}
            canvas.rules([(ends[0], y, ends[1], y)], **mark)


def limits_along_supply(record: Record, width: float = WIDTH) -> Chart:
    """Draw two strips per side on the time axis of the energy-delay chart of the same width."""
    key, title = "limits-along-supply", "What limits each side along its curve"
    curves = {
        name: sorted(positive(rows, "time_s")[0], key=lambda row: row["supply_V"])
        for name, rows in chosen_curves(record).items()
    }
    curves = {name: rows for name, rows in curves.items() if rows}
    plane = plane_of(record, width, 100.0)
    if not curves or plane is None:
        words = "Not drawn: no design point can be evaluated."
        return Chart(key, title, None, words, words)
    axis = plane.x
    height = ROW * len(curves) + 8.0
    canvas = Canvas(axis, LinearAxis(height, 0.0, height, vertical=True))
    canvas.frame()
    said: list[str] = []
    points: list[Row] = []
    spots = Spots(MARGINS[0], 6.0)
    outside = False
    for position, (name, rows) in enumerate(curves.items()):
        top = 4.0 + NAME + ROW * position
        shown = side_name(record, name)
        parts = []
        outside |= any(not axis.holds(row["time_s"]) for row in rows)
        for line, (field, what) in enumerate(_SAID.items()):
            runs, here = _runs(rows, field), top + 5.0 + line * (STRIP + 1.0)
            for index, box in _strip(canvas, axis, runs, here):
                run = runs[index]
                words = f"{shown}, {what}: mostly {run.name} from {volts(run.low, 3)} to {volts(run.high, 3)}"
                spots.bar(box, len(points) + index, words)
            parts += [f"{what} {run.name} from {volts(run.low)} to {volts(run.high)}" for run in runs]
            points += [
                {"role": rows[0]["role"], "side": rows[0]["side"], "of": what, "mostly": run.name}
                | {"from_V": run.low, "to_V": run.high, "fastest_s": run.fast, "slowest_s": run.slow}
                for run in runs
            ]
            canvas.words([Words(what, -8.0, here + 0.5 * STRIP, "right")])
        _states(canvas, axis, rows, top)
        canvas.words([Words(fitted(shown, width - 12.0, bold=True)[0], 6.0, top - 0.5 * NAME, bold=True)], back=True)
        said.append(f"{shown}: {listed(parts)}.")
    drawing = checked(spec(canvas.layers, width, height, (MARGINS[0], 6.0, MARGINS[2], 48.0)))
    caption = (
        "On the time axis of the curves above, two strips per side: the part that takes most of the delay, and the "
        "part that takes most of the energy. The line above the strips is drawn through where every hard requirement "
        f"holds, dotted where one fails. {_cut(outside, axis)}{' '.join(said)}"
    )
    return Chart(key, title, drawing, caption, f"{title}. {' '.join(said)}", tuple(points), spots.found())


def _cut(outside: bool, axis: LogAxis) -> str:
    if not outside:
        return ""
    return (
        f"Strips end at the axes ({amount(axis.low, 's')} and {amount(axis.high, 's')}); the words and the table cover "
        "the whole supply range. "
    )
