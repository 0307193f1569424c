"""Requirement margins: bars in decades from the limit, pass to the right, fail to the left (layer 9)."""

from __future__ import annotations

import itertools
import math
from collections.abc import Mapping, Sequence
from typing import Any

from benchmark.report.drawing import Canvas, Words
from benchmark.report.figure import Chart, Row, checked
from benchmark.report.placing import Box, fitted, hatch, text_width
from benchmark.report.spots import Spots
from benchmark.report.style import INK, LinearAxis, spec
from benchmark.report.words import amount, is_number, listed, number, requirement_name

__all__ = ["decades", "margin_words", "requirement_margins"]

Record = Mapping[str, Any]
WIDTH, LEFT, RIGHT = 316.0, 150.0, 240.0
LINE, BAR, TOP = 13.0, 16.0, 6.0
#: bars are drawn at most this far; what lies beyond says so in words
MOST = 4.0
FAIL, PASS = "#D55E00", "#0072B2"


def decades(margin: Any) -> float | None:
    """Return log10 of a margin factor; infinite ends for no limit and for nothing; None when unknown."""
    if margin == "infinite":
        return math.inf
    if margin == "-infinite" or (is_number(margin) and margin <= 0.0):
        return -math.inf
    return math.log10(margin) if is_number(margin) else None


def margin_words(row: Mapping[str, Any]) -> str:
    """Say state and margin: "pass, 1.6 times the limit", "fail, 0.93 of the limit", "unknown"."""
    margin = row["margin"]
    if row["state"] == "unknown":
        return "unknown" if not is_number(margin) else f"unknown (shown: factor {number(margin, 2, (1.0,))})"
    if margin == "infinite":
        return f"{row['state']}, nothing used of the limit"
    if decades(margin) == -math.inf:
        return f"{row['state']}, nothing offered"
    return f"{row['state']}, factor {number(margin, 2, (1.0,))}"


def _order(row: Row) -> tuple[float, str]:
    """Failures first, then unknown ones, then passes by margin."""
    place = row["decades"]
    if row["state"] == "fail":
        return (-1e6 if place is None else max(place, -1e5), row["name"])
    return (-1e-9 if place is None or row["state"] == "unknown" else min(place, 1e6), row["name"])


def _beside(row: Row, room: float) -> list[tuple[str, bool]]:
    """Return the lines written beside a bar, and whether each is bold: state and margin, what is offered, demanded."""
    bold = row["state"] != "pass"
    offered, demanded = (amount(row[name], row["unit"], 2) for name in ("offered", "demanded"))
    offer = [f"offered {offered}, demanded {demanded}"]
    if text_width(offer[0]) > room:
        offer = [fitted(f"offered {offered}", room)[0], fitted(f"demanded {demanded}", room)[0]]
    return [(line, bold) for line in fitted(margin_words(row), room, 2, bold=bold)] + [(line, False) for line in offer]


def _name(row: Row) -> str:
    offered, demanded = (amount(row[name], row["unit"], 3) for name in ("offered", "demanded"))
    return f"{requirement_name(row['name'])}: {margin_words(row)}; offered {offered}, demanded {demanded}"


def _axis(rows: Sequence[Row], width: float) -> LinearAxis:
    known = [row["decades"] for row in rows if row["decades"] is not None and math.isfinite(row["decades"])]
    low = max(-MOST, math.floor(min([*known, -0.5]) * 2.0) / 2.0 - 0.25)
    high = min(MOST, math.ceil(max([*known, 0.5]) * 2.0) / 2.0 + 0.25)
    ticks = [
        (float(k), "limit" if k == 0 else f"×{number(10.0**k)}" if k > 0 else f"÷{number(10.0**-k)}")
        for k in range(math.ceil(low), math.floor(high) + 1)
    ]
    if len(ticks) < 3:
        halves = [(math.log10(2.0), "×2"), (-math.log10(2.0), "÷2"), (math.log10(5.0), "×5"), (-math.log10(5.0), "÷5")]
        ticks = sorted([*ticks, *(tick for tick in halves if low <= tick[0] <= high)])
    apart = width / (high - low) * min((b[0] - a[0] for a, b in itertools.pairwise(ticks)), default=high - low)
    stride = math.ceil(34.0 / apart)
    if stride > 1:  # the limit stays
        zero = next((position for position, tick in enumerate(ticks) if tick[0] == 0.0), 0)
        ticks = [tick for position, tick in enumerate(ticks) if (position - zero) % stride == 0]
    return LinearAxis(low, high, width, "margin (factor beyond the limit, log scale)", tuple(ticks))


