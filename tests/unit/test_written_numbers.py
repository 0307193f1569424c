"""Numbers and days as people and spreadsheets write them."""

from __future__ import annotations

import datetime
from decimal import Decimal as D

import pytest
from hypothesis import given
from hypothesis import strategies as st

from benchmark.sets.cells import CellError, is_day_number, looks_like_date, read_day, read_number


@pytest.mark.parametrize(
    ("text", "number"),
    [("170", "170"), (" 170.0 ", "170.0"), ("1E-09", "1E-9"), (".5", "0.5"), ("-2.", "-2"), ("+3e2", "3E+2")],
)
def test_numbers_keep_their_digits(text: str, number: str):
    assert str(read_number(text)) == number


@pytest.mark.parametrize(("text", "number"), [("1,25", "1.25"), ("-0,5", "-0.5"), ("1,5E-09", "1.5E-9"), ("7", "7")])
def test_the_declared_comma(text: str, number: str):
    assert str(read_number(text, "comma")) == number


@pytest.mark.parametrize(
    ("text", "what"),
    [
        ("", "is empty, a number is needed"),
        ("1,2e-9", "has a decimal comma"),
        ("0,5", "has a decimal comma"),
        ("1,234", "has separated thousands or another decimal sign"),
        ("1 234", "has separated thousands or another decimal sign"),
        ("1\u202f234,5", "has separated thousands or another decimal sign"),
        ("1'234.5", "has separated thousands or another decimal sign"),
        ("1.234.567", "has separated thousands or another decimal sign"),
        ("3. Jan", "looks like a date"),
        ("Mar-05", "looks like a date"),
        ("05-Mar", "looks like a date"),
        ("1. Okt. 2026", "looks like a date"),
        ("2026-01-03", "looks like a date"),
        ("2026-01-03 00:00:00", "looks like a date"),
        ("03.01.2026", "looks like a date"),
        ("1/3/26", "looks like a date"),
        ("3.1.", "looks like a date"),
        ("5 %", "has a per cent sign"),
        ("#DIV/0!", "is an error of a spreadsheet"),
        ("#####", "is an error of a spreadsheet"),
        ("170 pm/V", "has text behind the number"),
        ("1_000", "has text behind the number"),
        ("\u22125", "has a dash instead of the minus sign"),
        ("n/a", "is not a number"),
        ("-", "is not a number"),
        ("nan", "is not a number"),
        ("inf", "is not a number"),
        ("٣", "is not a number"),
        ("1.2.3", "is not a number"),
        ("1e999", "is beyond the range of the program"),
        ("1" * 1001, "is beyond the range of the program"),
    ],
)
def test_what_is_no_number_says_why(text: str, what: str):
    with pytest.raises(CellError) as refused:
        read_number(text)
    assert str(refused.value) == what


def test_with_the_comma_a_point_is_refused():
    with pytest.raises(CellError, match="has a decimal point"):
        read_number("1.25", "comma")
    with pytest.raises(CellError, match="has separated thousands or another decimal sign"):
        read_number("1.234", "comma")


@given(st.decimals(allow_nan=False, allow_infinity=False, min_value=D("-1e200"), max_value=D("1e200"), places=None))
def test_what_a_decimal_writes_is_read_back(number: D):
    if number == 0 or abs(number.adjusted()) <= 300:
        assert read_number(str(number)) == number
        assert read_number(str(number).replace(".", ","), "comma") == number


@given(st.dates())
def test_days(day: datetime.date):
    assert read_day(day.isoformat()) == day
    assert looks_like_date(day.isoformat())
    for spelled in (f"{day.day}.{day.month}.{day.year:04d}", f"{day.month}/{day.day}/{day.year:04d}"):
        assert looks_like_date(spelled)
        with pytest.raises(CellError):
            read_day(spelled)


@pytest.mark.parametrize(
    ("text", "what"),
    [
        ("46032", "is a day as a number of a spreadsheet"),
        ("2026-02-30", "is not a day of the calendar"),
        ("soon", "is not a day"),
    ],
)
def test_days_that_are_none(text: str, what: str):
    with pytest.raises(CellError) as refused:
        read_day(text)
    assert str(refused.value) == what


def test_words_are_no_dates():
    for text in ("p. 3", "Table 3-5 and text", "Fig. 2", "25 degC", "-", "", "12", "3.1", "lot 7", "mar"):
        assert not looks_like_date(text), text
    assert is_day_number("43891")
    assert not is_day_number("4389")
    assert not is_day_number("99999")
