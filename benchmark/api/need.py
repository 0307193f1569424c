"""What would be needed: break-evens, required values, trade curves, maps, who must improve, what flips the answer."""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterable, Mapping, Sequence
from typing import TYPE_CHECKING, Any

from benchmark.api.needed import Needed, Range, Told, heading_of, level_of, ranged, trials_of
from benchmark.api.session import Place
from benchmark.api.views import StudyView
from benchmark.errors import UsageError

if TYPE_CHECKING:
    from benchmark.decide.trials import Trials

__all__ = ["Needed", "flips", "improve", "joint_sheet", "need", "opportunity", "sheet", "trade"]

REQUIRED_ADVANTAGE = "required_advantage"


def need(
    study: StudyView | Place,
    names: Iterable[str] = (),
    *,
    advantage: float | None = None,
    pair: str = "",
    over: Sequence[Range] = (),
    points: int = 17,
    told: Told | None = None,
) -> Needed:
    """Find where the advantage is 1 (break-even) and where it is the required one, axis by axis.

    Parameters
    ----------
    study : StudyView, str or Path
        A loaded study, or the file of one.
    names : iterable of str, optional
        Values by ledger key (``technology.name``) or by name; also ``temperature``, ``required_time``, ``deadline``,
        ``on_off_ratio``, ``awake_share``, ``required_advantage``. By default the usual axes of a workload.
    advantage : float, optional
        Level instead of the required advantage of the study.
    pair : str, optional
        Label of a node pair; by default the headline.
    over : sequence of (low, high), optional
        Ranges for the names, in order, in the units of the values.
    points : int
        Grid points on which each range is scanned before crossings are solved for.
    told : callable, optional
        Told how many comparisons have been made.

    Returns
    -------
    Needed
        One row per crossing.

    Raises
    ------
    UsageError
        For an unknown name, pair, range or level.
    """
    from benchmark.decide.axes import find_axis, usual_axes
    from benchmark.decide.break_even import find_needs
    from benchmark.decide.need_words import NEED_COLUMNS, need_rows, need_text

    view, trials = trials_of(study, pair, told)
    asked = list(names)
    level = level_of(view, advantage)
    axes = [find_axis(trials, name) for name in asked if name != REQUIRED_ADVANTAGE] if asked else usual_axes(trials)
    if over and REQUIRED_ADVANTAGE in asked:
        message = f"{REQUIRED_ADVANTAGE} takes no range; ask for it without one"
        raise UsageError(message)
    if points < 2:
        message = f"a scan needs at least 2 points, found {points}"
        raise UsageError(message)
    found = find_needs(trials.study, trials.pair, ranged(axes, over), (1.0, level), trials=trials, count=points)
    facts = []
    for axis, group in itertools.groupby(found, key=lambda item: item.axis):
        facts.append((axis.name, f"{axis.meaning}, today {axis.text(axis.best)}. {need_text(*group)}"))
    rows = need_rows(found)
    if not asked or REQUIRED_ADVANTAGE in asked:
        text, row = _required_advantage(trials, level)
        facts.append((REQUIRED_ADVANTAGE, text))
        rows.append({column: row.get(column, "") for column in NEED_COLUMNS})
    return Needed(heading_of(view, trials), tuple(facts), NEED_COLUMNS, tuple(rows))


def _required_advantage(trials: Trials, level: float) -> tuple[str, dict[str, Any]]:
    """Where the answer changes with the required advantage itself: at the advantage there is."""
    today = float(trials.best.advantage[0])
    if math.isnan(today):
        text = f"no value of it is met: {trials.best.state(0)}"
    else:
        text = f"met up to {today:.4g} ({today / level:.4g} times the {level:.4g} asked for), missed above"
    row = {
        "name": REQUIRED_ADVANTAGE,
        "unit": "1",
        "today": level,
        "advantage_today": today,
        "level": today,
        "answer": "undefined" if math.isnan(today) else "crossings",
        "value": today,
        "factor": today / level,
        "difference": today - level,
        "standard_deviations": math.nan,
        "advantage_at_or_above_level": "below",
        "low": math.nan,
        "high": math.nan,
        "words": text,
    }
    return text, row


