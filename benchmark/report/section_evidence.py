"""Evidence in the report: anchors, cross-check, ledger, options, conventions, omissions, sources (layer 9)."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from typing import Any

from benchmark.report.blocks import Block, Bullets, Cell, Notice, Pairs, Paragraph, Section, Table, plain
from benchmark.report.words import amount, is_number, listed, number, plural, spaced, volts
from benchmark.units import from_si, parse_unit

__all__ = ["anchors", "closed_form", "conventions", "ledger", "not_modelled", "options", "source_numbers", "sources"]

Record = Mapping[str, Any]


def source_numbers(record: Record) -> dict[str, int]:
    """Return source key -> number in the list of sources."""
    return {key: position for position, key in enumerate(record["sources"], start=1)}


def _source(record: Record, key: str, where: str) -> Cell:
    if not key:
        return Cell("none")
    found = source_numbers(record).get(key)
    place = "" if where in ("", "-") else where
    return Cell(f"[{found}] {key}", f"#source-{found}", place) if found else Cell(key, small=place)


def _in_unit(value: float, unit: str) -> str:
    return spaced(from_si(value, parse_unit(unit)), unit, 3)


def _difference(relative: float) -> str:
    percent = 100.0 * relative
    return "under 0.001 %" if abs(percent) < 1e-3 else f"{number(percent)} %"


def anchors(record: Record) -> Section:
    """Return published values beside predicted ones; a technology without any says none."""
    rows: list[Sequence[Any]] = []
    for technology in dict.fromkeys(side["technology"] for side in record["sides"]):
        mine = [row for row in record["anchors"] if row["technology"] == technology]
        if not mine:
            rows.append((Cell(technology), *["none"] * 8))
        for row in mine:
            spread = ""
            if row["low"] != row["high"]:
                spread = f"{_in_unit(row['low'], row['unit'])} to {_in_unit(row['high'], row['unit'])}"
            rows.append(
                (
                    Cell(technology, small=f"node {row['node']}"),
                    row["name"].replace("_", " "),
                    volts(row["supply"], 3),
                    Cell(_in_unit(row["published"], row["unit"]), small=spread),
                    _in_unit(row["predicted"], row["unit"]),
                    _difference(row["difference"]),
                    "fitted" if row["fitted"] else "predicted",
                    _source(record, row["source"], row["where"]),
                    "" if row["conditions"] == "-" else row["conditions"],
                )
            )
    columns = (
        *("technology", "quantity", "supply", "published", "by this model", "difference", "fitted or predicted"),
        *("source", "conditions"),
    )
    free = [abs(row["difference"]) for row in record["anchors"] if not row["fitted"]]
    text = (
        f"{plural(len(free), 'value')} predicted without fitting, largest difference {number(100.0 * max(free))} %."
        if free
        else "No value is predicted without fitting, so nothing outside the inputs supports the reference."
    )
    caption = "Published values and what the models say for them"
    block = Paragraph(text) if free else Notice(text)
    return Section("anchors", "Reference anchors", (block, plain("anchors", caption, columns, rows, wide=True)))


def closed_form(record: Record) -> Section:
    """Return the closed-form delay beside the transient of the same switches."""
    title = "Closed form against transient"
    if not record["closed_form"]:
        text = (
            "Not executed for this study: the closed-form delay was not compared with a transient of the same switches."
        )
        return Section("closed-form", title, (Paragraph(text), *_error_bands(record)))
    rows = [
        (
            Cell(row["side"], small=f"net {row['net']}"),
            volts(row["supply"], 3),
            amount(row["temperature"], "K", 4),
            row["rule"],
            amount(row["closed_delay"], "s", 4),
            amount(row["transient_delay"], "s", 4) if is_number(row["transient_delay"]) else "not solved",
            _difference(row["difference"]) if is_number(row["difference"]) else "not solved",
            row["note"],
        )
        for row in record["closed_form"]
    ]
    columns = (
        "side",
        "supply",
        "temperature",
        "delay rule",
        "by the rule",
        "by transient",
        "rule over transient, minus 1",
        "note",
    )
    caption = "Delay of the stage that takes most of the path, by the rule of the study and solved in time"
    table = plain("closed-form", caption, columns, rows, wide=True)
    return Section("closed-form", title, (table, *_error_bands(record)))


def _error_bands(record: Record) -> tuple[Block, ...]:
    """Return the measured bands of the closed forms at the design points, and what they leave of the advantage."""
    bands = record.get("error_bands")
    if bands is None:  # a record of an earlier version
        return ()
    rows = [
        (
            row["side"],
            row["quantity"],
            f"{number(row['ratio_low'])} to {number(row['ratio_high'])}" if row["points"] else "not measured",
            f"{number(100.0 * row['covered'])} %",
            row["points"],
            Cell(row["over"], small="; ".join(f"not measured: {part['why']}" for part in row["missing"])),
        )
        for row in bands["sides"]
    ]
    columns = ("side", "quantity", "closed form over simulation", "share measured", "points", "measured over")
    caption = "Closed forms at the design points over ngspice with the charges of the device, as measured beforehand"
    table = plain("error-bands", caption, columns, rows, wide=True, empty="No side has closed forms to be measured.")
    found = bands["advantage"]
    if found is None:
        return (table,)
    ends = (found["advantage_low"], found["advantage_high"])
    low, high = (number(end) if is_number(end) else end for end in ends)
    turns = "; this can turn the answer." if found["straddles"] else ", on one side of the required advantage."
    text = f"If both sides err within their bands the advantage lies between {low} and {high}{turns}"
    return table, Notice(text) if found["straddles"] else Paragraph(text)


def _values(row: Mapping[str, Any]) -> Cell:
    shown = [number(value, 6) for value in row["value"]]
    unit = "" if row["unit"] == "1" else f" {row['unit']}"
    bound = {"at-least": "at least ", "at-most": "at most "}.get(row["bound"], "")
    if row["nodes"]:
        pairs = ", ".join(f"{node}: {value}" for node, value in zip(row["nodes"], shown, strict=True))
        return Cell(f"{bound}{pairs}{unit}")
    return Cell(f"{bound}{shown[0]}{unit}")


def _range(row: Mapping[str, Any]) -> Cell:
    spread = row["spread"]
    if spread is None:
        return Cell("no range stated")
    pairs = zip(spread["low"], spread["high"], strict=True)
    words = dict.fromkeys(f"{number(low, 4)} to {number(high, 4)}" for low, high in pairs)
    return Cell(", ".join(words), small=f"{spread['shape']}, {spread['meaning']}")


def _effect(row: Mapping[str, Any]) -> str:
    if row["decisive"]:
        return "decisive"
    if row["matters"] is None:
        return "not moved"
    return "moves the result" if row["matters"] else "no effect"


def _set_by(row: Mapping[str, Any]) -> Cell:
    if row["set_by"] == "default":
        return Cell("default", small=row["origin"])
    place = f"{row['file']}, line {row['line']}" if row["line"] else row["file"]
    return Cell("user", small=place)


def _remarks(row: Mapping[str, Any]) -> str:
    parts = [
        "" if row["conditions"] == "-" else row["conditions"],
        row["note"],
        f"owner: {row['owner_of_choice']}" if row["owner_of_choice"] else "",
        f"formula: {row['formula']}" if row["formula"] else "",
        f"date: {row['date']}" if row["date"] else "",
    ]
    return "; ".join(part for part in parts if part)


def ledger(record: Record) -> Section:
    """Return every number used."""
    rows, tags = [], []
    for row in record["ledger"]:
        symbol = f" ({row['symbol']})" if row["symbol"] else ""
        rows.append(
            (
                Cell(f"{row['name'].replace('_', ' ')}{symbol}", small=f"{row['owner']}: {row['meaning']}"),
                _values(row),
                _range(row),
                row["evidence"],
                _source(record, row["source"], row["where"]),
                _remarks(row),
                _set_by(row),
                _effect(row),
            )
        )
        tags.append({"evidence": row["evidence"], "set-by": row["set_by"], "effect": _effect(row)})
    columns = (
        *("value of", "value and unit", "range and its meaning", "evidence", "source and place"),
        *("conditions and notes", "set by", "effect when moved alone"),
    )
    by_default = sum(row["set_by"] == "default" for row in [*record["ledger"], *record["options"]])
    without = sum(row["spread"] is None for row in record["ledger"])
    counts = Counter(row["evidence"] for row in record["ledger"])
    text = (
        f"{len(record['ledger'])} values, complete. {plural(by_default, 'default')} set by the program "
        f"(values and options), the rest by the user's files. No range stated: {without}. Evidence: "
        f"{listed(f'{name} {count}' for name, count in sorted(counts.items()))}."
    )
    anchors = tuple(f"value-{position}" for position in range(1, len(rows) + 1))
    caption = "Every value used"
    table = plain("ledger", caption, columns, rows, wide=True, filterable=True, tags=tuple(tags), anchors=anchors)
    return Section("ledger", "Assumptions: every value used", (Paragraph(text), table))


def options(record: Record) -> Section:
    """Return every choice that is not a number."""
    rows = [(row["owner"], row["name"].replace("_", " "), row["value"], row["set_by"]) for row in record["options"]]
    columns = ("technology", "option", "choice", "set by")
    empty = "No technology has options."
    return Section(
        "options", "Options", (plain("options", "Choices that are not numbers", columns, rows, empty=empty),)
    )


def conventions(record: Record) -> Section:
    """Return the conventions with their factors, and what the circuit assumes."""
    pairs = Pairs(tuple((row["name"], row["text"]) for row in record["conventions"]))
    return Section("conventions", "Conventions with their factors", (pairs,))


def circuit_assumptions(record: Record) -> Section:
    """Return what the circuit assumes."""
    items = tuple(record["circuit_assumptions"])
    block: Block = Bullets(items) if items else Paragraph("The circuit states none beyond its netlist.")
    return Section("circuit", "Circuit assumptions", (block,))


def not_modelled(record: Record) -> Section:
    """Return what is left out, and whom that favours."""
    rows = [(row["what"], row["favours"]) for row in record["not_modelled"]]
    table = plain("not-modelled", "Left out, and the side that gains", ("not modelled", "favours"), rows)
    return Section("not-modelled", "Not modelled", (table,))


def sources(record: Record) -> Table:
    """Return the numbered sources."""
    rows = []
    for key, position in source_numbers(record).items():
        source = record["sources"][key]
        doi = f"doi {source['doi']}" if source["doi"] else ""
        small = "; ".join(part for part in (source["kind"], doi, source["note"]) if part)
        rows.append((Cell(f"[{position}]"), key, Cell(source["citation"], small=small)))
    anchors = tuple(f"source-{position}" for position in range(1, len(rows) + 1))
    columns, empty = ("number", "key", "source"), "No source is named."
    return plain("sources", "Sources, as read", columns, rows, empty=empty, anchors=anchors)
