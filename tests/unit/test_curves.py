"""Raw measured files: three dialects of one table are one table, and everything done to a file is said."""

from __future__ import annotations

import hashlib
from decimal import Decimal
from fractions import Fraction
from pathlib import Path

import mpmath
import numpy as np
import pytest

from benchmark.curves.meanings import MEANINGS, PER_WIDTH
from benchmark.curves.record import MeasuredCurves
from benchmark.sets.library import shipped_nodes
from benchmark.sets.problems import Collector
from benchmark.sets.tables import COLUMN_UNITS, MAX_COLUMNS, MAX_ROWS, read_table
from benchmark.units import parse_unit
from tests.raw_curves import HEAD, SOURCES, Dialect, Truth, expected, outcome, read, refusals, write
from tests.refusals import RAW, RAW_CURVES, SIDE, SIDE_BY_SIDE

VOLT = '[[column]]\nheader = "V"\nmeaning = "control_voltage"\nkind = "axis"\nunit = "V"\n'
AMPERE = '[[column]]\nheader = "I"\nmeaning = "path_current"\nkind = "value"\nunit = "A"\n'
WARM = 'fixed = { temperature = { value = 25.0, unit = "degC" } }\n'
PLAIN = HEAD + 'file = "raw.csv"\nalong = "control_voltage"\n' + WARM


def put(folder: Path, raw: str | bytes, description: str) -> Path:
    folder.mkdir(exist_ok=True)
    name = next(line.split('"')[1] for line in description.splitlines() if line.startswith("file = "))
    (folder / name).write_bytes(raw if isinstance(raw, bytes) else raw.encode("utf-8"))
    path = folder / name.replace(".csv", ".toml")
    path.write_text(description, encoding="utf-8")
    return path


def values(curves: MeasuredCurves, meaning: str) -> list[list[float]]:
    return [sweep.columns[meaning].tolist() for sweep in curves.sweeps]


# -- one table, three dialects ---------------------------------------------------------------------------------

DEMO = shipped_nodes() / "tables" / "demo-current.csv"


def demo() -> list[list[str]]:
    return [line.split(",") for line in DEMO.read_text(encoding="utf-8").splitlines()]


DEMO_COLUMNS = """
[[column]]
header = "sweep"
meaning = "sweep"
kind = "label"
[[column]]
header = "control_voltage"
meaning = "control_voltage"
kind = "axis"
unit = "{volt}"
sign = "{sign}"
[[column]]
header = "path_voltage"
meaning = "path_voltage"
kind = "axis"
unit = "{volt}"
sign = "{sign}"
[[column]]
header = "temperature"
meaning = "temperature"
kind = "axis"
unit = "{kelvin}"
[[column]]
header = "current"
meaning = "path_current_per_width"
kind = "value"
unit = "{ampere}"
sign = "{sign}"
floor = {{ value = {floor}, unit = "{ampere}" }}
"""


def described(more: str = "", **words: str) -> str:
    kept = {"volt": "V", "kelvin": "degC", "ampere": "A/um", "sign": "positive", "floor": "1.0e-13"} | words
    return f'{HEAD}file = "raw.csv"\nalong = "control_voltage"\n{more}{DEMO_COLUMNS.format(**kept)}'


def three_dialects(folder: Path) -> list[MeasuredCurves]:
    header, *rows = demo()
    plain = "\n".join(",".join(row) for row in [header, *rows]) + "\n"
    micro = [[s, v, p, t, f"{Decimal(i) * 10**6:f}".replace(".", ",")] for s, v, p, t, i in rows]
    comma = [[s, v.replace(".", ","), p.replace(".", ","), t, i] for s, v, p, t, i in micro]
    semicolons = (
        "\ufeffInvented spreadsheet\r\n" + "\r\n".join(";".join(row) for row in [header, *comma]) + "\r\n;;;;\r\n"
    )
    other = [[s, f"-{Decimal(v) * 1000}", f"-{Decimal(p) * 1000}", "298.15", f"-{i}"] for s, v, p, t, i in rows]
    order = [4, 2, 0, 3, 1]
    tabs = "\n".join(
        "\t".join(row[k] for k in order) for row in [header, *(other[k] for k in (5, 2, 7, 0, 3, 6, 1, 4))]
    )
    more = 'delimiter = ";"\ndecimal = ","\nskip_rows = 1\n'
    return [
        read(put(folder / "plain", plain, described())),
        read(put(folder / "comma", semicolons, described(more, ampere="uA/um", floor="1.0e-7"))),
        read(
            put(
                folder / "tabs",
                tabs,
                described('delimiter = "\\t"\nsort = true\n', volt="mV", kelvin="K", sign="negative"),
            )
        ),
    ]


