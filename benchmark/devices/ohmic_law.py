"""Path current of a switch of which only two resistances and a switching level are known (layer 4)."""

from __future__ import annotations

import numpy as np

from benchmark.devices.record import Array
from benchmark.physics.ohmic import conduction_window, log_linear_conductance, perfect_conductance

__all__ = ["OhmicLaw"]


class OhmicLaw:
    """Current law of the record: ohmic across the path, log-linear in the control voltage inside its window.

    A class rather than a closure, so that records can be pickled.

    Parameters
    ----------
    supply : ndarray
        Supply V [V]; its elements and those of the other arguments broadcast to the shape of the record.
    on_resistance : ndarray
        Resistance at full control [ohm].
    open_resistance : ndarray or None
        Resistance at zero control [ohm]; None: exactly no current.
    level : ndarray
        Switching level w [1], R(w V) = 2 R_on; nan gives nan.
    """

    def __init__(self, supply: Array, on_resistance: Array, open_resistance: Array | None, level: Array) -> None:
        self._supply, self._on, self._level = supply[..., None], on_resistance[..., None], level[..., None]
        self._decades: Array | None = None
        if open_resistance is not None:
            self._decades = np.log10(open_resistance / on_resistance)[..., None]
            self._window = conduction_window(self._level, self._decades)

    def __call__(self, control: Array, path: Array) -> Array:
        """Return the current [A] at control and path voltages [V] with one trailing axis more than the record."""
        share = control / self._supply
        if self._decades is None:
            return path * perfect_conductance(share, self._on, self._level)
        return path * log_linear_conductance(share, self._on, self._decades, *self._window)
