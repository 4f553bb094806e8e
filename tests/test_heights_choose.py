"""Choices under limits, steps, taken positions and costs; brute force over all pairs is the second opinion."""

import itertools
import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from profiler.errors import InputError
from profiler.geometry import ROUNDING_M
from profiler.heights import Choice, NoPair, cheapest, clearing_region, least_other, round_up, surplus
from profiler.heights.tower_positions import all_positions, free_positions, height_cost
from profiler.models import TowerChoice

FOOT_M = 0.3048
HILL = clearing_region([0, 4e3, 10e3], [100, 160, 130], 100, 120)  # A: 0 m, B: 10 m of cover; a crest at 4 km


@st.composite
def towers(draw):
    lowest = draw(st.floats(1, 30))
    threshold = draw(st.none() | st.floats(5, 60))
    return TowerChoice(
        lowest_m=lowest,
        highest_m=lowest + draw(st.floats(6, 50)),
        step_m=draw(st.sampled_from([1.0, 0.5, 3.0, 5 * FOOT_M])),
        taken_m=tuple(draw(st.lists(st.floats(1, 60), max_size=3))),
        taken_clearance_m=draw(st.floats(0, 4)),
        cost_per_m=draw(st.sampled_from([0.0, 1.0, 2.5, 40.0])),
        threshold_m=threshold,
        threshold_cost=draw(st.sampled_from([0.0, 30.0, 1000.0])),
    )


@st.composite
def regions(draw):
    size = draw(st.integers(3, 8))
    required = np.array(draw(st.lists(st.floats(0, 70), min_size=size, max_size=size)))
    distance = np.cumsum(draw(st.lists(st.floats(100, 5000), min_size=size, max_size=size)))
    return clearing_region(distance - distance[0], required, 0.0, 0.0)


@given(regions(), towers(), towers())
def test_cheapest_is_the_cheapest_of_all_pairs(region, tower_a, tower_b):
    found = cheapest(region, tower_a, tower_b)
    pairs = itertools.product(free_positions(tower_a), free_positions(tower_b))
    good = [pair for pair in pairs if surplus(region, *pair) >= -ROUNDING_M]
    if isinstance(found, NoPair):
        assert not good
        assert found.reason
    else:
        assert surplus(region, found.antenna_a_m, found.antenna_b_m) >= -ROUNDING_M
        least = min(float(height_cost(tower_a, a) + height_cost(tower_b, b)) for a, b in good)
        assert found.cost == pytest.approx(least, abs=1e-6)


@given(regions(), towers(), towers())
def test_each_remedy_alone_would_do(region, tower_a, tower_b):
    found = cheapest(region, tower_a, tower_b)
    if isinstance(found, Choice) or math.isnan(found.best_a_m + found.best_b_m):
        return
    best = np.array([found.best_a_m, found.best_b_m])
    assert surplus(region, *best) < 0
    if found.raise_a_to_m is not None:
        assert surplus(region, found.raise_a_to_m, best[1]) == pytest.approx(0, abs=2e-6)
    if found.raise_b_to_m is not None:
        assert surplus(region, best[0], found.raise_b_to_m) == pytest.approx(0, abs=2e-6)
    assert surplus(region, *(best + found.raise_both_by_m)) == pytest.approx(0, abs=1e-9)
    free = [TowerChoice(t.lowest_m, t.highest_m, t.step_m) for t in (tower_a, tower_b)]
    assert found.taken_to_blame == isinstance(cheapest(region, *free), Choice)


def test_a_notice_threshold_is_worth_a_taller_other_tower():
    """14 CFR 77.9(a) as an example of a fixed cost above a height: notice above 200 ft (60.96 m), none at it."""
    region = clearing_region([0, 5e3, 10e3], [0, 205 * FOOT_M, 0], 0, 0)  # the heights must sum to 410 ft
    notice = TowerChoice(cost_per_m=10, step_m=5 * FOOT_M, threshold_m=200 * FOOT_M, threshold_cost=4000)
    plain = TowerChoice(cost_per_m=10.5, step_m=5 * FOOT_M)
    found = cheapest(region, notice, plain)
    assert found.antenna_a_m / FOOT_M == pytest.approx(200)
    assert found.antenna_b_m / FOOT_M == pytest.approx(210)
    without = cheapest(region, TowerChoice(cost_per_m=10, step_m=5 * FOOT_M), plain)
    assert without.antenna_a_m / FOOT_M == pytest.approx(405)


