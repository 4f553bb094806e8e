"""The terminal: one console, text that breaks between words, tables that fit their width, the reader's units."""

from __future__ import annotations

import os
from textwrap import TextWrapper
from typing import TYPE_CHECKING, Literal

from profiler.cli.safe_screen import safe_hook
from profiler.printable import printable

if TYPE_CHECKING:
    from rich.console import Console
    from rich.table import Table

__all__ = ["compact_table", "console", "say", "show_notes", "show_table"]

_FILE_WIDTH = 110
_NARROWEST, _WIDEST = 20, 1000
"""What COLUMNS says beyond these is no width of a terminal."""

_GAP = 2
"""Columns of space between two columns of a table."""


def console(*, color: bool) -> Console:
    """Open the terminal; its width is that of the terminal, and a file's is fixed.

    Without color, by the option or by NO_COLOR (https://no-color.org), no escape of any kind is sent.
    """
    from rich.console import Console

    system: Literal["auto"] | None = "auto" if color and not os.environ.get("NO_COLOR") else None
    # names and labels are text: no markup and no emoji codes in them
    screen = Console(color_system=system, highlight=False, markup=False, emoji=False)
    screen.width = min(max(screen.width, _NARROWEST), _WIDEST) if screen.is_terminal else _FILE_WIDTH
    screen.push_render_hook(safe_hook())
    return screen


def say(screen: Console, text: str, style: str = "", *, hang: int = 0) -> None:
    """Print text, broken between words at a terminal and not at all in a file.

    Parameters
    ----------
    screen
        From `console`.
    text
        One or more lines.
    style
        Of rich.
    hang
        How far every line after the first is put in, columns.
    """
    if screen.is_terminal:
        wrapper = TextWrapper(
            screen.width, subsequent_indent=" " * hang, break_long_words=False, break_on_hyphens=False
        )
        text = "\n".join(wrapper.fill(line) for line in text.split("\n"))
    screen.print(text, style=style, soft_wrap=True)


def show_notes(screen: Console, title: str, notes: tuple[str, ...], style: str = "") -> None:
    """Print a titled list, or nothing if it is empty."""
    if notes:
        say(screen, f"\n{title}", "bold " + style)
        for note in notes:
            say(screen, f"  - {printable(note)}", style, hang=4)  # a line feed in it is that of some name


def compact_table(*headers: str, words: tuple[str, ...] = (), wraps: str | None = None) -> Table:
    """Make a table with no frame but a line under its header, for `show_table`.

    Parameters
    ----------
    headers
        Of the columns; a line feed makes one of two lines.
    words
        Headers of columns that are set to the left, as the first always is.
    wraps
        Header of the one column whose text may be broken between words.
    """
    from rich import box
    from rich.table import Table

    table = Table(box=box.SIMPLE_HEAD, pad_edge=False, show_edge=False, collapse_padding=True)
    for number, header in enumerate(headers):
        left = number == 0 or header in words or header == wraps
        table.add_column(header, justify="left" if left else "right", no_wrap=header != wraps, overflow="fold")
    return table


def show_table(screen: Console, table: Table) -> None:
    """Print a table, or where it does not fit between the edges, a paragraph for each of its rows."""
    if _least_width(table) <= screen.width:
        screen.print(table)
        return
    title, *names = (" ".join(str(column.header).split()) for column in table.columns)
    say(screen, title, "bold")
    for row, cells in zip(table.rows, zip(*(column.cells for column in table.columns), strict=True), strict=True):
        first, *others = (str(cell).replace("\n", ", ") for cell in cells)
        style = str(row.style or "")
        filled = (f"{name}: {other}" for name, other in zip(names, others, strict=True) if other)
        say(screen, f"- {first}", style, hang=2)
        say(screen, "  " + "; ".join(filled), style, hang=2)


def _least_width(table: Table) -> int:
    """Width under which a word or a number of the table would have to be split, columns."""
    from rich.cells import cell_len

    def least(cell: object, *, whole: bool) -> int:
        parts = str(cell).split("\n") if whole else str(cell).split()
        return max((cell_len(part) for part in parts), default=0)

    widths = [
        max(least(cell, whole=column.no_wrap) for cell in (column.header, *column.cells)) for column in table.columns
    ]
    return sum(widths) + _GAP * (len(widths) - 1)
