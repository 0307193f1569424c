"""One order for the objects of a PDF (layer 9), so that the same drawing gives the same bytes.

The drawing library writes font objects and the entries of dictionaries in an order that changes between processes;
what they say does not change. Here every dictionary is sorted by name, objects are numbered as they are met from the
root, and the table of offsets is made anew. Numbers, strings and streams pass as they are.

File structure: ISO 32000-1:2008, 7.2 (tokens), 7.3 (objects), 7.5 (header, cross-reference table, trailer).
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from typing import TypeAlias

__all__ = ["in_one_order"]

_TOKEN = re.compile(
    rb"(?P<skip>[\x00\t\n\f\r ]+|%[^\r\n]*)|(?P<ref>(\d+)\s+(\d+)\s+R(?![A-Za-z]))|(?P<open><<|\[)|(?P<close>>>|\])"
    rb"|(?P<name>/[^\x00\t\n\f\r ()<>\[\]{}/%]*)|(?P<hex><[0-9A-Fa-f\s]*>)|(?P<text>\()"
    rb"|(?P<word>[^\x00\t\n\f\r ()<>\[\]{}/%]+)"
)
_XREF = re.compile(rb"^(\d{10}) (\d{5}) n", re.MULTILINE)
_HEAD = re.compile(rb"(\d+) 0 obj\b")


@dataclass(frozen=True)
class _Ref:
    number: int


#: a dictionary by name, an array, a reference, or bytes that pass as they are
_Value: TypeAlias = dict[bytes, "_Value"] | list["_Value"] | _Ref | bytes


@dataclass
class _Reader:
    """Reads one value at a time from the bytes of an object."""

    data: bytes
    place: int = 0

    def value(self) -> _Value:
        """Return the next value: dictionary, list, reference or bytes.

        Raises
        ------
        ValueError
            Something this reader does not know.
        """
        kind, token = self._token()
        if kind == "ref":
            return _Ref(int(token.split()[0]))
        if kind == "open":
            return self._inside(b">>" if token == b"<<" else b"]")
        if kind in ("name", "hex", "word", "text"):
            return token
        message = f"a PDF holds {token!r} where a value is due"
        raise ValueError(message)

    def _token(self) -> tuple[str, bytes]:
        while True:
            found = _TOKEN.match(self.data, self.place)
            if found is None:
                message = f"a PDF holds {self.data[self.place : self.place + 20]!r}, which is no token"
                raise ValueError(message)
            kind = next(name for name in ("skip", "ref", "open", "close", "name", "hex", "text", "word") if found[name])
            start, self.place = self.place, found.end()
            if kind == "text":
                self._skip_text()
            if kind != "skip":
                return kind, self.data[start : self.place]

    def _skip_text(self) -> None:
        """Go past a literal string: brackets nest, a backslash takes the next byte along."""
        depth = 1
        while depth:
            byte = self.data[self.place : self.place + 1]
            if not byte:
                message = "a PDF holds a string without end"
                raise ValueError(message)
            depth += {b"(": 1, b")": -1}.get(byte, 0)
            self.place += 2 if byte == b"\\" else 1

    def _inside(self, end: bytes) -> _Value:
        items: list[_Value] = []
        while True:
            before = self.place
            kind, token = self._token()
            if kind == "close" and token == end:
                break
            self.place = before
            items.append(self.value())
        if end == b"]":
            return items
        names = [item for item in items[::2] if isinstance(item, bytes) and item.startswith(b"/")]
        if len(items) % 2 or len(names) != len(items) // 2 or len(set(names)) != len(names):
            message = "a PDF holds a dictionary whose names and values do not pair"
            raise ValueError(message)
        return dict(zip(names, items[1::2], strict=True))


@dataclass
class _Writer:
    """Numbers objects as they are met and writes them."""

    objects: dict[int, tuple[_Value, bytes]]
    numbers: dict[int, int] = field(default_factory=dict)
    waiting: list[int] = field(default_factory=list)

    def text(self, value: _Value) -> bytes:
        """Return a value as bytes, dictionaries sorted, references by new number."""
        if isinstance(value, dict):
            return b"<<" + b" ".join(name + b" " + self.text(value[name]) for name in sorted(value)) + b">>"
        if isinstance(value, list):
            return b"[" + b" ".join(map(self.text, value)) + b"]"
        if isinstance(value, _Ref):
            if value.number not in self.numbers:
                self.numbers[value.number] = len(self.numbers) + 1
                self.waiting.append(value.number)
            return b"%d 0 R" % self.numbers[value.number]
        return value

    def file(self, header: bytes, trailer: dict[bytes, _Value]) -> bytes:
        """Return the whole file."""
        roots = {name: trailer[name] for name in (b"/Root", b"/Info") if name in trailer}
        said = [name + b" " + self.text(roots[name]) for name in roots]
        parts, offsets, size = [header], [], len(header)
        while self.waiting:
            old = self.waiting.pop(0)
            value, stream = self.objects[old]
            body = b"%d 0 obj\n" % self.numbers[old] + self.text(value) + b"\n" + stream + b"endobj\n"
            parts.append(body)
            offsets.append(size)
            size += len(body)
        rows = [b"0000000000 65535 f \n", *(b"%010d 00000 n \n" % offset for offset in offsets)]
        parts += [b"xref\n0 %d\n" % len(rows), *rows]
        parts.append(
            b"trailer\n<<" + b" ".join([*said, b"/Size %d" % len(rows)]) + b">>\nstartxref\n%d\n%%%%EOF\n" % size
        )
        return b"".join(parts)


def _stream(data: bytes, place: int, value: _Value) -> bytes:
    """Return the stream that follows a dictionary, with its two words, or nothing."""
    found = re.compile(rb"\s*stream\r?\n").match(data, place)
    if found is None:
        return b""
    length = value.get(b"/Length") if isinstance(value, dict) else None
    if not isinstance(length, bytes) or not length.isdigit():
        message = "a PDF holds a stream whose length is not stated beside it"
        raise ValueError(message)
    inside = data[found.end() : found.end() + int(length)]
    if not data[found.end() + int(length) :].lstrip(b"\r\n").startswith(b"endstream"):
        message = "a PDF holds a stream that is not as long as it says"
        raise ValueError(message)
    return b"stream\n" + inside + b"\nendstream\n"


def in_one_order(data: bytes) -> bytes:
    """Return the PDF with dictionaries sorted and objects in the order they are met from the root.

    Raises
    ------
    ValueError
        A file with another structure than one cross-reference table and streams of stated length.
    """
    start = re.search(rb"startxref\s+(\d+)\s+%%EOF\s*\Z", data)
    if start is None or not data[int(start[1]) :].startswith(b"xref"):
        message = "a PDF has no cross-reference table at its end"
        raise ValueError(message)
    table, _, rest = data[int(start[1]) :].partition(b"trailer")
    objects: dict[int, tuple[_Value, bytes]] = {}
    places = [int(row[1]) for row in _XREF.finditer(table)]
    for place in places:
        head = _HEAD.match(data, place)
        if head is None:
            message = f"a PDF has no object at byte {place}, where its table names one"
            raise ValueError(message)
        reader = _Reader(data, head.end())
        value = reader.value()
        objects[int(head[1])] = value, _stream(data, reader.place, value)
    trailer = _Reader(rest).value()
    if not isinstance(trailer, dict) or b"/Root" not in trailer:
        message = "a PDF has no root"
        raise ValueError(message)
    return _Writer(objects).file(data[: min(places)], trailer)
