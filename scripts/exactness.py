"""How far studies are from the surface that they state: random hops over real ground beside a dense calculation.

The dense calculation shares no code with the terrain, the path and the clearance of the package: the raster's array
read whole, its own interpolation, PROJ's geodesic points every metre (every centimetre about the least surplus), and
the formulas of bulge, zone and ray written out. A study is *optimistic* where it finds more surplus than that.

Beside the path, out to the edge of the zone, the dense calculation looks every 5 m along and at nine places across,
every metre both ways wherever that comes within 10 m of the least, and every decimetre and centimetre about the least.
A heights plan's cheapest pair, and its least equal heights, are held to the same.

Delta-Bullington over the profile is held against the same method over the points a metre apart: the method itself is
held against published values in the tests. Called by scripts/exactness.
"""

from __future__ import annotations

import argparse
import sys
import tempfile
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field, replace
from pathlib import Path

import numpy as np
import rasterio
from matplotlib.cbook import get_sample_data
from pyproj import Geod, Transformer
from rasterio.transform import Affine
from scipy.ndimage import map_coordinates

from profiler.diffraction import delta_bullington
from profiler.heights import Choice
from profiler.models import CoverChoice, Hop, Rule, SampleMethod, Site, TerrainChoice
from profiler.plan import plan_heights
from profiler.study import Study, run_study
from profiler.terrain import Terrain, open_terrain

ROOT = Path(__file__).resolve().parent.parent
GEOD = Geod(ellps="WGS84")
EARTH_M, LIGHT_M_S = 6_371_000.0, 299_792_458.0
CLASS_HEIGHTS_M = {1: 0.0, 2: 6.0, 3: 0.0, 4: 18.0, 5: 2.0, 6: 0.5, 7: 1.0, 8: 1.0}
"""Invented: how tall each class of the canyon's land cover stands."""
OPTIMISTIC_M, WITHIN_M, WITHIN_DB, HEIGHTS_M = 0.05, 0.05, 0.1, 0.02

Array = np.ndarray
Surface = Callable[[Array, Array], Array]


@dataclass(frozen=True)
class Grid:
    """One raster, whole, with its way from degrees to cells."""

    cells: Array
    inverse: Affine
    to_plane: Transformer
    bounds: tuple[float, float, float, float]

    @classmethod
    def read(cls, path: Path) -> Grid:
        with rasterio.open(path) as raster:
            cells = raster.read(1, masked=True).astype(float).filled(np.nan)
            to_plane = Transformer.from_crs("EPSG:4326", raster.crs, always_xy=True)
            bounds = to_plane.transform_bounds(*raster.bounds, direction="INVERSE")
            return cls(cells, ~raster.transform, to_plane, bounds)

    def place(self, longitude: Array, latitude: Array) -> tuple[Array, Array]:
        """Column and row, counted from the centre of the first cell."""
        x, y = self.to_plane.transform(longitude, latitude)
        a, b, c, d, e, f = self.inverse[:6]
        return a * x + b * y + c - 0.5, d * x + e * y + f - 0.5

    def bilinear(self, longitude: Array, latitude: Array) -> Array:
        column, row = self.place(longitude, latitude)
        return map_coordinates(self.cells, [row, column], order=1, mode="constant", cval=np.nan, prefilter=False)

    def highest(self, longitude: Array, latitude: Array) -> Array:
        """Highest of the four cells whose centres are around; NaN outside them."""
        column, row = (np.floor(each).astype(int) for each in self.place(longitude, latitude))
        rows, columns = self.cells.shape
        inside = (column >= 0) & (column < columns - 1) & (row >= 0) & (row < rows - 1)
        i, j = np.where(inside, row, 0), np.where(inside, column, 0)
        around = np.max([self.cells[i + down, j + right] for down in (0, 1) for right in (0, 1)], axis=0)
        return np.where(inside, around, np.nan)

    def nearest(self, longitude: Array, latitude: Array) -> Array:
        column, row = (np.floor(each + 0.5).astype(int) for each in self.place(longitude, latitude))
        rows, columns = self.cells.shape
        inside = (column >= 0) & (column < columns) & (row >= 0) & (row < rows)
        return np.where(inside, self.cells[np.where(inside, row, 0), np.where(inside, column, 0)], np.nan)


