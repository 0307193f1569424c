"""From a study file to a ``Study``: every problem of every slot in one pass (layer 2)."""

from __future__ import annotations

import dataclasses
from collections.abc import Mapping, Sequence
from typing import Any

from benchmark.catalogue import PRODUCT_CLASSES, QUANTITIES, STUDY_QUANTITIES
from benchmark.errors import nearest
from benchmark.sets.circuit_file import CircuitSpec
from benchmark.sets.files import TomlFile, shown
from benchmark.sets.joints import read_joints
from benchmark.sets.library import Library
from benchmark.sets.parameters import ParameterSet, check_formulas
from benchmark.sets.problems import Collector
from benchmark.sets.schema import Measure, validate_values
from benchmark.sets.study import NodePair, Side, Study
from benchmark.sets.study_circuits import CircuitDeclaration, study_circuits
from benchmark.sets.study_draws import read_draws, read_measurements
from benchmark.sets.study_policy import check_declared_supplies, read_policy, read_requirements
from benchmark.sets.study_schema import BackBiasKnob, FrozenKnob, KnobsTable, SideTable, StudyFile
from benchmark.sets.study_schema import NodePair as NodePairTable
from benchmark.sets.values import Place, Value, convert_measure, convert_value
from benchmark.units import UnitError, parse_unit, to_si

__all__ = ["GATING", "LENGTHS", "MITIGATION", "OPTIONAL_OVERHEADS", "OVERHEADS", "CircuitDeclaration", "build_study"]

#: values of a side's ledger of overheads, and of its power gating
OVERHEADS = ("level_shifter_energy", "supply_efficiency", "overhead_power")
OPTIONAL_OVERHEADS = ("level_shifter_delay",)
#: supplies on the curves of a study that uses the transient rule
TRANSIENT_POINTS = 9
#: two ways to state a net length, of which a study takes one
LENGTHS = ("average_net_length", "average_net_pitches")
GATING = ("residual_leakage", "wake_energy_cycles")
#: knob -> values that a side with it states
MITIGATION = {
    "copies": ("routing_overhead", "repeated_share", "area_share"),
    "back_bias": ("body_factor", "back_bias_power"),
}


