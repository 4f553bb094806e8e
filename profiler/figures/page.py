"""A page that is laid out by hand: axes, words and strokes at inches from its top left corner.

Every place is worked out from the widths of the words before anything is drawn: nothing needs a trial drawing, and the
axes of two figures have the same size on paper, which makes them comparable. A page with much to say grows downward.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

from matplotlib.figure import Figure
from matplotlib.lines import Line2D
from matplotlib.patches import Rectangle
from matplotlib.transforms import Affine2D

from profiler.figures import style
from profiler.figures.scale import minus
from profiler.figures.text import font, wrap

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.text import Text

__all__ = ["ASCENT", "LEADING", "LINE_IN", "MARGIN_IN", "PAGE_HEIGHT_IN", "PAGE_WIDTH_IN", "Page"]

PAGE_WIDTH_IN, PAGE_HEIGHT_IN = 11.69, 8.27
"""A4 landscape; it prints on Letter at 94 %."""

MARGIN_IN = 0.36
ASCENT, LEADING = 0.86, 1.2
"""From the top of a line to its baseline, and from one baseline to the next, as shares of the size of type."""

LINE_IN = LEADING / 72.0
"""Depth of a line of text, inches for each point of its size."""


class Page:
    """A figure under construction, measured in inches to the right and downward."""

    def __init__(self) -> None:
        self.figure = Figure(figsize=(PAGE_WIDTH_IN, PAGE_HEIGHT_IN), dpi=style.DPI, facecolor="white")
        self._down = Affine2D()
        self._inches = self._down + self.figure.dpi_scale_trans
        self._places: dict[Axes, tuple[float, float, float, float]] = {}

    def axes(self, left: float, top: float, width: float, height: float, *, label: str) -> Axes:
        """Add axes; the label names them for whoever looks into the figure."""
        axes = self.figure.add_axes((0.0, 0.0, 1.0, 1.0), label=label)
        axes.set_facecolor("white")
        for spine in axes.spines.values():
            spine.set(linewidth=0.6, color=style.MUTED)
        axes.set_xticks([])
        axes.set_yticks([])
        self._places[axes] = (left, top, width, height)
        return axes

    def scale_side(self, axes: Axes, values: Sequence[float], labels: Sequence[str]) -> None:
        """Write the scale of the upright axis; the grid stands in for ticks.

        The ticks of an axis take a third of the time of a whole page: here they are words like all others.
        """
        left, top, _, height = self._places[axes]
        for value, label in zip(values, labels, strict=True):
            share = axes.transLimits.transform(axes.transScale.transform((axes.get_xlim()[1], value)))[1]
            self.words(left - 0.05, top + height * (1.0 - share) - 0.058, label, size=style.SMALL, align="right")

    def scale_foot(self, axes: Axes, values: Sequence[float], title: str) -> float:
        """Write the scale of the level axis and its title; returns where the next thing can stand."""
        left, top, width, height = self._places[axes]
        low, high = axes.get_xlim()
        for value in values:
            at = left + width * (value - low) / (high - low)
            self.words(at, top + height + 0.04, minus(f"{value:g}"), size=style.SMALL, align="center", gid="scale")
        self.words(left + width / 2, top + height + 0.18, title, align="center", gid="title")
        return top + height + 0.18 + style.BODY * LINE_IN

    def words(
        self,
        left: float,
        top: float,
        lines: str | Sequence[str],
        *,
        size: float = style.BODY,
        bold: bool = False,
        color: str = style.INK,
        align: str = "left",
        **more: Any,
    ) -> Text:
        """Write one line or several, the first one's top at ``top``; nothing in them is taken for mathematics."""
        string = lines if isinstance(lines, str) else "\n".join(lines)
        baseline = top + (ASCENT + string.count("\n") * LEADING) * size / 72.0
        return self.figure.text(
            left,
            baseline,
            string,
            transform=self._inches,
            fontproperties=font(size, bold),
            color=color,
            ha=align,
            va="baseline",
            parse_math=False,
            **more,
        )

    def paragraph(
        self,
        left: float,
        top: float,
        words: str,
        room: float,
        *,
        size: float = style.BODY,
        bold: bool = False,
        **more: Any,
    ) -> float:
        """Write a text in as many lines as the room asks for; returns where the next thing can stand."""
        lines = wrap(words, room, size, bold=bold)
        self.words(left, top, lines, size=size, bold=bold, **more)
        return top + len(lines) * size * LINE_IN

    def box(self, left: float, top: float, width: float, height: float, **more: Any) -> Rectangle:
        """Draw a rectangle."""
        patch = Rectangle((left, top), width, height, transform=self._inches, **more)
        self.figure.add_artist(patch)
        return patch

    def stroke(self, x: Sequence[float], y: Sequence[float], **more: Any) -> Line2D:
        """Draw a line through points."""
        line = Line2D(x, y, transform=self._inches, **more)
        self.figure.add_artist(line)
        return line

    def finish(self, bottom: float) -> Figure:
        """Close the page under the lowest thing on it and put everything in place."""
        height = max(PAGE_HEIGHT_IN, bottom + MARGIN_IN)
        self.figure.set_size_inches(PAGE_WIDTH_IN, height)
        self._down.clear().scale(1.0, -1.0).translate(0.0, height)
        for axes, (left, top, width, depth) in self._places.items():
            axes.set_position(
                (left / PAGE_WIDTH_IN, 1.0 - (top + depth) / height, width / PAGE_WIDTH_IN, depth / height)
            )
        return self.figure
