"""Run all draws against all rules, a block of points at a time, and keep what the analysis needs of them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from profiler.confidence.draws import Doubt
from profiler.confidence.fields import Draws
from profiler.confidence.findings import Band
from profiler.models import frozen_array
from profiler.units import Float

__all__ = ["BAND", "DrawTally", "Nominal", "run_draws"]

BAND = (0.05, 0.5, 0.95)

_BLOCK = 64
"""Points handled together: 64 × 2 000 float32 draws stay in a core's cache."""


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
    mixed: dict[str, Draws] = {}
    band = np.empty((own.size, len(BAND)))
    for low in range(0, own.size, _BLOCK):
        block = slice(low, min(low + _BLOCK, own.size))
        index = np.arange(block.start, block.stop)
        parts = doubt.parts(index)
        fixed = parts["terrain"] + parts["cover"] if "cover" in parts else parts["terrain"]
        band[index[own[block]]] = _quantiles(fixed[own[block]])
        _fold(least, fixed, surplus[:, block])
        all_rules.fold(fixed, block)
        if doubt.inverse_k is not None:
            parts["k"] = -nominal.unit_bulge_m[block, None].astype(np.float32) * doubt.inverse_k
            _fold(least_varied, fixed + parts["k"], varied[:, block])
        for name in parts if doubt.moves_ground else [name for name in parts if name != "terrain"]:
            mixed.setdefault(name, _unbounded(len(surplus), draws - 1))
            _fold(mixed[name], _mix(parts, name), (varied if with_k else surplus)[:, block])
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
