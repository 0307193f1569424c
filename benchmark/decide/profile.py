"""Where the advantage crosses a level along a line of trial values (layer 7).

A line moves one axis while other axes are held. It is scanned on a grid; between neighbours that both have an advantage
every change of side is bracketed and solved (scipy.optimize.elementwise), all lines together. Where the advantage jumps
instead of crossing, because a side loses its last permitted point, that is a jump and no root. Between a grid point
with and one without an advantage the edge is found by halving, and the stretch up to it is searched too.

Where the advantage turns between grid points near a level, the turning point is looked for, so that two crossings close
to each other are seen. Narrower features that no grid point shows are not seen.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from benchmark.decide.axes import Axis
from benchmark.decide.trials import Answers, Trials

__all__ = [
    "Crossing",
    "Edge",
    "LabelChange",
    "Line",
    "Profile",
    "Shares",
    "find_shares",
    "label_changes",
    "profiles",
    "shares_on_side",
]

Array = NDArray[np.float64]
#: ln(advantage) that stands for "none" or "infinite" in the search
FAR = 700.0
#: a root is converged when ln(advantage) is this close to the level
CLOSE = 1.0e-13
#: more than this beside the level at the converged place is a jump, not a root
JUMP = 1.0e-6
#: relative width to which an edge is found
EDGE = 1.0e-6
#: relative distance at which both sides of a jump are looked at
ASIDE = 1.0e-8
#: halvings of a bracket, at most
MOST = 100
#: rows that cost about as much as the call that evaluates them, and places looked at in one step towards an edge
ROWS_FOR_A_CALL, MOST_INNER = 20, 7
#: steps towards a turning point, at most
TURN_STEPS = 16


@dataclass(frozen=True)
class Line:
    """One axis moved, the others held at numbers of their own."""

    axis: Axis
    held: Mapping[Axis, float] = field(default_factory=dict)

    def trial(self, x: float) -> dict[str, float]:
        """Return the trial at one value of the axis."""
        found: dict[str, float] = {}
        # twice: what an axis places may depend on another one (a share of the time on the clock), in either order
        for axis, value in (*self.held.items(), (self.axis, x)) * 2:
            found |= axis.place(float(value), found)
        return found

    def between(self, low: float, high: float, share: float) -> float:
        """Return the value a share of the way between two, on the scale of the axis."""
        if share in (0.0, 1.0):
            return high if share else low
        if self.axis.logarithmic and low > 0.0:
            return float(low * (high / low) ** share)
        return float(low + (high - low) * share)


@dataclass(frozen=True)
class Crossing:
    """A value at which the advantage meets a level.

    ``kind`` is "root", or "jump" when the advantage jumps over the level there; ``above_below``: the advantage is above
    the level on the lower side of the value. ``meets``: no listed requirement is missed there.
    """

    x: float
    level: float
    kind: str
    above_below: bool
    advantage: float
    meets: bool
    why: str = ""


@dataclass(frozen=True)
class Edge:
    """A value beyond which there is no advantage: a side has no permitted point."""

    x: float
    defined_below: bool
    advantage: float
    why: str


@dataclass(frozen=True)
class Profile:
    """The scan of one line, edges put in, with its crossings and edges in the order of the axis.

    ``states``: who has no permitted point at each value, empty where there is an advantage.
    """

    line: Line
    x: Array
    advantage: Array
    meets: NDArray[np.bool_]
    states: tuple[str, ...]
    crossings: tuple[Crossing, ...]
    edges: tuple[Edge, ...]

    def crossings_of(self, level: float) -> list[Crossing]:
        """Return the crossings of one level."""
        return [crossing for crossing in self.crossings if crossing.level == level]

    @property
    def defined(self) -> Array:
        """Return the advantages there are."""
        return np.asarray(self.advantage[~np.isnan(self.advantage)])


@dataclass(frozen=True)
class _Bracket:
    """Two neighbouring values of a line, with a level between their advantages."""

    line: int
    low: float
    high: float
    level: float
    above_below: bool


def profiles(
    trials: Trials, lines: Sequence[Line], levels: Sequence[float], count: int = 17, *, name_edges: bool = True
) -> list[Profile]:
    """Scan lines and find every crossing of the levels, all lines at once.

    Parameters
    ----------
    trials : Trials
    lines : sequence of Line
    levels : sequence of float
        Advantages above 0.
    count : int
        Grid points per line.
    name_edges : bool
        Say why a side has no permitted point beyond an edge (one more evaluation each).
    """
    if not lines:
        return []
    grids = [line.axis.grid(count) for line in lines]
    flat = [line.trial(x) for line, grid in zip(lines, grids, strict=True) for x in grid]
    answers = trials(flat)
    ends = np.cumsum([0, *map(len, grids)])
    edges = _edges(trials, lines, grids, answers, ends, name_edges)
    scans = []
    for i, grid in enumerate(grids):
        rows = slice(int(ends[i]), int(ends[i + 1]))
        scans.append(_with_edges(grid, answers, rows, edges[i]))
    scans = _with_turns(trials, lines, scans, levels)
    crossings = _crossings(trials, lines, scans, levels)
    return [
        Profile(line, *scan, tuple(sorted(found, key=lambda c: (c.x, c.level))), tuple(edge))
        for line, scan, found, edge in zip(lines, scans, crossings, edges, strict=True)
    ]


_Scan = tuple[Array, Array, NDArray[np.bool_], tuple[str, ...]]


def _with_edges(grid: Array, answers: Answers, rows: slice, edges: Sequence[Edge]) -> _Scan:
    states = [answers.state(row) for row in range(rows.start, rows.stop)]
    x = np.concatenate([grid, [edge.x for edge in edges]])
    advantage = np.concatenate([answers.advantage[rows], [edge.advantage for edge in edges]])
    meets = np.concatenate([answers.meets[rows], np.ones(len(edges), dtype=bool)])
    order = np.argsort(x, kind="stable")
    texts = [*states, *[""] * len(edges)]
    return x[order], advantage[order], meets[order], tuple(texts[position] for position in order)


def _edges(
    trials: Trials,
    lines: Sequence[Line],
    grids: Sequence[Array],
    answers: Answers,
    ends: NDArray[np.int64],
    name_edges: bool,
) -> list[list[Edge]]:
    """Narrow every step between a value with and one without an advantage, all at once."""
    listed: list[tuple[int, float, float]] = []  # line, value with an advantage, value without
    for i, grid in enumerate(grids):
        has = ~np.isnan(answers.advantage[ends[i] : ends[i + 1]])
        for k in np.flatnonzero(has[1:] != has[:-1]):
            ends_at = (k, k + 1) if has[k] else (k + 1, k)
            listed.append((i, float(grid[ends_at[0]]), float(grid[ends_at[1]])))
    found: list[list[Edge]] = [[] for _ in lines]
    if not listed:
        return found
    inside = np.array([item[1] for item in listed])
    outside = np.array([item[2] for item in listed])
    advantage = np.full(inside.shape, np.nan)
    for _ in range(MOST):
        wide = np.flatnonzero(np.abs(outside - inside) > EDGE * np.maximum(np.abs(inside), np.abs(outside)))
        if not wide.size:
            break
        # several places at once where few edges are left: a call costs more than a row
        shares = np.linspace(0.0, 1.0, min(max(ROWS_FOR_A_CALL // wide.size, 1), MOST_INNER) + 2)[1:-1]
        tried_x = np.array([[lines[listed[k][0]].between(inside[k], outside[k], s) for s in shares] for k in wide])
        tried = trials([lines[listed[k][0]].trial(x) for k, row in zip(wide, tried_x, strict=True) for x in row])
        found_at = tried.advantage.reshape(tried_x.shape)
        for k, x, at in zip(wide, tried_x, found_at, strict=True):
            missing = np.flatnonzero(np.isnan(at))
            first = int(missing[0]) if missing.size else at.size
            if first > 0:
                inside[k], advantage[k] = x[first - 1], at[first - 1]
            if first < at.size:
                outside[k] = x[first]
    for position, (i, start, _) in enumerate(listed):
        x, beyond, at = float(inside[position]), float(outside[position]), float(advantage[position])
        if np.isnan(at):  # the grid point itself is the last one inside
            at = float(answers.advantage[int(ends[i] + np.flatnonzero(grids[i] == start)[0])])
        why = trials.why(lines[i].trial(beyond)) if name_edges else ""
        found[i].append(Edge(x, x < beyond, at, why))
    return [sorted(edges, key=lambda edge: edge.x) for edges in found]


@dataclass
class _Turn:
    """Three neighbouring values around a turning point, in ln(advantage); ``sign`` 1: a maximum, -1: a minimum."""

    line: int
    level: float
    sign: float
    x: tuple[float, float, float]
    y: tuple[float, float, float]

    @property
    def beyond(self) -> bool:
        """Tell whether the middle lies on the other side of the level already."""
        return self.sign * (self.y[1] - self.level) > 0.0

    @property
    def hopeful(self) -> bool:
        """Tell whether the level is nearer to the middle than the outer values are."""
        drop = max(self.sign * (self.y[1] - self.y[0]), self.sign * (self.y[1] - self.y[2]))
        return not self.beyond and 0.0 <= self.sign * (self.level - self.y[1]) <= drop

    def narrowed(self, x: tuple[float, float], y: tuple[float, float]) -> _Turn:
        """Return the half of the bracket that holds the turning point, from the values at both middles."""
        best = int(np.argmax([self.sign * y[0], self.sign * self.y[1], self.sign * y[1]]))
        xs, ys = (self.x[0], x[0], self.x[1], x[1], self.x[2]), (self.y[0], y[0], self.y[1], y[1], self.y[2])
        return _Turn(self.line, self.level, self.sign, xs[best : best + 3], ys[best : best + 3])  # type: ignore[arg-type]


def _with_turns(trials: Trials, lines: Sequence[Line], scans: Sequence[_Scan], levels: Sequence[float]) -> list[_Scan]:
    """Put in turning points that reach over a level between two grid points on the same side of it."""
    turns = [turn for i, scan in enumerate(scans) for level in dict.fromkeys(levels) for turn in _turns(i, scan, level)]
    reached: list[_Turn] = []
    for _ in range(TURN_STEPS):
        if not turns:
            break
        middles = [tuple(lines[turn.line].between(turn.x[k], turn.x[k + 1], 0.5) for k in (0, 1)) for turn in turns]
        found = trials([lines[turn.line].trial(x) for turn, pair in zip(turns, middles, strict=True) for x in pair])
        values = found.log.reshape(-1, 2)
        narrowed = [
            turn.narrowed((pair[0], pair[1]), (float(y[0]), float(y[1])))
            for turn, pair, y in zip(turns, middles, values, strict=True)
            if np.isfinite(y).all()
        ]
        reached += [turn for turn in narrowed if turn.beyond]
        turns = [turn for turn in narrowed if turn.hopeful]
    listed = list(scans)
    for turn in reached:
        x, advantage, meets, states = listed[turn.line]
        k = int(np.searchsorted(x, turn.x[1]))
        listed[turn.line] = (
            np.insert(x, k, turn.x[1]),
            np.insert(advantage, k, np.exp(turn.y[1])),
            np.insert(meets, k, meets[max(k - 1, 0)]),
            (*states[:k], "", *states[k:]),
        )
    return listed


def _turns(line: int, scan: _Scan, level: float) -> list[_Turn]:
    x, advantage = scan[0], scan[1]
    with np.errstate(divide="ignore", invalid="ignore"):
        y = np.log(advantage)
    found = []
    for k in range(1, len(x) - 1):
        if not np.isfinite(y[k - 1 : k + 2]).all():
            continue
        for sign in (1.0, -1.0):
            turn = _Turn(line, float(np.log(level)), sign, tuple(x[k - 1 : k + 2]), tuple(y[k - 1 : k + 2]))
            if min(sign * (turn.y[1] - turn.y[0]), sign * (turn.y[1] - turn.y[2])) >= 0.0 and turn.hopeful:
                found.append(turn)
    return found


def _above(advantage: Array, level: float) -> NDArray[np.bool_]:
    return np.asarray(advantage >= level)


def _crossings(
    trials: Trials, lines: Sequence[Line], scans: Sequence[_Scan], levels: Sequence[float]
) -> list[list[Crossing]]:
    brackets: list[_Bracket] = []
    for i, (x, advantage, _, _) in enumerate(scans):
        for level in dict.fromkeys(levels):
            above = _above(advantage, level)
            both = ~np.isnan(advantage[1:]) & ~np.isnan(advantage[:-1]) & (x[1:] > x[:-1])
            brackets += [
                _Bracket(i, float(x[k]), float(x[k + 1]), level, bool(above[k]))
                for k in np.flatnonzero(both & (above[1:] != above[:-1]))
            ]
    found: list[list[Crossing]] = [[] for _ in lines]
    if not brackets:
        return found
    share = _solve(trials, lines, brackets)
    met = [lines[b.line].between(b.low, b.high, float(s)) for b, s in zip(brackets, share, strict=True)]
    # held against every contender in full, where the search evaluates the strongest alone
    answers = trials.whole([lines[b.line].trial(value) for b, value in zip(brackets, met, strict=True)])
    for k, bracket in enumerate(brackets):
        off = float(answers.log[k]) - float(np.log(bracket.level))
        root = abs(off) <= JUMP
        why = "" if root else _jump(trials, lines[bracket.line], met[k])
        found[bracket.line].append(
            Crossing(
                met[k],
                bracket.level,
                "root" if root else "jump",
                bracket.above_below,
                float(answers.advantage[k]),
                bool(answers.meets[k]),
                why,
            )
        )
    return found


def _solve(trials: Trials, lines: Sequence[Line], brackets: Sequence[_Bracket]) -> Array:
    """Return the share of the way through each bracket at which the level is met."""
    level = np.log(np.array([bracket.level for bracket in brackets]))

    def difference(share: Array, which: NDArray[np.intp]) -> Array:
        rows = []
        for s, i in zip(share, which, strict=True):
            line = lines[brackets[i].line]
            rows.append(line.trial(line.between(brackets[i].low, brackets[i].high, float(s))))
        return np.asarray(trials(rows).log - level[which])

    return find_shares(difference, len(brackets)).x


@dataclass(frozen=True)
class Shares:
    """Solutions of ``find_shares``: ``x``, and the shares just before and just after it with their function values."""

    x: Array
    bracket: tuple[Array, Array]
    at_bracket: tuple[Array, Array]


def find_shares(
    difference: Callable[[Array, NDArray[np.intp]], Array], count: int, *, xtol: float = 1e-16, ftol: float = CLOSE
) -> Shares:
    """Solve ``difference(share, which) = 0`` for ``count`` problems at once, each between the shares 0 and 1.

    Parameters
    ----------
    difference : callable
        Of shares and the numbers of the problems they belong to, both (n,). What is not a number counts as far below 0.
    count : int
        Problems; the signs at 0 and 1 must differ in each.
    xtol, ftol : float
        Absolute tolerances of the share and of the function.
    """
    from scipy.optimize import elementwise

    def wide(share: Array, index: NDArray[np.int64]) -> Array:
        share, index = np.broadcast_arrays(share, index)
        found = difference(share.ravel(), index.ravel().astype(np.intp))
        return np.asarray(np.nan_to_num(found, nan=-FAR, posinf=FAR, neginf=-FAR)).reshape(share.shape)

    result = elementwise.find_root(
        wide,
        (np.zeros(count), np.ones(count)),
        args=(np.arange(count),),
        tolerances={"xatol": xtol, "xrtol": 1e-15, "fatol": ftol, "frtol": 0.0},
        maxiter=MOST,
    )
    return Shares(np.asarray(result.x, dtype=np.float64), tuple(result.bracket), tuple(result.f_bracket))


def shares_on_side(
    difference: Callable[[Array, NDArray[np.intp]], Array], count: int, above: bool, *, xtol: float
) -> Array:
    """Return the shares next to the solutions of ``find_shares`` at which the function is, or is not, below 0.

    Parameters
    ----------
    difference, count
        As in ``find_shares``.
    above : bool
        Whether 0 and more is wanted, or less.
    xtol : float
        How near to the solution [share].
    """
    solved = find_shares(difference, count, xtol=xtol, ftol=0.0)
    shares = np.where((solved.at_bracket[1] >= 0.0) == above, solved.bracket[1], solved.bracket[0])
    # a 0 met exactly ends the search while the bracket is wide: the wanted side begins right beside that place
    beside = solved.x + np.sign(shares - solved.x) * xtol
    return np.asarray(np.where(np.abs(shares - solved.x) > xtol, beside, shares))


def _jump(trials: Trials, line: Line, x: float) -> str:
    """Say what differs just below and just above a jump."""
    step = max(abs(x), np.finfo(float).tiny) * ASIDE
    answers = trials.whole([line.trial(x - step), line.trial(x + step)])
    texts = []
    for position, name in enumerate(answers.names):
        below, above = (bool(has) for has in answers.contenders[position])
        if below != above:
            texts.append(f"{name} has a permitted point only {'below' if below else 'above'}")
    ends = " to ".join(f"{value:.4g}" for value in answers.advantage)
    return f"the advantage jumps from {ends}" + (f": {', '.join(texts)}" if texts else "")


@dataclass(frozen=True)
class LabelChange:
    """A value at which what limits the candidate changes: ``of`` is "delay" or "energy"."""

    x: float
    of: str
    below: str
    above: str


def label_changes(trials: Trials, line: Line, count: int = 17) -> list[LabelChange]:
    """Find where the largest share of the candidate's delay or energy passes from one term to another."""
    grid = line.axis.grid(count)
    answers = trials([line.trial(x) for x in grid])
    listed: list[tuple[str, float, float, str, str]] = []
    for of, shares in (("delay", answers.delay_shares), ("energy", answers.energy_shares)):
        names = list(shares)
        table = np.stack([shares[name] for name in names])
        known = np.asarray(np.isfinite(table).all(axis=0))
        largest = np.argmax(np.where(np.isfinite(table), table, -1.0), axis=0)
        listed += [
            (of, float(grid[k]), float(grid[k + 1]), names[largest[k]], names[largest[k + 1]])
            for k in np.flatnonzero(known[1:] & known[:-1] & (largest[1:] != largest[:-1]))
        ]
    if not listed:
        return []

    def difference(share: Array, which: NDArray[np.intp]) -> Array:
        found = trials(
            [line.trial(line.between(listed[i][1], listed[i][2], float(s))) for s, i in zip(share, which, strict=True)]
        )
        values = []
        for row, i in enumerate(which):
            of, _, _, below, above = listed[i]
            shares = found.delay_shares if of == "delay" else found.energy_shares
            values.append(float(shares[below][row] - shares[above][row]))
        return np.asarray(values)

    solved = find_shares(difference, len(listed), ftol=1e-14)
    return [
        LabelChange(line.between(low, high, float(share)), of, below, above)
        for (of, low, high, below, above), share in zip(listed, solved.x, strict=True)
    ]
