"""How far apart edges must be, what the spacing of points does to the losses, and wave theory over the same ground."""

import math

import numpy as np
import pytest

from profiler.diffraction import (
    bullington,
    cascaded_knife_edges,
    delta_bullington,
    double_edge,
    knife_edge_loss,
    rounded_obstacle,
    single_knife_edge,
)
from profiler.diffraction.formulas import fresnel_parameter
from profiler.path import trace
from profiler.terrain import open_terrain
from profiler.units import SPEED_OF_LIGHT_M_S

LENGTH = 20_000.0
FINE = np.arange(0, LENGTH + 1, 5.0)
F6 = SPEED_OF_LIGHT_M_S / 0.05
SPACINGS = (5, 25, 100)
RADIUS = 8500e3


def gauss(at_m, top_m, width_m):
    return top_m * np.exp(-(((FINE - at_m) / width_m) ** 2))


HILLS = {
    "bell": gauss(1e4, 150, 1500),
    "dome": np.maximum(150 - (FINE - 1e4) ** 2 / 16e3, 0),
    "broad dome": np.maximum(150 - (FINE - 1e4) ** 2 / 40e3, 0),
    "ramp": np.interp(FINE, [0, 5e3, 12e3, 12.1e3, LENGTH], [0, 60, 140, 0, 0]),
}
MESA = np.interp(FINE, [0, 8400, 8500, 11500, 11600, LENGTH], [0, 0, 150, 150, 0, 0])


def over(method, ground, spacing=5, radius=RADIUS):
    """Run a method over a hill on FINE with 100 m masts, at a coarser spacing of points."""
    step = spacing // 5
    return method(FINE[::step], ground[::step], ground[0] + 100, ground[-1] + 100, F6, radius)


def rough(seed, size_m):
    """Return ground of a fractal roughness, whose heights 20 m apart differ by `size_m`, level at both ends."""
    rng = np.random.default_rng(seed)
    wave = np.fft.rfftfreq(2 * FINE.size)
    wave[1:] **= -1.2
    ground = np.fft.irfft(wave * np.exp(2j * np.pi * rng.random(wave.size)))[: FINE.size]
    ground *= size_m / np.std(ground[4:] - ground[:-4])
    return ground - np.interp(FINE, [0, LENGTH], ground[[0, -1]])


@pytest.mark.parametrize("name", HILLS)
@pytest.mark.parametrize("method", [cascaded_knife_edges, double_edge])
def test_a_smooth_hill_loses_the_same_at_every_spacing(method, name):
    losses = [float(over(method, HILLS[name], spacing).loss_db) for spacing in SPACINGS]
    assert max(losses) - min(losses) < 0.3


@pytest.mark.parametrize("seed", range(8))
@pytest.mark.parametrize("name", HILLS)
@pytest.mark.parametrize("method", [cascaded_knife_edges, double_edge])
def test_a_rough_hill_loses_nearly_the_same_at_5_and_25_m(method, name, seed):
    ground = HILLS[name] + rough(seed, 0.5)
    fine, coarse = (over(method, ground, spacing).loss_db for spacing in (5, 25))
    assert float(fine) == pytest.approx(float(coarse), abs=1.0)


def test_the_corners_of_a_broad_flat_top_are_two_edges_at_every_spacing():
    found = [over(double_edge, MESA, spacing, math.inf) for spacing in SPACINGS]
    for each in found:
        assert each.distance_m.tolist() == pytest.approx([8500, 11500])
        # Rec. ITU-R P.526-15 §4.3 by hand, one after the other: 50 m above the line, each seen from its neighbours
        nu = fresnel_parameter(50 * (1 - 8.5 / 11.5), 8500, 3000, F6)
        by_hand = 2 * float(knife_edge_loss(nu)) + 10 * math.log10(11.5**2 / (3 * 20))
        assert float(each.loss_db) == pytest.approx(by_hand)


