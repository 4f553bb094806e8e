"""The least surplus anywhere in the part of the Fresnel zone that a rule asks for: exact, not sampled.

At the offset y the surface must stay sqrt(r² - y²) + margin below the ray, r = fraction·F1 being the zone's radius
there; beyond r it does not matter. The surplus is then ray - bulge - sqrt(r² - y²) - margin, which is convex along and
across the path together, less the surface. A convex function lies above its tangent plane, and on a patch of the
surface the plane less a bilinear surface is least at a corner: so a box of a patch is bounded from below by four
corners, with a slack of the second order in its size. Boxes that cannot hold the least are dropped and the rest split
in four, until none is left.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from profiler.models import frozen_array
from profiler.patches import Patches
from profiler.units import MEAN_EARTH_RADIUS_M, Float

__all__ = ["ZoneLeast", "ZoneRays", "least_in_zone"]

Index = NDArray[np.intp]

_SLACK_M = 0.004
"""No terrain is known to a centimetre."""

_INSIDE = 0.9999
"""At the very edge of the zone the tangent plane stands on end."""

_INSIDE, _THINNEST_M = 0.9999, 1e-6
"""At the very edge of the zone the tangent plane stands on end."""

_SMALLEST_M = 0.004
"""A box this small counts by one place in it and the zone: at a step in the cover no corner need lie inside."""

_AT_ONCE = 400_000
_FEW = 100
_UNLIKE = 10.0


@dataclass(frozen=True, slots=True, eq=False)
class ZoneRays:
    """Rays and the part of their zones that must be free, arrays (r,): one for each rule, for each hop.

    Each counts from ``from_m`` to ``to_m`` along the path of ``length_m``. ``fraction`` is above 0.
    """

    centre_a_m: Float
    centre_b_m: Float
    length_m: Float
    wavelength_m: Float
    k: Float
    fraction: Float
    margin_m: Float
    from_m: Float
    to_m: Float

    def take(self, which: Index) -> ZoneRays:
        """Return the chosen rays."""
        return ZoneRays(*(getattr(self, name)[which] for name in self.__slots__))

    def radius2(self, along_m: Float) -> Float:
        """Radius of the part that must be free, squared: (fraction·F1)²."""
        scale = self.fraction**2 * self.wavelength_m / self.length_m
        return np.asarray(np.maximum(scale * along_m * (self.length_m - along_m), 0.0))

    def widest2(self, low_m: Float, high_m: Float) -> Float:
        """Greatest squared radius between two distances."""
        return self.radius2(np.clip(0.5 * self.length_m, low_m, high_m))

    def over(self, along_m: Float) -> tuple[Float, Float]:
        """Ray less bulge and margin above the datum, and its slope."""
        rise = (self.centre_b_m - self.centre_a_m) / self.length_m
        curve = 1.0 / (2.0 * self.k * MEAN_EARTH_RADIUS_M)
        bulge = curve * along_m * (self.length_m - along_m)
        height = self.centre_a_m + rise * along_m - bulge - self.margin_m
        return height, rise - curve * (self.length_m - 2.0 * along_m)

    def radius2_slope(self, along_m: Float) -> Float:
        """Slope of the squared radius along the path."""
        return np.asarray(self.fraction**2 * self.wavelength_m * (1.0 - 2.0 * along_m / self.length_m))


@dataclass(frozen=True, slots=True, eq=False)
class ZoneLeast:
    """Least surplus of each ray, arrays (r,), and where: patch (-1: nothing less than what was known), p and q."""

    surplus_m: Float
    patch: Index
    p: Float
    q: Float


@dataclass(slots=True, eq=False)
class _Boxes:
    """Boxes within patches, under rays; arrays (b,): the middle and the half sides in the patch's own coordinates."""

    patch: Index
    ray: Index
    p: Float
    q: Float
    half_p: Float
    half_q: Float

    def take(self, which: Index | NDArray[np.bool_]) -> _Boxes:
        return _Boxes(*(getattr(self, name)[which] for name in self.__slots__))

    def split(self, bend_p: Float, bend_q: Float) -> _Boxes:
        """Split every box in four, or where they are few in sixteen, so that fewer rounds are needed.

        A side along which the bound bends much less (by ``bend``, metres) than along the other stays whole.
        """
        each = 4 if self.p.size < _FEW else 2
        parts_p = np.where(bend_p > _UNLIKE * bend_q, each**2, np.where(bend_q > _UNLIKE * bend_p, 1, each))
        parts_q = each**2 // parts_p
        number = np.arange(each**2)[:, None]
        shift_p = (2.0 * (number // parts_q) + 1.0 - parts_p) / parts_p
        shift_q = (2.0 * (number % parts_q) + 1.0 - parts_q) / parts_q
        p, q = self.p + shift_p * self.half_p, self.q + shift_q * self.half_q
        rest = (np.tile(old, each**2) for old in (self.half_p / parts_p, self.half_q / parts_q))
        return _Boxes(np.tile(self.patch, each**2), np.tile(self.ray, each**2), p.ravel(), q.ravel(), *rest)


def least_in_zone(
    patches: Patches, rays: ZoneRays, patch: Index, ray: Index, known_m: Float, *, slack_m: float = _SLACK_M
) -> ZoneLeast:
    """Find the least surplus of each ray over the surface in its zone.

    Parameters
    ----------
    patches
        The surface of one hop or of many.
    rays
        The rays, (r,).
    patch, ray
        Which patches lie under which ray, (pairs,): all that its zone touches, more do no harm.
    known_m
        Surplus of each ray that is known already, (r,), infinite where none is; the closer, the quicker.
    slack_m
        How far below what is found the least may lie, at most.

    Returns
    -------
    ZoneLeast
        The least of what is known and what is found.

    Examples
    --------
    One patch, 1000 m by 200 m, that rises to the right by 1 in 1, under a zone of radius 1 m: the surface asks for
    sqrt(2) m below the ray, 0.7 m beside the path.

    >>> patches = Patches(*(np.array([row]) for row in ([0.0, 1000, 0], [-100.0, 0, 200], [-100.0, 0, 200, 0, 0, 0],
    ...     [0.0] * 6)), window=np.empty((1, 0, 3)), whole=np.array([True]))
    >>> one = np.ones(1)
    >>> rays = ZoneRays(10 * one, 10 * one, 1000 * one, one / 250, 1e9 * one, one, 0 * one, 0 * one, 1000 * one)
    >>> first = np.zeros(1, dtype=np.intp)
    >>> least = least_in_zone(patches, rays, first, first, np.array([np.inf]))
    >>> least.surplus_m.round(2).tolist()
    [8.59]
    """
    best = np.array(known_m, dtype=float)
    found = np.full(best.size, -1, dtype=np.intp), np.zeros(best.size), np.zeros(best.size)
    tops = _tops(patches)
    for start in range(0, patch.size, _AT_ONCE):
        part = slice(start, start + _AT_ONCE)
        open_ = _may_hold(patches, tops, rays, patch[part], ray[part], best - slack_m)
        chosen = patch[part][open_]
        half = np.full(chosen.size, 0.5)
        boxes = _Boxes(chosen, ray[part][open_], half, half, half, half)
        while boxes.p.size:
            boxes = _step(patches, rays, boxes, best, found, slack_m)
    return ZoneLeast(
        frozen_array(best), frozen_array(found[0], np.intp), frozen_array(found[1]), frozen_array(found[2])
    )


def _tops(patches: Patches) -> Float:
    """Height that each patch does not exceed."""
    c0, c1, c2, c3, c4, c5 = patches.surface_m.T
    upper = np.maximum(c0, c0 + c1 + c4), np.maximum(c0 + c2 + c5, c0 + c1 + c2 + c3 + c4 + c5)
    return np.asarray(np.maximum(*upper) + 0.25 * (np.maximum(-c4, 0.0) + np.maximum(-c5, 0.0)))


def _may_hold(
    patches: Patches, tops: Float, rays: ZoneRays, patch: Index, ray: Index, under_m: Float
) -> NDArray[np.bool_]:
    """Tell which patches may hold less than that: a first bound by their tops, as if all stood on the path."""
    c0, c1, c2 = patches.along_m.T
    middle, half = (c0 + 0.5 * (c1 + c2))[patch], (0.5 * (np.abs(c1) + np.abs(c2)))[patch]
    under = rays.take(ray)
    low, high = np.maximum(middle - half, under.from_m), np.minimum(middle + half, under.to_m)
    touched = low <= high
    # ray - bulge - radius is convex: above its tangent at the middle
    at = 0.5 * (low + high)
    height, slope = under.over(at)
    radius = np.sqrt(np.maximum(under.radius2(at), 1e-12))
    slope -= 0.5 * under.radius2_slope(at) / radius
    bound = height - radius - np.abs(slope) * 0.5 * (high - low) - tops[patch]
    return np.asarray(touched & (bound < under_m[ray]))


@dataclass(slots=True, eq=False)
class _Bounds:
    """What is known of boxes, arrays (b,): no point of theirs has less surplus than ``least_m``, and where it counts.

    ``corner_p`` and ``corner_q`` are the corner at which the bound is least, -1 or 1 each; ``at_p``, ``at_q`` a place
    in what the box and the zone have in common, of surplus ``at_m``. ``bend_p`` and ``bend_q`` say how much the convex
    part bends over each side.
    """

    touched: NDArray[np.bool_]
    least_m: Float
    corner_p: Float
    corner_q: Float
    at_p: Float
    at_q: Float
    at_m: Float
    small: NDArray[np.bool_]
    bend_p: Float
    bend_q: Float

    def take(self, which: Index) -> _Bounds:
        return _Bounds(*(getattr(self, name)[which] for name in self.__slots__))


def _bounds(patches: Patches, rays: ZoneRays, boxes: _Boxes) -> _Bounds:
    """Bound the surplus in every box from below."""
    a, y = patches.along_m[boxes.patch].T, patches.across_m[boxes.patch].T
    c, under = patches.surface_m[boxes.patch].T, rays.take(boxes.ray)
    p, q, half_p, half_q = boxes.p, boxes.q, boxes.half_p, boxes.half_q
    along, across = a[0] + a[1] * p + a[2] * q, y[0] + y[1] * p + y[2] * q
    half_along = np.abs(a[1]) * half_p + np.abs(a[2]) * half_q
    half_across = np.abs(y[1]) * half_p + np.abs(y[2]) * half_q
    low, high = np.maximum(along - half_along, under.from_m), np.minimum(along + half_along, under.to_m)
    touched = (low <= high) & (np.abs(across) - half_across <= np.sqrt(under.widest2(low, high)))
    touched &= _in_windows(patches.window[boxes.patch], p, q, half_p, half_q)

    # tangent plane of the convex part, at the middle of what the box and the zone have in common
    at_along = 0.5 * (low + high)
    radius = np.sqrt(np.maximum(under.radius2(at_along), _THINNEST_M**2))
    left, right = (np.clip(across + way * half_across, -radius, radius) for way in (-1.0, 1.0))
    at_across = np.clip(0.5 * (left + right), -_INSIDE * radius, _INSIDE * radius)
    circle = np.sqrt(radius**2 - at_across**2)
    height, slope_along = under.over(at_along)
    slope_along = slope_along - 0.5 * under.radius2_slope(at_along) / circle
    slope_across = at_across / circle
    ahead, aside = at_along - along, at_across - across
    plane = height - circle - slope_along * ahead - slope_across * aside

    # the plane less the surface is bilinear but for the curved parts: nothing between four corners is less
    curved_p, curved_q = c[4] * half_p**2, c[5] * half_q**2
    base = plane - (c[0] + (c[1] + c[3] * q + c[4] * p) * p + (c[2] + c[5] * q) * q) - curved_p - curved_q
    tilt_p = (slope_along * a[1] + slope_across * y[1] - c[1] - c[3] * q - 2.0 * c[4] * p) * half_p
    tilt_q = (slope_along * a[2] + slope_across * y[2] - c[2] - c[3] * p - 2.0 * c[5] * q) * half_q
    twist = -c[3] * half_p * half_q
    up, down = tilt_q - np.abs(tilt_p + twist), -tilt_q - np.abs(tilt_p - twist)
    corner_q = np.where(up <= down, 1.0, -1.0)

    turn = a[1] * y[2] - a[2] * y[1]
    at_p, at_q = p + (ahead * y[2] - aside * a[2]) / turn, q + (aside * a[1] - ahead * y[1]) / turn
    # the convex part bends with 1/r across the path, with r/(4·d²) along it at d from an antenna
    across_per_m, along_per_m = (
        1.0 / radius,
        radius / (2.0 * np.minimum(at_along, under.length_m - at_along) + 1.0) ** 2,
    )
    return _Bounds(
        touched=touched,
        least_m=base + np.minimum(up, down) - np.maximum(-curved_p, 0.0) - np.maximum(-curved_q, 0.0),
        corner_p=-np.sign(tilt_p + corner_q * twist),
        corner_q=corner_q,
        at_p=at_p,
        at_q=at_q,
        at_m=height - circle - patches.at(boxes.patch, at_p, at_q)[2],
        small=np.maximum(half_along, half_across) < _SMALLEST_M,
        bend_p=((y[1] * half_p) ** 2 * across_per_m + (a[1] * half_p) ** 2 * along_per_m) + np.abs(curved_p),
        bend_q=((y[2] * half_q) ** 2 * across_per_m + (a[2] * half_q) ** 2 * along_per_m) + np.abs(curved_q),
    )


def _in_windows(
    window: Float, p: Float, q: Float, half_p: Float | float = 0.0, half_q: Float | float = 0.0
) -> NDArray[np.bool_]:
    """Tell which places, or boxes about them, reach into all the windows of their patches."""
    inside = np.ones(p.size, dtype=bool)
    for number in range(window.shape[1]):
        c0, c1, c2 = window[:, number].T
        inside &= np.abs(c0 + c1 * p + c2 * q - 0.5) <= 0.5 + np.abs(c1) * half_p + np.abs(c2) * half_q
    return inside


def _step(
    patches: Patches, rays: ZoneRays, boxes: _Boxes, best: Float, found: tuple[Index, Float, Float], slack_m: float
) -> _Boxes:
    """Bound every box, note what is found better, and split what may hold better still."""
    bounds = _bounds(patches, rays, boxes)
    open_ = np.flatnonzero(bounds.touched & (bounds.least_m < best[boxes.ray] - slack_m))
    boxes, bounds = boxes.take(open_), bounds.take(open_)
    # two real points of each: the middle, and the corner that bounds
    at_p = np.append(boxes.p, boxes.p + bounds.corner_p * boxes.half_p)
    at_q = np.append(boxes.q, boxes.q + bounds.corner_q * boxes.half_q)
    _note(patches, rays, np.tile(boxes.patch, 2), np.tile(boxes.ray, 2), at_p, at_q, best, found)
    small = np.flatnonzero(bounds.small)
    if small.size:
        ends, at = boxes.take(small), bounds.take(small)
        _keep_least(ends.patch, ends.ray, at.at_m, at.at_p, at.at_q, best, found)
    left = np.flatnonzero(~bounds.small & (bounds.least_m < best[boxes.ray] - slack_m))
    return boxes.take(left).split(bounds.bend_p[left], bounds.bend_q[left])


def _note(
    patches: Patches,
    rays: ZoneRays,
    patch: Index,
    ray: Index,
    p: Float,
    q: Float,
    best: Float,
    found: tuple[Index, Float, Float],
) -> None:
    """Note the surplus at points of patches where these lie in the zone and the windows, and it is better."""
    under = rays.take(ray)
    along, across, surface, _ = patches.at(patch, p, q)
    inside = under.radius2(along) - across**2
    counts = (inside >= 0.0) & (along >= under.from_m) & (along <= under.to_m)
    counts &= _in_windows(patches.window[patch], p, q)
    surplus = under.over(along)[0] - np.sqrt(np.maximum(inside, 0.0)) - surface
    better = np.flatnonzero(counts & (surplus < best[ray]))
    if better.size:
        _keep_least(patch[better], ray[better], surplus[better], p[better], q[better], best, found)


def _keep_least(
    patch: Index, ray: Index, surplus: Float, p: Float, q: Float, best: Float, found: tuple[Index, Float, Float]
) -> None:
    """Take the least surplus of each ray, in place, where it is below the best."""
    better = surplus < best[ray]
    patch, ray = patch[better], ray[better]
    surplus, p, q = surplus[better], p[better], q[better]
    np.minimum.at(best, ray, surplus)
    taken = np.flatnonzero(surplus == best[ray])
    ray = ray[taken]
    found[0][ray], found[1][ray], found[2][ray] = patch[taken], p[taken], q[taken]
