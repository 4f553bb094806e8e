"""The program as a user runs it: what it prints and writes, its exit codes, one line for everything that is wrong."""

import contextlib
import csv
import io
import json
import os
import re
import shutil
import subprocess
import sys
import threading
import time
from pathlib import Path

import numpy as np
import pytest
import rasterio
from affine import Affine

from profiler.cli import main
from profiler.cli.app import root
from profiler.hopfile import load_hop, starter

ROOT = Path(__file__).resolve().parent.parent

PASSING = """\
name = "Over the plain"
frequency_ghz = 7.5
polarization = "vertical"

[site_a]
name = "South"
position = "46.0, 9.0"
antenna_m = 40

[site_b]
name = "North"
position = "46.18, 9.0"
antenna_m = 40

[terrain]
paths = ["dem.tif"]

[rules]
preset = "1.0-and-0.3-f1"

[radio.a]
power_dbm = 27
gain_dbi = 36

[radio.b]
power_dbm = 27
gain_dbi = 36

[[radio.mode]]
name = "QPSK"
threshold_dbm = -86

[availability]
multipath_method = "p530-17-quick"
dn1_n_km = -300
rain_rate_mm_h = 30

[availability.objective]
year_percent = 0.01

[confidence]
terrain_rmse_m = 2.0
correlation_m = 100
draws = 200

[heights.a]
highest_m = 60
[heights.b]
highest_m = 60
"""
PLAIN = PASSING[: PASSING.index("[availability]")] + PASSING[PASSING.index("[heights.a]") :]
FAILING = PASSING.replace("antenna_m = 40", "antenna_m = 5")


@pytest.fixture(scope="module")
def land(tmp_path_factory):
    """Write a plain with rasters that are no terrain beside it, once."""
    folder = tmp_path_factory.mktemp("land")
    cell, shape = 1 / 600, (120, 24)
    affine = Affine(cell, 0.0, 8.98, 0.0, -cell, 46.19)

    def write(name, cells, *, crs="EPSG:4326", transform=affine, driver="GTiff", **options):
        cells = np.atleast_3d(cells.T).T
        size = {"count": cells.shape[0], "height": cells.shape[1], "width": cells.shape[2], "dtype": cells.dtype}
        with rasterio.open(
            folder / name, "w", driver=driver, crs=crs, transform=transform, **size, **options
        ) as raster:
            raster.write(cells)

    plain = np.full(shape, 100, dtype="int16")
    write("dem.tif", plain)
    write("nocrs.tif", plain, crs=None)
    write("photo.tif", np.full((3, *shape), 90, dtype="uint8"))
    write("void.tif", np.where(np.arange(120)[:, None] == 60, -9999, plain).astype("int16"), nodata=-9999)
    write("egm96.tif", plain[:60], crs="EPSG:4326+5773")
    write("egm2008.tif", plain[60:], crs="EPSG:4326+3855", transform=affine @ Affine.translation(0, 60))
    write("trees.tif", np.full(shape, 50, dtype="uint8"))
    (folder / "cut.tif").write_bytes((folder / "dem.tif").read_bytes()[:200])
    (folder / "text.tif").write_text("not a raster")
    return folder


@pytest.fixture
def here(land, tmp_path, monkeypatch):
    """Stand in a folder with the rasters and three hop files."""
    for raster in land.iterdir():
        shutil.copy(raster, tmp_path)
    (tmp_path / "hop.toml").write_text(PASSING)
    (tmp_path / "fails.toml").write_text(FAILING)
    (tmp_path / "plain.toml").write_text(PLAIN)
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
        out, err = capfd.readouterr()
        return stop.value.code, out, err

    return call


@pytest.fixture
def refused(run):
    """Run what must be refused: exit code 2, nothing on standard output, one line on standard error."""

    def call(*words):
        code, out, err = run(*words)
        assert (code, out) == (2, "")
        assert err.startswith("hopwright: ")
        assert err.count("\n") == 1
        assert err.endswith("\n")
        return err.removeprefix("hopwright: ").rstrip()

    return call


OPTIONS = ("--a", "46.0, 9.0", "--b", "46.18N 9E", "--antenna-a", "40", "--antenna-b", "131.25 ft",
           "--frequency-ghz", "7.5", "--terrain", "dem.tif", "--preset", "1.0-and-0.3-f1")  # fmt: skip


def changed(**values):
    """Give the words of the quick hop with the values of some options replaced, ``antenna_a="5"``."""
    words = list(OPTIONS)
    for name, value in values.items():
        words[words.index("--" + name.replace("_", "-")) + 1] = value
    return words


# What the commands print and write ------------------------------------------------------------------------------------


def test_the_verdict_comes_first_and_sets_the_exit_code(run):
    code, out, err = run("study", "hop.toml")
    assert (code, err) == (0, "")
    first, second, *_ = out.splitlines()
    assert first == "Over the plain: PASSES, more than 99.9 % chance of clearing, 90 % asked"
    assert second.startswith("Clears every rule; tightest ")
    code, out, _ = run("study", "fails.toml")
    assert code == 1
    assert re.match(
        r"Over the plain: FAILS, less than 0\.1 % chance of clearing, 90 % asked\nDoes not clear: \d+\.\d m short, ",
        out,
    )


def test_the_long_output_says_all_that_was_assumed(run):
    _, out, _ = run("study", "hop.toml", "--full")
    for part in ("Tight places", "Reflection points", "budget, mode QPSK", "Availability", "Confidence", "Assumed"):
        assert part in out
    assert "rules of preset 1.0-and-0.3-f1" in out
    assert "no raster declares its vertical datum" in out
    assert "ground: dem.tif at 100 % of the path" in out
    assert "point refractivity gradient dN1 −300 N/km: given" in out
    assert "terrain error: RMSE 2 m (hop file)" in out
    assert "200 draws, seed 1" in out
    assert "A screening result, not a certificate" in out


