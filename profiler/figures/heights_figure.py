"""The heights figure: every pair of antenna heights that clears, and which obstacle and rule draws each stretch of it.

The decision is which pair to build. The figure holds the two heights against each other, so that a metre more at one
end reads off as metres less at the other; the towers' limits are drawn in, and the pair of the hop file, the answer
and the least equal heights are marked. The table beside it names the obstacle behind each numbered stretch.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from profiler.figures import style
from profiler.figures.blocks import columns_at, foot, head, heading, rows, titles
from profiler.figures.captions import hop_facts, profile_notes
from profiler.figures.page import FOOT_IN, LINE_IN, MARGIN_IN, PAGE_WIDTH_IN, Page
from profiler.figures.place_labels import spread
from profiler.figures.strips import rule_look
from profiler.remarks import chance_text, cost_text, minus
from profiler.words import (
    Scale,
    beside_text,
    chance_words,
    pair_words,
    remedies_words,
    requirement_text,
    spare_text,
    spot_text,
    stands_text,
)

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from profiler.heights import Stretch
    from profiler.plan import HeightsPlan

__all__ = ["frontier_figure"]

_LEFT, _SIZE_IN = 0.92, 5.0
_SIDE = _LEFT + _SIZE_IN + 0.42
_SIDE_ROOM = PAGE_WIDTH_IN - MARGIN_IN - _SIDE
_MARK_LOOK: dict[str, Any] = {"ms": 7, "mec": style.INK, "mew": 0.9}


@dataclass(frozen=True, slots=True)
class _Mark:
    """One pair of heights worth a mark: how it looks, and what it is."""

    look: dict[str, Any]
    antenna_a_m: float
    antenna_b_m: float
    words: str


def frontier_figure(plan: HeightsPlan, *, feet: bool = False) -> Figure:
    """Draw the region of antenna heights that clear, its frontier and the pairs that matter.

    Parameters
    ----------
    plan
        From `profiler.study.plan_heights`.
    feet
        Feet and statute miles in place of metres and kilometres.

    Returns
    -------
    Figure
        One axes, labelled "heights": antenna A across, antenna B up, both above their own ground.

    Examples
    --------
    >>> size = Path("heights.png").write_bytes(render(frontier_figure(plan_heights(study)), ".png"))  # doctest: +SKIP
    """
    from profiler.heights import NoPair

    scale, hop = Scale(feet), plan.study.hop
    marks = _marks(plan, scale)
    stretches = plan.stretches or plan.beyond
    highest_a, highest_b = hop.heights.tower_a.highest_m, hop.heights.tower_b.highest_m
    if stretches:
        highest_a, highest_b = (
            max(highest_a, stretches[-1].corners_m[-1, 0]),
            max(highest_b, stretches[0].corners_m[0, 1]),
        )
    reach_a = _reach(highest_a, [mark.antenna_a_m for mark in marks])
    reach_b = _reach(highest_b, [mark.antenna_b_m for mark in marks])
    with style.defaults():
        page = Page()
        top = head(
            page,
            plan.outcome,
            "no pair of heights does"
            if isinstance(plan.answer.pair, NoPair)
            else chance_words(plan.answer.chance, plan.answer.asked_chance),
            sentence=pair_words(plan, scale),
            name=hop.name,
            facts=hop_facts(hop, plan.study.line.distance_m, scale),
        )
        axes = page.axes(_LEFT, top + 0.16, _SIZE_IN, _SIZE_IN, label="heights", most=(9, 9))
        _draw_region(axes, plan, stretches, scale)
        axes.set_xlim(0.0, scale.height(reach_a))
        axes.set_ylim(0.0, scale.height(reach_b))
        _draw_stretches(axes, stretches, scale)
        _draw_marks(axes, marks, scale)
        axes.set_xlabel(f"antenna A above ground, {scale.height_unit}")
        axes.set_ylabel(f"antenna B above ground, {scale.height_unit}")
        _number_stretches(page, top + 0.16, axes, stretches, scale)
        side = _mark_table(page, top + 0.14, plan, marks, scale)
        side = _stretch_table(page, side + 0.12, plan, stretches, scale)
        bottom = max(top + 0.16 + _SIZE_IN + FOOT_IN, side)
        return page.finish(foot(page, bottom + 0.1, _notes(plan, scale)))


def _reach(highest_m: float, marked_m: list[float]) -> float:
    """How far an axis goes: over the tower's limit and what is marked, but not for a mark that is far out."""
    near = [mark for mark in marked_m if mark <= 1.6 * max(highest_m, marked_m[0], marked_m[1])]
    return 1.06 * max(highest_m, *near)


