"""The least surplus over the width of the zone, against closed forms and a dense search of its own."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from profiler.geometry import Surface, asked_across, check_rule, fresnel_radius, hold_rules
from profiler.models import Rule
from profiler.patches import Patches, bilinear, cut_patches, join_patches

FREQUENCY_HZ = 3e9
LENGTH_M = 10e3
EARTH_M = 6_371_000.0


def grid_patches(heights, corner, step_m, turn_deg):
    """Bilinear ground of a grid of cells, turned against the path: patches in distances along and across."""
    rows, columns = heights.shape
    j, i = (each.ravel() for each in np.mgrid[: rows - 1, : columns - 1])
    c, s = np.cos(np.radians(turn_deg)), np.sin(np.radians(turn_deg))
    along = np.column_stack((corner[0] + step_m * (c * i - s * j), 0 * i + step_m * c, 0 * i - step_m * s))
    across = np.column_stack((corner[1] + step_m * (s * i + c * j), 0 * i + step_m * s, 0 * i + step_m * c))
    z00, z10, z01, z11 = heights[j, i], heights[j, i + 1], heights[j + 1, i], heights[j + 1, i + 1]
    surface = np.column_stack((z00, z10 - z00, z01 - z00, z00 + z11 - z10 - z01, 0 * z00, 0 * z00))
    return Patches(along, across, surface, 0 * surface, np.empty((i.size, 0, 3)), np.ones(i.size, dtype=bool))


def one_patch(along, across, surface):
    rows = (np.array([each], dtype=float) for each in (along, across, surface, [0.0] * 6))
    return Patches(*rows, window=np.empty((1, 0, 3)), whole=np.array([True]))


def over(patches, points=41):
    x = np.linspace(0.0, LENGTH_M, points)
    return Surface(x, np.full(points, -1e4), 0 * x, patches)


def ground_at(heights, corner, step_m, turn_deg, along, across):
    """Interpolate the same ground plainly."""
    c, s = np.cos(np.radians(turn_deg)), np.sin(np.radians(turn_deg))
    x, y = (along - corner[0]) / step_m, (across - corner[1]) / step_m
    u, v = c * x + s * y, -s * x + c * y
    i = np.clip(np.floor(u).astype(int), 0, heights.shape[1] - 2)
    j = np.clip(np.floor(v).astype(int), 0, heights.shape[0] - 2)
    right, down = u - i, v - j
    upper = heights[j, i] * (1 - right) + heights[j, i + 1] * right
    lower = heights[j + 1, i] * (1 - right) + heights[j + 1, i + 1] * right
    inside = (u >= 0) & (v >= 0) & (u <= heights.shape[1] - 1) & (v <= heights.shape[0] - 1)
    return np.where(inside, upper * (1 - down) + lower * down, -1e4)


def surplus_at(rule, centres, along, across, ground):
    """Write out the surplus of a rule at places in its zone."""
    radius2 = rule.fresnel_fraction**2 * 299_792_458 / FREQUENCY_HZ * along * (LENGTH_M - along) / LENGTH_M
    ray = centres[0] + (centres[1] - centres[0]) * along / LENGTH_M
    bulge = along * (LENGTH_M - along) / (2 * rule.k * EARTH_M)
    inside = radius2 >= across**2
    return np.where(inside, ray - bulge - np.sqrt(np.maximum(radius2 - across**2, 0)) - ground - rule.margin_m, np.inf)


def dense(rule, centres, ground, along, across):
    """Least surplus on a grid of places, and then on finer ones about the best."""
    step = along[1] - along[0], across[1] - across[0]
    for _ in range(4):
        s, y = np.meshgrid(along, across, indexing="ij")
        found = surplus_at(rule, centres, s, y, ground(s, y))
        at = np.unravel_index(found.argmin(), found.shape)
        s, y = s[at], y[at]
        along = np.clip(np.linspace(s - step[0], s + step[0], 41), 0, LENGTH_M)
        across = np.linspace(y - step[1], y + step[1], 41)
        step = step[0] / 20, step[1] / 20
    return float(found.min())


@settings(max_examples=25)
@given(
    st.integers(0, 10**6),
    st.floats(0, 90),
    st.sampled_from([7.0, 30.0, 110.0]),
    st.sampled_from([Rule(4 / 3, 1.0), Rule(0.6, 0.3), Rule(1e9, 0.6, -40.0), Rule(1.0, 1.5, 3.0)]),
    st.floats(0, 9.6e3),
)
def test_no_dense_search_finds_less_and_little_more(seed, turn_deg, step_m, rule, start_m):
    rng = np.random.default_rng(seed)
    heights = rng.normal(0, step_m / 3, (12, 12))
    reach = 11 * step_m / np.sqrt(2)
    c, s = np.cos(np.radians(turn_deg)), np.sin(np.radians(turn_deg))
    corner = (start_m - 5.5 * step_m * (c - s) + reach / 2, -5.5 * step_m * (s + c))
    grid = heights, corner, step_m, turn_deg
    centres = tuple(rng.uniform(50, 250, 2))
    [held] = hold_rules(over(grid_patches(*grid)), [(rule, *centres)], FREQUENCY_HZ)
    along = np.linspace(max(start_m - reach, 0), min(start_m + 2 * reach, LENGTH_M), 500)
    widest = rule.fresnel_fraction * float(fresnel_radius(5e3, 5e3, FREQUENCY_HZ))
    across = np.linspace(-min(widest, 1.5 * reach), min(widest, 1.5 * reach), 121)
    least = dense(rule, centres, lambda s, y: ground_at(*grid, s, y), along, across)
    assert held.surplus_m <= least + 0.006
    # the place is real: its own surplus is the one that is told
    i = held.critical
    if held.surface_m[i] > -1e3:
        ground = ground_at(*grid, held.along_m[i], held.offset_m[i])
        assert ground == pytest.approx(held.surface_m[i], abs=0.02)
        place = held.along_m[i], held.offset_m[i]
        assert surplus_at(rule, centres, *place, held.surface_m[i]) == pytest.approx(held.surplus_m, abs=0.03)


@pytest.mark.parametrize("slope", [0.5, 1.0, -1.0, 2.0])
def test_a_side_slope_asks_for_the_distance_to_the_plane(slope):
    """Independent: a plane tilted across the path touches a circle of radius r when the ray is r·sqrt(1 + s²) above."""
    radius = float(fresnel_radius(5e3, 5e3, FREQUENCY_HZ))
    plane = one_patch([-1e3, 12e3, 0], [-50, 0, 100], [-50 * slope, 0, 100 * slope, 0, 0, 0])
    [held] = hold_rules(over(plane), [(Rule(1e12, 1.0), 100.0, 100.0)], FREQUENCY_HZ)
    assert held.surplus_m == pytest.approx(100 - radius * np.sqrt(1 + slope**2), abs=0.005)
    asked = asked_across(over(plane), FREQUENCY_HZ, [1.0])[1.0]
    assert asked.rise_m[20] == pytest.approx(radius * np.sqrt(1 + slope**2), rel=1e-9)
    assert asked.offset_m[20] == pytest.approx(radius * slope / np.sqrt(1 + slope**2), rel=1e-6)


def test_ground_outside_the_zone_or_below_its_curve_does_not_matter():
    """A wall 1 m thick at 0.6 r, or from just outside the zone on: the circle's height at 0.6 r is 0.8 r."""
    radius = float(fresnel_radius(5e3, 5e3, FREQUENCY_HZ))
    rule = Rule(1e12, 1.0)

    def passes(offset_m, height_m):
        wall = one_patch([4990.0, 20, 0], [offset_m, 0, 1], [height_m, 0, 0, 0, 0, 0])
        return hold_rules(over(wall), [(rule, 100.0, 100.0)], FREQUENCY_HZ)[0].passes

    assert passes(1.0001 * radius, 500.0)
    assert passes(-1.0001 * radius - 1, 500.0)
    assert not passes(0.9999 * radius, 500.0)
    assert passes(0.6 * radius, 100 - 0.8 * radius - 0.01)
    assert not passes(0.6 * radius, 100 - 0.8 * radius + 0.01)


