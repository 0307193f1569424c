"""What a description asks for: every refusal read whole, choices among curves, and numbers of whole files."""

from __future__ import annotations

import json
import math
import tomllib
from collections.abc import Sequence
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from benchmark import api
from benchmark.curves.extraction import Found, extract_all
from benchmark.curves.quantities import KINDS, QuantityName
from benchmark.curves.read import read_curves
from benchmark.curves.requests import ExtractTable
from benchmark.errors import InputRefused
from benchmark.sets.problems import Collector
from tests.near import near

HEAD = """\
schema = 1
kind = "curves"
file = "raw.csv"
along = "control_voltage"
evidence = "invented"
source = "invented"
conditions = "probe station"
date = 2026-11-20
"""
FIXED = 'fixed = { temperature = { value = 25.0, unit = "degC" } }\n'
TRANSFER = """\
[[column]]
header = "VG"
meaning = "control_voltage"
kind = "axis"
unit = "V"
[[column]]
header = "VD"
meaning = "path_voltage"
kind = "axis"
unit = "V"
[[column]]
header = "Die"
meaning = "device"
kind = "label"
[[column]]
header = "Dir"
meaning = "sweep"
kind = "label"
[[column]]
header = "ID"
meaning = "path_current"
kind = "value"
unit = "A"
floor = { value = 1, unit = "fA" }
"""
V = [round(0.05 * step, 2) for step in range(13)]
#: device -> swing [V/decade], all at 1 pA at 0 V and 0.6 V on the path
DEVICES = {"A1": 0.06, "A2": 0.07, "A3": 0.08}
WINDOW = 0.04


def current(device: str, direction: str, control: float, path: float) -> float:
    """Straight in the logarithm; the backward sweep lies 40 mV lower; half the path voltage halves the current."""
    at = control + (WINDOW if direction == "backward" else 0.0)
    return float(1e-12 * 10.0 ** (at / DEVICES[device]) * path / 0.6)


def transfer_rows(devices: Sequence[str] = tuple(DEVICES), paths: Sequence[float] = (0.3, 0.6)) -> list[str]:
    rows = ["VG,VD,Die,Dir,ID"]
    for device in devices:
        for path in paths:
            for direction, voltages in (("forward", V), ("backward", V[::-1])):
                rows += [f"{v},{path},{device},{direction},{current(device, direction, v, path)!r}" for v in voltages]
    return rows


def write(
    folder: Path, asked: str, columns: str = TRANSFER, rows: Sequence[str] | None = None, head: str = HEAD
) -> Path:
    folder.mkdir(parents=True, exist_ok=True)
    (folder / "raw.csv").write_text("\n".join(rows or transfer_rows()) + "\n", encoding="utf-8")
    path = folder / "raw.toml"
    path.write_text(head + FIXED + columns + asked, encoding="utf-8")
    return path


def read(path: Path) -> tuple[list[Found], list[str]]:
    collector = Collector()
    curves = read_curves(path, collector, frozenset({"invented"}), "raw.toml")
    found = [] if curves is None else extract_all(curves, collector)
    return found, [str(problem) for problem in sorted(set(collector.problems))]


def one(folder: Path, asked: str, **more: object) -> Found:
    found, problems = read(write(folder, f"[[extract]]\n{asked}", **more))  # type: ignore[arg-type]
    assert problems == []
    assert len(found) == 1
    return found[0]


AVERAGE = 'quantity = "average_swing"\nspan = { low = 10, high = 1000, unit = "pA" }\n'
CHOSEN = 'over = "A1"\nsweep = "forward"\npath_voltage = { value = 600, unit = "mV" }\n'


def test_the_words_of_quantities_are_those_that_have_a_reading():
    assert set(QuantityName.__args__) == set(KINDS)  # type: ignore[attr-defined]
    keys = {key for kind in KINDS.values() for key in (*kind.needs, *kind.may)}
    assert keys <= set(ExtractTable.model_fields)


def test_one_curve_is_chosen_by_device_sweep_and_path_voltage(tmp_path: Path):
    found = one(tmp_path, AVERAGE + CHOSEN)
    assert found.value == near(0.06, rel=1e-12)
    assert (found.request.unit, found.devices[0].device) == ("mV/decade", "A1")
    assert found.devices[0].sweeps[0].labels == {"device": "A1", "sweep": "forward"}


