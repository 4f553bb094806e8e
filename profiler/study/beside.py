"""What stands on the path and beside it, out to the edge of the widest zone that a rule asks for, as one surface."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np

from profiler.cover import CoverRasters, obstacle_extent
from profiler.geometry import Surface, fresnel_radius
from profiler.models import Hop, Profile, Rule
from profiler.patches import Patches, join_patches
from profiler.path import PathLine, beside
from profiler.terrain import Layer, SourceUse, Strip, Terrain, ground_patches, hidden_out, lay_over
from profiler.units import Float

__all__ = ["Beside", "read_beside"]


@dataclass(frozen=True, slots=True, eq=False)
class Beside:
    """The surface of a hop, and the rasters and files of cover that it is from."""

    surface: Surface
    sources: tuple[SourceUse, ...]
    cover_files: tuple[Path, ...]


def read_beside(
    hop: Hop, terrain: Terrain, cover: CoverRasters, line: PathLine, profile: Profile, settled_m: tuple[float, float]
) -> Beside:
    """Read ground and cover out to the edge of the widest zone that a rule asks for.

    Parameters
    ----------
    hop, terrain, cover
        The hop, and the open rasters.
    line, profile
        The path and what stands on it.
    settled_m
        Where, counted from A, the profile follows the raster: before and after that it leads to a site whose ground is
        not the raster's, and nothing is said of the ground beside.

    Returns
    -------
    Beside
    """
    fraction = max(rule.fresnel_fraction for rule in (*hop.rules, *_lower_rules(hop)))
    on_path = Surface(profile.distance_m, profile.surface_m, profile.cover_m, None, *settled_m)
    if fraction == 0.0:
        return Beside(on_path, (), ())
    strip = _strip(hop, line, fraction)
    layers, sources = terrain.layers(strip)
    ground = ground_patches(layers, strip)
    if ground is None:
        return Beside(on_path, sources, ())
    canopy, classes, files = cover.layers(strip)
    patches = _covered(hop, ground, canopy, classes, strip)
    return Beside(replace(on_path, patches=patches), sources, files)


def _lower_rules(hop: Hop) -> tuple[Rule, ...]:
    """Rules of a diversity pair's lower antennas; their k has no part in the width of the zone."""
    if hop.availability is None or hop.availability.diversity is None:
        return ()
    from profiler.heights import lower_rules

    return lower_rules(hop.heights.diversity_obstruction, 1.0)


def _strip(hop: Hop, line: PathLine, fraction: float) -> Strip:
    """Ground that lies under the zone."""

    def reach_m(low_m: Float, high_m: Float) -> Float:
        along = np.clip(0.5 * line.distance_m, low_m, high_m)  # the zone is widest at the middle
        return fraction * fresnel_radius(along, line.distance_m - along, hop.frequency_hz)

    return Strip(0.0, line.distance_m, lambda along, across: beside(line, along, across), reach_m)


def _covered(hop: Hop, ground: Patches, canopy: Sequence[Layer], classes: Sequence[Layer], strip: Strip) -> Patches:
    """Ground, and over it what stands on it: of patches that lie over one another the highest counts.

    The bare ground counts everywhere. Canopy comes first, classes where it has no data, an obstacle on top of neither;
    within a site's clearing nothing stands.
    """
    clear_from, clear_to = hop.site_a.clearing_m, strip.to_m - hop.site_b.clearing_m
    parts = [ground]
    if hop.cover.canopy or hop.cover.landcover is not None:
        # where cover is given the ground alone is not all that stands there, but in the clearings
        parts = [replace(ground, whole=np.zeros(ground.size, dtype=bool))]
        parts += [_between(ground, 0.0, clear_from), _between(ground, clear_to, strip.to_m)]
        for number, layer in enumerate(canopy):
            parts.append(hidden_out(lay_over(ground, layer), canopy[:number], strip))
        for number, layer in enumerate(classes):
            parts.append(hidden_out(lay_over(ground, layer), [*canopy, *classes[:number]], strip))
        parts[3:] = [_between(part, clear_from, clear_to) for part in parts[3:]]
    for obstacle in hop.cover.obstacles:
        first_m, last_m = obstacle_extent(obstacle)
        under = _between(ground, max(first_m, clear_from), min(last_m, clear_to))
        heights = np.zeros((under.size, 6))
        heights[:, 0] = obstacle.height_m
        nothing = np.zeros(under.size, dtype=bool)
        parts.append(replace(under, surface_m=under.surface_m + heights, cover_m=heights, whole=nothing))
    return join_patches(parts)


def _between(patches: Patches, low_m: float, high_m: float) -> Patches:
    """Leave of patches what lies between two distances from A."""
    if high_m <= low_m:
        return patches.take(np.zeros(0, dtype=np.intp))
    starts, ends = patches.reach_m
    met = (ends >= low_m) & (starts <= high_m)
    kept = patches.take(met)
    if ((starts[met] >= low_m) & (ends[met] <= high_m)).all():
        return kept
    form = (kept.along_m - [low_m, 0.0, 0.0]) / (high_m - low_m)
    return replace(kept, window=np.concatenate((kept.window, form[:, None]), axis=1))
