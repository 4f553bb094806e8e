"""How wrong terrain models are: published vertical errors per kind of source, and statements of error as one sigma.

Rank 1 beside `profiler.models`, so that the reader of hop files can offer the names; `profiler.confidence` uses them.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from types import MappingProxyType

from profiler.errors import InputError

__all__ = ["LE90_SIGMA", "TERRAIN_ERRORS", "TerrainError", "sigma_from_le90", "sigma_from_rmse"]

LE90_SIGMA = 1.6448536269514722
"""Sigmas within which 90 % of a Gaussian error lies: the 95 % point of the standard normal distribution."""


@dataclass(frozen=True, slots=True)
class TerrainError:
    """Default error of one kind of terrain model, with where each number comes from.

    ``correlation_m`` is the practical range: the distance at which the correlation has fallen to 5 %.
    """

    sigma_m: float
    source: str
    correlation_m: float
    correlation_source: str


def sigma_from_rmse(rmse_m: float, bias_m: float = 0.0) -> float:
    """Turn the root mean square of an error into its standard deviation, sqrt(RMSE² - bias²).

    Parameters
    ----------
    rmse_m
        Root mean square error against surveyed points, 0 m or more.
    bias_m
        Mean error, metres, if it is known *and taken out of the heights*; else leave 0, and the RMSE is the sigma.

    Returns
    -------
    float
        Metres.

    Raises
    ------
    InputError
        If the RMSE is negative or smaller than the bias.

    Examples
    --------
    >>> sigma_from_rmse(5.0)
    5.0
    >>> sigma_from_rmse(5.0, bias_m=-3.0)
    4.0

    Notes
    -----
    Source: definition of variance.
    """
    if not (math.isfinite(rmse_m) and rmse_m >= abs(bias_m)):
        raise InputError(f"rmse_m = {rmse_m}: must be 0 m or more and at least the bias of {bias_m} m")
    return math.sqrt(rmse_m**2 - bias_m**2)


def sigma_from_le90(le90_m: float) -> float:
    """Turn an LE90, the magnitude that 90 % of the errors stay within, into a standard deviation, LE90/1.645.

    Parameters
    ----------
    le90_m
        Linear error at 90 % probability, 0 m or more.

    Returns
    -------
    float
        Metres.

    Raises
    ------
    InputError
        If the LE90 is negative or not a number.

    Examples
    --------
    >>> round(sigma_from_le90(16.0), 2)
    9.73

    Notes
    -----
    Holds for a Gaussian error without bias. Source: the 95 % point of the normal distribution, 1.645.
    """
    if not (math.isfinite(le90_m) and le90_m >= 0):
        raise InputError(f"le90_m = {le90_m}: must be 0 m or more")
    return le90_m / LE90_SIGMA


_AZIZ = "RMSE against 7 757 GNSS points, northern Malaysia (Aziz et al., International Journal of Geoinformatics)"
_APEH = "RMSE in Nigeria (Apeh et al., Journal of Geographic Information System 11(2), 2019)"
_OKSANEN = "upper end of the 0-120 m of Oksanen and Sarjakoski, Computers & Geosciences 31(8), 2005"
_CELLS = "three cells of the model; an assumption, no source"

TERRAIN_ERRORS = MappingProxyType(
    {
        "srtm-1": TerrainError(5.7, f"SRTM 1 arc-second: 5.7 m {_AZIZ}; 7.5 m {_APEH}", 120.0, _OKSANEN),
        "srtm-3": TerrainError(
            round(sigma_from_le90(16.0), 2),
            "SRTM 3 arc-seconds: the mission's stated absolute LE90 of 16 m (from memory)",
            270.0,
            _CELLS,
        ),
        "nasadem": TerrainError(3.7, f"NASADEM: 3.7 m {_AZIZ}", 120.0, _OKSANEN),
        "merit": TerrainError(2.7, f"MERIT: 2.7 m {_AZIZ}", 270.0, _CELLS),
        "alos-w3d30": TerrainError(5.4, f"ALOS World 3D 30 m: 5.4 m {_APEH}", 120.0, _OKSANEN),
        "copernicus-glo30": TerrainError(
            round(sigma_from_le90(4.0), 2),
            "Copernicus GLO-30: stated absolute LE90 under 4 m (from memory); tree tops count as ground in forest",
            120.0,
            _OKSANEN,
        ),
        "usgs-10m": TerrainError(
            1.55,
            "USGS 1/3 arc-second: 1.55 m RMSE over the conterminous United States (Gesch et al., USGS Open-File Report "
            "2014-1008, from memory)",
            30.0,
            _CELLS,
        ),
        "lidar": TerrainError(
            0.15,
            "airborne lidar of quality level 2: 29.4 cm at 95 % under vegetation (USGS Lidar Base Specification, from "
            "memory), divided by 1.96",
            10.0,
            "an assumption, no source",
        ),
    }
)
"""Default errors by kind of source. They are from other places than yours: a local comparison is always better."""
