"""Gate-level netlists: loads, timing in gate stages and switching activity, all found by walking them (layer 5).

Times are counted in gate stages (every gate one unit); they find *which* stages a path is made of, the delays of the
stages come from the technology.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

import numpy as np

from benchmark.circuits.cells import Cell, cell
from benchmark.circuits.circuit import Load
from benchmark.devices.record import Array
from benchmark.errors import UsageError

__all__ = [
    "Gate",
    "Netlist",
    "Settled",
    "all_loads",
    "loads",
    "longest_path",
    "ordered",
    "rising_probability",
    "settle",
]


@dataclass(frozen=True)
class Gate:
    """A cell, by name or itself, that drives ``output`` from the nets ``inputs`` (in the order of its inputs)."""

    output: str
    cell: str | Cell
    inputs: tuple[str, ...]

    @property
    def which(self) -> Cell:
        """Return the cell itself."""
        return cell(self.cell) if isinstance(self.cell, str) else self.cell


@dataclass(frozen=True)
class Netlist:
    """Gates between primary inputs and outputs; feedback is allowed."""

    name: str
    inputs: tuple[str, ...]
    gates: tuple[Gate, ...]
    outputs: tuple[str, ...]

    def __post_init__(self) -> None:
        nets = [*self.inputs, *(gate.output for gate in self.gates)]
        known = set(nets)
        if len(nets) != len(known):
            message = f"netlist {self.name!r}: a net is driven twice"
            raise UsageError(message)
        for gate in self.gates:
            if len(gate.inputs) != len(gate.which.inputs) or not known.issuperset(gate.inputs):
                message = f"netlist {self.name!r}: inputs of the gate driving {gate.output!r} do not fit"
                raise UsageError(message)
        if not known.issuperset(self.outputs):
            message = f"netlist {self.name!r}: an output is not a net"
            raise UsageError(message)


def loads(netlist: Netlist, net: str) -> tuple[Load, ...]:
    """Return the gate inputs that a net drives inside the netlist."""
    return all_loads(netlist).get(net, ())


def all_loads(netlist: Netlist) -> dict[str, tuple[Load, ...]]:
    """Return the gate inputs that each net drives inside the netlist; nets that drive none are left out."""
    found: dict[str, list[Load]] = {}
    for gate in netlist.gates:
        for pin, source in zip(gate.which.inputs, gate.inputs, strict=True):
            found.setdefault(source, []).append(Load(gate.which, pin))
    return {net: tuple(driven) for net, driven in found.items()}


@dataclass(frozen=True)
class Settled:
    """Result of ``settle``.

    ``values`` of all nets at rest; ``rising`` transitions counted per net; ``changed_at`` the last change of each net
    that changed, in gate stages after the stimulus; ``cause`` the net whose change made that last change.
    """

    values: Mapping[str, bool]
    rising: Mapping[str, int]
    changed_at: Mapping[str, int]
    cause: Mapping[str, str]

    def path_to(self, net: str) -> tuple[str, ...]:
        """Return the driven nets from the stimulus to the last change of ``net``, in order."""
        path = [net]
        while path[-1] in self.cause:
            path.append(self.cause[path[-1]])
        return tuple(reversed(path[:-1]))


def settle(netlist: Netlist, values: Mapping[str, bool], stimulus: Mapping[str, bool]) -> Settled:
    """Apply new input values at stage 0 and let every gate answer one stage later until nothing moves.

    ``values`` of all nets must be at rest. Hazards are simulated and counted. A race that does not settle is refused.
    """
    state = {**values, **stimulus}
    moved = {net for net, value in stimulus.items() if values[net] != value}
    rising = {net: int(state[net]) for net in moved}
    changed_at = dict.fromkeys(moved, 0)
    cause: dict[str, str] = {}
    for now in range(1, 4 * len(netlist.gates) + 2):
        if not moved:
            return Settled(state, rising, changed_at, cause)
        after: dict[str, bool] = {}
        for gate in netlist.gates:
            which = gate.which
            value = which.output({pin: state[net] for pin, net in zip(which.inputs, gate.inputs, strict=True)})
            if value != state[gate.output]:
                after[gate.output] = value
                changed_at[gate.output] = now
                why = next((net for net in gate.inputs if net in moved), None)
                if why is None:
                    message = f"netlist {netlist.name!r} was not at rest at {gate.output!r} before the stimulus"
                    raise UsageError(message)
                cause[gate.output] = why
                rising[gate.output] = rising.get(gate.output, 0) + int(value)
        state.update(after)
        moved = set(after)
    message = f"netlist {netlist.name!r} does not settle after {dict(stimulus)}"
    raise UsageError(message)


def ordered(netlist: Netlist) -> tuple[Gate, ...]:
    """Return the gates of a netlist without feedback, drivers before readers."""
    known, waiting, order = set(netlist.inputs), list(netlist.gates), list[Gate]()
    while waiting:
        later = []
        for gate in waiting:
            if known.issuperset(gate.inputs):
                order.append(gate)
                known.add(gate.output)
            else:
                later.append(gate)
        if len(later) == len(waiting):
            message = f"netlist {netlist.name!r} has feedback; it has no order"
            raise UsageError(message)
        waiting = later
    return tuple(order)


def longest_path(
    netlist: Netlist, start: Iterable[str] | None = None, burden: Mapping[str, float] | None = None
) -> tuple[str, ...]:
    """Return the driven nets of the longest path in gate stages from ``start`` (default: all inputs) to an output.

    Structural, without regard to whether the path can be sensitised. Among equally long paths the one with the
    largest sum of ``burden`` over its nets, else the first.
    """
    reach: dict[str, tuple[int, float]] = dict.fromkeys(netlist.inputs if start is None else start, (0, 0.0))
    before: dict[str, str] = {}
    for gate in ordered(netlist):
        reaching = [net for net in gate.inputs if net in reach]
        if reaching:
            last = max(reaching, key=lambda net: reach[net])
            stages, whole = reach[last]
            reach[gate.output] = (stages + 1, whole + (burden[gate.output] if burden is not None else 0.0))
            before[gate.output] = last
    path = [max((net for net in netlist.outputs if net in reach), key=lambda net: reach[net])]
    while path[-1] in before:
        path.append(before[path[-1]])
    return tuple(reversed(path[:-1]))


def rising_probability(netlist: Netlist, high: Mapping[str, float] | None = None) -> dict[str, float]:
    """Return a01 = p (1 - p) of every net for independent vectors of independent inputs, no hazards.

    ``high``: probability that an input is high (default 1/2). Exhaustive over all input states (exact, also where
    signals reconverge); Weste & Harris, CMOS VLSI Design, 5.2.1 (from memory).
    """
    count = len(netlist.inputs)
    if count > 20:
        message = f"netlist {netlist.name!r}: {count} inputs are too many for an exhaustive count"
        raise UsageError(message)
    states = np.arange(2**count)
    values: dict[str, Array] = {}
    weight = np.ones(2**count)
    for place, net in enumerate(netlist.inputs):
        bit = (states >> place) & 1 == 1
        p = 0.5 if high is None else high[net]
        values[net] = bit
        weight = weight * np.where(bit, p, 1.0 - p)
    for gate in ordered(netlist):
        values[gate.output] = _output(gate, values)
    chances = {net: float(weight @ value) for net, value in values.items()}
    return {net: p * (1.0 - p) for net, p in chances.items()}


def _output(gate: Gate, values: Mapping[str, Array]) -> Array:
    """Return the output of a gate for many states at once, from the truth table of its cell."""
    which = gate.which
    index = np.zeros(values[gate.inputs[0]].shape, dtype=np.int64)
    for place, net in enumerate(gate.inputs):
        index += values[net].astype(np.int64) << place
    table = np.array(
        [
            which.output({pin: bool(row >> place & 1) for place, pin in enumerate(which.inputs)})
            for row in range(2 ** len(which.inputs))
        ]
    )
    return np.asarray(table[index])
