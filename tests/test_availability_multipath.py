"""Multipath against the itur package, Barnett's and Vigants's printed forms, and what the methods promise."""

import warnings
from importlib.util import find_spec

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from profiler.availability import path_roughness
from profiler.availability.multipath import (
    fade_percent,
    geoclimatic_factor_17,
    geoclimatic_factor_17_quick,
    occurrence_17,
    occurrence_17_quick,
    occurrence_18,
    transition_fade,
    year_conversion,
)
from profiler.availability.vigants import climate_factor, improvement_vigants, occurrence_vigants, season_share
from profiler.errors import InputError
from profiler.units import STATUTE_MILE_M

needs_itur = pytest.mark.skipif(find_spec("itur") is None, reason="the second opinion needs the itur package")

distances_m = st.floats(7.5e3, 185e3)
frequencies_hz = st.floats(1e9, 45e9)
centres_m = st.floats(17.0, 2300.0)
occurrences = st.floats(1e-9, 1999.0)
fades_db = st.floats(0.0, 60.0)


def itur_530():
    with warnings.catch_warnings(), np.errstate():
        warnings.simplefilter("ignore")
        from itur.models import itu453, itu530
    return itu453, itu530


@needs_itur
@pytest.mark.parametrize(("latitude", "longitude"), [(51.5, 1.0), (46.5, 8.0), (1.3, 103.8), (-33.9, 151.2)])
def test_occurrence_second_opinion(latitude, longitude):
    # itur (MIT), P.530-17 §2.3.1 detailed design, with the dN1 and sa of its own maps.
    itu453, itu530 = itur_530()
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        dn1 = float(itu453.DN65(latitude, longitude, 1).value)
        place = np.array([float(latitude)]), np.array([longitude % 360.0])
        roughness = float(itu530._ITU530_17_.s_a(*place)[0])
        theirs = itu530.multipath_loss_for_A(latitude, longitude, 300.0, 480.0, 45.0, 7.5, 30.0).value
    factor = geoclimatic_factor_17(dn1, roughness)
    ours = occurrence_17(45e3, 7.5e9, 300.0, 480.0, geoclimatic_factor=factor)
    assert float(fade_percent(ours, 30.0)) == pytest.approx(float(theirs), rel=1e-9)


@needs_itur
def test_shallow_fading_of_itur_jumps_where_ours_joins():
    # Why the two differ for shallow fades: itur 0.4 puts A/800 into the exponent, 10^(-A/20 + A/800), and divides
    # q'a - 2 by 1 + 0.3·10^(-At/20)·10^(-0.016·At). §2.3.2 is an interpolation, and itur's misses the deep law at At.
    _, itu530 = itur_530()
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        place = (51.5, 1.0, 300.0, 480.0, 45.0, 7.5)
        p0 = float(itu530.multipath_loss_for_A(*place, 0.0).value)
        at = float(transition_fade(p0))
        theirs = [float(itu530.multipath_loss(*place, at + step).value) for step in (-1e-6, 1e-6)]
    ours = fade_percent(p0, [at - 1e-6, at + 1e-6])
    assert theirs[1] == pytest.approx(ours[1], rel=1e-9)
    assert ours[0] == pytest.approx(ours[1], rel=1e-5)
    assert abs(theirs[0] / theirs[1] - 1.0) > 0.05


def test_p0_in_full():
    # Worked by hand from P.530-17 §2.3.1: K = 10^(-4.4 + 0.81)·100^-0.46, d = 50, |ep| = 1 mrad, f = 10, hL = 100.
    k = 10**-3.59 / 100**0.46
    assert float(geoclimatic_factor_17(-300.0, 90.0)) == pytest.approx(k, rel=1e-12)
    p0 = k * 50**3.4 / 2**1.03 * 10**0.8 * 10**-0.076
    assert float(occurrence_17(50e3, 10e9, 150.0, 100.0, geoclimatic_factor=k)) == pytest.approx(p0, rel=1e-12)
    k = 10**-3.79
    p0 = k * 50**3.1 / 2**1.29 * 10**0.8 * 10**-0.089
    assert float(geoclimatic_factor_17_quick(-300.0)) == pytest.approx(k, rel=1e-12)
    assert float(occurrence_17_quick(50e3, 10e9, 150.0, 100.0, geoclimatic_factor=k)) == pytest.approx(p0, rel=1e-12)


