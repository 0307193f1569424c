"""Advantage against required time, and advantage by node (layer 9)."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from benchmark.record.shown_units import unit_words
from benchmark.report.drawing import Canvas, Label, Words
from benchmark.report.energy_delay import limits_of
from benchmark.report.figure import Chart, Row, checked
from benchmark.report.placing import Box, Placer, fitted, hatch, text_width, wrapped
from benchmark.report.rows import advantage_rows
from benchmark.report.spots import Spot, Spots
from benchmark.report.style import INK, LinearAxis, LogAxis, looks, positive, spec
from benchmark.report.words import amount, is_number, listed, number

__all__ = ["advantage_against_time", "advantage_by_node", "crossing_words", "level_lines_down", "levels", "stretches"]

Record = Mapping[str, Any]
WIDTH, HEIGHT = 610.0, 330.0
MARGINS = (64.0, 10.0, 12.0, 48.0)
#: least distance of marks along the line [pixel]
SPACING = 34.0


def levels(record: Record) -> list[tuple[float, str]]:
    """Return the lines every advantage is read against, with their words."""
    required = float(record["study"]["required_advantage"])
    if required == 1.0:
        return [(1.0, "1: equal, and the required advantage")]
    return [(1.0, "1: equal"), (required, f"{number(required, 3)}: required advantage")]


def stretches(rows: Sequence[Row], field: str) -> list[tuple[Any, list[Row]]]:
    """Split rows into neighbours with the same value of ``field``."""
    found: list[tuple[Any, list[Row]]] = []
    for row in rows:
        if found and found[-1][0] == row[field]:
            found[-1][1].append(row)
        else:
            found.append((row[field], [row]))
    return found


def crossing_words(record: Record) -> list[str]:
    """Say in words where the advantage crosses 1 and the required advantage."""
    rows = [row for row in record["advantage_against_time"] if is_number(row["advantage"])]
    words = []
    for level, name in levels(record):
        times = [row["time"] for row in record["crossings"] if row["level"] == level]
        label = "the required advantage " + number(level, 3) if "required" in name else "1 (equal)"
        if times:
            words.append(f"The advantage crosses {label} at {listed(amount(time, 's') for time in times)}.")
        elif rows:
            side = "at or above" if rows[0]["advantage"] >= level else "below"
            words.append(f"The advantage stays {side} {label} at every time both sides reach.")
    return words or ["There is no time that both sides reach, so there is no advantage to show."]


def _strongest_words(rows: Sequence[Row]) -> str:
    good = [row for row in rows if is_number(row["advantage"])]
    parts = [
        f"{name} from {amount(group[0]['time_s'], 's')} to {amount(group[-1]['time_s'], 's')}"
        for name, group in stretches(good, "strongest_contender")
    ]
    return f"Strongest contender: {listed(parts)}." if parts else ""


def _level_lines(canvas: Canvas, record: Record, axis: LogAxis, placer: Placer) -> list[Label]:
    """Draw the lines at 1 and M across the whole width and name them."""
    labels = []
    for value, name in levels(record):
        y = axis.pixel(value)
        width = canvas.x.size
        canvas.rules([(0.0, y, width, y)], color=INK, strokeWidth=1.6 if "required" in name else 1.0, strokeDash=[6, 3])
        placer.avoid_line([(0.0, y), (width, y)])
    for value, name in levels(record):
        y = axis.pixel(value)
        spots = [(share * canvas.x.size, y) for share in (0.01, 0.99, 0.3, 0.6)]
        placed = placer.place([name], spots, distances=(8.0,), bold=True)
        if placed is not None:
            labels.append(Label(placed, INK, True))
    return labels


def level_lines_down(
    canvas: Canvas, axis: LogAxis, record: Record, height: float, best: tuple[float, str] | None = None
) -> None:
    """Draw 1 and M down a chart whose rows lie below each other, each named in a line of its own at the top.

    ``best``: the best estimate and its words, drawn before them as an unbroken line.
    """
    lines = [*([best] if best else []), *levels(record)]
    words = []
    for position, (value, name) in enumerate(line for line in lines if axis.holds(line[0])):
        x, y = axis.pixel(value), 9.0 + 14.0 * position
        canvas.rules(
            [(x, y + 6.0, x, height)],
            color=INK,
            strokeWidth=1.6 if "required" in name else 1.0,
            strokeDash=[1, 0] if best and name == best[1] else [6, 3],
        )
        half = 0.5 * text_width(name, bold=True)
        words.append(Words(name, min(max(x, half + 3.0), axis.size - half - 3.0), y, "center", bold=True))
    canvas.words(words, back=True)


def _advantage_axis(record: Record, values: Sequence[float], height: float) -> LogAxis:
    wanted = [*values, *(level for level, _ in levels(record))]
    return LogAxis.around(wanted, height, "1", "advantage (reference / candidate)", vertical=True, room=0.1)


def _runs(rows: Sequence[Row]) -> list[Row]:
    """Number the unbroken runs of known advantage."""
    found, run, open_run = [], 0, False
    for row in rows:
        known = is_number(row["advantage"]) and row["advantage"] > 0.0
        if known:
            run += not open_run
            found.append({**row, "run": str(run)})
        open_run = known
    return found


def advantage_against_time(record: Record, width: float = WIDTH, height: float = HEIGHT) -> Chart:
    """Draw the advantage for every required time; breaks where one side cannot reach it."""
    key, title = "advantage-against-time", "Advantage against required time"
    rows, lost = positive(advantage_rows(record), "time_s")
    known = _runs(rows)
    if not rows or not known:
        words = "Not drawn. " + " ".join(crossing_words(record))
        return Chart(key, title, None, words, words)
    words = f"required time per operation ({unit_words('s')})"
    x = LogAxis.around([row["time_s"] for row in rows], width, "s", words, room=0.02)
    y = _advantage_axis(record, [row["advantage"] for row in known], height)
    canvas, placer = Canvas(x, y), Placer(Box(3.0, 3.0, width - 3.0, height - 3.0))
    look = looks(record)[_candidate_key(record)]
    canvas.frame()
    placer.avoid_line([(x.pixel(row["time_s"]), y.pixel(row["advantage"])) for row in known])
    labels = _level_lines(canvas, record, y, placer)
    labels += _gaps(canvas, rows, placer)
    deadline = limits_of(record).deadline
    if deadline is not None and x.holds(deadline):
        edge = x.pixel(deadline)
        canvas.rules([(edge, 0.0, edge, height)], color=INK, strokeWidth=1.6)
        placer.avoid_line([(edge, 0.0), (edge, height)])
        placed = placer.place([f"deadline {amount(deadline, 's')}"], [(edge, height * s) for s in (0.95, 0.05, 0.5)])
        labels += [Label(placed)] if placed else []
    canvas.path(known, "time_s", "advantage", color=look.colour, strokeWidth=2.6)
    singles = [group[0] for _, group in stretches(known, "run") if len(group) == 1]
    canvas.marks(singles, "time_s", "advantage", shape=look.marker, size=40, color=look.colour)
    labels += _crossings(canvas, record, x, y, placer)
    spots = _time_spots(canvas, rows, x, y, [row["time"] for row in record["crossings"]], look.colour)
    canvas.leaders(labels)
    canvas.backs(labels)
    canvas.words([words for label in labels for words in label.words()])
    caption = [
        "Reference energy over candidate energy when both must meet the same time, each at its own best supply; above "
        "1 favours the candidate. Both sides stand on the points of their supply grids, so small steps are the grid.",
        "The required time is also the clock period." if record["study"]["timing"] == "clocked" else "",
        *crossing_words(record),
        _strongest_words(rows),
    ]
    if len(known) < len(rows):
        caption.append("Hatched: times that one side cannot reach, where no advantage exists.")
    if lost:
        caption.append(f"{lost} times that are not positive dropped from the log axis.")
    span = f"from {number(min(row['advantage'] for row in known))} to {number(max(row['advantage'] for row in known))}"
    between = f"between {amount(known[0]['time_s'], 's')} and {amount(known[-1]['time_s'], 's')}"
    alternative = f"Advantage against required time: {span} {between}. {' '.join(crossing_words(record))}"
    drawing = checked(spec(canvas.layers, width, height, MARGINS))
    return Chart(key, title, drawing, " ".join(filter(None, caption)), alternative, tuple(rows), spots)


def _time_spots(
    canvas: Canvas, rows: Sequence[Row], x: LogAxis, y: LogAxis, wanted: Sequence[float], colour: str
) -> tuple[Spot, ...]:
    """Mark points along the line, not crowded and always next to the times ``wanted`` [s], and return their places."""
    known = [index for index, row in enumerate(rows) if is_number(row["advantage"]) and row["advantage"] > 0.0]
    chosen = {min(known, key=lambda index: abs(x.pixel(rows[index]["time_s"]) - x.pixel(time))) for time in wanted}
    for index in known:
        if all(abs(x.pixel(rows[index]["time_s"]) - x.pixel(rows[other]["time_s"])) >= SPACING for other in chosen):
            chosen.add(index)
    spots = Spots(*MARGINS[:2])
    for index in sorted(chosen):
        row = rows[index]
        said = f"required time {amount(row['time_s'], 's', 3)}: advantage {number(row['advantage'], 3)}"
        energies = " and ".join(amount(row[f"{side}_energy_J"], "J", 3) for side in ("candidate", "reference"))
        name = f"{said}, candidate and reference energy {energies}, strongest contender {row['strongest_contender']}"
        spots.mark(x.pixel(row["time_s"]), y.pixel(row["advantage"]), index, name)
    canvas.marks(
        [rows[index] for index in sorted(chosen)], "time_s", "advantage", shape="circle", size=22, color=colour
    )
    return spots.found()


def _candidate_key(record: Record) -> str:
    side = next(side for side in record["sides"] if side["role"] == "candidate")
    return f"candidate {side['id']}"


def _gaps(canvas: Canvas, rows: Sequence[Row], placer: Placer) -> list[Label]:
    """Hatch the times one side cannot reach, in words."""
    labels = []
    edges = [canvas.x.pixel(row["time_s"]) for row in rows]
    position = 0
    for reason, group in stretches(rows, "reason"):
        first, last = position, position + len(group) - 1
        position += len(group)
        if not reason:
            continue
        left = 0.0 if first == 0 else 0.5 * (edges[first - 1] + edges[first])
        right = canvas.x.size if last == len(rows) - 1 else 0.5 * (edges[last] + edges[last + 1])
        box = Box(left, 0.0, right, canvas.y.size)
        canvas.rules(hatch(box), color="#bdbdbd")
        columns = max(9, int((right - left - 8.0) / 5.6))
        spots = [(left + 4.0, canvas.y.size * share) for share in (0.08, 0.3, 0.5, 0.7, 0.9)]
        canvas.rules([(edge, 0.0, edge, canvas.y.size) for edge in (left, right) if 0.0 < edge < canvas.x.size])
        if right - left > 70.0:
            room = Placer(Box(left + 3.0, 3.0, right, canvas.y.size - 3.0), placer.boxes, placer.cells)
            columns = int((right - left - 8.0) / 5.6)
            spots = [(left + 4.0, canvas.y.size * share) for share in (0.08, 0.3, 0.5, 0.7, 0.9)]
            placed = room.place(wrapped(reason, columns, 8), spots, distances=(2.0,))
        else:  # too narrow to write in: beside it
            spots = [(0.5 * (left + right), canvas.y.size * share) for share in (0.9, 0.7, 0.5, 0.3, 0.1)]
            placed = placer.place(wrapped(reason, 20), spots, distances=(20.0, 30.0, 45.0))
        if placed is not None:
            labels.append(Label(placed))
    return labels


def _crossings(canvas: Canvas, record: Record, x: LogAxis, y: LogAxis, placer: Placer) -> list[Label]:
    labels = []
    for row in record["crossings"]:
        if not (x.holds(row["time"]) and y.holds(row["level"])):
            continue
        place = (x.pixel(row["time"]), y.pixel(row["level"]))
        canvas.symbols([place], shape="circle", size=60, fill="white", stroke=INK, strokeWidth=1.5)
        placer.avoid_mark(*place)
        placed = placer.place([f"{number(row['level'], 3)} at {amount(row['time'], 's')}"], [place])
        if placed is not None:
            labels.append(Label(placed, INK))
    return labels


def advantage_by_node(record: Record, width: float = WIDTH) -> Chart:
    """Draw the advantage over node labels in order; equal spacing, because labels are not lengths."""
    key, title = "advantage-by-node", "Advantage by node"
    rows = [
        {"node": row["label"], "order": position, "advantage": row["advantage"], "note": row["note"]}
        for position, row in enumerate(record["nodes"])
    ]
    known = [row for row in rows if is_number(row["advantage"]) and row["advantage"] > 0.0]
    if not known:
        notes = listed(f"{row['node']}: {row['note'] or 'infeasible'}" for row in rows)
        why = f"Not drawn: no node has an advantage ({notes})."
        return Chart(key, title, None, why, why)
    height = 240.0
    y = _advantage_axis(record, [row["advantage"] for row in known], height)
    ticks = tuple((float(row["order"]), " ") for row in rows)
    x = LinearAxis(-0.6, len(rows) - 0.4, width, "node label, in order", ticks, title_gap=13.0)
    canvas, placer = Canvas(x, y), Placer(Box(3.0, 3.0, width - 3.0, height - 3.0))
    look = looks(record)[_candidate_key(record)]
    canvas.frame()
    points = [{**row, "order": float(row["order"])} for row in _runs(rows)]
    for row in points:
        placer.avoid_mark(x.pixel(row["order"]), y.pixel(row["advantage"]))
    placer.avoid_line([(x.pixel(row["order"]), y.pixel(row["advantage"])) for row in points])
    labels = _level_lines(canvas, record, y, placer)
    canvas.path(points, "order", "advantage", color=look.colour, strokeWidth=1.6)
    canvas.marks(points, "order", "advantage", shape=look.marker, size=80, color=look.colour)
    limits = [level for level, _ in levels(record)]
    for row in points:
        place = (x.pixel(row["order"]), y.pixel(row["advantage"]))
        placed = placer.place([number(row["advantage"], 2, limits)], [place], bold=True)
        labels += [Label(placed, look.ink, True)] if placed else []
    labels += _node_crossings(canvas, record, rows, y, placer)
    canvas.leaders(labels)
    canvas.backs(labels)
    infeasible = [row for row in rows if not is_number(row["advantage"])]
    remarks = [
        Words(line, x.pixel(float(row["order"])), height - 36.0 + 13.0 * i, "center")
        for row in infeasible
        for i, line in enumerate(fitted(row["note"] or "infeasible", max(60.0, width / len(rows)), 3))
    ]
    names = _node_names(rows, x, height)
    spots = Spots(*MARGINS[:2])
    for row in points:
        said = f"node {row['node']}: advantage {number(row['advantage'], 3, limits)}"
        spots.mark(x.pixel(row["order"]), y.pixel(row["advantage"]), int(row["order"]), said)
    canvas.words([*(words for label in labels for words in label.words()), *remarks, *names])
    drawing = checked(spec(canvas.layers, width, height, (64.0, 10.0, 12.0, 60.0)))
    summary = _node_words(record, rows)
    caption = f"Primary policy at every node pair. {summary} Labels are equally spaced: a label is not a length."
    return Chart(key, title, drawing, caption, f"Advantage by node. {summary}", tuple(rows), spots.found())


def _node_names(rows: Sequence[Row], x: LinearAxis, height: float) -> list[Words]:
    """Write labels under their ticks in at most two lines; of very many labels every second, third ... one."""
    room = x.size / len(rows)
    stride = max(1, -(-34 // int(room)))
    return [
        Words(line, x.pixel(float(row["order"])), height + 15.0 + 13.0 * i, "center")
        for row in rows[::stride]
        for i, line in enumerate(fitted(row["node"], room * stride - 4.0, 2))
    ]


def _node_crossings(canvas: Canvas, record: Record, rows: Sequence[Row], y: LogAxis, placer: Placer) -> list[Label]:
    """Mark between which labels the advantage passes a level."""
    order = {row["node"]: float(row["order"]) for row in rows}
    labels = []
    for row in record["node_crossings"]:
        left, right = (order[name] for name in row["between"])
        place = (canvas.x.pixel(0.5 * (left + right)), y.pixel(row["level"]))
        spans = [(canvas.x.pixel(left), place[1], canvas.x.pixel(right), place[1])]
        canvas.rules(spans, color=INK, strokeWidth=4.0)
        placed = placer.place([f"passes {number(row['level'], 3)} here"], [place], distances=(10.0, 18.0, 30.0))
        labels += [Label(placed)] if placed else []
    return labels


def _node_words(record: Record, rows: Sequence[Row]) -> str:
    limits = [level for level, _ in levels(record)]
    parts = [
        f"{row['node']}: {number(row['advantage'], 2, limits)}"
        if is_number(row["advantage"])
        else f"{row['node']}: infeasible ({row['note']})"
        for row in rows
    ]
    passes = [
        f"The advantage passes {number(row['level'], 3)} between {listed(row['between'])}."
        for row in record["node_crossings"]
    ]
    return f"{', '.join(parts)}. {' '.join(passes) or 'It passes neither line between two labels.'}"
