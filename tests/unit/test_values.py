"""From value tables to SI arrays: each spread shape, defaults of the file, provenance."""

from __future__ import annotations

import math
from decimal import Decimal
from pathlib import Path

import numpy as np
import pytest

from benchmark.catalogue import EVIDENCE, QUANTITIES, Quantity
from benchmark.sets.parameters import ParameterSet
from benchmark.sets.values import NORMAL_95, Value
from benchmark.units import parse_unit, to_si
from tests.refusals import TECHNOLOGY, WIRES


def _load(folder: Path, text: str, name: str = "switch") -> ParameterSet:
    from benchmark.errors import Problem
    from benchmark.record.load import open_library

    (folder / f"{name}.toml").write_text(text, encoding="utf-8")
    library = open_library(folder)
    loaded = library.load(name, "technologies", Problem("", 0, name, ""))
    assert loaded is not None, library.collector.problems
    return loaded


def _with(folder: Path, old: str, new: str) -> ParameterSet:
    assert TECHNOLOGY.count(old) == 1
    return _load(folder, TECHNOLOGY.replace(old, new))


def _level(folder: Path, spread: str) -> Value:
    return _with(folder, "value = 0.7\n", f"value = 0.7\nspread = {spread}\n").values["switching_level"]


def test_numbers_become_si_by_node(tmp_path: Path):
    values = _load(tmp_path, TECHNOLOGY).values
    assert values["on_resistance"].si.tolist() == [50.0e3, 40.0e3]
    assert values["input_capacitance"].si.tolist() == [0.25e-15]
    assert values["reference_temperature"].si.tolist() == [298.15]
    assert values["on_resistance"].at(1).si.tolist() == [40.0e3]
    assert values["input_capacitance"].at(1).si.tolist() == [0.25e-15]  # one value for all nodes


def test_a_value_goes_back_into_the_unit_of_the_file(tmp_path: Path):
    value = _load(tmp_path, TECHNOLOGY).values["input_capacitance"]
    assert value.in_unit(float(value.si[0])) == 0.25


def test_without_a_spread_there_is_none(tmp_path: Path):
    assert _load(tmp_path, TECHNOLOGY).values["switching_level"].spread is None


@pytest.mark.parametrize("shape", ["uniform", "loguniform", "triangular"])
def test_hard_limits(shape: str, tmp_path: Path):
    spread = _level(tmp_path, f'{{ shape = "{shape}", low = 0.6, high = 0.8 }}').spread
    assert spread is not None
    assert (spread.shape, spread.low.tolist(), spread.high.tolist(), spread.scale) == (shape, [0.6], [0.8], None)


def test_hard_limits_may_meet_the_value(tmp_path: Path):
    spread = _level(tmp_path, '{ shape = "uniform", low = 0.7, high = 0.7 }').spread
    assert spread is not None
    assert spread.low.tolist() == spread.high.tolist() == [0.7]


def test_a_standard_deviation_gives_the_central_95_percent(tmp_path: Path):
    spread = _level(tmp_path, '{ shape = "normal", sd = 0.1 }').spread
    assert spread is not None
    assert spread.scale is not None
    assert spread.scale.tolist() == [0.1]
    assert spread.low[0] == pytest.approx(0.7 - 1.959964 * 0.1, rel=1e-6)
    assert spread.high[0] == pytest.approx(0.7 + 1.959964 * 0.1, rel=1e-6)


def test_per_cent_is_a_standard_deviation_and_follows_each_node(tmp_path: Path):
    loaded = _with(tmp_path, "g2 = 40.0 }", 'g2 = 40.0 }\nspread = { shape = "normal", percent = 10 }')
    spread = loaded.values["on_resistance"].spread
    assert spread is not None
    assert spread.scale is not None
    np.testing.assert_allclose(spread.scale, [5.0e3, 4.0e3], rtol=1e-15)
    one = loaded.values["on_resistance"].at(1).spread
    assert one is not None
    assert one.low[0] == pytest.approx(40.0e3 - 1.959964 * 4.0e3, rel=1e-6)


def test_a_factor_spans_the_central_95_percent_and_follows_each_node(tmp_path: Path):
    loaded = _with(tmp_path, "g2 = 40.0 }", 'g2 = 40.0 }\nspread = { shape = "lognormal", factor = 1.5 }')
    spread = loaded.values["on_resistance"].spread
    assert spread is not None
    assert spread.scale is not None
    np.testing.assert_allclose(spread.low, [50.0e3 / 1.5, 40.0e3 / 1.5], rtol=1e-15)
    np.testing.assert_allclose(spread.high, [75.0e3, 60.0e3], rtol=1e-15)
    np.testing.assert_allclose(spread.scale, math.log(1.5) / 1.959964, rtol=1e-6)


def test_a_factor_and_its_logarithmic_deviation_are_the_same(tmp_path: Path):
    ln_sd = math.log(1.2) / NORMAL_95
    (tmp_path / "a").mkdir()
    (tmp_path / "b").mkdir()
    factor = _level(tmp_path / "a", '{ shape = "lognormal", factor = 1.2 }').spread
    deviation = _level(tmp_path / "b", f'{{ shape = "lognormal", ln_sd = {ln_sd:.17f} }}').spread
    assert factor is not None
    assert deviation is not None
    np.testing.assert_allclose(deviation.low, factor.low, rtol=1e-14)
    np.testing.assert_allclose(deviation.high, factor.high, rtol=1e-14)


