"""Whole studies on real ground, argued by hand and held against rasterio, scipy, pyproj and geographiclib.

The canyon (NASA SRTM, 3″, Utah) lies in tests/terrain; the fault (3″, Tennessee) ships with matplotlib.
"""

import math
from dataclasses import replace

import numpy as np
import pytest
import rasterio
from affine import Affine
from geographiclib.geodesic import Geodesic
from pyproj import Transformer
from scipy.interpolate import RegularGridInterpolator

from profiler.models import CoverChoice, Hop, Rule, Site, TerrainChoice
from profiler.study import run_study

FREQUENCY_HZ = 7.5e9


def interpolator(path):
    """Interpolate a raster between its cell centres with scipy; takes (y, x)."""
    with rasterio.open(path) as raster:
        heights, affine = raster.read(1).astype(float), raster.transform
        heights[heights == raster.nodata] = np.nan
    rows, columns = heights.shape
    x = affine.c + affine.a * (np.arange(columns) + 0.5)
    y = affine.f + affine.e * (np.arange(rows) + 0.5)
    return RegularGridInterpolator((y[::-1], x), heights[::-1])


def along(hop: Hop, distance_m):
    """Latitude and longitude on the geodesic, by geographiclib."""
    a, b = hop.site_a, hop.site_b
    line = Geodesic.WGS84.InverseLine(a.latitude, a.longitude, b.latitude, b.longitude)
    places = [line.Position(each) for each in distance_m]
    return line.s13, np.array([(place["lat2"], place["lon2"]) for place in places])


def by_hand(hop: Hop, distance_m, ground_m, k, fraction):
    """Surplus of a rule from its definition, in SI units: bulge d1·d2/(2kR), zone sqrt(λ·d1·d2/d)."""
    total = distance_m[-1]
    d1, d2 = distance_m, total - distance_m
    start, end = ground_m[0] + hop.site_a.antenna_m, ground_m[-1] + hop.site_b.antenna_m
    ray = start + (end - start) * d1 / total
    zone = np.sqrt(299_792_458 / hop.frequency_hz * d1 * d2 / total)
    return ray - ground_m - d1 * d2 / (2 * k * 6_371_000) - fraction * zone


def canyon(terrain, site_a, site_b) -> Hop:
    return Hop(
        name="canyon",
        site_a=site_a,
        site_b=site_b,
        frequency_hz=FREQUENCY_HZ,
        rules=(Rule(4 / 3, 1.0), Rule(2 / 3, 0.3)),
        terrain=TerrainChoice((terrain,)),
    )


def rim_to_rim(terrain) -> Hop:
    """From the tableland in the south-west over the basin and the great mesas to the plateau in the north-east."""
    return canyon(
        terrain,
        Site("south-west rim", -113.22917, 37.13917, 30.0),
        Site("north-east rim", -112.89083, 37.40833, 30.0),
    )


def through_the_mountain(terrain) -> Hop:
    """From the desert floor to the canyon floor, with a 2.3 km high mountain between them."""
    return canyon(terrain, Site("desert floor", -113.09, 37.20, 20.0), Site("canyon floor", -112.97, 37.22, 20.0))


@pytest.fixture
def degrees(real_terrain):
    return real_terrain / "canyon_srtm_3arcsec.tif"


@pytest.fixture
def utm(real_terrain):
    return real_terrain / "canyon_srtm_utm12.vrt"


@pytest.mark.parametrize("make", [rim_to_rim, through_the_mountain])
def test_every_point_is_what_scipy_and_geographiclib_say(degrees, make):
    study = run_study(make(degrees))
    length_m, places = along(study.hop, study.profile.distance_m)
    assert study.line.distance_m == pytest.approx(length_m, abs=1e-6)
    assert study.profile.ground_m == pytest.approx(interpolator(degrees)(places), abs=1e-3)
    for result, rule in zip(study.rules, study.hop.rules, strict=True):
        surplus = by_hand(study.hop, study.profile.distance_m, study.profile.ground_m, rule.k, rule.fresnel_fraction)
        assert result.check.surplus_m == pytest.approx(surplus, abs=1e-6)
        assert result.check.critical == surplus.argmin()


