"""Figures: the data drawn, limits and labels, words that never meet, and files that are the same each time."""

import dataclasses
import functools
import math
from pathlib import Path

import matplotlib
import numpy as np
import pytest
import rasterio
from hypothesis import given
from hypothesis import strategies as st
from matplotlib.backends.backend_agg import FigureCanvasAgg
from rasterio.transform import Affine

from profiler.errors import InputError
from profiler.figures import FORMATS, frontier_figure, margin_figure, profile_figure, render, style
from profiler.figures.place_labels import spread
from profiler.figures.profile import thinned
from profiler.figures.strips import brightness, rule_look
from profiler.figures.text import missing_letters, width_in, wrap
from profiler.geometry import earth_bulge
from profiler.models import (
    AvailabilityChoice,
    ConfidenceChoice,
    CoverChoice,
    HeightsChoice,
    Hop,
    Objective,
    Obstacle,
    Radio,
    RadioMode,
    Rule,
    Signature,
    Site,
    Terminal,
    TerrainChoice,
    TowerChoice,
)
from profiler.plan import plan_heights
from profiler.study import run_study
from profiler.study.outage import OutageResult
from profiler.study.reasons import MarginMissing
from profiler.units import FOOT_M, STATUTE_MILE_M
from profiler.words import Scale

SAMPLE = Path(__file__).resolve().parent.parent / "sample_dem"
KESTREL, GULL = (-39.13581, 46.08499), (-38.87716, 46.06701)
LONG_A = "Upper Saint-Bartholomew-on-the-Hill Municipal Water Tower No 7"
LONG_B = "Nether Wallop Regional Hospital Roof, South-Eastern Stairwell"
TWO = (Rule(4 / 3, 1.0, label="median air"), Rule(2 / 3, 0.3, label="bent air"))
FOUR = (*TWO, Rule(1.0, 0.6, 3.0, label="light route"), Rule(0.8, 0.0, 2.0, label="bare ray"))
SURE = ConfidenceChoice(4.0, "a guess for the test", 300.0, cover_sigma_m=3.0, draws=200)
OBJECTIVE = Objective(worst_month_percent=0.01, minutes_per_year=53.0, severely_errored_seconds_ratio=1e-3)
OUTAGE = AvailabilityChoice("p530-17-quick", OBJECTIVE, rain_rate_mm_h=35.0, dn1_n_km=-200.0)
MANY = tuple(
    f"Assumption {i}: a number of the regional default, because the hop file gives none, which is said here in full"
    for i in range(1, 13)
)


PLAIN_MODES = (RadioMode("128QAM", threshold_dbm=-70.0), RadioMode("QPSK", threshold_dbm=-88.0))


def radio(power_dbm=28.0, modes=PLAIN_MODES):
    end = Terminal(power_dbm, 1.5, gain_dbi=38.2)
    return Radio(end, end, modes, (("polarization mismatch by tolerance of installation", 1.0),))


def sample_hop(name="Kestrel to Gull", a=150.0, b=165.0, rules=TWO, names=("Kestrel Ridge", "Gull Head"), **more):
    terrain = TerrainChoice((SAMPLE / "country.tif",))
    return Hop(name, Site(names[0], *KESTREL, a), Site(names[1], *GULL, b), 6e9, rules, terrain, **more)


def plain_raster(folder, length_m, ground_m):
    """Gently rolling ground about the equator, eastward; ground_m tells the height from the distance."""
    cell = 60.0 / 111_320.0
    width = int(length_m / 60.0) + 120
    heights = np.broadcast_to(ground_m(np.arange(width) * 60.0 - 3600.0), (160, width)).astype("float32")
    look = {"count": 1, "dtype": "float32", "crs": "EPSG:4326", "width": width, "height": 160, "driver": "GTiff"}
    path = folder / f"plain_{length_m:.0f}.tif"
    with rasterio.open(path, "w", transform=Affine(cell, 0, 10 - 60 * cell, 0, -cell, 80 * cell), **look) as raster:
        raster.write(heights, 1)
    return TerrainChoice((path,), vertical_datum="EGM96 height")


def plain_hop(folder, length_m, ground_m, frequency_hz, a, b, **more):
    terrain = plain_raster(folder, length_m, ground_m)
    east = Site("East", 10 + length_m / 111_320.0, 0.0, b)
    return Hop("Plain", Site("West", 10.0, 0.0, a), east, frequency_hz, TWO, terrain, **more)


def canyon_hop(folder, **more):
    terrain = TerrainChoice((folder / "canyon_srtm_3arcsec.tif",))
    a, b = Site("North mesa", -113.073, 37.505, 30.0), Site("South mesa", -112.88, 37.20, 40.0)
    return Hop("Canyon", a, b, 7.5e9, FOUR[:3], terrain, **more)


