"""Speed of the main jobs beside what cannot be avoided, in one run: called by scripts/bench.

Machines differ and are noisy, so each job runs in turn with its floor (A B A B ...), and the ratio is the median over
the pairs, once by the clock on the wall and once by processor time, which other programs disturb less. The aims are for
a present machine with nothing else running; no test asserts them.
"""

from __future__ import annotations

import argparse
import os
import resource
import subprocess
import sys
import tempfile
import time
import tracemalloc
from collections.abc import Callable, Iterator
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np
import rasterio
from pyproj import Geod
from rasterio.transform import Affine
from scipy.ndimage import map_coordinates
from scipy.spatial import ConvexHull

from profiler.confidence import assess
from profiler.cover import open_cover
from profiler.diffraction import delta_bullington
from profiler.geometry import check_rule
from profiler.heights import clearing_region, least_ray
from profiler.hopfile import load_hop
from profiler.models import ConfidenceChoice, Hop, Rule, Site, TerrainChoice
from profiler.path import PathLine, trace
from profiler.plan import plan_heights
from profiler.screen.chunk import Template, screen_chunk
from profiler.screen.pairs import Pairs
from profiler.screen.rows import Rows
from profiler.screen.run import CHUNK
from profiler.study import Study, run_study
from profiler.study.along_path import lay_profile
from profiler.study.ground import read_ground
from profiler.terrain import SourceUse, open_terrain

ROOT = Path(__file__).resolve().parent.parent
SAMPLE = ROOT / "sample_dem" / "ridge_to_mill.toml"
IMPORTS = "import numpy, rasterio, pyproj, matplotlib.figure"
RULES = (Rule(4 / 3, 1.0), Rule(2 / 3, 0.3), Rule(1.0, 0.6, 3.0))
FREQUENCY_HZ = 6.2e9

PLAIN_HOP = """
name = "Rules and figure only"
frequency_ghz = 7.425
[site_a]
name = "Western ridge"
position = "46.12238, -39.10549"
antenna_m = 30
[site_b]
name = "Mill"
position = "46.07878, -38.97025"
antenna_m = 30
[terrain]
paths = ["{country}"]
[rules]
preset = "1.0-and-0.3-f1"
"""

CHILD_READS = """
import resource, sys
from pathlib import Path
from profiler.path import trace
from profiler.terrain import open_terrain
def resident(): return int(Path("/proc/self/statm").read_text().split()[1]) * resource.getpagesize()
with open_terrain(Path(sys.argv[1])) as terrain:
    line = trace(*map(float, sys.argv[2:6]), spacing_m=10.0)
    terrain.sample(line.longitude[:2], line.latitude[:2])
    before = resident()
    terrain.sample(line.longitude, line.latitude)
    print(resident() - before)
"""


Pair = tuple[float, float]
"""By the clock on the wall, and of processor time."""


@dataclass(frozen=True, slots=True)
class Row:
    """One line of the table: what a job took, what it should take, and how many times its floor that is."""

    what: str
    value: float
    cpu: float | None
    unit: str
    aim: str = ""
    floor: str = ""
    ratio: float | None = None
    cpu_ratio: float | None = None


@dataclass(frozen=True, slots=True)
class Paired:
    """Medians of a job in seconds, of its floor, and of their ratio over the pairs."""

    job: Pair
    floor: Pair
    ratio: Pair

    def row(self, what: str, aim: str, floor: str, *, unit: str = "ms", per_second: float = 1e3) -> Row:
        job, job_cpu = (per_second * each for each in self.job)
        floor = f"{floor} {per_second * self.floor[0]:.4g} {unit}"
        return Row(what, job, job_cpu, unit, aim, floor, *self.ratio)


def clocks() -> np.ndarray:
    """Seconds on the wall, and of processor time of this process and those that it has waited for."""
    used = [resource.getrusage(who) for who in (resource.RUSAGE_SELF, resource.RUSAGE_CHILDREN)]
    return np.array([time.perf_counter(), sum(each.ru_utime + each.ru_stime for each in used)])


