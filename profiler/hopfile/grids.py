"""Read a position on a grid from text: UTM with its zone and letter, or MGRS."""

from __future__ import annotations

import re
from typing import Final, NamedTuple

from profiler.errors import InputError

__all__ = ["GridPlace", "parse_grid"]

_BANDS: Final = "CDEFGHJKLMNPQRSTUVWX"
"""Bands of 8° from 80° south (X: 12°), without I and O."""
_UTM: Final = re.compile(
    r"(?:UTM\s*)?(?:zone\s*)?(\d{1,2})\s*(north|south|[A-Z])[\s,;]+"
    r"(?:E\s*[:=]?\s*)?(\d{5,6}(?:\.\d+)?)\s*(?:m\s*)?E?[\s,;]+(?:N\s*[:=]?\s*)?(\d{1,8}(?:\.\d+)?)\s*(?:m\s*)?N?",
    re.IGNORECASE | re.ASCII,
)
_MGRS: Final = re.compile(
    r"(?:MGRS\s*)?(\d{1,2})\s*([C-HJ-NP-X])\s*([A-HJ-NP-Z])([A-HJ-NP-V])\s*(\d*)\s*(\d*)",
    re.IGNORECASE | re.ASCII,
)
_COLUMNS: Final = ("STUVWXYZ", "ABCDEFGH", "JKLMNPQR")
"""Letters of the 100 km columns from 100 km east on, for zones 3, 6, ...; 1, 4, ...; 2, 5, ..."""
_ROWS: Final = "ABCDEFGHJKLMNPQRSTUV"
"""Letters of the 100 km rows, from the equator in odd zones and from five rows lower in even ones."""
_METRES_PER_DEGREE: Final = 110_950.0
"""Northing of a degree of latitude in UTM on the middle of a zone, to half a percent."""
_FALSE_NORTHING_M: Final = 10_000_000.0
_COARSEST_M: Final = 10.0


class GridPlace(NamedTuple):
    """A place of a UTM grid, in metres; ``square_m`` is the side of the MGRS square of which it is the middle."""

    zone: int
    north: bool
    easting_m: float
    northing_m: float
    square_m: float = 0.0


def parse_grid(text: str) -> GridPlace | None:
    """Read UTM or MGRS text.

    Parameters
    ----------
    text
        ``13T 478000 4420000`` (the letter is the band of latitude), ``13 north 478000 4420000``, or MGRS as
        ``13T DE 78000 20000`` or ``13TDE7800020000``, to 10 m or finer.

    Returns
    -------
    GridPlace or None
        None where the text is neither.

    Raises
    ------
    InputError
        For a zone, a letter or a square that there is not, a northing that does not lie in its band, or the letter S
        where it may be the band (32° to 40° north) as well as the southern hemisphere.

    Examples
    --------
    >>> parse_grid("13T 478000 4420000")
    GridPlace(zone=13, north=True, easting_m=478000.0, northing_m=4420000.0, square_m=0.0)
    >>> parse_grid("13TDE7800020000")
    GridPlace(zone=13, north=True, easting_m=478000.5, northing_m=4420000.5, square_m=1.0)
    >>> parse_grid("40.1, -105.2") is None
    True

    Notes
    -----
    Source: NGA.STND.0037, Universal Grids and Grid Reference Systems, 2014 (from memory); the tests hold it against
    PROJ and an implementation of MGRS that is not this project's.
    """
    if utm := _UTM.fullmatch(text.strip()):
        return _utm(text, int(utm[1]), utm[2].upper(), float(utm[3]), float(utm[4]))
    if mgrs := _MGRS.fullmatch(text.strip()):
        digits, more = mgrs[5], mgrs[6]
        if not more:
            digits, more = digits[: len(digits) // 2], digits[len(digits) // 2 :]
        return _mgrs(text, int(mgrs[1]), mgrs[2].upper(), mgrs[3].upper() + mgrs[4].upper(), (digits, more))
    return None


def _wrong(text: str, allowed: str, remedy: str = "") -> InputError:
    return InputError(field="position", value=" ".join(text.split()), allowed=allowed, remedy=remedy)


def _utm(text: str, zone: int, letter: str, easting_m: float, northing_m: float) -> GridPlace:
    """Place a UTM pair, by its band or its hemisphere."""
    _check_zone(text, zone)
    if letter in ("NORTH", "SOUTH"):
        return GridPlace(zone, letter == "NORTH", easting_m, northing_m)
    if letter not in _BANDS:
        raise _wrong(text, f"UTM with a band of latitude out of {_BANDS}, or north or south, behind the zone")
    in_band = _in_band(northing_m, letter)
    if letter == "S" and in_band:
        other = f"or {zone} south for the southern hemisphere"
        raise _wrong(text, f"UTM without doubt: write {zone} north for band S (32° to 40° north)", other)
    if letter == "S" or (letter == "N" and not in_band):  # no band S or N has it: the letter is the hemisphere
        return GridPlace(zone, letter == "N", easting_m, northing_m)
    if not in_band:
        raise _wrong(text, f"UTM with a northing that lies in band {letter}", "or write north or south behind the zone")
    return GridPlace(zone, letter >= "N", easting_m, northing_m)


def _check_zone(text: str, zone: int) -> None:
    if not 1 <= zone <= 60:
        raise _wrong(text, "on a UTM grid of zone 1 to 60")


def _in_band(northing_m: float, band: str) -> bool:
    """Whether a northing lies in a band of latitude, a third of a degree more at its edges away from mid-zone."""
    south = -80.0 + 8.0 * _BANDS.index(band)
    north = 84.0 if band == "X" else south + 8.0
    latitude = (northing_m - (0.0 if band >= "N" else _FALSE_NORTHING_M)) / _METRES_PER_DEGREE
    return south - 0.7 <= latitude <= north + 0.7


def _mgrs(text: str, zone: int, band: str, square: str, digits: tuple[str, str]) -> GridPlace:
    """Place the middle of an MGRS square."""
    _check_zone(text, zone)
    size_m = 10.0 ** (5 - len(digits[0]))
    if len(digits[0]) != len(digits[1]) or size_m > _COARSEST_M or size_m < 1.0:
        raise _wrong(text, "MGRS to 10 m or 1 m: four or five digits of easting and as many of northing")
    columns = _COLUMNS[zone % 3]
    if square[0] not in columns:
        raise _wrong(text, f"MGRS with a column of zone {zone}, one of {columns}")
    easting_m = 100_000.0 * (columns.index(square[0]) + 1) + size_m * int(digits[0]) + size_m / 2
    row = (_ROWS.index(square[1]) - (5 if zone % 2 == 0 else 0)) % len(_ROWS)
    inside_m = 100_000.0 * row + size_m * int(digits[1]) + size_m / 2
    found = [inside_m + 2e6 * turn for turn in range(5) if _in_band(inside_m + 2e6 * turn, band)]
    if not found:
        raise _wrong(text, f"MGRS with a row that lies in band {band}")
    return GridPlace(zone, band >= "N", easting_m, found[0], size_m)
