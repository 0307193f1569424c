"""Tables and facts on a terminal or as plain aligned text (layer 10).

A terminal gets rich tables. Pipes, files and dumb terminals get plain text that never exceeds the width: long cells are
wrapped, and a table that cannot be narrow enough is written as one block of facts per row. ``COLUMNS`` sets the width.
"""

from __future__ import annotations

import os
import shutil
import sys
import textwrap
from collections.abc import Sequence
from dataclasses import dataclass

import typer

__all__ = ["Block", "Facts", "Note", "Table", "plain_lines", "printable", "show_blocks"]

#: width of plain text when neither COLUMNS nor a terminal says otherwise
PLAIN_WIDTH = 120
#: a column is not made narrower than this
NARROWEST = 8
GAP = 2


@dataclass(frozen=True)
class Table:
    """Rows under headings."""

    title: str
    columns: Sequence[str]
    rows: Sequence[Sequence[str]]


@dataclass(frozen=True)
class Facts:
    """Pairs of a name and a text."""

    title: str
    rows: Sequence[tuple[str, str]]


@dataclass(frozen=True)
class Note:
    """A paragraph."""

    text: str


Block = Table | Facts | Note


def printable(text: str) -> str:
    """Replace control and formatting characters, so that no text of a file can steer the terminal."""
    return "".join(letter if letter.isprintable() else " " for letter in text)


def show_blocks(blocks: Sequence[Block]) -> None:
    """Print blocks in the form that suits standard output."""
    if sys.stdout.isatty() and os.environ.get("TERM", "") not in ("", "dumb"):
        _show_rich(blocks)
        return
    width = shutil.get_terminal_size((PLAIN_WIDTH, 24)).columns
    typer.echo("\n".join(plain_lines(blocks, width)))


def plain_lines(blocks: Sequence[Block], width: int) -> list[str]:
    """Return the blocks as plain lines of at most ``width`` characters (but never fewer than 20)."""
    width = max(width, 20)
    lines: list[str] = []
    for block in blocks:
        if lines:
            lines.append("")
        if isinstance(block, Note):
            lines += _wrap(printable(block.text), width)
        elif isinstance(block, Facts):
            lines += _wrap(printable(block.title), width) if block.title else []
            lines += _facts(block.rows, width)
        else:
            lines += _wrap(printable(block.title), width) if block.title else []
            lines += _table(block, width)
    return lines


def _wrap(text: str, width: int) -> list[str]:
    return textwrap.wrap(text, width, break_on_hyphens=False) or [""]


def _facts(rows: Sequence[tuple[str, str]], width: int) -> list[str]:
    lines: list[str] = []
    name_width = min(max((len(name) for name, _ in rows), default=0), max(NARROWEST, width // 3))
    for name, text in rows:
        indent = 2 + name_width + GAP
        names, texts = _wrap(printable(name), name_width), _wrap(printable(text), width - indent)
        for position in range(max(len(names), len(texts))):
            left = names[position] if position < len(names) else ""
            right = texts[position] if position < len(texts) else ""
            lines.append(f"  {left:<{name_width}}{' ' * GAP}{right}".rstrip())
    return lines


def _widths(cells: Sequence[Sequence[str]], width: int) -> list[int] | None:
    """Column widths that fit, taking from the widest first and never from the names in the first column; None when
    even narrow columns do not fit.
    """
    widths = [max(len(row[column]) for row in cells) for column in range(len(cells[0]))]
    room = width - 2 - GAP * (len(widths) - 1)
    while sum(widths) > room:
        widest = max(range(1, len(widths)), key=lambda column: widths[column], default=0)
        if widest == 0 or widths[widest] <= NARROWEST:
            return None
        widths[widest] -= 1
    return widths


def _table(table: Table, width: int) -> list[str]:
    cells = [[printable(text) for text in row] for row in (table.columns, *table.rows)]
    widths = _widths(cells, width)
    if widths is None:
        lines: list[str] = []
        for row in cells[1:]:
            lines += [*_facts(list(zip(cells[0], row, strict=True)), width), ""]
        return lines[:-1]
    lines = []
    for position, row in enumerate(cells):
        wrapped = [_wrap(text, size) for text, size in zip(row, widths, strict=True)]
        for level in range(max(len(part) for part in wrapped)):
            line = (" " * GAP).join(
                f"{part[level] if level < len(part) else '':<{size}}"
                for part, size in zip(wrapped, widths, strict=True)
            )
            lines.append(f"  {line}".rstrip())
        if position == 0:
            lines.append(f"  {(' ' * GAP).join('-' * size for size in widths)}")
    return lines


def _show_rich(blocks: Sequence[Block]) -> None:
    from rich import box
    from rich.console import Console
    from rich.table import Table as RichTable
    from rich.text import Text

    console = Console(highlight=False, markup=False, emoji=False)
    for position, block in enumerate(blocks):
        if position:
            console.print()
        if isinstance(block, Note):
            console.print(Text(printable(block.text)))
            continue
        if block.title:
            console.print(Text(printable(block.title), style="bold"))
        columns = block.columns if isinstance(block, Table) else ("", "")
        table = RichTable(box=box.SIMPLE_HEAD, show_header=isinstance(block, Table), pad_edge=False)
        for column in columns:
            table.add_column(Text(column), overflow="fold")
        for row in block.rows:
            table.add_row(*(Text(printable(text)) for text in row))
        console.print(table)
