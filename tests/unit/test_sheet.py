"""A set out to a spreadsheet and in again: nothing lost, nothing repaired, every mistake named by its cell."""

from __future__ import annotations

import csv
import datetime
import io
from collections.abc import Callable
from decimal import Decimal as D
from pathlib import Path
from typing import Any

import pytest
from hypothesis import HealthCheck, assume, given, settings
from hypothesis import strategies as st

from benchmark import api
from benchmark.errors import InputRefused, UsageError
from benchmark.sets.files import read_toml
from benchmark.sets.history import as_it_was
from benchmark.sets.library import shipped_nodes
from benchmark.sets.problems import Collector
from benchmark.sets.sheet import COLUMNS, exported_rows, mangled
from tests.cli.conftest import Run, evenload

__all__ = ["evenload"]

OLD, NEW = datetime.date(2026, 1, 10), datetime.date(2026, 2, 10)
SAID: dict[str, Any] = {"reason": "a new wafer", "date": NEW, "old_date": OLD}
Cells = list[list[str]]

SET = """\
schema = 1
id = "switch"
title = "Switch"
model = "given"
nodes = ["g1", "g2"]
reference_temperature = { value = 25.0, unit = "degC" }
[default]
evidence = "invented"
source = "invented"
conditions = "-"
[option]
off_state = "resistance"

# supply of all nodes
[value.declared_supply]
value = 0.5
unit = "V"
[value.on_resistance]
by_node = { g1 = 50.0, g2 = 40.0 }  # by node
unit = "kohm"
spread = { shape = "lognormal", factor = 1.25 }
date = 2026-01-05
[value.off_resistance]
value = 2.0e6
unit = "Mohm"
note = "=2+2 is a text; a second line"
[value.switching_level]
value = 0.7
where = "3-5"
[value.input_capacitance]
value = 0.2512345678901234
unit = "fF"
spread = { shape = "uniform", low = 0.2, high = 0.3 }
[value.closing_delay]
value = 0.05
unit = "ns"
# last words
[value.opening_delay]
value = 0.05
unit = "ns"
conditions = "25 °C"
"""


@pytest.fixture
def place(tmp_path: Path) -> Path:
    path = tmp_path / "switch.toml"
    path.write_text(SET, encoding="utf-8")
    return path


def exported(path: Path) -> Cells:
    sheet = api.export_sheet(path, path.with_suffix(".csv"))
    return list(csv.reader(io.StringIO(sheet.read_bytes().decode("utf-8-sig"), newline="")))


def at(cells: Cells, name: str, column: str, node: str = "") -> tuple[int, int]:
    row = next(number for number, line in enumerate(cells[4:], 4) if (line[0], line[2]) == (name, node))
    return row, COLUMNS.index(column)


def put(cells: Cells, name: str, column: str, text: str, node: str = "") -> str:
    """Write a cell; returns its name in a spreadsheet."""
    row, position = at(cells, name, column, node)
    cells[row][position] = text
    return f"row {row + 1}, column {column}, cell {chr(ord('A') + position)}{row + 1}"


def save(path: Path, cells: Cells, *, delimiter: str = ",", end: str = "\n", mark: bool = False) -> Path:
    written = io.StringIO()
    csv.writer(written, delimiter=delimiter, lineterminator=end).writerows(cells)
    sheet = path.with_suffix(".csv")
    sheet.write_bytes((b"\xef\xbb\xbf" if mark else b"") + written.getvalue().encode("utf-8"))
    return sheet


def problems(path: Path, sheet: Path, **said: Any) -> list[str]:
    before = path.read_bytes()
    with pytest.raises(InputRefused) as refused:
        api.import_sheet(sheet, path, **{**SAID, **said})
    assert path.read_bytes() == before
    assert not (path.parent / "CHANGES.md").exists()
    return [str(problem) for problem in refused.value.problems]


@pytest.mark.parametrize("folder", ["technologies", "wires"])
def test_an_unchanged_sheet_leaves_every_shipped_set_as_it_is(folder: str, tmp_path: Path):
    for shipped in sorted((shipped_nodes() / folder).glob("*.toml")):
        root = shipped_nodes()
        sheet = api.export_sheet(shipped, tmp_path / f"{shipped.stem}.csv")
        edited = api.import_sheet(sheet, shipped, reason="x", date=NEW, old_date=OLD, write=False)
        assert edited.text.encode("utf-8") == shipped.read_bytes(), shipped.stem
        assert (edited.data["inputs"], edited.written, edited.notes) == ([], (), ())
        assert root.is_dir()


