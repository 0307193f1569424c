"""The same equations in ngspice and in the program: chains of stages with the constants of the record.

What ngspice found is stored in ``tests/data/same-equations.csv``; the program's numbers are obtained anew.
``measure`` writes the file; a test simulates lines of it again.
"""

from __future__ import annotations

import csv
import functools
from pathlib import Path
from typing import Any

from benchmark.circuits.transfer import functional, transfer_curve
from benchmark.circuits.transient import chain_transient, headline_difference
from tests.ngspice.benches import Bench, bench, quasi_static
from tests.validation.check import Check

__all__ = ["CASES", "PATH", "checks", "measure", "name_of", "simulate", "stored"]

PATH = Path(__file__).parent.parent / "data" / "same-equations.csv"
SOURCE = "own simulation, ngspice 39.3, deck of tests/ngspice/benches.py; SI"
#: set, node, supply [V], what is unlike the usual stage
CASES: tuple[tuple[str, str, float, dict[str, Any]], ...] = (
    ("open-7nm-regular", "n7", 0.3, {}),
    ("open-7nm-regular", "n7", 0.5, {}),
    ("open-7nm-regular", "n7", 0.7, {}),
    ("silicon-45nm-high-performance", "n45", 0.5, {}),
    ("silicon-45nm-high-performance", "n45", 1.0, {}),
    ("demo-stress-gated", "g1", 0.45, {"actuator": False}),
    ("demo-stress-gated", "g1", 0.6, {}),
    ("demo-steep-swing", "g1", 0.3, {}),
    ("demo-given", "g1", 0.5, {}),
    ("demo-table", "g1", 0.3, {}),
)
#: agreement asked for: of the two solvers, and of margins as a share of the supply
AGREED, SHARE = 2e-3, 2e-3
NUMBERS = (
    *("delay_falling", "delay_rising", "delay", "switching_energy", "leakage_power", "switching_voltage"),
    *("noise_margin_low", "noise_margin_high", "gain"),
)
UNITS = {"delay": "s", "switching_energy": "J", "leakage_power": "W", "gain": "1"}


def name_of(case: tuple[str, str, float, dict[str, Any]]) -> str:
    """Name a case."""
    technology, node, supply, how = case
    more = ", actuator as a pure delay" if how else ""
    return f"{technology}, {node}, {supply:g} V{more}"


def _bench(case: tuple[str, str, float, dict[str, Any]]) -> Bench:
    technology, node, supply, how = case
    return bench(technology, node, supply, **how)


def simulate(case: tuple[str, str, float, dict[str, Any]]) -> dict[str, float]:
    """Return what ngspice finds."""
    found = _bench(case).chain()
    return {name: found[name] for name in NUMBERS}


def measure() -> None:
    """Simulate every case and write the file."""
    with PATH.open("w", newline="", encoding="utf-8") as stream:
        writer = csv.writer(stream, lineterminator="\n")
        writer.writerow(("case", *NUMBERS, "source"))
        for case in CASES:
            found = simulate(case)
            writer.writerow((name_of(case), *(f"{found[name]:.8g}" for name in NUMBERS), SOURCE))
    stored.cache_clear()


@functools.lru_cache(maxsize=1)
def stored() -> dict[str, dict[str, float]]:
    """Read the file: name of the case -> numbers."""
    with PATH.open(newline="", encoding="utf-8") as stream:
        return {row["case"]: {name: float(row[name]) for name in NUMBERS} for row in csv.DictReader(stream)}


def _obtained(case: tuple[str, str, float, dict[str, Any]]) -> dict[str, float]:
    one = _bench(case)
    time = float(one.pair.down.resistance.item()) * one.load().total
    # an actuator far faster than R C moves in ngspice and is a transport delay here
    pair = quasi_static(one.pair) if one.pair.down.natural_frequency.item() * time > 1e3 else one.pair
    here, closed = chain_transient(pair, one.load()), one.estimate()
    delay = here.delay
    if case is CASES[0]:  # the difference that reports state, taken off again
        closed_delay = closed.path_delay.item()
        delay = closed_delay / (1.0 + headline_difference(closed_delay, pair, one.load()))
    static, margins = transfer_curve(one.pair, points=401), functional(one.pair, 1, "accurate")
    return {
        "delay_falling": here.falling_delay,
        "delay_rising": here.rising_delay,
        "delay": delay,
        "switching_energy": here.switching_energy,
        "leakage_power": closed.leakage_power_parts["path"].item(),
        "switching_voltage": static.switching_voltage.item(),
        "noise_margin_low": margins.noise_margin_low.item(),
        "noise_margin_high": margins.noise_margin_high.item(),
        "gain": static.gain.item(),
    }


def checks() -> list[Check]:
    """Every number of every case; noise margins not where hysteresis takes part of them, which a deck does not know."""
    found = []
    for case in CASES:
        expected, obtained = stored()[name_of(case)], _obtained(case)
        down = _bench(case).pair.down
        window = bool((down.opening_voltage != down.closing_voltage).any())
        for name in NUMBERS:
            if window and name.startswith("noise"):
                continue
            share = name.startswith("noise") or name == "switching_voltage"
            allowed = SHARE * case[2] if share else (1e-2 if name == "gain" else AGREED) * expected[name]
            basis = (
                "0.2 % of the supply" if share else "1 %, steepest slope of 401 points" if name == "gain" else "0.2 %"
            )
            unit = next((unit for start, unit in UNITS.items() if name.startswith(start)), "V")
            found.append(
                Check(
                    "simulator, same equations", name_of(case), f"{name.replace('_', ' ')}, {name_of(case)} [{unit}]",
                    SOURCE, "simulated", expected[name], obtained[name], allowed, f"agreement of solvers: {basis}",
                )
            )  # fmt: skip
    return found