def test_three_dialects_of_one_table_give_the_same_bits(tmp_path: Path):
    """Decimal points and A/um; spreadsheet with decimal commas and uA/um; shuffled p type in mV with minus signs."""
    plain, *others = three_dialects(tmp_path)
    assert plain.sweeps[0].columns["path_current_per_width"].tolist() == [1e-6, 1e-4, 1e-2, 1.0]
    assert [sweep.labels for sweep in plain.sweeps] == [{"sweep": "forward"}, {"sweep": "backward"}]
    for other in others:
        twins = {sweep.labels["sweep"]: sweep for sweep in other.sweeps}
        for sweep in plain.sweeps:
            twin = twins[sweep.labels["sweep"]]
            assert {k: v.tobytes() for k, v in sweep.columns.items()} == {
                k: v.tobytes() for k, v in twin.columns.items()
            }
            assert (sweep.fixed, sweep.floor) == (twin.fixed, twin.floor)
            assert (
                sweep.at_floor["path_current_per_width"].tobytes() == twin.at_floor["path_current_per_width"].tobytes()
            )


def test_the_clean_table_of_a_set_and_the_raw_file_are_the_same_numbers(tmp_path: Path):
    clean = read_table(DEMO, "current", SOURCES, Collector(), "demo-current.csv")
    raw = read(put(tmp_path, DEMO.read_bytes(), described()))
    assert clean is not None
    for meaning in ("control_voltage", "path_current_per_width"):
        assert np.concatenate(values(raw, meaning)).tobytes() == clean.table.columns[meaning].tobytes()
    assert raw.sweeps[0].fixed == {"path_voltage": 0.3, "temperature": 298.15}
    assert raw.sweeps[0].floor == clean.table.floor


def test_forty_devices_forward_and_backward_side_by_side(tmp_path: Path):
    curves = {}
    for device in range(40):
        rising = [(Decimal(k) / 10, Decimal(device + 1).scaleb(k - 12)) for k in range(5)]
        curves[f"D{device:02}", "forward"] = rising
        curves[f"D{device:02}", "backward"] = [(v, 3 * i) for v, i in reversed(rising)]
    truth = Truth(curves, {f"D{device:02}": Decimal(device + 1) / 7 * 0 + 2 + device for device in range(40)})
    found = read(write(tmp_path, truth, Dialect(layout="side", delimiter=";", decimal=",", units="row", ampere=-9)))
    assert outcome(found) == expected(truth)
    assert len(found.sweeps) == 80
    assert "400 points in 80 curves of 5 points along control_voltage" in found.notes
    assert "device: D00, D01, D02, D03, D04, D05 and 34 more" in found.notes
    assert "sweep: forward, backward" in found.notes


# -- what a description can say ----------------------------------------------------------------------------------


def test_everything_that_was_done_is_said(tmp_path: Path):
    found = read(put(tmp_path, RAW, RAW_CURVES))
    assert list(found.notes) == [
        "read as utf-8 text, cells divided at ',', decimal sign '.'",
        "line 1 before the table left out",
        "1 comment line left out",
        "names of the columns on line 2, units on line 3",
        "column 1 (VG): voltage of the control terminal in V",
        "column 2 (VD): voltage across the switched path in V, tells curves apart",
        "column 3 (T): temperature in degC, 273.15 added for K, tells curves apart",
        "column 4 (Die): label device",
        "column 5 (ID): current of the switched path in uA, times 1e-06 for SI, divided by the width",
        "columns left out as declared: Time",
        "8 points in 2 curves of 4 points along control_voltage",
        "device: A1, A2",
        "fixed along a curve: path_voltage 0.3 V",
        "fixed along a curve: temperature 25 degC",
        "fixed along a curve: width 2 um",
        "path_current_per_width: 1 reading(s) at or below the floor: upper bounds of the size (1.0 pA)",
        "path_current_per_width: 0 reading(s) at or above the compliance: lower bounds of the size (1.0 mA)",
    ]


