"""Shipped sets as decks, and what the program finds for the same stage."""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping
from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from benchmark.circuits.cells import Cell, cell
from benchmark.circuits.circuit import Circuit, Load, Net, Wires
from benchmark.circuits.deck import Capacitances, DeckStage, Pace, chain_deck, deck_stage, ring_deck
from benchmark.circuits.deck_cells import cell_lines, inner_levels, switch_lines
from benchmark.circuits.deck_control import CHAIN_RESULTS, RING_RESULTS, STATIC_RESULTS
from benchmark.circuits.operation import OperationMetrics, estimate
from benchmark.circuits.sized import Sized
from benchmark.circuits.transient import ChainLoad
from benchmark.devices import model
from benchmark.devices.model import DeviceModel, ModelInputs, Prepared
from benchmark.devices.netlist.parts import SubCircuits
from benchmark.devices.record import Array, SwitchPair
from benchmark.evaluate.batch import Batch, resolve
from benchmark.evaluate.deck import pace_of, switch_texts
from benchmark.record.load import load_technology
from tests.ngspice.runner import run_deck

__all__ = ["NO_WIRES", "Bench", "bench", "current_grid", "input_states", "quasi_static"]

NO_WIRES = Wires(0.0, 0.0)
_KNOBS: Mapping[str, Array] = {"threshold_shift": np.zeros((1, 1, 1))}


@lru_cache(maxsize=64)
def _prepared(technology: str, node: str) -> tuple[DeviceModel, Prepared, float]:
    known = load_technology(technology)
    device = model(known.model)
    values = resolve(known.id, known.at(node), Batch.best_estimate())
    tables = {name: table.table for name, table in known.tables.items()}
    if known.rows:
        tables["rows"] = known.rows[node]
    prepared = device.prepare(ModelInputs(values, known.options, tables))
    return device, prepared, float(values["reference_temperature"].ravel()[0])


def quasi_static(pair: SwitchPair) -> SwitchPair:
    """Return the pair with its actuators replaced by a pure transport delay."""
    none = np.full((1, 1, 1), np.nan)
    down, up = (dataclasses.replace(switch, natural_frequency=none) for switch in (pair.down, pair.up))
    return dataclasses.replace(pair, down=down, up=up)


@dataclass(frozen=True)
class Bench:
    """One pair of switches at one design point, in stages of one cell that drive input ``pin`` of the next."""

    pair: SwitchPair
    texts: SubCircuits
    cell: Cell
    fan_out: float
    pin: str
    fixed_load: float = 0.0

    @property
    def net(self) -> Net:
        """A stage that drives its own kind and ``fixed_load`` [F], no wire."""
        loads = (Load(self.cell, self.pin, self.fan_out),)
        fixed = self.fixed_load
        return Net("stage", self.cell, loads=loads, fixed_load=fixed, rising_per_operation=1.0, on_critical_path=1.0)

    def estimate(self, rule: str = "chain") -> OperationMetrics:
        """What the closed forms, or another rule, say about one stage."""
        return estimate(Circuit("stage", "stage", "one cycle", (self.net,)), self.pair, NO_WIRES, rule)

    def stage(self, capacitances: Capacitances) -> DeckStage:
        """The stage of a deck."""
        return deck_stage(self.net, Sized(self.pair), self.texts, NO_WIRES, {}, 1.0, capacitances)

    def load(self, capacitances: Capacitances = "delay") -> ChainLoad:
        """The lumped load of the program's own transient: the very constants of the deck."""
        stage = self.stage(capacitances)
        return ChainLoad(stage.near, stage.far)

    @property
    def supply(self) -> float:
        """V [V]."""
        return float(self.pair.supply.ravel()[0])

    @property
    def pace(self) -> Pace:
        """Scales of the deck."""
        return pace_of(self.pair, self.estimate().path_delay.item())

    def chain_text(self, capacitances: Capacitances = "delay") -> str:
        """The deck of a chain."""
        return chain_deck(["chain of a test"], self.stage(capacitances), self.texts, self.supply, self.pace)

    def chain(self, capacitances: Capacitances = "delay") -> dict[str, float]:
        """Every number the deck of a chain prints."""
        return run_deck(self.chain_text(capacitances), (*STATIC_RESULTS, *CHAIN_RESULTS)).numbers

    def ring(self, stages: int, capacitances: Capacitances = "delay") -> dict[str, float]:
        """Every number the deck of a ring prints."""
        deck = ring_deck(["ring of a test"], self.stage(capacitances), self.texts, self.supply, self.pace, stages)
        return run_deck(deck, RING_RESULTS).numbers


