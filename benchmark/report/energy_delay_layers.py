"""Drawing of the energy-delay chart: regions, curves, symbols and labels (layer 9)."""

from __future__ import annotations

import itertools
from collections.abc import Mapping, Sequence
from typing import Any

from benchmark.report.drawing import Canvas, Label
from benchmark.report.energy_delay import FEASIBLE, Plane, envelope_path, outlook_path, side_key, side_name
from benchmark.report.figure import Row
from benchmark.report.placing import Box, Placer, hatch, wrapped
from benchmark.report.style import INK, looks
from benchmark.report.words import amount, policy_name, volts

__all__ = ["layers", "policy_groups", "supplies_of"]

#: width [pixel] below which there is no room to name a shape twice
NARROW = 330.0
FAILING_DASH = [1.5, 3.5]
#: the reference is a band: a pale line on a darker, broader one
ENVELOPE = ({"color": "#8a8a8a", "strokeWidth": 9.5}, {"color": "#dedede", "strokeWidth": 6.5})


#: how a design point looks by what its technology stands for: filled, hollow, outlined
_AMBITION: dict[str, Row] = {
    "today": {},
    "target": {"fill": "white"},
    "limit": {"fill": "transparent", "strokeDash": [2.5, 1.5]},
}


def _segments(rows: Sequence[Row], key: str) -> list[Row]:
    """Split a curve into runs of one state; a change of state is drawn in the failing style."""
    pieces: list[Row] = []
    run, previous = 0, None
    for row in rows:
        if previous is not None and previous["state"] != row["state"]:
            if row["state"] == FEASIBLE:
                pieces.append({**row, "state": previous["state"], "run": f"{key} {run}"})
                run += 1
            else:
                run += 1
                pieces.append({**previous, "state": row["state"], "run": f"{key} {run}"})
        pieces.append({**row, "run": f"{key} {run}"})
        previous = row
    return pieces


def _supply_marks(plane: Plane, rows: Sequence[Row]) -> list[Row]:
    """Grid points nearest to round supplies, not crowded."""
    low, high = min(row["supply_V"] for row in rows), max(row["supply_V"] for row in rows)
    for step in (0.05, 0.1, 0.2, 0.5, 1.0, 2.0, 5.0, 10.0):
        if (high - low) / step > 12.0:
            continue
        found = {}
        for k in range(round(low / step), round(high / step) + 1):
            row = min(rows, key=lambda row: abs(row["supply_V"] - step * k))
            if abs(row["supply_V"] - step * k) < 0.2 * step:
                found[id(row)] = row
        marks: list[Row] = []
        for row in found.values():
            here = plane.pixel(row)
            if all(abs(here[0] - px) + abs(here[1] - py) > 26.0 for px, py in map(plane.pixel, marks)):
                marks.append(row)
        if marks and len(marks) >= 0.8 * len(found):
            return marks
    return list(rows[:1])


def _regions(plane: Plane) -> list[tuple[Box, tuple[float, float, float, float], str]]:
    """Return box, edge and words of what the study forbids."""
    width, height = plane.x.size, plane.y.size
    found = []
    deadline, energy = plane.limits.deadline, plane.limits.energy
    if deadline is not None and plane.x.holds(deadline):
        edge = plane.x.pixel(deadline)
        words = f"later than the deadline {amount(deadline, 's')}"
        found.append((Box(edge, 0.0, width, height), (edge, 0.0, edge, height), words))
    if energy is not None and plane.y.holds(energy):
        edge = plane.y.pixel(energy)
        words = f"above the allowed energy {amount(energy, 'J')}"
        found.append((Box(0.0, 0.0, width, edge), (0.0, edge, width, edge), words))
    return found


def policy_groups(plane: Plane) -> list[tuple[Row, list[str]]]:
    """Return first mark and policies of each group: marks that coincide share one symbol and one label."""
    groups: list[tuple[Row, list[str]]] = []
    for mark in plane.marks:
        x, y = plane.pixel(mark)
        for first, names in groups:
            px, py = plane.pixel(first)
            if side_key(first) == side_key(mark) and abs(px - x) + abs(py - y) < 8.0:
                names.append(mark["policy"])
                break
        else:
            groups.append((mark, [mark["policy"]]))
    return groups


def _named_groups(plane: Plane) -> list[tuple[Row, list[str]]]:
    """Return the groups to be named; on a narrow plane a symbol of the reference like the candidate's is not."""
    groups = policy_groups(plane)
    if plane.x.size >= NARROW:
        return groups
    mine = [names for mark, names in groups if mark["role"] == "candidate"]
    return [(mark, names) for mark, names in groups if mark["role"] == "candidate" or names not in mine]


def _obstacles(plane: Plane, supplies: Mapping[str, Sequence[Row]]) -> Placer:
    placer = Placer(Box(3.0, 3.0, plane.x.size - 3.0, plane.y.size - 3.0))
    placer.avoid_line([plane.pixel(row) for row in outlook_path(plane)])
    for rows in plane.curves.values():
        placer.avoid_line([plane.pixel(row) for row in rows])
    for shift in (-4.0, 4.0):  # the reference line is broad
        placer.avoid_line([(x, y + shift) for x, y in map(plane.pixel, envelope_path(plane.envelope))])
    for mark in plane.marks:
        placer.avoid_mark(*plane.pixel(mark), 8.0)
    for row in itertools.chain.from_iterable(supplies.values()):
        placer.avoid_mark(*plane.pixel(row), 3.0)
    for _, (x0, y0, x1, y1), _ in _regions(plane):
        placer.avoid_line([(x0, y0), (x1, y1)])
    return placer


