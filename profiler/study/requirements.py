"""What the ray of a hop must reach, and what asks for it: every rule, on the path and beside it; lower antennas.

The region of heights that clear follows from a finite number of requirements. Those of the points of the path come
first; then, in turn, every edge of the region's hull is held as a ray against the whole surface in its zone, and what
stands highest above it is added, until nothing does: cutting planes, which end with the exact region.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from profiler.geometry import ON_PATH_M, Surface, asked_across, earth_bulge, least_in_zone, zone_rays
from profiler.heights import ClearingRegion, DiversityEnd, check_diversity, clearing_region, lower_rules
from profiler.models import Hop, Profile, Rule, frozen_array
from profiler.units import Float

__all__ = ["Requirement", "Requirements", "lower_antennas", "lower_regions", "requirements", "spacing_of"]

_ABOVE_COVER_M = 1e-5
"""More than rounding, and less than anybody means."""

_SLACK_M = 1e-3
_MOST_ROUNDS = 40


class Requirement(NamedTuple):
    """A rule, and how far below the main antennas at A and B the ray begins and ends that must meet it."""

    rule: Rule
    below_a_m: float = 0.0
    below_b_m: float = 0.0


@dataclass(frozen=True, slots=True, eq=False)
class Requirements:
    """Every requirement on the ray between the main antennas, a row each; arrays (rows, n).

    ``wanted`` are the rules of the hop and then, with a diversity pair, what P.530 wants for the lower antennas at A
    and B. ``distance_m`` (n,) are the points of the path and further places that decide. ``least_ray_m`` is the least
    height of the ray above the datum, -inf where a row says nothing, asked for at ``offset_m`` across the path by a
    surface of ``surface_m``, ``cover_m`` of it cover.
    """

    wanted: tuple[Requirement, ...]
    distance_m: Float
    least_ray_m: Float
    offset_m: Float
    surface_m: Float
    cover_m: Float

    @property
    def rules(self) -> tuple[Rule, ...]:
        """The rules by themselves."""
        return tuple(each.rule for each in self.wanted)

    def region(self, profile: Profile) -> ClearingRegion:
        """Give the heights that meet them all."""
        ground = profile.ground_m
        return clearing_region(self.distance_m, self.least_ray_m, float(ground[0]), float(ground[-1]))


def spacing_of(hop: Hop) -> float:
    """Spacing of the diversity pairs of a hop, metres; 0 without diversity."""
    pair = None if hop.availability is None else hop.availability.diversity
    return 0.0 if pair is None else pair.spacing_m


def requirements(hop: Hop, profile: Profile, surface: Surface, median_k: float) -> Requirements:
    """Collect what the ray must reach.

    Parameters
    ----------
    hop, profile, surface
        The hop, its profile and what stands on the path and beside it.
    median_k
        Median effective-earth-radius factor, for the lower antennas.

    Returns
    -------
    Requirements
    """
    wanted, spacing_m = [Requirement(rule) for rule in hop.rules], spacing_of(hop)
    if spacing_m:
        least = lower_rules(hop.heights.diversity_obstruction, median_k)[0]
        wanted.append(Requirement(replace(least, label="lower antenna at A"), below_a_m=spacing_m))
        wanted.append(Requirement(replace(least, label="lower antenna at B"), below_b_m=spacing_m))
    return _collect(wanted, profile, surface, hop.frequency_hz)


def lower_regions(hop: Hop, profile: Profile, surface: Surface, median_k: float) -> tuple[ClearingRegion, ...]:
    """Give the heights at the ends of a lower antenna's own ray for the two ends of P.530's range of clearance.

    The parameters are those of `requirements`; empty without diversity.
    """
    if not spacing_of(hop):
        return ()
    rules = lower_rules(hop.heights.diversity_obstruction, median_k)
    return tuple(_collect([Requirement(rule)], profile, surface, hop.frequency_hz).region(profile) for rule in rules)


def lower_antennas(
    hop: Hop,
    regions: tuple[ClearingRegion, ...],
    *,
    antenna_a_m: float,
    antenna_b_m: float,
    lowest_m: tuple[float, float] = (0.0, 0.0),
) -> tuple[DiversityEnd, ...]:
    """Hold the lower antennas of a hop's diversity pairs to P.530's clearance; empty without diversity.

    Parameters
    ----------
    hop, regions
        The hop and its `lower_regions`.
    antenna_a_m, antenna_b_m
        Main antennas above ground.
    lowest_m
        Lowest position that each tower offers.

    Returns
    -------
    tuple of DiversityEnd
        A and B.
    """
    if not regions:
        return ()
    least, full = regions
    return check_diversity(
        least,
        full,
        hop.frequency_hz,
        antenna_a_m=antenna_a_m,
        antenna_b_m=antenna_b_m,
        spacing_m=spacing_of(hop),
        obstruction=hop.heights.diversity_obstruction,
        lowest_m=lowest_m,
    )


def _collect(wanted: Sequence[Requirement], profile: Profile, surface: Surface, frequency_hz: float) -> Requirements:
    """Collect the requirements of the points of the path, and of every other place that decides."""
    share = profile.distance_m / profile.distance_m[-1]
    asked = asked_across(surface, frequency_hz, [each.rule.fresnel_fraction for each in wanted])
    found = [asked[each.rule.fresnel_fraction] for each in wanted]
    remaining = profile.distance_m[-1] - profile.distance_m
    bulge = [earth_bulge(profile.distance_m, remaining, each.rule.k) for each in wanted]
    rays = np.stack([each.rise_m for each in found]) + np.stack(bulge) + [[each.rule.margin_m] for each in wanted]
    # an antenna exactly at the top of its own cover is not above it, and a study would refuse it
    ends = [end for end in (0, -1) if profile.cover_m[end] > 0]
    rays[:, ends] = np.maximum(rays[:, ends], profile.surface_m[ends] + _ABOVE_COVER_M)
    # a ray that begins so much lower asks the main one for so much more
    below = np.array([(each.below_a_m, each.below_b_m) for each in wanted])
    rays += below[:, :1] * (1.0 - share) + below[:, 1:] * share
    needs = Requirements(
        tuple(wanted),
        profile.distance_m,
        frozen_array(rays),
        *(
            frozen_array(np.stack([getattr(each, name) for each in found]))
            for name in ("offset_m", "surface_m", "cover_m")
        ),
    )
    return _with_decisive_places(needs, profile, surface, frequency_hz)


def _with_decisive_places(needs: Requirements, profile: Profile, surface: Surface, frequency_hz: float) -> Requirements:
    """Add the places between the points until no edge of the region's hull is short anywhere."""
    zoned = [row for row, each in enumerate(needs.wanted) if each.rule.fresnel_fraction > 0.0]
    if surface.patches is None or not zoned:
        return needs
    for _ in range(_MOST_ROUNDS):
        more = _above_hull(needs, needs.region(profile), zoned, surface, frequency_hz)
        if more is None:
            break
        needs = more
    # what may be left: as much as does not count, and what the search may have left under it
    rays = np.array(needs.least_ray_m)
    rays[zoned] += 2.0 * _SLACK_M
    return replace(needs, least_ray_m=frozen_array(rays))


