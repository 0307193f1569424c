"""Three to six findings in plain words, each from numbers of the record and with the section that holds them (layer 8).

Ratios, shares and probabilities only, so that the findings of a record without absolute values are the same sentences.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

from benchmark.record.text import factor, ladder_words, probability, robustness_words, without_range

__all__ = ["findings"]

Record = Mapping[str, Any]
LEAST, MOST = 3, 6


def findings(record: Record) -> list[dict[str, str]]:
    """Return three to six findings in the order of their weight.

    What every record can say of itself, down to its requirements and counts, follows only while there are fewer than
    three: a study without an advantage has little else to say.

    Returns
    -------
    list of dict
        ``text``: one sentence; ``at``: id of the section of the report that holds its numbers.
    """
    made = (_requirements, _advantage, _probability, _limits, _decisive, _ladder, _nodes, _knowing)
    found = [{"text": text, "at": at} for make in made for text, at in make(record)]
    for make in (_robustness, _contenders, _requirements_met, _counts):
        if len(found) >= LEAST:
            break
        found += [{"text": text, "at": at} for text, at in make(record)]
    return found[:MOST]


def _number(value: Any) -> bool:
    return isinstance(value, (int, float)) and not isinstance(value, bool) and math.isfinite(value)


def _limits_of(record: Record) -> tuple[float, float]:
    return 1.0, float(record["study"]["required_advantage"])


def _requirements(record: Record) -> list[tuple[str, str]]:
    failed = [row["name"].replace("_", " ") for row in record["requirements"] if row["state"] == "fail"]
    unknown = [row["name"].replace("_", " ") for row in record["requirements"] if row["state"] == "unknown"]
    found = []
    if failed:
        found.append((f"The candidate fails {len(failed)} requirement(s): {', '.join(failed)}.", "requirements"))
    if unknown:
        found.append((f"Not known: {', '.join(unknown)}; an unknown is no pass.", "requirements"))
    return found


def _advantage(record: Record) -> list[tuple[str, str]]:
    advantage = record["verdict"]["advantage"]
    primary = record["policies"][0]
    if not _number(advantage):
        if primary["candidate"]["point"] is not None:
            side = "no contender has a permitted point"
        elif any(row["point"] is not None for row in primary["contenders"]):
            side = "the candidate has no permitted point"
        else:
            side = "no side has a permitted point"
        return [(f"No advantage exists: {side} under the policy {primary['policy']}.", "policies")]
    one, required = _limits_of(record)
    metric = record["study"]["metric"].replace("-", " ")
    reach = "which reaches" if advantage >= required else "which does not reach"
    return [
        (
            f"The advantage in {metric} over {primary['strongest']}, the strongest contender, is "
            f"{factor(advantage, one, required)} (reference / candidate), {reach} the required {required:g}.",
            "policies",
        )
    ]


def _probability(record: Record) -> list[tuple[str, str]]:
    found = record.get("uncertainty")
    if found is None:
        return []
    return [
        (
            f"With all stated ranges at once an advantage of {record['study']['required_advantage']:g} has a "
            f"probability of {probability(found['reaches'], found['draws'])} (under the stated "
            f"ranges; {without_range(record)}); {found['judgement']} of {found['inputs']} ranges are judgement or "
            "invented.",
            "uncertainty",
        )
    ]


def _limits(record: Record) -> list[tuple[str, str]]:
    point = record["policies"][0]["candidate"]["point"]
    if point is None:
        return []
    delay, energy = point["delay_limit"], point["energy_limit"]
    return [
        (
            f"The candidate's delay is {100.0 * point['delay_shares'][delay]:.0f} % {delay}, its energy "
            f"{100.0 * point['energy_shares'][energy]:.0f} % {energy.replace('_', ' ')}.",
            "parts",
        )
    ]


def _decisive(record: Record) -> list[tuple[str, str]]:
    ranged = [row for row in record["verdict"]["moves"] if row["ranged"]]
    straddling = [row for row in ranged if row["straddles"]]
    if straddling:
        names = ", ".join(row["key"] for row in straddling[:3])
        more = f" and {len(straddling) - 3} more" if len(straddling) > 3 else ""
        return [(f"Moved alone over its range, each of these turns the answer: {names}{more}.", "moves")]
    known = [row for row in ranged if _number(row["advantage_low"]) and _number(row["advantage_high"])]
    if not known:
        return []
    row = known[0]
    ends = sorted((row["advantage_low"], row["advantage_high"]))
    low, high = (factor(end, *_limits_of(record)) for end in ends)
    return [
        (
            f"No input moved alone over its range turns the answer; {row['key']} moves the advantage most, from "
            f"{low} to {high}.",
            "moves",
        )
    ]


def _ladder(record: Record) -> list[tuple[str, str]]:
    return [(ladder_words(record, row), "ladder") for row in record.get("ladder", ()) if row["of"] == "reference"]


def _nodes(record: Record) -> list[tuple[str, str]]:
    rows = [row for row in record["nodes"] if _number(row["advantage"])]
    if len(rows) < 2:
        return []
    limits = _limits_of(record)
    steps = ", ".join(f"{factor(row['advantage'], *limits)} at {row['label']}" for row in rows)
    return [(f"From node pair to node pair the advantage is {steps}.", "nodes")]


def _knowing(record: Record) -> list[tuple[str, str]]:
    found = record.get("uncertainty")
    if found is None:
        return []
    if found["stop"]:
        return [("No measurement of these inputs can change the answer within their ranges.", "next-measurement")]
    best = min(found["shares"], key=lambda row: row["place"], default=None)
    if best is None or (best["cost"] is None and best["worth"] <= 2.0 * best["worth_error"]):
        return []
    return [(f"Most worth measuring: {best['key']}.", "next-measurement")]


def _requirements_met(record: Record) -> list[tuple[str, str]]:
    rows = record["requirements"]
    if not rows or any(row["state"] in ("fail", "unknown") for row in rows):
        return []
    met = sum(row["state"] == "pass" for row in rows)
    return [(f"The candidate fails no listed requirement; it passes {met} of {len(rows)}.", "requirements")]


def _contenders(record: Record) -> list[tuple[str, str]]:
    sides = record["policies"][0]["contenders"]
    permitted = sum(side["point"] is not None for side in sides)
    return [
        (
            f"Of {len(sides)} contender(s) {permitted} can be set to a permitted point under the primary policy.",
            "policies",
        )
    ]


def _robustness(record: Record) -> list[tuple[str, str]]:
    return [(robustness_words(record), "robustness")] if "robustness" in record else []


def _counts(record: Record) -> list[tuple[str, str]]:
    verdict = record["verdict"]
    return [
        (
            f"{verdict['inputs_with_effect']} input(s) move the result, {verdict['inputs_without_range']} of them "
            "without a stated range.",
            "moves",
        )
    ]
