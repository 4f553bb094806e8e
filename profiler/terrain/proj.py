"""The edge to PROJ: degrees to the plane of a raster and back, and distances on the ground."""

from __future__ import annotations

from functools import lru_cache
from typing import TYPE_CHECKING

import numpy as np

from profiler.units import Float

if TYPE_CHECKING:
    from pyproj import Geod, Transformer

__all__ = ["distance_between", "from_lonlat", "to_lonlat"]


@lru_cache(maxsize=64)
def _transformer(plane: str) -> Transformer:
    from pyproj import Transformer, network

    network.set_network_enabled(False)  # type: ignore[attr-defined]  # documented, only not re-exported
    return Transformer.from_crs("EPSG:4326", plane, always_xy=True)


@lru_cache(maxsize=1)
def _geod() -> Geod:
    from pyproj import Geod

    return Geod(ellps="WGS84")


def from_lonlat(plane: str, longitude: Float, latitude: Float) -> tuple[Float, Float]:
    """Easting-like and northing-like coordinates of WGS 84 degrees in a CRS; NaN where the projection has no answer.

    Parameters
    ----------
    plane
        The CRS, as WKT.
    longitude, latitude
        Degrees, of one shape.
    """
    return _transform(plane, longitude, latitude, "FORWARD")


def to_lonlat(plane: str, x: Float, y: Float) -> tuple[Float, Float]:
    """WGS 84 longitude and latitude of coordinates in a CRS; NaN where the projection has no answer."""
    return _transform(plane, x, y, "INVERSE")


def _transform(plane: str, x: Float, y: Float, direction: str) -> tuple[Float, Float]:
    from pyproj.exceptions import ProjError

    try:
        new_x, new_y = _transformer(plane).transform(x, y, direction=direction)
    except ProjError:  # no way at all from one to the other: nowhere, like a point that the projection does not reach
        return np.full(x.shape, np.nan), np.full(x.shape, np.nan)
    there = np.isfinite(new_x) & np.isfinite(new_y)
    return np.where(there, new_x, np.nan), np.where(there, new_y, np.nan)


def distance_between(longitude_a: Float, latitude_a: Float, longitude_b: Float, latitude_b: Float) -> Float:
    """Metres between points on the WGS 84 ellipsoid, by PROJ's geodesics; NaN where a coordinate is.

    A cell that is centred on a pole ends there: latitudes beyond are taken as the pole's.
    """
    from_latitude, to_latitude = np.clip(latitude_a, -90.0, 90.0), np.clip(latitude_b, -90.0, 90.0)
    _, _, distance = _geod().inv(longitude_a, from_latitude, longitude_b, to_latitude)
    return np.asarray(distance)
