"""Text from files and names, made safe to print: no cursor moves, no line begins, no writing turns around."""

from __future__ import annotations

import re

__all__ = ["printable"]

_HARMLESS = frozenset(
    "\u200c\u200d"  # joiners: parts of words in Persian and in the scripts of India, though they show as nothing
    "\u00a0\u2000\u2001\u2002\u2003\u2004\u2005\u2006\u2007\u2008\u2009\u200a\u202f\u205f\u3000"  # spaces of some width
)


def printable(text: str) -> str:
    r"""Write every character that does not stand for itself as the escape that Python and TOML have for it.

    These are controls of either set (C0, C1), the marks that turn the direction of writing, separators of lines and
    paragraphs, the byte-order mark and other invisible formats, halves of surrogate pairs (a file name that is no
    UTF-8), private and unassigned characters and non-characters.

    Parameters
    ----------
    text
        Anything.

    Returns
    -------
    str
        The same text where it had none of these.

    Examples
    --------
    >>> print(printable("Łódź → \x1b[2Ja\nb \u202e \ufeff \udcff"))
    Łódź → \x1b[2Ja\nb \u202e \ufeff \udcff
    """
    return re.sub(r"[^ -~]", _written, text)


def _written(found: re.Match[str]) -> str:
    letter = found[0]
    return letter if letter.isprintable() or letter in _HARMLESS else letter.encode("unicode_escape").decode("ascii")
