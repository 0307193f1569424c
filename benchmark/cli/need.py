"""The command ``need``: where the answer changes, and what would be needed (layer 10)."""

from __future__ import annotations

import math
import sys
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from benchmark.cli.chosen import study_inputs
from benchmark.cli.commands import check_folders
from benchmark.cli.forms import check_form, echo_csv, echo_json
from benchmark.errors import UsageError

if TYPE_CHECKING:
    from benchmark.api.need import Needed

__all__ = ["need_command"]

#: longest name that stands beside its sentence in one table
SHORT = 32


def _range(text: str) -> tuple[str, str]:
    low, dots, high = text.partition("..")
    if not dots or not low.strip() or not high.strip():
        message = f"--over needs LOW..HIGH in the unit of the value, found {text!r}"
        raise UsageError(message)
    return low.strip(), high.strip()


class _Count:
    """Comparisons made so far, on standard error of a terminal."""

    def __init__(self) -> None:
        self.active, self.made = sys.stderr.isatty(), 0

    def __call__(self, rows: int) -> None:
        self.made += rows
        if self.active:
            sys.stderr.write(f"\r\x1b[K{self.made} comparisons")
            sys.stderr.flush()

    def __enter__(self) -> None:
        pass

    def __exit__(self, *stopped: object) -> None:
        """Wipe the line, also when the question is interrupted."""
        if self.active:
            sys.stderr.write("\r\x1b[K")
            sys.stderr.flush()


def _one_of(chosen: Mapping[str, bool]) -> str:
    asked = [name for name, wanted in chosen.items() if wanted]
    if len(asked) > 1:
        message = f"{' and '.join(asked)} are different questions; ask one at a time"
        raise UsageError(message)
    return asked[0] if asked else ""


def _refuse_idle(idle: Mapping[str, bool], question: str) -> None:
    """Refuse what the question asked has no use for."""
    listed = [name for name, given in idle.items() if given]
    if listed:
        homes = {"--together": "--sheet", "--probability": "--sheet"}
        belongs = [f"{name} belongs to {homes[name]}" for name in listed if name in homes and not question]
        message = "; ".join(belongs) or f"{question} takes no {' and no '.join(listed)}"
        raise UsageError(message)


def need_command(
    study_path: Path,
    names: Sequence[str],
    *,
    advantage: float | None,
    pair: str,
    over: Sequence[str],
    points: int | None,
    trade: bool,
    sheet: bool,
    together: bool,
    map_: str,
    improve: bool,
    flips: int | None,
    probability: float | None,
    draws: int | None,
    seed: int | None,
    form: str,
    nodes: Sequence[Path],
    overrides: Mapping[str, str],
) -> None:
    """Answer one question about a study and print it."""
    from benchmark import api

    check_folders(nodes)
    check_form(form)
    question = _one_of(
        {"--trade": trade, "--sheet": sheet, "--map": bool(map_), "--improve": improve, "--flips": flips is not None}
    )
    if trade and len(names) != 2:
        message = f"--trade needs exactly two names, found {len(names)}"
        raise UsageError(message)
    _refuse_idle(
        {
            "names": bool(names) and question not in ("", "--trade", "--sheet"),
            "--over": bool(over) and question not in ("", "--trade"),
            "--together": together and question != "--sheet",
            "--probability": probability is not None and question != "--sheet",
            "--points": points is not None and question in ("--improve", "--flips"),
        },
        question,
    )
    drawing = {"--draws": draws is not None, "--seed": seed is not None}
    if idle := [name for name, given in drawing.items() if given and probability is None]:
        message = f"{' and '.join(idle)} without --probability: nothing would be drawn"
        raise UsageError(message)
    if over and not names:
        message = "--over needs the names of the values whose ranges it states"
        raise UsageError(message)
    ranges = [_range(text) for text in over]
    if points is not None and points < 2:
        message = f"--points needs 2 or more, found {points}"
        raise UsageError(message)
    told = _Count()
    more: dict[str, Any] = {"advantage": advantage, "pair": pair, "told": told}
    scan: dict[str, Any] = {} if points is None else {"points": points}
    with told, study_inputs(study_path, overrides, nodes) as (path, numbers):
        view = api.load_study(path, nodes, numbers)
        if trade:
            found = api.trade(view, names[0], names[1], over=ranges, **more, **scan)
        elif sheet:
            asked = api.joint_sheet if together else api.sheet
            found = asked(view, names, probability=probability, draws=draws, seed=seed, **more, **scan)
        elif map_:
            found = api.opportunity(view, map_, **more, **scan)
        elif improve:
            found = api.improve(view, **more)
        elif flips is not None:
            found = api.flips(view, up_to=flips, **more)
        else:
            found = api.need(view, names, over=ranges, **more, **scan)
    _print(found, form)


def _print(found: Needed, form: str) -> None:
    if form == "text":
        from benchmark.cli.layout import Facts, Note, show_blocks

        # short names make one table; long ones would leave no room for the sentences
        short = max(len(name) for name, _ in found.facts) <= SHORT
        facts = [Facts("", found.facts)] if short else [Facts("", [fact]) for fact in found.facts]
        show_blocks([*map(Note, found.heading), *facts])
    elif form == "csv":
        echo_csv(found.columns, ([_cell(row[column]) for column in found.columns] for row in found.rows))
    else:
        rows = [{column: _plain(row[column]) for column in found.columns} for row in found.rows]
        echo_json({"heading": list(found.heading), "rows": rows})


def _cell(value: Any) -> str:
    """A number with all its digits; nothing where there is none."""
    if isinstance(value, float):
        return "" if math.isnan(value) else repr(float(value))
    return str(value)


def _plain(value: Any) -> Any:
    """A value that JSON knows: null where there is no number, a word for infinity."""
    if isinstance(value, float) and not math.isfinite(value):
        return None if math.isnan(value) else ("infinite" if value > 0.0 else "-infinite")
    return value
