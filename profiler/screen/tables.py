"""Tables of pairs and sites as people keep them: CSV, GeoJSON, GeoPackage and Parquet, column by column."""

from __future__ import annotations

import csv
import importlib
import io
import json
from collections.abc import Iterator
from pathlib import Path
from typing import Any

from profiler.errors import InputError

__all__ = ["Columns", "needed", "read_table"]

Columns = dict[str, list[Any]]
"""Columns by their names in small letters; texts, numbers or None as they stand in the file."""

_ENDS = ("longitude_a", "latitude_a", "longitude_b", "latitude_b")


def needed(module: str, what: str) -> Any:
    """Import a module of the optional extra, or say in one line how to get it."""
    try:
        return importlib.import_module(module)
    except ImportError:
        raise InputError(
            f'{what}: must be read or written by {module.partition(".")[0]}; pip install "hopwright[tables]"'
        ) from None


def read_table(path: Path) -> Columns:
    """Read a table by the ending of its name: .geojson, .json, .gpkg, .parquet, and CSV for all others.

    The lines of a GeoJSON or GeoPackage give the columns ``longitude_a, latitude_a, longitude_b, latitude_b`` of their
    first and last corner, points ``longitude`` and ``latitude``.

    Raises
    ------
    InputError
        For a file that is not there or not of its kind, or a column that stands twice.
    """
    if not path.is_file():
        raise InputError(f"{path}: must be a file of pairs or sites that is there")
    reader = {".parquet": _parquet, ".geojson": _geojson, ".json": _geojson, ".gpkg": _geopackage}
    try:
        columns = reader.get(path.suffix.lower(), _csv)(path)
    except (OSError, ValueError, KeyError, TypeError, RuntimeError) as error:
        raise InputError(f"{path}: must be a table that can be read ({' '.join(str(error).split())})") from error
    return {name.strip().lower(): values for name, values in columns.items()}


def _csv(path: Path) -> Columns:
    """Read CSV whose columns are parted by commas, semicolons or tabs, as its header says."""
    text = path.read_text(encoding="utf-8-sig")
    header = text.partition("\n")[0]
    rows = csv.reader(io.StringIO(text, newline=""), delimiter=max(",;\t", key=header.count))
    names = [name.strip().lower() for name in next(rows, [])]
    twice = [name for name in names if names.count(name) > 1]
    if twice:
        raise ValueError(f"column {twice[0]} stands twice in the header")
    whole = ([*row, *[None] * (len(names) - len(row))] for row in rows if any(row))
    columns = list(zip(*whole, strict=False)) or [()] * len(names)
    return {name: list(column) for name, column in zip(names, columns, strict=False)}


def _parquet(path: Path) -> Columns:
    columns: Columns = needed("pyarrow.parquet", f"{path}: Parquet").read_table(path).to_pydict()
    return columns


def _geojson(path: Path) -> Columns:
    features = json.loads(path.read_text(encoding="utf-8-sig"))["features"]
    rows = ((each.get("properties") or {}, each.get("id"), each["geometry"]) for each in features)
    return _columns(
        {"id": name, **facts, **_corners(shape["type"], shape["coordinates"])} for facts, name, shape in rows
    )


def _geopackage(path: Path) -> Columns:
    """Read the first layer; its coordinates must be WGS 84 degrees."""
    facts, ids, shapes, values = needed("pyogrio.raw", f"{path}: GeoPackage").read(path, return_fids=True)
    if facts["crs"] not in (None, "EPSG:4326", "OGC:CRS84"):
        raise ValueError(f"its layer is in {facts['crs']}: bring it to EPSG:4326")
    shapely = needed("shapely", f"{path}: GeoPackage")
    rows = []
    for number, shape in enumerate(shapely.from_wkb(shapes)):
        row = {"id": ids[number], **dict(zip(facts["fields"], (column[number] for column in values), strict=True))}
        corners = shape.coords[0] if shape.geom_type == "Point" else list(shape.coords)
        rows.append(row | _corners(shape.geom_type, corners))
    return _columns(iter(rows))


def _corners(kind: str, corners: Any) -> dict[str, float]:
    """Name the position of a point, or the ends of a line."""
    if kind == "Point":
        return {"longitude": corners[0], "latitude": corners[1]}
    if kind == "LineString" and len(corners) > 1:
        return dict(zip(_ENDS, (*corners[0][:2], *corners[-1][:2]), strict=True))
    raise ValueError(f"it holds a {kind}: lines from A to B, or points")


def _columns(rows: Iterator[dict[str, Any]]) -> Columns:
    """Turn rows with names into columns; what a row lacks is None."""
    listed = [{str(name).strip().lower(): value for name, value in row.items()} for row in rows]
    names = dict.fromkeys(name for row in listed for name in row)
    return {name: [row.get(name) for row in listed] for name in names}
