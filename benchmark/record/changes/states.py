"""A state of a study: its record, and the study itself to evaluate again (layer 8)."""

from __future__ import annotations

import contextlib
import html.parser
import io
import json
import subprocess
import tarfile
import tempfile
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path, PurePosixPath
from typing import Any

from benchmark.errors import EvenloadError, UsageError
from benchmark.record.changes.links import set_links
from benchmark.record.ledger import set_rows
from benchmark.record.load import load_study, open_library
from benchmark.record.rerun import recreate
from benchmark.record.write import absent, of_this_version, read_record
from benchmark.sets.files import read_toml
from benchmark.sets.parameters import ParameterSet
from benchmark.sets.sources import Source
from benchmark.sets.study import Study

__all__ = ["State", "is_report", "open_state", "read_any_record", "set_state", "state_of_set"]

#: seconds git may take
PATIENCE = 60.0


@dataclass(frozen=True)
class State:
    """One end of a comparison; ``shown`` names it as the user did."""

    shown: str
    record: Mapping[str, Any]
    study: Study


class _Embedded(html.parser.HTMLParser):
    """Finds the record that a report carries."""

    def __init__(self) -> None:
        super().__init__(convert_charrefs=False)
        self.inside, self.parts = False, list[str]()

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.inside = tag == "script" and ("id", "record") in attrs

    def handle_endtag(self, tag: str) -> None:
        self.inside = False

    def handle_data(self, data: str) -> None:
        if self.inside:
            self.parts.append(data)


def is_report(path: Path) -> bool:
    """Tell whether a file is a report by its name."""
    return path.suffix.lower() in (".html", ".htm")


def read_any_record(path: Path) -> dict[str, Any]:
    """Read the record of a record folder, a ``record.json``, or the one inside a report.

    Raises
    ------
    EvenloadError
        Missing, unreadable, without a record, or of another schema.
    """
    if not is_report(path):
        return read_record(path)
    try:
        text = path.read_text(encoding="utf-8")
    except (FileNotFoundError, NotADirectoryError) as error:
        raise EvenloadError(absent(path)) from error
    except (OSError, ValueError) as error:
        message = f"{path}: is not a readable report ({type(error).__name__})"
        raise EvenloadError(message) from error
    reader = _Embedded()
    reader.feed(text)
    try:
        record = json.loads("".join(reader.parts))
    except (ValueError, RecursionError) as error:
        message = f"{path}: holds no record; a report.html written by evenload run does"
        raise EvenloadError(message) from error
    return of_this_version(record, path)


def open_state(shown: str, record: Mapping[str, Any]) -> State:
    """Make a study of a record again.

    Raises
    ------
    EvenloadError
        When the record holds ratios only, or lacks what is needed to evaluate it.
    InputRefused
        When this version refuses its inputs.
    """
    if record.get("ratio_only"):
        message = f"{shown}: holds ratios only, without the inputs; a complete record is needed to say what changed"
        raise EvenloadError(message)
    with tempfile.TemporaryDirectory(prefix="evenload-") as folder:
        path, numbers = recreate(record, Path(folder))
        study, _ = load_study(path, (), numbers)
    return State(shown, record, study)


def set_state(place: str) -> dict[str, Any]:
    """Read the values of one set: a file, or ``REVISION:path`` of a git repository.

    Returns
    -------
    dict
        ``shown``, ``id``, ``nodes``, ``options``, ``ledger`` (rows as in a record) and ``links``.

    Raises
    ------
    EvenloadError
        When there is no such file or revision.
    InputRefused
        With every problem of the set.
    """
    with _set_file(place) as path:
        parent = path.parent
        root = parent.parent if parent.name in ("technologies", "wires") else parent
        library = open_library(root)
        file = read_toml(path, library.collector, path.name)
        if file is not None and ("workload" in file.data or "contender" in file.data):
            message = f"{place}: is a study; of a revision only a set of values can be compared"
            raise EvenloadError(message)
        item = None if file is None else library.build(file)
        library.collector.raise_if_any()
        if item is None:
            message = f"{place}: is not a set of values (technology or wires)"
            raise EvenloadError(message)
        return state_of_set(place, item, library.sources)


def state_of_set(shown: str, item: ParameterSet, sources: Mapping[str, Source]) -> dict[str, Any]:
    """Return what ``set_state`` returns of a set that is built."""
    return {
        "shown": shown,
        "id": item.id,
        "nodes": list(item.nodes),
        "options": dict(item.options),
        "ledger": set_rows(item, sources),
        "links": set_links(item),
    }


@contextlib.contextmanager
def _set_file(place: str) -> Iterator[Path]:
    """A set file as it is, or as it was at a revision, with the sets, tables and sources beside it."""
    if Path(place).is_file():
        yield Path(place)
        return
    revision, colon, name = place.partition(":")
    if not colon or not revision or not name:
        message = f"{absent(Path(place))}; a revision of a set is written REVISION:path"
        raise EvenloadError(message)
    path = PurePosixPath(name)
    top = path.parent.parent if path.parent.name in ("technologies", "wires") else path.parent
    tree = f"{revision}:{top}" if top.is_absolute() else f"{revision}:./{'' if str(top) == '.' else top}"
    packed = _git(place, "archive", "--format=tar", tree)
    with tempfile.TemporaryDirectory(prefix="evenload-") as folder:
        with tarfile.open(fileobj=io.BytesIO(packed)) as archive:
            archive.extractall(folder, filter="data")
        inside = Path(folder) / path.relative_to(top)
        if not inside.is_file():
            message = f"{place}: there is no such file at {revision}"
            raise EvenloadError(message)
        yield inside


def _git(place: str, *arguments: str) -> bytes:
    try:
        done = subprocess.run(["git", *arguments], capture_output=True, check=False, timeout=PATIENCE)
    except FileNotFoundError as error:
        message = f"{place}: names a revision, but git is not installed; give a file instead"
        raise UsageError(message) from error
    except subprocess.TimeoutExpired as error:
        message = f"{place}: git did not answer within {PATIENCE:g} s"
        raise EvenloadError(message) from error
    if done.returncode != 0:
        why = done.stderr.decode(errors="replace").strip().splitlines()
        message = f"{place}: git cannot give this revision ({why[-1] if why else 'no reason told'})"
        raise EvenloadError(message)
    return done.stdout
