"""Whole comparisons whose answer is known exactly: an advantage that is a product of log-normal values, and R C stages.

The film driven to a fixed displacement (``tests/fixed_displacement.py``, invented): ln(advantage) is normal with mean
ln 2 and variance 0.20^2 + (2 0.20)^2 + 0.10^2, so probabilities, variance shares and values of information follow from
the normal distribution (scipy.stats). Draws are 2^14, so tolerances are sampling errors, five standard errors as the
program's own estimates state them or more.
"""

from __future__ import annotations

import tempfile
from collections.abc import Iterator
from functools import lru_cache
from pathlib import Path

import mpmath
import numpy as np
from scipy import stats

from benchmark.decide import (
    attribution,
    axes,
    closed_form,
    curves,
    elasticity,
    flipping_set,
    gap,
    joint_sheet,
    ladder,
    moves,
    next_measurement,
    robustness,
    specification,
    steps,
    trade,
    uncertainty,
    variance_shares,
)
from benchmark.decide.break_even import find_needs
from benchmark.decide.compare import Comparison
from benchmark.decide.draw_block import DrawTask
from benchmark.decide.trials import Trials
from benchmark.draws.plan import plan_of
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.side import values_by_key
from benchmark.record.load import load_study
from benchmark.sets.study import Study
from tests.fixed_displacement import fixed_displacement
from tests.validation.check import Check

__all__ = ["checks"]

GROUP = "Decisions, by the normal distribution and exact product laws"
NORMAL = "normal distribution, scipy.stats.norm"
LAW = "exponents of the product law"
DRAWS, REQUIRED = 2**14, 1.5
MEAN, SHARES = float(np.log(2.0)), {"capacitance": 0.20**2, "coefficient": (2.0 * 0.20) ** 2, "reference": 0.10**2}
SD = float(np.sqrt(sum(SHARES.values())))
KEYS = {
    "capacitance": "film-switch.input_capacitance",
    "coefficient": "film-switch.actuator_coefficient",
    "reference": "stated-reference.input_capacitance",
}


@lru_cache(maxsize=2)
def _study(coefficient: str = "200.0", capacitance: str = "0.20") -> Study:
    made = fixed_displacement((coefficient, "0.20"), (capacitance, "0.20"), str(REQUIRED))
    with tempfile.TemporaryDirectory() as folder:
        return load_study(made.write(Path(folder)))[0]


def _task(draws: int) -> DrawTask:
    study = _study()
    pair = study.pair(study.headline)
    comparison = Comparison(study, pair, Batch.best_estimate())
    frozen = comparison.frozen_choices(comparison.outcome(study.policy.primary))
    return DrawTask(study, pair, study.policy.primary, frozen, plan_of(draws))


def _check(name: str, source: str, expected: float, obtained: float, allowed: float, basis: str) -> Check:
    return Check("closed form", GROUP, name, source, "derived", float(expected), float(obtained), allowed, basis)


def _loss(mean: float, sd: float) -> float:
    """E[max(0, x)] of a normal x."""
    return float(mean * stats.norm.cdf(mean / sd) + sd * stats.norm.pdf(mean / sd))


def _drawn() -> Iterator[Check]:
    found = uncertainty.uncertainty(_task(DRAWS))
    gain = MEAN - np.log(REQUIRED)
    sampled = "sampling error of 2^14 draws"
    yield _check(
        "probability that the required advantage is reached [1]", NORMAL, stats.norm.cdf(gain / SD),
        found.reaches.value, 0.006, sampled,
    )  # fmt: skip
    yield _check(
        "probability that the advantage exceeds 1 [1]",
        NORMAL,
        stats.norm.cdf(MEAN / SD),
        found.above_one.value,
        0.006,
        sampled,
    )
    yield _check("mean of ln(advantage) [1]", NORMAL, MEAN, found.mean_log.value, 0.002, sampled)
    yield _check("standard deviation of ln(advantage) [1]", NORMAL, SD, found.sd_log.value, 0.003, sampled)
    for q in (0.05, 0.5, 0.95):
        yield _check(
            f"quantile {q:g} of the advantage [1]", NORMAL, np.exp(MEAN + SD * stats.norm.ppf(q)),
            found.quantiles[q].value, 0.01 * np.exp(MEAN + SD * stats.norm.ppf(q)), sampled,
        )  # fmt: skip
    worth = _loss(gain, SD) - max(gain, 0.0)
    yield _check("value of perfect information [ln advantage]", NORMAL, worth, found.worth_of_all.value, 0.001, sampled)
    for draws in (64, 256, 4096):
        exact = 1.0 - 0.05 ** (1.0 / draws)
        yield _check(
            f"largest probability of what none of {draws} draws showed, at 95 % [1]",
            "(1 - p)^n = 0.05: the binomial probability of no success",
            exact,
            uncertainty.unseen(draws),
            0.03 * exact,
            "the rule of three is the first term of the logarithm",
        )
    shares = {item.key: item for item in found.shares}
    for name, variance in SHARES.items():
        one, sd = shares[KEYS[name]], float(np.sqrt(variance))
        yield _check(f"variance share, {name} [1]", LAW, variance / SD**2, one.share.value, 0.01, sampled)
        if name == "reference":
            continue  # below the sampling error
        yield _check(
            f"value of knowing the {name} [ln advantage]",
            NORMAL,
            _loss(gain, sd) - max(gain, 0.0),
            one.worth.value,
            0.002,
            sampled,
        )
    study = _study()
    listed = next_measurement.next_measurements(found, REQUIRED, (), values_by_key(study, study.pair(study.headline)))
    (best,) = (item for item in listed if item.key == KEYS["coefficient"])
    halved = np.sqrt(SHARES["coefficient"] / 1.25)
    yield _check(
        "value of measuring the coefficient to half its spread [ln advantage]", NORMAL,
        _loss(gain, halved) - max(gain, 0.0), best.worth_halved, 0.002, sampled,
    )  # fmt: skip
    few = variance_shares.variance_shares(_task(DRAWS), list(KEYS.values()), 1024)
    for name, item in zip(SHARES, few, strict=True):
        yield _check(
            f"total variance share, {name} [1]",
            LAW,
            SHARES[name] / SD**2,
            item.total,
            0.05,
            "sampling error of 2^10 draws",
        )


