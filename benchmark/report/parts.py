"""Where time and energy go: stacked bars of the candidate and the strongest reference on one scale (layer 9)."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from benchmark.report.drawing import Canvas, Words
from benchmark.report.energy_delay import side_name
from benchmark.report.figure import Chart, Row, checked
from benchmark.report.placing import Box, fitted, hatch, text_width
from benchmark.report.rows import part_rows
from benchmark.report.section_points import anchor_of
from benchmark.report.spots import Spot, Spots
from benchmark.report.style import INK, LinearAxis, spec
from benchmark.report.words import amount, number, policy_name, scaled

__all__ = ["FILLS", "where_it_goes"]

Record = Mapping[str, Any]
WIDTH = 560.0
BAR, ROW, LEFT, PAD = 26.0, 64.0, 124.0, 6.0
#: fill of each part: pale, so that words on it can be read; hatched ones differ in grey print too
FILLS = {
    "transit": ("#d5e6f3", True),
    "device RC": ("#d5e6f3", False),
    "device": ("#d5e6f3", False),
    "wire": ("#f9dcc6", False),
    "layout and fixed load": ("#f9dcc6", True),
    "leakage": ("#dcdcdc", False),
    "idle": ("#dcdcdc", True),
    "short circuit": ("#cfe9df", False),
    "losses beyond charge": ("#cfe9df", True),
    "bias and overheads": ("#ead6e4", False),
    "supply loss": ("#ead6e4", True),
    "level shifter": ("#ffffff", True),
    "level shifters": ("#ffffff", True),
}
SMALL = 0.05


def _sides(record: Record, rows: Sequence[Row]) -> list[tuple[str, list[Row]]]:
    """Candidate and strongest contender of the primary policy, with the words for each."""
    primary = record["policies"][0]
    found = []
    for role, name in (("candidate", primary["candidate"]["id"]), ("contender", primary["strongest"])):
        mine = [row for row in rows if row["role"] == role and row["side"] == name]
        if mine:
            found.append((f"{role} {name}", mine))
    return found


def _nice(total: float) -> tuple[list[float], float]:
    """Return round ticks from zero and the end of the axis."""
    power = 10.0 ** len(str(int(total))) if total >= 1.0 else 10.0
    steps = [power / 10.0**k * m for k in range(1, 8) for m in (5.0, 2.0, 1.0)]
    step = min((s for s in steps if total / s <= 6.0), default=total)
    count = int(total / step) + 1
    return [step * k for k in range(count + 1)], step * count


def _segments(rows: Sequence[Row], top: float, axis: LinearAxis, factor: float) -> list[tuple[Row, Box]]:
    """Return the parts above zero with the rectangle of each."""
    found: list[tuple[Row, Box]] = []
    left = 0.0
    for row in rows:
        if row["value_SI"] > 0.0:
            right = left + axis.pixel(row["value_SI"] / factor)
            found.append((row, Box(left, top, right, top + BAR)))
            left = right
    return found


def _bar(canvas: Canvas, segments: Sequence[tuple[Row, Box]], top: float, unit: str) -> None:
    """Draw one stacked bar with its words inside, or below it where a segment is narrow."""
    words: list[Words] = []
    below: list[tuple[float, str]] = []
    every: list[tuple[float, str]] = []
    total = sum(row["value_SI"] for row, _ in segments)
    for row, box in segments:
        left, right = box.left, box.right
        fill, lined = FILLS.get(row["part"], ("#ffffff", False))
        canvas.boxes([box], color=fill, stroke=INK, strokeWidth=0.8)
        if lined and right - left > 3.0:
            canvas.rules(hatch(box, 6.0), color="#a8a8a8", strokeWidth=0.8)
        if row["share"] >= SMALL:
            percent = f" {number(100.0 * row['share'])} %"
            name = fitted(row["part"], 150.0)[0]
            text = f"{name}{percent}".replace(" ", "\u00a0")
            every.append((0.5 * (left + right), text))
            if text_width(text) + 8.0 <= right - left:
                half = 0.5 * text_width(text) + 2.0
                middle = 0.5 * (left + right)
                if lined:
                    canvas.boxes([Box(middle - half, top + 6.0, middle + half, top + BAR - 6.0)], color="white")
                words.append(Words(text, middle, top + 0.5 * BAR, "center"))
            else:
                below.append((0.5 * (left + right), text))
    left = segments[-1][1].right if segments else 0.0
    said = amount(total, unit, 3)
    words.append(Words(said, left + 5.0, top + 0.5 * BAR, bold=True))
    beside = left + 17.0 + text_width(said, bold=True)
    if len(below) > 1 and beside < 0.55 * canvas.x.size:  # a short bar: its parts in order, beside it
        listing = "from the left: " + ", ".join(text for _, text in every)
        lines = fitted(listing, canvas.x.size - beside - 4.0, 3)
        words += [
            Words(line, beside, top + 0.5 * BAR + 13.0 * (i - 0.5 * (len(lines) - 1))) for i, line in enumerate(lines)
        ]
    else:
        _below(canvas, below, words, top + BAR, canvas.x.size)
    canvas.words(words)


def _below(canvas: Canvas, below: Sequence[tuple[float, str]], words: list[Words], bottom: float, limit: float) -> None:
    """Write narrow segments in two lines under the bar, each with a leader, without overlap."""
    ends = [0.0, 0.0]
    for place, text in below:
        width = text_width(text) + 10.0
        line = min((0, 1), key=lambda k: (max(ends[k], place - 4.0) + width > limit, max(ends[k] - place, 0.0)))
        start = min(max(ends[line], place - 4.0), limit - width)
        y = bottom + 12.0 + 14.0 * line
        canvas.rules([(place, bottom, place, bottom + 3.0), (place, bottom + 3.0, start + 4.0, y - 5.0)])
        words.append(Words(text, start, y))
        ends[line] = start + width


def _panel(
    record: Record, rows: Sequence[Row], quantity: str, width: float, left: float
) -> tuple[list[Row], float, str, tuple[Spot, ...]] | None:
    """Return layers, height, words and places of one quantity."""
    rows = [row for row in rows if row["quantity"] == quantity]
    sides = _sides(record, rows)
    if not sides:
        return None
    unit = rows[0]["unit"]
    totals = {key: sum(row["value_SI"] for row in mine) for key, mine in sides}
    largest = max(totals.values())
    shown, shown_unit = scaled(largest, unit)
    factor = largest / shown
    ticks, end = _nice(shown)
    label = {"time": "time per operation", "energy": "energy per operation"}[quantity]
    room = width / (1.0 - 86.0 / width)
    axis = LinearAxis(
        0.0, end * room / width, width, f"{label} ({shown_unit})", tuple((tick, number(tick, 3)) for tick in ticks)
    )
    height = ROW * len(sides) + 8.0
    canvas = Canvas(axis, LinearAxis(height, 0.0, height, vertical=True))
    canvas.frame()
    words, first, spots = [], 0, Spots(left, PAD)
    for position, (key, mine) in enumerate(sides):
        top = 8.0 + ROW * position
        name = fitted(side_name(record, key), left - 12.0, 2, bold=True)
        canvas.words(
            [
                Words(line, -10.0, top + 0.5 * BAR + 13.0 * (i - 0.5 * (len(name) - 1)), "right", bold=True)
                for i, line in enumerate(name)
            ]
        )
        segments = _segments(mine, top, axis, factor)
        _bar(canvas, segments, top, unit)
        places = {row["part"]: first + index for index, row in enumerate(mine)}
        first += len(mine)
        for row, box in segments:
            said = f"{side_name(record, key)}, {quantity}, {row['part']}: {amount(row['value_SI'], unit, 3)}"
            share = f"{number(100.0 * row['share'])} % of {amount(totals[key], unit, 3)}"
            place = anchor_of(record, row["role"], row["side"], quantity)
            spots.bar(box, places[row["part"]], f"{said}, {share}", place)
        big = [f"{row['part']} {number(100 * row['share'])} %" for row in mine if row["share"] >= SMALL]
        words.append(f"{side_name(record, key)} {amount(totals[key], unit)} ({', '.join(big)})")
    return canvas.layers, height, f"{label.capitalize()}: {'; '.join(words)}.", spots.found()


def where_it_goes(record: Record, width: float = WIDTH, left: float = LEFT) -> tuple[Chart, Chart]:
    """Draw time and energy, one chart each, at the primary design points."""
    policy = record["policies"][0]["policy"]
    rows = [row for row in part_rows(record) if row["policy"] == policy]
    charts = []
    for quantity in ("time", "energy"):
        key, title = f"{quantity}-parts", f"Where the {quantity} goes"
        panel = _panel(record, rows, quantity, width, left)
        if panel is None:
            words = "Not drawn: no side has a permitted design point under the primary policy."
            charts.append(Chart(key, title, None, words, words))
            continue
        layers, height, words, spots = panel
        drawing = checked(spec(layers, width, height, (left, PAD, 12.0, 48.0)))
        caption = (
            f"At the design points of the primary policy ({policy_name(policy)}), both bars on one scale from zero. "
            f"{words} Parts below 5 % are in the table."
        )
        points = tuple(
            {name: row[name] for name in ("side", "role", "part", "value_SI", "unit", "share")}
            for _, mine in _sides(record, [row for row in rows if row["quantity"] == quantity])
            for row in mine
        )
        charts.append(Chart(key, title, drawing, caption, words, points, spots))
    return charts[0], charts[1]
