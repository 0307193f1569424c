"""What moves the answer: the advantage over the range of each input moved alone (layer 9)."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from benchmark.report.advantage import level_lines_down, levels
from benchmark.report.drawing import Canvas, Words
from benchmark.report.figure import Chart, Row, checked
from benchmark.report.placing import Box, cut, fitted, text_width
from benchmark.report.rows import NOT_PERMITTED, flips_of
from benchmark.report.spots import TARGET, Spots
from benchmark.report.style import GREY, INK, LinearAxis, LogAxis, spec
from benchmark.report.words import flat_powers, is_number, listed, number, plural, spaced

__all__ = ["input_swings", "ranged_moves"]

Record = Mapping[str, Any]
WIDTH, LEFT, RIGHT = 440.0, 216.0, 34.0
ROW, BAR, TOP, PAD = 40.0, 11.0, 48.0, 6.0
MOST = 12
#: marker and word of the evidence class, at the best estimate of each bar
_MARKERS = {
    "defined": "circle",
    "measured": "circle",
    "published": "square",
    "choice": "diamond",
    "extracted": "triangle-up",
    "simulated": "triangle-up",
    "derived": "triangle-up",
    "projected": "triangle-down",
    "target": "triangle-down",
    "assumed": "cross",
    "invented": "triangle-right",
}


def ranged_moves(record: Record) -> list[Row]:
    """Return the inputs with a stated range that move the result, in the order of the record (largest swing first)."""
    return [dict(row) for row in record["verdict"]["moves"] if row["ranged"] and row["matters"]]


def _name(key: str) -> tuple[str, str]:
    owner, _, name = key.rpartition(".")
    return name.replace("_", " "), owner


def _end(row: Row, which: str) -> str:
    return f"{which} {spaced(row[which], row['unit'], 2)}"


def _provenance(evidence: str, owner: str, room: float) -> str:
    """Return evidence class and owner in the room there is; the owner may be cut, the class may not."""
    return f"{evidence}; {cut(owner, room - text_width(f'{evidence}; '))}"


def _axis(record: Record, rows: Sequence[Row], width: float) -> LogAxis:
    best = record["verdict"]["advantage"]
    ends = [row[name] for row in rows for name in ("advantage_low", "advantage_high")]
    values = [value for value in [*ends, best] if is_number(value) and value > 0.0]
    values += [level for level, _ in levels(record) if min(values) / 30.0 < level < max(values) * 30.0]
    return LogAxis.around(values, width, "1", "advantage (reference / candidate)", room=0.26)


def _ends(axis: LogAxis, row: Row) -> dict[str, tuple[float, str, bool]]:
    """Return, for low and high, the pixel where the bar ends, the words, and whether a side is infeasible there."""
    best = row["best_advantage"]
    found = {}
    for which in ("low", "high"):
        value = row[f"advantage_{which}"]
        known = is_number(value) and value > 0.0
        place = axis.pixel(value) if known else axis.pixel(best)
        found[which] = (place, _end(row, which) + ("" if known else ": not permitted"), not known)
    return found


def _bar(canvas: Canvas, axis: LogAxis, row: Row, middle: float, required: float) -> tuple[float, float]:
    """Draw one bar with its words; returns where it begins and ends."""
    ends = _ends(axis, row)
    places = sorted(place for place, _, _ in ends.values())
    left, right = places[0], max(places[1], places[0] + 1.0)
    if any(gone for _, _, gone in ends.values()):  # towards an end where a side is infeasible, the bar has no known end
        canvas.rules([(right, middle, canvas.x.size, middle)], color=GREY, strokeWidth=1.6, strokeDash=[2, 3])
    canvas.boxes(
        [Box(left, middle - BAR / 2, right, middle + BAR / 2)], color="#bcd7ea", stroke="#0072B2", strokeWidth=1.0
    )
    best = axis.pixel(row["best_advantage"])
    marker = _MARKERS.get(row["evidence"], "circle")
    canvas.symbols([(best, middle)], shape=marker, size=55, color=INK, stroke=INK, strokeWidth=1.2)
    words = []
    low, high = ends["low"], ends["high"]
    first, second = (low, high) if (low[0], not low[2]) <= (high[0], not high[2]) else (high, low)
    left, right = min(left, best - 5.0), max(right, best + 5.0)  # clear of the symbol
    words.append(Words(first[1], left - 5.0, middle, "right"))
    if second[2]:
        words.append(Words(second[1], canvas.x.size - 6.0, middle, "right"))
    else:
        words.append(Words(second[1], right + 5.0, middle))
    if text_width(flat_powers(first[1])) + 8.0 > left:
        words[0] = Words(first[1], left, middle - 12.0)
    if row["straddles"] and flips_of(row):
        x = axis.pixel(required)
        if places[0] <= x <= places[1]:
            canvas.rules([(x, middle - 10.0, x, middle + 10.0)], color=INK, strokeWidth=3.0)
        text = f"flips at {_flips(row)}"
        half = 0.5 * text_width(text, bold=True)
        words.append(Words(text, min(max(x, half), canvas.x.size - half), middle + 15.0, "center", bold=True))
    canvas.words(words, back=True)
    return left, right


def input_swings(
    record: Record, width: float = WIDTH, left: float = LEFT, right: float = RIGHT, most: int = MOST
) -> Chart:
    """Draw at most ``most`` inputs, largest swing first."""
    key, title = "input-swings", "What moves the answer"
    moves, best = ranged_moves(record), record["verdict"]["advantage"]
    if not moves or not is_number(best):
        why = (
            "no advantage exists at the best estimate" if not is_number(best) else "no input has a range that moves it"
        )
        words = f"Not drawn: {why}."
        return Chart(key, title, None, words, words)
    rows: list[Row] = [{**row, "best_advantage": best} for row in moves[:most]]
    height = ROW * len(rows) + TOP + 4.0
    axis = _axis(record, rows, width)
    canvas = Canvas(axis, LinearAxis(height, 0.0, height, vertical=True))
    canvas.frame()
    wanted = [level for level, _ in levels(record)]
    level_lines_down(canvas, axis, record, height, (float(best), f"best estimate {number(float(best), 2, wanted)}"))
    required = float(record["study"]["required_advantage"])
    spots = Spots(left, PAD)
    for position, row in enumerate(rows):
        middle = TOP + ROW * (position + 0.45)
        begin, end = _bar(canvas, axis, row, middle, required)
        name, owner = _name(row["key"])
        grown = 0.5 * max(0.0, TARGET - (end - begin))
        box = Box(begin - grown, middle - 0.5 * TARGET, end + grown, middle + 0.5 * TARGET)
        spots.bar(box, position, f"{name} of {owner}: {_end(row, 'low')}, {_end(row, 'high')}; {_range(row)}")
        canvas.words(
            [
                Words(fitted(name, left - 12.0, bold=True)[0], -10.0, middle - 6.5, "right", bold=True),
                Words(_provenance(row["evidence"], owner, left - 12.0), -10.0, middle + 6.5, "right"),
            ]
        )
    drawing = checked(spec(canvas.layers, width, height, (left, PAD, right, 48.0)))
    points = tuple(
        {name: row[name] for name in ("key", "unit", "evidence", "low", "best", "high", "straddles")}
        | {
            "advantage_at_low": NOT_PERMITTED if row["advantage_low"] is None else row["advantage_low"],
            "advantage_at_best": best,
            "advantage_at_high": NOT_PERMITTED if row["advantage_high"] is None else row["advantage_high"],
            "flips_at": _flips(row) or "does not flip",
        }
        for row in rows
    )
    words = _summary(record, rows, moves)
    caption = _caption(record, words, moves, most)
    return Chart(key, title, drawing, caption, f"What moves the answer. {words}", points, spots.found())


def _summary(record: Record, rows: Sequence[Row], moves: Sequence[Row]) -> str:
    flips = [f"{_name(row['key'])[0]} at {_flips(row)}" for row in moves if row["straddles"] and flips_of(row)]
    ends = [row for row in moves if row["straddles"] and not flips_of(row)]
    first = rows[0]
    parts = [f"Largest swing: {_name(first['key'])[0]} ({_range(first)})."]
    required = number(record["study"]["required_advantage"], 3)
    if flips:
        parts.append(f"Alone, these change the answer against {required}: {'; '.join(flips)}.")
    if ends:
        names = listed(_name(row["key"])[0] for row in ends)
        parts.append(f"At one end of {names} a side is infeasible or a requirement missed.")
    if not flips and not ends:
        parts.append(f"No input alone carries the advantage across {required}.")
    return " ".join(parts)


def _flips(row: Row) -> str:
    return " and ".join(spaced(value, row["unit"], 2) for value in flips_of(row))


def _range(row: Row) -> str:
    known = [row[name] for name in ("advantage_low", "advantage_high") if is_number(row[name])]
    if len(known) < 2:
        return "infeasible or a requirement missed at one end"
    return f"advantage {number(min(known))} to {number(max(known))}"


def _caption(record: Record, words: str, moves: Sequence[Row], most: int) -> str:
    unranged = sum(not row["ranged"] for row in record["verdict"]["moves"])
    parts = [
        "Each input moved alone over its stated range, both sides re-optimised; the symbol stands at the best estimate "
        "and its shape tells the evidence class named at the left. Not permitted: a side is infeasible there or a "
        "requirement missed.",
        words,
    ]
    if len(moves) > most:
        parts.append(f"{plural(len(moves) - most, 'further input')} with smaller swing in the table.")
    if unranged:
        parts.append(f"{plural(unranged, 'input')} that move the result have no stated range and no bar.")
    return " ".join(parts)
