"""profiler.hopfile: what a hop file means, what it refuses and how, presets, starter, heights written back."""

import hashlib
import json
import re
import subprocess
import sys
import tomllib
from dataclasses import fields
from functools import cache
from pathlib import Path
from typing import get_args

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from jsonschema import Draft202012Validator

from profiler import models
from profiler.diffraction import METHODS
from profiler.errors import InputError
from profiler.hopfile import PRESETS, hop_schema, keys_page, load_hop, parse_hop, quick_hop, starter, with_antennas
from profiler.hopfile.build import build_hop
from profiler.hopfile.presets import expand_preset
from profiler.models import ConfidenceChoice, Hop
from profiler.models.confidence import TerrainDoubt, TerrainKind
from profiler.models.key_units import LENGTHS_M
from profiler.models.rules import PresetName
from profiler.models.stated import Entry, Stated, entries
from profiler.path import geodesic
from profiler.terrain_error import TERRAIN_ERRORS

ROOT = Path(__file__).resolve().parent.parent

SMALL = """\
frequency_ghz = 7.5
[site_a]
position = "46.0490 N, 39.1005 W"
antenna_m = 35
[site_b]
position = "46.0490 N, 38.8743 W"
antenna_m = 30
[terrain]
paths = ["dem"]
[rules]
preset = "0.6-f1-plus-3m"
"""

RADIO = """
[radio.a]
power_dbm = 27
gain_dbi = 36
[radio.b]
power_dbm = 27
diameter_ft = 4
efficiency = 0.6
"""


@pytest.fixture
def folder(tmp_path):
    (tmp_path / "dem").mkdir()
    (tmp_path / "canopy.tif").touch()
    return tmp_path


def small(**changes: str) -> str:
    """Text of the small hop with lines replaced: the name is the key's, ``table__key`` where two tables have it."""
    text = SMALL
    for name, line in changes.items():
        table, _, key = name.rpartition("__")
        start = text.index(f"[{table}]") if table else 0
        at = re.compile(rf"^{key} = .*$", re.MULTILINE).search(text, start)
        text = f"{text[: at.start()]}{line}{text[at.end() :]}"
    return text


def read(folder: Path, text: str) -> models.Hop:
    return parse_hop(text, "hop.toml", folder)


def refused(folder: Path, text: str) -> str:
    with pytest.raises(InputError, match=r"^hop\.toml: ") as caught:
        read(folder, text)
    message = str(caught.value)
    assert "\n" not in message
    return message.removeprefix("hop.toml: ")


# What a file means ----------------------------------------------------------------------------------------------------


def test_small_hop(folder):
    hop = read(folder, SMALL)
    assert (hop.site_a.latitude, hop.site_a.longitude, hop.site_a.antenna_m) == (46.049, -39.1005, 35)
    assert hop.frequency_hz == 7.5e9
    assert hop.terrain == models.TerrainChoice((folder / "dem",))
    assert hop.rules == (models.Rule(1.0, 0.6, 3.0, "0.6-f1-plus-3m"),)
    assert (hop.radio, hop.availability, hop.confidence, hop.air) == (None, None, None, models.AirChoice())
    assert hop.name == "A to B"
    assert hop.source == "hop.toml"
    assert hop.assumptions == (
        "positions: no datum is given for A and B, WGS 84 is taken",
        "rules of preset 0.6-f1-plus-3m (fixed k, whatever the climate): 0.6 F1 + 3 m at k = 1; handbooks of the 1970s,"
        " from memory: no edition is at hand to cite",
        "polarization: none is given, vertical is taken",
    )


def test_a_median_k_is_what_the_file_says_or_left_to_the_study(folder):
    assert read(folder, SMALL).median_k is None
    assert read(folder, small(rules__preset='preset = "0.6-f1-plus-3m"\nmedian_k = 1.25')).median_k == 1.25


def test_load_hop_takes_paths_from_its_folder_and_hashes_the_bytes(folder):
    file = folder / "hop.toml"
    file.write_bytes(b"\xef\xbb\xbf" + SMALL.replace("\n", "\r\n").encode())
    hop = load_hop(file)
    assert hop.terrain.paths == (folder / "dem",)
    assert hop.source == str(file)
    assert hop.source_sha256 == hashlib.sha256(file.read_bytes()).hexdigest()


@pytest.mark.parametrize(
    ("key", "metres"),
    [("antenna_m = 30.48", 30.48), ("antenna_ft = 100", 30.48), ("antenna_km = 0.03048", 30.48)],
)
def test_lengths_in_any_unit(folder, key, metres):
    # 1 ft is exactly 0.3048 m (1959 agreement).
    assert read(folder, small(site_a__antenna_m=key)).site_a.antenna_m == pytest.approx(metres, rel=1e-12)


def test_other_units(folder):
    text = small(frequency_ghz="frequency_mhz = 7_500") + (
        "[[rules.rule]]\nk = 1.0\nfresnel_fraction = 0.6\nmargin_ft = 10\n"
        "[[cover.obstacle]]\nname = 'mast'\nat_mi = 2\nheight_ft = 50\n"
        "[heights.a]\ntaken_ft = [10, 20]\ncost_per_ft = 3.048\n"
    )
    hop = read(folder, text)
    assert hop.frequency_hz == 7.5e9
    assert hop.rules[1].margin_m == pytest.approx(3.048, rel=1e-12)
    assert hop.cover.obstacles[0].from_m == pytest.approx(3218.688, rel=1e-12)  # the statute mile is 1609.344 m
    assert hop.cover.obstacles[0].height_m == pytest.approx(15.24, rel=1e-12)
    assert hop.heights.tower_a.taken_m == pytest.approx((3.048, 6.096), rel=1e-12)
    assert hop.heights.tower_a.cost_per_m == pytest.approx(10.0, rel=1e-12)


