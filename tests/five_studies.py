"""Five studies of two switches that share their sets: what one edit of a set does to each of them (all invented)."""

from __future__ import annotations

import copy
from decimal import Decimal as D
from pathlib import Path

from tests.fixed_displacement import fixed_displacement
from tests.studies import Inputs, mixed, toml


def five_whole_studies(folder: Path, factor: str = "1") -> None:
    """Five studies of two device models, two nodes, six policies, ranges and wires; ``factor`` on the gate capacitance.

    They differ in the required advantage and the activity and share one reference.
    """
    inputs = mixed()
    gate = inputs.sets["technologies/old-switch"]["value"]["gate_capacitance_total"]
    gate["value"] = gate["value"] * D(factor)
    for position, (required, activity) in enumerate(
        [("1.2", "0.1"), ("3.0", "0.1"), ("3.1", "0.1"), ("2.0", "0.2"), ("2.0", "0.05")], start=1
    ):
        study = copy.deepcopy(inputs.study) | {"id": f"study-{position}"}
        study["verdict"]["required_advantage"] = D(required)
        study["value"]["activity"]["value"] = D(activity)
        study["value"]["activity"].pop("spread", None)
        inputs.texts[f"s{position}.toml"] = toml(study)
    _write(folder, inputs)


def five_studies(folder: Path, coefficient: str = "200.0") -> None:
    """Five studies of two switches that share their sets; the second switch has a fixed coefficient."""
    inputs = fixed_displacement(coefficient=(coefficient, "0.05"))
    other = copy.deepcopy(fixed_displacement().sets["technologies/film-switch"]) | {"id": "other-switch"}
    inputs.sets["technologies/other-switch"] = other
    for position, (required, switch) in enumerate(
        [("1.2", "film"), ("1.5", "film"), ("3.0", "film"), ("1.5", "other"), ("3.0", "other")], start=1
    ):
        study = copy.deepcopy(inputs.study) | {"id": f"study-{position}"}
        study["verdict"]["required_advantage"] = D(required)
        study["candidate"]["technology"] = f"{switch}-switch"
        inputs.texts[f"s{position}.toml"] = toml(study)
    _write(folder, inputs)


def _write(folder: Path, inputs: Inputs) -> None:
    for name, text in inputs.files().items():
        if name != "study.toml":
            place = folder / name
            place.parent.mkdir(parents=True, exist_ok=True)
            place.write_text(text, encoding="utf-8")
