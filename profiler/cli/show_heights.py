"""A heights plan on the terminal: the pair first, then the frontier and the rest."""

from __future__ import annotations

from typing import TYPE_CHECKING

from profiler.cli.brief import CAUTION, Part, show_brief
from profiler.cli.screen import compact_table, console, say, show_notes, show_table
from profiler.cli.show import OUTCOME_STYLES
from profiler.heights import Least, NoPair
from profiler.remarks import cost_text, db_text, k_text
from profiler.words import (
    Scale,
    along_text,
    least_words,
    pair_text,
    pair_words,
    place_text,
    plan_verdict_words,
    remedies_words,
    requirement_text,
    slack_words,
    spare_text,
    spot_text,
    sure_words,
)

if TYPE_CHECKING:
    from rich.console import Console

    from profiler.heights import LimitHeights, MountingSheet, Stretch
    from profiler.plan import HeightsPlan

__all__ = ["show_heights"]


def show_heights(plan: HeightsPlan, *, feet: bool, full: bool, quiet: bool, color: bool) -> None:
    """Print a heights plan."""
    screen, scale = console(color=color), Scale(feet=feet)
    verdict, *more = _parts(plan, scale)
    warnings = [scale.text(each) for each in (*plan.answer.unjudged, *plan.study.warnings)]
    if quiet:
        for part in (verdict, more[0]):
            say(screen, part.text, part.style)
        for warning in warnings[:1]:
            say(screen, f"Warning: {warning}", "yellow")
    elif not full:
        show_brief(screen, (verdict, *more), warnings, _next_step(plan, scale))
    else:
        for part in (verdict, *more):
            say(screen, part.text, part.style)
        say(screen, f"Next: {_next_step(plan, scale)}", "bold")
        _show_tables(screen, plan, scale)
        show_notes(screen, "Warnings", tuple(warnings), "yellow")
        show_notes(screen, "Assumed", tuple(map(scale.text, plan.assumptions)))
        threshold = "A height threshold here counts the antenna's centre, not the top of the structure."
        say(screen, f"\n{CAUTION} {threshold}", style="dim")


def _parts(plan: HeightsPlan, scale: Scale) -> list[Part]:
    """Give the short answer in the order in which it is decided."""
    answer = plan.answer
    parts = [
        Part(f"{plan.study.hop.name}: {plan_verdict_words(plan)}", OUTCOME_STYLES[plan.outcome]),
        Part(f"{pair_words(plan, scale)}."),
    ]
    if isinstance(answer.pair, NoPair):
        if answer.pair.lower:
            worst = answer.pair.lower[0]
            place = place_text(plan.source(worst.point, worst.rule), scale)
            parts.append(Part(f"In the way: {place}, under {requirement_text(plan, worst.rule, scale)}."))
        if not isinstance(plan.cheapest, NoPair):
            parts.append(Part(f"The cheapest pair that clears every rule is {pair_text(plan.cheapest, scale)}."))
    elif answer.by_trial:
        slack = slack_words(answer.cheaper_by_at_most)
        parts.append(Part(f"Found by trial of losses and outage: if height only helps those, {slack}.", needed=False))
    if plan.sheet is not None:
        parts.append(Part(_held_words(plan.sheet, scale)))
    parts.append(Part(f"Least equal heights: {least_words(plan, plan.least_equal, scale, 'AB')}."))
    return [*parts, *(Part(text, needed=False) for text in sure_words(plan, scale))]


def _held_words(sheet: MountingSheet, scale: Scale) -> str:
    """Say how the mounted pair fares when every rule is held against it again."""
    width = "along the path and beside it" if sheet.beside else "along the path"
    worst = min((ray.held for ray in sheet.rays), key=lambda held: held.surplus_m)
    verdict = "passes" if sheet.passes else "FAILS"
    return f"Re-checked through every rule, {width}: {verdict}, {spare_text(worst.surplus_m, scale)}."


def _next_step(plan: HeightsPlan, scale: Scale) -> str:
    """Say what to do with the pair, or without one."""
    if isinstance(plan.answer.pair, NoPair):
        return f"{'; or '.join(remedies_words(plan, plan.answer.pair, scale))}."
    return "write the pair into a copy of the hop file (--write) and study that."


