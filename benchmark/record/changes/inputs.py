"""Which values of a ledger differ (layer 8)."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from decimal import Decimal
from typing import Any

from benchmark.units import from_si, parse_unit, to_si

__all__ = ["input_changes", "text_changes", "unit_notes"]

Row = Mapping[str, Any]
#: a number that changes by more, up or down, may have been given in another unit
SUSPICIOUS = 10.0
#: what is said of a value besides its number
_WORDS = ("evidence", "source", "where", "conditions", "bound", "formula", "date", "owner_of_choice", "note")


def input_changes(old: Sequence[Row], new: Sequence[Row]) -> list[dict[str, Any]]:
    """Return one row for every value that is not the same, node by node.

    Parameters
    ----------
    old, new : sequence of mapping
        Ledgers of two records, or rows of two sets.

    Returns
    -------
    list of dict
        ``key``, ``node``, ``old`` and ``new`` in ``unit`` (that of the new file), ``factor`` (None where there is
        none), ``range_old``, ``range_new`` as words, evidence and source of both, ``changed``: what differs.
    """
    before, after = {row["key"]: row for row in old}, {row["key"]: row for row in new}
    rows: list[dict[str, Any]] = []
    for key in dict.fromkeys([*before, *after]):
        if key not in after:
            rows += _alone(before[key], "removed")
        elif key not in before:
            rows += _alone(after[key], "added")
        else:
            rows += _rows(key, before[key], after[key])
    return rows


def _alone(row: Row, what: str) -> list[dict[str, Any]]:
    """Return a value that only one of the two has."""
    gone = what == "removed"
    sides = (row, None) if gone else (None, row)
    return [
        _row(
            row["key"],
            node,
            number if gone else None,
            None if gone else number,
            row["unit"],
            sides[0],
            sides[1],
            [what],
        )
        for node, number in _by_node(row).items()
    ]


def _rows(key: str, old: Row, new: Row) -> list[dict[str, Any]]:
    first, second = _by_node(old, new["unit"]), _by_node(new)
    words = [name.replace("_", " ") for name in _WORDS if old.get(name, "") != new.get(name, "")]
    unit = ["unit"] if old["unit"] != new["unit"] else []
    rows = []
    for node in dict.fromkeys([*first, *second]):
        one, two = _at(first, node), _at(second, node)
        what = ["value"] if not _equal(one, two, unit) else []
        if _spread(old, node, new["unit"]) != _spread(new, node, new["unit"]):
            what.append("range")
        if what:
            rows.append(_row(key, node, one, two, new["unit"], old, new, [*what, *unit, *words]))
    if not rows and (unit or words):
        node = next(iter(second))
        rows.append(_row(key, "", _at(first, node), second[node], new["unit"], old, new, [*unit, *words]))
    return rows


def _at(numbers: Mapping[str, float], node: str) -> float | None:
    """The number at a node; a single number holds at every node."""
    return numbers.get(node, numbers.get(""))


def _equal(one: float | None, two: float | None, unit: Sequence[str]) -> bool:
    """Tell whether two numbers are the same; a unit spelled otherwise may cost the last digit."""
    if one is None or two is None:
        return one is two
    return one == two or (bool(unit) and abs(one - two) <= 1e-14 * abs(two))


def _converted(number: float, unit: str, wanted: str) -> float:
    if unit == wanted:
        return number
    source, target = parse_unit(unit or "1"), parse_unit(wanted or "1")
    if source.dimension != target.dimension:
        return number
    return from_si(to_si(Decimal(repr(number)), source), target)


def _by_node(row: Row, unit: str | None = None) -> dict[str, float]:
    nodes = row["nodes"] or [""]
    wanted = row["unit"] if unit is None else unit
    return {node: _converted(number, row["unit"], wanted) for node, number in zip(nodes, row["value"], strict=False)}


def _spread(row: Row, node: str, unit: str) -> str:
    spread = row["spread"]
    if spread is None:
        return ""
    position = row["nodes"].index(node) if node in row["nodes"] else 0
    low, high = (_converted(spread[end][min(position, len(spread[end]) - 1)], row["unit"], unit) for end in _ENDS)
    return f"{spread['shape']} {low:.6g} to {high:.6g}"


_ENDS = ("low", "high")


def _row(
    key: str,
    node: str,
    old: float | None,
    new: float | None,
    unit: str,
    before: Row | None,
    after: Row | None,
    changed: Sequence[str],
) -> dict[str, Any]:
    def told(row: Row | None, name: str) -> str:
        return "" if row is None else str(row[name])

    return {
        "key": key,
        "node": node,
        "old": old,
        "new": new,
        "factor": new / old if old and new is not None else None,
        "unit": unit,
        "range_old": "" if before is None else _spread(before, node, unit),
        "range_new": "" if after is None else _spread(after, node, unit),
        "evidence_old": told(before, "evidence"),
        "evidence_new": told(after, "evidence"),
        "source_old": told(before, "source"),
        "source_new": told(after, "source"),
        "changed": list(changed),
    }


def text_changes(old: Mapping[str, str], new: Mapping[str, str], kind: str) -> list[dict[str, str]]:
    """Return what differs between two sets of named texts; an absent one is empty."""
    return [
        {"kind": kind, "name": name, "old": old.get(name, ""), "new": new.get(name, "")}
        for name in dict.fromkeys([*old, *new])
        if old.get(name, "") != new.get(name, "")
    ]


def unit_notes(changed: Sequence[Row]) -> list[str]:
    """Return a sentence for every number that changed by more than a factor 10, or its sign."""
    notes = []
    for row in changed:
        factor = row["factor"]
        if not factor or (factor > 0.0 and 1.0 / SUSPICIOUS <= factor <= SUSPICIOUS):
            continue
        place = row["key"] + (f" at {row['node']}" if row["node"] else "")
        notes.append(f"{place} changed by a factor {factor:.4g}: check units first")
    return notes
