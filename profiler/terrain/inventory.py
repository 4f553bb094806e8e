"""What a folder of terrain holds: coverage, resolution, datums, voids; every raster read once, in pieces."""

from __future__ import annotations

import math
from collections.abc import Sequence
from contextlib import closing
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from profiler.errors import RasterError
from profiler.terrain.cells import ReadTally, to_metres
from profiler.terrain.describe import Bounds, NotHeightsError, RasterInfo, Tile, describe
from profiler.terrain.files import find_rasters
from profiler.terrain.gdal import OpenRasters, gdal_session
from profiler.terrain.index import build_index, find_hits
from profiler.terrain.mosaic import as_reading
from profiler.terrain.placing import place, require_placed
from profiler.terrain.reading import read_cells
from profiler.terrain.samples import Skipped

__all__ = ["FolderSurvey", "RasterSurvey", "bounds_around", "survey"]

_PIECE_CELLS = 1_000_000


@dataclass(frozen=True, slots=True)
class RasterSurvey:
    """One raster: what it declares, and what its cells hold.

    `void_share` (0 to 1), `min_m` and `max_m` are None when cells were not read, heights also when all are void.
    `notes` say what was assumed, converted, or met among the cells.
    """

    info: RasterInfo
    void_share: float | None
    min_m: float | None
    max_m: float | None
    notes: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class FolderSurvey:
    """All rasters under some paths.

    Attributes
    ----------
    rasters
        Each usable raster.
    problems
        One-line messages about rasters that cannot be used; `open_terrain` on the same paths stops with the first.
    skipped
        What is not heights, and folders, links and files that were passed over, and why.
    bounds
        Degrees around all of them; None when there are none.
    covered_share
        Share of the bounds that lies on a raster, from a grid of 100 by 100 points; None when there are none.
    finest_cell_m, coarsest_cell_m
        Smallest and largest side of a cell on the ground, metres; None when there are none.
    vertical_datums
        Different vertical datums, in order of appearance; None among them stands for "not declared".
    void_share, min_m, max_m
        Over all cells (a cell that two tiles hold counts twice); None when not read.
    size_bytes
        Of all files.
    """

    rasters: tuple[RasterSurvey, ...]
    problems: tuple[str, ...]
    skipped: tuple[Skipped, ...]
    bounds: Bounds | None
    covered_share: float | None
    finest_cell_m: float | None
    coarsest_cell_m: float | None
    vertical_datums: tuple[str | None, ...]
    void_share: float | None
    min_m: float | None
    max_m: float | None
    size_bytes: int


def survey(
    paths: Sequence[Path] | Path,
    *,
    read_heights: bool = True,
    vertical_datum: str | None = None,
    height_unit: str | None = None,
    allow_network: bool = False,
) -> FolderSurvey:
    r"""Describe every raster under the paths without stopping at a bad one.

    Parameters
    ----------
    paths
        Rasters, archives, folders.
    read_heights
        Read every cell, for voids and heights; without, only metadata is read.
    vertical_datum, height_unit
        Of the rasters that declare none, as in `open_terrain`.
    allow_network
        Let mosaics name sources that are read over the network.

    Raises
    ------
    InputError, RasterError
        When a path does not exist, the paths hold nothing like a raster, or the unit or the datum is unknown.

    Examples
    --------
    >>> import tempfile
    >>> grid = "ncols 2\nnrows 2\nxllcorner 10\nyllcorner 50\ncellsize 0.1\nNODATA_value -9\n100 200 300 -9\n"
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     _ = Path(folder, "hill.prj").write_text("Projection GEOGRAPHIC\nDatum WGS84\nUnits DD\n")
    ...     _ = Path(folder, "hill.asc").write_text(grid)
    ...     _ = Path(folder, "lost.asc").write_text(grid)
    ...     found = survey(Path(folder))
    >>> len(found.rasters), found.void_share, found.min_m, found.max_m
    (1, 0.25, 100.0, 300.0)
    >>> found.problems[0].split("/")[-1].split(",")[0]
    'lost.asc: has no coordinate reference system'
    """
    reading = as_reading(vertical_datum, height_unit, allow_network=allow_network)
    found: list[Tile] = []
    tiles: list[Tile] = []
    rasters: list[RasterSurvey] = []
    problems: list[str] = []
    with gdal_session(allow_network=allow_network):
        listed = find_rasters([paths] if isinstance(paths, Path) else paths)
        skipped = [Skipped(path, "", reason) for path, reason in listed.passed_over]
        for file in listed.rasters:
            try:
                found.append(describe(file, reading))
            except NotHeightsError as error:
                skipped.append(Skipped.because(file, error))
            except RasterError as error:
                problems.append(str(error))
        for tile in place(found):
            try:
                require_placed(tile)
                rasters.append(
                    _survey_tile(tile) if read_heights else RasterSurvey(tile.info, None, None, None, tile.info.notes)
                )
                tiles.append(tile)
            except RasterError as error:
                problems.append(str(error))
        return _summary(tiles, rasters, problems, skipped)


