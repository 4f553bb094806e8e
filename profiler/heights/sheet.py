"""What goes on each tower: heights above ground and sea level, on a free position, re-checked by the forward model."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal

from numpy.typing import ArrayLike

from profiler.errors import InputError
from profiler.geometry import ROUNDING_M, RuleCheck, check_rule
from profiler.heights.choose import NoPair
from profiler.heights.positions import free_positions, round_up
from profiler.models import Rule, TowerChoice
from profiler.units import FOOT_M

__all__ = ["EndHeights", "MountingSheet", "mounting_sheet"]


@dataclass(frozen=True, slots=True)
class EndHeights:
    """One end's antenna: ``needed_m`` is what was asked for, ``antenna_m`` the position above ground that it gets.

    ``ground_m`` and ``centre_m`` are above the vertical datum of the terrain (mean sea level where that is the datum).
    Feet are international feet, 0.3048 m exactly.
    """

    end: Literal["A", "B"]
    needed_m: float
    antenna_m: float
    ground_m: float

    @property
    def centre_m(self) -> float:
        """Antenna centre above the vertical datum."""
        return self.ground_m + self.antenna_m

    @property
    def antenna_ft(self) -> float:
        """Antenna centre above ground in feet."""
        return self.antenna_m / FOOT_M

    @property
    def ground_ft(self) -> float:
        """Ground above the vertical datum in feet."""
        return self.ground_m / FOOT_M

    @property
    def centre_ft(self) -> float:
        """Antenna centre above the vertical datum in feet."""
        return self.centre_m / FOOT_M


@dataclass(frozen=True, slots=True, eq=False)
class MountingSheet:
    """Both ends' antennas as mounted, and every rule held against them again."""

    end_a: EndHeights
    end_b: EndHeights
    checks: tuple[RuleCheck, ...]

    @property
    def passes(self) -> bool:
        """Whether the mounted heights pass every rule, up to rounding."""
        return all(float(check.surplus_m[check.critical]) >= -ROUNDING_M for check in self.checks)


def mounting_sheet(
    distance_m: ArrayLike,
    surface_m: ArrayLike,
    ground_a_m: float,
    ground_b_m: float,
    frequency_hz: float,
    rules: Sequence[Rule],
    *,
    antenna_a_m: float,
    antenna_b_m: float,
    tower_a: TowerChoice,
    tower_b: TowerChoice,
) -> MountingSheet | NoPair:
    """Round antenna heights up to free positions and hold every rule against the result.

    Parameters
    ----------
    distance_m, surface_m
        The profile, (n,), metres from A and metres above the datum, no gaps.
    ground_a_m, ground_b_m
        Ground at the sites above the datum.
    frequency_hz
        Frequency, more than 0 Hz.
    rules
        One or more clearance rules.
    antenna_a_m, antenna_b_m
        Heights above ground that are asked for.
    tower_a, tower_b
        Steps, limits and taken positions.

    Returns
    -------
    MountingSheet or NoPair
        `NoPair` when a tower has no free position at or above the height. A sheet may hold heights that fail a rule:
        look at ``passes``.

    Raises
    ------
    InputError
        If there is no rule, the profile is bad, or a tower's limits hold no whole step.

    Examples
    --------
    >>> feet = TowerChoice(step_m=5 * 0.3048)
    >>> sheet = mounting_sheet([0, 20e3, 40e3], [100, 100, 100], 100, 100, 6e9, [Rule(k=4 / 3, fresnel_fraction=1.0)],
    ...     antenna_a_m=45.9, antenna_b_m=45.9, tower_a=feet, tower_b=TowerChoice())
    >>> round(sheet.end_a.antenna_ft, 6), sheet.end_b.antenna_m, sheet.end_b.centre_m, sheet.passes
    (155.0, 46.0, 146.0, True)
    """
    if not rules:
        raise InputError("rules: none given; give at least one rule")
    mounted_a, mounted_b = round_up(antenna_a_m, tower_a), round_up(antenna_b_m, tower_b)
    if mounted_a is None or mounted_b is None:
        end, height = ("A", antenna_a_m) if mounted_a is None else ("B", antenna_b_m)
        return NoPair(
            reason=f"antenna {end}: no free position at or above {height:.2f} m; raise the limit, or free a position",
            best_a_m=max(free_positions(tower_a), default=math.nan),
            best_b_m=max(free_positions(tower_b), default=math.nan),
            raise_a_to_m=antenna_a_m if mounted_a is None else None,
            raise_b_to_m=antenna_b_m if mounted_b is None else None,
        )
    path = (distance_m, surface_m, ground_a_m + mounted_a, ground_b_m + mounted_b, frequency_hz)
    return MountingSheet(
        end_a=EndHeights("A", antenna_a_m, mounted_a, float(ground_a_m)),
        end_b=EndHeights("B", antenna_b_m, mounted_b, float(ground_b_m)),
        checks=tuple(check_rule(*path, rule) for rule in rules),
    )
