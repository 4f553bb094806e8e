"""Bulge, Fresnel radius, clearance, tight places and reflection, against published values and by property."""

import itertools

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy.optimize import brentq

from profiler.errors import InputError, MissingGroundError
from profiler.geometry import (
    check_rule,
    earth_bulge,
    elevation_angle,
    find_reflections,
    fresnel_radius,
    ray_height,
    tight_places,
)
from profiler.models import Rule

lengths_m = st.floats(1e3, 120e3)
shares = st.floats(0.01, 0.99)
ks = st.floats(0.4, 5.0)
frequencies_hz = st.floats(1e8, 90e9)


def from_digits(text: str) -> pytest.approx:
    """Agree with a printed number: within half a unit of its last digit."""
    decimals = len(text.split(".")[1]) if "." in text else 0
    return pytest.approx(float(text), abs=0.5 * 10.0**-decimals)


# Published closed forms, in the units in which they are printed.


@pytest.mark.parametrize(("d1_km", "d2_km", "f_ghz"), [(1, 9, 6.0), (20, 20, 7.5), (0.5, 39.5, 23.0)])
def test_fresnel_radius_is_the_published_17_3_formula(d1_km, d2_km, f_ghz):
    """Rec. ITU-R P.530-18 §2.2 note: F1 = 17.3·sqrt(d1·d2/(f·d)), three digits printed."""
    published = 17.3 * np.sqrt(d1_km * d2_km / (f_ghz * (d1_km + d2_km)))
    assert float(fresnel_radius(d1_km * 1e3, d2_km * 1e3, f_ghz * 1e9)) == pytest.approx(published, rel=0.05 / 17.3)


@pytest.mark.parametrize(("zone", "root"), [(1, "1.00000"), (2, "1.41421"), (3, "1.73205"), (4, "2.00000")])
def test_zone_radii_grow_as_the_root_of_the_zone(zone, root):
    """Rec. ITU-R P.526-15 §2.1, equation (2): R_n = sqrt(n)·R_1."""
    ratio = float(fresnel_radius(7e3, 13e3, 6e9, zone) / fresnel_radius(7e3, 13e3, 6e9))
    assert ratio == from_digits(root)


def test_bulge_is_the_handbook_number():
    """12.742 = 2 · 6.371, the divisor of the trade's d1·d2/(12.742·k) with km and m (six digits of R = 6371 km)."""
    assert float(earth_bulge(20e3, 30e3, 1.0)) == pytest.approx(20 * 30 / 12.742, rel=1e-5)


def test_bulge_is_the_sagitta_of_the_circle():
    """Independent: the height of the arc of radius k·R above its chord, from plane trigonometry, at 60 km."""
    k, d = 4 / 3, 60e3
    half_angle = d / 2 / (k * 6_371_000.0)
    sagitta = k * 6_371_000.0 * (1 - np.cos(half_angle))
    assert float(earth_bulge(d / 2, d / 2, k)) == pytest.approx(sagitta, rel=2e-6)


def test_ellipsoid_definition_gives_the_fresnel_radius():
    """Independent: detour over a point F1 off the path is half a wavelength longer (P.526-15 §2.1), at 6 GHz, 30 km."""
    d1, d2, wavelength_m = 11e3, 19e3, 299_792_458 / 6e9
    radius = float(fresnel_radius(d1, d2, 6e9))
    detour = np.hypot(d1, radius) + np.hypot(d2, radius) - d1 - d2
    assert detour == pytest.approx(wavelength_m / 2, rel=1e-5)


# Properties.


@given(lengths_m, shares, ks, frequencies_hz)
def test_swapping_the_ends_changes_neither_bulge_nor_radius(length, share, k, frequency):
    d1 = share * length
    assert earth_bulge(d1, length - d1, k) == pytest.approx(earth_bulge(length - d1, d1, k))
    assert fresnel_radius(d1, length - d1, frequency) == pytest.approx(fresnel_radius(length - d1, d1, frequency))


