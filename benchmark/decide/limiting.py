"""What limits delay and what dominates energy at a point, with shares that add up to one (layer 7)."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchmark.evaluate.points import Points

__all__ = ["DELAY_GROUPS", "ENERGY_GROUPS", "Limiting", "groups_of", "limiting"]

#: group shown -> parts of the estimators; labels are read as "<group>-limited"
DELAY_GROUPS: dict[str, tuple[str, ...]] = {
    "transit": ("transit",),
    "device RC": ("self", "input"),
    "wire": ("wire",),
    "layout and fixed load": ("layout", "fixed_load"),
    "level shifter": ("level_shifter",),
}
ENERGY_GROUPS: dict[str, tuple[str, ...]] = {
    "device": ("input", "self"),
    "wire": ("wire",),
    "layout and fixed load": ("layout", "fixed_load"),
    "losses beyond charge": ("extra",),
    "short circuit": ("short_circuit",),
    "parallel copies": ("copies",),
    "leakage": ("leakage",),
    "idle": ("idle",),
    "bias and overheads": ("bias_and_overheads",),
    "supply loss": ("supply_loss",),
    "level shifters": ("level_shifters",),
}


@dataclass(frozen=True)
class Limiting:
    """Shares at one point, in the order of the groups, and the largest of each."""

    delay_shares: Mapping[str, float]
    energy_shares: Mapping[str, float]
    delay_limit: str
    energy_limit: str


def groups_of(
    parts: Mapping[str, NDArray[np.float64]], groups: Mapping[str, tuple[str, ...]]
) -> dict[str, NDArray[np.float64]]:
    """Sum parts into groups; every part must belong to exactly one group."""
    known = {part for names in groups.values() for part in names}
    unknown = sorted(set(parts) - known)
    if unknown:
        message = f"parts without a group: {', '.join(unknown)}"
        raise KeyError(message)
    return {
        group: np.asarray(sum(parts[name] for name in names if name in parts))
        for group, names in groups.items()
        if any(name in parts for name in names)
    }


def limiting(points: Points, row: int = 0, column: int = 0) -> Limiting:
    """Return the shares at one point of a ``Points`` table."""
    delay = {k: float(v[row, column]) for k, v in groups_of(points.time_parts, DELAY_GROUPS).items()}
    energy = {k: float(v[row, column]) for k, v in groups_of(points.energy_parts, ENERGY_GROUPS).items()}
    total_delay, total_energy = sum(delay.values()), sum(energy.values())
    delay_shares = {k: v / total_delay if total_delay > 0 else 0.0 for k, v in delay.items()}
    energy_shares = {k: v / total_energy if total_energy > 0 else 0.0 for k, v in energy.items()}
    return Limiting(
        delay_shares,
        energy_shares,
        max(delay_shares, key=lambda k: delay_shares[k]),
        max(energy_shares, key=lambda k: energy_shares[k]),
    )
