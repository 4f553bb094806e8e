"""Heights by loss or objective, diversity pairs and the mounting sheet."""

import math
from functools import partial

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from profiler.diffraction import delta_bullington, knife_edge_loss
from profiler.errors import InputError
from profiler.geometry import ROUNDING_M, Surface, check_rule, fresnel_radius, hold_rules
from profiler.heights import (
    Choice,
    NoPair,
    cheapest,
    cheapest_by_trial,
    check_diversity,
    clearing_region,
    heights_within,
    least_equal,
    least_ray,
    loss_excess,
    lower_rules,
    mounting_sheet,
    surplus,
)
from profiler.heights.tower_positions import free_positions
from profiler.models import Rule, TowerChoice
from profiler.patches import Patches
from profiler.units import MEAN_EARTH_RADIUS_M

FOOT_M = 0.3048
EDGE_X = np.array([0.0, 4e3, 10e3])


def edge_loss(centre_a, centre_b):
    """Loss over a knife edge of 160 m at 4 km of a 10 km hop, 6 GHz."""
    ray = 0.6 * centre_a + 0.4 * centre_b
    return float(knife_edge_loss((160 - ray) * math.sqrt(2 / 0.049965 * (1 / 4e3 + 1 / 6e3))))


def bare_edge(limit_db, surfaces_m=(100, 100)):
    """Hold the loss over the knife edge to a limit, sites at 100 m."""
    return loss_excess(edge_loss, limit_db, grounds_m=(100, 100), surfaces_m=surfaces_m)


def test_grazing_a_knife_edge_is_the_heights_for_its_published_loss():
    """J(0) = 6.03 dB (Rec. ITU-R P.526-15 §4.1), so a limit of 6.03 dB asks for the grazing ray, to 0.02 m.

    J falls by 7.9 dB per unit of ν there, and ν by 0.129 per metre: the third digit of 6.03 is 0.005 dB, 5 mm.
    """
    tower = TowerChoice(lowest_m=1, highest_m=150)
    found = heights_within(bare_edge(6.03), tower, tower)
    grazing = clearing_region(EDGE_X, [100, 160, 100], 100, 100)
    assert found.least_equal_m == pytest.approx(least_equal(grazing).height_m, abs=0.02)
    assert found.holds_above
    assert isinstance(found.cheapest, Choice)


@pytest.mark.parametrize("surface_b_m", [100, 112])
@pytest.mark.parametrize("step_m", [0.1, 1.0, 5 * FOOT_M])
def test_every_pair_found_is_good_and_no_pair_around_the_cheapest_is_cheaper_than_said(step_m, surface_b_m):
    """Loss over an edge falls strictly with either height, so around the cheapest pair all cheaper ones are bad."""
    tower_a, tower_b = TowerChoice(step_m=step_m), TowerChoice(taken_m=(61,), cost_per_m=3)
    found = heights_within(bare_edge(3.0, (100, surface_b_m)), tower_a, tower_b)
    assert max(edge_loss(100 + a, 100 + b) for a, b in found.frontier_m) <= 3.0
    assert np.all(np.diff(found.frontier_m[:, 0]) > 0)
    assert np.all(np.diff(found.frontier_m[:, 1]) < 0)
    assert found.frontier_m[:, 1].min() > surface_b_m - 100  # never inside the cover
    best = found.cheapest
    assert found.cheaper_by_at_most < 2
    for a in best.antenna_a_m + step_m * np.arange(-20, 21):
        for b in best.antenna_b_m + np.arange(-6, 7):
            good = 1 <= a <= 150 and b > surface_b_m - 100 and b != 61 and edge_loss(100 + a, 100 + b) <= 3.0
            assert not good or a + 3 * b >= best.cost - found.cheaper_by_at_most - 1e-6


@pytest.mark.parametrize(("step_m", "highest_m"), [(1.0, 60), (0.1, 300), (1.0, 1999)])
def test_the_number_of_trials_is_bounded_and_counted(step_m, highest_m):
    asked = []

    def excess(a, b):
        asked.append((a, b))
        return edge_loss(100 + a, 100 + b) - 3.0

    tower = TowerChoice(step_m=step_m, highest_m=highest_m)
    found = heights_within(excess, tower, tower)
    assert found.trials == len(asked) == len(set(asked)) < 260


