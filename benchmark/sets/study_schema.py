"""Shape of a study file and of a circuit file, as strict models (layer 2)."""

from __future__ import annotations

import datetime
from decimal import Decimal
from typing import Literal

from pydantic import Field

from benchmark.sets.schema import (
    DefaultsTable,
    FileModel,
    FreeNote,
    High,
    Identity,
    Joints,
    Low,
    Measure,
    NodeLabel,
    Number,
    Schema,
    Text,
    Title,
    UnitText,
    ValueTable,
    Whole,
)

__all__ = ["CircuitFile", "StudyFile"]

POLICIES = Literal["declared-point", "iso-delay", "iso-energy", "minimum-energy", "minimum-energy-delay", "same-supply"]
METRICS = Literal["energy-per-operation", "time-per-operation", "area", "leakage-power"]


class ProductTable(FileModel):
    """K: the product class."""

    class_: Text = Field(alias="class", description="Product class: what usually decides for products of this kind")
    describe: Text = Field(description="The block in question, in words")


class WorkloadTable(FileModel):
    """W: the operation, the circuit and how time and leakage are counted."""

    operation: Text = Field(description="What one operation is, in words; energy and time are per operation")
    circuit: Text = Field(description="A built-in circuit, or the id of a circuit file")
    topology: Literal["same-netlist", "own-best"] = Field(
        default="same-netlist",
        description="same-netlist: all sides use this circuit; own-best: a side may name one of its own of the same "
        "function, and the result with this circuit is reported beside it",
    )
    timing: Literal["clocked", "self-timed"] = Field(
        description="clocked: one operation per clock cycle; self-timed: one per path delay"
    )
    leakage_accounting: Literal["period", "operation"] = Field(
        description="Leakage is charged over the clock cycle (period) or over the path delay (operation)"
    )
    idle: Literal["none", "ungated", "gated"] = Field(
        default="none",
        description="What the block does between its tasks; ungated and gated need idle_time and active_cycles; "
        "gated: power-gated where that costs less",
    )


class TemperatureList(FileModel):
    """Temperatures at which each side is judged."""

    values: list[Number] = Field(min_length=1, max_length=9, description="Ambient temperatures, in the unit")
    unit: UnitText


class GuardBand(FileModel):
    """Multipliers, the same for both sides; 1 means none and is printed as none."""

    delay: Number = Field(description="Multiplies every delay; 1 means none")
    leakage: Number = Field(description="Multiplies every leakage; 1 means none")


class ConditionsTable(FileModel):
    """What both sides share."""

    temperatures: TemperatureList = Field(description="Ambient temperatures at which each side is judged")
    delay_at: Literal["slowest"] = Field(
        default="slowest", description="Delay counts at each side's slowest temperature"
    )
    leakage_at: Literal["highest"] = Field(default="highest", description="Leakage counts at the highest temperature")
    delay_rule: Literal["chain", "step", "integral", "transient"] = Field(
        description="How R C becomes a delay: chain and step are closed forms, integral follows the actuator, "
        "transient solves a differential equation at declared points"
    )
    short_circuit: Literal["estimated", "none"] = Field(
        default="estimated",
        description="estimated: charge through the opening switch while the input ramps; none: left out",
    )
    wires: Text = Field(description="Wires set both sides use, by id")
    guard_band: GuardBand = Field(description="Multipliers for both sides")


class SupplyKnob(FileModel):
    """Supply range to search."""

    low: Low
    high: High
    unit: UnitText
    scope: Literal["run-time"] = Field(default="run-time", description="The supply may be chosen at run time")


class FrozenKnob(FileModel):
    """Discrete choices frozen in silicon."""

    values: list[Number] = Field(min_length=1, max_length=16, description="The choices, in the unit")
    unit: Text = Field(default="1", description="Unit of the choices; 1 for plain numbers")
    scope: Literal["frozen"] = Field(default="frozen", description="Frozen in silicon")


class BackBiasKnob(FileModel):
    """Back biases to choose from."""

    values: list[Number] = Field(
        min_length=1, max_length=16, description="The biases, in the unit; above 0 is forward and lowers the threshold"
    )
    unit: UnitText
    scope: Literal["run-time"] = Field(default="run-time", description="The bias may be chosen at run time")


class KnobsTable(FileModel):
    """What may be chosen for one side."""

    supply: SupplyKnob = Field(description="Supply range to search [V]")
    size: FrozenKnob | None = Field(default=None, description="Sizes to choose from: units of width, or copies")
    threshold_shift: FrozenKnob | None = Field(
        default=None, description="Threshold shifts to choose from [V]; for models that honour it"
    )
    copies: FrozenKnob | None = Field(
        default=None,
        description="Numbers of parallel copies to choose from; n copies may take n times the required time each, "
        "where operations do not depend on each other",
    )
    back_bias: BackBiasKnob | None = Field(
        default=None, description="Back biases to choose from [V]; for models that honour a threshold shift"
    )


