"""The profile of one hop, laid where the surface bends: exact between its points, however densely they are listed.

A raster's surface bends or steps where the path crosses certain lines (`Terrain.crossings`), and between two of these
*knots* it is one parabola in the distance, recovered from three samples strictly inside. The points of the profile are
the knots, two of them a hair apart where the surface steps; the places that keep straight lines between points within
centimetres of the ground, the zone and the bulge; those of least surplus under each rule; and the regular ones.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path

import numpy as np

from profiler.cover import CoverRasters, obstacle_edges, obstacle_heights
from profiler.errors import InputError, under
from profiler.geometry import Parabolas, PathZone, inside_places, least_surplus, zone_places
from profiler.models import Hop, TerrainChoice
from profiler.path import PathLine, equal_steps, geodesic, points_along, trace, with_points
from profiler.remarks import Length, Note, Remark, note
from profiler.study.terrain_notes import disagreements, sea_notes
from profiler.terrain import SourceUse, Terrain
from profiler.units import MEAN_EARTH_RADIUS_M, Float, wavelength

__all__ = ["AlongPath", "clearing_notes", "lay_profile", "standing_heights"]

_SEARCH_STEPS = 256
_DEFAULT_STEPS, _FEWEST_STEPS, _MOST_STEPS = 200, 50, 2000
"""A short path over coarse cells still needs points enough for the facets that reflect, and to be drawn."""
_ABOVE_M, _BELOW_M = 0.01, 0.1
"""How far surface, zone and bulge may rise over a straight line between two points (what nobody sees is unsafe), and
the surface hang below it (which only moves means)."""
_APART_M = 0.005
"""Lines crossed nearer to each other are one knot: what lies between is narrower than any place is known."""
_STEP_M, _HAIR_M = 1e-3, 1e-3


@dataclass(frozen=True, slots=True, eq=False)
class AlongPath:
    """What the rasters say along a path; arrays (n,), ground NaN where it is missing.

    ``raster_ends_m`` is the raster's own ground at A and B, where a survey may have replaced it. ``settled_m`` is where
    the profile begins and ends to follow the raster: at the sites, unless their ground is their own.
    """

    line: PathLine
    ground_m: Float
    cover_m: Float
    spacing_m: float
    finest_cell_m: float
    raster_ends_m: tuple[float, float]
    settled_m: tuple[float, float]
    sources: tuple[SourceUse, ...]
    vertical_datum: str | None
    notes: tuple[Remark, ...]
    cover_notes: tuple[Remark, ...]
    cover_files: tuple[Path, ...]
    sea_share: float
    warnings: tuple[Remark, ...]


@dataclass(frozen=True, slots=True, eq=False)
class _Laid:
    """Knots, (m + 1,), and between them ground and cover (what stands in the way included), m pieces."""

    knot_m: Float
    ground: Parabolas
    cover: Parabolas


def lay_profile(hop: Hop, terrain: Terrain, cover: CoverRasters) -> AlongPath:
    """Read ground and cover along the path of a hop.

    Parameters
    ----------
    hop
        The hop; its rules say where the zone needs points, and where the least surplus is wanted.
    terrain, cover
        The open rasters.

    Returns
    -------
    AlongPath

    Raises
    ------
    InputError, RasterError, MissingGroundError
        For rasters that cannot be used, points too far apart, or cover that is missing.
    """
    coarse, spacing_m, cell_m = _coarse(hop, terrain)
    knot_m = _knots(hop, coarse, terrain, cover)
    length_m = np.diff(knot_m)
    at_m = knot_m[:-1, None] + length_m[:, None] * Parabolas.FIT_AT
    start = coarse.longitude[0], coarse.latitude[0], coarse.azimuth_a_deg
    longitude, latitude, _ = points_along(*start, at_m)
    samples = terrain.sample(longitude, latitude, compare=True)
    ground_m, weight_m = np.array(samples.ground_m), np.broadcast_to(length_m[:, None], at_m.shape)
    notes: tuple[Remark, ...] = (*samples.notes, *sea_notes(samples.sea, at_m))
    if hop.terrain.method == "highest":
        ends = [0, -1]
        ground_m[ends] = terrain.sample(longitude[ends], latitude[ends], method="bilinear").ground_m
        notes += (
            "ground from the sites to the first line through cell centres: bilinear, as the highest cell around"
            " would lift the antennas",
        )
    found = cover.sample(at_m[:, 0], longitude, latitude, weight_m=weight_m)
    ground = Parabolas.fit(ground_m)
    raster_ends_m = float(ground.first_m[0]), float(ground.last_m[-1])
    laid = _Laid(knot_m, _surveyed(hop, ground), _standing(hop, knot_m, Parabolas.fit(found.cover_m)))
    line, points = _points(hop, coarse, laid, spacing_m)
    share = [float(weight_m[samples.source == number].sum() / weight_m.sum()) for number in range(len(samples.sources))]
    return AlongPath(
        line=line,
        ground_m=points[0],
        cover_m=points[1],
        spacing_m=spacing_m,
        finest_cell_m=cell_m,
        raster_ends_m=raster_ends_m,
        settled_m=_settled(hop, knot_m),
        sources=tuple(replace(use, share=each) for use, each in zip(samples.sources, share, strict=True)),
        vertical_datum=samples.vertical_datum,
        notes=notes,
        cover_notes=(*found.notes, *clearing_notes(hop)),
        cover_files=found.files,
        sea_share=float(weight_m[samples.sea].sum() / weight_m.sum()),
        warnings=disagreements(hop, samples.overlaps, at_m.ravel()),
    )


def _settled(hop: Hop, knot_m: Float) -> tuple[float, float]:
    """Where the profile begins and ends to follow the raster: with ground of its own at a site, one piece further."""
    own = [site.surveyed_ground_m is not None or hop.terrain.method == "highest" for site in (hop.site_a, hop.site_b)]
    return float(knot_m[1 if own[0] else 0]), float(knot_m[-2 if own[1] else -1])


def standing_heights(hop: Hop, length_m: float, distance_m: Float, cover_m: Float) -> Float:
    """Cover with the obstacles in it and the clearings around the sites taken out.

    Parameters
    ----------
    hop, length_m
        The hop and the length of its path.
    distance_m
        Distances from A, (n,), or a shape that broadcasts with the cover.
    cover_m
        Cover by the rasters, (n,) or (n, across).
    """
    heights = np.maximum(cover_m, obstacle_heights(distance_m, hop.cover.obstacles)) if hop.cover.obstacles else cover_m
    for site, from_site_m in ((hop.site_a, distance_m), (hop.site_b, length_m - distance_m)):
        if site.clearing_m > 0.0:
            heights = np.where(from_site_m <= site.clearing_m, 0.0, heights)
    return heights


def clearing_notes(hop: Hop) -> tuple[Note, ...]:
    """Say where the hop file has the cover taken out."""
    cleared = [site for site in (hop.site_a, hop.site_b) if site.clearing_m > 0.0]
    words = "no cover within {} of {}, as the hop file says"
    return tuple(note("cover", words, Length(site.clearing_m), site.name) for site in cleared)


def _coarse(hop: Hop, terrain: Terrain) -> tuple[PathLine, float, float]:
    """Few equally spaced points of the path, the spacing of the regular points, and the finest cell on the way."""
    length_m, spacing_m = float(geodesic(*hop.ends)[0]), hop.terrain.spacing_m
    coarse = trace(*hop.ends, spacing_m=length_m / _SEARCH_STEPS)
    # a cell is measured at the first point on its raster: the one nearest to the middle, whichever end is called A
    outward = np.argsort(np.abs(np.arange(coarse.points) - coarse.points // 2), kind="stable")
    cell_m = terrain.finest_cell_m(coarse.longitude[outward], coarse.latitude[outward])
    if spacing_m is None:
        spacing_m = length_m / _DEFAULT_STEPS
    elif spacing_m * _FEWEST_STEPS > length_m:
        raise InputError(
            f"terrain.spacing_m = {spacing_m:g}: must be at most one {_FEWEST_STEPS}th of this path of"
            f" {length_m / 1e3:.2f} km; leave it out for a {_DEFAULT_STEPS}th"
        )
    return coarse, spacing_m, cell_m


def _knots(hop: Hop, coarse: PathLine, terrain: Terrain, cover: CoverRasters) -> Float:
    """Distances from A, both sites among them, between which ground and cover are one parabola each."""
    length_m, where = coarse.distance_m, (coarse.longitude, coarse.latitude)
    crossed_m = length_m * np.concatenate((terrain.crossings(*where), cover.crossings(*where)))
    clearings_m = [hop.site_a.clearing_m, length_m - hop.site_b.clearing_m]
    inner = np.sort(np.concatenate((crossed_m, obstacle_edges(hop.cover.obstacles, length_m), clearings_m)))
    inner = inner[(inner > _APART_M) & (inner < length_m - _APART_M)]
    inner = inner[np.diff(inner, prepend=0.0) > _APART_M]
    return np.concatenate(([0.0], inner, [length_m]))


def _surveyed(hop: Hop, ground: Parabolas) -> Parabolas:
    """Ground that starts from the surveyed heights of the sites and meets the raster's where the first piece ends."""
    first_m, last_m = ground.first_m.copy(), ground.last_m.copy()
    if hop.site_a.surveyed_ground_m is not None:
        first_m[0] = hop.site_a.surveyed_ground_m
    if hop.site_b.surveyed_ground_m is not None:
        last_m[-1] = hop.site_b.surveyed_ground_m
    return Parabolas(first_m, last_m, ground.crown_m)


