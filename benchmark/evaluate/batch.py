"""A batch: many parameter vectors at once (layer 6). Row 0 is always the best estimate.

A value is addressed by its ledger key, ``owner.name``: the owner is a technology id, a wires id, ``study``,
``candidate.overhead`` and the like. A technology that plays both sides has one key, hence one value in every row.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from benchmark.sets.formulas import evaluate_formula, names_in
from benchmark.sets.values import Value

__all__ = ["Batch", "resolve"]

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Batch:
    """``rows`` parameter vectors; ``columns`` holds only the values that differ from the best estimate.

    ``origin``: for a part of a larger batch, the row of the larger batch that each row came from.
    """

    rows: int
    columns: Mapping[str, NDArray[np.float64]]
    origin: NDArray[np.intp] = field(default_factory=lambda: np.zeros(0, dtype=np.intp))

    def __post_init__(self) -> None:
        """Number the rows of a whole batch."""
        if self.origin.size != self.rows:
            object.__setattr__(self, "origin", np.arange(self.rows))

    def own(self, array: NDArray[np.float64]) -> NDArray[np.float64]:
        """Pick this batch's rows from an array over the rows of the whole batch (or of one row for all)."""
        return array if array.shape[0] == 1 else array[self.origin]

    @classmethod
    def best_estimate(cls) -> Batch:
        """One row, nothing moved."""
        return cls(1, {})

    @classmethod
    def one_at_a_time(cls, moves: Iterable[tuple[str, float, float]]) -> Batch:
        """Row 0 best estimate, then one row for each (key, best, moved) with that value alone moved."""
        listed = list(moves)
        rows = 1 + len(listed)
        columns: dict[str, NDArray[np.float64]] = {}
        for row, (key, best, moved) in enumerate(listed, start=1):
            column = columns.setdefault(key, np.full(rows, best))
            column[row] = moved
        return cls(rows, columns)

    def take(self, rows: NDArray[np.intp]) -> Batch:
        """Return the batch of some rows, in the order given."""
        return Batch(len(rows), {key: column[rows] for key, column in self.columns.items()}, self.origin[rows])

    def distinct(self, concerns: Callable[[str], bool]) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
        """Return the rows that differ in a key which ``concerns`` accepts, and for every row its place among them.

        Of equal rows the first stands for all; row 0 comes first.
        """
        columns = [column for key, column in self.columns.items() if concerns(key)]
        if not columns:
            return np.zeros(1, dtype=np.intp), np.zeros(self.rows, dtype=np.intp)
        _, first, place = np.unique(np.stack(columns, axis=1), axis=0, return_index=True, return_inverse=True)
        order = np.argsort(first)
        rank = np.empty_like(order)
        rank[order] = np.arange(order.size)
        return first[order], rank[place.reshape(-1)]


def resolve(
    owner: str, values: Mapping[str, Value], batch: Batch, outer: Mapping[str, Value] | None = None
) -> dict[str, Array]:
    """Return the values of one owner as arrays of shape (row or 1, 1, 1).

    A derived value follows the values its formula names, in the rows in which they are moved and it is not moved
    itself: it is multiplied by the factor by which its formula moves. ``outer``: values of the study that formulas of
    an overhead may name.
    """
    links = _Links(owner, values, batch, outer or {})
    return {name: links.array(name) for name in values}


class _Links:
    """Values of one owner with those of the study behind them, and what follows from what."""

    def __init__(self, owner: str, values: Mapping[str, Value], batch: Batch, outer: Mapping[str, Value]) -> None:
        self.values = {**outer, **values}
        self.keys = {name: f"{owner if name in values else 'study'}.{name}" for name in self.values}
        self.batch = batch
        self._arrays: dict[str, Array] = {}

    def array(self, name: str) -> Array:
        """The value in every row (row or 1, 1, 1)."""
        if name not in self._arrays:
            self._arrays[name] = self._made(name)
        return self._arrays[name]

    def _made(self, name: str) -> Array:
        value = self.values[name]
        stated = np.asarray(value.si[:1], dtype=np.float64).reshape(1, 1, 1)
        column = self.batch.columns.get(self.keys[name])
        if column is None:
            return self._linked(value, stated)
        own = column.reshape(-1, 1, 1)
        return np.where(own == stated, self._linked(value, stated), own) if value.formula else own

    def _linked(self, value: Value, stated: Array) -> Array:
        """The value as its formula moves it."""
        used = names_in(value.formula) & self.values.keys() if value.formula else frozenset()
        moved = {other: self.array(other) for other in sorted(used)}
        still = {other: self.values[other].si[:1].reshape(1, 1, 1) for other in moved}
        if all(np.array_equal(moved[other], still[other]) for other in moved):
            return stated
        before, after = evaluate_formula(value.formula, still), evaluate_formula(value.formula, moved)
        if np.any(before == 0.0):
            return np.asarray(after)
        # where nothing is moved the factor is 1 to the bit, so the row stays that of the files
        return np.asarray(stated * (after / before))
