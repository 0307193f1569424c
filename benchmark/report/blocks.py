"""What a page is made of (layer 9): sections of paragraphs, lists, tables and figures, as data for the templates."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

from benchmark.report.figure import Chart
from benchmark.report.words import is_number, number

__all__ = [
    *("Block", "Bullets", "Cell", "Code", "Figure", "Folded", "Group", "Groups", "Notice", "Pairs", "Paragraph"),
    *("Section", "Table", "plain"),
]

#: characters of a word that still fits a column
LONGEST = 22


@dataclass(frozen=True)
class Cell:
    """Text of one cell, with what else it says: a link to a place on the page, a small second line, further links."""

    text: str
    href: str = ""
    small: str = ""
    number: bool = False
    #: words and places of further links
    links: tuple[tuple[str, str], ...] = ()

    @property
    def style(self) -> str:
        """Class of the cell: numbers align right; a cell with a word too long for a column may break it anywhere."""
        long = any(len(word) > LONGEST for text in (self.text, self.small) for word in text.split())
        return " ".join(name for name, wanted in (("number", self.number), ("long", long)) if wanted)


@dataclass(frozen=True)
class Paragraph:
    """One paragraph; ``strong`` is set in bold before it."""

    text: str
    strong: str = ""
    kind: str = "paragraph"


@dataclass(frozen=True)
class Notice:
    """A paragraph nobody may overlook."""

    text: str
    strong: str = ""
    kind: str = "notice"


@dataclass(frozen=True)
class Bullets:
    """A list."""

    items: tuple[str, ...]
    strong: str = ""
    kind: str = "bullets"


@dataclass(frozen=True)
class Folded:
    """A list behind one line that says what it holds; opened by a click."""

    summary: str
    items: tuple[str, ...]
    kind: str = "folded"


@dataclass(frozen=True)
class Pairs:
    """Names with what they say."""

    items: tuple[tuple[str, str], ...]
    kind: str = "pairs"


@dataclass(frozen=True)
class Code:
    """Lines to type."""

    text: str
    kind: str = "code"


@dataclass(frozen=True)
class Table:
    """A table with caption and column headers; the first cell of each row names the row."""

    key: str
    caption: str
    columns: tuple[str, ...]
    rows: tuple[tuple[Cell, ...], ...]
    wide: bool = False
    filterable: bool = False
    #: words of each row a filter looks at: evidence class, set by
    tags: tuple[Mapping[str, str], ...] = ()
    empty: str = "none"
    #: id of each row, where rows can be led to
    anchors: tuple[str, ...] = ()
    kind: str = "table"

    @property
    def heads(self) -> tuple[Cell, ...]:
        """Column headers as cells: words too long for a column may break anywhere."""
        return tuple(Cell(name) for name in self.columns)


@dataclass(frozen=True)
class Figure:
    """A chart with its words and the table of what it draws."""

    chart: Chart
    svg: str
    data: Table | None
    kind: str = "figure"


@dataclass(frozen=True)
class Group:
    """Blocks under a heading of their own."""

    key: str
    title: str
    blocks: tuple[Paragraph | Table | Figure, ...]


@dataclass(frozen=True)
class Groups:
    """Groups of one kind, all shown; a small script offers to show one at a time."""

    key: str
    label: str
    groups: tuple[Group, ...]
    kind: str = "groups"


Block = Paragraph | Notice | Bullets | Folded | Pairs | Code | Table | Figure | Groups


@dataclass(frozen=True)
class Section:
    """One section of the report."""

    key: str
    title: str
    blocks: tuple[Block, ...] = field(default=())


def _cell(value: Any, digits: int) -> Cell:
    if isinstance(value, Cell):
        return value
    if isinstance(value, bool):
        return Cell("yes" if value else "no")
    if is_number(value):
        return Cell(number(value, digits), number=True)
    return Cell("" if value is None else str(value))


def plain(
    key: str,
    caption: str,
    columns: Sequence[str],
    rows: Sequence[Sequence[Any]],
    *,
    digits: int = 3,
    **options: Any,
) -> Table:
    """Make a table of raw values: numbers are printed, truth values become yes and no."""
    cells = tuple(tuple(_cell(value, digits) for value in row) for row in rows)
    return Table(key, caption, tuple(columns), cells, **options)
