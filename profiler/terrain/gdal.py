"""The edge to GDAL: one environment, quiet opening, its failures as one-line errors."""

from __future__ import annotations

import contextlib
import warnings
from collections import OrderedDict
from collections.abc import Iterator
from typing import Any

import numpy as np
from numpy.typing import NDArray

from profiler.errors import RasterError
from profiler.terrain.files import RasterFile
from profiler.terrain.pieces import Pieces, find_pieces

__all__ = ["OpenRasters", "gdal_session", "library_versions", "open_raster", "read_window"]

_OPTIONS = {
    "GDAL_CACHEMAX": 64_000_000,  # bytes; the default is 5 % of the machine, which grows with the mosaic
    "GDAL_DISABLE_READDIR_ON_OPEN": "TRUE",  # else each of thousands of tiles lists the whole folder
    "GTIFF_REPORT_COMPD_CS": "YES",  # GeoTIFF 1.0 files hide their vertical CRS otherwise
    "REPORT_COMPD_CS": "YES",  # the same for DTED and .hgt, whose formats define EGM96
}

_HANDLES = 128
"""Rasters kept open at once: a path crosses few, and the limit on open files of a process is low."""


def library_versions() -> tuple[tuple[str, str], ...]:
    """Versions of what stands behind rasterio and pyproj: GDAL, PROJ, and PROJ's copy of the EPSG register.

    Examples
    --------
    >>> [name for name, _ in library_versions()]
    ['GDAL', 'PROJ', 'EPSG']
    """
    import pyproj
    import rasterio
    from pyproj.database import get_database_metadata

    register = get_database_metadata("EPSG.VERSION") or "unknown"
    return ("GDAL", rasterio.__gdal_version__), ("PROJ", pyproj.proj_version_str), ("EPSG", register)


@contextlib.contextmanager
def gdal_session() -> Iterator[None]:
    """Run the body with hopwright's GDAL options (25 µs to enter)."""
    import rasterio

    with rasterio.Env(**_OPTIONS):
        yield


def open_raster(file: RasterFile) -> Any:
    """Open a raster.

    Raises
    ------
    RasterError
        When no driver takes it: damaged, cut short, or not a raster.
    """
    import rasterio
    from rasterio.errors import NotGeoreferencedWarning, RasterioError

    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore", NotGeoreferencedWarning)
            return rasterio.open(file.source)
    except (RasterioError, ValueError) as error:
        reason = _first_line(error).removeprefix(f"'{file.source}' ").rstrip(".")
        raise RasterError(
            f"{file.name}: not readable as a raster ({reason}); the file is damaged or in a format that GDAL does not "
            "read: get it again, or leave it out"
        ) from error


def read_window(
    dataset: Any, band: int, rows: tuple[int, int], cols: tuple[int, int], *, name: str, masked: bool
) -> tuple[NDArray[Any], NDArray[np.bool_] | None]:
    """Raw cells of rows[0]:rows[1], cols[0]:cols[1], and where the raster's own mask band is valid (None: no mask)."""
    from rasterio.errors import RasterioError

    window = (rows, cols)
    try:
        cells = dataset.read(band, window=window)
        valid = dataset.read_masks(band, window=window) != 0 if masked else None
    except RasterioError as error:
        raise RasterError(
            f"{name}: cannot be read at rows {rows[0]} to {rows[1] - 1}, columns {cols[0]} to {cols[1] - 1} "
            f"({_first_line(error.__cause__ or error)}); the file is damaged or cut short: get it again"
        ) from error
    return cells, valid


def _first_line(error: BaseException) -> str:
    return " ".join(str(error).split()) or type(error).__name__


class OpenRasters:
    """Open datasets, the least recently used closed first, so that thousands of tiles need few handles."""

    __slots__ = ("_datasets", "_pieces")

    def __init__(self) -> None:
        self._datasets: OrderedDict[RasterFile, Any] = OrderedDict()
        self._pieces: dict[RasterFile, Pieces] = {}

    def get(self, file: RasterFile) -> Any:
        """Return the open dataset, opening it if need be."""
        dataset = self._datasets.get(file)
        if dataset is None:
            dataset = self._datasets[file] = open_raster(file)
            if len(self._datasets) > _HANDLES:
                self._datasets.popitem(last=False)[1].close()
        self._datasets.move_to_end(file)
        return dataset

    def pieces(self, file: RasterFile) -> Pieces:
        """Return the files that the raster is read from."""
        if file not in self._pieces:
            self._pieces[file] = find_pieces(self.get(file))
        return self._pieces[file]

    def close(self) -> None:
        """Close everything; a later `get` opens again."""
        while self._datasets:
            self._datasets.popitem()[1].close()
