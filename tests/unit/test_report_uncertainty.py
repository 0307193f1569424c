"""Charts and sections made from draws and ladders: exactly the numbers of the record."""

from __future__ import annotations

from pathlib import Path

import pytest

from benchmark.record.load import load_study
from benchmark.record.run import run_study
from benchmark.record.text import uncertainty_words
from benchmark.report.blocks import Figure, Paragraph, Table
from benchmark.report.distribution import advantage_distribution
from benchmark.report.energy_delay import energy_delay
from benchmark.report.ladder_chart import ladder_steps
from benchmark.report.section_uncertainty import uncertainty
from benchmark.report.uncertainty_rows import band_rows, distribution_rows, share_rows
from benchmark.sets.study import DrawSettings
from tests.fixed_displacement import fixed_displacement
from tests.near import near
from tests.report_records import changed, hub, mixed
from tests.studies import D, Inputs


@pytest.fixture(scope="module")
def record(tmp_path_factory: pytest.TempPathFactory):
    study, library = load_study(fixed_displacement().write(tmp_path_factory.mktemp("study")))
    return run_study(study, library, created="2026-01-31T00:00:00Z", draws=DrawSettings(256))


def test_the_curve_of_the_advantage_holds_the_distribution_of_the_record(record):
    chart = advantage_distribution(record)
    assert chart.spec is not None
    assert [row["advantage"] for row in chart.points] == [
        row["advantage"] for row in record["uncertainty"]["distribution"] if row["advantage"] is not None
    ]
    assert "256 draws of all 3 inputs with a stated range" in chart.caption
    assert "half at or below" in chart.alternative
    assert len(chart.spots) == 7


@pytest.mark.parametrize(
    ("change", "why"),
    [
        (lambda found: None, "no draws were asked for"),
        (lambda found: found | {"constant": True}, "no input with a range moves the advantage"),
        (lambda found: found | {"distribution": []}, "no draw has an advantage"),
    ],
)
def test_what_is_not_drawn_says_why(record, change, why):
    chart = advantage_distribution({**record, "uncertainty": change(record["uncertainty"])})
    assert chart.spec is None
    assert why in chart.caption


def test_bars_of_the_energy_chart_are_the_bands_of_the_record(record):
    chart = energy_delay(record)
    low = {(row["side"], row["supply_V"]): row["energy_J"] for row in chart.points if row["series"].startswith("10 %")}
    high = {(row["side"], row["supply_V"]): row["energy_J"] for row in chart.points if row["series"].startswith("90 %")}
    assert low
    assert low.keys() == high.keys()
    known = {(row["side"], row["supply_V"]): row for row in band_rows(record)}
    for key, energy in low.items():
        assert energy == known[key]["energy_10_percent_J"]
        assert high[key] == known[key]["energy_90_percent_J"]
        assert energy < high[key]
    assert "Bars: 10 to 90 % of the draws" in chart.caption
    # C alone matters at a fixed supply that is not low: e^(+-1.28155 x 0.20) on both sides of the best estimate
    row = known[max(key for key in known if key[0] == "film-switch")]
    assert row["energy_90_percent_J"] / row["energy_10_percent_J"] == near(1.669, rel=0.06)


def test_tables_of_the_draws(record):
    rows = distribution_rows(record)
    assert rows[0]["value"] == record["uncertainty"]["reaches"]["value"]
    assert [row["key"] for row in share_rows(record)] == [row["key"] for row in record["uncertainty"]["shares"]]
    assert distribution_rows(mixed()) == share_rows(mixed()) == band_rows(mixed()) == []


COEFFICIENT, CAPACITANCE, REFERENCE = (
    "film-switch.actuator_coefficient",
    "film-switch.input_capacitance",
    "stated-reference.input_capacitance",
)


def drawn(folder: Path, inputs: Inputs, draws: int = 256):
    study, library = load_study(inputs.write(folder))
    return run_study(study, library, created="2026-01-31T00:00:00Z", draws=DrawSettings(draws))


def section(record) -> tuple[str, list[tuple[str, ...]]]:
    """All that is said of the shares, and the rows of their table."""
    chart = advantage_distribution(record)
    blocks = uncertainty(record, Figure(chart, "", None)).blocks
    tables = [block for block in blocks if isinstance(block, Table) and block.key == "variance-shares"]
    rows = [tuple(cell.text for cell in row) for table in tables for row in table.rows]
    return " ".join([*(block.text for block in blocks if isinstance(block, Paragraph)),
                     *(table.caption for table in tables)]), rows  # fmt: skip


def test_an_input_without_a_clear_share_alone_has_its_share_together_with_others(tmp_path: Path):
    inputs = fixed_displacement()
    spread = inputs.sets["technologies/stated-reference"]["value"]["input_capacitance"]["spread"]
    spread["ln_sd"] = D("0.06")  # 1.8 % of the variance
    found = drawn(tmp_path, inputs, 64)["uncertainty"]
    (alone,) = (row for row in found["shares"] if row["key"] == REFERENCE)
    assert alone["share"] <= 2.0 * alone["share_error"]
    (total,) = (row for row in found["totals"] if row["key"] == REFERENCE)
    assert abs(total["total"] - 0.0177) <= 4.0 * total["total_error"]
    assert [row["key"] for row in found["totals"]] == [COEFFICIENT, CAPACITANCE, REFERENCE]


