"""The state of the air: pressures, and the reference atmosphere where nobody measured (Rec. ITU-R P.835-6)."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from profiler.checks import not_negative, positive, within
from profiler.errors import InputError
from profiler.models import frozen_array
from profiler.units import Float

__all__ = [
    "HEIGHT_RANGE_M",
    "Atmosphere",
    "dry_pressure",
    "local_atmosphere",
    "reference_atmosphere",
    "vapour_pressure",
]

HEIGHT_RANGE_M = (-500.0, 8500.0)
"""Where the profile here answers: within its lowest layer, with room for land below sea level."""


@dataclass(frozen=True, slots=True, eq=False)
class Atmosphere:
    """The air at one height or many; the arrays are read-only and of one shape.

    ``pressure_hpa`` is of the dry air, ready for `gas_attenuation`; ``total_pressure_hpa`` is what a barometer reads.
    """

    pressure_hpa: Float
    temperature_k: Float
    vapour_g_m3: Float

    @property
    def total_pressure_hpa(self) -> Float:
        """Barometric pressure, dry air plus vapour."""
        return np.asarray(self.pressure_hpa + vapour_pressure(self.temperature_k, self.vapour_g_m3))


def vapour_pressure(temperature_k: ArrayLike, vapour_g_m3: ArrayLike) -> Float:
    """Partial pressure of water vapour, e = ρ·T/216.7.

    Parameters
    ----------
    temperature_k
        Temperature, above 0 K; broadcasts.
    vapour_g_m3
        Water-vapour density, 0 g/m³ or more; broadcasts.

    Returns
    -------
    ndarray
        e in hPa.

    Raises
    ------
    InputError
        If an argument is out of range.

    Examples
    --------
    >>> round(float(vapour_pressure(288.15, 7.5)), 3)
    9.973

    Notes
    -----
    Source: Rec. ITU-R P.676-13 Annex 1 eq. (4).
    """
    density = not_negative("vapour_g_m3", vapour_g_m3, "g/m³")
    return np.asarray(density * positive("temperature_k", temperature_k, "K") / 216.7)


def dry_pressure(total_pressure_hpa: ArrayLike, temperature_k: ArrayLike, vapour_g_m3: ArrayLike) -> Float:
    """Pressure of the dry air in hPa: the barometer's total less the vapour pressure, p = p_total − e.

    Parameters
    ----------
    total_pressure_hpa
        Barometric pressure, above 0 hPa and above the vapour pressure; broadcasts.
    temperature_k, vapour_g_m3
        As for `vapour_pressure`.

    Returns
    -------
    ndarray
        p in hPa, what `gas_attenuation` asks for.

    Raises
    ------
    InputError
        If the vapour alone would have the total pressure or more, or an argument is out of range.

    Examples
    --------
    >>> round(float(dry_pressure(1013.25, 288.15, 7.5)), 2)
    1003.28

    Notes
    -----
    Source: Rec. ITU-R P.676-13 Annex 1 §1 (total barometric pressure p + e).
    """
    total = positive("total_pressure_hpa", total_pressure_hpa, "hPa")
    dry = np.asarray(total - vapour_pressure(temperature_k, vapour_g_m3))
    if not (dry > 0).all():
        value = np.broadcast_to(total, dry.shape)[dry <= 0].flat[0]
        raise InputError(f"total_pressure_hpa = {value:g}: must be more than the pressure of its vapour_g_m3 alone")
    return dry


def _reference(height_m: ArrayLike) -> tuple[Float, Float, Float]:
    """Total pressure, temperature and vapour of the mean annual global profile, P.835-6 Annex 1 §1, lowest layer."""
    low, high = HEIGHT_RANGE_M
    height_km = within("height_m", height_m, low, high, f"{low:g} to {high:g} m above sea level") / 1e3
    geopotential_km = 6356.766 * height_km / (6356.766 + height_km)
    temperature = 288.15 - 6.5 * geopotential_km
    pressure = 1013.25 * (288.15 / temperature) ** (-34.1632 / 6.5)
    return pressure, temperature, 7.5 * np.exp(-height_km / 2.0)


def local_atmosphere(
    height_m: ArrayLike,
    *,
    total_pressure_hpa: ArrayLike | None = None,
    temperature_k: ArrayLike | None = None,
    vapour_g_m3: ArrayLike | None = None,
    given_at_m: ArrayLike | None = None,
) -> Atmosphere:
    """Air with what was measured, and the reference atmosphere at the height for what was not.

    Parameters
    ----------
    height_m
        Height above mean sea level, -500 to 8500 m unless all the rest is given; all arguments broadcast.
    total_pressure_hpa
        Barometric pressure (dry air plus vapour, not reduced to sea level), above 0 hPa, or None.
    temperature_k
        Temperature, above 0 K, or None.
    vapour_g_m3
        Water-vapour density, 0 g/m³ or more, or None.
    given_at_m
        Height at which the given numbers hold, -500 to 8500 m, if not ``height_m``: from there temperature changes by
        the difference, pressure and vapour by the ratio that the reference atmosphere has between the two heights.

    Returns
    -------
    Atmosphere
        Its ``pressure_hpa`` is of the dry air: the vapour pressure is taken off the total here.

    Raises
    ------
    InputError
        As `reference_atmosphere` and `dry_pressure`.

    Examples
    --------
    >>> air = local_atmosphere(0.0, vapour_g_m3=20.0)
    >>> round(float(air.pressure_hpa), 2), round(float(air.total_pressure_hpa), 2), float(air.temperature_k)
    (986.66, 1013.25, 288.15)
    >>> float(local_atmosphere(1000.0, temperature_k=300.0, given_at_m=0.0).temperature_k.round(2))
    293.5

    Notes
    -----
    Source: Rec. ITU-R P.835-6 Annex 1 for what is not given. Its pressure is taken as the total, which is what the
    United States Standard Atmosphere 1976 behind it tabulates.
    """
    total, temperature, vapour = total_pressure_hpa, temperature_k, vapour_g_m3
    if given_at_m is not None:
        (here_total, here_temperature, here_vapour), there = _reference(height_m), _reference(given_at_m)
        total = None if total is None else np.asarray(total) * here_total / there[0]
        temperature = None if temperature is None else np.asarray(temperature) + here_temperature - there[1]
        vapour = None if vapour is None else np.asarray(vapour) * here_vapour / there[2]
    if total is None or temperature is None or vapour is None:
        mean_total, mean_temperature, mean_vapour = _reference(height_m)
        total = mean_total if total is None else total
        temperature = mean_temperature if temperature is None else temperature
        vapour = mean_vapour if vapour is None else vapour
    air = np.broadcast_arrays(dry_pressure(total, temperature, vapour), temperature, vapour)
    return Atmosphere(*map(frozen_array, air))


def reference_atmosphere(height_m: ArrayLike) -> Atmosphere:
    """Give the mean annual global reference atmosphere at a height.

    T = 288.15 − 6.5·h′, P = 1013.25·(288.15/T)^(−34.1632/6.5), ρ = 7.5·e^(−h/2), h in km and
    h′ = 6356.766·h/(6356.766 + h).

    Parameters
    ----------
    height_m
        Height above mean sea level, -500 to 8500 m, any shape. The profile is published from 0 m up; below, the same
        formula carries on and `gas_warnings` says so.

    Returns
    -------
    Atmosphere
        Dry-air pressure, temperature and vapour density. The published pressure is taken as the total (barometric)
        one and the vapour pressure taken off it.

    Raises
    ------
    InputError
        If the height is not allowed.

    Examples
    --------
    >>> air = reference_atmosphere(1000.0)
    >>> round(float(air.total_pressure_hpa), 2), round(float(air.temperature_k), 3), round(float(air.vapour_g_m3), 3)
    (898.76, 281.651, 4.549)

    Notes
    -----
    Source: Rec. ITU-R P.835-6 Annex 1 §1.
    """
    return local_atmosphere(height_m)
