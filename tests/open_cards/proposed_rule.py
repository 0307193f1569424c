"""Another closed form of the delay, beside the one in use: a comparison, not a check, because its numbers are fitted.

In use: C V / (2 I_eff) with a weight m of the driven drain edge that falls to 0.85 and so also makes up for the
effective current, which is 5 to 16 % low for a constant load. A load that does not move with a gate (a wire) has no
drain edge to make up with. Here the two are kept apart, and the currents of the ratio are taken at one drain voltage,
so that barrier lowering cancels:

    q = min(I(3V/4, 3V/4) / I(V, 3V/4), 0.34)
    t = C V / [2 (1.01 + 0.225 q) I_eff],   m = 2.37 - 3.04 q

Fitted (smallest largest difference) to the delays of six sets, 45, 32 and 7 nm, 0.3 to 1.0 V, and to the delay per
linear load of the open 45 nm cards. Not fitted: 16 nm, the open 45 nm cards of other thresholds, and the stored series
of invented transistors.
"""

from __future__ import annotations

import tempfile
from pathlib import Path

import numpy as np

from benchmark.devices.record import Switch
from benchmark.physics import drive
from benchmark.record.load import load_technology
from tests.open_cards.engine import pair_at
from tests.open_cards.freepdk45 import ROOT, SET, text
from tests.open_cards.open_45nm import APART, FLAVOURS, LOADS, NOW, SOURCE, measured_chain, written
from tests.open_cards.predictive import CARDS
from tests.open_cards.row import Row, read_csv
from tests.unit import test_virtual_source_series as invented

__all__ = ["rule_rows"]

CAP, WEIGHT, SLOPE, DRIVE, GROWTH = 0.34, 2.37, 3.04, 1.01, 0.225
NOTE = "proposed rule, not in use; fitted to these rows"
FREE = "proposed rule, not in use; no part in its fit"


def _ratio(switch: Switch, supply: float) -> float:
    control, path = supply * np.array([[[[0.75, 1.0]]]]), supply * np.array([[[[0.75, 0.75]]]])
    middle, high = switch.current(control, path).ravel().tolist()
    return min(float(middle / high), CAP)


def _rule(name: str, supply: float, *folders: Path) -> tuple[float, float]:
    """Delay of the fan-out-of-four stage [s] and delay per linear load [s/F]."""
    pair, values = pair_at(name, supply, *folders), load_technology(name, *folders)
    known = values.at(values.nodes[0])
    edge = float(known["overlap_capacitance"].si[0] * known["unit_width"].si[0])
    load = slowness = 0.0
    ratios = [_ratio(switch, supply) for switch in (pair.down, pair.up)]
    for switch, q in zip((pair.down, pair.up), ratios, strict=True):
        held = switch.intermediates["drain-edge weight in delay"][0].item()
        load += 4.0 * (switch.input_capacitance_delay.item() + (WEIGHT - SLOPE * q - held) * edge)
        load += switch.terminal_capacitance_delay.item()
        slowness += 0.25 * supply / switch.intermediates["effective current"][0].item()
    slowness /= DRIVE + GROWTH * float(np.mean(ratios))
    return load * slowness, slowness


def _card_rows() -> list[Row]:
    sets = {cards.title: (cards.name, (ROOT,), cards.nominal) for cards in CARDS}
    sets["open 45 nm"] = (SET, (ROOT,), 1.0)
    rows = []
    for row in read_csv("fo4-planar-cards.csv"):
        name, folders, _ = sets[row["cards"]]
        supply = float(row["supply_V"])
        if supply < 0.3:
            continue
        free = row["cards"] == "predictive 16 nm"
        delay, at = _rule(name, supply, *folders)[0], f"{row['cards']}, {supply:.2f} V"
        note, allowed = (FREE, 0.20) if free else (NOTE, 0.075)
        rows.append(
            Row(f"delay, {at} [s]", row["source"], "simulated", float(row["delay_ps"]) * 1e-12, delay, allowed, note)
        )
    for row in read_csv("fo4-open-7nm.csv"):
        supply, flavour = float(row["supply_V"]), row["flavour"]
        if supply < 0.3 or flavour == "low-leakage":
            continue
        delay, at = _rule(f"open-7nm-{flavour}", supply)[0], f"open 7 nm kit, {flavour}, {supply:.2f} V"
        seen = float(row["delay_ps"]) * 1e-12
        rows.append(Row(f"delay, {at} [s]", row["source"], "simulated", seen, delay, 0.075, NOTE))
    return rows


def _load_rows() -> list[Row]:
    rows = []
    for supply in APART:
        low, high = (measured_chain(supply, load).delay for load in LOADS)
        growth, name = (high - low) / (LOADS[1] - LOADS[0]), f"delay per linear load, open 45 nm, {supply:.1f} V [s/F]"
        rows.append(Row(name, SOURCE, NOW, growth, _rule(SET, supply, ROOT)[1], 0.075, NOTE))
    return rows


def _held_out_rows() -> list[Row]:
    """Low and high threshold of the open 45 nm cards: delay, and delay per linear load."""
    rows = []
    with tempfile.TemporaryDirectory() as folder:
        for flavour in FLAVOURS:
            place = written(Path(folder) / flavour, text(False, flavour=flavour))
            for supply in APART:
                seen, low, high = (measured_chain(supply, load, flavour=flavour).delay for load in (0.0, *LOADS))
                growth, at = (high - low) / (LOADS[1] - LOADS[0]), f"open 45 nm, {flavour}, {supply:.1f} V"
                delay, slope = _rule(SET, supply, place)
                rows += [
                    Row(f"delay, {at} [s]", SOURCE, NOW, seen, delay, 0.10, FREE),
                    Row(f"delay per linear load, {at} [s/F]", SOURCE, NOW, growth, slope, 0.11, FREE),
                ]
    return rows


def _invented_rows() -> list[Row]:
    """Stored series of invented transistors: charge that follows the gate, and a constant load."""
    rows = []
    for name, supply, known in invented.ROWS:
        if supply < 0.3:
            continue
        pair = invented.SETS[name]
        load = constant = slowness = 0.0
        ratios = []
        for t in (pair.n, pair.p):
            middle, high = (float(invented._current(t, share * supply, 0.75 * supply)) for share in (0.75, 1.0))
            q = min(middle / high, CAP)
            ratios.append(q)
            gate = drive.switching_capacitance(t, np.float64(supply), pair.edge, WEIGHT - SLOPE * q)
            load += 4.0 * float(gate) + (drive.OUTPUT_WEIGHT * pair.edge + pair.junction) * float(t.width)
            whole = t.inversion_capacitance * t.length + 2.0 * pair.edge
            constant += float(t.width * (4.0 * whole + pair.junction))
            slowness += 0.25 * supply / invented._effective(t, supply)
        slowness /= DRIVE + GROWTH * float(np.mean(ratios))
        flat = 0.5e-12 * (known["lumped_delay_falling_ps"] + known["lumped_delay_rising_ps"])
        origin, at = "stored series of invented transistors, ngspice 39.3", f"{name}, {supply:.2f} V"
        moving = known["charge_delay_ps"] * 1e-12
        rows += [
            Row(f"delay, moving charge, {at} [s]", origin, "simulated", moving, load * slowness, 0.10, FREE),
            Row(f"delay, constant load, {at} [s]", origin, "simulated", flat, constant * slowness, 0.08, FREE),
        ]
    return rows


def rule_rows() -> list[Row]:
    """Delay by the proposed rule, everywhere it was compared."""
    return [*_card_rows(), *_load_rows(), *_held_out_rows(), *_invented_rows()]
