"""The title block and the notes of a figure: rows and paragraphs out of the study, in the words of `profiler.words`."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from profiler.figures.text import missing_letters
from profiler.models import ConfidenceChoice, Hop, Site
from profiler.remarks import Note, Topic, db_text, k_text, minus, percent_text, position_text
from profiler.study.next_step import Survey
from profiler.words import (
    Scale,
    chance_words,
    input_words,
    outage_sentence,
    place_text,
    rule_text,
    spare_text,
    survey_words,
    where_text,
)

if TYPE_CHECKING:
    from profiler.study.result import RuleResult, Study

__all__ = [
    "ground_notes",
    "hop_facts",
    "hop_rows",
    "link_assumptions",
    "link_notes",
    "profile_notes",
    "rule_lines",
    "site_rows",
    "tightest_words",
]

_SAID_ON_THE_PAGE: frozenset[Topic] = frozenset({"ground", "cover", "confidence", "air", "budget", "availability"})
"""Topics of assumptions that the title block states in other words, or that concern the link alone."""


def hop_facts(hop: Hop, length_m: float, scale: Scale) -> str:
    """Give the hop in a line: frequency, polarization and length."""
    return f"{hop.frequency_hz / 1e9:g} GHz, {hop.polarization} polarization · {scale.distance_text(length_m)}"


def doubt_words(choice: ConfidenceChoice, scale: Scale) -> str:
    """How wrong ground and cover are taken to be, and by what draws.

    Examples
    --------
    >>> choice = ConfidenceChoice(4.0, "a guess", 150.0, cover_sigma_m=2.0, draws=500)
    >>> doubt_words(choice, Scale())
    'errors: ground sigma 4.0 m (a guess), cover sigma 2.0 m, exponential over 150.0 m; 500 draws, seed 1'
    """
    cover = [scale.height_text(choice.cover_sigma_m)] if choice.cover_sigma_m else []
    cover += [f"{percent_text(choice.cover_relative_sigma)} of its height"] if choice.cover_relative_sigma else []
    reach = choice.correlation_m
    parts = [
        f"ground sigma {scale.height_text(choice.terrain_sigma_m)} ({choice.terrain_source})",
        *([f"cover sigma {' and '.join(cover)}"] if cover else []),
        "alike along the path" if math.isinf(reach) else f"{choice.covariance} over {scale.height_text(reach)}",
    ]
    k = "; k by its percentiles" if choice.vary_k else ""
    return f"errors: {', '.join(parts)}{k}; {choice.draws} draws, seed {choice.seed}"


def hop_rows(study: Study, scale: Scale) -> list[tuple[str, str]]:
    """Rows of the hop in the title block."""
    survey = [survey_words(step, scale) for step in study.verdict.next_step if isinstance(step, Survey)]
    losses = [f"{db_text(each.loss_db)} at {k_text(each.k)}" for each in study.diffraction]
    return [
        ("heights above", study.terrain.vertical_datum or "a datum that the terrain does not state"),
        ("how sure", chance_words(study.verdict.chance, study.verdict.minimum_chance)),
        *(("survey first", places) for places in survey),
        *([("diffraction at k", ", ".join(losses))] if losses else []),
        *link_rows(study),
    ]


def link_rows(study: Study) -> list[tuple[str, str]]:
    """Fade margin and outage in a row each; what is not known has none."""
    rows = []
    outage = study.outage.availability
    margin_db = None if study.budget is None else study.budget.weaker()[1].fade_margin_db
    if margin_db is not None:
        rows.append(("fade margin", db_text(margin_db)))
    if outage is not None:
        rows.append(("outage", outage_sentence(outage)))
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
    """Three lines of a rule: what it asks, whether it is met, and the numbers behind it at its tightest place."""
    place, rule = result.tightest, result.check.rule
    title = rule_text(rule, scale) + (f" ({rule.label})" if rule.label else "")
    met = "passes" if result.passes else "fails"
    ratio = f" = {minus(f'{place.ratio:.2f}')} F1" if place.f1_m > 0 else ""
    numbers = f"clearance {scale.height_text(place.clearance_m)}{ratio}; required {scale.height_text(place.required_m)}"
    return title, f"{met}, {spare_text(place.surplus_m, scale)}, {where_text(place, scale)}", numbers


def tightest_words(study: Study, scale: Scale) -> str:
    """Label of the place that decides."""
    place = study.governing.tightest
    return f"Tightest: {place_text(place, scale)}, {spare_text(place.surplus_m, scale)}"


def ground_notes(study: Study, scale: Scale) -> list[str]:
    """Where ground and cover come from, and what was done to them."""
    terrain, spacing = study.terrain, scale.height_text(study.terrain.spacing_m)
    names = [f"{each.info.path.name} ({percent_text(each.share)} of the path)" for each in terrain.sources]
    count = terrain.filled_points
    filled = [f"{count} points without data were interpolated between their neighbours (hatched)"] if count else []
    differences = [
        f"surveyed ground at {site} differs from the terrain by {scale.height_text(value)}"
        for site, value in (("A", terrain.surveyed_difference_a_m), ("B", terrain.surveyed_difference_b_m))
        if value is not None
    ]
    ground = f"ground: {', '.join(names)}, {terrain.method}, points at most {spacing} apart"
    side_m = study.governing.held.half_width_m
    width = [f"zone checked to {scale.height_text(side_m)} beside the path"] if side_m > 0.0 else []
    return [ground, *filled, *differences, *map(scale.text, terrain.cover_notes), *width]


def profile_notes(study: Study, scale: Scale) -> list[tuple[str, list[str]]]:
    """Headings and paragraphs at the foot of the profile: what clearance rests on, what to beware of, the maker."""
    sites = (study.hop.site_a, study.hop.site_b)
    given = {f"{site.name}: {note}" for site in sites for note in site.position_notes if note.startswith("given as")}
    elsewhere = {*link_assumptions(study), *study.terrain.cover_notes, *given}
    assumed = [
        scale.text(each)
        for each in study.assumptions
        if each not in elsewhere and not (isinstance(each, Note) and each.topic in _SAID_ON_THE_PAGE)
    ]
    if study.hop.confidence is not None:
        assumed.append(doubt_words(study.hop.confidence, scale))
    return _notes(study, assumed, scale)


def link_assumptions(study: Study) -> list[Note | str]:
    """Collect what only the budget and the outage assume."""
    budget = () if study.budget is None else study.budget.assumptions
    outage = study.outage.assumptions
    return list(dict.fromkeys([*budget, *outage]))


def link_notes(study: Study, scale: Scale) -> list[tuple[str, list[str]]]:
    """Headings and paragraphs at the foot of the margin figure: what the budget and the outage rest on."""
    loss = study.median_diffraction
    path = [f"gases {db_text(study.air.gas_db, digits=2)}; air: {scale.text(study.air.source)}"]
    if loss is not None:
        path.insert(0, f"diffraction {db_text(loss.loss_db)} by {loss.method} at k = {k_text(loss.k)}")
    inputs = [] if study.outage.availability is None else study.outage.availability.inputs
    numbers = [input_words(each, scale) for each in inputs]
    blocks = _notes(study, [*path, *map(scale.text, link_assumptions(study))], scale)
    return [("Numbers used", numbers), *blocks] if numbers else blocks


def _notes(study: Study, assumed: list[str], scale: Scale) -> list[tuple[str, list[str]]]:
    hop = study.hop
    letters = missing_letters(" ".join((hop.name, hop.site_a.name, hop.site_b.name)))
    boxes = [f"the font of this figure lacks the letters {letters}: they show as boxes"] if letters else []
    blocks = [
        ("Assumed", assumed),
        ("Beware", [*map(scale.text, study.warnings), *boxes]),
        ("Made with", provenance_words(study)),
    ]
    return [(heading, paragraphs) for heading, paragraphs in blocks if paragraphs]


def provenance_words(study: Study) -> list[str]:
    """Date, version, hop file and rasters with the beginnings of their hashes; the JSON document has all of it."""
    made = study.provenance
    maker = " ".join(made.versions[0])
    digest = f" (SHA-256 {made.hop_sha256[:12]}…)" if made.hop_sha256 else ""
    rasters = ", ".join(f"{name} {digest[:12]}…" for name, _, digest in made.rasters)
    return [f"{made.created}; {maker}; hop file {made.hop_file}{digest}; rasters by SHA-256: {rasters}"]
