"""Where the ray runs over the curved earth: bulge, Fresnel radius, ray height and elevation angle."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from profiler.checks import not_negative, positive, within
from profiler.errors import InputError
from profiler.units import MEAN_EARTH_RADIUS_M, Float, wavelength

__all__ = [
    "earth_bulge",
    "elevation_angle",
    "fresnel_radius",
    "ray_height",
]


def _lengths(d1_m: ArrayLike, d2_m: ArrayLike) -> tuple[Float, Float]:
    """Distances to both ends; a point outside the path has no bulge and no Fresnel radius."""
    return not_negative("d1_m", d1_m, "m"), not_negative("d2_m", d2_m, "m")


def earth_bulge(d1_m: ArrayLike, d2_m: ArrayLike, k: ArrayLike) -> Float:
    """Height that the curved effective earth adds at a point, d1·d2/(2·k·R).

    Parameters
    ----------
    d1_m, d2_m
        Distances from the point to the two ends, 0 m or more; they broadcast.
    k
        Effective-earth-radius factor, more than 0 (a negative one, past super-refraction, has no bulge); infinity is
        the flat earth.

    Returns
    -------
    ndarray
        Bulge in metres above the chord between the ends.

    Raises
    ------
    InputError
        For a negative distance or a k that is not above 0.

    Examples
    --------
    >>> round(float(earth_bulge(20e3, 20e3, 4 / 3)), 2)
    23.54
    >>> float(earth_bulge(0.0, 40e3, 4 / 3))
    0.0

    Notes
    -----
    The parabola is the usual approximation (relative error about (d/2R)², under 1e-4 at 100 km); R = 6371 km. In km
    and m it reads d1·d2/(12.742·k). Source: Rec. ITU-R P.530-18 §2.2 takes the effective earth; formula from memory.
    """
    d1, d2 = _lengths(d1_m, d2_m)
    return np.asarray(d1 * d2 / (2.0 * positive("k", k, infinite=True) * MEAN_EARTH_RADIUS_M))


def fresnel_radius(d1_m: ArrayLike, d2_m: ArrayLike, frequency_hz: ArrayLike, zone: ArrayLike = 1) -> Float:
    """Radius of a Fresnel zone, sqrt(n·λ·d1·d2/(d1+d2)).

    Parameters
    ----------
    d1_m, d2_m
        Distances from the point to the two ends, 0 m or more, not both 0; they broadcast.
    frequency_hz
        Frequency, more than 0 Hz.
    zone
        Number n of the zone, 1 or more.

    Returns
    -------
    ndarray
        Radius in metres; 0 at the ends.

    Raises
    ------
    InputError
        For a negative distance, a path of no length, a frequency not above 0 or a zone below 1.

    Examples
    --------
    >>> round(float(fresnel_radius(20e3, 20e3, 6e9)), 2)
    22.35
    >>> float(fresnel_radius(0.0, 40e3, 6e9))
    0.0

    Notes
    -----
    Source: Rec. ITU-R P.526-15 §2.1, equation (2).
    """
    d1, d2 = _lengths(d1_m, d2_m)
    if np.any(d1 + d2 <= 0):
        raise InputError("d1_m + d2_m = 0: the path has no length; give two different sites")
    number = within("zone", zone, 1, np.inf, "1 or more")
    lam = wavelength(positive("frequency_hz", frequency_hz, "Hz"))
    return np.asarray(np.sqrt(number * lam * d1 * d2 / (d1 + d2)))


def ray_height(distance_m: ArrayLike, centre_a_m: ArrayLike, centre_b_m: ArrayLike) -> Float:
    """Height of the straight ray between the antenna centres, above the vertical datum.

    Parameters
    ----------
    distance_m
        Distances from A along the path, (..., n); the last one is B.
    centre_a_m, centre_b_m
        Antenna centres above the datum, scalars or (..., 1).

    Examples
    --------
    >>> ray_height([0.0, 5e3, 10e3], 100.0, 200.0).tolist()
    [100.0, 150.0, 200.0]
    """
    distance = np.asarray(distance_m, dtype=float)
    share = distance / distance[..., -1:]
    return np.asarray((1.0 - share) * np.asarray(centre_a_m) + share * np.asarray(centre_b_m))


def elevation_angle(distance_m: ArrayLike, centre_from_m: ArrayLike, centre_to_m: ArrayLike, k: ArrayLike) -> Float:
    """Elevation angle in degrees at which one antenna sees the other, atan((h2-h1)/d - d/(2·k·R)).

    Examples
    --------
    >>> round(float(elevation_angle(40e3, 300.0, 300.0, 4 / 3)), 3)
    -0.135
    """
    distance = np.asarray(distance_m, dtype=float)
    rise = (np.asarray(centre_to_m, dtype=float) - np.asarray(centre_from_m, dtype=float)) / distance
    return np.asarray(np.degrees(np.arctan(rise - distance / (2.0 * np.asarray(k, dtype=float) * MEAN_EARTH_RADIUS_M))))
