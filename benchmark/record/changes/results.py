"""Which results of two records differ, and which are the same to the last bit (layer 8)."""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from typing import Any

__all__ = ["is_table", "result_changes"]

Record = Mapping[str, Any]
#: numbers of a design point -> unit
_POINT = {
    "supply": "V",
    "size": "1",
    "threshold_shift": "V",
    "time": "s",
    "cycle": "s",
    "energy": "J",
    "leakage_power": "W",
    "area": "m^2",
    "power_density": "W/m^2",
}
_DRAWN = ("reaches", "above_one", "mean_log", "sd_log")


def result_changes(old: Record, new: Record) -> tuple[list[dict[str, Any]], list[str]]:
    """Compare every result of two records.

    Returns
    -------
    tuple
        Rows of what differs: ``result``, ``unit``, ``old``, ``new``, ``factor`` (None where there is none); and the
        names of all results that are the same to the last bit.
    """
    before, after = dict(_results(old)), dict(_results(new))
    rows: list[dict[str, Any]] = []
    same: list[str] = []
    for name in dict.fromkeys([*before, *after]):
        one, unit = before.get(name, (None, ""))
        two, unit = after.get(name, (None, unit))
        if name in before and name in after and one == two:
            same.append(name)
            continue
        if one is None and two is None:
            continue  # stated by neither, though only one of them has the row
        rows.append({"result": name, "unit": unit, **_ends(one, two), "factor": _factor(one, two)})
    return rows, same


def _ends(one: Any, two: Any) -> dict[str, Any]:
    """What is shown of both ends: whole tables by their number of rows."""
    return {"old": _shown(one), "new": _shown(two)}


def _shown(value: Any) -> Any:
    if isinstance(value, dict):
        return "a table"
    return f"table of {len(value)} rows" if isinstance(value, list) else value


def is_table(shown: Any) -> bool:
    """Tell whether what is shown of an end stands for a whole table."""
    return isinstance(shown, str) and re.fullmatch(r"a table|table of \d+ rows", shown) is not None


def _factor(one: Any, two: Any) -> float | None:
    usable = [isinstance(x, (int, float)) and not isinstance(x, bool) for x in (one, two)]
    return float(two / one) if all(usable) and one else None


def _results(record: Record) -> Iterator[tuple[str, tuple[Any, str]]]:
    verdict = record["verdict"]
    yield "verdict", (verdict["word"], "")
    for name in ("advantage", "advantage_low", "advantage_high"):
        yield name.replace("_", " "), (verdict[name], "1")
    for row in record["policies"]:
        yield from _policy(row)
    for row in record["requirements"]:
        for name in ("state", "offered", "margin"):
            yield f"requirement {row['name']}: {name}", (row[name], row["unit"] if name == "offered" else "")
    for row in record["nodes"]:
        yield f"advantage at node pair {row['label']}", (row["advantage"], "1")
    drawn = record.get("uncertainty") or {}
    for name in _DRAWN:
        if name in drawn:
            yield f"draws: {name.replace('_', ' ')}", (drawn[name]["value"], "1")
    for row in record["curves"]:
        place = f"{row['side']}, size {row['size']:g}, threshold shift {row['threshold_shift']:g} V"
        yield f"curve of the {row['role']} {place}", (row["points"], "")
    yield "advantage against required time", (record["advantage_against_time"], "")
    for row in record["anchors"]:
        place = f"{row['name']} of {row['technology']}, node {row['node']}, at {row['supply']:.6g} V"
        yield f"check of the reference: {place}", (row["predicted"], row["unit"])
    for name in ("ladder", "robustness", "elasticities", "node_steps"):
        if name in record:
            yield f"table: {name.replace('_', ' ')}", (record[name], "")


def _policy(row: Record) -> Iterator[tuple[str, tuple[Any, str]]]:
    policy = row["policy"]
    yield f"{policy}: advantage", (row["advantage"], "1")
    yield f"{policy}: strongest contender", (row["strongest"], "")
    for role, side in [("candidate", row["candidate"]), *(("contender", side) for side in row["contenders"])]:
        point = side["point"] or {}
        where = f"{policy}: {role} {side['id']}"
        yield f"{where}: permitted point", ("yes" if side["feasible"] else side["why"], "")
        for name, unit in _POINT.items():
            if name in point:
                yield f"{where}: {name.replace('_', ' ')}", (point[name], unit)
