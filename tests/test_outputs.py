"""What a command writes hurts nothing: no input, no protected file, no half of a set of files, whatever happens."""

import json
import os
import shutil
import signal
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pytest
import rasterio
from affine import Affine

from profiler.cli import main
from profiler.cli.files import write_all
from profiler.errors import InputError
from profiler.hopfile import load_hop

ROOT = Path(__file__).resolve().parent.parent

HOP = """\
name = "Over the plain"
frequency_ghz = 7.5

[site_a]
name = "South"
position = "46.0, 9.0"
antenna_m = 40

[site_b]
name = "North"
position = "46.18, 9.0"
antenna_m = 40  # as high as it goes

[terrain]
paths = ["dem.tif"]

[cover]
canopy = ["trees.tif"]

[rules]
rule = [{ k = 1.333, fresnel_fraction = 1.0 }, { k = 0.667, fresnel_fraction = 0.3 }]
"""
COMMANDS = ("study", "heights", "losses", "reach", "compare")
RADIO = """
[radio.a]
power_dbm = 27
gain_dbi = 36
[radio.b]
power_dbm = 27
gain_dbi = 36
[[radio.mode]]
name = "QPSK"
threshold_dbm = -86
"""


@pytest.fixture
def here(tmp_path, monkeypatch):
    """Stand in a folder with a hop, its terrain in several guises, and its cover."""
    affine = Affine(1 / 600, 0.0, 8.98, 0.0, -1 / 600, 46.19)

    def write(name, value, kind):
        size = {"count": 1, "height": 120, "width": 24, "dtype": kind, "crs": "EPSG:4326", "transform": affine}
        with rasterio.open(tmp_path / name, "w", driver="GTiff", **size) as raster:
            raster.write(np.full((1, 120, 24), value, dtype=kind))

    write("dem.tif", 100, "int16")
    write("trees.tif", 3, "int16")
    (tmp_path / "hop.toml").write_text(HOP + RADIO)
    monkeypatch.chdir(tmp_path)
    return tmp_path


@pytest.fixture
def run(here, capfd):
    """Run the command line in this process: exit code, standard output, standard error."""

    def call(*words):
        capfd.readouterr()
        with pytest.raises(SystemExit) as stop:
            main([str(word) for word in words])
        sys.stdout.flush()
        return stop.value.code, *capfd.readouterr()

    return call


@pytest.fixture
def refused(run, here):
    """Run what must be refused before it starts: one line, and every file as it was."""

    def call(*words):
        before = {path: path.read_bytes() for path in here.rglob("*") if path.is_file()}
        code, out, err = run(*words)
        assert (code, out, err.count("\n")) == (2, "", 1)
        assert {path: path.read_bytes() for path in here.rglob("*") if path.is_file()} == before
        return err.removeprefix("hopwright: ").rstrip()

    return call


def mosaic(path, source):
    """Write a virtual mosaic of one raster, by GDAL's own format (https://gdal.org/drivers/raster/vrt.html)."""
    path.write_text(
        '<VRTDataset rasterXSize="24" rasterYSize="120"><SRS>EPSG:4326</SRS>'
        "<GeoTransform>8.98, 0.0016666666666666668, 0, 46.19, 0, -0.0016666666666666668</GeoTransform>"
        '<VRTRasterBand dataType="Int16" band="1"><NoDataValue>-9999</NoDataValue><SimpleSource>'
        f'<SourceFilename relativeToVRT="1">{source}</SourceFilename><SourceBand>1</SourceBand>'
        '<SrcRect xOff="0" yOff="0" xSize="24" ySize="120"/><DstRect xOff="0" yOff="0" xSize="24" ySize="120"/>'
        "</SimpleSource></VRTRasterBand></VRTDataset>"
    )


# No output replaces what is read --------------------------------------------------------------------------------------


@pytest.mark.parametrize("command", COMMANDS)
@pytest.mark.parametrize("target", ["dem.tif", "trees.tif", "soft.csv", "hard.csv", "hop.toml", "softhop.json"])
def test_no_output_replaces_an_input(refused, here, command, target):
    (here / "soft.csv").symlink_to("dem.tif")
    (here / "hard.csv").hardlink_to("dem.tif")
    (here / "softhop.json").symlink_to("hop.toml")
    hops = ["hop.toml"] * (1 + (command == "compare"))
    assert f"{target}: must not be " in refused(command, *hops, "--json", target)
    if command == "study":
        assert f"{target}: must not be " in refused(command, "hop.toml", "--csv", target)
    if command == "heights":
        assert f"{target}: must not be " in refused(command, "hop.toml", "--write", target)


