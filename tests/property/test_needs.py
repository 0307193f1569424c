"""Laws 60 and 61 of break-even and required values, over random small technologies.

60: a value put back gives the level, the sides next to it differ, and there is no answer exactly where no side changes.
61: a stricter level asks for a stricter value; it is unreachable exactly where the ideal limit lies below it.
"""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from benchmark.decide.axes import find_axis, known_axes
from benchmark.decide.break_even import find_needs
from benchmark.decide.profile import Line
from benchmark.decide.trials import Trials
from tests import comparisons as cmp
from tests.comparisons import load, planar, pressed, side, steep, study
from tests.near import near
from tests.profiles import costly

few = costly(3)
#: relative resolution of the search over supplies in these studies
RESOLUTION = 1e-9


def factor(low: float, high: float) -> st.SearchStrategy[float]:
    return st.floats(np.log(low), np.log(high)).map(lambda x: float(f"{np.exp(x):.6g}"))


def made(policy: str, capacitance: float, resistance: float, swing: float, delay: float = 0.0) -> Trials:
    """A candidate of stated resistance (and switching time, ns) against a tunnelling transistor, best supplies."""
    loaded = load(
        study(
            side("a", 0.25, 0.6),
            [side("b", 0.2, 0.8)],
            [
                cmp.given(
                    "a",
                    on_resistance=20.0 * resistance,
                    input_capacitance=0.2 * capacitance,
                    closing_delay=delay,
                    opening_delay=delay,
                ),
                steep("b", subthreshold_swing=70.0 * swing),
            ],
            policy={"primary": policy} | ({} if policy == "minimum-energy" else {"exponent": 1.0}),
            refine=RESOLUTION,
            points=21,
        )
    )
    return Trials(loaded, loaded.pair(loaded.headline))


@pytest.mark.parametrize("policy", ["minimum-energy", "minimum-energy-delay"])
@few
@given(factor(0.3, 3.0), factor(0.3, 3.0), factor(0.6, 1.4), factor(0.5, 2.0))
def test_values_put_back_give_the_level_and_none_means_no_change(policy, capacitance, resistance, swing, of_today):
    trials = made(policy, capacitance, resistance, swing)
    level = float(trials.best.advantage[0]) * of_today
    sides = 0
    names = ("study.activity", "study.logic_depth", "a.input_capacitance", "a.on_resistance", "b.off_current")
    axes = [known_axes(trials)[name] for name in names]
    for need in find_needs(trials.study, trials.pair, axes, [level], trials=trials, count=9, ideal=False):
        changes = need.lowest < level <= need.highest
        assert bool(need.crossings) == changes
        for crossing in need.crossings:
            line = Line(need.axis)
            at, below, above = trials([line.trial(crossing.x * (1.0 + step)) for step in (0.0, -1e-4, 1e-4)]).advantage
            assert at == near(level, rel=1e-8)
            # where the advantage is nearly flat, the resolution of the search hides on which side it lies
            if abs(below / above - 1.0) > 100.0 * RESOLUTION:
                assert (below > level) == crossing.above_below
                assert (above < level) == crossing.above_below
                sides += 1
    assert sides >= 1


@few
@given(factor(0.3, 3.0), factor(0.3, 3.0), factor(0.6, 1.4))
def test_stricter_levels_ask_for_stricter_values_until_the_ideal_limit(capacitance, resistance, swing):
    trials = made("minimum-energy", capacitance, resistance, swing, 0.1)
    axis = find_axis(trials, "a.input_capacitance")
    levels = [float(trials.best.advantage[0]) * step for step in (1.1, 1.5, 3.0, 1e2, 1e7)]
    needs = find_needs(trials.study, trials.pair, [axis], levels, trials=trials, count=9)
    values = [need.crossings[0].x for need in needs if need.crossings]
    assert values == sorted(values, reverse=True)
    assert len(values) >= 2
    reached = [need.reach for need in needs if need.reach is not None]
    for need in needs:
        assert (need.kind == "unreachable") == (need.reach is not None)
        if need.reach is not None:
            assert need.reach.advantage < need.level
            assert need.reach.settled  # without charges the leakage of the switching time is left
    assert reached
    assert all(not need.crossings or need.level <= reached[0].advantage for need in needs)


@few
@given(factor(0.6, 1.6), factor(0.7, 1.3))
def test_better_coefficients_of_a_stress_gated_switch_never_ask_for_more_supply(strength, thickness):
    loaded = load(
        study(
            side("a", 0.05, 1.0),
            [side("b", 0.4, 1.0)],
            [
                pressed("a", actuator_coefficient=300.0 * strength, stack_thickness=60.0 * thickness),
                planar("b"),
            ],
            policy={"primary": "declared-point", "metric": "time-per-operation"},
            points=21,
        )
    )
    trials = Trials(loaded, loaded.pair(loaded.headline))
    level = float(trials.best.advantage[0])
    supply = find_axis(trials, "a.declared_supply").over(0.05, 0.5)
    coefficient = find_axis(trials, "a.actuator_coefficient")
    for better in (1.25, 1.5):
        line = Line(supply, {coefficient: coefficient.best * better})
        # the product of coefficient and supply sets the delay
        at = trials([line.trial(supply.best / better)]).advantage[0]
        assert at == near(level, rel=1e-9)
