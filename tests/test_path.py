"""profiler.path: geodesics against published lines and geographiclib, points beside the path, datum changes."""

import math
import warnings

import numpy as np
import pytest
from geographiclib.geodesic import Geodesic
from hypothesis import assume, given
from hypothesis import strategies as st

from profiler.errors import InputError
from profiler.path import DATUMS, LONGEST_M, across, geodesic, locate, midpoint, to_wgs84, trace

longitudes = st.floats(-180, 180)
latitudes = st.floats(-89.5, 89.5)
azimuths = st.floats(0, 360, exclude_max=True)
hop_lengths_m = st.floats(100, 150e3)


def half_digit(printed: str) -> float:
    """Half of the last printed digit: the most that a rounded published value may differ from the truth."""
    return 0.5 * 10.0 ** -len(printed.partition(".")[2])


def dms(degrees: int, minutes: int, seconds: float) -> float:
    return math.copysign(abs(degrees) + minutes / 60 + seconds / 3600, degrees)


def turn(a: float, b: float) -> float:
    """Unsigned angle between two azimuths."""
    return abs((a - b + 180) % 360 - 180)


def hop_ends(longitude: float, latitude: float, azimuth: float, length_m: float) -> tuple[float, float, float, float]:
    end = Geodesic.WGS84.Direct(latitude, longitude, azimuth, length_m)
    return longitude, latitude, end["lon2"], end["lat2"]


# Published lines ------------------------------------------------------------------------------------------------------


def test_flinders_peak_to_buninyong():
    # Geocentric Datum of Australia Technical Manual, worked example of Vincenty's formulae (from memory of the text).
    # Its ellipsoid is GRS80, which differs from WGS 84 by 0.1 mm in the polar radius: under 2 µm on this line.
    line = trace(dms(144, 25, 29.52440), dms(-37, 57, 3.72030), dms(143, 55, 35.38390), dms(-37, 39, 10.15610), 1e3)
    assert line.distance_m == pytest.approx(54972.271, abs=half_digit("54972.271"))
    second = half_digit("5.37") / 3600
    assert line.azimuth_a_deg == pytest.approx(dms(306, 52, 5.37), abs=second)
    assert line.azimuth_b_deg == pytest.approx(dms(127, 10, 25.07), abs=second)


@pytest.mark.parametrize(
    ("positions", "distance", "azimuth_a", "azimuth_b"),
    [
        # GeographicLib documentation, Python package examples: Wellington to Salamanca; the azimuth of the library
        # at the far end points onward, so ours at B toward A is 180 degrees more.
        ((174.81, -41.32, -5.50, 40.96), "19959679.267", "161.0676700", "198.8251951"),
        # GeographicLib documentation, GeodSolve(1): John F. Kennedy to Singapore Changi (from memory of the page).
        ((-dms(73, 46, 44), dms(40, 38, 23), dms(103, 59, 22), dms(1, 21, 33)), "15347628", "3.3083", "357.4859"),
    ],
)
def test_long_published_lines(positions, distance, azimuth_a, azimuth_b):
    ours = geodesic(*positions)
    for value, printed in zip(ours, (distance, azimuth_a, azimuth_b), strict=True):
        assert float(value) == pytest.approx(float(printed), abs=half_digit(printed))


def test_the_longest_line_that_a_quadrant_gives():
    # Length of the WGS 84 meridian quadrant: 10 001 965.729 m (DMA TR 8350.2, derived constants).
    assert float(geodesic(0, 0, 0, 90)[0]) == pytest.approx(10_001_965.729, abs=half_digit("0.729"))


def test_a_degree_of_the_equator():
    # Along the equator the geodesic is an arc of the semi-major axis, 6 378 137 m exactly.
    assert float(geodesic(0, 0, 1, 0)[0]) == pytest.approx(6_378_137 * math.pi / 180, abs=1e-6)


