"""The criteria of a study, locked by a digest at its first run into a record folder (layer 8).

Policy, metric, required advantage and thresholds decide what counts as an answer. Their digest and the date of the
first run stay in the record; a later run of the study into the same folder with others says so.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from benchmark.errors import EvenloadError
from benchmark.record.write import read_record
from benchmark.sets.files import is_file
from benchmark.sets.study import Study

__all__ = [
    "after_earlier",
    "continued",
    "criteria_of",
    "criteria_row",
    "criteria_words",
    "with_earlier",
    "without_limits",
]

Row = dict[str, Any]
#: criteria without a dimension, which a ratio-only record may tell
_PURE = frozenset(
    {
        *("required advantage", "primary policy", "other policies", "metric", "exponent"),
        *("likely from", "unlikely up to", "invented inputs"),
    }
)


def criteria_of(study: Study) -> Row:
    """Return what decides: name -> number or word, SI."""
    policy = study.policy
    return {
        "required advantage": study.required_advantage,
        "primary policy": policy.primary,
        "other policies": ", ".join(policy.also),
        "metric": policy.metric,
        "required time": policy.required_time,
        "required energy": policy.required_energy,
        "exponent": policy.exponent,
        "likely from": study.draws.likely,
        "unlikely up to": study.draws.unlikely,
        "invented inputs": study.invented_inputs,
        **{
            f"requirement {name}": f"{item.kind}, limit {item.limit} {item.unit}, "
            f"fan-in {item.fan_in}, life {item.life}"
            for name, item in study.requirements.items()
        },
    }


def criteria_row(study: Study, created: str) -> Row:
    """Return the criteria of a run for its record: digest, date, and what they are."""
    stated = criteria_of(study)
    return {"digest": _digest(stated), "fixed": created, "stated": stated, "earlier": [], "note": ""}


def _digest(stated: Mapping[str, Any]) -> str:
    return hashlib.sha256(json.dumps(stated, sort_keys=True, ensure_ascii=False).encode()).hexdigest()


def continued(record: Mapping[str, Any], folder: Path) -> Mapping[str, Any]:
    """Return a record as it is written into a folder: with the criteria of an earlier run of the study there.

    An earlier record that cannot be read, or whose criteria do not have their digest, is replaced as before, and
    ``note`` says so. A ratio-only record stays as it is: it is made of one that has been continued.
    """
    if "criteria" not in record or record.get("ratio_only") or not is_file(folder / "record.json"):
        return record
    try:
        before = read_record(folder)
    except EvenloadError:
        return _noted(record, "the folder held a record that could not be read, so earlier criteria are not known")
    return after_earlier(record, before)


def after_earlier(record: Mapping[str, Any], before: Mapping[str, Any]) -> Mapping[str, Any]:
    """Return a record with the criteria of an earlier record of the same study; of another study nothing is taken."""
    if before.get("study", {}).get("id") != record["study"]["id"]:
        return record
    earlier = before.get("criteria")
    if earlier and before.get("ratio_only"):
        return _noted(
            record, "the earlier record holds ratios only, so whether its criteria were the same is not known"
        )
    if earlier and not _whole(earlier):
        return _noted(record, "the criteria in the earlier record do not have the digest stated there")
    return {**record, "criteria": with_earlier(record["criteria"], earlier)}


def without_limits(criteria: Mapping[str, Any], left_out: str) -> Row:
    """Return the criteria as a ratio-only record tells them: dates, what changed, and only what has no dimension.

    The digest goes too: of a few unknown numbers it could be found by trying.
    """

    def told(row: Mapping[str, Any]) -> Row:
        stated = {name: value for name, value in row["stated"].items() if name in _PURE}
        return {"digest": left_out, "fixed": row["fixed"], "stated": stated}

    def change(item: Mapping[str, Any]) -> Row:
        return dict(item) if item["name"] in _PURE else {"name": item["name"], "old": left_out, "new": left_out}

    earlier = [told(row) | {"changed": [change(item) for item in row["changed"]]} for row in criteria["earlier"]]
    return told(criteria) | {"earlier": earlier, "note": criteria["note"]}


def _noted(record: Mapping[str, Any], note: str) -> Row:
    return {**record, "criteria": {**record["criteria"], "note": note}}


def _whole(criteria: Any) -> bool:
    """Tell whether the criteria of a record, and all that came before them, are what their digests say."""
    try:
        rows = [criteria, *criteria["earlier"]]
        return all(isinstance(row["fixed"], str) and _digest(row["stated"]) == row["digest"] for row in rows)
    except (KeyError, TypeError):
        return False


def criteria_words(record: Mapping[str, Any]) -> str:
    """Say which criteria changed after results existed, with the dates; empty when none did."""
    criteria = record.get("criteria") or {}
    said = [
        f"used on {row['fixed']}, "
        + "; ".join(f"{item['name']} {_word(item['old'])} -> {_word(item['new'])}" for item in row["changed"])
        for row in criteria.get("earlier", ())
        if row["changed"]
    ]
    said = [f"those of this run were first used on {criteria['fixed']}; before: {' | '.join(said)}."] if said else []
    if criteria.get("note"):
        said.append(f"{criteria['note']}.")
    return " ".join(said)


def _word(value: Any) -> str:
    return "none" if value in (None, "") else f"{value:.6g}" if isinstance(value, float) else str(value)


def with_earlier(criteria: Mapping[str, Any], before: Mapping[str, Any] | None) -> Row:
    """Return the criteria of a run into a folder that holds an earlier run.

    Parameters
    ----------
    criteria : mapping
        Of the new run, from ``criteria_row``.
    before : mapping or None
        ``record["criteria"]`` of the earlier run; None when there is none.

    Returns
    -------
    dict
        With the date of the first run with these criteria; ``earlier`` lists what was used before, oldest first, each
        with its date and what has changed since.
    """
    if not before:
        return dict(criteria)
    if before["digest"] == criteria["digest"]:
        return {**criteria, "fixed": before["fixed"], "earlier": list(before["earlier"])}
    stated = criteria["stated"]
    past = [*before["earlier"], {name: before[name] for name in ("digest", "fixed", "stated")}]
    return {**criteria, "earlier": [row | {"changed": _changed(row["stated"], stated)} for row in past]}


def _changed(old: Mapping[str, Any], new: Mapping[str, Any]) -> list[Row]:
    return [
        {"name": name, "old": old.get(name), "new": new.get(name)}
        for name in dict.fromkeys([*old, *new])
        if old.get(name) != new.get(name)
    ]
