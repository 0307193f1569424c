"""Value names of technology sets (layer 1). Ranges are ours, from memory, to catch unit slips; not evidence."""

from __future__ import annotations

from benchmark.catalogue.quantity import Quantity

__all__ = ["TECHNOLOGY_QUANTITIES"]

_COMMON = (
    Quantity("reference_temperature", "T_ref", "temperature at which the values hold", "K", 200.0, 420.0),
    Quantity("declared_supply", "V_DD", "supply voltage of the declared point", "V", 0.05, 20.0),
    Quantity(
        "footprint", "A", "plan area with isolation (what it covers is said in its conditions)", "um^2", 1.0e-4, 1.0e3
    ),
    Quantity("height", "h", "height of one switch", "nm", 1.0, 1.0e4),
    Quantity("unit_width", "W", "channel width of the unit switch", "nm", 5.0, 1.0e4),
    Quantity("endurance_cycles", "N_end", "switching cycles until end of life", "1", 1.0e3, 1.0e18),
    Quantity("process_temperature", "T_proc", "highest process temperature", "degC", 20.0, 1200.0, "any"),
    Quantity("retention_time", "t_ret", "time the state is kept unpowered", "s", 1.0e-9, 1.0e10),
    Quantity("bias_power", "P_b", "standing power of bias per switch", "pW", 1.0e-6, 1.0e6, "nonnegative"),
    Quantity("series_switches_max", "k_max", "longest allowed series stack", "1", 1.0, 16.0, "count"),
    Quantity("supply_ceiling", "V_max", "highest allowed supply", "V", 0.05, 50.0),
    Quantity("closing_voltage", "V_on", "control voltage at which the switch closes", "V", 0.005, 50.0),
    Quantity("opening_voltage", "V_off", "control voltage at which the switch opens", "V", 0.0, 50.0, "any"),
    Quantity(
        "transit_time", "t_tr", "load-independent time from input to switching", "ps", 1.0e-3, 1.0e6, "nonnegative"
    ),
    Quantity(
        "extra_energy_per_cycle",
        "E_x",
        "loss per full input cycle not contained in charge times supply",
        "fJ",
        1.0e-6,
        1.0e4,
        "nonnegative",
    ),
)

_RESISTIVE = (
    Quantity("on_resistance", "R_on", "resistance of the closed switch", "kohm", 1.0e-3, 1.0e5),
    Quantity(
        "closed_state_current",
        "I_on",
        "current of one closed switch with the declared supply across it, for the consistency check only",
        "uA",
        1.0e-6,
        1.0e5,
    ),
    Quantity(
        "effective_drive_current",
        "I_eff",
        "effective drive current of one switch at the declared supply, for the consistency check only",
        "uA",
        1.0e-6,
        1.0e5,
    ),
    Quantity("off_resistance", "R_off", "resistance of the open switch", "Mohm", 1.0e-3, 1.0e12),
    Quantity(
        "open_state_current",
        "I_off",
        "leakage of the open switch at the declared supply",
        "pA",
        1.0e-9,
        1.0e6,
        "nonnegative",
    ),
    Quantity(
        "switching_level",
        "w",
        "input level, of the supply, where the resistance is twice the on value",
        "1",
        0.1,
        0.99,
        "fraction",
    ),
    Quantity("input_capacitance", "C_in", "input charge over supply, one switch", "fF", 1.0e-3, 1.0e3),
    Quantity(
        "terminal_capacitance", "C_t", "capacitance of one conducting terminal", "fF", 1.0e-3, 1.0e3, "nonnegative"
    ),
    Quantity("closing_delay", "t_on", "load-independent time to close", "ns", 1.0e-4, 1.0e5, "nonnegative"),
    Quantity("opening_delay", "t_off", "load-independent time to open", "ns", 1.0e-4, 1.0e5, "nonnegative"),
)

