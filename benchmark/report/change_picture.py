"""Before and after a change in one picture: operating points of both sides and the required line (layer 9).

The required advantage is a straight line: the largest metric the candidate may have beside the strongest contender. The
vertical axis carries the metric of the study (energy where the metric is time).
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from benchmark.report.drawing import Canvas, Label
from benchmark.report.figure import Chart, Row, checked
from benchmark.report.placing import Box, Placer, fitted
from benchmark.report.spots import Spots
from benchmark.report.style import INK, LogAxis, Look, looks, positive, spec
from benchmark.report.words import amount, is_number, listed, number, policy_name, volts

__all__ = ["change_picture"]

Record = Mapping[str, Any]
KEY, TITLE = "change-picture", "Operating points before and after the change"
WIDTH, HEIGHT = 610.0, 330.0
MARGINS = (74.0, 10.0, 12.0, 48.0)
#: metric -> column of the data, unit, words
_METRICS = {
    "energy-per-operation": ("energy_J", "J", "energy per operation"),
    "time-per-operation": ("time_s", "s", "time per operation"),
    "area": ("area_m2", "m^2", "area"),
    "leakage-power": ("leakage_power_W", "W", "leakage power"),
}
_COLUMNS = {"supply_V": "supply", "time_s": "time", "energy_J": "energy", "area_m2": "area"}
_COLUMNS |= {"leakage_power_W": "leakage_power"}
#: area of a mark by when it was [square pixel]
_SIZES = {"before": 55, "after": 150}
#: as in the other charts: filled for what is, hollow and outlined for what is aimed at
_AMBITION: dict[str, Row] = {
    "target": {"fill": "white"},
    "limit": {"fill": "transparent", "strokeDash": [2.5, 1.5]},
}
#: two places nearer than this are one mark [pixel]
ONE_MARK = 9.0
_GONE = Look("#767676", INK, (), "square", 1.3)


@dataclass(frozen=True)
class _Plane:
    """The axes, the column and unit of the metric, and what lies on them."""

    x: LogAxis
    y: LogAxis
    column: str
    metric: str
    points: list[Row]
    lines: list[Row]

    def pixel(self, row: Mapping[str, Any]) -> tuple[float, float]:
        return self.x.pixel(row["time_s"]), self.y.pixel(row[self.vertical])

    @property
    def vertical(self) -> str:
        """Column of the vertical axis."""
        return "energy_J" if self.column == "time_s" else self.column

    def edge(self, line: Mapping[str, Any]) -> tuple[float, float, float, float]:
        """Return the required line in pixels, across the whole plane."""
        if self.column == "time_s":
            place = self.x.pixel(line["time_s"])
            return place, 0.0, place, self.y.size
        place = self.y.pixel(line[self.column])
        return 0.0, place, self.x.size, place


def _rows(change: Record) -> list[Row]:
    """Return the operating points as data: units in the names, the advantage on the candidate's rows."""
    ends = {"before": change["old"], "after": change["new"]}
    rows = []
    for point in change["points"]:
        end = ends[point["when"]]
        mine = point["role"] == "candidate"
        head = {name: point[name] for name in ("when", "role", "side", "name", "ambition")}
        numbers = {column: point[name] for column, name in _COLUMNS.items()}
        rows.append({**head, **numbers, "advantage": end["advantage"] if mine else None, "required": None})
    return rows


def _lines(change: Record, rows: Sequence[Row], column: str) -> list[Row]:
    """Return the largest metric the candidate may have for the required advantage, before and after."""
    found: list[Row] = []
    for when, end in (("before", change["old"]), ("after", change["new"])):
        reference = next((row for row in rows if row["when"] == when and row["role"] == "contender"), None)
        if reference is None or end["metric"] != change["new"]["metric"]:
            continue
        level = reference[column] / end["required_advantage"]
        named = {name: reference[name] for name in ("when", "role", "side", "name")}
        found.append({**named, column: level, "required": end["required_advantage"]})
    return found


def _plane(record: Record, width: float, height: float) -> _Plane | None:
    change = record["change"]
    column, unit, words = _METRICS[change["new"]["metric"]]
    vertical, unit, words = (column, unit, words) if column != "time_s" else _METRICS["energy-per-operation"]
    points, _ = positive(_rows(change), "time_s", vertical)
    if not points:
        return None
    lines = _lines(change, points, column)
    times = [row["time_s"] for row in (*points, *lines) if "time_s" in row]
    heights = [row[vertical] for row in (*points, *lines) if vertical in row]
    x = LogAxis.around(times, width, "s", "time per operation (s)", room=0.22)
    shown = {"m^2": "µm²"}.get(unit, unit)
    y = LogAxis.around(heights, height, unit, f"{words} ({shown})", vertical=True, room=0.22)
    return _Plane(x, y, column, words, points, lines)


