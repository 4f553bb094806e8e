"""The multipath method chosen by name: which numbers it needs, where they come from, what it gives."""

from __future__ import annotations

from collections.abc import Mapping
from contextlib import suppress
from dataclasses import dataclass, replace
from typing import get_args

from profiler.availability.facts import PathFacts
from profiler.availability.fitted_ranges import p530_warnings, vigants_warnings
from profiler.availability.multipath import (
    geoclimatic_factor_17,
    geoclimatic_factor_17_quick,
    occurrence_17,
    occurrence_17_quick,
    occurrence_18,
    year_conversion,
)
from profiler.availability.notes import InputUsed, Notes
from profiler.availability.vigants import climate_factor, occurrence_vigants, season_share
from profiler.errors import InputError
from profiler.models import AvailabilityChoice, MultipathMethod

__all__ = ["GIVEN", "MultipathFading", "NumberNotGivenError", "fadings_side_by_side", "multipath_fading"]


class NumberNotGivenError(InputError):
    """A number that the multipath method cannot do without is not there."""


GIVEN = "given"
"""Source of a number for which the caller names none."""

_YEAR_SOURCE = "Rec. ITU-R P.530-17 §2.3.4"


@dataclass(frozen=True, slots=True)
class MultipathFading:
    """The occurrence factor p0 of the worst month, percent, and what the year has of it as a share."""

    occurrence_percent: float
    year_share: float
    notes: Notes


def _needed(choice: AvailabilityChoice, field: str, method: str, remedy: str) -> float:
    """Give the number of the choice that the method cannot do without."""
    value = getattr(choice, field)
    if value is None:
        raise NumberNotGivenError(f"{field} = not given: must be given for multipath_method {method}; {remedy}")
    return float(value)


def _factor_17(choice: AvailabilityChoice, sources: Mapping[str, str]) -> tuple[float, Notes]:
    """K of P.530-17, given or by its formula, for either form."""
    method = choice.multipath_method
    if choice.geoclimatic_factor is not None:
        used = InputUsed("geoclimatic_factor", choice.geoclimatic_factor, sources.get("geoclimatic_factor", GIVEN))
        return choice.geoclimatic_factor, Notes((used,))
    dn1 = _needed(choice, "dn1_n_km", method, "give dn1_n_km or geoclimatic_factor, or let the climate maps fill it")
    used = InputUsed("dn1_n_km", dn1, sources.get("dn1_n_km", GIVEN))
    if method == "p530-17-quick":
        factor = float(geoclimatic_factor_17_quick(dn1))
        formula = InputUsed("geoclimatic_factor", factor, "Rec. ITU-R P.530-17 §2.3.1, quick planning, from dn1_n_km")
        return factor, Notes((used, formula))
    remedy = "give terrain_roughness_m or geoclimatic_factor, terrain over the 110 km box, or choose p530-17-quick"
    roughness = _needed(choice, "terrain_roughness_m", method, remedy)
    factor = float(geoclimatic_factor_17(dn1, roughness))
    rough = InputUsed("terrain_roughness_m", roughness, sources.get("terrain_roughness_m", GIVEN))
    source = "Rec. ITU-R P.530-17 §2.3.1, detailed design, from dn1_n_km and terrain_roughness_m"
    return factor, Notes((used, rough, InputUsed("geoclimatic_factor", factor, source)))


def _p530_year(path: PathFacts) -> tuple[float, Notes]:
    """Share of the worst month's occurrence that the year has, by P.530 §2.3.4."""
    conversion_db = float(year_conversion(path.distance_m, path.inclination_mrad, path.latitude))
    return 10.0 ** (-conversion_db / 10.0), Notes((InputUsed("year_conversion_db", conversion_db, _YEAR_SOURCE),))


