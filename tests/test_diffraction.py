"""Diffraction against published values, a literal transcription of the published steps, and its own laws."""

import csv
import math
import tracemalloc
from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from profiler.diffraction import (
    bullington,
    cascaded_knife_edges,
    delta_bullington,
    double_edge,
    knife_edge_loss,
    rounded_obstacle,
    single_knife_edge,
    spherical_earth,
)
from profiler.diffraction.formulas import fresnel_parameter
from profiler.errors import InputError, MissingGroundError
from profiler.units import SPEED_OF_LIGHT_M_S

BATCHED = (bullington, single_knife_edge, rounded_obstacle, double_edge, cascaded_knife_edges)
RIDGE = ([0.0, 5e3, 10e3], [100.0, 180.0, 100.0], 130.0, 130.0, 6e9, 8500e3)


# Published values ---------------------------------------------------------------------------------------------------


def test_knife_edge_at_grazing_is_half_the_field():
    # Rec. ITU-R P.526-15 §4.1: the exact integral gives 20·log10(2) = 6.02 dB; its approximation prints 6.9 dB − 0.87
    assert float(knife_edge_loss(0.0)) == pytest.approx(6.02, abs=0.02)


# ν, C(ν), S(ν): Abramowitz and Stegun, Handbook of Mathematical Functions (1964), Table 7.7, from memory
FRESNEL_INTEGRALS = [
    ("0.5", "0.4923442", "0.0647324"),
    ("1.0", "0.7798934", "0.4382591"),
    ("2.0", "0.4882534", "0.3434157"),
]


@pytest.mark.parametrize(("nu", "c", "s"), FRESNEL_INTEGRALS)
def test_knife_edge_follows_the_tabulated_fresnel_integrals(nu, c, s):
    # Rec. ITU-R P.526-15 §4.1 gives J(ν) exactly by C and S, and the approximation that is used here
    c, s = float(c), float(s)
    exact = -20 * math.log10(math.hypot(1 - c - s, c - s) / 2)
    assert float(knife_edge_loss(float(nu))) == pytest.approx(exact, abs=0.1)


def test_knife_edge_stays_near_the_fresnel_integrals_everywhere():
    from scipy.special import fresnel

    nu = np.linspace(-0.7, 12, 400)
    s, c = fresnel(nu)
    exact = -20 * np.log10(np.hypot(1 - c - s, c - s) / 2)
    assert np.abs(knife_edge_loss(nu) - exact).max() < 0.35


def rows(folder: Path) -> list[dict[str, str]]:
    with (folder / "p526_delta_bullington.csv").open() as file:
        return list(csv.DictReader(file))


def published(folder: Path, row: dict[str, str], polarization: str, scale: float):
    km, height = np.loadtxt(folder / f"{row['profile']}.csv", delimiter=",", skiprows=1).T
    return delta_bullington(
        km * 1000,
        height,
        height[0] + float(row["antenna_a_m_agl"]),
        height[-1] + float(row["antenna_b_m_agl"]),
        float(row["frequency_ghz"]) * 1e9 * scale,
        float(row["effective_earth_radius_km"]) * 1000,
        polarization,
    )


PARTS = {
    "bullington_actual_db": "bullington_db",
    "bullington_smooth_db": "smooth_bullington_db",
    "spherical_earth_db": "spherical_db",
    "delta_bullington_db": "total_db",
}


@pytest.mark.parametrize("polarization", ["vertical", "horizontal"])
def test_delta_bullington_reproduces_the_published_validation_examples(reference, polarization):
    # ITU-R Study Group 3 validation examples for the delta-Bullington method of Rec. ITU-R P.526, paths 1 and 3
    for row in rows(reference):
        result = published(reference, row, polarization, 1.0)
        for column, part in PARTS.items():
            assert float(getattr(result, part)) == pytest.approx(float(row[column]), abs=0.01), (row, part)


