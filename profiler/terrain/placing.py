"""Where rasters lie in degrees and how large their cells are in metres, for all rasters of a CRS in one go.

A call to PROJ costs as much as transforming a dozen points, and a folder may hold thousands of tiles.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from profiler.errors import RasterError
from profiler.terrain.describe import Bounds, Tile
from profiler.terrain.proj import distance_between, from_lonlat, to_lonlat
from profiler.terrain.reference import Reference
from profiler.units import Float

__all__ = ["by_crs", "cells_on_ground", "place", "require_placed"]


def by_crs(tiles: Sequence[Tile]) -> list[NDArray[np.int64]]:
    """Positions of the tiles in the sequence, gathered by horizontal CRS, in order of appearance."""
    groups: dict[str, list[int]] = {}
    for i, tile in enumerate(tiles):
        groups.setdefault(tile.reference.horizontal, []).append(i)
    return [np.array(members, dtype=np.int64) for members in groups.values()]


def place(tiles: Sequence[Tile]) -> list[Tile]:
    """Tiles with the bounds and cell sizes of their descriptions filled in; NaN where the CRS puts them nowhere."""
    placed = list(tiles)
    for members in by_crs(tiles):
        reference = tiles[members[0]].reference
        affine = np.array([tiles[i].affine for i in members])
        size = np.array([(tiles[i].info.width, tiles[i].info.height) for i in members], dtype=float)
        cells = cells_on_ground(reference, affine, (size[:, 0] - 1) / 2, (size[:, 1] - 1) / 2)
        for i, (x_m, y_m), bounds in zip(members, cells.tolist(), _bounds(reference, affine, size), strict=True):
            info = replace(tiles[i].info, cell_x_m=x_m, cell_y_m=y_m, bounds=bounds)
            placed[i] = replace(tiles[i], info=info)
    return placed


def require_placed(tile: Tile) -> None:
    """Refuse a raster that lies nowhere."""
    if not np.isfinite([*tile.info.bounds, tile.info.cell_x_m, tile.info.cell_y_m]).all():
        raise RasterError(
            f"{tile.info.name}: its corners fall nowhere on the earth in {tile.info.crs}; correct its CRS or corners"
        )


def cells_on_ground(reference: Reference, affine: Float, col: Float, row: Float) -> Float:
    """Metres on the ground along the row and along the column of the cell centred at (col, row), one line a tile.

    Geodesics between the middles of opposite sides of the cell: right at any latitude, over the antimeridian and near a
    pole, where differences of longitude are not.
    """
    u = np.stack([col, col + 1.0, col + 0.5, col + 0.5], axis=1)
    v = np.stack([row + 0.5, row + 0.5, row, row + 1.0], axis=1)
    longitude, latitude = _lonlat(reference, affine, u, v)
    return distance_between(longitude[:, ::2], latitude[:, ::2], longitude[:, 1::2], latitude[:, 1::2])


def _lonlat(reference: Reference, affine: Float, u: Float, v: Float) -> tuple[Float, Float]:
    """Degrees of column and row (counted from the corner), one line a tile."""
    a, b, c, d, e, f = affine.T[:, :, None]
    x, y = a * u + b * v + c, d * u + e * v + f
    return (x, y) if reference.is_wgs84 else to_lonlat(reference.horizontal, x, y)


def _bounds(reference: Reference, affine: Float, size: Float) -> list[Bounds]:
    """Degrees that each raster spans, from points along its outline, and the poles, which an outline goes round."""
    step = np.linspace(0.0, 1.0, 22)[:-1]
    u = size[:, :1] * np.concatenate([step, np.ones(21), 1.0 - step, np.zeros(21)])
    v = size[:, 1:] * np.concatenate([np.zeros(21), step, np.ones(21), 1.0 - step])
    longitude, latitude = _lonlat(reference, affine, u, v)
    poles = _poles_inside(reference, affine, size)
    turn = np.unwrap(longitude, period=360.0, axis=1)
    west, east = turn.min(axis=1), turn.max(axis=1)
    south, north = latitude.min(axis=1), latitude.max(axis=1)
    found = []
    for i in range(size.shape[0]):
        lost = np.isnan(longitude[i])
        if lost.all():
            found.append(Bounds(np.nan, np.nan, np.nan, np.nan))
        elif lost.any():  # an outline that leaves its own projection: exclude nothing
            found.append(Bounds(-180.0, -90.0, 180.0, 90.0))
        elif poles[i].any():
            found.append(Bounds(-180.0, -90.0 if poles[i, 1] else south[i], 180.0, 90.0 if poles[i, 0] else north[i]))
        elif east[i] - west[i] >= 360.0 - 1e-9:
            found.append(Bounds(-180.0, south[i], 180.0, north[i]))
        else:
            found.append(Bounds(_wrap(west[i]), south[i], _wrap(east[i]), north[i]))
    return [Bounds(*(float(side) for side in bounds)) for bounds in found]


def _wrap(longitude: float) -> float:
    """Longitude within -180° to 180°, either end kept as it came."""
    return longitude if -180.0 <= longitude <= 180.0 else (longitude + 180.0) % 360.0 - 180.0


def _poles_inside(reference: Reference, affine: Float, size: Float) -> NDArray[np.bool_]:
    """Whether the north and the south pole lie inside each raster; a geographic raster has them on its edge at most."""
    if reference.period:
        return np.zeros(size.shape, dtype=bool)
    x, y = from_lonlat(reference.horizontal, np.zeros(2), np.array([90.0, -90.0]))
    a, b, c, d, e, f = affine.T[:, :, None]
    col = (e * (x - c) - b * (y - f)) / (a * e - b * d)
    row = (a * (y - f) - d * (x - c)) / (a * e - b * d)
    return np.asarray((col >= 0) & (col <= size[:, :1]) & (row >= 0) & (row <= size[:, 1:]))
