"""Attenuation by the gases over a whole path: the air changes with height, and the ray climbs and sags through it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from profiler.atmosphere.air import Atmosphere, local_atmosphere
from profiler.atmosphere.gases import gas_attenuation
from profiler.geometry import earth_bulge
from profiler.units import Float

__all__ = ["GasLoss", "gas_along_ray"]

_NODES = 12
"""Of the Gauss-Legendre sum: within 1e-9 of the loss where the ray is free, 3 % where it must bend over mountains."""


@dataclass(frozen=True, slots=True, eq=False)
class GasLoss:
    """Attenuation by the gases along a ray, and the air that it assumes; heights are above the datum.

    ``mean_m`` is the mean height of the ray, where given numbers hold, and ``atmosphere`` the air there.
    """

    loss_db: float
    lowest_m: float
    mean_m: float
    highest_m: float
    atmosphere: Atmosphere


def gas_along_ray(
    frequency_hz: float,
    distance_m: ArrayLike,
    ground_m: ArrayLike,
    centre_a_m: float,
    centre_b_m: float,
    k: float,
    *,
    total_pressure_hpa: float | None = None,
    temperature_k: float | None = None,
    vapour_g_m3: float | None = None,
) -> GasLoss:
    """Attenuation by the gases along the ray, each part of it in the air of its own height.

    The height of the ray above the curved earth is that of the straight line between the antennas less the bulge
    d1·d2/(2·k·R), and where the ground stands above that, the ground's: the signal goes over it.

    Parameters
    ----------
    frequency_hz
        Frequency, above 0 Hz; published for 1 to 1000 GHz.
    distance_m, ground_m
        Distances from A, ascending from 0, and the ground there above sea level, (n,); the last is B.
    centre_a_m, centre_b_m
        Antenna centres above sea level.
    k
        Effective-earth-radius factor, above 0; infinity is allowed.
    total_pressure_hpa, temperature_k, vapour_g_m3
        What was measured of the air, as in `local_atmosphere`; it is taken to hold at the mean height of the ray and
        changes with height as the reference atmosphere does. None: the reference atmosphere.

    Returns
    -------
    GasLoss

    Raises
    ------
    InputError
        As `local_atmosphere`: the ray must run between -500 and 8500 m.

    Examples
    --------
    A ray that climbs 2 km through the oxygen line: all of it at the height of A would lose 292 dB.

    >>> loss = gas_along_ray(60e9, [0, 10e3, 20e3], [0, 500, 1900], 50.0, 2050.0, 4 / 3)
    >>> round(loss.loss_db, 1), round(loss.mean_m), loss.atmosphere.temperature_k.round(2).item()
    (279.0, 1046, 281.35)

    Notes
    -----
    Source: Rec. ITU-R P.676-13 Annex 1 for the attenuation at each height, P.835-6 for the air; the sum along the ray
    is a Gauss-Legendre quadrature.
    """
    distance, ground = np.asarray(distance_m, dtype=float), np.asarray(ground_m, dtype=float)
    place, weight = np.polynomial.legendre.leggauss(_NODES)
    share, weight = (place + 1.0) / 2.0, weight / 2.0
    length_m = float(distance[-1])
    ray = centre_a_m + (centre_b_m - centre_a_m) * share
    ray = ray - earth_bulge(length_m * share, length_m * (1.0 - share), k)
    height = np.maximum(ray, np.interp(length_m * share, distance, ground))
    mean_m = float(weight @ height)

    def air_at(height_m: ArrayLike) -> Atmosphere:
        return local_atmosphere(
            height_m,
            total_pressure_hpa=total_pressure_hpa,
            temperature_k=temperature_k,
            vapour_g_m3=vapour_g_m3,
            given_at_m=mean_m,
        )

    air = air_at(height)
    per_km: Float = gas_attenuation(frequency_hz, air.pressure_hpa, air.temperature_k, air.vapour_g_m3)
    loss_db = float(weight @ per_km) * length_m / 1e3
    return GasLoss(loss_db, float(height.min()), mean_m, float(height.max()), air_at(mean_m))