def test_the_published_examples_take_light_at_300_000_km_s(reference):
    # with the wavelength of the examples, every part agrees to their rounding of constants
    for row in rows(reference):
        result = published(reference, row, "horizontal", SPEED_OF_LIGHT_M_S / 3e8)
        for column, part in PARTS.items():
            assert float(getattr(result, part)) == pytest.approx(float(row[column]), abs=2e-4), (row, part)


def test_obstruction_by_one_fresnel_radius_brackets_the_quick_figure():
    # Rec. ITU-R P.530 §2.2.1: A = −20·h/F1 + 10 dB over average terrain, between the knife edge and the smooth earth
    loss_530 = 30.0
    f1 = math.sqrt(0.05 * 20e3 * 20e3 / 40e3)
    knife = float(knife_edge_loss(fresnel_parameter(f1, 20e3, 20e3, SPEED_OF_LIGHT_M_S / 0.05)))
    radius = 8500e3
    antenna = (20e3**2 / (2 * radius)) - f1
    smooth = float(spherical_earth(40e3, antenna, antenna, SPEED_OF_LIGHT_M_S / 0.05, radius))
    assert knife < loss_530 < smooth


# A literal transcription ---------------------------------------------------------------------------------------------


def literal_bullington(d, h, hts, hrs, lam, ae):
    """Rec. ITU-R P.526-15 §4.5.1 step by step, km and m, one profile."""
    ce, whole = 1 / ae, d[-1]
    inner = range(1, len(d) - 1)
    stim = max((h[i] + 500 * ce * d[i] * (whole - d[i]) - hts) / d[i] for i in inner)
    str_ = (hrs - hts) / whole
    if stim < str_:
        nu = max(
            (h[i] + 500 * ce * d[i] * (whole - d[i]) - (hts * (whole - d[i]) + hrs * d[i]) / whole)
            * math.sqrt(0.002 * whole / (lam * d[i] * (whole - d[i])))
            for i in inner
        )
    else:
        srim = max((h[i] + 500 * ce * d[i] * (whole - d[i]) - hrs) / (whole - d[i]) for i in inner)
        dbp = (hrs - hts + srim * whole) / (stim + srim)
        nu = (hts + stim * dbp - (hts * (whole - dbp) + hrs * dbp) / whole) * math.sqrt(
            0.002 * whole / (lam * dbp * (whole - dbp))
        )
    luc = 6.9 + 20 * math.log10(math.sqrt((nu - 0.1) ** 2 + 1) + nu - 0.1) if nu > -0.78 else 0.0
    return luc + (1 - math.exp(-luc / 6)) * (10 + 0.02 * whole)


def literal_smooth_heights(d, h, hts, hrs):
    """Rec. ITU-R P.526-15 §4.5.2: antenna heights over the smooth surface."""
    whole, n = d[-1], len(d)
    v1 = sum((d[i] - d[i - 1]) * (h[i] + h[i - 1]) for i in range(1, n))
    v2 = sum((d[i] - d[i - 1]) * (h[i] * (2 * d[i] + d[i - 1]) + h[i - 1] * (d[i] + 2 * d[i - 1])) for i in range(1, n))
    hst, hsr = (2 * v1 * whole - v2) / whole**2, (v2 - v1 * whole) / whole**2
    over = [h[i] - (hts * (whole - d[i]) + hrs * d[i]) / whole for i in range(1, n - 1)]
    hobs = max(over)
    if hobs > 0:
        at = max(o / d[i + 1] for i, o in enumerate(over))
        ar = max(o / (whole - d[i + 1]) for i, o in enumerate(over))
        hst, hsr = hst - hobs * at / (at + ar), hsr - hobs * ar / (at + ar)
    return hts - min(hst, h[0]), hrs - min(hsr, h[-1])


def everywhere(whole):
    """Points of a path so dense, the more the nearer to its ends, that the maxima over smooth ground are met."""
    return whole / (1 + np.exp(-np.linspace(-14, 14, 4001)))