@pytest.mark.parametrize(
    "place",
    [
        'position = "46°02\'56.4\\"N 39°06\'01.8\\"W"',
        "latitude = 46.0490\nlongitude = -39.1005",
        "easting = 492224.56\nnorthing = 5099496.88\nepsg = 32624",
        "latitude = 46.0490\nlongitude = -39.1005\ndatum = 'WGS84'",
    ],
)
def test_one_site_in_every_form_of_position(folder, place):
    site = read(folder, small(site_a__position=place)).site_a
    # Half a metre: the grid coordinates are this project's own conversion, given to the centimetre.
    assert float(geodesic(-39.1005, 46.049, site.longitude, site.latitude)[0]) < 0.5


def test_a_position_in_another_datum_is_moved_and_says_so(folder):
    text = small(
        site_a__position="position = '36 00 00 N, 112 00 00 W'\ndatum = 'NAD27'",
        site_b__position="latitude = 36.1\nlongitude = -112.1\ndatum = 'EPSG:4267'",
    )
    hop = read(folder, text)
    # NAD27 lies some 65 m from WGS 84 in Arizona (NIMA TR 8350.2, appendix B, from memory).
    moved = float(geodesic(-112, 36, hop.site_a.longitude, hop.site_a.latitude)[0])
    assert moved == pytest.approx(67, abs=10)
    assert hop.site_a.position_notes[0] == "given as 36 00 00 N, 112 00 00 W"
    assert hop.site_a.position_notes[1].startswith("from NAD27 (EPSG:4267) by NAD27 to WGS 84")
    assert hop.site_b.position_notes[0] == "given as latitude 36.1, longitude -112.1"
    assert not any("no datum" in note for note in hop.assumptions)


def test_k_by_gradient(folder):
    text = small(preset='preset = "p530-extended"\nmedian_gradient_n_km = -57\nlow_gradient_n_km = 39.25')
    rules = read(folder, text + "[[rules.rule]]\ngradient_n_km = 0\nfresnel_fraction = 0.5\n").rules
    # k = 157/(157 + dN/dh): 157/100, 157/196.25, 157/157.
    assert [rule.k for rule in rules] == pytest.approx([1.57, 0.8, 1.0], rel=1e-12)


def test_obstacle_by_position_stands_where_it_is(folder):
    text = SMALL + "[[cover.obstacle]]\nname = 'silo'\nposition = '46.0495 N 39.0 W'\nwidth_m = 30\nheight_m = 20\n"
    hop = read(folder, text)
    silo = hop.cover.obstacles[0]
    along = float(geodesic(-39.1005, 46.049, -39.0, 46.0495)[0])
    assert 0.5 * (silo.from_m + silo.to_m) == pytest.approx(along, abs=1.0)
    assert silo.to_m - silo.from_m == pytest.approx(30)
    said = next(note for note in hop.assumptions if "silo" in note)
    assert re.fullmatch(r"obstacle silo: 77\d\d m from A, \d\d m (left|right) of the path, taken as on it", said)


def test_terrain_error_in_each_of_its_ways(folder):
    def confidence(lines: str) -> models.ConfidenceChoice:
        return read(folder, f"{SMALL}[confidence]\n{lines}").confidence

    named = confidence("terrain_kind = 'srtm-1'")
    assert named.terrain_sigma_m == TERRAIN_ERRORS["srtm-1"].sigma_m
    assert named.correlation_m == TERRAIN_ERRORS["srtm-1"].correlation_m
    assert named.terrain_offset_sigma_m == TERRAIN_ERRORS["srtm-1"].offset_sigma_m
    assert "Oksanen" in named.terrain_source
    le90 = confidence("terrain_le90_m = 16\ncorrelation_m = 100\nterrain_source = 'producer'")
    assert le90.terrain_sigma_m == pytest.approx(16 / 1.645, rel=1e-3)  # LE90 = 1.645 σ of a Gaussian
    local = "; all of it local, as no error common to a neighbourhood is given: the cautious way"
    assert le90.terrain_source == "LE90 16 m / 1.645 (producer)" + local
    split = confidence("terrain_sigma_m = 3\nterrain_offset_sigma_m = 2\ncorrelation_m = 100")
    assert (split.terrain_sigma_m, split.terrain_offset_sigma_m) == (3, 2)
    assert split.terrain_source == "sigma 3 m (hop file)"
    both = confidence(
        "terrain_absolute_le90_m = 9\nterrain_relative_le90_m = 7\ncorrelation_m = 100\nterrain_source = 'producer'"
    )
    # 7/(1.645·sqrt 2) = 3.01 local; sqrt((9/1.645)² - 3.01²) = 4.57 offset
    assert (both.terrain_sigma_m, both.terrain_offset_sigma_m) == pytest.approx((3.01, 4.57), abs=0.005)
    assert both.terrain_source == "LE90 9 m absolute, 7 m relative (producer)"
    rmse = confidence("terrain_rmse_m = 5\ncorrelation_m = inf")
    assert (rmse.terrain_sigma_m, rmse.correlation_m, rmse.vary_k) == (5, float("inf"), False)


def test_celsius(folder):
    assert read(folder, f"{SMALL}[air]\ntemperature_c = 15").air.temperature_k == pytest.approx(288.15)


