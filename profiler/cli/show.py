"""A study on the terminal: the verdict first, then compact tables, then what was assumed."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from profiler.cli.brief import CAUTION, Part, show_brief
from profiler.cli.lines import lines_table
from profiler.cli.screen import compact_table, console, say, show_notes, show_table
from profiler.remarks import chance_text, db_text, k_text, listed, minus, percent_text, ratio_text
from profiler.words import (
    Scale,
    achieved_text,
    along_text,
    asked_text,
    clearance_words,
    ends_words,
    feet_words,
    headline,
    held_words,
    input_words,
    margin_words,
    needs_text,
    objective_words,
    outage_sentence,
    reason_words,
    rule_text,
    spot_text,
    steps_words,
    verdict_words,
)

if TYPE_CHECKING:
    from rich.console import Console
    from rich.table import Table

    from profiler.confidence import Confidence
    from profiler.diffraction import DiffractionLoss
    from profiler.models import Rule
    from profiler.study import Study
    from profiler.study.reasons import Outcome

__all__ = ["OUTCOME_STYLES", "show_study"]

OUTCOME_STYLES: dict[Outcome, str] = {"passes": "bold green", "not_sure": "bold yellow", "fails": "bold red"}
_MOST_TARGETS = 2
"""Targets of objectives that stand on the short screen in any case."""

_MOST_NAMED = 3
"""Rasters that are named, those that gave most first; the document has them all."""


def show_study(study: Study, *, feet: bool, full: bool, quiet: bool, color: bool) -> None:
    """Print a study."""
    screen, scale = console(color=color), Scale(feet=feet)
    verdict, *more = _parts(study, scale)
    warnings = tuple(map(scale.text, study.warnings))
    if quiet:
        for text, style in ((verdict.text, verdict.style), (f"{headline(study, scale)}.", "")):
            say(screen, text, style)
        for warning in warnings[:1]:
            say(screen, f"Warning: {warning}", "yellow")
    elif not full:
        show_brief(screen, (verdict, *more), warnings, steps_words(study, scale))
    else:
        for part in (verdict, *more):
            say(screen, part.text, part.style)
        say(screen, f"Next: {steps_words(study, scale)}", "bold")
        _show_tables(screen, study, scale)
        show_notes(screen, "Warnings", warnings, "yellow")
        show_notes(screen, "Numbers used", _numbers_used(study, scale))
        doubt = () if study.confidence is None else study.confidence.method
        show_notes(screen, "Assumed", (*map(scale.text, study.assumptions), *map(scale.text, doubt)))
        say(screen, f"\n{CAUTION}", "dim")


def _parts(study: Study, scale: Scale) -> list[Part]:
    """Give the short answer in the order in which it is decided."""
    verdict = study.verdict
    fails_otherwise = verdict.clears and verdict.outcome == "fails"
    found = headline(study, scale) if fails_otherwise else clearance_words(study, scale)
    parts = [
        Part(f"{study.hop.name}: {verdict_words(study)}", OUTCOME_STYLES[verdict.outcome]),
        Part(f"{found}."),
        Part(held_words(study, scale)),
        Part(feet_words(study, scale), needed=False),
    ]
    if study.budget is not None:
        parts.append(Part(f"{margin_words(study)}."))
    objectives = objective_words(study)
    parts += [Part(f"{text}.", needed=number < _MOST_TARGETS) for number, text in enumerate(objectives)]
    told = {"clearance", "chance"} | ({"objective"} if objectives else set())
    parts += [Part(reason_words(each, study, scale)) for each in verdict.reasons if each.test not in told]
    return [*parts, Part(ends_words(study, scale), needed=False)]


def _show_tables(screen: Console, study: Study, scale: Scale) -> None:
    """Print every table of a study."""
    _show_sites(screen, study, scale)
    _show_rules(screen, study, scale)
    _show_places(screen, study, scale)
    _show_reflections(screen, study, scale)
    if study.budget is not None:
        say(screen, "")
        show_table(screen, _budget(study, scale))
    if study.outage.availability is not None:
        _show_availability(screen, study)
    if study.confidence is not None:
        _show_confidence(screen, study, scale)


def _numbers_used(study: Study, scale: Scale) -> tuple[str, ...]:
    """Say where the ground is from and by how much a survey differs, and every climate number with its source."""
    terrain = study.terrain
    surveys = [
        f"{site.name}: surveyed ground {scale.height_text(site.surveyed_ground_m or 0.0, 2)},"
        f" {scale.height_text(abs(difference), 2)} {'above' if difference > 0 else 'below'} that of the terrain"
        for site, difference in (
            (study.hop.site_a, terrain.surveyed_difference_a_m),
            (study.hop.site_b, terrain.surveyed_difference_b_m),
        )
        if difference is not None
    ]
    climate = () if study.outage.availability is None else study.outage.availability.inputs
    named = [f"{use.info.path.name} at {percent_text(use.share)} of the path" for use in terrain.sources[:_MOST_NAMED]]
    unnamed = len(terrain.sources) - len(named)
    more = f", and {unnamed} more" if unnamed else ""
    return (
        f"ground: {', '.join(named)}{more}",
        *surveys,
        *(input_words(each, scale) for each in climate),
    )


def _show_sites(screen: Console, study: Study, scale: Scale) -> None:
    """Print both ends, and what lies between them."""
    hop, line, unit = study.hop, study.line, scale.height_unit
    heights = (f"ground\n{unit}", f"antenna\n{unit}", f"centre\n{unit}")
    table = compact_table("site", "latitude", "longitude", *heights, "true\nazimuth", wraps="site")
    for letter, site, centre_m, azimuth_deg in (
        ("A", hop.site_a, study.centre_a_m, line.azimuth_a_deg),
        ("B", hop.site_b, study.centre_b_m, line.azimuth_b_deg),
    ):
        place = (f"{site.latitude:.6f}", f"{site.longitude:.6f}")
        shown = (scale.height_number(height_m) for height_m in (centre_m - site.antenna_m, site.antenna_m, centre_m))
        table.add_row(f"{letter}  {site.name}", *place, *shown, f"{azimuth_deg:.2f}°")
    say(screen, "")
    show_table(screen, table)
    say(
        screen,
        f"{scale.distance_number(line.distance_m, 3)} {scale.distance_unit}, {hop.frequency_hz / 1e9:g} GHz,"
        f" {hop.polarization} polarization, {line.points} points at most {scale.height_text(study.terrain.spacing_m)}"
        " apart; antennas above ground, centres above the datum of the ground",
    )


def _show_rules(screen: Console, study: Study, scale: Scale) -> None:
    """Print what each rule finds at its critical place, and what depends on k alone."""
    unit = scale.height_unit
    headers = ("rule", "verdict", f"surplus\n{unit}", "at", f"F1\n{unit}", "clear\n/F1")
    table = compact_table(*headers, words=("verdict", "at"), wraps="rule")
    for result in study.rules:
        place = result.critical
        table.add_row(
            _rule_name(result.check.rule, scale),
            "pass" if result.passes else "FAIL",
            scale.height_number(place.surplus_m),
            along_text(place, scale),
            scale.height_number(place.f1_m),
            "–" if math.isnan(place.ratio) else minus(f"{place.ratio:.2f}"),
            style="" if result.passes else "red",
        )
    by_k = compact_table("k", "line of sight", "elevation A", "elevation B", "diffraction dB", words=("line of sight",))
    losses = {loss.k: loss.loss_db for loss in study.diffraction}
    for k, result in {result.check.rule.k: result for result in study.rules}.items():
        sight = "yes" if result.check.line_of_sight else "no"
        angles = (minus(f"{angle_deg:+.3f}°") for angle_deg in (result.elevation_a_deg, result.elevation_b_deg))
        by_k.add_row(k_text(k), sight, *angles, f"{losses[k]:.1f}")
    for each in (table, by_k):
        say(screen, "")
        show_table(screen, each)
    for loss in study.diffraction:
        say(screen, _edges(loss, scale), hang=2)


def _edges(loss: DiffractionLoss, scale: Scale) -> str:
    """Say by which method and over which edges a diffraction loss came about."""
    charged, touched = (
        [scale.distance_number(edge.distance_m) for edge in loss.edges if (edge.loss_db is None) == shape]
        for shape in (False, True)
    )
    over = f", edge{'s' if len(charged) > 1 else ''} at {', '.join(charged)} {scale.distance_unit}" if charged else ""
    horizons = f" between horizons at {' and '.join(touched)} {scale.distance_unit}" if touched else ""
    return f"Diffraction at k = {k_text(loss.k)}: {db_text(loss.loss_db)} by {loss.method}{over}{horizons}"


def _rule_name(rule: Rule, scale: Scale) -> str:
    """Give a rule's label, if it has one, and below it what it asks for."""
    return f"{rule.label}\n{rule_text(rule, scale)}" if rule.label else rule_text(rule, scale)


