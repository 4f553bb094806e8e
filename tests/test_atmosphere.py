"""Gases, rain and the reference atmosphere against published values and a second implementation."""

import csv
import warnings
from importlib.util import find_spec

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from profiler.atmosphere import (
    dry_pressure,
    gas_along_ray,
    gas_attenuation,
    gas_warnings,
    local_atmosphere,
    rain_attenuation,
    rain_coefficients,
    reference_atmosphere,
)
from profiler.atmosphere.air import vapour_pressure
from profiler.atmosphere.gases import gas_attenuation_parts
from profiler.errors import InputError

needs_itur = pytest.mark.skipif(find_spec("itur") is None, reason="the second opinion needs the itur package")

frequencies_hz = st.floats(1e9, 1e12)
pressures_hpa = st.floats(300.0, 1080.0)
temperatures_k = st.floats(230.0, 320.0)
densities_g_m3 = st.floats(0.0, 35.0)
rains_mm_h = st.floats(0.1, 200.0)
elevations_deg = st.floats(-90.0, 90.0)
tilts_deg = st.floats(0.0, 180.0)


def printed(text):
    """Read a printed value: the number and half a unit of its last digit."""
    return float(text), 0.5 * 10.0 ** -len(text.partition(".")[2])


def columns(path):
    with path.open() as file:
        rows = list(csv.DictReader(file))
    return {name: np.array([float(row[name]) for row in rows]) for name in rows[0]}


def assert_printed(value, text, half_units=1):
    expected, half_unit = printed(text)
    assert abs(float(value) - expected) <= half_units * half_unit, f"{float(value)} is not {text} as printed"


# --- Gases ---


@pytest.mark.parametrize(
    ("frequency_ghz", "dry_db_km", "vapour_db_km"),
    [
        # ITU-R Study Group 3 validation examples (CG-3M3J-13-ValEx), Rec. ITU-R P.676-13 Annex 1, at 1013.25 hPa,
        # 288.15 K, 7.5 g/m³. Printed to 15 digits; 1e-12 leaves room for the order of a sum of 44 terms.
        (1, 0.00538865816790655, 5.09046173249644e-05),
        (7, 0.00768290516490283, 0.00266809649272083),
        (23, 0.0138472778555002, 0.180441698099627),
        (59, 13.6352956340441, 0.149984058069274),
        (81, 0.0663780533246123, 0.276788450815178),
        (119, 1.30637904078462, 0.617993479946656),
        (183, 0.0127339088358709, 27.6650083141665),
        (349, 0.0363536940897413, 9.93212190524728),
    ],
)
def test_gas_typed_rows(frequency_ghz, dry_db_km, vapour_db_km):
    air = gas_attenuation_parts(frequency_ghz * 1e9, 1013.25, 288.15, 7.5)
    np.testing.assert_allclose(air.oxygen_db_km, dry_db_km, rtol=1e-12)
    np.testing.assert_allclose(air.vapour_db_km, vapour_db_km, rtol=1e-12)


def test_gas_all_published_rows(reference):
    # The same source, every second row of it (1 to 349 GHz).
    rows = columns(reference / "p676_specific_attenuation.csv")
    state = rows["pressure_hpa"], rows["temperature_k"], rows["water_vapour_g_m3"]
    air = gas_attenuation_parts(rows["frequency_ghz"] * 1e9, *state)
    np.testing.assert_allclose(air.oxygen_db_km, rows["dry_air_db_km"], rtol=1e-12)
    np.testing.assert_allclose(air.vapour_db_km, rows["water_vapour_db_km"], rtol=1e-12)
    total = gas_attenuation(rows["frequency_ghz"] * 1e9, *state)
    np.testing.assert_allclose(total, rows["total_db_km"], rtol=1e-12)


