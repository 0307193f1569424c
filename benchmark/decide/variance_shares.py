"""First-order and total shares of the variance of ln(advantage), by the pick-freeze estimator (layer 7).

Two independent sets of draws A and B; for each input a third set that is A with this input's draws of B. scipy's
estimators (scipy.stats.sobol_indices: Saltelli et al., Comput. Phys. Commun. 181, 259 (2010)). It costs a set of draws
per input, so it is done for the inputs that matter most; a side is evaluated anew only where one of its own inputs
differs.
"""

from __future__ import annotations

from collections.abc import Sequence
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
#: parts of the draws from whose scatter the error is taken
GROUPS = 8


@dataclass(frozen=True)
class VarianceShare:
    """Shares of one input with their errors; ``total`` counts what it does together with others too."""

    key: str
    first: float
    first_error: float
    total: float
    total_error: float


def sobol_shares(keys: Sequence[str], a: Array, b: Array, mixed: Array) -> list[VarianceShare]:
    """Return the shares from values of a function at the three sets of draws.

    Parameters
    ----------
    keys : sequence of str
        Names of the inputs, in the order of ``mixed``.
    a, b : array (draw,)
        Values at A and B; a power of two of them, at least 16.
    mixed : array (input, draw)
        Values at A with one input from B.

    Raises
    ------
    ValueError
        When the output is constant (no variance to share) or a value is not finite.

    Notes
    -----
    Errors: scatter of the same estimate over ``GROUPS`` parts of the draws.
    """
    if not (np.isfinite(a).all() and np.isfinite(b).all() and np.isfinite(mixed).all()):
        message = "shares need a finite advantage in every draw"
        raise ValueError(message)
    if np.all(a == a[0]) and np.all(b == a[0]):
        message = "no drawn input moves the advantage"
        raise ValueError(message)
    whole = _indices(a, b, mixed)
    size = a.size // GROUPS
    parts = np.stack(
        [_indices(a[i : i + size], b[i : i + size], mixed[:, i : i + size]) for i in range(0, a.size, size)]
    )
    error = parts.std(axis=0, ddof=1) / np.sqrt(GROUPS)
    return [
        VarianceShare(key, *(float(x) for x in (whole[0, i], error[0, i], whole[1, i], error[1, i])))
        for i, key in enumerate(keys)
    ]


def _indices(a: Array, b: Array, mixed: Array) -> Array:
    """First-order and total shares, (2, input)."""
    from scipy.stats import sobol_indices

    mean = 0.5 * (a.mean() + b.mean())  # shares do not depend on it, their errors do
    twice = mixed if len(mixed) > 1 else np.repeat(mixed, 2, axis=0)  # the library takes two inputs or more
    sets = {"f_A": (a - mean)[None, :], "f_B": (b - mean)[None, :], "f_AB": (twice - mean)[:, None, :]}
    found = sobol_indices(func=sets, n=a.size)
    return np.stack([np.ravel(found.first_order), np.ravel(found.total_order)])[:, : len(mixed)]


def variance_shares(task: DrawTask, keys: Sequence[str], draws: int = 256) -> list[VarianceShare]:
    """Return first-order and total shares of some inputs of a study; all other inputs are drawn too.

    Raises
    ------
    ValueError
        As ``sobol_shares``.
    """
    values = values_by_key(task.study, task.pair)
    joints = joints_by_owner(task.study, task.pair)
    a, b = draw_twice(values, Plan(1, draws, task.plan.seed), tuple(task.put), joints)
    # values that are not independent change places together
    sets = [a, b, *({**a, **{tied: b[tied] for tied in tied_with(key, joints) if tied in b}} for key in keys)]
    columns = {key: np.concatenate([values[key].si[:1], *(item[key] for item in sets)]) for key in a}
    rows = 1 + draws * len(sets)
    columns |= {key: np.concatenate([values[key].si[:1], np.full(rows - 1, si)]) for key, si in task.put.items()}
    comparison = Comparison(resolution(task.study), task.pair, Batch(rows, columns), frozen=task.frozen)
    advantage = permitted_advantage(comparison, strongest_outcome(comparison, task.policy))[1:]
    with np.errstate(divide="ignore", invalid="ignore"):
        log = np.log(advantage).reshape(len(sets), draws)
    return sobol_shares(keys, log[0], log[1], log[2:])
