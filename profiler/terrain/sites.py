"""Whether a site is on the terrain at all, and if not, whether it was typed the wrong way round."""

from __future__ import annotations

import numpy as np

from profiler.errors import InputError
from profiler.terrain.mosaic import Terrain

__all__ = ["require_inside"]


def require_inside(terrain: Terrain, name: str, longitude: float, latitude: float) -> None:
    r"""Stop when a site lies off the terrain; offer the swap or the sign that would put it there.

    Parameters
    ----------
    terrain
        The rasters.
    name
        What to call the site in the message.
    longitude, latitude
        Degrees on WGS 84.

    Raises
    ------
    InputError
        One line: the site, how far off the nearest raster is, and the correction that would fit, if one does.

    Examples
    --------
    >>> import tempfile
    >>> from pathlib import Path
    >>> from profiler.terrain import open_terrain
    >>> grid = "ncols 2\nnrows 1\nxllcorner 10\nyllcorner 50\ncellsize 0.1\n100 200\n"
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     _ = Path(folder, "hill.prj").write_text("Projection GEOGRAPHIC\nDatum WGS84\nUnits DD\n")
    ...     _ = Path(folder, "hill.asc").write_text(grid)
    ...     with open_terrain(Path(folder)) as terrain:
    ...         require_inside(terrain, "site A", 10.05, 50.05)
    ...         try:
    ...             require_inside(terrain, "site B", 50.05, 10.05)
    ...         except InputError as error:
    ...             print(str(error).split("; ")[1])
    longitude and latitude look swapped: longitude 10.050000, latitude 50.050000 would lie on it

    Notes
    -----
    A void under the site is not "off the terrain": it is missing ground, and the study says so.
    """
    if abs(latitude) <= 90.0 and terrain.covers(longitude, latitude).all():
        return
    site = f"{name}: longitude {longitude:.6f}, latitude {latitude:.6f}: lies off the terrain"
    for lon, lat, slip in (
        (latitude, longitude, "longitude and latitude look swapped"),
        (-longitude, latitude, "the sign of the longitude (east or west) looks wrong"),
        (longitude, -latitude, "the sign of the latitude (north or south) looks wrong"),
        (latitude, -longitude, "longitude and latitude look swapped, with a wrong sign"),
        (-latitude, longitude, "longitude and latitude look swapped, with a wrong sign"),
    ):
        if abs(lat) <= 90.0 and terrain.covers(lon, lat).all():
            raise InputError(f"{site}; {slip}: longitude {lon:.6f}, latitude {lat:.6f} would lie on it")
    raise InputError(
        f"{site}, {_nearest(terrain, longitude, latitude)}; correct the site or give terrain that covers it"
    )


def _nearest(terrain: Terrain, longitude: float, latitude: float) -> str:
    """Say which raster's bounds are nearest and about how far (sphere of 111.2 km a degree; a hint, not a survey)."""
    bounds = np.array([info.bounds for info in terrain.rasters])
    west, south, east, north = bounds.T
    width = (east - west) % 360.0 + 360.0 * (east - west == 360.0)
    beyond = (longitude - west) % 360.0
    aside = np.where(beyond <= width, 0.0, np.minimum(beyond - width, 360.0 - beyond))
    above = np.maximum(0.0, np.maximum(south - latitude, latitude - north))
    away = np.hypot(aside * np.cos(np.radians(min(abs(latitude), 90.0))), above) * 111.2
    nearest = int(np.argmin(away))
    return f"about {away[nearest]:.1f} km from the nearest raster ({terrain.rasters[nearest].name})"
