"""Hops as plain arrays, checked once, and handed to the methods a block at a time so that memory stays bounded.

Every method works in one frame: t, the fraction of the way from A to B, and the rise of a point over the straight ray,
both taken on ground bulged by the effective earth. In it a method needs a few products and one maximum per point.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from profiler.checks import positive
from profiler.errors import InputError, MissingGroundError
from profiler.units import Float, wavelength

__all__ = ["Block", "Hops", "Index", "Points"]

Index = NDArray[np.intp]

_SAME_FRACTION = 1e-12
"""Hops of unlike lengths whose points stand at the same fractions of them, but for rounding, share one grid."""

_POINTS_PER_BLOCK = 1 << 16
"""Half a megabyte per working array: three of them fit the second-level cache of a present core."""


@dataclass(frozen=True, slots=True, eq=False)
class Grid:
    """What depends on the distances alone, at the points between the ends: `(n - 2,)` for all hops, or a row a hop."""

    t: Float
    from_a: Float
    """1/t."""
    from_b: Float
    """1/(1 − t)."""
    bow: Float
    """t(1 − t): the shape of the earth's bulge."""
    weight: Float
    """1/sqrt(t(1 − t)): what turns a rise into ν, but for a factor of the hop."""
    under_a: Float
    """Weights of the heights of all points, ends included, in the height of the smooth surface under A."""
    under_b: Float

    @classmethod
    def of(cls, fraction: Float) -> Grid:
        """Build the tables from the fractions t of all points, ends included."""
        t = fraction[..., 1:-1]
        bow = t * (1.0 - t)
        return cls(t, 1.0 / t, 1.0 / (1.0 - t), bow, 1.0 / np.sqrt(bow), *_smooth_fit(fraction))


def _smooth_fit(fraction: Float) -> tuple[Float, Float]:
    """Weights that turn the heights of all points into the smooth surface's heights under A and B.

    The surface is the least-squares straight line through the ground, taken as straight between its points.
    """
    step = np.diff(fraction, axis=-1)
    edge = np.zeros_like(fraction[..., :1])
    before, after = np.concatenate([edge, step], axis=-1), np.concatenate([step, edge], axis=-1)
    behind, ahead = np.roll(fraction, 1, axis=-1), np.roll(fraction, -1, axis=-1)
    v1 = before + after
    v2 = before * (2.0 * fraction + behind) + after * (2.0 * fraction + ahead)
    return 2.0 * v1 - v2, v2 - v1


@dataclass(frozen=True, slots=True, eq=False)
class Points:
    """One profile point a hop: where it is and how far it rises over the ray on the bulged earth."""

    t: Float
    height_m: Float
    """Above the datum, without the bulge."""
    rise_m: Float


@dataclass(frozen=True, slots=True, eq=False)
class Block:
    """A run of hops with float64 heights in one piece of memory; arrays are `(rows, …)`."""

    grid: Grid
    height_m: Float
    centre_a_m: Float
    centre_b_m: Float
    bulge_m: Float
    """d²/(2·a): four times the bulge at mid-path."""
    length_m: Float
    wavelength_m: Float

    def above_chord(self) -> Float:
        """Heights of the inner points above the line between the antennas, without the bulge, `(rows, n - 2)`."""
        a, b = self.centre_a_m[:, None], self.centre_b_m[:, None]
        return np.asarray(self.height_m[:, 1:-1] - (a + (b - a) * self.grid.t))

    def rise(self) -> Float:
        """Rise of the inner points over the ray on the bulged earth, m, `(rows, n - 2)`."""
        return np.asarray(self.above_chord() + self.bulge_m[:, None] * self.grid.bow)


