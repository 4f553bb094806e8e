"""Places that ask for clearance: what the terminal, the figures and the documents all show."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from profiler.geometry import ROUNDING_M, HeldRule, earth_bulge, fresnel_radius, side_of, tight_places
from profiler.models import Profile, Rule
from profiler.path import PathLine, beside
from profiler.study.result import Place
from profiler.units import Float

__all__ = ["Tight", "find_places", "places_at"]

_BARE = Rule(k=np.inf, fresnel_fraction=0.0)

_FOOT_SHARE, _FOOT_LEAST_M, _FOOT_MOST_M = 0.03, 50.0, 300.0
"""How far the foot of a mast reaches, as a share of the path within bounds: so near, what the clearance tells is the
height of the mast (common practice, no source)."""

_RISE, _WITHIN = 0.2, 2.0
"""How far the surplus rises between two places, and how far above the tightest one still counts, in F1."""


@dataclass(frozen=True, slots=True)
class Tight:
    """Where one rule is tight; see `profiler.study.result.RuleResult`."""

    critical: Place
    places: tuple[Place, ...]
    feet: tuple[Place, Place]


def find_places(held: HeldRule, profile: Profile, line: PathLine, frequency_hz: float) -> Tight:
    """Find where one rule is tight, each place where it is tightest across the path.

    Where something is short, the separate places that are, the shortest first. Where all clears, the obstacles away
    from the masts' feet by their surplus in proportion to F1: a metre to spare under a wide zone is tighter than under
    a narrow one, and the least surplus of all is mostly the height of a mast.

    Parameters
    ----------
    held
        The rule held against the path and the width of its zone.
    profile, line, frequency_hz
        The ground on the path, the path, and the frequency.

    Returns
    -------
    Tight
    """
    surplus_m, distance_m, f1_m = held.least_surplus_m, profile.distance_m, held.check.f1_m
    length_m, widest_m = float(distance_m[-1]), float(f1_m.max())
    foot_m = min(max(_FOOT_SHARE * length_m, _FOOT_LEAST_M), _FOOT_MOST_M, length_m / 4)
    from_a, from_b = np.flatnonzero(distance_m <= foot_m), np.flatnonzero(distance_m >= length_m - foot_m)
    between = np.arange(from_a[-1] + 1, from_b[0])
    critical = int(np.argmin(surplus_m))
    if surplus_m[critical] < -ROUNDING_M or not between.size:
        found = list(tight_places(surplus_m, rise_m=max(2.0, _RISE * widest_m), within_m=_WITHIN * widest_m))
    else:
        found = between[list(tight_places(surplus_m[between] / f1_m[between], rise_m=_RISE, within_m=_WITHIN))].tolist()
    feet = (int(from_a[np.argmin(surplus_m[from_a])]), int(from_b[np.argmin(surplus_m[from_b])]))
    at = np.array([critical, *feet, *found])
    rows = (held.along_m, held.offset_m, held.surface_m, held.cover_m, held.least_surplus_m)
    critical_place, foot_a, foot_b, *places = places_at(
        *(each[at] for each in rows), profile=profile, line=line, frequency_hz=frequency_hz, rule=held.check.rule
    )
    return Tight(critical_place, tuple(places), (foot_a, foot_b))


def places_at(
    along_m: Float,
    offset_m: Float,
    surface_m: Float,
    cover_m: Float,
    surplus_m: Float,
    *,
    profile: Profile,
    line: PathLine,
    frequency_hz: float,
    rule: Rule | None,
) -> tuple[Place, ...]:
    """Describe places on the path or beside it under a rule (None: bare ground, for which no more is asked).

    Parameters
    ----------
    along_m, offset_m, surface_m, cover_m
        Where they are, (m,), their surface above the datum and how much of that is cover.
    surplus_m
        What the ray has over what the rule asks for there, (m,).
    profile, line, frequency_hz, rule
        The ground on the path, the path, the frequency and the rule.

    Returns
    -------
    tuple of Place
    """
    asked = rule or _BARE
    remaining_m = np.maximum(line.distance_m - along_m, 0.0)
    f1_m = fresnel_radius(along_m, remaining_m, frequency_hz)
    required_m = np.sqrt(np.maximum((asked.fresnel_fraction * f1_m) ** 2 - offset_m**2, 0.0)) + asked.margin_m
    clearance_m = surplus_m + required_m
    longitude, latitude = beside(line, along_m, offset_m)
    index = np.abs(profile.distance_m - along_m[:, None]).argmin(axis=1)
    numbers = {
        "index": index,
        "distance_m": along_m,
        "offset_m": offset_m,
        "longitude": longitude,
        "latitude": latitude,
        "ground_m": surface_m - cover_m,
        "cover_m": cover_m,
        "filled": profile.filled[index] & (offset_m == 0.0),
        "bulge_m": earth_bulge(along_m, remaining_m, asked.k),
        "f1_m": f1_m,
        "clearance_m": clearance_m,
        "required_m": required_m,
        "surplus_m": surplus_m,
        "ratio": np.divide(clearance_m, f1_m, out=np.full_like(f1_m, np.nan), where=f1_m > 0),
    }
    rows = zip(*(each.tolist() for each in numbers.values()), strict=True)
    found = [dict(zip(numbers, row, strict=True)) for row in rows]
    return tuple(Place(side=side_of(each["offset_m"]), **each) for each in found)
