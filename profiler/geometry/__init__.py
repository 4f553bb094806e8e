"""Where the ray runs, what it must clear, and where it is tightest.

Distances in metres from site A, heights in metres above the vertical datum. Clearance is positive when the ray is
above the ground and its cover.
"""

from profiler.geometry.across import Surface, asked_across
from profiler.geometry.clearance import ROUNDING_M, RuleCheck, check_rule, tight_places
from profiler.geometry.hold import ON_PATH_M, HeldRule, hold_rules, side_of, zone_rays
from profiler.geometry.pieces import Least, Parabolas, PathZone, inside_places, least_surplus, zone_places
from profiler.geometry.ray import earth_bulge, elevation_angle, fresnel_radius, ray_height
from profiler.geometry.reflection import Reflection, find_reflections
from profiler.geometry.zone import least_in_zone

__all__ = [
    "ON_PATH_M",
    "ROUNDING_M",
    "HeldRule",
    "Least",
    "Parabolas",
    "PathZone",
    "Reflection",
    "RuleCheck",
    "Surface",
    "asked_across",
    "check_rule",
    "earth_bulge",
    "elevation_angle",
    "find_reflections",
    "fresnel_radius",
    "hold_rules",
    "inside_places",
    "least_in_zone",
    "least_surplus",
    "ray_height",
    "side_of",
    "tight_places",
    "zone_places",
    "zone_rays",
]
