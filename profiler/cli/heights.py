"""`hopwright heights`: the antenna heights that clear, the cheapest under limits, and how sure they are."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from profiler.cli.options import hop_options, named, read_hop, speech_options
from profiler.cli.output import check_targets, json_text, put, write_whole
from profiler.errors import InputError

if TYPE_CHECKING:
    from profiler.models import Hop
    from profiler.study.plan import HeightsPlan

__all__ = ["command"]


@click.command("heights")
@hop_options
@click.option("--json", "json_to", metavar="FILE", help="Write the plan as JSON; - for standard output.")
@click.option("--csv", "csv_to", metavar="FILE", help="Write the frontier's stretches as CSV; - for standard output.")
@click.option(
    "--figure",
    "figures",
    multiple=True,
    type=click.Path(path_type=Path),
    help="Draw the frontier: .png, .svg or .pdf; may be repeated.",
)
@click.option(
    "--write",
    "write_to",
    type=click.Path(path_type=Path),
    metavar="FILE.toml",
    help="Write a copy of the hop file with the cheapest pair in it.",
)
@click.option("--feet", is_flag=True, help="Print and draw in feet and miles.")
@speech_options
def command(
    json_to: str | None,
    csv_to: str | None,
    figures: tuple[Path, ...],
    write_to: Path | None,
    feet: bool,
    quiet: bool,
    no_color: bool,
    **hop_given: Any,
) -> int:
    """Find the antenna heights that clear every rule, and the cheapest.

    The region of the pairs that clear is exact; the cheapest of them is the cheapest that the towers allow.

    Exit code 0: a pair exists; 1: none does, and what would have to change is said; 2: the input is wrong.
    """
    from profiler.study import run_study
    from profiler.study.plan import heights_document, plan_heights

    check_targets(json_to, csv_to, write_to, figures=figures, hop_file=hop_given["hop_file"])
    hop = read_hop(**hop_given)
    with named(hop.source):
        plan = plan_heights(run_study(hop, losses=False))
        rewritten = None if write_to is None else _rewritten(hop, hop_given["hop_file"], plan)
    drawn = _drawn(plan, figures, feet)
    for path, content in drawn:
        write_whole(path, content)
    if write_to is not None and rewritten is not None:
        write_whole(write_to, rewritten)
    elif write_to is not None:
        click.echo(f"{write_to}: not written, since no pair of heights clears", err=True)
    if csv_to is not None:
        put(csv_to, _csv_text(plan))
    if json_to is not None:
        put(json_to, json_text(heights_document(plan)))
    if "-" not in (json_to, csv_to):
        from profiler.cli.show_heights import show_heights

        show_heights(plan, feet=feet, quiet=quiet, color=not no_color)
    return 0 if plan.feasible else 1


def _drawn(plan: HeightsPlan, paths: tuple[Path, ...], feet: bool) -> list[tuple[Path, bytes]]:
    """Draw the frontier once and render it for every file asked for."""
    if not paths:
        return []
    from profiler.figures import frontier_figure, render

    figure = frontier_figure(plan, feet=feet)
    return [(path, render(figure, path.suffix)) for path in paths]


def _rewritten(hop: Hop, hop_file: Path | None, plan: HeightsPlan) -> str | None:
    """Give the hop file's text with the cheapest pair in it, or None where there is no pair."""
    from profiler.heights import Choice
    from profiler.hopfile import with_antennas

    if hop_file is None:
        raise InputError(f"{hop.source}: --write: must have a hop file to copy; give one instead of options")
    if not isinstance(plan.cheapest, Choice):
        return None
    return with_antennas(hop_file.read_text(encoding="utf-8"), plan.cheapest.antenna_a_m, plan.cheapest.antenna_b_m)


def _csv_text(plan: HeightsPlan) -> str:
    """Write the frontier's corners as CSV, each with the obstacle and the rule that govern up to the next corner."""
    import csv
    import io

    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow(["stretch", "antenna_a_m", "antenna_b_m", "obstacle_distance_m", "least_ray_m", "rule"])
    for number, stretch in enumerate(plan.stretches, start=1):
        for antenna_a_m, antenna_b_m in stretch.corners_m.tolist():
            writer.writerow(
                [number, antenna_a_m, antenna_b_m, stretch.distance_m, stretch.least_ray_m, stretch.rule + 1]
            )
    return text.getvalue()
