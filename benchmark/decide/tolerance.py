"""Required value and required spread of one parameter at a stated probability, the other ranges drawn (layer 7).

All values with a stated spread are drawn together. The parameter asked about is moved as a whole, its spread with it:
a spread on a logarithmic scale keeps its factor, any other its share of the value. With common draws,

    P(f, s) = share of draws with an advantage of at least M
    value = best f (draw / best)^s    or    f (best + s (draw - best))

the required value is best f with P(f, 1) = p, the required spread is the largest s with P(1, s) >= p. The k-th smallest
ln(advantage) of the draws, k = floor((1 - p) n), is continuous where the advantage is, so both are roots of it. A draw
in which the candidate has no permitted point, or misses a listed requirement, does not reach M.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchmark.catalogue import QUANTITIES
from benchmark.decide.axes import Axis
from benchmark.decide.draw_block import resolution
from benchmark.decide.profile import find_shares
from benchmark.decide.trials import Trials
from benchmark.draws.plan import plan_of
from benchmark.draws.values import draw_values
from benchmark.errors import UsageError
from benchmark.evaluate.side import joints_by_owner
from benchmark.sets.study import draws_allowed

__all__ = ["Tolerance", "Tolerances"]

Array = NDArray[np.float64]
#: factors between which a required value is looked for, and looks per decade on the way
FACTORS, LOOKS = 10.0, 4
#: largest multiple of the stated spread that is looked at
WIDEST = 4.0
#: tolerance of ln f, and of s
TOLERANCE = 1.0e-4
LOGARITHMIC = ("lognormal", "loguniform")


@dataclass(frozen=True)
class Tolerance:
    """Answer for one parameter.

    ``value``: required value (SI), its spread moving with it, nan where none between a tenth and ten times today's will
    do; ``spread``: largest multiple of the stated spread at today's value, 0 when it must be known exactly, nan when
    even that is not enough or no spread is stated; ``words`` says which. ``today``: probability as it is.
    """

    axis: Axis
    probability: float
    today: float
    value: float
    spread: float
    error: float
    words: str


class Tolerances:
    """Draws of a study, kept for all parameters asked about.

    Parameters
    ----------
    trials : Trials
    level : float
        Advantage to be reached.
    probability : float
        Above 0 and below 1.
    draws : int
        A power of two, at least 16.
    seed : int

    Raises
    ------
    UsageError
        When a number is out of its range, or no value of the study has a spread.
    """

    def __init__(self, trials: Trials, level: float, probability: float, draws: int = 256, seed: int = 0) -> None:
        if not 0.0 < probability < 1.0:
            message = f"a probability above 0 and below 1 is needed, found {probability:g}"
            raise UsageError(message)
        if allowed := draws_allowed(draws):
            message = f"draws must be {allowed}; found {draws}"
            raise UsageError(message)
        plan = plan_of(draws, seed)
        joints = joints_by_owner(trials.study, trials.pair)
        blocks = [draw_values(trials.values, plan, block, joints=joints) for block in range(plan.blocks)]
        if not blocks[0][1]:
            message = "no value of the study has a spread: nothing can be drawn, so there is no probability"
            raise UsageError(message)
        self.level, self.probability = level, probability
        #: ledger key -> points in (0, 1), and values drawn there (SI), over the draws
        self.points, self.columns = (
            {key: np.concatenate([block[part][key] for block in blocks]) for key in blocks[0][part]} for part in (0, 1)
        )
        self.draws = draws
        coarse = resolution(trials.study)
        self.trials = Trials(coarse, trials.pair, trials.policy, frozen=trials.frozen)

    @property
    def error(self) -> float:
        """Sampling error of a probability: of independent draws, an upper bound for these."""
        return math.sqrt(self.probability * (1.0 - self.probability) / self.draws)

    @property
    def place(self) -> int:
        """Place of the sorted draw that decides: where it reaches the level, the probability is reached."""
        return math.floor((1.0 - self.probability) * self.draws + 1e-9)

    def reaching(self, key: str = "", factor: float = 1.0, spread: float = 1.0) -> Array:
        """Return ln(advantage / M) of every draw, sorted; minus infinity where M is not reached for another reason."""
        moved = self._moved(key, factor, spread) if key else None
        if key and moved is None:
            return np.full(self.draws, -np.inf)
        return self.ranked({} if moved is None else {key: moved})

    def ranked(self, other: Mapping[str, Array]) -> Array:
        """Return ln(advantage / M) of every draw, sorted, with other values (SI, over the draws) for some keys."""
        columns = {**self.columns, **other}
        rows = [{name: float(column[row]) for name, column in columns.items()} for row in range(self.draws)]
        answers = self.trials(rows)
        log = np.where(answers.meets, answers.log, -np.inf) - math.log(self.level)
        return np.sort(np.nan_to_num(log, nan=-np.inf, posinf=np.inf, neginf=-np.inf))

    def share(self, key: str = "", factor: float = 1.0, spread: float = 1.0) -> float:
        """Return the share of draws that reach the level."""
        return float(np.mean(self.reaching(key, factor, spread) >= 0.0))

    def _moved(self, key: str, factor: float, spread: float) -> Array | None:
        """Return the moved draws of one value; None when some leave the domain of the value."""
        value = self.trials.values[key]
        best = float(value.si[0])
        drawn = self.columns.get(key)
        if drawn is None:
            moved = np.full(self.draws, best * factor)
        elif value.spread is not None and value.spread.shape in LOGARITHMIC:
            moved = best * factor * (drawn / best) ** spread
        else:
            moved = factor * (best + spread * (drawn - best))
        allows = QUANTITIES[value.name].allows
        return np.asarray(moved) if all(allows(float(x)) for x in moved) else None

    def _margin(self, key: str, factor: float, spread: float) -> float:
        """ln(advantage / M) that a share 1 - p of the draws does not exceed; at least 0 where P >= p."""
        return float(self.reaching(key, factor, spread)[self.place])

    def of(self, axis: Axis) -> Tolerance:
        """Answer for one parameter with a value above 0 that is no whole number."""
        key, value = axis.name, axis.value
        today = self.share(key)
        nan = float("nan")
        if value is None or axis.best <= 0.0 or axis.domain == "count":
            return Tolerance(axis, self.probability, today, nan, nan, self.error, "not a positive continuous value")
        here = self._margin(key, 1.0, 1.0)
        required, spread = self._value(key, axis.best, here), self._spread(key, here)
        parts = [f"today P = {today:.3g}"]
        if np.isnan(required):
            parts.append(f"no value between a tenth and ten times today's gives P = {self.probability:g}")
        else:
            parts.append(f"P = {self.probability:g} at {axis.text(required)}, its spread moving with it")
        if key not in self.columns:
            parts.append("no spread is stated")
        elif np.isnan(spread):
            parts.append("at today's value no spread is small enough")
        elif spread >= WIDEST:
            parts.append(f"at today's value {WIDEST:g} times the stated spread would still do")
        else:
            parts.append(f"at today's value {spread:.3g} times the stated spread")
        parts.append(f"error of P {self.error:.2g} with {self.draws} draws")
        return Tolerance(axis, self.probability, today, required, spread, self.error, "; ".join(parts))

    def _value(self, key: str, best: float, here: float) -> float:
        """Return the nearest required value (SI), looking outwards from today's step by step."""
        step = math.log(10.0) / LOOKS
        known = {0: here}
        for k in range(1, round(LOOKS * math.log10(FACTORS)) + 1):
            for number in (k, -k):
                inner = number - 1 if number > 0 else number + 1
                known[number] = self._margin(key, math.exp(number * step), 1.0)
                if (known[number] >= 0.0) != (known[inner] >= 0.0):
                    return best * math.exp(self._solve(key, inner * step, number * step, True))
        return float("nan")

    def _spread(self, key: str, here: float) -> float:
        """Return the largest multiple of the stated spread up to which P is reached without a gap."""
        if key not in self.columns:
            return float("nan")
        if here >= 0.0:
            for low, high in itertools.pairwise([1.0, 2.0, WIDEST]):
                if self._margin(key, 1.0, high) < 0.0:
                    return self._solve(key, low, high, False)
            return WIDEST
        return self._solve(key, 0.0, 1.0, False) if self._margin(key, 1.0, 0.0) >= 0.0 else float("nan")

    def _solve(self, key: str, low: float, high: float, moves_value: bool) -> float:
        """Return where the margin changes sign: ln f, or s."""

        def at(share: float) -> float:
            x = low + (high - low) * share
            return self._margin(key, math.exp(x), 1.0) if moves_value else self._margin(key, 1.0, x)

        def difference(share: Array, which: NDArray[np.intp]) -> Array:
            return np.array([at(float(s)) for s in share])

        return low + (high - low) * float(find_shares(difference, 1, xtol=TOLERANCE, ftol=TOLERANCE).x[0])