def _marks(plan: HeightsPlan, scale: Scale) -> list[_Mark]:
    """Pairs worth a mark, the most wanted last so that it lies on top."""
    from profiler.heights import Choice, Least

    a, b = plan.study.hop.site_a.antenna_m, plan.study.hop.site_b.antenna_m
    spare = min(result.critical.surplus_m for result in plan.study.rules)
    state, equal = spare_text(spare, scale), plan.least_equal.height_m
    marks = [
        _Mark({"marker": "s", "mfc": "white"}, a, b, f"as in the hop file: {state}"),
        _Mark({"marker": "^", "mfc": style.ZONE_REQUIRED}, equal, equal, "least equal heights"),
    ]
    if isinstance(plan.least_a, Least):
        look = {"marker": ">", "mfc": style.GROUND}
        marks.append(_Mark(look, plan.least_a.height_m, b, "least A with B as it is"))
    if isinstance(plan.least_b, Least):
        look = {"marker": "v", "mfc": style.GROUND}
        marks.append(_Mark(look, a, plan.least_b.height_m, "least B with A as it is"))
    for each in plan.sure:
        if isinstance(each.pair, Choice):
            words = f"cheapest pair to clear with a chance of {chance_text(each.asked)}"
            pair_m = each.pair.antenna_a_m, each.pair.antenna_b_m
            marks.append(_Mark({"marker": "D", "mfc": style.MUTED}, *pair_m, words))
    stars = [(plan.answer.pair, style.PASS, plan.answer.asked)]
    if plan.cheapest != plan.answer.pair:
        stars.insert(0, (plan.cheapest, "white", plan.answer.asked[:1]))
    for pair, fill, asked in stars:
        if isinstance(pair, Choice):
            words = f"cheapest pair to {' and '.join(asked)}, cost {cost_text(pair.cost)}"
            marks.append(_Mark({"marker": "*", "mfc": fill, "ms": 13}, pair.antenna_a_m, pair.antenna_b_m, words))
    return marks


def _draw_region(axes: Axes, plan: HeightsPlan, stretches: tuple[Stretch, ...], scale: Scale) -> None:
    """Shade what clears as far as the stretches reach, and outline what the towers allow."""
    if stretches:
        a, b = scale.height(np.concatenate([stretch.corners_m for stretch in stretches])).T
        axes.fill_between(a, b, b[0], fc=style.ZONE, lw=0, label="clears")
    tower_a, tower_b = plan.study.hop.heights.tower_a, plan.study.hop.heights.tower_b
    low_a, high_a = scale.height(tower_a.lowest_m), scale.height(tower_a.highest_m)
    low_b, high_b = scale.height(tower_b.lowest_m), scale.height(tower_b.highest_m)
    axes.plot(
        [low_a, high_a, high_a, low_a, low_a],
        [low_b, low_b, high_b, high_b, low_b],
        color=style.INK,
        lw=1.0,
        dashes=(6, 2, 1.5, 2),
        label="limits",
    )
    axes.axline((0.0, 0.0), slope=1.0, color=style.MUTED, lw=0.6, dashes=(1.5, 2), label="equal")


def _draw_stretches(axes: Axes, stretches: tuple[Stretch, ...], scale: Scale) -> None:
    """Draw each stretch in the look of its rule, with a tick where one ends and the next begins."""
    for stretch in stretches:
        color, dashes = rule_look(max(stretch.rule, 0))
        corners = scale.height(stretch.corners_m)
        axes.plot(corners[:, 0], corners[:, 1], color=color, lw=2.0, dashes=dashes or (None, None), label="stretch")
    if len(stretches) > 1:
        ends = scale.height(np.array([stretch.corners_m[0] for stretch in stretches[1:]]))
        axes.plot(
            ends[:, 0], ends[:, 1], ls="", marker="o", ms=3.5, mfc="white", mec=style.INK, mew=0.8, label="corners"
        )


def _draw_marks(axes: Axes, marks: list[_Mark], scale: Scale) -> None:
    """Mark the pairs that lie within the axes; the table lists them all."""
    right, top = axes.get_xlim()[1], axes.get_ylim()[1]
    for mark in marks:
        a, b = scale.height(mark.antenna_a_m), scale.height(mark.antenna_b_m)
        if a <= right and b <= top:
            axes.plot(a, b, ls="", clip_on=False, zorder=6, label=mark.words, **{**_MARK_LOOK, **mark.look})


