"""What a result says about itself: the numbers used with their sources, what was assumed, what to beware of."""

from __future__ import annotations

from dataclasses import dataclass

from profiler.remarks import Remark

__all__ = ["InputUsed", "Notes"]


@dataclass(frozen=True, slots=True)
class InputUsed:
    """One number behind a result; the unit is in the name, ``source`` says who gave it or which method made it.

    A list of numbers, as the statistics of k are, has its text for its value.

    Examples
    --------
    >>> InputUsed("rain_rate_mm_h", 42.0, "given").line
    'rain_rate_mm_h = 42: given'
    """

    name: str
    value: float | str
    source: str

    @property
    def line(self) -> str:
        """The number with its source, in words."""
        value = self.value if isinstance(self.value, str) else f"{self.value:.4g}"
        return f"{self.name} = {value}: {self.source}"


@dataclass(frozen=True, slots=True)
class Notes:
    """Numbers used, assumptions and warnings, one plain line each; notes add up in order, none twice.

    ``outside_fit`` are the warnings that a formula is used outside the data it was fitted to.

    Examples
    --------
    >>> (Notes(warnings=("a", "b")) + Notes(warnings=("b",))).warnings
    ('a', 'b')
    """

    inputs: tuple[InputUsed, ...] = ()
    assumptions: tuple[Remark, ...] = ()
    warnings: tuple[Remark, ...] = ()
    outside_fit: tuple[Remark, ...] = ()

    def __add__(self, other: Notes) -> Notes:
        """Both sets of notes, in order, without repeats."""
        return Notes(
            tuple(dict.fromkeys(self.inputs + other.inputs)),
            tuple(dict.fromkeys(self.assumptions + other.assumptions)),
            tuple(dict.fromkeys(self.warnings + other.warnings)),
            tuple(dict.fromkeys(self.outside_fit + other.outside_fit)),
        )