class SideTable(FileModel):
    """One side: its technology, knobs and ledger of overheads (a zero is an entry, not an omission)."""

    technology: Text = Field(description="Technology set, by id")
    id: Text = Field(
        default="", description="Name in results; needed when one technology stands for several contenders"
    )
    outlook: list[Text] = Field(
        default=[],
        max_length=2,
        description="Candidate only: further sets of the same switch by id, such as a target and a physical limit; "
        "drawn and tabled beside it, never judged",
    )
    circuit: Text = Field(
        default="", description="Circuit of this side alone, with workload.topology = own-best; empty: workload.circuit"
    )
    knobs: KnobsTable = Field(description="What may be chosen for this side")
    overhead: dict[str, ValueTable] = Field(
        description="What this side needs around its logic: a ledger, so a zero is an entry"
    )
    gating: dict[str, ValueTable] = Field(default={}, description="Power gating, with workload.idle = gated")
    mitigation: dict[str, ValueTable] = Field(
        default={},
        description="What parallel copies cost, what a back bias does and costs; with the knobs copies, back_bias",
    )


class WiresAt(FileModel):
    """A node of another wires set than the study's."""

    set: Text = Field(description="Wires set, by id")
    node: NodeLabel = Field(description="Node of that wires set")


class NodePair(FileModel):
    """Which label stands against which; ``wires`` is a node of the study's wires set, or of another one."""

    label: NodeLabel = Field(description="Name of the pair in results")
    candidate: NodeLabel = Field(description="Node of the candidate")
    reference: dict[str, NodeLabel] | NodeLabel = Field(
        description="Node of every contender, or one node per contender id"
    )
    wires: NodeLabel | WiresAt = Field(description="Node of the study's wires set, or of another set")


class NodesTable(FileModel):
    """Node pairs in order; the headline pair carries the verdict."""

    headline: NodeLabel = Field(description="Label of the pair that carries the verdict")
    pairs: list[NodePair] = Field(min_length=1, max_length=40, description="Which node stands against which, in order")


class RequirementTable(FileModel):
    """One requirement; ``limit`` is a number with unit, or "cycle" for the deadline."""

    limit: Measure | Literal["cycle"] | None = Field(
        default=None, description="The limit with its unit; for the deadline also the word cycle"
    )
    kind: Literal["hard", "report"] = Field(
        description="hard: bounds the search of both sides; report: judged at the optimum"
    )
    fan_in: Whole | None = Field(
        default=None, description="Inputs of the gates judged: noise_margin and voltage_gain only"
    )
    life: Measure | None = Field(default=None, description="Life in use: endurance only")


class PolicyTable(FileModel):
    """P and X, fixed before the run."""

    primary: POLICIES = Field(description="How each side chooses its design point; carries the verdict")
    also: list[POLICIES] = Field(default=[], description="Further policies to report")
    required_time: Measure | Text | None = Field(
        default=None, description="iso-delay: a time, the word cycle, or contender:<id>"
    )
    required_energy: Measure | None = Field(default=None, description="iso-energy: energy per operation [J]")
    exponent: Number | None = Field(default=None, description="minimum-energy-delay: exponent of the delay")
    metric: METRICS = Field(
        default="energy-per-operation", description="What is compared: advantage = reference / candidate"
    )


class VerdictTable(FileModel):
    """M and how inputs without range and invented inputs count."""

    required_advantage: Number = Field(description="M: the advantage that makes it worth it; M = 2 means half the cost")
    unranged_inputs: Literal["decisive"] = Field(
        default="decisive", description="Inputs without a range count as decisive"
    )
    invented_inputs: Literal["support", "refuse"] = Field(
        default="support", description="support: invented inputs may carry a demonstration; refuse: they carry nothing"
    )


class UncertaintyTable(FileModel):
    """Draws of all stated ranges together, and when their probability is called likely."""

    draws: Whole = Field(default=0, description="Draws of all ranges together: 0 for none, else a power of two from 16")
    seed: Whole = Field(default=0, description="Another seed gives other draws; results differ within the stated error")
    likely: Number = Field(
        default=Decimal("0.9"), description="From this probability of reaching M on, reaching it is called likely"
    )
    unlikely: Number = Field(
        default=Decimal("0.1"), description="Up to this probability of reaching M, reaching it is called unlikely"
    )


class MeasurementTable(FileModel):
    """A measurement that could be made: what it costs and how well it can be done."""

    value: Text = Field(description="Key of the value it would measure, such as demo-switch.actuator_coefficient")
    cost: Number = Field(description="What it costs, in any unit that is the same for all measurements")
    reachable_percent: Number = Field(description="Standard error it can reach, in per cent of the value")


