"""The clearing region on made-up profiles: properties that a wrong sign or a lost point would break, and dead ends."""

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from profiler.errors import InputError, MissingGroundError
from profiler.geometry import ROUNDING_M, check_rule
from profiler.heights import (
    clearing_region,
    frontier_stretches,
    least_a_for,
    least_b_for,
    least_equal,
    least_ray,
    surplus,
)
from profiler.models import Rule

FREQUENCY_HZ = 7.5e9
heights = st.floats(-50, 400, allow_nan=False)
rules = st.builds(
    Rule, k=st.floats(0.4, 5), fresnel_fraction=st.floats(0, 1.2), margin_m=st.floats(-5, 20, allow_nan=False)
)


@st.composite
def profiles(draw):
    ground = np.array(draw(st.lists(heights, min_size=3, max_size=40)))
    cover = np.array(draw(st.lists(st.floats(0, 30), min_size=ground.size, max_size=ground.size)))
    steps = np.array(draw(st.lists(st.floats(10, 2000), min_size=ground.size - 1, max_size=ground.size - 1)))
    return np.concatenate(([0.0], np.cumsum(steps))), ground, ground + cover


def region_of(profile, some_rules, doubt_m=0.0):
    distance, ground, surface = profile
    return clearing_region(
        distance, least_ray(distance, surface + doubt_m, FREQUENCY_HZ, some_rules), ground[0], ground[-1]
    )


@given(profiles(), st.lists(rules, min_size=1, max_size=4), st.floats(0, 500), st.floats(0, 500))
def test_surplus_is_the_forward_models(profile, some_rules, a, b):
    distance, ground, surface = profile
    forward = min(
        check_rule(
            distance,
            surface,
            ground[0] + a,
            ground[-1] + b,
            FREQUENCY_HZ,
            rule,
        ).surplus_m.min()
        for rule in some_rules
    )
    # the region also keeps the antennas out of the ground, which a rule with a negative margin does not
    assert float(surplus(region_of(profile, some_rules), a, b)) == pytest.approx(min(forward, a, b), abs=1e-8)


@given(profiles(), st.lists(rules, min_size=1, max_size=3))
def test_vertices_lie_on_both_their_stretches_and_go_down(profile, some_rules):
    region = region_of(profile, some_rules)
    a, b = region.vertices_m.T
    assert region.governing_point.size == a.size + 1
    assert np.all(np.diff(a) >= -1e-6)
    assert np.all(np.diff(b) <= 1e-6)
    share = region.distance_m[region.governing_point] / region.distance_m[-1]
    for points in (slice(None, -1), slice(1, None)):
        at_point = (1 - share[points]) * (region.ground_a_m + a) + share[points] * (region.ground_b_m + b)
        # vertices can be a hundred kilometres high when two points stand close together: relative rounding
        np.testing.assert_allclose(at_point, region.least_ray_m[region.governing_point[points]], rtol=1e-9, atol=1e-6)


@given(profiles(), st.lists(rules, min_size=1, max_size=3), rules)
def test_adding_a_rule_never_lowers_a_height(profile, some_rules, another):
    few, more = region_of(profile, some_rules), region_of(profile, [*some_rules, another])
    assert least_equal(more).height_m >= least_equal(few).height_m
    a = np.linspace(0, 500, 26)
    assert np.all(least_b_for(more, a) >= least_b_for(few, a) - 1e-9)


@given(profiles(), st.lists(rules, min_size=1, max_size=3), st.lists(st.floats(0, 15), min_size=40, max_size=40))
def test_more_doubt_never_lowers_a_height(profile, some_rules, doubts):
    doubt = np.array(doubts[: profile[0].size])
    sure, surer = (region_of(profile, some_rules, share * doubt) for share in (0.5, 1.0))
    assert least_equal(surer).height_m >= least_equal(sure).height_m
    assert np.all(least_a_for(surer, np.linspace(0, 500, 26)) >= least_a_for(sure, np.linspace(0, 500, 26)) - 1e-9)


@given(profiles(), st.lists(rules, min_size=1, max_size=3))
def test_swapping_the_ends_swaps_the_heights(profile, some_rules):
    distance, ground, surface = profile
    here = region_of(profile, some_rules)
    there = region_of((distance[-1] - distance[::-1], ground[::-1], surface[::-1]), some_rules)
    assert least_equal(there).height_m == pytest.approx(least_equal(here).height_m, abs=1e-7)
    np.testing.assert_allclose(least_a_for(there, [50.0, 150.0]), least_b_for(here, [50.0, 150.0]), atol=1e-6)


@given(profiles(), st.lists(rules, min_size=1, max_size=3), st.floats(0, 300))
def test_least_heights_pass_and_a_centimetre_less_fails(profile, some_rules, a):
    region = region_of(profile, some_rules)
    equal = least_equal(region).height_m
    assert surplus(region, equal, equal) == pytest.approx(0, abs=1e-9)
    assert surplus(region, equal - 0.01, equal - 0.01) == pytest.approx(-0.01, abs=1e-9)
    b = float(least_b_for(region, a))
    if math.isfinite(b):
        assert surplus(region, a, b) >= -ROUNDING_M
        assert surplus(region, a, b - 0.01) < 0
    else:
        assert surplus(region, a, 1e7) < 0


