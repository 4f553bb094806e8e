"""Constants with their provenance, and unit conversions: SI inside, dB and degrees where the field uses them."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = [
    "AGREEMENT_DB",
    "BOLTZMANN_J_K",
    "FOOT_M",
    "K_MEDIAN",
    "MEAN_EARTH_RADIUS_M",
    "MINUTES_PER_YEAR",
    "SPEED_OF_LIGHT_M_S",
    "STATUTE_MILE_M",
    "US_SURVEY_FOOT_M",
    "ZERO_CELSIUS_K",
    "Float",
    "db_from_ratio",
    "dbm_from_watts",
    "gradient_from_k",
    "k_from_gradient",
    "ratio_from_db",
    "wavelength",
]

Float = NDArray[np.float64]

SPEED_OF_LIGHT_M_S = 299_792_458.0
"""Exact: SI definition of the metre (BIPM, SI Brochure, 9th edition, 2019)."""

BOLTZMANN_J_K = 1.380_649e-23
"""Exact: SI definition of the kelvin (BIPM, SI Brochure, 9th edition, 2019)."""

MEAN_EARTH_RADIUS_M = 6_371_000.0
"""Mean earth radius used by the ITU-R P series (e.g. Rec. ITU-R P.452, P.526-15)."""

FOOT_M = 0.3048
"""Exact: international foot (1959 agreement)."""

US_SURVEY_FOOT_M = 1200.0 / 3937.0
"""Exact: US survey foot (Mendenhall order, 1893; retired by NIST at the end of 2022, still met in old rasters)."""

STATUTE_MILE_M = 5280 * FOOT_M
"""Exact: statute mile of international feet."""

ZERO_CELSIUS_K = 273.15
"""Exact: 0 °C in kelvin (BIPM, SI Brochure, 9th edition, 2019)."""

MINUTES_PER_YEAR = 365.25 * 1440.0
"""Minutes of a year of 365.25 days (the Julian year of the IAU)."""

AGREEMENT_DB = 0.05
"""Two statements of one quantity agree within half the last digit of a data sheet's tenth of a decibel."""

K_MEDIAN = 4.0 / 3.0
"""Effective-earth-radius factor of the median temperate atmosphere (Rec. ITU-R P.310; P.530-18 §2.2 where unknown)."""

_K_NUMERATOR_N_KM = 157.0
"""1e6 / 6371 km rounded as the ITU-R publishes it: k = 157/(157 + dN/dh) (Rec. ITU-R P.452, from memory)."""


def k_from_gradient(gradient_n_km: ArrayLike) -> Float:
    """Effective-earth-radius factor from the refractivity gradient, k = 157/(157 + dN/dh).

    Parameters
    ----------
    gradient_n_km
        Refractivity gradient dN/dh near the ground, N-units per km, any shape; above -157 for a finite positive k.

    Returns
    -------
    ndarray
        k, the shape of the input. At -157 N/km it is infinite (the ray follows the earth), below that negative.

    Examples
    --------
    >>> round(float(k_from_gradient(-39.0)), 3)
    1.331
    >>> float(k_from_gradient(0.0))
    1.0

    Notes
    -----
    Source: Rec. ITU-R P.452, definition of the median effective radius factor (from memory of the text).
    """
    gradient = np.asarray(gradient_n_km, dtype=float)
    with np.errstate(divide="ignore"):
        return np.asarray(_K_NUMERATOR_N_KM / (_K_NUMERATOR_N_KM + gradient))


def gradient_from_k(k: ArrayLike) -> Float:
    """Refractivity gradient in N/km that gives the factor k; the inverse of `k_from_gradient`.

    Examples
    --------
    >>> round(float(gradient_from_k(4 / 3)), 2)
    -39.25
    """
    return np.asarray(_K_NUMERATOR_N_KM / np.asarray(k, dtype=float) - _K_NUMERATOR_N_KM)


def db_from_ratio(ratio: ArrayLike) -> Float:
    """Power ratio to decibels, 10·log10(ratio); the ratio is above 0.

    Examples
    --------
    >>> round(float(db_from_ratio(2.0)), 2)
    3.01
    """
    return np.asarray(10.0 * np.log10(np.asarray(ratio, dtype=float)))


def ratio_from_db(level_db: ArrayLike) -> Float:
    """Decibels to power ratio, 10^(dB/10).

    Examples
    --------
    >>> float(ratio_from_db(10.0))
    10.0
    """
    return np.asarray(10.0 ** (np.asarray(level_db, dtype=float) / 10.0))


def dbm_from_watts(power_w: ArrayLike) -> Float:
    """Watts (above 0) to dBm.

    Examples
    --------
    >>> float(dbm_from_watts(1.0))
    30.0
    """
    return np.asarray(db_from_ratio(power_w) + 30.0)


def wavelength(frequency_hz: ArrayLike) -> Float:
    """Free-space wavelength in metres, c/f, for a frequency above 0 Hz.

    Examples
    --------
    >>> round(float(wavelength(6e9)), 6)
    0.049965
    """
    return np.asarray(SPEED_OF_LIGHT_M_S / np.asarray(frequency_hz, dtype=float))
