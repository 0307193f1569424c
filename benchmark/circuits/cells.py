"""Cells as series/parallel topologies of switches; everything else is found by walking the topology (layer 5).

A ``Cell`` has a pull-down network ``down`` between the output and ground and a pull-up network ``up`` between the
output and the supply. A switch of ``down`` is closed while its input is high, one of ``up`` while it is low; ``up``
must be the dual of ``down``, so that in every input state exactly one network conducts.

No table of efforts or parasitics is kept: series depth, switches per input, terminals at the output and at internal
nodes, and leakage by input state are derived here for any cell. Only the names ("nand3") are a list.

Conventions
-----------
Order
    The first part of a ``Series`` is the one at the output, the last one the one at the rail.
Sizing
    ``unit``: every switch is one unit wide. ``equal-drive``: a switch is as many units wide as the longest series
    path through it is long, so every path drives like one unit switch (exactly so for ohmic stacks).
Terminals
    Each switch end at the output is counted on its own. Inside a series stack the two switch ends that meet share one
    terminal (the wider of the two), as two transistors of a stack share one diffusion region. The same for every
    technology; one whose series switches cannot share a terminal is counted too low.
"""

from __future__ import annotations

import itertools
import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import lru_cache
from typing import Literal

from benchmark.errors import UsageError

__all__ = [
    "CELL_NAMES",
    "Cell",
    "Edge",
    "InternalNode",
    "Network",
    "Parallel",
    "Series",
    "Sizing",
    "Switched",
    "SwitchedOff",
    "cell",
    "dual",
    "inverter",
    "nand",
    "nor",
]

Sizing = Literal["unit", "equal-drive"]
Edge = Literal["down", "up"]

#: spellings ``cell`` understands
CELL_NAMES = "inverter, nand<n>, nor<n>, aoi<digits>, oai<digits>"


@dataclass(frozen=True)
class Switched:
    """One switch, controlled by the named input."""

    input: str


@dataclass(frozen=True)
class Series:
    """Parts in series, from the output towards the rail."""

    parts: tuple[Network, ...]


@dataclass(frozen=True)
class Parallel:
    """Parts side by side."""

    parts: tuple[Network, ...]


Network = Switched | Series | Parallel


def dual(network: Network) -> Network:
    """Exchange series and parallel."""
    if isinstance(network, Switched):
        return network
    parts = tuple(dual(part) for part in network.parts)
    return Parallel(parts) if isinstance(network, Series) else Series(parts)


def _inputs(network: Network) -> frozenset[str]:
    if isinstance(network, Switched):
        return frozenset({network.input})
    return frozenset().union(*(_inputs(part) for part in network.parts))


def conducts(network: Network, closed: frozenset[str]) -> bool:
    """Tell whether the network conducts when the switches of the inputs in ``closed`` are closed."""
    if isinstance(network, Switched):
        return network.input in closed
    states = (conducts(part, closed) for part in network.parts)
    return all(states) if isinstance(network, Series) else any(states)


def depth(network: Network) -> int:
    """Return the number of switches on the longest series path."""
    if isinstance(network, Switched):
        return 1
    depths = [depth(part) for part in network.parts]
    return sum(depths) if isinstance(network, Series) else max(depths)


@dataclass(frozen=True)
class _Placed:
    """A switch with its width in units."""

    input: str
    width: float


def _placed(network: Network, sizing: Sizing, others: int = 0) -> Iterator[_Placed]:
    """Yield every switch; ``others`` is the length of the longest series path outside ``network``."""
    if isinstance(network, Switched):
        yield _Placed(network.input, 1.0 if sizing == "unit" else float(others + 1))
    elif isinstance(network, Parallel):
        for part in network.parts:
            yield from _placed(part, sizing, others)
    else:
        whole = depth(network)
        for part in network.parts:
            yield from _placed(part, sizing, others + whole - depth(part))


def _paths(network: Network, sizing: Sizing, others: int = 0) -> list[tuple[float, ...]]:
    """Return every conducting path as the widths of its switches."""
    if isinstance(network, Switched):
        return [(1.0 if sizing == "unit" else float(others + 1),)]
    if isinstance(network, Parallel):
        return [path for part in network.parts for path in _paths(part, sizing, others)]
    whole = depth(network)
    choices = [_paths(part, sizing, others + whole - depth(part)) for part in network.parts]
    return [sum(choice, ()) for choice in itertools.product(*choices)]


def _end_width(network: Network, sizing: Sizing, others: int, end: Literal[0, -1]) -> float:
    """Return the summed width of the switch ends at one end of the network (0: output side, -1: rail side)."""
    if isinstance(network, Switched):
        return 1.0 if sizing == "unit" else float(others + 1)
    if isinstance(network, Parallel):
        return sum(_end_width(part, sizing, others, end) for part in network.parts)
    part = network.parts[end]
    return _end_width(part, sizing, others + depth(network) - depth(part), end)


@dataclass(frozen=True)
class InternalNode:
    """A node inside a series stack.

    ``width``: units of terminal at the node [1]. ``share``: part of the path resistance between the node and the
    rail [1], the Elmore weight of its charge when this network conducts.
    """

    width: float
    share: float


