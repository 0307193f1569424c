"""The Python interface to many studies at once: which of them moved, which verdicts flipped."""

from __future__ import annotations

import functools
import time
from collections.abc import Callable, Collection, Iterable, Mapping, Sequence
from dataclasses import asdict, dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any

from benchmark.api.batch_files import Stamps, files_read, stamps
from benchmark.api.batch_options import taken_over
from benchmark.api.batch_processes import mapped
from benchmark.api.changes import OTHER, STUDY, toml_kind
from benchmark.errors import EvenloadError, InputRefused, UsageError

if TYPE_CHECKING:
    import pandas

    from benchmark.api.result import Result
    from benchmark.api.views import StudyView

__all__ = ["Batched", "StudyState", "batch", "studies_in"]

Place = str | Path
Told = Callable[[int, int], None]
#: what may have become of a study, and what it is called without an earlier record
UNCHANGED, MOVED, FLIPPED, NEW, FAILED = "unchanged", "moved", "flipped", "no earlier record", "failed"
#: an earlier record whose study is not in the folder any more
GONE = "study missing"
#: names of folders and files that hold other TOML files than studies
ELSEWHERE = frozenset({"nodes", "technologies", "wires", "circuits", "tables", "sources.toml"})


@dataclass(frozen=True)
class StudyState:
    """One study of a batch.

    ``study``: its file, from the folder of the batch. ``state``: unchanged (every result is the same to the last bit),
    moved (some result, not the verdict), flipped (the verdict), no earlier record, failed, or study missing: there is
    an earlier record, named in ``study`` by its folder, and no study for it. ``distance``: advantage over the required
    one [1]. ``results_moved``: results that differ. ``message``: why it failed, what makes the two records different
    questions, why the new record does not say what changed, or what was taken over from the earlier one. ``seconds``:
    its run took.
    """

    study: str
    state: str
    verdict_old: str = ""
    verdict_new: str = ""
    advantage_old: float | str | None = None
    advantage_new: float | str | None = None
    distance: float | None = None
    results_moved: int = 0
    message: str = ""
    seconds: float = 0.0


#: a study that was run, and the files it was read from
Done = tuple[StudyState, Stamps]


@dataclass(frozen=True, eq=False)
class Batched:
    """What became of the studies of a folder.

    Attributes
    ----------
    rows : tuple of StudyState
        One for each study, in the order of their files; then one for each earlier record without its study.
    seconds : float
        Wall time of all [s].
    notes : tuple of str
        TOML files of the folder that cannot be read and stand where sets, circuits, tables or sources do.
    files : mapping
        Every file that a study was read from, wherever it lies: name -> (time of its last change [ns], size [bytes])
        when the study was loaded; of a study that could not be loaded there are none.
    """

    rows: tuple[StudyState, ...]
    seconds: float
    notes: tuple[str, ...] = ()
    files: Mapping[str, tuple[int, int]] = field(default_factory=dict)

    @property
    def status(self) -> int:
        """Return the exit status: 3 a study failed, 20 a verdict flipped, else 0."""
        states = {row.state for row in self.rows}
        return 3 if FAILED in states else 20 if FLIPPED in states else 0

    @property
    def frame(self) -> pandas.DataFrame:
        """Return one row for each study."""
        import pandas

        return pandas.DataFrame([asdict(row) for row in self.rows])


def studies_in(folder: Place) -> list[Path]:
    """Return every file in a folder, at any depth, that is a study or, since it cannot be read, may be one.

    Raises
    ------
    UsageError
        When it is not a folder, or holds no study.
    """
    return _listed(folder)[0]