def trade(
    study: StudyView | Place,
    first: str,
    second: str,
    *,
    advantage: float | None = None,
    pair: str = "",
    over: Sequence[Range] = (),
    points: int = 17,
    told: Told | None = None,
) -> Needed:
    """Find the value of one parameter that each value of another asks for.

    Parameters
    ----------
    study : StudyView, str or Path
        A loaded study, or the file of one.
    first : str
        Name as in ``need`` of the value that is varied.
    second : str
        Name of the value that is solved for.
    advantage : float, optional
        Level instead of the required advantage of the study.
    pair : str, optional
        Label of a node pair; by default the headline.
    over : sequence of (low, high), optional
        Ranges for the names, in order, in the units of the values.
    points : int
        Grid points of each scan.
    told : callable, optional
        Told how many comparisons have been made.

    Returns
    -------
    Needed
        Rows ready for drawing; the first one is today's point, the last ones are draws of both values from their stated
        spreads, the rest at the best estimate.

    Raises
    ------
    UsageError
        For an unknown name, pair, range or level, or when both names move the same value.
    """
    from benchmark.decide.axes import find_axis
    from benchmark.decide.trade import TRADE_COLUMNS, trade_curve, trade_rows, trade_samples

    view, trials = trials_of(study, pair, told)
    level = level_of(view, advantage)
    one, other = ranged([find_axis(trials, first), find_axis(trials, second)], over)
    curve = trade_curve(trials, one, other, level, points, points)
    rows, samples = trade_rows(curve), trade_samples(trials, curve)
    facts = []
    for row in rows:
        place = f"{one.name} {row['first_value']:.4g} {one.unit}".removesuffix(" 1")
        if row["answer"] in ("root", "jump", "today"):
            words = f"{other.name} {row['second_value']:.4g} {other.unit}".removesuffix(" 1")
            words += f" ({row['answer']})" if row["answer"] != "root" else ""
            words += f", {level:.4g} or more {row['at_or_above_level']}" if row["at_or_above_level"] else ""
        else:
            words = {"always": "any value will do", "never": "no value will do"}.get(row["answer"], "no advantage")
        facts.append((place, words + (f"; cut {row['cut_by']}" if row["cut_by"] else "")))
    if samples:
        reaching = sum(row["advantage"] >= level and row["meets_requirements"] == "yes" for row in samples)
        facts.append((f"draws of {one.name} and {other.name}", f"{reaching} of {len(samples)} reach {level:.4g}"))
    return Needed(heading_of(view, trials), tuple(facts), TRADE_COLUMNS, (*rows, *samples))


def sheet(
    study: StudyView | Place,
    names: Iterable[str] = (),
    *,
    advantage: float | None = None,
    pair: str = "",
    points: int = 17,
    probability: float | None = None,
    draws: int | None = None,
    seed: int | None = None,
    told: Told | None = None,
) -> Needed:
    """Return what each value of the candidate must be, alone, for the level.

    Parameters
    ----------
    study : StudyView, str or Path
        A loaded study, or the file of one.
    names : iterable of str, optional
        Values to be on the sheet; by default the decisive ones, then those with a range that move the advantage.
    advantage : float, optional
        Level instead of the required advantage of the study.
    pair : str, optional
        Label of a node pair; by default the headline.
    points : int
        Grid points of each scan.
    probability : float, optional
        Also state the value, and the spread, at which the level is reached with this probability when all stated ranges
        are drawn together.
    draws : int, optional
        How many draws for the probability: a power of two from 16, by default 256.
    seed : int, optional
        Seed of the draws, by default 0.
    told : callable, optional
        Told how many comparisons have been made.

    Returns
    -------
    Needed
        One row per required value.

    Raises
    ------
    UsageError
        For an unknown name, pair or level, when there is no advantage today, when a probability is asked for and
        nothing can be drawn, or when draws or a seed are given without one.
    """
    from benchmark.decide.axes import find_axis
    from benchmark.decide.specification import SHEET_COLUMNS, TOLERANCE_COLUMNS, sheet_rows, specification

    view, trials = trials_of(study, pair, told)
    level = level_of(view, advantage)
    chosen = [find_axis(trials, name) for name in names]
    drawing = _drawing(probability, draws, seed)
    found = specification(trials, level, points, chosen=chosen, probability=probability, **drawing)
    rows = sheet_rows(found)
    facts = []
    for row in rows:
        drawn = found.tolerances.get(row["name"])
        facts.append(
            (row["name"], f"{_first(row)}. {row['words']}" + ("" if drawn is None else f". Drawn: {drawn.words}"))
        )
    columns = SHEET_COLUMNS if probability is None else (*SHEET_COLUMNS, *TOLERANCE_COLUMNS)
    if not facts:
        facts = [("nothing is decisive", "no value of the candidate alone moves the advantage")]
    return Needed(heading_of(view, trials), tuple(facts), columns, tuple(rows))


