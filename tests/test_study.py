"""Whole studies on ground whose answer is known: by closed form, by symmetry, or by what must follow from a change.

The ground is a strip of one-arc-second cells (31 m by 21 m) along the meridian 9° E, so that a path along it is exactly
the meridian and its distances are those of the rows. Real ground is in test_study_real.py.
"""

import hashlib
import json
import math
from dataclasses import replace
from importlib.util import find_spec
from itertools import pairwise
from types import SimpleNamespace

import numpy as np
import pytest
from affine import Affine
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.ndimage import gaussian_filter

from profiler.climate import lookup
from profiler.confidence import Chance
from profiler.document import point_table, to_document
from profiler.document.heights_document import heights_document
from profiler.errors import DatumError, InputError, MissingGroundError
from profiler.geometry import ROUNDING_M
from profiler.hopfile import load_hop
from profiler.models import (
    AvailabilityChoice,
    ConfidenceChoice,
    CoverChoice,
    DiffractionChoice,
    HeightsChoice,
    Hop,
    Objective,
    Obstacle,
    Radio,
    RadioMode,
    Rule,
    Site,
    Terminal,
    TerrainChoice,
    TowerChoice,
)
from profiler.plan import plan_heights
from profiler.study import open_hop_terrain, run_study
from profiler.study.outage import OutageResult
from profiler.study.reasons import ChanceTooSmall, MarginMissing, find_reasons
from profiler.words import METRES, Scale, headline

CELL = 1 / 3600
ROWS, COLUMNS = 720, 61
WEST, NORTH = 9.0 - 30.5 * CELL, 46.19
LATITUDE = NORTH - CELL * (np.arange(ROWS) + 0.5)
LONGITUDE = WEST + CELL * (np.arange(COLUMNS) + 0.5)
CELL_EW_M, CELL_NS_M = 21.5, 30.87
"""At 46° N on WGS 84, to the digits shown (111 320 m · cos 46° / 3600 and the meridian's 111 147 m / 3600)."""

MID_ROW = 342  # the row whose centre is nearest to the middle of the path
GROUND_M = 100.0


def north_up(west: float, north: float, cell: float) -> Affine:
    """Place square cells by their north-west corner."""
    return Affine(cell, 0.0, west, 0.0, -cell, north)


@pytest.fixture
def land(write_raster):
    """Write the strip with heights (rows, columns) or one height: ``land(heights, "name.tif", nodata=…)``."""

    def write(heights=GROUND_M, name="ground.tif", *, crs="EPSG:4326", west=WEST, **options):
        heights = np.broadcast_to(np.asarray(heights, dtype=float), (ROWS, COLUMNS))
        return write_raster(name, heights, north_up(west, NORTH, CELL), crs, **options)

    return write


def hop_over(*terrain, **changes) -> Hop:
    """Make a 20 km hop due north over rasters, 30 m up at both ends, under two rules."""
    hop = Hop(
        name="strip",
        site_a=Site("south", 9.0, 46.0, 30.0),
        site_b=Site("north", 9.0, 46.18, 30.0),
        frequency_hz=7.5e9,
        rules=(Rule(4 / 3, 1.0), Rule(2 / 3, 0.3)),
        terrain=TerrainChoice(terrain),
    )
    return replace(hop, **changes)


def with_terrain(hop: Hop, **changes) -> Hop:
    return replace(hop, terrain=replace(hop.terrain, **changes))


RADIO = Radio(
    Terminal(power_dbm=27.0, gain_dbi=36.0, line_loss_db=1.0),
    Terminal(power_dbm=20.0, gain_dbi=33.0, line_loss_db=2.0),
    (RadioMode("256-QAM", threshold_dbm=-64.0), RadioMode("QPSK", threshold_dbm=-86.0)),
    (("aging", 1.5),),
)
CLIMATE = AvailabilityChoice(
    "p530-17-quick",
    Objective(year_percent=0.01),
    rain_rate_mm_h=30.0,
    dn1_n_km=-300.0,
    k_percentiles=((0.1, 0.7), (50.0, 4 / 3), (99.0, 2.2)),
)


def rolling(seed=1) -> np.ndarray:
    """Smooth hills of some 30 m about 100 m."""
    noise = np.random.default_rng(seed).standard_normal((ROWS, COLUMNS))
    return GROUND_M + 30 * gaussian_filter(noise, 25) / 0.0112


def ridge(height_m: float, row=MID_ROW) -> np.ndarray:
    """Three rows of cells across the path: sharp, but wide enough that points half a cell apart find its top."""
    heights = np.full((ROWS, COLUMNS), GROUND_M)
    heights[row - 1 : row + 2] += height_m
    return heights


def surpluses(study) -> np.ndarray:
    return np.array([result.check.surplus_m for result in study.rules])