def test_the_median_over_devices_and_what_is_left_out(tmp_path: Path):
    chosen = CHOSEN.replace('"A1"', '"median"')
    found = one(tmp_path, AVERAGE + chosen)
    assert found.value == near(0.07, rel=1e-12)
    assert found.over is not None
    assert found.over.count == 3
    assert found.over.seen_spread == near(0.01 / (1.5 / math.sqrt(math.pi)), rel=1e-9)
    assert found.spread == found.uncertainty
    assert one(tmp_path, AVERAGE + chosen + 'spread = "none"\n').spread is None
    spread = one(tmp_path, AVERAGE + chosen + 'spread = "devices"\n')
    assert spread.over is not None
    assert spread.spread == spread.over.device_spread == near(0.01 / (1.5 / math.sqrt(math.pi)), rel=1e-6)
    few = one(tmp_path, AVERAGE + chosen + 'leave_out = ["A3"]\n')
    assert few.value == near(0.065, rel=1e-12)
    assert "left out, as the description says: A3" in few.warnings
    hero = one(tmp_path, AVERAGE + CHOSEN, head=HEAD + "hero = true\n")
    assert hero.warnings[0] == "raw.csv holds a hero device: one chosen sample, not a typical one"


def test_the_mean_of_both_sweeps_and_the_window_between_them(tmp_path: Path):
    asked = 'quantity = "threshold_at_current"\nlevel = { value = 1, unit = "nA" }\n'
    mean = one(tmp_path, asked + CHOSEN.replace('"forward"', '"mean"'))
    forward = one(tmp_path, asked + CHOSEN)
    assert forward.value == near(0.18, rel=1e-9)
    assert mean.value == near(0.16, rel=1e-9)
    assert {part.name: part.size for part in mean.parts}["difference of the sweeps"] == near(0.02 / math.sqrt(3.0))
    window = CHOSEN.replace('sweep = "forward"\n', "")
    found = one(tmp_path, asked.replace("threshold_at_current", "hysteresis_window") + window)
    assert found.value == near(WINDOW, rel=1e-9)


def test_the_effective_current_takes_two_curves(tmp_path: Path):
    asked = 'quantity = "effective_current"\nsupply = { value = 0.6, unit = "V" }\nover = "A1"\nsweep = "forward"\n'
    found = one(tmp_path, asked)
    assert found.value == near(0.5 * (current("A1", "forward", 0.6, 0.3) + current("A1", "forward", 0.3, 0.6)))
    path = write(tmp_path, f"[[extract]]\n{asked}", rows=transfer_rows(paths=(0.6,)))
    assert read(path)[1] == [
        "raw.toml:34: extract.0: effective_current (device A1): the effective current needs a curve at path_voltage "
        "0.3 V; found 0.6 V"
    ]


OUTPUT = TRANSFER.replace('"control_voltage"', '"x"').replace('"path_voltage"', '"control_voltage"').replace(
    '"x"', '"path_voltage"'
)  # fmt: skip


def test_the_effective_current_of_output_curves_is_the_same(tmp_path: Path):
    rows = ["VG,VD,Die,Dir,ID"]
    for control in (0.3, 0.6):
        for direction, voltages in (("forward", V), ("backward", V[::-1])):
            rows += [f"{v},{control},A1,{direction},{current('A1', direction, control, v)!r}" for v in voltages]
    head = HEAD.replace('"control_voltage"', '"path_voltage"')
    asked = 'quantity = "effective_current"\nsupply = { value = 0.6, unit = "V" }\nsweep = "forward"\n'
    found = one(tmp_path, asked, columns=OUTPUT, rows=rows, head=head)
    assert found.value == near(0.5 * (current("A1", "forward", 0.6, 0.3) + current("A1", "forward", 0.3, 0.6)))


def columns(*stated: tuple[str, str, str, str]) -> str:
    return "".join(
        f'[[column]]\nheader = "{header}"\nmeaning = "{meaning}"\nkind = "{kind}"\n'
        + (f'unit = "{unit}"\n' if kind != "label" else "")
        for header, meaning, kind, unit in stated
    )


