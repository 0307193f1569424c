"""Best design points over supply and frozen choices (layer 6).

The supply is searched on a grid and then by repeated zooming into the interval around the best grid point; limits of
the feasible region inside that interval are found to the same resolution. The result is never worse than the best
grid point. Where no grid point is permitted, the permitted ones may lie between two of them (too slow here, beyond a
limit there): then the smallest margin is made as large as it goes, which finds them. An expensive condition (the
functional floor) is first checked at the optimum alone: an optimum of the larger set that also satisfies the condition
is the optimum of the smaller set. Only rows that fail it are searched again with the condition applied at every point.
"""

from __future__ import annotations

import abc
import dataclasses
from collections.abc import Callable, Mapping
from dataclasses import dataclass, fields
from typing import Any

import numpy as np
from numpy.typing import NDArray

from benchmark.evaluate.points import Points, design_points
from benchmark.evaluate.side import SideProblem, build_side
from benchmark.evaluate.windows import hidden_windows
from benchmark.evaluate.zoom import Near, Seen
from benchmark.sets.study import Choice, NodePair

__all__ = [
    "All",
    "Alteration",
    "Condition",
    "Objective",
    "Optimum",
    "SideRun",
    "hold_to",
    "least",
    "minimise",
    "nowhere",
    "put_rows",
    "same_silicon",
    "supply_grid",
    "take_columns",
    "take_rows",
]

Array = NDArray[np.float64]
Mask = NDArray[np.bool_]
Alteration = Callable[[SideProblem], SideProblem]
Objective = Callable[[SideProblem, Points], Array]
#: points of which a costly condition is asked in one call: enough to be worth the call
ASKED_TOGETHER = 16
#: relative distance at which an optimum counts as lying on a limit of the search
ON_BOUND = 1.0e-9
#: of so many supplies of the grid one is looked at for a first idea
SPARSE = 4
#: the rows that are not done go on alone once they are fewer than one in so many
ALONE = 2
#: points of each round that looks for a window of permitted supplies
WINDOW_POINTS = 9


@dataclass(frozen=True)
class Optimum:
    """Best point of every row. ``found`` marks rows with a feasible point; the others hold no meaning."""

    points: Points  # (row, 1)
    value: Array  # objective (row,)
    found: Mask  # (row,)
    at_lower: Mask
    at_upper: Mask
    at_limit: Mask  # inside the range, but the supplies next to it that would be better are not permitted


class Condition(abc.ABC):
    """What a point must meet, with a margin that tells how far it is from it."""

    @abc.abstractmethod
    def margin(self, run: SideRun, points: Points, among: Mask) -> Array:
        """Return a factor that is below 1 where the condition is missed, nan where that is not known.

        ``among``: points that need an answer; it may say anything about the others.
        """

    def judge(self, run: SideRun, points: Points, among: Mask) -> tuple[Mask, Array]:
        """Return where the condition is not missed (an unknown is no failure), and the margin."""
        margin = np.broadcast_to(self.margin(run, points, among), points.energy.shape)
        return ~(margin < 1.0), margin

    def __call__(self, run: SideRun, points: Points, among: Mask) -> Mask:
        """Return where the condition is not missed."""
        return self.judge(run, points, among)[0]


@dataclass(frozen=True)
class All(Condition):
    """Conditions that must hold together, cheap ones first."""

    parts: tuple[Condition, ...] = ()

    def margin(self, run: SideRun, points: Points, among: Mask) -> Array:
        """Return the smallest margin; what is unknown does not count."""
        worst = np.full(points.energy.shape, np.inf)
        for part in self.parts:
            worst = np.fmin(worst, part.margin(run, points, among))
        return worst

    def judge(self, run: SideRun, points: Points, among: Mask) -> tuple[Mask, Array]:
        """Return where all hold, among the points asked about; each is asked only where those before it hold."""
        mask, worst = among, np.full(points.energy.shape, np.inf)
        for part in self.parts:
            holds, margin = part.judge(run, points, mask)
            worst = np.where(mask, np.fmin(worst, margin), worst)
            mask = mask & holds
        return mask, worst

    @classmethod
    def of(cls, *conditions: Condition) -> All:
        """Join conditions; those that are joined already are taken apart."""
        parts: list[Condition] = []
        for condition in conditions:
            parts += condition.parts if isinstance(condition, All) else (condition,)
        return cls(tuple(parts))


