"""The antenna heights of a hop that has been studied: the exact region that clears, and the pair that does it all."""

from profiler.plan.compose import HeightsPlan, plan_heights
from profiler.plan.remedies import remedies

__all__ = ["HeightsPlan", "plan_heights", "remedies"]
