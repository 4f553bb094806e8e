"""The chance of clearing on real ground, against a Monte Carlo that shares no code with the program.

The ground (NASA SRTM, 3″, Utah) is read with rasterio and SciPy along geographiclib's geodesic; the field of errors is
drawn by Cholesky's factor at cells that begin anywhere, and the rule is written out in SI units. Sampling tolerances
are four standard errors of a difference of two estimates.
"""

from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
import rasterio
from geographiclib.geodesic import Geodesic
from scipy.interpolate import RegularGridInterpolator

from profiler.confidence import assess
from profiler.hopfile import load_hop
from profiler.models import ConfidenceChoice, HeightsChoice, Hop, Rule, Site, TerrainChoice, TowerChoice
from profiler.plan import plan_heights
from profiler.study import run_study

ROOT = Path(__file__).resolve().parent.parent

CELL_M, FREQUENCY_HZ, DRAWS, SPARE_M = 92.0, 7.5e9, 4000, 4.0
HOPS = {
    "desert to canyon": ((-113.09, 37.20), (-112.97, 37.22), (1 / 2, 0.0, 1.5)),
    "mesa to plateau": ((-113.20, 37.35), (-112.95, 37.18), (4 / 3, 0.6, 0.0)),
}


def walk(path, site_a, site_b, spacing_m=30.0):
    """Distances from A and ground along the geodesic, by libraries that the program does not read ground with."""
    with rasterio.open(path) as raster:
        heights, affine = raster.read(1).astype(float), raster.transform
    rows, columns = heights.shape
    y, x = (affine.f + affine.e * (np.arange(rows) + 0.5))[::-1], affine.c + affine.a * (np.arange(columns) + 0.5)
    line = Geodesic.WGS84.InverseLine(site_a[1], site_a[0], site_b[1], site_b[0])
    distance = np.linspace(0, line.s13, int(line.s13 / spacing_m) + 1)
    places = [line.Position(each) for each in distance]
    ground = RegularGridInterpolator((y, x), heights[::-1])([(place["lat2"], place["lon2"]) for place in places])
    return distance, ground


def surplus_of(distance, ground, heights, rule):
    """Surplus from the definitions: ray less ground, bulge d1·d2/(2kR), fraction of sqrt(λ·d1·d2/d) and margin."""
    (k, fraction, margin), total = rule, distance[-1]
    start, end = ground[0] + heights[0], ground[-1] + heights[1]
    product = distance * (total - distance)
    zone = fraction * np.sqrt(299_792_458 / FREQUENCY_HZ * product / total)
    return start + (end - start) * distance / total - ground - product / (2 * k * 6_371_000) - zone - margin


def drawn_least(distance, ground, heights, rule, sigma, reach, *, seed, phase=0.3):
    """Least surplus of each draw, the errors by Cholesky's factor at cells that begin somewhere before A."""
    cells = CELL_M * (np.arange(-1, distance[-1] / CELL_M + 2) + phase)
    covariance = np.exp(-3 * np.abs(cells[:, None] - cells) / reach)
    drawn = np.linalg.cholesky(covariance) @ np.random.default_rng(seed).standard_normal((cells.size, DRAWS))
    carry = np.maximum(0, 1 - np.abs(distance[:, None] - cells) / CELL_M)
    spread = np.sqrt(np.einsum("ij,jk,ik->i", carry, covariance, carry))
    error = sigma * (carry / spread[:, None]) @ drawn
    t = (distance / distance[-1])[:, None]
    surplus = surplus_of(distance, ground, heights, rule)[:, None]
    return (surplus + (1 - t) * error[0] + t * error[-1] - error).min(axis=0)


@pytest.fixture(scope="module", params=HOPS)
def hop(request, real_terrain):
    """Give a hop with different heights at both ends that clears its rule by 4 m on the map."""
    site_a, site_b, rule = HOPS[request.param]
    distance, ground = walk(real_terrain / "canyon_srtm_3arcsec.tif", site_a, site_b)
    equal = SPARE_M - surplus_of(distance, ground, (0.0, 0.0), rule).min()
    tilt = 0.1 * equal
    spare = surplus_of(distance, ground, (equal + tilt, equal - tilt), rule).min()
    heights = equal + tilt + SPARE_M - spare, equal - tilt + SPARE_M - spare
    return distance, ground, heights, rule


def assessed(hop, sigma=4.0, reach=150.0, *, seed=1, draws=DRAWS, surveyed=(False, False), **doubt):
    distance, ground, heights, rule = hop
    choice = ConfidenceChoice(sigma, "test", reach, draws=draws, seed=seed, **doubt)
    rules = [Rule(*rule)]
    return assess(distance, ground, 0 * ground, *heights, FREQUENCY_HZ, rules, choice, cell_m=CELL_M, surveyed=surveyed)


