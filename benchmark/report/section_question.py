"""First screen of the report: the answer, the question as asked, the requirements (layer 9)."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping, Sequence
from typing import Any

from benchmark.record.criteria import criteria_words
from benchmark.record.text import answer_sentence
from benchmark.report.blocks import Block, Bullets, Cell, Figure, Notice, Pairs, Paragraph, Section, Table, plain
from benchmark.report.margins import margin_words
from benchmark.report.section_change import change_sentence
from benchmark.report.section_points import anchor_of
from benchmark.report.words import amount, is_number, listed, number, plural, policy_name, requirement_name, volts

__all__ = ["answer", "evidence_counts", "findings", "question", "requirements"]

Record = Mapping[str, Any]
MOST_NAMED = 5
MOST_LISTED = 8
#: evidence classes that cannot be improved by measuring
SETTLED = ("defined", "measured", "choice")


def _evidence(row: Mapping[str, Any]) -> str:
    return f"{row['key']} ({row['evidence']}{'' if row['ranged'] else ', no range stated'})"


def _named(rows: Sequence[Mapping[str, Any]]) -> str:
    words = [_evidence(row) for row in rows[:MOST_NAMED]]
    if len(rows) > MOST_NAMED:
        words.append(f"{len(rows) - MOST_NAMED} more (section What moves the answer)")
    return listed(words)


def _decisive(record: Record) -> str:
    rows = [row for row in record["verdict"]["moves"] if row["decisive"]]
    if rows:
        return f"{_named(rows)}."
    if not record["verdict"]["moves"]:
        return "none could be moved, because a side has no permitted design point."
    return "none: no input moved alone over its stated range changes the side of the required advantage."


def _first_to_measure(record: Record) -> str:
    verdict = record["verdict"]
    if verdict["measure_next"]:
        return f"{verdict['measure_next'][0]}."
    failed = [row["name"] for row in record["requirements"] if row["state"] == "fail"]
    if failed:
        return f"nothing before the failed requirements can be met: {listed(map(requirement_name, failed))}."
    weak = [row for row in verdict["moves"] if row["decisive"] and row["evidence"] not in SETTLED]
    ranged = [row for row in weak if row["ranged"]]
    if ranged:
        return f"{_evidence(ranged[0])}."
    if weak:
        return f"no input with a range decides; a range is missing for {_evidence(weak[0])}."
    return "nothing: no single input, wherever it lies in its stated range, would change this answer."


def _first(items: Sequence[str]) -> tuple[str, ...]:
    """Keep the first screen short; the section What moves the answer has all."""
    if len(items) <= MOST_LISTED:
        return tuple(items)
    return (*items[:MOST_LISTED], f"and {len(items) - MOST_LISTED} more, listed in the section What moves the answer")


def answer(record: Record, digest: str) -> Section:
    """Return the answer in one sentence, its conditions, and three lines."""
    study, verdict = record["study"], record["verdict"]
    blocks: list[Block] = []
    if study["demonstration"]:
        blocks.append(
            Notice("some inputs are invented. The verdict says nothing about any real switch.", "Demonstration:")
        )
    if record.get("ratio_only"):
        blocks.append(Notice(f"no absolute value of any side is given. {record['ratio_only']}.", "Ratios only:"))
    if words := criteria_words(record):
        blocks.append(Notice(words, "Criteria changed after results:"))
    failed = [check["name"] for check in record["self_checks"] if not check["passed"]]
    if failed:
        blocks.append(Notice(f"{listed(failed)}. Do not use these results.", "Self-check failed:"))
    blocks.append(Paragraph(answer_sentence(record)))
    if verdict["reasons"]:
        blocks.append(Bullets(tuple(verdict["reasons"]), "Why"))
    if verdict["conditions"]:
        blocks.append(Bullets(_first(verdict["conditions"]), "Conditions: each of these must hold"))
    if verdict["measure_next"] and verdict["measure_next"] != verdict["reasons"]:
        blocks.append(Bullets(_first(verdict["measure_next"]), "To be measured before deciding"))
    advantage = verdict["advantage"]
    if is_number(advantage) and study["required_advantage"] != 1.0:
        word = "reaches" if advantage >= 1.0 else "does not reach"
        blocks.append(
            Paragraph(f"the best estimate {number(advantage, 2, (1.0,))} {word} 1.", "Against an advantage of 1:")
        )
    if record.get("outlook"):
        blocks.append(Paragraph(_made_on(record), "Made on:"))
    if said := change_sentence(record):
        blocks.append(Paragraph(said, "Since the previous record:"))
    blocks += [
        Paragraph(_decisive(record), "Decisive inputs:"),
        Paragraph(_first_to_measure(record), "First thing to measure:"),
        Paragraph(f"sha256 {digest}, made {record['created']}.", "Record:"),
    ]
    if record["warnings"]:
        text = f"{plural(len(record['warnings']), 'warning')} below (section Warnings)."
        blocks.append(Paragraph(text, "Warnings:"))
    return Section("answer", "Answer", tuple(blocks))


def _made_on(record: Record) -> str:
    """Say which set of the candidate carries the verdict, and what the others would have."""
    side = next(side for side in record["sides"] if side["role"] == "candidate")
    others = [
        f"{row['ambition']} ({row['title']}): "
        + (f"advantage {number(row['advantage'], 2)}" if is_number(row["advantage"]) else f"infeasible, {row['why']}")
        for row in record["outlook"]
    ]
    return f"{side['ambition']} ({side['title']}). Shown beside it and not judged: {'; '.join(others)}."


def evidence_counts(record: Record) -> str:
    """Count the values by evidence class: "measured 7, published 5, assumed 1"."""
    counts = Counter(row["evidence"] for row in record["ledger"])
    return ", ".join(f"{name} {count}" for name, count in sorted(counts.items(), key=lambda item: (-item[1], item[0])))


def _required_time(record: Record) -> str:
    study = record["study"]
    required = study["required_time"]
    if is_number(required):
        return f"; required time {amount(required, 's')}"
    if required == "cycle":
        return "; required time: the clock period"
    if required:
        return f"; required time: the declared time of {str(required).removeprefix('contender:')}"
    return ""


def _policy(record: Record) -> str:
    study = record["study"]
    also = listed(policy_name(name) for name in study["also"]) or "none"
    energy = f"; required energy {amount(study['required_energy'], 'J')}" if is_number(study["required_energy"]) else ""
    exponent = ""
    if "minimum-energy-delay" in (study["primary_policy"], *study["also"]):
        exponent = f"; exponent m of E T^m {number(study['exponent'], 3)}"
    return f"{policy_name(study['primary_policy'])}{_required_time(record)}{energy}{exponent}. For robustness: {also}."


def _locked(record: Record) -> str:
    """Say since when the criteria are locked, and by which digest."""
    criteria = record.get("criteria")
    return (
        f"; locked at the first run with them, {criteria['fixed']}, by sha256 {criteria['digest']}" if criteria else ""
    )


def _slots(record: Record) -> list[tuple[str, str]]:
    study, sides = record["study"], record["sides"]
    candidate = next(side for side in sides if side["role"] == "candidate")
    contenders = [side["id"] for side in sides if side["role"] == "contender"]
    strongest = record["policies"][0]["strongest"]
    hard = [requirement_name(row["name"]) for row in record["requirements"] if row["kind"] == "hard"]
    report = [requirement_name(row["name"]) for row in record["requirements"] if row["kind"] != "hard"]
    own = [f"{side['id']} in {side['circuit']}" for side in sides if "circuit" in side]
    circuit = f"circuit {study['circuit']}" + (f", own best: {listed(own)}" if own else "")
    workload = (
        f"{study['operation']}; {circuit}, {study['timing']}, "
        f"leakage over the {study['leakage_accounting']}, idle: {study['idle']}; "
        f"at {listed(amount(t, 'K') for t in study['temperatures'])}"
    )
    winner = f"; strongest under the primary policy: {strongest}" if strongest else "; none has a permitted point"
    return [
        ("Product class", f"{study['product_class']}: {study['product']}"),
        ("Operation and workload", workload),
        ("Requirements", f"hard: {listed(hard) or 'none'}; reported: {listed(report) or 'none'}"),
        ("Candidate", f"{candidate['title']} ({candidate['technology']}), node {study['headline_nodes']['candidate']}"),
        ("Contenders", f"{listed(contenders)}{winner}"),
        ("Required advantage", number(study["required_advantage"], 3)),
        ("Metric", study["metric"].replace("-", " ")),
        ("Policy", _policy(record)),
        ("Evidence", f"{len(record['ledger'])} values: {evidence_counts(record)}"),
        ("Criteria fixed", f"{study['declared']} by {study['owner']}{_locked(record)}"),
    ]


def _sides(record: Record) -> Table:
    nodes = record["study"]["headline_nodes"]
    rows = [
        (
            side["id"],
            side["role"],
            Cell(side["title"], small=side["note"]),
            side["flavour"] or "not stated",
            nodes["candidate"]
            if side["role"] == "candidate"
            else nodes["reference"].get(side["id"], "not in this pair"),
            side["model"],
            side["ambition"],
            f"{volts(side['supply'][0])} to {volts(side['supply'][1])}",
            listed(number(size, 3) for size in side["sizes"]),
            listed(volts(shift, 3) for shift in side["threshold_shifts"]),
            *((listed(number(count, 3) for count in side["copies"]),) if "copies" in side else ()),
            *((listed(volts(bias, 3) for bias in side["back_biases"]),) if "back_biases" in side else ()),
        )
        for side in record["sides"]
    ]
    columns: tuple[str, ...] = (
        "side",
        "role",
        "technology",
        "flavour",
        "node",
        "model",
        "stands for",
        "supply searched",
        "sizes",
        "threshold shifts",
    )
    columns += tuple(
        title
        for key, title in (("copies", "parallel copies"), ("back_biases", "back biases"))
        if any(key in side for side in record["sides"])
    )
    return plain("sides", "The sides and what each may choose", columns, rows, wide=True)


#: section that holds the numbers of a finding -> what it is called there
_WHERE = {
    "requirements": "margins of requirements",
    "policies": "all policies",
    "uncertainty": "how sure",
    "parts": "parts of time and energy",
    "moves": "inputs moved alone",
    "ladder": "ladder of the reference",
    "nodes": "node pairs",
    "next-measurement": "what to measure",
    "robustness": "robustness",
}


def _rows_of(record: Record, finding: Mapping[str, str]) -> tuple[tuple[str, str], ...]:
    """Return name and place of the rows of the page that hold the numbers of a finding; none where it has no such row.

    The advantage and the parts stand where the candidate's point is worked out, an input that is named in the ledger.
    """
    if finding["at"] == "policies":
        primary = record["policies"][0]
        both = (
            anchor_of(record, "contender", primary["strongest"]) and record["study"]["metric"] == "energy-per-operation"
        )
        place = anchor_of(record, "candidate", primary["candidate"]["id"], "advantage")
        return (("row of the advantage", place),) if both and place and is_number(primary["advantage"]) else ()
    if finding["at"] == "parts":
        candidate = record["policies"][0]["candidate"]["id"]
        places = [(name, anchor_of(record, "candidate", candidate, name)) for name in ("time", "energy")]
        return tuple((f"row of the {name}", place) for name, place in places if place)
    if finding["at"] in ("moves", "next-measurement"):
        words = finding["text"].replace(",", " ").replace(";", " ").replace(":", " ").split()
        named = {word.rstrip(".") for word in words}
        ledger = enumerate(record["ledger"], start=1)
        return tuple((row["key"], f"#value-{place}") for place, row in ledger if row["key"] in named)
    return ()


def findings(record: Record) -> Section:
    """Return the findings in plain words, each with the section and, where there is one, the row of its numbers."""
    rows = [
        (
            row["text"],
            Cell(_WHERE[row["at"]], f"#{row['at']}", links=_rows_of(record, row))
            if row["at"] in _WHERE
            else Cell(row["at"]),
        )
        for row in record.get("findings", ())
    ]
    caption = "Made from the numbers of this record alone"
    table = plain("findings-table", caption, ("finding", "where"), rows, empty="This record states no findings.")
    return Section("findings", "Findings", (table,))


def question(record: Record) -> Section:
    """Return the question as asked: every slot filled."""
    blocks: list[Block] = [Pairs(tuple(_slots(record)))]
    if record["study"]["note"]:
        blocks.append(Paragraph(record["study"]["note"], "Note:"))
    what_if = record.get("what_if") or {}
    if what_if:
        changed = listed(f"{name} = {value}" for name, value in what_if.items())
        blocks.append(Notice(f"{changed}. The files themselves are unchanged.", "What-if values set for this run:"))
    if record.get("as_of"):
        blocks.append(Notice(f"values with a history are as they were on {record['as_of']}.", "A past state:"))
    return Section("question", "The question as asked", (*blocks, _sides(record)))


def _device_limits(record: Record) -> Table | None:
    point = record["policies"][0]["candidate"]["point"]
    if point is None or not point["device_margins"]:
        return None
    rows = [(name, number(margin, 3, (1.0,))) for name, margin in sorted(point["device_margins"].items())]
    caption = "Limits the candidate's device model reports, at the primary design point (1 is the limit, above passes)"
    return plain("device-limits", caption, ("limit", "margin (factor)"), rows)


def requirements(record: Record, figure: Figure) -> Section:
    """Return the requirements table and chart."""
    rows = [
        (
            Cell(requirement_name(row["name"]), small=row["meaning"]),
            row["kind"],
            row["state"],
            amount(row["demanded"], row["unit"], 3),
            amount(row["offered"], row["unit"], 3),
            margin_words(row),
            "yes" if row["passes_somewhere"] else "no",
            row["note"],
        )
        for row in record["requirements"]
    ]
    columns = (
        "requirement",
        "kind",
        "state",
        "demanded",
        "offered",
        "margin",
        "met at some point of the range",
        "note",
    )
    caption = "Requirements of the candidate at the primary design point; an unknown is not a pass"
    table = plain("requirements", caption, columns, rows, wide=True, empty="The study states no requirement.")
    limits = _device_limits(record)
    return Section("requirements", "Requirements", (table, figure, *([limits] if limits else [])))