MODES = tuple(
    RadioMode(name, threshold_dbm=level) for name, level in (("4096QAM", -52.0), ("256QAM", -65.0), ("QPSK", -85.0))
)
SHAPED = (RadioMode("64QAM", threshold_dbm=-72.0, signature=Signature(30e6, 18.0, 17.0)),)
CANOPY = CoverChoice(canopy=(SAMPLE / "canopy.tif",))
SILO = CoverChoice(canopy=(SAMPLE / "canopy.tif",), obstacles=(Obstacle("silo at the old crossroads", 9000, 9060, 38),))


@pytest.fixture(scope="module")
def study(tmp_path_factory, real_terrain):
    """Study a case by name, once for all tests."""
    folder = tmp_path_factory.mktemp("plains")
    tall = HeightsChoice(TowerChoice(highest_m=230), TowerChoice(highest_m=230))

    def rolling(x):
        return 120 + 0.4e-3 * x + 6 * np.sin(x / 5300) + 3 * np.sin(x / 810)

    full = {"radio": radio(), "availability": OUTAGE, "confidence": SURE}
    cases = {
        "fails": lambda: sample_hop(cover=CANOPY, **full),
        "passes": lambda: sample_hop(
            a=175, b=195, cover=CANOPY, heights=tall, **{**full, "radio": radio(modes=SHAPED)},
        ),
        "bare": lambda: sample_hop(a=175.0, b=195.0, rules=TWO[:1]),
        "long": lambda: sample_hop(
            f"Backhaul of {LONG_A}", names=(LONG_A, LONG_B), rules=FOUR, cover=SILO, assumptions=MANY,
            radio=radio(modes=MODES), availability=OUTAGE, confidence=SURE,
        ),
        "flat 80 km": lambda: plain_hop(folder, 80e3, rolling, 4e9, 200, 205, **full),
        "canyon": lambda: canyon_hop(real_terrain, **full),
    }  # fmt: skip

    @functools.cache
    def find(name):
        return run_study(cases[name](), relief=True)

    return find


CASES = ("fails", "passes", "bare", "long", "flat 80 km", "canyon")


@pytest.fixture(scope="module")
def plan(study):
    """Plan the heights of a case by name; the search for the objective is not drawn and takes seconds."""

    @functools.cache
    def find(name):
        hop = dataclasses.replace(study(name).hop, availability=None)
        return plan_heights(dataclasses.replace(study(name), hop=hop))

    return find


@pytest.fixture(scope="module")
def profile(study):
    """Draw the profile of a case by name, once for all tests; nobody changes it."""
    return functools.cache(lambda name: profile_figure(study(name)))


@pytest.fixture(scope="module")
def margin(study):
    """Draw the margin of a case by name, once for all tests."""
    return functools.cache(lambda name: margin_figure(study(name)))


@pytest.fixture(scope="module")
def heights(plan):
    """Draw the heights of a case by name, once for all tests."""
    return functools.cache(lambda name: frontier_figure(plan(name)))


def axes_of(figure, label):
    [axes] = [each for each in figure.axes if each.get_label() == label]
    return axes


def line_of(axes, label):
    [line] = [each for each in axes.lines if each.get_label() == label]
    return line.get_xydata()


def words_of(figure):
    return "\n".join(each.get_text() for each in figure.texts)


def text_by_gid(figure, gid):
    [text] = [each for each in figure.texts if each.get_gid() == gid]
    return text.get_text()


# --- the profile: what is drawn ---------------------------------------------------------------------------------------


def test_ground_is_drawn_over_the_bulge_of_the_governing_rule(study, profile):
    case = study("fails")
    drawn = line_of(axes_of(profile("fails"), "profile"), "ground")
    x_m = case.profile.distance_m
    bulge = earth_bulge(x_m, x_m[-1] - x_m, case.governing.check.rule.k)
    assert np.allclose(drawn, np.column_stack((x_m / 1e3, case.profile.ground_m + bulge)))


def test_ray_ends_at_the_antenna_centres_and_the_mark_is_at_the_critical_point(study, profile):
    case = study("fails")
    axes = axes_of(profile("fails"), "profile")
    ray = line_of(axes, "ray")
    assert ray[[0, -1], 1].tolist() == pytest.approx([case.centre_a_m, case.centre_b_m])
    place = case.governing.tightest
    expected = [place.distance_m / 1e3, place.surface_m + place.bulge_m]
    assert line_of(axes, "critical")[0].tolist() == pytest.approx(expected)


def test_required_clearance_less_than_zone_reaches_the_surface_where_the_surplus_is_zero(study, profile):
    case = study("flat 80 km")
    axes = axes_of(profile("flat 80 km"), "profile")
    ground, required = line_of(axes, "ground"), line_of(axes, "required")
    surplus = np.interp(case.profile.distance_m / 1e3, required[:, 0], required[:, 1] - ground[:, 1])
    found, expected = surplus, case.governing.check.surplus_m
    assert found.min() == pytest.approx(expected.min(), abs=1e-9)


