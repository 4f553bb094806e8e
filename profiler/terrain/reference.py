"""Reference systems of a raster: where its plane lies on the earth, what its heights count from, and in which unit."""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import lru_cache
from typing import TYPE_CHECKING, Any

from profiler.errors import InputError
from profiler.units import FOOT_M, US_SURVEY_FOOT_M

if TYPE_CHECKING:
    from rasterio.crs import CRS

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
        The CRS without its vertical part.
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
    horizontal: CRS
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
    >>> from rasterio.crs import CRS
    >>> found = parse_reference(CRS.from_user_input("EPSG:32612+5773").to_wkt())
    >>> found.name, found.vertical_datum, found.vertical_unit_m
    ('EPSG:32612', 'EGM96 geoid', 1.0)
    """
    from rasterio.crs import CRS

    crs = CRS.from_wkt(wkt)
    tree = crs.to_dict(projjson=True)
    plane, vertical = _split(tree)
    kind = _unbound(plane)["type"]
    if kind not in ("GeographicCRS", "GeodeticCRS", "ProjectedCRS", "DerivedGeographicCRS", "DerivedProjectedCRS") or (
        not crs.is_geographic and not crs.is_projected
    ):
        raise InputError(
            f"its CRS ({_unbound(plane).get('name', kind)}) is local or geocentric, with no place on a map"
        )
    horizontal = CRS.from_user_input(plane) if vertical is not None else crs
    epsg = horizontal.to_epsg()
    base = _unbound(plane)
    datum, unit_m = _vertical_part(base, vertical)
    geographic = bool(horizontal.is_geographic)
    return Reference(
        name=f"EPSG:{epsg}" if epsg else str(base.get("name", "unnamed CRS")),
        horizontal=horizontal,
        is_wgs84=_is_wgs84(plane),
        period=6.283185307179586 / float(horizontal.units_factor[1]) if geographic else 0.0,
        plane_unit_m=None if geographic else float(horizontal.units_factor[1]),
        vertical_datum=datum,
        vertical_unit_m=unit_m,
    )


def _split(tree: dict[str, Any]) -> tuple[dict[str, Any], dict[str, Any] | None]:
    """Horizontal and vertical part of a CRS in PROJJSON."""
    whole = _unbound(tree)
    if whole["type"] == "CompoundCRS":
        return whole["components"][0], _unbound(whole["components"][1])
    return tree, None


def _unbound(tree: dict[str, Any]) -> dict[str, Any]:
    """Return the CRS itself when it comes bound to a datum shift (TOWGS84)."""
    return tree["source_crs"] if tree["type"] == "BoundCRS" else tree


def _axes(crs: dict[str, Any]) -> list[dict[str, Any]]:
    return list(crs.get("coordinate_system", {}).get("axis", []))


def _frame(crs: dict[str, Any]) -> str:
    return str((crs.get("datum") or crs.get("datum_ensemble") or {}).get("name", "unknown"))


def _vertical_part(base: dict[str, Any], vertical: dict[str, Any] | None) -> tuple[str | None, float | None]:
    if vertical is not None:
        return _frame(vertical), _axis_unit_m(vertical, -1)
    if len(_axes(base)) == 3:
        return f"ellipsoid of {_frame(base.get('base_crs', base)).removesuffix(' ensemble')}", _axis_unit_m(base, 2)
    return None, None


def _axis_unit_m(crs: dict[str, Any], axis: int) -> float:
    unit = _axes(crs)[axis]["unit"]
    return unit_factor(unit) if isinstance(unit, str) else float(unit["conversion_factor"])


def _is_wgs84(plane: dict[str, Any]) -> bool:
    return (
        plane["type"] == "GeographicCRS"
        and _frame(plane).startswith("World Geodetic System 1984")
        and all(axis["unit"] == "degree" for axis in _axes(plane)[:2])
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
    from rasterio.crs import CRS
    from rasterio.errors import CRSError

    try:
        datum = _vertical_part({}, _vertical_of(CRS.from_user_input(name).to_dict(projjson=True)))[0]
    except CRSError:
        datum = None
    if datum is None:
        raise InputError(
            f"vertical datum {name}: must be the EPSG code of a vertical CRS (such as EPSG:5773) or a name"
        )
    return datum


def _vertical_of(tree: dict[str, Any]) -> dict[str, Any] | None:
    return tree if tree["type"] == "VerticalCRS" else _split(tree)[1]
