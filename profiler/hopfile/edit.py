"""Write chosen antenna heights back into the text of a hop file, leaving comments and layout as they are."""

from __future__ import annotations

import re
from copy import deepcopy
from typing import Any

from profiler.errors import InputError
from profiler.hopfile.reader import parse_tables
from profiler.models.key_units import LENGTHS_M

__all__ = ["with_antennas"]

_NUMBER = r"[-+]?[0-9][0-9_]*(?:\.[0-9_]+)?(?:[eE][-+]?[0-9_]+)?"
_KEY = r"""(?:antenna_(?P<unit>m|ft|km|mi)|["']antenna_(?P<quoted>m|ft|km|mi)["'])"""
_HEADER = re.compile(r"""^[ \t]*\[+[ \t]*["']?(?P<name>[^\]"']*?)["']?[ \t]*\]""", re.MULTILINE)


def with_antennas(text: str, antenna_a_m: float, antenna_b_m: float) -> str:
    r"""Copy of a hop file's text with other antenna heights.

    Each height is written in the unit of the key that is there, to a millimetre or a thousandth of a foot; nothing
    else changes.

    Parameters
    ----------
    text
        A hop file with an antenna height in ``[site_a]`` and in ``[site_b]``.
    antenna_a_m, antenna_b_m
        Heights of the antenna centres above ground, more than 0 and under 2000 m.

    Returns
    -------
    str
        The new text. It has been read again and compared: it says the same but for the two heights.

    Raises
    ------
    InputError
        If a height is out of range, the text is not TOML, or a height stands where it cannot be replaced safely.

    Examples
    --------
    >>> print(with_antennas("[site_a]\nantenna_ft = 90  # top\n[site_b]\nantenna_m=25", 30.48, 31.5))
    [site_a]
    antenna_ft = 100  # top
    [site_b]
    antenna_m=31.5
    """
    mark = text[:1] if text.startswith("\ufeff") else ""
    text = text.removeprefix(mark)
    before = parse_tables(text, "hop file")
    for site, height_m in (("site_a", antenna_a_m), ("site_b", antenna_b_m)):
        if not 0 < height_m < 2000:
            raise InputError(f"{site}.antenna_m = {height_m}: must be more than 0 and under 2000 m")
        text = _replaced(text, site, height_m)
    _compare(before, parse_tables(text, "hop file"), {"site_a": antenna_a_m, "site_b": antenna_b_m})
    return mark + text


def _replaced(text: str, site: str, height_m: float) -> str:
    """Replace the number behind the antenna key of one site: in its table, in a dotted key or in an inline table."""
    headers = list(_HEADER.finditer(text))
    top, *ends = [header.start() for header in headers] + [len(text)]
    spans = [(h.end(), end) for h, end in zip(headers, ends, strict=True) if h["name"].strip() == site]
    leads = [(_KEY, start, end) for start, end in spans]
    leads += [(rf"{site}[ \t]*\.[ \t]*{_KEY}", 0, top), (rf"{site}[ \t]*=[ \t]*\{{[^\n]*?\b{_KEY}", 0, top)]
    for lead, start, end in leads:
        match = re.compile(rf"^[ \t]*{lead}[ \t]*=[ \t]*(?P<number>{_NUMBER})", re.MULTILINE).search(text[:end], start)
        if match:
            unit_m = LENGTHS_M[match["unit"] or match["quoted"]]
            value = round(height_m / unit_m, 3 if unit_m <= 1.0 else 6)
            return f"{text[: match.start('number')]}{value:.10g}{text[match.end('number') :]}"
    raise _by_hand(site, height_m)


def _compare(before: dict[str, Any], after: dict[str, Any], heights_m: dict[str, float]) -> None:
    """Stop unless the new text says the wanted heights and otherwise what the old one said."""
    before, after = deepcopy(before), deepcopy(after)
    for site, height_m in heights_m.items():
        for unit, unit_m in LENGTHS_M.items():
            before[site].pop(f"antenna_{unit}", None)
            found = after[site].pop(f"antenna_{unit}", None)
            if found is not None and abs(found * unit_m - height_m) > 1.1e-3:
                raise _by_hand(site, height_m)
    if before != after:
        raise _by_hand("site_a and site_b", *heights_m.values())


def _by_hand(site: str, *heights_m: float) -> InputError:
    heights = " and ".join(f"{height_m:g} m" for height_m in heights_m)
    return InputError(
        f"{site}: antenna_m (or antenna_ft): must stand on a line of its own under its [table] to be "
        f"replaced; write {heights} there by hand"
    )
