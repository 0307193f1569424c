"""Stress-gated switch (layer 4): a piezoelectric column presses on a channel whose resistance falls with pressure.

Chain of one evaluation, each step a function of ``benchmark.physics``::

    control voltage -> clamp force -> pressure -> channel resistance + contacts

The control voltage acts between the input and a fixed reference plate (ground for the pull-down, supply for the
pull-up switch with option ``mirrored-plate``), never against the conducting terminals: series switches actuate at the
same time and a stack is ohmic.

Decisions of this model
    Closing and opening time are the acoustic transit of the whole stack. A column under a voltage step first
    reaches its static stroke after one transit whatever the base reflects; a two-pole actuator of the same quarter
    wave would need 1.29 (Q 0.5) to 0.75 (Q 10) transits to 60 % of it. No such factor is applied: ``natural_frequency``
    and ``quality`` are in the record for rules that solve the motion.
    Natural frequency: fundamental of the column on a fixed base, its tip loaded by channel, punch and frame.
    Temperature moves the channel only; drift of the actuator constants (0.2 to 0.5 % per kelvin in soft ceramics,
    from memory) is not in the model. With the log-slope law the pressure at which the floor is reached stays fixed and
    the slope follows the decades that are left, as for a barrier that the pressure closes. The exponential law
    has no temperature dependence.
    The ringing limit is soft: its rules assume a drive that is fast against the mechanics; a slow load damps.
    A gap (negative built-in interference) conducts like the unstressed channel until it closes.
    Size means copies of the whole switch: widening the channel under one actuator would lower the pressure.
    ``off_current_path`` is the full supply across the open switch, V/R(0); the closed switch in series with it
    belongs to the cell.
    With ``stated-pressure`` (hand estimates) the pressure is p = b d V, the input a constant capacitance and the
    transit thickness over speed; actuator leakage, force, contact and ringing limits are not part of it.

Outside the model: column lower than wide, electrodes as compliance, hysteresis in the voltage (its loss is in
``extra_energy``), ageing.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from benchmark.constants import VACUUM_PERMITTIVITY
from benchmark.devices.links.stress_gated import STRESS_GATED_LINKS
from benchmark.devices.model import DeviceModel, ModelInputs, Prepared
from benchmark.devices.netlist.parts import SubCircuits, scalar
from benchmark.devices.netlist.stress_gated import Gate, switch_text
from benchmark.devices.record import Array, BoolArray, Capability, Limit, Switch, SwitchPair
from benchmark.devices.stress_gated_channel import Channel, channel_at, prepare_channel
from benchmark.devices.stress_gated_inputs import INPUTS, OPTIONS, REFERENCES, check
from benchmark.physics import acoustics, force_balance, losses, piezo, two_pole
from benchmark.physics.roots import falling_root

__all__ = ["MODEL"]

#: longest series stack in the record; the ohmic law holds for any length
STACK_LENGTH = 8


def _prepare_column(v: Mapping[str, Array], wave_speed: str) -> dict[str, Array]:
    """Compliances, charge and waves of the force loop; everything that needs no supply and no temperature."""
    height, area = v["actuator_height"], v["actuator_area"]
    channel_area, layers = v["channel_area"], v["layer_count"]
    permittivity = v["actuator_permittivity"] * VACUUM_PERMITTIVITY
    coupling = piezo.coupling_factor(v["actuator_coefficient"], v["actuator_compliance"], permittivity)
    stiff = piezo.compliance_constant_displacement(v["actuator_compliance"], coupling)
    speeds = {
        "open-circuit": piezo.bar_wave_speed(v["actuator_density"], stiff),
        "short-circuit": piezo.bar_wave_speed(v["actuator_density"], v["actuator_compliance"]),
    }
    column = force_balance.column_compliance(v["actuator_compliance"], height, area)
    channel = force_balance.post_compliance(v["channel_modulus"], v["channel_thickness"], channel_area)
    punch = v["punch_faces"] * force_balance.flat_punch_compliance(
        v["punch_modulus"], v["punch_poisson_ratio"], np.sqrt(channel_area / np.pi)
    )
    total = column + channel + punch + v["frame_compliance"]
    passive = acoustics.transit_time(v["channel_thickness"], v["channel_sound_speed"])
    if "electrode_thickness" in v:
        passive = passive + acoustics.transit_time(v["electrode_thickness"], v["electrode_sound_speed"])
    transits = {name: acoustics.transit_time(height, speed) + passive for name, speed in speeds.items()}
    compliance = stiff if wave_speed == "open-circuit" else v["actuator_compliance"]
    own = force_balance.column_compliance(compliance, height, area)
    root = acoustics.loaded_bar_root(own / (total - column))
    free = force_balance.free_capacitance(layers, permittivity, area, height)
    blocking = force_balance.blocking_ratio(column, total)
    return {
        "coupling": coupling,
        "punch_compliance": punch,
        "total_compliance": total,
        "blocking": blocking,
        "free_capacitance": free,
        "loaded_capacitance": force_balance.input_capacitance(free, coupling, blocking),
        "blocked_capacitance": force_balance.length_blocked_capacitance(free, coupling),
        "pressure_per_volt": force_balance.pressure_per_volt(layers, v["actuator_coefficient"], total, channel_area),
        "transit_open_circuit": transits["open-circuit"],
        "transit_short_circuit": transits["short-circuit"],
        "transit": transits[wave_speed],
        "natural_frequency": root * speeds[wave_speed] / height,
    }


def _prepare(inputs: ModelInputs) -> Prepared:
    """Everything that depends on neither supply nor temperature."""
    v, options = inputs.values, inputs.options
    prepared: dict[str, object] = {
        "values": v,
        "options": options,
        "channel": prepare_channel(v, options["pressure_law"], options["mechanics"]),
    }
    if options["mechanics"] == "force-balance":
        prepared["column"] = _prepare_column(v, options["wave_speed"])
    return prepared


def _force(prepared: Prepared, voltage: Array, trailing: bool = False) -> tuple[Array, BoolArray]:
    """Clamp force [N] and mask of lost contact; ``trailing``: voltage has one axis more than the values."""
    v, total = prepared["values"], prepared["column"]["total_compliance"]
    names = ("layer_count", "actuator_coefficient", "built_in_interference")
    layers, coefficient, interference = (v[name][..., None] if trailing else v[name] for name in names)
    loop = total[..., None] if trailing else total
    return force_balance.contact_force(force_balance.spring_force(layers, coefficient, voltage, interference, loop))


def _pressure(prepared: Prepared, voltage: Array, trailing: bool = False) -> Array:
    """Pressure on the channel [Pa] at a control voltage [V]; not below zero, a contact does not pull."""
    v = prepared["values"]
    if prepared["options"]["mechanics"] == "force-balance":
        area = v["channel_area"][..., None] if trailing else v["channel_area"]
        return np.asarray(_force(prepared, voltage, trailing)[0] / area)
    per_volt = v["pressure_per_coefficient_voltage"] * v["actuator_coefficient"]
    return np.asarray(np.maximum(0.0, (per_volt[..., None] if trailing else per_volt) * voltage))


def _switching_level(prepared: Prepared, channel: Channel, supply: Array, closed: Array, opened: Array) -> Array:
    """Return w with R(w V) = 2 R(V) [1]; nan where even the open switch has less than twice the closed resistance."""
    target = np.log(2.0 * closed)

    def excess(level: Array) -> Array:
        return np.asarray(np.log(channel.resistance(_pressure(prepared, level * supply))) - target)

    shape = np.broadcast_shapes(np.shape(closed), np.shape(supply))
    level = falling_root(excess, np.zeros(shape), np.ones(shape))
    return np.asarray(np.where(opened > 2.0 * closed, level, np.nan))


def _charge(prepared: Prepared, supply: Array) -> Array:
    """Charge drawn by the input over the full swing [C]; exact also when contact is made on the way."""
    v = prepared["values"]
    if prepared["options"]["mechanics"] == "stated-pressure":
        return np.asarray(v["input_capacitance"] * supply)
    free, layers, coefficient = prepared["column"]["free_capacitance"], v["layer_count"], v["actuator_coefficient"]
    closed, opened = (
        force_balance.terminal_charge(free, volts, layers, coefficient, _force(prepared, volts)[0])
        for volts in (supply, np.zeros_like(supply))
    )
    return np.asarray(closed - opened)


def _column_limits(
    prepared: Prepared, pressure: Array, force: Array, level: Array, temperature: Array
) -> tuple[Limit, ...]:
    v = prepared["values"]
    peak = pressure * (1.0 + two_pole.overshoot(v["mechanical_quality"]))
    curie = v["curie_temperature"]
    half = 273.15 + 0.5 * (curie - 273.15)
    quality = acoustics.quality_limit(level)
    return (
        Limit("back pressure on the actuator", force / v["actuator_area"], v["depoling_stress"], "Pa", "hard",
              "depoling_stress"),
        Limit("peak channel pressure with overshoot", peak, v["channel_strength"], "Pa", "hard", "channel_strength"),
        Limit("Curie temperature", temperature, curie, "K", "hard", "curie_temperature"),
        Limit("half the Curie temperature in degC (vendor rule)", temperature, half, "K", "soft", "curie_temperature"),
        Limit("ringing: mechanical quality", v["mechanical_quality"], quality, "1", "soft", "mechanical_quality"),
    )  # fmt: skip


def _column_intermediates(prepared: Prepared, force: Array, level: Array) -> dict[str, tuple[Array, str]]:
    v, c = prepared["values"], prepared["column"]
    elastic = force_balance.elastic_energy(force, c["total_compliance"] * (1.0 - c["blocking"]))
    return {
        "clamp force": (force, "N"),
        "back pressure": (np.asarray(force / v["actuator_area"]), "Pa"),
        "pressure per volt": (c["pressure_per_volt"], "Pa/V"),
        "blocking ratio": (c["blocking"], "1"),
        "coupling factor": (c["coupling"], "1"),
        "compliance of the loop": (c["total_compliance"], "m/N"),
        "compliance of the punch": (c["punch_compliance"], "m/N"),
        "capacitance with free ends": (c["free_capacitance"], "F"),
        "capacitance in contact": (c["loaded_capacitance"], "F"),
        "capacitance with blocked length": (c["blocked_capacitance"], "F"),
        "elastic energy outside the column (part of charge times voltage)": (elastic, "J"),
        "overshoot": (two_pole.overshoot(v["mechanical_quality"]), "1"),
        "highest quality without ringing": (acoustics.quality_limit(level), "1"),
        "transit, open-circuit speed": (c["transit_open_circuit"], "s"),
        "transit, short-circuit speed": (c["transit_short_circuit"], "s"),
    }


def _current(prepared: Prepared, channel: Channel) -> object:
    wide = channel.widened()

    def current(control: Array, path: Array) -> Array:
        return np.asarray(path / wide.resistance(_pressure(prepared, control, trailing=True)), dtype=np.float64)

    return current


def _switch(prepared: Prepared, supply: Array, temperature: Array, knobs: Mapping[str, Array]) -> SwitchPair:
    """Return the pair of switches; ``knobs`` are not used by this model."""
    v, options = prepared["values"], prepared["options"]
    supply, temperature = np.asarray(supply, dtype=np.float64), np.asarray(temperature, dtype=np.float64)
    channel = channel_at(prepared["channel"], temperature)
    pressure = _pressure(prepared, supply)
    closed = channel.resistance(pressure)
    opened = channel.resistance(_pressure(prepared, np.zeros_like(supply)))
    level = _switching_level(prepared, channel, supply, closed, opened)
    charge = _charge(prepared, supply)
    capacitance = np.asarray(charge / supply)
    outside: dict[str, BoolArray] = dict(channel.outside)
    intermediates: dict[str, tuple[Array, str]] = {
        "pressure": (pressure, "Pa"),
        "channel resistance, closed": (np.asarray(closed - channel.contact), "ohm"),
        "contact resistance": (channel.contact, "ohm"),
        "resistance, open": (opened, "ohm"),
    }
    if options["mechanics"] == "force-balance":
        column = prepared["column"]
        force, lost = _force(prepared, supply)
        field = np.asarray(v["layer_count"] * supply / v["actuator_height"])
        transit, frequency, quality = column["transit"], column["natural_frequency"], v["mechanical_quality"]
        leakage = np.asarray(supply / v["actuator_leakage_resistance"])
        limits = _column_limits(prepared, pressure, force, level, temperature)
        intermediates |= _column_intermediates(prepared, force, level)
        outside["the gap does not close at the supply (contact lost)"] = lost
        outside["coupling factor of one or more: the material constants do not belong together"] = (
            column["coupling"] >= 1.0
        )
    else:
        field = np.asarray(supply / v["stack_thickness"])
        transit = acoustics.transit_time(v["stack_thickness"], v["stack_sound_speed"])
        frequency = quality = np.full_like(transit, np.nan)
        leakage, limits = np.zeros_like(supply), ()
    limits = (Limit("actuator field", field, v["breakdown_field"], "V/m", "hard", "breakdown_field"), *limits)
    intermediates |= {"actuator field": (field, "V/m"), "stack transit": (transit, "s")}
    zero = np.zeros_like(supply)
    stack = np.arange(1.0, STACK_LENGTH + 1.0)
    fields = {
        "technology": MODEL.title,
        "partner": options["complement"],
        "resistance_kind": "path",
        "stack_time": "simultaneous",
        "input_scales_with_size": True,
        "resistance": closed,
        "switching_level": level,
        "current": _current(prepared, channel),
        "on_current": np.asarray(supply / closed),
        "off_current_path": np.asarray(supply / opened),
        "off_current_input_high": leakage,
        "off_current_input_low": zero,
        "off_current_body": zero,
        "stack_on": stack,
        "stack_off": 1.0 / stack,
        "input_charge": charge,
        "input_capacitance_delay": capacitance,
        "terminal_capacitance": v["terminal_capacitance"],
        "terminal_capacitance_delay": v["terminal_capacitance"],
        "extra_energy": losses.dielectric_loss_unipolar(capacitance, supply, v["actuator_loss_tangent"]),
        "closing_time": transit,
        "opening_time": transit,
        "natural_frequency": frequency,
        "quality": quality,
        "closing_voltage": np.asarray(level * supply),
        "opening_voltage": np.asarray(level * supply),
        "area": v["footprint"],
        "height": v.get("height", np.asarray(np.nan)),
        "bias_power": zero,
        "retention": np.full_like(supply, np.inf),
        "limits": limits,
        "capabilities": _capabilities(v),
        "outside": outside,
        "intermediates": intermediates,
    }
    return SwitchPair(Switch(polarity="down", **fields), Switch(polarity="up", **fields), supply, temperature)


def _netlist(prepared: Prepared, pair: SwitchPair, knobs: Mapping[str, Array]) -> SubCircuits:
    v, stated = prepared["values"], prepared["options"]["mechanics"] == "stated-pressure"
    notes = ["The loss of the actuator beyond charge times voltage (extra energy of the record) is not in it."]
    if stated:
        slope, offset = scalar(_pressure(prepared, np.ones(1))), 0.0
        gate = Gate(slope, offset, None, None)
    else:
        column = prepared["column"]
        slope = scalar(column["pressure_per_volt"])
        offset = scalar(v["built_in_interference"] / (column["total_compliance"] * v["channel_area"]))
        gate = Gate(slope, offset, scalar(column["blocked_capacitance"]), scalar(v["actuator_leakage_resistance"]))
        notes.append("Leakage of the film is in it only together with the charges of the device.")
    channel = channel_at(prepared["channel"], np.asarray(pair.temperature))
    return SubCircuits(
        switch_text(pair.down, "down", channel, gate, pair.supply),
        switch_text(pair.up, "up", channel, gate, pair.supply),
        tuple(notes),
    )


def _capabilities(v: Mapping[str, Array]) -> dict[str, Capability]:
    """What the file states; one-sided bounds are marked in the ledger under the same name."""
    units = {"endurance_cycles": "1", "process_temperature": "K"}
    return {name: Capability(v[name], unit, "", name) for name, unit in units.items() if name in v}


MODEL = DeviceModel(
    name="stress-gated",
    title="stress-gated switch",
    inputs=INPUTS,
    options=OPTIONS,
    prepare=_prepare,
    switch=_switch,
    netlist=_netlist,
    check=check,
    links=STRESS_GATED_LINKS,
    references=REFERENCES,
)
