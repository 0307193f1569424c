"""Exceptions and problems (layer 0).

EvenloadError
├── UsageError       wrong use of a command or function (exit status 2)
└── InputRefused     one or more problems in the user's files (exit status 3); carries all of them
"""

from __future__ import annotations

import difflib
from collections.abc import Iterable
from dataclasses import dataclass

__all__ = ["EvenloadError", "InputRefused", "Problem", "UsageError", "nearest"]


def _short(text: str, most: int) -> str:
    """Cut a text that nobody would read to its end; what a file says may be megabytes long."""
    return text if len(text) <= most else f"{text[:most]}... ({len(text)} characters)"


@dataclass(frozen=True, order=True)
class Problem:
    """One thing wrong in a user's file: where, what, what was found, what is allowed, what to do next.

    The fields hold everything; as text, each is cut to a length that can be read.
    """

    file: str
    line: int
    name: str
    what: str
    found: str = ""
    allowed: str = ""
    hint: str = ""

    def __str__(self) -> str:
        place = f"{self.file}:{self.line}" if self.line else self.file
        name, what = _short(self.name, 200), _short(self.what, 600)
        text = f"{place}: {name}: {what}" if name else f"{place}: {what}"
        if self.found:
            text += f"; found {_short(self.found, 600)}"
        if self.allowed:
            text += f"; allowed: {_short(self.allowed, 3000)}"
        if self.hint:
            text += f"; {_short(self.hint, 600)}"
        return text


class EvenloadError(Exception):
    """Base of every error a user can cause."""


class UsageError(EvenloadError):
    """A command or function was called in a way that cannot mean anything."""


class InputRefused(EvenloadError):
    """The inputs have problems; nothing was run. ``problems`` lists all of them in file and line order."""

    def __init__(self, problems: Iterable[Problem]) -> None:
        self.problems: tuple[Problem, ...] = tuple(sorted(set(problems)))
        super().__init__("\n".join(str(problem) for problem in self.problems))


def nearest(name: str, allowed: Iterable[str]) -> str:
    """Return a hint naming the closest allowed name, or an empty string."""
    match = difflib.get_close_matches(name, list(allowed), n=1, cutoff=0.6)
    return f"did you mean {match[0]!r}?" if match else ""
