"""Opportunity map: where the candidate would be worth it, over the deadline and the activity or the duty (layer 9)."""

from __future__ import annotations

import itertools
from collections.abc import Mapping, Sequence
from typing import Any

from benchmark.report.drawing import Canvas, Label
from benchmark.report.figure import Chart, Row, checked
from benchmark.report.placing import Box, Placer, hatch
from benchmark.report.spots import Spots
from benchmark.report.style import GREY, INK, LogAxis, spec
from benchmark.report.words import amount, is_number, listed, number

__all__ = ["boundary_segments", "opportunity_charts"]

Record = Mapping[str, Any]
Place = tuple[float, float]
WIDTH, HEIGHT = 600.0, 400.0
MARGINS = (72.0, 10.0, 14.0, 48.0)
BLUE = "#0072B2"
#: second axis of a map -> key of the chart, title, words
_KINDS = {
    "map-activity": ("opportunity-activity", "Where it would be worth it: deadline and activity", "activity factor"),
    "map-duty": ("opportunity-duty", "Where it would be worth it: deadline and duty", "share of the time clocked"),
}
_LINES: dict[str, Row] = {
    "required": {"strokeWidth": 2.8},
    "equal": {"strokeWidth": 1.6},
    "below": {"strokeWidth": 1.2, "strokeDash": [2, 3]},
    "further": {"strokeWidth": 1.2, "strokeDash": [9, 4]},
}
#: an edge at which the advantage jumps: no level is taken there
_JUMP: Row = {"color": "#D55E00", "strokeWidth": 1.8, "strokeDash": [6, 3]}


def opportunity_charts(record: Record, width: float = WIDTH, height: float = HEIGHT) -> list[Chart]:
    """Draw every map of the record."""
    return [_chart(record, block, width, height) for block in record.get("need", ()) if block["key"] in _KINDS]


def _chart(record: Record, block: Record, width: float, height: float) -> Chart:
    key, title, name = _KINDS[block["key"]]
    rows = [_row(row) for row in block["rows"]]
    points = [row for row in rows if row["kind"] == "point"]
    # a value of 0 has no place on a logarithmic axis
    shown = [row for row in rows if row["value"] > 0.0 and row["deadline_s"] > 0.0]
    plotted = [row for row in shown if row["kind"] == "point"]
    if not plotted:
        words = "Not drawn: no point of the map was worked out."
        return Chart(key, title, None, words, words)
    required = float(record["study"]["required_advantage"])
    x = LogAxis.around([row["deadline_s"] for row in plotted], width, "s", "deadline: time per operation", room=0.03)
    y = LogAxis.around([row["value"] for row in plotted], height, "1", name, vertical=True, room=0.03)
    canvas, placer = Canvas(x, y), Placer(Box(3.0, 3.0, width - 3.0, height - 3.0))
    canvas.frame()
    today = next(row for row in rows if row["kind"] == "today")
    here = x.pixel(today["deadline_s"]), y.pixel(today["value"])
    placer.avoid_mark(*here, 9.0)
    for row in plotted:
        if is_number(row["advantage"]):
            placer.avoid_point(x.pixel(row["deadline_s"]), y.pixel(row["value"]))
    hatched = _infeasible(canvas, plotted)
    classes = _classes(canvas, record, [row for row in shown if row["kind"] == "class"])
    _points(canvas, plotted, required)
    jumps = _jumps(canvas, shown, placer)
    labels = _boundary(canvas, shown, required, placer)
    placed = placer.place([f"this study: {_advantage(today)}"], [here], bold=True)
    labels += [Label(placed, INK, True)] if placed else []
    labels += _named(hatched, classes, placer)
    spots = Spots(*MARGINS[:2])
    crossed = [row for row in shown if row["kind"] == "boundary" and row["level"] in (1.0, required)]
    for row in [*([today] if today in shown else []), *crossed, *jumps]:
        spots.mark(x.pixel(row["deadline_s"]), y.pixel(row["value"]), shown.index(row), _said(row))
    canvas.symbols([here], shape="diamond", size=150, color=INK, stroke="white", strokeWidth=1.2)
    canvas.leaders(labels)
    canvas.backs(labels)
    canvas.words([words for label in labels for words in label.words()])
    drawing = checked(spec(canvas.layers, width, height, MARGINS))
    caption = _caption(shown, required, len(points) - len(plotted))
    return Chart(key, title, drawing, caption, f"{title}. {caption} {_spoken(shown)}", tuple(shown), spots.found())


