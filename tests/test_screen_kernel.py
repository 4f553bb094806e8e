"""Least surplus of many hops over one grid, against a dense search of its own with SciPy and pyproj."""

import numpy as np
import pytest
from pyproj import Geod
from scipy.ndimage import map_coordinates

from profiler.models import Rule
from profiler.screen import Sight, build_blocks, grid_lines, least_surplus
from profiler.screen.losses import delta_bullington_losses, profiles_of

GEOD = Geod(ellps="WGS84")
RADIUS_M, LIGHT_M_S = 6_371_000.0, 299_792_458.0
RULES = (Rule(4 / 3, 1.0), Rule(2 / 3, 0.3), Rule(1.0, 0.6, 3.0), Rule(0.5, 0.0))
FREQUENCY_HZ = 6.2e9
CELL_DEG, WEST, NORTH = 1 / 1200, -113.0, 37.5


def to_cells(longitude, latitude):
    return (longitude - WEST) / CELL_DEG, (NORTH - latitude) / CELL_DEG


def country(rows=300, columns=420):
    """Rugged ground of whole metres: steep, with twisted cells."""
    rng = np.random.default_rng(7)
    rough = rng.normal(0, 1, (rows, columns)).cumsum(axis=0).cumsum(axis=1)
    return np.round(500 + 300 * rough / np.abs(rough).max() + rng.normal(0, 4, (rows, columns)))


def dense(ground, hop, rule, heights, step_m=0.2):
    """Least surplus and its distance, on points 20 cm apart."""
    azimuth, _, length = GEOD.inv(*hop)
    s = np.linspace(0, length, int(length / step_m) + 2)
    longitude, latitude, _ = GEOD.fwd(*(np.full(s.size, each) for each in (hop[0], hop[1], azimuth)), s)
    column, row = to_cells(longitude, latitude)
    z = map_coordinates(ground, [row, column], order=1, mode="nearest")
    zone = rule.fresnel_fraction * np.sqrt(LIGHT_M_S / FREQUENCY_HZ * s * (length - s) / length)
    ray = (z[0] + heights[0]) * (1 - s / length) + (z[-1] + heights[1]) * s / length
    surplus = ray - z - s * (length - s) / (2 * rule.k * RADIUS_M) - zone - rule.margin_m
    return surplus.min(), s[surplus.argmin()]


def screened(ground, hops, heights=(31.0, 17.0)):
    blocks = build_blocks(ground)
    lines = grid_lines(*np.array(hops).T[[0, 1, 2, 3]], to_cells)
    centres = (blocks.height(lines.column_a, lines.row_a), blocks.height(lines.column_b, lines.row_b))
    centre_a_m, centre_b_m = (centre + height for centre, height in zip(centres, heights, strict=True))
    wavelength_m = np.full(len(hops), LIGHT_M_S / FREQUENCY_HZ)
    sight = Sight.of(RULES, centre_a_m, centre_b_m, wavelength_m)
    return lines, blocks, sight, least_surplus(lines, blocks, sight)


def at(column, row):
    return WEST + column * CELL_DEG, NORTH - row * CELL_DEG


SHAPES = {
    "along a row of centres": (*at(3, 40), *at(400, 40)),
    "along a column of centres, southward": (*at(77, 5), *at(77, 290)),
    "along a diagonal of cells": (*at(10.5, 10.5), *at(250.5, 250.5)),
    "westward": (*at(399.2, 100.7), *at(2.1, 140.3)),
    "northward": (*at(100.3, 280.1), *at(140.9, 3.3)),
    "inside one cell": (*at(50.1, 50.2), *at(50.8, 50.7)),
    "inside one column": (*at(60.2, 20.1), *at(60.4, 21.9)),
    "from the corner of the grid": (*at(0, 0), *at(419, 299)),
    "along the edge of the grid": (*at(0, 299), *at(419, 299)),
}


@pytest.mark.parametrize("shape", SHAPES)
def test_every_way_over_the_grid_is_exact(shape):
    ground, hop = country(), SHAPES[shape]
    _, _, _, found = screened(ground, [hop])
    for number, rule in enumerate(RULES):
        least, _ = dense(ground, hop, rule, (31.0, 17.0), step_m=min(0.2, GEOD.inv(*hop)[2] / 500))
        assert found.surplus_m[number, 0] <= least + 1e-3
        assert found.surplus_m[number, 0] >= least - 0.05


def some_hops(count, seed=3):
    rng = np.random.default_rng(seed)
    columns, rows = rng.uniform(1, 418, (2, count)), rng.uniform(1, 298, (2, count))
    return [(*at(columns[0, i], rows[0, i]), *at(columns[1, i], rows[1, i])) for i in range(count)]


def test_many_hops_at_once_are_exact_and_know_where():
    ground, hops = country(), some_hops(12)
    _, _, _, found = screened(ground, hops)
    for i, hop in enumerate(hops):
        for number, rule in enumerate(RULES):
            least, distance_m = dense(ground, hop, rule, (31.0, 17.0))
            assert least - 0.05 <= found.surplus_m[number, i] <= least + 1e-3
            assert found.distance_m[number, i] == pytest.approx(distance_m, abs=2.0)


def test_the_other_way_round_is_the_same_hop():
    ground, hops = country(), some_hops(40)
    there = screened(ground, hops)[3]
    back = screened(ground, [hop[2:] + hop[:2] for hop in hops], heights=(17.0, 31.0))
    assert back[3].surplus_m == pytest.approx(there.surplus_m, abs=1e-6)
    assert back[0].distance_m - back[3].distance_m == pytest.approx(there.distance_m, abs=1.0)


def test_alone_or_in_company_a_hop_has_the_same_answer():
    ground, hops = country(), some_hops(20)
    together = screened(ground, hops)[3]
    for i, hop in enumerate(hops):
        assert screened(ground, [hop])[3].surplus_m[:, 0].tolist() == together.surplus_m[:, i].tolist()


def test_a_gap_on_the_way_is_not_passed_over_and_one_beside_it_does_not_matter():
    ground, hop = country(), (*at(10.2, 50.3), *at(300.7, 60.2))
    clear = screened(ground, [hop])[3].surplus_m
    near = ground.copy()
    near[70, 200] = np.nan
    assert screened(near, [hop])[3].surplus_m.tolist() == clear.tolist()
    near[57, 200] = np.nan
    assert np.isnan(screened(near, [hop])[3].surplus_m).all()


def test_profiles_hold_every_crossing_and_give_the_loss_of_a_metre_of_spacing():
    from profiler.diffraction import delta_bullington

    ground, hops = country(), some_hops(30)
    lines, blocks, sight, _ = screened(ground, hops)
    loss_db = delta_bullington_losses(lines, blocks, sight.centre_a_m, sight.centre_b_m, sight.wavelength_m, 4 / 3)
    for i, hop in enumerate(hops):
        azimuth, _, length = GEOD.inv(*hop)
        s = np.linspace(0, length, int(length) + 1)
        longitude, latitude, _ = GEOD.fwd(*(np.full(s.size, each) for each in (hop[0], hop[1], azimuth)), s)
        z = map_coordinates(ground, to_cells(longitude, latitude)[::-1], order=1, mode="nearest")
        centres = sight.centre_a_m[i], sight.centre_b_m[i]
        expected = delta_bullington(s, z, *centres, FREQUENCY_HZ, 4 / 3 * RADIUS_M).total_db
        assert loss_db[i] == pytest.approx(float(expected), abs=0.15)
    [(_, distance_m, _)] = profiles_of(lines.take(np.array([4])), blocks)
    assert (np.diff(distance_m) > 0).all()