# What a file may not say ----------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("changes", "more", "message"),
    [
        ({"frequency_ghz": "frequency_ghz = '7.5'"}, "", "frequency_ghz = '7.5': must be a number, 0.01 to 1000 GHz"),
        ({"frequency_ghz": "frequency_mhz = 7.5"}, "", "frequency_mhz = 7.5: must be 10 to 1000000 MHz"),
        ({"frequency_ghz": "frequency_ghz = nan"}, "", "frequency_ghz = nan: must be a number, 0.01 to 1000 GHz"),
        ({"frequency_ghz": ""}, "", "frequency_ghz = (missing): must be a number, 0.01 to 1000 GHz"),
        (
            {"frequency_ghz": "frequency = 7.5"},
            "",
            'frequency = 7.5: must be a number with its unit in quotes, like "7.5 GHz"; or frequency_ghz with',
        ),
        (
            {"site_a__antenna_m": "antenna_ft = 9000"},
            "",
            "site_a.antenna_ft = 9000: must be more than 0 and under 6561.68 ft",
        ),
        (
            {"site_a__antenna_m": "antenna_m = true"},
            "",
            "site_a.antenna_m = true: must be a number, more than 0 and under 2000 m",
        ),
        (
            {"site_a__antenna_m": ""},
            "",
            "site_a.antenna_m = (missing): must be a number, more than 0 and under 2000 m",
        ),
        (
            {"site_a__antenna_m": "antenna_m = 35\nantenna_ft = 115"},
            "",
            "site_a.antenna_ft = 115: must be left out beside antenna_m = 35; give one",
        ),
        (
            {"site_b__antenna_m": "antena_m = 30"},
            "",
            "site_b.antena_m = 30: must be a known key; did you mean antenna_m?",
        ),
        (
            {"site_b__antenna_m": "antenna_m = 30\nfrequency_ghz = 7"},
            "",
            "site_b.frequency_ghz = 7: must be a known key; it belongs at the top of the file, before the first",
        ),
        (
            {"site_b__antenna_m": "antenna_m = 30\nzzz = 7"},
            "",
            r"site_b.zzz = 7: must be a known key; known here: name, position,",
        ),
        (
            {"site_a__position": ""},
            "",
            "site_a.position = (missing): must be given: position, or latitude and longitude",
        ),
        (
            {"site_a__position": "position = '46 N 39 W'\nlatitude = 46"},
            "",
            "site_a.latitude = 46: must be left out beside position; give one of position, or latitude and longitude",
        ),
        ({"site_a__position": "latitude = 46"}, "", "site_a.longitude = (missing): must be given beside latitude"),
        (
            {"site_a__position": "easting = 1.0\nnorthing = 2.0"},
            "",
            "site_a.epsg = (missing): must be given beside easting",
        ),
        (
            {"site_a__position": "easting = 1.0\nnorthing = 2.0\nepsg = 32624\ndatum = 'NAD27'"},
            "",
            "site_a.datum = 'NAD27': must be left out beside easting",
        ),
        (
            {"site_a__position": "easting = 1.0\nnorthing = 2.0\nepsg = 4326"},
            "",
            "site_a.epsg = 4326: must be projected, and WGS 84 (EPSG:4326) is for degrees",
        ),
        (
            {"site_a__position": "easting = 1.0\nnorthing = 2.0\nepsg = 32624"},
            "",
            "site_a.easting, northing = 1, 2: must lie in the area of WGS 84 / UTM zone 24N",
        ),
        (
            {"site_a__position": "position = '46 N 39 W'\ndatum = 'NAD28'"},
            "",
            "site_a.datum = 'NAD28': must be an EPSG code or a known datum; did you mean 'NAD83'?",
        ),
        (
            {"site_a__position": "position = '46 60 N 39 W'"},
            "",
            "site_a.position = '46 60 N 39 W': must be with minutes under",
        ),
        ({"site_a__position": "latitude = 96\nlongitude = 3"}, "", "site_a.latitude = 96: must be -90 to 90 degrees"),
        (
            {"site_a__position": "latitude = -113.1\nlongitude = 37.3"},
            "",
            "site_a.latitude = -113.1: must be -90 to 90 degrees; latitude and longitude look swapped: give latitude = "
            "37.3, longitude = -113.1",
        ),
        (
            {"site_a__position": "latitude = -113.1\nlongitude = 97.3"},
            "",
            "site_a.latitude = -113.1: must be -90 to 90 degrees",
        ),
        (
            {"site_a__position": "position = '-113.1, 37.3'"},
            "",
            "site_a.position = '-113.1, 37.3': must be a latitude of -90 to 90 degrees, not -113.1°; latitude and "
            "longitude look swapped: give 37.3°, -113.1°",
        ),
        (
            {"site_a__position": "position = '46.049 N 38.8743 W'"},
            "",
            "site_b = '46.049000, -38.874300': must be another place than site_a",
        ),
        (
            {"site_b__position": "name = 'A'\nposition = '46.049 N 38.8743 W'"},
            "",
            "site_b.name = 'A': must be another name than that of site_a",
        ),
        ({"paths": "paths = []"}, "", 'terrain.paths = []: must be a list with at least one text, like ["a.tif"]'),
        ({"paths": "paths = 'dem'"}, "", "terrain.paths = 'dem': must be a list with at least one text"),
        (
            {"paths": "paths = ['dem', 'no.tif']"},
            "",
            "terrain.paths[1] = 'no.tif': must be a raster or a folder of rasters",
        ),
        (
            {"paths": "paths = ['dem']\nmethod = 'bilinera'"},
            "",
            "terrain.method = 'bilinera': must be one of 'bilinear', 'highest'; did you mean 'bilinear'?",
        ),
        (
            {"preset": ""},
            "",
            "rules.preset = (missing): must be given: preset, or rule; a named set of rules, beside [[rules.rule]]",
        ),
        ({"preset": "preset = 'p530'"}, "", "rules.preset = 'p530': must be one of 'p530-isolated', 'p530-extended',"),
        (
            {"preset": "preset = 'p530-tropical'"},
            "",
            "rules.low_k = (missing): must be given beside preset 'p530-tropical': the k exceeded for about 99.9 %",
        ),
        (
            {"preset": "preset = 'p530-tropical'\nlow_k = 1.4"},
            "",
            "rules.low_k = 1.4: must be below the median k of 1.333",
        ),
        (
            {"preset": "preset = '0.6-f1-plus-3m'\nlow_k = 0.8"},
            "",
            "rules.low_k = 0.8: must be left out beside preset '0.6-f1-plus-3m', which fixes its k",
        ),
        (
            {"preset": "low_k = 0.8\n[[rules.rule]]\nk = 1\nfresnel_fraction = 1"},
            "",
            "rules.low_k = 0.8: must be left out without a preset that uses it",
        ),
        (
            {"preset": "[[rules.rule]]\nfresnel_fraction = 1"},
            "",
            "rules.rule[0].k = (missing): must be a number, 0.1 to 100; effective earth radius factor",
        ),
        (
            {"preset": "[[rules.rule]]\nk = 1\ngradient_n_km = 0\nfresnel_fraction = 1"},
            "",
            "rules.rule[0].gradient_n_km = 0: must be left out beside k = 1; give one",
        ),
        (
            {"preset": "[[rules.rule]]\ngradient_n_km = -157\nfresnel_fraction = 1"},
            "",
            "rules.rule[0].gradient_n_km = -157: must be -155.43 to 1413 N/km",
        ),
        (
            {"preset": "[rules.rule]\nk = 1\nfresnel_fraction = 1"},
            "",
            "rules.rule = {k = 1, fresnel_fraction = 1}: must be a list of tables, each headed [[rules.rule]]",
        ),
        ({}, "[diffraction]\nmethod = 'knife'", "diffraction.method = 'knife': must be one of 'delta-bullington',"),
        ({}, "[cover]\ncanopy = ['no.tif']", "cover.canopy[0] = 'no.tif': must be a raster"),
        (
            {},
            "[cover]\nlandcover = 'canopy.tif'",
            "cover.class_heights_m = (missing): must be given beside landcover",
        ),
        (
            {},
            "[cover]\nlandcover = 'canopy.tif'\nclass_heights_ft = { 41 = -5 }",
            "cover.class_heights_ft.41 = -5: must be 0 to under 6561.68 ft",
        ),
        (
            {},
            "[cover]\nlandcover = 'canopy.tif'\nclass_heights_m = { forest = 5 }",
            "cover.class_heights_m.forest = 5: must be keyed by a whole number, like 41 = 18",
        ),
        (
            {},
            "[[cover.obstacle]]\nheight_m = 5",
            "cover.obstacle[0].at_km = (missing): must be given: at_km, or from_km and to_km, or",
        ),
        (
            {},
            "[[cover.obstacle]]\nheight_m = 5\nat_km = 1\nfrom_km = 1\nto_km = 2",
            "cover.obstacle[0].from_km = 1: must be left out beside at_km; give one of at_km, or",
        ),
        (
            {},
            "[[cover.obstacle]]\nname = 'x'\nheight_m = 5\nfrom_km = 3\nto_km = 2",
            "cover.obstacle[0].to_km = 2: must be at least from_m = 3000; both are from site A",
        ),
        (
            {},
            "[[cover.obstacle]]\nheight_m = 5\nposition = '46.06 N 39.0 W'",
            "cover.obstacle[0].position = '46.06 N 39.0 W': must be within 200 m of the path; it lies 12",
        ),
        (
            {},
            "[[cover.obstacle]]\nheight_m = 5\nposition = '46.049 N 39.2 W'",
            "cover.obstacle[0].position = '46.049 N 39.2 W': must be between the sites; it lies 77",
        ),
        ({}, "[radio.a]\npower_dbm = 1\ngain_dbi = 30", "radio.b = (missing): must be a table, headed [radio.b]"),
        (
            {},
            RADIO.replace("efficiency = 0.6", ""),
            "radio.b.efficiency = (missing): must be given beside diameter_ft; or give gain_dbi",
        ),
        ({}, RADIO.replace("0.6", "60"), "radio.b.efficiency = 60: must be more than 0 and at most 1"),
        ({}, RADIO + "[radio.losses]\nrain = -1", "radio.losses.rain = -1: must be 0 dB or more"),
        ({}, RADIO + "[[radio.mode]]\nthreshold_dbm = -70", "radio.mode[0].name = (missing): must be text in quotes"),
        (
            {},
            RADIO + "[[radio.mode]]\nname = 'a'\n[[radio.mode]]\nname = 'a'",
            "radio.mode[1].name = 'a': must be another name than that of mode[0]",
        ),
        (
            {},
            RADIO + "[[radio.mode]]\nname = 'a'\n[radio.mode.signature]\nwidth_mhz = 0",
            "radio.mode[0].signature.width_mhz = 0: must be more than 0 MHz",
        ),
        (
            {},
            "[availability]\nmultipath_method = 'p530-17'\nk_percentiles = [[50, 1.3], [10, 1.4]]",
            "availability.k_percentiles = [[50, 1.3], [10, 1.4]]: must be pairs of percent and k, both ascending",
        ),
        (
            {},
            "[availability]\nmultipath_method = 'p530-17'\n[availability.objective]\nerrored_seconds_ratio = 1e-4",
            "availability.objective.errored_threshold_offset_db = (missing): must be given beside",
        ),
        ({}, "[heights.a]\ntaken_ft = 10", "heights.a.taken_ft = 10: must be a list of numbers in ft"),
        (
            {},
            "[availability]\nmultipath_method = 'p530-17'\nk_percentiles = [50, 1.3]",
            "availability.k_percentiles[0] = 50: must be pairs of numbers, like [[0.1, 0.8], [50, 1.3333]]",
        ),
        (
            {},
            "[availability]\nmultipath_method = 'p530-17'\nk_percentiles = [[50, 1.3]]\n"
            "[confidence]\nterrain_kind = 'srtm-1'\nvary_k = true",
            "confidence.vary_k = true: must be false where nothing says how k varies; give two or more availability",
        ),
        ({}, "[heights.a]\ncost_per_m = -1", "heights.a.cost_per_m = -1: must be 0 to 1000000000"),
        (
            {},
            "[heights.b]\nlowest_m = 30\nhighest_m = 20",
            "heights.b.highest_m = 20: must be at least lowest_m = 30",
        ),
        (
            {},
            "[heights.a]\ntaken_ft = [10, 'x']",
            "heights.a.taken_ft[1] = 'x': must be a number, more than 0 and under",
        ),
        (
            {},
            "[confidence]\ndraws = 500",
            "confidence.terrain_kind = (missing): must be given: terrain_kind, or terrain_rmse_m and corr",
        ),
        (
            {},
            "[confidence]\nterrain_kind = 'srtm'",
            "confidence.terrain_kind = 'srtm': must be one of 'srtm-1', 'srtm-3',",
        ),
        (
            {},
            "[confidence]\nterrain_kind = 'merit'\nterrain_offset_sigma_m = 2",
            "confidence.terrain_offset_sigma_m = 2: must be left out beside terrain_kind; it goes with",
        ),
        (
            {},
            "[confidence]\nterrain_rmse_m = 5",
            "confidence.correlation_m = (missing): must be given beside terrain_rmse_m",
        ),
        (
            {},
            "[confidence]\nterrain_kind = 'srtm-1'\nvary_k = true",
            "confidence.vary_k = true: must be false where nothing says how k varies; give two or more availability.k_",
        ),
        (
            {},
            "[confidence]\nterrain_kind = 'srtm-1'\ndraws = 10",
            "confidence.draws = 10: must be 100 to 1000000",
        ),
        (
            {},
            "[confidence]\nterrain_kind = 'srtm-1'\ndraws = 1000.0",
            "confidence.draws = 1000.0: must be a whole number, 100 to 1000000",
        ),
        (
            {},
            "[air]\ntemperature_c = 5\ntemperature_k = 280",
            "air.temperature_k = 280: must be left out beside temperature_c = 5; give one",
        ),
        ({}, "[air]\ntemperature_k = 15", "air.temperature_k = 15: must be 150 to 350 K"),
    ],
)
def test_refused(folder, changes, more, message):
    assert refused(folder, small(**changes) + more).startswith(message)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ('name = "a\\nb"\n' + SMALL, r"name = 'a\nb': must be text on one line without control characters"),
        ('name = ""\n' + SMALL, "name = '': must be text in quotes, not empty"),
        (
            small(site_a__antenna_m='antenna_m = 35\nname = "a\\u001b[31m"'),
            r"site_a.name = 'a\x1b[31m': must be text on",
        ),
        (small(site_a__antenna_m='antenna_m = 35\nname = "a\\u202e"'), r"site_a.name = 'a\u202e': must be text on"),
        (
            SMALL + '[[rules.rule]]\nk = 1\nfresnel_fraction = 1\nlabel = "a\\tb"',
            r"rules.rule[0].label = 'a\tb': must be text on one line",
        ),
        (
            SMALL + RADIO + '[radio.losses]\n"a\\u0007" = 1',
            r"radio.losses = 'a\x07': must be a table of keys that are text on one line without control characters",
        ),
        ('"\\u001b[31m" = 1\n' + SMALL, r"\x1b[31m = 1: must be a known key"),
        (small(paths='paths = ["d\\u009bem"]'), r"terrain.paths[0] = 'd\x9bem': must be text on one line"),
    ],
)
def test_nothing_that_steers_a_terminal_gets_through(folder, text, message):
    assert refused(folder, text).startswith(message)