def test_nor_what_stands_behind_an_input(refused, here):
    """The sources of mosaics of mosaics, the files beside a raster, an archive, and what a folder of terrain holds."""
    (here / "far").mkdir()
    shutil.move("dem.tif", here / "far" / "real.tif")
    mosaic(here / "far" / "inner.vrt", "real.tif")
    mosaic(here / "outer.vrt", "far/inner.vrt")
    (here / "hop.toml").write_text(HOP.replace("dem.tif", "outer.vrt"))
    for target in ("outer.vrt", "far/inner.vrt", "far/real.tif"):
        assert f"{target}: must not be a raster that is read" in refused("study", "hop.toml", "--json", target)
    (here / "far" / "real.tif.aux.xml").write_text("<PAMDataset></PAMDataset>")
    (here / "hop.toml").write_text(HOP.replace("dem.tif", "far"))
    for target in ("far/inner.vrt", "far/real.tif", "far/real.tif.aux.xml"):
        assert f"{target}: must not be a raster that is read" in refused("study", "hop.toml", "--json", target)
    assert "far/real.tif: must not be a raster" in refused("terrain", "far", "--json", "far/real.tif")
    assert "hop.toml: must not be the hop file" in refused("terrain", "far", "--hop", "hop.toml", "--json", "hop.toml")


def test_what_is_not_read_may_be_replaced_beside_it(run, here):
    """The figures of the last run in a folder of terrain are not terrain; neither is a table."""
    (here / "hop.toml").write_text(HOP.replace('"dem.tif"', '"."').replace('canopy = ["trees.tif"]', ""))
    for _ in range(2):
        code, _, err = run("study", "hop.toml", "-q", "--figure", "hop.png", "--json", "dem.json")
        assert (code, err) == (0, "")


# Protected files ------------------------------------------------------------------------------------------------------


def test_a_protected_file_stays(refused, here):
    (here / "old.json").write_text("old")
    (here / "old.json").chmod(0o444)
    assert refused("study", "hop.toml", "--json", "old.json").startswith("old.json: is write-protected: must be")
    assert refused("starter", "old.json", "--force").startswith("old.json: is write-protected")


def test_a_replaced_file_keeps_its_permissions_and_a_new_one_gets_the_usual(run, here):
    (here / "old.json").write_text("old")
    (here / "old.json").chmod(0o640)
    run("study", "hop.toml", "--json", "old.json")
    run("study", "hop.toml", "--json", "new.json")
    umask = os.umask(0)
    os.umask(umask)
    assert (here / "old.json").stat().st_mode & 0o777 == 0o640
    assert (here / "new.json").stat().st_mode & 0o777 == 0o666 & ~umask


# All or none ----------------------------------------------------------------------------------------------------------


def failing(function, *, at):
    """Give a function of the system that fails once, the disk being full."""
    calls = []

    def call(*words, **options):
        calls.append(words)
        if len(calls) == at:
            raise OSError(28, "No space left on device")
        return function(*words, **options)

    return call


def no_links(*_):
    raise OSError(95, "Operation not supported")


@pytest.mark.parametrize("links", [True, False])
@pytest.mark.parametrize(
    ("broken", "at"), [("os.fsync", 1), ("os.fsync", 3), ("Path.replace", 1), ("Path.replace", 2), ("Path.replace", 3)]
)
def test_several_files_appear_together_or_not_at_all(tmp_path, monkeypatch, broken, at, links):
    (tmp_path / "a").write_text("old a")
    (tmp_path / "c").write_text("old c")
    if not links:  # as on some file systems
        monkeypatch.setattr("profiler.cli.files.Path.hardlink_to", no_links)
    original = os.fsync if broken == "os.fsync" else Path.replace
    monkeypatch.setattr(f"profiler.cli.files.{broken}", failing(original, at=at))
    with pytest.raises(InputError, match=r"No space left on device: must be a file that can be written here"):
        write_all([(tmp_path / name, b"new") for name in "abc"])
    assert {path.name: path.read_text() for path in tmp_path.iterdir()} == {"a": "old a", "c": "old c"}
    monkeypatch.undo()
    write_all([(tmp_path / name, b"new") for name in "abc"])
    assert {path.name: path.read_text() for path in tmp_path.iterdir()} == dict.fromkeys("abc", "new")


def test_no_file_is_written_where_standard_output_does_not_take_its_part(here):
    with Path("/dev/full").open("wb") as full:
        done = process("study", "hop.toml", "--json", "-", "--csv", "points.csv", stdout=full)
    assert done.returncode == 2
    assert done.stderr == (
        b"hopwright: standard output: No space left on device: must be a file that can be read or written here\n"
    )
    assert not (here / "points.csv").exists()


# Signals --------------------------------------------------------------------------------------------------------------

