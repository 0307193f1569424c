"""The answer under the stated ranges: probabilities with sampling errors, shares, values of information (layer 7).

The net benefit is ln(advantage / M): what is gained by going when it is positive, lost when it is negative; stopping
gives 0. Its unit is a factor of e in the advantage. With mu its mean over the draws:

    value of perfect information   E[max(0, NB)] - max(0, mu)
    ... of one input               E_i[max(0, E[NB | x_i])] - max(0, mu)

E[NB | x_i] comes from an expansion in orthonormal functions of the drawn value (``draws/bases.py``); its squared
coefficients over the variance are the first-order share of the input. Draws without a permitted point have no net
benefit: shares and values are of the draws that have one, and the share of those is stated.

Values of contenders that are the strongest in no draw have no effect, exactly.

Raiffa and Schlaifer, Applied Statistical Decision Theory (1961), and Howard, IEEE Trans. SSC 2, 22 (1966) for the value
of information; Sobol', Math. Comput. Simul. 55, 271 (2001) for variance shares: from memory. Errors are from leaving
out groups of independently scrambled blocks (jackknife).
"""

from __future__ import annotations

import contextlib
import functools
import itertools
import operator
from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchmark.decide.draw_block import BIN, CURVE_BIN, BlockSum, DrawTask, basis_of, sum_block
from benchmark.draws.bases import QUADRATURE
from benchmark.evaluate.side import values_by_key

__all__ = ["CONSTANT", "Estimate", "InputShare", "Uncertainty", "draw_blocks", "summarise", "uncertainty", "unseen"]

Array = NDArray[np.float64]
#: quantiles of the advantage that are stated
QUANTILES = (0.05, 0.10, 0.25, 0.50, 0.75, 0.90, 0.95)
#: shares at which the whole distribution is stated
SHARES = tuple(i / 100.0 for i in range(1, 100))
#: groups of blocks that are left out in turn
MOST_GROUPS = 16
#: terms of an expansion within so many sampling errors of 0 are left out
CLEAR = 3.0
#: draws from which on an expansion goes to the next degree: every term adds noise
DEGREES = (0, 512, 2048, 8192, 32768)
#: spread of ln(advantage), largest less smallest, below which the advantage counts as constant
CONSTANT = 1.0e-6
#: told the share done
Told = Callable[[float], None]


@dataclass(frozen=True)
class Estimate:
    """A number with its sampling error (one standard deviation)."""

    value: float
    error: float


def unseen(draws: int) -> float:
    """Return the largest probability, at 95 %, of what happened in none of ``draws`` independent draws: 3/n.

    Rule of three: Hanley and Lippman-Hand, JAMA 249, 1743 (1983), from memory. Where all draws agree there is no
    scatter to take an error from.
    """
    return 3.0 / draws


@dataclass(frozen=True)
class InputShare:
    """What one drawn input carries.

    ``share``: first-order share of the variance of ln(advantage) [1]. ``worth``: value of knowing it perfectly, in
    ln(advantage). ``coefficients``: of E[ln(advantage) | value] in the basis that suits ``shape``, without the mean.
    """

    key: str
    shape: str
    share: Estimate
    worth: Estimate
    coefficients: Array


@dataclass(frozen=True)
class Uncertainty:
    """Result of a set of draws.

    ``reaches``: probability that the advantage is at least M; ``above_one``: that it exceeds 1. Draws in which the
    candidate has no permitted point count as neither. ``distribution``: share of the draws -> advantage that it
    does not exceed, nan where draws without an advantage lie. ``bands``: side -> quantity -> (supply, [low, high])
    factors of the best estimate that hold 80 % of the draws.
    """

    draws: int
    blocks: int
    seed: int
    inputs: int
    reaches: Estimate
    above_one: Estimate
    without_candidate: float
    without_contender: float
    unbounded: float
    quantiles: Mapping[float, Estimate]
    distribution: Mapping[float, float]
    mean_log: Estimate
    sd_log: Estimate
    worth_of_all: Estimate
    shares: tuple[InputShare, ...]
    strongest: Mapping[str, float]
    bands: Mapping[str, Mapping[str, Array]]
    smallest: float
    largest: float

    @property
    def constant(self) -> bool:
        """Tell whether no drawn input moves the advantage by as much as ``CONSTANT`` of it."""
        return _same(self.smallest, self.largest)


def _same(smallest: float, largest: float) -> bool:
    """Tell whether two ends of the advantage are one within ``CONSTANT``; no draw with an advantage is no constant."""
    return smallest <= largest and float(np.log(largest / smallest)) < CONSTANT