@pytest.mark.parametrize("name", ["Łódź – Süd №1", "پایگاه\u200cها", "山頂 🗼", "a [b] :house: #1"])
def test_names_of_every_writing_pass(folder, name):
    assert read(folder, f"name = {json.dumps(name, ensure_ascii=False)}\n" + SMALL).name == name


def test_no_rules_at_all_lists_the_presets(folder):
    message = refused(folder, SMALL[: SMALL.index("[rules]")])
    assert message.startswith("rules = (missing): must be a table, headed [rules]; what must be clear: a preset (")
    assert all(name in message for name in PRESETS)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("name = 7,5", r"hop\.toml: line 1, column 9: must be TOML: .*; text needs quotes, decimals a point"),
        (
            "a = 1\na = 2",
            r"hop\.toml: line 2, column 6: must be TOML: cannot overwrite a value; give each key and each",
        ),
        ("a = 1\n[b", r"hop\.toml: line 2, column 3: must be TOML: "),
        ('a = """\nb\n', r"hop\.toml: line 3, column 1: must be TOML: "),
    ],
)
def test_broken_toml_says_where(text, message):
    with pytest.raises(InputError, match=message) as caught:
        parse_hop(text, "hop.toml")
    assert "\n" not in str(caught.value)


def test_files_that_cannot_be_read(tmp_path):
    with pytest.raises(InputError, match=r"none\.toml: No such file or directory: must be a hop file that can be read"):
        load_hop(tmp_path / "none.toml")
    with pytest.raises(InputError, match=r"Is a directory: must be a hop file|Permission denied: must be a hop file"):
        load_hop(tmp_path)
    file = tmp_path / "latin.toml"
    file.write_bytes("name = 'x'\n# 46°\n".encode("latin-1"))
    with pytest.raises(InputError, match=r"latin\.toml: line 2: byte 0xb0: must be UTF-8 text"):
        load_hop(file)