def seconds(job: Callable[[], object]) -> np.ndarray:
    start = clocks()
    job()
    return clocks() - start


def paired(job: Callable[[], object], floor: Callable[[], object], pairs: int) -> Paired:
    """Run job and floor in turn, once unmeasured and then in pairs."""
    job(), floor()
    times = np.array([(seconds(job), seconds(floor)) for _ in range(pairs)])
    job_s, floor_s = np.median(times, axis=0).tolist()
    return Paired(job_s, floor_s, np.median(times[:, 0] / times[:, 1], axis=0).tolist())


def rough(rng: np.random.Generator, side: int, slope: float) -> np.ndarray:
    """Fractal ground of unit standard deviation: white noise with its spectrum bent to the power -slope."""
    wave = np.hypot(*np.meshgrid(np.fft.rfftfreq(side), np.fft.fftfreq(side)))
    wave[0, 0] = np.inf
    noise = np.fft.irfft2(np.fft.rfft2(rng.standard_normal((side, side))) * wave ** (-slope / 2), (side, side))
    return noise / noise.std()


def write_tile(path: Path, side: int, west: float, south: float, cell_deg: float) -> Path:
    """Write an invented one-degree tile of whole metres."""
    heights = np.round(600 + 150 * rough(np.random.default_rng(1), side, 3.4)).astype("int16")
    grid = Affine(cell_deg, 0, west, 0, -cell_deg, south + side * cell_deg)
    shape = {"width": side, "height": side, "count": 1, "dtype": "int16", "crs": "EPSG:4326", "transform": grid}
    with rasterio.open(path, "w", "GTiff", tiled=True, compress="deflate", **shape) as raster:
        raster.write(heights, 1)
    return path


def whole_process(work: Path, pairs: int) -> Iterator[Row]:
    """Study a hop with its figure from an empty process, beside the imports that it cannot do without."""
    plain = work / "plain.toml"
    plain.write_text(PLAIN_HOP.format(country=(ROOT / "sample_dem" / "country.tif").as_posix()))
    threads = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS")
    environment = {name: value for name, value in os.environ.items() if name not in threads}

    def run(*arguments: str) -> None:
        done = subprocess.run(
            [sys.executable, *arguments], cwd=ROOT, env=environment, capture_output=True, text=True, check=False
        )
        if done.returncode > 1:
            sys.exit(done.stderr)

    def study(hop: Path) -> None:
        run("-m", "profiler", "study", str(hop), "--figure", str(work / "hop.png"))

    for name, hop in (("study, radio, availability, confidence, figure", SAMPLE), ("study, rules, figure", plain)):
        took = paired(lambda hop=hop: study(hop), lambda: run("-c", IMPORTS), pairs)
        yield took.row(f"process: {name}", "1.6 x", "bare imports")


