"""Heights against independent calculations: scipy's interpolators over cell centres placed by hand."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from pyproj import Transformer
from rasterio.transform import Affine
from scipy.interpolate import RegularGridInterpolator
from scipy.ndimage import map_coordinates

from profiler.terrain import open_terrain

MILLIMETRE = 1e-3


def from_origin(west, north, width, height):
    """North-up grid from its corner (rasterio's own helper warns under affine 3)."""
    return Affine(width, 0.0, west, 0.0, -height, north)


def rough(rows, cols, seed=7):
    """Rough ground of a few hundred metres, nothing smooth to hide a shift of a cell."""
    rng = np.random.default_rng(seed)
    return (500 + 80 * rng.standard_normal((rows, cols))).astype("float32")


def sample(path, lon, lat, **options):
    with open_terrain(path, **options) as terrain:
        return terrain.sample(lon, lat)


def by_scipy(heights, first_lon, first_lat, cell_lon, cell_lat, lon, lat):
    """Bilinear by scipy between cell centres, the first (top left) at first_lon, first_lat."""
    rows, cols = heights.shape
    lats, lons = first_lat - cell_lat * np.arange(rows), first_lon + cell_lon * np.arange(cols)
    grid = RegularGridInterpolator((lats[::-1], lons), heights[::-1].astype(float))
    return grid(np.stack([lat, lon], axis=-1))


def on_map(epsg, lon, lat):
    """Map coordinates by GDAL, whose PROJ is not the one that terrain asks."""
    from rasterio.warp import transform

    x, y = transform("EPSG:4326", f"EPSG:{epsg}", np.atleast_1d(lon).tolist(), np.atleast_1d(lat).tolist())
    return np.squeeze(x), np.squeeze(y)


@pytest.mark.parametrize("kind", ["Area", "Point"])
def test_area_and_point_agree_with_scipy_to_a_millimetre(write_raster, kind):
    heights, cell = rough(60, 80), 1 / 1200
    # GDAL writes AREA_OR_POINT=Point as a GeoTIFF of cell centres and reads it back as corners: same ground either way
    path = write_raster("a.tif", heights, from_origin(8.0, 47.0, cell, cell), tags={"AREA_OR_POINT": kind})
    rng = np.random.default_rng(1)
    lon, lat = 8 + cell * rng.uniform(0.5, 79.5, 500), 47 - cell * rng.uniform(0.5, 59.5, 500)
    found = sample(path, lon, lat)
    expected = by_scipy(heights, 8 + cell / 2, 47 - cell / 2, cell, cell, lon, lat)
    assert np.abs(found.ground_m - expected).max() < MILLIMETRE
    assert found.sources[0].info.pixel_is_point == (kind == "Point")


def test_geotiff_point_convention_from_raw_tags(tmp_path):
    """A GeoTIFF by Pillow whose tiepoint is the centre of the first cell (GeoTIFF 1.1, RasterPixelIsPoint)."""
    from PIL import Image, TiffImagePlugin

    heights, cell = rough(20, 30), 0.001
    tags = TiffImagePlugin.ImageFileDirectory_v2()
    tags[33550] = (cell, cell, 0.0)  # ModelPixelScale
    tags[33922] = (0.0, 0.0, 0.0, 8.0, 47.0, 0.0)  # ModelTiepoint: cell (0, 0) is at 8 E, 47 N
    for tag, kind in ((33550, 12), (33922, 12), (34735, 3)):
        tags.tagtype[tag] = kind
    tags[34735] = (1, 1, 0, 3, 1024, 0, 1, 2, 1025, 0, 1, 2, 2048, 0, 1, 4326)  # geographic, pixel is point, WGS 84
    path = tmp_path / "point.tif"
    Image.fromarray(heights).save(path, tiffinfo=tags)
    lon, lat = 8 + cell * np.array([0.0, 3.25, 29.0]), 47 - cell * np.array([0.0, 7.5, 19.0])
    found = sample(path, lon, lat)
    expected = by_scipy(heights, 8.0, 47.0, cell, cell, lon, lat)
    assert found.sources[0].info.pixel_is_point
    assert np.abs(found.ground_m - expected).max() < MILLIMETRE


def test_real_ground_in_two_crs_against_scipy_and_gdal(real_terrain):
    lon, lat = np.linspace(-113.2, -112.9, 1500), np.linspace(37.17, 37.47, 1500)
    found = {}
    for name, crs in (("canyon_srtm_3arcsec.tif", 4326), ("canyon_srtm_utm12.vrt", 32612)):
        import rasterio

        with rasterio.open(real_terrain / name) as raster:
            heights, affine = raster.read(1).astype(float), raster.transform
        x, y = on_map(crs, lon, lat)
        expected = map_coordinates(heights, [(y - affine.f) / affine.e - 0.5, (x - affine.c) / affine.a - 0.5], order=1)
        found[crs] = sample(real_terrain / name, lon, lat).ground_m
        assert np.abs(found[crs] - expected).max() < MILLIMETRE
    # The UTM raster is a bilinear warp of the other, to whole metres: two different smoothings of cliffs of 300 m.
    # Its cost on this path is what scipy finds too: 3.8 m rms, 0.3 m mean, 53 m at the steepest point.
    difference = found[4326] - found[32612]
    assert 3.0 < np.sqrt(np.mean(difference**2)) < 4.5
    assert abs(difference.mean()) < 0.5


def test_two_crs_agree_as_the_warp_gets_finer(real_terrain, tmp_path):
    """The difference between CRSs is the warp's: unrounded and on ever finer cells, GDAL's own warp closes it."""
    import rasterio
    from rasterio.warp import Resampling, reproject

    source = real_terrain / "canyon_srtm_3arcsec.tif"
    lon, lat = np.linspace(-113.15, -113.1, 800), np.linspace(37.25, 37.3, 800)
    direct = sample(source, lon, lat).ground_m
    rms = []
    for cell in (60.0, 30.0, 10.0):
        size, affine = int(7200 / cell), from_origin(308_400, 4_131_600, cell, cell)
        warped = np.full((size, size), np.nan)
        with rasterio.open(source) as raster:
            kinds = {"src_crs": raster.crs, "src_transform": raster.transform, "resampling": Resampling.bilinear}
            reproject(raster.read(1).astype(float), warped, dst_crs="EPSG:32612", dst_transform=affine, **kinds)
        path = tmp_path / f"warped{cell:.0f}.tif"
        shape = {"width": size, "height": size, "count": 1, "dtype": "float64", "nodata": np.nan}
        with rasterio.open(path, "w", driver="GTiff", crs="EPSG:32612", transform=affine, **shape) as out:
            out.write(warped, 1)
        rms.append(float(np.sqrt(np.mean((sample(path, lon, lat).ground_m - direct) ** 2))))
    assert rms[0] > 2 * rms[1] > 4 * rms[2]
    assert rms[2] < 0.2, rms


def test_matplotlib_ground_against_scipy(write_raster):
    """Real ground that matplotlib ships (ymin and ymax are swapped in the file), cut into tiles of a folder."""
    from matplotlib import cbook

    with np.load(cbook.get_sample_data("jacksboro_fault_dem.npz", asfileobj=False)) as dem:
        heights, cell = dem["elevation"], float(dem["dx"])
        west, north = float(dem["xmin"]), max(float(dem["ymin"]), float(dem["ymax"]))
    for i, rows in enumerate((slice(0, 100), slice(100, 344))):
        for j, cols in enumerate((slice(0, 150), slice(150, 403))):
            corner = from_origin(west + cols.start * cell, north - rows.start * cell, cell, cell)
            write_raster(f"dem/{i}{j}.tif", heights[rows, cols], corner)
    lon, lat = np.linspace(west + 0.01, west + 0.32, 2000), np.linspace(north - 0.01, north - 0.27, 2000)
    found = sample(
        write_raster("dem/00.tif", heights[:100, :150], from_origin(west, north, cell, cell)).parent, lon, lat
    )
    expected = map_coordinates(heights.astype(float), [(north - lat) / cell - 0.5, (lon - west) / cell - 0.5], order=1)
    assert 200 < expected.min() < expected.max() < 1100  # the file's own range is 236 to 1076 m
    assert np.abs(found.ground_m - expected).max() < MILLIMETRE
    assert len(found.sources) >= 3


corner = st.floats(-170, 170), st.floats(-80, 80)
slope = st.floats(-20, 20)


@given(st.floats(-0.9, 0.9), st.floats(0.3, 3.0), st.booleans(), slope, slope)
def test_bilinear_gives_a_plane_back_on_any_grid(tmp_path_factory, turn, stretch, south_up, east_slope, north_slope):
    """Rotated, stretched and south-up grids: a plane in map coordinates comes back exactly."""
    import rasterio

    path = tmp_path_factory.mktemp("plane") / "plane.tif"
    flip = -1 if south_up else 1
    affine = (
        Affine.translation(500_000, 5_500_000) @ Affine.rotation(57 * turn) @ Affine.scale(25, -25 * stretch * flip)
    )
    col, row = np.meshgrid(np.arange(20) + 0.5, np.arange(16) + 0.5)
    x, y = affine @ (col, row)
    plane = 1000 + east_slope * (x - 500_000) / 100 + north_slope * (y - 5_500_000) / 100
    shape = {"width": 20, "height": 16, "count": 1, "dtype": "float64"}
    with rasterio.open(path, "w", driver="GTiff", crs="EPSG:32632", transform=affine, **shape) as raster:
        raster.write(plane, 1)
    rng = np.random.default_rng(0)
    x, y = affine @ (rng.uniform(0.5, 19.5, 50), rng.uniform(0.5, 15.5, 50))
    lon, lat = Transformer.from_crs(32632, 4326, always_xy=True).transform(x, y)
    expected = 1000 + east_slope * (x - 500_000) / 100 + north_slope * (y - 5_500_000) / 100
    assert np.abs(sample(path, lon, lat).ground_m - expected).max() < 1e-6


@pytest.mark.parametrize(
    ("epsg", "lon", "lat", "cell"),
    [
        (3857, 9.0, 47.0, 30.0),  # web Mercator
        (2154, 3.0, 46.5, 25.0),  # Lambert conformal, France
        (3035, 10.0, 55.0, 25.0),  # Lambert equal area, Europe
        (27700, -3.2, 55.9, 50.0),  # British grid, another ellipsoid
        (4258, 20.0, 69.0, 1 / 3600),  # degrees, not on WGS 84
        (2193, 175.0, -40.0, 15.0),  # New Zealand
        (3031, 166.0, -77.8, 100.0),  # Antarctic polar stereographic
        (5041, 15.0, 89.9, 100.0),  # around the north pole
        (32601, -179.99, 66.0, 30.0),  # UTM zone 1, at the antimeridian
    ],
)
def test_any_crs_agrees_with_gdal(write_raster, epsg, lon, lat, cell):
    """A plane of 10 m a cell in map coordinates, at points whose map coordinates GDAL finds with its own PROJ."""
    x0, y0 = on_map(epsg, lon, lat)
    heights = np.add.outer(np.arange(60.0), np.arange(60.0)) * 10
    path = write_raster("p.tif", heights, from_origin(x0 - 30 * cell, y0 + 30 * cell, cell, cell), f"EPSG:{epsg}")
    spread = 20 * (cell if cell > 1 else cell * 111_000) / 111_000
    rng = np.random.default_rng(epsg)
    lons = (lon + spread * rng.uniform(-1, 1, 50) + 180) % 360 - 180
    lats = np.minimum(lat + spread * rng.uniform(-1, 1, 50), 90.0)
    x, y = on_map(epsg, lons, lats)
    expected = 10 * ((x - x0 + y0 - y) / cell + 59)
    found = sample(path, lons, lats)
    assert np.abs(found.ground_m - expected).max() < MILLIMETRE
    assert found.sources[0].info.crs == f"EPSG:{epsg}"


def test_points_that_a_projection_does_not_reach_cost_the_others_nothing(write_raster):
    """Orthographic: the far side of the earth has no place on the map. By hand: x = R·cos(lat)·sin(lon - lon0)."""
    sphere = "+proj=ortho +lat_0=0 +lon_0=20 +R=6371000"
    path = write_raster("o.tif", np.tile(np.arange(100.0), (100, 1)), from_origin(-5e6, 5e6, 1e5, 1e5), sphere)
    lon = np.array([20.0, 200.0, 25.0, -160.0, 0.0, 170.0])
    found = sample(path, lon, np.zeros(6))
    expected = (6_371_000 * np.sin(np.radians(lon - 20)) + 5e6) / 1e5 - 0.5
    np.testing.assert_allclose(found.ground_m, np.where(np.abs(lon - 10) < 90, expected, np.nan), atol=1e-6)
    assert found.covered.tolist() == [True, False, True, False, True, False]


@given(st.lists(st.integers(1, 59), max_size=3, unique=True), st.lists(st.integers(1, 59), max_size=3, unique=True),
       st.integers(0, 1), st.sampled_from(["bilinear", "highest"]))  # fmt: skip
def test_cutting_a_raster_into_tiles_changes_nothing(tmp_path_factory, row_cuts, col_cuts, overlap, method):
    """Tiles edge to edge (as cut GeoTIFFs) or sharing a line of cells (as SRTM): the samples are the whole raster's."""
    import rasterio

    folder, cell, heights = tmp_path_factory.mktemp("cut"), 1 / 3600, rough(60, 60)

    def write(name, rows, cols):
        affine = from_origin(10 + cols.start * cell, 50 - rows.start * cell, cell, cell)
        part = heights[rows, cols]
        shape = {"width": part.shape[1], "height": part.shape[0], "count": 1, "dtype": "float32"}
        with rasterio.open(folder / name, "w", driver="GTiff", crs="EPSG:4326", transform=affine, **shape) as raster:
            raster.write(part, 1)

    write("whole.tif", slice(0, 60), slice(0, 60))
    (folder / "tiles").mkdir()
    for i, (top, bottom) in enumerate(zip([0, *sorted(row_cuts)], [*sorted(row_cuts), 60], strict=True)):
        for j, (left, right) in enumerate(zip([0, *sorted(col_cuts)], [*sorted(col_cuts), 60], strict=True)):
            write(f"tiles/{i}_{j}.tif", slice(top, min(bottom + overlap, 60)), slice(left, min(right + overlap, 60)))
    rng = np.random.default_rng(3)
    lon, lat = 10 + cell * rng.uniform(0, 60, 400), 50 - cell * rng.uniform(0, 60, 400)
    whole = sample(folder / "whole.tif", lon, lat, method=method)
    tiles = sample(folder / "tiles", lon, lat, method=method)
    assert not np.isnan(whole.ground_m).any()
    assert np.abs(tiles.ground_m - whole.ground_m).max() < 1e-6


def test_seam_between_different_column_spacings_is_continuous(write_raster):
    """Global models widen their columns at fixed latitudes (1″ to 1.5″ at 50°): no gap and no step where they meet."""
    cell = 1 / 3600
    north = rough(30, 60, seed=1)  # 1.5″ columns above 50 N
    south = rough(30, 90, seed=2)  # 1″ columns below
    folder = write_raster("s/n.tif", north, from_origin(10, 50 + 30 * cell, 1.5 * cell, cell)).parent
    write_raster("s/s.tif", south, from_origin(10, 50, cell, cell))
    lat = 50 + cell * np.linspace(-2, 2, 4001)
    ground = sample(folder, np.full(4001, 10.0101), lat).ground_m
    assert not np.isnan(ground).any()
    # steps of a thousandth of a cell: between centres of some hundred metres' difference no jump may exceed 0.6 m
    assert np.abs(np.diff(ground)).max() < 0.6
    # on the line itself: half of each last row, interpolated along the row (worked by hand)
    at_n = np.interp((10.0101 - 10) / (1.5 * cell) - 0.5, np.arange(60), north[-1])
    at_s = np.interp((10.0101 - 10) / cell - 0.5, np.arange(90), south[0])
    assert ground[2000] == pytest.approx((at_n + at_s) / 2, abs=MILLIMETRE)
    # a second copy of a tile, as folders collect them, pulls nothing to its side
    write_raster("s/copy/n.tif", north, from_origin(10, 50 + 30 * cell, 1.5 * cell, cell))
    np.testing.assert_allclose(sample(folder, np.full(4001, 10.0101), lat).ground_m, ground, atol=1e-9)


def test_a_crack_from_rounded_cell_sizes_is_closed(write_raster):
    """Neighbouring ASCII-style tiles whose printed cell size is short by a part in 4e-4: a plane crosses the crack."""
    cell, short = 0.001, 0.0009996
    lon_of = lambda west, size, n: west + size * (np.arange(n) + 0.5)  # noqa: E731
    left = np.tile(1e4 * (lon_of(10, short, 100) - 10), (20, 1)).astype("float64")
    right = np.tile(1e4 * (lon_of(10.1, short, 100) - 10), (20, 1)).astype("float64")
    folder = write_raster("c/a.tif", left, from_origin(10, 50, short, cell)).parent
    write_raster("c/b.tif", right, from_origin(10.1, 50, short, cell))
    lon = np.linspace(10.09, 10.11, 1001)
    ground = sample(folder, lon, np.full(1001, 49.99)).ground_m
    # the crack is 0.04 cells of 10 m height difference each: no more is lost in it, and nowhere is there a step
    assert np.abs(ground - 1e4 * (lon - 10)).max() < 0.04 * 10 + 1e-6
    assert np.abs(np.diff(ground)).max() < 1.1 * 10 * 0.02  # points are 0.02 cells apart


def test_finest_wins_where_it_has_data_and_shares_say_so(write_raster):
    coarse = np.full((40, 40), 100.0, "float32")
    fine = np.full((100, 100), 200.0, "float32")
    fine[:, 60:] = -9999  # a void that the coarse raster fills
    folder = write_raster("m/coarse.tif", coarse, from_origin(10, 50, 0.01, 0.01)).parent
    write_raster("m/fine.tif", fine, from_origin(10.1, 49.9, 0.001, 0.001), nodata=-9999)
    lon = np.linspace(10.05, 10.25, 2001)
    found = sample(folder, lon, np.full(2001, 49.85))
    inside = (lon > 10.1005) & (lon < 10.1594)
    outside = (lon < 10.0999) | (lon > 10.1606)
    assert (found.ground_m[inside] == 200).all()
    assert (found.ground_m[outside] == 100).all()
    assert [use.info.path.name for use in found.sources] == ["coarse.tif", "fine.tif"]
    assert sum(use.share for use in found.sources) == pytest.approx(1.0)
    assert found.sources[1].share == pytest.approx(0.059 / 0.2, abs=0.003)
    assert set(found.source[inside]) == {1}


def test_order_of_finest_is_by_size_on_the_ground(write_raster):
    """At 60° N a degree of longitude is half as long: 1.5″ columns by 1″ rows (23 m × 31 m) beat 30 m square."""
    x, y = Transformer.from_crs(4326, 32632, always_xy=True).transform(9.0, 60.0)
    folder = write_raster("o/utm.tif", np.full((50, 50), 1.0, "float32"),
                          from_origin(x - 750, y + 750, 30, 30), "EPSG:32632").parent  # fmt: skip
    arcsec = 1 / 3600
    write_raster("o/arc.tif", np.full((60, 60), 2.0, "float32"),
                 from_origin(9 - 45 * arcsec, 60 + 30 * arcsec, 1.5 * arcsec, arcsec))  # fmt: skip
    with open_terrain(folder) as terrain:
        assert terrain.sample(9.0, 60.0).ground_m == 2.0
        # one degree of the 60th parallel is 55 802 m on WGS 84 (geographiclib: 55 800.9 m geodesic)
        assert terrain.finest_cell_m(9.0, 60.0) == pytest.approx(55_801 * 1.5 / 3600, rel=1e-3)


def test_void_is_nan_never_zero_and_spreads_to_cells_that_need_it(write_raster):
    heights = np.full((5, 5), 100, "int16")
    heights[2, 2] = -1
    path = write_raster("v.tif", heights, from_origin(10, 50, 0.1, 0.1), nodata=-1)
    lon = 10 + 0.1 * np.array([2.5, 2.0, 1.5, 3.5, 3.6])  # the void, halfway to it, and the centres beside it
    found = sample(path, lon, np.full(5, 49.75))
    np.testing.assert_array_equal(found.ground_m, [np.nan, np.nan, 100, 100, 100])
    assert found.covered.all()
    assert found.source.tolist() == [-1, -1, 0, 0, 0]


def test_outer_half_cell_holds_the_edge_and_says_so(write_raster):
    heights = np.array([[1, 2], [3, 4]], "float32")
    path = write_raster("e.tif", heights, from_origin(10, 50, 1, 1))
    found = sample(path, [10.0, 10.25, 11.0, 12.0, 12.01], [50.0, 49.0, 49.9, 48.1, 48.1])
    np.testing.assert_allclose(found.ground_m, [1, 2, 1.5, 4, np.nan])
    assert "4 points in its outermost half cell" in found.sources[0].notes[-1]
    assert found.covered.tolist() == [True, True, True, True, False]


def test_highest_takes_the_highest_cell_that_carries_weight(write_raster):
    heights = np.array([[1, 9], [3, 4]], "float32")
    path = write_raster("h.tif", heights, from_origin(10, 50, 1, 1))
    found = sample(path, [11.0, 10.5, 10.5, 10.51], [49.0, 49.5, 49.4, 48.5], method="highest")
    assert found.ground_m.tolist() == [9, 1, 3, 4]


@given(st.floats(0.5, 19.5), st.floats(0.5, 19.5))
def test_highest_is_never_below_bilinear(tmp_path_factory, col, row):
    import rasterio

    folder = tmp_path_factory.mktemp("high")
    shape = {"width": 20, "height": 20, "count": 1, "dtype": "float32"}
    with rasterio.open(folder / "r.tif", "w", driver="GTiff", crs="EPSG:4326",
                       transform=from_origin(0, 20, 1, 1), **shape) as raster:  # fmt: skip
        raster.write(rough(20, 20), 1)
    low, high = (sample(folder, col, 20 - row, method=method).ground_m for method in ("bilinear", "highest"))
    assert high >= low - 1e-9


def test_across_the_antimeridian(write_raster):
    """A plane over 180° in two tiles, in one raster of 0…360° longitudes, and in a plane CRS: the same heights."""
    height = lambda lon, lat: 500 + 100 * ((lon + 360) % 360 - 180) + 50 * (lat + 17)  # noqa: E731
    lon, lat = np.array([179.7, 179.95, 179.9999, 180.0, -179.9999, -179.95, 180.3]), np.full(7, -17.1)

    def grid(west, cols):
        centre_lon, centre_lat = np.meshgrid(
            west + 0.01 * (np.arange(cols) + 0.5), -16.5 - 0.01 * (np.arange(120) + 0.5)
        )
        return height(centre_lon, centre_lat)

    two = write_raster("two/e.tif", grid(179.5, 50), from_origin(179.5, -16.5, 0.01, 0.01)).parent
    write_raster("two/w.tif", grid(-180, 50), from_origin(-180, -16.5, 0.01, 0.01))
    one = write_raster("one.tif", grid(179.5, 100), from_origin(179.5, -16.5, 0.01, 0.01))
    for path in (two, one):
        found = sample(path, lon, lat)
        np.testing.assert_allclose(found.ground_m, height(lon, lat), atol=1e-6)
    x, y = np.meshgrid(np.arange(100) * 1000 - 49_500.0, -np.arange(200) * 1000.0 - 1_800_000)
    mercator = "+proj=merc +lon_0=180 +datum=WGS84"
    heights = height(*Transformer.from_crs(mercator, 4326, always_xy=True).transform(x, y))
    plane = write_raster("merc.tif", heights, from_origin(-50_000, -1_799_500, 1000, 1000), mercator)
    found = sample(plane, lon[1:6], lat[1:6])
    np.testing.assert_allclose(found.ground_m, height(lon, lat)[1:6], atol=0.01)  # curved only by the projection
    with open_terrain(two) as terrain:
        assert terrain.covers(181.0 - 360 * np.arange(2), -17.0).tolist() == [False, False]
        assert terrain.covers([-180.0, 180.0, 540.0], -17.0).all()


def test_world_raster_closes_on_itself(write_raster):
    """On a global grid the cell west of the first column is the last one."""
    heights = np.tile(np.arange(36.0), (18, 1))
    path = write_raster("world.tif", heights, from_origin(-180, 90, 10, 10))
    found = sample(path, [-180.0, 180.0, 177.5, -177.5, 540.0], 5.0)
    np.testing.assert_allclose(found.ground_m, [17.5, 17.5, 26.25, 8.75, 17.5])


def test_around_the_pole(write_raster):
    """Universal polar stereographic (EPSG:5041): a cone about the pole, walked round and over."""
    x, y = np.meshgrid(np.arange(200) * 1000 + 1_900_500.0, 2_099_500.0 - np.arange(200) * 1000)
    path = write_raster(
        "pole.tif", np.hypot(x - 2e6, y - 2e6) / 100, from_origin(1.9e6, 2.1e6, 1000, 1000), "EPSG:5041"
    )
    lon = np.linspace(-180, 180, 73)
    with open_terrain(path) as terrain:
        assert terrain.rasters[0].bounds.north == 90.0
        assert terrain.rasters[0].bounds[::2] == (-180.0, 180.0)
        assert terrain.rasters[0].cell_x_m == pytest.approx(1000 / 0.994, rel=1e-3)  # scale 0.994 at the pole
        ring = terrain.sample(lon, 89.5).ground_m
        assert terrain.covers([0.0, 77.0], 90.0).all()
    radius = np.hypot(*(np.array(Transformer.from_crs(4326, 5041, always_xy=True).transform(0.0, 89.5)) - 2e6))
    np.testing.assert_allclose(ring, radius / 100, atol=0.05)


def test_posts_on_the_poles(write_raster):
    """A global grid of posts has its outermost cells half beyond the poles; they end there."""
    heights = np.tile(np.arange(181.0)[:, None], (1, 361))
    with open_terrain(write_raster("posts.tif", heights, from_origin(-180.5, 90.5, 1, 1))) as terrain:
        found = terrain.sample(10.0, [90.0, 89.8, -89.8, -90.0]).ground_m
        # 0.2° from the pole a degree of longitude is the 111.69 km of a degree of meridian there · 0.2 · π/180
        assert terrain.finest_cell_m(10.0, 89.8) == pytest.approx(111_694 * 0.2 * np.pi / 180, rel=1e-4)
    np.testing.assert_allclose(found, [0.0, 0.2, 179.8, 180.0])


@given(st.integers(0, 30), st.integers(1, 40))
def test_shape_and_order_of_points_change_nothing(tmp_path_factory, seed, across):
    import rasterio

    folder = tmp_path_factory.mktemp("shape")
    shape = {
        "width": 50,
        "height": 50,
        "count": 1,
        "dtype": "float32",
        "tiled": True,
        "blockxsize": 16,
        "blockysize": 16,
    }
    with rasterio.open(folder / "r.tif", "w", driver="GTiff", crs="EPSG:4326",
                       transform=from_origin(0, 5, 0.1, 0.1), **shape) as raster:  # fmt: skip
        raster.write(rough(50, 50), 1)
    rng = np.random.default_rng(seed)
    lon, lat = rng.uniform(-0.5, 5.5, (across, 7)), rng.uniform(-0.5, 5.5, (across, 7))
    with open_terrain(folder) as terrain:
        together = terrain.sample(lon, lat)
        mixed = rng.permutation(lon.size)
        apart = terrain.sample(lon.ravel()[mixed], lat.ravel()[mixed])
        alone = terrain.sample(lon[0, 0], lat[0, 0])
    assert together.ground_m.shape == lon.shape
    np.testing.assert_array_equal(together.ground_m.ravel()[mixed], apart.ground_m)
    np.testing.assert_array_equal(alone.ground_m, together.ground_m[0, 0])
    assert not together.ground_m.flags.writeable
