"""The two strips under the profile: surplus along the path for each rule, and the ground seen from above."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np

from profiler.figures import style
from profiler.figures.axes import draw_grid, label_side
from profiler.figures.page import Page
from profiler.figures.places import rule_position, rules_by_surplus, surplus_drawn
from profiler.figures.profile import AXES_IN, thinned
from profiler.figures.scale import Scale, minus, nice_ticks
from profiler.units import Float

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from profiler.study.result import Place, Relief, Study

__all__ = ["draw_relief", "draw_surplus", "hillshade", "mark_on_relief", "north_on_page", "rule_look"]

_MOST_ALONG, _MOST_ACROSS = 1200, 160


def rule_look(position: int) -> tuple[str, tuple[float, ...]]:
    """Color and dashes of a rule by its place in the hop file, the same on every figure."""
    count = len(style.RULE_COLORS)
    # from the sixth rule on the colors meet other dashes
    return style.RULE_COLORS[position % count], style.RULE_DASHES[(position + position // count) % count]


def draw_surplus(
    page: Page,
    axes: Axes,
    study: Study,
    scale: Scale,
    *,
    distance_limits: tuple[float, float],
    surplus_limits: tuple[float, float] | None,
) -> None:
    """Draw how much clearance each rule leaves over along the path; below 0 it is short.

    The limits are set for the tight places; where there is much more clearance the lines leave at the top.
    """
    results = rules_by_surplus(study)
    bottom, top = _surplus_limits(study, scale) if surplus_limits is None else surplus_limits
    axes.fill_between(distance_limits, min(bottom, 0.0), 0.0, fc=style.FAIL_TINT, lw=0, zorder=0.4)
    x = study.profile.distance_m
    if study.confidence is not None:
        band = study.confidence.rules[rule_position(study, results[0])].surplus
        keep = thinned(band.low_m)
        low, high = scale.height(band.low_m[keep]), scale.height(band.high_m[keep])
        axes.fill_between(scale.distance(x[keep]), low, high, fc=style.INK, alpha=0.22, lw=0, label="band")
    for result in reversed(results):
        position = rule_position(study, result)
        surplus = surplus_drawn(result)
        keep = thinned(surplus)
        color, dashes = rule_look(position)
        axes.plot(
            scale.distance(x[keep]),
            scale.height(surplus[keep]),
            color=color,
            lw=1.8 if result is results[0] else 1.0,
            dashes=dashes or (None, None),
            label=f"rule {position + 1}",
        )
    axes.axhline(0.0, color=style.INK, lw=1.0)
    axes.set_xlim(*distance_limits)
    axes.set_ylim(bottom, top)
    ticks = nice_ticks(bottom, top, 5)
    page.scale_side(axes, ticks, [f"{'+' if tick > 0 else ''}{minus(f'{tick:g}')}" for tick in ticks])
    label_side(axes, f"clearance less\nrequirement, {scale.height_unit}", width_in=AXES_IN)
    draw_grid(axes, nice_ticks(*distance_limits, 12), ticks)


def _surplus_limits(study: Study, scale: Scale) -> tuple[float, float]:
    """Limits that show the tight places of every rule, whatever room there is over deep valleys."""
    surpluses = [surplus_drawn(each) for each in study.rules]
    leasts, most = [float(each.min()) for each in surpluses], max(float(each.max()) for each in surpluses)
    widest = max(float(each.check.f1_m.max()) for each in study.rules)
    doubtful = [] if study.confidence is None else [float(each.surplus.low_m.min()) for each in study.confidence.rules]
    low = min(0.0, *leasts, *doubtful)
    # the tightest place of every rule, unless one rule is so easy that it would flatten all the others
    tight = [least for least in leasts if least < min(leasts) + 6.0 * widest]
    high = min(most, max(3.0 * widest, -0.8 * low, 1.2 * max(tight) + widest, 5.0))
    span = max(high - low, 1.0)
    return scale.height(low - 0.1 * span), scale.height(high + 0.05 * span)


def hillshade(ground_m: Float, along_step_m: float, offset_step_m: float) -> Float:
    """Brightness 0 to 1 of the ground lit from the upper left of the page, higher ground a little brighter.

    ``ground_m`` is (n, across), A to B and left to right of the path, which is the page's left to right and top to
    bottom. Slopes are exaggerated until they show, up to twentyfold, so that noise of flat ground stays noise.
    """
    along, aside = np.gradient(ground_m, along_step_m, offset_step_m)
    facing = (along + aside) / math.sqrt(2.0)  # ground that rises to the lower right of the page faces the light
    steepness = float(np.sqrt(np.nanmean(facing**2)))
    lit = 0.5 + 0.5 * np.tanh(0.7 * facing * min(20.0, 1.0 / max(steepness, 1e-9)))
    low, high = float(np.nanmin(ground_m)), float(np.nanmax(ground_m))
    height = 0.5 + (ground_m - 0.5 * (low + high)) / max(high - low, 10.0)
    return np.asarray(np.clip(0.5 * lit + 0.5 * height, 0.0, 1.0))


def draw_relief(
    page: Page, axes: Axes, relief: Relief, length_m: float, scale: Scale, *, distance_limits: tuple[float, float]
) -> None:
    """Draw the ground from above along the path: A left, B right, the left side of the path on top."""
    rows = np.arange(0, relief.along_m.size, max(1, relief.along_m.size // _MOST_ALONG))
    columns = np.arange(0, relief.offset_m.size, max(1, relief.offset_m.size // _MOST_ACROSS))
    along, offset, ground = relief.along_m[rows], relief.offset_m[columns], relief.ground_m[np.ix_(rows, columns)]
    left, right = scale.distance(float(offset[0])), scale.distance(float(offset[-1]))
    if np.isfinite(ground).any():
        shade = hillshade(ground, float(along[1] - along[0]), float(offset[1] - offset[0]))
        image = style.RELIEF_LOW + shade.T[..., None] * (style.RELIEF_HIGH - style.RELIEF_LOW)
        image[np.isnan(image)] = 1.0
        extent = (scale.distance(float(along[0])), scale.distance(float(along[-1])), right, left)
        axes.imshow(image, extent=extent, aspect="auto", interpolation="bilinear")
    axes.plot([0.0, scale.distance(length_m)], [0.0, 0.0], color="white", lw=3.0, solid_capstyle="butt")
    axes.plot([0.0, scale.distance(length_m)], [0.0, 0.0], color=style.RAY, lw=1.4, label="path")
    axes.set_facecolor("#ffffff")
    axes.set_xlim(*distance_limits)
    axes.set_ylim(right, left)
    ticks = nice_ticks(left, right, 5)
    sides = [f"{abs(tick):g}{' L' if tick < 0 else ' R' if tick > 0 else ''}" for tick in ticks]
    page.scale_side(axes, ticks, sides)
    label_side(axes, f"left or right\nof path, {scale.distance_unit}", width_in=AXES_IN)


def mark_on_relief(axes: Axes, places: tuple[Place, ...], scale: Scale, *, color: str) -> None:
    """Mark the tight places on the ground seen from above."""
    x = scale.distance(np.array([each.distance_m for each in places]))
    y = scale.distance(np.array([each.offset_m for each in places]))
    axes.plot(x[1:], y[1:], ls="", marker="o", ms=5, mfc="white", mec=style.INK, mew=1.0, zorder=5, label="tight")
    axes.plot(x[:1], y[:1], ls="", marker="v", ms=8, mfc=color, mec="white", mew=0.8, zorder=6, label="critical")


def north_on_page(azimuth_deg: float, along_in_per_m: float, across_in_per_m: float) -> tuple[float, float]:
    """Direction of north on the page, a unit vector (right, down), in a map whose two scales differ.

    Examples
    --------
    A path due east on equal scales has north at the top; one due north has it at the right:

    >>> [round(each, 3) + 0.0 for each in north_on_page(90.0, 1.0, 1.0)]
    [0.0, -1.0]
    >>> [round(each, 3) + 0.0 for each in north_on_page(0.0, 1.0, 1.0)]
    [1.0, 0.0]
    """
    azimuth = math.radians(azimuth_deg)
    right, down = math.cos(azimuth) * along_in_per_m, -math.sin(azimuth) * across_in_per_m
    length = math.hypot(right, down)
    return right / length, down / length