class SideRun:
    """A side with its grids, each computed once.

    Parameters
    ----------
    problem : SideProblem
        As ``build_side`` makes it.
    pair : NodePair
    alter : callable, optional
        Makes another side of it, here and in every part of it: what would be if a term of it were perfect.
    """

    def __init__(self, problem: SideProblem, pair: NodePair, alter: Alteration | None = None) -> None:
        self.problem = problem if alter is None else alter(problem)
        self.pair = pair
        self.alter = alter
        self._grids: dict[Choice, Points] = {}

    @property
    def combinations(self) -> list[Choice]:
        """Everything that may be chosen besides the supply."""
        return self.problem.side.choices

    def grid(self, combination: Choice) -> Points:
        """Design points over the supply grid."""
        if combination not in self._grids:
            self._grids[combination] = design_points(self.problem, supply_grid(self.problem), *combination)
        return self._grids[combination]

    def declared(self) -> Points:
        """Points at each row's declared supply, first frozen choice."""
        return design_points(self.problem, self.problem.declared_supply[:, 0, :], *self.combinations[0])

    def subset(self, rows: NDArray[np.intp]) -> SideRun:
        """The same side for some rows only; what is known of them is kept."""
        problem = self.problem
        smaller = build_side(problem.study, problem.side, problem.role, self.pair, problem.batch.take(rows))
        made = SideRun(smaller, self.pair, self.alter)
        if problem.batch.rows > 1:
            made._grids = {choice: _points_of(points, rows) for choice, points in self._grids.items()}
        return made


def supply_grid(problem: SideProblem) -> Array:
    """Return the supplies searched, (1 or row, supply): evenly spaced, with the declared supply among them."""
    low, high = problem.side.supply
    grid = np.linspace(low, high, problem.study.supply_points)[None, :] if high > low else np.array([[low]])
    declared = problem.declared_supply[:, 0, :]
    inside = np.isfinite(declared) & (declared >= low) & (declared <= high)
    if not inside.any():
        return grid
    rows = declared.shape[0]
    declared = np.where(inside, declared, low)
    return np.asarray(np.sort(np.concatenate([np.broadcast_to(grid, (rows, grid.shape[1])), declared], axis=1), axis=1))


def _take(points: Points, column: NDArray[np.intp]) -> Points:
    """Pick supplies row by row, (row,) or (row, k); every (row, supply) array becomes (row, 1) or (row, k)."""
    shape = points.energy.shape
    columns = column.reshape(shape[0], -1)

    def pick(value: Any) -> Any:
        if isinstance(value, np.ndarray) and value.shape == shape:
            return np.take_along_axis(value, columns, axis=1)
        if isinstance(value, Mapping):
            return {key: pick(item) for key, item in value.items()}
        return value

    changes = {item.name: pick(getattr(points, item.name)) for item in fields(points)}
    return dataclasses.replace(points, **changes)


def take_rows(optimum: Optimum, rows: NDArray[np.intp]) -> Optimum:
    """Return some rows of an optimum."""
    return Optimum(
        _points_of(optimum.points, rows), *(getattr(optimum, item.name)[rows] for item in fields(optimum)[1:])
    )


def _points_of(points: Points, rows: NDArray[np.intp]) -> Points:
    """Return some rows of design points."""
    size = points.energy.shape[0]

    def pick(value: Any) -> Any:
        if isinstance(value, np.ndarray):
            return value[rows] if value.ndim and value.shape[0] == size else value
        if isinstance(value, Mapping):
            return {key: pick(item) for key, item in value.items()}
        return tuple(pick(item) for item in value) if isinstance(value, tuple) else value

    return dataclasses.replace(points, **{item.name: pick(getattr(points, item.name)) for item in fields(points)})


