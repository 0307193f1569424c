"""Check rows of piezoelectric materials, the loaded column, its acoustics and the channel, bound to the package."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from scipy.optimize import minimize_scalar

from benchmark.constants import BOLTZMANN, ELEMENTARY_CHARGE, JULIAN_YEAR
from benchmark.constants import VACUUM_PERMITTIVITY as EPS0
from benchmark.devices import model
from benchmark.devices.links import link
from benchmark.physics import acoustics, force_balance, losses, piezo, pressure_resistance, resonator
from tests.published.rows import Binding

BINDINGS: list[Binding] = []


def _bind(row: str, exercises: str, obtain: Callable[[], object]) -> None:
    """``exercises``: 'module:function' names below benchmark.physics, separated by blanks."""
    names = tuple(f"benchmark.physics.{name}" for name in exercises.split())
    BINDINGS.append(Binding(f"dev.{row}", names, obtain))  # type: ignore[arg-type]


# --- P1, P2, P3, P6: ceramics (d33 [C/N], s33E [m2/N], eps33T/eps0, rho [kg/m3]) -----------------------------------

CERAMICS = {
    "PZT-5H": (593e-12, 20.7e-12, 3400.0, 7500.0),
    "PZT-5A": (374e-12, 18.8e-12, 1700.0, 7750.0),
    "PZT-4": (289e-12, 15.5e-12, 1300.0, 7500.0),
    "PZT-8": (225e-12, 13.5e-12, 1000.0, 7600.0),
    "BaTiO3": (190e-12, 9.5e-12, 1700.0, 5700.0),
}


def _k33(name: str) -> np.ndarray:
    d, s, eps, _ = CERAMICS[name]
    return piezo.coupling_factor(d, s, eps * EPS0)


def _gap(d: float, s: float, eps: float, published: float) -> float:
    """What the constants imply over the published k33, minus 1, as the link of the model has it."""
    names = ("actuator_coefficient", "actuator_compliance", "actuator_permittivity", "actuator_coupling_factor")
    values = {name: np.asarray(value) for name, value in zip(names, (d, s, eps, published), strict=True)}
    found = link.judged(model("stress-gated").links, values, {"mechanics": "force-balance"})
    return next(float(item.deviation) for item in found if item.link.place == "actuator_coupling_factor")


def _v_open(name: str) -> np.ndarray:
    _, s, _, rho = CERAMICS[name]
    return piezo.bar_wave_speed(rho, piezo.compliance_constant_displacement(s, _k33(name)))


def _v_short(name: str) -> np.ndarray:
    _, s, _, rho = CERAMICS[name]
    return piezo.bar_wave_speed(rho, s)


OPEN_SPEED = "piezo:bar_wave_speed piezo:compliance_constant_displacement piezo:coupling_factor"
for suffix, name in (("", "PZT-5H"), (".2", "PZT-5A"), (".3", "PZT-4"), (".5", "BaTiO3")):
    _bind(f"P1-k33{suffix}", "piezo:coupling_factor", lambda name=name: _k33(name))
for suffix, name in (("", "PZT-5H"), (".2", "PZT-5A"), (".3", "PZT-4"), (".4", "PZT-8"), (".5", "BaTiO3")):
    _bind(f"P1-k33-pub{suffix}", "piezo:coupling_factor", lambda name=name: _k33(name))
    _bind(f"P2-vD{suffix}", OPEN_SPEED, lambda name=name: _v_open(name))
for suffix, name in ((".4", "PZT-8"), (".5", "BaTiO3")):
    _bind(f"P2-vE{suffix}", "piezo:bar_wave_speed", lambda name=name: _v_short(name))

for suffix, k33, v_open in (
    ("", 0.7512, 3845.0),
    (".2", 0.7031, 3684.0),
    (".3", 0.6842, 4021.6),
    (".4", 0.6508, None),
    (".5", 0.5025, 4970.3),
):
    _bind(f"P3-fsfp{suffix}", "piezo:resonance_ratio", lambda k=k33: piezo.resonance_ratio(k))
    if v_open is not None:
        _bind(
            f"P3-N33{suffix}",
            "piezo:frequency_constant piezo:resonance_ratio",
            lambda k=k33, v=v_open: piezo.frequency_constant(k, v),
        )

for suffix, (d, s, eps, published) in (
    ("", (300e-12, 16e-12, 1250.0, 0.68)),
    (".2", (215e-12, 14e-12, 1000.0, 0.63)),
    (".3", (400e-12, 16e-12, 1750.0, 0.70)),
):
    BINDINGS.append(
        Binding(
            f"dev.P1-catalogue-gap{suffix}",
            ("benchmark.devices.links.link:judged",),
            lambda d=d, s=s, eps=eps, k=published: _gap(d, s, eps, k),
        )
    )

for row in ("P2-vD-pub", "P2-vD.6"):
    _bind(row, "piezo:plate_wave_speed", lambda: piezo.plate_wave_speed(7600.0, 15.9e10))
_bind("P6-epsS", "piezo:permittivity_length_clamped", lambda: piezo.permittivity_length_clamped(3400.0, 0.7512))

# --- P4: crystals in stress form (c [GPa], e [C/m2], eps/eps0 at constant strain) ------------------------------------


def _trigonal(c11: float, c12: float, c13: float, c14: float, c33: float, c44: float) -> np.ndarray:
    """Stiffness of a trigonal crystal (hexagonal for c14 = 0)."""
    c = np.zeros((6, 6))
    c[0, :4] = c11, c12, c13, c14
    c[1, :4] = c12, c11, c13, -c14
    c[2, :3] = c13, c13, c33
    c[3, [0, 1, 3]] = c14, -c14, c44
    c[4, [4, 5]] = c44, c14
    c[5, [4, 5]] = c14, 0.5 * (c11 - c12)
    return c * 1e9


def _polar(e15: float, e22: float, e31: float, e33: float) -> np.ndarray:
    """Stress coefficients of class 3m (6mm for e22 = 0)."""
    e = np.zeros((3, 6))
    e[0, [4, 5]] = e15, -e22
    e[1, [0, 1, 3]] = -e22, e22, e15
    e[2, :3] = e31, e31, e33
    return e


def _class_32(e11: float, e14: float) -> np.ndarray:
    e = np.zeros((3, 6))
    e[0, [0, 1, 3]] = e11, -e11, e14
    e[1, [4, 5]] = -e14, -e11
    return e


CRYSTALS = {
    "LiNbO3": (_trigonal(203, 53, 75, 9, 245, 60), _polar(3.7, 2.5, 0.2, 1.3), (44.0, 29.0)),
    "ZnO": (_trigonal(209.7, 121.1, 105.1, 0, 210.9, 42.47), _polar(-0.48, 0, -0.573, 1.32), (8.55, 10.2)),
    "AlN": (_trigonal(410, 149, 99, 0, 389, 125), _polar(-0.48, 0, -0.58, 1.55), (9.0, 9.0)),
    "quartz": (_trigonal(86.74, 6.99, 11.91, -17.91, 107.2, 57.94), _class_32(0.171, -0.0436), (4.5, 4.6)),
}


def _strain(name: str, part: int, i: int, j: int) -> float:
    """Element (i, j) of sE (part 0), d (1) or epsT (2)."""
    c, e, (eps11, eps33) = CRYSTALS[name]
    return piezo.strain_form(c, e, np.diag([eps11, eps11, eps33]) * EPS0)[part][i, j]


def _crystal_coupling(name: str, axis: int) -> np.ndarray:
    return piezo.coupling_factor(
        _strain(name, 1, axis, axis), _strain(name, 0, axis, axis), _strain(name, 2, axis, axis)
    )


def _stiffened(name: str) -> np.ndarray:
    c, e, (_, eps33) = CRYSTALS[name]
    return piezo.plate_stiffened_modulus(c[2, 2], e[2, 2], eps33 * EPS0)


def _kt(name: str) -> np.ndarray:
    _, e, (_, eps33) = CRYSTALS[name]
    return piezo.thickness_coupling(e[2, 2], _stiffened(name), eps33 * EPS0)


FORM = "piezo:strain_form"
COUPLED = "piezo:strain_form piezo:coupling_factor"
_bind("P4-invert", FORM, lambda: _strain("LiNbO3", 1, 2, 2))
_bind("P4-invert.2", FORM, lambda: _strain("LiNbO3", 0, 2, 2))
_bind("P4-invert.3", FORM, lambda: _strain("LiNbO3", 2, 2, 2) / EPS0)
_bind("P4-invert.4", COUPLED, lambda: _crystal_coupling("LiNbO3", 2))
_bind("P4-pub", FORM, lambda: _strain("LiNbO3", 1, 2, 2))
_bind("P4-invert.5", FORM, lambda: _strain("ZnO", 1, 2, 2))
_bind("P4-invert.6", FORM, lambda: _strain("ZnO", 0, 2, 2))
_bind("P4-invert.7", FORM, lambda: _strain("ZnO", 2, 2, 2) / EPS0)
_bind("P4-invert.8", COUPLED, lambda: _crystal_coupling("ZnO", 2))
_bind("P4-pub.2", FORM, lambda: _strain("ZnO", 1, 2, 2))
_bind("P4-invert.9", FORM, lambda: _strain("AlN", 1, 2, 2))
_bind("P4-pub.3", FORM, lambda: _strain("AlN", 1, 2, 2))
_bind("P4-invert.13", FORM, lambda: abs(_strain("quartz", 1, 0, 0)))
_bind("P4-pub.4", FORM, lambda: abs(_strain("quartz", 1, 0, 0)))
_bind("P4-invert.14", COUPLED, lambda: _crystal_coupling("quartz", 0))
_bind("P4-kt", "piezo:thickness_coupling piezo:plate_stiffened_modulus", lambda: _kt("LiNbO3"))
_bind("P4-kt.3", "piezo:thickness_coupling piezo:plate_stiffened_modulus", lambda: _kt("AlN"))
STIFF_PLATE = "piezo:plate_stiffened_modulus piezo:plate_wave_speed"
_bind("P4-vLD.2", STIFF_PLATE, lambda: piezo.plate_wave_speed(5680.0, _stiffened("ZnO")))
_bind("P4-vLD.3", STIFF_PLATE, lambda: piezo.plate_wave_speed(3300.0, _stiffened("AlN")))

# --- P5: passive layers ----------------------------------------------------------------------------------------------

_bind("P5-v", "piezo:plate_wave_speed", lambda: piezo.plate_wave_speed(2329.0, 165.7e9))
_bind("P5-v.2", "piezo:cubic_axis_modulus", lambda: piezo.cubic_axis_modulus(165.7e9, 63.9e9))
_bind(
    "P5-v.3",
    "piezo:plate_wave_speed piezo:constrained_modulus",
    lambda: piezo.plate_wave_speed(3100.0, piezo.constrained_modulus(250e9, 0.25)),
)

# --- S1, S6: the illustrative cell -----------------------------------------------------------------------------------

D33, S33E, EPS33T, RHO = 593e-12, 20.7e-12, 3400.0 * EPS0, 7500.0
L_A, A_A, L_C, A_C, Y_C, C_F, C_X, V = 100e-9, (60e-9) ** 2, 5e-9, (20e-9) ** 2, 100e9, 2e-3, 1e-3, 0.5


def _column() -> np.ndarray:
    return force_balance.column_compliance(S33E, L_A, A_A)


def _channel() -> np.ndarray:
    return force_balance.post_compliance(Y_C, L_C, A_C)


def _total() -> np.ndarray:
    return _column() + _channel() + C_F + C_X


def _force() -> np.ndarray:
    return force_balance.spring_force(1, D33, V, 0.0, _total())


def _kappa() -> np.ndarray:
    return force_balance.blocking_ratio(_column(), _total())


def _free() -> np.ndarray:
    return force_balance.free_capacitance(1, EPS33T, A_A, L_A)


def _cell_coupling() -> np.ndarray:
    return piezo.coupling_factor(D33, S33E, EPS33T)


def _c_in() -> np.ndarray:
    return force_balance.input_capacitance(_free(), _cell_coupling(), _kappa())


def _energy_ratio() -> float:
    """Internal energy of column (by T and E) and of everything else, over C_in V^2/2."""
    force = _force()
    column = 0.5 * _free() * V**2 - D33 * V * force + force_balance.elastic_energy(force, _column())
    rest = force_balance.elastic_energy(force, _total() - _column())
    return float((column + rest) / (0.5 * _c_in() * V**2))


LOOP = "force_balance:spring_force force_balance:column_compliance force_balance:post_compliance"
CHARGED = (
    "force_balance:input_capacitance force_balance:free_capacitance force_balance:blocking_ratio piezo:coupling_factor"
)
_bind("S1-F", LOOP, _force)
_bind("S1-pc", LOOP, lambda: _force() / A_C)
_bind("S1-pa", LOOP, lambda: _force() / A_A)
_bind("S1-kappa", "force_balance:blocking_ratio", _kappa)
_bind("S1-CT", "force_balance:free_capacitance", _free)
_bind("S1-Cin", CHARGED, _c_in)
_bind(
    "S1-C0",
    "force_balance:length_blocked_capacitance",
    lambda: force_balance.length_blocked_capacitance(_free(), _cell_coupling()),
)
_bind("S1-Q", "force_balance:terminal_charge", lambda: force_balance.terminal_charge(_free(), V, 1, D33, _force()))
_bind(
    "S1-dpdV",
    "force_balance:pressure_per_volt",
    lambda: force_balance.pressure_per_volt(1, D33, _total(), A_C),
)
_bind("S1-Ecycle", CHARGED, lambda: _c_in() * V**2)
_bind(
    "S1-Uload",
    "force_balance:elastic_energy",
    lambda: force_balance.elastic_energy(_force(), _total() - _column()),
)
_bind("S1-Uchan", "force_balance:elastic_energy", lambda: force_balance.elastic_energy(_force(), _channel()))
_bind("S1-lam", "force_balance:elastic_share", lambda: force_balance.elastic_share(_cell_coupling(), _kappa()))
_bind("S1-balance", f"force_balance:elastic_energy {CHARGED} {LOOP}", _energy_ratio)
_bind(
    "S1b-blocked.2",
    "force_balance:pressure_bound",
    lambda: force_balance.pressure_bound(D33, S33E, 5e6, 1.0 / 9.0),
)
_bind(
    "S1c-Vneed",
    "force_balance:supply_for_decades",
    lambda: force_balance.supply_for_decades(4.0, 1.848e-9, 4.00676e8),
)


def _branch() -> tuple[np.ndarray, ...]:
    mass = acoustics.lumped_mass(RHO * A_A * L_A)
    return tuple(resonator.motional_branch(1, D33, _column(), _free(), _cell_coupling(), _kappa(), mass))


def _series() -> np.ndarray:
    _, _, c_m, l_m = _branch()
    return resonator.series_resonance(l_m, c_m)


BRANCH = "resonator:motional_branch"
_bind("S6-BVD-eta", BRANCH, lambda: _branch()[0])
_bind("S6-BVD-Cm", BRANCH, lambda: _branch()[2])
_bind("S6-BVD-Lm", f"{BRANCH} acoustics:lumped_mass", lambda: _branch()[3])
_bind("S6-BVD-fs", f"{BRANCH} acoustics:lumped_mass resonator:series_resonance", _series)
_bind(
    "S6-BVD-fp",
    f"{BRANCH} resonator:parallel_resonance",
    lambda: resonator.parallel_resonance(_series(), _branch()[2], _branch()[1]),
)
_bind("S6-identity", f"{BRANCH} {CHARGED}", lambda: (_branch()[1] + _branch()[2]) / _c_in())

# --- S2: largest elastic share ---------------------------------------------------------------------------------------

K_CHECK = 0.7512
_bind(
    "S2-lammax",
    "force_balance:elastic_share_largest",
    lambda: force_balance.elastic_share_largest(K_CHECK)[0],
)
_bind("S2-kopt", "force_balance:elastic_share_largest", lambda: force_balance.elastic_share_largest(K_CHECK)[1])
_bind(
    "S2-lammax-num",
    "force_balance:elastic_share",
    lambda: (
        -minimize_scalar(
            lambda x: -float(force_balance.elastic_share(K_CHECK, x)), bounds=(0.0, 1.0), method="bounded"
        ).fun
    ),
)

# --- S3, S4, S5, S7: base, waves, ringing ----------------------------------------------------------------------------

_bind(
    "S3-punch",
    "force_balance:flat_punch_compliance",
    lambda: force_balance.flat_punch_compliance(60e9, 0.31, 10e-9),
)
_bind("S3-lysmer-k", "acoustics:footing_stiffness", lambda: acoustics.footing_stiffness(66e9, 0.22, 30e-9))
_bind("S3-lysmer-c", "acoustics:footing_damping", lambda: acoustics.footing_damping(66e9, 0.22, 2329.0, 30e-9))
_bind("S4-transit", "acoustics:transit_time", lambda: acoustics.transit_time(L_A, _v_open("PZT-5H")))
_bind("S4-half", "acoustics:half_wave_frequency", lambda: acoustics.half_wave_frequency(L_A, _v_open("PZT-5H")))
for suffix, ratios in ((".2", (1.0, 0.0)), (".3", (10.0, 0.0)), (".4", (0.0, 0.5))):
    _bind(f"S4-barmode{suffix}", "acoustics:loaded_bar_root", lambda r=ratios: acoustics.loaded_bar_root(*r))


def _bar(frequency: float) -> np.ndarray:
    c_0 = force_balance.length_blocked_capacitance(_free(), _cell_coupling())
    return resonator.bar_impedance(frequency, c_0, _cell_coupling(), L_A, _v_open("PZT-5H"))


_bind("S5-Zbar", "resonator:bar_impedance", lambda: np.abs(_bar(5e9)))
_bind(
    "S5-LF",
    "resonator:bar_impedance",
    lambda: 1.0 / (2.0 * np.pi * 1e6 * np.abs(_bar(1e6))) / _free(),
)
_bind("S7-ring", "acoustics:quality_from_reflection", lambda: acoustics.quality_from_reflection(0.9))
for suffix, r in (("", 0.9), (".2", 0.5), (".3", 0.2)):
    _bind(f"S7-overshoot{suffix}", "acoustics:step_peak", lambda r=r: acoustics.step_peak(r))
_bind("S7-r", "acoustics:reflection", lambda: acoustics.reflection(7500.0 * 3851.0, 2329.0 * 8435.0))
_bind(
    "S7-RCdamp",
    "acoustics:residual_after_exponential",
    lambda: acoustics.residual_after_exponential(1.0, 1.0),
)
_bind("S7-Qmax", "acoustics:quality_limit_undershoot", lambda: acoustics.quality_limit_undershoot(0.63))

# --- S8 to S11: loss, channel, cycles --------------------------------------------------------------------------------

_bind(
    "S8-tand",
    "losses:dielectric_loss_unipolar",
    lambda: losses.dielectric_loss_unipolar(1e-15, 1.0, 0.02),
)


def _soft(pressure: float) -> np.ndarray:
    saturation = pressure_resistance.floor_pressure(1e9, 1e4, 0.2e9, 2.5e-9)
    return pressure_resistance.log_slope_resistance(pressure, 1e9, 1e4, 0.2e9, saturation, 0.05e9)


for suffix, pressure in (("", 0.0), (".3", 1e9), (".4", 2e9), (".5", 2.2e9)):
    _bind(
        f"S9-Rsat{suffix}",
        "pressure_resistance:log_slope_resistance pressure_resistance:floor_pressure",
        lambda p=pressure: _soft(p),
    )


def _activated(pressure: float, temperature: float) -> np.ndarray:
    energy = pressure_resistance.activation_energy(
        pressure, 0.45 * ELEMENTARY_CHARGE, 0.110e-9 * ELEMENTARY_CHARGE, 0.01 * ELEMENTARY_CHARGE
    )
    return pressure_resistance.activated_resistance(energy, temperature, 1e3, 5e3)


for suffix, state in (("", (0.0, 300.0)), (".2", (2e9, 300.0)), (".3", (2e9, 358.0))):
    _bind(
        f"S10-Ract{suffix}",
        "pressure_resistance:activated_resistance pressure_resistance:activation_energy",
        lambda s=state: _activated(*s),
    )
_bind(
    "S10-pub",
    "pressure_resistance:activation_energy_fall",
    lambda: pressure_resistance.activation_energy_fall(BOLTZMANN * 33.0, 70e8) / ELEMENTARY_CHARGE * 1e3 * 1e9,
)
_bind("S11-cycles", "losses:cycles_demanded", lambda: losses.cycles_demanded(1e9, 0.1, 10.0 * JULIAN_YEAR))
