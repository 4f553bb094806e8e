"""Parts of a page that several figures share: the verdict across the top and the notes in columns at the foot."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from profiler.figures import style
from profiler.figures.page import LINE_IN, MARGIN_IN, PAGE_WIDTH_IN, Page
from profiler.figures.text import fitted, width_in, wrap
from profiler.words import outcome_word

if TYPE_CHECKING:
    from profiler.study.reasons import Outcome

__all__ = ["columns_at", "foot", "head", "heading", "rows", "titles"]

_VERDICT_PT = 20.0
_NAME_PT = 10.0
_COLUMNS = 3
_GUTTER_IN = 0.3


def head(page: Page, outcome: Outcome, chance: str, *, sentence: str, name: str, facts: str) -> float:
    """Put the verdict, large, its chance and the hop's name across the top; returns how far down they reach, inches."""
    top, depth = 0.3, 0.62
    word = outcome_word(outcome)
    width = max(width_in(word, _VERDICT_PT, bold=True), width_in(chance, style.BODY, bold=True)) + 0.3
    page.box(MARGIN_IN, top, width, depth, fc=style.OUTCOMES[outcome], ec=style.OUTCOMES[outcome])
    for words, down, size, gid in ((word, 0.06, _VERDICT_PT, "verdict"), (chance, 0.42, style.BODY, "chance")):
        page.words(
            MARGIN_IN + width / 2, top + down, words, size=size, bold=True, color="white", align="center", gid=gid
        )
    left = MARGIN_IN + width + 0.18
    lines, size = fitted(sentence, PAGE_WIDTH_IN - MARGIN_IN - left, (14.0, 13.0, 12.0, 11.0), bold=True)
    line_in = size * LINE_IN
    page.words(left, top + max(0.0, (depth - len(lines) * line_in) / 2), lines, size=size, bold=True, gid="sentence")
    below = top + max(depth, len(lines) * line_in) + 0.08
    facts_in = width_in(facts, _NAME_PT) + 0.3
    names = wrap(name, PAGE_WIDTH_IN - 2 * MARGIN_IN - facts_in, _NAME_PT, bold=True)
    page.words(MARGIN_IN, below, names, size=_NAME_PT, bold=True, gid="name")
    page.words(PAGE_WIDTH_IN - MARGIN_IN, below, facts, size=_NAME_PT, color=style.MUTED, align="right")
    below += len(names) * _NAME_PT * LINE_IN + 0.05
    page.stroke([MARGIN_IN, PAGE_WIDTH_IN - MARGIN_IN], [below, below], color=style.INK, lw=0.8)
    return below


def heading(page: Page, left: float, top: float, words: str) -> float:
    """Write the heading of a block; returns where its text begins."""
    page.words(left, top, words, size=style.HEAD, bold=True)
    return top + style.HEAD * LINE_IN + 0.03


def rows(page: Page, top: float, columns: list[tuple[float, float, str]], cells: Sequence[Sequence[str]]) -> float:
    """Set a table: columns are (left, room, color), a cell that is too long for its room takes more lines.

    Returns where the next thing can stand.
    """
    texts: list[list[str]] = [[] for _ in columns]
    for row in cells:
        wrapped = [wrap(cell, room, style.BODY) for (_, room, _), cell in zip(columns, row, strict=True)]
        depth = max(map(len, wrapped))
        for column, lines in zip(texts, wrapped, strict=True):
            column.extend(lines + [""] * (depth - len(lines)))
    for (left, _, color), lines in zip(columns, texts, strict=True):
        page.words(left, top, lines, color=color)
    return top + len(texts[0]) * style.BODY * LINE_IN


def columns_at(left: float, widths: tuple[float, ...]) -> list[tuple[float, float, str]]:
    """Columns of a table from its left edge and their widths, a little room left between them."""
    columns = []
    for width in widths:
        columns.append((left, width - 0.06, style.INK))
        left += width
    return columns


def titles(page: Page, top: float, columns: list[tuple[float, float, str]], words: tuple[str, ...]) -> float:
    """Write the titles of a table's columns; returns where its rows begin."""
    for (left, _, _), title in zip(columns, words, strict=True):
        if title:
            page.words(left, top, title, bold=True)
    return top + style.BODY * LINE_IN


Line = tuple[str, bool]
"""A line of the notes and whether it is bold."""


def foot(page: Page, top: float, blocks: list[tuple[str, list[str]]]) -> float:
    """Set the notes in columns at the foot of the page; returns how far down they reach."""
    room = (PAGE_WIDTH_IN - 2 * MARGIN_IN - (_COLUMNS - 1) * _GUTTER_IN) / _COLUMNS
    pieces: list[list[Line]] = []
    for title, paragraphs in blocks:
        for number, paragraph in enumerate(paragraphs):
            lines = [(line, False) for line in wrap(f"– {paragraph}", room, style.SMALL, indent="   ")]
            pieces.append([("", False), (title, True), *lines] if number == 0 else lines)
    page.stroke([MARGIN_IN, PAGE_WIDTH_IN - MARGIN_IN], [top, top], color=style.GRID, lw=0.8)
    columns = _columns(pieces)
    for number, column in enumerate(columns):
        left = MARGIN_IN + number * (room + _GUTTER_IN)
        for bold in (False, True):
            shown = [line if is_bold == bold else "" for line, is_bold in column]
            if any(shown):
                page.words(left, top + 0.06, shown, size=style.SMALL, bold=bold)
    return top + 0.06 + max(map(len, columns)) * style.SMALL * LINE_IN


def _columns(pieces: list[list[Line]]) -> list[list[Line]]:
    """Share paragraphs among columns of the least depth that holds them all; none is split, no heading left alone."""
    depth = max(map(len, pieces))
    while True:
        columns: list[list[Line]] = [[]]
        for piece in pieces:
            if len(columns[-1]) + len(piece) > depth and columns[-1]:
                columns.append([])
            # a blank line parts a heading from what stands above it, and nothing stands above it in a new column
            columns[-1] += piece[1:] if not columns[-1] and not piece[0][0] else piece
        if len(columns) <= _COLUMNS:
            return columns
        depth += 1
