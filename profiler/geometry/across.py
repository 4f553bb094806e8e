"""What a surface asks of the ray over the whole width of a Fresnel zone, at each distance along the path."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from profiler.geometry.ray import fresnel_radius
from profiler.models import lengths_between
from profiler.patches import Patches
from profiler.units import Float

__all__ = ["Asked", "Surface", "asked_across"]

Index = NDArray[np.intp]

_SAME_M = 0.01
"""No terrain is known to a centimetre: what asks for the same is named by the place nearest to the path."""

_AT_ONCE = 400_000
_ROUNDING_SHARE = 1e-6

_SEAM_SHARE = 2e-5
"""Patches are affine, the squares of a grid not quite: neighbours leave up to a millimetre or two between them. Each
reaches so much of itself further, or a line across the path that runs along a line of the grid falls between two."""


@dataclass(frozen=True, slots=True, eq=False)
class Surface:
    """What a ray must clear: ground plus cover on the path, at its points (n,), and beside it in patches.

    ``patches`` is None where nothing beside the path is known or asked for. It counts from ``from_m`` to ``to_m``.
    """

    distance_m: Float
    surface_m: Float
    cover_m: Float
    patches: Patches | None = None
    from_m: float = 0.0
    to_m: float = math.inf


@dataclass(frozen=True, slots=True, eq=False)
class Asked:
    """What the surface asks of the ray over the width of a zone, at each point of the path; arrays (n,).

    ``rise_m`` is the greatest surface + sqrt(r² - y²), the rest describes the place that asks.
    """

    rise_m: Float
    offset_m: Float
    surface_m: Float
    cover_m: Float
    missing_share: float


def asked_across(surface: Surface, frequency_hz: float, fractions: Sequence[float]) -> dict[float, Asked]:
    """Find what the surface, on the path and beside it, asks of the ray under fractions of F1.

    Parameters
    ----------
    surface
        What stands there.
    frequency_hz
        Frequency, more than 0 Hz.
    fractions
        Fractions of F1 that must be free; with 0 nothing beside the path matters.

    Returns
    -------
    dict
        By fraction.
    """
    distance, patches = surface.distance_m, surface.patches
    f1 = fresnel_radius(distance, distance[-1] - distance, frequency_hz)
    on_path = np.zeros_like(f1), surface.surface_m, surface.cover_m
    asked = {each: Asked(surface.surface_m + each * f1, *on_path, 0.0) for each in fractions}
    wide = [each for each in asked if each > 0.0]
    if patches is None or not wide:
        return asked
    counts = (distance >= surface.from_m) & (distance <= surface.to_m)
    needs = _needs(patches, distance, np.where(counts, np.multiply.outer(wide, f1), -1.0))
    for fraction, need in zip(wide, needs, strict=True):
        own = asked[fraction]
        more = need.rise_m > own.rise_m
        asked[fraction] = Asked(
            rise_m=np.where(more, need.rise_m, own.rise_m),
            offset_m=np.where(more, need.offset_m, 0.0),
            surface_m=np.where(more, need.surface_m, own.surface_m),
            cover_m=np.where(more, patches.cover_at(need.patch, distance, need.offset_m), own.cover_m),
            missing_share=_missing(need.known_m[counts], 2.0 * fraction * f1[counts], distance[counts]),
        )
    return asked


def _missing(known_m: Float, width_m: Float, distance_m: Float) -> float:
    """Share of the zone's area of which not all is known; what lacks less than a centimetre of its width lacks none."""
    weight = lengths_between(distance_m)
    whole = (weight * width_m).sum()
    lacking = width_m - known_m
    share = float((weight * np.where(lacking > _SAME_M, lacking, 0.0)).sum() / whole) if whole > 0.0 else 0.0
    return share if share > _ROUNDING_SHARE else 0.0


class _Needs(NamedTuple):
    """What the surface beside the path asks of the ray at each distance: the greatest surface + circle, and its place.

    ``rise_m`` is -inf where nothing is known, ``patch`` -1. Of places that ask for the same to a centimetre it is the
    one nearest to the path. ``known_m`` is the width of which all is known.
    """

    rise_m: Float
    offset_m: Float
    surface_m: Float
    patch: Index
    known_m: Float