json_like = st.recursive(
    st.booleans() | st.dates() | st.integers(-5, 5) | st.floats() | st.text(max_size=5),
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text("abkmx_", max_size=4), inner, max_size=3),
    max_leaves=5,
)


@given(st.data())
def test_any_value_at_any_key_is_taken_or_refused_in_one_line(data):
    raw = tomllib.loads(starter().replace("terrain/", "."))
    table = raw
    while True:
        key = data.draw(st.sampled_from(sorted(table)))
        if not isinstance(table[key], dict) or data.draw(st.booleans()):
            break
        table = table[key]
    table[key] = data.draw(json_like)
    try:
        build_hop(raw, "hop.toml", Path())
    except InputError as error:
        message = str(error)
    else:
        message = "hop.toml: "
    assert message.startswith("hop.toml: ")
    assert "\n" not in message


# Presets --------------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("name", "low_k", "expected"),
    [
        # Rec. ITU-R P.530-18 §2.2 (from memory): 1.0 F1 at the median k; at the low k 0, 0.3 or 0.6 F1.
        ("p530-isolated", 0.8, [(4 / 3, 1.0, 0.0), (0.8, 0.0, 0.0)]),
        ("p530-extended", 0.8, [(4 / 3, 1.0, 0.0), (0.8, 0.3, 0.0)]),
        ("p530-tropical", 0.8, [(4 / 3, 1.0, 0.0), (0.8, 0.6, 0.0)]),
        # Handbooks of the 1970s, from memory.
        ("1.0-and-0.3-f1", None, [(4 / 3, 1.0, 0.0), (2 / 3, 0.3, 0.0)]),
        ("0.6-f1-plus-3m", None, [(1.0, 0.6, 3.0)]),
    ],
)
def test_presets(name, low_k, expected):
    rules = expand_preset(name, low_k=low_k)
    assert [(rule.k, rule.fresnel_fraction, rule.margin_m) for rule in rules] == expected
    assert all(rule.label.startswith(name) for rule in rules)
    assert set(PRESETS) == {"p530-isolated", "p530-extended", "p530-tropical", "1.0-and-0.3-f1", "0.6-f1-plus-3m"}