@needs_itur
def test_gas_second_opinion_over_all_states():
    # itur (MIT), P.676-12: same Annex 1 formula. The published rows have one state of the air and end at 349 GHz.
    with warnings.catch_warnings(), np.errstate():
        warnings.simplefilter("ignore")
        from itur.models import itu676
    random = np.random.default_rng(1)
    f, p, t, v = (random.uniform(*span, 100) for span in ((1, 1000), (300, 1080), (230, 320), (0, 35)))
    air = gas_attenuation_parts(f * 1e9, p, t, v)
    np.testing.assert_allclose(air.oxygen_db_km, itu676.gamma0_exact(f, p, v, t).value, rtol=1e-12)
    np.testing.assert_allclose(air.vapour_db_km, itu676.gammaw_exact(f, p, v, t).value, rtol=1e-12)


def test_gas_peaks_where_the_molecules_absorb():
    # Laboratory frequencies: oxygen's complex near 60 GHz and its line at 118.75, water's at 22.235 and 183.31 GHz.
    f = np.arange(1.0, 340.0, 0.05)
    air = gas_attenuation_parts(f * 1e9, 1013.25, 288.15, 7.5)
    assert 57 < f[np.argmax(air.oxygen_db_km)] < 63
    above = f > 100
    assert f[above][np.argmax(air.oxygen_db_km[above])] == pytest.approx(118.75, abs=0.1)
    for low, high, line in ((15, 30, 22.235), (150, 250, 183.31)):
        part = (f > low) & (f < high)
        assert f[part][np.argmax(air.vapour_db_km[part])] == pytest.approx(line, abs=0.5)


@given(frequencies_hz, pressures_hpa, temperatures_k, densities_g_m3, st.floats(0.1, 10.0))
def test_more_vapour_takes_more(frequency_hz, pressure_hpa, temperature_k, vapour_g_m3, extra_g_m3):
    less, more = (
        gas_attenuation_parts(frequency_hz, pressure_hpa, temperature_k, v).vapour_db_km
        for v in (vapour_g_m3, vapour_g_m3 + extra_g_m3)
    )
    assert 0 <= less < more


@given(frequencies_hz, pressures_hpa, temperatures_k, densities_g_m3)
def test_gas_scalar_equals_array(frequency_hz, pressure_hpa, temperature_k, vapour_g_m3):
    one = gas_attenuation(frequency_hz, pressure_hpa, temperature_k, vapour_g_m3)
    many = gas_attenuation([[frequency_hz], [5e9]], pressure_hpa, [temperature_k, 280.0, 300.0], vapour_g_m3)
    assert one.shape == ()
    assert many.shape == (2, 3)
    np.testing.assert_allclose(many[0, 0], one, rtol=1e-13)


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ((0.0, 1013.25, 288.15, 7.5), "frequency_hz = 0: must be finite and more than 0 Hz"),
        ((6e9, -1.0, 288.15, 7.5), "pressure_hpa = -1: must be finite and more than 0 hPa"),
        ((6e9, 1013.25, 0.0, 7.5), "temperature_k = 0: must be finite and more than 0 K"),
        ((6e9, 1013.25, 288.15, -0.5), "vapour_g_m3 = -0.5: must be finite and 0 g/m³ or more"),
        (([6e9, np.nan], 1013.25, 288.15, 7.5), "frequency_hz = nan: must be"),
        ((6e9, np.inf, 288.15, 7.5), "pressure_hpa = inf: must be"),
    ],
)
def test_gas_refuses(arguments, message):
    with pytest.raises(InputError, match=message):
        gas_attenuation(*arguments)


# --- Rain ---


@pytest.mark.parametrize(
    ("frequency_ghz", "k_h", "alpha_h", "k_v", "alpha_v"),
    [
        # Rec. ITU-R P.838-3, Table 5 (from memory of the table).
        (1, "0.0000259", "0.9691", "0.0000308", "0.8592"),
        (4, "0.0001071", "1.6009", "0.0002461", "1.2476"),
        (6, "0.0007056", "1.5900", "0.0004878", "1.5728"),
        (10, "0.01217", "1.2571", "0.01129", "1.2156"),
        (15, "0.04481", "1.1233", "0.05008", "1.0440"),
        (20, "0.09164", "1.0568", "0.09611", "0.9847"),
        (40, "0.4431", "0.8673", "0.4274", "0.8421"),
        (80, "1.1704", "0.7115", "1.1668", "0.7021"),
        (100, "1.3671", "0.6815", "1.3680", "0.6765"),
    ],
)
def test_rain_published_table(frequency_ghz, k_h, alpha_h, k_v, alpha_v):
    # One unit, not half: the curves' own coefficients are rounded too (at 4 GHz the sixth decimal of the two steep
    # bells of alpha V, 48·0.07·2·1.63/0.116·5e-7, is worth 5e-5), and there 1.24755 meets a printed 1.2476.
    k, alpha = rain_coefficients(frequency_ghz * 1e9, tilt_deg=[0, 90])
    for value, text in zip((k[0], alpha[0], k[1], alpha[1]), (k_h, alpha_h, k_v, alpha_v), strict=True):
        assert_printed(value, text, half_units=2)


