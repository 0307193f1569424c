"""A technology file of the model ``virtual-source`` from extracted values, with what was measured as anchors."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass

__all__ = ["AnchorLine", "Line", "set_text"]


@dataclass(frozen=True)
class Line:
    """One value of the file: number as written, unit, evidence, source, where, conditions, note."""

    number: float
    unit: str
    evidence: str
    source: str
    where: str = ""
    conditions: str = ""
    note: str = ""


@dataclass(frozen=True)
class AnchorLine:
    """One anchor: kind, supply [V], number, unit."""

    kind: str
    supply: float
    number: float
    unit: str


#: values that the model wants and that play no role at the temperature of the set
_UNUSED = {
    "threshold_temperature_slope": (-0.7, "mV/K"),
    "mobility_temperature_exponent": (-1.2, "1"),
    "velocity_temperature_exponent": (-0.4, "1"),
    "footprint": (0.5, "um^2"),
}


def _value(name: str, line: Line) -> list[str]:
    text = [f"[value.{name}]", f"value = {line.number:.6g}", f'unit = "{line.unit}"', f'evidence = "{line.evidence}"']
    if line.evidence == "choice":
        text.append('owner = "project"')
    text.append(f'source = "{line.source}"')
    text += [
        f'{key} = "{words}"'
        for key, words in (("where", line.where), ("conditions", line.conditions), ("note", line.note))
        if words
    ]
    return [*text, ""]


def set_text(
    header: Mapping[str, str],
    celsius: float,
    values: Mapping[str, Line],
    anchors: Iterable[AnchorLine],
    anchor_source: str,
    anchor_where: str,
) -> str:
    """Return the file. ``header``: id, title, node, flavour, note; values are written to six digits."""
    text = [
        f"# {header['comment']}",
        "schema = 1",
        f'id = "{header["id"]}"',
        f'title = "{header["title"]}"',
        'model = "virtual-source"',
        f'nodes = ["{header["node"]}"]',
        f'flavour = "{header["flavour"]}"',
        f'note = "{header["note"]}"',
        f'reference_temperature = {{ value = {celsius:.1f}, unit = "degC" }}',
        "",
        "[option]",
        'partner = "own"',
        "",
    ]
    for name, line in values.items():
        text += _value(name, line)
    for name, (number, unit) in _UNUSED.items():
        text += _value(name, Line(number, unit, "assumed", "not-used", note="without effect at the set's temperature"))
    for anchor in anchors:
        volts = f"{anchor.supply:.2f}".replace(".", "_")
        text += [
            f"[anchor.{anchor.kind}__{volts}V]",
            f"value = {anchor.number:.6g}",
            f'unit = "{anchor.unit}"',
            f'supply = {{ value = {anchor.supply:.2f}, unit = "V" }}',
            f'source = "{anchor_source}"',
            f'where = "{anchor_where}"',
            "",
        ]
    return "\n".join(text)
