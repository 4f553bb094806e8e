"""What the search for antenna heights takes where a hop file leaves it open."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from profiler.models import Site, TowerChoice
from profiler.models.stated import Entry, entries

__all__ = ["stand_ins"]


def stand_ins(tables: dict[str, Any], *, antennas: bool, steps_in_feet: bool) -> list[str]:
    """Put what may be left open into the tables, and say what was taken."""
    notes = []
    for end in ("a", "b"):
        site, tower = tables.get(f"site_{end}"), _inside(tables, "heights", end)
        if not antennas and isinstance(site, dict) and _key(site, _entry(Site, "antenna_m")) is None:
            site.update(_highest(tower))
            height = " ".join(f"{value} {key.rpartition('_')[2]}" for key, value in _highest(tower).items())
            notes.append(f"antenna at {end.upper()}: no height is given, the highest of the tower, {height}, stands in")
        if steps_in_feet and _key(tower, _entry(TowerChoice, "step_m")) is None:
            tables.setdefault("heights", {}).setdefault(end, {})["step_ft"] = 1
            notes.append(f"tower at {end.upper()}: no step is given, positions at whole feet are taken")
    return notes


def _inside(tables: Mapping[str, Any], *names: str) -> Mapping[str, Any]:
    """Table inside tables; empty where there is none."""
    found: Any = tables
    for name in names:
        found = found.get(name, {}) if isinstance(found, dict) else {}
    return found if isinstance(found, dict) else {}


def _entry(states: Any, field: str) -> Entry:
    return next(entry for entry in entries(states) if entry.field == field)


def _key(table: Mapping[str, Any], entry: Entry) -> str | None:
    """Key by which a field is given."""
    return next((key for key in (*(way.key for way in entry.ways), entry.bare) if key in table), None)


def _highest(tower: Mapping[str, Any]) -> dict[str, Any]:
    """Highest position of a tower, as a key and value of an antenna's height."""
    entry = _entry(TowerChoice, "highest_m")
    key = _key(tower, entry)
    return {"antenna_m": entry.default} if key is None else {key.replace("highest", "antenna"): tower[key]}
