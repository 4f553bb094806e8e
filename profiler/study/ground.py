"""The first half of a study: from two sites and some rasters to a profile, a corridor and a view from above."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np

from profiler.cover import Cover, cover_along
from profiler.errors import InputError, under
from profiler.geometry import corridor_offsets
from profiler.models import Hop, Profile, Rule, Site, TerrainChoice, frozen_array
from profiler.path import PathLine, across, geodesic, trace
from profiler.study.result import Corridor, Relief, TerrainUse
from profiler.terrain import SourceUse, Terrain, common_datum, fill_missing, missing_stretches, require_ground
from profiler.units import Float

__all__ = ["Ground", "read_ground", "require_above_cover"]

_SEARCH_STEPS = 256
_DEFAULT_STEPS, _FEWEST_STEPS = 200, 50
"""A short path over coarse cells still needs points enough for its bulge, its zone and the facets that reflect."""
_RELIEF_ALONG, _RELIEF_ACROSS = 320, 61
_ACROSS_STEPS = 10
_POINTS_AT_ONCE = 200_000
"""Points beside the path that are read together: it bounds the memory of a long path over fine cells."""


@dataclass(frozen=True, slots=True, eq=False)
class Ground:
    """Everything that the rasters say about one hop; ``files`` are those that a number of the study depends on."""

    line: PathLine
    profile: Profile
    terrain: TerrainUse
    corridor: Corridor | None
    relief: Relief | None
    heights_around_m: Float | None
    files: tuple[Path, ...]


def read_ground(
    hop: Hop, terrain: Terrain, *, relief: bool = False, around: tuple[Float, Float] | None = None
) -> Ground:
    """Read the ground and the cover under, beside and around one hop.

    Parameters
    ----------
    hop
        The hop.
    terrain
        The open terrain.
    relief
        Whether to read the ground some way to both sides too, for the view from above.
    around
        Longitudes and latitudes of further points wanted, such as the grid for the terrain's roughness.

    Returns
    -------
    Ground

    Raises
    ------
    MissingGroundError
        Where the path has no ground and the hop file does not let it be filled.
    InputError, RasterError
        For rasters that cannot be used, datums that do not agree, or points too far apart.
    """
    line, cell_m = _lay_path(hop, terrain)
    samples = terrain.sample(line.longitude, line.latitude)
    ground_m = np.array(samples.ground_m)
    site_notes = _with_true_sites(hop, terrain, line, ground_m)
    differences = _with_surveys(hop, ground_m)
    ground_m, filled, fill_notes = _without_gaps(hop, line, ground_m)
    cover = _cover(hop, line, line.longitude, line.latitude)
    surveyed = np.zeros(line.points, dtype=bool)
    surveyed[[0, -1]] = [difference is not None for difference in differences]
    profile = Profile(
        distance_m=line.along_m,
        longitude=line.longitude,
        latitude=line.latitude,
        ground_m=frozen_array(ground_m),
        cover_m=cover.cover_m,
        filled=frozen_array(filled, np.bool_),
        surveyed=frozen_array(surveyed, np.bool_),
    )
    corridor, beside, cover_files = _corridor(hop, terrain, profile, line, cell_m)
    datum, datum_notes = common_datum([*samples.sources, *beside], allow_mixed=hop.terrain.allow_mixed_datums)
    use = TerrainUse(
        method=hop.terrain.method,
        spacing_m=line.spacing_m,
        finest_cell_m=cell_m,
        vertical_datum=samples.vertical_datum,
        sources=samples.sources,
        filled_points=int(filled.sum()),
        surveyed_difference_a_m=differences[0],
        surveyed_difference_b_m=differences[1],
        notes=(*samples.notes, *(datum_notes if datum != samples.vertical_datum else ()), *fill_notes, *site_notes),
        cover_notes=cover.notes,
    )
    wide = None if around is None else terrain.sample(*around, allow_mixed_datums=True)
    sources = [*samples.sources, *beside, *(() if wide is None else wide.sources)]
    files = [*(path for source in sources for path in source.files), *cover.files, *cover_files]
    return Ground(
        line=line,
        profile=profile,
        terrain=use,
        corridor=corridor,
        relief=_relief(terrain, line) if relief else None,
        heights_around_m=None if wide is None else wide.ground_m,
        files=tuple(dict.fromkeys(files)),
    )


def _lay_path(hop: Hop, terrain: Terrain) -> tuple[PathLine, float]:
    """Trace the path with points at most half the finest cell apart, unless the hop file says otherwise."""
    length_m, spacing_m = float(geodesic(*hop.ends)[0]), hop.terrain.spacing_m
    coarse = trace(*hop.ends, spacing_m=length_m / _SEARCH_STEPS)
    # a cell is measured where the path meets its raster first: ask from both ends, or swapping them moves the points
    cell_m = min(terrain.finest_cell_m(coarse.longitude[::way], coarse.latitude[::way]) for way in (1, -1))
    if spacing_m is None:
        spacing_m = min(0.5 * cell_m, length_m / _DEFAULT_STEPS)
    elif spacing_m * _FEWEST_STEPS > length_m:
        raise InputError(
            f"terrain.spacing_m = {spacing_m:g}: must be at most one {_FEWEST_STEPS}th of this path of"
            f" {length_m / 1e3:.2f} km; leave it out for half the finest cell"
        )
    with under("terrain", TerrainChoice):
        return trace(*hop.ends, spacing_m=spacing_m), cell_m


def _without_gaps(hop: Hop, line: PathLine, ground_m: Float) -> tuple[Float, np.ndarray, tuple[str, ...]]:
    """Ground with its gaps filled where the hop file allows it; otherwise a gap is an error that says where."""
    filled = np.zeros(line.points, dtype=bool)
    notes: tuple[str, ...] = ()
    if hop.terrain.missing == "interpolate":
        ground_m, filled = fill_missing(line.along_m, ground_m)
        stretches = ", ".join(
            f"{line.along_m[first] / 1e3:.2f} to {line.along_m[last] / 1e3:.2f} km"
            for first, last in missing_stretches(np.where(filled, np.nan, 0.0))
        )
        if stretches:
            notes = (f"ground missing at {stretches}: interpolated along the path, as the hop file allows",)
    require_ground(line.along_m, line.longitude, line.latitude, ground_m)
    return ground_m, filled, notes


def _with_true_sites(hop: Hop, terrain: Terrain, line: PathLine, ground_m: Float) -> tuple[str, ...]:
    """Put bilinear ground in at the sites: the highest cell around one would lift its antenna with it."""
    if hop.terrain.method != "highest":
        return ()
    ends = [0, -1]
    ground_m[ends] = terrain.sample(line.longitude[ends], line.latitude[ends], method="bilinear").ground_m
    return ("ground at the sites: bilinear, as the highest cell around would lift the antennas",)


def _with_surveys(hop: Hop, ground_m: Float) -> tuple[float | None, float | None]:
    """Put the surveyed ground in at the sites, and say how far the raster was from it."""

    def difference(site: Site, raster_m: float) -> float | None:
        survey_m = site.surveyed_ground_m
        return None if survey_m is None or np.isnan(raster_m) else survey_m - raster_m

    differences = difference(hop.site_a, float(ground_m[0])), difference(hop.site_b, float(ground_m[-1]))
    if hop.site_a.surveyed_ground_m is not None:
        ground_m[0] = hop.site_a.surveyed_ground_m
    if hop.site_b.surveyed_ground_m is not None:
        ground_m[-1] = hop.site_b.surveyed_ground_m
    return differences


def _cover(hop: Hop, line: PathLine, longitude: Float, latitude: Float, part: slice = slice(None)) -> Cover:
    """Cover at points of a part of the path or beside it, with the clearings around the sites taken out.

    On the path a gap in the cover is an error; beside it, where there are many columns, it is left and counted.
    """
    beside, along_m = longitude.ndim > 1, line.along_m[part]
    cover = cover_along(
        hop.cover, line.along_m, longitude, latitude, rows=part, method=hop.terrain.method, allow_gaps=beside
    )
    heights, notes = np.array(cover.cover_m), list(cover.notes)
    for site, from_site_m in ((hop.site_a, along_m), (hop.site_b, line.distance_m - along_m)):
        if site.clearing_m > 0:
            heights[from_site_m <= site.clearing_m] = 0.0
            notes.append(f"no cover within {site.clearing_m:g} m of {site.name}, as the hop file says")
    return Cover(frozen_array(heights), tuple(notes), cover.files)


def require_above_cover(hop: Hop, profile: Profile) -> None:
    """Stop when an antenna stands inside the cover at its own site: no loss has a value there.

    The same goes for the lower antennas of a diversity pair, in the cover or under the ground: no credit is due there.

    Raises
    ------
    InputError
        Naming the site and the cover, or the spacing.
    """
    pair = None if hop.availability is None else hop.availability.diversity
    for key, site, cover_m in (
        ("site_a", hop.site_a, float(profile.cover_m[0])),
        ("site_b", hop.site_b, float(profile.cover_m[-1])),
    ):
        if site.antenna_m <= cover_m:
            raise InputError(
                f"{key}.antenna_m = {site.antenna_m:g}: must be above the {cover_m:.1f} m of cover at {site.name};"
                f" raise it, or give {key}.clearing_m if the trees around the mast are cut"
            )
        if pair is not None and site.antenna_m - pair.spacing_m <= cover_m:
            stands = f"the {cover_m:.1f} m of cover" if cover_m > 0 else "the ground"
            raise InputError(
                f"availability.diversity.spacing_m = {pair.spacing_m:g}: must be under {site.antenna_m - cover_m:g} m,"
                f" to keep the lower antenna above {stands} at {site.name}; space them closer, or raise"
                f" {key}.antenna_m = {site.antenna_m:g}"
            )


def _lower_rules(hop: Hop) -> tuple[Rule, ...]:
    """Rule of a diversity pair's lower antennas; its k has no part in the width of the zone."""
    if hop.availability is None or hop.availability.diversity is None:
        return ()
    from profiler.heights import lower_rules

    return lower_rules(hop.heights.diversity_obstruction, 1.0)[:1]


