"""How a device model is declared (layer 4).

A model is one module in this folder with one ``DeviceModel`` value named ``MODEL``. It names its inputs (catalogue
names), its options (closed lists) and two pure functions:

``prepare(inputs)``
    everything that does not depend on supply or temperature: calibration on published targets, derived
    constants, interpolants of tables. Returns a mapping that only ``switch`` reads.
``switch(prepared, supply, temperature, knobs)``
    the ``SwitchPair``. ``knobs`` always has ``threshold_shift`` [V] (0 when unused). It may have ``stack_depth``:
    the longest series stack the caller will ask about, so that a model with costly stacks can stop there.

Both are elementwise over broadcast arrays: no loop over samples, no clipping, no file, no clock, no random state.
The evaluator calls ``prepare`` with value arrays of shape (draw, 1, 1) and ``switch`` with supply (1 or draw, 1,
supply) and temperature (1, temperature, 1).
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Any

from benchmark.devices.links.link import Link
from benchmark.devices.netlist.parts import SubCircuits
from benchmark.devices.record import Array, SwitchPair
from benchmark.measured import MeasuredTable

__all__ = ["Default", "DeviceModel", "Finding", "Input", "ModelInputs", "Option", "Prepared"]

Prepared = Mapping[str, Any]


@dataclass(frozen=True)
class ModelInputs:
    """What a model may read: SI values by catalogue name, options, measured tables.

    A value the file does not state and that has no default is absent from ``values``.
    """

    values: Mapping[str, Array]
    options: Mapping[str, str]
    tables: Mapping[str, MeasuredTable]


@dataclass(frozen=True)
class Default:
    """A value used when the file is silent; it appears in the ledger as a default with this origin."""

    value: float  # SI
    evidence: str
    origin: str


@dataclass(frozen=True)
class Input:
    """One catalogue name that the model reads. Neither required nor default: absent means 'not stated' (unknown)."""

    name: str
    required: bool = True
    default: Default | None = None
    #: required only when this option has one of these values, e.g. ("pressure_law", ("log-slope",))
    when: tuple[str, tuple[str, ...]] | None = None


@dataclass(frozen=True)
class Option:
    """A non-numeric choice: closed list and the value used when the file is silent."""

    name: str
    allowed: tuple[str, ...]
    default: str


@dataclass(frozen=True)
class Finding:
    """Result of a model's own consistency check of a parameter set.

    ``level`` is 'refuse', 'warn' or 'note'; ``name`` the dotted value it belongs to.
    """

    level: str
    name: str
    what: str
    found: str = ""
    allowed: str = ""
    hint: str = ""


def _no_findings(inputs: ModelInputs) -> list[Finding]:
    return []


@dataclass(frozen=True)
class DeviceModel:
    """A registered device model; see the module docstring for the two functions."""

    name: str
    title: str
    inputs: tuple[Input, ...]
    options: tuple[Option, ...]
    prepare: Callable[[ModelInputs], Prepared]
    switch: Callable[[Prepared, Array, Array, Mapping[str, Array]], SwitchPair]
    #: domain checks that need the physics (coupling-factor consistency, swing below the thermionic limit ...)
    check: Callable[[ModelInputs], list[Finding]] = _no_findings
    #: stated values that say the same thing, or bound each other; judged by ``benchmark.evaluate.links``
    links: tuple[Link, ...] = ()
    #: tables the model reads: name -> required
    tables: Mapping[str, bool] = field(default_factory=dict)
    #: published targets the model is solved for at load (they check the solver, not the model)
    calibrated_on: tuple[str, ...] = ()
    #: knobs beyond supply and size that this model honours
    knobs: tuple[str, ...] = ()
    #: text of both switches at ONE point for a circuit simulator, from what ``prepare`` returned, the records of
    #: ``switch`` at that point, and the knobs; None: no closed form, the current law is written as a table
    netlist: Callable[[Prepared, SwitchPair, Mapping[str, Array]], SubCircuits] | None = None
    #: equation numbers, validity and references, printed by ``evenload show model``
    references: tuple[str, ...] = ()
