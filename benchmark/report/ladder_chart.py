"""The ladder of the reference as steps: the advantage as one mitigation after another is allowed (layer 9)."""

from __future__ import annotations

import itertools
from collections.abc import Mapping, Sequence
from typing import Any

from benchmark.record.text import ladder_words
from benchmark.report.advantage import level_lines_down, levels
from benchmark.report.drawing import Canvas, Words
from benchmark.report.figure import Chart, Row, checked
from benchmark.report.placing import cut, text_width
from benchmark.report.spots import Spots
from benchmark.report.style import GREY, INK, LinearAxis, LogAxis, spec
from benchmark.report.words import is_number, number

__all__ = ["ladder_steps"]

Record = Mapping[str, Any]
WIDTH, LEFT, RIGHT = 440.0, 150.0, 34.0
ROW, TOP, PAD = 30.0, 42.0, 6.0


def ladder_steps(record: Record, width: float = WIDTH, left: float = LEFT, right: float = RIGHT) -> Chart:
    """Draw one dot per rung, joined by steps, with lines at 1 and the required advantage."""
    key, title = "ladder-steps", "Ladder of the reference"
    found = next((row for row in record.get("ladder", ()) if row["of"] == "reference"), None)
    rows = [_row(rung) for rung in found["rungs"]] if found is not None else []
    known = [row for row in rows if is_number(row["advantage"]) and row["advantage"] > 0.0]
    if found is None or len(known) < 2:
        words = "Not drawn: fewer than two rungs have an advantage."
        return Chart(key, title, None, words, words)
    values = [*(row["advantage"] for row in known), *(level for level, _ in levels(record))]
    x = LogAxis.around(values, width, "1", "advantage (reference / candidate)", room=0.12)
    height = TOP + ROW * len(rows) + 4.0
    canvas = Canvas(x, LinearAxis(height, 0.0, height, vertical=True))
    canvas.frame()
    level_lines_down(canvas, x, record, height)
    spots = Spots(left, PAD)
    places = [(x.pixel(row["advantage"]), _middle(rows.index(row))) for row in known]
    for (x0, y0), (x1, y1) in itertools.pairwise(places):
        canvas.rules([(x0, y0, x0, y1), (x0, y1, x1, y1)], color=INK, strokeWidth=1.6)
    limits = [level for level, _ in levels(record)]
    labels = []
    for position, row in enumerate(rows):
        middle = _middle(position)
        turn = row["rung"] == found["turn"]
        labels.append(Words(cut(row["rung"], left - 14.0), -10.0, middle, "right", bold=turn))
        if row not in known:
            labels.append(Words(row["advantage"] if isinstance(row["advantage"], str) else "infeasible", 4.0, middle))
            continue
        place = x.pixel(row["advantage"])
        shape = "circle" if row["offered"] else "diamond"
        fill = INK if row["offered"] else GREY
        canvas.symbols([(place, middle)], shape=shape, size=60, color=fill, stroke=INK, strokeWidth=1.0)
        text = number(row["advantage"], 2, limits)
        # the line comes from the right where the advantage falls: the number stands on the other side
        before = next((x.pixel(one["advantage"]) for one in reversed(rows[:position]) if one in known), place)
        room = 12.0 + text_width(text, bold=turn)
        to_the_left = (before > place and place > room) or place + room > width
        labels.append(
            Words(
                text, place - 9.0 if to_the_left else place + 9.0, middle, "right" if to_the_left else "left", bold=turn
            )
        )
        spots.mark(place, middle, position, f"{row['rung']}: advantage {text}")
    canvas.words(labels, back=True)
    said = ladder_words(record, found)
    caption = (
        f"One mitigation more is allowed from rung to rung, the candidate keeps all of its own; the rung where "
        "the required advantage turns is in bold. Grey diamonds: not offered by the study, so nothing changes there. "
        f"{said}"
    )
    drawing = checked(spec(canvas.layers, width, height, (left, PAD, right, 48.0)))
    return Chart(key, title, drawing, caption, f"{title}. {_alternative(rows)} {said}", tuple(rows), spots.found())


def _row(rung: Record) -> Row:
    advantage = rung["advantage"]
    return {
        "rung": rung["name"],
        "offered": bool(rung["offered"]),
        "advantage": advantage if is_number(advantage) or isinstance(advantage, str) else "infeasible",
        "strongest_contender": rung["side"] or "none",
    }


def _middle(position: int) -> float:
    return TOP + ROW * (position + 0.45)


def _alternative(rows: Sequence[Row]) -> str:
    said = [
        f"{row['rung']} {number(row['advantage']) if is_number(row['advantage']) else row['advantage']}" for row in rows
    ]
    return f"Rungs and their advantages: {'; '.join(said)}."
