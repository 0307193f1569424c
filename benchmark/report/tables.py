"""Tidy tables of a record (layer 9), each from the record alone; units stand in the column names.

Where there is no number the cell holds a word and a ``reason`` column says why: infeasible is never a blank or a zero.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from benchmark.report.words import is_number, state_word

if TYPE_CHECKING:
    import pandas

__all__ = [
    "INFEASIBLE",
    "advantage_rows",
    "curve_rows",
    "envelope_rows",
    "frames",
    "part_rows",
    "policy_rows",
    "tables",
    "write_csv",
]

Record = Mapping[str, Any]
Row = dict[str, Any]
INFEASIBLE = "infeasible"
NOT_STATED = "not stated"


def _word(value: Any, word: str) -> Any:
    return word if value is None else value


def curve_rows(record: Record) -> list[Row]:
    """Every swept point of every side."""
    return [
        {
            "role": curve["role"],
            "side": curve["side"],
            "technology": curve["technology"],
            "size": curve["size"],
            "threshold_shift_V": curve["threshold_shift"],
            "supply_V": point["supply"],
            "time_s": _word(point["time"], "cannot be evaluated"),
            "energy_J": _word(point["energy"], "cannot be evaluated"),
            "state": state_word(point["feasible"]),
            "reason": "; ".join(point["reasons"]),
            "delay_limit": point["delay_limit"],
            "energy_limit": point["energy_limit"],
        }
        for curve in record["curves"]
        for point in curve["points"]
    ]


def envelope_rows(record: Record) -> list[Row]:
    """Return the lower envelope of all contenders' feasible points: no other such point is as fast with less energy."""
    rows = [row for row in curve_rows(record) if row["role"] == "contender" and row["state"] == state_word(True)]
    rows = [row for row in rows if is_number(row["time_s"]) and is_number(row["energy_J"])]
    rows.sort(key=lambda row: (row["time_s"], row["energy_J"], row["side"]))
    kept: list[Row] = []
    for row in rows:
        if not kept or row["energy_J"] < kept[-1]["energy_J"]:
            kept.append({key: row[key] for key in ("time_s", "energy_J", "side", "supply_V")})
    return kept


def _reach(row: Mapping[str, Any]) -> str:
    candidate, reference = is_number(row["candidate_energy"]), is_number(row["reference_energy"])
    if candidate and reference:
        return ""
    if candidate:
        return "no contender reaches this time"
    return "the candidate does not reach this time" if reference else "neither side reaches this time"


def advantage_rows(record: Record) -> list[Row]:
    """Advantage against required time."""
    return [
        {
            "time_s": row["time"],
            "advantage": _word(row["advantage"], INFEASIBLE),
            "reason": _reach(row),
            "strongest_contender": row["strongest"] or INFEASIBLE,
            "candidate_energy_J": row["candidate_energy"] if is_number(row["candidate_energy"]) else INFEASIBLE,
            "reference_energy_J": row["reference_energy"] if is_number(row["reference_energy"]) else INFEASIBLE,
        }
        for row in record["advantage_against_time"]
    ]


def _sides(policy: Mapping[str, Any]) -> list[tuple[str, Mapping[str, Any]]]:
    return [("candidate", policy["candidate"]), *(("contender", side) for side in policy["contenders"])]


def policy_rows(record: Record) -> list[Row]:
    """One row per policy and side."""
    rows = []
    for policy in record["policies"]:
        for role, side in _sides(policy):
            point = side["point"]
            rows.append(
                {
                    "policy": policy["policy"],
                    "diagnostic": policy["diagnostic"],
                    "role": role,
                    "side": side["id"],
                    "strongest": role == "contender" and side["id"] == policy["strongest"],
                    "state": state_word(side["feasible"]),
                    "reason": "" if side["feasible"] else side.get("why") or "no permitted point under this policy",
                    "advantage": _word(policy["advantage"] if role == "candidate" else side["advantage"], INFEASIBLE),
                    "supply_V": point["supply"] if point else INFEASIBLE,
                    "size": point["size"] if point else INFEASIBLE,
                    "threshold_shift_V": point["threshold_shift"] if point else INFEASIBLE,
                    "time_s": point["time"] if point else INFEASIBLE,
                    "cycle_s": point["cycle"] if point else INFEASIBLE,
                    "energy_J": point["energy"] if point else INFEASIBLE,
                    "leakage_power_W": point["leakage_power"] if point else INFEASIBLE,
                    "area_m2": point["area"] if point else INFEASIBLE,
                    "power_density_W_per_m2": point["power_density"] if point else INFEASIBLE,
                    "place": side["at"],
                }
            )
    return rows


