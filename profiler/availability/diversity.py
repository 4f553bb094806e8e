"""Space diversity: Rec. ITU-R P.530-17 §6.2."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from profiler.checks import not_negative, positive
from profiler.units import Float

__all__ = ["add_diversity_outages", "amplitude_correlation", "improvement_p530", "protected_selective"]


def improvement_p530(
    distance_m: ArrayLike,
    frequency_hz: ArrayLike,
    spacing_m: ArrayLike,
    fade_db: ArrayLike,
    *,
    occurrence_percent: ArrayLike,
    gain_difference_db: ArrayLike = 0.0,
) -> Float:
    """Improvement by vertical space diversity, I = [1 − exp(−0.04·S^0.87·f^−0.12·d^0.48·p0^−1.04)]·10^((A − V)/10).

    Parameters
    ----------
    distance_m
        Path length, above 0 m; published for 43 to 240 km, and thought fair down to 25 km. All arguments broadcast.
    frequency_hz
        Above 0 Hz; published for 2 to 11 GHz.
    spacing_m
        S, vertical spacing of the receiving antennas, above 0 m; published for 3 to 23 m.
    fade_db
        A, 0 dB or more; the law is for deep fades.
    occurrence_percent
        p0 of the worst month, above 0 %.
    gain_difference_db
        Gain of one antenna over the other, V = |G1 − G2|.

    Returns
    -------
    ndarray
        How many times less outage; below 1 means outside the law's range, not a loss.

    Examples
    --------
    >>> round(float(improvement_p530(50e3, 6e9, 10.0, 35.0, occurrence_percent=10.0)), 0)
    420.0

    Notes
    -----
    Source: Rec. ITU-R P.530-17 §6.2 (from memory, with its ranges).
    """
    d = positive("distance_m", distance_m, "m") / 1e3
    f = positive("frequency_hz", frequency_hz, "Hz") / 1e9
    spacing = positive("spacing_m", spacing_m, "m")
    p0 = positive("occurrence_percent", occurrence_percent, "%")
    net_db = not_negative("fade_db", fade_db, "dB") - np.abs(np.asarray(gain_difference_db, dtype=float))
    decorrelation = -np.expm1(-0.04 * spacing**0.87 * f**-0.12 * d**0.48 * p0**-1.04)
    return np.asarray(decorrelation * 10.0 ** (net_db / 10.0))


def amplitude_correlation(nonselective_correlation_squared: ArrayLike) -> tuple[Float, Float]:
    """Correlation of the relative amplitudes and the share they leave selective fading: r_w and 1 − k_s².

    r_w = 1 − 0.9746·(1 − k_ns²)^2.170 up to k_ns² = 0.26, 1 − 0.6921·(1 − k_ns²)^1.034 above; 1 − k_s² = 0.1762 up to
    r_w = 0.5, 0.195·(1 − r_w)^(0.109 − 0.13·log10(1 − r_w)) up to 0.9628, 0.3957·(1 − r_w)^0.5136 above.

    Parameters
    ----------
    nonselective_correlation_squared
        k_ns², at most 1; it falls below 0 where the improvement is large, and the formulas carry on.

    Returns
    -------
    tuple of ndarray
        r_w and 1 − k_s².

    Examples
    --------
    >>> rw, uncorrelated = amplitude_correlation([0.9, 0.26, 0.0])
    >>> rw.round(3).tolist(), uncorrelated.round(4).tolist()
    ([0.936, 0.493, 0.025], [0.0943, 0.1762, 0.1762])

    Notes
    -----
    Source: Rec. ITU-R P.530-17 §6.2, outage with space diversity, Step 3 (from memory; the branches meet at their
    limits, which a test holds).
    """
    apart = 1.0 - np.asarray(nonselective_correlation_squared, dtype=float)
    rw = 1.0 - np.where(apart >= 0.74, 0.9746 * apart**2.170, 0.6921 * apart**1.034)
    rest = np.maximum(1.0 - rw, np.finfo(float).tiny)
    between = 0.195 * rest ** (0.109 - 0.13 * np.log10(rest))
    uncorrelated = np.select(
        [rw <= 0.5, rw <= 0.9628], [np.full_like(rw, 1.0 - 0.8238), between], 0.3957 * rest**0.5136
    )
    return np.asarray(rw), uncorrelated


def protected_selective(
    selective_percent: ArrayLike,
    *,
    activity: ArrayLike,
    occurrence_percent: ArrayLike,
    improvement_at_0_db: ArrayLike,
) -> Float:
    """Give the selective outage left with space diversity and maximum-power combining, Pds = Ps²/(η·(1 − k_s²)).

    k_ns² = 1 − I·Pns/η. In the deep-fade law the product I·Pns does not depend on the fade margin, so it is taken at
    0 dB: the improvement law there times P0.

    Parameters
    ----------
    selective_percent
        Ps without diversity, percent of the worst month. All arguments broadcast.
    activity
        η of `multipath_activity`.
    occurrence_percent
        p0 of the worst month, above 0 %.
    improvement_at_0_db
        The improvement law (`improvement_p530` or another) at A = 0 dB, above 0.

    Returns
    -------
    ndarray
        Percent of the worst month; never more than without diversity.

    Examples
    --------
    >>> pds = protected_selective(0.01, activity=0.035, occurrence_percent=10, improvement_at_0_db=0.13)
    >>> f"{float(pds):.2e}"
    '1.90e-04'

    Notes
    -----
    Source: Rec. ITU-R P.530-17 §6.2, outage with space diversity, Steps 2, 3 and 5 (from memory).
    """
    unprotected = not_negative("selective_percent", selective_percent, "%") / 100.0
    eta = positive("activity", activity, "")
    product = positive("improvement_at_0_db", improvement_at_0_db, "")
    product = product * positive("occurrence_percent", occurrence_percent, "%") / 100.0
    _, uncorrelated = amplitude_correlation(1.0 - product / eta)
    return np.minimum(100.0 * unprotected**2 / (eta * uncorrelated), 100.0 * unprotected)


def add_diversity_outages(flat: ArrayLike, selective: ArrayLike) -> Float:
    """Outage of a hop with diversity by flat and selective fading together, (Pdns^0.75 + Pds^0.75)^(4/3).

    Examples
    --------
    >>> float(add_diversity_outages(0.0, 1.0)), round(float(add_diversity_outages(1.0, 1.0)), 3)
    (1.0, 2.52)

    Notes
    -----
    Source: Rec. ITU-R P.530-17 §6.2, outage with space diversity, Step 6 (from memory).
    """
    parts = np.asarray(flat, dtype=float) ** 0.75 + np.asarray(selective, dtype=float) ** 0.75
    return np.asarray(parts ** (4.0 / 3.0))
