"""The command line in scenarios: the same fixture as in its own tests."""

from __future__ import annotations

from tests.cli.conftest import evenload as evenload