@pytest.mark.parametrize("mark", [False, True])
@pytest.mark.parametrize("end", ["\n", "\r\n"])
@pytest.mark.parametrize(("delimiter", "comma"), [(",", False), (";", False), (";", True), ("\t", False)])
def test_what_spreadsheets_save_unchanged_is_unchanged(place: Path, delimiter: str, comma: bool, end: str, mark: bool):
    cells = exported(place)
    if comma:  # a European spreadsheet: decimal commas in numbers, words left alone
        for line in cells[4:]:
            for column in ("value", "low", "high"):
                position = COLUMNS.index(column)
                line[position] = line[position].replace(".", ",")
    cells = [[*line, "", ""] for line in cells]  # padded
    before = place.read_bytes()
    edited = api.import_sheet(save(place, cells, delimiter=delimiter, end=end, mark=mark), place)
    assert edited.written == ()
    assert place.read_bytes() == before
    assert not (place.parent / "CHANGES.md").exists()


def test_respelled_numbers_are_unchanged_and_cut_ones_are_said(place: Path):
    cells = exported(place)
    put(cells, "off_resistance", "value", "2000000")
    put(cells, "declared_supply", "value", "5.00E-01")
    where = put(cells, "input_capacitance", "value", "0.251234568")
    edited = api.import_sheet(save(place, cells), place)
    assert edited.written == ()
    assert edited.notes == (f"{where}: the file has more digits (0.2512345678901234); taken as unchanged",)


def test_changed_values_are_superseded_and_the_rest_stays(place: Path):
    cells = exported(place)
    put(cells, "on_resistance", "value", "30", "g2")
    for node in ("g1", "g2"):
        put(cells, "on_resistance", "date", "2026-02-20", node)
        put(cells, "on_resistance", "spread shape", "lognormal factor 1.5", node)
    put(cells, "input_capacitance", "high", "0.28")
    put(cells, "closing_delay", "comment", "said by nobody")
    put(cells, "opening_delay", "evidence", "measured")
    edited = api.import_sheet(save(place, cells), place, **SAID)
    file = read_toml(place, Collector())
    assert file is not None
    values = file.data["value"]
    assert values["on_resistance"]["by_node"] == {"g1": D("50.0"), "g2": 30}
    assert values["on_resistance"]["date"] == datetime.date(2026, 2, 20)
    assert values["on_resistance"]["superseded"][0] | {} == {
        "by_node": {"g1": D("50.0"), "g2": D("40.0")},
        "unit": "kohm",
        "spread": {"shape": "lognormal", "factor": D("1.25")},
        "evidence": "invented",
        "source": "invented",
        "conditions": "-",
        "date": datetime.date(2026, 1, 5),
        "reason": "a new wafer",
    }
    assert values["input_capacitance"]["spread"] == {"shape": "uniform", "low": D("0.2"), "high": D("0.28")}
    assert values["closing_delay"] == {"value": D("0.05"), "unit": "ns", "note": "said by nobody"}
    assert values["opening_delay"]["evidence"] == "measured"
    assert values["opening_delay"]["superseded"][0]["date"] == OLD
    for comment in ("# supply of all nodes", "# by node", "# last words"):
        assert file.text.count(comment) == 1
    back = as_it_was(file, OLD, Collector())
    assert back is not None
    assert back.data["value"]["on_resistance"]["by_node"] == {"g1": D("50.0"), "g2": D("40.0")}
    assert back.data["value"]["opening_delay"]["evidence"] == "invented"
    assert edited.written == (place, place.parent / "CHANGES.md")
    assert (place.parent / "CHANGES.md").read_text().splitlines()[2:] == [
        "- 2026-02-20, switch: on_resistance at g1, range lognormal 40 to 62.5 -> lognormal 33.3333 to 75 kohm, source "
        "invented: a new wafer",
        "- 2026-02-20, switch: on_resistance at g2, 40 -> 30 kohm, factor 0.75, source invented: a new wafer",
        "- 2026-02-10, switch: input_capacitance, range uniform 0.2 to 0.3 -> uniform 0.2 to 0.28 fF, source invented: "
        "a new wafer",
        "- 2026-02-10, switch: opening_delay, new evidence, source invented: a new wafer",
    ]