def _row(row: Record) -> Row:
    found = {"kind": row["kind"], "deadline_s": row["deadline_s"], "with": row["with"], "value": row["value"]}
    advantage = row["advantage"]
    return found | {
        "key": row["with"] if "." in row["with"] else f"study.{row['with']}",
        "advantage": advantage if is_number(advantage) else ("infeasible" if row["kind"] == "point" else "-"),
        "level": row["level"] if is_number(row["level"]) else "-",
        "strongest": row["strongest"] or "-",
        "meets_requirements": row["meets_requirements"] or "-",
        "reason": row["state"] or "-",
        "product_class": row["product_class"] or "-",
        "deadline_to_s": row["deadline_to_s"] if is_number(row["deadline_to_s"]) else "-",
        "value_to": row["value_to"] if is_number(row["value_to"]) else "-",
    }


def _advantage(row: Row) -> str:
    return f"advantage {number(row['advantage'], 3)}" if is_number(row["advantage"]) else "infeasible"


def _said(row: Row) -> str:
    if row["kind"] == "jump":
        over = f"jumps over {number(row['level'], 3)}"
        return f"jump: deadline {amount(row['deadline_s'], 's', 3)}, {number(row['value'], 3)}, the advantage {over}"
    word = "boundary" if row["kind"] == "boundary" else "this study"
    return f"{word}: deadline {amount(row['deadline_s'], 's', 3)}, {number(row['value'], 3)}, {_advantage(row)}"


def _cells(rows: Sequence[Row], axis: LogAxis, field: str) -> dict[float, tuple[float, float]]:
    """Return for every value of the grid where its cell begins and ends [pixel]: half way to its neighbours."""
    places = sorted({row[field] for row in rows}, key=axis.pixel)
    pixels = [axis.pixel(value) for value in places]
    middles = [0.5 * (a + b) for a, b in itertools.pairwise(pixels)]
    edges = [0.0, *middles, axis.size]
    return {value: (edges[k], edges[k + 1]) for k, value in enumerate(places)}