def _pairs(points: Sequence[Row]) -> list[dict[str, Row]]:
    """Return the points of each role by when they were, the candidate first."""
    return [
        {row["when"]: row for row in points if row["role"] == role}
        for role in ("candidate", "contender")
        if any(row["role"] == role for row in points)
    ]


def _look(record: Record, row: Mapping[str, Any]) -> Look:
    """Return the style of a side in all charts; a side of the old record alone is grey."""
    return looks(record).get(f"{row['role']} {row['side']}", _GONE)


def change_picture(record: Record, width: float = WIDTH, height: float = HEIGHT) -> Chart:
    """Draw the operating points of both sides before and after a change, with the required line of each."""
    plane = _plane(record, width, height)
    if plane is None:
        words = "Not drawn: no side has an operating point with positive numbers, before or after."
        return Chart(KEY, TITLE, None, words, words)
    canvas, spots = Canvas(plane.x, plane.y), Spots(*MARGINS[:2])
    placer = Placer(Box(3.0, 3.0, width - 3.0, height - 3.0))
    canvas.frame()
    labels = _draw_lines(canvas, placer, plane)
    labels += _draw_points(canvas, placer, plane, record, spots)
    canvas.leaders(labels)
    canvas.backs(labels)
    canvas.words([words for label in labels for words in label.words()])
    drawing = checked(spec(canvas.layers, width, height, MARGINS))
    alternative = f"{TITLE}. {_alternative(record, plane)}"
    return Chart(KEY, TITLE, drawing, _caption(record, plane), alternative, _data(plane), spots.found())


def _draw_lines(canvas: Canvas, placer: Placer, plane: _Plane) -> list[Label]:
    """Draw the required line after the change, and before it where that was another; each with its name."""
    labels = []
    after = [line for line in plane.lines if line["when"] == "after"]
    before = [
        line
        for line in plane.lines
        if line["when"] == "before"
        and not any(math.dist(plane.edge(line), plane.edge(other)) < ONE_MARK for other in after)
    ]
    for line in (*before, *after):
        edge = plane.edge(line)
        thin = line["when"] == "before"
        canvas.rules([edge], color=INK, strokeWidth=1.0 if thin else 1.6, strokeDash=[2, 3] if thin else [6, 3])
        placer.avoid_line([edge[:2], edge[2:]])
    for line in (*before, *after):
        x0, y0, x1, y1 = plane.edge(line)
        when = "" if not before else f", {line['when']}"
        name = f"required advantage {number(line['required'], 3)}{when}"
        places = [(x0 + share * (x1 - x0), y0 + share * (y1 - y0)) for share in (0.99, 0.01, 0.3, 0.6)]
        placed = placer.place([name], places, distances=(8.0,), bold=True)
        if placed is not None:
            labels.append(Label(placed, INK, True))
    return labels


def _draw_points(canvas: Canvas, placer: Placer, plane: _Plane, record: Record, spots: Spots) -> list[Label]:
    """Draw the marks of each side with an arrow from before to after; returns their labels."""
    pairs = _pairs(plane.points)
    for pair in pairs:
        for row in pair.values():
            placer.avoid_mark(*plane.pixel(row), 8.0)
        if len(pair) == 2:
            placer.avoid_line([plane.pixel(pair["before"]), plane.pixel(pair["after"])])
    labels = []
    for pair in pairs:
        placed = [plane.pixel(row) for row in pair.values()]
        one = len(placed) == 2 and math.dist(*placed) < ONE_MARK
        if len(placed) == 2 and not one:
            canvas.rules(_arrow(*placed), color=INK, strokeWidth=1.2)
        for when, row in pair.items():
            if one and when == "before":
                continue
            look, place = _look(record, row), plane.pixel(row)
            mark: Row = {"shape": look.marker, "size": _SIZES[when], "fill": look.colour, "stroke": INK}
            canvas.symbols([place], **(mark | {"strokeWidth": 1.3} | _AMBITION.get(row["ambition"], {})))
            shown = [pair["before"], row] if one else [row]
            spots.mark(*place, plane.points.index(row), _name(shown, plane))
            room = 0.46 * plane.x.size
            lines = [text for line in _label(record, shown, plane) for text in fitted(line, room, 2)]
            found = placer.place(lines, [place], bold=row["role"] == "candidate")
            if found is not None:
                labels.append(Label(found, look.ink, row["role"] == "candidate"))
    return labels


