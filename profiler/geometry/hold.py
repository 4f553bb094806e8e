"""Hold rules against what stands under and beside a ray: one way for studies, heights and diversity alike."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from profiler.geometry.across import Surface, asked_across
from profiler.geometry.clearance import ROUNDING_M, RuleCheck, check_rule
from profiler.geometry.zone import ZoneRays, least_in_zone
from profiler.models import Rule, frozen_array
from profiler.units import Float, wavelength

__all__ = ["ON_PATH_M", "HeldRule", "hold_rules", "side_of", "zone_rays"]

ON_PATH_M = 0.01
"""A place that is nearer to the path is on it."""


@dataclass(frozen=True, slots=True, eq=False)
class HeldRule:
    """One rule held against the path and the whole width of the zone that it asks for; arrays (n,).

    ``check`` is the path alone. ``least_surplus_m`` is the least surplus over the width at each point of the path, and
    ``along_m``, ``offset_m`` (positive to the right of A→B), ``surface_m`` and ``cover_m`` are of the place that has
    it. The least of all is exact: where it lies between points, the nearest point has it. ``half_width_m`` is how far
    to either side was looked, ``missing_share`` the share of the zone of which not all is known.
    """

    check: RuleCheck
    least_surplus_m: Float
    along_m: Float
    offset_m: Float
    surface_m: Float
    cover_m: Float
    half_width_m: float
    missing_share: float

    @property
    def critical(self) -> int:
        """The point of least surplus."""
        return int(np.argmin(self.least_surplus_m))

    @property
    def surplus_m(self) -> float:
        """Least surplus over length and width."""
        return float(self.least_surplus_m.min())

    @property
    def passes(self) -> bool:
        """Whether nothing on the path or beside it rises into the required zone, up to rounding."""
        return self.surplus_m >= -ROUNDING_M


def side_of(offset_m: float) -> str:
    """Name the side of the path A→B of an offset.

    Examples
    --------
    >>> side_of(-3.0), side_of(0.0)
    ('left', 'centre')
    """
    return "centre" if offset_m == 0 else "right" if offset_m > 0 else "left"


def hold_rules(
    surface: Surface, rays: Sequence[tuple[Rule, float, float]], frequency_hz: float
) -> tuple[HeldRule, ...]:
    """Hold rules against rays, along the path and over the whole width of the zone that each asks for.

    Parameters
    ----------
    surface
        What stands under and beside the rays.
    rays
        Rules, each with the antenna centres at A and B above the datum.
    frequency_hz
        Frequency, more than 0 Hz.

    Returns
    -------
    tuple of HeldRule

    Examples
    --------
    A wall 5 m beside the path, level with the ray, stands in the zone though the path itself is clear:

    >>> from profiler.geometry import Surface
    >>> from profiler.patches import Patches
    >>> wall = Patches(*(np.array([row]) for row in ([4e3, 2e3, 0], [5.0, 0, 1], [90.0, 0, 0, 0, 0, 0], [0.0] * 6)),
    ...     window=np.empty((1, 0, 3)), whole=np.array([True]))
    >>> path = np.array([0.0, 5e3, 10e3])
    >>> surface = Surface(path, 0 * path, 0 * path, wall)
    >>> held = hold_rules(surface, [(Rule(k=4 / 3, fresnel_fraction=1.0), 90.0, 90.0)], 6e9)[0]
    >>> held.check.passes, held.passes, side_of(held.offset_m[held.critical]), round(held.surplus_m, 2)
    (True, False, 'right', -11.47)
    """
    asked = asked_across(surface, frequency_hz, [rule.fresnel_fraction for rule, _, _ in rays])
    held = []
    for rule, centre_a_m, centre_b_m in rays:
        check = check_rule(surface.distance_m, surface.surface_m, centre_a_m, centre_b_m, frequency_hz, rule)
        found = asked[rule.fresnel_fraction]
        over = check.clearance_m + surface.surface_m - rule.margin_m  # ray less bulge and margin
        held.append(
            HeldRule(
                check=check,
                least_surplus_m=frozen_array(np.minimum(over - found.rise_m, check.surplus_m)),
                along_m=surface.distance_m,
                offset_m=frozen_array(found.offset_m),
                surface_m=frozen_array(found.surface_m),
                cover_m=frozen_array(found.cover_m),
                half_width_m=0.0 if surface.patches is None else rule.fresnel_fraction * float(check.f1_m.max()),
                missing_share=found.missing_share,
            )
        )
    return _with_exact_least(surface, held, rays, frequency_hz)


def _with_exact_least(
    surface: Surface, held: list[HeldRule], rays: Sequence[tuple[Rule, float, float]], frequency_hz: float
) -> tuple[HeldRule, ...]:
    """Search the zones between the points too, and put the least surplus in at the nearest point."""
    patches = surface.patches
    wide = [i for i, (rule, _, _) in enumerate(rays) if rule.fresnel_fraction > 0.0]
    if patches is None or not wide:
        return tuple(held)
    zones = zone_rays(surface, [rays[i] for i in wide], frequency_hz)
    known = np.array([held[i].surplus_m for i in wide])
    patch, ray = np.tile(np.arange(patches.size), len(wide)), np.repeat(np.arange(len(wide)), patches.size)
    least = least_in_zone(patches, zones, patch, ray, known)
    for number, i in enumerate(wide):
        if least.patch[number] >= 0:
            place = patches.at(least.patch[number], least.p[number], least.q[number])
            held[i] = _placed(held[i], float(least.surplus_m[number]), place)
    return tuple(held)


def zone_rays(surface: Surface, rays: Sequence[tuple[Rule, float, float]], frequency_hz: float) -> ZoneRays:
    """Rays as the search in their zones takes them, all along the surface."""
    numbers = np.array([(a, b, rule.k, rule.fresnel_fraction, rule.margin_m) for rule, a, b in rays]).T
    length, lam = float(surface.distance_m[-1]), float(wavelength(frequency_hz))
    lengths, lams, starts, ends = (
        np.full(len(rays), each) for each in (length, lam, surface.from_m, min(surface.to_m, length))
    )
    return ZoneRays(numbers[0], numbers[1], lengths, lams, numbers[2], numbers[3], numbers[4], starts, ends)


def _placed(held: HeldRule, surplus_m: float, place: tuple[Float, Float, Float, Float]) -> HeldRule:
    """Let the nearest point of the path have a place of less surplus."""
    point = int(np.argmin(np.abs(held.along_m - place[0])))

    def put(array: Float, value: Float | float) -> Float:
        changed = array.copy()
        changed[point] = value
        return frozen_array(changed)

    return replace(
        held,
        least_surplus_m=put(held.least_surplus_m, surplus_m),
        along_m=put(held.along_m, np.clip(place[0], held.along_m[0], held.along_m[-1])),
        offset_m=put(held.offset_m, place[1] if abs(place[1]) > ON_PATH_M else 0.0),
        surface_m=put(held.surface_m, place[2]),
        cover_m=put(held.cover_m, place[3]),
    )
