"""Electrical quantities of a cell made of a technology's switches: resistance, capacitance, leakage (layer 5)."""

from __future__ import annotations

from collections import Counter
from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache
from typing import Final, Literal

import numpy as np

from benchmark.circuits.cells import Cell, Edge, Sizing, SwitchedOff
from benchmark.circuits.circuit import Value
from benchmark.devices.record import Array, Switch, SwitchPair

__all__ = ["EDGES", "OTHER", "SizeAs", "Sized", "Weight"]

SizeAs = Literal["width", "copies"]
Weight = Literal["delay", "energy"]

EDGES: Final[tuple[Edge, Edge]] = ("down", "up")
OTHER: Final[Mapping[Edge, Edge]] = {"down": "up", "up": "down"}


@dataclass(frozen=True)
class Sized:
    """A pair of switches with the size knob and the sizing rule applied to cells.

    size [1]
        Resistance / size, terminals x size, leakage x size, area x size. With ``size_as`` ``width`` the input charge,
        extra energy, input leakage and bias grow only when the record says that the input scales with size; with
        ``copies`` (size parallel copies of the whole switch) they always grow. The widths of the sizing rule
        ``equal-drive`` multiply the same way. The area of a widened channel is taken as proportional to its width
        even when the actuator stays as it is.
    internal_nodes
        False leaves internal nodes out of capacitances (the convention of logical-effort tables).
    """

    pair: SwitchPair
    size: Value = 1.0
    size_as: SizeAs = "width"
    sizing: Sizing = "unit"
    internal_nodes: bool = True

    def switch(self, edge: Edge) -> Switch:
        """Return the unit switch that drives the edge."""
        return self.pair.down if edge == "down" else self.pair.up

    def path_resistance(self, cell: Cell, edge: Edge) -> Array:
        """Return the resistance [ohm] of the worst conducting path of the edge.

        R stack_on[k] mean(1/width) / size, largest over the paths; nan when the technology does not state k
        switches in series or the resistance is not finite. Parallel paths that may conduct at the same time are not
        used (one input switches last).
        """
        switch = self.switch(edge)
        ratios = [
            stack_ratio(switch.stack_on, count) * (inverse / count) for count, inverse in cell.paths(edge, self.sizing)
        ]
        worst = ratios[0]
        for ratio in ratios[1:]:
            worst = np.maximum(worst, ratio)
        unit = np.where(np.isfinite(switch.resistance), switch.resistance, np.nan)
        return np.asarray(unit * worst / self.size)

    def transit(self, cell: Cell, edge: Edge) -> Array:
        """Return max(closing time of the stack that closes, opening time of the switch that opens) [s].

        k switches in series that actuate at the same time close in one closing time, sequential ones in k; one
        opening switch opens a stack.
        """
        closing, opening = self.switch(edge), self.switch(OTHER[edge])
        stages = cell.depth(edge) if closing.stack_time == "sequential" else 1
        return np.asarray(np.maximum(stages * closing.closing_time, opening.opening_time))

    def output_capacitance(self, cell: Cell, weight: Weight, driving: Edge) -> Array:
        """Return the capacitance [F] of the cell's own terminals, lumped at its output.

        Every switch end at the output counts fully. Internal nodes of the driving network count with their Elmore
        share of the path resistance; those of the other network hang on the output through closed switches and count
        fully (the input next to the rail switches last). For energy every internal node counts fully: once per
        rising transition of the output, full swing.
        """
        total: Array = np.asarray(0.0)
        for edge in EDGES:
            switch = self.switch(edge)
            unit = switch.terminal_capacitance_delay if weight == "delay" else switch.terminal_capacitance
            width = cell.output_width(edge, self.sizing)
            if self.internal_nodes:
                for node in cell.internal_nodes(edge, self.sizing):
                    width += node.width * (node.share if weight == "delay" and edge == driving else 1.0)
            total = total + unit * width
        return np.asarray(total * self.size)

    def _input_sum(self, widths: Mapping[Edge, tuple[float, ...]], unit: Mapping[Edge, Array]) -> Array:
        total: Array = np.asarray(0.0)
        for edge in EDGES:
            if self.size_as == "copies" or self.switch(edge).input_scales_with_size:
                total = total + unit[edge] * (sum(widths[edge]) * self.size)
            else:
                total = total + unit[edge] * float(len(widths[edge]))
        return np.asarray(total)

    def input_capacitance(self, cell: Cell, name: str) -> Array:
        """Return the capacitance [F] of one input in the switching window (delay)."""
        unit = {edge: self.switch(edge).input_capacitance_delay for edge in EDGES}
        return self._input_sum(cell.input_widths(name, self.sizing), unit)

    def input_charge(self, cell: Cell, name: str) -> Array:
        """Return the charge [C] one input draws over the full supply swing (energy)."""
        return self._input_sum(
            cell.input_widths(name, self.sizing), {edge: self.switch(edge).input_charge for edge in EDGES}
        )

    def extra_energy(self, cell: Cell, name: str) -> Array:
        """Return the energy [J] lost per full cycle of one input, beyond charge times supply."""
        return self._input_sum(
            cell.input_widths(name, self.sizing), {edge: self.switch(edge).extra_energy for edge in EDGES}
        )

    def bias_power(self, cell: Cell) -> Array:
        """Return the standing power [W] of the cell's switches."""
        widths = {edge: cell.widths(edge, self.sizing) for edge in EDGES}
        return self._input_sum(widths, {edge: self.switch(edge).bias_power for edge in EDGES})

    def area(self, cell: Cell) -> Array:
        """Return the area [m^2] of the cell's switches, isolation included, wiring not."""
        total: Array = np.asarray(0.0)
        for edge in EDGES:
            total = total + self.switch(edge).area * sum(cell.widths(edge, self.sizing))
        return np.asarray(total * self.size)

    def leakage_current(self, cell: Cell) -> dict[str, Array]:
        """Return the leakage [A] of a cell, averaged over its 2^n input states, in parts.

        Inputs are independent and high half of the time.

        path
            Through the open network at the full supply, the other one conducting. k open switches in series leak
            stack_off[k] of one; unequal members of a series stack combine by the harmonic mean (exact for ohmic
            switches and for plain stacks). Parallel branches add.
        input
            Half of the time at the closing level, half at the opening level.
        body
            Open or closed.
        """
        path: Array = np.asarray(0.0)
        for (edge, network), share in _state_shares(cell, self.sizing):
            switch = self.switch(edge)
            path = path + share * switch.off_current_path * _relative_leakage(network, switch)
        widths = {edge: cell.widths(edge, self.sizing) for edge in EDGES}
        inputs = {
            edge: 0.5 * (self.switch(edge).off_current_input_high + self.switch(edge).off_current_input_low)
            for edge in EDGES
        }
        body: Array = np.asarray(0.0)
        for edge in EDGES:
            body = body + self.switch(edge).off_current_body * sum(widths[edge])
        return {
            "path": np.asarray(path * self.size),
            "input": self._input_sum(widths, inputs),
            "body": np.asarray(body * self.size),
        }


def stack_ratio(ratios: Array, count: int) -> Array:
    """Return entry k of a stacking array with trailing axis k; nan where the technology does not state it."""
    if count > ratios.shape[-1]:
        return np.full(ratios.shape[:-1], np.nan)
    return np.asarray(ratios[..., count - 1])


def _relative_leakage(network: SwitchedOff, switch: Switch) -> Array:
    """Return the leakage of an open network relative to one open unit switch."""
    total: Array = np.asarray(0.0)
    for members in network.branches:
        inverse: Array = np.asarray(0.0)
        for member in members:
            inverse = inverse + 1.0 / (member if isinstance(member, float) else _relative_leakage(member, switch))
        total = total + stack_ratio(switch.stack_off, len(members)) * len(members) / inverse
    return np.asarray(total)


@lru_cache(maxsize=1024)
def _state_shares(cell: Cell, sizing: Sizing) -> tuple[tuple[tuple[Edge, SwitchedOff], float], ...]:
    states = cell.open_networks(sizing)
    return tuple((state, count / len(states)) for state, count in Counter(states).items())
