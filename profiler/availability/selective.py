"""Frequency-selective fading by the radio's signature: Rec. ITU-R P.530-17 §5.1."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from profiler.checks import positive
from profiler.units import Float

__all__ = ["mean_delay", "multipath_activity", "selective_percent"]


def mean_delay(distance_m: ArrayLike) -> Float:
    """Mean delay of the echo, τm = 0.7·(d/50 km)^1.3 ns, in seconds.

    Examples
    --------
    >>> float(mean_delay(50e3))
    7e-10

    Notes
    -----
    Source: Rec. ITU-R P.530-17 §5.1 Step 1 (from memory).
    """
    return np.asarray(0.7e-9 * (positive("distance_m", distance_m, "m") / 50e3) ** 1.3)


def multipath_activity(occurrence_percent: ArrayLike) -> Float:
    """Multipath activity parameter, η = 1 − exp(−0.2·P0^0.75), P0 = p0/100.

    Examples
    --------
    >>> round(float(multipath_activity(10.0)), 4)
    0.0349

    Notes
    -----
    Source: Rec. ITU-R P.530-17 §5.1 Step 2 (from memory).
    """
    ratio = positive("occurrence_percent", occurrence_percent, "%") / 100.0
    return np.asarray(-np.expm1(-0.2 * ratio**0.75))


def selective_percent(
    occurrence_percent: ArrayLike,
    distance_m: ArrayLike,
    *,
    width_hz: ArrayLike,
    depth_minimum_phase_db: ArrayLike,
    depth_nonminimum_phase_db: ArrayLike,
    delay_s: ArrayLike = 6.3e-9,
) -> Float:
    """Percent of the worst month that selective fading alone puts the radio out of work, without diversity.

    Ps = 2.15·η·(W·10^(−B_M/20)·τm²/τr + W·10^(−B_NM/20)·τm²/τr), W in GHz and the delays in ns. It does not depend on
    the fade margin: more power does not mend distortion.

    Parameters
    ----------
    occurrence_percent
        p0 of the worst month, above 0 %. All arguments broadcast.
    distance_m
        Path length, above 0 m.
    width_hz
        Width W of the signature, above 0 Hz, taken as the same for both phases.
    depth_minimum_phase_db, depth_nonminimum_phase_db
        Depths B of the signature for minimum and non-minimum phase, dB.
    delay_s
        Reference delay τr at which the signature was measured, above 0 s.

    Returns
    -------
    ndarray
        Percent of the worst month, at most 100.

    Examples
    --------
    >>> ps = selective_percent(10, 50e3, width_hz=30e6, depth_minimum_phase_db=20, depth_nonminimum_phase_db=20)
    >>> round(float(ps), 5)
    0.00351

    Notes
    -----
    Source: Rec. ITU-R P.530-17 §5.1 Step 3 (from memory); signatures as in Rec. ITU-R F.1093.
    """
    width_ghz = positive("width_hz", width_hz, "Hz") / 1e9
    reference_ns = positive("delay_s", delay_s, "s") * 1e9
    depths = (depth_minimum_phase_db, depth_nonminimum_phase_db)
    height = sum(10.0 ** (-np.asarray(depth, dtype=float) / 20.0) for depth in depths)
    delay_ns = mean_delay(distance_m) * 1e9
    probability = 2.15 * multipath_activity(occurrence_percent) * width_ghz * height * delay_ns**2 / reference_ns
    return np.minimum(100.0 * probability, 100.0)