def _listed(folder: Place) -> tuple[list[Path], tuple[str, ...]]:
    """Return the studies of a folder, and what is to be said of other files that cannot be read."""
    place = Path(folder)
    if not place.is_dir():
        message = f"{place} is not a folder of studies"
        raise UsageError(message)
    found, notes = [], []
    for path in sorted(place.rglob("*.toml")):
        if not path.is_file() and not path.is_symlink():  # a link to nowhere is a mistake, not an absence
            continue
        kind, why = toml_kind(path)
        if kind == STUDY or (why and not {path.name, path.parent.name} & ELSEWHERE):
            found.append(path)
        elif kind != OTHER:
            notes.append(f"{path.relative_to(place)} cannot be read: {why}")
    if not found:
        message = f"{place}: holds no study; a study file is a TOML file with [workload] and [[contender]]"
        raise UsageError(message)
    return found, tuple(notes)


def batch(
    folder: Place,
    *,
    since: Place | None = None,
    out: Place | None = None,
    nodes: Iterable[Place] = (),
    created: str | None = None,
    draws: int | None = None,
    seed: int | None = None,
    jobs: int = 1,
    told: Told | None = None,
) -> Batched:
    """Run every study of a folder and say what became of it.

    Parameters
    ----------
    folder : str or Path
        Searched for study files at any depth.
    since : str or Path, optional
        Folder of earlier records, one folder per study at the place it has in ``folder``, as ``out`` writes them.
        Default: ``out``, as it was before.
    out : str or Path, optional
        Where to write the new records; none are written without it. One that moved says what changed, and why.
    nodes : iterable of path, optional
        As in ``load_study``.
    created : str, optional
        As in ``run``.
    draws : int, optional
        As in ``run``; by default those that were given to the run of the earlier record, else the study's.
    seed : int, optional
        The same. What would be needed is worked out again when the earlier record says it.
    jobs : int
        Studies run at once, each in a process of its own; no digit depends on their number.
    told : callable, optional
        Told the number of studies done, at first 0, and of all.

    Returns
    -------
    Batched
        A study that fails has its message in its row and does not stop the others.

    Raises
    ------
    UsageError
        When there is no study, or a number cannot be one.
    """
    if jobs < 1:
        message = f"jobs: {jobs} processes cannot work; allowed: 1 or more"
        raise UsageError(message)
    root = Path(folder)
    paths, notes = _listed(root)
    earlier = since if since is not None else out
    if since is not None and not Path(since).is_dir():
        message = f"{since} is not a folder of records"
        raise UsageError(message)
    _places_differ([path.relative_to(root) for path in paths])
    started = time.perf_counter()
    work = functools.partial(
        _one,
        root=root,
        since=None if earlier is None else Path(earlier),
        out=None if out is None else Path(out),
        nodes=tuple(Path(place) for place in nodes),
        options={"created": created, "draws": draws, "seed": seed},
    )
    rows: list[StudyState] = []
    files: Stamps = {}
    if told is not None:
        told(0, len(paths))
    for row, read in mapped(work, paths, jobs):
        rows.append(row)
        files |= read
        if told is not None:
            told(len(rows), len(paths))
    if earlier is not None:
        rows += _without_study(Path(earlier), {place_of(path.relative_to(root), Path()) for path in paths})
    return Batched(tuple(rows), time.perf_counter() - started, notes, files)


def _without_study(records: Path, known: Collection[Path]) -> list[StudyState]:
    """Return a row for each earlier record that belongs to no study; folders of killed runs begin with a dot."""
    from benchmark.record.write import read_record

    rows = []
    for path in sorted(records.rglob("record.json")):
        place = path.parent.relative_to(records)
        if place in known or any(part.startswith(".") for part in place.parts):
            continue
        name, message = str(place), f"there is a record in {path.parent}, and no study for it"
        try:
            verdict = read_record(path)["verdict"]
            rows.append(StudyState(name, GONE, verdict["word"], "", verdict["advantage"], message=message))
        except (EvenloadError, LookupError, TypeError) as error:
            rows.append(StudyState(name, GONE, message=f"{message}; {error}"))
    return rows


def _places_differ(names: Sequence[Path]) -> None:
    seen: dict[Path, Path] = {}
    for name in names:
        place = place_of(name, Path())
        if place in seen:
            message = f"{seen[place]} and {name} would have one record folder, {place}; rename one of them"
            raise UsageError(message)
        seen[place] = name


