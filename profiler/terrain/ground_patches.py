"""Ground beside a path as patches, from every raster that reaches the strip, as sampling has it.

A square of a grid answers as a whole: where all its four cells hold heights, the finest grid's does, and hides what
lies under it; elsewhere the next grid's. Where cells are absent, in the outermost half cell of all rasters, the edge
value holds. (Between grids of one cell size that meet edge to edge sampling blends; here both hold their edge value,
and the higher counts.)
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from profiler.models import SampleMethod
from profiler.patches import Patches, bilinear, cut_patches, join_patches
from profiler.terrain.cells import ReadTally, fetch_heights
from profiler.terrain.gdal import OpenRasters
from profiler.terrain.grids import Grid, find_grids
from profiler.terrain.index import Index, Ints, locate_cells
from profiler.terrain.sampling import SampledGround
from profiler.terrain.strip import Band, Strip, bands, touched
from profiler.units import Float

__all__ = ["Layer", "ground_patches", "hidden_out", "lay_over", "read_classes", "read_layers"]


@dataclass(frozen=True, slots=True, eq=False)
class Layer:
    """Squares of one grid and what they hold: heights at their corners (m, 4), NaN where the grid does not answer.

    At the outer edge of a grid a square answers in part, from ``low`` to ``high`` (m, 2) of its sides. ``sea`` squares,
    with voids taken for the sea at 0 m, answer where no other does.
    """

    band: Band
    corners: Float
    low: Float
    high: Float
    sea: bool = False

    @property
    def answers(self) -> NDArray[np.bool_]:
        """Squares that answer as a whole."""
        return np.asarray(self._known & self._full & (not self.sea))

    @property
    def in_part(self) -> NDArray[np.bool_]:
        """Squares that answer in part, or last of all."""
        return np.asarray(self._known & ~(self._full & (not self.sea)))

    @property
    def _known(self) -> NDArray[np.bool_]:
        return np.asarray(~np.isnan(self.corners).any(axis=1))

    @property
    def _full(self) -> NDArray[np.bool_]:
        return np.asarray((self.high - self.low == 1.0).all(axis=1))


def read_layers(
    index: Index, rasters: OpenRasters, strip: Strip, method: SampleMethod, *, voids_are_sea: bool = False
) -> tuple[list[Layer], SampledGround]:
    """Read the squares on a strip of every grid that reaches it, the finest first, and the cells for their sources.

    Grids under one that answers everywhere are left unread.
    """
    tally, layers, sea = ReadTally(), list[Layer](), list[Layer]()
    cells: list[tuple[Float, Ints]] = [(np.zeros(0), np.zeros(0, np.int64))]
    for grid in find_grids(index, strip):
        here = []
        for band in bands(strip, grid.to_grid, grid.limits):
            height, tile, at = _corner_cells(index, rasters, band, grid, tally)
            cells.append((height, np.where(np.isnan(height), -1, tile)))
            corners, exists = height[at], tile[at] >= 0
            here.append(_layer(band, corners, exists, method))
            if voids_are_sea and np.isnan(corners[exists]).any():
                flooded = _layer(band, np.where(exists & np.isnan(corners), 0.0, corners), exists, method)
                sea.append(replace(flooded, sea=True))
        layers += here
        if here and all(layer.answers.all() for layer in here) and grid.covers(strip):
            break
    heights, tiles = (np.concatenate(each) for each in zip(*cells, strict=True))
    none = np.zeros(heights.size, dtype=bool)
    return [*layers, *sea], SampledGround(heights, tiles, none, none, none, tally)


def read_classes(index: Index, strip: Strip, classes_of: Callable[[Ints, Ints, Ints], Ints]) -> list[Layer]:
    """Read the cells of class rasters on a strip, each a square of one class; the first grid is the one that counts.

    ``classes_of`` gives the classes of cells by tile, column and row, -1 where there is none.
    """
    layers = []
    for grid in find_grids(index, strip, cells=True):
        for band in bands(strip, grid.to_grid, grid.limits):
            col, row = (band.w, band.x) if band.track.swapped else (band.x, band.w)
            tile = np.full(col.size, grid.tile, dtype=np.int64)
            holder, col, row = locate_cells(index, tile, col.astype(np.int64), row.astype(np.int64), grid.tiles)
            found = np.full(col.size, np.nan)
            exists = holder >= 0
            classes = classes_of(holder[exists], col[exists], row[exists])
            found[exists] = np.where(classes >= 0, classes, np.nan)
            corners = np.repeat(found[:, None], 4, axis=1)
            layers.append(Layer(band, corners, np.zeros((col.size, 2)), np.ones((col.size, 2))))
    return layers


def ground_patches(layers: Sequence[Layer], strip: Strip) -> Patches | None:
    """Ground on a strip; None where no raster reaches it."""
    parts = []
    # where two grids end, the height between their outermost centres is a blend: at most the higher of both held on
    seam = sum(bool(layer.in_part.any()) and not layer.sea for layer in layers) > 1
    for number, layer in enumerate(layers):
        parts.append(hidden_out(_squares(layer, layer.answers), layers[:number], strip))
        parts.append(hidden_out(_squares(layer, layer.in_part, boxed=not seam), layers, strip))
    parts = [part for part in parts if part.size] or parts[:1]
    return join_patches(parts) if parts else None


def _corner_cells(
    index: Index, rasters: OpenRasters, band: Band, grid: Grid, tally: ReadTally
) -> tuple[Float, Ints, NDArray[np.intp]]:
    """Fetch every cell at a corner of a square once: heights, the tile of each (-1: absent), and (m, 4) which."""
    count = np.diff(band.starts)
    # a column of cells serves the squares to both of its sides
    none = np.iinfo(np.intp).max
    low = np.where(count > 0, band.lowest, none)
    high = np.where(count > 0, band.lowest + count, -none)
    low, high = (
        np.minimum(np.append(low, none), np.append(none, low)),
        np.maximum(np.append(high, -none), np.append(-none, high)),
    )
    tall = np.maximum(high - low + 1, 0)
    low = np.where(tall > 0, low, 0)
    starts = np.append(0, np.cumsum(tall))
    column = np.repeat(np.arange(tall.size), tall)
    x, w = band.first + column, low[column] + np.arange(column.size) - starts[column]
    col, row = (w, x) if band.track.swapped else (x, w)
    tile = np.full(col.size, grid.tile, dtype=np.int64)
    holder, own_col, own_row = locate_cells(index, tile, col.astype(np.int64), row.astype(np.int64), grid.tiles)
    height = np.full(col.size, np.nan)
    exists = holder >= 0
    height[exists] = fetch_heights(index, rasters, holder[exists], own_col[exists], own_row[exists], tally)
    for other in grid.tiles[1:]:  # a cell that is void in one tile may be there in another that overlaps it
        void = np.flatnonzero(np.isnan(height) & (holder >= 0) & (holder != other))
        at = np.full(void.size, other)
        own_col, own_row = (
            each[void] - index.offset[other, side] + index.offset[grid.tile, side]
            for side, each in enumerate((col, row))
        )
        there = ((own_col >= 0) & (own_col < index.size[other, 0])) & (
            (own_row >= 0) & (own_row < index.size[other, 1])
        )
        void, at, own_col, own_row = (each[there] for each in (void, at, own_col, own_row))
        height[void], holder[void] = fetch_heights(index, rasters, at, own_col, own_row, tally), other
    at = band.x - band.first
    near, far = starts[at] + band.w - low[at], starts[at + 1] + band.w - low[at + 1]
    return height, holder, np.stack((near, far, near + 1, far + 1), axis=1)


def _layer(band: Band, corners: Float, exists: NDArray[np.bool_], method: SampleMethod) -> Layer:
    """Squares of a band with what they answer.

    Where some cells are absent each that is there holds its height to the edge, half a cell on: beyond two absent
    neighbours the straight line between the two others goes on level, and at a corner one cell is left.
    """
    there = exists & ~np.isnan(corners)
    usable = (exists == there).all(axis=1) & there.any(axis=1)
    low, high = np.zeros((band.x.size, 2)), np.ones((band.x.size, 2))
    if not exists[usable].all():
        for side, (near, far) in enumerate((([0, 2], [1, 3]), ([0, 1], [2, 3]))):
            low[:, side] = np.where(exists[:, near].any(axis=1), 0.0, 0.5)
            high[:, side] = np.where(exists[:, far].any(axis=1), 1.0, 0.5)
        for partner in ((1, 0, 3, 2), (2, 3, 0, 1)):  # across, then up: what is absent takes its neighbour's height
            corners = np.where(exists, corners, corners[:, partner])
            exists = exists | exists[:, partner]
    corners = np.where(usable[:, None], corners, np.nan)
    if method == "highest":
        corners = np.repeat(corners.max(axis=1, keepdims=True), 4, axis=1)
    return Layer(band, corners, low, high)


def _squares(layer: Layer, which: NDArray[np.bool_], *, boxed: bool = False) -> Patches:
    """Make patches of ground of some squares of a layer, cut to the part that answers if asked for."""
    band, (z00, z10, z01, z11) = layer.band, layer.corners[which].T
    none = np.zeros(z00.size)
    squares = Patches(
        along_m=band.along_m[which],
        across_m=band.across_m[which],
        surface_m=np.stack([z00, z10 - z00, z01 - z00, z00 + z11 - z10 - z01, none, none], axis=1),
        cover_m=np.zeros((z00.size, 6)),
        window=np.empty((z00.size, 0, 3)),
        whole=np.ones(z00.size, dtype=bool),
    )
    own = np.tile([[0.0, 1.0, 0.0], [0.0, 0.0, 1.0]], (z00.size, 1, 1))
    return cut_patches(squares, _boxed(own, layer, which))[0] if boxed else squares


def _boxed(forms: Float, layer: Layer, square: NDArray[np.intp] | NDArray[np.bool_]) -> Float:
    """Forms that are 0 to 1 in the part of the squares that answers."""
    low, wide = layer.low[square], (layer.high - layer.low)[square]
    boxed = forms.copy()
    boxed[:, :, 0] -= low
    return np.asarray(boxed / wide[:, :, None])


def hidden_out(patches: Patches, layers: Sequence[Layer], strip: Strip) -> Patches:
    """Leave out of patches what lies under whole squares of layers that answer."""
    for layer in layers:
        if not patches.size:
            break
        forms = layer.band.track.forms(patches.along_m, patches.across_m)
        which, x, w = touched(forms)
        square = layer.band.find(x, w)
        hides = np.where(square >= 0, layer.answers[square], False)
        some = np.zeros(patches.size, dtype=bool)
        some[which[hides]] = True
        pairs = some[which] & ~hides
        own = _from_corner(forms[which[pairs]], x[pairs], w[pairs])
        left = cut_patches(patches.take(which[pairs]), own)[0]
        patches = join_patches([patches.take(~some), _within(left, strip)])
    return patches


def _from_corner(forms: Float, x: NDArray[np.intp], w: NDArray[np.intp]) -> Float:
    """Forms counted from the lower corners of squares."""
    own = forms.copy()
    own[:, 0, 0] -= x
    own[:, 1, 0] -= w
    return own


def _within(patches: Patches, strip: Strip) -> Patches:
    """Leave out patches beside the strip."""
    ends = (np.clip(each, strip.from_m, strip.to_m) for each in patches.reach_m)
    middle = patches.across_m[:, 0] + 0.5 * patches.across_m[:, 1:].sum(axis=1)
    half = 0.5 * np.abs(patches.across_m[:, 1:]).sum(axis=1)
    return patches.take(np.abs(middle) - half <= strip.reach_m(*ends))


def lay_over(patches: Patches, layer: Layer) -> Patches:
    """Patches of ground with cover on them: the part of each that lies under squares of a layer of cover."""
    band = layer.band
    forms = band.track.forms(patches.along_m, patches.across_m)
    which, x, w = touched(forms)
    square = band.find(x, w)
    has = np.flatnonzero((square >= 0) & ~np.isnan(layer.corners[square]).any(axis=1))
    which, square = which[has], square[has]
    own = _from_corner(forms[which], x[has], w[has])
    under, kept = cut_patches(patches.take(which), _boxed(own, layer, square))
    square = square[kept]
    own = _from_corner(band.track.forms(under.along_m, under.across_m), band.x[square], band.w[square])
    cover = bilinear(own, layer.corners[square])
    return replace(under, surface_m=under.surface_m + cover, cover_m=under.cover_m + cover)
