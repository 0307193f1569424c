"""A random table written in a random dialect reads back to the last bit, and says what was done to it."""

from __future__ import annotations

from decimal import Decimal
from pathlib import Path
from tempfile import TemporaryDirectory

from hypothesis import assume, given, settings
from hypothesis import strategies as st

from tests.profiles import examples
from tests.raw_curves import Dialect, Truth, expected, outcome, read, write

WORDS = st.text("ABCDEFGHKLMNPRSTUVWXYZ0123456789-_", min_size=2, max_size=6)
NUMBERS = st.decimals(Decimal("1e-15"), Decimal("0.9"), allow_nan=False, allow_infinity=False)
JUNK = st.lists(st.text("abc xyz;,:=\"'0123456789()", max_size=20).filter(lambda line: line.strip()), max_size=4)


@st.composite
def truths(draw: st.DrawFn) -> Truth:
    devices = draw(st.lists(WORDS, min_size=2, max_size=4, unique=True))
    curves = {}
    for device in devices:
        for sweep in ("forward", "backward"):
            millivolts = draw(st.lists(st.integers(-900, 900), min_size=2, max_size=6, unique=True))
            volts = [Decimal(value) / 1000 for value in sorted(millivolts, reverse=sweep == "backward")]
            curves[device, sweep] = [(volt, draw(NUMBERS)) for volt in volts]
        # a turn is one only when the second sweep begins where the first ended
        top = curves[device, "forward"][-1][0]
        kept = [point for point in curves[device, "backward"] if point[0] < top]
        assume(kept)
        curves[device, "backward"] = [(top, draw(NUMBERS)), *kept]
    widths = {device: draw(st.decimals(Decimal("0.01"), 100, places=3)) for device in devices}
    return Truth(curves, widths, Decimal(draw(st.integers(-900, 900))) / 1000, Decimal(draw(st.integers(-200, 300))))


@st.composite
def dialects(draw: st.DrawFn) -> Dialect:
    layout = draw(st.sampled_from(["long", "turns", "side"]))
    delimiter = draw(st.sampled_from([",", ";", "\t", "|"] + (["whitespace"] if layout != "side" else [])))
    units = draw(st.sampled_from(["stated", "row"] + (["header"] if delimiter != "whitespace" else [])))
    junk = tuple(draw(JUNK))
    ahead = all(not line.lstrip(' \t"').startswith("VG") for line in junk)
    encoding = draw(st.sampled_from(["utf-8", "utf-16", "latin-1", "cp1252"]))
    return Dialect(
        layout=layout,
        delimiter=delimiter,
        decimal=draw(st.sampled_from([".", ","])),
        encoding=encoding,
        bom=draw(st.booleans()),
        newline=draw(st.sampled_from(["\n", "\r\n"])),
        junk=junk,
        starts=ahead and draw(st.booleans()),
        comment=draw(st.booleans()),
        units=units,
        volt=draw(st.sampled_from([0, -3, -6])),
        ampere=draw(st.sampled_from([0, -3, -6, -9, -12])),
        exponents=draw(st.booleans()),
        negative=draw(st.booleans()),
        trailing=draw(st.integers(0, 2)) if delimiter != "whitespace" else 0,
        blank=draw(st.integers(0, 2)),
        footer=draw(st.booleans()),
        ignored=draw(st.booleans()),
        columns=draw(st.none() | st.integers(0, 99)),
        kelvin=draw(st.booleans()),
        micrometres=draw(st.booleans()),
    )


@settings(max_examples=examples(150))
@given(truths(), dialects())
def test_a_random_table_in_a_random_dialect_reads_back_to_the_last_bit(truth: Truth, dialect: Dialect):
    with TemporaryDirectory() as folder:
        curves = read(write(Path(folder), truth, dialect))
    assert outcome(curves) == expected(truth)
    said = "\n".join(curves.notes)
    assert ("Flags" in said) == dialect.ignored
    assert ("comment line" in said) == dialect.comment
    assert ("sign turned round" in said) == dialect.negative
    assert ("byte order mark" in said) == (
        dialect.encoding == "utf-16" or (dialect.bom and dialect.encoding == "utf-8")
    )
    assert said.count("divided by the width") == (len(truth.devices) if dialect.layout == "side" else 1)


@settings(max_examples=examples(40))
@given(truths(), st.integers(0, 9999))
def test_rows_in_any_order_give_the_rising_curves(truth: Truth, seed: int):
    rising = Truth({key: sorted(points) for key, points in truth.curves.items()}, truth.widths)
    with TemporaryDirectory() as folder:
        curves = read(write(Path(folder), rising, Dialect(shuffle=seed)))
    assert outcome(curves) == expected(rising)