def wild_hop(rng, points):
    """Return a random profile with uneven spacing, antennas over it, GHz and an effective radius in km."""
    d = np.concatenate([[0], np.cumsum(rng.uniform(0.02, 1.0, points - 1))])
    h = np.maximum(np.cumsum(rng.normal(0, rng.uniform(0, 25), points)) + 300, 0)
    a, b = h[0] + rng.uniform(0, 120), h[-1] + rng.uniform(0, 120)
    return d, h, a, b, 10 ** rng.uniform(-1, 1.6), rng.uniform(3000, 20000)


@pytest.mark.parametrize("seed", range(40))
def test_delta_bullington_is_the_published_construction_step_by_step(seed):
    d, h, a, b, ghz, ae = wild_hop(np.random.default_rng(seed), points=3 + 4 * seed)
    result = delta_bullington(d * 1000, h, a, b, ghz * 1e9, ae * 1000)
    lam = SPEED_OF_LIGHT_M_S / (ghz * 1e9)
    over_a, over_b = literal_smooth_heights(d, h, a, b)
    dense = np.concatenate([[0], everywhere(d[-1]), d[-1:]])
    smooth = literal_bullington(dense, np.zeros_like(dense), over_a, over_b, lam, ae)  # smooth ground is no points
    assert float(result.bullington_db) == pytest.approx(literal_bullington(d, h, a, b, lam, ae), abs=1e-9)
    assert float(result.effective_a_m) == pytest.approx(over_a, abs=1e-9)
    assert float(result.effective_b_m) == pytest.approx(over_b, abs=1e-9)
    assert float(result.smooth_bullington_db) == pytest.approx(smooth, abs=1e-4)
    sphere = float(spherical_earth(d[-1] * 1000, over_a, over_b, ghz * 1e9, ae * 1000))
    assert float(result.spherical_db) == pytest.approx(sphere, abs=1e-6)
    assert float(result.total_db) == pytest.approx(float(result.bullington_db) + max(sphere - smooth, 0), abs=1e-4)


# Laws ----------------------------------------------------------------------------------------------------------------

heights = st.lists(st.floats(0, 600), min_size=3, max_size=40)
masts = st.floats(0.5, 150)
frequencies = st.floats(0.1e9, 40e9)
ks = st.sampled_from([0.4, 2 / 3, 1.0, 4 / 3, 3.0, math.inf])


@st.composite
def hops(draw):
    """One hop: distances, heights, both centres, frequency, effective radius."""
    h = np.array(draw(heights))
    steps = draw(st.lists(st.floats(30, 2000), min_size=len(h) - 1, max_size=len(h) - 1))
    d = np.concatenate([[0.0], np.cumsum(steps)])
    return d, h, h[0] + draw(masts), h[-1] + draw(masts), draw(frequencies), draw(ks) * 6371e3


def reverse(hop):
    d, h, a, b, frequency, radius = hop
    return (d[-1] - d)[::-1], h[::-1], b, a, frequency, radius


@pytest.mark.parametrize("method", BATCHED)
@given(hop=hops())
def test_the_loss_is_the_same_from_b_to_a(method, hop):
    forth, back = method(*hop), method(*reverse(hop))
    assert float(forth.loss_db) == pytest.approx(float(back.loss_db), abs=1e-6)


@given(hop=hops())
def test_delta_bullington_is_the_same_from_b_to_a(hop):
    forth, back = delta_bullington(*hop), delta_bullington(*reverse(hop))
    assert float(forth.total_db) == pytest.approx(float(back.total_db), abs=1e-6)
    assert float(forth.effective_a_m) == pytest.approx(float(back.effective_b_m), abs=1e-6)


