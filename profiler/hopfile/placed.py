"""Positions in a hop file, in whichever of their forms, to WGS 84."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, TypeVar

from profiler.errors import InputError
from profiler.hopfile.check import check, given
from profiler.hopfile.positions import parse_position
from profiler.hopfile.schema import ObstacleTable, PlaceTable, SiteTable
from profiler.hopfile.spot import MISSING, Spot
from profiler.models import Obstacle, Site
from profiler.path import locate, to_wgs84, trace

__all__ = ["build_obstacle", "build_site"]

_FORMS = (("position",), ("latitude", "longitude"), ("easting", "northing"))
_FARTHEST_ASIDE_M = 200.0
"""A thing further beside the path stands outside the first Fresnel zone of any hop of this trade."""

PlaceT = TypeVar("PlaceT", bound=PlaceTable)


def _checked(model: type[PlaceT], raw: Mapping[str, Any], spot: Spot) -> PlaceT:
    """Check a table that holds a position; where its two angles would fit the other way round, say so."""
    angles = [raw[name] for name in ("latitude", "longitude") if isinstance(raw.get(name), int | float)]
    if len(angles) == 2 and 90 < abs(angles[0]) <= 180 and abs(angles[1]) <= 90:
        remedy = f"latitude and longitude look swapped: give latitude = {angles[1]}, longitude = {angles[0]}"
        raise spot.error("latitude", angles[0], "-90 to 90 degrees", remedy)
    return check(model, raw, spot)


def _form(table: PlaceTable, spot: Spot) -> tuple[str, ...]:
    """Which form of position a table uses; exactly one, and whole."""
    values = given(table)
    used = [form for form in _FORMS if any(name in values for name in form)]
    forms = "position, or latitude and longitude, or easting and northing with epsg"
    if not used:
        raise spot.error("position", MISSING, f"given: {forms}")
    if len(used) > 1:
        extra = next(name for name in used[1] if name in values)
        raise spot.error(extra, values[extra], f"left out beside {used[0][0]}", f"give one of {forms}")
    wanted = (*used[0], "epsg") if used[0][0] == "easting" else used[0]
    for name in wanted:
        if name not in values:
            raise spot.error(name, MISSING, f"given beside {next(each for each in used[0] if each in values)}")
    for name in ("epsg", "datum"):
        if name in values and (name == "epsg") != ("epsg" in wanted):
            raise spot.error(
                name, values[name], f"left out beside {used[0][0]}", "epsg goes with easting, datum with degrees"
            )
    return used[0]


def _as_given(table: PlaceTable, spot: Spot) -> tuple[float, float, int | str | None, str]:
    """Both coordinates (x first) in the system they were given in, the system, and the words for it."""
    form = _form(table, spot)
    if form[0] == "position":
        assert table.position is not None
        with spot.blame():
            latitude, longitude = parse_position(table.position)
        return longitude, latitude, table.datum, f"given as {' '.join(table.position.split())}"
    x, y = (table.longitude, table.latitude) if form[0] == "latitude" else (table.easting, table.northing)
    assert x is not None
    assert y is not None
    if form[0] == "latitude":
        return x, y, table.datum, f"given as latitude {y:.12g}, longitude {x:.12g}" if table.datum else ""
    return x, y, table.epsg, f"given as easting {x:.12g}, northing {y:.12g}"


def _place(table: PlaceTable, spot: Spot) -> tuple[float, float, tuple[str, ...]]:
    """Longitude, latitude, and how they were given if not as plain WGS 84 degrees."""
    x, y, system, words = _as_given(table, spot)
    if system is None:
        return x, y, (words,) if words else ()
    degrees = table.epsg is None
    try:
        longitude, latitude, note = to_wgs84(x, y, system, degrees=degrees)
    except InputError as error:
        theirs, ours = ("datum", "longitude, latitude") if degrees else ("epsg", "easting, northing")
        message = str(error).replace("crs = ", f"{theirs} = ", 1).replace("x, y = ", f"{ours} = ", 1)
        raise InputError(f"{spot.where}: {spot.key(message)}") from None
    return longitude, latitude, tuple(filter(None, (words, note)))


def build_site(raw: Mapping[str, Any], spot: Spot, name: str) -> Site:
    """Build a site; ``name`` is what it is called where the file gives it none."""
    table = _checked(SiteTable, raw, spot)
    longitude, latitude, notes = _place(table, spot)
    with spot.blame():
        return Site(
            name=table.name or name,
            longitude=longitude,
            latitude=latitude,
            antenna_m=table.antenna_m,
            surveyed_ground_m=table.ground_m,
            clearing_m=table.clearing_m or 0.0,
            position_notes=notes,
        )


def build_obstacle(raw: Mapping[str, Any], spot: Spot, sites: tuple[Site, Site]) -> tuple[Obstacle, tuple[str, ...]]:
    """Build an obstacle on the path between two sites, with what has to be said about where it stands."""
    table = _checked(ObstacleTable, raw, spot)
    name = table.name or spot.at
    start, end, notes = _extent(table, spot, sites, name)
    with spot.blame():
        return Obstacle(name=name, from_m=start, to_m=end, height_m=table.height_m), notes


def _extent(
    table: ObstacleTable, spot: Spot, sites: tuple[Site, Site], name: str
) -> tuple[float, float, tuple[str, ...]]:
    """Where along the path an obstacle begins and ends: between two distances, or around one, or around a position."""
    values = given(table)
    ways = [way for way in (("from_m", "to_m"), ("at_m",)) if any(key in values for key in way)]
    placed = any(key in values for form in _FORMS for key in form)
    if len(ways) + placed != 1:
        first = ways[0][0] if ways else "at_m"
        raise spot.error(
            first,
            values.get(first, MISSING),
            "the only place of the obstacle",
            "give at, or from and to, or a position",
        )
    if ways and ways[0][0] == "from_m":
        if table.from_m is None or table.to_m is None:
            raise spot.error("from_m" if table.from_m is None else "to_m", MISSING, "given: both from and to")
        if table.width_m is not None:
            raise spot.error("width_m", table.width_m, "left out beside from and to")
        if table.to_m < table.from_m:
            raise spot.error("to_m", table.to_m, f"at least from_m = {table.from_m:g}", "both count from site A")
        return table.from_m, table.to_m, ()
    middle, notes = (table.at_m, ()) if table.at_m is not None else _on_path(table, spot, sites, name)
    half = (table.width_m or 0.0) / 2.0
    if middle < half:
        raise spot.error("width_m", table.width_m, f"at most {2 * middle:g} m, so that the obstacle ends at site A")
    return middle - half, middle + half, notes


def _on_path(table: ObstacleTable, spot: Spot, sites: tuple[Site, Site], name: str) -> tuple[float, tuple[str, ...]]:
    """Distance along the path of an obstacle given by its position."""
    longitude, latitude, _ = _place(table, spot)
    (a, b) = sites
    line = trace(a.longitude, a.latitude, b.longitude, b.latitude, spacing_m=1e5)
    along, offset = (float(value) for value in locate(line, longitude, latitude))
    side = "right" if offset > 0 else "left"
    shown = table.position or f"{latitude:.6f}, {longitude:.6f}"
    if not 0.0 < along < line.distance_m:
        raise spot.error("position", shown, "between the sites", f"it lies {abs(offset):.0f} m behind one of them")
    if abs(offset) > _FARTHEST_ASIDE_M:
        raise spot.error(
            "position",
            shown,
            f"within {_FARTHEST_ASIDE_M:.0f} m of the path",
            f"it lies {abs(offset):.0f} m to the {side}",
        )
    return along, (f"obstacle {name}: {along:.0f} m from A, {abs(offset):.0f} m {side} of the path, taken as on it",)