def test_provenance_digests_and_units_come_along(tmp_path: Path):
    path = put(tmp_path, RAW, RAW_CURVES + "\n")
    found = read(path)
    assert found.digest == hashlib.sha256(RAW.encode()).hexdigest()
    assert found.description_digest == hashlib.sha256(path.read_bytes()).hexdigest()
    assert (found.name, found.file, found.description) == ("raw", "raw.csv", "raw.toml")
    assert (found.evidence, found.source, found.conditions, found.hero) == (
        "invented",
        "invented",
        "probe station",
        False,
    )
    assert found.units == {
        "control_voltage": "V",
        "path_voltage": "V",
        "temperature": "degC",
        "path_current_per_width": "uA/um",
        "width": "um",
    }


def test_a_hero_device_and_a_date_are_named(tmp_path: Path):
    more = "hero = true\ndate = 2026-01-31\nconditions = "
    found = read(put(tmp_path, RAW, RAW_CURVES.replace("conditions = ", more, 1)))
    assert (found.hero, found.date) == (True, "2026-01-31")
    assert "the file says that it is one chosen device, not a typical one" in found.notes


def test_lines_are_those_of_the_file(tmp_path: Path):
    found = read(put(tmp_path, RAW, RAW_CURVES))
    assert [sweep.rows.tolist() for sweep in found.sweeps] == [[4, 5, 6, 7], [9, 10, 11, 12]]
    lines = RAW.splitlines()
    assert all(lines[row - 1].split(",")[3] == s.labels["device"] for s in found.sweeps for row in s.rows.tolist())


def test_a_shorter_group_side_by_side_has_fewer_points(tmp_path: Path):
    found = read(put(tmp_path, SIDE, SIDE_BY_SIDE))
    ends = {(s.labels["device"], s.labels["sweep"]): s.columns["control_voltage"].tolist() for s in found.sweeps}
    assert ends == {
        ("A1", "forward"): [0.0, 0.1, 0.2],
        ("A1", "backward"): [0.2, 0.1, 0.0],
        ("A2", "forward"): [0.0, 0.1, 0.2],
        ("A2", "backward"): [0.2, 0.1],
    }
    widths = {s.labels["device"]: s.fixed["width"] for s in found.sweeps}
    assert widths == {"A1": 2e-6, "A2": 1e-6}


@pytest.mark.parametrize(
    ("volts", "parts"),
    [
        ("0 1 2 1 0", {"forward": [0, 1, 2], "backward": [2, 1, 0]}),
        ("0 1 2 2 1 0", {"forward": [0, 1, 2], "backward": [2, 1, 0]}),  # a reading of its own on either side
        ("2 1 0 1 2", {"forward": [2, 1, 0], "backward": [0, 1, 2]}),
        ("0 1 2", {"forward": [0, 1, 2]}),
        (
            "0 1 0 2 0",
            {"forward 1": [0, 1], "backward 1": [1, 0], "forward 2": [0, 2], "backward 2": [2, 0]},
        ),
    ],
)
def test_turns_of_the_axis(volts: str, parts: dict[str, list[float]], tmp_path: Path):
    rows = "\n".join(f"{volt},{1.1 ** (k + 1):.3f}e-9" for k, volt in enumerate(volts.split()))
    found = read(put(tmp_path, f"V,I\n{rows}\n", PLAIN + 'turns = ["forward", "backward"]\n' + VOLT + AMPERE))
    named = {" ".join(s.labels.values()): s.columns["control_voltage"].tolist() for s in found.sweeps}
    assert named == parts


def test_rows_of_two_curves_may_alternate(tmp_path: Path):
    raw = "V,U,I\n0,0.1,1e-9\n0,0.2,2e-9\n1,0.1,3e-9\n1,0.2,4e-9\n"
    path_voltage = VOLT.replace('"V"\nmeaning = "control', '"U"\nmeaning = "path')
    found = read(put(tmp_path, raw, PLAIN + VOLT + path_voltage + AMPERE))
    assert [(s.fixed["path_voltage"], s.columns["path_current"].tolist()) for s in found.sweeps] == [
        (0.1, [1e-9, 3e-9]),
        (0.2, [2e-9, 4e-9]),
    ]


def test_one_column_per_curve_beside_a_shared_axis(tmp_path: Path):
    low = AMPERE + 'fixed = { path_voltage = { value = 50, unit = "mV" } }\n'
    high = AMPERE.replace('"I"', '"J"') + 'fixed = { path_voltage = { value = 0.7, unit = "V" } }\n'
    found = read(put(tmp_path, "V,I,J\n0,1e-9,2e-9\n1,3e-9,4e-9\n2,5e-9,\n", PLAIN + VOLT + low + high))
    assert [(s.fixed["path_voltage"], s.columns["control_voltage"].tolist()) for s in found.sweeps] == [
        (0.05, [0.0, 1.0, 2.0]),
        (0.7, [0.0, 1.0]),
    ]