def _exponents() -> Iterator[Check]:
    study = _study()
    pair = study.pair(study.headline)
    comparison = Comparison(study, pair, Batch.best_estimate())
    outcome = comparison.outcome(study.policy.primary)
    frozen = comparison.frozen_choices(outcome)
    found = {
        row.key: row for row in elasticity.elasticities(study, pair, outcome, frozen, list(values_by_key(study, pair)))
    }
    for name, exponent in (("capacitance", -1.0), ("coefficient", 2.0), ("reference", 1.0)):
        value = found[KEYS[name]].reoptimised
        yield _check(f"elasticity of the advantage, {name} [1]", LAW, exponent, value, 1e-4, "difference quotient")


def _levels() -> Iterator[Check]:
    study = _study()
    trials = Trials(study, study.pair(study.headline))
    axis = axes.find_axis(trials, KEYS["coefficient"])
    (need,) = find_needs(study, trials.pair, [axis], [REQUIRED], trials=trials)
    (crossing,) = need.crossings
    own = float(mpmath.mpf("200e-12") * mpmath.sqrt(mpmath.mpf(REQUIRED) / 2))
    yield _check(
        "coefficient at which the required advantage is met [m/V]", LAW, own, crossing.x, 1e-6 * own, "root of the law"
    )
    away = axes.deviations(axis.value, crossing.x)
    own = float(mpmath.log(mpmath.sqrt(mpmath.mpf(REQUIRED) / 2)) / mpmath.mpf("0.2"))
    yield _check("the same in standard deviations of its spread [1]", LAW, own, away, 1e-5, "root of the law")
    x = np.geomspace(1.0, 100.0, 9)
    (found,) = curves.crossings(x, 0.2 * x**0.7, 1.0)
    own = float(mpmath.power(5, 1 / mpmath.mpf("0.7")))
    yield _check("crossing of a power law on logarithmic scales [1]", LAW, own, found, 1e-9, "rounding")


def _moved() -> Iterator[Check]:
    """The law at the ends of a range, at the nodes, in every cell and on every rung that offers nothing."""
    study = _study()
    pair, policy = study.pair(study.headline), study.policy.primary
    comparison = Comparison(study, pair, Batch.best_estimate())
    outcome = comparison.outcome(policy)
    (node,) = curves.scan_nodes(study, policy)
    rungs = [rung for ladder_ in ladder.ladders(comparison, outcome) for rung in ladder_.rungs]
    found = {
        "at the only node": [node.advantage],
        "in every cell of the robustness table": [cell.advantage for cell in robustness.robustness(study, {}).cells],
        "on every rung, none of which offers anything": [rung.advantage for rung in rungs if not rung.offered],
        "with nothing perfected": [gap.improvements(Trials(study, pair))[0].advantage],
    }
    for where, values in found.items():
        worst = max(values, key=lambda value: abs(value - 2.0))
        yield _check(f"advantage {where} [1]", LAW, 2.0, worst, 2e-6, "leakage through 1e15 ohm")
    _, listed = moves.move_inputs(study, pair, policy, comparison.frozen_choices(outcome))
    by_key = {move.key: move for move in listed}
    for name, exponent in (("capacitance", -1.0), ("coefficient", 2.0)):
        move = by_key[KEYS[name]]
        for end, value in ((move.low, move.advantage_low), (move.high, move.advantage_high)):
            own = 2.0 * float(mpmath.power(mpmath.mpf(end) / mpmath.mpf(move.best), exponent))
            side = "low" if end < move.best else "high"
            yield _check(
                f"advantage at the {side} end of the {name} [1]", LAW, own, value, 1e-5 * own, "leakage, search"
            )