def _survey_tile(tile: Tile) -> RasterSurvey:
    """Read all cells in bands of whole blocks."""
    info = tile.info
    rows = max(1, _PIECE_CELLS // (info.width * tile.read_cells[0])) * tile.read_cells[0]
    lowest, highest, known, tally = math.inf, -math.inf, 0, ReadTally()
    with closing(OpenRasters()) as rasters:
        for top in range(0, info.height, rows):
            cells, valid = read_cells(rasters, tile, (top, min(top + rows, info.height)), (0, info.width))
            height = to_metres(
                tile,
                0,
                cells.ravel().astype(float),
                None if valid is None else valid.ravel(),
                tally,
                lambda i, top=top: (i % info.width, top + i // info.width),  # type: ignore[misc]
            )
            height = height[~np.isnan(height)]
            if height.size:
                known += height.size
                lowest, highest = min(lowest, float(height.min())), max(highest, float(height.max()))
    cells_there = info.width * info.height
    void_share = (cells_there - known) / cells_there
    notes = info.notes + tally.notes(0)
    return RasterSurvey(info, void_share, lowest if known else None, highest if known else None, notes)


def _summary(
    tiles: list[Tile], rasters: list[RasterSurvey], problems: list[str], skipped: list[Skipped]
) -> FolderSurvey:
    infos = [raster.info for raster in rasters]
    sides = [side for info in infos for side in (info.cell_x_m, info.cell_y_m)]
    bounds = bounds_around([info.bounds for info in infos]) if infos else None
    read = [raster for raster in rasters if raster.void_share is not None]
    cells = sum(raster.info.width * raster.info.height for raster in read)
    void = sum((raster.void_share or 0.0) * raster.info.width * raster.info.height for raster in read)
    return FolderSurvey(
        rasters=tuple(rasters),
        problems=tuple(problems),
        skipped=tuple(skipped),
        bounds=bounds,
        covered_share=None if bounds is None else _covered_share(tiles, bounds),
        finest_cell_m=min(sides, default=None),
        coarsest_cell_m=max(sides, default=None),
        vertical_datums=tuple(dict.fromkeys(info.vertical_datum for info in infos)),
        void_share=void / cells if cells else None,
        min_m=min((raster.min_m for raster in read if raster.min_m is not None), default=None),
        max_m=max((raster.max_m for raster in read if raster.max_m is not None), default=None),
        size_bytes=sum({info.path: info.size_bytes for info in infos}.values()),
    )


def bounds_around(bounds: Sequence[Bounds]) -> Bounds:
    """Bounds around bounds: the circle of longitudes is cut in its widest gap."""
    south, north = min(bound.south for bound in bounds), max(bound.north for bound in bounds)
    spans = sorted((bound.west, bound.west + (bound.east - bound.west) % 360.0) for bound in bounds)
    if any(bound.east - bound.west >= 360.0 for bound in bounds):
        return Bounds(-180.0, south, 180.0, north)
    gaps, reach = [], spans[0][1]
    for west, east in spans[1:]:
        gaps.append((west - reach, west, reach))
        reach = max(reach, east)
    first = spans[0][0]
    widest = max([(first + 360.0 - reach, first, reach), *gaps])
    if widest[0] <= 0.0:
        return Bounds(-180.0, south, 180.0, north)
    west, east = widest[1], widest[2]
    return Bounds(west, south, east if east <= 180.0 else east - 360.0, north)


def _covered_share(tiles: Sequence[Tile], bounds: Bounds) -> float:
    """Share of points of a grid over the bounds that lie on a raster (cosine-weighted, so a share of the area)."""
    part = (np.arange(100) + 0.5) / 100.0
    width = (bounds.east - bounds.west) % 360.0 or 360.0
    lon, lat = np.meshgrid(bounds.west + width * part, bounds.south + (bounds.north - bounds.south) * part)
    lon, lat = lon.ravel(), np.clip(lat.ravel(), -90.0, 90.0)
    hits = find_hits(build_index(tiles), lon, lat)
    covered = np.zeros(lon.size, dtype=bool)
    covered[hits.point[hits.inside]] = True
    return float(np.average(covered, weights=np.cos(np.radians(lat)) + 1e-12))
