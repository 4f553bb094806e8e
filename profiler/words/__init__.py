"""The one place that puts results into words: rules, places, verdict, next step, outage, numbers with their units.

Terminal, figures and documents take their words from here, in metres and kilometres or in feet and miles.
"""

from profiler.words.heights_words import (
    least_words,
    pair_text,
    pair_words,
    plan_verdict_words,
    remedies_words,
    requirement_text,
    slack_words,
    sure_words,
)
from profiler.words.input_words import input_words
from profiler.words.next_step_words import step_words, steps_words, survey_words
from profiler.words.outage_words import (
    achieved_text,
    asked_text,
    limit_text,
    margin_words,
    mode_text,
    needs_text,
    objective_words,
    outage_sentence,
)
from profiler.words.places import (
    along_text,
    beside_text,
    place_text,
    rule_text,
    spare_text,
    spot_text,
    stands_text,
    where_text,
)
from profiler.words.scale import METRES, Scale
from profiler.words.verdict_words import (
    chance_words,
    clearance_words,
    ends_words,
    feet_words,
    headline,
    held_words,
    outcome_word,
    reason_words,
    verdict_words,
)

__all__ = [
    "METRES",
    "Scale",
    "achieved_text",
    "along_text",
    "asked_text",
    "beside_text",
    "chance_words",
    "clearance_words",
    "ends_words",
    "feet_words",
    "headline",
    "held_words",
    "input_words",
    "least_words",
    "limit_text",
    "margin_words",
    "mode_text",
    "needs_text",
    "objective_words",
    "outage_sentence",
    "outcome_word",
    "pair_text",
    "pair_words",
    "place_text",
    "plan_verdict_words",
    "reason_words",
    "remedies_words",
    "requirement_text",
    "rule_text",
    "slack_words",
    "spare_text",
    "spot_text",
    "stands_text",
    "step_words",
    "steps_words",
    "sure_words",
    "survey_words",
    "verdict_words",
    "where_text",
]
