"""Multipath fading on a narrow band: Rec. ITU-R P.530-17 and P.530-18 §2.3, worst month and year, all fade depths."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from profiler.checks import not_negative, positive, within
from profiler.units import Float

__all__ = [
    "OCCURRENCE_LIMIT_PERCENT",
    "fade_percent",
    "geoclimatic_factor_17",
    "geoclimatic_factor_17_quick",
    "occurrence_17",
    "occurrence_17_quick",
    "occurrence_18",
    "transition_fade",
    "year_conversion",
]

OCCURRENCE_LIMIT_PERCENT = 2000.0
"""p0 up to which P.530-17 §2.3.2 states that its shallow fading is monotonic (a test confirms it)."""


def geoclimatic_factor_17(dn1_n_km: ArrayLike, terrain_roughness_m: ArrayLike) -> Float:
    """Geoclimatic factor for detailed design, K = 10^(−4.4 − 0.0027·dN1)·(10 + sa)^(−0.46).

    Parameters
    ----------
    dn1_n_km
        Point refractivity gradient in the lowest 65 m not exceeded for 1 % of an average year, N/km; published for
        -860 to -150.
    terrain_roughness_m
        sa, standard deviation of terrain heights in the 110 km box (`terrain_roughness`), 0 m or more; published for 6
        to 850 m, and below 1 m it counts as 1 m.

    Returns
    -------
    ndarray
        K, the broadcast shape.

    Examples
    --------
    >>> f"{float(geoclimatic_factor_17(-300.0, 90.0)):.3g}"
    '3.09e-05'
    >>> bool(geoclimatic_factor_17(-300.0, 0.0) == geoclimatic_factor_17(-300.0, 1.0))
    True

    Notes
    -----
    Source: Rec. ITU-R P.530-17 §2.3.1.
    """
    roughness = np.maximum(not_negative("terrain_roughness_m", terrain_roughness_m, "m"), 1.0)
    gradient = within("dn1_n_km", dn1_n_km, -5000, 5000, "-5000 to 5000 N/km")
    return np.asarray(10.0 ** (-4.4 - 0.0027 * gradient) * (10.0 + roughness) ** -0.46)


def geoclimatic_factor_17_quick(dn1_n_km: ArrayLike) -> Float:
    """Geoclimatic factor for quick planning, without terrain: K = 10^(−4.6 − 0.0027·dN1).

    Examples
    --------
    >>> f"{float(geoclimatic_factor_17_quick(-300.0)):.3g}"
    '0.000162'

    Notes
    -----
    Source: Rec. ITU-R P.530-17 §2.3.1, for quick planning.
    """
    return np.asarray(10.0 ** (-4.6 - 0.0027 * within("dn1_n_km", dn1_n_km, -5000, 5000, "-5000 to 5000 N/km")))


def _inclined(
    distance_m: ArrayLike, frequency_hz: ArrayLike, centre_a_m: ArrayLike, centre_b_m: ArrayLike
) -> tuple[Float, Float, Float, Float]:
    """Distance in km, frequency in GHz, inclination in mrad and lower antenna in m, as the formulas take them."""
    d = positive("distance_m", distance_m, "m") / 1e3
    f = positive("frequency_hz", frequency_hz, "Hz") / 1e9
    a, b = np.asarray(centre_a_m, dtype=float), np.asarray(centre_b_m, dtype=float)
    return d, f, np.abs(b - a) / d, np.minimum(a, b)


def occurrence_17(
    distance_m: ArrayLike,
    frequency_hz: ArrayLike,
    centre_a_m: ArrayLike,
    centre_b_m: ArrayLike,
    *,
    geoclimatic_factor: ArrayLike,
) -> Float:
    """Multipath occurrence factor for detailed design, p0 = K·d^3.4·(1 + |εp|)^−1.03·f^0.8·10^(−0.00076·hL).

    Parameters
    ----------
    distance_m
        Path length, above 0 m; published for 7.5 to 185 km. All arguments broadcast.
    frequency_hz
        Above 0 Hz; published for 0.45 to 37 GHz, expected to hold to at least 45 GHz and down to 15/d (GHz, km).
    centre_a_m, centre_b_m
        Antenna centres above mean sea level; the order does not matter.
    geoclimatic_factor
        K of `geoclimatic_factor_17`, above 0.

    Returns
    -------
    ndarray
        p0, percent of the average worst month; it is the deep-fade law carried to 0 dB, so it can exceed 100.

    Examples
    --------
    >>> round(float(occurrence_17(40e3, 7e9, 300.0, 400.0, geoclimatic_factor=3.09e-5)), 2)
    6.68

    Notes
    -----
    Source: Rec. ITU-R P.530-17 §2.3.1.
    """
    d, f, inclination, lower = _inclined(distance_m, frequency_hz, centre_a_m, centre_b_m)
    factor = positive("geoclimatic_factor", geoclimatic_factor, "")
    return np.asarray(factor * d**3.4 * (1.0 + inclination) ** -1.03 * f**0.8 * 10.0 ** (-0.00076 * lower))


def occurrence_17_quick(
    distance_m: ArrayLike,
    frequency_hz: ArrayLike,
    centre_a_m: ArrayLike,
    centre_b_m: ArrayLike,
    *,
    geoclimatic_factor: ArrayLike,
) -> Float:
    """Multipath occurrence factor for quick planning, p0 = K·d^3.1·(1 + |εp|)^−1.29·f^0.8·10^(−0.00089·hL).

    Parameters and result as `occurrence_17`, with K of `geoclimatic_factor_17_quick`.

    Examples
    --------
    >>> round(float(occurrence_17_quick(40e3, 7e9, 300.0, 400.0, geoclimatic_factor=1.62e-4)), 2)
    7.64

    Notes
    -----
    Source: Rec. ITU-R P.530-17 §2.3.1, for quick planning.
    """
    d, f, inclination, lower = _inclined(distance_m, frequency_hz, centre_a_m, centre_b_m)
    factor = positive("geoclimatic_factor", geoclimatic_factor, "")
    return np.asarray(factor * d**3.1 * (1.0 + inclination) ** -1.29 * f**0.8 * 10.0 ** (-0.00089 * lower))


def occurrence_18(
    distance_m: ArrayLike,
    frequency_hz: ArrayLike,
    centre_a_m: ArrayLike,
    centre_b_m: ArrayLike,
    *,
    geoclimatic_factor: ArrayLike,
    dn75_n_km: ArrayLike,
    mean_ground_m: ArrayLike,
) -> Float:
    """Multipath occurrence factor of P.530-18, from its own maps of K and dN75.

    p0 = K·d^3.51·(f² + 13)^0.447·10^(−0.376·tanh((hc − 147)/125) − 0.334·|εp|^0.39 − 0.00027·hL + 17.85·vsr), with
    hc = (hA + hB)/2 − d²/102 − ht and vsr the lesser of (dN75/50)^1.8·e^(−hc/(2.5·√d)) and dN75·d^1.5·√f/24730.

    Parameters
    ----------
    distance_m, frequency_hz, centre_a_m, centre_b_m
        As for `occurrence_17`.
    geoclimatic_factor
        K of P.530-18's own map (not that of P.530-17), above 0.
    dn75_n_km
        dN75 of its map, 0 or more.
    mean_ground_m
        ht, mean ground along the path above mean sea level, without trees.

    Returns
    -------
    ndarray
        p0, percent of the average worst month.

    Examples
    --------
    >>> p0 = occurrence_18(40e3, 7e9, 300, 400, geoclimatic_factor=2e-6, dn75_n_km=20, mean_ground_m=200)
    >>> round(float(p0), 2)
    1.61

    Notes
    -----
    Source: Rec. ITU-R P.530-18 §2.3.1, read from one implementation that calls itself untested, not from the text:
    no published value has been held against it. `outage_model` repeats this as a warning.
    """
    d, f, inclination, lower = _inclined(distance_m, frequency_hz, centre_a_m, centre_b_m)
    factor = positive("geoclimatic_factor", geoclimatic_factor, "")
    gradient = not_negative("dn75_n_km", dn75_n_km, "N-units")
    middle = (np.asarray(centre_a_m, dtype=float) + np.asarray(centre_b_m, dtype=float)) / 2.0
    clearance = middle - d**2 / 102.0 - np.asarray(mean_ground_m, dtype=float)
    reflected = np.minimum(
        (gradient / 50.0) ** 1.8 * np.exp(-clearance / (2.5 * np.sqrt(d))), gradient * d**1.5 * np.sqrt(f) / 24730.0
    )
    exponent = (
        -0.376 * np.tanh((clearance - 147.0) / 125.0) - 0.334 * inclination**0.39 - 0.00027 * lower + 17.85 * reflected
    )
    return np.asarray(factor * d**3.51 * (f**2 + 13.0) ** 0.447 * 10.0**exponent)


def transition_fade(occurrence_percent: ArrayLike) -> Float:
    """Fade depth at which shallow fading becomes deep, At = 25 + 1.2·log10 p0, dB.

    Examples
    --------
    >>> float(transition_fade(10.0))
    26.2

    Notes
    -----
    Source: Rec. ITU-R P.530-17 §2.3.2.
    """
    return np.asarray(25.0 + 1.2 * np.log10(positive("occurrence_percent", occurrence_percent, "%")))


def _shallow_percent(p0: Float, transition_db: Float, fade_db: Float) -> Float:
    """Shallow fading, P.530-17 §2.3.2 Step 3b (from memory; it joins the deep law at At by construction)."""
    pt = p0 * 10.0 ** (-transition_db / 10.0)
    at_transition = -20.0 * np.log10(-np.log1p(-pt / 100.0)) / transition_db
    decay = (1.0 + 0.3 * 10.0 ** (-transition_db / 20.0)) * 10.0 ** (-0.016 * transition_db)
    qt = (at_transition - 2.0) / decay - 4.3 * (10.0 ** (-transition_db / 20.0) + transition_db / 800.0)
    bend = qt + 4.3 * (10.0 ** (-fade_db / 20.0) + fade_db / 800.0)
    qa = 2.0 + (1.0 + 0.3 * 10.0 ** (-fade_db / 20.0)) * 10.0 ** (-0.016 * fade_db) * bend
    return np.asarray(-100.0 * np.expm1(-(10.0 ** (-qa * fade_db / 20.0))))


def fade_percent(occurrence_percent: ArrayLike, fade_db: ArrayLike) -> Float:
    """Percent of time that a fade depth is exceeded, shallow fades as well as deep.

    From At = 25 + 1.2·log10 p0 on the deep law p = p0·10^(−A/10); below, p = 100·(1 − exp(−10^(−qa·A/20))) with qa
    bent so that both meet at At. At 0 dB that is 63.2 %, whatever p0.

    Parameters
    ----------
    occurrence_percent
        p0, above 0 %. From 2000 % on, where the shallow formula is no longer monotonic, the deep law is used at every
        depth up to 100 %; it is the more cautious of the two. All arguments broadcast.
    fade_db
        A, 0 dB or more.

    Returns
    -------
    ndarray
        Percent of the period that p0 is for.

    Examples
    --------
    >>> fade_percent(10.0, [0.0, 10.0, 30.0]).round(4).tolist()
    [63.2121, 0.705, 0.01]

    Notes
    -----
    Source: Rec. ITU-R P.530-17 §2.3.2, qa, q'a and qt from memory of the text; P.530-18 is taken to keep it.
    """
    p0, fade = np.broadcast_arrays(
        positive("occurrence_percent", occurrence_percent, "%"), not_negative("fade_db", fade_db, "dB")
    )
    at = transition_fade(p0)
    deep = p0 * 10.0 ** (-fade / 10.0)
    interpolated = (fade < at) & (p0 < OCCURRENCE_LIMIT_PERCENT)
    # placeholders keep the formula away from arguments it is not for; np.where drops their results
    shallow = _shallow_percent(np.where(interpolated, p0, 1.0), np.where(interpolated, at, 25.0), fade)
    return np.where(interpolated, shallow, np.minimum(deep, 100.0))


def year_conversion(distance_m: ArrayLike, inclination_mrad: ArrayLike, latitude: ArrayLike) -> Float:
    """Logarithmic conversion from the worst month to the year: p_year = 10^(−ΔG/10)·p_worst month.

    ΔG = 10.5 − 5.6·log10(1.1 ± |cos 2ξ|^0.7) − 2.7·log10 d + 1.7·log10(1 + |εp|), at most 10.8 dB; plus up to 45°
    latitude ξ, minus above.

    Parameters
    ----------
    distance_m
        Path length, above 0 m. All arguments broadcast.
    inclination_mrad
        |εp|, 0 mrad or more.
    latitude
        -90 to 90 degrees.

    Returns
    -------
    ndarray
        ΔG, dB.

    Examples
    --------
    >>> year_conversion([5e3, 50e3], 2.0, 50.0).round(2).tolist()
    [9.95, 7.25]

    Notes
    -----
    Source: Rec. ITU-R P.530-17 §2.3.4.
    """
    d = positive("distance_m", distance_m, "m") / 1e3
    slope = not_negative("inclination_mrad", inclination_mrad, "mrad")
    north = np.abs(within("latitude", latitude, -90, 90, "-90 to 90 degrees"))
    swing = np.abs(np.cos(np.radians(2.0 * north))) ** 0.7
    season = np.where(north <= 45.0, 1.1 + swing, 1.1 - swing)
    conversion = 10.5 - 5.6 * np.log10(season) - 2.7 * np.log10(d) + 1.7 * np.log10(1.0 + slope)
    return np.minimum(conversion, 10.8)
