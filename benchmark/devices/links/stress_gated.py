"""Links of the stress-gated switch: material constants, thicknesses, field, resistance span (layer 4)."""

from __future__ import annotations

import numpy as np

from benchmark.constants import BOLTZMANN, VACUUM_PERMITTIVITY
from benchmark.devices.links.link import Link, Values
from benchmark.devices.record import Array
from benchmark.physics import piezo

__all__ = ["STRESS_GATED_LINKS"]

COLUMN = {"mechanics": ("force-balance",)}
STATED = {"mechanics": ("stated-pressure",)}
FLOOR = {"pressure_law": ("log-slope",)}
#: densities of solids [kg/m3]: lightest foams aside, lithium 534, osmium 22 590 (handbook, from memory)
LIGHTEST, DENSEST = 500.0, 23.0e3
#: highest relative permittivity that films and ceramics show (usual range of the catalogue)
HIGHEST_PERMITTIVITY = 1.0e4
_MATERIAL = ("actuator_coefficient", "actuator_compliance", "actuator_permittivity")
_CONSTANTS = "k33^2 = d33^2/(s33E eps33T); check that compliance is s33E and permittivity is at constant stress"


def _coupling(v: Values) -> Array:
    coefficient, compliance, permittivity = (v[name] for name in _MATERIAL)
    return piezo.coupling_factor(coefficient, compliance, permittivity * VACUUM_PERMITTIVITY)


def _decades_of_barrier(v: Values) -> Array:
    """Decades that a closing barrier can give, E_0 / (k T ln 10)."""
    thermal = BOLTZMANN * v["reference_temperature"] * np.log(10.0)
    return np.asarray(v["unstressed_activation_energy"] / thermal)


