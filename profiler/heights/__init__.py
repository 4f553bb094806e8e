"""How high the antennas must stand: the exact region of heights that clear, and the choice within it.

Heights are metres above the ground of their own site unless a name says ``centre`` (above the vertical datum).
"""

from profiler.heights.choose import Choice, Lowering, NoPair, cheapest, cheapest_of, least_other
from profiler.heights.frontier import Stretch, frontier_stretches
from profiler.heights.lower_antenna import DiversityEnd, check_diversity, lower_rules
from profiler.heights.region import (
    ClearingRegion,
    Least,
    clearing_region,
    least_a_for,
    least_b_for,
    least_equal,
    least_ray,
    surplus,
)
from profiler.heights.search import LimitHeights, cheapest_by_trial, heights_within, loss_excess
from profiler.heights.sheet import MountingSheet, mounting_sheet
from profiler.heights.sure import DrawnRegions, drawn_regions, least_b_sure, least_surplus_drawn
from profiler.heights.tower_positions import both_free, round_up

__all__ = [
    "Choice",
    "ClearingRegion",
    "DiversityEnd",
    "DrawnRegions",
    "Least",
    "LimitHeights",
    "Lowering",
    "MountingSheet",
    "NoPair",
    "Stretch",
    "both_free",
    "cheapest",
    "cheapest_by_trial",
    "cheapest_of",
    "check_diversity",
    "clearing_region",
    "drawn_regions",
    "frontier_stretches",
    "heights_within",
    "least_a_for",
    "least_b_for",
    "least_b_sure",
    "least_equal",
    "least_other",
    "least_ray",
    "least_surplus_drawn",
    "loss_excess",
    "lower_rules",
    "mounting_sheet",
    "round_up",
    "surplus",
]