def _internal(network: Network, sizing: Sizing, others: int, below: int, total: int) -> Iterator[InternalNode]:
    if isinstance(network, Switched):
        return
    if isinstance(network, Parallel):
        for part in network.parts:
            yield from _internal(part, sizing, others, below, total)
        return
    whole = depth(network)
    under = below + whole
    for index, part in enumerate(network.parts):
        outside = others + whole - depth(part)
        under -= depth(part)
        yield from _internal(part, sizing, outside, under, total)
        if index + 1 < len(network.parts):
            lower = network.parts[index + 1]
            above_width = _end_width(part, sizing, outside, -1)
            below_width = _end_width(lower, sizing, others + whole - depth(lower), 0)
            yield InternalNode(max(above_width, below_width), under / total)


@dataclass(frozen=True)
class SwitchedOff:
    """Leakage of an open network: conductances in series or in parallel, resolved later with real stacks.

    ``branches``: parallel branches, each a tuple of series members; a member is a width (one open switch) or again
    a ``SwitchedOff``. Closed switches are short circuits and have been removed.
    """

    branches: tuple[tuple[float | SwitchedOff, ...], ...]


def _open(network: Network, closed: frozenset[str], sizing: Sizing, others: int = 0) -> SwitchedOff:
    """Reduce a network that does not conduct in this state to its open switches."""
    if isinstance(network, Switched):
        return SwitchedOff((((1.0 if sizing == "unit" else float(others + 1)),),))
    if isinstance(network, Parallel):
        return SwitchedOff(sum((_open(part, closed, sizing, others).branches for part in network.parts), ()))
    whole = depth(network)
    members: list[float | SwitchedOff] = []
    for part in network.parts:
        if conducts(part, closed):
            continue
        inner = _open(part, closed, sizing, others + whole - depth(part))
        if len(inner.branches) == 1:  # a plain stack inside a stack lengthens the stack
            members.extend(inner.branches[0])
        else:
            members.append(inner)
    return SwitchedOff((tuple(members),))


@dataclass(frozen=True)
class Cell:
    """A complementary cell; see the module docstring.

    ``complements``: pairs of inputs that carry a signal and its complement; states in which both are alike do not
    occur, so they neither count in the mean leakage nor need exactly one conducting network.

    Raises
    ------
    UsageError
        If ``up`` is not the dual of ``down`` or the inputs differ from those of the networks.
    """

    name: str
    inputs: tuple[str, ...]
    down: Network
    up: Network
    complements: tuple[tuple[str, str], ...] = ()

    def __post_init__(self) -> None:
        if set(self.inputs) != _inputs(self.down) or set(self.inputs) != _inputs(self.up):
            message = f"cell {self.name!r}: inputs {self.inputs} are not the inputs of its networks"
            raise UsageError(message)
        paired = [name for pair in self.complements for name in pair]
        if len(set(paired)) != len(paired) or not set(paired) <= set(self.inputs):
            message = f"cell {self.name!r}: complements {self.complements} are not pairs of different inputs"
            raise UsageError(message)
        for high in self.states():
            low = frozenset(self.inputs) - high
            if conducts(self.down, high) == conducts(self.up, low):
                message = (
                    f"cell {self.name!r}: the pull-up network is not the dual of the pull-down network "
                    f"(with {sorted(high)} high both or neither of them conduct)"
                )
                raise UsageError(message)

    def states(self) -> Iterator[frozenset[str]]:
        """Yield all input states, each as the set of inputs that are high: 2^n of n independent inputs."""
        follows = {second: first for first, second in self.complements}
        free = [name for name in self.inputs if name not in follows]
        for flags in itertools.product((False, True), repeat=len(free)):
            high = {name for name, flag in zip(free, flags, strict=True) if flag}
            yield frozenset(high | {second for second, first in follows.items() if first not in high})

    def network(self, edge: Edge) -> Network:
        """Return the network that drives the edge: ``down`` for the falling output, ``up`` for the rising one."""
        return self.down if edge == "down" else self.up

    def output(self, values: Mapping[str, bool]) -> bool:
        """Return the logic value of the output."""
        return not conducts(self.down, frozenset(name for name in self.inputs if values[name]))

    @property
    def switch_count(self) -> int:
        """Return the number of switches in both networks."""
        return len(self.widths("down", "unit")) + len(self.widths("up", "unit"))

    def depth(self, edge: Edge) -> int:
        """Return the number of switches on the longest series path of the edge."""
        return depth(self.network(edge))

    def paths(self, edge: Edge, sizing: Sizing) -> frozenset[tuple[int, float]]:
        """Return the distinct conducting paths as (number of switches k, sum of 1/width) [1]."""
        return _cell_paths(self, edge, sizing)

    def input_widths(self, name: str, sizing: Sizing) -> Mapping[Edge, tuple[float, ...]]:
        """Return the widths [units] of the switches on one input, by network."""
        return _cell_input_widths(self, name, sizing)

    def widths(self, edge: Edge, sizing: Sizing) -> tuple[float, ...]:
        """Return the widths [units] of all switches of one network."""
        return tuple(placed.width for placed in _placed(self.network(edge), sizing))

    def output_width(self, edge: Edge, sizing: Sizing) -> float:
        """Return the units of terminal that one network puts on the output."""
        return _end_width(self.network(edge), sizing, 0, 0)

    def internal_nodes(self, edge: Edge, sizing: Sizing) -> tuple[InternalNode, ...]:
        """Return the internal nodes of one network."""
        network = self.network(edge)
        return tuple(_internal(network, sizing, 0, 0, depth(network)))

    def open_networks(self, sizing: Sizing) -> tuple[tuple[Edge, SwitchedOff], ...]:
        """Return for each input state which network is open, and its open switches."""
        return _cell_open(self, sizing)


