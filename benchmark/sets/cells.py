"""Numbers and days as people and spreadsheets write them: read exactly, or refused with the reason (layer 2)."""

from __future__ import annotations

import datetime
import re
from decimal import Decimal, InvalidOperation

from benchmark.sets.schema import MOST_DIGITS

__all__ = ["CellError", "looks_like_date", "read_day", "read_number"]

_MONTHS = (
    "jan|feb|mar|mär|mrz|apr|may|mai|jun|jul|aug|sep|oct|okt|nov|dec|dez|janv|févr|fév|mars|avr|juin|juil|août|déc|"
    "january|february|march|april|june|july|august|september|sept|october|november|december|januar|februar|märz|juni|"
    "juli|oktober|dezember"
)
_DATES = tuple(
    re.compile(pattern, re.IGNORECASE)
    for pattern in (
        r"\d{4}-\d{1,2}-\d{1,2}([T ].*)?",
        r"\d{4}/\d{1,2}/\d{1,2}",
        r"\d{1,2}[./-]\d{1,2}[./-](\d{2}|\d{4})",
        r"\d{1,2}\.\d{1,2}\.",
        r"\d{1,2}/\d{1,2}",
        rf"\d{{1,4}}(st|nd|rd|th)?[.\-/ ]{{1,2}}({_MONTHS})\.?([.\-/ ]{{1,2}}\d{{2,4}})?",
        rf"({_MONTHS})\.?[.\-/ ]{{1,2}}\d{{1,4}}(,? \d{{4}})?",
    )
)
#: a point, then digits; what a file may say, and ".5" and "1." besides
_PLAIN = re.compile(r"(?a)[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?")
_COMMA = re.compile(r"(?a)[+-]?(\d+,\d*|,\d+)([eE][+-]?\d+)?")
#: groups of three digits, whatever stands between them
_GROUPED = re.compile(r"[+-]?\d{1,3}([,.'’\u00a0\u202f\u2009 ])\d{3}(\1\d{3})*([.,]\d+)?")
_ERROR = re.compile(r"#+[A-Z0-9/!?]*[!?]?|#+|Err:\d+", re.IGNORECASE)
#: days that a spreadsheet writes as a number, about 1954 to 2119
_SERIAL = range(20_000, 80_001)


class CellError(ValueError):
    """A text that is not what is needed; ``hint`` says what to write."""

    def __init__(self, what: str, hint: str = "") -> None:
        super().__init__(what)
        self.hint = hint


def looks_like_date(text: str) -> bool:
    """Tell whether a text is a day or month as spreadsheets write them."""
    return any(pattern.fullmatch(text.strip()) for pattern in _DATES)


def is_day_number(text: str) -> bool:
    """Tell whether a text may be a day as the number that spreadsheets count days by."""
    stripped = text.strip()
    return stripped.isdigit() and len(stripped) == 5 and int(stripped) in _SERIAL


def read_number(text: str, decimal: str = "point") -> Decimal:
    """Read a number exactly.

    Parameters
    ----------
    text : str
        Digits with a decimal sign and a power of ten; spaces around them are nothing.
    decimal : str
        Decimal sign in use: ``point`` or ``comma``.

    Raises
    ------
    CellError
        With what is wrong: a date, separated thousands, another decimal sign, a per cent sign, a unit, an error.
    """
    stripped = text.strip()
    sign, other = (_PLAIN, _COMMA) if decimal == "point" else (_COMMA, _PLAIN)
    whole = re.fullmatch(r"(?a)[+-]?\d+([eE][+-]?\d+)?", stripped)
    if whole or sign.fullmatch(stripped):
        try:
            number = Decimal(stripped.replace(",", "."))
        except InvalidOperation as error:
            message = "is beyond the range of the program"
            raise CellError(message) from error
        if len(stripped) > MOST_DIGITS or (number and abs(number.adjusted()) > 300):
            message = "is beyond the range of the program"
            raise CellError(message)
        return number
    raise _why_not(stripped, other, decimal)


def _why_not(text: str, other: re.Pattern[str], decimal: str) -> CellError:
    if not text:
        return CellError("is empty, a number is needed")
    if looks_like_date(text):
        return CellError("looks like a date", "a spreadsheet may have changed the number; format the column as text")
    if text.endswith("%"):
        return CellError("has a per cent sign", "write the number alone; the unit says what it counts")
    if _ERROR.fullmatch(text):
        return CellError("is an error of a spreadsheet", "write the number itself, not a formula")
    if other.fullmatch(text) and not _GROUPED.fullmatch(text):
        return CellError(f"has a decimal {'comma' if decimal == 'point' else 'point'}", _decimal_hint(decimal))
    if _GROUPED.fullmatch(text):
        return CellError("has separated thousands or another decimal sign", "write 1234.5 or 1.2345e3, digits only")
    if text[0] in "\u2212\u2013" and len(text) > 1:
        return CellError("has a dash instead of the minus sign", "write -1.5 with the sign of the keyboard")
    if re.match(r"[+-]?[\d.,]+\s*[^\d.,\s]", text):
        return CellError("has text behind the number", "the unit has a place of its own")
    return CellError("is not a number", "write digits such as 1.5 or 1.5e-9")


def _decimal_hint(decimal: str) -> str:
    return (
        "write 1.5, or declare the decimal comma" if decimal == "point" else "write 1,5, or declare the decimal point"
    )


def read_day(text: str) -> datetime.date:
    """Read a day written year-month-day.

    Raises
    ------
    CellError
        When it is written otherwise, or there is no such day.
    """
    hint = "write it as 2026-01-31; in a spreadsheet, format the column as text"
    stripped = text.strip()
    if not re.fullmatch(r"\d{4}-\d{2}-\d{2}", stripped):
        what = "is a day as a number of a spreadsheet" if is_day_number(stripped) else "is not a day"
        raise CellError(what, hint)
    try:
        return datetime.date.fromisoformat(stripped)
    except ValueError as error:
        message = "is not a day of the calendar"
        raise CellError(message, hint) from error