@dataclass(frozen=True)
class Case:
    """Ground and cover, as the package is given them and as the dense calculation reads them."""

    name: str
    terrain: Path
    grid: Grid
    cover: CoverChoice = field(default_factory=CoverChoice)
    standing: Surface | None = None
    method: SampleMethod = "bilinear"

    def ground_m(self, longitude: Array, latitude: Array) -> Array:
        return self.grid.bilinear(longitude, latitude)

    def surface_m(self, longitude: Array, latitude: Array, hop: Hop) -> Array:
        surface = self.ground_m(longitude, latitude)
        if self.method == "highest":  # but among the four cell centres around a site the ground is bilinear
            here = np.floor(self.grid.place(longitude, latitude))
            sites = np.floor(self.grid.place(*np.array(hop.ends).reshape(2, 2).T))
            at_site = (here[:, :, None] == sites[:, None, :]).all(axis=0).any(axis=1)
            surface = np.where(at_site, surface, self.grid.highest(longitude, latitude))
        return surface if self.standing is None else surface + self.standing(longitude, latitude)


def cases(work: Path) -> Iterator[Case]:
    """Every real raster at hand, and the sample country with its canopy."""
    canyon, canyon_utm = (ROOT / "tests" / "terrain" / f"canyon_srtm_{name}" for name in ("3arcsec.tif", "utm12.vrt"))
    classes = ROOT / "tests" / "terrain" / "canyon_landcover_utm12.tif"
    yield Case("canyon, degrees", canyon, Grid.read(canyon))
    yield Case("canyon, UTM", canyon_utm, Grid.read(canyon_utm))
    with get_sample_data("jacksboro_fault_dem.npz") as held:
        heights = held["elevation"].astype("float32")
        west, north = float(held["xmin"]), float(max(held["ymin"], held["ymax"]))
        affine = Affine(float(held["dx"]), 0, west, 0, -abs(float(held["dy"])), north)
    fault = work / "fault.tif"
    size = {"width": heights.shape[1], "height": heights.shape[0], "count": 1, "dtype": "float32"}
    with rasterio.open(fault, "w", "GTiff", crs="EPSG:4326", transform=affine, **size) as raster:
        raster.write(heights, 1)
    yield Case("fault", fault, Grid.read(fault))
    country, canopy = (ROOT / "sample_dem" / f"{name}.tif" for name in ("country", "canopy"))
    trees = Grid.read(canopy)
    yield Case("country and canopy", country, Grid.read(country), CoverChoice(canopy=(canopy,)), trees.bilinear)
    table = CoverChoice(landcover=classes, class_heights_m=tuple(CLASS_HEIGHTS_M.items()))
    cover = Grid.read(classes)

    def class_heights(longitude: Array, latitude: Array) -> Array:
        heights = np.array([CLASS_HEIGHTS_M.get(each, np.nan) for each in range(10)])
        found = cover.nearest(longitude, latitude)
        return heights[np.where(np.isfinite(found), found, 9).astype(int)]

    yield Case("canyon and classes", canyon, Grid.read(canyon), table, class_heights)
    yield Case("canyon, highest", canyon, Grid.read(canyon), method="highest")


@dataclass(frozen=True)
class Dense:
    """Points of a hop every so often: distances from A and the surface."""

    distance_m: Array
    surface_m: Array

    @classmethod
    def read(cls, case: Case, hop: Hop, distance_m: Array) -> Dense:
        azimuth, _, _ = GEOD.inv(*hop.ends)
        start = (np.full(distance_m.size, each) for each in (*hop.ends[:2], azimuth))
        longitude, latitude, _ = GEOD.fwd(*start, distance_m)
        return cls(distance_m, case.surface_m(np.asarray(longitude), np.asarray(latitude), hop))


def centres(case: Case, hop: Hop) -> tuple[float, float]:
    """Antenna centres above the datum, over the bilinear ground."""
    longitude, latitude = np.array(hop.ends).reshape(2, 2).T
    ground = case.ground_m(longitude, latitude)
    return float(ground[0]) + hop.site_a.antenna_m, float(ground[1]) + hop.site_b.antenna_m


