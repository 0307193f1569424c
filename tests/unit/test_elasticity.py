"""Elasticities at the point and re-optimised, by hand arithmetic."""

from __future__ import annotations

import math
from pathlib import Path

import pytest

from benchmark.decide.compare import Comparison
from benchmark.decide.elasticity import elasticities
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.side import values_by_key
from benchmark.record.load import load_study
from tests.fixed_displacement import fixed_displacement
from tests.near import near

STUDY = Path(__file__).parent.parent / "data" / "stress-hand" / "study.toml"


def found(study, policy: str = ""):
    pair = study.pair(study.headline)
    comparison = Comparison(study, pair, Batch.best_estimate())
    outcome = comparison.outcome(policy or study.policy.primary)
    frozen = comparison.frozen_choices(outcome)
    return {row.key: row for row in elasticities(study, pair, outcome, frozen, list(values_by_key(study, pair)))}


@pytest.mark.parametrize(("coefficient", "expected"), [("300.0", -2.911), ("150.0", -4.508)])
def test_delay_to_the_actuator_coefficient(coefficient: str, expected: float):
    """S2: -(RC/t) 2 p ln 10 with the share of RC 0.316 at 2 GPa, 0.979 at 1 GPa; invented numbers, exact arithmetic."""
    study, _ = load_study(STUDY, overrides={"hand-stress-gated.actuator_coefficient": coefficient})
    assert found(study)["hand-stress-gated.actuator_coefficient"].of_time == near(expected, rel=0, abs=3e-3)


def test_where_transit_rules_the_coefficient_does_not_matter():
    study, _ = load_study(STUDY, overrides={"hand-stress-gated.actuator_coefficient": "900.0"})
    assert found(study)["hand-stress-gated.actuator_coefficient"].of_time == near(0.0, abs=1e-3)


def test_a_product_law_has_its_exponents(tmp_path: Path):
    """S8: A = E_ref d^2 / (C (60 pm)^2); the supply follows from d, so the fixed point does not see it."""
    study, _ = load_study(fixed_displacement().write(tmp_path))
    rows = found(study)
    assert rows["film-switch.input_capacitance"].at_point == near(-1.0, rel=1e-4)
    assert rows["film-switch.input_capacitance"].reoptimised == near(-1.0, rel=1e-4)
    assert rows["stated-reference.input_capacitance"].reoptimised == near(1.0, rel=1e-4)
    assert rows["film-switch.actuator_coefficient"].reoptimised == near(2.0, rel=1e-4)
    assert rows["film-switch.actuator_coefficient"].at_point == near(0.0, abs=1e-5)


def test_at_the_point_and_re_optimised_differ_where_a_required_time_binds():
    """The required time is met at d V = const: re-optimised, V falls with d and energy with its square."""
    study, _ = load_study(STUDY)
    row = found(study, "iso-delay")["hand-stress-gated.actuator_coefficient"]
    assert row.at_point == near(0.0, abs=0.3)  # only leakage per operation moves
    assert row.reoptimised == near(2.0, rel=0.02)
    assert not math.isnan(row.of_time)