@pytest.mark.parametrize("spacing", [5, 25, 100, 250])
def test_two_hills_are_two_edges_at_every_spacing(spacing):
    ground = np.maximum(gauss(7e3, 150, 500), gauss(11e3, 150, 500))
    cascade, double = (over(method, ground, spacing, math.inf) for method in (cascaded_knife_edges, double_edge))
    assert cascade.distance_m[1:].tolist() == pytest.approx([7e3, 11e3], abs=10)
    assert not cascade.edge_loss_db[0] > 1.5
    assert double.distance_m.tolist() == pytest.approx([7e3, 11e3], abs=10)
    # Rec. ITU-R P.526-15 §4.3 by hand, one after the other: the tops rise 50 m, each seen from its neighbours
    seen = (50 * (1 - 7 / 11), 7e3, 4e3), (50 * (1 - 9 / 13), 4e3, 9e3)
    apart = 10 * math.log10(11 * 13 / (4 * 20))
    by_hand = sum(float(knife_edge_loss(fresnel_parameter(*each, F6))) for each in seen) + apart
    assert float(double.loss_db) == pytest.approx(by_hand, abs=0.05)


def two_tops(at_m, apart_m):
    """Two tops 150 m high, the one nearer to A higher by a hair, and a deep notch between them."""
    near, far = at_m, at_m + apart_m
    return np.interp(FINE, [0, near - 50, near, at_m + apart_m / 2, far, far + 50, LENGTH], [0, 0, 150.1, 0, 150, 0, 0])


@pytest.mark.parametrize(("at_m", "whole_m"), [(9e3, 500.0), (1e3, 100.0), (18e3, 175.0)])
@pytest.mark.parametrize("part", [0.2, 0.5, 0.9, 1.0, 3.0])
def test_an_edge_counts_in_full_from_500_m_or_a_tenth_of_the_way_to_the_nearer_end(at_m, whole_m, part):
    """The principal edge is the near top, or where that is farther from its end the far one; a tenth of its own way."""
    apart_m = 10 * round(part * whole_m / 10)
    whole_m = whole_m if at_m < 17e3 else 0.1 * (LENGTH - at_m - apart_m)  # of the far top, which obstructs more there
    share = min(apart_m / whole_m, 1.0)
    for profile in (two_tops(at_m, apart_m), two_tops(at_m, apart_m)[::-1]):
        cascade, double = (over(method, profile, radius=math.inf) for method in (cascaded_knife_edges, double_edge))
        beside = np.nanmax(cascade.edge_loss_db[[0, 2]])
        seen = np.nanmax(np.where(cascade.edge_loss_db == beside, cascade.nu, np.nan))
        assert beside == pytest.approx(share * float(knife_edge_loss(seen)))
        alone = float(single_knife_edge(FINE, profile, 100.0, 100.0, F6, math.inf).loss_db)
        assert np.nansum(double.edge_loss_db) > alone


MOVES = {
    "level with the other": (lambda x: np.maximum(gauss(9e3, 150, 300), gauss(x, 150, 300)), 9e3),
    "lower": (lambda x: np.maximum(gauss(9e3, 150, 300), gauss(x, 146, 200)), 9e3),
    "by the end": (lambda x: np.maximum(gauss(1e3, 150, 60), gauss(x, 148, 60)), 1e3),
    "between two": (
        lambda x: np.maximum.reduce([gauss(6e3, 140, 200), gauss(13e3, 150, 200), gauss(x, 145, 150)]),
        6e3,
    ),
}


@pytest.mark.parametrize("name", MOVES)
@pytest.mark.parametrize("method", [cascaded_knife_edges, double_edge])
def test_no_loss_jumps_when_a_hill_moves(method, name):
    """A hill moves past another in steps of 10 m: 40 m made a difference of 12 to 30 dB where edges were cut off."""
    ground, start = MOVES[name]
    at = start + np.arange(0, 1500, 10.0)
    losses = method(FINE, np.stack([ground(x) for x in at]), 100.0, 100.0, F6, RADIUS).loss_db
    assert np.abs(np.diff(losses)).max() < 1.3
    assert np.ptp(losses) > 1.5


