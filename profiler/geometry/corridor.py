"""Hold a rule against the ground beside the path: the Fresnel zone is an ellipsoid, not a line."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from profiler.errors import InputError
from profiler.geometry.clearance import ROUNDING_M
from profiler.geometry.ray import earth_bulge, fresnel_radius, ray_height
from profiler.models import Rule, frozen_array
from profiler.units import Float

__all__ = ["CorridorCheck", "check_corridor", "corridor_least_ray", "corridor_offsets"]

_EDGE = 1.0 + 1e-9  # a point on the edge of the zone counts, whatever the last digit of its offset


@dataclass(frozen=True, slots=True, eq=False)
class CorridorCheck:
    """The place beside the path where the required zone is tightest.

    ``offset_m`` is across the path, positive to the right of A→B. ``surplus_m`` is the least surplus over the whole
    width at the critical point; ``least_surplus_m`` (n,) is the same at every distance. ``missing_share`` is the share
    of points beside the path that had no ground height and could not be checked.
    """

    half_width_m: float
    across: int
    distance_index: int
    offset_m: float
    surface_m: float
    surplus_m: float
    least_surplus_m: Float
    missing_share: float

    @property
    def passes(self) -> bool:
        """Whether no ground beside the path rises into the required zone."""
        return self.surplus_m >= -ROUNDING_M

    @property
    def side(self) -> str:
        """Which side of the path A→B the tightest place lies on."""
        return "centre" if self.offset_m == 0 else "right" if self.offset_m > 0 else "left"


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
    if not cell_m > 0:
        raise InputError(f"cell_m = {cell_m}: must be more than 0 m")
    distance = np.asarray(distance_m, dtype=float)
    radius = fresnel_fraction * fresnel_radius(distance, distance[-1] - distance, frequency_hz)
    each_side = max(1, int(np.ceil(float(radius.max()) / cell_m)))
    return np.asarray(radius[:, None] * (np.arange(-each_side, each_side + 1) / each_side))


def corridor_least_ray(
    distance_m: ArrayLike,
    offset_m: ArrayLike,
    surface_m: ArrayLike,
    frequency_hz: float,
    rule: Rule,
) -> Float:
    """Least height of the ray above the datum that one rule asks for because of each point across the path.

    surface + bulge + sqrt(r² - y²) + margin, with the zone's radius r = fraction·F1 and the offset y.

    Parameters
    ----------
    distance_m, offset_m, surface_m, frequency_hz, rule
        As in `check_corridor`.

    Returns
    -------
    ndarray
        Metres, (n, across); -inf where the point is unknown or lies beyond the zone and so asks for nothing.

    Raises
    ------
    InputError
        If the shapes do not fit.

    Examples
    --------
    >>> sight = Rule(k=4 / 3, fresnel_fraction=0.0)
    >>> least = corridor_least_ray([0, 5e3, 10e3], [[0.0]] * 3, [[10.0], [20.0], [30.0]], 6e9, sight)
    >>> least.ravel().round(2).tolist()
    [10.0, 21.47, 30.0]
    """
    distance = np.asarray(distance_m, dtype=float)
    offset, surface = np.asarray(offset_m, dtype=float), np.asarray(surface_m, dtype=float)
    if offset.shape != surface.shape or offset.ndim != 2 or offset.shape[0] != distance.size:
        raise InputError(f"corridor of shapes {offset.shape} and {surface.shape}: must be (n, across) with n points")
    remaining = distance[-1] - distance
    radius = rule.fresnel_fraction * fresnel_radius(distance, remaining, frequency_hz)[:, None]
    least = surface + earth_bulge(distance, remaining, rule.k)[:, None]
    least += np.sqrt(np.maximum(radius**2 - offset**2, 0.0)) + rule.margin_m
    asks = (np.abs(offset) <= radius * _EDGE) & ~np.isnan(surface)
    return np.asarray(np.where(asks, least, -np.inf))


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
    distance_m
        Distances from A, (n,).
    offset_m
        Offsets across the path, (n, across), positive to the right of A→B.
    surface_m
        Ground plus cover at those points, (n, across); NaN where unknown (counted, and left out).
    centre_a_m, centre_b_m
        Antenna centres above the datum.
    frequency_hz
        Frequency, more than 0 Hz.
    rule
        The clearance rule.

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
    least = corridor_least_ray(distance_m, offset_m, surface_m, frequency_hz, rule)
    distance, offset, surface = (np.asarray(each, dtype=float) for each in (distance_m, offset_m, surface_m))
    surplus = ray_height(distance, centre_a_m, centre_b_m)[:, None] - least
    radius = rule.fresnel_fraction * fresnel_radius(distance, distance[-1] - distance, frequency_hz)
    within = np.abs(offset) <= radius[:, None] * _EDGE
    # of places equally tight up to rounding the one nearest to the path counts, so that the path is not "beside" itself
    tightest = np.where(surplus <= surplus.min() + ROUNDING_M, np.abs(offset), np.inf)
    where = np.unravel_index(int(np.argmin(tightest)), surplus.shape)
    return CorridorCheck(
        half_width_m=float(radius.max()),
        across=int(offset.shape[1]),
        distance_index=int(where[0]),
        offset_m=float(offset[where]),
        surface_m=float(surface[where]),
        surplus_m=float(surplus[where]),
        least_surplus_m=frozen_array(surplus.min(axis=1)),
        missing_share=float(np.isnan(surface[within]).mean()),
    )