def _bar(canvas: Canvas, axis: LinearAxis, row: Row, middle: float) -> None:
    zero, place = axis.pixel(0.0), row["decades"]
    top, bottom = middle - BAR / 2.0, middle + BAR / 2.0
    if row["state"] == "unknown" or place is None:
        half = 26.0
        canvas.boxes(
            [Box(zero - half, top, zero + half, bottom)], color="white", stroke=INK, strokeWidth=1.2, strokeDash=[4, 3]
        )
        canvas.words([Words("?", zero, middle, "center", bold=True)])
        return
    clipped = min(max(place, axis.low), axis.high)
    end = axis.pixel(clipped)
    box = Box(min(zero, end), top, max(zero, end), bottom)
    failed = row["state"] == "fail"
    canvas.boxes([box], color="white" if failed else PASS, stroke=FAIL if failed else PASS, strokeWidth=1.2)
    if failed:
        canvas.rules(hatch(box, 5.0), color=FAIL, strokeWidth=1.0)
    if clipped != place:  # the bar goes on: an open arrow head at its end
        tip = 7.0 if end > zero else -7.0
        canvas.rules(
            [(end - tip, top, end, middle), (end - tip, bottom, end, middle)], color="white" if not failed else FAIL
        )


def requirement_margins(record: Record, width: float = WIDTH, left: float = LEFT, right: float = RIGHT) -> Chart:
    """Draw every requirement, failures first."""
    key, title = "requirement-margins", "Requirement margins"
    rows: list[Row] = [
        {
            "name": row["name"],
            "state": row["state"],
            "decades": decades(row["margin"]),
            "margin": row["margin"],
            "demanded": row["demanded"],
            "offered": row["offered"],
            "unit": row["unit"],
        }
        for row in record["requirements"]
    ]
    if not rows:
        return Chart(key, title, None, "Not drawn: the study states no requirement.", "No requirement.")
    rows.sort(key=_order)
    axis = _axis(rows, width)
    beside = [_beside(row, right - 14.0) for row in rows]
    pitches = [LINE * len(lines) + 8.0 for lines in beside]
    height = sum(pitches) + 8.0
    canvas = Canvas(axis, LinearAxis(height, 0.0, height, vertical=True))
    canvas.frame()
    zero = axis.pixel(0.0)
    canvas.rules([(zero, 0.0, zero, height)], color=INK, strokeWidth=1.6)
    spots = Spots(left, TOP)
    for position, row in enumerate(rows):
        pitch = pitches[position]
        middle = 4.0 + sum(pitches[:position]) + 0.5 * pitch
        _bar(canvas, axis, row, middle)
        spots.bar(Box(0.0, middle - 0.5 * pitch, width, middle + 0.5 * pitch), position, _name(row))
        name = fitted(requirement_name(row["name"]), left - 14.0, 2, bold=True)
        texts = [
            (line, -10.0, "right", k - 0.5 * (len(name) - 1), row["state"] != "pass") for k, line in enumerate(name)
        ]
        lines = beside[position]
        texts += [
            (line, width + 10.0, "left", k - 0.5 * (len(lines) - 1), bold) for k, (line, bold) in enumerate(lines)
        ]
        canvas.words([Words(text, x, middle + LINE * k, align, bold=bold) for text, x, align, k, bold in texts])
    drawing = checked(spec(canvas.layers, width, height, (left, TOP, right, 48.0)))
    words = _summary(rows)
    points = tuple(
        {
            "requirement": row["name"],
            "state": row["state"],
            "margin_factor": "unknown" if row["margin"] is None else row["margin"],
            "margin_decades": _decade_word(row["decades"]),
            "offered": "not stated" if row["offered"] is None else row["offered"],
            "demanded": "not stated" if row["demanded"] is None else row["demanded"],
            "unit": row["unit"],
        }
        for row in rows
    )
    caption = (
        f"Margin of the candidate as a factor, on a log scale: pass to the right of the limit, fail (hatched) to the "
        f"left, unknown as an open bar with a question mark. {words}"
    )
    return Chart(key, title, drawing, caption, f"Requirement margins. {words}", points, spots.found())


def _decade_word(value: float | None) -> Any:
    if value is None:
        return "unknown"
    return value if math.isfinite(value) else ("infinite" if value > 0 else "-infinite")


def _state_words(row: Row) -> str:
    name, words = requirement_name(row["name"]), margin_words(row)
    said = words.removeprefix(row["state"]).lstrip(", ").strip("()")
    return f"{name} ({said})" if said else name


def _summary(rows: Sequence[Row]) -> str:
    by_state = {
        state: [_state_words(row) for row in rows if row["state"] == state] for state in ("fail", "unknown", "pass")
    }
    parts = [f"{len(by_state['pass'])} of {len(rows)} pass."]
    if by_state["fail"]:
        parts.append(f"Failed: {listed(by_state['fail'])}.")
    if by_state["unknown"]:
        parts.append(f"Unknown: {listed(by_state['unknown'])}.")
    return " ".join(parts)