def on_common_points(one, other) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Distances of the points that two studies share, nearly all, and the surpluses of both there."""
    shared, here, there = np.intersect1d(one.profile.distance_m, other.profile.distance_m, return_indices=True)
    assert shared.size > 0.85 * max(one.line.points, other.line.points)
    return shared, surpluses(one)[:, here], surpluses(other)[:, there]


def swapped(hop: Hop) -> Hop:
    """Make the same hop told from the other end."""
    radio = hop.radio and replace(hop.radio, terminal_a=hop.radio.terminal_b, terminal_b=hop.radio.terminal_a)
    return replace(hop, site_a=hop.site_b, site_b=hop.site_a, radio=radio)


# Closed forms ---------------------------------------------------------------------------------------------------------


def test_flat_ground_is_the_closed_form(land):
    study = run_study(hop_over(land()))
    length_km = study.line.distance_m / 1e3
    for result, k, fraction in zip(study.rules, (4 / 3, 2 / 3), (1.0, 0.3), strict=True):
        # the forms of the trade, d in km: bulge d1·d2/(12.742·k) and F1 17.3·sqrt(d1·d2/(f·d)), rounded to 0.3 %
        bulge_m = length_km**2 / 4 / (12.742 * k)
        f1_m = 17.3 * math.sqrt(length_km / 4 / 7.5)
        check = result.check
        assert check.bulge_m[check.critical] == pytest.approx(bulge_m, rel=1e-3)
        assert check.f1_m[check.critical] == pytest.approx(f1_m, rel=3e-3)
        assert check.surplus_m[check.critical] == pytest.approx(30 - bulge_m - fraction * f1_m, abs=0.06)
        assert study.profile.distance_m[check.critical] == pytest.approx(length_km * 500, abs=1.0)
        assert result.passes
        assert result.held.passes
    assert study.verdict.outcome == "passes"
    assert headline(study, METRES) == "Clears every rule; tightest 10.00 km from A: 10.0 m to spare (1.0 F1 at k = 4/3)"
    assert headline(study, Scale(feet=True)).endswith("tightest 6.22 mi from A: 32.7 ft to spare (1.0 F1 at k = 4/3)")


def test_the_path_is_the_meridian(land):
    study = run_study(hop_over(land()))
    line = study.line
    # WGS 84 meridian arc by the series in the third flattening (Rapp, Geometric Geodesy I, 1991, §3.6; from memory)
    n = (1 / 298.257223563) / (2 - 1 / 298.257223563)
    a0 = 6378137 / (1 + n) * (1 + n**2 / 4 + n**4 / 64)

    def arc(degrees):
        phi = math.radians(degrees)
        waves = (-3 / 2 * n + 9 / 16 * n**3, 15 / 16 * n**2, -35 / 48 * n**3)
        return a0 * (phi + sum(c * math.sin(2 * j * phi) for j, c in enumerate(waves, start=1)))

    assert line.distance_m == pytest.approx(arc(46.18) - arc(46.0), abs=2e-3)
    assert (line.azimuth_a_deg, line.azimuth_b_deg) == pytest.approx((0.0, 180.0), abs=1e-9)
    assert study.terrain.finest_cell_m == pytest.approx(CELL_EW_M, rel=3e-3)
    rows = LATITUDE[(LATITUDE > 46.0) & (LATITUDE < 46.18)]  # the lines that the path crosses: each has a point
    assert np.abs(rows[:, None] - study.profile.latitude).min(axis=1) == pytest.approx(np.zeros(rows.size), abs=1e-9)


def test_a_sharp_ridge_is_a_knife_edge(land):
    hop = hop_over(
        land(ridge(60.0)), diffraction=DiffractionChoice("knife-edge"), rules=(Rule(4 / 3, 1.0),), radio=RADIO
    )
    study = run_study(hop)
    [loss], check = study.diffraction, study.rules[0].check
    d1 = study.profile.distance_m[check.critical]
    d2 = study.line.distance_m - d1
    height = 160 + d1 * d2 / (2 * 4 / 3 * 6371e3) - 130
    nu = height * math.sqrt(2 / (299792458 / 7.5e9) * (1 / d1 + 1 / d2))
    # Rec. ITU-R P.526-15 §4.1, equation (31)
    assert loss.loss_db == pytest.approx(6.9 + 20 * math.log10(math.sqrt((nu - 0.1) ** 2 + 1) + nu - 0.1), abs=0.01)
    assert d1 == pytest.approx((46.0 - LATITUDE[MID_ROW]) * -111147, abs=1.5 * CELL_NS_M)
    assert study.verdict.outcome == "fails"
    assert not check.line_of_sight
    assert study.budget.a_to_b.diffraction_db == loss.loss_db


def test_elevation_angles_on_flat_ground_look_down_by_half_the_bend(land):
    study = run_study(hop_over(land()))
    for result in study.rules:
        half_bend_deg = math.degrees(study.line.distance_m / (2 * result.check.rule.k * 6371e3))
        assert result.elevation_a_deg == pytest.approx(-half_bend_deg, abs=1e-5)
        assert result.elevation_b_deg == pytest.approx(-half_bend_deg, abs=1e-5)


# Properties of whole studies ------------------------------------------------------------------------------------------


def test_swapping_the_ends_mirrors_everything(land):
    hop = hop_over(land(rolling()), radio=RADIO, availability=CLIMATE, site_b=Site("north", 9.0005, 46.18, 45.0))
    there, back = run_study(hop), run_study(swapped(hop))
    assert there.line.distance_m == pytest.approx(back.line.distance_m, abs=1e-6)
    assert (there.line.azimuth_a_deg, there.line.azimuth_b_deg) == pytest.approx(
        (back.line.azimuth_b_deg, back.line.azimuth_a_deg), abs=1e-9
    )
    assert (there.elevation_a_deg, there.elevation_b_deg) == pytest.approx(
        (back.elevation_b_deg, back.elevation_a_deg), abs=1e-9
    )
    assert surpluses(there) == pytest.approx(surpluses(back)[:, ::-1], abs=1e-5)
    assert [result.passes for result in there.rules] == [result.passes for result in back.rules]
    for one, other in zip(there.diffraction, back.diffraction, strict=True):
        assert one.loss_db == pytest.approx(other.loss_db, abs=1e-5)
    for name in ("received_dbm", "threshold_dbm", "fade_margin_db", "free_space_db", "gas_db"):
        assert getattr(there.budget.a_to_b, name) == pytest.approx(getattr(back.budget.b_to_a, name), abs=1e-5)
        assert getattr(there.budget.b_to_a, name) == pytest.approx(getattr(back.budget.a_to_b, name), abs=1e-5)
    assert there.outage.availability.year_percent.total == pytest.approx(
        back.outage.availability.year_percent.total, rel=1e-6
    )
    assert [mode.direction for mode in there.outage.modes] != [mode.direction for mode in back.outage.modes]


@settings(max_examples=20)
@given(raise_m=st.floats(0.1, 80.0), end=st.sampled_from(["site_a", "site_b"]))
def test_raising_an_antenna_lifts_the_ray_by_its_share(open_rolling, raise_m, end):
    hop, terrain, before = open_rolling
    site = getattr(hop, end)
    after = run_study(replace(hop, **{end: replace(site, antenna_m=site.antenna_m + raise_m)}), terrain)
    distance_m, low, high = on_common_points(before, after)
    share = distance_m / before.line.distance_m
    lift = raise_m * (share if end == "site_b" else 1 - share)
    assert high - low == pytest.approx(np.tile(lift, (2, 1)), abs=1e-6)


@settings(max_examples=20)
@given(k=st.floats(0.4, 3.0), factor=st.floats(1.01, 3.0))
def test_more_k_never_takes_clearance(open_rolling, k, factor):
    hop, terrain, _ = open_rolling
    low, high = (run_study(replace(hop, rules=(Rule(each, 0.6),)), terrain) for each in (k, k * factor))
    d1, before, after = on_common_points(low, high)
    bend = d1 * (low.line.distance_m - d1) / (2 * 6371e3)
    assert (after - before)[0] == pytest.approx(bend / k - bend / (k * factor), abs=1e-6)


@settings(max_examples=20)
@given(frequency_ghz=st.floats(1.0, 40.0), factor=st.floats(1.01, 2.0))
def test_more_frequency_narrows_the_zone(open_rolling, frequency_ghz, factor):
    hop, terrain, _ = open_rolling
    low, high = (
        run_study(replace(hop, frequency_hz=f * 1e9), terrain) for f in (frequency_ghz, frequency_ghz * factor)
    )
    _, before, after = on_common_points(low, high)
    assert np.all(after >= before - ROUNDING_M)
    for one, other in zip(low.rules, high.rules, strict=True):
        assert other.check.f1_m.max() * math.sqrt(factor) == pytest.approx(one.check.f1_m.max(), rel=1e-6)


@pytest.fixture(scope="module")
def open_rolling(tmp_path_factory):
    """Give a hop over rolling ground, its terrain left open, and its study: for properties that ask it often."""
    import rasterio

    path = tmp_path_factory.mktemp("rolling") / "ground.tif"
    shape = {"count": 1, "height": ROWS, "width": COLUMNS, "dtype": "float64"}
    with rasterio.open(
        path, "w", driver="GTiff", crs="EPSG:4326", transform=north_up(WEST, NORTH, CELL), **shape
    ) as raster:
        raster.write(rolling(), 1)
    hop = with_terrain(hop_over(path), spacing_m=100.0)
    with open_hop_terrain(hop) as terrain:
        yield hop, terrain, run_study(hop, terrain)


@pytest.mark.parametrize("method", ["bilinear", "highest"])
def test_the_spacing_has_no_say_in_what_is_found(land, method):
    hop = with_terrain(hop_over(land(rolling()), site_b=Site("north", 9.004, 46.18, 12.0), radio=RADIO), method=method)
    default, *others = (run_study(with_terrain(hop, spacing_m=each)) for each in (None, 400.0, 37.0, 3.0))
    leasts = surpluses(default).min(axis=1)
    for other in others:
        assert surpluses(other).min(axis=1) == pytest.approx(leasts, abs=1e-4)
        for one, fine in zip(default.diffraction, other.diffraction, strict=True):
            assert fine.loss_db == pytest.approx(one.loss_db, abs=0.02)
        assert other.air.gas_db == pytest.approx(default.air.gas_db, rel=1e-4)
        assert np.diff(other.profile.distance_m).max() <= other.terrain.spacing_m + 0.01


def test_highest_of_the_cells_is_never_lower(land):
    hop = hop_over(land(rolling()))
    highest, bilinear = run_study(with_terrain(hop, method="highest")), run_study(hop)
    x, z = bilinear.profile.distance_m, bilinear.profile.ground_m
    assert np.all(np.interp(x, highest.profile.distance_m, highest.profile.ground_m) >= z - 0.01)
    assert any(each.startswith("ground between cell centres: highest") for each in map(str, highest.assumptions))


# Where the ground comes from ------------------------------------------------------------------------------------------


def test_surveyed_ground_replaces_the_raster_and_says_by_how_much(land):
    path = land(rolling())
    raster = run_study(hop_over(path))
    site = replace(hop_over(path).site_a, surveyed_ground_m=93.25)
    study = run_study(hop_over(path, site_a=site))
    assert study.profile.ground_m[0] == 93.25
    # from the survey straight to the raster where the path first crosses a line through cell centres
    x, straight = study.profile.distance_m, raster.profile.ground_m.copy()
    _, theirs, ours = np.intersect1d(raster.profile.distance_m, x, return_indices=True)
    changed = np.flatnonzero(np.abs(study.profile.ground_m[ours] - straight[theirs]) > 1e-9)
    assert 0 < x[ours[changed]].max() < CELL_NS_M
    north = run_study(hop_over(path, site_b=replace(hop_over(path).site_b, surveyed_ground_m=88.5)))
    assert north.profile.ground_m[[0, -1]].tolist() == [raster.profile.ground_m[0], 88.5]
    _, theirs, ours = np.intersect1d(raster.profile.distance_m, north.profile.distance_m, return_indices=True)
    changed = np.flatnonzero(np.abs(north.profile.ground_m[ours] - straight[theirs]) > 1e-9)
    assert 0 < north.line.distance_m - north.profile.distance_m[ours[changed]].min() < CELL_NS_M
    assert study.terrain.surveyed_difference_a_m == pytest.approx(93.25 - raster.profile.ground_m[0])
    assert study.terrain.surveyed_difference_b_m is None
    assert study.centre_a_m == 93.25 + 30
    assert study.profile.surveyed.nonzero()[0].tolist() == [0]
    assert to_document(study)["hop"]["site_a"]["ground_surveyed"]


def test_a_survey_holds_across_the_path_too(land):
    """At a site the zone has no width, so no column beside it may bring the raster's ground back."""
    hop = hop_over(land(), site_a=Site("south", 9.0, 46.0, 60.0, surveyed_ground_m=35.0))
    study = run_study(hop)
    for result in study.rules:
        assert result.held.least_surplus_m[0] == pytest.approx(result.check.surplus_m[0]) == 60.0


