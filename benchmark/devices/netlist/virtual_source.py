"""Virtual-source transistor as a sub-circuit: the equations of ``benchmark.physics.virtual_source`` (layer 4).

Access resistances are real resistors (nodes ``di``, ``si``). Helper nodes carry F_pre, y, F_f and Q/(C_inv n phi); the
current is a B-source between ``di`` and ``si``. Where F_pre and F_f enter a divisor they are held between 0 and 1: on
its way to a solution the simulator extrapolates them beyond. Source and drain exchange when the path voltage turns
negative: the control is the larger of the voltages to both ends, the path voltage enters by its magnitude and the
current by its sign.

Charges (``charged``): constant edges from the gate to source and drain, and the channel charge of
``benchmark.physics.drive.gate_charge`` at the outer voltages, split between source and drain by its two shares.

Body effect and punch-through are no inputs of the device model and are not written.
"""

from __future__ import annotations

from benchmark.devices.netlist.parts import Polarity, SwitchText, across, named, number, scalar, softplus
from benchmark.devices.record import Array
from benchmark.physics.virtual_source import Transistor

__all__ = ["transistor_text"]


def _share(node: str) -> str:
    """Return a helper node that lies between 0 and 1 in every solution, held there on the way to it."""
    return f"min(max(v({node}),0),1)"


class _Equations:
    """Constants of one transistor as text, and its equations for given control and path expressions."""

    def __init__(self, t: Transistor, polarity: Polarity) -> None:
        phi, alpha = scalar(t.thermal_voltage), scalar(t.fermi_width)
        self.polarity: Polarity = polarity
        self.phi, self.wide, self.delta = phi, alpha * phi, scalar(t.barrier_lowering)
        self.slope = scalar(t.slope_factor) * phi
        self.threshold, self.beta = scalar(t.threshold), scalar(t.saturation_exponent)
        self.v_sat = scalar(t.velocity) * scalar(t.length) / scalar(t.mobility)
        self.charge = scalar(t.inversion_capacitance) * self.slope  # C/m^2 per unit of softplus
        self.width, self.length, self.velocity = scalar(t.width), scalar(t.length), scalar(t.velocity)
        self.resistances = (scalar(t.drain_resistance) / self.width, scalar(t.source_resistance) / self.width)

    def _larger(self, drain: str, source: str) -> str:
        return f"max({across(self.polarity, 'g', source)},{across(self.polarity, 'g', drain)})"

    def helpers(self, drain: str, source: str, tag: str = "") -> list[str]:
        """Return the lines of F_pre, y, F_f and the charge with the internal nodes ``drain`` and ``source``."""
        path = f"abs(v({drain},{source}))"
        excess = f"{number(-self.threshold)}+{number(self.delta)}*{path}"
        ab = f"({number(2.0 * self.phi)}*(1-0.99*{_share(f'fpre{tag}')}))"
        return [
            f"Bfpre{tag} fpre{tag} 0 V=0.5*(1-tanh(({self._larger('d', 's')}+{excess})/{number(3.0 * self.wide)}))",
            f"By{tag} y{tag} 0 V={self._larger(drain, source)}+{excess}"
            f"+{number(0.5 + self.delta)}*{ab}*exp(-{path}/{ab})",
            f"Bf{tag} f{tag} 0 V=0.5*(1-tanh(v(y{tag})/{number(2.0 * self.wide)}+0.25))",
            f"Bx{tag} x{tag} 0 V=(v(y{tag})+{number(self.wide)}*{_share(f'f{tag}')})/{number(self.slope)}",
            f"Bn{tag} n{tag} 0 V={softplus(f'v(x{tag})')}",
        ]

    def current(self, drain: str, source: str) -> list[str]:
        """Return the lines of V_DSi/V_dsat and of the channel current."""
        v_dsat = f"({number(self.v_sat)}+{number(self.phi - self.v_sat)}*{_share('f')})"
        scale = number(self.width * self.velocity * self.charge)
        saturation = f"v(r)/(1+abs(v(r))^{number(self.beta)})^{number(1.0 / self.beta)}"
        return [
            f"Br r 0 V=v({drain},{source})/{v_dsat}",
            f"Bpath {drain} {source} I={{size}}*{scale}*v(n)*{saturation}",
        ]


