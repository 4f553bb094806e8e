"""The edge to GDAL: one environment, quiet opening, its failures as one-line errors."""

from __future__ import annotations

import contextlib
import os
import warnings
from collections import OrderedDict
from collections.abc import Iterator
from typing import Any

import numpy as np
from numpy.typing import NDArray

from profiler.errors import RasterError
from profiler.printable import printable
from profiler.surroundings import unheard
from profiler.terrain.files import Piece, RasterFile, Window, on_disk, read_bytes
from profiler.terrain.pieces import Pieces, find_pieces
from profiler.terrain.sound import require_plain_beside, require_whole
from profiler.terrain.virtual import is_virtual

__all__ = [
    "LARGE_BLOCK_CELLS",
    "OpenRasters",
    "gdal_failures",
    "gdal_session",
    "library_versions",
    "open_raster",
    "read_window",
]

_DRIVERS = [
    "GTiff", "SRTMHGT", "DTED", "AAIGrid", "GRASSASCIIGrid", "HFA", "EHdr", "ENVI", "BT", "USGSDEM", "SDTS", "GSAG",
    "GSBG", "GS7BG", "netCDF", "BAG", "Terragen", "JP2OpenJPEG", "HF2", "SAGA", "RST", "SIGDEM", "XYZ", "NITF", "GXF",
    "AIG", "PCRaster", "NWT_GRD", "Leveller", "PNG", "JPEG", "GIF", "WEBP", "BMP",
]  # fmt: skip
"""Formats that hold cells themselves. GDAL's others reach for services, data bases, indexes of further files."""

_OPTIONS = {
    "GDAL_CACHEMAX": 64_000_000,  # bytes; the default is 5 % of the machine, which grows with the mosaic
    "GDAL_DISABLE_READDIR_ON_OPEN": "TRUE",  # else each of thousands of tiles lists the whole folder
    "GTIFF_REPORT_COMPD_CS": "YES",  # GeoTIFF 1.0 files hide their vertical CRS otherwise
    "REPORT_COMPD_CS": "YES",  # the same for DTED and .hgt, whose formats define EGM96
    "AAIGRID_DATATYPE": "Float64",  # else whole numbers in the first lines make 4.7 further down a 4
    "GRASSASCIIGRID_DATATYPE": "Float64",
    "GDAL_VRT_ENABLE_PYTHON": "NO",
    "GDAL_CONFIG_FILE": os.devnull,
    "GDAL_DRIVER_PATH": "disable",
}

_NO_NETWORK = {"CPL_VSIL_CURL_ALLOWED_FILENAME": "none"}
"""GDAL's files of the network (/vsicurl, /vsis3 and all their kin) open under this name alone."""

LARGE_BLOCK_CELLS = 4_000_000
"""From here on a block is not read whole where the format allows it."""

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
def gdal_session(*, allow_network: bool = False) -> Iterator[None]:
    """Run the body with hopwright's GDAL options, deaf to the environment and to the network (45 µs to enter)."""
    with unheard():
        import rasterio

        with rasterio.Env(**_OPTIONS, **({} if allow_network else _NO_NETWORK)):
            yield


@contextlib.contextmanager
def gdal_failures(name: str) -> Iterator[None]:
    """Turn what GDAL says of a damaged raster inside the body into one line that names the raster."""
    from rasterio._err import CPLE_BaseError  # rasterio hands it on from where it only asks for metadata
    from rasterio.errors import RasterioError

    try:
        yield
    except (CPLE_BaseError, RasterioError, UnicodeError) as error:
        reason = _first_line(error.__cause__ or error)
        raise RasterError(
            f"{name}: cannot be read ({reason}); the file is damaged or cut short: get it again"
        ) from error


def open_raster(file: RasterFile) -> Any:
    """Open a raster, by its own format alone or as the mosaic that its text was found to be.

    Raises
    ------
    RasterError
        When no driver takes it: damaged, cut short, or not a raster.
    """
    import rasterio
    from rasterio.errors import NotGeoreferencedWarning, RasterioError
    from rasterio.io import DatasetReader

    drivers = ["VRT"] if file.types else _DRIVERS
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore", NotGeoreferencedWarning)
            dataset = DatasetReader(file.source, driver=drivers, sharing=False)
            if dataset.driver == "GTiff" and _has_large_block(dataset) and dataset.compression is None:
                dataset.close()
                with rasterio.Env(GTIFF_DIRECT_IO="YES"):  # the cells asked for, not the whole block around them
                    dataset = DatasetReader(file.source, driver=drivers, sharing=False)
            return dataset
    except (RasterioError, ValueError, UnicodeError) as error:
        reason = _first_line(error).replace(f"'{file.source}' ", "").replace(file.source, file.name).rstrip(".")
        raise RasterError(
            f"{file.name}: not readable as a raster ({reason}); the file is damaged or in a format that GDAL does not "
            "read: get it again, or leave it out"
        ) from error


