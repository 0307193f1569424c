"""Activity of a netlist from input patterns, 64 of them in one machine word (layer 5).

Up to ``EXHAUSTIVE`` inputs every input state is taken once: exact for independent uniform inputs, also where signals
reconverge. Beyond, ``SAMPLED`` patterns of a fixed sequence: every input word is a 64-bit mix of its own number
(splitmix64; Steele, Lea and Flood, OOPSLA 2014, from memory), so there is no random state and every run gives the same
numbers. Standard error of a share of highs 0.5 / sqrt(SAMPLED) = 0.002. Hazards are not counted.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import Final

import numpy as np
from numpy.typing import NDArray

from benchmark.circuits.cells import Network, Series, Switched
from benchmark.circuits.netlist import Netlist, ordered

__all__ = ["EXHAUSTIVE", "SAMPLED", "activity", "high_shares", "patterns", "simulate"]

Words = NDArray[np.uint64]

EXHAUSTIVE: Final = 16
SAMPLED: Final = 2**16
_WORD: Final = 64
#: patterns of the six fastest inputs inside one word
_FAST: Final = (
    0xAAAAAAAAAAAAAAAA,
    0xCCCCCCCCCCCCCCCC,
    0xF0F0F0F0F0F0F0F0,
    0xFF00FF00FF00FF00,
    0xFFFF0000FFFF0000,
    0xFFFFFFFF00000000,
)


def _mixed(numbers: Words) -> Words:
    """Return the splitmix64 output of each number; products wrap around."""
    z = numbers * np.uint64(0x9E3779B97F4A7C15)
    z = (z ^ (z >> np.uint64(30))) * np.uint64(0xBF58476D1CE4E5B9)
    z = (z ^ (z >> np.uint64(27))) * np.uint64(0x94D049BB133111EB)
    return np.asarray(z ^ (z >> np.uint64(31)))


def patterns(names: Sequence[str]) -> dict[str, Words]:
    """Return a word array per input: every state equally often, or the fixed sample."""
    count = len(names)
    if count > EXHAUSTIVE:
        words = SAMPLED // _WORD
        index = np.arange(1, count * words + 1, dtype=np.uint64).reshape(count, words)
        return dict(zip(names, _mixed(index), strict=True))
    words = max(1, 2**count // _WORD)
    place = np.arange(words, dtype=np.uint64)
    found = {}
    for k, name in enumerate(names):
        if k < len(_FAST):
            found[name] = np.full(words, _FAST[k], dtype=np.uint64)
        else:
            bit = (place >> np.uint64(k - len(_FAST))) & np.uint64(1)
            found[name] = np.where(bit == 1, np.uint64(2**64 - 1), np.uint64(0))
    return found


def _conducts(network: Network, closed: Mapping[str, Words]) -> Words:
    if isinstance(network, Switched):
        return closed[network.input]
    found = _conducts(network.parts[0], closed)
    for part in network.parts[1:]:
        other = _conducts(part, closed)
        found = found & other if isinstance(network, Series) else found | other
    return found


def simulate(netlist: Netlist, inputs: Mapping[str, Words]) -> dict[str, Words]:
    """Return the values of all nets of a netlist without feedback."""
    values = dict(inputs)
    for gate in ordered(netlist):
        pins = dict(zip(gate.which.inputs, (values[net] for net in gate.inputs), strict=True))
        values[gate.output] = ~_conducts(gate.which.down, pins)
    return values


def high_shares(netlist: Netlist) -> dict[str, float]:
    """Return the share of patterns in which each net is high."""
    values = simulate(netlist, patterns(netlist.inputs))
    return {net: float(np.bitwise_count(words).sum()) / (words.size * _WORD) for net, words in values.items()}


def activity(netlist: Netlist) -> dict[str, float]:
    """Return a01 = p (1 - p) of every net for independent uniform vectors, no hazards.

    Weste & Harris, CMOS VLSI Design, 5.2.1 (from memory).
    """
    return {net: p * (1.0 - p) for net, p in high_shares(netlist).items()}
