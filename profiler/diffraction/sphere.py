"""Diffraction over the smooth spherical earth: the first-term residue, and its way down to nothing in line of sight."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from profiler.checks import not_negative, positive, within
from profiler.errors import InputError
from profiler.units import Float, wavelength

__all__ = ["check_surface", "spherical_earth"]


class _Surface(NamedTuple):
    permittivity: float
    conductivity_s_m: float
    vertical_alike_hz: float
    """Above it β is 1 for vertical polarization too."""


class _Path(NamedTuple):
    distance_m: Float
    height_a_m: Float
    height_b_m: Float
    frequency_hz: Float


_LAND = _Surface(22.0, 0.003, 20e6)
_SEA = _Surface(80.0, 5.0, 300e6)
"""Rec. ITU-R P.526-15 §3.1.1.1 (β) and §4.5 (the electrical constants, as in P.452 and P.1812)."""

_FLAT_M = 1e15
"""Stands for an infinite radius in the residue: the loss tends to a limit, which it has reached long before."""


def check_surface(polarization: str, sea_fraction: ArrayLike) -> Float:
    """Return `sea_fraction` as float64 once it and the polarization are allowed; else raise InputError."""
    if polarization not in ("horizontal", "vertical"):
        raise InputError(f"polarization = {polarization!r}: must be 'horizontal' or 'vertical'")
    return within("sea_fraction", sea_fraction, 0, 1, "0 (all land) to 1 (all sea)")


def _height_gain(reduced: Float, admittance: Float) -> Float:
    """Height gain G in dB of an end at reduced height B = β·Y over a surface of normalised admittance K."""
    high = np.maximum(reduced, 2.0) - 1.1
    low = np.minimum(reduced, 2.0)
    with np.errstate(divide="ignore"):  # an end on the ground has no gain at all: the floor below takes over
        gain = np.where(
            reduced > 2.0,
            17.6 * np.sqrt(high) - 5.0 * np.log10(high) - 8.0,
            20.0 * np.log10(low + 0.1 * low**3),
        )
    return np.asarray(np.maximum(gain, 2.0 + 20.0 * np.log10(admittance)))


def _first_term_over(surface: _Surface, path: _Path, radius_m: Float, polarization: str) -> Float:
    """First-term loss −F(X) − G(Y1) − G(Y2) in dB over one kind of surface."""
    distance, height_a, height_b, frequency = path
    lam = wavelength(frequency)
    conduction = (18.0 * surface.conductivity_s_m / (frequency / 1e9)) ** 2
    k = 0.036 * np.cbrt(1e12 / (radius_m * frequency)) * ((surface.permittivity - 1.0) ** 2 + conduction) ** -0.25
    if polarization == "vertical":
        k = k * np.sqrt(surface.permittivity**2 + conduction)
    k2 = k * k
    beta = (1.0 + 1.6 * k2 + 0.67 * k2 * k2) / (1.0 + 4.5 * k2 + 1.53 * k2 * k2)
    if polarization == "horizontal":
        beta = np.ones_like(k)
    beta = np.where(frequency > surface.vertical_alike_hz, 1.0, beta)
    x = beta * np.cbrt(np.pi / (lam * radius_m * radius_m)) * distance
    f_x = np.where(
        x >= 1.6,
        11.0 + 10.0 * np.log10(x) - 17.6 * x,
        -20.0 * np.log10(x) - 5.6488 * x**1.425,
    )
    reduced = 2.0 * beta * beta * np.cbrt(np.pi * np.pi / (lam * lam * radius_m))
    return np.asarray(-f_x - _height_gain(reduced * height_a, k) - _height_gain(reduced * height_b, k))


def _first_term(path: _Path, radius_m: Float, polarization: str, sea_fraction: Float) -> Float:
    """First-term loss in dB over a path part land, part sea: the two losses in proportion."""
    radius = np.minimum(radius_m, _FLAT_M)
    loss = np.zeros(())
    if (sea_fraction < 1.0).any():
        loss = loss + (1.0 - sea_fraction) * _first_term_over(_LAND, path, radius, polarization)
    if (sea_fraction > 0.0).any():
        loss = loss + sea_fraction * _first_term_over(_SEA, path, radius, polarization)
    return loss


def _clear_fraction(distance: Float, height_a: Float, height_b: Float, radius: Float, lam: Float) -> Float:
    """Clearance at the point of reflection, over the clearance that leaves no loss, on a line-of-sight path."""
    both = height_a + height_b
    safe = np.where(both > 0, both, 1.0)
    c = (height_a - height_b) / safe
    m = np.minimum(distance * distance / (4.0 * radius * safe), 1.0)  # more only beyond the horizon, where unused
    # cos(π/3 + arccos(z)/3) = sin(arcsin(z)/3), which stays exact as the earth flattens; |z|, |b| exceed 1 by rounding
    z = np.clip(1.5 * c * np.sqrt(3.0 * m / (m + 1.0) ** 3), -1.0, 1.0)
    with np.errstate(divide="ignore", invalid="ignore"):
        b = np.where(m > 0, 2.0 * np.sqrt((m + 1.0) / (3.0 * m)) * np.sin(np.arcsin(z) / 3.0), c)
    b = np.clip(b, -1.0, 1.0)
    d1, d2 = distance / 2.0 * (1.0 + b), distance / 2.0 * (1.0 - b)
    bulge_a, bulge_b = d1 * d1 / (2.0 * radius), d2 * d2 / (2.0 * radius)
    clearance = ((height_a - bulge_a) * d2 + (height_b - bulge_b) * d1) / distance
    enough = 0.552 * np.sqrt(d1 * d2 * lam / distance)
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.asarray(np.where(enough > 0, clearance / enough, np.where(clearance > 0, np.inf, 0.0)))


def spherical_earth(
    distance_m: ArrayLike,
    height_a_m: ArrayLike,
    height_b_m: ArrayLike,
    frequency_hz: ArrayLike,
    effective_radius_m: ArrayLike,
    polarization: str = "vertical",
    sea_fraction: ArrayLike = 0.0,
) -> Float:
    """Diffraction loss over the smooth spherical earth.

    Beyond the horizon, d ≥ sqrt(2a)(√h1 + √h2): the first term of the residue series, −F(X) − G(Y1) − G(Y2). Nearer:
    0 dB where the ray clears the point of reflection by 0.552 of the Fresnel radius there (h_req); else the first term
    for the radius that would put the horizon at the far end, times 1 − h/h_req, and not below 0.

    Parameters
    ----------
    distance_m
        Path length, m, above 0.
    height_a_m, height_b_m
        Heights of the antennas above the smooth earth, m, 0 or more.
    frequency_hz
        Frequency, Hz; the source states 10 MHz and above.
    effective_radius_m
        Effective earth radius k·R, m, above 0; may be infinite.
    polarization
        ``"vertical"`` or ``"horizontal"``.
    sea_fraction
        Part of the path over sea, 0 to 1; the losses over sea (εr 80, 5 S/m) and land (εr 22, 0.003 S/m) are mixed in
        that proportion.

    Returns
    -------
    ndarray
        Loss over free space, dB, the broadcast shape of the inputs.

    Raises
    ------
    InputError
        A parameter is outside its range.

    Examples
    --------
    >>> round(float(spherical_earth(80e3, 30.0, 30.0, 6e9, 8500e3)), 1)
    69.8
    >>> float(spherical_earth(20e3, 50.0, 50.0, 6e9, 8500e3))
    0.0

    Notes
    -----
    Source: Rec. ITU-R P.526-15 §3.1.1 and §3.2 (from memory); the mixing of land and sea from P.452 and P.1812. As
    §3.1.1 allows, and as the published validation examples do, β is 1 for horizontal polarization, and for vertical
    above 20 MHz over land and 300 MHz over sea; P.452 takes it from K there too, which adds 0.02 dB at 150 MHz.
    """
    distance = positive("distance_m", distance_m, "m")
    height_a = not_negative("height_a_m", height_a_m, "m")
    height_b = not_negative("height_b_m", height_b_m, "m")
    frequency = positive("frequency_hz", frequency_hz, "Hz")
    radius = positive("effective_radius_m", effective_radius_m, "m", infinite=True)
    sea = check_surface(polarization, sea_fraction)

    roots = np.sqrt(height_a) + np.sqrt(height_b)
    with np.errstate(divide="ignore", invalid="ignore"):  # both ends on the ground, or a flat earth: limits, not faults
        beyond = distance >= np.sqrt(2.0 * radius) * roots
        horizon_radius = 0.5 * (distance / roots) ** 2
    fraction = _clear_fraction(distance, height_a, height_b, radius, wavelength(frequency))
    path = _Path(distance, height_a, height_b, frequency)
    loss = _first_term(path, np.asarray(np.where(beyond, radius, horizon_radius)), polarization, sea)
    return np.asarray(np.where(beyond, loss, np.maximum(loss, 0.0) * np.clip(1.0 - fraction, 0.0, 1.0)))