def _drawing(probability: float | None, draws: int | None, seed: int | None) -> dict[str, int]:
    """Return draws and seed; refused where nothing is drawn."""
    given = [name for name, number in (("draws", draws), ("seed", seed)) if number is not None]
    if given and probability is None:
        message = f"{' and '.join(given)} given without a probability, so nothing would be drawn; state a probability"
        raise UsageError(message)
    return {"draws": 256 if draws is None else draws, "seed": 0 if seed is None else seed}


def _first(row: Mapping[str, Any]) -> str:
    """Say whether a value is decisive and within reach."""
    return ("decisive; " if row["decisive"] == "yes" else "") + f"reachable: {row['reachable']}"


def joint_sheet(
    study: StudyView | Place,
    names: Iterable[str] = (),
    *,
    advantage: float | None = None,
    pair: str = "",
    points: int = 17,
    probability: float | None = None,
    draws: int | None = None,
    seed: int | None = None,
    told: Told | None = None,
) -> Needed:
    """Return what several values of the candidate, and their spreads, must be together for the level.

    Parameters
    ----------
    study : StudyView, str or Path
        A loaded study, or the file of one.
    names : iterable of str, optional
        Values with a stated spread; by default all of the candidate's that move the advantage.
    advantage : float, optional
        Level instead of the required advantage of the study.
    pair : str, optional
        Label of a node pair; by default the headline.
    points : int
        Grid points of the scan over the steps.
    probability : float, optional
        Also state values and spreads at which the level is reached with this probability.
    draws : int, optional
        How many draws for the probability: a power of two from 16, by default 256.
    seed : int, optional
        Seed of the draws, by default 0.
    told : callable, optional
        Told how many comparisons have been made.

    Returns
    -------
    Needed
        One row per value. Put into the files of the study they give the level with the probability of the sheet.

    Raises
    ------
    UsageError
        For an unknown name, pair or level, a value without a stated spread or without effect, when there is no
        advantage today, or when draws or a seed are given without a probability.
    """
    from benchmark.decide.axes import find_axis
    from benchmark.decide.joint_sheet import joint_sheet as solved
    from benchmark.decide.joint_words import JOINT_COLUMNS, joint_facts, joint_rows
    from benchmark.decide.specification import spread_effects

    view, trials = trials_of(study, pair, told)
    level = level_of(view, advantage)
    drawing = _drawing(probability, draws, seed)
    axes = [find_axis(trials, name) for name in dict.fromkeys(names)] or spread_effects(trials, level)
    found = solved(trials, level, axes, probability=probability, count=points, **drawing)
    return Needed(heading_of(view, trials), tuple(joint_facts(found)), JOINT_COLUMNS, tuple(joint_rows(found)))


