"""What the ground does to outage: obstruction by the statistics of k, and the roughness of the area."""

import warnings
from importlib.util import find_spec

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from profiler.availability import KStatistics, k_statistics, roughness_grid, terrain_roughness
from profiler.availability.obstruction import obstruction_percent
from profiler.errors import InputError

needs_itur = pytest.mark.skipif(find_spec("itur") is None, reason="the second opinion needs the itur package")

percentiles = st.lists(st.floats(0.01, 99.9), min_size=1, max_size=6, unique=True).map(sorted)


def test_gaussian_loss_gives_gaussian_tails():
    # An excess loss of 10·z dB (z the normal quantile) exceeds 10·m dB for the share Φ(-m): tables of the normal
    # distribution, e.g. Abramowitz and Stegun table 26.1: Φ(-1) = 0.158655, Φ(-2) = 0.022750.
    from scipy.special import ndtri

    percent = np.array([0.1, 5.0, 50.0, 99.0])
    excess = -10.0 * ndtri(percent / 100)
    found = obstruction_percent(KStatistics(percent, excess), [0.0, 10.0, 20.0, 40.0])
    assert found == pytest.approx([50.0, 15.8655, 2.2750, 0.0], abs=0.5e-4)


@given(percentiles, st.data(), st.floats(0.0, 40.0))
def test_against_many_draws(percent, data, margin_db):
    # The same question put to draws: percentages evenly spread, each with the loss interpolated in the quantile.
    from scipy.special import ndtri

    excess = data.draw(st.lists(st.floats(-20.0, 60.0), min_size=len(percent), max_size=len(percent)))
    found = float(obstruction_percent(KStatistics(percent, excess), margin_db))
    draws = (np.arange(20_000) + 0.5) / 20_000
    loss = np.interp(ndtri(draws), ndtri(np.array(percent) / 100), excess)
    assert found == pytest.approx(100 * np.mean(loss > margin_db), abs=0.05)


@given(percentiles, st.lists(st.floats(-20.0, 60.0), min_size=6, max_size=6))
def test_more_margin_less_obstruction(percent, excess):
    found = obstruction_percent(KStatistics(percent, excess[: len(percent)]), np.linspace(0.0, 70.0, 141))
    assert (np.diff(found) <= 1e-9).all()
    assert found[0] <= 100.0 + 1e-9
    assert found[-1] == 0.0


def test_one_low_k_bounds_the_outage():
    # Cut off at the k that is not exceeded for 0.1 %: at least that; free there: nothing is counted. A loss that is
    # linear in 1/k runs from 30 dB at the normal score -3.0902 (0.1 %) to 0 (50 %): 15 dB at -1.5451, Φ = 6.117 %.
    one = k_statistics([(0.1, 0.5)], 4 / 3, lambda k: 30.0 * (1 / k - 0.75) / (2 - 0.75))
    assert float(obstruction_percent(one, 29.9999)) == pytest.approx(0.1, abs=1e-4)
    assert float(obstruction_percent(one, 15.0)) == pytest.approx(6.117, abs=0.005)
    assert float(obstruction_percent(one, 30.0)) == 0.0
    assert one.assumptions == ("obstruction fading: the k given end below 50 %; there k = 1.333, the median",)
    assert float(obstruction_percent(KStatistics([50.0, 90.0], [10.0, 5.0]), 1.0)) == 100.0


RIDGE = np.array([0, 6e3, 8e3, 20e3, 40e3]), np.array([100.0, 140.0, 100.0, 190.0, 100.0])
SPREAD = ((0.1, 0.55), (1.0, 0.75), (10.0, 1.05), (50.0, 1.4), (90.0, 2.2))


@pytest.mark.parametrize("margin_db", [3.0, 8.0, 14.0, 20.0])
@pytest.mark.parametrize("spread", [SPREAD, SPREAD[:1], SPREAD[:2], SPREAD[1:3]])
def test_obstruction_is_that_of_many_draws_of_k(spread, margin_db):
    """Draw k as the confidence analysis does, take the loss of each, count; the loss is far from linear in between."""
    from scipy.special import ndtr, ndtri

    from profiler.diffraction import losses_over_k

    def excess_at(k):
        losses = losses_over_k("delta-bullington", *RIDGE, 210.0, 230.0, 7e9, np.append(k, 1.4))
        return losses[:-1] - losses[-1]

    found = float(obstruction_percent(k_statistics(spread, 1.4, excess_at), margin_db))
    percent, k = np.array(spread if spread[-1][0] >= 50 else (*spread, (50.0, 1.4))).T
    score = np.linspace(-6, 6, 24_001)
    loss = excess_at(1 / np.interp(score, ndtri(percent / 100), 1 / k))
    loss[score < ndtri(percent[0] / 100)] = excess_at(k[:1])[0]  # below the lowest k it counts as there
    density = np.diff(ndtr(np.append(score, 9.0)))
    assert found == pytest.approx(100 * density[loss > margin_db].sum(), rel=0.01, abs=1e-5)


