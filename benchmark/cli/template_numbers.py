"""Invented numbers of the templates, in the catalogue's unit (layer 10). They only have to be possible together."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Final

__all__ = ["SPREADS", "STUDY_NUMBERS", "TECHNOLOGY_NUMBERS"]

_SIZE: Final = {
    "declared_supply": "0.5",
    "footprint": "0.05",
    "endurance_cycles": "1.0e12",
    "process_temperature": "380",
}

_GIVEN: Final = {
    **_SIZE,
    "on_resistance": "100",
    "off_resistance": "1.0e6",
    "switching_level": "0.7",
    "input_capacitance": "0.25",
    "closing_delay": "0.05",
    "opening_delay": "0.05",
}

_VIRTUAL_SOURCE: Final = {
    **_SIZE,
    "declared_supply": "0.7",
    "unit_width": "200",
    "gate_length": "20",
    "on_current": "520",
    "on_current_p": "450",
    "off_current": "0.5",
    "off_current_p": "0.5",
    "subthreshold_swing": "65",
    "drain_barrier_lowering": "30",
    "gate_capacitance_total": "0.8",
    "overlap_capacitance": "0.15",
    "access_resistance": "120",
    "channel_mobility": "200",
    "saturation_exponent": "1.8",
    "fermi_width": "2.0",
    "threshold_temperature_slope": "-0.7",
    "mobility_temperature_exponent": "-1.2",
    "velocity_temperature_exponent": "-0.4",
}

_STRESS_GATED: Final = {
    **_SIZE,
    "declared_supply": "0.6",
    "footprint": "0.024",
    "actuator_coefficient": "330",
    "actuator_loss_tangent": "0.03",
    "terminal_capacitance": "0.035",
    "breakdown_field": "45",
    "actuator_compliance": "15.2",
    "actuator_permittivity": "1600",
    "actuator_density": "7550",
    "actuator_height": "80",
    "actuator_area": "3600",
    "layer_count": "1",
    "mechanical_quality": "0.9",
    "channel_thickness": "4",
    "channel_area": "144",
    "channel_modulus": "90",
    "channel_sound_speed": "3200",
    "frame_compliance": "1.0e-4",
    "punch_modulus": "380",
    "punch_poisson_ratio": "0.22",
    "punch_faces": "2",
    "built_in_interference": "0",
    "contact_resistivity": "1.5e-12",
    "actuator_leakage_resistance": "4.0e13",
    "depoling_stress": "85",
    "channel_strength": "3.5",
    "curie_temperature": "320",
    "resistance_unstressed": "2.0e10",
    "resistance_slope": "5",
    "resistance_floor": "4.0e4",
    "onset_pressure": "0.12",
    "corner_width": "0.04",
    "unstressed_activation_energy": "0.42",
}

_STEEP_SWING: Final = {
    **_SIZE,
    "declared_supply": "0.4",
    "subthreshold_swing": "70",
    "on_current": "80",
    "off_current": "0.01",
    "saturation_voltage": "60",
    "gate_capacitance_total": "0.6",
    "drain_capacitance_share": "0.5",
    "terminal_capacitance_per_width": "0.1",
    "transit_time": "0",
    "unit_width": "200",
}

_TABLE: Final = {
    **_SIZE,
    "declared_supply": "0.3",
    "saturation_voltage": "60",
    "unit_width": "1000",
    "terminal_capacitance_per_width": "0.1",
    "gate_capacitance_total": "1.2",
    "transit_time": "0",
}

_STAGE_TABLE: Final = {name: number for name, number in _SIZE.items() if name not in ("footprint",)}

#: model -> value name -> number; names a model does not read are left out by the template
TECHNOLOGY_NUMBERS: Final[Mapping[str, Mapping[str, str]]] = {
    "given": _GIVEN,
    "virtual-source": _VIRTUAL_SOURCE,
    "stress-gated": _STRESS_GATED,
    "steep-swing": _STEEP_SWING,
    "table": _TABLE,
    "stage-table": _STAGE_TABLE,
}

#: value name -> spread shown as an example where a template states the value
SPREADS: Final[Mapping[str, str]] = {
    "on_resistance": '{ shape = "lognormal", factor = 1.5 }',
    "switching_level": '{ shape = "uniform", low = 0.6, high = 0.8 }',
    "on_current": '{ shape = "lognormal", factor = 1.1 }',
    "gate_capacitance_total": '{ shape = "normal", percent = 5.0 }',
    "actuator_coefficient": '{ shape = "lognormal", factor = 1.25 }',
    "clock_frequency": '{ shape = "loguniform", low = 0.3, high = 3.0 }',
    "activity": '{ shape = "loguniform", low = 0.005, high = 0.1 }',
}

STUDY_NUMBERS: Final[Mapping[str, str]] = {
    "clock_frequency": "1",
    "activity": "0.02",
    "busiest_activity": "1",
    "duty": "0.05",
    "logic_depth": "20",
    "gate_count": "1000",
    "register_count": "100",
    "fan_out": "3",
    "average_net_pitches": "8",
    "level_shifter_energy": "0",
    "supply_efficiency": "1",
    "overhead_power": "0",
    "residual_leakage": "0.05",
    "wake_energy_cycles": "3",
    "routing_overhead": "0.1",
    "repeated_share": "1",
    "area_share": "1",
    "idle_time": "1",
    "active_cycles": "1000",
    "word_length": "16",
    "stage_count": "11",
}
