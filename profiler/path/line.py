"""The WGS 84 geodesic between two sites, and points along, across and beside it.

Longitude comes before latitude, in degrees, east and north positive; azimuths are true, clockwise from north, 0 to 360.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike

from profiler.errors import InputError
from profiler.models import frozen_array
from profiler.units import MEAN_EARTH_RADIUS_M, Float

if TYPE_CHECKING:
    from pyproj import Geod

__all__ = [
    "LONGEST_M",
    "PathLine",
    "across",
    "beside",
    "check_positions",
    "equal_steps",
    "geodesic",
    "locate",
    "midpoint",
    "points_along",
    "trace",
    "with_points",
]

LONGEST_M = 1_000_000.0
"""Longest path that `trace` accepts: several times any radio hop, so a longer one is a slip in a sign or a datum."""

_MOST_POINTS = 2_000_000
_SHORTEST_M = 1.0


@dataclass(frozen=True, slots=True, eq=False)
class PathLine:
    """Points of the geodesic from A to B, in order; arrays (n,), read-only, the first is A and the last is B.

    The points of `trace` are equally far apart, those of `with_points` wherever they were asked for: the distances
    are in ``along_m``, and whoever takes a mean over points weights them by length.

    ``azimuth_a_deg`` points from A to B, ``azimuth_b_deg`` from B to A; ``azimuth_deg`` is the direction of travel
    toward B at each point.
    """

    distance_m: float
    azimuth_a_deg: float
    azimuth_b_deg: float
    along_m: Float
    longitude: Float
    latitude: Float
    azimuth_deg: Float

    @property
    def points(self) -> int:
        """How many points the path has, both sites among them."""
        return int(self.along_m.size)


@lru_cache(maxsize=1)
def _geod() -> Geod:
    from pyproj import Geod

    return Geod(ellps="WGS84")


def check_positions(longitude: Float, latitude: Float) -> None:
    """Stop at the first position that is not on the globe.

    Parameters
    ----------
    longitude, latitude
        Degrees, any shape; NaN is not on the globe.

    Raises
    ------
    InputError
        Naming the coordinate and its value.

    Examples
    --------
    >>> check_positions(np.array([180.0]), np.array([-90.0]))
    >>> check_positions(np.array([280.0]), np.array([40.0]))
    Traceback (most recent call last):
    profiler.errors.InputError: longitude = 280: must be -180 to 180 degrees
    """
    for name, values, limit in (("longitude", longitude, 180.0), ("latitude", latitude, 90.0)):
        bad = ~(np.abs(values) <= limit)
        if np.any(bad):
            raise InputError(f"{name} = {values[bad].flat[0]:g}: must be -{limit:g} to {limit:g} degrees")


def geodesic(
    longitude_a: ArrayLike, latitude_a: ArrayLike, longitude_b: ArrayLike, latitude_b: ArrayLike
) -> tuple[Float, Float, Float]:
    """Distance and both azimuths of the WGS 84 geodesic between positions.

    Parameters
    ----------
    longitude_a, latitude_a, longitude_b, latitude_b
        WGS 84 degrees, -180 to 180 and -90 to 90; they broadcast.

    Returns
    -------
    distance_m, azimuth_a_deg, azimuth_b_deg
        Metres; true azimuths at A toward B and at B toward A, 0 up to 360 degrees. The azimuths of coincident
        positions mean nothing.

    Raises
    ------
    InputError
        For a position that is not on the globe.

    Examples
    --------
    Flinders Peak to Buninyong (Geocentric Datum of Australia Technical Manual, worked example):

    >>> line = geodesic(144.424867889, -37.951033417, 143.926495528, -37.652821139)
    >>> [round(float(value), 3) for value in line]
    [54972.271, 306.868, 127.174]
    >>> float(geodesic(10, 50, 10, 50)[0])
    0.0

    Notes
    -----
    PROJ's geodesic routines: C. F. F. Karney, Algorithms for geodesics, Journal of Geodesy 87 (2013), 43-55; their
    error is a few nanometres.
    """
    names = np.broadcast_arrays(
        *(np.asarray(v, dtype=float) for v in (longitude_a, latitude_a, longitude_b, latitude_b))
    )
    lon_a, lat_a, lon_b, lat_b = names
    check_positions(lon_a, lat_a)
    check_positions(lon_b, lat_b)
    azimuth_a, azimuth_b, distance = _geod().inv(lon_a.ravel(), lat_a.ravel(), lon_b.ravel(), lat_b.ravel())
    shape = lon_a.shape
    return (
        np.asarray(distance).reshape(shape),
        np.mod(np.asarray(azimuth_a), 360.0).reshape(shape),
        np.mod(np.asarray(azimuth_b), 360.0).reshape(shape),
    )


def _forward(start: tuple[float, float, float], along_m: Float) -> tuple[Float, Float, Float]:
    """Longitude, latitude and backward azimuth at distances along the geodesic of a start and its azimuth."""
    longitude, latitude, azimuth = (np.full_like(along_m, value) for value in start)
    longitude, latitude, back = _geod().fwd(longitude, latitude, azimuth, along_m)
    return np.asarray(longitude), np.asarray(latitude), np.asarray(back)


def points_along(
    longitude: ArrayLike, latitude: ArrayLike, azimuth_deg: ArrayLike, along_m: ArrayLike
) -> tuple[Float, Float, Float]:
    """Positions at distances along geodesics, and the way on there.

    Parameters
    ----------
    longitude, latitude
        Where each geodesic starts, WGS 84 degrees.
    azimuth_deg
        True azimuth there.
    along_m
        Distances from the start, metres; all broadcast.

    Returns
    -------
    longitude, latitude, azimuth_deg
        WGS 84 degrees, and the true azimuth in which each goes on, 0 up to 360 degrees.

    Examples
    --------
    >>> longitude, latitude, azimuth = points_along([0.0, 5.0], [0.0, 0.0], 90.0, [[0.0], [111319.49079327358]])
    >>> longitude.round(9).tolist(), latitude.round(9).tolist(), azimuth.round(9).tolist()
    ([[0.0, 5.0], [1.0, 6.0]], [[0.0, 0.0], [0.0, 0.0]], [[90.0, 90.0], [90.0, 90.0]])
    """
    lon, lat, azimuth, along = np.broadcast_arrays(
        *(np.asarray(each, dtype=float) for each in (longitude, latitude, azimuth_deg, along_m))
    )
    there_lon, there_lat, back = _geod().fwd(lon.ravel(), lat.ravel(), azimuth.ravel(), along.ravel())
    onward = np.mod(np.asarray(back) + 180.0, 360.0)
    return np.asarray(there_lon).reshape(lon.shape), np.asarray(there_lat).reshape(lon.shape), onward.reshape(lon.shape)


def equal_steps(distance_m: float, spacing_m: float) -> Float:
    """Distances from A, both ends included, in the fewest equal steps of at most ``spacing_m``.

    Raises
    ------
    InputError
        For a spacing that is not above 0 m or asks for more than two million points.

    Examples
    --------
    >>> equal_steps(10.0, 4.0).round(2).tolist()
    [0.0, 3.33, 6.67, 10.0]
    """
    if not 0 < spacing_m < math.inf:
        raise InputError(f"spacing_m = {spacing_m:g}: must be more than 0 m")
    # a billionth too long is rounding, not a step
    intervals = max(1.0, math.ceil(distance_m / spacing_m * (1.0 - 1e-9)))
    if intervals >= _MOST_POINTS:
        raise InputError(
            f"spacing_m = {spacing_m:g}: must be more than {distance_m / _MOST_POINTS:.3g} m on this path of "
            f"{distance_m / 1e3:.1f} km; a 200th of the path is enough"
        )
    return np.linspace(0.0, distance_m, int(intervals) + 1)


def trace(longitude_a: float, latitude_a: float, longitude_b: float, latitude_b: float, spacing_m: float) -> PathLine:
    """Equally spaced points along the WGS 84 geodesic from A to B.

    Parameters
    ----------
    longitude_a, latitude_a, longitude_b, latitude_b
        The sites, WGS 84 degrees.
    spacing_m
        Greatest distance between points, more than 0 m.

    Returns
    -------
    PathLine
        Its ends are exactly the sites.

    Raises
    ------
    InputError
        For sites off the globe, sites less than 1 m or more than 1000 km apart, or a spacing that is not above 0 m
        or asks for more than two million points.

    Examples
    --------
    >>> line = trace(179.9, 0.0, -179.9, 0.0, spacing_m=10e3)
    >>> round(line.distance_m, 1), line.azimuth_a_deg, line.points, line.longitude.tolist()
    (22263.9, 90.0, 4, [179.9, 179.96666666666667, -179.96666666666667, -179.9])
    """
    distance, azimuth_a, azimuth_b = (float(v) for v in geodesic(longitude_a, latitude_a, longitude_b, latitude_b))
    if distance < _SHORTEST_M:
        raise InputError(f"the sites are {distance:.2f} m apart: must be at least 1 m; give two different sites")
    if distance > LONGEST_M:
        raise InputError(
            f"the sites are {distance / 1e3:.0f} km apart: must be at most {LONGEST_M / 1e3:.0f} km; "
            "check the signs and letters of both positions"
        )
    points = [0.0, distance], [longitude_a, longitude_b], [latitude_a, latitude_b], [azimuth_a, azimuth_b + 180.0]
    ends = PathLine(distance, azimuth_a, azimuth_b, *map(frozen_array, points))
    return with_points(ends, equal_steps(distance, spacing_m))


def with_points(line: PathLine, along_m: ArrayLike) -> PathLine:
    """Return the same path with its points at other distances from A.

    Parameters
    ----------
    line
        The path.
    along_m
        Distances from A, ascending from 0 to the path's length, (n,).

    Returns
    -------
    PathLine
        Its ends are exactly the sites.

    Raises
    ------
    InputError
        If the distances do not ascend from 0 to the path's length.

    Examples
    --------
    >>> line = trace(0.0, 0.0, 0.0, 0.1, spacing_m=5e3)
    >>> with_points(line, [0.0, 1.0, line.distance_m]).latitude.round(8).tolist()
    [0.0, 9.04e-06, 0.1]
    """
    distance = frozen_array(along_m)
    if distance[0] != 0.0 or distance[-1] != line.distance_m or not np.all(np.diff(distance) > 0.0):
        raise InputError(f"along_m: must ascend from 0 to the {line.distance_m:.3f} m of the path")
    longitude, latitude, back = _forward(_start(line), distance)
    longitude[[0, -1]], latitude[[0, -1]] = line.longitude[[0, -1]], line.latitude[[0, -1]]
    azimuth = np.mod(back + 180.0, 360.0)
    azimuth[[0, -1]] = line.azimuth_a_deg, math.fmod(line.azimuth_b_deg + 180.0, 360.0)
    return replace(
        line,
        along_m=distance,
        longitude=frozen_array(longitude),
        latitude=frozen_array(latitude),
        azimuth_deg=frozen_array(azimuth),
    )


def _start(line: PathLine) -> tuple[float, float, float]:
    """Site A and the direction in which the path leaves it."""
    return float(line.longitude[0]), float(line.latitude[0]), line.azimuth_a_deg


def across(line: PathLine, offset_m: ArrayLike) -> tuple[Float, Float]:
    """Positions beside the path, on the geodesics that cross it at right angles.

    Parameters
    ----------
    line
        The path, n points.
    offset_m
        Offsets in metres, positive to the right of A→B: (n, across), or a shape that broadcasts with (n, 1).

    Returns
    -------
    longitude, latitude
        WGS 84 degrees, (n, across).

    Raises
    ------
    InputError
        If the offsets do not fit the points.

    Examples
    --------
    On the way north, right is east:

    >>> longitude, latitude = across(trace(0, 0, 0, 0.1, spacing_m=20e3), [[-50.0, 0.0, 50.0]])
    >>> longitude.round(6).tolist()
    [[-0.000449, 0.0, 0.000449], [-0.000449, 0.0, 0.000449]]
    """
    offset = np.asarray(offset_m, dtype=float)
    try:
        arrays = np.broadcast_arrays(line.longitude[:, None], line.latitude[:, None], line.azimuth_deg[:, None], offset)
    except ValueError:
        arrays = ()
    if not arrays or arrays[0].ndim != 2 or arrays[0].shape[0] != line.points:
        raise InputError(f"offset_m of shape {offset.shape}: must be ({line.points}, across), a row for each point")
    longitude, latitude, azimuth, offset = (array.ravel() for array in arrays)
    lon, lat, _ = _geod().fwd(longitude, latitude, azimuth + 90.0, offset)
    return np.asarray(lon).reshape(arrays[0].shape), np.asarray(lat).reshape(arrays[0].shape)


def beside(line: PathLine, along_m: ArrayLike, offset_m: ArrayLike) -> tuple[Float, Float]:
    """Positions at any distances along the path and across it, positive to the right of A→B; they broadcast.

    Examples
    --------
    >>> line = trace(0, 0, 0, 0.1, spacing_m=20e3)
    >>> beside(line, 0.0, [-50.0, 50.0])[0].round(6).tolist()
    [-0.000449, 0.000449]
    """
    along, offset = np.broadcast_arrays(np.asarray(along_m, dtype=float), np.asarray(offset_m, dtype=float))
    start = (float(line.longitude[0]), float(line.latitude[0]), line.azimuth_a_deg)
    longitude, latitude, back = _forward(start, along.ravel())
    longitude, latitude, _ = _geod().fwd(longitude, latitude, back - 90.0, offset.ravel())
    return np.asarray(longitude).reshape(along.shape), np.asarray(latitude).reshape(along.shape)


def locate(line: PathLine, longitude: ArrayLike, latitude: ArrayLike) -> tuple[Float, Float]:
    """Where positions lie relative to the path: the nearest point of the path and how far to the side.

    Parameters
    ----------
    line
        The path.
    longitude, latitude
        WGS 84 degrees, any shape; they broadcast.

    Returns
    -------
    along_m, offset_m
        Distance from A of the nearest point of the path, 0 to the path's length, and the distance from that point,
        positive to the right of A→B. A position behind a site has the site as its nearest point.

    Raises
    ------
    InputError
        For a position that is not on the globe.

    Examples
    --------
    >>> line = trace(0.0, 0.0, 0.0, 0.1, spacing_m=1e3)
    >>> along, offset = locate(line, [0.001, -0.001], [0.05, 0.05])
    >>> along.round(1).tolist(), offset.round(1).tolist()
    ([5528.7, 5528.7], [111.3, -111.3])

    Notes
    -----
    Newton's method on the geodesic, each step by Napier's rule on the sphere (tan s = tan r · cos δ); it gains about
    four digits a step, so a few steps reach a micrometre.
    """
    lon, lat = np.broadcast_arrays(np.asarray(longitude, dtype=float), np.asarray(latitude, dtype=float))
    shape, lon, lat = lon.shape, lon.ravel(), lat.ravel()
    along = np.zeros(lon.shape)
    for _ in range(8):
        step, _, _ = _aside(line, along, lon, lat)
        along += step
        if np.all(np.abs(step) < 1e-6):
            break
    along = np.clip(along, 0.0, line.distance_m)
    _, distance, side = _aside(line, along, lon, lat)
    offset = np.where(side < 0.0, -distance, distance)
    return along.reshape(shape), offset.reshape(shape)


def _aside(line: PathLine, along_m: Float, longitude: Float, latitude: Float) -> tuple[Float, Float, Float]:
    """From points of the path: step along it toward the foot of each position, its distance, and sin of its bearing."""
    foot_longitude, foot_latitude, back = _forward(_start(line), along_m)
    distance, bearing, _ = geodesic(foot_longitude, foot_latitude, longitude, latitude)
    turn = np.radians(bearing - (back + 180.0))
    angle = distance / MEAN_EARTH_RADIUS_M
    step = MEAN_EARTH_RADIUS_M * np.arctan2(np.sin(angle) * np.cos(turn), np.cos(angle))
    return step, distance, np.sin(turn)


def midpoint(longitude_a: float, latitude_a: float, longitude_b: float, latitude_b: float) -> tuple[float, float]:
    """Longitude and latitude of the point halfway between two positions.

    Examples
    --------
    >>> midpoint(0.0, 0.0, 1.0, 0.0)
    (0.5, 0.0)
    """
    distance_m, azimuth_deg, _ = geodesic(longitude_a, latitude_a, longitude_b, latitude_b)
    longitude, latitude, _ = _geod().fwd(longitude_a, latitude_a, float(azimuth_deg), float(distance_m) / 2.0)
    return float(longitude), float(latitude)
