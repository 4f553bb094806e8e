"""The profile: ground over the bulged earth, what stands on it, the ray, its zone and what must be free of it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from profiler.figures import style
from profiler.figures.place_labels import rule_position
from profiler.models import frozen_array
from profiler.remarks import k_text
from profiler.units import Float
from profiler.words import Scale

if TYPE_CHECKING:
    from matplotlib.axes import Axes

    from profiler.study.result import Place, Study

__all__ = ["AXES_IN", "Scene", "draw_profile", "draw_tight_places", "scene", "thinned"]

_MOST_POINTS = 4000

AXES_IN = 7.0
"""Width of the profile and of the strips under it, inches."""


def thinned(values: Float, most: int = _MOST_POINTS) -> NDArray[np.intp]:
    """Find indices that draw a line of many points with few: the lowest and the highest of every stretch, and the ends.

    Examples
    --------
    >>> thinned(np.array([0.0, 5.0, 1.0, -3.0, 0.0]), most=99).tolist()
    [0, 1, 2, 3, 4]
    >>> 0 < thinned(np.sin(np.arange(100_000.0))).size <= 4000
    True
    """
    count = values.size
    if count <= most:
        return np.arange(count)
    stretches = most // 2 - 1
    width = -(-count // stretches)
    padded = np.concatenate((values, np.full(-count % width, values[-1]))).reshape(-1, width)
    first = np.arange(padded.shape[0]) * width
    found = np.concatenate(([0, count - 1], first + padded.argmin(axis=1), first + padded.argmax(axis=1)))
    return np.unique(np.minimum(found, count - 1))


@dataclass(frozen=True, slots=True, eq=False)
class Scene:
    """What the profile draws, in the units it shows, thinned for drawing; heights carry the bulge of the governing k.

    Above ``free`` nothing may stand. ``low`` and ``high`` bound the surface with 5 % and 95 % confidence; None without
    a confidence analysis.
    """

    x: Float
    ground: Float
    surface: Float
    ray: Float
    f1: Float
    free: Float
    filled: NDArray[np.bool_]
    surveyed: tuple[Float, Float]
    reflections: tuple[Float, Float]
    low: Float | None
    high: Float | None
    k: float


def scene(study: Study, scale: Scale) -> Scene:
    """Gather what the profile draws, over the earth bulged at the governing rule's k."""
    profile, result = study.profile, study.governing
    check = result.check
    keep = np.union1d(thinned(profile.surface_m), [place.index for place in result.places])
    x, ground = profile.distance_m, profile.ground_m + check.bulge_m
    surface = ground + profile.cover_m
    free = surface + check.surplus_m
    mirrors = [each.distance_m for each in result.reflections if not each.screened]
    doubt = None if study.confidence is None else study.confidence.rules[rule_position(study, result)].surplus

    def shown(values: Float) -> Float:
        return frozen_array(scale.height(values[keep]))

    return Scene(
        x=frozen_array(scale.distance(x[keep])),
        ground=shown(ground),
        surface=shown(surface),
        ray=shown(surface + check.clearance_m),
        f1=shown(check.f1_m),
        free=shown(free),
        filled=profile.filled[keep],
        surveyed=(scale.distance(x[profile.surveyed]), scale.height(ground[profile.surveyed])),
        reflections=(scale.distance(np.array(mirrors)), scale.height(np.interp(mirrors, x, surface))),
        low=None if doubt is None else shown(free - doubt.high_m),
        high=None if doubt is None else shown(free - doubt.low_m),
        k=check.rule.k,
    )


