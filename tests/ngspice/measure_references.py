"""Closed forms of virtual-source transistors against ngspice: ``tests/data/closed-form-references.csv``.

Four reference sets from 0.2 V to the declared supply in steps of 0.1 V at 25 degC: an inverter with fan-out 4 and a
NAND2 with fan-out 3 (one input moving, the other held at the supply). The 7 nm set also with a NAND3 whose last input
moves, at 0.2, 0.3 and 0.5 V and the declared supply; with fan-out 1 at 0.3 V; and at -40 and 125 degC at 0.3 V and the
declared supply.

ngspice solves the sub-circuits with the charges of the device; the closed forms are delay C V / (2 I_eff) with its
capacitance weights, energy C V^2 with and without the short-circuit estimate, leakage averaged over input states. For
a switch of kind ``effective`` the three closed rules are one, so their columns agree.
"""

from __future__ import annotations

import dataclasses
import itertools
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from tests.ngspice.benches import Bench, bench, input_states
from tests.ngspice.measured_rows import DATA, Row, complete, ratios

__all__ = ["INPUTS", "PATH", "SETS", "Point", "design", "key", "measure", "row", "simulate"]

SETS = (
    ("open-7nm-regular", "n7", 0.7),
    ("silicon-14nm-finfet", "n14", 0.7),
    ("silicon-32nm-high-performance", "n32", 1.0),
    ("silicon-45nm-high-performance", "n45", 1.0),
)
#: cell, moving input, fan-out; input b of the NAND2 is the one next to the rail
STAGES = (("inverter", "a", 4.0), ("nand2", "a", 3.0), ("nand2", "b", 3.0))
ROOM, OTHERS = 298.15, (233.15, 398.15)
PATH = DATA / "closed-form-references.csv"
SOURCE = "own simulation, ngspice 39.3, tests/ngspice/measure_references.py"
INPUTS = ("technology", "node", "supply_V", "temperature_K", "cell", "input", "fan_out", "fixed_inputs")
SIMULATED = ("simulated_delay_ps", "simulated_energy_fJ", "simulated_leakage_nW", "simulated_falling_ps")


@dataclass(frozen=True)
class Point:
    """One stage at one supply [V] and temperature [K]; ``fixed_inputs``: fixed load in driven inputs."""

    technology: str
    node: str
    supply: float
    kelvin: float
    cell: str
    pin: str
    fan_out: float
    fixed_inputs: float = 0.0

    @property
    def bench(self) -> Bench:
        """The stage."""
        known = {"cell_name": self.cell, "fan_out": self.fan_out, "pin": self.pin, "kelvin": self.kelvin}
        one = bench(self.technology, self.node, self.supply, **known)  # type: ignore[arg-type]
        return dataclasses.replace(one, fixed_load=self.fixed_inputs * one.stage("delay").far / self.fan_out)


def design() -> Iterator[Point]:
    """Yield every point."""
    for technology, node, declared in SETS:
        for supply in np.round(np.arange(0.2, declared + 0.01, 0.1), 6).tolist():
            for stage in STAGES:
                yield Point(technology, node, supply, ROOM, *stage)
    technology, node, declared = SETS[0]
    for supply in (0.2, 0.3, 0.5, declared):
        yield Point(technology, node, supply, ROOM, "nand3", "c", 3.0)
    yield Point(technology, node, 0.3, ROOM, "inverter", "a", 1.0)
    for kelvin, supply, stage in itertools.product(OTHERS, (0.3, declared), (STAGES[0], STAGES[2])):
        yield Point(technology, node, supply, kelvin, *stage)


def key(point: Point) -> tuple[str, ...]:
    """Return the inputs of a row as text."""
    numbers = (point.supply, point.kelvin)
    loads = (point.fan_out, point.fixed_inputs)
    return (
        point.technology, point.node, *(f"{x:g}" for x in numbers), point.cell, point.pin, *(f"{x:g}" for x in loads)
    )  # fmt: skip


def simulate(point: Point) -> Row:
    """Return what ngspice finds."""
    one = point.bench
    spice = one.chain("device")
    leakage = spice["leakage_power"] if point.cell == "inverter" else float(np.mean(input_states(one)))
    found = (spice["delay"] * 1e12, spice["switching_energy"] * 1e15, leakage * 1e9, spice["delay_falling"] * 1e12)
    return dict(zip(SIMULATED, (f"{x:.6g}" for x in found), strict=True))


def row(point: Point, simulated: Row) -> Row:
    """Return the whole row with the ratios of the present program."""
    delay, energy, leakage, falling = (float(simulated[name]) for name in SIMULATED)
    one = point.bench
    stage = one.estimate().stages[0]
    edges = {
        "delay_falling": stage.falling.delay.item() / (falling * 1e-12),
        "delay_rising": stage.rising.delay.item() / ((2.0 * delay - falling) * 1e-12),
    }
    return (
        dict(zip(INPUTS, key(point), strict=True))
        | {name: simulated[name] for name in SIMULATED}
        | ratios(one, delay * 1e-12, energy * 1e-15, leakage * 1e-9)
        | {name: f"{value:.5g}" for name, value in edges.items()}
        | {"source": SOURCE}
    )


def measure() -> list[Row]:
    """Measure what is missing and write the table."""
    return complete(PATH, design(), key, INPUTS, simulate, row)
