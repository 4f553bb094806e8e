"""Where a path crosses the lines on which its rasters bend or step: through cell centres, along cell edges.

Between two such lines the bilinear ground under a straight path is a parabola in the distance, the highest of the cells
around is constant, and a class is one class. So the lines are all that must be known of the grid to be exact.
"""

from __future__ import annotations

import numpy as np

from profiler.terrain.index import Group, Index, Ints, turned
from profiler.terrain.proj import from_lonlat
from profiler.units import Float

__all__ = ["find_crossings"]

_LEAST_MOVE_CELLS = 1e-5
"""A stretch that moves less than this across the lines runs along them: where it meets one is rounding."""


def find_crossings(index: Index, longitude: Float, latitude: Float, *, cell_edges: bool) -> Float:
    """Fractions of the way along a path, 0 to 1 in no order, at which it crosses the lines of every raster it meets.

    The positions are taken in threes (start, middle, end of a stretch, each end the next start), through which column
    and row are parabolas: over a 128th of a path of 100 km that is good to a millimetre up to 80° latitude. Nothing is
    assumed of where the path goes: one that turns back across a line within a stretch meets it twice.

    Parameters
    ----------
    index
        The tiles.
    longitude, latitude
        Degrees on WGS 84, equally far apart along the path, (2·m + 1,).
    cell_edges
        The lines between cells, on which classes step, in place of those through cell centres, on which heights bend.
    """
    found = [np.zeros(0)]
    for group in index.groups:
        if not _near(group, longitude, latitude):
            continue
        x, y = longitude, latitude
        if not group.reference.is_wgs84:
            x, y = from_lonlat(group.reference.horizontal, x, y)
        if group.reference.period:
            x = np.unwrap(x, period=group.reference.period)
        if np.isfinite(x).any():
            for tile in _tiles_near(index, group, x, y):
                found.append(_on_tile(index, tile, _threes(x), _threes(y), group.reference.period, cell_edges))
    return np.concatenate(found) / (longitude.size // 2)


def _near(group: Group, longitude: Float, latitude: Float) -> bool:
    """Whether the box of a path meets the box of all the tiles of a CRS."""
    if latitude.max() < group.south or latitude.min() > group.north:
        return False
    east = np.unwrap(longitude, period=360.0)
    half = np.ptp(east) / 2.0
    apart = turned(east.min() + half - (group.west + group.span / 2.0), 360.0)
    return bool(abs(apart) <= half + group.span / 2.0)


def _tiles_near(index: Index, group: Group, x: Float, y: Float) -> Ints:
    """Tiles whose box the box of the path meets."""
    there, box = np.isfinite(x), index.box[group.tiles]
    half_x, half_y = np.ptp(x[there]) / 2.0, np.ptp(y[there]) / 2.0
    apart_x = turned(x[there].min() + half_x - box[:, 0], group.reference.period)
    apart_y = y[there].min() + half_y - box[:, 1]
    return np.asarray(group.tiles[(np.abs(apart_x) <= half_x + box[:, 2]) & (np.abs(apart_y) <= half_y + box[:, 3])])


def _threes(values: Float) -> Float:
    """Start, middle and end of every stretch, (3, m)."""
    return np.stack((values[:-2:2], values[1:-1:2], values[2::2]))


def _on_tile(index: Index, tile: int, x: Float, y: Float, period: float, cell_edges: bool) -> Float:
    """Crossings of the lines of one tile, counted in stretches from the start, where its cells reach."""
    if period:
        x = x - period * np.rint((x[1] - index.box[tile, 0]) / period)
    ia, ib, ic, id_, ie, if_ = index.inverse[tile]
    counts = np.stack((ia * x + ib * y + ic, id_ * x + ie * y + if_), axis=1)  # start, middle, end; column, row
    size = index.size[tile]
    reached = ((counts.max(axis=0) >= -1.0) & (counts.min(axis=0) <= size[:, None])).all(axis=0)
    stretch = np.flatnonzero(reached)
    count = counts[:, :, stretch].reshape(3, -1)
    stretch = np.tile(stretch, 2)
    if cell_edges:
        return _meets_whole(count + 0.5, stretch)
    # beyond the outermost centres a raster holds its edge value, and half a cell further it ends
    last = np.repeat(size - 1.0, stretch.size // 2)
    low, high = _extremes(count)
    found = [_meets_whole(count, stretch)]
    for edge in (np.full(last.size, -0.5), last + 0.5):
        met = np.flatnonzero((low <= edge) & (edge <= high))
        if met.size:
            found.append(_roots(count[:, met], edge[met], stretch[met]))
    return np.concatenate(found)


def _extremes(count: Float) -> tuple[Float, Float]:
    """Least and greatest of the parabolas: one that turns between its three values goes at most so much further."""
    further = np.abs(count[0] + count[2] - 2.0 * count[1]) / 8.0
    return count.min(axis=0) - further, count.max(axis=0) + further


def _meets_whole(count: Float, stretch: Ints) -> Float:
    """Where the parabolas pass whole numbers."""
    low, high = _extremes(count)
    first = np.ceil(low)
    lines = np.where(high - low > _LEAST_MOVE_CELLS, np.floor(high) - first + 1.0, 0.0).astype(np.int64)
    which = np.repeat(np.arange(lines.size), lines)
    level = first[which] + np.arange(which.size) - (np.cumsum(lines) - lines)[which]
    return _roots(count[:, which], level, stretch[which])


def _roots(count: Float, level: Float, stretch: Ints) -> Float:
    """Where parabolas through three values, half a stretch apart, meet a level each: stretch + t, t in [0, 1]."""
    b = 4.0 * count[1] - 3.0 * count[0] - count[2]
    a, c = 2.0 * (count[0] + count[2] - 2.0 * count[1]), count[0] - level
    q = -0.5 * (b + np.copysign(np.sqrt(np.maximum(b * b - 4.0 * a * c, 0.0)), b))  # no difference of near equals
    with np.errstate(divide="ignore", invalid="ignore"):
        t = np.stack((c / q, q / a))
    return np.asarray((stretch + t)[(t >= 0.0) & (t <= 1.0)])
