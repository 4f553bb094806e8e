"""Ground as a user meets it: what was taken for sea, what disagrees, what was passed over, and who may say so."""

import http.server
import json
import os
import re
import subprocess
import sys
import threading

import numpy as np
import pytest
import rasterio
from odd_rasters import CELL, COLS, GRID, HALVES, ROWS, country, hidden, mosaic, piece, plain, write, write_hop
from rasterio.transform import Affine
from test_odd_rasters import run


def study(folder, terrain, capsys, *more):
    """Study the hop over the country; return its JSON document, and distance and ground of every point."""
    points = folder / "points.csv"
    hop = write_hop(folder, terrain, *more)
    code, out, err = run(["study", hop, "--json", "-", "--csv", points], capsys)
    assert code in (0, 1), err
    table = np.genfromtxt(points, delimiter=",", names=True)
    return json.loads(out), table["distance_m"], table["ground_m"]


def told(document):
    """Everything that a document says in sentences."""
    return json.dumps(document, ensure_ascii=False)


def test_voids_are_sea_only_where_a_raster_lies_and_the_hop_file_says_so(tmp_path, capsys):
    terrain = write(tmp_path / "a.tif", hidden(-9999), nodata=-9999)
    code, _, err = run(["study", write_hop(tmp_path, terrain)], capsys)
    assert code == 2
    assert "if these cells are the sea, set terrain.voids_are_sea = true" in err
    document, distance_m, ground_m = study(tmp_path, terrain, capsys, "voids_are_sea = true")
    low = distance_m[ground_m == 0.0]
    # four void cells of 0.003°: between the centres of void and land the ground slopes, as between any two cells
    cell_m = CELL * 111_320 * np.cos(np.radians(49.964))
    assert np.ptp(low) == pytest.approx(3 * cell_m, rel=0.01)
    assert (ground_m.min(), ground_m.max()) == pytest.approx((0.0, 100.0), abs=1e-6)
    assert document["terrain"]["sea_share"] == pytest.approx(5 * CELL / 0.155, rel=0.01)
    place = re.search(
        r"sea level at (\S+) km to (\S+) km: the rasters hold no height there, and by the hop file", told(document)
    )
    first_m = (27.5 * CELL - 0.011) * cell_m / CELL  # from the last centre of land, in column 27
    assert [float(end) for end in place.groups()] == pytest.approx(
        [first_m / 1e3, (first_m + 5 * cell_m) / 1e3], abs=0.05
    )


def test_a_place_without_a_raster_is_no_sea(tmp_path, capsys):
    folder = tmp_path / "tiles"
    folder.mkdir()
    write(folder / "w.tif", country()[:, :20])
    write(folder / "e.tif", country()[:, 40:], grid=GRID @ Affine.translation(40, 0))
    code, _, err = run(["study", write_hop(tmp_path, folder, "voids_are_sea = true")], capsys)
    assert code == 2
    assert "no raster lies there: give terrain that covers them" in err


def test_a_coarser_raster_fills_a_void_before_the_sea_does(tmp_path, capsys):
    folder = tmp_path / "tiles"
    folder.mkdir()
    write(folder / "fine.tif", hidden(-9999), nodata=-9999)
    write(folder / "coarse.tif", country()[::2, ::2], grid=GRID @ Affine.scale(2))
    document, _, ground_m = study(tmp_path, folder, capsys, "voids_are_sea = true")
    assert ground_m.max() == pytest.approx(700.0)
    assert document["terrain"]["sea_share"] == 0.0


def test_the_sea_is_not_at_zero_above_an_ellipsoid(tmp_path, capsys):
    terrain = write(tmp_path / "a.tif", hidden(-9999), nodata=-9999, crs="EPSG:4979")
    code, _, err = run(["study", write_hop(tmp_path, terrain, "voids_are_sea = true")], capsys)
    assert code == 2
    assert "terrain.voids_are_sea = true: must be left out with" in err
    assert "ellipsoid of World Geodetic System 1984, where the sea is not at 0 m" in err


def test_all_void_ground_is_not_told_to_interpolate(tmp_path, capsys):
    terrain = write(tmp_path / "a.tif", np.full((ROWS, COLS), -9999, "int16"), nodata=-9999)
    for more in ((), ('missing = "interpolate"',)):
        code, _, err = run(["study", write_hop(tmp_path, terrain, *more)], capsys)
        assert code == 2
        assert "no ground height at any of" in err
        assert "interpolate" not in err
    gap = write(tmp_path / "b.tif", hidden(-9999), nodata=-9999)
    _, _, err = run(["study", write_hop(tmp_path, gap)], capsys)
    assert 'set terrain.missing = "interpolate"' in err


