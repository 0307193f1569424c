"""From a row of chart data back to its mark, and on to formulas and values (layer 9)."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from benchmark.report.blocks import Cell
from benchmark.report.figure import Chart, Row
from benchmark.report.formulas import formula_of_part
from benchmark.report.section_points import anchor_of

__all__ = ["data_id", "mark_id", "trail"]

Record = Mapping[str, Any]
#: chart -> formulas of each of its rows
_FORMULAS = {
    "requirement-margins": ("margin",),
    "energy-delay": ("time", "energy"),
    "limits-along-supply": ("limit",),
    "advantage-against-time": ("advantage",),
    "ladder-steps": ("ladder",),
    "advantage-distribution": ("draws",),
    "input-swings": ("swing",),
    "advantage-by-node": ("advantage",),
    "break-even-lines": ("break-even",),
    "trade-curve": ("break-even",),
    "opportunity-activity": ("advantage", "break-even"),
    "opportunity-duty": ("advantage", "break-even"),
    "change-picture": ("time", "energy", "advantage"),
    "change-parts": ("change",),
}


def data_id(chart: str, row: int) -> str:
    """Return the id of a row of a chart's data, counted from zero."""
    return f"data-{chart}-{row + 1}"


def mark_id(chart: str, row: int) -> str:
    """Return the id of the first mark that leads to a row of a chart's data."""
    return f"{chart}-mark-{row + 1}"


def _formulas(chart: Chart, row: Row) -> list[tuple[str, str]]:
    if "part" in row:
        return [("formula", f"#formula-{formula_of_part(row['part'])}")]
    keys = ("step",) if chart.key.startswith("node-steps") else _FORMULAS[chart.key]
    if str(row.get("series", "")).startswith("reference envelope"):
        keys = ("envelope", *keys)
    return [(f"formula of {key}" if len(keys) > 1 else "formula", f"#formula-{key}") for key in keys]


def _places(record: Record) -> tuple[dict[str, int], dict[str, int]]:
    """Return ledger key -> position, and owner -> position of its first value."""
    keys: dict[str, int] = {}
    owners: dict[str, int] = {}
    for position, row in enumerate(record["ledger"], start=1):
        keys.setdefault(row["key"], position)
        owners.setdefault(row["owner"], position)
    return keys, owners


def _values(record: Record, chart: Chart, row: Row) -> list[tuple[str, str]]:
    """Return links into the ledger: to the value itself, else to the first value of the technology."""
    keys, owners = _places(record)
    key = row.get("key", row.get("cause"))
    if key in keys:
        return [("value", f"#value-{keys[key]}")]
    if chart.key == "change-parts":
        return [("values", "#ledger")]
    if "requirement" in row:
        wanted = next((place for key, place in keys.items() if key.rpartition(".")[2] == row["requirement"]), None)
        if wanted is not None:
            return [("value demanded", f"#value-{wanted}")]
    sides = [side for side in record["sides"] if "role" in row and side["role"] == row["role"]]
    named = [side for side in sides if side["id"] == row["side"]]
    candidate = [side for side in record["sides"] if side["role"] == "candidate"]
    beside = owners.get(str(row.get("side", "")))  # a further set of the candidate has the id of its technology
    if row.get("when") == "before" and not named:
        return [("values", "#ledger")]  # a contender of the earlier record alone
    place = beside or owners.get((named or candidate)[0]["technology"])
    return [("values", f"#value-{place}")] if place else [("values", "#ledger")]


def _worked(record: Record, chart: Chart, index: int, row: Row) -> list[tuple[str, str]]:
    """Return the link to the arithmetic, where the row belongs to a point that is worked out on the page."""
    if chart.key == "advantage-by-node":
        return [("both sides", f"#pair-{index + 1}")]
    primary = record["policies"][0]["policy"]
    if row.get("when") == "before":
        return []  # worked out on the page of the earlier record
    if chart.key in ("time-parts", "energy-parts"):
        place = anchor_of(record, row["role"], row["side"], chart.key.partition("-")[0])
    elif row.get("series") == "operating point" or (row.get("series") == "design point" and row["policy"] == primary):
        place = anchor_of(record, row["role"], row["side"])
    else:
        place = ""
    return [("arithmetic", place)] if place else []


def trail(record: Record, chart: Chart, index: int, row: Row) -> Cell:
    """Return the cell of links of one row of a chart's data."""
    marked = any(spot.row == index for spot in chart.spots)
    back = ("mark", f"#{mark_id(chart.key, index)}") if marked else ("chart", f"#chart-{chart.key}")
    links = [back, *_formulas(chart, row), *_worked(record, chart, index, row), *_values(record, chart, row)]
    return Cell("", links=tuple(links))
