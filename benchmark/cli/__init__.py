"""Command line (layer 10). Heavy parts are imported inside the commands, so that ``--help`` answers at once."""

from __future__ import annotations

from benchmark.cli.app import main

__all__ = ["main"]
