"""What one raster says of itself: where it lies, how its cells become metres, and whether they are heights at all."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np

from profiler.errors import InputError, RasterError, under
from profiler.printable import printable
from profiler.terrain.files import RasterFile, read_bytes
from profiler.terrain.gdal import LARGE_BLOCK_CELLS, gdal_failures, open_raster
from profiler.terrain.reference import Reference, parse_reference, unit_factor
from profiler.terrain.sound import declared_marker, require_plain_beside
from profiler.terrain.virtual import is_virtual, read_virtual

__all__ = ["Bounds", "Coding", "NotHeightsError", "RasterInfo", "Reading", "Tile", "describe", "settled"]

_PHOTO_DRIVERS = frozenset({"JPEG", "GIF", "WEBP", "BMP"})
_SMALL_BLOCK, _READ_CELLS = 64, 256
"""Sides of blocks under 64 cells (strips of rows) are read together, up to about 256: each call costs 20 µs."""

Affine = tuple[float, float, float, float, float, float]


class NotHeightsError(RasterError):
    """A readable raster that holds something else: a photo, classes, a mask."""


class Bounds(NamedTuple):
    """Degrees on WGS 84; `west` is above `east` when the raster crosses the antimeridian (as in RFC 7946 §5.2)."""

    west: float
    south: float
    east: float
    north: float


@dataclass(frozen=True, slots=True)
class RasterInfo:
    """What a raster declares, for the provenance and for `hopwright terrain`.

    Attributes
    ----------
    path, member
        The file, and the raster inside it when the file is an archive.
    driver
        GDAL's name of the format.
    crs
        ``EPSG:32612``, or the name of a CRS in no register; the vertical part is in `vertical_datum`.
    width, height
        Columns and rows.
    cell_x_m, cell_y_m
        Size of a cell on the ground along its row and column, metres, at the centre of the raster.
    bounds
        Outer edges of the outermost cells, degrees.
    nodata
        Declared marker of missing cells, as stored; None when none is declared.
    unit, unit_factor_m
        Unit of height, and metres in one of it.
    vertical_datum
        What heights count from; None when neither the raster nor the user says.
    pixel_is_point
        The raster states its coordinates at cell centres rather than cell corners (GDAL accounts for it).
    size_bytes
        Size of the file.
    notes
        What had to be assumed or converted.
    """

    path: Path
    member: str
    driver: str
    crs: str
    width: int
    height: int
    cell_x_m: float
    cell_y_m: float
    bounds: Bounds
    nodata: float | None
    unit: str
    unit_factor_m: float
    vertical_datum: str | None
    pixel_is_point: bool
    size_bytes: int
    notes: tuple[str, ...] = ()

    @property
    def name(self) -> str:
        """What messages call the raster."""
        return printable(f"{self.path}/{self.member}" if self.member else str(self.path))


@dataclass(frozen=True, slots=True)
class Reading:
    """How rasters are to be understood where they do not say.

    `classes` reads cells as class numbers, not heights; `eight_bit` takes 8-bit cells for heights; `allow_network` lets
    mosaics name sources that are read over the network.
    """

    vertical_datum: str | None = None
    height_unit: str | None = None
    eight_bit: bool = False
    classes: bool = False
    allow_network: bool = False


@dataclass(frozen=True, slots=True)
class Coding:
    """From stored cells to metres: height = cell · scale_m + offset_m, missing where the cell is `nodata` or masked.

    `alpha` is the band of opacities, 0 for none: what it makes invisible is missing too.
    """

    band: int
    nodata: float
    scale_m: float
    offset_m: float
    masked: bool
    alpha: int
    item_bytes: int


@dataclass(frozen=True, slots=True, eq=False)
class Tile:
    """One indexed raster: its description, and all that sampling needs without opening it again.

    `block` is rows and columns of the blocks that it is stored in, `read_cells` of the groups of them read together.
    """

    info: RasterInfo
    file: RasterFile
    reference: Reference
    affine: Affine
    coding: Coding
    block: tuple[int, int]
    read_cells: tuple[int, int]


def describe(file: RasterFile, reading: Reading) -> Tile:
    """Read the metadata of one raster and check that it can be used; no cell is read.

    Where it lies in degrees, and its cells in metres, `profiler.terrain.placing` works out for many rasters at once.

    Raises
    ------
    RasterError
        When it is unreadable, has no CRS or no place, is a photo or classes instead of heights, or its unit is unknown.
    """
    file = settled(file, reading)
    with open_raster(file) as dataset, gdal_failures(file.name), under(file.name):
        band = _band(dataset, file.types, reading)
        reference = _reference(dataset)
        affine = _affine(dataset)
        unit, factor, unit_notes = ("", 1.0, ()) if reading.classes else _unit(dataset, band, reference, reading)
        datum, datum_notes = (None, ()) if reading.classes else _datum(reference, reading)
        marker, marker_notes = _marker(dataset, band, file)
        size, block = (dataset.width, dataset.height), dataset.block_shapes[band - 1]
        info = RasterInfo(
            path=file.path,
            member=file.member,
            driver=dataset.driver,
            crs=reference.name,
            width=size[0],
            height=size[1],
            cell_x_m=math.nan,
            cell_y_m=math.nan,
            bounds=Bounds(math.nan, math.nan, math.nan, math.nan),
            nodata=None if dataset.nodatavals[band - 1] is None else float(dataset.nodatavals[band - 1]),
            unit=unit,
            unit_factor_m=factor,
            vertical_datum=datum,
            pixel_is_point=dataset.tags().get("AREA_OR_POINT") == "Point",
            size_bytes=file.path.stat().st_size,
            notes=(*unit_notes, *datum_notes, *marker_notes, *_block_notes(block), *file.notes),
        )
        return Tile(info, file, reference, affine, _coding(dataset, band, factor, marker), block, _read_cells(block))


def settled(file: RasterFile, reading: Reading) -> RasterFile:
    """Return the file as GDAL may have it: a VRT as the plain mosaic that it is, all else as it stands."""
    if is_virtual(read_bytes(file.source, 4096)):
        found = read_virtual(file.source, file.name, allow_network=reading.allow_network)
        return replace(file, source=found.text, pieces=found.pieces, types=found.types, notes=found.notes)
    require_plain_beside(file.source, file.name)
    return file


def _read_cells(block: tuple[int, int]) -> tuple[int, int]:
    if block[0] * block[1] > LARGE_BLOCK_CELLS:  # a window round a slanting path would be most of the raster
        rows, cols = (min(side, _READ_CELLS) for side in block)
    else:
        rows, cols = (side if side >= _SMALL_BLOCK else side * (_READ_CELLS // side) for side in block)
    return rows, cols


def _band(dataset: Any, types: Sequence[str], reading: Reading) -> int:
    """Band that holds the heights, refusing what cannot be heights."""
    from rasterio.enums import ColorInterp

    remedy = "give a raster of classes" if reading.classes else "give a raster of elevations"
    colors = dataset.colorinterp
    if not dataset.count:
        raise RasterError(f"holds {len(dataset.subdatasets)} subdatasets; extract the one with the heights")
    bands = [i for i, color in zip(dataset.indexes, colors, strict=True) if color != ColorInterp.alpha]
    if dataset.driver in _PHOTO_DRIVERS or {ColorInterp.red, ColorInterp.green, ColorInterp.blue} & set(colors):
        raise NotHeightsError(f"is a photo ({len(bands)}-band color or grey image), not heights; {remedy}")
    if len(bands) > 1:
        named = [
            i for i in bands if (dataset.descriptions[i - 1] or "").lower() in ("elevation", "height", "dem", "dtm")
        ]
        if len(named) != 1:
            raise NotHeightsError(f"has {len(bands)} bands where one was expected; {remedy} of one band")
        bands = named
    band = bands[0]
    kind = np.dtype(dataset.dtypes[band - 1])
    if kind.kind not in "iuf":
        raise NotHeightsError(f"holds {kind} cells, not real numbers; {remedy}")
    if not reading.classes:
        if colors[band - 1] == ColorInterp.palette:
            raise NotHeightsError(f"holds classes or colors (it has a palette), not heights; {remedy}")
        eight_bit = types[band - 1] in ("Byte", "Int8") if types else kind.itemsize == 1
        if eight_bit and not reading.eight_bit:
            raise NotHeightsError(f"holds 8-bit cells (a photo, mask or class map), not heights; {remedy}")
    return int(band)


def _reference(dataset: Any) -> Reference:
    if not dataset.crs:
        raise RasterError(
            "has no coordinate reference system, so nobody can tell where it lies; assign the right one "
            "(a .prj file beside an ASCII grid, gdal_edit -a_srs for a GeoTIFF)"
        )
    try:
        return parse_reference(dataset.crs.wkt)
    except InputError as error:
        raise RasterError(f"{error}; reproject it") from None


def _affine(dataset: Any) -> Affine:
    a, b, c, d, e, f = affine = dataset.transform[:6]
    if affine == (1.0, 0.0, 0.0, 0.0, 1.0, 0.0) or not math.isfinite(a + b + c + d + e + f) or a * e - b * d == 0.0:
        raise RasterError(
            "has a CRS but no corner coordinates and cell size; georeference it (a world file, gdal_edit "
            "-a_ullr), or warp it if it has ground control points"
        )
    return a, b, c, d, e, f


def _unit(dataset: Any, band: int, reference: Reference, reading: Reading) -> tuple[str, float, tuple[str, ...]]:
    """Find the unit of height, its metres, and what was assumed or converted.

    What the band says holds, else the vertical CRS, else the user, else metres.
    """
    declared = (dataset.units[band - 1] or "").strip()
    try:
        factor = unit_factor(declared) if declared else reference.vertical_unit_m
    except InputError as error:
        raise RasterError(f"{error}; correct the unit of the band") from None
    if (
        declared
        and reference.vertical_unit_m is not None
        and not math.isclose(factor or 0.0, reference.vertical_unit_m)
    ):
        raise RasterError(
            f"the band's unit is {declared} but its vertical CRS counts in units of "
            f"{reference.vertical_unit_m:g} m; correct the one that is wrong"
        )
    if factor is not None:
        name = declared or {1.0: "m", 0.3048: "ft"}.get(factor, f"unit of {factor:.9g} m")
        notes = () if factor == 1.0 else (f"heights in {name} converted to metres (1 = {factor:.9g} m)",)
        return name, factor, notes
    if reading.height_unit is not None:
        note = f"declares no height unit: taken as {reading.height_unit}, as stated by the user"
        return reading.height_unit, unit_factor(reading.height_unit), (note,)
    if reference.plane_unit_m is not None and reference.plane_unit_m != 1.0:
        raise RasterError(
            f"declares no height unit and its map plane is in units of {reference.plane_unit_m:.9g} m, so "
            "heights may be metres or feet; set the unit of the band, or terrain.height_unit in the hop file"
        )
    return "m", 1.0, ("declares no height unit: taken as metres",)


def _datum(reference: Reference, reading: Reading) -> tuple[str | None, tuple[str, ...]]:
    """Find what heights count from, and what was assumed."""
    if reference.vertical_datum is not None:
        above = f"heights above the {reference.vertical_datum}, not above sea level"
        return reference.vertical_datum, (above,) if reference.vertical_datum.startswith("ellipsoid") else ()
    if reading.vertical_datum is not None:
        note = f"declares no vertical datum: taken as {reading.vertical_datum}, as stated by the user"
        return reading.vertical_datum, (note,)
    return None, ("declares no vertical datum",)


def _coding(dataset: Any, band: int, factor: float, marker: float) -> Coding:
    from rasterio.enums import ColorInterp, MaskFlags

    flags = dataset.mask_flag_enums[band - 1]
    scale, offset = float(dataset.scales[band - 1]), float(dataset.offsets[band - 1])
    if scale == 0.0 or not math.isfinite(scale) or not math.isfinite(offset):
        raise RasterError(
            f"declares a scale of {scale:g} and an offset of {offset:g} for its cells, which leaves no heights in "
            "them; correct the scale (gdal_edit -scale 1)"
        )
    alpha = [i for i, color in zip(dataset.indexes, dataset.colorinterp, strict=True) if color == ColorInterp.alpha]
    return Coding(
        band=band,
        nodata=marker,
        scale_m=scale * factor,
        offset_m=offset * factor,
        masked=MaskFlags.all_valid not in flags and MaskFlags.nodata not in flags,
        alpha=alpha[0] if alpha else 0,
        item_bytes=np.dtype(dataset.dtypes[band - 1]).itemsize,
    )


def _marker(dataset: Any, band: int, file: RasterFile) -> tuple[float, tuple[str, ...]]:
    """Find what missing cells hold as stored, NaN for none, and what to say about it.

    A declared marker that the cells cannot hold became the nearest that they can.
    """
    declared, kind = dataset.nodatavals[band - 1], np.dtype(dataset.dtypes[band - 1])
    if declared is None and kind.kind in "iu" and not file.types:
        lost, limits = declared_marker(file.source), np.iinfo(kind)
        if lost is None or not math.isfinite(lost):
            return math.nan, ()
        held = float(np.clip(np.rint(lost), limits.min, limits.max))
        return held, (f"declares {lost:g} as nodata, which its {kind} cells cannot hold: {held:g} taken as missing",)
    if declared is None:
        return math.nan, ()
    with np.errstate(over="ignore"):  # stored cells hold the marker as rounded to their type, not as printed
        return float(kind.type(declared)) if kind.kind == "f" else float(declared), ()


def _block_notes(block: tuple[int, int]) -> tuple[str, ...]:
    if block[0] * block[1] <= LARGE_BLOCK_CELLS:
        return ()
    return (
        f"is stored in blocks of {block[1]} x {block[0]} cells, each unpacked whole: slow; gdal_translate -of COG "
        "in.tif out.tif makes it quick",
    )
