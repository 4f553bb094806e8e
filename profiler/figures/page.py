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
from matplotlib.ticker import MaxNLocator
from matplotlib.transforms import Affine2D

from profiler.figures import style
from profiler.figures.text import font, wrap

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.text import Text

__all__ = ["FOOT_IN", "LINE_IN", "MARGIN_IN", "PAGE_HEIGHT_IN", "PAGE_WIDTH_IN", "Page"]

PAGE_WIDTH_IN, PAGE_HEIGHT_IN = 11.69, 8.27
"""A4 landscape; it prints on Letter at 94 %."""

MARGIN_IN = 0.36
_ASCENT, _LEADING = 0.86, 1.2
"""From the top of a line to its baseline, and from one baseline to the next, as shares of the size of type."""

LINE_IN = _LEADING / 72.0
"""Depth of a line of text, inches for each point of its size."""

FOOT_IN = 0.22 + style.BODY * LINE_IN
"""Depth of the scale of a level axis with its title."""


class Page:
    """A figure under construction, measured in inches to the right and downward."""

    def __init__(self) -> None:
        self.figure = Figure(figsize=(PAGE_WIDTH_IN, PAGE_HEIGHT_IN), dpi=style.DPI, facecolor="white")
        self._down = Affine2D()
        self._inches = self._down + self.figure.dpi_scale_trans
        self._places: dict[Axes, tuple[float, float, float, float]] = {}

    def axes(self, left: float, top: float, width: float, height: float, *, label: str, most: tuple[int, int]) -> Axes:
        """Add axes with at most so many steps across and up; the label names them for whoever looks into the figure."""
        axes = self.figure.add_axes((0.0, 0.0, 1.0, 1.0), label=label)
        for axis, steps in zip((axes.xaxis, axes.yaxis), most, strict=True):
            axis.set_major_locator(MaxNLocator(steps, steps=[1, 2, 5, 10]))
        # the titles of the axes at the same distance on every page
        axes.xaxis.set_label_coords(0.5, -0.22 / height)
        axes.yaxis.set_label_coords(-0.43 / width, 0.5)
        self._places[axes] = (left, top, width, height)
        return axes

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
        baseline = top + (_ASCENT + string.count("\n") * _LEADING) * size / 72.0
        return self.figure.text(
            left,
            baseline,
            string,
            transform=self._inches,
            fontproperties=font(size, bold),
            color=color,
            ha=align,
            va="baseline",
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