@pytest.fixture
def two_truths(tmp_path):
    """Two rasters of one grid: one sees the wall, one does not; each in a folder of its own, and both in a third."""
    for name, heights in (("one/a.tif", country()), ("two/b.tif", hidden(100))):
        (tmp_path / name).parent.mkdir()
        write(tmp_path / name, heights)
    (tmp_path / "both").mkdir()
    write(tmp_path / "both" / "b.tif", country())
    write(tmp_path / "both" / "a.tif", hidden(100))
    return tmp_path


@pytest.mark.parametrize(("order", "ground"), [(("one", "two"), 700.0), (("two", "one"), 100.0)])
def test_the_order_of_the_paths_decides_between_equals_and_the_difference_is_told(two_truths, capsys, order, ground):
    hop = write_hop(two_truths, two_truths / order[0])
    paths = ", ".join(json.dumps(str(two_truths / name)) for name in order)
    hop.write_text(re.sub(r"paths = .*", f"paths = [{paths}]", hop.read_text()))
    code, out, _ = run(["study", hop, "--json", "-", "--csv", two_truths / "points.csv"], capsys)
    document = json.loads(out)
    table = np.genfromtxt(two_truths / "points.csv", delimiter=",", names=True)
    assert table["ground_m"].max() == pytest.approx(ground)
    assert code == (1 if ground == 700.0 else 0)
    first, second = ("a.tif", "b.tif") if order[0] == "one" else ("b.tif", "a.tif")
    (warning,) = [each for each in document["terrain"]["warnings"] if "overlap" in each]
    assert warning.startswith(f"{first} and {second} overlap between ")
    assert f"the first lies 600.0 m {'above' if ground == 700.0 else 'below'} the second (median 0.0 m)" in warning
    assert "its path stands first in terrain.paths" in warning


def test_within_a_folder_the_name_decides_and_that_is_told(two_truths, capsys):
    document, *_ = study(two_truths, two_truths / "both", capsys)
    (warning,) = document["terrain"]["warnings"]
    assert warning.startswith("a.tif and b.tif overlap")
    assert "its name comes first in its folder" in warning
    where = float(re.search(r"at (\d+\.\d+) km the first lies 600", warning)[1])
    # the wall's first centre, column 28, of the hop from 10.011 to 10.166 (11.1 km)
    assert where == pytest.approx((10 + 28.5 * CELL - 10.011) / 0.155 * 11.11, abs=0.7)


def test_rasters_that_agree_within_their_errors_give_no_warning(tmp_path, capsys):
    for name, shift in (("a.tif", 0.0), ("b.tif", 0.8)):
        write(tmp_path / name, country("float32") + np.float32(shift))
    assert study(tmp_path, tmp_path, capsys)[0]["terrain"]["warnings"] == []
    write(tmp_path / "b.tif", country("float32") + np.float32(6))
    assert len(study(tmp_path, tmp_path, capsys)[0]["terrain"]["warnings"]) == 1
    hop = write_hop(tmp_path, tmp_path)
    hop.write_text(
        hop.read_text() + "[confidence]\nterrain_rmse_m = 3.0\ncorrelation_m = 100\n"
    )  # two errors of 3 m: up to 8.5 m
    _, out, _ = run(["study", hop, "--json", "-"], capsys)
    assert json.loads(out)["terrain"]["warnings"] == []


def test_what_was_passed_over_is_told(tmp_path, capsys):
    folder = tmp_path / "tiles"
    folder.mkdir()
    plain(folder)
    (tmp_path / "elsewhere").mkdir()
    (folder / "linked").symlink_to(tmp_path / "elsewhere")
    (folder / "lost.tif").symlink_to(tmp_path / "nowhere.tif")
    os.mkfifo(folder / "pipe.tif")
    (folder / "w001001.adf").write_bytes(b"x")
    write(folder / "mask.tif", np.zeros((ROWS, COLS), "uint8"))
    if os.geteuid() != 0:
        (folder / "locked").mkdir(mode=0)
    text = told(study(tmp_path, folder, capsys)[0])
    code, out, _ = run(["terrain", folder, "--no-color"], capsys)
    assert code == 0
    for words in (
        "linked: link to a folder, not followed",
        "lost.tif: not read (No such file or directory)",
        "pipe.tif: is a pipe, not a regular file",
        "1 file has an ending that no raster has (.adf): not looked at",
        "holds 8-bit cells",
        *(["locked: folder not read (Permission denied)"] if os.geteuid() != 0 else []),
    ):
        assert words in text
        assert words in " ".join(out.split())


