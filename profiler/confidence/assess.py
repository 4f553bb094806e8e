"""How sure it is that a hop clears its rules, given how wrong the terrain, the cover and k may be."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike

from profiler.checks import not_negative
from profiler.confidence.draws import draw_doubt
from profiler.confidence.findings import Confidence
from profiler.confidence.method import describe
from profiler.confidence.summary import chance_of, rule_confidence, sure_heights
from profiler.confidence.survey import survey_places
from profiler.confidence.tally import Nominal, run_draws
from profiler.errors import InputError
from profiler.geometry import check_rule, earth_bulge
from profiler.models import ConfidenceChoice, Rule, frozen_array
from profiler.units import Float

__all__ = ["SURE_CHANCES", "assess"]

SURE_CHANCES = (0.90, 0.95)
"""How sure the sure heights are."""


def assess(
    distance_m: ArrayLike,
    ground_m: ArrayLike,
    cover_m: ArrayLike,
    antenna_a_m: float,
    antenna_b_m: float,
    frequency_hz: float,
    rules: Sequence[Rule],
    choice: ConfidenceChoice,
    *,
    cell_m: float,
    surveyed: tuple[bool, bool] = (False, False),
    beside_m: ArrayLike = 0.0,
    k_percentiles: Sequence[tuple[float, float]] = (),
) -> Confidence:
    """Draw the errors of terrain and cover many times, and count how the rules fare.

    Each draw moves the ground by a correlated Gaussian error, and with it the antennas that stand on it, and the cover
    by an error of its own. A rule's k is part of its definition ("0.3 F1 at k = 2/3"), so the chance that a rule is
    met, the sure heights and the survey points are over terrain and cover, at each rule's own k. If percentiles of k
    are given, k also varies, one value per draw for the whole path: that gives the expected share of time that each
    rule's fraction and margin are clear, and k's share of the doubt.

    Parameters
    ----------
    distance_m
        Distances from A, (n,), ascending from 0; the last is B.
    ground_m, cover_m
        Ground above the datum, and cover above ground (0 m or more), (n,), no gaps.
    antenna_a_m, antenna_b_m
        Antenna centres above ground.
    frequency_hz
        Frequency, more than 0 Hz.
    rules
        One or more clearance rules.
    choice
        How wrong the terrain and the cover may be, and how that is drawn.
    cell_m
        The raster's cell under the path, more than 0 m: the step at which errors are drawn, unless the choice has its
        own, and between which they are carried, as the ground is. How densely the path is listed is no matter.
    surveyed
        Whether the ground at A and at B is known apart from the raster; then its error is the choice's
        ``site_sigma_m``, none where that is None, and independent of the raster's.
    beside_m
        How much less surplus the ground beside the path leaves than the path itself, metres, 0 or more, (rules, n) or
        what broadcasts to it; its error is taken to be that of the path's own point.
    k_percentiles
        (percent of the time that k is not exceeded, k) pairs, as in `draw_inverse_k`; empty: k does not vary.

    Returns
    -------
    Confidence

    Raises
    ------
    InputError
        If a value is out of range, or the draws would not fit in memory.
    MissingGroundError
        If the ground has a gap.

    Examples
    --------
    One sharp top midway over a deep valley, 1 m above what the rule needs, sites surveyed, a terrain error of 5 m: the
    chance is Φ(1/5) = 0.579, and both antennas must rise by 1.645·5 - 1 = 7.2 m to be 95 % sure.

    >>> top = 100 + 30 - float(earth_bulge(10e3, 10e3, 4 / 3)) - 1.0
    >>> path = [0, 1, 9999, 10e3, 10001, 19999, 20e3], [100, 0, 0, top, 0, 0, 100]
    >>> found = assess(*path, np.zeros(7), 30, 30, 6e9, [Rule(4 / 3, 0.0)],
    ...     ConfidenceChoice(5.0, "an example", 100.0, draws=20000), cell_m=100.0, surveyed=(True, True))
    >>> round(found.chance.value, 2), round(found.sure[1].raise_m, 1), found.survey[0].distance_m
    (0.58, 7.2, 10000.0)

    Notes
    -----
    The model of the error, a stationary Gaussian field drawn many times, is that of Fisher, GeoInformatica 2(3), 1998,
    and Oksanen and Sarjakoski, Computers & Geosciences 31(8), 2005. Raising both antennas alike lifts the ray alike
    everywhere, so a draw needs a raise of minus its least surplus; raising A alone lifts a point at the share t of the
    way by 1 - t. The sure heights are order statistics of those needs, exact but for the number of draws.

    The error belongs to the cells: it is drawn at their step, and between two cells it is that of both, scaled so that
    its standard deviation is the stated one everywhere. What the whole neighbourhood shares cancels where both sites
    stand on the raster's ground.

    For given standard deviations, and sites that are surveyed, a longer correlation never lowers the chance that
    all points are clear (Slepian's inequality, Bell System Technical Journal 41, 1962, from memory), so a short range
    is then the cautious assumption. Where the sites share the raster's error, correlation with nearby ground cancels
    besides.
    """
    distance, ground, cover = frozen_array(distance_m), frozen_array(ground_m), frozen_array(cover_m)
    if not distance.shape == ground.shape == cover.shape:
        shapes = f"{distance.shape}, {ground.shape} and {cover.shape}"
        raise InputError(f"distance, ground and cover of shapes {shapes}: must be three equal rows")
    if not rules:
        raise InputError("rules: none given: must be at least one")
    surplus = _surplus(
        distance, ground + cover, (ground[0] + antenna_a_m, ground[-1] + antenna_b_m), frequency_hz, rules
    )
    surplus -= not_negative("beside_m", beside_m, "m")
    doubt = draw_doubt(distance, cover, choice, cell_m=cell_m, surveyed=surveyed, k_percentiles=k_percentiles)
    places = doubt.places
    at_m = places.distance_m
    result = run_draws(
        Nominal(
            surplus_m=places.carry(surplus),
            inverse_k=np.asarray([1.0 / rule.k for rule in rules]),
            unit_bulge_m=earth_bulge(at_m, at_m[-1] - at_m, 1.0),
            share=at_m / at_m[-1],
        ),
        doubt,
    )
    return Confidence(
        rules=tuple(rule_confidence(i, rule, result) for i, rule in enumerate(rules)),
        chance=chance_of(result.all_m),
        sure=tuple(sure_heights(chance, result, antenna_a_m, antenna_b_m) for chance in SURE_CHANCES),
        survey=survey_places(distance, doubt, result, correlation_m=choice.correlation_m),
        draws=choice.draws,
        seed=choice.seed,
        method=describe(choice, doubt, surveyed, k_percentiles),
    )


def _surplus(
    distance: Float, surface: Float, centres_m: tuple[float, float], frequency_hz: float, rules: Sequence[Rule]
) -> Float:
    """Hold every rule against the path as given, (rules, n)."""
    return np.stack([check_rule(distance, surface, *centres_m, frequency_hz, rule).surplus_m for rule in rules])
