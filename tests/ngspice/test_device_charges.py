"""Decks with the charges of the device itself: coupling and charge that follows the voltages."""

from __future__ import annotations

import numpy as np
import pytest

from benchmark.circuits.cells import cell
from benchmark.circuits.deck import DeckStage, Pace, chain_deck
from benchmark.circuits.deck_control import CHAIN_RESULTS
from benchmark.devices.netlist.parts import SubCircuits
from benchmark.devices.netlist.virtual_source import transistor_text
from benchmark.physics import virtual_source as vs
from tests.ngspice.benches import bench
from tests.ngspice.runner import run_deck
from tests.unit import test_miller_weight as chains

pytestmark = pytest.mark.spice


@pytest.mark.parametrize(("name", "supply"), [("planar 32 nm", 1.0), ("fin 7 nm regular", 0.35)])
def test_nonlinear_charge_solved_by_ngspice_and_by_an_ode_solver(name, supply):
    """Fan-out 4 with the channel charge of both transistors: 0.1 % (measured 1e-4 and 6e-4)."""
    n, p, edge, _ = chains.PAIRS[name]
    closed = chains._closed_form(n, p, edge, supply)
    here = chains._Chain(n, p, edge, supply).delay(2.0 * closed)
    texts = SubCircuits(transistor_text(n, "down", edge, 0.0), transistor_text(p, "up", edge, 0.0))
    none = {"down": 0.0, "up": 0.0}
    stage = DeckStage(cell("inverter"), "a", 1.0, "unit", 0.0, 0.0, 0.0, 0.0, none, chains.FAN_OUT, "device")
    current = float(vs.drain_current(n, np.asarray(supply), np.asarray(supply)))
    deck = chain_deck(["fan-out 4 with channel charge"], stage, texts, supply, Pace(closed, current))
    assert run_deck(deck, CHAIN_RESULTS).numbers["delay"] == pytest.approx(here, rel=1e-3)


def test_motion_that_acts_back_on_the_gate_costs_no_other_energy():
    """C_0 beside the motional branch: slow charge times voltage, C_in V^2, whatever way the column moves.

    Against the constants of the record: energy to 1 %, delay +0.6 % (the gate first takes only C_0, then the rest).
    """
    one = bench("demo-stress-gated", "g1", 0.6)
    back, forth = one.chain("device"), one.chain("delay")
    assert back["switching_energy"] == pytest.approx(forth["switching_energy"], rel=0.01)
    assert back["delay"] == pytest.approx(forth["delay"], rel=0.01)
    assert back["ringing_time"] == 0.0
    # film leakage: one switch of the inverter at a time sees the supply across its film
    film = 0.5 * 0.6 * (one.pair.down.off_current_input_high.item() + one.pair.up.off_current_input_high.item())
    assert back["leakage_power"] - forth["leakage_power"] == pytest.approx(film, rel=1e-3)
    closed = one.estimate()
    assert closed.leakage_power.item() == pytest.approx(back["leakage_power"], rel=2e-3)


def test_coupling_of_the_steep_swing_transistor():
    """Its stated accuracy: energy -12 to +9 %, delay -42 to +56 % at a drain share of 0.8."""
    one = bench("demo-steep-swing", "g1", 0.3)
    spice, closed = one.chain("device"), one.estimate()
    assert -0.42 < closed.path_delay.item() / spice["delay"] - 1.0 < 0.56
    assert -0.12 < closed.dynamic_energy.item() / spice["switching_energy"] - 1.0 < 0.09
