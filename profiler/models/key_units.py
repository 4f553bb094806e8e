"""Every unit in which a key may be written: the ending of a field's name says which."""

from __future__ import annotations

import re
from collections.abc import Callable, Mapping
from typing import NamedTuple

from profiler.units import FOOT_M, STATUTE_MILE_M, ZERO_CELSIUS_K, gradient_from_k, k_from_gradient

__all__ = ["LENGTHS_M", "Way", "in_unit", "stem_of", "unit_ways"]

LENGTHS_M: Mapping[str, float] = {"m": 1.0, "ft": FOOT_M, "km": 1e3, "mi": STATUTE_MILE_M}
"""Endings of a key that holds a length, and their size."""

_SCALES: Mapping[str, Mapping[str, tuple[str, float]]] = {
    "m": {ending: (ending, size) for ending, size in LENGTHS_M.items()},
    "hz": {"hz": ("Hz", 1.0), "khz": ("kHz", 1e3), "mhz": ("MHz", 1e6), "ghz": ("GHz", 1e9)},
    "bps": {"bps": ("bit/s", 1.0), "kbps": ("kbit/s", 1e3), "mbps": ("Mbit/s", 1e6), "gbps": ("Gbit/s", 1e9)},
    "s": {"s": ("s", 1.0), "ns": ("ns", 1e-9)},
}
_PRINTED = {
    "_n_km": "N/km",
    "_g_m3": "g/m³",
    "_mm_h": "mm/h",
    "_db": "dB",
    "_dbm": "dBm",
    "_dbi": "dBi",
    "losses": "dB",
    "_hpa": "hPa",
    "_percent": "%",
    "temperature_k": "K",
    "efficiency": "(a fraction, not percent)",
    "sea_fraction": "(a fraction, not percent)",
    "latitude": "degrees",
    "longitude": "degrees",
}


class Way(NamedTuple):
    """One way to write a field: the key, the unit as printed, and the conversions to the field's unit and back."""

    key: str
    unit: str
    into: Callable[[float], float]
    out: Callable[[float], float]

    @property
    def plain(self) -> bool:
        """Whether the number is the field's own."""
        return self.into is _same


_SPELLED = {
    **dict.fromkeys(("'", "′", "’", "foot", "feet"), "ft"),
    **dict.fromkeys(("metre", "metres", "meter", "meters"), "m"),
    **dict.fromkeys(("kilometre", "kilometres", "kilometer", "kilometers"), "km"),
    **dict.fromkeys(("mile", "miles"), "mi"),
    **dict.fromkeys(("°c", "celsius"), "c"),
    "kelvin": "k",
}
"""Units as people write them behind a number, beside the endings of keys."""
_MEASURE = re.compile(r"\s*([-+]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][-+]?\d+)?)\s*([^\d\s.].*?)\s*", re.ASCII)


def stem_of(key: str) -> str:
    """Give a key without the ending that is its unit; empty where it has none.

    Examples
    --------
    >>> stem_of("antenna_ft"), stem_of("terrain_kind"), stem_of("cost_per_m")
    ('antenna', '', '')
    """
    stem, _, ending = key.rpartition("_")
    known = ending in {"c", "k"}.union(*_SCALES.values()) and not stem.endswith("_per")
    return stem if known and (ending not in "ck" or stem.endswith("temperature")) else ""


def in_unit(text: str, ways: tuple[Way, ...]) -> tuple[str, float] | None:
    """Read a number with its unit as the key in that unit and the number; None where it is no such text.

    Examples
    --------
    >>> antenna = unit_ways("antenna_m")
    >>> in_unit("60'", antenna), in_unit("18.3 m", antenna), in_unit("60 GHz", antenna), in_unit("60", antenna)
    (('antenna_ft', 60.0), ('antenna_m', 18.3), None, None)
    """
    found = _MEASURE.fullmatch(text)
    if found is None:
        return None
    unit = found[2].casefold()
    unit = _SPELLED.get(unit, unit)
    key = next((way.key for way in ways if way.key.rpartition("_")[2] == unit or way.unit.casefold() == unit), None)
    return None if key is None else (key, float(found[1]))


def _same(value: float) -> float:
    return value


def _k_from_gradient(gradient_n_km: float) -> float:
    return float(k_from_gradient(gradient_n_km))


def unit_ways(name: str, usual: str = "", *, percent: bool = False) -> tuple[Way, ...]:
    """Every way to write a field, from the ending of its name; the one with the usual ending first.

    Examples
    --------
    >>> [way.key for way in unit_ways("frequency_hz", "ghz")]
    ['frequency_ghz', 'frequency_hz', 'frequency_khz', 'frequency_mhz']
    >>> [way.key for way in unit_ways("median_k")], [way.key for way in unit_ways("minimum_chance", percent=True)]
    (['median_k', 'median_gradient_n_km'], ['minimum_chance_percent'])
    """
    if percent:
        return (Way(f"{name}_percent", "%", lambda value: value / 100.0, lambda value: value * 100.0),)
    stem, _, ending = name.rpartition("_")
    found = [Way(name, next((printed for end, printed in _PRINTED.items() if name.endswith(end)), ""), _same, _same)]
    if name.endswith("temperature_k"):
        found.append(Way(f"{stem}_c", "°C", lambda c: c + ZERO_CELSIUS_K, lambda k: k - ZERO_CELSIUS_K))
    elif ending == "k":
        lead = f"{stem}_" if stem else ""
        found.append(Way(f"{lead}gradient_n_km", "N/km", _k_from_gradient, lambda k: float(gradient_from_k(k))))
    elif name.endswith("_db_per_m"):
        lengths = {"m": 1.0, "100m": 100.0, "ft": FOOT_M, "100ft": 100.0 * FOOT_M}
        found = [
            _scaled(f"{stem}_{each}", f"dB per {each.replace('100', '100 ')}", 1.0 / size)
            for each, size in lengths.items()
        ]
    elif ending in _SCALES and stem:
        per = stem.endswith("_per")
        found = [
            _scaled(f"{stem}_{each}", "" if per else printed, 1.0 / size if per else size)
            for each, (printed, size) in _SCALES[ending].items()
        ]
    first = f"{stem}_{usual}" if usual else name
    return tuple(sorted(found, key=lambda way: way.key != first))


def _scaled(key: str, unit: str, size: float) -> Way:
    if size == 1.0:
        return Way(key, unit, _same, _same)
    return Way(key, unit, lambda value: value * size, lambda value: value / size)