def test_a_shared_value_column_belongs_to_every_curve(tmp_path: Path):
    shared = AMPERE.replace('"I"', '"R"').replace("path_current", "path_resistance").replace('"A"', '"ohm"')
    one = AMPERE + 'labels = { device = "A1" }\n'
    other = AMPERE.replace('"I"', '"J"') + 'labels = { device = "A2" }\n'
    found = read(put(tmp_path, "V,I,J,R\n0,1,2,7\n1,3,4,8\n", PLAIN + VOLT + one + other + shared))
    assert [sweep.labels for sweep in found.sweeps] == [{"device": "A1"}, {"device": "A2"}]
    assert values(found, "path_resistance") == [[7.0, 8.0], [7.0, 8.0]]
    assert values(found, "path_current") == [[1.0, 3.0], [2.0, 4.0]]


def test_words_in_quotes_may_hold_the_delimiter(tmp_path: Path):
    die = '[[column]]\nheader = "Die"\nmeaning = "device"\nkind = "label"\n'
    raw = 'V, I, "Die"\n0, 1e-9, "row 1, left"\n1, 2e-9, "row 1, left"\n'
    (sweep,) = read(put(tmp_path, raw, PLAIN + VOLT + AMPERE + die)).sweeps
    assert sweep.labels == {"device": "row 1, left"}


def test_logarithms_are_powers_of_ten_in_the_stated_unit(tmp_path: Path):
    one = PLAIN + VOLT + AMPERE.replace('"I"', '"log10(I/A)"') + 'scale = "log10"\n'
    other = PLAIN + VOLT + AMPERE.replace('"I"', '"log10(I/uA)"').replace('"A"', '"uA"') + 'scale = "log10"\n'
    ampere = read(put(tmp_path / "a", "V,log10(I/A)\n0,-12.5\n1,-9\n2,-3.123456\n", one))
    micro = read(put(tmp_path / "b", "V,log10(I/uA)\n0,-6.5\n1,-3\n2,2.876544\n", other))
    (first,), (second,) = values(ampere, "path_current"), values(micro, "path_current")
    assert first == second  # to the last bit, although the exponents differ
    assert first[1] == 1e-9
    assert np.allclose(first, [10**-12.5, 1e-9, 10**-3.123456], rtol=1e-14, atol=0.0)
    assert any("ten to the power of the number" in note for note in ampere.notes)


def test_powers_of_ten_are_rounded_once(tmp_path: Path):
    """Two hundred logarithms against the arithmetic of mpmath with 60 digits, rounded to a float once."""
    drawn = np.random.default_rng(7).integers(-150_000_000, -10_000_000, 200)
    texts = [f"{Decimal(int(number)).scaleb(-7):f}" for number in sorted(set(drawn.tolist()))]
    raw = "V,I\n" + "\n".join(f"{k},{text}" for k, text in enumerate(texts)) + "\n"
    (found,) = values(read(put(tmp_path, raw, PLAIN + VOLT + AMPERE + 'scale = "log10"\n')), "path_current")
    with mpmath.workdps(60):
        assert found == [float(mpmath.mpf(10) ** mpmath.mpf(text)) for text in texts]


def test_logarithms_nobody_declared_are_refused(tmp_path: Path):
    for header in ("log10(I)", "log I", "lg(I/A)", "Gain (dB)", "20 LOG|S|"):
        path = put(tmp_path, f"V,{header}\n0,1\n1,2\n", PLAIN + VOLT + AMPERE.replace('"I"', f'"{header}"'))
        assert refusals(path) == [
            f"raw.csv:1: {header}: looks like logarithms, and the description does not say so; "
            'allowed: scale = "log10" with the unit of the number itself, or scale = "linear"'
        ]
        path = put(
            tmp_path,
            f"V,{header}\n0,1\n1,2\n",
            PLAIN + VOLT + AMPERE.replace('"I"', f'"{header}"') + 'scale = "linear"\n',
        )
        assert values(read(path), "path_current") == [[1.0, 2.0]]


