"""What the stress-gated model reads, and its own consistency checks (layer 4)."""

from __future__ import annotations

import numpy as np

from benchmark.devices.model import Default, Finding, Input, ModelInputs, Option

__all__ = ["INPUTS", "OPTIONS", "REFERENCES", "check"]

_COLUMN = ("mechanics", ("force-balance",))
_STATED = ("mechanics", ("stated-pressure",))
_SLOPE = ("pressure_law", ("log-slope", "exponential"))
_FLOOR = ("pressure_law", ("log-slope",))
_BARRIER = ("pressure_law", ("activated",))
_THERMAL = ("pressure_law", ("log-slope", "activated"))

INPUTS: tuple[Input, ...] = (
    Input("reference_temperature"),
    Input("declared_supply", required=False),
    Input("actuator_coefficient"),
    Input("actuator_loss_tangent"),
    Input("terminal_capacitance"),
    Input("footprint"),
    Input("height", required=False),
    Input("breakdown_field"),
    Input("endurance_cycles", required=False),
    Input("process_temperature", required=False),
    # mechanics = force-balance
    *(
        Input(name, when=_COLUMN)
        for name in (
            "actuator_compliance",
            "actuator_permittivity",
            "actuator_density",
            "actuator_height",
            "actuator_area",
            "layer_count",
            "mechanical_quality",
            "channel_thickness",
            "channel_area",
            "channel_modulus",
            "channel_sound_speed",
            "frame_compliance",
            "punch_modulus",
            "punch_poisson_ratio",
            "punch_faces",
            "built_in_interference",
            "contact_resistivity",
            "actuator_leakage_resistance",
            "depoling_stress",
            "channel_strength",
            "curie_temperature",
        )
    ),
    Input("actuator_coupling_factor", required=False, when=_COLUMN),
    Input("electrode_thickness", required=False, when=_COLUMN),
    Input("electrode_sound_speed", required=False, when=_COLUMN),
    # mechanics = stated-pressure
    Input("pressure_per_coefficient_voltage", when=_STATED),
    Input("input_capacitance", when=_STATED),
    Input("stack_thickness", when=_STATED),
    Input("stack_sound_speed", when=_STATED),
    Input("declared_pressure", required=False, when=_STATED),
    # pressure law
    Input("resistance_unstressed", when=_SLOPE),
    Input("resistance_slope", when=_SLOPE),
    Input("resistance_floor", when=_FLOOR),
    Input("onset_pressure", when=_FLOOR),
    Input("corner_width", when=_FLOOR),
    Input("unstressed_activation_energy", when=_THERMAL),
    Input("activation_energy_slope", when=_BARRIER),
    Input("activation_corner_width", when=_BARRIER),
    Input("resistance_prefactor", when=_BARRIER),
    Input("metallic_resistance", when=_BARRIER),
    Input(
        "metallic_temperature_coefficient",
        when=_BARRIER,
        default=Default(0.0, "assumed", "metallic state taken as independent of temperature"),
    ),
    Input("parallel_leakage_conductance", when=_BARRIER),
)

OPTIONS: tuple[Option, ...] = (
    Option("mechanics", ("force-balance", "stated-pressure"), "force-balance"),
    Option("pressure_law", ("log-slope", "activated", "exponential"), "log-slope"),
    Option("wave_speed", ("open-circuit", "short-circuit"), "open-circuit"),
    Option("complement", ("mirrored-plate", "own", "none"), "mirrored-plate"),
    Option("size_scaling", ("copies",), "copies"),
    Option("wall", ("frame",), "frame"),
)

REFERENCES: tuple[str, ...] = (
    "Force F = (n d33 V + u_pre)/Sigma and charge Q = C_T V - n d33 F: derived from the strain-charge form of IEEE Std "
    "176-1987 (from memory), one-dimensional, free sides, linear, quasi-static",
    "Spreading under the punch (1 - nu^2)/(2 E r): Johnson, Contact Mechanics (1985), from memory",
    "Pressure law log-slope: own smooth form of the shape reported for TmTe, Phys. Rev. Lett. 78, 1138 (1997) "
    "(abstract)",
    "Pressure law activated: barrier falling linearly with pressure as reported for SmB6, Beille et al., Phys. Rev. B "
    "28, 7397 (1983) (abstract)",
    "Pressure law exponential with p = b d V: hand estimate without floor, corner, temperature and contacts",
    "Transit: bar speed at constant displacement (open-circuit) or constant field (short-circuit); the two bracket it",
    "Ringing limit: smaller of 0.5 sqrt(1 + [2 pi/ln(1/(1 - w))]^2) (derived) and min(4.5, 0.8 pi/ln(1/w)) (own "
    "circuit simulation of chains); soft, because both assume a drive that is fast against the mechanics",
    "Half the Curie temperature in degC: vendor rule, from memory",
    "Valid: column at least as high as wide, back pressure below the depoling stress, unipolar field along the poling "
    "below breakdown, channel thicker than two to three tunnelling lengths",
)

#: two tunnelling lengths of about 1 nm (common practice, no source)
THIN_CHANNEL = 2.0e-9


def check(inputs: ModelInputs) -> list[Finding]:
    """Return what is inconsistent in a set; arrays may hold one entry per node."""
    findings: list[Finding] = []
    if inputs.options["mechanics"] == "force-balance":
        findings += _check_material(inputs) + _check_geometry(inputs)
    if inputs.options["pressure_law"] == "log-slope":
        v = inputs.values
        if np.any(v["resistance_floor"] >= v["resistance_unstressed"]):
            findings.append(
                Finding(
                    "refuse", "value.resistance_floor", "is not below resistance_unstressed: the switch cannot open"
                )
            )
    return findings


def _check_material(inputs: ModelInputs) -> list[Finding]:
    if "actuator_coupling_factor" in inputs.values:
        return []
    what = "is not stated: the coupling factor implied by the constants cannot be compared with a published one"
    return [Finding("note", "value.actuator_coupling_factor", what)]


def _check_geometry(inputs: ModelInputs) -> list[Finding]:
    v = inputs.values
    findings = []
    aspect = float(np.min(v["actuator_height"] / np.sqrt(v["actuator_area"])))
    if aspect < 1.0:
        what = "is lower than the column is wide: the one-dimensional force balance does not hold"
        findings.append(Finding("warn", "value.actuator_height", what, f"height over width {aspect:.2f}", "1 or more"))
    if np.any(v["channel_area"] > v["actuator_area"]):
        what = "is larger than the actuator area: the pressure is diluted, not multiplied"
        findings.append(Finding("warn", "value.channel_area", what))
    thin = float(np.min(v["channel_thickness"]))
    if thin < THIN_CHANNEL:
        what = "is below two tunnelling lengths: the open channel leaks by tunnelling, which the model leaves out"
        found, allowed = f"{thin * 1e9:.2f} nm", f"{THIN_CHANNEL * 1e9:.0f} nm or more"
        findings.append(Finding("note", "value.channel_thickness", what, found, allowed))
    if np.any(v["built_in_interference"] < 0.0):
        what = "is a gap: until it closes the path is taken as the unstressed channel"
        findings.append(Finding("note", "value.built_in_interference", what))
    if ("electrode_thickness" in v) != ("electrode_sound_speed" in v):
        what = "electrode_thickness and electrode_sound_speed belong together"
        findings.append(Finding("refuse", "value.electrode_thickness", what))
    return findings
