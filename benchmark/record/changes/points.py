"""Operating points of both sides before and after a change, as the two records state them (layer 8)."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

__all__ = ["operating_points"]

Record = Mapping[str, Any]
#: what is told of a design point
_KEPT = ("supply", "time", "energy", "area", "leakage_power")


def operating_points(old: Record, new: Record) -> list[dict[str, Any]]:
    """Return the candidate and the strongest contender under the primary policy, in the old and in the new record.

    Returns
    -------
    list of dict
        ``when`` (before, after), ``role``, ``side`` (its id), ``name`` (title of the candidate, id of a contender),
        ``ambition`` of its technology, and of the design point ``supply`` [V], ``time`` [s], ``energy`` [J],
        ``area`` [m^2], ``leakage_power`` [W].
        A side without a permitted point has no row.
    """
    return [row for when, record in (("before", old), ("after", new)) for row in _points(when, record)]


def _points(when: str, record: Record) -> list[dict[str, Any]]:
    policy = record["policies"][0]
    named = [("candidate", policy["candidate"])]
    named += [("contender", side) for side in policy["contenders"] if side["id"] == policy["strongest"]]
    rows = []
    for role, side in named:
        if side["point"] is None:
            continue
        told = next(row for row in record["sides"] if (row["role"], row["id"]) == (role, side["id"]))
        name = str(told["title"] if role == "candidate" else side["id"])
        head = {"when": when, "role": role, "side": side["id"], "name": name, "ambition": told["ambition"]}
        rows.append({**head, **{key: side["point"].get(key) for key in _KEPT}})
    return rows