def _show_places(screen: Console, study: Study, scale: Scale) -> None:
    """Print the tight places of the governing rule, on the path or beside it, and how wide each rule was checked."""
    unit, rule = scale.height_unit, study.governing.check.rule
    names = ("ground", "cover", "F1", "clearance", "needs", "surplus")
    table = compact_table("tight place", *(f"{name}\n{unit}" for name in names))
    for place in study.governing.places:
        heights = (place.ground_m, place.cover_m, place.f1_m)
        held = (place.clearance_m, place.required_m, place.surplus_m)
        where = f"{along_text(place, scale)}\n{spot_text(place)}"
        table.add_row(where, *(scale.height_number(height_m) for height_m in (*heights, *held)))
    say(screen, f"\nTight places of rule {_rule_name(rule, scale).replace(chr(10), ', ')}", "bold")
    show_table(screen, table)
    widest = max((result.held for result in study.rules), key=lambda zone: zone.half_width_m)
    if widest.half_width_m > 0.0:
        width = f"{scale.height_text(widest.half_width_m)} to each side"
        unseen = f", {percent_text(widest.missing_share)} of it without ground" if widest.missing_share else ""
        say(screen, f"Checked across the path too: {width}{unseen}.")


def _show_reflections(screen: Console, study: Study, scale: Scale) -> None:
    """Print the specular points at the k of each rule, screened ones only in number."""
    lines = []
    for k, result in {result.check.rule.k: result for result in study.rules}.items():
        open_places = [place for place in result.reflections if not place.screened]
        hidden = len(result.reflections) - len(open_places)
        for place in open_places[:3]:
            kind = "rough" if place.rough else "smooth enough to mirror"
            lines.append(
                f"  k = {k_text(k)}: {scale.distance_text(place.distance_m)}, grazing"
                f" {place.grazing_deg:.2f}°, {place.delay_s * 1e9:.2f} ns late, {kind}"
            )
        more = len(open_places) - 3
        lines.append(f"  k = {k_text(k)}: {hidden} screened" + (f", {more} more in view" if more > 0 else ""))
    say(screen, "\nReflection points", "bold")
    say(screen, "\n".join(lines), hang=4)


