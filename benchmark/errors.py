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


@dataclass(frozen=True, order=True)
class Problem:
    """One thing wrong in a user's file: where, what, what was found, what is allowed, what to do next."""

    file: str
    line: int
    name: str
    what: str
    found: str = ""
    allowed: str = ""
    hint: str = ""

    def __str__(self) -> str:
        place = f"{self.file}:{self.line}" if self.line else self.file
        text = f"{place}: {self.name}: {self.what}" if self.name else f"{place}: {self.what}"
        if self.found:
            text += f"; found {self.found}"
        if self.allowed:
            text += f"; allowed: {self.allowed}"
        if self.hint:
            text += f"; {self.hint}"
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
