"""Five studies of two switches that share their sets: what one edit of a set does to each of them (all invented)."""

from __future__ import annotations

import copy
from decimal import Decimal as D
from pathlib import Path

from tests.fixed_displacement import fixed_displacement
from tests.studies import toml


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
    for name, text in inputs.files().items():
        if name != "study.toml":
            place = folder / name
            place.parent.mkdir(parents=True, exist_ok=True)
            place.write_text(text, encoding="utf-8")
