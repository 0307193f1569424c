"""Comparisons with the open 45 nm cards, simulated in ngspice in the same run.

The set (``freepdk45``) saw direct currents and small-signal capacitances only. Delay and energy of the fan-out-of-four
stage are predictions; the further rows take them apart: the drive alone (how the delay grows with a linear load), the
capacitance alone (delay over that growth), the leakage with and without current through the gate.
"""

from __future__ import annotations

from functools import lru_cache
from pathlib import Path

import numpy as np

from benchmark.devices.record import Switch
from benchmark.physics.drive import ENERGY_WEIGHT
from tests.open_cards.card import Flavour
from tests.open_cards.engine import Stage, pair_at, stage
from tests.open_cards.fit import Curves
from tests.open_cards.freepdk45 import EDGES, MEAN_WIDTH, ROOT, SET, SUPPLIES, capacitance, curves, measured_chain, text
from tests.open_cards.row import Row, read_csv

__all__ = [
    "apart",
    "current_rows",
    "deck_rows",
    "edge_rows",
    "held_out_rows",
    "prediction_rows",
    "solved_rows",
    "written",
]

SOURCE = "open 45 nm cards (package c4m-pdk-freepdk45 0.0.1, Apache-2.0), ngspice 39, BSIM4v5, 27 degC"
NOW = "simulated now"
#: linear loads per unit inverter between which the growth of the delay is taken [F]: about 1 and 2 stages
LOADS = (10e-15, 20e-15)
#: supplies at which the prediction is taken apart
APART = (0.4, 0.6, 0.8, 1.0)
#: cards that had no part in settling how a set is extracted
FLAVOURS: tuple[Flavour, ...] = ("VTL", "VTH")


def prediction_rows() -> list[Row]:
    """Delay and energy per cycle of the stage over supply."""
    rows = []
    for supply in SUPPLIES:
        seen, here = measured_chain(supply), stage(pair_at(SET, supply, ROOT))
        at = f"at {supply:.1f} V"
        rows += [
            Row(f"fan-out-of-four delay {at} [s]", SOURCE, NOW, seen.delay, here.delay, 0.05),
            Row(f"fan-out-of-four energy per cycle {at} [J]", SOURCE, NOW, seen.energy, here.energy, 0.10),
        ]
    return rows


def _currents(switch: Switch, supply: float) -> tuple[float, float, float]:
    control = supply * np.array([[[[1.0, 0.0, 1.0, 0.5]]]])
    path = supply * np.array([[[[1.0, 1.0, 0.5, 1.0]]]])
    on, off, high, low = (switch.current(control, path) / MEAN_WIDTH).ravel().tolist()
    return on, off, 0.5 * (high + low)


def current_rows() -> list[Row]:
    """On-, off- and effective current of both polarities over supply: what the set was fitted to."""
    rows = []
    for k, supply in enumerate(SUPPLIES):
        pair = pair_at(SET, supply, ROOT)
        for polarity, switch in (("n", pair.down), ("p", pair.up)):
            known: Curves = curves()[polarity]
            seen = (known.on[k], known.off[k], known.effective[k])
            for kind, expected, obtained in zip(
                ("on", "off", "effective"), seen, _currents(switch, supply), strict=True
            ):
                name = f"{kind}-current {polarity} at {supply:.1f} V [A/m]"
                rows.append(Row(name, SOURCE, NOW, float(expected), obtained, 0.04, "fitted"))
    return rows


def _energy_from_charges(supply: float, flavour: Flavour = "VTG") -> float:
    """Energy per cycle [J] by the program's weights of the drain edge, charges as measured at this supply."""
    c = capacitance(EDGES[0], supply, flavour)
    driven = 4.0 * (c.gate - (2.0 - ENERGY_WEIGHT) * c.edge)
    return 2.0 * MEAN_WIDTH * (driven + ENERGY_WEIGHT * c.edge + c.terminal) * supply**2