def test_the_step_just_below_a_cost_threshold_is_found():
    """14 CFR 77.9(a) as an example: what stands above 60.96 m costs more, so A takes the last step under it."""
    notice = TowerChoice(cost_per_m=10, step_m=0.1, threshold_m=60.96, threshold_cost=4000)
    found = heights_within(bare_edge(3.0), notice, TowerChoice(cost_per_m=15, step_m=0.1))
    assert found.cheapest.antenna_a_m == pytest.approx(60.9)
    lower = edge_loss(100 + 60.9, 100 + found.cheapest.antenna_b_m - 0.1)
    assert lower > 3.0 >= edge_loss(160.9, 100 + found.cheapest.antenna_b_m)


def test_trial_agrees_with_the_exact_choice_where_the_limit_is_a_straight_line():
    """The cheapest of the clearing region, found by trial: no dearer than it says that it can be."""
    region = clearing_region(EDGE_X, [100, 160, 100], 100, 100)
    towers = TowerChoice(cost_per_m=2, step_m=0.5), TowerChoice(cost_per_m=1.1, step_m=0.5)
    free = [np.arange(2, 301) * 0.5] * 2
    choice, _, slack = cheapest_by_trial(lambda a, b: -float(surplus(region, a, b)), *free, *towers)
    exact = cheapest(region, *towers)
    assert exact.cost <= choice.cost <= exact.cost + slack + 1e-9
    assert slack < 2


@given(st.lists(st.floats(0, 70), min_size=3, max_size=8), st.floats(0.3, 3), st.none() | st.floats(10, 90))
def test_the_cheapest_by_trial_is_never_dearer_than_it_says(required, cost_per_m, threshold_m):
    region = clearing_region(np.linspace(0, 20e3, len(required)), required, 0.0, 0.0)
    tower_a = TowerChoice(cost_per_m=cost_per_m, threshold_m=threshold_m, threshold_cost=40)
    tower_b = TowerChoice(step_m=0.5, taken_m=(33.0, 61.0))
    free = free_positions(tower_a), free_positions(tower_b)
    asked = []

    def excess(a, b):
        asked.append((a, b))
        return -float(surplus(region, a, b)) - ROUNDING_M

    choice, pairs, slack = cheapest_by_trial(excess, *free, tower_a, tower_b)
    exact = cheapest(region, tower_a, tower_b)
    assert len(asked) < 200
    assert (choice is None) == isinstance(exact, NoPair)
    if choice is not None:
        assert exact.cost - 1e-9 <= choice.cost <= exact.cost + slack + 1e-9
        assert np.all(surplus(region, pairs[:, 0], pairs[:, 1]) >= -2 * ROUNDING_M)


def test_loss_limit_on_a_real_profile(reference):
    """Delta-Bullington over the ITU-R validation profile 3 at k = 4/3: least heights pass, 2 cm less does not."""
    table = np.loadtxt(reference / "p526_profile_path_3.csv", delimiter=",", skiprows=1)
    distance, ground = table[:, 0] * 1e3, table[:, 1]
    effective = 4 / 3 * MEAN_EARTH_RADIUS_M
    parts = partial(delta_bullington, distance, ground, frequency_hz=6e9, effective_radius_m=effective)

    def loss(a, b):
        return float(parts(centre_a_m=a, centre_b_m=b).total_db)

    ends = float(ground[0]), float(ground[-1])
    tower = TowerChoice(lowest_m=2, highest_m=80, step_m=2)
    found = heights_within(loss_excess(loss, 6.0, grounds_m=ends, surfaces_m=ends), tower, tower)
    h = found.least_equal_m
    assert loss(ends[0] + h, ends[1] + h) <= 6.0 < loss(ends[0] + h - 0.02, ends[1] + h - 0.02)
    for a, b in found.frontier_m:
        assert loss(ends[0] + a, ends[1] + b) <= 6.0
    stricter = heights_within(loss_excess(loss, 1.0, grounds_m=ends, surfaces_m=ends), tower, tower)
    assert stricter.least_equal_m > h
    # 6 dB is about grazing, the full first zone costs nothing: the clearance rule asks for more than 6 dB does
    zone = clearing_region(distance, least_ray(distance, ground, 6e9, [Rule(4 / 3, 1.0)]), *ends)
    assert h < least_equal(zone).height_m