def _spots(plane: Plane, rows: Sequence[Row], shares: Sequence[float]) -> list[tuple[float, float]]:
    return [plane.pixel(rows[round(share * (len(rows) - 1))]) for share in shares]


def _labels(
    record: Mapping[str, Any], plane: Plane, order: Sequence[str], supplies: Mapping[str, Sequence[Row]]
) -> list[Label]:
    """Write every label where there is room: regions, names, policies, supplies."""
    styles = looks(record)
    placer = _obstacles(plane, supplies)
    found: list[Label] = []

    def put(
        lines: Sequence[str], spots: Sequence[tuple[float, float]], ink: str, bold: bool = False, **options: Any
    ) -> None:
        placed = placer.place(lines, spots, bold=bold, **options)
        if placed is not None:
            found.append(Label(placed, ink, bold))

    for box, _, words in _regions(plane):
        inner = Placer(box, placer.boxes, placer.cells)
        spots = [
            (box.left + 6.0, box.top + share * (box.bottom - box.top))
            for share in (0.04, *(0.1 * k for k in range(1, 10)))
        ]
        columns = max(9, int((box.right - box.left - 10.0) / 5.6))
        placed = inner.place(wrapped(words, columns, 6), spots, distances=(2.0,))
        if placed is not None:
            found.append(Label(placed))
    for key in order:
        rows = plane.curves[key]
        spots = _spots(plane, rows, (0.0, 0.12, 0.3, 0.5, 0.7, 0.88, 1.0))
        put(wrapped(side_name(record, key), 26), spots, styles[key].ink, bold=True)
    if plane.envelope:
        spots = _spots(plane, plane.envelope, (0.2, 0.4, 0.6, 0.8))
        put(["reference: lower envelope", "of the feasible contenders"], spots, "#4d4d4d", bold=True)
    columns = 34 if plane.x.size >= NARROW else 20
    for mark, names in _named_groups(plane):
        stands = "" if mark["ambition"] == "today" else f" ({mark['ambition']})"
        put(wrapped(", ".join(policy_name(name) for name in names) + stands, columns), [plane.pixel(mark)], INK)
    for key in order:
        for row in supplies[key]:
            put([volts(row["supply_V"])], [plane.pixel(row)], styles[key].ink, distances=(6.0, 9.0, 12.0), most=20.0)
    return found


def supplies_of(plane: Plane) -> dict[str, list[Row]]:
    """Return side key -> points of its curve that carry a supply mark, the candidate first."""
    order = sorted(
        (key for key, rows in plane.curves.items() if rows), key=lambda key: not key.startswith("candidate ")
    )
    return {key: _supply_marks(plane, plane.curves[key]) for key in order}


def _colour(record: Mapping[str, Any], mark: Row) -> str:
    """Return the colour of the side; further sets of the candidate have the candidate's."""
    styles = looks(record)
    candidate = next(key for key in styles if key.startswith("candidate "))
    return styles.get(side_key(mark), styles[candidate]).colour


def layers(record: Mapping[str, Any], plane: Plane, supplies: Mapping[str, Sequence[Row]]) -> list[Row]:
    """Return the layers, from the ground up; ``supplies`` as ``supplies_of`` chooses them."""
    styles = looks(record)
    order = list(supplies)
    labels = _labels(record, plane, order, supplies)
    canvas = Canvas(plane.x, plane.y)
    canvas.frame()
    for box, edge, _ in _regions(plane):
        canvas.rules(hatch(box), color="#bdbdbd")
        canvas.rules([edge], color=INK, strokeWidth=1.6)
    for band in ENVELOPE:
        canvas.path(envelope_path(plane.envelope), "time_s", "energy_J", **band)
    if len(plane.envelope) == 1:
        canvas.marks(plane.envelope, "time_s", "energy_J", size=420, fill="#dedede", stroke="#8a8a8a", strokeWidth=1.5)
    canvas.leaders(labels)
    for row in plane.bands:
        place, low, high = plane.x.pixel(row["time_s"]), plane.y.pixel(row["low_J"]), plane.y.pixel(row["high_J"])
        ends = [(place - 3.0, low, place + 3.0, low), (place - 3.0, high, place + 3.0, high)]
        colour = styles[side_key(row)].colour
        canvas.rules([(place, low, place, high), *ends], color=colour, strokeWidth=1.1, opacity=0.75)
    for key in reversed(order):
        look, pieces = styles[key], _segments(plane.curves[key], key)
        failing = [row for row in pieces if row["state"] != FEASIBLE]
        good = [row for row in pieces if row["state"] == FEASIBLE]
        width = max(1.0, 0.6 * look.width)
        canvas.path(failing, "time_s", "energy_J", color=look.colour, strokeWidth=width, strokeDash=FAILING_DASH)
        dash = list(look.dash) or [1, 0]
        canvas.path(good, "time_s", "energy_J", color=look.colour, strokeWidth=look.width, strokeDash=dash)
        canvas.marks(supplies[key], "time_s", "energy_J", shape=look.marker, size=34, color=look.colour)
    canvas.path(outlook_path(plane), "time_s", "energy_J", color=INK, strokeWidth=1.0, strokeDash=[6, 2])
    for mark, _ in policy_groups(plane):
        look_of_mark: Row = _AMBITION[mark["ambition"]] | {
            "shape": mark["shape"],
            "size": 110,
            "stroke": INK,
            "strokeWidth": 1.3,
        }
        canvas.marks([mark], "time_s", "energy_J", **{"fill": _colour(record, mark), **look_of_mark})
    canvas.backs(labels)
    canvas.words([words for label in labels for words in label.words()])
    return canvas.layers