@pytest.mark.parametrize("turn", [0.0, 0.1])
def test_a_wall_along_the_path_is_found_whole_and_quickly(turn):
    """A level wall all along, on the path or at a small angle to it: nothing along it stands out."""
    heights = np.zeros((61, 3))
    heights[:, 1] = 90.0
    # 60 cells of 200 m along the path, 20 m across
    j, i = (each.ravel() for each in np.mgrid[:60, :2])
    along = np.column_stack((200.0 * j - 1e3, 0.0 * i, 200.0 + 0 * i))
    across = np.column_stack((20.0 * (i - 1) + turn * 200 * (j - 30), 20.0 + 0 * i, turn * 200 + 0 * i))
    z00, z10, z01, z11 = heights[j, i], heights[j, i + 1], heights[j + 1, i], heights[j + 1, i + 1]
    surface = np.column_stack((z00, z10 - z00, z01 - z00, z00 + z11 - z10 - z01, 0 * z00, 0 * z00))
    patches = Patches(along, across, surface, 0 * surface, np.empty((i.size, 0, 3)), np.ones(i.size, dtype=bool))
    [held] = hold_rules(over(patches), [(Rule(4 / 3, 1.0), 130.0, 120.0)], FREQUENCY_HZ)
    x = np.linspace(0, LENGTH_M, 100_001)
    offset = turn * (x - 5e3)
    wall = surplus_at(Rule(4 / 3, 1.0), (130.0, 120.0), x, offset, 90.0)
    assert held.surplus_m == pytest.approx(wall.min(), abs=0.02)
    assert held.surplus_m <= wall.min() + 0.005


