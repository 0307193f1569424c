"""Joint specification sheet: values and spreads put back into the files give the advantage and the probability.

By hand for the film driven to a fixed displacement (``tests/fixed_displacement.py``): ln A = ln 2 + 2 ln(d / 200 pm/V)
- ln(C / 0.20 fF) + ln(E / 36 aJ), ln-standard deviations of d and C 0.20, of E 0.10. With t steps for d and C,
ln A = ln 2 + 0.6 t at the best estimates, and its standard deviation is sqrt((0.16 + 0.04) 4^-t + 0.01). Numbers are
invented, the arithmetic is exact.
"""

from __future__ import annotations

import math
from decimal import Decimal as D
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from scipy.optimize import brentq
from scipy.special import ndtr, ndtri

from benchmark import api
from benchmark.decide.axes import deviations, find_axis
from benchmark.decide.joint_sheet import JointSheet, joint_sheet, moved_value
from benchmark.decide.joint_words import joint_facts, joint_rows
from benchmark.decide.tolerance import Tolerances
from benchmark.decide.trials import Trials
from benchmark.errors import UsageError
from benchmark.record.load import load_study
from tests.comparisons import given, load, side, study
from tests.fixed_displacement import fixed_displacement
from tests.near import near
from tests.studies import v

FILM, CHARGE = "film-switch.actuator_coefficient", "film-switch.input_capacitance"
DRAWS = 1024


def film(folder: Path, **case: tuple[str, str]) -> Trials:
    loaded, _ = load_study(fixed_displacement(**case).write(folder))
    return Trials(loaded, loaded.pair(loaded.headline))


def solved(trials: Trials, level: float, *names: str, **asked: Any) -> JointSheet:
    return joint_sheet(trials, level, [find_axis(trials, name) for name in names], **asked)


def put_back(sheet: JointSheet) -> dict[str, tuple[str, str]]:
    """The film's numbers for the files, as the rows of the sheet state them."""
    rows = {row["name"]: row for row in joint_rows(sheet)}

    def of(key: str, factor: float = 1.0) -> tuple[str, str]:
        number = f"{rows[key]['required_at_probability'] * factor:.15g}"
        return number, rows[key]["spread_at_probability"].removeprefix("lognormal, ln_sd = ")

    return {"coefficient": of(FILM), "capacitance": of(CHARGE, 2.0)}  # the file states one of the two switches


@pytest.mark.parametrize("level", [1.5, 2.0, 3.0])
def test_best_estimates_alone(level, tmp_path):
    trials = film(tmp_path)
    sheet = solved(trials, level, FILM, CHARGE)
    assert sheet.steps == near(math.log(level / 2.0) / 0.6, rel=0, abs=1e-6)
    assert [item.towards for item in sheet.moved] == [1.0, -1.0]
    moved = {item.axis.name: float(item.at(sheet.steps).si[0]) for item in sheet.moved}
    assert trials([moved]).advantage[0] == near(level, rel=1e-9)
    for item in sheet.moved:  # the same number of standard deviations for all
        assert item.towards * deviations(item.value, moved[item.axis.name]) == near(sheet.steps, rel=1e-9, abs=1e-12)


@pytest.mark.parametrize("probability", [0.6, 0.9])
def test_steps_for_a_probability(probability, tmp_path):
    sheet = solved(film(tmp_path), 1.5, FILM, CHARGE, probability=probability, draws=DRAWS)
    allowed = 4.0 * math.sqrt(probability * (1.0 - probability) / DRAWS)
    reached = (math.log(2.0 / 1.5) + 0.6 * sheet.steps_drawn) / math.sqrt(0.2 * 4.0**-sheet.steps_drawn + 0.01)
    assert abs(float(ndtr(reached)) - probability) <= allowed
    by_hand = brentq(
        lambda t: math.log(2.0 / 1.5) + 0.6 * t - float(ndtri(probability)) * math.sqrt(0.2 * 4.0**-t + 0.01), -2, 2
    )
    assert sheet.steps_drawn == near(by_hand, rel=0, abs=0.1)
    assert sheet.advantage == near(2.0 * math.exp(0.6 * sheet.steps_drawn), rel=1e-6)
    assert 0.0 <= sheet.reached - probability <= 2.0 / DRAWS