def opportunity(
    study: StudyView | Place,
    kind: str = "activity",
    *,
    advantage: float | None = None,
    pair: str = "",
    points: int = 13,
    told: Told | None = None,
) -> Needed:
    """Return the map of the advantage over the deadline and the activity or the duty.

    Parameters
    ----------
    study : StudyView, str or Path
        A loaded study, or the file of one.
    kind : str
        Second axis: "activity", or "duty" (share of the time in which the block is clocked).
    advantage : float, optional
        Level instead of the required advantage of the study.
    pair : str, optional
        Label of a node pair; by default the headline.
    points : int
        Grid points per axis.
    told : callable, optional
        Told how many comparisons have been made.

    Returns
    -------
    Needed
        Rows of kind "today", "point", "boundary" (exact crossings of 0.5, 1, the level and 10), "jump" (where the
        advantage jumps over such a level because a contender or a better design point ceases to be permitted) and
        "class" (usual place of product classes, common practice, no source).

    Raises
    ------
    UsageError
        For another kind, or a study without a deadline or without that axis.
    """
    from benchmark.decide.opportunity import MAP_COLUMNS, contours, map_rows, opportunity_map

    view, trials = trials_of(study, pair, told)
    level = level_of(view, advantage)
    found = opportunity_map(trials, kind, contours(level), points)
    facts = []
    for value, points_on in found.boundary.items():
        listed = ", ".join(f"{found.second.text(y)} at {x:.4g} s" for x, y in points_on)
        facts.append((f"boundary of advantage {value:.4g}", listed or "none on the map"))
        if jumped := ", ".join(f"{found.second.text(y)} at {x:.4g} s" for x, y in found.jumps[value]):
            facts.append((f"jumps over advantage {value:.4g}", f"{jumped}: what is permitted changes there"))
    won = float((found.advantage >= level).mean())
    facts.append((f"share of the map with {level:.4g} or more", f"{won:.0%} of {found.advantage.size} points"))
    return Needed(heading_of(view, trials), tuple(facts), MAP_COLUMNS, tuple(map_rows(found)))


def improve(
    study: StudyView | Place, *, advantage: float | None = None, pair: str = "", told: Told | None = None
) -> Needed:
    """Return the largest advantage that perfecting one physical term of the candidate could give.

    Parameters
    ----------
    study : StudyView, str or Path
        A loaded study, or the file of one.
    advantage : float, optional
        Level instead of the required advantage of the study.
    pair : str, optional
        Label of a node pair; by default the headline.
    told : callable, optional
        Told how many comparisons have been made.

    Returns
    -------
    Needed
        One row per term, then terms perfected together.

    Raises
    ------
    UsageError
        For an unknown pair or level.
    """
    from benchmark.decide.gap import GAP_COLUMNS, gap_rows, improvements

    view, trials = trials_of(study, pair, told)
    level = level_of(view, advantage)
    rows = gap_rows(improvements(trials), level)
    facts = []
    for row in rows:
        words = row["state"] or f"at most {row['advantage']:.4g}, then limited by {row['limit']}"
        words += f"; {level:.4g} {'reached' if row['reaches'] == 'yes' else 'not reached'}"
        facts.append((row["perfected"], words + (f" ({row['side']})" if row["side"] not in ("", "candidate") else "")))
    return Needed(heading_of(view, trials), tuple(facts), GAP_COLUMNS, tuple(rows))


def flips(
    study: StudyView | Place,
    *,
    up_to: int = 2,
    advantage: float | None = None,
    pair: str = "",
    told: Told | None = None,
) -> Needed:
    """Return the smallest sets of inputs that, inside their ranges, change the side of the level.

    Parameters
    ----------
    study : StudyView, str or Path
        A loaded study, or the file of one.
    up_to : int
        Largest set looked for, 1 to 3.
    advantage : float, optional
        Level instead of the required advantage of the study.
    pair : str, optional
        Label of a node pair; by default the headline.
    told : callable, optional
        Told how many comparisons have been made.

    Returns
    -------
    Needed
        One row per input of every set, the least implausible set first; none when there is no such set.

    Raises
    ------
    UsageError
        For an unknown pair or level, another ``up_to``, or a size that would need too many comparisons.
    """
    from benchmark.decide.flipping_set import FLIP_COLUMNS, flip_rows, flipping_sets

    view, trials = trials_of(study, pair, told)
    found = flipping_sets(trials, level_of(view, advantage), up_to)
    facts = [("smallest set", found.text)]
    for number, flip in enumerate(found.flips, start=1):
        moved = "; ".join(
            f"{axis.name} from {axis.text(axis.best)} to {axis.text(value)} "
            f"({distance:+.3g} standard deviations, {axis.value.evidence if axis.value else ''})"
            for axis, value, distance in zip(flip.axes, flip.values, flip.distances, strict=True)
        )
        facts.append((f"set {number}, distance {flip.implausibility:.3g}", moved))
    return Needed(heading_of(view, trials), tuple(facts), FLIP_COLUMNS, tuple(flip_rows(found)))
