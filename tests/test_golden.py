"""One hop with everything in it, held to literal numbers on every surface that people and programs read.

The ground is real (the canyon of tests/terrain), the radio and the rules are invented. It descends by 418 m, bears
south-south-east, and has something else at each end: a mast cleared of trees and a surveyed one, metres and feet,
other powers, gains, lines and frequencies. What decides lies 8 m beside the path, to the left, under trees that do not
stand on the path itself, 86 % of the way to B. So a swap of the ends, of the sides, of the rules or of the units shows.

The literals were found without the project: `Hand` reads the rasters with rasterio and scipy, goes along the geodesic
with pyproj, and looks at the whole zone point by point; the budget is an addition. A test holds the literals to that.
A literal is good to half its last digit.
"""

import copy
import io
import json
import math
import re
import sys
from contextlib import redirect_stdout
from pathlib import Path

import numpy as np
import pytest
import rasterio
from pyproj import Geod, Transformer
from scipy.ndimage import map_coordinates
from scipy.stats import norm

HERE = Path(__file__).resolve().parent
HOP = """\
name = "Mesa to bench"
frequency_ghz = 2.1
return_frequency_ghz = 2.2
polarization = "horizontal"

[site_a]
name = "Mesa"
position = "37.3191, -113.1801"
antenna_m = 86
clearing_m = 60

[site_b]
name = "Bench"
latitude = 37.1816
longitude = -113.106
antenna_ft = 225
ground_m = 1298.4

[terrain]
paths = ["canyon_srtm_3arcsec.tif"]
vertical_datum = "EGM96"

[cover]
landcover = "canyon_landcover_utm12.tif"
class_heights_m = { 1 = 0, 2 = 6, 3 = 0, 4 = 14, 5 = 2, 6 = 0.5, 7 = 1, 8 = 1.5 }

[[cover.obstacle]]
name = "silo"
from_km = 4.0
to_km = 4.1
height_m = 21

[[rules.rule]]
k = 0.6666666666666666
fresnel_fraction = 0.3
label = "bad air"

[[rules.rule]]
k = 1.3333333333333333
fresnel_fraction = 1.0

[[rules.rule]]
k = 1.0
fresnel_fraction = 0.6
margin_m = 3
label = "trunk line"

[radio.a]
power_dbm = 33
line_loss_db = 2.4
gain_dbi = 31.5
overload_dbm = -37

[radio.b]
power_dbm = 29.5
line_loss_db = 1.1
line_length_m = 30
line_loss_db_per_100m = 3.9
diameter_m = 2.4
efficiency = 0.55
overload_dbm = -34

[radio.losses]
filters = 1.7

[[radio.mode]]
name = "64-QAM"
threshold_dbm = -67.5

[[radio.mode]]
name = "QPSK"
noise_figure_db = 4
bit_rate_mbps = 8
modulation = "QPSK"
bit_error_ratio = 1e-6
coding_gain_db = 2
implementation_loss_db = 1.5
power_dbm = 34

[availability]
multipath_method = "vigants-barnett"
climate_factor = 0.8

[availability.objective]
worst_month_percent = 0.005
minutes_per_year = 20

[availability.diversity]
spacing_m = 7

[heights.a]
lowest_m = 20
highest_m = 110
cost_per_m = 3

[heights.b]
lowest_m = 10
highest_m = 90

[confidence]
terrain_rmse_m = 3.5
correlation_m = 150
cover_relative_sigma = 0.1
draws = 2000
seed = 7
"""

# What each rule finds where it is tightest, by `Hand`; in the order of the hop file
RULES = (
    {
        "distance_m": "14292",
        "offset_m": "0",
        "longitude": "-113.11634",
        "latitude": "37.20083",
        "ground_m": "1394.2",
        "cover_m": "2.0",
        "bulge_m": "3.910",
        "f1_m": "16.89",
        "clearance_m": "25.3",
        "required_m": "5.1",
        "surplus_m": "20.25",
    },
    {
        "distance_m": "14361",
        "offset_m": "-7.9",
        "longitude": "-113.11596",
        "latitude": "37.20029",
        "ground_m": "1390.3",
        "cover_m": "14.0",
        "bulge_m": "1.906",
        "f1_m": "16.68",
        "clearance_m": "17.40",
        "required_m": "14.68",
        "surplus_m": "2.72",
    },
    {
        "distance_m": "14361",
        "offset_m": "-7.9",
        "longitude": "-113.11596",
        "latitude": "37.20029",
        "ground_m": "1390.3",
        "cover_m": "14.0",
        "bulge_m": "2.541",
        "f1_m": "16.68",
        "clearance_m": "16.77",
        "required_m": "9.12",
        "surplus_m": "7.65",
    },
)
DECIDES = 1
LABELS = ("bad air", "", "trunk line")
ASKS = ((2 / 3, 0.3, 0.0), (4 / 3, 1.0, 0.0), (1.0, 0.6, 3.0))
SIDES = ("centre", "left", "left")
PATH = {
    "distance_m": "16615.90",
    "azimuth_a_deg": "156.6711",
    "azimuth_b_deg": "336.7159",
}
ELEVATIONS = (("-1.552", "1.328"), ("-1.496", "1.384"), ("-1.514", "1.365"))
GROUND_M, ANTENNA_M, CENTRE_M = ("1698.58", "1298.40"), ("86.00", "68.58"), ("1784.58", "1366.98")
GAIN_B_DBI = {2.1e9: "31.86", 2.2e9: "32.26"}
FREE_SPACE_DB = {2.1e9: "123.30", 2.2e9: "123.71"}
GAS_DB = 0.09
QPSK_DBM = "-90.91"


def close(text, *, digits=0.0):
    """Give what a printed number allows: half its last digit, or a number of last digits more."""
    places = len(text.split(".")[1]) if "." in text else 0
    return pytest.approx(float(text), rel=0.0, abs=(0.5 + digits) * 10.0**-places + 1e-9)