def apart(supply: float) -> list[Row]:
    """Second measurements at one supply that say where the differences of the stage come from."""
    pair, at = pair_at(SET, supply, ROOT), f"at {supply:.1f} V"
    seen, first, second = (measured_chain(supply, added) for added in (0.0, *LOADS))
    here, here_first, here_second = (stage(pair, added) for added in (0.0, *LOADS))
    step = LOADS[1] - LOADS[0]
    growth, here_growth = (second.delay - first.delay) / step, (here_second.delay - here_first.delay) / step
    resting = measured_chain(supply, 0.0, False)
    delay, energy = f"fan-out-of-four delay {at} [s]", f"fan-out-of-four energy per cycle {at} [J]"
    return [
        Row(
            f"delay per linear load {at} [s/F]", SOURCE, NOW, growth, here_growth, 0.18,
            "drive alone: V / (2 I_eff) is slow for a load that is constant (stated: -5 to +14 %)", delay,
        ),
        Row(
            f"the same with 1.1 times the effective current {at} [s/F]", SOURCE, NOW, growth, here_growth / 1.1, 0.07,
            "a rule for constant loads that would halve the difference; not in use", delay,
        ),
        Row(
            f"delay over delay per linear load {at} [F]", SOURCE, NOW, seen.delay / growth,
            here.delay / here_growth, 0.18,
            "capacitance alone: the weight of the drain edge is small where the drive is slow, by construction", delay,
        ),
        Row(
            f"energy per linear load {at} [J/F]", SOURCE, NOW, (second.energy - first.energy) / step,
            (here_second.energy - here_first.energy) / step, 0.02,
            "V squared; the rest is short circuit", energy,
        ),
        Row(
            f"energy per cycle from the cards' charges at the same supply {at} [J]", SOURCE, NOW, seen.energy,
            _energy_from_charges(supply), 0.045,
            "the rule with measured full swings of gate and drain at this supply: the rest is one constant edge and "
            "terminal, and no charge to the body below threshold", energy,
        ),
        Row(
            f"leakage power {at} [W]", SOURCE, NOW, seen.leakage, here.leakage, 0.36,
            "the cards tunnel through the gate, the model does not",
        ),
        Row(
            f"leakage power without current through the gate {at} [W]", SOURCE, NOW, resting.leakage,
            here.leakage, 0.08, "off-currents alone", f"leakage power {at} [W]",
        ),
    ]  # fmt: skip


@lru_cache(maxsize=1)
def solved_rows() -> tuple[Row, ...]:
    """Delay rule ``transient`` at one supply: the program's own differential equations with the same constants.

    The growth with a linear load is right to the error of the currents, so the closed form is what is slow there. The
    delay without added load is too short, because the weight of the drain edge was made for the closed form and also
    makes up for its slow drive.
    """
    supply = 0.8
    pair, at = pair_at(SET, supply, ROOT), f"at {supply:.1f} V"
    none, first, second = (stage(pair, added, "transient").delay for added in (0.0, *LOADS))
    seen = [measured_chain(supply, added).delay for added in (0.0, *LOADS)]
    step, delay = LOADS[1] - LOADS[0], f"fan-out-of-four delay {at} [s]"
    return (
        Row(
            f"delay per linear load, differential equation, {at} [s/F]", SOURCE, NOW, (seen[2] - seen[1]) / step,
            (second - first) / step, 0.06, "drive alone, solved", f"delay per linear load {at} [s/F]",
        ),
        Row(
            f"fan-out-of-four delay, differential equation, {at} [s]", SOURCE, NOW, seen[0], none, 0.14,
            "the weight of the drain edge belongs to the closed form", delay,
        ),
    )  # fmt: skip