def test_the_sheet_put_into_the_files_and_run_with_draws(tmp_path):
    sheet = solved(film(tmp_path / "today"), 1.5, FILM, CHARGE, probability=0.9, draws=DRAWS)
    view = api.load_study(fixed_displacement(**put_back(sheet)).write(tmp_path / "put-back"))
    result = api.run(view, draws=DRAWS, seed=0)
    assert result.advantage == near(sheet.advantage, rel=1e-6)
    drawn = result.record["uncertainty"]["reaches"]
    assert abs(drawn["value"] - 0.9) <= 1.0 / DRAWS  # the same points: the sheet's own probability
    again = Trials(view.study, view.study.pair("n1"))
    other = [Tolerances(again, 1.5, 0.9, DRAWS, seed).share() for seed in (1, 2, 3)]
    for share in other:
        assert abs(share - 0.9) <= 4.0 * sheet.error
    # the derived supply that the file has to state
    ((key, unit, number),) = sheet.follows
    assert (key, unit) == ("film-switch.declared_supply", "V")
    assert number == near(60.0 / float(put_back(sheet)["coefficient"][0]), rel=1e-9)


def test_todays_probability_is_that_of_a_run(tmp_path):
    sheet = solved(film(tmp_path), 1.5, FILM, CHARGE, probability=0.9, draws=256)
    drawn = api.run(fixed_displacement().write(tmp_path / "run"), draws=256, seed=0).record["uncertainty"]
    assert sheet.today == drawn["reaches"]["value"]


def test_correlated_values_stay_correlated(tmp_path):
    inputs = fixed_displacement()
    inputs.sets["technologies/film-switch"]["joint"] = [
        {"values": ["actuator_coefficient", "input_capacitance"], "rank_correlation": D("0.8")}
    ]
    view = api.load_study(inputs.write(tmp_path))
    trials = Trials(view.study, view.study.pair("n1"))
    drawn = api.run(view, draws=256, seed=0).record["uncertainty"]["reaches"]["value"]
    assert Tolerances(trials, 1.5, 0.9, 256).share() == drawn
    assert solved(trials, 1.5, FILM, CHARGE, probability=0.9, draws=256).today == drawn


def test_what_may_be_given_up_where_the_probability_is_reached_already(tmp_path):
    sheet = solved(film(tmp_path), 1.5, FILM, CHARGE, probability=0.6, draws=256)
    assert sheet.steps_drawn < 0.0
    assert "steps may be given up" in dict(joint_facts(sheet))["with probability 0.6"]
    for item in sheet.moved:
        spread = item.at(sheet.steps_drawn).spread
        assert spread is not None
        assert spread.scale is not None
        assert float(spread.scale[0]) == near(0.2 * 2.0**-sheet.steps_drawn, rel=1e-12)


# -- every shape of a spread: energy is activity times the capacitances times V^2, over the supply's efficiency --------


def charges(numbers: dict[str, Any] | None = None) -> Trials:
    """Candidate of four values with a spread of every other shape; ``numbers`` instead of today's."""
    tables = {
        "input_capacitance": v(D("0.100"), "fF", spread={"shape": "uniform", "low": D("0.08"), "high": D("0.13")}),
        "terminal_capacitance": v(
            D("0.040"), "fF", spread={"shape": "triangular", "low": D("0.03"), "high": D("0.06")}, unusual=True
        ),
        "declared_supply": v(D("0.5"), "V"),
    } | (numbers or {})
    efficiency = tables.pop(
        "supply_efficiency", v(D("0.9"), spread={"shape": "loguniform", "low": D("0.8"), "high": D("0.95")})
    )
    shifter = tables.pop(
        "level_shifter_energy", v(D("0.010"), "fJ", spread={"shape": "normal", "sd": D("0.002")}, unusual=True)
    )
    free = {"options": {"off_state": "none"}, "off_resistance": None}
    tables.pop("declared_supply")
    sets = [given("a", **tables, **free), given("b", input_capacitance=v(D("0.16"), "fF", unusual=True), **free)]
    loaded = load(
        study(
            side("a", 0.5, 0.5, costs={"supply_efficiency": efficiency, "level_shifter_energy": shifter}),
            [side("b", 0.5, 0.5)],
            sets,
        )
    )
    return Trials(loaded, loaded.pair(loaded.headline))


NAMES = (
    "a.input_capacitance",
    "a.terminal_capacitance",
    "candidate.overhead.supply_efficiency",
    "candidate.overhead.level_shifter_energy",
)


