"""One block of draws: evaluated, and summed up so that the draws themselves need not be kept (layer 7).

Both sides are re-optimised in every draw, with the choices that are frozen in silicon kept. Sums are over the draws of
the block; blocks are added in their order, whoever evaluated them.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchmark.decide.compare import Comparison, Outcome
from benchmark.decide.moves import permitted_advantage
from benchmark.decide.strongest import strongest_outcome
from benchmark.draws.bases import DEGREE, hermite, legendre
from benchmark.draws.plan import Plan
from benchmark.draws.values import draw_values
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.search import SideRun
from benchmark.evaluate.side import joints_by_owner, values_by_key
from benchmark.sets.study import Choice, NodePair, Study

__all__ = ["BIN", "CURVE_BIN", "BlockSum", "DrawTask", "basis_of", "drawn", "resolution", "sum_block"]

Array = NDArray[np.float64]
Counts = NDArray[np.int64]
#: width of a bin of ln(advantage)
BIN = 0.005
#: bins on each side of 1; beyond exp(40) all is one bin
FINE_BINS = 8000
#: width of a bin of ln(energy) and ln(time) on a curve, and bins on each side
CURVE_BIN, CURVE_BINS = 0.02, 400
#: blocks whose draws make the bands of the curves: 16 384 draws place a tenth to a share of 0.003, and every point of
#: every curve is a good part of the work
CURVE_BLOCKS = 16
#: supplies of the grid and relative step of the search in a draw
SUPPLIES, STEP = 17, 1.0e-3


@dataclass(frozen=True)
class DrawTask:
    """What to draw: a study at one node pair under one policy, some values put elsewhere instead of being drawn."""

    study: Study
    pair: NodePair
    policy: str
    frozen: Mapping[str, Choice]
    plan: Plan
    put: Mapping[str, float] = dataclasses.field(default_factory=dict)


@dataclass(frozen=True)
class BlockSum:
    """Counts and sums over draws.

    ``histogram``: draws by ln(advantage), bins of width ``BIN`` around 0. ``moments``: key -> sums of ln(advantage)
    times the basis functions of the key, over draws with an advantage. ``unbounded``: draws in which the candidate
    costs nothing. ``curves``: side -> counts of ln(value / value of the best estimate), (energy or time, supply, bin of
    width ``CURVE_BIN``), of the draws in which the point can be evaluated; from the first ``CURVE_BLOCKS`` blocks.
    """

    draws: int
    reaching: int
    above_one: int
    without_candidate: int
    without_contender: int
    unbounded: int
    log_sum: float
    log_square: float
    histogram: Counts
    strongest: Counts
    moments: Mapping[str, Array]
    curves: Mapping[str, Counts]
    smallest: float
    largest: float

    @property
    def defined(self) -> int:
        """Draws that have a finite advantage."""
        return self.draws - self.without_candidate - self.without_contender - self.unbounded

    def __add__(self, other: BlockSum) -> BlockSum:
        return BlockSum(
            self.draws + other.draws,
            self.reaching + other.reaching,
            self.above_one + other.above_one,
            self.without_candidate + other.without_candidate,
            self.without_contender + other.without_contender,
            self.unbounded + other.unbounded,
            self.log_sum + other.log_sum,
            self.log_square + other.log_square,
            self.histogram + other.histogram,
            self.strongest + other.strongest,
            {key: self.moments[key] + other.moments[key] for key in self.moments},
            _joined(self.curves, other.curves),
            min(self.smallest, other.smallest),
            max(self.largest, other.largest),
        )


def _joined(one: Mapping[str, Counts], other: Mapping[str, Counts]) -> Mapping[str, Counts]:
    """Add up counts; a block that counted nothing adds nothing."""
    return {side: counts + other[side] for side, counts in one.items()} if one and other else one or other


def resolution(study: Study) -> Study:
    """Return the study with the resolution of the search in a draw: the metric is found to about 1e-3."""
    return dataclasses.replace(study, supply_points=SUPPLIES, refine_relative=STEP)


def _batch(task: DrawTask, block: int) -> tuple[Batch, dict[str, Array]]:
    """Return the draws of a block after the best estimate, and their points in (0, 1)."""
    values = values_by_key(task.study, task.pair)
    joints = joints_by_owner(task.study, task.pair)
    points, drawn = draw_values(values, task.plan, block, tuple(task.put), joints)
    size = task.plan.block_size + 1
    columns = {key: np.concatenate([values[key].si[:1], column]) for key, column in drawn.items()}
    columns |= {key: np.concatenate([values[key].si[:1], np.full(size - 1, si)]) for key, si in task.put.items()}
    return Batch(size, columns), points


def drawn(task: DrawTask, block: int) -> tuple[Comparison, Outcome, dict[str, Array]]:
    """Evaluate the draws of a block: comparison, outcome (row 0 is the best estimate), key -> points in (0, 1)."""
    batch, points = _batch(task, block)
    comparison = Comparison(resolution(task.study), task.pair, batch, frozen=task.frozen)
    return comparison, strongest_outcome(comparison, task.policy), points


def sum_block(task: DrawTask, block: int) -> BlockSum:
    """Evaluate one block of draws and sum it up."""
    comparison, outcome, points = drawn(task, block)
    advantage = permitted_advantage(comparison, outcome)[1:]
    shapes = {key: value.spread.shape for key, value in values_by_key(task.study, task.pair).items() if value.spread}
    # without a candidate nobody looks for its strongest contender
    rivals = (outcome.strongest[1:] >= 0) | ~outcome.candidate.found[1:]
    missing = np.isnan(advantage)
    # a candidate that costs nothing reaches every advantage, which has no logarithm
    defined = np.isfinite(advantage) & (advantage > 0.0)
    log = np.log(advantage[defined])
    return BlockSum(
        draws=advantage.size,
        reaching=int(np.count_nonzero(advantage >= task.study.required_advantage)),
        above_one=int(np.count_nonzero(advantage > 1.0)),
        without_candidate=int(np.count_nonzero(missing & rivals)),
        without_contender=int(np.count_nonzero(missing & ~rivals)),
        unbounded=int(np.count_nonzero(~missing & ~defined)),
        log_sum=float(log.sum()),
        log_square=float((log**2).sum()),
        histogram=_counted(log, BIN, FINE_BINS),
        strongest=np.bincount(outcome.strongest[1:][defined], minlength=len(outcome.contenders)).astype(np.int64),
        moments={key: _moments(shapes[key], u[defined], log) for key, u in points.items()},
        curves={
            side: _curve(comparison, run, task.frozen[comparison.key(run)])
            for side, run in {"candidate": comparison.candidate, **comparison.contenders}.items()
            if block < CURVE_BLOCKS
        },
        smallest=float(advantage[defined].min()) if defined.any() else np.inf,
        largest=float(advantage[defined].max()) if defined.any() else -np.inf,
    )


def _counted(log: Array, width: float, reach: int) -> Counts:
    """Count logarithms in bins around 0; the outermost bins hold all that lies beyond."""
    place = np.clip(np.rint(log / width).astype(int), -reach, reach) + reach
    return np.bincount(place, minlength=2 * reach + 1).astype(np.int64)


def _curve(comparison: Comparison, run: SideRun, choice: Choice) -> Counts:
    """Count energy and time at every supply of the grid against the best estimate."""
    grid = run.grid(choice)
    able = comparison.widen(run, np.asarray(grid.able, dtype=np.float64))[1:] > 0.0
    # a declared supply that is drawn moves through the grid: such columns are no points of a curve
    fixed = np.all(grid.supply == grid.supply[:1], axis=0)
    counts = np.zeros((2, grid.supply.shape[1], 2 * CURVE_BINS + 1), dtype=np.int64)
    for position, quantity in enumerate((grid.energy, grid.time)):
        wide = comparison.widen(run, quantity)
        for column in np.flatnonzero(fixed & grid.able[0]):
            values = wide[1:, column][able[:, column] & (wide[1:, column] > 0.0)]
            counts[position, column] = _counted(np.log(values / wide[0, column]), CURVE_BIN, CURVE_BINS)
    return counts


def basis_of(shape: str, u: Array) -> Array:
    """Return the basis functions (k, draw) that suit the shape of a spread."""
    return hermite(u) if shape in ("normal", "lognormal") else legendre(u)


def _moments(shape: str, u: Array, log: Array) -> Array:
    return np.asarray(basis_of(shape, u) @ log) if u.size else np.zeros(DEGREE + 1)
