"""Fetch single cells from rasters, each block read once, and turn them into metres; count what it cost."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from profiler.errors import RasterError
from profiler.terrain.describe import Tile
from profiler.terrain.gdal import OpenRasters, read_window
from profiler.terrain.index import Index, Ints
from profiler.units import Float

__all__ = ["Tally", "fetch", "fetch_heights", "to_metres"]

_MARKERS = (-32768.0, -32767.0, -9999.0, -99999.0, 9999.0, 32767.0, 65535.0, 99999.0)
"""What rasters write for "no height" when they forget to declare it (common practice, no source)."""

_LOWEST_GROUND_M, _LOWEST_SEABED_M, _HIGHEST_M = -500.0, -12_000.0, 9_000.0
"""No dry ground, no sea bed and no summit lies beyond (Dead Sea shore -430, Challenger Deep -10 935, Everest 8 849)."""


@dataclass(slots=True)
class Tally:
    """What reading cost and met, by tile."""

    blocks: dict[int, int] = field(default_factory=dict)
    read_bytes: dict[int, int] = field(default_factory=dict)
    undeclared: dict[int, dict[float, int]] = field(default_factory=dict)
    seabed: set[int] = field(default_factory=set)

    def count(self, number: int, tile: Tile, rows: tuple[int, int], cols: tuple[int, int]) -> None:
        """Add the blocks that the window rows[0]:rows[1], cols[0]:cols[1] touches, and the cells in them."""
        block_rows, block_cols = tile.block
        first_row, last_row = rows[0] // block_rows, (rows[1] - 1) // block_rows
        first_col, last_col = cols[0] // block_cols, (cols[1] - 1) // block_cols
        high = min((last_row + 1) * block_rows, tile.info.height) - first_row * block_rows
        wide = min((last_col + 1) * block_cols, tile.info.width) - first_col * block_cols
        blocks = (last_row - first_row + 1) * (last_col - first_col + 1)
        self.blocks[number] = self.blocks.get(number, 0) + blocks
        self.read_bytes[number] = self.read_bytes.get(number, 0) + high * wide * tile.coding.item_bytes

    def notes(self, number: int) -> tuple[str, ...]:
        """Sentences for the provenance about one tile."""
        told = tuple(
            f"holds {value:g} without declaring it as nodata ({count} cells near the path): taken as missing"
            for value, count in sorted(self.undeclared.get(number, {}).items())
        )
        return (*told, "ground below -500 m: the raster may hold the sea bed") if number in self.seabed else told


def fetch(
    index: Index, rasters: OpenRasters, tile: Ints, col: Ints, row: Ints, tally: Tally
) -> tuple[Float, NDArray[np.bool_]]:
    """Fetch stored values of single cells (float64, exact for 32-bit types), and where a mask band drops them.

    Cells are sorted into groups of blocks; the rectangle around the wanted cells of a group is read once, and only
    the blocks under it. Nothing but the wanted cells is kept.
    """
    raw = np.empty(tile.size)
    valid = np.ones(tile.size, dtype=bool)
    unit_rows, unit_cols = index.unit[tile].T
    key = (tile << 40) | ((row // unit_rows) << 20) | (col // unit_cols)
    order = np.argsort(key, kind="stable")
    starts = np.flatnonzero(np.diff(key[order], prepend=-1))
    for which in np.split(order, starts[1:]):
        if which.size:
            number = int(tile[which[0]])
            raw[which], valid[which] = _window(index.tiles[number], number, rasters, col[which], row[which], tally)
    return raw, valid


def _window(
    tile: Tile, number: int, rasters: OpenRasters, col: Ints, row: Ints, tally: Tally
) -> tuple[NDArray[Any], NDArray[np.bool_] | bool]:
    rows, cols = (int(row.min()), int(row.max()) + 1), (int(col.min()), int(col.max()) + 1)
    dataset = rasters.get(tile.file.source, tile.file.path)
    coding = tile.coding
    cells, valid = read_window(dataset, coding.band, rows, cols, path=tile.file.path, masked=coding.masked)
    tally.count(number, tile, rows, cols)
    at = (row - rows[0], col - cols[0])
    return cells[at], True if valid is None else valid[at]


def fetch_heights(index: Index, rasters: OpenRasters, tile: Ints, col: Ints, row: Ints, tally: Tally) -> Float:
    """Heights of single cells in metres, NaN where missing.

    Raises
    ------
    RasterError
        When a cell holds a height that no place on earth has.
    """
    raw, valid = fetch(index, rasters, tile, col, row, tally)
    height = raw * index.scale_m[tile] + index.offset_m[tile]
    height[(raw == index.nodata[tile]) | ~valid] = np.nan
    odd = np.flatnonzero((height < _LOWEST_GROUND_M) | (height > _HIGHEST_M))
    for number in np.unique(tile[odd]).tolist():
        mine = odd[tile[odd] == number]
        height[mine] = _judge(index.tiles[number], number, raw[mine], height[mine], col[mine], row[mine], tally)
    return height


def _judge(tile: Tile, number: int, raw: Float, height: Float, col: Ints, row: Ints, tally: Tally) -> Float:
    """Decide about heights no dry ground has: undeclared markers are missing, a sea bed is noted, the rest an error."""
    marker = np.isin(raw, _MARKERS) | (np.abs(raw) > 1e9)
    impossible = ~marker & ((height < _LOWEST_SEABED_M) | (height > _HIGHEST_M))
    if impossible.any():
        i = int(np.argmax(impossible))
        raise RasterError(
            f"{tile.info.name}: holds {height[i]:g} m at column {col[i]}, row {row[i]}, where ground lies between "
            f"{_LOWEST_SEABED_M:g} and {_HIGHEST_M:g} m; correct its unit ({tile.info.unit}), scale or nodata value"
        )
    if marker.any():
        counts = tally.undeclared.setdefault(number, {})
        for value, count in zip(*np.unique(raw[marker], return_counts=True), strict=True):
            counts[float(value)] = counts.get(float(value), 0) + int(count)
    if not marker.all():
        tally.seabed.add(number)
    return np.where(marker, np.nan, height)


def to_metres(tile: Tile, cells: NDArray[Any], valid: NDArray[np.bool_] | None) -> Float:
    """Heights of a whole window of one raster, NaN where missing by its own account or by an undeclared marker."""
    coding = tile.coding
    raw = cells.astype(float)
    height = raw * coding.scale_m + coding.offset_m
    odd = (height < _LOWEST_GROUND_M) | (height > _HIGHEST_M)
    missing = (raw == coding.nodata) | (odd & (np.isin(raw, _MARKERS) | (np.abs(raw) > 1e9)))
    return np.where(missing if valid is None else missing | ~valid, np.nan, height)
