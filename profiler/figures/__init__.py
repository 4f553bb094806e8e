"""Figures of a study: results in, pictures out; nothing about the hop is computed here."""

from profiler.figures.heights_figure import frontier_figure
from profiler.figures.margin import margin_figure
from profiler.figures.render import FORMATS, render
from profiler.figures.surplus_panel import profile_figure

__all__ = ["FORMATS", "frontier_figure", "margin_figure", "profile_figure", "render"]
