"""profiler.hopfile.positions: one place in every dress, round trips, and texts that must be refused."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from profiler.errors import InputError
from profiler.hopfile.positions import parse_position

# 40°26'46.3"N 79°58'56.1"W: the arithmetic is the definition of the sexagesimal degree.
LATITUDE = 40 + 26 / 60 + 46.3 / 3600
LONGITUDE = -(79 + 58 / 60 + 56.1 / 3600)

WRITINGS = [
    """40°26'46.3"N 79°58'56.1"W""",
    """40°26′46.3″N 79°58′56.1″W""",
    """40º26’46.3”N, 79º58’56.1”W""",
    """40°26'46.3''N 079°58'56.1''W""",
    """40° 26' 46.3" N / 79° 58' 56.1" W""",
    "40 26 46.3 N, 79 58 56.1 W",
    "40 26 46.3n 79 58 56.1w",
    "N40-26-46.3 W079-58-56.1",
    "40-26-46.3 N, 79-58-56.1 W",
    "40\u201326\u201346.3 N, 79\u201358\u201356.1 W",
    "W 79 58 56.1  N 40 26 46.3",
    "N40:26:46.3 W79:58:56.1",
    "402646.3N 0795856.1W",
    "N402646.3 W0795856.1",
    "40d26m46.3s N 79d58m56.1s W",
    "40D26M46.3S N, 79D58M56.1S W",
    "40 deg 26 min 46.3 sec north, 79 deg 58 min 56.1 sec west",
    "lat: 40 26 46.3, lon: -79 58 56.1",
    "lon=-79:58:56.1; lat=40:26:46.3",
    "40 26 46.3 -79 58 56.1",
    "(40:26:46.3, \u221279:58:56.1)",
    """+40°26'46.3", -79°58'56.1\"""",
    "+402646.3-0795856.1/",
    """40°26'46,3"N 79°58'56,1"W""",
    """40°26'46,3"N, 79°58'56,1"W""",
    "N 40 26 46,3; W 79 58 56,1",
    "40:26:46,3 / -79:58:56,1",
    "402646,3N 0795856,1W",
    "40° 26' 46,3\" Nord, 79° 58' 56,1\" Ouest",
    f"{LATITUDE!r}, {LONGITUDE!r}",
    f"{LATITUDE!r}; {LONGITUDE!r}".replace(".", ","),
    f"N{LATITUDE!r} W{-LONGITUDE!r}".replace(".", ","),
    f"{LATITUDE!r} {LONGITUDE!r}",
    f"{LATITUDE!r}°N {-LONGITUDE!r}°W",
    f"{40 + 0!r}° {26 + 46.3 / 60!r}' N 79° {58 + 56.1 / 60!r}' W",
    f"40{26 + 46.3 / 60!r}N 079{58 + 56.1 / 60!r}W",
    f"+{LATITUDE!r}-0{-LONGITUDE!r}/",
]