def test_surplus_strip_holds_every_rule_and_the_least_over_the_zones_width(study, profile):
    case = study("long")
    axes = axes_of(profile("long"), "surplus")
    for number, result in enumerate(case.rules, start=1):
        assert np.all(result.held.least_surplus_m <= result.check.surplus_m)
        assert np.allclose(line_of(axes, f"rule {number}")[:, 1], result.held.least_surplus_m)
    low, high = axes.get_ylim()
    assert low < min(float(each.check.surplus_m.min()) for each in case.rules)
    assert high > 0


def test_band_of_the_profile_is_what_the_surplus_band_leaves(study, profile):
    case = study("fails")
    profile, strip = (axes_of(profile("fails"), name) for name in ("profile", "surplus"))
    [on_profile] = [each for each in profile.collections if each.get_label() == "band"]
    [on_strip] = [each for each in strip.collections if each.get_label() == "band"]
    at = case.profile.distance_m.size // 3
    band = case.confidence.rules[case.rules.index(case.governing)].surplus
    x = case.profile.distance_m[at] / 1e3
    heights = [y for px, y in on_profile.get_paths()[0].vertices if px == pytest.approx(x, abs=1e-9)]
    required = np.interp(x, *line_of(profile, "required").T)
    expected = (required - band.high_m[at], required - band.low_m[at])
    assert (min(heights), max(heights)) == pytest.approx(expected)
    surpluses = [y for px, y in on_strip.get_paths()[0].vertices if px == pytest.approx(x, abs=1e-9)]
    assert (min(surpluses), max(surpluses)) == pytest.approx((band.low_m[at], band.high_m[at]))


def test_relief_shows_the_ground_and_marks_the_places(study, profile):
    case = study("fails")
    axes = axes_of(profile("fails"), "relief")
    [image] = axes.images
    left, right, bottom, top = image.get_extent()
    assert (left, right) == pytest.approx((0.0, case.line.distance_m / 1e3), abs=0.03)
    # the left side of the path is on top
    assert (top, bottom) == pytest.approx((case.relief.offset_m[0] / 1e3, case.relief.offset_m[-1] / 1e3))
    assert axes.yaxis_inverted()
    place = case.governing.tightest
    assert line_of(axes, "critical")[0].tolist() == pytest.approx([place.distance_m / 1e3, place.offset_m / 1e3])


def test_feet_and_miles_scale_all_that_is_drawn(study):
    case = study("fails")
    metric, feet = (profile_figure(case, feet=each) for each in (False, True))
    for name, factor in (("profile", FOOT_M), ("surplus", FOOT_M)):
        label = "ray" if name == "profile" else "rule 1"
        ratio = line_of(axes_of(metric, name), label)[1:] / line_of(axes_of(feet, name), label)[1:]
        assert np.allclose(ratio, [STATUTE_MILE_M / 1e3, factor])
    assert axes_of(feet, "relief").get_xlabel() == "distance from A, mi"
    assert "errors: ground sigma 13.1 ft (a guess for the test), cover sigma 9.8 ft" in words_of(feet).replace(
        "\n   ", " "
    )
    assert axes_of(feet, "profile").get_ylabel().startswith("height above datum, ft")
    assert " km" not in text_by_gid(feet, "sentence")
    assert " m " not in text_by_gid(feet, "critical")


def test_every_axis_names_its_unit(profile):
    figure = profile("fails")
    assert axes_of(figure, "profile").get_ylabel() == "height above datum, m,\nwith the bulge at k = 4/3"
    assert axes_of(figure, "surplus").get_ylabel() == "clearance less\nrequirement, m"
    assert axes_of(figure, "relief").get_ylabel() == "left or right\nof path, km"
    assert axes_of(figure, "relief").get_xlabel() == "distance from A, km"


def test_limits_are_as_asked_on_all_three_drawings(study):
    limits = {"distance_limits": (0.0, 50.0), "height_limits": (0.0, 900.0), "surplus_limits": (-60.0, 60.0)}
    figures = [profile_figure(study(name), **limits) for name in ("fails", "long")]
    for figure in figures:
        assert all(axes.get_xlim() == (0.0, 50.0) for axes in figure.axes)
        assert axes_of(figure, "profile").get_ylim() == (0.0, 900.0)
        assert axes_of(figure, "surplus").get_ylim() == (-60.0, 60.0)
    sizes = [[axes.get_position().size * figure.get_size_inches() for axes in figure.axes] for figure in figures]
    assert np.allclose(*sizes)


@pytest.mark.parametrize("limits", [(5.0, 5.0), (9.0, 1.0), (math.nan, 1.0), (0.0, math.inf)])
def test_limits_that_are_none_are_refused(study, limits):
    with pytest.raises(InputError, match=r"height_limits = .*: must be two numbers of -1e\+06 to 1e\+06"):
        profile_figure(study("bare"), height_limits=limits)


