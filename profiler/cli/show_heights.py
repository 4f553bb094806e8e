"""A heights plan on the terminal: the pair first, then the frontier and the rest."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING

from profiler.cli.screen import compact_table, console, say, show_notes, show_table
from profiler.heights import Least, NoPair, round_up
from profiler.remarks import chance_text, k_text
from profiler.words import Scale, remedies_words

if TYPE_CHECKING:
    from rich.console import Console

    from profiler.heights import LimitHeights, Stretch
    from profiler.models import Rule, TowerChoice
    from profiler.plan import HeightsPlan
    from profiler.study.requirements import Source

__all__ = ["show_heights"]


def show_heights(plan: HeightsPlan, *, feet: bool, quiet: bool, color: bool) -> None:
    """Print a heights plan."""
    screen, scale = console(color=color), Scale(feet=feet)
    _show_answer(screen, plan, scale)
    if quiet:
        return
    _show_sheet(screen, plan, scale)
    say(screen, f"\nLeast equal heights: {_least(plan, plan.least_equal, scale, 'AB')}")
    site_a, site_b = plan.study.hop.site_a, plan.study.hop.site_b
    for fixed, other, height_m, found in (
        ("B", "A", site_b.antenna_m, plan.least_a),
        ("A", "B", site_a.antenna_m, plan.least_b),
    ):
        text = _least(plan, found, scale, other) if isinstance(found, Least) else scale.text(found.reason)
        beginning = f"Least {other} with {fixed} at {scale.height_number(height_m)} {scale.height_unit}"
        say(screen, f"{beginning}: {text}")
    _show_frontier(screen, plan, scale)
    if plan.for_loss is not None:
        asked = plan.study.hop.heights
        title = f"Diffraction loss of {asked.loss_limit_db:g} dB at k = {k_text(asked.loss_k)}"
        _show_limit(screen, title, plan.for_loss, scale)
    if plan.for_objective is not None:
        _show_limit(screen, "Availability objective", plan.for_objective, scale)
    _show_diversity(screen, plan, scale)
    _show_sure(screen, plan, scale)
    show_notes(screen, "Assumed", tuple(map(scale.text, plan.study.assumptions)))
    say(
        screen,
        "\nA screening result: tower loading, lighting, aircraft notice and exposure are for licensed practice and"
        " local codes. A height threshold here counts the antenna's centre, not the top of the structure.",
        style="dim",
    )


def _rule(rules: Sequence[Rule], number: int, scale: Scale) -> str:
    """Say what a requirement asks for, by its index; -1 is the bare ground of a site."""
    if number < 0:
        return "site's own ground"
    rule = rules[number]
    margin = f" + {scale.height_number(rule.margin_m)} {scale.height_unit}" if rule.margin_m else ""
    lower = f", {rule.label}" if rule.label.startswith("lower antenna") else ""
    return f"{rule.fresnel_fraction:g} F1{margin} at k = {k_text(rule.k)}{lower}"


def _show_answer(screen: Console, plan: HeightsPlan, scale: Scale) -> None:
    """Print the pair that meets everything, or why there is none and what would have to change."""
    answer, name = plan.answer, plan.study.hop.name
    *most, last = answer.asked
    asked = f"{', '.join(most)} and {last}" if most else last
    if not isinstance(answer.pair, NoPair):
        pair = f"A {scale.height_text(answer.pair.antenna_a_m)}, B {scale.height_text(answer.pair.antenna_b_m)}"
        text = f"{name}: {pair} above ground {asked}, cost {answer.pair.cost:g}"
        say(screen, text, style="bold green")
    else:
        say(screen, f"{name}: {scale.text(answer.pair.reason)}", style="bold red")
        if answer.pair.lower:
            worst = answer.pair.lower[0]
            text = f"In the way: {_where(plan.source(worst.point, worst.rule), scale)}, under"
            say(screen, f"{text} {_rule(plan.rules, worst.rule, scale)}")
        show_notes(screen, "Any one of these would do", tuple(remedies_words(plan, answer.pair, scale)))
        if not isinstance(plan.cheapest, NoPair):
            pair = f"A {scale.height_text(plan.cheapest.antenna_a_m)}, B {scale.height_text(plan.cheapest.antenna_b_m)}"
            text = f"Cheapest pair that {_third(answer.asked[0])}: {pair}, cost {plan.cheapest.cost:g}"
            say(screen, text)
    if answer.chance is not None:
        doubt = f"{answer.chance.value:.1%} ({answer.chance.low:.1%} to {answer.chance.high:.1%} by the draws)"
        say(screen, f"Chance of clearing: {doubt}")
    if answer.by_trial and not isinstance(answer.pair, NoPair):
        slack = _slack(answer.cheaper_by_at_most)
        say(screen, f"Found by trial of losses and outage: if height only helps those, {slack}.")
    show_notes(screen, "Not judged", tuple(map(scale.text, answer.unjudged)), "yellow")


def _third(words: str) -> str:
    """Put 'clear every rule' into the third person."""
    verb, _, rest = words.partition(" ")
    return f"{verb}s {rest}"


def _where(place: Source, scale: Scale) -> str:
    """Say where what asks for a height stands, and how high."""
    unit = scale.height_unit
    aside = f", {_offset(place, scale)} {unit} {place.side} of the path" if _aside(place) else ""
    cover = f" + cover {scale.height_number(place.cover_m)}" if place.cover_m else ""
    return (
        f"{scale.distance_number(place.distance_m)} {scale.distance_unit}{aside}"
        f" ({place.latitude:.5f}, {place.longitude:.5f}; ground {scale.height_number(place.ground_m)}{cover} {unit})"
    )


def _aside(place: Source) -> bool:
    """Tell whether a place is far enough from the path for somebody who stands there to notice."""
    return abs(place.offset_m) >= 0.5


def _offset(place: Source, scale: Scale) -> str:
    return scale.height_number(abs(place.offset_m))


def _least(plan: HeightsPlan, least: Least, scale: Scale, ends: str) -> str:
    """Give a least height with the positions it takes and what asks for it."""
    towers = {"A": plan.study.hop.heights.tower_a, "B": plan.study.hop.heights.tower_b}
    positions = ", ".join(f"{end} {_position(least.height_m, towers[end], plan.spacing_m, scale)}" for end in ends)
    return (
        f"{scale.height_number(least.height_m, 2)} {scale.height_unit} ({positions}), for"
        f" {_where(plan.source(least.point, least.rule), scale)}, under {_rule(plan.rules, least.rule, scale)}"
    )


def _position(height_m: float | None, tower: TowerChoice, spacing_m: float, scale: Scale) -> str:
    """Give the position that a height takes on a tower, or why there is none."""
    if height_m is None:
        return "none alone"
    position_m = round_up(height_m, tower, spacing_m=spacing_m)
    if position_m is not None:
        return f"at {scale.height_number(position_m)}"
    if height_m > tower.highest_m:
        return f"above the tower's {scale.height_number(tower.highest_m)} {scale.height_unit}"
    return f"no free position from {scale.height_number(height_m)} {scale.height_unit} up"


def _show_sheet(screen: Console, plan: HeightsPlan, scale: Scale) -> None:
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
    width = "along the path and beside it" if sheet.beside else "along the path"
    worst = min(sheet.held, key=lambda held: held.surplus_m)
    surplus = f"{scale.height_number(abs(worst.surplus_m), 2)} {scale.height_unit}"
    verdict = f"passes, {surplus} to spare" if sheet.passes else f"FAILS, {surplus} short"
    say(screen, f"Re-checked through every rule, {width}: {verdict}")


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
        aside = f", {_offset(place, scale)} {unit} {place.side}" if _aside(place) else ""
        table.add_row(
            *_spans(stretch, scale),
            f"{scale.distance_number(place.distance_m)} {scale.distance_unit}{aside}\n"
            f"{place.latitude:.5f}, {place.longitude:.5f}",
            f"{scale.height_number(place.ground_m)} + {scale.height_number(place.cover_m)}",
            _rule(plan.rules, stretch.rule, scale),
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
            f" B {scale.height_text(choice.antenna_b_m)}, cost {choice.cost:g};"
            f" if height only helps, {_slack(found.cheaper_by_at_most)}",
            hang=2,
        )


def _slack(cheaper_by_at_most: float) -> str:
    """Say how much cheaper a pair can be that a search did not find."""
    return f"none is cheaper by more than {cheaper_by_at_most:.3g}" if cheaper_by_at_most > 1e-6 else "none is cheaper"


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
            say(screen, f"  - {note}", hang=4)


def _show_sure(screen: Console, plan: HeightsPlan, scale: Scale) -> None:
    """Print what the merely clearing pair has for a chance, and the cheapest pairs that are sure enough."""
    clearing, chance = plan.cheapest, plan.cheapest_chance
    if chance is not None and not isinstance(clearing, NoPair) and clearing != plan.answer.pair:
        text = f"A {scale.height_text(clearing.antenna_a_m)}, B {scale.height_text(clearing.antenna_b_m)}"
        how_sure = f"a chance of {chance_text(chance.value)}"
        say(screen, f"\nOn the map as it is {text} would clear, cost {clearing.cost:g}: {how_sure}")
    for found in plan.sure:
        pair = found.pair
        if isinstance(pair, NoPair):
            say(screen, f"\n{chance_text(found.asked)} sure of every rule: {scale.text(pair.reason)}")
            continue
        text = f"A {scale.height_text(pair.antenna_a_m)}, B {scale.height_text(pair.antenna_b_m)}"
        say(screen, f"\n{chance_text(found.asked)} sure of every rule: {text}, cost {pair.cost:g}")