def test_a_logarithm_beyond_the_program_is_no_number(tmp_path: Path):
    path = put(tmp_path, "V,I\n0,-12\n1,4000\n", PLAIN + VOLT + AMPERE + 'scale = "log10"\n')
    assert refusals(path) == [
        "raw.csv:3: I: is not a number; found '4000'; allowed: a logarithm from -300 to 300",
    ]


def test_resistance_times_width_for_transmission_line_structures(tmp_path: Path):
    spacing = VOLT.replace('"control_voltage"', '"contact_spacing"').replace('unit = "V"', 'unit = "um"')
    ohm = AMPERE.replace("path_current", "path_resistance").replace('unit = "A"', 'unit = "ohm"') + "per_width = true\n"
    head = PLAIN.replace('along = "control_voltage"', 'along = "contact_spacing"')
    head = head.replace("fixed = {", 'fixed = { width = { value = 3, unit = "um" },')
    found = read(put(tmp_path, "V,I\n0.1,200\n0.2,290.1\n", head + spacing + ohm))
    assert values(found, "resistance_width") == [[0.0006, float(Fraction("290.1") * 3 / 10**6)]]
    assert found.units["resistance_width"] == "ohm um"
    assert any("times the width" in note for note in found.notes)


def test_a_width_column_divides_its_own_rows(tmp_path: Path):
    width = VOLT.replace('"V"\nmeaning = "control_voltage"', '"W"\nmeaning = "width"').replace(
        'unit = "V"', 'unit = "um"'
    )
    found = read(
        put(tmp_path, "W,V,I\n1,0,3\n1,1,4\n3,0,3\n3,1,4\n", PLAIN + width + VOLT + AMPERE + "per_width = true\n")
    )
    assert values(found, "path_current_per_width") == [[3e6, 4e6], [1e6, float(Fraction(4 * 10**6, 3))]]
    assert found.units["path_current_per_width"] == "A/um"


def test_a_file_without_header_is_read_by_position(tmp_path: Path):
    columns = VOLT.replace('header = "V"', "number = 2") + AMPERE.replace('header = "I"', "number = 1")
    description = PLAIN + 'has_header = false\ndelimiter = "whitespace"\nignore = ["3"]\n' + columns
    found = read(put(tmp_path, "  1e-9 0.0   7\n\t2e-9\t0.5 8\n", description))
    assert values(found, "control_voltage") == [[0.0, 0.5]]
    assert values(found, "path_current") == [[1e-9, 2e-9]]


def test_the_same_name_twice_is_read_by_position(tmp_path: Path):
    """Two columns of one name, only one of them wanted: the other is ignored by name."""
    description = PLAIN + 'ignore = ["I"]\n' + VOLT + AMPERE.replace('header = "I"', 'number = 3\nheader = "I"')
    found = read(put(tmp_path, "V,I,I\n0,1e-9,2e-9\n1,3e-9,4e-9\n", description))
    assert values(found, "path_current") == [[2e-9, 4e-9]]


def test_units_in_the_header_in_three_ways(tmp_path: Path):
    columns = (VOLT + AMPERE).replace('unit = "V"\n', "").replace('unit = "A"\n', "")
    for header in ("V (mV),I [nA]", "V / mV,I / nA", "V[mV],I(nA)"):
        found = read(put(tmp_path, f"{header}\n0,1\n1000,2\n", PLAIN + 'units = "header"\n' + columns))
        assert (values(found, "control_voltage"), values(found, "path_current")) == ([[0.0, 1.0]], [[1e-9, 2e-9]])


def test_a_name_may_be_the_whole_header_with_its_unit(tmp_path: Path):
    description = PLAIN + 'units = "header"\n' + VOLT + AMPERE.replace('header = "I"', 'header = "I (nA)"')
    path = put(tmp_path, "V (V),I (nA)\n0,1\n1,2\n", description.replace('unit = "A"', 'unit = "nA"'))
    assert values(read(path), "path_current") == [[1e-9, 2e-9]]


def test_absolute_numbers_beside_numbers_per_width_need_the_width(tmp_path: Path):
    per_width = AMPERE.replace('"I"', '"J"').replace("path_current", "path_current_per_width").replace('"A"', '"A/m"')
    farad = AMPERE.replace("path_current", "input_capacitance").replace('unit = "A"', 'unit = "fF"')
    raw = "V,I,J\n0,1,1e-6\n1,2,2e-6\n"
    assert refusals(put(tmp_path, raw, PLAIN + VOLT + farad + per_width)) == [
        "raw.csv:2: I: is absolute beside numbers per width, but no width is stated; "
        "state fixed.width, or a column with the width"
    ]
    wide = PLAIN.replace("fixed = {", 'fixed = { width = { value = 3, unit = "um" },')
    assert read(put(tmp_path, raw, wide + VOLT + farad + per_width)).sweeps[0].fixed["width"] == 3e-6