MISTAKES: list[tuple[str, str, str, str, str]] = [
    ("declared_supply", "", "value", "0,6", "has a decimal comma; found '0,6'"),
    ("declared_supply", "", "value", "3. Jan", "looks like a date; found '3. Jan'"),
    ("declared_supply", "", "value", "2026-01-03", "looks like a date"),
    ("declared_supply", "", "value", "Mar-05", "looks like a date"),
    ("declared_supply", "", "value", "1,234.5", "has separated thousands"),
    ("declared_supply", "", "value", "60 %", "has a per cent sign"),
    ("declared_supply", "", "value", "#REF!", "is an error of a spreadsheet"),
    ("declared_supply", "", "value", "", "is empty, a number is needed"),
    ("declared_supply", "", "value", "0.6 V", "has text behind the number"),
    ("declared_supply", "", "unit", "", "is missing: a value has a unit; found nothing; allowed: a unit such as V"),
    ("switching_level", "", "unit", "", "is missing: a value has a unit; found nothing; allowed: a unit such as 1"),
    ("declared_supply", "", "unit", "m ", "has the wrong dimension for declared_supply"),
    ("declared_supply", "", "where", "05. Mrz", "looks like a date that a spreadsheet made of a text"),
    ("switching_level", "", "where", "43891", "looks like a day number that a spreadsheet made of a text"),
    ("declared_supply", "", "source", "43891", "looks like a day number that a spreadsheet made of a text"),
    ("declared_supply", "", "date", "10.02.2026", "is not a day; found '10.02.2026'"),
    ("declared_supply", "", "date", "46032", "is a day as a number of a spreadsheet"),
    ("on_resistance", "g1", "date", "", "differs from row"),
    ("on_resistance", "g2", "unit", "ohm", "differs from row 6: the nodes of one value share one unit; found 'ohm'"),
    ("on_resistance", "g2", "source", "other", "differs from row 6: the nodes of one value share one source"),
    ("declared_supply", "", "name", "declared_suply", "is not a value of the set; found 'declared_suply'; allowed: "),
    (
        "on_resistance",
        "g1",
        "node",
        "Mar-05",
        "is not a node of the set; found 'Mar-05'; allowed: g1, g2; looks like a date",
    ),
    ("declared_supply", "", "node", "g1", "is not used: the file states one number for all nodes; found 'g1'"),
    ("on_resistance", "g2", "node", "g1", "stands twice; found on_resistance at g1; also in row 6"),
    ("declared_supply", "", "meaning", "voltage", "is not changed in a sheet; found 'voltage'"),
    ("declared_supply", "", "check", "r0", "is not changed in a sheet; found 'r0'"),
    ("declared_supply", "", "low", "0.4", "is missing, but low or high are stated"),
    ("on_resistance", "g1", "low", "0.4", "differs from row"),
    ("input_capacitance", "", "spread shape", "lognormal factor 2", "lognormal has no limits of its own"),
    ("declared_supply", "", "spread shape", "normal", "normal needs one number with its name"),
    ("declared_supply", "", "spread shape", "gauss", "'gauss' is not a shape of a range"),
    ("input_capacitance", "", "low", "0,2", "has a decimal comma"),
]


@pytest.mark.parametrize(("name", "node", "column", "text", "message"), MISTAKES)
def test_a_mistake_is_named_by_its_cell(place: Path, name: str, node: str, column: str, text: str, message: str):
    cells = exported(place)
    where = put(cells, name, column, text, node)
    if "differs from row" in message and node == "g1":
        where = where.replace("row 6", "row 7").replace("6,", "7,").replace(where[-1], "7")
    found = problems(place, save(place, cells))
    assert any(message in problem for problem in found), found
    if "dimension" not in message:  # which the check of the changed set tells, by the line of the file
        assert any(where.split(",")[0] in problem and "cell" in problem for problem in found), (where, found)


def test_everything_wrong_is_said_in_one_pass(place: Path):
    cells = exported(place)
    put(cells, "declared_supply", "value", "0,6")
    put(cells, "on_resistance", "value", "50 %", "g1")
    put(cells, "opening_delay", "unit", "")
    put(cells, "closing_delay", "name", "closing_dely")
    found = problems(place, save(place, cells), reason="", date=None)
    assert [problem.split(";")[0] for problem in found] == [
        "switch.csv:5: row 5, column value, cell D5: has a decimal comma",
        "switch.csv:6: row 6, column value, cell D6: has a per cent sign",
        "switch.csv:11: row 11, column name, cell A11: is not a value of the set",
        "switch.csv:12: row 12, column unit, cell E12: is missing: a value has a unit",
    ]


def test_reason_and_date_are_asked_for(place: Path):
    cells = exported(place)
    put(cells, "declared_supply", "value", "0.6")
    sheet = save(place, cells)
    assert problems(place, sheet, reason="", date=None) == [
        "switch.csv: changes declared_supply; say also --reason and --date; why the old numbers are no longer used, "
        "and the day from which the new ones hold"
    ]
    assert "say also --reason;" in problems(place, sheet, reason="")[0]
    (problem,) = problems(place, sheet, old_date=None)
    assert "value.declared_supply: does not say from which day its old number held" in problem


