"""Required value and spread at a probability, against the normal distribution (see ``tests/fixed_displacement.py``).

ln(advantage) = ln 2 + 2 ln(d / 200 pm/V) - ln(C / 0.20 fF) + ln(E / 36 aJ), standard deviations of d 0.20, C 0.20 and
E 0.10, M = 1.5. All numbers are invented, the arithmetic is exact.
"""

from __future__ import annotations

import dataclasses
import math
from pathlib import Path

import numpy as np
import pytest
from scipy.special import ndtri

from benchmark.decide.axes import find_axis
from benchmark.decide.break_even import CUT
from benchmark.decide.specification import sheet_rows, specification
from benchmark.decide.tolerance import Tolerances
from benchmark.decide.trials import Trials
from benchmark.errors import UsageError
from benchmark.record.load import load_study
from tests.fixed_displacement import fixed_displacement
from tests.near import near
from tests.studies import hub

D, C, REFERENCE = (
    "film-switch.actuator_coefficient",
    "film-switch.input_capacitance",
    "stated-reference.input_capacitance",
)
DRAWS = 1024


def made(folder: Path, **case: tuple[str, str]) -> Trials:
    study, _ = load_study(fixed_displacement(**case).write(folder))
    return Trials(study, study.pair(study.headline))


def error(probability: float, slope: float) -> float:
    """Four sampling errors of the logarithm of a value, from the error of the probability and the normal density."""
    z = float(ndtri(probability))
    density = math.exp(-0.5 * z**2) / math.sqrt(2.0 * math.pi)
    return 4.0 * math.sqrt(probability * (1.0 - probability) / DRAWS) / density / slope


@pytest.mark.parametrize("probability", [0.9, 0.6])
def test_required_value_with_its_spread_moving_along(probability, tmp_path):
    trials = made(tmp_path)
    drawn = Tolerances(trials, 1.5, probability, DRAWS)
    sd = math.sqrt(0.16 + 0.04 + 0.01)
    needed = math.log(1.5) + float(ndtri(probability)) * sd - math.log(2.0)
    for key, power in ((D, 2.0), (C, -1.0)):
        axis = find_axis(trials, key)
        found = drawn.of(axis)
        tolerance = error(probability, abs(power) / sd)
        assert math.log(found.value / axis.best) == near(needed / power, rel=0, abs=tolerance)
        assert abs(found.today - 0.7349) <= 4.0 * math.sqrt(0.735 * 0.265 / DRAWS)


def test_values_put_back_give_the_probability(tmp_path):
    trials = made(tmp_path)
    drawn = Tolerances(trials, 1.5, 0.9, DRAWS)
    axis = find_axis(trials, D)
    factor = drawn.of(axis).value / axis.best
    assert drawn.share(D, factor) == near(0.9, rel=0, abs=2.0 / DRAWS)
    # other draws: within the stated error
    other = Tolerances(trials, 1.5, 0.9, DRAWS, seed=5)
    assert abs(other.share(D, factor) - 0.9) <= 4.0 * drawn.error


def test_required_spread_at_todays_value(tmp_path):
    # at p = 0.9 the spread of all may be (ln 2 - ln 1.5)/1.2816 = 0.2245; C and E take 0.2236 of it
    trials = made(tmp_path, coefficient=("200.0", "0.20"), capacitance=("0.20", "0.10"))
    drawn = Tolerances(trials, 1.5, 0.9, DRAWS)
    found = drawn.of(find_axis(trials, D))
    allowed = (math.log(2.0) - math.log(1.5)) / float(ndtri(0.9))
    by_hand = math.sqrt(allowed**2 - 0.01 - 0.01) / 2.0 / 0.20
    assert found.spread == near(by_hand, rel=0.1)
    assert drawn.share(D, 1.0, found.spread) == near(0.9, rel=0, abs=2.0 / DRAWS)
    # the spread of C alone can never be small enough: that of d is too wide
    assert np.isnan(drawn.of(find_axis(trials, C)).spread)
    easy = Tolerances(trials, 1.5, 0.6, DRAWS).of(find_axis(trials, C))
    assert easy.spread > 1.0
    assert "stated spread" in easy.words


def test_a_value_without_spread_is_put_exactly(tmp_path):
    trials = made(tmp_path)
    values = dict(trials.values)
    trials.values = values | {D: dataclasses.replace(values[D], spread=None)}
    drawn = Tolerances(trials, 1.5, 0.9, DRAWS)
    found = drawn.of(dataclasses.replace(find_axis(trials, D), value=trials.values[D]))
    needed = (math.log(1.5) + float(ndtri(0.9)) * math.sqrt(0.05) - math.log(2.0)) / 2.0
    assert math.log(found.value / 200e-12) == near(needed, rel=0, abs=error(0.9, 2.0 / math.sqrt(0.05)))
    assert np.isnan(found.spread)
    assert "no spread is stated" in found.words


def test_far_from_the_level_values_with_a_range_still_stand_on_the_sheet(tmp_path):
    trials = made(tmp_path)
    far = specification(trials, 8.0, 5)
    names = [need.axis.name for need in far.needs]
    assert {D, C} <= set(names)
    assert not {D, C} & far.decisive
    # 8 is 4 times today's: a coefficient of 200 sqrt(4)
    need = next(need for need in far.needs if need.axis.name == D)
    assert need.kind == "beyond"
    assert need.crossings[0].x == near(400e-12, rel=1e-6)
    # 100 would need less than the lowest supply of the set, 0.05 V x 1200 pm/V
    cut = next(need for need in specification(trials, 100.0, 5).needs if need.axis.name == D)
    assert cut.reach is not None
    assert cut.reach.end == CUT
    assert cut.reach.x == near(1200e-12, rel=2e-6)
    assert cut.reach.advantage == near(72.0, rel=1e-5)
    near_by = specification(trials, 1.5, 5)
    assert D in near_by.decisive
    order = [need.axis.name in near_by.decisive for need in near_by.needs]
    assert order == sorted(order, reverse=True)


def test_the_sheet_carries_both(tmp_path):
    trials = made(tmp_path)
    rows = {row["name"]: row for row in sheet_rows(specification(trials, 1.5, 5, probability=0.9, draws=64))}
    assert rows[D]["required"] < 200.0 < rows[D]["required_at_probability"]
    # without spreads: 200 sqrt(1.5/2), to the resolution of the supply that is searched
    assert rows[D]["required"] == near(200.0 * math.sqrt(0.75), rel=1e-7)
    assert rows[D]["probability_error"] == near(math.sqrt(0.09 / 64), rel=1e-12)
    assert "probability" not in sheet_rows(specification(trials, 1.5, 5))[0]


def test_what_cannot_be_asked_is_refused(tmp_path):
    trials = made(tmp_path)
    with pytest.raises(UsageError, match="above 0 and below 1"):
        Tolerances(trials, 1.5, 1.0)
    with pytest.raises(UsageError, match="power of two"):
        Tolerances(trials, 1.5, 0.9, 100)
    study, _ = load_study(hub().write(tmp_path / "hub"))
    with pytest.raises(UsageError, match="no value of the study has a spread"):
        Tolerances(Trials(study, study.pair("n1")), 1.0, 0.9)
