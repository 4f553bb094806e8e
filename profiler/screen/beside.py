"""Least surplus of many hops over the whole width of the zones that rules ask for, where it is less than on the path.

The path's own least is the first best. What could beat it lies in few segments, by the same bound as along the path
with the blocks that the zone touches; of these the cells are handed to the search in the zone as patches.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from profiler.geometry.zone import ZoneRays, least_in_zone
from profiler.models import Rule
from profiler.patches import Patches
from profiler.screen.blocks import BLOCK, Blocks
from profiler.screen.least import LeastSurplus, Segments, Sight, lower_bounds, segments_of, strides
from profiler.screen.lines import GridLines, Ints
from profiler.units import Float

__all__ = ["Beside", "least_beside"]

_SLACK_M = 5e-4
"""How far below what is found the least may lie, at most."""

_HOPS_AT_ONCE = 256


@dataclass(frozen=True, slots=True, eq=False)
class Beside:
    """Least surplus over length and width, and how far from A and to the right of the path it is, (rules, hops)."""

    surplus_m: Float
    distance_m: Float
    offset_m: Float


def least_beside(lines: GridLines, blocks: Blocks, sight: Sight, rules: Sequence[Rule], along: LeastSurplus) -> Beside:
    """Lower the least surplus of every hop and rule by what stands beside the path within the zone.

    Parameters
    ----------
    lines, blocks, sight, rules
        As for `least_surplus`; ``sight`` was made of the rules.
    along
        The least along the path. Missing ground beside it is left out, as in a study.

    Returns
    -------
    Beside
    """
    found = Beside(along.surplus_m.copy(), along.distance_m.copy(), np.zeros_like(along.surplus_m))
    wide = [number for number, rule in enumerate(rules) if rule.fresnel_fraction > 0.0]
    if not wide:
        return found
    for hops in np.array_split(np.arange(lines.distance_m.size), -(-lines.distance_m.size // _HOPS_AT_ONCE)):
        _search(lines.take(hops), blocks, sight.take(hops), rules, wide, hops, found)
    return found


def _search(
    lines: GridLines, blocks: Blocks, sight: Sight, rules: Sequence[Rule], wide: list[int], hops: Ints, found: Beside
) -> None:
    """Search the zones of some hops, and put what is less into the result."""
    segments = segments_of(lines)
    count = hops.size
    best = found.surplus_m[:, hops]
    widest_m = _widest(lines, sight, segments)
    least = lower_bounds(lines, blocks, sight, segments, aside_m=widest_m)
    may = (least < (best - _SLACK_M)[:, segments.hop])[wide]
    opened = np.flatnonzero(may.any(axis=0))
    if not opened.size:
        return
    patches, owner = _patches(lines, blocks, segments, opened, widest_m[opened])
    if not patches.size:
        return
    per_rule = [np.flatnonzero(may[i, opened][owner]) for i in range(len(wide))]
    hop = segments.hop[opened][owner]
    ray = np.concatenate([i * count + hop[chosen] for i, chosen in enumerate(per_rule)])
    fraction, margin_m = (np.repeat(each[wide, 0], count) for each in (sight.fraction, sight.margin_m))
    a, b, length, wavelength = (
        np.tile(each, len(wide)) for each in (sight.centre_a_m, sight.centre_b_m, lines.distance_m, sight.wavelength_m)
    )
    k = np.repeat([rules[number].k for number in wide], count)
    rays = ZoneRays(a, b, length, wavelength, k, fraction, margin_m, np.zeros_like(length), length)
    known = best[wide].ravel()
    result = least_in_zone(patches, rays, np.concatenate(per_rule), ray, known, slack_m=_SLACK_M)
    better = np.flatnonzero(result.patch >= 0)
    distance_m, offset_m, _, _ = patches.at(result.patch[better], result.p[better], result.q[better])
    where = np.array(wide)[better // count], hops[better % count]
    found.surplus_m[where] = result.surplus_m[better]
    found.distance_m[where], found.offset_m[where] = distance_m, offset_m


def _widest(lines: GridLines, sight: Sight, segments: Segments) -> Float:
    """Greatest radius of any rule's zone in every segment, metres; a hair more than that."""
    hop = segments.hop
    metres = lines.metres(np.stack([segments.first, segments.last]).T, hop)
    length = lines.distance_m[hop]
    at = np.clip(0.5 * length, metres.min(axis=1), metres.max(axis=1))
    radius = np.sqrt(sight.wavelength_m[hop] * at * (length - at) / length) * sight.fraction.max()
    # what lies to one side of a slanting path belongs to the next segment's distances: as wide as a little further on
    return np.asarray(1.05 * radius + 1.0)


