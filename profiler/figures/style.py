"""Palette, type sizes and the drawing defaults of every figure.

The colors keep their order in grey print (ground light, cover darker, trouble darkest) and keep apart for the common
kinds of color blindness (blue, orange-red and neutral, never red against green); nothing is told by color alone.
"""

from __future__ import annotations

from contextlib import AbstractContextManager
from typing import Any

import matplotlib
from matplotlib.colors import LinearSegmentedColormap

__all__ = [
    "BODY",
    "COVER",
    "COVER_EDGE",
    "DPI",
    "FAIL",
    "FAIL_TINT",
    "GRID",
    "GROUND",
    "GROUND_EDGE",
    "HEAD",
    "INK",
    "MUTED",
    "OUTCOMES",
    "PASS",
    "RAY",
    "RELIEF",
    "RULE_COLORS",
    "RULE_DASHES",
    "SMALL",
    "ZONE",
    "ZONE_EDGE",
    "ZONE_REQUIRED",
    "defaults",
]

INK = "#1c1f24"
MUTED = "#585f6b"
GRID = "#d9dce1"
GROUND = "#dccfb8"
GROUND_EDGE = "#4a3b28"
COVER = "#8fa486"
COVER_EDGE = "#3f5a3c"
RAY = "#0b3c6f"
ZONE = "#e6eff8"
ZONE_EDGE = "#8fb3d6"
ZONE_REQUIRED = "#b5d0ea"
RELIEF = LinearSegmentedColormap.from_list("relief", ["#6b6359", "#faf5e8"])
PASS = "#00594f"
FAIL = "#b23a00"
UNSURE = "#7a5c00"
FAIL_TINT = "#f6dfd2"
OUTCOMES = {"passes": PASS, "not_sure": UNSURE, "fails": FAIL}

RULE_COLORS = ("#1c1f24", "#0072b2", "#b8860b", "#a0527a", "#4d8a7a")
RULE_DASHES: tuple[tuple[float, ...], ...] = ((), (5, 2), (1.5, 1.5), (6, 1.5, 1.5, 1.5), (4, 1.5, 1, 1.5, 1, 1.5))
"""One color and one dash for each rule, in the order of the hop file."""

BODY = 7.4
SMALL = 7.0
HEAD = 8.4
"""Sizes of type in points: running text, the smallest that is used anywhere, and headings of blocks."""

DPI = 120
"""Dots per inch of a PNG: the smallest type has 14 of them from line to line."""


def defaults() -> AbstractContextManager[None]:
    """Draw with the library's own defaults and ours, whatever a user's configuration file asks for elsewhere."""
    own: dict[Any, Any] = {
        "font.family": ["DejaVu Sans"],
        "font.size": BODY,
        "text.color": INK,
        "text.hinting": "none",
        "text.parse_math": False,
        "axes.edgecolor": MUTED,
        "axes.linewidth": 0.6,
        "axes.labelsize": BODY,
        "axes.grid": True,
        "axes.axisbelow": True,
        "axes.formatter.useoffset": False,
        "grid.color": GRID,
        "grid.linewidth": 0.5,
        "xtick.bottom": False,
        "xtick.labelsize": SMALL,
        "xtick.major.pad": 3.0,
        "ytick.left": False,
        "ytick.labelsize": SMALL,
        "ytick.major.pad": 3.0,
        "svg.hashsalt": "hopwright",
        "svg.fonttype": "path",
        "pdf.fonttype": 42,
        "hatch.linewidth": 0.5,
    }
    plain: dict[Any, Any] = {key: value for key, value in matplotlib.rcParamsDefault.items() if "backend" not in key}
    return matplotlib.rc_context({**plain, **own})
