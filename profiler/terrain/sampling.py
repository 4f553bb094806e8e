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

__all__ = ["Around", "SampledGround", "around_hits", "lattice_cells", "ranked_hits", "sample_ground"]

_FULL = 1.0 - 1e-9
_NONE = np.iinfo(np.int64).max


@dataclass(frozen=True, slots=True, eq=False)
class SampledGround:
    """Heights at points (NaN missing), the tile each came from (-1 none), where an edge was settled, and the cost.

    `sea` says where void cells were taken for the sea.
    """

    height_m: Float
    tile: Ints
    edge: NDArray[np.bool_]
    sea: NDArray[np.bool_]
    covered: NDArray[np.bool_]
    tally: ReadTally


@dataclass(frozen=True, slots=True, eq=False)
class Around:
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


def ranked_hits(index: Index, longitude: Float, latitude: Float) -> tuple[Hits, Ints]:
    """Pairs of points and tiles, those of a point from the finest cells to the coarsest, and the size of their cells.

    Sizes are in steps of 0.1 %, so that rounding does not choose between two products of the same grid: of tiles of one
    size the first given comes first.
    """
    hits = find_hits(index, longitude, latitude)
    names, sides = lattice_cells(index, hits)
    sizes = np.rint(1000.0 * np.log(sides.prod(axis=1) + 1e-300) / 2.0).astype(np.int64)
    size = sizes[np.searchsorted(names, index.lattice[hits.tile])]
    order = np.lexsort((hits.tile, size, hits.point))
    return hits.take(order), size[order]


def sample_ground(
    index: Index,
    rasters: OpenRasters,
    longitude: Float,
    latitude: Float,
    method: SampleMethod,
    *,
    voids_are_sea: bool = False,
) -> SampledGround:
    """Heights in metres at points (n,) in degrees on WGS 84; NaN where no raster has one."""
    hits, size = ranked_hits(index, longitude, latitude)
    candidates = np.flatnonzero(np.bincount(hits.tile, minlength=len(index.tiles)))

    # every point asks its finest tile first; those that it leaves open ask their next, all points of a turn at once
    n, tally = longitude.size, ReadTally()
    height, tile, finest = np.full(n, np.nan), np.full(n, -1, dtype=np.int64), np.full(n, _NONE)
    edges: list[tuple[Ints, Around]] = []
    todo = np.flatnonzero(hits.inside)
    covered = np.zeros(n, dtype=bool)
    covered[hits.point[todo]] = True
    while todo.size:
        first = np.diff(hits.point[todo], prepend=-1) > 0
        now, rest = todo[first], todo[~first]
        around = around_hits(index, rasters, hits.take(now), candidates, tally, method)
        whole = (around.weight >= _FULL) & ~around.void
        done = now[whole]
        height[hits.point[done]] = around.value[whole]
        tile[hits.point[done]], finest[hits.point[done]] = hits.tile[done], size[done]
        edges.append((now[~whole], _pick(around, ~whole)))
        todo = rest[np.isnan(height[hits.point[rest]])]

    # a tile that a point lies just beyond may still hold cells around it: it is asked where none finer answered
    near = np.flatnonzero(~hits.inside & (size < finest[hits.point]))
    if near.size:
        edges.append((near, around_hits(index, rasters, hits.take(near), candidates, tally, method)))
    edge = _settle_edges(index, hits, size, edges, height, tile, finest, method)
    sea = np.zeros(n, dtype=bool)
    if voids_are_sea:
        # last of all: a void that a coarser raster fills is no sea; the finest tile's cells again, voids now at 0 m
        left = np.flatnonzero(hits.inside & np.isnan(height[hits.point]))
        left = left[np.diff(hits.point[left], prepend=-1) > 0]
        around = around_hits(index, rasters, hits.take(left), candidates, tally, method, void_m=0.0)
        height[hits.point[left]] = around.value / (around.weight if method == "bilinear" else 1.0)
        tile[hits.point[left]] = hits.tile[left]
        sea[hits.point[left]] = True
    return SampledGround(height, tile, edge, sea, covered, tally)


def _pick(around: Around, which: NDArray[np.bool_]) -> Around:
    return Around(around.value[which], around.weight[which], around.void[which])


def around_hits(
    index: Index,
    rasters: OpenRasters,
    hits: Hits,
    candidates: Ints,
    tally: ReadTally,
    method: SampleMethod,
    *,
    void_m: float = np.nan,
) -> Around:
    """Combine the cells around each hit, voids at the height given; a cell of no weight is not looked at."""
    # the four cells whose centres stand around the hit, and what share each has in a bilinear blend
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
    # only near an edge does a cell lie in a neighbour of the same lattice, or nowhere; elsewhere nothing is looked up
    if not ((hits.u >= 0) & (hits.u <= far_col) & (hits.v >= 0) & (hits.v <= far_row)).all():
        tile = np.where(exists, tile, -1)
        tile[exists], cols[exists], rows[exists] = locate_cells(
            index, tile[exists], cols[exists], rows[exists], candidates
        )
        exists &= tile >= 0
    # all cells of all hits in one call: each block of each file is then read once
    wanted = ... if exists.all() else exists
    cells[wanted] = fetch_heights(
        index, rasters, tile[wanted].ravel(), cols[wanted].ravel(), rows[wanted].ravel(), tally
    ).reshape(cells[wanted].shape)
    void = np.asarray(np.isnan(cells).any(axis=0))
    cells[np.isnan(cells)] = void_m
    used = np.where(exists, weight, 0.0)
    if method == "bilinear":
        value = (used * cells).sum(axis=0)
    else:
        value = np.where(exists, cells, -np.inf).max(axis=0, initial=-np.inf)
    return Around(value, used.sum(axis=0), void)


def _settle_edges(
    index: Index,
    hits: Hits,
    size: Ints,
    edges: list[tuple[Ints, Around]],
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
    # every reading that was not whole: the sum over the cells that exist, and the weight that they carry
    value = np.concatenate([around.value for _, around in edges])
    weight = np.concatenate([around.weight for _, around in edges])
    void = np.concatenate([around.void for _, around in edges])
    keep = np.flatnonzero(~void & (weight > 0.0) & (size[which] < finest[hits.point[which]]))
    # two tiles of one lattice saw the same cells: one reading for each point and lattice, or they would count twice
    key = hits.point[which[keep]] * len(index.tiles) + index.lattice[hits.tile[which[keep]]]
    keep = keep[np.unique(key, return_index=True)[1]]
    which, value, weight = which[keep], value[keep], weight[keep]
    point = hits.point[which]

    # scale the weights that are there to one: the straight line across a seam, or the edge value held
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
    # the tile that counts as the source is the one of most weight: written last, it stays
    strongest = np.argsort(weight, kind="stable")
    strongest = strongest[settled[point[strongest]]]
    tile[point[strongest]] = hits.tile[which[strongest]]
    return settled
