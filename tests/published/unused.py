"""Check rows that no function of the package answers, each with the reason: the same law is not part of the program."""

from __future__ import annotations

__all__ = ["REASONS", "reason"]

_RELAY = "electrostatic relays have no device model of their own: they are stated by R, C and delays (model given)"
_TUNNEL = "the steep-swing model is stated by swing, ceiling and floor, not by tunnelling probabilities"
_FERRO = "no model of a ferroelectric gate"
_PHASE = "no model of a phase-change source"
_ALPHA = "currents come from the virtual source, tables or an ohmic law; no alpha-power law"
_MEMORY_OF_DRAWS = "the answer comes from draws alone; this analytic route is not taken"
_SETS = "ranges are moved one at a time or drawn; no intervals, probability boxes or belief functions"
_OWN = "no such quantity in the program"
_TEMPERATURE = "the temperature is stated by the study; no heating of its own"

#: beginning of a row's name after its list -> why nothing answers it; the longest that fits counts
REASONS = {
    "dev.R1-": _RELAY,
    "dev.R2-": _RELAY,
    "dev.R3-": _RELAY,
    "dev.R4-": _RELAY,
    "dev.R5-": _RELAY,
    "dev.R6-": _RELAY,
    "dev.T1-": _TUNNEL,
    "dev.T2-": _TUNNEL,
    "dev.T3-": _TUNNEL,
    "dev.T4-": "the mean swing is an input, not a result",
    "dev.N1-": _FERRO,
    "dev.N2-": _FERRO,
    "dev.N3-": _FERRO,
    "dev.N4-": _FERRO,
    "dev.H1-": _PHASE,
    "dev.H2-": _PHASE,
    "dev.M4-": _ALPHA,
    "dev.M6-": "current through the gate is stated or zero; no tunnelling law",
    "cir.SLOPE-SN": _ALPHA,
    "cir.REQ": "delay from the effective current, not from a mean resistance",
    "cir.I-AVG-P": "the row gives no oxide or velocity saturation to state a virtual source with",
    "cir.PSTAT-WH": "arithmetic of one chip; leakage is counted from the circuit's own switches",
    "cir.PSC": "short circuit is the charge through the opening switch while the input ramps, without a square law",
    "cir.MEP-": "a closed minimum; the program searches the supply (compared in: Minimum energy, exponential drive)",
    "cir.EDP-": _ALPHA,
    "cir.ED2-": _ALPHA,
    "cir.SENS-": _ALPHA,
    "cir.LKSW-": _ALPHA,
    "cir.PCAP": "power density is a requirement on the point, not a cap that sets the rate",
    "cir.AMDAHL": "parallel copies share the work evenly; no serial part",
    "cir.SEQ": "no clock skew; register and logic are summed as nets of one path",
    "cir.MAXN-": "no variation from switch to switch",
    "cir.CLARK-": "no variation from switch to switch",
    "cir.YIELD": "no variation from switch to switch",
    "cir.RTH-": _TEMPERATURE,
    "cir.THERM-": _TEMPERATURE,
    "cir.GUM-H1-nud": "no degrees of freedom: spreads are distributions",
    "cir.S1-9.3-GUF2": _MEMORY_OF_DRAWS,
    "cir.S1-9.3-valid": _MEMORY_OF_DRAWS,
    "cir.AMC-": "the number of draws is stated; no adaptive stop",
    "cir.LMDI": "steps are shared by orders of exchange, not by log means",
    "cir.EVPI-disc": "values of information are of continuous spreads; two-point values cannot be stated",
    "cir.INT-": _SETS,
    "cir.PBOX": _SETS,
    "cir.DS": _SETS,
    "cir.TORN": "bars are of the advantage of a whole study, never of a bare product",
}


def reason(row: str) -> str:
    """Return why no function answers a row, or an empty text."""
    fits = [start for start in REASONS if row.startswith(start)]
    return REASONS[max(fits, key=len)] if fits else ""
