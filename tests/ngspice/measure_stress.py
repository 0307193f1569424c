"""Closed forms of the stress-gated switch against ngspice: ``tests/data/closed-form-stress-gated.csv``.

The switch is invented (``tests/ngspice/stress_switch.py``). ngspice solves the sub-circuits with the charges of the
device, motion acting back on the gate included. Design, all combinations of

- inverter driving its own kind: transit over R C 0.01, 0.1, 1, 10, 100 x on/off ratio 1e2, 1e4, 1e6, 1e8 x supply over
  closing voltage 0.8, 1, 1.5, 2, 2.5, with quality 0.5, 1, 2, 3 where the actuator matters (transit over R C from 1
  on), 0.5 and 3 at 0.1, and 1 at 0.01; from 1.5 closing voltages on also transit over R C 0.0001;
- NAND2 driving its own kind, one input moving: transit over R C 0.0001, 0.1, 1, 10 x on/off ratio 1e2, 1e4, 1e8 x the
  same supplies x quality 0.5 and 3; NAND3 likewise at 0.0001 (quality 1) and 0.1
  (3), from 1e4 on.

The start of the window (0 or 0.4 of its end) and the moving input of a NAND alternate over them like a chessboard.

Every point is a row, also one where the method breaks: ``flag`` says why it belongs to no band.
"""

from __future__ import annotations

import itertools
from collections.abc import Iterator, Mapping, Sequence

import numpy as np

from benchmark.circuits.sized import Sized
from benchmark.evaluate.bands import rings, stage_facts
from benchmark.physics import acoustics
from tests.ngspice.benches import Bench, input_states
from tests.ngspice.measured_rows import DATA, RATIOS, Row, complete, ratios
from tests.ngspice.runner import SpiceError
from tests.ngspice.stress_switch import Asked, stress_bench

PATH = DATA / "closed-form-stress-gated.csv"
SOURCE = "own simulation, ngspice 39.3, tests/ngspice/measure_stress.py"
#: transit over R C -> qualities
TRANSITS = {
    0.01: (1.0,),
    0.1: (0.5, 3.0),
    1.0: (0.5, 1.0, 2.0, 3.0),
    10.0: (0.5, 1.0, 2.0, 3.0),
    100.0: (0.5, 1.0, 2.0, 3.0),
}
STACK_TRANSITS = {0.0001: (1.0,), 0.1: (0.5, 3.0), 1.0: (0.5, 3.0), 10.0: (0.5, 3.0)}
#: moving inputs: at the output and at the rail
PINS = {"inverter": "aa", "nand2": "ab", "nand3": "ac"}
STACK_DECADES = (2.0, 4.0, 8.0)
DECADES = (2.0, 4.0, 6.0, 8.0)
PLACEMENTS = (0.8, 1.0, 1.5, 2.0, 2.5)
STARTS = (0.0, 0.4)
#: below this on/off ratio an output keeps so little swing that energy without leakage means nothing
LEAST_CONTRAST = 40.0
#: of a stack [W]: below it the tolerance of the static solution (1e-18 A) is no longer small
LEAST_LEAKAGE = 1.0e-15
INPUTS = ("cell", "input", "asked_transit_over_rc", "decades", "quality", "placement", "start")
FACTS = ("transit_over_rc", "on_off_ratio", "switching_level", "quality_limit")
SIMULATED = ("simulated_delay_s", "simulated_energy_J", "simulated_leakage_W", "ringing_over_delay", "outcome")

Point = tuple[str, str, Asked]


def design() -> Iterator[Point]:
    """Yield every point of the design."""
    yield from _whole("inverter", TRANSITS, DECADES, PLACEMENTS)
    yield from _whole("inverter", {0.0001: (1.0,)}, STACK_DECADES, PLACEMENTS[2:])
    yield from _whole("nand2", STACK_TRANSITS, STACK_DECADES, PLACEMENTS)
    yield from _whole("nand3", {0.0001: (1.0,), 0.1: (3.0,)}, STACK_DECADES[1:], PLACEMENTS)


