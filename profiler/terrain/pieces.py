"""Which files a raster is read from: itself, those beside it, and the pieces of a virtual mosaic (VRT)."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray

from profiler.terrain.files import RasterFile, Window, on_disk

__all__ = ["Pieces", "find_pieces"]


_BESIDE = (".aux.xml", ".msk")
"""What GDAL reads beside any raster, the pieces of a mosaic included; a mosaic lists only the pieces."""


@dataclass(frozen=True, slots=True, eq=False)
class Pieces:
    """Files on disk, one or more times each, and the window of the raster that each fills, (n, 4)."""

    files: tuple[Path, ...]
    windows: NDArray[np.int64]

    def under(self, windows: Iterable[Window]) -> tuple[Path, ...]:
        """Files that any of the windows touches, each once."""
        first_row, end_row, first_col, end_col = self.windows.T
        touched = np.zeros(len(self.files), dtype=bool)
        for top, bottom, left, right in windows:
            touched |= (first_row < bottom) & (end_row > top) & (first_col < right) & (end_col > left)
        read = dict.fromkeys(self.files[i] for i in np.flatnonzero(touched))
        beside = {path: [path.with_name(path.name + ending) for ending in _BESIDE] for path in read}
        return tuple(dict.fromkeys(each for path in read for each in (path, *beside[path]) if each.is_file()))


def find_pieces(file: RasterFile, dataset: Any) -> Pieces:
    """Files that a raster is read from, those in archives as the archive; no file of the network is one."""
    whole = (0, dataset.height, 0, dataset.width)
    beside = [] if file.pieces else dataset.files
    found = [(file.path, whole)]
    found += [(path, whole) for name in beside if (path := on_disk(name)) is not None]
    found += [(path, piece.window) for piece in file.pieces if (path := on_disk(piece.source)) is not None]
    return Pieces(tuple(path for path, _ in found), np.array([window for _, window in found], dtype=np.int64))
