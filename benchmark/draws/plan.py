"""How many draws, in how many independent scrambles, from which seed (layer 3).

The draws come in blocks. A block is one scrambled Sobol net per owner of values (a technology, a wires set, the study,
the overheads of a side), with its points in an order of its own. Blocks are independent of each other, so the scatter
of a result between blocks is its sampling error, and they can be evaluated anywhere in any order.

The random state of a net follows from the seed, the owner's name and the number of the block alone: adding a
technology, reordering anything or sharing the blocks among workers changes no number.
"""

from __future__ import annotations

import hashlib
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchmark.sets.study import draws_allowed

__all__ = ["LARGEST_BLOCK", "LEAST_BLOCKS", "Plan", "net", "plan_of"]

Array = NDArray[np.float64]
#: draws of a block at most: memory does not grow with the number of draws
LARGEST_BLOCK = 1024
#: independent scrambles that an error is taken from, at least
LEAST_BLOCKS = 8
#: bits of a coordinate of a net
BITS = 30


@dataclass(frozen=True)
class Plan:
    """``blocks`` independent scrambled nets of ``block_size`` (a power of two) draws each."""

    blocks: int
    block_size: int
    seed: int

    @property
    def draws(self) -> int:
        """Draws in all."""
        return self.blocks * self.block_size


def plan_of(draws: int, seed: int = 0) -> Plan:
    """Return the plan of a number of draws.

    Parameters
    ----------
    draws : int
        A power of two, at least 16.
    seed : int
        Not negative.

    Raises
    ------
    ValueError
        When the number is not a power of two (nets have that many points), too small, or the seed negative.
    """
    if allowed := draws_allowed(draws):
        message = f"draws must be {allowed}; found {draws}"
        raise ValueError(message)
    if seed < 0:
        message = f"the seed must not be negative, found {seed}"
        raise ValueError(message)
    size = min(draws // LEAST_BLOCKS, LARGEST_BLOCK)
    return Plan(draws // size, size, seed)


def net(owner: str, dimension: int, plan: Plan, block: int) -> Array:
    """Return the points (draw, value) in (0, 1) of one owner's values in one block.

    Parameters
    ----------
    owner : str
        Whose values: the part of a ledger key before the name.
    dimension : int
        Number of values drawn.
    plan : Plan
    block : int
        Number of the block.

    Notes
    -----
    Sobol points, scrambled by a random linear matrix and a digital shift (scipy.stats.qmc.Sobol), each moved to the
    middle of its cell of 2^-30. The order of the points is shuffled, because nets of different owners share their
    generating sequence and would otherwise be tied to each other point by point.
    """
    from scipy.stats import qmc

    digest = hashlib.sha256(owner.encode()).digest()
    words = [int.from_bytes(digest[i : i + 4], "big") for i in range(0, 32, 4)]
    state = np.random.default_rng(np.random.SeedSequence([plan.seed, block, *words]))
    sobol = qmc.Sobol(dimension, scramble=True, bits=BITS, rng=state)
    points = sobol.random_base2(plan.block_size.bit_length() - 1)
    centred = (np.floor(points * 2.0**BITS) + 0.5) / 2.0**BITS
    return np.asarray(centred[state.permutation(plan.block_size)])