def _one(
    path: Path, *, root: Path, since: Path | None, out: Path | None, nodes: tuple[Path, ...], options: Mapping[str, Any]
) -> Done:
    """Run one study; whatever is wrong with it stays with it."""
    name = path.relative_to(root)
    started = time.perf_counter()
    files: Stamps = {}
    row: dict[str, Any] = {"state": FAILED}
    try:
        row = _ran(path, name, since, out, nodes, options, files)
    except InputRefused as error:
        more = f" and {len(error.problems) - 1} more" if len(error.problems) > 1 else ""
        row["message"] = f"{error.problems[0]}{more}"
    except (EvenloadError, OSError) as error:
        row["message"] = str(error)
    except Exception as error:  # a fault in one study must not lose the results of the others
        row["message"] = f"internal fault ({type(error).__name__}: {error}); run this study alone to see more"
    return StudyState(str(name), **row, seconds=_passed(started)), files


def _passed(started: float) -> float:
    return time.perf_counter() - started


def place_of(name: Path, records: Path) -> Path:
    """Return the record folder of a study: ``a/study.toml`` has ``a``, ``a/b.toml`` has ``a/b``."""
    return records / (name.parent if name.name == "study.toml" and name.parent != Path() else name.with_suffix(""))


def _ran(
    path: Path,
    name: Path,
    since: Path | None,
    out: Path | None,
    nodes: tuple[Path, ...],
    options: Mapping[str, Any],
    files: Stamps,
) -> dict[str, Any]:
    """Run a study, write its record, and put the files it was read from into ``files``."""
    from benchmark.api.result import Result
    from benchmark.api.session import load_study, run
    from benchmark.record.criteria import after_earlier
    from benchmark.record.write import read_record

    before = None
    if since is not None and (place_of(name, since) / "record.json").is_file():
        before = read_record(place_of(name, since))
    view = load_study(path, nodes)
    files |= stamps(files_read(view))
    as_before, words = ({}, "") if before is None else taken_over(before, view.study, options)
    result = run(view, **{**options, **as_before})
    row = _compared(before, result.record)
    row["message"] = "; ".join(text for text in (row.get("message", ""), words) if text)
    if before is not None:
        result = Result(after_earlier(result.record, before))
    if out is not None:
        if before is not None and row["state"] != UNCHANGED:
            result, why_not = _explained(before, view, result)
            row["message"] = "; ".join(text for text in (row["message"], why_not) if text)
        place_of(name, out).parent.mkdir(parents=True, exist_ok=True)
        result.save(place_of(name, out))
    return row


def _explained(before: Mapping[str, Any], view: StudyView, result: Result) -> tuple[Result, str]:
    """Return the result with what changed since the earlier record, or as it is with the reason why not."""
    from benchmark.api.result import Result
    from benchmark.record.changes import State, compare_states, in_record, open_state

    try:
        old = open_state("the earlier record", before)
        found = compare_states(old, State("this run", result.record, view.study), anyway=True)
    except (EvenloadError, InputRefused) as error:
        return result, f"what changed cannot be said: {str(error).splitlines()[0]}"
    return Result(in_record(result.record, found)), ""


def _compared(before: Mapping[str, Any] | None, now: Mapping[str, Any]) -> dict[str, Any]:
    from benchmark.record.changes.results import result_changes

    verdict, required = now["verdict"], now["study"]["required_advantage"]
    advantage = verdict["advantage"]
    row = {
        "state": NEW,
        "verdict_new": verdict["word"],
        "advantage_new": advantage,
        "distance": advantage / required if isinstance(advantage, float) else None,
    }
    if before is None:
        return row
    moved, _ = result_changes(before, now)
    old = before["verdict"]
    asked = before["study"]["required_advantage"]
    return row | {
        "state": FLIPPED if old["word"] != verdict["word"] else MOVED if moved else UNCHANGED,
        "verdict_old": old["word"],
        "advantage_old": old["advantage"],
        "results_moved": len(moved),
        "message": "" if asked == required else f"required advantage was {asked:g}",
    }
