"""Reading a raw measured file as its description says (layer 7.5)."""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from pathlib import Path

import numpy as np

from benchmark.curves.blocks import Block, make_blocks
from benchmark.curves.columns import Column, judge_column
from benchmark.curves.description import CurvesFile
from benchmark.curves.lines import MOST_SHOWN, Reading, read_rows
from benchmark.curves.matching import match_columns
from benchmark.curves.meanings import MEANINGS, MULTIPLIED
from benchmark.curves.notes import column_note, curve_notes, mark_notes
from benchmark.curves.numbers import Numbers, read_numbers
from benchmark.curves.record import IntArray, MeasuredCurves, Sweep
from benchmark.curves.requests import convert_requests
from benchmark.curves.sweeps import given_values, make_sweeps
from benchmark.sets.files import TomlFile, read_bytes, read_toml
from benchmark.sets.library import shipped_nodes
from benchmark.sets.problems import Collector
from benchmark.sets.schema import DefaultsTable, validate
from benchmark.sets.sources import read_sources
from benchmark.sets.values import Place, read_provenance
from benchmark.units import UnitError, parse_unit

__all__ = ["read_curves"]


def read_curves(
    path: Path, collector: Collector, sources: frozenset[str] | None = None, shown_name: str = ""
) -> MeasuredCurves | None:
    """Read a raw measured file as its description says.

    Parameters
    ----------
    path : path
        The description, a TOML file of kind ``curves``; it names the raw file beside it.
    collector : Collector
        Takes every problem of both files, in one pass.
    sources : frozenset of str, optional
        Known source keys; without it, those of ``sources.toml`` beside the description and of the shipped list.
    shown_name : str, optional
        How messages call the description; without it, its path.

    Returns
    -------
    MeasuredCurves or None
        None after any problem. Numbers are in SI, exact until one rounding, so every dialect of the same table gives
        the same bits.
    """
    before = len(collector.problems)
    opened = _open(path, sources, shown_name or str(path), collector)
    if opened is None:
        return None
    reading, raw, consistent = opened
    spec, notes = reading.spec, reading.table.notes
    columns = _columns(reading, consistent)
    units = _units(columns, reading)
    requests = convert_requests(spec.extract, reading.file, spec.along, units, collector) if columns else []
    sweeps = _sweeps(columns, reading)
    if len(collector.problems) > before:
        return None
    ignored = [f"columns left out as declared: {', '.join(spec.ignore)}"] if spec.ignore else []
    return MeasuredCurves(
        name=path.stem,
        file=reading.table.name,
        description=reading.file.name,
        digest=hashlib.sha256(raw).hexdigest(),
        description_digest=reading.file.sha256,
        along=spec.along,
        sweeps=tuple(sweeps),
        units=units,
        notes=(
            *notes,
            *(column_note(column, spec) for column in columns),
            *ignored,
            *curve_notes(sweeps, spec, units),
            *mark_notes(sweeps, columns),
        ),
        evidence=spec.evidence,
        source=spec.source,
        where=spec.where,
        conditions=spec.conditions,
        date=spec.date.isoformat() if spec.date else "",
        owner=spec.owner,
        note=spec.note,
        title=spec.title,
        hero=spec.hero,
        extract=tuple(requests),
    )


def _open(
    path: Path, sources: frozenset[str] | None, shown_name: str, collector: Collector
) -> tuple[Reading, bytes, bool] | None:
    """Read the description and divide the raw file into rows; and tell whether the keys of the description agree."""
    file = read_toml(path, collector, shown_name)
    spec = None if file is None else validate(CurvesFile, file, collector)
    if file is None or spec is None:
        return None
    known = _known_sources(path, collector) if sources is None else sources
    read_provenance(spec, Place(file, "", DefaultsTable(), known), collector)
    consistent = _check_choices(spec, file, collector)
    if Path(spec.file).name != spec.file:
        collector.add(file.problem("file", "is not the name of a file beside the description", repr(spec.file)))
        return None
    name = (Path(file.name).parent / spec.file).as_posix()
    raw = read_bytes(path.parent / spec.file, name, collector)
    table = None if raw is None else read_rows(raw, spec, name, collector)
    return None if raw is None or table is None else (Reading(spec, file, table, collector), raw, consistent)


def _columns(reading: Reading, consistent: bool) -> list[Column]:
    """Find and judge the columns; none when any of them has a problem, or the description contradicts itself."""
    start = len(reading.collector.problems)
    places = match_columns(reading)
    if reading.spec.repeat and len(reading.collector.problems) == start and all(place.group < 0 for place in places):
        words = str(len(reading.spec.repeat.words))
        reading.problem("repeat", "repeats no column", "", f"a header that stands {words} times")
    judged = [judge_column(place, reading) for place in places]
    columns = [column for column in judged if column is not None]
    if consistent and len(reading.collector.problems) == start:
        return columns
    _read_alone(columns, reading)
    return []


def _sweeps(columns: list[Column], reading: Reading) -> list[Sweep]:
    """Cut the file into curves; what is wrong elsewhere does not keep them from being judged."""
    start = len(reading.collector.problems)
    blocks = make_blocks(columns, reading) if columns else []
    given = given_values(reading)
    used = [_rows_of(block, reading) for block in blocks]
    numbers = _numbers(blocks, used, reading)
    if len(reading.collector.problems) > start:
        return []
    sweeps = [
        sweep
        for block, rows in zip(blocks, used, strict=True)
        for sweep in make_sweeps(block, rows, numbers, given, reading)
    ]
    if columns and len(reading.collector.problems) == start:
        _check_given(sweeps, reading)
    return sweeps