def test_a_path_that_clears_by_hand(degrees):
    """Read from the raster with scipy, then worked with a pocket calculator.

    A stands on 1659 m and B on 2489 m, 42.34 km apart, antennas 30 m up: the ray climbs from 1689 m to 2519 m. Of the
    mesas on the way the one 27.254 km out comes nearest: 2159.7 m where the path crosses the line between two rows of
    cell centres, 15.088 km from B.

    - ray there: 1689 + 830 · 27.254/42.342 = 2223.2 m
    - bulge at k = 4/3: 27.254 · 15.088/(12.742 · 4/3) = 24.2 m; at k = 2/3: 48.4 m
    - F1 at 7.5 GHz: 17.3 · sqrt(27.254 · 15.088/(7.5 · 42.342)) = 19.7 m
    - k = 4/3: 2223.2 - 2159.7 - 24.2 = 39.3 m clear, 19.6 m more than F1
    - k = 2/3: 2223.2 - 2159.7 - 48.4 = 15.1 m clear, 9.2 m more than 0.3 F1
    """
    ground = interpolator(degrees)
    assert ground([(37.13917, -113.22917), (37.40833, -112.89083)]) == pytest.approx([1659, 2489], abs=0.5)
    _, [mesa] = along(rim_to_rim(degrees), [27_254.1])
    assert ground([mesa]) == pytest.approx(2159.7, abs=0.05)
    study = run_study(rim_to_rim(degrees))
    assert study.line.distance_m == pytest.approx(42_340, abs=5)
    median, low = study.rules
    assert study.verdict.outcome == "passes"
    assert study.governing is low
    for result, bulge_m, surplus_m in ((median, 24.2, 19.6), (low, 48.4, 9.2)):
        check, at = result.check, result.check.critical
        assert result.passes
        assert check.line_of_sight
        assert study.profile.distance_m[at] == pytest.approx(27_254.1, abs=0.5)
        assert check.bulge_m[at] == pytest.approx(bulge_m, abs=0.05)
        assert check.f1_m[at] == pytest.approx(19.7, abs=0.05)
        assert check.surplus_m[at] == pytest.approx(surplus_m, abs=0.1)
    # both mesas are listed as places of their own, not as one crest
    assert np.all(np.diff(sorted([place.distance_m for place in low.places])) > 300)


def test_a_path_that_fails_by_hand(degrees):
    """The ray lies between 1348 m and 1381 m all the way; 6.3 km out the mountain stands at 2.35 km.

    No k and no frequency matter: the bulge there is 6.3 · 4.6/(12.742 · 4/3) = 1.7 m and F1 = 17.3 ·
    sqrt(6.3 · 4.6/(7.5 · 10.88)) = 10.3 m, and the ray is 1 km short of sight.
    """
    ground = interpolator(degrees)
    assert ground([(37.20, -113.09), (37.22, -112.97)]) == pytest.approx([1328, 1361], abs=0.5)
    study = run_study(through_the_mountain(degrees))
    check = study.rules[0].check
    assert study.verdict.outcome == "fails"
    assert not check.line_of_sight
    assert study.profile.distance_m[check.critical] == pytest.approx(6_300, abs=100)
    assert study.profile.ground_m[check.critical] == pytest.approx(2352, abs=10)
    assert check.bulge_m[check.critical] == pytest.approx(1.7, abs=0.05)
    assert check.f1_m[check.critical] == pytest.approx(10.3, abs=0.05)
    assert check.surplus_m[check.critical] == pytest.approx(1367 - 2352 - 1.7 - 10.3, abs=12)
    # one sharp edge 985 m over the ray has ν = √2·985/10.3 = 135 and J(ν) = 6.9 + 20·log10(2·135) = 55.5 dB (Rec. ITU-R
    # P.526-15 §4.1); a mountain is more than one edge
    assert study.median_diffraction.loss_db > 55


def test_the_same_ground_in_two_systems_differs_by_the_warp_and_no_more(degrees, utm):
    """Both rasters hold the same SRTM heights; whoever made the second resampled them to 83.5 m cells.

    What that costs is measured without the project, by scipy on both rasters at the points of the path: 5.1 m rms
    and up to 91 m on these cliffs. The studies differ by exactly that, at every point that both have.
    """
    hop = replace(rim_to_rim(degrees), terrain=TerrainChoice((degrees,), spacing_m=40.0))
    one = run_study(hop)
    other = run_study(replace(hop, terrain=TerrainChoice((utm,), spacing_m=40.0)))
    _, here, there = np.intersect1d(one.profile.distance_m, other.profile.distance_m, return_indices=True)
    assert here.size > 1000  # the regular points
    places = np.column_stack((one.profile.latitude, one.profile.longitude))[here]
    easting, northing = Transformer.from_crs("EPSG:4326", "EPSG:32612").transform(*places.T)
    warp_m = interpolator(utm)(np.column_stack((northing, easting))) - interpolator(degrees)(places)
    assert other.profile.ground_m[there] - one.profile.ground_m[here] == pytest.approx(warp_m, abs=0.01)
    assert warp_m.std() == pytest.approx(5.1, abs=0.05)
    assert np.abs(warp_m).max() == pytest.approx(91, abs=0.5)
    for first, second in zip(one.rules, other.rules, strict=True):
        assert first.passes == second.passes
    assert other.verdict.outcome == "passes"
    assert run_study(through_the_mountain(utm)).verdict.outcome == "fails"


