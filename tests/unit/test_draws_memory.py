"""Draws are added up as they come: eight times as many need no more memory."""

from __future__ import annotations

import tracemalloc
from pathlib import Path

from benchmark.decide.compare import Comparison
from benchmark.decide.draw_block import DrawTask
from benchmark.decide.uncertainty import uncertainty
from benchmark.draws.plan import LARGEST_BLOCK, plan_of
from benchmark.evaluate.batch import Batch
from benchmark.record.load import load_study
from tests.fixed_displacement import fixed_displacement


def test_memory_does_not_grow_with_the_draws(tmp_path: Path):
    study, _ = load_study(fixed_displacement().write(tmp_path))
    pair = study.pair(study.headline)
    comparison = Comparison(study, pair, Batch.best_estimate())
    frozen = comparison.frozen_choices(comparison.outcome(study.policy.primary))
    peaks = []
    uncertainty(DrawTask(study, pair, study.policy.primary, frozen, plan_of(8 * LARGEST_BLOCK)))  # imports and caches
    # from 32 blocks on everything that is kept once is there: groups of blocks, blocks of the curves
    for blocks in (32, 256):
        task = DrawTask(study, pair, study.policy.primary, frozen, plan_of(blocks * LARGEST_BLOCK))
        tracemalloc.start()
        uncertainty(task)
        peaks.append(tracemalloc.get_traced_memory()[1])
        tracemalloc.stop()
    # one more block sum would be 0.13 MB; 224 of them would stand out
    assert peaks[1] - peaks[0] < 2.0e6
