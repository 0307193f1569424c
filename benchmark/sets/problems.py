"""Collecting every problem of every file before anything is refused (layer 2)."""

from __future__ import annotations

from dataclasses import dataclass, field

from benchmark.errors import InputRefused, Problem

__all__ = ["Collector"]


@dataclass
class Collector:
    """Problems and warnings found so far; ``raise_if_any`` ends the pass."""

    problems: list[Problem] = field(default_factory=list)
    warnings: list[Problem] = field(default_factory=list)
    notes: list[Problem] = field(default_factory=list)

    def add(self, problem: Problem) -> None:
        """Record a reason to refuse."""
        self.problems.append(problem)

    def warn(self, problem: Problem) -> None:
        """Record something to say loudly without refusing."""
        self.warnings.append(problem)

    def note(self, problem: Problem) -> None:
        """Record what a model takes where a file is silent."""
        self.notes.append(problem)

    def raise_if_any(self) -> None:
        """Refuse the input if any problem was recorded.

        Raises
        ------
        InputRefused
            With all problems.
        """
        if self.problems:
            raise InputRefused(self.problems)