def test_the_changed_set_is_judged_as_a_whole(place: Path):
    cells = exported(place)
    put(cells, "off_resistance", "value", "-5")
    put(cells, "switching_level", "evidence", "mesured")
    found = problems(place, save(place, cells))
    assert any("value.off_resistance" in problem for problem in found)
    assert any("did you mean 'measured'?" in problem for problem in found)


def test_a_range_in_the_old_unit_does_not_stay(place: Path):
    cells = exported(place)
    put(cells, "input_capacitance", "unit", "aF")
    (problem,) = problems(place, save(place, cells))
    assert "changes its unit while its range stays; state the range in the new unit; found fF -> aF" in problem


def test_a_unit_spelled_otherwise_is_a_correction(place: Path):
    cells = exported(place)
    for node in ("g1", "g2"):
        put(cells, "on_resistance", "unit", "kΩ", node)
    edited = api.import_sheet(save(place, cells), place)
    assert edited.lines == ()
    file = read_toml(place, Collector())
    assert file is not None
    assert file.data["value"]["on_resistance"]["unit"] == "kΩ"
    assert "superseded" not in file.data["value"]["on_resistance"]


def test_a_set_that_changed_meanwhile_is_refused_with_the_values(place: Path):
    cells = exported(place)
    put(cells, "closing_delay", "value", "0.06")
    sheet = save(place, cells)
    place.write_text(SET.replace("value = 0.7\n", "value = 0.6\n"), encoding="utf-8")
    (problem,) = problems(place, sheet)
    assert problem == (
        "switch.csv:2: digest: was exported from another state of the set; found changed since: switching_level; "
        "export it again and put the changes into the new sheet"
    )
    place.write_text(SET.replace('title = "Switch"', 'title = "Other"'), encoding="utf-8")
    assert "found changed since: no value of the sheet, another part of it" in problems(place, sheet)[0]
    other = place.with_name("other.toml")
    other.write_text(SET.replace('id = "switch"', 'id = "other"'), encoding="utf-8")
    assert "is a sheet of another set; found 'switch'; allowed: 'other'" in problems(other, sheet)[0]


def test_rows_and_columns_that_are_left_out_stay(place: Path):
    cells = exported(place)
    put(cells, "declared_supply", "value", "0.55")
    order = [COLUMNS.index(column) for column in ("value", "check", "unit", "node", "name")]
    cut = [*cells[:3], *([line[position] for position in order] for line in cells[3:6])]
    edited = api.import_sheet(save(place, cut), place, **SAID)
    assert [row["key"] for row in edited.data["inputs"]] == ["declared_supply"]
    assert edited.notes == ("6 rows of the set are not in the sheet and stay as they are",)


@pytest.mark.parametrize(
    ("spoil", "message"),
    [
        (
            lambda cells: cells[3].__setitem__(4, "units"),
            "switch.csv:4: row 4, cell E4: is not a known column; found 'units'",
        ),
        (
            lambda cells: cells[3].__setitem__(4, "value"),
            "row 4, cell E4: is a column that stands twice; found 'value'",
        ),
        (lambda cells: cells[3].__setitem__(3, ""), "switch.csv:4: lacks a column that is needed; allowed: value"),
        (lambda cells: cells.__delitem__(1), "lacks its first rows (set, digest, change) or the row of column names"),
        (
            lambda cells: cells.__delitem__(0),
            "switch.csv:1: does not begin with 'Evenload set' as an exported sheet does",
        ),
        (lambda cells: cells[6].append("note to self"), "row 7, cell P7: stands in a column without a name"),
    ],
)
def test_a_layout_that_is_not_understood(place: Path, spoil: Callable[[Cells], None], message: str):
    cells = exported(place)
    spoil(cells)
    assert any(message in problem for problem in problems(place, save(place, cells)))


@pytest.mark.parametrize(
    ("raw", "message"),
    [
        (b"\xff\xfe\x00", "is not UTF-8 text; save it from the spreadsheet as CSV UTF-8"),
        (b"", "does not begin with 'Evenload set'"),
        (b'Evenload set,x\n"open', "is not readable as cells ("),
    ],
)
def test_a_file_that_is_no_sheet(place: Path, raw: bytes, message: str):
    sheet = place.with_suffix(".csv")
    sheet.write_bytes(raw)
    assert message in problems(place, sheet)[0]


