"""What the caller's environment would tell GDAL and PROJ, and how it is kept from them.

Both read hundreds of variables: plug-ins to load, grids to shift by, tags to ignore, half a cell to move by. A result
must not depend on the shell that it was made in.
"""

from __future__ import annotations

import os
from collections.abc import Iterator
from contextlib import contextmanager

__all__ = ["forget_surroundings", "unheard"]

_PREFIXES = (
    "GDAL", "CPL_", "VSI", "PROJ", "OGR", "OSR_", "GTIFF", "TIFF", "AAIGRID", "GRASSASCIIGRID", "DTED", "SRTM", "USGS",
    "HFA_", "NITF", "NETCDF", "HDF5", "BAG_", "VRT_", "JP2", "GMLJP2", "OPJ_", "OPENJPEG", "USE_", "RAW_", "ESRI_XML",
    "XYZ_", "SAGA", "PNG_", "JPEG", "ISO8211", "PCRASTER", "HF2_", "GSBG", "GS7BG", "IGNORE_", "CENTER_LONG",
    "GEO_TIFF", "GEOTIFF", "EPSG_", "CURL_", "RPC_", "MEM_", "CHECK_", "OVERVIEW", "STATISTICS",
)  # fmt: skip
"""How the names of the variables begin that GDAL's raster drivers, its virtual files and PROJ look for."""

_SETTLED = {
    "GDAL_CONFIG_FILE": os.devnull,  # else ~/.gdal/gdalrc is read
    "GDAL_DRIVER_PATH": "disable",  # no plug-ins
    "PROJ_NETWORK": "OFF",
    "PROJ_SKIP_READ_USER_WRITABLE_DIRECTORY": "YES",  # grids in a home folder would move places by metres
}


def _heard() -> list[str]:
    return [
        name for name in os.environ if name.upper().startswith(_PREFIXES) and _SETTLED.get(name) != os.environ[name]
    ]


def forget_surroundings() -> None:
    """Take out of this process's environment what GDAL and PROJ would read in it, for good: a command's first act."""
    for name in _heard():
        del os.environ[name]
    os.environ.update(_SETTLED)


@contextmanager
def unheard() -> Iterator[None]:
    """Run the body without what GDAL and PROJ would read in the environment, and put it back after.

    Examples
    --------
    >>> os.environ["GTIFF_POINT_GEO_IGNORE"] = "YES"
    >>> with unheard():
    ...     print("GTIFF_POINT_GEO_IGNORE" in os.environ)
    False
    >>> os.environ.pop("GTIFF_POINT_GEO_IGNORE")
    'YES'
    """
    kept = {name: os.environ.pop(name) for name in _heard()}
    added = {name: value for name, value in _SETTLED.items() if name not in os.environ}
    os.environ.update(added)
    try:
        yield
    finally:
        for name in added:
            os.environ.pop(name, None)
        os.environ.update(kept)
