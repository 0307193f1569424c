"""Arithmetic of the primary design points: formula, numbers put in, result, inputs with evidence (layer 9)."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

from benchmark.report.blocks import Block, Cell, Code, Paragraph, Section, plain
from benchmark.report.energy_delay import side_name
from benchmark.report.formulas import formulas
from benchmark.report.words import amount, is_number, number, policy_name, spaced, volts

__all__ = ["anchor_of", "points"]

Record = Mapping[str, Any]
MOST_INPUTS = 10
#: largest relative difference between the recombined and the recorded number
AGREEMENT = 1e-9


def _sides(record: Record) -> list[tuple[str, Mapping[str, Any]]]:
    """Return the candidate and the strongest contender, where they have a point."""
    primary = record["policies"][0]
    rivals = [("contender", side) for side in primary["contenders"] if side["id"] == primary["strongest"]]
    return [(role, side) for role, side in (("candidate", primary["candidate"]), *rivals) if side["point"]]


def anchor_of(record: Record, role: str, side_id: str, quantity: str = "table") -> str:
    """Return the place on the page where a side's design point (time or energy of it) is worked out, or nothing."""
    shown = any(role == found and side["id"] == side_id for found, side in _sides(record))
    return f"#point-{role}-{quantity}" if shown else ""


def _sum(name: str, symbol: str, parts: Mapping[str, float], total: float, unit: str) -> tuple[Any, ...]:
    """Return one row: the parts put in, and whether they give the recorded total."""
    listed = {part: value for part, value in parts.items() if value}
    put_in = " + ".join(f"{amount(value, unit, 4)} ({part})" for part, value in listed.items())
    found = math.fsum(parts.values())
    agrees = abs(found - total) <= AGREEMENT * abs(total)
    check = "agrees" if agrees else f"recorded {amount(total, unit, 6)}: DIFFERS"
    quantity = "time" if unit == "s" else "energy"
    links = (
        ("formula", f"#formula-{quantity}"),
        ("parts", f"#chart-{quantity}-parts"),
        ("curve", "#chart-energy-delay"),
    )
    return (Cell(name, links=links), f"{symbol} = sum of its parts", put_in or "nothing", amount(found, unit, 4), check)


def _ratio(record: Record) -> tuple[Any, ...] | None:
    """Return the row of the advantage where it is a ratio of energies."""
    sides = dict(_sides(record))
    if len(sides) < 2 or record["study"]["metric"] != "energy-per-operation":
        return None
    mine, other = sides["candidate"]["point"]["energy"], sides["contender"]["point"]["energy"]
    recorded = record["policies"][0]["advantage"]
    if not (is_number(recorded) and mine):
        return None
    agrees = abs(other / mine - recorded) <= AGREEMENT * abs(recorded)
    put_in = f"{amount(other, 'J', 4)} / {amount(mine, 'J', 4)}"
    check = "agrees" if agrees else f"recorded {number(recorded, 6)}: DIFFERS"
    links = (("formula", "#formula-advantage"), ("chart", "#chart-advantage-against-time"))
    return (
        Cell("advantage", links=links),
        "A = E of the reference / E of the candidate",
        put_in,
        number(other / mine, 4),
        check,
    )


def _inputs(record: Record, side: Mapping[str, Any], role: str) -> list[tuple[Any, ...]]:
    """Return the inputs of this side that move the advantage most, with evidence and a link to the ledger."""
    technology = next(s["technology"] for s in record["sides"] if s["role"] == role and s["id"] == side["id"])
    owner = "candidate" if role == "candidate" else f"contender {side['id']}"
    places = {row["key"]: position for position, row in enumerate(record["ledger"], start=1)}
    rows: list[tuple[Any, ...]] = []
    for move in record["verdict"]["moves"]:
        if move["key"].startswith((f"{technology}.", f"{owner}.", "study.")) and len(rows) < MOST_INPUTS:
            name = move["key"].rpartition(".")[2].replace("_", " ")
            place = places.get(move["key"])
            best = spaced(move["best"], move["unit"], 4) if is_number(move["best"]) else "as stated"
            link = Cell(name, f"#value-{place}" if place else "", move["key"].rpartition(".")[0])
            rows.append((link, best, move["evidence"], "decisive" if move["decisive"] else "no"))
    return rows


def points(record: Record) -> Section:
    """Return formula, numbers and evidence of the candidate's and the strongest contender's design point."""
    blocks: list[Block] = []
    for role, side in _sides(record):
        point = side["point"]
        at = f"{volts(point['supply'], 4)}, size {number(point['size'], 3)}"
        rows = [
            _sum("time per operation", "T", point["time_parts"], point["time"], "s"),
            _sum("energy per operation", "E", point["energy_parts"], point["energy"], "J"),
        ]
        if role == "candidate" and (ratio := _ratio(record)):
            rows.append(ratio)
        name = side_name(record, f"{role} {side['id']}")
        caption = f"{name} at {at}, {policy_name(record['policies'][0]['policy'])}"
        columns = ("quantity", "formula", "numbers put in", "result", "against the record")
        anchors = tuple(f"point-{role}-{quantity}" for quantity in ("time", "energy", "advantage")[: len(rows)])
        blocks.append(plain(f"point-{role}", caption, columns, rows, wide=True, anchors=anchors))
        inputs = _inputs(record, side, role)
        heads = ("input", "best estimate", "evidence", "decisive")
        blocks.append(plain(f"point-{role}-inputs", f"Inputs of {name} that move the advantage most", heads, inputs))
    if not blocks:
        blocks.append(Paragraph("No side has a permitted design point under the primary policy."))
    elif not record.get("ratio_only"):
        blocks.append(
            Paragraph("Every stage, from the switch to the sums above, is printed from the record folder by:")
        )
        blocks.append(Code("evenload trace RECORD_FOLDER\nevenload trace RECORD_FOLDER --side CONTENDER"))
    blocks.append(formulas(record))
    return Section("points", "Design points worked out", tuple(blocks))