def surplus(hop: Hop, rule: Rule, dense: Dense, ends: tuple[float, float], length_m: float) -> Array:
    """Surplus of one rule at every point, written out."""
    x = dense.distance_m
    ray = ends[0] + (ends[1] - ends[0]) * x / length_m
    bulge = x * (length_m - x) / (2 * rule.k * EARTH_M)
    zone = np.sqrt(np.maximum(LIGHT_M_S / hop.frequency_hz * x * (length_m - x) / length_m, 0.0))
    return ray - dense.surface_m - bulge - rule.fresnel_fraction * zone - rule.margin_m


def random_hop(case: Case, rng: np.random.Generator, length_m: tuple[float, float]) -> Hop | None:
    """Draw a hop with everything different at both ends; None where it leaves the ground."""
    west, south, east, north = case.grid.bounds
    longitude_a, latitude_a = rng.uniform(west, east), rng.uniform(south, north)
    longitude_b, latitude_b, _ = GEOD.fwd(longitude_a, latitude_a, rng.uniform(0, 360), rng.uniform(*length_m))
    k = (4 / 3, float(rng.uniform(0.4, 1.2)), 1.0)
    hop = Hop(
        name="random",
        site_a=Site("A", longitude_a, latitude_a, float(rng.uniform(25, 90))),
        site_b=Site("B", longitude_b, latitude_b, float(rng.uniform(25, 90))),
        frequency_hz=float(rng.uniform(1.5e9, 25e9)),
        rules=(Rule(k[0], 1.0), Rule(k[1], 0.3), Rule(k[2], 0.6, 3.0), Rule(k[0], 0.0)),
        terrain=TerrainChoice(paths=(case.terrain,), method=case.method),
        cover=case.cover,
    )
    distance_m = GEOD.inv(*hop.ends)[2]
    return hop if np.isfinite(Dense.read(case, hop, np.linspace(0.0, distance_m, 2000)).surface_m).all() else None


def along(case: Case, hop: Hop, study: Study) -> tuple[list[float], float]:
    """How much more surplus than the dense calculation the study finds under each rule, m; and loss, dB."""
    length_m = GEOD.inv(*hop.ends)[2]
    ends = centres(case, hop)
    step_m = 0.1 if case.method == "highest" else 1.0  # a loss feels a step near a site by the decimetre
    dense = Dense.read(case, hop, np.append(np.arange(0.0, length_m, step_m), length_m))
    more = []
    for result in study.rules:
        coarse = surplus(hop, result.check.rule, dense, ends, length_m)
        about = float(dense.distance_m[np.argmin(coarse)])
        fine_m = np.linspace(max(about - 1.5, 0.0), min(about + 1.5, length_m), 301)
        fine = surplus(hop, result.check.rule, Dense.read(case, hop, fine_m), ends, length_m)
        more.append(float(result.check.surplus_m.min()) - min(float(coarse.min()), float(fine.min())))
    args = (*ends, hop.frequency_hz, 4 / 3 * EARTH_M)
    ours = delta_bullington(study.profile.distance_m, study.profile.surface_m, *args)
    theirs = delta_bullington(dense.distance_m, dense.surface_m, *args)
    return more, float(ours.total_db - theirs.total_db)


def at_offsets(case: Case, hop: Hop, along_m: Array, across_m: Array) -> Array:
    """Surface at distances along the path and across it, positive to the right, without the exception at the sites."""
    azimuth, _, _ = GEOD.inv(*hop.ends)
    start = (np.full(along_m.size, each) for each in (*hop.ends[:2], azimuth))
    longitude, latitude, back = GEOD.fwd(*start, along_m)
    longitude, latitude, _ = GEOD.fwd(longitude, latitude, np.asarray(back) - 90.0, across_m)
    read = case.grid.highest if case.method == "highest" else case.grid.bilinear
    surface = read(np.asarray(longitude), np.asarray(latitude))
    return surface if case.standing is None else surface + case.standing(np.asarray(longitude), np.asarray(latitude))


