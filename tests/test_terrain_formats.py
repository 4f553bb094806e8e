"""What formats declare: conventions of cells, units, datums, markers of missing ground, archives."""

import gzip
import zipfile

import numpy as np
import pytest
from pyproj import Transformer
from rasterio.transform import Affine

from profiler.errors import DatumError, InputError, RasterError
from profiler.terrain import open_terrain, survey

GRID = Affine(0.01, 0, 10, 0, -0.01, 50)
FLAT = np.full((10, 10), 1000, "float32")
WGS84 = 'GEOGCS["WGS 84",DATUM["WGS_1984",SPHEROID["WGS 84",6378137,298.257223563]],UNIT["degree",0.0174532925199433]]'


def sample(path, lon, lat, **options):
    with open_terrain(path, **options) as terrain:
        return terrain.sample(lon, lat)


def info(path, **options):
    with open_terrain(path, **options) as terrain:
        return terrain.rasters[0]


@pytest.fixture
def hgt(tmp_path):
    """SRTM tile, 1201 × 1201 big-endian int16: corner cells are centred on whole degrees (SRTM documentation)."""
    row, col = np.mgrid[0:1201, 0:1201]
    heights = (1000 + row - 2 * (col % 300)).astype(">i2")
    heights[600, 900] = -32768
    path = tmp_path / "N50E010.hgt"
    heights.tofile(path)
    return path, heights.astype(float)


def test_hgt_cells_lie_on_whole_degrees(hgt):
    path, heights = hgt
    lon, lat = np.array([10.0, 11.0, 10 + 100.25 / 1200, 10.0]), np.array([51.0, 50.0, 51 - 7.5 / 1200, 50.0])
    found = sample(path, lon, lat)
    between = 0.5 * (0.75 * heights[7, 100] + 0.25 * heights[7, 101] + 0.75 * heights[8, 100] + 0.25 * heights[8, 101])
    np.testing.assert_allclose(found.ground_m, [heights[0, 0], heights[-1, -1], between, heights[-1, 0]], atol=1e-3)
    raster = found.sources[0].info
    assert (raster.driver, raster.vertical_datum, raster.nodata, raster.unit) == ("SRTMHGT", "EGM96 geoid", -32768, "m")
    assert raster.pixel_is_point
    assert np.isnan(sample(path, 10 + 900.5 / 1200, 51 - 600.5 / 1200).ground_m)


@pytest.mark.parametrize("kind", ["zip", "gz"])
def test_packed_hgt_reads_the_same(hgt, tmp_path, kind):
    path, _ = hgt
    packed = tmp_path / "packed" / f"N50E010.hgt.{kind}"
    packed.parent.mkdir()
    if kind == "zip":
        with zipfile.ZipFile(packed, "w", zipfile.ZIP_DEFLATED) as archive:
            archive.write(path, "deep/N50E010.hgt")
            archive.writestr("readme.txt", "not a raster")
    else:
        packed.write_bytes(gzip.compress(path.read_bytes()))
    lon, lat = np.linspace(10.01, 10.6, 50), np.linspace(50.9, 50.1, 50)
    np.testing.assert_array_equal(sample(packed.parent, lon, lat).ground_m, sample(path, lon, lat).ground_m)
    assert info(packed).member == ("deep/N50E010.hgt" if kind == "zip" else "")


def test_dted_cells_lie_on_whole_degrees(tmp_path, write_raster):
    """DTED level 0, 30″: 121 × 121 posts, the corners on whole degrees (MIL-PRF-89020B); heights above EGM96."""
    from rasterio.shutil import copy

    heights = (np.arange(121)[:, None] * 3 + np.arange(121)).astype("int16")
    post = 1 / 120
    copy(write_raster("d.tif", heights, Affine(post, 0, 10 - post / 2, 0, -post, 50 + post / 2)), tmp_path / "n49.dt0",
         driver="DTED")  # fmt: skip
    found = sample(tmp_path / "n49.dt0", [10.0, 11.0, 10.5], [50.0, 49.0, 49.5])
    np.testing.assert_allclose(found.ground_m, [0, 480, 240], atol=1e-3)
    assert found.vertical_datum == "EGM96 geoid"


