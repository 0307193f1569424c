"""Candidate against the strongest contender in every row, with little work on the others (layer 7).

In each row the contenders are known better step by step, and only as far as it takes to tell which is the strongest:

    0  the best supply of the grid            its metric is at least ``metric / REFINING``
    1  refined, without the functional floor  its metric is at least this one, for the floor can only raise it
    2  held to the functional floor           its metric

The contender with the lowest bound goes one step further, until the one with the lowest bound is at step 2. The result
is that of ``Comparison.outcome``, but for the contenders that are not the strongest: of them only a bound is known. The
bounds hold where the policy makes small what the study compares; elsewhere all contenders are evaluated in full.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from benchmark.decide.compare import Comparison, Outcome
from benchmark.decide.policies import PolicyInputs, floor_only_raises, hold_to_floor, optimum, roughly
from benchmark.evaluate.search import Optimum, SideRun, put_rows, take_rows

__all__ = ["REFINING", "strongest_outcome"]

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]
#: factor that refining the supply is trusted not to exceed: between two points of a grid of 16 steps the energy of a
#: switch changes by less, unless the optimum sits on a limit that the grid steps over (then step 0 found nothing there)
REFINING = 2.0


class _Rival:
    """One contender, known row by row up to some step."""

    def __init__(self, comparison: Comparison, policy: str, run: SideRun, inputs: PolicyInputs) -> None:
        self.comparison, self.policy, self.run, self.inputs = comparison, policy, run, inputs
        self.choice = comparison.frozen[comparison.key(run)]
        self.best: Optimum = roughly(policy, run, inputs, self.choice)
        self.step = np.zeros(self.best.found.shape, dtype=int)

    @property
    def bound(self) -> Array:
        """The metric is at least this, in every row of the whole batch; infinite without a permitted point."""
        side = self.comparison.widened(self.run, self.best)
        step = self.comparison.widen(self.run, self.step)
        bound = np.where(step == 0, side.metric / REFINING, side.metric)
        # a grid without a permitted point tells nothing
        return np.asarray(np.where(side.found & ~np.isnan(side.metric), bound, np.where(step == 0, 0.0, np.inf)))

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
        if step == 0:
            found = optimum(self.policy, run, self.inputs, self.choice, floor=False)
        else:
            found = hold_to_floor(
                self.policy, run, self.inputs, self.choice, self.best if whole else take_rows(self.best, rows)
            )
        self.best = found if whole else put_rows(self.best, found, rows)


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
            sides = tuple(comparison.widened(rival.run, rival.best) for rival in rivals)
            return comparison.compared(policy, inputs, candidate, sides)
        for position, rival in enumerate(rivals):
            mine = asked & (lowest == position)
            if mine.any():
                rival.advance(mine)