def void(first=300, last=340) -> np.ndarray:
    heights = rolling().copy()
    heights[first : last + 1] = -9999
    return heights


def test_missing_ground_stops_the_study_and_says_where(land):
    with pytest.raises(MissingGroundError, match=r"no ground height at \d+ of \d+ points: from 10\.\d+ to 11\.\d+ km"):
        run_study(hop_over(land(void(), nodata=-9999)))


def test_missing_ground_is_filled_when_the_hop_says_so_and_marked(land):
    hop = with_terrain(hop_over(land(void(), nodata=-9999)), missing="interpolate")
    study = run_study(hop)
    filled, x, z = study.profile.filled, study.profile.distance_m, study.profile.ground_m
    # bilinear cells that touch the void are void too: 41 rows and half a row to each side
    assert study.terrain.filled_share * study.line.distance_m == pytest.approx(42 * CELL_NS_M, abs=CELL_NS_M)
    first, last = filled.nonzero()[0][[0, -1]]
    line = np.interp(x[filled], x[[first - 1, last + 1]], z[[first - 1, last + 1]])
    assert z[filled] == pytest.approx(line, abs=1e-9)
    assert study.terrain.filled_points == filled.sum()
    assert any("interpolated along the path" in note for note in map(str, study.assumptions))
    assert any("beside the path" in warning and "not checked" in warning for warning in map(str, study.warnings))


def test_a_void_under_a_site_cannot_be_filled(land):
    hop = with_terrain(hop_over(land(void(680, 719), nodata=-9999)), missing="interpolate")
    with pytest.raises(MissingGroundError, match=r"from 0\.000 to"):
        run_study(hop)


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"site_a": Site("south", 9.0, 45.0, 30.0)}, "south: longitude 9.0.*off the terrain, about 110"),
        ({"site_a": Site("south", 46.0, 9.0, 30.0)}, "south: .*look swapped: longitude 9.0.*would lie on it"),
        ({"site_b": Site("north", -9.0, 46.18, 30.0)}, "north: .*sign of the longitude"),
        ({"site_b": Site("north", 9.0, -46.18, 30.0)}, "north: .*sign of the latitude"),
    ],
)
def test_a_site_off_the_terrain_is_named_with_its_slip(land, change, message):
    with pytest.raises(InputError, match=message):
        run_study(hop_over(land(), **change))


def two_datums(land):
    south, north = (np.full((ROWS, COLUMNS), GROUND_M) for _ in range(2))
    south[:360], north[360:] = -9999, -9999
    return (
        land(south, "south.tif", crs="EPSG:4326+5773", nodata=-9999),
        land(north, "north.tif", crs="EPSG:4326+3855", nodata=-9999),
    )


def test_two_vertical_datums_on_a_path_stop_the_study_unless_allowed(land):
    hop = hop_over(*two_datums(land))
    with pytest.raises(DatumError, match=r"datums meet on or beside one path: EGM96 geoid \(.*south\.tif\), EGM2008"):
        run_study(hop)
    study = run_study(with_terrain(hop, missing="interpolate", allow_mixed_datums=True))
    assert study.terrain.vertical_datum is None
    assert any("mixed, as allowed" in note for note in map(str, study.assumptions))


def test_another_datum_beside_the_path_stops_the_study_unless_allowed(land):
    """The path runs over the one column that the first raster holds; the second begins half a cell to the east."""
    on, east = (np.full((ROWS, COLUMNS), GROUND_M) for _ in range(2))
    on[:, :30], on[:, 31:], east[:, :30] = -9999, -9999, -9999
    hop = hop_over(
        land(on, "on.tif", crs="EPSG:4326+5773", nodata=-9999),
        land(east, "east.tif", crs="EPSG:4326+3855", nodata=-9999, west=WEST + CELL / 2),
    )
    with pytest.raises(
        DatumError, match=r"meet on or beside one path: EGM96 geoid \(.*on\.tif\), EGM2008 geoid \(.*east"
    ):
        run_study(hop)
    study = run_study(with_terrain(hop, allow_mixed_datums=True))
    assert study.terrain.vertical_datum == "EGM96 geoid"  # the path's own
    assert [use.info.path.name for use in study.terrain.sources] == ["on.tif"]
    assert any("mixed, as allowed: EGM96 geoid" in note for note in map(str, study.assumptions))


def test_another_datum_beside_the_path_does_not_stop_the_view_from_above(land):
    east = land(GROUND_M, "east.tif", crs="EPSG:4326+3855", west=WEST + COLUMNS * CELL)
    study = run_study(hop_over(land(crs="EPSG:4326+5773"), east), relief=True)
    assert study.terrain.vertical_datum.startswith("EGM96")
    assert np.isfinite(study.relief.ground_m[:, -20:]).any()


def test_the_finest_raster_wins_and_the_shares_are_told(land, write_raster):
    wide = write_raster("wide.tif", np.full((80, 80), 50.0), north_up(8.9, 46.3, 1 / 120), "EPSG:4326")  # 30″
    heights = np.full((ROWS, COLUMNS), GROUND_M)
    heights[:342] = -9999
    study = run_study(hop_over(wide, land(heights, nodata=-9999)))
    share = {use.info.path.name: use.share for use in study.terrain.sources}
    assert share["ground.tif"] + share["wide.tif"] == pytest.approx(1.0)
    assert share["ground.tif"] == pytest.approx(np.mean(study.profile.ground_m == GROUND_M), abs=0.01)
    assert study.profile.ground_m[[0, -1]].tolist() == [GROUND_M, 50.0]
    assert np.all(np.diff(study.profile.ground_m) <= 0)  # down at the seam, once
    assert study.profile.mean_ground_m == pytest.approx(50.0 + 50.0 * share["ground.tif"], abs=1e-3)
    assert study.terrain.finest_cell_m == pytest.approx(CELL_EW_M, rel=1e-2)