class _Builder:
    """Walks a parsed study once, sending every problem to the collector."""

    def __init__(
        self,
        parsed: StudyFile,
        file: TomlFile,
        library: Library,
        circuits: Mapping[str, CircuitDeclaration],
        spoiled: frozenset[str],
    ) -> None:
        self.parsed, self.file, self.library = parsed, file, library
        self.collector: Collector = library.collector
        self.sources = frozenset(library.sources)
        self.study_values: Mapping[str, Value] = {}
        self.stated = spoiled | frozenset(parsed.value)  # also values that could not be read
        self.circuits = study_circuits(parsed, library, circuits, self.refuse)

    def refuse(self, dotted: str, what: str, found: str = "", allowed: str = "", hint: str = "") -> None:
        self.collector.add(self.file.problem(dotted, what, found, allowed, hint))

    def place(self, dotted: str) -> Place:
        return Place(self.file, dotted, self.parsed.default, self.sources)

    def measure(
        self, measure: Measure, unit: str, dotted: str, low: float | None = 0.0, key: str = "value"
    ) -> float | None:
        return convert_measure(measure, unit, low, self.place(dotted), self.collector, key)

    def word(self, dotted: str, text: str, allowed: Sequence[str]) -> None:
        if text not in allowed:
            self.refuse(
                dotted, "is not one of the allowed words", repr(text), ", ".join(allowed), nearest(text, allowed)
            )

    # -- values ---------------------------------------------------------------------------------------------

    def needed_values(self) -> tuple[set[str], set[str]]:
        """Names the study must give, and names it may give."""
        parsed = self.parsed
        must, may = self.circuits.required, self.circuits.usable - {"busiest_activity"}
        if parsed.workload.timing == "clocked":
            must.add("clock_frequency")
        if parsed.workload.idle != "none":
            must |= {"idle_time", "active_cycles"}
        if "endurance" in parsed.requirements:
            if self.circuits.declared:
                must.add("busiest_activity")
            if parsed.workload.idle == "none":
                must.add("duty")
            if parsed.workload.timing == "self-timed":
                may.add("clock_frequency")
        return must, may

    def values(self) -> dict[str, Value]:
        must, may = self.needed_values()
        names = {quantity.name for quantity in STUDY_QUANTITIES}
        if self.circuits.unknown:
            may = names  # a circuit is refused: what it would need is not known
        allowed = sorted(must | may)
        found: dict[str, Value] = {}
        for name, table in self.parsed.value.items():
            dotted = f"value.{name}"
            if name not in allowed:
                what = (
                    "is not used by this circuit, timing, idle mode and requirements"
                    if name in names
                    else "is not a known name"
                )
                self.refuse(dotted, what, "", ", ".join(allowed), nearest(name, allowed))
                continue
            value = convert_value(QUANTITIES[name], table, [""], self.place(dotted), self.collector)
            if value is not None:
                found[name] = value
        check_formulas(found, self.file, {**dict.fromkeys(self.stated), **self.parsed.value}, self.collector)
        self.study_values = found
        for name in self.circuits.whole:
            if name in found and found[name].spread is not None:
                self.refuse(f"value.{name}.spread", "is not possible: the number shapes the netlist of the circuit")
        for name in sorted(must - self.stated):
            self.refuse(f"value.{name}", f"is missing ({QUANTITIES[name].meaning})", "", QUANTITIES[name].example)
        for group, needed in self.circuits.groups:
            stated = [name for name in group if name in self.stated]
            if len(stated) > 1 or (needed and not stated):
                self.refuse("value", f"needs exactly one of {' and '.join(group)}", ", ".join(stated) or "none")
        return found

    # -- sides ----------------------------------------------------------------------------------------------

    def frozen(
        self, knob: FrozenKnob | BackBiasKnob | None, unit_like: str, dotted: str, neutral: float
    ) -> tuple[float, ...]:
        if knob is None:
            return (neutral,)
        found = []
        for number in knob.values:
            si = self.measure(Measure(value=number, unit=knob.unit), unit_like, dotted, None)
            if si is not None:
                found.append(si)
        if len(set(found)) != len(found):
            self.refuse(dotted, "names a value twice")
        return tuple(found)

    def side(self, table: SideTable, dotted: str) -> Side | None:
        where = self.file.problem(f"{dotted}.technology", "")
        technology = self.library.load(table.technology, "technologies", where)
        span, place = table.knobs.supply, f"{dotted}.knobs.supply"
        low, high = (
            self.measure(Measure(value=number, unit=span.unit), "V", place, key=key)
            for key, number in (("low", span.low), ("high", span.high))
        )
        if low is not None and high is not None and not 0.0 < low <= high:
            self.refuse(place, "needs 0 < low <= high", f"{span.low} to {span.high} {span.unit}")
        sizes = self.frozen(table.knobs.size, "1", f"{dotted}.knobs.size", 1.0)
        if any(size <= 0 for size in sizes):
            self.refuse(f"{dotted}.knobs.size", "must be above 0")
        shifts = self.frozen(table.knobs.threshold_shift, "V", f"{dotted}.knobs.threshold_shift", 0.0)
        overhead = self.ledger(table.overhead, (*OVERHEADS,), OPTIONAL_OVERHEADS, f"{dotted}.overhead")
        gated = self.parsed.workload.idle == "gated"
        gating = self.ledger(table.gating, GATING if gated else (), (), f"{dotted}.gating")
        copies, biases, mitigation = self.mitigations(table, dotted)
        if technology is None or low is None or high is None:
            return None
        if technology.kind != "technology":
            self.refuse(f"{dotted}.technology", "is a wires set", repr(table.technology))
            return None
        knobs = getattr(self.library.declarations(technology.model), "knobs", ())
        if table.knobs.threshold_shift is not None and "threshold_shift" not in knobs and any(shifts):
            self.refuse(f"{dotted}.knobs.threshold_shift", f"has no effect with the model {technology.model}")
        if table.knobs.back_bias is not None and "threshold_shift" not in knobs:
            self.refuse(f"{dotted}.knobs.back_bias", f"has no effect with the model {technology.model}")
        circuit = self.circuits.own.get(dotted, "")
        spec = self.circuits.specs.get(circuit)
        return Side(
            table.id or technology.id,
            technology,
            (low, high),
            sizes,
            shifts,
            overhead,
            gating,
            circuit,
            spec,
            copies,
            biases,
            mitigation,
        )

    def outlook(self, side: Side) -> Side:
        """Read the candidate's further sets: the same model, its node of the headline pair, each for something else."""
        found: list[ParameterSet] = []
        nodes = [pair.candidate for pair in self.parsed.nodes.pairs if pair.label == self.parsed.nodes.headline]
        dotted = "candidate.outlook"
        for name in self.parsed.candidate.outlook:
            item = self.library.load(name, "technologies", self.file.problem(dotted, ""))
            if item is None:
                continue
            if item.kind != "technology" or item.model != side.technology.model:
                allowed = f"technology sets of the model {side.technology.model}"
                self.refuse(dotted, "is not a set of the candidate's model", repr(name), allowed)
                continue
            stated = {other.ambition: other.id for other in (side.technology, *found)}
            if item.ambition in stated:
                what = f"stands for {item.ambition}, as {stated[item.ambition]} does"
                self.refuse(dotted, what, repr(name), "one set each for today, target, limit")
            for node in nodes:
                if node not in item.nodes:
                    what = f"{item.id} has no node of the headline pair"
                    self.refuse(dotted, what, repr(node), ", ".join(item.nodes), nearest(node, item.nodes))
            found.append(item)
        return dataclasses.replace(side, outlook=tuple(found))

    def mitigations(
        self, table: SideTable, dotted: str
    ) -> tuple[tuple[float, ...], tuple[float, ...], dict[str, Value]]:
        """Read parallel copies and back bias with what they cost; neutral without their knobs."""
        knobs: KnobsTable = table.knobs
        copies = self.frozen(knobs.copies, "1", f"{dotted}.knobs.copies", 1.0)
        if any(number < 1.0 or number != round(number) for number in copies):
            found = ", ".join(f"{number:g}" for number in copies)
            self.refuse(f"{dotted}.knobs.copies", "must be whole numbers from 1", found, "such as 1, 2, 4")
        biases = self.frozen(knobs.back_bias, "V", f"{dotted}.knobs.back_bias", 0.0)
        must = [name for knob, names in MITIGATION.items() if getattr(knobs, knob) is not None for name in names]
        return copies, biases, self.ledger(table.mitigation, must, (), f"{dotted}.mitigation")

    def ledger(
        self, tables: Mapping[str, Any], must: Sequence[str], may: Sequence[str], dotted: str
    ) -> dict[str, Value]:
        found: dict[str, Value] = {}
        for name, table in tables.items():
            place = f"{dotted}.{name}"
            if name not in (*must, *may):
                self.refuse(
                    place, "is not used here", "", ", ".join((*must, *may)) or "nothing", nearest(name, (*must, *may))
                )
                continue
            value = convert_value(QUANTITIES[name], table, [""], self.place(place), self.collector)
            if value is not None:
                found[name] = value
        for name in must:
            if name not in tables:
                self.refuse(
                    f"{dotted}.{name}",
                    "is missing (a zero is an entry, not an omission)",
                    "",
                    QUANTITIES[name].example,
                )
        check_formulas(found, self.file, tables, self.collector, dotted, self.study_values)
        return found

    def sides(self) -> tuple[Side | None, list[Side]]:
        candidate = self.side(self.parsed.candidate, "candidate")
        if candidate is not None and self.parsed.candidate.outlook:
            candidate = self.outlook(candidate)
        contenders = []
        for position, table in enumerate(self.parsed.contender):
            if table.outlook:
                self.refuse(f"contender.{position}.outlook", "belongs to the candidate alone", ", ".join(table.outlook))
            side = self.side(table, f"contender.{position}")
            if side is not None:
                contenders.append(side)
        ids = [side.id for side in contenders]
        for repeated in sorted({name for name in ids if ids.count(name) > 1}):
            self.refuse("contender", "two contenders have the same id", repr(repeated))
        return candidate, contenders

    # -- nodes ----------------------------------------------------------------------------------------------

    def wires_set(self, name: str, dotted: str) -> ParameterSet | None:
        found = self.library.load(name, "wires", self.file.problem(dotted, ""))
        if found is not None and found.kind != "wires":
            self.refuse(dotted, "is not a wires set", repr(name))
            return None
        return found

    def wires_of(self, pair: NodePairTable, default: ParameterSet | None) -> tuple[ParameterSet | None, str]:
        if isinstance(pair.wires, str):
            return default, pair.wires
        return self.wires_set(pair.wires.set, "nodes.pairs"), pair.wires.node

    def pairs(self, candidate: Side | None, contenders: Sequence[Side], wires: ParameterSet | None) -> list[NodePair]:
        found = []
        labels = [pair.label for pair in self.parsed.nodes.pairs]
        for repeated in sorted({label for label in labels if labels.count(label) > 1}):
            self.refuse("nodes.pairs", "a label appears twice", repr(repeated))
        if self.parsed.nodes.headline not in labels:
            self.refuse(
                "nodes.headline",
                "is not the label of a pair",
                repr(self.parsed.nodes.headline),
                ", ".join(labels),
                nearest(self.parsed.nodes.headline, labels),
            )
        ids = [table.id or table.technology for table in self.parsed.contender]  # also those whose set is refused
        for pair in self.parsed.nodes.pairs:
            dotted = "nodes.pairs"
            if candidate is not None and pair.candidate not in candidate.technology.nodes:
                self.refuse(
                    dotted,
                    f"the candidate {candidate.technology.id} has no node",
                    repr(pair.candidate),
                    ", ".join(candidate.technology.nodes),
                    nearest(pair.candidate, candidate.technology.nodes),
                )
            reference = pair.reference if isinstance(pair.reference, dict) else dict.fromkeys(ids, pair.reference)
            for name in reference:
                if name not in ids:
                    self.refuse(
                        dotted, "names a contender that is not listed", repr(name), ", ".join(ids), nearest(name, ids)
                    )
            for side in contenders:
                node = reference.get(side.id)
                if node is not None and node not in side.technology.nodes:
                    self.refuse(
                        dotted,
                        f"the reference {side.technology.id} has no node",
                        repr(node),
                        ", ".join(side.technology.nodes),
                        nearest(node, side.technology.nodes),
                    )
            if not reference:
                self.refuse(dotted, "names no reference node", repr(pair.label))
            self.one_node_each(pair.label, pair.candidate, reference, candidate, contenders)
            deciding = str(self.parsed.policy.required_time).removeprefix("contender:")
            if deciding in ids and deciding not in reference:
                self.refuse(dotted, "leaves out the contender that sets the required time", repr(pair.label), deciding)
            used, node = self.wires_of(pair, wires)
            if used is None:
                continue
            if node not in used.nodes:
                self.refuse(
                    dotted,
                    f"the wires set {used.id} has no node",
                    repr(node),
                    ", ".join(used.nodes),
                    nearest(node, used.nodes),
                )
            found.append(NodePair(pair.label, pair.candidate, dict(reference), used, node))
        for name in ids:
            if found and not any(name in pair.reference for pair in found):
                self.refuse("contender", "stands in no node pair", repr(name))
        return found

    def one_node_each(
        self,
        label: str,
        node: str,
        reference: Mapping[str, str],
        candidate: Side | None,
        contenders: Sequence[Side],
    ) -> None:
        """In one comparison a technology has one node, for each of its values has one ledger key."""
        nodes: dict[str, set[str]] = {}
        if candidate is not None:
            nodes[candidate.technology.id] = {node}
        for side in contenders:
            if side.id in reference:
                nodes.setdefault(side.technology.id, set()).add(reference[side.id])
        for name, several in nodes.items():
            if len(several) > 1:
                self.refuse(
                    "nodes.pairs",
                    f"compares two nodes of {name} in pair {label}",
                    ", ".join(sorted(several)),
                    "one node of a technology per pair",
                    "give the other node a set of its own",
                )

    def temperatures(self) -> tuple[float, ...]:
        table = self.parsed.conditions.temperatures
        try:
            unit = parse_unit(table.unit)
        except UnitError as error:
            self.refuse("conditions.temperatures", f"unknown unit: {error}")
            return ()
        if unit.dimension != parse_unit("K").dimension:
            self.refuse("conditions.temperatures", "has the wrong dimension", repr(table.unit), "K or degC")
            return ()
        found = tuple(sorted(to_si(number, unit) for number in table.values))
        if found and found[0] <= 0.0:
            self.refuse("conditions.temperatures", "is at or below absolute zero", f"{found[0]:g} K")
        if len(set(found)) != len(found):
            self.refuse("conditions.temperatures", "names a temperature twice")
        return found

    def number(self, dotted: str, value: Any, low: float, high: float) -> float:
        number = float(value)
        if not low <= number <= high:
            self.refuse(dotted, "is out of range", shown(value), f"{low:g} to {high:g}")
        return number


