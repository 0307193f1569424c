"""The report of a change as plain data: inputs, results, verdict, parts, chain (layer 8)."""

from __future__ import annotations

import hashlib
import math
from collections.abc import Mapping, Sequence
from pathlib import PurePath
from typing import Any

from benchmark.decide.attribution import REST, Attribution, attribute
from benchmark.errors import UsageError
from benchmark.record.changes.chain import causal_chain
from benchmark.record.changes.inputs import input_changes, text_changes, unit_notes
from benchmark.record.changes.links import changed_links, study_links
from benchmark.record.changes.points import operating_points
from benchmark.record.changes.question import asked_changes, other_changes
from benchmark.record.changes.results import result_changes
from benchmark.record.changes.spreads import probability_split
from benchmark.record.changes.states import State
from benchmark.record.results import clean
from benchmark.record.write import to_json
from benchmark.sets.study import Study

__all__ = ["QuestionsDiffer", "compare_sets", "compare_states", "in_record", "refuse_other_question"]

#: a smaller difference of ln(advantage) between record and present program is rounding
SAME = 1.0e-9
Row = dict[str, Any]


class QuestionsDiffer(UsageError):
    """Two records answer different questions."""


def compare_states(old: State, new: State, *, anyway: bool = False, jobs: int = 1) -> Row:
    """Say what changed from one state of a study to another, and why.

    Parameters
    ----------
    old, new : State
    anyway : bool
        Compare records that answer different questions too; ``banners`` then says so.
    jobs : int
        Processes for the draws of the probability; their number changes no digit.

    Returns
    -------
    dict
        ``inputs``, ``links`` (which other values the changed ones have to fit), ``other`` (what is not a value),
        ``results``, ``identical``, ``verdict``, ``points`` (operating points before and after), ``resolution``
        (relative: a smaller part may be what is left of the search), ``attribution``, ``probability`` (None without
        draws on both sides), ``chain``,
        ``banners``.

    Raises
    ------
    QuestionsDiffer
        When question or criteria differ and ``anyway`` is not set.
    """
    if not anyway:
        refuse_other_question((old.shown, old.study), (new.shown, new.study))
    other = other_changes(old, new)
    changed, identical = result_changes(old.record, new.record)
    inputs = input_changes(old.record["ledger"], new.record["ledger"])
    split = attribute(old.study, new.study)
    found = {
        "old": _head(old),
        "new": _head(new),
        "banners": [*_banners(other, split, old.record, new.record), *unit_notes(inputs)],
        "inputs": inputs,
        "links": changed_links(study_links(old.study), study_links(new.study), [row["key"] for row in inputs]),
        "other": other,
        "verdict": {
            "old": old.record["verdict"]["word"],
            "new": new.record["verdict"]["word"],
            "reasons_old": old.record["verdict"]["reasons"],
            "reasons_new": new.record["verdict"]["reasons"],
            "flipped": old.record["verdict"]["word"] != new.record["verdict"]["word"],
        },
        "points": operating_points(old.record, new.record),
        "resolution": max(old.study.refine_relative, new.study.refine_relative),
        "attribution": [vars(row) for row in split],
        "probability": probability_split(old.study, new.study, (old.record, new.record), jobs),
        "chain": causal_chain(old.study, new.study),
        "results": changed,
        "identical": identical,
    }
    cleaned: Row = clean(found)
    return cleaned


def refuse_other_question(old: tuple[str, Study], new: tuple[str, Study]) -> None:
    """Refuse to compare two studies, each with its name, that answer different questions.

    Raises
    ------
    QuestionsDiffer
        Naming everything in which question and criteria differ.
    """
    asked = asked_changes(old[1], new[1])
    if asked:
        named = "; ".join(f"{row['name']}: {row['old'] or 'absent'} -> {row['new'] or 'absent'}" for row in asked)
        message = f"{old[0]} and {new[0]} answer different questions ({named}); --anyway compares them none the less"
        raise QuestionsDiffer(message)


def in_record(record: Mapping[str, Any], found: Mapping[str, Any]) -> Row:
    """Return a record with what changed since an earlier one; folders of the earlier one are not told."""
    old = {**found["old"], "shown": PurePath(found["old"]["shown"]).name}
    new = {name: value for name, value in found["new"].items() if name not in ("shown", "sha256")}
    return {**record, "change": {**found, "old": old, "new": new}}


def compare_sets(old: Mapping[str, Any], new: Mapping[str, Any]) -> Row:
    """Say which values of a set changed; nothing is run.

    Parameters
    ----------
    old, new : mapping
        From ``set_state``.
    """
    banners = [] if old["id"] == new["id"] else [f"two different sets: {old['id']} and {new['id']}"]
    # keys carry the id of their set, which differs between a set and a renamed copy of it
    ledgers = [[row | {"key": row["name"]} for row in state["ledger"]] for state in (old, new)]
    inputs = input_changes(*ledgers)
    found = {
        "old": {"shown": old["shown"], "id": old["id"]},
        "new": {"shown": new["shown"], "id": new["id"]},
        "banners": [*banners, *unit_notes(inputs)],
        "inputs": inputs,
        "links": changed_links(old["links"], new["links"], [row["key"] for row in inputs]),
        "other": text_changes(old["options"], new["options"], "option"),
    }
    cleaned: Row = clean(found)
    return cleaned


def _head(state: State) -> Row:
    study, verdict = state.record["study"], state.record["verdict"]
    return {
        "shown": state.shown,
        "study": study["id"],
        "created": state.record["created"],
        "sha256": hashlib.sha256(to_json(state.record).encode()).hexdigest(),
        "metric": study["metric"],
        "advantage": verdict["advantage"],
        "required_advantage": study["required_advantage"],
    }


def _banners(
    other: Sequence[Mapping[str, str]], split: Sequence[Attribution], old: Mapping[str, Any], new: Mapping[str, Any]
) -> list[str]:
    """Return what else than values changed, in sentences, so that it is not taken for the effect of a value."""
    banners = []
    for kind, text in _TEXTS.items():
        names = [row["name"] for row in other if row["kind"] == kind]
        if names:
            dates = f" ({_dates(old, new)})" if kind == "criteria" else ""
            banners.append(f"{text}: {', '.join(names)}{dates}")
    advantage = split[0]
    if REST in advantage.parts:
        banners.append(f"the part {REST!r} is what options, tables, circuits, ranges of the search or the question do")
    for word, record, now in (("old", old, advantage.before), ("new", new, advantage.after)):
        stated = record["verdict"]["advantage"]
        if _differs(stated, now):
            banners.append(
                f"the {word} record states the advantage {stated}, this program finds {now:.12g} from the same inputs; "
                "the parts below are of this program's numbers"
            )
    return banners


def _dates(old: Mapping[str, Any], new: Mapping[str, Any]) -> str:
    """When the criteria of both were first used."""
    first, second = ((record.get("criteria") or {}).get("fixed") or record["created"] for record in (old, new))
    return f"first used on {first} and on {second}"


_TEXTS = {
    "question": "the two records answer different questions",
    "criteria": "the criteria of the answer changed",
    "option": "choices that are no numbers changed",
    "file": "measured tables or circuit files changed",
    "method": "what is searched changed",
    "constant": "physical constants of the program changed",
    "program": "the program or its libraries changed",
}


def _differs(stated: Any, now: float) -> bool:
    if not isinstance(stated, (int, float)):
        return math.isfinite(now)
    if not (math.isfinite(now) and now > 0.0 and stated > 0.0):
        return bool(stated != now)
    return abs(math.log(now / stated)) > SAME
