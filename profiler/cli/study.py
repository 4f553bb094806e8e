"""`hopwright study`: one hop, end to end."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from profiler.cli.options import hop_options, named, read_hop, speech_options
from profiler.cli.output import check_targets, json_text, put, write_whole

if TYPE_CHECKING:
    from profiler.study import Study

__all__ = ["command"]

Limits = tuple[float, float] | None


@click.command("study")
@hop_options
@click.option("--json", "json_to", metavar="FILE", help="Write the whole result as JSON; - for standard output.")
@click.option("--csv", "csv_to", metavar="FILE", help="Write the point table as CSV; - for standard output.")
@click.option(
    "--figure",
    "figures",
    multiple=True,
    type=click.Path(path_type=Path),
    help="Draw the profile: .png, .svg or .pdf; may be repeated.",
)
@click.option(
    "--margin-figure",
    "margin_figures",
    multiple=True,
    type=click.Path(path_type=Path),
    help="Draw fade margin against outage; needs a radio and availability in the hop file.",
)
@click.option("--feet", is_flag=True, help="Print and draw in feet and miles.")
@click.option(
    "--distance-limits", type=(float, float), metavar="FROM TO", help="Fix the figure's distance axis, km (mi)."
)
@click.option("--height-limits", type=(float, float), metavar="FROM TO", help="Fix the figure's height axis, m (ft).")
@speech_options
def command(
    json_to: str | None,
    csv_to: str | None,
    figures: tuple[Path, ...],
    margin_figures: tuple[Path, ...],
    feet: bool,
    distance_limits: Limits,
    height_limits: Limits,
    quiet: bool,
    no_color: bool,
    **hop_given: Any,
) -> int:
    """Study one hop: clearance, losses, fade margin and objective.

    Give a HOP.toml, or the sites in options. Exit code 0: the hop passes; 1: it does not; 2: the input is wrong.
    """
    from profiler.study import run_study, to_document

    check_targets(json_to, csv_to, figures=(*figures, *margin_figures), hop_file=hop_given["hop_file"])
    hop = read_hop(**hop_given)
    with named(hop.source):
        study = run_study(hop, relief=bool(figures))
    drawn = [
        *_drawn_profiles(study, figures, feet, distance_limits, height_limits),
        *_drawn_margins(study, margin_figures),
    ]
    for path, content in drawn:
        write_whole(path, content)
    if csv_to is not None:
        put(csv_to, _csv_text(study))
    if json_to is not None:
        put(json_to, json_text(to_document(study)))
    if "-" not in (json_to, csv_to):
        from profiler.cli.show import show_study

        show_study(study, feet=feet, quiet=quiet, color=not no_color)
    return 0 if study.verdict.passes else 1


def _drawn_profiles(
    study: Study, paths: tuple[Path, ...], feet: bool, distance_limits: Limits, height_limits: Limits
) -> list[tuple[Path, bytes]]:
    """Draw the profile once and render it for every file asked for."""
    if not paths:
        return []
    from profiler.figures import profile_figure, render

    figure = profile_figure(study, feet=feet, distance_limits=distance_limits, height_limits=height_limits)
    return [(path, render(figure, path.suffix)) for path in paths]


def _drawn_margins(study: Study, paths: tuple[Path, ...]) -> list[tuple[Path, bytes]]:
    """Draw margin against outage once and render it for every file asked for."""
    if not paths:
        return []
    from profiler.errors import InputError
    from profiler.figures import margin_figure, render

    if study.outage_curve is None:
        raise InputError(
            f"{study.hop.source}: --margin-figure: must have a [radio] with a threshold and [availability] to draw"
        )
    figure = margin_figure(study)
    return [(path, render(figure, path.suffix)) for path in paths]


def _csv_text(study: Study) -> str:
    """Write the point table as CSV, full precision, one header row with units in the names."""
    import csv
    import io

    from profiler.study import point_table

    names, numbers = point_table(study)
    text = io.StringIO()
    writer = csv.writer(text, lineterminator="\n")
    writer.writerow(names)
    writer.writerows([["" if value != value else repr(value) for value in row] for row in numbers.tolist()])  # noqa: PLR0124 - NaN
    return text.getvalue()
