"""Shapes of the files, as strict pydantic models (layer 2). Meaning and units are checked in ``values``."""

from __future__ import annotations

import datetime
from decimal import Decimal
from typing import Annotated, Any, Literal, TypeVar, get_args, get_origin

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field, ValidationError
from pydantic_core import PydanticCustomError

from benchmark.errors import Problem, nearest
from benchmark.sets.files import MAX_BITS, TomlFile, shown
from benchmark.sets.problems import Collector

__all__ = [
    "FileModel",
    "Measure",
    "Number",
    "SpreadTable",
    "ValueTable",
    "validate",
    "validate_part",
    "validate_values",
]


def _number(value: Any) -> Any:
    if isinstance(value, bool) or not isinstance(value, (int, Decimal)):
        msg = "number"
        raise PydanticCustomError(msg, "a number is needed")
    if isinstance(value, Decimal) and not value.is_finite():
        msg = "finite"
        raise PydanticCustomError(msg, "a finite number is needed")
    if isinstance(value, Decimal) and len(str(value)) > MOST_DIGITS:
        msg = "finite"  # exact conversion of a million digits would take minutes
        raise PydanticCustomError(msg, f"the number has more than {MOST_DIGITS} digits")
    if isinstance(value, int) and value.bit_length() > MAX_BITS:
        size = Decimal("Infinity")
    else:
        size = Decimal(value).copy_abs()  # copy_abs: exact, and never an overflow of its own
    if size > Decimal("1e300") or (size and size < Decimal("1e-300")):
        msg = "finite"
        raise PydanticCustomError(msg, "the number is beyond the range of the program (1e-300 to 1e300)")
    return value


def _whole(value: Any) -> Any:
    if isinstance(value, int) and abs(value) > MOST_WHOLE:
        msg = "finite"
        raise PydanticCustomError(msg, "the number is beyond the range of the program (1e9)")
    return value


#: digits a number may have; the exact value of a float has up to 767
MOST_DIGITS = 1000
#: largest whole number of a key that is not a physical value
MOST_WHOLE = 10**9
M = TypeVar("M", bound="FileModel")
Number = Annotated[Decimal | int, BeforeValidator(_number)]
Whole = Annotated[int, BeforeValidator(_whole)]
Text = Annotated[str, Field(max_length=20_000)]
_LABEL = r"^[A-Za-z0-9][A-Za-z0-9_.\-]{0,80}$"
_NODE_LABEL = r"^[A-Za-z][A-Za-z0-9_\-]{0,40}$"
_DIGEST = r"^[0-9a-f]{64}$"
_PATTERN_TEXT = {
    _DIGEST: "64 digits 0 to 9 and a to f",
    _LABEL: "up to 81 letters, digits, '_', '.' and '-', starting with a letter or digit",
    _NODE_LABEL: "up to 41 letters, digits, '_' and '-', starting with a letter",
}
Label = Annotated[str, Field(pattern=_LABEL)]
NodeLabel = Annotated[str, Field(pattern=_NODE_LABEL)]

# keys that several tables have; the descriptions are what editors show (nodes/schema, tests/remake_schemas.py)
Schema = Annotated[Literal[1], Field(alias="schema", description="Version of the file format: 1")]
Identity = Annotated[Label, Field(description="Name of the file without .toml; other files refer to it")]
Title = Annotated[Text, Field(description="One line for lists and reports")]
Nodes = Annotated[
    list[NodeLabel],
    Field(min_length=1, description="Node labels in order, such as n7 or n1p5; labels, never lengths"),
]
Evidence = Annotated[Text | None, Field(description="What the number is worth: its evidence class")]
SourceKey = Annotated[Text | None, Field(description="Where the number comes from: a key of sources.toml")]
Where = Annotated[Text | None, Field(description="Place in the source: table, figure, page")]
Conditions = Annotated[Text | None, Field(description="What the number holds for: temperature, sample, geometry")]
Note = Annotated[Text | None, Field(description="Anything a reader must know about the number")]
Owner = Annotated[Text | None, Field(description="Who decided, for choices and targets")]
UnitText = Annotated[Text, Field(description="Unit in any common spelling; converted exactly")]
Low = Annotated[Number, Field(description="Lower end")]
High = Annotated[Number, Field(description="Upper end, not below the lower end")]
FreeNote = Annotated[Text, Field(description="Anything a reader must know")]