@pytest.mark.parametrize(("header", "west"), [("xllcorner 10", 10.0), ("xllcenter 10", 9.75)])
def test_ascii_grid_by_corner_and_by_centre(tmp_path, header, west):
    y = header.replace("x", "y").replace("10", "50")
    rows = "1 2 3\n4 5 -9999\n"
    (tmp_path / "g.asc").write_text(f"ncols 3\nnrows 2\n{header}\n{y}\ncellsize 0.5\nNODATA_value -9999\n{rows}")
    (tmp_path / "g.prj").write_text(WGS84)
    shift = 0.0 if west == 10.0 else -0.25
    found = sample(tmp_path, [10.25 + shift, 10.5 + shift, 11.25 + shift], [50.75 + shift, 50.5 + shift, 50.25 + shift])
    np.testing.assert_allclose(found.ground_m, [1, 3, np.nan])
    assert found.sources[0].info.bounds.west == pytest.approx(west)


@pytest.fixture
def vrt(tmp_path, write_raster):
    """Three tiles side by side and the VRT over them, in a folder each."""
    heights, sources = np.arange(300.0).reshape(10, 30), ""
    for i in range(3):
        write_raster(f"tiles/{i}.tif", heights[:, 10 * i : 10 * i + 10], GRID @ Affine.translation(10 * i, 0))
        sources += (
            f'<SimpleSource><SourceFilename relativeToVRT="1">../tiles/{i}.tif</SourceFilename>'
            '<SourceBand>1</SourceBand><SrcRect xOff="0" yOff="0" xSize="10" ySize="10"/>'
            f'<DstRect xOff="{10 * i}" yOff="0" xSize="10" ySize="10"/></SimpleSource>'
        )
    path = tmp_path / "vrt" / "m.vrt"
    path.parent.mkdir()
    path.write_text(
        f'<VRTDataset rasterXSize="30" rasterYSize="10"><SRS>EPSG:4326</SRS>'
        f"<GeoTransform>10, 0.01, 0, 50, 0, -0.01</GeoTransform>"
        f'<VRTRasterBand dataType="Float64" band="1">{sources}</VRTRasterBand></VRTDataset>'
    )
    return path


def test_vrt_mosaic_reads_as_its_tiles(vrt, tmp_path):
    lon, lat = np.linspace(10.0, 10.3, 61), np.full(61, 49.95)
    tiles = sample(tmp_path / "tiles", lon, lat).ground_m
    np.testing.assert_allclose(sample(vrt, lon, lat).ground_m, tiles)
    np.testing.assert_allclose(sample(tmp_path, lon, lat).ground_m, tiles)  # the VRT and its tiles together


def names(use):
    return [str(path).partition("/tiles/")[2] or path.name for path in use.files]


def test_a_source_names_the_pieces_of_a_vrt_that_it_was_read_from(vrt):
    """Cells are 0.01°: up to 10.0949 the middle tile has no part in the blend, from 10.0951 it has."""
    assert names(sample(vrt, [10.0, 10.0949], 49.95).sources[0]) == ["m.vrt", "0.tif"]
    assert names(sample(vrt, [10.0, 10.0951], 49.95).sources[0]) == ["m.vrt", "0.tif", "1.tif"]
    assert names(sample(vrt, [10.25], 49.95).sources[0]) == ["m.vrt", "2.tif"]


def test_a_warped_vrt_names_all_that_it_is_made_from(tmp_path, write_raster):
    import rasterio
    from rasterio.shutil import copy
    from rasterio.vrt import WarpedVRT

    path = write_raster("plain.tif", FLAT, GRID)
    with rasterio.open(path) as raster, WarpedVRT(raster, crs="EPSG:32632", nodata=-9999) as warped:
        copy(warped, tmp_path / "w.vrt", driver="VRT")
    assert names(sample(tmp_path / "w.vrt", 10.05, 49.95).sources[0]) == ["w.vrt", "plain.tif"]


def test_a_source_names_the_files_beside_it_and_its_archive(tmp_path):
    (tmp_path / "g.asc").write_text("ncols 2\nnrows 2\nxllcorner 10\nyllcorner 50\ncellsize 0.5\n1 2\n3 4\n")
    (tmp_path / "g.prj").write_text(WGS84)
    assert sample(tmp_path, 10.5, 50.5).sources[0].files == (tmp_path / "g.asc", tmp_path / "g.prj")
    packed = tmp_path / "packed.zip"
    with zipfile.ZipFile(packed, "w") as archive:
        for name in ("g.asc", "g.prj"):
            archive.write(tmp_path / name, f"in/{name}")
    assert sample(packed, 10.5, 50.5).sources[0].files == (packed,)