def test_a_mosaic_names_every_file_behind_it_with_its_hash(tmp_path, capsys):
    inner = tmp_path / "deep"
    inner.mkdir()
    write(inner / "wall.tif", np.full((ROWS, 28), 700, "int16"))
    mosaic(inner, piece("wall.tif", 28, 4), name="inner.vrt")
    outer = piece("deep/inner.vrt", 0, COLS).replace('xSize="28"', f'xSize="{COLS}"')
    document, *_ = study(tmp_path, mosaic(tmp_path, HALVES + outer), capsys)
    names = {name: sha256 for name, _, sha256 in document["provenance"]["rasters"]}
    assert set(names) == {"m.vrt", "half.tif", "inner.vrt", "wall.tif"}
    assert all(len(value) == 64 for value in names.values())


@pytest.fixture
def server():
    """Run a web server on this machine that notes what it is asked."""
    asked = []

    class Handler(http.server.BaseHTTPRequestHandler):
        def do_GET(self):
            asked.append(self.path)
            self.send_error(404)

        do_HEAD = do_GET  # noqa: N815

        def log_message(self, *_):
            pass

    with http.server.ThreadingHTTPServer(("127.0.0.1", 0), Handler) as running:
        threading.Thread(target=running.serve_forever, daemon=True).start()
        yield f"http://127.0.0.1:{running.server_address[1]}", asked
        running.shutdown()


@pytest.mark.parametrize("form", ["/vsicurl/{}/a.tif", "{}/a.tif", "/vsizip//vsicurl/{}/a.zip/a.tif", "WMS:{}/a"])
def test_a_mosaic_reaches_the_network_only_when_allowed(tmp_path, capsys, server, form):
    address, asked = server
    terrain = mosaic(tmp_path, HALVES + piece(form.format(address), 28, 4, relative=0))
    code, _, err = run(["study", write_hop(tmp_path, terrain)], capsys)
    assert code == 2
    assert "set terrain.allow_network = true" in err
    assert asked == []
    code, _, err = run(["study", write_hop(tmp_path, terrain, "allow_network = true")], capsys)
    assert code == 2  # there is nothing to be had, but it was asked for
    assert asked or form.startswith("WMS")
    assert err.count("\n") == 1


@pytest.mark.parametrize(
    "form", ["/vsicurl/{}/a.tif", "/vsicurl_streaming/{}/a.tif", "/vsizip//vsicurl/{}/a.zip/a.tif"]
)
def test_the_files_of_the_network_are_closed_behind_the_text_of_mosaics_too(server, form):
    """The second lock: were a name to slip through the reading of a mosaic's text, GDAL itself has no way out."""
    from profiler.terrain.gdal import gdal_session

    address, asked = server
    with gdal_session(), pytest.raises(rasterio.errors.RasterioIOError):
        rasterio.open(form.format(address))
    assert asked == []
    with gdal_session(allow_network=True), pytest.raises(rasterio.errors.RasterioIOError):
        rasterio.open(form.format(address).replace("/a.", "/b."))  # GDAL remembers what it could not have
    assert asked


@pytest.mark.parametrize("ending", [".ovr", ".msk", ".aux.xml"])
def test_nothing_beside_a_raster_reaches_the_network(tmp_path, capsys, server, ending):
    address, asked = server
    terrain = plain(tmp_path)
    mosaic(tmp_path, piece(f"/vsicurl/{address}/a.tif", 0, 28, relative=0), name=f"a.tif{ending}")
    code, _, err = run(["study", write_hop(tmp_path, terrain, "allow_network = true")], capsys)
    assert code == 2
    assert "beside it names other files" in err
    assert asked == []


