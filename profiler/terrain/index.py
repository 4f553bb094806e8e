"""Which rasters reach which points: tiles by CRS, and tiles that continue one another's grid as one lattice.

Tiles cut from one grid have the same CRS, the same cell vectors and corners a whole number of cells apart. They form a
*lattice*: a cell that a tile lacks at its edge is looked up in the neighbour, so that a seam is no edge at all.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from profiler.terrain.describe import Tile
from profiler.terrain.placing import by_crs
from profiler.terrain.proj import from_lonlat
from profiler.terrain.reference import Reference
from profiler.units import Float

__all__ = ["Group", "Hits", "Index", "Ints", "build_index", "find_hits", "locate_cells", "turned"]

Ints = NDArray[np.int64]

_ALIGNED_CELLS = 1e-3
"""Tiles whose corners miss a common grid by less are one grid: printed cell sizes round, real shifts are larger."""

_SNAP_CELLS = 1e-6
"""A point this near a line of cell centres or an edge is on it: coordinates do not carry more digits."""


@dataclass(frozen=True, slots=True, eq=False)
class Group:
    """The tiles of one CRS: their ids, and the box that all their outlines lie in (degrees; `span` eastward)."""

    reference: Reference
    tiles: Ints
    west: float
    span: float
    south: float
    north: float


@dataclass(frozen=True, slots=True, eq=False)
class Index:
    """Every tile as a row of arrays, so that points meet thousands of tiles without a loop over them.

    `inverse` takes (x, y) to (column, row) counted from cell centres; `box` is the middle and half sides of the
    outline in the CRS, one cell wider; `lattice` and `offset` place a tile's first cell; `around` is the number of
    columns round the globe where the lattice closes on itself, else 0.
    """

    tiles: tuple[Tile, ...]
    groups: tuple[Group, ...]
    inverse: Float
    size: Ints
    box: Float
    lattice: Ints
    offset: Ints
    around: Ints


@dataclass(frozen=True, slots=True, eq=False)
class Hits:
    """Pairs of a point and a tile whose cells reach it; `u`, `v` count columns and rows from the tile's first centre.

    `inside` says that the point lies on the tile; the others lie beyond its edge, by less than one cell from a centre.
    """

    point: Ints
    tile: Ints
    u: Float
    v: Float
    inside: NDArray[np.bool_]

    def take(self, which: NDArray[np.intp] | NDArray[np.bool_]) -> Hits:
        """Return the chosen pairs, in the order chosen."""
        return Hits(self.point[which], self.tile[which], self.u[which], self.v[which], self.inside[which])


def build_index(tiles: Sequence[Tile]) -> Index:
    """Arrange described tiles for look-up."""
    from rasterio.transform import Affine

    # every tile a row: what follows is arithmetic on whole columns, for a folder may hold thousands
    affine = np.array([tile.affine for tile in tiles])
    size = np.array([(tile.info.width, tile.info.height) for tile in tiles], dtype=np.int64)
    inverse = np.array([(~Affine(*tile.affine))[:6] for tile in tiles])
    inverse[:, [2, 5]] -= 0.5  # an affine counts from the corner of the first cell, all else here from its centre
    groups = tuple(_group(tiles, members) for members in by_crs(tiles))
    lattice = np.full(len(tiles), -1, dtype=np.int64)
    offset = np.zeros((len(tiles), 2), dtype=np.int64)
    around = np.zeros(len(tiles), dtype=np.int64)
    for group in groups:
        _join_lattices(group, affine, inverse, size, lattice, offset, around)
    return Index(
        tiles=tuple(tiles),
        groups=groups,
        inverse=inverse,
        size=size,
        box=_boxes(affine, size),
        lattice=lattice,
        offset=offset,
        around=around,
    )


def _boxes(affine: Float, size: Ints) -> Float:
    """Middle x, middle y, half width, half height of each outline, with a cell to spare."""
    # a turned or sheared raster's outline: the middle is exact, and no corner is further off than both half sides
    a, b, c, d, e, f = affine.T
    width, height = size.T
    middle_x, middle_y = a * width / 2 + b * height / 2 + c, d * width / 2 + e * height / 2 + f
    half_x = (np.abs(a) * (width + 2) + np.abs(b) * (height + 2)) / 2
    half_y = (np.abs(d) * (width + 2) + np.abs(e) * (height + 2)) / 2
    return np.stack([middle_x, middle_y, half_x, half_y], axis=1)


def _group(tiles: Sequence[Tile], ids: Ints) -> Group:
    bounds = np.array([tiles[i].info.bounds for i in ids])
    cell_deg = max(max(tiles[i].info.cell_x_m, tiles[i].info.cell_y_m) for i in ids) / 100_000.0
    south, north = bounds[:, 1].min() - 2 * cell_deg, bounds[:, 3].max() + 2 * cell_deg
    # longitudes shrink towards the poles: the margin grows, and close to one the whole circle is let in
    margin = 2 * cell_deg / max(np.cos(np.radians(min(max(abs(south), abs(north)), 90.0))), 1e-3)
    # longitudes turn: all are counted from the first tile's western edge, so that none is cut at the antimeridian
    west = bounds[0, 0]
    start = (bounds[:, 0] - west + 180.0) % 360.0 - 180.0
    end = start + np.where(bounds[:, 2] >= bounds[:, 0], 0.0, 360.0) + bounds[:, 2] - bounds[:, 0]
    low, high = start.min() - margin, end.max() + margin
    return Group(
        tiles[ids[0]].reference, ids, float(west + low), float(min(high - low, 360.0)), float(south), float(north)
    )


def _join_lattices(
    group: Group, affine: Float, inverse: Float, size: Ints, lattice: Ints, offset: Ints, around: Ints
) -> None:
    """Fill `lattice`, `offset` and `around` for the tiles of one CRS."""
    left = group.tiles
    while left.size:
        # the first tile left over begins a lattice; its cell is the measure for the others
        first = left[0]
        a, b, c, d, e, f = affine[first]
        ia, ib, _, id_, ie, _ = inverse[first]
        # how far, in cells of the first, a tile's own cell would drift over its longer side
        da, db, dd, de = (affine[left][:, [0, 1, 3, 4]] - [a, b, d, e]).T
        drift = np.abs([ia * da + ib * dd, ia * db + ib * de, id_ * da + ie * dd, id_ * db + ie * de])
        drift = drift.max(axis=0) * size[left].max(axis=1)
        # where each corner stands in the first's count: on the same grid it is whole numbers away
        dx, dy = affine[left][:, 2] - c, affine[left][:, 5] - f
        corner = np.stack([ia * dx + ib * dy, id_ * dx + ie * dy], axis=1)
        whole = np.rint(corner)
        same = (drift < _ALIGNED_CELLS) & (np.abs(corner - whole).max(axis=1) < _ALIGNED_CELLS)
        same[0] = True
        members = left[same]
        lattice[members] = first
        offset[members] = whole[same]
        # a lattice of longitudes whose cells divide the circle closes on itself: its last column is beside its first
        round_trip = group.reference.period / abs(a) if group.reference.period and b == d == 0.0 else 0.0
        if round_trip and abs(round_trip - round(round_trip)) < _ALIGNED_CELLS:
            around[members] = round(round_trip)
        left = left[~same]


def find_hits(index: Index, longitude: Float, latitude: Float) -> Hits:
    """Pair every point with every tile that reaches it, ordered by tile.

    Parameters
    ----------
    index
        The tiles.
    longitude, latitude
        Degrees on WGS 84, shape (n,).
    """
    found: list[Hits] = []
    for group in index.groups:
        # the box of the whole CRS first, in degrees: what lies outside need not be projected
        near = np.flatnonzero(
            (latitude >= group.south) & (latitude <= group.north) & ((longitude - group.west) % 360.0 <= group.span)
        )
        if not near.size:
            continue
        x, y = longitude[near], latitude[near]
        if not group.reference.is_wgs84:
            x, y = from_lonlat(group.reference.horizontal, x, y)
            there = np.isfinite(x)
            if not there.all():
                x, y, near = x[there], y[there], near[there]
        if near.size:
            found.extend(_hits_in_group(index, group, near, x, y))
    if not found:
        none = np.zeros(0, dtype=np.int64)
        return Hits(none, none, np.zeros(0), np.zeros(0), np.zeros(0, dtype=bool))
    return Hits(
        np.concatenate([hit.point for hit in found]),
        np.concatenate([hit.tile for hit in found]),
        np.concatenate([hit.u for hit in found]),
        np.concatenate([hit.v for hit in found]),
        np.concatenate([hit.inside for hit in found]),
    )


def _hits_in_group(index: Index, group: Group, point: Ints, x: Float, y: Float) -> list[Hits]:
    """Test the box around all the points against each tile's, and in those that meet it each point."""
    period, box = group.reference.period, index.box[group.tiles]
    turn = turned(x - x[0], period)
    half_x, half_y = np.ptp(turn) / 2, np.ptp(y) / 2
    middle_x, middle_y = x[0] + turn.min() + half_x, y.min() + half_y
    meets = (np.abs(turned(middle_x - box[:, 0], period)) <= half_x + box[:, 2]) & (
        np.abs(middle_y - box[:, 1]) <= half_y + box[:, 3]
    )
    found = []
    for tile in group.tiles[meets]:
        tile_x, tile_y, wide, high = index.box[tile]
        reach = np.flatnonzero(np.abs(y - tile_y) <= high)
        reach = reach[np.abs(turned(x[reach] - tile_x, period)) <= wide]
        if reach.size:
            found.append(_hits_on_tile(index, int(tile), point[reach], x[reach], y[reach], period))
    return found