def test_a_raster_in_feet_becomes_metres_and_says_so(land):
    study = run_study(hop_over(land(1000.0, unit="ft")))
    assert study.profile.ground_m == pytest.approx(np.full(study.line.points, 304.8))
    assert any("ft" in note and "ground.tif" in note for note in map(str, study.assumptions))


def test_a_short_hop_over_coarse_cells_has_points_enough(write_raster):
    path = write_raster("coarse.tif", np.full((6, 6), 10.0), north_up(8.97, 46.03, 0.01), "EPSG:4326")
    study = run_study(hop_over(path, site_b=Site("north", 9.0, 46.02, 30.0)))
    assert np.diff(study.profile.distance_m).max() <= study.line.distance_m / 200 + 0.01
    assert study.verdict.outcome == "passes"


def test_a_spacing_too_wide_for_the_path_names_its_field(land):
    with pytest.raises(InputError, match=r"terrain\.spacing_m = 900: must be at most one 50th of this path of 20\.0"):
        run_study(with_terrain(hop_over(land()), spacing_m=900.0))


def test_across_the_antimeridian(write_raster):
    cell = 1 / 120
    west = write_raster("west.tif", np.full((24, 24), 20.0), north_up(179.8, 70.1, cell), "EPSG:4326")
    east = write_raster("east.tif", np.full((24, 24), 20.0), north_up(-180.0, 70.1, cell), "EPSG:4326")
    hop = hop_over(west, east, site_a=Site("west", 179.85, 70.0, 30.0), site_b=Site("east", -179.85, 70.0, 30.0))
    study = run_study(hop)
    # 0.3° of the parallel at 70° N: 0.3 · π/180 · a·cos φ / sqrt(1 - e²·sin² φ)
    parallel_m = (
        math.radians(0.3)
        * 6378137
        * math.cos(math.radians(70))
        / math.sqrt(1 - 0.00669438 * math.sin(math.radians(70)) ** 2)
    )
    assert study.line.distance_m == pytest.approx(parallel_m, rel=1e-5)
    assert {use.info.path.name for use in study.terrain.sources} == {"west.tif", "east.tif"}
    assert study.profile.ground_m == pytest.approx(np.full(study.line.points, 20.0))


# Cover, and what stands beside ----------------------------------------------------------------------------------------


def test_canopy_raises_the_surface_by_its_height(land):
    path = land(rolling())
    canopy = np.zeros((ROWS, COLUMNS))
    canopy[300:400] = 18.0
    bare = run_study(hop_over(path))
    wooded = run_study(hop_over(path, cover=CoverChoice(canopy=(land(canopy, "canopy.tif"),))))
    cover = wooded.profile.cover_m
    assert (cover.min(), cover.max()) == pytest.approx((0.0, 18.0), abs=1e-9)
    _, here, there = np.intersect1d(bare.profile.distance_m, wooded.profile.distance_m, return_indices=True)
    taken = surpluses(bare)[:, here] - surpluses(wooded)[:, there]
    assert taken == pytest.approx(np.tile(cover[there], (2, 1)), abs=1e-9)
    assert wooded.profile.ground_m[there] == pytest.approx(bare.profile.ground_m[here])


def test_land_cover_gives_each_class_its_height(land, write_raster):
    classes = np.full((ROWS, COLUMNS), 7, dtype="uint8")
    classes[300:400] = 4
    landcover = write_raster("classes.tif", classes, north_up(WEST, NORTH, CELL))
    hop = hop_over(land(), cover=CoverChoice(landcover=landcover, class_heights_m=((4, 15.0), (7, 1.0))))
    study = run_study(hop)
    in_wood = (study.profile.latitude < NORTH - 300 * CELL) & (study.profile.latitude > NORTH - 400 * CELL)
    assert study.profile.cover_m.tolist() == np.where(in_wood, 15.0, 1.0).tolist()
    with pytest.raises(InputError, match=r"class_heights_m: classes\.tif holds class 4 .* must list a height for it"):
        run_study(replace(hop, cover=replace(hop.cover, class_heights_m=((7, 1.0),))))


def test_an_obstacle_counts_where_it_stands(land):
    mast = Obstacle("water tower", 8000.0, 8005.0, 28.0)
    study = run_study(hop_over(land(), cover=CoverChoice(obstacles=(mast,))))
    under = study.profile.cover_m.nonzero()[0]
    edges = study.profile.distance_m[[under[0] - 1, under[0], under[-1], under[-1] + 1]]
    assert edges == pytest.approx([8000, 8000, 8005, 8005], abs=0.00051)
    assert all(result.check.critical == under[-1] for result in study.rules)
    assert study.verdict.outcome == "fails"
    pole = run_study(hop_over(land(), cover=CoverChoice(obstacles=(replace(mast, from_m=8003.0, to_m=8003.0),))))
    assert [result.check.surplus_m.min() for result in pole.rules] == pytest.approx(
        [result.check.surplus_m.min() for result in study.rules], abs=0.05
    )
    with pytest.raises(InputError, match=r"obstacle far mast: to_m = 30000: must lie within the 200\d\d m path"):
        run_study(hop_over(land(), cover=CoverChoice(obstacles=(Obstacle("far mast", 29990.0, 30000.0, 5.0),))))


def test_an_antenna_in_its_own_trees_is_named_and_a_clearing_helps(land):
    hop = hop_over(land(), cover=CoverChoice(canopy=(land(35.0, "canopy.tif"),)))
    with pytest.raises(InputError, match=r"site_a\.antenna_m = 30: must be above the 35\.0 m of cover at south"):
        run_study(hop)
    cleared = replace(hop, site_a=replace(hop.site_a, clearing_m=50.0), site_b=replace(hop.site_b, clearing_m=50.0))
    study = run_study(cleared)
    near = np.minimum(study.profile.distance_m, study.line.distance_m - study.profile.distance_m) <= 50.0
    assert study.profile.cover_m.tolist() == np.where(near, 0.0, 35.0).tolist()
    edges = study.profile.distance_m[np.flatnonzero(np.diff(near.astype(int)))]  # a hair before or after the trees
    assert edges == pytest.approx([50.0, study.line.distance_m - 50.0], abs=0.001)


def wall(side: int) -> np.ndarray:
    """Put a wall 60 m high one cell beside the path (``side`` 1 east, -1 west), 600 m along its middle."""
    heights = np.full((ROWS, COLUMNS), GROUND_M)
    beside = slice(31, None) if side > 0 else slice(None, 30)
    heights[MID_ROW - 10 : MID_ROW + 10, beside] += 60.0
    return heights