def test_a_critical_point_outside_the_distances_is_said_to_be_there(study):
    figure = profile_figure(study("fails"), distance_limits=(10.0, 30.0))
    [masts] = [line for line in axes_of(figure, "profile").lines if line.get_label() == "antennas"]
    assert masts.get_clip_on()  # that of A lies outside
    assert text_by_gid(figure, "critical").replace("\n", " ").endswith("It lies outside the distances drawn.")


# --- the profile: what is said ----------------------------------------------------------------------------------------


def test_a_failing_rule_is_said_to_fail_by_how_much_where_and_which(study, profile):
    case = study("fails")
    figure = profile("fails")
    place = case.governing.tightest
    assert text_by_gid(figure, "verdict") == "FAILS"
    assert text_by_gid(figure, "chance") == "less than 0.1 % chance of clearing, 90 % asked"
    short, where = f"{-place.surplus_m:.1f} m short", f"{place.distance_m / 1e3:.2f} km from A"
    sentence = text_by_gid(figure, "sentence").replace("\n", " ")
    assert sentence.startswith(f"Does not clear: {short}, {where} (1.0 F1 at k = 4/3); 2 of 2 rules are missed")
    label = text_by_gid(figure, "critical").replace("\n", " ")
    ground, cover = place.ground_m, place.cover_m
    assert f"({place.latitude:.5f}° N, {-place.longitude:.5f}° W)" in label
    assert f"ground {ground:.1f} m + cover {cover:.1f} m, {short}" in label


def test_a_pass_is_said_to_pass_and_by_how_much(study, profile):
    figure = profile("passes")
    case = study("passes")
    assert case.verdict.clears
    assert (text_by_gid(figure, "verdict"), text_by_gid(figure, "chance")[-10:]) == ("NOT SURE", "90 % asked")
    place = case.governing.tightest
    said = f"Clears every rule; tightest {place.distance_m / 1e3:.2f} km from A: {place.surplus_m:.1f} m to spare"
    assert text_by_gid(figure, "sentence").replace("\n", " ").startswith(said)


def test_title_block_holds_what_a_reviewer_signs(study, profile):
    case = study("long")
    said = words_of(profile("long")).replace("\n   ", " ").replace("\n", " ")
    numbers = [f"{angle:.2f}°" for angle in (case.line.azimuth_a_deg, case.line.azimuth_b_deg)]
    numbers += [f"{case.centre_a_m:.1f} m", f"{case.profile.ground_m[-1]:.1f} m", "46.08499° N", "39.13581° W"]
    numbers += [
        "6 GHz, vertical polarization",
        f"{case.line.distance_m / 1e3:.2f} km",
        "chance of clearing, 90 % asked",
    ]
    sources = ["country.tif", "canopy heights from canopy.tif", "a datum that the terrain does not state"]
    for words in (*numbers, *sources, LONG_A, LONG_B, case.provenance.created, "hopwright"):
        assert words in said, words
    for assumption in MANY:
        assert assumption in said
    for result in case.rules:
        assert result.check.rule.label in said


def test_losses_margin_and_what_to_survey_stand_in_the_title_block(study, profile):
    case = study("flat 80 km")
    said = words_of(profile("flat 80 km")).replace("\n", " ")
    low, median = case.diffraction[1].loss_db, case.diffraction[0].loss_db
    assert f"{median:.1f} dB at 4/3, {low:.1f} dB at 2/3" in said
    assert f"{case.outage.availability.fade_margin_db:.1f} dB" in said


def test_every_assumption_stands_on_the_profile_or_on_the_margin_figure(study, profile, margin):
    case = study("passes")
    said = " ".join((words_of(profile("passes")) + words_of(margin("passes"))).split())
    elsewhere = ("vertical datum: ", "ground between cell centres: ", "terrain error: ")
    missing = [each for each in map(str, case.assumptions) if each not in said and not each.startswith(elsewhere)]
    assert missing == []
    assert "a datum that the terrain does not state" in said
    assert f"bilinear, points at most {case.terrain.spacing_m:.1f} m apart" in said
    assert "errors: ground sigma 4.0 m (a guess for the test)" in said


def test_a_hop_below_its_threshold_is_not_said_to_clear_alone(study):
    case = study("passes")
    reasons = (MarginMissing("QPSK", "b_to_a", 3.25),)
    verdict = dataclasses.replace(case.verdict, outcome="fails", reasons=reasons)
    figure = profile_figure(dataclasses.replace(case, verdict=verdict))
    assert text_by_gid(figure, "verdict") == "FAILS"
    assert "; no fade margin (−3.2 dB)" in text_by_gid(figure, "sentence").replace("\n", " ")


