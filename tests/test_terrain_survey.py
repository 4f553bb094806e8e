"""Folder survey, classes, missing stretches and their filling, and the hash of a file."""

import hashlib
import zipfile

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from rasterio.transform import Affine

from profiler.errors import MissingGroundError
from profiler.terrain import fill_missing, missing_stretches, open_classes, open_terrain, require_ground, survey
from profiler.terrain.files import file_hash

GRID = Affine(0.01, 0, 10, 0, -0.01, 50)


def test_survey_of_a_mixed_folder(write_raster):
    heights = np.arange(100, dtype="int16").reshape(10, 10)
    heights[0, :5] = -9999
    folder = write_raster("f/a.tif", heights, GRID, "EPSG:4326+5773", nodata=-9999).parent
    write_raster("f/b.tif", np.full((20, 20), 3281, "int16"), Affine(0.005, 0, 10.1, 0, -0.005, 49.9), unit="ft")
    write_raster("f/mask.tif", np.zeros((10, 10), "uint8"), GRID)
    write_raster("f/lost.tif", heights, GRID, None)
    (folder / "bad.tif").write_bytes(b"junk")
    (folder / "bad.zip").write_bytes(b"PK but no")
    with zipfile.ZipFile(folder / "good.zip", "w") as archive:
        archive.write(folder / "mask.tif", "in/mask.tif")
        archive.writestr("in/worse.tif", b"junk")
    found = survey(folder)
    a, b = found.rasters
    assert (a.void_share, a.min_m, a.max_m) == (0.05, 5.0, 99.0)
    assert (b.void_share, b.min_m, b.max_m) == (0.0, pytest.approx(1000.05, abs=0.01), pytest.approx(1000.05, abs=0.01))
    unreadable = "not readable as a raster (not recognized as being in a supported file format)"
    assert [problem.removeprefix(f"{folder}/").split(";")[0].split(",")[0] for problem in found.problems] == [
        f"bad.tif: {unreadable}",
        f"bad.zip: {unreadable}",
        f"good.zip/in/worse.tif: {unreadable}",
        "lost.tif: has no coordinate reference system",
    ]
    assert [skipped.name for skipped in found.skipped] == [f"{folder}/good.zip/in/mask.tif", f"{folder}/mask.tif"]
    assert all(skipped.reason.startswith("holds 8-bit cells") for skipped in found.skipped)
    assert found.bounds == pytest.approx((10.0, 49.8, 10.2, 50.0))
    assert found.covered_share == pytest.approx(0.5, abs=0.01)  # two of the four quarters
    assert found.vertical_datums == ("EGM96 geoid", None)
    assert found.void_share == pytest.approx(5 / 500)
    assert (found.min_m, found.max_m) == (5.0, b.max_m)
    # 0.005 degrees of the 50th parallel (71.70 km a degree) and 0.01 degrees of meridian (111.2 km), WGS 84
    assert found.finest_cell_m == pytest.approx(0.005 * 71_696, rel=5e-3)
    assert found.coarsest_cell_m == pytest.approx(0.01 * 111_229, rel=1e-3)
    assert survey(folder, read_heights=False).rasters[0].void_share is None


def test_survey_of_real_ground(real_terrain):
    found = survey(real_terrain)
    by_name = {raster.info.path.name: raster for raster in found.rasters}
    assert set(by_name) == {"canyon_srtm_3arcsec.tif", "canyon_srtm_utm12.vrt"}
    degrees = by_name["canyon_srtm_3arcsec.tif"]
    assert (degrees.min_m, degrees.max_m) == (1024.0, 2892.0)  # as the data's own README states
    assert degrees.info.bounds == pytest.approx((-113.24, 37.13, -112.85, 37.51), abs=0.005)
    assert by_name["canyon_srtm_utm12.vrt"].info.cell_x_m == pytest.approx(83.5, abs=0.1)
    assert by_name["canyon_srtm_utm12.vrt"].void_share > 0  # its nodata corners
    assert [skipped.path.name for skipped in found.skipped] == ["canyon_landcover_utm12.tif"]


