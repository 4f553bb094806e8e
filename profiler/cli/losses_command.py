"""`hopwright losses`: every diffraction method side by side for one hop."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import click

from profiler.cli.hop_options import hop_options, named, read_hop, speech_options
from profiler.cli.output import check_targets, json_text, put
from profiler.remarks import db_text, k_text, listed, minus

if TYPE_CHECKING:
    from rich.table import Table

    from profiler.cli.brief import Part
    from profiler.diffraction import DiffractionLoss
    from profiler.study import Study
    from profiler.words import Scale

__all__ = ["command"]

_MOST_K = 2
"""Factors k that stand on the short screen."""


@click.command("losses")
@hop_options
@click.option("--json", "json_to", metavar="FILE", help="Write the losses as JSON; - for standard output.")
@speech_options
def command(json_to: str | None, feet: bool, full: bool, quiet: bool, no_color: bool, **hop_given: Any) -> int:
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
        _show(study, by_k, feet=feet, full=full, quiet=quiet, color=not no_color)
    return 0


def _show(
    study: Study,
    by_k: dict[float, tuple[DiffractionLoss, ...]],
    *,
    feet: bool,
    full: bool,
    quiet: bool,
    color: bool,
) -> None:
    """Print the losses of every method; in full the edges and the rounded tops behind them too."""
    from profiler.cli.brief import Part, show_brief
    from profiler.cli.screen import compact_table, console, say, show_notes, show_table
    from profiler.words import Scale

    screen, scale = console(color=color), Scale(feet=feet)
    doubts = dict.fromkeys(scale.text(each) for losses in by_k.values() for loss in losses for each in loss.warnings)
    rows = list(zip(*by_k.values(), strict=True))
    if not full:
        parts = [_row_part(study, losses) for losses in rows]
        head = Part(f"{study.hop.name}: diffraction loss by every method.", "bold")
        if quiet:
            for part in parts:
                say(screen, part.text, part.style)
        else:
            show_brief(screen, (head, *parts), list(doubts), "choose the method that fits the obstacles.")
        return
    table = compact_table("diffraction loss, dB", *(f"k = {k_text(k)}" for k in by_k))
    for losses in rows:
        chosen = losses[0].method == study.hop.diffraction.method
        name = losses[0].method + (" (chosen)" if chosen else "")
        table.add_row(name, *(f"{loss.loss_db:.2f}" for loss in losses), style="bold" if chosen else "")
    show_table(screen, table)
    for each in (_edges_table(by_k, scale), _tops_table(by_k, scale)):
        if each.rows:
            say(screen, "")
            show_table(screen, each)
    show_notes(screen, "Warnings", tuple(doubts), "yellow")


def _row_part(study: Study, losses: tuple[DiffractionLoss, ...]) -> Part:
    """Say what one method gives at each k."""
    from profiler.cli.brief import Part

    chosen = losses[0].method == study.hop.diffraction.method
    values = [f"{db_text(loss.loss_db)} at k = {k_text(loss.k)}" for loss in losses[:_MOST_K]]
    values += [f"{len(losses) - _MOST_K} more"] if len(losses) > _MOST_K else []
    return Part(f"{losses[0].method}{', chosen' if chosen else ''}: {listed(values)}", "bold" if chosen else "")


def _edges_table(by_k: dict[float, tuple[DiffractionLoss, ...]], scale: Scale) -> Table:
    """Tabulate the edges that each method used."""
    from profiler.cli.screen import compact_table

    titles = (f"{scale.distance_unit} from A", f"height {scale.height_unit}", "ν", "loss dB")
    table = compact_table("edge", "k", "method", *titles, words=("method",))
    for k, losses in by_k.items():
        for loss in losses:
            for number, edge in enumerate(loss.edges, start=1):
                charged = "–" if edge.loss_db is None else f"{edge.loss_db:.2f}"
                where = scale.distance_number(edge.distance_m, 3), scale.height_number(edge.height_m)
                table.add_row(str(number), k_text(k), loss.method, *where, minus(f"{edge.nu:.2f}"), charged)
    return table


def _tops_table(by_k: dict[float, tuple[DiffractionLoss, ...]], scale: Scale) -> Table:
    """Tabulate the rounded tops that were fitted."""
    from profiler.cli.screen import compact_table

    far, near = scale.distance_unit, scale.height_unit
    table = compact_table("rounded top", f"radius {near}", "roundness", f"from {far}", f"to {far}")
    for k, losses in by_k.items():
        for top in (loss.top for loss in losses if loss.top is not None):
            fit = ("not convex", "–")
            if top.radius_m is not None:
                fit = scale.height_number(top.radius_m, 0), f"{top.roundness:.3f}"
            span = scale.distance_number(top.from_m, 3), scale.distance_number(top.to_m, 3)
            table.add_row(f"k = {k_text(k)}", *fit, *span)
    return table
