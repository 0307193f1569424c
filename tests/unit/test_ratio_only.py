"""Ratio-only records: no absolute value of any side is anywhere in what is written."""

from __future__ import annotations

import json
import re
import struct
from collections.abc import Iterator
from decimal import Decimal
from pathlib import Path
from typing import Any

import pytest

from benchmark.errors import EvenloadError
from benchmark.record.ratio_only import ratio_only
from benchmark.record.rerun import recreate
from benchmark.record.scrub import scrubbed
from benchmark.record.text import engineering, verdict_text
from benchmark.report.folder import fill_folder
from benchmark.report.publish import write_figures
from benchmark.report.publish_tables import FORMATS, write_tables
from benchmark.report.words import amount, spaced, volts
from benchmark.units import parse_unit, to_si
from tests.report_records import crossing, infeasible, mixed

ROOT = Path(__file__).resolve().parents[2]
UNITS = {
    **dict.fromkeys(("time", "cycle", "closed_delay", "transient_delay"), "s"),
    **dict.fromkeys(("candidate_time", "reference_time"), "s"),
    **dict.fromkeys(("energy", "candidate_energy", "reference_energy"), "J"),
    **dict.fromkeys(("supply", "candidate_supply", "reference_supply"), "V"),
    "leakage_power": "W",
    "area": "m^2",
    "power_density": "W/m^2",
}
#: shortest mantissa by which a bare number counts as found: chance is then below one in a million
DIGITS = 10


def worked() -> dict[str, Any]:
    """The record in the worked report."""
    page = (ROOT / "reports" / "always-on-hub" / "report.html").read_text(encoding="utf-8")
    text = page.split('<script type="application/json" id="record">')[1].split("</script>")[0]
    found: dict[str, Any] = json.loads(text)
    return found


def _absolutes(record: dict[str, Any]) -> Iterator[tuple[float, str, float]]:
    """Every absolute number of every side: in SI, with the unit it is written in and the number in that unit."""

    def walk(value: Any, key: str) -> Iterator[tuple[float, str, float]]:
        if isinstance(value, dict):
            for name, item in value.items():
                if name in ("time_parts", "energy_parts"):
                    for part in item.values():
                        yield from walk(part, name.split("_")[0])
                else:
                    yield from walk(item, name)
        elif isinstance(value, list):
            for item in value:
                yield from walk(item, key)
        elif isinstance(value, float) and key in UNITS and value:
            yield value, UNITS[key], value

    for part in ("policies", "curves", "advantage_against_time", "crossings", "nodes", "closed_form", "sides"):
        yield from walk(record[part], "")
    for row in record["ledger"]:
        if row["owner"] == "study" or row["owner"].startswith("circuit"):
            continue
        unit = parse_unit(row["unit"])
        ends = [*row["spread"]["low"], *row["spread"]["high"]] if row["spread"] else []
        if any(_mantissa(value).rstrip("0") == "1." for value in row["value"]):
            ends = []  # the ratio to a power of ten has the digits of the value itself, which gives nothing away
        for value in [*row["value"], *ends]:
            if value:
                yield float(to_si(Decimal(repr(value)), unit)), row["unit"], value
    for row in record["anchors"]:
        for name in ("published", "low", "high", "predicted"):
            yield row[name], "", row[name]


def _mantissa(value: float) -> str:
    return f"{abs(value):.{DIGITS - 1}e}".split("e")[0]


def _simple(mantissa: float) -> bool:
    """Tell round numbers and simple fractions: they come about everywhere, so they count only with their unit."""
    return any(abs(k * mantissa - round(k * mantissa, 6)) < 1e-8 for k in (1, 3, 7, 9))


def _texts(folder: Path) -> Iterator[tuple[str, str]]:
    for place in sorted(folder.rglob("*")):
        if place.suffix in (".json", ".html", ".csv", ".svg", ".txt", ".md", ".tex"):
            yield place.name, place.read_text(encoding="utf-8").replace("\u00a0", " ").replace("\\u00a0", " ")