class Hand:
    """The hop worked out from the rasters and the definitions, with nothing of the project."""

    SITE_A, SITE_B, LENGTHS = (-113.1801, 37.3191), (-113.106, 37.1816), Geod(ellps="WGS84")

    def __init__(self, folder):
        with rasterio.open(folder / "canyon_srtm_3arcsec.tif") as raster:
            self.heights, self.grid = raster.read(1).astype(float), raster.transform
        with rasterio.open(folder / "canyon_landcover_utm12.tif") as raster:
            self.classes, self.class_grid = raster.read(1), raster.transform
        self.to_utm = Transformer.from_crs("EPSG:4326", "EPSG:26912", always_xy=True)
        self.class_m = np.full(256, np.nan)
        self.class_m[1:9] = 0.0, 6.0, 0.0, 14.0, 2.0, 0.5, 1.0, 1.5
        azimuth_a, azimuth_b, self.length_m = self.LENGTHS.inv(*self.SITE_A, *self.SITE_B)
        self.azimuths_deg = azimuth_a % 360.0, azimuth_b % 360.0
        self.ends_m = float(self.ground(*self.SITE_A)), 1298.4
        self.strip = None
        self.centres_m = self.ends_m[0] + 86.0, self.ends_m[1] + 225.0 * 0.3048

    def ground(self, longitude, latitude):
        """Bilinear between the centres of the cells."""
        row, column = (latitude - self.grid.f) / self.grid.e - 0.5, (longitude - self.grid.c) / self.grid.a - 0.5
        return map_coordinates(self.heights, [np.atleast_1d(row), np.atleast_1d(column)], order=1).reshape(
            np.shape(row)
        )

    def cover(self, longitude, latitude, along_m):
        """Height of the class of the cell, the silo between 4.0 and 4.1 km, nothing around A's mast."""
        east, north = self.to_utm.transform(longitude, latitude)
        row = np.floor((north - self.class_grid.f) / self.class_grid.e).astype(int)
        column = np.floor((east - self.class_grid.c) / self.class_grid.a).astype(int)
        cover_m = self.class_m[self.classes[row, column]]
        cover_m = np.where((along_m >= 4000.0) & (along_m <= 4100.0), np.maximum(cover_m, 21.0), cover_m)
        return np.where(along_m <= 60.0, 0.0, cover_m)

    def place(self, along_m, right_m):
        """Longitude and latitude of a place so far along the geodesic and so far to its right."""
        along_m, right_m = np.broadcast_arrays(along_m, right_m)
        start = (np.full(along_m.shape, each) for each in (*self.SITE_A, self.azimuths_deg[0]))
        longitude, latitude, back_deg = self.LENGTHS.fwd(*start, along_m)
        return self.LENGTHS.fwd(longitude, latitude, back_deg + 180.0 + 90.0, right_m)[:2]

    def stands(self, along_m, right_m):
        """Give place, ground and cover."""
        longitude, latitude = self.place(along_m, right_m)
        return longitude, latitude, self.ground(longitude, latitude), self.cover(longitude, latitude, along_m)

    def held(self, along_m, right_m, k, fraction, margin_m, stands=None):
        """One rule at places of its zone, a circle of radius fraction · F1 around the ray at every distance."""
        longitude, latitude, ground_m, cover_m = self.stands(along_m, right_m) if stands is None else stands
        to_b_m = self.length_m - along_m
        f1_m = np.sqrt(299_792_458.0 / 2.1e9 * along_m * to_b_m / self.length_m)
        ray_m = (self.centres_m[0] * to_b_m + self.centres_m[1] * along_m) / self.length_m
        bulge_m = along_m * to_b_m / (2.0 * k * 6_371_000.0)
        required_m = np.sqrt(np.maximum((fraction * f1_m) ** 2 - right_m**2, 0.0)) + margin_m
        clearance_m = ray_m - ground_m - cover_m - bulge_m
        return {
            "distance_m": along_m,
            "offset_m": right_m,
            "longitude": longitude,
            "latitude": latitude,
            "ground_m": ground_m,
            "cover_m": cover_m,
            "bulge_m": bulge_m,
            "f1_m": f1_m,
            "clearance_m": clearance_m,
            "required_m": required_m,
            "surplus_m": np.where(np.abs(right_m) <= fraction * f1_m, clearance_m - required_m, np.inf),
        }

    def tightest(self, *asks):
        """Where a rule has least to spare: the whole zone at every 5 m by 1 m, then ever finer around the best four."""
        if self.strip is None:
            along_m, right_m = np.arange(75.0, self.length_m - 75.0, 5.0)[:, None], np.arange(-25.0, 26.0)
            self.strip = along_m, right_m, self.stands(along_m, right_m)
        along_m, right_m, stands = self.strip
        surplus_m = self.held(along_m, right_m, *asks, stands)["surplus_m"]
        least_m, column = surplus_m.min(axis=1), surplus_m.argmin(axis=1)
        starts: list[int] = []
        for row in np.argsort(least_m):
            if all(abs(row - other) > 5 for other in starts):
                starts.append(int(row))
        found = (self._closer(along_m[row, 0], right_m[column[row]], *asks) for row in starts[:4])
        return min(found, key=lambda at: at["surplus_m"])

    def _closer(self, along_m, right_m, *asks):
        """Give the least place around another, in ever finer steps."""
        share = np.linspace(-1.0, 1.0, 31)
        for finer in (1.0, 0.2, 0.04, 0.008, 0.0016):
            found = self.held(along_m + 10.0 * finer * share[:, None], right_m + 2.0 * finer * share, *asks)
            least = np.unravel_index(found["surplus_m"].argmin(), found["surplus_m"].shape)
            at = {name: float(np.broadcast_to(each, found["surplus_m"].shape)[least]) for name, each in found.items()}
            along_m, right_m = at["distance_m"], at["offset_m"]
        return at

    def elevation_deg(self, end, k):
        """Angle of the ray at an end: its slope less what the earth curves away, d/(2·k·R)."""
        rise_m = self.centres_m[1 - end] - self.centres_m[end]
        slope = rise_m / self.length_m - self.length_m / (2.0 * k * 6_371_000.0)
        return math.degrees(math.atan(slope))


