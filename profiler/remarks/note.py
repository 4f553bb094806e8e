"""What a stage remarks on its own result: what it assumed, or what to beware of, with the lengths in it as numbers.

A stage says what it found and never in which unit the reader will see it: `profiler.words` writes metres or feet.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal, TypeAlias

from profiler.remarks.numerals import minus
from profiler.units import FOOT_M, STATUTE_MILE_M

__all__ = ["Length", "Note", "Remark", "Topic", "note", "prefixed"]

Topic = Literal[
    "site",
    "rules",
    "ground",
    "terrain",
    "cover",
    "climate",
    "diffraction",
    "reflection",
    "air",
    "budget",
    "availability",
    "diversity",
    "confidence",
    "heights",
]
"""What a note is about, so that a page can choose by it and never by how a sentence begins; ``ground`` is how heights
were read between the cells, ``terrain`` what the rasters themselves are like."""


@dataclass(frozen=True, slots=True)
class Length:
    """A length to be written: in metres or feet, or with ``far`` in kilometres or miles.

    ``digits`` after the point hold in every unit; None means as many as such a length is known to: a tenth of a metre
    or foot, finer below 1; hundredths of a kilometre or mile, and near an end metres or feet in their place.
    """

    length_m: float
    digits: int | None = None
    far: bool = False

    def text(self, *, feet: bool = False) -> str:
        """Write the length with its unit.

        Examples
        --------
        >>> Length(-12.34).text(), Length(0.034).text(), Length(1.0).text(feet=True), Length(30.0, 0).text()
        ('−12.3 m', '0.03 m', '3.3 ft', '30 m')
        >>> Length(12_431.0, far=True).text(), Length(12_431.0, far=True).text(feet=True), Length(40, far=True).text()
        ('12.43 km', '7.72 mi', '40 m')
        """
        if self.far and abs(self.length_m) >= _NEAR_M:
            unit_m, unit = (STATUTE_MILE_M, "mi") if feet else (1000.0, "km")
            value = self.length_m / unit_m
            digits = (0 if abs(value) >= 1000 else 2) if self.digits is None else self.digits
            return f"{minus(f'{value:.{digits}f}')} {unit}"
        value, unit = (self.length_m / FOOT_M, "ft") if feet else (self.length_m, "m")
        known = 0 if self.far else 1 if abs(value) >= 1 or value == 0 else 2 if abs(value) >= 0.01 else 4
        digits = known if self.digits is None or self.far else self.digits
        return f"{minus(f'{value:.{digits}f}')} {unit}"


_NEAR_M = 99.5
"""Under this a distance in hundredths of a kilometre would say next to nothing."""


@dataclass(frozen=True, slots=True)
class Note:
    """One remark: its topic, and its words with the lengths among them; see `note`."""

    topic: Topic
    parts: tuple[str | Length, ...]

    def text(self, *, feet: bool = False) -> str:
        """Write the remark in metres and kilometres, or in feet and miles."""
        return "".join(part if isinstance(part, str) else part.text(feet=feet) for part in self.parts)

    def __str__(self) -> str:
        """Write the remark in metres."""
        return self.text()


Remark: TypeAlias = Note | str
"""A remark with its lengths as numbers, or one that has none and is plain text."""


def note(topic: Topic, words: str, *values: str | Length) -> Note:
    """Make a remark; each ``{}`` in its words stands for one of the values.

    Names that a user gave go in as values, never into the words themselves: they may hold braces.

    Examples
    --------
    >>> remark = note("terrain", "{}: points stand {} apart", "dem{1}.tif", Length(25.0, 0))
    >>> remark.text(), remark.text(feet=True)
    ('dem{1}.tif: points stand 25 m apart', 'dem{1}.tif: points stand 82 ft apart')
    """
    first, *others = words.split("{}")
    parts: list[str | Length] = [first]
    for value, after in zip(values, others, strict=True):
        parts += [value, after]
    return Note(topic, tuple(part for part in parts if part != ""))


def prefixed(name: str, remark: Remark) -> Remark:
    """Put what a remark is about before it.

    Examples
    --------
    >>> str(prefixed("knife-edge", note("diffraction", "the top is {} wide", Length(40.0, 0))))
    'knife-edge: the top is 40 m wide'
    """
    return f"{name}: {remark}" if isinstance(remark, str) else Note(remark.topic, (f"{name}: ", *remark.parts))
