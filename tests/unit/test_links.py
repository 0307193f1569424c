"""Stated values that say the same thing, or bound each other: each link fits where it should and breaks where not."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from benchmark import api
from benchmark.devices import MODEL_NAMES, model
from benchmark.devices.links import Link, judged
from benchmark.errors import InputRefused
from benchmark.evaluate.links import link_rows
from benchmark.record.load import load_technology
from benchmark.sets.library import shipped_nodes
from tests.cli.conftest import Run, evenload
from tests.fixed_displacement import fixed_displacement
from tests.near import near
from tests.refusals import TECHNOLOGY, check

__all__ = ["evenload"]

LINKS = [(name, link) for name in MODEL_NAMES for link in model(name).links]
EPS0 = 8.8541878128e-12
MATERIAL = {"actuator_coefficient": 593e-12, "actuator_compliance": 20.7e-12, "actuator_permittivity": 3400.0}

#: by formula: values [SI] that fit (invented, unless a source is named), what changes, and what the link then is
BROKEN: dict[str, tuple[dict[str, float], dict[str, float], str]] = {
    "declared_supply at most supply_ceiling": (
        {"declared_supply": 0.5, "supply_ceiling": 0.5},
        {"declared_supply": 0.51},
        "warned",
    ),
    "closing_voltage = switching_level declared_supply": (
        {"closing_voltage": 0.35, "switching_level": 0.7, "declared_supply": 0.5},
        {"closing_voltage": 0.36},
        "refused",
    ),
    "on_resistance = declared_supply / closed_state_current": (
        {"on_resistance": 50e3, "declared_supply": 0.5, "closed_state_current": 10e-6},
        {"closed_state_current": 10e-3},  # a slip of a prefix
        "refused",
    ),
    "on_resistance = declared_supply / (2 ln 2 effective_drive_current)": (
        {"on_resistance": 0.7213e4, "declared_supply": 0.7, "effective_drive_current": 70e-6},
        {"effective_drive_current": 63e-6},
        "warned",
    ),
    # Navy type VI, k33 0.75 published: Erturk & Inman, Piezoelectric Energy Harvesting (2011), table E.1
    "actuator_coefficient / sqrt(actuator_compliance actuator_permittivity eps0) below 1": (
        MATERIAL,
        {"actuator_coefficient": 800e-12},
        "refused",
    ),
    "actuator_coupling_factor = actuator_coefficient / sqrt(actuator_compliance actuator_permittivity eps0)": (
        {**MATERIAL, "actuator_coupling_factor": 0.75},
        {"actuator_permittivity": 2900.0},
        "warned",
    ),
    "channel_modulus / channel_sound_speed^2, its density, at most 23000 kg/m^3": (
        {"channel_modulus": 90e9, "channel_sound_speed": 3200.0},
        {"channel_sound_speed": 320.0},
        "warned",
    ),
    "500 kg/m^3 at most channel_modulus / channel_sound_speed^2, its density": (
        {"channel_modulus": 90e9, "channel_sound_speed": 3200.0},
        {"channel_modulus": 90e6},
        "warned",
    ),
    "layer_count declared_supply / actuator_height at most breakdown_field": (
        {"layer_count": 1.0, "declared_supply": 0.6, "actuator_height": 80e-9, "breakdown_field": 45e6},
        {"actuator_height": 8e-9},
        "warned",
    ),
    "declared_supply / stack_thickness at most breakdown_field": (
        {"declared_supply": 0.3, "stack_thickness": 60e-9, "breakdown_field": 100e6},
        {"breakdown_field": 4.9e6},
        "warned",
    ),
    "actuator_height + channel_thickness at most height": (
        {"height": 160e-9, "actuator_height": 80e-9, "channel_thickness": 4e-9},
        {"height": 83e-9},
        "warned",
    ),
    "stack_thickness at most height": ({"height": 61e-9, "stack_thickness": 60e-9}, {"height": 59e-9}, "warned"),
    "actuator_area at most footprint": (
        {"footprint": 0.024e-12, "actuator_area": 3600e-18},
        {"footprint": 0.0024e-12},
        "warned",
    ),
    "input_capacitance stack_thickness / (eps0 footprint), its relative permittivity, at most 10000": (
        {"input_capacitance": 0.1e-15, "stack_thickness": 60e-9, "footprint": 0.01e-12},
        {"input_capacitance": 100e-15},
        "warned",
    ),
    "declared_pressure = pressure_per_coefficient_voltage actuator_coefficient declared_supply": (
        {
            "declared_pressure": 1.6e9,
            "pressure_per_coefficient_voltage": 2.6666666666666667e19,
            "actuator_coefficient": 200e-12,
            "declared_supply": 0.3,
        },
        {"actuator_coefficient": 150e-12},
        "warned",
    ),
    "log10(resistance_unstressed / resistance_floor) at most unstressed_activation_energy / (k T ln 10)": (
        {
            "resistance_unstressed": 1e10,
            "resistance_floor": 2e4,
            "unstressed_activation_energy": 0.42 * 1.602176634e-19,
            "reference_temperature": 298.15,
        },
        {"unstressed_activation_energy": 0.30 * 1.602176634e-19},
        "warned",
    ),
    "3 overlap_capacitance at most gate_capacitance_total": (
        {"overlap_capacitance": 0.2e-9, "gate_capacitance_total": 0.9e-9},
        {"overlap_capacitance": 0.31e-9},
        "refused",
    ),
    "gate_length at most contacted_gate_pitch": (
        {"gate_length": 20e-9, "contacted_gate_pitch": 70e-9},
        {"gate_length": 71e-9},
        "warned",
    ),
}
for _end in ("", "_p"):
    BROKEN[f"log10(on_current{_end} / off_current{_end}) at most declared_supply / subthreshold_swing{_end}"] = (
        {
            "declared_supply": 0.7,
            f"on_current{_end}": 1e3,
            f"off_current{_end}": 1e-2,
            f"subthreshold_swing{_end}": 0.07,
        },
        {"declared_supply": 0.3},
        "warned" if not _end else "refused",
    )
    BROKEN[f"effective_current{_end} at most on_current{_end}"] = (
        {f"effective_current{_end}": 600.0, f"on_current{_end}": 1e3},
        {f"effective_current{_end}": 1.1e3},
        "refused",
    )
    BROKEN[f"2 access_resistance on_current{_end} at most declared_supply"] = (
        {"access_resistance": 80e-6, f"on_current{_end}": 1e3, "declared_supply": 0.7},
        {"access_resistance": 400e-6},
        "refused",
    )


def options_for(link: Link) -> dict[str, str]:
    return {name: words[0] for name, words in (link.when or {}).items()}


def state(link: Link, values: Mapping[str, Any]) -> str:
    (found,) = judged([link], {name: np.asarray(value) for name, value in values.items()}, options_for(link))
    assert not bool(found.warned & found.refused)
    return "refused" if found.refused else "warned" if found.warned else "fits"


@pytest.mark.parametrize(("name", "link"), LINKS, ids=lambda item: item if isinstance(item, str) else item.formula[:40])
def test_each_link_fits_and_breaks(name: str, link: Link):
    fitting, change, expected = BROKEN[link.formula]
    assert state(link, fitting) == "fits"
    if link.formula.startswith("log10(on_current /") and name == "virtual-source":
        expected = "refused"
    assert state(link, {**fitting, **change}) == expected


def test_every_case_is_of_a_link():
    assert set(BROKEN) == {link.formula for _, link in LINKS}


@pytest.mark.parametrize(("name", "link"), LINKS, ids=lambda item: item if isinstance(item, str) else item.formula[:40])
def test_links_are_made_of_what_the_model_reads(name: str, link: Link):
    reads = {item.name for item in model(name).inputs}
    assert set(link.names) <= reads
    assert link.place in link.names
    words = {option.name: set(option.allowed) for option in model(name).options}
    for option, allowed in (link.when or {}).items():
        assert set(allowed) <= words[option]
    missing = {key: np.asarray(value) for key, value in BROKEN[link.formula][0].items() if key != link.place}
    assert judged([link], missing, options_for(link)) == ()
    if link.when:
        assert judged([link], {key: np.asarray(1.0) for key in link.names}, dict.fromkeys(link.when, "other")) == ()


#: generic ceramics, k33 published and of the constants: Erturk & Inman (2011), table E.1; Jaffe, Cook & Jaffe (1971),
#: from memory
@pytest.mark.parametrize(
    ("d", "s", "eps", "published"),
    [
        (593e-12, 20.7e-12, 3400.0, 0.75),
        (374e-12, 18.8e-12, 1700.0, 0.705),
        (289e-12, 15.5e-12, 1300.0, 0.70),
        (225e-12, 13.5e-12, 1000.0, 0.64),
        (190e-12, 9.5e-12, 1700.0, 0.50),
    ],
)
def test_published_ceramics_fit(d: float, s: float, eps: float, published: float):
    link = next(link for _, link in LINKS if link.place == "actuator_coupling_factor")
    values = {"actuator_coefficient": d, "actuator_compliance": s, "actuator_permittivity": eps}
    assert state(link, {**values, "actuator_coupling_factor": published}) == "fits"


def test_all_nodes_at_once_are_each_node_alone():
    link = next(link for _, link in LINKS if link.place == "actuator_coupling_factor")
    values = {name: np.asarray(value) for name, value in MATERIAL.items()}
    values |= {"actuator_coupling_factor": np.array([0.75, 0.70, 0.50]), "actuator_coefficient": np.array([6e-10] * 3)}
    (whole,) = judged([link], values, options_for(link))
    for position in range(3):
        one = {name: value if value.ndim == 0 else value[position] for name, value in values.items()}
        (single,) = judged([link], one, options_for(link))
        assert (whole.left[position], whole.deviation[position]) == (single.left, single.deviation)
    assert whole.warned.tolist() == [False, True, False]
    assert whole.refused.tolist() == [False, False, True]


@pytest.mark.parametrize("huge", [1e200, 1e-200])
def test_numbers_out_of_any_range_do_not_fit_and_do_not_stop_anything(huge: float):
    for _, link in LINKS:
        values = {key: np.asarray(huge) for key in link.names}
        (found,) = judged([link], values, options_for(link))
        if not np.isfinite(found.deviation):
            assert found.warned or found.refused, link.formula


def test_every_shipped_set_fits():
    for path in sorted((shipped_nodes() / "technologies").glob("*.toml")):
        assert {row.state for row in link_rows(load_technology(path.stem))} <= {"fits"}, path.stem


def with_current(number: float) -> str:
    return TECHNOLOGY + f'[value.closed_state_current]\nby_node = {{ g1 = 10.0, g2 = {number} }}\nunit = "uA"\n'


def test_what_the_check_says(tmp_path: Path):
    said = check(tmp_path, {"switch.toml": with_current(12.5)})
    assert (said.refused, said.warned) == ([], [])
    said = check(tmp_path, {"switch.toml": with_current(14.0)})
    assert said.refused == []
    assert said.warned == [
        "switch.toml:36: value.closed_state_current: does not fit other values of the set: on_resistance = "
        "declared_supply / closed_state_current; found 40 kohm against 35.714 kohm at g2, ratio 0.8929; allowed: "
        "warned beyond 5 %, refused beyond 25 %; an on-resistance holds at the voltage across the switch that its "
        "conditions state"
    ]
    said = check(tmp_path, {"switch.toml": with_current(12.5e3)})
    assert said.warned == []
    assert len(said.refused) == 1
    assert (
        "contradicts other values of the set: on_resistance = declared_supply / closed_state_current" in said.refused[0]
    )
    assert "found 40 kohm against 0.04 kohm at g2, ratio 0.001" in said.refused[0]


def test_an_impossible_coupling_factor_is_refused(tmp_path: Path):
    path = tmp_path / "demo-stress-gated.toml"
    path.write_bytes((shipped_nodes() / "technologies" / path.name).read_bytes())
    before = path.read_bytes()
    said = {"unit": "pm/V", "evidence": "measured", "source": "invented", "where": "-", "conditions": "25 degC"}
    with pytest.raises(InputRefused, match=r"found 1\.0667 against 1 at g1, ratio 1\.067; allowed: refused above"):
        api.supersede(
            path,
            "actuator_coefficient",
            495,
            node="g1",
            date="2026-02-01",
            reason="x",
            old_date="2026-01-01",
            spread="keep",
            **said,
        )
    assert path.read_bytes() == before


def test_a_change_names_the_links_it_is_in(tmp_path: Path, evenload: Run):
    path = tmp_path / "nodes" / "technologies" / "film-switch.toml"
    fixed_displacement().write(tmp_path)
    old = tmp_path / "old" / "technologies" / "film-switch.toml"
    old.parent.mkdir(parents=True)
    old.write_bytes(path.read_bytes())
    text = (
        path.read_text().replace("value = 200.0", "value = 100.0").replace("value = 0.300000000000000", "value = 0.6")
    )
    path.write_text(text)
    found = api.changes(old, path).data["links"]
    assert [row["formula"] for row in found] == [
        "declared_supply / stack_thickness at most breakdown_field",
        "declared_supply = 6e-11 / actuator_coefficient",
    ]
    assert found[0]["left_old"] == near(5.0)
    assert found[0]["left"] == near(10.0)
    assert (found[0]["right"], found[0]["unit"], found[0]["state"]) == (near(100.0), "MV/m", "fits")
    assert (found[1]["left_old"], found[1]["right"], found[1]["ratio"]) == (near(0.3), near(0.6), near(1.0))
    ran = evenload("changes", old, path)
    assert ran.status == 0
    assert "Values that have to fit the changed ones" in ran.out
    ran = evenload("changes", old, path, "--format", "csv")
    assert [line.split(",")[0] for line in ran.out.splitlines()].count("link") == 4
    assert api.changes(path, path).data["links"] == []


def test_a_broken_link_is_a_warning_of_a_run(tmp_path: Path):
    inputs = fixed_displacement()
    values = inputs.sets["technologies/film-switch"]["value"]
    values["height"] = {"value": 50, "unit": "nm"}
    (warning,) = api.load_study(inputs.write(tmp_path)).warnings
    assert "does not fit other values of the set: stack_thickness at most height; found 60 nm against 50 nm" in warning
