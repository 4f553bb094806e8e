"""The level diagram: how the transmit power becomes the received level, and what is left of it over the threshold."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from profiler.figures import style
from profiler.figures.page import FOOT_IN, LINE_IN, Page
from profiler.figures.text import wrap
from profiler.remarks import minus

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from profiler.budget import ModeBudget

__all__ = ["Step", "draw_levels", "steps_of"]

_PAD_IN = 0.055


@dataclass(frozen=True, slots=True)
class Step:
    """One row: from which level to which, dBm; ``kind`` is power, gain, loss, received, threshold, margin or lack."""

    name: str
    start_dbm: float
    end_dbm: float
    kind: str

    @property
    def change(self) -> str:
        """What the row adds or takes, in words."""
        if self.kind in ("power", "received", "threshold"):
            return ""
        change = self.end_dbm - self.start_dbm
        return minus(f"{change:+.1f}") if abs(change) >= 0.05 else "0.0"


def steps_of(row: ModeBudget) -> list[Step]:
    """Rows of the diagram for one mode in one direction: the lines of its budget, then what they come to.

    Examples
    --------
    >>> from profiler.budget import link_budget
    >>> from profiler.models import Radio, RadioMode, Terminal
    >>> end = Terminal(20.0, gain_dbi=40.0)
    >>> radio = Radio(end, end, (RadioMode("m", threshold_dbm=-70.0),))
    >>> budget = link_budget(radio, 10e3, 6e9, gas_db=0.1, diffraction_db=0.0)
    >>> [(step.name, step.kind) for step in steps_of(budget.a_to_b.modes[0])][-3:]
    [('received level', 'received'), ('threshold', 'threshold'), ('fade margin', 'margin')]
    """
    first, *others = row.lines
    steps = [Step(first.name, first.value, first.value, "power")]
    level = first.value
    for line in others:
        steps.append(Step(line.name, level, level + line.value, "gain" if line.value > 0 else "loss"))
        level += line.value
    steps.append(Step("received level", row.received_dbm, row.received_dbm, "received"))
    if row.threshold_dbm is not None and row.fade_margin_db is not None:
        steps.append(Step("threshold", row.threshold_dbm, row.threshold_dbm, "threshold"))
        kind = "margin" if row.fade_margin_db >= 0 else "lack"
        steps.append(Step("fade margin", row.threshold_dbm, row.received_dbm, kind))
    return steps


def draw_levels(page: Page, left: float, top: float, width: float, steps: list[Step]) -> tuple[Axes, float]:
    """Draw the rows with their names, changes and levels; returns the axes and how far down they reach."""
    names_in, numbers_in = 1.5, 1.15
    names = [wrap(step.name, names_in - 0.1, style.BODY) for step in steps]
    depths = [len(lines) * style.BODY * LINE_IN + _PAD_IN for lines in names]
    tops = np.concatenate(([0.0], np.cumsum(depths)))
    axes = page.axes(left + names_in, top, width - names_in - numbers_in, float(tops[-1]), label="levels", most=(9, 1))
    change_at, level_at = left + width - 0.62, left + width
    page.words(change_at, top - style.SMALL * LINE_IN - 0.03, "dB", size=style.SMALL, color=style.MUTED, align="right")
    page.words(level_at, top - style.SMALL * LINE_IN - 0.03, "dBm", size=style.SMALL, color=style.MUTED, align="right")
    for step, lines, y in zip(steps, names, tops, strict=False):
        bold = step.kind in ("received", "threshold", "margin", "lack")
        at = top + float(y) + _PAD_IN / 2
        page.words(left, at, lines, bold=bold)
        if step.change:
            page.words(change_at, at, step.change, bold=bold, align="right")
        if step.kind not in ("margin", "lack"):
            page.words(level_at, at, minus(f"{step.end_dbm:.1f}"), bold=bold, align="right")
    _bars(axes, steps, tops)
    axes.set_xlabel("level, dBm")
    axes.set_yticks([])
    return axes, top + float(tops[-1]) + FOOT_IN


_FILLS = {
    "gain": style.ZONE_REQUIRED,
    "loss": style.GROUND,
    "margin": style.MUTED,
    "lack": style.FAIL,
}


def _bars(axes: Axes, steps: list[Step], tops: np.ndarray) -> None:
    """Draw each row's change as a bar between two levels, the levels as strokes across the rows."""
    middle, depth = (tops[:-1] + tops[1:]) / 2, np.diff(tops)
    for kind, color in _FILLS.items():
        rows = [i for i, step in enumerate(steps) if step.kind == kind]
        start = np.array([steps[i].start_dbm for i in rows])
        change = np.array([steps[i].end_dbm - steps[i].start_dbm for i in rows])
        axes.barh(middle[rows], change, 0.62 * depth[rows], start, color=color, ec=style.INK, lw=0.6, label=kind)
    levels = np.array([step.end_dbm for step in steps])
    carried = len(steps) if steps[-1].kind not in ("margin", "lack") else len(steps) - 2
    axes.vlines(levels[: carried - 1], middle[: carried - 1], middle[1:carried], color=style.MUTED, lw=0.6)
    for level, y, step in zip(levels, middle, steps, strict=True):
        if step.kind in ("power", "received", "threshold"):
            axes.plot(level, y, ls="", marker="D", ms=4, mfc=style.INK, mec=style.INK, label=step.kind)
        if step.kind == "threshold":
            axes.axvline(level, color=style.INK, lw=0.8, dashes=(4, 2), zorder=0.6)
    low, high = float(levels.min()), float(levels.max())
    pad = 0.06 * (high - low)
    axes.set_xlim(low - pad, high + pad)
    axes.set_ylim(float(tops[-1]), 0.0)
