"""Everything ``need`` can say of a study, as plain data for its record (layer 9.5)."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

from benchmark.api.need import flips, improve, joint_sheet, need, opportunity, sheet, trade
from benchmark.api.needed import Needed, Told, level_of, trials_of
from benchmark.errors import UsageError

if TYPE_CHECKING:
    from benchmark.api.views import StudyView
    from benchmark.sets.study import DrawSettings

__all__ = ["need_blocks"]

#: told the question being answered and the share of the questions done
Progress = Callable[[str, float], None]
Question = tuple[str, str, Callable[[Told | None], Needed]]
#: inputs that a flipping set may have at most
MOST_FLIPPED = 2
#: draws of a probability on the sheets, at most: each is drawn anew at every value that is tried
MOST_DRAWS = 256


def need_blocks(
    view: StudyView, progress: Progress | None = None, drawing: DrawSettings | None = None
) -> list[dict[str, Any]]:
    """Return break-evens, specifications, a trade curve, who must improve, the smallest flipping set and two maps.

    Parameters
    ----------
    view : StudyView
        A loaded study.
    progress : callable, optional
        Told the question being answered, with the comparisons made for it, and the share of the questions done [1].
    drawing : DrawSettings, optional
        With draws, the sheets also state what is needed for the probability that is called likely.

    Returns
    -------
    list of dict
        ``key``, ``title``, ``facts`` (name and sentence), ``columns`` and ``rows`` of each.
    """
    questions = _questions(view, drawing)
    found = []
    for number, (key, title, answer) in enumerate(questions):
        told = _Count(title, number / len(questions), progress) if progress else None
        try:
            answered = answer(told)
        except UsageError as error:  # a question this study has no answer to does not take the others away
            answered = Needed((), (("not answered", str(error)),), (), ())
        found.append(
            {
                "key": key,
                "title": title,
                "facts": [list(fact) for fact in answered.facts],
                "columns": list(answered.columns),
                "rows": [dict(row) for row in answered.rows],
            }
        )
    return found


class _Count:
    """Passes the comparisons made for one question on to the progress of all."""

    def __init__(self, title: str, share: float, progress: Progress) -> None:
        self.title, self.share, self.progress, self.made = title, share, progress, 0
        progress(title, share)

    def __call__(self, rows: int) -> None:
        self.made += rows
        self.progress(f"{self.title}: {self.made} comparisons", self.share)


def _questions(view: StudyView, drawing: DrawSettings | None) -> list[Question]:
    """List what can be asked of the study, in the order of the report."""
    from benchmark.decide.axes import known_axes
    from benchmark.decide.specification import most_effective, spread_effects

    more: dict[str, Any] = {}
    if drawing is not None and drawing.number:
        more = {"probability": drawing.likely, "draws": min(drawing.number, MOST_DRAWS), "seed": drawing.seed}
    _, trials = trials_of(view, "", None)
    known = trials.best.state(0) == ""
    listed: list[Question] = [
        ("break-evens", "Break-evens and required values of the question", lambda told: need(view, told=told))
    ]
    if known:  # a sheet starts from an advantage there is
        drawn = more if any(value.spread is not None for value in trials.values.values()) else {}
        listed.append(("sheet", "Specification of the candidate", lambda told: sheet(view, told=told, **drawn)))
        if spread_effects(trials, level_of(view, None)):
            title = "Joint specification of values and spreads"
            listed.append(("joint-sheet", title, lambda told: joint_sheet(view, told=told, **drawn)))
        names = [axis.name for axis in most_effective(trials)]
        if len(names) == 2:
            title = "One value against another"
            listed.append(("trade", title, lambda told: trade(view, names[0], names[1], told=told)))
    listed += [
        ("improve", "Who must improve", lambda told: improve(view, told=told)),
        ("flips", "Smallest change that turns the answer", lambda told: flips(view, up_to=MOST_FLIPPED, told=told)),
    ]
    axes = known_axes(trials)
    if view.study.timing == "clocked" and "deadline" in axes:
        if "study.activity" in axes:
            title = "Where it would be worth it: deadline and activity"
            listed.append(("map-activity", title, lambda told: opportunity(view, "activity", told=told)))
        if "awake_share" in axes:
            title = "Where it would be worth it: deadline and duty"
            listed.append(("map-duty", title, lambda told: opportunity(view, "duty", told=told)))
    return listed
