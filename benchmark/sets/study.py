"""A study in SI: every slot of the question filled and checked (layer 2)."""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import NamedTuple

from benchmark.sets.circuit_file import CircuitSpec
from benchmark.sets.joints import Joint
from benchmark.sets.parameters import ParameterSet
from benchmark.sets.values import Value

__all__ = [
    "REQUIREMENTS",
    "Choice",
    "DrawSettings",
    "NodePair",
    "Policy",
    "PossibleMeasurement",
    "Requirement",
    "Side",
    "Study",
    "draws_allowed",
]

#: requirement -> (unit of its limit, what it demands)
REQUIREMENTS: dict[str, tuple[str, str]] = {
    "deadline": ("s", "path delay with guard-band at most the limit"),
    "noise_margin": ("1", "noise margin over supply, after level degradation, at least the limit"),
    "voltage_gain": ("1", "largest voltage gain of the gate at least the limit"),
    "thermal_noise": ("1", "half the swing over sqrt(kT/C) at least the limit"),
    "hysteresis_window": ("1", "closing minus opening voltage, over the supply, at most the limit"),
    "device_limits": ("1", "smallest margin of the limits the device reports at least the limit"),
    "power_density": ("W/m^2", "power over area at most the limit"),
    "endurance": ("1", "cycles shown at least the cycles of the busiest net over the life"),
    "process_temperature": ("K", "highest process temperature at most the limit"),
    "retention": ("s", "time the state is kept at least the limit"),
    "area": ("1", "area over the strongest contender's area at most the limit"),
    "leakage_power": ("W", "leakage power of the block at most the limit"),
}


class Choice(NamedTuple):
    """Everything chosen for a side but its supply: size [1], threshold shift [V], parallel copies, back bias [V].

    Size, threshold shift and copies are frozen in silicon: one for all rows of a batch. The back bias may be chosen at
    run time, row by row.
    """

    size: float
    threshold_shift: float
    copies: float = 1.0
    back_bias: float = 0.0

    @property
    def frozen(self) -> tuple[float, float, float]:
        """What is frozen in silicon."""
        return self.size, self.threshold_shift, self.copies


@dataclass(frozen=True)
class Side:
    """One side of the comparison: a technology, what may be chosen for it, and its overheads.

    ``circuit``: the circuit it has of its own under the topology own-best (``circuit_spec``: when that is a file);
    empty: the study's. ``mitigation``: what its copies and back biases cost. ``may_gate``: False keeps the supply on
    while idle although the study allows power gating (a rung of the ladder, never a study). ``outlook``: of the
    candidate, sets of the same switch that stand for something else (a target, a limit), shown and never judged.
    """

    id: str
    technology: ParameterSet
    supply: tuple[float, float]
    sizes: tuple[float, ...]
    threshold_shifts: tuple[float, ...]
    overhead: Mapping[str, Value]
    gating: Mapping[str, Value]
    circuit: str = ""
    circuit_spec: CircuitSpec | None = None
    copies: tuple[float, ...] = (1.0,)
    back_biases: tuple[float, ...] = (0.0,)
    mitigation: Mapping[str, Value] = field(default_factory=dict)
    may_gate: bool = True
    outlook: tuple[ParameterSet, ...] = ()

    @property
    def choices(self) -> list[Choice]:
        """Every choice, in the order of the study."""
        return [
            Choice(size, shift, copies, bias)
            for size in self.sizes
            for shift in self.threshold_shifts
            for copies in self.copies
            for bias in self.back_biases
        ]


@dataclass(frozen=True)
class NodePair:
    """One comparison: candidate node, reference node by contender id, and the wires both sides use."""

    label: str
    candidate: str
    reference: Mapping[str, str]
    wires: ParameterSet
    wires_node: str


@dataclass(frozen=True)
class Requirement:
    """One requirement with its limit in SI (None: the deadline is the cycle, or only a life is given)."""

    name: str
    limit: float | None
    unit: str
    kind: str
    fan_in: int
    life: float


@dataclass(frozen=True)
class Policy:
    """The primary policy, the others to report, and what they need."""

    primary: str
    also: tuple[str, ...]
    required_time: float | str
    required_energy: float | None
    exponent: float
    metric: str


#: draws at least (eight independent nets of two) and at most
LEAST_DRAWS, MOST_DRAWS = 16, 2**30


def draws_allowed(number: int) -> str:
    """Return what a number of draws must be, in words; empty when it may be this one."""
    if LEAST_DRAWS <= number <= MOST_DRAWS and number & (number - 1) == 0:
        return ""
    near = min(max(number, LEAST_DRAWS), MOST_DRAWS).bit_length() - 1
    nearest_two = dict.fromkeys([1 << near, min(2 << near, MOST_DRAWS)])
    return f"a power of two from {LEAST_DRAWS} to {MOST_DRAWS}, such as {' or '.join(map(str, nearest_two))}"


@dataclass(frozen=True)
class DrawSettings:
    """How many draws of all ranges together (0: none), from which seed, and when a probability is called likely."""

    number: int = 0
    seed: int = 0
    likely: float = 0.9
    unlikely: float = 0.1


@dataclass(frozen=True)
class PossibleMeasurement:
    """A measurement that could be made of one value: its cost, and the relative standard error it can reach [1]."""

    key: str
    cost: float
    reachable: float


@dataclass(frozen=True)
class Study:
    """A checked study in SI."""

    id: str
    title: str
    declared: str
    owner: str
    demonstration: bool
    note: str
    product_class: str
    product: str
    operation: str
    circuit: str
    circuit_spec: CircuitSpec | None
    timing: str
    leakage_accounting: str
    idle: str
    values: Mapping[str, Value]
    temperatures: tuple[float, ...]
    delay_rule: str
    short_circuit: str
    guard_band_delay: float
    guard_band_leakage: float
    candidate: Side
    contenders: tuple[Side, ...]
    headline: str
    pairs: tuple[NodePair, ...]
    requirements: Mapping[str, Requirement]
    policy: Policy
    required_advantage: float
    invented_inputs: str
    supply_points: int
    refine_relative: float
    file: str
    sha256: str
    text: str
    path: Path
    default_fields: tuple[str, ...] = field(default=())
    topology: str = "same-netlist"
    draws: DrawSettings = field(default_factory=DrawSettings)
    joints: tuple[Joint, ...] = ()
    measurements: tuple[PossibleMeasurement, ...] = ()

    @property
    def wires_sets(self) -> tuple[ParameterSet, ...]:
        """Every wires set the study uses, once."""
        return tuple({pair.wires.id: pair.wires for pair in self.pairs}.values())

    @property
    def sides(self) -> tuple[Side, ...]:
        """Every side, the candidate first."""
        return (self.candidate, *self.contenders)

    def circuit_of(self, side: Side) -> tuple[str, CircuitSpec | None]:
        """Return the name of the circuit a side is judged in, and its file when it is one."""
        if self.topology == "own-best" and side.circuit:
            return side.circuit, side.circuit_spec
        return self.circuit, self.circuit_spec

    @property
    def circuit_specs(self) -> tuple[CircuitSpec, ...]:
        """Return every circuit file in use, the common one first, each once."""
        own = [spec for _, spec in map(self.circuit_of, self.sides)]
        return tuple({spec.id: spec for spec in (self.circuit_spec, *own) if spec is not None}.values())

    @property
    def same_netlist(self) -> Study:
        """Return the study with the common circuit on every side."""
        return dataclasses.replace(self, topology="same-netlist")

    def pair(self, label: str) -> NodePair:
        """Return a node pair by label."""
        return next(pair for pair in self.pairs if pair.label == label)
