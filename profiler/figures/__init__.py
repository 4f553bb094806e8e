"""Figures of a study: results in, pictures out, nothing computed here.

The margin and the heights figure load when they are first asked for, so that the profile figure starts fast.
"""

from importlib import import_module
from typing import TYPE_CHECKING, Any

from profiler.figures.clearance import profile_figure
from profiler.figures.render import FORMATS, render

if TYPE_CHECKING:
    from profiler.figures.frontier import frontier_figure
    from profiler.figures.margin import margin_figure

__all__ = ["FORMATS", "frontier_figure", "margin_figure", "profile_figure", "render"]

_LATER = {"frontier_figure": "profiler.figures.frontier", "margin_figure": "profiler.figures.margin"}


def __getattr__(name: str) -> Any:
    """Load a figure function the first time that it is asked for."""
    if name not in _LATER:
        raise AttributeError(f"module {__name__} has no attribute {name}")
    return getattr(import_module(_LATER[name]), name)
