"""Surfaces that are a parabola in the distance between given places: the ground under a path, exactly as it is stated.

Each piece is taken between two neighbouring places at which a raster's surface may bend or step. Its height at the
share t of its length is first + (last - first)·t + 4·crown·t·(1 - t), so that ``crown`` is how far its middle stands
above the straight line between its ends (negative: hangs below it).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from profiler.errors import InputError
from profiler.models import frozen_array
from profiler.units import MEAN_EARTH_RADIUS_M, Float, wavelength

__all__ = ["Least", "Parabolas", "PathZone", "inside_places", "least_surplus", "zone_places"]

Index = NDArray[np.intp]

_PROBES = 16
"""Steps in which the inside of a piece is searched, twice: what a parabola through three of the last ones leaves is
far below a millimetre, for a piece of any length and from the antenna on."""
_GAIN_M = 1e-5


@dataclass(frozen=True, slots=True, eq=False)
class Parabolas:
    """Heights on pieces of a path; arrays (m,), NaN where missing."""

    first_m: Float
    last_m: Float
    crown_m: Float

    FIT_AT = (0.125, 0.5, 0.875)
    """Shares of a piece at which `fit` wants its heights: inside it, so that none is a neighbour's."""

    @classmethod
    def fit(cls, height_m: ArrayLike) -> Parabolas:
        """Recover the parabolas from their heights at `FIT_AT`, (m, 3): the ends are those of the piece itself.

        Examples
        --------
        >>> t = np.array(Parabolas.FIT_AT)
        >>> one = Parabolas.fit([10 + 6 * t + 4 * 2 * t * (1 - t)])
        >>> one.first_m.tolist(), one.last_m.tolist(), one.crown_m.tolist()
        ([10.0], [16.0], [2.0])
        """
        low, middle, high = np.moveaxis(np.asarray(height_m, dtype=float), -1, 0)
        off = 0.5 - cls.FIT_AT[0]
        crown = (2.0 * middle - low - high) / (8.0 * off**2)
        half_rise = (high - low) / (4.0 * off)
        return cls(middle - crown - half_rise, middle - crown + half_rise, crown)

    def at(self, piece: ArrayLike, share: ArrayLike) -> Float:
        """Height at shares of pieces, 0 to 1; both (q,)."""
        which, t = np.asarray(piece), np.asarray(share, dtype=float)
        first = self.first_m[which]
        return np.asarray(first + (self.last_m[which] - first) * t + 4.0 * self.crown_m[which] * t * (1.0 - t))

    def __add__(self, other: Parabolas) -> Parabolas:
        return Parabolas(self.first_m + other.first_m, self.last_m + other.last_m, self.crown_m + other.crown_m)


def inside_places(crown_m: Float, *, above_m: float, below_m: float) -> tuple[Index, Float]:
    """Places inside pieces such that straight lines between all places stay near the surface: piece and share, (q,).

    Parameters
    ----------
    crown_m
        Crowns of the pieces, (m,).
    above_m, below_m
        How far the surface may stand above such a line, and hang below it, metres.

    Examples
    --------
    A crown of 0.9 m cut in three leaves a ninth of it:

    >>> piece, share = inside_places(np.array([0.9, 0.1, -0.9]), above_m=0.1, below_m=0.5)
    >>> piece.tolist(), share.round(3).tolist()
    ([0, 0, 2], [0.333, 0.667, 0.5])
    """
    allowed = np.where(crown_m > 0.0, above_m, below_m)
    parts = np.ceil(np.sqrt(np.maximum(np.abs(np.nan_to_num(crown_m)) / allowed, 1.0)) * (1.0 - 1e-12)).astype(np.intp)
    piece = np.repeat(np.arange(parts.size), parts - 1)
    number = np.arange(1, piece.size + 1) - np.repeat(np.cumsum(parts - 1) - (parts - 1), parts - 1)
    return piece, number / parts[piece]