@pytest.mark.parametrize(("side", "name"), [(1, "right"), (-1, "left")])
def test_a_wall_beside_the_path_fails_the_rule_and_names_the_side(land, side, name):
    """At 0.9 GHz F1 is 40.8 m amid the path, and the wall begins at its full height 21.5 m beside it."""
    hop = hop_over(land(wall(side)), frequency_hz=0.9e9, rules=(Rule(4 / 3, 0.6),))
    hop = replace(hop, site_a=replace(hop.site_a, antenna_m=45.0), site_b=replace(hop.site_b, antenna_m=45.0))
    study = run_study(hop)
    [result] = study.rules
    place = result.critical
    assert result.check.passes
    assert not result.held.passes
    assert not result.passes
    assert place.side == name
    assert f"m {name} of the path" in headline(study, METRES)
    # by hand: the wall's flank rises over one cell, and at the offset found: ray - bulge - sqrt(r² - y²) - that flank
    d1, y = place.distance_m, abs(place.offset_m)
    d2 = study.line.distance_m - d1
    flank_m = 60.0 * y / CELL_EW_M
    radius_m = 0.6 * math.sqrt(299792458 / 0.9e9 * d1 * d2 / (d1 + d2))
    surplus_m = 45 - d1 * d2 / (2 * 4 / 3 * 6371e3) - math.sqrt(radius_m**2 - y**2) - flank_m
    assert place.surplus_m == pytest.approx(surplus_m, abs=0.2)  # CELL_EW_M is rounded
    assert result.held.half_width_m == pytest.approx(radius_m, rel=1e-3)
    assert run_study(swapped(hop)).rules[0].critical.side == {"right": "left", "left": "right"}[name]
    critical = to_document(study)["rules"][0]["critical"]
    assert (critical["side"], critical["surplus_m"]) == (name, place.surplus_m)
    assert critical["ground_m"] - GROUND_M == pytest.approx(flank_m, abs=0.2)
    assert critical["clearance_m"] - critical["required_m"] == pytest.approx(critical["surplus_m"])
    east_m = (critical["longitude"] - 9.0) * 111_320 * math.cos(math.radians(46.09))
    assert east_m == pytest.approx(place.offset_m, abs=0.2)


def test_every_rule_looks_as_far_aside_as_its_own_zone(land):
    """The narrower zone is looked at over its own width, however coarse the cells: 0.3 F1 is 4 m and a cell 21 m."""
    study = run_study(hop_over(land(rolling())))
    for result, fraction in zip(study.rules, (1.0, 0.3), strict=True):
        half_width_m = fraction * study.rules[0].check.f1_m
        assert result.held.half_width_m == pytest.approx(half_width_m.max())
        assert np.all(np.abs(result.held.offset_m) <= half_width_m + 0.01)


def test_ground_that_ends_beside_the_path_is_told(land):
    heights = np.full((ROWS, COLUMNS), GROUND_M)
    heights[:, 32:] = -9999
    study = run_study(hop_over(land(heights, nodata=-9999), frequency_hz=0.3e9))
    assert study.rules[0].held.missing_share > 0.1
    assert any("not checked" in warning for warning in map(str, study.warnings))


@pytest.mark.parametrize("end", ["37.5, -112.93", "37.46, -112.95", "37.44, -113.02"])
def test_nothing_is_missing_between_the_squares_of_a_grid_in_degrees(real_terrain, tmp_path, end):
    """They are no parallelograms, and along a parallel the lines across the path run along the grid's own."""
    raster = real_terrain / "canyon_srtm_3arcsec.tif"
    (tmp_path / "hop.toml").write_text(
        f"""
        frequency_ghz = 6.2
        site_a = {{ position = "37.5, -113.02", antenna_m = 40 }}
        site_b = {{ position = "{end}", antenna_m = 40 }}
        terrain.paths = ['{raster}']
        rules.preset = "1.0-and-0.3-f1"
        """
    )
    study = run_study(load_hop(tmp_path / "hop.toml"))
    assert [result.held.missing_share for result in study.rules] == [0.0, 0.0]
    assert not [warning for warning in map(str, study.warnings) if "not checked" in warning]


# Radio and availability -----------------------------------------------------------------------------------------------


def test_without_a_radio_nothing_of_it_is_invented(land):
    document = to_document(run_study(hop_over(land())))
    assert document["budget"] is None
    assert document["availability"] is None
    assert document["confidence"] is None


def test_an_objective_without_a_radio_is_not_called_met(land):
    study = run_study(hop_over(land(), availability=CLIMATE))
    assert study.outage.availability is None
    assert study.verdict.meets_objective is None
    assert any("objective was not judged" in warning for warning in map(str, study.warnings))


def test_the_lines_of_the_budget_add_up_both_ways(land):
    study = run_study(hop_over(land(), radio=RADIO))
    for way in (study.budget.a_to_b, study.budget.b_to_a):
        for mode in way.modes:
            assert sum(line.value for line in mode.lines) == pytest.approx(mode.received_dbm, abs=1e-9)
    # by hand, A to B: 27 - 1 + 36 + 33 - 2 - 1.5, less 20·log10(4π·d·f/c) (Rec. ITU-R P.525), gases and diffraction
    there = study.budget.a_to_b
    free_db = 20 * math.log10(4 * math.pi * study.line.distance_m * 7.5e9 / 299792458)
    assert there.free_space_db == pytest.approx(free_db, abs=1e-9)
    assert there.received_dbm == pytest.approx(91.5 - free_db - there.gas_db - there.diffraction_db, abs=1e-9)
    assert there.fade_margin_db == pytest.approx(there.received_dbm + 64.0)


def test_the_budget_counts_diffraction_at_the_median_k(land):
    study = run_study(hop_over(land(ridge(45.0)), radio=RADIO, median_k=1.0))
    by_k = {loss.k: loss.loss_db for loss in study.diffraction}
    assert by_k[4 / 3] < study.budget.a_to_b.diffraction_db < by_k[2 / 3]
    assert study.median_diffraction.k == 1.0


def with_threshold(threshold_dbm: float) -> Radio:
    return replace(RADIO, modes=(RadioMode("QPSK", threshold_dbm=threshold_dbm),))


@pytest.mark.parametrize(("margin_db", "blocked"), [(8.0, False), (0.5, True)])
def test_obstruction_counts_what_low_k_takes_beyond_the_budget(land, margin_db, blocked):
    """Over a ridge that costs some 25 dB at every k, it is only the difference to the median k that counts."""
    hop = hop_over(land(ridge(50.0)), radio=with_threshold(-80.0), availability=CLIMATE)
    received_dbm = run_study(hop).budget.b_to_a.received_dbm
    study = run_study(replace(hop, radio=with_threshold(received_dbm - margin_db)))
    by_k = {loss.k: loss.loss_db for loss in study.diffraction}
    assert by_k[4 / 3] > 20
    assert by_k[2 / 3] - by_k[4 / 3] == pytest.approx(2.5, abs=2)
    assert study.outage.availability.low_k_blocks is blocked
    assert (study.outage.availability.year_percent.obstruction > 0) is blocked


@pytest.mark.parametrize("k_percentiles", [(), ((0.1, 1.1), (50.0, 4 / 3))])
def test_statistics_that_end_above_the_low_k_do_not_hide_that_it_cuts_the_hop_off(land, k_percentiles):
    climate = replace(CLIMATE, k_percentiles=k_percentiles, objective=Objective(year_percent=50.0))
    hop = hop_over(land(ridge(50.0)), radio=RADIO, availability=climate)
    received_dbm = run_study(hop).budget.b_to_a.received_dbm
    study = run_study(replace(hop, radio=with_threshold(received_dbm - 1.0)))
    assert (study.outage.availability.low_k_blocks, study.verdict.meets_objective) == (True, None)
    assert study.verdict.outcome == "fails"
    assert sum("low k of the rules, 2/3, takes" in warning for warning in map(str, study.warnings)) == 1


def test_multipath_over_a_path_blocked_at_the_median_k_is_warned_of(land):
    def warned(height_m):
        study = run_study(hop_over(land(ridge(height_m)), radio=RADIO, availability=CLIMATE))
        return study.median_diffraction.loss_db, [
            line for line in map(str, study.warnings) if "clear of the ground" in line
        ]

    assert warned(0.0) == (pytest.approx(0.0, abs=1.0), [])
    loss_db, [line] = warned(60.0)
    assert line.startswith(f"diffraction at the median k = {loss_db:.1f} dB")


