"""The draws of a study in its record: probabilities, shares, what to measure next (layer 8)."""

from __future__ import annotations

import dataclasses
from collections.abc import Collection, Mapping, Sequence
from typing import Any

import numpy as np

from benchmark.catalogue import QUANTITIES
from benchmark.decide.compare import Comparison
from benchmark.decide.draw_block import DrawTask, resolution
from benchmark.decide.moves import range_of
from benchmark.decide.next_measurement import NEGLIGIBLE, next_measurements, nothing_to_measure
from benchmark.decide.uncertainty import CONSTANT, Estimate, Told, Uncertainty, uncertainty, unseen
from benchmark.decide.variance_shares import variance_shares
from benchmark.draws.plan import plan_of
from benchmark.draws.values import drawn_keys, tied_with
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.search import supply_grid
from benchmark.evaluate.side import joints_by_owner, values_by_key
from benchmark.sets.study import Choice, DrawSettings, Study
from benchmark.sets.values import Value

__all__ = ["draw_rows"]

#: inputs whose total share of the variance is worked out: those whose total share of a few draws is the largest
MOST_TOTALS = 8
#: draws behind each total share, and behind the few that choose the inputs
TOTAL_DRAWS, CHOOSING_DRAWS = 128, 32
#: total share below which an input is not chosen
LEAST_TOTAL = 1.0e-3


def draw_rows(
    study: Study,
    frozen: Mapping[str, Choice],
    settings: DrawSettings,
    jobs: int,
    told: Told,
    bounds: Collection[str] = (),
) -> dict[str, Any] | None:
    """Draw the headline pair under the primary policy; None when no draws are asked for or nothing has a range.

    Parameters
    ----------
    study : Study
    frozen : mapping
        What each side chose at the best estimate; its frozen parts are kept in every draw.
    settings : DrawSettings
    jobs : int
        Processes; they change no digit.
    told : callable
        Told the share done.
    bounds : collection of str
        Keys of values stated as bounds on which the result rests: the probability is given at both of their ends.
    """
    pair = study.pair(study.headline)
    values = values_by_key(study, pair)
    if settings.number == 0 or not drawn_keys(values):
        return None
    task = DrawTask(study, pair, study.policy.primary, frozen, plan_of(settings.number, settings.seed))
    found = uncertainty(task, jobs, told)
    tied = _tied(task, found)
    ends = {key: end for key in sorted(bounds) if (end := _open_end(values[key])) is not None}
    opened = uncertainty(dataclasses.replace(task, put=ends), jobs) if ends else None
    return {
        "draws": found.draws,
        "blocks": found.blocks,
        "seed": found.seed,
        "word": _word(found, settings),
        "likely": settings.likely,
        "unlikely": settings.unlikely,
        "inputs": found.inputs,
        "judgement": sum(values[share.key].evidence in ("assumed", "invented") for share in found.shares),
        "reaches": vars(found.reaches),
        "above_one": vars(found.above_one),
        "bounds": [{"key": key, "stated": float(values[key].si[0]), "open_end": end} for key, end in ends.items()],
        "reaches_at_open_ends": None if opened is None else vars(opened.reaches),
        "without_candidate": found.without_candidate,
        "without_contender": found.without_contender,
        "unbounded": found.unbounded,
        "quantiles": [{"share": q, **vars(estimate)} for q, estimate in found.quantiles.items()],
        "distribution": [{"share": q, "advantage": x} for q, x in found.distribution.items()],
        "mean_log": vars(found.mean_log),
        "sd_log": vars(found.sd_log),
        "constant": found.constant,
        "constant_below": CONSTANT,
        "worth_of_all": vars(found.worth_of_all),
        "negligible": NEGLIGIBLE,
        "stop": nothing_to_measure(found),
        "shares": _share_rows(study, found, values, tied),
        "totals": _totals(task, found, tied),
        "strongest": [{"side": side, "share": share} for side, share in found.strongest.items()],
        "bands": _band_rows(study, frozen, found),
    }


def _open_end(value: Value) -> float | None:
    """The far end of a value stated as a bound [SI]; None when it is none."""
    span = range_of(value)
    if not value.bound or value.spread is not None or span is None:
        return None
    return span[0] if value.bound == "at-most" else span[1]


def _word(found: Uncertainty, settings: DrawSettings) -> str:
    """The word for the probability, with the thresholds of the study; an error that straddles one says so."""
    low, high = _two_errors(found.reaches, found.draws)
    if low >= settings.likely:
        return "likely reached"
    if high <= settings.unlikely:
        return "unlikely to be reached"
    if found.reaches.value >= settings.likely or found.reaches.value <= settings.unlikely:
        return "within the sampling error of a threshold: draw more"
    return "neither likely nor unlikely to be reached"


