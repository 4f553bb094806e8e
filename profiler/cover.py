"""What stands on the ground: canopy rasters, land-cover classes with a height each, and obstacles on the path."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import ExitStack, contextmanager
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike

from profiler.errors import InputError, MissingGroundError, under
from profiler.models import CoverChoice, Obstacle, SampleMethod, frozen_array
from profiler.remarks import Length, Note, note, percent_text
from profiler.units import Float

if TYPE_CHECKING:
    from profiler.terrain import Classes, Layer, Strip, Terrain

__all__ = ["Cover", "CoverRasters", "obstacle_edges", "obstacle_extent", "obstacle_heights", "open_cover"]

_NARROWEST_M = 0.01
"""An obstacle that is narrower, such as one given by a single distance, is taken to be so wide."""


@dataclass(frozen=True, slots=True, eq=False)
class Cover:
    """Cover heights at the points asked for, where they came from, and the files that were read for them."""

    cover_m: Float
    notes: tuple[Note, ...]
    files: tuple[Path, ...] = ()


def obstacle_extent(obstacle: Obstacle) -> tuple[float, float]:
    """Where an obstacle begins and ends, metres from A."""
    wider = max(0.0, 0.5 * (_NARROWEST_M - (obstacle.to_m - obstacle.from_m)))
    return obstacle.from_m - wider, obstacle.to_m + wider


def obstacle_edges(obstacles: tuple[Obstacle, ...], length_m: float) -> Float:
    """Distances from A, inside the path, at which an obstacle begins or ends.

    Parameters
    ----------
    obstacles
        The obstacles.
    length_m
        Length of the path, metres.

    Raises
    ------
    InputError
        If an obstacle reaches beyond the path.

    Examples
    --------
    >>> obstacle_edges((Obstacle("barn", 90.0, 210.0, 8.0), Obstacle("mast", 0.0, 0.0, 30.0)), 300.0).tolist()
    [90.0, 210.0, 0.005]
    """
    for each in obstacles:
        if each.to_m > length_m:
            raise InputError(f"obstacle {each.name}: to_m = {each.to_m:.0f}: must lie within the {length_m:.0f} m path")
    edges = np.array([edge for each in obstacles for edge in obstacle_extent(each)])
    return edges[(edges > 0.0) & (edges < length_m)]


def obstacle_heights(distance_m: ArrayLike, obstacles: tuple[Obstacle, ...]) -> Float:
    """Height of the tallest obstacle at each distance, 0 where none stands; its edges belong to an obstacle.

    Parameters
    ----------
    distance_m
        Distances from A, any shape.
    obstacles
        The obstacles.

    Returns
    -------
    ndarray
        Heights above ground, metres, the shape of the distances.

    Examples
    --------
    >>> obstacle_heights([0.0, 100.0, 200.0], (Obstacle("mast", 200, 200, 30), Obstacle("barn", 90, 210, 8))).tolist()
    [0.0, 8.0, 30.0]
    """
    distance = np.asarray(distance_m, dtype=float)
    heights = np.zeros_like(distance)
    for each in obstacles:
        first, last = obstacle_extent(each)
        stands = (distance >= first) & (distance <= last)
        heights[stands] = np.maximum(heights[stands], each.height_m)
    return heights


@dataclass(frozen=True, slots=True)
class CoverRasters:
    """The rasters of one choice of cover, open; made by `open_cover`, which closes them."""

    choice: CoverChoice
    canopy: Terrain | None
    classes: Classes | None

    def crossings(self, longitude: ArrayLike, latitude: ArrayLike) -> Float:
        """Fractions of the way along a path between which the cover is one parabola: as `Terrain.crossings`."""
        rasters = [each for each in (self.canopy, self.classes) if each is not None]
        return np.concatenate([np.zeros(0), *(each.crossings(longitude, latitude) for each in rasters)])

    def sample(
        self,
        distance_m: Float,
        longitude: Float,
        latitude: Float,
        *,
        weight_m: Float | None = None,
    ) -> Cover:
        """Cover heights at the points of a path, from the rasters; obstacles come on top.

        Canopy rasters come first; where they have no data the land-cover class gives the height. Where a raster was
        given and neither has data, it is an error.

        Parameters
        ----------
        distance_m
            Distances from A, (m,), for the message.
        longitude, latitude
            The points, degrees, a row for each distance: (m, ...).
        weight_m
            Length of the path that each point stands for, for the shares in the notes; equal by default.

        Returns
        -------
        Cover

        Raises
        ------
        MissingGroundError
            Where a given raster has no data and no other source covers for it.
        InputError
            For a land-cover class with no height, or a canopy below the ground.
        """
        choice = self.choice
        weight = np.ones(longitude.shape) if weight_m is None else weight_m
        heights, notes, files = np.full(longitude.shape, np.nan), list[Note](), list[Path]()
        if self.canopy is not None:
            heights, read = _canopy_heights(self.canopy, choice, longitude, latitude)
            files += read
            share = 1.0 - weight[np.isnan(heights)].sum() / weight.sum()
            names = ", ".join(path.name for path in choice.canopy)
            notes.append(note("cover", "canopy heights from {} on {} of the path", names, percent_text(share)))
        gaps = np.isnan(heights)
        if self.classes is not None and gaps.any():
            heights[gaps], read = _class_heights(self.classes, choice, longitude[gaps], latitude[gaps])
            files += read
            share, name = weight[gaps].sum() / weight.sum(), "" if choice.landcover is None else choice.landcover.name
            notes.append(note("cover", "class heights from {} on {} of the path", name, percent_text(share)))
        if self.canopy is None and self.classes is None:
            heights[:] = 0.0
            none = "no cover given: trees and buildings are not in this result"
            notes.append(note("cover", "cover from the listed obstacles only" if choice.obstacles else none))
        if np.isnan(heights).any():
            row = int(np.argwhere(np.isnan(heights))[0][0])
            raise MissingGroundError(
                f"cover: no data {distance_m[row]:.0f} m from A: must be covered; give more rasters, or"
                " cover.landcover with cover.class_heights_m for the rest"
            )
        if choice.obstacles:
            named = [part for each in choice.obstacles for part in (each.name, Length(each.height_m))]
            notes.append(note("cover", f"obstacles: {', '.join('{} {}' for _ in choice.obstacles)}", *named))
        return Cover(frozen_array(heights), tuple(notes), tuple(files))

    def layers(self, strip: Strip) -> tuple[list[Layer], list[Layer], tuple[Path, ...]]:
        """Canopy heights and class heights on a strip beside a path, in the squares of their grids, and the files read.

        Raises
        ------
        InputError
            For a land-cover class with no height, or a canopy below the ground.
        """
        canopy: list[Layer] = []
        classes: list[Layer] = []
        files: list[Path] = []
        if self.canopy is not None:
            with under("cover.canopy"):
                canopy, sources = self.canopy.layers(strip)
            files += [path for use in sources for path in use.files]
            _require_canopy(self.choice, *(layer.corners for layer in canopy))
        if self.classes is not None:
            with under("cover.landcover"):
                found, read = self.classes.layers(strip)
            files += read
            classes = [replace(layer, corners=_heights_of(self.choice, layer.corners)) for layer in found]
        return canopy, classes, tuple(files)


@contextmanager
def open_cover(choice: CoverChoice, method: SampleMethod = "bilinear") -> Iterator[CoverRasters]:
    """Open the cover rasters of a choice, if it has any, and close them after.

    Parameters
    ----------
    choice
        What the hop file says about cover; with nothing in it the cover is 0 everywhere, and the notes say so.
    method
        How canopy rasters are read, as for terrain.

    Raises
    ------
    InputError, RasterError
        For rasters that do not exist or cannot be used.

    Examples
    --------
    >>> x = np.array([0.0, 100.0])
    >>> with open_cover(CoverChoice()) as cover:
    ...     print(*cover.sample(x, x, x).notes)
    no cover given: trees and buildings are not in this result
    """
    with ExitStack() as stack:
        canopy = classes = None
        if choice.canopy:
            from profiler.terrain import open_terrain

            with under("cover.canopy"):
                canopy = stack.enter_context(
                    open_terrain(choice.canopy, method=method, allow_mixed_datums=True, eight_bit=True)
                )
        if choice.landcover is not None:
            from profiler.terrain import open_classes

            with under("cover.landcover"):
                classes = stack.enter_context(open_classes(choice.landcover))
        yield CoverRasters(choice, canopy, classes)


def _canopy_heights(
    canopy: Terrain, choice: CoverChoice, longitude: Float, latitude: Float
) -> tuple[Float, tuple[Path, ...]]:
    """Heights from the canopy rasters, NaN where they have none, and the files read."""
    with under("cover.canopy"):
        samples = canopy.sample(longitude, latitude)
    heights = np.array(samples.ground_m)
    _require_canopy(choice, heights)
    return heights, tuple(path for use in samples.sources for path in use.files)


def _require_canopy(choice: CoverChoice, *heights_m: Float) -> None:
    lowest = min((np.nanmin(each, initial=0.0) for each in heights_m), default=0.0)
    if lowest < 0.0:
        raise InputError(f"cover.canopy = {choice.canopy[0]}: must hold heights of 0 m or more, not {lowest:g} m")


def _class_heights(
    rasters: Classes, choice: CoverChoice, longitude: Float, latitude: Float
) -> tuple[Float, tuple[Path, ...]]:
    """Height of the land-cover class under each point, NaN where the raster has no class, and the files read."""
    with under("cover.landcover"):
        classes, files = rasters.sample(longitude, latitude)
    return _heights_of(choice, np.where(classes >= 0, classes, np.nan)), files


def _heights_of(choice: CoverChoice, classes: Float) -> Float:
    """Heights of classes, NaN where there is none."""
    table, name = dict(choice.class_heights_m), "" if choice.landcover is None else choice.landcover.name
    found = {int(each) for each in np.unique(classes[~np.isnan(classes)])}
    unknown = sorted(found - table.keys())
    if unknown:
        raise InputError(
            f"cover.class_heights_m: {name} holds class {unknown[0]} on or beside the path: must list"
            f" a height for it; give 0 for bare ground (listed: {sorted(table)})"
        )
    heights = np.full(classes.shape, np.nan)
    for each in found:
        heights[classes == each] = table[each]
    return heights