def build_study(file: TomlFile, library: Library, circuits: Mapping[str, CircuitDeclaration]) -> Study | None:
    """Validate and convert a study with everything it refers to.

    Parameters
    ----------
    file : TomlFile
    library : Library
        Finds the sets, the wires and the sources; its collector receives every problem.
    circuits : mapping
        Built-in circuit name -> what it declares.
    """
    before = len(library.collector.problems)
    parsed, spoiled = validate_values(StudyFile, file, library.collector)
    if parsed is None:
        return None
    build = _Builder(parsed, file, library, circuits, spoiled)
    build.word("product.class", parsed.product.class_, list(PRODUCT_CLASSES))
    circuit = parsed.workload.circuit
    spec = build.circuits.specs.get(circuit)
    values = build.values()
    temperatures = build.temperatures()
    wires = build.wires_set(parsed.conditions.wires, "conditions.wires")
    candidate, contenders = build.sides()
    pairs = build.pairs(candidate, contenders, wires)
    requirements = read_requirements(build)
    policy = read_policy(build)
    advantage = build.number("verdict.required_advantage", parsed.verdict.required_advantage, 1e-6, 1e6)
    delay_band = build.number("conditions.guard_band.delay", parsed.conditions.guard_band.delay, 1.0, 100.0)
    leakage_band = build.number("conditions.guard_band.leakage", parsed.conditions.guard_band.leakage, 1.0, 1e6)
    points = int(build.number("search.supply_points", parsed.search.supply_points, 3, 5001))
    refine = build.number("search.refine_relative", parsed.search.refine_relative, 1e-12, 1.0)
    draws = read_draws(build)
    joints, values = read_joints(parsed.joint, values, file, library.collector)
    _check_transient(build, points)
    _check_temperatures(build, temperatures, [*contenders, *_every_set(candidate)])
    _check_self_comparison(build, candidate, contenders)
    if candidate is not None and contenders:
        check_declared_supplies(build, policy, candidate, contenders)
    _check_invented(build, values, candidate, contenders, [pair.wires for pair in pairs], spec)
    measurements = read_measurements(build, values, [*contenders, *([candidate] if candidate else [])], pairs)
    if len(library.collector.problems) > before or candidate is None or wires is None or not contenders:
        return None
    return Study(
        parsed.id,
        parsed.title,
        parsed.declared.isoformat(),
        parsed.owner,
        parsed.demonstration,
        parsed.note,
        parsed.product.class_,
        parsed.product.describe,
        parsed.workload.operation,
        circuit,
        spec,
        parsed.workload.timing,
        parsed.workload.leakage_accounting,
        parsed.workload.idle,
        values,
        temperatures,
        parsed.conditions.delay_rule,
        parsed.conditions.short_circuit,
        delay_band,
        leakage_band,
        candidate,
        tuple(contenders),
        parsed.nodes.headline,
        tuple(pairs),
        requirements,
        policy,
        advantage,
        parsed.verdict.invented_inputs,
        points,
        refine,
        file.name,
        file.sha256,
        file.text,
        file.path,
        topology=parsed.workload.topology,
        draws=draws,
        joints=joints,
        measurements=measurements,
    )


