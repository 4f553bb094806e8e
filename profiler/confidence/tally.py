"""Run all draws against all rules, a block of points at a time, and keep what the analysis needs of them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from profiler.confidence.fields import Draws
from profiler.confidence.findings import Band
from profiler.models import frozen_array
from profiler.units import Float

__all__ = ["BAND", "Doubt", "DrawTally", "Nominal", "run_draws"]

BAND = (0.05, 0.5, 0.95)

_BLOCK = 64
"""Points handled together: 64 × 2 000 float32 draws stay in a core's cache."""


@dataclass(frozen=True, slots=True, eq=False)
class Nominal:
    """The path without doubt: surplus (rules, n), each rule's 1/k (rules,), bulge at k = 1 and way to B (0…1), (n,)."""

    surplus_m: Float
    inverse_k: Float
    unit_bulge_m: Float
    share: Float


@dataclass(frozen=True, slots=True, eq=False)
class Doubt:
    """The draws: errors are true minus given height; None where a cause of doubt is absent.

    ``ground_m`` is (n, draws) and always present; ``cover_m`` is (covered points, draws) with ``covered`` the indices
    of those points, ascending; ``inverse_k`` is (draws,).
    """

    ground_m: Draws
    cover_m: Draws | None
    covered: np.ndarray
    inverse_k: Draws | None


@dataclass(frozen=True, slots=True, eq=False)
class DrawTally:
    """What the draws gave.

    ``fixed`` are the bands of each rule at its own k, ``varied`` with k varying. ``least_m`` and ``least_varied_m``
    (rules, draws) are the least surpluses along the path; ``all_m`` (draws,) is the least of all rules at their own k
    and ``critical`` its point; ``need_a_m`` and ``need_b_m`` what one antenna alone must be raised by, infinite where
    that cannot help. ``mixed_m`` holds for each cause the least surplus with that cause taken from the next draw
    (rules, draws - 1).
    """

    fixed: tuple[Band, ...]
    varied: tuple[Band, ...]
    least_m: Draws
    least_varied_m: Draws | None
    all_m: Draws
    critical: np.ndarray
    need_a_m: Draws
    need_b_m: Draws
    mixed_m: dict[str, Draws]


def run_draws(nominal: Nominal, doubt: Doubt) -> DrawTally:
    """Fold every draw over the path.

    The surplus of a draw at a point is the nominal one plus (1 - t)·eA + t·eB - e - c: the antennas stand on the
    ground, so the ray moves with the ground error at its ends, and the point's own ground and cover error count
    against it. All rules share that random part. With k varying, bulge(k = 1)·(1/k - 1/k of the rule) comes off too.

    Parameters
    ----------
    nominal
        The path at its given heights.
    doubt
        The draws.
    """
    points, draws = doubt.ground_m.shape
    surplus = nominal.surplus_m.astype(np.float32)
    varied = (nominal.surplus_m + nominal.unit_bulge_m * nominal.inverse_k[:, None]).astype(np.float32)
    with_k = doubt.inverse_k is not None
    all_rules = _AllRules(surplus.min(axis=0), nominal.share.astype(np.float32), draws)
    least, least_varied = _unbounded(len(surplus), draws), _unbounded(len(surplus), draws)
    mixed = {name: _unbounded(len(surplus), draws - 1) for name in _causes(doubt)}
    band, band_varied = np.empty((points, len(BAND))), np.empty((points, len(BAND)))
    for low in range(0, points, _BLOCK):
        block = slice(low, min(low + _BLOCK, points))
        parts = _parts(nominal, doubt, block)
        fixed = parts["terrain"] + parts["cover"] if "cover" in parts else parts["terrain"]
        band[block] = _quantiles(fixed)
        _fold(least, fixed, surplus[:, block])
        all_rules.fold(fixed, block)
        if with_k:
            moving = fixed + parts["k"]
            band_varied[block] = _quantiles(moving)
            _fold(least_varied, moving, varied[:, block])
        for name, folded in mixed.items():
            _fold(folded, _mix(parts, name), (varied if with_k else surplus)[:, block])
    return DrawTally(
        fixed=_bands(nominal.surplus_m, band),
        varied=_bands(varied.astype(float), band_varied) if with_k else (),
        least_m=least,
        least_varied_m=least_varied if with_k else None,
        all_m=all_rules.least_m,
        critical=all_rules.critical,
        need_a_m=all_rules.need_a_m,
        need_b_m=all_rules.need_b_m,
        mixed_m=mixed,
    )