@pytest.fixture(scope="module")
def hand(real_terrain):
    return Hand(real_terrain)


def test_the_literals_are_worked_out_by_hand(hand):
    assert hand.length_m == close(PATH["distance_m"])
    for found, text in zip(hand.azimuths_deg, (PATH["azimuth_a_deg"], PATH["azimuth_b_deg"]), strict=True):
        assert found == close(text)
    assert hand.ends_m == (close(GROUND_M[0]), close(GROUND_M[1]))
    assert hand.centres_m == (close(CENTRE_M[0]), close(CENTRE_M[1]))
    for asks, literal, ends in zip(ASKS, RULES, ELEVATIONS, strict=True):
        at = hand.tightest(*asks)
        assert {name: close(text) for name, text in literal.items()} == {name: at[name] for name in literal}
        assert [hand.elevation_deg(end, asks[0]) for end in (0, 1)] == [close(text) for text in ends]
    # there the path itself has grass for trees, and clears by 5 m more
    path = hand.held(np.array(14361.0), np.array(0.0), 4 / 3, 1.0, 0.0)
    assert path["cover_m"] == 2.0
    assert path["surplus_m"] > 6.0


# What the program says ------------------------------------------------------------------------------------------------

FULL_ROWS = (
    "A Mesa 37.319100 -113.180100 1698.6 86.0 1784.6 156.67°",
    "B Bench 37.181600 -113.106000 1298.4 68.6 1367.0 336.72°",
    "16.616 km, 2.1 GHz, horizontal polarization",
    "bad air pass 20.3 14.29 km 16.9 1.50 0.3 F1 at k = 2/3",
    "1.0 F1 at k = 4/3 pass 2.7 14.36 km, 8 m left 16.7 1.04",
    "trunk line pass 7.7 14.36 km, 8 m left 16.7 1.01 0.6 F1 + 3 m at k = 1",
    "2/3 yes −1.552° +1.328° 0.0",
    "4/3 yes −1.496° +1.384° 0.0",
    "1 yes −1.514° +1.365° 0.0",
    "14.36 km, 8 m left 1390.3 14.0 16.7 17.4 14.7 2.7 37.20029° N, 113.11596° W",
    "Bench: surveyed ground 1298.40 m, 2.24 m above that of the terrain",
)
FULL_ROWS_FEET = (  # the same by 0.3048 m, and 1609.344 m
    "A Mesa 37.319100 -113.180100 5572.8 282.2 5854.9 156.67°",
    "B Bench 37.181600 -113.106000 4259.8 225.0 4484.8 336.72°",
    "10.325 mi, 2.1 GHz, horizontal polarization",
    "bad air pass 66.4 8.88 mi 55.4 1.50 0.3 F1 at k = 2/3",
    "1.0 F1 at k = 4/3 pass 8.9 8.92 mi, 26 ft left 54.7 1.04",
    "trunk line pass 25.1 8.92 mi, 26 ft left 54.7 1.01 0.6 F1 + 9.8 ft at k = 1",
    "2/3 yes −1.552° +1.328° 0.0",
    "8.92 mi, 26 ft left 4561.5 45.9 54.7 57.1 48.2 8.9 37.20029° N, 113.11596° W",
    "Bench: surveyed ground 4259.84 ft, 7.35 ft above that of the terrain",
)
# power, line, line by length, dish, free space, gases, diffraction, filters, dish, line, line by length
BUDGET_ROWS = (
    "transmit power at the sender +33.00 +29.50 dBm",
    "line loss at the sender −2.40 −1.10 dB",
    "line by length at the sender – −1.17 dB",
    "antenna gain at the sender +31.50 +32.26 dBi",
    "free space −123.30 −123.71 dB",
    "gases −0.09 −0.09 dB",
    "diffraction 0.00 0.00 dB",
    "filters −1.70 −1.70 dB",
    "antenna gain at the receiver +31.86 +31.50 dBi",
    "line loss at the receiver −1.10 −2.40 dB",
    "line by length at the receiver −1.17 – dB",
    "received level −33.40 −36.90 dBm",
    "threshold −67.50 −67.50 dBm",
    "fade margin 34.10 30.60 dB",
    "fade margin, QPSK 58.51 58.51 dB",
)
BRIEF = (
    "Clears every rule; tightest 14.36 km from A, 8 m left of the path: 2.7 m to spare (1.0 F1 at k = 4/3).",
    "There the clearance is 17.4 m (1.04 F1) and 14.7 m are required, over ground 1390.3 m + cover 14.0 m.",
    "Fade margin 30.6 dB",
    "Mode 64-QAM: asked 0.005 % of the worst month, expected 6.8·10⁻⁵ % of the worst month: met.",
    "Mode 64-QAM: asked 20 min a year, expected 5.5 s a year: met.",
    "Next: survey the ground 14.36 km from A and at site A; or raise both antennas by",
)
BRIEF_FEET = (
    "Clears every rule; tightest 8.92 mi from A, 26 ft left of the path: 8.9 ft to spare (1.0 F1 at k = 4/3).",
    "There the clearance is 57.1 ft (1.04 F1) and 48.2 ft are required, over ground 4561.5 ft + cover 45.9 ft.",
    "A Mesa, antenna 282.2 ft up, azimuth 156.67°; B Bench, antenna 225.0 ft up, azimuth 336.72°; 10.32 mi at 2.1 GHz.",
    "Next: Survey the ground 8.92 mi from A and at site A; or raise both antennas by",
)
HEADLINE = (
    "Clears every rule; tightest 14.36 km from A, 8 m left of the path: 2.7 m to spare (1.0 F1 at k = 4/3);"
    " meets the availability objective"
)


