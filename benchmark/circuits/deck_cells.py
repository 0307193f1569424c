"""Switches and cells as sub-circuits of a deck (layer 5)."""

from __future__ import annotations

import itertools
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import Final, Literal

from benchmark.circuits.cells import Cell, Edge, Network, Parallel, Sizing, Switched, depth
from benchmark.circuits.sized import EDGES
from benchmark.devices.netlist.parts import SubCircuits, number
from benchmark.errors import UsageError

__all__ = ["SWITCH_NAMES", "Capacitances", "cell_lines", "inner_levels", "side_inputs", "switch_lines"]

Capacitances = Literal["delay", "energy", "device"]

SWITCH_NAMES: Final[Mapping[Edge, str]] = {"down": "pull_down", "up": "pull_up"}
_RAIL: Final[Mapping[Edge, str]] = {"down": "0", "up": "vdd"}


def switch_lines(texts: SubCircuits, capacitances: Capacitances) -> list[str]:
    """Return the sub-circuits of both switches.

    Raises
    ------
    UsageError
        If the charges of the device are asked for and the model has none.
    """
    lines = []
    for edge in EDGES:
        text = texts.of(edge)
        body = text.charged if capacitances == "device" else text.driven
        if body is None:
            message = "this model knows no charges of the device beyond constants; use the capacitances delay or energy"
            raise UsageError(message)
        lines += [f".subckt {SWITCH_NAMES[edge]} d g s p size=1", *body, ".ends"]
    return lines


@dataclass(frozen=True)
class _Placed:
    """One switch between two nodes of a cell."""

    input: str
    ends: tuple[str, str]
    width: float


class _Places:
    """Walks one network of a cell from the output towards the rail; ``inner`` as in ``Cell.internal_nodes``."""

    def __init__(self, cell: Cell, edge: Edge, sizing: Sizing) -> None:
        self.sizing = sizing
        self.inner: list[str] = []
        self._names = (f"{edge[0]}m{number}" for number in itertools.count(1))
        self.switches = list(self._walk(cell.network(edge), ("out", _RAIL[edge]), 0))

    def _walk(self, network: Network, ends: tuple[str, str], others: int) -> Iterator[_Placed]:
        if isinstance(network, Switched):
            yield _Placed(network.input, ends, 1.0 if self.sizing == "unit" else others + 1.0)
            return
        if isinstance(network, Parallel):
            for part in network.parts:
                yield from self._walk(part, ends, others)
            return
        whole, top = depth(network), ends[0]
        for index, part in enumerate(network.parts):
            last = index + 1 == len(network.parts)
            bottom = ends[1] if last else next(self._names)
            yield from self._walk(part, (top, bottom), others + whole - depth(part))
            if not last:
                self.inner.append(bottom)
            top = bottom


def cell_lines(cell: Cell, sizing: Sizing, inner: Mapping[Edge, float]) -> list[str]:
    """Return a cell as a sub-circuit with the ports ``out vdd`` and its inputs, and the parameter ``size``.

    ``inner``: capacitance to ground of one terminal of unit width at an internal node [F], by network.
    """
    lines = [f".subckt {cell.name} out vdd {' '.join(cell.inputs)} size=1"]
    for edge in EDGES:
        places = _Places(cell, edge, sizing)
        for index, switch in enumerate(places.switches, start=1):
            nodes = f"{switch.ends[0]} {switch.input} {switch.ends[1]} {_RAIL[edge]}"
            lines.append(f"x{edge}{index} {nodes} {SWITCH_NAMES[edge]} size={{{number(switch.width)}*size}}")
        for node, detail in zip(places.inner, cell.internal_nodes(edge, sizing), strict=True):
            if inner[edge] > 0.0:
                lines.append(f"C{node} {node} 0 {{{number(inner[edge] * detail.width)}*size}}")
    return [*lines, ".ends"]


def inner_levels(cell: Cell, high: Mapping[str, bool]) -> dict[str, bool]:
    """Return the levels of internal nodes at rest, for first guesses; a floating node takes its rail's."""
    known = {"out": cell.output(high), "0": False, "vdd": True}
    found: dict[str, bool] = {}
    for edge in EDGES:
        places = _Places(cell, edge, "unit")
        closed = [switch.ends for switch in places.switches if high[switch.input] == (edge == "down")]
        levels = dict(known)
        for _ in places.switches:
            for one, other in (*closed, *((b, a) for a, b in closed)):
                if one in levels:
                    levels.setdefault(other, levels[one])
        found |= {node: levels.get(node, edge == "up") for node in places.inner}
    return found


def side_inputs(cell: Cell, driven: str) -> Mapping[str, bool]:
    """Return levels of the other inputs with which the output follows the driven one.

    Raises
    ------
    UsageError
        If the cell has no such input.
    """
    others = [name for name in cell.inputs if name != driven]
    for levels in itertools.product((True, False), repeat=len(others)):
        chosen = dict(zip(others, levels, strict=True))
        if cell.output({**chosen, driven: False}) and not cell.output({**chosen, driven: True}):
            return chosen
    message = f"cell {cell.name!r} has no input {driven!r} that moves its output"
    raise UsageError(message)
