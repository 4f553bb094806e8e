"""The title block beside the profile: sites, hop, each rule with its verdict, and where the ground comes from."""

from __future__ import annotations

from typing import TYPE_CHECKING

from profiler.figures import style
from profiler.figures.blocks import heading, rows
from profiler.figures.captions import ground_notes, hop_rows, rule_lines, site_rows
from profiler.figures.page import LINE_IN, MARGIN_IN, PAGE_WIDTH_IN, Page
from profiler.figures.place_labels import rule_position
from profiler.figures.strips import rule_look
from profiler.words import Scale

if TYPE_CHECKING:
    from profiler.study.result import Study

__all__ = ["title_block"]

_SIDE = 8.24
_SIDE_ROOM = PAGE_WIDTH_IN - MARGIN_IN - _SIDE


def title_block(page: Page, top: float, study: Study, scale: Scale) -> float:
    """Set the title block beside the drawings: sites, hop, and each rule with its verdict."""
    label = 1.3
    each = (_SIDE_ROOM - label) / 2
    top = heading(page, _SIDE, top, "Sites")
    page.words(_SIDE + label, top, "A", bold=True)
    page.words(_SIDE + label + each, top, "B", bold=True)
    columns = [
        (_SIDE, label - 0.05, style.MUTED),
        (_SIDE + label, each, style.INK),
        (_SIDE + label + each, each, style.INK),
    ]
    top = rows(page, top + style.BODY * LINE_IN, columns, site_rows(study, scale))
    top = heading(page, _SIDE, top + 0.1, "Hop")
    columns = [(_SIDE, label - 0.05, style.MUTED), (_SIDE + label, 2 * each, style.INK)]
    top = rows(page, top, columns, hop_rows(study, scale))
    top = heading(page, _SIDE, top + 0.1, "Rules, each at its own k, the tightest first")
    for result in study.by_tightness:
        color, dashes = rule_look(rule_position(study, result))
        page.stroke(
            [_SIDE, _SIDE + 0.3],
            [top + 0.065] * 2,
            color=color,
            lw=1.8 if result is study.governing else 1.0,
            dashes=dashes or (None, None),
        )
        title, verdict, numbers = rule_lines(result, scale)
        left, room = _SIDE + 0.38, _SIDE_ROOM - 0.38
        top = page.paragraph(left, top, title, room)
        color = style.PASS if result.passes else style.FAIL
        top = page.paragraph(left, top, verdict, room, bold=True, color=color)
        top = page.paragraph(left, top, numbers, room, size=style.SMALL, color=style.MUTED) + 0.05
    top = heading(page, _SIDE, top + 0.05, "Terrain and cover")
    for note in ground_notes(study, scale):
        top = page.paragraph(_SIDE, top, note, _SIDE_ROOM, size=style.SMALL)
    return top
