"""Where a rule is tight: the places that the terminal, the figure and the document all show."""

from __future__ import annotations

import numpy as np

from profiler.geometry import CorridorCheck, RuleCheck, side_of, tight_places
from profiler.models import Profile
from profiler.path import PathLine, beside
from profiler.study.result import Corridor, Place

__all__ = ["find_places"]


def find_places(
    check: RuleCheck, across: CorridorCheck | None, profile: Profile, corridor: Corridor | None, line: PathLine
) -> tuple[Place, ...]:
    """Find the separate tight places of one rule, tightest first, each where it is tightest across the path.

    Parameters
    ----------
    check, across
        The rule held against the path and, where it asks for some of the zone, against the width of that.
    profile, corridor, line
        The ground on the path and beside it, and the path.

    Returns
    -------
    tuple of Place
        At least one: the critical place.
    """
    surplus_m = check.surplus_m if across is None else np.minimum(check.surplus_m, across.least_surplus_m)
    widest_m = float(check.f1_m.max())
    found = tight_places(surplus_m, rise_m=max(2.0, 0.2 * widest_m), within_m=2.0 * widest_m)
    return tuple(_place(int(index), check, across, profile, corridor, line) for index in found)


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
