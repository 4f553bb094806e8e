"""Terrain: rasters opened together, asked for heights at longitudes and latitudes."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from types import TracebackType
from typing import Self

import numpy as np
from numpy.typing import ArrayLike, NDArray

from profiler.errors import InputError, MissingGroundError, RasterError, under
from profiler.models import SampleMethod
from profiler.terrain.crossings import find_crossings
from profiler.terrain.describe import NotHeightsError, RasterInfo, Reading, Tile, describe
from profiler.terrain.files import find_rasters
from profiler.terrain.gdal import OpenRasters, gdal_session
from profiler.terrain.ground_patches import Layer, read_layers
from profiler.terrain.index import build_index, find_hits
from profiler.terrain.lattice import Lattice, finest_lattice, lattice_window
from profiler.terrain.overlap import Overlap, find_overlaps
from profiler.terrain.placing import place, require_placed
from profiler.terrain.reference import resolve_datum, unit_factor
from profiler.terrain.samples import Samples, Skipped, SourceUse, gather_samples
from profiler.terrain.sampling import lattice_cells, sample_ground
from profiler.terrain.strip import Strip
from profiler.units import Float

__all__ = ["Terrain", "as_degrees", "as_reading", "describe_all", "open_terrain"]


class Terrain:
    """Rasters indexed together; a context manager that closes the files it opened. Made by `open_terrain`.

    One thread at a time may use it (GDAL's datasets allow no more); every process opens its own.
    """

    __slots__ = ("_allow_mixed_datums", "_allow_network", "_index", "_method", "_rasters", "_voids_are_sea", "skipped")

    def __init__(
        self,
        tiles: Sequence[Tile],
        skipped: Sequence[Skipped],
        *,
        method: SampleMethod,
        allow_mixed_datums: bool,
        allow_network: bool,
        voids_are_sea: bool,
    ) -> None:
        self._index = build_index(tiles)
        self._rasters = OpenRasters()
        self._method: SampleMethod = method
        self._allow_mixed_datums = allow_mixed_datums
        self._allow_network = allow_network
        self._voids_are_sea = voids_are_sea
        self.skipped = tuple(skipped)

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()

    def close(self) -> None:
        """Close the files; sampling again opens them again."""
        self._rasters.close()

    @property
    def rasters(self) -> tuple[RasterInfo, ...]:
        """Every raster, in the order found."""
        return tuple(tile.info for tile in self._index.tiles)

    def covers(self, longitude: ArrayLike, latitude: ArrayLike) -> NDArray[np.bool_]:
        """Whether points (degrees, any shape) lie on some raster, void or not; no cell is read."""
        lon, lat, shape = as_degrees(longitude, latitude)
        covered = np.zeros(lon.size, dtype=bool)
        with gdal_session():
            hits = find_hits(self._index, lon, lat)
        covered[hits.point[hits.inside]] = True
        return covered.reshape(shape)

    def finest_cell_m(self, longitude: ArrayLike, latitude: ArrayLike) -> float:
        """Shorter side, in metres on the ground, of the smallest cell among the rasters under any of the points.

        Raises
        ------
        MissingGroundError
            When no raster covers any of them.
        """
        lon, lat, _ = as_degrees(longitude, latitude)
        with gdal_session():
            hits = find_hits(self._index, lon, lat)
            hits = hits.take(hits.inside)
            if not hits.point.size:
                raise MissingGroundError(
                    f"no raster covers longitude {lon.min():.6f} to {lon.max():.6f}, latitude {lat.min():.6f} to "
                    f"{lat.max():.6f}; give terrain that does"
                )
            return float(lattice_cells(self._index, hits)[1].min())

    def crossings(self, longitude: ArrayLike, latitude: ArrayLike) -> Float:
        """Fractions of the way along a path at which it crosses the lines through cell centres, 0 to 1, in no order.

        Between two neighbouring ones, of all the rasters that the path meets, the ground is one parabola in the
        distance along it (one height, for the highest of the cells around) and comes from one raster.

        Parameters
        ----------
        longitude, latitude
            Degrees on WGS 84 of points equally far apart along the path, an odd number of them, (n,); 257 serve for
            any path that is a radio hop.
        """
        return find_crossings(self._index, *as_degrees(longitude, latitude)[:2], cell_edges=False)

    def lattice(self, longitude: Float, latitude: Float) -> Lattice | None:
        """Find the grid with the smallest cells under any of some positions, degrees, (n,); None if there is none."""
        return finest_lattice(self._index, longitude, latitude)

    def window(self, lattice: Lattice, rows: tuple[int, int], columns: tuple[int, int]) -> NDArray[np.float32]:
        """Read a rectangle of a grid in metres, from the first to before the last row and column; NaN where missing."""
        with gdal_session(allow_network=self._allow_network):
            return lattice_window(self._index, self._rasters, lattice, rows, columns)

    def sample(
        self,
        longitude: ArrayLike,
        latitude: ArrayLike,
        *,
        method: SampleMethod | None = None,
        allow_mixed_datums: bool | None = None,
        compare: bool = False,
    ) -> Samples:
        """Heights of the ground at points, in metres.

        Bilinear between the four cell centres around a point, or the highest of those of them that carry weight. The
        finest raster answers where all of these hold heights, else the next; of rasters of one resolution the one whose
        path was given first. Where voids are sea, void cells count 0 m once every raster was asked.

        Parameters
        ----------
        longitude, latitude
            Degrees on WGS 84, any shapes that broadcast; any longitude goes (181 is -179), latitude -90 to 90.
        method
            How to read between cell centres, where it differs from how the terrain was opened.
        allow_mixed_datums
            What to do about rasters on different vertical datums, where it differs from how the terrain was opened:
            points beside the path need not stop a study whose path is on one datum.
        compare
            Read the other rasters of the same resolution at the points too, and tell how they differ.

        Returns
        -------
        Samples
            Heights, where each came from, and what each raster gave.

        Raises
        ------
        InputError
            For coordinates that are not finite or no latitude.
        RasterError
            When a raster cannot be read, or holds heights that no place on earth has.
        DatumError
            When heights come from rasters on different vertical datums, unless that was allowed.
        """
        lon, lat, shape = as_degrees(longitude, latitude)
        with gdal_session(allow_network=self._allow_network):
            ground = sample_ground(
                self._index, self._rasters, lon, lat, method or self._method, voids_are_sea=self._voids_are_sea
            )
            allow = self._allow_mixed_datums if allow_mixed_datums is None else allow_mixed_datums
            overlaps: tuple[Overlap, ...] = ()
            if compare:
                overlaps = find_overlaps(self._index, self._rasters, lon, lat, ground, method or self._method)
            return gather_samples(
                self._index.tiles, self._rasters, ground, shape, allow_mixed_datums=allow, overlaps=overlaps
            )

    def layers(self, strip: Strip) -> tuple[list[Layer], tuple[SourceUse, ...]]:
        """Squares between cell centres on a strip beside a path, of every grid, and the rasters that they are from.

        Among them the ground is exact: between four cell centres it is bilinear (or the highest of them).
        """
        with gdal_session(allow_network=self._allow_network):
            layers, cells = read_layers(
                self._index, self._rasters, strip, self._method, voids_are_sea=self._voids_are_sea
            )
            if not cells.height_m.size:
                return [], ()
            shape = cells.height_m.shape
            return layers, gather_samples(
                self._index.tiles, self._rasters, cells, shape, allow_mixed_datums=True
            ).sources


def open_terrain(
    paths: Sequence[Path] | Path,
    *,
    method: SampleMethod = "bilinear",
    allow_mixed_datums: bool = False,
    vertical_datum: str | None = None,
    height_unit: str | None = None,
    eight_bit: bool = False,
    allow_network: bool = False,
    voids_are_sea: bool = False,
) -> Terrain:
    r"""Index rasters for sampling; only their metadata is read.

    Parameters
    ----------
    paths
        Rasters, zip archives and folders (walked to the bottom). A folder may also hold photos, masks and class maps:
        they are left out and listed in `Terrain.skipped`; named on their own they are an error.
    method
        ``"bilinear"`` between cell centres, or ``"highest"`` of the cells around.
    allow_mixed_datums
        Let heights on different vertical datums meet in one set of samples.
    vertical_datum
        Datum of the rasters that declare none: a name, or the ``EPSG:…`` of a vertical CRS.
    height_unit
        Unit of the rasters that declare none (``"m"``, ``"ft"``…); metres otherwise.
    eight_bit
        Take 8-bit cells for heights (canopy height maps often are), instead of a photo or a mask.
    allow_network
        Let mosaics (VRT) name sources that are read over the network; nothing else ever is.
    voids_are_sea
        Take cells without a height for the sea, at 0 m; a place that no raster covers stays missing.

    Returns
    -------
    Terrain
        A context manager.

    Raises
    ------
    InputError
        For a path that does not exist, an unknown method, unit or datum.
    RasterError
        For a raster that is damaged, has no CRS, or is not heights.

    Examples
    --------
    >>> import tempfile
    >>> wgs84 = ('GEOGCS["WGS 84",DATUM["WGS_1984",SPHEROID["WGS 84",6378137,298.257223563]],'
    ...     'UNIT["degree",0.0174532925199433]]')
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     _ = Path(folder, "hill.prj").write_text(wgs84)
    ...     _ = Path(folder, "hill.asc").write_text(
    ...         "ncols 3\nnrows 2\nxllcorner 10\nyllcorner 50\ncellsize 0.1\nNODATA_value -9999\n"
    ...         "100 200 300\n300 400 -9999\n")
    ...     with open_terrain(Path(folder)) as terrain:
    ...         found = terrain.sample([10.05, 10.1, 10.25, 12.0], [50.15, 50.1, 50.05, 50.0])
    >>> found.ground_m.round(9).tolist(), found.source.tolist(), found.covered.tolist()
    ([100.0, 250.0, nan, nan], [0, 0, -1, -1], [True, True, True, False])
    >>> found.sources[0].share
    0.5
    """
    if method not in ("bilinear", "highest"):
        raise InputError(f"terrain.method = {method!r}: must be bilinear or highest")
    reading = as_reading(vertical_datum, height_unit, eight_bit=eight_bit, allow_network=allow_network)
    tiles, skipped = describe_all([paths] if isinstance(paths, Path) else paths, reading)
    above = next((tile.info for tile in tiles if (tile.info.vertical_datum or "").startswith("ellipsoid")), None)
    if voids_are_sea and above is not None:
        raise InputError(
            f"terrain.voids_are_sea = true: must be left out with {above.name}, whose heights count from the "
            f"{above.vertical_datum}, where the sea is not at 0 m; give heights above sea level"
        )
    return Terrain(
        tiles,
        skipped,
        method=method,
        allow_mixed_datums=allow_mixed_datums,
        allow_network=allow_network,
        voids_are_sea=voids_are_sea,
    )


def as_reading(
    vertical_datum: str | None, height_unit: str | None, *, eight_bit: bool = False, allow_network: bool = False
) -> Reading:
    """Check what a user says about rasters that do not say it themselves.

    Raises
    ------
    InputError
        For an unknown unit or datum.
    """
    if height_unit is not None:
        with under("terrain.height_unit"):
            unit_factor(height_unit)
    with under("terrain.vertical_datum"):
        datum = None if vertical_datum is None else resolve_datum(vertical_datum)
    return Reading(vertical_datum=datum, height_unit=height_unit, eight_bit=eight_bit, allow_network=allow_network)


def describe_all(paths: Sequence[Path], reading: Reading) -> tuple[list[Tile], list[Skipped]]:
    """Describe every raster in the paths; what a folder holds besides heights is set aside, all else is an error."""
    tiles: list[Tile] = []
    refused: RasterError | None = None
    with gdal_session(allow_network=reading.allow_network):
        found = find_rasters(paths)
        skipped = [Skipped(path, "", reason) for path, reason in found.passed_over]
        for file in found.rasters:
            try:
                tiles.append(describe(file, reading))
            except NotHeightsError as error:
                if file.named:
                    raise
                refused = refused or error
                skipped.append(Skipped.because(file, error))
        tiles = place(tiles)
    if not tiles and refused is not None:
        raise refused
    for tile in tiles:
        require_placed(tile)
    return tiles, skipped


def as_degrees(longitude: ArrayLike, latitude: ArrayLike) -> tuple[Float, Float, tuple[int, ...]]:
    """Broadcast, check and flatten coordinates; return them with the shape to give results.

    Raises
    ------
    InputError
        For a coordinate that is not finite, or a latitude beyond the poles.
    """
    lon, lat = np.broadcast_arrays(np.asarray(longitude, dtype=float), np.asarray(latitude, dtype=float))
    flat_lon, flat_lat = lon.ravel(), lat.ravel()
    bad = ~(np.isfinite(flat_lon) & (np.abs(flat_lat) <= 90.0))
    if bad.any():
        i = int(np.argmax(bad))
        raise InputError(
            f"point {i}: longitude {flat_lon[i]:g}, latitude {flat_lat[i]:g}: must be finite degrees with latitude "
            "-90 to 90; longitude comes first"
        )
    return flat_lon, flat_lat, lon.shape
