"""Measured tables: dialects of one table give identical arrays; what is no table is said in one line."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from benchmark.sets.problems import Collector
from benchmark.sets.tables import MAX_ROWS, TableFile, read_table
from tests.refusals import CURVE, SIDECAR, check, files

SOURCES = frozenset({"invented"})


def _read(folder: Path, curve: str | bytes, sidecar: str = SIDECAR) -> TableFile:
    collector = Collector()
    found = _try(folder, curve, sidecar, collector)
    assert found is not None, [str(problem) for problem in collector.problems]
    return found


def _try(folder: Path, curve: str | bytes, sidecar: str, collector: Collector) -> TableFile | None:
    folder.mkdir(exist_ok=True)
    (folder / "curve.toml").write_text(sidecar, encoding="utf-8")
    (folder / "curve.csv").write_bytes(curve if isinstance(curve, bytes) else curve.encode("utf-8"))
    return read_table(folder / "curve.csv", "current", SOURCES, collector, "tables/curve.csv")


def _cells() -> list[list[str]]:
    return [line.split(",") for line in CURVE.splitlines()]


def _same(one: TableFile, other: TableFile) -> None:
    assert one.table.columns.keys() == other.table.columns.keys()
    for name, column in one.table.columns.items():
        assert column.tobytes() == other.table.columns[name].tobytes(), name
    assert one.table.labels == other.table.labels
    assert one.table.floor == other.table.floor


def test_a_table_in_si(tmp_path: Path):
    table = _read(tmp_path, CURVE).table
    assert table.columns["control_voltage"].tolist() == [0.0, 0.1, 0.2, 0.3] * 2
    assert table.columns["temperature"].tolist() == [298.15] * 8
    assert table.columns["path_current_per_width"][:2].tolist() == [1e-6, 1e-4]  # A/m
    assert table.labels["sweep"] == ("forward",) * 4 + ("backward",) * 4
    assert table.floor == {"path_current_per_width": 1e-7}
    assert (table.value, table.along) == ("path_current_per_width", "control_voltage")


def test_decimal_commas_and_semicolons(tmp_path: Path):
    dialect = "\n".join(";".join(cell.replace(".", ",") for cell in row) for row in _cells()) + "\n"
    sidecar = SIDECAR.replace("schema = 1\n", 'schema = 1\ndelimiter = ";"\ndecimal = ","\n')
    _same(_read(tmp_path / "a", CURVE), _read(tmp_path / "b", dialect, sidecar))


def test_other_units_and_tabs(tmp_path: Path):
    """Millivolt and microampere: the numbers are exact, so the arrays are the same to the last bit."""
    rows = _cells()
    microampere = {"1e-12": "1e-6", "1e-10": "1e-4", "1e-8": "0.01", "1e-6": "1"}
    microampere |= {"6e-12": "6e-6", "6e-10": "6e-4", "6e-8": "0.06"}
    dialect = ["\t".join(rows[0])]
    for sweep, volt, path, _, current in rows[1:]:
        cells = [sweep, f"{round(1000 * float(volt))}", path, "298.15", microampere[current]]
        dialect.append("\t".join(cells))
    sidecar = SIDECAR.replace("schema = 1\n", 'schema = 1\ndelimiter = "\\t"\n')
    sidecar = sidecar.replace(
        'meaning = "control_voltage"\nkind = "axis"\nunit = "V"',
        'meaning = "control_voltage"\nkind = "axis"\nunit = "mV"',
    )
    sidecar = sidecar.replace('unit = "degC"', 'unit = "K"').replace(
        'kind = "value"\nunit = "A/um"', 'kind = "value"\nunit = "uA/um"'
    )
    _same(_read(tmp_path / "a", CURVE), _read(tmp_path / "b", "\n".join(dialect), sidecar))


def test_columns_in_another_order_blank_lines_and_a_byte_order_mark(tmp_path: Path):
    order = [4, 2, 0, 3, 1]
    lines = [",".join(f" {row[column]} " for column in order) for row in _cells()]
    dialect = "\ufeff" + "\r\n\r\n".join(lines) + "\r\n\r\n"
    one, other = _read(tmp_path / "a", CURVE), _read(tmp_path / "b", dialect)
    _same(one, other)
    assert other.raw == dialect  # the record keeps the file as it is


def test_currents_of_the_other_polarity(tmp_path: Path):
    lines = [",".join(row) for row in _cells()[:1]]
    lines += [",".join((*row[:4], f"-{row[4]}")) for row in _cells()[1:]]
    sidecar = SIDECAR.replace('kind = "value"\nunit = "A/um"', 'kind = "value"\nunit = "A/um"\nsign = "negative"')
    _same(_read(tmp_path / "a", CURVE), _read(tmp_path / "b", "\n".join(lines), sidecar))


def test_shuffled_rows_hold_the_same_points(tmp_path: Path):
    lines = CURVE.splitlines()
    shuffled = "\n".join([lines[0], *(lines[1:][position] for position in (5, 2, 7, 0, 3, 6, 1, 4))])
    one, other = _read(tmp_path / "a", CURVE).table, _read(tmp_path / "b", shuffled).table
    points = [
        sorted(zip(t.labels["sweep"], *(t.columns[name].tolist() for name in sorted(t.columns)), strict=True))
        for t in (one, other)
    ]
    assert points[0] == points[1]


def test_noise_within_the_stated_floor_is_kept_and_a_wrong_sign_is_not(tmp_path: Path):
    noisy = CURVE.replace("forward,0.0,0.3,25,1e-12", "forward,0.0,0.3,25,-0.5e-13")
    assert _read(tmp_path / "a", noisy).table.columns["path_current_per_width"][0] == -0.5e-7
    collector = Collector()
    wrong = CURVE.replace("forward,0.0,0.3,25,1e-12", "forward,0.0,0.3,25,-2e-13")
    assert _try(tmp_path / "b", wrong, SIDECAR, collector) is None
    assert [str(problem) for problem in collector.problems] == ["tables/curve.csv:2: I: must be above 0; found -2e-13"]


def test_a_floor_in_another_unit(tmp_path: Path):
    sidecar = SIDECAR.replace('value = 1.0e-13, unit = "A/um"', 'value = 0.1, unit = "pA/um"')
    _same(_read(tmp_path / "a", CURVE), _read(tmp_path / "b", CURVE, sidecar))


@pytest.mark.parametrize(
    ("curve", "message"),
    [
        (b"", "tables/curve.csv: is empty"),
        (b"sweep,V,U,T,I\n", "tables/curve.csv: has no data rows"),
        (b"sweep\x00,V,U,T,I\nforward,0,0,0,1\n", "tables/curve.csv: is binary"),
        ("sweep,V,U,T,I\nvorwärts,0,0,0,1\n".encode("latin-1"), "tables/curve.csv: is not UTF-8 text"),
        (b'sweep,V,U,T,I\n"forward,0,0,0,1\n', "tables/curve.csv:2: is not a readable table (unexpected end of data)"),
        (
            b"sweep,V,U,T,I\n" + b"forward,0,0,0,1\n" * MAX_ROWS,
            f"tables/curve.csv:{MAX_ROWS + 1}: has too many rows; allowed: at most {MAX_ROWS}",
        ),
    ],
)
def test_what_is_no_table(curve: bytes, message: str, tmp_path: Path):
    collector = Collector()
    assert _try(tmp_path, curve, SIDECAR, collector) is None
    assert [str(problem) for problem in collector.problems] == [message]


def test_a_table_is_looked_for_beside_its_set_and_then_beside_the_folder_of_technologies(tmp_path: Path):
    texts: dict[str, str | bytes] = dict(files("table"))
    beside = {name.replace("tables/", "technologies/tables/"): text for name, text in texts.items()}
    assert check(tmp_path / "a", texts).refused == []
    assert check(tmp_path / "b", beside).refused == []
    del texts["tables/curve.csv"]
    assert check(tmp_path / "c", texts).refused == ["tables/curve.csv: does not exist"]


def test_arrays_of_a_table_are_double_precision(tmp_path: Path):
    assert all(column.dtype == np.float64 for column in _read(tmp_path, CURVE).table.columns.values())