@pytest.fixture(scope="module")
def hop_file(real_terrain, tmp_path_factory):
    text = HOP
    for raster in ("canyon_srtm_3arcsec.tif", "canyon_landcover_utm12.tif"):
        text = text.replace(f'"{raster}"', f'"{(real_terrain / raster).as_posix()}"')
    path = tmp_path_factory.mktemp("golden") / "hop.toml"
    path.write_text(text, encoding="utf-8")
    return path


@pytest.fixture(scope="module")
def study(hop_file):
    from profiler.hopfile import load_hop
    from profiler.study import run_study

    return run_study(load_hop(hop_file), relief=True)


@pytest.fixture(scope="module")
def run(hop_file, study):
    """Run `study` at a wide terminal on what was studied once; give the exit code and the words, spaces as one."""
    from profiler.cli import main

    def call(*words):
        printed, shown = io.StringIO(), {"COLUMNS": "250", "FORCE_COLOR": "1", "NO_COLOR": "1", "TERM": "xterm"}
        with pytest.MonkeyPatch.context() as patch, redirect_stdout(printed):
            for name, value in shown.items():
                patch.setenv(name, value)
            patch.setattr("profiler.study.run_study", lambda hop, **_: study)
            with pytest.raises(SystemExit) as stop:
                main(["study", str(hop_file), *map(str, words)])
        sys.stdout.flush()
        return stop.value.code, " ".join(printed.getvalue().split())

    return call


@pytest.fixture(scope="module")
def metres(run, hop_file):
    """Give the exit code, the full screen, the document and the point table in metres."""
    document, table = hop_file.with_name("m.json"), hop_file.with_name("m.csv")
    code, screen = run("--full", "--json", document, "--csv", table)
    return code, screen, json.loads(document.read_text(encoding="utf-8")), rows_of(table)


@pytest.fixture(scope="module")
def feet(run, hop_file):
    """Give the full screen and the point table in feet."""
    table = hop_file.with_name("ft.csv")
    _, screen = run("--full", "--feet", "--csv", table)
    return screen, rows_of(table)


def rows_of(path):
    names, *rows = (line.split(",") for line in path.read_text(encoding="utf-8").splitlines())
    numbers = np.array([[float(cell or "nan") for cell in row] for row in rows])
    return dict(zip(names, numbers.T, strict=True))


def test_document_has_the_path_and_the_sites(metres):
    code, _, document, _ = metres
    assert code == 1  # not sure
    path, hop = document["path"], document["hop"]
    assert {name: path[name] for name in PATH} == {name: close(text) for name, text in PATH.items()}
    assert (path["elevation_a_deg"], path["elevation_b_deg"]) == tuple(map(close, ELEVATIONS[DECIDES]))
    assert (hop["frequency_hz"], hop["frequencies_hz"]) == (2.1e9, {"a_to_b": 2.1e9, "b_to_a": 2.2e9})
    assert hop["polarization"] == "horizontal"
    sites = (hop["site_a"], hop["site_b"])
    assert [(site["name"], site["longitude"], site["latitude"]) for site in sites] == [
        ("Mesa", *Hand.SITE_A),
        ("Bench", *Hand.SITE_B),
    ]
    for name, texts in (("ground_m", GROUND_M), ("antenna_m", ANTENNA_M), ("centre_m", CENTRE_M)):
        assert [site[name] for site in sites] == [close(text) for text in texts]
    assert [site["ground_surveyed"] for site in sites] == [False, True]
    assert document["terrain"]["surveyed_difference_a_m"] is None
    assert document["terrain"]["surveyed_difference_b_m"] == close("2.24")
    assert document["terrain"]["vertical_datum"] == "EGM96"


def test_document_has_every_rule_where_it_is_tightest(metres):
    document = metres[2]
    for rule, asks, label, literal, side, ends in zip(
        document["rules"], ASKS, LABELS, RULES, SIDES, ELEVATIONS, strict=True
    ):
        assert (rule["k"], rule["fresnel_fraction"], rule["margin_m"], rule["label"]) == (*asks, label)
        assert rule["passes"]
        assert rule["line_of_sight"]
        critical = rule["critical"]
        # the search of the zone promises a centimetre
        assert {name: critical[name] for name in literal} == {
            name: close(text, digits=1) for name, text in literal.items()
        }
        assert critical["ratio"] == pytest.approx(float(literal["clearance_m"]) / float(literal["f1_m"]), abs=0.005)
        assert side == "centre" or critical["side"] == side
        assert (rule["elevation_a_deg"], rule["elevation_b_deg"]) == tuple(map(close, ends))
    # at A the trees begin where the clearing ends; at B stands grass, which with the last rule leaves 68.58 - 2 - 3 m
    assert min(rule["feet"][1]["surplus_m"] for rule in document["rules"]) == pytest.approx(63.5, abs=0.15)
    assert [[foot["cover_m"] for foot in rule["feet"]] for rule in document["rules"]] == [[14.0, 2.0]] * 3
    verdict = document["verdict"]
    assert (verdict["outcome"], verdict["headline"]) == ("not_sure", HEADLINE)
    assert (verdict["clears"], verdict["has_margin"], verdict["meets_objective"]) == (True, True, True)