def test_a_limit_that_cannot_be_met_says_by_how_much():
    tower = TowerChoice(highest_m=20)
    found = heights_within(bare_edge(5.0), tower, tower)
    over = edge_loss(120, 120) - 5.0
    assert found.least_equal_m is None
    assert found.frontier_m.shape == (0, 2)
    assert str(found.cheapest.reason) == (
        "no pair found: at the highest there is, A 20.0 m and B 20.0 m, "
        f"the diffraction loss is {over:.2f} dB over its limit"
    )
    assert not found.cheapest.proven


def test_an_antenna_in_its_own_cover_is_said_to_be():
    tower = TowerChoice(highest_m=20)
    found = heights_within(bare_edge(50.0, (130, 100)), tower, tower)
    assert "an antenna stands inside its own cover" in str(found.cheapest.reason)


def test_an_objective_that_is_not_monotone_is_reported():
    """Outage over its objective in percent: met from 30 m, lost again above 60 m."""
    tower = TowerChoice(lowest_m=10, highest_m=80)
    found = heights_within(lambda a, b: abs((a + b) / 2 - 45) - 15, tower, tower, what="outage", unit="%")
    assert found.least_equal_m == pytest.approx(30, abs=0.011)
    assert not found.holds_above


def test_searches_with_nothing_to_search():
    full = TowerChoice(highest_m=3, taken_m=(2,), taken_clearance_m=9)
    found = heights_within(lambda a, b: -1.0, full, TowerChoice())
    assert str(found.cheapest.reason) == "no pair: every position of tower A is taken, or too close to a taken one"
    apart = heights_within(lambda a, b: -1.0, TowerChoice(highest_m=10), TowerChoice(lowest_m=20, highest_m=40))
    assert apart.least_equal_m is None  # no height is in both ranges
    assert apart.cheapest == Choice(1.0, 20.0, 21.0)
    assert math.isclose(heights_within(lambda a, b: -1.0, *[TowerChoice()] * 2).least_equal_m, 1.0)
    with pytest.raises(InputError, match=r"limit_db = -1: must be finite and 0 dB or more"):
        bare_edge(-1)


def diversity(**changes):
    given = {"antenna_a_m": 70, "antenna_b_m": 60, "spacing_m": 10, "obstruction": "isolated"} | changes
    return check_lower([0, 15e3, 40e3], [0, 40, 0], **given)


def check_lower(distance, surface, *, obstruction, **given):
    """Hold lower antennas against a bare profile at k = 4/3 and 6 GHz, sites at 0 m."""
    rays = least_ray(distance, surface, 6e9, lower_rules(obstruction, 4 / 3))
    least, full = (clearing_region(distance, ray, 0, 0) for ray in rays)
    return check_diversity(least, full, 6e9, obstruction=obstruction, **given)


@pytest.mark.parametrize(
    ("obstruction", "fractions"),
    # Rec. ITU-R P.530-18 §2.2.2.2 step 2, from memory of the text
    [("isolated", (0.0, 0.3)), ("extended", (0.3, 0.6))],
)
def test_lower_antennas_by_p530_by_hand(obstruction, fractions):
    """Crest of 40 m at 15 km of 40 km: bulge 15·25/(12.742·4/3) = 22.07 m, F1 = 17.31·sqrt(15·25/(6·40)) = 21.64 m.

    Lower A against main B at 60 m: (25·a + 15·60)/40 = c, so a = (40·c - 900)/25; lower B: (40·c - 25·70)/15.
    """
    ends = diversity(obstruction=obstruction)
    for fraction, name in zip(fractions, ("least_m", "full_m"), strict=True):
        c = 40 + 22.07 + fraction * 21.64
        assert getattr(ends[0], name) == pytest.approx((40 * c - 900) / 25, abs=0.03)
        assert getattr(ends[1], name) == pytest.approx((40 * c - 1750) / 15, abs=0.03)
    assert ends[0].fractions == fractions
    assert fresnel_radius(15e3, 25e3, 6e9) == pytest.approx(21.64, abs=0.005)


