"""The functions of the Python interface: loading, running, changing, checking, listing."""

from __future__ import annotations

import dataclasses
import datetime
import numbers
from collections.abc import Callable, Iterable, Mapping
from decimal import Decimal
from pathlib import Path
from typing import TYPE_CHECKING

from benchmark.api.result import Result
from benchmark.api.views import SetView, StudyView
from benchmark.errors import UsageError, nearest

if TYPE_CHECKING:
    import pandas

    from benchmark.record.changes import State
    from benchmark.record.check import CheckResult
    from benchmark.sets.study import DrawSettings

__all__ = ["check", "load_result", "load_set", "load_study", "run", "technologies", "what_if", "worked_study"]

Place = str | Path
#: share of a run with needs that is done when these begin
NEED_FROM = 0.2
#: share of a run since an earlier record that is done when the change is worked out
CHANGE_FROM = 0.6
#: a what-if number; text is read as the file would read it
WhatIf = int | float | Decimal | str


def folders_of(nodes: Iterable[Place]) -> list[Path]:
    folders = [Path(nodes)] if isinstance(nodes, (str, Path)) else [Path(folder) for folder in nodes]
    for folder in folders:
        if not folder.is_dir():
            message = f"{folder} is not a folder of sets"
            raise UsageError(message)
    return folders


def text_of(name: str, value: object) -> str:
    """The number as the file would spell it: exact, so that it gives the bits the command line gives."""
    if isinstance(value, (str, Decimal)):
        return str(value)
    if isinstance(value, numbers.Integral) and not isinstance(value, bool):
        return str(int(value))
    if isinstance(value, numbers.Real) and not isinstance(value, bool):
        return repr(float(value))
    message = f"{name}: a number is needed, found {value!r}"
    raise UsageError(message)


def load_set(name: str, nodes: Iterable[Place] = ()) -> SetView:
    """Load one technology or wires set with the sources its values name.

    Parameters
    ----------
    name : str
        Id of the set.
    nodes : iterable of path, optional
        Further folders of sets, searched before the shipped ones.

    Returns
    -------
    SetView
        The set; in a notebook it shows every value with unit, spread, evidence and source.

    Raises
    ------
    InputRefused
        With every problem of the file.
    """
    from benchmark.record.load import open_set

    item, library = open_set(name, *folders_of(nodes))
    return SetView(item, dict(library.sources))


def load_study(
    path: Place,
    nodes: Iterable[Place] = (),
    what_if: Mapping[str, WhatIf] | None = None,
    as_of: datetime.date | None = None,
) -> StudyView:
    """Load and check a study with every set, wires set and circuit it refers to.

    Parameters
    ----------
    path : str or Path
        Study file; sets beside it, and in a folder ``nodes`` beside it, are found first.
    nodes : iterable of path, optional
        Further folders of sets, searched before all others.
    what_if : mapping, optional
        Numbers to use instead of those of the files: a study value name, or ``technology.name``, to a number in the
        unit of the file. The range of a changed value is dropped.
    as_of : date, optional
        Values with a history as they were on this day.

    Returns
    -------
    StudyView
        The checked study.

    Raises
    ------
    InputRefused
        With every problem of every file, in one pass.
    """
    from benchmark.record.load import load_study as load

    folders = folders_of(nodes)
    changes = {name: text_of(f"what-if {name}", value) for name, value in (what_if or {}).items()}
    study, library = load(Path(path), folders, changes, as_of)
    return StudyView(Path(path), tuple(folders), changes, study, library)


def worked_study(name: str = "always-on-hub") -> StudyView:
    """Load one of the worked studies that come with the program.

    Parameters
    ----------
    name : str
        Name of its folder.

    Returns
    -------
    StudyView
        The checked study; ``always-on-hub`` is the one ``evenload demo`` runs.

    Raises
    ------
    UsageError
        When there is no such study.
    """
    from benchmark.sets.library import shipped_reports

    known = {path.parent.name: path for path in sorted(shipped_reports().glob("*/study.toml"))}
    if name not in known:
        message = f"there is no worked study {name!r}; known are {', '.join(known)}; {nearest(name, known)}".rstrip(
            "; "
        )
        raise UsageError(message)
    return load_study(known[name])


