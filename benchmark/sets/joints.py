"""Values of one file that are not independent: a rank correlation, or samples that show them together (layer 2)."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from benchmark.catalogue import QUANTITIES
from benchmark.errors import nearest
from benchmark.sets.files import TomlFile, shown
from benchmark.sets.problems import Collector
from benchmark.sets.schema import JointTable
from benchmark.sets.values import Spread, Value
from benchmark.units import parse_unit, to_si

__all__ = ["Joint", "rank_matrix", "read_joints"]

Refuse = Callable[..., None]
#: an eigenvalue of a correlation matrix may be this much below zero by rounding
ROUNDING = 1.0e-9
#: samples that say something about a spread
FEWEST_SAMPLES = 3


@dataclass(frozen=True)
class Joint:
    """``names`` move together: two of them with a rank correlation, or all as in one of the ``samples`` (row, name)."""

    names: tuple[str, ...]
    rank_correlation: float = 0.0
    samples: NDArray[np.float64] | None = None


def rank_matrix(joints: Sequence[Joint]) -> tuple[list[str], NDArray[np.float64]]:
    """Return the names of all rank correlations, and the correlation matrix of their normal scores.

    r = 2 sin(pi rho / 6) of the normal scores gives the rank correlation rho (Pearson 1907, from memory).
    """
    pairs = [joint for joint in joints if joint.samples is None]
    names = sorted({name for joint in pairs for name in joint.names})
    matrix = np.eye(len(names))
    for joint in pairs:
        i, j = (names.index(name) for name in joint.names)
        matrix[i, j] = matrix[j, i] = 2.0 * np.sin(np.pi * joint.rank_correlation / 6.0)
    return names, matrix


def read_joints(
    tables: Sequence[JointTable], values: Mapping[str, Value], file: TomlFile, collector: Collector
) -> tuple[tuple[Joint, ...], dict[str, Value]]:
    """Convert the joint tables of a file.

    Returns
    -------
    joints : tuple of Joint
    values : dict
        The values; those with samples have them as their spread.
    """
    found: list[Joint] = []
    changed = dict(values)
    seen: set[tuple[str, ...]] = set()
    for position, table in enumerate(tables):
        dotted = f"joint.{position}"
        joint = _joint(table, dotted, values, file, collector)
        if joint is None:
            continue
        key = tuple(sorted(joint.names))
        taken = [other for other in seen if (set(other) & set(key)) and (joint.samples is not None or other == key)]
        if taken:
            collector.add(file.problem(f"{dotted}.values", "states again what another joint states", ", ".join(key)))
            continue
        seen.add(key)
        found.append(joint)
        if joint.samples is not None:
            for column, name in enumerate(joint.names):
                spread = _sampled(changed[name], joint.samples[:, column], dotted, file, collector)
                if spread is not None:
                    changed[name] = dataclasses.replace(changed[name], spread=spread)
    _check_matrix(found, file, collector)
    return tuple(found), changed


def _joint(
    table: JointTable, dotted: str, values: Mapping[str, Value], file: TomlFile, collector: Collector
) -> Joint | None:
    before = len(collector.problems)

    def refuse(key: str, what: str, found: str = "", allowed: str = "", hint: str = "") -> None:
        collector.add(file.problem(f"{dotted}.{key}" if key else dotted, what, found, allowed, hint))

    names = tuple(table.values)
    for name in names:
        if name not in values:
            refuse(
                "values",
                "names a value that is not in this file",
                repr(name),
                ", ".join(sorted(values)),
                nearest(name, values),
            )
    if len(set(names)) != len(names):
        refuse("values", "names a value twice", ", ".join(names))
    if (table.rank_correlation is None) == (table.samples is None):
        refuse("", "needs exactly one of rank_correlation and samples")
    if len(collector.problems) > before:
        return None
    spreads = {name: values[name].spread for name in names}
    if table.rank_correlation is not None:
        if len(names) != 2:
            refuse("values", "has a rank correlation, which ties two values", str(len(names)), "2 names")
        for name, spread in spreads.items():
            if spread is None:
                refuse("values", f"correlates {name}, which has no spread")
        rho = float(table.rank_correlation)
        if not -1.0 <= rho <= 1.0:
            refuse("rank_correlation", "is out of range", shown(table.rank_correlation), "-1 to 1")
        return Joint(names, rho) if len(collector.problems) == before else None
    for name, spread in spreads.items():
        if spread is not None:
            refuse("values", f"gives samples of {name}, which has a spread of its own", spread.shape, "one of the two")
    samples = _samples(table, names, values, refuse)
    return Joint(names, samples=samples) if len(collector.problems) == before else None


def _samples(
    table: JointTable, names: Sequence[str], values: Mapping[str, Value], refuse: Refuse
) -> NDArray[np.float64]:
    rows = []
    for number, row in enumerate(table.samples or (), start=1):
        if len(row) != len(names):
            wanted = f"{len(names)}: one for each of {', '.join(names)}"
            refuse("samples", f"row {number} has not one number for each value", str(len(row)), wanted)
            continue
        si = [float(to_si(item, parse_unit(values[name].unit))) for item, name in zip(row, names, strict=True)]
        for item, name in zip(si, names, strict=True):
            if not QUANTITIES[name].allows(item):
                refuse(
                    "samples",
                    f"row {number} takes {name} out of its domain",
                    f"{item:g} (SI)",
                    QUANTITIES[name].domain_text,
                )
        rows.append(si)
    if len(table.samples or ()) < FEWEST_SAMPLES:
        refuse("samples", "are too few to be a spread", str(len(table.samples or ())), f"{FEWEST_SAMPLES} or more")
    return np.array(sorted(rows), dtype=np.float64)


def _sampled(
    value: Value, samples: NDArray[np.float64], dotted: str, file: TomlFile, collector: Collector
) -> Spread | None:
    low, high = float(samples.min()), float(samples.max())
    if not (np.all(value.si >= low) and np.all(value.si <= high)):
        stated = ", ".join(f"{value.in_unit(float(x)):g}" for x in value.si)
        collector.add(
            file.problem(
                f"{dotted}.samples",
                f"do not enclose the value of {value.name}",
                f"value {stated} {value.unit}",
                f"{value.in_unit(low):g} to {value.in_unit(high):g} {value.unit}",
                "state the median of the samples as the value",
            )
        )
        return None
    return Spread("samples", np.array([low]), np.array([high]))


def _check_matrix(joints: Sequence[Joint], file: TomlFile, collector: Collector) -> None:
    names, matrix = rank_matrix(joints)
    if not names:
        return
    smallest = float(np.linalg.eigvalsh(matrix)[0])
    if smallest < -ROUNDING:
        collector.add(
            file.problem(
                "joint",
                "states correlations that contradict each other (their matrix is not positive semi-definite)",
                f"smallest eigenvalue {smallest:.3g} for {', '.join(names)}",
                "0 or above",
            )
        )