def test_spacing_is_checked_against_the_data_and_the_wavelength():
    a, b = diversity()
    assert (a.lower_m, b.lower_m, a.clears, b.clears) == (60, 50, False, True)
    # 375/(12.742·4/3) = 22.0727 m of bulge: (40 × 62.0727 - 900)/25 = 63.316 m
    assert tuple(map(str, a.notes)) == (
        "A: the lower antenna at 60.00 m needs 63.32 m: raise the main antenna to 73.32 m, or space them by 6.68 m",
    )
    assert a.spacing_wavelengths == pytest.approx(200.1, abs=0.05)  # λ at 6 GHz is 0.049965 m
    wide = diversity(spacing_m=25)[0]
    assert not wide.spacing_in_data
    assert "outside 3 m to 23 m" in str(wide.notes[1])
    near = diversity(antenna_a_m=100, antenna_b_m=100, spacing_m=2)[0]
    assert near.clears
    assert near.clears_more_than_needed
    assert not near.spacing_wide_enough
    assert str(near.notes[-1]).endswith("is 40 wavelengths; 150 or more are common practice")


def test_raising_the_main_antenna_as_told_clears_the_lower_one():
    told = diversity()[0].main_for_spacing_m
    assert diversity(antenna_a_m=told)[0].clears
    assert not diversity(antenna_a_m=told - 0.01)[0].clears


def test_diversity_with_no_way_out_says_so():
    trees = check_lower(
        [0, 15e3, 40e3], [0, 0, 80], antenna_a_m=70, antenna_b_m=60, spacing_m=10, obstruction="extended"
    )
    assert "cannot be helped by height" in str(trees[0].notes[0])
    assert "space them" not in str(trees[1].notes[0])
    with pytest.raises(InputError, match='obstruction = \'hill\': must be "isolated" or "extended"'):
        diversity(obstruction="hill")
    with pytest.raises(InputError, match="spacing_m = 0: must be finite and more than 0 m"):
        diversity(spacing_m=0)


def test_a_lower_antenna_in_the_ground_is_a_finding_not_an_error():
    """Main antennas too short for the spacing, over a valley that asks for nothing: the ground itself is the limit."""
    valley = {"antenna_a_m": 8, "antenna_b_m": 12, "spacing_m": 10, "obstruction": "isolated"}
    ends = check_lower([0, 5e3, 10e3], [0, -200, 0], **valley)
    assert [end.clears for end in ends] == [False, True]
    assert str(ends[0].notes[0]) == (
        "A: the lower antenna at −2.00 m needs 0.00 m: raise the main antenna to 10.00 m, or space them by 8.00 m"
    )
    on_tower = check_lower([0, 5e3, 10e3], [0, -200, 0], **valley, lowest_m=(5.0, 5.0))
    assert [(end.clears, end.least_m) for end in on_tower] == [(False, 5.0), (False, 5.0)]
    assert on_tower[1].main_for_spacing_m == 15.0


heights = st.floats(0, 150)


@given(
    st.lists(st.floats(0, 80), min_size=3, max_size=12),
    st.sampled_from(["isolated", "extended"]),
    heights,
    heights,
    st.floats(1, 30),
)
def test_the_region_with_lower_rays_is_where_both_lower_antennas_clear(surface, obstruction, a, b, spacing):
    """The rays from each lower antenna to the far main one, held by the forward model, against the region."""
    distance = np.linspace(0, 30e3, len(surface))
    rule = lower_rules(obstruction, 4 / 3)[0]
    ray = least_ray(distance, surface, 6e9, [rule])
    share = distance / distance[-1]
    region = clearing_region(distance, ray + spacing * np.stack((1 - share, share)), 0, 0)
    forward = [
        float(check_rule(distance, surface, a - down_a, b - down_b, 6e9, rule).surplus_m.min())
        for down_a, down_b in ((spacing, 0), (0, spacing))
    ]
    assert float(surplus(region, a, b)) == pytest.approx(min(forward), abs=1e-8)
    ends = check_lower(distance, surface, obstruction=obstruction, antenna_a_m=a, antenna_b_m=b, spacing_m=spacing)
    if abs(min(forward)) > 1e-4:
        above_own = a >= surface[0] and b >= surface[-1]
        assert (min(forward) >= 0) == (above_own and all(end.clears for end in ends))


def over_path(distance_m, surface_m, patches=None):
    """Hold rules over ground without cover, as a mounting sheet asks for it."""
    return partial(hold_rules, Surface(distance_m, surface_m, 0 * surface_m, patches), frequency_hz=6e9)