def uncertainty(task: DrawTask, jobs: int = 1, told: Told = lambda share: None) -> Uncertainty:
    """Draw, evaluate and sum up.

    Parameters
    ----------
    task : DrawTask
    jobs : int
        Processes; the result is the same to the last bit whatever their number.
    told : callable
        Told the share done [1].
    """
    blocks = _counted(draw_blocks(task, jobs), task.plan.blocks, told)
    sizes = [group.size for group in np.array_split(np.arange(task.plan.blocks), min(task.plan.blocks, MOST_GROUPS))]
    # added up as they come, so that memory does not grow with the draws
    return summarise(task, [functools.reduce(operator.add, itertools.islice(blocks, size)) for size in sizes])


def _counted(blocks: Iterable[BlockSum], count: int, told: Told) -> Iterator[BlockSum]:
    for done, block in enumerate(blocks, start=1):
        told(done / count)
        yield block


def draw_blocks(task: DrawTask, jobs: int = 1) -> Iterable[BlockSum]:
    """Yield the sums of all blocks in their order, from this process or from several."""
    numbers = range(task.plan.blocks)
    work = functools.partial(sum_block, task)
    if jobs <= 1:
        yield from map(work, numbers)
        return
    from concurrent.futures import ProcessPoolExecutor
    from multiprocessing import get_context

    # a fresh interpreter: threads of the numeric libraries do not survive a fork
    with ProcessPoolExecutor(min(jobs, task.plan.blocks), mp_context=get_context("spawn")) as pool:
        with _interrupts_left_to_us():
            results = pool.map(work, numbers)
        try:
            yield from results
        except BaseException:
            pool.shutdown(cancel_futures=True)
            raise


@contextlib.contextmanager
def _interrupts_left_to_us() -> Iterator[None]:
    """Processes started here ignore interrupts from the keyboard; the one that hands out the work answers them."""
    import signal
    import threading

    if threading.current_thread() is not threading.main_thread():
        yield
        return
    before = signal.signal(signal.SIGINT, signal.SIG_IGN)
    try:
        yield
    finally:
        signal.signal(signal.SIGINT, before)


def summarise(task: DrawTask, groups: Sequence[BlockSum]) -> Uncertainty:
    """Turn sums of blocks into probabilities, shares and values; leaving out a group in turn gives the errors."""
    total = functools.reduce(operator.add, groups)
    without = [functools.reduce(operator.add, [*groups[:i], *groups[i + 1 :]]) for i in range(len(groups))]

    def estimate(function: Callable[[BlockSum], float]) -> Estimate:
        return _jackknife(function, total, without)

    values = values_by_key(task.study, task.pair)
    shapes = {key: values[key].spread.shape for key in total.moments}  # type: ignore[union-attr]
    log_required = float(np.log(task.study.required_advantage))
    bases = {shape: basis_of(shape, QUADRATURE) for shape in {*shapes.values()}}
    contenders = [side.id for side in task.study.contenders if side.id in task.pair.reference]
    idle = _idle_owners(task, total)
    degree = sum(total.draws >= least for least in DEGREES)
    shares = []
    for key, shape in shapes.items():
        if key.startswith(idle):
            shares.append(InputShare(key, shape, Estimate(0.0, 0.0), Estimate(0.0, 0.0), np.zeros(degree)))
            continue
        noise = _noise(key, degree, without)
        kept = _coefficients(total, key, degree) ** 2 > CLEAR**2 * noise
        share = estimate(functools.partial(_share, key=key, kept=kept))
        basis = bases[shape][1 : degree + 1]
        worth = estimate(functools.partial(_worth, key=key, kept=kept, basis=basis, required=log_required))
        variance = _variance(total)
        by_noise = float(noise[kept].sum()) / variance if variance > 0.0 else 0.0
        coefficients = np.where(kept, _coefficients(total, key, degree), 0.0)
        shares.append(InputShare(key, shape, Estimate(share.value - by_noise, share.error), worth, coefficients))
    return Uncertainty(
        draws=total.draws,
        blocks=task.plan.blocks,
        seed=task.plan.seed,
        inputs=len(shapes),
        reaches=estimate(lambda block: block.reaching / block.draws),
        above_one=estimate(lambda block: block.above_one / block.draws),
        without_candidate=total.without_candidate / total.draws,
        without_contender=total.without_contender / total.draws,
        unbounded=total.unbounded / total.draws,
        quantiles={q: estimate(functools.partial(_quantile, q=q)) for q in QUANTILES},
        distribution={q: _quantile(total, q=q) for q in SHARES},
        mean_log=estimate(_mean),
        sd_log=estimate(lambda block: float(np.sqrt(_variance(block)))),
        worth_of_all=estimate(functools.partial(_worth_of_all, required=log_required)),
        shares=tuple(sorted(shares, key=lambda item: (-item.share.value, item.key))),
        strongest=dict(zip(contenders, (total.strongest / max(total.defined, 1)).tolist(), strict=True)),
        bands={side: _bands(counts) for side, counts in total.curves.items()},
        smallest=total.smallest,
        largest=total.largest,
    )