_TRANSISTOR = (
    Quantity("on_current", "I_on", "current per width at gate and drain on the supply", "uA/um", 0.01, 5000.0),
    Quantity("on_current_p", "I_on,p", "the same, p type", "uA/um", 0.01, 5000.0),
    Quantity(
        "off_current", "I_off", "current per width at zero gate voltage, drain on the supply", "nA/um", 1.0e-9, 1.0e4
    ),
    Quantity("off_current_p", "I_off,p", "the same, p type", "nA/um", 1.0e-9, 1.0e4),
    Quantity("effective_current", "I_eff", "effective drive current per width", "uA/um", 0.01, 5000.0),
    Quantity("effective_current_p", "I_eff,p", "the same, p type", "uA/um", 0.01, 5000.0),
    Quantity(
        "subthreshold_swing", "S", "subthreshold swing over the span stated in its conditions", "mV/decade", 1.0, 200.0
    ),
    Quantity("subthreshold_swing_p", "S_p", "the same, p type", "mV/decade", 1.0, 200.0),
    Quantity(
        "swing_temperature_coefficient",
        "dS/dT",
        "change of the swing with temperature",
        "mV/decade/K",
        -1.0,
        1.0,
        "any",
    ),
    Quantity(
        "drain_barrier_lowering", "delta", "threshold change per drain voltage", "mV/V", 0.0, 300.0, "nonnegative"
    ),
    Quantity("drain_barrier_lowering_p", "delta_p", "the same, p type", "mV/V", 0.0, 300.0, "nonnegative"),
    Quantity("saturation_voltage", "V_sat", "drain voltage scale of saturation", "mV", 1.0, 500.0),
    Quantity("gate_length", "L_g", "gate length", "nm", 5.0, 250.0),
    Quantity("gate_length_correction", "dL_g", "gate length minus channel length", "nm", 0.0, 50.0, "any"),
    Quantity("gate_capacitance_total", "C_g", "switching charge over supply, per width", "fF/um", 0.05, 5.0),
    Quantity(
        "overlap_capacitance", "C_ov", "overlap and fringe per edge, per width", "fF/um", 0.01, 1.0, "nonnegative"
    ),
    Quantity(
        "drain_capacitance_share",
        "s_d",
        "share of the gate capacitance that couples to the drain",
        "1",
        0.0,
        1.0,
        "fraction",
    ),
    Quantity(
        "terminal_capacitance_per_width",
        "C_t/W",
        "capacitance of one conducting terminal, per width",
        "fF/um",
        1.0e-3,
        5.0,
        "nonnegative",
    ),
    Quantity("inversion_capacitance", "C_inv", "inversion capacitance per area", "fF/um^2", 5.0, 60.0),
    Quantity(
        "access_resistance", "R_s", "access resistance per side times width", "ohm um", 1.0, 1000.0, "nonnegative"
    ),
    Quantity("channel_mobility", "mu", "channel mobility of the model", "cm^2/V/s", 20.0, 2000.0),
    Quantity("channel_mobility_p", "mu_p", "the same, p type", "cm^2/V/s", 20.0, 2000.0),
    Quantity("saturation_exponent", "beta", "model constant of the saturation function", "1", 0.8, 3.0),
    Quantity("saturation_exponent_p", "beta_p", "the same, p type", "1", 0.8, 3.0),
    Quantity("fermi_width", "alpha", "model constant of the Fermi factor", "1", 1.0, 5.0),
    Quantity(
        "threshold_temperature_slope",
        "dV_T/dT",
        "change of the threshold voltage with temperature",
        "mV/K",
        -2.0,
        0.0,
        "any",
    ),
    Quantity("mobility_temperature_exponent", "k_mu", "mobility goes as T to this power", "1", -2.5, 0.0, "any"),
    Quantity("velocity_temperature_exponent", "k_v", "velocity goes as T to this power", "1", -1.0, 0.0, "any"),
    Quantity("cell_height", "h_cell", "height of a standard cell", "nm", 30.0, 5000.0),
    Quantity("contacted_gate_pitch", "CGP", "contacted gate pitch", "nm", 20.0, 500.0),
)

