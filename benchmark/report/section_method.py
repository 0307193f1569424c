"""Method in the report: self-checks, warnings, how to reproduce, terms, cautions (layer 9)."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from benchmark.report.blocks import Block, Bullets, Code, Notice, Pairs, Paragraph, Section, plain

__all__ = ["cautions", "reproduce", "self_checks", "terms", "warnings"]

Record = Mapping[str, Any]

TERMS: tuple[tuple[str, str], ...] = (
    ("activity factor", "rising transitions per clock cycle per net"),
    ("advantage", "reference over candidate for costs such as energy; above 1 favours the candidate, always"),
    (
        "contender",
        "a reference technology the study lists; the strongest is the one with the lowest cost that is feasible",
    ),
    (
        "decisive input",
        "moving it alone over its stated range changes the side of the required advantage, or it has no range",
    ),
    ("design point", "supply, size and threshold shift a policy chooses for one side"),
    (
        "energy per operation",
        "charge energy of every net times its activity, plus leakage, plus overheads, over one operation",
    ),
    (
        "evidence class",
        "how a value is known: defined, measured, published, choice, extracted, simulated, derived, projected, "
        "target, assumed, invented",
    ),
    ("feasible", "every hard requirement holds; a side that cannot reach a time is infeasible, not infinitely worse"),
    ("flip value", "value of an input at which the advantage equals the required advantage"),
    ("guard-band", "multiplier on delay and leakage, the same for both sides"),
    ("iso-delay", "least energy with time at most the required time"),
    ("lower envelope", "for each time the least energy any feasible contender point needs"),
    ("margin", "factor between what a requirement allows and what is used; above 1 passes"),
    ("node label", "a name with an order, never a length"),
    ("period accounting", "leakage is charged over the whole clock period; operation accounting: over the path delay"),
    ("required advantage", "the advantage the study demanded before the run"),
    ("self-timed, clocked", "the cycle is the path delay; the cycle is the clock period"),
    ("transit", "time a mechanical or acoustic motion takes, apart from charging"),
)


def self_checks(record: Record) -> Section:
    """Return the checks executed on this study's own data."""
    rows = [
        (check["name"], check["expected"], check["obtained"], "passed" if check["passed"] else "FAILED")
        for check in record["self_checks"]
    ]
    failed = [check["name"] for check in record["self_checks"] if not check["passed"]]
    blocks: list[Block] = []
    if failed:
        blocks.append(
            Notice(f"{', '.join(failed)}. The results of this report are not to be used.", "Self-check failed:")
        )
    caption = "Executed on the data of this study, in this run"
    columns = ("check", "expected", "obtained", "outcome")
    blocks.append(plain("self-checks", caption, columns, rows, empty="No check was executed."))
    return Section("self-checks", "Self-checks", tuple(blocks))


def warnings(record: Record) -> Section:
    """Return every warning of files and results, and what was taken without being stated."""
    items, notes = tuple(record["warnings"]), tuple(record.get("notes", ()))
    blocks: list[Block] = [Bullets(items, "Warnings") if items else Paragraph("No warning.")]
    if notes:
        blocks.append(Bullets(notes, "Notes"))
    return Section("warnings", "Warnings", tuple(blocks))


def reproduce(record: Record, digest: str) -> Section:
    """Return command, versions and digests of all inputs."""
    study = next((item["name"] for item in record["files"] if item["kind"] == "study"), "study.toml")
    changes = "".join(f" --set {name}={value}" for name, value in (record.get("what_if") or {}).items())
    command = f"evenload run {study}{changes} --freeze-time {record['created']}"
    versions = tuple((name, version) for name, version in record["software"].items())
    rows = [(item["name"], item["kind"], item["sha256"]) for item in record["files"]]
    text = (
        "A ratio-only record cannot be run again: the input files are named by their digests, their texts are not "
        "here. The record itself is embedded in this page (element with the id record)."
        if record.get("ratio_only")
        else "Every input file stands with its full text in the record, and the record is embedded in this page "
        "(element with the id record), so the page carries all it was made from."
    )
    return Section(
        "reproduce",
        "How to reproduce",
        (
            Paragraph(text),
            Code(command),
            Paragraph(digest, "sha256 of record.json:"),
            Pairs(versions),
            plain("files", "Input files", ("file", "kind", "sha256"), rows, wide=True),
        ),
    )


def terms() -> Section:
    """Return the words as this report uses them."""
    return Section("terms", "Terms", (Pairs(TERMS),))


def cautions(record: Record) -> Section:
    """Return what to keep in mind before acting on the report."""
    return Section("cautions", "Cautions", (Bullets(tuple(record["cautions"])),))