def _standing(hop: Hop, knot_m: Float, cover: Parabolas) -> Parabolas:
    """Cover with the obstacles that stand higher all along a piece, and without what is cleared."""
    if not hop.cover.obstacles and not clearing_notes(hop):
        return cover
    middle_m = 0.5 * (knot_m[:-1] + knot_m[1:])
    highest_m = np.maximum(
        np.maximum(cover.first_m, cover.last_m), 0.5 * (cover.first_m + cover.last_m) + cover.crown_m
    )
    level_m = standing_heights(hop, float(knot_m[-1]), middle_m, highest_m)
    level = level_m != highest_m
    return Parabolas(
        *(
            np.where(level, each, own)
            for each, own in ((level_m, cover.first_m), (level_m, cover.last_m), (0.0, cover.crown_m))
        )
    )


def _points(hop: Hop, coarse: PathLine, laid: _Laid, spacing_m: float) -> tuple[PathLine, tuple[Float, Float]]:
    """Lay the points of the profile, and give their ground and cover."""
    length_m, knot_m, ground, cover = coarse.distance_m, laid.knot_m, laid.ground, laid.cover
    # between pieces: one point, or two a hair apart where ground or cover steps
    inner_m = knot_m[1:-1]
    before_m, after_m = inner_m - 0.5 * _HAIR_M, inner_m + 0.5 * _HAIR_M
    ends = [
        (ground.last_m[:-1], ground.first_m[1:]),
        (
            standing_heights(hop, length_m, before_m, cover.last_m[:-1]),
            standing_heights(hop, length_m, after_m, cover.first_m[1:]),
        ),
    ]
    steps = np.any([np.abs(one - other) > _STEP_M for one, other in ends], axis=0)
    # within pieces
    inside_m = _inside(hop, laid, spacing_m)
    piece = np.searchsorted(knot_m, inside_m) - 1
    share = (inside_m - knot_m[piece]) / (knot_m[piece + 1] - knot_m[piece])
    distance_m = np.concatenate(([0.0, length_m], np.where(steps, before_m, inner_m), after_m[steps], inside_m))
    order = np.argsort(distance_m)
    heights = []
    for each, (one, other) in zip((ground, cover), ends, strict=True):
        at_knots = np.where(steps, one, np.fmax(one, other))
        heights.append(
            np.concatenate(([each.first_m[0], each.last_m[-1]], at_knots, other[steps], each.at(piece, share)))[order]
        )
    distance_m = distance_m[order]
    heights[1] = standing_heights(hop, length_m, distance_m, heights[1])
    return with_points(coarse, distance_m), (heights[0], heights[1])