def test_p0_of_p530_18_in_full():
    # Worked from P.530-18 §2.3.1 as this project knows it, not from the text: d = 40, f = 7, hA = 300, hB = 400,
    # ht = 200, dN75 = 20, K = 2e-6. It holds the code to the formula, not the formula to the world.
    hc = 350 - 40**2 / 102 - 200
    vsr = min(0.4**1.8 * np.exp(-hc / (2.5 * 40**0.5)), 20 * 40**1.5 * 7**0.5 / 24730)
    exponent = -0.376 * np.tanh((hc - 147) / 125) - 0.334 * 2.5**0.39 - 0.00027 * 300 + 17.85 * vsr
    p0 = 2e-6 * 40**3.51 * 62**0.447 * 10**exponent
    found = occurrence_18(40e3, 7e9, 300, 400, geoclimatic_factor=2e-6, dn75_n_km=20, mean_ground_m=200)
    assert float(found) == pytest.approx(p0, rel=1e-12)


def test_year_conversion_in_full():
    # Worked from P.530-17 §2.3.4: latitudes 20 and 60 (cos 40° = 0.76604, cos 120° = -0.5), 50 km, 4 mrad.
    rest = 10.5 - 2.7 * np.log10(50) + 1.7 * np.log10(5)
    assert float(year_conversion(50e3, 4.0, 20.0)) == pytest.approx(rest - 5.6 * np.log10(1.1 + 0.76604**0.7), abs=1e-5)
    assert float(year_conversion(50e3, 4.0, 60.0)) == pytest.approx(rest - 5.6 * np.log10(1.1 - 0.5**0.7), abs=1e-12)


@pytest.mark.parametrize("distance_m", [30e3, 50e3, 80e3])
def test_methods_of_different_origin_agree_where_they_should(distance_m):
    # Flat path in an average climate (dN1 -200 N/km, hL 100 m, c = 1). P.530 states a standard deviation of its error
    # of 5 to 6 dB (from memory), so two regressions on different data may differ by about as much.
    quick = occurrence_17_quick(distance_m, 6e9, 100, 100, geoclimatic_factor=geoclimatic_factor_17_quick(-200.0))
    detailed = occurrence_17(distance_m, 6e9, 100, 100, geoclimatic_factor=geoclimatic_factor_17(-200.0, 30.0))
    barnett = occurrence_vigants(distance_m, 6e9, 1.0)
    apart_db = 10 * np.log10([quick / detailed, quick / barnett, detailed / barnett])
    assert np.abs(apart_db).max() < 6.0


@given(distances_m, frequencies_hz, st.floats(0.1, 10.0))
def test_barnett_in_miles(distance_m, frequency_hz, factor):
    # Barnett (BSTJ 51(2), 1972): r = c·(f/4)·D^3·1e-5, f in GHz, D in miles; the metric 6.0e-7 has two printed digits.
    r = factor * frequency_hz / 4e9 * (distance_m / STATUTE_MILE_M) ** 3 * 1e-5
    assert float(occurrence_vigants(distance_m, frequency_hz, factor)) == pytest.approx(100 * r, rel=0.05 / 6.0)


@given(distances_m, frequencies_hz, st.floats(3.0, 20.0))
def test_vigants_in_feet(distance_m, frequency_hz, spacing_m):
    # Vigants (BSTJ 54(1), 1975): I = 7.0e-5·(f/D)·s^2·10^(A/10), feet and miles; the metric 1.2e-3 has two digits.
    spacing_ft = spacing_m / 0.3048
    improvement = 7.0e-5 * frequency_hz / 1e9 / (distance_m / STATUTE_MILE_M) * spacing_ft**2 * 10**3.5
    ours = float(improvement_vigants(distance_m, frequency_hz, spacing_m, 35.0))
    assert ours == pytest.approx(improvement, rel=0.05 / 1.2)


