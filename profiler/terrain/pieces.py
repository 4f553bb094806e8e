"""Which files a raster is read from: itself, those beside it, and the pieces of a virtual mosaic (VRT)."""

from __future__ import annotations

import math
import os
import re
from collections import defaultdict
from collections.abc import Iterable
from dataclasses import dataclass
from pathlib import Path
from typing import Any
from xml.etree import ElementTree

import numpy as np
from numpy.typing import NDArray

__all__ = ["Pieces", "Window", "find_pieces"]

_SIDES = {"xOff", "yOff", "xSize", "ySize"}

Window = tuple[int, int, int, int]
"""First row, end row, first column, end column."""


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
        return tuple(dict.fromkeys(self.files[i] for i in np.flatnonzero(touched)))


def find_pieces(dataset: Any) -> Pieces:
    """Files that GDAL reads an open dataset from, those in archives as the archive; no file of the network is one.

    A VRT among the pieces of a VRT stands for itself: its own pieces are not looked up.
    """
    filled = _filled(dataset) if dataset.driver == "VRT" else {}
    whole = (0, dataset.height, 0, dataset.width)
    found = [
        (path, window)
        for name in dataset.files
        if (path := _on_disk(name)) is not None
        for window in filled.get(os.path.normpath(name), [whole])
    ]
    return Pieces(tuple(path for path, _ in found), np.array([window for _, window in found], dtype=np.int64))


def _filled(dataset: Any) -> dict[str, list[Window]]:
    """Windows that the sources of a VRT fill, by their names; a source that does not say where is not among them."""
    found: dict[str, list[Window]] = defaultdict(list)
    for source in ElementTree.fromstring(dataset.tags(ns="xml:VRT")["xml:VRT"]).iter():
        name, place = source.find("SourceFilename"), source.find("DstRect")
        if name is None or place is None or not place.attrib.keys() >= _SIDES:
            continue
        left, top, wide, high = (float(place.attrib[side]) for side in ("xOff", "yOff", "xSize", "ySize"))
        window = math.floor(top), math.ceil(top + high), math.floor(left), math.ceil(left + wide)
        folder = Path(dataset.name).parent if name.get("relativeToVRT") == "1" else Path()
        found[os.path.normpath(folder / (name.text or ""))].append(window)
    return found


def _on_disk(name: str) -> Path | None:
    """File that holds what GDAL calls `name`, which may be inside an archive."""
    path = Path(re.sub(r"^(/vsi[a-z]+/)+", "", name))
    return next((each for each in (path, *path.parents) if each.is_file()), None)