@given(lengths_m, shares, ks, frequencies_hz)
def test_more_k_means_less_bulge_and_more_frequency_a_thinner_zone(length, share, k, frequency):
    d1 = share * length
    assert earth_bulge(d1, length - d1, 1.1 * k) < earth_bulge(d1, length - d1, k)
    assert fresnel_radius(d1, length - d1, 1.1 * frequency) < fresnel_radius(d1, length - d1, frequency)


def test_flat_earth_is_the_limit_of_k():
    assert float(earth_bulge(20e3, 20e3, np.inf)) == 0.0


def test_scalars_and_arrays_agree():
    d1 = np.array([1e3, 5e3, 9e3])
    together = earth_bulge(d1, 10e3 - d1, 1.0)
    assert together.tolist() == [float(earth_bulge(x, 10e3 - x, 1.0)) for x in d1]


hill_heights = st.lists(st.floats(0, 300), min_size=12, max_size=12)


def profile(heights: list[float]) -> tuple[np.ndarray, np.ndarray]:
    return np.linspace(0, 30e3, len(heights)), np.asarray(heights, dtype=float)


@given(hill_heights, ks)
def test_swapping_the_ends_mirrors_the_surplus(heights, k):
    x, z = profile(heights)
    there = check_rule(x, z, 400.0, 350.0, 6e9, Rule(k, 0.6, 3.0))
    back = check_rule(x, z[::-1], 350.0, 400.0, 6e9, Rule(k, 0.6, 3.0))
    np.testing.assert_allclose(back.surplus_m[::-1], there.surplus_m, atol=1e-9)


@given(hill_heights, ks, st.floats(0.1, 50))
def test_raising_an_antenna_or_k_never_lowers_a_surplus(heights, k, lift):
    x, z = profile(heights)
    base = check_rule(x, z, 320.0, 320.0, 6e9, Rule(k, 1.0))
    raised = check_rule(x, z, 320.0 + lift, 320.0, 6e9, Rule(k, 1.0))
    bent = check_rule(x, z, 320.0, 320.0, 6e9, Rule(1.2 * k, 1.0))
    assert np.all(raised.surplus_m >= base.surplus_m)
    assert raised.surplus_m[0] == pytest.approx(base.surplus_m[0] + lift)
    assert np.all(bent.surplus_m >= base.surplus_m)


@given(hill_heights, frequencies_hz)
def test_more_frequency_never_lowers_a_surplus(heights, frequency):
    x, z = profile(heights)
    low = check_rule(x, z, 320.0, 320.0, frequency, Rule(1.0, 1.0))
    high = check_rule(x, z, 320.0, 320.0, 2 * frequency, Rule(1.0, 1.0))
    assert np.all(high.surplus_m >= low.surplus_m)


def test_finer_steps_settle():
    def least(count: int) -> float:
        x = np.linspace(0, 30e3, count)
        z = 120 * np.exp(-(((x - 17_123) / 900) ** 2))
        check = check_rule(x, z, 150.0, 150.0, 6e9, Rule(4 / 3, 1.0))
        return float(check.surplus_m[check.critical])

    errors = [abs(least(count) - least(24_001)) for count in (76, 301, 1201)]
    assert errors[0] > errors[1] > errors[2]
    assert errors[2] < 0.01


def test_the_ray_ends_at_the_antennas_and_clearance_adds_up():
    x, z = profile([10, 50, 20, 90, 30])
    check = check_rule(x, z, 130.0, 95.0, 6e9, Rule(1.0, 0.6, 3.0))
    assert check.clearance_m[0] == 120.0
    assert check.clearance_m[-1] == 65.0
    assert np.isnan(check.ratio[[0, -1]]).all()
    np.testing.assert_allclose(ray_height(x, 130.0, 95.0) - z - check.bulge_m, check.clearance_m)
    np.testing.assert_allclose(check.clearance_m - 0.6 * check.f1_m - 3.0, check.surplus_m)


def test_a_knife_at_the_ray_fails_and_a_centimetre_lower_passes():
    x = np.array([0.0, 10e3, 20e3])
    bulge = float(earth_bulge(10e3, 10e3, 4 / 3))
    touching = check_rule(x, [0, 100 - bulge + 0.005, 0], 100, 100, 6e9, Rule(4 / 3, 0.0))
    free = check_rule(x, [0, 100 - bulge - 0.005, 0], 100, 100, 6e9, Rule(4 / 3, 0.0))
    assert (touching.passes, free.passes) == (False, True)
    assert (touching.line_of_sight, free.line_of_sight) == (False, True)


