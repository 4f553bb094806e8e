"""Thermal noise."""

from __future__ import annotations

from numpy.typing import ArrayLike

from profiler.checks import positive
from profiler.units import BOLTZMANN_J_K, Float, dbm_from_watts

__all__ = [
    "NOISE_REFERENCE_K",
    "noise_density_dbm_hz",
]

NOISE_REFERENCE_K = 290.0
"""Reference temperature T0 that defines the noise figure (IEEE Std 161; Rec. ITU-R P.372-16 §2; from memory)."""


def noise_density_dbm_hz(temperature_k: ArrayLike = NOISE_REFERENCE_K) -> Float:
    """Thermal noise power in 1 Hz, N0 = k_B·T.

    Parameters
    ----------
    temperature_k
        Noise temperature of the receiving system, K, above 0, any shape; 290 K is the reference of noise figures.

    Returns
    -------
    ndarray
        dBm in 1 Hz.

    Raises
    ------
    InputError
        For a temperature not above 0.

    Examples
    --------
    >>> round(float(noise_density_dbm_hz()), 2)
    -173.98
    >>> round(float(noise_density_dbm_hz(1.0)) - 30, 1)
    -228.6

    Notes
    -----
    Source: Nyquist, Physical Review 32, 1928; k_B from the BIPM SI Brochure, 9th edition, 2019. The Rayleigh-Jeans
    form: it holds while h·f is small against k_B·T (at 290 K, 1 % high at 121 GHz).
    """
    temperature = positive("temperature_k", temperature_k, "K")
    return dbm_from_watts(BOLTZMANN_J_K * temperature)
