"""Each thing that can be wrong with terrain has its own line, which names the file and the way out."""

import re
import subprocess
import sys

import numpy as np
import pytest
from rasterio.transform import Affine

from profiler.errors import InputError, MissingGroundError, RasterError
from profiler.terrain import open_classes, open_terrain, require_inside

GRID = Affine(0.01, 0, 10, 0, -0.01, 50)
FLAT = np.full((10, 10), 1000, "float32")


def message(call, kind=RasterError):
    with pytest.raises(kind, match=r"\w") as caught:
        call()
    text = str(caught.value)
    assert "\n" not in text
    return text


def cut_short(write_raster):
    """Half a raster: its directory and its northern blocks are whole (a COG keeps its directory in front)."""
    heights = np.random.default_rng(0).random((500, 500))
    path = write_raster("cut.tif", heights, Affine(0.001, 0, 10, 0, -0.001, 50), driver="COG", blocksize=128)
    path.write_bytes(path.read_bytes()[: path.stat().st_size // 2])
    return path


def test_no_crs(write_raster):
    text = message(lambda: open_terrain(write_raster("a.tif", FLAT, GRID, None)))
    assert "a.tif: has no coordinate reference system" in text
    assert ".prj" in text


def test_crs_but_no_corner(tmp_path):
    vrt = tmp_path / "a.vrt"
    vrt.write_text(
        '<VRTDataset rasterXSize="9" rasterYSize="9"><SRS>EPSG:4326</SRS><VRTRasterBand dataType="Int16" band="1"/>'
        "</VRTDataset>"
    )
    assert "a.vrt: has a CRS but no corner coordinates" in message(lambda: open_terrain(vrt))


@pytest.mark.parametrize(
    ("crs", "kind"), [('LOCAL_CS["site grid",UNIT["metre",1]]', "site grid"), ("EPSG:4978", "WGS 84")]
)
def test_crs_with_no_place_on_a_map(write_raster, crs, kind):
    text = message(lambda: open_terrain(write_raster("a.tif", FLAT, GRID, crs)))
    assert f"a.tif: its CRS ({kind}) is local or geocentric" in text


def test_corners_off_the_earth(write_raster):
    far = Affine(1e3, 0, 9e9, 0, -1e3, 9e9)
    text = message(lambda: open_terrain(write_raster("a.tif", FLAT, far, "EPSG:3035")))
    assert "a.tif: its corners fall nowhere on the earth in EPSG:3035" in text


def test_photos_and_masks_and_classes(write_raster):
    rgb = np.zeros((3, 10, 10), "uint8")
    text = message(lambda: open_terrain(write_raster("p.tif", rgb, GRID, photometric="RGB")))
    assert "p.tif: is a photo (3-band color or grey image), not heights; give a raster of elevations" in text
    text = message(lambda: open_terrain(write_raster("m.tif", rgb[0], GRID)))
    assert "m.tif: holds 8-bit cells (a photo, mask or class map), not heights" in text
    text = message(lambda: open_terrain(write_raster("b.tif", np.zeros((2, 10, 10), "int16"), GRID)))
    assert "b.tif: has 2 bands where one was expected" in text
    text = message(lambda: open_terrain(write_raster("c.tif", np.zeros((10, 10), "complex64"), GRID)))
    assert "c.tif: holds complex64 cells, not real numbers" in text


def test_photo_without_a_crs_is_first_of_all_a_photo(tmp_path):
    from PIL import Image

    Image.new("RGB", (8, 8)).save(tmp_path / "site.jpg")
    assert "site.jpg: is a photo" in message(lambda: open_terrain(tmp_path / "site.jpg"))


def test_land_cover_is_not_ground(real_terrain):
    text = message(lambda: open_terrain(real_terrain / "canyon_landcover_utm12.tif"))
    assert "canyon_landcover_utm12.tif: holds classes or colors (it has a palette), not heights" in text


def test_folder_sets_aside_what_is_not_heights(write_raster):
    folder = write_raster("f/dem.tif", FLAT, GRID).parent
    write_raster("f/mask.tif", np.zeros((10, 10), "uint8"), GRID)
    (folder / "notes.txt").write_text("hello")
    with open_terrain(folder) as terrain:
        assert [info.path.name for info in terrain.rasters] == ["dem.tif"]
        assert [skipped.path.name for skipped in terrain.skipped] == ["mask.tif"]
        assert terrain.skipped[0].reason.startswith("holds 8-bit cells")
    with open_terrain(folder / "mask.tif", eight_bit=True) as terrain:
        assert terrain.sample(10.05, 49.95).ground_m == 0


def test_folder_of_photos_only(write_raster):
    folder = write_raster("f/mask.tif", np.zeros((10, 10), "uint8"), GRID).parent
    assert "mask.tif: holds 8-bit cells" in message(lambda: open_terrain(folder))


@pytest.mark.parametrize("content", [b"", b"not a raster at all", b"II*\x00\x08\x00\x00\x00"])
def test_corrupt_file(tmp_path, content):
    (tmp_path / "bad.tif").write_bytes(content)
    for path in (tmp_path, tmp_path / "bad.tif"):  # in a folder too: a missing tile would be a hole in the ground
        text = message(lambda path=path: open_terrain(path))
        assert "bad.tif: not readable as a raster" in text


def test_file_cut_short(write_raster):
    with open_terrain(cut_short(write_raster)) as terrain:  # refused before a cell is read, wherever the cut may be
        text = message(lambda: terrain.sample(10.1, 49.99))
    assert re.search(
        r"cut\.tif: ends after \d+ bytes where its cells reach to byte \d+; the file is damaged or cut", text
    )


def test_bad_zip(tmp_path):
    (tmp_path / "a.zip").write_bytes(b"PK but no")
    for path in (tmp_path, tmp_path / "a.zip"):
        told = message(lambda path=path: open_terrain(path))
        assert "a.zip: not readable as a raster (not recognized as being in a supported file format); the file" in told


def test_nothing_there(tmp_path):
    nowhere = tmp_path / "nowhere"
    assert message(lambda: open_terrain(nowhere), InputError).startswith(f"{nowhere}: no such file or folder")
    assert message(lambda: open_terrain(tmp_path)).startswith(f"{tmp_path}: holds no raster")
    assert "no path given" in message(lambda: open_terrain([]), InputError)


def test_unknown_choices(write_raster):
    path = write_raster("a.tif", FLAT, GRID)
    with pytest.raises(InputError, match=r"terrain\.method = 'cubic': must be bilinear or highest"):
        open_terrain(path, method="cubic")
    with pytest.raises(InputError, match=r"terrain\.height_unit: height unit 'league' is not a known length"):
        open_terrain(path, height_unit="league")


@pytest.mark.parametrize(("lon", "lat"), [(10.0, 91.0), (np.nan, 49.9), (10.0, np.inf)])
def test_impossible_coordinates(write_raster, lon, lat):
    with (
        open_terrain(write_raster("a.tif", FLAT, GRID)) as terrain,
        pytest.raises(InputError, match=r"point 1: longitude .* latitude -90 to 90; longitude comes first"),
    ):
        terrain.sample([10.05, lon], [49.95, lat])


@pytest.mark.parametrize(
    ("lon", "lat", "told"),
    [
        (49.95, 10.05, "longitude and latitude look swapped: longitude 10.050000, latitude 49.950000 would lie on it"),
        (-10.05, 49.95, "the sign of the longitude (east or west) looks wrong: longitude 10.050000, latitude 49.9"),
        (10.05, -49.95, "the sign of the latitude (north or south) looks wrong"),
        (49.95, -10.05, "swapped, with a wrong sign: longitude 10.050000, latitude 49.950000"),
        (10.05, 50.5, "about 55.6 km from the nearest raster"),  # 0.5 degrees of latitude
        (9.0, 49.95, "about 71.6 km from the nearest raster"),  # 1 degree of longitude times cos 49.95
        (10.05, 149.95, "lies off the terrain, about"),
    ],
)
def test_site_off_the_terrain(write_raster, lon, lat, told):
    with open_terrain(write_raster("a.tif", FLAT, GRID)) as terrain:
        require_inside(terrain, "A", 10.05, 49.95)
        text = message(lambda: require_inside(terrain, "site B", lon, lat), InputError)
    assert text.startswith(f"site B: longitude {lon:.6f}, latitude {lat:.6f}: lies off the terrain")
    assert told in text


def test_swap_offered_in_a_plane_crs_and_over_100_degrees(write_raster):
    """A longitude beyond 90° cannot be a latitude: swapped, the site's own latitude is out of range."""
    x = Affine(100, 0, 301_000, 0, -100, 4_150_000)
    with open_terrain(write_raster("u.tif", np.zeros((300, 300), "int16"), x, "EPSG:32612")) as terrain:
        text = message(lambda: require_inside(terrain, "A", 37.3, -113.1), InputError)
    assert "look swapped: longitude -113.100000, latitude 37.300000" in text


def test_no_raster_under_the_path_has_no_cell_size(write_raster):
    with (
        open_terrain(write_raster("a.tif", FLAT, GRID)) as terrain,
        pytest.raises(MissingGroundError, match=r"no raster covers longitude 20\.000000 to 21\.000000"),
    ):
        terrain.finest_cell_m([20.0, 21.0], [50.0, 50.0])


def test_classes_must_be_whole(write_raster):
    with (
        open_classes(write_raster("a.tif", FLAT * 0 + 0.5, GRID)) as rasters,
        pytest.raises(RasterError, match=r"a\.tif: holds 0\.5, and a class is a whole number from 0"),
    ):
        rasters.sample(10.05, 49.95)


def test_gdal_says_nothing_of_its_own(tmp_path, write_raster):
    """One line on standard error is the promise of the command line: GDAL's own complaints must not join it."""
    cut_short(write_raster)
    (tmp_path / "bad.tif").write_bytes(b"II*\x00\x08\x00\x00\x00")
    code = (
        "import sys; from pathlib import Path; from profiler.terrain import open_terrain, survey\n"
        f"folder = Path({str(tmp_path)!r})\n"
        "survey(folder)\n"
        "for name in ('cut.tif', 'bad.tif'):\n"
        "    try: open_terrain(folder / name).sample(10.4, 49.51)\n"
        "    except OSError: pass\n"
        "    else: sys.exit('no error')\n"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert (done.stdout, done.stderr) == ("", "")
