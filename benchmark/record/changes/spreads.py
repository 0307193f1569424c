"""How much of a change of probability is the moved best estimates, and how much the changed ranges (layer 8).

Four states are drawn with the same points: old and new best estimates, each with the old and with the new ranges. A
range goes with a moved best estimate as a factor where value and range lie on one side of zero (a percentage stays the
same percentage), else as a distance. The parts are the mean over both orders, so they add up to the change.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Mapping, Sequence
from typing import Any

import numpy as np

from benchmark.catalogue import QUANTITIES
from benchmark.decide.compare import Comparison
from benchmark.decide.draw_block import DrawTask
from benchmark.decide.uncertainty import uncertainty
from benchmark.draws.plan import plan_of
from benchmark.draws.values import DOMAINS, drawn_keys
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.side import values_by_key
from benchmark.sets.joints import Joint
from benchmark.sets.parameters import ParameterSet
from benchmark.sets.study import Side, Study
from benchmark.sets.values import Spread, Value

__all__ = ["probability_split", "with_spreads"]

Values = Mapping[str, Value]
STATED = (
    "ranges are carried to another best estimate as factors where value and range lie on one side of zero, else as "
    "distances; correlations go with their ranges"
)


class _OutsideDomainError(ValueError):
    """A carried range leaves the domain of its value."""


def probability_split(
    old: Study, new: Study, records: tuple[Mapping[str, Any], Mapping[str, Any]], jobs: int = 1
) -> dict[str, Any] | None:
    """Split the change of the probability of reaching the required advantage; None unless both records have draws.

    Returns
    -------
    dict
        ``old``, ``new``; ``moved``: new best estimates with the old ranges; ``narrowed``: old best estimates with the
        new ranges; each with ``value`` and sampling ``error``. ``part_moved`` and ``part_narrowed`` add up to the
        change. ``how``: draws, seed and rule in words; ``note`` instead of numbers where a range cannot be carried.
    """
    drawn = [record.get("uncertainty") for record in records]
    if drawn[0] is None or drawn[1] is None:
        return None
    number, seed = int(drawn[1]["draws"]), int(drawn[1]["seed"])
    how = f"{number} draws with seed {seed} in all four states; {STATED}"
    try:
        mixed = {"moved": with_spreads(new, old), "narrowed": with_spreads(old, new)}
    except _OutsideDomainError as error:
        return {"note": str(error), "how": how}
    found = {name: _reaches(study, number, seed, jobs) for name, study in mixed.items()}
    for name, study, row in (("old", old, drawn[0]), ("new", new, drawn[1])):
        same = (int(row["draws"]), int(row["seed"])) == (number, seed)
        found[name] = dict(row["reaches"]) if same else _reaches(study, number, seed, jobs)
    p = {name: row["value"] for name, row in found.items()}
    moved = 0.5 * (p["moved"] - p["old"] + p["new"] - p["narrowed"])
    narrowed = 0.5 * (p["narrowed"] - p["old"] + p["new"] - p["moved"])
    return {**found, "part_moved": moved, "part_narrowed": narrowed, "how": how, "note": ""}


def _reaches(study: Study, number: int, seed: int, jobs: int) -> dict[str, float]:
    pair = study.pair(study.headline)
    comparison = Comparison(study, pair, Batch.best_estimate())
    outcome = comparison.outcome(study.policy.primary)
    if not drawn_keys(values_by_key(study, pair)):
        reached = bool(outcome.advantage[0] >= study.required_advantage)
        return {"value": float(reached), "error": 0.0}
    frozen = comparison.frozen_choices(outcome)
    task = DrawTask(study, pair, study.policy.primary, frozen, plan_of(number, seed))
    return dict(vars(uncertainty(task, jobs).reaches))


def with_spreads(study: Study, donor: Study) -> Study:
    """Return a study with its own best estimates and the ranges of another study.

    Values that the donor does not have keep their range.
    """
    sets = {item.id: item for item in (*(side.technology for side in donor.sides), *donor.wires_sets)}

    def of_set(item: ParameterSet) -> ParameterSet:
        other = sets.get(item.id)
        if other is None or other.nodes != item.nodes:
            return item
        values = _carried(item.values, other.values)
        return dataclasses.replace(item, values=values, joints=_joints(other.joints, values))

    sides = {side.id: side for side in donor.contenders}
    values = _carried(study.values, donor.values)
    return dataclasses.replace(
        study,
        values=values,
        joints=_joints(donor.joints, values),
        candidate=_side(study.candidate, donor.candidate, of_set),
        contenders=tuple(_side(side, sides.get(side.id), of_set) for side in study.contenders),
        pairs=tuple(dataclasses.replace(pair, wires=of_set(pair.wires)) for pair in study.pairs),
    )


def _joints(joints: Sequence[Joint], values: Values) -> tuple[Joint, ...]:
    """Return the correlations whose values all have a range."""
    ranged = {name for name, value in values.items() if value.spread is not None}
    return tuple(joint for joint in joints if ranged.issuperset(joint.names))


def _side(side: Side, donor: Side | None, of_set: Callable[[ParameterSet], ParameterSet]) -> Side:
    technology = of_set(side.technology)
    if donor is None:
        return dataclasses.replace(side, technology=technology)
    return dataclasses.replace(
        side,
        technology=technology,
        overhead=_carried(side.overhead, donor.overhead),
        gating=_carried(side.gating, donor.gating),
        mitigation=_carried(side.mitigation, donor.mitigation),
    )


def _carried(values: Values, donors: Values) -> dict[str, Value]:
    return {name: _with_spread(value, donors[name]) if name in donors else value for name, value in values.items()}


def _with_spread(value: Value, donor: Value) -> Value:
    """Put the range of another best estimate around this one."""
    spread = donor.spread
    if spread is None:
        return dataclasses.replace(value, spread=None)
    if value.si.shape != donor.si.shape:
        # one number for all nodes on one side only: carried from node to node
        shape = np.broadcast_shapes(value.si.shape, donor.si.shape)
        value, donor = (dataclasses.replace(v, si=np.broadcast_to(v.si, shape)) for v in (value, donor))
    with np.errstate(divide="ignore", invalid="ignore"):
        factor = value.si / donor.si
    one_side = bool(np.all(spread.low * donor.si > 0.0) and np.all(spread.high * donor.si > 0.0) and np.all(factor > 0))
    if one_side:
        low, high = spread.low * factor, spread.high * factor
        scale = spread.scale if spread.scale is None or spread.shape == "lognormal" else spread.scale * factor
    else:
        moved = value.si - donor.si
        low, high, scale = spread.low + moved, spread.high + moved, spread.scale
    lowest, highest = DOMAINS.get(QUANTITIES[value.name].domain, (-np.inf, np.inf))
    if np.any(low < lowest) or np.any(high > highest):
        message = f"the other range of {value.name} around its best estimate would leave its domain"
        raise _OutsideDomainError(message)
    return dataclasses.replace(value, spread=Spread(spread.shape, low, high, scale))