def test_what_many_rasters_have_in_common_is_said_once(run, here):
    with rasterio.open("dem.tif") as whole:
        profile, cells = whole.profile, whole.read()
    for number in range(5):
        transform = profile["transform"] @ Affine.translation(0, 24 * number)
        with rasterio.open(f"band{number}.tif", "w", **{**profile, "height": 24, "transform": transform}) as raster:
            raster.write(cells[:, 24 * number : 24 * (number + 1)])
    paths = ", ".join(f'"band{number}.tif"' for number in range(5))
    (here / "bands.toml").write_text(PASSING.replace('"dem.tif"', paths))
    _, out, _ = run("study", "bands.toml", "--full")
    assert "\n  - 5 rasters: declares no vertical datum\n" in out
    assert out.count("declares no vertical datum") == 1
    assert re.search(r"ground: (band\d\.tif at \d+ % of the path, ){3}and 2 more\n", out)


def test_a_survey_is_told_on_the_terminal(run, here):
    (here / "survey.toml").write_text(PASSING.replace("antenna_m = 40", "antenna_m = 40\nground_m = 97.5", 1))
    assert (
        "South: surveyed ground 97.50 m, 2.50 m below that of the terrain" in run("study", "survey.toml", "--full")[1]
    )


def test_a_rule_that_only_the_ground_beside_fails_says_so(run, here):
    """At 0.1 GHz 0.7 F1 reaches 86 m to both sides; the wall rises from the middle of the next cell, 64 m east."""
    with rasterio.open("dem.tif", "r+") as raster:
        cells = raster.read(1)
        cells[55:65, 13:] += 1000
        raster.write(cells, 1)
    rule = "rule = [{k = 1.3333, fresnel_fraction = 0.7}]"
    text = PLAIN.replace("7.5", "0.1").replace('preset = "1.0-and-0.3-f1"', rule)
    (here / "wall.toml").write_text(text.replace("antenna_m = 40", "antenna_m = 100"))
    code, out, _ = run("study", "wall.toml", "--full")
    assert code == 1
    place = r"(9|10)\.\d\d km, \d\d m right"
    assert re.search(rf"0\.7 F1 at k = 4/3 +FAIL +−\d+\.\d  {place}", out)  # in the table of rules
    assert re.search(rf"\n{place} +\d+\.\d +0\.0 ", out)  # among the tight places


def test_quiet_prints_the_verdict_only(run):
    _, out, err = run("study", "hop.toml", "--quiet")
    assert len(out.splitlines()) == 3
    assert out.splitlines()[2].startswith("Warning: the finest terrain has cells of 129 m")
    assert "more than 99.9 % chance of clearing" in out
    assert err == ""


EVERY_TABLE = [
    ("study", "hop.toml", "--full"),
    ("study", "fails.toml", "--full", "--feet"),
    ("heights", "fails.toml", "--full"),
    ("losses", "fails.toml", "--full"),
    ("reach", "hop.toml", "--full"),
    ("terrain", "egm96.tif", "egm2008.tif", "dem.tif", "cut.tif"),
]


@pytest.fixture
def terminal(run, monkeypatch):
    """Run the command line as at a terminal of some width that has colors, whatever this test itself runs at."""

    def call(*words, width=80, **environment):
        monkeypatch.delenv("NO_COLOR", raising=False)
        for name, value in {"FORCE_COLOR": "1", "TERM": "xterm", "COLUMNS": str(width), **environment}.items():
            monkeypatch.setenv(name, value)
        return run(*words)[1]

    return call


@pytest.mark.parametrize("words", EVERY_TABLE)
def test_a_terminal_gets_colors_unless_they_are_refused(terminal, run, words):
    """By the option or by NO_COLOR, set and not empty (https://no-color.org); bold is an escape too."""
    assert "\x1b[1" in terminal(*words)
    assert "\x1b[1" in terminal(*words, NO_COLOR="")
    assert "\x1b" not in terminal(*words, NO_COLOR="1")
    assert "\x1b" not in terminal(*words, "--no-color")


@pytest.mark.parametrize("words", EVERY_TABLE)
def test_a_file_gets_no_colors(run, words):
    assert "\x1b" not in run(*words)[1]


@pytest.mark.parametrize("words", EVERY_TABLE)
def test_no_word_and_no_number_is_split(terminal, words):
    """At every width each word is one that stands in the widest output, and no line is wider but for a long word."""

    def tokens(text):
        return set(re.findall(r"[^\s;:,|─]+", text))

    whole = tokens(terminal(*words, "--no-color", width=1000))
    for width in (40, 60, 80, 110, 160):
        out = terminal(*words, "--no-color", width=width)
        assert tokens(out) <= whole
        wide = [line for line in out.splitlines() if len(line.rstrip()) > width]
        assert [line for line in wide if len(line.strip(" -").split()) > 1] == []


