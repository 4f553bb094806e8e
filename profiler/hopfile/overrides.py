"""Set keys of a hop file from outside, by their dotted names."""

from __future__ import annotations

import re
import tomllib
from collections.abc import Mapping
from copy import deepcopy
from typing import Any

from profiler.errors import InputError, show
from profiler.models import Hop, Override
from profiler.models.stated import Entry, States, entries, forms, ways

__all__ = ["overridden", "value_of"]

_PART = re.compile(r"([^.\[\]]+)(?:\[(\d+)\])?(?:\.|$)")


def value_of(text: str) -> Any:
    """Read a value as TOML writes it, or as text where it is no TOML: ``40``, ``true``, ``[1, 2]``, ``60 ft``.

    Examples
    --------
    >>> value_of("40"), value_of("60 ft"), value_of("[24, 41.5]")
    (40, '60 ft', [24, 41.5])
    """
    try:
        tables = tomllib.loads(f"value = {text}")
    except ValueError:
        return text
    return tables["value"] if list(tables) == ["value"] else text


def overridden(raw: Mapping[str, Any], changes: Mapping[str, Any]) -> tuple[dict[str, Any], tuple[Override, ...]]:
    """Give the tables of a hop file with some keys set anew, and what they said before.

    Parameters
    ----------
    raw
        The file as TOML gives it; it stays as it is.
    changes
        Values by dotted name: ``site_a.antenna_m``, ``radio.mode[0].threshold_dbm``. A key replaces its like in another
        unit and every other form of the same statement.

    Returns
    -------
    tables, overrides

    Raises
    ------
    InputError
        For a name that leads nowhere.

    Examples
    --------
    >>> overridden({"site_a": {"antenna_m": 30}}, {"site_a.antenna_ft": 100})
    ({'site_a': {'antenna_ft': 100}}, (Override(key='site_a.antenna_ft', value='100', instead_of='antenna_m = 30'),))
    """
    tables = deepcopy(dict(raw))
    made = []
    for name, value in changes.items():
        table, states, key = _walk(tables, name)
        before = [f"{each} = {show(table.pop(each))}" for each in _rivals(states, key) if each in table]
        table[key] = _as_stated(states, key, value)
        made.append(Override(name, show(table[key]), ", ".join(before) or None))
    return tables, tuple(made)


def _walk(table: dict[str, Any], name: str) -> tuple[dict[str, Any], States | None, str]:
    """Go to the table that holds a key, making tables on the way where there are none."""
    parts = [(found[1], found[2]) for found in _PART.finditer(name)]
    if not parts or "".join(f"{key}[{at}]" if at else key for key, at in parts) != re.sub(r"(?<=[\w\]])\.", "", name):
        raise InputError(field="--set", value=name, allowed="the dotted name of a key, like site_a.antenna_m")
    states: States | None = Hop
    for key, at in parts[:-1]:
        entry = ways(states)[key][0] if states is not None and key in ways(states) else None
        inner: Any = table.setdefault(key, [] if at else {})
        if at and isinstance(inner, list):
            if int(at) > len(inner):
                raise InputError(field="--set", value=name, allowed=f"about one of {key}[0] to {key}[{len(inner)}]")
            inner += [{}] if int(at) == len(inner) else []
            inner = inner[int(at)]
        if not isinstance(inner, dict):
            raise InputError(field="--set", value=name, allowed=f"a name in which {key} is a table; lists: {key}[0]")
        table, states = inner, _class_of(entry)
    return table, states, parts[-1][0]


def _class_of(entry: Entry | None) -> States | None:
    if entry is None:
        return None
    kind = entry.kind.of if entry.kind.sort == "list" else entry.kind
    return kind.of if kind.sort == "table" else None


def _rivals(states: States | None, key: str) -> list[str]:
    """Keys that say the same, or that cannot stand beside it."""
    if states is None:
        return [key]
    found = {name: each for each in entries(states) for name in (*(way.key for way in each.ways), each.bare) if name}
    if key not in found:
        return [key]
    field = found[key].field
    gone = {field}
    for each in forms(states):
        mine = [{name.rstrip("?") for name in way} for way in each.ways if field in way]
        if each.only and each.needed and mine:
            members = {name.rstrip("?") for way in each.ways for name in way}
            gone |= members - {name for each in mine for name in each}
    return [name for name, entry in found.items() if entry.field in gone]


def _as_stated(states: States | None, key: str, value: Any) -> Any:
    """Let a number stay text where the key holds text: a revision 2, a channel 11."""
    known = ways(states).get(key) if states is not None else None
    plain = known is not None and known[0].kind.sort is str and isinstance(value, int | float)
    return str(value) if plain and not isinstance(value, bool) else value
