"""In every draw both sides choose their supply anew; size and threshold shift stay as frozen at the best estimate."""

from __future__ import annotations

from decimal import Decimal as D

import numpy as np

from benchmark.decide.draw_block import DrawTask, drawn
from benchmark.draws.plan import Plan
from benchmark.sets.study import Choice, Study
from tests.comparisons import comparison, load, moved, side, steep, study
from tests.near import near
from tests.studies import Table, v

KEYS = ("a.on_current", "a.off_current", "b.on_current", "b.off_current")


def spread(best: str, unit: str, factor: str) -> Table:
    return v(D(best), unit, spread={"shape": "lognormal", "factor": D(factor)})


def two_sides() -> Study:
    """Clocked, so that leakage over the period and the deadline both pull at supply, size and threshold."""
    knobs: Table = {"shifts": [-50.0, 0.0, 50.0, 100.0], "sizes": [0.5, 1.0, 2.0]}
    currents = {"on_current": spread("200.0", "uA/um", "2.0"), "off_current": spread("1.0", "nA/um", "20.0")}
    return load(
        study(
            side("a", 0.15, 0.9, **knobs),
            [side("b", 0.15, 0.9, **knobs)],
            [steep("a", **currents), steep("b", **currents)],
            timing="clocked",
            accounting="period",
            values={"clock_frequency": v(D("10.0"), "MHz")},
            requirements={"deadline": {"limit": "cycle", "kind": "hard"}},
        )
    )


def test_supplies_are_chosen_anew_in_every_draw_and_what_is_frozen_stays():
    loaded = two_sides()
    policy = loaded.policy.primary
    start = comparison(loaded)
    frozen = start.frozen_choices(start.outcome(policy))
    task = DrawTask(loaded, loaded.pair(loaded.headline), policy, frozen, Plan(1, 16, 3))
    together, outcome, _ = drawn(task, 0)
    sides = {"a": outcome.candidate, "b": outcome.contenders[0]}
    first = {"a": start.outcome(policy).candidate, "b": start.outcome(policy).contenders[0]}
    for name, found in sides.items():
        assert np.count_nonzero(found.found) >= 12
        supplies = found.supply[found.found]
        assert supplies.max() / supplies.min() > 1.1
        points, best = found.optimum.points, first[name].optimum.points
        assert Choice(float(points.size), float(points.threshold_shift)).frozen == (
            Choice(float(best.size), float(best.threshold_shift)).frozen
        )
    would_change = {"a": 0, "b": 0}
    for row in range(1, together.batch.rows):
        at = loaded
        for key in KEYS:
            at = moved(at, key, float(together.batch.columns[key][row]))
        alone, free = comparison(at), comparison(at).outcome(policy)
        alone.frozen = frozen
        single = alone.outcome(policy)
        for name, mine, kept, chosen in (
            ("a", sides["a"], single.candidate, free.candidate),
            ("b", sides["b"], single.contenders[0], free.contenders[0]),
        ):
            assert mine.found[row] == kept.found[0]
            if not mine.found[row]:
                continue
            # the search of a draw is coarser than that of a study of its own
            assert mine.energy[row] == near(float(kept.energy[0]), rel=2e-3)
            assert mine.energy[row] >= chosen.energy[0] * (1.0 - 1e-9)
            would_change[name] += bool(mine.energy[row] > 1.05 * chosen.energy[0])
    assert min(would_change.values()) >= 2
