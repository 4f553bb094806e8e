"""Where rasters of one resolution overlap along a path: by how much the one that answers differs from the others."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from profiler.models import SampleMethod
from profiler.terrain.cells import ReadTally
from profiler.terrain.describe import RasterInfo
from profiler.terrain.gdal import OpenRasters
from profiler.terrain.index import Index
from profiler.terrain.sampling import SampledGround, around_hits, ranked_hits
from profiler.units import Float

__all__ = ["Overlap", "find_overlaps"]


@dataclass(frozen=True, slots=True, eq=False)
class Overlap:
    """Two rasters of one resolution that hold heights at the same points: which points, and first less second."""

    first: RasterInfo
    second: RasterInfo
    point: NDArray[np.int64]
    difference_m: Float


def find_overlaps(
    index: Index, rasters: OpenRasters, longitude: Float, latitude: Float, ground: SampledGround, method: SampleMethod
) -> tuple[Overlap, ...]:
    """Compare the raster that answered at each point with every other of the same resolution that could have.

    Nothing is read where a point lies on one raster alone, or where a finer one answered. Points whose height was
    settled at an edge, or taken for the sea, are nobody's own and not compared.
    """
    hits, size = ranked_hits(index, longitude, latitude)
    # size of the cells of the raster that answered, by point; -1 where none did on its own
    answered = np.full(longitude.size, -1, dtype=np.int64)
    mine = (ground.tile[hits.point] == hits.tile) & ~(ground.edge | ground.sea)[hits.point]
    answered[hits.point[mine]] = size[mine]
    rivals = hits.inside & (ground.tile[hits.point] != hits.tile) & (size == answered[hits.point])
    if not rivals.any():
        return ()
    hits = hits.take(rivals)
    candidates = np.flatnonzero(np.bincount(hits.tile, minlength=len(index.tiles)))
    around = around_hits(index, rasters, hits, candidates, ReadTally(), method)
    known = (around.weight >= 1.0 - 1e-9) & ~around.void
    hits, other_m = hits.take(known), around.value[known]
    first = ground.tile[hits.point]
    difference_m = ground.height_m[hits.point] - other_m
    pairs = first * len(index.tiles) + hits.tile
    return tuple(
        Overlap(
            index.tiles[int(pair) // len(index.tiles)].info,
            index.tiles[int(pair) % len(index.tiles)].info,
            hits.point[pairs == pair],
            difference_m[pairs == pair],
        )
        for pair in np.unique(pairs)
    )
