"""Places of the energy-delay chart that lead to rows (layer 9): design points, supplies, ends of the reference."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from benchmark.report.energy_delay import FEASIBLE, Plane, envelope_path, side_name
from benchmark.report.energy_delay_layers import policy_groups
from benchmark.report.figure import Row
from benchmark.report.section_points import anchor_of
from benchmark.report.spots import LEAST, Spot, Spots
from benchmark.report.words import amount, listed, policy_name, volts

__all__ = ["spots"]

Record = Mapping[str, Any]


def _said(name: str, row: Mapping[str, Any]) -> str:
    return (
        f"{name}: supply {volts(row['supply_V'], 3)}, time {amount(row['time_s'], 's', 3)}, "
        f"energy {amount(row['energy_J'], 'J', 3)}"
    )


def spots(
    record: Record, plane: Plane, supplies: Mapping[str, Sequence[Row]], corner: tuple[float, float]
) -> tuple[Spot, ...]:
    """Return the places, with rows counted as ``energy_delay`` lists its points: curves, reference, design points.

    Parameters
    ----------
    record : mapping
        The record.
    plane : Plane
        What is drawn.
    supplies : mapping
        Side key -> points of the curve that carry a supply mark.
    corner : tuple of float
        Upper left corner of the plane in the drawing [pixel].
    """
    found = Spots(*corner)
    position, ticks = 0, []
    for key, rows in plane.curves.items():
        marked = {id(row) for row in supplies.get(key, ())}
        for row in rows:
            if id(row) in marked:
                ticks.append(plane.pixel(row))
                state = "" if row["state"] == FEASIBLE else f"; {row['state']}: {row['reason']}"
                found.mark(*plane.pixel(row), position, _said(side_name(record, key), row) + state)
            position += 1
    path = envelope_path(plane.envelope)
    for index, row in enumerate(path):
        neighbours = path[max(0, index - 1) : index + 2]
        end = index in (0, len(path) - 1) or any(other["corner"] for other in neighbours)
        x, y = plane.pixel(row)
        hidden = any(abs(x - a) < LEAST and abs(y - b) < LEAST for a, b in ticks)
        if end and not row["corner"] and not hidden:
            found.mark(x, y, position, _said(f"reference, lower envelope, here {row['side']}", row))
        position += 1
    primary = record["policies"][0]["policy"]
    first = {id(mark): position + index for index, mark in enumerate(plane.marks)}
    for mark, names in policy_groups(plane):
        words = f"design point, {listed(map(policy_name, names))}"
        name = side_name(record, f"{mark['role']} {mark['side']}")
        href = anchor_of(record, mark["role"], mark["side"]) if primary in names else ""
        found.mark(*plane.pixel(mark), first[id(mark)], f"{_said(name, mark)}; {words}", href)
    return found.found()
