"""Heights that are sure enough: every draw has its own clearing region; brute force over all points says the same."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from profiler.confidence import assess, draw_doubt
from profiler.errors import InputError
from profiler.heights import (
    clearing_region,
    drawn_regions,
    least_b_for,
    least_b_sure,
    least_ray,
    least_surplus_drawn,
    surplus,
)
from profiler.models import ConfidenceChoice, Rule

DRAWS = 60


@st.composite
def moved_regions(draw):
    """Draw a region over bare ground, the errors that move it, and its least ray."""
    size = draw(st.integers(3, 30))
    distance = np.cumsum(draw(st.lists(st.floats(50, 3000), min_size=size, max_size=size)))
    ground = np.array(draw(st.lists(st.floats(0, 80), min_size=size, max_size=size)))
    rng = np.random.default_rng(draw(st.integers(0, 99)))
    error = rng.normal(0, draw(st.sampled_from([0.1, 3.0, 20.0])), (size, DRAWS)).astype(np.float32)
    region = clearing_region(distance - distance[0], ground, float(ground[0]) - 2.0, float(ground[-1]) - 5.0)
    return region, error


def surplus_of_all_points(region, error, a, b):
    share = (region.distance_m / region.distance_m[-1])[:, None]
    ray = (1 - share) * (region.ground_a_m + a) + share * (region.ground_b_m + b)
    return (ray + error - region.least_ray_m[:, None]).min(axis=0)


@given(moved_regions(), st.floats(0, 200), st.floats(0, 200))
def test_no_point_that_was_left_out_is_ever_the_tightest(moved, a, b):
    region, error = moved
    drawn = drawn_regions(region, error.__getitem__)
    np.testing.assert_allclose(
        least_surplus_drawn(drawn, a, b), surplus_of_all_points(region, error, a, b), atol=2e-4, rtol=1e-5
    )


@given(moved_regions(), st.floats(5, 200), st.sampled_from([0.5, 0.9, 0.95, 1.0]))
def test_the_least_b_is_sure_enough_and_a_little_less_is_not(moved, a, chance):
    region, error = moved
    b = float(least_b_sure(drawn_regions(region, error.__getitem__), [a], chance)[0])
    at_a = region.ground_a_m + a + error[0] - region.least_ray_m[0]
    if np.isinf(b):  # what stands at A itself is too high in too many draws, and no B helps
        assert np.mean(at_a >= 1e-4) < chance
        return
    # a point close to A hardly feels B, and single precision is coarse there
    hair = 1e-3 / (region.distance_m[1] / region.distance_m[-1])
    assert np.mean(surplus_of_all_points(region, error, a, b + hair) >= -1e-3) >= chance
    assert np.mean(surplus_of_all_points(region, error, a, b - 2 * hair - 1e-3) >= 0) < chance


def test_without_errors_the_sure_heights_are_those_of_the_region():
    x = np.linspace(0, 30e3, 200)
    ground = 40 * np.sin(x / 2e3)
    region = clearing_region(x, least_ray(x, ground, 6e9, [Rule(4 / 3, 1.0)]), ground[0], ground[-1])
    drawn = drawn_regions(region, np.zeros((200, DRAWS), dtype=np.float32).__getitem__)
    a = np.arange(1.0, 200.0, 7)
    np.testing.assert_allclose(least_b_sure(drawn, a, 0.95), least_b_for(region, a), atol=2e-3)
    assert drawn.share.size <= region.governing_point.size + 40  # of 200 points few can matter
    assert least_surplus_drawn(drawn, 60, 70) == pytest.approx(float(surplus(region, 60, 70)), abs=1e-4)


def test_the_chance_is_that_of_the_confidence_analysis():
    """The same draws through another door: `assess` at a pair, against the moved regions at that pair."""
    x = np.linspace(0, 30e3, 300)
    ground, cover = 40 * np.sin(x / 2e3), np.where(np.sin(x / 5e3) > 0, 12.0, 0.0)
    rules = [Rule(4 / 3, 1.0), Rule(2 / 3, 0.3)]
    choice = ConfidenceChoice(4.0, "test", 300.0, cover_sigma_m=2.0, draws=500, seed=3)
    doubt = draw_doubt(x, cover, choice, cell_m=90.0)
    ray = doubt.places.carry(least_ray(x, ground + cover, 6e9, rules).max(axis=0))
    region = clearing_region(doubt.places.distance_m, ray, ground[0], ground[-1])
    drawn = drawn_regions(region, doubt.surplus_errors)
    for a, b in ((70, 75), (80, 72), (95, 90)):
        whole = assess(x, ground, cover, a, b, 6e9, rules, choice, cell_m=90.0)
        share = np.mean(least_surplus_drawn(drawn, a, b) >= 0)
        assert share == pytest.approx(whole.chance.value, abs=1.01 / 500)  # a draw on the edge may fall either way
        assert float(least_b_sure(drawn, [a], 0.9)[0]) == pytest.approx(whole.sure[0].b_only_m, abs=0.01)


def test_chances_out_of_range_are_refused():
    region = clearing_region([0, 5e3, 10e3], [0, 60, 0], 0, 0)
    drawn = drawn_regions(region, np.zeros((3, 5), dtype=np.float32).__getitem__)
    with pytest.raises(InputError, match="chance = 0: must be more than 0 and at most 1"):
        least_b_sure(drawn, [30.0], 0.0)
