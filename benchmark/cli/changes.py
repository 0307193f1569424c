"""The command ``changes``: what changed between two states, and why (layer 10)."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from benchmark.cli.commands import check_folders
from benchmark.cli.forms import check_form, echo_csv, echo_json
from benchmark.cli.layout import Block, Facts, Note, Table, show_blocks
from benchmark.record.text import engineering

__all__ = ["changes_command"]

Row = Mapping[str, Any]
#: columns of the csv: every fact is a row of its section
COLUMNS = ("section", "name", "node", "unit", "old", "new", "factor", "at_old_supply", "part", "note")
#: a smaller relative difference in a chain is rounding
SAME = 1.0e-9
#: a smaller part of an energy or time is the rounding of its sums
ROUNDING = 1.0e-14


def changes_command(
    old: str,
    new: str,
    *,
    form: str,
    anyway: bool,
    additive: bool,
    draws: int | None,
    seed: int | None,
    jobs: int,
    nodes: Sequence[Path],
) -> None:
    """Compare two states and print what changed."""
    from benchmark import api

    check_folders(nodes)
    check_form(form)
    found = api.changes(old, new, nodes=nodes, anyway=anyway, draws=draws, seed=seed, jobs=jobs).data
    if form == "json":
        echo_json(found)
    elif form == "csv":
        echo_csv(COLUMNS, ([_cell(row.get(name, "")) for name in COLUMNS] for row in csv_rows(found)))
    else:
        show_blocks(blocks(found, additive=additive))


def blocks(found: Row, *, additive: bool = False) -> list[Block]:
    """Return the comparison as blocks of text."""
    shown: list[Block] = [Note(f"Change from {found['old']['shown']} to {found['new']['shown']}")]
    shown += [Note(f"Note: {text}.") for text in found["banners"]]
    if "verdict" in found:
        shown.append(_answer(found))
    shown.append(_inputs(found["inputs"]))
    if found["other"]:
        rows = [(row["kind"], row["name"], row["old"] or "absent", row["new"] or "absent") for row in found["other"]]
        shown.append(Table("Changed besides values", ("kind", "name", "old", "new"), rows))
    if "attribution" in found:
        shown += _attribution(found["attribution"], additive)
        shown += _probability(found["probability"])
        shown += [_chain(found["chain"]), *_results(found)]
    return shown


def _answer(found: Row) -> Facts:
    verdict, old, new = found["verdict"], found["old"], found["new"]
    word = "flipped" if verdict["flipped"] else "the same"
    required = [engineering(end["required_advantage"], "1") for end in (old, new)]
    rows = [
        ("Verdict", f"{word}: {_arrow(verdict['old'], verdict['new'])}"),
        ("Advantage", _arrow(engineering(old["advantage"], "1", 5), engineering(new["advantage"], "1", 5))),
        ("Required", _arrow(*required)),
    ]
    rows += [("Why now", reason) for reason in verdict["reasons_new"]]
    return Facts("", rows)


def _arrow(old: str, new: str) -> str:
    return old if old == new else f"{old} -> {new}"


def _inputs(rows: Sequence[Row]) -> Block:
    if not rows:
        return Note("Inputs: none changed.")
    table = [
        (
            row["key"] + (f" at {row['node']}" if row["node"] else ""),
            _number(row["old"]),
            _number(row["new"]),
            row["unit"],
            _number(row["factor"], 4),
            _arrow(row["range_old"] or "none", row["range_new"] or "none"),
            _arrow(row["evidence_old"] or "-", row["evidence_new"] or "-"),
            _arrow(row["source_old"] or "-", row["source_new"] or "-"),
            ", ".join(row["changed"]),
        )
        for row in rows
    ]
    columns = ("input", "old", "new", "unit", "factor", "range", "evidence", "source", "changed")
    return Table("Inputs that changed", columns, table)


def _number(value: Any, digits: int = 6) -> str:
    return "-" if value is None else f"{value:.{digits}g}" if isinstance(value, float) else str(value)


def _attribution(attribution: Sequence[Row], additive: bool) -> list[Block]:
    """Logarithms with the factors they stand for; joules and seconds when asked for."""
    shown: list[Block] = []
    for scale in ("logarithm", "additive") if additive else ("logarithm",):
        items = [item for item in attribution if item["scale"] == scale]
        split = [item for item in items if not item["note"] and _moves(item)]
        shown += [Note(f"Not split: {item['note']}.") for item in items if item["note"]]
        causes = list(dict.fromkeys(cause for item in split for cause in item["parts"]))
        if not causes:
            continue
        rows = [(cause, *(_part(item, item["parts"].get(cause, 0.0)) for item in split)) for cause in causes]
        rows.append(("total", *(_part(item, item["total"]) for item in split)))
        title = "Parts of the change, as ln(after / before) and as factor" if scale == "logarithm" else "In J and s"
        shown.append(Table(title, ("cause", *(item["quantity"] for item in split)), rows))
    return shown


def _moves(item: Row) -> bool:
    """Tell whether there is anything to show: any part that is not rounding."""
    small = ROUNDING * (abs(item["after"]) if item["scale"] == "additive" else 1.0)
    return any(abs(part) > small for part in item["parts"].values())


def _part(item: Row, part: float) -> str:
    if item["scale"] == "additive":
        if abs(part) <= ROUNDING * abs(item["after"]):
            return f"0 {item['unit']}"
        return f"{'+' if part > 0.0 else ''}{engineering(part, item['unit'], 4)}"
    return f"{round(part, 5) + 0.0:+.5f} (x {math.exp(part):.4g})"


def _probability(found: Row | None) -> list[Block]:
    if found is None:
        return []
    if found["note"]:
        return [Note(f"Probability of reaching the required advantage, not split: {found['note']}.")]
    rows = [
        ("before", _estimate(found["old"])),
        ("new best estimates, old ranges", _estimate(found["moved"])),
        ("old best estimates, new ranges", _estimate(found["narrowed"])),
        ("after", _estimate(found["new"])),
        ("part of the moved best estimates", f"{found['part_moved']:+.3f}"),
        ("part of the changed ranges", f"{found['part_narrowed']:+.3f}"),
        ("how", found["how"]),
    ]
    return [Facts("Probability of reaching the required advantage", rows)]


def _estimate(row: Row) -> str:
    return f"{row['value']:.3f} (sampling error {row['error']:.1g})"


def _same(row: Row) -> bool:
    ends = [row[name] for name in ("before", "at_old_supply", "after")]
    if None in ends or not all(isinstance(end, float) for end in ends):
        return len(set(map(str, ends))) == 1
    return bool(max(ends) - min(ends) <= SAME * max(map(abs, ends)))


def _chain(chain: Sequence[Row]) -> Block:
    """Only what changes anywhere; the csv and json have all of it."""
    moving = [row for row in chain if not _same(row)]
    if not moving:
        return Note("Between inputs and result of the candidate: nothing changed.")
    rows = [
        (
            row["stage"],
            row["quantity"],
            *(_end(row[name], row["unit"]) for name in ("before", "at_old_supply", "after")),
        )
        for row in moving
    ]
    still = len(chain) - len(moving)
    title = f"From inputs to result, candidate ({still} further quantities do not change)"
    return Table(title, ("stage", "quantity", "before", "new inputs at the old supply", "after"), rows)


def _end(value: Any, unit: str) -> str:
    return "-" if value is None else engineering(value, unit, 4)


def _results(found: Row) -> list[Block]:
    identical = found["identical"]
    rows = [
        (row["result"], _result(row["old"], row["unit"]), _result(row["new"], row["unit"]), _number(row["factor"], 5))
        for row in found["results"]
    ]
    shown: list[Block] = []
    if rows:
        shown.append(Table("Results that changed", ("result", "old", "new", "factor"), rows))
    listed = "; ".join(identical) or "none"
    return [*shown, Note(f"Results identical to the last bit ({len(identical)}): {listed}.")]


def _result(value: Any, unit: str) -> str:
    if isinstance(value, bool) or not isinstance(value, (int, float)):
        return "none" if value is None else str(value) or "none"
    return engineering(float(value), unit or "1", 5)


def csv_rows(found: Row) -> list[dict[str, Any]]:
    """Return the comparison as rows of one table."""
    rows: list[dict[str, Any]] = [{"section": "note", "name": "note", "note": text} for text in found["banners"]]
    for row in found["inputs"]:
        kept = {name: row[name] for name in ("node", "unit", "old", "new", "factor")}
        rows.append({"section": "input", "name": row["key"], **kept, "note": ", ".join(row["changed"])})
    rows += [
        {"section": row["kind"], "name": row["name"], "old": row["old"], "new": row["new"]} for row in found["other"]
    ]
    if "verdict" not in found:
        return rows
    rows.append(
        {"section": "verdict", "name": "verdict", "old": found["verdict"]["old"], "new": found["verdict"]["new"]}
    )
    for item in found["attribution"]:
        head = {"section": f"part, {item['scale']}", "node": item["quantity"], "unit": item["unit"]}
        parts = [*item["parts"].items(), ("total", item["total"])]
        rows += [{**head, "name": cause, "part": part, "note": item["note"]} for cause, part in parts]
    rows += _probability_rows(found["probability"])
    rows += [
        {
            "section": f"chain, {row['stage']}",
            "name": row["quantity"],
            "unit": row["unit"],
            "old": row["before"],
            "new": row["after"],
            "at_old_supply": row["at_old_supply"],
        }
        for row in found["chain"]
    ]
    rows += [{"section": "result", "name": row["result"], **_but(row, "result")} for row in found["results"]]
    return rows + [{"section": "identical", "name": name} for name in found["identical"]]


def _but(row: Row, name: str) -> dict[str, Any]:
    return {key: value for key, value in row.items() if key != name}


def _probability_rows(found: Row | None) -> list[dict[str, Any]]:
    if found is None:
        return []
    if found["note"]:
        return [{"section": "probability", "name": "not split", "note": found["note"]}]
    ends = {"section": "probability", "name": "reaches", "old": found["old"]["value"], "new": found["new"]["value"]}
    parts = [("moved best estimates", found["part_moved"]), ("changed ranges", found["part_narrowed"])]
    return [
        ends | {"note": found["how"]},
        *({"section": "probability", "name": name, "part": part} for name, part in parts),
        {"section": "probability", "name": "new best estimates, old ranges", "new": found["moved"]["value"]},
        {"section": "probability", "name": "old best estimates, new ranges", "new": found["narrowed"]["value"]},
    ]


def _cell(value: Any) -> str:
    """A number with all its digits; nothing where there is none."""
    if value is None:
        return ""
    return repr(value) if isinstance(value, float) else str(value)