def _fading_17(path: PathFacts, choice: AvailabilityChoice, sources: Mapping[str, str]) -> MultipathFading:
    """P.530-17, detailed or quick."""
    factor, notes = _factor_17(choice, sources)
    occurrence = occurrence_17 if choice.multipath_method == "p530-17" else occurrence_17_quick
    p0 = float(
        occurrence(path.distance_m, path.frequency_hz, path.centre_a_m, path.centre_b_m, geoclimatic_factor=factor)
    )
    source = f"Rec. ITU-R P.530-17 §2.3.1, {'detailed design' if occurrence is occurrence_17 else 'quick planning'}"
    share, year = _p530_year(path)
    notes += Notes((InputUsed("multipath_occurrence_percent", p0, source),), outside_fit=p530_warnings(path, choice))
    return MultipathFading(p0, share, notes + year)


def _fading_18(path: PathFacts, choice: AvailabilityChoice, sources: Mapping[str, str]) -> MultipathFading:
    """P.530-18, with K and dN75 given."""
    remedy = "read it from the maps that come with Rec. ITU-R P.530-18"
    factor = _needed(choice, "geoclimatic_factor", "p530-18", remedy)
    dn75 = _needed(choice, "dn75_n_km", "p530-18", remedy)
    if path.mean_ground_m is None:
        raise NumberNotGivenError("mean_ground_m = not given: must be given for multipath_method p530-18")
    p0 = float(
        occurrence_18(
            path.distance_m,
            path.frequency_hz,
            path.centre_a_m,
            path.centre_b_m,
            geoclimatic_factor=factor,
            dn75_n_km=dn75,
            mean_ground_m=path.mean_ground_m,
        )
    )
    used = (
        InputUsed("geoclimatic_factor", factor, sources.get("geoclimatic_factor", GIVEN)),
        InputUsed("dn75_n_km", dn75, sources.get("dn75_n_km", GIVEN)),
        InputUsed("mean_ground_m", path.mean_ground_m, sources.get("mean_ground_m", "mean ground of the profile")),
        InputUsed("multipath_occurrence_percent", p0, "Rec. ITU-R P.530-18 §2.3.1"),
    )
    untested = (
        "multipath by P.530-18: its formula was read from one implementation that calls itself untested, and no "
        "published value has been held against it; compare with p530-17"
    )
    kept = "P.530-18 is taken to keep the shallow fading (§2.3.2) and the year conversion (§2.3.4) of P.530-17"
    share, year = _p530_year(path)
    return MultipathFading(p0, share, Notes(used, (kept,), (untested,), p530_warnings(path, choice)) + year)


def _vigants_factor(
    path: PathFacts, choice: AvailabilityChoice, sources: Mapping[str, str]
) -> tuple[float, tuple[InputUsed, ...]]:
    """Factor c of Vigants-Barnett: given whole, or from the climate's name and the roughness of the path's ground."""
    if choice.climate_factor is not None:
        return choice.climate_factor, (
            InputUsed("climate_factor", choice.climate_factor, sources.get("climate_factor", GIVEN)),
        )
    if choice.climate is None or path.ground_roughness_m is None:
        raise NumberNotGivenError(
            "climate_factor = not given: must be given for multipath_method vigants-barnett; give it, or the climate "
            "(humid, average, dry) with the roughness of the path's ground"
        )
    factor = float(climate_factor(choice.climate, path.ground_roughness_m))
    roughness_source = sources.get("ground_roughness_m", "profile: ground at one-mile steps, ends left out")
    return factor, (
        InputUsed("ground_roughness_m", path.ground_roughness_m, roughness_source),
        InputUsed("climate_factor", factor, f"Vigants (BSTJ 1975), {choice.climate} climate with ground_roughness_m"),
    )


