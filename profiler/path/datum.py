"""Positions of other datums and of projected grids, as WGS 84 degrees with a word on how well that is known."""

from __future__ import annotations

import difflib
import math
import warnings
from typing import TYPE_CHECKING

import numpy as np

from profiler.errors import InputError
from profiler.path.line import check_positions

if TYPE_CHECKING:
    from pyproj import CRS
    from pyproj.transformer import TransformerGroup

__all__ = ["DATUMS", "to_wgs84"]

_AREA_SLACK_DEG = 1.0

DATUMS = {
    "WGS84": 4326,
    "NAD83": 4269,
    "NAD83(2011)": 6318,
    "NAD83(CSRS)": 4617,
    "NAD27": 4267,
    "ETRS89": 4258,
    "ED50": 4230,
    "OSGB36": 4277,
    "TM65": 4299,
    "GDA94": 4283,
    "GDA2020": 7844,
    "AGD66": 4202,
    "AGD84": 4203,
    "NZGD49": 4272,
    "NZGD2000": 4167,
    "TOKYO": 4301,
    "JGD2000": 4612,
    "JGD2011": 6668,
    "SAD69": 4618,
    "SIRGAS2000": 4674,
    "PSAD56": 4248,
    "CAPE": 4222,
    "HARTEBEESTHOEK94": 4148,
    "ARC1960": 4210,
    "CH1903": 4149,
    "CH1903+": 4150,
    "DHDN": 4314,
    "MGI": 4312,
    "AMERSFOORT": 4289,
    "BD72": 4313,
    "RT90": 4124,
    "PULKOVO1942": 4284,
    "KALIANPUR1975": 4146,
    "INDIAN1975": 4240,
    "HONGKONG1980": 4611,
}
"""EPSG codes of geographic coordinate systems by the names that people write (EPSG dataset; a test compares them)."""


def to_wgs84(x: float, y: float, crs: int | str, *, degrees: bool | None = None) -> tuple[float, float, str]:
    """Turn a position of another datum or of a projected grid into WGS 84 degrees, and say how well that is known.

    Parameters
    ----------
    x, y
        Easting and northing in the unit of the coordinate system, or longitude and latitude in degrees.
    crs
        EPSG code (``32612`` or ``"EPSG:32612"``), or the name of a geographic datum from `DATUMS` (``"NAD27"``).
    degrees
        True if x and y are degrees, False if they are not: a system of the other kind is then refused. None takes
        either.

    Returns
    -------
    longitude, latitude, note
        WGS 84 degrees, and the operation that PROJ chose for this place with its stated accuracy; the note also
        tells of a better operation whose grid is not installed, and of a shift that is only a guess ("ballpark").
        The note is empty when the position was WGS 84 degrees already.

    Raises
    ------
    InputError
        For an unknown code or name, a system that is not horizontal, or a position outside the area it is made for.

    Examples
    --------
    >>> longitude, latitude, note = to_wgs84(447_000.0, 3_990_000.0, 32612)
    >>> round(longitude, 4), round(latitude, 4)
    (-111.5884, 36.0531)
    >>> to_wgs84(-112.1, 36.1, "NAD83")[2].split(";")[0]
    'from NAD83 (EPSG:4269) by NAD83 to WGS 84 (1), stated accuracy 4 m'
    >>> to_wgs84(-112.1, 36.1, "WGS84")
    (-112.1, 36.1, '')

    Notes
    -----
    The EPSG dataset through PROJ. No grid is fetched from the network. Positions up to 1 degree outside the area of
    use pass with a word in the note: a project near a zone border often keeps to one zone.
    """
    from pyproj import network
    from pyproj.transformer import AreaOfInterest, TransformerGroup

    network.set_network_enabled(False)  # type: ignore[attr-defined]  # documented, only not re-exported
    system = _crs(crs)
    if degrees is not None and system.is_geographic != degrees:
        kind, other = ("geographic", "eastings and northings") if degrees else ("projected", "degrees")
        raise InputError(f"crs = {crs!r}: must be {kind}, and {_title(system)} is for {other}")
    if system.to_epsg() == 4326:
        check_positions(np.asarray([x], dtype=float), np.asarray([y], dtype=float))
        return float(x), float(y), ""
    longitude, latitude = _roughly(system, x, y)
    edge = _check_area(system, x, y, longitude, latitude)
    here = AreaOfInterest(longitude, latitude, longitude, latitude)
    with warnings.catch_warnings():  # pyproj warns of missing grids; the note says it where a reader sees it
        warnings.simplefilter("ignore")
        group = TransformerGroup(system, 4326, always_xy=True, area_of_interest=here)
    longitude, latitude = group.transformers[0].transform(x, y, errcheck=True)
    return float(longitude), float(latitude), f"from {_title(system)} by {_operation_note(group)}{edge}"


