"""A record as inputs again: its embedded files in an empty folder (layer 8)."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from pathlib import Path, PurePosixPath
from typing import Any

from benchmark.errors import EvenloadError

__all__ = ["recreate"]

#: fields of a source as the source list spells them
_SOURCE_KEYS = ("kind", "authors", "year", "title", "venue", "doi", "read", "via", "note")


def recreate(record: Mapping[str, Any], folder: Path) -> tuple[Path, dict[str, str]]:
    """Write the input files of a record into a folder.

    Parameters
    ----------
    record : mapping
        From ``read_record``.
    folder : Path
        An existing empty folder.

    Returns
    -------
    tuple
        The study file, and the what-if numbers the record was made with.

    Raises
    ------
    EvenloadError
        If a file's name leaves the folder or its text does not have the digest that the record states.
    """
    study: Path | None = None
    try:
        for item in record["files"]:
            place = folder / _inside(item["name"])
            data = item["text"].encode("utf-8")
            if hashlib.sha256(data).hexdigest() != item["sha256"]:
                message = f"the record's copy of {item['name']} does not have the digest the record states"
                raise EvenloadError(message)
            place.parent.mkdir(parents=True, exist_ok=True)
            place.write_bytes(data)
            if item["kind"] == "study":
                study = place
        (folder / "sources.toml").write_text(_sources(record["sources"]), encoding="utf-8", newline="\n")
    except (KeyError, TypeError, AttributeError, UnicodeEncodeError) as error:
        message = f"the record lacks what is needed to run it again ({type(error).__name__}: {error})"
        raise EvenloadError(message) from error
    if study is None:
        message = "the record holds no study file"
        raise EvenloadError(message)
    return study, dict(record.get("what_if", {}))


def _inside(name: str) -> PurePosixPath:
    path = PurePosixPath(name)
    if not name or path.is_absolute() or ".." in path.parts or any(letter in name for letter in "\\:\0"):
        message = f"the record names an input file outside its folder: {name!r}"
        raise EvenloadError(message)
    return path


def _sources(sources: Mapping[str, Mapping[str, Any]]) -> str:
    """The used sources as a source list; JSON strings, numbers and lists of strings are TOML as well."""
    parts = ["schema = 1"]
    for key, source in sources.items():
        lines = [f"[{_quoted(key)}]"]
        lines += [f"{name} = {_quoted(source[name])}" for name in _SOURCE_KEYS if source[name] not in ("", None)]
        parts.append("\n".join(lines))
    return "\n\n".join(parts) + "\n"


def _quoted(value: Any) -> str:
    return json.dumps(value, ensure_ascii=False).replace("\x7f", "\\u007f")