def _above_hull(
    needs: Requirements, region: ClearingRegion, rows: Sequence[int], surface: Surface, frequency_hz: float
) -> Requirements | None:
    """Add what stands highest above each edge of the hull under each of the rows; None when nothing does."""
    assert surface.patches is not None
    x, y = region.distance_m[region.governing_point], region.least_ray_m[region.governing_point]
    slope = np.diff(y) / np.diff(x)
    at_a, at_b = y[:-1] - slope * x[:-1], y[1:] + slope * (x[-1] - x[1:])
    rays = zone_rays(
        surface,
        [
            (needs.wanted[row].rule, a - needs.wanted[row].below_a_m, b - needs.wanted[row].below_b_m)
            for row in rows
            for a, b in zip(at_a, at_b, strict=True)
        ],
        frequency_hz,
    )
    edges = slope.size
    rays = replace(
        rays,
        from_m=np.maximum(rays.from_m, np.tile(x[:-1], len(rows))),
        to_m=np.minimum(rays.to_m, np.tile(x[1:], len(rows))),
    )
    patch, edge = _pairs(surface, x)
    of_row = np.repeat(np.arange(len(rows)) * edges, edge.size)
    least = least_in_zone(
        surface.patches,
        rays,
        np.tile(patch, len(rows)),
        np.tile(edge, len(rows)) + of_row,
        np.zeros(edges * len(rows)),
        slack_m=_SLACK_M,
    )
    # next to a mast the zone bends without end: what is short by less is no place of its own
    hit = np.flatnonzero(least.surplus_m < -_SLACK_M)
    if not hit.size:
        return None
    along, offset, height, cover = surface.patches.at(least.patch[hit], least.p[hit], least.q[hit])
    offset = np.where(np.abs(offset) > ON_PATH_M, offset, 0.0)
    along = np.clip(along, 0.0, x[-1])  # a box so small that it counts may stick out of the path by its size
    row, at = np.array(rows)[hit // edges], hit % edges
    wanted = y[at] + slope[at] * (along - x[at]) - least.surplus_m[hit]
    return _with_places(needs, row, along, (wanted, offset, height, cover))


def _pairs(surface: Surface, x: Float) -> tuple[NDArray[np.intp], NDArray[np.intp]]:
    """Every patch with every stretch between neighbouring x that it reaches."""
    assert surface.patches is not None
    low, high = surface.patches.reach_m
    first = np.clip(np.searchsorted(x, low, "right") - 1, 0, x.size - 2)
    count = np.clip(np.searchsorted(x, high, "left") - 1, first, x.size - 2) - first + 1
    patch = np.repeat(np.arange(count.size), count)
    return patch, first[patch] + np.arange(patch.size) - np.repeat(np.cumsum(count) - count, count)


def _with_places(
    needs: Requirements, row: NDArray[np.intp], along_m: Float, found: tuple[Float, Float, Float, Float]
) -> Requirements:
    """Add places, each in a column of its own; one that is at a point of the path goes into the column of that."""
    distance, column = np.unique(np.append(needs.distance_m, along_m), return_inverse=True)
    old, new = column[: needs.distance_m.size], column[needs.distance_m.size :]
    arrays = []
    names = ("least_ray_m", "offset_m", "surface_m", "cover_m")
    higher = np.ones(new.size, dtype=bool)
    for name, values in zip(names, found, strict=True):
        array = np.full((len(needs.wanted), distance.size), -np.inf if name == "least_ray_m" else 0.0)
        array[:, old] = getattr(needs, name)
        if name == "least_ray_m":
            higher = values > array[row, new]
        array[row[higher], new[higher]] = values[higher]
        arrays.append(frozen_array(array))
    return Requirements(needs.wanted, frozen_array(distance), *arrays)