def _number_stretches(page: Page, top: float, axes: Axes, stretches: tuple[Stretch, ...], scale: Scale) -> None:
    """Write the numbers along the frontier, on the side that does not clear, moved apart where stretches are short."""
    if not stretches:
        return
    right, ceiling = axes.get_xlim()[1], axes.get_ylim()[1]
    lines = []
    for stretch in stretches:
        heights = scale.height(stretch.corners_m)
        lines.append(np.column_stack((heights[:, 0] / right, 1.0 - heights[:, 1] / ceiling)) * _SIZE_IN)
    line = np.concatenate(lines)
    run = np.concatenate(([0.0], np.cumsum(np.hypot(*np.diff(line, axis=0).T))))
    last = np.cumsum([len(each) for each in lines]) - 1
    middles = [float(run[end] + run[end - len(each) + 1]) / 2 for end, each in zip(last, lines, strict=True)]
    apart = min(0.17, float(run[-1]) / max(len(middles) - 1, 1))
    for number, (middle, at) in enumerate(zip(middles, spread(middles, apart, 0.0, float(run[-1])), strict=True)):
        foot_x, foot_y = (float(np.interp(middle, run, line[:, axis])) for axis in (0, 1))
        x, y = (float(np.interp(at, run, line[:, axis])) for axis in (0, 1))
        # near the left or the lower edge there is no room on that side
        aside = -1.0 if x > 0.25 and y < _SIZE_IN - 0.25 else 1.0
        x, y = x + aside * 0.15, y - aside * 0.13
        page.stroke([_LEFT + x, _LEFT + foot_x], [top + y, top + foot_y], color=style.MUTED, lw=0.5)
        page.box(_LEFT + x - 0.06, top + y - 0.06, 0.12, 0.12, fc="white" if aside < 0 else style.ZONE, ec="none")
        page.words(_LEFT + x, top + y - 0.062, f"{number + 1}", bold=True, align="center")


def _mark_table(page: Page, top: float, plan: HeightsPlan, marks: list[_Mark], scale: Scale) -> float:
    """Name the marks with their heights."""
    top = heading(page, _SIDE, top, "Pairs of heights above ground")
    columns = columns_at(_SIDE + 0.25, (0.68, 0.68, _SIDE_ROOM - 1.61))
    top = titles(page, top, columns, ("A", "B", ""))
    for mark in reversed(marks):
        page.stroke([_SIDE + 0.08], [top + 0.065], ls="", **{**_MARK_LOOK, **mark.look})
        cells = (scale.height_text(mark.antenna_a_m), scale.height_text(mark.antenna_b_m), mark.words)
        top = rows(page, top, columns, [cells]) + 0.02
    page.stroke([_SIDE, _SIDE + 0.2], [top + 0.065] * 2, color=style.INK, lw=1.0, dashes=(6, 2, 1.5, 2))
    page.words(
        _SIDE + 0.25,
        top,
        "limits of the towers; shaded: clears every rule under them"
        if plan.stretches
        else "limits of the towers; shaded: clears, but above them",
        color=style.MUTED,
    )
    return top + style.BODY * LINE_IN


def _stretch_table(page: Page, top: float, plan: HeightsPlan, stretches: tuple[Stretch, ...], scale: Scale) -> float:
    """Name the obstacle and the rule behind each stretch."""
    inside = "" if plan.stretches else " (all above the limits)"
    top = heading(page, _SIDE, top, f"Stretches of the frontier{inside}")
    unit = scale.height_unit
    columns = columns_at(_SIDE, (0.6, 0.96, 0.96, 0.52, _SIDE_ROOM - 3.04))
    top = titles(
        page, top, columns, ("", f"A, {unit}", f"B, {unit}", f"at, {scale.distance_unit}", "obstacle and rule")
    )
    for number, stretch in enumerate(stretches):
        color, dashes = rule_look(max(stretch.rule, 0))
        page.stroke([_SIDE + 0.2, _SIDE + 0.52], [top + 0.065] * 2, color=color, lw=2.0, dashes=dashes or (None, None))
        top = rows(page, top, columns, [(f"{number + 1}", *_stretch_cells(plan, stretch, scale))])
    if not stretches:
        page.words(_SIDE, top, "none within the heights drawn", color=style.MUTED)
        top += style.BODY * LINE_IN
    return top


def _stretch_cells(plan: HeightsPlan, stretch: Stretch, scale: Scale) -> tuple[str, str, str, str]:
    """Cells of one stretch: the range of A, the range of B, where the obstacle is, what it is."""
    first, last = stretch.corners_m[0], stretch.corners_m[-1]
    place = plan.source(stretch.point, stretch.rule)

    def span(low: float, high: float) -> str:
        ends = [minus(f"{scale.height(float(each)):.1f}") if np.isfinite(each) else "∞" for each in (low, high)]
        return ends[0] if ends[0] == ends[1] else f"{ends[0]} to {ends[1]}"

    stands = f"{stands_text(place, scale)}{beside_text(place, scale)}"
    asks = requirement_text(plan, stretch.rule, scale)
    return (
        span(first[0], last[0]),
        span(last[1], first[1]),
        f"{scale.distance(stretch.distance_m):.2f}",
        f"{stands}; {asks}; {spot_text(place)}",
    )


def _notes(plan: HeightsPlan, scale: Scale) -> list[tuple[str, list[str]]]:
    """Put together the notes at the foot: how to read the figure, ways out, and what the study assumed."""
    from profiler.heights import NoPair

    reading = ["every pair in the shaded region clears every rule at every point; on its edge one point is just met"]
    if isinstance(plan.answer.pair, NoPair):
        reading += [f"one way out: {way}" for way in remedies_words(plan, plan.answer.pair, scale)]
    beware = [f"not judged: {scale.text(each)}" for each in plan.answer.unjudged]
    return [("Reading", [*reading, *beware]), *profile_notes(plan.study, scale)]
