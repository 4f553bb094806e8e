"""The two strips under the profile: surplus along the path for each rule, and the ground seen from above."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

import numpy as np
from matplotlib.colors import LightSource

from profiler.figures import style
from profiler.figures.place_labels import rule_position
from profiler.figures.profile import thinned
from profiler.units import Float
from profiler.words import Scale

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from profiler.study.result import Place, Relief, Study

__all__ = ["brightness", "draw_relief", "draw_surplus", "mark_on_relief", "north_on_page", "rule_look"]

_MOST_ALONG, _MOST_ACROSS = 600, 80
_FLAT_M = 30.0


def rule_look(position: int) -> tuple[str, tuple[float, ...]]:
    """Color and dashes of a rule by its place in the hop file, the same on every figure."""
    count = len(style.RULE_COLORS)
    # from the sixth rule on the colors meet other dashes
    return style.RULE_COLORS[position % count], style.RULE_DASHES[(position + position // count) % count]


def draw_surplus(
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
    results = study.by_tightness
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
        surplus = result.least_surplus_m
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
    axes.set_ylabel(f"clearance less\nrequirement, {scale.height_unit}")


def _surplus_limits(study: Study, scale: Scale) -> tuple[float, float]:
    """Limits that show the tight places of every rule, whatever room there is over deep valleys."""
    surpluses = [each.least_surplus_m for each in study.rules]
    leasts, most = [float(each.min()) for each in surpluses], max(float(each.max()) for each in surpluses)
    widest = max(float(each.check.f1_m.max()) for each in study.rules)
    doubtful = [] if study.confidence is None else [float(each.surplus.low_m.min()) for each in study.confidence.rules]
    low = min(0.0, *leasts, *doubtful)
    # the tightest place of every rule, unless one rule is so easy that it would flatten all the others
    tight = [least for least in leasts if least < min(leasts) + 6.0 * widest]
    high = min(most, max(3.0 * widest, -0.8 * low, 1.2 * max(tight) + widest, 5.0))
    span = max(high - low, 1.0)
    return scale.height(low - 0.1 * span), scale.height(high + 0.05 * span)


def brightness(ground_m: Float, along_step_m: float, offset_step_m: float) -> Float:
    """Brightness 0 to 1 of the ground on the page, (across, n): half by height, half by light from the upper left.

    The light is stretched until it shows, whatever the slopes; over flat country it fades, so that noise stays noise.
    """
    heights_m = ground_m.T
    low_m, high_m = float(np.nanmin(heights_m)), float(np.nanmax(heights_m))
    light = LightSource(315.0, 45.0).hillshade(heights_m, dx=along_step_m, dy=offset_step_m)
    height = (heights_m - low_m) / max(high_m - low_m, 1e-9)
    return np.asarray(0.5 + min((high_m - low_m) / _FLAT_M, 1.0) * (0.5 * (light + height) - 0.5))


def draw_relief(
    axes: Axes, relief: Relief, length_m: float, scale: Scale, *, distance_limits: tuple[float, float]
) -> None:
    """Draw the ground from above along the path: A left, B right, the left side of the path on top."""
    rows = slice(None, None, max(1, relief.along_m.size // _MOST_ALONG))
    columns = slice(None, None, max(1, relief.offset_m.size // _MOST_ACROSS))
    along, offset, ground = relief.along_m[rows], relief.offset_m[columns], relief.ground_m[rows, columns]
    left, right = scale.distance(float(offset[0])), scale.distance(float(offset[-1]))
    if np.isfinite(ground).any():
        shade = brightness(ground, float(along[1] - along[0]), float(offset[1] - offset[0]))
        extent = (scale.distance(float(along[0])), scale.distance(float(along[-1])), right, left)
        axes.imshow(
            shade, cmap=style.RELIEF, vmin=0.0, vmax=1.0, extent=extent, aspect="auto", interpolation="bilinear"
        )
    axes.plot([0.0, scale.distance(length_m)], [0.0, 0.0], color="white", lw=3.0, solid_capstyle="butt")
    axes.plot([0.0, scale.distance(length_m)], [0.0, 0.0], color=style.RAY, lw=1.4, label="path")
    axes.set_xlim(*distance_limits)
    axes.set_ylim(right, left)
    axes.grid(visible=False)
    axes.yaxis.set_major_formatter(lambda value, _: f"{abs(value):g}{' L' if value < 0 else ' R' if value > 0 else ''}")
    axes.set_ylabel(f"left or right\nof path, {scale.distance_unit}")


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
