"""What limits each side along its supply sweep: two patterned strips per curve (layer 9)."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from benchmark.record.shown_units import unit_words
from benchmark.report.advantage import stretches
from benchmark.report.drawing import Canvas, Words
from benchmark.report.energy_delay import FEASIBLE, chosen_curves, side_name
from benchmark.report.figure import Chart, Row, checked
from benchmark.report.parts import FILLS
from benchmark.report.placing import Box, fitted, hatch, text_width
from benchmark.report.style import GREY, INK, LinearAxis, spec
from benchmark.report.words import is_number, listed, number, volts

__all__ = ["limits_along_supply"]

Record = Mapping[str, Any]
WIDTH, LEFT = 560.0, 124.0
STRIP, ROW = 15.0, 50.0
#: field of a swept point -> what it says
_SAID = {"delay_limit": "delay", "energy_limit": "energy"}


def _runs(rows: Sequence[Row], field: str) -> list[tuple[str, float, float]]:
    """Return mechanism, first and last supply of each run; runs meet half-way between their points."""
    runs = stretches(rows, field)
    found = []
    for position, (name, group) in enumerate(runs):
        low, high = group[0]["supply_V"], group[-1]["supply_V"]
        if position:
            low = 0.5 * (low + runs[position - 1][1][-1]["supply_V"])
        if position < len(runs) - 1:
            high = 0.5 * (high + runs[position + 1][1][0]["supply_V"])
        found.append((name, low, high))
    return found


def _ticks(low: float, high: float) -> tuple[tuple[float, str], ...]:
    step = next(s for s in (0.05, 0.1, 0.2, 0.5, 1.0, 2.0, 5.0, 10.0, 1e9) if (high - low) / s <= 10.0)
    first = round(low / step + 0.499999)
    ticks = [step * k for k in range(first, int(high / step + 1e-9) + 1)]
    return tuple((tick, number(tick, 3)) for tick in ticks) or ((low, number(low, 3)),)


def _strip(canvas: Canvas, runs: Sequence[tuple[str, float, float]], top: float) -> None:
    """Draw one strip; the pattern is that of the bars of parts, words stand where they fit."""
    axis, words = canvas.x, []
    for name, low, high in runs:
        left, right = axis.pixel(low), max(axis.pixel(high), axis.pixel(low) + 2.0)
        fill, lined = FILLS.get(name, ("#ffffff", False))
        box = Box(left, top, right, top + STRIP)
        canvas.boxes([box], color=fill, stroke=INK, strokeWidth=0.8)
        if lined and right - left > 3.0:
            canvas.rules(hatch(box, 6.0), color="#a8a8a8", strokeWidth=0.8)
        if text_width(name) + 8.0 <= right - left:
            words.append(Words(name, 0.5 * (left + right), top + 0.5 * STRIP, "center"))
    canvas.words(words, back=True)


def limits_along_supply(record: Record, width: float = WIDTH, left: float = LEFT) -> Chart:
    """Draw two strips per side over its supply, with the part where hard requirements hold marked above it."""
    key, title = "limits-along-supply", "What limits each side along its supply"
    curves = {
        name: sorted((row for row in rows if is_number(row["time_s"])), key=lambda row: row["supply_V"])
        for name, rows in chosen_curves(record).items()
    }
    curves = {name: rows for name, rows in curves.items() if rows}
    if not curves:
        words = "Not drawn: no design point can be evaluated."
        return Chart(key, title, None, words, words)
    low = min(rows[0]["supply_V"] for rows in curves.values())
    high = max(rows[-1]["supply_V"] for rows in curves.values())
    room = 0.03 * (high - low) or 0.1 * high
    axis = LinearAxis(low - room, high + room, width, f"supply ({unit_words('V')})", _ticks(low - room, high + room))
    height = ROW * len(curves) + 8.0
    canvas = Canvas(axis, LinearAxis(height, 0.0, height, vertical=True))
    canvas.frame()
    said, points = [], []
    for position, (name, rows) in enumerate(curves.items()):
        top = 12.0 + ROW * position
        parts = []
        for line, (field, what) in enumerate(_SAID.items()):
            runs = _runs(rows, field)
            _strip(canvas, runs, top + line * (STRIP + 1.0))
            parts += [f"{what} {name} from {volts(a)} to {volts(b)}" for name, a, b in runs]
            points += [
                {"role": rows[0]["role"], "side": rows[0]["side"], "of": what, "mostly": name, "from_V": a, "to_V": b}
                for name, a, b in runs
            ]
        for state, group in stretches(rows, "state"):
            ends = [axis.pixel(group[0]["supply_V"]), axis.pixel(group[-1]["supply_V"])]
            holds = state == FEASIBLE
            mark = {"color": INK, "strokeWidth": 2.4} if holds else {"color": GREY, "strokeDash": [1.5, 3.5]}
            canvas.rules([(ends[0], top - 4.0, max(ends[1], ends[0] + 2.0), top - 4.0)], **mark)
        shown = fitted(side_name(record, name), left - 12.0, 2, bold=True)
        canvas.words(
            [
                Words(line, -10.0, top + STRIP + 13.0 * (i - 0.5 * (len(shown) - 1)), "right", bold=True)
                for i, line in enumerate(shown)
            ]
        )
        said.append(f"{side_name(record, name)}: {listed(parts)}.")
    drawing = checked(spec(canvas.layers, width, height, (left, 6.0, 12.0, 48.0)))
    caption = (
        "Two strips per side over its supply: above, the part that takes most of the delay; below, the part that takes "
        "most of the energy. The line above the strips is drawn through where every hard requirement holds, dotted "
        f"where one fails. {' '.join(said)}"
    )
    return Chart(key, title, drawing, caption, f"{title}. {' '.join(said)}", tuple(points))