_STRESS_GATED = (
    Quantity("actuator_coefficient", "d33", "strain per field of the actuator film, effective", "pm/V", 1.0, 3000.0),
    Quantity("actuator_compliance", "s33E", "compliance of the actuator at constant field", "1/TPa", 1.0, 100.0),
    Quantity(
        "actuator_permittivity", "eps33T", "relative permittivity of the actuator at constant stress", "1", 3.0, 1.0e4
    ),
    Quantity(
        "actuator_coupling_factor",
        "k33",
        "published coupling factor, for the consistency check only",
        "1",
        0.01,
        0.99,
        "fraction",
    ),
    Quantity("actuator_density", "rho_a", "density of the actuator", "kg/m^3", 1000.0, 2.0e4),
    Quantity(
        "actuator_loss_tangent", "tan delta", "dielectric loss tangent at use field", "1", 1.0e-4, 0.3, "nonnegative"
    ),
    Quantity("mechanical_quality", "Q", "mechanical quality factor of the mounted column", "1", 0.1, 1000.0),
    Quantity("actuator_height", "L_a", "height of the actuator", "nm", 5.0, 1.0e4),
    Quantity("actuator_area", "A_a", "plan area of the actuator", "nm^2", 100.0, 1.0e8),
    Quantity("layer_count", "n", "actuator layers electrically in parallel", "1", 1.0, 100.0, "count"),
    Quantity("channel_thickness", "L_c", "thickness of the channel", "nm", 0.5, 1000.0),
    Quantity("channel_area", "A_c", "area of the channel under the punch", "nm^2", 10.0, 1.0e8),
    Quantity("channel_modulus", "Y_c", "modulus of the channel, laterally constrained", "GPa", 1.0, 1000.0),
    Quantity("channel_sound_speed", "v_c", "sound speed in the channel", "m/s", 300.0, 2.0e4),
    Quantity("electrode_thickness", "L_e", "thickness of all electrodes that the sound crosses", "nm", 0.1, 1.0e4),
    Quantity("electrode_sound_speed", "v_e", "sound speed in the electrodes", "m/s", 300.0, 2.0e4),
    Quantity("frame_compliance", "C_f", "compliance of the frame", "m/N", 1.0e-7, 1.0, "nonnegative"),
    Quantity("punch_modulus", "E_p", "modulus of the punch faces", "GPa", 1.0, 1500.0),
    Quantity("punch_poisson_ratio", "nu_p", "Poisson ratio of the punch faces", "1", 0.0, 0.5, "fraction"),
    Quantity("punch_faces", "n_p", "punch faces in series", "1", 0.0, 4.0, "nonnegative"),
    Quantity(
        "built_in_interference",
        "u_pre",
        "interference built in at zero volt (gap if negative)",
        "pm",
        -1000.0,
        1000.0,
        "any",
    ),
    Quantity("resistance_unstressed", "R_0", "resistance at zero pressure", "ohm", 1.0e3, 1.0e16),
    Quantity("resistance_floor", "R_min", "lowest channel resistance, without contacts", "ohm", 1.0, 1.0e8),
    Quantity("resistance_slope", "s", "decades of resistance per pressure", "decade/GPa", 0.01, 100.0),
    Quantity(
        "onset_pressure", "p_1", "pressure at which the resistance starts to fall", "GPa", 0.0, 20.0, "nonnegative"
    ),
    Quantity("corner_width", "w_p", "width of the corners of the pressure law", "GPa", 1.0e-4, 5.0),
    Quantity("unstressed_activation_energy", "E_0", "activation energy of the unstressed resistance", "eV", 0.01, 3.0),
    Quantity("activation_energy_slope", "gamma", "fall of the activation energy per pressure", "meV/GPa", 0.1, 2000.0),
    Quantity("activation_corner_width", "w_E", "width of the corner of the activated law", "meV", 0.1, 200.0),
    Quantity("resistance_prefactor", "R_00", "prefactor of the activated resistance", "ohm", 0.1, 1.0e8),
    Quantity(
        "metallic_resistance",
        "R_met",
        "resistance of the metallic state at the reference temperature",
        "ohm",
        1.0,
        1.0e8,
    ),
    Quantity(
        "metallic_temperature_coefficient",
        "alpha_m",
        "relative change of the metallic resistance with temperature",
        "1/K",
        0.0,
        0.02,
        "any",
    ),
    Quantity(
        "parallel_leakage_conductance",
        "G_leak",
        "conductance parallel to the channel",
        "S",
        1.0e-20,
        1.0e-6,
        "nonnegative",
    ),
    Quantity("contact_resistivity", "rho_c", "contact resistivity per face", "ohm m^2", 1.0e-15, 1.0e-6, "nonnegative"),
    Quantity("actuator_leakage_resistance", "R_a", "resistance through the actuator dielectric", "ohm", 1.0e8, 1.0e20),
    Quantity("breakdown_field", "E_bd", "breakdown field of the actuator", "MV/m", 0.5, 2000.0),
    Quantity("depoling_stress", "p_dep", "stress at which the actuator starts to lose its poling", "MPa", 1.0, 2000.0),
    Quantity("channel_strength", "p_max", "highest pressure the channel bears", "GPa", 0.05, 50.0),
    Quantity("curie_temperature", "T_C", "Curie temperature of the actuator", "degC", 50.0, 1200.0, "any"),
    Quantity(
        "pressure_per_coefficient_voltage",
        "b",
        "pressure per coefficient and voltage, p = b d V",
        "Pa/m",
        1.0e17,
        1.0e21,
    ),
    Quantity(
        "declared_pressure",
        "p_DD",
        "pressure on the channel at the declared supply, for the consistency check only",
        "GPa",
        1.0e-4,
        50.0,
    ),
    Quantity("stack_thickness", "h_s", "thickness of the stack the sound crosses", "nm", 1.0, 1.0e4),
    Quantity("stack_sound_speed", "v_s", "sound speed in the stack", "m/s", 300.0, 2.0e4),
)

TECHNOLOGY_QUANTITIES: tuple[Quantity, ...] = (*_COMMON, *_RESISTIVE, *_TRANSISTOR, *_STRESS_GATED)
