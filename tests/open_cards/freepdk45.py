"""A set extracted from the open 45 nm cards: currents and small-signal capacitances, never a delay or an energy.

``python -m tests.open_cards.freepdk45`` measures in ngspice and writes the set again.

Currents are read at the source: the drain of a closed device also loses current to the gate by tunnelling, 11 times the
channel's at 1 V for the n type of high threshold, and a threshold solved from that would be far too low.

Capacitances, each the mean of both polarities per mean width:

- full swing of the gate with the drain moving the other way, at the declared supply: the charge between (gate 0,
  drain V) and (gate V, drain 0), integrated from the small-signal capacitances;
- one edge: gate-drain capacitance at zero bias. The cards' edge depends on its voltage (0.26 to 0.47 fF/um from -1 to
  +0.3 V) and below threshold the gate also sees 0.13 fF/um to the body, which the model does not have; ``EDGES`` names
  two other readings of the same curve, whose residuals are compared;
- one terminal: drain capacitance less the gate-drain part, mean over the swing at the declared supply.
"""

from __future__ import annotations

from collections.abc import Iterable
from functools import lru_cache
from pathlib import Path
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from tests.open_cards import card
from tests.open_cards.fit import UNITS, Capacitance, Curves, fit
from tests.open_cards.set_text import AnchorLine, Line, set_text

__all__ = ["EDGES", "PLACE", "ROOT", "SET", "SUPPLIES", "capacitance", "curves", "main", "measured_chain", "text"]

Array = NDArray[np.float64]

ROOT = Path(__file__).parent.parent / "data" / "open-cards"
SET = "open-45nm-card"
PLACE = ROOT / "technologies" / f"{SET}.toml"
SUPPLIES = (0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9, 1.0)
DECLARED = 1.0
#: drawn 50 nm, 20 nm shorter as etched, 3.75 nm of diffusion at each side (lines xl and lint of the cards)
CHANNEL_LENGTH = 22.5e-9
MEAN_WIDTH = 0.5 * (card.WIDTHS["n"] + card.WIDTHS["p"])
#: readings of the gate-drain capacitance: the one used first
EDGES = ("zero bias", "mean of the drain's swing", "a third of the gate's swing below threshold")


@lru_cache(maxsize=4)
def curves(flavour: card.Flavour = "VTG", terminal: Literal["d", "s"] = "s") -> dict[str, Curves]:
    """On-, off- and effective current of the cards per mean width, read at the source unless said otherwise."""
    axis = np.round(np.linspace(0.0, 1.0, 21), 6)
    volts = np.array(SUPPLIES)
    whole, half = np.round(volts / 0.05).astype(int), np.round(volts / 0.1).astype(int)
    found = {}
    for polarity in ("n", "p"):
        grid = card.currents(polarity, axis, axis, flavour, terminal) / MEAN_WIDTH
        effective = 0.5 * (grid[whole, half] + grid[half, whole])
        found[polarity] = Curves(volts, grid[whole, whole], grid[0, whole], effective)
    return found


@lru_cache(maxsize=16)
def capacitance(reading: str = EDGES[0], supply: float = DECLARED, flavour: card.Flavour = "VTG") -> Capacitance:
    """Measured capacitances per mean width; ``supply``: that of the full swings."""
    axis = np.linspace(0.0, supply, 41)
    gate = edge = terminal = 0.0
    low = np.linspace(0.0, 0.2, 9)
    for polarity in ("n", "p"):
        by_gate, _, _ = card.capacitances(polarity, axis, 0.0 * axis, flavour)
        _, by_drain, drain = card.capacitances(polarity, 0.0 * axis, axis, flavour)
        gate += np.trapezoid(by_gate + by_drain, axis) / supply
        terminal += np.trapezoid(drain - by_drain, axis) / supply
        if reading == EDGES[0]:
            edge += by_drain[0]
        elif reading == EDGES[1]:
            edge += np.trapezoid(by_drain, axis) / supply
        else:
            weak_gate, _, _ = card.capacitances(polarity, low, 0.0 * low, flavour)
            _, weak_drain, _ = card.capacitances(polarity, 0.0 * low, low, flavour)
            edge += np.trapezoid(weak_gate + weak_drain, low) / (3.0 * low[-1])
    scale = 1.0 / (2.0 * MEAN_WIDTH)
    return Capacitance(float(gate * scale), float(edge * scale), float(terminal * scale))


