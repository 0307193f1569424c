"""Requirements and policies of a study file (layer 2)."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Protocol

from benchmark.errors import nearest
from benchmark.sets.files import shown
from benchmark.sets.schema import Measure
from benchmark.sets.study import REQUIREMENTS, Policy, Requirement, Side
from benchmark.sets.study_schema import StudyFile

__all__ = ["DIAGNOSTIC", "check_declared_supplies", "read_policy", "read_requirements"]

#: policies that are reported and never give a verdict
DIAGNOSTIC = frozenset({"same-supply"})


class Builder(Protocol):
    """What this module needs of the study builder."""

    @property
    def parsed(self) -> StudyFile: ...
    def refuse(self, dotted: str, what: str, found: str = "", allowed: str = "", hint: str = "") -> None: ...
    def measure(self, measure: Measure, unit: str, dotted: str) -> float | None: ...
    def word(self, dotted: str, text: str, allowed: Sequence[str]) -> None: ...


def above_zero(build: Builder, measure: Measure, unit: str, dotted: str) -> float | None:
    """Convert a number that must be above zero; None after recording a problem."""
    si = build.measure(measure, unit, dotted)
    if si == 0.0:
        build.refuse(f"{dotted}.value", "must be above 0", shown(measure.value))
        return None
    return si


def read_requirements(build: Builder) -> dict[str, Requirement]:
    """Read Q: every requirement with its limit in SI."""
    found: dict[str, Requirement] = {}
    for name, table in build.parsed.requirements.items():
        dotted = f"requirements.{name}"
        if name not in REQUIREMENTS:
            build.refuse(dotted, "is not a known requirement", "", ", ".join(REQUIREMENTS), nearest(name, REQUIREMENTS))
            continue
        unit, _ = REQUIREMENTS[name]
        limit, life = None, 0.0
        if name == "endurance":
            if table.limit is not None or table.life is None:
                build.refuse(dotted, "needs a life and no limit", "", 'life = { value = 10.0, unit = "year" }')
            else:
                life = above_zero(build, table.life, "s", f"{dotted}.life") or 0.0
        elif table.limit == "cycle":
            if name != "deadline" or build.parsed.workload.timing != "clocked":
                build.refuse(f"{dotted}.limit", 'may be "cycle" only for the deadline of a clocked workload')
        elif table.limit is None or isinstance(table.limit, str):
            build.refuse(dotted, "has no limit", "", f'limit = {{ value = ..., unit = "{unit}" }}')
        else:
            limit = above_zero(build, table.limit, unit, f"{dotted}.limit")
        if table.life is not None and name != "endurance":
            build.refuse(f"{dotted}.life", "belongs to endurance only")
        functional = name in ("noise_margin", "voltage_gain")
        if table.fan_in is not None and not functional:
            build.refuse(f"{dotted}.fan_in", "belongs to noise_margin and voltage_gain only")
        if table.fan_in is not None and not 1 <= table.fan_in <= 16:
            build.refuse(f"{dotted}.fan_in", "is out of range", str(table.fan_in), "1 to 16")
        found[name] = Requirement(name, limit, unit, table.kind, table.fan_in or 1, life)
    return {name: found[name] for name in REQUIREMENTS if name in found}


def read_policy(build: Builder) -> Policy:
    """Read P and X: the policies, what they need, and the metric."""
    table = build.parsed.policy
    used: set[str] = {table.primary, *table.also}
    if table.primary in DIAGNOSTIC:
        build.refuse("policy.primary", "is a diagnostic and gives no verdict", repr(table.primary))
    energy = None
    if table.required_energy is not None:
        if "iso-energy" not in used:
            build.refuse("policy.required_energy", "is used by iso-energy only, which is not asked for")
        energy = above_zero(build, table.required_energy, "J", "policy.required_energy")
    elif "iso-energy" in used:
        build.refuse("policy.required_energy", "is missing", "", "{ value, unit }", "iso-energy needs it")
    exponent = 1.0
    if table.exponent is not None:
        exponent = float(table.exponent)
        if "minimum-energy-delay" not in used:
            build.refuse("policy.exponent", "is used by minimum-energy-delay only, which is not asked for")
        if not 0.0 < exponent <= 10.0:
            build.refuse("policy.exponent", "is out of range", shown(table.exponent), "above 0, at most 10")
    elif "minimum-energy-delay" in used:
        build.refuse("policy.exponent", "is missing", "", "exponent = 1.0", "minimum-energy-delay needs it")
    also = tuple(dict.fromkeys(name for name in table.also if name != table.primary))
    return Policy(table.primary, also, _required_time(build, used), energy, exponent, table.metric)


def _required_time(build: Builder, used: set[str]) -> float | str:
    """Return T*: a time [s], "cycle", "contender:<id>", or nothing."""
    table = build.parsed.policy
    if table.required_time is None:
        if "iso-delay" in used:
            allowed = '"cycle", "contender:<id>" or { value, unit }'
            build.refuse("policy.required_time", "is missing", "", allowed, "iso-delay needs it")
        return ""
    if not used & {"iso-delay", "minimum-energy"}:
        build.refuse("policy.required_time", "is used by iso-delay and minimum-energy only, which are not asked for")
    if not isinstance(table.required_time, str):
        return above_zero(build, table.required_time, "s", "policy.required_time") or 0.0
    names = [f"contender:{side.id or side.technology}" for side in build.parsed.contender]
    cycle = ["cycle"] if build.parsed.workload.timing == "clocked" else []
    build.word("policy.required_time", table.required_time, [*cycle, *names])
    return table.required_time


def check_declared_supplies(build: Builder, policy: Policy, candidate: Side, contenders: Sequence[Side]) -> None:
    """Some policies stand on supplies that the sets declare; a set that declares none is refused by name."""
    used = {policy.primary, *policy.also}
    needed: list[tuple[str, Side]] = []
    if "declared-point" in used:
        needed += [("declared-point", side) for side in (candidate, *contenders)]
    if "same-supply" in used:
        needed.append(("same-supply", contenders[0]))
    deciding = str(policy.required_time)
    needed += [(deciding, side) for side in contenders if deciding == f"contender:{side.id}"]
    for reason, side in needed:
        if "declared_supply" not in side.technology.values:
            build.refuse("policy", f"{reason} needs declared_supply in the set {side.technology.id}")
