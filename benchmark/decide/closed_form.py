"""The closed-form delay beside the transient of the same switches, at the points a verdict rests on (layer 7)."""

from __future__ import annotations

import dataclasses
from typing import Any

import numpy as np

from benchmark.circuits.circuit import Circuit
from benchmark.circuits.operation import OperationMetrics, estimate
from benchmark.decide.compare import Comparison, Outcome, SideOutcome
from benchmark.errors import UsageError
from benchmark.evaluate.search import SideRun

__all__ = ["closed_form_differences", "delay_factor"]


def _metrics(run: SideRun, side: SideOutcome, circuit: Circuit, rule: str) -> OperationMetrics:
    """Estimate a circuit at a side's optimum, at the temperature that sets its delay."""
    problem = run.problem
    points = side.optimum.points
    kelvin = problem.study.temperatures[int(points.slowest_temperature[0, 0])]
    pair = problem.device.switch(
        problem.prepared,
        points.supply[:1, :, None],
        np.full((1, 1, 1), kelvin),
        {"threshold_shift": np.full((1, 1, 1), _shift(run, side))},
    )
    return estimate(circuit, pair, problem.wires, rule, size=points.size, size_as=problem.size_as, short_circuit=False)


def _circuit(run: SideRun, side: SideOutcome) -> Circuit:
    """Return the circuit at a side's optimum."""
    points = side.optimum.points
    return run.problem.circuit_at(points.supply[:1], points.size, _shift(run, side))


def _shift(run: SideRun, side: SideOutcome) -> float:
    """Return the threshold shift of the devices at a side's optimum."""
    points = side.optimum.points
    return float(np.ravel(run.problem.device_shift(points.threshold_shift, points.back_bias))[0])


def delay_factor(run: SideRun, side: SideOutcome) -> float:
    """Return the factor F of the delay rule at a side's optimum (mean of both edges of the first critical net)."""
    stage = _metrics(run, side, _circuit(run, side), run.problem.study.delay_rule).stages[0]
    return float(0.5 * (stage.falling.factor.ravel()[0] + stage.rising.factor.ravel()[0]))


def closed_form_differences(comparison: Comparison, outcome: Outcome) -> list[dict[str, Any]]:
    """Compare the delay rule with the transient for the candidate and the strongest contender.

    The gate that takes the largest part of the critical path is solved as a chain of alike stages (both edges, at the
    temperature that sets the delay). ``difference`` = closed over transient, minus 1. Nets that no gate drives on both
    edges have no such chain.
    """
    rows = []
    sides = [(outcome.candidate, comparison.candidate)]
    strongest = outcome.strongest_side
    if strongest is not None:
        sides.append((strongest, comparison.contenders[strongest.id]))
    rule = comparison.study.delay_rule
    for side, run in sides:
        if not side.found[0] or rule == "transient":
            continue
        circuit = _circuit(run, side)
        stages = [stage for stage in _metrics(run, side, circuit, rule).stages if stage.net.gated]
        share = [float(np.max(s.net.on_critical_path * s.delay)) for s in stages]
        stage = stages[int(np.argmax(share))]
        # the stage alone, with the wire length it has in the whole circuit
        net = dataclasses.replace(
            stage.net, wire_length=stage.wire_length, length_unit="m", count=1.0, on_critical_path=1.0
        )
        alone = dataclasses.replace(circuit, nets=(net,))
        closed = float(_metrics(run, side, alone, rule).path_delay.ravel()[0])
        row: dict[str, Any] = {
            "side": side.id,
            "net": net.name,
            "supply": float(side.supply[0]),
            "temperature": run.problem.study.temperatures[int(side.optimum.points.slowest_temperature[0, 0])],
            "rule": rule,
            "closed_delay": closed,
            "transient_delay": float("nan"),
            "difference": float("nan"),
            "note": "",
        }
        try:
            solved = float(_metrics(run, side, alone, "transient").path_delay.ravel()[0])
        except UsageError as error:
            row["note"] = str(error)
        else:
            row |= {"transient_delay": solved, "difference": closed / solved - 1.0}
        rows.append(row)
    return rows
