"""The grids that a strip beside a path may meet: tiles that continue one another count as one."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from profiler.terrain.index import Group, Index, Ints, turned
from profiler.terrain.placing import cells_on_ground
from profiler.terrain.proj import from_lonlat
from profiler.terrain.strip import Strip
from profiler.units import Float

__all__ = ["Grid", "find_grids"]

_OUTLINE = 33


@dataclass(frozen=True, slots=True, eq=False)
class Grid:
    """One lattice of tiles that a strip may meet.

    Columns and rows count from the first cell centre of ``tile``; ``limits`` are the lowest and the highest column and
    row of the squares between cell centres that touch a cell. ``size_m2`` is that of a cell on the ground.
    """

    tile: int
    tiles: Ints
    limits: tuple[float, float, float, float]
    size_m2: float
    to_grid: Callable[[Float, Float], tuple[Float, Float]]

    def covers(self, strip: Strip) -> bool:
        """Whether the squares reach as far as the strip does."""
        side = float(strip.reach_m(np.array([strip.from_m]), np.array([strip.to_m]))[0])
        along = np.tile(np.linspace(strip.from_m, strip.to_m, _OUTLINE), 2)
        u, v = self.to_grid(*strip.position(along, np.repeat([-side, side], _OUTLINE)))
        low_u, high_u, low_v, high_v = self.limits
        return bool(np.all((u >= low_u) & (u <= high_u + 1.0) & (v >= low_v) & (v <= high_v + 1.0)))


def find_grids(index: Index, strip: Strip, *, cells: bool = False) -> list[Grid]:
    """Find the lattices whose tiles the box around a strip meets, the finest first; of equals the first tile's.

    With ``cells`` the squares are the cells themselves, in the order of the tiles.
    """
    along = np.tile(np.linspace(strip.from_m, strip.to_m, _OUTLINE), 3)
    side = float(strip.reach_m(np.array([strip.from_m]), np.array([strip.to_m]))[0])
    longitude, latitude = strip.position(along, np.repeat([-side, 0.0, side], _OUTLINE))
    found = []
    for group in index.groups:
        near = (latitude >= group.south) & (latitude <= group.north) & ((longitude - group.west) % 360.0 <= group.span)
        if not near.any():
            continue
        x, y = _plane(group, longitude, latitude)
        there = np.isfinite(x)
        if there.any():
            found += _grids_in_group(index, group, x[there], y[there], 0.5 if cells else 0.0)
    fineness = 0.0 if cells else 500.0
    return sorted(found, key=lambda grid: (round(fineness * np.log(grid.size_m2 + 1e-300)), grid.tile))


def _plane(group: Group, longitude: Float, latitude: Float) -> tuple[Float, Float]:
    """Coordinates in the CRS of a group of tiles, without a jump of longitude."""
    x, y = longitude, latitude
    if not group.reference.is_wgs84:
        x, y = from_lonlat(group.reference.horizontal, longitude, latitude)
    return x[0] + turned(x - x[0], group.reference.period), y


def _grids_in_group(index: Index, group: Group, x: Float, y: Float, shift: float) -> list[Grid]:
    period, box = group.reference.period, index.box[group.tiles]
    half_x, half_y = np.ptp(x) / 2, np.ptp(y) / 2
    middle_x, middle_y = x.min() + half_x, y.min() + half_y
    meets = (np.abs(turned(middle_x - box[:, 0], period)) <= half_x + box[:, 2]) & (
        np.abs(middle_y - box[:, 1]) <= half_y + box[:, 3]
    )
    met = group.tiles[meets]
    found = []
    for lattice in np.unique(index.lattice[met]):
        tiles = met[index.lattice[met] == lattice]
        tile = int(tiles[0])
        corner = index.offset[tiles] - index.offset[tile]
        low, high = corner.min(axis=0) - (1.0 - 2.0 * shift), (corner + index.size[tiles]).max(axis=0) - 1.0
        limits = (float(low[0]), float(high[0]), float(low[1]), float(high[1]))
        if index.around[tile]:  # it closes on itself: columns count on
            limits = (-np.inf, np.inf, *limits[2:])
        to_grid = _counter(index, group, tile, shift)
        u, v = _count(index, group, tile, middle_x, middle_y)
        sides = cells_on_ground(group.reference, np.array([index.tiles[tile].affine]), u, v)
        found.append(Grid(tile, tiles, limits, float(sides.prod()), to_grid))
    return found


def _count(index: Index, group: Group, tile: int, x: float, y: float) -> tuple[Float, Float]:
    ia, ib, ic, id_, ie, if_ = index.inverse[tile]
    middle = index.box[tile, 0]
    near = middle + turned(np.array([x]) - middle, group.reference.period)
    return ia * near + ib * y + ic, id_ * near + ie * y + if_


def _counter(index: Index, group: Group, tile: int, added: float) -> Callable[[Float, Float], tuple[Float, Float]]:
    """Column and row of longitudes and latitudes, counted from a tile's first cell centre, with something added."""
    ia, ib, ic, id_, ie, if_ = index.inverse[tile]
    middle = index.box[tile, 0]

    def to_grid(longitude: Float, latitude: Float) -> tuple[Float, Float]:
        x, y = _plane(group, longitude, latitude)
        shift = middle + turned(x[0] - middle, group.reference.period) - x[0]
        x = x + shift
        return ia * x + ib * y + ic + added, id_ * x + ie * y + if_ + added

    return to_grid
