"""The criteria of a study, locked by a digest at its first run into a record folder (layer 8).

Policy, metric, required advantage and thresholds decide what counts as an answer. Their digest and the date of the
first run stay in the record; a later run into the same folder with others says so.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from typing import Any

from benchmark.sets.study import Study

__all__ = ["criteria_of", "criteria_row", "with_earlier"]

Row = dict[str, Any]


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
    text = json.dumps(stated, sort_keys=True, ensure_ascii=False)
    return {"digest": hashlib.sha256(text.encode()).hexdigest(), "fixed": created, "stated": stated, "earlier": []}


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