class SearchTable(FileModel):
    """Resolution of the supply search."""

    supply_points: Whole = Field(default=121, description="Points of the supply grid")
    refine_relative: Number = Field(default=1, description="Relative step to which the best grid point is refined")


class StudyFile(FileModel):
    """A study: every slot of the question filled."""

    schema_: Schema
    id: Identity
    title: Title
    declared: datetime.date = Field(description="The day the criteria were fixed, such as 2026-01-31")
    owner: Text = Field(description="Who asks and decides")
    demonstration: bool = Field(default=False, description="true: some inputs are invented, and the verdict says so")
    note: FreeNote = ""
    default: DefaultsTable = Field(default=DefaultsTable(), description="What a value below does not say itself")
    product: ProductTable = Field(description="K: the product class")
    workload: WorkloadTable = Field(description="W: the operation, the circuit, and how time and leakage are counted")
    value: dict[str, ValueTable] = Field(description="Scenario values by catalogue name, the same for both sides")
    joint: Joints = []
    conditions: ConditionsTable = Field(description="What both sides share")
    candidate: SideTable = Field(description="The new switch")
    contender: list[SideTable] = Field(
        min_length=1, max_length=24, description="The rivals; the strongest one is the reference"
    )
    nodes: NodesTable = Field(description="Which node stands against which")
    requirements: dict[str, RequirementTable] = Field(description="Q: what the block must reach")
    policy: PolicyTable = Field(description="P and X: how design points are chosen and what is compared")
    verdict: VerdictTable = Field(description="M: the required advantage")
    uncertainty: UncertaintyTable = Field(
        default=UncertaintyTable(), description="Draws of all stated ranges together, fixed before the run"
    )
    measurement: list[MeasurementTable] = Field(
        default=[], max_length=200, description="Measurements that could be made, with cost and reachable precision"
    )
    search: SearchTable = Field(description="Resolution of the supply search")


class LoadTable(FileModel):
    """Inputs driven at the far end of a net."""

    cell: Text = Field(description="Driven cell: inverter, nand2 to nand8, nor2 to nor8, aoi21, oai22 and the like")
    input: Text = Field(description="Input of that cell: a, b, ...")
    count: Number = Field(default=1, description="How many")


class WireTable(FileModel):
    """Wire of a net."""

    length: Number = Field(description="Length, in the unit")
    length_unit: Text = Field(description="A unit of length, or gate-pitch: pitches of each technology's own gates")
    layer: Text = Field(default="", description="Layer of this file; without it the study's wires set")


class SwingTable(FileModel):
    """A swing fixed from outside."""

    value: Number = Field(description="The swing, in the unit")
    unit: UnitText
    reason: Text = Field(description="What fixes it")


class NetTable(FileModel):
    """One net: its driver, loads, wire and how often it switches."""

    name: Text = Field(description="Name of the net, once per file")
    driver: Text = Field(description="Driving cell: inverter, nand2 to nand8, nor2 to nor8, aoi21, oai22 and the like")
    loads: list[LoadTable] = Field(default=[], description="Driven inputs at the far end")
    fixed_load: Measure | None = Field(default=None, description="A fixed capacitance at the far end [F]")
    wire: WireTable | None = Field(default=None, description="Wire between driver and loads")
    swing: SwingTable | None = Field(default=None, description="A swing fixed from outside [V]; without it the supply")
    rising_per_operation: Number = Field(description="Rising transitions of one such net per operation")
    busiest_per_operation: Number | None = Field(
        default=None, description="Rising transitions of the busiest such net: endurance is judged on it"
    )
    count: Number = Field(default=1, description="Number of alike nets")
    on_critical_path: Number = Field(default=0, description="How many of them follow each other on the critical path")


class LayerTable(FileModel):
    """Wires stated in the circuit override the study's wires set for this layer, on both sides."""

    resistance_per_length: ValueTable = Field(description="Resistance of a wire per length [ohm/um]")
    capacitance_per_length: ValueTable = Field(description="Capacitance of a wire per length [fF/um]")


class CircuitFile(FileModel):
    """A circuit a user writes."""

    schema_: Schema
    id: Identity
    title: Title
    operation: Text = Field(description="What one operation is, in words")
    function: Text = Field(
        default="",
        description="What the circuit computes, with its interface; circuits of the same function may stand against "
        "each other with workload.topology = own-best",
    )
    default: DefaultsTable = Field(default=DefaultsTable(), description="What a value below does not say itself")
    net: list[NetTable] = Field(
        min_length=1, max_length=5000, description="Nets of the circuit: one table per kind of net"
    )
    layer: dict[str, LayerTable] = Field(default={}, description="Wires of this circuit's own, the same for both sides")