def part_rows(record: Record) -> list[Row]:
    """Parts of time and energy of every side under every policy."""
    rows = []
    for policy in record["policies"]:
        for role, side in _sides(policy):
            point = side["point"]
            for quantity, unit in (("time", "s"), ("energy", "J")):
                parts = point[f"{quantity}_parts"] if point else {}
                total = sum(parts.values())
                rows += [
                    {
                        "policy": policy["policy"],
                        "role": role,
                        "side": side["id"],
                        "quantity": quantity,
                        "part": part,
                        "value_SI": value,
                        "unit": unit,
                        "share": value / total if total > 0.0 else 0.0,
                    }
                    for part, value in parts.items()
                ]
    return rows


def _limits(record: Record) -> list[Row]:
    return [
        {
            "policy": policy["policy"],
            "role": role,
            "side": side["id"],
            "limit": name,
            "margin": _word(margin, NOT_STATED),
        }
        for policy in record["policies"]
        for role, side in _sides(policy)
        for name, margin in (side["point"]["device_margins"] if side["point"] else {}).items()
    ]


def _requirements(record: Record) -> list[Row]:
    return [
        {
            "requirement": row["name"],
            "kind": row["kind"],
            "state": row["state"],
            "demanded": _word(row["demanded"], NOT_STATED),
            "offered": _word(row["offered"], NOT_STATED),
            "unit": row["unit"],
            "margin_factor": _word(row["margin"], "unknown"),
            "met_somewhere": row["passes_somewhere"],
            "meaning": row["meaning"],
            "note": row["note"],
        }
        for row in record["requirements"]
    ]


def _nodes(record: Record) -> list[Row]:
    rows = []
    for row in record["nodes"]:
        named = {
            "node": row["label"],
            "candidate_node": row["candidate_node"],
            "advantage": row["advantage"],
            "reason": row["note"],
            "strongest_contender": row["strongest"],
            "candidate_energy_J": row["candidate_energy"],
            "candidate_time_s": row["candidate_time"],
            "candidate_supply_V": row["candidate_supply"],
            "reference_energy_J": row["reference_energy"],
            "reference_time_s": row["reference_time"],
            "reference_supply_V": row["reference_supply"],
        }
        rows.append(
            {key: INFEASIBLE if value in (None, "") and key != "reason" else value for key, value in named.items()}
        )
    return rows


def _moves(record: Record) -> list[Row]:
    rows = []
    for row in record["verdict"]["moves"]:
        ranged = row["ranged"]
        rows.append(
            {
                "input": row["key"],
                "unit": row["unit"],
                "evidence": row["evidence"],
                "best": row["best"],
                "low": _word(row["low"], "no range stated"),
                "high": _word(row["high"], "no range stated"),
                "advantage_at_low": _word(row["advantage_low"], INFEASIBLE) if ranged else "no range stated",
                "advantage_at_high": _word(row["advantage_high"], INFEASIBLE) if ranged else "no range stated",
                "flips_at": _word(row["flip"], "does not flip" if not row["straddles"] else "at an infeasible end"),
                "decisive": row["decisive"],
            }
        )
    return rows


def _anchors(record: Record) -> list[Row]:
    return [
        {
            "technology": row["technology"],
            "node": row["node"],
            "anchor": row["name"],
            "supply_V": row["supply"],
            "published_SI": row["published"],
            "published_low_SI": row["low"],
            "published_high_SI": row["high"],
            "predicted_SI": row["predicted"],
            "unit_of_source": row["unit"],
            "relative_difference": row["difference"],
            "kind": "fitted" if row["fitted"] else "predicted",
            "source": row["source"],
            "where": row["where"],
            "conditions": row["conditions"],
        }
        for row in record["anchors"]
    ]