def _corridor(
    hop: Hop, terrain: Terrain, profile: Profile, line: PathLine, cell_m: float
) -> tuple[Corridor | None, list[SourceUse], list[Path]]:
    """Surface across the path to the edge of the widest zone asked for, NaN where unknown, and what it is from.

    The path's own points keep their profile. Across, points stand half a cell apart, but no closer than a tenth of the
    zone: what is narrower than that hides next to none of it.
    """
    fraction = max(rule.fresnel_fraction for rule in (*hop.rules, *_lower_rules(hop)))
    if fraction == 0.0:
        return None, [], []
    widest = float(np.abs(corridor_offsets(line.along_m, hop.frequency_hz, fraction, np.inf)).max())
    offset = corridor_offsets(line.along_m, hop.frequency_hz, fraction, max(0.5 * cell_m, widest / _ACROSS_STEPS))
    longitude, latitude = across(line, offset)
    surface, cover_m = np.empty_like(offset), np.empty_like(offset)
    sources: list[SourceUse] = []
    files: list[Path] = []
    rows = max(1, _POINTS_AT_ONCE // offset.shape[1])
    for part in (slice(first, first + rows) for first in range(0, line.points, rows)):
        samples = terrain.sample(longitude[part], latitude[part])
        cover = _cover(hop, line, longitude[part], latitude[part], part)
        surface[part], cover_m[part] = samples.ground_m + cover.cover_m, cover.cover_m
        sources += samples.sources
        files += cover.files
    # at the sites the zone has no width: what a survey or a fill says of the path holds for the whole row there
    surface = np.where(offset == 0.0, profile.surface_m[:, None], surface)
    return Corridor(frozen_array(offset), frozen_array(surface), frozen_array(cover_m)), sources, files


def _relief(terrain: Terrain, line: PathLine) -> Relief:
    """Ground on a grid along the path, as wide as an eighth of its length but 3 to 10 km."""
    half_width = float(np.clip(line.distance_m / 16.0, 1.5e3, 5e3))
    site_a, site_b = ((float(line.longitude[end]), float(line.latitude[end])) for end in (0, -1))
    thin = trace(*site_a, *site_b, spacing_m=line.distance_m / _RELIEF_ALONG)
    offset = np.linspace(-half_width, half_width, _RELIEF_ACROSS)
    longitude, latitude = across(thin, offset[None, :])
    return Relief(
        along_m=thin.along_m,
        offset_m=frozen_array(offset),
        ground_m=frozen_array(terrain.sample(longitude, latitude, allow_mixed_datums=True).ground_m),
    )