def _check_transient(build: _Builder, points: int) -> None:
    """The transient rule solves every point apart: declared points only, and few supplies on the curves."""
    if build.parsed.conditions.delay_rule != "transient":
        return
    table = build.parsed.policy
    slow = sorted({table.primary, *table.also} - {"declared-point", "same-supply"})
    if slow:
        build.refuse(
            "conditions.delay_rule",
            "transient solves a differential equation at every point and cannot search a supply",
            ", ".join(slow),
            "declared-point and same-supply",
            "use chain: reports show its difference to the transient at the points the verdict rests on",
        )
    if points > TRANSIENT_POINTS:
        build.refuse(
            "search.supply_points", "is too many for the transient rule", str(points), f"3 to {TRANSIENT_POINTS}"
        )


def _every_set(candidate: Side | None) -> list[Side]:
    """Return the candidate with each of its sets in turn."""
    if candidate is None:
        return []
    return [candidate, *(dataclasses.replace(candidate, technology=item) for item in candidate.outlook)]


def _check_temperatures(build: _Builder, temperatures: Sequence[float], sides: Sequence[Side]) -> None:
    """Every temperature of the study must lie in the validity range of every set that states one."""
    for technology in {side.technology.id: side.technology for side in sides}.values():
        if "temperature" not in technology.valid:
            continue
        low, high = technology.valid["temperature"]
        for temperature in temperatures:
            if temperature > 0.0 and not low <= temperature <= high:
                build.refuse(
                    "conditions.temperatures",
                    f"is outside the validity of {technology.id}",
                    f"{temperature:g} K",
                    f"{low:g} to {high:g} K",
                )


