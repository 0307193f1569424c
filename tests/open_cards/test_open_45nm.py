"""A set extracted from cards that nobody here wrote, against the same cards in a circuit simulator."""

from __future__ import annotations

import re
import tomllib

import pytest

from tests.near import near
from tests.open_cards import card, open_45nm
from tests.open_cards.freepdk45 import PLACE, curves, text
from tests.open_cards.row import failures

pytestmark = pytest.mark.spice


def test_the_cards_run_on_the_stated_model():
    assert card.model_version() == "BSIM4v5 models (Berkeley Short Channel IGFET Model-4)"


def test_decks_repeat_the_stored_series():
    assert not failures(open_45nm.deck_rows())


def test_stored_set_is_what_extraction_gives():
    """Targets and capacitances to print; fitted values, which trade against each other, to 1 %."""
    stored, now = tomllib.loads(PLACE.read_text(encoding="utf-8")), tomllib.loads(text())
    assert stored.keys() == now.keys()
    assert stored["value"].keys() == now["value"].keys()
    for name, value in stored["value"].items():
        allowed = 1e-2 if value["evidence"] == "extracted" else 1e-5
        assert now["value"][name]["value"] == near(value["value"], rel=allowed), name
    for name, anchor in stored["anchor"].items():
        assert now["anchor"][name]["value"] == near(anchor["value"], rel=1e-4), name


def test_currents_are_met():
    assert not failures(open_45nm.current_rows())


def test_delay_and_energy_are_predicted():
    """0.3 to 1.0 V: delay within 5 %, energy within 10 %; measured -4.1 to +2.5 % and -7.6 to -0.4 %."""
    assert not failures(open_45nm.prediction_rows())


@pytest.mark.parametrize("supply", open_45nm.APART)
def test_where_the_differences_come_from(supply: float):
    assert not failures(open_45nm.apart(supply))


def test_cards_of_other_thresholds(tmp_path):
    """VTL: delay -5.7 to -3.3 %, energy -5.9 to -2.1 %; VTH: delay -2.4 to +7.9 %, energy -16 to +1 %."""
    assert not failures(open_45nm.held_out_rows(tmp_path))


def test_off_current_of_the_drain_is_not_that_of_the_channel():
    """High threshold, n: the drain of a closed device loses 11 times more to the gate than through the channel."""
    drain, channel = (curves("VTH", terminal)["n"].off[-1] for terminal in ("d", "s"))
    assert drain > 8.0 * channel
    drain, channel = (curves("VTG", terminal)["n"].off[-1] for terminal in ("d", "s"))
    assert 1.0 < drain / channel < 1.2


def test_other_readings_of_the_edge_capacitance(tmp_path):
    """The reading matters: the mean over the drain's swing misses 10 % at 0.4 V, a reading below threshold does not."""
    rows = open_45nm.edge_rows(tmp_path)
    assert not failures(rows)
    weak = [row for row in rows if "swing below" in row.note]
    assert all(abs(row.difference) < 0.10 for row in weak)
    assert any(abs(row.difference) > 0.20 for row in rows if row not in weak)


def test_the_solved_chain_shows_that_the_closed_form_is_slow_under_a_constant_load():
    load, delay = open_45nm.solved_rows()
    closed = next(row for row in open_45nm.apart(0.8) if row.quantity == load.isolates)
    assert load.holds
    assert closed.difference - load.difference > 0.08
    assert delay.holds
    assert delay.difference < -0.08


def test_facts_of_the_card_file():
    words = card.card_text()
    assert "SPDX-License-Identifier: Apache-2.0" in words
    for name in ("NMOS_VTG", "PMOS_VTG"):
        own = words.split(f".model  {name} ")[1].split(".model")[0]
        assert re.search(r"level = 54\b", own)
        assert re.search(r"\+version = 4\.0\b", own)
        assert re.search(r"xl\s*=\s*-2e-0?8|xl\s*=\s*-20e-9", own)
        assert re.search(r"lint\s*=\s*3\.75e-0?09", own)
