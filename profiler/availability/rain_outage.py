"""Rain fading over the path: Rec. ITU-R P.530-18 §2.4.1."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from profiler.checks import not_negative, positive, within
from profiler.units import Float

__all__ = ["PERCENT_RANGE", "effective_distance", "rain_fade", "rain_percent"]

PERCENT_RANGE = (0.001, 1.0)
"""Percentages of the year for which §2.4.1 publishes its power law."""

_LARGEST_FACTOR = 2.5


def effective_distance(
    distance_m: ArrayLike, frequency_hz: ArrayLike, rain_rate_mm_h: ArrayLike, alpha: ArrayLike
) -> Float:
    """Length of path over which R0.01 may be taken to fall, d·r with r at most 2.5.

    r = 1/(0.477·d^0.633·R0.01^(0.073·α)·f^0.123 − 10.579·(1 − e^(−0.024·d))), d in km, f in GHz. Where the denominator
    is under 0.4 (short paths; also light rain at low frequencies over long ones, where it turns negative), r = 2.5.

    Parameters
    ----------
    distance_m
        Path length, above 0 m; published to 60 km. All arguments broadcast.
    frequency_hz
        Above 0 Hz; published to 100 GHz.
    rain_rate_mm_h
        R0.01, rain rate exceeded for 0.01 % of the average year with one-minute integration, 0 mm/h or more.
    alpha
        Exponent of P.838, from `profiler.atmosphere.rain_coefficients`.

    Returns
    -------
    ndarray
        Metres.

    Examples
    --------
    >>> round(float(effective_distance(20e3, 18e9, 42.0, 1.0)))
    10399

    Notes
    -----
    Source: Rec. ITU-R P.530-18 §2.4.1 Step 3.
    """
    d = positive("distance_m", distance_m, "m") / 1e3
    f = positive("frequency_hz", frequency_hz, "Hz") / 1e9
    rain = not_negative("rain_rate_mm_h", rain_rate_mm_h, "mm/h")
    exponent = 0.073 * positive("alpha", alpha, "")
    inverse = 0.477 * d**0.633 * rain**exponent * f**0.123 - 10.579 * (1.0 - np.exp(-0.024 * d))
    return np.asarray(d * 1e3 / np.maximum(inverse, 1.0 / _LARGEST_FACTOR))


def _power_law(frequency_hz: ArrayLike) -> tuple[Float, Float, Float]:
    """C1, C2 and C3 of §2.4.1 Step 5."""
    f = positive("frequency_hz", frequency_hz, "Hz") / 1e9
    c0 = 0.12 + 0.4 * np.log10(np.maximum(f / 10.0, 1.0) ** 0.8)
    return 0.07**c0 * 0.12 ** (1.0 - c0), 0.855 * c0 + 0.546 * (1.0 - c0), 0.139 * c0 + 0.043 * (1.0 - c0)


def rain_fade(fade_001_db: ArrayLike, frequency_hz: ArrayLike, percent: ArrayLike) -> Float:
    """Rain fade exceeded for another percentage of the year, Ap = A0.01·C1·p^(−(C2 + C3·log10 p)).

    C1 = 0.07^C0·0.12^(1 − C0), C2 = 0.855·C0 + 0.546·(1 − C0), C3 = 0.139·C0 + 0.043·(1 − C0), with
    C0 = 0.12 + 0.4·log10((f/10)^0.8) from 10 GHz on and 0.12 below.

    Parameters
    ----------
    fade_001_db
        A0.01, specific attenuation at R0.01 times the effective distance, 0 dB or more. All arguments broadcast.
    frequency_hz
        Above 0 Hz.
    percent
        p, 0.001 to 1 % of the year.

    Returns
    -------
    ndarray
        dB.

    Raises
    ------
    InputError
        If a percentage is outside 0.001 to 1.

    Examples
    --------
    >>> rain_fade(30.0, 18e9, [0.001, 0.01, 1.0]).round(2).tolist()
    [59.26, 29.94, 3.23]

    Notes
    -----
    Source: Rec. ITU-R P.530-18 §2.4.1 Step 5. C0 reads the power as inside the logarithm, so that C0 grows with log f;
    the itur package reads it as (log10(f/10))^0.8, which takes up to 4.5 % less fade at 1 % and 3.5 % at 0.001 % up to
    100 GHz, and differs by nothing at or below 10 GHz and by under 0.01 % at p = 0.01 %.
    """
    fade = not_negative("fade_001_db", fade_001_db, "dB")
    p = within("percent", percent, *PERCENT_RANGE, "0.001 to 1 % of the year")
    c1, c2, c3 = _power_law(frequency_hz)
    return np.asarray(fade * c1 * p ** -(c2 + c3 * np.log10(p)))


def rain_percent(fade_001_db: ArrayLike, frequency_hz: ArrayLike, fade_db: ArrayLike) -> Float:
    """Percent of the year that a rain fade is exceeded: the inverse of `rain_fade`.

    With q = log10(A/(A0.01·C1)) the power law is C3·L² + C2·L + q = 0 in L = log10 p. Outside the published 0.001 to
    1 % the curve is carried on along its tangent in log-log, which keeps it monotonic: fades rarer than 0.001 % go on
    falling, fades more frequent than 1 % rise to at most 100 %. `outage_model` and `predict` say when that happens.

    Parameters
    ----------
    fade_001_db
        A0.01, 0 dB or more; without rain (0) the answer is 0. All arguments broadcast.
    frequency_hz
        Above 0 Hz.
    fade_db
        A, 0 dB or more.

    Returns
    -------
    ndarray
        Percent of the average year.

    Examples
    --------
    >>> rain_percent(30.0, 18e9, rain_fade(30.0, 18e9, [0.001, 0.02, 1.0])).round(6).tolist()
    [0.001, 0.02, 1.0]
    >>> float(rain_percent(0.0, 18e9, 0.0))
    0.0

    Notes
    -----
    Source: Rec. ITU-R P.530-18 §2.4.1, inverted in closed form; the tangents are this project's own.
    """
    c1, c2, c3 = _power_law(frequency_hz)
    fade_001 = not_negative("fade_001_db", fade_001_db, "dB")
    fade = not_negative("fade_db", fade_db, "dB")
    tiny = np.finfo(float).tiny
    q = np.log10(np.maximum(fade, tiny)) - np.log10(np.maximum(fade_001, tiny) * c1)
    q_rare = 3.0 * c2 - 9.0 * c3
    inside = (np.sqrt(c2**2 - 4.0 * c3 * np.clip(q, 0.0, q_rare)) - c2) / (2.0 * c3)
    frequent = -np.minimum(q, 0.0) / c2
    rare = -np.maximum(q - q_rare, 0.0) / (c2 - 6.0 * c3)
    percent = 10.0 ** np.minimum(inside + frequent + rare, 2.0)
    return np.where(fade_001 > 0.0, percent, 0.0)