class FileModel(BaseModel):
    """Strict: no unknown keys, no coercion."""

    model_config = ConfigDict(extra="forbid", strict=True, frozen=True, arbitrary_types_allowed=True)


class Uniform(FileModel):
    """Equally likely between two hard limits, in the unit of the value."""

    shape: Literal["uniform"] = Field(description="Equally likely between low and high")
    low: Low
    high: High


class LogUniform(FileModel):
    """Equally likely per decade between two hard limits."""

    shape: Literal["loguniform"] = Field(description="Equally likely per decade between low and high")
    low: Low
    high: High


class Triangular(FileModel):
    """Hard limits, most likely at the value."""

    shape: Literal["triangular"] = Field(description="Between low and high, most likely at the value")
    low: Low
    high: High


class Normal(FileModel):
    """Normal; give ``sd`` in the unit of the value, or ``percent``: the standard deviation as per cent of it."""

    shape: Literal["normal"] = Field(description="Normal around the value")
    sd: Number | None = Field(default=None, description="Standard deviation in the unit of the value; not with by_node")
    percent: Number | None = Field(default=None, description="Standard deviation as per cent of the value")


class LogNormal(FileModel):
    """Log-normal with the value as median: central 95 % between value/factor and value*factor, or ``ln_sd``."""

    shape: Literal["lognormal"] = Field(description="Log-normal with the value as median")
    factor: Number | None = Field(
        default=None, description="Central 95 % lie between value/factor and value*factor; 1 or more"
    )
    ln_sd: Number | None = Field(default=None, description="Standard deviation of the natural logarithm")


SpreadTable = Annotated[Uniform | LogUniform | Triangular | Normal | LogNormal, Field(discriminator="shape")]


class ExtractedFrom(FileModel):
    """Measured data that a number was read off."""

    file: Text = Field(description="File with the data, by its path from this file")
    digest: Annotated[str, Field(pattern=_DIGEST)] = Field(description="sha256 of its bytes then; check compares")
    hero: bool = Field(default=False, description="true: one chosen device, not a typical one; check warns")


ReadOff = Annotated[
    ExtractedFrom | None, Field(description="Measured data that the number was read off; check says if they changed")
]


class PastTable(FileModel):
    """What a value was before: the number, the day it was measured or chosen, and why it is no longer used.

    What it does not say besides number, unit, spread and date was as in the state that followed it.
    """

    value: Number | None = Field(default=None, description="The number, in the unit")
    by_node: dict[NodeLabel, Number] | None = Field(default=None, description="One number per node, in the unit")
    unit: Text | None = Field(default=None, description="Unit; of the dimension of the value")
    spread: SpreadTable | None = Field(default=None, description="Range it was stated with; none when left out")
    evidence: Evidence = None
    source: SourceKey = None
    where: Where = None
    conditions: Conditions = None
    note: Note = None
    owner: Owner = None
    bound: Literal["at-least", "at-most", "none"] | None = Field(
        default=None, description="What kind of bound it was, or none, where that differs from the state that followed"
    )
    formula: Text | None = Field(
        default=None, description='Formula it had, or "" for none, where that differs from the state that followed'
    )
    unusual: bool | None = Field(default=None, description="Whether it was meant to be unusual, if that changed")
    extracted_from: ReadOff = None
    date: datetime.date = Field(description="Day of the measurement or choice; it held from then on")
    reason: Text = Field(min_length=1, description="Why it is no longer used")


