"""What a record says more when sides have circuits of their own: which, and the result in the common one (layer 8)."""

from __future__ import annotations

from typing import Any

from benchmark.decide.compare import Comparison
from benchmark.evaluate.batch import Batch
from benchmark.record.results import outcome_row
from benchmark.sets.study import Side, Study

__all__ = ["circuit_assumptions", "same_netlist_rows", "side_circuit", "topology_convention"]

OWN_BEST = "own-best"


def same_netlist_rows(study: Study) -> list[dict[str, Any]]:
    """Return the primary policy with the common circuit on every side, as one more row of the policies.

    It carries no verdict. Nothing for studies in which all sides share a circuit anyway.
    """
    if study.topology != OWN_BEST:
        return []
    common = study.same_netlist
    outcome = Comparison(common, common.pair(common.headline), Batch.best_estimate()).outcome(common.policy.primary)
    row = outcome_row(outcome, diagnostic=True)
    return [row | {"policy": f"{outcome.policy}, same netlist", "topology": "same-netlist", "circuit": study.circuit}]


def side_circuit(study: Study, side: Side) -> dict[str, str]:
    """Return the circuit of a side, when sides have their own."""
    return {"circuit": study.circuit_of(side)[0]} if study.topology == OWN_BEST else {}


def circuit_assumptions(comparison: Comparison) -> list[str]:
    """Return what the circuit assumes; with circuits of their own, each sentence once, behind its circuit's name."""
    study = comparison.study
    if study.topology != OWN_BEST:
        return list(comparison.candidate.problem.circuit.assumptions)
    circuits = [run.problem.circuit for run in (comparison.candidate, *comparison.contenders.values())]
    return list(dict.fromkeys(f"{circuit.name}: {text}" for circuit in circuits for text in circuit.assumptions))


def topology_convention(study: Study) -> list[dict[str, str]]:
    """Return the convention on topologies, when sides have their own."""
    if study.topology != OWN_BEST:
        return []
    listed = ", ".join(f"{side.id}: {study.circuit_of(side)[0]}" for side in study.sides)
    text = (
        f"each side in a circuit of its own choice of the same function ({listed}); the same policy with "
        f"{study.circuit} on every side is shown beside it and carries no verdict"
    )
    return [{"name": "topology", "text": text}]