def test_an_antenna_inside_its_own_trees_fails():
    check = check_rule([0, 5e3, 10e3], [25, 0, 0], 20.0, 60.0, 6e9, Rule(4 / 3, 0.0))
    assert not check.passes
    assert check.critical == 0


# Tight places.


def test_every_blocked_stretch_is_a_place_and_bumps_of_a_deep_one_are_none():
    """A 38 km canyon crossing once listed two bumps 180 m apart and none of four other blocked stretches."""
    surplus = np.array([30, -460, -450, -455, 20, -66, 5, -21, 1, -144, 2, -23, 40], dtype=float)
    assert tight_places(surplus, rise_m=5.0) == (1, 9, 5, 11, 7)


def test_the_ends_are_places_only_when_tightest():
    assert tight_places([20.0, 30.0, 25.0, 40.0, 22.0], rise_m=2.0) == (0, 2)
    assert tight_places([20.0, 30.0, 10.0, 40.0, 22.0], rise_m=2.0) == (2,)


def test_neighbours_of_one_crest_are_one_place():
    surplus = np.array([30, 8, 7, 5, 6.5, 6, 9, 30, 4.5, 30])
    assert tight_places(surplus, rise_m=3.0) == (8, 3)
    assert tight_places(surplus, rise_m=0.4) == (8, 3, 5)


@given(st.lists(st.floats(-50, 50), min_size=2, max_size=60), st.floats(0.1, 20))
def test_tight_places_are_ranked_separate_and_start_with_the_tightest(values, rise):
    surplus = np.array(values)
    places = tight_places(surplus, rise_m=rise, places=4)
    assert surplus[places[0]] == surplus.min()
    assert list(surplus[list(places)]) == sorted(surplus[list(places)])
    for one, other in itertools.combinations(places, 2):
        low, high = sorted((one, other))
        crest, shallower = surplus[low : high + 1].max(), max(surplus[one], surplus[other])
        enough = crest - shallower >= max(rise, -0.2 * shallower)
        assert enough or shallower < 0 <= crest


# Reflection and elevation.


@given(st.floats(20, 300), st.floats(20, 300), st.floats(0.6, 5.0))
def test_profile_reflection_finds_the_smooth_earth_point(height_a, height_b, k):
    """Independent: over the parabola the two grazing angles, h/d - d/(2kR), are equal at the specular point."""
    x = np.linspace(0, 40e3, 1001)

    def difference(where):
        angle_a, angle_b = (h / d - d / (2 * k * 6_371_000.0) for h, d in ((height_a, where), (height_b, 40e3 - where)))
        return angle_a - angle_b

    places = find_reflections(x, np.zeros_like(x), height_a, height_b, 6e9, k=k)
    assert len(places) == 1 or min(height_a, height_b) < 60  # lower antennas do not see each other at a low k
    for place in places:
        assert place.distance_m == pytest.approx(brentq(difference, 1.0, 40e3 - 1.0), abs=15.0)
        assert not place.screened


def test_plane_earth_reflection_is_the_image_construction():
    """On flat earth: d1/d = h1/(h1+h2), grazing atan((h1+h2)/d), delay 2·h1·h2/(c·d)."""
    x = np.linspace(0, 10e3, 1001)
    [only] = find_reflections(x, np.zeros_like(x), 60.0, 20.0, 6e9, k=1e12)
    assert only.distance_m == pytest.approx(7500.0, abs=1.0)
    assert only.grazing_deg == pytest.approx(np.degrees(np.arctan(80 / 10e3)), rel=1e-6)
    assert only.delay_s == pytest.approx(2 * 60 * 20 / 10e3 / 299_792_458, rel=1e-4)


