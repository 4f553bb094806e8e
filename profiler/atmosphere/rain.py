"""Attenuation by rain: Rec. ITU-R P.838-3."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from profiler.atmosphere.ranges import FREQUENCY_RANGE_GHZ
from profiler.checks import not_negative, positive, within
from profiler.units import Float

__all__ = [
    "rain_attenuation",
    "rain_coefficients",
]


class _Fit(NamedTuple):
    """Σ a·exp(−((log10 f − b)/c)²) + slope·log10 f + offset, f in GHz: P.838-3 eqs. (2) and (3)."""

    a: tuple[float, ...]
    b: tuple[float, ...]
    c: tuple[float, ...]
    slope: float
    offset: float

    def at(self, log_f: Float) -> Float:
        bells = np.exp(-(((log_f[..., np.newaxis] - self.b) / self.c) ** 2)) @ np.array(self.a)
        return np.asarray(bells + self.slope * log_f + self.offset)


_LOG_K_H = _Fit(  # P.838-3 Table 1
    a=(-5.33980, -0.35351, -0.23789, -0.94158),
    b=(-0.10008, 1.26970, 0.86036, 0.64552),
    c=(1.13098, 0.45400, 0.15354, 0.16817),
    slope=-0.18961,
    offset=0.71147,
)
_LOG_K_V = _Fit(  # P.838-3 Table 2
    a=(-3.80595, -3.44965, -0.39902, 0.50167),
    b=(0.56934, -0.22911, 0.73042, 1.07319),
    c=(0.81061, 0.51059, 0.11899, 0.27195),
    slope=-0.16398,
    offset=0.63297,
)
_ALPHA_H = _Fit(  # P.838-3 Table 3
    a=(-0.14318, 0.29591, 0.32177, -5.37610, 16.1721),
    b=(1.82442, 0.77564, 0.63773, -0.96230, -3.29980),
    c=(-0.55187, 0.19822, 0.13164, 1.47828, 3.43990),
    slope=0.67849,
    offset=-1.95537,
)
_ALPHA_V = _Fit(  # P.838-3 Table 4
    a=(-0.07771, 0.56727, -0.20238, -48.2991, 48.5833),
    b=(2.33840, 0.95545, 1.14520, 0.791669, 0.791459),
    c=(-0.76284, 0.54039, 0.26809, 0.116226, 0.116479),
    slope=-0.053739,
    offset=0.83433,
)


def rain_coefficients(
    frequency_hz: ArrayLike, elevation_deg: ArrayLike = 0.0, tilt_deg: ArrayLike = 0.0
) -> tuple[Float, Float]:
    """Coefficients k and α of the rain attenuation γ = k·R^α (dB/km, R in mm/h).

    k = [kH + kV + (kH − kV)·cos²θ·cos 2τ]/2 and α = [kH·αH + kV·αV + (kH·αH − kV·αV)·cos²θ·cos 2τ]/(2k), with the
    path's elevation θ, the polarization's tilt τ, and kH, kV, αH, αV from the curves of P.838-3 Tables 1 to 4.

    Parameters
    ----------
    frequency_hz
        Frequency, above 0 Hz. The curves are published for 1 to 1000 GHz and mean nothing outside: there the values at
        the nearer end are returned (below 1 GHz an upper bound, as rain takes less there), and `atmosphere_warnings`
        says so. All arguments broadcast.
    elevation_deg
        Elevation of the path above the horizontal, -90 to 90 degrees; the sign does not matter.
    tilt_deg
        Tilt of the polarization from the horizontal, -180 to 180 degrees: 0 horizontal, 90 vertical, 45 circular.

    Returns
    -------
    tuple of ndarray
        k and α in the broadcast shape.

    Raises
    ------
    InputError
        If a frequency is not above 0 or an angle is outside its range.

    Examples
    --------
    >>> k, alpha = rain_coefficients(10e9)
    >>> round(float(k), 5), round(float(alpha), 4)
    (0.01217, 1.2571)
    >>> k, alpha = rain_coefficients(10e9, tilt_deg=90)
    >>> round(float(k), 5), round(float(alpha), 4)
    (0.01129, 1.2156)

    Notes
    -----
    Source: Rec. ITU-R P.838-3, eqs. (2) to (5), Tables 1 to 4.
    """
    f = positive("frequency_hz", frequency_hz, "Hz") / 1e9
    log_f = np.log10(np.clip(f, *FREQUENCY_RANGE_GHZ))  # the fits turn upwards again below: 100 dB/km at 0.1 GHz
    elevation = np.radians(within("elevation_deg", elevation_deg, -90, 90, "-90 to 90 degrees"))
    tilt = np.radians(within("tilt_deg", tilt_deg, -180, 180, "-180 to 180 degrees; 0 horizontal, 90 vertical"))
    weight = np.cos(elevation) ** 2 * np.cos(2.0 * tilt)
    horizontal = 10.0 ** _LOG_K_H.at(log_f) * (1.0 + weight) / 2.0
    vertical = 10.0 ** _LOG_K_V.at(log_f) * (1.0 - weight) / 2.0
    k = horizontal + vertical
    alpha = (horizontal * _ALPHA_H.at(log_f) + vertical * _ALPHA_V.at(log_f)) / k
    return np.asarray(k), np.asarray(alpha)


def rain_attenuation(
    frequency_hz: ArrayLike, rain_mm_h: ArrayLike, elevation_deg: ArrayLike = 0.0, tilt_deg: ArrayLike = 0.0
) -> Float:
    """Specific attenuation by rain, γ = k·R^α.

    Parameters
    ----------
    frequency_hz
        Frequency, above 0 Hz; outside 1 to 1000 GHz see `rain_coefficients`. All arguments broadcast.
    rain_mm_h
        Rain rate at a point, 0 mm/h or more.
    elevation_deg, tilt_deg
        As for `rain_coefficients`: tilt 0 is horizontal, 90 vertical, 45 circular polarization.

    Returns
    -------
    ndarray
        dB per km inside the rain, the broadcast shape.

    Raises
    ------
    InputError
        If the rain rate is negative or not finite, and as `rain_coefficients`.

    Examples
    --------
    >>> round(float(rain_attenuation(18e9, 42.0, tilt_deg=90)), 2)
    3.27
    >>> float(rain_attenuation(18e9, 0.0))
    0.0

    Notes
    -----
    Source: Rec. ITU-R P.838-3, eq. (1).
    """
    rain = not_negative("rain_mm_h", rain_mm_h, "mm/h")
    k, alpha = rain_coefficients(frequency_hz, elevation_deg, tilt_deg)
    return np.asarray(k * rain**alpha)