@pytest.mark.skipif(sys.platform == "win32", reason="no pseudo-terminals there")
def test_a_real_terminal_is_measured(here):
    import fcntl
    import pty
    import struct
    import termios

    main_end, terminal_end = pty.openpty()
    fcntl.ioctl(terminal_end, termios.TIOCSWINSZ, struct.pack("HHHH", 50, 60, 0, 0))
    unset = ("COLUMNS", "LINES", "NO_COLOR", "FORCE_COLOR", "TTY_COMPATIBLE")
    environment = {name: value for name, value in os.environ.items() if name not in unset}
    command = [sys.executable, "-m", "profiler", "study", "hop.toml"]
    environment |= {"PYTHONPATH": str(ROOT), "TERM": "xterm"}
    with subprocess.Popen(command, stdin=terminal_end, stdout=terminal_end, env=environment) as running:
        os.close(terminal_end)
        text = b""
        with contextlib.suppress(OSError):  # how Linux says that the other end is closed
            while piece := os.read(main_end, 4096):
                text += piece
        assert running.wait(timeout=60) == 0
    os.close(main_end)
    assert b"\x1b[1;32mOver the plain: PASSES, more than 99.9 %" in text
    lines = re.sub(r"\x1b\[[\d;]*m", "", text.decode()).splitlines()
    assert 50 < max(len(line) for line in lines) <= 60


def test_feet_and_miles_on_request(run):
    _, out, _ = run("study", "hop.toml", "--feet", "--full")
    assert "12.432 mi" in out  # 20.0076 km / 1.609344
    heights = r"328\.1 +131\.2 +459\.3"  # 100 m, 40 m and 140 m / 0.3048
    assert re.search(rf"ground +antenna +centre.*\n.* ft +ft +ft .*\n.*\nA  South .* {heights} ", out)
    assert re.search(r" points at most \d+\.\d ft\s+apart", out)


@pytest.mark.parametrize(
    ("command", "schema"),
    [
        (("study", "hop.toml"), "hopwright-study/1"),
        (("study", "fails.toml"), "hopwright-study/1"),
        (("heights", "plain.toml"), "hopwright-heights/1"),
        (("losses", "hop.toml"), "hopwright-losses/1"),
        (("reach", "hop.toml"), "hopwright-reach/1"),
        (("terrain", "dem.tif"), "hopwright-terrain/1"),
    ],
)
def test_json_to_standard_output_is_one_document_and_nothing_else(run, command, schema):
    _, out, err = run(*command, "--json", "-")
    assert err == ""
    assert json.loads(out, parse_constant=pytest.fail)["schema"] == schema  # NaN and Infinity are not JSON


def test_json_to_a_file_leaves_the_terminal_its_verdict(run, here):
    code, out, _ = run("study", "hop.toml", "--json", "out.json", "-q")
    assert code == 0
    assert out.startswith("Over the plain: PASSES")
    document = json.loads((here / "out.json").read_text(encoding="utf-8"))
    assert document["verdict"]["outcome"] == "passes"
    assert document["provenance"]["hop_file"] == "hop.toml"


def test_the_same_input_gives_the_same_document(run):
    documents = [json.loads(run("study", "hop.toml", "--json", "-")[1]) for _ in range(2)]
    for document in documents:
        del document["provenance"]["created"]
    assert documents[0] == documents[1]


def test_csv_is_the_point_table(run):
    _, out, err = run("study", "hop.toml", "--csv", "-")
    assert err == ""
    rows = list(csv.DictReader(io.StringIO(out)))
    document = json.loads(run("study", "hop.toml", "--json", "-")[1])
    assert len(rows) == document["path"]["points"]
    surplus = [float(row["rule1_least_surplus_m"]) for row in rows]
    assert min(surplus) == document["rules"][0]["critical"]["surplus_m"]
    assert rows[0]["rule1_ratio"] == ""  # 0/0 at the sites
    assert float(rows[-1]["distance_m"]) == document["path"]["distance_m"]


def test_figures_are_written_whole(run, here):
    figures = ("A.PNG", "a.svg", "a.pdf")
    code, _, err = run("study", "hop.toml", "-q", *(word for name in figures for word in ("--figure", name)))
    assert (code, err) == (0, "")
    assert (here / "A.PNG").read_bytes().startswith(b"\x89PNG\r\n")
    assert b"IEND" in (here / "A.PNG").read_bytes()[-12:]
    drawing = (here / "a.svg").read_text()
    assert drawing.rstrip().endswith("</svg>")
    assert "<image" in drawing  # the ground seen from above
    assert (here / "a.pdf").read_bytes().startswith(b"%PDF")
    assert (here / "a.pdf").read_bytes().rstrip().endswith(b"%%EOF")
    assert [path for path in here.iterdir() if path.name.startswith(".")] == []


def test_the_margin_and_the_heights_figure(run, here):
    assert run("study", "hop.toml", "-q", "--margin-figure", "margin.png")[0] == 0
    assert run("heights", "plain.toml", "-q", "--figure", "heights.png")[0] == 0
    for name in ("margin.png", "heights.png"):
        assert (here / name).stat().st_size > 10_000


def test_a_hop_without_a_file(run):
    code, out, err = run("study", *OPTIONS, "--full")
    assert (code, err) == (0, "")
    assert out.startswith("A to B: PASSES")
    assert re.search(r"\nB  B  +46\.180000   9\.000000 +100\.0 +40\.0 +140\.0 ", out)  # 131.25 ft
    own = [word for word in OPTIONS if word not in ("--preset", "1.0-and-0.3-f1")]
    assert run("study", *own, "--rule", "1", "0.6", "3", "-q")[0] == 0
    assert run("study", *own, "--rule", "1", "0.6", "60", "-q")[0] == 1


