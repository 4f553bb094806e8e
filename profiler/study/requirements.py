"""What the ray of a hop must reach, and what asks for it: every rule, on the path and beside it; lower antennas."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from profiler.geometry import corridor_need, side_of
from profiler.heights import DiversityEnd, check_diversity, least_ray, lower_rays, lower_rules
from profiler.models import Hop, Profile, Rule, frozen_array
from profiler.path import PathLine, beside
from profiler.study.result import Corridor
from profiler.units import Float

__all__ = ["Requirements", "Source", "lower_antennas", "requirements", "source_of", "spacing_of"]

_ABOVE_COVER_M = 1e-5
"""More than rounding, and less than anybody means."""


@dataclass(frozen=True, slots=True, eq=False)
class Requirements:
    """Every requirement on the ray between the main antennas, a row each; arrays (rows, n).

    ``rules`` are those of the hop and then, with a diversity pair, what P.530 wants for the lower antennas at A and B.
    ``least_ray_m`` is the least height of the ray above the datum, asked for at ``offset_m`` across the path by a
    surface of ``surface_m``.
    """

    rules: tuple[Rule, ...]
    least_ray_m: Float
    offset_m: Float
    surface_m: Float


@dataclass(frozen=True, slots=True)
class Source:
    """What asks for a height: a place on the path or beside it (``offset_m``, positive to the right of A→B).

    Position, ground and cover are those of the place. ``rule`` is an index into the requirements, -1 where the bare
    ground of a site asks.
    """

    distance_m: float
    offset_m: float
    side: str
    longitude: float
    latitude: float
    ground_m: float
    cover_m: float
    rule: int


def spacing_of(hop: Hop) -> float:
    """Spacing of the diversity pairs of a hop, metres; 0 without diversity."""
    pair = None if hop.availability is None else hop.availability.diversity
    return 0.0 if pair is None else pair.spacing_m


def requirements(hop: Hop, profile: Profile, corridor: Corridor | None, median_k: float) -> Requirements:
    """Collect what the ray must reach.

    Parameters
    ----------
    hop, profile, corridor
        The hop, its profile and the ground beside it, None where no rule asks for it.
    median_k
        Median effective-earth-radius factor, for the lower antennas.

    Returns
    -------
    Requirements
    """
    rays, offsets, surfaces = _rays(hop, profile, corridor, hop.rules)
    rules, spacing_m = hop.rules, spacing_of(hop)
    if spacing_m:
        least = lower_rules(hop.heights.diversity_obstruction, median_k)[0]
        own, own_offset, own_surface = _rays(hop, profile, corridor, [least])
        rays = np.concatenate((rays, lower_rays(profile.distance_m, own[0], spacing_m)))
        offsets = np.concatenate((offsets, own_offset, own_offset))
        surfaces = np.concatenate((surfaces, own_surface, own_surface))
        rules += tuple(Rule(least.k, least.fresnel_fraction, label=f"lower antenna at {end}") for end in ("A", "B"))
    return Requirements(rules, frozen_array(rays), frozen_array(offsets), frozen_array(surfaces))


def lower_antennas(
    hop: Hop,
    profile: Profile,
    corridor: Corridor | None,
    median_k: float,
    *,
    antenna_a_m: float,
    antenna_b_m: float,
    lowest_m: tuple[float, float] = (0.0, 0.0),
) -> tuple[DiversityEnd, ...]:
    """Hold the lower antennas of a hop's diversity pairs to P.530's clearance; empty without diversity.

    Parameters
    ----------
    hop, profile, corridor, median_k
        As in `requirements`.
    antenna_a_m, antenna_b_m
        Main antennas above ground.
    lowest_m
        Lowest position that each tower offers.

    Returns
    -------
    tuple of DiversityEnd
        A and B.
    """
    spacing_m, obstruction = spacing_of(hop), hop.heights.diversity_obstruction
    if not spacing_m:
        return ()
    rays, _, _ = _rays(hop, profile, corridor, lower_rules(obstruction, median_k))
    return check_diversity(
        profile.distance_m,
        rays,
        float(profile.ground_m[0]),
        float(profile.ground_m[-1]),
        hop.frequency_hz,
        antenna_a_m=antenna_a_m,
        antenna_b_m=antenna_b_m,
        spacing_m=spacing_m,
        obstruction=obstruction,
        lowest_m=lowest_m,
    )


def source_of(
    needs: Requirements, profile: Profile, corridor: Corridor | None, line: PathLine, point: int, rule: int
) -> Source:
    """Describe what asks for a height: the place at one point of the path under one requirement.

    Parameters
    ----------
    needs, profile, corridor, line
        The requirements, the ground on the path and beside it, and the path.
    point, rule
        Index of the point, and of the requirement; -1 for the bare ground of a site.

    Returns
    -------
    Source
    """
    offset_m = float(needs.offset_m[rule, point]) if rule >= 0 else 0.0
    longitude, latitude = float(profile.longitude[point]), float(profile.latitude[point])
    ground_m, cover_m = float(profile.ground_m[point]), float(profile.cover_m[point])
    if offset_m and corridor is not None:
        longitude, latitude = beside(line, point, offset_m)
        cover_m = float(np.interp(offset_m, corridor.offset_m[point], corridor.cover_m[point]))
        ground_m = float(needs.surface_m[rule, point]) - cover_m
    return Source(
        distance_m=float(profile.distance_m[point]),
        offset_m=offset_m,
        side=side_of(offset_m),
        longitude=longitude,
        latitude=latitude,
        ground_m=ground_m,
        cover_m=cover_m,
        rule=rule,
    )


def _rays(hop: Hop, profile: Profile, corridor: Corridor | None, rules: Sequence[Rule]) -> tuple[Float, Float, Float]:
    """Least ray under each rule, raised where ground beside the path asks for more, and what asks: (rules, n) each."""
    rays = least_ray(profile.distance_m, profile.surface_m, hop.frequency_hz, rules)
    offsets, surfaces = np.zeros_like(rays), np.tile(profile.surface_m, (len(rules), 1))
    # an antenna exactly at the top of its own cover is not above it, and a study would refuse it
    ends = [end for end in (0, -1) if profile.cover_m[end] > 0]
    rays[:, ends] = np.maximum(rays[:, ends], profile.surface_m[ends] + _ABOVE_COVER_M)
    if corridor is None:
        return rays, offsets, surfaces
    beside_path = (profile.distance_m, corridor.offset_m, corridor.surface_m, hop.frequency_hz)
    for row, rule in enumerate(rules):
        if rule.fresnel_fraction == 0.0:
            continue
        need = corridor_need(*beside_path, rule)
        higher = need.least_ray_m > rays[row]
        rays[row, higher] = need.least_ray_m[higher]
        offsets[row, higher], surfaces[row, higher] = need.offset_m[higher], need.surface_m[higher]
    return rays, offsets, surfaces
