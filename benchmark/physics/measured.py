"""Kept so that both layers name one class; the class lives in ``benchmark.measured``."""

from benchmark.measured import MeasuredTable

__all__ = ["MeasuredTable"]