def written(place: Path, words: str) -> Path:
    """Write a set into a folder of its own and return the folder."""
    (place / "technologies").mkdir(parents=True)
    (place / "technologies" / f"{SET}.toml").write_text(words, encoding="utf-8")
    (place / "sources.toml").write_text((ROOT / "sources.toml").read_text(encoding="utf-8"), encoding="utf-8")
    return place


def held_out_rows(folder: Path) -> list[Row]:
    """Low and high threshold of the same file, extracted by the same rules. ``folder``: where the sets are written.

    The rules were settled on the regular threshold, except one: that currents are read at the source was learnt on the
    high threshold, where off-currents of the drain gave delays 31 % too long at 0.4 V. Its energy misses 10 % below
    threshold, where the gate sees the body; with the charges measured at the same supply it does not.
    """
    rows = []
    for flavour in FLAVOURS:
        place = written(folder / flavour, text(False, flavour=flavour))
        for supply in SUPPLIES[1:]:
            seen, here = measured_chain(supply, flavour=flavour), stage(pair_at(SET, supply, place))
            at, allowed = f"{flavour}, at {supply:.1f} V", 0.17 if flavour == "VTH" else 0.10
            name, own = f"fan-out-of-four energy per cycle, {at} [J]", _energy_from_charges(supply, flavour)
            note = "with the cards' charges at the same supply, without short circuit"
            rows += [
                Row(f"fan-out-of-four delay, {at} [s]", SOURCE, NOW, seen.delay, here.delay, 0.10),
                Row(name, SOURCE, NOW, seen.energy, here.energy, allowed),
                Row(f"the same from charges: {name}", SOURCE, NOW, seen.energy, own, 0.07, note, name),
            ]
    return rows


def edge_rows(folder: Path) -> list[Row]:
    """Delay and energy with other readings of the gate-drain capacitance; ``folder``: where the sets are written."""
    rows = []
    for number, reading in enumerate(EDGES[1:]):
        place = written(folder / f"reading-{number}", text(False, reading))
        for supply in (0.4, 0.6, 1.0):
            seen, here = measured_chain(supply), stage(pair_at(SET, supply, place))
            note = f"edge: {reading}"
            rows += _edge_pair(supply, seen.delay, seen.energy, here, note)
    return rows


def _edge_pair(supply: float, delay: float, energy: float, here: Stage, note: str) -> list[Row]:
    at = f"at {supply:.1f} V"
    return [
        Row(f"delay, other edge capacitance, {at} [s]", SOURCE, NOW, delay, here.delay, 0.30, note, "capacitance"),
        Row(f"energy, other edge capacitance, {at} [J]", SOURCE, NOW, energy, here.energy, 0.30, note, "capacitance"),
    ]


def deck_rows() -> list[Row]:
    """The decks written here against the stored series of the same cards from other decks."""
    rows = []
    for row in read_csv("fo4-planar-cards.csv"):
        supply = float(row["supply_V"])
        if row["cards"] != "open 45 nm" or supply not in SUPPLIES:
            continue
        seen, at = measured_chain(supply), f"at {supply:.1f} V"
        origin, status = row["source"], row["status"]
        delay, energy = float(row["delay_ps"]) * 1e-12, float(row["energy_per_cycle_without_leakage_fJ"]) * 1e-15
        rows += [
            Row(f"simulated delay {at} [s]", origin, status, delay, seen.delay, 1e-3),
            Row(f"simulated energy {at} [J]", origin, status, energy, seen.energy, 2e-3),
        ]
        rows += [
            Row(
                f"simulated {kind}-current {polarity} {at} [A]",
                origin,
                status,
                float(row[f"{kind}_{polarity}_{unit}"]) * scale,
                float(getattr(curves(terminal="d")[polarity], kind)[SUPPLIES.index(supply)] * MEAN_WIDTH),
                1e-4,
            )
            for polarity in ("n", "p")
            for kind, unit, scale in (("on", "uA", 1e-6), ("off", "nA", 1e-9), ("effective", "uA", 1e-6))
        ]
    return rows