@given(longitudes, latitudes, azimuths, hop_lengths_m)
def test_agrees_with_geographiclib(longitude, latitude, azimuth, length):
    ends = hop_ends(longitude, latitude, azimuth, length)
    distance, azimuth_a, azimuth_b = geodesic(*ends)
    other = Geodesic.WGS84.Inverse(ends[1], ends[0], ends[3], ends[2])
    assert float(distance) == pytest.approx(other["s12"], abs=1e-6)
    sharp = math.degrees(1e-6 / length)  # a micrometre across the far end
    assert turn(float(azimuth_a), other["azi1"]) < sharp + 1e-9
    assert turn(float(azimuth_b), other["azi2"] + 180) < sharp + 1e-9


# Points of the path ---------------------------------------------------------------------------------------------------


@given(longitudes, latitudes, azimuths, hop_lengths_m, st.floats(10, 5e3))
def test_points_are_equally_spaced_on_the_geodesic(longitude, latitude, azimuth, length, spacing):
    ends = hop_ends(longitude, latitude, azimuth, length)
    line = trace(*ends, spacing)
    assert (line.longitude[0], line.latitude[0], line.longitude[-1], line.latitude[-1]) == ends
    assert line.along_m[0] == 0
    assert line.along_m[-1] == line.distance_m
    assert line.points == line.along_m.size == max(1, math.ceil(line.distance_m / spacing * (1 - 1e-9))) + 1
    steps = geodesic(line.longitude[:-1], line.latitude[:-1], line.longitude[1:], line.latitude[1:])[0]
    assert np.all(np.abs(steps - line.distance_m / (line.points - 1)) < 1e-6)
    assert steps.max() <= spacing * (1 + 1e-9)
    somewhere = line.points // 2
    other = Geodesic.WGS84.Inverse(
        line.latitude[0], line.longitude[0], line.latitude[somewhere], line.longitude[somewhere]
    )
    assert other["s12"] == pytest.approx(float(line.along_m[somewhere]), abs=1e-6)


@given(longitudes, latitudes, azimuths, hop_lengths_m)
def test_swapped_ends_walk_the_same_points_backward(longitude, latitude, azimuth, length):
    ends = hop_ends(longitude, latitude, azimuth, length)
    there, back = trace(*ends, 1e3), trace(*ends[2:], *ends[:2], 1e3)
    assert turn(there.azimuth_a_deg, back.azimuth_b_deg) < 1e-9
    assert turn(there.azimuth_b_deg, back.azimuth_a_deg) < 1e-9
    apart = geodesic(there.longitude, there.latitude, back.longitude[::-1], back.latitude[::-1])[0]
    assert np.all(apart < 1e-6)


def test_path_over_the_antimeridian_and_over_the_pole():
    fiji = trace(179.95, -17.0, -179.95, -17.0, 100.0)
    assert fiji.distance_m == pytest.approx(10.65e3, abs=10)
    assert np.all(np.abs(fiji.longitude) >= 179.95)
    pole = trace(0.0, 89.9, 180.0, 89.9, 100.0)
    assert pole.latitude.max() == pytest.approx(90.0, abs=1e-3)
    assert pole.azimuth_a_deg == 0.0
    assert pole.azimuth_b_deg == 0.0
    assert turn(float(pole.azimuth_deg[-1]), 180.0) < 1e-9


def test_a_site_at_the_pole_itself():
    line = trace(30.0, 89.8, 0.0, 90.0, 500.0)
    assert line.azimuth_a_deg == pytest.approx(0.0, abs=1e-9)
    assert np.all(np.diff(line.latitude) > 0)


def test_arrays_are_read_only():
    line = trace(0, 0, 0.1, 0, 1e3)
    with pytest.raises(ValueError, match="read-only"):
        line.longitude[0] = 1.0


def test_spacing_that_divides_the_path_adds_no_point():
    length = float(geodesic(0, 0, 0.1, 0)[0])
    assert trace(0, 0, 0.1, 0, length / 7).points == 8
    assert trace(0, 0, 0.1, 0, length * 2).points == 2