EVERY = (bullington, delta_bullington, single_knife_edge, rounded_obstacle, double_edge, cascaded_knife_edges)


def losses_of(method, d, ground):
    found = method(d, ground, 130.0, 100.0, F6, RADIUS, **({"cell_m": 5.0} if method is rounded_obstacle else {}))
    return float(found.total_db if method is delta_bullington else found.loss_db)


@pytest.mark.parametrize("name", HILLS)
@pytest.mark.parametrize("method", EVERY)
def test_points_added_on_the_line_between_points_change_nothing(method, name):
    """Twice as many points in one half, and beside others one a millimetre apart: the same ground, the same loss."""
    rng = np.random.default_rng(5)
    coarse = FINE[::20]
    ground = HILLS[name][::20]
    more = np.unique(np.concatenate([coarse, FINE[2005::5], coarse[1::3] - 1e-3, rng.uniform(0, LENGTH, 200)]))
    tilted = np.interp(more, coarse, ground - coarse * 1e-3)
    before, after = losses_of(method, coarse, ground - coarse * 1e-3), losses_of(method, more, tilted)
    # an edge that fades in may stand between points; the earth's bulge is not straight over 100 m either: 0.15 mm
    assert after == pytest.approx(before, abs=0.3 if method in (double_edge, cascaded_knife_edges) else 0.002)


@pytest.mark.parametrize("method", [each for each in EVERY if each is not rounded_obstacle])
def test_a_step_of_a_millimetre_is_a_wall(method):
    """A wall has no radius that a fit could find, so not by the rounded obstacle.

    Classes of land cover end at once: points a millimetre apart, and the loss of the same wall on fine points.
    """
    wall = np.where((FINE >= 9e3) & (FINE <= 9.6e3), 150.0, 0.0)
    d, top = np.array([0, 9e3 - 1e-3, 9e3, 9.6e3, 9.6e3 + 1e-3, LENGTH]), np.array([0, 0, 150.0, 150, 0, 0])
    assert losses_of(method, d, top) == pytest.approx(losses_of(method, FINE, wall), abs=0.5)


@pytest.mark.parametrize("step_m", [10.0, 23.0, 37.0])
def test_the_rounded_obstacle_over_real_ground_hardly_knows_the_spacing(real_terrain, step_m):
    """High mountains of the canyon, by which one cell's corner made 57 dB at one spacing and 320 dB at another."""
    cell_m = 92.0
    with open_terrain(real_terrain / "canyon_srtm_3arcsec.tif") as terrain:
        for ends in ((-113.09, 37.20, -112.97, 37.22), (-113.041, 37.192, -112.878, 37.482)):
            found = []
            for spacing_m in (5.0, step_m):
                line = trace(*ends, spacing_m=spacing_m)
                ground = terrain.sample(line.longitude, line.latitude).ground_m
                centres = ground[0] + 20, ground[-1] + 20
                found.append(float(rounded_obstacle(line.along_m, ground, *centres, F6, RADIUS, cell_m).loss_db))
            assert found[1] == pytest.approx(found[0], rel=0.01)


def waves(ground, step_m=25.0, grid_m=0.4):
    """Loss over screens that swallow what meets them, one each `step_m`, by wave theory: dB over free space.

    The parabolic equation solved by split steps (R. H. Hardin and F. D. Tappert, SIAM Review 15, 1973, from memory):
    a step over free space is a product in the spectrum of heights, a screen sets the field under its top to 0. Heights
    count from the ray; the source is a ray tube of 2° to each side, the sponge keeps waves from coming round.
    """
    x = np.arange(0, LENGTH + 1, step_m)
    bulge = x * (LENGTH - x) / (2 * RADIUS)
    top = np.interp(x, FINE, ground) + bulge - np.interp(x, [0, LENGTH], ground[[0, -1]] + 100)
    z = (np.arange(4096) - 2048) * grid_m
    wave = 2 * np.pi / 0.05
    sponge = np.exp(-0.6 * np.clip(np.abs(z) / z[-1] / 0.3 - 7 / 3, 0, 1) ** 2)
    step = np.exp(-0.5j * (2 * np.pi * np.fft.fftfreq(z.size, grid_m)) ** 2 * step_m / wave)
    near = 4 * step_m
    end = np.exp(
        0.5j * wave * z**2 / near - (z / (near * 0.035)) ** 6
    )  # of a ray tube, from a site to its first screen
    fields = {}
    for name, screens in (("ground", top), ("free", np.full_like(top, -np.inf))):
        field = end
        for height in screens[4:-5]:
            field = np.fft.ifft(np.fft.fft(field * np.clip((z - height) / grid_m + 0.5, 0, 1)) * step) * sponge
        fields[name] = abs((field * np.clip((z - screens[-5]) / grid_m + 0.5, 0, 1) * end).sum())
    return -20 * math.log10(fields["ground"] / fields["free"])


