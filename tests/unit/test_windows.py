"""A grid of supplies must not step over a window of permitted ones."""

from __future__ import annotations

import dataclasses
from pathlib import Path

import numpy as np
import pytest

from benchmark.decide.compare import Comparison
from benchmark.decide.draw_block import DrawTask, resolution
from benchmark.decide.strongest import strongest_outcome
from benchmark.draws.plan import Plan
from benchmark.draws.values import draw_values
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.side import joints_by_owner, values_by_key
from benchmark.evaluate.windows import hidden_windows
from benchmark.record.load import load_study

WORKED = Path(__file__).parents[2] / "reports" / "always-on-hub" / "study.toml"


@pytest.mark.parametrize(
    ("rising", "falling", "hidden"),
    [
        # ln margins of two conditions at two supplies; their lines cross at 0.5 (1st), -0.5 (2nd), near 0 (3rd)
        ((-1.0, 2.0), (2.0, -1.0), True),
        ((-2.0, 1.0), (1.0, -2.0), False),
        ((-1.02, 1.0), (1.0, -1.02), True),
        # one condition refuses both points
        ((-1.0, -0.1), (2.0, 2.0), False),
        # a permitted point is no hidden window
        ((1.0, 2.0), (2.0, -1.0), False),
        # a condition that is not known refuses nothing
        ((-1.0, 2.0), (np.nan, -1.0), True),
    ],
)
def test_lines_of_margins(rising: tuple, falling: tuple, hidden: bool):
    margins = [np.exp(np.array([line])) for line in (rising, falling)]
    assert hidden_windows(margins, np.ones((1, 2), dtype=bool)).tolist() == [[hidden]]


def test_points_without_meaning_hide_nothing():
    margins = [np.array([[0.4, 7.0]]), np.array([[7.0, 0.4]])]
    assert hidden_windows(margins, np.array([[True, False]])).tolist() == [[False]]
    assert hidden_windows(margins, np.array([[True, True]])).tolist() == [[True]]


def test_negative_margins_and_no_conditions():
    able = np.ones((1, 3), dtype=bool)
    assert not hidden_windows([np.array([[-1.0, -2.0, 0.0]])], able).any()
    assert not hidden_windows([], able).any()


def test_draws_of_the_worked_study_find_what_a_fine_grid_finds():
    """In these draws the actuator rings between 0.44 and 0.58 V and is too slow below 0.41 V: two windows."""
    study, _ = load_study(WORKED)
    pair = study.pair(study.headline)
    first = Comparison(study, pair, Batch.best_estimate())
    frozen = first.frozen_choices(first.outcome(study.policy.primary))
    task = DrawTask(study, pair, study.policy.primary, frozen, Plan(64, 256, 0))
    values = values_by_key(study, pair)
    _, drawn = draw_values(values, task.plan, 3, (), joints_by_owner(study, pair))
    some = np.array([4, 168, 250, 17])
    columns = {key: np.concatenate([values[key].si[:1], column[some]]) for key, column in drawn.items()}
    batch = Batch(5, columns)
    coarse = strongest_outcome(Comparison(resolution(study), pair, batch, frozen=frozen), task.policy)
    finer = dataclasses.replace(study, supply_points=121, refine_relative=1e-6)
    fine = Comparison(finer, pair, batch, frozen=frozen).outcome(task.policy)
    assert fine.candidate.found.all()
    np.testing.assert_allclose(coarse.advantage, fine.advantage, rtol=2e-3)