def test_names_and_signs_that_cannot_be(place: Path):
    for call in (
        lambda: api.export_sheet(place, "x.xlsx"),
        lambda: api.import_sheet("x.ods", place),
    ):
        with pytest.raises(UsageError, match=r"the name of a sheet ends in \.csv"):
            call()
    with pytest.raises(UsageError, match="decimal: 'dot' is not one of point, comma"):
        api.import_sheet("x.csv", place, decimal="dot")
    with pytest.raises(InputRefused, match=r"absent\.csv: does not exist"):
        api.import_sheet(place.with_name("absent.csv"), place)


def test_no_cell_is_computed_by_a_spreadsheet(place: Path):
    rows = exported_rows(read_toml(place, Collector()))  # type: ignore[arg-type]
    assert rows["off_resistance", ""]["comment"] == "'=2+2 is a text; a second line"
    cells = exported(place)
    put(cells, "off_resistance", "comment", "'=3+3")
    api.import_sheet(save(place, cells), place)
    assert 'note = "=3+3"' in place.read_text(encoding="utf-8")


def test_a_comma_is_declared_or_shown_by_an_untouched_number(place: Path):
    cells = exported(place)
    for line in cells[4:]:
        for position in (COLUMNS.index(column) for column in ("value", "low", "high")):
            line[position] = line[position].replace(".", ",")
    put(cells, "declared_supply", "value", "0,6")
    edited = api.import_sheet(save(place, cells, delimiter=";"), place, write=False, **SAID)
    assert [row["new"] for row in edited.data["inputs"]] == [0.6]
    assert len(problems(place, save(place, cells))) >= 3  # commas between cells: no decimal comma undeclared
    edited = api.import_sheet(save(place, cells), place, write=False, decimal="comma", **SAID)
    assert [row["new"] for row in edited.data["inputs"]] == [0.6]
    put(cells, "closing_delay", "value", "0.06")  # both signs: not told apart by guessing
    assert any("has a decimal comma" in problem for problem in problems(place, save(place, cells, delimiter=";")))


NUMBERS = st.decimals(min_value=D("0.5"), max_value=D("1.5"), places=6, allow_nan=False)


@settings(max_examples=25, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(
    factors=st.dictionaries(
        st.sampled_from(["declared_supply", "on_resistance", "off_resistance", "closing_delay", "opening_delay"]),
        NUMBERS,
    ),
    comment=st.text(st.characters(codec="utf-8", exclude_categories=["C", "Z"]), max_size=12),
    delimiter=st.sampled_from([",", ";", "\t"]),
)
def test_any_change_goes_round(tmp_path: Path, factors: dict[str, D], comment: str, delimiter: str):
    """What was put into the sheet is what the next export says, and the past state is what the first one said."""
    place = tmp_path / "switch.toml"
    place.write_text(SET, encoding="utf-8")
    cells = exported(place)
    for line in cells[4:]:
        if line[0] in factors:
            line[3] = str(D(line[3]) * factors[line[0]])
        if line[0] == "closing_delay":
            line[13] = comment
    first = exported_rows(read_toml(place, Collector()))  # type: ignore[arg-type]
    assume(not mangled(comment))
    api.import_sheet(save(place, cells, delimiter=delimiter), place, **SAID)
    after = exported(place)
    for line, now in zip(cells[4:], after[4:], strict=True):
        assert D(now[3]) == D(line[3])
        if line[0] == "closing_delay":
            assert now[13].lstrip("'") == comment.lstrip("'")
    file = read_toml(place, Collector())
    assert file is not None
    back = as_it_was(file, OLD, Collector())
    assert back is not None
    assert {key: D(row["value"]) for key, row in exported_rows(back).items()} == {
        key: D(row["value"]) for key, row in first.items()
    }


def test_the_commands(place: Path, evenload: Run):
    ran = evenload("sheet", "export", place, "s.csv")
    assert (ran.status, ran.out.splitlines()[0]) == (0, "Written: s.csv")
    sheet = Path("s.csv")
    sheet.write_text(sheet.read_text("utf-8-sig").replace(",0.5,V,", ",6,V,"), encoding="utf-8")
    ran = evenload("sheet", "import", sheet, place)
    assert ran.status == 3
    assert "changes declared_supply; say also --reason and --date" in ran.err
    said = ["--reason", "why", "--date", "2026-02-10", "--old-date", "2026-01-10"]
    before = place.read_bytes()
    ran = evenload("sheet", "import", sheet, place, *said, "--dry-run", "--decimal", "point")
    assert ran.status == 0
    assert place.read_bytes() == before
    assert "Note: declared_supply changed by a factor 12: check units first." in ran.out
    assert evenload("sheet", "import", sheet, place, *said, "--format", "json").status == 0
    assert place.read_bytes() != before
    assert evenload("sheet").status == 2