def _traded() -> Iterator[Check]:
    study = _study()
    trials = Trials(study, study.pair(study.headline))
    first, second = (axes.find_axis(trials, KEYS[name]) for name in ("coefficient", "capacitance"))
    curve = trade.trade_curve(trials, first, second, REQUIRED, count=5)
    pairs = [
        (x, crossing.x)
        for x, profile in zip(curve.values, curve.profiles, strict=True)
        for crossing in profile.crossings_of(REQUIRED)
    ]
    x, capacitance = pairs[len(pairs) // 2]
    own = second.best * 2.0 / REQUIRED * (x / first.best) ** 2
    yield _check("capacitance that a coefficient allows [F]", LAW, own, capacitance, 1e-5 * own, "leakage, root")
    flip = flipping_set.flipping_sets(trials, REQUIRED, 1).flips[0]
    own = abs(float(mpmath.log(mpmath.sqrt(mpmath.mpf(REQUIRED) / 2)) / mpmath.mpf("0.2")))
    yield _check(
        "nearest input that flips the answer [standard deviations]", LAW, own, flip.implausibility, 1e-5, "root"
    )
    sheet = specification.specification(trials, REQUIRED, chosen=[first])
    (need,) = sheet.needs
    own = first.best * float(mpmath.sqrt(mpmath.mpf(REQUIRED) / 2))
    yield _check("coefficient on the specification sheet [m/V]", LAW, own, need.crossings[0].x, 1e-6 * own, "root")
    found = joint_sheet.joint_sheet(trials, REQUIRED, specification.spread_effects(trials, REQUIRED))
    # exponents 2 and -1 with equal spreads: the coefficient moves the advantage most
    (largest,) = specification.most_effective(trials, 1)
    yield _check("value of the candidate with the largest effect [m/V]", LAW, first.best, largest.best, 0.0, "exact")
    own = float(mpmath.log(mpmath.mpf(REQUIRED) / 2) / mpmath.mpf("0.6"))
    yield _check("steps of coefficient and capacitance together [1]", LAW, own, found.steps, 1e-5, "leakage, root")
    value = float(joint_sheet.moved_value(trials.values[KEYS["coefficient"]], 1.0, own).si[0])
    own = first.best * float(mpmath.cbrt(mpmath.mpf(REQUIRED) / 2))
    yield _check("coefficient on the joint sheet [m/V]", LAW, own, value, 1e-12 * own, "rounding")


def _split() -> Iterator[Check]:
    """Two changes at once, told apart: the parts of a product law are its exponents times the logarithms."""
    old, new = _study(), _study("220.0", "0.18")
    found = attribution.attribute(old, new)[0]
    parts = {"coefficient": 2.0 * float(mpmath.log("1.1")), "capacitance": -float(mpmath.log("0.9"))}
    yield _check(
        "change of ln(advantage) between two studies [1]", LAW, sum(parts.values()), found.total, 1e-6, "leakage"
    )
    for name, own in parts.items():
        values = [value for key, value in found.parts.items() if KEYS[name].rpartition(".")[2] in key]
        yield _check(f"its part from the {name} [1]", LAW, own, sum(values), 1e-5, "leakage")
    worth = {k: (1.0 + (k & 1)) * (1.0 - 0.2 * (k >> 1)) ** 2 for k in steps.combinations(2)}
    for name, own, value in zip(("C", "V"), (0.82, -0.54), steps.attribution(worth, 2), strict=True):
        yield _check(
            f"part of a step of C V^2 by two orders, {name} [1]", "both orders by hand", own, value, 1e-12, "rounding"
        )


def _facts() -> Iterator[Check]:
    study = _study()
    pair = study.pair(study.headline)
    comparison = Comparison(study, pair, Batch.best_estimate())
    outcome = comparison.outcome(study.policy.primary)
    factor = closed_form.delay_factor(comparison.contenders["stated-reference"], outcome.contenders[0])
    yield _check(
        "factor of R C under the rule step [1]",
        "half of an exponential, mpmath",
        float(mpmath.log(2)),
        factor,
        1e-12,
        "rounding",
    )
    rung = ladder.climb(comparison, outcome, "reference").rungs[0]
    yield _check("advantage on the first rung of the reference alone [1]", LAW, 2.0, rung.advantage, 2e-6, "leakage")
    value = values_by_key(study, pair)[KEYS["reference"]]
    found = next_measurement.relative_spread(value)
    yield _check("relative spread of a log-normal value, small [1]", "its ln-sd", 0.1, found, 1e-12, "definition")


def checks() -> list[Check]:
    """Every result."""
    return [check for part in (_drawn, _exponents, _levels, _moved, _traded, _split, _facts) for check in part()]
