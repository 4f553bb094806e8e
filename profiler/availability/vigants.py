"""Multipath fading by Barnett (1972) and Vigants (1975), Bell System Technical Journal."""

from __future__ import annotations

from typing import get_args

import numpy as np
from numpy.typing import ArrayLike

from profiler.checks import not_negative, positive
from profiler.errors import InputError
from profiler.models import VigantsClimate
from profiler.units import FOOT_M, MINUTES_PER_YEAR, STATUTE_MILE_M, Float

__all__ = [
    "ROUGHNESS_RANGE_M",
    "SEASON_TEMPERATURE_RANGE_K",
    "climate_factor",
    "improvement_vigants",
    "occurrence_vigants",
    "path_roughness",
    "season_share",
]

ROUGHNESS_RANGE_M = (20 * FOOT_M, 140 * FOOT_M)
"""Vigants's range of roughness, 20 to 140 ft; values outside count as the nearer end (from memory)."""

SEASON_TEMPERATURE_RANGE_K = ((35 + 459.67) / 1.8, (75 + 459.67) / 1.8)
"""Vigants's range of mean annual temperature, 35 to 75 °F (from memory)."""

_SEASON_S = 8.0e6
_CLIMATES = {"humid": 2.0, "average": 1.0, "dry": 0.5}
_FEWEST_SAMPLES = 3


def climate_factor(climate: VigantsClimate, path_roughness_m: ArrayLike) -> Float:
    """Climate-and-terrain factor c = climate·(w/50 ft)^−1.3; the climate counts 2 humid, 1 average, 0.5 dry.

    Parameters
    ----------
    climate
        ``"humid"`` (coasts and over water), ``"average"`` or ``"dry"``.
    path_roughness_m
        w of `path_roughness`, 0 m or more; below 20 ft (6.1 m) it counts as 20 ft, above 140 ft (42.7 m) as 140 ft.

    Returns
    -------
    ndarray
        c.

    Raises
    ------
    InputError
        If the climate is not one of the three.

    Examples
    --------
    >>> float(climate_factor("average", 15.24))
    1.0
    >>> climate_factor("humid", [0.0, 100.0]).round(2).tolist()
    [6.58, 0.52]

    Notes
    -----
    Source: Vigants, "Space-Diversity Engineering", BSTJ 54(1), 1975; from memory.
    """
    if climate not in get_args(VigantsClimate):
        raise InputError(f"climate = {climate}: must be {', '.join(get_args(VigantsClimate))}")
    roughness = np.clip(not_negative("path_roughness_m", path_roughness_m, "m"), *ROUGHNESS_RANGE_M)
    return np.asarray(_CLIMATES[climate] * (roughness / (50 * FOOT_M)) ** -1.3)


def path_roughness(distance_m: ArrayLike, ground_m: ArrayLike) -> float:
    """Roughness w of a path's own ground: standard deviation of its heights at one-mile steps, ends left out.

    Parameters
    ----------
    distance_m
        Distances from A, (n,), ascending from 0.
    ground_m
        Bare ground, (n,), no gaps.

    Returns
    -------
    float
        Metres.

    Raises
    ------
    InputError
        If the path has fewer than three one-mile points between its ends (4828 m or less), or ground is missing.

    Examples
    --------
    >>> path_roughness([0.0, 10e3, 20e3], [50.0, 50.0, 50.0])
    0.0
    >>> round(path_roughness([0.0, 20e3], [0.0, 200.0]), 1)
    55.6

    Notes
    -----
    Source: Vigants, BSTJ 54(1), 1975; from memory.
    """
    distance, ground = np.asarray(distance_m, dtype=float), np.asarray(ground_m, dtype=float)
    if not np.isfinite(ground).all():
        raise InputError("ground_m = NaN: must be a height at every point for the roughness of the path")
    steps = np.arange(STATUTE_MILE_M, distance[-1], STATUTE_MILE_M)
    if steps.size < _FEWEST_SAMPLES:
        raise InputError(
            f"distance_m = {distance[-1]:g}: must be more than {_FEWEST_SAMPLES * STATUTE_MILE_M:.0f} m for the "
            "roughness of the path; give climate_factor instead"
        )
    return float(np.std(np.interp(steps, distance, ground)))