def _inside(hop: Hop, laid: _Laid, spacing_m: float) -> Float:
    """Distances of the points between knots: regular ones, those that keep straight lines near, and the tightest."""
    knot_m, surface = laid.knot_m, laid.ground + laid.cover
    length_m = float(knot_m[-1])
    # the bulge over a step s stands s²/(8·k·R) above its chord; no k of this earth asks for the least step
    bulge_step_m = (8.0 * min(rule.k for rule in hop.rules) * MEAN_EARTH_RADIUS_M * _ABOVE_M) ** 0.5
    step_m = min(spacing_m, max(bulge_step_m, length_m / _MOST_STEPS))
    with under("terrain", TerrainChoice):
        regular_m = equal_steps(length_m, step_m)[1:-1]
    fraction = max(rule.fresnel_fraction for rule in hop.rules)
    near_m = zone_places(length_m, hop.frequency_hz, fraction, _ABOVE_M)
    piece, share = inside_places(surface.crown_m, above_m=_ABOVE_M, below_m=_BELOW_M)
    curved_m = knot_m[piece] + share * (knot_m[piece + 1] - knot_m[piece])
    found = [regular_m, near_m, length_m - near_m, curved_m, _tightest(hop, laid, surface)]
    inside_m = np.sort(np.concatenate(found))
    inside_m = inside_m[np.diff(inside_m, prepend=-np.inf) > _HAIR_M]
    after = np.searchsorted(knot_m, inside_m)
    clear = np.minimum(inside_m - knot_m[after - 1], knot_m[after] - inside_m) > 2.0 * _HAIR_M
    return inside_m[clear]


def _tightest(hop: Hop, laid: _Laid, surface: Parabolas) -> Float:
    """Distances of least surplus under every rule; none while a site's own ground is missing."""
    knot_m, (site_a, site_b) = laid.knot_m, (hop.site_a, hop.site_b)
    centres = laid.ground.first_m[0] + site_a.antenna_m, laid.ground.last_m[-1] + site_b.antenna_m
    known = np.isfinite(surface.crown_m)
    if not np.isfinite(centres).all():
        return np.zeros(0)
    rules = len(hop.rules)
    zone = PathZone(
        *(np.full(rules, each) for each in (knot_m[-1], *centres, float(wavelength(hop.frequency_hz)))),
        *(np.array([getattr(rule, name) for rule in hop.rules]) for name in ("k", "fresnel_fraction", "margin_m")),
    )
    of = np.repeat(np.arange(rules), known.sum())
    tiled = [
        np.tile(each[known], rules)
        for each in (knot_m[:-1], knot_m[1:], surface.first_m, surface.last_m, surface.crown_m)
    ]
    return least_surplus(of, tiled[0], tiled[1], Parabolas(*tiled[2:]), zone).distance_m