def test_heights_writes_the_pair_into_a_copy_that_passes(run, here):
    code, out, _ = run("heights", "fails.toml", "--write", "raised.toml")
    assert code == 0
    said = " ".join(out.split())
    assert "keep a fade margin, meet the availability objective and clear with 90 % chance" in said
    assert "Re-checked through every rule, along the path and beside it: passes" in said
    before, after = load_hop(here / "fails.toml"), load_hop(here / "raised.toml")
    assert after.site_a.antenna_m > before.site_a.antenna_m
    assert after.rules == before.rules
    assert run("study", "fails.toml", "-q")[0] == 1
    assert run("study", "raised.toml", "-q")[0] == 0


def test_heights_that_cannot_be_had_end_with_1_and_say_what_would_do(run, here):
    (here / "low.toml").write_text(PASSING.replace("highest_m = 60", "highest_m = 9"))
    code, out, err = run("heights", "low.toml", "--write", "raised.toml")
    assert code == 1
    assert out.splitlines()[0] == "Over the plain: FAILS"
    assert "No pair clears: at the highest there is, A 9.0 m and B 9.0 m" in out
    assert "Next: look for a relay, a passive reflector or another site" in out
    assert not (here / "raised.toml").exists()
    assert err == "raised.toml: not written, since no pair of heights does all that is asked\n"


def test_heights_as_csv_names_what_governs(run):
    _, out, _ = run("heights", "plain.toml", "--csv", "-")
    rows = list(csv.DictReader(io.StringIO(out)))
    assert {row["rule"] for row in rows} <= {"0", "1", "2"}
    assert all(float(row["antenna_a_m"]) > 0 for row in rows)


def test_losses_lists_every_method(run):
    code, out, _ = run("losses", "fails.toml", "--full")
    assert code == 0
    for method in ("delta-bullington (chosen)", "knife-edge", "spherical-earth", "cascaded-edges"):
        assert method in out
    document = json.loads(run("losses", "fails.toml", "--json", "-")[1])
    assert len({(loss["method"], loss["k"]) for loss in document["diffraction"]}) == 14  # 7 methods at 2 k
    rows = [line.split() for line in out.splitlines()]
    for loss in document["diffraction"]:
        if loss["method"] == "rounded-obstacle":
            top = loss["top"]
            shown = f"{top['radius_m']:.0f} {top['roundness']:.3f} {top['from_m'] / 1e3:.3f} {top['to_m'] / 1e3:.3f}"
            assert ["k", "=", {4 / 3: "4/3", 2 / 3: "2/3"}[loss["k"]], *shown.split()] in rows


def test_a_study_says_by_which_edges_a_loss_came_about(run):
    _, out, _ = run("study", "fails.toml", "--full")
    document = json.loads(run("study", "fails.toml", "--json", "-")[1])
    for loss in document["diffraction"]:
        places = [f"{edge['distance_m'] / 1000:.2f}" for edge in loss["edges"] if edge["loss_db"] is not None]
        k = {4 / 3: "4/3", 2 / 3: "2/3"}[loss["k"]]
        line = f"Diffraction at k = {k}: {loss['loss_db']:.1f} dB by {loss['method']}"
        assert f"{line}, edge at {' '.join(places)} km" in out


def test_reach_answers_both_ways(run):
    """27 + 36 + 36 + 86 = 185 dB of free space at 7.5 GHz: 10^((185 - 92.45)/20)/7.5 = 5 650 km."""
    answers = json.loads(run("reach", "hop.toml", "--json", "-")[1])["answers"]
    for way in ("a_to_b", "b_to_a"):
        assert answers[way]["longest_free_space_range"]["value"] == pytest.approx(5.65e6, rel=2e-3)
        # 135.9 dB of free space over 20.0 km, and 0.2 dB of gases: 185 - 136.1 = 48.9 dB less power would do
        assert answers[way]["least_power"]["value"] == pytest.approx(27 - 48.9, abs=0.1)
        assert answers[way]["least_gain_both"]["value"] == pytest.approx(36 - 48.9 / 2, abs=0.1)
    assert list(json.loads(run("reach", "hop.toml", "--direction", "b_to_a", "--json", "-")[1])["answers"]) == [
        "b_to_a"
    ]


def test_reach_says_by_which_mode_and_margin(run):
    said = " ".join(run("reach", "hop.toml")[1].split())
    assert "what the radio reaches with mode QPSK and a fade margin of 0.0 dB." in said
    said = " ".join(run("reach", "hop.toml", "--fade-margin-db", "25")[1].split())
    assert "with mode QPSK and a fade margin of 25.0 dB." in said


def test_reach_adds_up_on_the_terminal(run):
    """Every table is of signed terms and ends with their sum."""
    _, out, _ = run("reach", "hop.toml", "--fade-margin-db", "10", "--resize", "b", "--efficiency", "0.6", "--full")
    assert re.search(r"smallest dish at B on this hop: 0\.\d\d m A to B and 0\.\d\d m B to A", out)
    assert re.search(r"less threshold +\+86\.00 +\+86\.00  dBm", out)
    assert re.search(r"less fade margin +−10\.00", out)
    out = out.replace("−", "-")
    tables = [table for table in out.split("\n\n") if " unit  by" in table]
    assert len(tables) == 4  # the range and the power for both ways, and the dish for each
    for table in tables:
        *terms, total = (float(row[1]) for row in re.finditer(r" ([+-]?\d+\.\d\d) .*dB", table.replace("- ", "")))
        assert sum(terms) == pytest.approx(total, abs=0.06)


