"""The first half of a study: from two sites and some rasters to a profile, what is beside it and a view from above."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np

from profiler.cover import open_cover
from profiler.errors import InputError
from profiler.geometry import Surface
from profiler.models import Hop, Profile, Site, frozen_array
from profiler.path import PathLine, across, trace
from profiler.study.along_path import lay_profile
from profiler.study.beside import read_beside
from profiler.study.result import Relief, TerrainUse
from profiler.study.terrain_notes import passed_over
from profiler.terrain import Terrain, common_datum, fill_missing, missing_stretches, require_ground
from profiler.units import Float

__all__ = ["Ground", "read_ground", "require_above_cover"]

_RELIEF_ALONG, _RELIEF_ACROSS = 320, 61


@dataclass(frozen=True, slots=True, eq=False)
class Ground:
    """Everything that the rasters say about one hop; ``files`` are those that a number of the study depends on."""

    line: PathLine
    profile: Profile
    terrain: TerrainUse
    surface: Surface
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
    with open_cover(hop.cover, hop.terrain.method) as cover:
        along = lay_profile(hop, terrain, cover)
        line = along.line
        ground_m, filled, fill_notes = _without_gaps(hop, terrain, line, along.ground_m)
        surveyed = np.zeros(line.points, dtype=bool)
        surveyed[[0, -1]] = [site.surveyed_ground_m is not None for site in (hop.site_a, hop.site_b)]
        profile = Profile(
            distance_m=line.along_m,
            longitude=line.longitude,
            latitude=line.latitude,
            ground_m=frozen_array(ground_m),
            cover_m=frozen_array(along.cover_m),
            filled=frozen_array(filled, np.bool_),
            surveyed=frozen_array(surveyed, np.bool_),
        )
        beside = read_beside(hop, terrain, cover, line, profile, along.settled_m)
    datum, datum_notes = common_datum([*along.sources, *beside.sources], allow_mixed=hop.terrain.allow_mixed_datums)
    differences = _survey_differences(hop, along.raster_ends_m)
    use = TerrainUse(
        method=hop.terrain.method,
        spacing_m=along.spacing_m,
        finest_cell_m=along.finest_cell_m,
        vertical_datum=along.vertical_datum,
        sources=along.sources,
        filled_points=int(filled.sum()),
        filled_share=float(profile.weight_m[filled].sum() / line.distance_m),
        surveyed_difference_a_m=differences[0],
        surveyed_difference_b_m=differences[1],
        notes=(
            *along.notes,
            *(datum_notes if datum != along.vertical_datum else ()),
            *fill_notes,
            *passed_over(terrain),
        ),
        cover_notes=along.cover_notes,
        sea_share=along.sea_share,
        warnings=along.warnings,
    )
    wide = None if around is None else terrain.sample(*around, allow_mixed_datums=True)
    sources = [*along.sources, *beside.sources, *(() if wide is None else wide.sources)]
    files = [*(path for source in sources for path in source.files), *along.cover_files, *beside.cover_files]
    return Ground(
        line=line,
        profile=profile,
        terrain=use,
        surface=beside.surface,
        relief=_relief(terrain, line) if relief else None,
        heights_around_m=None if wide is None else wide.ground_m,
        files=tuple(dict.fromkeys(files)),
    )


def _without_gaps(
    hop: Hop, terrain: Terrain, line: PathLine, ground_m: Float
) -> tuple[Float, np.ndarray, tuple[str, ...]]:
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
    if np.isnan(ground_m).any():
        covered = terrain.covers(line.longitude, line.latitude)
        require_ground(
            line.along_m, line.longitude, line.latitude, ground_m, covered=covered, interpolated=bool(filled.any())
        )
    return ground_m, filled, notes


def _survey_differences(hop: Hop, raster_ends_m: tuple[float, float]) -> tuple[float | None, float | None]:
    """How far the surveyed ground at A and B is from the raster's."""

    def difference(site: Site, raster_m: float) -> float | None:
        survey_m = site.surveyed_ground_m
        return None if survey_m is None or np.isnan(raster_m) else survey_m - raster_m

    return difference(hop.site_a, raster_ends_m[0]), difference(hop.site_b, raster_ends_m[1])


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