def test_towers_with_absurdly_many_positions_are_refused_by_name():
    fine = TowerChoice(highest_m=1999, step_m=0.01)
    with pytest.raises(
        InputError, match=r"^heights\.b\.step_m = 0\.01: must leave at most 5000 positions from 1 to 1999 m"
    ):
        cheapest(HILL, TowerChoice(), fine)
    assert cheapest(HILL, TowerChoice(), TowerChoice(step_m=0.1)).cost > 0


@given(regions(), towers(), towers(), st.sampled_from([3.0, 6.0, 12.0, 4.5, 6.096]))
def test_with_diversity_both_antennas_of_a_tower_stand_on_free_positions(region, tower_a, tower_b, spacing):
    """Brute force over all pairs of main positions whose lower position is free too is the second opinion."""
    whole = [abs(spacing / tower.step_m - round(spacing / tower.step_m)) < 1e-7 for tower in (tower_a, tower_b)]
    if not all(whole):
        with pytest.raises(
            InputError, match=r"^availability\.diversity\.spacing_m = .* whole number of steps of heights"
        ):
            cheapest(region, tower_a, tower_b, spacing_m=spacing)
        return
    mains = [
        [height for height in free_positions(tower) if np.abs(free_positions(tower) - height + spacing).min() < 1e-6]
        for tower in (tower_a, tower_b)
    ]
    good = [pair for pair in itertools.product(*mains) if surplus(region, *pair) >= -ROUNDING_M]
    found = cheapest(region, tower_a, tower_b, spacing_m=spacing)
    if isinstance(found, NoPair):
        assert not good
        return
    least = min(float(height_cost(tower_a, a) + height_cost(tower_b, b)) for a, b in good)
    assert found.cost == pytest.approx(least, abs=1e-6)
    for main, tower in ((found.antenna_a_m, tower_a), (found.antenna_b_m, tower_b)):
        assert main - spacing >= tower.lowest_m - ROUNDING_M
        assert np.abs(free_positions(tower) - (main - spacing)).min() < ROUNDING_M


def test_a_tower_too_short_for_the_spacing_is_said_to_be():
    """Positions of 20 to 28 m hold no two that are 10 m apart."""
    short = TowerChoice(lowest_m=20, highest_m=28)
    found = cheapest(HILL, TowerChoice(), short, spacing_m=10)
    assert str(found.reason) == (
        "no pair: tower B offers no two positions 10.0 m apart for the diversity pair, 20.0 m to 28.0 m"
    )
    assert not found.taken_to_blame
    taken = cheapest(HILL, TowerChoice(highest_m=90), TowerChoice(taken_m=(75,), taken_clearance_m=70), spacing_m=10)
    assert str(taken.reason) == (
        "no pair: every position of tower B is taken, or too close to a taken one, or the one 10.0 m below it is"
    )
    assert taken.taken_to_blame


def test_equally_cheap_pairs_give_the_least_taller_antenna():
    region = clearing_region([0, 5e3, 10e3], [0, 30, 0], 0, 0)
    assert cheapest(region, TowerChoice(), TowerChoice()) == Choice(30.0, 30.0, 60.0)


def test_a_requirement_met_up_to_rounding_is_met():
    region = clearing_region([0, 10e3], [312.3 + 10.0, 312.3 + 10.0], 312.3, 312.3)
    assert cheapest(region, TowerChoice(), TowerChoice()) == Choice(10.0, 10.0, 20.0)
    assert round_up(10.0000000001, TowerChoice()) == 10.0


def test_taken_positions_push_the_antenna_up_or_block_the_tower():
    fixed = TowerChoice(lowest_m=30, highest_m=30)
    # with B at 30 m: (100 + a)·0.6 + 150·0.4 >= 160, so A needs 66.67 m
    assert cheapest(HILL, TowerChoice(), fixed).antenna_a_m == 67
    taken = TowerChoice(taken_m=(67.5,), taken_clearance_m=1.5)
    assert cheapest(HILL, taken, fixed).antenna_a_m == 69
    blocked = cheapest(HILL, TowerChoice(highest_m=68, taken_m=(67.5,), taken_clearance_m=1.5), fixed)
    assert blocked.taken_to_blame
    assert blocked.best_a_m == 66
    full = cheapest(HILL, TowerChoice(highest_m=3, taken_m=(2,), taken_clearance_m=5), fixed)
    assert str(full.reason) == "no pair: every position of tower A is taken, or too close to a taken one"
    assert math.isnan(full.best_a_m)
    assert not full.taken_to_blame