def test_vigants_climate_spans_what_is_printed():
    # Usual table beside Barnett: 4 (over water, Gulf coast), 1 (average), 1/4 (dry mountains); from memory.
    assert float(climate_factor("humid", 8.9)) == pytest.approx(4.0, rel=0.02)
    assert float(climate_factor("average", 15.24)) == 1.0
    assert float(climate_factor("dry", 26.0)) == pytest.approx(0.25, rel=0.02)
    assert (climate_factor("average", [0.0, 6.0, 43.0, 200.0]).round(3) == [3.291, 3.291, 0.262, 0.262]).all()


def test_vigants_season():
    # T0 = (t/50)·8e6 s with t in °F: 8e6 s at 50 °F and 12e6 s at 75 °F (297.04 K), also above.
    year_s = 365.25 * 86400
    temperatures_k = [283.15, 297.04, 310.0, 260.0]
    seasons_s = np.array([season_share(t) for t in temperatures_k]) * year_s
    assert seasons_s / 1e6 == pytest.approx([8.0, 12.0, 12.0, 5.6], abs=0.001)
    assert float(season_share()) * year_s == pytest.approx(8e6)


@given(st.floats(12e3, 120e3), st.floats(5.0, 500.0))
def test_path_roughness_of_a_sine(distance_m, amplitude_m):
    # Samples at one-mile steps of a sine with a period of 3 miles: a full set has the standard deviation amplitude/√2.
    along = np.arange(0.0, distance_m + 100.0, 100.0)
    miles = int((along[-1] - 1.0) / STATUTE_MILE_M)
    found = path_roughness(along, amplitude_m * np.sin(2 * np.pi * along / (3 * STATUTE_MILE_M)))
    if miles % 3 == 0:
        assert found == pytest.approx(amplitude_m / np.sqrt(2), rel=0.01)
    assert found <= amplitude_m


@given(occurrences)
def test_fading_joins_and_falls(p0):
    # §2.3.2 promises a monotonic curve below p0 = 2000 %; at 0 dB qa does not matter: 100·(1 - 1/e).
    at = float(transition_fade(p0))
    margin = np.linspace(0.0, 60.0, 601)
    curve = fade_percent(p0, margin)
    assert (np.diff(curve) < 0).all()
    assert curve[0] == pytest.approx(100 * (1 - np.exp(-1)))
    assert curve[-1] == pytest.approx(p0 * 1e-6)
    below, above = fade_percent(p0, [at * (1 - 1e-9), at])
    assert below == pytest.approx(above, rel=1e-6)
    assert above == pytest.approx(p0 * 10 ** (-at / 10))


def test_stated_limit_of_the_shallow_formula_is_true():
    # Outside p0 < 2000 % the printed formula is not monotonic (this is why the deep law takes over there).
    from profiler.availability.multipath import _shallow_percent

    def rises(p0):
        at = np.asarray(transition_fade(p0))
        return bool((np.diff(_shallow_percent(np.asarray(p0), at, np.linspace(0.0, at, 500))) > 0).any())

    assert not rises(1999.0)
    assert rises(3000.0)
    assert (np.diff(fade_percent(3000.0, np.linspace(0, 60, 500))) <= 0).all()
    assert float(fade_percent(3000.0, 0.0)) == 100.0


@given(occurrences, st.floats(1.01, 5.0), fades_db)
def test_more_multipath_is_more_outage(p0, times, fade_db):
    assert fade_percent(p0 * times, fade_db) >= fade_percent(p0, fade_db)


