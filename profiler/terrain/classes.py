"""Class numbers (land cover) at points: the cell a point lies in, never a blend."""

from __future__ import annotations

from pathlib import Path

import numpy as np
from numpy.typing import ArrayLike, NDArray

from profiler.errors import RasterError
from profiler.terrain.cells import ReadTally, fetch
from profiler.terrain.describe import Reading, Tile
from profiler.terrain.gdal import OpenRasters, gdal_session
from profiler.terrain.index import Hits, Ints, build_index, find_hits
from profiler.terrain.mosaic import as_degrees, describe_all

__all__ = ["sample_classes"]


def sample_classes(path: Path, longitude: ArrayLike, latitude: ArrayLike) -> tuple[Ints, tuple[Path, ...]]:
    r"""Class number of the cell that each point lies in.

    Parameters
    ----------
    path
        A raster of whole numbers, or a folder of them: the first that has a class at a point answers.
    longitude, latitude
        Degrees on WGS 84, any shapes that broadcast.

    Returns
    -------
    classes, files
        Classes, -1 where no raster has one (outside, nodata), and the files that were read for them.

    Raises
    ------
    RasterError
        When a raster is unreadable, a photo, without a CRS, or holds numbers that are not whole.

    Examples
    --------
    >>> import tempfile
    >>> grid = "ncols 2\nnrows 1\nxllcorner 10\nyllcorner 50\ncellsize 0.1\nNODATA_value 255\n4 255\n"
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     _ = Path(folder, "cover.prj").write_text("Projection GEOGRAPHIC\nDatum WGS84\nUnits DD\n")
    ...     _ = Path(folder, "cover.asc").write_text(grid)
    ...     classes, files = sample_classes(Path(folder), [10.02, 10.09, 10.15, 11.0], 50.05)
    >>> classes.tolist(), [path.name for path in files]
    ([4, 4, -1, -1], ['cover.asc', 'cover.prj'])
    """
    lon, lat, shape = as_degrees(longitude, latitude)
    tiles, _ = describe_all([path], Reading(classes=True))
    index, rasters, tally = build_index(tiles), OpenRasters(), ReadTally()
    classes, files = np.full(lon.size, -1, dtype=np.int64), dict[Path, None]()
    with gdal_session():
        hits = find_hits(index, lon, lat)
        hits = hits.take(hits.inside)
        try:
            for number in np.unique(hits.tile):
                mine = hits.take((hits.tile == number) & (classes[hits.point] < 0))
                if mine.point.size:
                    tile = index.tiles[number]
                    classes[mine.point] = _classes_on_tile(tile, int(number), rasters, mine, tally)
                    files |= dict.fromkeys(rasters.pieces(tile.file).under(tally.windows[int(number)]))
        finally:
            rasters.close()
    return classes.reshape(shape), tuple(files)


def _classes_on_tile(tile: Tile, number: int, rasters: OpenRasters, hits: Hits, tally: ReadTally) -> Ints:
    """Class of the cell under each hit, -1 where it has none; a point on the outer edge is in the last cell."""
    col, row = (
        np.clip(np.floor(at + 0.5).astype(np.int64), 0, side - 1)
        for at, side in ((hits.u, tile.info.width), (hits.v, tile.info.height))
    )
    raw, valid = fetch(tile, number, rasters, col, row, tally)
    there = (raw != tile.coding.nodata) & ~np.isnan(raw)
    if valid is not None:
        there &= valid
    _require_whole(raw[there], tile.info.name)
    return np.where(there, raw, -1.0).astype(np.int64)


def _require_whole(values: NDArray[np.float64], name: str) -> None:
    odd = (values != np.floor(values)) | (values < 0)
    if odd.any():
        raise RasterError(
            f"{name}: holds {values[np.argmax(odd)]:g}, and a class is a whole number from 0; give a raster of classes"
        )