@pytest.mark.parametrize(("old", "new"), [("high-reliability", "1.0-and-0.3-f1"), ("light-route", "0.6-f1-plus-3m")])
def test_a_preset_by_its_former_name_is_refused_with_its_name_of_now(folder, old, new):
    with pytest.raises(
        InputError, match=f"hop.toml: rules.preset = '{old}': must be written as '{new}', which it is called now"
    ):
        read(folder, small(preset=f"preset = '{old}'"))


def test_a_preset_for_longer_paths_says_so(folder):
    notes = read(folder, small(preset="preset = 'p530-tropical'\nlow_k = 0.9")).assumptions
    assert "preset p530-tropical is for paths over 30 km; this one has 17.5 km" in notes


def test_preset_and_own_rules_add_up(folder):
    hop = read(folder, SMALL + "[[rules.rule]]\nk = 0.9\nfresnel_fraction = 0\nlabel = 'mine'\n")
    assert [rule.label for rule in hop.rules] == ["0.6-f1-plus-3m", "mine"]


# Without a file -------------------------------------------------------------------------------------------------------


def quick(folder, **changes):
    values = {
        "position_a": "46.0490 N, 39.1005 W",
        "position_b": "46.0490 N, 38.8743 W",
        "antenna_a": 35,
        "antenna_b": "98.4 ft",
        "frequency_ghz": 7.5,
        "terrain": ["dem"],
        "preset": "0.6-f1-plus-3m",
        "base_dir": folder,
    }
    return quick_hop(**values | changes)


def test_quick_hop_is_the_hop_of_the_file(folder):
    quickly, slowly = quick(folder, antenna_b="30 m"), read(folder, SMALL)
    for field in fields(quickly):
        if field.name != "source":
            assert getattr(quickly, field.name) == getattr(slowly, field.name)
    assert quickly.source == "command line"
    assert quick(folder).site_b.antenna_m == pytest.approx(98.4 * 0.3048)
    assert quick(folder, preset=None, rules=[(1.0, 0.6, 2.0)]).rules == (models.Rule(1.0, 0.6, 2.0),)


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"antenna_a": -3}, r"command line: site_a\.antenna_m = -3: must be more than 0 and under 2000 m"),
        (
            {"antenna_b": "9000ft"},
            r"command line: site_b\.antenna_ft = 9000\.0: must be more than 0 and under 6561\.68 ft",
        ),
        (
            {"antenna_b": "tall"},
            r"command line: site_b\.antenna = 'tall': must be a number with its unit in quotes, like .35 m",
        ),
        (
            {"preset": None},
            r"command line: rules\.preset = \(missing\): must be given: preset, or rule; .*: p530-isolated",
        ),
        ({"position_a": "46"}, r"command line: site_a\.position = '46': must be a latitude and a longitude"),
        ({"terrain": ["x.tif"]}, r"command line: terrain\.paths\[0\] = 'x\.tif': must be a raster or a folder"),
    ],
)
def test_quick_hop_refuses(folder, changes, message):
    with pytest.raises(InputError, match=message):
        quick(folder, **changes)


# The starter ----------------------------------------------------------------------------------------------------------


def starter_keys(text: str) -> set[tuple[str, str]]:
    """(table, key) of every line of a hop file that holds a key, offered ones among them."""
    found, table = set(), ""
    for line in text.splitlines():
        if header := re.match(r"#?\[+([\w.]+)\]+", line):
            table = header[1]
        elif key := re.match(r"#?(\w+) = ", line):
            found.add((table, key[1]))
    return found


def test_the_whole_starter_with_its_diversity_taken_up(folder):
    text = starter().replace('"terrain/"', '"dem"')
    text = text.replace("#[availability.d", "[availability.d").replace("#spacing_m = 10", "spacing_m = 10")
    assert read(folder, text).availability.diversity == models.DiversityChoice(10.0)


def test_starter_reads_once_its_terrain_is_filled_in(folder):
    hop = read(folder, starter().replace('"terrain/"', '"dem"'))
    assert "invented" in starter()
    assert None not in (hop.radio, hop.availability, hop.confidence)
    assert len(hop.radio.modes) == 2
    assert "[0] = 'terrain/': must be a raster or a folder" in refused(folder, starter())


