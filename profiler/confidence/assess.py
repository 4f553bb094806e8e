"""How sure it is that a hop clears its rules, given how wrong the terrain, the cover and k may be."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike

from profiler.checks import not_negative
from profiler.confidence.draws import draw_doubt
from profiler.confidence.fields import Covariance, Draws
from profiler.confidence.findings import Confidence
from profiler.confidence.method import describe
from profiler.confidence.summary import chance_of, rule_confidence, sure_heights
from profiler.confidence.survey import rank_points
from profiler.confidence.tally import Doubt, Nominal, run_draws
from profiler.errors import InputError
from profiler.geometry import check_rule, earth_bulge
from profiler.models import Rule, frozen_array
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
    *,
    terrain_sigma_m: ArrayLike,
    correlation_m: float,
    covariance: Covariance = "exponential",
    site_sigma_a_m: float | None = None,
    site_sigma_b_m: float | None = None,
    cover_sigma_m: float = 0.0,
    cover_relative_sigma: float = 0.0,
    cover_correlation_m: float | None = None,
    beside_m: ArrayLike = 0.0,
    k_percentiles: Sequence[tuple[float, float]] = (),
    draws: int = 2000,
    seed: int = 1,
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
    terrain_sigma_m
        Standard deviation of the ground's error, 0 m or more: a scalar, or (n,) where points differ (surveyed, filled).
    correlation_m
        Practical range of the terrain error (5 % correlation left), 0 m or more; infinity is one error for all points.
    covariance
        ``"exponential"`` or ``"gaussian"`` correlation, for terrain and cover.
    site_sigma_a_m, site_sigma_b_m
        Standard deviation of a site's ground where it is known apart from the raster (a survey), 0 m or more; then its
        error is independent of the raster's. None: the site's ground is the raster's, with its error.
    cover_sigma_m, cover_relative_sigma
        Standard deviation of the cover's height, in metres and as a part of the height, added in quadrature. Cover does
        not sink below 0, and where none is given none grows.
    cover_correlation_m
        Practical range of the cover's error; None is the terrain's.
    beside_m
        How much less surplus the ground beside the path leaves than the path itself, metres, 0 or more, (rules, n) or
        what broadcasts to it; its error is taken to be that of the path's own point.
    k_percentiles
        (percent of the time that k is not exceeded, k) pairs, as in `draw_inverse_k`; empty: k does not vary.
    draws
        How many draws, 100 or more; the intervals in the result show what that number leaves open.
    seed
        Seed of the random numbers, 0 or more: the same seed and inputs give the same result. Each cause has its own
        stream, so that a change of one input leaves the other causes' draws alone.

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
    One hill midway over a deep valley, 1 m above what the rule needs, sites surveyed, a terrain error of 5 m: the
    chance is Φ(1/5) = 0.579, and both antennas must rise by 1.645·5 - 1 = 7.2 m to be 95 % sure.

    >>> hill = 100 + 30 - float(earth_bulge(10e3, 10e3, 4 / 3)) - 1.0
    >>> found = assess([0, 10e3, 20e3], [100, hill, 100], [0, 0, 0], 30, 30, 6e9, [Rule(4 / 3, 0.0)],
    ...     terrain_sigma_m=5.0, correlation_m=100.0, site_sigma_a_m=0.0, site_sigma_b_m=0.0, draws=20000)
    >>> round(found.chance.value, 2), round(found.sure[1].raise_m, 1), found.survey[0].index
    (0.58, 7.2, 1)

    Notes
    -----
    The model of the error, a stationary Gaussian field drawn many times, is that of Fisher, GeoInformatica 2(3), 1998,
    and Oksanen and Sarjakoski, Computers & Geosciences 31(8), 2005. Raising both antennas alike lifts the ray alike
    everywhere, so a draw needs a raise of minus its least surplus; raising A alone lifts a point at the share t of the
    way by 1 - t. The sure heights are order statistics of those needs, exact but for the number of draws.

    For given standard deviations, and sites that are surveyed, a longer correlation never lowers the chance that
    all points are clear (Slepian's inequality, Bell System Technical Journal 41, 1962, from memory), so a short range
    is then the cautious assumption here; its result depends on how densely the path is sampled. Where the sites share
    the raster's error, correlation with nearby ground cancels besides.
    """
    distance, ground, cover = frozen_array(distance_m), frozen_array(ground_m), frozen_array(cover_m)
    if not distance.shape == ground.shape == cover.shape:
        shapes = f"{distance.shape}, {ground.shape} and {cover.shape}"
        raise InputError(f"distance, ground and cover of shapes {shapes}: must be three equal rows")
    nominal = _nominal(distance, ground, cover, (antenna_a_m, antenna_b_m), frequency_hz, rules, beside_m)
    doubt, sigmas = draw_doubt(
        distance,
        cover,
        terrain_sigma_m=terrain_sigma_m,
        correlation_m=correlation_m,
        covariance=covariance,
        site_sigma_a_m=site_sigma_a_m,
        site_sigma_b_m=site_sigma_b_m,
        cover_sigma_m=cover_sigma_m,
        cover_relative_sigma=cover_relative_sigma,
        cover_correlation_m=cover_correlation_m,
        k_percentiles=k_percentiles,
        draws=draws,
        seed=seed,
    )
    result = run_draws(nominal, doubt)
    ranges_m = (correlation_m, correlation_m if cover_correlation_m is None else cover_correlation_m)
    chance_critical = np.bincount(result.critical, minlength=distance.size) / draws
    return Confidence(
        rules=tuple(rule_confidence(i, rule, result) for i, rule in enumerate(rules)),
        chance=chance_of(result.all_m),
        sure=tuple(sure_heights(chance, result, antenna_a_m, antenna_b_m) for chance in SURE_CHANCES),
        survey=rank_points(distance, _surface_error(doubt), result.all_m, chance_critical, reach_m=correlation_m),
        chance_critical=frozen_array(chance_critical),
        draws=draws,
        seed=seed,
        method=describe(sigmas, ranges_m, covariance, k_percentiles, draws, seed),
    )


def _nominal(
    distance: Float,
    ground: Float,
    cover: Float,
    antennas: tuple[float, float],
    frequency_hz: float,
    rules: Sequence[Rule],
    beside_m: ArrayLike,
) -> Nominal:
    """Hold every rule against the path as given."""
    if not rules:
        raise InputError("rules: none given: must be at least one")
    centre_a, centre_b = float(ground[0]) + antennas[0], float(ground[-1]) + antennas[1]
    path = (distance, ground + cover, centre_a, centre_b, frequency_hz)
    surplus = [check_rule(*path, rule).surplus_m for rule in rules]
    return Nominal(
        surplus_m=np.asarray(surplus) - not_negative("beside_m", beside_m, "m"),
        inverse_k=np.asarray([1.0 / rule.k for rule in rules]),
        unit_bulge_m=earth_bulge(distance, distance[-1] - distance, 1.0),
        share=distance / distance[-1],
    )


def _surface_error(doubt: Doubt) -> Draws:
    """Error of what a survey would measure: ground at the sites, the top of the cover between. Reuses the draws."""
    error = doubt.ground_m
    if doubt.cover_m is not None:
        inner = (doubt.covered > 0) & (doubt.covered < len(error) - 1)
        error[doubt.covered[inner]] += doubt.cover_m[inner]
    return error