@pytest.mark.parametrize("text", WRITINGS)
def test_one_place_in_many_dresses(text):
    assert parse_position(text) == pytest.approx((LATITUDE, LONGITUDE), abs=1e-11)


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("40d26m46.3S 79d58m56.1W", (-LATITUDE, LONGITUDE)),  # another case than d and m: the letter of the south
        ("40 26 46.3 S 79 58 56.1 E", (-LATITUDE, -LONGITUDE)),
        ("40°26'46.3 S, 79°58'56.1 E", (-LATITUDE, -LONGITUDE)),
        ("4026N 07958W", (40 + 26 / 60, -79 - 58 / 60)),
        ("-0 30 0, -0 15 0", (-0.5, -0.25)),
        ("0, 0", (0, 0)),
        ("40,79", (40, 79)),
        ("N 40,79 W", (40, -79)),
        ("40 Süd 79 Ost", (-40, 79)),
        ("40 Sud, 79 Est", (-40, 79)),
        ("40 norte, 79 oeste", (40, -79)),
        ("90 S 180 W", (-90, -180)),
        ("40 -79", (40, -79)),
        ("40 26.5 79 58.5", (40 + 26.5 / 60, 79 + 58.5 / 60)),
        ("+40-079", (40, -79)),
    ],
)
def test_other_texts(text, expected):
    assert parse_position(text) == pytest.approx(expected, abs=1e-11)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("40 26 46 79", r"readable in one way, not as 40°, 26°46'79\" or 40°26', 46°79' or 40°26'46\", 79°"),
        ("N 40 26 79 58 W", r"readable in one way, not as .*; put a comma between the two, or use letters"),
        ("40 N 79", r"letters on both angles or on neither"),
        ("40 26 46 N 79 58 56", r"letters on both angles or on neither"),
        ("40 N 79 N", r"a latitude and a longitude, not two latitudes"),
        ("lat 40, lat 41", r"not two latitudes"),
        ("-40 N 79 W", r"with a sign or a letter, not both"),
        ("+40 N, 79 W", r"with a sign or a letter, not both"),
        ("40N-79W", r"with a sign or a letter, not both"),
        ("40 60 0 N 79 0 0 W", r"with minutes under 60, not 60"),
        ("40 26 60.0 N 79 58 56 W", r"with seconds under 60, not 60\.0"),
        ("406000N 0790000W", r"with minutes under 60, not 60"),
        ("+406000-0790000", r"with minutes under 60, not 60"),
        ("90.1, 10", r"a latitude of -90 to 90 degrees, not 90\.1°; .* swapped: give 10°, 90\.1°$"),
        ("-112.1, 36.1", r"a latitude of -90 to 90 degrees, not -112\.1°; .* swapped: give 36\.1°, -112\.1°$"),
        ("91 N 10 E", r"a latitude of -90 to 90 degrees, not 91°N$"),
        ("40, 280", r"a longitude of -180 to 180 degrees, not 280°"),
        ("402646N 795856W", r"a longitude of up to 3 digits, or packed DDDMM or DDDMMSS with a letter"),
        ("402646, 0795856", r"a latitude of up to 3 digits, or packed DDMM or DDMMSS with a letter"),
        ("40,4462 79,9822", r"with one comma, between latitude and longitude, and decimals after a point"),
        ("40 - 26 N 79 - 58 W", r"without a hyphen between blanks"),
        ("40.5 26 N 79 58 W", r"a latitude and a longitude; write latitude first"),
        ("40.4462-79.9822", r"a latitude and a longitude; write latitude first"),
        ("40.4462N", r"a latitude and a longitude; write latitude first"),
        ("lon 40 N, 79 W", r"with a letter that fits 'lon', not N"),
        ("-112.1, 136.1", r"a latitude of -90 to 90 degrees, not -112\.1°; latitude comes first, or use letters$"),
        ("-112:30, 36:10", r"not -112°30'; latitude and longitude look swapped: give 36°10', -112°30'$"),
        ("40 Septentrio, 79 West", r"a position, and 'Septentrio' has no meaning in one"),
        (
            "40 N 79 O",
            r"with E or W, not 'O': in some languages that is the west \(Ouest, .*, in others the east \(Ost\)",
        ),
        ("40o26'N 79o58'W", r"with E or W, not 'o': .*; write degrees as ° or deg$"),
        ("N 40 26,79 58 W", r"readable in one way, not as 40°26'N, 79°58'W or 40°26\.79'N, 58°W"),
        ("40,26 79,58", r"with one comma, between latitude and longitude, and decimals after a point; or with letters"),
        ("40,4462, 79,9822", r"with one comma, between latitude and longitude"),
        ("40#, 79", r"a position, and '#' has no meaning in one"),
        ("nan, nan", r"'nan' has no meaning"),
        ("1e5, 3", r"a latitude and a longitude"),
        ("", r"a latitude and a longitude"),
        ("1 2 3 4 5 6 7 8", r"a latitude and a longitude"),
        ("40\nN 79\nN", r"not two latitudes"),
    ],
)
def test_refused(text, message):
    with pytest.raises(InputError, match=message) as caught:
        parse_position(text)
    assert str(caught.value).startswith(f"position = {' '.join(text.split())!r}: must be ")
    assert "\n" not in str(caught.value)


def split(hundredths: int) -> tuple[int, int, float]:
    """Degrees, minutes, seconds of an angle in hundredths of a second."""
    minutes, rest = divmod(hundredths, 6000)
    return minutes // 60, minutes % 60, rest / 100


latitudes = st.integers(-90 * 360_000, 90 * 360_000)
longitudes = st.integers(-180 * 360_000, 180 * 360_000)


@given(
    latitudes,
    longitudes,
    st.sampled_from(
        [
            "{d}°{m}'{s}\"{h}",
            "{h}{d} {m} {s}",
            "{d}:{m}:{s} {h}",
            "{h}{d}-{m}-{s}",
            "{d}d{m}m{s}s {h}",
            "{p}{m:02}{s:05.2f}{h}",
        ]
    ),
    st.sampled_from([" ", ", ", " / "]),
    st.booleans(),
)
def test_round_trip_with_letters(latitude, longitude, dress, between, longitude_first):
    parts = []
    for value, letters, width in ((latitude, "NS", 2), (longitude, "EW", 3)):
        degrees, minutes, seconds = split(abs(value))
        parts.append(dress.format(d=degrees, m=minutes, s=seconds, h=letters[value < 0], p=f"{degrees:0{width}}"))
    text = between.join(reversed(parts) if longitude_first else parts)
    assert parse_position(text) == pytest.approx((latitude / 360_000, longitude / 360_000), abs=1e-10)


@given(latitudes, longitudes, st.sampled_from(["{v:.7f}", "{v:+.7f}", "{v:.7f}°", "{v:.7f} deg"]))
def test_round_trip_with_signs(latitude, longitude, dress):
    text = ", ".join(dress.format(v=value / 360_000) for value in (latitude, longitude))
    assert parse_position(text) == pytest.approx((latitude / 360_000, longitude / 360_000), abs=6e-8)


@given(st.text(alphabet="0123456789.-+ ,NSEWnsew°'\"dm:/", max_size=24))
def test_any_text_gives_a_place_on_the_globe_or_one_line(text):
    try:
        latitude, longitude = parse_position(text)
    except InputError as error:
        message, latitude, longitude = str(error), 0.0, 0.0
    else:
        message = ""
    assert "\n" not in message
    assert -90 <= latitude <= 90
    assert -180 <= longitude <= 180
