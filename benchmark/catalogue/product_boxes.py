"""Where product classes usually lie: cycle time, activity and duty (layer 1).

Orders of magnitude to draw boxes with, common practice, no source; a study states its own numbers. ``duty`` is the
share of the time in which the block is clocked. Memory periphery has no box: timing and voltage are set by the array.
"""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["PRODUCT_BOXES", "ProductBox"]


@dataclass(frozen=True)
class ProductBox:
    """Lowest and highest cycle time [s], activity [1] and duty [1] of a product class."""

    cycle: tuple[float, float]
    activity: tuple[float, float]
    duty: tuple[float, float]
    origin: str = "common practice, no source"


PRODUCT_BOXES: dict[str, ProductBox] = {
    "always-on hub": ProductBox((1.0 / 10.0e6, 1.0 / 32.0e3), (0.01, 0.1), (0.001, 0.05)),
    "microcontroller": ProductBox((1.0 / 200.0e6, 1.0 / 10.0e6), (0.05, 0.15), (0.01, 1.0)),
    "mobile core": ProductBox((1.0 / 3.5e9, 1.0 / 0.3e9), (0.05, 0.2), (0.02, 0.1)),
    "server core": ProductBox((1.0 / 4.0e9, 1.0 / 2.0e9), (0.1, 0.2), (0.3, 0.9)),
    "multiply-accumulate array": ProductBox((1.0 / 2.0e9, 1.0 / 0.5e9), (0.2, 0.5), (0.3, 0.9)),
}
