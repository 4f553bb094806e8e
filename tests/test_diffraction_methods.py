"""The front door: methods by name for one hop, side by side, with the edges used and the doubts."""

import dataclasses
import math
from typing import get_args

import numpy as np
import pytest

from profiler.diffraction import (
    METHODS,
    cascaded_knife_edges,
    delta_bullington,
    diffract,
    diffract_over_k,
    double_edge,
    spherical_earth,
)
from profiler.errors import InputError
from profiler.models import DiffractionMethod
from profiler.units import MEAN_EARTH_RADIUS_M, SPEED_OF_LIGHT_M_S

K = 4 / 3
RADIUS = K * MEAN_EARTH_RADIUS_M
D = np.linspace(0, 30e3, 301)


def peak(at_m, height_m, width_m=400.0):
    """Return a narrow triangular hill on the distances D."""
    return np.maximum(height_m * (1 - np.abs(D - at_m) / width_m), 0)


THREE = np.maximum.reduce([peak(6e3, 150), peak(15e3, 190), peak(24e3, 140)])
HOP = (D, THREE, 100.0, 100.0, 6e9, K)


def test_the_methods_are_those_that_a_hop_can_name():
    assert tuple(METHODS) == get_args(DiffractionMethod)
    assert all(name == method.name for name, method in METHODS.items())


def test_more_edges_and_rounder_ones_cost_more():
    losses_db = {name: diffract(name, *HOP).loss_db for name in METHODS}
    assert losses_db["knife-edge"] < losses_db["double-edge"] < losses_db["cascaded-edges"]
    assert losses_db["knife-edge"] < losses_db["rounded-obstacle"]


def test_every_loss_is_that_of_the_batch_function():
    by_name = {name: diffract(name, *HOP, polarization="horizontal", sea_fraction=0.5) for name in METHODS}
    whole = delta_bullington(*HOP[:5], RADIUS, "horizontal", 0.5)
    assert by_name["delta-bullington"].loss_db == float(whole.total_db)
    assert by_name["bullington"].loss_db == float(whole.bullington_db)
    assert by_name["double-edge"].loss_db == float(double_edge(*HOP[:5], RADIUS).loss_db)
    assert by_name["cascaded-edges"].loss_db == float(cascaded_knife_edges(*HOP[:5], RADIUS).loss_db)
    over = (float(whole.effective_a_m), float(whole.effective_b_m))
    sphere = float(spherical_earth(30e3, *over, 6e9, RADIUS, "horizontal", 0.5))
    assert by_name["spherical-earth"].loss_db == pytest.approx(sphere)


def test_the_edges_say_where_and_how_high():
    loss = diffract("cascaded-edges", *HOP)
    assert [edge.distance_m for edge in loss.edges] == pytest.approx([6e3, 15e3, 24e3])
    assert [edge.height_m for edge in loss.edges] == pytest.approx([150, 190, 140])
    assert all(edge.loss_db > 0 for edge in loss.edges)


def test_a_construction_charges_only_its_own_edge():
    low, crest, high = diffract("delta-bullington", *HOP).edges
    assert (low.loss_db, high.loss_db) == (None, None)
    assert low.distance_m < crest.distance_m < high.distance_m
    assert crest.nu > max(low.nu, high.nu)


def test_the_result_is_plain_numbers():
    loss = diffract("delta-bullington", *HOP)
    assert type(loss.loss_db) is float
    assert all(type(value) in (float, type(None)) for edge in loss.edges for value in dataclasses.astuple(edge))


def test_bad_refraction_costs():
    losses = [diffract("delta-bullington", *HOP[:5], k).loss_db for k in (math.inf, K, 1.0, 0.5)]
    assert losses == sorted(losses)
    assert losses[-1] > losses[0] + 1


def test_the_cascade_keeps_the_edges_of_the_median_k_and_says_when_others_obstruct_more():
    # a peak near A leads at k = 4/3; the bulge lifts the low hill in the middle past it at k = 0.4
    ground = np.maximum(peak(2e3, 105), peak(15e3, 98))
    median = diffract("cascaded-edges", D, ground, 100.0, 100.0, 6e9, K)
    poor = diffract("cascaded-edges", D, ground, 100.0, 100.0, 6e9, 0.4)
    assert median.warnings == ()
    assert poor.edges[0].distance_m == median.edges[0].distance_m == pytest.approx(2e3)
    assert poor.loss_db > median.loss_db
    assert len(poor.warnings) == 1
    assert "at this k the ground 15.00 km from A obstructs more" in str(poor.warnings[0])


