"""A file with curves at several temperatures: each is chosen in either unit, none is chosen silently."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.near import near
from tests.unit.test_curve_requests import HEAD, V, columns, read

#: temperature [K] -> swing [V/decade]
SWINGS = {298.15: 0.06, 398.15: 0.08}
AVERAGE = '[[extract]]\nquantity = "average_swing"\nspan = { low = 10, high = 1000, unit = "pA" }\n'


def described(folder: Path, unit: str, chosen: str) -> Path:
    """A file whose temperature column is in a unit; what is asked of it."""
    stated = columns(
        ("V", "control_voltage", "axis", "V"), ("T", "temperature", "axis", unit), ("I", "path_current", "value", "A")
    )
    zero = 273.15 if unit == "degC" else 0.0
    rows = [f"{v},{t - zero:.2f},{1e-12 * 10.0 ** (v / swing)!r}" for t, swing in SWINGS.items() for v in V]
    (folder / "raw.csv").write_text("V,T,I\n" + "\n".join(rows) + "\n", encoding="utf-8")
    path = folder / "raw.toml"
    path.write_text(HEAD + stated + AVERAGE + chosen, encoding="utf-8")
    return path


@pytest.mark.parametrize("unit", ["K", "degC"])
@pytest.mark.parametrize(
    ("chosen", "kelvin"), [("298.15, K", 298.15), ("25, degC", 298.15), ("398.15, K", 398.15), ("125, degC", 398.15)]
)
def test_a_temperature_is_chosen_in_either_unit(unit: str, chosen: str, kelvin: float, tmp_path: Path):
    value, asked_in = chosen.split(", ")
    asked = f'temperature = {{ value = {value}, unit = "{asked_in}" }}\n'
    found, problems = read(described(tmp_path, unit, asked))
    assert problems == []
    assert [one.value for one in found] == [near(SWINGS[kelvin], rel=1e-9)]
    (device,) = found[0].devices
    assert [sweep.fixed["temperature"] for sweep in device.sweeps] == [near(kelvin)]


@pytest.mark.parametrize(("unit", "there"), [("K", "298.15 K, 398.15 K"), ("degC", "25 degC, 125 degC")])
def test_several_temperatures_are_refused_unless_one_is_chosen(unit: str, there: str, tmp_path: Path):
    found, problems = read(described(tmp_path, unit, ""))
    assert found == []
    assert len(problems) == 1
    assert "several curves fit the request, and it does not choose between them" in problems[0]
    assert f"found temperature {there}" in problems[0]


@pytest.mark.parametrize(("unit", "there"), [("K", "298.15 K, 398.15 K"), ("degC", "25 degC, 125 degC")])
def test_a_temperature_that_is_not_there_is_refused_with_those_that_are(unit: str, there: str, tmp_path: Path):
    found, problems = read(described(tmp_path, unit, 'temperature = { value = 26, unit = "degC" }\n'))
    assert found == []
    assert len(problems) == 1
    assert "no curve of the file fits the request" in problems[0]
    assert f"temperature {there}" in problems[0]