def test_terrain_says_what_a_folder_holds(run, here):
    code, out, _ = run("terrain", "dem.tif")
    assert code == 0
    assert out.startswith("dem.tif\n  24 x 120 cells of 128.9 x 185.3 m, EPSG:4326, vertical datum not stated\n")
    assert "longitude 8.980 to 9.020, latitude 45.990 to 46.190; heights 100 to 100 m, no voids" in out
    assert out.count("declares no vertical datum") == 1
    code, out, _ = run("terrain", "dem.tif", "void.tif", "--metadata-only")
    assert code == 0
    assert "heights" not in out
    code, out, _ = run("terrain", here)
    assert code == 1  # a study on the folder would stop
    assert "Cannot be used: a study on this terrain stops\n" in out
    assert "Left out" in out
    assert re.search(r"\n\n4 rasters, .*; heights 100 to 100 m, voids 0\.28%\n", out)  # 24 of 8640 cells


def test_terrain_says_that_datums_differ(run):
    _, out, _ = run("terrain", "egm96.tif", "egm2008.tif", "dem.tif")
    assert "Vertical datums MIXED: EGM96 geoid, EGM2008 geoid, 1 not stated" in out
    _, out, _ = run("terrain", "egm96.tif", "dem.tif")
    assert "Vertical datums in part not stated: EGM96 geoid, 1 not stated" in out


def test_terrain_says_whether_and_where_a_hop_leaves_it(run, here):
    """The void row is from 46.0883 to 46.0900 degrees north, 9.82 to 10.00 km from A; half a cell more is unknown."""
    code, out, _ = run("terrain", "dem.tif", "--hop", "hop.toml")
    assert code == 0
    assert "hop.toml: 100.0% of the path has ground" in out
    code, out, _ = run("terrain", "void.tif", "--hop", "hop.toml")
    assert code == 1
    assert "hop.toml: cannot be studied on this terrain: 98.2% of the path has ground" in out
    assert re.search(r"from 9\.8\d\d to 10\.0\d\d km \(longitude 9\.00000, latitude 46\.08", out)
    code, out, _ = run("terrain", "egm96.tif", "--hop", "hop.toml")
    assert code == 1
    assert "South: longitude 9.000000, latitude 46.000000: lies off the terrain, about" in out
    (here / "filled.toml").write_text(PASSING.replace('["dem.tif"]', '["dem.tif"]\nmissing = "interpolate"'))
    code, out, _ = run("terrain", "void.tif", "--hop", "filled.toml")
    assert code == 0
    assert "98.2% of the path has ground, the rest is interpolated, as the hop file allows" in out


def test_terrain_is_read_as_the_hop_says(run, here):
    settings = 'height_unit = "ft"\nvertical_datum = "EGM96"\nallow_mixed_datums = true'
    (here / "own.toml").write_text(PASSING.replace('["dem.tif"]', f'["dem.tif"]\n{settings}'))
    code, out, _ = run("terrain", "dem.tif", "--hop", "own.toml")
    assert code == 0
    assert "heights 30 to 30 m" in out  # 100 ft
    assert "vertical datum EGM96" in out
    both = ("terrain", "egm96.tif", "egm2008.tif", "--hop")
    assert run(*both, "own.toml")[0] == 0
    code, out, _ = run(*both, "hop.toml")
    assert code == 1
    assert "\nheights on different vertical datums meet on " in out


def test_many_rasters_are_told_by_kind(run, here):
    for number in range(14):
        shutil.copy("dem.tif", here / f"copy{number:02}.tif")
    words = ("terrain", "egm96.tif", *(f"copy{number:02}.tif" for number in range(14)))
    _, out, _ = run(*words)
    assert re.search(r"\n\.: 14 rasters \(GTiff\)\n  cells of 128\.9 x 185\.3 m, ", out)
    assert out.startswith("egm96.tif\n")
    assert out.count("declares no vertical datum") == 1
    _, out, _ = run(*words, "--all")
    assert out.count("declares no vertical datum") == 14
    assert "\ncopy07.tif\n" in out


def test_the_starter_studies_the_sample_country(run, here):
    """The commented file is about the invented country: put its raster where the file says, and it runs."""
    assert run("starter", "new.toml")[0] == 0
    assert (here / "new.toml").read_text(encoding="utf-8") == starter()
    assert run("starter", "-")[1] == starter()
    (here / "terrain").mkdir()
    shutil.copy(ROOT / "sample_dem" / "country.tif", here / "terrain")
    code, out, err = run("study", "new.toml", "-q")
    assert (code in (0, 1), err) == (True, "")
    assert out.startswith("Western ridge to eastern ridge: ")


@pytest.mark.parametrize(("name", "code"), [("ridge_to_mill", 0), ("quarry_to_island", 1)])
def test_the_sample_hops(run, name, code):
    assert run("study", ROOT / "sample_dem" / f"{name}.toml", "-q")[0] == code


def test_every_command_has_help(run):
    code, out, _ = run("--help")
    assert code == 0
    for name, command in root.commands.items():
        first = command.help.partition("\n")[0]
        assert re.search(rf"  {name} +{re.escape(first)}\n", out)  # whole, not cut short
        code, text, _ = run(name, "--help")
        assert code == 0
        assert text.startswith(f"Usage: hopwright {name}")
    assert run()[1] == out


# Files: whole or not at all -------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    "words",
    [
        ("--figure", "good.png", "--json", "no/such/folder.json"),
        ("--figure", "good.png", "--figure", "picture.gif"),
        ("--json", "good.json", "--csv", "."),
        ("--csv", "good.csv", "--figure", "picture.jpeg"),
    ],
)
def test_nothing_is_written_when_one_output_cannot_be(refused, here, words):
    refused("study", "hop.toml", *words)
    assert not list(here.glob("good.*"))


