"""Tables of the draws (layer 9): shares and worth of inputs, quantiles, bands of the curves, elasticities."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from benchmark.report.rows import word

__all__ = ["band_rows", "distribution_rows", "elasticity_rows", "share_rows"]

Record = Mapping[str, Any]
Row = dict[str, Any]
NOT_STATED = "not stated"


def _found(record: Record) -> Record | None:
    return record.get("uncertainty")


def share_rows(record: Record) -> list[Row]:
    """One row per drawn input: share of the variance, worth of a measurement."""
    found = _found(record)
    if found is None:
        return []
    totals = {row["key"]: row for row in found["totals"]}
    return [
        {
            "key": row["key"],
            "evidence": row["evidence"],
            "spread": row["shape"],
            "share": row["share"],
            "share_error": row["share_error"],
            "moves_with": " ".join(row.get("moves_with", ())),
            "total_share": _total(row, totals, "total"),
            "total_share_error": _total(row, totals, "total_error"),
            "total_share_left_out": _total(row, totals, "left_out"),
            "worth_ln": row["worth"],
            "worth_error_ln": row["worth_error"],
            "worth_known_twice_as_well_ln": row["worth_halved"],
            "enough_standard_deviations": word(row["enough"], "does not matter as it is"),
            "cost": word(row["cost"], "not stated"),
            "worth_reachable_ln": word(row["worth_reachable"], "not stated"),
            "worth_per_cost": word(row["worth_per_cost"], "not stated"),
        }
        for row in found["shares"]
    ]


def _total(row: Record, totals: Mapping[str, Record], name: str) -> Any:
    """A number of the total share of an input, or which row holds that of all that moves with it."""
    if row["key"] in totals:
        return totals[row["key"]].get(name, 0.0)
    other = next((key for key in row.get("moves_with", ()) if key in totals), None)
    return "not worked out" if other is None else f"counted with {other}"


def distribution_rows(record: Record) -> list[Row]:
    """The probabilities and the whole distribution, each with its sampling error where it has one."""
    found = _found(record)
    if found is None:
        return []
    rows: list[Row] = [
        {"what": "probability of the required advantage", "share_of_draws": "", **_estimate(found["reaches"])},
        {"what": "probability of more than 1", "share_of_draws": "", **_estimate(found["above_one"])},
        {"what": "draws without a permitted point of the candidate", "share_of_draws": "",
         "value": found["without_candidate"], "sampling_error": ""},
    ]  # fmt: skip
    errors = {row["share"]: row["error"] for row in found["quantiles"]}
    rows += [
        {
            "what": "advantage at most",
            "share_of_draws": row["share"],
            "value": word(row["advantage"], "infeasible"),
            "sampling_error": errors.get(row["share"], ""),
        }
        for row in found["distribution"]
    ]
    return rows


def _estimate(found: Record) -> Row:
    return {"value": found["value"], "sampling_error": found["error"]}


def band_rows(record: Record) -> list[Row]:
    """What 80 % of the draws hold of energy and time at each supply."""
    found = _found(record)
    if found is None:
        return []
    return [
        {
            "side": row["side"],
            "role": row["role"],
            "supply_V": row["supply"],
            "energy_10_percent_J": row["energy_low"],
            "energy_90_percent_J": row["energy_high"],
            "time_10_percent_s": row["time_low"],
            "time_90_percent_s": row["time_high"],
        }
        for row in found["bands"]
    ]


def elasticity_rows(record: Record) -> list[Row]:
    """One row per input with an elasticity."""
    names = {
        "at_point": "elasticity_of_advantage_at_points",
        "reoptimised": "elasticity_of_advantage_reoptimised",
        "of_time": "elasticity_of_time",
        "of_energy": "elasticity_of_energy",
    }
    return [
        {"key": row["key"], **{column: word(row[name], "not defined") for name, column in names.items()}}
        for row in record.get("elasticities", ())
    ]
