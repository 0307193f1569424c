"""The step between two neighbouring nodes, split by cause (layer 7).

The values of one node are put in place of those of the other, group by group, both sides re-optimised; each group is
given its effect on ln(advantage) as the mean of one order and the opposite one, so the parts add up to the total. What
values do not carry over is a part of its own.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from benchmark.catalogue import QUANTITIES
from benchmark.decide.compare import Comparison
from benchmark.decide.curves import NodeResult
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.side import values_by_key
from benchmark.sets.study import NodePair, Study

__all__ = ["CONTENDERS", "REST", "NodeStep", "attribution", "combinations", "node_steps"]

#: what values alone do not carry over: tables and rows by node, other contenders, limits of the search
REST = "not carried by values"
CONTENDERS = "other contenders listed"
WIRES, REFERENCE = "wires", "reference values"
#: unit of a value of the candidate -> cause
_CAUSES = {
    "V": "candidate voltages",
    "fF": "candidate capacitance",
    "fF/um": "candidate capacitance",
    "nm": "candidate dimensions",
    "um": "candidate dimensions",
    "um^2": "candidate dimensions",
}
OTHER = "other candidate values"


@dataclass(frozen=True)
class NodeStep:
    """ln(advantage at ``after`` / advantage at ``before``) and its parts; no parts where ``note`` says why."""

    before: str
    after: str
    total: float
    parts: Mapping[str, float]
    note: str


def attribution(worth: Mapping[int, float], count: int) -> list[float]:
    """Return the effect of each of ``count`` groups: the mean over putting them in place in order and backwards.

    Parameters
    ----------
    worth : mapping
        Value of every combination of ``combinations``; bit i of the key tells whether group i is in place.
    count : int
        Number of groups.

    Returns
    -------
    list of float
        Effects; their sum is ``worth`` of all groups less ``worth`` of none.
    """
    return [
        0.5 * (worth[_first(i + 1)] - worth[_first(i)]) + 0.5 * (worth[_last(count, i)] - worth[_last(count, i + 1)])
        for i in range(count)
    ]


def _first(number: int) -> int:
    """The combination of the first groups."""
    return (1 << number) - 1


def _last(count: int, start: int) -> int:
    """The combination of the groups from ``start`` on."""
    return _first(count) & ~_first(start)


def combinations(count: int) -> list[int]:
    """Return every combination the two orders pass, none in place first."""
    return list(dict.fromkeys([_first(i) for i in range(count + 1)] + [_last(count, i) for i in range(count + 1)]))


def _cause(key: str, study: Study, pair: NodePair) -> str:
    owner, _, name = key.rpartition(".")
    if owner == pair.wires.id:
        return WIRES
    if owner != study.candidate.technology.id:
        return REFERENCE
    if "coefficient" in name:
        return "candidate coefficients"
    return _CAUSES.get(QUANTITIES[name].unit, OTHER)


def _changes(study: Study, before: NodePair, after: NodePair) -> dict[str, list[tuple[str, float, float]]]:
    """Return cause -> (key, value before, value after) of what differs between two pairs."""
    old, new = values_by_key(study, before), values_by_key(study, after)
    found: dict[str, list[tuple[str, float, float]]] = {}
    for key, value in old.items():
        other = new.get(key)
        if other is None and key.startswith(f"{before.wires.id}."):
            other = new.get(f"{after.wires.id}.{key.rpartition('.')[2]}")
        if other is not None and float(value.si[0]) != float(other.si[0]):
            cause = _cause(key, study, before)
            found.setdefault(cause, []).append((key, float(value.si[0]), float(other.si[0])))
    return dict(sorted(found.items()))


def _worth(
    study: Study, pair: NodePair, policy: str, groups: Sequence[Sequence[tuple[str, float, float]]]
) -> dict[int, float]:
    """Return ln(advantage) of every combination of groups needed; nan where a side has no permitted point."""
    wanted = combinations(len(groups))
    rows = np.asarray(wanted)
    columns = {
        key: np.where(rows >> position & 1, after, before)
        for position, group in enumerate(groups)
        for key, before, after in group
    }
    advantage = Comparison(study, pair, Batch(len(wanted), columns)).outcome(policy).advantage
    usable = np.isfinite(advantage) & (advantage > 0.0)
    found = np.full(len(wanted), np.nan)
    found[usable] = np.log(advantage[usable])
    return dict(zip(wanted, map(float, found), strict=True))


def node_steps(study: Study, policy: str, nodes: Sequence[NodeResult]) -> list[NodeStep]:
    """Split every step between neighbouring nodes that both have an advantage."""
    steps = []
    for before, after, low, high in zip(study.pairs, study.pairs[1:], nodes, nodes[1:], strict=False):
        ends = low.advantage, high.advantage
        if not all(math.isfinite(end) and end > 0.0 for end in ends):
            steps.append(NodeStep(before.label, after.label, math.nan, {}, "one of the nodes has no advantage"))
            continue
        total = math.log(ends[1] / ends[0])
        changes = _changes(study, before, after)
        worth = _worth(study, before, policy, list(changes.values())) if changes else {0: 0.0}
        if not all(map(math.isfinite, worth.values())):
            why = "with some of the values carried over, a side has no permitted point"
            steps.append(NodeStep(before.label, after.label, total, {}, why))
            continue
        parts = dict(zip(changes, attribution(worth, len(changes)), strict=True))
        parts[CONTENDERS if set(before.reference) != set(after.reference) else REST] = total - math.fsum(parts.values())
        steps.append(NodeStep(before.label, after.label, total, parts, ""))
    return steps