def test_a_width_that_no_number_survives_is_refused(tmp_path: Path):
    tiny = PLAIN.replace("fixed = {", 'fixed = { width = { value = 1e-300, unit = "m" },')
    path = put(tmp_path, "V,I\n0,1\n1,1e-9\n", tiny + VOLT + AMPERE + "per_width = true\n")
    assert len(read(path).sweeps) == 1  # 1e300 is a number of the program
    path = put(tmp_path, "V,I\n0,1\n1,1e-9\n", tiny.replace('"m"', '"nm"') + VOLT + AMPERE + "per_width = true\n")
    assert refusals(path) == ["raw.csv:2: I: is beyond the range of the program with this width; found 1e-309 m"]


def test_a_wrong_unit_of_the_width_is_said_once(tmp_path: Path):
    wrong = PLAIN.replace("fixed = {", 'fixed = { width = { value = 1, unit = "V*" },')
    asked = '[[extract]]\nquantity = "current"\nat = { value = 1, unit = "V" }\n'
    lines = refusals(put(tmp_path, "V,I\n0,1\n1,2\n", wrong + VOLT + AMPERE + "per_width = true\n" + asked))
    assert lines == ["raw.toml:8: fixed.width.unit: unknown unit: 'V*' is not a unit; allowed: a unit such as m"]


def test_a_unit_of_the_file_that_nobody_can_read_is_stated_in_the_description(tmp_path: Path):
    raw = "V,T,I\nVolts,Deg. C,A\n0,25,1e-9\n1,25,2e-9\n"
    warm = VOLT.replace('"V"\nmeaning = "control_voltage"', '"T"\nmeaning = "temperature"').replace('"V"', '"degC"')
    head = PLAIN.replace(WARM, 'units = "row"\n')
    found = read(put(tmp_path, raw, head + VOLT + warm + AMPERE))
    assert found.sweeps[0].fixed == {"temperature": 298.15}
    assert "column T: the unit 'Deg. C' of the file is taken for degC, as stated" in found.notes


def test_a_stated_unit_of_the_wrong_dimension_is_a_mistake_of_the_description(tmp_path: Path):
    path = put(tmp_path, "V,I\n0,1\n1,2\n", PLAIN + VOLT + AMPERE.replace('unit = "A"', 'unit = "V"'))
    (line,) = refusals(path)
    assert line.startswith("raw.toml:18: column.1.unit: has the wrong dimension; found 'V'")


def test_signs_of_currents(tmp_path: Path):
    raw = "V,I\n-1,-1e-9\n0,0\n1,2e-9\n"
    assert len(refusals(put(tmp_path, raw, PLAIN + VOLT + AMPERE))) == 2
    found = read(put(tmp_path, raw, PLAIN + VOLT + AMPERE + 'sign = "both"\n'))
    assert values(found, "path_current") == [[-1e-9, 0.0, 2e-9]]


def test_a_repeated_row_is_left_out_and_said(tmp_path: Path):
    found = read(put(tmp_path, "V,I\n0,1e-9\n0.00,1.0e-9\n1,2e-9\n", PLAIN + VOLT + AMPERE))
    assert values(found, "control_voltage") == [[0.0, 1.0]]
    assert "1 row(s) left out that repeat the row before them: line 3" in found.notes


# -- floor and compliance ----------------------------------------------------------------------------------------

TOP = "V,I\n0,2e-13\n1,1e-9\n2,1e-3\n3,1.0004e-3\n4,9.998e-4\n"
ASKED = (
    "raw.csv:4: I: has a flat top at a round value that no compliance explains; found 0.001 A on lines 4 to 6; "
    "was the instrument limited? state compliance in its [[column]]; if the sample saturates, saturates = true"
)