def bench(
    technology: str,
    node: str,
    supply: float,
    *,
    cell_name: str = "inverter",
    fan_out: float = 4.0,
    pin: str = "a",
    kelvin: float | None = None,
    actuator: bool = True,
) -> Bench:
    """Return a shipped set at one supply, at its reference temperature unless said otherwise.

    ``actuator=False``: the mechanics as a pure transport delay, in the records and in the deck.
    """
    device, prepared, reference = _prepared(technology, node)
    volts, temperature = np.full((1, 1, 1), supply), np.full((1, 1, 1), reference if kelvin is None else kelvin)
    pair = device.switch(prepared, volts, temperature, _KNOBS)
    if not actuator:
        pair = quasi_static(pair)
    return Bench(pair, switch_texts(device, prepared, pair, _KNOBS), cell(cell_name), fan_out, pin)


def input_states(one: Bench) -> list[float]:
    """Return the leakage power of a cell [W] in its input states, in binary order with the first input lowest."""
    supply, inputs = one.supply, one.cell.inputs
    states = range(2 ** len(inputs))
    lines = ["* leakage of a cell", *switch_lines(one.texts, "delay")]
    lines += cell_lines(one.cell, "unit", {"down": 0.0, "up": 0.0})
    for state in states:
        high = {name: bool(state >> position & 1) for position, name in enumerate(inputs)}
        level = {name: supply if on else 0.0 for name, on in high.items()}
        lines += [f"v{pin}{state} {pin}{state} 0 {volts!r}" for pin, volts in level.items()]
        pins = " ".join(f"{pin}{state}" for pin in inputs)
        lines += [f"vr{state} r{state} 0 {supply!r}", f"x{state} o{state} r{state} {pins} {one.cell.name}"]
        guesses = {f"o{state}": one.cell.output(high)}
        guesses |= {f"x{state}.{node}": on for node, on in inner_levels(one.cell, high).items()}
        lines.append(".nodeset " + " ".join(f"v({n})={supply if on else 0.0!r}" for n, on in guesses.items()))
    lines += [
        ".options reltol=1e-6 abstol=1e-18 vntol=1e-12 gmin=1e-20 pivtol=1e-30 itl1=1000",
        ".control",
        "set numdgt=10",
        "op",
        *(f"let p{state} = -i(vr{state})*{supply!r}\nprint p{state}" for state in states),
        "quit 0",
        ".endc",
        ".end",
    ]
    numbers = run_deck("\n".join(lines), [f"p{state}" for state in states]).numbers
    return [numbers[f"p{state}"] for state in states]


def current_grid(text: tuple[str, ...], gates: Array, paths: Array, *, up: bool = False, lift: float = 0.0) -> Array:
    """Return the path current of one sub-circuit in ngspice, shape (gates, paths) [A], in the switch's own sense.

    ``gates``: from the rail to the gate; ``paths``: across the switch; ``lift``: from the rail to the lower end. Evenly
    spaced.
    """
    sign = -1.0 if up else 1.0
    drains = lift + paths

    def sweep(axis: Array) -> str:
        first, last, step = float(axis[0]), float(axis[-1]), float(axis[1] - axis[0])
        return f"{sign * first!r} {sign * (last + 0.01 * step)!r} {sign * step!r}"

    deck = "\n".join(
        [
            "* path current of one switch",
            ".subckt switch d g s p size=1",
            *text,
            ".ends",
            "x1 d g s 0 switch",
            "vd d 0 0",
            "vg g 0 0",
            f"vs s 0 {sign * lift!r}",
            ".options reltol=1e-9 abstol=1e-24 vntol=1e-12 gmin=1e-24 pivtol=1e-40 itl1=1000 itl2=1000",
            ".control",
            "set wr_singlescale",
            "set wr_vecnames",
            "set numdgt=15",
            f"dc vd {sweep(drains)} vg {sweep(gates)}",
            "wrdata grid.txt i(vd) v(d) v(g)",
            "quit 0",
            ".endc",
            ".end",
        ]
    )
    table = run_deck(deck, tables={"grid.txt": ("i(vd)", "v(d)", "v(g)")}).tables["grid.txt"]
    shape = (len(gates), len(paths))
    assert np.allclose(sign * table["v(d)"].reshape(shape), drains, rtol=1e-9, atol=1e-12)
    assert np.allclose(sign * table["v(g)"].reshape(shape), gates[:, None], rtol=1e-9, atol=1e-12)
    return np.asarray(-sign * table["i(vd)"].reshape(shape))
