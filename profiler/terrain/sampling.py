"""Ground heights at points from every raster that reaches them: the finest that has data, seams and edges settled.

For each point the rasters on which it lies are tried from the finest cell to the coarsest. A raster answers when every
cell that carries weight is there and holds a height, its neighbours on the same lattice included; a void anywhere
among them passes the point on. What is left lies in the outermost half cell of its rasters, where cells are absent
rather than void: there the weights of the cells that do exist, in all the lattices that reach the point, are scaled to
one. Between two rasters whose grids meet edge to edge that is the straight line from one to the other; at the outer
edge of everything it holds the edge value.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from profiler.models import SampleMethod
from profiler.terrain.cells import ReadTally, fetch_heights
from profiler.terrain.gdal import OpenRasters
from profiler.terrain.index import Hits, Index, Ints, find_hits, locate_cells
from profiler.terrain.placing import by_crs, cells_on_ground
from profiler.units import Float

__all__ = ["SampledGround", "lattice_cells", "sample_ground"]

_FULL = 1.0 - 1e-9
_NONE = np.iinfo(np.int64).max


@dataclass(frozen=True, slots=True, eq=False)
class SampledGround:
    """Heights at points (NaN missing), the tile each came from (-1 none), where an edge was settled, and the cost."""

    height_m: Float
    tile: Ints
    edge: NDArray[np.bool_]
    covered: NDArray[np.bool_]
    tally: ReadTally


@dataclass(frozen=True, slots=True, eq=False)
class _Around:
    """The cells around points that exist: Σ weight · height (or the highest), Σ weight, and whether any is void."""

    value: Float
    weight: Float
    void: NDArray[np.bool_]


def lattice_cells(index: Index, hits: Hits) -> tuple[Ints, Float]:
    """Lattices among the hits, and the two sides of their cells on the ground (metres) about where they are hit.

    The hits are ordered by tile, as they are found.
    """
    starts = np.flatnonzero(np.diff(hits.tile, prepend=-1))
    names, which = np.unique(index.lattice[hits.tile[starts]], return_index=True)
    first = starts[which]
    sides = np.empty((names.size, 2))
    tiles = [index.tiles[k] for k in hits.tile[first]]
    for members in by_crs(tiles):
        affine = np.array([tiles[i].affine for i in members])
        at = first[members]
        sides[members] = cells_on_ground(tiles[members[0]].reference, affine, hits.u[at], hits.v[at])
    return names, sides


def sample_ground(
    index: Index, rasters: OpenRasters, longitude: Float, latitude: Float, method: SampleMethod
) -> SampledGround:
    """Heights in metres at points (n,) in degrees on WGS 84; NaN where no raster has one."""
    hits = find_hits(index, longitude, latitude)
    names, sides = lattice_cells(index, hits)
    # sizes within 0.1 % are one resolution, so that rounding does not choose between two products of the same grid
    sizes = np.rint(1000.0 * np.log(sides.prod(axis=1) + 1e-300) / 2.0).astype(np.int64)
    size = sizes[np.searchsorted(names, index.lattice[hits.tile])]
    order = np.lexsort((hits.tile, size, hits.point))
    hits, size = hits.take(order), size[order]
    candidates = np.flatnonzero(np.bincount(hits.tile, minlength=len(index.tiles)))

    n, tally = longitude.size, ReadTally()
    height, tile, finest = np.full(n, np.nan), np.full(n, -1, dtype=np.int64), np.full(n, _NONE)
    edges: list[tuple[Ints, _Around]] = []
    todo = np.flatnonzero(hits.inside)
    covered = np.zeros(n, dtype=bool)
    covered[hits.point[todo]] = True
    while todo.size:
        first = np.diff(hits.point[todo], prepend=-1) > 0
        now, rest = todo[first], todo[~first]
        around = _around(index, rasters, hits.take(now), candidates, tally, method)
        whole = (around.weight >= _FULL) & ~around.void
        done = now[whole]
        height[hits.point[done]] = around.value[whole]
        tile[hits.point[done]], finest[hits.point[done]] = hits.tile[done], size[done]
        edges.append((now[~whole], _pick(around, ~whole)))
        todo = rest[np.isnan(height[hits.point[rest]])]

    near = np.flatnonzero(~hits.inside & (size < finest[hits.point]))
    if near.size:
        edges.append((near, _around(index, rasters, hits.take(near), candidates, tally, method)))
    edge = _settle_edges(index, hits, size, edges, height, tile, finest, method)
    return SampledGround(height, tile, edge, covered, tally)


def _pick(around: _Around, which: NDArray[np.bool_]) -> _Around:
    return _Around(around.value[which], around.weight[which], around.void[which])


def _around(
    index: Index, rasters: OpenRasters, hits: Hits, candidates: Ints, tally: ReadTally, method: SampleMethod
) -> _Around:
    """Combine the cells around each hit; a cell of no weight is not looked at."""
    col, row = np.floor(hits.u), np.floor(hits.v)
    right, down = hits.u - col, hits.v - row
    weight = np.stack([(1 - right) * (1 - down), right * (1 - down), (1 - right) * down, right * down])
    near_col, near_row = col.astype(np.int64), row.astype(np.int64)
    cols = np.stack([near_col, near_col + 1, near_col, near_col + 1])
    rows = np.stack([near_row, near_row, near_row + 1, near_row + 1])
    exists = weight > 0.0
    cells = np.zeros(weight.shape)
    far_col, far_row = index.size[hits.tile].T - 1
    tile = np.broadcast_to(hits.tile, weight.shape)
    if not ((hits.u >= 0) & (hits.u <= far_col) & (hits.v >= 0) & (hits.v <= far_row)).all():
        tile = np.where(exists, tile, -1)
        tile[exists], cols[exists], rows[exists] = locate_cells(
            index, tile[exists], cols[exists], rows[exists], candidates
        )
        exists &= tile >= 0
    wanted = ... if exists.all() else exists
    cells[wanted] = fetch_heights(
        index, rasters, tile[wanted].ravel(), cols[wanted].ravel(), rows[wanted].ravel(), tally
    ).reshape(cells[wanted].shape)
    void = np.asarray(np.isnan(cells).any(axis=0))
    used = np.where(exists, weight, 0.0)
    if method == "bilinear":
        value = (used * cells).sum(axis=0)
    else:
        value = np.where(exists, cells, -np.inf).max(axis=0, initial=-np.inf)
    return _Around(value, used.sum(axis=0), void)


def _settle_edges(
    index: Index,
    hits: Hits,
    size: Ints,
    edges: list[tuple[Ints, _Around]],
    height: Float,
    tile: Ints,
    finest: Ints,
    method: SampleMethod,
) -> NDArray[np.bool_]:
    """Fill, in place, points in the outermost half cell of rasters finer than any that answered; return which.

    A point needs either two lattices that reach it (together half the weight: a seam, or a gap of a fraction of a
    cell), or one on which it lies when no coarser raster answered either.
    """
    n = height.size
    settled = np.zeros(n, dtype=bool)
    which = np.concatenate([hit for hit, _ in edges]) if edges else np.zeros(0, dtype=np.int64)
    if not which.size:
        return settled
    value = np.concatenate([around.value for _, around in edges])
    weight = np.concatenate([around.weight for _, around in edges])
    void = np.concatenate([around.void for _, around in edges])
    keep = np.flatnonzero(~void & (weight > 0.0) & (size[which] < finest[hits.point[which]]))
    key = hits.point[which[keep]] * len(index.tiles) + index.lattice[hits.tile[which[keep]]]
    keep = keep[np.unique(key, return_index=True)[1]]
    which, value, weight = which[keep], value[keep], weight[keep]
    point = hits.point[which]

    total = np.bincount(point, weight, n)
    on_raster = np.bincount(point, hits.inside[which], n) > 0
    seam = (np.bincount(point, minlength=n) >= 2) & (total >= 0.5)
    settled = seam | (on_raster & np.isnan(height))
    if method == "bilinear":
        mixed = np.bincount(point, value, n)[settled] / total[settled]
    else:
        top = np.full(n, -np.inf)
        np.maximum.at(top, point, value)
        mixed = top[settled]
    height[settled] = mixed
    strongest = np.argsort(weight, kind="stable")
    strongest = strongest[settled[point[strongest]]]
    tile[point[strongest]] = hits.tile[which[strongest]]
    return settled