def _needs(patches: Patches, distance_m: Float, radius_m: Float) -> list[_Needs]:
    """Find what is asked at each distance (n,) for each row of radii (rows, n); below 0 nothing is.

    At a distance every patch is a stretch of a parabola across the path; the greatest of parabola + sqrt(r² - y²) on it
    is at one of its ends or where the slopes balance.
    """
    rows, n = radius_m.shape
    low, high = patches.reach_m
    first, last = np.searchsorted(distance_m, low), np.searchsorted(distance_m, high, "right")
    starts = np.append(0, np.cumsum(last - first))
    rise, known = np.full(rows * n, -np.inf), np.zeros(rows * n)
    found = []
    parts = np.searchsorted(starts[:-1], np.arange(_AT_ONCE, starts[-1], _AT_ONCE))
    for start, end in pairwise(np.concatenate(([0], parts, [first.size]))):
        patch = np.repeat(np.arange(start, end), (last - first)[start:end])
        point = np.arange(starts[start], starts[end]) - (starts[:-1] - first)[patch]
        patch, row = np.tile(patch, rows), np.repeat(np.arange(rows), point.size)
        point = np.tile(point, rows)
        section = _sections(patches, patch, distance_m[point], radius_m[row, point])
        at = (row * n + point)[section.which]
        np.maximum.at(rise, at, section.rise_m)
        np.add.at(known, at, np.where(patches.whole[patch[section.which]], section.width_m, 0.0))
        found.append((at, patch[section.which], section))
    offset, surface, holder = np.zeros(rows * n), np.full(rows * n, np.nan), np.full(rows * n, -1, dtype=np.intp)
    for at, patch, section in found:
        same = np.flatnonzero(section.rise_m >= rise[at] - _SAME_M)
        same = same[np.argsort(-np.abs(section.offset_m[same]), kind="stable")]  # the nearest is written last
        offset[at[same]], surface[at[same]] = section.offset_m[same], section.surface_m[same]
        holder[at[same]] = patch[same]
    split = (each.reshape(rows, n) for each in (rise, offset, surface, holder, known))
    return [_Needs(*each) for each in zip(*split, strict=True)]


class _Section(NamedTuple):
    """Where lines across the path meet patches: which pairs do, the greatest surface + circle there, and its place."""

    which: Index
    rise_m: Float
    offset_m: Float
    surface_m: Float
    width_m: Float


def _sections(patches: Patches, patch: Index, distance_m: Float, radius_m: Float) -> _Section:
    """Cut patches along lines across the path, within radii."""
    a, y = patches.along_m[patch].T, patches.across_m[patch].T
    turn = a[1] * y[2] - a[2] * y[1]
    along = distance_m - a[0]
    # on the line across, p and q are affine in the offset: value at the offset 0, and slope
    p0, p1 = (along * y[2] + y[0] * a[2]) / turn, -a[2] / turn
    q0, q1 = -(along * y[1] + y[0] * a[1]) / turn, a[1] / turn
    low, high = -radius_m, radius_m
    window = patches.window[patch]
    forms = [(p0, p1), (q0, q1)]
    for number in range(window.shape[1]):
        c0, c1, c2 = window[:, number].T
        forms.append((c0 + c1 * p0 + c2 * q0, c1 * p1 + c2 * q1))
    for at_zero, slope in forms:
        with np.errstate(divide="ignore", invalid="ignore"):
            ends = (-_SEAM_SHARE - at_zero) / slope, (1.0 + _SEAM_SHARE - at_zero) / slope
        flat = np.abs(slope) < 1e-15
        outside = flat & ((at_zero < -_SEAM_SHARE) | (at_zero > 1.0 + _SEAM_SHARE))
        low = np.where(flat, low, np.maximum(low, np.minimum(*ends)))
        high = np.where(outside, -np.inf, np.where(flat, high, np.minimum(high, np.maximum(*ends))))
    meets = np.flatnonzero(low <= high)
    radius, low, high = radius_m[meets], low[meets], high[meets]
    p0, p1, q0, q1 = p0[meets], p1[meets], q0[meets], q1[meets]
    c = patches.surface_m[patch[meets]].T
    s0 = c[0] + (c[1] + c[3] * q0 + c[4] * p0) * p0 + (c[2] + c[5] * q0) * q0
    s1 = (c[1] + c[3] * q0 + 2.0 * c[4] * p0) * p1 + (c[2] + c[3] * p0 + 2.0 * c[5] * q0) * q1
    s2 = c[3] * p1 * q1 + c[4] * p1**2 + c[5] * q1**2
    crest = 0.5 * (low + high)
    for _ in range(3):  # the slopes of surface and circle balance; the surface curves little beside the circle
        slope = s1 + 2.0 * s2 * crest
        crest = np.clip(radius * slope / np.sqrt(1.0 + slope**2), low, high)
    offsets = np.stack((low, high, crest))
    surfaces = s0 + (s1 + s2 * offsets) * offsets
    rises = surfaces + np.sqrt(np.maximum(radius**2 - offsets**2, 0.0))
    top = rises.argmax(axis=0)[None]
    rise, offset, surface = (np.take_along_axis(each, top, axis=0)[0] for each in (rises, offsets, surfaces))
    return _Section(meets, rise, offset, surface, high - low)