@dataclass(frozen=True, slots=True, eq=False)
class Hops:
    """Checked inputs of `hops` paths of `points` profile points each; the per-hop arrays are `(hops,)`."""

    distance_m: Float
    """`(points,)`, shared by all hops, or `(hops, points)`."""
    height_m: NDArray[Any]
    """`(hops, points)`; maybe a view of one profile, any number type."""
    centre_a_m: Float
    centre_b_m: Float
    frequency_hz: Float
    radius_m: Float
    length_m: Float
    single: bool
    """Everything was given for one hop: results come back without the axis of hops."""

    @classmethod
    def of(
        cls,
        distance_m: ArrayLike,
        height_m: ArrayLike,
        centre_a_m: ArrayLike,
        centre_b_m: ArrayLike,
        frequency_hz: ArrayLike,
        effective_radius_m: ArrayLike,
    ) -> Hops:
        """Check the shapes and ranges of the inputs and broadcast them over the hops; heights are checked by block."""
        distance = np.asarray(distance_m, dtype=float)
        height = np.asarray(height_m)
        if not (1 <= distance.ndim <= 2 and 1 <= height.ndim <= 2) or distance.shape[-1] != height.shape[-1]:
            raise InputError(
                f"distance_m has shape {distance.shape} and height_m {height.shape}: must be (points,) or "
                "(hops, points), with as many points in both"
            )
        points = height.shape[-1]
        if points < 3:
            raise InputError(f"height_m has {points} points: must be at least 3, the two ends and one between")
        per_hop = [
            np.asarray(centre_a_m, dtype=float),
            np.asarray(centre_b_m, dtype=float),
            positive("frequency_hz", frequency_hz, "Hz"),
            positive("effective_radius_m", effective_radius_m, "m", infinite=True),
        ]
        try:
            shape = np.broadcast_shapes(distance.shape[:-1], height.shape[:-1], *(value.shape for value in per_hop))
        except ValueError:
            shape = (0, 0)
        if len(shape) > 1:
            shapes = ", ".join(str(value.shape) for value in per_hop)
            raise InputError(
                f"shapes distance_m {distance.shape}, height_m {height.shape}, centres, frequency and radius {shapes} "
                "do not fit: each of the last four must be one value or one per hop"
            )
        hops = shape[0] if shape else 1
        if hops == 0:
            raise InputError("height_m has no hops: must be at least one profile")
        _check_distance(distance)
        a, b, frequency, radius = (np.broadcast_to(value, (hops,)) for value in per_hop)
        height = np.broadcast_to(height, (hops, points))
        _check_ends(a, height[:, 0], "A")
        _check_ends(b, height[:, -1], "B")
        length = np.broadcast_to(distance[..., -1], (hops,))
        return cls(distance, height, a, b, frequency, radius, length, not shape)

    @property
    def wavelength_m(self) -> Float:
        """Wavelength of each hop, m."""
        return wavelength(self.frequency_hz)

    @property
    def bulge_m(self) -> Float:
        """d²/(2·a) of each hop: four times the bulge at mid-path, m."""
        return np.asarray(self.length_m * self.length_m / (2.0 * self.radius_m))

    def with_radius(self, radius_m: ArrayLike) -> Hops:
        """Return the same hops over another effective radius."""
        radius = positive("edges_radius_m", radius_m, "m", infinite=True)
        columns = (self.distance_m, self.height_m, self.centre_a_m, self.centre_b_m, self.frequency_hz)
        return Hops(*columns, np.broadcast_to(radius, self.radius_m.shape), self.length_m, self.single)

    def blocks(self) -> Iterator[Block]:
        """Yield the hops in blocks that fit the cache, and raise MissingGroundError where a height is not a number."""
        hops, points = self.height_m.shape
        rows = min(hops, max(1, _POINTS_PER_BLOCK // points))
        bulge, lam = self.bulge_m, self.wavelength_m
        first = self.distance_m if self.distance_m.ndim == 1 else self.distance_m[0]
        common = first / first[-1]
        common_grid = Grid.of(common)
        for start in range(0, hops, rows):
            part = slice(start, start + rows)
            height = np.ascontiguousarray(self.height_m[part], dtype=float)
            if not np.isfinite(height).all():
                self._raise_missing(start, height)
            grid = common_grid
            if self.distance_m.ndim == 2:
                fraction = np.broadcast_to(self.distance_m, self.height_m.shape)[part] / self.length_m[part, None]
                if np.abs(fraction - common).max() > _SAME_FRACTION:
                    grid = Grid.of(fraction)
            yield Block(
                grid,
                height,
                self.centre_a_m[part],
                self.centre_b_m[part],
                bulge[part],
                self.length_m[part],
                lam[part],
            )

    def run(self, kernel: Callable[[Block], tuple[NDArray[Any], ...]]) -> tuple[NDArray[Any], ...]:
        """Apply `kernel` to every block and join the `(rows,)` columns that it returns into `(hops,)` columns."""
        parts = [kernel(block) for block in self.blocks()]
        return tuple(np.concatenate(column) for column in zip(*parts, strict=True))

    def fraction_at(self, index: Index) -> Float:
        """Fraction t of the inner point `index` of each hop, `(..., hops)`; 0 is the first point after A."""
        if self.distance_m.ndim == 1:
            return np.asarray(self.distance_m[index + 1] / self.distance_m[-1])
        distance = np.broadcast_to(self.distance_m, self.height_m.shape)
        return np.asarray(distance[np.arange(index.shape[-1]), index + 1] / self.length_m)

    def points_at(self, index: Index) -> Points:
        """Return the inner point `index` of each hop."""
        t = self.fraction_at(index)
        height = self.height_m[np.arange(index.size), index + 1].astype(float)
        return Points(t, height, height - self.datum_height(t, 0.0))

    def datum_height(self, t: Float, rise_m: Float | float) -> Float:
        """Height above the datum, without the bulge, of what rises `rise_m` over the ray at `t` on the bulged earth."""
        chord = self.centre_a_m * (1.0 - t) + self.centre_b_m * t
        return np.asarray(chord - self.bulge_m * t * (1.0 - t) + rise_m)

    def _raise_missing(self, start: int, height: Float) -> None:
        row, point = (int(i) for i in np.argwhere(~np.isfinite(height))[0])
        hop = "" if self.single else f" of hop {start + row}"
        where = np.broadcast_to(self.distance_m, self.height_m.shape)[start + row, point]
        raise MissingGroundError(
            f"height_m at point {point}{hop}, {where / 1000.0:.3f} km from A, is {height[row, point]}: "
            "must be a number; fill the missing ground first"
        )


def _check_distance(distance_m: Float) -> None:
    """Raise InputError unless every row starts at 0 and increases."""
    first = distance_m[..., 0]
    if (first != 0).any():
        raise InputError(f"distance_m starts at {first[first != 0].flat[0]:g} m: must start at 0 m, at site A")
    stuck = ~(distance_m[..., 1:] > distance_m[..., :-1]) | np.isinf(distance_m[..., 1:])
    if stuck.any():
        at = np.argwhere(stuck)[0]
        before, after = distance_m[(*at[:-1], at[-1])], distance_m[(*at[:-1], at[-1] + 1)]
        raise InputError(
            f"distance_m goes from {before:g} to {after:g} m at point {at[-1] + 1}: must be finite and rise from A to B"
        )


def _check_ends(centre_m: Float, surface_m: NDArray[Any], site: str) -> None:
    """Raise InputError where an antenna is not a number or below the surface at its own site."""
    low = ~(np.isfinite(centre_m) & ~(centre_m < surface_m))
    if low.any():
        at = int(np.argmax(low))
        raise InputError(
            f"centre_{site.lower()}_m = {centre_m[at]:g}: must be a number not below the surface at site {site}, "
            f"{surface_m[at]:g} m; raise the antenna or clear the cover at the site"
        )
