"""Check rows of draws, correlation, variance shares and values of information.

Draws come from the project's own nets (2^17 of them unless said otherwise), so what a finite number adds to the
tolerance of a row stands beside it: about five standard errors, measured as the scatter of twelve seeds.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq

from benchmark.decide import attribution, next_measurement, variance_shares
from benchmark.decide.uncertainty import Estimate, InputShare
from benchmark.draws.plan import Plan, net, plan_of
from benchmark.draws.values import draw_values
from benchmark.sets import joints
from benchmark.sets.joints import Joint
from benchmark.sets.values import Spread, Value
from tests.published.rows import Binding

Array = NDArray[np.float64]
VALUES = ("benchmark.draws.values:value_at",)
SHARES = ("benchmark.decide.variance_shares:sobol_shares",)
WORTH = ("benchmark.decide.next_measurement:imperfect_worth",)
#: a name whose domain cuts no tail
NAME = "built_in_interference"
ROOT3 = float(np.sqrt(3.0))


def _value(best: float, shape: str, low: float, high: float, scale: float | None = None) -> Value:
    spread = Spread(shape, np.array([low]), np.array([high]), None if scale is None else np.array([scale]))
    return Value(NAME, np.array([best]), "1", spread, "measured", "s")


def _normal(best: float, sd: float) -> Value:
    return _value(best, "normal", best - 2.0 * sd, best + 2.0 * sd, sd)


def _rectangular(half: float) -> Value:
    return _value(0.0, "uniform", -half, half)


def _propagated(
    function: Callable[..., Array], values: Mapping[str, Value], joint: Joint | None = None, draws: int = 2**17
) -> Array:
    plan = plan_of(draws)
    keyed = {f"example.{name}": item for name, item in values.items()}
    tied = {"example": (joint,)} if joint else None
    found = []
    for block in range(plan.blocks):
        _, columns = draw_values(keyed, plan, block, joints=tied)
        found.append(function(*(columns[key] for key in keyed)))
    return np.concatenate(found)


def _ends(y: Array) -> tuple[float, float]:
    low, high = np.quantile(y, [0.025, 0.975]).tolist()
    return low, high


def _sum(values: list[Value]) -> Array:
    return _propagated(lambda *x: np.sum(x, axis=0), {f"x{i}": item for i, item in enumerate(values)})


def _spread_and_ends(values: list[Value]) -> list[float]:
    y = _sum(values)
    return [float(y.std()), _ends(y)[0]]


def _mass() -> Array:
    """Calibration of a mass: conventional mass less 100 g [mg], densities in kg/m^3."""
    values = {
        "reference": _normal(100000.0, 0.05),
        "added": _normal(1.234, 0.02),
        "air": _value(1.2, "uniform", 1.1, 1.3),
        "weight": _value(8000.0, "uniform", 7000.0, 9000.0),
        "density": _value(8000.0, "uniform", 7950.0, 8050.0),
    }
    return _propagated(
        lambda reference, added, air, weight, density: (
            (reference + added) * (1.0 + (air - 1.2) * (1.0 / weight - 1.0 / density)) - 100000.0
        ),
        values,
    )


def _loss(x1: float, correlation: float = 0.0) -> Array:
    """Comparison loss x1^2 + x2^2 in 1e-6, standard uncertainties 0.005."""
    # rank correlation of a normal pair with this correlation
    joint = Joint(("x1", "x2"), 6.0 / np.pi * float(np.arcsin(0.5 * correlation))) if correlation else None
    values = {"x1": _normal(x1, 0.005), "x2": _normal(0.0, 0.005)}
    return 1e6 * _propagated(lambda a, b: a**2 + b**2, values, joint)


def _logarithm() -> Array:
    return _propagated(np.log, {"x": _value(0.6, "uniform", 0.1, 1.1)})


def _shortest(y: Array) -> tuple[float, float]:
    """Return the shortest interval that holds 95 %."""
    ordered = np.sort(y)
    held = int(0.95 * ordered.size)
    start = int(np.argmin(ordered[held:] - ordered[:-held]))
    return float(ordered[start]), float(ordered[start + held])


_DRAWS = [
    Binding("cir.S1-9.2.2", VALUES, lambda: _spread_and_ends([_normal(0.0, 1.0)] * 4), picks=(0, 1), sampling=0.04),
    Binding("cir.S1-9.2.3", VALUES, lambda: _ends(_sum([_rectangular(ROOT3)] * 4))[1], sampling=0.03),
    Binding(
        "cir.S1-9.2.4",
        VALUES,
        lambda: _spread_and_ends([_rectangular(ROOT3)] * 3 + [_rectangular(10.0 * ROOT3)]),
        picks=(0, 1),
    ),
    Binding("cir.S1-9.3-MCM", VALUES, lambda: (float(_mass().mean()), float(_mass().std())), picks=(0, 1)),
    Binding("cir.S1-9.3-width", VALUES, lambda: (*_ends(_mass()), float(np.ptp(_ends(_mass()))))),
    *(
        Binding(f"cir.S1-9.4-x{x1}", VALUES, lambda x1=x1: (float(_loss(x1).mean()), float(_loss(x1).std())))
        for x1 in (0.0, 0.05)
    ),
    *(
        Binding(f"cir.S1-9.4r-x{x1}", VALUES, lambda x1=x1: float(_loss(x1, 0.9).std()), sampling=0.4)
        for x1 in (0.0, 0.01, 0.05)
    ),
    Binding("cir.NPL-ln", VALUES, lambda: (float(_logarithm().mean()), float(_logarithm().std()))),
    Binding("cir.NPL-ln-int", VALUES, lambda: _shortest(_logarithm())),
]


# -- correlation: of the normal scores from that of the ranks ----------------------------------------------------------


def _scores(rank: float) -> float:
    return float(joints.rank_matrix((Joint(("a", "b"), rank),))[1][0, 1])


_CORRELATION = [
    Binding("cir.COP-inv", ("benchmark.sets.joints:rank_matrix",), lambda: _scores(0.5)),
    *(
        Binding(
            f"cir.COP-{r}",
            (),
            lambda r=r: brentq(lambda rank: _scores(rank) - r, 0.0, 1.0, xtol=1e-12),
        )
        for r in (0.3, 0.5, 0.9)
    ),
]


# -- variance shares: an estimate from draws, 2^16 of them: standard error up to 2e-4 ---------------------------

DRAWS = 2**16


@lru_cache(maxsize=8)
def _sets(dimension: int) -> tuple[Array, Array]:
    both = net("function", 2 * dimension, Plan(1, DRAWS, 0), 0)
    return both[:, :dimension], both[:, dimension:]


def _shares(function: Callable[[Array], Array], dimension: int) -> tuple[list[float], list[float]]:
    """Return first-order and total shares of the inputs of a function of points in (0, 1)."""
    a, b = _sets(dimension)
    mixed = []
    for i in range(dimension):
        changed = a.copy()
        changed[:, i] = b[:, i]
        mixed.append(function(changed))
    keys = [str(i) for i in range(dimension)]
    # one net: no error, none is asked for
    found = variance_shares.sobol_shares(keys, function(a)[None], function(b)[None], np.stack(mixed)[:, None])
    return [one.first for one in found], [one.total for one in found]


def _ishigami(u: Array) -> Array:
    x = np.pi * (2.0 * u - 1.0)
    return np.asarray(np.sin(x[:, 0]) + 7.0 * np.sin(x[:, 1]) ** 2 + 0.1 * x[:, 2] ** 4 * np.sin(x[:, 0]))


def _g_function(weights: tuple[float, ...]) -> Callable[[Array], Array]:
    a = np.array(weights)
    return lambda u: np.prod((np.abs(4.0 * u - 2.0) + a) / (1.0 + a), axis=1)


def _linear(u: Array) -> Array:
    """Unit variances: rectangular inputs of that variance do as well as any."""
    return (u * np.sqrt(12.0)) @ np.array([3.0, 4.0])


def _product(u: Array) -> Array:
    """Means 1, standard deviations 0.5."""
    return np.prod(1.0 + (u - 0.5) * np.sqrt(12.0) * 0.5, axis=1)


EIGHT, FOUR = (0.0, 1.0, 4.5, 9.0, 99.0, 99.0, 99.0, 99.0), (0.0, 1.0, 4.5, 9.0)


def _of_product() -> tuple[float, float]:
    first, total = _shares(_product, 2)
    return first[0], total[0]


_VARIANCE = [
    Binding(
        "cir.SOBOL-ISH",
        SHARES,
        lambda: [x for part in _shares(_ishigami, 3) for x in part],
        picks=(1, 2, 3, 4, 5, 6),
        sampling=0.001,
    ),
    Binding("cir.SOBOL-G", SHARES, lambda: _shares(_g_function(EIGHT), 8)[0][:5], sampling=0.001),
    Binding("cir.SOBOL-G4", SHARES, lambda: _shares(_g_function(FOUR), 4)[0], sampling=0.001),
    Binding("cir.SOBOL-lin", SHARES, lambda: _shares(_linear, 2)[0], sampling=0.001),
    Binding("cir.SOBOL-prod", SHARES, _of_product, picks=(0, 2), sampling=0.001),
]


# -- values of information, shares of a step ---------------------------------------------------------------------------


def _worth(sd: float, ratio: float) -> float:
    """Mean net benefit 1, normal; measured with an error of ``ratio`` prior standard deviations."""
    none = Estimate(0.0, 0.0)
    return next_measurement.imperfect_worth(1.0, InputShare("x", "normal", none, none, np.array([sd])), ratio)


def _step() -> list[float]:
    """C V^2 from (1, 1) to (2, 0.8): bit 0 of a combination is C, bit 1 is V."""
    worth = [(1.0 + (k & 1)) * (1.0 - 0.2 * (k >> 1)) ** 2 for k in range(4)]
    return [float(part) for part in attribution.shapley(np.array(worth), 2)]


_INFORMATION = [
    # a net of 16384 midpoints instead of an integral
    Binding("cir.EVPPI-norm", WORTH, lambda: (_worth(1.6, 0.0), _worth(1.2, 0.0)), sampling=1e-4),
    Binding("cir.EVSI-norm", WORTH, lambda: _worth(1.6, 0.5), picks=(1,), sampling=1e-4),
    Binding("cir.SHAP-CV2", ("benchmark.decide.attribution:shapley",), _step),
]

BINDINGS = [*_DRAWS, *_CORRELATION, *_VARIANCE, *_INFORMATION]
