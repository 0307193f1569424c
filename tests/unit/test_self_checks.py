"""Self-checks of a run whose reference costs nothing: an advantage of 0 stays 0 on a finer grid."""

from __future__ import annotations

from pathlib import Path

from benchmark.decide.compare import Comparison
from benchmark.decide.self_checks import self_checks
from benchmark.evaluate.batch import Batch
from benchmark.record.load import load_study
from tests.fixed_displacement import fixed_displacement


def test_a_reference_without_leakage_has_an_advantage_of_nought_that_no_check_divides_by(tmp_path: Path):
    inputs = fixed_displacement()
    inputs.study["policy"]["metric"] = "leakage-power"
    study, _ = load_study(inputs.write(tmp_path))
    outcome = Comparison(study, study.pair(study.headline), Batch.best_estimate()).outcome(study.policy.primary)
    assert outcome.advantage[0] == 0.0
    checks = {row["name"]: row for row in self_checks(study, outcome)}
    assert checks["supply grid twice as fine"]["obtained"] == "relative change 0"
    assert all(row["passed"] for row in checks.values())
