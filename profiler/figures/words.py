"""The words of a figure: verdict, title block and notes. Everything here comes from the study; nothing is computed."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from profiler.figures.place_labels import place_words
from profiler.figures.scale import Scale, k_text, minus, position_text, required_text
from profiler.figures.text import missing_letters
from profiler.models import ConfidenceChoice, Hop, Site
from profiler.units import MINUTES_PER_YEAR

if TYPE_CHECKING:
    from profiler.availability import Availability
    from profiler.study.result import RuleResult, Study

__all__ = [
    "critical_words",
    "ground_notes",
    "hop_facts",
    "hop_rows",
    "link_assumptions",
    "link_notes",
    "minutes_text",
    "outage_words",
    "profile_notes",
    "rule_lines",
    "site_rows",
    "verdict_sentence",
    "verdict_word",
]


def verdict_word(passes: bool) -> str:
    """Give the verdict in one word."""
    return "PASSES" if passes else "FAILS"


def verdict_sentence(study: Study, scale: Scale) -> str:
    """Say why: the least surplus, where and under which rule, and whether the objective is met."""
    result = study.governing
    place = result.critical
    amount, where = scale.height_text(abs(place.surplus_m)), scale.distance_text(place.distance_m)
    failing = sum(not each.passes for each in study.rules)
    count, required = len(study.rules), required_text(result.check.rule, scale)
    if failing:
        of_rules = f"; {failing} of {count} rules fail" if count > 1 else ""
        sentence = f"{amount} short of {required}, {where} from A{of_rules}"
    else:
        rules, more = ("every rule", " or more") if count > 1 else ("the rule", "")
        sentence = f"Clears {rules} by {amount}{more}; tightest {where} from A ({required})"
    if study.verdict.has_margin is False:
        sentence += "; no fade margin"
    elif study.verdict.meets_objective is not None:
        sentence += f"; outage objective {'met' if study.verdict.meets_objective else 'not met'}"
    return sentence


def hop_facts(hop: Hop, length_m: float, scale: Scale) -> str:
    """Give the hop in a line: frequency, polarization and length."""
    return f"{hop.frequency_hz / 1e9:g} GHz, {hop.polarization} polarization · {scale.distance_text(length_m)}"


def chance_words(study: Study) -> str:
    """How sure the verdict is, or that nobody asked."""
    if study.confidence is None:
        return "not examined (no error of the terrain given)"
    chance = study.confidence.chance
    value, low, high = (100.0 * each for each in (chance.value, chance.low, chance.high))
    return f"{value:.1f} % that all rules hold ({low:.1f} to {high:.1f} % by the draws)"


def doubt_words(choice: ConfidenceChoice, scale: Scale) -> str:
    """How wrong ground and cover are taken to be, and by what draws.

    Examples
    --------
    >>> choice = ConfidenceChoice(4.0, "a guess", 150.0, cover_sigma_m=2.0, draws=500)
    >>> doubt_words(choice, Scale())
    'errors: ground sigma 4.0 m (a guess), cover sigma 2.0 m, exponential over 150.0 m; 500 draws, seed 1'
    """
    cover = [scale.height_text(choice.cover_sigma_m)] if choice.cover_sigma_m else []
    cover += [f"{choice.cover_relative_sigma:.0%} of its height"] if choice.cover_relative_sigma else []
    reach = choice.correlation_m
    parts = [
        f"ground sigma {scale.height_text(choice.terrain_sigma_m)} ({choice.terrain_source})",
        *([f"cover sigma {' and '.join(cover)}"] if cover else []),
        "alike along the path" if math.isinf(reach) else f"{choice.covariance} over {scale.height_text(reach)}",
    ]
    k = "; k by its percentiles" if choice.vary_k else ""
    return f"errors: {', '.join(parts)}{k}; {choice.draws} draws, seed {choice.seed}"


def survey_words(study: Study, scale: Scale) -> str:
    """Where a survey removes the most doubt, the most useful place first; empty where nothing is to be gained."""
    places = () if study.confidence is None else study.confidence.survey
    texts = [f"{scale.distance(place.distance_m):.2f}" for place in places]
    return f"{', '.join(texts)} {scale.distance_unit} from A" if texts else ""


def hop_rows(study: Study, scale: Scale) -> list[tuple[str, str]]:
    """Rows of the hop in the title block."""
    survey = survey_words(study, scale)
    losses = [f"{each.loss_db:.1f} dB at {k_text(each.k)}" for each in study.diffraction]
    return [
        ("heights above", study.terrain.vertical_datum or "a datum that the terrain does not state"),
        ("how sure", chance_words(study)),
        *([("survey first", survey)] if survey else []),
        *([("diffraction at k", ", ".join(losses))] if losses else []),
        *link_rows(study),
    ]


def link_rows(study: Study) -> list[tuple[str, str]]:
    """Fade margin and outage in a row each; what is not known has none."""
    rows = []
    outage = study.outage.availability
    margin_db = None if study.budget is None else study.budget.weaker()[1].fade_margin_db
    if margin_db is not None:
        rows.append(("fade margin", minus(f"{margin_db:.1f} dB")))
    if outage is not None:
        rows.append(("outage", outage_words(outage)))
    return rows


def site_rows(study: Study, scale: Scale) -> list[tuple[str, str, str]]:
    """Rows of both sites side by side: label, A, B."""
    hop, line, governing = study.hop, study.line, study.governing
    ground = [float(study.profile.ground_m[end]) for end in (0, -1)]

    def latitude(site: Site) -> str:
        return position_text(site.longitude, site.latitude).split(", ")[0]

    def longitude(site: Site) -> str:
        return position_text(site.longitude, site.latitude).split(", ")[1]

    a, b = hop.site_a, hop.site_b
    surveyed = ["surveyed" if site.surveyed_ground_m is not None else "from terrain" for site in (a, b)]
    return [
        ("latitude", latitude(a), latitude(b)),
        ("longitude", longitude(a), longitude(b)),
        ("ground", scale.height_text(ground[0]), scale.height_text(ground[1])),
        ("", surveyed[0], surveyed[1]),
        ("antenna above ground", scale.height_text(a.antenna_m), scale.height_text(b.antenna_m)),
        ("antenna above datum", scale.height_text(study.centre_a_m), scale.height_text(study.centre_b_m)),
        ("true azimuth", f"{line.azimuth_a_deg:.2f}°", f"{line.azimuth_b_deg:.2f}°"),
        (
            f"elevation, k = {k_text(governing.check.rule.k)}",
            f"{governing.elevation_a_deg:+.3f}°".replace("-", "−"),
            f"{governing.elevation_b_deg:+.3f}°".replace("-", "−"),
        ),
    ]


def rule_lines(result: RuleResult, scale: Scale) -> tuple[str, str, str]:
    """Three lines of a rule: what it asks, its verdict, and the numbers behind it."""
    place = result.critical
    rule = result.check.rule
    title = required_text(rule, scale) + (f" ({rule.label})" if rule.label else "")
    amount = scale.height_text(abs(place.surplus_m))
    verdict = f"passes, {amount} to spare" if result.passes else f"fails, {amount} short"
    ratio = f" = {place.clearance_m / place.f1_m:.2f} F1".replace("-", "−") if place.f1_m > 0 else ""
    numbers = f"clearance {scale.height_text(place.clearance_m)}{ratio}; required {scale.height_text(place.required_m)}"
    return title, f"{verdict}, {scale.distance_text(place.distance_m)} from A", numbers


def critical_words(study: Study, scale: Scale) -> str:
    """Label of the critical point."""
    place = study.governing.critical
    state = f"{scale.height_text(abs(place.surplus_m))} {'short' if place.surplus_m < 0 else 'to spare'}"
    return f"Tightest: {place_words(place, scale)}, {state}"


def ground_notes(study: Study, scale: Scale) -> list[str]:
    """Where ground and cover come from, and what was done to them."""
    terrain, spacing = study.terrain, scale.height_text(study.terrain.spacing_m)
    names = [f"{each.info.path.name} ({each.share:.0%} of the path)" for each in terrain.sources]
    count = terrain.filled_points
    filled = [f"{count} points without data were interpolated between their neighbours (hatched)"] if count else []
    differences = [
        f"surveyed ground at {site} differs from the terrain by {scale.height_text(value)}"
        for site, value in (("A", terrain.surveyed_difference_a_m), ("B", terrain.surveyed_difference_b_m))
        if value is not None
    ]
    ground = f"ground: {', '.join(names)}, {terrain.method}, points at most {spacing} apart"
    corridor = study.governing.corridor
    width = [] if corridor is None else [f"zone checked to {scale.height_text(corridor.half_width_m)} beside the path"]
    return [ground, *filled, *differences, *terrain.cover_notes, *width]


_SAID_ELSEWHERE = (
    "vertical datum: ",
    "ground between cell centres: ",
    "terrain error: ",
    "air: ",
    "availability is that of mode",
)
"""How assumptions begin that the page states in other words, or that concern the link alone."""


def profile_notes(study: Study, scale: Scale) -> list[tuple[str, list[str]]]:
    """Headings and paragraphs at the foot of the profile: what clearance rests on, what to beware of, the maker."""
    sites = (study.hop.site_a, study.hop.site_b)
    given = {f"{site.name}: {note}" for site in sites for note in site.position_notes if note.startswith("given as")}
    elsewhere = {*link_assumptions(study), *study.terrain.cover_notes, *given}
    assumed = [each for each in study.assumptions if each not in elsewhere and not each.startswith(_SAID_ELSEWHERE)]
    if study.hop.confidence is not None:
        assumed.append(doubt_words(study.hop.confidence, scale))
    return _notes(study, assumed, list(study.warnings))


def link_assumptions(study: Study) -> list[str]:
    """Collect what only the budget and the outage assume."""
    budget = () if study.budget is None else study.budget.assumptions
    outage = () if study.outage.availability is None else study.outage.availability.assumptions
    return list(dict.fromkeys([*budget, *outage]))


def link_notes(study: Study) -> list[tuple[str, list[str]]]:
    """Headings and paragraphs at the foot of the margin figure: what the budget and the outage rest on."""
    loss = study.median_diffraction
    path = [f"gases {study.air.gas_db:.2f} dB; air: {study.air.source}"]
    if loss is not None:
        path.insert(0, f"diffraction {loss.loss_db:.1f} dB by {loss.method} at k = {k_text(loss.k)}")
    inputs = [] if study.outage.availability is None else study.outage.availability.inputs
    numbers = [each.line for each in inputs]
    blocks = _notes(study, [*path, *link_assumptions(study)], list(study.warnings))
    return [("Numbers used", numbers), *blocks] if numbers else blocks


def outage_words(outage: Availability) -> str:
    """Say how long the hop is out, and by what."""
    if outage.limited_by == "no margin":
        return "out all the time: the level is below the threshold"
    return f"out {minutes_text(outage.year_minutes)}, most by {outage.limited_by}"


def minutes_text(minutes: float) -> str:
    """Write the outage of a year so that it can be grasped.

    Examples
    --------
    >>> minutes_text(0.012), minutes_text(53.2), minutes_text(3000.0), minutes_text(525_960.0)
    ('0.72 s a year', '53 min a year', '50 h a year', 'all the time')
    """
    if minutes > 0.998 * MINUTES_PER_YEAR:
        return "all the time"
    value, unit = (minutes, "min") if minutes < 600.0 else (minutes / 60.0, "h")
    if minutes < 1.0:
        value, unit = 60.0 * minutes, "s"
    return f"{value:.0f} {unit} a year" if value >= 10.0 else f"{value:.2g} {unit} a year"


def _notes(study: Study, assumed: list[str], beware: list[str]) -> list[tuple[str, list[str]]]:
    hop = study.hop
    letters = missing_letters(" ".join((hop.name, hop.site_a.name, hop.site_b.name)))
    boxes = [f"the font of this figure lacks the letters {letters}: they show as boxes"] if letters else []
    blocks = [("Assumed", assumed), ("Beware", [*beware, *boxes]), ("Made with", provenance_words(study))]
    return [(heading, paragraphs) for heading, paragraphs in blocks if paragraphs]


def provenance_words(study: Study) -> list[str]:
    """Date, version, hop file and rasters with the beginnings of their hashes; the JSON document has all of it."""
    made = study.provenance
    maker = " ".join(made.versions[0])
    digest = f" (SHA-256 {made.hop_sha256[:12]}…)" if made.hop_sha256 else ""
    rasters = ", ".join(f"{name} {digest[:12]}…" for name, _, digest in made.rasters)
    return [f"{made.created}; {maker}; hop file {made.hop_file}{digest}; rasters by SHA-256: {rasters}"]