def test_document_has_the_budget_both_ways(metres):
    """An addition; gases at 2 GHz take 0.005 dB/km at sea level (Rec. ITU-R P.676, Figure 5), less up here."""
    budget = metres[2]["budget"]
    assert [budget[way][name] for way in ("a_to_b", "b_to_a") for name in ("transmitter", "receiver")] == [*"ABBA"]
    for way, hz, before_db, after_db, overload_dbm in (
        ("a_to_b", 2.1e9, 33.0 - 2.4 + 31.5, "B", -34.0),
        ("b_to_a", 2.2e9, 29.5 - 1.1 - 30 * 0.039, "A", -37.0),
    ):
        gain_b_db = 10 * math.log10(0.55 * (math.pi * 2.4 * hz / 299_792_458) ** 2)
        free_db = 20 * math.log10(4 * math.pi * float(PATH["distance_m"]) * hz / 299_792_458)
        assert (gain_b_db, free_db) == (close(GAIN_B_DBI[hz]), close(FREE_SPACE_DB[hz]))
        eirp_dbm = before_db + (0.0 if after_db == "B" else gain_b_db)
        level_dbm = eirp_dbm - free_db - GAS_DB - 1.7
        level_dbm += gain_b_db - 1.1 - 30 * 0.039 if after_db == "B" else 31.5 - 2.4
        found = budget[way]
        assert found["frequency_hz"] == hz
        assert found["free_space_db"] == pytest.approx(free_db, abs=1e-3)
        assert found["gas_db"] == pytest.approx(GAS_DB, abs=0.02)
        assert found["diffraction_db"] == 0.0
        assert found["eirp_dbm"] == pytest.approx(eirp_dbm, abs=1e-6)
        assert found["lines"][0]["value"] == (33.0 if after_db == "B" else 29.5)
        assert sum(line["value"] for line in found["lines"]) == pytest.approx(found["received_dbm"])
        assert found["received_dbm"] == pytest.approx(level_dbm, abs=0.01)
        assert (found["threshold_dbm"], found["overload_dbm"]) == (-67.5, overload_dbm)
        assert found["fade_margin_db"] == pytest.approx(level_dbm + 67.5, abs=0.01)
        # a mode with a power of its own, 1 dB more than A's and 4.5 dB more than B's
        main, qpsk = found["modes"]
        assert (main["name"], qpsk["name"]) == ("64-QAM", "QPSK")
        more_db = 34.0 - (33.0 if after_db == "B" else 29.5)
        # kT at 290 K in dBm/Hz, noise figure, bits, Eb/N0 from Q(√(2·Eb/N0)) = 1e-6, coding, implementation
        kt_dbm = 10 * math.log10(1.380649e-23 * 290 * 1e3)
        needed_db = 10 * math.log10(norm.isf(1e-6) ** 2 / 2)
        qpsk_dbm = kt_dbm + 4.0 + 10 * math.log10(8e6) + needed_db - 2.0 + 1.5
        assert qpsk_dbm == close(QPSK_DBM)
        assert qpsk["threshold_dbm"] == pytest.approx(qpsk_dbm, abs=1e-3)
        assert qpsk["received_dbm"] == pytest.approx(level_dbm + more_db, abs=0.01)
        assert qpsk["fade_margin_db"] == pytest.approx(level_dbm + more_db - qpsk_dbm, abs=0.02)


def test_document_has_the_outage_of_the_weaker_way(metres):
    """Barnett: 6.0e-7·c·f·d³·10^(-A/10) of the worst month at the higher frequency, a season of 8e6 s a year.

    Vigants: diversity makes that 1.2e-3·f/d·s²·10^(A/10) times less, with d taken as 24 km, where the law begins.
    """
    outage = metres[2]["availability"]
    margin_db, d_km = 30.60, float(PATH["distance_m"]) / 1e3
    month = 6.0e-7 * 0.8 * 2.2 * d_km**3 * 10 ** (-margin_db / 10)
    # the frequency cancels with diversity, so that the law without it is held to its own number
    assert outage["multipath"][0]["worst_month_percent"] == pytest.approx(100 * month, rel=0.01)
    month /= 1.2e-3 * 2.2 / 24.0 * 7.0**2 * 10 ** (margin_db / 10)
    year = month * 8e6 / (365.25 * 86400)
    assert outage["fade_margin_db"] == close("30.60")
    assert outage["worst_month_percent"]["multipath"] == pytest.approx(100 * month, rel=0.01)
    assert outage["worst_month_percent"]["total"] == pytest.approx(100 * month, rel=0.01)
    assert outage["year_percent"]["total"] == pytest.approx(100 * year, rel=0.01)
    assert (100 * month, 100 * year) == (close("0.0000682", digits=1), close("0.0000173", digits=1))
    of_month, of_year = outage["objective"]["targets"]
    assert (of_month["required"], of_month["met"]) == (0.005, True)
    assert of_month["achieved"] == pytest.approx(100 * month, rel=0.01)
    assert (of_year["required"], of_year["met"]) == (20.0, True)
    assert of_year["achieved"] == pytest.approx(year * 365.25 * 1440, rel=0.01)
    assert of_year["achieved"] * 60.0 == close("5.5")  # seconds
    assert [(mode["mode"], mode["direction"]) for mode in outage["modes"]] == [("64-QAM", "b_to_a"), ("QPSK", "b_to_a")]


def test_document_has_the_doubt_and_what_would_be_sure(metres):
    """One place decides: its error is that of the ground there and a share 1 - t of A's, B is surveyed.

    So the surplus varies by σ = 3.5·√(1 + (1 - t)²) = 3.53 m: the chance is Φ(2.72/3.53) = 0.78. To be sure by 90 and
    95 % takes 1.282σ and 1.645σ less 2.72 m: 1.8 and 3.1 m more at both ends, (1 - t) and t times as much alone.
    """
    confidence, share = metres[2]["confidence"], 14361.0 / 16615.9
    spread_m = 3.5 * math.hypot(1.0, 1.0 - share)
    assert spread_m == close("3.53")
    assert norm.cdf(2.724 / spread_m) == close("0.78")
    assert confidence["chance"]["value"] == pytest.approx(0.78, abs=0.03)
    assert confidence["rules"][DECIDES]["chance"]["value"] == confidence["chance"]["value"]
    assert [rule["k"] for rule in confidence["rules"]] == [asks[0] for asks in ASKS]
    assert metres[2]["verdict"]["chance"] == confidence["chance"]["value"]
    for sure, chance, more in zip(confidence["sure"], (0.90, 0.95), ("1.8", "3.1"), strict=True):
        assert norm.ppf(chance) * spread_m - 2.724 == close(more)
        assert sure["chance"] == chance
        assert sure["raise_m"] == pytest.approx(float(more), abs=0.5)  # 2000 draws leave ±0.3 m
        assert sure["equal_m"] == [pytest.approx(86.0 + sure["raise_m"]), pytest.approx(68.58 + sure["raise_m"])]
        assert (sure["a_only_m"] - 86.0) * (1.0 - share) == pytest.approx(sure["raise_m"], abs=0.15)
        assert (sure["b_only_m"] - 68.58) * share == pytest.approx(sure["raise_m"], abs=0.15)
    # what a surveyor measures first: there, then A, which stands on the raster; never B
    first, second = confidence["survey"]
    assert (first["distance_m"], first["site"]) == (pytest.approx(14361, abs=10), None)
    assert (second["distance_m"], second["site"]) == (0.0, "A")


