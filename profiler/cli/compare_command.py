"""`hopwright compare`: hops, or variants of one, side by side."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from profiler.cli.hop_options import named, read_hop
from profiler.cli.output import check_targets, json_text, put
from profiler.errors import InputError
from profiler.printable import printable

if TYPE_CHECKING:
    from profiler.document.comparison import Side
    from profiler.models import Hop
    from profiler.words import Scale

__all__ = ["command"]

_ACROSS = 3
"""Columns that fit beside the names of the rows into 80 columns of a terminal."""


@click.command("compare")
@click.argument("hop_files", nargs=-1, required=True, type=click.Path(path_type=Path), metavar="HOP.toml...")
@click.option(
    "--variant",
    "variants",
    multiple=True,
    metavar="KEY=VALUE[; KEY=VALUE...]",
    help="The first hop with these keys set, as one more column; may be repeated.",
)
@click.option(
    "--set", "settings", multiple=True, metavar="KEY=VALUE", help="A key set in every column; may be repeated."
)
@click.option("--json", "json_to", metavar="FILE", help="Write the comparison as JSON; - for standard output.")
@click.option("--feet", is_flag=True, help="Print in feet and miles.")
@click.option("-q", "--quiet", is_flag=True, help="Print the verdicts only.")
@click.option("--no-color", is_flag=True, help="Print without color.")
def command(
    hop_files: tuple[Path, ...],
    variants: tuple[str, ...],
    settings: tuple[str, ...],
    json_to: str | None,
    feet: bool,
    quiet: bool,
    no_color: bool,
) -> int:
    """Put hop files, or variants of one, side by side.

    Exit code 0: every one passes; 1: at least one does not; 2: the input is wrong.
    """
    hops = tuple(_hops(hop_files, variants, settings))
    if len(hops) < 2:
        raise InputError("command line: HOP.toml: must be two or more, or one with --variant, to stand side by side")
    check_targets(json_to, reads=hops)
    sides = tuple(_sides(hops))
    if json_to is not None:
        from profiler.document.comparison import comparison_document

        put(json_to, json_text(comparison_document(sides)))
    if json_to != "-":
        _show(sides, feet=feet, quiet=quiet, color=not no_color)
    return 0 if all(side.study.verdict.outcome == "passes" for side in sides) else 1


def _hops(
    hop_files: tuple[Path, ...], variants: tuple[str, ...], settings: tuple[str, ...]
) -> Iterator[tuple[str, Hop]]:
    """Read every hop and every variant of the first, each with its title."""
    for path in hop_files:
        yield printable(path.stem), read_hop(path, settings=settings)
    for variant in variants:
        own = tuple(part.strip() for part in variant.split(";") if part.strip())
        yield printable(", ".join(own)), read_hop(hop_files[0], settings=(*settings, *own))


def _sides(hops: tuple[tuple[str, Hop], ...]) -> Iterator[Side]:
    """Study every hop, and plan its heights."""
    from profiler.document.comparison import Side
    from profiler.plan import plan_heights
    from profiler.study import run_study

    for title, hop in hops:
        with named(hop.source):
            study = run_study(hop)
            yield Side(title, study, plan_heights(study))


def _show(sides: tuple[Side, ...], *, feet: bool, quiet: bool, color: bool) -> None:
    """Print who is who, then the rows, a few columns at a time."""
    from profiler.cli.screen import compact_table, console, say, show_table
    from profiler.words import Scale, outcome_word

    screen, scale = console(color=color), Scale(feet=feet)
    for number, side in enumerate(sides, start=1):
        say(screen, f"{number}  {side.title}: {outcome_word(side.study.verdict.outcome)}", "bold", hang=3)
    for first in () if quiet else range(0, len(sides), _ACROSS):
        part = sides[first : first + _ACROSS]
        table = compact_table("", *(str(number) for number in range(first + 1, first + 1 + len(part))))
        for name, cells in _rows(part, scale):
            table.add_row(name, *cells)
        say(screen, "")
        show_table(screen, table)


def _rows(sides: tuple[Side, ...], scale: Scale) -> Iterator[tuple[str, list[str]]]:
    """Give the rows of the table: name, and a cell for each side; empty where a hop gives no data."""
    from profiler.remarks import chance_text, cost_text, db_text, time_text
    from profiler.words import outcome_word

    def known(value: Any, write: Any) -> str:
        return "–" if value is None else str(write(value))

    unit = scale.height_unit
    rows: list[tuple[str, Any]] = [
        ("verdict", lambda side: outcome_word(side.study.verdict.outcome)),
        ("chance of clearing", lambda side: known(side.study.verdict.chance, lambda chance: chance_text(chance.value))),
        (f"least surplus, {unit}", lambda side: scale.height_number(side.study.governing.critical.surplus_m)),
        ("least surplus at", lambda side: scale.distance_text(side.study.governing.critical.distance_m)),
        (f"antennas A and B, {unit}", lambda side: _pair(_given(side), scale)),
        (f"least equal, {unit}", lambda side: scale.height_number(side.plan.least_equal.height_m)),
        (f"cheapest pair, {unit}", lambda side: known(side.pair, lambda pair: _pair(_found(pair), scale))),
        ("its cost", lambda side: known(side.pair, lambda pair: cost_text(pair.cost))),
        ("fade margin", lambda side: known(side.margin_db, db_text)),
        ("outage", lambda side: known(side.year_minutes, time_text)),
        ("objective", lambda side: {True: "met", False: "missed", None: "–"}[side.study.verdict.meets_objective]),
    ]
    for name, write in rows:
        yield name, [write(side) for side in sides]


def _given(side: Side) -> tuple[float, float]:
    return side.study.hop.site_a.antenna_m, side.study.hop.site_b.antenna_m


def _found(pair: Any) -> tuple[float, float]:
    return pair.antenna_a_m, pair.antenna_b_m


def _pair(heights_m: tuple[float, float], scale: Scale) -> str:
    return " / ".join(scale.height_number(height_m) for height_m in heights_m)
