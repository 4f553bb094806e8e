"""The squares of a grid that a strip beside a path touches, and where along and across the path they lie.

Let x be the grid axis that the path crosses most and w the other one. The path is then w(x), its distance s(x), and
what a metre across the path adds to x and w is a function of x too: all of them so smooth that a polynomial through a
few exact places has them to a micrometre. A strip for which it has not (near a pole) is halved until it has.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np
from numpy.polynomial import chebyshev
from numpy.typing import NDArray

from profiler.units import Float

__all__ = ["Band", "Strip", "Track", "bands", "touched"]

Index = NDArray[np.intp]

_NODES = 6
_FIT_CELLS = 1e-4
_SHORTEST_M = 200.0
_EDGE = 1e-9


@dataclass(frozen=True, slots=True, eq=False)
class Strip:
    """Ground along a path, as far to both sides as matters: from ``from_m`` to ``to_m`` of its distances from A.

    ``position`` gives longitude and latitude at distances along and across the path (positive to the right), and
    ``reach_m`` the greatest half width between two distances.
    """

    from_m: float
    to_m: float
    position: Callable[[Float, Float], tuple[Float, Float]]
    reach_m: Callable[[Float, Float], Float]

    def halves(self) -> tuple[Strip, Strip]:
        """Split it at its middle."""
        middle = 0.5 * (self.from_m + self.to_m)
        return (
            Strip(self.from_m, middle, self.position, self.reach_m),
            Strip(middle, self.to_m, self.position, self.reach_m),
        )


@dataclass(frozen=True, slots=True, eq=False)
class Track:
    """A path over a grid as polynomials.

    ``by_x`` gives distance, w, and what a metre to the right adds to x and w, in terms of x; ``by_s`` gives x, w and
    these in terms of the distance. ``swapped``: x counts rows. ``xs`` and ``ss`` are the middle and the half range.
    """

    by_x: Float
    by_s: Float
    xs: tuple[float, float]
    ss: tuple[float, float]
    swapped: bool

    def at_x(self, x: Float) -> Float:
        """Distance, w, x and w per metre to the right, and the slope of w, at places of x: (5, ...)."""
        t = (x - self.xs[0]) / self.xs[1]
        slope = chebyshev.chebval(t, chebyshev.chebder(self.by_x[:, 1])) / self.xs[1]
        per_s = chebyshev.chebval(t, chebyshev.chebder(self.by_x[:, 0])) / self.xs[1]
        s, w, right_x, right_w = chebyshev.chebval(t, self.by_x)
        # off the path by d in w: d / offset_w metres to the right, and so much further along
        offset_w = right_w - slope * right_x
        return np.stack((s, w, offset_w, -right_x * per_s))

    def forms(self, along_m: Float, across_m: Float) -> Float:
        """Give x and w of patches, (m, 2, 3), from where these lie along and across (m, 3)."""
        s = along_m[:, 0] + 0.5 * (along_m[:, 1] + along_m[:, 2])
        t = (s - self.ss[0]) / self.ss[1]
        x, w, right_x, right_w = chebyshev.chebval(t, self.by_s)
        slope_x, slope_w = chebyshev.chebval(t, chebyshev.chebder(self.by_s[:, :2])) / self.ss[1]
        forms = np.stack(
            [
                slope_x[:, None] * along_m + right_x[:, None] * across_m,
                slope_w[:, None] * along_m + right_w[:, None] * across_m,
            ],
            axis=1,
        )
        forms[:, 0, 0] += x - slope_x * s
        forms[:, 1, 0] += w - slope_w * s
        return forms


@dataclass(frozen=True, slots=True, eq=False)
class Band:
    """The unit squares of a grid that a strip touches, a stretch of rows w for every column x.

    ``along_m`` and ``across_m`` (m, 3) say where each lies, ``x`` and ``w`` (m,) are its lower corner. The squares of
    the column ``first + i`` are those from ``starts[i]`` on, ``starts[i + 1] - starts[i]`` of them from ``lowest[i]``.
    """

    track: Track
    first: int
    lowest: Index
    starts: Index
    x: Index
    w: Index
    along_m: Float
    across_m: Float

    def find(self, x: Index, w: Index) -> Index:
        """Which squares lie at (x, w), -1 where none does."""
        column = x - self.first
        there = (column >= 0) & (column < self.lowest.size)
        column = np.where(there, column, 0)
        row = w - self.lowest[column]
        there &= (row >= 0) & (row < self.starts[column + 1] - self.starts[column])
        return np.where(there, self.starts[column] + row, -1)


def bands(
    strip: Strip, to_grid: Callable[[Float, Float], tuple[Float, Float]], limits: tuple[float, float, float, float]
) -> Iterator[Band]:
    """Give the squares of a grid that a strip touches, for as many parts of it as are needed.

    Parameters
    ----------
    strip
        The strip.
    to_grid
        Column and row, counted such that squares lie between whole numbers, of longitudes and latitudes; NaN where the
        grid's coordinate system has none.
    limits
        Lowest and highest column, lowest and highest row of the squares that are there.
    """
    track = _track(strip, to_grid)
    if track is None:
        if strip.to_m - strip.from_m > _SHORTEST_M:
            for half in strip.halves():
                yield from bands(half, to_grid, limits)
        return
    band = _band(strip, track, limits)
    if band is not None:
        yield band


def touched(forms: Float) -> tuple[Index, Index, Index]:
    """Find the unit squares that patches may touch, by their forms (m, 2, 3): patch, x and w of each pair."""
    middle = forms[:, :, 0] + 0.5 * (forms[:, :, 1] + forms[:, :, 2])
    half = 0.5 * (np.abs(forms[:, :, 1]) + np.abs(forms[:, :, 2]))
    low = np.floor(middle - half + _EDGE).astype(np.intp)
    count = np.maximum(np.ceil(middle + half - _EDGE).astype(np.intp) - low, 1)
    pairs = count.prod(axis=1)
    which = np.repeat(np.arange(pairs.size), pairs)
    number = np.arange(which.size) - np.repeat(np.cumsum(pairs) - pairs, pairs)
    return which, low[which, 0] + number // count[which, 1], low[which, 1] + number % count[which, 1]


def _track(strip: Strip, to_grid: Callable[[Float, Float], tuple[Float, Float]]) -> Track | None:
    """Fit the polynomials, or None where they do not fit."""
    middle, half = 0.5 * (strip.from_m + strip.to_m), 0.5 * (strip.to_m - strip.from_m)
    t = -np.cos(np.pi * np.arange(_NODES) / (_NODES - 1))
    checks = 0.5 * (t[1:] + t[:-1])
    s = middle + half * np.concatenate((t, checks))
    side = max(1.0, float(strip.reach_m(np.array([strip.from_m]), np.array([strip.to_m]))[0]))
    along = np.concatenate((s, s[:_NODES], s[:_NODES]))
    across = np.repeat([0.0, -side, side], [s.size, _NODES, _NODES])
    place = np.stack(to_grid(*strip.position(along, across)))
    if not np.isfinite(place).all():
        return None
    per_m = (place[:, s.size + _NODES :] - place[:, s.size : s.size + _NODES]) / (2.0 * side)
    at, check = place[:, :_NODES], place[:, _NODES : s.size]
    swapped = bool(abs(at[1, -1] - at[1, 0]) > abs(at[0, -1] - at[0, 0]))
    if swapped:
        at, check, per_m = at[::-1], check[::-1], per_m[::-1]
    if np.ptp(np.sign(np.diff(at[0]))) != 0 or at[0, -1] == at[0, 0]:
        return None
    xs = float(0.5 * (at[0, 0] + at[0, -1])), float(0.5 * (at[0, -1] - at[0, 0]))
    values = np.concatenate((at, per_m)).T
    by_s = np.linalg.solve(chebyshev.chebvander(t, _NODES - 1), values)
    by_x_values = np.column_stack((s[:_NODES], values[:, 1:]))
    by_x = np.linalg.solve(chebyshev.chebvander((at[0] - xs[0]) / xs[1], _NODES - 1), by_x_values)
    track = Track(np.asarray(by_x, dtype=float), np.asarray(by_s, dtype=float), xs, (middle, half), swapped)
    missed = np.abs(chebyshev.chebval((check[0] - xs[0]) / xs[1], by_x[:, 1]) - check[1]).max()
    missed = max(missed, np.abs(chebyshev.chebval(checks, by_s[:, 0]) - check[0]).max())
    return track if missed < _FIT_CELLS else None


def _band(strip: Strip, track: Track, limits: tuple[float, float, float, float]) -> Band | None:
    """Enumerate the squares, column by column."""
    ends = sorted(track.xs[0] + np.array([-1.0, 1.0]) * track.xs[1])
    x_limits, w_limits = (limits[2:], limits[:2]) if track.swapped else (limits[:2], limits[2:])
    first, last = int(max(np.floor(ends[0]), x_limits[0])), int(min(np.floor(ends[1]), x_limits[1]))
    if last < first:
        return None
    s, w, offset_w, ahead = track.at_x(np.arange(first, last + 2, dtype=float))
    # as wide as anywhere from where a point on the left edge lies along the path to where one on the right does
    widest = strip.reach_m(np.array([strip.from_m]), np.array([strip.to_m]))
    near = np.sort(np.stack((s[:-1], s[1:])), axis=0) + np.array([[-1.0], [1.0]]) * widest
    half = strip.reach_m(*np.clip(near, strip.from_m, strip.to_m)) * np.abs(offset_w).max() * (1.0 + 1e-6)
    low = np.maximum(np.floor(np.minimum(w[:-1], w[1:]) - half), w_limits[0]).astype(np.intp)
    high = np.minimum(np.floor(np.maximum(w[:-1], w[1:]) + half), w_limits[1]).astype(np.intp)
    count = np.maximum(high - low + 1, 0)
    starts = np.append(0, np.cumsum(count))
    column = np.repeat(np.arange(count.size), count)
    row = low[column] + np.arange(column.size) - starts[column]
    along, across = [], []
    for far in (0, 1):  # the four corners: with the bilinear part left out, an affine map
        at = column + far
        for up in (0, 1):
            across.append((row + up - w[at]) / offset_w[at])
            along.append(s[at] + across[-1] * ahead[at])
    return Band(track, first, low, starts, first + column, row, _affine(along), _affine(across))


def _affine(corners: list[Float]) -> Float:
    """Coefficients (m, 3) of the affine map nearest to values at (0, 0), (0, 1), (1, 0) and (1, 1)."""
    c00, c01, c10, c11 = corners
    return np.stack(
        [(3.0 * c00 + c01 + c10 - c11) / 4.0, (c10 + c11 - c00 - c01) / 2.0, (c01 + c11 - c00 - c10) / 2.0], axis=1
    )