def test_points_of_the_path_are_those_of_the_rasters(metres, hand):
    table = metres[3]
    chosen = np.arange(13, table["distance_m"].size - 13, 13)
    along_m = table["distance_m"][chosen]
    # not within a hair of the edge of a class
    apart = [hand.held(along_m + shift, np.zeros_like(along_m), *ASKS[0])["cover_m"] for shift in (-0.01, 0.0, 0.01)]
    inside = (apart[0] == apart[1]) & (apart[1] == apart[2])
    chosen, along_m = chosen[inside], along_m[inside]
    assert along_m.size > 80
    for number, asks in enumerate(ASKS, start=1):
        by_hand = hand.held(along_m, np.zeros_like(along_m), *asks)
        for name in ("longitude", "latitude"):
            assert table[name][chosen] == pytest.approx(by_hand[name], abs=1e-7)
        for name in ("ground_m", "cover_m"):
            assert table[name][chosen] == pytest.approx(by_hand[name], abs=0.01)
        for name in ("bulge_m", "f1_m", "clearance_m", "required_m", "surplus_m"):
            assert table[f"rule{number}_{name}"][chosen] == pytest.approx(by_hand[name], abs=0.01)
        assert table[f"rule{number}_ratio"][chosen] == pytest.approx(by_hand["clearance_m"] / by_hand["f1_m"], abs=0.01)


def test_ends_and_the_silo_stand_in_the_table(metres):
    table = metres[3]
    assert [table[name][end] for name in ("distance_m", "ground_m", "cover_m", "ray_m") for end in (0, -1)] == [
        *(0.0, close(PATH["distance_m"])),
        *(close(GROUND_M[0]), close(GROUND_M[1])),
        *(0.0, 2.0),
        *(close(CENTRE_M[0]), close(CENTRE_M[1])),
    ]
    silo = (table["distance_m"] > 4000.1) & (table["distance_m"] < 4099.9)
    assert silo.sum() > 1
    assert set(table["cover_m"][silo]) == {21.0}
    assert 21.0 not in table["cover_m"][table["distance_m"] > 4100.1]


def test_beside_the_path_the_table_says_which_side(metres, hand):
    table = metres[3]
    number, literal = DECIDES + 1, RULES[DECIDES]
    row = int(table[f"rule{number}_least_surplus_m"].argmin())
    assert table["distance_m"][row] == pytest.approx(float(literal["distance_m"]), abs=10.0)
    assert table[f"rule{number}_offset_m"][row] == close(literal["offset_m"])
    assert table[f"rule{number}_least_surplus_m"][row] == close(literal["surplus_m"], digits=1)
    band = [table[f"rule{number}_surplus_{percent}_percent_m"][row] for percent in (5, 95)]
    assert band == [pytest.approx(2.724 - 1.645 * 3.53, abs=0.5), pytest.approx(2.724 + 1.645 * 3.53, abs=0.5)]
    # on the other side, early on the path, the trees stand to the right
    early = np.flatnonzero(np.abs(table["distance_m"] - 1906.0) < 10.0)
    right_m = table[f"rule{number}_offset_m"][early]
    assert right_m.max() > 3.0
    at = early[right_m.argmax()]
    by_hand = hand.held(table["distance_m"][at], right_m.max(), *ASKS[DECIDES])
    assert by_hand["cover_m"] == 14.0
    assert table[f"rule{number}_least_surplus_m"][at] == pytest.approx(float(by_hand["surplus_m"]), abs=0.3)


def test_feet_are_feet_in_the_table(metres, feet):
    lengths, (_, table) = metres[3], feet
    assert list(table) == [re.sub("_m$", "_ft", name) for name in lengths]
    for name, values in table.items():
        in_metres = values * 0.3048 if name.endswith("_ft") else values
        assert in_metres == pytest.approx(lengths[re.sub("_ft$", "_m", name)], nan_ok=True)


def test_the_full_screen_in_metres(metres):
    screen = metres[1]
    assert [row for row in (*FULL_ROWS, *BUDGET_ROWS) if row not in screen] == []
    assert "Availability, fade margin 30.6 dB" in screen
    assert "worst month 6.8·10⁻⁵ – – – 6.8·10⁻⁵" in screen
    assert "year 1.7·10⁻⁵ – – – 1.7·10⁻⁵" in screen
    assert "64-QAM B to A 30.60 6.8·10⁻⁵ 1.7·10⁻⁵ met" in screen
    assert "A Mesa, antenna 86.0 m up, azimuth 156.67°; B Bench, antenna 68.6 m up, azimuth 336.72°; 16.62 km" in screen
    assert "A to B: the received level of −32.4 dBm" in screen.replace("-", "−")
    # both ways −32.4 with the mode of most power; only so much is taken: −34 dBm at B, −37 dBm at A
    rules = metres[2]["rules"]
    feet_m = [min(rule["feet"][end]["surplus_m"] for rule in rules) for end in (0, 1)]
    spare = (
        f"{feet_m[0]:.1f} m to spare at A over 14.0 m of cover and {feet_m[1]:.1f} m to spare at B over 2.0 m of cover"
    )
    assert f"At the masts' feet: {spare}." in screen
    for sure in metres[2]["confidence"]["sure"]:
        more, equal, alone = sure["raise_m"], sure["equal_m"], (sure["a_only_m"], sure["b_only_m"])
        assert (
            f"both antennas {more:.1f} m higher, A at {equal[0]:.1f} m and B at {equal[1]:.1f} m,"
            f" A alone at {alone[0]:.1f} m or B alone at {alone[1]:.1f} m." in screen
        )