def _has_large_block(dataset: Any) -> bool:
    return bool(dataset.count) and dataset.block_shapes[0][0] * dataset.block_shapes[0][1] > LARGE_BLOCK_CELLS


def read_window(
    dataset: Any, band: int, rows: tuple[int, int], cols: tuple[int, int], *, file: RasterFile, masked: bool
) -> tuple[NDArray[Any], NDArray[np.bool_] | None]:
    """Raw cells of rows[0]:rows[1], cols[0]:cols[1], and where the raster's own mask band is valid (None: no mask)."""
    from rasterio._err import CPLE_BaseError
    from rasterio.errors import RasterioError

    window = (rows, cols)
    try:
        cells = dataset.read(band, window=window)
        valid = dataset.read_masks(band, window=window) != 0 if masked else None
    except (CPLE_BaseError, RasterioError) as error:
        raise RasterError(
            f"{file.name}: cannot be read at rows {rows[0]} to {rows[1] - 1}, columns {cols[0]} to {cols[1] - 1} "
            f"({_first_line(error.__cause__ or error)}); the file is damaged or cut short: get it again"
        ) from error
    return cells, valid


def _first_line(error: BaseException) -> str:
    text = " ".join(printable(str(error)).split()) or type(error).__name__
    return text if len(text) < 300 else text[:300] + "…"


def _require_sound_piece(piece: Piece, mosaic: str) -> None:
    """Refuse a piece of a mosaic that is no plain raster, or has missing cells that the mosaic would not know of.

    Raises
    ------
    RasterError
        Naming the mosaic and the piece.
    """
    path = on_disk(piece.source)
    if path is None or (piece.source.lower().endswith(".vrt") and is_virtual(read_bytes(piece.source, 4096))):
        return  # of the network, as allowed; or rewritten with the mosaic, its own pieces among the mosaic's
    name = f"{mosaic}: {printable(piece.source)}"
    if is_virtual(read_bytes(piece.source, 4096)):
        raise RasterError(f"{name}: is a VRT with another ending; name it .vrt, or make a GeoTIFF of it")
    require_plain_beside(piece.source, name)
    with open_raster(RasterFile(path, "", piece.source, named=True)) as dataset, gdal_failures(name):
        all_written = require_whole(dataset, piece.source, name)
        flags = {flag.name for flags in dataset.mask_flag_enums for flag in flags}
        others = {value for value in dataset.nodatavals if value is not None}
        if piece.marker is not None and "all_valid" not in flags and others != {piece.marker}:
            raise RasterError(
                f"{name}: says itself which cells are missing, and the mosaic takes {piece.marker:g} for that; make "
                "the mosaic without -srcnodata"
            )
        # what was never written reads as 0, and the mosaic would hand that on
        if "all_valid" in flags and piece.marker != 0.0 and not all_written:
            raise RasterError(
                f"{name}: has, or may have, blocks that were never written and declares no nodata, so that "
                "they read as 0 m; declare one (gdal_edit -a_nodata)"
            )


class OpenRasters:
    """Open datasets, the least recently used closed first, so that thousands of tiles need few handles."""

    __slots__ = ("_datasets", "_pieces", "_sound", "_sparse", "_windows")

    def __init__(self) -> None:
        self._datasets: OrderedDict[RasterFile, Any] = OrderedDict()
        self._pieces: dict[RasterFile, Pieces] = {}
        self._sound: set[Piece | RasterFile] = set()
        self._sparse: set[RasterFile] = set()
        self._windows: dict[RasterFile, NDArray[np.int64]] = {}

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
            self._pieces[file] = find_pieces(file, self.get(file))
        return self._pieces[file]

    def may_be_sparse(self, file: RasterFile, window: Window) -> bool:
        """Whether the file may have blocks that were never written; a mosaic knows of its own gaps.

        Refuses a file that is not whole, or pieces under the window that are not; each is looked into once.
        """
        if not file.types:
            if file not in self._sound:
                with gdal_failures(file.name):
                    if not require_whole(self.get(file), file.source, file.name):
                        self._sparse.add(file)
                self._sound.add(file)
            return file in self._sparse
        if file not in self._windows:
            self._windows[file] = np.array([piece.window for piece in file.pieces], dtype=np.int64).reshape(-1, 4)
        first_row, end_row, first_col, end_col = self._windows[file].T
        top, bottom, left, right = window
        under = (first_row < bottom) & (end_row > top) & (first_col < right) & (end_col > left)
        for piece in (file.pieces[i] for i in np.flatnonzero(under)):
            if piece not in self._sound:
                _require_sound_piece(piece, file.name)
                self._sound.add(piece)
        return False

    def close(self) -> None:
        """Close everything; a later `get` opens again."""
        while self._datasets:
            self._datasets.popitem()[1].close()