def settled(case: Case, hop: Hop, length_m: float) -> tuple[float, float]:
    """Where the path leaves the four cell centres around A and comes to those around B, if its ground differs there."""
    if case.method != "highest":
        return 0.0, length_m
    x = np.append(np.arange(0.0, length_m, 0.1), length_m)
    azimuth, _, _ = GEOD.inv(*hop.ends)
    longitude, latitude, _ = GEOD.fwd(*(np.full(x.size, each) for each in (*hop.ends[:2], azimuth)), x)
    cell = np.floor(case.grid.place(np.asarray(longitude), np.asarray(latitude)))
    away = [np.flatnonzero((cell != cell[:, [end]]).any(axis=0)) for end in (0, -1)]
    return float(x[away[0][0]]), float(x[away[1][-1]])


def in_zone(case: Case, hop: Hop, rule: Rule, ends: tuple[float, float], along_m: Array, across_m: Array) -> Array:
    """Surplus at places along and across, infinite outside the part of the zone that the rule asks for."""
    length_m = GEOD.inv(*hop.ends)[2]
    zone2 = LIGHT_M_S / hop.frequency_hz * along_m * (length_m - along_m) / length_m
    circle2 = rule.fresnel_fraction**2 * zone2 - across_m**2
    found = np.full(along_m.size, np.inf)
    first, last = settled(case, hop, length_m)
    inside = np.flatnonzero((along_m >= first) & (along_m <= last) & (circle2 >= -1e-9))
    x = along_m[inside]
    ray = ends[0] + (ends[1] - ends[0]) * x / length_m - x * (length_m - x) / (2 * rule.k * EARTH_M)
    surface = at_offsets(case, hop, x, across_m[inside])
    found[inside] = ray - surface - np.sqrt(np.maximum(circle2[inside], 0.0)) - rule.margin_m
    return np.where(np.isnan(found), np.inf, found)


def least_in_zone(case: Case, hop: Hop, rule: Rule, ends: tuple[float, float]) -> float:
    """Least surplus anywhere in the zone of a rule, by looking densely."""
    length_m = GEOD.inv(*hop.ends)[2]
    x = np.append(np.arange(0.0, length_m, 5.0), length_m)
    radius = rule.fresnel_fraction * np.sqrt(LIGHT_M_S / hop.frequency_hz * x * (length_m - x) / length_m)
    across = (radius[:, None] * np.linspace(-1, 1, 9)).ravel()
    coarse = in_zone(case, hop, rule, ends, np.repeat(x, 9), across).reshape(-1, 9).min(axis=1)
    near = np.flatnonzero(coarse < coarse.min() + 10.0)
    fine = np.unique((x[near, None] + np.arange(-4.0, 5.0)).round())
    widest = np.ceil(radius.max())
    grid = np.meshgrid(fine, np.arange(-widest, widest + 1.0), indexing="ij")
    step, least = 1.0, float(coarse.min())
    for _ in range(2):
        along, across = (each.ravel() for each in grid)
        found = in_zone(case, hop, rule, ends, along, across)
        best = int(found.argmin())
        least = min(least, float(found[best]))
        shift = np.linspace(-1.5 * step, 1.5 * step, 31)
        grid, step = np.meshgrid(along[best] + shift, across[best] + shift, indexing="ij"), step / 10
    return least


def beside(case: Case, hop: Hop, study: Study) -> list[float]:
    """How much more surplus than the dense calculation the study finds over the zone's width under each rule, m.

    At the foot of a mast whose ground is not the raster's the study has the path alone, which `along` holds.
    """
    ends = centres(case, hop)
    first, last = settled(case, hop, study.line.distance_m)
    counts = (study.profile.distance_m >= first) & (study.profile.distance_m <= last)
    return [
        float(result.held.least_surplus_m[counts].min()) - least_in_zone(case, hop, result.check.rule, ends)
        for result in study.rules
        if result.check.rule.fresnel_fraction > 0.0
    ]


def planned(case: Case, hop: Hop, study: Study) -> tuple[float, float]:
    """How far a plan's pair, and its least equal heights, are short of any rule by the dense calculation, m."""
    plan = plan_heights(study)
    equal = plan.least_equal.height_m

    def spare(antenna_a_m: float, antenna_b_m: float) -> float:
        sites = replace(hop.site_a, antenna_m=antenna_a_m), replace(hop.site_b, antenna_m=antenna_b_m)
        raised = replace(hop, site_a=sites[0], site_b=sites[1])
        return min(least_in_zone(case, raised, rule, centres(case, raised)) for rule in hop.rules)

    pair = plan.cheapest if isinstance(plan.cheapest, Choice) else Choice(equal, equal, 0.0)
    return -spare(pair.antenna_a_m, pair.antenna_b_m), -spare(equal, equal)


