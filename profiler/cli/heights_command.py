"""`hopwright heights`: the antenna heights that clear, the cheapest under limits, and how sure they are."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from profiler.cli.hop_options import hop_options, named, read_hop, speech_options
from profiler.cli.number import NUMBER
from profiler.cli.output import check_targets, csv_text, deliver, rendered, tell
from profiler.errors import InputError, field_error

if TYPE_CHECKING:
    from profiler.heights import Choice
    from profiler.models import Hop
    from profiler.plan import HeightsPlan

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
    help="Write a copy of the hop file with the pair that meets everything in it.",
)
@click.option(
    "--sure",
    "sure_percent",
    type=NUMBER,
    metavar="PERCENT",
    help="Let the pair clear with this chance, by [confidence]: 50 to 99.9.",
)
@speech_options
def command(
    json_to: str | None,
    csv_to: str | None,
    figures: tuple[Path, ...],
    write_to: Path | None,
    sure_percent: float | None,
    feet: bool,
    full: bool,
    quiet: bool,
    no_color: bool,
    **hop_given: Any,
) -> int:
    """Find the antenna heights that clear every rule, and the cheapest.

    The region of the pairs that clear is exact; the cheapest of them is the cheapest that the towers allow. The pair
    given first also meets what else the hop file asks for: a fade margin, the objective, a loss limit; and the chance
    given by --sure.

    Exit code 0: there is a pair and a hop with it passes; 1: not so, and why is said; 2: the input is wrong.
    """
    from profiler.document.heights_document import heights_document
    from profiler.plan import plan_heights
    from profiler.study import run_study

    hop = read_hop(**hop_given, antennas=False, steps_in_feet=feet)
    check_targets(json_to, csv_to, write_to, figures=figures, reads=hop)
    with named(hop.source):
        sure = None if sure_percent is None else _share(sure_percent)
        plan = plan_heights(run_study(hop, losses=False), sure=sure)
        rewritten = None if write_to is None else _rewritten(hop, hop_given["hop_file"], plan, write_to)
    files: list[tuple[Path, bytes | str]] = [*rendered(figures, lambda: _frontier(plan, feet))]
    if write_to is not None and rewritten is not None:
        files.append((write_to, rewritten))
    if deliver(
        files,
        csv_to=csv_to,
        table=lambda: _csv_text(plan),
        json_to=json_to,
        document=lambda: heights_document(plan),
    ):
        from profiler.cli.show_heights import show_heights

        show_heights(plan, feet=feet, full=full, quiet=quiet, color=not no_color)
    if write_to is not None and rewritten is None:
        tell(f"{write_to}: not written, since no pair of heights does all that is asked", err=True)
    return 0 if plan.outcome == "passes" else 1


def _share(percent: float) -> float:
    """Turn the chance asked for into a share."""
    if not 50.0 <= percent <= 99.9:
        raise InputError(f"--sure = {percent:g}: must be a chance of 50 to 99.9 %")
    return percent / 100.0


def _pair(plan: HeightsPlan) -> Choice | None:
    """Give the pair that meets everything, if there is one."""
    from profiler.heights import NoPair

    pair = plan.answer.pair
    return None if isinstance(pair, NoPair) else pair


def _frontier(plan: HeightsPlan, feet: bool) -> Any:
    from profiler.figures import frontier_figure

    return frontier_figure(plan, feet=feet)


def _rewritten(hop: Hop, hop_file: Path | None, plan: HeightsPlan, write_to: Path) -> bytes | None:
    """Give the hop file with the pair that meets everything in it, or None where there is none."""
    from profiler.hopfile import with_antennas, with_paths_from

    if hop_file is None:
        raise InputError(f"{hop.source}: --write: must have a hop file to copy; give one instead of options")
    if hop.overrides:
        remedy = "write the keys into the file, or leave --write out"
        raise field_error(hop.source, "--write", str(write_to), "without options that set keys", remedy)
    pair = _pair(plan)
    if pair is None:
        return None
    text = hop_file.read_bytes().decode()  # with its line ends
    copy = with_antennas(text, pair.antenna_a_m, pair.antenna_b_m)
    return with_paths_from(copy, hop_file.parent, write_to.parent).encode()


def _csv_text(plan: HeightsPlan) -> str:
    """Write the frontier's corners as CSV, each with what governs up to the next: where it stands and its rule."""
    names = ["stretch", "antenna_a_m", "antenna_b_m", "obstacle_distance_m", "least_ray_m", "rule"]
    names += ["obstacle_offset_m", "latitude", "longitude", "ground_m", "cover_m"]
    rows = []
    for number, stretch in enumerate(plan.stretches, start=1):
        place = plan.source(stretch.point, stretch.rule)
        asks = (stretch.distance_m, stretch.least_ray_m, stretch.rule + 1)
        where = (place.offset_m, place.latitude, place.longitude, place.ground_m, place.cover_m)
        rows += [(number, *corner, *asks, *where) for corner in stretch.corners_m.tolist()]
    return csv_text(names, rows)