def least(run: SideRun, choice: Choice, objective: Objective) -> Array:
    """Return what the least value over a few supplies of the grid cannot be below, (row,), whatever conditions say.

    At the highest temperature alone: another one may make the path slower, which can only cost more energy and time.
    Infinite where no point has a value.
    """
    hot = dataclasses.replace(run.problem.study, temperatures=run.problem.study.temperatures[-1:])
    problem = dataclasses.replace(run.problem, study=hot)
    supply = supply_grid(problem)
    some = np.unique(np.append(np.arange(0, supply.shape[1], SPARSE), supply.shape[1] - 1))
    points = design_points(problem, supply[:, some], *choice)
    return np.asarray(np.where(points.able, objective(problem, points), np.inf).min(axis=1))


def nowhere(run: SideRun, choice: Choice) -> Optimum:
    """Return an optimum without a permitted point in any row; its points only fill the place."""
    low = np.array([[run.problem.side.supply[0]]])
    points = design_points(run.problem, low, *choice)
    no = np.zeros(points.energy.shape[0], dtype=bool)
    return Optimum(points, np.full(no.shape, np.inf), no, no, no, no)


def same_silicon(run: SideRun, frozen: Choice | None) -> list[Choice]:
    """Return the choices that keep the frozen parts of one; all when none is given."""
    return [choice for choice in run.combinations if frozen is None or choice.frozen == frozen.frozen]


def take_columns(points: Points, columns: NDArray[np.intp]) -> Points:
    """Return the points at some of the supplies, the same for every row."""
    shape = points.energy.shape

    def pick(value: Any) -> Any:
        if isinstance(value, np.ndarray) and value.shape == shape:
            return value[:, columns]
        if isinstance(value, Mapping):
            return {key: pick(item) for key, item in value.items()}
        return value

    return dataclasses.replace(points, **{item.name: pick(getattr(points, item.name)) for item in fields(points)})


def _best(objective: Array, mask: Mask) -> tuple[NDArray[np.intp], Array]:
    score = np.where(mask, objective, np.inf)
    column = np.argmin(score, axis=1)
    return column, np.take_along_axis(score, column[:, None], axis=1)[:, 0]


def _merge(first: Points, second: Points, use_second: Mask) -> Points:
    """Take rows of ``second`` where asked; both have one supply per row."""
    shape = first.energy.shape

    def pick(a: Any, b: Any) -> Any:
        if isinstance(a, np.ndarray) and a.shape == shape:
            return np.where(use_second[:, None], np.broadcast_to(b, shape), a)
        if isinstance(a, Mapping):
            everywhere = (
                np.zeros(shape, dtype=bool)
                if any(v.dtype == bool for v in (*a.values(), *b.values()) if isinstance(v, np.ndarray))
                else None
            )
            keys = dict.fromkeys([*a, *b])
            return {key: pick(a.get(key, everywhere), b.get(key, everywhere)) for key in keys}
        return a

    changes = {item.name: pick(getattr(first, item.name), getattr(second, item.name)) for item in fields(first)}
    return dataclasses.replace(first, **changes)


def _bracket(centre: Array, reach: float | Array, ends: tuple[float, float]) -> tuple[Array, Array]:
    """Interval around a supply, inside the range searched."""
    return np.asarray(np.maximum(centre - reach, ends[0])), np.asarray(np.minimum(centre + reach, ends[1]))