@lru_cache(maxsize=64)
def measured_chain(
    supply: float, added: float = 0.0, tunnelling: bool = True, flavour: card.Flavour = "VTG"
) -> card.Chain:
    """Fan-out-of-four stage of the cards at one supply of ``SUPPLIES``; see ``card.chain``."""
    k = SUPPLIES.index(supply)
    current = 2.0 / sum(1.0 / curves(flavour)[p].effective[k] for p in ("n", "p")) * MEAN_WIDTH
    return card.chain(supply, float((10e-15 + added) * supply / (2.0 * current)), added, tunnelling, flavour)


def _lines(measured: Capacitance, flavour: card.Flavour) -> dict[str, Line]:
    known = curves(flavour)
    values, spread = fit(known, CHANNEL_LENGTH, card.CELSIUS + 273.15, lambda _: measured)
    card_source = "open-45nm-card"

    def seen(number: float, unit: str, conditions: str) -> Line:
        return Line(number, unit, "simulated", card_source, f"typical corner, {flavour}", conditions)

    at_declared = "1.0 V, 27 degC, per mean width of n (0.5 um) and p (1.0 um)"
    lines = {
        "unit_width": Line(
            MEAN_WIDTH * 1e9, "nm", "choice", "project-choice", conditions="mean of 0.5 um (n) and 1.0 um (p)"
        ),
        "gate_length": Line(50.0, "nm", "published", card_source, "drawn"),
        "gate_length_correction": Line(27.5, "nm", "published", card_source, "lines xl and lint"),
        "declared_supply": Line(DECLARED, "V", "choice", "project-choice"),
        "on_current": seen(known["n"].on[-1], "uA/um", at_declared),
        "on_current_p": seen(known["p"].on[-1], "uA/um", at_declared),
        "off_current": seen(known["n"].off[-1] * 1e3, "nA/um", at_declared),
        "off_current_p": seen(known["p"].off[-1] * 1e3, "nA/um", at_declared),
        "gate_capacitance_total": seen(
            measured.gate * 1e9, "fF/um", "small-signal, full swing with the drain moving the other way, 1.0 V"
        ),
        "overlap_capacitance": seen(measured.edge * 1e9, "fF/um", "small-signal gate-drain capacitance at zero bias"),
        "terminal_capacitance_per_width": seen(
            measured.terminal * 1e9, "fF/um", "drain less gate-drain capacitance, mean over 1.0 V"
        ),
    }
    note = f"least squares of on-, off- and effective current, 0.3 to 1.0 V, both polarities; rms {spread * 100:.2g} %"
    for name, value in values.items():
        factor, unit = UNITS.get(name.removesuffix("_p"), (1.0, "1"))
        lines[name] = Line(value * factor, unit, "extracted", card_source, "currents of the cards", note=note)
    # A/m is uA/um
    return lines


def text(with_anchors: bool = True, reading: str = EDGES[0], flavour: card.Flavour = "VTG") -> str:
    """Return the set as a file. ``reading``: which gate-drain capacitance is the edge."""
    header = {
        "comment": "Extracted from the open 45 nm cards; written by tests/open_cards/freepdk45.py, not by hand.",
        "id": SET,
        "title": "Open 45 nm cards, extracted from direct currents and small-signal capacitances",
        "node": "n45",
        "flavour": "card",
        "note": "No delay or energy was used. One width, one edge and one access resistance for both polarities.",
    }
    anchors: Iterable[AnchorLine] = (
        line
        for supply in (SUPPLIES if with_anchors else ())
        for line in (
            AnchorLine("fan_out_4_delay", supply, measured_chain(supply, flavour=flavour).delay * 1e12, "ps"),
            AnchorLine("fan_out_4_energy", supply, measured_chain(supply, flavour=flavour).energy * 1e15, "fJ"),
        )
    )
    where = "third stage of the chain 1:4:16:64:256, no wires, 27 degC; energy per cycle without leakage"
    return set_text(
        header, card.CELSIUS, _lines(capacitance(reading, flavour=flavour), flavour), anchors, "open-45nm-card", where
    )


def main() -> None:
    """Measure and write the set."""
    PLACE.parent.mkdir(parents=True, exist_ok=True)
    PLACE.write_text(text(), encoding="utf-8")


if __name__ == "__main__":
    main()
