"""One pair of antenna heights that meets all that a hop is asked for at once, the cheapest there is."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from profiler.checks import within
from profiler.errors import InputError
from profiler.geometry import ROUNDING_M
from profiler.heights import (
    Choice,
    ClearingRegion,
    DrawnRegions,
    NoPair,
    both_free,
    cheapest_by_trial,
    cheapest_of,
    clearing_region,
    drawn_regions,
    least_b_for,
    least_b_sure,
    least_surplus_drawn,
)
from profiler.plan.link_limits import Excess
from profiler.remarks import Length, Remark, chance_text, note
from profiler.study.requirements import spacing_of
from profiler.study.result import Study
from profiler.units import Float

if TYPE_CHECKING:
    from profiler.confidence import Chance

__all__ = ["Answer", "SurePair", "asked_chance", "chance_of_pair", "draw_regions", "find_answer", "sure_pairs"]

_FEWEST_BEYOND = 10
"""Draws that must be left beyond a chance, or their number says nothing about it."""

_HAIR_M = 1e-3
"""A draw that clears by less does not count here: a study of the pair then never finds a lesser chance by rounding."""


@dataclass(frozen=True, slots=True, eq=False)
class Answer:
    """The cheapest pair that meets everything asked for at once.

    ``asked`` says what, each in words that follow "the antennas", and ``unjudged`` what was set but cannot be judged.
    ``asked_chance`` is the least chance of clearing every rule and, with a diversity pair, the lower antennas;
    ``chance`` is that of the pair, over the draws of the errors. None where no error is known. ``by_trial`` says that
    the pair was found by trial of losses and outage: where heights only ever help these, none is cheaper by more than
    ``cheaper_by_at_most``. Otherwise none is cheaper.
    """

    pair: Choice | NoPair
    asked: tuple[str, ...]
    unjudged: tuple[Remark, ...]
    asked_chance: float | None
    chance: Chance | None
    by_trial: bool = False
    cheaper_by_at_most: float = 0.0


@dataclass(frozen=True, slots=True, eq=False)
class SurePair:
    """The cheapest pair that clears with at least the chance ``asked``, and the chance that it has.

    It holds the lower antennas of a diversity pair clear too, but need not keep any limit of loss or outage.
    """

    asked: float
    pair: Choice | NoPair
    chance: Chance | None


def asked_chance(study: Study, sure: float | None) -> float | None:
    """Give the chance that a plan's pair must have: the one asked for, else the least that passes; None without error.

    Raises
    ------
    InputError
        If a chance is asked for and the hop file does not say how wrong the ground may be, or draws too little.
    """
    choice = study.hop.confidence
    if sure is not None:
        within("sure", sure, 0.5, 0.999, "a chance of 0.5 to 0.999")
    if choice is None:
        if sure is None:
            return None
        raise InputError("confidence = (missing): must say how wrong the terrain may be where a chance is asked for")
    asked = choice.minimum_chance if sure is None else sure
    fewest = math.ceil(_FEWEST_BEYOND / (1.0 - asked) - 1e-6)
    if choice.draws < fewest:
        raise InputError(
            f"confidence.draws = {choice.draws}: must be at least {fewest} for a chance of {100 * asked:g} %,"
            f" to leave {_FEWEST_BEYOND} draws beyond it"
        )
    return asked


def find_answer(
    study: Study,
    region: ClearingRegion,
    clearing: Choice | NoPair,
    limits: Mapping[str, Excess],
    *,
    unjudged: tuple[Remark, ...] = (),
    drawn: DrawnRegions | None = None,
    sure: float | None = None,
) -> Answer:
    """Find the cheapest pair of free positions that clears, is sure enough and keeps every limit.

    Clearance and chance are held exactly: raising an antenna never lowers either, so for each position of A the least
    position of B follows. The limits are tried from the cheapest such pair on.

    Parameters
    ----------
    study, region
        The study and the region that clears.
    clearing
        The cheapest pair that clears, or why there is none.
    limits
        What else must hold, by the words for it: forward models that give how far a pair is over.
    unjudged
        What cannot be judged, to be told.
    drawn, sure
        The regions of `draw_regions` and the chance of `asked_chance`; None: the ground is taken as given.

    Returns
    -------
    Answer
    """
    towers = study.hop.heights
    asked = ["clear every rule", *(["hold their lower antennas clear"] if spacing_of(study.hop) else []), *limits]
    if sure is not None:
        asked.append(f"clear with {100 * sure:g} % chance")
    if isinstance(clearing, NoPair):
        return Answer(clearing, tuple(asked), unjudged, sure, None)
    free_a, free_b = both_free(towers.tower_a, towers.tower_b, spacing_m=spacing_of(study.hop))
    floor = _floor(region, free_a, free_b, drawn, sure)
    pair: Choice | NoPair = _cheapest(study, free_a, free_b, floor, drawn, sure)
    if isinstance(pair, NoPair) or all(excess(pair.antenna_a_m, pair.antenna_b_m) <= 0 for excess in limits.values()):
        return Answer(pair, tuple(asked), unjudged, sure, chance_of_pair(drawn, pair))
    pair, slack = _by_trial(study, free_a, free_b, floor, limits)
    return Answer(
        pair, tuple(asked), unjudged, sure, chance_of_pair(drawn, pair), by_trial=True, cheaper_by_at_most=slack
    )


def sure_pairs(
    study: Study, region: ClearingRegion, clearing: Choice | NoPair, drawn: DrawnRegions, chances: tuple[float, ...]
) -> tuple[SurePair, ...]:
    """Find the cheapest pair for each of some chances of clearing; there is none where none clears on the map."""
    if isinstance(clearing, NoPair):
        return tuple(SurePair(chance, clearing, None) for chance in chances)
    towers = study.hop.heights
    free_a, free_b = both_free(towers.tower_a, towers.tower_b, spacing_m=spacing_of(study.hop))
    pairs = []
    for chance in chances:
        pair = _cheapest(study, free_a, free_b, _floor(region, free_a, free_b, drawn, chance), drawn, chance)
        pairs.append(SurePair(chance, pair, chance_of_pair(drawn, pair)))
    return tuple(pairs)


def draw_regions(study: Study, region: ClearingRegion) -> DrawnRegions | None:
    """Move the region by the errors that the hop file speaks of; None where it speaks of none."""
    choice, profile = study.hop.confidence, study.profile
    if choice is None:
        return None
    from profiler.confidence import draw_doubt

    doubt = draw_doubt(
        region.distance_m,
        np.interp(region.distance_m, profile.distance_m, profile.cover_m),
        choice,
        cell_m=study.terrain.finest_cell_m,
        surveyed=(bool(profile.surveyed[0]), bool(profile.surveyed[-1])),
    )
    least_ray_m = doubt.places.carry(region.least_ray_m) + _HAIR_M
    between = clearing_region(doubt.places.distance_m, least_ray_m, region.ground_a_m, region.ground_b_m)
    return drawn_regions(between, doubt.surplus_errors)


def chance_of_pair(drawn: DrawnRegions | None, pair: Choice | NoPair) -> Chance | None:
    """Chance that a pair clears; None without a pair, or where no error is known."""
    if drawn is None or not isinstance(pair, Choice):
        return None
    from profiler.confidence import chance_of

    return chance_of(least_surplus_drawn(drawn, pair.antenna_a_m, pair.antenna_b_m))


def _floor(
    region: ClearingRegion, free_a: Float, free_b: Float, drawn: DrawnRegions | None, sure: float | None
) -> NDArray[np.intp]:
    """Index of the least position of B for each position of A: that clears, and with the chance that is asked for."""
    least_b = least_b_for(region, free_a)
    if drawn is not None and sure is not None:
        least_b = np.maximum(least_b, least_b_sure(drawn, free_a, sure))
    return np.asarray(np.searchsorted(free_b, least_b - ROUNDING_M), dtype=np.intp)


def _cheapest(
    study: Study, free_a: Float, free_b: Float, floor: NDArray[np.intp], drawn: DrawnRegions | None, sure: float | None
) -> Choice | NoPair:
    """Cheapest of the pairs of each A with its least B; ``floor`` holds the index of that and is raised to be sure."""
    towers = study.hop.heights
    while True:
        found = floor < free_b.size
        if not found.any():
            break
        pair = cheapest_of(free_a[found], free_b[floor[found]], towers.tower_a, towers.tower_b)
        chance = chance_of_pair(drawn, pair)
        if chance is None or sure is None or chance.value >= sure:
            return pair
        floor[np.searchsorted(free_a, pair.antenna_a_m)] += 1  # single precision left the least B a hair too low
    best = Choice(float(free_a[-1]), float(free_b[-1]), math.nan)
    chance = chance_of_pair(drawn, best)
    assert chance is not None  # where none is asked for, the clearing pair is there
    assert sure is not None
    return NoPair(
        reason=note(
            "heights",
            "no pair clears with a chance of {}: at the highest there is, A {} and B {}, the chance is {}",
            chance_text(sure),
            Length(best.antenna_a_m),
            Length(best.antenna_b_m),
            chance_text(chance.value),
        ),
        best_a_m=best.antenna_a_m,
        best_b_m=best.antenna_b_m,
    )


def _by_trial(
    study: Study, free_a: Float, free_b: Float, floor: NDArray[np.intp], limits: Mapping[str, Excess]
) -> tuple[Choice | NoPair, float]:
    """Cheapest pair found, at or above the floor, that keeps the limits, and how much cheaper another can be."""
    towers = study.hop.heights

    def excess(antenna_a_m: float, antenna_b_m: float) -> float:
        lowest = floor[np.searchsorted(free_a, antenna_a_m)]
        if lowest == free_b.size or antenna_b_m < free_b[lowest]:
            return math.inf
        return max(each(antenna_a_m, antenna_b_m) for each in limits.values())

    choice, _, slack = cheapest_by_trial(excess, free_a, free_b, towers.tower_a, towers.tower_b)
    if choice is not None:
        return choice, slack
    best_a, best_b = float(free_a[-1]), float(free_b[-1])
    over = {name: each(best_a, best_b) for name, each in limits.items()}
    missed = [f"{name} by {db:.2f} dB" for name, db in over.items() if 0 < db < math.inf]
    missed += [f"{name} at any fade margin" for name, db in over.items() if db == math.inf]
    words = "no pair found that does all that is asked: what helps one limit spoils another"
    if missed:
        words = (
            "no pair found that does all that is asked: at the highest there is, A {} and B {}, the antennas fail to"
            f" {', and to '.join(missed)}"
        )
    reason = note("heights", words, *(Length(height) for height in (best_a, best_b) if missed))
    return NoPair(reason, best_a, best_b, proven=False), 0.0
