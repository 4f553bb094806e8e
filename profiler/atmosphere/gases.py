"""Attenuation by the gases of the air, line by line: Rec. ITU-R P.676-13 Annex 1."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache
from importlib import resources
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike

from profiler.atmosphere.air import vapour_pressure
from profiler.checks import positive
from profiler.models import frozen_array
from profiler.units import Float

__all__ = [
    "GasAttenuation",
    "gas_attenuation",
    "gas_attenuation_parts",
]


@dataclass(frozen=True, slots=True, eq=False)
class GasAttenuation:
    """Specific attenuation by the gases of the air, dB/km; the arrays are read-only.

    ``oxygen_db_km`` holds the oxygen lines and the dry continuum ("dry air"), ``vapour_db_km`` water vapour.
    """

    oxygen_db_km: Float
    vapour_db_km: Float

    @property
    def total_db_km(self) -> Float:
        """Dry air plus water vapour."""
        return np.asarray(self.oxygen_db_km + self.vapour_db_km)


@cache
def _lines(gas: Literal["oxygen", "vapour"]) -> Float:
    """Read a spectroscopic table once: the centre frequency in GHz and the six coefficients, one row each, by line."""
    table = resources.files("profiler").joinpath("data", f"p676_{gas}_lines.csv").read_text(encoding="utf-8")
    return frozen_array(np.loadtxt(table.splitlines(), delimiter=",", skiprows=3).T)


def _shape(f: Float, line_ghz: Float, width_ghz: Float, interference: Float | float) -> Float:
    """Shape F of each line, P.676-13 Annex 1 eq. (5), in 1/GHz."""
    below, above = line_ghz - f, line_ghz + f
    squared = width_ghz**2
    lower = (width_ghz - interference * below) / (below**2 + squared)
    upper = (width_ghz - interference * above) / (above**2 + squared)
    return np.asarray(f / line_ghz * (lower + upper))


def _oxygen(f: Float, p: Float, e: Float, theta: Float) -> Float:
    """Imaginary refractivity of the oxygen lines; arguments broadcast with a last axis for the lines."""
    line_ghz, a1, a2, a3, a4, a5, a6 = _lines("oxygen")
    strength = a1 * 1e-7 * p * theta**3 * np.exp(a2 * (1.0 - theta))
    pressure_width = a3 * 1e-4 * (p * theta ** (0.8 - a4) + 1.1 * e * theta)
    width_ghz = np.sqrt(pressure_width**2 + 2.25e-6)  # Zeeman splitting, eq. (6b)
    interference = (a5 + a6 * theta) * 1e-4 * (p + e) * theta**0.8
    return np.asarray((strength * _shape(f, line_ghz, width_ghz, interference)).sum(axis=-1))


def _vapour(f: Float, p: Float, e: Float, theta: Float) -> Float:
    """Imaginary refractivity of the water-vapour lines; arguments broadcast with a last axis for the lines."""
    line_ghz, b1, b2, b3, b4, b5, b6 = _lines("vapour")
    strength = b1 * 1e-1 * e * theta**3.5 * np.exp(b2 * (1.0 - theta))
    pressure_width = b3 * 1e-4 * (p * theta**b4 + b5 * e * theta**b6)
    doppler = 2.1316e-12 * line_ghz**2 / theta  # eq. (6b)
    width_ghz = 0.535 * pressure_width + np.sqrt(0.217 * pressure_width**2 + doppler)
    return np.asarray((strength * _shape(f, line_ghz, width_ghz, 0.0)).sum(axis=-1))


def _dry_continuum(f: Float, p: Float, e: Float, theta: Float) -> Float:
    """Imaginary refractivity of the dry continuum, P.676-13 Annex 1 eqs. (8) and (9)."""
    debye_ghz = 5.6e-4 * (p + e) * theta**0.8
    debye = 6.14e-5 / (debye_ghz * (1.0 + (f / debye_ghz) ** 2))
    nitrogen = 1.4e-12 * p * theta**1.5 / (1.0 + 1.9e-5 * f**1.5)
    return np.asarray(f * p * theta**2 * (debye + nitrogen))


def gas_attenuation_parts(
    frequency_hz: ArrayLike, pressure_hpa: ArrayLike, temperature_k: ArrayLike, vapour_g_m3: ArrayLike
) -> GasAttenuation:
    """Specific attenuation by dry air and by water vapour, each on its own.

    γ = 0.1820·f·N″(f), f in GHz; N″ is the sum of strength times shape over the 44 oxygen or 35 water-vapour lines,
    with the dry (Debye and pressure-induced nitrogen) continuum in the dry part.

    Parameters
    ----------
    frequency_hz
        Frequency, above 0 Hz; the method is published for 1 to 1000 GHz. All arguments broadcast.
    pressure_hpa
        Pressure of the dry air, above 0 hPa (a barometer reads the total: see `dry_pressure`).
    temperature_k
        Temperature, above 0 K.
    vapour_g_m3
        Water-vapour density, 0 g/m³ or more.

    Returns
    -------
    GasAttenuation
        ``oxygen_db_km``, ``vapour_db_km`` and ``total_db_km`` in the broadcast shape.

    Raises
    ------
    InputError
        If a frequency, pressure or temperature is not above 0, a density is negative, or any is not finite.

    Examples
    --------
    >>> air = gas_attenuation_parts(60e9, 1013.25, 288.15, 7.5)
    >>> round(float(air.oxygen_db_km), 3), round(float(air.vapour_db_km), 3)
    (14.623, 0.155)
    >>> float(gas_attenuation_parts(22e9, 1013.25, 288.15, 0.0).vapour_db_km)
    0.0

    Notes
    -----
    Source: Rec. ITU-R P.676-13 Annex 1 §1, eqs. (1) to (9), Tables 1 and 2.
    """
    f = positive("frequency_hz", frequency_hz, "Hz") / 1e9
    p = positive("pressure_hpa", pressure_hpa, "hPa")
    temperature = positive("temperature_k", temperature_k, "K")
    e = vapour_pressure(temperature, vapour_g_m3)
    theta = 300.0 / temperature
    by_line = tuple(values[..., np.newaxis] for values in (f, p, e, theta))
    scale = 0.1820 * f
    oxygen = scale * (_oxygen(*by_line) + _dry_continuum(f, p, e, theta))
    return GasAttenuation(frozen_array(oxygen), frozen_array(scale * _vapour(*by_line)))


def gas_attenuation(
    frequency_hz: ArrayLike, pressure_hpa: ArrayLike, temperature_k: ArrayLike, vapour_g_m3: ArrayLike
) -> Float:
    """Specific attenuation by the gases of the air, dB/km: the total of `gas_attenuation_parts`.

    Parameters
    ----------
    frequency_hz, pressure_hpa, temperature_k, vapour_g_m3
        As for `gas_attenuation_parts`; the pressure is that of the dry air. All broadcast.

    Returns
    -------
    ndarray
        dB per km of path, the broadcast shape.

    Raises
    ------
    InputError
        As `gas_attenuation_parts`.

    Examples
    --------
    >>> round(float(gas_attenuation(7e9, 1013.25, 288.15, 7.5)), 4)
    0.0104
    >>> gas_attenuation([6e9, 18e9, 80e9], 1013.25, 288.15, 7.5).round(4).tolist()
    [0.0095, 0.0575, 0.3424]

    Notes
    -----
    Source: Rec. ITU-R P.676-13 Annex 1 §1.
    """
    return gas_attenuation_parts(frequency_hz, pressure_hpa, temperature_k, vapour_g_m3).total_db_km
