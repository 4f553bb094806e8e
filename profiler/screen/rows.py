"""What screening finds of every pair, column by column, ready to be written as a table."""

from __future__ import annotations

from dataclasses import dataclass, fields

import numpy as np

from profiler.screen.lines import Ints
from profiler.units import Float

__all__ = ["OK", "Rows"]

OK = "ok"
"""Status of a pair that was screened; any other says in words why it was not."""


@dataclass(frozen=True, slots=True, eq=False)
class Rows:
    """One row for each pair; what is not known is NaN, or an empty text.

    ``surplus_m`` is the least over the rules, ``surplus_at_m`` how far from A it is and ``surplus_offset_m`` how far to
    the right of the path, ``rule`` the number of its rule, counted from 1; ``rule_surplus_m`` (pairs, rules) is that of
    each. ``diffraction_db`` is by the template's method at the median k; ``least_equal_m`` the least height of both
    antennas alike that meets the rules. ``fade_margin_db`` and ``chance`` are those of a full study, where the template
    asks for one; ``studied`` is 1 for a pair that was studied in full, 0 where the kernel answered.
    """

    status: list[str]
    outcome: list[str]
    distance_m: Float
    azimuth_a_deg: Float
    azimuth_b_deg: Float
    surplus_m: Float
    surplus_at_m: Float
    surplus_offset_m: Float
    rule: Float
    rule_surplus_m: Float
    diffraction_db: Float
    least_equal_m: Float
    fade_margin_db: Float
    chance: Float
    studied: Float

    def __len__(self) -> int:
        return int(self.distance_m.size)

    @classmethod
    def empty(cls, pairs: int, rules: int) -> Rows:
        """Make rows in which nothing is known yet, to be filled by `put`."""
        numbers = {
            each.name: np.full((pairs, rules) if each.name == "rule_surplus_m" else pairs, np.nan)
            for each in fields(cls)[2:]
        }
        return cls(status=[""] * pairs, outcome=[""] * pairs, **numbers)

    def take(self, which: Ints) -> Rows:
        """Return some rows, in the order given."""
        status, outcome = ([values[i] for i in which.tolist()] for values in (self.status, self.outcome))
        return Rows(status, outcome, *(getattr(self, each.name)[which] for each in fields(self)[2:]))

    def put(self, at: Ints, other: Rows) -> None:
        """Put rows in the place of some of these."""
        for each in fields(self):
            target, source = getattr(self, each.name), getattr(other, each.name)
            if isinstance(target, list):
                for place, value in zip(at.tolist(), source, strict=True):
                    target[place] = value
            else:
                target[at] = source