@pytest.mark.parametrize("method", [bullington, single_knife_edge])
@given(hop=hops(), lift=st.floats(0, 100))
def test_a_higher_antenna_never_costs_more(method, hop, lift):
    d, h, a, *rest = hop
    assert method(d, h, a + lift, *rest).loss_db <= method(*hop).loss_db + 1e-9


@pytest.mark.parametrize("method", [bullington, single_knife_edge])
@given(hop=hops(), lift=st.floats(0, 100), where=st.integers(0, 1000))
def test_higher_ground_never_costs_less(method, hop, lift, where):
    d, h, *rest = hop
    raised = h.copy()
    raised[1 + where % (len(h) - 2)] += lift
    assert method(d, raised, *rest).loss_db >= method(*hop).loss_db - 1e-9


@pytest.mark.parametrize("method", [bullington, single_knife_edge])
@given(hop=hops())
def test_a_greater_k_never_costs_more(method, hop):
    losses = method(*hop[:5], np.array([0.4, 2 / 3, 1.0, 4 / 3, 5.0, math.inf]) * 6371e3).loss_db
    assert (np.diff(losses) <= 1e-9).all()


@given(hop=hops())
def test_a_greater_k_never_costs_more_in_cascade_once_the_edges_are_kept(hop):
    radii = np.array([0.4, 2 / 3, 1.0, 4 / 3, 5.0, math.inf]) * 6371e3
    kept = cascaded_knife_edges(*hop[:5], radii, edges_radius_m=4 / 3 * 6371e3)
    assert (np.diff(kept.loss_db) <= 1e-9).all()


@pytest.mark.parametrize("method", [bullington, single_knife_edge])
@given(hop=hops(), ratio=st.floats(1, 10))
def test_a_higher_frequency_costs_more_behind_an_obstacle_and_less_over_it(method, hop, ratio):
    d, h, a, b, frequency, radius = hop
    low, high = (float(method(d, h, a, b, f, radius).loss_db) for f in (frequency, frequency * ratio))
    bulge = d * (d[-1] - d) / (2 * radius)
    obstructed = (h + bulge - (a + (b - a) * d / d[-1]))[1:-1].max() > 0
    assert (high - low) * (1 if obstructed else -1) >= -1e-9


@given(hop=hops(), ground=st.floats(-100, 3000))
def test_flat_ground_is_the_spherical_earth(hop, ground):
    d, h, a, b, frequency, radius = hop
    dense = np.concatenate([[0], everywhere(d[-1]), d[-1:]])
    level = np.full_like(dense, ground)
    flat = delta_bullington(dense, level, ground + a - h[0], ground + b - h[-1], frequency, radius)
    sphere = float(spherical_earth(d[-1], a - h[0], b - h[-1], frequency, radius))
    assert float(flat.spherical_db) == pytest.approx(sphere, abs=1e-6)
    assert float(flat.bullington_db) == pytest.approx(float(flat.smooth_bullington_db), abs=1e-4)
    assert float(flat.total_db) == pytest.approx(max(sphere, float(flat.bullington_db)), abs=1e-4)


@given(hop=hops(), datum=st.floats(-400, 4000))
def test_the_datum_does_not_matter(hop, datum):
    d, h, a, b, *rest = hop
    moved = delta_bullington(d, h + datum, a + datum, b + datum, *rest)
    assert float(moved.total_db) == pytest.approx(float(delta_bullington(*hop).total_db), abs=1e-5)


@pytest.mark.parametrize("method", [single_knife_edge, rounded_obstacle, double_edge])
@given(nu=st.floats(-0.77, 20), t=st.floats(0.05, 0.95), frequency=frequencies)
def test_one_sharp_edge_is_the_knife_edge(method, nu, t, frequency):
    d = np.array([0.0, t, 1.0]) * 20e3
    h = nu / float(fresnel_parameter(1.0, d[1], d[2] - d[1], frequency))
    result = method(d, [0.0, 1000.0 + h, 0.0], 1000.0, 1000.0, frequency, math.inf)
    assert float(result.loss_db) == pytest.approx(float(knife_edge_loss(nu)), abs=1e-6)
    assert result.distance_m[0] == pytest.approx(d[1])
    assert result.height_m[0] == pytest.approx(1000.0 + h)


