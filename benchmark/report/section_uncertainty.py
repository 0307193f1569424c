"""Probability, shares and what to measure next in the report (layer 9)."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Any

from benchmark.record.text import probability, uncertainty_words, without_range
from benchmark.report.blocks import Block, Bullets, Cell, Figure, Paragraph, Section, Table, plain
from benchmark.report.words import is_number, number

__all__ = ["next_measurement", "uncertainty"]

Record = Mapping[str, Any]
NONE = "No draws were asked for (uncertainty.draws in the study, --draws on the command line), or no value has a range."


def uncertainty(record: Record, figure: Figure) -> Section:
    """Return the probability of the required advantage, its distribution, and the inputs that carry it."""
    title = "How sure"
    found = record.get("uncertainty")
    if found is None:
        return Section("uncertainty", title, (Paragraph(NONE),))
    words = uncertainty_words(record)
    text = (
        f"Called likely from a probability of {number(found['likely'], 3)} on and unlikely up to "
        f"{number(found['unlikely'], 3)}, as fixed in the study; twice the sampling error must clear the threshold. "
        f"The error is the scatter between {found['blocks']} independently scrambled sets of draws. The deterministic "
        "verdict moves one input at a time; here all move together. Both stand."
    )
    blocks: list[Block] = [Paragraph(words[0]), Paragraph(text), figure, _quantiles(found)]
    if found["reaches_at_open_ends"] is not None:
        keys = ", ".join(row["key"] for row in found["bounds"])
        reached = probability(found["reaches_at_open_ends"], found["draws"])
        under = f"under the stated ranges; {without_range(record)}"
        said = f"{keys}; at their open ends the probability is {reached} ({under})."
        blocks.insert(1, Paragraph(said, "Stated as bounds:"))
    if found["constant"]:
        below = found.get("constant_below")
        least = "" if below is None else f" by as much as {number(below)} of it"
        blocks.append(
            Paragraph(f"No drawn input moves the advantage{least}: there is no variance to share.", "Shares:")
        )
    else:
        blocks.append(_shares(record, found))
    return Section("uncertainty", title, tuple(blocks))


def _quantiles(found: Record) -> Table:
    rows = [
        (
            f"{number(100 * row['share'])} %",
            number(row["value"], 3) if is_number(row["value"]) else "infeasible: no advantage",
            number(row["error"], 2) if is_number(row["value"]) else "–",
        )
        for row in found["quantiles"]
    ]
    columns = ("share of the draws", "advantage at most", "sampling error")
    return plain("advantage-quantiles", "Distribution of the advantage", columns, rows)


def _shares(record: Record, found: Record) -> Table:
    totals = {row["key"]: row for row in found["totals"]}
    rows = [
        (
            _value(record, row["key"], row.get("moves_with", ())),
            row["evidence"],
            _share(row["share"], row["share_error"]),
            _total(row, totals),
        )
        for row in _listed(found)
    ]
    columns = ("input", "evidence", "share alone", "share with what it does together with others")
    caption = (
        "Shares of the variance of ln(advantage): the inputs with a share clear of its sampling error, alone or "
        f"together with others; {found['inputs'] - len(rows)} others have none. Inputs that move together (stated as "
        "not independent of each other) have one share together with others."
    )
    left = max((row.get("left_out", 0.0) for row in totals.values()), default=0.0)
    if left > 0.0:
        caption += (
            f" Shares together with others leave out the draws in which a side has no permitted point, up to "
            f"{number(100 * left, 2)} % of them."
        )
    return plain("variance-shares", caption, columns, rows)


def _total(row: Record, totals: Mapping[str, Record]) -> str:
    """Total share of an input, or which row holds that of all that moves with it."""
    if row["key"] in totals:
        total = totals[row["key"]]
        return _share(total["total"], total["total_error"])
    other = next((key for key in row.get("moves_with", ()) if key in totals), None)
    return "not worked out" if other is None else f"counted with {other}"


def _listed(found: Record) -> list[Record]:
    clear = {row["key"] for row in found["totals"] if row["total"] > 2.0 * row["total_error"]}
    return [row for row in found["shares"] if row["share"] > 2.0 * row["share_error"] or row["key"] in clear]


def _share(value: float, error: float) -> str:
    return f"{number(100 * value, 2)} % ± {number(100 * error, 1)}"


def _value(record: Record, key: str, others: Sequence[str] = ()) -> Cell:
    place = next((i for i, row in enumerate(record["ledger"], start=1) if row["key"] == key), None)
    tied = f" (moves with {', '.join(others)})" if others else ""
    return Cell(f"{key}{tied}", f"#value-{place}" if place else "")


def _worth(found: Record) -> str:
    return f"{number(found['value'], 2)} ± {number(found['error'], 1)}" if found["value"] else "nothing"


def _offer(row: Record) -> str:
    """What the measurement the study names is worth, for its cost."""
    if not is_number(row["cost"]):
        return "not stated"
    return (
        f"worth {number(row['worth_reachable'], 2)} for {number(row['cost'], 3)}: "
        f"{number(row['worth_per_cost'], 2)} per unit of cost"
    )


def next_measurement(record: Record) -> Section:
    """Return what each possible measurement is worth, how good it must be, and when to stop."""
    title = "What to measure next"
    found = record.get("uncertainty")
    if found is None:
        return Section("next-measurement", title, (Paragraph(NONE),))
    text = (
        "Worth: by how much knowing an input raises the expected gain of deciding right, in ln(advantage): gain when "
        "going is ln(advantage / required advantage), stopping gains nothing. Enough: standard error, in widths of the "
        f"present range (one standard deviation), below which a better measurement is worth less than "
        f"{number(found['negligible'], 1)} more."
    )
    whole = f"Knowing all of them perfectly is worth {_worth(found['worth_of_all'])}."
    if found["stop"]:
        stop = "Stop: no measurement of these inputs can change the answer within their ranges."
        return Section("next-measurement", title, (Paragraph(stop, "Stop rule:"), Paragraph(whole), Paragraph(text)))
    rows = [
        (
            _value(record, row["key"], row.get("moves_with", ())),
            row["evidence"],
            f"{number(row['worth'], 2)} ± {number(row['worth_error'], 1)}",
            number(row["worth_halved"], 2),
            number(row["enough"], 2) if is_number(row["enough"]) else "does not matter as it is",
            _offer(row),
        )
        for row in sorted(found["shares"], key=lambda row: row["place"])
        if row["worth"] > 2.0 * row["worth_error"] or is_number(row["cost"])
    ]
    if not rows:
        none = "No single input is worth measuring by itself within the sampling error."
        return Section("next-measurement", title, (Bullets((none, whole)), Paragraph(text)))
    columns = (
        *("input", "evidence", "worth known perfectly", "worth known twice as well", "enough"),
        "as the study says it could be measured",
    )
    table = plain("next-measurements", "Inputs worth measuring, the most worthwhile first", columns, rows)
    return Section("next-measurement", title, (Paragraph(whole), table, Paragraph(text)))
