"""Read a position from text as people write it: degrees, minutes and seconds in any dress, or packed digits.

The text is cut into tokens, and the tokens into two angles in every way that makes sense. Exactly one way must remain;
otherwise the text is ambiguous, and that is an error: nothing is guessed.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from typing import Final, NamedTuple

from profiler.errors import InputError

__all__ = ["parse_position"]

_PLAIN: Final = str.maketrans(
    {
        **dict.fromkeys("°º˚∘", "°"),
        **dict.fromkeys("′’‘´ʹ`", "'"),
        **dict.fromkeys("″“”ʺ", '"'),
        **dict.fromkeys("−‐‑–—", "-"),
        **dict.fromkeys("()[]", " "),
        **dict.fromkeys(";/", ","),
    }
)
_WORDS: Final = {
    **dict.fromkeys(("n", "north", "nord", "norte"), ("letter", "N")),
    **dict.fromkeys(("south", "süd", "sud", "sur", "sul"), ("letter", "S")),
    **dict.fromkeys(("e", "east", "ost", "est", "este"), ("letter", "E")),
    **dict.fromkeys(("w", "west", "ouest", "ovest", "oeste"), ("letter", "W")),
    **dict.fromkeys(("d", "deg", "degs", "degree", "degrees"), ("mark", "°")),
    **dict.fromkeys(("m", "min", "mins", "minute", "minutes"), ("mark", "'")),
    **dict.fromkeys(("sec", "secs", "second", "seconds"), ("mark", '"')),
    **dict.fromkeys(("lat", "latitude"), ("label", "lat")),
    **dict.fromkeys(("lon", "lng", "long", "longitude"), ("label", "lon")),
}
_TOKEN: Final = re.compile(r"""\s*(?:(\d+(?:\.\d*)?|\.\d+)|([^\W\d_]+)|(''|[°'"])|([-+:=,]))""")
_DECIMAL_COMMA: Final = re.compile(r"(?<=\d),(?=\d)")
_SECONDS_BEFORE_LETTER: Final = re.compile(r"(?<=\d)\s?s(?=[NSEW]\b)", re.IGNORECASE)
"""The s of 46sN, with no blank between."""
_MARKS: Final = ("°", "'", '"')
_ISO_6709: Final = re.compile(r"([-+])((?:\d{2}){1,3}(?:\.\d+)?)([-+])(\d(?:\d{2}){1,3}(?:\.\d+)?)/?")
_LIMITS: Final = {"lat": 90, "lon": 180}
_NAMES: Final = {"lat": "latitude", "lon": "longitude"}
_WAYS: Final = "write latitude first, as 40.4462, -79.9822 or 40°26'46.3\"N 79°58'56.1\"W"


class _UnreadableError(Exception):
    """Why a text is no position, worded to follow "must be"."""


class _Token(NamedTuple):
    """``kind`` is number, letter (N E S W), mark (° ' "), label (lat, lon), sign (- +), joint (: of 40:26) or comma."""

    kind: str
    text: str
    raw: str = ""


@dataclass(frozen=True, slots=True)
class _Angle:
    """One angle as written; the numbers stay text, because the count of their digits matters."""

    numbers: tuple[str, ...]
    marked: bool
    sign: str
    letter: str
    label: str

    def __str__(self) -> str:
        return self.sign + "".join(a + b for a, b in zip(self.numbers, _MARKS, strict=False)) + self.letter


def parse_position(text: str) -> tuple[float, float]:
    """Read a latitude and a longitude from text.

    Decimal degrees, degrees and decimal minutes, or degrees, minutes and seconds, with the usual marks (° ' " and
    their typographic kin), words (``deg``, ``min``, ``north``), colons, hyphens or blanks between them; letters N, S,
    E, W before or after; signs instead of letters; packed digits with letters (``402646.3N 0795856.1W``) and ISO 6709
    (``+40.4462-079.9822/``). Decimals may follow a comma (``40,4462 N 79,9822 W``) where letters, a semicolon or a
    slash say what belongs together.

    Parameters
    ----------
    text
        Both angles. Without letters or the words lat and lon, the latitude comes first.

    Returns
    -------
    latitude, longitude
        Degrees, north and east positive.

    Raises
    ------
    InputError
        If the text cannot be read, can be read in more than one way, has minutes or seconds of 60 or more, both a sign
        and a letter, or an angle off the globe.

    Examples
    --------
    >>> parse_position("40.4462, -79.9822")
    (40.4462, -79.9822)
    >>> latitude, longitude = parse_position("W 079-58-56.1  N 40-26-46.3")
    >>> round(latitude, 6), round(longitude, 6)
    (40.446194, -79.98225)
    >>> parse_position("40 26 N 79")
    Traceback (most recent call last):
    profiler.errors.InputError: position = '40 26 N 79': must be with letters on both angles or on neither

    Notes
    -----
    Letters and layouts after common practice; packed digits as in aeronautical publications (ICAO Annex 15) and ISO
    6709:2008 annex H (both from memory).
    """
    try:
        iso = _ISO_6709.fullmatch(text.strip())
        if iso:
            return _both_degrees(_iso_angle(iso[1], iso[2], "lat"), _iso_angle(iso[3], iso[4], "lon"))
        return _both_degrees(*_only_pair(text))
    except _UnreadableError as problem:
        raise InputError(field="position", value=" ".join(text.split()), allowed=str(problem)) from None


def _iso_angle(sign: str, digits: str, axis: str) -> _Angle:
    return _Angle(_unpack(digits, axis) or (digits,), False, sign, "", axis)


def _only_pair(text: str) -> tuple[_Angle, _Angle]:
    """Find the one way to read the text as two angles, with commas between them or before decimals."""
    text = _SECONDS_BEFORE_LETTER.sub('"', text)
    tokens = _tokens(text.translate(_PLAIN).strip())
    found = _pairs(tokens)
    decimal = _DECIMAL_COMMA.sub(".", text)
    if decimal != text:
        parted = ";" in text or "/" in text
        found += [
            pair for pair in _pairs(_tokens(decimal.translate(_PLAIN).strip())) if parted or all(a.letter for a in pair)
        ]
    if not found and [token.kind for token in tokens].count("comma") > 1:
        raise _UnreadableError(
            "with one comma, between latitude and longitude, and decimals after a point; or with letters N, S, E, W"
        )
    if not found:
        raise _UnreadableError(f"a latitude and a longitude; {_WAYS}")
    both_or_neither = [pair for pair in found if bool(pair[0].letter) == bool(pair[1].letter)]
    if not both_or_neither:
        raise _UnreadableError("with letters on both angles or on neither")
    if len(both_or_neither) > 1:
        ways = " or ".join(f"{first}, {second}" for first, second in both_or_neither)
        raise _UnreadableError(f"readable in one way, not as {ways}; put a comma between the two, or use letters")
    return both_or_neither[0]


def _tokens(text: str) -> list[_Token]:
    """Cut the text into tokens."""
    tokens: list[_Token] = []
    at = 0
    while at < len(text):
        match = _TOKEN.match(text, at)
        if match is None:
            raise _UnreadableError(f"a position, and {text[at:].strip()[:1]!r} has no meaning in one; {_WAYS}")
        number, word, mark, sign = match.groups()
        blank_before, at = match[0][0].isspace(), match.end()
        if number:
            tokens.append(_Token("number", number))
        elif word:
            tokens.append(_word(word, tokens))
        elif mark:
            tokens.append(_Token("mark", '"' if mark == "''" else mark))
        elif not (sign in ":=" and tokens and tokens[-1].kind == "label"):  # the colon of "lat: 40" says nothing
            tokens.append(_sign(sign, tokens, blank_before, text[at : at + 1].isspace()))
    return tokens


def _word(word: str, tokens: list[_Token]) -> _Token:
    """Translate a word; a lone s is seconds after 26m46 (in the same case), else south."""
    if word in ("s", "S"):
        after_minutes = len(tokens) > 1 and tokens[-1].kind == "number" and tokens[-2].text == "'"
        seconds = after_minutes and tokens[-2].raw != "" and tokens[-2].raw[0].isupper() == word.isupper()
        return _Token("mark", '"', word) if seconds else _Token("letter", "S", word)
    if word in ("o", "O"):
        raise _UnreadableError(
            f"with E or W, not {word!r}: in some languages that is the west (Ouest, Ovest, Oeste), in others the east "
            "(Ost); write degrees as ° or deg"
        )
    if word.lower() not in _WORDS:
        raise _UnreadableError(f"a position, and {word!r} has no meaning in one; {_WAYS}")
    return _Token(*_WORDS[word.lower()], word)


def _sign(sign: str, tokens: list[_Token], blank_before: bool, blank_after: bool) -> _Token:
    """Tell the hyphen of 40-26-46 from the minus of -79."""
    if sign in ",:=":
        return _Token("comma" if sign == "," else "joint", sign)
    if sign == "-" and tokens and tokens[-1].kind in ("number", "mark"):
        if blank_before and blank_after:
            raise _UnreadableError("without a hyphen between blanks: it may join or be a minus; use letters N, S, E, W")
        if not blank_before:
            return _Token("joint", sign)
    return _Token("sign", sign)


def _pairs(tokens: list[_Token]) -> list[tuple[_Angle, _Angle]]:
    """Find every way to cut the tokens into two angles, at the comma where there is one."""
    kinds = [token.kind for token in tokens]
    if kinds.count("comma") > 1:
        return []
    if "comma" in kinds:
        middle = kinds.index("comma")
        cuts = [(tokens[:middle], tokens[middle + 1 :])]
    else:
        cuts = [(tokens[:cut], tokens[cut:]) for cut in range(1, len(tokens))]
    both = ((_angle(one), _angle(other)) for one, other in cuts)
    return [(first, second) for first, second in both if first and second]


def _angle(tokens: list[_Token]) -> _Angle | None:
    """Read tokens as [lat] [N] [-] number [°] [:] number ['] [:] number ["] [N]; None where they are something else."""
    rest = list(tokens)

    def take(kind: str) -> str:
        return rest.pop(0).text if rest and rest[0].kind == kind else ""

    label, before, sign = take("label"), take("letter"), take("sign")
    numbers: list[str] = []
    marks: list[str] = []
    while number := take("number"):
        numbers.append(number)
        marks.append(take("mark"))
        if take("joint") and not (rest and rest[0].kind == "number"):
            return None
    after = take("letter")
    whole = all(part.isdigit() for part in numbers[:-1]) and all(len(part) <= 2 for part in numbers[1:-1])
    in_order = all(mark in ("", _MARKS[index]) for index, mark in enumerate(marks[:3]))
    if rest or not 1 <= len(numbers) <= 3 or (before and after) or not whole or not in_order:
        return None
    return _Angle(tuple(numbers), any(marks), sign, before or after, label)


def _both_degrees(first: _Angle, second: _Angle) -> tuple[float, float]:
    """Latitude and longitude of two angles in whichever order."""
    axes = [_axis(first), _axis(second)]
    if axes == ["", ""]:
        axes = ["lat", "lon"]
    axes = [axis or ("lon" if axes[1 - index] == "lat" else "lat") for index, axis in enumerate(axes)]
    if axes[0] == axes[1]:
        raise _UnreadableError(f"a latitude and a longitude, not two {_NAMES[axes[0]]}s")
    _require_not_swapped(first, second, axes)
    by_axis = {axis: _degrees(angle, axis) for axis, angle in zip(axes, (first, second), strict=True)}
    return by_axis["lat"], by_axis["lon"]


def _size(numbers: tuple[str, ...]) -> float:
    """Degrees of up to three numbers, without a sign."""
    in_seconds = sum(float(part) * scale for part, scale in zip(numbers, (3600.0, 60.0, 1.0), strict=False))
    return in_seconds / 3600.0 if len(numbers) > 1 else float(numbers[0])


def _require_not_swapped(first: _Angle, second: _Angle, axes: list[str]) -> None:
    """Offer the other order where, without letters, only that is a place on the globe."""
    if axes == ["lat", "lon"] and not first.letter and 90 < _size(first.numbers) <= 180 and _size(second.numbers) <= 90:
        raise _UnreadableError(
            f"a latitude of -90 to 90 degrees, not {first}; latitude and longitude look swapped: give {second}, {first}"
        )


def _axis(angle: _Angle) -> str:
    """Which axis the letter or the label says, or nothing."""
    by_letter = {"": "", "N": "lat", "S": "lat", "E": "lon", "W": "lon"}[angle.letter]
    if by_letter and angle.label and by_letter != angle.label:
        raise _UnreadableError(f"with a letter that fits {angle.label!r}, not {angle.letter}")
    return by_letter or angle.label


def _unpack(digits: str, axis: str) -> tuple[str, ...]:
    """Split DDMM, DDMMSS (one more D in longitudes) with or without decimals; nothing for other counts of digits."""
    width = 2 if axis == "lat" else 3
    whole = len(digits.partition(".")[0])
    if whole == width + 2:
        return digits[:width], digits[width:]
    if whole == width + 4:
        return digits[:width], digits[width : width + 2], digits[width + 2 :]
    return ()


def _degrees(angle: _Angle, axis: str) -> float:
    """Decimal degrees of an angle, its parts checked."""
    if angle.sign and angle.letter:
        raise _UnreadableError(f"with a sign or a letter, not both ({angle})")
    numbers = angle.numbers
    if len(numbers) == 1 and angle.letter and not angle.marked:
        numbers = _unpack(numbers[0], axis) or numbers
    if len(numbers[0].partition(".")[0]) > 3:
        width = "DD" if axis == "lat" else "DDD"
        raise _UnreadableError(
            f"a {_NAMES[axis]} of up to 3 digits, or packed {width}MM or {width}MMSS with a letter, not {angle}"
        )
    for name, part in zip(("minutes", "seconds"), numbers[1:], strict=False):
        if float(part) >= 60:
            raise _UnreadableError(f"with {name} under 60, not {part}")
    size = _size(numbers)
    if size > _LIMITS[axis]:
        swap = "; latitude comes first, or use letters" if axis == "lat" and size <= 180 and not angle.letter else ""
        raise _UnreadableError(f"a {_NAMES[axis]} of -{_LIMITS[axis]} to {_LIMITS[axis]} degrees, not {angle}{swap}")
    return -size if angle.sign == "-" or angle.letter in ("S", "W") else size