def _budget(study: Study, scale: Scale) -> Table:
    """Tabulate the budget of the first mode line by line both ways, then a row for every further mode."""
    assert study.budget is not None
    there, back = study.budget.a_to_b, study.budget.b_to_a
    lines = {"A to B": there.modes[0].lines, "B to A": back.modes[0].lines}
    table = lines_table(f"budget, mode {there.modes[0].name}", lines, scale)
    table.add_section()
    for name, part in (("received level", "received_dbm"), ("threshold", "threshold_dbm")):
        table.add_row(name, *(_number(getattr(way, part)) for way in (there, back)), "dBm", "")
    table.add_row("fade margin", *(_number(way.fade_margin_db) for way in (there, back)), "dB", "", style="bold")
    for one_mode, other_mode in zip(there.modes[1:], back.modes[1:], strict=True):
        margins = (_number(mode.fade_margin_db) for mode in (one_mode, other_mode))
        table.add_row(f"fade margin, {one_mode.name}", *margins, "dB", "")
    return table


def _number(value: float | None) -> str:
    return "–" if value is None else minus(f"{value:.2f}")


def _percent(value: float | None) -> str:
    return "–" if value is None else ratio_text(value)


def _span(value: float | None, most: float | None) -> str:
    """Write an outage, with what it could be at most where that is more."""
    return _percent(value) if value == most else f"{_percent(value)} to {_percent(most)}"