def test_a_flat_top_at_a_round_value_is_asked_about(tmp_path: Path):
    assert refusals(put(tmp_path, TOP, PLAIN + VOLT + AMPERE)) == [ASKED]
    stated = AMPERE + 'compliance = { value = 0.999, unit = "mA" }\nfloor = { value = 0.3, unit = "pA" }\n'
    (sweep,) = read(put(tmp_path, TOP, PLAIN + VOLT + stated)).sweeps
    assert sweep.at_compliance["path_current"].tolist() == [False, False, True, True, True]
    assert sweep.at_floor["path_current"].tolist() == [True, False, False, False, False]
    assert (sweep.floor, sweep.compliance) == ({"path_current": 3e-13}, {"path_current": 9.99e-4})
    (sweep,) = read(put(tmp_path, TOP, PLAIN + VOLT + AMPERE + "saturates = true\n")).sweeps
    assert not sweep.at_compliance["path_current"].any()


@pytest.mark.parametrize(
    "currents",
    [
        "1e-9 1e-3 1e-3",  # two points are no flat top
        "1e-9 1.234e-3 1.234e-3 1.234e-3",  # not a round value
        "1e-9 0.9e-3 0.95e-3 1e-3",  # not flat
        "1e-3 1e-3 1e-3 2.3e-3 4.7e-3",  # not the top
    ],
)
def test_other_tops_are_not_asked_about(currents: str, tmp_path: Path):
    rows = "\n".join(f"{k},{current}" for k, current in enumerate(currents.split()))
    assert len(read(put(tmp_path, f"V,I\n{rows}\n", PLAIN + VOLT + AMPERE)).sweeps) == 1


def test_a_flat_top_of_a_capacitance_is_nothing_to_ask_about(tmp_path: Path):
    farad = AMPERE.replace("path_current", "input_capacitance").replace('unit = "A"', 'unit = "fF"')
    assert len(read(put(tmp_path, "V,I\n0,1\n1,1\n2,1\n", PLAIN + VOLT + farad)).sweeps) == 1


def test_limits_include_their_own_value_and_follow_the_width(tmp_path: Path):
    limits = 'per_width = true\nfloor = { value = 1, unit = "pA" }\ncompliance = { value = 1, unit = "mA" }\n'
    wide = PLAIN.replace("fixed = {", 'fixed = { width = { value = 3, unit = "um" },')
    (sweep,) = read(put(tmp_path, "V,I\n0,1e-12\n1,1.1e-12\n2,0.9e-3\n3,1e-3\n", wide + VOLT + AMPERE + limits)).sweeps
    assert sweep.at_floor["path_current_per_width"].tolist() == [True, False, False, False]
    assert sweep.at_compliance["path_current_per_width"].tolist() == [False, False, False, True]
    assert (
        sweep.floor["path_current_per_width"]
        == sweep.columns["path_current_per_width"][0]
        == float(Fraction(1, 3000000))
    )
    assert sweep.compliance["path_current_per_width"] == sweep.columns["path_current_per_width"][3]


def test_every_value_column_has_its_own_marks(tmp_path: Path):
    leak = AMPERE.replace('"I"', '"J"').replace("path_current", "control_current")
    floors = [f'floor = {{ value = {value}, unit = "pA" }}\n' for value in (2, 0.5)]
    found = read(
        put(tmp_path, "V,I,J\n0,1e-12,1e-12\n1,1e-9,-3e-13\n", PLAIN + VOLT + AMPERE + floors[0] + leak + floors[1])
    )
    (sweep,) = found.sweeps
    assert sweep.at_floor["path_current"].tolist() == [True, False]
    assert sweep.at_floor["control_current"].tolist() == [False, True]


# -- bytes and shapes ----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("raw", "message"),
    [
        (b"", "raw.csv: is empty"),
        (b" \r\n\t\r\n", "raw.csv: is empty"),
        (b"\xef\xbb\xbf", "raw.csv: is empty"),
        (b"V,I\n", "raw.csv: has no data rows; allowed: a header and rows of numbers"),
        (b"V,I\n0,1\n\x00\x01,2\n", "raw.csv:3: is binary; allowed: a text file with rows of cells"),
        (
            b"V,I\n0,\xb5\n",
            'raw.csv:2: is not utf-8 text; found byte 0xb5; allowed: encoding = "utf-8", "utf-16", "latin-1" or '
            '"windows-1252"',
        ),
        (
            "V,I\n0,1\n".encode("utf-16"),
            "raw.csv:1: has a byte order mark of another encoding; found utf-16; allowed: utf-8; "
            'state encoding = "utf-16"',
        ),
        (b'V,I\n0,"1\n2,3', "raw.csv:3: is not a readable table (unexpected end of data)"),
    ],
)
def test_what_is_no_table(raw: bytes, message: str, tmp_path: Path):
    assert refusals(put(tmp_path, raw, PLAIN + VOLT + AMPERE)) == [message]


