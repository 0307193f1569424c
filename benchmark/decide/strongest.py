"""Candidate against the strongest contender in every row, with little work on the others (layer 7).

In each row the contenders are known better step by step, and only as far as it takes to tell which is the strongest:

    0  the least of a few supplies, whatever is permitted   its metric is at least this one over ``BETWEEN``
    1  refined, without the functional floor                its metric is at least this one, the floor can only raise it
    2  held to the functional floor                         its metric

The contender with the lowest bound goes one step further, until the one with the lowest bound is at step 2. The result
is that of ``Comparison.outcome``, but for the contenders that are not the strongest: of them only a bound is known. The
bounds hold where the policy makes small what the study compares; elsewhere all contenders are evaluated in full.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from benchmark.decide.compare import Comparison, Outcome, SideOutcome
from benchmark.decide.policies import PRESCRIBED, PolicyInputs, floor_only_raises, hold_to_floor, optimum, roughly
from benchmark.evaluate.search import Optimum, SideRun, nowhere, put_rows, take_rows

__all__ = ["BETWEEN", "strongest_outcome"]

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]
#: factor by which the cost at the best supply is trusted not to lie below the least at every fourth supply of the grid
#: (in the worked study up to 2.1: there C V^2 moves by less than 1.8 between two of them)
BETWEEN = 4.0


class _Rival:
    """One contender, known row by row up to some step."""

    def __init__(self, comparison: Comparison, policy: str, run: SideRun, inputs: PolicyInputs) -> None:
        self.comparison, self.policy, self.run, self.inputs = comparison, policy, run, inputs
        self.choice = comparison.frozen[comparison.key(run)]
        rows = run.problem.batch.rows
        self.step = np.zeros(rows, dtype=int)
        self.best: Optimum | None = None
        if policy in PRESCRIBED:
            self._advance(np.arange(rows), 0)
            self.step += 1
            self._lowest = np.zeros(rows)
        else:
            least = roughly(policy, run, inputs, self.choice)
            # a few supplies without a value tell nothing
            self._lowest = np.where(np.isfinite(least), least / BETWEEN, 0.0)

    @property
    def bound(self) -> Array:
        """The metric is at least this, in every row of the whole batch; infinite without a permitted point."""
        lowest = self.comparison.widen(self.run, self._lowest)
        if self.best is None:
            return lowest
        side = self.comparison.widened(self.run, self.best)
        known = np.where(side.found & ~np.isnan(side.metric), side.metric, np.inf)
        return np.asarray(np.where(self.comparison.widen(self.run, self.step) == 0, lowest, known))

    def side(self) -> SideOutcome:
        """Return what is known; where the contender never came into question it has no permitted point."""
        if self.best is None:
            self.best = nowhere(self.run.subset(np.zeros(1, dtype=np.intp)), self.choice)
        return self.comparison.widened(self.run, self.best)

    @property
    def settled(self) -> Mask:
        """Rows of the whole batch in which the metric is known."""
        return np.asarray(self.comparison.widen(self.run, self.step) == 2)

    def advance(self, asked: Mask) -> None:
        """Go one step further in the rows of the whole batch asked for."""
        own = self.comparison.own_rows(self.run, asked)
        for step in (1, 0):
            rows = np.flatnonzero(own & (self.step == step))
            if rows.size:
                self._advance(rows, step)
                self.step[rows] = step + 1

    def _advance(self, rows: NDArray[np.intp], step: int) -> None:
        whole = rows.size == self.step.size
        run = self.run if whole else self.run.subset(rows)
        if self.best is None or step == 0:
            found = optimum(self.policy, run, self.inputs, self.choice, floor=False)
        else:
            without = self.best if whole else take_rows(self.best, rows)
            found = hold_to_floor(self.policy, run, self.inputs, self.choice, without)
        if whole:
            self.best = found
        else:
            self.best = put_rows(self.best or nowhere(self.run, self.choice), found, rows)


def strongest_outcome(comparison: Comparison, policy: str) -> Outcome:
    """Compare every row under one policy, with the frozen choices of the comparison.

    Parameters
    ----------
    comparison : Comparison
        With a frozen choice for every side.
    policy : str

    Returns
    -------
    Outcome
        Advantage and strongest contender of every row as from ``comparison.outcome(policy)``.
    """
    if not floor_only_raises(policy, comparison.study.policy.metric):
        return comparison.outcome(policy)
    inputs = comparison.policy_inputs()
    candidate = comparison.side_outcome(policy, comparison.candidate, inputs)
    rivals = [_Rival(comparison, policy, run, inputs) for run in comparison.contenders.values()]
    rows = np.arange(comparison.batch.rows)
    while True:
        bounds = np.stack([rival.bound for rival in rivals])
        lowest = np.argmin(bounds, axis=0)
        known = np.stack([rival.settled for rival in rivals])[lowest, rows]
        asked = np.isfinite(bounds[lowest, rows]) & ~known & candidate.found
        if not asked.any():
            sides = tuple(rival.side() for rival in rivals)
            return comparison.compared(policy, inputs, candidate, sides)
        for position, rival in enumerate(rivals):
            mine = asked & (lowest == position)
            if mine.any():
                rival.advance(mine)