@pytest.mark.parametrize(("sigma", "reach"), [(4.0, 150.0), (2.0, 600.0)])
def test_chance_and_spread_are_those_of_an_independent_monte_carlo(hop, sigma, reach):
    found = assessed(hop, sigma, reach)
    least = drawn_least(*hop, sigma, reach, seed=5)
    truth = np.mean(least >= 0)
    assert 0.55 < truth < 0.98
    assert found.chance.value == pytest.approx(truth, abs=4 * np.sqrt(2 * truth * (1 - truth) / DRAWS))
    rule = found.rules[0]
    # standard error of a 5, 50 or 95 % quantile: 0.033, 0.020, 0.033 sigma at 4 000 draws, sigma of the least surplus
    allowed = 4 * np.sqrt(2) * np.array([0.033, 0.020, 0.033]) * least.std()
    given = np.array([rule.least_low_m, rule.least_median_m, rule.least_high_m])
    assert np.all(np.abs(given - np.quantile(least, [0.05, 0.5, 0.95])) < allowed)
    assert found.sure[1].raise_m == pytest.approx(-np.quantile(least, 0.05), abs=allowed[0])


def test_how_densely_the_path_is_listed_does_not_matter(hop):
    """The same ground, every third of its points left out but the tightest, and four points put between every two."""
    distance, ground, heights, rule = hop
    found = assessed(hop)
    dense = np.linspace(0, distance[-1], 5 * (distance.size - 1) + 1)
    finer = assessed((dense, np.interp(dense, distance, ground), heights, rule))
    near = surplus_of(distance, ground, heights, rule) < 40.0
    kept = near | (np.arange(distance.size) % 3 == 0) | (np.arange(distance.size) == distance.size - 1)
    assert kept.sum() < 0.8 * distance.size
    for other in (finer, assessed((distance[kept], ground[kept], heights, rule))):
        assert found.chance.low <= other.chance.value <= found.chance.high
        for one, another in zip(found.sure, other.sure, strict=True):
            assert one.raise_low_m <= another.raise_m <= one.raise_high_m
        assert [place.site for place in other.survey] == [place.site for place in found.survey]
        for one, another in zip(found.survey, other.survey, strict=True):
            assert another.distance_m == pytest.approx(one.distance_m, abs=150.0)
            assert another.share_of_doubt == pytest.approx(one.share_of_doubt, abs=0.03)


def test_doubt_only_ever_takes_from_a_hop_that_clears(hop):
    sigmas = (0.5, 1.0, 2.0, 4.0, 8.0)
    chances = [assessed(hop, sigma).chance.value for sigma in sigmas]
    assert np.all(np.diff(chances) <= 0)
    assert chances[0] == 1.0
    raises = [assessed(hop, sigma).sure[1].raise_m for sigma in sigmas]
    assert np.all(np.diff(raises) > 0)


def test_swapping_the_ends_mirrors_the_analysis(hop):
    distance, ground, heights, rule = hop
    back = (distance[-1] - distance[::-1], ground[::-1], heights[::-1], rule)
    for surveyed in ((False, False), (True, False)):
        one = assessed(hop, surveyed=surveyed, terrain_offset_sigma_m=3.0)
        other = assessed(back, seed=2, surveyed=surveyed[::-1], terrain_offset_sigma_m=3.0)
        pooled = np.sqrt(2 * one.chance.value * (1 - one.chance.value) / DRAWS)
        assert other.chance.value == pytest.approx(one.chance.value, abs=4 * pooled)
        # a height that one antenna alone must have is the other's when the ends are swapped: the interval of the raise,
        # widened by what one end must rise for a metre at the tightest place
        top = one.survey[0].distance_m / distance[-1] if one.survey[0].site is None else 0.5
        slack = 1.5 * (one.sure[1].raise_high_m - one.sure[1].raise_low_m) / min(top, 1 - top)
        assert other.sure[1].a_only_m == pytest.approx(one.sure[1].b_only_m, abs=slack)
        assert other.sure[1].b_only_m == pytest.approx(one.sure[1].a_only_m, abs=slack)
        for first, mirrored in zip(one.survey[:2], other.survey[:2], strict=True):
            assert distance[-1] - mirrored.distance_m == pytest.approx(first.distance_m, abs=100.0)
            assert mirrored.share_of_doubt == pytest.approx(first.share_of_doubt, abs=0.05)
            assert (mirrored.site, first.site) in ((None, None), ("A", "B"), ("B", "A"))


def test_the_offset_takes_nothing_on_the_raster_and_much_from_a_survey(hop):
    on_raster, moved = assessed(hop), assessed(hop, terrain_offset_sigma_m=6.0)
    assert moved.chance == on_raster.chance
    surveyed, shifted = (assessed(hop, surveyed=(True, True), terrain_offset_sigma_m=offset) for offset in (0.0, 6.0))
    assert shifted.chance.value < surveyed.chance.value - 0.03


