"""Named sets of clearance rules, named by their source or by what they ask; nothing is taken when none is named."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import Literal

from profiler.errors import InputError
from profiler.models import Rule
from profiler.units import K_MEDIAN

__all__ = ["PRESETS", "Preset", "PresetRule", "expand_preset"]


@dataclass(frozen=True, slots=True)
class PresetRule:
    """One rule of a preset; k is a number, or the median or low k that the hop file gives."""

    k: float | Literal["median", "low"]
    fresnel_fraction: float
    margin_m: float = 0.0


@dataclass(frozen=True, slots=True)
class Preset:
    """A set of rules with what it is for and where it comes from; ``shortest_m`` is the path length it begins at."""

    label: str
    source: str
    rules: tuple[PresetRule, ...]
    shortest_m: float = 0.0

    @property
    def needs_low_k(self) -> bool:
        """Whether the hop file must give the low k too."""
        return any(rule.k == "low" for rule in self.rules)


_P530 = "Rec. ITU-R P.530-18 §2.2 (from memory)"
_HANDBOOKS = "handbooks of the 1970s, from memory: no edition is at hand to cite"

PRESETS: Mapping[str, Preset] = MappingProxyType(
    {
        "p530-isolated": Preset(
            "temperate climate, the path is blocked by one isolated obstacle",
            _P530,
            (PresetRule("median", 1.0), PresetRule("low", 0.0)),
        ),
        "p530-extended": Preset(
            "temperate climate, the path is blocked along an extended part of it",
            _P530,
            (PresetRule("median", 1.0), PresetRule("low", 0.3)),
        ),
        "p530-tropical": Preset(
            "tropical climate, paths longer than about 30 km",
            _P530,
            (PresetRule("median", 1.0), PresetRule("low", 0.6)),
            shortest_m=30e3,
        ),
        "1.0-and-0.3-f1": Preset(
            "fixed k, whatever the climate", _HANDBOOKS, (PresetRule(4.0 / 3.0, 1.0), PresetRule(2.0 / 3.0, 0.3))
        ),
        "0.6-f1-plus-3m": Preset("fixed k, whatever the climate", _HANDBOOKS, (PresetRule(1.0, 0.6, 3.0),)),
    }
)
"""The presets by name; `expand_preset` turns one into rules."""


def expand_preset(name: str, *, median_k: float = K_MEDIAN, low_k: float | None = None) -> tuple[Rule, ...]:
    """Spell out a preset as rules.

    Parameters
    ----------
    name
        A name of `PRESETS`.
    median_k
        Median effective-earth-radius factor of the place, more than 0.
    low_k
        k exceeded for about 99.9 % of the worst month, which Rec. ITU-R P.530 Figure 2 gives by path length; more
        than 0. Needed by the presets after P.530, and refused by the others.

    Returns
    -------
    tuple of Rule
        Each labelled with the preset's name and which k it stands for.

    Raises
    ------
    InputError
        For an unknown name, or a low k that is missing, not below the median or of no use.

    Examples
    --------
    >>> for rule in expand_preset("p530-extended", low_k=0.8):
    ...     print(f"k {rule.k:.3f}: {rule.fresnel_fraction} F1 + {rule.margin_m} m ({rule.label})")
    k 1.333: 1.0 F1 + 0.0 m (p530-extended, median k)
    k 0.800: 0.3 F1 + 0.0 m (p530-extended, low k)

    Notes
    -----
    Sources: in the table; P.530 asks for the greater height of its two rules, which is what holding both does.
    """
    if name not in PRESETS:
        raise InputError(field="preset", value=name, allowed=f"one of {', '.join(PRESETS)}")
    preset = PRESETS[name]
    if preset.needs_low_k and low_k is None:
        told = (
            "the k exceeded for about 99.9 % of the worst month, which Rec. ITU-R P.530 Figure 2 gives by path length"
        )
        raise InputError(field="low_k", allowed=f"given beside preset {name!r}: {told}")
    if low_k is not None and not preset.needs_low_k:
        raise InputError(field="low_k", value=low_k, allowed=f"left out beside preset {name!r}, which fixes its k")
    if low_k is not None and not low_k < median_k:
        raise InputError(field="low_k", value=low_k, allowed=f"below the median k of {median_k:.4g}")
    values = {"median": median_k, "low": low_k if low_k is not None else median_k}
    return tuple(
        Rule(
            k=values[rule.k] if isinstance(rule.k, str) else rule.k,
            fresnel_fraction=rule.fresnel_fraction,
            margin_m=rule.margin_m,
            label=f"{name}, {rule.k} k" if isinstance(rule.k, str) else name,
        )
        for rule in preset.rules
    )