def test_a_ridge_screens_the_reflection_on_its_own_side():
    x = np.linspace(0, 20e3, 2001)
    ground = np.where(np.abs(x - 3e3) < 100, 70.0, 0.0)
    places = [p for p in find_reflections(x, ground, 80.0, 80.0, 6e9, k=4 / 3) if abs(p.distance_m - 10e3) < 200]
    assert [(p.screened_a, p.screened_b) for p in places] == [(True, False)]


def test_points_crowded_on_one_part_do_not_turn_the_facets():
    """A facet is fitted to the length of the ground, not to the number of points that somebody put on a part of it."""
    x = np.linspace(0, 20e3, 2001)
    crowded = np.unique(
        np.concatenate(
            (x, np.arange(0.0, 20e3, 200.0)[:, None].repeat(30, 1).ravel() + np.tile(np.linspace(0.0, 9.9, 30), 100))
        )
    )
    for ground in (lambda d: 5.0 * np.sin(d / 700.0) + d * 1e-3, lambda d: 8.0 * np.cos(d / 1100.0)):
        even, uneven = (find_reflections(each, ground(each), 90.0, 60.0, 6e9, k=4 / 3) for each in (x, crowded))
        assert len(even) == len(uneven) > 0
        for one, other in zip(even, uneven, strict=True):
            assert other.distance_m == pytest.approx(one.distance_m, abs=6.0)
            assert other.roughness_m == pytest.approx(one.roughness_m, abs=0.02)


def test_a_bank_next_to_the_place_hides_it():
    """Flat 60 km, 150 m antennas: a 40 m bank 1.7 km before the middle, where the mirrored ray is some 6 m up."""
    x = np.linspace(0, 60e3, 3001)
    bank = np.where(np.abs(x - 28.3e3) < 100, 40.0, 0.0)
    near = [p for p in find_reflections(x, bank, 150.0, 150.0, 6e9, k=4 / 3) if abs(p.distance_m - 30e3) < 500]
    assert near
    assert all(place.screened_a for place in near)


def test_rough_ground_fails_the_rayleigh_criterion():
    x = np.linspace(0, 20e3, 2001)
    wave = np.where(np.arange(x.size) % 2 == 0, 20.0, -20.0)
    assert all(p.rough for p in find_reflections(x, wave, 100.0, 100.0, 6e9, k=4 / 3))
    assert not any(p.rough for p in find_reflections(x, 0 * x, 100.0, 100.0, 6e9, k=4 / 3))


def test_elevation_angles_of_a_level_hop_are_both_down_by_half_the_arc():
    """Independent: the chord of an arc leaves its tangent at half the arc's angle, d/(2·k·R)."""
    angle = float(elevation_angle(50e3, 200.0, 200.0, 1.0))
    assert angle == pytest.approx(-np.degrees(50e3 / (2 * 6_371_000)), rel=1e-4)


# Bad input.


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda: earth_bulge(-1, 5, 1.0), "d1_m = -1: must be finite and 0 m or more"),
        (lambda: earth_bulge(1, 5, -1.0), "k = -1: must be more than 0"),
        (lambda: fresnel_radius(0, 0, 6e9), "the path has no length"),
        (lambda: fresnel_radius(1, 1, 0.0), "frequency_hz = 0: must be finite and more than 0 Hz"),
        (lambda: fresnel_radius(1, 1, 6e9, 0), "zone = 0: must be 1 or more"),
        (
            lambda: find_reflections([0, 1e3], [0, 0], 9, 9, 6e9, k=1),
            "2 points: must have 3 or more in every",
        ),
        (lambda: check_rule([0, 2, 1], [0, 0, 0], 9, 9, 6e9, Rule(1, 1)), "must ascend from 0"),
        (lambda: check_rule([0, 1], [0, 0, 0], 9, 9, 6e9, Rule(1, 1)), "must be two equal rows"),
    ],
)
def test_bad_input_is_named(call, message):
    with pytest.raises(InputError, match=message):
        call()


def test_a_gap_is_never_zero():
    with pytest.raises(MissingGroundError, match="no height at 5000 m from A"):
        check_rule([0, 5e3, 10e3], [0, np.nan, 0], 50, 50, 6e9, Rule(1.0, 1.0))
