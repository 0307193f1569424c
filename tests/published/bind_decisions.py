"""Check rows of break-evens and of whole comparisons: studies of invented switches stated by R and C.

One inverter of two switches of C_in drives its like: energy a 2 C_in V^2 per operation, leakage V^2 / R_off over the
operation's time, so that the numbers of a row can be set.
"""

from __future__ import annotations

from collections.abc import Mapping
from decimal import Decimal
from functools import lru_cache
from typing import Any

from benchmark.decide import break_even, compare
from benchmark.decide.axes import find_axis
from benchmark.decide.trials import Trials
from benchmark.evaluate.batch import Batch
from benchmark.physics import noise, wires
from benchmark.sets.study import Study
from tests.comparisons import given, load, side, study
from tests.published.rows import Binding
from tests.studies import v


def _switch(name: str, energy: float, power: float, supply: float = 1.0) -> dict[str, Any]:
    """Invented switch; ``energy`` [fJ] of one inverter and cycle, ``power`` [nW] of its leakage, at ``supply``."""
    return given(
        name,
        supply=supply,
        on_resistance=1e-6,
        input_capacitance=0.5 * energy / supply**2,
        off_resistance=1e3 * supply**2 / power,
        footprint=1.0,
    )


@lru_cache(maxsize=8)
def _clocked(clock: str, activity: str) -> Study:
    """E_A = 4 fJ, P_A = 1 nW against E_B = 1 fJ, P_B = 100 nW, at 1 V in a clocked block."""
    values: Mapping[str, Any] = {
        "activity": v(Decimal(activity)),
        "logic_depth": v(1),
        "clock_frequency": v(Decimal(clock), "MHz"),
    }
    return load(
        study(
            side("a", 1.0, 1.0),
            [side("b", 1.0, 1.0)],
            [_switch("a", 4.0, 1.0), _switch("b", 1.0, 100.0)],
            values=dict(values),
            timing="clocked",
            accounting="period",
        )
    )


def _break_even(axis: str, clock: str, activity: str) -> float:
    loaded = _clocked(clock, activity)
    trials = Trials(loaded, loaded.pair(loaded.headline))
    (need,) = break_even.find_needs(loaded, trials.pair, [find_axis(trials, axis)], [1.0], trials=trials)
    (crossing,) = need.crossings
    return float(crossing.x)


def _lowered(capacitance: float, supply: float) -> float:
    """Power of a block of ``capacitance`` times the reference's at ``supply``, over that at 5 V and equal rate."""
    sides = [given("a", supply=supply, input_capacitance=0.2 * capacitance, off_resistance=None)]
    sides += [given("b", supply=5.0, input_capacitance=0.2, off_resistance=None)]
    for one in sides:
        one["value"]["off_resistance"] = v(Decimal("1e15"), "Mohm", unusual=True)
    loaded = load(study(side("a", supply, supply), [side("b", 5.0, 5.0)], sides))
    outcome = compare.Comparison(loaded, loaded.pair(loaded.headline), Batch.best_estimate()).outcome("minimum-energy")
    return float(outcome.candidate.energy[0] / outcome.contenders[0].energy[0])


BINDINGS = [
    Binding("cir.BE-alpha", (), lambda: _break_even("activity", "1000", "0.05")),
    # an operation per period, 1 ns of it active: the duty is rate times 1 ns
    Binding("cir.BE-duty", (), lambda: 1e-9 * _break_even("clock_frequency", "100", "1")),
    Binding("cir.BE-duty-T", (), lambda: 1e9 / _break_even("clock_frequency", "100", "1")),
    Binding("cir.PAR-pipe", (), lambda: _lowered(1.15, 2.9)),
    Binding(
        "cir.NOISE-rate",
        ("benchmark.physics.noise:crossing_rate",),
        lambda: noise.crossing_rate(8.0, noise.pole_frequency(1e4, 0.1e-15)),
        relative=True,
    ),
    Binding("cir.NOISE-Q", ("benchmark.physics.noise:sampled_error",), lambda: noise.sampled_error(7.0), relative=True),
    Binding("cir.CU-const", (), lambda: wires.COPPER_RESISTIVITY * wires.COPPER_MEAN_FREE_PATH),
]
