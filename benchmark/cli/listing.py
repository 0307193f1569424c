"""The lists of the command ``show`` (layer 10)."""

from __future__ import annotations

from collections.abc import Callable

from benchmark.catalogue import EVIDENCE, PRODUCT_CLASSES, QUANTITIES
from benchmark.circuits.library import BUILT_IN, BuiltIn
from benchmark.cli.describe import SUPPORT
from benchmark.cli.layout import Block, Note, Table
from benchmark.devices import MODEL_NAMES, model
from benchmark.record.listing import TECHNOLOGY_COLUMNS, file_rows, technology_rows
from benchmark.sets.library import Library
from benchmark.sets.study import REQUIREMENTS

__all__ = ["LISTS", "choice_words"]


def _technologies(library: Library) -> list[Block]:
    table = Table("Technologies", ("id", *TECHNOLOGY_COLUMNS), technology_rows(library))
    return [table, Note("evenload show ID: all its values and their sources.")]


def _wires(library: Library) -> list[Block]:
    return [Table("Wires", ("id", "title", "nodes"), file_rows(library, "wires", ("title", "nodes")))]


def choice_words(which: BuiltIn) -> tuple[str, ...]:
    """Say which values of a circuit state the same thing, so that only one may be given."""
    return (
        *(f"one of {' or '.join(group)}" for group in which.one_of),
        *(f"at most one of {' or '.join(group)}" for group in which.at_most_one_of),
    )


def _circuits(library: Library) -> list[Block]:
    built_in = [
        (
            name,
            which.title,
            which.operation,
            ", ".join(which.required),
            ", ".join((*which.optional, *choice_words(which))),
        )
        for name, which in BUILT_IN.items()
    ]
    blocks: list[Block] = [
        Table(
            "Built-in circuits",
            ("name", "title", "one operation", "scenario values it needs", "and may use"),
            built_in,
        )
    ]
    files = file_rows(library, "circuit", ("title", "operation"))
    if files:
        blocks.append(Table("Circuit files", ("id", "title", "one operation"), files))
    return blocks


def _models(library: Library) -> list[Block]:
    rows = [
        (
            name,
            model(name).title,
            str(len(model(name).inputs)),
            ", ".join(option.name for option in model(name).options) or "-",
            ", ".join(model(name).tables) or "-",
        )
        for name in MODEL_NAMES
    ]
    return [
        Table("Device models", ("name", "title", "inputs", "options", "tables"), rows),
        Note("evenload show NAME: its inputs, options and references."),
    ]


def _values(library: Library) -> list[Block]:
    rows = [
        (name, item.symbol, item.meaning, item.unit, f"{item.low:g} to {item.high:g}", item.domain_text)
        for name, item in sorted(QUANTITIES.items())
    ]
    return [Table("Value names", ("name", "symbol", "meaning", "unit", "usual range", "allowed"), rows)]


def _sources(library: Library) -> list[Block]:
    rows = [(key, item.kind, item.read, item.citation) for key, item in sorted(library.sources.items())]
    return [Table("Sources", ("key", "kind", "read", "citation"), rows)]


def _requirements(library: Library) -> list[Block]:
    rows = [(name, unit, meaning) for name, (unit, meaning) in REQUIREMENTS.items()]
    return [Table("Requirements", ("name", "unit of the limit", "demands"), rows)]


def _evidence(library: Library) -> list[Block]:
    rows = [
        (item.name, item.meaning, SUPPORT[item.support], ", ".join(item.must_state) or "-")
        for item in EVIDENCE.values()
    ]
    return [Table("Evidence classes", ("name", "meaning", "a decisive value of this class", "must state"), rows)]


def _classes(library: Library) -> list[Block]:
    return [Table("Product classes", ("name", "what usually decides (from memory)"), list(PRODUCT_CLASSES.items()))]


LISTS: dict[str, Callable[[Library], list[Block]]] = {
    "technologies": _technologies,
    "wires": _wires,
    "circuits": _circuits,
    "models": _models,
    "values": _values,
    "sources": _sources,
    "requirements": _requirements,
    "evidence": _evidence,
    "classes": _classes,
}
