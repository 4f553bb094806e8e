"""Where the ground can mirror the ray: specular points over the bulged profile, their grazing angle and screening."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from profiler.errors import InputError
from profiler.geometry.ray import earth_bulge
from profiler.models import lengths_between
from profiler.units import SPEED_OF_LIGHT_M_S, Float, wavelength

__all__ = ["Reflection", "find_reflections"]

_FACET = 1.0 / 20.0
"""Length of a facet over that of the path."""
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


def find_reflections(
    distance_m: ArrayLike,
    surface_m: ArrayLike,
    centre_a_m: float,
    centre_b_m: float,
    frequency_hz: float,
    *,
    k: float,
) -> tuple[Reflection, ...]:
    """Specular points of a profile: places whose facet of bulged ground mirrors one antenna into the other.

    Around every point a straight facet is fitted to the bulged surface by least squares, each point with the length of
    the path that it stands for; the image of B in the facet
    tells where the mirrored ray would meet it. The places that meet themselves are the specular points. On a smooth
    earth that is one point; rough country may have several or none.

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
    length = _FACET * float(distance[-1])
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
        raise InputError(
            f"profile of {distance.size} points: must have {_FEWEST_FACET_POINTS} or more in every {length:.0f} m, "
            "the length of a facet"
        )
    weight = lengths_between(distance)
    level = float(np.average(bulged, weights=weight))
    x, z = distance - 0.5 * distance[-1], bulged - level

    def total(values: Float) -> Float:
        running = np.concatenate(([0.0], np.cumsum(values)))
        return np.asarray(running[last] - running[first])

    whole = total(weight)

    def window(values: Float) -> Float:
        return total(weight * values) / whole

    mean_x, mean_z = window(x), window(z)
    spread = np.maximum(window(x * x) - mean_x**2, np.finfo(float).tiny)
    slope = np.where(count >= _FEWEST_FACET_POINTS, (window(x * z) - mean_x * mean_z) / spread, 0.0)
    residual = np.maximum(window(z * z) - mean_z**2 - slope**2 * spread, 0.0)
    middle = level + mean_z + slope * (x - mean_x)
    return middle, slope, np.sqrt(residual)


def _screened(distance: Float, ground: Float, from_m: float, centre: float, to_m: float, height: float) -> bool:
    """Whether ground stands above the line from an antenna to a place on it; the place's own roughness is taken off."""
    between = (distance - from_m) * (distance - to_m) < 0
    line = centre + (height - centre) * (distance[between] - from_m) / (to_m - from_m)
    return bool(np.any(ground[between] > line))
