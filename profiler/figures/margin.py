"""The margin figure: whether the radio has enough margin, which mechanism takes it, and where the decibels go.

Why these drawings. The decision is whether the fade margin meets the objective and, if not, what to change. Outage
against margin answers the first at a glance (the margin there is, the margin that is needed) and names the mechanism to
fight: a bigger antenna helps against one that falls with the margin, and not against one that is level. The level
diagram answers the second: it holds every line of the budget at its size, so that what can be won shows.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

from profiler.budget import way_name
from profiler.errors import InputError
from profiler.figures import style
from profiler.figures.blocks import columns_at, foot, head, heading, rows, titles
from profiler.figures.captions import hop_facts, link_notes
from profiler.figures.levels import draw_levels, steps_of
from profiler.figures.outage_panel import draw_outage
from profiler.figures.page import LINE_IN, MARGIN_IN, PAGE_WIDTH_IN, Page
from profiler.remarks import db_text, outage_text
from profiler.words import Scale, achieved_text, asked_text, chance_words, limit_text, margin_words

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from profiler.study.result import Study

__all__ = ["margin_figure"]

_LEFT_ROOM = 5.55
_RIGHT = MARGIN_IN + _LEFT_ROOM + 0.95
_RIGHT_ROOM = PAGE_WIDTH_IN - MARGIN_IN - _RIGHT


def margin_figure(study: Study, *, feet: bool = False) -> Figure:
    """Draw the level diagram and the outage of a hop against its objective.

    Parameters
    ----------
    study
        What to draw; it needs a budget, and shows the outage where there is one.
    feet
        Statute miles in place of kilometres.

    Returns
    -------
    Figure

    Raises
    ------
    InputError
        If the hop has no radio, so that there is no budget to draw.

    Examples
    --------
    >>> size = Path("margin.svg").write_bytes(render(margin_figure(study), ".svg"))  # doctest: +SKIP
    """
    if study.budget is None:
        raise InputError(
            f"{study.hop.source}: radio = not given: must be given for the margin figure; give a [radio] or leave the "
            "figure out"
        )
    way, row = study.budget.weaker()
    with style.defaults():
        page = Page()
        top = head(
            page,
            study.verdict.outcome,
            chance_words(study.verdict.chance, study.verdict.minimum_chance),
            sentence=margin_words(study),
            name=study.hop.name,
            facts=hop_facts(study.hop, study.line.distance_m, Scale(feet)),
        )
        left = heading(page, MARGIN_IN, top + 0.14, f"Levels {way_name(way)}{f', mode {row.name}' if row.name else ''}")
        _, left = draw_levels(page, MARGIN_IN, left + style.SMALL * LINE_IN + 0.02, _LEFT_ROOM, steps_of(row))
        left = _targets(page, _modes(page, left + 0.14, study), study)
        right = top
        if study.outage.availability is not None and study.outage.curve is not None:
            right = heading(page, _RIGHT, top + 0.14, "Outage against fade margin")
            _, right = draw_outage(page, _RIGHT, right, _RIGHT_ROOM, study.outage.availability, study.outage.curve)
        return page.finish(foot(page, max(left, right) + 0.12, link_notes(study, Scale(feet))))


def _modes(page: Page, top: float, study: Study) -> float:
    """List every mode in both directions, with its outage in the weaker one."""
    assert study.budget is not None
    outages = {each.mode: each for each in study.outage.modes}
    cells = []
    for number, there in enumerate(study.budget.a_to_b.modes):
        back, margin_db = study.budget.b_to_a.modes[number], study.budget.weaker(number)[1].fade_margin_db
        found = outages.get(there.name)
        met = None if found is None else found.met
        cells.append(
            (
                there.name or "(unnamed)",
                db_text(there.received_dbm, "dBm"),
                db_text(back.received_dbm, "dBm"),
                "–" if there.threshold_dbm is None else db_text(there.threshold_dbm, "dBm"),
                "–" if margin_db is None else db_text(margin_db),
                "–" if found is None else outage_text(found.worst_month_percent),
                "–" if found is None else outage_text(found.year_percent),
                {True: "met", False: "missed", None: "–"}[met],
            )
        )
    top = heading(page, MARGIN_IN, top, "Modes: received level both ways; margin and outage the weaker way")
    columns = columns_at(MARGIN_IN, (0.72, 0.76, 0.76, 0.78, 0.66, 0.86, 0.7, 0.66))
    names = ("mode", "A to B", "B to A", "threshold", "margin", "worst month", "year", "objective")
    return rows(page, titles(page, top, columns, names), columns, cells)


def _targets(page: Page, top: float, study: Study) -> float:
    """List what was asked for, what is reached, and which margin would do."""
    objective = None if study.outage.availability is None else study.outage.availability.objective
    if objective is None:
        return top
    cells = [
        (
            asked_text(each),
            achieved_text(each),
            {True: "met", False: "missed", None: "open"}[each.met],
            "none is sure" if each.required_margin_db is None else db_text(each.required_margin_db),
            limit_text(each.margin_set_by),
        )
        for each in objective.targets
    ]
    top = heading(page, MARGIN_IN, top + 0.14, "Objective")
    columns = columns_at(MARGIN_IN, (1.55, 1.75, 0.5, 0.95, 0.8))
    names = ("asked, at most", "reached", "", "margin needed", "decides")
    return rows(page, titles(page, top, columns, names), columns, cells)