def _patches(
    lines: GridLines, blocks: Blocks, segments: Segments, which: Ints, widest_m: Float
) -> tuple[Patches, Ints]:
    """Make a patch of every known cell that the zones touch in some segments; whose segment each is, by its place."""
    hop = segments.hop[which]
    first = segments.block[which, None] * BLOCK
    edge = (first + np.arange(BLOCK + 1)).astype(float)
    cross, metres = lines.cross(edge, hop), lines.metres(edge, hop)
    across_m, ahead_m = lines.beside(edge, hop)
    half = (widest_m / np.abs(across_m).min(axis=1))[:, None]
    low = np.floor(np.minimum(cross[:, :-1], cross[:, 1:]) - half)
    high = np.floor(np.maximum(cross[:, :-1], cross[:, 1:]) + half)
    most_main = np.where(lines.turned[hop], blocks.rows, blocks.columns)[:, None] - 2
    most_cross = np.where(lines.turned[hop], blocks.columns, blocks.rows)[:, None] - 2
    low, high = np.maximum(low, 0.0), np.minimum(high, most_cross)
    reached = (edge[:, 1:] > lines.first_main[hop, None] - half) & (edge[:, :-1] < lines.last_main[hop, None] + half)
    reached &= (edge[:, :-1] <= most_main) & (edge[:, :-1] >= 0)
    cells = np.where(reached, np.maximum(high - low + 1, 0), 0).astype(np.int64)
    strip = np.repeat(np.arange(cells.size), cells.ravel())
    number = np.arange(strip.size) - np.repeat(np.cumsum(cells.ravel()) - cells.ravel(), cells.ravel())
    owner, column = strip // BLOCK, strip % BLOCK
    row = low.ravel()[strip] + number
    corners_along, corners_across = [], []
    for far in (0, 1):
        at = owner, column + far
        for up in (0, 1):
            beyond = row + up - cross[at]
            corners_across.append(beyond * across_m[at])
            corners_along.append(metres[at] + beyond * ahead_m[at])
    along, across = strides(lines.turned[hop][owner], blocks.columns)
    cell = ((first[owner, 0] + column) * along + row * across).astype(np.int64)
    heights = [blocks.cells_m[cell + step].astype(float) for step in (0, across, along, along + across)]
    known = np.flatnonzero(np.isfinite(heights).all(axis=0))
    z00, z01, z10, z11 = (height[known] for height in heights)
    surface = np.stack([z00, z10 - z00, z01 - z00, z00 + z11 - z10 - z01, 0.0 * z00, 0.0 * z00], axis=1)
    patches = Patches(
        along_m=_affine([each[known] for each in corners_along]),
        across_m=_affine([each[known] for each in corners_across]),
        surface_m=surface,
        cover_m=np.zeros_like(surface),
        window=np.empty((known.size, 0, 3)),
        whole=np.ones(known.size, dtype=bool),
    )
    return patches, owner[known]


def _affine(corners: list[Float]) -> Float:
    """Coefficients (m, 3) of the affine map nearest to values at (0, 0), (0, 1), (1, 0) and (1, 1)."""
    c00, c01, c10, c11 = corners
    return np.stack(
        [(3.0 * c00 + c01 + c10 - c11) / 4.0, (c10 + c11 - c00 - c01) / 2.0, (c01 + c11 - c00 - c10) / 2.0], axis=1
    )