@pytest.mark.parametrize(("method", "per_km"), [(bullington, 0.02), (cascaded_knife_edges, 0.04)])
@given(nu=st.floats(-0.77, 20))
def test_the_general_methods_add_their_own_term_even_to_one_edge(method, per_km, nu):
    # Rec. ITU-R P.526-15 §4.4.2 and §4.5.1: (1 − e^(−J/6))·(10 + c·D) is part of both methods
    h = nu / float(fresnel_parameter(1.0, 10e3, 10e3, 6e9))
    j = float(knife_edge_loss(nu))
    result = method([0, 10e3, 20e3], [0.0, 1000.0 + h, 0.0], 1000.0, 1000.0, 6e9, math.inf)
    assert float(result.loss_db) == pytest.approx(j + (1 - math.exp(-j / 6)) * (10 + per_km * 20), abs=1e-6)


def test_the_long_run_of_the_knife_edge_is_13_db_and_20_db_a_decade():
    # 20·log10(π·√2·ν): the leading term of the exact integral
    nu = np.array([1e2, 1e4, 1e6])
    assert knife_edge_loss(nu) == pytest.approx(20 * np.log10(math.pi * math.sqrt(2) * nu), abs=0.06)


@given(a=st.floats(1, 200), b=st.floats(1, 200), frequency=frequencies, k=ks)
def test_spherical_loss_rises_with_distance_and_falls_with_height(a, b, frequency, k):
    distance = np.linspace(2e3, 200e3, 60)
    radius = k * 6371e3
    low, high = (spherical_earth(distance, h, b, frequency, radius) for h in (a, a + 20))
    # the two branches of the height gain meet 0.02 dB apart
    assert (np.diff(low) >= -0.05).all()
    assert (high <= low + 0.05).all()


def test_spherical_loss_is_continuous_at_the_horizon_and_as_the_earth_flattens():
    radius, f = 8500e3, 6e9
    horizon = math.sqrt(2 * radius) * (math.sqrt(30) + math.sqrt(50))
    before, after = spherical_earth(horizon * np.array([1 - 1e-9, 1 + 1e-9]), 30, 50, f, radius)
    assert before == pytest.approx(after, abs=1e-4)
    flat, nearly = spherical_earth(20e3, 5, 7, f, np.array([math.inf, 1e14]))
    assert flat == pytest.approx(nearly, abs=1e-4)
    assert flat > 1


def test_sea_and_polarization_matter_where_the_ground_conducts():
    # Rec. ITU-R P.526-15 §3.1.1: a vertically polarized wave at tens of MHz hangs on to the sea
    args = (80e3, 10.0, 10.0, 40e6, 8500e3)
    land_v, sea_v = (float(spherical_earth(*args, "vertical", sea)) for sea in (0.0, 1.0))
    land_h, sea_h = (float(spherical_earth(*args, "horizontal", sea)) for sea in (0.0, 1.0))
    assert sea_v < land_v - 3
    assert sea_h == pytest.approx(land_h, abs=0.5)
    assert float(spherical_earth(*args, "vertical", 0.25)) == pytest.approx(0.75 * land_v + 0.25 * sea_v)


def test_delta_bullington_falls_with_antenna_height_and_k_on_rolling_ground():
    rng = np.random.default_rng(2)
    h = np.cumsum(rng.normal(0, 1.5, (500, 201)), axis=1)
    h += 300 - np.linspace(0, 1, 201) * h[:, -1:]
    d = np.linspace(0, 60e3, 201)
    base = delta_bullington(d, h, h[:, 0] + 15, h[:, -1] + 15, 1e9, 8500e3)
    assert (base.total_db > base.bullington_db).all()  # the spherical part counts on every hop
    higher = delta_bullington(d, h, h[:, 0] + 20, h[:, -1] + 15, 1e9, 8500e3)
    poorer = delta_bullington(d, h, h[:, 0] + 15, h[:, -1] + 15, 1e9, 5000e3)
    assert (higher.total_db < base.total_db).all()
    assert (poorer.total_db > base.total_db).all()


