"""The verdict in plain text, for terminals and mail (layer 8)."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

from benchmark.decide.uncertainty import unseen
from benchmark.record.shown_units import in_units_of_record, normalised
from benchmark.units import format_si

__all__ = [
    "answer_sentence",
    "cell_words",
    "engineering",
    "factor",
    "ladder_words",
    "probability",
    "robustness_words",
    "uncertainty_words",
    "verdict_text",
    "without_range",
]

_PREFIXES = (
    (1e15, "P"),
    (1e12, "T"),
    (1e9, "G"),
    (1e6, "M"),
    (1e3, "k"),
    (1.0, ""),
    (1e-3, "m"),
    (1e-6, "u"),
    (1e-9, "n"),
    (1e-12, "p"),
    (1e-15, "f"),
    (1e-18, "a"),
    (1e-21, "z"),
    (1e-24, "y"),
)


def engineering(value: float | str | None, unit: str, digits: int = 3) -> str:
    """Print an SI number with a prefix; None and words pass through as words."""
    if value is None:
        return "not stated"
    if isinstance(value, str):
        return value
    if unit == "1":
        return f"{value:.{digits}g}"
    if (symbol := normalised(unit)) is not None:
        return f"{value:.{digits}g} {symbol}"
    if unit in ("K", "m^2", "W/m^2"):
        shown = {"K": "degC", "m^2": "um^2", "W/m^2": "W/cm^2"}[unit]
        return format_si(value, shown, max(digits, 4) if unit == "K" else digits)
    if value == 0.0:
        return f"0 {unit}"
    size = abs(value)
    factor, prefix = next(((f, p) for f, p in _PREFIXES if size >= f * 0.9995), _PREFIXES[-1])
    return f"{value / factor:.{digits}g} {prefix}{unit}"


def factor(value: float, *limits: float) -> str:
    """Print a factor with two significant digits, with more where rounding would cross one of ``limits``."""
    digits = 2
    while digits < 17 and any((float(f"{value:.{digits}g}") >= limit) != (value >= limit) for limit in limits):
        digits += 1
    return f"{float(f'{value:.{digits}g}'):.{max(digits, 6)}g}"


def answer_sentence(record: Mapping[str, Any]) -> str:
    """One sentence: class, verdict, advantage with range, M, policy, strongest reference."""
    study, verdict = record["study"], record["verdict"]
    primary = record["policies"][0]
    candidate = next(side for side in record["sides"] if side["role"] == "candidate")
    head = "Demonstration with invented inputs: " if study["demonstration"] else ""
    word = verdict["word"]
    metric = study["metric"].replace("-", " ")
    sentence = f"{head}{word} for {candidate['title']!r} in {study['product_class']}"
    if verdict["advantage"] is None:
        return f"{sentence}: no advantage in {metric} can be stated, because a side has no permitted design point."
    limits = (1.0, study["required_advantage"])
    span = ""
    if verdict["advantage_low"] is not None and verdict["advantage_low"] != verdict["advantage_high"]:
        low, high = verdict["advantage_low"], verdict["advantage_high"]
        span = f" ({factor(low, *limits)} to {factor(high, *limits)} as inputs move one at a time over their ranges)"
    return (
        f"{sentence}: advantage {factor(verdict['advantage'], *limits)}{span} in {metric}, "
        f"required {study['required_advantage']:g}, policy {study['primary_policy']}, "
        f"against {primary['strongest']!r}, the strongest contender."
    )


def _side_line(name: str, point: Mapping[str, Any]) -> str:
    return (
        f"  {name}: {engineering(point['supply'], 'V')}, {engineering(point['time'], 's')} per operation path, "
        f"{engineering(point['energy'], 'J')} per operation; {point['delay_limit']}-limited in delay, "
        f"mostly {point['energy_limit']} in energy"
    )


def _band_line(record: Mapping[str, Any]) -> str:
    """Return how far the closed forms were from simulation; empty where none stands behind the numbers."""
    parts = []
    rows = record.get("error_bands", {}).get("sides", ())
    for side in dict.fromkeys(row["side"] for row in rows):
        mine = [row for row in rows if row["side"] == side and row["quantity"] in ("delay", "energy per operation")]
        said = [
            f"{row['quantity']} {row['ratio_low']:.2f} to {row['ratio_high']:.2f}"
            + ("" if row["covered"] > 0.999 else f" ({100.0 * row['covered']:.0f} % of it measured)")
            for row in mine
            if row["points"]
        ]
        parts.append(f"{side} {', '.join(said) if said else 'not measured'}")
    return f"Closed forms over circuit simulation: {'; '.join(parts)}" if parts else ""


def probability(found: Mapping[str, float], draws: int) -> str:
    """Print a probability with its sampling error; where all draws agree, with what none of them showed."""
    if found["value"] in (0.0, 1.0):
        limit = f"at most {unseen(draws):.2g}" if found["value"] == 0.0 else f"at least {1.0 - unseen(draws):.4g}"
        return f"{found['value']:.0f} ({'none' if found['value'] == 0.0 else 'all'} of {draws} draws; {limit} at 95 %)"
    if found["error"] == 0.0:
        return f"{found['value']:.3g} (the same in all scrambles)"
    digits = max(2, 1 - math.floor(math.log10(found["error"])))
    return f"{found['value']:.{digits}f} ± {found['error']:.{digits}f}"


def without_range(record: Mapping[str, Any]) -> str:
    """Say how many inputs no probability of the record has drawn, because no range is stated."""
    without = record["verdict"]["inputs_without_range"]
    if not without:
        return "every input that moves the result has one"
    if without == 1:
        return "1 input without a range stays at its value and counts as decisive"
    return f"{without} inputs without a range stay at their value and each counts as decisive"


def uncertainty_words(record: Mapping[str, Any]) -> list[str]:
    """Say how probable the required advantage is under the stated ranges, and what carries it."""
    found = record.get("uncertainty")
    if found is None:
        return []
    required = record["study"]["required_advantage"]
    reaches, better = (probability(found[key], found["draws"]) for key in ("reaches", "above_one"))
    lines = [
        f"Under the stated ranges ({found['draws']} draws, seed {found['seed']}): an advantage of {required:g} is "
        f"{found['word']}, probability {reaches}; more than 1: {better}; {without_range(record)}. "
        f"The ranges of {found['judgement']} of {found['inputs']} inputs are judgement or invented."
    ]
    if found["without_candidate"] > 0.0:
        lines.append(f"  In {found['without_candidate']:.2g} of the draws the candidate has no permitted point.")
    if found["reaches_at_open_ends"] is not None:
        keys = ", ".join(row["key"] for row in found["bounds"])
        at_ends = probability(found["reaches_at_open_ends"], found["draws"])
        lines.append(
            f"  Stated as bounds: {keys}; at their open ends the probability is {at_ends} (under the stated "
            f"ranges; {without_range(record)})."
        )
    if found["constant"]:
        least = f" by as much as {found['constant_below']:.0e} of it" if "constant_below" in found else ""
        return [*lines, f"  No drawn input moves the advantage{least}."]
    named = [row for row in found["shares"][:3] if row["share"] > 2.0 * row["share_error"]]
    if named:
        shares = ", ".join(f"{row['key']} {100.0 * row['share']:.2g} %{_tied(row)}" for row in named)
        lines.append(f"  Largest shares of the variance of its logarithm: {shares}")
    if found["stop"]:
        return [*lines, "  No measurement of these inputs can change the answer within their ranges: stop."]
    first = min(found["shares"], key=lambda row: row["place"])
    if first["cost"] is not None:
        per = f"{first['worth_per_cost']:.2g} in ln(advantage) per unit of cost"
        lines.append(f"  Most worth measuring for its cost: {first['key']} ({per})")
    elif first["worth"] > 2.0 * first["worth_error"]:
        lines.append(f"  Most worth measuring: {first['key']} (worth {first['worth']:.2g} in ln(advantage))")
    return lines


def _tied(row: Mapping[str, Any]) -> str:
    """Name the inputs that are not independent of one."""
    return f" (moves with {', '.join(row['moves_with'])})" if row.get("moves_with") else ""


def ladder_words(record: Mapping[str, Any], row: Mapping[str, Any]) -> str:
    """Say what becomes of the required advantage on the way up a ladder."""
    required = record["study"]["required_advantage"]
    head = f"Ladder of the {row['of']}: "
    if row["state"] == "undefined":
        return f"{head}on no rung do both sides have a permitted point."
    known = [rung for rung in row["rungs"] if rung["advantage"] is not None]
    first, last = (_shown(rung["advantage"], required) for rung in (known[0], known[-1]))
    whole = known[-1]["name"] == row["rungs"][-1]["name"]
    top = "with everything the study offers" if whole else f"at '{known[-1]['name']}'"
    span = f"advantage {first} at '{known[0]['name']}', {last} {top}"
    end = {
        "lost": f"is lost at '{row['turn']}'",
        "reached": f"is reached at '{row['turn']}'",
        "kept": "is kept on every rung",
        "never": "is reached on no rung",
    }.get(row["state"], "is not judged")
    return f"{head}{span}; the required {required:g} {end}."


def cell_words(cell: Mapping[str, Any]) -> str:
    """Name a cell."""
    kelvin = cell["temperatures"]
    at = f"{kelvin[0]:.6g} K" if len(kelvin) == 1 else "all temperatures"
    return f"{cell['policy']}, contenders {cell['contenders']}, pair {cell['pair']}, {at}"


def robustness_words(record: Mapping[str, Any]) -> str:
    """Say how many cells reach the required advantage, and which is the worst."""
    row = record["robustness"]
    required = record["study"]["required_advantage"]
    cells = len(row["cells"])
    text = f"Robustness: {row['reaching']} of {cells} cells reach {required:g}, {row['better']} are above 1"
    text += f", {row['infeasible']} are infeasible" if row["infeasible"] else ""
    if row["worst"] is None:
        return f"{text}."
    worst = row["cells"][row["worst"]]
    return f"{text}; worst {_shown(worst['advantage'], required)} ({cell_words(worst)})."


def _shown(advantage: Any, required: float) -> str:
    return advantage if isinstance(advantage, str) else factor(advantage, 1.0, required)


@in_units_of_record
def verdict_text(record: Mapping[str, Any]) -> str:
    """Return the verdict as a few plain lines."""
    verdict, primary = record["verdict"], record["policies"][0]
    lines = [answer_sentence(record)]
    for title, key in (("Why", "reasons"), ("Conditions", "conditions"), ("To measure", "measure_next")):
        rows = verdict[key]
        if rows and not (key == "measure_next" and rows == verdict["reasons"]):
            lines += [f"{title}:", *(f"  - {row}" for row in rows[:12])]
            if len(rows) > 12:
                lines.append(f"  - and {len(rows) - 12} more (see the report)")
    if primary["candidate"]["point"] is not None:
        lines += ["Design points:", _side_line("candidate", primary["candidate"]["point"])]
        reference = next((side for side in primary["contenders"] if side["id"] == primary["strongest"]), None)
        if reference is not None and reference["point"] is not None:
            lines.append(_side_line(reference["id"], reference["point"]))
    if band := _band_line(record):
        lines.append(band)
    lines.append("Requirements:")
    for row in record["requirements"]:
        unit = row["unit"]
        margin = "" if row["margin"] is None else f", margin {engineering(row['margin'], '1')}"
        note = f" ({row['note']})" if row["note"] else ""
        lines.append(
            f"  {row['state']:7} {row['name'].replace('_', ' ')}: demanded {engineering(row['demanded'], unit)}, "
            f"offered {engineering(row['offered'], unit)}{margin}{note}"
        )
    lines += uncertainty_words(record)
    lines += [ladder_words(record, row) for row in record.get("ladder", ())]
    lines += [robustness_words(record)] if "robustness" in record else []
    counts = (
        f"{verdict['inputs_with_effect']} inputs move the result, {verdict['inputs_without_range']} of them have "
        f"no stated range, {verdict['inputs_of_judgement']} are judgement or invented."
    )
    return "\n".join([*lines, counts, *record["cautions"][:1]])
