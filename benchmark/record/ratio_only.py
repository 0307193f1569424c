"""A record without absolute values (layer 8): what may leave a house whose reference is confidential.

Built anew from named parts, so what is not named here is not in it. Times are multiples of T0 (the required time where
the study states one, else the candidate's), energies, supplies, leakage powers, areas and power densities multiples of
the candidate's at its design point of the primary policy. The candidate's absolute values go too: with them, every
ratio would give the reference away. So do values of the study and of wires that have a dimension, the texts of all
input files, and numbers in free texts. Requirements without a base value are stated as multiples of what is demanded,
ranges and flip values of inputs as multiples of the best estimate. Sides whose name carries a number are renamed.

What a reader knows from elsewhere is not protected: who knows the required time knows T0, hence every time.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from benchmark.record.criteria import without_limits
from benchmark.record.findings import findings
from benchmark.record.scrub import LEFT_OUT, printed_forms, scrubbed

__all__ = ["ratio_only"]

Record = Mapping[str, Any]
Row = dict[str, Any]
OF_BEST = "of best"
#: keys of the study that hold words, counts and factors
_STUDY = (
    *("id", "declared", "owner", "demonstration", "product_class", "circuit", "timing", "leakage_accounting", "idle"),
    *("temperatures", "delay_rule", "short_circuit", "guard_band_delay", "guard_band_leakage", "wires"),
    *("primary_policy", "also", "metric", "exponent", "required_advantage", "headline", "headline_nodes"),
    *("supply_points", "refine_relative", "sha256"),
)
#: field of a design point -> base value
_POINT = {
    **dict.fromkeys(("supply", "threshold_shift", "back_bias"), "V"),
    **dict.fromkeys(("time", "cycle"), "s"),
    "energy": "J",
    "leakage_power": "W",
    "area": "m^2",
    "power_density": "W/m^2",
}


def _number(value: Any) -> bool:
    return isinstance(value, (int, float)) and not isinstance(value, bool) and math.isfinite(value)


def _over(value: Any, base: Any) -> Any:
    """Return value / base; words stay, what has no base becomes unknown."""
    if not _number(value):
        return value
    return value / base if _number(base) and base != 0.0 else None


@dataclass(frozen=True)
class _Maker:
    """The bases and the numbers that may be told in texts."""

    record: Record
    base: Mapping[str, Any]
    told: frozenset[str]

    def say(self, text: Any) -> Any:
        return scrubbed(text, self.told) if isinstance(text, str) else text

    def texts(self, items: Sequence[Any]) -> list[Any]:
        return [self.say(item) for item in items]

    def by(self, value: Any, unit: str) -> Any:
        return _over(value, self.base[unit])

    def point(self, point: Record | None, role: str) -> Row | None:
        if point is None:
            return None
        return {
            **{name: self.by(point[name], unit) for name, unit in _POINT.items() if name in point},
            **{name: point[name] for name in ("size", "copies", "gated") if name in point},
            "time_parts": {name: self.by(value, "s") for name, value in point["time_parts"].items()},
            "energy_parts": {name: self.by(value, "J") for name, value in point["energy_parts"].items()},
            **{name: point[name] for name in ("delay_shares", "energy_shares", "delay_limit", "energy_limit")},
            "device_margins": dict(point["device_margins"]) if role == "candidate" else {},
        }

    def side(self, side: Record, role: str) -> Row:
        kept = {name: side[name] for name in ("id", "feasible", "at")}
        found = kept | {"why": self.say(side["why"]), "point": self.point(side["point"], role)}
        return found | ({"advantage": side["advantage"]} if role == "contender" else {})

    def policies(self) -> list[Row]:
        return [
            {name: row[name] for name in ("policy", "diagnostic", "advantage", "strongest")}
            | {name: row[name] for name in ("topology", "circuit") if name in row}
            | {"candidate": self.side(row["candidate"], "candidate")}
            | {"contenders": [self.side(side, "contender") for side in row["contenders"]]}
            for row in self.record["policies"]
        ]

    def ladder(self) -> list[Row]:
        return [
            {name: ladder[name] for name in ("of", "state", "turn")}
            | {
                "rungs": [
                    {name: rung[name] for name in ("name", "offered", "advantage", "side", "copies", "gated")}
                    | {name: self.by(rung[name], "V") for name in ("supply", "back_bias")}
                    | {"why": self.say(rung["why"])}
                    for rung in ladder["rungs"]
                ]
            }
            for ladder in self.record.get("ladder", ())
        ]

    def robustness(self) -> Row:
        found = self.record.get("robustness")
        if found is None:
            return {}
        kept = ("policy", "contenders", "pair", "temperatures", "advantage", "level", "strongest", "declared")
        cells = [{name: cell[name] for name in kept} | {"why": self.say(cell["why"])} for cell in found["cells"]]
        counts = {name: found[name] for name in ("reaching", "better", "infeasible", "worst")}
        return {"robustness": counts | {"cells": cells}}

    def uncertainty(self) -> Row | None:
        found = self.record.get("uncertainty")
        if found is None:
            return None
        shares = [{**row, "unit": OF_BEST} for row in found["shares"]]
        bounds = [{"key": row["key"]} for row in found["bounds"]]
        return dict(found) | {"shares": shares, "bounds": bounds, "bands": []}

    def curves(self) -> list[Row]:
        return [
            {name: curve[name] for name in ("side", "role", "size", "technology")}
            | {"threshold_shift": self.by(curve["threshold_shift"], "V")}
            | {
                "points": [
                    {name: self.by(point[name], _POINT[name]) for name in ("supply", "time", "energy")}
                    | {name: point[name] for name in ("feasible", "delay_limit", "energy_limit")}
                    | {"reasons": self.texts(point["reasons"])}
                    for point in curve["points"]
                ]
            }
            for curve in self.record["curves"]
        ]

    def advantages(self) -> list[Row]:
        return [
            {"time": self.by(row["time"], "s"), "advantage": row["advantage"], "strongest": row["strongest"]}
            | {name: self.by(row[name], "J") for name in ("candidate_energy", "reference_energy")}
            for row in self.record["advantage_against_time"]
        ]

    def nodes(self) -> list[Row]:
        units = {"energy": "J", "time": "s", "supply": "V"}
        return [
            {name: row[name] for name in ("label", "candidate_node", "advantage", "strongest")}
            | {
                f"{side}_{name}": self.by(row[f"{side}_{name}"], unit)
                for side in ("candidate", "reference")
                for name, unit in units.items()
            }
            | {"note": self.say(row["note"])}
            for row in self.record["nodes"]
        ]

    def requirements(self) -> list[Row]:
        return [
            {name: row[name] for name in ("name", "kind", "state", "margin", "meaning", "passes_somewhere")}
            | self.demand(row)
            | {"note": self.say(row["note"])}
            for row in self.record["requirements"]
        ]

    def demand(self, row: Record) -> Row:
        """Return demanded and offered in base values where there is one, else as multiples of what is demanded."""
        unit = row["unit"]
        base = self.base[unit] if unit in self.base else row["demanded"]
        ends = {name: _over(row[name], base) for name in ("demanded", "offered")}
        return ends | {"unit": unit if unit in self.base else "1"}

    def anchors(self) -> list[Row]:
        return [
            {name: row[name] for name in ("technology", "node", "name", "difference", "fitted", "source")}
            | {name: _over(row[name], row["published"]) for name in ("published", "low", "high", "predicted")}
            | {"unit": "1", "supply": LEFT_OUT}  # a public supply over V0 would give V0
            | {name: self.say(row[name]) for name in ("where", "conditions")}
            for row in self.record["anchors"]
        ]

    def closed_form(self) -> list[Row]:
        return [
            {name: row[name] for name in ("side", "net", "temperature", "rule", "difference")}
            | {"supply": self.by(row["supply"], "V"), "note": self.say(row["note"])}
            | {name: self.by(row[name], "s") for name in ("closed_delay", "transient_delay")}
            for row in self.record["closed_form"]
        ]

    def error_bands(self) -> Row:
        bands = self.record.get("error_bands", {"sides": (), "advantage": None})
        rows = [
            {name: self.say(value) for name, value in row.items()}
            | {"missing": [{"share": part["share"], "why": self.say(part["why"])} for part in row["missing"]]}
            for row in bands["sides"]
        ]
        return {"sides": rows, "advantage": bands["advantage"]}

    def moves(self) -> list[Row]:
        ends = ("best", "low", "high", "flip", "flip_low", "flip_high")
        kept = ("key", "name", "evidence", "advantage_low", "advantage_high", "ranged", "straddles", "matters")
        return [
            {name: row[name] for name in (*kept, "decisive")}
            | {name: _over(row.get(name), row["best"]) for name in ends}
            | {"unit": OF_BEST}
            for row in self.record["verdict"]["moves"]
        ]

    def verdict(self) -> Row:
        verdict = self.record["verdict"]
        kept = ("word", "advantage", "advantage_low", "advantage_high", "inputs_with_effect", "inputs_without_range")
        return (
            {name: verdict[name] for name in (*kept, "inputs_of_judgement", "without_effect")}
            | {name: self.texts(verdict[name]) for name in ("reasons", "conditions", "measure_next")}
            | {"moves": self.moves()}
        )

    def ledger(self) -> list[Row]:
        return [self.entry(row) for row in self.record["ledger"]]

    def entry(self, row: Record) -> Row:
        kept = ("key", "owner", "name", "symbol", "meaning", "nodes", "unit", "evidence", "source", "source_read")
        more = ("owner_of_choice", "bound", "date", "set_by", "file", "line", "matters", "decisive")
        shown = row["unit"] == "1" and row["owner"].split(".")[0] in ("study", "circuit")
        spread = row["spread"]
        if spread is not None:
            spread = {
                "shape": spread["shape"],
                **{
                    end: [_over(x, row["value"][min(i, len(row["value"]) - 1)]) for i, x in enumerate(spread[end])]
                    for end in ("low", "high")
                },
                "meaning": f"{spread['meaning']}, as multiples of the best estimate",
            }
        return (
            {name: row[name] for name in (*kept, *more)}
            | {"value": list(row["value"]) if shown else [LEFT_OUT] * len(row["value"]), "spread": spread}
            | {name: self.say(row[name]) for name in ("where", "conditions", "note", "formula", "origin")}
        )

    def sides(self) -> list[Row]:
        kept = ("id", "role", "technology", "ambition", "model", "sizes", "sha256")
        return [
            {name: side[name] for name in (*kept, "circuit", "copies") if name in side}
            | {name: self.say(side[name]) for name in ("title", "flavour", "note")}
            | {name: [LEFT_OUT] * len(side[name]) for name in ("supply", "threshold_shifts")}
            for side in self.record["sides"]
        ]

    def study(self) -> Row:
        study = self.record["study"]
        return (
            {name: study[name] for name in _STUDY if name in study}
            | {name: self.say(study[name]) for name in ("title", "note", "product", "operation")}
            | {
                "required_time": self.by(study["required_time"], "s"),
                "required_energy": self.by(study["required_energy"], "J"),
            }
        )

    def conventions(self) -> list[Row]:
        rows = [row for row in self.record["conventions"] if row["name"] != "delay factor in use"]
        return [row | {"text": self.say(row["text"])} if row["name"] == "operation" else dict(row) for row in rows]

    def sources(self) -> Row:
        return {
            key: {name: self.say(value) if name == "note" else value for name, value in source.items()}
            for key, source in self.record["sources"].items()
        }


def _bases(record: Record) -> tuple[Row, str]:
    """Return base values by unit, and in words what they are."""
    primary = record["policies"][0]["candidate"]["point"]
    found: Row = dict.fromkeys(("s", "J", "V", "W", "m^2", "W/m^2"))
    words = "the candidate's at its design point of the primary policy"
    if primary is not None:
        found = {unit: abs(primary[name]) for name, unit in reversed(_POINT.items()) if name in _BASES}
    else:
        words = "those of the first point of the first curve that can be evaluated"
        for curve in record["curves"]:
            point = next((p for p in curve["points"] if _number(p["time"]) and _number(p["energy"])), None)
            if point is not None:
                found |= {"s": point["time"], "J": point["energy"], "V": point["supply"]}
                break
    demanded = next((row["demanded"] for row in record["requirements"] if row["name"] == "deadline"), None)
    required = demanded if _number(demanded) else record["study"]["required_time"]
    if _number(required):
        found["s"] = required
        return found, f"T0 is the required time; E0, V0, P0, A0 and D0 (power density) are {words}"
    return found, f"T0, E0, V0, P0, A0 and D0 (power density) are {words}"


#: fields of the candidate's design point that give the bases
_BASES = ("supply", "time", "energy", "leakage_power", "area", "power_density")


def ratio_only(record: Record) -> Row:
    """Return a record with ratios only, or the record itself when it is one already.

    Parameters
    ----------
    record : mapping
        As ``run_study`` returns it.

    Returns
    -------
    dict
        A record every report, table and figure can be made from; it cannot be run again.
    """
    if record.get("ratio_only"):
        return dict(record)
    base, words = _bases(record)
    verdict = record["verdict"]
    told = printed_forms(
        [
            *(verdict[name] for name in ("advantage", "advantage_low", "advantage_high")),
            record["study"]["required_advantage"],
            *(row["margin"] for row in record["requirements"]),
        ]
    )
    made = _parts(_Maker(record, base, told), record, words)
    renamed: Row = _renamed(made, _names(record, told))
    return {**renamed, "findings": findings(renamed)}


def _names(record: Record, told: frozenset[str]) -> dict[str, str]:
    """Return new names for sides whose own name carries a number, longest first."""
    found: dict[str, str] = {}
    for position, side in enumerate(record["sides"], start=1):
        name = scrubbed(side["id"], told)
        if name != side["id"]:
            found[side["id"]] = f"{name} (side {position})"
    return dict(sorted(found.items(), key=lambda item: -len(item[0])))


def _renamed(value: Any, names: Mapping[str, str]) -> Any:
    """Put new names of sides into every text and key."""
    if not names:
        return value
    if isinstance(value, dict):
        return {_renamed(key, names): _renamed(item, names) for key, item in value.items()}
    if isinstance(value, list):
        return [_renamed(item, names) for item in value]
    if isinstance(value, str):
        for old, new in names.items():
            value = value.replace(old, new)
    return value


def _parts(make: _Maker, record: Record, words: str) -> Row:
    return {
        "schema": record["schema"],
        "ratio_only": words,
        **{name: record[name] for name in ("software", "created")},
        "study": make.study(),
        **({"criteria": without_limits(record["criteria"], LEFT_OUT)} if record.get("criteria") else {}),
        "verdict": make.verdict(),
        "requirements": make.requirements(),
        "policies": make.policies(),
        "sides": make.sides(),
        "ladder": make.ladder(),
        **make.robustness(),
        "elasticities": [dict(row) for row in record.get("elasticities", ())],
        "uncertainty": make.uncertainty(),
        "curves": make.curves(),
        "advantage_against_time": make.advantages(),
        "crossings": [{"level": row["level"], "time": make.by(row["time"], "s")} for row in record["crossings"]],
        "nodes": make.nodes(),
        "node_steps": list(record.get("node_steps", ())),
        "node_crossings": record["node_crossings"],
        "anchors": make.anchors(),
        "closed_form": make.closed_form(),
        "error_bands": make.error_bands(),
        "self_checks": record["self_checks"],
        "ledger": make.ledger(),
        "options": [row | {"value": make.say(row["value"])} for row in record["options"]],
        "sources": make.sources(),
        "conventions": make.conventions(),
        "circuit_assumptions": make.texts(record["circuit_assumptions"]),
        **{name: record[name] for name in ("not_modelled", "cautions")},
        **{name: make.texts(record.get(name, ())) for name in ("notes", "warnings")},
        "files": [{name: row[name] for name in ("name", "kind", "sha256")} for row in record["files"]],
        "what_if": dict.fromkeys(record.get("what_if") or {}, LEFT_OUT),
    }
