"""Climate numbers of a place from the published ITU-R maps, through the optional ``climate`` extra (the itur package).

Nothing of the maps is in this project: each number is looked up in the installed package, with its source in words.
"""

from __future__ import annotations

import warnings
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from importlib import metadata
from types import ModuleType

import numpy as np

from profiler.errors import InputError, MissingExtraError
from profiler.remarks import Remark
from profiler.units import gradient_from_k, k_from_gradient

__all__ = ["Climate", "lookup"]

_PERCENTS = (0.1, 0.2, 0.5, 1, 2, 5, 10, 20, 30, 40, 50, 60, 70, 80, 90, 95, 98, 99, 99.5, 99.8, 99.9)
"""Percentages of the average year for which P.453-13 publishes a map of the gradient in the lowest kilometre."""

_TRAPPING_N_KM = float(gradient_from_k(np.inf))
"""Gradient at which a ray follows the earth, -157 N/km: there and below no positive k describes the path."""


@dataclass(frozen=True, slots=True)
class Climate:
    """What the maps say of one place, all for the average year.

    Attributes
    ----------
    longitude, latitude
        The place, WGS 84 degrees.
    rain_rate_r001_mm_h
        R0.01, the rain rate exceeded for 0.01 % of the year.
    dn1_n_km
        Refractivity gradient in the lowest 65 m that is not exceeded for 1 % of the year, N/km.
    k_median
        k of the median gradient in the lowest kilometre.
    k_percentiles
        Pairs (percent of the year that k is *not* exceeded, k), both ascending: the first pair is the low k, exceeded
        for 99.9 %. Percentages at which the gradient traps the ray are left out, as no k describes them.
    rain_source, dn1_source, k_source
        Recommendation, edition, layer and the package that gave the map behind the rain rate, dN1 and every k.
    warnings
        One line each on what a reader must know; empty if nothing.
    """

    longitude: float
    latitude: float
    rain_rate_r001_mm_h: float
    dn1_n_km: float
    k_median: float
    k_percentiles: tuple[tuple[float, float], ...]
    rain_source: str
    dn1_source: str
    k_source: str
    warnings: tuple[Remark, ...] = ()


@contextmanager
def _quiet() -> Iterator[None]:
    """Keep the package's warnings, and its change of numpy's error state on import, from the caller."""
    with warnings.catch_warnings(), np.errstate():
        warnings.simplefilter("ignore")
        yield


def _maps() -> tuple[ModuleType, ModuleType]:
    """Import the package's P.453 and P.837, or say what to install."""
    try:
        from itur.models import itu453, itu837
    except ImportError as error:
        raise MissingExtraError(
            f'climate numbers from the maps need the itur package ({error}): pip install "hopwright[climate]", '
            "or give the numbers in the hop file"
        ) from error
    return itu453, itu837


def _k_percentiles(gradients: tuple[tuple[float, float], ...]) -> tuple[tuple[float, float], ...]:
    """Turn gradients into k and the percentages round, low k first, without those that trap the ray.

    Examples
    --------
    >>> [(percent, round(k, 3)) for percent, k in _k_percentiles(((0.1, -160.0), (50, -39.0), (99.9, 0.0)))]
    [(0.1, 1.0), (50.0, 1.331)]
    """
    return tuple(
        (round(100.0 - percent, 1), float(k_from_gradient(gradient)))
        for percent, gradient in reversed(gradients)
        if gradient > _TRAPPING_N_KM
    )


def _trapping_warning(gradients: tuple[tuple[float, float], ...]) -> tuple[str, ...]:
    """Name the share of the year in which the lowest kilometre traps the ray, if the maps show any."""
    trapped = [percent for percent, gradient in gradients if gradient <= _TRAPPING_N_KM]
    if not trapped:
        return ()
    share = f"at or below {_TRAPPING_N_KM:g} N/km for {max(trapped):g} % of the average year or more"
    return (f"refractivity gradient {share}: rays are trapped then, and those percentiles of k are left out",)


def lookup(longitude: float, latitude: float) -> Climate:
    """Look up a place in the published maps of rain rate and refractivity gradient.

    R0.01 comes from Rec. ITU-R P.837-7, the gradients in the lowest 65 m (dN1) and in the lowest kilometre from Rec.
    ITU-R P.453-13, interpolated bilinearly between the grid points as both say; k = 157/(157 + dN/dh).

    Parameters
    ----------
    longitude
        Of the path's middle, WGS 84, -180 to 180 degrees.
    latitude
        Of the path's middle, WGS 84, -90 to 90 degrees.

    Returns
    -------
    Climate
        The numbers with their source in words.

    Raises
    ------
    InputError
        If the place is not on the earth.
    MissingExtraError
        If the ``climate`` extra is not installed.

    Examples
    --------
    >>> lookup(0.0, 95.0)
    Traceback (most recent call last):
    profiler.errors.InputError: latitude = 95: must be -90 to 90 degrees

    Notes
    -----
    These k are for the average year, at a point, from the mean gradient of a whole kilometre of height. The low k that
    Rec. ITU-R P.530 §2.2 asks for (exceeded for 99.9 % of the worst month, by path length) is another and lower one:
    do not put a percentile from here in its place. First call about 2 s, as the maps load; then milliseconds.
    """
    for name, value, limit in (("longitude", longitude, 180), ("latitude", latitude, 90)):
        if not -limit <= value <= limit:
            raise InputError(f"{name} = {value:g}: must be {-limit} to {limit} degrees")
    with _quiet():
        itu453, itu837 = _maps()
        rain_rate = float(itu837.rainfall_rate(latitude, longitude, 0.01).value)
        dn1 = float(itu453.DN65(latitude, longitude, 1).value)
        gradients = tuple((float(p), float(itu453.DN1(latitude, longitude, p).value)) for p in _PERCENTS)
        package = f"map of itur {metadata.version('itur')}"
        gradients_by = f"Rec. ITU-R P.453-{itu453.get_version()}"
        rain_source = f"R0.01 of Rec. ITU-R P.837-{itu837.get_version()}, {package}"
    return Climate(
        longitude=float(longitude),
        latitude=float(latitude),
        rain_rate_r001_mm_h=rain_rate,
        dn1_n_km=dn1,
        k_median=float(k_from_gradient(dict(gradients)[50.0])),
        k_percentiles=_k_percentiles(gradients),
        rain_source=rain_source,
        dn1_source=f"gradient in the lowest 65 m at 1 % of the year, {gradients_by}, {package}",
        k_source=f"gradients in the lowest kilometre over the year, {gradients_by}, {package}",
        warnings=_trapping_warning(gradients),
    )
