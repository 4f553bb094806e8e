"""What to do next, in words."""

from __future__ import annotations

from typing import TYPE_CHECKING

from profiler.remarks import chance_text, db_text, listed
from profiler.study.next_step import (
    AddMargin,
    Counter,
    FreePositions,
    GiveInputs,
    GoElsewhere,
    LowerCover,
    RaiseAntennas,
    StateDoubt,
    Step,
    Survey,
    TakeMode,
)
from profiler.words.scale import Scale

if TYPE_CHECKING:
    from collections.abc import Sequence

    from profiler.study.result import Study

__all__ = ["step_words", "steps_words", "survey_words"]

_MOST_PLACES = 3
_COUNTERS = {
    "multipath": "use space diversity or a shorter hop, since no margin beats the multipath here",
    "selective": "use space diversity, an equalizer or a narrower mode, since no margin beats selective fading",
    "rain": "take a lower band or a shorter hop, since no margin beats the rain here",
    "obstruction": "raise the antennas, since no margin beats the obstruction at low k",
    "no margin": "find more level first: there is no margin at all",
}


def survey_words(step: Survey, scale: Scale) -> str:
    """Name the places to survey, the most useful first.

    Examples
    --------
    >>> from profiler.confidence import SurveyPlace
    >>> spur = SurveyPlace(40, 3892.0, 3840.0, 3960.0, None, 0.5, 0.6)
    >>> survey_words(Survey((spur, SurveyPlace(99, 8800.0, 8800.0, 8800.0, "B", 0.3, 0.1))), Scale())
    '3.89 km from A and at site B'
    """
    places = [
        f"at site {each.site}" if each.site else f"{scale.distance_text(each.distance_m)} from A"
        for each in step.places[:_MOST_PLACES]
    ]
    return listed(places)


def _raise_words(step: RaiseAntennas, study: Study, scale: Scale) -> str:
    hop = study.hop
    chance = "" if step.chance is None else f" for a chance of {chance_text(step.chance)}"
    a_m, b_m = hop.site_a.antenna_m + step.a_by_m, hop.site_b.antenna_m + step.b_by_m
    to = (scale.raise_text(a_m), scale.raise_text(b_m))
    if step.a_by_m == step.b_by_m:
        return f"raise both antennas by {scale.raise_text(step.a_by_m)}, A to {to[0]} and B to {to[1]}{chance}"
    ends = [
        f"antenna {name} by {scale.raise_text(by_m)} to {height}"
        for name, by_m, height in zip("AB", (step.a_by_m, step.b_by_m), to, strict=True)
        if by_m > 0
    ]
    return f"raise {listed(ends)}{chance}"


def step_words(step: Step, study: Study, scale: Scale) -> str:
    """Say one thing to do, as an order without its capital and its full stop."""
    match step:
        case RaiseAntennas():
            words = _raise_words(step, study, scale)
        case LowerCover():
            words = f"lower the cover {_cut_words(step, scale)}"
        case GoElsewhere():
            band = ", or a higher band with a narrower zone" if step.band else ""
            towers = study.hop.heights
            limits = [scale.height_text(tower.highest_m) for tower in (towers.tower_a, towers.tower_b)]
            words = (
                f"look for a relay, a passive reflector or another site{band}: no height within the towers' limits,"
                f" A {limits[0]} and B {limits[1]}, clears"
            )
        case FreePositions():
            words = "free positions that are taken: the towers are high enough"
        case TakeMode():
            words = f"take mode {step.mode}"
        case AddMargin():
            words = f"add {db_text(step.missing_db)} of fade margin by larger antennas, more power or less line loss"
        case Counter():
            words = _COUNTERS[step.limit]
        case Survey():
            words = f"survey the ground {survey_words(step, scale)}"
        case GiveInputs():
            words = f"give what is lacking: {'; '.join(map(scale.text, step.why))}"
        case StateDoubt():
            words = "state the error of the terrain in the hop file, so that the chance of clearing is known"
    return words


def _cut_words(step: LowerCover, scale: Scale) -> str:
    cuts = [f"{scale.distance_text(cut.distance_m)} from A by {scale.raise_text(cut.by_m)}" for cut in step.cuts]
    more = len(cuts) - _MOST_PLACES
    return listed([*cuts[:_MOST_PLACES], f"{more} places more"] if more > 0 else cuts)


def steps_words(study: Study, scale: Scale, steps: Sequence[Step] | None = None) -> str:
    """Say what to do next, in one sentence; any one of the ways in it does."""
    chosen = study.verdict.next_step if steps is None else steps
    if not chosen:
        return "Confirm sites, structures and path on the ground before building."
    before = "before building, " if study.verdict.outcome == "passes" and isinstance(chosen[0], Survey) else ""
    sentence = before + "; or ".join(step_words(each, study, scale) for each in chosen)
    return f"{sentence[0].upper()}{sentence[1:].rstrip('.')}."
