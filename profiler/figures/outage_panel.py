"""Outage against the fade margin, each mechanism and all together, with what was asked for drawn in."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np

from profiler.figures import style
from profiler.figures.page import FOOT_IN, LINE_IN, Page
from profiler.figures.place_labels import spread
from profiler.figures.text import width_in
from profiler.remarks import db_text, outage_text, superscript
from profiler.units import MINUTES_PER_YEAR

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from profiler.availability import Availability, OutageCurve, Outages
    from profiler.units import Float

__all__ = ["draw_outage", "target_lines"]

_LOOKS: dict[str, tuple[str, tuple[float, ...], float]] = {
    "total": (style.INK, (), 1.8),
    "multipath": ("#0072b2", (5, 2), 1.2),
    "selective": ("#a0527a", (6, 1.5, 1.5, 1.5), 1.2),
    "rain": ("#4d8a7a", (1.5, 1.5), 1.4),
    "obstruction": ("#b8860b", (9, 3), 1.2),
}
_HALF_IN = 2.0
_LOWEST_POWER = -12
_RIGHT_IN = 1.02


def target_lines(outage: Availability, period: str) -> list[tuple[float, list[str]]]:
    """Targets of a period, as the percentage that may be lost and the words beside its line."""
    found: list[tuple[float, list[str]]] = []
    for target in () if outage.objective is None else outage.objective.targets:
        if target.name == "minutes_per_year":
            line = (100.0 * target.required / MINUTES_PER_YEAR, [f"{target.required:g} min", "a year asked"])
        elif target.name in ("year_percent", "worst_month_percent"):
            line = (target.required, [outage_text(target.required), "asked"])
        else:
            kind = "errored" if target.name == "errored_seconds_ratio" else "sev. errored"
            line = (100.0 * target.required, [outage_text(100.0 * target.required), f"{kind} s"])
        of_year = target.name in ("minutes_per_year", "year_percent")
        if of_year == (period == "year"):
            found.append(line)
    return found


def draw_outage(
    page: Page, left: float, top: float, width: float, outage: Availability, curve: OutageCurve
) -> tuple[tuple[Axes, Axes], float]:
    """Draw the worst month above and the year below; returns both axes and how far down they reach."""
    room = width - _RIGHT_IN
    highest = max(float(curve.margin_db[-1]), 1.08 * outage.fade_margin_db)
    top = _key(page, left, top, outage)
    top = _margin_labels(page, left, top, room, outage, highest)
    pair = []
    for period, outages, here in (
        ("worst month", curve.worst_month_percent, outage.worst_month_percent.total),
        ("year", curve.year_percent, outage.year_percent.total),
    ):
        axes = page.axes(left, top, room, _HALF_IN, label=period, most=(8, 8))
        targets = target_lines(outage, period)
        _curves(axes, curve.margin_db, outages, targets, here)
        _margins(axes, outage, highest)
        axes.plot(max(outage.fade_margin_db, 0.0), here, "o", color=style.INK, ms=4, label="reached", zorder=4)
        axes.set_ylabel(f"outage, % of the\n{period}")
        _target_words(page, left + room, top, axes, targets)
        pair.append(axes)
        top += _HALF_IN + 0.12
    pair[0].tick_params(labelbottom=False)
    pair[1].set_xlabel("flat fade margin, dB")
    return (pair[0], pair[1]), top - 0.12 + FOOT_IN


def _percent_label(percent: float, _: object) -> str:
    power = round(math.log10(percent))
    return f"{percent:g}" if power >= -3 else f"10{superscript(power)}"


def _curves(
    axes: Axes, margin_db: Float, outages: Outages[Float], targets: list[tuple[float, list[str]]], here: float
) -> None:
    """Draw the curves of one period, from 100 % to below what is asked and what is reached."""
    lowest = min([1e-3, *(percent / 30.0 for percent, _ in targets), *([here / 3.0] if here > 0 else [])])
    bottom = max(math.floor(math.log10(lowest)), _LOWEST_POWER)
    axes.set_yscale("log")
    axes.minorticks_off()
    axes.yaxis.set_major_formatter(_percent_label)
    for name, (color, dashes, weight) in _LOOKS.items():
        part = outages.total if name == "total" else outages.part(name)  # type: ignore[arg-type]
        if part is None:
            continue
        shown = np.where(part > 0.0, part, np.nan)
        axes.plot(margin_db, shown, color=color, dashes=dashes or (None, None), lw=weight, label=name)
    axes.set_ylim(10.0**bottom, 150.0)
    for percent, _ in targets:
        axes.axhline(percent, color=style.FAIL, lw=1.6, label="asked")


def _margins(axes: Axes, outage: Availability, highest: float) -> None:
    """Mark the margin there is and the one that is needed."""
    axes.set_xlim(0.0, highest)
    axes.axvline(max(outage.fade_margin_db, 0.0), color=style.INK, lw=1.2, label="margin")
    needed = None if outage.objective is None else outage.objective.required_margin_db
    if needed is not None and needed <= highest:
        axes.axvline(needed, color=style.FAIL, lw=1.2, dashes=(2, 1.5), label="needed")


def _margin_labels(page: Page, left: float, top: float, room: float, outage: Availability, highest: float) -> float:
    """Name the two upright lines, each in a row of its own so that they never meet."""
    share = max(outage.fade_margin_db, 0.0) / highest
    rows = [(f"there is: {db_text(outage.fade_margin_db)}", share, style.INK)]
    needed = None if outage.objective is None else outage.objective.required_margin_db
    if needed is not None:
        rows.append((f"needed: {db_text(needed)}", min(needed / highest, 1.0), style.FAIL))
    for words, where, color in rows:
        half = width_in(words, style.BODY, bold=True) / 2
        x = min(max(left + where * room, left + half), left + room - half)
        page.words(x, top, words, bold=True, color=color, align="center")
        top += style.BODY * LINE_IN
    return top + 0.04


def _target_words(page: Page, left: float, top: float, axes: Axes, targets: list[tuple[float, list[str]]]) -> None:
    """Name the level lines at their right ends, moved apart where they stand close."""
    bottom, ceiling = np.log10(axes.get_ylim())
    depth = 2 * style.SMALL * LINE_IN
    wanted = [_HALF_IN * (ceiling - math.log10(percent)) / (ceiling - bottom) - depth / 2 for percent, _ in targets]
    for at, (_, words) in zip(spread(wanted, depth, 0.0, _HALF_IN - depth), targets, strict=True):
        page.words(left + 0.06, top + at, words, size=style.SMALL, color=style.FAIL)


def _key(page: Page, left: float, top: float, outage: Availability) -> float:
    """Name the curves that there are, and the mechanisms that nothing was given for."""
    x, y, depth = left, top, style.SMALL * LINE_IN
    for name, (color, dashes, weight) in _LOOKS.items():
        if name in outage.missing:
            continue
        page.stroke([x, x + 0.3], [y + depth / 2] * 2, color=color, dashes=dashes or (None, None), lw=weight)
        page.words(x + 0.35, y, name, size=style.SMALL)
        x += 0.35 + width_in(name, style.SMALL) + 0.16
    y += depth + 0.02
    if outage.missing:
        words = f"not counted, nothing given for it: {', '.join(outage.missing)}"
        page.words(left, y, words, size=style.SMALL, color=style.MUTED)
        y += depth + 0.02
    return y + 0.02
