"""Neighbours that give a reading its uncertainty never lie across a jump, and nothing of a smooth curve is cut off."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from benchmark.physics.extraction.charge import charge_from_capacitance, scatter_of
from benchmark.physics.extraction.points import Points, Scale, crossing, jumps_in, nearby, read_at
from benchmark.physics.extraction.result import Accuracy, CannotExtract, combined
from benchmark.physics.extraction.swing import minimum_swing
from tests.near import near
from tests.unit.test_curve_requests import HEAD, columns, one

V = np.linspace(0.0, 0.6, 61)
RELAY_V = np.linspace(0.0, 0.6, 13)


def refused(read: Callable[[], object]) -> CannotExtract:
    with pytest.raises(CannotExtract) as caught:
        read()
    return caught.value


@pytest.mark.parametrize("at", [0.0, 0.1, 0.3, 0.35, 0.375, 0.6])
@pytest.mark.parametrize("scale", ["linear", "log"])
def test_the_uncertainty_of_a_flat_part_beside_a_jump_is_that_of_the_part(at: float, scale: Scale):
    closed = RELAY_V > 0.32
    relay = Points.of(RELAY_V, np.where(closed, 1.5e3, 9e5))
    read = read_at(relay, at, scale, Accuracy(setting=1e-3))
    assert read.value == near(1.5e3 if at > 0.32 else 9e5)
    assert read.uncertainty == 0.0
    # scatter of one per cent on the closed side alone: of its own size, whatever the side of the open contact holds
    noise = np.random.default_rng(3).normal(size=13)
    for opened in (9e5, 1e12):
        rough = Points.of(RELAY_V, np.where(closed, 1.5e3 * (1.0 + 0.01 * noise), opened))
        alone = Points.of(RELAY_V[closed], (1.5e3 * (1.0 + 0.01 * noise))[closed])
        if at > 0.32:
            assert read_at(rough, at, scale).uncertainty == read_at(alone, at, scale).uncertainty


def test_a_place_inside_a_jump_may_lie_on_either_side_of_it():
    relay = Points.of(RELAY_V, np.where(RELAY_V > 0.32, 1e-4, 1e-13))
    assert jumps_in(RELAY_V, np.log(relay.y), "log").tolist() == [6]
    inside = read_at(relay, 0.33, "linear")
    assert inside.uncertainty is not None
    assert inside.uncertainty > 0.2 * 1e-4
    crossed = crossing(relay, 1e-8, "log")
    assert 0.2 * 0.05 < combined(crossed.parts).size < 0.05


def test_a_side_of_a_jump_with_too_few_points_is_refused():
    relay = Points.of(RELAY_V, np.where(RELAY_V > 0.47, 1.5e3, 9e5))
    error = refused(lambda: read_at(relay, 0.6, "linear"))
    what = "the curve jumps, and the side of the jump that is read has too few points to tell their scatter"
    assert (error.what, error.found, tuple(error.at)) == (what, "3", (10, 11, 12))
    assert error.hint == "measure more points on that side"
    assert read_at(relay, 0.3, "linear").uncertainty == 0.0


@pytest.mark.parametrize("points", [9, 13, 25, 61])
@pytest.mark.parametrize("scale", ["linear", "log"])
def test_nothing_of_a_smooth_steep_curve_is_cut_off(points: int, scale: Scale):
    """Curves without a step: exponential (60 mV per decade), bent over, its mirror image, uneven steps."""
    x = np.linspace(0.0, 0.6, points)
    uneven = np.unique(np.concatenate([x[x < 0.2], [0.2, 0.45], x[x > 0.45]]))
    for v in (x, uneven):
        steep = 1e-12 * 10.0 ** (v / 0.06)
        for y in (steep, 1e-13 + 1e-4 * np.log1p(np.exp((v - 0.3) / 0.026)), 1.0 / steep):
            assert jumps_in(v, np.log(y) if scale == "log" else y, scale).size == 0


def test_scatter_and_single_spikes_are_no_jump():
    """Of 2000 rows of noise around a level and of 2000 around zero, nearly none may be cut in two."""
    noise = np.random.default_rng(5).normal(size=(2000, 13))
    assert sum(jumps_in(RELAY_V, 1.0 + 0.1 * row, "linear").size for row in noise) == 0
    assert sum(jumps_in(RELAY_V, row, "linear").size > 0 for row in noise) <= 10
    assert sum(jumps_in(RELAY_V, row, "log").size > 0 for row in noise) <= 10
    spike = np.where(np.arange(13) == 6, 50.0, 1.0)
    assert jumps_in(RELAY_V, spike, "linear").size == 0
    assert nearby(Points.of(RELAY_V, spike), 0.2, "linear").scatter > 5.0


def test_the_scatter_of_a_charge_and_of_a_smallest_swing_does_not_cross_a_jump():
    stepped = np.where(V < 0.305, 1e-15, 5e-15)
    assert scatter_of(V, stepped)[0] == 0.0
    assert scatter_of(V, stepped)[1] == near((58 - 3) / 2.305, rel=0.01)
    found = charge_from_capacitance(Points.of(V, stepped), 0.1, 0.5)
    assert found.value == near(1e-15 * 0.205 + 5e-15 * 0.195)
    assert next(part.size for part in found.parts if part.name == "scatter of the points") == 0.0
    few = refused(lambda: scatter_of(V[:5], np.array([1.0, 1.0, 9.0, 9.0, 9.0])))
    assert few.what == "the curve jumps so often that no four neighbouring points tell their scatter"
    # a slope that lies beside the jump has the scatter of its side, one across it that of both
    leaping = np.where(V > 0.425, 1e-3 * 10.0**V, 1e-12 * 10.0 ** (V / 0.1))
    above = minimum_swing(Points.of(V, leaping), 1e-11, 5e-10)
    assert above.uncertainty is not None
    assert above.uncertainty < 1e-9
    across = minimum_swing(Points.of(V, leaping), 2e-9, 3.5e-3, 3)
    assert across.span[0] < 0.425 < across.span[1]
    assert across.uncertainty is not None
    assert across.uncertainty > 1e-4


@pytest.mark.parametrize("at", [0.35, 0.6])
def test_the_resistance_of_a_relay_of_a_file_has_no_scatter_of_its_jump(at: float, tmp_path: Path):
    stated = columns(("V", "control_voltage", "axis", "V"), ("R", "path_resistance", "value", "kohm"))
    rows = ["V,R", *(f"{v:.2f},{1.5 if v > 0.32 else 900.0}" for v in RELAY_V)]
    asked = f'quantity = "resistance"\nname = "on_resistance"\nat = {{ value = {at}, unit = "V" }}\n'
    found = one(tmp_path, asked, columns=stated, rows=rows, head=HEAD)
    assert (found.value, found.uncertainty) == (1500.0, 0.0)
