"""How wide words are in the font of the figures, and where lines break, so that nothing needs a trial drawing."""

from __future__ import annotations

from functools import cache

import matplotlib
from matplotlib.font_manager import FontProperties, get_font
from matplotlib.ft2font import FT2Font, LoadFlags

__all__ = ["fitted", "font", "missing_letters", "width_in", "wrap"]


@cache
def font(size_pt: float, bold: bool = False) -> FontProperties:
    """Return the font that comes with the drawing library, by file: no search among those of the machine."""
    return FontProperties(fname=_file(bold), size=size_pt)


def _file(bold: bool) -> str:
    return f"{matplotlib.get_data_path()}/fonts/ttf/DejaVuSans{'-Bold' if bold else ''}.ttf"


def _face(bold: bool = False) -> FT2Font:
    return get_font(_file(bold))


@cache
def _advance(letter: str, bold: bool) -> float:
    """Advance of a letter as a share of the size of type; that of an empty box for one that the font lacks."""
    face = _face(bold)
    face.set_size(100.0, 72.0)
    glyph = face.load_glyph(face.get_char_index(ord(letter)), flags=LoadFlags.NO_HINTING)
    return float(glyph.linearHoriAdvance) / 65536.0 / 100.0


def width_in(words: str, size_pt: float, *, bold: bool = False) -> float:
    """Width of one line, inches.

    The sum over the letters leaves out kerning, which only draws them closer (up to 1.5 % of a line). Laying out every
    word with the font library instead takes eighty times as long, some 50 ms a page.

    Examples
    --------
    >>> 0.5 < width_in("ten points", 10.0) < 0.9
    True
    """
    return sum(_advance(letter, bold) for letter in words) * size_pt / 72.0


def wrap(words: str, room_in: float, size_pt: float, *, bold: bool = False, indent: str = "") -> list[str]:
    """Break a text into lines that fit; a word wider than a line is broken where the line ends.

    Examples
    --------
    >>> wrap("one two three", 0.5, 7.0, indent="  ")
    ['one two', '  three']
    """
    lines: list[str] = []
    line = ""
    for word in words.split():
        longer = f"{line} {word}" if line else word
        if line and width_in(longer, size_pt, bold=bold) > room_in:
            lines.append(line)
            longer = indent + word
        line = longer
        while width_in(line, size_pt, bold=bold) > room_in and len(line) > len(indent) + 1:
            cuts = range(len(line) - 1, len(indent) + 1, -1)
            cut = next((cut for cut in cuts if width_in(line[:cut], size_pt, bold=bold) <= room_in), len(indent) + 1)
            lines.append(line[:cut])
            line = indent + line[cut:]
    return [*lines, line]


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
    face = _face()
    return "".join(dict.fromkeys(letter for letter in words if letter > " " and not face.get_char_index(ord(letter))))
