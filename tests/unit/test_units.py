"""Units: exact, one rounding, refusals."""

from __future__ import annotations

from decimal import Decimal

import pytest
from hypothesis import given
from hypothesis import strategies as st

from benchmark.units import UnitError, format_si, from_si, parse_unit, to_si


@pytest.mark.parametrize(
    ("number", "unit", "other", "other_unit"),
    [
        ("0.1", "mA/um", "100", "A/m"),
        ("360", "pm/V", "3.6e-10", "m/V"),
        ("0.05", "V/decade", "50", "mV/dec"),
        ("25", "degC", "298.15", "K"),
        ("1", "µA/µm", "1", "μA/μm"),
        ("1", "kohm", "1", "kΩ"),
        ("3", "decade/GPa", "3e-9", "decade/Pa"),
        ("200", "cm^2/V/s", "0.02", "m^2/V/s"),
        ("2.0e-12", "ohm m^2", "2", "ohm*um^2"),
    ],
)
def test_spellings_give_the_same_bits(number, unit, other, other_unit):
    assert to_si(Decimal(number), parse_unit(unit)) == to_si(Decimal(other), parse_unit(other_unit))


@given(st.decimals(min_value="-1e6", max_value="1e6", allow_nan=False, places=6))
def test_prefix_steps_are_exact(number):
    milli = to_si(number * 1000, parse_unit("mV"))
    assert milli == to_si(number, parse_unit("V"))


def test_a_swing_is_not_a_voltage():
    assert parse_unit("mV/decade").dimension != parse_unit("mV").dimension


@pytest.mark.parametrize("text", ["foo", "m/", "a", "h", "degC/V", "V**", "import os"])
def test_refused(text):
    with pytest.raises(UnitError):
        parse_unit(text)


def test_display_round_trip():
    assert from_si(to_si(Decimal("85"), parse_unit("degC")), parse_unit("degC")) == pytest.approx(85)
    assert format_si(1.44e5, "kohm") == "144 kohm"