def test_charge_capacitance_and_their_units(tmp_path: Path):
    stated = columns(("V", "control_voltage", "axis", "mV"), ("C", "input_capacitance_per_width", "value", "fF/um"))
    rows = ["V,C", *(f"{100 * k},0.8" for k in range(8))]
    span = 'span = { low = 0.05, high = 0.65, unit = "V" }\n'
    charge = one(tmp_path, f'quantity = "switching_charge"\n{span}', columns=stated, rows=rows)
    assert (charge.value, charge.request.unit) == (near(0.8e-9 * 0.6), "fC/um")
    named = f'quantity = "switching_capacitance"\nname = "gate_capacitance_total"\n{span}'
    capacitance = one(tmp_path, named, columns=stated, rows=rows)
    assert (capacitance.value, capacitance.request.unit) == (near(0.8e-9), "fF/um")


def test_contacts_of_a_file(tmp_path: Path):
    stated = columns(("L", "contact_spacing", "axis", "um"), ("RW", "resistance_width", "value", "kohm um"))
    rows = ["L,RW", *(f"{length},{2 * 0.12 + 0.06 * length!r}" for length in (2, 4, 8, 16, 32))]
    head = HEAD.replace('"control_voltage"', '"contact_spacing"')
    for quantity, value, unit in (
        ("contact_resistance", 120e-6, "kohm um"),
        ("sheet_resistance", 60.0, "ohm"),
        ("transfer_length", 2e-6, "um"),
        ("contact_resistivity", 2.4e-10, "ohm m^2"),
    ):
        found = one(tmp_path, f'quantity = "{quantity}"\n', columns=stated, rows=rows, head=head)
        assert (found.value, found.request.unit) == (near(value), unit)
    short = 'quantity = "sheet_resistance"\nspan = { low = 0, high = 9, unit = "um" }\n'
    assert read(write(tmp_path, f"[[extract]]\n{short}", stated, rows, head))[1] == [
        "raw.csv:2: resistance_width: sheet_resistance: the span has too few structures (rows 2 to 4); found 3; "
        "allowed: 4 or more"
    ]


def test_slopes_of_resistance_over_pressure_and_drive(tmp_path: Path):
    stated = columns(("p", "pressure", "axis", "MPa"), ("R", "path_resistance", "value", "Mohm"))
    rows = ["p,R", *(f"{100 * k},{1000.0 * 10.0 ** (-0.2 * k)!r}" for k in range(8))]
    head = HEAD.replace('"control_voltage"', '"pressure"')
    found = one(
        tmp_path, 'quantity = "resistance_slope"\nname = "resistance_slope"\n', columns=stated, rows=rows, head=head
    )
    assert (found.value, found.request.unit) == (near(2e-9), "decade/GPa")
    found = one(tmp_path, 'quantity = "log_resistance_slope"\n', columns=stated, rows=rows, head=head)
    assert (found.value, found.request.unit) == (near(-2e-9 * math.log(10.0)), "1/MPa")


def test_pull_in_pull_out_and_the_resistance_of_a_relay(tmp_path: Path):
    stated = columns(
        ("V", "control_voltage", "axis", "V"),
        ("u", "displacement", "value", "nm"),
        ("R", "path_resistance", "value", "kohm"),
    )
    up = [(v, 1.0 if v < 0.32 else 20.0) for v in V]
    down = [(v, 1.0 if v < 0.12 else 20.0) for v in V[::-1]][1:]
    rows = ["V,u,R", *(f"{v},{u},{1.5 if u > 10 else 900.0}" for v, u in [*up, *down])]
    head = HEAD + 'turns = ["forward", "backward"]\n'
    step = 'step = { value = 10, unit = "nm" }\n'
    found = one(
        tmp_path,
        f'quantity = "pull_in_voltage"\nname = "closing_voltage"\n{step}',
        columns=stated,
        rows=rows,
        head=head,
    )
    assert found.value == near(0.325)
    assert found.uncertainty == near(0.025 / math.sqrt(3.0))
    found = one(tmp_path, f'quantity = "pull_out_voltage"\n{step}', columns=stated, rows=rows, head=head)
    assert found.value == near(0.125)
    asked = 'quantity = "resistance"\nname = "on_resistance"\nat = { value = 0.6, unit = "V" }\nsweep = "forward"\n'
    assert one(tmp_path, asked, columns=stated, rows=rows, head=head).value == 1500.0