@given(longitudes, latitudes, azimuths, hop_lengths_m)
def test_midpoint_is_as_far_from_both_ends(longitude, latitude, azimuth, length):
    ends = hop_ends(longitude, latitude, azimuth, length)
    middle = midpoint(*ends)
    to_a, to_b = (float(geodesic(*middle, *site)[0]) for site in (ends[:2], ends[2:]))
    assert to_a == pytest.approx(to_b, abs=1e-6)
    assert to_a + to_b == pytest.approx(length, abs=1e-5)


@pytest.mark.parametrize(
    ("positions", "spacing", "message"),
    [
        ((10, 50, 10, 50), 10, r"sites are 0\.00 m apart: must be at least 1 m"),
        ((10, 50, -10, 50), 10, r"sites are 1430 km apart: must be at most 1000 km; check the signs"),
        ((10, 95, 10, 50), 10, r"latitude = 95: must be -90 to 90 degrees"),
        ((280, 50, 10, 50), 10, r"longitude = 280: must be -180 to 180 degrees"),
        ((math.nan, 50, 10, 50), 10, r"longitude = nan: must be"),
        ((10, 50, 10, 50.1), 0, r"spacing_m = 0: must be more than 0 m"),
        ((10, 50, 10, 50.1), math.inf, r"spacing_m = inf: must be more than 0 m"),
        ((10, 50, 10, 50.1), 1e-3, r"spacing_m = 0\.001: must be more than 0\.00556 m on this path of 11\.1 km"),
    ],
)
def test_trace_refuses(positions, spacing, message):
    with pytest.raises(InputError, match=message) as caught:
        trace(*positions, spacing)
    assert "\n" not in str(caught.value)
    assert LONGEST_M == 1e6


# Beside the path ------------------------------------------------------------------------------------------------------


@given(longitudes, latitudes, azimuths, hop_lengths_m, st.floats(-500, 500), st.floats(0, 1))
def test_locate_undoes_across(longitude, latitude, azimuth, length, offset, share):
    line = trace(*hop_ends(longitude, latitude, azimuth, length), length / 20)
    lon, lat = across(line, np.full((line.points, 1), offset))
    index = round(share * (line.points - 1))
    along, back = locate(line, lon[index, 0], lat[index, 0])
    assert float(along) == pytest.approx(float(line.along_m[index]), abs=1e-4)
    assert float(back) == pytest.approx(offset, abs=1e-4)


@given(longitudes, latitudes, azimuths, st.floats(1e3, 300e3), st.floats(-90e3, 90e3), st.floats(0, 1))
def test_no_point_of_the_path_is_nearer_than_the_one_located(longitude, latitude, azimuth, length, aside, share):
    assume(abs(latitude) < 85)
    line = trace(*hop_ends(longitude, latitude, azimuth, length), length / 50)
    start = Geodesic.WGS84.Direct(latitude, longitude, azimuth, share * length)
    point = Geodesic.WGS84.Direct(start["lat2"], start["lon2"], start["azi2"] + 60, aside)
    _, offset = locate(line, point["lon2"], point["lat2"])
    distances = geodesic(line.longitude, line.latitude, point["lon2"], point["lat2"])[0]
    assert abs(float(offset)) <= distances.min() + 1e-6
    if 0 < share < 1 and abs(aside) > 1:
        assert math.copysign(1, float(offset)) == math.copysign(1, aside)


def test_locate_stops_at_the_sites():
    line = trace(0.0, 50.0, 0.2, 50.0, 500.0)
    along, offset = locate(line, [-0.1, 0.3], [50.0, 50.0])
    assert along.tolist() == [0.0, line.distance_m]
    behind = geodesic([-0.1, 0.3], 50.0, [0.0, 0.2], 50.0)[0]
    assert np.abs(offset) == pytest.approx(behind, abs=1e-6)


