"""Exact results, worked out with scipy or mpmath by another way than the program's."""

from __future__ import annotations

from tests.validation import closed_decisions, closed_links, closed_physics
from tests.validation.check import Check

__all__ = ["checks"]


def checks() -> list[Check]:
    """Every result."""
    return [*closed_physics.checks(), *closed_decisions.checks(), *closed_links.checks()]
