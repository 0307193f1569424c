"""The same curves written in every dialect give the same switch to the last bit; bad tables are refused by row."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from benchmark.devices.model import ModelInputs
from benchmark.devices.table import MODEL
from benchmark.sets.problems import Collector
from benchmark.sets.tables import read_table

HEADER = ["sweep", "control_voltage", "path_voltage", "temperature", "current"]
ROWS = [
    ["forward", "0.0", "0.3", "25", "1e-12"],
    ["forward", "0.1", "0.3", "25", "1e-10"],
    ["forward", "0.2", "0.3", "25", "1e-8"],
    ["forward", "0.3", "0.3", "25", "1e-6"],
    ["backward", "0.0", "0.3", "25", "6.3e-12"],
    ["backward", "0.1", "0.3", "25", "6.3e-10"],
    ["backward", "0.2", "0.3", "25", "6.3e-8"],
    ["backward", "0.3", "0.3", "25", "1e-6"],
]


def sidecar(**changed: str) -> str:
    words = {"delimiter": ",", "decimal": ".", "volt": "V", "unit": "A/um", "sign": "positive", "kelvin": "degC"}
    words |= changed
    return f'''schema = 1
file = "curves.csv"
delimiter = "{words["delimiter"]}"
decimal = "{words["decimal"]}"
evidence = "invented"
source = "invented"
conditions = "-"
interpolate = {{ column = "current", along = "control_voltage", scale = "log", method = "monotone" }}
[column.sweep]
meaning = "sweep"
kind = "label"
allowed = ["forward", "backward"]
[column.control_voltage]
meaning = "control_voltage"
kind = "axis"
unit = "{words["volt"]}"
sign = "{words["sign"]}"
[column.path_voltage]
meaning = "path_voltage"
kind = "axis"
unit = "{words["volt"]}"
sign = "{words["sign"]}"
[column.temperature]
meaning = "temperature"
kind = "axis"
unit = "{words["kelvin"]}"
[column.current]
meaning = "path_current_per_width"
kind = "value"
unit = "{words["unit"]}"
sign = "{words["sign"]}"
'''


def read(folder: Path, rows: list[list[str]], header: list[str] | None = None, **changed: str):
    lines = [(changed.get("delimiter", ",")).join(cells) for cells in [header or HEADER, *rows]]
    (folder / "curves.csv").write_text("\n".join(lines) + "\n", encoding="utf-8")
    (folder / "curves.toml").write_text(sidecar(**changed), encoding="utf-8")
    collector = Collector()
    found = read_table(folder / "curves.csv", "current", frozenset({"invented"}), collector, "curves.csv")
    return found, [str(problem) for problem in collector.problems]


def switch_of(table):
    values = {
        "reference_temperature": 298.15,
        "declared_supply": 0.3,
        "saturation_voltage": 0.06,
        "unit_width": 1e-6,
        "terminal_capacitance_per_width": 1e-10,
        "gate_capacitance_total": 1e-9,
        "drain_capacitance_share": 0.0,
        "transit_time": 0.0,
    }
    given = ModelInputs({k: np.asarray(v) for k, v in values.items()}, {}, {"current": table})
    assert MODEL.check(given) == []
    knobs = {"threshold_shift": np.zeros(())}
    return MODEL.switch(MODEL.prepare(given), np.array([0.07, 0.22, 0.3]), np.asarray(298.15), knobs).down


def scaled(rows: list[list[str]]) -> list[list[str]]:
    return [[*row[:4], row[4].split("e")[0] + "e" + str(int(row[4].split("e")[1]) + 6)] for row in rows]


DIALECTS = {
    "microampere": (scaled(ROWS), None, {"unit": "uA/um"}),
    "decimal comma": (
        [[cell.replace(".", ",") for cell in row] for row in ROWS],
        None,
        {"delimiter": ";", "decimal": ","},
    ),
    "shuffled": ([ROWS[k] for k in (6, 1, 4, 0, 7, 3, 2, 5)], None, {}),
    "columns exchanged": ([row[::-1] for row in ROWS], HEADER[::-1], {}),
    "p type signs": (
        [[row[0], "-" + row[1], "-" + row[2], row[3], "-" + row[4]] for row in ROWS],
        None,
        {"sign": "negative"},
    ),
    "millivolt and kelvin": (
        [[row[0], str(int(float(row[1]) * 1000)), "300", "298.15", row[4]] for row in ROWS],
        None,
        {"volt": "mV", "kelvin": "K"},
    ),
}


@pytest.mark.parametrize("name", DIALECTS)
def test_every_dialect_gives_the_same_switch(tmp_path: Path, name: str):
    plain, problems = read(tmp_path, ROWS)
    assert problems == []
    rows, header, changed = DIALECTS[name]
    other, problems = read(tmp_path, rows, header, **changed)
    assert problems == []
    first, second = switch_of(plain.table), switch_of(other.table)
    for field in ("resistance", "switching_level", "on_current", "off_current_path", "closing_voltage"):
        assert np.array_equal(getattr(first, field), getattr(second, field)), field


@pytest.mark.parametrize(
    ("rows", "text"),
    [
        ([*ROWS, ["forward", "0.1", "0.3", "25", "2e-10"]], "two different values at the same point of one sweep"),
        ([["forward", "0.0", "0.3", "25", "0.0"], *ROWS[1:]], "must be above 0"),
        ([["forward", "0.0", "0.3", "25", "n/a"], *ROWS[1:]], "is not a number"),
        ([["forward", "0.0", "0.3", "25", "1,2e-12"], *ROWS[1:]], "row and header differ in length"),
        ([["up", *ROWS[0][1:]], *ROWS[1:]], "is not an allowed word"),
    ],
)
def test_bad_tables_are_refused_by_row(tmp_path: Path, rows: list[list[str]], text: str):
    found, problems = read(tmp_path, rows)
    assert found is None
    assert len([p for p in problems if text in p]) == 1