def test_the_full_screen_in_feet(feet, metres):
    screen = feet[0]
    assert [row for row in (*FULL_ROWS_FEET, *BUDGET_ROWS, *BRIEF_FEET) if row not in screen] == []
    sure = metres[2]["confidence"]["sure"][0]
    a_ft, b_ft = (each / 0.3048 for each in (sure["a_only_m"], sure["b_only_m"]))
    assert f"A alone at {a_ft:.1f} ft or B alone at {b_ft:.1f} ft." in screen


def test_the_short_screen_and_the_quiet_one(run, metres):
    (_, screen), (_, quiet), (_, feet) = run(), run("--quiet"), run("--quiet", "--feet")
    chance = float(re.match(r"Mesa to bench: NOT SURE, ([\d.]+) % chance of clearing, 90 % asked", screen)[1])
    assert chance == pytest.approx(100 * metres[2]["confidence"]["chance"]["value"], abs=0.06)
    assert [text for text in BRIEF if text not in screen] == []
    assert f"NOT SURE, {chance} % chance of clearing, 90 % asked {HEADLINE}." in quiet
    assert BRIEF_FEET[0].removesuffix(".") in feet


# What the figures show ------------------------------------------------------------------------------------------------

SITE_LABELS = (
    "latitude\nlongitude\nground\n\nantenna above ground\nantenna above datum\ntrue azimuth\nelevation, k = 4/3"
)
SITE_COLUMNS = (
    "37.31910° N\n113.18010° W\n1698.6 m\nfrom terrain\n86.0 m\n1784.6 m\n156.67°\n−1.496°",
    "37.18160° N\n113.10600° W\n1298.4 m\nsurveyed\n68.6 m\n1367.0 m\n336.72°\n+1.384°",
)
SITE_COLUMNS_FEET = (
    "37.31910° N\n113.18010° W\n5572.8 ft\nfrom terrain\n282.2 ft\n5854.9 ft\n156.67°\n−1.496°",
    "37.18160° N\n113.10600° W\n4259.8 ft\nsurveyed\n225.0 ft\n4484.8 ft\n336.72°\n+1.384°",
)
RULE_WORDS = (
    "1.0 F1 at k = 4/3",
    "passes, 2.7 m to spare, 14.36 km from A, 8 m left of the path",
    "clearance 17.4 m = 1.04 F1; required 14.7 m",
    "0.6 F1 + 3 m at k = 1 (trunk line)",
    "passes, 7.7 m to spare, 14.36 km from A, 8 m left of the path",
    "clearance 16.8 m = 1.01 F1; required 9.1 m",
    "0.3 F1 at k = 2/3 (bad air)",
)
RULE_WORDS_FEET = (
    "passes, 8.9 ft to spare, 8.92 mi from A, 26 ft left of the path",
    "clearance 57.1 ft = 1.04 F1; required 48.2 ft",
    "0.6 F1 + 9.8 ft at k = 1 (trunk line)",
)
CRITICAL = (
    "1 Tightest: 14.36 km from A, 8 m left of the path (37.20029° N, 113.11596° W), ground 1390.3 m + cover 14.0 m,"
    " 2.7 m to spare"
)


def words_of(figure):
    from matplotlib.text import Text

    return [text for text in figure.findobj(Text) if text.get_text()]


def said(figure):
    return {" ".join(text.get_text().split()) for text in words_of(figure)}


def by_name(figure, gid):
    [found] = [text for text in words_of(figure) if text.get_gid() == gid]
    return " ".join(found.get_text().split())


def line_of(axes, label):
    [found] = [line for line in axes.lines if line.get_label() == label]
    return found.get_xdata(), found.get_ydata()


@pytest.mark.parametrize("in_feet", [False, True])
def test_title_block_and_badge(study, metres, in_feet):
    from profiler.figures import profile_figure

    figure = profile_figure(study, feet=in_feet)
    texts = {text.get_text(): text for text in words_of(figure)}
    columns = SITE_COLUMNS_FEET if in_feet else SITE_COLUMNS
    labels, a, b = (texts[each] for each in (SITE_LABELS, *columns))
    assert labels.get_position()[0] < a.get_position()[0] < b.get_position()[0]
    assert (texts["A"].get_position()[0], texts["B"].get_position()[0]) == (a.get_position()[0], b.get_position()[0])
    assert [words for words in (RULE_WORDS_FEET if in_feet else RULE_WORDS) if words not in said(figure)] == []
    assert by_name(figure, "verdict") == "NOT SURE"
    chance = float(re.fullmatch(r"([\d.]+) % chance of clearing, 90 % asked", by_name(figure, "chance"))[1])
    assert chance == pytest.approx(100 * metres[2]["confidence"]["chance"]["value"], abs=0.06)
    facts = "2.1 GHz, horizontal polarization · "
    assert f"{facts}{'10.32 mi' if in_feet else '16.62 km'}" in said(figure)
    assert f"A: Mesa, antenna {'282.2 ft' if in_feet else '86.0 m'} up" in said(figure)
    assert f"B: Bench, antenna {'225.0 ft' if in_feet else '68.6 m'} up" in said(figure)
    if not in_feet:
        assert by_name(figure, "sentence") == HEADLINE
        assert by_name(figure, "critical") == CRITICAL
        assert any("30.6 dB" in text.split("\n") for text in texts)


