"""What sampling hands back: heights, where each came from, and what every raster gave and cost."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Self

import numpy as np
from numpy.typing import NDArray

from profiler.errors import DatumError
from profiler.printable import printable
from profiler.terrain.describe import NotHeightsError, RasterInfo, Tile
from profiler.terrain.files import RasterFile
from profiler.terrain.gdal import OpenRasters
from profiler.terrain.index import Ints
from profiler.terrain.overlap import Overlap
from profiler.terrain.reference import datum_key
from profiler.terrain.sampling import SampledGround
from profiler.units import Float

__all__ = ["Samples", "Skipped", "SourceUse", "common_datum", "gather_samples"]


@dataclass(frozen=True, slots=True)
class Skipped:
    """A file in a folder (or a member of an archive), a link or a folder that was left out, and why."""

    path: Path
    member: str
    reason: str

    @classmethod
    def because(cls, file: RasterFile, error: NotHeightsError) -> Self:
        """Take the reason from the error that describing the file raised, without its name."""
        return cls(file.path, file.member, str(error).removeprefix(f"{file.name}: "))

    @property
    def name(self) -> str:
        """What messages call it."""
        return printable(f"{self.path}/{self.member}" if self.member else str(self.path))


@dataclass(frozen=True, slots=True)
class SourceUse:
    """What one raster gave to a set of samples.

    Attributes
    ----------
    info
        The raster.
    files
        The files that it was read from at these points: itself, those beside it (.prj, .aux.xml), the pieces of a VRT.
    share
        Share of all the points whose height came from it, 0 to 1.
    blocks_read, bytes_read
        Blocks of the raster that were read for them, and the bytes they hold unpacked.
    read_share
        `bytes_read` over the unpacked bytes of the whole raster.
    notes
        What had to be assumed, converted or settled.
    """

    info: RasterInfo
    files: tuple[Path, ...]
    share: float
    blocks_read: int
    bytes_read: int
    read_share: float
    notes: tuple[str, ...]


@dataclass(frozen=True, slots=True, eq=False)
class Samples:
    """SampledGround heights at points; arrays have the shape of the points asked for, and are read-only.

    Attributes
    ----------
    ground_m
        Height in metres; NaN where missing.
    source
        Which of `sources` the height came from; -1 where missing.
    covered
        The point lies on some raster: where the height is missing, that is a void, not a place off the terrain.
    sea
        A void cell at the point was taken for the sea.
    sources
        The rasters that gave heights, in the order of their share.
    vertical_datum
        What all the heights count from, as far as the sources say; None when none says, or when they differ.
    notes
        What holds for the heights together: datums that are mixed or not all known.
    overlaps
        Pairs of rasters of one resolution that both hold heights at some of the points, if they were to be compared; an
        overlap counts points of the flattened arrays.
    """

    ground_m: Float
    source: Ints
    covered: NDArray[np.bool_]
    sea: NDArray[np.bool_]
    sources: tuple[SourceUse, ...]
    vertical_datum: str | None
    notes: tuple[str, ...]
    overlaps: tuple[Overlap, ...] = ()


def gather_samples(
    tiles: Sequence[Tile],
    rasters: OpenRasters,
    ground: SampledGround,
    shape: tuple[int, ...],
    *,
    allow_mixed_datums: bool,
    overlaps: tuple[Overlap, ...] = (),
) -> Samples:
    """Turn heights by tile into heights by source, the greatest share first, and settle the vertical datum.

    Raises
    ------
    DatumError
        When sources are on different vertical datums and that is not allowed.
    """
    counts = np.bincount(ground.tile + 1, minlength=len(tiles) + 1)[1:]
    numbers = np.argsort(-counts, kind="stable")[: np.count_nonzero(counts)]
    rank = np.full(len(tiles) + 1, -1, dtype=np.int64)  # the last is for the tile -1, which is none
    rank[numbers] = np.arange(numbers.size)
    sources = tuple(_use(tiles[k], rasters, int(k), int(counts[k]), ground) for k in numbers)
    datum, notes = common_datum(sources, allow_mixed=allow_mixed_datums)
    unused = sorted(set(ground.tally.undeclared) - set(numbers.tolist()))
    notes += tuple(f"{tiles[k].info.name}: {note}" for k in unused for note in ground.tally.notes(k))
    result = Samples(
        ground_m=ground.height_m.reshape(shape),
        source=rank[ground.tile].reshape(shape),
        covered=ground.covered.reshape(shape),
        sea=ground.sea.reshape(shape),
        sources=sources,
        vertical_datum=datum,
        notes=notes,
        overlaps=overlaps,
    )
    for array in (result.ground_m, result.source, result.covered, result.sea):
        array.flags.writeable = False
    return result


def _use(tile: Tile, rasters: OpenRasters, number: int, count: int, ground: SampledGround) -> SourceUse:
    tally = ground.tally
    notes = tile.info.notes + tally.notes(number)
    edge = int(np.count_nonzero(ground.edge & (ground.tile == number)))
    if edge:
        notes += (f"{edge} points in its outermost half cell: blended with the next raster, or the edge value held",)
    read = tally.read_bytes.get(number, 0)
    whole = tile.info.width * tile.info.height * tile.coding.item_bytes
    share = count / ground.tile.size
    files = rasters.pieces(tile.file).under(tally.windows.get(number, ()))
    return SourceUse(tile.info, files, share, tally.blocks.get(number, 0), read, read / whole, notes)


def common_datum(sources: Sequence[SourceUse], *, allow_mixed: bool) -> tuple[str | None, tuple[str, ...]]:
    """Find the vertical datum that all sources share, and what has to be said about it.

    An undeclared datum proves no difference, so it is noted, not refused.

    Raises
    ------
    DatumError
        When sources are on different vertical datums and that is not allowed.
    """
    rasters = list(dict.fromkeys(use.info for use in sources))
    seen: dict[str, RasterInfo] = {}
    for info in rasters:
        if info.vertical_datum is not None:
            seen.setdefault(datum_key(info.vertical_datum), info)
    if len(seen) > 1:
        found = ", ".join(f"{info.vertical_datum} ({info.name})" for info in seen.values())
        if not allow_mixed:
            raise DatumError(
                f"heights on different vertical datums meet on or beside one path: {found}; bring the rasters to one "
                "datum, leave one out, or set terrain.allow_mixed_datums = true and live with the step between them"
            )
        return None, (f"heights on different vertical datums are mixed, as allowed: {found}",)
    silent = sum(info.vertical_datum is None for info in rasters)
    if not seen:
        return None, ("no raster declares its vertical datum",) if silent else ()
    datum = next(iter(seen.values())).vertical_datum
    note = f"{silent} of {len(rasters)} rasters declare no vertical datum: taken as {datum}, like the rest"
    return datum, (note,) if silent else ()
