"""`hopwright study`: one hop, end to end."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from profiler.cli.hop_options import hop_options, named, read_hop, speech_options
from profiler.cli.number import NUMBER
from profiler.cli.output import check_targets, csv_text, deliver, rendered
from profiler.errors import InputError

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
@click.option(
    "--distance-limits", type=(NUMBER, NUMBER), metavar="FROM TO", help="Fix the figure's distance axis, km (mi)."
)
@click.option("--height-limits", type=(NUMBER, NUMBER), metavar="FROM TO", help="Fix the figure's height axis, m (ft).")
@speech_options
def command(
    json_to: str | None,
    csv_to: str | None,
    figures: tuple[Path, ...],
    margin_figures: tuple[Path, ...],
    feet: bool,
    full: bool,
    distance_limits: Limits,
    height_limits: Limits,
    quiet: bool,
    no_color: bool,
    **hop_given: Any,
) -> int:
    """Study one hop: clearance, losses, fade margin and objective.

    Give a HOP.toml, or the sites in options. Exit code 0: the hop passes; 1: it does not; 2: the input is wrong.
    """
    from profiler.document import point_table, to_document
    from profiler.study import run_study

    hop = read_hop(**hop_given)
    check_targets(json_to, csv_to, figures=(*figures, *margin_figures), reads=hop)
    with named(hop.source):
        study = run_study(hop, relief=bool(figures))
    axes = {"feet": feet, "distance_limits": distance_limits, "height_limits": height_limits}
    drawn = [
        *rendered(figures, lambda: _profile(study, **axes)),
        *rendered(margin_figures, lambda: _margins(study, feet=feet)),
    ]
    if deliver(
        drawn,
        csv_to=csv_to,
        table=lambda: csv_text(*point_table(study, feet=feet)),
        json_to=json_to,
        document=lambda: to_document(study),
    ):
        from profiler.cli.show import show_study

        show_study(study, feet=feet, full=full, quiet=quiet, color=not no_color)
    return 0 if study.verdict.outcome == "passes" else 1


def _profile(study: Study, **axes: Any) -> Any:
    from profiler.figures import profile_figure

    return profile_figure(study, **axes)


def _margins(study: Study, *, feet: bool) -> Any:
    from profiler.figures import margin_figure

    if study.outage.curve is None:
        raise InputError(
            f"{study.hop.source}: --margin-figure: must have a [radio] with a threshold and [availability] to draw"
        )
    return margin_figure(study, feet=feet)
