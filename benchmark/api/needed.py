"""An answer of ``need`` in words and as rows, and what every question starts from (layer 9.5)."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from benchmark.api.session import Place, load_study
from benchmark.api.views import StudyView
from benchmark.errors import UsageError, nearest

if TYPE_CHECKING:
    import pandas

    from benchmark.decide.axes import Axis
    from benchmark.decide.trials import Trials

__all__ = ["Needed", "Range", "Told", "heading_of", "level_of", "ranged", "trials_of"]

Told = Callable[[int], None]
#: ends of a range, in the unit of the value
Range = tuple[float | str, float | str]


@dataclass(frozen=True, eq=False, repr=False)
class Needed:
    """An answer in words and as rows.

    Attributes
    ----------
    heading : tuple of str
        Study, node pair, policy, and the advantage as it is today.
    facts : tuple of (str, str)
        Name and sentence.
    columns : tuple of str
        Of the rows, in order; values are in the unit a column names, or the one of the column ``unit``.
    rows : tuple of mapping
        Numbers and words; nan where there is no number.
    """

    heading: tuple[str, ...]
    facts: tuple[tuple[str, str], ...]
    columns: tuple[str, ...]
    rows: tuple[Mapping[str, Any], ...]

    @property
    def text(self) -> str:
        """Return heading and sentences as plain lines."""
        return "\n".join([*self.heading, *(f"{name}: {text}" for name, text in self.facts)])

    @property
    def frame(self) -> pandas.DataFrame:
        """Return the rows as a tidy frame."""
        import pandas

        return pandas.DataFrame([dict(row) for row in self.rows], columns=list(self.columns))

    def _repr_html_(self) -> str:
        from benchmark.api import html

        return html.frame(*map(html.note, self.heading), html.table("", ("what", "answer"), self.facts))

    def __repr__(self) -> str:
        return f"Needed({len(self.facts)} answers, {len(self.rows)} rows)"


def level_of(view: StudyView, advantage: float | None) -> float:
    """Return the level asked for, by default the required advantage of the study.

    Raises
    ------
    UsageError
        When it is not above 0.
    """
    level = view.study.required_advantage if advantage is None else float(advantage)
    if not (math.isfinite(level) and level > 0.0):
        message = f"an advantage above 0 is needed, found {level:g}"
        raise UsageError(message)
    return level


def trials_of(study: StudyView | Place, pair: str, told: Told | None) -> tuple[StudyView, Trials]:
    """Load a study where it is a file, and evaluate its best estimate at one node pair.

    Raises
    ------
    UsageError
        For an unknown pair.
    """
    from benchmark.decide.trials import Trials

    view = study if isinstance(study, StudyView) else load_study(study)
    labels = [item.label for item in view.study.pairs]
    label = pair or view.study.headline
    if label not in labels:
        message = f"there is no node pair {label!r}; known are {', '.join(labels)}; {nearest(label, labels)}"
        raise UsageError(message.rstrip("; "))
    return view, Trials(view.study, view.study.pair(label), told=told)


def heading_of(view: StudyView, trials: Trials) -> tuple[str, ...]:
    """Say study, what-if numbers, node pair, policy and the advantage as it is today."""
    study = trials.study
    best = trials.best
    if best.state(0):
        today = f"no advantage today: {best.state(0)} ({trials.why({})})"
    else:
        strongest = best.names[int(best.strongest[0])]
        today = f"advantage today {best.advantage[0]:.4g} in {study.policy.metric} against {strongest}"
        today += "" if best.meets[0] else "; a listed requirement is missed"
    return (
        f"Study {study.id}: {study.title}",
        *(f"What-if: {name} = {text}" for name, text in view.what_if.items()),
        f"Node pair {trials.pair.label}, policy {trials.policy}, both sides optimised at every value; {today}",
    )


def ranged(axes: Sequence[Axis], over: Sequence[Range]) -> list[Axis]:
    """Give axes the ranges asked for, in order."""
    if len(over) > len(axes):
        message = f"{len(over)} ranges for {len(axes)} value(s)"
        raise UsageError(message)
    ends = [tuple(axis.si(str(end)) for end in pair) for axis, pair in zip(axes, over, strict=False)]
    found = [axis.over(low, high) for axis, (low, high) in zip(axes, ends, strict=False)]
    return [*found, *axes[len(found) :]]
