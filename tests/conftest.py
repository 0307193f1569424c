"""For all tests: loads the profile of the tests over random inputs before any of them states its settings."""

from __future__ import annotations

from tests import profiles

__all__ = ["profiles"]
