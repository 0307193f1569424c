"""Shapes of the files, as strict pydantic models (layer 2). Meaning and units are checked in ``values``."""

from __future__ import annotations

import datetime
from decimal import Decimal
from typing import Annotated, Any, Literal, TypeVar, get_args, get_origin

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field, ValidationError
from pydantic_core import PydanticCustomError

from benchmark.errors import Problem, nearest
from benchmark.sets.files import TomlFile, shown
from benchmark.sets.problems import Collector

__all__ = ["FileModel", "Measure", "Number", "SpreadTable", "ValueTable", "validate", "validate_part"]


def _number(value: Any) -> Any:
    if isinstance(value, bool) or not isinstance(value, (int, Decimal)):
        msg = "number"
        raise PydanticCustomError(msg, "a number is needed")
    if isinstance(value, Decimal) and not value.is_finite():
        msg = "finite"
        raise PydanticCustomError(msg, "a finite number is needed")
    if abs(Decimal(value)) > Decimal("1e300") or (value != 0 and abs(Decimal(value)) < Decimal("1e-300")):
        msg = "finite"
        raise PydanticCustomError(msg, "the number is beyond the range of the program (1e-300 to 1e300)")
    return value


M = TypeVar("M", bound="FileModel")
Number = Annotated[Decimal | int, BeforeValidator(_number)]
Text = Annotated[str, Field(max_length=20_000)]
_LABEL = r"^[A-Za-z0-9][A-Za-z0-9_.\-]{0,80}$"
_NODE_LABEL = r"^[A-Za-z][A-Za-z0-9_\-]{0,40}$"
_PATTERN_TEXT = {
    _LABEL: "up to 81 letters, digits, '_', '.' and '-', starting with a letter or digit",
    _NODE_LABEL: "up to 41 letters, digits, '_' and '-', starting with a letter",
}
Label = Annotated[str, Field(pattern=_LABEL)]
NodeLabel = Annotated[str, Field(pattern=_NODE_LABEL)]


class FileModel(BaseModel):
    """Strict: no unknown keys, no coercion."""

    model_config = ConfigDict(extra="forbid", strict=True, frozen=True, arbitrary_types_allowed=True)


class Uniform(FileModel):
    """Equally likely between two hard limits, in the unit of the value."""

    shape: Literal["uniform"]
    low: Number
    high: Number


class LogUniform(FileModel):
    """Equally likely per decade between two hard limits."""

    shape: Literal["loguniform"]
    low: Number
    high: Number


class Triangular(FileModel):
    """Hard limits, most likely at the value."""

    shape: Literal["triangular"]
    low: Number
    high: Number


class Normal(FileModel):
    """Normal; give ``sd`` in the unit of the value, or ``percent``: the standard deviation as per cent of it."""

    shape: Literal["normal"]
    sd: Number | None = None
    percent: Number | None = None


class LogNormal(FileModel):
    """Log-normal with the value as median: central 95 % between value/factor and value*factor, or ``ln_sd``."""

    shape: Literal["lognormal"]
    factor: Number | None = None
    ln_sd: Number | None = None


SpreadTable = Annotated[Uniform | LogUniform | Triangular | Normal | LogNormal, Field(discriminator="shape")]


class ValueTable(FileModel):
    """One value with unit, spread and provenance: the atom of every file."""

    value: Number | None = None
    by_node: dict[NodeLabel, Number] | None = None
    unit: Text | None = None
    spread: SpreadTable | None = None
    evidence: Text | None = None
    source: Text | None = None
    where: Text | None = None
    conditions: Text | None = None
    note: Text | None = None
    owner: Text | None = None
    bound: Literal["at-least", "at-most"] | None = None
    formula: Text | None = None
    unusual: bool = False
    date: datetime.date | None = None


class Measure(FileModel):
    """A plain number with its unit."""

    value: Number
    unit: Text


class RangeTable(FileModel):
    """A closed range with its unit."""

    low: Number
    high: Number
    unit: Text


class DefaultsTable(FileModel):
    """What values use when they do not say their own."""

    evidence: Text | None = None
    source: Text | None = None
    conditions: Text | None = None
    owner: Text | None = None
    where: Text | None = None
    note: Text | None = None


class AnchorTable(FileModel):
    """A published number that the set must predict; never fitted, except where it says so."""

    value: Number
    unit: Text
    node: NodeLabel | None = None
    supply: Measure | None = None
    low: Number | None = None
    high: Number | None = None
    source: Text
    where: Text = "-"
    conditions: Text = "-"
    note: Text = ""


class TableReference(FileModel):
    """A measured table: a CSV file whose sidecar has the same stem."""

    file: Text


class ValidTable(FileModel):
    """Ranges in which the set may be used."""

    supply: RangeTable | None = None
    temperature: RangeTable | None = None


class RowTable(FileModel):
    """One stage result of a technology known only by stage results."""

    node: NodeLabel
    supply: Measure
    temperature: Measure
    delay: Measure
    energy_per_cycle: Measure
    leakage_power: Measure
    drive_resistance: Measure | None = None
    input_capacitance: Measure | None = None
    area: Measure | None = None
    evidence: Text | None = None
    source: Text | None = None
    where: Text | None = None
    conditions: Text | None = None
    note: Text | None = None
    owner: Text | None = None


