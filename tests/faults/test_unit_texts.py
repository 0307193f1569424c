"""Unit texts that would hang the program, or change a number without a word."""

from __future__ import annotations

import time

import pytest

from benchmark.catalogue import QUANTITIES
from benchmark.units import UnitError, parse_unit


@pytest.mark.parametrize(
    "text",
    [
        "V^1e9", "9^9^9", "9**9**9", "m^(9^9^9)", "V^(2^(2^(2^9)))", "1e999999999", "2^99999*m", "um^999999999",
        "9²⁹⁹⁹⁹⁹⁹⁹⁹",
        "um²⁹⁹⁹⁹⁹⁹⁹⁹", "(9m)²⁹⁹⁹⁹⁹⁹⁹", "((9^99)^99)^99", "(((9 m)^99)^99)^99", "9" * 4400, "V " * 9_000, "m^9 ^9",
        "9^9 **9", "((9m)²)^99",
    ],
)  # fmt: skip
def test_a_tower_of_powers_is_refused_at_once(text: str):
    parse_unit("V")  # the table of units is read once
    start = time.process_time()
    with pytest.raises(UnitError, match="is not a unit"):
        parse_unit(text)
    assert time.process_time() - start < 0.2


@pytest.mark.parametrize(
    "text",
    ["V;A", "m==m", "m<m", "~m", "m%m", "m//m", "V,A", "[V]", "V'", "V!", "V&A", "@V", "#V", "V:A", "V+A", "V-A"],
)
def test_signs_that_are_no_part_of_a_unit(text: str):
    with pytest.raises(UnitError, match="is not a unit"):
        parse_unit(text)


@pytest.mark.parametrize(
    "text", ["cycle", "cycles", "cycles/s", "turn", "rpm", "dB", "dBm", "Np", "B", "byte", "octave", "1/cycle"]
)
def test_units_that_would_change_the_number_unseen(text: str):
    with pytest.raises(UnitError, match="would be read as"):
        parse_unit(text)


@pytest.mark.parametrize("text", sorted({quantity.unit for quantity in QUANTITIES.values()}))
def test_every_unit_of_the_catalogue_is_one(text: str):
    assert parse_unit(text).factor > 0


@pytest.mark.parametrize(
    ("text", "same"),
    [
        ("m²", "m^2"), ("m⁻¹", "1/m"), ("m**-1", "m^-1"), ("m^(-1)", "1/m"), ("V·A", "W"), ("V×A", "W"), ("V A",
        "V*A"), ("(V/m)^2", "V^2/m^2"),
        ("V^0.5", "V ** 0.5"), ("ohm·µm", "ohm um"), ("Å", "angstrom"), ("%", "percent"), ("V per m", "V/m"),
        ("square meter", "m^2"), ("kΩ", "kohm"), ("°C", "degC"), ("(V)", "V"), ("MV^0.5/cm^0.5", "(MV/cm)^0.5"),
        ("(V/m)²", "(V/m)^2"),
    ],
)  # fmt: skip
def test_common_spellings_stay(text: str, same: str):
    one, two = parse_unit(text), parse_unit(same)
    assert (float(one.factor), one.dimension, one.offset) == (float(two.factor), two.dimension, two.offset)