@pytest.mark.parametrize(
    ("elevation_deg", "frequency_ghz", "rain_mm_h", "tilt_deg", "k", "alpha", "attenuation_db_km"),
    [
        # ITU-R Study Group 3 validation examples (CG-3M3J-13-ValEx), Rec. ITU-R P.838-3.
        (31.07699124, 14.25, 26.48052, 0, "0.03975488", "1.12418043", "1.58130839"),
        (40.232036, 29, 33.936232, 0, "0.22031404", "0.9504446", "6.27846024"),
        (48.24117054, 14.25, 63.62668149, 90, "0.04226474", "1.07871664", "3.72901264"),
        (85.80459566, 29, 99.13558978, 90, "0.21737148", "0.93950825", "16.3183686"),
    ],
)
def test_rain_typed_rows(elevation_deg, frequency_ghz, rain_mm_h, tilt_deg, k, alpha, attenuation_db_km):
    path = elevation_deg, tilt_deg
    for value, text in zip(rain_coefficients(frequency_ghz * 1e9, *path), (k, alpha), strict=True):
        assert_printed(value, text)
    assert_printed(rain_attenuation(frequency_ghz * 1e9, rain_mm_h, *path), attenuation_db_km)


def test_rain_all_published_rows(reference):
    # The same source, every second row; 8 decimals are printed.
    rows = columns(reference / "p838_specific_attenuation.csv")
    path = rows["path_elevation_deg"], rows["polarization_tilt_deg"]
    k, alpha = rain_coefficients(rows["frequency_ghz"] * 1e9, *path)
    loss = rain_attenuation(rows["frequency_ghz"] * 1e9, rows["rain_rate_mm_h"], *path)
    for ours, name in ((k, "k"), (alpha, "alpha"), (loss, "specific_attenuation_db_km")):
        np.testing.assert_allclose(ours, rows[name], rtol=0, atol=0.5e-8)


@needs_itur
def test_rain_second_opinion():
    with warnings.catch_warnings(), np.errstate():
        warnings.simplefilter("ignore")
        from itur.models import itu838
    random = np.random.default_rng(2)
    for f, elevation, tilt in random.uniform((1, -90, 0), (1000, 90, 180), (60, 3)):
        theirs = itu838.rain_specific_attenuation_coefficients(f, elevation, tilt)
        ours = rain_coefficients(f * 1e9, elevation, tilt)
        np.testing.assert_allclose(ours, [float(value) for value in theirs], rtol=1e-12)


@given(st.floats(6e9, 4e10), st.floats(10.0, 200.0))
def test_flat_drops_take_more_of_the_horizontal(frequency_hz, rain_mm_h):
    # Falling drops are oblate: horizontal polarization loses more, circular lies between (Oguchi; P.838-3 itself).
    horizontal, circular, vertical = rain_attenuation(frequency_hz, rain_mm_h, tilt_deg=[0, 45, 90])
    assert horizontal > circular > vertical


@given(frequencies_hz, rains_mm_h, elevations_deg, tilts_deg)
def test_rain_symmetries(frequency_hz, rain_mm_h, elevation_deg, tilt_deg):
    here = rain_attenuation(frequency_hz, rain_mm_h, elevation_deg, tilt_deg)
    same = [
        rain_attenuation(frequency_hz, rain_mm_h, -elevation_deg, tilt_deg),
        rain_attenuation(frequency_hz, rain_mm_h, elevation_deg, -tilt_deg),
        rain_attenuation(frequency_hz, rain_mm_h, elevation_deg, 180 - tilt_deg),
    ]
    np.testing.assert_allclose(same, here, rtol=1e-12)
    assert rain_attenuation(frequency_hz, 1.1 * rain_mm_h, elevation_deg, tilt_deg) > here > 0


