"""Which columns of a raw file belong together and make curves (layer 7.5)."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction

from benchmark.curves.columns import Column
from benchmark.curves.lines import Reading
from benchmark.errors import nearest

__all__ = ["Block", "make_blocks"]


@dataclass(frozen=True)
class Block:
    """Columns that make curves together; ``own``: those that no other block has."""

    labels: Mapping[str, str]
    fixed: Mapping[str, Fraction]
    columns: tuple[Column, ...]
    own: tuple[Column, ...]

    def of_kind(self, kind: str) -> list[Column]:
        """Columns of one kind: label, axis or value."""
        return [column for column in self.columns if column.spec.kind == kind]


def _key(column: Column) -> frozenset[tuple[str, object]]:
    return frozenset((*column.labels.items(), *column.fixed.items()))


def make_blocks(columns: list[Column], reading: Reading) -> list[Block]:
    """Put columns together by their labels and fixed values.

    Each different set of labels and fixed values of the value columns makes a block; a column belongs to every block
    that says all that the column says, so a column without any is shared by all.
    """
    keys = list(dict.fromkeys(_key(column) for column in columns if column.spec.kind == "value"))
    if not keys:
        reading.problem("column", "has no column of kind value")
        return []
    keys = [one for one in keys if not any(one < other for other in keys)]
    blocks, used = [], set()
    for one in keys:
        inside = tuple(column for column in columns if _key(column) <= one)
        used |= {column.position for column in inside}
        labels = {name: word for column in inside for name, word in column.labels.items()}
        fixed = {name: si for column in inside for name, si in column.fixed.items()}
        own = tuple(column for column in inside if sum(_key(column) <= other for other in keys) == 1)
        blocks.append(Block(labels, fixed, inside, own if len(keys) > 1 else ()))
    for column in columns:
        if column.position not in used:
            hint = "give it the labels and fixed values of the value it belongs to"
            reading.problem(column.dotted, "belongs to no column of kind value", repr(column.header), "", hint)
    for block in blocks:
        _check(block, reading)
    return blocks


def _check(block: Block, reading: Reading) -> None:
    """Check that a block has the axis it is read along, and nothing twice."""
    stated = [*(column.meaning for column in block.columns), *block.labels, *block.fixed]
    for meaning in sorted({meaning for meaning in stated if stated.count(meaning) > 1}):
        which = [column for column in block.columns if column.meaning == meaning]
        headers = ", ".join(repr(column.header) for column in which)
        dotted = which[-1].dotted if which else "column"
        reading.problem(
            dotted,
            "states what another part of its curve states",
            meaning,
            "",
            f"see {headers}; tell them apart by labels",
        )
    axes = [column.meaning for column in block.of_kind("axis")]
    if reading.spec.along not in axes:
        found, hint = repr(reading.spec.along), nearest(reading.spec.along, axes)
        reading.problem("along", "is not the meaning of a column of kind axis", found, ", ".join(axes), hint)
