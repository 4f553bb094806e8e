"""Where the ray runs, what it must clear, and where it is tightest.

Distances in metres from site A, heights in metres above the vertical datum. Clearance is positive when the ray is
above the ground and its cover.
"""

from profiler.geometry.clearance import ROUNDING_M, RuleCheck, check_rule, tight_places
from profiler.geometry.corridor import (
    CorridorCheck,
    CorridorNeed,
    check_corridor,
    corridor_need,
    corridor_offsets,
    side_of,
)
from profiler.geometry.pieces import Least, Parabolas, PathZone, inside_places, least_surplus, zone_places
from profiler.geometry.ray import earth_bulge, elevation_angle, fresnel_radius, ray_height
from profiler.geometry.reflection import Reflection, find_reflections

__all__ = [
    "ROUNDING_M",
    "CorridorCheck",
    "CorridorNeed",
    "Least",
    "Parabolas",
    "PathZone",
    "Reflection",
    "RuleCheck",
    "check_corridor",
    "check_rule",
    "corridor_need",
    "corridor_offsets",
    "earth_bulge",
    "elevation_angle",
    "find_reflections",
    "fresnel_radius",
    "inside_places",
    "least_surplus",
    "ray_height",
    "side_of",
    "tight_places",
    "zone_places",
]
