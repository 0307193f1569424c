"""From the bytes of a raw file to the lines of its table (layer 7.5)."""

from __future__ import annotations

import codecs
import io
import re

from benchmark.curves.description import CurvesFile
from benchmark.errors import Problem, nearest
from benchmark.sets.problems import Collector

__all__ = ["counted", "kept_lines"]

_MARKS = {codecs.BOM_UTF8: "utf-8", codecs.BOM_UTF16_LE: "utf-16", codecs.BOM_UTF16_BE: "utf-16"}
_CODECS = {"utf-8": "utf-8-sig", "utf-16": "utf-16", "latin-1": "latin-1", "windows-1252": "cp1252"}


def kept_lines(
    raw: bytes, spec: CurvesFile, name: str, collector: Collector, notes: list[str]
) -> list[tuple[int, str]] | None:
    """Lines of the table itself, numbered from 1; None after a problem. What is left out is noted."""
    text = _decoded(raw, spec, name, collector, notes)
    return None if text is None else _kept(text, spec, name, collector, notes)


def _decoded(raw: bytes, spec: CurvesFile, name: str, collector: Collector, notes: list[str]) -> str | None:
    """Decode as declared; never guess."""
    mark = next((found for start, found in _MARKS.items() if raw.startswith(start)), "")
    if mark and mark != spec.encoding:
        collector.add(
            Problem(
                name,
                1,
                "",
                "has a byte order mark of another encoding",
                mark,
                spec.encoding,
                f'state encoding = "{mark}"',
            )
        )
        return None
    try:
        text = raw.decode(_CODECS[spec.encoding])
    except UnicodeDecodeError as error:
        line = raw.count(b"\n", 0, error.start) + 1
        collector.add(
            Problem(
                name,
                line,
                "",
                f"is not {spec.encoding} text",
                f"byte {raw[error.start]:#04x}",
                'encoding = "utf-8", "utf-16", "latin-1" or "windows-1252"',
            )
        )
        return None
    if not text.strip():
        collector.add(Problem(name, 0, "", "is empty"))
        return None
    if not text.strip():
        collector.add(Problem(name, 0, "", "is empty"))
        return None
    if any(ord(sign) < 32 and sign not in "\t\r\n\f\v" for sign in set(text)):
        line = next(
            number
            for number, part in enumerate(text.split("\n"), start=1)
            if any(ord(sign) < 32 and sign not in "\t\r\f\v" for sign in part)
        )
        collector.add(Problem(name, line, "", "is binary", "", "a text file with rows of cells"))
        return None
    marked = " with a byte order mark" if mark else ""
    cells = "white space" if spec.delimiter == "whitespace" else repr(spec.delimiter)
    notes.append(f"read as {spec.encoding} text{marked}, cells divided at {cells}, decimal sign {spec.decimal!r}")
    return text


def counted(number: int, what: str) -> str:
    """Say how many lines, in the singular or plural."""
    return f"{number} {what} line{'' if number == 1 else 's'} left out"


def _kept(
    text: str, spec: CurvesFile, name: str, collector: Collector, notes: list[str]
) -> list[tuple[int, str]] | None:
    """Lines of the table itself: from the header on, without comments, up to the end that is stated."""
    lines = list(enumerate(io.StringIO(text, newline="").readlines(), start=1))
    start = spec.skip_rows
    if spec.header_starts:
        starts = [number for number, line in lines if line.lstrip(' \t"').startswith(spec.header_starts)]
        if not starts:
            words = [re.split(r"[,;|\t]", line.strip())[0][:40] for _, line in lines if line.strip()]
            collector.add(
                Problem(
                    name,
                    0,
                    "",
                    "has no line that starts as the description says",
                    "",
                    f"header_starts = {spec.header_starts!r}",
                    nearest(spec.header_starts, words),
                )
            )
            return None
        start = starts[0] - 1
    if start >= len(lines):
        collector.add(
            Problem(
                name, 0, "", "has no line after those left out", f"{len(lines)} lines", f"{start + 1} lines or more"
            )
        )
        return None
    if start:
        notes.append(
            f"lines 1 to {start} before the table left out" if start > 1 else "line 1 before the table left out"
        )
    kept, comments, ended = [], 0, not spec.ends_before
    for number, line in lines[start:]:
        if spec.ends_before and line.lstrip(' \t"').startswith(spec.ends_before):
            notes.append(f"the table ends before line {number}; {len(lines) - number + 1} line(s) left out")
            ended = True
            break
        if spec.comment and line.lstrip().startswith(spec.comment):
            comments += 1
            continue
        kept.append((number, line))
    if not ended:
        allowed = f"ends_before = {spec.ends_before!r}, or none"
        collector.add(Problem(name, 0, "", "does not end as the description says", "", allowed))
        return None
    if comments:
        notes.append(counted(comments, "comment"))
    return kept