def zone_places(length_m: float, frequency_hz: float, fresnel_fraction: float, within_m: float) -> Float:
    """Distances from an antenna, up to a quarter of the path, between which straight lines stay near the zone's radius.

    The radius grows as √(λ·d) from the antenna. Between d and d′ the root stands (√d′ - √d)²/(4·(√d′ + √d)) above its
    chord; steps that make this the same everywhere put √d at Q times the triangular numbers, Q = 4·within/(f·√λ).

    Parameters
    ----------
    length_m
        Length of the path.
    frequency_hz, fresnel_fraction
        The zone: a fraction f of F1, 0 or more.
    within_m
        How far the radius may stand above such a line, metres; a quarter of the way it is half as much again, since
        the other antenna bends it too.

    Examples
    --------
    >>> zone_places(40e3, 6e9, 1.0, 0.05).round(1).tolist()[:6]
    [0.8, 7.2, 28.8, 80.1, 180.1, 353.0]
    """
    if fresnel_fraction == 0.0:
        return np.zeros(0)
    unit = 4.0 * within_m / (fresnel_fraction * float(np.sqrt(wavelength(frequency_hz))))
    count = int(0.5 * (np.sqrt(1.0 + 4.0 * np.sqrt(length_m) / unit) - 1.0))
    number = np.arange(1.0, count + 1.0)
    return np.asarray((0.5 * unit * number * (number + 1.0)) ** 2)


@dataclass(frozen=True, slots=True, eq=False)
class PathZone:
    """Paths with the rule that each is held to; arrays (hops,). The same path under two rules is two of them."""

    length_m: Float
    centre_a_m: Float
    centre_b_m: Float
    wavelength_m: Float
    k: Float
    fresnel_fraction: Float
    margin_m: Float

    def free_m(self, hop: Index, distance_m: Float) -> Float:
        """Height above the datum up to which the rule lets the surface rise, at distances along hops."""
        length, left = self.length_m[hop], self.length_m[hop] - distance_m
        share, product = distance_m / length, distance_m * left
        ray = self.centre_a_m[hop] * (1.0 - share) + self.centre_b_m[hop] * share - self.margin_m[hop]
        zone = self.fresnel_fraction[hop] * np.sqrt(self.wavelength_m[hop] * np.maximum(product, 0.0) / length)
        return np.asarray(ray - zone - product / (2.0 * MEAN_EARTH_RADIUS_M * self.k[hop]))

    def sag_m(self, hop: Index, start_m: Float, end_m: Float) -> Float:
        """Most that this height hangs below its chord over a piece: of the bulge and of the zone, both bounded above.

        The radius is concave with the second derivative -f·√λ/(4·p^1.5), p = d1·d2/d, greatest at the end nearer to an
        antenna; and since roots of parts exceed the root of the whole, no more than that of the piece's own length.
        """
        length, step = self.length_m[hop], end_m - start_m
        nearest = np.minimum(start_m * (length - start_m), end_m * (length - end_m)) / length
        with np.errstate(divide="ignore"):
            root = np.minimum(step**2 / (32.0 * np.maximum(nearest, 0.0) ** 1.5), np.sqrt(step))
        zone = self.fresnel_fraction[hop] * np.sqrt(self.wavelength_m[hop]) * root
        return np.asarray(zone + step**2 / (8.0 * MEAN_EARTH_RADIUS_M * self.k[hop]))


@dataclass(frozen=True, slots=True, eq=False)
class Least:
    """Least surplus of every hop and how far from its A it is, (hops,), both read-only."""

    surplus_m: Float
    distance_m: Float