def _conduction(e: _Equations) -> tuple[str, ...]:
    lines, inner = [], []
    for name, outer, resistance in zip(("drain", "source"), ("d", "s"), e.resistances, strict=True):
        inner.append(f"{outer}i" if resistance > 0.0 else outer)
        if resistance > 0.0:
            lines.append(f"R{name} {outer} {outer}i r={{{number(resistance)}/size}}")
    lines += e.helpers(*inner)
    lines += e.current(*inner)
    return named(lines, "access resistances; F_pre, y, F_f and charge at the virtual source; channel current")


def _charges(e: _Equations, inversion_capacitance: float, edge: float) -> tuple[str, ...]:
    """Return edges and channel charge between the gate and both ends.

    A charge is a voltage on a capacitor whose current is copied to the gate: q in units of C_inv n phi W L.
    """
    # V_dsat of the charge, sqrt(F_f (alpha phi)^2 + (Q/C_inv)^2), never below 0.1 alpha phi in a solution
    least = number(0.1 * e.wide)
    root = f"{_share('fq')}*{number(e.wide**2)}+({number(e.charge / inversion_capacitance)}*v(nq))^2"
    v_dsat = f"max(v(vq),{least})"
    beta = number(e.beta)
    saturation = f"abs(v(d,s))/(abs(v(d,s))^{beta}+{v_dsat}^{beta})^{number(1.0 / e.beta)}"
    x = f"(1-{_share('sq')})"
    below = f"(15*(1+{x})*(1+{x}))"
    near = f"v(nq)*(6+{x}*(12+{x}*(8+4*{x})))/{below}"  # of the end that acts as source
    far = f"v(nq)*(4+{x}*(8+{x}*(12+6*{x})))/{below}"
    forward = f"{across(e.polarity, 'd', 's')}>=0"
    whole = number(e.width * e.length * e.charge)
    lines = [
        *e.helpers("d", "s", "q"),
        f"Bvq vq 0 V=sqrt(max({root},{number((0.1 * e.wide) ** 2)}))",
        f"Bsq sq 0 V={saturation}",
        f"Bqs qs 0 V=({forward}) ? {near} : {far}",
        f"Bqd qd 0 V=({forward}) ? {far} : {near}",
    ]
    for end in "sd":
        gate = f"g {end}" if e.polarity == "down" else f"{end} g"
        lines += [f"Cq{end} q{end} i{end} {{{whole}*size}}", f"Vq{end} i{end} 0 0", f"Fq{end} {gate} Vq{end} 1"]
        if edge > 0.0:
            lines.append(f"Cedge{end} g {end} {{{number(edge * e.width)}*size}}")
    return named(lines, "channel charge at the outer voltages, split between source and drain; constant edges")


def transistor_text(t: Transistor, polarity: Polarity, edge: float | Array, terminal: float | Array) -> SwitchText:
    """Return one transistor as text.

    Parameters
    ----------
    t : Transistor
        At one design point (every field of size 1), as in ``benchmark.physics.virtual_source``.
    polarity : {"down", "up"}
        n sense or p sense.
    edge : array_like
        Overlap and fringe of one gate edge per width [F/m].
    terminal : array_like
        What a conducting terminal of the unit switch has beside its edge [F].

    Returns
    -------
    SwitchText
        Its current agrees with ``drain_current`` to 1e-6 away from zero path voltage.
    """
    equations = _Equations(t, polarity)
    driven = _conduction(equations)
    charges = _charges(equations, scalar(t.inversion_capacitance), scalar(edge))
    return SwitchText(driven, driven + charges, scalar(terminal))
