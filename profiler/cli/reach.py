"""`hopwright reach`: the inverse questions of the link budget."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import click

from profiler.cli.options import hop_options, named, read_hop, speech_options
from profiler.cli.output import check_targets, console, json_text, put
from profiler.errors import InputError

if TYPE_CHECKING:
    from profiler.budget import Answer

__all__ = ["command"]


@click.command("reach")
@hop_options
@click.option("--mode", metavar="NAME", help="Radio mode; the first by default.")
@click.option("--bit-error-ratio", type=float, metavar="RATIO", help="Wanted bit error ratio; the mode's by default.")
@click.option(
    "--fade-margin-db",
    type=click.FloatRange(-200.0, 200.0),
    default=0.0,
    show_default=True,
    metavar="DB",
    help="Margin to keep.",
)
@click.option(
    "--direction",
    type=click.Choice(["a_to_b", "b_to_a"]),
    default="a_to_b",
    show_default=True,
    help="Direction to answer for.",
)
@click.option("--json", "json_to", metavar="FILE", help="Write the answers as JSON; - for standard output.")
@speech_options
def command(
    mode: str | None,
    bit_error_ratio: float | None,
    fade_margin_db: float,
    direction: str,
    json_to: str | None,
    quiet: bool,
    no_color: bool,
    **hop_given: Any,
) -> int:
    """Find the longest range, the least power and the smallest dishes.

    The range is in free space; power and dishes are for this hop, with the losses of its path. Needs a [radio] with a
    threshold, or the noise and modulation that give one.
    """
    from profiler.budget import least_power, longest_free_space_range, smallest_dish
    from profiler.study import plain, run_study

    check_targets(json_to, hop_file=hop_given["hop_file"])
    hop = read_hop(**hop_given)
    if hop.radio is None:
        raise InputError(
            f"{hop.source}: radio: must be given to answer from; add [radio.a], [radio.b] and [[radio.mode]]"
        )
    with named(hop.source):
        study = run_study(hop)
        wanted: dict[str, Any] = {
            "mode": mode,
            "bit_error_ratio": bit_error_ratio,
            "fade_margin_db": fade_margin_db,
            "direction": direction,
        }
        assert study.median_diffraction is not None
        wanted_here = {**wanted, "gas_db": study.air.gas_db, "diffraction_db": study.median_diffraction.loss_db}
        distance_m = study.line.distance_m
        answers = {
            "longest range in free space": longest_free_space_range(hop.radio, hop.frequency_hz, **wanted),
            "least power on this hop": least_power(hop.radio, distance_m, hop.frequency_hz, **wanted_here),
        }
        if all(end.diameter_m is not None for end in (hop.radio.terminal_a, hop.radio.terminal_b)):
            answers["smallest equal dishes on this hop"] = smallest_dish(
                hop.radio, distance_m, hop.frequency_hz, **wanted_here
            )
    if json_to is not None:
        found = {name: plain(answer) for name, answer in answers.items()}
        put(json_to, json_text({"schema": "hopwright-reach/1", "hop": hop.name, "answers": found}))
    if json_to != "-":
        _show(answers, quiet=quiet, color=not no_color)
    return 0


def _show(answers: dict[str, Answer], *, quiet: bool, color: bool) -> None:
    """Print each answer, then the lines that it stands on."""
    from profiler.cli.show import compact_table, show_notes

    screen = console(color=color)
    for name, answer in answers.items():
        value = f"{answer.value / 1e3:.2f} km" if answer.value >= 1e3 else f"{answer.value:.2f} {answer.unit}"
        screen.print(f"{name}: {value}", style="bold", markup=False)
        if quiet:
            continue
        table = compact_table("line", "value", "unit", "by", words=("unit", "by"))
        for line in (*answer.lines, *answer.threshold_lines):
            table.add_row(line.name, f"{line.value:.2f}", line.unit, line.note)
        screen.print(table)
        show_notes(screen, "Assumed", answer.assumptions)
        show_notes(screen, "Warnings", answer.warnings, "yellow")
        screen.print()
