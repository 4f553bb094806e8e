"""What all axes of the figures share: the name of the upright axis, and a light grid that costs little to draw."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from profiler.figures import style

if TYPE_CHECKING:
    from matplotlib.axes import Axes

__all__ = ["draw_grid", "label_side"]


def label_side(axes: Axes, words: str, *, width_in: float) -> None:
    """Name the upright axis, at the same distance from the axes on every page."""
    axes.set_ylabel(words, fontsize=style.BODY, parse_math=False)
    axes.yaxis.set_label_coords(-0.43 / width_in, 0.5)


def draw_grid(axes: Axes, across: Sequence[float], up: Sequence[float]) -> None:
    """Rule the axes from edge to edge at values across and up, under all else.

    Two collections take a small part of the time of the grid that goes with the ticks of an axis.
    """
    (left, right), (low, high) = axes.get_xlim(), axes.get_ylim()
    axes.vlines(across, low, high, color=style.GRID, lw=0.5, zorder=0.5)
    axes.hlines(up, left, right, color=style.GRID, lw=0.5, zorder=0.5)
    axes.set_xlim(left, right)
    axes.set_ylim(low, high)
