"""Heights of one grid with the highest of every block of cells, so that most of a path is never looked at."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from profiler.units import Float

__all__ = ["BLOCK", "Blocks", "build_blocks"]

BLOCK = 16
"""Cells to a side: 32 opens too much of each path, 8 makes too many bounds."""


@dataclass(frozen=True, slots=True, eq=False)
class Blocks:
    """Cells of a grid, row by row, and the highest cell around every block.

    ``cells_m`` (rows · columns,) is float32, NaN where missing. ``highest_m`` (block rows · block columns,) covers for
    each block the cells from its first to the first of the next, both included, so that it bounds the bilinear surface
    over the block; infinite where a cell is missing, so that no bound hides a gap.
    """

    cells_m: NDArray[np.float32]
    columns: int
    rows: int
    highest_m: NDArray[np.float32]
    block_columns: int

    def height(self, column: Float, row: Float) -> Float:
        """Bilinear height at columns and rows counted from the first centre; NaN where a cell is missing or beyond."""
        inside = (column >= 0) & (column <= self.columns - 1) & (row >= 0) & (row <= self.rows - 1)
        col = np.clip(np.floor(column), 0, self.columns - 2).astype(np.int64)
        line = np.clip(np.floor(row), 0, self.rows - 2).astype(np.int64)
        right, down, at = column - col, row - line, line * self.columns + col
        upper, lower = (
            np.where(right > 0, left * (1 - right) + self.cells_m[first + 1] * right, left)
            for first in (at, at + self.columns)
            for left in (self.cells_m[first].astype(float),)
        )
        return np.where(inside, np.where(down > 0, upper * (1 - down) + lower * down, upper), np.nan)


def build_blocks(cells_m: ArrayLike) -> Blocks:
    """Find the highest cell around every block.

    Parameters
    ----------
    cells_m
        Heights, (rows, columns), two or more each way, NaN where missing.

    Returns
    -------
    Blocks

    Examples
    --------
    >>> blocks = build_blocks(np.arange(400.0).reshape(20, 20))
    >>> blocks.highest_m.reshape(-1, blocks.block_columns).tolist()
    [[336.0, 339.0], [396.0, 399.0]]
    >>> float(blocks.height(np.array(0.5), np.array(1.25)))
    25.5
    """
    cells = np.ascontiguousarray(cells_m, dtype=np.float32)
    rows, columns = cells.shape
    down, across = -(-(rows - 1) // BLOCK), -(-(columns - 1) // BLOCK)
    padded = np.full((down * BLOCK + 1, across * BLOCK + 1), -np.inf, dtype=np.float32)
    padded[:rows, :columns] = np.where(np.isnan(cells), np.float32(np.inf), cells)
    inner = padded[:-1, :-1].reshape(down, BLOCK, across, BLOCK).max(axis=(1, 3))
    right = padded[:-1, BLOCK::BLOCK].reshape(down, BLOCK, across).max(axis=1)
    below = padded[BLOCK::BLOCK, :-1].reshape(down, across, BLOCK).max(axis=2)
    highest = np.maximum(np.maximum(inner, right), np.maximum(below, padded[BLOCK::BLOCK, BLOCK::BLOCK]))
    return Blocks(cells.ravel(), columns, rows, highest.ravel(), across)