def every_entry(states=Hop, at="") -> list[tuple[str, Entry]]:
    """Every key that is stated, with the dotted name of its table."""
    found = []
    for entry in entries(states):
        kind = entry.kind.of if entry.kind.sort == "list" else entry.kind
        if kind.sort == "table":
            found += every_entry(kind.of, f"{at}.{entry.usual.key}".lstrip("."))
        elif kind.sort != "named":
            found.append((at, entry))
    return found


def test_every_key_of_the_starter_is_known_and_every_stated_key_is_in_it():
    shown = {key for _, key in starter_keys(starter())}
    stated = {way.key for _, entry in every_entry() for way in entry.ways}
    assert {key for table, key in starter_keys(starter()) if "losses" not in table and "class" not in table} <= stated
    missing = [entry.field for _, entry in every_entry() if shown.isdisjoint(way.key for way in entry.ways)]
    assert missing == []


def test_every_stated_key_is_on_the_page_of_keys():
    page = keys_page()
    assert [entry.field for _, entry in every_entry() if f"| `{entry.usual.key}` |" not in page] == []


def test_the_page_beside_the_readme_is_the_page_of_keys():
    assert (ROOT / "HOPFILE.md").read_text() == keys_page(), "run: hopwright starter --keys HOPFILE.md --force"


def test_every_statement_has_words_an_example_that_it_allows_and_what_is_taken_without_it():
    for table, entry in every_entry():
        assert entry.key.words, (table, entry.field)
        if entry.kind.sort in (float, int):
            assert entry.key.hold(entry.usual.into(entry.key.example)), (table, entry.field)
        if entry.kind.sort == "choice":
            assert entry.key.example in entry.kind.of
        if entry.default is None:
            in_a_form = table in ("site_a", "site_b", "cover.obstacle", "confidence")
            assert entry.key.left_out or in_a_form, (table, entry.field)


@pytest.mark.parametrize("line", [line for line in starter().splitlines() if re.match(r"#(\w+ = |\[)", line)])
def test_every_offered_line_of_the_starter_is_toml(line):
    assert len(tomllib.loads(line[1:])) == 1


def test_starter_sites_stand_in_the_sample_country():
    import rasterio
    from rasterio.warp import transform

    country = ROOT / "sample_dem" / "country.tif"
    hop = parse_hop(starter().replace('"terrain/"', json.dumps(country.name)), base_dir=country.parent)
    with rasterio.open(country) as raster:
        for site in (hop.site_a, hop.site_b):
            (x,), (y,) = transform("EPSG:4326", raster.crs, [site.longitude], [site.latitude])
            assert raster.bounds.left < x < raster.bounds.right
            assert raster.bounds.bottom < y < raster.bounds.top


# One statement of each key --------------------------------------------------------------------------------------------

DERIVED = {"longitude", "latitude", "position_notes", "from_m", "to_m", "terrain_sigma_m", "terrain_source"}
DERIVED |= {"two_frequencies_hz", "correlation_m", "median_k", "assumptions", "overrides", "source", "source_sha256"}
"""Fields that are made from keys: a position, an extent, an error of the terrain, the rules, what reading adds."""


def test_no_field_of_a_model_is_dropped_in_silence():
    for model in (getattr(models, name) for name in models.__all__):
        if isinstance(model, type) and issubclass(model, Stated):
            silent = {field.name for field in fields(model)} - {entry.field for entry in entries(model)}
            assert silent <= DERIVED, model


@given(st.data())
def test_any_stated_number_reaches_the_hop(data):
    """Set one number of the starter's hop in any of its units; the hop holds it at that field, in the field's unit."""
    raw = tomllib.loads(starter().replace("terrain/", "."))
    tables = [(at, entry) for at, entry in every_entry() if entry.kind.sort is float and entry.field not in PLACED]
    at, entry = data.draw(st.sampled_from([(at, entry) for at, entry in tables if walk(raw, at) is not None]))
    way = data.draw(st.sampled_from(entry.ways))
    table = walk(raw, at)
    for other in entry.ways:
        table.pop(other.key, None)
    low, high, *_ = entry.key.ends(way)
    low, high = (-50.0 if low is None else low, 50.0 if high is None else high)
    table[way.key] = data.draw(st.floats(low + 0.3 * (high - low), low + 0.6 * (high - low)))
    hop = build_hop(raw, "hop.toml", Path())
    holders = ConfidenceChoice if entry.owner is TerrainDoubt else entry.owner
    found = [getattr(each, entry.field) for each in walk_hop(hop, holders)]
    assert any(value == pytest.approx(way.into(table[way.key]), rel=1e-9) for value in found if value is not None)


PLACED = {"latitude", "longitude", "easting", "northing", "at_m", "from_m", "to_m", "width_m", "median_k", "low_k"}
PLACED |= {"terrain_rmse_m", "terrain_sigma_m", "terrain_le90_m", "errored_seconds_ratio", "correlation_m"}
PLACED |= {"errored_threshold_offset_db", "lowest_m", "highest_m", "terrain_absolute_le90_m", "terrain_relative_le90_m"}
PLACED |= {"frequency_hz", "return_frequency_hz", "line_length_m", "line_loss_db_per_m"}
"""Numbers that are not taken up field by field, or not alone; they have tests of their own."""


def walk(raw, at):
    """Table of a hop file by its dotted name, the first where there are several; None where it is not there."""
    for name in filter(None, at.split(".")):
        raw = raw.get(name)
        raw = raw[0] if isinstance(raw, list) else raw
        if raw is None:
            return None
    return raw


def walk_hop(value, states):
    """Every object of a class in a hop."""
    if isinstance(value, states):
        yield value
    if isinstance(value, tuple):
        for each in value:
            yield from walk_hop(each, states)
    elif isinstance(value, Stated):
        for field in fields(value):
            yield from walk_hop(getattr(value, field.name), states)


