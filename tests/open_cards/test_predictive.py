"""Stored series of the predictive planar cards and of the open 7 nm kit against what sets predict over supply."""

from __future__ import annotations

import tomllib

import pytest

from tests.near import near
from tests.open_cards import predictive
from tests.open_cards.predictive import CARDS, Cards, place
from tests.open_cards.row import failures

each = pytest.mark.parametrize("cards", CARDS, ids=[cards.node for cards in CARDS])


@each
def test_stored_set_is_what_extraction_gives(cards: Cards):
    """Targets to print; fitted values, which trade against each other, to 2 %."""
    stored, now = (tomllib.loads(words) for words in (place(cards).read_text(encoding="utf-8"), predictive.text(cards)))
    assert stored["anchor"] == now["anchor"]
    assert stored["value"].keys() == now["value"].keys()
    for name, value in stored["value"].items():
        allowed = 2e-2 if value["evidence"] == "extracted" else 1e-5
        assert now["value"][name]["value"] == near(value["value"], rel=allowed), name


@each
def test_delay_and_energy_over_supply(cards: Cards):
    """Delay: 45 nm -5.4 to +5.7 %, 32 nm -8.8 to +0.3 %, 16 nm -24.5 to -9.4 % (misses 10 %)."""
    assert not failures(predictive.predictive_rows(cards))


def test_the_16_nm_miss_is_the_weight_of_the_drain_edge_in_part():
    rows = {row.quantity: row for row in predictive.predictive_rows(CARDS[2])}
    for supply in ("0.30", "0.40", "0.50", "0.60"):
        plain = rows[f"fan-out-of-four delay, predictive 16 nm, {supply} V [s]"]
        current = rows[f"delay with the effective currents of the series, predictive 16 nm, {supply} V [s]"]
        weight = rows[f"delay with a weight from currents at one drain voltage, predictive 16 nm, {supply} V [s]"]
        assert plain.difference < -0.10
        assert abs(current.difference - plain.difference) < 0.02
        assert weight.difference - plain.difference > 0.06


def test_shipped_seven_nanometre_sets():
    assert not failures(predictive.seven_nanometre_rows())
