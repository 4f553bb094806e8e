"""profiler.hopfile.grids: UTM and MGRS as text, against PROJ and an implementation of MGRS by others."""

import mgrs
import pytest
from hypothesis import given
from hypothesis import strategies as st
from pyproj import Transformer

from profiler.errors import InputError
from profiler.hopfile import parse_hop
from profiler.hopfile.grids import parse_grid
from profiler.path import geodesic

HOP = """
frequency_ghz = 7.5
[site_a]
position = "{}"
{}
antenna_m = 35
[site_b]
position = "40.1 N, 105.0 W"
antenna_m = 30
[terrain]
paths = ["."]
[rules]
preset = "0.6-f1-plus-3m"
"""


@given(st.floats(-79.9, 83.9), st.floats(-180, 179.99), st.sampled_from([4, 5]))
def test_mgrs_agrees_with_the_other_implementation(latitude, longitude, digits):
    text = mgrs.MGRS().toMGRS(latitude, longitude, MGRSPrecision=digits)
    zone, hemisphere, easting, northing = mgrs.MGRS().MGRSToUTM(text)
    place = parse_grid(text)
    assert (place.zone, "N" if place.north else "S", place.square_m) == (zone, hemisphere, 10.0 ** (5 - digits))
    # GEOTRANS, which the other implementation wraps, gives the middle of the square too.
    assert (place.easting_m, place.northing_m) == pytest.approx((easting, northing), abs=1e-6)


@given(st.floats(-79.5, 83.5), st.integers(1, 60), st.floats(-2.9, 2.9))
def test_utm_by_its_band_agrees_with_proj(latitude, zone, off_middle):
    longitude = 6.0 * zone - 183.0 + off_middle
    epsg = (32600 if latitude >= 0 else 32700) + zone
    easting, northing = Transformer.from_crs("EPSG:4326", epsg, always_xy=True).transform(longitude, latitude)
    band = "CDEFGHJKLMNPQRSTUVWX"[min(int((latitude + 80) // 8), 19)]
    if band == "S" or abs(latitude) < 1e-6:  # not to be told from the southern hemisphere; on the equator
        return
    place = parse_grid(f"{zone}{band} {easting:.3f} {northing:.3f}")
    assert (place.zone, place.north) == (zone, latitude >= 0)
    assert (place.easting_m, place.northing_m) == pytest.approx((easting, northing), abs=1e-3)


@pytest.mark.parametrize(
    ("text", "north", "northing_m"),
    [
        ("13T 478000 4420000", True, 4_420_000.0),
        ("UTM zone 13T, 478000 mE, 4420000 mN", True, 4_420_000.0),
        ("13 north 478000 4420000", True, 4_420_000.0),
        ("13N 478000 4420000", True, 4_420_000.0),  # not in band N, so the hemisphere; in band N it is the same place
        ("56 south 334000 6252000", False, 6_252_000.0),
        ("56S 334000 6252000", False, 6_252_000.0),  # 33.9° south; band S ends at 4 430 km
        ("56H 334000 6252000", False, 6_252_000.0),
        ("13TDE7800020000", True, 4_420_000.5),
        ("13T DE 7800 2000", True, 4_420_005.0),
    ],
)
def test_grid_text_in_many_habits(text, north, northing_m):
    place = parse_grid(text)
    assert (place.north, place.northing_m) == (north, northing_m)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        # 4 000 km is 36.1° north in band S, and 54° south in the southern hemisphere: sea, but also Tierra del Fuego.
        (
            "19S 478000 4000000",
            "UTM without doubt: write 19 north for band S .* or 19 south for the southern",
        ),
        ("13T 478000 3000000", "a northing that lies in band T; or write north or south"),
        ("13I 478000 4420000", "a band of latitude out of CDEFGHJKLMNPQRSTUVWX"),
        ("61T 478000 4420000", "zone 1 to 60"),
        ("13TDE780200", "MGRS to 10 m or 1 m"),
        ("14TAE7800020000", "a column of zone 14, one of JKLMNPQR"),
    ],
)
def test_grid_text_that_is_refused(text, message):
    with pytest.raises(InputError, match=message):
        parse_grid(text)


@pytest.mark.parametrize("text", ["40.1, -105.2", "40 26 46 N 79 58 56 W", "13 478000 4420000", "+40.4-079.9/"])
def test_what_is_no_grid_text_is_left_to_the_reader_of_degrees(text):
    assert parse_grid(text) is None


def site(position, more=""):
    return parse_hop(HOP.format(position, more), "hop.toml").site_a


def test_a_hop_file_takes_utm_and_mgrs_and_says_so():
    utm, mgrs_site = site("13T 478000 4420000"), site("13T DE 7800 2000")
    longitude, latitude = Transformer.from_crs(32613, 4326, always_xy=True).transform(478000, 4420000)
    assert (utm.longitude, utm.latitude) == pytest.approx((longitude, latitude), abs=1e-8)
    assert utm.position_notes[0] == "given as 13T 478000 4420000"
    assert mgrs_site.position_notes[0] == "given as 13T DE 7800 2000, the middle of a square of 10 m"
    assert float(geodesic(longitude, latitude, mgrs_site.longitude, mgrs_site.latitude)[0]) == pytest.approx(
        50**0.5, 0.01
    )


def test_utm_on_an_older_datum_is_moved():
    moved = site("13T 478000 4420000", 'datum = "NAD27"')
    old = site("13T 478000 4420000")
    # NAD27's UTM grid lies some 200 m from that of WGS 84 in northing in Colorado (NIMA TR 8350.2, from memory).
    assert 150 < float(geodesic(old.longitude, old.latitude, moved.longitude, moved.latitude)[0]) < 260
    with pytest.raises(InputError, match=r"site_a\.datum = 'CH1903': must be one of WGS84, ETRS89, NAD83, NAD27"):
        site("13T 478000 4420000", 'datum = "CH1903"')
