"""A change in words (layer 8): the same tables for the terminal and for the report, and all of it as rows.

How numbers are printed differs (plain ASCII on a terminal, typeset on a page), so every function takes a ``Print``; the
digits do not.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from benchmark.record.changes.results import is_table
from benchmark.record.text import engineering

__all__ = [
    "COLUMNS",
    "PLAIN",
    "Print",
    "Worded",
    "answer_rows",
    "arrow",
    "chain_table",
    "change_lines",
    "change_rows",
    "identical_words",
    "input_table",
    "link_table",
    "other_table",
    "part_tables",
    "probability_rows",
    "result_table",
    "result_words",
    "unsplit",
]

Row = Mapping[str, Any]
#: columns of the rows: every fact is a row of its section
COLUMNS = ("section", "name", "node", "unit", "old", "new", "factor", "at_old_supply", "part", "note")
#: columns of a chain
_ENDS = ("before", "at_old_supply", "after")
#: a smaller relative difference in a chain is rounding
SAME = 1.0e-9
#: a smaller part of an energy or time is the rounding of its sums
ROUNDING = 1.0e-14
#: said of a part that the search itself may have made
BELOW = "below the resolution of the search"
#: a smaller part of a logarithm is left out of sentences
SMALL = 5.0e-4


@dataclass(frozen=True)
class Print:
    """How numbers are printed: ``number(value, digits)``, ``amount(value, unit, digits)`` with SI value, and signs."""

    number: Callable[[Any, int], str]
    amount: Callable[[Any, str, int], str]
    times: str
    arrow: str
    minus: str

    def signed(self, value: float, decimals: int) -> str:
        """Print a number with its sign; zero has a plus."""
        return f"{round(value, decimals) + 0.0:+.{decimals}f}".replace("-", self.minus)


@dataclass(frozen=True)
class Worded:
    """A table in words."""

    title: str
    columns: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]


def _plain_number(value: Any, digits: int) -> str:
    return f"{value:.{digits}g}" if isinstance(value, float) else str(value)


PLAIN = Print(_plain_number, engineering, "x ", " -> ", "-")


def arrow(old: str, new: str, how: Print) -> str:
    """Return both, or the one where they are the same."""
    return old if old == new else f"{old}{how.arrow}{new}"


def _number(value: Any, how: Print, digits: int = 6) -> str:
    return "-" if value is None else how.number(value, digits)


def answer_rows(found: Row, how: Print = PLAIN) -> list[tuple[str, str]]:
    """Return verdict, advantage, required advantage before and after, and why now."""
    verdict, old, new = found["verdict"], found["old"], found["new"]
    word = "flipped" if verdict["flipped"] else "the same"

    def both(name: str) -> str:
        return arrow(how.amount(old[name], "1", 5), how.amount(new[name], "1", 5), how)

    rows = [
        ("Verdict", f"{word}: {arrow(verdict['old'], verdict['new'], how)}"),
        ("Advantage", both("advantage")),
        ("Required", both("required_advantage")),
    ]
    reasons = verdict["reasons_new"]
    several = len(reasons) > 1
    return rows + [(f"Why now ({i})" if several else "Why now", reason) for i, reason in enumerate(reasons, start=1)]


def change_lines(found: Row, how: Print = PLAIN) -> list[str]:
    """Say the change in short: verdict and advantage, what did most of it, what else changed."""
    (_, verdict), (_, advantage), *_ = answer_rows(found, how)
    lines = [f"Verdict {verdict}; advantage {advantage}."]
    split = _of(found, "advantage")
    parts = sorted(split["parts"].items(), key=lambda item: -abs(item[1])) if split else []
    least = max(SMALL, _resolution(found))
    named = [f"{cause} ({how.times}{how.number(math.exp(part), 4)})" for cause, part in parts if abs(part) >= least]
    if named:
        more = f" and {len(named) - 3} more" if len(named) > 3 else ""
        lines.append(f"Most of it by {', '.join(named[:3])}{more}.")
    elif split is not None and not split["note"]:
        lines.append("No changed input moves the advantage." if found["inputs"] else "No input changed.")
    return [*lines, *(f"Note: {text}." for text in found["banners"])]


def _of(found: Row, quantity: str) -> Row | None:
    """The parts of the logarithm of a quantity."""
    rows = (row for row in found["attribution"] if (row["quantity"], row["scale"]) == (quantity, "logarithm"))
    return next(rows, None)


def input_table(found: Row, how: Print = PLAIN) -> Worded:
    """Return the values that changed, node by node."""
    rows = tuple(
        (
            row["key"] + (f" at {row['node']}" if row["node"] else ""),
            _number(row["old"], how),
            _number(row["new"], how),
            row["unit"],
            _number(row["factor"], how, 4),
            arrow(row["range_old"] or "none", row["range_new"] or "none", how),
            arrow(row["evidence_old"] or "-", row["evidence_new"] or "-", how),
            arrow(row["source_old"] or "-", row["source_new"] or "-", how),
            ", ".join(row["changed"]),
        )
        for row in found["inputs"]
    )
    columns = ("input", "old", "new", "unit", "factor", "range", "evidence", "source", "changed")
    return Worded("Inputs that changed", columns, rows)


def link_table(found: Row, how: Print = PLAIN) -> Worded:
    """Return the values that state the same thing as a changed one, or bound it: both sides, ratio, what is allowed."""

    def side(row: Row, name: str) -> str:
        old, new = row[f"{name}_old"], how.number(row[name], 5)
        return f"{new if old is None else arrow(how.number(old, 5), new, how)} {row['unit']}".removesuffix(" 1")

    several = any(row["set"] for row in found.get("links", ()))
    rows = tuple(
        (
            row["state"],
            *([row["set"]] if several else []),
            row["node"] or "all",
            row["formula"],
            side(row, "left"),
            side(row, "right"),
            how.number(row["ratio"], 4),
            row["tolerance"],
        )
        for row in found.get("links", ())
    )
    columns = ("result", *(["set"] if several else []), "node", "link", "left side", "right side", "ratio", "allowed")
    return Worded("Values that have to fit the changed ones", columns, rows)


def other_table(found: Row) -> Worded:
    """Return what changed besides values."""
    rows = tuple((row["kind"], row["name"], row["old"] or "absent", row["new"] or "absent") for row in found["other"])
    return Worded("Changed besides values", ("kind", "name", "old", "new"), rows)


def unsplit(found: Row, scale: str) -> list[str]:
    """Say which quantities could not be split, and why."""
    return [f"Not split: {item['note']}." for item in found["attribution"] if item["scale"] == scale and item["note"]]


def part_tables(found: Row, how: Print = PLAIN, *, additive: bool = False) -> list[Worded]:
    """Return the parts of the change: as logarithms with their factors, and in joules and seconds when asked for.

    A part smaller than the search resolves is no effect of its cause: it is said to be, and the rows have its digits.
    """
    resolution = _resolution(found)
    shown: list[Worded] = []
    for scale in ("logarithm", "additive") if additive else ("logarithm",):
        split = [item for item in found["attribution"] if item["scale"] == scale and not item["note"] and _moves(item)]
        causes = list(dict.fromkeys(cause for item in split for cause in item["parts"]))
        if not causes:
            continue
        named = [(cause, [item["parts"].get(cause, 0.0) for item in split]) for cause in causes]
        named.append(("total", [item["total"] for item in split]))
        rows = [
            (cause, *(_part(item, part, how, resolution) for item, part in zip(split, parts, strict=True)))
            for cause, parts in named
        ]
        title = "Parts of the change, as ln(after / before) and as factor" if scale == "logarithm" else "In J and s"
        if any(BELOW in row for row in rows):
            title += f"; {BELOW}: less than {how.number(resolution, 3)} of the quantity"
        shown.append(Worded(title, ("cause", *(item["quantity"] for item in split)), tuple(rows)))
    return shown


def _moves(item: Row) -> bool:
    """Tell whether there is anything to show: any part that is not rounding."""
    small = ROUNDING * (abs(item["after"]) if item["scale"] == "additive" else 1.0)
    return any(abs(part) > small for part in item["parts"].values())


def _resolution(found: Row) -> float:
    """The relative step to which the coarser of both searches finds its points; 0 where a record does not state it."""
    return float(found.get("resolution", 0.0))


def _part(item: Row, part: float, how: Print, resolution: float) -> str:
    size = abs(part) / (abs(item["after"]) if item["scale"] == "additive" and item["after"] else 1.0)
    if ROUNDING < size < resolution:
        return BELOW
    if item["scale"] == "additive":
        if abs(part) <= ROUNDING * abs(item["after"]):
            return how.amount(0.0, item["unit"], 4)
        return f"{'+' if part > 0.0 else ''}{how.amount(part, item['unit'], 4)}"
    return f"{how.signed(part, 5)} ({how.times}{how.number(math.exp(part), 4)})"


def probability_rows(found: Row, how: Print = PLAIN) -> list[tuple[str, str]]:
    """Return the probability in the four states and its two parts; empty without draws or where it is not split."""
    split = found["probability"]
    if split is None or split["note"]:
        return []
    return [
        ("before", _estimate(split["old"])),
        ("new best estimates, old ranges", _estimate(split["moved"])),
        ("old best estimates, new ranges", _estimate(split["narrowed"])),
        ("after", _estimate(split["new"])),
        ("part of the moved best estimates", how.signed(split["part_moved"], 3)),
        ("part of the changed ranges", how.signed(split["part_narrowed"], 3)),
        ("how", split["how"]),
    ]


def _estimate(row: Row) -> str:
    return f"{row['value']:.3f} (sampling error {row['error']:.1g})"


def _same(row: Row) -> bool:
    ends = [row[name] for name in _ENDS]
    if None in ends or not all(isinstance(end, float) for end in ends):
        return len(set(map(str, ends))) == 1
    return bool(max(ends) - min(ends) <= SAME * max(map(abs, ends)))


def chain_table(found: Row, how: Print = PLAIN) -> Worded:
    """Return what lies between inputs and result and changes anywhere; the rows and the json have all of it."""
    worded = [
        tuple("-" if row[name] is None else how.amount(row[name], row["unit"], 4) for name in _ENDS)
        for row in found["chain"]
    ]
    rows = tuple(
        (row["stage"], row["quantity"], *ends)
        for row, ends in zip(found["chain"], worded, strict=True)
        if not _same(row) and len(set(ends)) > 1
    )
    still = len(worded) - len(rows)
    title = f"From inputs to result, candidate ({still} further quantities do not change in these digits)"
    return Worded(title, ("stage", "quantity", "before", "new inputs at the old supply", "after"), rows)


def result_table(found: Row, how: Print = PLAIN) -> Worded:
    """Return the results whose printed digits changed; ``result_words`` counts the others."""
    rows = tuple(
        (row["result"], *ends, _number(row["factor"], how, 5))
        for row in found["results"]
        if not _both_tables(row) and len(set(ends := _result_ends(row, how))) > 1
    )
    return Worded("Results that changed", ("result", "old", "new", "factor"), rows)


def result_words(found: Row, how: Print = PLAIN) -> str:
    """Count the changed results that ``result_table`` does not list; empty where it lists all."""
    tables = sum(map(_both_tables, found["results"]))
    small = len(found["results"]) - tables - len(result_table(found, how).rows)
    counted = [f"{small} more differ only below the printed digits"] if small else []
    counted += [f"{tables} whole {'table differs' if tables == 1 else 'tables differ'}"] if tables else []
    return f"Results: {'; '.join(counted)}. Of numbers, csv and json have all digits." if counted else ""


def _both_tables(row: Row) -> bool:
    return is_table(row["old"]) and is_table(row["new"])


def _result_ends(row: Row, how: Print) -> tuple[str, str]:
    return _result(row["old"], row["unit"], how), _result(row["new"], row["unit"], how)


def _result(value: Any, unit: str, how: Print) -> str:
    if isinstance(value, bool) or not isinstance(value, (int, float)):
        return "none" if value is None else str(value) or "none"
    return how.amount(float(value), unit or "1", 5)


def identical_words(found: Row) -> str:
    """Count the results that are the same to the last bit; the rows, the json and the report name them."""
    return f"Results identical to the last bit: {len(found['identical']) or 'none'}."


def change_rows(found: Row) -> list[dict[str, Any]]:
    """Return the comparison as rows of one table with ``COLUMNS``; a column a row does not name is empty."""
    rows: list[dict[str, Any]] = [{"section": "note", "name": "note", "note": text} for text in found["banners"]]
    for row in found["inputs"]:
        kept = {name: row[name] for name in ("node", "unit", "old", "new", "factor")}
        rows.append({"section": "input", "name": row["key"], **kept, "note": ", ".join(row["changed"])})
    for row in found.get("links", ()):
        head = {
            "section": "link",
            "node": row["node"],
            "unit": row["unit"],
            "note": f"{row['state']}: {row['tolerance']}",
        }
        sides = (("left side of", "left", None), ("right side of", "right", row["ratio"]))
        rows += [
            {**head, "name": f"{words} {row['formula']}", "old": row[f"{name}_old"], "new": row[name], "factor": ratio}
            for words, name, ratio in sides
        ]
    rows += [
        {"section": row["kind"], "name": row["name"], "old": row["old"], "new": row["new"]} for row in found["other"]
    ]
    if "verdict" not in found:
        return rows
    rows.append(
        {"section": "verdict", "name": "verdict", "old": found["verdict"]["old"], "new": found["verdict"]["new"]}
    )
    if "resolution" in found:
        rows.append({"section": "resolution", "name": BELOW.removeprefix("below the "), "part": found["resolution"]})
    for item in found["attribution"]:
        head = {"section": f"part, {item['scale']}", "node": item["quantity"], "unit": item["unit"]}
        parts = [*item["parts"].items(), ("total", item["total"])]
        rows += [{**head, "name": cause, "part": part, "note": item["note"]} for cause, part in parts]
    rows += _probability_facts(found["probability"])
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
    rows += [
        {"section": "result", "name": row["result"], **{key: row[key] for key in ("unit", "old", "new", "factor")}}
        for row in found["results"]
    ]
    return rows + [{"section": "identical", "name": name} for name in found["identical"]]


def _probability_facts(found: Row | None) -> Sequence[dict[str, Any]]:
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