def _check_self_comparison(build: _Builder, candidate: Side | None, contenders: Sequence[Side]) -> None:
    """The candidate may stand among the contenders only when its id says that this is a self-comparison."""
    for side in contenders:
        if candidate is not None and side.technology.id == candidate.technology.id and "self-comparison" not in side.id:
            build.refuse(
                "contender",
                "the candidate's technology is also a contender",
                repr(side.technology.id),
                "",
                'if this is meant, give the contender an id containing "self-comparison"',
            )


def _check_invented(
    build: _Builder,
    values: Mapping[str, Value],
    candidate: Side | None,
    contenders: Sequence[Side],
    wires: Sequence[ParameterSet],
    circuit: CircuitSpec | None,
) -> None:
    """A study with invented inputs must call itself a demonstration, and only then."""
    groups: list[list[Value]] = [list(values.values()), *(list(item.values.values()) for item in wires)]
    groups += [list(layer.values()) for layer in circuit.layers.values()] if circuit is not None else []
    for side in [*contenders, *_every_set(candidate)]:
        groups += [
            list(table.values()) for table in (side.technology.values, side.overhead, side.gating, side.mitigation)
        ]
        for table in side.technology.tables.values():
            if table.evidence == "invented" and not build.parsed.demonstration:
                build.refuse("demonstration", "must be true: a table of an input set is invented", table.file)
                return
        if (
            any(evidence == "invented" for evidence, _ in side.technology.rows_rest_on)
            and not build.parsed.demonstration
        ):
            build.refuse("demonstration", "must be true: stage results of a set are invented", side.technology.id)
            return
    invented = sorted({value.name for group in groups for value in group if value.evidence == "invented"})
    if invented and not build.parsed.demonstration:
        build.refuse("demonstration", "must be true: some inputs are invented", ", ".join(invented[:5]))