def test_names_of_choices_are_those_of_their_tables():
    assert get_args(PresetName) == tuple(PRESETS)
    assert get_args(TerrainKind) == tuple(TERRAIN_ERRORS)


# The JSON Schema ------------------------------------------------------------------------------------------------------


@cache
def validator() -> Draft202012Validator:
    Draft202012Validator.check_schema(hop_schema())
    return Draft202012Validator(hop_schema())


@pytest.mark.parametrize("path", sorted((ROOT / "sample_dem").glob("*.toml")))
def test_samples_keep_to_the_schema(path):
    validator().validate(tomllib.loads(path.read_text()))


def test_the_starter_keeps_to_the_schema():
    validator().validate(tomllib.loads(starter()))
    validator().validate(tomllib.loads(SMALL + RADIO))


EXAMPLE = object()
SIMPLE = st.booleans() | st.integers(-5, 5) | st.floats(-1e4, 1e4) | st.sampled_from(["", "a", "0.6-f1-plus-3m"])


@given(st.integers(0, 999), st.integers(0, 9), st.booleans(), SIMPLE | st.lists(SIMPLE, max_size=2) | st.just(EXAMPLE))
@settings(max_examples=100)
def test_the_schema_refuses_what_the_reader_refuses_and_takes_what_it_takes(which, unit, beside, value):
    """Spoil one key of the starter, or say it twice; beyond what a schema can know, both must agree."""
    raw = tomllib.loads(starter().replace("terrain/", "."))
    keys = [pair for pair in every_entry() if walk(raw, pair[0]) is not None]
    at, entry = keys[which % len(keys)]
    table, way = walk(raw, at), entry.ways[unit % len(entry.ways)]
    for other in () if beside else entry.ways:
        table.pop(other.key, None)
    table[way.key] = entry.key.example if value is EXAMPLE else value
    try:
        build_hop(raw, "hop.toml", Path())
    except InputError as error:
        refused = error
    else:
        refused = None
    beyond = ("paths", "canopy", "landcover", "position", "datum", "epsg", "easting", "low_k", "taken_m", "vary_k")
    beyond += ("highest_m", "lowest_m", "latitude", "longitude", "k_percentiles", "to_m", "site_b", "name", "width_m")
    if refused is None or not any(name in str(refused).partition(" = ")[0] for name in beyond):
        assert validator().is_valid(raw) == (refused is None), refused


def test_diffraction_methods_are_those_that_exist():
    message = "must be one of " + ", ".join(repr(name) for name in METHODS)
    with pytest.raises(InputError, match=re.escape(message)):
        parse_hop(SMALL.replace('"dem"', '"."') + "[diffraction]\nmethod = 'none'")


# Heights written back -------------------------------------------------------------------------------------------------


@given(st.floats(0.5, 200), st.floats(0.5, 200))
def test_with_antennas_changes_two_numbers_and_nothing_else(a_m, b_m):
    text = starter().replace("antenna_m = 30", "antenna_ft = 98.43")
    changed = with_antennas(text, a_m, b_m)
    old, new = text.splitlines(), changed.splitlines()
    different = [index for index, (one, other) in enumerate(zip(old, new, strict=True)) if one != other]
    assert all(old[index].startswith("antenna_") for index in different)
    assert len(different) <= 2
    data = tomllib.loads(changed)
    assert data["site_a"]["antenna_m"] == pytest.approx(a_m, abs=0.0006)
    assert data["site_b"]["antenna_ft"] * 0.3048 == pytest.approx(b_m, abs=0.0006)


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        (
            "[site_b]\r\nantenna_m=1\r\n[ site_a ] # x\r\n  antenna_m\t= 2.50 # y",
            "[site_b]\r\nantenna_m=8\r\n[ site_a ] # x\r\n  antenna_m\t= 7 # y",
        ),
        ("site_a.antenna_m = 1\nsite_b.antenna_m = 2", "site_a.antenna_m = 7\nsite_b.antenna_m = 8"),
        (
            "site_a = { antenna_m = 1, name = 'x' }\nsite_b = {antenna_m=2}",
            "site_a = { antenna_m = 7, name = 'x' }\nsite_b = {antenna_m=8}",
        ),
        (
            '[site_a]\n#antenna_m = 5\n"antenna_m" = 1\n[site_b]\nantenna_km = 1e-2',
            '[site_a]\n#antenna_m = 5\n"antenna_m" = 7\n[site_b]\nantenna_km = 0.008',
        ),
    ],
)
def test_with_antennas_in_every_layout(text, expected):
    assert with_antennas(text, 7, 8) == expected
    assert with_antennas("\ufeff" + text, 7, 8) == "\ufeff" + expected


@pytest.mark.parametrize(
    ("text", "a_m", "message"),
    [
        ("[site_a]\nantenna_m = 1\n[site_b]\nname = 'x'", 7, r"site_b: antenna_m \(or antenna_ft\): must stand .* 8 m"),
        (
            '[site_a]\nname = """\nantenna_m = 1"""\nantenna_m = 2\n[site_b]\nantenna_m = 1',
            7,
            r"write 7 m there by hand",
        ),
        ("[site_a]\nantenna_m = 1\n[site_b]\nantenna_m = 1", 0, r"site_a\.antenna_m = 0: must be more than 0"),
        ("[site_a", 7, r"line 1, column 8: must be TOML"),
    ],
)
def test_with_antennas_refuses(text, a_m, message):
    with pytest.raises(InputError, match=message):
        with_antennas(text, a_m, 8)


def test_length_units_are_exact():
    # International foot and statute mile (1959 agreement).
    assert LENGTHS_M == {"m": 1, "ft": 0.3048, "km": 1000, "mi": 1609.344}


def test_importing_the_package_does_not_import_pyproj():
    code = "import sys, profiler.hopfile, profiler.path; print({'pyproj', 'rasterio'} & set(sys.modules))"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "set()"
