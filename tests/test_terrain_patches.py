"""Ground in patches beside a path, against sampling at the same places: tiles, voids, islands, edges, other grids."""

import numpy as np
import pytest
from pyproj import Transformer
from rasterio.transform import Affine

from profiler.path import beside, trace
from profiler.terrain import Strip, ground_patches, open_terrain

CELL = 1 / 1200


def placed(right=0.0, down=0.0):
    """Place a grid so many cells from 10° E, 50.1° N."""
    return Affine(CELL, 0, 10.0 + right * CELL, 0, -CELL, 50.1 - down * CELL)


FIRST = placed()
ENDS = (10.01, 50.01, 10.12, 50.09)


def strip_along(ends, widest_m):
    line = trace(*ends, spacing_m=200.0)

    def reach_m(low_m, high_m):
        s = np.clip(line.distance_m / 2, low_m, high_m)
        return 2 * widest_m / line.distance_m * np.sqrt(s * (line.distance_m - s))

    return line, Strip(0.0, line.distance_m, lambda s, y: beside(line, s, y), reach_m)


def heights_of(patches, along, across):
    """Highest patch over each place, by plain arithmetic; -inf where none lies there."""
    a, y = patches.along_m.T[:, :, None], patches.across_m.T[:, :, None]
    turn = a[1] * y[2] - a[2] * y[1]
    p = ((along - a[0]) * y[2] - (across - y[0]) * a[2]) / turn
    q = ((across - y[0]) * a[1] - (along - a[0]) * y[1]) / turn
    inside = (np.abs(p - 0.5) <= 0.5 + 1e-9) & (np.abs(q - 0.5) <= 0.5 + 1e-9)
    for c0, c1, c2 in np.moveaxis(patches.window, (1, 2), (0, 1))[..., None]:
        inside &= np.abs(c0 + c1 * p + c2 * q - 0.5) <= 0.5 + 1e-9
    c = patches.surface_m.T[:, :, None]
    return np.where(inside, c[0] + c[1] * p + c[2] * q + c[3] * p * q + c[4] * p**2 + c[5] * q**2, -np.inf).max(axis=0)


def compared(paths, *, ends=ENDS, widest_m=20.0, **options):
    """Patches and samples at random places in the strip."""
    rng = np.random.default_rng(5)
    with open_terrain(paths, **options) as terrain:
        line, strip = strip_along(ends, widest_m)
        along = rng.uniform(0, line.distance_m, 400)
        across = rng.uniform(-1, 1, 400) * strip.reach_m(along, along)
        patches = ground_patches(terrain.layers(strip)[0], strip)
        sampled = terrain.sample(*beside(line, along, across), allow_mixed_datums=True).ground_m
    return heights_of(patches, along, across), sampled


@pytest.fixture
def rough():
    return np.random.default_rng(2).normal(500, 40, (120, 160)).astype("float32")


@pytest.fixture
def coarse(write_raster):
    heights = np.random.default_rng(3).normal(500, 40, (40, 56)).astype("float32")
    return write_raster("coarse.tif", heights, Affine(3 * CELL, 0, 9.997, 0, -3 * CELL, 50.102))


def agree(found, sampled):
    known = np.isfinite(sampled)
    np.testing.assert_array_equal(np.isfinite(found), known)
    np.testing.assert_allclose(found[known], sampled[known], atol=5e-3)
    return known


def test_tiles_of_one_grid_are_one(write_raster, rough):
    tiles = [
        write_raster(f"{i}{j}.tif", rough[60 * i :, 80 * j :][:60, :80], placed(80 * j, 60 * i))
        for i in (0, 1)
        for j in (0, 1)
    ]
    assert agree(*compared(tiles)).all()


@pytest.mark.parametrize("widest_m", [5.0, 80.0])
def test_a_void_is_missing_or_the_next_rasters(write_raster, rough, coarse, widest_m):
    rough[np.random.default_rng(4).random(rough.shape) < 0.05] = -9999
    holed = write_raster("holed.tif", rough, FIRST, nodata=-9999)
    assert not agree(*compared([holed], widest_m=widest_m)).all()
    assert agree(*compared([holed, coarse], widest_m=widest_m)).all()


def test_a_void_that_is_the_sea_is_no_higher_than_sampled(write_raster, rough):
    rough[50:70, 60:90] = -9999
    holed = write_raster("holed.tif", rough, FIRST, nodata=-9999)
    assert agree(*compared([holed], voids_are_sea=True)).all()


def test_an_island_of_a_finer_grid_in_another_projection_hides_what_is_under_it(write_raster, coarse):
    x, y = Transformer.from_crs(4326, 32632, always_xy=True).transform(10.04, 50.06)
    heights = np.random.default_rng(6).normal(500, 40, (200, 250)).astype("float32")
    fine = write_raster("fine.tif", heights, Affine(20, 0, x, 0, -20, y), "EPSG:32632")
    assert agree(*compared([fine, coarse], widest_m=60.0)).all()


def test_the_outermost_half_cell_holds_the_edge_and_beyond_is_nothing(write_raster, rough):
    one = write_raster("one.tif", rough, FIRST)
    assert not agree(*compared([one], ends=(10.0001, 50.0003, 10.1333, 50.0004), widest_m=70.0)).all()


def test_where_two_grids_end_the_higher_edge_counts(write_raster, rough):
    left = write_raster("left.tif", rough, FIRST)
    right = write_raster("right.tif", rough[::-1], placed(160, 0.3))
    found, sampled = compared([left, right], ends=(10.01, 50.01, 10.24, 50.09), widest_m=40.0)
    assert np.all(found >= sampled - 5e-3)
    assert np.mean(np.abs(found - sampled) < 5e-3) > 0.97


@pytest.mark.parametrize(
    "ends",
    [
        (10 + 10.5 * CELL, 50.1 - 40.5 * CELL, 10 + 100.5 * CELL, 50.1 - 40.5 * CELL),
        (10 + 40.5 * CELL, 50.1 - 100.5 * CELL, 10 + 40.5 * CELL, 50.1 - 10.5 * CELL),
    ],
    ids=["along a row of centres", "along a column"],
)
def test_a_path_along_a_grid_line(write_raster, rough, ends):
    assert agree(*compared([write_raster("one.tif", rough, FIRST)], ends=ends)).all()


@pytest.mark.parametrize("method", ["bilinear", "highest"])
def test_across_the_antimeridian(write_raster, rough, method):
    one = write_raster("one.tif", rough, Affine(CELL, 0, 180 - 80 * CELL, 0, -CELL, 50.1))
    assert agree(*compared([one], ends=(179.95, 50.01, -179.95, 50.09), method=method)).all()


def test_over_the_pole_on_a_polar_grid(write_raster):
    heights = np.random.default_rng(7).normal(500, 40, (400, 400)).astype("float32")
    polar = write_raster("polar.tif", heights, Affine(100, 0, -20000, 0, -100, 20000), "EPSG:3413")
    assert agree(*compared([polar], ends=(10.0, 89.9, 170.0, 89.95), widest_m=60.0)).all()