def analysis(work: Path, pairs: int) -> Iterator[Row]:
    """Study a hop of 40 km and about 1 000 points over an open terrain, beside a gather of as many cells."""
    tile = write_tile(work / "three_second.tif", 1201, 10 - 1 / 2400, 30 - 1 / 2400, 1 / 1200)
    line = trace(10.3, 30.4, 10.3 + 0.3602, 30.6, spacing_m=50e3)
    hop = Hop(
        name="bench",
        site_a=Site("A", 10.3, 30.4, 60.0),
        site_b=Site("B", float(line.longitude[-1]), 30.6, 60.0),
        frequency_hz=FREQUENCY_HZ,
        rules=RULES,
        terrain=TerrainChoice(paths=(tile,)),
    )
    rng = np.random.default_rng(1)
    cells = rng.standard_normal((1201, 1201))
    with open_terrain(tile) as terrain:
        study = run_study(hop, terrain)
        beside = 0 if study.surface.patches is None else study.surface.patches.size
        points = study.profile.distance_m.size + beside
        row, col = (rng.uniform(0, 1199, points) for _ in range(2))

        def gather() -> np.ndarray:
            i, j = row.astype(int), col.astype(int)
            down, right = row - i, col - j
            upper = cells[i, j] * (1 - right) + cells[i, j + 1] * right
            lower = cells[i + 1, j] * (1 - right) + cells[i + 1, j + 1] * right
            return upper * (1 - down) + lower * down

        took = paired(lambda: run_study(hop, terrain), gather, pairs)
        ground = paired(lambda: read_ground(hop, terrain), lambda: run_study(hop, terrain), pairs)

        def sampled() -> tuple[np.ndarray, np.ndarray]:
            line = trace(*hop.ends, spacing_m=0.5 * study.terrain.finest_cell_m)
            return line.along_m, terrain.sample(line.longitude, line.latitude).ground_m

        with open_cover(hop.cover) as cover:
            exact = paired(lambda: lay_profile(hop, terrain, cover), sampled, pairs)
        path = (*sampled(), study.centre_a_m, study.centre_b_m, FREQUENCY_HZ)
        missed = [
            check_rule(*path, each.check.rule).surplus_m.min() - each.check.surplus_m.min() for each in study.rules
        ]
    size = f"{study.line.distance_m / 1e3:.0f} km, {study.line.points} points, {beside} patches beside"
    yield took.row(f"analysis: {size}", "15 ms", "numpy gather of the cells")
    yield Row("  of it reading the ground", *(100 * each for each in ground.ratio), "%")
    yield exact.row("  of it laying the profile, exact", "", "sampled half a cell apart")
    yield Row("  what those samples miss, of the rules most", float(max(missed)), None, "m")


def diffraction(pairs: int) -> Iterator[Row]:
    """Run delta-Bullington over many hops at once, beside one pass over their heights."""
    hops, points = 10_000, 512
    rng = np.random.default_rng(1)
    distance_m = np.linspace(0, 40e3, points)
    height_m = 200 + np.cumsum(rng.normal(0, 4, (hops, points)), axis=1)
    centre_a_m, centre_b_m = height_m[:, 0] + 30, height_m[:, -1] + 30

    def job() -> object:
        return delta_bullington(distance_m, height_m, centre_a_m, centre_b_m, FREQUENCY_HZ, 8.5e6)

    took = paired(job, lambda: height_m.sum(axis=1), pairs)
    what = f"delta-Bullington, {hops} x {points}, each"
    yield took.row(what, "25 us", "sum of the heights", unit="us", per_second=1e6 / hops)
    tracemalloc.start()
    job()
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    floor = f"the heights {height_m.nbytes / 2**20:.0f} MiB"
    yield Row("  memory on top of the heights", peak / 2**20, None, "MiB", "", floor, peak / height_m.nbytes)


def country(points: int) -> tuple[np.ndarray, np.ndarray]:
    """Distances and rolling ground of one hop."""
    distance_m = np.linspace(0, 40e3, points)
    return distance_m, 200 + np.cumsum(np.random.default_rng(1).normal(0, 3, points))


def heights(pairs: int) -> Iterator[Row]:
    """Find the exact region of antenna heights, beside the convex hull of as many points by Qhull."""
    distance_m, ground_m = country(1000)
    ends = float(ground_m[0]), float(ground_m[-1])

    def job() -> object:
        return clearing_region(distance_m, least_ray(distance_m, ground_m, FREQUENCY_HZ, RULES), *ends)

    corners = np.column_stack((distance_m, ground_m))
    took = paired(job, lambda: ConvexHull(corners), 20 * pairs)
    yield took.row("heights: exact region, 1000 points, 3 rules", "2 ms", "Qhull of the points")