def _arrow(start: tuple[float, float], end: tuple[float, float]) -> list[tuple[float, float, float, float]]:
    """Return a shaft that ends before the mark, and the two sides of its head."""
    angle = math.atan2(end[1] - start[1], end[0] - start[0])
    tip = end[0] - 8.0 * math.cos(angle), end[1] - 8.0 * math.sin(angle)
    sides = [(tip[0] - 7.0 * math.cos(angle + turn), tip[1] - 7.0 * math.sin(angle + turn)) for turn in (-0.45, 0.45)]
    return [(*start, *tip), *((*side, *tip) for side in sides)]


def _limits(record: Record) -> tuple[float, ...]:
    return (1.0, *(record["change"][end]["required_advantage"] for end in ("old", "new")))


def _label(record: Record, rows: Sequence[Row], plane: _Plane) -> list[str]:
    """Name a mark of one or of both points of a side: side, metric and supply; of the candidate also the advantage."""
    lines = [rows[-1]["name"], *_stated(rows, [_numbers(row, plane) for row in rows])]
    known = [row["advantage"] for row in rows if is_number(row["advantage"])]
    if rows[-1]["role"] == "candidate" and known:
        said = dict.fromkeys(number(value, 3, _limits(record)) for value in known)
        lines.append(f"advantage {', then '.join(said)}")
    return lines


def _stated(rows: Sequence[Row], said: Sequence[str]) -> list[str]:
    """Say when with each number, once where both are the same."""
    if len(said) == 2 and said[0] == said[1]:
        return [f"before and after: {said[0]}"]
    return [f"{row['when']}: {text}" for row, text in zip(rows, said, strict=True)]


def _unit(column: str) -> str:
    return next(unit for name, unit, _ in _METRICS.values() if name == column)


def _numbers(row: Row, plane: _Plane) -> str:
    """Return metric and supply."""
    return f"{amount(row[plane.column], _unit(plane.column), 3)}, {volts(row['supply_V'], 3)}"


def _place(row: Row, plane: _Plane) -> str:
    """Return the supply and both coordinates."""
    words = {"energy_J": "energy", "area_m2": "area", "leakage_power_W": "leakage power"}[plane.vertical]
    upright = amount(row[plane.vertical], _unit(plane.vertical), 3)
    return f"supply {volts(row['supply_V'], 3)}, time {amount(row['time_s'], 's', 3)}, {words} {upright}"


def _name(rows: Sequence[Row], plane: _Plane) -> str:
    return f"{rows[-1]['name']}, {'; '.join(_stated(rows, [_place(row, plane) for row in rows]))}"


def _data(plane: _Plane) -> tuple[Row, ...]:
    """Return points, then required lines; what a row has not is empty."""
    columns = ("when", "role", "side", *_COLUMNS, "advantage", "required")
    rows = [("operating point", row) for row in plane.points] + [("required line", row) for row in plane.lines]
    cells = [(series, {name: row.get(name) for name in columns}) for series, row in rows]
    return tuple(
        {"series": series} | {name: "" if value is None else value for name, value in found.items()}
        for series, found in cells
    )


def _caption(record: Record, plane: _Plane) -> str:
    shapes = [f"{_look(record, row).marker.replace('-', ' ')}: {row['name']}" for row in _last(plane)]
    words = [
        f"Each side at its design point under the policy {policy_name(record['study']['primary_policy'])}, the "
        "reference the strongest contender: small mark before the change, large mark after it, an arrow from one to "
        f"the other. Shapes: {'; '.join(shapes)}.",
    ]
    missing = [
        f"the {'candidate' if role == 'candidate' else 'reference'} {when}"
        for role in ("candidate", "contender")
        for when in ("before", "after")
        if not any((row["role"], row["when"]) == (role, when) for row in plane.points)
    ]
    if missing:
        words.append(f"Without a point that can be shown: {listed(missing)} the change.")
    if plane.lines:
        where = "left of" if plane.column == "time_s" else "below"
        words.append(
            f"Dashed: the {'time' if plane.column == 'time_s' else plane.metric} of the reference over the required "
            f"advantage; a candidate {where} this line reaches it."
        )
    else:
        words.append("There is no reference point, hence no required line.")
    return " ".join(words)


def _last(plane: _Plane) -> list[Row]:
    """Return one row for each side that is drawn, the candidate first."""
    found = {(row["role"], row["side"]): row for row in plane.points}
    return sorted(found.values(), key=lambda row: str(row["role"]))


def _alternative(record: Record, plane: _Plane) -> str:
    words = [
        f"{row['name']} {row['when']}: {_place(row, plane)}"
        + (f", advantage {number(row['advantage'], 3, _limits(record))}" if is_number(row["advantage"]) else "")
        + "."
        for row in plane.points
    ]
    words += [
        f"Required line {line['when']}: {amount(line[plane.column], _unit(plane.column), 3)} for the advantage "
        f"{number(line['required'], 3)}."
        for line in plane.lines
    ]
    return " ".join(words)