def test_filled_and_surveyed_ground_show(study, profile):
    case = study("bare")
    filled = np.zeros(case.profile.distance_m.size, dtype=bool)
    filled[200:260] = True
    surveyed = np.zeros_like(filled)
    surveyed[[0, 100]] = True
    marked = dataclasses.replace(case, profile=dataclasses.replace(case.profile, filled=filled, surveyed=surveyed))
    figure = profile_figure(marked)
    axes = axes_of(figure, "profile")
    [hatched] = [each for each in axes.collections if each.get_hatch()]
    x = hatched.get_paths()[0].vertices[:, 0]
    # the line to the known neighbours is filled too
    assert (x.min(), x.max()) == pytest.approx(tuple(case.profile.distance_m[[199, 260]] / 1e3))
    assert line_of(axes, "surveyed")[:, 0].tolist() == pytest.approx((case.profile.distance_m[surveyed] / 1e3).tolist())
    assert "no data, filled" in words_of(figure)
    assert "surveyed" in words_of(figure)
    assert "no data, filled" not in words_of(profile("bare"))


def test_a_critical_place_beside_the_path_is_marked_there_and_said_so(study):
    case = study("bare")
    [result] = case.rules
    aside = dataclasses.replace(
        result.critical, index=300, distance_m=float(case.profile.distance_m[300]), offset_m=7.0, side="right",
        ground_m=640.0, cover_m=0.0, bulge_m=float(result.check.bulge_m[300]), surplus_m=-4.0,
    )  # fmt: skip
    beside = dataclasses.replace(case, rules=(dataclasses.replace(result, places=(aside,)),))
    figure = profile_figure(beside)
    axes = axes_of(figure, "profile")
    bulged = 640.0 + float(result.check.bulge_m[300])
    assert line_of(axes, "critical")[0].tolist() == pytest.approx([case.profile.distance_m[300] / 1e3, bulged])
    assert "7 m right of the path" in text_by_gid(figure, "critical").replace("\n", " ")
    assert "ground 640.0 m" in text_by_gid(figure, "critical").replace("\n", " ")
    assert line_of(axes_of(figure, "relief"), "critical")[0, 1] == pytest.approx(0.007)


def test_without_relief_or_confidence_the_rest_stands(study):
    case = dataclasses.replace(study("bare"), relief=None)
    figure = profile_figure(case)
    assert [each.get_label() for each in figure.axes] == ["profile", "surplus"]
    lowest = axes_of(figure, "surplus")
    assert lowest.get_xlabel() == "distance from A, km"
    assert lowest.xaxis.get_tick_params()["labelbottom"]
    assert not axes_of(figure, "profile").xaxis.get_tick_params()["labelbottom"]
    assert "not examined" in words_of(figure)


# --- margin and heights -----------------------------------------------------------------------------------------------


def test_level_diagram_adds_up_to_the_received_level_and_the_margin(study, margin):
    case = study("flat 80 km")
    axes = axes_of(margin("flat 80 km"), "levels")
    changes = {kind: [bar.get_width() for bar in container] for kind, container in
               ((each.get_label(), each) for each in axes.containers)}  # fmt: skip
    power = line_of(axes, "power")[0, 0]
    row = case.budget.a_to_b.modes[0]
    assert power + sum(changes["gain"]) + sum(changes["loss"]) == pytest.approx(row.received_dbm)
    assert line_of(axes, "received")[0, 0] == pytest.approx(row.received_dbm)
    assert changes["margin"] == pytest.approx([row.fade_margin_db])
    assert min(changes["gain"]) > 0.0 >= max(changes["loss"])


def test_outage_curves_and_objective_are_drawn_as_computed(study, margin):
    case = study("flat 80 km")
    figure = margin("flat 80 km")
    for period, outages in (("worst month", case.outage.curve.worst_month_percent),
                            ("year", case.outage.curve.year_percent)):  # fmt: skip
        axes = axes_of(figure, period)
        assert np.allclose(line_of(axes, "total")[:, 1], outages.total)
        assert np.allclose(line_of(axes, "multipath")[:, 1], outages.multipath)
        assert line_of(axes, "margin")[0, 0] == pytest.approx(case.outage.availability.fade_margin_db)
        assert line_of(axes, "needed")[0, 0] == pytest.approx(case.outage.availability.objective.required_margin_db)
        assert axes.get_yscale() == "log"
        assert "%" in axes.get_ylabel()
    asked = [line.get_ydata()[0] for line in axes_of(figure, "worst month").lines if line.get_label() == "asked"]
    assert asked == pytest.approx([0.01, 0.1])  # 0.01 %; a ratio of 1e-3 is 0.1 %
    [yearly] = [line.get_ydata()[0] for line in axes_of(figure, "year").lines if line.get_label() == "asked"]
    assert yearly == pytest.approx(100 * 53.0 / (365.25 * 24 * 60))