def _two_errors(estimate: Estimate, draws: int) -> tuple[float, float]:
    """About 95 %: twice the error; where all draws agree, what none of them showed."""
    reach = unseen(draws) if estimate.value in (0.0, 1.0) else 2.0 * estimate.error
    return estimate.value - reach, estimate.value + reach


def _tied(task: DrawTask, found: Uncertainty) -> dict[str, list[str]]:
    """Key -> the other drawn inputs that move with it, the one with the largest share first."""
    joints = joints_by_owner(task.study, task.pair)
    listed = [share.key for share in found.shares]
    others = sorted(key for keys in drawn_keys(values_by_key(task.study, task.pair)).values() for key in keys)
    listed += [key for key in others if key not in listed]  # drawn as samples with another
    groups = {key: tied_with(key, joints) for key in listed}
    return {key: [other for other in listed if other in group and other != key] for key, group in groups.items()}


def _share_rows(
    study: Study, found: Uncertainty, values: Mapping[str, Value], tied: Mapping[str, Sequence[str]]
) -> list[dict[str, Any]]:
    listed = next_measurements(found, study.required_advantage, study.measurements, values)
    measured = {item.key: (place, item) for place, item in enumerate(listed, start=1)}
    rows = []
    for share in found.shares:
        (place, item), value = measured[share.key], values[share.key]
        rows.append(
            {
                "key": share.key,
                "name": value.name,
                "unit": QUANTITIES[value.name].unit,
                "evidence": value.evidence,
                "shape": share.shape,
                "share": share.share.value,
                "share_error": share.share.error,
                "worth": item.worth,
                "worth_error": item.error,
                "worth_halved": item.worth_halved,
                "enough": item.enough,
                "cost": item.cost,
                "worth_reachable": item.worth_reachable,
                "worth_per_cost": item.worth_per_cost,
                "place": place,
                "moves_with": list(tied[share.key]),
            }
        )
    return rows


def _totals(task: DrawTask, found: Uncertainty, tied: Mapping[str, Sequence[str]]) -> list[dict[str, Any]]:
    """Total shares of the inputs that carry most, what moves together as one; empty when they cannot be told.

    An input that acts only through others has no first-order share: the total shares of a few draws choose, where that
    costs no more than the draws themselves; else the first-order shares do.
    """
    if found.constant:
        return []
    keys: list[str] = []
    for share in found.shares:
        if not set(tied[share.key]) & set(keys):
            keys.append(share.key)
    try:
        if 2 * found.draws >= CHOOSING_DRAWS * len(keys):  # an input moved alone is one side anew
            few = sorted(variance_shares(task, keys, CHOOSING_DRAWS), key=lambda item: -item.total)
            chosen = [item.key for item in few if item.total > LEAST_TOTAL][:MOST_TOTALS]
        else:
            clear = [share for share in found.shares if share.share.value > 2.0 * share.share.error]
            chosen = [share.key for share in clear if share.key in keys][:MOST_TOTALS]
        rows = variance_shares(task, chosen, TOTAL_DRAWS) if chosen else []
    except ValueError:  # too few of these draws have an advantage
        return []
    return [{**vars(item), "moves_with": list(tied[item.key])} for item in sorted(rows, key=lambda item: -item.total)]


def _band_rows(study: Study, frozen: Mapping[str, Choice], found: Uncertainty) -> list[dict[str, Any]]:
    """What 80 % of the draws hold of energy and time, at every supply of the coarse grid."""
    pair = study.pair(study.headline)
    comparison = Comparison(resolution(study), pair, Batch.best_estimate(), frozen=frozen)
    rows = []
    for side, run in {"candidate": comparison.candidate, **comparison.contenders}.items():
        grid = run.grid(frozen[comparison.key(run)])
        supplies = supply_grid(run.problem)[0]
        band = found.bands[side]
        for column, supply in enumerate(supplies):
            energy, time = band["energy"][column], band["time"][column]
            if np.isfinite(energy).all() and np.isfinite(time).all():
                rows.append(
                    {
                        "side": run.problem.side.id,
                        "role": run.problem.role,
                        "supply": float(supply),
                        "energy_low": float(grid.energy[0, column] * energy[0]),
                        "energy_high": float(grid.energy[0, column] * energy[1]),
                        "time_low": float(grid.time[0, column] * time[0]),
                        "time_high": float(grid.time[0, column] * time[1]),
                    }
                )
    return rows
