"""The draws of every error along a path, and what they do to the surplus of a ray between antennas on that ground."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from profiler.checks import positive
from profiler.confidence.fields import Draws, draw_inverse_k
from profiler.confidence.nodes import CarriedField, Places, draw_carried, join_places, node_distances
from profiler.errors import InputError
from profiler.models import ConfidenceChoice
from profiler.units import Float

__all__ = ["Doubt", "draw_doubt"]

_MOST_NODES = 5000
"""Where the path is longer than so many cells, nodes stand further apart, unless a step is asked for."""

_LOOKS = 4
"""Places in each step: the greatest error of a step is then at most 1 % over the greatest that is looked at."""

_MOST_NUMBERS = 250_000_000
"""Of a field: 1 GB. What a plan keeps of them is no more in any but the flattest country."""


@dataclass(frozen=True, slots=True, eq=False)
class Doubt:
    """The draws of a path's errors (true minus given height), and where they are looked at.

    ``cover_m`` and ``cover_sigma_m`` (m,) are the cover and its error's standard deviation at the places. ``terrain``
    and ``cover`` are fields of variance 1, ``terrain_sigma_m`` scales the one. ``offset_m`` is what all ground of the
    raster shares, ``site_a_m`` and ``site_b_m`` the error of the ground under the antennas, ``inverse_k`` is 1/k,
    (draws,) each. None where a cause of doubt is absent.
    """

    places: Places
    cover_m: Float
    cover_sigma_m: Float
    terrain: CarriedField | None
    terrain_sigma_m: float
    offset_m: Draws
    site_a_m: Draws
    site_b_m: Draws
    cover: CarriedField | None
    inverse_k: Draws | None

    @property
    def draws(self) -> int:
        """How many draws there are."""
        return self.offset_m.size

    @property
    def moves_ground(self) -> bool:
        """Whether any ground is in doubt."""
        rest = (self.offset_m, self.site_a_m, self.site_b_m)
        return self.terrain is not None or any(bool(each.any()) for each in rest)

    def ground_error(self, index: NDArray[np.intp]) -> Draws:
        """Error of the ground at some of the places, (k, draws); at the ends it is that of the sites."""
        error: Draws = np.repeat(self.offset_m[None], index.size, axis=0)
        if self.terrain is not None:
            error += np.float32(self.terrain_sigma_m) * self.terrain.at(self.places.distance_m[index])
        error[index == 0], error[index == self.places.own.size - 1] = self.site_a_m, self.site_b_m
        return error

    def cover_error(self, index: NDArray[np.intp]) -> Draws | None:
        """Error of the cover's height at some of the places, (k, draws); none grows, and none sinks below height 0."""
        if self.cover is None:
            return None
        error = self.cover.at(self.places.distance_m[index])
        error *= self.cover_sigma_m[index, None].astype(np.float32)
        np.maximum(error, -self.cover_m[index, None].astype(np.float32), out=error)
        return error

    def parts(self, index: NDArray[np.intp]) -> dict[str, Draws]:
        """Give what terrain and cover add to the surplus at some of the places, at any heights, (k, draws) each.

        For terrain (1 - t)·eA + t·eB - e: the antennas stand on the ground and move with it, and the point's own error
        counts against the ray. What all ground shares cancels, unless a site is surveyed.
        """
        share = (self.places.distance_m[index] / self.places.distance_m[-1])[:, None].astype(np.float32)
        parts = {"terrain": (1 - share) * self.site_a_m + share * self.site_b_m - self.ground_error(index)}
        cover = self.cover_error(index)
        return parts if cover is None else parts | {"cover": -cover}

    def surface_error(self, index: NDArray[np.intp]) -> Draws:
        """Error of what a survey measures at some of the places: ground at the sites, the top of the cover between."""
        error, cover = self.ground_error(index), self.cover_error(index)
        if cover is not None:
            between = (index > 0) & (index < self.places.own.size - 1)
            error[between] += cover[between]
        return error

    def surplus_errors(self, index: NDArray[np.intp]) -> Draws:
        """Give what each draw adds to the surplus at some of the places, at each rule's own k, (k, draws)."""
        terrain, *cover = self.parts(index).values()
        return terrain + cover[0] if cover else terrain


