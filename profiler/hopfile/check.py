"""Check one table of a hop file against its schema, in whichever unit a key is written, and word what is wrong.

Every message is one line that names the file, the key as the user wrote it, its value, what is allowed in the user's
own unit, and what to do.
"""

from __future__ import annotations

import difflib
import math
import types
from collections.abc import Mapping
from functools import lru_cache
from typing import TYPE_CHECKING, Annotated, Any, Literal, TypeVar, Union, get_args, get_origin

from profiler.errors import InputError
from profiler.hopfile.spot import MISSING, Spot, show
from profiler.units import FOOT_M, STATUTE_MILE_M

if TYPE_CHECKING:
    from pydantic.fields import FieldInfo

    from profiler.hopfile.schema import Table

__all__ = ["LENGTHS_M", "check", "given"]

LENGTHS_M: Mapping[str, float] = {"m": 1.0, "ft": FOOT_M, "km": 1e3, "mi": STATUTE_MILE_M}
"""Endings of a key that holds a length, and their size."""

_SCALES: Mapping[str, Mapping[str, float]] = {
    "m": LENGTHS_M,
    "hz": {"hz": 1.0, "khz": 1e3, "mhz": 1e6, "ghz": 1e9},
    "bps": {"bps": 1.0, "kbps": 1e3, "mbps": 1e6, "gbps": 1e9},
    "s": {"s": 1.0, "ns": 1e-9},
}
_USUAL = {
    "frequency_hz": "frequency_ghz",
    "bandwidth_hz": "bandwidth_mhz",
    "width_hz": "width_mhz",
    "bit_rate_bps": "bit_rate_mbps",
    "delay_s": "delay_ns",
}
_PRINTED = {
    "_n_km": "N/km",
    "_g_m3": "g/m³",
    "_mm_h": "mm/h",
    "_m": "m",
    "_ft": "ft",
    "_km": "km",
    "_mi": "mi",
    "_hz": "Hz",
    "_khz": "kHz",
    "_mhz": "MHz",
    "_ghz": "GHz",
    "_bps": "bit/s",
    "_kbps": "kbit/s",
    "_mbps": "Mbit/s",
    "_gbps": "Gbit/s",
    "_s": "s",
    "_ns": "ns",
    "_db": "dB",
    "_dbm": "dBm",
    "_dbi": "dBi",
    "losses": "dB",
    "_hpa": "hPa",
    "_c": "°C",
    "_percent": "%",
    "temperature_k": "K",
    "latitude": "degrees",
    "longitude": "degrees",
}
_RANGE_ERRORS = frozenset({"greater_than", "greater_than_equal", "less_than", "less_than_equal"})

TableT = TypeVar("TableT", bound="Table")


def given(table: Table) -> dict[str, Any]:
    """Keys of a checked table that were given, with their values."""
    return {key: value for key, value in table if value is not None}


@lru_cache(maxsize=64)
def _ways(model: type[Table]) -> dict[str, tuple[str, float]]:
    """Every key that a table knows, unit variants among them: the key of the schema and the factor to its unit."""
    ways: dict[str, tuple[str, float]] = {}
    for field in model.model_fields:
        stem, _, unit = field.rpartition("_")
        for written, factor in _SCALES.get(unit, {}).items():
            ways[f"{stem}_{written}"] = (field, 1.0 / factor if stem.endswith("_per") else factor)
    return ways | {field: (field, 1.0) for field in model.model_fields}


def _scaled(value: Any, factor: float) -> Any:
    """Turn numbers, alone or in lists and tables, into the schema's unit; leave all else for the schema to refuse."""
    if isinstance(value, list):
        return [_scaled(each, factor) for each in value]
    if isinstance(value, dict):
        return {key: _scaled(each, factor) for key, each in value.items()}
    if isinstance(value, bool) or not isinstance(value, int | float):
        return value
    try:
        return value * factor
    except OverflowError:  # an integer beyond floating point; the schema refuses infinity
        return math.inf


def check(model: type[TableT], raw: Mapping[str, Any], spot: Spot) -> TableT:
    """Check one table.

    Parameters
    ----------
    model
        Its schema.
    raw
        The table as TOML gives it.
    spot
        Where it stands.

    Returns
    -------
    Table
        In the units of the schema.

    Raises
    ------
    InputError
        For the first unknown key, else the first value that is not allowed.

    Examples
    --------
    >>> from profiler.hopfile.schema import TowerTable
    >>> check(TowerTable, {"lowest_ft": 100}, Spot("hop.toml", "heights.a")).lowest_m
    30.48
    >>> check(TowerTable, {"lowest_fr": 100}, Spot("hop.toml", "heights.a"))
    Traceback (most recent call last):
    profiler.errors.InputError: hop.toml: heights.a.lowest_fr = 100: must be a known key; did you mean lowest_ft?
    """
    from pydantic import ValidationError

    ways = _ways(model)
    values: dict[str, Any] = {}
    written: dict[str, str] = {}
    for key, value in raw.items():
        if key not in ways:
            raise _unknown(model, key, value, spot)
        field, factor = ways[key]
        if field in written:
            raise spot.error(key, value, f"left out beside {written[field]} = {show(raw[written[field]])}", "give one")
        values[field], written[field] = _scaled(value, factor) if key != field else value, key
    try:
        return model.model_validate(values)
    except ValidationError as error:
        first = error.errors(include_url=False, include_context=False, include_input=False)[0]
        raise _reworded(model, raw, written, first["type"], first["loc"], spot) from None