def _infeasible(canvas: Canvas, rows: Sequence[Row]) -> list[tuple[str, Place]]:
    """Hatch where a side has no permitted point; returns why, and the middle of each such part."""
    x, y = canvas.x, canvas.y
    if not isinstance(x, LogAxis) or not isinstance(y, LogAxis):
        return []
    across, along = _cells(rows, x, "deadline_s"), _cells(rows, y, "value")
    found: list[tuple[str, Place]] = []
    gone = [row for row in rows if not is_number(row["advantage"])]
    for reason in dict.fromkeys(row["reason"] for row in gone):
        group = [row for row in gone if row["reason"] == reason]
        boxes = [(across[row["deadline_s"]], along[row["value"]]) for row in group]
        canvas.rules([line for box in _merged(boxes) for line in hatch(box)], color="#bdbdbd")
        middle = group[len(group) // 2]
        found.append((reason, (x.pixel(middle["deadline_s"]), y.pixel(middle["value"]))))
    return found


def _named(
    hatched: Sequence[tuple[str, Place]], classes: Sequence[tuple[str, bool, Box]], placer: Placer
) -> list[Label]:
    """Write what is hatched and the names of the classes, the study's own first."""
    labels: list[Label] = []
    for name, own, box in sorted(classes, key=lambda item: not item[1]):
        at = [(box.left, box.top), (box.right, box.top), (box.left, box.bottom), (box.right, box.bottom)]
        placed = placer.place([name], at, bold=own, distances=(6.0, 12.0, 20.0, 30.0))
        labels += [Label(placed, "#4a4a4a", own)] if placed else []
    for reason, place in hatched:
        placed = placer.place(["infeasible:", *_short(reason)], [place], distances=(2.0, 20.0, 40.0))
        labels += [Label(placed)] if placed else []
    return labels


def _merged(cells: Sequence[tuple[Place, Place]]) -> list[Box]:
    """Join cells, each from and to across and along, into larger rectangles: upwards, then sideways."""
    columns: dict[Place, list[Place]] = {}
    for across, along in sorted(cells):
        runs = columns.setdefault(across, [])
        if runs and runs[-1][1] == along[0]:
            runs[-1] = (runs[-1][0], along[1])
        else:
            runs.append(along)
    found: list[tuple[Place, list[Place]]] = []
    for across, runs in sorted(columns.items()):
        if found and found[-1][1] == runs and found[-1][0][1] == across[0]:
            found[-1] = ((found[-1][0][0], across[1]), runs)
        else:
            found.append((across, runs))
    return [Box(left, top, right, bottom) for (left, right), runs in found for top, bottom in runs]


def _short(reason: str) -> list[str]:
    words = {"the candidate has no permitted point": "candidate", "no contender has a permitted point": "contenders"}
    return [words.get(reason, "cannot be evaluated")]


def _classes(canvas: Canvas, record: Record, rows: Sequence[Row]) -> list[tuple[str, bool, Box]]:
    """Outline the usual places of product classes, the study's own in bold; returns what is to be written where."""
    x, y = canvas.x, canvas.y
    found: list[tuple[str, bool, Box]] = []
    for row in rows:
        left, right = x.pixel(row["deadline_s"]), x.pixel(row["deadline_to_s"])
        top, bottom = y.pixel(row["value_to"]), y.pixel(row["value"])
        box = Box(max(left, 0.0), max(top, 0.0), min(right, x.size), min(bottom, y.size))
        if box.right - box.left < 4.0 or box.bottom - box.top < 2.0:
            continue
        own = row["product_class"] == record["study"]["product_class"]
        corners = [
            (box.left, box.top, box.right, box.top),
            (box.right, box.top, box.right, box.bottom),
            (box.right, box.bottom, box.left, box.bottom),
            (box.left, box.bottom, box.left, box.top),
        ]
        canvas.rules(corners, color=GREY, strokeWidth=1.6 if own else 0.9, strokeDash=[4, 2])
        found.append((row["product_class"], own, box))
    return found


def _points(canvas: Canvas, rows: Sequence[Row], required: float) -> None:
    """Draw one symbol per evaluated point: a shape for each side of 1 and of the required advantage."""
    known = [row for row in rows if is_number(row["advantage"])]
    groups = (
        ([row for row in known if row["advantage"] >= required], {"shape": "triangle-up", "size": 44, "color": BLUE}),
        (
            [row for row in known if 1.0 < row["advantage"] < required],
            {"shape": "circle", "size": 26, "fill": "white", "stroke": BLUE, "strokeWidth": 1.2},
        ),
        (
            [row for row in known if row["advantage"] < required and row["advantage"] <= 1.0],
            {"shape": "stroke", "size": 40, "stroke": "#8a8a8a", "strokeWidth": 1.2},
        ),
    )
    for group, look in groups:
        canvas.marks(group, "deadline_s", "value", **look)


def boundary_segments(rows: Sequence[Row], level: float, kind: str = "boundary") -> list[tuple[Place, Place]]:
    """Join the exact crossings of a level, cell by cell of the grid on whose lines they lie.

    Parameters
    ----------
    rows : sequence of mapping
        Rows of a map, of kind "point" and "boundary".
    level : float
        Advantage of the boundary.
    kind : "boundary" or "jump"
        Crossings that take the level, or places at which the advantage jumps over it.

    Returns
    -------
    list of ((deadline, value), (deadline, value))
        Straight pieces, each between two crossings on the edges of one cell.
    """
    across = sorted({row["deadline_s"] for row in rows if row["kind"] == "point"})
    along = sorted({row["value"] for row in rows if row["kind"] == "point"})
    found = [(row["deadline_s"], row["value"]) for row in rows if row["kind"] == kind and row["level"] == level]
    pieces: list[tuple[Place, Place]] = []
    for (x0, x1), (y0, y1) in itertools.product(itertools.pairwise(across), itertools.pairwise(along)):
        inside = sorted({(x, y) for x, y in found if x0 <= x <= x1 and y0 <= y <= y1})
        # in order of the deadline: of four crossings the first two and the last two belong together
        pieces += [(inside[k], inside[k + 1]) for k in range(0, len(inside) - 1, 2 if len(inside) % 2 == 0 else 1)]
    return list(dict.fromkeys(pieces))


def _boundary(canvas: Canvas, rows: Sequence[Row], required: float, placer: Placer) -> list[Label]:
    labels: list[Label] = []
    for level in sorted({row["level"] for row in rows if row["kind"] == "boundary"}):
        pieces = boundary_segments(rows, level)
        ends = [[{"deadline_s": x, "value": y, "run": str(k)} for x, y in piece] for k, piece in enumerate(pieces)]
        canvas.path([row for pair in ends for row in pair], "deadline_s", "value", color=INK, **_look(level, required))
        marked = [row for row in rows if row["kind"] == "boundary" and row["level"] == level]
        canvas.marks(marked, "deadline_s", "value", shape="circle", size=12, color=INK)
        for a, b in pieces:
            placer.avoid_line([(canvas.x.pixel(x), canvas.y.pixel(y)) for x, y in (a, b)])
        places = [(canvas.x.pixel(row["deadline_s"]), canvas.y.pixel(row["value"])) for row in marked]
        word = f"{number(level, 3)}: required" if level == required else number(level, 3)
        placed = placer.place([word], places, bold=level == required, distances=(9.0, 14.0, 22.0))
        labels += [Label(placed, INK, level == required)] if placed else []
    return labels


def _jumps(canvas: Canvas, rows: Sequence[Row], placer: Placer) -> list[Row]:
    """Draw where the advantage jumps over a level, once for all levels there; returns one row for each place."""
    levels = sorted({row["level"] for row in rows if row["kind"] == "jump"})
    pieces = list(dict.fromkeys(piece for level in levels for piece in boundary_segments(rows, level, "jump")))
    ends = [[{"deadline_s": x, "value": y, "run": str(k)} for x, y in piece] for k, piece in enumerate(pieces)]
    canvas.path([row for pair in ends for row in pair], "deadline_s", "value", **_JUMP)
    marked = {(row["deadline_s"], row["value"]): row for row in rows if row["kind"] == "jump"}
    canvas.marks(list(marked.values()), "deadline_s", "value", shape="square", size=12, color=_JUMP["color"])
    for a, b in pieces:
        placer.avoid_line([(canvas.x.pixel(x), canvas.y.pixel(y)) for x, y in (a, b)])
    return list(marked.values())


def _look(level: float, required: float) -> Row:
    if level == required:
        return _LINES["required"]
    return _LINES["equal" if level == 1.0 else "below" if level < required else "further"]


def _caption(rows: Sequence[Row], required: float, hidden: int) -> str:
    known = [row for row in rows if row["kind"] == "point"]
    good = sum(is_number(row["advantage"]) and row["advantage"] >= required for row in known)
    drawn = sorted({row["level"] for row in rows if row["kind"] == "boundary"})
    words = [
        f"Advantage against the strongest contender at every point, both sides re-optimised there. Triangles: at least "
        f"the required {number(required, 3)} ({good} of {len(known)} points)",
        "; circles: above 1; strokes: at most 1. " if required > 1.0 else "; strokes: less. ",
        f"Lines join exact crossings of {listed(number(level, 3) for level in drawn)}. "
        if drawn
        else "No level that would be drawn (0.5, 1, the required advantage, 10) is crossed on the map. ",
        "Orange dashed lines with squares: the advantage jumps over a level, because a contender or a better design "
        "point ceases to be permitted there. "
        if any(row["kind"] == "jump" for row in rows)
        else "",
        "Diamond: this study. Dashed boxes: usual places of product classes (common practice, no source).",
    ]
    if any(not is_number(row["advantage"]) for row in known):
        words.append(" Hatched: infeasible, a side has no permitted point.")
    if hidden:
        words.append(f" {hidden} points at 0 have no place on a logarithmic axis.")
    return "".join(words)


def _spoken(rows: Sequence[Row]) -> str:
    known = [row["advantage"] for row in rows if row["kind"] == "point" and is_number(row["advantage"])]
    if not known:
        return "No point of the map is permitted for both sides."
    return f"The advantage goes from {number(min(known), 3)} to {number(max(known), 3)} over the map."
