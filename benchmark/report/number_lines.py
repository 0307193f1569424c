"""Break-evens as number lines: for every axis where the advantage is 1 and the required one, and who is better (9)."""

from __future__ import annotations

import itertools
from collections.abc import Mapping, Sequence
from typing import Any

from benchmark.report.drawing import Canvas, Words
from benchmark.report.figure import Chart, Row, checked
from benchmark.report.placing import Box, Placer, cut, fitted, hatch, text_width
from benchmark.report.spots import Spots
from benchmark.report.style import GREY, INK, LinearAxis, LogAxis, spec
from benchmark.report.words import flat_powers, is_number, listed, number, spaced

__all__ = ["number_lines"]

Record = Mapping[str, Any]
WIDTH, LEFT, RIGHT, PAD = 470.0, 186.0, 16.0, 8.0
ROW = 76.0
KEY, TITLE = "break-even-lines", "Break-evens and required values, axis by axis"
BLUE = "#0072B2"
#: a line whose ends lie further apart than this factor is logarithmic
LOGARITHMIC = 4.0
#: answer -> words where a level is not crossed inside the range
_ANSWERS = {
    "always": "reached at every permitted value",
    "never": "reached at no permitted value",
    "unreachable": "unreachable",
    "no effect": "no effect",
    "undefined": "infeasible over the whole range",
}
#: answers that say all without naming a level
_WHOLE = ("no effect", "infeasible over the whole range")


def number_lines(record: Record, width: float = WIDTH, left: float = LEFT, right: float = RIGHT) -> Chart:
    """Draw one line per axis of the break-evens in the record."""
    block = next((row for row in record.get("need", ()) if row["key"] == "break-evens"), None)
    rows = [] if block is None else [_row(row) for row in block["rows"] if is_number(row["low"])]
    groups = [list(group) for _, group in itertools.groupby(rows, key=lambda row: row["key"])]
    if not groups:
        words = "Not drawn: break-evens were not asked for, or no axis has a range."
        return Chart(KEY, TITLE, None, words, words)
    height = ROW * len(groups) + 4.0
    canvas = Canvas(LinearAxis(0.0, width, width), LinearAxis(height, 0.0, height, vertical=True))
    canvas.frame()
    spots = Spots(left, PAD)
    required = float(record["study"]["required_advantage"])
    start = 0
    for position, group in enumerate(groups):
        top = ROW * position
        line = _Line(group, width, top, required)
        line.draw(canvas)
        canvas.words(_names(group[0], left, top))
        for index, row in enumerate(group):
            place = line.axis.pixel(row["value"]) if is_number(row["value"]) else line.axis.pixel(row["today"])
            spots.mark(place, line.middle, start + index, _said(row))
        start += len(group)
    drawing = checked(spec(canvas.layers, width, height, (left, PAD, right, 8.0)))
    now = rows[0]["advantage_today"]
    caption = (
        f"Advantage today: {number(now, 3, (1.0, required)) if is_number(now) else now}. "
        "One line per value, the others at their best estimate, both sides re-optimised everywhere. Grey band: "
        "plausible range. Filled circle: today. Upright strokes: where the advantage is 1 and, thicker, the required "
        f"{number(required, 3)}. Solid: the candidate is better; bar: by the required advantage or more; dashed: the "
        "reference is better; hatched: infeasible, a side has no permitted point."
    )
    alternative = f"{TITLE}. {' '.join(_said(row) + '.' for row in rows)}"
    return Chart(KEY, TITLE, drawing, caption, alternative, tuple(rows), spots.found())


def _row(row: Record) -> Row:
    """Return a row of the record as the chart draws it; numbers in the unit it names."""
    return {
        "key": row["name"],
        "unit": row["unit"],
        "range_low": row["low"],
        "range_high": row["high"],
        "today": row["today"],
        "advantage_today": row["advantage_today"] if is_number(row["advantage_today"]) else "infeasible",
        "level": row["level"],
        "answer": row["answer"],
        "value": row["value"] if is_number(row["value"]) else _ANSWERS.get(row["answer"], "none"),
        "reached": row["advantage_at_or_above_level"] or "-",
        "permitted_from": row["advantage_from"] if is_number(row["advantage_from"]) else "infeasible",
        "permitted_to": row["advantage_to"] if is_number(row["advantage_to"]) else "infeasible",
    }


def _name(row: Row) -> tuple[str, str]:
    owner, _, name = row["key"].rpartition(".")
    return name.replace("_", " "), owner