@pytest.mark.parametrize("objective", [Objective(), Objective(year_percent=0.01)])
def test_too_little_terrain_for_the_roughness_leaves_out_the_outage_and_nothing_else(land, objective):
    climate = replace(CLIMATE, multipath_method="p530-17", objective=objective)
    study = run_study(hop_over(land(), radio=RADIO, availability=climate))
    assert study.outage.availability is None
    assert (study.verdict.clears, study.verdict.outcome) == (True, "not_sure" if study.hop.has_objective else "passes")
    assert study.budget.a_to_b.fade_margin_db > 0
    [line] = [warning for warning in map(str, study.warnings) if "availability was not predicted" in warning]
    assert ("objective not judged" in line) == study.hop.has_objective
    assert "110 km x 110 km box" in line
    assert line.endswith("give terrain_roughness_m, more terrain, or choose p530-17-quick")
    given = run_study(replace(study.hop, availability=replace(climate, terrain_roughness_m=60.0)))
    assert given.outage.availability is not None


@pytest.mark.skipif(find_spec("itur") is None, reason='the maps need pip install "hopwright[climate]"')
def test_the_maps_give_the_median_k_where_the_hop_does_not(land):
    """Beside the library's own reading of P.453-13: the budget takes its k at 50 %, the rules keep theirs."""
    place = lookup(9.0, 46.09)
    maps = AvailabilityChoice("p530-17-quick", Objective(year_percent=0.01), use_maps=True)
    hop = hop_over(land(ridge(40.0)), radio=RADIO, availability=maps)
    study = run_study(hop)
    assert study.climate.median_k == pytest.approx(place.k_median, rel=1e-3)
    assert study.climate.median_k != pytest.approx(4 / 3, rel=1e-3)
    assert study.median_diffraction.k == to_document(study)["hop"]["median_k"] == study.climate.median_k
    assert study.budget.a_to_b.diffraction_db == study.median_diffraction.loss_db
    assert [result.check.rule.k for result in study.rules] == [4 / 3, 2 / 3]
    [line] = [assumption for assumption in map(str, study.assumptions) if assumption.startswith("median k")]
    assert "P.453-13" in line
    assert "4/3" not in line
    used = {each.name: each for each in study.outage.availability.inputs}
    assert used["median_k"].value == study.climate.median_k
    assert used["median_k"].source == used["k_percentiles"].source == place.k_source
    assert (used["rain_rate_mm_h"].source, used["dn1_n_km"].source) == (place.rain_source, place.dn1_source)
    assert f"{study.climate.median_k:.4g} at 50 %" in used["k_percentiles"].value
    stated = run_study(replace(hop, median_k=1.2))
    assert stated.median_diffraction.k == 1.2
    assert not any(assumption.startswith("median k") for assumption in map(str, stated.assumptions))


def test_without_maps_a_median_k_that_is_not_given_is_four_thirds_and_said(land):
    study = run_study(hop_over(land(), radio=RADIO, availability=CLIMATE))
    note = "median k: none is given, 4/3 is taken (Rec. ITU-R P.530-18 §2.2, where unknown)"
    assert study.median_diffraction.k == 4 / 3
    assert study.assumptions.count(note) == 1
    assert note not in run_study(hop_over(land(), median_k=4 / 3)).assumptions


def test_availability_is_that_of_the_weaker_direction(land):
    hop = hop_over(land(), radio=RADIO, availability=CLIMATE)  # B sends 7 dB less into the same losses
    study = run_study(hop)
    assert study.budget.b_to_a.fade_margin_db == pytest.approx(study.budget.a_to_b.fade_margin_db - 7.0)
    assert [mode.direction for mode in study.outage.modes] == ["b_to_a", "b_to_a"]
    assert study.outage.availability.fade_margin_db == study.budget.b_to_a.fade_margin_db
    stronger = replace(RADIO, terminal_b=replace(RADIO.terminal_b, power_dbm=27.0))
    raised = run_study(replace(hop, radio=stronger))
    assert raised.outage.availability.year_percent.total < study.outage.availability.year_percent.total
    qam, qpsk = study.outage.modes
    assert qpsk.fade_margin_db == pytest.approx(qam.fade_margin_db + 22.0)
    assert qpsk.year_percent < qam.year_percent


def test_a_missed_objective_fails_a_clear_hop(land):
    climate = replace(CLIMATE, objective=Objective(year_percent=1e-9))
    study = run_study(hop_over(land(), radio=RADIO, availability=climate))
    assert study.verdict.clears
    assert study.verdict.meets_objective is False
    assert study.verdict.outcome == "fails"
    assert headline(study, METRES).endswith("misses the availability objective")


def test_roughness_is_the_spread_of_the_raster_in_the_box(write_raster):
    """The sa of P.530-17 against numpy: the standard deviation of 30″ cells within 55 km of the path's middle."""
    cell = 1 / 120
    noise = gaussian_filter(np.random.default_rng(3).standard_normal((200, 240)), 1.0)
    heights = 300 + 80 * noise / noise.std()
    path = write_raster("wide.tif", heights, north_up(8.0, 46.9, cell), "EPSG:4326")
    climate = replace(CLIMATE, multipath_method="p530-17")
    study = run_study(hop_over(path, radio=RADIO, availability=climate, site_a=Site("south", 9.0, 46.0, 900.0)))
    [used] = [each for each in study.outage.availability.inputs if each.name == "terrain_roughness_m"]
    rows = np.abs(46.9 - cell * (np.arange(200) + 0.5) - 46.09) < 55 / 111.15
    columns = np.abs(8.0 + cell * (np.arange(240) + 0.5) - 9.0) < 55 / (111.32 * math.cos(math.radians(46.09)))
    # the grid of the method and the cells of the raster do not coincide: bilinear sampling smooths the noise
    assert used.value == pytest.approx(heights[np.ix_(rows, columns)].std(), rel=0.12)
    assert "roughness" in used.source or "terrain" in used.source


# Confidence -----------------------------------------------------------------------------------------------------------

DOUBT = ConfidenceChoice(4.0, "a test", correlation_m=100.0, draws=400)


@pytest.mark.parametrize(("antenna_m", "chance"), [(90.0, 1.0), (2.0, 0.0)])
def test_confidence_agrees_with_a_verdict_that_nothing_can_turn(land, antenna_m, chance):
    hop = hop_over(land(rolling()), confidence=DOUBT)
    sites = {end: replace(getattr(hop, end), antenna_m=antenna_m) for end in ("site_a", "site_b")}
    study = run_study(replace(hop, **sites))
    assert study.confidence.chance.value == chance
    assert study.verdict.clears == bool(chance)
    names, numbers = point_table(study)
    low = numbers[:, names.index("rule1_surplus_5_percent_m")]
    high = numbers[:, names.index("rule1_surplus_95_percent_m")]
    surplus = numbers[:, names.index("rule1_surplus_m")]
    assert np.all(low <= high)
    assert np.mean((low <= surplus) & (surplus <= high)) > 0.95


def test_confidence_is_repeatable_and_follows_its_seed(land):
    hop = hop_over(land(rolling()), confidence=DOUBT)
    one, again = (to_document(run_study(hop))["confidence"] for _ in range(2))
    other = to_document(run_study(replace(hop, confidence=replace(DOUBT, seed=2))))["confidence"]
    assert one == again
    assert one != other


@pytest.mark.parametrize(("surveyed", "far_share"), [("site_a", 0.2), ("site_b", 0.8)])
def test_a_surveyed_site_takes_its_own_doubt_away(land, surveyed, far_share):
    """A ridge a fifth of the way out: its error and that of the unsurveyed site by its share of the ray, in quadrature.

    The 5 to 95 % band of a Gaussian is 2·1.645 standard deviations wide.
    """
    hop = hop_over(land(ridge(60.0, row=554)), confidence=replace(DOUBT, draws=4000))
    study = run_study(replace(hop, **{surveyed: replace(getattr(hop, surveyed), surveyed_ground_m=GROUND_M)}))
    top = study.rules[0].check.critical
    share = study.profile.distance_m[top] / study.line.distance_m
    assert (share if surveyed == "site_a" else 1 - share) == pytest.approx(far_share, abs=0.01)
    band = study.confidence.rules[0].surplus
    assert band.high_m[top] - band.low_m[top] == pytest.approx(3.29 * 4.0 * math.hypot(1, far_share), rel=0.05)


