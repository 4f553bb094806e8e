"""Where a rule is tight: the places that the terminal, the figure and the document all show."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from profiler.geometry import ROUNDING_M, CorridorCheck, RuleCheck, side_of, tight_places
from profiler.models import Profile
from profiler.path import PathLine, beside
from profiler.study.result import Corridor, Place

__all__ = ["Tight", "find_places"]

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


def find_places(
    check: RuleCheck, across: CorridorCheck | None, profile: Profile, corridor: Corridor | None, line: PathLine
) -> Tight:
    """Find where one rule is tight, each place where it is tightest across the path.

    Where something is short, the separate places that are, the shortest first. Where all clears, the obstacles away
    from the masts' feet by their surplus in proportion to F1: a metre to spare under a wide zone is tighter than under
    a narrow one, and the least surplus of all is mostly the height of a mast.

    Parameters
    ----------
    check, across
        The rule held against the path and, where it asks for some of the zone, against the width of that.
    profile, corridor, line
        The ground on the path and beside it, and the path.

    Returns
    -------
    Tight
    """
    surplus_m = check.surplus_m if across is None else np.minimum(check.surplus_m, across.least_surplus_m)
    distance_m, f1_m = profile.distance_m, check.f1_m
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
    critical_place, foot_a, foot_b, *places = (
        _place(int(index), check, across, profile, corridor, line) for index in (critical, *feet, *found)
    )
    return Tight(critical_place, tuple(places), (foot_a, foot_b))


def _place(
    index: int,
    check: RuleCheck,
    across: CorridorCheck | None,
    profile: Profile,
    corridor: Corridor | None,
    line: PathLine,
) -> Place:
    """Describe one distance, where across the path it is tightest there."""
    offset_m, surplus_m = 0.0, float(check.surplus_m[index])
    longitude, latitude = float(profile.longitude[index]), float(profile.latitude[index])
    surface_m, cover_m = float(profile.surface_m[index]), float(profile.cover_m[index])
    if across is not None:
        surplus_m = min(surplus_m, float(across.least_surplus_m[index]))
    if across is not None and corridor is not None and across.need.offset_m[index] != 0.0:
        offset_m = float(across.need.offset_m[index])
        longitude, latitude = beside(line, index, offset_m)
        surface_m = float(across.need.surface_m[index])
        cover_m = float(np.interp(offset_m, corridor.offset_m[index], corridor.cover_m[index]))
    # the ray's height over the bulge is the same across the path
    clearance_m = float(check.clearance_m[index]) + float(profile.surface_m[index]) - surface_m
    f1_m = float(check.f1_m[index])
    return Place(
        index=index,
        distance_m=float(profile.distance_m[index]),
        offset_m=offset_m,
        side=side_of(offset_m),
        longitude=longitude,
        latitude=latitude,
        ground_m=surface_m - cover_m,
        cover_m=cover_m,
        filled=bool(profile.filled[index]) and offset_m == 0.0,
        bulge_m=float(check.bulge_m[index]),
        f1_m=f1_m,
        clearance_m=clearance_m,
        required_m=clearance_m - surplus_m,
        surplus_m=surplus_m,
        ratio=clearance_m / f1_m if f1_m > 0 else float("nan"),
    )
