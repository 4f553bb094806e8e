"""A heights plan on the terminal: the pair first, then the frontier and the rest."""

from __future__ import annotations

from typing import TYPE_CHECKING

from profiler.cli.output import console
from profiler.cli.show import Scale, compact_table, show_notes
from profiler.heights import Choice, Least, NoPair

if TYPE_CHECKING:
    from rich.console import Console

    from profiler.heights import LimitHeights
    from profiler.study.plan import HeightsPlan

__all__ = ["show_heights"]


def show_heights(plan: HeightsPlan, *, feet: bool, quiet: bool, color: bool) -> None:
    """Print a heights plan."""
    screen, scale = console(color=color), Scale(feet=feet)
    _show_pair(screen, plan, scale)
    if quiet:
        return
    _show_sheet(screen, plan, scale)
    screen.print(f"\nLeast equal heights: {_least(plan, plan.least_equal, scale)}", markup=False)
    site_a, site_b = plan.study.hop.site_a, plan.study.hop.site_b
    for fixed, other, height_m, found in (
        ("B", "A", site_b.antenna_m, plan.least_a),
        ("A", "B", site_a.antenna_m, plan.least_b),
    ):
        text = _least(plan, found, scale) if isinstance(found, Least) else found.reason
        screen.print(
            f"Least {other} with {fixed} at {scale.height(height_m)} {scale.height_unit}: {text}", markup=False
        )
    _show_frontier(screen, plan, scale)
    if plan.for_loss is not None:
        asked = plan.study.hop.heights
        title = f"Diffraction loss of {asked.loss_limit_db:g} dB at k = {asked.loss_k:.3f}"
        _show_limit(screen, title, plan.for_loss, scale)
    if plan.for_objective is not None:
        _show_limit(screen, "Availability objective", plan.for_objective, scale)
    _show_diversity(screen, plan, scale)
    if plan.study.confidence is not None:
        from profiler.cli.show import show_sure_heights

        show_sure_heights(screen, plan.study.confidence, scale)
    show_notes(screen, "Assumed", plan.study.assumptions)
    screen.print(
        "\nA screening result: tower loading, lighting, aircraft notice and exposure are for licensed practice and"
        " local codes. A height threshold here counts the antenna's centre, not the top of the structure.",
        style="dim",
        markup=False,
        soft_wrap=True,
    )


def _show_pair(screen: Console, plan: HeightsPlan, scale: Scale) -> None:
    """Print the cheapest pair, or why there is none and what would have to change."""
    choice, unit = plan.cheapest, scale.height_unit
    if isinstance(choice, Choice):
        screen.print(
            f"{plan.study.hop.name}: A {scale.height(choice.antenna_a_m)} {unit}, B {scale.height(choice.antenna_b_m)}"
            f" {unit} above ground clear every rule, cost {choice.cost:g}",
            style="bold green",
            markup=False,
            soft_wrap=True,
        )
        return
    screen.print(f"{plan.study.hop.name}: {choice.reason}", style="bold red", markup=False, soft_wrap=True)
    show_notes(screen, "Any one of these would do", choice.remedies)


def _least(plan: HeightsPlan, least: Least, scale: Scale) -> str:
    """Give a least height with what asks for it."""
    rule = "its own ground" if least.rule < 0 else _rule(plan, least.rule)
    return (
        f"{scale.height(least.height_m, 2)} {scale.height_unit}, for the ground at {scale.distance(least.distance_m)}"
        f" {scale.distance_unit} under {rule}"
    )


def _rule(plan: HeightsPlan, number: int) -> str:
    rule = plan.study.hop.rules[number]
    margin = f" + {rule.margin_m:g} m" if rule.margin_m else ""
    return f"{rule.fresnel_fraction:g} F1{margin} at k = {rule.k:.3f}"


def _show_sheet(screen: Console, plan: HeightsPlan, scale: Scale) -> None:
    """Print both ends' mounted heights in both unit systems."""
    sheet = plan.sheet
    if sheet is None:
        return
    del scale  # a mounting sheet always gives both unit systems
    table = compact_table("mounted", "above ground m", "ft", "ground m", "ft", "above sea level m", "ft")
    for end, name in ((sheet.end_a, plan.study.hop.site_a.name), (sheet.end_b, plan.study.hop.site_b.name)):
        heights = (end.antenna_m, end.antenna_ft, end.ground_m, end.ground_ft, end.centre_m, end.centre_ft)
        table.add_row(f"{end.end}  {name}", *(f"{height:.1f}" for height in heights))
    screen.print()
    screen.print(table)
    screen.print("Re-checked through the rules: " + ("passes" if sheet.passes else "FAILS"), markup=False)


def _show_frontier(screen: Console, plan: HeightsPlan, scale: Scale) -> None:
    """Print the frontier within the towers' limits, a row for each stretch."""
    unit = scale.height_unit
    table = compact_table(f"frontier, {unit}", "A from", "B from", "A to", "B to", f"obstacle at {scale.distance_unit}",
                          "rule", words=("rule",))  # fmt: skip
    for number, stretch in enumerate(plan.stretches, start=1):
        first, last = stretch.corners_m[0], stretch.corners_m[-1]
        heights = (scale.height(value) for value in (*first, *last))
        rule = "site's own ground" if stretch.rule < 0 else _rule(plan, stretch.rule)
        table.add_row(str(number), *heights, scale.distance(stretch.distance_m), rule)
    screen.print()
    if plan.stretches:
        screen.print(table)
    else:
        screen.print("Frontier: none of it lies within the towers' limits.")


def _show_limit(screen: Console, title: str, found: LimitHeights, scale: Scale) -> None:
    """Print the heights for a limit on loss or outage."""
    unit = scale.height_unit
    screen.print(f"\n{title}:", style="bold", markup=False)
    if found.least_equal_m is not None:
        caution = "" if found.holds_above else "; not at every greater height: the loss is not monotone here"
        screen.print(f"  least equal heights {scale.height(found.least_equal_m, 2)} {unit}{caution}", markup=False)
    choice = found.cheapest
    if isinstance(choice, NoPair):
        screen.print(f"  {choice.reason}", markup=False, soft_wrap=True)
    else:
        screen.print(
            f"  cheapest pair found: A {scale.height(choice.antenna_a_m)}, B {scale.height(choice.antenna_b_m)} {unit},"
            f" cost {choice.cost:g}",
            markup=False,
        )


def _show_diversity(screen: Console, plan: HeightsPlan, scale: Scale) -> None:
    """Print the lower antennas of a diversity pair."""
    unit = scale.height_unit
    for end in plan.diversity:
        screen.print(
            f"\nDiversity at {end.end}: lower antenna {scale.height(end.lower_m)} {unit}, {scale.height(end.spacing_m)}"
            f" {unit} ({end.spacing_wavelengths:.0f} wavelengths) below the main one; it needs"
            f" {scale.height(end.least_m)} to {scale.height(end.full_m)} {unit}",
            markup=False,
            soft_wrap=True,
        )
        for note in end.notes:
            screen.print(f"  - {note}", markup=False, soft_wrap=True)