def test_95_percent_of_a_normal_distribution():
    from scipy.stats import norm

    assert pytest.approx(float(norm.ppf(0.975)), rel=1e-15) == NORMAL_95


def test_a_deviation_in_another_unit_has_no_offset(tmp_path: Path):
    """A standard deviation of 5 degC is one of 5 K."""
    text = TECHNOLOGY + '[value.process_temperature]\nvalue = 400.0\nunit = "degC"\n'
    celsius = _load(tmp_path, text + 'spread = { shape = "normal", sd = 5.0 }\n').values["process_temperature"]
    assert celsius.si[0] == 673.15
    assert celsius.spread is not None
    assert celsius.spread.scale is not None
    assert celsius.spread.scale.tolist() == [5.0]


def test_a_value_takes_from_the_defaults_of_the_file_what_it_does_not_say(tmp_path: Path):
    text = TECHNOLOGY.replace(
        '[value.closing_delay]\nvalue = 0.05\nunit = "ns"\n',
        '[value.closing_delay]\nvalue = 0.05\nunit = "ns"\nevidence = "measured"\nconditions = "25 degC"\n'
        'where = "row 4"\nnote = "a note"\nowner = "team"\nbound = "at-most"\ndate = 2026-01-31\n',
    )
    values = _load(tmp_path, text).values
    own, other = values["closing_delay"], values["opening_delay"]
    assert (own.evidence, own.conditions, own.where, own.note, own.owner) == (
        "measured",
        "25 degC",
        "row 4",
        "a note",
        "team",
    )
    assert (own.bound, own.date, own.source) == ("at-most", "2026-01-31", "invented")
    assert (other.evidence, other.conditions, other.where, other.note, other.bound) == ("invented", "-", "-", "", "")
    assert (own.file, own.line) == ("switch.toml", 27)


def test_a_silent_file_leaves_a_default_with_its_origin(tmp_path: Path):
    values = _load(tmp_path, TECHNOLOGY).values
    assert values["terminal_capacitance"].is_default
    assert values["terminal_capacitance"].origin == "not stated: no capacitance of the conducting terminals"
    assert not values["on_resistance"].is_default
    assert "footprint" not in values  # neither required nor defaulted: unknown


def test_options_say_whether_the_file_or_the_program_chose(tmp_path: Path):
    loaded = _load(tmp_path, TECHNOLOGY)
    assert loaded.options["off_state"] == "resistance"
    assert "off_state" not in loaded.default_options
    assert loaded.options["partner"] == "mirrored"
    assert "partner" in loaded.default_options


def test_wires_load_as_wires(tmp_path: Path):
    from benchmark.errors import Problem
    from benchmark.record.load import open_library

    (tmp_path / "lines.toml").write_text(WIRES)
    library = open_library(tmp_path)
    loaded = library.load("lines", "wires", Problem("", 0, "", ""))
    assert loaded is not None
    assert (loaded.kind, loaded.model, loaded.nodes) == ("wires", "", ("w1",))
    assert loaded.values["wire_resistance_per_length"].si.tolist() == [50.0e6]


# -- the catalogue behind them ---------------------------------------------------------------------------------


@pytest.mark.parametrize("quantity", QUANTITIES.values(), ids=lambda quantity: quantity.name)
def test_catalogue_entries_are_sound(quantity: Quantity):
    unit = parse_unit(quantity.unit)
    assert quantity.low < quantity.high
    assert quantity.meaning
    assert quantity.meaning[0] not in " ."
    assert quantity.domain_text
    low, high = (to_si(Decimal(repr(bound)), unit) for bound in (quantity.low, quantity.high))
    assert low < high
    if quantity.domain != "any":
        assert quantity.allows(high)
    if quantity.domain in ("positive", "count"):
        assert quantity.allows(low)
        assert not quantity.allows(0.0)


@pytest.mark.parametrize(
    ("domain", "inside", "outside"),
    [
        ("positive", (1e-30, 5.0), (0.0, -1.0)),
        ("nonnegative", (0.0, 5.0), (-1e-30,)),
        ("any", (-5.0, 0.0), ()),
        ("fraction", (0.0, 1.0), (-0.1, 1.0001)),
        ("share", (1e-9, 1.0), (0.0, 1.0001)),
        ("count", (1.0, 7.0), (0.0, 2.5, -1.0)),
    ],
)
def test_domains(domain: str, inside: tuple[float, ...], outside: tuple[float, ...]):
    quantity = Quantity("x", "x", "x", "1", 0.0, 1.0, domain)  # type: ignore[arg-type]
    assert all(quantity.allows(number) for number in inside)
    assert not any(quantity.allows(number) for number in outside)


def test_every_evidence_class_says_what_it_supports():
    assert {item.support for item in EVIDENCE.values()} == {"go", "conditional", "none", "demonstration"}
    assert EVIDENCE["invented"].support == "demonstration"
    assert EVIDENCE["assumed"].support == "none"
    assert {name for name, item in EVIDENCE.items() if item.support == "go"} == {
        "defined",
        "measured",
        "published",
        "choice",
    }