class ValueTable(FileModel):
    """One value with unit, spread and provenance: the atom of every file."""

    value: Number | None = Field(default=None, description="The number, in the unit")
    by_node: dict[NodeLabel, Number] | None = Field(default=None, description="One number per node, in the unit")
    unit: Text | None = Field(
        default=None, description="Unit in any common spelling; may be left out for plain numbers"
    )
    spread: SpreadTable | None = Field(default=None, description="How far the value may lie from the number")
    evidence: Evidence = None
    source: SourceKey = None
    where: Where = None
    conditions: Conditions = None
    note: Note = None
    owner: Owner = None
    bound: Literal["at-least", "at-most"] | None = Field(
        default=None, description="The number is only a bound: the value is at least, or at most, this"
    )
    formula: Text | None = Field(
        default=None, description="Derived values: + - * / ** over other names of the set, in SI; recomputed by check"
    )
    unusual: bool = Field(default=False, description="true: yes, far outside the usual range is meant")
    date: datetime.date | None = Field(default=None, description="Day of the measurement or choice, such as 2026-01-31")
    extracted_from: ReadOff = None
    superseded: list[PastTable] = Field(default=[], description="What it was before, oldest first; needs a date above")


class Measure(FileModel):
    """A plain number with its unit."""

    value: Number = Field(description="The number, in the unit")
    unit: UnitText


class RangeTable(FileModel):
    """A closed range with its unit."""

    low: Low
    high: High
    unit: UnitText


class DefaultsTable(FileModel):
    """What values use when they do not say their own."""

    evidence: Evidence = None
    source: SourceKey = None
    conditions: Conditions = None
    owner: Owner = None
    where: Where = None
    note: Note = None


class AnchorTable(FileModel):
    """A published number that the set must predict; never fitted, except where it says so."""

    value: Number = Field(description="The published number, in the unit")
    unit: UnitText
    node: NodeLabel | None = Field(default=None, description="Node it belongs to; needed when the set has several")
    supply: Measure | None = Field(
        default=None, description="Supply it was published at; without it the declared supply"
    )
    low: Number | None = Field(default=None, description="Lower end of the published range, in the unit")
    high: Number | None = Field(default=None, description="Upper end of the published range, in the unit")
    source: Text = Field(description="Where the number comes from: a key of sources.toml")
    where: Text = Field(default="-", description="Place in the source: table, figure, page")
    conditions: Text = Field(default="-", description="What the number holds for")
    note: FreeNote = ""


class TableReference(FileModel):
    """A measured table: a CSV file whose sidecar has the same stem."""

    file: Text = Field(description="CSV file inside the folder of the sets, such as tables/name.csv")


class ValidTable(FileModel):
    """Ranges in which the set may be used."""

    supply: RangeTable | None = Field(
        default=None, description="Supplies [V] the set may be used at; outside: infeasible"
    )
    temperature: RangeTable | None = Field(
        default=None, description="Temperatures the set may be used at; outside: infeasible"
    )


class RowTable(FileModel):
    """One stage result of a technology known only by stage results."""

    node: NodeLabel = Field(description="Node label of the set")
    supply: Measure = Field(description="Supply [V]")
    temperature: Measure = Field(description="Temperature [K or degC]")
    delay: Measure = Field(description="Delay of the stage [s]")
    energy_per_cycle: Measure = Field(description="Energy of one full cycle of the stage [J]")
    leakage_power: Measure = Field(description="Leakage power of the stage [W]")
    drive_resistance: Measure | None = Field(default=None, description="Drive resistance of the stage [ohm]")
    input_capacitance: Measure | None = Field(default=None, description="Input capacitance of the stage [F]")
    area: Measure | None = Field(default=None, description="Area of the stage [m^2]")
    evidence: Evidence = None
    source: SourceKey = None
    where: Where = None
    conditions: Conditions = None
    note: Note = None
    owner: Owner = None


class JointTable(FileModel):
    """Values of this file that are not independent."""

    values: list[Text] = Field(min_length=2, max_length=16, description="Names of values of this file")
    rank_correlation: Number | None = Field(
        default=None, description="Rank correlation of two values that have spreads: -1 to 1"
    )
    samples: list[list[Number]] | None = Field(
        default=None,
        description="Samples on which all of them were measured: one row each, numbers in the units of the values",
    )


