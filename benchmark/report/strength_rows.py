"""Rows of the ladders and of the table of robustness, for tables of a record (layer 9)."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from benchmark.report.rows import INFEASIBLE, word

__all__ = ["ladder_rows", "robustness_rows"]

Record = Mapping[str, Any]
Row = dict[str, Any]


def ladder_rows(record: Record) -> list[Row]:
    """Every rung of both ladders."""
    return [
        {
            "ladder_of": ladder["of"],
            "rung": rung["name"],
            "offered": rung["offered"],
            "advantage": word(rung["advantage"], INFEASIBLE),
            "turn": ladder["state"] if rung["name"] == ladder["turn"] else "",
            "side": rung["side"] or INFEASIBLE,
            "supply_V": word(rung["supply"], INFEASIBLE),
            "copies": word(rung["copies"], INFEASIBLE),
            "back_bias_V": word(rung["back_bias"], INFEASIBLE),
            "gated": rung["gated"],
            "reason": rung["why"],
        }
        for ladder in record.get("ladder", ())
        for rung in ladder["rungs"]
    ]


def robustness_rows(record: Record) -> list[Row]:
    """Every cell; ``temperature_K`` is a number where the cell has one temperature, else the word all."""
    return [
        {
            **{name: cell[name] for name in ("policy", "contenders", "pair")},
            "temperature_K": cell["temperatures"][0] if len(cell["temperatures"]) == 1 else "all",
            "advantage": word(cell["advantage"], INFEASIBLE),
            "level": cell["level"],
            "strongest": cell["strongest"] or INFEASIBLE,
            "declared": cell["declared"],
            "reason": cell["why"],
        }
        for cell in record.get("robustness", {}).get("cells", ())
    ]