def _unknown(model: type[Table], key: str, value: object, spot: Spot) -> InputError:
    """Offer the nearest known key, or all of them."""
    from profiler.hopfile.schema import HopTable

    near = difflib.get_close_matches(key.lower(), _ways(model), n=1)
    if near:
        remedy = f"did you mean {near[0]}?"
    elif spot.at and key in _ways(HopTable):
        remedy = "it belongs at the top of the file, before the first [table]"
    else:
        remedy = f"known here: {', '.join(_USUAL.get(field, field) for field in model.model_fields)}"
    return spot.error(key, value, "a known key", remedy)


def _reworded(
    model: type[Table],
    raw: Mapping[str, Any],
    written: Mapping[str, str],
    kind: str,
    location: tuple[int | str, ...],
    spot: Spot,
) -> InputError:
    """Word a complaint of the schema for the person who wrote the file."""
    field, steps = str(location[0]), location[1:]
    key = written.get(field, _USUAL.get(field, field))
    factor = _ways(model)[key][1]
    annotation, bounds = _inner(model.model_fields[field], len(steps))
    unit = next((printed for end, printed in _PRINTED.items() if key.endswith(end)), "")
    allowed = _allowed(annotation, bounds, unit, 1.0 if key == field else factor, kind in _RANGE_ERRORS, spot.key(key))
    if kind == "missing":
        return spot.error(key, MISSING, allowed)
    value: Any = raw[key]
    for step in steps:
        value = value[step]
    name = key + "".join(f"[{step}]" if isinstance(step, int) else f".{step}" for step in steps)
    choices = [each for each in get_args(annotation) if isinstance(each, str)]
    near = difflib.get_close_matches(value.lower(), choices, n=1) if isinstance(value, str) and choices else []
    return spot.error(name, value, allowed, f"did you mean {near[0]!r}?" if near else "")


def _inner(field: FieldInfo, depth: int) -> tuple[Any, dict[str, float]]:
    """Type and bounds of a field, or of what stands ``depth`` lists or tables inside it."""
    annotation, notes = _plain(field.annotation), list(field.metadata)
    for _ in range(depth):
        annotation, notes = _plain(get_args(annotation)[-1]), []
        if get_origin(annotation) is Annotated:
            annotation, *extra = get_args(annotation)
            notes = [note for each in extra for note in each.metadata]
    bounds = {name: getattr(note, name) for note in notes for name in ("gt", "ge", "lt", "le") if hasattr(note, name)}
    return annotation, bounds


def _plain(annotation: Any) -> Any:
    """Take the None out of an optional type."""
    if get_origin(annotation) in (Union, types.UnionType):
        return next(each for each in get_args(annotation) if each is not type(None))
    return annotation


def _allowed(
    annotation: Any, bounds: Mapping[str, float], unit: str, factor: float, is_number: bool, dotted: str
) -> str:
    """Say what a key may hold, its bounds in the unit that the user writes."""
    origin = get_origin(annotation)
    if annotation in (float, int):
        limits = _range({name: bound / factor for name, bound in bounds.items()}, unit)
        sort = ("a number" if annotation is float else "a whole number") + (
            f" of {unit}" if unit and not limits else ""
        )
        return limits if is_number else ", ".join(filter(None, (sort, limits)))
    if origin is Literal:
        return f"one of {', '.join(map(repr, get_args(annotation)))}"
    if origin is list:
        inner = _plain(get_args(annotation)[0])
        if get_origin(inner) is dict:
            return f"a list of tables, each headed [[{dotted}]]"
        return 'a list with at least one text, like ["a.tif"]' if inner is str else f"a list of numbers {unit}".strip()
    if origin is dict:
        return f"a table, headed [{dotted}]"
    return {bool: "true or false", str: "text in quotes, not empty"}[annotation]


def _range(bounds: Mapping[str, float], unit: str) -> str:
    """Word bounds.

    Examples
    --------
    >>> _range({"gt": 0, "le": 1}, ""), _range({"ge": -90, "le": 90}, "degrees"), _range({"ge": 0}, "dB")
    ('more than 0 and at most 1', '-90 to 90 degrees', '0 dB or more')
    """
    low = bounds.get("ge", bounds.get("gt", -math.inf))
    high = bounds.get("le", bounds.get("lt", math.inf))
    end = f" {unit}" if unit else ""
    lowest, highest = f"{low:.7g}", f"{high:.7g}"
    if math.isinf(low) and math.isinf(high):
        return ""
    if math.isinf(high):
        return f"more than {lowest}{end}" if "gt" in bounds else f"{lowest}{end} or more"
    under = "under " if "lt" in bounds else ""
    if "gt" in bounds:
        return f"more than {lowest} and {under or 'at most '}{highest}{end}"
    return f"{lowest} to {under}{highest}{end}"
