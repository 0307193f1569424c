"""Physical constants in SI (layer 0). Source: CODATA 2018; exact where the SI defines them."""

from __future__ import annotations

from typing import Final

ELEMENTARY_CHARGE: Final = 1.602176634e-19  # C, exact
BOLTZMANN: Final = 1.380649e-23  # J/K, exact
PLANCK: Final = 6.62607015e-34  # J s, exact
SPEED_OF_LIGHT: Final = 299792458.0  # m/s, exact
VACUUM_PERMITTIVITY: Final = 8.8541878128e-12  # F/m
ELECTRON_MASS: Final = 9.1093837015e-31  # kg
JULIAN_YEAR: Final = 365.25 * 86400.0  # s, definition