def test_a_full_disk_leaves_the_old_file_as_it_was(refused, here, monkeypatch):
    (here / "out.json").write_text("old")

    def full(*_):
        raise OSError(28, "No space left on device")

    monkeypatch.setattr("profiler.cli.files.os.fsync", full)
    message = refused("study", "hop.toml", "--json", "out.json", "-q")
    assert message == "out.json: No space left on device: must be a file that can be written here; name another"
    assert (here / "out.json").read_text() == "old"
    assert [path for path in here.iterdir() if path.name.startswith(".")] == []


def test_a_link_is_followed_and_a_pipe_is_not_replaced(run, here):
    (here / "link.json").symlink_to("real.json")
    run("study", "hop.toml", "-q", "--json", "link.json")
    assert (here / "link.json").is_symlink()
    assert json.loads((here / "real.json").read_text())["schema"]
    os.mkfifo(here / "pipe")
    got = []
    reader = threading.Thread(target=lambda: got.append((here / "pipe").read_text()))
    reader.start()
    run("study", "hop.toml", "-q", "--csv", "pipe")
    reader.join(timeout=10)
    assert got[0].startswith("distance_m,")
    assert (here / "pipe").is_fifo()


@pytest.mark.parametrize(
    ("words", "message"),
    [
        (("study", "hop.toml", "--json", "-", "--csv", "-"), "-: must stand once"),
        (("study", "hop.toml", "--json", "hop.toml"), "hop.toml: must not be the hop file too"),
        (("study", "hop.toml", "--json", "x", "--csv", "x"), "x: must not be another output too"),
        (("study", "hop.toml", "--figure", "x.png", "--margin-figure", "x.png"), "x.png: must not be another output"),
        (("heights", "hop.toml", "--write", "hop.toml"), "hop.toml: must not be the hop file too"),
        (("study", "hop.toml", "--figure", "x.gif"), "x.gif: must end in one of .png, .svg, .pdf"),
        (("study", "hop.toml", "--figure", "x"), "x: must end in one of .png"),
        (("study", "hop.toml", "--json", "no/x.json"), "no/x.json: must be a file in a folder that exists"),
        (("study", "hop.toml", "--json", "y" * 300), "File name too long: must be a file"),
        (("study", "hop.toml", "--figure", "x.png", "--height-limits", "9", "3"), "height_limits = 9, 3: must be two"),
        (("heights", *OPTIONS, "--write", "x.toml"), "--write: must have a hop file to copy"),
        (("starter", "hop.toml"), "hop.toml: exists already: must be a new file"),
        (("starter", "no/x.toml"), "no/x.toml: must be a file in a folder that exists"),
        (("terrain", "dem.tif", "--json", "."), ".: must be a file in a folder that exists"),
    ],
)
def test_outputs_that_cannot_be(refused, words, message):
    assert message in refused(*words)


# Bad input: one line that says which, where, what and what would do ---------------------------------------------------


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("frequency_ghz", "frequenzy_ghz", "frequenzy_ghz = 7.5: must be a known key; did you mean frequency_ghz?"),
        ("antenna_m = 40", "antena_m = 40", "site_a.antena_m = 40: must be a known key; did you mean antenna_m?"),
        ("7.5", "-7.5", "frequency_ghz = -7.5: must be 0.01 to 1000 GHz"),
        ("7.5", "nan", "frequency_ghz = nan: must be a number, 0.01 to 1000 GHz"),
        ("7.5", "1e400", "frequency_ghz = inf: must be a number"),
        ("7.5", "1" + "0" * 5000, "must be TOML: exceeds the limit"),
        ("7.5", '"fast"', "frequency_ghz = 'fast': must be a number"),
        ("antenna_m = 40", "antenna_m = 1e9", "site_a.antenna_m = 1000000000.0: must be more than 0 and under 2000 m"),
        ("antenna_m = 40", "antenna_m = 40\nantenna_m = 41", "line 9, column 15: must be TOML: cannot overwrite"),
        ('"46.0, 9.0"', '"9.0, 46.0"', "longitude and latitude look swapped: longitude 9.000000, latitude 46.000000"),
        ('"46.0, 9.0"', '"40.0, 9.0"', "South: longitude 9.000000, latitude 40.000000: lies off the terrain, about"),
        ('"46.0, 9.0"', '"46.18, 9.0"', "site_b = '46.180000, 9.000000': must be another place than site_a"),
        ('"46.0, 9.0"', '"somewhere"', "site_a.position = 'somewhere': must be a position"),
        ('"46.0, 9.0"', '"95, 9"', "site_a.position = '95, 9': must be a latitude of -90 to 90 degrees"),
        ('"1.0-and-0.3-f1"', '"high"', "rules.preset = 'high': must be one of 'p530-isolated',"),
        ('preset = "1.0-and-0.3-f1"', "", "rules.preset = (missing): must be given"),
        ('preset = "1.0-and-0.3-f1"', "rule = [{k = 0, fresnel_fraction = 1}]", "rules.rule[0].k = 0: must be 0.1"),
        ("dem.tif", "gone.tif", "terrain.paths[0] = 'gone.tif': must be a raster or a folder of rasters that is there"),
        ("dem.tif", "nocrs.tif", "nocrs.tif: has no coordinate reference system"),
        ("dem.tif", "photo.tif", "photo.tif: is a photo (3-band color or grey image), not heights"),
        ("dem.tif", "cut.tif", "cut.tif: not readable as a raster"),
        ("dem.tif", "text.tif", "text.tif: not readable as a raster"),
        ("dem.tif", "void.tif", "no ground height at "),
        ('"dem.tif"', '"egm96.tif", "egm2008.tif"', "heights on different vertical datums meet on"),
        ("dem.tif", "trees.tif", "trees.tif: holds 8-bit cells"),
        ('["dem.tif"]', "[]", "terrain.paths = []: must be a list with at least one text"),
        ('["dem.tif"]', '["dem.tif"]\nspacing_m = 5000', "terrain.spacing_m = 5000: must be at most one 50th of this"),
        ('["dem.tif"]', '["dem.tif"]\nspacing_m = 1e-9',
         "bad.toml: terrain.spacing_m = 1e-09: must be more than 0.01 m"),
        ("[rules]", '[cover]\ncanopy = ["trees.tif"]\n[rules]', "site_a.antenna_m = 40: must be above the 50.0 m of"),
        ("threshold_dbm = -86", "threshold_dbm = -86\nmodulation = 'FM'\nnoise_figure_db = 5\nbandwidth_mhz = 28\n"
         "bit_error_ratio = 1e-6", "bad.toml: radio: mode QPSK: modulation = FM: must be BPSK, QPSK"),
        ("dn1_n_km = -300\n", "", "bad.toml: availability.dn1_n_km = not given: must be given for multipath_method"),
        ("draws = 200", "draws = 2", "confidence.draws = 2: must be 100 to 1000000"),
        ("highest_m = 60\n[", "highest_m = 60\nlowest_m = 70\n[", "heights.a.highest_m = 60: must be at least"),
    ],
)  # fmt: skip
def test_a_bad_hop_file(refused, here, old, new, message):
    assert old in PASSING
    (here / "bad.toml").write_text(PASSING.replace(old, new, 1))
    line = refused("study", "bad.toml")
    assert line.startswith("bad.toml: ")
    assert message in line


