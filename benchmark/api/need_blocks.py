"""Everything ``need`` can say of a study, as plain data for its record (layer 9.5)."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

from benchmark.api.need import Needed, flips, improve, need, opportunity, sheet

if TYPE_CHECKING:
    from benchmark.api.views import StudyView

__all__ = ["need_blocks"]

Told = Callable[[int], None]
#: inputs that a flipping set may have at most
MOST_FLIPPED = 2


def need_blocks(view: StudyView, told: Told | None = None) -> list[dict[str, Any]]:
    """Return break-evens, required values, who must improve, the smallest flipping set and two maps.

    Parameters
    ----------
    view : StudyView
        A loaded study.
    told : callable, optional
        Told how many comparisons have been made.

    Returns
    -------
    list of dict
        ``key``, ``title``, ``facts`` (name and sentence), ``columns`` and ``rows`` of each.
    """
    made: list[tuple[str, str, Needed]] = [
        ("break-evens", "Break-evens and required values of the question", need(view, told=told)),
        ("sheet", "Specification of the candidate", sheet(view, told=told)),
        ("improve", "Who must improve", improve(view, told=told)),
        ("flips", "Smallest change that turns the answer", flips(view, up_to=MOST_FLIPPED, told=told)),
    ]
    if view.study.timing == "clocked":
        made.append(
            (
                "map-activity",
                "Where it would be worth it: deadline and activity",
                opportunity(view, "activity", told=told),
            )
        )
        if view.study.idle != "none":
            made.append(
                ("map-duty", "Where it would be worth it: deadline and duty", opportunity(view, "duty", told=told))
            )
    return [
        {
            "key": key,
            "title": title,
            "facts": [list(fact) for fact in found.facts],
            "columns": list(found.columns),
            "rows": [dict(row) for row in found.rows],
        }
        for key, title, found in made
    ]