def _found(record: dict[str, Any], folder: Path) -> set[str]:
    """Search every text for absolute numbers: long ones in any power of ten, short ones with their unit."""
    absolute = list(_absolutes(record))
    assert len(absolute) > 300
    cited = [source["citation"].replace("\u00a0", " ") for source in record["sources"].values()]
    cited += [source["title"] for source in record["sources"].values()]
    long = {_mantissa(number) for value, _, stated in absolute for number in (value, stated)}
    long = {mantissa for mantissa in long if not _simple(float(mantissa))}
    short: set[str] = set()
    for si, unit, value in absolute:
        for digits in (2, 3, 4, 6):
            if unit and unit != "1":
                short |= {spaced(value, unit, digits).replace("\u00a0", " "), f"{value:.{digits}g} {unit}"}
            if unit in ("s", "J", "V", "W", "m^2", "W/m^2"):
                short |= {amount(si, unit, digits).replace("\u00a0", " "), engineering(si, unit, digits)}
            if unit == "V":
                short |= {volts(si, digits).replace("\u00a0", " "), f"{1e3 * si:.{digits}g} mV"}
    pattern = re.compile(r"(?<![\d.])(\d+(?:\.\d+)?(?:[e×]10?[-−⁻⁰¹²³⁴⁵⁶⁷⁸⁹\d]+)?) [A-Za-zµΩ°]")
    hits: set[str] = set()
    for name, whole in _texts(folder):
        text = whole
        for citation in sorted(cited, key=len, reverse=True):  # titles of sources are public words
            text = text.replace(citation, "")
        for token in re.findall(r"\d+\.\d+(?:[eE][-+]?\d+)?|\d+[eE][-+]?\d+|\d{6,}", text):
            digits = token.lower().split("e")[0].replace(".", "").strip("0")
            if len(digits) >= DIGITS and float(token) and _mantissa(float(token)) in long:
                hits.add(f"{name}: {token}")
        near = {text[match.start() : match.end() + 14] for match in pattern.finditer(text)}
        joined = "\n".join(near)
        for form in short:
            if re.search(rf"(?m)^{re.escape(form)}(?![\w/^])", joined):
                hits.add(f"{name}: {form}")
    return hits


def _write(record: dict[str, Any], folder: Path) -> Path:
    folder.mkdir()
    fill_folder(folder, record)
    (folder / "print").mkdir()
    write_figures(record, folder / "print")
    for form in FORMATS:
        (folder / form).mkdir()
        write_tables(record, folder / form, form)
    (folder / "terminal.txt").write_text(verdict_text(record), encoding="utf-8")
    return folder


@pytest.mark.parametrize("source", [mixed, worked], ids=["mixed", "worked"])
def test_no_absolute_number_is_anywhere(source, tmp_path: Path):
    record = source()
    folder = _write(ratio_only(record), tmp_path / "ratios")
    assert _found(record, folder) == set()
    for place in folder.rglob("*.png"):
        assert _chunks(place.read_bytes()) <= {b"IHDR", b"pHYs", b"IDAT", b"IEND"}, place.name


def test_the_search_can_fail(tmp_path: Path):
    record = mixed()
    place = tmp_path / "ordinary"
    place.mkdir()
    fill_folder(place, record)
    found = _found(record, place)
    names = {hit.split(":")[0] for hit in found}
    assert {"record.json", "report.html", "summary.json", "curves.csv", "policies.csv", "ledger.csv"} <= names
    assert any(hit.endswith((" V", " ns", " fJ", " pJ")) for hit in found)


def _chunks(data: bytes) -> set[bytes]:
    found, place = set(), 8
    while place < len(data):
        (length,) = struct.unpack(">I", data[place : place + 4])
        found.add(data[place + 4 : place + 8])
        place += 12 + length
    return found


#: keys whose numbers are ratios, shares, counts or knobs without a dimension and may stay as they are
KEPT = {
    *("schema", "advantage", "advantage_low", "advantage_high", "margin", "difference", "size", "level", "value"),
    *("inputs_with_effect", "inputs_without_range", "inputs_of_judgement", "required_advantage", "exponent", "line"),
    *("guard_band_delay", "guard_band_leakage", "temperatures", "temperature", "supply_points", "refine_relative"),
    *("delay_shares", "energy_shares", "device_margins", "sizes", "advantages", "year", "parts", "total"),
    *("ratio_low", "ratio_high", "covered", "points", "share", "copies", "reaching", "better", "infeasible", "worst"),
    *("at_point", "reoptimised", "of_time", "of_energy"),  # elasticities
    *("draws", "blocks", "seed", "inputs", "judgement", "likely", "unlikely", "error", "negligible", "place"),
    *("without_candidate", "without_contender", "unbounded", "share_error", "first", "first_error", "total_error"),
    *("left_out", "constant_below"),
    *("required advantage", "likely from", "unlikely up to"),  # criteria
    *("worth", "worth_error", "worth_halved", "worth_reachable", "worth_per_cost", "cost", "enough"),
}


