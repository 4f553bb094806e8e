"""Run all draws against all rules, a block of points at a time, and keep what the analysis needs of them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from profiler.confidence.draws import Doubt
from profiler.confidence.fields import Draws
from profiler.confidence.findings import Band
from profiler.models import frozen_array
from profiler.units import Float

__all__ = ["BAND", "DrawTally", "Nominal", "run_draws"]

BAND = (0.05, 0.5, 0.95)

_BLOCK = 64
"""Points handled together: 64 × 2 000 float32 draws stay in a core's cache."""


_FAR_M = np.float32(1e30)


@dataclass(frozen=True, slots=True, eq=False)
class Nominal:
    """The places without doubt: surplus (rules, m), each rule's 1/k (rules,), bulge at k = 1 and way to B, (m,)."""

    surplus_m: Float
    inverse_k: Float
    unit_bulge_m: Float
    share: Float


@dataclass(frozen=True, slots=True, eq=False)
class DrawTally:
    """What the draws gave.

    ``bands`` are those of each rule at its own k, at the path's own points. ``least_m`` and ``least_varied_m`` (rules,
    draws) are the least surpluses along the path, at the rules' own k and with k varying; ``all_m`` (draws,) is the
    least of all rules at their own k and ``critical`` its place; ``need_a_m`` and ``need_b_m`` what one antenna alone
    must be raised by, infinite where that cannot help. ``mixed_m`` holds for each cause the least surplus with that
    cause taken from the next draw (rules, draws - 1).
    """

    bands: tuple[Band, ...]
    least_m: Draws
    least_varied_m: Draws | None
    all_m: Draws
    critical: np.ndarray
    need_a_m: Draws
    need_b_m: Draws
    mixed_m: dict[str, Draws]


def run_draws(nominal: Nominal, doubt: Doubt) -> DrawTally:
    """Fold every draw over the path.

    The surplus of a draw at a place is the nominal one plus what `Doubt.parts` says, which all rules share. With k
    varying, bulge(k = 1)·(1/k - 1/k of the rule) comes off too.

    Parameters
    ----------
    nominal
        The path at its given heights.
    doubt
        The draws.
    """
    own, draws = doubt.places.own, doubt.draws
    surplus = nominal.surplus_m.astype(np.float32)
    varied = (nominal.surplus_m + nominal.unit_bulge_m * nominal.inverse_k[:, None]).astype(np.float32)
    with_k = doubt.inverse_k is not None
    all_rules = _AllRules(surplus.min(axis=0), nominal.share.astype(np.float32), draws)
    least, least_varied = _unbounded(len(surplus), draws), _unbounded(len(surplus), draws)
    causes = [name for name, here in _causes(doubt).items() if here]
    mixed = {name: _unbounded(len(surplus), draws - 1) for name in causes}
    band = np.empty((own.size, len(BAND)))
    starts = np.arange(0, own.size, _BLOCK)
    # tightest first: then few places of the later blocks can still be the tightest in any draw; only those are folded
    for start in starts[np.argsort(np.minimum.reduceat(surplus.min(axis=0), starts))]:
        block = slice(start, min(start + _BLOCK, own.size))
        index = np.arange(block.start, block.stop)
        parts = doubt.parts(index)
        fixed = _mix(parts)
        band[index[own[block]]] = _quantiles(fixed[own[block]])
        lowest = fixed.min(axis=1)
        _fold(least, surplus[:, block], lowest, parts)
        all_rules.fold(fixed, lowest, index)
        if doubt.inverse_k is not None:
            parts["k"] = -nominal.unit_bulge_m[block, None].astype(np.float32) * doubt.inverse_k
            _fold(least_varied, varied[:, block], lowest + parts["k"].min(axis=1), parts)
        lowest = sum((part.min(axis=1) for part in parts.values()), start=np.zeros(index.size, np.float32))
        for name, folded in mixed.items():
            _fold(folded, (varied if with_k else surplus)[:, block], lowest, parts, name)
    return DrawTally(
        bands=tuple(Band(*(frozen_array(row + part) for part in band[own].T)) for row in nominal.surplus_m[:, own]),
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

    def fold(self, random: Draws, lowest: Draws, index: NDArray[np.intp]) -> None:
        lift_a, lift_b = 1.0 - self.share[index], self.share[index]
        floor = self.surplus_m[index] + lowest
        open_ = floor < self.least_m.max()
        for need, lift in ((self.need_a_m, lift_a), (self.need_b_m, lift_b)):
            open_ |= -floor > np.clip(need.min(), -_FAR_M, _FAR_M) * lift
        rows = np.flatnonzero(open_)
        if not rows.size:
            return
        surplus = random[rows] + self.surplus_m[index[rows], None]
        where = surplus.argmin(axis=0)
        least = np.take_along_axis(surplus, where[None], axis=0)[0]
        lower = least < self.least_m
        self.critical[lower] = index[rows[where[lower]]]
        np.minimum(self.least_m, least, out=self.least_m)
        self._need(self.need_a_m, surplus, lift_a[rows])
        self._need(self.need_b_m, surplus, lift_b[rows])

    @staticmethod
    def _need(need: Draws, surplus: Draws, lift: Draws) -> None:
        """Raise the need to what these points ask for; where the antenna lifts nothing, it cannot help."""
        lifted = lift > 0
        np.maximum(need, -(surplus[lifted] / lift[lifted, None]).min(axis=0, initial=np.inf), out=need)
        need[(surplus[~lifted] < 0).any(axis=0)] = np.inf


def _causes(doubt: Doubt) -> dict[str, bool]:
    """Say which causes of doubt are present."""
    return {"terrain": doubt.moves_ground, "cover": doubt.cover is not None, "k": doubt.inverse_k is not None}


def _mix(parts: dict[str, Draws], cause: str | None = None) -> Draws:
    """Sum the parts, one cause taken from the next draw if one is named."""
    ahead, behind = (slice(None), slice(None)) if cause is None else (slice(1, None), slice(None, -1))
    total, *rest = (part[:, ahead if name == cause else behind] for name, part in parts.items())
    for part in rest:
        total = total + part
    return total


def _unbounded(rules: int, draws: int) -> Draws:
    return np.full((rules, draws), np.inf, dtype=np.float32)


def _fold(least: Draws, surplus: Draws, lowest: Draws, parts: dict[str, Draws], cause: str | None = None) -> None:
    """Lower each rule's least surplus by those places of a block whose lowest random part can lower it in some draw."""
    rows = np.flatnonzero((surplus + lowest < least.max(axis=1, keepdims=True)).any(axis=0))
    if not rows.size:
        return
    random = _mix({name: part[rows] for name, part in parts.items()}, cause)
    for rule, nominal in enumerate(surplus[:, rows]):
        np.minimum(least[rule], (random + nominal[:, None]).min(axis=0), out=least[rule])


def _quantiles(random: Draws) -> Draws:
    """Return the band's order statistics, (points, 3); with vector instructions a whole sort is the fastest way."""
    draws = random.shape[1]
    return np.sort(random, axis=1)[:, [min(draws - 1, int(chance * draws)) for chance in BAND]]