def test_every_figure_repeats_the_one_verdict(study, profile, margin):
    for name in ("passes", "flat 80 km"):
        for gid in ("verdict", "chance"):
            assert text_by_gid(margin(name), gid) == text_by_gid(profile(name), gid)
    assert "and the objective needs a fade margin of" in text_by_gid(margin("passes"), "sentence").replace("\n", " ")
    assert study("flat 80 km").verdict.meets_objective is False


def test_margin_figure_needs_a_radio_and_says_so(margin):
    with pytest.raises(InputError, match=r"code: radio = not given: must be given for the margin figure"):
        margin("bare")


def test_margin_figure_without_outage_or_threshold(study):
    case = study("passes")
    no_outage = dataclasses.replace(case, outage=OutageResult())
    assert [each.get_label() for each in margin_figure(no_outage).axes] == ["levels"]
    open_modes = [dataclasses.replace(each, threshold_dbm=None, fade_margin_db=None) for each in
                  case.budget.a_to_b.modes]  # fmt: skip
    way = dataclasses.replace(case.budget.a_to_b, threshold_dbm=None, fade_margin_db=None, modes=tuple(open_modes))
    budget = dataclasses.replace(case.budget, a_to_b=way, b_to_a=way)
    said = text_by_gid(margin_figure(dataclasses.replace(no_outage, budget=budget)), "sentence")
    assert "no threshold is given" in said


def test_frontier_is_drawn_stretch_by_stretch_and_tabled(plan, heights):
    found, figure = plan("passes"), heights("passes")
    axes = axes_of(figure, "heights")
    drawn = [line.get_xydata() for line in axes.lines if line.get_label() == "stretch"]
    assert len(drawn) == len(found.stretches) > 1
    for line, stretch in zip(drawn, found.stretches, strict=True):
        assert np.allclose(line, stretch.corners_m)
        assert f"{stretch.distance_m / 1e3:.2f}" in words_of(figure)
    assert text_by_gid(figure, "verdict") == "PASSES"
    pair = found.answer.pair
    star = line_of(axes, f"cheapest pair to {' and '.join(found.answer.asked)}, cost {pair.cost:g}")
    assert star[0].tolist() == pytest.approx([pair.antenna_a_m, pair.antenna_b_m])
    assert axes.get_ylabel() == "antenna B above ground, m"


def test_the_pair_that_meets_all_is_marked_beside_the_one_that_clears(plan):
    found = plan("passes")
    higher = dataclasses.replace(found.cheapest, antenna_a_m=210.0, antenna_b_m=30.0)
    answer = dataclasses.replace(found.answer, pair=higher, asked=("clear every rule", "meet the objective"))
    figure = frontier_figure(dataclasses.replace(found, answer=answer))
    stars = [line.get_xydata()[0].tolist() for line in axes_of(figure, "heights").lines if line.get_marker() == "*"]
    assert stars == [[found.cheapest.antenna_a_m, found.cheapest.antenna_b_m], [210.0, 30.0]]
    assert "Antennas at A 210.0 m and B 30.0 m above ground clear every rule and meet" in text_by_gid(
        figure, "sentence"
    )


def test_shaded_region_is_bounded_by_the_frontier(plan, heights):
    axes = axes_of(heights("passes"), "heights")
    [shaded] = [each for each in axes.collections if each.get_label() == "clears"]
    path = shaded.get_paths()[0]
    for stretch in plan("passes").stretches:
        middle = stretch.corners_m[:2].mean(axis=0)
        assert path.contains_point(middle + 0.5)
        assert not path.contains_point(middle - 0.5)


def test_frontier_above_the_limits_is_shown_with_the_ways_out(plan):
    heights = plan("flat 80 km")  # towers of 150 m
    figure = frontier_figure(heights, feet=True)
    assert text_by_gid(figure, "verdict") == "FAILS"
    assert not heights.stretches
    assert [line for line in axes_of(figure, "heights").lines if line.get_label() == "stretch"]
    assert "(all above the limits)" in words_of(figure)
    assert "one way out: look for a relay" in words_of(figure)
    assert axes_of(figure, "heights").get_ylabel() == "antenna B above ground, ft"


# --- no overlap -------------------------------------------------------------------------------------------------------


def boxes(figure):
    """Every line of words of a figure as (left, bottom, right, top, words) in pixels, those of the axes last."""
    with style.defaults():
        renderer = FigureCanvasAgg(figure).get_renderer()
        figure.draw_without_rendering()
        found = []
        for text in figure.texts:
            x, y = text.get_transform().transform(text.get_position())
            size = text.get_fontsize() * figure.dpi / 72
            shift = {"left": 0.0, "center": 0.5, "right": 1.0}[text.get_ha()]
            for above, line in enumerate(reversed(text.get_text().split("\n"))):
                if line.strip():
                    width, _, _ = renderer.get_text_width_height_descent(line, text.get_fontproperties(), False)
                    base, left = y + above * 1.2 * size, x - shift * width
                    found.append((left, base - 0.1 * size, left + width, base + 0.74 * size, line))
        for text in (text for axes in figure.axes for text in words_of_axes(axes)):
            box = text.get_window_extent(renderer)
            found.append((box.x0 + 1, box.y0 + 1, box.x1 - 1, box.y1 - 1, text.get_text()))
    return found