def _show_tables(screen: Console, plan: HeightsPlan, scale: Scale) -> None:
    """Print every table of a plan."""
    _show_sheet(screen, plan)
    site_a, site_b = plan.study.hop.site_a, plan.study.hop.site_b
    say(screen, "")
    for fixed, other, height_m, found in (
        ("B", "A", site_b.antenna_m, plan.least_a),
        ("A", "B", site_a.antenna_m, plan.least_b),
    ):
        text = least_words(plan, found, scale, other) if isinstance(found, Least) else scale.text(found.reason)
        say(screen, f"Least {other} with {fixed} at {scale.height_text(height_m)}: {text}")
    _show_frontier(screen, plan, scale)
    if plan.for_loss is not None:
        asked = plan.study.hop.heights
        title = f"Diffraction loss of {db_text(asked.loss_limit_db or 0.0)} at k = {k_text(asked.loss_k)}"
        _show_limit(screen, title, plan.for_loss, scale)
    if plan.for_objective is not None:
        _show_limit(screen, "Availability objective", plan.for_objective, scale)
    _show_diversity(screen, plan, scale)


def _show_sheet(screen: Console, plan: HeightsPlan) -> None:
    """Print both ends' mounted heights, always in both unit systems, and how the rules fare with them."""
    sheet = plan.sheet
    if sheet is None:
        return
    feet = Scale(feet=True)
    headers = ("above ground\nm", "\nft", "ground\nm", "\nft", "above sea\nm", "\nft")
    table = compact_table("mounted", *headers, wraps="mounted")
    for end, name in ((sheet.end_a, plan.study.hop.site_a.name), (sheet.end_b, plan.study.hop.site_b.name)):
        antennas = [(f"{end.end}  {name}", end.antenna_m)]
        antennas += [] if end.lower_m is None else [(f"{end.end}  lower antenna", end.lower_m)]
        for label, antenna_m in antennas:
            heights = (antenna_m, end.ground_m, end.ground_m + antenna_m)
            table.add_row(
                label, *(text for height in heights for text in (f"{height:.1f}", feet.height_number(height)))
            )
    say(screen, "")
    show_table(screen, table)


def _show_frontier(screen: Console, plan: HeightsPlan, scale: Scale) -> None:
    """Print the frontier within the towers' limits, a row for each stretch."""
    if not plan.stretches:
        say(screen, "\nFrontier: none of it lies within the towers' limits.")
        return
    unit = scale.height_unit
    titles = (f"frontier: A\n{unit}", f"B\n{unit}", "for", f"ground + cover\n{unit}", "rule")
    table = compact_table(*titles, words=("for",), wraps="rule")
    for stretch in plan.stretches:
        place = plan.source(stretch.point, stretch.rule)
        table.add_row(
            *_spans(stretch, scale),
            f"{along_text(place, scale)}\n{spot_text(place)}",
            f"{scale.height_number(place.ground_m)} + {scale.height_number(place.cover_m)}",
            requirement_text(plan, stretch.rule, scale),
        )
    say(screen, "")
    show_table(screen, table)


def _spans(stretch: Stretch, scale: Scale) -> tuple[str, str]:
    """Give the heights of A and of B along a stretch, from its first corner to its last."""
    first, last = stretch.corners_m[0], stretch.corners_m[-1]
    a, b = (f"{scale.height_number(first[end])} to {scale.height_number(last[end])}" for end in (0, 1))
    return a, b


def _show_limit(screen: Console, title: str, found: LimitHeights, scale: Scale) -> None:
    """Print the heights for a limit on loss or outage."""
    unit = scale.height_unit
    say(screen, f"\n{title}, by trial of {found.trials} pairs of heights:", "bold")
    if found.least_equal_m is not None:
        caution = "" if found.holds_above else "; not at every greater height: the loss is not monotone here"
        say(screen, f"  least equal heights {scale.height_number(found.least_equal_m, 2)} {unit}{caution}", hang=2)
    choice = found.cheapest
    if isinstance(choice, NoPair):
        say(screen, f"  {scale.text(choice.reason)}")
    else:
        say(
            screen,
            f"  cheapest pair found: A {scale.height_text(choice.antenna_a_m)},"
            f" B {scale.height_text(choice.antenna_b_m)}, cost {cost_text(choice.cost)};"
            f" if height only helps, {slack_words(found.cheaper_by_at_most)}",
            hang=2,
        )


def _show_diversity(screen: Console, plan: HeightsPlan, scale: Scale) -> None:
    """Print the lower antennas of a diversity pair."""
    unit = scale.height_unit
    for end in plan.diversity:
        say(
            screen,
            f"\nDiversity at {end.end}: lower antenna {scale.height_text(end.lower_m)},"
            f" {scale.height_text(end.spacing_m)} ({end.spacing_wavelengths:.0f} wavelengths) below the main one;"
            f" it needs {scale.height_number(end.least_m)} to {scale.height_number(end.full_m)} {unit}",
        )
        for note in end.notes:
            say(screen, f"  - {scale.text(note)}", hang=4)