@given(frequencies_hz, tilts_deg)
def test_tilt_means_nothing_straight_up(frequency_hz, tilt_deg):
    up = rain_coefficients(frequency_hz, 90.0, tilt_deg)
    circular = rain_coefficients(frequency_hz, 17.0, 45.0)
    np.testing.assert_allclose(up, circular, rtol=1e-12)


def test_rain_is_held_below_one_gigahertz():
    # The published fit turns upwards again below its range; the value at 1 GHz is an upper bound there.
    assert rain_attenuation(0.1e9, 50.0) == rain_attenuation(1e9, 50.0)


def test_no_rain_no_loss():
    assert rain_attenuation([2e9, 80e9], 0.0).tolist() == [0.0, 0.0]


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        ((-1.0, 10.0), "frequency_hz = -1: must be finite and more than 0 Hz"),
        ((18e9, -10.0), "rain_mm_h = -10: must be finite and 0 mm/h or more"),
        ((18e9, 10.0, 91.0), "elevation_deg = 91: must be -90 to 90 degrees"),
        ((18e9, 10.0, 0.0, 270.0), "tilt_deg = 270: must be -180 to 180 degrees; 0 horizontal, 90 vertical"),
    ],
)
def test_rain_refuses(arguments, message):
    with pytest.raises(InputError, match=message):
        rain_attenuation(*arguments)


# --- The air ---


@pytest.mark.parametrize(
    ("height_m", "pressure_hpa", "temperature_k"),
    [
        # U.S. Standard Atmosphere 1976 (NOAA, NASA, USAF), Table I, geometric height (from memory of the table).
        (0, "1013.25", "288.150"),
        (1000, "898.76", "281.651"),
        (2000, "795.01", "275.154"),
        (3000, "701.21", "268.659"),
        (5000, "540.48", "255.676"),
    ],
)
def test_mean_atmosphere_is_the_standard_one(height_m, pressure_hpa, temperature_k):
    air = reference_atmosphere(height_m)
    assert_printed(air.total_pressure_hpa, pressure_hpa)
    assert_printed(air.temperature_k, temperature_k)


def test_mean_vapour_is_the_published_one():
    # Rec. ITU-R P.835-6 Annex 1: 7.5 g/m³ at the ground, scale height 2 km.
    np.testing.assert_allclose(reference_atmosphere([0.0, 2000.0]).vapour_g_m3, [7.5, 7.5 / np.e], rtol=1e-15)


@needs_itur
@pytest.mark.parametrize("height_km", [0.0, 0.5, 3.0, 8.0])
def test_mean_atmosphere_second_opinion(height_km):
    with warnings.catch_warnings(), np.errstate():
        warnings.simplefilter("ignore")
        from itur.models import itu835
    air = reference_atmosphere(1e3 * height_km)
    ours = air.total_pressure_hpa, air.temperature_k, air.vapour_g_m3
    theirs = (itu835.standard_pressure, itu835.standard_temperature, itu835.standard_water_vapour_density)
    np.testing.assert_allclose(ours, [f(height_km).value for f in theirs], rtol=1e-12)


def test_air_has_the_shape_of_the_heights_and_is_read_only():
    air = reference_atmosphere([[0.0], [1000.0]])
    assert air.temperature_k.shape == air.pressure_hpa.shape == air.vapour_g_m3.shape == (2, 1)
    assert not air.pressure_hpa.flags.writeable


@given(pressures_hpa, temperatures_k, densities_g_m3)
def test_dry_and_vapour_make_the_total(total_hpa, temperature_k, vapour_g_m3):
    dry = dry_pressure(total_hpa, temperature_k, vapour_g_m3)
    assert dry + vapour_pressure(temperature_k, vapour_g_m3) == pytest.approx(total_hpa, rel=1e-14)
    assert dry <= total_hpa


