"""One side at one design point as a deck for ngspice (layer 6)."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import Final

import numpy as np

from benchmark.circuits.deck import Capacitances, Pace, chain_deck, deck_stage, ring_deck
from benchmark.circuits.operation import OperationMetrics, estimate
from benchmark.circuits.sized import Sized
from benchmark.circuits.stage import StageDetail
from benchmark.devices.model import DeviceModel, Prepared
from benchmark.devices.netlist.parts import SubCircuits, scalar
from benchmark.devices.netlist.tabulated import tabulated
from benchmark.devices.record import Array, SwitchPair
from benchmark.errors import UsageError, nearest
from benchmark.evaluate.side import SideProblem

__all__ = ["CAPACITANCES", "pace_of", "side_deck", "switch_texts"]

CAPACITANCES: Final[Mapping[Capacitances, str]] = {
    "delay": "constants of the switching window, lumped at the nodes, as the delay rules use them: compare the delay",
    "energy": "constants from the charge over the full swing, lumped at the nodes: compare the energy",
    "device": "charges of the device itself, with coupling from input to output: compare both",
}


def switch_texts(device: DeviceModel, prepared: Prepared, pair: SwitchPair, knobs: Mapping[str, Array]) -> SubCircuits:
    """Return the sub-circuits of both switches at one point; a table where the model has no closed form."""
    return tabulated(pair) if device.netlist is None else device.netlist(prepared, pair, knobs)


def pace_of(pair: SwitchPair, delay: float) -> Pace:
    """Return the scales of a deck from an estimate of the stage delay [s]."""
    ring_down = 0.0
    for switch in (pair.down, pair.up):
        frequency, quality = scalar(switch.natural_frequency), scalar(switch.quality)
        if math.isfinite(frequency):
            # the slower of the two rates falls by e^-14
            ring_down = max(ring_down, 14.0 * (2.0 * quality + 1.0 / quality) / frequency)
    current = max(scalar(pair.down.on_current), scalar(pair.up.on_current))
    return Pace(delay, current, ring_down)


def _chosen(metrics: OperationMetrics, name: str) -> StageDetail:
    """Return the named stage, else the gate's that takes the largest part of the critical path."""
    stages = {stage.net.name: stage for stage in metrics.stages}
    if name and name not in stages:
        message = f"there is no net {name!r}; known are {', '.join(stages)}; {nearest(name, stages)}"
        raise UsageError(message.removesuffix("; "))
    if name:
        return stages[name]
    # nets that no gate drives from rail to rail (bit lines, latches) are refused by name; by themselves never chosen
    chains = [stage for stage in metrics.stages if stage.net.gated and stage.net.swing is None] or metrics.stages
    return max(chains, key=lambda stage: scalar(stage.net.on_critical_path) * scalar(stage.delay))


def _refuse_unusable(metrics: OperationMetrics) -> None:
    reasons = [reason for reason, mask in metrics.unable.items() if np.any(mask)]
    if reasons:
        message = f"no netlist at this point: {'; '.join(reasons)}"
        raise UsageError(message)


def side_deck(
    problem: SideProblem,
    point: tuple[float, float, float],
    kelvin: float,
    *,
    net: str = "",
    capacitances: Capacitances = "delay",
    comments: Sequence[str] = (),
) -> str:
    """Return the deck of one side: a ring where the circuit is a ring, else a chain of stages like one of its nets.

    Parameters
    ----------
    problem : SideProblem
        The side, best estimate (row 0).
    point : tuple of float
        Supply [V], size [1], threshold shift [V].
    kelvin : float
        Temperature [K].
    net : str
        Net whose stage is repeated; the one with the largest part of the critical path when empty.
    capacitances : {"delay", "energy", "device"}
        See ``benchmark.circuits.deck``.
    comments : sequence of str
        Further lines for the head of the deck.

    Raises
    ------
    UsageError
        If the switch is not usable at this point, its model has no text, or the net cannot be a chain.
    """
    supply, size, shift = point
    cube = (1, 1, 1)
    knobs: dict[str, Array] = {
        "threshold_shift": np.full(cube, shift),
        "stack_depth": np.asarray(problem.stack_depth),
    }
    pair = problem.device.switch(problem.prepared, np.full(cube, supply), np.full(cube, kelvin), knobs)
    study = problem.study
    metrics = estimate(
        problem.circuit,
        pair,
        problem.wires,
        study.delay_rule,
        size=size,
        size_as=problem.size_as,
        short_circuit=study.short_circuit == "estimated",
    )
    _refuse_unusable(metrics)
    stage = _chosen(metrics, net)
    texts = switch_texts(problem.device, problem.prepared, pair, knobs)
    sized = Sized(pair, size, problem.size_as)
    deck = deck_stage(stage.net, sized, texts, problem.wires, problem.circuit.layers, metrics.gate_pitch, capacitances)
    pace = pace_of(pair, scalar(stage.worst_delay))
    ring = problem.circuit.name == "ring"
    head = [*comments, *_facts(problem, metrics, stage, capacitances)]
    if ring:
        return ring_deck(head, deck, texts, supply, pace, round(scalar(stage.net.count)))
    return chain_deck(head, deck, texts, supply, pace)


def _facts(
    problem: SideProblem, metrics: OperationMetrics, stage: StageDetail, capacitances: Capacitances
) -> list[str]:
    """Return what the deck is and what this program finds for the same stage, for comparison."""
    net = stage.net
    loads = ", ".join(f"{scalar(load.count):g} x {load.cell.name}.{load.input}" for load in net.loads) or "no inputs"
    what = "a ring of stages like" if problem.circuit.name == "ring" else "a chain of stages like"
    lines = [
        f"Circuit {problem.circuit.name}: {what} net {net.name}: {net.driver.name} drives {loads}, "
        f"wire {scalar(stage.wire_length):.6g} m",
        f"Capacitances: {CAPACITANCES[capacitances]}",
        f"Without guard-bands, by the rule {problem.study.delay_rule}, this program finds per stage:",
        f"  delay_falling {scalar(stage.falling.delay):.6g} s, delay_rising {scalar(stage.rising.delay):.6g} s, "
        f"delay {scalar(stage.delay):.6g} s",
        f"  energy of one cycle without leakage {scalar(stage.energy):.6g} J, "
        f"leakage_power {scalar(stage.leakage_power):.6g} W over all input states",
    ]
    others = [other.net.name for other in metrics.stages if other is not stage]
    if others:
        lines.append(f"Not in this deck: the nets {', '.join(others)}")
    return lines
