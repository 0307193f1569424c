"""The verdict in plain text, for terminals and mail (layer 8)."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from benchmark.record.shown_units import in_units_of_record, normalised
from benchmark.units import format_si

__all__ = ["answer_sentence", "engineering", "factor", "verdict_text"]

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
    lines.append("Requirements:")
    for row in record["requirements"]:
        unit = row["unit"]
        margin = "" if row["margin"] is None else f", margin {engineering(row['margin'], '1')}"
        note = f" ({row['note']})" if row["note"] else ""
        lines.append(
            f"  {row['state']:7} {row['name'].replace('_', ' ')}: demanded {engineering(row['demanded'], unit)}, "
            f"offered {engineering(row['offered'], unit)}{margin}{note}"
        )
    counts = (
        f"{verdict['inputs_with_effect']} inputs move the result, {verdict['inputs_without_range']} of them have "
        f"no stated range, {verdict['inputs_of_judgement']} are judgement or invented."
    )
    return "\n".join([*lines, counts, *record["cautions"][:1]])
