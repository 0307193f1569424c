"""First-order and total shares of the variance of ln(advantage), by the pick-freeze estimator (layer 7).

Two independent sets of draws A and B; for each input a third set that is A with this input's draws of B. With means
over the draws and the variance V of A and B together (Saltelli et al., Comput. Phys. Commun. 181, 259 (2010), with
Jansen's total; the estimators of scipy.stats.sobol_indices, which takes no other number than a power of two and so can
leave nothing out):

    first = mean(f_B (f_AB - f_A)) / V        total = mean((f_A - f_AB)^2) / (2 V)

The draws come in independently scrambled nets; leaving out one net in turn gives the errors (jackknife). Parts of one
net are no independent samples: their scatter is several times that of the whole.

It costs a set of draws per input, so it is done for the inputs that matter most; a side is evaluated anew only where
one of its own inputs differs. Inputs that are not independent of each other change places together and have one share.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchmark.decide.compare import Comparison
from benchmark.decide.draw_block import DrawTask, resolution
from benchmark.decide.moves import permitted_advantage
from benchmark.decide.strongest import strongest_outcome
from benchmark.draws.plan import Plan
from benchmark.draws.values import draw_twice, tied_with
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.side import joints_by_owner, values_by_key

__all__ = ["VarianceShare", "sobol_shares", "variance_shares"]

Array = NDArray[np.float64]
#: independently scrambled nets from which the error is taken
NETS = 8
#: draws with all three values that a share is taken from, at least
LEAST = 8


@dataclass(frozen=True)
class VarianceShare:
    """Shares of one input, and of all that is tied to it, with their errors.

    ``total`` counts what it does together with others too. ``left_out``: share of the draws without an advantage in one
    of the three sets; the shares are of the others.
    """

    key: str
    first: float
    first_error: float
    total: float
    total_error: float
    left_out: float = 0.0


def sobol_shares(keys: Sequence[str], a: Array, b: Array, mixed: Array) -> list[VarianceShare]:
    """Return the shares from values of a function at the three sets of draws.

    Parameters
    ----------
    keys : sequence of str
        Names of the inputs, in the order of ``mixed``.
    a, b : array (net, draw)
        Values at A and B. Draws in which one of the three is not finite are left out.
    mixed : array (input, net, draw)
        Values at A with one input from B.

    Raises
    ------
    ValueError
        When the output is constant (no variance to share), or fewer than ``LEAST`` draws have all three values.

    Notes
    -----
    Errors: jackknife over the nets; nan with one net alone.
    """
    if np.all(a == a.flat[0]) and np.all(b == a.flat[0]):
        message = "no drawn input moves the advantage"
        raise ValueError(message)
    return [_shares(key, a, b, one) for key, one in zip(keys, mixed, strict=True)]


def _shares(key: str, a: Array, b: Array, mixed: Array) -> VarianceShare:
    used = np.isfinite(a) & np.isfinite(b) & np.isfinite(mixed)
    if used.sum() < LEAST:
        message = f"{key}: fewer than {LEAST} draws have an advantage in all three sets"
        raise ValueError(message)
    nets = range(len(a))
    parts = [(a[i][used[i]], b[i][used[i]], mixed[i][used[i]]) for i in nets]
    first, total = _indices(parts)
    error = np.full(2, np.nan)
    if len(parts) > 1:
        without = np.array([_indices([*parts[:i], *parts[i + 1 :]]) for i in nets])
        error = np.sqrt((len(parts) - 1) * without.var(axis=0))
    return VarianceShare(key, first, float(error[0]), total, float(error[1]), float(1.0 - used.mean()))


def _indices(parts: Sequence[tuple[Array, Array, Array]]) -> tuple[float, float]:
    """First-order and total share from all nets together."""
    a, b, mixed = (np.concatenate(column) for column in zip(*parts, strict=True))
    both = np.concatenate([a, b])
    mean, variance = both.mean(), both.var()  # shares do not depend on the mean, their errors do
    first = np.mean((b - mean) * (mixed - a))
    return float(first / variance), float(0.5 * np.mean((a - mixed) ** 2) / variance)


def variance_shares(task: DrawTask, keys: Sequence[str], draws: int = 256) -> list[VarianceShare]:
    """Return first-order and total shares of some inputs of a study; all other inputs are drawn too.

    Parameters
    ----------
    task : DrawTask
    keys : sequence of str
    draws : int
        In all ``NETS`` nets together; a power of two, at least 16.

    Raises
    ------
    ValueError
        As ``sobol_shares``.
    """
    values = values_by_key(task.study, task.pair)
    joints = joints_by_owner(task.study, task.pair)
    plan = Plan(NETS, draws // NETS, task.plan.seed)
    a, b = (
        _joined(half)
        for half in zip(*(draw_twice(values, plan, tuple(task.put), joints, net) for net in range(NETS)), strict=True)
    )
    # values that are not independent change places together
    sets = [a, b, *({**a, **{tied: b[tied] for tied in tied_with(key, joints) if tied in b}} for key in keys)]
    columns = {key: np.concatenate([values[key].si[:1], *(item[key] for item in sets)]) for key in a}
    rows = 1 + draws * len(sets)
    columns |= {key: np.concatenate([values[key].si[:1], np.full(rows - 1, si)]) for key, si in task.put.items()}
    comparison = Comparison(resolution(task.study), task.pair, Batch(rows, columns), frozen=task.frozen)
    advantage = permitted_advantage(comparison, strongest_outcome(comparison, task.policy))[1:]
    with np.errstate(divide="ignore", invalid="ignore"):
        log = np.log(advantage).reshape(len(sets), NETS, draws // NETS)
    return sobol_shares(keys, log[0], log[1], log[2:])


def _joined(nets: Sequence[Mapping[str, Array]]) -> dict[str, Array]:
    return {key: np.concatenate([net[key] for net in nets]) for key in nets[0]}
