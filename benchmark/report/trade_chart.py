"""Two values against each other: where the required advantage is met, what limits it, and today's draws (layer 9)."""

from __future__ import annotations

import itertools
import math
from collections.abc import Mapping, Sequence
from typing import Any

from benchmark.report.drawing import Canvas, Label
from benchmark.report.figure import Chart, Row, checked
from benchmark.report.placing import Box, Placer, hatch, wrapped
from benchmark.report.spots import Spots
from benchmark.report.style import GREY, INK, LinearAxis, LogAxis, spec
from benchmark.report.words import is_number, number, plural, spaced

__all__ = ["trade_chart"]

Record = Mapping[str, Any]
WIDTH, HEIGHT = 600.0, 360.0
MARGINS = (72.0, 10.0, 14.0, 48.0)
KEY, TITLE = "trade-curve", "One value against another"
BLUE = "#0072B2"


def trade_chart(record: Record, width: float = WIDTH, height: float = HEIGHT) -> Chart:
    """Draw the required value of one parameter for every value of another."""
    block = next((row for row in record.get("need", ()) if row["key"] == "trade"), None)
    rows = [] if block is None else [_row(row) for row in block["rows"]]
    if not any(is_number(row["second_value"]) for row in rows):
        words = "Not drawn: no trade curve was worked out, or no value of the second parameter meets the level."
        return Chart(KEY, TITLE, None, words, words)
    first = rows[0]
    x = _axis(rows, "first_value", width, f"{_name(first['first'])}{_unit(first['first_unit'])}")
    y = _axis(rows, "second_value", height, f"{_name(first['second'])}{_unit(first['second_unit'])}", vertical=True)
    canvas, placer = Canvas(x, y), Placer(Box(3.0, 3.0, width - 3.0, height - 3.0))
    canvas.frame()
    labels = _limits(canvas, rows, placer)
    today = next(row for row in rows if row["kind"] == "today")
    samples = [row for row in rows if row["kind"] == "sample" and _inside(row, x, y)]
    level = first["level"]
    for row in samples:
        placer.avoid_point(x.pixel(row["first_value"]), y.pixel(row["second_value"]))
    for reached, fill in ((False, "white"), (True, GREY)):
        chosen = [row for row in samples if _reaches(row, level) == reached]
        canvas.marks(chosen, "first_value", "second_value", shape="circle", size=22, fill=fill, stroke=GREY)
    roots = [row for row in rows if row["kind"] in ("root", "jump")]
    curve = _runs(rows)
    canvas.path(curve, "first_value", "second_value", color=BLUE, strokeWidth=2.6)
    placer.avoid_line([(x.pixel(row["first_value"]), y.pixel(row["second_value"])) for row in roots])
    canvas.marks(roots, "first_value", "second_value", shape="square", size=26, color=BLUE)
    spots = Spots(*MARGINS[:2])
    for row in roots:
        spots.mark(x.pixel(row["first_value"]), y.pixel(row["second_value"]), rows.index(row), _said(row))
    if roots:
        middle = roots[len(roots) // 2]
        lines = wrapped(f"advantage {number(level, 3)}; {number(level, 3)} or more {middle['reached']}", 26)
        at = [(x.pixel(row["first_value"]), y.pixel(row["second_value"])) for row in roots]
        placed = placer.place(lines, at, bold=True)
        labels += [Label(placed, "#005A8D", True)] if placed else []
    place = x.pixel(today["first_value"]), y.pixel(today["second_value"])
    canvas.symbols([place], shape="diamond", size=150, color=INK, stroke="white", strokeWidth=1.2)
    spots.mark(*place, rows.index(today), _said(today))
    placer.avoid_mark(*place)
    placed = placer.place([f"today: advantage {_advantage(today)}"], [place])
    labels += [Label(placed)] if placed else []
    canvas.leaders(labels)
    canvas.backs(labels)
    canvas.words([words for label in labels for words in label.words()])
    drawing = checked(spec(canvas.layers, width, height, MARGINS))
    hidden = sum(row["kind"] == "sample" for row in rows) - len(samples)
    caption = _caption(rows, level, hidden)
    shown = [row for row in rows if row["kind"] != "sample" or row in samples]
    # rows that were left out stand last, so the places of the others hold
    alternative = f"{TITLE}. {caption} {' '.join(_said(row) + '.' for row in [today, *roots])}"
    return Chart(KEY, TITLE, drawing, caption, alternative, tuple(shown), spots.found())


def _row(row: Record) -> Row:
    words = {"always": "any value will do", "never": "no value will do", "undefined": "infeasible"}
    kept = {name: row[name] for name in ("first", "first_unit", "first_value", "second", "second_unit")}
    return kept | {
        "key": row["second"],
        "kind": row["answer"],
        "second_value": row["second_value"] if is_number(row["second_value"]) else words.get(row["answer"], "none"),
        "level": row["level"],
        "advantage": row["advantage"] if is_number(row["advantage"]) else "-",
        "reached": row["at_or_above_level"] or "-",
        "meets_requirements": row["meets_requirements"] or "-",
        "permitted_from": row["second_low"] if is_number(row["second_low"]) else "-",
        "permitted_to": row["second_high"] if is_number(row["second_high"]) else "-",
        "ends_below": row["cut_below"] or "-",
        "ends_above": row["cut_above"] or "-",
    }


def _name(key: str) -> str:
    return key.rpartition(".")[2].replace("_", " ")


def _unit(unit: str) -> str:
    return "" if unit == "1" else f" ({unit})"


def _advantage(row: Row) -> str:
    return number(row["advantage"], 3) if is_number(row["advantage"]) else "none"


def _reaches(row: Row, level: float) -> bool:
    return is_number(row["advantage"]) and row["advantage"] >= level and row["meets_requirements"] == "yes"


def _said(row: Row) -> str:
    first = f"{_name(row['first'])} {spaced(row['first_value'], row['first_unit'])}"
    second = f"{_name(row['second'])} {spaced(row['second_value'], row['second_unit'])}"
    return f"{row['kind']}: {first}, {second}, advantage {_advantage(row)}"


def _axis(rows: Sequence[Row], field: str, size: float, title: str, *, vertical: bool = False) -> LogAxis | LinearAxis:
    """Fit an axis around the curve and today, and around the draws as far as a half more on either side."""
    values = [row[field] for row in rows if row["kind"] != "sample" and is_number(row[field])]
    values += [row[field] for row in rows if row["kind"] == "sample" and is_number(row[field])]
    if field == "second_value":
        values += [
            row[end]
            for row in rows
            for end, why in (("permitted_from", "ends_below"), ("permitted_to", "ends_above"))
            if row[why] != "-" and is_number(row[end])
        ]
    if min(values) > 0.0:
        return LogAxis.around(values, size, "1", title, vertical=vertical)
    low, high = min(values), max(values)
    room = 0.06 * (high - low) or 1.0
    step = 10.0 ** math.floor(math.log10((high - low) or 1.0))
    first, last = math.ceil((low - room) / step), math.floor((high + room) / step)
    ticks = tuple((k * step, number(k * step, 2)) for k in range(first, last + 1))
    return LinearAxis(low - room, high + room, size, title, ticks, vertical)


def _inside(row: Row, x: LogAxis | LinearAxis, y: LogAxis | LinearAxis) -> bool:
    return all(
        is_number(row[field]) and axis.low <= row[field] <= axis.high
        for field, axis in (("first_value", x), ("second_value", y))
    )


def _runs(rows: Sequence[Row]) -> list[Row]:
    """Return the points of the curve in the order of the first value; it breaks where there is none."""
    found: list[Row] = []
    run = 0
    asked = [row for row in rows if row["kind"] not in ("today", "sample")]
    for _, group in itertools.groupby(asked, key=lambda row: row["first_value"]):
        roots = [row for row in group if row["kind"] == "root"]
        if not roots:
            run += 1
        found += [{**row, "run": f"{run} {position}"} for position, row in enumerate(roots)]
    return found


def _limits(canvas: Canvas, rows: Sequence[Row], placer: Placer) -> list[Label]:
    """Draw where a side loses its last permitted point, hatched beyond, with what it is."""
    labels: list[Label] = []
    x, y = canvas.x, canvas.y
    for end, why, edge in (("permitted_to", "ends_above", 0.0), ("permitted_from", "ends_below", y.size)):
        known = [row for row in rows if row[why] != "-" and is_number(row[end]) and y.low <= row[end] <= y.high]
        if not known:
            continue
        points = [(x.pixel(row["first_value"]), y.pixel(row[end])) for row in known]
        lines = [(a, b, c, d) for (a, b), (c, d) in itertools.pairwise(points)]
        canvas.rules(lines or [(points[0][0] - 8.0, points[0][1], points[0][0] + 8.0, points[0][1])],
                     color=INK, strokeWidth=1.6, strokeDash=[8, 3, 2, 3])  # fmt: skip
        for (a, b), (c, d) in itertools.pairwise(points):
            top, bottom = sorted((edge, max(b, d) if edge else min(b, d)))
            if bottom - top > 3.0:
                canvas.rules(hatch(Box(a, top, c, bottom)), color="#bdbdbd")
        placer.avoid_line(points)
        words = wrapped(f"infeasible beyond: {known[len(known) // 2][why]}", 30, 4)
        placed = placer.place(words, points)
        labels += [Label(placed)] if placed else []
    return labels


def _caption(rows: Sequence[Row], level: float, hidden: int) -> str:
    first = rows[0]
    samples = [row for row in rows if row["kind"] == "sample"]
    words = [
        f"Value of {_name(first['second'])} that gives an advantage of {number(level, 3)} for each value of "
        f"{_name(first['first'])}, both sides re-optimised at every point. Squares: solved points. Diamond: today."
    ]
    if samples:
        reaching = sum(_reaches(row, level) for row in samples)
        words.append(
            f"Circles: {len(samples)} draws of both values from their stated ranges, the rest at the best estimate; "
            f"filled where the level is reached ({reaching})."
        )
    if hidden:
        words.append(f"{plural(hidden, 'draw')} outside the axes not shown.")
    for kind, said in (("never", "no value will do"), ("always", "any value will do"), ("undefined", "infeasible")):
        found = [row["first_value"] for row in rows if row["kind"] == kind]
        if found:
            span = f"{number(min(found), 3)} to " if len(found) > 1 else ""
            words.append(f"At {_name(first['first'])} {span}{spaced(max(found), first['first_unit'])}: {said}.")
    if any(row["ends_above"] != "-" or row["ends_below"] != "-" for row in rows):
        words.append("Hatched: infeasible, a side has no permitted point.")
    return " ".join(words)
