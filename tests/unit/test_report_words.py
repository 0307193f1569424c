"""Numbers and words of the report: significant digits, units, and no rounding across a limit."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from benchmark.record.text import factor
from benchmark.report import words


@pytest.mark.parametrize(
    ("value", "digits", "shown"),
    [
        (0.0, 2, "0"),
        (1.0, 2, "1"),
        (0.07551, 2, "0.076"),
        (153.4, 2, "150"),
        (15300.0, 2, "15000"),
        (1.6e13, 2, "1.6×10¹³"),
        (1e13, 2, "10¹³"),
        (2.04e-5, 2, "2×10⁻⁵"),
        (-0.5, 2, "−0.5"),
        (9.96, 2, "10"),
        (0.00996, 2, "0.01"),
        (99999.0, 3, "10⁵"),
        (None, 2, "not stated"),
        ("infinite", 2, "infinite"),
    ],
)
def test_a_number_is_printed_with_significant_digits(value: object, digits: int, shown: str):
    assert words.number(value, digits) == shown


@pytest.mark.parametrize(
    ("value", "limits", "shown"),
    [
        (1.96, (2.0,), "1.96"),
        (1.94, (2.0,), "1.9"),
        (0.9996, (1.0, 2.0), "0.9996"),
        (1.0000007, (1.0,), "1.000001"),
        (2.0, (2.0,), "2"),
        (2.04, (2.0,), "2.04"),
    ],
)
def test_rounding_never_crosses_a_limit(value: float, limits: tuple[float, ...], shown: str):
    assert words.number(value, 2, limits) == shown


@given(st.floats(1e-6, 1e6), st.sampled_from([1.0, 2.0, 1.5, 10.0]))
def test_a_printed_factor_stands_on_the_side_of_the_limit_where_the_value_stands(value: float, limit: float):
    assert (float(factor(value, limit)) >= limit) == (value >= limit)
    shown = words.number(value, 2, (limit,))
    if "×" not in shown and not shown.startswith("10"):
        assert (float(shown) > limit) == (value > limit)
        assert (float(shown) < limit) == (value < limit)


@pytest.mark.parametrize(
    ("value", "unit", "shown"),
    [
        (1.9644741336040714e-12, "J", "2\u00a0pJ"),
        (1e-6, "s", "1\u00a0µs"),
        (9.9999999e-7, "s", "1\u00a0µs"),
        (2.5e-13, "J", "250\u00a0fJ"),
        (0.0, "s", "0\u00a0s"),
        (298.15, "K", "25\u00a0°C"),
        (253.15, "K", "−20\u00a0°C"),
        (1e5, "W/m^2", "10\u00a0W/cm²"),
        (6.5e-10, "m^2", "650\u00a0µm²"),
        (3.0, "1", "3"),
        (None, "s", "not stated"),
        ("infinite", "s", "infinite"),
    ],
)
def test_an_amount_has_prefix_space_and_unit(value: object, unit: str, shown: str):
    assert words.amount(value, unit) == shown


def test_supplies_are_said_in_volt():
    assert words.volts(0.35) == "0.35\u00a0V"
    assert words.volts(0.0021) == "2.1\u00a0mV"
    assert words.volts(0.0) == "0\u00a0V"


def test_powers_of_ten_in_drawings_use_plain_digits():
    assert words.flat_powers("low 5×10⁹ ohm, 10⁻³ and 1.8×10⁻⁴ m/N") == "low 5e9 ohm, 1e-3 and 1.8e-4 m/N"


def test_lists_and_plurals():
    assert words.listed([]) == ""
    assert words.listed(["a"]) == "a"
    assert words.listed(["a", "b", "c"]) == "a, b and c"
    assert words.plural(0, "input") == "no inputs"
    assert words.plural(1, "input") == "1 input"
    assert words.plural(3, "entry", "entries") == "3 entries"


def test_truth_values_and_infinities_are_no_numbers():
    assert not words.is_number(True)
    assert not words.is_number(float("inf"))
    assert not words.is_number(float("nan"))
    assert words.is_number(0)


def test_characters_that_cannot_be_drawn_are_replaced():
    assert words.visible("a\x00\x1b\ud800b\ufffe") == "a\ufffd\ufffd\ufffdb\ufffd"
    assert words.visible("2.4 \u202e4.2\u202c") == "2.4 \ufffd4.2\ufffd"
    assert words.visible("Ω µ 中 🙂\n") == "Ω µ 中 🙂\n"
