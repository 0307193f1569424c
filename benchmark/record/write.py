"""Writing a record folder: all or nothing (layer 8)."""

from __future__ import annotations

import contextlib
import glob
import json
import os
import shutil
import tempfile
import time
from collections.abc import Callable, Iterator, Mapping
from pathlib import Path
from typing import Any

from benchmark.errors import EvenloadError, nearest

__all__ = ["absent", "of_this_version", "read_record", "summary", "to_json", "write_folder"]

#: end of the name under which the old folder waits where two folders cannot be exchanged in one step
_OLD = ".old"
#: seconds to wait for another run that is looking for left-overs beside the same folder
PATIENCE = 2.0


def to_json(data: Any) -> str:
    """Serialise with stable key order and shortest exact numbers."""
    return json.dumps(data, indent=1, ensure_ascii=False, allow_nan=False, sort_keys=False) + "\n"


def _probability(found: Any) -> Any:
    """Probabilities of the draws with their sampling errors; null without draws."""
    if found is None:
        return None
    return {key: found[key] for key in ("draws", "seed", "word", "reaches", "above_one", "without_candidate")}


def summary(record: Mapping[str, Any]) -> dict[str, Any]:
    """Return the small, stable part of a record: it depends on values, not on how files spell them."""
    verdict, study = record["verdict"], record["study"]
    primary = record["policies"][0]
    point = primary["candidate"]["point"]
    reference = next((side for side in primary["contenders"] if side["id"] == primary["strongest"]), None)

    def brief(side: Any) -> Any:
        if side is None or side["point"] is None:
            return None
        keep = ("supply", "time", "energy", "leakage_power", "area", "delay_limit", "energy_limit")
        return {key: side["point"][key] for key in keep} | {"id": side["id"]}

    return {
        "schema": record["schema"],
        **({"ratio_only": record["ratio_only"]} if record.get("ratio_only") else {}),
        "study": study["id"],
        "demonstration": study["demonstration"],
        "verdict": verdict["word"],
        "reasons": verdict["reasons"],
        "conditions": verdict["conditions"],
        "measure_next": verdict["measure_next"],
        "advantage": verdict["advantage"],
        "advantage_low": verdict["advantage_low"],
        "advantage_high": verdict["advantage_high"],
        "required_advantage": study["required_advantage"],
        "probability": _probability(record.get("uncertainty")),
        "metric": study["metric"],
        "policy": study["primary_policy"],
        "strongest_contender": primary["strongest"],
        "requirements": [
            {key: row[key] for key in ("name", "kind", "state", "demanded", "offered", "margin")}
            for row in record["requirements"]
        ],
        "candidate": brief(primary["candidate"]),
        "reference": brief(reference),
        "delay_shares": None if point is None else point["delay_shares"],
        "energy_shares": None if point is None else point["energy_shares"],
        "inputs_with_effect": verdict["inputs_with_effect"],
        "inputs_without_range": verdict["inputs_without_range"],
        "defaults_used": sum(row["set_by"] == "default" for row in [*record["ledger"], *record["options"]]),
        "self_checks_passed": all(check["passed"] for check in record["self_checks"]),
    }


def write_folder(folder: Path, fill: Callable[[Path], None]) -> None:
    """Fill a new folder beside ``folder`` and swap it in; whenever a run ends, there is the old folder or the new one.

    What killed runs left beside the folder is cleared away; the folder of a run that is still going is not.

    Raises
    ------
    EvenloadError
        When the place cannot be written.
    """
    folder = folder.absolute()
    with contextlib.ExitStack() as until_the_end:
        try:
            folder = folder.resolve() if folder.is_symlink() else folder
            temporary = _made_beside(folder, until_the_end)
            # half a new folder, or after the swap the old one
            until_the_end.callback(shutil.rmtree, temporary, ignore_errors=True)
            fill(temporary)
            temporary.chmod(0o755)
            _swap_in(temporary, folder)
        except OSError as error:
            message = f"{folder}: cannot be written ({error.strerror or error}); nothing was written"
            raise EvenloadError(message) from error


def _made_beside(folder: Path, held: contextlib.ExitStack) -> Path:
    """Make an empty folder beside ``folder``, held until the end, so that no other run takes it for a left-over."""
    folder.parent.mkdir(parents=True, exist_ok=True)
    with _held(folder.parent, PATIENCE) as alone:
        if alone:
            _clear_left_over(folder)
        if folder.exists() and not _is_record(folder):
            message = f"{folder.name}: exists and is not a record folder; nothing was written"
            raise EvenloadError(message)
        temporary = Path(tempfile.mkdtemp(prefix=_prefix(folder), dir=folder.parent))
        held.enter_context(_held(temporary))
    return temporary


