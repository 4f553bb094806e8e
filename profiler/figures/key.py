"""The key of the profile: samples and words for what is drawn, and only for that."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from profiler.figures import style
from profiler.figures.page import LINE_IN, Page
from profiler.figures.profile import Scene
from profiler.figures.text import width_in
from profiler.remarks import k_text

__all__ = ["draw_key"]

_SAMPLE_IN, _GAP_IN = 0.22, 0.14

Sample = Callable[[Page, float, float, float], Any]
"""Draws a sample into a place: page, left, top, depth."""


def draw_key(page: Page, left: float, top: float, width: float, view: Scene) -> float:
    """Name what the profile shows, in a row or two; returns how far down they reach."""
    x, y, depth = left, top, style.SMALL * LINE_IN
    for words, sample in _entries(view):
        room = _SAMPLE_IN + 0.05 + width_in(words, style.SMALL)
        if x + room > left + width:
            x, y = left, y + depth + 0.03
        sample(page, x, y + 0.02, depth - 0.04)
        page.words(x + _SAMPLE_IN + 0.05, y, words, size=style.SMALL)
        x += room + _GAP_IN
    return y + depth


def _swatch(**look: Any) -> Sample:
    return lambda page, x, y, depth: page.box(x, y, _SAMPLE_IN, depth, **look)


def _line(**look: Any) -> Sample:
    return lambda page, x, y, depth: page.stroke([x, x + _SAMPLE_IN], [y + depth / 2] * 2, **look)


def _mark(**look: Any) -> Sample:
    return lambda page, x, y, depth: page.stroke([x + _SAMPLE_IN / 2], [y + depth / 2], ls="", **look)


def _entries(view: Scene) -> list[tuple[str, Sample]]:
    """Words and samples, in the order of their weight."""
    entries = [
        ("ray", _line(color=style.RAY, lw=1.4)),
        ("first Fresnel zone", _swatch(fc=style.ZONE, ec=style.ZONE_EDGE, lw=0.5)),
        ("must be free", _swatch(fc=style.ZONE_REQUIRED, ec=style.RAY, lw=0.7, ls=(0, (3, 1.5)))),
    ]
    if (view.surface > view.free).any():
        entries.append(("not free", _swatch(fc=style.FAIL, lw=0)))
    entries.append((f"ground at k = {k_text(view.k)}", _swatch(fc=style.GROUND, ec=style.GROUND_EDGE, lw=0.7)))
    if (view.surface > view.ground).any():
        entries.append(("cover on it", _swatch(fc=style.COVER, ec=style.COVER_EDGE, lw=0.4)))
    if view.low is not None:
        entries.append(("5 to 95 % band", _swatch(fc=style.INK, alpha=0.22, lw=0)))
    if view.filled.any():
        entries.append(("no data, filled", _swatch(fc=style.GROUND, ec=style.MUTED, hatch="xxxxxx", lw=0)))
    if view.surveyed[0].size:
        entries.append(("surveyed", _mark(marker="s", ms=3.6, mfc="white", mec=style.INK, mew=0.8)))
    if view.reflections[0].size:
        entries.append(("may mirror the ray", _mark(marker="D", ms=3.4, mfc="white", mec=style.RAY, mew=0.8)))
    return entries