# Heights --------------------------------------------------------------------------------------------------------------

TOWERS = HeightsChoice(TowerChoice(lowest_m=5.0, highest_m=120.0, step_m=1.0), TowerChoice(lowest_m=5.0, step_m=1.5))


def at_heights(hop: Hop, antenna_a_m: float, antenna_b_m: float) -> Hop:
    return replace(
        hop,
        site_a=replace(hop.site_a, antenna_m=antenna_a_m),
        site_b=replace(hop.site_b, antenna_m=antenna_b_m),
    )


@pytest.mark.parametrize("ground", ["rolling", "ridge", "wall"])
def test_the_cheapest_pair_passes_a_study_and_one_step_less_fails(land, ground):
    heights = {"rolling": rolling(2), "ridge": ridge(40.0, row=200), "wall": wall(1)}[ground]
    hop = hop_over(land(heights), heights=TOWERS)
    plan = plan_heights(run_study(hop))
    pair = plan.cheapest.antenna_a_m, plan.cheapest.antenna_b_m
    assert pair[1] % 1.5 == pytest.approx(0.0)
    assert run_study(at_heights(hop, *pair)).verdict.clears
    assert not run_study(at_heights(hop, pair[0], pair[1] - 1.5)).verdict.clears
    if pair[0] > hop.heights.tower_a.lowest_m:
        assert not run_study(at_heights(hop, pair[0] - 1.0, pair[1])).verdict.clears
    least = plan.least_equal.height_m
    assert run_study(at_heights(hop, least + 0.001, least + 0.001)).verdict.clears
    assert not run_study(at_heights(hop, least - 0.01, least - 0.01)).verdict.clears


def test_the_least_height_at_one_end_leaves_the_other_as_it_is(land):
    hop = hop_over(land(ridge(40.0, row=200)), site_b=Site("north", 9.0, 46.18, 65.0))
    plan = plan_heights(run_study(hop))
    for less, verdict in ((0.0, True), (0.01, False)):
        assert run_study(at_heights(hop, plan.least_a.height_m - less, 65.0)).verdict.clears is verdict
        assert run_study(at_heights(hop, 30.0, plan.least_b.height_m - less)).verdict.clears is verdict


def test_the_heights_for_the_objective_meet_it_and_lower_ones_do_not(land):
    towers = HeightsChoice(TowerChoice(lowest_m=10, highest_m=60, step_m=5), TowerChoice(lowest_m=10, step_m=5))
    hop = hop_over(land(ridge(60.0)), radio=with_threshold(-80.0), availability=CLIMATE, heights=towers)
    hop = with_terrain(hop, spacing_m=30.0)
    found = plan_heights(run_study(hop)).for_objective.cheapest
    pair = found.antenna_a_m, found.antenna_b_m
    assert run_study(at_heights(hop, *pair)).verdict.meets_objective is True
    assert run_study(at_heights(hop, pair[0] - 5, pair[1] - 5)).verdict.meets_objective is False


def test_adding_a_rule_never_lowers_a_height(land):
    hop = hop_over(land(rolling(2)), heights=TOWERS)
    rules = (*hop.rules, Rule(0.8, 0.6), Rule(1.0, 0.6, 3.0))
    plans = [plan_heights(run_study(replace(hop, rules=rules[:count]))) for count in range(1, 5)]
    for fewer, more in pairwise(plans):
        assert more.least_equal.height_m >= fewer.least_equal.height_m - 1e-9
        assert more.cheapest.cost >= fewer.cheapest.cost - 1e-9
        assert more.least_b.height_m >= fewer.least_b.height_m - 1e-9


def test_no_feasible_pair_is_proven_and_says_what_would_have_to_change(land):
    low = HeightsChoice(TowerChoice(highest_m=20.0), TowerChoice(highest_m=20.0))
    hop = hop_over(land(ridge(60.0)), heights=low)
    plan = plan_heights(run_study(hop))
    assert not plan.feasible
    place = plan.cheapest.lower[0]
    check = run_study(at_heights(hop, 20.0, 20.0)).rules[place.rule].check
    # heights are sought to the millimetre, and to the safe side
    assert 0.0 <= place.by_m + check.surplus_m[check.critical] < 0.01
    both = 20.0 + plan.cheapest.raise_both_by_m
    assert run_study(at_heights(hop, both, both)).verdict.clears
    assert not run_study(at_heights(hop, both - 0.01, both - 0.01)).verdict.clears
    document = heights_document(plan)
    assert (document["feasible"], document["cheapest_m"]) == (False, None)
    assert document["why_not"]["remedies"]


# The document ---------------------------------------------------------------------------------------------------------

CRITICAL = {
    "distance_m", "longitude", "latitude", "ground_m", "cover_m", "bulge_m", "f1_m", "clearance_m", "required_m",
    "surplus_m", "ratio",
}  # fmt: skip


@pytest.fixture
def full(land):
    """Study a hop with everything in it."""
    hop = hop_over(land(rolling()), radio=RADIO, availability=CLIMATE, confidence=DOUBT, heights=TOWERS)
    return run_study(with_terrain(hop, spacing_m=200.0))


def test_the_document_has_the_stable_keys(full):
    """The names that other people script against: once published, they stay."""
    document = to_document(full)
    assert set(document) == {
        "schema", "hop", "path", "terrain", "rules", "diffraction", "budget", "availability", "confidence", "verdict",
        "provenance",
    }  # fmt: skip
    assert document["path"].keys() >= {
        "distance_m", "azimuth_a_deg", "azimuth_b_deg", "elevation_a_deg", "elevation_b_deg", "points",
    }  # fmt: skip
    for rule in document["rules"]:
        assert rule.keys() >= {"k", "fresnel_fraction", "margin_m", "passes", "critical"}
        assert rule["critical"].keys() >= CRITICAL
    assert [loss["k"] for loss in document["diffraction"]] == [4 / 3, 2 / 3]
    for loss in document["diffraction"]:
        assert loss.keys() >= {"k", "method", "loss_db", "edges"}
    for way in ("a_to_b", "b_to_a"):
        assert document["budget"][way].keys() >= {
            "free_space_db", "gas_db", "diffraction_db", "received_dbm", "threshold_dbm", "fade_margin_db", "lines",
        }  # fmt: skip
    for period in ("worst_month_percent", "year_percent"):
        assert document["availability"][period].keys() >= {"multipath", "rain", "obstruction", "total"}
    assert isinstance(document["availability"]["objective"]["met"], bool)


def test_the_heights_document_has_the_stable_keys_and_plain_values(full):
    document = heights_document(plan_heights(full))
    assert json.loads(json.dumps(document))["schema"] == "hopwright-heights/1"
    assert document.keys() >= {"least_equal_m", "frontier_m", "cheapest_m", "feasible"}
    assert all(len(vertex) == 2 for vertex in document["frontier_m"])
    assert len(document["cheapest_m"]) == 2


def test_the_document_is_plain_values(full):
    assert json.loads(json.dumps(to_document(full)))["schema"] == "hopwright-study/1"