# Batches -------------------------------------------------------------------------------------------------------------


def batch(count=300, points=64):
    rng = np.random.default_rng(5)
    h = np.cumsum(rng.normal(0, 12, (count, points)), axis=1) + 400
    length = rng.uniform(5e3, 60e3, count)
    return h, h[:, 0] + 20, h[:, -1] + 30, 10 ** rng.uniform(8.5, 10.5, count), rng.uniform(3e6, 2e7, count), length


def spaced(length, points=64, *, even):
    t = np.linspace(0, 1, points)
    if even:
        return t * length[:, None]
    power = np.linspace(0.7, 1.4, len(length))[:, None]
    return length[:, None] * t**power


@pytest.mark.parametrize("even", [True, False])
@pytest.mark.parametrize("small_blocks", [True, False])
@pytest.mark.parametrize("method", [*BATCHED, delta_bullington])
def test_a_batch_is_its_hops_one_by_one(method, small_blocks, even, monkeypatch):
    if small_blocks:
        monkeypatch.setattr("profiler.diffraction.hops._POINTS_PER_BLOCK", 500)
    h, a, b, f, radius, length = batch()
    d = spaced(length, even=even)
    whole = method(d, h, a, b, f, radius)
    for i in (0, 1, 7, 150, 299):
        one = method(d[i], h[i], a[i], b[i], f[i], radius[i])
        name = "total_db" if method is delta_bullington else "loss_db"
        assert getattr(one, name).shape == ()
        assert getattr(whole, name).shape == (300,)
        assert float(getattr(whole, name)[i]) == pytest.approx(float(getattr(one, name)), abs=1e-7)
        edges, edge = (whole.edges, one.edges) if method is delta_bullington else (whole, one)
        assert edges.distance_m[i] == pytest.approx(edge.distance_m, nan_ok=True)
        assert edges.height_m[i] == pytest.approx(edge.height_m, nan_ok=True)


def test_layout_and_number_type_of_the_heights_do_not_matter():
    h, a, b, f, radius, _ = batch()
    d = np.linspace(0, 30e3, 64)
    whole = np.round(h)
    a, b = np.ceil(a) + 1, np.ceil(b) + 1
    expected = delta_bullington(d, whole, a, b, f, radius).total_db
    for form in (np.asfortranarray(whole), whole.astype(np.float32), whole.astype(np.int16)):
        assert delta_bullington(d, form, a, b, f, radius).total_db == pytest.approx(expected, abs=1e-9)


def test_one_profile_takes_many_radii_heights_and_frequencies():
    many = delta_bullington(*RIDGE[:2], [130.0, 150.0], 130.0, [6e9, 8e9], [8500e3, 4250e3])
    assert many.total_db.shape == (2,)
    assert many.total_db[1] == delta_bullington(*RIDGE[:2], 150.0, 130.0, 8e9, 4250e3).total_db


def test_results_are_read_only():
    with pytest.raises(ValueError, match="read-only"):
        bullington(*RIDGE).distance_m[0] = 1.0


def test_memory_stays_bounded_by_the_block():
    h = np.zeros((4000, 256))
    d = np.linspace(0, 30e3, 256)
    tracemalloc.start()
    delta_bullington(d, h, 30.0, 30.0, 6e9, 8500e3)
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert peak < h.nbytes / 2


# Bad input -----------------------------------------------------------------------------------------------------------


def changed(**changes):
    names = ("distance_m", "height_m", "centre_a_m", "centre_b_m", "frequency_hz", "effective_radius_m")
    return dict(zip(names, RIDGE, strict=True)) | changes


