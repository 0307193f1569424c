"""Comparison without the absolute tolerance of 1e-12 that ``pytest.approx`` adds: femtojoules are far below it."""

from __future__ import annotations

from typing import Any

import pytest


def near(expected: Any, rel: float | None = None, abs: float = 0.0) -> Any:
    """``pytest.approx`` with no absolute tolerance unless one is given (then rel is not used unless given too)."""
    if rel is None:
        rel = 0.0 if abs else 1e-6
    return pytest.approx(expected, rel=rel, abs=abs)
