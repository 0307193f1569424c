"""The change between two states of a study, split by what was changed (layer 7).

Every combination of old and new inputs is evaluated with both sides re-optimised; each changed input is given its
Shapley value, the mean of its effect over all orders in which the changes can be put in place:

    part_i = sum over S without i of |S|! (n - |S| - 1)! / n! (v(S and i) - v(S))

so the parts add up to the total, equal roles get equal parts, what has no effect gets 0, and the way back has the
opposite parts. v is the logarithm of a ratio, or an energy or time itself. Shapley, A value for n-person games (1953),
from memory.

What values do not carry over (another question, circuit, option, table, range of the search) is one more change: the
combinations are then evaluated in the old and in the new study.
"""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchmark.circuits.library import BUILT_IN
from benchmark.decide.compare import Comparison
from benchmark.evaluate.batch import Batch, resolve
from benchmark.evaluate.side import values_by_key
from benchmark.sets.study import Study
from benchmark.sets.values import Value

__all__ = ["MOST_CHANGES", "REST", "ROUNDING", "Attribution", "Change", "attribute", "changed_values", "shapley"]

Array = NDArray[np.float64]
#: changes that are told apart one by one; beyond, they are grouped by owner
MOST_CHANGES = 12
#: what values alone do not carry over
REST = "not carried by values"
#: digits of derived values that the file rounds
ROUNDING = "rounding of derived values"
#: derived values within this of their formula follow it; up to the second they are rounded in the file
FOLLOWS, ROUNDED = 1.0e-12, 1.0e-3
#: a smaller difference of ln(advantage) between the two ways to the new state is rounding
SAME_STATE = 1.0e-9
#: combinations evaluated at once
CHUNK = 1024
#: what is split: name, unit
_QUANTITIES = (
    ("advantage", "1"),
    ("candidate energy", "J"),
    ("candidate time", "s"),
    ("reference energy", "J"),
    ("reference time", "s"),
)


@dataclass(frozen=True)
class Change:
    """A value that differs between two studies at their headline pairs, in SI."""

    key: str
    before: float
    after: float


@dataclass(frozen=True)
class Attribution:
    """One quantity and the parts of its change.

    ``scale``: logarithm (parts are of ln(after / before)) or additive (parts are of after - before, in ``unit``). No
    parts where ``note`` says why.
    """

    quantity: str
    scale: str
    unit: str
    before: float
    after: float
    total: float
    parts: Mapping[str, float]
    note: str


@dataclass(frozen=True)
class _Player:
    """Changes that are put in place together. ``derived``: of values that otherwise follow their formula."""

    name: str
    stated: tuple[Change, ...]
    derived: tuple[Change, ...] = ()


def shapley(worth: Array, count: int) -> Array:
    """Return the Shapley value of ``count`` changes.

    Parameters
    ----------
    worth : array (2**count, ...)
        Value of every combination; bit i of the index tells whether change i is in place.
    count : int

    Returns
    -------
    array (count, ...)
        Their sum is ``worth[-1] - worth[0]``.
    """
    masks = np.arange(1 << count)
    size = np.array([int(mask).bit_count() for mask in masks])
    weight = np.array([math.factorial(k) * math.factorial(count - k - 1) for k in range(count)], dtype=np.float64)
    weight /= math.factorial(count)
    parts = np.zeros((count, *worth.shape[1:]))
    for i in range(count):
        without = masks[(masks >> i & 1) == 0]
        parts[i] = np.tensordot(weight[size[without]], worth[without | 1 << i] - worth[without], axes=1)
    return parts


def _shaping(study: Study) -> set[str]:
    """Names of whole numbers that shape the netlist: another number is another circuit, so no value of a row."""
    names = {study.circuit_of(side)[0] for side in study.sides}
    return {name for circuit in names if circuit in BUILT_IN for name in BUILT_IN[circuit].whole}


def changed_values(old: Study, new: Study) -> list[Change]:
    """Return every value that both studies state differently at their headline pairs."""
    before, after = _values(old), _values(new)
    shaping = _shaping(old) | _shaping(new)
    found = []
    for key, value in before.items():
        ends = float(value.si[0]), float(after[key].si[0]) if key in after else math.nan
        if key in after and value.name not in shaping and ends[0] != ends[1]:
            found.append(Change(key, *ends))
    return found


