"""Read windows of cells with the truth about each: GDAL gives 0 for cells that were never written, or lie hidden."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from profiler.errors import RasterError
from profiler.terrain.describe import Tile
from profiler.terrain.gdal import LARGE_BLOCK_CELLS, OpenRasters, read_window

__all__ = ["Span", "read_cells"]

Span = tuple[int, int]
"""First row (or column), and the one after the last."""

_MOST_BYTES = 1_000_000_000
"""A block must be unpacked whole to read one cell of it; beyond this GDAL would need more than many machines have."""


def read_cells(
    rasters: OpenRasters, tile: Tile, rows: Span, cols: Span
) -> tuple[NDArray[Any], NDArray[np.bool_] | None]:
    """Read the stored cells of a window, and which of them hold something (None: all but those of the marker's value).

    Raises
    ------
    RasterError
        When a file is damaged or cut short, or its blocks are too large to unpack.
    """
    coding = tile.coding
    dataset = rasters.get(tile.file)
    if tile.block[0] * tile.block[1] > LARGE_BLOCK_CELLS:
        _require_small_blocks(dataset, tile)
    # where the raster declares a marker, blocks that were never written read as that, and need no second look
    sparse = rasters.may_be_sparse(tile.file, (*rows, *cols)) and np.isnan(coding.nodata)
    by_zeros = sparse and tile.info.driver == "HFA"
    inner: tuple[slice, slice] = slice(None), slice(None)
    if by_zeros:
        rows, cols, inner = _to_whole_blocks(tile, rows, cols)
    cells, valid = read_window(dataset, coding.band, rows, cols, file=tile.file, masked=coding.masked)
    shown: list[NDArray[np.bool_]] = []
    if coding.alpha:
        shown.append(read_window(dataset, coding.alpha, rows, cols, file=tile.file, masked=False)[0] != 0)
    if by_zeros:
        shown.append(_not_all_zero(tile, cells))
    elif sparse:
        shown.append(_written(dataset, tile, rows, cols))
    for seen in shown:
        valid = seen if valid is None else valid & seen
    return cells[inner], None if valid is None else valid[inner]


def _require_small_blocks(dataset: Any, tile: Tile) -> None:
    high, wide = (min(side, whole) for side, whole in zip(tile.block, (tile.info.height, tile.info.width), strict=True))
    size = high * wide * tile.coding.item_bytes
    if size > _MOST_BYTES and not (tile.info.driver == "GTiff" and dataset.compression is None):
        raise RasterError(
            f"{tile.info.name}: is stored in blocks of {wide} x {high} cells, of {size / 1e9:.1f} GB each, "
            "which must be unpacked whole; make tiles of it (gdal_translate -of COG in.tif out.tif) and give those"
        )


def _blocks(tile: Tile, rows: Span, cols: Span) -> tuple[range, range]:
    high, wide = tile.block
    return range(rows[0] // high, (rows[1] - 1) // high + 1), range(cols[0] // wide, (cols[1] - 1) // wide + 1)


def _written(dataset: Any, tile: Tile, rows: Span, cols: Span) -> NDArray[np.bool_]:
    """Which cells of a window of a GeoTIFF lie in blocks that were ever written: one without a place reads as 0."""
    down, across = _blocks(tile, rows, cols)
    there = [
        [dataset.get_tag_item(f"BLOCK_OFFSET_{x}_{y}", "TIFF", bidx=tile.coding.band) is not None for x in across]
        for y in down
    ]
    return _per_cell(np.array(there), tile, rows, cols)


def _per_cell(blocks: NDArray[np.bool_], tile: Tile, rows: Span, cols: Span) -> NDArray[np.bool_]:
    """Spread what holds for blocks over the cells of a window."""
    high, wide = tile.block
    row = np.arange(*rows) // high - rows[0] // high
    col = np.arange(*cols) // wide - cols[0] // wide
    return blocks[row[:, None], col[None, :]]


def _to_whole_blocks(tile: Tile, rows: Span, cols: Span) -> tuple[Span, Span, tuple[slice, slice]]:
    """Widen a window to the edges of its blocks; return where the window lies in the wider one too."""
    wider = []
    for (first, end), side, whole in zip((rows, cols), tile.block, (tile.info.height, tile.info.width), strict=True):
        wider.append((first // side * side, min(-(-end // side) * side, whole)))
    inner = tuple(slice(span[0] - out[0], span[1] - out[0]) for span, out in zip((rows, cols), wider, strict=True))
    return wider[0], wider[1], (inner[0], inner[1])


def _not_all_zero(tile: Tile, cells: NDArray[Any]) -> NDArray[np.bool_]:
    """Which cells of whole blocks lie in blocks that hold anything but 0.

    An Imagine file does not let through which of its blocks were never written; they are nothing but zeros.
    """
    high, wide = tile.block
    down, across = range(0, cells.shape[0], high), range(0, cells.shape[1], wide)
    blocks = [[bool(cells[y : y + high, x : x + wide].any()) for x in across] for y in down]
    return _per_cell(np.array(blocks), tile, (0, cells.shape[0]), (0, cells.shape[1]))