class TechnologyFile(FileModel):
    """A parameter set of one technology."""

    schema_: Literal[1] = Field(alias="schema")
    id: Label
    title: Text
    kind: Literal["technology"] = "technology"
    model: Text
    nodes: Annotated[list[NodeLabel], Field(min_length=1)]
    flavour: Text = ""
    ambition: Literal["today", "target", "limit"] = "today"
    note: Text = ""
    reference_temperature: Measure
    default: DefaultsTable = DefaultsTable()
    option: dict[str, Text] = {}
    value: dict[str, ValueTable] = {}
    anchor: dict[str, AnchorTable] = {}
    table: dict[str, TableReference] = {}
    row: list[RowTable] = []
    valid: ValidTable = ValidTable()


class WiresFile(FileModel):
    """Wires of one or several nodes, used by both sides of a study."""

    schema_: Literal[1] = Field(alias="schema")
    id: Label
    title: Text
    kind: Literal["wires"]
    nodes: Annotated[list[NodeLabel], Field(min_length=1)]
    note: Text = ""
    default: DefaultsTable = DefaultsTable()
    value: dict[str, ValueTable] = {}


class SourceEntry(FileModel):
    """Where values come from."""

    kind: Literal[
        "article",
        "book",
        "thesis",
        "report",
        "roadmap",
        "standard",
        "data",
        "simulation",
        "measurement",
        "invented",
        "choice",
        "web page",
        "patent",
    ]
    authors: list[Text]
    year: int
    title: Text
    venue: Text = ""
    doi: Text = ""
    read: Literal["original", "abstract", "second-hand", "memory"]
    via: Text = ""
    note: Text = ""


#: messages for the kinds of pydantic error that can occur in strict mode
_KIND_TEXT = {
    "missing": "is missing",
    "string_type": "text is needed",
    "bool_type": "true or false is needed",
    "int_type": "a whole number is needed",
    "date_type": "a date such as 2026-01-31 is needed",
    "list_type": "a list is needed",
    "dict_type": "a table is needed",
    "model_type": "a table is needed",
    "model_attributes_type": "a table is needed",
    "string_pattern_mismatch": "has characters that are not allowed here",
    "string_too_long": "is too long",
    "too_short": "needs at least one entry",
}


def _models_in(annotation: Any) -> list[type[BaseModel]]:
    """Every model class inside an annotation (through lists, unions and Annotated, not through dicts)."""
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return [annotation]
    return [model for argument in get_args(annotation) for model in _models_in(argument)]


def _child(annotation: Any, step: Any) -> Any:
    """The annotation one step further down: a field, the value type of a dict, a list item, or a spread's shape."""
    if get_origin(annotation) is dict:
        return get_args(annotation)[1]
    for model in _models_in(annotation):
        if "shape" in model.model_fields and step in get_args(model.model_fields["shape"].annotation):
            return model
        for key, info in model.model_fields.items():
            if step in (key, info.alias):
                return info.annotation
    return annotation


def _fields_at(model: Any, location: tuple[Any, ...]) -> list[str]:
    """Names allowed at a location, for hints."""
    current: Any = model
    for step in location:
        current = _child(current, step)
    names = [info.alias or key for found in _models_in(current) for key, info in found.model_fields.items()]
    return list(dict.fromkeys(names))


def _dotted(location: tuple[Any, ...]) -> str:
    """Turn a pydantic location into the dotted name of the file (union tags are not part of the file)."""
    tags = {"uniform", "loguniform", "triangular", "normal", "lognormal"}
    kept = [
        str(step)
        for position, step in enumerate(location)
        if not (step in tags and position and location[position - 1] == "spread")
        and not str(step).startswith(("function-", "literal[", "dict[", "constrained-"))
        and step not in ("Measure", "str")
        and step != "[key]"
    ]
    return ".".join(kept)


def validate(model: type[M], file: TomlFile, collector: Collector) -> M | None:
    """Validate a whole file; every problem goes to the collector with its line and nearest name."""
    try:
        return model.model_validate(file.data)
    except ValidationError as error:
        validate_part(model, file, (), error, collector)
    except RecursionError:
        collector.add(file.problem("", "is nested too deeply"))
    return None


def validate_part(
    model: type[FileModel], file: TomlFile, prefix: tuple[str, ...], error: ValidationError, collector: Collector
) -> None:
    """Turn the errors of a part of a file, standing at ``prefix``, into problems."""
    for item in error.errors(include_url=False, include_context=True):
        collector.add(_as_problem(model, file, prefix, item))


def _as_problem(model: type[FileModel], file: TomlFile, prefix: tuple[str, ...], item: Any) -> Problem:
    location, kind = tuple(item["loc"]), str(item["type"])
    dotted, context = _dotted((*prefix, *location)), item.get("ctx", {})
    found = "" if kind == "missing" else shown(item["input"])
    allowed, hint = "", ""
    if kind == "extra_forbidden":
        names = _fields_at(model, location[:-1])
        what, found = "is not a known name here", ""
        allowed, hint = ", ".join(names), nearest(str(location[-1]), names)
    elif kind == "literal_error" and location == ("schema",):
        what, allowed = "is not a file format this version reads", str(context.get("expected", ""))
    elif kind == "literal_error":
        what, allowed = "is not one of the allowed words", str(context.get("expected", ""))
        hint = nearest(str(item["input"]), [word.strip("'") for word in allowed.replace(" or ", ", ").split(", ")])
    elif kind.startswith("union_tag"):
        what, allowed = "needs a known shape", "uniform, loguniform, triangular, normal, lognormal"
    elif kind in ("number", "finite"):
        what = str(item["msg"])
    elif kind == "string_pattern_mismatch":
        pattern = str(context.get("pattern", ""))
        what, allowed = _KIND_TEXT[kind], _PATTERN_TEXT.get(pattern, pattern)
    else:
        what = _KIND_TEXT.get(kind, str(item["msg"]))
    return Problem(file.name, file.line(dotted), dotted, what, found, allowed, hint)
