"""The short way to the strongest contender gives the advantage of the long way."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from benchmark.decide import strongest
from benchmark.decide.compare import Comparison
from benchmark.evaluate.batch import Batch
from benchmark.record.load import load_study
from tests.studies import D, hub, mixed

ROWS = 256


def comparison(inputs, folder: Path, moved: dict[str, float]) -> Comparison:
    study, _ = load_study(inputs.write(folder))
    pair = study.pair(study.headline)
    first = Comparison(study, pair, Batch.best_estimate())
    frozen = first.frozen_choices(first.outcome(study.policy.primary))
    rng = np.random.default_rng(5)
    columns = {}
    for key, best in moved.items():
        columns[key] = best * np.exp(rng.normal(0.0, 0.8, ROWS))
        columns[key][0] = best
    return Comparison(study, pair, Batch(ROWS, columns), frozen=frozen)


def same(made: Comparison) -> None:
    policy = made.study.policy.primary
    short, whole = strongest.strongest_outcome(made, policy), made.outcome(policy)
    np.testing.assert_array_equal(short.candidate.found, whole.candidate.found)
    rows = whole.candidate.found
    np.testing.assert_array_equal(short.strongest[rows], whole.strongest[rows])
    np.testing.assert_array_equal(short.advantage[rows], whole.advantage[rows])
    assert np.isnan(short.advantage[~rows]).all()


def supplies_to_choose(folder: Path) -> Comparison:
    """Two contenders of which the better one changes from row to row, each free in its supply."""
    inputs = hub()
    for contender in inputs.study["contender"]:
        contender["knobs"]["supply"] = {"low": D("0.3"), "high": D("0.9"), "unit": "V"}
    return comparison(inputs, folder, {"study.activity": 0.1, "low-leakage.input_capacitance": 3e-14})


def test_contenders_that_take_turns(tmp_path: Path):
    made = supplies_to_choose(tmp_path)
    assert len(set(made.outcome(made.study.policy.primary).strongest.tolist())) == 2
    same(made)


def test_transistors_with_a_functional_floor(tmp_path: Path):
    inputs = mixed()
    inputs.study["requirements"]["noise_margin"] = {
        "limit": {"value": D("0.2"), "unit": "1"},
        "kind": "hard",
        "fan_in": 2,
    }
    same(comparison(inputs, tmp_path, {"study.clock_frequency": 5e7, "study.activity": 0.1}))


def test_a_bound_that_is_too_high_is_noticed(tmp_path: Path, monkeypatch: pytest.MonkeyPatch):
    """The tests above can fail: a contender whose first idea is far too high is passed over."""
    made = supplies_to_choose(tmp_path)
    monkeypatch.setattr(
        strongest, "roughly", lambda name, run, *_: np.full(ROWS, 1.0 if run.problem.side.id == "fast" else 1e-30)
    )
    with pytest.raises(AssertionError):
        same(made)
