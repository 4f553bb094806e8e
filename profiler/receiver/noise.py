"""Thermal noise: density, power, and noise figure against noise temperature."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from profiler.checks import not_negative, positive
from profiler.units import BOLTZMANN_J_K, Float, db_from_ratio, dbm_from_watts, ratio_from_db

__all__ = [
    "NOISE_REFERENCE_K",
    "effective_temperature",
    "noise_density_dbm_hz",
    "noise_figure",
    "noise_power_dbm",
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


def noise_power_dbm(bandwidth_hz: ArrayLike, noise_figure_db: ArrayLike = 0.0) -> Float:
    """Noise at a receiver's input that sees a source at 290 K, N = k_B·T0·B·F.

    Parameters
    ----------
    bandwidth_hz
        Noise bandwidth, Hz, above 0, any shape.
    noise_figure_db
        Noise figure, dB, 0 or more, broadcast against the bandwidth.

    Returns
    -------
    ndarray
        dBm.

    Raises
    ------
    InputError
        For a bandwidth not above 0 or a negative noise figure.

    Examples
    --------
    >>> round(float(noise_power_dbm(28e6, 5.0)), 1)
    -94.5
    >>> bool(noise_power_dbm(1.0) == noise_density_dbm_hz())
    True

    Notes
    -----
    Source: Friis, Proceedings of the IRE 32(7), 1944.
    """
    bandwidth = positive("bandwidth_hz", bandwidth_hz, "Hz")
    figure = not_negative("noise_figure_db", noise_figure_db, "dB")
    return np.asarray(noise_density_dbm_hz() + db_from_ratio(bandwidth) + figure)


def effective_temperature(noise_figure_db: ArrayLike) -> Float:
    """Effective input noise temperature of a receiver, Te = T0·(F − 1) with T0 = 290 K.

    The whole system's temperature adds the antenna's: behind an antenna at 290 K it is T0·F.

    Parameters
    ----------
    noise_figure_db
        Noise figure, dB, 0 or more, any shape.

    Returns
    -------
    ndarray
        K.

    Raises
    ------
    InputError
        For a negative noise figure.

    Examples
    --------
    >>> round(float(effective_temperature(3.0)), 1)
    288.6
    >>> float(effective_temperature(0.0))
    0.0

    Notes
    -----
    Source: Rec. ITU-R P.372-16 §2, Friis 1944 (from memory).
    """
    return np.asarray(NOISE_REFERENCE_K * (ratio_from_db(not_negative("noise_figure_db", noise_figure_db, "dB")) - 1.0))


def noise_figure(temperature_k: ArrayLike) -> Float:
    """Noise figure in dB of an effective input noise temperature; the inverse of `effective_temperature`.

    Parameters
    ----------
    temperature_k
        Effective input noise temperature of the receiver alone, K, 0 or more, any shape.

    Returns
    -------
    ndarray
        F = 10·log10(1 + Te/T0), dB.

    Raises
    ------
    InputError
        For a negative temperature.

    Examples
    --------
    >>> round(float(noise_figure(290.0)), 2)
    3.01
    """
    return db_from_ratio(1.0 + not_negative("temperature_k", temperature_k, "K") / NOISE_REFERENCE_K)
