"""Circuits as lists of nets: a driver, its loads, its wire, its activity (layer 5). The same for every technology.

Numbers may be plain floats or arrays that broadcast with the arrays of the switch records (scenario values drawn at
random have the shape (draw, 1, 1)). Everything is SI.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Literal

from benchmark.circuits.cells import Cell
from benchmark.devices.record import Array
from benchmark.errors import UsageError

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    from benchmark.circuits.rules import StageRule
    from benchmark.circuits.sized import Sized

__all__ = ["Circuit", "Discharge", "Fit", "Layer", "LengthUnit", "Load", "Net", "SwingFrom", "Value", "Wires"]

Value = float | Array
#: shapes a circuit to a technology, from its sized switches, the wires and the delay rule
Fit = Callable[["Sized", "Wires", "StageRule"], "Circuit"]
LengthUnit = Literal["m", "gate_pitch"]
SwingFrom = Literal["own-rail", "supply"]


@dataclass(frozen=True)
class Layer:
    """Wire of one layer, resistance [ohm/m] and capacitance [F/m] per length."""

    resistance_per_length: Value
    capacitance_per_length: Value


@dataclass(frozen=True)
class Wires:
    """The wire set both sides of a study use at a node.

    resistance_per_length [ohm/m], capacitance_per_length [F/m]
        of the layer ``local``; a circuit may state further layers of its own.
    layout_capacitance_per_pin [F]
        layout parasitic added to every gate input and every gate output, of both sides alike.
    """

    resistance_per_length: Value
    capacitance_per_length: Value
    layout_capacitance_per_pin: Value = 0.0

    def layer(self, name: str, stated: Mapping[str, Layer]) -> Layer:
        """Return a layer: one the circuit states, or ``local``, the one of this set."""
        if name in stated:
            return stated[name]
        if name == "local":
            return Layer(self.resistance_per_length, self.capacitance_per_length)
        message = f"no wire layer {name!r}; known are {', '.join(sorted({*stated, 'local'}))}"
        raise UsageError(message)


@dataclass(frozen=True)
class Load:
    """``count`` inputs named ``input`` of cells ``cell`` at the far end of a net."""

    cell: Cell
    input: str
    count: Value = 1.0


@dataclass(frozen=True)
class Discharge:
    """Something outside the technology that discharges a net at the far end of its wire: a memory cell.

    current [A]
        Constant while the net falls by its swing.
    rail [V]
        From which the driver restores the net; energy C rail swing.
    """

    current: Value
    rail: Value


@dataclass(frozen=True)
class Net:
    """One net, or ``count`` alike nets, with the cell that drives each of them.

    driver
        The cell whose output the net is. Its switches, leakage and area belong to this net.
    copies [1]
        Parallel copies of the driver: so many times its drive, terminals, leakage and area.
    loads, fixed_load [F]
        Driven inputs and a fixed capacitance, both at the far end of the wire.
    load_per_length [F/m]
        Fixed loads spread evenly along the wire (memory cells); it counts as fixed load in energy and, for the wire's
        resistance, as part of the distributed line.
    wire_length [m or gate pitches]
        ``length_unit`` says which; a gate pitch is the square root of the mean cell area of the circuit in the
        technology at hand, so a larger cell pays with longer wires.
    layer
        Wire layer, ``local`` or one that the circuit states.
    swing [V]
        None: the full supply. A value fixed from outside (by a memory cell, a pad) is the same for all technologies.
    swing_from
        ``own-rail``: the net is charged from a rail of the voltage ``swing``, energy C swing^2.
        ``supply``: it is charged from the logic supply V through part of the swing, energy C V swing.
    discharge
        The net falls by ``swing``, pulled by something outside the technology; loads stand at the near end of the wire,
        with the driver, which only restores it. See ``stage``.
    latch_from [V]
        The driver is one of two cross-coupled inverters; the net starts as far apart from its partner and regenerates
        to half the supply. See ``latch``.
    rising_per_operation [1]
        Activity: rising transitions of one such net per operation.
    busiest_per_operation [1]
        Rising transitions per operation of the busiest of these nets; endurance is judged on it.
        None: ``rising_per_operation``.
    count [1]
        Number of alike nets (and drivers).
    on_critical_path [1]
        How many times a stage like this occurs on the critical path.
    group
        Bill in which the energy is listed: ``logic``, ``register``, ``clock`` or a name of the circuit's own.
    """

    name: str
    driver: Cell
    loads: tuple[Load, ...] = ()
    fixed_load: Value = 0.0
    wire_length: Value = 0.0
    length_unit: LengthUnit = "m"
    layer: str = "local"
    swing: Value | None = None
    swing_from: SwingFrom = "own-rail"
    rising_per_operation: Value = 0.0
    busiest_per_operation: Value | None = None
    count: Value = 1.0
    on_critical_path: Value = 0.0
    group: str = "logic"
    copies: Value = 1.0
    load_per_length: Value = 0.0
    discharge: Discharge | None = None
    latch_from: Value | None = None

    def __post_init__(self) -> None:
        if self.discharge is not None and (self.swing is None or self.latch_from is not None):
            message = f"net {self.name!r}: a net that is discharged from outside needs a swing and is no latch"
            raise UsageError(message)

    @property
    def gated(self) -> bool:
        """Tell whether the net is driven by a complementary gate on both edges."""
        return self.discharge is None and self.latch_from is None

    @property
    def plain(self) -> bool:
        """Tell whether one copy of a complementary gate with loads at the end of a wire describes the net."""
        return (
            self.gated
            and isinstance(self.copies, float)
            and self.copies == 1.0
            and isinstance(self.load_per_length, float)
            and self.load_per_length == 0.0
        )

    @property
    def busiest(self) -> Value:
        """Return the rising transitions per operation of the busiest of these nets."""
        return self.rising_per_operation if self.busiest_per_operation is None else self.busiest_per_operation


@dataclass(frozen=True)
class Circuit:
    """A named list of nets doing one operation.

    operation
        What one operation is, in words ("one clock cycle", "one row access").
    layers
        Wire layers that the circuit states itself.
    assumptions
        What was assumed when the nets were made, one sentence each.
    stage
        Text of the one kind of stage the circuit is made of ("inverter, fan-out 4, no wire"), or an array of it over
        rows; empty when it has several. A technology known only at one stage can be used in a circuit of just that
        stage.
    fit
        Shapes the circuit to a technology (repeaters: how many, how wide); ``nets`` are then an example of it.
    """

    name: str
    title: str
    operation: str
    nets: tuple[Net, ...]
    layers: Mapping[str, Layer] = field(default_factory=dict)
    assumptions: tuple[str, ...] = ()
    stage: str | NDArray[np.str_] = ""
    fit: Fit | None = None

    def __post_init__(self) -> None:
        if not self.nets:
            message = f"circuit {self.name!r} has no net"
            raise UsageError(message)
        names = [net.name for net in self.nets]
        twice = sorted({name for name in names if names.count(name) > 1})
        if twice:
            message = f"circuit {self.name!r}: net names occur twice: {', '.join(twice)}"
            raise UsageError(message)
