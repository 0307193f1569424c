"""The Python interface to what changed and why."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

from benchmark.api.result import Result
from benchmark.api.views import StudyView
from benchmark.errors import EvenloadError, UsageError

if TYPE_CHECKING:
    import pandas

    from benchmark.record.changes import State

__all__ = ["Changes", "changes"]

Place = str | Path
End = StudyView | Result | Place
#: tables of a comparison of two studies, in the order of the report
TABLES = ("inputs", "other", "points", "attribution", "chain", "results")
#: what a TOML file may be, here
STUDY, OTHER, UNKNOWN = "study", "other", "unknown"
#: a line of a table that only a study has
_STUDY_LINE = re.compile(r"^\ufeff?[ \t]*(?:\[\[?[ \t]*)?[\"']?(?:workload|contender)[\"']?[ \t]*[\].=]", re.MULTILINE)


@dataclass(frozen=True, eq=False)
class Changes:
    """What changed between two states.

    Attributes
    ----------
    data : mapping
        Everything as plain data, as ``evenload changes --format json`` prints it. Two sets have inputs only.
    record : mapping or None
        The record of the new state with what changed in it; None for two sets.
    """

    data: Mapping[str, Any]
    record: Mapping[str, Any] | None = None

    @property
    def flipped(self) -> bool:
        """Tell whether the verdict is another one; never for two sets."""
        return bool(self.data.get("verdict", {}).get("flipped", False))

    @property
    def frames(self) -> dict[str, pandas.DataFrame]:
        """Return the tables by name; of ``attribution`` one row for each part."""
        import pandas

        found = {name: pandas.DataFrame(self.data[name]) for name in TABLES if name in self.data}
        if "attribution" in found:
            found["attribution"] = pandas.DataFrame(part_rows(self.data["attribution"]))
        return found

    def report(self, path: Place) -> Path:
        """Write the report of the new state with a section of what changed since the old one.

        Parameters
        ----------
        path : str or Path
            File to write; one that exists is replaced.

        Returns
        -------
        Path
            The file.

        Raises
        ------
        UsageError
            When two sets were compared.
        EvenloadError
            When the file cannot be written.
        """
        if self.record is None:
            message = "two sets of values have no report; compare two studies or their records"
            raise UsageError(message)
        return Result(self.record).report(path)


def part_rows(attribution: Iterable[Mapping[str, Any]]) -> list[dict[str, Any]]:
    """Return one row for each part of each quantity, the total last."""
    rows: list[dict[str, Any]] = []
    for item in attribution:
        head = {name: item[name] for name in ("quantity", "scale", "unit")}
        rows += [{**head, "cause": cause, "part": part} for cause, part in item["parts"].items()]
        rows.append({**head, "cause": "total", "part": item["total"]})
    return rows


def changes(
    old: End,
    new: End,
    *,
    nodes: Iterable[Place] = (),
    anyway: bool = False,
    draws: int | None = None,
    seed: int | None = None,
    jobs: int = 1,
) -> Changes:
    """Say what changed from one state of a study, or of a set, to another, and why.

    Parameters
    ----------
    old : Result, StudyView, str or Path
        A result; a study (it is run); or the place of a record folder, ``record.json``, ``report.html``, study file,
        set file, or ``REVISION:path`` of a set in a git repository.
    new : Result, StudyView, str or Path
        The same.
    nodes : iterable of path, optional
        Further folders of sets, for study files.
    anyway : bool
        Compare also records that answer different questions.
    draws : int, optional
        For studies that are run, as in ``run``.
    seed : int, optional
        The same.
    jobs : int
        Processes for draws; no digit depends on their number.

    Returns
    -------
    Changes
        Inputs, results, verdict, the parts of each change and what lies between. Of two sets: values only.

    Raises
    ------
    UsageError
        A set against a study, two records that answer different questions, or an option that would have no effect.
    EvenloadError
        A place that holds nothing that can be compared.
    InputRefused
        With every problem of the files.
    """
    from benchmark.record.changes import compare_sets, compare_states, in_record, set_state

    places = list(nodes)
    _refuse_absent(old, new)
    kinds = [_kind(end) for end in (old, new)]
    if kinds.count("set") == 1:
        message = f"{old} and {new} cannot be compared: one is a set of values, the other a study or its record"
        raise UsageError(message)
    _refuse_idle(kinds, {"nodes": bool(places), "draws": draws is not None, "seed": seed is not None})
    if kinds[0] == "set":
        _refuse_idle(kinds, {"anyway": anyway, "jobs": jobs != 1})
        return Changes(compare_sets(set_state(str(old)), set_state(str(new))))
    told = {"nodes": places, "draws": draws, "seed": seed, "jobs": jobs}
    states = [_state(end, kind, word, told) for end, kind, word in zip((old, new), kinds, ("old", "new"), strict=True)]
    found = compare_states(*states, anyway=anyway, jobs=jobs)
    return Changes(found, in_record(states[1].record, found))


def _refuse_absent(*ends: End) -> None:
    """Refuse places where nothing is, all in one pass; what has a colon may be a revision, which git knows."""
    from benchmark.record.write import absent

    told = []
    for end in dict.fromkeys(end for end in ends if isinstance(end, (str, Path))):
        try:
            Path(end).stat()
        except (FileNotFoundError, NotADirectoryError):
            if ":" not in str(end):
                told.append(absent(Path(end)))
        except (OSError, ValueError):
            continue  # there is something that cannot be read: said when it is
    if told:
        message = "\n".join(told)
        raise EvenloadError(message)


def _refuse_idle(kinds: list[str], given: Mapping[str, bool]) -> None:
    """Refuse options for running a study where none is run, and of results where two sets are compared."""
    idle = [name for name, stated in given.items() if stated]
    if idle and "study" not in kinds:
        what = "two sets are compared value by value" if kinds[0] == "set" else "records hold what they were run with"
        message = f"{', '.join(idle)}: without effect, for {what}; leave out"
        raise UsageError(message)


def _kind(end: End) -> str:
    """Return what an end is: result, study, record or set."""
    if isinstance(end, Result):
        return "result"
    if isinstance(end, StudyView):
        return "study"
    path = Path(end)
    if path.is_dir() or path.suffix.lower() in (".json", ".html", ".htm"):
        return "record"
    if path.is_file() and is_study(path):
        return "study"
    return "set"


def is_study(path: Path) -> bool:
    """Tell whether a TOML file is a study; one that is no TOML counts by the tables its lines name."""
    return toml_kind(path)[0] == STUDY


def toml_kind(path: Path) -> tuple[str, str]:
    """Return what a TOML file is, ``study``, ``other`` or ``unknown``, and why it cannot be read, if it cannot.

    ``unknown``: it cannot be read, and none of its lines names a table that only a study has.
    """
    from benchmark.sets.files import MAX_BYTES, read_toml
    from benchmark.sets.problems import Collector

    collector = Collector()
    file = read_toml(path, collector, path.name)
    if file is not None:
        return STUDY if "workload" in file.data or "contender" in file.data else OTHER, ""
    why = "; ".join(map(str, collector.problems))
    try:
        text = path.read_text(encoding="utf-8", errors="replace") if path.stat().st_size <= MAX_BYTES else ""
    except (OSError, ValueError):
        text = ""
    return STUDY if _STUDY_LINE.search(text) else UNKNOWN, why


def _state(end: End, kind: str, word: str, told: Mapping[str, Any]) -> State:
    from benchmark.api.session import load_study, run
    from benchmark.record.changes import State, open_state, read_any_record

    if isinstance(end, Result):
        return open_state(f"the {word} result", end.record)
    if kind == "record":
        return open_state(str(end), read_any_record(Path(str(end))))
    view = end if isinstance(end, StudyView) else load_study(end, told["nodes"])
    result = run(view, draws=told["draws"], seed=told["seed"], jobs=told["jobs"])
    return State(str(view.path), result.record, view.study)