def test_the_reference_by_waves_is_right_for_a_single_screen():
    screen = np.where(FINE == 1e4, 150.0, -500.0)
    screen[[0, -1]] = 0
    exact = float(knife_edge_loss(fresnel_parameter(50 + 1e4**2 / (2 * RADIUS), 1e4, 1e4, F6)))
    assert waves(screen) == pytest.approx(exact, abs=0.2)


@pytest.mark.parametrize(("name", "ground"), [*HILLS.items(), ("mesa", MESA)])
def test_the_cascade_is_over_wave_theory_by_no_more_than_its_own_term(name, ground):
    # counting every point of the hill would be 18 dB over, counting a broad flat top once 19 dB under
    excess = float(over(cascaded_knife_edges, ground).loss_db) - waves(ground)
    assert -1 < excess < 10 + 0.04 * LENGTH / 1000


@pytest.fixture
def canyon_hops(real_terrain):
    """Give obstructed paths over the canyon, their points 5 m apart: distances, ground and both antenna centres."""
    rng = np.random.default_rng(3)
    hops = []
    with open_terrain(real_terrain / "canyon_srtm_3arcsec.tif") as terrain:
        while len(hops) < 60:
            longitude, latitude = rng.uniform(-113.23, -112.86, 2), rng.uniform(37.14, 37.50, 2)
            line = trace(longitude[0], latitude[0], longitude[1], latitude[1], spacing_m=5.0)
            ground = terrain.sample(line.longitude, line.latitude).ground_m
            whole = (line.points - 1) // 20 * 20 + 1
            hop = lifted(line.along_m[:whole], ground[:whole], rng.uniform(0, 4))
            if 0.1 < float(single_knife_edge(*hop, F6, RADIUS).distance_m[0]) / hop[0][-1] < 0.9:
                hops.append(hop)
    return hops


def lifted(d, ground, nu):
    """Raise both antennas above the higher site until the principal edge has a given ν."""
    inner = slice(1, -1)
    bulge = d[inner] * (d[-1] - d[inner]) / (2 * RADIUS)
    per_m = fresnel_parameter(1.0, d[inner], d[-1] - d[inner], F6)
    level = max(float((ground[inner] + bulge - nu / per_m).max()), ground[0], ground[-1])
    return d, ground, level, level


def test_the_losses_over_real_ground_converge_with_the_spacing(canyon_hops):
    # root mean square from 5 m to 10, 25 and 100 m, in cells of 3": 0.1 to 0.4, 0.5 to 0.6 and 1.2 to 1.5 dB
    for method in (delta_bullington, single_knife_edge, double_edge, cascaded_knife_edges):
        name = "total_db" if method is delta_bullington else "loss_db"
        losses = {}
        for step in (1, 2, 5, 20):
            hops = [(d[::step], h[::step], *centres) for d, h, *centres in canyon_hops]
            losses[step] = np.array([float(getattr(method(*hop, F6, RADIUS), name)) for hop in hops])
        near, mid, far = (math.sqrt(np.mean((losses[step] - losses[1]) ** 2)) for step in (2, 5, 20))
        assert near < 0.5
        assert mid < 0.8
        assert mid < far
