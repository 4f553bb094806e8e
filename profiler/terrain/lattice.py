"""One grid of cells out of many rasters: for whoever looks at so many places that single cells would be slow."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from profiler.terrain.cells import ReadTally, to_metres
from profiler.terrain.gdal import OpenRasters
from profiler.terrain.index import Index, find_hits
from profiler.terrain.proj import from_lonlat
from profiler.terrain.reading import read_cells
from profiler.terrain.reference import Reference, datum_key
from profiler.terrain.sampling import lattice_cells
from profiler.units import Float

__all__ = ["Lattice", "finest_lattice", "lattice_window"]

_POLAR_DEG, _SPARE_DEG = 80.0, 0.05
"""Close to a pole a box of degrees says little."""


@dataclass(frozen=True, slots=True, eq=False)
class Lattice:
    """Tiles cut from one grid, as a plane of columns and rows that count from the first cell centre of one of them.

    ``number`` is that tile's, and ``longitude`` a place near which it is used, so that a path over the antimeridian
    stays in one piece. ``alone`` says that no other lattice has cells between the places it was asked for, and that its
    tiles are not known to be on different vertical datums: what is missing in it is missing.
    """

    number: int
    reference: Reference
    inverse: Float
    longitude: float
    alone: bool

    def to_cells(self, longitude: Float, latitude: Float) -> tuple[Float, Float]:
        """Give column and row of positions, WGS 84 degrees, of any shape."""
        x, y = self.longitude + (longitude - self.longitude + 180.0) % 360.0 - 180.0, latitude
        if not self.reference.is_wgs84:
            x, y = from_lonlat(self.reference.horizontal, x, y)
        ia, ib, ic, id_, ie, if_ = self.inverse
        return ia * x + ib * y + ic, id_ * x + ie * y + if_


def finest_lattice(index: Index, longitude: Float, latitude: Float) -> Lattice | None:
    """Find the lattice with the smallest cells under any of the positions, degrees, (n,); None where there is none."""
    hits = find_hits(index, longitude, latitude)
    hits = hits.take(hits.inside)
    if not hits.point.size:
        return None
    names, sides = lattice_cells(index, hits)
    number = int(names[np.argmin(sides.prod(axis=1))])
    near = _near(index, longitude, latitude)
    datums = {index.tiles[i].info.vertical_datum for i in near} - {None}
    alone = len(set(index.lattice[near].tolist())) == 1 and len({datum_key(datum) for datum in datums if datum}) < 2
    return Lattice(number, index.tiles[number].reference, index.inverse[number], float(longitude[0]), alone)


def _near(index: Index, longitude: Float, latitude: Float) -> list[int]:
    """Tiles whose outlines reach into the box around positions, wide enough for the geodesics between them."""
    if np.abs(latitude).max() > _POLAR_DEG:
        return list(range(len(index.tiles)))
    bounds = np.array([tile.info.bounds for tile in index.tiles])
    east = (longitude - longitude[0] + 180.0) % 360.0 - 180.0
    spare = _SPARE_DEG + 0.1 * max(np.ptp(east), np.ptp(latitude))
    width = (bounds[:, 2] - bounds[:, 0]) % 360.0
    start = (bounds[:, 0] - longitude[0] - east.min() + spare) % 360.0  # counted from the western side of the box
    meets = (start <= np.ptp(east) + 2.0 * spare) | (start + width >= 360.0) | (width == 0.0)
    meets &= (bounds[:, 1] <= latitude.max() + spare) & (bounds[:, 3] >= latitude.min() - spare)
    return [int(each) for each in np.flatnonzero(meets)]


def lattice_window(
    index: Index, rasters: OpenRasters, lattice: Lattice, rows: tuple[int, int], columns: tuple[int, int]
) -> NDArray[np.float32]:
    """Read the cells rows[0]:rows[1], columns[0]:columns[1] of a lattice in metres, NaN where there are none.

    Each tile is read once, only where the window covers it; of tiles that overlap the first given answers.
    """
    height, tally = np.full((rows[1] - rows[0], columns[1] - columns[0]), np.nan, dtype=np.float32), ReadTally()
    for number in np.flatnonzero(index.lattice == index.lattice[lattice.number]):
        right, down = index.offset[number] - index.offset[lattice.number]
        around = int(index.around[number])
        width, tall = index.size[number]
        top, bottom = max(rows[0], down), min(rows[1], down + tall)
        for turn in _turns(right, width, columns, around):
            left, end = max(columns[0], turn), min(columns[1], turn + width)
            if top < bottom and left < end:
                part = _read(index, rasters, int(number), (top - down, bottom - down), (left - turn, end - turn), tally)
                here = height[top - rows[0] : bottom - rows[0], left - columns[0] : end - columns[0]]
                np.copyto(here, part, where=np.isnan(here), casting="same_kind")
    return height


def _turns(right: int, width: int, columns: tuple[int, int], around: int) -> list[int]:
    """First columns of a tile, once for each turn round the globe that the window meets."""
    if not around:
        return [int(right)]
    first = -(-(columns[0] - right - width + 1) // around)
    last = (columns[1] - 1 - right) // around
    return [int(right + turn * around) for turn in range(first, last + 1)]


def _read(
    index: Index, rasters: OpenRasters, number: int, rows: tuple[int, int], columns: tuple[int, int], tally: ReadTally
) -> Float:
    """Read a window of one tile in metres."""
    tile = index.tiles[number]
    cells, valid = read_cells(rasters, tile, rows, columns)
    tally.count(number, tile, rows, columns)
    width = columns[1] - columns[0]

    def place(at: int) -> tuple[int, int]:
        return columns[0] + at % width, rows[0] + at // width

    found = to_metres(tile, number, cells.ravel().astype(float), None if valid is None else valid.ravel(), tally, place)
    return found.reshape(cells.shape)
