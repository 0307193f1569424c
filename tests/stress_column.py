"""An invented stress-gated column, round numbers in SI, for tests of the model and of its deck."""

from __future__ import annotations

T_REF = 298.15

COLUMN: dict[str, float] = {
    "reference_temperature": T_REF,
    "actuator_coefficient": 350e-12,
    "actuator_compliance": 16e-12,
    "actuator_permittivity": 1750.0,
    "actuator_coupling_factor": 0.70,
    "actuator_density": 7600.0,
    "actuator_loss_tangent": 0.02,
    "mechanical_quality": 1.0,
    "actuator_height": 60e-9,
    "actuator_area": 2500e-18,
    "layer_count": 1.0,
    "channel_thickness": 3e-9,
    "channel_area": 100e-18,
    "channel_modulus": 80e9,
    "channel_sound_speed": 3500.0,
    "frame_compliance": 1e-4,
    "punch_modulus": 400e9,
    "punch_poisson_ratio": 0.2,
    "punch_faces": 2.0,
    "built_in_interference": 0.0,
    "contact_resistivity": 2e-12,
    "actuator_leakage_resistance": 1e14,
    "terminal_capacitance": 30e-18,
    "footprint": 0.02e-12,
    "breakdown_field": 60e6,
    "depoling_stress": 100e6,
    "channel_strength": 4e9,
    "curie_temperature": 603.15,
}