class _AllRules:
    """Running least surplus of all rules together, its point, and what each antenna alone would need."""

    def __init__(self, surplus_m: Draws, share: Draws, draws: int) -> None:
        self.surplus_m, self.share = surplus_m, share
        self.least_m = np.full(draws, np.inf, dtype=np.float32)
        self.critical = np.zeros(draws, dtype=np.int64)
        self.need_a_m = np.full(draws, -np.inf, dtype=np.float32)
        self.need_b_m = np.full(draws, -np.inf, dtype=np.float32)

    def fold(self, random: Draws, block: slice) -> None:
        surplus = random + self.surplus_m[block, None]
        where = surplus.argmin(axis=0)
        least = np.take_along_axis(surplus, where[None], axis=0)[0]
        lower = least < self.least_m
        self.critical[lower] = block.start + where[lower]
        np.minimum(self.least_m, least, out=self.least_m)
        self._need(self.need_a_m, surplus, 1.0 - self.share[block])
        self._need(self.need_b_m, surplus, self.share[block])

    @staticmethod
    def _need(need: Draws, surplus: Draws, lift: Draws) -> None:
        """Raise the need to what these points ask for; where the antenna lifts nothing, it cannot help."""
        lifted = lift > 0
        np.maximum(need, -(surplus[lifted] / lift[lifted, None]).min(axis=0, initial=np.inf), out=need)
        need[(surplus[~lifted] < 0).any(axis=0)] = np.inf


def _causes(doubt: Doubt) -> tuple[str, ...]:
    """Name the causes of doubt that are present."""
    present = {"terrain": doubt.ground_m.any(), "cover": doubt.cover_m is not None, "k": doubt.inverse_k is not None}
    return tuple(name for name, here in present.items() if here)


def _parts(nominal: Nominal, doubt: Doubt, block: slice) -> dict[str, Draws]:
    """Return what each cause adds to the surplus in a block of points."""
    share = nominal.share[block, None].astype(np.float32)
    parts = {"terrain": (1 - share) * doubt.ground_m[0] + share * doubt.ground_m[-1] - doubt.ground_m[block]}
    if doubt.cover_m is not None:
        low, high = np.searchsorted(doubt.covered, (block.start, block.stop))
        parts["cover"] = np.zeros_like(parts["terrain"])
        parts["cover"][doubt.covered[low:high] - block.start] -= doubt.cover_m[low:high]
    if doubt.inverse_k is not None:
        parts["k"] = -nominal.unit_bulge_m[block, None].astype(np.float32) * doubt.inverse_k
    return parts


def _mix(parts: dict[str, Draws], cause: str) -> Draws:
    """Sum the parts with one cause taken from the next draw."""
    total, *rest = (part[:, 1:] if name == cause else part[:, :-1] for name, part in parts.items())
    for part in rest:
        total = total + part
    return total


def _unbounded(rules: int, draws: int) -> Draws:
    return np.full((rules, draws), np.inf, dtype=np.float32)


def _fold(least: Draws, random: Draws, surplus: Draws) -> None:
    """Lower each rule's least surplus by a block of points."""
    for rule, nominal in enumerate(surplus):
        np.minimum(least[rule], (random + nominal[:, None]).min(axis=0), out=least[rule])


def _quantiles(random: Draws) -> Draws:
    """Return the band's order statistics, (points, 3); with vector instructions a whole sort is the fastest way."""
    draws = random.shape[1]
    return np.sort(random, axis=1)[:, [min(draws - 1, int(chance * draws)) for chance in BAND]]


def _bands(surplus_m: Float, quantiles: Float) -> tuple[Band, ...]:
    """Add to each rule's own surplus the quantiles of the random part that all rules share."""
    return tuple(Band(*(frozen_array(row + part) for part in quantiles.T)) for row in surplus_m)
