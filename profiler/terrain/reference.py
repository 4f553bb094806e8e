"""Reference systems of a raster: where its plane lies on the earth, what its heights count from, and in which unit."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING

from profiler.errors import InputError
from profiler.units import FOOT_M, US_SURVEY_FOOT_M

if TYPE_CHECKING:
    from pyproj import CRS

__all__ = ["Reference", "datum_key", "parse_reference", "resolve_datum", "unit_factor"]

_UNITS_M = {
    "m": 1.0, "metre": 1.0, "metres": 1.0, "meter": 1.0, "meters": 1.0, "mtr": 1.0,
    "ft": FOOT_M, "foot": FOOT_M, "feet": FOOT_M, "international foot": FOOT_M, "intl foot": FOOT_M, "'": FOOT_M,
    "us survey foot": US_SURVEY_FOOT_M, "us survey feet": US_SURVEY_FOOT_M, "us-ft": US_SURVEY_FOOT_M,
    "ftus": US_SURVEY_FOOT_M, "foot_us": US_SURVEY_FOOT_M, "us foot": US_SURVEY_FOOT_M, "sft": US_SURVEY_FOOT_M,
    "mm": 1e-3, "millimetre": 1e-3, "millimeter": 1e-3, "cm": 1e-2, "centimetre": 1e-2, "centimeter": 1e-2,
    "dm": 1e-1, "decimetre": 1e-1, "decimeter": 1e-1, "km": 1e3, "kilometre": 1e3, "kilometer": 1e3,
    "yd": 3 * FOOT_M, "yard": 3 * FOOT_M, "fathom": 6 * FOOT_M,
}  # fmt: skip

_SAME_DATUM = {
    "navd88": "northamericanverticaldatum1988",
    "ngvd29": "nationalgeodeticverticaldatum1929",
    "cgvd2013": "canadiangeodeticverticaldatumof2013",
    "nap": "normaalamsterdamspeil",
    "odn": "ordnancedatumnewlyn",
    "msl": "meansealevel",
}


@dataclass(frozen=True, slots=True)
class Reference:
    """What the CRS of a raster says.

    Attributes
    ----------
    name
        ``EPSG:32612``, or the name of the CRS when it is in no register.
    horizontal
        The CRS without its vertical part, as WKT.
    is_wgs84
        Longitude and latitude in degrees on WGS 84: nothing to transform.
    period
        What 360° of longitude are in its units; 0 for a projected CRS.
    plane_unit_m
        Metres in one unit of a projected CRS; None for a geographic one.
    vertical_datum
        Name of the vertical datum; None when the CRS has no vertical part.
    vertical_unit_m
        Metres in one unit of the vertical part; None without one.
    """

    name: str
    horizontal: str
    is_wgs84: bool
    period: float
    plane_unit_m: float | None
    vertical_datum: str | None
    vertical_unit_m: float | None


@lru_cache(maxsize=512)
def parse_reference(wkt: str) -> Reference:
    """Take a CRS apart into its plane and its vertical part.

    Raises
    ------
    InputError
        When it has no place on the earth's surface that a longitude and latitude could meet (local, geocentric).

    Examples
    --------
    >>> from pyproj import CRS
    >>> found = parse_reference(CRS("EPSG:32612+5773").to_wkt())
    >>> found.name, found.vertical_datum, found.vertical_unit_m
    ('EPSG:32612', 'EGM96 geoid', 1.0)
    """
    from pyproj import CRS
    from pyproj.exceptions import CRSError

    try:
        whole = CRS.from_wkt(wkt)
    except CRSError as error:
        raise InputError(f"its CRS is none that PROJ understands ({' '.join(str(error).split())})") from error
    parts = _unbound(whole).sub_crs_list
    plane, vertical = (parts[0], _unbound(parts[1])) if parts else (whole, None)
    base = _unbound(plane)
    if not (base.is_geographic or base.is_projected):
        raise InputError(f"its CRS ({base.name}) is local or geocentric, with no place on a map")
    axes = base.axis_info
    plane_unit = axes[0].unit_conversion_factor
    if vertical is not None:
        datum, unit_m = _datum_name(vertical), vertical.axis_info[-1].unit_conversion_factor
    elif len(axes) == 3:
        datum, unit_m = f"ellipsoid of {_datum_name(base)}", axes[2].unit_conversion_factor
    else:
        datum, unit_m = None, None
    return Reference(
        name=_registered_name(base),
        horizontal=plane.to_wkt(),
        is_wgs84=_is_wgs84(plane),
        period=2.0 * math.pi / plane_unit if base.is_geographic else 0.0,
        plane_unit_m=None if base.is_geographic else plane_unit,
        vertical_datum=datum,
        vertical_unit_m=unit_m,
    )


def _unbound(crs: CRS) -> CRS:
    """Return the CRS itself when it comes bound to a datum shift (TOWGS84)."""
    return crs.source_crs if crs.is_bound and crs.source_crs is not None else crs


def _datum_name(crs: CRS) -> str:
    return "unknown" if crs.datum is None else crs.datum.name.removesuffix(" ensemble")


def _registered_name(crs: CRS) -> str:
    """Code by which the CRS goes: what it states, which holds whatever edition of the register is installed."""
    stated = crs.to_json_dict().get("id")
    if stated is not None:
        return f"{stated['authority']}:{stated['code']}"
    epsg = crs.to_epsg()
    return f"EPSG:{epsg}" if epsg else crs.name


def _is_wgs84(plane: CRS) -> bool:
    """Whether x and y are degrees on WGS 84 as they stand, east of Greenwich."""
    return (
        plane.is_geographic
        and not plane.is_bound
        and not plane.is_derived
        and _datum_name(plane).startswith("World Geodetic System 1984")
        and plane.prime_meridian is not None
        and plane.prime_meridian.longitude == 0.0
        and all(math.isclose(axis.unit_conversion_factor, math.pi / 180.0) for axis in plane.axis_info[:2])
    )


def unit_factor(unit: str) -> float:
    """Metres in one unit of height, by the name a raster gives it.

    Raises
    ------
    InputError
        For a name that is not a known unit of length.

    Examples
    --------
    >>> unit_factor("ft"), unit_factor("metre")
    (0.3048, 1.0)
    >>> round(unit_factor("US survey foot"), 9)
    0.30480061
    """
    try:
        return _UNITS_M[" ".join(unit.lower().split())]
    except KeyError:
        raise InputError(f"height unit {unit!r} is not a known length (m, cm, dm, km, ft, US survey foot, …)") from None


def datum_key(name: str) -> str:
    """Reduce the names one vertical datum goes by to a single key.

    Examples
    --------
    >>> datum_key("EGM96 geoid") == datum_key("EGM96 height") == datum_key("egm96")
    True
    >>> datum_key("NAVD88") == datum_key("North American Vertical Datum 1988")
    True
    >>> datum_key("EGM96") == datum_key("EGM2008")
    False
    """
    key = re.sub(r"[^a-z0-9]", "", re.sub(r"\b(geoid|height|depth)\b|\(.*?\)", "", name.lower()))
    return _SAME_DATUM.get(key, key)


def resolve_datum(name: str) -> str:
    """Name of a vertical datum that a user wrote, looked up when it is ``EPSG:…``.

    Raises
    ------
    InputError
        When the code names no vertical CRS.

    Examples
    --------
    >>> resolve_datum("EPSG:5773"), resolve_datum("EGM2008")
    ('EGM96 geoid', 'EGM2008')
    """
    if not name.upper().startswith("EPSG:"):
        return name
    from pyproj import CRS
    from pyproj.exceptions import CRSError

    try:
        crs = CRS(name)
    except CRSError:
        crs = None
    vertical = None if crs is None else crs.sub_crs_list[1] if crs.sub_crs_list else crs
    if vertical is None or not vertical.is_vertical:
        raise InputError(
            f"vertical datum {name}: must be the EPSG code of a vertical CRS (such as EPSG:5773) or a name"
        )
    return _datum_name(_unbound(vertical))
