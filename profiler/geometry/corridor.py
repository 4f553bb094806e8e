"""Hold a rule against the ground beside the path: the Fresnel zone is an ellipsoid, not a line."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from profiler.checks import positive
from profiler.errors import InputError
from profiler.geometry.clearance import ROUNDING_M
from profiler.geometry.ray import earth_bulge, fresnel_radius, ray_height
from profiler.models import Rule, frozen_array
from profiler.units import Float

__all__ = ["CorridorCheck", "CorridorNeed", "check_corridor", "corridor_need", "corridor_offsets", "side_of"]

_SAME_M = 0.01  # no terrain is known to a centimetre
_EDGE = 1.0 + 1e-9  # a point on the edge of the zone counts, whatever the last digit of its offset


@dataclass(frozen=True, slots=True, eq=False)
class CorridorNeed:
    """What the ground across the path asks of the ray under one rule, at each distance; arrays (n,).

    ``least_ray_m`` is the least height of the ray above the datum, asked for at ``offset_m`` (positive to the right of
    A→B, 0 on the path) by a surface of ``surface_m``. ``missing_share`` is the share of the points in the zone that had
    no height.
    """

    least_ray_m: Float
    offset_m: Float
    surface_m: Float
    missing_share: float


@dataclass(frozen=True, slots=True, eq=False)
class CorridorCheck:
    """One rule held against the whole width of its zone.

    ``least_surplus_m`` (n,) is the least surplus over the width at every distance, and ``critical`` the index of the
    least of all; ``need`` says where across the path it is. ``across`` is the number of points across.
    """

    need: CorridorNeed
    half_width_m: float
    across: int
    least_surplus_m: Float
    critical: int

    @property
    def surplus_m(self) -> float:
        """Least surplus over length and width."""
        return float(self.least_surplus_m[self.critical])

    @property
    def offset_m(self) -> float:
        """Where across the path the tightest place is, positive to the right of A→B."""
        return float(self.need.offset_m[self.critical])

    @property
    def passes(self) -> bool:
        """Whether no ground on the path or beside it rises into the required zone."""
        return self.surplus_m >= -ROUNDING_M

    @property
    def side(self) -> str:
        """Which side of the path A→B the tightest place lies on."""
        return side_of(self.offset_m)


def side_of(offset_m: float) -> str:
    """Name the side of the path A→B of an offset.

    Examples
    --------
    >>> side_of(-3.0), side_of(0.0)
    ('left', 'centre')
    """
    return "centre" if offset_m == 0 else "right" if offset_m > 0 else "left"


def corridor_offsets(distance_m: ArrayLike, frequency_hz: float, fresnel_fraction: float, cell_m: float) -> Float:
    """Offsets across the path, (n, across), that reach from edge to edge of a fraction of the first Fresnel zone.

    The number of points across is odd (one lies on the path), at least 3, and such that they stand no further
    apart than ``cell_m`` where the zone is widest.

    Parameters
    ----------
    distance_m
        Distances from A, (n,), ascending from 0; the last is B.
    frequency_hz
        Frequency, more than 0 Hz.
    fresnel_fraction
        Fraction of F1 that the rule asks for, more than 0.
    cell_m
        Greatest step across the path, metres: half the finest terrain cell is a good choice.

    Examples
    --------
    >>> corridor_offsets([0, 20e3, 40e3], 6e9, 1.0, 15.0)[1].round(1).tolist()
    [-22.4, -11.2, 0.0, 11.2, 22.4]
    """
    cell = positive("cell_m", cell_m, "m", infinite=True)
    distance = np.asarray(distance_m, dtype=float)
    radius = fresnel_fraction * fresnel_radius(distance, distance[-1] - distance, frequency_hz)
    each_side = max(1, int(np.ceil(float(radius.max()) / cell)))
    return np.asarray(radius[:, None] * (np.arange(-each_side, each_side + 1) / each_side))


def corridor_need(
    distance_m: ArrayLike, offset_m: ArrayLike, surface_m: ArrayLike, frequency_hz: float, rule: Rule
) -> CorridorNeed:
    """Find what the ground across the path asks of the ray: the greatest of surface + bulge + sqrt(r² - y²) + margin.

    r is the zone's radius, fraction·F1, and y the offset. Between two neighbouring points across, the surface is taken
    as straight, and the greatest value there, at y = r·s/sqrt(1 + s²) for the slope s, counts too: on a side slope it
    lies between the points, and leaving it out would pass ground that stands in the zone.

    Parameters
    ----------
    distance_m
        Distances from A, (n,), ascending from 0; the last is B.
    offset_m
        Offsets across the path, (n, across), ascending in each row, positive to the right of A→B.
    surface_m
        Ground plus cover at those points, (n, across); NaN where unknown (counted, and left out).
    frequency_hz
        Frequency, more than 0 Hz.
    rule
        The clearance rule.

    Returns
    -------
    CorridorNeed
        Of places that ask for the same to a centimetre the one nearest to the path; -inf where nothing is known.

    Raises
    ------
    InputError
        If the shapes do not fit.

    Examples
    --------
    Ground that falls to the left by 1 in 1, under a zone of radius 1 m, asks for √2 m over the path, not 1 m:

    >>> frequency_hz = 299_792_458.0 * 250.0  # F1 is 1 m at the middle of 1 km
    >>> rows = [[0, 0, 0], [-1, 0, 1], [0, 0, 0]]
    >>> need = corridor_need([0, 500, 1000], rows, rows, frequency_hz, Rule(k=1e9, fresnel_fraction=1.0))
    >>> round(float(need.least_ray_m[1]), 3), round(float(need.offset_m[1]), 3)
    (1.414, 0.707)
    """
    distance = np.asarray(distance_m, dtype=float)
    offset, surface = np.asarray(offset_m, dtype=float), np.asarray(surface_m, dtype=float)
    if offset.shape != surface.shape or offset.ndim != 2 or offset.shape[0] != distance.size:
        raise InputError(f"corridor of shapes {offset.shape} and {surface.shape}: must be (n, across) with n points")
    remaining = distance[-1] - distance
    radius = rule.fresnel_fraction * fresnel_radius(distance, remaining, frequency_hz)[:, None]
    within = np.abs(offset) <= radius * _EDGE
    between, height = _crests(offset, surface, radius)
    offsets, surfaces = np.hstack([offset, between]), np.hstack([surface, height])
    rise = surfaces + np.sqrt(np.maximum(radius**2 - offsets**2, 0.0))
    counts = np.hstack([within, np.ones_like(between, dtype=bool)]) & ~np.isnan(rise)
    rise = np.where(counts, rise, -np.inf)
    highest = rise.max(axis=1, keepdims=True)
    # of places that ask for the same the nearest is named: a gentle slope does not put the path beside itself
    nearest = np.argmin(np.where(counts & (rise >= highest - _SAME_M), np.abs(offsets), np.inf), axis=1)[:, None]
    return CorridorNeed(
        least_ray_m=frozen_array(highest[:, 0] + earth_bulge(distance, remaining, rule.k) + rule.margin_m),
        offset_m=frozen_array(np.take_along_axis(offsets, nearest, axis=1)[:, 0]),
        surface_m=frozen_array(np.take_along_axis(surfaces, nearest, axis=1)[:, 0]),
        missing_share=float(np.isnan(surface[within]).mean()),
    )


def _crests(offset: Float, surface: Float, radius: Float) -> tuple[Float, Float]:
    """Offsets and surface of the greatest surface + circle strictly between neighbouring points; NaN where none is."""
    step = np.diff(offset, axis=1)
    slope = np.divide(np.diff(surface, axis=1), step, out=np.full_like(step, np.nan), where=step > 0)
    crest = radius * slope / np.sqrt(1.0 + slope**2)
    inside = (crest > offset[:, :-1]) & (crest < offset[:, 1:])
    crest = np.where(inside, crest, np.nan)
    return crest, surface[:, :-1] + slope * (crest - offset[:, :-1])


def check_corridor(
    distance_m: ArrayLike,
    offset_m: ArrayLike,
    surface_m: ArrayLike,
    centre_a_m: float,
    centre_b_m: float,
    frequency_hz: float,
    rule: Rule,
) -> CorridorCheck:
    """Hold one rule against the ground across the path, out to the edge of the required zone.

    The zone of radius r = fraction·F1 around the ray must be free: at the offset y the surface must stay
    sqrt(r² - y²) + margin below the ray; beyond r it does not matter. On the path (y = 0) this is the rule itself.

    Parameters
    ----------
    distance_m, offset_m, surface_m, frequency_hz, rule
        As in `corridor_need`.
    centre_a_m, centre_b_m
        Antenna centres above the datum.

    Returns
    -------
    CorridorCheck

    Raises
    ------
    InputError
        If the shapes do not fit.

    Examples
    --------
    A wall 5 m beside the path, level with the ray, stands in the zone though the path itself is clear:

    >>> wall = [[0, 0, 0], [0, 0, 90], [0, 0, 0]]
    >>> check = check_corridor([0, 5e3, 10e3], [[0, 0, 0], [-5, 0, 5], [0, 0, 0]], wall, 90, 90, 6e9,
    ...     Rule(k=4 / 3, fresnel_fraction=1.0))
    >>> check.passes, check.side, round(check.surplus_m, 1)
    (False, 'right', -11.5)

    Notes
    -----
    The ellipsoid is Rec. ITU-R P.526-15 §2.1; at each distance its cross-section is a circle of radius F1 to a part in
    10⁴ and better for the paths of this trade. The bulge is that of the point of the path beside it.
    """
    need = corridor_need(distance_m, offset_m, surface_m, frequency_hz, rule)
    distance = np.asarray(distance_m, dtype=float)
    surplus = ray_height(distance, centre_a_m, centre_b_m) - need.least_ray_m
    radius = rule.fresnel_fraction * fresnel_radius(distance, distance[-1] - distance, frequency_hz)
    return CorridorCheck(
        need=need,
        half_width_m=float(radius.max()),
        across=int(np.asarray(offset_m).shape[1]),
        least_surplus_m=frozen_array(surplus),
        critical=int(np.argmin(surplus)),
    )