BAD = [
    ({"distance_m": [0, 5e3]}, r"shape \(2,\) and height_m \(3,\).*as many points in both"),
    ({"distance_m": [0, 1e3], "height_m": [0, 0]}, "2 points: must be at least 3"),
    ({"distance_m": [1.0, 5e3, 10e3]}, "starts at 1 m: must start at 0 m"),
    ({"distance_m": [0, 6e3, 5e3]}, "from 6000 to 5000 m at point 2"),
    ({"distance_m": [0, math.nan, 5e3]}, "at point 1: must be finite and rise"),
    ({"distance_m": [0, 5e3, math.inf]}, "must be finite and rise"),
    ({"centre_a_m": 99.0}, "centre_a_m = 99: must be a number not below the surface at site A, 100 m"),
    ({"centre_b_m": math.nan}, "centre_b_m = nan: must be a number"),
    ({"frequency_hz": 0.0}, "frequency_hz = 0: must be finite and more than 0 Hz"),
    ({"frequency_hz": math.inf}, "frequency_hz = inf: must be finite and more than 0 Hz"),
    ({"effective_radius_m": -8500e3}, r"effective_radius_m = -8.5e\+06: must be more than 0 m"),
    ({"centre_a_m": [130.0, 130.0], "frequency_hz": [6e9] * 3}, "do not fit"),
    ({"height_m": np.zeros((0, 3))}, "no hops"),
]


@pytest.mark.parametrize(("changes", "message"), BAD)
@pytest.mark.parametrize("method", [*BATCHED, delta_bullington])
def test_a_bad_argument_is_named_in_one_line(method, changes, message):
    with pytest.raises(InputError, match=message) as caught:
        method(**changed(**changes))
    assert "\n" not in str(caught.value)


@pytest.mark.parametrize("method", [*BATCHED, delta_bullington])
def test_missing_ground_is_said_and_located(method):
    with pytest.raises(MissingGroundError, match=r"point 1, 5\.000 km from A, is nan"):
        method(**changed(height_m=[100.0, math.nan, 100.0]))
    two = np.array([[100.0, 180.0, 100.0], [100.0, math.inf, 100.0]])
    with pytest.raises(MissingGroundError, match=r"point 1 of hop 1, 5\.000 km"):
        method(**changed(height_m=two))


def test_polarization_and_sea_are_checked():
    with pytest.raises(InputError, match="polarization = 'circular': must be 'horizontal' or 'vertical'"):
        delta_bullington(*RIDGE, "circular")
    with pytest.raises(InputError, match=r"sea_fraction = 1\.5: must be 0"):
        delta_bullington(*RIDGE, "vertical", 1.5)


def test_a_missing_nu_stays_missing():
    assert math.isnan(float(knife_edge_loss(math.nan)))


def test_an_edge_at_an_end_has_no_parameter():
    with pytest.raises(InputError, match="d1_m = 0: must be finite and more than 0 m"):
        fresnel_parameter(1.0, 0.0, 10.0, 6e9)


# Edges ---------------------------------------------------------------------------------------------------------------


def test_bullington_shows_both_horizon_points_and_the_edge_between():
    d = np.array([0, 4e3, 6e3, 10e3])
    result = bullington(d, [0.0, 120.0, 115.0, 0.0], 100.0, 100.0, 6e9, math.inf)
    slope_a, slope_b = 20 / 4e3, 15 / 4e3  # of the rays, from the antennas over the edges
    meet = slope_b * 10e3 / (slope_a + slope_b)
    assert result.distance_m.tolist() == pytest.approx([4e3, meet, 6e3])
    assert result.height_m.tolist() == pytest.approx([120.0, 100 + slope_a * meet, 115.0])
    assert np.isnan(result.edge_loss_db).tolist() == [True, False, True]


