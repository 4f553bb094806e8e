"""The JSON Schema of a hop file, from the same statement as its reader, for editors to complete and check."""

from __future__ import annotations

from itertools import combinations
from pathlib import Path
from typing import Any

from profiler.models import Hop
from profiler.models.key_units import Way
from profiler.models.stated import Entry, Forms, Kind, States, entries, forms

__all__ = ["hop_schema"]

Schema = dict[str, Any]

_PLAIN: dict[Any, Schema] = {
    bool: {"type": "boolean"},
    str: {"type": "string", "minLength": 1},
    Path: {"type": "string", "minLength": 1},
}


def hop_schema() -> Schema:
    """Give the JSON Schema of a hop file.

    Returns
    -------
    dict
        Draft 2020-12. It refuses what a schema can: unknown keys, wrong sorts, numbers out of their bounds in whichever
        unit, one thing said twice, and forms that are not whole.

    Examples
    --------
    >>> hop_schema()["properties"]["frequency_mhz"]["minimum"]
    10.0
    """
    return {
        "$schema": "https://json-schema.org/draft/2020-12/schema",
        "title": "hopwright hop file",
        **_table(Hop),
    }


def _table(states: States) -> Schema:
    """Give the schema of one table."""
    properties: Schema = {}
    asks: list[Schema] = []
    for entry in entries(states):
        properties |= {way.key: {"description": _described(entry, way), **_value(entry, way)} for way in entry.ways}
        keys = [way.key for way in entry.ways]
        if entry.required:
            asks.append(_only_one(keys))
        elif len(keys) > 1:
            asks.append(_at_most_one(keys))
    by_field = {entry.field: entry for entry in entries(states)}
    asks += [ask for each in forms(states) for ask in _asked(each, by_field)]
    table = {"type": "object", "properties": properties, "additionalProperties": False}
    return table | ({"allOf": asks} if asks else {})


def _described(entry: Entry, way: Way) -> str:
    unit = f" ({way.unit.strip('()')})" if way.unit else ""
    taken = f"; if left out, {entry.key.left_out}" if entry.key.left_out else ""
    return f"{entry.key.words}{unit}{taken}"


def _value(entry: Entry, way: Way, kind: Kind | None = None) -> Schema:
    """Give the schema of a key's value, or of what stands inside it."""
    kind = kind or entry.kind
    match kind.sort:
        case "choice":
            found: Schema = {"enum": list(kind.of)}
        case "table":
            found = _table(kind.of)
        case "list":
            inner = {"type": "array", "items": _value(entry, way, kind.of)}
            found = inner | ({"minItems": 1} if entry.required else {})
        case "named":
            names = {"propertyNames": {"pattern": "^[0-9]+$"}} if kind.of is int else {}
            found = {"type": "object", "additionalProperties": _number(entry, way, float), **names}
        case "pairs":
            pair = {"type": "array", "items": _number(entry, way, float), "minItems": 2, "maxItems": 2}
            found = {"type": "array", "items": pair}
        case sort if sort in (float, int):
            found = _number(entry, way, sort)
        case _:
            found = _PLAIN[kind.sort]
    return found


def _number(entry: Entry, way: Way, sort: type) -> Schema:
    """Give the schema of a number, with its bounds in the unit of the key."""
    low, high, over, under = entry.key.ends(way)
    ends = {"exclusiveMinimum" if over else "minimum": low, "exclusiveMaximum" if under else "maximum": high}
    return {"type": "number" if sort is float else "integer"} | {
        name: end for name, end in ends.items() if end is not None
    }


def _has(entry: Entry) -> Schema:
    """Say that a field is given, in one of its units."""
    keys = [way.key for way in entry.ways]
    return {"required": keys} if len(keys) == 1 else {"anyOf": [{"required": [key]} for key in keys]}


def _only_one(keys: list[str]) -> Schema:
    return {"required": keys} if len(keys) == 1 else {"oneOf": [{"required": [key]} for key in keys]}


def _at_most_one(keys: list[str]) -> Schema:
    return {"not": {"anyOf": [{"required": list(pair)} for pair in combinations(keys, 2)]}}


def _asked(each: Forms, by_field: dict[str, Entry]) -> list[Schema]:
    """Say which ways are whole, and, where only one may be given, that nothing of another stands beside it."""
    every = list(dict.fromkeys(name.rstrip("?") for way in each.ways for name in way))
    options: list[Schema] = []
    for way, whole in zip(each.ways, each.required(), strict=True):
        here = {name.rstrip("?") for name in way}
        others = [_has(by_field[name]) for name in every if name not in here] if each.only else []
        options.append(
            {"allOf": [_has(by_field[name]) for name in whole]} | ({"not": {"anyOf": others}} if others else {})
        )
    if not each.needed:
        options.append({"not": {"anyOf": [_has(by_field[name]) for name in every]}})
    return [{"anyOf": options}]