def _known_sources(path: Path, collector: Collector) -> frozenset[str]:
    """Source keys of the list beside the description and of the shipped one."""
    keys = set(read_sources(shipped_nodes() / "sources.toml", collector))
    beside = path.parent / "sources.toml"
    return frozenset(keys | set(read_sources(beside, collector)) if beside.exists() else keys)


def _check_choices(spec: CurvesFile, file: TomlFile, collector: Collector) -> bool:
    """Refuse keys that exclude each other or mean nothing; True when there are none."""
    before = len(collector.problems)
    if spec.skip_rows and spec.header_starts:
        collector.add(file.problem("skip_rows", "stands beside header_starts", "", "one of them"))
    if spec.header_starts and not spec.has_header:
        collector.add(file.problem("header_starts", "needs a header", "has_header = false"))
    if spec.units == "header" and not spec.has_header:
        collector.add(file.problem("units", "needs a header", "has_header = false"))
    if spec.turns and spec.sort:
        collector.add(file.problem("turns", "stands beside sort = true", "", "one of them"))
    if spec.turns and (len(spec.turns) < 2 or len(set(spec.turns)) < len(spec.turns)):
        found = ", ".join(spec.turns)
        collector.add(file.problem("turns", "needs different names for two parts or more", found))
    labels = [column.meaning for column in spec.column if column.kind == "label"]
    labels += [name for column in spec.column for name in column.labels]
    labels += [spec.repeat.label] if spec.repeat else []
    for name in ("sweep", "pass"):
        if spec.turns and name in labels:
            collector.add(file.problem("turns", "names curves that a label names already", name))
    if spec.repeat and len(set(spec.repeat.words)) < len(spec.repeat.words):
        collector.add(file.problem("repeat.words", "names two groups alike", ", ".join(spec.repeat.words)))
    if spec.comment and spec.comment.strip() != spec.comment:
        collector.add(file.problem("comment", "has blanks around it", repr(spec.comment)))
    return len(collector.problems) == before


def _rows_of(block: Block, reading: Reading) -> IntArray:
    """Rows on which a block has readings: beside others, a shorter block leaves its cells empty."""
    rows = reading.table.rows
    if not block.own:
        return np.arange(len(rows), dtype=np.int64)
    places = [column.position for column in block.own]
    return np.array(
        [index for index, row in enumerate(rows) if any(row.cells[place] for place in places)], dtype=np.int64
    )


def _numbers(blocks: list[Block], used: list[IntArray], reading: Reading) -> dict[int, Numbers]:
    """Read the numbers of every column on the rows its blocks use; words of labels are checked."""
    wanted: dict[int, tuple[Column, list[IntArray]]] = {}
    for block, rows in zip(blocks, used, strict=True):
        for column in block.columns:
            wanted.setdefault(column.position, (column, []))[1].append(rows)
    found = {}
    for position, (column, parts) in wanted.items():
        rows = np.unique(np.concatenate(parts))
        if column.spec.kind == "label":
            _check_words(column, rows, reading)
        else:
            found[position] = read_numbers(column, rows, reading)
    return found


def _read_alone(columns: list[Column], reading: Reading) -> None:
    """Judge the cells of columns that are good themselves where others are not, to report all in one pass."""
    for column in columns:
        rows = [index for index, row in enumerate(reading.table.rows) if row.cells[column.position]]
        if column.spec.kind == "label":
            _check_words(column, np.array(rows, dtype=np.int64), reading)
        else:
            read_numbers(column, np.array(rows, dtype=np.int64), reading)


def _check_words(column: Column, rows: IntArray, reading: Reading) -> None:
    """A label has a word in every row, one of those allowed."""
    allowed = column.spec.allowed
    for index in rows.tolist():
        row = reading.table.rows[index]
        word, where = row.cells[column.position], (row.line, column.header)
        if not word:
            reading.table.refuse(where, "has no word", "", ", ".join(allowed or []), most=MOST_SHOWN)
        elif allowed is not None and word not in allowed:
            reading.table.refuse(where, "is not an allowed word", repr(word[:40]), ", ".join(allowed), most=MOST_SHOWN)


def _check_given(sweeps: list[Sweep], reading: Reading) -> None:
    """What is given for certain labels belongs to some curve."""
    for index, table in enumerate(reading.spec.given):
        if not any(table.labels.items() <= sweep.labels.items() for sweep in sweeps):
            words = ", ".join(f"{name} {word}" for name, word in table.labels.items())
            reading.problem(f"given.{index}.labels", "fits no curve of the file", words)


def _units(columns: list[Column], reading: Reading) -> Mapping[str, str]:
    """Unit in which each meaning is printed: that of the file, for per-width numbers with that of the width."""
    spec = reading.spec
    found: dict[str, str] = {}
    tables = [spec.fixed, *(table.fixed for table in spec.given), *(column.fixed for column in spec.column)]
    stated = [(name, m.unit) for table in tables for name, m in table.items() if _fits(name, m.unit)]
    widths = [column.unit.text for column in columns if column.meaning == "width"]
    widths += [unit for name, unit in stated if name == "width"]
    width = [*widths, "m"][0]  # a column per width without any width is refused with its first curve
    for column in columns:
        if column.spec.kind == "label":
            continue
        unit = column.unit.text
        if column.spec.per_width:
            unit = f"{unit} {width}" if column.spec.meaning in MULTIPLIED else f"{unit}/{width}"
        found.setdefault(column.meaning, unit)
    for name, unit in stated:
        found.setdefault(name, unit)
    return found


def _fits(name: str, unit: str) -> bool:
    """Tell whether a meaning is known and a unit fits it; what does not is refused elsewhere."""
    try:
        return name in MEANINGS and parse_unit(unit).dimension == parse_unit(MEANINGS[name].unit).dimension
    except UnitError:
        return False
