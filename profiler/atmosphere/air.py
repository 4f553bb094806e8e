"""The state of the air: pressures, and the reference atmosphere where nobody measured (Rec. ITU-R P.835-6)."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike

from profiler.checks import not_negative, positive, within
from profiler.errors import InputError
from profiler.models import frozen_array
from profiler.units import Float

__all__ = [
    "HEIGHT_RANGE_M",
    "Atmosphere",
    "Season",
    "dry_pressure",
    "local_atmosphere",
    "reference_atmosphere",
    "vapour_pressure",
]

Season = Literal["summer", "winter"]

HEIGHT_RANGE_M = (-500.0, 8500.0)
"""Where the profiles here answer: the lowest layer of all six, with room for land below sea level."""


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


# Seasonal profiles of P.835-6 Annex 1 §§2 to 4, lowest layer, powers of the height in km: total pressure (hPa),
# temperature (K), then the vapour density at the ground (g/m³) and the powers 1 to 4 of its exponent. Rows: low
# latitudes, mid-latitude summer and winter, high-latitude summer and winter.
_PRESSURE = np.array(
    [
        [1012.0306, -109.0338, 3.6316],
        [1012.8186, -111.5569, 3.8646],
        [1018.8627, -124.2954, 4.8307],
        [1008.0278, -113.2494, 3.9408],
        [1010.8828, -122.2411, 4.554],
    ]
)
_TEMPERATURE = np.array(
    [
        [300.4222, -6.3533, 0.005886, 0.0],
        [294.9838, -5.2159, -0.07109, 0.0],
        [272.7241, -3.6217, -0.1759, 0.0],
        [286.8374, -4.7805, -0.1402, 0.0],
        [257.4345, 2.3474, -1.5479, 0.08473],
    ]
)
_GROUND_VAPOUR = np.array([19.6542, 14.3542, 3.4742, 8.988, 1.2319])
_VAPOUR_EXPONENT = np.array(
    [
        [0.0, -0.2313, -0.1122, 0.01351, -0.0005923],
        [0.0, -0.4174, -0.02290, 0.001007, 0.0],
        [0.0, -0.2697, -0.03604, 0.0004489, 0.0],
        [0.0, -0.3614, -0.005402, -0.001955, 0.0],
        [0.0, 0.07481, -0.0981, 0.00281, 0.0],
    ]
)


def _mean_annual(height_km: Float) -> tuple[Float, Float, Float]:
    """Total pressure, temperature and vapour of the mean annual global profile, P.835-6 Annex 1 §1, lowest layer."""
    geopotential_km = 6356.766 * height_km / (6356.766 + height_km)
    temperature = 288.15 - 6.5 * geopotential_km
    pressure = 1013.25 * (288.15 / temperature) ** (-34.1632 / 6.5)
    return pressure, temperature, 7.5 * np.exp(-height_km / 2.0)


def _seasonal(height_km: Float, latitude: ArrayLike, season: Season | None) -> tuple[Float, Float, Float]:
    """Total pressure, temperature and vapour of the profile for the latitude and season, P.835-6 Annex 1 §§2 to 4."""
    from_equator = np.abs(within("latitude", latitude, -90, 90, "-90 to 90 degrees"))
    if season not in ("summer", "winter", None):
        raise InputError(f"season = {season}: must be summer or winter")
    if season is None and (from_equator >= 22).any():
        raise InputError(
            "season = None: must be summer or winter from latitude 22 on; leave out both for the year's mean"
        )
    winter = int(season == "winter")
    row = np.where(from_equator < 22, 0, np.where(from_equator < 45, 1 + winter, 3 + winter))

    def powers(table: Float) -> Float:
        return np.asarray(sum(table[row, n] * height_km**n for n in range(table.shape[1])))

    return powers(_PRESSURE), powers(_TEMPERATURE), _GROUND_VAPOUR[row] * np.exp(powers(_VAPOUR_EXPONENT))


def _reference(height_m: ArrayLike, latitude: ArrayLike | None, season: Season | None) -> tuple[Float, Float, Float]:
    """Total pressure, temperature and vapour of the profile that latitude and season ask for."""
    low, high = HEIGHT_RANGE_M
    height_km = (
        within("height_m", height_m, low, high, f"{low:g} to {high:g} m; else give the air in the hop file") / 1e3
    )
    if latitude is not None:
        return _seasonal(height_km, latitude, season)
    if season is not None:
        raise InputError(f"season = {season}: must come with a latitude; leave out both for the year's mean")
    return _mean_annual(height_km)


def local_atmosphere(
    height_m: ArrayLike,
    *,
    total_pressure_hpa: ArrayLike | None = None,
    temperature_k: ArrayLike | None = None,
    vapour_g_m3: ArrayLike | None = None,
    latitude: ArrayLike | None = None,
    season: Season | None = None,
) -> Atmosphere:
    """Air with what was measured, and the reference atmosphere at the height for what was not.

    Parameters
    ----------
    height_m
        Height above mean sea level, -500 to 8500 m unless all the rest is given; all arguments broadcast.
    total_pressure_hpa
        Barometric pressure at that height (dry air plus vapour, not reduced to sea level), above 0 hPa, or None.
    temperature_k
        Temperature, above 0 K, or None.
    vapour_g_m3
        Water-vapour density, 0 g/m³ or more, or None.
    latitude, season
        As for `reference_atmosphere`.

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

    Notes
    -----
    Source: Rec. ITU-R P.835-6 Annex 1 for what is not given. Its pressure is taken as the total, which is what the
    United States Standard Atmosphere 1976 behind it tabulates.
    """
    total, temperature, vapour = total_pressure_hpa, temperature_k, vapour_g_m3
    if total is None or temperature is None or vapour is None:
        mean_total, mean_temperature, mean_vapour = _reference(height_m, latitude, season)
        total = mean_total if total is None else total
        temperature = mean_temperature if temperature is None else temperature
        vapour = mean_vapour if vapour is None else vapour
    air = np.broadcast_arrays(dry_pressure(total, temperature, vapour), temperature, vapour)
    return Atmosphere(*map(frozen_array, air))


def reference_atmosphere(
    height_m: ArrayLike, latitude: ArrayLike | None = None, season: Season | None = None
) -> Atmosphere:
    """Give the reference atmosphere at a height: the year's global mean, or the profile of a latitude and season.

    Mean: T = 288.15 − 6.5·h′, P = 1013.25·(288.15/T)^(−34.1632/6.5), ρ = 7.5·e^(−h/2), h in km and
    h′ = 6356.766·h/(6356.766 + h). By latitude and season: polynomials in h (below 22°, 22° to 45°, from 45° on).

    Parameters
    ----------
    height_m
        Height above mean sea level, -500 to 8500 m. The profiles are published from 0 m up; below, the same formula
        carries on and `atmosphere_warnings` says so. Broadcasts with the latitude.
    latitude
        Degrees, or None for the mean annual global atmosphere.
    season
        ``"summer"`` or ``"winter"`` of the hemisphere; needed from latitude 22 on, without effect below.

    Returns
    -------
    Atmosphere
        Dry-air pressure, temperature and vapour density. The published pressure is taken as the total (barometric)
        one and the vapour pressure taken off it.

    Raises
    ------
    InputError
        If the height, latitude or season is not allowed, or one of latitude and season is missing.

    Examples
    --------
    >>> air = reference_atmosphere(1000.0)
    >>> round(float(air.total_pressure_hpa), 2), round(float(air.temperature_k), 3), round(float(air.vapour_g_m3), 3)
    (898.76, 281.651, 4.549)
    >>> reference_atmosphere([0.0, 2000.0], latitude=40.0, season="winter").temperature_k.round(1).tolist()
    [272.7, 264.8]

    Notes
    -----
    Source: Rec. ITU-R P.835-6 Annex 1 §1 (mean annual) and §§2 to 4 (seasonal).
    """
    return local_atmosphere(height_m, latitude=latitude, season=season)
