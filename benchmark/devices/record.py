"""The contract between devices and circuits: the ``Switch`` record (layer 4).

Every device model returns one ``SwitchPair`` for any number of nodes, draws, temperatures and supplies at once.
Circuits read nothing else about a technology. All quantities are SI and belong to a switch of *unit size*.

Shapes. Every array field broadcasts to the common shape S of the arguments (for the evaluator S is
draw x temperature x supply). ``stack_on`` and ``stack_off`` carry one trailing axis k = 1..k_max.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Literal

import numpy as np
from numpy.typing import NDArray

__all__ = ["Array", "BoolArray", "Capability", "Limit", "Switch", "SwitchPair"]

Array = NDArray[np.float64]
BoolArray = NDArray[np.bool_]


@dataclass(frozen=True)
class Limit:
    """A limit only the device knows (field, stress, temperature): ``margin = limit / used``.

    ``used`` and ``limit`` broadcast to S; ``kind`` is hard (never usable beyond) or soft (flagged);
    ``source`` names the parameter that carries the limit, so the ledger entry can be found.
    """

    name: str
    used: Array
    limit: Array
    unit: str
    kind: Literal["hard", "soft"]
    source: str

    @property
    def margin(self) -> Array:
        """Limit over used; infinite where nothing is used."""
        with np.errstate(divide="ignore", invalid="ignore"):
            ratio = self.limit / self.used
        return np.asarray(np.where(self.used > 0.0, ratio, np.inf), dtype=np.float64)


@dataclass(frozen=True)
class Capability:
    """What the device can do; the study brings the demand. ``bound`` marks a one-sided value."""

    value: Array
    unit: str
    bound: Literal["", "at-least", "at-most"]
    source: str


@dataclass(frozen=True)
class Switch:
    """One switch of unit size, seen from outside.

    Definitions (``V`` is the supply of the same array element):

    resistance [ohm]
        Defined by: 50 % step delay = ln 2 * resistance * C. Path resistance of a resistive switch, or
        V / (2 ln 2 I_eff) of a current source (``resistance_kind`` tells which).
    switching_level [1]
        w with R(w V) = 2 R(V) at this supply; 0.5 when ``resistance_kind`` is effective; nan: does not switch.
    current(control, path) -> [A]
        Static path current of this switch as a function of the control voltage and of the voltage across the
        path, both as magnitudes in the switch's own sense (for the pull-up switch: measured from the supply rail
        downwards). Arguments have ONE trailing axis more than S and broadcast against S + (1,).
        Must be finite, >= 0 for path >= 0, and 0 at path = 0. Includes the open-state floor.
    on_current, off_current_path [A]
        At control = path = V; at control = 0, path = V. The on/off ratio printed is their quotient.
    off_current_input_high, off_current_input_low [A]
        Through the input when it is at the closing level, and at the opening level.
    off_current_body [A]
        Junction and substrate, open or closed.
    stack_on[k-1], stack_off[k-1] [1]
        Resistance of k closed switches in series, leakage of k open switches in series, relative to one.
    input_charge [C]
        Drawn from the supply by the input over the full swing, Miller and electromechanical part included:
        ENERGY uses it.
    input_capacitance_delay [F]
        Average in the switching window of the driver: DELAY uses it.
    terminal_capacitance, terminal_capacitance_delay [F]
        Per conducting terminal: charge over the swing (energy); in the switching window (delay).
    extra_energy [J]
        Per switch and full cycle of its input, not contained in charge times V.
    closing_time, opening_time [s]
        Load-independent (acoustic transit, mechanics).
    natural_frequency [rad/s], quality [1]
        Of the actuator; nan if none.
    closing_voltage, opening_voltage [V]
        Control voltage at which it closes and opens; equal without hysteresis.
    """

    # identity
    technology: str
    polarity: Literal["down", "up"]
    partner: Literal["own", "mirrored", "mirrored-plate", "none"]
    resistance_kind: Literal["path", "effective"]
    stack_time: Literal["simultaneous", "sequential"]
    input_scales_with_size: bool
    # conduction
    resistance: Array
    switching_level: Array
    current: Callable[[Array, Array], Array]
    on_current: Array
    # leakage
    off_current_path: Array
    off_current_input_high: Array
    off_current_input_low: Array
    off_current_body: Array
    # stacking
    stack_on: Array
    stack_off: Array
    # charge
    input_charge: Array
    input_capacitance_delay: Array
    terminal_capacitance: Array
    terminal_capacitance_delay: Array
    extra_energy: Array
    # time
    closing_time: Array
    opening_time: Array
    natural_frequency: Array
    quality: Array
    # levels
    closing_voltage: Array
    opening_voltage: Array
    # size and standing
    area: Array  # m^2 with isolation, one switch
    height: Array  # m; nan when not stated
    bias_power: Array  # W per switch
    retention: Array  # s; inf when the state needs no refresh, nan when not stated
    # what only the device knows
    limits: tuple[Limit, ...] = ()
    capabilities: Mapping[str, Capability] = field(default_factory=dict)
    #: reason -> mask of points outside the range where the model may be used; such points are infeasible
    outside: Mapping[str, BoolArray] = field(default_factory=dict)
    #: intermediate results worth showing in a trace: name -> (array, unit), e.g. pressure, stack transit
    intermediates: Mapping[str, tuple[Array, str]] = field(default_factory=dict)
    #: set when the technology is known only at one stage (its text); other stages are refused
    stage_only: str = ""


@dataclass(frozen=True)
class SwitchPair:
    """The pull-down and pull-up switch of a technology at the same supply, temperature and knobs."""

    down: Switch
    up: Switch
    supply: Array
    temperature: Array