def words_of_axes(axes):
    """Words of axes that are drawn: the numbers of ticks inside the limits, and the titles."""
    found = [axis.label for axis in (axes.xaxis, axes.yaxis)]
    for axis in (axes.xaxis, axes.yaxis):
        low, high = sorted(axis.get_view_interval())
        found += [tick.label1 for tick in axis.get_major_ticks() if low <= tick.get_loc() <= high]
    return [text for text in found if text.get_visible() and text.get_text()]


def meet(one, other):
    return one[0] < other[2] and other[0] < one[2] and one[1] < other[3] and other[1] < one[3]


@pytest.fixture(scope="module")
def drawn(study, plan, profile, margin, heights):
    """Draw all figures of a case, with the boxes of their words, once for all tests."""

    @functools.cache
    def find(name, feet):
        if feet:
            figures = [profile_figure(study(name), feet=True), frontier_figure(plan(name), feet=True)]
        else:
            figures = [profile(name), heights(name), *([] if study(name).budget is None else [margin(name)])]
        return [(figure, boxes(figure)) for figure in figures]

    return find


@pytest.mark.parametrize(("name", "feet"), [*((name, False) for name in CASES), ("long", True), ("flat 80 km", True)])
def test_no_words_overlap_or_leave_the_page_or_are_too_small(drawn, name, feet):
    for figure, found in drawn(name, feet):
        width, height = figure.get_size_inches() * figure.dpi
        assert [each for each in found if each[0] < 0 or each[1] < 0 or each[2] > width or each[3] > height] == []
        assert [(a[4], b[4]) for i, a in enumerate(found) for b in found[:i] if meet(a, b)] == []
        of_axes = [text for axes in figure.axes for text in words_of_axes(axes)]
        assert min(text.get_fontsize() for text in [*figure.texts, *of_axes]) >= 7.0


@pytest.mark.parametrize("name", CASES)
def test_no_words_of_the_page_lie_on_the_drawings(drawn, name):
    for figure, found in drawn(name, False):
        frames = [(*axes.get_window_extent().extents, axes.get_label()) for axes in figure.axes]
        count = len([line for text in figure.texts for line in text.get_text().split("\n") if line.strip()])
        on = [(each[4], frame[4]) for each in found[:count] for frame in frames if meet(each, frame)]
        # only the numbers of the stretches stand inside, beside the frontier
        assert [words for words, frame in on if frame != "heights" or not words.isdigit()] == []


def test_tight_places_side_by_side_keep_their_numbers_apart(study):
    case = study("fails")
    first, where = case.governing.critical, case.profile.distance_m
    places = tuple(dataclasses.replace(first, index=i, distance_m=float(where[i])) for i in range(126, 131))
    rules = [dataclasses.replace(each, places=places) if each is case.governing else each for each in case.rules]
    crowded = dataclasses.replace(case, rules=tuple(rules))
    found = boxes(profile_figure(crowded))
    assert [(a[4], b[4]) for i, a in enumerate(found) for b in found[:i] if meet(a, b)] == []


# --- files ------------------------------------------------------------------------------------------------------------


@pytest.mark.parametrize("suffix", FORMATS)
def test_files_are_the_same_each_time(study, suffix):
    case = dataclasses.replace(study("bare"), relief=None)
    first, second = (render(profile_figure(case), suffix) for _ in range(2))
    assert first == second
    assert len(first) > 10_000
    assert b"dc:date" not in first
    assert b"CreationDate" not in first


def test_other_endings_are_refused(profile):
    figure = profile("bare")
    with pytest.raises(InputError, match=r"figure file ending \.jpg: must be one of \.png, \.svg, \.pdf"):
        render(figure, ".jpg")
    with pytest.raises(InputError, match="figure file ending none: must be one of"):
        render(figure, "")


def test_a_users_configuration_does_not_change_the_figure(study):
    case = dataclasses.replace(study("bare"), relief=None)
    plain = render(profile_figure(case), ".png")
    with matplotlib.rc_context({"font.size": 30, "axes.facecolor": "black", "lines.linewidth": 9, "axes.grid": False}):
        assert render(profile_figure(case), ".png") == plain


def test_names_are_never_taken_for_mathematics_and_missing_letters_are_told(study):
    case = study("bare")
    odd = dataclasses.replace(case.hop.site_a, name="$x^2$_{basis} 基地")
    figure = profile_figure(dataclasses.replace(case, hop=dataclasses.replace(case.hop, site_a=odd)))
    assert "A: $x^2$_{basis} 基地, antenna 175.0 m up" in words_of(figure)
    assert "lacks the letters 基地" in words_of(figure).replace("\n   ", " ")
    assert len(render(figure, ".png")) > 10_000