def test_land_cover_stands_where_its_raster_says(degrees, real_terrain):
    """The classes of another raster in another datum (NAD 83, zone 12): looked up cell by cell, never blended."""
    path = real_terrain / "canyon_landcover_utm12.tif"
    heights_m = {1: 0.0, 2: 6.0, 3: 0.0, 4: 14.0, 5: 2.0, 6: 0.5, 7: 1.0, 8: 1.5}
    hop = replace(rim_to_rim(degrees), cover=CoverChoice(landcover=path, class_heights_m=tuple(heights_m.items())))
    study, bare = run_study(hop), run_study(rim_to_rim(degrees))
    easting, northing = Transformer.from_crs("EPSG:4326", "EPSG:26912").transform(
        study.profile.latitude, study.profile.longitude
    )
    with rasterio.open(path) as raster:
        rows, columns = rasterio.transform.rowcol(raster.transform, easting, northing)
        classes = raster.read(1)[rows, columns]
    expected = np.array([heights_m[each] for each in classes.tolist()])
    assert study.profile.cover_m == pytest.approx(expected)
    assert {0.0, 2.0, 14.0} <= set(expected)
    # the cover steps on the edges of cells, and there the profile has a point to either side
    step = np.flatnonzero(np.diff(expected))
    assert np.all(np.diff(study.profile.distance_m)[step] < 0.0011)
    for with_cover, without in zip(study.rules, bare.rules, strict=True):
        assert with_cover.check.surplus_m.min() <= without.check.surplus_m.min()


def test_matplotlibs_fault(tmp_path):
    """The Jacksboro fault: its ymin and ymax are swapped, so the first row is the northern one at "ymin"."""
    from matplotlib.cbook import get_sample_data

    dem = get_sample_data("jacksboro_fault_dem.npz")
    heights, north = dem["elevation"], float(dem["ymin"])
    assert north > float(dem["ymax"])
    cell_x, cell_y = float(dem["dx"]), abs(float(dem["dy"]))
    path = tmp_path / "fault.tif"
    shape = {"height": heights.shape[0], "width": heights.shape[1], "count": 1, "dtype": heights.dtype}
    affine = Affine(cell_x, 0.0, float(dem["xmin"]), 0.0, -cell_y, north)
    with rasterio.open(path, "w", driver="GTiff", crs="EPSG:4269", transform=affine, **shape) as raster:
        raster.write(heights, 1)
    latitude = north - cell_y * (np.arange(heights.shape[0]) + 0.5)
    longitude = float(dem["xmin"]) + cell_x * (np.arange(heights.shape[1]) + 0.5)
    ground = RegularGridInterpolator((latitude[::-1], longitude), heights[::-1].astype(float))
    hop = Hop(
        name="over the fault",
        site_a=Site("north-west", -84.40, 36.72, 40.0),
        site_b=Site("south-east", -84.09, 36.46, 40.0),
        frequency_hz=6.175e9,
        rules=(Rule(4 / 3, 0.6),),
        terrain=TerrainChoice((path,)),
    )
    study = run_study(hop)
    length_m, places = along(hop, study.profile.distance_m)
    assert study.line.distance_m == pytest.approx(length_m, abs=1e-6)
    assert study.profile.ground_m == pytest.approx(ground(places), abs=1e-3)
    surplus = by_hand(hop, study.profile.distance_m, ground(places), 4 / 3, 0.6)
    [result] = study.rules
    assert result.check.critical == surplus.argmin()
    assert result.check.surplus_m[result.check.critical] == pytest.approx(surplus.min(), abs=1e-3)
    assert result.passes == bool(surplus.min() >= 0)
    assert math.isclose(study.terrain.sources[0].share, 1.0)