def _closed_form(record: Record) -> list[Row]:
    return [
        {
            "side": row["side"],
            "net": row["net"],
            "supply_V": row["supply"],
            "temperature_K": row["temperature"],
            "delay_rule": row["rule"],
            "closed_form_delay_s": row["closed_delay"],
            "transient_delay_s": _word(row["transient_delay"], "not solved"),
            "relative_difference": _word(row["difference"], "not solved"),
            "note": row["note"],
        }
        for row in record["closed_form"]
    ]


def _ledger(record: Record) -> list[Row]:
    rows = []
    for row in record["ledger"]:
        spread = row["spread"]
        for position, value in enumerate(row["value"]):
            rows.append(
                {
                    "owner": row["owner"],
                    "name": row["name"],
                    "symbol": row["symbol"],
                    "node": row["nodes"][position] if row["nodes"] else "",
                    "value": value,
                    "unit": row["unit"],
                    "low": _at(spread["low"], position) if spread else "no range stated",
                    "high": _at(spread["high"], position) if spread else "no range stated",
                    "range_shape": spread["shape"] if spread else "",
                    "range_meaning": spread["meaning"] if spread else "",
                    **{
                        key: row[key]
                        for key in ("evidence", "bound", "source", "where", "conditions", "set_by", "origin")
                    },
                    "owner_of_choice": row["owner_of_choice"],
                    "meaning": row["meaning"],
                    "note": row["note"],
                    "formula": row["formula"],
                    "date": row["date"],
                    "file": row["file"],
                    "line": row["line"],
                    "moves_result": _word(row["matters"], "not moved"),
                    "decisive": _word(row["decisive"], "not moved"),
                }
            )
    return rows


def _at(values: Sequence[Any], position: int) -> Any:
    return values[min(position, len(values) - 1)]


def _plain(key: str) -> Callable[[Record], list[Row]]:
    def rows(record: Record) -> list[Row]:
        return [dict(row) for row in record[key]]

    return rows


def _named(key: str, column: str) -> Callable[[Record], list[Row]]:
    def rows(record: Record) -> list[Row]:
        return [{column: text} for text in record[key]]

    return rows


def _sources(record: Record) -> list[Row]:
    return [
        {
            "number": position,
            "key": key,
            **{name: _joined(value) for name, value in source.items() if name not in ("key", "citation")},
        }
        for position, (key, source) in enumerate(record["sources"].items(), start=1)
    ]


def _joined(value: Any) -> Any:
    return "; ".join(str(item) for item in value) if isinstance(value, (list, tuple)) else value


def _side_rows(record: Record) -> list[Row]:
    return [{key: _joined(value) for key, value in side.items()} for side in record["sides"]]


def _files(record: Record) -> list[Row]:
    return [{key: row[key] for key in ("name", "kind", "sha256")} for row in record["files"]]


_BUILDERS: dict[str, Callable[[Record], list[Row]]] = {
    "curves": curve_rows,
    "reference_envelope": envelope_rows,
    "advantage_against_time": advantage_rows,
    "crossings": _plain("crossings"),
    "policies": policy_rows,
    "parts": part_rows,
    "device_limits": _limits,
    "requirements": _requirements,
    "moves": _moves,
    "nodes": _nodes,
    "anchors": _anchors,
    "closed_form": _closed_form,
    "ledger": _ledger,
    "options": _plain("options"),
    "sides": _side_rows,
    "sources": _sources,
    "conventions": _plain("conventions"),
    "circuit_assumptions": _named("circuit_assumptions", "assumption"),
    "not_modelled": _plain("not_modelled"),
    "self_checks": _plain("self_checks"),
    "warnings": _named("warnings", "warning"),
    "files": _files,
}


def tables(record: Record) -> dict[str, list[Row]]:
    """Return table name -> rows, in a fixed order."""
    return {name: build(record) for name, build in _BUILDERS.items()}


def frames(record: Record) -> dict[str, pandas.DataFrame]:
    """Return table name -> tidy pandas frame; an empty table is a frame without rows."""
    import pandas

    return {name: pandas.DataFrame(rows) for name, rows in tables(record).items()}


def write_csv(rows: Sequence[Mapping[str, Any]], path: Path) -> None:
    """Write one table: one header row, shortest exact numbers, unix line ends."""
    import pandas

    if rows:
        pandas.DataFrame(rows).to_csv(path, index=False, lineterminator="\n")
    else:
        path.write_text("no rows\n", encoding="utf-8")