def _values(study: Study) -> dict[str, Value]:
    return values_by_key(study, study.pair(study.headline))


def attribute(old: Study, new: Study, *, most: int = MOST_CHANGES) -> list[Attribution]:
    """Split the change of the headline numbers from ``old`` to ``new`` by cause.

    Parameters
    ----------
    old, new : Study
    most : int
        Changes told apart one by one; more are grouped by the owner of the value (technology, wires, study).

    Returns
    -------
    list of Attribution
        Logarithm of advantage, energy and time under the primary policy, then energy and time themselves.
    """
    players = _players(old, new, most)
    count = len(players)
    worth = _worth(old, players, 0)
    names = [player.name for player in players]
    if not _same(worth[-1], _worth(new, players, (1 << count) - 1, only_best=True)[0]):
        worth = np.concatenate([worth, _worth(new, players, (1 << count) - 1)])
        names, count = [*names, REST], count + 1
    return _split(worth, names)


def _same(one: Array, other: Array) -> bool:
    with np.errstate(divide="ignore", invalid="ignore"):
        return bool(np.all((np.abs(np.log(one / other)) <= SAME_STATE) | (np.isnan(one) & np.isnan(other))))


def _players(old: Study, new: Study, most: int) -> list[_Player]:
    """Return what is put in place together: each change alone, or by owner when there are too many."""
    listed = changed_values(old, new)
    values = _values(old)
    stated = [change for change in listed if not values[change.key].formula]
    derived = _own_parts(old, stated, [change for change in listed if values[change.key].formula])
    rounded = tuple(change for change, factor in derived if abs(factor - 1.0) <= ROUNDED)
    own = [change for change, factor in derived if abs(factor - 1.0) > ROUNDED]
    players = [_Player(change.key, (change,)) for change in stated]
    players += [_Player(change.key, (), (change,)) for change in own]
    if rounded:
        players.append(_Player(ROUNDING, (), rounded))
    if len(players) <= most:
        return players
    owners: dict[str, list[_Player]] = {}
    for player in players:
        owners.setdefault(player.name.split(".")[0], []).append(player)
    grouped = [
        _Player(
            f"{name} ({len(members)} values)" if name != ROUNDING else name,
            tuple(change for member in members for change in member.stated),
            tuple(change for member in members for change in member.derived),
        )
        for name, members in owners.items()
    ]
    while len(grouped) > most:  # the last owners go together
        *grouped, one, two = grouped
        grouped.append(_Player(f"{one.name} and {two.name}", one.stated + two.stated, one.derived + two.derived))
    return grouped


def _own_parts(study: Study, stated: Sequence[Change], derived: Sequence[Change]) -> list[tuple[Change, float]]:
    """Return the derived values that do not merely follow the changed ones, with the factor beyond their formula."""
    columns = {change.key: np.array([change.before, change.after]) for change in stated}
    found = []
    for change in derived:
        followed = float(_followed(study, change.key, Batch(2, columns))[1])
        factor = change.after / followed if followed != 0.0 else math.inf
        if abs(factor - 1.0) > FOLLOWS:
            found.append((change, factor))
    return found


def _followed(study: Study, key: str, batch: Batch) -> Array:
    """Return a value in every row of a batch, as its formula moves it."""
    owner, _, name = key.rpartition(".")
    values = {other.rpartition(".")[2]: v for other, v in _values(study).items() if other.rpartition(".")[0] == owner}
    outer = study.values if owner.endswith((".overhead", ".gating", ".mitigation")) else None
    array = resolve(owner, values, batch, outer)[name].reshape(-1)
    return np.broadcast_to(array, (batch.rows,)).copy()


