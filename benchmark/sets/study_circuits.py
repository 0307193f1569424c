"""Which circuits a study uses: the one all sides share, and each side's own best one (layer 2)."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, field
from typing import Protocol

from benchmark.errors import nearest
from benchmark.sets.circuit_file import CircuitSpec, read_circuit
from benchmark.sets.library import Library
from benchmark.sets.study_schema import StudyFile

__all__ = ["OWN_BEST", "CircuitDeclaration", "StudyCircuits", "study_circuits"]

OWN_BEST = "own-best"
#: place, what, found, allowed, hint
Refuse = Callable[[str, str, str, str, str], None]


class CircuitDeclaration(Protocol):
    """What this layer needs to know of a built-in circuit (``benchmark.circuits.library.BuiltIn`` has it)."""

    @property
    def required(self) -> tuple[str, ...]: ...  # noqa: D102
    @property
    def optional(self) -> tuple[str, ...]: ...  # noqa: D102
    @property
    def one_of(self) -> tuple[tuple[str, ...], ...]: ...  # noqa: D102
    @property
    def at_most_one_of(self) -> tuple[tuple[str, ...], ...]: ...  # noqa: D102
    @property
    def whole(self) -> tuple[str, ...]: ...  # noqa: D102
    @property
    def function(self) -> str: ...  # noqa: D102


@dataclass(frozen=True)
class StudyCircuits:
    """The circuits of a study.

    ``specs``: circuit files in use, by the name the study calls them. ``declared``: built-in circuits in use.
    ``own``: place of a side in the file -> name of the circuit it has of its own. ``unknown``: some circuit could not
    be found or read.
    """

    specs: Mapping[str, CircuitSpec] = field(default_factory=dict)
    declared: tuple[CircuitDeclaration, ...] = ()
    own: Mapping[str, str] = field(default_factory=dict)
    unknown: bool = False

    @property
    def groups(self) -> tuple[tuple[tuple[str, ...], bool], ...]:
        """Return the groups of values that state the same thing, each once, with whether one of them is needed."""
        found: dict[tuple[str, ...], bool] = {}
        for which in self.declared:
            for group in (*which.one_of, *which.at_most_one_of):
                found[group] = found.get(group, False) or group in which.one_of
        return tuple(found.items())

    @property
    def required(self) -> set[str]:
        """Return the values that some circuit needs."""
        return {name for which in self.declared for name in which.required}

    @property
    def usable(self) -> set[str]:
        """Return the values that some circuit may use beyond those."""
        optional = {name for which in self.declared for name in which.optional}
        return optional | {name for group, _ in self.groups for name in group}

    @property
    def whole(self) -> tuple[str, ...]:
        """Return the counts that shape a netlist."""
        return tuple(dict.fromkeys(name for which in self.declared for name in which.whole))


def study_circuits(
    parsed: StudyFile, library: Library, built_in: Mapping[str, CircuitDeclaration], refuse: Refuse
) -> StudyCircuits:
    """Find the circuits a study names and judge whether they may stand against each other."""
    common, own_best = parsed.workload.circuit, parsed.workload.topology == OWN_BEST
    named = {"candidate": parsed.candidate.circuit}
    named |= {f"contender.{position}": table.circuit for position, table in enumerate(parsed.contender)}
    own = {place: name for place, name in named.items() if name}
    if not own_best:
        for place in own:
            refuse(f"{place}.circuit", "is used with workload.topology = own-best only", "", "", "")
        own = {}
    elif all(name == common for name in own.values()):
        refuse("workload.topology", "is own-best, and no side names a circuit other than the common one", "", "", "")
    finder = _Finder(library, built_in, refuse)
    functions = {"workload": finder.function(common, "workload.circuit")}
    functions |= {place: finder.function(name, f"{place}.circuit") for place, name in own.items()}
    for place, function in functions.items():
        if own and function is not None and not function:
            where = "workload.circuit" if place == "workload" else f"{place}.circuit"
            refuse(where, "does not say its function, so no other circuit can stand for it", "", "", "")
        elif functions["workload"] and function and function != functions["workload"]:
            refuse(
                f"{place}.circuit", "has another function than the common circuit", function, functions["workload"], ""
            )
    for place, name in own.items():
        spec = finder.specs.get(name)
        if spec is not None and spec.layers and name != common:
            refuse(f"{place}.circuit", "states wire layers of its own; only the common circuit may", repr(name), "", "")
    return StudyCircuits(finder.specs, tuple(finder.declared.values()), own, finder.unknown)


class _Finder:
    """Finds circuits by name, each once."""

    def __init__(self, library: Library, built_in: Mapping[str, CircuitDeclaration], refuse: Refuse) -> None:
        self.library, self.built_in, self.refuse = library, built_in, refuse
        self.specs: dict[str, CircuitSpec] = {}
        self.declared: dict[str, CircuitDeclaration] = {}
        self.unknown = False

    def function(self, name: str, dotted: str) -> str | None:
        """Return the function of a circuit; None when it could not be read."""
        if name in self.built_in:
            self.declared[name] = self.built_in[name]
            return self.built_in[name].function
        if name not in self.specs:
            spec = self._read(name, dotted)
            if spec is None:
                self.unknown = True
                return None
            self.specs[name] = spec
        return self.specs[name].function

    def _read(self, name: str, dotted: str) -> CircuitSpec | None:
        stem = name.removesuffix(".toml")
        path = self.library.find(stem, "circuits")
        if path is None:
            known: Sequence[str] = [*self.built_in, *self.library.ids("circuits")]
            self.refuse(dotted, "there is no such circuit", repr(name), ", ".join(known), nearest(stem, known))
            return None
        return read_circuit(path, self.library, self.library.collector)
