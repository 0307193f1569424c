"""A measured table as pure numbers (layer 1): what the file layer hands to device models."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Literal

import numpy as np
from numpy.typing import NDArray

__all__ = ["MeasuredTable"]


@dataclass(frozen=True)
class MeasuredTable:
    """Rows of one measured table in SI, in file order.

    ``columns``: axis and value columns, each of shape (rows,), float64, by catalogue meaning
    (for example control_voltage, path_voltage, temperature, path_current_per_width).
    ``labels``: text columns such as sweep (forward | backward).
    ``interpolate``: which value column, along which axis, on which scale, by which method.
    ``floor``: value column -> instrument floor; rows at or below it are upper bounds.
    """

    name: str
    columns: Mapping[str, NDArray[np.float64]]
    labels: Mapping[str, tuple[str, ...]]
    value: str
    along: str
    scale: Literal["linear", "log"]
    method: Literal["monotone", "charge"]
    floor: Mapping[str, float] = field(default_factory=dict)
    where: str = ""