def test_the_edge_of_a_curved_earth_is_reported_without_its_bulge():
    d = np.linspace(0, 60e3, 601)
    result = bullington(d, np.zeros(601), 30.0, 30.0, 6e9, 8500e3)
    vertex = 30e3**2 / (2 * 8500e3)
    a_side = result.distance_m[0]
    assert a_side == pytest.approx(math.sqrt(2 * 8500e3 * 30), abs=100)
    assert result.height_m[0] == pytest.approx(0.0, abs=1e-9)
    slope = (a_side * (60e3 - a_side) / (2 * 8500e3) - 30) / a_side
    assert result.height_m[1] == pytest.approx(30 + slope * 30e3 - vertex, abs=0.01)


def test_cascade_finds_the_main_edge_and_one_on_either_side():
    d = np.arange(7) * 5e3
    h = np.array([0, 118, 0, 160, 0, 120, 0.0])
    result = cascaded_knife_edges(d, h, 100.0, 100.0, 6e9, math.inf)
    assert result.distance_m.tolist() == [5e3, 15e3, 25e3]
    # Rec. ITU-R P.526-15 §4.4.2 by hand: heights over the line from the end to the main edge
    nus = [
        fresnel_parameter(118 - 120, 5e3, 10e3, 6e9),
        fresnel_parameter(60, 15e3, 15e3, 6e9),
        fresnel_parameter(120 - 120, 10e3, 5e3, 6e9),
    ]
    assert result.nu.tolist() == pytest.approx([float(nu) for nu in nus])
    j = [float(knife_edge_loss(nu)) for nu in nus]
    by_hand = j[1] + (1 - math.exp(-j[1] / 6)) * (j[0] + j[2] + 10 + 0.04 * 30)
    assert float(result.loss_db) == pytest.approx(by_hand)


def test_a_clear_path_has_no_edges_and_no_loss():
    for method in BATCHED:
        result = method([0, 5e3, 10e3], [0, 0, 0], 100.0, 100.0, 6e9, 8500e3)
        assert float(result.loss_db) == 0.0
        assert np.isnan(result.distance_m).all()


@given(radius=st.floats(50, 20e3), shift=st.floats(-2e3, 2e3), top=st.floats(-3, 40), tilt=st.floats(-60, 60))
def test_the_fitted_radius_is_that_of_the_hill(radius, shift, top, tilt):
    d = np.linspace(0, 20e3, 8001)
    x = d - 10e3 - shift
    hill = 500 + top + tilt * d / 20e3 - np.minimum(x**2 / (2 * radius), 400)
    result = rounded_obstacle(d, hill, 500.0, 500.0 + tilt, 6e9, math.inf)
    # straight lines between points 2.5 m apart take a little of the narrowest top
    assert float(result.radius_m) == pytest.approx(radius, rel=1e-4)
    assert bool(result.isolated)


def test_the_bulge_of_the_earth_is_part_of_the_radius():
    d = np.linspace(0, 20e3, 2001)
    hill = 500 - np.minimum((d - 10e3) ** 2 / (2 * 50e3), 400)
    result = rounded_obstacle(d, hill, 480.0, 480.0, 6e9, 8500e3)
    assert float(result.radius_m) == pytest.approx(1 / (1 / 50e3 + 1 / 8500e3), rel=1e-5)


def test_the_loss_of_a_rounding_top_rises_from_the_knife_edge():
    d = np.linspace(0, 20e3, 2001)
    losses = []
    for radius in (1.0, 100.0, 1000.0, 10e3, 100e3):
        hill = 120 - np.minimum((d - 10e3) ** 2 / (2 * radius), 120)
        losses.append(float(rounded_obstacle(d, hill, 100.0, 100.0, 6e9, math.inf).loss_db))
    assert losses[0] == pytest.approx(float(knife_edge_loss(fresnel_parameter(20.0, 10e3, 10e3, 6e9))), abs=0.01)
    assert all(less < more for less, more in pairwise(losses))