def test_the_interval_holds_the_truth_for_19_seeds_in_20(hop):
    truth = assessed(hop, draws=20000, seed=99, step_m=300.0).chance.value
    found = [assessed(hop, draws=400, seed=seed, step_m=300.0).chance for seed in range(60)]
    inside = sum(each.low <= truth <= each.high for each in found)
    assert inside >= 52  # of 60 at 95 %: fewer has a probability of 0.3 %


# Whole studies: the spacing of the hop file has no say in any of it


def canyon_hop(real_terrain):
    """Give a hop from the mesa to the plateau that clears by some 4 m on the map."""
    return Hop(
        name="canyon",
        site_a=Site("mesa", -113.20, 37.35, 818.0),
        site_b=Site("plateau", -112.95, 37.18, 798.0),
        frequency_hz=FREQUENCY_HZ,
        rules=(Rule(4 / 3, 1.0), Rule(2 / 3, 0.3)),
        terrain=TerrainChoice((real_terrain / "canyon_srtm_3arcsec.tif",)),
        confidence=ConfidenceChoice(4.0, "test", 120.0, terrain_offset_sigma_m=3.0),
        heights=HeightsChoice(TowerChoice(700, 900, step_m=2.0), TowerChoice(700, 900, step_m=2.0)),
    )


def sample_hop(_):
    """Give the sample hop over its lowered antennas, so that some draws are short."""
    hop = load_hop(ROOT / "sample_dem" / "ridge_to_mill.toml")
    ends = replace(hop.site_a, antenna_m=17.0), replace(hop.site_b, antenna_m=19.0)
    return replace(hop, site_a=ends[0], site_b=ends[1])


@pytest.mark.parametrize("make", [canyon_hop, sample_hop])
def test_chance_band_sure_heights_shares_and_places_are_equal_at_every_spacing(make, real_terrain):
    hop = make(real_terrain)
    studies = [
        run_study(replace(hop, terrain=replace(hop.terrain, spacing_m=spacing_m)), losses=False)
        for spacing_m in (40.0, 10.0, 2.0)
    ]
    first, *others = (study.confidence for study in studies)
    assert 0.5 < first.chance.value < 0.99
    at_m = studies[0].profile.distance_m[::7]
    for other, study in zip(others, studies[1:], strict=True):
        assert first.chance.low <= other.chance.value <= first.chance.high
        for one, another in zip(first.sure, other.sure, strict=True):
            assert one.raise_low_m <= another.raise_m <= one.raise_high_m
        for one, another in zip(first.rules, other.rules, strict=True):
            assert one.chance.low <= another.chance.value <= one.chance.high
            assert another.least_low_m == pytest.approx(one.least_low_m, abs=0.1)
            # estimates of a share are good to a few percent of the whole; the draws are the same
            assert another.shares.terrain == pytest.approx(one.shares.terrain, abs=0.01)
            rows = np.searchsorted(study.profile.distance_m, at_m)
            same = study.profile.distance_m[rows] == at_m
            assert same.sum() > 20
            assert another.surplus.low_m[rows[same]] == pytest.approx(one.surplus.low_m[::7][same], abs=1e-3)
        assert [place.site for place in other.survey] == [place.site for place in first.survey]
        for one, another in zip(first.survey, other.survey, strict=True):
            assert another.distance_m == pytest.approx(one.distance_m, abs=150.0)
            assert another.share_of_doubt == pytest.approx(one.share_of_doubt, abs=0.05)


@pytest.mark.parametrize("make", [canyon_hop, sample_hop])
def test_the_planned_pair_is_the_same_at_every_spacing_and_passes(make, real_terrain):
    hop = replace(make(real_terrain), availability=None, radio=None)
    hop = replace(hop, confidence=replace(hop.confidence, vary_k=False))
    pairs = set()
    for spacing_m in (40.0, 5.0):
        study = run_study(replace(hop, terrain=replace(hop.terrain, spacing_m=spacing_m)), losses=False)
        plan = plan_heights(study, sure=0.95)
        pairs.add((plan.answer.pair.antenna_a_m, plan.answer.pair.antenna_b_m))
    assert len(pairs) == 1
    a, b = pairs.pop()
    again = replace(hop, site_a=replace(hop.site_a, antenna_m=a), site_b=replace(hop.site_b, antenna_m=b))
    again = replace(again, terrain=replace(hop.terrain, spacing_m=5.0))
    found = run_study(again, losses=False).confidence.chance
    assert found.value >= 0.95
    assert found.value == pytest.approx(plan.answer.chance.value, abs=0.002)