def test_cloud_optimized_geotiff(write_raster):
    heights = np.add.outer(np.arange(700.0), np.arange(700.0)).astype("float32")
    grid = Affine(0.001, 0, 10, 0, -0.001, 50)
    path = write_raster("c.tif", heights, grid, driver="COG", blocksize=128, compress="deflate", nodata=-9999)
    found = sample(path, [10.3505, 10.1], [49.6495, 49.9])
    np.testing.assert_allclose(found.ground_m, [700, 199], atol=1e-3)
    assert (found.sources[0].blocks_read, found.sources[0].read_share) == (2, pytest.approx(2 * 128 * 128 / 700**2))


@pytest.mark.parametrize(
    ("unit", "factor"),  # exact definitions: international foot 0.3048 m, US survey foot 1200/3937 m
    [("ft", 0.3048), ("US survey foot", 1200 / 3937), ("cm", 0.01), ("metre", 1.0)],
)
def test_band_unit_becomes_metres_and_says_so(write_raster, unit, factor):
    found = sample(write_raster("u.tif", FLAT, GRID, unit=unit), 10.05, 49.95)
    assert found.ground_m == pytest.approx(1000 * factor, rel=1e-12)
    told = any(f"heights in {unit} converted to metres" in note for note in found.sources[0].notes)
    assert told == (factor != 1.0)


def test_unit_of_the_vertical_crs(write_raster):
    """NAD83 / Pennsylvania South (ftUS) + NAVD88 height (ftUS): heights in survey feet though the band may not say."""
    lon, lat = -77.75, 39.9
    x, y = Transformer.from_crs(4326, 2272, always_xy=True).transform(lon, lat)
    path = write_raster("p.tif", FLAT, Affine(30, 0, x - 150, 0, -30, y + 150), "EPSG:2272+6360")
    found = sample(path, lon, lat)
    assert found.ground_m == pytest.approx(1000 * 1200 / 3937, rel=1e-9)
    assert found.vertical_datum == "North American Vertical Datum 1988"
    assert found.sources[0].info.crs == "EPSG:2272"
    assert found.sources[0].info.cell_x_m == pytest.approx(30 * 1200 / 3937, rel=1e-3)


def test_plane_in_feet_without_height_unit_is_not_guessed(write_raster):
    path = write_raster("p.tif", FLAT, Affine(30, 0, 1968000, 0, -30, 200000), "EPSG:2272")
    with pytest.raises(
        RasterError,
        match=r"p\.tif: declares no height unit .* may be metres or feet; set the unit of the band, or terrain\.",
    ):
        open_terrain(path)
    assert info(path, height_unit="ft").unit_factor_m == 0.3048
    assert "declares no height unit: taken as ft, as stated by the user" in info(path, height_unit="ft").notes


@pytest.mark.parametrize(
    ("unit", "message"),
    [("furlong", "height unit 'furlong' is not a known length"), ("ft", "band's unit is ft but its vertical CRS")],
)
def test_wrong_units_are_errors(write_raster, unit, message):
    path = write_raster("w.tif", FLAT, GRID, "EPSG:4326+5773", unit=unit)
    with pytest.raises(RasterError, match=message):
        open_terrain(path)


def test_scale_and_offset_of_the_band(write_raster):
    path = write_raster("s.tif", np.full((10, 10), 5000, "int16"), GRID, scale=(0.1, 100.0), unit="ft")
    assert sample(path, 10.05, 49.95).ground_m == pytest.approx((5000 * 0.1 + 100) * 0.3048)


def test_mask_band_and_nan_are_missing(tmp_path, write_raster):
    import rasterio

    heights = FLAT.copy()
    heights[0, 0] = np.nan
    path = write_raster("m.tif", heights, GRID)
    with rasterio.Env(GDAL_TIFF_INTERNAL_MASK="YES"), rasterio.open(path, "r+") as raster:
        mask = np.full((10, 10), 255, "uint8")
        mask[5, 5] = 0
        raster.write_mask(mask)
    found = sample(path, [10.005, 10.055, 10.095], [49.995, 49.945, 49.905])
    np.testing.assert_array_equal(found.ground_m, [np.nan, np.nan, 1000])


