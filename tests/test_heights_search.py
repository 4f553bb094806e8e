"""Heights by loss or objective, diversity pairs and the mounting sheet."""

import math
from functools import partial

import numpy as np
import pytest

from profiler.diffraction import delta_bullington, knife_edge_loss
from profiler.errors import InputError
from profiler.geometry import fresnel_radius
from profiler.heights import (
    Choice,
    NoPair,
    check_diversity,
    clearing_region,
    heights_for_loss,
    heights_within,
    least_equal,
    least_ray,
    mounting_sheet,
)
from profiler.models import Rule, TowerChoice
from profiler.units import MEAN_EARTH_RADIUS_M

FOOT_M = 0.3048
EDGE_X = np.array([0.0, 4e3, 10e3])


def edge_loss(centre_a, centre_b):
    """Loss over a knife edge of 160 m at 4 km of a 10 km hop, 6 GHz."""
    ray = 0.6 * centre_a + 0.4 * centre_b
    return float(knife_edge_loss((160 - ray) * math.sqrt(2 / 0.049965 * (1 / 4e3 + 1 / 6e3))))


def test_grazing_a_knife_edge_is_the_heights_for_its_published_loss():
    """J(0) = 6.03 dB (Rec. ITU-R P.526-15 §4.1), so a limit of 6.03 dB asks for the grazing ray, to 0.02 m.

    J falls by 7.9 dB per unit of ν there, and ν by 0.129 per metre: the third digit of 6.03 is 0.005 dB, 5 mm.
    """
    tower = TowerChoice(lowest_m=1, highest_m=150)
    found = heights_for_loss(edge_loss, 6.03, grounds_m=(100, 100), surfaces_m=(100, 100), tower_a=tower, tower_b=tower)
    grazing = clearing_region(EDGE_X, [100, 160, 100], 100, 100)
    assert found.least_equal_m == pytest.approx(least_equal(grazing).height_m, abs=0.02)
    assert found.holds_above
    assert isinstance(found.cheapest, Choice)


def test_every_pair_of_the_staircase_is_good_and_a_step_less_is_not():
    tower_a, tower_b = TowerChoice(step_m=5 * FOOT_M), TowerChoice(taken_m=(61,), cost_per_m=3)
    found = heights_for_loss(
        edge_loss, 3.0, grounds_m=(100, 100), surfaces_m=(100, 112), tower_a=tower_a, tower_b=tower_b
    )
    loss = np.array([edge_loss(100 + a, 100 + b) for a, b in found.frontier_m])
    assert np.all(loss <= 3.0)
    lower = [edge_loss(100 + a, 100 + b - 1) for a, b in found.frontier_m if b not in (12, 61 + 1)]
    assert min(lower) > 3.0
    assert np.all(np.diff(found.frontier_m[:, 0]) > 0)
    assert np.all(np.diff(found.frontier_m[:, 1]) < 0)
    assert found.frontier_m[:, 1].min() == 12  # the surface at B, never asked below it
    assert 61 not in found.frontier_m[:, 1]
    cost = found.frontier_m @ [1, 3]
    assert found.cheapest.cost == pytest.approx(cost.min())


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
    found = heights_for_loss(loss, 6.0, grounds_m=ends, surfaces_m=ends, tower_a=tower, tower_b=tower)
    h = found.least_equal_m
    assert loss(ends[0] + h, ends[1] + h) <= 6.0 < loss(ends[0] + h - 0.02, ends[1] + h - 0.02)
    for a, b in found.frontier_m:
        assert loss(ends[0] + a, ends[1] + b) <= 6.0
    stricter = heights_for_loss(loss, 1.0, grounds_m=ends, surfaces_m=ends, tower_a=tower, tower_b=tower)
    assert stricter.least_equal_m > h
    # 6 dB is about grazing, the full first zone costs nothing: the clearance rule asks for more than 6 dB does
    zone = clearing_region(distance, least_ray(distance, ground, 6e9, [Rule(4 / 3, 1.0)]), *ends)
    assert h < least_equal(zone).height_m


def test_a_limit_that_cannot_be_met_says_by_how_much():
    tower = TowerChoice(highest_m=20)
    found = heights_for_loss(edge_loss, 5.0, grounds_m=(100, 100), surfaces_m=(100, 100), tower_a=tower, tower_b=tower)
    over = edge_loss(120, 120) - 5.0
    assert found.least_equal_m is None
    assert found.frontier_m.shape == (0, 2)
    assert found.cheapest.reason == (
        "no pair found: at the highest there is, A 20.00 m and B 20.00 m, "
        f"the diffraction loss is {over:.2f} dB over its limit"
    )
    assert not found.cheapest.proven


def test_an_antenna_in_its_own_cover_is_said_to_be():
    tower = TowerChoice(highest_m=20)
    found = heights_for_loss(edge_loss, 50.0, grounds_m=(100, 100), surfaces_m=(130, 100), tower_a=tower, tower_b=tower)
    assert "an antenna stands inside its own cover" in found.cheapest.reason


def test_an_objective_that_is_not_monotone_is_reported():
    """Outage over its objective in percent: met from 30 m, lost again above 60 m."""
    tower = TowerChoice(lowest_m=10, highest_m=80)
    found = heights_within(lambda a, b: abs((a + b) / 2 - 45) - 15, tower, tower, what="outage", unit="%")
    assert found.least_equal_m == pytest.approx(30, abs=0.011)
    assert not found.holds_above