def _title(system: CRS) -> str:
    return f"{system.name} (EPSG:{system.to_epsg()})"


def _crs(crs: int | str) -> CRS:
    """Find the horizontal coordinate system of an EPSG code or datum name."""
    from pyproj import CRS
    from pyproj.exceptions import CRSError

    text = str(crs).strip().upper().removeprefix("EPSG:").replace(" ", "").replace("_", "").replace("-", "")
    code = DATUMS.get(text) or (int(text) if text.isdecimal() else None)
    if code is None:
        near = difflib.get_close_matches(text, DATUMS, n=1)
        remedy = f"did you mean {near[0]!r}?" if near else f"known datums: {', '.join(DATUMS)}"
        raise InputError(f"crs = {crs!r}: must be an EPSG code or a known datum; {remedy}")
    try:
        system = CRS.from_epsg(code)
    except CRSError:
        raise InputError(f"crs = {crs!r}: must be a code that the EPSG dataset of this PROJ knows") from None
    if system.type_name not in ("Projected CRS", "Geographic 2D CRS", "Geographic 3D CRS"):
        raise InputError(
            f"crs = {crs!r}: must be geographic or projected, and {_title(system)} is a {system.type_name}; "
            "give the code of its horizontal part"
        )
    if system.is_geographic and system.axis_info[0].unit_name != "degree":
        unit = system.axis_info[0].unit_name
        raise InputError(f"crs = {crs!r}: must count in degrees, and {_title(system)} counts in {unit}")
    return system


def _roughly(system: CRS, x: float, y: float) -> tuple[float, float]:
    """Where the position is by PROJ's first choice: near enough to choose the best operation for the place."""
    from pyproj import Transformer
    from pyproj.exceptions import ProjError

    if system.is_geographic:
        check_positions(np.asarray([x], dtype=float), np.asarray([y], dtype=float))
    try:
        longitude, latitude = Transformer.from_crs(system, 4326, always_xy=True).transform(x, y, errcheck=True)
    except ProjError:
        longitude = latitude = math.inf
    if not (math.isfinite(longitude) and math.isfinite(latitude)):
        raise InputError(f"x, y = {x:g}, {y:g}: must be a position that {_title(system)} can hold; check their order")
    return float(longitude), float(latitude)


def _outside_deg(bounds: tuple[float, float, float, float], longitude: float, latitude: float) -> float:
    """How far a position is outside a box (west, south, east, north), degrees; the box may cross the antimeridian."""
    west, south, east, north = bounds
    width = 360.0 if east - west == 360.0 else (east - west) % 360.0
    beyond = (longitude - west) % 360.0 - width
    sideways = max(0.0, min(beyond, 360.0 - width - beyond))
    return max(sideways, south - latitude, latitude - north, 0.0)


def _check_area(system: CRS, x: float, y: float, longitude: float, latitude: float) -> str:
    """Stop outside the area that the system is made for; inside, or close by, return what the note must add."""
    area = system.area_of_use
    outside = _outside_deg(area.bounds, longitude, latitude) if area else 0.0
    if area is None or outside == 0.0:
        return ""
    if outside <= _AREA_SLACK_DEG:
        return f"; {outside:.2f} degrees outside the area that the system is made for"
    unit = system.axis_info[0].unit_name
    raise InputError(
        f"x, y = {x:g}, {y:g}: must lie in the area of {_title(system)} ({area.west:g} to {area.east:g} east, "
        f"{area.south:g} to {area.north:g} north), not at {longitude:.3f} east, {latitude:.3f} north; "
        f"check the code, the order and the unit ({unit})"
    )


def _operation_note(group: TransformerGroup) -> str:
    """Name the operation taken, its stated accuracy, and a better one that lacks its grid."""
    taken = group.transformers[0]
    steps = [step for step in taken.operations or () if not step.name.startswith("axis order change")]
    name = " + ".join(step.name for step in steps) or taken.description
    # PROJ 9.8 states no accuracy for a conversion, which has no error, where older ones state 0
    accuracy = 0.0 if steps and all(step.type_name == "Conversion" for step in steps) else taken.accuracy
    if accuracy < 0 or "allpark" in name:
        note = f"{name}: no datum shift is known here, so the position may be off by 100 m and more (ballpark)"
        best = math.inf
    else:
        sure = f"stated accuracy {accuracy:g} m" if accuracy else "exact"
        note, best = f"{name}, {sure}", accuracy
    better = [op for op in group.unavailable_operations if 0 <= op.accuracy < best]
    if better:
        first = min(better, key=lambda op: op.accuracy)
        grids = ", ".join(grid.short_name for grid in first.grids if not grid.available)
        note += f"; {first.name} ({first.accuracy:g} m) would be better and needs {grids}, not installed"
    return note
