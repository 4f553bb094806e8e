"""What arrives and what is left: the link budget both ways, and its inverse questions.

Tables add up: every loss is a negative line, every gain a positive one, and the sum is the received level.
"""

from profiler.budget.antenna import dish_diameter, dish_gain, far_field_distance
from profiler.budget.budget_lines import Budget, Direction, ModeBudget, Way, free_space_loss, link_budget, way_name
from profiler.budget.inverse import InverseAnswer, least_gain, least_power, longest_free_space_range, smallest_dish

__all__ = [
    "Budget",
    "Direction",
    "InverseAnswer",
    "ModeBudget",
    "Way",
    "dish_diameter",
    "dish_gain",
    "far_field_distance",
    "free_space_loss",
    "least_gain",
    "least_power",
    "link_budget",
    "longest_free_space_range",
    "smallest_dish",
    "way_name",
]
