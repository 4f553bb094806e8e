"""Where the ground can mirror the ray: specular points over the bulged profile, their grazing angle and screening."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from profiler.errors import InputError
from profiler.geometry.ray import earth_bulge
from profiler.units import MEAN_EARTH_RADIUS_M, SPEED_OF_LIGHT_M_S, Float, wavelength

__all__ = ["Reflection", "find_reflections", "smooth_specular_distance"]

_FEWEST_FACET_POINTS = 3


@dataclass(frozen=True, slots=True)
class Reflection:
    """One place whose ground, at its own slope, mirrors the ray from A to B.

    ``screened_a`` and ``screened_b`` say whether the ground hides the place from that antenna. ``delay_s`` is how
    much later the mirrored ray arrives. ``roughness_m`` is the rms height of the ground about its facet;
    ``rough`` compares it with the Rayleigh criterion, λ/(8·sin ψ).
    """

    distance_m: float
    grazing_deg: float
    screened_a: bool
    screened_b: bool
    delay_s: float
    roughness_m: float
    rough: bool

    @property
    def screened(self) -> bool:
        """Whether the ground hides the place from either antenna."""
        return self.screened_a or self.screened_b


def smooth_specular_distance(distance_m: float, height_a_m: float, height_b_m: float, k: float) -> float:
    """Distance from A to the specular point on a smooth curved earth.

    With m = d²/(4·k·R·(h1 + h2)) and c = (h1 - h2)/(h1 + h2) (the taller end first) the reflection lies at
    d1 = d/2·(1 + b), b = 2·sqrt((m + 1)/(3m))·cos(π/3 + arccos(3c/2·sqrt(3m/(m + 1)³))/3).

    Parameters
    ----------
    distance_m
        Length of the path, more than 0 m.
    height_a_m, height_b_m
        Antenna centres above the smooth surface, 0 m or more, not both 0.
    k
        Effective-earth-radius factor, more than 0.

    Returns
    -------
    float
        Metres from A.

    Raises
    ------
    InputError
        For a length, heights or k outside those ranges.

    Examples
    --------
    >>> round(smooth_specular_distance(40e3, 50.0, 50.0, 4 / 3))
    20000
    >>> round(smooth_specular_distance(40e3, 100.0, 50.0, 4 / 3))
    25156

    Notes
    -----
    Source: Rec. ITU-R P.530-18 §6.1.2.3 and P.526-15 §3.2 use this closed form (from memory of the text).
    """
    if not (distance_m > 0 and k > 0 and min(height_a_m, height_b_m) >= 0 and height_a_m + height_b_m > 0):
        raise InputError(
            f"path of {distance_m} m, antennas {height_a_m} and {height_b_m} m, k {k}: must be more than 0"
        )
    total = height_a_m + height_b_m
    c = abs(height_a_m - height_b_m) / total
    m = distance_m**2 / (4.0 * k * MEAN_EARTH_RADIUS_M * total)
    angle = np.arccos(1.5 * c * np.sqrt(3.0 * m / (m + 1.0) ** 3))
    b = 2.0 * np.sqrt((m + 1.0) / (3.0 * m)) * np.cos(np.pi / 3.0 + angle / 3.0)
    from_taller = 0.5 * distance_m * (1.0 + b)
    return float(from_taller if height_a_m >= height_b_m else distance_m - from_taller)


def find_reflections(
    distance_m: ArrayLike,
    surface_m: ArrayLike,
    centre_a_m: float,
    centre_b_m: float,
    frequency_hz: float,
    *,
    k: float,
    facet_m: float | None = None,
) -> tuple[Reflection, ...]:
    """Specular points of a profile: places whose facet of bulged ground mirrors one antenna into the other.

    Around every point a straight facet is fitted to the bulged surface by least squares; the image of B in the facet
    tells where the mirrored ray would meet it. The places that meet themselves are the specular points. On a smooth
    earth that is the one point of `smooth_specular_distance`; rough country may have several or none.

    Parameters
    ----------
    distance_m, surface_m
        The profile as in `check_rule`, (n,), no gaps.
    centre_a_m, centre_b_m
        Antenna centres above the datum.
    frequency_hz
        Frequency, more than 0 Hz; it sets how rough is rough.
    k
        Effective-earth-radius factor, more than 0.
    facet_m
        Length of a facet, metres; by default a twentieth of the path.

    Returns
    -------
    tuple of Reflection
        Unscreened places first, then by delay; empty when no facet mirrors the ray.

    Raises
    ------
    InputError
        If a facet would hold fewer than three points.

    Examples
    --------
    >>> x = np.linspace(0, 40e3, 801)
    >>> [only] = find_reflections(x, 0 * x, 100.0, 50.0, 6e9, k=4 / 3)
    >>> round(only.distance_m), only.screened, round(only.grazing_deg, 3)
    (25155, False, 0.143)
    """
    distance, surface = np.asarray(distance_m, dtype=float), np.asarray(surface_m, dtype=float)
    bulged = surface + earth_bulge(distance, distance[-1] - distance, k)
    length = 0.05 * float(distance[-1]) if facet_m is None else facet_m
    mean, slope, rms = _facets(distance, bulged, length)
    # heights of both antennas over each facet's line, and where the mirrored ray meets that line
    over_a = centre_a_m - (mean + slope * (0.0 - distance))
    over_b = centre_b_m - (mean + slope * (distance[-1] - distance))
    lit = (over_a > 0) & (over_b > 0)
    total = np.where(lit, over_a + over_b, 1.0)
    miss = np.where(lit, distance[-1] * over_a / total, np.nan) - distance
    crossing = np.flatnonzero((miss[:-1] >= 0) & (miss[1:] < 0) & (np.abs(miss[:-1]) + np.abs(miss[1:]) <= length))
    found = []
    for i in crossing:
        share = miss[i] / (miss[i] - miss[i + 1])
        where = float(distance[i] + share * (distance[i + 1] - distance[i]))
        height = float(np.interp(where, distance, bulged))
        grazing = float(np.arctan2(total[i], distance[-1]))
        roughness = float(rms[i])
        found.append(
            Reflection(
                distance_m=where,
                grazing_deg=float(np.degrees(grazing)),
                screened_a=_screened(distance, bulged - roughness, 0.0, centre_a_m, where, height),
                screened_b=_screened(distance, bulged - roughness, float(distance[-1]), centre_b_m, where, height),
                delay_s=float(_excess_m(distance[-1], over_a[i], over_b[i]) / SPEED_OF_LIGHT_M_S),
                roughness_m=roughness,
                rough=bool(roughness > float(wavelength(frequency_hz)) / (8.0 * np.sin(grazing))),
            )
        )
    return tuple(sorted(found, key=lambda place: (place.screened, place.delay_s)))


def _excess_m(length_m: float, over_a_m: float, over_b_m: float) -> float:
    """How much longer the mirrored ray is: the difference of two near-equal lengths, written without cancelling."""
    direct = np.hypot(length_m, over_a_m - over_b_m)
    mirrored = np.hypot(length_m, over_a_m + over_b_m)
    return float(4.0 * over_a_m * over_b_m / (direct + mirrored))


def _facets(distance: Float, bulged: Float, length: float) -> tuple[Float, Float, Float]:
    """Height at its middle point, slope and rms residual of the least-squares line around every point."""
    first = np.searchsorted(distance, distance - 0.5 * length, side="left")
    last = np.searchsorted(distance, distance + 0.5 * length, side="right")
    count = last - first
    if count.max() < _FEWEST_FACET_POINTS:
        raise InputError(f"facet_m = {length:.0f}: must span at least {_FEWEST_FACET_POINTS} points of the profile")
    x, z = distance - distance.mean(), bulged - bulged.mean()

    def window(values: Float) -> Float:
        running = np.concatenate(([0.0], np.cumsum(values)))
        return np.asarray((running[last] - running[first]) / count)

    mean_x, mean_z = window(x), window(z)
    spread = np.maximum(window(x * x) - mean_x**2, np.finfo(float).tiny)
    slope = np.where(count >= _FEWEST_FACET_POINTS, (window(x * z) - mean_x * mean_z) / spread, 0.0)
    residual = np.maximum(window(z * z) - mean_z**2 - slope**2 * spread, 0.0)
    middle = bulged.mean() + mean_z + slope * (x - mean_x)
    return middle, slope, np.sqrt(residual)


def _screened(distance: Float, ground: Float, from_m: float, centre: float, to_m: float, height: float) -> bool:
    """Whether ground stands above the line from an antenna to a place on it; the place's own roughness is taken off."""
    between = (distance - from_m) * (distance - to_m) < 0
    line = centre + (height - centre) * (distance[between] - from_m) / (to_m - from_m)
    return bool(np.any(ground[between] > line))