def test_vapour_pressure_obeys_the_gas_law():
    # e = ρ·R·T/M with R = 8.314 462 618 J/(mol·K) (SI) and M(H2O) = 18.015 g/mol (IUPAC); 216.7 has four digits.
    e_hpa = 7.5 * 8.314462618 * 288.15 / 18.015 / 100
    assert float(vapour_pressure(288.15, 7.5)) == pytest.approx(e_hpa, rel=0.05 / 216.7)


def test_measured_values_stand_and_the_rest_is_reference():
    mean = reference_atmosphere(500.0)
    air = local_atmosphere(500.0, total_pressure_hpa=960.0, vapour_g_m3=12.0)
    assert air.total_pressure_hpa == pytest.approx(960.0, rel=1e-14)
    assert air.vapour_g_m3 == 12.0
    assert air.temperature_k == mean.temperature_k


def test_all_measured_needs_no_reference_height():
    air = local_atmosphere(20_000.0, total_pressure_hpa=55.0, temperature_k=217.0, vapour_g_m3=0.0)
    assert float(air.pressure_hpa) == 55.0


@pytest.mark.parametrize(
    ("height_m", "message"),
    [
        (9000.0, "height_m = 9000: must be -500 to 8500 m above sea level"),
        (-501.0, "height_m = -501: must be -500 to 8500 m"),
    ],
)
def test_reference_refuses(height_m, message):
    with pytest.raises(InputError, match=message):
        reference_atmosphere(height_m)


def test_vapour_alone_cannot_be_the_pressure():
    with pytest.raises(
        InputError, match="total_pressure_hpa = 5: must be more than the pressure of its vapour_g_m3 alone"
    ):
        dry_pressure([1013.25, 5.0], 288.15, 7.5)


# --- Along the ray ---


STEEP = np.array([0, 3e3, 9e3, 20e3]), np.array([150.0, 20.0, 700.0, 2600.0])


def by_parts(frequency_hz, centre_a_m, centre_b_m, k, parts=4000, **given):
    """Cut the ray into short parts, each in the air at its middle: P.676 by P.835, as the definition has it."""
    share = (np.arange(parts) + 0.5) / parts
    length_m = STEEP[0][-1]
    bulge = length_m**2 * share * (1 - share) / (2 * k * 6_371_000)
    air = reference_atmosphere(centre_a_m + (centre_b_m - centre_a_m) * share - bulge)
    per_km = gas_attenuation(frequency_hz, air.pressure_hpa, air.temperature_k, air.vapour_g_m3)
    return float(per_km.mean() * length_m / 1e3)


@pytest.mark.parametrize("frequency_hz", [7e9, 22.235e9, 60e9, 118.75e9, 183.31e9])
@pytest.mark.parametrize("ends", [(200.0, 2700.0), (2800.0, 2700.0)])
def test_gases_are_summed_at_the_height_of_the_ray(frequency_hz, ends):
    found = gas_along_ray(frequency_hz, *STEEP, *ends, 4 / 3)
    assert found.loss_db == pytest.approx(by_parts(frequency_hz, *ends, 4 / 3), rel=1e-6)
    turned = gas_along_ray(frequency_hz, STEEP[0][-1] - STEEP[0][::-1], STEEP[1][::-1], *ends[::-1], 4 / 3)
    assert turned.loss_db == pytest.approx(found.loss_db, rel=1e-12)
    assert found.lowest_m < found.mean_m < found.highest_m


def test_gases_of_the_ray_are_not_those_of_the_mean_ground():
    """From rim to rim over a canyon at 60 GHz: at the ground's height between them it would be 18 dB more."""
    canyon = np.array([0, 500.0, 10e3, 19.5e3, 20e3]), np.array([2390.0, 1000, 900, 1000, 2290])
    rim, ground = (
        20 * float(gas_attenuation(60e9, air.pressure_hpa, air.temperature_k, air.vapour_g_m3))
        for air in (reference_atmosphere(2350.0 - 2 / 3 * 5.9), reference_atmosphere(1000.0))
    )
    assert gas_along_ray(60e9, *canyon, 2400.0, 2300.0, 4 / 3).loss_db == pytest.approx(rim, rel=1e-4)
    assert ground - rim > 17