def what_if(study: StudyView, changes: Mapping[str, WhatIf] | None = None, /, **named: WhatIf) -> StudyView:
    """Load a study again with some numbers changed, as ``--set`` does on the command line.

    Parameters
    ----------
    study : StudyView
        The study to start from; changes it already has are kept unless named again. Its files are read again.
    changes : mapping, optional
        For names with a dot: ``{"demo-stress-gated.actuator_coefficient": 660}``.
    **named : int, float, Decimal or str
        Study values by name, in the unit of the file: ``activity=0.1``.

    Returns
    -------
    StudyView
        The changed study; ``study`` itself stays as it is.

    Raises
    ------
    UsageError
        When a name is given in both ways.
    InputRefused
        When a name is not a value of the study or the set, or the changed study cannot be run.
    """
    both = sorted(set(changes or {}) & set(named))
    if both:
        message = f"what-if names {', '.join(both)} twice"
        raise UsageError(message)
    changed = {**study.what_if, **(changes or {}), **named}
    return load_study(study.path, study.nodes, changed, study.library.as_of)


def run(
    study: StudyView | Place,
    *,
    created: str | None = None,
    progress: Callable[[str, float], None] | None = None,
    draws: int | None = None,
    seed: int | None = None,
    jobs: int = 1,
    need: bool = False,
    since: Result | Place | None = None,
    anyway: bool = False,
) -> Result:
    """Run a study.

    Parameters
    ----------
    study : StudyView, str or Path
        A loaded study, or the file of one.
    created : str, optional
        Time stamp to write into the record instead of the clock, for records that are equal byte by byte.
    progress : callable, optional
        Told the name of each step and the share done [1].
    draws : int, optional
        Draws of all ranges together instead of the study's: 0 for none, else a power of two from 16.
    seed : int, optional
        Seed of the draws instead of the study's.
    jobs : int
        Processes for the draws; no digit depends on their number.
    need : bool
        Also work out break-evens, required values, who must improve, the smallest flipping set and maps.
    since : Result, str or Path, optional
        An earlier result, record folder, ``record.json`` or ``report.html``: also say what changed since, and why.
    anyway : bool
        With ``since``: also when the earlier record answers another question.

    Returns
    -------
    Result
        Verdict, advantage, tables and record.

    Raises
    ------
    InputRefused
        When the study is a file with problems.
    UsageError
        When a number of draws, a seed or a number of processes cannot be one, or ``since`` answers another question.
    EvenloadError
        When ``since`` holds no record that can be evaluated.
    """
    from benchmark.record.run import run_study

    loaded = study if isinstance(study, StudyView) else load_study(study)
    earlier = None if since is None else _earlier(since, loaded, anyway)
    whole = progress
    if progress is not None and earlier is not None:
        progress = _part(progress, 0.0, CHANGE_FROM)
    told = {} if progress is None else {"progress": _part(progress, 0.0, NEED_FROM) if need else progress}
    settings = _draw_settings(loaded.study.draws, draws, seed, jobs)
    record = run_study(loaded.study, loaded.library, created=created, draws=settings, jobs=jobs, **told)
    record["what_if"] = dict(loaded.what_if)
    if loaded.library.as_of is not None:
        record["as_of"] = loaded.library.as_of.isoformat()
    if need:
        from benchmark.api.need_blocks import need_blocks
        from benchmark.record.results import clean

        record["need"] = clean(need_blocks(loaded, progress and _part(progress, NEED_FROM, 1.0), settings))
        if progress is not None:
            progress("done", 1.0)
    if earlier is not None:
        from benchmark.record.changes import State, compare_states, in_record
        from benchmark.record.criteria import after_earlier

        if whole is not None:
            whole("what changed, and why", CHANGE_FROM)
        found = compare_states(earlier, State("this run", record, loaded.study), anyway=anyway, jobs=jobs)
        record = in_record(dict(after_earlier(record, earlier.record)), found)
        if whole is not None:
            whole("done", 1.0)
    return Result(record)