STRESS_GATED_LINKS = (
    Link(
        name="coupling factor of the material constants",
        formula="actuator_coefficient / sqrt(actuator_compliance actuator_permittivity eps0) below 1",
        place="actuator_coefficient",
        names=_MATERIAL,
        left=_coupling,
        right=lambda v: np.asarray(1.0),
        unit="1",
        kind="at most",
        warned=None,
        refused=0.0,
        source="IEEE Std 176-1987 (from memory)",
        hint=_CONSTANTS,
        when=COLUMN,
    ),
    Link(
        name="coupling factor, published and of the constants",
        formula="actuator_coupling_factor = actuator_coefficient / "
        "sqrt(actuator_compliance actuator_permittivity eps0)",
        place="actuator_coupling_factor",
        names=("actuator_coupling_factor", *_MATERIAL),
        left=lambda v: v["actuator_coupling_factor"],
        right=_coupling,
        unit="1",
        kind="equal",
        warned=0.05,
        refused=0.25,
        source="IEEE Std 176-1987 (from memory); published tables that mix specimens miss it by up to 17 %",
        hint=_CONSTANTS,
        when=COLUMN,
    ),
    Link(
        name="modulus and sound speed of the channel",
        formula=f"channel_modulus / channel_sound_speed^2, its density, at most {DENSEST:g} kg/m^3",
        place="channel_sound_speed",
        names=("channel_modulus", "channel_sound_speed"),
        left=lambda v: v["channel_modulus"] / v["channel_sound_speed"] ** 2,
        right=lambda v: np.asarray(DENSEST),
        unit="kg/m^3",
        kind="at most",
        warned=0.0,
        refused=None,
        source="speed of sound sqrt(modulus/density); density of osmium, handbook, from memory",
        when=COLUMN,
    ),
    Link(
        name="sound speed and modulus of the channel",
        formula=f"{LIGHTEST:g} kg/m^3 at most channel_modulus / channel_sound_speed^2, its density",
        place="channel_sound_speed",
        names=("channel_modulus", "channel_sound_speed"),
        left=lambda v: np.asarray(LIGHTEST),
        right=lambda v: v["channel_modulus"] / v["channel_sound_speed"] ** 2,
        unit="kg/m^3",
        kind="at most",
        warned=0.0,
        refused=None,
        source="speed of sound sqrt(modulus/density); density of lithium, handbook, from memory",
        when=COLUMN,
    ),
    Link(
        name="field at the declared supply and breakdown",
        formula="layer_count declared_supply / actuator_height at most breakdown_field",
        place="breakdown_field",
        names=("layer_count", "declared_supply", "actuator_height", "breakdown_field"),
        left=lambda v: v["layer_count"] * v["declared_supply"] / v["actuator_height"],
        right=lambda v: v["breakdown_field"],
        unit="MV/m",
        kind="at most",
        warned=0.0,
        refused=None,
        source="field of a plate capacitor, V/t",
        hint="the declared point itself is not allowed",
        when=COLUMN,
    ),
    Link(
        name="field at the declared supply and breakdown",
        formula="declared_supply / stack_thickness at most breakdown_field",
        place="breakdown_field",
        names=("declared_supply", "stack_thickness", "breakdown_field"),
        left=lambda v: v["declared_supply"] / v["stack_thickness"],
        right=lambda v: v["breakdown_field"],
        unit="MV/m",
        kind="at most",
        warned=0.0,
        refused=None,
        source="field of a plate capacitor, V/t",
        hint="the declared point itself is not allowed",
        when=STATED,
    ),
    Link(
        name="height of the switch and of its layers",
        formula="actuator_height + channel_thickness at most height",
        place="height",
        names=("height", "actuator_height", "channel_thickness"),
        left=lambda v: v["actuator_height"] + v["channel_thickness"],
        right=lambda v: v["height"],
        unit="nm",
        kind="at most",
        warned=0.0,
        refused=None,
        source="geometry",
        when=COLUMN,
    ),
    Link(
        name="height of the switch and of its stack",
        formula="stack_thickness at most height",
        place="height",
        names=("height", "stack_thickness"),
        left=lambda v: v["stack_thickness"],
        right=lambda v: v["height"],
        unit="nm",
        kind="at most",
        warned=0.0,
        refused=None,
        source="geometry",
        when=STATED,
    ),
    Link(
        name="footprint and area of the actuator",
        formula="actuator_area at most footprint",
        place="footprint",
        names=("footprint", "actuator_area"),
        left=lambda v: v["actuator_area"],
        right=lambda v: v["footprint"],
        unit="um^2",
        kind="at most",
        warned=0.0,
        refused=None,
        source="geometry: a footprint is with isolation",
        when=COLUMN,
    ),
    Link(
        name="input capacitance and thickness of the stack",
        formula="input_capacitance stack_thickness / (eps0 footprint), its relative permittivity, at most "
        f"{HIGHEST_PERMITTIVITY:g}",
        place="input_capacitance",
        names=("input_capacitance", "stack_thickness", "footprint"),
        left=lambda v: v["input_capacitance"] * v["stack_thickness"] / (VACUUM_PERMITTIVITY * v["footprint"]),
        right=lambda v: np.asarray(HIGHEST_PERMITTIVITY),
        unit="1",
        kind="at most",
        warned=0.0,
        refused=None,
        source="capacitance per area eps/t of one layer under the whole footprint",
        hint="several layers in parallel give more",
        when=STATED,
    ),
    Link(
        name="pressure at the declared supply and its coefficient",
        formula="declared_pressure = pressure_per_coefficient_voltage actuator_coefficient declared_supply",
        place="declared_pressure",
        names=("declared_pressure", "pressure_per_coefficient_voltage", "actuator_coefficient", "declared_supply"),
        left=lambda v: v["declared_pressure"],
        right=lambda v: v["pressure_per_coefficient_voltage"] * v["actuator_coefficient"] * v["declared_supply"],
        unit="GPa",
        kind="equal",
        warned=0.05,
        refused=0.25,
        source="p = b d V, the law of the model",
        when=STATED,
    ),
    Link(
        name="span of the resistance and activation energy",
        formula="log10(resistance_unstressed / resistance_floor) at most unstressed_activation_energy / (k T ln 10)",
        place="unstressed_activation_energy",
        names=("resistance_unstressed", "resistance_floor", "unstressed_activation_energy", "reference_temperature"),
        left=lambda v: np.log10(v["resistance_unstressed"] / v["resistance_floor"]),
        right=_decades_of_barrier,
        unit="decade",
        kind="at most",
        warned=0.05,
        refused=None,
        source="decades of a barrier that closes, R = R_00 exp(E/kT)",
        hint="a barrier of this height cannot give so many decades at the reference temperature",
        when=FLOOR,
    ),
)