def test_across_lies_at_right_angles():
    line = trace(-112.0, 36.0, -111.6, 36.3, 2e3)
    lon, lat = across(line, np.tile([-40.0, 0.0, 40.0], (line.points, 1)))
    distance, azimuth, _ = geodesic(line.longitude[:, None], line.latitude[:, None], lon, lat)
    assert distance == pytest.approx(np.tile([40.0, 0.0, 40.0], (line.points, 1)), abs=1e-6)
    right = (azimuth[:, 2] - line.azimuth_deg) % 360
    assert right == pytest.approx(np.full(line.points, 90.0), abs=1e-5)


def test_across_refuses_a_shape_that_does_not_fit():
    with pytest.raises(InputError, match=r"offset_m of shape \(3, 1\): must be \(2, across\)"):
        across(trace(0, 0, 0.1, 0, 20e3), np.zeros((3, 1)))


# Other datums and grids -----------------------------------------------------------------------------------------------


def test_british_national_grid_worked_example():
    # Ordnance Survey, "A guide to coordinate systems in Great Britain", annexe C: the point E 651 409.903,
    # N 313 177.270 on OSGB36 is 52°39'27.2531"N 1°43'4.5177"E (Airy 1830). EPSG code 4277 keeps the datum, so going
    # from the grid and from those degrees to WGS 84 must end at one place.
    grid = to_wgs84(651_409.903, 313_177.270, 27700)
    degrees = to_wgs84(dms(1, 43, 4.5177), dms(52, 39, 27.2531), "OSGB36")
    assert float(geodesic(*grid[:2], *degrees[:2])[0]) < 0.005


def test_utm_worked_example():
    # The central meridian of UTM zone 12 is 111°W, false easting 500 km, scale 0.9996 (EPSG guidance note 7-2):
    # on it the northing is 0.9996 of the meridian arc, and the easting is 500 km at any latitude.
    arc = float(geodesic(-111, 0, -111, 36)[0])
    longitude, latitude, note = to_wgs84(500_000.0, 0.9996 * arc, 32612)
    assert (longitude, latitude) == pytest.approx((-111, 36), abs=1e-9)
    assert note == "from WGS 84 / UTM zone 12N (EPSG:32612) by Inverse of UTM zone 12N, exact"


def test_nad27_to_wgs84_shift():
    # NIMA TR 8350.2, third edition, appendix B: NAD27 (western United States) to WGS 84 is dX -8, dY 159,
    # dZ 175 m from Clarke 1866 (from memory; EPSG's "NAD27 to WGS 84 (6)"), worked through earth-centred coordinates.
    a, b = 6378206.4, 6356583.8
    lat, lon = math.radians(36), math.radians(-112)
    radius = a / math.sqrt(1 - (1 - b * b / a / a) * math.sin(lat) ** 2)
    x = radius * math.cos(lat) * math.cos(lon) - 8
    y = radius * math.cos(lat) * math.sin(lon) + 159
    z = radius * b * b / a / a * math.sin(lat) + 175
    expected_longitude = math.degrees(math.atan2(y, x))
    longitude, latitude, note = to_wgs84(-112, 36, "NAD27")
    assert longitude == pytest.approx(expected_longitude, abs=1e-7)
    f = 1 / 298.257223563
    e2 = f * (2 - f)
    guess = math.atan2(z, math.hypot(x, y) * (1 - e2))
    for _ in range(10):
        n = 6378137 / math.sqrt(1 - e2 * math.sin(guess) ** 2)
        guess = math.atan2(z + e2 * n * math.sin(guess), math.hypot(x, y))
    assert latitude == pytest.approx(math.degrees(guess), abs=1e-7)
    assert "stated accuracy 7 m" in note


def test_a_missing_grid_is_in_the_note_and_not_a_warning():
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        note = to_wgs84(-112, 36, "nad 27")[2]
    if "us_noaa_conus" not in note:
        pytest.skip("this PROJ has the NADCON grids installed")
    assert note.startswith("from NAD27 (EPSG:4267) by NAD27 to WGS 84 (6), stated accuracy 7 m; NAD27 to WGS 84 (")
    assert note.endswith("would be better and needs us_noaa_azhpgn.tif, us_noaa_conus.tif, not installed")


