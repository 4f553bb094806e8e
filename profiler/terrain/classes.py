"""Class numbers (land cover) at points: the cell a point lies in, never a blend."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from types import TracebackType
from typing import Self

import numpy as np
from numpy.typing import ArrayLike, NDArray

from profiler.errors import RasterError
from profiler.terrain.cells import ReadTally, fetch
from profiler.terrain.crossings import find_crossings
from profiler.terrain.describe import Reading, Tile
from profiler.terrain.gdal import OpenRasters, gdal_session
from profiler.terrain.ground_patches import Layer, read_classes
from profiler.terrain.index import Hits, Ints, build_index, find_hits
from profiler.terrain.mosaic import as_degrees, describe_all
from profiler.terrain.strip import Strip
from profiler.units import Float

__all__ = ["Classes", "open_classes"]


class Classes:
    """Class rasters opened together; a context manager that closes the files it opened. Made by `open_classes`."""

    __slots__ = ("_index", "_rasters")

    def __init__(self, tiles: Sequence[Tile]) -> None:
        self._index, self._rasters = build_index(tiles), OpenRasters()

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self._rasters.close()

    def crossings(self, longitude: ArrayLike, latitude: ArrayLike) -> Float:
        """Fractions of the way along a path at which the class may change: `Terrain.crossings`, of the cells' edges."""
        return find_crossings(self._index, *as_degrees(longitude, latitude)[:2], cell_edges=True)

    def sample(self, longitude: ArrayLike, latitude: ArrayLike) -> tuple[Ints, tuple[Path, ...]]:
        """Class number of the cell that each point lies in.

        Parameters
        ----------
        longitude, latitude
            Degrees on WGS 84, any shapes that broadcast.

        Returns
        -------
        classes, files
            Classes, -1 where no raster has one (outside, nodata), and the files that were read for them.

        Raises
        ------
        RasterError
            When a raster is unreadable, or holds numbers that are not whole.
        """
        lon, lat, shape = as_degrees(longitude, latitude)
        classes, files, tally = np.full(lon.size, -1, dtype=np.int64), dict[Path, None](), ReadTally()
        with gdal_session():
            hits = find_hits(self._index, lon, lat)
            hits = hits.take(hits.inside)
            for number in np.unique(hits.tile):
                mine = hits.take((hits.tile == number) & (classes[hits.point] < 0))
                if mine.point.size:
                    tile = self._index.tiles[number]
                    classes[mine.point] = _classes_on_tile(tile, int(number), self._rasters, mine, tally)
                    files |= dict.fromkeys(self._rasters.pieces(tile.file).under(tally.windows[int(number)]))
        return classes.reshape(shape), tuple(files)

    def layers(self, strip: Strip) -> tuple[list[Layer], tuple[Path, ...]]:
        """Class of every cell on a strip beside a path, and the files that were read for them."""
        tally = ReadTally()

        def classes_of(tile: Ints, col: Ints, row: Ints) -> Ints:
            found = np.full(tile.size, -1, dtype=np.int64)
            for number in np.unique(tile):
                mine, at = tile == number, self._index.tiles[number]
                found[mine] = _stored_classes(at, int(number), self._rasters, col[mine], row[mine], tally)
            return found

        with gdal_session():
            layers = read_classes(self._index, strip, classes_of)
            files = dict[Path, None]()
            for number, windows in tally.windows.items():
                files |= dict.fromkeys(self._rasters.pieces(self._index.tiles[number].file).under(windows))
        return layers, tuple(files)


def open_classes(path: Path) -> Classes:
    r"""Index class rasters for sampling; only their metadata is read.

    Parameters
    ----------
    path
        A raster of whole numbers, or a folder of them: the first that has a class at a point answers.

    Returns
    -------
    Classes
        A context manager.

    Raises
    ------
    RasterError
        When a raster is a photo, without a CRS, or cannot be read.

    Examples
    --------
    >>> import tempfile
    >>> grid = "ncols 2\nnrows 1\nxllcorner 10\nyllcorner 50\ncellsize 0.1\nNODATA_value 255\n4 255\n"
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     _ = Path(folder, "cover.prj").write_text("Projection GEOGRAPHIC\nDatum WGS84\nUnits DD\n")
    ...     _ = Path(folder, "cover.asc").write_text(grid)
    ...     with open_classes(Path(folder)) as rasters:
    ...         classes, files = rasters.sample([10.02, 10.09, 10.15, 11.0], 50.05)
    >>> classes.tolist(), [path.name for path in files]
    ([4, 4, -1, -1], ['cover.asc', 'cover.prj'])
    """
    return Classes(describe_all([path], Reading(classes=True))[0])


def _classes_on_tile(tile: Tile, number: int, rasters: OpenRasters, hits: Hits, tally: ReadTally) -> Ints:
    """Class of the cell under each hit, -1 where it has none; a point on the outer edge is in the last cell."""
    col, row = (
        np.clip(np.floor(at + 0.5).astype(np.int64), 0, side - 1)
        for at, side in ((hits.u, tile.info.width), (hits.v, tile.info.height))
    )
    return _stored_classes(tile, number, rasters, col, row, tally)


def _stored_classes(tile: Tile, number: int, rasters: OpenRasters, col: Ints, row: Ints, tally: ReadTally) -> Ints:
    """Class of each cell, -1 where it has none."""
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