def draw_profile(
    axes: Axes,
    view: Scene,
    scale: Scale,
    *,
    distance_limits: tuple[float, float],
    height_limits: tuple[float, float] | None,
) -> None:
    """Draw the profile; the limits are in the units shown."""
    bottom, top = _height_limits(view) if height_limits is None else height_limits
    base = min(bottom, float(view.ground.min()))
    axes.fill_between(view.x, view.ray - view.f1, view.ray + view.f1, fc=style.ZONE, ec=style.ZONE_EDGE, lw=0.5)
    axes.fill_between(view.x, view.free, view.ray, fc=style.ZONE_REQUIRED, lw=0)
    axes.fill_between(view.x, base, view.ground, fc=style.GROUND, lw=0)
    if (view.surface > view.ground).any():
        axes.fill_between(view.x, view.ground, view.surface, fc=style.COVER, ec=style.COVER_EDGE, lw=0.4)
    if view.filled.any():
        axes.fill_between(
            view.x, base, view.ground, where=_widened(view.filled), fc="none", ec=style.MUTED, hatch="xxxx", lw=0
        )
    if (view.surface > view.free).any():
        axes.fill_between(
            view.x,
            view.free,
            view.surface,
            where=view.surface > view.free,
            interpolate=True,
            fc=style.FAIL,
            lw=0,
            zorder=1.5,
        )
    axes.plot(view.x, view.ground, color=style.GROUND_EDGE, lw=0.9, label="ground")
    if view.low is not None and view.high is not None:
        axes.fill_between(view.x, view.low, view.high, fc=style.INK, alpha=0.22, lw=0, zorder=2.4, label="band")
    axes.plot(view.x, view.free, color=style.RAY, lw=0.8, dashes=(4, 2), label="required")
    axes.plot(view.x, view.ray, color=style.RAY, lw=1.4, label="ray")
    axes.plot(*view.surveyed, ls="", marker="s", ms=3.6, mfc="white", mec=style.INK, mew=0.8, label="surveyed")
    axes.plot(*view.reflections, ls="", marker="D", ms=3.4, mfc="white", mec=style.RAY, mew=0.8, label="reflections")
    axes.set_xlim(*distance_limits)
    axes.set_ylim(bottom, top)
    _masts(axes, view)
    axes.set_ylabel(f"height above datum, {scale.height_unit},\nwith the bulge at k = {k_text(view.k)}")
    axes.tick_params(labelbottom=False)


def _masts(axes: Axes, view: Scene) -> None:
    """Draw the antennas' supports from the ground to the ray at both ends, over the edges where the limits hold all."""
    x, ground, ray = view.x[[0, -1]], view.ground[[0, -1]], view.ray[[0, -1]]
    (left, right), (bottom, top) = axes.get_xlim(), axes.get_ylim()
    cut = bool(left > x[0] or right < x[1] or bottom > ground.min() or top < ray.max())
    axes.vlines(x, ground, ray, color=style.INK, lw=2.2, clip_on=cut, zorder=3)
    look: dict[str, Any] = {"marker": "o", "ms": 4.2, "mfc": "white", "mec": style.INK, "mew": 1.1}
    axes.plot(x, ray, ls="", clip_on=cut, zorder=4, label="antennas", **look)


def _widened(filled: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Mark filled points and their neighbours: the line between a known and a filled point is filled too."""
    wide = filled.copy()
    wide[1:] |= filled[:-1]
    wide[:-1] |= filled[1:]
    return wide


def _height_limits(view: Scene) -> tuple[float, float]:
    """Limits that hold ground, antennas and zone, with a strip of ground at the foot however flat it is."""
    top = max(float((view.ray + view.f1).max()), float(view.surface.max()))
    low = float(view.ground.min())
    span = max(top - low, 1.0)
    return low - 0.12 * span, top + 0.05 * span


def draw_tight_places(axes: Axes, places: tuple[Place, ...], scale: Scale, *, on_surface: bool, color: str) -> None:
    """Mark the tight places: a thin line down through the axes, and on the profile a mark on the surface itself."""
    x = scale.distance(np.array([each.distance_m for each in places]))
    y = scale.height(np.array([each.surface_m + each.bulge_m for each in places]))
    bottom, top = axes.get_ylim()
    axes.vlines(x, bottom, y if on_surface else top, color=style.INK, lw=0.6, linestyles=(0, (1, 1.5)), zorder=2.6)
    if on_surface:
        axes.plot(x[1:], y[1:], ls="", marker="o", ms=5, mfc="white", mec=style.INK, mew=1.0, zorder=5, label="tight")
        axes.plot(x[:1], y[:1], ls="", marker="v", ms=8, mfc=color, mec="white", mew=0.8, zorder=6, label="critical")
    axes.set_ylim(bottom, top)
