"""Published scaling factors against supply: A. Stillmaker and B. Baas, Integration 58 (2017) 74.

Delay factor: cubic in the supply, energy factor: square, by node. Only ratios at one node are used (the units of the
factors were not seen), from the supply ``base`` down to three quarters of it: the cubics turn up at high supplies
(45 nm above 0.95 V, 32 nm above 0.85 V) and are no longer a transistor's near threshold. The coefficients are a
restatement; the authors' erratum page prints two energy factors and their ratio, which the restated ones must give.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np

from tests.open_cards.engine import pair_at, stage
from tests.open_cards.row import DATA, Row, read_csv

__all__ = ["delay_factor", "energy_factor", "printed_rows", "ratio_rows"]

SOURCE = "A. Stillmaker and B. Baas, Integration 58 (2017) 74"
#: lowest supply over the base
LOWEST = 0.75


@lru_cache(maxsize=1)
def _table() -> dict[str, dict[str, str]]:
    return {row["node"]: row for row in read_csv("scaling-factors-2017.csv")}


def delay_factor(node: str, supply: float) -> float:
    """Delay factor of a node [1], supply in volts; only where the cubic still falls."""
    row = _table()[node]
    assert supply <= float(row["delay_falls_to_V"]), f"the cubic of {node} no longer falls at {supply} V"
    return float(np.polyval([float(row[f"delay_a{k}"]) for k in (3, 2, 1, 0)], supply))


def energy_factor(node: str, supply: float) -> float:
    """Energy factor of a node [1], supply in volts."""
    row = _table()[node]
    return float(np.polyval([float(row[f"energy_b{k}"]) for k in (2, 1, 0)], supply))


def printed_rows() -> list[Row]:
    """The example of the authors' erratum page (read there): 32 nm at 0.9 V, 65 nm at 1.3 V, 1 pJ scaled."""
    first, second = energy_factor("HP32", 0.9), energy_factor("65", 1.3)
    origin = f"{SOURCE}, erratum page of the authors"
    return [
        Row("energy factor, 32 nm, 0.9 V [1]", origin, "published", 0.4571, first, 0.00005 / 0.4571),
        Row("energy factor, 65 nm, 1.3 V [1]", origin, "published", 2.604, second, 0.0005 / 2.604),
        Row("energy of the example [pJ]", origin, "published", 0.1755, first / second, 0.0001 / 0.1755),
    ]


@dataclass(frozen=True)
class Pair:
    """A node of the source and our nearest set; ratios to ``base`` [V]; allowed differences and a note."""

    node: str
    name: str
    base: float
    delay: float
    energy: float
    note: str = ""
    stored: str = ""


PAIRS = (
    Pair("HP20", "silicon-22nm-tri-gate", 0.8, 0.10, 0.05, "silicon against predictive cards, 22 against 20 nm"),
    Pair("HP16", "silicon-14nm-finfet", 0.8, 0.05, 0.05, "silicon against predictive cards, 14 against 16 nm"),
    Pair("HP14", "silicon-14nm-finfet", 0.8, 0.05, 0.05, "silicon against predictive cards"),
    Pair("HP7", "open-7nm-regular", 0.7, 0.08, 0.05, "the threshold of the source is not stated"),
    Pair("HP7", "open-7nm-low", 0.7, 0.08, 0.05, "the threshold of the source is not stated"),
    Pair("HP7", "open-7nm-super-low", 0.7, 0.08, 0.05, "the threshold of the source is not stated"),
    Pair("HP45", "predictive-45nm-card", 0.9, 0.25, 0.10, "same kind of card", "predictive 45 nm"),
    Pair("HP32", "predictive-32nm-card", 0.8, 0.52, 0.10, "same kind of card", "predictive 32 nm"),
    Pair("LP45", "silicon-45nm-low-power", 1.1, 0.25, 0.15, "silicon leaks 30 times more than the cards behind it"),
    Pair("LP32", "silicon-32nm-low-power", 1.0, 0.25, 0.20, "silicon leaks 30 times more than the cards behind it"),
)


def _supplies(base: float) -> list[float]:
    return [v for v in (1.0, 0.9, 0.8, 0.7, 0.6) if LOWEST * base <= v + 1e-9 and v < base]


def ratio_rows() -> list[Row]:
    """Delay and energy ratios of our nearest sets, and of the stored simulations where the cards are of that kind."""
    rows = []
    for pair in PAIRS:
        folders = (DATA / "open-cards",) if pair.stored else ()
        base = stage(pair_at(pair.name, pair.base, *folders))
        stored = {
            float(row["supply_V"]): float(row["delay_ps"])
            for row in read_csv("fo4-planar-cards.csv")
            if row["cards"] == pair.stored
        }
        for supply in _supplies(pair.base):
            here, at = stage(pair_at(pair.name, supply, *folders)), f"{pair.node} by {pair.name}, {supply:.1f} V"
            delay = delay_factor(pair.node, supply) / delay_factor(pair.node, pair.base)
            energy = energy_factor(pair.node, supply) / energy_factor(pair.node, pair.base)
            name = f"delay over that at {pair.base:.1f} V, {at} [1]"
            rows += [
                Row(name, SOURCE, "published", delay, here.delay / base.delay, pair.delay, pair.note),
                Row(
                    f"energy over that at {pair.base:.1f} V, {at} [1]",
                    SOURCE,
                    "published",
                    energy,
                    here.energy / base.energy,
                    pair.energy,
                    pair.note,
                ),
            ]
            if stored:
                found = stored[supply] / stored[pair.base]
                note = "simulation of such cards against the cubic: the cubic is what differs"
                rows += [
                    Row(f"simulated: {name}", SOURCE, "published", delay, found, pair.delay, note, name),
                    Row(
                        f"against the simulation: {name}",
                        "stored simulation of the predictive cards, ngspice 39, BSIM4, 27 degC",
                        "simulated",
                        found,
                        here.delay / base.delay,
                        0.10,
                        "the same ratio without the cubic",
                        name,
                    ),
                ]
    return rows
