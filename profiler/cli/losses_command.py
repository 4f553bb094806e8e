"""`hopwright losses`: every diffraction method side by side for one hop."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import click

from profiler.cli.hop_options import hop_options, named, read_hop, speech_options
from profiler.cli.output import check_targets, json_text, put

if TYPE_CHECKING:
    from profiler.diffraction import DiffractionLoss
    from profiler.study import Study

__all__ = ["command"]


@click.command("losses")
@hop_options
@click.option("--json", "json_to", metavar="FILE", help="Write the losses as JSON; - for standard output.")
@speech_options
def command(json_to: str | None, quiet: bool, no_color: bool, **hop_given: Any) -> int:
    """List the diffraction loss of one hop by every method.

    At every k of the rules and at the median k, with the edges that each method used.
    """
    from profiler.diffraction import METHODS
    from profiler.study import losses_at, run_study

    hop = read_hop(**hop_given)
    check_targets(json_to, reads=hop)
    with named(hop.source):
        study = run_study(hop)
    ks = (study.climate.median_k, *(rule.k for rule in hop.rules))
    centres = (study.centre_a_m, study.centre_b_m)
    cell_m = study.terrain.finest_cell_m
    by_method = [
        losses_at(hop, study.profile, ks, *centres, cell_m=cell_m, method=each.name) for each in METHODS.values()
    ]
    by_k = {k: tuple(losses[k] for losses in by_method) for k in dict.fromkeys(ks)}
    if json_to is not None:
        losses = [loss for found in by_k.values() for loss in found]
        put(json_to, json_text({"schema": "hopwright-losses/1", "hop": hop.name, "diffraction": losses}))
    if json_to != "-":
        _show(study, by_k, quiet=quiet, color=not no_color)
    return 0


def _show(study: Study, by_k: dict[float, tuple[DiffractionLoss, ...]], *, quiet: bool, color: bool) -> None:
    """Print a row for each method and a column for each k, then the edges, the rounded tops and the doubts."""
    from profiler.cli.screen import compact_table, console, say, show_notes, show_table

    screen = console(color=color)
    table = compact_table("diffraction loss, dB", *(f"k = {k:.3f}" for k in by_k))
    for rows in zip(*by_k.values(), strict=True):
        chosen = rows[0].method == study.hop.diffraction.method
        name = rows[0].method + (" (chosen)" if chosen else "")
        table.add_row(name, *(f"{loss.loss_db:.2f}" for loss in rows), style="bold" if chosen else "")
    show_table(screen, table)
    if quiet:
        return
    edges = compact_table("edge", "k", "method", "km from A", "height m", "nu", "loss dB", words=("method",))
    for k, losses in by_k.items():
        for loss in losses:
            for number, edge in enumerate(loss.edges, start=1):
                charged = "-" if edge.loss_db is None else f"{edge.loss_db:.2f}"
                where = (f"{edge.distance_m / 1e3:.3f}", f"{edge.height_m:.1f}", f"{edge.nu:.2f}")
                edges.add_row(str(number), f"{k:.3f}", loss.method, *where, charged)
    tops = compact_table("rounded top", "radius m", "roundness m", "from km", "to km")
    for k, losses in by_k.items():
        for top in (loss.top for loss in losses if loss.top is not None):
            fit = ("not convex", "-") if top.radius_m is None else (f"{top.radius_m:.0f}", f"{top.roundness:.3f}")
            tops.add_row(f"k = {k:.3f}", *fit, f"{top.from_m / 1e3:.3f}", f"{top.to_m / 1e3:.3f}")
    for each in (edges, tops):
        if each.rows:
            say(screen, "")
            show_table(screen, each)
    doubts = dict.fromkeys(warning for losses in by_k.values() for loss in losses for warning in loss.warnings)
    show_notes(screen, "Warnings", tuple(doubts), "yellow")