@pytest.mark.parametrize(
    ("percent", "excess", "message"),
    [
        ([1.0, 0.1], [1.0, 2.0], r"percent = \[1.0, 0.1\]: must ascend within 0 to 100 %"),
        ([0.0, 1.0], [1.0, 2.0], r"percent = \[0.0, 1.0\]: must ascend within 0 to 100 %"),
        ([1.0, 2.0], [1.0], r"excess_db of shape \(1,\): must be one value for each of 2 percent"),
        ([1.0], [np.nan], r"excess_db = \[nan\]: must be finite dB"),
    ],
)
def test_statistics_that_are_refused(percent, excess, message):
    with pytest.raises(InputError, match=message):
        KStatistics(percent, excess)


def test_a_percentage_without_a_score_is_refused():
    with pytest.raises(InputError, match="must be percentages that the normal distribution knows"):
        k_statistics([(5e-324, 0.8), (50.0, 4 / 3)], 4 / 3, np.zeros_like)


@given(st.floats(-180.0, 180.0), st.floats(-85.0, 85.0))
def test_grid_spans_110_km(longitude, latitude):
    from geographiclib.geodesic import Geodesic

    longitudes, latitudes = roughness_grid(longitude, latitude)
    assert ((longitudes >= -180) & (longitudes <= 180)).all()
    middle = longitudes.shape[1] // 2

    def length_m(a, b):
        return Geodesic.WGS84.Inverse(latitudes[a], longitudes[a], latitudes[b], longitudes[b])["s12"]

    tall = length_m((0, middle), (-1, middle))
    row = latitudes.shape[0] // 2
    half_wide = length_m((row, 0), (row, middle))
    step_m = 30 / 3600 * 111.2e3
    assert tall == pytest.approx(110e3, abs=2 * step_m)  # the sphere against the ellipsoid takes up to 0.7 %
    assert half_wide == pytest.approx(55e3, abs=step_m + 400)


def test_roughness_of_a_plane_and_a_gap():
    # An even slope of relief H has the standard deviation H/√12.
    longitudes, _ = roughness_grid(10.0, 50.0)
    across = (longitudes - longitudes.min()) / np.ptp(longitudes)
    found = terrain_roughness(1000.0 * across)
    assert found.roughness_m == pytest.approx(1000 / np.sqrt(12), rel=0.01)
    assert found.coverage == 1.0
    gap = np.where(across > 0.97, np.nan, across)
    assert 0.95 < terrain_roughness(gap).coverage < 1.0
    assert "100.0% of" in found.source


def test_terrain_too_small_is_refused():
    longitudes, latitudes = roughness_grid(-113.05, 37.32)
    inside = (abs(longitudes + 113.05) < 0.19) & (abs(latitudes - 37.32) < 0.19)
    with pytest.raises(InputError, match=r"terrain covers 1[0-9]% of the 110 km x 110 km box .* p530-17-quick"):
        terrain_roughness(np.where(inside, 1500.0, np.nan))
    with pytest.raises(InputError, match="latitude = 88: must be -85 to 85 degrees; give terrain_roughness_m"):
        roughness_grid(0.0, 88.0)


@needs_itur
def test_roughness_of_real_ground_is_that_of_the_map(real_terrain):
    # SRTM of 42 km of canyons in Utah against P.530-17's own map of sa there. The raster is only a part of the 110 km
    # box, hence the 15 %; a variance, a range or another unit would be far off.
    import rasterio

    with warnings.catch_warnings(), np.errstate():
        warnings.simplefilter("ignore")
        from itur.models import itu530

        published_m = float(itu530._ITU530_17_.s_a(np.array([37.32]), np.array([360 - 113.05]))[0])
    with rasterio.open(real_terrain / "canyon_srtm_3arcsec.tif") as raster:
        height = raster.read(1).astype(float)[::10, ::10]
    height[height == 65535] = np.nan
    assert terrain_roughness(height).roughness_m == pytest.approx(published_m, rel=0.15)