def test_on_level_ground_across_the_rule_is_that_of_the_path():
    x = np.array([0.0, 2e3, 4e3, 6e3, 8e3, 10e3])
    z = np.array([10.0, 50, 20, 90, 30, 15])
    along = np.column_stack((x[:-1], np.diff(x), 0 * x[1:]))
    across = np.tile([-100.0, 0, 200], (5, 1))
    surface = np.column_stack((z[:-1], np.diff(z), *np.zeros((4, 5))))
    patches = Patches(along, across, surface, 0 * surface, np.empty((5, 0, 3)), np.ones(5, dtype=bool))
    rule = Rule(1.0, 0.6, 2.0)
    [held] = hold_rules(Surface(x, z, 0 * z, patches), [(rule, 110.0, 105.0)], FREQUENCY_HZ)
    check = check_rule(x, z, 110.0, 105.0, FREQUENCY_HZ, rule)
    np.testing.assert_allclose(np.delete(held.least_surplus_m, 3), np.delete(check.surplus_m, 3), atol=1e-9)
    assert (held.critical, held.offset_m[3], held.missing_share) == (3, 0.0, 0.0)
    assert check.surplus_m[3] - 0.5 < held.surplus_m <= check.surplus_m[3]


def test_what_is_not_known_is_counted():
    half = one_patch([0.0, LENGTH_M, 0], [0.0, 0, 100], [0.0] * 6)
    [held] = hold_rules(over(half), [(Rule(1.0, 1.0), 100.0, 100.0)], FREQUENCY_HZ)
    assert held.missing_share == pytest.approx(0.5, abs=1e-4)  # a patch reaches a 50 000th of itself further


def test_a_step_counts_from_its_edge_on():
    """A block cut out by a window: just inside its corner the zone reaches deepest."""
    block = one_patch([4e3, 2e3, 0], [-50, 0, 100], [50.0, 0, 0, 0, 0, 0])
    turned = np.array([[[-25.0, 50.0, 1.0], [-5.5, 0.3, 10.0]]])  # 40 m by 10 m, at a slant
    cut, _ = cut_patches(block, turned)
    [held] = hold_rules(over(cut), [(Rule(1e12, 1.0), 70.0, 90.0)], FREQUENCY_HZ)
    p, q = np.meshgrid(np.linspace(0, 1, 2001), np.linspace(0, 1, 1001))
    inside = (np.abs(-25.5 + 50 * p + q) <= 0.5) & (np.abs(-6.0 + 0.3 * p + 10 * q) <= 0.5)
    every = surplus_at(Rule(1e12, 1.0), (70.0, 90.0), 4e3 + 2e3 * p[inside], -50 + 100 * q[inside], 50.0)
    assert held.surplus_m == pytest.approx(every.min(), abs=0.02)
    assert held.surplus_m <= every.min() + 0.005


def test_cutting_and_laying_over_keep_the_surface():
    rng = np.random.default_rng(4)
    patches = grid_patches(rng.normal(0, 5, (4, 4)), (100.0, -30.0), 30.0, 17.0)
    forms = np.tile([[-0.2, 0.9, 0.3], [0.1, -0.2, 0.7]], (patches.size, 1, 1)).astype(float)
    corners = rng.normal(0, 5, (patches.size, 4))
    cut, which = cut_patches(patches, forms)
    p, q = rng.uniform(0, 1, (2, cut.size))
    along, across, surface, _ = cut.at(np.arange(cut.size), p, q)
    # the same place in the patch that it was cut from
    a, y = patches.along_m[which].T, patches.across_m[which].T
    back = np.linalg.solve(
        np.moveaxis([[a[1], a[2]], [y[1], y[2]]], 2, 0), np.stack((along - a[0], across - y[0]), 1)[..., None]
    )
    old_p, old_q = back[:, :, 0].T
    np.testing.assert_allclose(patches.at(which, old_p, old_q)[2], surface, atol=1e-9)
    np.testing.assert_allclose(
        cut.window[:, 0, 0] + cut.window[:, 0, 1] * p + cut.window[:, 0, 2] * q,
        forms[which, 0, 0] + forms[which, 0, 1] * old_p + forms[which, 0, 2] * old_q,
    )
    # a bilinear layer in the coordinates of another grid
    polynomial = bilinear(forms, corners)
    u, v = (forms[:, each, 0] + forms[:, each, 1] * 0.3 + forms[:, each, 2] * 0.8 for each in (0, 1))
    z00, z10, z01, z11 = corners.T
    expected = (z00 * (1 - u) + z10 * u) * (1 - v) + (z01 * (1 - u) + z11 * u) * v
    at = np.array([1, 0.3, 0.8, 0.24, 0.09, 0.64])
    np.testing.assert_allclose(polynomial @ at, expected, atol=1e-9)
    both = join_patches([patches, cut])
    assert both.window.shape == (patches.size + cut.size, 2, 3)