def _show_availability(screen: Console, study: Study) -> None:
    """Print outage by mechanism, the objective, and the total of every mode."""
    from profiler.budget import way_name

    found = study.outage.availability
    assert found is not None
    table = compact_table("outage %", "multipath", "selective", "rain", "obstruction", "total")
    for period, outages in (("worst month", found.worst_month_percent), ("year", found.year_percent)):
        parts = (_percent(part) for part in (outages.multipath, outages.selective, outages.rain))
        obstruction = _span(outages.obstruction, outages.obstruction_up_to)
        table.add_row(period, *parts, obstruction, _span(outages.total, outages.total_up_to))
    say(screen, f"\nAvailability, fade margin {db_text(found.fade_margin_db)}", "bold")
    show_table(screen, table)
    outage = outage_sentence(found)
    say(screen, f"{outage[0].upper()}{outage[1:]}.")
    for target in found.objective.targets if found.objective is not None else ():
        judged = {True: "met", False: "MISSED", None: "undecided"}[target.met]
        text = f"Asked {asked_text(target)}, expected {achieved_text(target)}: {judged}; it {needs_text(target)}."
        say(screen, text, {True: "", False: "red", None: "yellow"}[target.met])
    if len(found.multipath) > 1:
        methods = compact_table("flat multipath, without diversity", "worst month\n%", "year\n%", "", words=("",))
        for each in found.multipath:
            decides = "decides" if each.chosen else ""
            outside = "outside its fit" if each.outside_fit else ""
            said = ", ".join(filter(None, (decides, outside)))
            methods.add_row(each.method, _percent(each.worst_month_percent), _percent(each.year_percent), said)
        say(screen, "")
        show_table(screen, methods)
    if len(study.outage.modes) > 1:
        headers = ("weaker\nway", "fade margin\ndB", "worst month\n%", "year\n%", "objective")
        modes = compact_table("mode", *headers, wraps="mode")
        for mode in study.outage.modes:
            met = {True: "met", False: "missed", None: "–"}[mode.met]
            modes.add_row(
                mode.mode,
                way_name(mode.direction),
                minus(f"{mode.fade_margin_db:.2f}"),
                _percent(mode.worst_month_percent),
                _percent(mode.year_percent),
                met,
            )
        say(screen, "")
        show_table(screen, modes)


def _show_confidence(screen: Console, study: Study, scale: Scale) -> None:
    """Print how sure the clearance is, the sure heights and what to survey."""
    found = study.confidence
    assert found is not None
    low, high = chance_text(found.chance.low), chance_text(found.chance.high)
    title = f"{chance_text(found.chance.value)} chance of meeting all rules"
    say(screen, f"\nConfidence: {title} ({low} to {high} by {found.draws} draws, seed {found.seed})", "bold")
    say(
        screen,
        f"Chance of each rule and share of the time that its zone is clear; least surplus ({scale.height_unit}) that 5,"
        " 50 and 95 % of the draws stay under; what the doubt is made of",
    )
    table = compact_table("rule", "chance", "time", "5 %", "50 %", "95 %", "terrain", "cover", "k", wraps="rule")
    for doubt in found.rules:
        table.add_row(
            _rule_name(doubt.rule, scale),
            chance_text(doubt.chance.value),
            "–" if doubt.chance_with_k is None else chance_text(doubt.chance_with_k.value),
            *(scale.height_number(value) for value in (doubt.least_low_m, doubt.least_median_m, doubt.least_high_m)),
            *(percent_text(share) for share in (doubt.shares.terrain, doubt.shares.cover, doubt.shares.k)),
        )
    show_table(screen, table)
    _show_sure_heights(screen, found, scale)
    places = [
        f"{'at site ' + each.site if each.site else scale.distance_text(each.distance_m) + ' from A'}"
        f" ({percent_text(each.share_of_doubt)} of the doubt)"
        for each in found.survey
    ]
    if places:
        say(screen, f"Survey first {listed(places)}.")


def _show_sure_heights(screen: Console, found: Confidence, scale: Scale) -> None:
    """Print the antenna heights that are sure enough, by raising both or one."""
    for sure in found.sure:
        alone = [
            f"{end} alone at {scale.height_text(height)}"
            for end, height in (("A", sure.a_only_m), ("B", sure.b_only_m))
            if height is not None
        ]
        change = f"{scale.height_text(abs(sure.raise_m))} {'higher' if sure.raise_m > 0 else 'lower'}"
        both = f"both antennas {change}, A at {scale.height_text(sure.equal_m[0])}"
        ways = listed([f"{both} and B at {scale.height_text(sure.equal_m[1])}", *alone], "or")
        say(screen, f"For a chance of {chance_text(sure.chance)}: {ways}.")
