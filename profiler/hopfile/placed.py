"""Positions in a hop file, in whichever of their forms, to WGS 84."""

from __future__ import annotations

from profiler.errors import InputError
from profiler.hopfile.grids import GridPlace, parse_grid
from profiler.hopfile.positions import parse_position
from profiler.hopfile.table import Table
from profiler.models import Obstacle, Site
from profiler.path import locate, to_wgs84, trace

__all__ = ["build_obstacle", "build_site"]

_FARTHEST_ASIDE_M = 200.0
"""A thing further beside the path stands outside the first Fresnel zone of any hop of this trade."""
_PLACE = ("position", "latitude", "longitude", "datum", "easting", "northing", "epsg")


def _place(table: Table) -> tuple[float, float, tuple[str, ...]]:
    """Longitude, latitude, and how they were given if not as plain WGS 84 degrees; takes them out of the values."""
    given = {name: table.values.pop(name, None) for name in _PLACE}
    system: int | str | None = given["datum"]
    text = given["position"]
    if text and (place := parse_grid(text)):
        system = given["epsg"] = _utm_grid(place, given["datum"], table)
        given["easting"], given["northing"] = place.easting_m, place.northing_m
        words = f"given as {' '.join(text.split())}"
        words += f", the middle of a square of {place.square_m:g} m" if place.square_m else ""
    elif text:
        given["latitude"], given["longitude"] = parse_position(text)
        words = f"given as {' '.join(text.split())}"
    elif given["easting"] is not None:
        system = given["epsg"]
        words = f"given as easting {given['easting']:.12g}, northing {given['northing']:.12g}"
    else:
        words = f"given as latitude {given['latitude']:.12g}, longitude {given['longitude']:.12g}"
    if system is None:
        return given["longitude"], given["latitude"], (words,) if text else ()
    x, y = ("easting", "northing") if given["epsg"] else ("longitude", "latitude")
    try:
        longitude, latitude, note = to_wgs84(given[x], given[y], system, degrees=x == "longitude")
    except InputError as error:
        message = str(error).replace("crs = ", f"{'epsg' if given['epsg'] else 'datum'} = ", 1)
        raise InputError(table.spot.key(message.replace("x, y = ", f"{x}, {y} = ", 1)), where=_file(table)) from None
    return longitude, latitude, tuple(filter(None, (words, note)))


_UTM_GRIDS = {
    "WGS84": (32600, 32700, range(1, 61)),
    "ETRS89": (25800, None, range(28, 39)),
    "NAD83": (26900, None, range(1, 24)),
    "NAD27": (26700, None, range(1, 23)),
}
"""EPSG codes of the UTM grids of a datum: zone 0 north, zone 0 south, and the zones that there are."""


def _utm_grid(place: GridPlace, datum: str | None, table: Table) -> int:
    """EPSG code of the UTM grid of a place."""
    north, south, zones = _UTM_GRIDS.get((datum or "WGS84").upper().replace(" ", ""), (0, None, range(0)))
    base = north if place.north else south
    if place.zone not in zones or base is None:
        remedy = "or give easting, northing and the epsg of the grid"
        raise table.error("datum", f"one of {', '.join(_UTM_GRIDS)} that has this zone, beside UTM or MGRS", remedy)
    return base + place.zone


def _file(table: Table) -> str:
    return table.spot.reading.where


def build_site(table: Table) -> Site:
    """Build a site, A or B where the file gives it no name."""
    longitude, latitude, notes = _place(table)
    values = {"name": table.spot.at[-1].upper(), **table.values}
    site = Site(longitude=longitude, latitude=latitude, position_notes=notes, **values)
    table.spot.reading.sites.append(site)
    return site


def build_obstacle(table: Table) -> Obstacle:
    """Build an obstacle between two distances along the path, around one, or around a position."""
    values = table.values
    width_m = values.pop("width_m", 0.0)
    if "from_m" in values:
        return Obstacle(**{"name": table.spot.at, **values})
    name = values.setdefault("name", table.spot.at)
    middle_m = values.pop("at_m") if "at_m" in values else _on_path(table, name)
    if middle_m < width_m / 2:
        raise table.error("width_m", f"at most {2 * middle_m:g} m, so that the obstacle ends at site A")
    return Obstacle(from_m=middle_m - width_m / 2, to_m=middle_m + width_m / 2, **values)


def _on_path(table: Table, name: str) -> float:
    """Distance along the path of an obstacle given by its position."""
    longitude, latitude, _ = _place(table)
    a, b = table.spot.reading.sites
    line = trace(a.longitude, a.latitude, b.longitude, b.latitude, spacing_m=1e5)
    along, offset = (float(value) for value in locate(line, longitude, latitude))
    side = "right" if offset > 0 else "left"
    shown = table.raw.get("position", f"{latitude:.6f}, {longitude:.6f}")
    if not 0.0 < along < line.distance_m:
        behind = f"it lies {abs(offset):.0f} m behind one of them"
        raise table.spot.error("position", shown, "between the sites", behind)
    if abs(offset) > _FARTHEST_ASIDE_M:
        aside = f"it lies {abs(offset):.0f} m to the {side}"
        raise table.spot.error("position", shown, f"within {_FARTHEST_ASIDE_M:.0f} m of the path", aside)
    beside = f"{along:.0f} m from A, {abs(offset):.0f} m {side} of the path, taken as on it"
    table.spot.reading.notes.append(f"obstacle {name}: {beside}")
    return along