def least_surplus(hop: ArrayLike, start_m: ArrayLike, end_m: ArrayLike, surface: Parabolas, zone: PathZone) -> Least:
    """Least surplus over surfaces of parabolas, exactly, for any number of hops and rules at once.

    Ends of pieces come first. The surplus inside a piece is no less than that at its lower end by more than its crown,
    and by what bulge and zone hang below their chords: only where that could beat the hop's least end is a piece
    searched inside. The search runs in the root of the distance to the nearer antenna, in which the zone's radius is
    smooth right from the antenna on.

    Parameters
    ----------
    hop
        Which hop a piece belongs to, (m,), ascending from 0; every hop has one or more.
    start_m, end_m
        Distances from the hop's A, (m,).
    surface
        Heights of ground and cover on the pieces, none missing.
    zone
        The hops, each with its rule.

    Returns
    -------
    Least

    Raises
    ------
    InputError
        If a hop has no pieces, or they are not in the order of the hops.

    Examples
    --------
    A ridge of a crown of 10 m over 1 km of flat ground, under a ray that falls from 60 to 20 m: line of sight only.

    >>> surface = Parabolas(np.zeros(1), np.zeros(1), np.full(1, 10.0))
    >>> zone = PathZone(*(np.array([each]) for each in (1000.0, 60.0, 20.0, 0.05, np.inf, 0.0, 0.0)))
    >>> least = least_surplus([0], [0.0], [1000.0], surface, zone)
    >>> least.surplus_m.tolist(), least.distance_m.tolist()
    ([20.0], [1000.0])

    Notes
    -----
    The terms are those of `check_rule`.
    """
    of, start, end = np.asarray(hop, dtype=np.intp), np.asarray(start_m, dtype=float), np.asarray(end_m, dtype=float)
    first = np.flatnonzero(np.diff(of, prepend=-1))
    if of.size == 0 or not np.array_equal(of[first], np.arange(zone.length_m.size)):
        raise InputError("hop: must number every hop from 0 on, in order, with one piece or more each")
    at_start = zone.free_m(of, start) - surface.first_m
    at_end = zone.free_m(of, end) - surface.last_m
    least, where = np.minimum(at_start, at_end), np.where(at_start <= at_end, start, end)
    best = np.minimum.reduceat(least, first)
    reach = np.maximum(surface.crown_m, 0.0) + zone.sag_m(of, start, end)
    inner = np.flatnonzero(least - reach < best[of] - _GAIN_M)
    if inner.size:
        found, at = _search(of[inner], start[inner], end[inner], inner, surface, zone)
        better = found < least[inner]
        least[inner[better]], where[inner[better]] = found[better], at[better]
        best = np.minimum.reduceat(least, first)
    hits = np.flatnonzero(least == best[of])
    hits = hits[np.flatnonzero(np.diff(of[hits], prepend=-1))]
    return Least(frozen_array(best), frozen_array(where[hits]))


def _search(
    hop: Index, start: Float, end: Float, piece: Index, surface: Parabolas, zone: PathZone
) -> tuple[Float, Float]:
    """Least surplus inside pieces and its distance from A: probes, finer probes about the least, a last parabola."""
    length = zone.length_m[hop]
    from_a = start + end <= length
    near, far = (np.sqrt(np.where(from_a, a, length - b)) for a, b in ((start, end), (end, start)))

    def surplus(root: Float) -> tuple[Float, Float]:
        distance = np.where(from_a[:, None], root**2, length[:, None] - root**2)
        share = (distance - start[:, None]) / (end - start)[:, None]
        rows = np.broadcast_to(np.arange(piece.size)[:, None], share.shape)
        free = zone.free_m(hop[rows], distance)
        return free - surface.at(piece[rows], share), distance

    low, high = near, far
    probes = np.linspace(0.0, 1.0, _PROBES + 1)
    rows = np.arange(piece.size)
    for _ in range(2):
        root = low[:, None] + (high - low)[:, None] * probes
        values, _ = surplus(root)
        middle = np.clip(values.argmin(axis=1), 1, _PROBES - 1)
        low, high = root[rows, middle - 1], root[rows, middle + 1]
    below, here, above = (values[rows, middle + side] for side in (-1, 0, 1))
    bend = below + above - 2.0 * here
    turn = np.where(bend > 0.0, 0.25 * (below - above) / np.where(bend > 0.0, bend, 1.0), 0.0)
    root = 0.5 * (low + high) + np.clip(turn, -0.5, 0.5) * (high - low)
    value, distance = surplus(root[:, None])
    return value[:, 0], distance[:, 0]