# --- small parts ------------------------------------------------------------------------------------------------------


def luminance(color):
    """Relative luminance of a color (WCAG 2.1, definition of relative luminance)."""
    parts = np.array([int(color[i : i + 2], 16) for i in (1, 3, 5)]) / 255
    linear = np.where(parts <= 0.03928, parts / 12.92, ((parts + 0.055) / 1.055) ** 2.4)
    return float(linear @ [0.2126, 0.7152, 0.0722])


def contrast(one, other):
    light, dark = sorted((luminance(one), luminance(other)), reverse=True)
    return (light + 0.05) / (dark + 0.05)


def test_contrast_of_words_and_lines():
    """WCAG 2.1: 4.5 to 1 for words (1.4.3), 3 to 1 for graphics that must be told apart (1.4.11)."""
    for color in (style.INK, style.MUTED, *style.OUTCOMES.values()):
        assert contrast(color, "#ffffff") >= 4.5
    for color in (*style.RULE_COLORS, style.RAY, style.GROUND_EDGE, style.COVER_EDGE):
        assert contrast(color, "#ffffff") >= 3.0
    assert contrast(style.GROUND_EDGE, style.GROUND) >= 3.0


def test_grey_print_keeps_the_order_ground_cover_trouble():
    ground, cover, trouble = (luminance(color) for color in (style.GROUND, style.COVER, style.FAIL))
    assert ground > 1.5 * cover > 1.5 * trouble


@given(st.integers(1, 20_000), st.integers(10, 4000))
def test_thinning_keeps_the_extremes_and_the_ends(count, most):
    values = np.random.default_rng(count).standard_normal(count)
    kept = thinned(values, most)
    assert kept.size <= max(most, 4)
    assert {0, count - 1, int(values.argmin()), int(values.argmax())} <= set(kept.tolist())
    assert (np.diff(kept) > 0).all()


@given(st.lists(st.floats(0, 10), min_size=1, max_size=12))
def test_spread_places_stand_apart_in_order_and_inside(at):
    moved = spread(at, 0.5, 0.0, 10.0)
    order = np.argsort(at, kind="stable")
    assert (np.diff(np.array(moved)[order]) >= 0.5 - 1e-9).all()
    assert min(moved) >= 0.0
    assert max(moved) <= 10.0 + 1e-9


@given(
    st.text(st.characters(codec="latin-1", categories=("L", "N", "P")), max_size=80).map(
        lambda s: s[:40] + " " + s[40:]
    )
)
def test_wrapping_loses_no_letter_and_fits(words):
    lines = wrap(words, 1.0, 8.0)
    assert "".join("".join(lines).split()) == "".join(words.split())
    assert all(width_in(line, 8.0) <= 1.0 + 1e-9 for line in lines)


def test_slopes_toward_the_light_are_brighter():
    """Light from the upper left of the page: ground that falls toward the upper left is lit."""
    rise = np.add.outer(np.arange(50.0), np.arange(50.0))
    shade = brightness(np.concatenate((rise, rise[::-1, ::-1])), 10.0, 10.0)
    assert shade.shape == (50, 100)  # across the path down the page, along it to the right
    assert shade[25, 24] > shade[25, 75]  # of the same height


def test_noise_of_flat_ground_stays_noise_and_missing_ground_stays_missing():
    ground = np.random.default_rng(1).normal(20.0, 0.1, (60, 40))
    assert np.ptp(brightness(ground, 10.0, 10.0)) < 0.1
    ground[20:30, 10:20] = np.nan
    shade = brightness(ground, 10.0, 10.0)
    assert np.isnan(shade[12:18, 22:28]).all()
    assert np.isfinite(shade[:5]).all()


def test_letters_of_the_font():
    assert missing_letters("Łódź – Ελλάδα ∞ −") == ""
    assert missing_letters("a基b地a") == "基地"


def test_heights_near_zero_are_not_written_as_zero():
    assert Scale().height_text(-0.004) == "−0.0040 m"
    assert Scale().height_text(0.0) == "0.0 m"


def test_rules_are_listed_tightest_first_and_look_apart(study, profile):
    case = study("long")
    said = words_of(profile("long"))
    least = sorted(case.rules, key=lambda each: float(each.check.surplus_m.min()))
    places = [said.index(f"({each.check.rule.label})") for each in least]
    assert places == sorted(places)
    assert len({rule_look(position) for position in range(25)}) == 25


def test_strip_shows_the_tightest_place_of_every_rule_that_is_near(study, profile):
    for name in CASES[:5]:
        low, high = axes_of(profile(name), "surplus").get_ylim()
        for result in study(name).rules:
            assert low < float(result.check.surplus_m.min()) < high