def test_no_variable_of_the_caller_changes_a_result(tmp_path, server):
    """Each of these moves heights or places, loads something, or writes files, where GDAL or PROJ sees it."""
    address, asked = server
    terrain = plain(tmp_path)
    with rasterio.open(terrain, "r+") as raster:
        raster.update_tags(AREA_OR_POINT="Point")
        raster.nodata = -1
    hop = write_hop(tmp_path, terrain)
    home = tmp_path / "home"
    (home / ".gdal").mkdir(parents=True)
    (home / ".gdal" / "gdalrc").write_text("[configoptions]\nGDAL_PAM_ENABLED=NO\nGTIFF_POINT_GEO_IGNORE=YES\n")
    bad = {
        "GTIFF_POINT_GEO_IGNORE": "YES", "GDAL_SKIP": "GTiff", "GDAL_DRIVER_PATH": str(tmp_path),
        "GDAL_DATA": "/nowhere",
        "GDAL_VRT_ENABLE_PYTHON": "YES", "GDAL_GEOREF_SOURCES": "NONE", "AAIGRID_DATATYPE": "Int32", "CPL_DEBUG": "ON",
        "CPL_LOG": str(tmp_path / "log"), "GDAL_PAM_ENABLED": "NO", "PROJ_NETWORK": "ON", "PROJ_DATA": "/nowhere",
        "PROJ_LIB": "/nowhere", "PROJ_NETWORK_ENDPOINT": address,
        "OSR_DEFAULT_AXIS_MAPPING_STRATEGY": "AUTHORITY_COMPLIANT",
        "GDAL_CONFIG_FILE": str(home / ".gdal" / "gdalrc"), "PROJ_DEBUG": "3", "HOME": str(home),
    }  # fmt: skip

    def outcome(environment):
        done = subprocess.run(
            [sys.executable, "-m", "profiler", "study", str(hop), "--json", "-"],
            capture_output=True, text=True, env=environment, check=False,
        )  # fmt: skip
        assert done.returncode == 1, done.stderr
        assert done.stderr == ""
        document = json.loads(done.stdout)
        document["provenance"].pop("created")
        return document

    assert outcome(os.environ | bad) == outcome({k: v for k, v in os.environ.items() if k not in bad or k == "HOME"})
    assert asked == []
    assert not (tmp_path / "log").exists()


def test_a_block_too_large_to_unpack_is_refused_with_the_way_out(tmp_path, capsys, monkeypatch):
    import profiler.terrain.reading as reading

    terrain = write(tmp_path / "a.tif", country(), blockysize=ROWS, compress="deflate")
    monkeypatch.setattr(reading, "_MOST_BYTES", 1000)
    monkeypatch.setattr(reading, "LARGE_BLOCK_CELLS", 1000)
    code, _, err = run(["study", write_hop(tmp_path, terrain)], capsys)
    assert code == 2
    assert "is stored in blocks of 60 x 24 cells, of 0.0 GB each, which must be unpacked whole" in err
    assert "gdal_translate -of COG in.tif out.tif" in err
    unpacked = write(tmp_path / "b.tif", country(), blockysize=ROWS)
    code, _, _ = run(["study", write_hop(tmp_path, unpacked)], capsys)
    assert code == 1


@pytest.mark.slow
@pytest.mark.parametrize("compress", [None, "deflate"])
def test_one_strip_of_900_million_cells(tmp_path, compress):
    """What took 36 s and 3.7 GB: unpacked it is read where it is needed, packed it is refused at once."""
    side, grid = 30_000, Affine(CELL / 50, 0, 10, 0, -CELL / 50, 50)
    shape = {"height": side, "width": side, "count": 1, "dtype": "int16", "crs": "EPSG:4326", "blockysize": side}
    with rasterio.open(tmp_path / "a.tif", "w", driver="GTiff", transform=grid, compress=compress, **shape) as raster:
        for top in range(0, side, 1000):
            raster.write(np.full((1000, side), 100, "int16"), 1, window=((top, top + 1000), (0, side)))
    hop = write_hop(tmp_path, tmp_path / "a.tif")
    code = (
        "import re, sys\nfrom profiler.cli import main\n"
        f"try: main(['study', {str(hop)!r}, '--quiet'])\n"
        "finally: print(re.search(r'VmHWM:\\s+(\\d+)', open('/proc/self/status').read())[1], file=sys.stderr)\n"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, timeout=20, check=False)
    assert done.returncode == (2 if compress else 0), done.stderr
    assert int(done.stderr.split()[-1]) < 500_000  # kB