def test_the_critical_point_of_the_document_is_the_row_of_the_point_table(full):
    names, numbers = point_table(full)
    for number, rule in enumerate(to_document(full)["rules"], start=1):
        critical = rule["critical"]
        row = dict(zip(names, numbers[critical["index"]].tolist(), strict=True))
        for key in ("distance_m", "filled"):
            assert row[key] == critical[key]
        for key in ("bulge_m", "f1_m", "offset_m"):
            assert row[f"rule{number}_{key}"] == pytest.approx(critical[key])
        assert row[f"rule{number}_least_surplus_m"] == critical["surplus_m"]
        assert numbers[:, names.index(f"rule{number}_least_surplus_m")].min() == critical["surplus_m"]
        assert critical["clearance_m"] - critical["required_m"] == pytest.approx(critical["surplus_m"])
    ray = numbers[:, names.index("ray_m")]
    clearance = ray - numbers[:, names.index("ground_m")] - numbers[:, names.index("cover_m")]
    assert clearance - numbers[:, names.index("rule1_bulge_m")] == pytest.approx(
        numbers[:, names.index("rule1_clearance_m")], abs=1e-9
    )


def test_provenance_names_every_raster_that_a_number_depends_on(land):
    """The tile to the east lies beside the path only: the zone reaches it, so the hash must be there."""
    strip = np.full((ROWS, COLUMNS), GROUND_M)
    strip[:, 32:] = -9999
    ground, east = land(strip, nodata=-9999), land(GROUND_M, "east.tif", west=WEST + 32 * CELL)
    canopy = land(3.0, "canopy.tif")
    study = run_study(hop_over(ground, east, frequency_hz=0.3e9, cover=CoverChoice(canopy=(canopy,))))
    assert {use.info.path.name for use in study.terrain.sources} == {"ground.tif"}
    expected = {
        (path.name, path.stat().st_size, hashlib.sha256(path.read_bytes()).hexdigest())
        for path in (ground, east, canopy)
    }
    assert set(study.provenance.rasters) == expected
    named = {"hopwright", "python", "numpy", "rasterio", "pyproj", "GDAL", "PROJ", "EPSG"}
    assert dict(study.provenance.versions).keys() >= named


def test_heights_are_planned_though_an_antenna_stands_in_its_own_trees(land):
    """The given heights are a first guess to a search for heights, and wrong input to a study of losses."""
    canopy = land(18.0, "canopy.tif")
    hop = replace(hop_over(land()), cover=CoverChoice(canopy=(canopy,)))
    wooded = replace(hop, site_a=replace(hop.site_a, antenna_m=10.0))
    with pytest.raises(InputError, match=r"site_a.antenna_m = 10: must be above the 18.0 m of cover at south"):
        run_study(wooded)
    plan = plan_heights(run_study(wooded, losses=False))
    assert plan.feasible
    assert plan.cheapest == plan_heights(run_study(hop, losses=False)).cheapest
    assert not plan.study.verdict.clears


def test_highest_cells_lift_the_path_but_not_the_sites(land):
    slope = np.broadcast_to(GROUND_M + 2.0 * np.arange(COLUMNS), (ROWS, COLUMNS))  # 2 m a cell across the path
    hop = hop_over(land(slope))
    bilinear, highest = run_study(hop), run_study(with_terrain(hop, method="highest"))
    assert highest.profile.ground_m[[0, -1]].tolist() == bilinear.profile.ground_m[[0, -1]].tolist()
    assert (highest.profile.ground_m[1:-1] >= bilinear.profile.ground_m[1:-1]).all()
    assert any("bilinear, as the highest cell around would lift" in line for line in map(str, highest.assumptions))


def test_an_objective_that_cannot_be_judged_is_not_passed(land):
    mute = replace(RADIO, modes=(RadioMode("silent"),))
    study = run_study(hop_over(land(), radio=mute, availability=CLIMATE, rules=(Rule(4 / 3, 0.0),)))
    assert study.verdict.clears
    assert study.verdict.meets_objective is None
    assert study.verdict.outcome == "not_sure"
    assert "nobody can decide the availability objective" in headline(study, METRES)


def test_ground_beside_the_path_counts_in_the_confidence(land):
    """A wall beside the path is short by what the rule says, and sure heights make that up with some to spare."""
    doubt = ConfidenceChoice(2.0, "test", 100.0)
    hop = hop_over(land(), confidence=doubt, rules=(Rule(4 / 3, 1.0),))
    heights = np.full((ROWS, COLUMNS), GROUND_M)
    heights[MID_ROW - 2 : MID_ROW + 3, COLUMNS // 2 - 1] += 50.0  # a wall one cell to the west
    free, walled = run_study(hop), run_study(replace(hop, terrain=TerrainChoice((land(heights, "wall.tif"),))))
    short = -walled.rules[0].held.surplus_m
    assert walled.rules[0].check.passes
    assert short > 5.0
    assert walled.confidence.chance.value < free.confidence.chance.value
    assert short < walled.confidence.sure[0].raise_m < short + 3 * 2.0 * 2**0.5


def test_a_link_without_margin_does_not_pass(land):
    """Clear ground does not help a radio that is too weak."""
    weak = replace(RADIO, terminal_a=replace(RADIO.terminal_a, power_dbm=-60.0))
    study = run_study(hop_over(land(), radio=weak, rules=(Rule(4 / 3, 0.0),)))
    assert study.verdict.clears
    assert study.verdict.has_margin is False
    assert study.verdict.outcome == "fails"
    assert "no fade margin (−" in headline(study, METRES)


def test_invented_coarse_and_doubtful_ground_is_warned_of(land, write_raster):
    heights = np.full((ROWS, COLUMNS), GROUND_M)
    heights[MID_ROW - 20 : MID_ROW + 20] = -9999
    holed = land(heights, "holed.tif", nodata=-9999)
    filled = run_study(with_terrain(hop_over(holed, rules=(Rule(4 / 3, 1.0),)), missing="interpolate"))
    assert any("ground is interpolated at" in line for line in map(str, filled.warnings))
    assert filled.rules[0].critical.filled
    assert "where the ground is interpolated" in headline(filled, METRES)
    hop = hop_over(land())
    surveyed = replace(hop, site_a=replace(hop.site_a, surveyed_ground_m=GROUND_M - 40.0))
    assert any(
        "surveyed ground at south is 40.0 m below the terrain" in line
        for line in map(str, run_study(surveyed).warnings)
    )
    coarse = write_raster("coarse.tif", np.full((60, 60), 100.0), north_up(8.7, 46.4, 0.01), "EPSG:4326")
    assert any("hills narrower than that" in line for line in map(str, run_study(hop_over(coarse)).warnings))


def test_a_survey_stands_for_missing_ground_at_its_site(land):
    heights = np.full((ROWS, COLUMNS), GROUND_M)
    heights[-60:] = -9999  # the south end, where site A is
    hop = hop_over(land(heights, "cut.tif", nodata=-9999))
    known = replace(hop, site_a=replace(hop.site_a, surveyed_ground_m=GROUND_M))
    study = run_study(with_terrain(known, missing="interpolate"))
    assert study.profile.filled[1]
    assert not study.profile.filled[0]


def test_reasons_at_the_limits_of_chance_and_margin():
    """The chance that is asked for is enough, and what a margin lacks is a positive number of decibels."""
    clear = [SimpleNamespace(critical=SimpleNamespace(surplus_m=1.0))]
    sure = SimpleNamespace(chance=Chance(0.9, 0.88, 0.92))

    def reasons(asked, margin_db):
        hop = SimpleNamespace(confidence=SimpleNamespace(minimum_chance=asked), has_objective=False)
        row = SimpleNamespace(name="QPSK", fade_margin_db=margin_db)
        return find_reasons(hop, clear, SimpleNamespace(weaker=lambda: ("b_to_a", row)), OutageResult(), sure)

    assert reasons(0.9, 0.0) == ()
    assert reasons(0.901, 0.0) == (ChanceTooSmall(sure.chance, 0.901),)
    assert reasons(0.9, -3.25) == (MarginMissing("QPSK", "b_to_a", 3.25),)