def _earlier(since: Result | Place, study: StudyView, anyway: bool) -> State:
    """Return the earlier state, refused before anything is run when it answers another question."""
    from benchmark.record.changes import open_state, read_any_record, refuse_other_question

    if isinstance(since, Result):
        state = open_state("the earlier result", since.record)
    else:
        state = open_state(str(since), read_any_record(Path(since)))
    if not anyway:
        refuse_other_question((state.shown, state.study), (str(study.path), study.study))
    return state


def _part(progress: Callable[[str, float], None], start: float, end: float) -> Callable[[str, float], None]:
    """Return the progress of one part of a run: its share of 0 to 1 is that of ``start`` to ``end`` of the whole."""
    return lambda step, share: progress(step, start + (end - start) * share)


def _draw_settings(stated: DrawSettings, draws: int | None, seed: int | None, jobs: int) -> DrawSettings:
    from benchmark.sets.study import draws_allowed

    if draws is not None and draws != 0 and (allowed := draws_allowed(draws)):
        message = f"draws: {draws} is no number of draws; allowed: 0 for none, or {allowed}"
        raise UsageError(message)
    if seed is not None and seed < 0:
        message = f"seed: {seed} is negative; allowed: 0 or above"
        raise UsageError(message)
    if jobs < 1:
        message = f"jobs: {jobs} processes cannot work; allowed: 1 or more"
        raise UsageError(message)
    return dataclasses.replace(
        stated,
        number=stated.number if draws is None else draws,
        seed=stated.seed if seed is None else seed,
    )


def load_result(path: Place) -> Result:
    """Read the result of an earlier run.

    Parameters
    ----------
    path : str or Path
        A record folder, or its ``record.json``.

    Returns
    -------
    Result
        The same object that the run returned.

    Raises
    ------
    EvenloadError
        When it is missing, unreadable or of another format.
    """
    from benchmark.record.write import read_record

    return Result(read_record(Path(path)))


def check(
    paths: Place | Iterable[Place], nodes: Iterable[Place] = (), as_of: datetime.date | None = None
) -> CheckResult:
    """Check files of every kind without running anything.

    Parameters
    ----------
    paths : path or iterable of path
        Files and folders: sets, sources, circuits, studies.
    nodes : iterable of path, optional
        Further folders of sets.
    as_of : date, optional
        Values with a history as they were on this day.

    Returns
    -------
    CheckResult
        ``files`` counts what was read; ``problems`` are reasons to refuse, ``warnings`` are not.
    """
    from benchmark.record.check import check_paths

    listed = [paths] if isinstance(paths, (str, Path)) else list(paths)
    return check_paths([Path(path) for path in listed], folders_of(nodes), as_of)


def technologies(nodes: Iterable[Place] = ()) -> pandas.DataFrame:
    """List the technology sets there are.

    Parameters
    ----------
    nodes : iterable of path, optional
        Further folders of sets, searched before the shipped ones.

    Returns
    -------
    pandas.DataFrame
        One row per set: ``id``, ``title``, ``model``, ``nodes`` (labels in order), ``flavour``, ``ambition``.

    Raises
    ------
    InputRefused
        When a source list of a folder has problems.
    """
    import pandas

    from benchmark.record.listing import TECHNOLOGY_COLUMNS, technology_rows
    from benchmark.record.load import open_library

    library = open_library(*folders_of(nodes))
    library.collector.raise_if_any()
    return pandas.DataFrame(technology_rows(library), columns=["id", *TECHNOLOGY_COLUMNS])
