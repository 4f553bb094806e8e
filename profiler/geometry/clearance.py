"""Hold one rule against one profile: clearance, requirement, surplus, and the places where it is tight."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from profiler.checks import check_profile
from profiler.geometry.ray import earth_bulge, fresnel_radius, ray_height
from profiler.models import Rule, frozen_array
from profiler.units import Float

__all__ = ["ROUNDING_M", "RuleCheck", "check_rule", "tight_places"]

ROUNDING_M = 1e-6
"""Rounding of float64 sums of heights is far below a micrometre, and no height is meant so finely: what a requirement
misses by less is met."""


@dataclass(frozen=True, slots=True, eq=False)
class RuleCheck:
    """One rule held against one profile; arrays are (n,) along the path.

    ``ratio`` is clearance/F1, NaN at the ends where F1 is 0. ``critical`` is the index of least surplus.
    """

    rule: Rule
    bulge_m: Float
    f1_m: Float
    clearance_m: Float
    required_m: Float
    surplus_m: Float
    ratio: Float
    critical: int

    @property
    def passes(self) -> bool:
        """Whether every point along the path has a surplus of 0 or more, up to rounding."""
        return bool(self.surplus_m[self.critical] >= -ROUNDING_M)

    @property
    def line_of_sight(self) -> bool:
        """Whether the ray clears ground and cover at this k, with no Fresnel requirement."""
        return bool(self.clearance_m.min() > 0.0)


def check_rule(
    distance_m: ArrayLike,
    surface_m: ArrayLike,
    centre_a_m: float,
    centre_b_m: float,
    frequency_hz: float,
    rule: Rule,
) -> RuleCheck:
    """Clearance of one profile under one rule, and where it is least.

    At each point: clearance = ray - (surface + bulge); required = fraction·F1 + margin; surplus = clearance -
    required. The rule passes when no surplus is below 0. The two ends count too: there F1 is 0 and the clearance is
    the antenna's height above the surface, so an antenna inside its own trees fails.

    Parameters
    ----------
    distance_m
        Distances from A, (n,), ascending from 0; the last is B.
    surface_m
        Ground plus cover above the datum, (n,), no gaps.
    centre_a_m, centre_b_m
        Antenna centres above the datum.
    frequency_hz
        Frequency, more than 0 Hz.
    rule
        The clearance rule, carried into the result.

    Returns
    -------
    RuleCheck

    Raises
    ------
    MissingGroundError
        If the surface has a gap; the message says where.
    InputError
        If the profile is too short, or its distances do not ascend from 0.

    Examples
    --------
    A 40 km hop over flat ground at k = 4/3 and 6 GHz needs a bulge of 23.5 m and 22.3 m of F1 at the middle:

    >>> check = check_rule([0, 20e3, 40e3], [0, 0, 0], 50.0, 50.0, 6e9, Rule(k=4 / 3, fresnel_fraction=1.0))
    >>> check.passes, check.critical, round(float(check.surplus_m[1]), 1)
    (True, 1, 4.1)

    Notes
    -----
    The terms follow the path clearance criteria of Rec. ITU-R P.530-18 §2.2.
    """
    distance, surface = check_profile(distance_m, surface_m)
    remaining = distance[-1] - distance
    bulge = earth_bulge(distance, remaining, rule.k)
    f1 = fresnel_radius(distance, remaining, frequency_hz)
    clearance = ray_height(distance, centre_a_m, centre_b_m) - surface - bulge
    required = rule.fresnel_fraction * f1 + rule.margin_m
    surplus = clearance - required
    ratio = np.divide(clearance, f1, out=np.full_like(f1, np.nan), where=f1 > 0)
    return RuleCheck(
        rule=rule,
        bulge_m=frozen_array(bulge),
        f1_m=frozen_array(f1),
        clearance_m=frozen_array(clearance),
        required_m=frozen_array(required),
        surplus_m=frozen_array(surplus),
        ratio=frozen_array(ratio),
        critical=int(np.argmin(surplus)),
    )


def tight_places(surplus_m: ArrayLike, *, rise_m: float, within_m: float = np.inf, places: int = 8) -> tuple[int, ...]:
    """Find the separate tight places of a profile, as indices, least surplus first.

    Two minima are separate obstacles when the ground between them clears though both are short, or when the surplus
    rises between them by at least ``rise_m`` and a fifth of what the shallower one is short; a bump on the flank of a
    crest is part of that crest. The tightest place always comes first. The ends are no obstacles: the antenna stands
    there; they count only where the tightest place is one.

    Parameters
    ----------
    surplus_m
        Surplus along the path, (n,), no gaps.
    rise_m
        Least rise of the surplus above the shallower of two places that makes them two, metres.
    within_m
        A place counts if its surplus is at most this much above the least surplus, or above 0 if that is short, metres.
    places
        The most places to return, 1 or more.

    Returns
    -------
    tuple of int

    Examples
    --------
    >>> tight_places([9, 1, 2, 1.5, 9, 4, 9], rise_m=2.0)
    (1, 5)
    >>> tight_places([9, -50, -45, -48, 1, -1, 9], rise_m=2.0)
    (1, 5)
    """
    surplus = np.asarray(surplus_m, dtype=float)
    tightest = int(np.argmin(surplus))
    most = max(float(surplus[tightest]), 0.0) + within_m
    minima = 1 + np.flatnonzero((surplus[1:-1] <= surplus[:-2]) & (surplus[1:-1] < surplus[2:]))
    nodes = np.unique(np.concatenate(([0, tightest, surplus.size - 1], minima)))
    depth, crest = surplus[nodes].tolist(), np.maximum.reduceat(surplus, nodes)[:-1].tolist()
    before = _crests_before(depth, crest, equal_hides=True)
    after = _crests_before(depth[::-1], crest[::-1], equal_hides=False)[::-1]
    lower_crest = dict(zip(nodes.tolist(), map(min, before, after), strict=True))
    chosen = [tightest]
    for index in minima[np.argsort(surplus[minima], kind="stable")].tolist():
        here = float(surplus[index])
        if len(chosen) >= places or here > most:
            break
        crossed = lower_crest[index]
        separate = crossed - here >= max(rise_m, 0.2 * max(-here, 0.0)) or here < 0.0 <= crossed
        if index != tightest and separate:
            chosen.append(index)
    return tuple(chosen)


def _crests_before(depth: list[float], crest: list[float], *, equal_hides: bool) -> list[float]:
    """Highest surplus on the way back from each minimum to the nearest deeper one; infinite where none is deeper.

    ``crest`` is the highest between each minimum and the next. A stack holds the minima that nothing deeper has hidden
    since, each with the highest on the way to the one under it.
    """
    found: list[float] = []
    stack: list[tuple[float, float]] = []
    for here, top in zip(depth, [np.inf, *crest], strict=True):
        highest = top
        while stack and (stack[-1][0] > here or (stack[-1][0] == here and not equal_hides)):
            highest = max(highest, stack.pop()[1])
        found.append(highest if stack else np.inf)
        stack.append((here, highest))
    return found