def test_flat_earth_by_hand():
    """40 km over smooth ground at k = 4/3 and 1.0 F1, 6 GHz: 23.54 m of bulge and 22.35 m of F1 at the middle.

    Both from the field's formulas: 20·20/(12.742·4/3) = 23.544 m; 17.3·sqrt(20·20/(6·40)) = 22.33 m (17.31: 22.35).
    """
    x = np.linspace(0, 40e3, 401)
    region = clearing_region(x, least_ray(x, 0 * x, 6e9, [Rule(4 / 3, 1.0)]), 0.0, 0.0)
    assert least_equal(region).height_m == pytest.approx(45.89, abs=0.03)
    assert least_equal(region).distance_m == 20e3


def test_stretches_follow_obstacles_and_rules():
    """Two crests; the nearer one is governed by the fixed margin, the middle one by the Fresnel zone."""
    x = np.array([0.0, 1e3, 20e3, 40e3])
    ray = least_ray(x, [0.0, 80.0, 30.0, 0.0], 6e9, [Rule(4 / 3, 1.0), Rule(math.inf, 0.0, 15.0)])
    region = clearing_region(x, ray, 0.0, 0.0)
    rows = [(stretch.distance_m, stretch.rule) for stretch in frontier_stretches(region, join_m=0)]
    assert rows == [(0.0, 1), (1e3, 1), (20e3, 0), (40e3, 1)]
    assert math.isinf(frontier_stretches(region, join_m=0)[0].corners_m[0, 1])
    assert math.isinf(frontier_stretches(region, join_m=0)[-1].corners_m[-1, 0])


def test_no_stretch_under_limits_that_no_pair_meets():
    region = clearing_region([0, 5e3, 10e3], [0, 60, 0], 0, 0)
    assert frontier_stretches(region, highest_a_m=50, highest_b_m=50, join_m=0) == ()
    [only] = frontier_stretches(region, highest_a_m=60, highest_b_m=60, join_m=0)
    assert only.corners_m.tolist() == [[60, 60], [60, 60]]


def test_points_beside_the_path_raise_the_region():
    x, ray = np.array([0, 5e3, 10e3]), np.array([[0.0, 60.0, 0.0]])
    beside = np.maximum(ray, [0, 75, 0])
    assert least_equal(clearing_region(x, beside, 0, 0)).height_m == 75


def test_the_bare_ground_of_a_site_is_no_rule():
    x = np.array([0.0, 5e3, 10e3])
    region = clearing_region(x, least_ray(x, [10.0, 0, 0], 6e9, [Rule(4 / 3, 0.0, -4.0)]), 10.0, 0.0)
    assert region.lowest_a_m == 0
    assert region.rule[region.governing_point[0]] == -1


@pytest.mark.parametrize("length", [4, 50, 700])
def test_hull_of_awkward_shapes(length):
    """Two arches meeting in a valley keep the quick filter busy; straight lines have no corner but their ends."""
    t = np.linspace(-1, 1, length)
    y = 300 * np.concatenate((-(t**2), -(t[1:] ** 2)))
    x = np.linspace(0, 10e3, y.size)
    region = clearing_region(x, y, y[0], y[-1])
    hull = np.interp(x, x[region.governing_point], y[region.governing_point])
    assert np.all(hull >= y - 1e-9)
    assert np.all(np.diff(np.diff(y[region.governing_point]) / np.diff(x[region.governing_point])) < 0)
    assert clearing_region(x, 0.5 + 0 * x, 0, 0).vertices_m.tolist() == [[0.5, 0.5]]


@pytest.mark.parametrize(
    ("distance", "surface", "error", "match"),
    [
        ([0, 0], [1, 1], InputError, "must ascend from 0 at site A"),
        ([0], [1], InputError, "two equal rows of 2 or more"),
        ([0, 1e3, 2e3], [1, 1], InputError, "two equal rows"),
        ([5, 1e3], [1, 1], InputError, "must ascend from 0"),
        ([0, 1e3, 2e3], [1, math.nan, 1], MissingGroundError, "no height at 1000 m from A"),
    ],
)
def test_bad_profiles_are_refused(distance, surface, error, match):
    with pytest.raises(error, match=match):
        least_ray(distance, surface, 6e9, [Rule(1.0, 0.6)])
    with pytest.raises(error, match=match):
        clearing_region(distance, surface, 0, 0)


def test_missing_rules_grounds_and_negative_joins_are_refused():
    with pytest.raises(InputError, match="at least one rule"):
        least_ray([0, 1e3], [0, 0], 6e9, [])
    with pytest.raises(MissingGroundError, match="ground at the sites = nan, 0 m"):
        clearing_region([0, 1e3], [0, 0], math.nan, 0)
    with pytest.raises(InputError, match="join_m = -1: must be finite and 0 m or more"):
        frontier_stretches(clearing_region([0, 1e3], [0, 0], 0, 0), join_m=-1)
