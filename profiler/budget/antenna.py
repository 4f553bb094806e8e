"""Antenna gain: given, or of a dish; and from where on it holds."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike

from profiler.checks import finite, positive, within
from profiler.errors import InputError
from profiler.models import Terminal
from profiler.receiver import Line
from profiler.remarks import Length, Note, note
from profiler.units import AGREEMENT_DB, Float, db_from_ratio, ratio_from_db, wavelength

__all__ = ["antenna_gain", "dish_diameter", "dish_gain", "far_field_distance", "near_field_warnings"]


def dish_gain(diameter_m: ArrayLike, efficiency: ArrayLike, frequency_hz: ArrayLike) -> Float:
    """Gain of a circular aperture on its axis, G = 10·log10(η·(π·D/λ)²).

    Parameters
    ----------
    diameter_m
        Diameter, m, above 0, any shape; many wavelengths for the formula to hold.
    efficiency
        Aperture efficiency η, above 0 and at most 1; broadcast.
    frequency_hz
        Frequency, Hz, above 0; broadcast.

    Returns
    -------
    ndarray
        Gain in dBi.

    Raises
    ------
    InputError
        For a value outside its range.

    Examples
    --------
    >>> round(float(dish_gain(1.8, 0.55, 6.175e9)), 1)
    38.7
    >>> round(float(dish_gain(3.6, 0.55, 6.175e9) - dish_gain(1.8, 0.55, 6.175e9)), 2)  # doubled
    6.02

    Notes
    -----
    Source: Friis, Proceedings of the IRE 34(5), 1946 (effective area); Rec. ITU-R F.699-8 rounds it, at η = 0.6, to
    20·log10(D/λ) + 7.7 (from memory).
    """
    widths = positive("diameter_m", diameter_m, "m") / wavelength(positive("frequency_hz", frequency_hz, "Hz"))
    return db_from_ratio(_efficiency(efficiency) * (np.pi * widths) ** 2)


def dish_diameter(gain_dbi: ArrayLike, efficiency: ArrayLike, frequency_hz: ArrayLike) -> Float:
    """Diameter in metres of the dish that has a gain; the inverse of `dish_gain`.

    Parameters
    ----------
    gain_dbi
        Wanted gain, dBi, any shape.
    efficiency, frequency_hz
        As `dish_gain`.

    Returns
    -------
    ndarray
        Diameter, m.

    Raises
    ------
    InputError
        For a value outside its range.

    Examples
    --------
    >>> round(float(dish_diameter(38.7, 0.55, 6.175e9)), 2)
    1.79
    """
    gain, frequency = finite("gain_dbi", gain_dbi, "dBi"), positive("frequency_hz", frequency_hz, "Hz")
    return np.asarray(wavelength(frequency) / np.pi * np.sqrt(ratio_from_db(gain) / _efficiency(efficiency)))


def _efficiency(efficiency: ArrayLike) -> Float:
    return within("efficiency", efficiency, 0, 1, "more than 0 and at most 1", above=True)


def far_field_distance(diameter_m: ArrayLike, frequency_hz: ArrayLike) -> Float:
    """Distance in metres from which on an aperture's gain and the free-space formula hold, 2·D²/λ.

    Parameters
    ----------
    diameter_m, frequency_hz
        As `dish_gain`.

    Returns
    -------
    ndarray
        Distance, m.

    Raises
    ------
    InputError
        For a value outside its range.

    Examples
    --------
    >>> round(float(far_field_distance(3.0, 6e9)))
    360

    Notes
    -----
    Source: IEEE Std 145-2013, "far-field region" (from memory).
    """
    diameter, frequency = positive("diameter_m", diameter_m, "m"), positive("frequency_hz", frequency_hz, "Hz")
    return np.asarray(2.0 * diameter**2 / wavelength(frequency))


def antenna_gain(terminal: Terminal, frequency_hz: float, end: str) -> Line:
    """Gain of one end's antenna, as given or from its dish.

    Parameters
    ----------
    terminal
        Gives the gain, or diameter and efficiency; if all three, they must agree within 0.05 dB.
    frequency_hz
        Frequency, Hz.
    end
        "A" or "B", for the line's name and the messages.

    Returns
    -------
    Line
        In dBi, with a note that names the antenna where it has a name, and says where the gain comes from.

    Raises
    ------
    InputError
        If nothing gives a gain, two statements of it disagree, or it is more than an ideal dish of that diameter has.

    Examples
    --------
    >>> str(antenna_gain(Terminal(power_dbm=30, diameter_m=1.8, efficiency=0.55), 6.175e9, "A").note)
    'dish 1.80 m, efficiency 0.55: 10·log10(η·(π·D/λ)²), Friis 1946'
    >>> antenna_gain(Terminal(power_dbm=30, gain_dbi=38.9, model="6 ft, shielded"), 6.175e9, "A").note
    '6 ft, shielded: as given'
    """
    gain, diameter, efficiency = terminal.gain_dbi, terminal.diameter_m, terminal.efficiency
    name, model = f"antenna gain {end}", f"{terminal.model}: " if terminal.model else ""
    if gain is None:
        if diameter is None or efficiency is None:
            raise InputError(f"terminal {end}: no antenna gain: give the gain in dBi, or dish diameter and efficiency")
        words = f"{{}}dish {{}}, efficiency {efficiency:g}: 10·log10(η·(π·D/λ)²), Friis 1946"
        by = note("budget", words, model, Length(diameter, 2))
        return Line(name, float(dish_gain(diameter, efficiency, frequency_hz)), "dBi", by)
    if diameter is not None:
        _require_possible(gain, diameter, efficiency, frequency_hz, end)
    return Line(name, float(gain), "dBi", f"{model}as given")


def near_field_warnings(ends: dict[str, float | None], distance_m: float, frequency_hz: float) -> tuple[Note, ...]:
    """Say for each end (its dish diameter in m, None if unknown) whether the far one is nearer than its far field."""
    warnings = []
    for end, diameter_m in ends.items():
        if diameter_m is None:
            continue
        limit_m = float(far_field_distance(diameter_m, frequency_hz))
        if distance_m < limit_m:
            warnings.append(
                note(
                    "budget",
                    f"the distance of {{}} is nearer than the far field of the {{}} antenna at {end}: its gain and the"
                    " free-space loss hold from 2·D²/λ = {} on (IEEE Std 145)",
                    Length(distance_m),
                    Length(diameter_m, 2),
                    Length(limit_m, 0),
                )
            )
    return tuple(warnings)


def _require_possible(
    gain_dbi: float, diameter_m: float, efficiency: float | None, frequency_hz: float, end: str
) -> None:
    """Stop if a given gain contradicts the given dish."""
    most_dbi = float(dish_gain(diameter_m, 1.0, frequency_hz))
    if efficiency is None:
        if gain_dbi > most_dbi + AGREEMENT_DB:
            raise InputError(
                f"terminal {end}: gain {gain_dbi:g} dBi: must be at most {most_dbi:.2f} dBi, what a {diameter_m:g} m "
                "dish has at efficiency 1; check both"
            )
        return
    dish_dbi = float(dish_gain(diameter_m, efficiency, frequency_hz))
    if abs(gain_dbi - dish_dbi) > AGREEMENT_DB:
        raise InputError(
            f"terminal {end}: gain {gain_dbi:g} dBi as given and {dish_dbi:.2f} dBi from the {diameter_m:g} m dish at "
            f"efficiency {efficiency:g}: must agree within {AGREEMENT_DB:g} dB; leave the gain or the efficiency out"
        )