@pytest.mark.parametrize(
    ("old", "new", "remedy"),
    [
        ('"dem.tif"', '"../void.tif"', 'set terrain.missing = "interpolate"'),
        ('"dem.tif"', '"../egm96.tif", "../egm2008.tif"', "set terrain.allow_mixed_datums = true"),
        ('["dem.tif"]', '["../dem.tif"]\nheight_unit = "furlong"', "terrain.height_unit: height unit 'furlong' is not"),
        (
            '["dem.tif"]',
            '["../dem.tif"]\nvertical_datum = "EPSG:1"',
            "terrain.vertical_datum: vertical datum EPSG:1: must",
        ),
    ],
)
def test_the_file_is_named_as_it_was_typed_and_the_remedy_by_its_key(refused, here, old, new, remedy):
    (here / "sub").mkdir()
    (here / "sub" / "bad.toml").write_text(PASSING.replace(old, new, 1))
    line = refused("study", "sub/bad.toml")
    assert line.startswith("sub/bad.toml: ")
    assert line.count("bad.toml") == 1
    assert remedy in line


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", "frequency_ghz = (missing): must be a number, 0.01 to 1000 GHz"),
        (b"# nothing\n", "frequency_ghz = (missing)"),
        (bytes(range(256)), "byte 0x80: must be UTF-8 text"),
        (PASSING.encode("utf-16"), "line 1: byte 0xff: must be UTF-8 text"),
        (b"[site_a", 'must be TOML: expected "]"'),
        (b"a = " + b"[" * 5000, "nested too deeply"),
        (b"a." * 30_000 + b"a = 1", "line 1: must be TOML that is nested a few levels deep"),
        (b"\n\n[" + b'"a" . ' * 30_000 + b"a]", "line 3: must be TOML that is nested a few levels deep"),
        (b"x = {" + b"'a'." * 30_000 + b"a = 1}", "line 1: must be TOML that is nested a few levels deep"),
        (b"#" * 1_000_001, "must be a hop file of at most 1 MB"),
        (b"a" * 1_000_000, "must be TOML"),
        (
            b"name = '" + b"x" * 40_000 + b"'",
            "name = xxxxxxxxxxxxxxxxxxxx…: must be at most 1000 characters, not 40000",
        ),
        (b"x" * 10_000 + b" = 1", "the key xxxxxxxxxxxxxxxxxxxx…: must be at most 1000 characters, not 10000"),
        (b"[site_a]\nposition = '" + b"1 " * 20_000 + b"'", "site_a.position = 1 1 1"),
        (b'x = {"\\u001b[2J\\u202e" = 1}', "x = {\\x1b[2J\\u202e = 1}: must be a known key"),
    ],
)
def test_a_file_that_is_no_hop_file(refused, here, content, message):
    (here / "bad.toml").write_bytes(content)
    started = time.monotonic()
    line = refused("study", "bad.toml")
    assert time.monotonic() - started < 2.0
    assert message in line
    assert len(line) < 1000


def test_a_pipe_or_a_device_is_no_hop_file(refused, here):
    """Neither is opened: the one would wait for a writer, the other never end."""
    os.mkfifo(here / "pipe.toml")
    for file in ("pipe.toml", "/dev/zero"):
        assert refused("study", file).startswith(f"{file}: must be a regular file, not a pipe or a device")


@pytest.mark.parametrize("command", ["study", "heights", "losses", "reach"])
def test_a_hop_file_that_is_not_there(refused, command):
    assert refused(command, "gone.toml") == "gone.toml: No such file or directory: must be a hop file that can be read"
    assert refused(command, ".") == ".: Is a directory: must be a hop file that can be read"