def test_cycles_until_a_limit(tmp_path: Path):
    stated = columns(
        ("N", "switching_cycles", "axis", "1"),
        ("R", "path_resistance", "value", "kohm"),
        ("Die", "device", "label", ""),
    )
    rows = ["N,R,Die"]
    for device, last in (("A1", 3), ("A2", 4), ("A3", 99)):
        rows += [f"1e{6 + k},{1.0 if k < last else 50.0},{device}" for k in range(5)]
    head = HEAD.replace('"control_voltage"', '"switching_cycles"')
    asked = 'quantity = "cycles_to_failure"\nname = "endurance_cycles"\nover = "median"\n'
    asked += 'level = { value = 10, unit = "kohm" }\n'
    found = one(tmp_path, asked, columns=stated, rows=rows, head=head)
    assert found.value == near(10.0**9.5)
    assert found.bound == ""
    assert found.warnings == ("A3: no failure within the data", "1 of 3 devices are known only by a bound")
    assert found.uncertainty is None  # the quartiles rest on the bound
    lived = one(tmp_path, asked.replace('"median"', '"A3"'), columns=stated, rows=rows, head=head)
    assert (lived.value, lived.bound, lived.uncertainty) == (1e10, "at-least", None)


# -- refusals --------------------------------------------------------------------------------------------------

#: what is asked, and every word that is said about it
CASES = tomllib.loads((Path(__file__).parent.parent / "data" / "curve-requests.toml").read_text(encoding="utf-8"))[
    "case"
]


@pytest.mark.parametrize("case", CASES, ids=lambda case: case["refused"][0].partition("extract.0")[2][:60])
def test_a_request_that_cannot_be_answered_is_refused_with_exactly_these_words(case: dict[str, Any], tmp_path: Path):
    found, problems = read(write(tmp_path, f"[[extract]]\n{case['asked']}"))
    assert problems == case["refused"]
    assert found == []


def test_all_problems_of_all_requests_come_in_one_pass(tmp_path: Path):
    asked = "".join(f"[[extract]]\n{case['asked']}" for case in CASES[:6])
    _, problems = read(write(tmp_path, asked))
    assert [problem.partition("extract.")[2][0] for problem in problems] == ["0", "1", "2", "3", "4", "5"]


def test_devices_without_labels_and_directions_without_words(tmp_path: Path):
    stated = columns(("V", "control_voltage", "axis", "V"), ("I", "path_current", "value", "A"))
    rows = ["V,I", *(f"{v},{current('A1', 'forward', v, 0.6)!r}" for v in V)]
    asked = AVERAGE + 'over = "median"\n'
    said = read(write(tmp_path, f"[[extract]]\n{asked}", stated, rows))[1]
    assert said == [
        "raw.toml:20: extract.0: average_swing: a median over devices needs a label device; allowed: a label column or "
        'a label with meaning = "device"'
    ]
    said = read(write(tmp_path, f'[[extract]]\n{AVERAGE}sweep = "backward"\n', stated, rows))[1]
    assert said == [
        "raw.toml:20: extract.0: average_swing: there is no backward sweep; found forward; allowed: curves with the "
        'label sweep, or turns = ["forward", "backward"]'
    ]
    half = 'quantity = "threshold_extrapolated"\nhalf_path_voltage = "subtracted"\n'
    said = read(write(tmp_path, f"[[extract]]\n{half}", stated, rows))[1]
    assert said == [
        "raw.toml:20: extract.0: threshold_extrapolated: half the path voltage is to be subtracted, and no path "
        "voltage is stated for the curve; state it in the description: fixed.path_voltage"
    ]


def test_a_spread_of_devices_that_cannot_be_told_is_refused(tmp_path: Path):
    chosen = CHOSEN.replace('"A1"', '"median"')
    noisy = [row if number % 3 else _doubled(row) for number, row in enumerate(transfer_rows())]
    path = write(tmp_path, f'[[extract]]\n{AVERAGE}{chosen}spread = "devices"\n', rows=noisy)
    found, said = read(path)
    assert found == []
    assert said == [
        "raw.toml:34: extract.0: average_swing: the spread between devices cannot be told from the uncertainty of "
        'measurement, or rests on bounds; state spread = "uncertainty" or "none"'
    ]


