"""Every unit in which a key may be written: the ending of a field's name says which."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import NamedTuple

from profiler.units import FOOT_M, STATUTE_MILE_M, ZERO_CELSIUS_K, gradient_from_k, k_from_gradient

__all__ = ["LENGTHS_M", "Way", "unit_ways"]

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
