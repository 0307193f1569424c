"""Charts and sections made from draws and ladders: exactly the numbers of the record."""

from __future__ import annotations

import pytest

from benchmark.record.load import load_study
from benchmark.record.run import run_study
from benchmark.report.distribution import advantage_distribution
from benchmark.report.energy_delay import energy_delay
from benchmark.report.ladder_chart import ladder_steps
from benchmark.report.uncertainty_rows import band_rows, distribution_rows, share_rows
from benchmark.sets.study import DrawSettings
from tests.fixed_displacement import fixed_displacement
from tests.near import near
from tests.report_records import changed, hub, mixed


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