def test_undeclared_marker_is_missing_and_noted(tmp_path, write_raster):
    heights = np.full((10, 10), 100, "int16")
    heights[4, 4] = -32768
    found = sample(write_raster("n.tif", heights, GRID), [10.045, 10.005], [49.955, 49.995])
    np.testing.assert_array_equal(found.ground_m, [np.nan, 100])
    told = "holds -32768 in 1 of the cells read without declaring it as nodata: taken as missing"
    assert told in found.sources[0].notes
    assert told in survey(tmp_path).rasters[0].notes
    heights[:] = -32768  # a raster that is all marker gives no height, but is not passed over in silence
    found = sample(write_raster("n.tif", heights, GRID), 10.045, 49.955)
    assert np.isnan(found.ground_m)
    assert found.sources == ()
    assert "n.tif: holds -32768" in " ".join(found.notes)


@pytest.mark.parametrize("marker", [-3.4028234663852886e38, -9999.9])
def test_float_marker_is_compared_as_stored(write_raster, marker):
    """The declared text of a float32 marker and the stored number differ in the last digits."""
    heights = FLAT.copy()
    heights[4, 4] = marker
    found = sample(write_raster("f.tif", heights, GRID, nodata=marker), [10.045, 10.005], [49.955, 49.995])
    np.testing.assert_array_equal(found.ground_m, [np.nan, 1000])
    assert not any("without declaring" in note for note in found.sources[0].notes)


def test_heights_no_place_has_are_an_error(write_raster):
    path = write_raster("c.tif", FLAT * 250, GRID)
    with pytest.raises(RasterError, match=r"c\.tif: holds 250000 m at column 3, row 4, where ground lies between"):
        sample(path, 10.035, 49.955)
    assert "c.tif: holds 250000 m at column 0, row 0" in survey(path).problems[0]


def test_sea_bed_is_noted(write_raster):
    found = sample(write_raster("b.tif", FLAT * -3, GRID), 10.035, 49.955)
    assert found.ground_m == -3000
    assert "ground below -500 m: the raster may hold the sea bed" in found.sources[0].notes


def two_datums(write_raster, first, second):
    folder = write_raster("d/a.tif", FLAT, GRID, first).parent
    write_raster("d/b.tif", FLAT, GRID @ Affine.translation(10, 0), second)
    return folder, np.array([10.05, 10.15]), np.array([49.95, 49.95])


def test_two_vertical_datums_on_one_path_stop(write_raster):
    folder, lon, lat = two_datums(write_raster, "EPSG:4326+5773", "EPSG:4326+3855")
    with pytest.raises(DatumError, match=r"EGM96 geoid \(.*a\.tif\), EGM2008 geoid \(.*b\.tif\); bring the rasters to"):
        sample(folder, lon, lat)
    assert sample(folder, lon[:1], lat[:1]).vertical_datum == "EGM96 geoid"  # the other one is not on this path
    with open_terrain(folder) as terrain:
        assert not np.isnan(terrain.sample(lon, lat, allow_mixed_datums=True).ground_m).any()  # points beside a path
    allowed = sample(folder, lon, lat, allow_mixed_datums=True)
    assert allowed.vertical_datum is None
    assert "are mixed, as allowed: EGM96 geoid" in allowed.notes[0]


def test_undeclared_datum_goes_with_the_other_and_says_so(write_raster):
    folder, lon, lat = two_datums(write_raster, "EPSG:4326+5773", "EPSG:4326")
    found = sample(folder, lon, lat)
    assert found.vertical_datum == "EGM96 geoid"
    assert found.notes == ("1 of 2 rasters declare no vertical datum: taken as EGM96 geoid, like the rest",)
    with pytest.raises(DatumError, match=r"EGM96 geoid .* EGM2008"):
        sample(folder, lon, lat, vertical_datum="EGM2008")
    assert sample(folder, lon, lat, vertical_datum="EPSG:5773").notes == ()


def test_one_datum_in_two_units_is_one_datum(write_raster):
    x, y = Transformer.from_crs(4326, 26918, always_xy=True).transform(-77.0, 40.0)
    folder = write_raster("d/a.tif", FLAT, Affine(30, 0, x, 0, -30, y), "EPSG:26918+5703").parent
    write_raster("d/b.tif", FLAT, Affine(30, 0, x + 300, 0, -30, y), "EPSG:26918+6360")
    lon, lat = Transformer.from_crs(26918, 4326, always_xy=True).transform([x + 150, x + 450], [y - 150, y - 150])
    found = sample(folder, lon, lat)
    np.testing.assert_allclose(found.ground_m, [1000, 1000 * 1200 / 3937])
    assert found.vertical_datum == "North American Vertical Datum 1988"