Joints = Annotated[list[JointTable], Field(description="Values of this file that are not independent")]


class TechnologyFile(FileModel):
    """A parameter set of one technology."""

    schema_: Schema
    id: Identity
    title: Title
    kind: Literal["technology"] = Field(default="technology", description="Kind of the set")
    model: Text = Field(description="Device model that reads the values")
    nodes: Nodes
    flavour: Text = Field(default="", description="A label such as a threshold flavour")
    ambition: Literal["today", "target", "limit"] = Field(
        default="today", description="today: as it is; target: wished for by a programme; limit: what physics allows"
    )
    note: FreeNote = ""
    reference_temperature: Measure = Field(description="Temperature at which the values hold")
    default: DefaultsTable = Field(default=DefaultsTable(), description="What a value below does not say itself")
    option: dict[str, Text] = Field(default={}, description="Choices of the model in words")
    value: dict[str, ValueTable] = Field(default={}, description="Values by catalogue name")
    joint: Joints = []
    anchor: dict[str, AnchorTable] = Field(
        default={}, description="Published numbers the set must predict: compared, never fitted"
    )
    table: dict[str, TableReference] = Field(default={}, description="Measured tables the model reads")
    row: list[RowTable] = Field(default=[], description="Stage results: one per node, supply and temperature")
    valid: ValidTable = Field(
        default=ValidTable(), description="Where the set may be used; outside a point is infeasible"
    )


class WiresFile(FileModel):
    """Wires of one or several nodes, used by both sides of a study."""

    schema_: Schema
    id: Identity
    title: Title
    kind: Literal["wires"] = Field(description="Kind of the set")
    nodes: Nodes
    note: FreeNote = ""
    default: DefaultsTable = Field(default=DefaultsTable(), description="What a value below does not say itself")
    value: dict[str, ValueTable] = Field(default={}, description="Values by catalogue name")
    joint: Joints = []


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
    ] = Field(description="What it is")
    authors: list[Text] = Field(description="Who wrote, measured or decided")
    year: Whole = Field(description="Year of publication")
    title: Title
    venue: Text = Field(default="", description="Journal, volume and pages; publisher; conference")
    doi: Text = Field(default="", description="Digital object identifier, without a prefix")
    read: Literal["original", "abstract", "second-hand", "memory"] = Field(
        description="How it was read; memory: to be checked before it carries an argument"
    )
    via: Text = Field(default="", description="Second-hand: the source it was read in")
    note: FreeNote = ""


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


def validate_values(model: type[M], file: TomlFile, collector: Collector) -> tuple[M | None, frozenset[str]]:
    """Validate a whole file; faults inside single value tables and unknown names do not hide the rest of the file.

    Returns
    -------
    tuple
        The file without what is wrong in it (None when that is not enough to go on), and the names of the value
        tables left out. Every problem has gone to the collector.
    """
    try:
        return model.model_validate(file.data), frozenset()
    except ValidationError as error:
        validate_part(model, file, (), error, collector)
        data, spoiled = _without_faults(file.data, error)
    except RecursionError:
        collector.add(file.problem("", "is nested too deeply"))
        return None, frozenset()
    try:
        return model.model_validate(data), spoiled
    except ValidationError:
        return None, spoiled


def _without_faults(data: dict[str, Any], error: ValidationError) -> tuple[dict[str, Any], frozenset[str]]:
    """Leave out unknown names at the top and every value table that has a fault."""
    kept, spoiled = dict(data), set()
    for item in error.errors(include_url=False, include_input=False, include_context=False):
        location = item["loc"]
        if item["type"] == "extra_forbidden" and len(location) == 1:
            kept.pop(str(location[0]), None)
        elif location[0] == "value" and len(location) > 1 and isinstance(kept.get("value"), dict):
            spoiled.add(str(location[1]))
            kept["value"] = {key: table for key, table in kept["value"].items() if key not in spoiled}
    return kept, frozenset(spoiled)


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
