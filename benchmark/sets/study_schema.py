"""Shape of a study file and of a circuit file, as strict models (layer 2)."""

from __future__ import annotations

import datetime
from typing import Annotated, Literal

from pydantic import Field

from benchmark.sets.schema import DefaultsTable, FileModel, Label, Measure, NodeLabel, Number, Text, ValueTable

__all__ = ["CircuitFile", "StudyFile"]

POLICIES = Literal["declared-point", "iso-delay", "iso-energy", "minimum-energy", "minimum-energy-delay", "same-supply"]
METRICS = Literal["energy-per-operation", "time-per-operation", "area", "leakage-power"]


class ProductTable(FileModel):
    """K: the product class."""

    class_: Text = Field(alias="class")
    describe: Text


class WorkloadTable(FileModel):
    """W: the operation, the circuit and how time and leakage are counted."""

    operation: Text
    circuit: Text
    topology: Literal["same-netlist"] = "same-netlist"
    timing: Literal["clocked", "self-timed"]
    leakage_accounting: Literal["period", "operation"]
    idle: Literal["none", "ungated", "gated"] = "none"


class TemperatureList(FileModel):
    """Temperatures at which each side is judged."""

    values: Annotated[list[Number], Field(min_length=1, max_length=9)]
    unit: Text


class GuardBand(FileModel):
    """Multipliers, the same for both sides; 1 means none and is printed as none."""

    delay: Number
    leakage: Number


class ConditionsTable(FileModel):
    """What both sides share."""

    temperatures: TemperatureList
    delay_at: Literal["slowest"] = "slowest"
    leakage_at: Literal["highest"] = "highest"
    delay_rule: Literal["chain", "step", "integral", "transient"]
    short_circuit: Literal["estimated", "none"] = "estimated"
    wires: Text
    guard_band: GuardBand


class SupplyKnob(FileModel):
    """Supply range to search."""

    low: Number
    high: Number
    unit: Text
    scope: Literal["run-time"] = "run-time"


class FrozenKnob(FileModel):
    """Discrete choices frozen in silicon."""

    values: Annotated[list[Number], Field(min_length=1, max_length=16)]
    unit: Text = "1"
    scope: Literal["frozen"] = "frozen"


class KnobsTable(FileModel):
    """What may be chosen for one side."""

    supply: SupplyKnob
    size: FrozenKnob | None = None
    threshold_shift: FrozenKnob | None = None


class SideTable(FileModel):
    """One side: its technology, knobs and ledger of overheads (a zero is an entry, not an omission)."""

    technology: Text
    id: Text = ""
    knobs: KnobsTable
    overhead: dict[str, ValueTable]
    gating: dict[str, ValueTable] = {}


class WiresAt(FileModel):
    """A node of another wires set than the study's."""

    set: Text
    node: NodeLabel


class NodePair(FileModel):
    """Which label stands against which; ``wires`` is a node of the study's wires set, or of another one."""

    label: NodeLabel
    candidate: NodeLabel
    reference: dict[str, NodeLabel] | NodeLabel
    wires: NodeLabel | WiresAt


class NodesTable(FileModel):
    """Node pairs in order; the headline pair carries the verdict."""

    headline: NodeLabel
    pairs: Annotated[list[NodePair], Field(min_length=1, max_length=40)]


class RequirementTable(FileModel):
    """One requirement; ``limit`` is a number with unit, or "cycle" for the deadline."""

    limit: Measure | Literal["cycle"] | None = None
    kind: Literal["hard", "report"]
    fan_in: int | None = None
    life: Measure | None = None


class PolicyTable(FileModel):
    """P and X, fixed before the run."""

    primary: POLICIES
    also: list[POLICIES] = []
    required_time: Measure | Text | None = None
    required_energy: Measure | None = None
    exponent: Number | None = None
    metric: METRICS = "energy-per-operation"


class VerdictTable(FileModel):
    """M and how inputs without range and invented inputs count."""

    required_advantage: Number
    unranged_inputs: Literal["decisive"] = "decisive"
    invented_inputs: Literal["support", "refuse"] = "support"


class SearchTable(FileModel):
    """Resolution of the supply search."""

    supply_points: int = 121
    refine_relative: Number = 1


class StudyFile(FileModel):
    """A study: every slot of the question filled."""

    schema_: Literal[1] = Field(alias="schema")
    id: Label
    title: Text
    declared: datetime.date
    owner: Text
    demonstration: bool = False
    note: Text = ""
    default: DefaultsTable = DefaultsTable()
    product: ProductTable
    workload: WorkloadTable
    value: dict[str, ValueTable]
    conditions: ConditionsTable
    candidate: SideTable
    contender: Annotated[list[SideTable], Field(min_length=1, max_length=24)]
    nodes: NodesTable
    requirements: dict[str, RequirementTable]
    policy: PolicyTable
    verdict: VerdictTable
    search: SearchTable


class LoadTable(FileModel):
    """Inputs driven at the far end of a net."""

    cell: Text
    input: Text
    count: Number = 1


class WireTable(FileModel):
    """Wire of a net."""

    length: Number
    length_unit: Text
    layer: Text = ""


class SwingTable(FileModel):
    """A swing fixed from outside."""

    value: Number
    unit: Text
    reason: Text


class NetTable(FileModel):
    """One net: its driver, loads, wire and how often it switches."""

    name: Text
    driver: Text
    loads: list[LoadTable] = []
    fixed_load: Measure | None = None
    wire: WireTable | None = None
    swing: SwingTable | None = None
    rising_per_operation: Number
    busiest_per_operation: Number | None = None
    count: Number = 1
    on_critical_path: Number = 0


class LayerTable(FileModel):
    """Wires stated in the circuit override the study's wires set for this layer, on both sides."""

    resistance_per_length: ValueTable
    capacitance_per_length: ValueTable


class CircuitFile(FileModel):
    """A circuit a user writes."""

    schema_: Literal[1] = Field(alias="schema")
    id: Label
    title: Text
    operation: Text
    default: DefaultsTable = DefaultsTable()
    net: Annotated[list[NetTable], Field(min_length=1, max_length=5000)]
    layer: dict[str, LayerTable] = {}