def _prefix(folder: Path) -> str:
    """How the folders beside ``folder`` begin in which it is made."""
    return f".{folder.name[:100]}.evenload-"


@contextlib.contextmanager
def _held(folder: Path, patience: float = 0.0) -> Iterator[bool]:
    """Hold a folder for this process alone until the end, however that comes; tells whether that is certain.

    ``patience``: seconds to wait for another process. Where the system has no such locks the answer is False.
    """
    try:
        import fcntl
    except ImportError:
        yield False
        return
    place, latest, certain = os.open(folder, os.O_RDONLY), time.monotonic() + patience, False
    try:
        while not certain:
            try:
                fcntl.flock(place, fcntl.LOCK_EX | fcntl.LOCK_NB)
                certain = True
            except OSError:
                if time.monotonic() >= latest:
                    break
                time.sleep(0.01)
        yield certain
    finally:
        os.close(place)


def _clear_left_over(folder: Path) -> None:
    """Clear away what killed runs left; put the old folder back if one was killed between two renames."""
    for left in sorted(folder.parent.glob(f"{glob.escape(_prefix(folder))}*")):
        with contextlib.suppress(OSError), _held(left) as free:
            if not free:
                continue
            if left.suffix == _OLD and not folder.exists():
                os.replace(left, folder)  # noqa: PTH105
            else:
                shutil.rmtree(left, ignore_errors=True)


def _swap_in(new: Path, folder: Path) -> None:
    """Put ``new`` at ``folder``; what was there is at ``new`` afterwards."""
    if not folder.exists():
        os.replace(new, folder)  # noqa: PTH105
        return
    if _exchange(new, folder):
        return
    old = new.with_name(new.name + _OLD)
    os.replace(folder, old)  # noqa: PTH105 - killed from here on, the next run puts it back
    try:
        os.replace(new, folder)  # noqa: PTH105
    except BaseException:
        os.replace(old, folder)  # noqa: PTH105
        raise
    os.replace(old, new)  # noqa: PTH105


def _exchange(one: Path, two: Path) -> bool:
    """Exchange two folders in one step, where the system can (Linux: renameat2); tells whether it did."""
    import ctypes

    try:
        rename = ctypes.CDLL(None, use_errno=True).renameat2
    except (OSError, AttributeError, TypeError):
        return False
    here, exchange = -100, 2  # AT_FDCWD, RENAME_EXCHANGE of <linux/fs.h>
    return bool(rename(here, os.fsencode(one), here, os.fsencode(two), exchange) == 0)


def _is_record(folder: Path) -> bool:
    return folder.is_dir() and ((folder / "record.json").is_file() or not any(folder.iterdir()))


def absent(path: Path) -> str:
    """Say that there is nothing at a path, with the nearest name beside it."""
    beside: list[str] = []
    with contextlib.suppress(OSError):
        beside = sorted(place.name for place in path.parent.iterdir() if not place.name.startswith("."))
    hint = nearest(path.name, beside)
    return f"{path}: does not exist{f'; {hint}' if hint else ''}"


def read_record(path: Path) -> dict[str, Any]:
    """Read ``record.json`` from a folder or a file.

    Raises
    ------
    EvenloadError
        Missing, unreadable or of another schema.
    """
    file = path
    try:
        file = path / "record.json" if path.is_dir() else path
        if file.exists() and not file.is_file():
            message = f"{file}: is not a regular file, a record is needed"
            raise EvenloadError(message)
        record = json.loads(file.read_text(encoding="utf-8"))
    except (FileNotFoundError, NotADirectoryError) as error:
        raise EvenloadError(absent(file)) from error
    except (OSError, ValueError, RecursionError) as error:
        message = f"{file}: is not a readable record ({type(error).__name__})"
        raise EvenloadError(message) from error
    return of_this_version(record, file)


def of_this_version(record: Any, file: Path) -> dict[str, Any]:
    """Return what was read from ``file`` if it is a record that this version reads, else refuse it."""
    if not isinstance(record, dict) or record.get("schema") != 1:
        found = record.get("schema") if isinstance(record, dict) else type(record).__name__
        message = f"{file}: record schema {found!r} is not the one this version reads (1)"
        raise EvenloadError(message)
    return record
