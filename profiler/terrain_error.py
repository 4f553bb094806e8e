"""How wrong terrain models are: published vertical errors per kind of source, and statements of error as sigmas.

The error of a model has two parts. A whole neighbourhood shares an offset, which cancels where both sites stand on the
model's own ground; the rest is local. A published *absolute* accuracy is of both, a *relative* one (of the difference
between two points) of the local part alone. None of the published figures was checked against the print here: they are
from memory, and say so.

Rank 1 beside `profiler.models`, so that the reader of hop files can offer the names; `profiler.confidence` uses them.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from types import MappingProxyType

from profiler.errors import InputError

__all__ = ["LE90_SIGMA", "TERRAIN_ERRORS", "TerrainError", "sigma_from_le90", "sigma_from_rmse", "split_le90"]

LE90_SIGMA = 1.6448536269514722
"""Sigmas within which 90 % of a Gaussian error lies: the 95 % point of the standard normal distribution."""


@dataclass(frozen=True, slots=True)
class TerrainError:
    """Default error of one kind of terrain model, with where each number comes from.

    ``sigma_m`` is the local part, ``offset_sigma_m`` what a neighbourhood shares. ``correlation_m`` is the practical
    range of the local part: the distance at which its correlation has fallen to 5 %.
    """

    sigma_m: float
    offset_sigma_m: float
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


def split_le90(absolute_le90_m: float, relative_le90_m: float) -> tuple[float, float]:
    """Split an error into its local part and its offset, by a published absolute and a published relative accuracy.

    The difference of two points holds two local errors and no offset, so local = relative/(1.645·sqrt 2); what the
    absolute error has beyond that is offset, sqrt((absolute/1.645)² - local²).

    Parameters
    ----------
    absolute_le90_m
        Absolute linear error at 90 % probability, 0 m or more.
    relative_le90_m
        Linear error at 90 % probability of the difference between two points far enough apart to be independent.

    Returns
    -------
    float, float
        Standard deviations of the local part and of the offset, metres; where the relative accuracy leaves nothing
        beyond the local part, the offset is 0.

    Raises
    ------
    InputError
        If either is negative or not a number.

    Examples
    --------
    >>> tuple(round(each, 2) for each in split_le90(9.0, 7.0))
    (3.01, 4.57)
    >>> split_le90(5.6, 9.8)[1]
    0.0

    Notes
    -----
    Holds for Gaussian errors without bias. Source: variance of a sum of independent errors.
    """
    local = sigma_from_le90(relative_le90_m) / math.sqrt(2.0)
    return local, math.sqrt(max(sigma_from_le90(absolute_le90_m) ** 2 - local**2, 0.0))


_ALL_LOCAL = (
    "no relative accuracy is known to split it by, so all of it is taken as local: cautious where both sites stand on"
    " the model's own ground"
)
_OKSANEN = "upper end of the 0-120 m of Oksanen and Sarjakoski, Computers & Geosciences 31(8), 2005 (from memory)"
_CELLS = "three cells of the model; an assumption, no source"


def _split(absolute_le90_m: float, relative_le90_m: float, source: str, correlation_m: float) -> TerrainError:
    """Make a default of two published accuracies."""
    local, offset = (round(each, 2) for each in split_le90(absolute_le90_m, relative_le90_m))
    text = f"{source}: local sigma {local:g} m, offset sigma {offset:g} m"
    return TerrainError(local, offset, text, correlation_m, _OKSANEN)


def _all_local(sigma_m: float, source: str, correlation_m: float, correlation_source: str = _OKSANEN) -> TerrainError:
    """Make a default of one published error that nothing splits."""
    return TerrainError(sigma_m, 0.0, f"{source}; {_ALL_LOCAL}", correlation_m, correlation_source)


_SRTM = (
    "LE90 of 9 m absolute (North America) and 9.8 m relative (Africa), the greatest of six continents in Rodríguez,"
    " Morris and Belz, Photogrammetric Engineering & Remote Sensing 72(3), 2006 (from memory)"
)
_AZIZ = "RMSE against 7 757 GNSS points, northern Malaysia (Aziz et al., International Journal of Geoinformatics;"

TERRAIN_ERRORS = MappingProxyType(
    {
        "srtm-1": _split(9.0, 9.8, f"SRTM 1 arc-second: {_SRTM}", 120.0),
        "srtm-3": _split(9.0, 9.8, f"SRTM 3 arc-seconds, a mean of the 1 arc-second model: as that, {_SRTM}", 120.0),
        "nasadem": _all_local(3.7, f"NASADEM: 3.7 m {_AZIZ} from memory)", 120.0),
        "merit": _all_local(2.7, f"MERIT: 2.7 m {_AZIZ} from memory)", 270.0, _CELLS),
        "alos-w3d30": _all_local(
            5.4,
            "ALOS World 3D 30 m: 5.4 m RMSE in Nigeria (Apeh et al., Journal of Geographic Information System 11(2),"
            " 2019; from memory)",
            120.0,
        ),
        "copernicus-glo30": _split(
            4.0,
            4.0,
            "Copernicus GLO-30: stated LE90 under 4 m absolute, and under 4 m relative on slopes over 20 % (2 m on"
            " gentler ones; from memory); tree tops count as ground in forest",
            120.0,
        ),
        "usgs-10m": _all_local(
            1.55,
            "USGS 1/3 arc-second: 1.55 m RMSE over the conterminous United States in 2013, 0.82 m in 2022, by some"
            " 25 000 survey points on mostly open ground (USGS on the accuracy of 3DEP, from memory); the greater is"
            " taken, as a copy may be old",
            30.0,
            _CELLS,
        ),
        "lidar": _all_local(
            0.15,
            "airborne lidar of quality level 2: 29.4 cm at 95 % under vegetation (USGS Lidar Base Specification, from "
            "memory), divided by 1.96",
            10.0,
            "an assumption, no source",
        ),
    }
)
"""Default errors by kind of source. They are from other places than yours: a local comparison is always better."""