def _worth(study: Study, players: Sequence[_Player], best: int, *, only_best: bool = False) -> Array:
    """Return every quantity (combination, quantity); ``best`` is the combination that is the study itself."""
    masks = np.arange(1 << len(players))
    order = np.concatenate([[best], masks[masks != best]])[: 1 if only_best else None]
    found = np.full((masks.size if not only_best else 1, len(_QUANTITIES)), np.nan)
    for start in range(0, order.size, CHUNK):
        rows = order[start : start + CHUNK]
        led = rows if rows[0] == best else np.concatenate([[best], rows])  # the first row is the study itself
        got = _evaluated(study, players, best, led)[led.size - rows.size :]
        found[0 if only_best else rows] = got
    return found


def _evaluated(study: Study, players: Sequence[_Player], best: int, masks: NDArray[np.intp]) -> Array:
    outcome = Comparison(study, study.pair(study.headline), Batch(masks.size, _columns(study, players, best, masks)))
    found = outcome.outcome(study.policy.primary)
    rows = np.arange(masks.size)
    strongest = found.strongest
    energy = np.stack([side.energy for side in found.contenders])[strongest, rows]
    time = np.stack([side.time for side in found.contenders])[strongest, rows]
    columns = [
        np.where(found.candidate.found, found.candidate.energy, np.nan),
        np.where(found.candidate.found, found.candidate.time, np.nan),
        np.where(strongest >= 0, energy, np.nan),
        np.where(strongest >= 0, time, np.nan),
    ]
    return np.stack([found.advantage, *columns], axis=1)


def _columns(study: Study, players: Sequence[_Player], best: int, masks: NDArray[np.intp]) -> dict[str, Array]:
    """Return the values of every combination: old where its player is not in place, new where it is."""
    placed = [(masks >> position & 1).astype(bool) for position in range(len(players))]
    columns = {
        change.key: np.where(inside, change.after, change.before)
        for player, inside in zip(players, placed, strict=True)
        for change in player.stated
    }
    other = {change.key: _opposite(change, best) for player in players for change in player.stated}
    for player, inside in zip(players, placed, strict=True):
        for change in player.derived:
            stated = float(_values(study)[change.key].si[0])
            away = change.before if best else change.after
            # the factor beyond the formula, found where all that it follows is moved
            end = _followed(study, change.key, Batch(2, {key: np.array(pair) for key, pair in other.items()}))[1]
            followed = _followed(study, change.key, Batch(masks.size, columns))
            moved = inside != bool(best)
            factored = np.where(followed == end, away, followed * (away / end)) if end else np.full(masks.size, away)
            columns[change.key] = np.where(moved, factored, np.where(followed == stated, stated, followed))
    return columns


def _opposite(change: Change, best: int) -> tuple[float, float]:
    return (change.after, change.before) if best else (change.before, change.after)


def _split(worth: Array, names: Sequence[str]) -> list[Attribution]:
    found = [
        _one(quantity, "logarithm", "1", worth[:, column], names) for column, (quantity, _) in enumerate(_QUANTITIES)
    ]
    return found + [
        _one(quantity, "additive", unit, worth[:, column], names)
        for column, (quantity, unit) in enumerate(_QUANTITIES)
        if unit != "1"
    ]


def _one(quantity: str, scale: str, unit: str, worth: Array, names: Sequence[str]) -> Attribution:
    before, after = float(worth[0]), float(worth[-1])
    usable = np.isfinite(worth) & ((worth > 0.0) | (scale == "additive"))
    missing = [end for end, ok in (("before", usable[0]), ("after", usable[-1])) if not ok]
    note = f"{quantity} is not stated {' and '.join(missing)} the change" if missing else ""
    if not note and not usable.all():
        mask = int(np.flatnonzero(~usable)[np.argmin([int(m).bit_count() for m in np.flatnonzero(~usable)])])
        held = ", ".join(name for position, name in enumerate(names) if mask >> position & 1)
        note = f"with only {held} changed, a side has no permitted point, so the change cannot be split"
    if note:
        return Attribution(quantity, scale, unit, before, after, math.nan, {}, note)
    taken = np.log(worth) if scale == "logarithm" else worth
    parts = shapley(taken, len(names))
    return Attribution(
        quantity,
        scale,
        unit,
        before,
        after,
        float(taken[-1] - taken[0]),
        dict(zip(names, map(float, parts), strict=True)),
        "",
    )
