"""What stands on the ground: canopy rasters, land-cover classes with a height each, and obstacles on the path."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

import numpy as np

from profiler.errors import InputError, MissingGroundError, under
from profiler.models import CoverChoice, Obstacle, SampleMethod, frozen_array
from profiler.units import Float

__all__ = ["Cover", "cover_along", "obstacle_heights"]


@dataclass(frozen=True, slots=True, eq=False)
class Cover:
    """Cover heights at the points asked for, where they came from, and the files that were read for them."""

    cover_m: Float
    notes: tuple[str, ...]
    files: tuple[Path, ...] = ()


def obstacle_heights(distance_m: Float, obstacles: tuple[Obstacle, ...]) -> Float:
    """Height of the tallest obstacle at each distance, 0 where none stands.

    An obstacle narrower than the step between points counts at the point nearest to its middle, so that none slips
    between two points.

    Parameters
    ----------
    distance_m
        Distances from A, (n,), ascending.
    obstacles
        The obstacles; each must lie within the path.

    Returns
    -------
    ndarray
        Heights above ground, metres, (n,).

    Raises
    ------
    InputError
        If an obstacle reaches beyond the path.

    Examples
    --------
    >>> x = np.array([0.0, 100.0, 200.0, 300.0])
    >>> obstacle_heights(x, (Obstacle("mast", 190.0, 195.0, 30.0), Obstacle("barn", 90.0, 210.0, 8.0))).tolist()
    [0.0, 8.0, 30.0, 0.0]
    """
    heights = np.zeros_like(distance_m)
    for obstacle in obstacles:
        if obstacle.to_m > distance_m[-1]:
            raise InputError(
                f"obstacle {obstacle.name}: to_m = {obstacle.to_m:.0f}: must lie within the {distance_m[-1]:.0f} m path"
            )
        under = (distance_m >= obstacle.from_m) & (distance_m <= obstacle.to_m)
        under[np.argmin(np.abs(distance_m - 0.5 * (obstacle.from_m + obstacle.to_m)))] = True
        heights[under] = np.maximum(heights[under], obstacle.height_m)
    return heights


def cover_along(
    choice: CoverChoice,
    distance_m: Float,
    longitude: Float,
    latitude: Float,
    *,
    rows: slice = slice(None),
    method: SampleMethod = "bilinear",
    allow_gaps: bool = False,
) -> Cover:
    """Cover heights at the points of a path, or of a corridor around it.

    Canopy rasters come first; where they have no data the land-cover class gives the height; obstacles stand on top of
    neither: the taller of cover and obstacle counts. Where a raster was given and neither has data, it is an error.

    Parameters
    ----------
    choice
        What the hop file says about cover; with nothing in it the cover is 0 everywhere, and the notes say so.
    distance_m
        Distances from A of the whole path, (n,): an obstacle narrower than the step stands at one of them.
    longitude, latitude
        The points, degrees, a row or more for each distance of ``rows``: (m,) or (m, across).
    rows
        Which of the distances the points are at; all by default.
    method
        How canopy rasters are read, as for terrain.
    allow_gaps
        Leave NaN where nothing has data, as beside a path, where the caller counts it.

    Returns
    -------
    Cover

    Raises
    ------
    MissingGroundError
        Where a given raster has no data and no other source covers for it, unless gaps are allowed.
    InputError
        For a land-cover class with no height, or an obstacle beyond the path.

    Examples
    --------
    >>> x = np.array([0.0, 100.0])
    >>> cover_along(CoverChoice(), x, x, x).notes
    ('no cover given: trees and buildings are not in this result',)
    """
    heights = np.full(longitude.shape, np.nan)
    notes: list[str] = []
    files: list[Path] = []
    if choice.canopy:
        heights, share, read = _canopy(choice, longitude, latitude, method)
        files.extend(read)
        notes.append(f"canopy heights from {', '.join(path.name for path in choice.canopy)} on {share:.0%} of the path")
    if choice.landcover is not None:
        gaps = np.isnan(heights)
        if gaps.any():
            heights[gaps], read = _class_heights(choice, longitude[gaps], latitude[gaps])
            files.extend(read)
            notes.append(f"class heights from {choice.landcover.name} on {gaps.mean():.0%} of the path")
    if not choice.canopy and choice.landcover is None:
        heights[:] = 0.0
        notes.append(
            "cover from the listed obstacles only"
            if choice.obstacles
            else "no cover given: trees and buildings are not in this result"
        )
    if np.isnan(heights).any() and not allow_gaps:
        row = int(np.argwhere(np.isnan(heights))[0][0])
        raise MissingGroundError(
            f"cover: no data {distance_m[rows][row]:.0f} m from A: must be covered; give more rasters, or"
            " cover.landcover with cover.class_heights_m for the rest"
        )
    if choice.obstacles:
        standing = obstacle_heights(distance_m, choice.obstacles)[rows]
        heights = np.maximum(heights, standing.reshape(standing.shape + (1,) * (heights.ndim - 1)))
        notes.append("obstacles: " + ", ".join(f"{each.name} {each.height_m:g} m" for each in choice.obstacles))
    return Cover(frozen_array(heights), tuple(notes), tuple(files))


def _canopy(
    choice: CoverChoice, longitude: Float, latitude: Float, method: SampleMethod
) -> tuple[Float, float, tuple[Path, ...]]:
    """Heights from the canopy rasters, NaN where they have none, the share that they cover, and the files read."""
    from profiler.terrain import open_terrain

    with (
        under("cover.canopy"),
        open_terrain(choice.canopy, method=method, allow_mixed_datums=True, eight_bit=True) as canopy,
    ):
        samples = canopy.sample(longitude, latitude)
    heights = np.array(samples.ground_m)
    lowest = np.nanmin(heights, initial=0.0)
    if lowest < 0.0:
        raise InputError(f"cover.canopy = {choice.canopy[0]}: must hold heights of 0 m or more, not {lowest:g} m")
    return heights, float(1.0 - np.isnan(heights).mean()), tuple(path for use in samples.sources for path in use.files)


def _class_heights(choice: CoverChoice, longitude: Float, latitude: Float) -> tuple[Float, tuple[Path, ...]]:
    """Height of the land-cover class under each point, NaN where the raster has no class, and the files read."""
    from profiler.terrain import sample_classes

    assert choice.landcover is not None
    with under("cover.landcover"):
        classes, files = sample_classes(choice.landcover, longitude, latitude)
    table = dict(choice.class_heights_m)
    found = {int(each) for each in np.unique(classes[classes >= 0])}
    unknown = sorted(found - table.keys())
    if unknown:
        raise InputError(
            f"cover.class_heights_m: {choice.landcover.name} holds class {unknown[0]} on or beside the path: must list"
            f" a height for it; give 0 for bare ground (listed: {sorted(table)})"
        )
    heights = np.full(classes.shape, np.nan)
    for each in found:
        heights[classes == each] = table[each]
    return heights, files