def _best_on_grid(
    run: SideRun, grid: Points, objective: Objective, cheap: Condition, costly: Condition | None
) -> tuple[NDArray[np.intp], Array]:
    """Best permitted supply of the grid for every row; the costly condition is asked of the best supplies first."""
    score = objective(run.problem, grid)
    open_to = grid.able & cheap(run, grid, grid.able)
    column, value = _best(score, open_to)
    if costly is None:
        return column, value
    together = max(1, ASKED_TOGETHER // score.shape[0])
    permitted = np.zeros(score.shape, dtype=bool)
    while (unsettled := np.isfinite(value) & ~np.take_along_axis(permitted, column[:, None], axis=1)[:, 0]).any():
        order = np.argsort(np.where(open_to & ~permitted, score, np.inf), axis=1, kind="stable")[:, :together]
        wanted = np.take_along_axis(open_to, order, axis=1) & unsettled[:, None]
        answer = costly(run, _take(grid, order), wanted) & wanted
        np.put_along_axis(permitted, order, answer, axis=1)
        refused = np.zeros(score.shape, dtype=bool)
        np.put_along_axis(refused, order, wanted & ~answer, axis=1)
        open_to &= ~refused
        column, value = _best(score, open_to)
    return column, value


def _search(
    run: SideRun,
    combination: Choice,
    objective: Objective,
    cheap: Condition,
    costly: Condition | None = None,
) -> Optimum:
    """Grid, then zoom. What a row gets does not depend on the other rows of the batch."""
    problem = run.problem
    grid = run.grid(combination)
    ends = problem.side.supply
    condition = cheap if costly is None else All.of(cheap, costly)
    column, value = _best_on_grid(run, grid, objective, cheap, costly)
    best = _take(grid, column)
    step = (ends[1] - ends[0]) / max(problem.study.supply_points - 1, 1)
    no = np.zeros(value.shape, dtype=bool)
    start = Optimum(best, value, np.isfinite(value), no, no, no)
    if step > 0.0:
        start = _between(run, combination, objective, cheap, condition, start)
        if not start.found.all():
            start = _feasible(run, combination, objective, condition, start)
    margin = cheap.judge(run, start.points, start.points.able)[1][:, 0]
    # the step of the grid, not its neighbours: a declared supply may lie beside a point of the grid, or on it
    near = Near.around(start.points.supply[:, 0], start.value, margin, step, ends)
    return _zoom(run, combination, objective, condition, start, near, near.first())


def _zoom(
    run: SideRun,
    combination: Choice,
    objective: Objective,
    condition: Condition,
    best: Optimum,
    near: Near,
    fine: Array,
) -> Optimum:
    """Refine the best points of a grid, round by round; the rows that take longer go on alone."""
    problem, points, value = run.problem, best.points, best.value
    ends = problem.side.supply

    def open_rows() -> Mask:
        return np.isfinite(value) & (near.width > problem.study.refine_relative * near.top)

    active = open_rows()
    rows = np.zeros(0, dtype=np.intp)
    while active.any() and not rows.size:
        found = design_points(problem, fine, *combination)
        score = objective(problem, found)
        # only points that would improve on the best so far need to be judged
        candidates = found.able & (score < value[:, None])
        permitted, margins = condition.judge(run, found, candidates)
        seen = Seen(fine, np.where(found.able, score, np.inf), candidates & permitted, margins)
        narrower, place = near.narrowed(seen)
        better = active & (place >= 0)
        if better.any():
            points = _merge(points, _take(found, np.maximum(place, 0)), better)
            value = np.where(better, narrower.seen.score[:, 1], value)
        near = near.where(active, narrower)
        active, fine = open_rows(), near.following(ends)
        rows = np.flatnonzero(active) if ALONE * np.count_nonzero(active) < active.size else rows
    known = np.isfinite(value)
    supply = points.supply[:, 0]
    at_lower = known & (supply <= ends[0] * (1.0 + ON_BOUND)) & (ends[1] > ends[0])
    at_upper = known & (supply >= ends[1] * (1.0 - ON_BOUND)) & (ends[1] > ends[0])
    whole = Optimum(points, value, known, at_lower, at_upper, known & near.at_limit & ~at_lower & ~at_upper)
    if not rows.size:
        return whole
    rest = _zoom(
        run.subset(rows), combination, objective, condition, take_rows(whole, rows), near.rows(rows), fine[rows]
    )
    return put_rows(whole, rest, rows)


def _between(
    run: SideRun, combination: Choice, objective: Objective, cheap: Condition, condition: Condition, start: Optimum
) -> Optimum:
    """Look where the grid steps over a window of permitted supplies that would be better than what it found."""
    grid = run.grid(combination)
    hidden = hidden_windows([part.margin(run, grid, grid.able) for part in All.of(cheap).parts], grid.able)
    score = objective(run.problem, grid)
    cost = np.fmin(score[:, :-1], score[:, 1:])
    while True:
        interval, least = _best(cost, hidden & (cost < start.value[:, None]))
        rows = np.flatnonzero(np.isfinite(least))
        if not rows.size:
            return start
        place = interval[rows]
        hidden[rows, place] = False
        part = run.subset(rows)
        found = _window(part, combination, condition, grid.supply[rows, place], grid.supply[rows, place + 1])
        start = _with_better(start, found, rows, objective(part.problem, found.points)[:, 0])


def _with_better(start: Optimum, found: Optimum, rows: NDArray[np.intp], value: Array) -> Optimum:
    """Take the points found in some rows where they are better; ``value`` is theirs."""
    keep = np.flatnonzero(found.found & (value < start.value[rows]))
    if not keep.size:
        return start
    return put_rows(start, take_rows(dataclasses.replace(found, value=value), keep), rows[keep])


def _feasible(run: SideRun, combination: Choice, objective: Objective, condition: Condition, start: Optimum) -> Optimum:
    """Look around the point of the grid with the largest margin for a permitted supply, where the grid has none."""
    rows = np.flatnonzero(~start.found)
    part = run.subset(rows)
    grid = part.grid(combination)
    column, short = _best(_short(part, grid, condition), np.ones(grid.energy.shape, dtype=bool))
    ends = run.problem.side.supply
    step = (ends[1] - ends[0]) / max(run.problem.study.supply_points - 1, 1)
    low, high = _bracket(np.take_along_axis(grid.supply, column[:, None], axis=1)[:, 0], step, ends)
    found = _window(part, combination, condition, low, high, wanted=np.isfinite(short))
    return _with_better(start, found, rows, objective(part.problem, found.points)[:, 0])


def _short(run: SideRun, points: Points, condition: Condition) -> Array:
    """Return the negative of the smallest margin; infinite where the numbers mean nothing."""
    return np.where(points.able, -np.fmin(condition.margin(run, points, points.able), np.finfo(float).max), np.inf)


def _window(
    run: SideRun, combination: Choice, condition: Condition, low: Array, high: Array, wanted: Mask | None = None
) -> Optimum:
    """Look for a permitted supply between two supplies.

    The smallest margin of all conditions is made as large as it goes, by zooming: a window of permitted supplies,
    however narrow, holds the supply at which it is largest, if the margins have one peak there.
    """
    problem, ends = run.problem, run.problem.side.supply
    best, value = nowhere(run, combination).points, np.full(low.shape, np.inf)
    found = np.zeros(low.shape, dtype=bool)
    active = np.ones(low.shape, dtype=bool) if wanted is None else wanted
    while active.any():
        fine = low[:, None] + (high - low)[:, None] * np.linspace(0.0, 1.0, WINDOW_POINTS)
        points = design_points(problem, fine, *combination)
        column, fine_value = _best(_short(run, points, condition), np.ones(fine.shape, dtype=bool))
        better = active & (fine_value < value)
        if better.any():
            best = _merge(best, _take(points, column), better)
            value = np.where(better, fine_value, value)
        asked = (active & (value <= -1.0))[:, None]
        found |= (asked & best.able & condition(run, best, asked))[:, 0]
        near = _bracket(best.supply[:, 0], (high - low) / (WINDOW_POINTS - 1), ends)
        low, high = np.where(active, near[0], low), np.where(active, near[1], high)
        active &= ~found & np.isfinite(value) & (high - low > problem.study.refine_relative * high)
    no = np.zeros(found.shape, dtype=bool)
    return Optimum(best, np.where(found, value, np.inf), found, no, no, no)


def minimise(
    run: SideRun,
    objective: Objective,
    cheap: Condition,
    costly: Condition | None = None,
    frozen: Choice | None = None,
) -> Optimum:
    """Return the best feasible point of every row.

    Parameters
    ----------
    run : SideRun
    objective : callable
        (problem, points) -> array (row, supply) to be made small.
    cheap, costly : callable
        Conditions; ``costly`` is asked about as few points as possible.
    frozen : Choice, optional
        Choice whose frozen parts are kept; by default those that are best for row 0. What may be chosen at run time is
        chosen row by row.
    """
    combinations = same_silicon(run, frozen)
    candidates: dict[tuple[float, ...], Optimum] = {}
    for combination in combinations:
        found = _with_costly(run, combination, objective, cheap, costly)
        key = combination.frozen
        candidates[key] = _better_of(candidates[key], found) if key in candidates else found
    return min(candidates.values(), key=lambda optimum: float(optimum.value[0]))


def _better_of(first: Optimum, second: Optimum) -> Optimum:
    """Take the better of two run-time choices, row by row."""
    use = second.value < first.value
    chosen = [
        np.where(use, getattr(second, name), getattr(first, name))
        for name in ("value", "found", "at_lower", "at_upper", "at_limit")
    ]
    return Optimum(_merge(first.points, second.points, use), *chosen)


def _with_costly(
    run: SideRun, combination: Choice, objective: Objective, cheap: Condition, costly: Condition | None
) -> Optimum:
    optimum = _search(run, combination, objective, cheap)
    return optimum if costly is None else hold_to(run, combination, objective, cheap, costly, optimum)


def hold_to(
    run: SideRun,
    combination: Choice,
    objective: Objective,
    cheap: Condition,
    costly: Condition,
    optimum: Optimum,
) -> Optimum:
    """Return the optimum of the points that meet a costly condition too, from the optimum without it."""
    if not optimum.found.any():
        return optimum
    allowed = costly(run, optimum.points, optimum.found[:, None])[:, 0] | ~optimum.found
    if allowed.all():
        return optimum
    rows = np.flatnonzero(~allowed)
    smaller = run.subset(rows)
    again = _search(smaller, combination, objective, cheap, costly)
    return put_rows(optimum, again, rows)


def put_rows(whole: Optimum, part: Optimum, rows: NDArray[np.intp]) -> Optimum:
    """Write the rows of a subset back."""
    size = whole.value.shape[0]

    def widen(array: Any) -> Any:
        wide = np.zeros((size, *array.shape[1:]), dtype=array.dtype)
        wide[rows] = array
        return wide

    def grow(value: Any) -> Any:
        if isinstance(value, np.ndarray) and value.ndim and value.shape[0] == len(rows):
            return widen(value)
        if isinstance(value, Mapping):
            return {key: grow(item) for key, item in value.items()}
        return value

    changes = {
        item.name: grow(getattr(part.points, item.name))
        for item in fields(part.points)
        if item.name not in ("capability", "size", "threshold_shift", "efficiency", "shifter")
    }
    use = np.zeros(size, dtype=bool)
    use[rows] = True
    merged = _merge(whole.points, dataclasses.replace(whole.points, **changes), use)

    def choose(a: Any, b: Any) -> Any:
        result = a.copy()
        result[rows] = b
        return result

    return Optimum(
        merged,
        choose(whole.value, part.value),
        choose(whole.found, part.found),
        choose(whole.at_lower, part.at_lower),
        choose(whole.at_upper, part.at_upper),
        choose(whole.at_limit, part.at_limit),
    )
