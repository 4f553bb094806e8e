"""Fetch single cells from rasters, each block read once, and turn them into metres; count what it cost."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from profiler.errors import RasterError
from profiler.terrain.describe import Tile
from profiler.terrain.files import Window
from profiler.terrain.gdal import LARGE_BLOCK_CELLS, OpenRasters
from profiler.terrain.index import Index, Ints
from profiler.terrain.reading import read_cells
from profiler.units import Float

__all__ = ["ReadTally", "fetch", "fetch_heights", "to_metres"]

_MARKERS = (-32768.0, -32767.0, -9999.0, -99999.0, 9999.0, 32767.0, 65535.0, 99999.0)
"""What rasters write for "no height" when they forget to declare it (common practice, no source)."""

_LOWEST_GROUND_M, _LOWEST_SEABED_M, _HIGHEST_M = -500.0, -12_000.0, 9_000.0
"""No dry ground, no sea bed and no summit lies beyond (Dead Sea shore -430, Challenger Deep -10 935, Everest 8 849)."""


@dataclass(slots=True)
class ReadTally:
    """What reading cost and met, by tile."""

    windows: dict[int, list[Window]] = field(default_factory=dict)
    blocks: dict[int, int] = field(default_factory=dict)
    read_bytes: dict[int, int] = field(default_factory=dict)
    large: set[tuple[int, int, int]] = field(default_factory=set)
    undeclared: dict[int, dict[float, int]] = field(default_factory=dict)
    seabed: set[int] = field(default_factory=set)

    def count(self, number: int, tile: Tile, rows: tuple[int, int], cols: tuple[int, int]) -> None:
        """Add the window rows[0]:rows[1], cols[0]:cols[1], the blocks that it touches, and the cells in them."""
        self.windows.setdefault(number, []).append((*rows, *cols))
        block_rows, block_cols = tile.block
        first_row, last_row = rows[0] // block_rows, (rows[1] - 1) // block_rows
        first_col, last_col = cols[0] // block_cols, (cols[1] - 1) // block_cols
        high = min((last_row + 1) * block_rows, tile.info.height) - first_row * block_rows
        wide = min((last_col + 1) * block_cols, tile.info.width) - first_col * block_cols
        blocks = (last_row - first_row + 1) * (last_col - first_col + 1)
        if block_rows * block_cols > LARGE_BLOCK_CELLS:  # read in parts: each block counts once
            if (number, first_row, first_col) in self.large:
                return
            self.large.add((number, first_row, first_col))
        self.blocks[number] = self.blocks.get(number, 0) + blocks
        self.read_bytes[number] = self.read_bytes.get(number, 0) + high * wide * tile.coding.item_bytes

    def meet(self, number: int, markers: Float) -> None:
        """Remember undeclared markers of missing ground."""
        counts = self.undeclared.setdefault(number, {})
        for value, count in zip(*np.unique(markers, return_counts=True), strict=True):
            counts[float(value)] = counts.get(float(value), 0) + int(count)

    def notes(self, number: int) -> tuple[str, ...]:
        """Sentences for the provenance about one tile."""
        told = tuple(
            f"holds {value:g} in {count} of the cells read without declaring it as nodata: taken as missing"
            for value, count in sorted(self.undeclared.get(number, {}).items())
        )
        return (*told, "ground below -500 m: the raster may hold the sea bed") if number in self.seabed else told


def fetch(
    tile: Tile, number: int, rasters: OpenRasters, col: Ints, row: Ints, tally: ReadTally
) -> tuple[Float, NDArray[np.bool_] | None]:
    """Fetch stored values of single cells (float64, exact for 32-bit types), and where a mask band holds them valid.

    Cells are sorted into groups of blocks; the rectangle around the wanted cells of a group is read once, and only
    the blocks under it. Nothing but the wanted cells is kept.
    """
    raw = np.empty(col.size)
    valid: NDArray[np.bool_] | None = None
    key = (row // tile.read_cells[0] << 32) | (col // tile.read_cells[1])
    order = np.argsort(key, kind="stable")  # wanted cells come nearly in order: this is quick
    starts = np.flatnonzero(np.diff(key[order])) + 1
    for which in np.split(order, starts) if starts.size else [slice(None)]:
        part_col, part_row = col[which], row[which]
        rows, cols = _span(part_row), _span(part_col)
        cells, cells_valid = read_cells(rasters, tile, rows, cols)
        tally.count(number, tile, rows, cols)
        at = (part_row - rows[0]) * (cols[1] - cols[0]) + (part_col - cols[0])
        raw[which] = cells.ravel()[at]
        if cells_valid is not None:
            valid = np.ones(col.size, dtype=bool) if valid is None else valid
            valid[which] = cells_valid.ravel()[at]
    return raw, valid


def _span(numbers: Ints) -> tuple[int, int]:
    return int(numbers.min()), int(numbers.max()) + 1


def fetch_heights(index: Index, rasters: OpenRasters, tile: Ints, col: Ints, row: Ints, tally: ReadTally) -> Float:
    """Heights of single cells in metres, NaN where missing.

    Raises
    ------
    RasterError
        When a cell holds a height that no place on earth has.
    """
    if not tile.size:
        return np.empty(0)
    if tile.min() == tile.max():
        return _heights_on_tile(index, int(tile[0]), rasters, col, row, tally)
    height = np.empty(tile.size)
    order = np.argsort(tile, kind="stable")
    for which in np.split(order, np.flatnonzero(np.diff(tile[order])) + 1):
        height[which] = _heights_on_tile(index, int(tile[which[0]]), rasters, col[which], row[which], tally)
    return height


def _heights_on_tile(index: Index, number: int, rasters: OpenRasters, col: Ints, row: Ints, tally: ReadTally) -> Float:
    tile = index.tiles[number]
    raw, valid = fetch(tile, number, rasters, col, row, tally)
    return to_metres(tile, number, raw, valid, tally, lambda i: (int(col[i]), int(row[i])))


def to_metres(
    tile: Tile,
    number: int,
    raw: Float,
    valid: NDArray[np.bool_] | None,
    tally: ReadTally,
    place: Callable[[int], tuple[int, int]],
) -> Float:
    """Heights in metres of stored values (n,), NaN where missing; `place` tells the column and row of the i-th.

    Beyond what any dry ground has, an undeclared marker is missing, a sea bed is noted, and the rest is an error.

    Raises
    ------
    RasterError
        When a cell holds a height that no place on earth has.
    """
    coding = tile.coding
    height = raw * coding.scale_m + coding.offset_m
    if not math.isnan(coding.nodata):
        height[raw == coding.nodata] = np.nan
    if valid is not None:
        height[~valid] = np.nan
    odd = np.flatnonzero((height < _LOWEST_GROUND_M) | (height > _HIGHEST_M))
    if not odd.size:
        return height
    marker = np.isin(raw[odd], _MARKERS) | (np.abs(raw[odd]) > 1e9)
    height[odd[marker]] = np.nan
    tally.meet(number, raw[odd[marker]])
    odd = odd[~marker]
    impossible = odd[(height[odd] < _LOWEST_SEABED_M) | (height[odd] > _HIGHEST_M)]
    if impossible.size:
        col, row = place(int(impossible[0]))
        raise RasterError(
            f"{tile.info.name}: holds {height[impossible[0]]:g} m at column {col}, row {row}, where ground lies "
            f"between {_LOWEST_SEABED_M:g} and {_HIGHEST_M:g} m; correct its unit ({tile.info.unit}), scale or nodata"
        )
    if odd.size:
        tally.seabed.add(number)
    return height
