"""How the advantage is distributed under the stated ranges: its cumulative curve (layer 9)."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from benchmark.record.text import probability
from benchmark.report.advantage import levels
from benchmark.report.drawing import Canvas, Label
from benchmark.report.figure import Chart, Row, checked
from benchmark.report.placing import Box, Placer, fitted
from benchmark.report.spots import Spots
from benchmark.report.style import INK, LinearAxis, LogAxis, looks, spec
from benchmark.report.words import is_number, number

__all__ = ["advantage_distribution"]

Record = Mapping[str, Any]
WIDTH, HEIGHT = 610.0, 300.0
MARGINS = (64.0, 10.0, 12.0, 48.0)
#: shares with a mark that leads to its row
MARKED = (0.05, 0.10, 0.25, 0.50, 0.75, 0.90, 0.95)


def advantage_distribution(record: Record, width: float = WIDTH, height: float = HEIGHT) -> Chart:
    """Draw the share of draws that do not exceed each advantage, with lines at 1 and the required advantage."""
    key, title = "advantage-distribution", "Advantage under the stated ranges"
    found = record.get("uncertainty")
    rows = [_row(row) for row in found["distribution"] if is_number(row["advantage"])] if found else []
    if not rows or found is None or found["constant"]:
        words = _why_not(found)
        return Chart(key, title, None, words, words)
    x = LogAxis.around(
        [*(row["advantage"] for row in rows), *(level for level, _ in levels(record))],
        width,
        "1",
        "advantage (reference / candidate)",
        room=0.08,
    )
    ticks = tuple((share / 100.0, f"{share} %") for share in (0, 10, 25, 50, 75, 90, 100))
    y = LinearAxis(0.0, 1.0, height, "share of the draws with at most this advantage", ticks, vertical=True)
    canvas, placer = Canvas(x, y), Placer(Box(3.0, 3.0, width - 3.0, height - 3.0))
    look = next(iter(looks(record).values()))
    canvas.frame()
    curve = [(x.pixel(row["advantage"]), y.pixel(row["share_of_draws"])) for row in rows]
    placer.avoid_line(curve)
    labels = []
    for value, name in levels(record):
        edge = x.pixel(value)
        required = "required" in name
        canvas.rules([(edge, 0.0, edge, height)], color=INK, strokeWidth=1.6 if required else 1.0, strokeDash=[6, 3])
        placer.avoid_line([(edge, 0.0), (edge, height)])
        reached = probability(found["reaches"] if required else found["above_one"], found["draws"])
        said = f"{'reached' if required else 'exceeded'} with probability {reached}"
        lines = [line for text in (name, said) for line in fitted(text, width / 3.0, 5, bold=True)]
        placed = placer.place(lines, [(edge, height * share) for share in (0.35, 0.6, 0.2, 0.8)], bold=True)
        labels += [Label(placed, INK, True)] if placed else []
    canvas.path(rows, "advantage", "share_of_draws", color=look.colour, strokeWidth=2.6)
    spots = Spots(*MARGINS[:2])
    for position, row in enumerate(rows):
        if row["share_of_draws"] in MARKED:
            canvas.symbols([curve[position]], shape="circle", size=36, color=look.colour)
            words = f"{number(100 * row['share_of_draws'])} % of the draws: at most {number(row['advantage'])}"
            spots.mark(*curve[position], position, words)
    canvas.leaders(labels)
    canvas.backs(labels)
    canvas.words([words for label in labels for words in label.words()])
    caption = _caption(record, found)
    alternative = (
        f"Cumulative distribution of the advantage: 5 % of the draws lie at or below "
        f"{_at(rows, 0.05)}, half at or below {_at(rows, 0.5)}, 95 % at or below {_at(rows, 0.95)}. {caption}"
    )
    drawing = checked(spec(canvas.layers, width, height, MARGINS))
    return Chart(key, title, drawing, caption, alternative, tuple(rows), spots.found())


def _row(row: Record) -> Row:
    return {"share_of_draws": row["share"], "advantage": row["advantage"]}


def _at(rows: list[Row], share: float) -> str:
    """Advantage that a share of the draws does not exceed; words where draws without an advantage lie there."""
    found = next((row["advantage"] for row in rows if row["share_of_draws"] == share), None)
    return "no advantage (infeasible)" if found is None else number(found)


def _why_not(found: Record | None) -> str:
    if found is None:
        return "Not drawn: no draws were asked for, or no value states a range."
    if found["constant"]:
        return "Not drawn: no input with a range moves the advantage."
    return "Not drawn: no draw has an advantage."


def _caption(record: Record, found: Record) -> str:
    words = [
        f"{found['draws']} draws of all {found['inputs']} inputs with a stated range together, both sides re-optimised "
        f"in each; policy {record['study']['primary_policy'].replace('-', ' ')}. The ranges of {found['judgement']} of "
        "them are judgement or invented.",
    ]
    if found["without_candidate"]:
        words.append(
            f"In {number(100 * found['without_candidate'])} % of the draws the candidate has no permitted point; they "
            "lie below every advantage."
        )
    return " ".join(words)