def sheet(**changes):
    x = np.array([0, 20e3, 40e3])
    given = {"antenna_a_m": 45.9, "antenna_b_m": 45.9}
    given |= {"tower_a": TowerChoice(step_m=5 * FOOT_M), "tower_b": TowerChoice()}
    hold = over_path(x, np.array([312.3, 300, 290]))
    return mounting_sheet(hold, 312.3, 290, [Rule(4 / 3, 1.0, 0, "full")], **(given | changes))


def test_the_sheet_rounds_up_converts_and_checks_again():
    found = sheet()
    a, b = found.end_a, found.end_b
    assert (a.antenna_ft, b.antenna_m) == (pytest.approx(155), 46)  # 45.9 m is 150.6 ft
    assert a.centre_m == pytest.approx(312.3 + 155 * FOOT_M)
    assert a.centre_ft == pytest.approx(312.3 / FOOT_M + 155)
    assert b.ground_ft == pytest.approx(951.44, abs=0.005)  # 290/0.3048
    assert found.passes
    check = found.rays[0].held.check
    assert check.rule.label == "full"
    assert not found.beside
    assert check.surplus_m[1] == pytest.approx((a.centre_m + 336) / 2 - 300 - 23.54 - 22.35, abs=0.01)
    assert not sheet(antenna_a_m=20, antenna_b_m=20).passes


def test_a_sheet_for_a_full_or_low_tower_says_so():
    low = sheet(tower_b=TowerChoice(highest_m=45))
    assert isinstance(low, NoPair)
    assert str(low.reason) == "antenna B: its tower has no free position at or above 45.9 m"
    assert (low.best_b_m, low.raise_a_to_m, low.raise_b_to_m) == (45, None, 45.9)


def test_exactly_at_the_cover_passes_up_to_rounding():
    """312.3 + 10 - 322.3 is -5.7e-14 m in float64: no antenna goes up a step for that."""
    found = mounting_sheet(
        over_path(np.array([0, 5e3]), np.array([322.3, 322.3])),
        312.3,
        312.3,
        [Rule(math.inf, 0.0)],
        antenna_a_m=10,
        antenna_b_m=10,
        tower_a=TowerChoice(),
        tower_b=TowerChoice(),
    )
    assert found.passes


def test_the_sheet_looks_beside_the_path_and_down_to_the_lower_antennas():
    """A wall of 20 m stands 10 m to the right at the middle: on the path nothing, beside it less than F1 is left."""
    wall = Patches(
        along_m=np.array([[19_999.0, 2.0, 0.0]]),
        across_m=np.array([[10.0, 0.0, 1.0]]),
        surface_m=np.array([[20.0, 0, 0, 0, 0, 0]]),
        cover_m=np.zeros((1, 6)),
        window=np.empty((1, 0, 3)),
        whole=np.array([True]),
    )
    x = np.array([0, 20e3, 40e3])
    bare = {"tower_a": TowerChoice(), "tower_b": TowerChoice(), "antenna_a_m": 50, "antenna_b_m": 50}
    path = (over_path(x, 0 * x), 0, 0, [Rule(4 / 3, 1.0)])
    assert mounting_sheet(*path, **bare).passes  # 50 m over 23.54 m of bulge and 22.35 m of F1
    walled = mounting_sheet(over_path(x, 0 * x, wall), *path[1:], **bare)
    assert walled.beside
    assert not walled.passes
    # ray 50 - bulge 23.54 - wall 20 - sqrt(22.35² - 10²) = -13.53 m
    assert walled.rays[0].held.surplus_m == pytest.approx(-13.53, abs=0.02)
    lower = lower_rules("extended", 4 / 3)[0]
    pair = mounting_sheet(*path, **bare, spacing_m=12, lower_rule=lower)
    assert (pair.end_a.lower_m, pair.end_b.lower_m) == (38, 38)
    assert [each.ray for each in pair.rays] == ["main", "lower A", "lower B"]
    # the middle of a ray from 38 m to 50 m: 44 - 23.54 - 0.3 x 22.35 = 13.76 m
    assert pair.rays[1].held.check.surplus_m[1] == pytest.approx(13.76, abs=0.02)
    assert pair.passes
    # 56 m apart both go up to 57 m, the lower ones to 1 m: 29 - 23.54 is 5.46 m, where 0.3 F1 is 6.70 m
    deep = mounting_sheet(*path, **bare, spacing_m=56, lower_rule=lower)
    assert (deep.end_a.antenna_m, deep.end_a.lower_m) == (57, 1)
    assert deep.rays[0].held.passes
    assert not deep.passes