def test_no_pair_says_what_would_have_to_change():
    """At 40 and 40 m the ray is at 140·0.6 + 160·0.4 = 148 m over the crest of 160 m: 12 m short."""
    found = cheapest(HILL, TowerChoice(highest_m=40), TowerChoice(highest_m=40))
    assert str(found.reason) == (
        "no pair clears: at the highest there is, A 40.0 m and B 40.0 m, the ray is still 12.0 m short 4.00 km from A"
    )
    assert found.reason.text(feet=True).endswith(
        "A 131.2 ft and B 131.2 ft, the ray is still 39.4 ft short 2.49 mi from A"
    )
    assert [(place.distance_m, place.by_m) for place in found.lower] == [(4e3, pytest.approx(12.0))]
    ways = (found.raise_a_to_m, found.raise_b_to_m, found.raise_both_by_m)
    assert ways == pytest.approx((60.0, 70.0, 12.0))
    assert found.proven


def test_many_obstacles_are_all_listed_and_the_tallest_named():
    crests = [60.0 + i if i % 2 else 0.0 for i in range(16)]
    region = clearing_region(np.arange(17) * 1e3, [*crests, 0.0], 0, 0)
    found = cheapest(region, TowerChoice(highest_m=20), TowerChoice(highest_m=20))
    assert [place.by_m for place in found.lower] == [55.0, 53.0, 51.0, 49.0, 47.0, 45.0, 43.0, 41.0]


def test_no_height_of_a_helps_an_antenna_b_in_its_own_cover():
    found = cheapest(HILL, TowerChoice(), TowerChoice(highest_m=8))
    assert found.raise_a_to_m is None
    assert [(place.distance_m, round(place.by_m, 6)) for place in found.lower] == [(10e3, 2.0)]


def test_a_fixed_antenna_below_its_own_cover_has_no_partner():
    found = least_other(HILL, fixed_b_m=9.0)
    assert str(found.reason) == (
        "no antenna A helps: antenna B at 9.0 m stands 1.0 m too low at its own site, where 10.0 m are needed"
    )
    assert found.raise_b_to_m == pytest.approx(10.0)
    assert [(place.distance_m, place.by_m) for place in found.lower] == [(10e3, pytest.approx(1.0))]


def test_least_other_by_hand():
    """100 + a at A and 150 at B: 0.6·(100 + a) + 0.4·150 = 160 gives a = 66.67; 0.6·150 + 0.4·(120 + b): b = 55."""
    assert least_other(HILL, fixed_b_m=30.0).height_m == pytest.approx(200 / 3)
    assert least_other(HILL, fixed_a_m=50.0).height_m == pytest.approx(55.0)
    assert least_other(HILL, fixed_a_m=1000.0).distance_m == 10e3  # high enough: B's own cover decides


@pytest.mark.parametrize(
    ("fixed", "match"),
    [
        ({}, "must be exactly one height"),
        ({"fixed_a_m": 5.0, "fixed_b_m": 5.0}, "must be exactly one height"),
        ({"fixed_a_m": 0.0}, r"fixed_a_m = 0\.0: must be more than 0 m above ground"),
        ({"fixed_b_m": -2.0}, r"fixed_b_m = -2\.0: must be more than 0 m above ground"),
        ({"fixed_b_m": math.nan}, "fixed_b_m = nan: must be more than 0 m above ground"),
    ],
)
def test_a_fixed_height_must_be_a_height(fixed, match):
    with pytest.raises(InputError, match=match):
        least_other(HILL, **fixed)


def test_positions_are_whole_steps_and_a_zero_range_is_one_height():
    assert all_positions(TowerChoice(lowest_m=1.2, highest_m=4.0)).tolist() == [2.0, 3.0, 4.0]
    feet = all_positions(TowerChoice(lowest_m=5 * FOOT_M, highest_m=200 * FOOT_M, step_m=5 * FOOT_M))
    np.testing.assert_allclose(feet / FOOT_M, np.arange(5, 201, 5))
    assert all_positions(TowerChoice(lowest_m=12.3, highest_m=12.3)).tolist() == [12.3]
    fixed = TowerChoice(lowest_m=70.5, highest_m=70.5)
    assert cheapest(HILL, fixed, fixed) == Choice(70.5, 70.5, 141.0)


def test_contradictory_limits_are_refused():
    narrow = TowerChoice(lowest_m=30.2, highest_m=30.8)
    for towers, end in (((narrow, TowerChoice()), "a"), ((TowerChoice(), narrow), "b")):
        limits = rf"^heights\.{end}\.lowest_m = 30\.2, heights\.{end}\.highest_m = 30\.8: must hold a whole step of 1 m"
        with pytest.raises(InputError, match=limits):
            cheapest(HILL, *towers)
    with pytest.raises(InputError, match="highest_m = 5: must be at least lowest_m = 10"):
        TowerChoice(lowest_m=10, highest_m=5)
    with pytest.raises(InputError, match="cost_per_m = -1: must be 0 to 1000000000"):
        TowerChoice(cost_per_m=-1)