RANGES = [
    ("delta-bullington", 80e9, "frequency 80 GHz is outside 0.03 to 50 GHz"),
    ("bullington", 20e6, "frequency 0.02 GHz is outside 0.03 to 50 GHz"),
    ("spherical-earth", 9e6, "frequency 0.009 GHz is outside 0.01 GHz and above"),
    ("knife-edge", 20e6, "frequency 0.02 GHz is outside 0.03 GHz and above"),
    ("rounded-obstacle", 20e6, "frequency 0.02 GHz is outside 0.03 GHz and above"),
    ("double-edge", 20e6, "frequency 0.02 GHz is outside 0.03 GHz and above"),
    ("cascaded-edges", 20e6, "frequency 0.02 GHz is outside 0.03 GHz and above"),
]


@pytest.mark.parametrize(("method", "frequency_hz", "text"), RANGES)
def test_a_frequency_outside_the_stated_range_is_a_warning_that_names_it(method, frequency_hz, text):
    flat = np.zeros_like(D)
    assert diffract(method, D, flat, 100.0, 100.0, 6e9, K).warnings == ()
    warnings = diffract(method, D, flat, 100.0, 100.0, frequency_hz, K).warnings
    assert any(line.startswith(f"{method}: {text} (Rec. ITU-R P.") for line in warnings)


@pytest.mark.parametrize("method", ["delta-bullington", "bullington"])
@pytest.mark.parametrize(("length_m", "text"), [(200.0, "0.20 km"), (4e6, "4000 km")])
def test_a_distance_outside_the_stated_range_is_a_warning_that_names_it(method, length_m, text):
    (line,) = diffract(method, [0, length_m / 2, length_m], [0, 0, 0], 100.0, 100.0, 6e9, K).warnings
    assert str(line) == (
        f"{method}: distance {text} is outside 0.25 km to 3000 km "
        "(Rec. ITU-R P.1812, for the same model; P.526-15 states none)"
    )


def test_two_edges_warn_of_a_third():
    (line,) = diffract("double-edge", *HOP).warnings
    assert str(line) == "double-edge: a third edge, 24.00 km from A, is left out: cascaded-edges counts it"
    assert diffract("double-edge", D, peak(15e3, 190), 100.0, 100.0, 6e9, K).warnings == ()


def test_edges_that_count_in_part_are_warned_of_where_it_matters():
    ground = np.maximum(peak(15e3, 300, 100), peak(15.2e3, 300, 100))
    for method in ("double-edge", "cascaded-edges"):
        [line] = diffract(method, D, ground, 100.0, 100.0, 6e9, K).warnings
        assert str(line).startswith(
            f"{method}: the edge 15.00 km from A stands near the principal one and counts in part: "
        )
    assert diffract("cascaded-edges", D, peak(15e3, 190), 100.0, 100.0, 6e9, K).warnings == ()


def test_two_edges_say_so_when_the_greater_alone_loses_more_than_their_formula_gives():
    ground = np.maximum(peak(15e3, 120), peak(15.5e3, 118))
    loss = diffract("double-edge", D, ground, 100.0, 100.0, 6e9, math.inf)
    assert loss.loss_db == pytest.approx(diffract("knife-edge", D, ground, 100.0, 100.0, 6e9, math.inf).loss_db)
    (line,) = loss.warnings
    assert line.startswith("double-edge: Rec. ITU-R P.526-15 §4.3 gives ")
    assert line.endswith(" dB, less than the greater edge alone loses, which is taken instead")


HOLLOW = np.interp(D, [0, 14.2e3, 14.5e3, 15e3, 15.5e3, 15.8e3, 30e3], [0, 0, 120, 112, 120, 0, 0])


def test_a_top_narrower_than_the_cells_is_fitted_over_them_and_said():
    """One cell of 90 m that stands out of a slope: within it nobody knows the top. A round hill needs no such word."""
    cells = np.arange(0, 30001, 90.0)
    ground = np.maximum(140 - np.abs(cells - 15030) * 0.25, 0)
    loss = diffract("rounded-obstacle", cells, ground, 100.0, 100.0, 6e9, math.inf, cell_m=90.0)
    assert (loss.top.from_m, loss.top.to_m) == pytest.approx((15030 - 180, 15030 + 180), abs=0.1)
    # least squares over a wedge of slope s and half width w: y″ = −15·s/(8·w), by hand
    assert loss.top.radius_m == pytest.approx(8 * 180 / (15 * 0.25), rel=1e-3)
    assert [
        line for line in map(str, loss.warnings) if "narrower than the 360 m over which its radius is fitted" in line
    ]
    hill = np.maximum(150 - (cells - 15030) ** 2 / (2 * 20e3), 0)
    assert diffract("rounded-obstacle", cells, hill, 100.0, 100.0, 6e9, math.inf, cell_m=90.0).warnings == ()


