"""Figures of a study: results in, pictures out; nothing about the hop is computed here."""

from profiler.figures.clearance import profile_figure
from profiler.figures.frontier import frontier_figure
from profiler.figures.margin import margin_figure
from profiler.figures.render import FORMATS, render

__all__ = ["FORMATS", "frontier_figure", "margin_figure", "profile_figure", "render"]
