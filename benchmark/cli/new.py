"""The command ``new``: a commented file to start from (layer 10). It never overwrites anything."""

from __future__ import annotations

import contextlib
import re
from pathlib import Path

import typer

from benchmark.errors import UsageError, nearest
from benchmark.sets.files import is_folder

__all__ = ["KINDS", "new_command"]

KINDS = ("study", "technology", "circuit", "curves")
_LABEL = re.compile(r"[A-Za-z0-9][A-Za-z0-9_.\-]{0,80}")


def new_command(kind: str, path: Path, model: str | None = None) -> None:
    """Write a template of the kind at ``path``; its id is the stem of the file. ``model``: of a technology."""
    if kind not in KINDS:
        message = f"there is no template {kind!r}; known are {', '.join(KINDS)}; {nearest(kind, KINDS)}".rstrip("; ")
        raise UsageError(message)
    if model is not None and kind != "technology":
        noun = "description of curves" if kind == "curves" else kind
        message = f"--model belongs to a new technology; a {noun} has none"
        raise UsageError(message)
    model_name = "given" if model is None else model
    stem = _stem(path, kind)
    texts = _texts(kind, stem, model_name)
    files = {path.parent / name: _hint(name, path.parent, kind, model_name) + text for name, text in texts.items()}
    for place in files:
        if place.exists() or place.is_symlink():
            message = f"{place} exists; nothing was written"
            raise UsageError(message)
    _write(files)
    for place in files:
        typer.echo(f"Written: {place}")
    then = {"study": "run", "curves": "extract"}.get(kind)
    typer.echo(f"Next:    evenload check {path}" + (f", evenload {then} {path}" if then else ""))


def _stem(path: Path, kind: str) -> str:
    if path.suffix != ".toml":
        message = f"{path}: the name of a new file ends in .toml"
        raise UsageError(message)
    if not is_folder(path.parent):
        message = f"{path.parent}: there is no such folder"
        raise UsageError(message)
    stem = path.stem
    if not _LABEL.fullmatch(stem):
        message = f"{path.name}: the name is also the id, so only letters, digits, '.', '-' and '_' are allowed"
        raise UsageError(message)
    if stem == "sources" or (kind == "circuit" and stem in _built_in()):
        message = f"{path.name}: the name {stem!r} has a meaning of its own; choose another one"
        raise UsageError(message)
    return stem


def _built_in() -> tuple[str, ...]:
    from benchmark.circuits.library import BUILT_IN

    return tuple(BUILT_IN)


def _texts(kind: str, stem: str, model_name: str) -> dict[str, str]:
    from benchmark.devices import MODEL_NAMES

    if kind == "study":
        from benchmark.cli.study_template import study_template

        return {f"{stem}.toml": study_template(stem)}
    if kind == "curves":
        from benchmark.cli.curves_template import curves_template

        return curves_template(stem)
    from benchmark.cli.templates import circuit_template, technology_template

    if kind == "circuit":
        return {f"{stem}.toml": circuit_template(stem)}
    if model_name not in MODEL_NAMES:
        hint = nearest(model_name, MODEL_NAMES)
        message = f"there is no model {model_name!r}; known are {', '.join(MODEL_NAMES)}; {hint}".rstrip("; ")
        raise UsageError(message)
    return technology_template(model_name, stem)


def _hint(name: str, folder: Path, kind: str, model_name: str) -> str:
    """First line of a new TOML file: where an editor finds what the file may say."""
    from benchmark.cli.templates import schema_hint

    if not name.endswith(".toml"):
        return ""
    if name.startswith("tables/"):
        return schema_hint("table", folder / name)
    return schema_hint(f"technology-{model_name}" if kind == "technology" else kind, folder / name)


def _write(files: dict[Path, str]) -> None:
    """Write all files or none."""
    written: list[Path] = []
    made: list[Path] = []
    try:
        for place, text in files.items():
            if not place.parent.exists():
                place.parent.mkdir()
                made.append(place.parent)
            with place.open("x", encoding="utf-8", newline="\n") as file:
                written.append(place)
                file.write(text)
    except OSError as error:
        with contextlib.suppress(OSError):
            for place in written:
                place.unlink()
            for folder in reversed(made):
                folder.rmdir()
        message = f"{error.filename or path_text(files)}: cannot be written ({error.strerror or error})"
        raise UsageError(message) from error


def path_text(files: dict[Path, str]) -> str:
    """Name the first file, for messages."""
    return str(next(iter(files)))
