"""Where a method's published range is left: a line that says so, and what was done about it."""

from __future__ import annotations

from profiler.availability.facts import PathFacts
from profiler.availability.vigants import ROUGHNESS_RANGE_M, SEASON_TEMPERATURE_RANGE_K
from profiler.models import AvailabilityChoice

__all__ = ["diversity_within_fit", "p530_warnings", "rain_warnings", "vigants_warnings"]

_GRAZING_DB = 6.0
"""Loss over a knife edge that touches the ray, Rec. ITU-R P.526-15 §4.1."""


def _outside(what: str, value: float, low: float, high: float, unit: str, source: str) -> tuple[str, ...]:
    """One line if the value is outside the range, none if inside."""
    if low <= value <= high:
        return ()
    return (
        f"{what} = {value:g} {unit}: outside the {low:g} to {high:g} {unit} of {source}; its formula was carried on",
    )


def _blocked(path: PathFacts, law: str) -> tuple[str, ...]:
    """Warn where the ground stands in the ray at the median k: the methods are fits to links that are clear of it."""
    loss_db = path.median_loss_db
    if loss_db is None or loss_db <= _GRAZING_DB:
        return ()
    return (
        f"diffraction at the median k = {loss_db:.1f} dB: more than the {_GRAZING_DB:g} dB of an edge that touches the "
        f"ray, and {law} is for paths clear of the ground; do not rely on its outage",
    )


def p530_warnings(path: PathFacts, choice: AvailabilityChoice) -> tuple[str, ...]:
    """Ranges of the data behind the multipath methods of P.530.

    Notes
    -----
    Source: Rec. ITU-R P.530-17 §2.3.1 (from memory): 251 links of 7.5 to 185 km, 450 MHz to 37 GHz and expected to hold
    to at least 45 GHz, inclinations to 37 mrad, lower antennas 17 to 2300 m, dN1 -860 to -150 N/km, sa 6 to 850 m;
    lowest frequency about 15/d. Those of P.530-18 are not at hand: the same are held against it.
    """
    law = "multipath by Rec. ITU-R P.530-17 §2.3.1"
    if choice.multipath_method == "p530-18":
        law += " (P.530-18's own range is not at hand)"
    distance = _outside("distance", path.distance_km, 7.5, 185.0, "km", law)
    if path.distance_km <= 5.0:
        distance = (f"{distance[0]}; §2.3 lets multipath on paths of 5 km or less count as zero, which was not done",)
    warnings = (
        *_blocked(path, law),
        *distance,
        *_outside("frequency", path.frequency_ghz, 0.45, 45.0, "GHz", law),
        *_outside("path inclination", path.inclination_mrad, 0.0, 37.0, "mrad", law),
        *_outside("lower antenna", path.lower_centre_m, 17.0, 2300.0, "m above sea level", law),
    )
    if path.frequency_ghz < 15.0 / path.distance_km:
        lowest = f"frequency = {path.frequency_ghz:g} GHz: below the 15/d = {15 / path.distance_km:.3g} GHz of {law}"
        warnings += (f"{lowest}; its formula was carried on",)
    if choice.multipath_method == "p530-18" or choice.geoclimatic_factor is not None:
        return warnings
    if choice.dn1_n_km is not None:
        warnings += _outside("dn1_n_km", choice.dn1_n_km, -860.0, -150.0, "N/km", law)
    if choice.multipath_method == "p530-17" and choice.terrain_roughness_m is not None:
        used = f"{law}; below 1 m it counts as 1 m" if choice.terrain_roughness_m < 1.0 else law
        warnings += _outside("terrain_roughness_m", choice.terrain_roughness_m, 6.0, 850.0, "m", used)
    return warnings


def vigants_warnings(path: PathFacts, choice: AvailabilityChoice) -> tuple[str, ...]:
    """Ranges of the data behind Vigants-Barnett.

    Notes
    -----
    Source: CCIR Report 338 on paths of about 24 to 70 km at 2 to 11 GHz, Vigants (BSTJ 1975) on roughness and
    temperature; all from memory.
    """
    law = "Vigants-Barnett (from memory of CCIR Report 338)"
    warnings = (
        *_blocked(path, law),
        *_outside("distance", path.distance_km, 24.0, 70.0, "km", law),
        *_outside("frequency", path.frequency_ghz, 2.0, 11.0, "GHz", law),
    )
    nearer = "Vigants (BSTJ 1975); the nearer end was used"
    low, high = ROUGHNESS_RANGE_M
    roughness = path.ground_roughness_m
    if choice.climate_factor is None and roughness is not None and not low <= roughness <= high:
        warnings += (f"ground roughness = {roughness:.3g} m: outside the {low:.3g} to {high:.3g} m of {nearer}",)
    low, high = SEASON_TEMPERATURE_RANGE_K
    temperature = choice.annual_temperature_k
    if temperature is not None and not low <= temperature <= high:
        warnings += (f"annual_temperature_k = {temperature:g}: outside the {low:.1f} to {high:.1f} K of {nearer}",)
    return warnings


def rain_warnings(path: PathFacts) -> tuple[str, ...]:
    """Ranges of the rain method of P.530 and of the coefficients of P.838.

    Notes
    -----
    Source: Rec. ITU-R P.530-18 §2.4.1 ("at least for frequencies up to 100 GHz and path lengths up to 60 km"); Rec.
    ITU-R P.838-3.
    """
    law = "rain by Rec. ITU-R P.530-18 §2.4.1"
    return (
        *_outside("distance", path.distance_km, 0.0, 60.0, "km", law),
        *_outside("frequency", path.frequency_ghz, 1.0, 100.0, "GHz", f"{law} with P.838-3"),
    )


def diversity_within_fit(
    path: PathFacts, choice: AvailabilityChoice, spacing_m: float
) -> tuple[tuple[float, float, float], tuple[str, ...]]:
    """Distance, frequency and spacing by which space diversity is credited, and a line for each that leaves the fit.

    Where the formula of the multipath method carried on beyond its range would promise more than at the range's edge,
    the value of the edge stands; where it promises less, it is carried on.

    Notes
    -----
    Source of the ranges: Rec. ITU-R P.530-17 §6.2; CCIR Report 338 beside Vigants (BSTJ 1975); both from memory. Both
    laws grow with the spacing; P.530's grows with the distance and falls with the frequency, Vigants's the other way.
    """
    if choice.multipath_method == "vigants-barnett":
        law, distance, spacing, farther_is_more = "Vigants (BSTJ 1975)", (24.0, 70.0), (5.0, 15.0), False
    else:
        law, distance, spacing, farther_is_more = "Rec. ITU-R P.530-17 §6.2", (43.0, 240.0), (3.0, 23.0), True
    rows = (
        ("distance", path.distance_km, distance, "km", farther_is_more),
        ("frequency", path.frequency_ghz, (2.0, 11.0), "GHz", not farther_is_more),
        ("diversity spacing", spacing_m, spacing, "m", True),
    )
    credited, lines = [], []
    for what, value, (low, high), unit, more in rows:
        held = min(value, high) if more else max(value, low)
        credited.append(held)
        if not low <= value <= high:
            done = "its formula was carried on, which promises less" if held == value else f"taken as {held:g} {unit}"
            lines.append(
                f"{what} = {value:g} {unit}: outside the {low:g} to {high:g} {unit} of space diversity by {law}; {done}"
            )
    return (credited[0] * 1e3, credited[1] * 1e9, credited[2]), tuple(lines)