def test_draws_without_a_permitted_point_leave_the_shares_of_the_others(tmp_path: Path):
    """Below d = 160 pm/V the supply of 60 pm / d lies beyond 0.375 V: ln(160/200) / 0.20, 13 % of the draws."""
    inputs = fixed_displacement()
    inputs.sets["technologies/film-switch"]["valid"]["supply"]["high"] = D("0.375")
    inputs.study["candidate"]["knobs"]["supply"]["high"] = D("0.375")
    record = drawn(tmp_path, inputs)
    found = record["uncertainty"]
    assert found["without_candidate"] == near(0.132, rel=0, abs=0.02)
    assert [row["key"] for row in found["totals"]] == [COEFFICIENT, CAPACITANCE, REFERENCE]
    left = {row["key"]: row["left_out"] for row in found["totals"]}
    # in either of two sets, in either of both and the mixed one: which has the coefficient of one of the two
    assert left == near(dict.fromkeys(left, 1.0 - (1.0 - 0.132) ** 2), rel=0, abs=0.06)
    words, _ = section(record)
    assert "leave out the draws in which a side has no permitted point, up to 2" in words
    assert share_rows(record)[0]["total_share_left_out"] == left[share_rows(record)[0]["key"]]


def test_inputs_that_move_together_are_marked_and_counted_once(tmp_path: Path):
    inputs = fixed_displacement()
    inputs.sets["technologies/film-switch"]["joint"] = [
        {"values": ["actuator_coefficient", "input_capacitance"], "rank_correlation": D("0.8")}
    ]
    record = drawn(tmp_path, inputs)
    found = record["uncertainty"]
    assert {row["key"]: row["moves_with"] for row in found["shares"]} == {
        COEFFICIENT: [CAPACITANCE], CAPACITANCE: [COEFFICIENT], REFERENCE: [],
    }  # fmt: skip
    assert [(row["key"], row["moves_with"]) for row in found["totals"]] == [
        (COEFFICIENT, [CAPACITANCE]),
        (REFERENCE, []),
    ]
    assert f"{COEFFICIENT} " in " ".join(uncertainty_words(record))
    assert f"(moves with {CAPACITANCE})" in " ".join(uncertainty_words(record))
    _, rows = section(record)
    by_name = {row[0]: row for row in rows}
    assert "±" in by_name[f"{COEFFICIENT} (moves with {CAPACITANCE})"][3]
    table = {row["key"]: row for row in share_rows(record)}
    assert table[COEFFICIENT]["moves_with"] == CAPACITANCE
    assert table[CAPACITANCE]["total_share"] == f"counted with {COEFFICIENT}"


def test_an_advantage_that_hardly_moves_is_called_constant(tmp_path: Path):
    """Activity multiplies both energies; leakage through 1e15 ohm moves the advantage by less than 1e-7 of it."""
    inputs = fixed_displacement()
    inputs.study["value"]["activity"]["spread"] = {"shape": "loguniform", "low": D("0.05"), "high": D("0.9")}
    for data in inputs.sets.values():
        for table in data["value"].values():
            table.pop("spread", None)
    record = drawn(tmp_path, inputs, 64)
    found = record["uncertainty"]
    assert found["constant"]
    assert found["quantiles"][0]["value"] != 0.0
    assert "No drawn input moves the advantage by as much as 1e-06 of it." in " ".join(uncertainty_words(record))
    words, rows = section(record)
    assert rows == []
    assert "No drawn input moves the advantage by as much as 10⁻⁶ of it: there is no variance to share." in words


def test_inputs_of_judgement_are_counted_in_words(tmp_path: Path):
    inputs = fixed_displacement()
    switch = inputs.sets["technologies/film-switch"]["value"]
    switch["actuator_coefficient"] |= {"evidence": "measured", "conditions": "invented for this test"}
    switch["input_capacitance"] |= {"evidence": "assumed", "note": "invented for this test"}
    record = drawn(tmp_path, inputs, 64)
    assert record["uncertainty"]["judgement"] == 2
    assert "The ranges of 2 of 3 inputs are judgement or invented." in uncertainty_words(record)[0]


def test_the_ladder_has_a_dot_for_every_rung_of_the_record():
    chart = ladder_steps(hub())
    rungs = next(row for row in hub()["ladder"] if row["of"] == "reference")["rungs"]
    assert chart.spec is not None
    assert [row["rung"] for row in chart.points] == [row["name"] for row in rungs]
    assert [row["advantage"] for row in chart.points] == [
        "infeasible" if row["advantage"] is None else row["advantage"] for row in rungs
    ]
    assert all(row["name"] in chart.alternative for row in rungs)


def test_a_ladder_without_two_advantages_is_not_drawn():
    def change(record):
        for row in record["ladder"]:
            for rung in row["rungs"]:
                rung["advantage"] = None

    chart = ladder_steps(changed(hub(), change))
    assert chart.spec is None
    assert "fewer than two rungs" in chart.caption