def occurrence_vigants(distance_m: ArrayLike, frequency_hz: ArrayLike, climate_factor: ArrayLike) -> Float:
    """Multipath occurrence in percent of the worst month, p0 = 100·r, r = 6.0e-7·c·f·d³ (GHz, km).

    Parameters
    ----------
    distance_m
        Path length, above 0 m. All arguments broadcast.
    frequency_hz
        Above 0 Hz.
    climate_factor
        c, above 0: about 1/4 in dry mountains, 1 on average, 4 or more over water and flat humid coasts.

    Returns
    -------
    ndarray
        Percent; the deep-fade law p = p0·10^(−A/10) carried to 0 dB.

    Examples
    --------
    >>> round(float(occurrence_vigants(48.28e3, 6e9, 1.0)), 1)
    40.5

    Notes
    -----
    Source: Barnett, "Multipath Propagation at 4, 6 and 11 GHz", BSTJ 51(2), 1972, r = c·(f/4)·D³·1e-5 (D in miles); in
    km as CCIR Report 338 prints it. The data are fades of more than about 15 dB.
    """
    d = positive("distance_m", distance_m, "m") / 1e3
    f = positive("frequency_hz", frequency_hz, "Hz") / 1e9
    return np.asarray(100.0 * 6.0e-7 * positive("climate_factor", climate_factor, "") * f * d**3)


def season_share(annual_temperature_k: ArrayLike | None = None) -> Float:
    """Length of the fading season as a share of the year: T0 = (t/50 °F)·8e6 s; the year's outage is p_month·T0/year.

    Parameters
    ----------
    annual_temperature_k
        Mean annual temperature; counted as the nearer end outside 35 to 75 °F (274.8 to 297.0 K). None: 50 °F (283 K),
        a season of 8e6 s, three months.

    Returns
    -------
    ndarray
        Share between 0 and 1.

    Examples
    --------
    >>> round(float(season_share()), 3), round(float(season_share(293.15)), 3)
    (0.254, 0.345)

    Notes
    -----
    Source: Vigants, BSTJ 54(1), 1975; from memory.
    """
    if annual_temperature_k is None:
        return np.asarray(_SEASON_S / (60.0 * MINUTES_PER_YEAR))
    kelvin = np.clip(positive("annual_temperature_k", annual_temperature_k, "K"), *SEASON_TEMPERATURE_RANGE_K)
    return np.asarray((kelvin * 1.8 - 459.67) / 50.0 * _SEASON_S / (60.0 * MINUTES_PER_YEAR))


def improvement_vigants(
    distance_m: ArrayLike,
    frequency_hz: ArrayLike,
    spacing_m: ArrayLike,
    fade_db: ArrayLike,
    *,
    gain_difference_db: ArrayLike = 0.0,
) -> Float:
    """Space-diversity improvement, I = 1.2e-3·(f/d)·s²·v²·10^(A/10) (GHz, km, m), v² = 10^(−|ΔG|/10).

    Parameters
    ----------
    distance_m, frequency_hz
        Above 0. All arguments broadcast.
    spacing_m
        Vertical spacing of the receiving antennas, above 0 m; published for about 5 to 15 m.
    fade_db
        A, 0 dB or more; the law is for deep fades.
    gain_difference_db
        Gain of one antenna over the other; the sign does not matter.

    Returns
    -------
    ndarray
        How many times less outage; below 1 means outside the law's range, not a loss.

    Examples
    --------
    >>> round(float(improvement_vigants(48.28e3, 6e9, 10.0, 40.0)), 0)
    149.0

    Notes
    -----
    Source: Vigants, BSTJ 54(1), 1975, I = 7.0e-5·(f/D)·s²·v²·10^(A/10) in feet and miles; in metric as CCIR Report 338.
    """
    d = positive("distance_m", distance_m, "m") / 1e3
    f = positive("frequency_hz", frequency_hz, "Hz") / 1e9
    spacing = positive("spacing_m", spacing_m, "m")
    net_db = not_negative("fade_db", fade_db, "dB") - np.abs(np.asarray(gain_difference_db, dtype=float))
    return np.asarray(1.2e-3 * f / d * spacing**2 * 10.0 ** (net_db / 10.0))
