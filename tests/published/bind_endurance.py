"""Switching cycles demanded of a net."""

from __future__ import annotations

from benchmark.constants import JULIAN_YEAR
from benchmark.physics import losses
from tests.published.rows import Binding

BINDINGS = [
    Binding(
        f"cir.ENDUR-{frequency}-{activity}",
        ("benchmark.physics.losses:cycles_demanded",),
        lambda f=frequency, a=activity: float(losses.cycles_demanded(float(f), float(a), 10.0 * JULIAN_YEAR)),
    )
    for frequency, activity in (("1e+09", "0.1"), ("5e+09", "0.2"), ("1e+06", "0.01"))
]
