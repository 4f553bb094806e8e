"""The antenna heights of a hop that has been studied: the exact region that clears, and the pair that does it all."""

from profiler.plan.compose import HeightsPlan, plan_heights
from profiler.plan.document_of_plan import heights_document

__all__ = ["HeightsPlan", "heights_document", "plan_heights"]
