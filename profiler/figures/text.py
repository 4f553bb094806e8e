"""How wide words are in the font of the figures, and where lines break, so that nothing needs a trial drawing."""

from __future__ import annotations

from functools import lru_cache
from pathlib import Path

import matplotlib
from matplotlib.font_manager import FontProperties, get_font

__all__ = ["fitted", "font", "missing_letters", "width_in", "wrap"]

_SLACK = 1.03
"""Hinting moves letters to whole pixels: a line may come out a little wider than its letters add up to."""


@lru_cache(maxsize=16)
def font(size_pt: float, bold: bool = False) -> FontProperties:
    """Return the font that comes with the drawing library, by file, so that every machine draws the same."""
    return FontProperties(fname=_file(bold), size=size_pt)


@lru_cache(maxsize=2)
def _file(bold: bool) -> Path:
    name = "DejaVuSans-Bold.ttf" if bold else "DejaVuSans.ttf"
    return Path(matplotlib.get_data_path()) / "fonts" / "ttf" / name


@lru_cache(maxsize=4096)
def _advance(letter: str, bold: bool) -> float:
    """Advance of a letter as a share of the size of type."""
    face = get_font(str(_file(bold)))
    face.set_size(100.0, 72.0)
    # a letter that the font lacks has index 0, the box that stands for it
    return float(face.load_glyph(face.get_char_index(ord(letter))).linearHoriAdvance) / 65536.0 / 100.0


@lru_cache(maxsize=8192)
def _ems(words: str, bold: bool) -> float:
    """Width of a text as a share of the size of type."""
    return sum(_advance(letter, bold) for letter in words)


def width_in(words: str, size_pt: float, *, bold: bool = False) -> float:
    """Width of one line, inches.

    Examples
    --------
    >>> 0.5 < width_in("ten points", 10.0) < 0.9
    True
    """
    return _SLACK * _ems(words, bold) * size_pt / 72.0


def wrap(words: str, room_in: float, size_pt: float, *, bold: bool = False, indent: str = "") -> list[str]:
    """Break a text into lines that fit; a word wider than a line is broken where the line ends.

    Examples
    --------
    >>> wrap("one two three", 0.5, 7.0, indent="  ")
    ['one two', '  three']
    """
    room = room_in * 72.0 / (_SLACK * size_pt)
    space = _ems(" ", bold)
    lines: list[str] = []
    line, used = "", 0.0
    for word in words.split():
        width = _ems(word, bold)
        if line.strip() and used + space + width <= room:
            line, used = f"{line} {word}", used + space + width
            continue
        if line.strip():
            lines.append(line)
            line, used = indent, _ems(indent, bold)
        line, used = line + word, used + width
        while used > room and len(line) > len(indent) + 1:
            cut = _longest_prefix(line, room, bold)
            lines.append(line[:cut])
            line = indent + line[cut:]
            used = _ems(line, bold)
    return [*lines, line]


def _longest_prefix(line: str, room: float, bold: bool) -> int:
    """How many letters fit, at least one beyond the indent."""
    start = len(line) - len(line.lstrip()) + 1
    for cut in range(start, len(line) + 1):
        if _ems(line[:cut], bold) > room:
            return max(start, cut - 1)
    return len(line)


def fitted(words: str, room_in: float, sizes_pt: tuple[float, ...], *, bold: bool = False) -> tuple[list[str], float]:
    """Wrap a text at the largest of some sizes that needs no more than one line, or else at the smallest."""
    for size in sizes_pt:
        if width_in(words, size, bold=bold) <= room_in:
            return [words], size
    return wrap(words, room_in, sizes_pt[-1], bold=bold), sizes_pt[-1]


def missing_letters(words: str) -> str:
    """Letters that the font of the figures does not have, each once.

    Examples
    --------
    >>> missing_letters("Łódź ν → ∞")
    ''
    """
    face = get_font(str(_file(False)))
    return "".join(dict.fromkeys(letter for letter in words if letter > " " and not face.get_char_index(ord(letter))))