def _whole(
    cell: str, transits: Mapping[float, tuple[float, ...]], decades: Sequence[float], placements: Sequence[float]
) -> Iterator[Point]:
    """Yield all combinations; start of the window and moving input of a NAND alternate like a chessboard."""
    for i, (transit, qualities) in enumerate(transits.items()):
        for (j, ratio), (k, placement), (n, quality) in itertools.product(
            enumerate(decades), enumerate(placements), enumerate(qualities)
        ):
            pin = PINS[cell][(j + n) % 2]
            yield cell, pin, Asked(transit, ratio, quality, placement, STARTS[(i + j + k + n) % 2])


def key(point: Point) -> tuple[str, ...]:
    """Return the inputs of a row as text."""
    cell, pin, asked = point
    numbers = (asked.transit_over_rc, asked.decades, asked.quality, asked.placement, asked.start)
    return (cell, pin, *(f"{x:g}" for x in numbers))


def simulate(point: Point) -> Row:
    """Return what ngspice finds; ``outcome`` says why it finds nothing."""
    cell, pin, asked = point
    one = stress_bench(asked, cell, pin)
    try:
        spice = one.chain("device")
        leakage = spice["leakage_power"] if cell == "inverter" else float(np.mean(input_states(one)))
    except SpiceError as error:
        reason = "no edge crosses half the supply" if "finite" in str(error) else "not solved"
        return dict.fromkeys(SIMULATED, "") | {"outcome": reason}
    numbers = (spice["delay"], spice["switching_energy"], leakage, spice["ringing_time"] / spice["delay"])
    return dict(zip(SIMULATED, [f"{x:.6g}" for x in numbers] + ["solved"], strict=True))


def facts_of(one: Bench) -> dict[str, float]:
    """Return what the program itself knows of the point: the axes of the bands, and the limit of the quality."""
    known = stage_facts(one.estimate("step").stages[0], Sized(one.pair), one.pair.temperature.item())
    limit = float(acoustics.quality_limit_chain(known["switching_level"]))
    return known | {"quality_limit": limit}


def row(point: Point, simulated: Row) -> Row:
    """Return the whole row: inputs, simulated numbers, and the ratios closed over simulated of the present program."""
    one = stress_bench(point[2], point[0], point[1])
    facts = facts_of(one)
    found: Row = dict(zip(INPUTS, key(point), strict=True)) | {name: f"{facts[name]:.5g}" for name in FACTS}
    found |= {name: simulated[name] for name in SIMULATED}
    over: Row = dict.fromkeys(RATIOS, "")
    limits = ""
    if simulated["outcome"] == "solved":
        delay, energy, leakage = (float(simulated[name]) for name in SIMULATED[:3])
        over = ratios(one, delay, energy, leakage)
        if point[0] != "inverter" and leakage < LEAST_LEAKAGE:
            over["leakage"] = ""
        limits = "transit" if 2.0 * one.pair.down.closing_time.item() > delay else "R C"
    return found | over | {"limits": limits, "flag": _flag(found, facts), "source": SOURCE}


def _flag(found: Row, facts: Mapping[str, float]) -> str:
    if found["outcome"] != "solved":
        return found["outcome"]
    if facts["on_off_ratio"] < LEAST_CONTRAST:
        return "levels far from the rails"
    if not np.isnan(rings(facts)):
        return "beyond the ringing limit"
    if float(found["simulated_delay_s"]) <= 0.0:
        return "edge before that of its input"
    return "false switching" if float(found["ringing_over_delay"]) > 0.0 else ""


def measure() -> list[Row]:
    """Measure what is missing and write the table."""
    return complete(PATH, design(), key, INPUTS, simulate, row)


if __name__ == "__main__":
    measure()
