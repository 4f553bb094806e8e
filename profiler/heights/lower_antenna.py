"""The lower antenna of a space-diversity pair: its clearance by P.530, and whether the spacing suits it."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Literal

from profiler.checks import positive
from profiler.errors import InputError
from profiler.geometry import ROUNDING_M
from profiler.heights.region import ClearingRegion, least_a_for, least_b_for
from profiler.models import Obstruction, Rule
from profiler.remarks import Length, Note, note
from profiler.units import wavelength

__all__ = ["DiversityEnd", "check_diversity", "lower_rules"]

_FRACTIONS: dict[Obstruction, tuple[float, float]] = {"isolated": (0.0, 0.3), "extended": (0.3, 0.6)}
"""Rec. ITU-R P.530-18 §2.2.2.2, step 2 (from memory): the range of F1 that the lower antenna clears at the median k."""

_SPACING_M = (3.0, 23.0)
"""Range of the data under P.530-18's space-diversity improvement, §6.1 (from memory)."""

_FEWEST_WAVELENGTHS = 150.0
"""Common practice, no source: 150 to 200 wavelengths apart, so that the two signals fade apart."""


@dataclass(frozen=True, slots=True)
class DiversityEnd:
    """One end's diversity pair; heights above ground in metres.

    ``lower_m`` is the planned lower antenna, ``spacing_m`` below the main one. ``least_m`` and ``full_m`` are the least
    heights for the lower and the upper end of P.530's range of clearance (``fractions`` of F1 at the median k), not
    under the tower's lowest position; infinite where the far antenna is so low that no height helps.
    ``main_for_spacing_m`` is how high the main antenna must stand for the lower one to keep ``least_m``.
    """

    end: Literal["A", "B"]
    main_m: float
    lower_m: float
    spacing_m: float
    spacing_wavelengths: float
    fractions: tuple[float, float]
    least_m: float
    full_m: float
    main_for_spacing_m: float

    @property
    def clears(self) -> bool:
        """Whether the lower antenna has at least the lower end of P.530's range of clearance."""
        return self.lower_m >= self.least_m - ROUNDING_M

    @property
    def clears_more_than_needed(self) -> bool:
        """Whether it stands above P.530's range, which is meant to shield it from the ground's own reflection."""
        return self.lower_m > self.full_m + ROUNDING_M

    @property
    def spacing_in_data(self) -> bool:
        """Whether the spacing is within 3 to 23 m, the data under P.530's improvement factor."""
        return _SPACING_M[0] <= self.spacing_m <= _SPACING_M[1]

    @property
    def spacing_wide_enough(self) -> bool:
        """Whether the antennas are at least 150 wavelengths apart (common practice, no source)."""
        return self.spacing_wavelengths >= _FEWEST_WAVELENGTHS

    @property
    def notes(self) -> tuple[Note, ...]:
        """What is wrong or worth knowing, one line each; empty when nothing is."""
        lines = []
        lower = Length(self.lower_m, 2)
        if not self.clears:
            words, *lengths_m = self._remedy()
            lengths = (Length(length_m, 2) for length_m in lengths_m)
            lines.append(note("diversity", f"{self.end}: the lower antenna at {{}} {words}", lower, *lengths))
        if self.clears_more_than_needed:
            words = (
                f"{self.end}: the lower antenna at {{}} clears more than {self.fractions[1]:g} F1 ({{}} would do), so"
                " the ground shields it less from the reflected ray"
            )
            lines.append(note("diversity", words, lower, Length(self.full_m, 2)))
        if not self.spacing_in_data:
            words = f"{self.end}: a spacing of {{}} is outside {{}} to {{}}, the data under P.530's improvement factor"
            lines.append(
                note("diversity", words, Length(self.spacing_m, 2), *(Length(limit_m, 0) for limit_m in _SPACING_M))
            )
        if not self.spacing_wide_enough:
            words = (
                f"{self.end}: a spacing of {{}} is {self.spacing_wavelengths:.0f} wavelengths;"
                f" {_FEWEST_WAVELENGTHS:.0f} or more are common practice"
            )
            lines.append(note("diversity", words, Length(self.spacing_m, 2)))
        return tuple(lines)

    def _remedy(self) -> tuple[str, *tuple[float, ...]]:
        """Say what a lower antenna that is too low needs: the words, and the lengths in them, metres."""
        if math.isinf(self.least_m):
            return (
                "cannot be helped by height: the far main antenna stands too low at its own site; raise that first",
            )
        raising, needed_m = "needs {}: raise the main antenna to {}", (self.least_m, self.main_for_spacing_m)
        closer_m = self.main_m - self.least_m
        return (f"{raising}, or space them by {{}}", *needed_m, closer_m) if closer_m > 0 else (raising, *needed_m)