def test_a_ballpark_shift_is_called_one():
    # EPSG 4001 is "Unknown datum based upon the Airy 1830 ellipsoid": no shift can be known, PROJ passes it through.
    longitude, latitude, note = to_wgs84(-1.0, 52.0, 4001)
    assert (longitude, latitude) == pytest.approx((-1.0, 52.0), abs=1e-6)
    assert "may be off by 100 m and more (ballpark)" in note


@pytest.mark.parametrize(("name", "code"), DATUMS.items())
def test_datum_names_are_those_of_the_epsg_dataset(name, code):
    from pyproj import CRS

    system = CRS.from_epsg(code)
    assert system.name.upper().replace(" ", "") == name
    assert system.type_name == "Geographic 2D CRS"


@given(st.floats(-113.9, -108.1), st.floats(30, 45))
def test_grid_round_trip(longitude, latitude):
    from pyproj import Proj  # the projection formula alone, no datum and no database

    x, y = Proj(proj="utm", zone=12, ellps="WGS84")(longitude, latitude)
    assert to_wgs84(x, y, "EPSG:32612")[:2] == pytest.approx((longitude, latitude), abs=1e-8)


def test_a_little_outside_the_area_is_noted():
    from pyproj import Proj

    x, y = Proj(proj="utm", zone=12, ellps="WGS84")(-114.25, 36.0)
    assert to_wgs84(x, y, 32612)[2].endswith("0.25 degrees outside the area that the system is made for")


def test_area_that_crosses_the_antimeridian():
    # NZGD2000 is made for 160.6°E to 171.2°W; the Chatham Islands lie beyond the antimeridian.
    longitude, _, note = to_wgs84(-176.5, -44.0, "NZGD2000")
    assert longitude == pytest.approx(-176.5, abs=1e-6)
    assert "outside" not in note


def test_degrees_and_grids_are_not_mixed_up():
    with pytest.raises(InputError, match=r"crs = 32612: must be geographic, and WGS 84 / UTM zone 12N .* eastings"):
        to_wgs84(-112, 36, 32612, degrees=True)
    with pytest.raises(InputError, match=r"crs = 'NAD27': must be projected, and NAD27 \(EPSG:4267\) is for degrees"):
        to_wgs84(-112, 36, "NAD27", degrees=False)


@pytest.mark.parametrize(
    ("x", "y", "crs", "message"),
    [
        (3_990_000, 447_000, 32612, r"must lie in the area of WGS 84 / UTM zone 12N .* check the code, the order"),
        (10, 50, "NAD27", r"must lie in the area of NAD27 \(EPSG:4267\) \(167.65 to -47.74 east"),
        (10, 95, "NAD83", r"latitude = 95: must be -90 to 90"),
        (10, 95, "WGS84", r"latitude = 95: must be -90 to 90"),
        (-112, 36, "NAD28", r"crs = 'NAD28': must be an EPSG code or a known datum; did you mean 'NAD"),
        (-112, 36, "moon", r"crs = 'moon': must be .*; known datums: WGS84, NAD83"),
        (-112, 36, 999_999, r"crs = 999999: must be a code that the EPSG dataset"),
        (-112, 36, 5703, r"crs = 5703: must be geographic or projected, and NAVD88 height .* is a Vertical CRS"),
        (2, 48, 4807, r"crs = 4807: must count in degrees, and NTF \(Paris\) .* counts in grad"),
        (math.nan, 1.0, 32612, r"x, y = nan, 1: must be a position that WGS 84 / UTM zone 12N"),
    ],
)
def test_to_wgs84_refuses(x, y, crs, message):
    with pytest.raises(InputError, match=message) as caught:
        to_wgs84(x, y, crs)
    assert "\n" not in str(caught.value)