def _same(old: Any, new: Any, key: str) -> Iterator[str]:
    """Keys under which a number came through unchanged."""
    if isinstance(old, dict) and isinstance(new, dict):
        for name in old.keys() & new.keys():
            inner = key if key in ("delay_shares", "energy_shares", "device_margins", "parts") else name
            yield from _same(old[name], new[name], inner)
    elif isinstance(old, list) and isinstance(new, list):
        for a, b in zip(old, new, strict=False):
            yield from _same(a, b, key)
    elif isinstance(new, (int, float)) and not isinstance(new, bool) and old == new and new not in (0.0, 1.0):
        yield key


@pytest.mark.parametrize("source", [mixed, worked, crossing], ids=["mixed", "worked", "crossing"])
def test_only_numbers_without_dimension_come_through(source):
    record = source()
    for row in record["requirements"]:
        if row["demanded"] == 1.0:
            row["offered"] = None  # a multiple of 1 is the number itself, and has no dimension
    assert set(_same(record, ratio_only(record), "")) <= KEPT


def test_ratios_are_those_of_the_record():
    record = mixed()
    found = ratio_only(record)
    old, new = record["policies"][0], found["policies"][0]
    assert new["advantage"] == old["advantage"]
    for before, after in zip(old["contenders"], new["contenders"], strict=True):
        if before["point"]:
            ratio = before["point"]["energy"] / old["candidate"]["point"]["energy"]
            assert after["point"]["energy"] == pytest.approx(ratio, rel=1e-14)
    assert new["candidate"]["point"]["energy"] == 1.0
    for before, after in zip(record["advantage_against_time"], found["advantage_against_time"], strict=True):
        assert after["advantage"] == before["advantage"]


def test_input_files_are_named_by_digest_only(tmp_path: Path):
    found = ratio_only(mixed())
    assert found["files"]
    assert all(set(row) == {"name", "kind", "sha256"} for row in found["files"])
    with pytest.raises(EvenloadError, match="lacks what is needed"):
        recreate(found, tmp_path)


def test_values_of_all_technologies_and_wires_are_left_out():
    for row in ratio_only(mixed())["ledger"]:
        if not row["owner"].startswith(("study", "circuit")) or row["unit"] != "1":
            assert set(row["value"]) == {"[left out]"}


def test_again_changes_nothing():
    once = ratio_only(mixed())
    assert ratio_only(once) == once


def test_a_record_without_a_permitted_point_can_be_shown(tmp_path: Path):
    place = tmp_path / "none"
    place.mkdir()
    fill_folder(place, ratio_only(infeasible()))
    assert "Ratios only:" in (place / "report.html").read_text(encoding="utf-8")


def test_the_report_says_what_the_bases_are(tmp_path: Path):
    fill_folder(tmp_path, ratio_only(mixed()))
    text = (tmp_path / "report.html").read_text(encoding="utf-8")
    assert "T0 is the required time" in text
    assert "energy per operation (E0)" in text
    assert "time_over_T0" in text


@pytest.mark.parametrize(
    ("text", "left"),
    [
        ("needs 0.7 V at 25 degC", "needs [left out] at [left out]"),
        ("awake for 20 ms each second", "awake for [left out] each second"),
        ("advantage 0.1461 is below 2", "advantage 0.1461 is below 2"),
        ("I_on 650 uA/um at 0.65V", "I_on [left out] at [left out]"),
        ("cannot reach 1e-12 s per operation", "cannot reach [left out] per operation"),
        ("6.5 × 10⁻¹³ J", "[left out]"),
        ("open-7nm-low node n7, 3 inputs", "open-7nm-low node n7, 3 inputs"),
        ("cost 1234.5 wafers", "cost [left out] wafers"),
    ],
)
def test_numbers_leave_free_texts(text: str, left: str):
    assert scrubbed(text, frozenset({"0.1461", "2"})) == left