def heights_plan(pairs: int) -> Iterator[Row]:
    """Plan the sample hop's heights, objective and all, beside the study of its ground; then with steps of 0.1 m."""
    hop = load_hop(SAMPLE)
    fine = replace(
        hop,
        heights=replace(
            hop.heights,
            tower_a=replace(hop.heights.tower_a, step_m=0.1),
            tower_b=replace(hop.heights.tower_b, step_m=0.1),
        ),
    )
    for name, each in (("", hop), (", steps of 0.1 m", fine)):
        study = run_study(each, losses=False)

        def job(study: Study = study) -> object:
            return plan_heights(study, sure=0.95)

        took = paired(job, lambda: run_study(hop, losses=False), pairs)
        yield took.row(f"heights: sample hop, 95 % sure{name}", "1 s", "its study, no losses")


def confidence(pairs: int) -> Iterator[Row]:
    """Draw the confidence analysis, beside drawing as many Gaussian numbers."""
    distance_m, ground_m = country(1000)
    cover_m = np.where(np.sin(distance_m / 700) > 0, 15.0, 0.0)
    doubt = ConfidenceChoice(5.0, "an invented error", 120.0, cover_sigma_m=4.0, draws=2000)
    percentiles = ((0.1, 0.8), (50, 4 / 3), (99.9, 3.0))

    def job() -> object:
        path = (distance_m, ground_m, cover_m, 60.0, 60.0, FREQUENCY_HZ)
        return assess(*path, RULES, doubt, cell_m=40.0, k_percentiles=percentiles)

    rng = np.random.default_rng(1)
    took = paired(job, lambda: rng.standard_normal((1000, 2000), dtype=np.float32), pairs)
    yield took.row("confidence: 2000 draws, 1000 points, 3 rules, k", "250 ms", "drawing the numbers")


def reading(work: Path, pairs: int) -> Iterator[Row]:
    """Sample paths over a large tile in blocks of 256 x 256, beside reading the tile whole."""
    tile = write_tile(work / "one_second.tif", 3600, 10.0, 50.0, 1 / 3600)
    size = 2 * 3600**2 / 2**20

    def whole() -> None:
        with rasterio.open(tile) as raster:
            raster.read(1)

    for name, ends in (
        ("side to side", (10.02, 50.52, 10.98, 50.55)),
        ("corner to corner", (10.02, 50.1, 10.98, 50.9)),
    ):
        line = trace(*ends, spacing_m=10.0)

        def job(line: PathLine = line) -> SourceUse:
            with open_terrain(tile) as terrain:
                return terrain.sample(line.longitude, line.latitude).sources[0]

        took = paired(job, whole, pairs)
        yield took.row(f"terrain: 3600 x 3600 {name}, {line.points} points", "", "the whole tile")
        share = 100 * job().read_share
        yield Row("  share of the tile read", share, None, "%", "a few %")
        if Path("/proc/self/statm").exists():
            command = [sys.executable, "-c", CHILD_READS, str(tile), *map(str, ends)]
            done = subprocess.run(command, cwd=ROOT, capture_output=True, text=True, check=True)
            grown = int(done.stdout) / 2**20
            yield Row("  memory grown by", grown, None, "MiB", "", f"the tile unpacked {size:.0f} MiB", grown / size)