def test_ellipsoidal_heights_are_told_apart(write_raster):
    path = write_raster("e.tif", FLAT, GRID, "EPSG:4979")
    found = sample(path, 10.05, 49.95)
    assert found.vertical_datum == "ellipsoid of World Geodetic System 1984"
    assert any("not above sea level" in note for note in found.sources[0].notes)


def test_horizontal_datum_shift_moves_the_place_not_the_height(write_raster):
    """NAD27 in Utah lies some 70 m from WGS 84 in longitude; GDAL, with a PROJ of its own, says where."""
    from rasterio.warp import transform

    lon, lat = -113.1, 37.3
    there = [values[0] for values in transform("EPSG:4326", "EPSG:4267", [lon], [lat])]
    heights = np.tile(np.arange(200.0), (200, 1))
    found = sample(write_raster("n.tif", heights, Affine(0.0001, 0, -113.11, 0, -0.0001, 37.31), "EPSG:4267"), lon, lat)
    assert abs(there[0] - lon) > 5e-4
    assert found.ground_m == pytest.approx((there[0] + 113.11) / 0.0001 - 0.5, abs=1e-3)


def test_longitudes_from_another_prime_meridian(tmp_path):
    """Degrees on WGS 84 counted from Paris, 2.337229° east of Greenwich (EPSG prime meridian 8903: 2.5969213 grads)."""
    (tmp_path / "p.asc").write_text("ncols 3\nnrows 1\nxllcorner 10\nyllcorner 50\ncellsize 1\n0 1 2\n")
    (tmp_path / "p.prj").write_text(WGS84.replace("UNIT", 'PRIMEM["Paris",2.337229],UNIT', 1))
    assert sample(tmp_path, 2.337229 + 11.75, 50.5).ground_m == pytest.approx(1.25, abs=1e-6)


@pytest.mark.parametrize("degree", ["degree", "Degree"])
def test_degrees_on_wgs84_need_no_transformation(write_raster, monkeypatch, degree):
    """As ESRI's .prj files spell the unit too."""
    import profiler.terrain.proj as proj

    monkeypatch.setattr(proj, "_transform", None)
    path = write_raster("w.tif", FLAT, GRID, WGS84.replace("degree", degree))
    assert sample(path, 10.05, 49.95).ground_m == 1000


@pytest.mark.parametrize("datum", ["EPSG:4326", "EPSG:999999"])
def test_stated_datum_must_be_vertical(write_raster, datum):
    with pytest.raises(InputError, match=f"vertical datum {datum}: must be the EPSG code of a vertical CRS"):
        open_terrain(write_raster("a.tif", FLAT, GRID), vertical_datum=datum)


@pytest.mark.parametrize(
    "options",
    [
        {},
        {"compress": "lzw"},
        {"tiled": True, "blockxsize": 16, "blockysize": 32, "bigtiff": "yes"},
        {"tiled": True, "blockxsize": 16, "blockysize": 16, "sparse_ok": True, "endianness": "big"},
    ],
)
def test_the_directory_of_a_tiff_says_what_gdal_says_of_each_block(write_raster, options):
    """GDAL's own metadata of blocks (BLOCK_OFFSET_x_y, BLOCK_SIZE_x_y) is the reference."""
    import rasterio

    from profiler.terrain.tiff import read_directory

    heights = np.full((64, 96), -7, "int16")
    heights[:32, 16:80] = np.arange(64)
    path = write_raster("t.tif", heights, GRID, nodata=-7, **options)
    found = read_directory(str(path))
    with rasterio.open(path) as raster:
        high, wide = raster.block_shapes[0]
        blocks = [f"{x}_{y}" for y in range(-(-64 // high)) for x in range(96 // wide)]
        starts = [raster.get_tag_item(f"BLOCK_OFFSET_{block}", "TIFF", bidx=1) for block in blocks]
        sizes = [raster.get_tag_item(f"BLOCK_SIZE_{block}", "TIFF", bidx=1) for block in blocks]
    ends = [int(start) + int(size) for start, size in zip(starts, sizes, strict=True) if start is not None]
    assert (found.end, found.all_written, found.marker) == (max(ends), None not in starts, -7.0)
    assert found.all_written == ("sparse_ok" not in options)