def test_searches_with_nothing_to_search():
    full = TowerChoice(highest_m=3, taken_m=(2,), taken_clearance_m=9)
    found = heights_within(lambda a, b: -1.0, full, TowerChoice())
    assert found.cheapest.reason == "no pair: every position of tower A is taken, or too close to one"
    apart = heights_within(lambda a, b: -1.0, TowerChoice(highest_m=10), TowerChoice(lowest_m=20, highest_m=40))
    assert apart.least_equal_m is None  # no height is in both ranges
    assert apart.cheapest == Choice(1.0, 20.0, 21.0)
    assert math.isclose(heights_within(lambda a, b: -1.0, *[TowerChoice()] * 2).least_equal_m, 1.0)
    with pytest.raises(InputError, match=r"limit_db = -1: must be 0 dB or more"):
        heights_for_loss(edge_loss, -1, grounds_m=(0, 0), surfaces_m=(0, 0), tower_a=full, tower_b=full)


def diversity(**changes):
    given = {"antenna_a_m": 70, "antenna_b_m": 60, "spacing_m": 10, "obstruction": "isolated", "median_k": 4 / 3}
    return check_diversity([0, 15e3, 40e3], [0, 40, 0], 0, 0, 6e9, **(given | changes))


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
    assert a.notes == (
        "A: the lower antenna at 60.00 m needs 63.32 m: raise the main antenna to 73.32 m, or space them by 6.68 m",
    )
    assert a.spacing_wavelengths == pytest.approx(200.1, abs=0.05)  # λ at 6 GHz is 0.049965 m
    wide = diversity(spacing_m=25)[0]
    assert not wide.spacing_in_data
    assert "outside 3 to 23 m" in wide.notes[1]
    near = diversity(antenna_a_m=100, antenna_b_m=100, spacing_m=2)[0]
    assert near.clears
    assert near.clears_more_than_needed
    assert not near.spacing_wide_enough
    assert near.notes[-1].endswith("is 40 wavelengths; 150 or more are common practice")


def test_raising_the_main_antenna_as_told_clears_the_lower_one():
    told = diversity()[0].main_for_spacing_m
    assert diversity(antenna_a_m=told)[0].clears
    assert not diversity(antenna_a_m=told - 0.01)[0].clears


def test_diversity_with_no_way_out_says_so():
    trees = check_diversity(
        [0, 15e3, 40e3],
        [0, 0, 80],
        0,
        0,
        6e9,
        antenna_a_m=70,
        antenna_b_m=60,
        spacing_m=10,
        obstruction="extended",
        median_k=4 / 3,
    )
    assert "cannot be helped by height" in trees[0].notes[0]
    assert "space them" not in trees[1].notes[0]
    with pytest.raises(InputError, match='obstruction = \'hill\': must be "isolated" or "extended"'):
        diversity(obstruction="hill")
    with pytest.raises(InputError, match="spacing_m = 0: must be more than 0 m"):
        diversity(spacing_m=0)


def test_a_lower_antenna_in_the_ground_is_a_finding_not_an_error():
    """Main antennas too short for the spacing, over a valley that asks for nothing: the ground itself is the limit."""
    ends = check_diversity(
        [0, 5e3, 10e3],
        [0, -200, 0],
        0,
        0,
        6e9,
        antenna_a_m=8,
        antenna_b_m=12,
        spacing_m=10,
        obstruction="isolated",
        median_k=4 / 3,
    )
    assert [end.clears for end in ends] == [False, True]
    assert ends[0].notes[0] == (
        "A: the lower antenna at -2.00 m needs 0.00 m: raise the main antenna to 10.00 m, or space them by 8.00 m"
    )


def sheet(**changes):
    x = np.array([0, 20e3, 40e3])
    given = {"antenna_a_m": 45.9, "antenna_b_m": 45.9}
    given |= {"tower_a": TowerChoice(step_m=5 * FOOT_M), "tower_b": TowerChoice()}
    return mounting_sheet(x, [312.3, 300, 290], 312.3, 290, 6e9, [Rule(4 / 3, 1.0, 0, "full")], **(given | changes))


def test_the_sheet_rounds_up_converts_and_checks_again():
    found = sheet()
    a, b = found.end_a, found.end_b
    assert (a.antenna_ft, b.antenna_m) == (pytest.approx(155), 46)  # 45.9 m is 150.6 ft
    assert a.centre_m == pytest.approx(312.3 + 155 * FOOT_M)
    assert a.centre_ft == pytest.approx(312.3 / FOOT_M + 155)
    assert b.ground_ft == pytest.approx(951.44, abs=0.005)  # 290/0.3048
    assert found.passes
    assert found.checks[0].rule.label == "full"
    assert found.checks[0].surplus_m[1] == pytest.approx((a.centre_m + 336) / 2 - 300 - 23.54 - 22.35, abs=0.01)
    assert not sheet(antenna_a_m=20, antenna_b_m=20).passes


def test_a_sheet_for_a_full_or_low_tower_says_so():
    low = sheet(tower_b=TowerChoice(highest_m=45))
    assert isinstance(low, NoPair)
    assert low.reason == "antenna B: no free position at or above 45.90 m; raise the limit, or free a position"
    assert (low.best_b_m, low.raise_a_to_m, low.raise_b_to_m) == (45, None, 45.9)


def test_exactly_at_the_cover_passes_up_to_rounding():
    """312.3 + 10 - 322.3 is -5.7e-14 m in float64: no antenna goes up a step for that."""
    found = mounting_sheet(
        [0, 5e3],
        [322.3, 322.3],
        312.3,
        312.3,
        6e9,
        [Rule(math.inf, 0.0)],
        antenna_a_m=10,
        antenna_b_m=10,
        tower_a=TowerChoice(),
        tower_b=TowerChoice(),
    )
    assert found.passes
