"""Links between the stated values of a set, judged for all nodes at once (layer 6)."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from benchmark.devices import model
from benchmark.devices.links import Judged, judged
from benchmark.sets.formulas import evaluate_formula, names_in
from benchmark.sets.parameters import ParameterSet
from benchmark.units import Unit, from_si, parse_unit

__all__ = ["FITS", "REFUSED", "WARNED", "LinkRow", "link_rows"]

FITS, WARNED, REFUSED = "fits", "does not fit", "contradiction"


@dataclass(frozen=True)
class LinkRow:
    """One link at one node (empty: at all nodes alike), both sides in ``unit``.

    ``ratio``: of a link that must be equal the right side over the left, else the left over its bound on the right.
    ``tolerance`` in words; ``state``: fits, does not fit, contradiction; ``names``: the values it is made of.
    """

    link: str
    formula: str
    place: str
    names: tuple[str, ...]
    node: str
    left: float
    right: float
    unit: str
    ratio: float
    tolerance: str
    state: str
    source: str
    hint: str


def link_rows(technology: ParameterSet) -> list[LinkRow]:
    """Return every link of a set with its numbers, node by node: those its model declares, and its derived values.

    Parameters
    ----------
    technology : ParameterSet
        Of a wires set only the derived values are linked.

    Returns
    -------
    list of LinkRow
        In the order of the model; links whose values are not all stated are left out.
    """
    values = {name: value.si for name, value in technology.values.items()}
    found: list[LinkRow] = []
    if technology.kind == "technology":
        for item in judged(model(technology.model).links, values, technology.options):
            found += _rows(item, technology)
    return [*found, *_derived(technology)]


def _rows(item: Judged, technology: ParameterSet) -> Iterator[LinkRow]:
    link, unit = item.link, parse_unit(item.link.unit)
    nodes = technology.nodes if item.left.size > 1 else ("",)
    left, right, deviation = np.ravel(item.left), np.ravel(item.right), np.ravel(item.deviation)
    warned, refused = np.ravel(item.warned), np.ravel(item.refused)
    for position, node in enumerate(nodes):
        state = REFUSED if refused[position] else WARNED if warned[position] else FITS
        yield LinkRow(
            link.name,
            link.formula,
            link.place,
            link.names,
            node,
            _in_unit(float(left[position]), unit),
            _in_unit(float(right[position]), unit),
            link.unit,
            1.0 + float(deviation[position]),
            _tolerance(item),
            state,
            link.source,
            link.hint,
        )


def _in_unit(si: float, unit: Unit) -> float:
    """Express a side in its unit; what is not finite has none."""
    return from_si(si, unit) if math.isfinite(si) else si


def _tolerance(item: Judged) -> str:
    """Say what deviation is allowed."""
    link = item.link
    if link.kind == "equal":
        limits = ((link.warned, "warned"), (link.refused, "refused"))
        return ", ".join(f"{word} beyond {100.0 * limit:g} %" for limit, word in limits if limit is not None)
    limit, word = (link.refused, "refused") if link.warned is None else (link.warned, "warned")
    return f"{word} above a ratio of {1.0 + (limit or 0.0):g}"


def _derived(technology: ParameterSet) -> Iterator[LinkRow]:
    """Derived values against their formulas; the check has refused what is beyond the last digit printed."""
    values = {name: value.si for name, value in technology.values.items()}
    for name, value in technology.values.items():
        if not value.formula:
            continue
        stated, computed = np.broadcast_arrays(value.si, evaluate_formula(value.formula, values))
        for position, node in enumerate(technology.nodes if stated.size > 1 else ("",)):
            left, right = float(np.ravel(stated)[position]), float(np.ravel(computed)[position])
            yield LinkRow(
                f"derived value {name}",
                f"{name} = {value.formula}",
                name,
                (name, *sorted(names_in(value.formula))),
                node,
                value.in_unit(left),
                value.in_unit(right),
                value.unit,
                right / left if left else 1.0,
                "refused beyond half a unit of its last digit",
                FITS,
                "the set",
                "",
            )