def lower_rules(obstruction: Obstruction, median_k: float) -> tuple[Rule, Rule]:
    """Give the two ends of the range of clearance that P.530 wants for a lower antenna, least first.

    Parameters
    ----------
    obstruction
        "isolated" (one or two obstacles: 0 to 0.3 F1) or "extended" (0.3 to 0.6 F1).
    median_k
        Median effective-earth-radius factor, more than 0.

    Raises
    ------
    InputError
        For an obstruction that is neither.

    Examples
    --------
    >>> [rule.fresnel_fraction for rule in lower_rules("extended", 4 / 3)]
    [0.3, 0.6]

    Notes
    -----
    Rec. ITU-R P.530-18 §2.2.2.2 (from memory of the text): enough for a loss of some 3 to 6 dB, and not so much that
    the ground's reflection reaches the lower antenna in full. The choice within the range is the designer's.
    """
    if obstruction not in _FRACTIONS:
        raise InputError(f'obstruction = {obstruction!r}: must be "isolated" or "extended"')
    least, full = (Rule(k=median_k, fresnel_fraction=fraction, label="lower") for fraction in _FRACTIONS[obstruction])
    return least, full


def check_diversity(
    least: ClearingRegion,
    full: ClearingRegion,
    frequency_hz: float,
    *,
    antenna_a_m: float,
    antenna_b_m: float,
    spacing_m: float,
    obstruction: Obstruction,
    lowest_m: tuple[float, float] = (0.0, 0.0),
) -> tuple[DiversityEnd, DiversityEnd]:
    """Hold the lower antennas of a space-diversity hop to P.530's clearance, and check their spacing.

    Each lower antenna receives from the far end's main antenna. At the median k it should clear 0.3 to 0.6 F1 over an
    extended obstruction, 0 to 0.3 F1 over one or two isolated obstacles. Points at the sites themselves count, so an
    antenna inside its own cover fails.

    Parameters
    ----------
    least, full
        Heights at the two ends of a lower antenna's ray that meet the two rules of `lower_rules`.
    frequency_hz
        Frequency, more than 0 Hz.
    antenna_a_m, antenna_b_m
        Main antennas above ground, more than 0 m.
    spacing_m
        How far the lower antenna is below the main one, more than 0 m. A spacing that would put it into the ground
        does not clear, and the notes say how high the main antenna must go.
    obstruction
        "isolated" or "extended", as the rays were asked for.
    lowest_m
        Lowest position that each tower offers, 0 m or more.

    Returns
    -------
    tuple of DiversityEnd
        A and B.

    Raises
    ------
    InputError
        For an obstruction that is neither, or a spacing not above 0.

    Examples
    --------
    >>> from profiler.heights import clearing_region, least_ray
    >>> profile = [0, 20e3, 40e3], [0, 20, 0]
    >>> rays = least_ray(*profile, 6e9, lower_rules("isolated", 4 / 3))
    >>> least, full = (clearing_region(profile[0], ray, 0, 0) for ray in rays)
    >>> ends = check_diversity(least, full, 6e9, antenna_a_m=70, antenna_b_m=70, spacing_m=10, obstruction="isolated")
    >>> ends[0].clears, round(ends[0].least_m, 2), round(ends[0].full_m, 2), round(ends[0].spacing_wavelengths)
    (True, 17.09, 30.5, 200)
    >>> print(str(ends[0].notes[0]).partition(",")[0])
    A: the lower antenna at 60.00 m clears more than 0.3 F1 (30.50 m would do)
    """
    fractions = tuple(rule.fresnel_fraction for rule in lower_rules(obstruction, 1.0))
    spacing = float(positive("spacing_m", spacing_m, "m"))
    needed = []
    for region in (least, full):
        heights = (float(least_a_for(region, antenna_b_m)), float(least_b_for(region, antenna_a_m)))
        needed.append([max(height, lowest) for height, lowest in zip(heights, lowest_m, strict=True)])
    ends: tuple[tuple[Literal["A", "B"], float], ...] = (("A", antenna_a_m), ("B", antenna_b_m))
    a, b = (
        DiversityEnd(
            end=end,
            main_m=main,
            lower_m=main - spacing,
            spacing_m=spacing,
            spacing_wavelengths=spacing / float(wavelength(frequency_hz)),
            fractions=(fractions[0], fractions[1]),
            least_m=needed[0][i],
            full_m=needed[1][i],
            main_for_spacing_m=needed[0][i] + spacing,
        )
        for i, (end, main) in enumerate(ends)
    )
    return a, b
