"""Tables of a record: units in names, words where there is no number, exact numbers in the CSV."""

from __future__ import annotations

import csv
import math
from pathlib import Path

import pytest

from benchmark.report.rows import advantage_rows, curve_rows, envelope_rows, part_rows, policy_rows
from benchmark.report.tables import frames, tables, write_csv
from benchmark.report.words import is_number
from tests.report_records import hub, infeasible, mixed

#: endings that say the unit, and columns that are counts, factors or shares
UNITS = ("_s", "_J", "_V", "_W", "_m2", "_W_per_m2", "_K", "_SI")
PURE = {
    *("ln_factor", "factor"),  # on the advantage
    *(
        "advantage",
        "size",
        "share",
        "share_error",
        "total_share",
        "total_share_error",
        "total_share_left_out",
        "worth_ln",
        "worth_error_ln",
        "worth_known_twice_as_well_ln",
        "worth_reachable_ln",
        "worth_per_cost",
        "cost",
        "enough_standard_deviations",
        "share_of_draws",
        "sampling_error",
        "margin_factor",
        "margin",
        "relative_difference",
        "closed_over_simulated_low",
        "closed_over_simulated_high",
        "share_measured",
        "points",
        "line",
        "number",
        "year",
        "level",
    ),
    *(
        "low",
        "high",
        "best",
        "value",
        "flips_below",
        "flips_above",
        "copies",
        "elasticity_of_advantage_at_points",
        "elasticity_of_advantage_reoptimised",
        "elasticity_of_time",
        "elasticity_of_energy",
        "advantage_at_low",
        "advantage_at_high",
        "demanded",
        "offered",
    ),
}

#: columns whose unit stands in a column of its own
BESIDE = {"low", "high", "best", "value", "flips_below", "flips_above", "demanded", "offered", "value_SI"}


@pytest.mark.parametrize("record", [mixed, hub, infeasible])
def test_every_number_has_its_unit_in_the_column_name_or_in_a_column_beside_it(record):
    for name, rows in tables(record()).items():
        for row in rows:
            for column, value in row.items():
                if is_number(value):
                    known = column.endswith(UNITS) or column in PURE
                    assert known, f"{name}.{column} says no unit"
                    if column in BESIDE:
                        assert "unit" in row, f"{name}.{column} has no unit beside it"


def test_a_side_that_cannot_is_said_in_words_with_the_reason():
    record = infeasible()
    for row in policy_rows(record):
        assert row["state"] == "infeasible"
        assert row["reason"] == "cannot reach 1e-12 s per operation"
        assert {row[name] for name in ("advantage", "time_s", "energy_J", "supply_V", "area_m2")} == {"infeasible"}
    for row in advantage_rows(record):
        assert row["advantage"] == "infeasible"
        assert row["reason"] == "neither side reaches this time"
        assert row["candidate_energy_J"] == "infeasible"
    assert {row["advantage"] for row in tables(record)["nodes"]} == {"infeasible"}
    assert envelope_rows(record) == []


@pytest.mark.parametrize("record", [mixed, hub, infeasible])
def test_no_cell_is_blank_where_a_number_belongs(record):
    for name, rows in tables(record()).items():
        for row in rows:
            for column, value in row.items():
                assert value is not None, f"{name}.{column}"
                assert not (isinstance(value, float) and not math.isfinite(value)), f"{name}.{column}"
                if column.endswith(UNITS):
                    assert value != "", f"{name}.{column}"


def test_only_one_reason_per_side_of_the_gap():
    reasons = {row["reason"] for row in advantage_rows(mixed())}
    assert reasons == {"", "neither side reaches this time", "the candidate does not reach this time"}


def test_the_envelope_is_made_of_feasible_contender_points_that_no_other_beats():
    record = mixed()
    feasible = [
        (row["time_s"], row["energy_J"])
        for row in curve_rows(record)
        if row["role"] == "contender" and row["state"] == "feasible"
    ]
    envelope = [(row["time_s"], row["energy_J"]) for row in envelope_rows(record)]
    assert envelope == sorted(envelope)
    assert set(envelope) <= set(feasible)
    undominated = {(t, e) for t, e in feasible if not any(a <= t and b <= e and (a, b) != (t, e) for a, b in feasible)}
    assert set(envelope) == undominated


def test_parts_add_up_to_the_totals_of_the_design_points():
    record = mixed()
    totals = {(row["policy"], row["role"], row["side"]): row for row in policy_rows(record)}
    sums: dict[tuple[str, ...], float] = {}
    for row in part_rows(record):
        key = (row["policy"], row["role"], row["side"], row["quantity"])
        sums[key] = sums.get(key, 0.0) + row["value_SI"]
    assert sums
    for (*side, quantity), total in sums.items():
        column = {"time": "time_s", "energy": "energy_J"}[quantity]
        assert total == pytest.approx(totals[tuple(side)][column], rel=1e-12)


def test_the_ledger_table_has_a_row_for_every_value_and_node():
    record = mixed()
    rows = tables(record)["ledger"]
    assert len(rows) == sum(len(row["value"]) for row in record["ledger"])
    found = {(row["owner"], row["name"], row["node"]): row["value"] for row in rows}
    for row in record["ledger"]:
        for position, value in enumerate(row["value"]):
            node = row["nodes"][position] if row["nodes"] else ""
            assert found[row["owner"], row["name"], node] == value


def test_csv_holds_the_same_cells_to_the_last_digit(tmp_path: Path):
    for name, rows in tables(mixed()).items():
        place = tmp_path / f"{name}.csv"
        write_csv(rows, place)
        if not rows:
            assert place.read_text() == "no rows\n"
            continue
        with place.open(newline="", encoding="utf-8") as handle:
            read = list(csv.DictReader(handle))
        assert len(read) == len(rows)
        for got, row in zip(read, rows, strict=True):
            for column, value in row.items():
                if is_number(value):
                    assert float(got[column]) == value, f"{name}.{column}"
                else:
                    assert got[column] == str(value), f"{name}.{column}"


def test_frames_are_the_tables():
    record = mixed()
    found = frames(record)
    for name, rows in tables(record).items():
        assert len(found[name]) == len(rows)
    assert list(found["crossings"].columns) in ([], ["advantage", "time_s"])
    curves = found["curves"]
    assert curves.loc[curves["state"] == "feasible", "energy_J"].astype(float).min() > 0.0


def test_rungs_and_cells_as_rows():
    record = mixed()
    found = tables(record)
    ladder, cells = found["ladder"], found["robustness"]
    assert [row["ladder_of"] for row in ladder] == ["reference"] * 7 + ["candidate"] * 7
    assert [row["advantage"] for row in ladder if row["rung"] == "back bias"] == [record["verdict"]["advantage"]] * 2
    assert {row["turn"] for row in ladder} <= {"", "lost", "reached"}
    assert [row["advantage"] for row in cells if row["declared"]] == [record["verdict"]["advantage"]]
    assert len(cells) == len(record["robustness"]["cells"])
    assert {row["temperature_K"] for row in cells} == {"all", *record["study"]["temperatures"]}
    assert all(bool(row["reason"]) == (row["advantage"] == "infeasible") for row in cells)
