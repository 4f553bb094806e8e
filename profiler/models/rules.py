"""What must be clear."""

from dataclasses import dataclass
from typing import Annotated, ClassVar, Literal

from profiler.models.stated import Bounds, Forms, Key, Stated

__all__ = ["PresetName", "Rule", "RulesTable"]


PresetName = Literal["p530-isolated", "p530-extended", "p530-tropical", "1.0-and-0.3-f1", "0.6-f1-plus-3m"]


@dataclass(frozen=True, slots=True)
class Rule(Stated):
    """One clearance requirement: at factor k, ``fresnel_fraction`` of F1 plus ``margin_m`` must be free."""

    k: Annotated[
        float,
        Key("effective earth radius factor of the rule", also=("k_factor",), least=0.1, most=100, example=1.0),
        Bounds(above=0, infinite=True),
    ]
    fresnel_fraction: Annotated[
        float,
        Key(
            "of the radius of the first Fresnel zone", also=("fresnel", "f1", "fraction"), least=0, most=10, example=0.6
        ),
    ]
    margin_m: Annotated[float, Key("to keep free besides", least=-100, most=1000, example=5)] = 0.0
    label: Annotated[str, Key("what the rule is called", left_out="no name", example="room for the trees to grow")] = ""


@dataclass(frozen=True, slots=True)
class RulesTable(Stated):
    """How a hop file states its rules: a preset, rules of its own, or both."""

    FORMS: ClassVar = (Forms((("preset",), ("rule",)), only=False),)

    preset: Annotated[
        PresetName | None,
        Key(
            "a named set of rules, beside [[rules.rule]] of your own or without",
            left_out="none",
            former=(("high-reliability", "1.0-and-0.3-f1"), ("light-route", "0.6-f1-plus-3m")),
            example="1.0-and-0.3-f1",
        ),
    ] = None
    median_k: Annotated[
        float | None,
        Key(
            "of the place",
            least=0.1,
            most=100,
            left_out="4/3, or that of the climate maps for losses and angles",
            example=1.36,
        ),
    ] = None
    low_k: Annotated[
        float | None,
        Key(
            "for the p530 presets: exceeded for 99.9 % of the worst month, P.530 Figure 2",
            least=0.1,
            most=100,
            left_out="none",
            example=0.8,
        ),
    ] = None
    rule: Annotated[tuple[Rule, ...], Key("rules of your own, each with k and fresnel_fraction", left_out="none")] = ()
