"""What an earlier record was run with besides its files, so that a study nobody edited gives the same bits."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from benchmark.sets.study import Study

__all__ = ["taken_over"]

Record = Mapping[str, Any]


def taken_over(before: Record, study: Study, given: Record) -> tuple[dict[str, Any], str]:
    """Return the options of a run after an earlier one, and words for what was taken over from it.

    Draws and seed are taken over when they were given to the earlier run beside its study; those that its study stated
    are not, for the study may state others now. Questions of need are asked again when the record answers them.

    Parameters
    ----------
    before : mapping
        Earlier record.
    study : Study
        As it is now.
    given : mapping
        ``draws`` and ``seed`` of this run; None is not given.

    Returns
    -------
    tuple
        ``draws``, ``seed`` and ``need``; and the words, empty when nothing was taken over.
    """
    found = {"draws": given["draws"], "seed": given["seed"], "need": "need" in before}
    words = []
    ran, then = _ran(before), _stated_then(before, study)
    for name, text in (("draws", "{} draws"), ("seed", "seed {}")):
        if found[name] is None and name in ran and ran[name] != then.get(name):
            found[name] = ran[name]
            words.append(text.format(ran[name]))
    if found["draws"] == 0 and given["seed"] is None:
        found["seed"] = None  # nothing is drawn
        words = [text for text in words if not text.startswith("seed")]
    if found["need"]:
        words.append("questions of need")
    said = [f"{', '.join(words)} as in the earlier record"] if words else []
    return found, "; ".join(said + _not_repeated(before))


def _ran(record: Record) -> dict[str, int]:
    """Draws and seed of a record; without draws none, where there was something to draw."""
    drawn = record.get("uncertainty")
    if drawn:
        return {"draws": drawn["draws"], "seed": drawn["seed"]}
    return {"draws": 0} if any(row.get("spread") for row in record.get("ledger", ())) else {}


def _stated_then(record: Record, study: Study) -> dict[str, int]:
    """Draws and seed that the study of a record stated; nothing when it is another one and its text is left out."""
    if record["study"].get("sha256") == study.sha256:
        return {"draws": study.draws.number, "seed": study.draws.seed}
    for item in record.get("files", ()):
        if item["kind"] == "study" and "text" in item:
            try:
                table = tomllib.loads(item["text"]).get("uncertainty", {})
            except tomllib.TOMLDecodeError:
                return {}
            return {"draws": table.get("draws", 0), "seed": table.get("seed", 0)}
    return {}


def _not_repeated(record: Record) -> list[str]:
    """Say what else made the earlier record another run than one of its study as it stands."""
    said = []
    if changed := record.get("what_if"):
        pairs = ", ".join(f"{name}={number}" for name, number in changed.items())
        said.append(f"the earlier record was run with --set {pairs}, this one without")
    if record.get("as_of"):
        said.append(f"the earlier record was run with --as-of {record['as_of']}, this one without")
    return said
