"""Terrain roughness sa of Rec. ITU-R P.530-17: the area about the middle of the path, not the path itself."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from profiler.errors import InputError
from profiler.units import MEAN_EARTH_RADIUS_M, Float

__all__ = ["TerrainRoughness", "roughness_grid", "terrain_roughness"]

_HALF_SIDE_M = 55_000.0
_STEP_DEG = 30.0 / 3600.0
_FARTHEST_LATITUDE = 85.0
_LEAST_COVERAGE = 0.95


@dataclass(frozen=True, slots=True)
class TerrainRoughness:
    """``roughness_m`` is sa; ``coverage`` the share of the 110 km box that had heights, of ``samples`` asked for."""

    roughness_m: float
    coverage: float
    samples: int

    @property
    def source(self) -> str:
        """What was used, in words."""
        return (
            f"terrain rasters: standard deviation of heights at 30 arc-second steps in the 110 km x 110 km box about "
            f"the path's middle ({self.coverage:.1%} of {self.samples} points), Rec. ITU-R P.530-17 §2.3.1"
        )


def roughness_grid(longitude: float, latitude: float) -> tuple[Float, Float]:
    """Where to sample terrain for sa: a 110 km × 110 km box about a point, at 30 arc-second steps.

    Parameters
    ----------
    longitude, latitude
        The path's middle, WGS 84 degrees; latitude -85 to 85.

    Returns
    -------
    tuple of ndarray
        Longitudes (wrapped into -180 to 180) and latitudes of every sample, both (rows, columns).

    Raises
    ------
    InputError
        If the point is not on the earth, or nearer to a pole than a 30″ grid makes sense.

    Examples
    --------
    >>> longitudes, latitudes = roughness_grid(10.0, 60.0)
    >>> latitudes.shape, round(float(latitudes.max() - latitudes.min()), 3)
    ((119, 237), 0.983)

    Notes
    -----
    Source: Rec. ITU-R P.530-17 §2.3.1, "a 110 km × 110 km area with a 30 s resolution"; degrees to kilometres on a
    sphere of 6371 km.
    """
    if not -180 <= longitude <= 180:
        raise InputError(f"longitude = {longitude:g}: must be -180 to 180 degrees")
    if not -_FARTHEST_LATITUDE <= latitude <= _FARTHEST_LATITUDE:
        raise InputError(f"latitude = {latitude:g}: must be -85 to 85 degrees; give terrain_roughness_m instead")
    half_deg = np.degrees(_HALF_SIDE_M / MEAN_EARTH_RADIUS_M)

    def steps(half: float) -> Float:
        count = int(half / _STEP_DEG)
        return np.asarray(np.arange(-count, count + 1) * _STEP_DEG, dtype=np.float64)

    across = steps(half_deg / np.cos(np.radians(latitude)))
    longitudes = (longitude + across + 180.0) % 360.0 - 180.0
    grid = np.meshgrid(longitudes, latitude + steps(half_deg))
    return np.asarray(grid[0]), np.asarray(grid[1])


def terrain_roughness(height_m: ArrayLike) -> TerrainRoughness:
    """Terrain roughness sa: the standard deviation of the heights sampled at `roughness_grid`.

    Parameters
    ----------
    height_m
        Heights, any shape, NaN where the terrain has none.

    Returns
    -------
    TerrainRoughness
        sa with the share of the box behind it.

    Raises
    ------
    InputError
        If fewer than 95 % of the samples have a height: sa of a part of the box would be a guess. (The limit is this
        project's own; the recommendation asks for the whole box.)

    Examples
    --------
    >>> terrain_roughness([[0.0, 20.0], [0.0, 20.0]]).roughness_m
    10.0

    Notes
    -----
    Source: Rec. ITU-R P.530-17 §2.3.1.
    """
    height = np.asarray(height_m, dtype=float)
    known = height[np.isfinite(height)]
    coverage = known.size / height.size if height.size else 0.0
    if coverage < _LEAST_COVERAGE:
        raise InputError(
            f"terrain covers {coverage:.0%} of the 110 km x 110 km box about the path's middle: must be at least 95 % "
            "for p530-17; give terrain_roughness_m, more terrain, or choose p530-17-quick"
        )
    return TerrainRoughness(float(known.std()), coverage, height.size)
