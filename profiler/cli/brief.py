"""The short answer on one screen: what matters most in 24 lines of 80 columns, and how much was left out."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from profiler.printable import printable

if TYPE_CHECKING:
    from rich.console import Console

__all__ = ["CAUTION", "Part", "show_brief"]

_LINES, _COLUMNS = 24, 80
_MOST_OF_ONE = 4
"""Lines of 80 columns of one part; what is longer is cut and stands whole in the full output."""

_WARNINGS = 3
CAUTION = "A screening result, not a certificate: licensed practice and local codes decide."


@dataclass(frozen=True, slots=True)
class Part:
    """A paragraph of the short answer; what is not ``needed`` gives way where the screen is full."""

    text: str
    style: str = ""
    needed: bool = True


def show_brief(screen: Console, parts: Sequence[Part], warnings: Sequence[str], next_step: str) -> None:
    """Print the parts in their order, the first warnings with a count of the rest, and the next step.

    Parameters
    ----------
    screen
        From `profiler.cli.screen.console`.
    parts
        What was found, in the order in which it is decided.
    warnings
        What to beware of; the first stand on the screen.
    next_step
        What to do now.
    """
    width = min(screen.width, _COLUMNS)
    set_parts = [(part, _lines(screen, part.text, width)) for part in parts if part.text]
    last = [
        (style, _lines(screen, text, width))
        for text, style in (
            (f"Next: {next_step[0].lower()}{next_step[1:]}", "bold"),
            (f"{CAUTION} All the rest: --full.", "dim"),
        )
    ]
    # a narrower terminal needs as many more lines for the same words
    room = _LINES * _COLUMNS // width - sum(len(lines) for _, lines in last)
    room -= sum(len(lines) for part, lines in set_parts if part.needed)
    warned, room = _fitted(screen, warnings, width, room)
    for part, lines in set_parts:
        if not part.needed:
            room -= len(lines)
            if room < 0:
                continue
        _print(screen, lines, part.style)
    for style, lines in (*(("yellow", lines) for lines in warned), *last):
        _print(screen, lines, style)


def _fitted(screen: Console, warnings: Sequence[str], width: int, room: int) -> tuple[list[list[str]], int]:
    """Set as many warnings as there is room for, and one line for the number of those that are left out."""
    found: list[list[str]] = []
    for number, warning in enumerate(warnings[:_WARNINGS]):
        lines = _lines(screen, f"Warning: {warning}", width)
        count_line = number + 1 < len(warnings)
        if found and len(lines) + count_line > room:
            break
        found.append(lines)
        room -= len(lines)
    left = len(warnings) - len(found)
    if left:
        found.append([f"and {left} warning{'s' if left > 1 else ''} more"])
        room -= 1
    return found, room


def _lines(screen: Console, text: str, width: int) -> list[str]:
    """Break a text between words into lines that fit, cut where it would fill the screen."""
    from rich.text import Text

    # what a terminal would act on is escaped before the lines are measured
    lines = [line.plain.rstrip() for line in Text(printable(text)).wrap(screen, width)]
    most = _MOST_OF_ONE * _COLUMNS // width
    if len(lines) > most:
        lines = [*lines[: most - 1], f"{lines[most - 1][: width - 2]} …"]
    return lines


def _print(screen: Console, lines: Sequence[str], style: str) -> None:
    for line in lines:
        screen.print(line, style=style, soft_wrap=True)
