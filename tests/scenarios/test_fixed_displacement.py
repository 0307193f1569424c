"""Scenario S8: the probability before and after a re-measurement, and what to measure next, by hand arithmetic.

ln(advantage) is normal, see ``tests/fixed_displacement.py``; Phi is the normal distribution function. All invented.
"""

from __future__ import annotations

import math
from decimal import Decimal as D
from pathlib import Path

import pytest
from scipy.special import ndtr

from benchmark.record.load import load_study
from benchmark.record.run import run_study
from benchmark.record.text import verdict_text
from benchmark.sets.study import DrawSettings
from tests.fixed_displacement import fixed_displacement
from tests.near import near

DRAWS = 2**14
BEFORE = {"coefficient": ("200.0", "0.20"), "capacitance": ("0.20", "0.20")}
AFTER = {"coefficient": ("170.0", "0.05"), "capacitance": ("0.20", "0.20")}
BOTH = {"coefficient": ("170.0", "0.05"), "capacitance": ("0.18", "0.02")}
COEFFICIENT, CAPACITANCE, REFERENCE = (
    "film-switch.actuator_coefficient",
    "film-switch.input_capacitance",
    "stated-reference.input_capacitance",
)


def run(folder: Path, case: dict[str, tuple[str, str]], draws: int = DRAWS, seed: int = 0):
    study, library = load_study(fixed_displacement(**case).write(folder))
    return run_study(study, library, created="2026-01-31T00:00:00Z", draws=DrawSettings(draws, seed))


@pytest.mark.parametrize(
    ("case", "advantage", "sd", "reaches", "shares", "worth"),
    [
        (
            BEFORE,
            2.000,
            0.4583,
            0.7349,
            {COEFFICIENT: 0.762, CAPACITANCE: 0.190, REFERENCE: 0.048},
            {COEFFICIENT: 0.0553, CAPACITANCE: 0.0067, REFERENCE: 6e-5},
        ),
        (
            AFTER,
            1.4450,
            0.2449,
            0.4394,
            {COEFFICIENT: 0.167, CAPACITANCE: 0.667, REFERENCE: 0.167},
            {CAPACITANCE: 0.0625, COEFFICIENT: 0.0240, REFERENCE: 0.0240},
        ),
        (BOTH, 1.6056, 0.1428, 0.6830, {}, {}),
    ],
)
def test_probability_shares_and_worth(case, advantage, sd, reaches, shares, worth, tmp_path: Path):
    record = run(tmp_path, case)
    found = record["uncertainty"]
    assert record["verdict"]["advantage"] == near(advantage, rel=0, abs=5e-5)
    assert found["sd_log"]["value"] == near(sd, rel=0, abs=1e-3)
    # the sampling error is stated; four digits are reached within four of it
    assert found["reaches"]["error"] < 0.004
    assert abs(found["reaches"]["value"] - reaches) <= 4.0 * found["reaches"]["error"] + 5e-5
    by_key = {row["key"]: row for row in found["shares"]}
    for key, share in shares.items():
        assert abs(by_key[key]["share"] - share) <= 4.0 * by_key[key]["share_error"] + 5e-4
    for key, value in worth.items():
        assert abs(by_key[key]["worth"] - value) <= 4.0 * by_key[key]["worth_error"] + 5e-5


def test_all_probabilities_before(tmp_path: Path):
    """P(>= 1) 0.9348, P(>= 2) 0.5000, P(>= 3) 0.1881."""
    for required, expected in (("2.0", 0.5000), ("3.0", 0.1881)):
        study, library = load_study(fixed_displacement(required=required).write(tmp_path / required))
        found = run_study(study, library, created="x", draws=DrawSettings(DRAWS))["uncertainty"]
        assert abs(found["reaches"]["value"] - expected) <= 4.0 * found["reaches"]["error"] + 5e-5
        assert abs(found["above_one"]["value"] - 0.9348) <= 4.0 * found["above_one"]["error"] + 5e-5


def test_the_next_measurement_moves_from_the_coefficient_to_the_capacitance(tmp_path: Path):
    before = run(tmp_path / "before", BEFORE, 4096)["uncertainty"]
    after = run(tmp_path / "after", AFTER, 4096)["uncertainty"]
    assert max(before["shares"], key=lambda row: row["worth"])["key"] == COEFFICIENT
    assert max(after["shares"], key=lambda row: row["worth"])["key"] == CAPACITANCE
    assert not before["stop"]


def test_a_product_of_lognormal_values_has_the_normal_probability(tmp_path: Path):
    """P = Phi((ln advantage - ln M) / sd): to the stated error, at several numbers of draws."""
    exact = float(ndtr((math.log(2.0) - math.log(1.5)) / math.sqrt(0.04 + 0.16 + 0.01)))
    assert exact == near(0.7349, rel=0, abs=5e-5)
    for draws in (256, 1024, 4096):
        found = run(tmp_path / str(draws), BEFORE, draws)["uncertainty"]
        assert abs(found["reaches"]["value"] - exact) <= 5.0 * found["reaches"]["error"]
        assert found["mean_log"]["value"] == near(math.log(2.0), rel=0, abs=6.0 * found["mean_log"]["error"])


def test_another_seed_agrees_within_the_errors_and_the_same_seed_to_the_last_digit(tmp_path: Path):
    first = run(tmp_path / "1", BEFORE, 1024)["uncertainty"]
    again = run(tmp_path / "2", BEFORE, 1024)["uncertainty"]
    other = run(tmp_path / "3", BEFORE, 1024, seed=7)["uncertainty"]
    assert first == again
    assert other["reaches"] != first["reaches"]
    spread = math.hypot(first["reaches"]["error"], other["reaches"]["error"])
    assert abs(other["reaches"]["value"] - first["reaches"]["value"]) <= 5.0 * spread


def test_a_value_stated_as_a_bound_gives_the_probability_at_both_ends(tmp_path: Path):
    """A terminal capacitance of at most 0.05 fF per switch: at its open end it is next to nothing, as in S8."""
    inputs = fixed_displacement()
    terminal = inputs.sets["technologies/film-switch"]["value"]["terminal_capacitance"]
    terminal |= {"value": D("0.05"), "bound": "at-most"}
    study, library = load_study(inputs.write(tmp_path))
    record = run_study(study, library, created="x", draws=DrawSettings(1024))
    found = record["uncertainty"]
    assert [row["key"] for row in found["bounds"]] == ["film-switch.terminal_capacitance"]
    at_open = found["reaches_at_open_ends"]
    assert abs(at_open["value"] - 0.7349) <= 4.0 * at_open["error"] + 5e-3
    assert found["reaches"]["value"] < at_open["value"] - 0.1
    assert "at their open ends the probability is" in verdict_text(record)