def _names(row: Row, left: float, top: float) -> list[Words]:
    name, owner = _name(row)
    beside = owner not in ("", "study")
    words = [Words(cut(name, left - 14.0, bold=True), -10.0, top + (34.0 if beside else 41.0), "right", bold=True)]
    return [*words, *([Words(cut(f"of {owner}", left - 14.0), -10.0, top + 48.0, "right")] if beside else [])]


def _said(row: Row) -> str:
    name, owner = _name(row)
    head = f"{name} of {owner}" if owner else name
    if is_number(row["value"]):
        reached = "" if row["reached"] == "-" else f", reached {row['reached']}"
        return f"{head}: advantage {number(row['level'], 3)} at {spaced(row['value'], row['unit'])}{reached}"
    return f"{head}: advantage {number(row['level'], 3)} {row['value']}"


class _Line:
    """One number line: its axis, and for every stretch who is better."""

    def __init__(self, rows: Sequence[Row], width: float, top: float, required: float) -> None:
        self.rows, self.required, self.top, self.middle = rows, required, top, top + 41.0
        first = rows[0]
        self.low, self.high, self.today = first["range_low"], first["range_high"], first["today"]
        self.marks = [row for row in rows if is_number(row["value"])]
        values = [self.low, self.high, self.today, *(row["value"] for row in self.marks)]
        positive = [value for value in values if value > 0.0]
        smallest, largest = min(values), max(values)
        self.axis: LogAxis | LinearAxis
        if smallest >= 0.0 and first["unit"] != "degC" and max(positive) / min(positive) > LOGARITHMIC:
            # a range that begins at 0 is drawn from a tenth of the smallest number on
            start = smallest if smallest > 0.0 else min(positive) / 10.0
            self.axis = LogAxis(start, largest, width, "1", "")
        else:
            self.axis = LinearAxis(smallest, largest if largest > smallest else smallest + 1.0, width)

    def pixel(self, value: float) -> float:
        """Return the place of a number on the line; 0 on a logarithmic line is its left end."""
        return self.axis.pixel(max(value, self.axis.low))

    def reached(self, level: float, x: float) -> bool:
        """Tell whether a level is reached at a number of the line between its crossings."""
        found = [row for row in self.rows if row["level"] == level]
        crossings = sorted((row for row in found if is_number(row["value"])), key=lambda row: row["value"])
        if not crossings:
            answer = found[0]["answer"] if found else ""
            today = found[0]["advantage_today"] if found else "none"
            return answer == "always" or (answer == "no effect" and is_number(today) and today >= level)
        before = [row for row in crossings if row["value"] < x]
        return bool(before[-1]["reached"] == "above" if before else crossings[0]["reached"] == "below")

    def stretches(self) -> list[tuple[float, float, str]]:
        """Return pieces of the plausible range, from, to and who is better there."""
        first = self.rows[0]
        if not is_number(first["permitted_from"]):
            return [(self.low, self.high, "infeasible")]
        start, end = first["permitted_from"], first["permitted_to"]
        inside = sorted({row["value"] for row in self.marks if start < row["value"] < end})
        edges = [start, *inside, end]
        found = []
        if start > self.low:
            found.append((self.low, start, "infeasible"))
        for a, b in itertools.pairwise(edges):
            x = 0.5 * (a + b)
            state = "reference better"
            if self.reached(1.0, x):
                state = "candidate better"
            if self.required != 1.0 and self.reached(self.required, x):
                state = f"{number(self.required, 3)} or more"
            if found and found[-1][2] == state:
                found[-1] = (found[-1][0], b, state)
            else:
                found.append((a, b, state))
        if end < self.high:
            found.append((end, self.high, "infeasible"))
        return found

    def draw(self, canvas: Canvas) -> None:
        """Draw band, stretches, marks and words."""
        middle, width = self.middle, canvas.x.size
        low, high = self.pixel(self.low), self.pixel(self.high)
        if self.top > 0.0:
            canvas.rules([(0.0, self.top, width, self.top)], color="#bdbdbd", strokeWidth=0.8)
        canvas.rules([(0.0, middle, width, middle)], color=GREY, strokeWidth=0.8)
        canvas.boxes([Box(low, middle - 9.0, high, middle + 9.0)], color="#ececec")
        labels: list[Words] = []
        placer = Placer(Box(2.0, self.top + 2.0, width - 2.0, self.top + ROW - 2.0))
        for a, b, state in self.stretches():
            box = Box(self.pixel(a), middle - 9.0, self.pixel(b), middle + 9.0)
            self._stretch(canvas, box, state)
            half, today = 0.5 * text_width(state) + 5.0, self.pixel(self.today)
            places = [box.left + share * (box.right - box.left) for share in (0.5, 0.25, 0.75)]
            clear = [x for x in places if box.left + half <= x <= box.right - half and abs(x - today) > half + 6.0]
            labels += [Words(state, x, middle, "center") for x in clear[:1]]
        placer.boxes.append(Box(0.0, middle - 9.0, width, middle + 9.0))
        ends = self._ends(low, high, width)
        for row in self.marks:
            x, thick = self.pixel(row["value"]), row["level"] == self.required
            canvas.rules([(x, middle - 12.0, x, middle + 12.0)], color=INK, strokeWidth=3.0 if thick else 1.6)
        x = self.pixel(self.today)
        canvas.words(labels, back=True)
        canvas.symbols([(x, middle)], shape="circle", size=70, color=INK, stroke="white", strokeWidth=1.0)
        canvas.words(ends)
        for item in ends:
            half = text_width(flat_powers(item.text))
            placer.boxes.append(Box(item.x - half, item.y - 6.5, item.x + half, item.y + 6.5))
        self._labels(canvas, placer)

    def _without_crossing(self) -> str:
        """Say which levels are not crossed, those with the same answer together."""
        levels: dict[str, list[str]] = {}
        for row in self.rows:
            if not is_number(row["value"]):
                levels.setdefault(row["value"], []).append(number(row["level"], 3))
        return "; ".join(
            answer if answer in _WHOLE else f"{listed(found)} {answer}" for answer, found in levels.items()
        )

    def _stretch(self, canvas: Canvas, box: Box, state: str) -> None:
        middle = self.middle
        if state == "infeasible":
            canvas.rules(hatch(box, 6.0), color="#a8a8a8", strokeWidth=0.8)
        elif state == "reference better":
            canvas.rules([(box.left, middle, box.right, middle)], color=INK, strokeWidth=1.6, strokeDash=[5, 4])
        elif state == "candidate better":
            canvas.rules([(box.left, middle, box.right, middle)], color=BLUE, strokeWidth=3.0)
        else:
            bar = Box(box.left, middle - 5.0, box.right, middle + 5.0)
            canvas.boxes([bar], color="#bcd7ea", stroke=BLUE, strokeWidth=1.0)

    def _ends(self, low: float, high: float, width: float) -> list[Words]:
        """Return the ends of the plausible range, below the line."""
        unit, y = self.rows[0]["unit"], self.middle + 22.0
        texts = [spaced(self.low, unit, 3), spaced(self.high, unit, 3)]
        first = Words(texts[0], max(low, 2.0), y, "left")
        second = Words(texts[1], min(high, width - 2.0), y, "right")
        return [first, second]

    def _labels(self, canvas: Canvas, placer: Placer) -> None:
        """Write today's number, every crossing, and what is never crossed, where there is room."""
        unit, middle = self.rows[0]["unit"], self.middle
        wanted = [(f"today {spaced(self.today, unit, 3)}", self.pixel(self.today), False)]
        for row in self.marks:
            text = f"{number(row['level'], 3)} at {spaced(row['value'], unit, 3)}"
            text += " (jump)" if row["answer"] == "jump" else ""
            wanted.append((text, self.pixel(row["value"]), row["level"] == self.required))
        words = []
        for text, x, bold in sorted(wanted, key=lambda item: item[1]):
            half = 0.5 * text_width(flat_powers(text), bold=bold) + 1.0
            place = min(max(x, half), canvas.x.size - half)
            rows = [middle - 20.0, middle + 22.0, middle - 31.0]
            boxes = [Box(place - half, y - 6.5, place + half, y + 6.5) for y in rows]
            costs = [sum(box.overlap(other) for other in placer.boxes) for box in boxes]
            chosen = costs.index(min(costs))
            placer.boxes.append(boxes[chosen])
            words.append(Words(text, place, rows[chosen], "center", bold=bold))
        text = self._without_crossing()
        if text:
            room = canvas.x.size - 4.0
            half = text_width(text)
            tops = [(2.0, middle - 20.0), (canvas.x.size - 2.0 - half, middle - 20.0), (2.0, middle - 31.0)]
            boxes = [Box(x, y - 6.5, x + half, y + 6.5) for x, y in tops]
            costs = [sum(box.overlap(other) for other in placer.boxes) for box in boxes]
            x, y = tops[costs.index(min(costs))]
            words.append(Words(fitted(text, room)[0], max(x, 2.0), y))
        canvas.words(words)