def test_the_rounded_obstacle_shows_the_top_that_it_fits():
    hill = np.maximum(150 - (D - 15e3) ** 2 / (2 * 20e3), 0)
    top = diffract("rounded-obstacle", D, hill, 100.0, 100.0, 6e9, math.inf).top
    assert top.radius_m == pytest.approx(20e3, rel=1e-3)  # straight lines between points 100 m apart
    # what is no more than F1 below the apex: x²/(2·R) = F1 at mid-path
    half = math.sqrt(2 * 20e3 * math.sqrt(SPEED_OF_LIGHT_M_S / 6e9 * 7.5e3))
    assert (top.from_m, top.to_m) == pytest.approx((15e3 - half, 15e3 + half), abs=5)
    assert 0 < top.roundness < 1
    assert diffract("rounded-obstacle", D, HOLLOW, 100.0, 100.0, 6e9, math.inf).top.radius_m is None
    assert diffract("rounded-obstacle", D, 0 * D, 100.0, 100.0, 6e9, math.inf).top is None
    assert diffract("knife-edge", D, hill, 100.0, 100.0, 6e9, math.inf).top is None


def test_the_rounded_obstacle_warns_of_a_profile_that_is_not_one_round_top():
    several = diffract("rounded-obstacle", *HOP)
    assert any("more than one obstacle" in line for line in map(str, several.warnings))
    plain = diffract("rounded-obstacle", D, np.zeros_like(D), 1.0, 1.0, 100e6, 4.0)
    assert any("take spherical-earth or delta-bullington" in line for line in map(str, plain.warnings))


def test_the_rounded_obstacle_warns_of_a_flat_top_whose_corners_bend_the_ray():
    # little but the bulge of the earth rounds it: a radius of some 1000 km, over which 10 mrad take 10 km; 3 are there
    mesa = np.interp(D, [0, 13.4e3, 13.5e3, 16.5e3, 16.6e3, 30e3], [0, 0, 150, 150, 0, 0])
    (line,) = diffract("rounded-obstacle", D, mesa, 100.0, 100.0, 6e9, K).warnings
    assert "the top from 13.49 km to 16.51 km is too short for the radius that fits it" in str(line)
    hill = np.maximum(150 - (D - 15e3) ** 2 / (2 * 20e3), 0)
    assert diffract("rounded-obstacle", D, hill, 100.0, 100.0, 6e9, K).warnings == ()


def test_a_hollow_top_has_no_radius():
    (line,) = diffract("rounded-obstacle", D, HOLLOW, 100.0, 100.0, 6e9, math.inf).warnings
    assert line.endswith("is not convex, so no radius fits it: the loss is that of a knife edge")


def test_unknown_methods_and_k_are_named():
    with pytest.raises(InputError, match="diffraction method = 'epsilon': must be one of delta-bullington, bullington"):
        diffract("epsilon", *HOP)
    for k in (0.0, -1.0, math.nan):
        with pytest.raises(InputError, match=f"k = {k:g}: must be more than 0"):
            diffract("bullington", *HOP[:5], k)
    with pytest.raises(InputError, match="must be one profile"):
        diffract("bullington", D, np.stack([THREE, THREE]), 100.0, 100.0, 6e9, K)


@pytest.mark.parametrize("method", METHODS)
def test_losses_over_k_are_those_of_one_k_at_a_time(method):
    """Edges and doubts too, but for the last digits: a batch adds up in another order."""
    d = np.linspace(0, 30e3, 61)
    ground = 100 + 60 * np.exp(-(((d - 12e3) / 2e3) ** 2)) + 40 * np.exp(-(((d - 21e3) / 1e3) ** 2))
    hop = (d, ground, 150.0, 150.0, 6e9)
    ks = [0.6, 1.0, 4 / 3, 10.0]
    for together, alone in zip(diffract_over_k(method, *hop, ks), (diffract(method, *hop, k) for k in ks), strict=True):
        assert (together.k, together.method, together.warnings) == (alone.k, alone.method, alone.warnings)
        assert together.loss_db == pytest.approx(alone.loss_db, rel=1e-12, abs=1e-12)
        assert [edge.distance_m for edge in together.edges] == [edge.distance_m for edge in alone.edges]
        assert [edge.nu for edge in together.edges] == pytest.approx([edge.nu for edge in alone.edges], abs=1e-9)