def test_survey_of_nothing_usable(write_raster):
    found = survey(write_raster("f/lost.tif", np.zeros((3, 3), "int16"), GRID, None).parent)
    assert (found.rasters, found.bounds, found.void_share, found.finest_cell_m) == ((), None, None, None)
    assert len(found.problems) == 1


def test_survey_bounds_over_the_antimeridian(write_raster):
    flat = np.zeros((10, 10), "int16")
    folder = write_raster("f/e.tif", flat, Affine(0.1, 0, 179, 0, -0.1, -17)).parent
    write_raster("f/w.tif", flat, Affine(0.1, 0, -180, 0, -0.1, -17))
    found = survey(folder)
    assert found.bounds == pytest.approx((179, -18, -179, -17))
    assert found.covered_share == 1.0


def test_classes_are_the_cell_a_point_lies_in(write_raster):
    classes = np.arange(1, 101, dtype="uint8").reshape(10, 10)
    classes[9, 9] = 255
    path = write_raster("c.tif", classes, GRID, nodata=255)
    lon = [10.001, 10.0099, 10.0101, 10.1, 10.095, 10.5]
    with open_classes(path) as rasters:
        found, files = rasters.sample(lon, [49.999, 49.999, 49.999, 49.999, 49.905, 49.95])
    assert found.tolist() == [1, 1, 2, 10, -1, -1]
    assert found.dtype == np.int64
    assert files == (path,)


def test_classes_of_real_land_cover_against_rasterio(real_terrain):
    import rasterio
    from rasterio.warp import transform

    path = real_terrain / "canyon_landcover_utm12.tif"
    lon, lat = np.random.default_rng(0).uniform((-113.2, 37.2), (-112.9, 37.45), (400, 2)).T
    with open_classes(path) as rasters:
        found, _ = rasters.sample(lon.reshape(20, 20), lat.reshape(20, 20))
    x, y = transform("EPSG:4326", "EPSG:26912", lon.tolist(), lat.tolist())
    with rasterio.open(path) as raster:
        expected = [int(value[0]) for value in raster.sample(zip(x, y, strict=True))]
    assert found.ravel().tolist() == expected
    assert set(expected) <= {1, 2, 3, 4, 5, 6, 7, 8}


heights = st.lists(st.one_of(st.floats(-400, 8000), st.just(np.nan)), min_size=1, max_size=30)


@given(heights)
def test_filling_is_linear_between_neighbours_and_leaves_the_ends(ground):
    distance = np.cumsum(np.arange(1, len(ground) + 1.0))
    filled, mask = fill_missing(distance, ground)
    known = ~np.isnan(ground)
    np.testing.assert_array_equal(filled[known], np.array(ground)[known])
    assert not (mask & known).any()
    for first, last in missing_stretches(ground):
        inner = known[:first].any() and known[last + 1 :].any()
        assert mask[first : last + 1].all() == inner
        if inner:  # on the straight line between the two sides: collinear by cross product
            run = distance[last + 1] - distance[first - 1]
            slope = (ground[last + 1] - ground[first - 1]) / run
            line = ground[first - 1] + slope * (distance[first : last + 1] - distance[first - 1])
            np.testing.assert_allclose(filled[first : last + 1], line, atol=1e-6)
        else:
            assert np.isnan(filled[first : last + 1]).all()


def test_missing_ground_says_where():
    distance = np.arange(12) * 1000.0
    ground = np.zeros(12)
    ground[[1, 2, 4, 6, 8, 9]] = np.nan
    with pytest.raises(
        MissingGroundError,
        match=r"no ground height at 6 of 12 points: from 1\.000 to 2\.000 km \(longitude 10\.10000, latitude "
        r"50\.00000\), at 4\.000 km .*, at 6\.000 km .* and 1 more stretches; give terrain",
    ):
        require_ground(distance, 10 + np.arange(12) / 10, np.full(12, 50.0), ground)


def test_file_hash_is_sha256(tmp_path, write_raster):
    path = write_raster("a.tif", np.zeros((3, 3), "int16"), GRID)
    assert file_hash(path) == hashlib.sha256(path.read_bytes()).hexdigest()
    with open_terrain(path) as terrain:
        assert terrain.rasters[0].size_bytes == path.stat().st_size