def _doubled(row: str) -> str:
    head, _, last = row.rpartition(",")
    return row if last == "ID" else f"{head},{3.0 * float(last)!r}"


def test_a_description_that_asks_for_nothing_is_refused(tmp_path: Path):
    with pytest.raises(InputRefused, match=r"raw.toml: extract: nothing is asked for; allowed: \[\[extract\]\] tables"):
        api.extract(write(tmp_path, ""))


def test_a_file_of_another_kind_is_refused_in_one_line(tmp_path: Path):
    (tmp_path / "study.toml").write_text('schema = 1\nkind = "wires"\n', encoding="utf-8")
    with pytest.raises(InputRefused) as caught:
        api.extract(tmp_path / "study.toml")
    (problem,) = caught.value.problems
    assert str(problem).endswith(
        "study.toml:2: kind: is no description of a raw measured file; found 'wires'; allowed: kind = \"curves\""
    )


# -- dialects --------------------------------------------------------------------------------------------------


def test_three_dialects_of_one_table_give_identical_bytes(tmp_path: Path):
    """Plain; decimal commas, semicolons, nA, mV and Windows line ends; tabs, a unit row and a comment before it."""
    plain = transfer_rows(("A1",), (0.6,))
    cells = [row.split(",") for row in plain[1:]]
    exact = [[v, d, die, way, f"{float(i):.6e}"] for v, d, die, way, i in cells]
    fitted = AVERAGE.replace("average", "fitted").replace("high = 1000,", "high = 1e7,")
    asked = f'[[extract]]\n{AVERAGE}sweep = "forward"\n[[extract]]\n{fitted}sweep = "backward"\n'
    first = write(tmp_path / "a", asked, rows=[plain[0], *(",".join(row) for row in exact)])
    german = [
        ";".join([*(_comma(x, shift) for x, shift in zip(row[:2], (3, 3), strict=True)), *row[2:4], _comma(row[4], 9)])
        for row in exact
    ]
    second = write(
        tmp_path / "b",
        asked,
        columns=TRANSFER.replace('unit = "V"', 'unit = "mV"').replace('unit = "A"', 'unit = "nA"'),
        rows=["VG;VD;Die;Dir;ID", *german],
        head=HEAD + 'delimiter = ";"\ndecimal = ","\n',
    )
    raw = second.with_suffix(".csv")
    raw.write_bytes(b"\xef\xbb\xbf" + raw.read_bytes().replace(b"\n", b"\r\n"))
    no_units = TRANSFER.replace('unit = "V"\n', "").replace('unit = "A"\n', "")
    third = write(
        tmp_path / "c",
        asked,
        columns=no_units,
        rows=[
            "# written by an analyser",
            "VG\tVD\tDie\tDir\tID",
            "V\tV\t-\t-\tuA",
            *("\t".join([*row[:4], _shifted(row[4], 6)]) for row in exact),
        ],
        head=HEAD + 'delimiter = "\\t"\ncomment = "#"\nunits = "row"\n',
    )
    texts = []
    for path in (first, second, third):
        extraction = api.extract(path)
        readings = [device.read for one in extraction.found for device in one.devices]
        shown = [
            {key: one[key] for key in ("value", "standard_uncertainty", "parts")} for one in extraction.data["numbers"]
        ]
        texts.append(f"{[(read.value, read.span, read.parts, read.bound) for read in readings]!r} {json.dumps(shown)}")
    assert texts[0] == texts[1] == texts[2]
    assert '"value": 59.99999' in texts[0]


def _shifted(text: str, power: int) -> str:
    mantissa, _, exponent = text.partition("e")
    return f"{mantissa}e{int(exponent or 0) + power}"


def _comma(text: str, power: int) -> str:
    return _shifted(text, power).replace(".", ",")


def test_the_numbers_are_those_of_the_array_functions(tmp_path: Path):
    found = one(tmp_path, AVERAGE + CHOSEN)
    v = np.array(V)
    i = np.array([current("A1", "forward", one_v, 0.6) for one_v in V])
    crossed = np.interp(np.log([1e-11, 1e-9]), np.log(i), v)
    assert found.value == near(float(np.diff(crossed)[0]) / 2.0, rel=1e-12)
