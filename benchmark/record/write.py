"""Writing a record folder: all or nothing (layer 8)."""

from __future__ import annotations

import contextlib
import json
import os
import shutil
import tempfile
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any

from benchmark.errors import EvenloadError

__all__ = ["read_record", "summary", "to_json", "write_folder"]


def to_json(data: Any) -> str:
    """Serialise with stable key order and shortest exact numbers."""
    return json.dumps(data, indent=1, ensure_ascii=False, allow_nan=False, sort_keys=False) + "\n"


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
    """Fill a new folder beside ``folder`` and swap it in; a killed or failed run leaves the old folder or none.

    Raises
    ------
    EvenloadError
        When the place cannot be written.
    """
    folder = folder.absolute()
    try:
        folder.parent.mkdir(parents=True, exist_ok=True)
        if folder.exists() and not _is_record(folder):
            message = f"{folder.name}: exists and is not a record folder; nothing was written"
            raise EvenloadError(message)
        temporary = Path(tempfile.mkdtemp(prefix=f".{folder.name}.", dir=folder.parent))
    except OSError as error:
        message = f"{folder}: cannot be written ({error.strerror or error}); nothing was written"
        raise EvenloadError(message) from error
    old = temporary.with_name(temporary.name + ".old")
    try:
        fill(temporary)
        temporary.chmod(0o755)
        if folder.exists():
            os.replace(folder, old)  # noqa: PTH105 - both names must be swapped the same way
        os.replace(temporary, folder)  # noqa: PTH105
    except OSError as error:
        if old.exists() and not folder.exists():
            os.replace(old, folder)  # noqa: PTH105
        message = f"{folder}: cannot be written ({error.strerror or error}); nothing was written"
        raise EvenloadError(message) from error
    finally:
        with contextlib.suppress(OSError):
            shutil.rmtree(temporary, ignore_errors=True)
            shutil.rmtree(old, ignore_errors=True)


def _is_record(folder: Path) -> bool:
    return folder.is_dir() and ((folder / "record.json").is_file() or not any(folder.iterdir()))


def read_record(path: Path) -> dict[str, Any]:
    """Read ``record.json`` from a folder or a file.

    Raises
    ------
    EvenloadError
        Missing, unreadable or of another schema.
    """
    file = path / "record.json" if path.is_dir() else path
    try:
        record = json.loads(file.read_text(encoding="utf-8"))
    except (OSError, ValueError, RecursionError) as error:
        message = f"{file}: is not a readable record ({type(error).__name__})"
        raise EvenloadError(message) from error
    if not isinstance(record, dict) or record.get("schema") != 1:
        found = record.get("schema") if isinstance(record, dict) else type(record).__name__
        message = f"{file}: record schema {found!r} is not the one this version reads (1)"
        raise EvenloadError(message)
    return record
