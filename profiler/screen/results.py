"""The results of a screening as a file: CSV, Parquet, GeoJSON or GeoPackage, one row for each pair."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np

from profiler.errors import InputError
from profiler.printable import printable
from profiler.screen.pairs import Pairs
from profiler.screen.rows import Rows
from profiler.screen.tables import needed
from profiler.units import Float

__all__ = ["check_kind", "results_file"]

_FIRST = ("distance_m", "azimuth_a_deg", "azimuth_b_deg", "surplus_m", "surplus_at_m", "surplus_offset_m", "rule")
_LAST = ("diffraction_db", "least_equal_m", "fade_margin_db", "chance", "studied")
_ENDS = ("latitude_a", "longitude_a", "latitude_b", "longitude_b")


def check_kind(path: Path) -> None:
    """Stop before any work where the ending of a name is not that of a table, or its library is not there.

    Raises
    ------
    InputError
        Naming the endings, or the extra to install.
    """
    kind = path.suffix.lower()
    if kind not in _WRITERS:
        raise InputError(f"{path}: must end in one of {', '.join(_WRITERS)} to be a table of results")
    for module in _WRITERS[kind][1]:
        needed(module, f"{path}")


def results_file(pairs: Pairs, rows: Rows, path: Path) -> bytes:
    """Make the file of results that the ending of a name asks for; the same rows give the same bytes.

    Parameters
    ----------
    pairs, rows
        What was screened, and what was found.
    path
        Its ending says what is made.
    """
    write, _ = _WRITERS[path.suffix.lower()]
    return write(_columns(pairs, rows), _lines(pairs))


def _columns(pairs: Pairs, rows: Rows) -> dict[str, Any]:
    """Give texts as lists and numbers as arrays, by the names of their columns."""
    texts = {
        "id": [printable(name) for name in pairs.ids],
        "status": [printable(words) for words in rows.status],
        "outcome": rows.outcome,
    }
    per_rule = {f"surplus_{number}_m": each for number, each in enumerate(rows.rule_surplus_m.T, start=1)}
    first, last = ({name: getattr(rows, name) for name in names} for names in (_FIRST, _LAST))
    return {**texts, **first, **per_rule, **last, **{name: getattr(pairs, name) for name in _ENDS}}


def _lines(pairs: Pairs) -> Float:
    """Longitude and latitude of both ends, (pairs, 2, 2)."""
    a, b = (np.stack(end, axis=1) for end in ((pairs.longitude_a, pairs.latitude_a), _b(pairs)))
    return np.stack([a, b], axis=1)


def _b(pairs: Pairs) -> tuple[Float, Float]:
    """Give the positions of B, on A's side of the antimeridian, so that a map draws the short way."""
    turn = (pairs.longitude_b - pairs.longitude_a + 180.0) % 360.0 - 180.0
    crosses = np.abs(pairs.longitude_b - pairs.longitude_a) > 180.0
    return np.where(crosses, pairs.longitude_a + turn, pairs.longitude_b), pairs.latitude_b


def _plain(values: Any) -> list[Any]:
    """Give values of a column with None for what is not known."""
    return values if isinstance(values, list) else [None if np.isnan(each) else each for each in values.tolist()]


def _csv(columns: dict[str, Any], _: Float) -> bytes:
    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow(columns)
    writer.writerows(zip(*map(_plain, columns.values()), strict=True))
    return text.getvalue().encode()


def _parquet(columns: dict[str, Any], _: Float) -> bytes:
    arrow, parquet = needed("pyarrow", "Parquet"), needed("pyarrow.parquet", "Parquet")
    memory = io.BytesIO()
    parquet.write_table(
        arrow.table({name: arrow.array(values, from_pandas=True) for name, values in columns.items()}), memory
    )
    return memory.getvalue()


def _geojson(columns: dict[str, Any], lines: Float) -> bytes:
    features = []
    for line, *values in zip(lines, *map(_plain, columns.values()), strict=True):
        known = bool(np.isfinite(line).all())
        features.append(
            {
                "type": "Feature",
                "geometry": {"type": "LineString", "coordinates": line.tolist()} if known else None,
                "properties": dict(zip(columns, values, strict=True)),
            }
        )
    return (json.dumps({"type": "FeatureCollection", "features": features}, ensure_ascii=False) + "\n").encode()


def _geopackage(columns: dict[str, Any], lines: Float) -> bytes:
    pyogrio, shapely = needed("pyogrio", "GeoPackage"), needed("shapely", "GeoPackage")
    known = np.isfinite(lines).all(axis=(1, 2))
    shapes = np.full(len(lines), None, dtype=object)
    shapes[known] = shapely.to_wkb(shapely.linestrings(lines[known]))
    values = [np.array(each, dtype=object) if isinstance(each, list) else each for each in columns.values()]
    memory = io.BytesIO()
    pyogrio.set_gdal_config_options({"OGR_CURRENT_DATE": "1970-01-01T00:00:00.000Z"})  # the clock is no result
    try:
        pyogrio.raw.write(
            memory,
            shapes,
            values,
            list(columns),
            driver="GPKG",
            layer="pairs",
            geometry_type="LineString",
            crs="EPSG:4326",
        )
    finally:
        pyogrio.set_gdal_config_options({"OGR_CURRENT_DATE": None})
    return memory.getvalue()


_WRITERS: dict[str, tuple[Callable[[dict[str, Any], Float], bytes], tuple[str, ...]]] = {
    ".csv": (_csv, ()),
    ".parquet": (_parquet, ("pyarrow",)),
    ".geojson": (_geojson, ()),
    ".gpkg": (_geopackage, ("pyogrio", "shapely")),
}
