"""Rows of a record that tables and charts share (layer 9): swept points, envelope, advantage, policies, parts.

Units stand in the column names. Where there is no number the cell holds a word and a ``reason`` column says why.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from benchmark.record.shown_units import NORMALISED
from benchmark.report.words import is_number, state_word

__all__ = [
    "INFEASIBLE",
    "NOT_PERMITTED",
    "advantage_rows",
    "curve_rows",
    "envelope_rows",
    "flips_of",
    "part_rows",
    "policy_rows",
    "ratio_columns",
    "sides_of",
    "word",
]

Record = Mapping[str, Any]
Row = dict[str, Any]
#: end of a column name -> its unit; longer ends first
_ENDS = {"_W_per_m2": "W/m^2", "_m2": "m^2", "_s": "s", "_J": "J", "_V": "V", "_W": "W"}
INFEASIBLE = "infeasible"
#: where a moved input leaves a side without permitted point, or makes the candidate miss a requirement
NOT_PERMITTED = "infeasible or a requirement missed"


def ratio_columns(rows: Sequence[Mapping[str, Any]]) -> list[Row]:
    """Name the columns of a ratio-only record: ``time_over_T0`` in place of ``time_s``; units of rows likewise."""

    def name(column: str) -> str:
        for end, unit in _ENDS.items():
            if column.endswith(end):
                return f"{column.removesuffix(end)}_over_{NORMALISED[unit]}"
        return column.removesuffix("_SI") + "_ratio" if column.endswith("_SI") else column

    def cell(column: str, value: Any) -> Any:
        return NORMALISED.get(value, value) if column == "unit" else value

    return [{name(column): cell(column, value) for column, value in row.items()} for row in rows]


def word(value: Any, instead: str) -> Any:
    """Return a word where the record has no value."""
    return instead if value is None else value


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
            "time_s": word(point["time"], "cannot be evaluated"),
            "energy_J": word(point["energy"], "cannot be evaluated"),
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
            "advantage": word(row["advantage"], INFEASIBLE),
            "reason": _reach(row),
            "strongest_contender": row["strongest"] or INFEASIBLE,
            "candidate_energy_J": row["candidate_energy"] if is_number(row["candidate_energy"]) else INFEASIBLE,
            "reference_energy_J": row["reference_energy"] if is_number(row["reference_energy"]) else INFEASIBLE,
        }
        for row in record["advantage_against_time"]
    ]


def flips_of(move: Mapping[str, Any]) -> list[float]:
    """Return the values at which an input moved alone changes the answer: none, one, or one on each side."""
    named = [move.get("flip_low"), move.get("flip_high")]
    return [value for value in (named if any(map(is_number, named)) else [move["flip"]]) if is_number(value)]


def sides_of(policy: Mapping[str, Any]) -> list[tuple[str, Mapping[str, Any]]]:
    """Return role and side of a policy, candidate first."""
    return [("candidate", policy["candidate"]), *(("contender", side) for side in policy["contenders"])]


def policy_rows(record: Record) -> list[Row]:
    """One row per policy and side."""
    rows = []
    for policy in record["policies"]:
        for role, side in sides_of(policy):
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
                    "advantage": word(policy["advantage"] if role == "candidate" else side["advantage"], INFEASIBLE),
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
        for role, side in sides_of(policy):
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
