"""Class numbers (land cover) at points: the cell a point lies in, never a blend."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np
from numpy.typing import ArrayLike, NDArray

from profiler.errors import RasterError
from profiler.terrain.cells import Tally, fetch
from profiler.terrain.describe import Reading
from profiler.terrain.gdal import OpenRasters, gdal_session
from profiler.terrain.index import Ints, build_index, find_hits
from profiler.terrain.mosaic import as_degrees, describe_all

__all__ = ["sample_classes"]


def sample_classes(paths: Sequence[Path] | Path, longitude: ArrayLike, latitude: ArrayLike) -> Ints:
    r"""Class number of the cell that each point lies in.

    Parameters
    ----------
    paths
        A raster of whole numbers, or several (files, folders): the first that has a class at a point answers.
    longitude, latitude
        Degrees on WGS 84, any shapes that broadcast.

    Returns
    -------
    ndarray of int
        Classes; -1 where no raster has one (outside, nodata).

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
    ...     print(sample_classes(Path(folder), [10.02, 10.09, 10.15, 11.0], 50.05))
    [ 4  4 -1 -1]
    """
    lon, lat, shape = as_degrees(longitude, latitude)
    tiles, _ = describe_all([paths] if isinstance(paths, Path) else paths, Reading(classes=True))
    index, rasters = build_index(tiles), OpenRasters()
    classes = np.full(lon.size, -1, dtype=np.int64)
    with gdal_session():
        hits = find_hits(index, lon, lat)
        hits = hits.take(hits.inside)
        try:
            for number in np.unique(hits.tile):
                mine = hits.take((hits.tile == number) & (classes[hits.point] < 0))
                col, row = (
                    np.clip(
                        np.floor(at + 0.5).astype(np.int64), 0, side - 1
                    )  # a point on the outer edge is in the last cell
                    for at, side in zip((mine.u, mine.v), index.size[number], strict=True)
                )
                if not mine.point.size:
                    continue
                tile = index.tiles[number]
                raw, valid = fetch(tile, int(number), rasters, col, row, Tally())
                there = (raw != tile.coding.nodata) & ~np.isnan(raw)
                if valid is not None:
                    there &= valid
                _require_whole(raw[there], tile.info.name)
                classes[mine.point[there]] = raw[there].astype(np.int64)
        finally:
            rasters.close()
    return classes.reshape(shape)


def _require_whole(values: NDArray[np.float64], name: str) -> None:
    odd = (values != np.floor(values)) | (values < 0)
    if odd.any():
        raise RasterError(
            f"{name}: holds {values[np.argmax(odd)]:g}, and a class is a whole number from 0; give a raster of classes"
        )