def _fading_vigants(path: PathFacts, choice: AvailabilityChoice, sources: Mapping[str, str]) -> MultipathFading:
    """Vigants-Barnett, with its fading season for the year."""
    factor, used = _vigants_factor(path, choice, sources)
    p0 = float(occurrence_vigants(path.distance_m, path.frequency_hz, factor))
    share = float(season_share(choice.annual_temperature_k))
    temperature: tuple[InputUsed, ...] = ()
    assumptions = ["Vigants-Barnett is for deep fades; shallow ones follow Rec. ITU-R P.530-17 §2.3.2 from its p0"]
    if choice.annual_temperature_k is None:
        assumptions.append("Vigants-Barnett: fading season of 8e6 s a year (three months), its value at 50 °F (283 K)")
    else:
        source = sources.get("annual_temperature_k", GIVEN)
        temperature = (InputUsed("annual_temperature_k", choice.annual_temperature_k, source),)
    found = (
        InputUsed("multipath_occurrence_percent", p0, "Barnett (BSTJ 1972), 100 x 6.0e-7·c·f·d³"),
        InputUsed("season_share", share, "Vigants (BSTJ 1975), T0 = (t/50 °F)·8e6 s over the year"),
    )
    notes = Notes((*used, *temperature, *found), tuple(assumptions), outside_fit=vigants_warnings(path, choice))
    return MultipathFading(p0, share, notes)


def multipath_fading(path: PathFacts, choice: AvailabilityChoice, sources: Mapping[str, str]) -> MultipathFading:
    """Occurrence of multipath in the worst month and its share in the year, by the method of the choice.

    Parameters
    ----------
    path
        The path.
    choice
        Method by name, and the climate numbers it needs.
    sources
        Where numbers came from, by the name of their field; ``"given"`` for what it does not name.

    Returns
    -------
    MultipathFading
        With every number used, and the warnings of the method's ranges.

    Raises
    ------
    InputError
        If the method is unknown or a number it needs is not there.

    Examples
    --------
    >>> path = PathFacts(40e3, 7e9, 300.0, 400.0, latitude=45.0)
    >>> choice = AvailabilityChoice("p530-17", dn1_n_km=-300.0, terrain_roughness_m=90.0)
    >>> round(multipath_fading(path, choice, {}).occurrence_percent, 2)
    6.68
    """
    methods = {
        "p530-17": _fading_17,
        "p530-17-quick": _fading_17,
        "p530-18": _fading_18,
        "vigants-barnett": _fading_vigants,
    }
    if choice.multipath_method not in methods:
        allowed = ", ".join(get_args(MultipathMethod))
        raise InputError(f"multipath_method = {choice.multipath_method}: must be {allowed}")
    return methods[choice.multipath_method](path, choice, sources)


def fadings_side_by_side(
    path: PathFacts, choice: AvailabilityChoice, sources: Mapping[str, str]
) -> dict[MultipathMethod, MultipathFading]:
    """Occurrence of multipath by every method whose numbers are known; that of the choice must be among them.

    A geoclimatic factor that is given is that of the chosen method: no other takes it.

    Parameters
    ----------
    path, choice, sources
        As in `multipath_fading`.

    Returns
    -------
    dict
        By the name of the method, that of the choice first.

    Raises
    ------
    InputError
        As `multipath_fading` for the method of the choice.

    Examples
    --------
    >>> path = PathFacts(40e3, 7e9, 300.0, 400.0, latitude=45.0)
    >>> choice = AvailabilityChoice("p530-17", dn1_n_km=-300.0, terrain_roughness_m=90.0, climate_factor=1.0)
    >>> found = fadings_side_by_side(path, choice, {})
    >>> {method: round(fading.occurrence_percent, 2) for method, fading in found.items()}
    {'p530-17': 6.68, 'p530-17-quick': 7.65, 'vigants-barnett': 26.88}
    """
    found = {choice.multipath_method: multipath_fading(path, choice, sources)}
    for method in get_args(MultipathMethod):
        if method not in found:
            with suppress(NumberNotGivenError):
                other = replace(choice, multipath_method=method, geoclimatic_factor=None)
                found[method] = multipath_fading(path, other, sources)
    return found