def test_the_bulge_lowers_the_ray_and_the_ground_holds_it_up():
    flat = np.array([0, 40e3, 80e3]), np.array([0.0, 0, 0])
    straight, bent = (gas_along_ray(22e9, *flat, 300.0, 300.0, k) for k in (np.inf, 4 / 3))
    assert bent.loss_db > 1.005 * straight.loss_db
    # d²/(8·k·R) = 80²/(8 · 8495) km: 94.2 m of bulge in the middle, of which two thirds on the mean (a parabola)
    assert straight.mean_m - bent.mean_m == pytest.approx(2 / 3 * 94.2, abs=0.1)
    over = gas_along_ray(22e9, flat[0], np.array([0.0, 3000, 0]), 300.0, 300.0, 4 / 3)
    assert over.loss_db < straight.loss_db
    assert over.highest_m > 2500


def test_measured_air_holds_at_the_mean_height_and_changes_with_height():
    ends = 200.0, 2700.0
    mean_m = gas_along_ray(60e9, *STEEP, *ends, 4 / 3).mean_m
    mean = reference_atmosphere(mean_m)
    same = {
        "total_pressure_hpa": float(mean.total_pressure_hpa),
        "temperature_k": float(mean.temperature_k),
        "vapour_g_m3": float(mean.vapour_g_m3),
    }
    assert gas_along_ray(60e9, *STEEP, *ends, 4 / 3, **same).loss_db == pytest.approx(
        gas_along_ray(60e9, *STEEP, *ends, 4 / 3).loss_db, rel=1e-12
    )
    wet = gas_along_ray(22e9, *STEEP, *ends, 4 / 3, vapour_g_m3=2 * same["vapour_g_m3"])
    assert wet.atmosphere.vapour_g_m3 == pytest.approx(2 * mean.vapour_g_m3)
    assert wet.loss_db > 1.8 * gas_along_ray(22e9, *STEEP, *ends, 4 / 3).loss_db


@needs_itur
def test_gases_along_the_ray_second_opinion():
    with warnings.catch_warnings(), np.errstate():
        warnings.simplefilter("ignore")
        from itur.models import itu676, itu835
    ends = (200.0, 2700.0)
    share = (np.arange(60) + 0.5) / 60
    height_km = (ends[0] + (ends[1] - ends[0]) * share - 20e3**2 * share * (1 - share) / (2 * 6_371_000 * 4 / 3)) / 1e3
    total = np.array([itu835.standard_pressure(each).value for each in height_km])
    kelvin = np.array([itu835.standard_temperature(each).value for each in height_km])
    vapour = np.array([itu835.standard_water_vapour_density(each).value for each in height_km])
    dry = total - vapour * kelvin / 216.7
    rows = zip(dry, vapour, kelvin, strict=True)
    per_km = [
        itu676.gamma0_exact(60.0, p, rho, t).value + itu676.gammaw_exact(60.0, p, rho, t).value for p, rho, t in rows
    ]
    theirs = 20 * float(np.mean(per_km))
    assert gas_along_ray(60e9, *STEEP, *ends, 4 / 3).loss_db == pytest.approx(theirs, rel=1e-4)


# --- Ranges ---


@pytest.mark.parametrize("frequency_hz", [1e9, 1e12])
def test_no_warning_inside_the_ranges(frequency_hz):
    assert gas_warnings(frequency_hz, 0.0) == ()


@pytest.mark.parametrize(("frequency_hz", "value"), [(0.9e9, "0.9 GHz"), (1.1e12, "1100 GHz")])
def test_a_frequency_outside_is_named(frequency_hz, value):
    (gas,) = gas_warnings(frequency_hz)
    assert gas.startswith(f"gas attenuation at {value}: outside the 1 to 1000 GHz of Rec. ITU-R P.676-13")


def test_warning_below_sea_level():
    (line,) = gas_warnings(18e9, -400.0)
    assert line.startswith("reference atmosphere at -400 m: below the 0 m of Rec. ITU-R P.835-6")
