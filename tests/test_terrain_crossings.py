"""profiler.terrain.crossings: where paths meet the lines of their rasters, against points close together."""

import numpy as np
import pytest
from affine import Affine
from pyproj import Geod, Transformer

from profiler.path import trace
from profiler.terrain import open_classes, open_terrain

GEOD = Geod(ellps="WGS84")
DEGREES = Affine(0.01, 0.0, 9.9, 0.0, -0.004, 50.4)
METRES = Affine(190.0, 0.0, 562_000.0, 0.0, -95.0, 5_565_000.0)
TURNED = Affine(81.6, 38.0, 571_000.0, 29.6, -63.4, 5_551_000.0)
CELLS = np.zeros((300, 300), dtype="float32")


def crossings(rasters, ends) -> tuple[np.ndarray, float]:
    """Distances at which a path crosses, in order, and its length."""
    length_m = trace(*ends, spacing_m=1e6).distance_m
    line = trace(*ends, spacing_m=length_m / 256)
    return np.sort(rasters.crossings(line.longitude, line.latitude)) * length_m, length_m


def dense(ends, length_m, affine, crs, *, shift=0.0) -> np.ndarray:
    """Find changes of whole column or row among points a metre apart, straight between two of them."""
    azimuth = GEOD.inv(*ends)[0]
    x_m = np.arange(0.0, length_m, 1.0)
    longitude, latitude, _ = GEOD.fwd(*(np.full(x_m.size, each) for each in (*ends[:2], azimuth)), x_m)
    plane = Transformer.from_crs("EPSG:4326", crs, always_xy=True).transform(longitude, latitude)
    found = []
    a, b, c, d, e, f = (~affine)[:6]
    for count in (a * plane[0] + b * plane[1] + c + shift - 0.5, d * plane[0] + e * plane[1] + f + shift - 0.5):
        at = np.flatnonzero(np.floor(count[1:]) != np.floor(count[:-1]))
        level = np.maximum(np.floor(count[at]), np.floor(count[at + 1]))
        found.append(x_m[at] + (level - count[at]) / (count[at + 1] - count[at]))
    return np.sort(np.concatenate(found))


def same(found, expected):
    """Compare but for what turns back within a metre, which the dense points cannot see."""
    assert found.size == expected.size
    assert found == pytest.approx(expected, abs=2e-3)


PATHS = [
    (10.1, 50.0, 10.6, 50.2),
    (10.62, 50.21, 10.13, 49.991),
    (10.2, 50.03, 10.21, 50.2),
    (10.1, 50.1107, 10.6, 50.1),
]


@pytest.mark.parametrize("ends", PATHS)
@pytest.mark.parametrize(("affine", "crs"), [(DEGREES, "EPSG:4326"), (METRES, "EPSG:32632"), (TURNED, "EPSG:32632")])
def test_every_line_is_met_where_close_points_change_cell(write_raster, affine, crs, ends):
    with open_terrain(write_raster("a.tif", CELLS, affine, crs)) as terrain:
        found, length_m = crossings(terrain, ends)
    expected = dense(ends, length_m, affine, crs)
    if affine is TURNED:  # a part of the path leaves this raster, and where it is not nothing is asked for
        assert 50 < found.size < expected.size
        near = np.abs(found[:, None] - expected).min(axis=1)
        assert np.sort(near)[: found.size - 4].max() < 2e-3  # all but the outer edges where it enters and leaves
    else:
        same(found, expected)


@pytest.mark.parametrize("ends", PATHS)
def test_classes_change_on_the_edges_of_cells(write_raster, ends):
    with open_classes(write_raster("c.tif", CELLS.astype("uint8"), METRES, "EPSG:32632")) as classes:
        found, length_m = crossings(classes, ends)
    same(found, dense(ends, length_m, METRES, "EPSG:32632", shift=0.5))


def test_a_path_that_turns_back_across_a_line_meets_it_twice(write_raster):
    """Due east at 60° N a geodesic of 40 km bulges 54 m to the north: over lines of latitude some 11 m apart."""
    affine = Affine(0.01, 0.0, 9.9, 0.0, -0.0001, 60.015)
    ends = (10.0, 60.0, 10.718, 60.0)
    with open_terrain(write_raster("a.tif", CELLS, affine)) as terrain:
        found, length_m = crossings(terrain, ends)
    rows = found[np.abs(np.sort(found) - dense(ends, length_m, affine, "EPSG:4326")) < 1e-3]
    assert found.size == rows.size == 72 + 2 * 5  # 72 columns; five rows on the way out, five on the way back
    same(found, dense(ends, length_m, affine, "EPSG:4326"))


def test_over_the_antimeridian(write_raster):
    affine = Affine(0.01, 0.0, 179.0, 0.0, -0.004, 50.4)
    ends, moved = (179.9, 50.0, -179.7, 50.2), (9.9, 50.0, 10.3, 50.2)
    with open_terrain(write_raster("a.tif", CELLS, affine)) as terrain:
        found, length_m = crossings(terrain, ends)
    same(found, dense(moved, length_m, Affine(0.01, 0.0, 9.0, 0.0, -0.004, 50.4), "EPSG:4326"))


def test_a_path_along_a_line_meets_only_the_lines_across(write_raster):
    """Column 10 has its centre on the meridian that the path runs along."""
    with open_terrain(write_raster("a.tif", CELLS, DEGREES)) as terrain:
        found, _ = crossings(terrain, (10.005, 49.9, 10.005, 50.2))
    expected = (50.398 - 0.004 * np.arange(300))[::-1]
    assert found.size == np.sum((expected > 49.9) & (expected < 50.2))


def test_a_raster_elsewhere_is_not_asked(write_raster):
    with open_terrain(write_raster("a.tif", CELLS, DEGREES)) as terrain:
        assert crossings(terrain, (-30.0, 10.0, -30.2, 10.1))[0].size == 0
