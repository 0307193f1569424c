"""Random but physical technologies for tests of whole comparisons, and small studies of two of them."""

from __future__ import annotations

import copy
from decimal import Decimal as D
from typing import Any

import numpy as np
from hypothesis import strategies as st

from tests import comparisons as cmp
from tests.comparisons import number, pressed, side, steep, study
from tests.studies import Inputs, v

#: what is exact to rounding
EXACT = 1e-9


def factor(low: float, high: float) -> st.SearchStrategy[float]:
    """A factor, even on a log scale."""
    return st.floats(np.log(low), np.log(high)).map(lambda x: float(f"{np.exp(x):.6g}"))


@st.composite
def plain(draw: Any, name: str, transit: bool = True) -> Any:
    """A switch stated directly."""
    on = draw(factor(1.0, 200.0))
    delay = draw(factor(1e-3, 1.0)) if transit else 0.0
    return cmp.given(
        name,
        on_resistance=on,
        off_resistance=on * 1e-3 * draw(factor(1e3, 1e9)),
        input_capacitance=draw(factor(0.02, 2.0)),
        switching_level=round(draw(st.floats(0.3, 0.8)), 3),
        closing_delay=delay,
        opening_delay=delay,
        footprint=draw(factor(0.01, 1.0)),
    )


@st.composite
def transistor(draw: Any, name: str) -> Any:
    """A transistor with swing, ceiling and floor."""
    return steep(
        name,
        subthreshold_swing=draw(factor(35.0, 90.0)),
        on_current=draw(factor(50.0, 500.0)),
        off_current=draw(factor(1e-3, 1.0)),
        gate_capacitance_total=draw(factor(0.3, 2.0)),
        drain_capacitance_share=round(draw(st.floats(0.0, 0.5)), 2),
    )


@st.composite
def column(draw: Any, name: str) -> Any:
    """A stress-gated switch."""
    return pressed(
        name,
        actuator_coefficient=draw(factor(200.0, 500.0)),
        resistance_slope=draw(factor(1.5, 2.5)),
        stack_thickness=draw(factor(40.0, 100.0)),
        input_capacitance=draw(factor(0.02, 0.2)),
        breakdown_field=20.0,
    )


RANGE = {"given": (0.25, 0.8), "steep-swing": (0.12, 0.9), "stress-gated": (0.08, 0.38), "virtual-source": (0.3, 1.1)}


def side_of(technology: Any, **more: Any) -> Any:
    """A side over the usual supplies of the model."""
    return side(technology["id"], *RANGE[technology["model"]], **more)


def two(first: Any, second: Any, **options: Any) -> Inputs:
    """Compare two technologies."""
    return study(side_of(first), [side_of(second)], [first, second], **{"points": 9, "refine": 1e-7} | options)


def switches(name: str) -> st.SearchStrategy[Any]:
    """Any of three models."""
    return st.one_of(plain(name), transistor(name), column(name))


POLICIES: dict[str, dict[str, Any]] = {
    "declared-point": {},
    "minimum-energy": {},
    "minimum-energy-delay": {"exponent": D("1.0")},
    "iso-delay": {"required_time": v(D("1.0"), "us")},
    "iso-energy": {"required_energy": v(D("1.0"), "pJ")},
}


def with_policy(inputs: Inputs, name: str) -> Inputs:
    """The same study under another policy; limits that any side meets."""
    inputs.study["policy"] = {"primary": name, **POLICIES[name]}
    if name == "iso-energy":
        inputs.study["policy"]["metric"] = "time-per-operation"
    return inputs


def published(inputs: Inputs) -> Inputs:
    """Say that every number is published."""
    for data in (inputs.study, *inputs.sets.values()):
        data["default"]["evidence"] = "published"
    inputs.study["demonstration"] = False
    return inputs


def scaled(technology: Any, **factors: float) -> Any:
    """The technology with some values multiplied."""
    item = copy.deepcopy(technology)
    for name, k in factors.items():
        table = item["value"][name]
        table["value"] = number(float(table["value"]) * k)
    return item


WIRED: dict[str, Any] = {"values": {"average_net_length": v(D("5.0"), "um")}}


def lines(resistance: float, capacitance: float, pin: float) -> tuple[str, str, str]:
    return repr(resistance), repr(capacitance), repr(pin)
