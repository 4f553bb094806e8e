"""What goes on each tower: heights above ground and sea level, on a free position, re-checked by the forward model."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Literal

from profiler.errors import InputError
from profiler.geometry import HeldRule
from profiler.heights.choose import NoPair
from profiler.heights.tower_positions import both_free, round_up
from profiler.models import Rule, TowerChoice
from profiler.remarks import Length, note
from profiler.units import FOOT_M

__all__ = ["EndHeights", "MountedRay", "MountingSheet", "mounting_sheet"]


@dataclass(frozen=True, slots=True)
class EndHeights:
    """One end's antenna: ``antenna_m`` is the position above ground that it gets.

    ``lower_m`` is the lower antenna of a diversity pair, None without one. ``ground_m`` and ``centre_m`` are above the
    vertical datum of the terrain (mean sea level where that is the datum). Feet are international feet, 0.3048 m
    exactly.
    """

    end: Literal["A", "B"]
    antenna_m: float
    ground_m: float
    lower_m: float | None = None

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
class MountedRay:
    """One rule held against one mounted ray.

    ``ray`` says which: between the main antennas, or from a lower antenna to the far main one.
    """

    ray: Literal["main", "lower A", "lower B"]
    held: HeldRule


@dataclass(frozen=True, slots=True, eq=False)
class MountingSheet:
    """Both ends' antennas as mounted, and every rule held against them again."""

    end_a: EndHeights
    end_b: EndHeights
    rays: tuple[MountedRay, ...]

    @property
    def passes(self) -> bool:
        """Whether the mounted heights pass every rule."""
        return all(each.held.passes for each in self.rays)

    @property
    def beside(self) -> bool:
        """Whether the ground beside the path was looked at too."""
        return any(each.held.half_width_m > 0.0 for each in self.rays)


def mounting_sheet(
    hold: Callable[[Sequence[tuple[Rule, float, float]]], Sequence[HeldRule]],
    ground_a_m: float,
    ground_b_m: float,
    rules: Sequence[Rule],
    *,
    antenna_a_m: float,
    antenna_b_m: float,
    tower_a: TowerChoice,
    tower_b: TowerChoice,
    spacing_m: float = 0.0,
    lower_rule: Rule | None = None,
) -> MountingSheet | NoPair:
    """Round antenna heights up to free positions and hold every rule against the result.

    Parameters
    ----------
    hold
        Forward model: rules, each with the antenna centres at A and B above the datum, to what they leave; for
        instance `profiler.geometry.hold_rules` with the surface and the frequency filled in.
    ground_a_m, ground_b_m
        Ground at the sites above the datum.
    rules
        One or more clearance rules.
    antenna_a_m, antenna_b_m
        Heights above ground that are asked for.
    tower_a, tower_b
        Steps, limits and taken positions.
    spacing_m, lower_rule
        How far the lower antenna of a diversity pair is below the main one, and the rule that its ray to the far main
        antenna must meet (`profiler.heights.lower_rules`); 0 and None without diversity.

    Returns
    -------
    MountingSheet or NoPair
        `NoPair` when a tower has no free position at or above the height. A sheet may hold heights that fail a rule:
        look at ``passes``.

    Raises
    ------
    InputError
        If there is no rule, or a tower's limits hold no whole step.

    Examples
    --------
    >>> from functools import partial
    >>> import numpy as np
    >>> from profiler.geometry import Surface, hold_rules
    >>> path = np.array([0.0, 20e3, 40e3])
    >>> hold = partial(hold_rules, Surface(path, 100 + 0 * path, 0 * path), frequency_hz=6e9)
    >>> feet = TowerChoice(step_m=5 * 0.3048)
    >>> sheet = mounting_sheet(hold, 100, 100, [Rule(k=4 / 3, fresnel_fraction=1.0)],
    ...     antenna_a_m=45.9, antenna_b_m=45.9, tower_a=feet, tower_b=TowerChoice())
    >>> round(sheet.end_a.antenna_ft, 6), sheet.end_b.antenna_m, sheet.end_b.centre_m, sheet.passes
    (155.0, 46.0, 146.0, True)
    """
    if not rules:
        raise InputError("rules: none given; give at least one rule")
    mounted_a = round_up(antenna_a_m, tower_a, spacing_m=spacing_m, field="heights.a")
    mounted_b = round_up(antenna_b_m, tower_b, spacing_m=spacing_m, field="heights.b")
    if mounted_a is None or mounted_b is None:
        end, height = ("A", antenna_a_m) if mounted_a is None else ("B", antenna_b_m)
        free_a, free_b = both_free(tower_a, tower_b, spacing_m=spacing_m)
        return NoPair(
            reason=note("heights", f"antenna {end}: its tower has no free position at or above {{}}", Length(height)),
            best_a_m=max(free_a, default=math.nan),
            best_b_m=max(free_b, default=math.nan),
            raise_a_to_m=antenna_a_m if mounted_a is None else None,
            raise_b_to_m=antenna_b_m if mounted_b is None else None,
        )
    centres = ground_a_m + mounted_a, ground_b_m + mounted_b

    rays: list[tuple[Literal["main", "lower A", "lower B"], Rule, float, float]]
    rays = [("main", rule, *centres) for rule in rules]
    if lower_rule is not None:
        rays += [
            ("lower A", lower_rule, centres[0] - spacing_m, centres[1]),
            ("lower B", lower_rule, centres[0], centres[1] - spacing_m),
        ]
    held = hold([ray[1:] for ray in rays])
    lower_a, lower_b = (mounted - spacing_m if spacing_m else None for mounted in (mounted_a, mounted_b))
    return MountingSheet(
        end_a=EndHeights("A", mounted_a, float(ground_a_m), lower_a),
        end_b=EndHeights("B", mounted_b, float(ground_b_m), lower_b),
        rays=tuple(MountedRay(ray[0], each) for ray, each in zip(rays, held, strict=True)),
    )