def _hits_on_tile(index: Index, tile: int, point: Ints, x: Float, y: Float, period: float) -> Hits:
    if period:
        x = index.box[tile, 0] + turned(x - index.box[tile, 0], period)
    ia, ib, ic, id_, ie, if_ = index.inverse[tile]
    u, v = _snapped(ia * x + ib * y + ic), _snapped(id_ * x + ie * y + if_)
    width, height = index.size[tile]
    reached = np.flatnonzero((u > -1.0) & (u < width) & (v > -1.0) & (v < height))
    u, v = u[reached], v[reached]
    edge = 0.5 + _SNAP_CELLS
    inside = (u >= -edge) & (u <= width - 1.0 + edge) & (v >= -edge) & (v <= height - 1.0 + edge)
    return Hits(point[reached], np.full(reached.size, tile, dtype=np.int64), u, v, inside)


def turned(difference: Float, period: float) -> Float:
    """Differences of longitude the short way round; as they are where x is no longitude."""
    return difference - period * np.rint(difference / period) if period else difference


def _snapped(value: Float) -> Float:
    whole = np.rint(value)
    return np.where(np.abs(value - whole) < _SNAP_CELLS, whole, value)


def locate_cells(index: Index, tile: Ints, col: Ints, row: Ints, candidates: Ints) -> tuple[Ints, Ints, Ints]:
    """Find which tile holds each cell, given in the count of a tile of its lattice that may not reach so far.

    Parameters
    ----------
    index
        The tiles.
    tile, col, row
        Tile that the count refers to, and the cell in it, shape (m,).
    candidates
        Tiles to look in.

    Returns
    -------
    holder, col, row
        The tile that holds the cell (-1: none does) and the cell in that tile's own count.
    """
    # most cells lie in the tile that they were counted in: nothing to look up
    width, height = index.size[tile].T
    own = (col >= 0) & (col < width) & (row >= 0) & (row < height)
    if own.all():
        return tile, col, row
    holder, new_col, new_row = np.where(own, tile, -1), col.copy(), row.copy()
    away = np.flatnonzero(~own)
    # the rest in the lattice's own count, which every tile of it shares up to its offset
    lattice, around = index.lattice[tile[away]], index.around[tile[away]]
    far_col, far_row = col[away] + index.offset[tile[away], 0], row[away] + index.offset[tile[away], 1]
    closes = np.maximum(around, 1)
    for other in candidates:
        here_col, here_row = far_col - index.offset[other, 0], far_row - index.offset[other, 1]
        # round the globe a column has many numbers: the one within the circle counts
        here_col = np.where(around > 0, here_col % closes, here_col)
        fits = (lattice == index.lattice[other]) & (holder[away] < 0)
        fits &= (
            (here_col >= 0) & (here_col < index.size[other, 0]) & (here_row >= 0) & (here_row < index.size[other, 1])
        )
        holder[away[fits]] = other
        new_col[away[fits]], new_row[away[fits]] = here_col[fits], here_row[fits]
    return holder, new_col, new_row
