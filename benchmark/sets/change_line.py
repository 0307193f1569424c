"""One line per change of a value, for people, in the ``CHANGES.md`` beside the sets (layer 2).

The line is a convenience: what a value was stands in its ``superseded`` entries, which ``check`` reads.
"""

from __future__ import annotations

import contextlib
import datetime
import os
import tempfile
from collections.abc import Mapping, Sequence
from decimal import Decimal
from pathlib import Path

from benchmark.errors import InputRefused, Problem

__all__ = ["append_change", "change_text", "changes_file", "with_changes", "write_files"]

HEADING = "# Changes of the data"
NAME = "CHANGES.md"
#: folders of sets that share the list of the folder above them
_KINDS = ("technologies", "wires", "circuits")
#: digits of a factor
_DIGITS = 4


def changes_file(set_path: Path) -> Path:
    """Return the list of changes that belongs to a set; it need not exist yet.

    For ``nodes/technologies/x.toml`` it is ``nodes/CHANGES.md``; else the one beside the file, or of the folder above
    when only that has one.
    """
    folder = Path(os.path.abspath(set_path)).parent  # noqa: PTH100 - a link keeps the folder it stands in
    if folder.name in _KINDS:
        return folder.parent / NAME
    beside, above = folder / NAME, folder.parent / NAME
    return above if above.is_file() and not beside.exists() else beside


def change_text(
    value: str,
    old: Decimal | int | float | None,
    new: Decimal | int | float | None,
    unit: str,
    *,
    node: str = "",
    source: str = "",
    reason: str = "",
) -> str:
    """Return what one line says: value, node, old -> new with unit, factor, source and reason.

    ``old`` and ``new`` are in ``unit``; None: there was, or is, no number.
    """
    place = f"{value} at {node}" if node else value
    shown = [("absent" if number is None else str(number)) for number in (old, new)]
    text = f"{place}, {shown[0]} -> {shown[1]}" + ("" if unit in ("", "1") else f" {unit}")
    if old and new is not None:
        text += f", factor {float(new) / float(old):.{_DIGITS}g}"
    text += f", source {source}" if source else ""
    return text + (f": {reason}" if reason else "")


def with_changes(before: str, set_id: str, texts: Sequence[str], date: datetime.date) -> str:
    """Return the text of a list with new lines: right below the heading, the newest first, in their own order."""
    end = "\r\n" if "\r\n" in before else "\n"
    new = [f"- {date.isoformat()}, {set_id}: {' '.join(text.split())}" for text in texts]
    lines = before.splitlines() if before.strip() else [HEADING, ""]
    first = next((position for position, line in enumerate(lines) if line.startswith("- ")), None)
    if first is None:
        lines = [*lines, *([""] if lines[-1].strip() else []), *new]
    else:
        lines[first:first] = new
    return end.join(lines) + end


def append_change(set_path: Path, text: str, date: datetime.date) -> Path:
    """Write one line into the list of changes of a set, which is made if there is none.

    Parameters
    ----------
    set_path : Path
        The set that changed; its file name without ``.toml`` heads the line.
    text : str
        What changed, such as ``change_text`` returns; it becomes one line.
    date : date
        Day from which the change holds.

    Returns
    -------
    Path
        The list.

    Raises
    ------
    InputRefused
        When the list is not a text file that can be read and written.
    """
    place = changes_file(set_path)
    write_files({place: with_changes(read_changes(place), set_path.stem, [text], date)})
    return place


def read_changes(place: Path) -> str:
    """Return the text of a list; empty when there is none yet."""
    try:
        return place.read_bytes().decode("utf-8")
    except FileNotFoundError:
        return ""
    except UnicodeDecodeError as error:
        raise InputRefused([Problem(str(place), 0, "", "is not UTF-8 text; no change was written")]) from error
    except OSError as error:
        raise InputRefused([_unusable(place, error)]) from error


def write_files(texts: Mapping[Path, str]) -> None:
    """Put all texts in place, or none: every file is written beside its place first and renamed then.

    Raises
    ------
    InputRefused
        When a place cannot be written; all files are then as they were.
    """
    made: dict[Path, Path] = {}
    before: dict[Path, bytes | None] = {}
    place = Path()
    try:
        for name, text in texts.items():
            place = name.resolve() if name.is_symlink() else name  # a link stays, what it names is written
            before[place] = place.read_bytes() if place.exists() else None
            made[place] = _beside(place, text.encode("utf-8"))
        for place, temporary in made.items():
            os.replace(temporary, place)  # noqa: PTH105 - both names on one file system
    except OSError as error:
        for path, old in before.items():
            _put_back(path, old, written=path in made and not made[path].exists())
        raise InputRefused([_unusable(place, error)]) from error
    finally:
        for temporary in made.values():
            temporary.unlink(missing_ok=True)


def _beside(place: Path, content: bytes) -> Path:
    """Write a temporary file beside a place, with the permissions of what is there."""
    handle, name = tempfile.mkstemp(prefix=f".{place.name[:100]}.evenload-", dir=place.parent)
    with os.fdopen(handle, "wb") as file:
        file.write(content)
    temporary = Path(name)
    temporary.chmod(place.stat().st_mode & 0o777 if place.exists() else 0o644)
    return temporary


def _put_back(path: Path, old: bytes | None, *, written: bool) -> None:
    if not written:
        return
    with contextlib.suppress(OSError):
        if old is None:
            path.unlink()
        else:
            path.write_bytes(old)


def _unusable(place: Path, error: OSError) -> Problem:
    return Problem(str(place), 0, "", f"cannot be used ({error.strerror or error}); nothing was written")