def as_table(row: dict[str, Any]) -> dict[str, Any]:
    """The row of a sheet as a file states it."""
    shape, *parts = row["spread_at_probability"].split(", ")
    spread = {"shape": shape} | {name: D(text) for name, text in (part.split(" = ") for part in parts)}
    unit = "" if row["unit"] == "1" else row["unit"]
    return v(D(f"{row['required_at_probability']:.12g}"), unit, spread=spread, unusual=True)


def test_every_shape_put_back():
    today = charges()
    level = float(today.best.advantage[0]) * 1.05
    sheet = solved(today, level, *NAMES, probability=0.9, draws=256)
    assert 0.0 < sheet.steps_drawn < 4.0
    assert [item.towards for item in sheet.moved] == [-1.0, -1.0, 1.0, -1.0]
    rows = joint_rows(sheet)
    assert [row["spread_at_probability"].partition(",")[0] for row in rows] == [
        "uniform",
        "triangular",
        "loguniform",
        "normal",
    ]
    again = charges({row["name"].rpartition(".")[2]: as_table(row) for row in rows})
    assert again.best.advantage[0] == near(sheet.advantage, rel=1e-9)
    drawn = Tolerances(again, level, 0.9, 256)
    assert drawn.share() == near(sheet.reached, rel=0, abs=1.0 / 256)
    assert drawn.share() == near(0.9, rel=0, abs=2.0 / 256)
    for seed in (1, 2):
        assert abs(Tolerances(again, level, 0.9, 256, seed).share() - 0.9) <= 4.0 * sheet.error


@pytest.mark.parametrize("steps", [-1.0, 0.0, 0.5, 2.0])
def test_the_rule(steps):
    trials = charges()
    for name in NAMES:
        value = trials.values[name]
        for towards in (1.0, -1.0):
            moved = moved_value(value, towards, steps)
            assert deviations(value, float(moved.si[0])) == near(towards * steps, rel=1e-9, abs=1e-12)
            old, new = value.spread, moved.spread
            assert old is not None
            assert new is not None
            size = np.log if old.shape == "loguniform" else np.asarray
            widths = [float(size(spread.high[0]) - size(spread.low[0])) for spread in (old, new)]
            assert widths[1] / widths[0] == near(2.0**-steps, rel=1e-9)
    assert moved_value(value, 1.0, 0.0).si[0] == value.si[0]


def test_out_of_reach_is_said():
    today = charges()
    sheet = solved(today, 1000.0, *NAMES, probability=0.9, draws=64)
    assert math.isnan(sheet.steps)
    assert math.isnan(sheet.steps_drawn)
    facts = dict(joint_facts(sheet))
    low, high = sheet.span
    assert facts["best estimates alone"].startswith(f"1000 is not met between {low:g} and {high:g} steps (today ")
    assert facts["with probability 0.9"].startswith(f"not reached between {low:g} and {high:g} steps; today 0")
    assert all(math.isnan(row["required"]) for row in joint_rows(sheet))
    # the supply cannot lose less than nothing, and no capacitance is negative
    assert high < 8.0


def test_what_cannot_be_on_a_sheet_is_refused(tmp_path):
    trials = film(tmp_path)
    with pytest.raises(UsageError, match=r"film-switch.resistance_slope has no stated spread, so a joint sheet"):
        solved(trials, 1.5, "film-switch.resistance_slope")
    with pytest.raises(UsageError, match="values with a stated spread that move the advantage; the candidate has none"):
        solved(trials, 1.5)
    wide = v(D("0.02"), "um^2", spread={"shape": "lognormal", "factor": D("2.0")})
    with pytest.raises(UsageError, match=r"a.footprint does not move the advantage; leave it out of the joint sheet"):
        solved(charges({"footprint": wide}), 1.0, "a.footprint")
    inputs = fixed_displacement()
    table = inputs.sets["technologies/film-switch"]
    del table["value"]["input_capacitance"]["spread"]
    table["joint"] = [
        {
            "values": ["input_capacitance", "footprint"],
            "samples": [[D("0.09"), D("0.01")], [D("0.10"), D("0.01")], [D("0.12"), D("0.02")]],
        }
    ]
    loaded, _ = load_study(inputs.write(tmp_path / "samples"))
    with pytest.raises(UsageError, match=r"is known by samples, which a joint sheet cannot narrow; leave it out"):
        solved(Trials(loaded, loaded.pair("n1")), 1.5, CHARGE)
