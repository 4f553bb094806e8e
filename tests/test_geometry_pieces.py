"""profiler.geometry.pieces: parabolas from samples, and the least surplus over them against a dense search."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from profiler.errors import InputError
from profiler.geometry import Parabolas, PathZone, inside_places, least_surplus, zone_places

RADIUS_M = 6_371_000.0


def path_zone(*rows) -> PathZone:
    """Make paths of rows (length, centre A, centre B, wavelength, k, fraction, margin)."""
    return PathZone(*np.array(rows, dtype=float).T)


def dense_least(knot_m, surface: Parabolas, length_m, centre_a_m, centre_b_m, wavelength_m, k, fraction, margin_m):
    """Search one path at 4000 places a piece, crowded at its ends, by formulas written out; surplus and distance."""
    t = 0.5 * (1.0 - np.cos(np.linspace(0.0, np.pi, 4001)))[:, None]
    x = (knot_m[:-1] + np.diff(knot_m) * t).T.ravel()
    height = surface.first_m * (1 - t) + surface.last_m * t + 4 * surface.crown_m * t * (1 - t)
    ray = centre_a_m + (centre_b_m - centre_a_m) * x / length_m
    zone = fraction * np.sqrt(np.maximum(wavelength_m * x * (length_m - x) / length_m, 0.0))
    surplus = ray - height.T.ravel() - x * (length_m - x) / (2 * k * RADIUS_M) - zone - margin_m
    return surplus.min(), x[surplus.argmin()]


@given(first=st.floats(-500, 9000), last=st.floats(-500, 9000), crown=st.floats(-300, 300), share=st.floats(0, 1))
def test_three_heights_inside_give_the_whole_parabola(first, last, crown, share):
    def height(t):
        return first + (last - first) * t + 4 * crown * t * (1 - t)

    fitted = Parabolas.fit([height(np.array(Parabolas.FIT_AT))])
    assert fitted.at([0], [share])[0] == pytest.approx(height(share), abs=1e-9 * (1 + abs(first) + abs(last)))


def test_a_piece_with_a_missing_height_is_missing():
    fitted = Parabolas.fit([[1.0, 2.0, 3.0], [1.0, np.nan, 3.0]])
    assert np.isnan(fitted.first_m).tolist() == np.isnan(fitted.last_m).tolist() == [False, True]


def random_path(rng, pieces):
    """Draw knots at random, steps included, and crowns up to 12 m both ways; antennas, wave and rule of their own."""
    length = rng.uniform(200.0, 60e3)
    knot = np.sort(np.concatenate(([0.0, length], rng.uniform(0.0, length, pieces - 1))))
    first, last = rng.normal(200.0, 40.0, (2, pieces))
    surface = Parabolas(first, last, rng.uniform(-12.0, 12.0, pieces))
    rule = rng.uniform(0.3, 3.0), rng.choice([0.0, 0.3, 0.6, 1.0, 2.0]), rng.uniform(-2.0, 5.0)
    row = length, first[0] + rng.uniform(1, 90), last[-1] + rng.uniform(1, 90), rng.uniform(0.01, 0.3), *rule
    return knot, surface, row


@pytest.mark.parametrize("seed", range(8))
def test_many_paths_at_once_are_what_a_dense_search_finds(seed):
    rng = np.random.default_rng(seed)
    paths = [random_path(rng, int(rng.integers(1, 30))) for _ in range(40)]
    hop = np.repeat(np.arange(len(paths)), [knot.size - 1 for knot, _, _ in paths])
    start, end = (np.concatenate([knot[part] for knot, _, _ in paths]) for part in (slice(-1), slice(1, None)))
    surface = Parabolas(
        *(np.concatenate([getattr(each, name) for _, each, _ in paths]) for name in ("first_m", "last_m", "crown_m"))
    )
    found = least_surplus(hop, start, end, surface, path_zone(*(row for _, _, row in paths)))
    for (knot, each, row), surplus, distance in zip(paths, found.surplus_m, found.distance_m, strict=True):
        least, where = dense_least(knot, each, *row)
        assert surplus == pytest.approx(least, abs=1e-4)
        assert surplus <= least + 1e-5
        # two places may be as tight as one another, to what the search resolves
        alone = dense_least(np.array([distance, distance + 1e-9]), flat(knot, each, distance), *row)[0]
        assert distance == pytest.approx(where, abs=0.02 * row[0]) or alone == pytest.approx(least, abs=1e-4)


def flat(knot, surface, distance) -> Parabolas:
    piece = int(np.clip(np.searchsorted(knot, distance) - 1, 0, knot.size - 2))
    height = surface.at([piece], [(distance - knot[piece]) / (knot[piece + 1] - knot[piece])])
    return Parabolas(height, height, np.zeros(1))


@pytest.mark.parametrize("near_b", [False, True])
@pytest.mark.parametrize("length_m", [30.0, 900.0, 20e3])
def test_from_the_antenna_on_the_radius_rises_as_a_root(length_m, near_b):
    """Ground that rises from the mast: the zone, not the ground, puts the least surplus metres into the first piece."""
    crown, slope = 0.0, 0.02
    first, last = (slope * length_m, 0.0) if near_b else (0.0, slope * length_m)
    surface = Parabolas(np.array([first]), np.array([last]), np.array([crown]))
    row = (length_m, first + 3.0, last + 3.0, 0.2, 4 / 3, 1.0, 0.0)
    found = least_surplus([0], [0.0], [length_m], surface, path_zone(row))
    assert found.surplus_m[0] == pytest.approx(dense_least(np.array([0.0, length_m]), surface, *row)[0], abs=1e-5)


def test_a_crown_hides_no_more_than_it_is():
    """Between two knots 10 m below the ray a crown of 12 m stands 2 m over it, and is found at its own middle."""
    surface = Parabolas(np.full(3, 90.0), np.full(3, 90.0), np.array([0.0, 12.0, 0.0]))
    row = (3e3, 100.0, 100.0, 0.05, np.inf, 0.0, 0.0)
    found = least_surplus(np.zeros(3, int), [0.0, 1e3, 2e3], [1e3, 2e3, 3e3], surface, path_zone(row))
    assert found.surplus_m[0] == pytest.approx(-2.0, abs=1e-9)
    assert found.distance_m[0] == pytest.approx(1500.0, abs=0.01)


def test_hops_out_of_order_or_without_pieces_are_refused():
    one = Parabolas(*np.zeros((3, 2)))
    rows = [(1e3, 9.0, 9.0, 0.05, 1.0, 1.0, 0.0)] * 2
    for hop in ([1, 0], [0, 0], [1, 1]):
        with pytest.raises(InputError, match="must number every hop from 0 on, in order"):
            least_surplus(hop, [0.0, 5.0], [5.0, 9.0], one, path_zone(*rows))


@given(crown=st.floats(-60, 60), above=st.floats(0.005, 1.0), below=st.floats(0.005, 1.0))
def test_straight_lines_between_the_places_stay_near(crown, above, below):
    _, share = inside_places(np.array([crown]), above_m=above, below_m=below)
    at = np.concatenate(([0.0], share, [1.0]))
    t = np.linspace(0.0, 1.0, 3001)
    over = 4 * crown * t * (1 - t) - np.interp(t, at, 4 * crown * at * (1 - at))
    assert -below * (1 + 1e-6) <= over.min()
    assert over.max() <= above * (1 + 1e-6)


def test_places_of_the_zone_keep_its_radius_near_too():
    """A quarter of the way the far antenna bends the radius too, half as much again."""
    for length, frequency, fraction, within in ((40e3, 6e9, 1.0, 0.01), (3e3, 1e9, 2.0, 0.05), (90e3, 38e9, 0.3, 0.02)):
        at = np.concatenate(([0.0], zone_places(length, frequency, fraction, within)))
        x = np.linspace(0.0, 1.0, 200_001) ** 3 * at[-1]
        radius = fraction * np.sqrt(299_792_458 / frequency * x * (length - x) / length)
        held = fraction * np.sqrt(299_792_458 / frequency * at * (length - at) / length)
        over = radius - np.interp(x, at, held)
        assert within < over.max() <= 1.6 * within
        assert 0.15 * length < at[-1] <= 0.25 * length
    assert zone_places(40e3, 6e9, 0.0, 0.01).size == 0
