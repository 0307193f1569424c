"""Parallel-prefix carry networks of any width as graphs: which cell combines which groups (layer 5).

A cell at bit i and some level combines the group i..k with the group k-1..j that ends at its ``partner`` bit k-1. A
cell whose group reaches bit 0 ("gray") gives only a carry, the others a generate and a propagate signal. Bit 0 of the
graph is the carry input of an adder, bits 1.. are its operand bits.

serial
    Every carry from the one before: N - 1 cells and levels.
kogge-stone
    At each level every bit combines with the one 1, 2, 4 ... places below: N log2 N - N + 1 cells, log2 N levels.
    Kogge and Stone, IEEE Trans. Computers 22 (1973) 786 (from memory).
sklansky
    Blocks of 2, 4, 8 ...: the top of the lower half serves the whole upper half: (N/2) log2 N cells, log2 N levels.
    Sklansky, IRE Trans. Electronic Computers 9 (1960) 226 (from memory).
brent-kung
    A tree up and a tree down: 2 N - 2 - log2 N cells, 2 log2 N - 1 levels. Brent and Kung, IEEE Trans. Computers 31
    (1982) 260 (from memory).

Counts in closed form hold for powers of two; other widths leave out the cells beyond the last bit.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass
from functools import lru_cache
from typing import Final, Literal

from benchmark.errors import UsageError

__all__ = ["PREFIX_KINDS", "PrefixCell", "PrefixCounts", "PrefixGraph", "prefix_counts", "prefix_delay", "prefix_graph"]

PrefixKind = Literal["serial", "kogge-stone", "sklansky", "brent-kung"]
PREFIX_KINDS: Final[tuple[PrefixKind, ...]] = ("serial", "kogge-stone", "sklansky", "brent-kung")


@dataclass(frozen=True)
class PrefixCell:
    """A cell at ``bit`` that combines its group with the one of ``partner``; ``low`` is the lowest bit it reaches."""

    bit: int
    partner: int
    low: int


@dataclass(frozen=True)
class PrefixGraph:
    """Cells by level; inside a level none depends on another."""

    kind: str
    bits: int
    levels: tuple[tuple[PrefixCell, ...], ...]


@dataclass(frozen=True)
class PrefixCounts:
    """What a graph is made of.

    levels, cells, gray [1]
        Levels of cells, cells, and those among them that reach bit 0.
    fan_out [1]
        Largest number of places at the next level that one cell or input of a level serves: its cells, and its own
        bit, to which it is passed on.
    tracks [1]
        Most nets side by side between two neighbouring bits at one level; generate and propagate count as one.
    wire [bit pitches]
        Sum over the cells of the distance to their partner; generate and propagate count as one.
    """

    levels: int
    cells: int
    gray: int
    fan_out: int
    tracks: int
    wire: int


def _pairs(kind: str, bits: int) -> list[list[tuple[int, int]]]:
    """Return (bit, partner) of the cells of each level."""
    if kind == "serial":
        return [[(i, i - 1)] for i in range(1, bits)]
    spans = [2**k for k in range((bits - 1).bit_length())]
    if kind == "kogge-stone":
        return [[(i, i - span) for i in range(span, bits)] for span in spans]
    if kind == "sklansky":
        return [[(i, i // span * span - 1) for i in range(bits) if i // span % 2] for span in spans]
    if kind == "brent-kung":
        up = [[(i, i - span) for i in range(2 * span - 1, bits, 2 * span)] for span in spans]
        down = [[(i, i - span) for i in range(3 * span - 1, bits, 2 * span)] for span in reversed(spans)]
        return [level for level in (*up, *down) if level]
    message = f"no prefix network {kind!r}; known are {', '.join(PREFIX_KINDS)}"
    raise UsageError(message)


@lru_cache(maxsize=64)
def prefix_graph(kind: str, bits: int) -> PrefixGraph:
    """Return the graph of ``bits`` bits, one or more."""
    if bits < 1:
        message = f"a prefix network has at least one bit, not {bits}"
        raise UsageError(message)
    low = list(range(bits))
    levels = []
    for pairs in _pairs(kind, bits):
        cells = [PrefixCell(bit, partner, low[partner]) for bit, partner in pairs]
        for cell in cells:
            low[cell.bit] = cell.low
        levels.append(tuple(cells))
    return PrefixGraph(kind, bits, tuple(levels))


def prefix_counts(graph: PrefixGraph) -> PrefixCounts:
    """Count cells, fan-out, tracks and wire by walking the graph."""
    cells = [cell for level in graph.levels for cell in level]
    fan_out, tracks = 0, 0
    for level in graph.levels:
        served = Counter(cell.partner for cell in level)
        fan_out = max(fan_out, *(1 + number for number in served.values()))
        far = {partner: max(cell.bit for cell in level if cell.partner == partner) for partner in served}
        crossing = [sum(start < edge <= stop for start, stop in far.items()) for edge in range(1, graph.bits)]
        tracks = max(tracks, *crossing)
    return PrefixCounts(
        levels=len(graph.levels),
        cells=len(cells),
        gray=sum(cell.low == 0 for cell in cells),
        fan_out=fan_out,
        tracks=tracks,
        wire=sum(cell.bit - cell.partner for cell in cells),
    )


def prefix_delay(graph: PrefixGraph, setup: float, combine: float, last: float, *, as_drawn: bool = False) -> float:
    """Return the longest path of an adder whose cells have fixed delays.

    ``setup`` of the generate and propagate signals, ``combine`` of every cell, ``last`` of the sum; one unit of time.
    Found by walking the graph. ``as_drawn``: every level of the drawing counts, setup + levels x combine + last, the
    textbook form (Weste & Harris, CMOS VLSI Design, chapter 11, from memory). Only brent-kung differs, by one cell:
    the last cell of the tree up and the first of the tree down do not depend on each other.
    """
    if as_drawn:
        return setup + len(graph.levels) * combine + last
    ready = [setup] * graph.bits
    for level in graph.levels:
        later = {cell.bit: max(ready[cell.bit], ready[cell.partner]) + combine for cell in level}
        for bit, time in later.items():
            ready[bit] = time
    return max(ready) + last