@pytest.mark.parametrize(("sign", "encoding"), [("\u00b5", "latin-1"), ("\u00b5", "utf-8"), ("\u03bc", "utf-8")])
def test_either_micro_sign(sign: str, encoding: str, tmp_path: Path):
    raw = f"V,I\nV,{sign}A\n0,1\n1,2\n".encode(encoding)
    columns = (VOLT + AMPERE).replace('unit = "V"\n', "").replace('unit = "A"\n', "")
    found = read(put(tmp_path, raw, PLAIN + f'encoding = "{encoding}"\nunits = "row"\n' + columns))
    assert values(found, "path_current") == [[1e-6, 2e-6]]


def test_lone_carriage_returns_end_lines_too(tmp_path: Path):
    found = read(put(tmp_path, b"V,I\r0,1\r1,2\r", PLAIN + VOLT + AMPERE))
    assert found.sweeps[0].rows.tolist() == [2, 3]


def test_spreadsheet_leftovers(tmp_path: Path):
    """Byte order mark, carriage returns, empty columns after the last, empty rows, a quoted header."""
    raw = '\ufeff"V","I",,\r\n0,1,,\r\n,,,\r\n1,2,,\r\n,,,\r\n,,,\r\n\r\n'
    found = read(put(tmp_path, raw, PLAIN + VOLT + AMPERE))
    assert found.sweeps[0].rows.tolist() == [2, 4]
    assert "4 empty lines left out" in found.notes
    assert "empty cells after the last column left out in 2 line(s)" in found.notes


def test_too_many_rows_and_columns(tmp_path: Path):
    many = "V,I\n" + "1,1\n" * (MAX_ROWS + 1)
    assert refusals(put(tmp_path, many, PLAIN + VOLT + AMPERE)) == [
        f"raw.csv:{MAX_ROWS + 2}: has too many rows; allowed: at most {MAX_ROWS}"
    ]
    wide = ",".join(f"c{k}" for k in range(MAX_COLUMNS + 1))
    assert refusals(put(tmp_path, f"{wide}\n{wide.replace('c', '')}\n", PLAIN + VOLT + AMPERE)) == [
        f"raw.csv:1: has too many columns; found {MAX_COLUMNS + 1}; allowed: at most {MAX_COLUMNS}"
    ]


def test_a_fault_of_every_row_is_shown_ten_times_and_then_summed_up(tmp_path: Path):
    lines = refusals(put(tmp_path, "V,I\n" + "x,1\n" * 500, PLAIN + VOLT + AMPERE))
    assert len(lines) == 11
    assert lines[-1] == "raw.csv:12: V: is not a number (further rows alike are not listed)"


def test_problems_of_both_files_in_one_pass(tmp_path: Path):
    description = RAW_CURVES.replace('source = "invented"', 'source = "nobody"').replace("degC", "K")
    raw = RAW.replace("0.1,0.3,25,A1,1e-4,1", "0.1,0.3,25,A1,oops,1").replace("VG,VD", "VG,UD")
    lines = refusals(put(tmp_path, raw, description))
    assert [line.split(": ")[0] for line in lines] == ["raw.csv:2", "raw.csv:5", "raw.toml:10", "raw.toml:18"]


def test_known_sources_are_those_beside_the_description_and_the_shipped_ones(tmp_path: Path):
    from benchmark.curves.read import read_curves

    path = put(tmp_path, RAW, RAW_CURVES.replace('source = "invented"', 'source = "my-wafer"'))
    assert read_curves(path, Collector()) is None
    own = 'kind = "measurement"\nauthors = ["team"]\nyear = 2026\ntitle = "W"\nread = "original"\n'
    (tmp_path / "sources.toml").write_text(f"schema = 1\n[my-wafer]\n{own}")
    assert read_curves(path, Collector()) is not None


def test_meanings_share_the_words_of_clean_tables():
    assert set(COLUMN_UNITS) <= set(MEANINGS)
    for name, unit in COLUMN_UNITS.items():
        assert MEANINGS[name].unit == unit
    for absolute, per_width in PER_WIDTH.items():
        one, other = (dict(parse_unit(MEANINGS[name].unit).dimension) for name in (absolute, per_width))
        one["[length]"] = one.get("[length]", 0) + (1 if absolute == "path_resistance" else -1)
        assert {key: power for key, power in one.items() if power} == other