def screening(work: Path, pairs: int) -> Iterator[Row]:
    """Screen pairs of 5 to 40 km over a tile, beside bilinear reads of its cells in memory and a plain script."""
    count, few = CHUNK, 4
    tile = write_tile(work / "screened.tif", 3601, 10.0, 46.0, 1 / 3600)
    rng = np.random.default_rng(3)
    a, way = rng.uniform((10.4, 46.4), (10.6, 46.6), (count, 2)), rng.uniform(0, 2 * np.pi, count)
    b = a + np.stack([np.sin(way) / 0.69, np.cos(way)], axis=1) * rng.uniform(5, 40, count)[:, None] / 111.2
    no = np.full(count, np.nan)
    sites = Pairs([str(i) for i in range(count)], [""] * count, *a.T, *b.T, no, no, no)
    site = Site("anywhere", 10.5, 46.5, 40.0)
    hop = Hop("template", site, site, FREQUENCY_HZ, RULES, TerrainChoice((tile,)))
    geod = Geod(ellps="WGS84")
    with open_terrain(tile) as terrain, rasterio.open(tile) as raster:
        cells = raster.read(1).astype("float32")
        share = np.linspace(0, 1, 512)
        column, row = (np.outer(1 - share, start) + np.outer(share, end) for start, end in _in_cells(raster, a, b))

        def floor() -> None:
            for i in range(count):
                map_coordinates(cells, (row[:, i], column[:, i]), order=1)

        def plain() -> None:
            for i in range(few):
                points = [tuple(a[i]), *geod.npts(*a[i], *b[i], 510), tuple(b[i])]
                z = np.array([value[0] for value in raster.sample(points)], dtype=float)
                s = np.linspace(0, geod.inv(*a[i], *b[i])[2], z.size)
                ray = z[0] + 40 + (z[-1] - z[0]) * s / s[-1]
                for rule in RULES:
                    zone = rule.fresnel_fraction * np.sqrt(299_792_458 / FREQUENCY_HZ * s * (s[-1] - s) / s[-1])
                    (ray - z - s * (s[-1] - s) / (2 * rule.k * 6_371_000) - zone - rule.margin_m).min()
                delta_bullington(s, z, z[0] + 40, z[-1] + 40, FREQUENCY_HZ, 4 / 3 * 6_371_000)

        for what, beside in (("along the path", False), ("with the ground beside", True)):
            template = Template(hop, beside=beside)

            def job(template: Template = template) -> Rows:
                return screen_chunk(template, sites, terrain)

            took = paired(job, floor, min(pairs, 7))
            yield took.row(f"a pair screened {what}, loss too", "", "512 reads", unit="us", per_second=1e6 / count)
            if not beside:
                script = paired(plain, job, min(pairs, 7))
                ratio = [each * count / few for each in script.ratio]
                value, cpu = (1e6 / few * each for each in script.job)
                yield Row("  a plain script for the same pair", value, cpu, "us", ">= 120", "screened", *ratio)


def _in_cells(raster: rasterio.DatasetReader, a: np.ndarray, b: np.ndarray) -> list[tuple[np.ndarray, np.ndarray]]:
    """Columns, then rows, of both ends, counted from the first cell's centre."""
    ends = [~raster.transform * (end[:, 0], end[:, 1]) for end in (a, b)]
    return [(ends[0][axis] - 0.5, ends[1][axis] - 0.5) for axis in (0, 1)]


def show(row: Row) -> None:
    def number(value: float | None) -> str:
        return " " * 9 if value is None else f"{value:>9.2f}"

    numbers, ratios = number(row.value) + number(row.cpu), number(row.ratio) + number(row.cpu_ratio)
    print(f"{row.what:<54}{numbers} {row.unit:<4}{row.aim:>7}  {row.floor:<34}{ratios}".rstrip(), flush=True)


def main() -> None:
    """Print the table, a row as soon as it is known."""
    parser = argparse.ArgumentParser(prog="scripts/bench", description=__doc__)
    parser.add_argument("--pairs", type=int, default=9, help="measured pairs of every job and its floor (7 or more)")
    pairs = max(7, parser.parse_args().pairs)
    load = f", load {os.getloadavg()[0]:.1f}" if hasattr(os, "getloadavg") else ""
    versions = f"Python {sys.version.split()[0]}, numpy {np.__version__}"
    print(f"{versions}, {os.cpu_count()} cores{load}; medians of {pairs} pairs")
    head = f"{'what':<54}{'wall':>9}{'cpu':>9} {'':<4}{'aim':>7}  {'floor (wall)':<34}{'x wall':>9}{'x cpu':>9}"
    print(head)
    with tempfile.TemporaryDirectory() as folder:
        work = Path(folder)
        for rows in (
            whole_process(work, pairs),
            analysis(work, pairs),
            diffraction(pairs),
            heights(pairs),
            heights_plan(pairs),
            confidence(pairs),
            reading(work, pairs),
            screening(work, pairs),
        ):
            for row in rows:
                show(row)


if __name__ == "__main__":
    main()
