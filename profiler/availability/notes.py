"""What a result says about itself: the numbers used with their sources, what was assumed, what to beware of."""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["InputUsed", "Notes"]


@dataclass(frozen=True, slots=True)
class InputUsed:
    """One number behind a result; the unit is in the name, ``source`` says who gave it or which method made it."""

    name: str
    value: float
    source: str


@dataclass(frozen=True, slots=True)
class Notes:
    """Numbers used, assumptions and warnings, one plain line each; notes add up in order, none twice.

    Examples
    --------
    >>> (Notes(warnings=("a", "b")) + Notes(warnings=("b",))).warnings
    ('a', 'b')
    """

    inputs: tuple[InputUsed, ...] = ()
    assumptions: tuple[str, ...] = ()
    warnings: tuple[str, ...] = ()

    def __add__(self, other: Notes) -> Notes:
        """Both sets of notes, in order, without repeats."""
        return Notes(
            tuple(dict.fromkeys(self.inputs + other.inputs)),
            tuple(dict.fromkeys(self.assumptions + other.assumptions)),
            tuple(dict.fromkeys(self.warnings + other.warnings)),
        )