@pytest.mark.parametrize(
    ("words", "message"),
    [
        (("study",), "--a, --b, --antenna-a, --antenna-b, --frequency-ghz, --terrain: must be given for a hop without"),
        (
            ("study", "hop.toml", "--frequency-ghz", "7000"),
            "command line: --frequency-ghz = 7000.0: must be 0.01 to 1000",
        ),
        (("study", "a.toml", "b.toml"), "Got unexpected extra argument (b.toml)"),
        (("study", "--nonsense"), "No such option"),
        (
            ("nonsense",),
            "No such command 'nonsense': must be one of study, heights, losses, reach, screen, compare, terrain,"
            " starter",
        ),
        (
            ("Study3",),
            "No such command 'Study3': must be one of study, heights, losses, reach, screen, compare, terrain, starter;"
            " did you mean study?",
        ),
        (("study", *changed(frequency_ghz="-7")), "command line: --frequency-ghz = -7.0: must be 0.01 to 1000 GHz"),
        (("study", *changed(frequency_ghz="nan")), "command line: --frequency-ghz = nan: must be a number"),
        (("study", *changed(frequency_ghz="x")), "'--frequency-ghz': 'x' must be a number, like 7.5"),
        (("study", *changed(antenna_a="tall")), "--antenna-a = 'tall': must be a number with its unit in quotes, like"),
        (("study", *changed(antenna_b="-5")), "--antenna-b = -5.0: must be more than 0 and under 2000 m"),
        (("study", *changed(terrain="")), "--terrain = '': must be text in quotes, not empty"),
        (
            ("study", *changed(terrain="site_a")),
            "--terrain = 'site_a': must be a raster or a folder of rasters that is"
            " there; paths start from the folder that you are in",
        ),
        (("study", *changed(a="46.18N 9E")), "--b = '46.180000, 9.000000': must be another place than --a"),
        (("study", *changed(a="somewhere")), "--a = 'somewhere': must be a position"),
        (("study", *changed(a="9.0, 46.0")), "longitude and latitude look swapped"),
        (("study", *changed(preset="none")), "--preset = 'none': must be one of"),
        (("study", *OPTIONS, "--low-k", "0.8"), "--low-k = 0.8: must be left out beside preset"),
        (("study", *OPTIONS, "--rule", "nan", "1", "0"), "--rule K = nan: must be a number"),
        (("study", "hop.toml", "--rule", "1", "1"), "'--rule' requires 3 arguments"),
        (("reach", *OPTIONS), "command line: radio: must be given to answer from"),
        (("reach", "hop.toml", "--mode", "64-QAM"), "hop.toml: mode = 64-QAM: must be one of QPSK"),
        (("reach", "hop.toml", "--bit-error-ratio", "0.7"), "bit_error_ratio = 0.7: must be more than 0 and under 0.5"),
        (("reach", "hop.toml", "--fade-margin-db", "1e300"), "'--fade-margin-db': 1e+300 is not in the range"),
        (("reach", "hop.toml", "--fade-margin-db", "nan"), "fade_margin_db = nan: must be a finite number of dB"),
        (("terrain",), "Missing argument 'PATH...'"),
        (("terrain", "gone"), "gone: no such file or folder"),
        (("terrain", "dem.tif", "--hop", "gone.toml"), "gone.toml: No such file or directory"),
    ],
)
def test_bad_words(refused, words, message):
    assert message in refused(*words)


def test_a_margin_figure_needs_a_margin(refused, here):
    (here / "bare.toml").write_text(PASSING[: PASSING.index("[radio.a]")])
    assert "bare.toml: --margin-figure: must have a [radio]" in refused(
        "study", "bare.toml", "--margin-figure", "m.png"
    )


# As a process ---------------------------------------------------------------------------------------------------------


def process(*words, **options):
    command = [sys.executable, "-m", "profiler", *words]
    environment = {**os.environ, "PYTHONPATH": str(ROOT), **options.pop("env", {})}
    return subprocess.run(command, capture_output=True, check=False, timeout=60, env=environment, **options)


def test_a_process_prints_one_document(here):
    done = process("study", "fails.toml", "--json", "-", env={"PYTHONIOENCODING": "latin-1"})
    assert (done.returncode, done.stderr) == (1, b"")
    assert json.loads(done.stdout.decode("utf-8"))["verdict"]["outcome"] == "fails"


def test_a_process_ends_with_one_line_and_code_2(here):
    done = process("study", "gone.toml")
    assert (done.returncode, done.stdout) == (2, b"")
    assert done.stderr == b"hopwright: gone.toml: No such file or directory: must be a hop file that can be read\n"


def test_a_terminal_without_the_signs_gets_marks_instead(here):
    done = process("study", "hop.toml", "--full", env={"PYTHONIOENCODING": "ascii"})
    assert (done.returncode, done.stderr) == (0, b"")
    assert b" 140.0 |  0.00?\n" in done.stdout


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="no /dev/full on this system")
def test_standard_output_that_is_full(here):
    with Path("/dev/full").open("wb") as full:
        command = [sys.executable, "-m", "profiler", "study", "hop.toml", "--json", "-"]
        environment = {**os.environ, "PYTHONPATH": str(ROOT)}
        done = subprocess.run(command, stdout=full, stderr=subprocess.PIPE, check=False, timeout=60, env=environment)
    assert done.returncode == 2
    assert done.stderr.startswith(b"hopwright: standard output: No space left on device")
    assert done.stderr.count(b"\n") == 1


@pytest.mark.skipif(sys.platform == "win32", reason="no such signal there")
def test_a_reader_that_leaves_early_ends_the_process_quietly(here):
    command = [sys.executable, "-m", "profiler", "study", "hop.toml", "--csv", "-"]
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    with subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, env=environment) as running:
        running.stdout.close()
        assert running.stderr.read() == b""
        assert running.wait(timeout=60) == -13  # ended by the signal, with no verdict in the code
