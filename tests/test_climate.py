"""Numbers of the maps against published rows, the package's own grids and plain physics."""

import csv
import subprocess
import sys
from importlib.util import find_spec
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from profiler.climate import lookup
from profiler.errors import InputError, MissingExtraError

needs_itur = pytest.mark.skipif(find_spec("itur") is None, reason='the maps need pip install "hopwright[climate]"')


@needs_itur
@pytest.mark.parametrize(
    ("latitude", "longitude", "rain_rate_mm_h"),
    [
        # ITU-R Study Group 3 validation examples (CG-3M3J-13-ValEx), Rec. ITU-R P.837-7, 0.01 %.
        (3.133, 101.7, "99.1481136"),
        (22.9, -43.23, "50.639304"),
        (51.5, -0.14, "26.48052"),
    ],
)
def test_rain_rate_typed_rows(latitude, longitude, rain_rate_mm_h):
    half_unit = 0.5 * 10.0 ** -len(rain_rate_mm_h.partition(".")[2])
    assert abs(lookup(longitude, latitude).rain_rate_r001_mm_h - float(rain_rate_mm_h)) <= half_unit


@needs_itur
def test_rain_rate_all_published_rows(reference):
    # The same source; the rows are printed with 7 decimals, trailing zeros dropped.
    with (reference / "p837_rain_rate_r001.csv").open() as file:
        for row in csv.DictReader(file):
            found = lookup(float(row["longitude"]), float(row["latitude"]))
            assert abs(found.rain_rate_r001_mm_h - float(row["rain_rate_mm_h"])) <= 0.5e-7


def grid(name):
    """Read one published grid of the package, past its own interpolation."""
    return np.load(Path(find_spec("itur").origin).parent / "data" / "453" / name)["arr_0"]


@needs_itur
@pytest.mark.parametrize(("longitude", "latitude"), [(54.75, 25.5), (-0.75, 51.0), (-112.5, -36.0), (180.0, 0.0)])
def test_gradients_at_grid_points(longitude, latitude):
    # Rec. ITU-R P.453-13: rows from 90 north, columns from 0 east, 0.75 degrees apart.
    row, column = round((90 - latitude) / 0.75), round(longitude % 360 / 0.75)
    place = lookup(longitude, latitude)
    assert place.dn1_n_km == pytest.approx(grid("v12_dn65m_01d00_v1.npz")[row, column], rel=1e-12)
    k = dict(place.k_percentiles)
    for percent, name in ((0.1, "99d90"), (50, "50d00"), (90, "10d00")):  # k rises as the gradient falls
        gradient_n_km = grid(f"v12_dn_{name}_v1.npz")[row, column]
        assert k[percent] == pytest.approx(157 / (157 + gradient_n_km), rel=1e-12)


@needs_itur
def test_temperate_median_is_near_four_thirds():
    # Rec. ITU-R P.310: the standard atmosphere has k = 4/3 (-39 N/km); London is temperate.
    assert lookup(-0.14, 51.5).k_median == pytest.approx(4 / 3, abs=0.05)


@needs_itur
@given(st.floats(-180, 180), st.floats(-90, 90))
def test_percentiles_are_in_order_everywhere(longitude, latitude):
    place = lookup(longitude, latitude)
    assert place.rain_rate_r001_mm_h >= 0
    percents, factors = zip(*place.k_percentiles, strict=True)
    assert list(percents) == sorted(percents)
    assert list(factors) == sorted(factors)
    assert factors[0] > 0
    assert np.isfinite(factors[-1])
    assert dict(place.k_percentiles)[50.0] == place.k_median
    assert bool(place.warnings) == (len(place.k_percentiles) < 21)


@needs_itur
def test_trapping_is_said_and_left_out():
    # The Persian Gulf in summer is known for its ducts; the lowest kilometre traps there for 1 % of the year.
    place = lookup(55.0, 25.0)
    assert place.k_percentiles[-1][0] == 98
    (line,) = place.warnings
    assert line.startswith("refractivity gradient at or below -157 N/km for 1 % of the average year or more: rays")


@needs_itur
def test_both_names_of_the_date_line():
    east, west = lookup(180.0, 10.0), lookup(-180.0, 10.0)
    assert east.rain_rate_r001_mm_h == pytest.approx(west.rain_rate_r001_mm_h)
    assert east.k_percentiles == pytest.approx(np.array(west.k_percentiles))


@needs_itur
def test_each_source_names_its_own_map_and_the_package():
    place = lookup(-0.14, 51.5)
    assert "R0.01 of Rec. ITU-R P.837-7" in place.rain_source
    assert "lowest 65 m" in place.dn1_source
    assert "lowest kilometre" in place.k_source
    assert "P.453" not in place.rain_source
    for source in (place.dn1_source, place.k_source):
        assert "P.453-13" in source
        assert "P.837" not in source
    assert all("map of itur 0." in source for source in (place.rain_source, place.dn1_source, place.k_source))


@pytest.mark.parametrize(
    ("longitude", "latitude", "message"),
    [
        (0.0, 90.5, "latitude = 90.5: must be -90 to 90 degrees"),
        (181.0, 0.0, "longitude = 181: must be -180 to 180 degrees"),
        (float("nan"), 0.0, "longitude = nan: must be"),
    ],
)
def test_lookup_refuses(longitude, latitude, message):
    with pytest.raises(InputError, match=message):
        lookup(longitude, latitude)


def test_absent_extra_says_what_to_install(monkeypatch):
    monkeypatch.setitem(sys.modules, "itur", None)
    monkeypatch.setitem(sys.modules, "itur.models", None)
    with pytest.raises(
        MissingExtraError, match=r'need the itur package .*pip install "hopwright\[climate\]"'
    ) as raised:
        lookup(0.0, 51.5)
    assert "\n" not in str(raised.value)


@needs_itur
def test_package_comes_late_and_leaves_no_trace():
    # The package changes numpy's error state when imported; with -W error any warning of it would end the run.
    code = (
        "import sys, numpy as np\n"
        "before = np.geterr()\n"
        "from profiler.climate import lookup\n"
        "assert 'itur' not in sys.modules, 'imported before it is needed'\n"
        "lookup(0.0, 51.5)\n"
        "assert np.geterr() == before, np.geterr()\n"
    )
    root = Path(__file__).resolve().parent.parent
    done = subprocess.run(
        [sys.executable, "-W", "error", "-c", code], cwd=root, capture_output=True, text=True, check=False
    )
    assert done.returncode == 0, done.stderr
