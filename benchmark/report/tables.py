"""Tidy tables of a record (layer 9), each from the record alone; units stand in the column names.

Where there is no number the cell holds a word and a ``reason`` column says why: infeasible is never a blank or a zero.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from benchmark.record.changes.words import COLUMNS, change_rows
from benchmark.report.rows import (
    INFEASIBLE,
    NOT_PERMITTED,
    advantage_rows,
    curve_rows,
    envelope_rows,
    flips_of,
    part_rows,
    policy_rows,
    ratio_columns,
    sides_of,
    word,
)
from benchmark.report.steps import step_rows
from benchmark.report.strength_rows import ladder_rows, robustness_rows
from benchmark.report.uncertainty_rows import band_rows, distribution_rows, elasticity_rows, share_rows

if TYPE_CHECKING:
    import pandas

__all__ = ["frames", "ledger_table", "plain_tables", "tables", "write_csv"]

Record = Mapping[str, Any]
Row = dict[str, Any]
NOT_STATED = "not stated"


def _limits(record: Record) -> list[Row]:
    return [
        {
            "policy": policy["policy"],
            "role": role,
            "side": side["id"],
            "limit": name,
            "margin": word(margin, NOT_STATED),
        }
        for policy in record["policies"]
        for role, side in sides_of(policy)
        for name, margin in (side["point"]["device_margins"] if side["point"] else {}).items()
    ]


def _requirements(record: Record) -> list[Row]:
    return [
        {
            "requirement": row["name"],
            "kind": row["kind"],
            "state": row["state"],
            "demanded": word(row["demanded"], NOT_STATED),
            "offered": word(row["offered"], NOT_STATED),
            "unit": row["unit"],
            "margin_factor": word(row["margin"], "unknown"),
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


def _flips(row: Mapping[str, Any]) -> Row:
    """Where moving down and moving up change the answer."""
    found = flips_of(row)
    instead = "not found" if row["straddles"] and not found else "does not flip"
    best = row["best"]
    below = [value for value in found if value <= best]
    above = [value for value in found if value > best]
    return {"flips_below": below[0] if below else instead, "flips_above": above[0] if above else instead}


def _moves(record: Record) -> list[Row]:
    rows = []
    for row in record["verdict"]["moves"]:
        ranged = row["ranged"]
        rows.append(
            {
                "input": row["key"],
                "unit": row["unit"],
                "evidence": row["evidence"],
                "best": word(row["best"], NOT_STATED),
                "low": word(row["low"], "no range stated"),
                "high": word(row["high"], "no range stated"),
                "advantage_at_low": word(row["advantage_low"], NOT_PERMITTED) if ranged else "no range stated",
                "advantage_at_high": word(row["advantage_high"], NOT_PERMITTED) if ranged else "no range stated",
                **_flips(row),
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


def _crossings(record: Record) -> list[Row]:
    return [{"advantage": row["level"], "time_s": row["time"]} for row in record["crossings"]]


def _closed_form(record: Record) -> list[Row]:
    return [
        {
            "side": row["side"],
            "net": row["net"],
            "supply_V": row["supply"],
            "temperature_K": row["temperature"],
            "delay_rule": row["rule"],
            "closed_form_delay_s": row["closed_delay"],
            "transient_delay_s": word(row["transient_delay"], "not solved"),
            "relative_difference": word(row["difference"], "not solved"),
            "note": row["note"],
        }
        for row in record["closed_form"]
    ]


def _error_bands(record: Record) -> list[Row]:
    return [
        {
            "side": row["side"],
            "quantity": row["quantity"],
            "closed_over_simulated_low": word(row["ratio_low"], "not measured"),
            "closed_over_simulated_high": word(row["ratio_high"], "not measured"),
            "share_measured": row["covered"],
            "points": row["points"],
            "measured_over": row["over"],
            "not_measured": "; ".join(part["why"] for part in row["missing"]),
        }
        for row in record.get("error_bands", {}).get("sides", ())
    ]


def ledger_table(record: Record) -> list[Row]:
    """Every value used, one row per node."""
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
                    "moves_result": word(row["matters"], "not moved"),
                    "decisive": word(row["decisive"], "not moved"),
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
        return [{column: text} for text in record.get(key, ())]

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
    rows = []
    for side in record["sides"]:
        apart = ("supply", "threshold_shifts", "back_biases")
        named = {key: _joined(value) for key, value in side.items() if key not in apart}
        low, high = side["supply"]
        shifts = _joined(side["threshold_shifts"])
        biases = {"back_biases_V": _joined(side["back_biases"])} if "back_biases" in side else {}
        rows.append(named | {"supply_low_V": low, "supply_high_V": high, "threshold_shifts_V": shifts} | biases)
    return rows


def _files(record: Record) -> list[Row]:
    return [{key: row[key] for key in ("name", "kind", "sha256")} for row in record["files"]]


_BUILDERS: dict[str, Callable[[Record], list[Row]]] = {
    "curves": curve_rows,
    "reference_envelope": envelope_rows,
    "advantage_against_time": advantage_rows,
    "crossings": _crossings,
    "policies": policy_rows,
    "ladder": ladder_rows,
    "robustness": robustness_rows,
    "elasticities": elasticity_rows,
    "uncertainty": distribution_rows,
    "uncertainty_inputs": share_rows,
    "uncertainty_bands": band_rows,
    "parts": part_rows,
    "device_limits": _limits,
    "requirements": _requirements,
    "moves": _moves,
    "nodes": _nodes,
    "node_steps": step_rows,
    "anchors": _anchors,
    "closed_form": _closed_form,
    "error_bands": _error_bands,
    "ledger": ledger_table,
    "options": _plain("options"),
    "sides": _side_rows,
    "sources": _sources,
    "conventions": _plain("conventions"),
    "circuit_assumptions": _named("circuit_assumptions", "assumption"),
    "not_modelled": _plain("not_modelled"),
    "self_checks": _plain("self_checks"),
    "warnings": _named("warnings", "warning"),
    "notes": _named("notes", "note"),
    "files": _files,
}


def plain_tables(record: Record) -> dict[str, list[Row]]:
    """Return table name -> rows, in a fixed order, with the column names of an ordinary record."""
    found = {name: build(record) for name, build in _BUILDERS.items()}
    if record.get("change") is not None:
        found["changes"] = [{name: row.get(name, "") for name in COLUMNS} for row in change_rows(record["change"])]
    return found


def tables(record: Record) -> dict[str, list[Row]]:
    """Return table name -> rows, in a fixed order; the columns of a ratio-only record say so."""
    found = plain_tables(record)
    if record.get("ratio_only"):
        found = {name: rows if name == "ledger" else ratio_columns(rows) for name, rows in found.items()}
    return found


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
