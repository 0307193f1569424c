"""Links of the values that changed: which other values they have to fit, and whether they do (layer 8)."""

from __future__ import annotations

import dataclasses
from collections.abc import Collection, Mapping, Sequence
from typing import Any

from benchmark.evaluate.links import link_rows
from benchmark.record.ledger import technologies
from benchmark.sets.parameters import ParameterSet
from benchmark.sets.study import Study

__all__ = ["changed_links", "set_links", "study_links"]

Row = Mapping[str, Any]
_KEPT = ("formula", "node", "unit", "left", "right", "ratio", "tolerance", "state", "source")


def set_links(item: ParameterSet, owner: str = "") -> list[dict[str, Any]]:
    """Return the links of a set as plain data; ``keys`` of the values as a ledger has them, ``owner`` before each."""
    head = f"{owner}." if owner else ""
    rows = []
    for row in link_rows(item):
        plain = dataclasses.asdict(row)
        rows.append(
            {"set": owner, "link": row.link, "keys": [head + name for name in row.names]}
            | {name: plain[name] for name in _KEPT}
        )
    return rows


def study_links(study: Study) -> list[dict[str, Any]]:
    """Return the links of every technology and wires set of a study."""
    return [row for item in (*technologies(study), *study.wires_sets) for row in set_links(item, item.id)]


def changed_links(old: Sequence[Row], new: Sequence[Row], changed: Collection[str]) -> list[dict[str, Any]]:
    """Return the links that changed values take part in and that are not as they were, with both sides then and now.

    Parameters
    ----------
    old, new : sequence of mapping
        From ``set_links`` or ``study_links``.
    changed : collection of str
        Keys of the values that changed.

    Returns
    -------
    list of dict
        ``left_old`` and ``right_old`` are None where the link did not hold before, or held at other nodes.
    """
    before = {_place(row): row for row in old}
    found = []
    for row in new:
        if not set(row["keys"]) & set(changed):
            continue
        was = before.get(_place(row))
        if was is not None and (was["left"], was["right"], was["state"]) == (row["left"], row["right"], row["state"]):
            continue  # another node, or only a range or a word
        sides = {f"{side}_old": None if was is None else was[side] for side in ("left", "right")}
        found.append({**row, **sides})
    return found


def _place(row: Row) -> tuple[str, str, str]:
    return row["set"], row["formula"], row["node"]