SLOW = f"""
import os, sys, time
sys.path.insert(0, {str(ROOT)!r})
sync = os.fsync
def slow_sync(handle):
    sync(handle)
    print("syncing", file=sys.stderr, flush=True)
    time.sleep(0.2)
os.fsync = slow_sync
from profiler.cli import main
main()
"""


@pytest.fixture(autouse=True)
def interruptible():
    """Let children be interrupted, though this process may run in the background, where Ctrl-C is ignored."""
    before = signal.signal(signal.SIGINT, signal.default_int_handler)
    yield
    signal.signal(signal.SIGINT, before)


@pytest.mark.parametrize("number", [signal.SIGTERM, signal.SIGINT, signal.SIGHUP])
def test_a_signal_while_files_take_their_places_waits_for_them(here, number):
    (here / "a.json").write_text("old")
    words = ["study", "hop.toml", "--json", "a.json", "--csv", "b.csv"]
    with subprocess.Popen([sys.executable, "-c", SLOW, *words], stdout=-1, stderr=-1) as running:
        assert running.stderr.readline() == b"syncing\n"
        running.send_signal(number)
        out, err = running.communicate(timeout=60)
    assert running.returncode == -number  # ended by it, but only then
    assert (out, err.replace(b"syncing\n", b"")) == (b"", b"")
    assert json.loads((here / "a.json").read_text())["schema"]
    assert (here / "b.csv").read_text().startswith("distance_m")
    assert not list(here.glob(".*"))


def test_a_signal_at_any_moment_leaves_files_whole(here):
    """A few of the many kills of scripts/fuzz."""
    (here / "a.json").write_text("old")
    for moment, number in zip((0.02, 0.2, 0.45), (signal.SIGINT, signal.SIGTERM, signal.SIGHUP), strict=True):
        with subprocess.Popen(
            command("study", "hop.toml", "--json", "a.json"), stdout=-1, stderr=-1, env=ENV
        ) as running:
            time.sleep(moment)
            running.send_signal(number)
            running.communicate(timeout=60)
        text = (here / "a.json").read_text()
        assert text == "old" or json.loads(text)["schema"]
        assert not list(here.glob(".*"))


# heights --write ------------------------------------------------------------------------------------------------------


def written(here, text, target="copy.toml"):
    (here / "hop.toml").write_bytes(text)
    with pytest.raises(SystemExit) as stop:
        main(["heights", "hop.toml", "-q", "--write", target])
    assert stop.value.code == 0
    return Path(target).read_bytes()


@pytest.mark.parametrize("mark", [b"", b"\xef\xbb\xbf"])
@pytest.mark.parametrize("end", [b"\n", b"\r\n"])
def test_a_copy_keeps_line_ends_comments_and_the_mark(here, mark, end):
    text = mark + HOP.rstrip().encode().replace(b"\n", end)  # and no line end where the file has none
    copy = written(here, text)
    assert copy != text
    assert [line.partition(b"antenna_m")[0] for line in copy.split(end)] == [
        line.partition(b"antenna_m")[0] for line in text.split(end)
    ]
    assert copy.count(b"  # as high as it goes") == 1
    assert copy.count(b"\n") == text.count(b"\n")


@pytest.mark.parametrize("quote", ['"{}"', "'{}'", '"./x/../{}"', '"\\u0064em.tif"  # not "dem.tif"\n'])
def test_a_copy_elsewhere_finds_the_same_files(here, quote):
    (here / "plans" / "deep").mkdir(parents=True)
    text = HOP.replace('"dem.tif"', quote.format("dem.tif"))
    (here / "x").mkdir()
    copy = written(here, text.encode(), "plans/deep/copy.toml")
    assert b'"../../dem.tif"' in copy
    assert [path.resolve() for path in load_hop("plans/deep/copy.toml").terrain.paths] == [here / "dem.tif"]
    assert copy.count(b"dem.tif") == text.count("dem.tif") + text.count("u0064")
    with pytest.raises(SystemExit, match="0"):
        main(["study", "plans/deep/copy.toml", "-q"])


def test_a_copy_elsewhere_is_refused_where_a_name_is_spelled_like_a_path(refused, here):
    (here / "plans").mkdir()
    (here / "hop.toml").write_text(HOP.replace('"South"', '"dem.tif"'))
    message = refused("heights", "hop.toml", "--write", "plans/copy.toml")
    assert message == "hop.toml: the paths in the hop file: must be written in full for a copy in another folder"


# As a process ---------------------------------------------------------------------------------------------------------

ENV = {**os.environ, "PYTHONPATH": str(ROOT)}


def command(*words):
    return [sys.executable, "-m", "profiler", *map(str, words)]


def process(*words, stdout=subprocess.PIPE, env=None, **options):
    return subprocess.run(
        command(*words), stdout=stdout, stderr=subprocess.PIPE, check=False, timeout=60, env=env or ENV, **options
    )