def compare_beside(
    case: Case, terrain: Terrain, hops: int, seed: int, length_m: tuple[float, float], plans: int
) -> tuple[Array, Array]:
    """Differences of surplus over the zone, (hops, rules), and of heights of the first hops, (plans, 2)."""
    rng = np.random.default_rng(seed)
    found: list[list[float]] = []
    heights: list[tuple[float, float]] = []
    while len(found) < hops:
        hop = random_hop(case, rng, length_m)
        if hop is not None:
            study = run_study(hop, terrain, losses=False)
            found.append(beside(case, hop, study))
            if len(heights) < plans:
                heights.append(planned(case, hop, study))
    return np.array(found), np.array(heights).reshape(-1, 2)


def compare(case: Case, terrain: Terrain, hops: int, seed: int, length_m: tuple[float, float]) -> tuple[Array, Array]:
    """Differences of surplus, (hops, rules), and of delta-Bullington, (hops,)."""
    rng = np.random.default_rng(seed)
    found: list[tuple[list[float], float]] = []
    while len(found) < hops:
        hop = random_hop(case, rng, length_m)
        if hop is not None:
            found.append(along(case, hop, run_study(hop, terrain, losses=False)))
    return np.array([more for more, _ in found]), np.array([loss for _, loss in found])


def report(what: str, difference: Array, unit: str, within: float) -> None:
    """Print one line: worst to the unsafe side, worst to the safe one, the middle, the 99th part, and how many hold."""
    size = np.abs(difference)
    print(
        f"  {what:<24}{difference.max():>+12.4f}{difference.min():>+12.4f}{np.median(size):>12.5f}"
        f"{np.quantile(size, 0.99):>12.5f} {unit:<3}{(size <= within).mean():>9.2%} within {within:g}",
        flush=True,
    )


def main() -> int:
    """Print the table and return 1 if a bar is missed."""
    parser = argparse.ArgumentParser(prog="scripts/exactness", description=__doc__)
    parser.add_argument("--hops", type=int, default=1000, help="random hops on each raster")
    parser.add_argument("--plans", type=int, default=100, help="heights plans on each raster")
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--only", default="", help="cases whose name holds this text")
    parser.add_argument("--km", type=float, nargs=2, default=(2.0, 35.0), help="shortest and longest hop")
    chosen = parser.parse_args()
    print(f"  {'':<24}{'optimistic':>12}{'pessimistic':>12}{'median':>12}{'99 %':>12}")
    missed = False
    with tempfile.TemporaryDirectory() as folder:
        for case in cases(Path(folder)):
            if chosen.only not in case.name:
                continue
            with open_terrain(case.terrain, method=case.method) as terrain:
                length_m = (1e3 * chosen.km[0], 1e3 * chosen.km[1])
                surpluses, losses = compare(case, terrain, chosen.hops, chosen.seed, length_m)
                plans = min(chosen.plans, chosen.hops)
                aside, heights = compare_beside(case, terrain, chosen.hops, chosen.seed, length_m, plans)
            print(f"{case.name}: {chosen.hops} hops, {surpluses.shape[1]} rules each")
            report("surplus along the path", surpluses, "m", WITHIN_M)
            report("delta-Bullington", losses, "dB", WITHIN_DB)
            missed |= bool(surpluses.max() > OPTIMISTIC_M or (np.abs(surpluses) <= WITHIN_M).mean() < 0.99)
            missed |= bool((np.abs(losses) <= WITHIN_DB).mean() < 0.99)
            report("surplus over the zone", aside, "m", WITHIN_M)
            missed |= bool(aside.max() > OPTIMISTIC_M or (np.abs(aside) <= WITHIN_M).mean() < 0.99)
            if plans:
                report("chosen heights short by", heights[:, 0], "m", HEIGHTS_M)
                report("least equal heights", heights[:, 1], "m", HEIGHTS_M)
                missed |= bool(heights.max() > HEIGHTS_M)
    print("a bar is missed" if missed else "every bar is met")
    return int(missed)


if __name__ == "__main__":
    sys.exit(main())