def draw_doubt(
    distance_m: Float,
    cover_m: Float,
    choice: ConfidenceChoice,
    *,
    cell_m: float,
    surveyed: tuple[bool, bool] = (False, False),
    k_percentiles: Sequence[tuple[float, float]] = (),
) -> Doubt:
    """Draw every error along a path; every cause has its own stream of unit draws, which its sigma scales.

    Parameters
    ----------
    distance_m, cover_m
        The path, (n,) each: distances from A, and cover above ground, 0 m or more.
    choice, cell_m, surveyed, k_percentiles
        As in `profiler.confidence.assess`.

    Returns
    -------
    Doubt

    Raises
    ------
    InputError
        If a value is out of range, or the draws would not fit in memory.
    """
    if not np.all(cover_m >= 0):
        raise InputError(f"cover_m: least value {float(cover_m.min())} m: must be 0 m or more everywhere, no gaps")
    draws, length_m = choice.draws, float(distance_m[-1])
    node_m = node_distances(length_m, _step(choice, length_m, float(positive("cell_m", cell_m, "m"))))
    places = join_places(distance_m, node_distances(length_m, (node_m[1] - node_m[0]) / _LOOKS))
    terrain_rng, site_rng, cover_rng, k_rng, offset_rng = (
        np.random.default_rng(child) for child in np.random.SeedSequence(choice.seed).spawn(5)
    )
    terrain = cover = None
    if choice.terrain_sigma_m > 0:
        terrain = draw_carried(node_m, choice.correlation_m, choice.covariance, draws, terrain_rng)
    offset = np.float32(choice.terrain_offset_sigma_m) * offset_rng.standard_normal(draws, dtype=np.float32)
    site_a, site_b = _site_errors(choice, surveyed, offset, terrain, site_rng)
    heights = places.carry(cover_m)
    cover_sigma = np.where(heights > 0, np.hypot(choice.cover_sigma_m, choice.cover_relative_sigma * heights), 0.0)
    if cover_sigma.any():
        reach = choice.correlation_m if choice.cover_correlation_m is None else choice.cover_correlation_m
        cover = draw_carried(node_m, reach, choice.covariance, draws, cover_rng)
    inverse_k = draw_inverse_k(k_percentiles, draws, k_rng) if len(k_percentiles) else None
    return Doubt(
        places=places,
        cover_m=heights,
        cover_sigma_m=cover_sigma,
        terrain=terrain,
        terrain_sigma_m=choice.terrain_sigma_m,
        offset_m=offset,
        site_a_m=site_a,
        site_b_m=site_b,
        cover=cover,
        inverse_k=inverse_k,
    )


def _step(choice: ConfidenceChoice, length_m: float, cell_m: float) -> float:
    """Step of the nodes; more numbers than fit in memory are refused."""
    step_m = max(cell_m, length_m / _MOST_NODES) if choice.step_m is None else choice.step_m
    along = f"along this path of {length_m / 1e3:.2f} km"
    if choice.step_m is None and choice.draws * length_m > _MOST_NUMBERS * step_m:
        most = int(_MOST_NUMBERS * step_m / length_m)
        raise InputError(f"draws = {choice.draws}: must be at most {most} at steps of {step_m:.3g} m {along}")
    if choice.draws * length_m > _MOST_NUMBERS * step_m:
        least_m = length_m * choice.draws / _MOST_NUMBERS
        raise InputError(f"step_m = {step_m:g}: must be at least {least_m:.3g} m for {choice.draws} draws {along}")
    return step_m


def _site_errors(
    choice: ConfidenceChoice,
    surveyed: tuple[bool, bool],
    offset: Draws,
    terrain: CarriedField | None,
    rng: np.random.Generator,
) -> tuple[Draws, Draws]:
    """Error of the ground at A and B: of the survey where there is one, else of the raster with its offset."""
    own = np.float32(choice.site_sigma_m or 0.0) * rng.standard_normal((2, offset.size), dtype=np.float32)
    apart = [known or choice.site_sigma_m is not None for known in surveyed]
    raster = np.zeros_like(own) if terrain is None else np.float32(choice.terrain_sigma_m) * terrain.node[[0, -1]]
    site_a, site_b = np.where(np.array(apart)[:, None], own, raster + offset)
    return site_a, site_b