def test_drawings_show_the_place_that_decides(study):
    from profiler.figures import profile_figure

    axes = {each.get_label(): each for each in profile_figure(study).axes}
    along_km, ray_m = line_of(axes["profile"], "ray")
    assert (along_km[0], along_km[-1], ray_m[0], ray_m[-1]) == (
        *(0.0, close("16.616")),
        *(close(CENTRE_M[0]), close(CENTRE_M[1])),
    )
    _, ground_m = line_of(axes["profile"], "ground")
    assert (ground_m[0], ground_m[-1]) == (close(GROUND_M[0]), close(GROUND_M[1]))
    # ground, trees and bulge: 1390.34 + 14.00 + 1.91 m
    (place_km,), (surface_m,) = line_of(axes["profile"], "critical")
    assert (place_km, surface_m) == (close("14.361"), close("1406.2", digits=1))
    (surveyed_km,), (surveyed_m,) = line_of(axes["profile"], "surveyed")
    assert (surveyed_km, surveyed_m) == (close("16.616"), close(GROUND_M[1]))
    for number, least in enumerate(RULES, start=1):
        _, surplus_m = line_of(axes["surplus"], f"rule {number}")
        assert surplus_m.min() == close(least["surplus_m"], digits=1)
    # seen from above: the left side of A to B is on top, and the place lies 8 m up there
    (place_km,), (right_km,) = line_of(axes["relief"], "critical")
    assert (place_km, right_km) == (close("14.361"), close("-0.0079"))
    bottom, top = axes["relief"].get_ylim()
    assert top < 0.0 < bottom


def test_levels_of_the_margin_figure_are_those_of_the_weaker_way(study):
    """29.5 - 1.1 - 1.17 + 32.26 - 123.71 - 0.09 - 0 - 1.7 + 31.5 - 2.4 = -36.9 dBm, 30.6 dB over the threshold."""
    from profiler.figures import margin_figure

    figure = margin_figure(study)
    assert "Levels B to A, mode 64-QAM" in said(figure)
    down = [text for text in words_of(figure) if re.fullmatch(r"−?\d+\.\d", text.get_text())]
    levels = [text.get_text() for text in sorted(down, key=lambda text: text.get_position()[1])]
    in_order = iter(levels)
    expected = ("29.5", "28.4", "27.2", "59.5", "−64.2", "−64.3", "−66.0", "−34.5", "−36.9", "−67.5")
    assert all(level in in_order for level in expected), levels
    assert by_name(figure, "sentence").startswith("Fade margin 30.6 dB, and the objective needs")


# What to build --------------------------------------------------------------------------------------------------------


def test_planned_heights_belong_to_their_ends(study, hand):
    """A metre costs three times as much at A: the plan is held to the whole zone by hand, and a step less is short."""
    from profiler.cli.show_heights import show_heights
    from profiler.document.heights_document import heights_document
    from profiler.plan import plan_heights

    found = plan_heights(study)
    plan = heights_document(found)
    a_m, b_m = plan["cheapest_m"]
    assert plan["cost"] == pytest.approx(3.0 * a_m + b_m)

    def least_m(antenna_a_m, antenna_b_m, asks=ASKS[DECIDES]):
        """Of all rules: the second asks for most on this path at any height."""
        raised = copy.copy(hand)
        raised.centres_m = hand.ends_m[0] + antenna_a_m, hand.ends_m[1] + antenna_b_m
        return raised.tightest(*asks)["surplus_m"]

    assert least_m(a_m, b_m) >= -0.01
    assert least_m(a_m - 1.0, b_m) < 0.0
    assert least_m(a_m, b_m - 1.0) < 0.0
    assert least_m(plan["least_equal_m"], plan["least_equal_m"]) == pytest.approx(0.0, abs=0.01)
    assert least_m(plan["least_a_m"], 68.58) == pytest.approx(0.0, abs=0.01)
    assert least_m(86.0, plan["least_b_m"]) == pytest.approx(0.0, abs=0.01)
    sheet, answer = plan["sheet"], plan["answer_m"]
    for end, antenna_m, ground_m in zip("AB", answer, hand.ends_m, strict=True):
        assert sheet[end]["antenna_m"] == antenna_m
        assert sheet[end]["lower_m"] == antenna_m - 7.0
        assert sheet[end]["ground_m"] == pytest.approx(ground_m, abs=0.01)
        assert sheet[end]["centre_m"] == pytest.approx(ground_m + antenna_m, abs=0.01)
        assert sheet[end]["centre_ft"] == pytest.approx((ground_m + antenna_m) / 0.3048, abs=0.04)
    # to be sure by 95 % the place that decides needs 1.645·3.53 = 5.8 m, and others with it more
    sure = plan["sure"][1]
    assert sure["asked_chance"] == 0.95
    assert least_m(*sure["pair_m"]) > 5.8 - 0.3
    # the lower antennas, 7 m down, by 0.3 F1 at the median k
    lower = {each["ray"]: each["surplus_m"] for each in sheet["held"]}
    assert lower["lower A"] == pytest.approx(least_m(answer[0] - 7.0, answer[1], (4 / 3, 0.3, 0.0)), abs=0.01)
    assert lower["lower B"] == pytest.approx(least_m(answer[0], answer[1] - 7.0, (4 / 3, 0.3, 0.0)), abs=0.01)
    # the frontier on the terminal: A rises and B falls along the stretch of the place that decides
    (first_a, first_b), *_, (last_a, last_b) = plan["stretches"][-1]["corners_m"]
    assert (last_a, least_m(last_a, last_b)) == (110.0, pytest.approx(0.0, abs=0.01))
    printed = io.StringIO()
    with pytest.MonkeyPatch.context() as patch, redirect_stdout(printed):
        patch.setenv("COLUMNS", "250")
        show_heights(found, feet=False, full=True, quiet=False, color=False)
    screen = " ".join(printed.getvalue().split())
    assert f"{first_a:.1f} to {last_a:.1f} {first_b:.1f} to {last_b:.1f} 14.36 km, 8 m left 1390.3 + 14.0" in screen
    assert f"Least A with B at 68.6 m: {plan['least_a_m']:.2f} m" in screen
    assert f"Least B with A at 86.0 m: {plan['least_b_m']:.2f} m" in screen