@lru_cache(maxsize=1024)
def _cell_paths(which: Cell, edge: Edge, sizing: Sizing) -> frozenset[tuple[int, float]]:
    paths = _paths(which.network(edge), sizing)
    return frozenset((len(path), sum(1.0 / width for width in path)) for path in paths)


@lru_cache(maxsize=1024)
def _cell_input_widths(which: Cell, name: str, sizing: Sizing) -> Mapping[Edge, tuple[float, ...]]:
    if name not in which.inputs:
        message = f"cell {which.name!r} has no input {name!r}; it has {', '.join(which.inputs)}"
        raise UsageError(message)
    edges: tuple[Edge, Edge] = ("down", "up")
    return {edge: tuple(p.width for p in _placed(which.network(edge), sizing) if p.input == name) for edge in edges}


@lru_cache(maxsize=1024)
def _cell_open(which: Cell, sizing: Sizing) -> tuple[tuple[Edge, SwitchedOff], ...]:
    found: list[tuple[Edge, SwitchedOff]] = []
    for high in which.states():
        low = frozenset(which.inputs) - high
        if conducts(which.down, high):
            found.append(("up", _open(which.up, low, sizing)))
        else:
            found.append(("down", _open(which.down, high, sizing)))
    return tuple(found)


def _letters(count: int) -> tuple[str, ...]:
    if not 1 <= count <= 8:
        message = f"a cell has 1 to 8 inputs, not {count}"
        raise UsageError(message)
    return tuple("abcdefgh"[:count])


def _narrow_end_first(network: Network) -> Network:
    """Order every series stack so that the part with the fewest switch ends stands at the output, as layouts do."""
    if isinstance(network, Switched):
        return network
    parts = tuple(_narrow_end_first(part) for part in network.parts)
    if isinstance(network, Parallel):
        return Parallel(parts)
    return Series(tuple(sorted(parts, key=lambda part: _end_width(part, "unit", 0, 0))))


def _complementary(name: str, inputs: tuple[str, ...], down: Network) -> Cell:
    return Cell(name, inputs, _narrow_end_first(down), _narrow_end_first(dual(down)))


def inverter() -> Cell:
    """Return the inverter (input ``a``)."""
    return _complementary("inverter", ("a",), Switched("a"))


def nand(inputs: int) -> Cell:
    """Return the NAND of n inputs a, b, ...; ``a`` is the switch at the output."""
    names = _letters(inputs)
    if inputs == 1:
        return inverter()
    return _complementary(f"nand{inputs}", names, Series(tuple(Switched(x) for x in names)))


def nor(inputs: int) -> Cell:
    """Return the NOR of n inputs a, b, ...; ``a`` is the pull-up switch at the output."""
    names = _letters(inputs)
    if inputs == 1:
        return inverter()
    return _complementary(f"nor{inputs}", names, Parallel(tuple(Switched(x) for x in names)))


def _groups(name: str, digits: str, outer: type[Series] | type[Parallel]) -> Cell:
    sizes = [int(digit) for digit in digits]
    letters = iter(_letters(sum(sizes)))
    inner: type[Series] | type[Parallel] = Parallel if outer is Series else Series
    parts: list[Network] = []
    for size in sizes:
        switches = tuple(Switched(next(letters)) for _ in range(size))
        parts.append(switches[0] if size == 1 else inner(switches))
    return _complementary(name, _letters(sum(sizes)), outer(tuple(parts)))


@lru_cache(maxsize=256)
def cell(name: str) -> Cell:
    """Return a cell by name: ``inverter``, ``nand3``, ``nor2``, ``aoi21`` (a.b + c inverted), ``oai22`` ...

    Raises
    ------
    UsageError
        If the name is none of ``CELL_NAMES``.
    """
    if name == "inverter":
        return inverter()
    found = re.fullmatch(r"(nand|nor)([2-8])|(aoi|oai)([1-4]{2,4})", name)
    if found is None:
        message = f"no cell {name!r}; known are {CELL_NAMES}"
        raise UsageError(message)
    if found[1] is not None:
        return (nand if found[1] == "nand" else nor)(int(found[2]))
    return _groups(name, found[4], Parallel if found[3] == "aoi" else Series)
