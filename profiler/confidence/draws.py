"""The draws of every error, and what they do to the surplus of a ray whose antennas stand on the ground."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike

from profiler.checks import not_negative
from profiler.confidence.fields import Covariance, Draws, draw_field, draw_inverse_k
from profiler.confidence.method import Sigmas
from profiler.confidence.tally import Doubt
from profiler.errors import InputError
from profiler.units import Float

__all__ = ["draw_doubt", "surplus_errors"]

_FEWEST_DRAWS = 100
_MOST_CELLS = 250_000_000


def draw_doubt(
    distance: Float,
    cover: Float,
    *,
    terrain_sigma_m: ArrayLike,
    correlation_m: float,
    covariance: Covariance = "exponential",
    site_sigma_a_m: float | None = None,
    site_sigma_b_m: float | None = None,
    cover_sigma_m: float = 0.0,
    cover_relative_sigma: float = 0.0,
    cover_correlation_m: float | None = None,
    k_percentiles: Sequence[tuple[float, float]] = (),
    draws: int = 2000,
    seed: int = 1,
) -> tuple[Doubt, Sigmas]:
    """Draw every error along a path; every cause has its own stream of unit draws, which its sigma scales.

    Parameters
    ----------
    distance, cover
        The path, (n,) each, as `profiler.confidence.assess` takes them, and everything else as there.

    Returns
    -------
    Doubt, Sigmas
        The draws, and the standard deviations that scale them.

    Raises
    ------
    InputError
        If a value is out of range, or the draws would not fit in memory.
    """
    _check(distance, cover, covariance, draws, seed)
    sigmas = Sigmas(
        _sigma_row(terrain_sigma_m, distance.size),
        None if site_sigma_a_m is None else float(not_negative("site_sigma_a_m", site_sigma_a_m, "m")),
        None if site_sigma_b_m is None else float(not_negative("site_sigma_b_m", site_sigma_b_m, "m")),
        np.hypot(
            not_negative("cover_sigma_m", cover_sigma_m, "m"),
            not_negative("cover_relative_sigma", cover_relative_sigma) * cover,
        ),
    )
    cover_range = correlation_m if cover_correlation_m is None else cover_correlation_m
    for name, value in (("correlation_m", correlation_m), ("cover_correlation_m", cover_range)):
        not_negative(name, value, "m", infinite=True)
    terrain_rng, site_rng, cover_rng, k_rng = (
        np.random.default_rng(child) for child in np.random.SeedSequence(seed).spawn(4)
    )
    ground_error: Draws = np.zeros((distance.size, draws), dtype=np.float32)
    if sigmas.ground_m.any():
        ground_error = draw_field(distance, correlation_m, covariance, draws, terrain_rng)
        ground_error *= sigmas.ground_m[:, None].astype(np.float32)
    for end, sigma in ((0, sigmas.site_a_m), (-1, sigmas.site_b_m)):
        unit = site_rng.standard_normal(draws, dtype=np.float32)
        if sigma is not None:
            ground_error[end] = np.float32(sigma) * unit
    covered = np.flatnonzero((cover > 0) & (sigmas.cover_m > 0))
    cover_error: Draws | None = None
    if covered.size:
        given = cover[covered, None].astype(np.float32)
        cover_error = draw_field(distance[covered], cover_range, covariance, draws, cover_rng)
        cover_error *= sigmas.cover_m[covered, None].astype(np.float32)
        np.maximum(cover_error, -given, out=cover_error)
    inverse_k = draw_inverse_k(k_percentiles, draws, k_rng) if len(k_percentiles) else None
    return Doubt(ground_error, cover_error, covered, inverse_k), sigmas


def surplus_errors(distance_m: ArrayLike, doubt: Doubt) -> Draws:
    """Give what each draw adds to the surplus at each point, at any heights: (1 - t)·eA + t·eB - e - c.

    The antennas stand on the ground and move with it; the point's own ground and cover error count against the ray. k
    does not vary here: every rule has its own.

    Parameters
    ----------
    distance_m
        Distances from A, (n,).
    doubt
        From `draw_doubt`.

    Returns
    -------
    ndarray
        (n, draws), float32.

    Examples
    --------
    >>> ground = np.array([[1.0], [5.0], [2.0]], dtype=np.float32)
    >>> surplus_errors([0, 500, 1000], Doubt(ground, None, np.empty(0, int), None)).ravel().tolist()
    [0.0, -3.5, 0.0]
    """
    distance = np.asarray(distance_m, dtype=float)
    share = (distance / distance[-1])[:, None].astype(np.float32)
    error: Draws = (1 - share) * doubt.ground_m[0] + share * doubt.ground_m[-1]
    error -= doubt.ground_m
    if doubt.cover_m is not None:
        error[doubt.covered] -= doubt.cover_m
    return error


def _sigma_row(terrain_sigma_m: ArrayLike, points: int) -> Float:
    """Spread the sigma of the ground over the points, or stop if it does not fit."""
    sigma = not_negative("terrain_sigma_m", terrain_sigma_m, "m")
    if sigma.shape not in ((), (1,), (points,)):
        raise InputError(
            f"terrain_sigma_m of shape {sigma.shape}: must be one number or one for each of {points} points"
        )
    return np.broadcast_to(sigma, (points,))


def _check(distance: Float, cover: Float, covariance: str, draws: int, seed: int) -> None:
    """Stop if the rows do not fit each other, or the draws do not fit in memory."""
    if not np.all(cover >= 0):
        raise InputError(f"cover_m: least value {float(cover.min())} m: must be 0 m or more everywhere, no gaps")
    if covariance not in ("exponential", "gaussian"):
        raise InputError(f"covariance = {covariance!r}: must be 'exponential' or 'gaussian'")
    if draws < _FEWEST_DRAWS or draws * distance.size > _MOST_CELLS:
        most = _MOST_CELLS // distance.size
        raise InputError(f"draws = {draws}: must be {_FEWEST_DRAWS} to {most} on a path of {distance.size} points")
    if seed < 0:
        raise InputError(f"seed = {seed}: must be 0 or more")