def _idle_owners(task: DrawTask, total: BlockSum) -> tuple[str, ...]:
    """Return the beginnings of keys that belong to contenders which are the strongest in no draw."""
    present = [side for side in task.study.contenders if side.id in task.pair.reference]
    busy = [side for side, count in zip(present, total.strongest, strict=True) if count]
    used = {task.study.candidate.technology.id, *(side.technology.id for side in busy)}
    idle = [side for side in present if side not in busy]
    return tuple(f"contender {side.id}." for side in idle) + tuple(
        f"{side.technology.id}." for side in idle if side.technology.id not in used
    )


def _jackknife(function: Callable[[BlockSum], float], total: BlockSum, without: Sequence[BlockSum]) -> Estimate:
    parts = np.array([function(block) for block in without])
    n = parts.size
    error = float(np.sqrt((n - 1) / n * np.sum((parts - parts.mean()) ** 2)))
    return Estimate(float(function(total)), error)


def _mean(block: BlockSum) -> float:
    return block.log_sum / block.defined if block.defined else float("nan")


def _variance(block: BlockSum) -> float:
    if block.defined < 2 or _same(block.smallest, block.largest):
        return 0.0 if block.defined else float("nan")
    mean = _mean(block)
    return max(block.log_square - block.defined * mean**2, 0.0) / (block.defined - 1)


def _coefficients(block: BlockSum, key: str, degree: int) -> Array:
    """Coefficients of E[ln advantage | x_i], the mean apart."""
    return np.asarray(block.moments[key][1 : degree + 1] / max(block.defined, 1))


def _share(block: BlockSum, key: str, kept: NDArray[np.bool_]) -> float:
    variance = _variance(block)
    return float(np.sum(_coefficients(block, key, kept.size)[kept] ** 2) / variance) if variance > 0.0 else 0.0


def _noise(key: str, degree: int, without: Sequence[BlockSum]) -> Array:
    """Squared sampling errors of the coefficients."""
    parts = np.stack([_coefficients(block, key, degree) for block in without])
    n = parts.shape[0]
    return np.asarray((n - 1) / n * np.sum((parts - parts.mean(axis=0)) ** 2, axis=0))


def _settled(block: BlockSum, required: float) -> bool:
    """Tell whether no draw is on the other side of the required advantage: then nothing is worth knowing."""
    return bool(block.smallest >= np.exp(required) or block.largest <= np.exp(required))


def _worth(block: BlockSum, key: str, kept: NDArray[np.bool_], basis: Array, required: float) -> float:
    if _settled(block, required):
        return 0.0
    mean = _mean(block) - required
    # the points stand for the whole distribution: without this their own small mean would count as information
    coefficients = np.where(kept, _coefficients(block, key, kept.size), 0.0)
    conditional = mean + coefficients @ (basis - basis.mean(axis=1, keepdims=True))
    return max(float(np.maximum(conditional, 0.0).mean() - max(mean, 0.0)), 0.0)


def _worth_of_all(block: BlockSum, required: float) -> float:
    if _settled(block, required):  # the bins below would leave up to half of their width
        return 0.0
    reach = block.histogram.size // 2
    log = (np.arange(block.histogram.size) - reach) * BIN - required
    mean = _mean(block) - required
    return max(float(np.maximum(log, 0.0) @ block.histogram / max(block.defined, 1) - max(mean, 0.0)), 0.0)


def _quantile(block: BlockSum, q: float) -> float:
    """Quantile of the advantage over all draws; a draw without an advantage lies below all others."""
    count = q * block.draws - block.without_candidate - block.without_contender
    return float("nan") if count <= 0.0 else float(np.exp(_place(block.histogram, count, BIN)))


def _place(histogram: NDArray[np.int64], count: float, width: float) -> float:
    """Value below which ``count`` entries lie, straight inside its bin."""
    total = np.cumsum(histogram)
    place = int(np.searchsorted(total, count))
    if place >= histogram.size:
        return float("inf")
    before = float(total[place] - histogram[place])
    inside = (count - before) / float(histogram[place])
    return float((place - histogram.size // 2 - 0.5 + inside) * width)


def _bands(counts: NDArray[np.int64]) -> dict[str, Array]:
    """10 % and 90 % of each quantity at each supply, over the best estimate; nan where nothing was counted."""
    found = {}
    for position, quantity in enumerate(("energy", "time")):
        rows = np.full((counts.shape[1], 2), np.nan)
        for supply, histogram in enumerate(counts[position]):
            if n := int(histogram.sum()):
                rows[supply] = [np.exp(_place(histogram, q * n, CURVE_BIN)) for q in (0.1, 0.9)]
        found[quantity] = rows
    return found
