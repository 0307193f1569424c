"""Small pieces of HTML for notebooks: every text escaped, style inline, colours those of the page around it."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from html import escape

from benchmark.report.words import visible

__all__ = ["bullets", "frame", "heading", "note", "table", "text"]

#: grey at half strength is a visible line on white and on black
_LINE = "1px solid rgba(128,128,128,.5)"
_BOX = "max-width:100%;overflow-x:auto;color:inherit;background:transparent"
_CELL = f"border:0;border-bottom:{_LINE};padding:2px 8px;text-align:left;vertical-align:top;color:inherit"


def text(value: object) -> str:
    """Return a text that cannot be markup; what cannot be shown becomes a replacement character."""
    return escape(visible(str(value)), quote=True)


def frame(*parts: str) -> str:
    """Put parts, which are HTML, into one box."""
    return f'<div style="{_BOX}">{"".join(parts)}</div>'


def heading(value: object, more: object = "") -> str:
    """Return a bold line, with a plain remark behind it."""
    return f"<p><strong>{text(value)}</strong>{f' {text(more)}' if more else ''}</p>"


def note(value: object) -> str:
    """Return a paragraph."""
    return f"<p>{text(value)}</p>" if value else ""


def bullets(title: str, items: Iterable[object]) -> str:
    """Return a titled list; nothing when it is empty."""
    listed = "".join(f"<li>{text(item)}</li>" for item in items)
    return f"<p>{text(title)}</p><ul>{listed}</ul>" if listed else ""


def table(title: str, columns: Sequence[str], rows: Iterable[Sequence[object]]) -> str:
    """Return a table with one header row; nothing when it has no rows."""
    body = "".join("<tr>" + "".join(_cell("td", cell) for cell in row) + "</tr>" for row in rows)
    if not body:
        return ""
    head = "".join(_cell("th", column, ' scope="col"') for column in columns)
    caption = (
        f'<caption style="text-align:left;font-style:italic;color:inherit">{text(title)}</caption>' if title else ""
    )
    return (
        f'<table style="border-collapse:collapse;margin:1em 0;color:inherit">{caption}<thead><tr>{head}</tr></thead>'
        f"<tbody>{body}</tbody></table>"
    )


def _cell(tag: str, value: object, more: str = "") -> str:
    return f'<{tag}{more} style="{_CELL}">{text(value)}</{tag}>'
