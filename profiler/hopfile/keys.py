"""What a key of a hop file says by its ending: its unit, the unit's size, and the unit that the trade writes."""

from __future__ import annotations

from collections.abc import Mapping
from functools import lru_cache

from profiler.units import FOOT_M, STATUTE_MILE_M

__all__ = ["LENGTHS_M", "printed_unit", "usual", "ways"]

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


@lru_cache(maxsize=64)
def ways(fields: tuple[str, ...]) -> Mapping[str, tuple[str, float]]:
    """Every key that stands for one of the fields, unit variants among them, with the field and the factor to its unit.

    Examples
    --------
    >>> ways(("step_m",))["step_km"], ways(("cost_per_m",))["cost_per_km"]
    (('step_m', 1000.0), ('cost_per_m', 0.001))
    """
    found: dict[str, tuple[str, float]] = {}
    for field in fields:
        stem, _, unit = field.rpartition("_")
        for written, factor in _SCALES.get(unit, {}).items():
            found[f"{stem}_{written}"] = (field, 1.0 / factor if stem.endswith("_per") else factor)
    return found | {field: (field, 1.0) for field in fields}


def usual(field: str) -> str:
    """Name a field as the trade writes it.

    Examples
    --------
    >>> usual("frequency_hz"), usual("antenna_m")
    ('frequency_ghz', 'antenna_m')
    """
    return _USUAL.get(field, field)


def printed_unit(key: str) -> str:
    """Give the unit of a key, as printed; empty where it has none.

    Examples
    --------
    >>> printed_unit("antenna_ft"), printed_unit("cost_per_m")
    ('ft', '')
    """
    if "_per_" in key:
        return ""
    return next((printed for end, printed in _PRINTED.items() if key.endswith(end)), "")