@given(distances_m, frequencies_hz, centres_m, centres_m, st.floats(1.05, 2.0))
def test_occurrence_grows_with_frequency_and_distance(distance_m, frequency_hz, a_m, b_m, times):
    for occurrence, more in (
        (occurrence_17, {"geoclimatic_factor": 1e-4}),
        (occurrence_17_quick, {"geoclimatic_factor": 1e-4}),
        (occurrence_18, {"geoclimatic_factor": 1e-6, "dn75_n_km": 0.0, "mean_ground_m": 0.0}),
    ):
        base = occurrence(distance_m, frequency_hz, a_m, b_m, **more)
        assert occurrence(distance_m, frequency_hz * times, a_m, b_m, **more) > base
        assert occurrence(distance_m, frequency_hz, b_m, a_m, **more) == base
        assert occurrence(distance_m * times, frequency_hz, a_m, b_m, **{**more, "geoclimatic_factor": 1e-4}) > base


@given(distances_m, frequencies_hz, st.floats(50.0, 500.0), st.floats(1.0, 200.0))
def test_p530_18_by_its_parts(distance_m, frequency_hz, centre_m, more_m):
    # What its terms say: less fading from an inclined path and with clearance; more with a gradient dN75.
    common = {"geoclimatic_factor": 1e-6, "mean_ground_m": 0.0}

    def p0(a, b, dn75=0.0):
        return occurrence_18(distance_m, frequency_hz, a, b, dn75_n_km=dn75, **common)

    assert p0(centre_m, centre_m + 2 * more_m) < p0(centre_m + more_m, centre_m + more_m)
    assert p0(centre_m + more_m, centre_m + more_m) < p0(centre_m, centre_m)
    assert p0(centre_m, centre_m, 30.0) >= p0(centre_m, centre_m)


def test_p530_18_takes_the_lesser_reflection():
    # With hc far below ground e^(-hc/...) is huge: the limit dN75·d^1.5·√f/24730 = 0.0715 holds, 17.85·0.0715 in log10.
    p0 = [
        occurrence_18(50e3, 25e9, 0, 0, geoclimatic_factor=1e-6, dn75_n_km=dn75, mean_ground_m=500.0)
        for dn75 in (0.0, 1.0)
    ]
    assert np.log10(p0[1] / p0[0]) == pytest.approx(17.85 * 50**1.5 * 5 / 24730, rel=1e-12)


@given(distances_m, st.floats(0.0, 37.0), st.floats(-90.0, 90.0))
def test_year_has_less_than_the_worst_month(distance_m, inclination_mrad, latitude):
    # ΔG is at most 10.8 dB: twelve months with all fading in one of them (10·log10 12); and never below 0 in range.
    conversion_db = float(year_conversion(distance_m, inclination_mrad, latitude))
    assert 0.0 < conversion_db <= 10.8 == round(10 * np.log10(12), 1)
    assert float(year_conversion(distance_m, inclination_mrad, -latitude)) == conversion_db


def test_year_conversion_meets_at_45_degrees():
    north, south = year_conversion(50e3, 0.0, [45.0, 45.0 + 1e-12])
    assert north == pytest.approx(south, abs=1e-6)
    assert year_conversion(50e3, 0.0, 60.0) > north > year_conversion(50e3, 0.0, 20.0)


@pytest.mark.parametrize(
    ("call", "message"),
    [
        (lambda: geoclimatic_factor_17(np.nan, 10.0), "dn1_n_km = nan: must be -5000 to 5000"),
        (lambda: geoclimatic_factor_17(-300.0, -1.0), "terrain_roughness_m = -1: must be finite and 0 m or more"),
        (lambda: fade_percent(0.0, 10.0), "occurrence_percent = 0: must be finite and more than 0 %"),
        (lambda: fade_percent(10.0, -1.0), "fade_db = -1: must be finite and 0 dB or more"),
        (lambda: climate_factor("wet", 10.0), "climate = wet: must be humid, average, dry"),
        (lambda: path_roughness([0.0, 4.8e3], [0.0, 0.0]), "distance_m = 4800: must be more than 4828 m"),
        (lambda: path_roughness([0.0, 9e3], [0.0, np.nan]), "ground_m = NaN: must be a height at every point"),
    ],
)
def test_what_is_refused(call, message):
    with pytest.raises(InputError, match=message):
        call()
