"""The profile figure: one page for whoever decides in ten seconds and signs in ten minutes.

From the top: the verdict in words, with how much, where and under which rule; the profile; the surplus of every rule
along the path; the ground from above; and what the numbers rest on. All three drawings share the distance axis.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from profiler.errors import InputError
from profiler.figures import style
from profiler.figures.blocks import foot, head
from profiler.figures.captions import hop_facts, profile_notes, tightest_words
from profiler.figures.key import draw_key
from profiler.figures.page import FOOT_IN, LINE_IN, Page
from profiler.figures.place_labels import spread
from profiler.figures.profile import AXES_IN, draw_profile, draw_tight_places, scene
from profiler.figures.side import title_block
from profiler.figures.strips import draw_relief, draw_surplus, mark_on_relief, north_on_page
from profiler.figures.text import width_in, wrap
from profiler.words import Scale, chance_words, headline

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from profiler.study.result import Place, Study

__all__ = ["profile_figure"]

Limits = tuple[float, float]

_LEFT, _WIDTH = 0.92, AXES_IN
_PROFILE_IN, _SURPLUS_IN, _GAP_IN, _RELIEF_IN = 2.55, 1.0, 0.14, 0.85
_MOST_ACROSS = 8


def profile_figure(
    study: Study,
    *,
    feet: bool = False,
    distance_limits: Limits | None = None,
    height_limits: Limits | None = None,
    surplus_limits: Limits | None = None,
) -> Figure:
    """Draw the profile of a hop with its verdict and everything that it rests on.

    The ground is drawn over the earth bulged at the k of the governing rule (the one with the least surplus); the strip
    below holds every rule at its own k. Axes have the same size on every page that has the view from above (without it
    the profile takes its room), so figures with the same limits are at the same scale.

    Parameters
    ----------
    study
        What to draw.
    feet
        Feet and statute miles in place of metres and kilometres.
    distance_limits, height_limits, surplus_limits
        Limits of the axes, (low, high), in the units shown: distance from A in km or mi; heights with the bulge, and
        clearance less requirement, in m or ft. By default each is set by what it shows.

    Returns
    -------
    Figure

    Raises
    ------
    InputError
        If limits are not two numbers that an axis can carry, the lower first.

    Examples
    --------
    >>> figure = profile_figure(run_study(hop, relief=True), distance_limits=(0, 50))  # doctest: +SKIP
    >>> size = Path("hop.pdf").write_bytes(render(figure, ".pdf"))  # doctest: +SKIP
    """
    scale = Scale(feet)
    for name, limits in (("distance", distance_limits), ("height", height_limits), ("surplus", surplus_limits)):
        _check_limits(name, limits)
    reach = (0.0, scale.distance(study.line.distance_m)) if distance_limits is None else distance_limits
    places = study.governing.places
    color = style.FAIL if places[0].surplus_m < 0 else style.PASS
    with style.defaults():
        page = Page()
        top = head(
            page,
            study.verdict.outcome,
            chance_words(study.verdict.chance, study.verdict.minimum_chance),
            sentence=headline(study, scale),
            name=study.hop.name,
            facts=hop_facts(study.hop, study.line.distance_m, scale),
        )
        view = scene(study, scale)
        below = draw_key(page, _LEFT, top + 0.12, _WIDTH, view)
        below = _site_names(page, below + 0.06, study, scale)
        depth = _PROFILE_IN if study.relief is not None else _PROFILE_IN + _GAP_IN + _RELIEF_IN
        axes = page.axes(_LEFT, below, _WIDTH, depth, label="profile", most=(_MOST_ACROSS, 7))
        draw_profile(axes, view, scale, distance_limits=reach, height_limits=height_limits)
        draw_tight_places(axes, places, scale, on_surface=True, color=color)
        below = _numbers(page, below + depth + 0.02, places, scale, reach, color)
        below = _critical(page, below, study, places[0], scale, reach, color)
        strip_top = below + 0.06
        below = _strips(page, strip_top, study, places, scale, reach, surplus_limits, color)
        side = title_block(page, top + 0.12, study, scale)
        return page.finish(foot(page, max(below, side) + 0.1, profile_notes(study, scale)))


_FARTHEST, _SHORTEST = 1e6, 0.01
"""Of the limits of axes, in any unit shown: past these the numbers on a scale no longer tell its steps apart."""


def _check_limits(name: str, limits: Limits | None) -> None:
    if limits is None:
        return
    low, high = limits
    if not (-_FARTHEST <= low < high <= _FARTHEST and high - low >= _SHORTEST):  # not a number is none of these
        raise InputError(
            f"{name}_limits = {low:g}, {high:g}: must be two numbers of {-_FARTHEST:g} to {_FARTHEST:g}, the lower"
            f" first, {_SHORTEST:g} or more apart"
        )


def _site_names(page: Page, top: float, study: Study, scale: Scale) -> float:
    """Write both sites over their ends of the profile."""
    room = _WIDTH / 2 - 0.1
    hop = study.hop
    both = [
        wrap(f"{letter}: {site.name}, antenna {scale.height_text(site.antenna_m)} up", room, style.BODY, bold=True)
        for letter, site in (("A", hop.site_a), ("B", hop.site_b))
    ]
    depth = max(map(len, both))
    for lines, x, align in zip(both, (_LEFT, _LEFT + _WIDTH), ("left", "right"), strict=True):
        page.words(x, top, [""] * (depth - len(lines)) + lines, bold=True, align=align)
    return top + depth * style.BODY * LINE_IN + 0.05


def _numbers(page: Page, top: float, places: tuple[Place, ...], scale: Scale, reach: Limits, color: str) -> float:
    """Write the numbers of the tight places under the profile, moved apart where they stand close."""
    shown = [(i, each) for i, each in enumerate(places) if reach[0] <= scale.distance(each.distance_m) <= reach[1]]
    at = [_LEFT + _WIDTH * (scale.distance(each.distance_m) - reach[0]) / (reach[1] - reach[0]) for _, each in shown]
    for (number, _), x in zip(shown, spread(at, 0.15, _LEFT, _LEFT + _WIDTH), strict=True):
        page.words(
            x,
            top,
            f"{number + 1}",
            bold=number == 0,
            color=color if number == 0 else style.INK,
            align="center",
        )
    return top + style.BODY * LINE_IN


def _critical(page: Page, top: float, study: Study, place: Place, scale: Scale, reach: Limits, color: str) -> float:
    """Label the critical point in words, under it as far as the room allows."""
    words = tightest_words(study, scale)
    x = scale.distance(place.distance_m)
    if not reach[0] <= x <= reach[1]:
        words += " It lies outside the distances drawn."
    lines = wrap(f"1  {words}", _WIDTH, style.BODY, bold=True)
    width = max(width_in(line, style.BODY, bold=True) for line in lines)
    share = min(max((x - reach[0]) / (reach[1] - reach[0]), 0.0), 1.0)
    left = min(max(_LEFT + share * _WIDTH - width / 2, _LEFT), _LEFT + _WIDTH - width)
    page.words(left, top, lines, bold=True, color=color, gid="critical")
    return top + len(lines) * style.BODY * LINE_IN


def _strips(
    page: Page,
    top: float,
    study: Study,
    places: tuple[Place, ...],
    scale: Scale,
    reach: Limits,
    surplus_limits: Limits | None,
    color: str,
) -> float:
    """Draw the surplus strip and the ground from above; returns where the distance axis ends."""
    axes = page.axes(_LEFT, top, _WIDTH, _SURPLUS_IN, label="surplus", most=(_MOST_ACROSS, 4))
    draw_surplus(axes, study, scale, distance_limits=reach, surplus_limits=surplus_limits)
    draw_tight_places(axes, places, scale, on_surface=False, color=color)
    lowest, bottom = axes, top + _SURPLUS_IN
    if study.relief is not None:
        axes.tick_params(labelbottom=False)
        top = bottom + _GAP_IN
        lowest = page.axes(_LEFT, top, _WIDTH, _RELIEF_IN, label="relief", most=(_MOST_ACROSS, 4))
        draw_relief(lowest, study.relief, study.line.distance_m, scale, distance_limits=reach)
        mark_on_relief(lowest, places, scale, color=color)
        bottom = top + _RELIEF_IN
        _north(page, lowest, bottom, study)
    lowest.set_xlabel(f"distance from A, {scale.distance_unit}")
    return bottom + FOOT_IN


def _north(page: Page, axes: Axes, bottom: float, study: Study) -> None:
    """Point north beside the ground seen from above, as its stretched map shows it."""
    low, high = axes.get_ylim()
    across = _RELIEF_IN / abs(high - low)
    left, right = axes.get_xlim()
    dx, dy = north_on_page(study.line.azimuth_a_deg, _WIDTH / (right - left), across)
    x, y, half = _LEFT + _WIDTH + 0.17, bottom - _RELIEF_IN / 2, 0.13
    tip, tail = (x + half * dx, y + half * dy), (x - half * dx, y - half * dy)
    wing = [(tip[0] - 0.09 * dx + side * 0.035 * dy, tip[1] - 0.09 * dy - side * 0.035 * dx) for side in (-1, 1)]
    page.stroke([tail[0], tip[0]], [tail[1], tip[1]], color=style.INK, lw=0.8)
    page.stroke([wing[0][0], tip[0], wing[1][0]], [wing[0][1], tip[1], wing[1][1]], color=style.INK, lw=0.8)
    page.words(x, bottom - 0.14, "N", size=style.SMALL, align="center")
