"""`hopwright reach`: the inverse questions of the link budget."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any, Literal

import click

from profiler.cli.hop_options import hop_options, named, read_hop, speech_options
from profiler.cli.lines import lines_table, seen_from
from profiler.cli.number import NUMBER, NumberRange
from profiler.cli.output import check_targets, json_text, put
from profiler.errors import InputError
from profiler.remarks import db_text, listed, minus

if TYPE_CHECKING:
    from rich.table import Table

    from profiler.budget import InverseAnswer, Way
    from profiler.receiver import Line
    from profiler.study import Study
    from profiler.words import Scale

__all__ = ["command"]

_WAYS: tuple[Way, ...] = ("a_to_b", "b_to_a")
_QUESTIONS = {
    "longest_free_space_range": "longest range in free space",
    "least_power": "least power on this hop",
    "smallest_dish_both": "smallest equal dishes on this hop",
    "smallest_dish_a": "smallest dish at A on this hop",
    "smallest_dish_b": "smallest dish at B on this hop",
    "least_gain_both": "least equal antenna gains on this hop",
    "least_gain_a": "least antenna gain at A on this hop",
    "least_gain_b": "least antenna gain at B on this hop",
}


@click.command("reach")
@hop_options
@click.option("--mode", metavar="NAME", help="Radio mode; the first by default.")
@click.option("--bit-error-ratio", type=NUMBER, metavar="RATIO", help="Wanted bit error ratio; the mode's by default.")
@click.option(
    "--fade-margin-db",
    type=NumberRange(-200.0, 200.0),
    default=0.0,
    show_default=True,
    metavar="DB",
    help="Margin to keep.",
)
@click.option("--direction", type=click.Choice(_WAYS), help="Direction to answer for; both by default.")
@click.option(
    "--resize",
    type=click.Choice(["both", "a", "b"]),
    default="both",
    show_default=True,
    help="Sites whose antennas are to be found; the other keeps its own.",
)
@click.option("--efficiency", type=NUMBER, metavar="RATIO", help="Of the dish asked for; the hop file's by default.")
@click.option("--json", "json_to", metavar="FILE", help="Write the answers as JSON; - for standard output.")
@speech_options
def command(
    mode: str | None,
    bit_error_ratio: float | None,
    fade_margin_db: float,
    direction: Way | None,
    resize: str,
    efficiency: float | None,
    json_to: str | None,
    feet: bool,
    full: bool,
    quiet: bool,
    no_color: bool,
    **hop_given: Any,
) -> int:
    """Find the longest range, the least power and the smallest dishes.

    The range is in free space; power and dishes are for this hop, with the losses of its path. Needs a [radio] with a
    threshold, or the noise and modulation that give one. Where no efficiency of a dish is known, its gain is found.
    """
    from profiler.study import run_study

    hop = read_hop(**hop_given)
    check_targets(json_to, reads=hop)
    if hop.radio is None:
        raise InputError(
            f"{hop.source}: radio: must be given to answer from; add [radio.a], [radio.b] and [[radio.mode]]"
        )
    wanted = {"mode": mode, "bit_error_ratio": bit_error_ratio, "fade_margin_db": fade_margin_db}
    ways = _WAYS if direction is None else (direction,)
    with named(hop.source):
        study = run_study(hop)
        answers = {way: _answers(study, way, resize, efficiency, wanted) for way in ways}
    if json_to is not None:
        put(json_to, json_text({"schema": "hopwright-reach/1", "hop": hop.name, "answers": answers}))
    if json_to != "-":
        asked = f"mode {mode or hop.radio.modes[0].name} and a fade margin of {db_text(fade_margin_db)}"
        _show(
            f"{hop.name}: what the radio reaches with {asked}.",
            answers,
            feet=feet,
            full=full,
            quiet=quiet,
            color=not no_color,
        )
    return 0


def _answers(
    study: Study, way: Way, resize: str, efficiency: float | None, wanted: dict[str, Any]
) -> dict[str, InverseAnswer]:
    """Answer every question for one direction, by the question's key."""
    from profiler.budget import least_gain, least_power, longest_free_space_range, smallest_dish

    hop = study.hop
    assert hop.radio is not None
    assert study.budget is not None
    wanted = {**wanted, "direction": way}
    frequency_hz, lost = hop.frequencies_hz[way], getattr(study.budget, way)
    path = (hop.radio, study.line.distance_m, frequency_hz)
    here = {**wanted, "gas_db": lost.gas_db, "diffraction_db": lost.diffraction_db}
    answers = {
        "longest_free_space_range": longest_free_space_range(hop.radio, frequency_hz, **wanted),
        "least_power": least_power(*path, **here),
    }
    ends = {"a": hop.radio.terminal_a, "b": hop.radio.terminal_b}
    resized: Literal["both", "transmitter", "receiver"] = "both"
    which = "both"
    if resize != "both":
        ends = {resize: ends[resize]}
        resized = "transmitter" if way.startswith(resize) else "receiver"
        which = resize
    if efficiency is not None or all(end.efficiency is not None for end in ends.values()):
        answers[f"smallest_dish_{which}"] = smallest_dish(*path, **here, resized=resized, efficiency=efficiency)
    else:
        answers[f"least_gain_{which}"] = least_gain(*path, **here, resized=resized)
    return answers


def _show(
    head: str, answers: dict[Way, dict[str, InverseAnswer]], *, feet: bool, full: bool, quiet: bool, color: bool
) -> None:
    """Print the answers, then the lines that each stands on."""
    from profiler.budget import way_name
    from profiler.cli.brief import Part, show_brief
    from profiler.cli.screen import console, say, show_notes, show_table
    from profiler.words import Scale

    screen, scale = console(color=color), Scale(feet=feet)
    questions = {
        _QUESTIONS[key]: {way_name(way): found[key] for way, found in answers.items()}
        for key in next(iter(answers.values()))
    }
    each = [(name, answer) for name, found in questions.items() for answer in found.values()]
    warnings = tuple(
        dict.fromkeys(f"{name}: {scale.text(warning)}" for name, answer in each for warning in answer.warnings)
    )
    parts = [
        Part(f"{name}: {listed([f'{_value(answer, scale)} {way}' for way, answer in found.items()])}.", "bold")
        for name, found in questions.items()
    ]
    if not full:
        if quiet:
            for part in parts:
                say(screen, part.text, part.style)
        else:
            show_brief(screen, (Part(head), *parts), warnings, "study the hop with what you choose from these.")
        return
    for part in parts:
        say(screen, part.text, part.style)
    for name, found in questions.items():
        for alike in _alike(found):
            say(screen, "")
            show_table(screen, _sum_table(name, alike, scale))
    threshold = each[0][1].threshold_lines  # of the mode, so the same for every answer
    if len(threshold) > 1:
        say(screen, "")
        show_table(screen, _threshold_table(threshold, scale))
    show_notes(screen, "Warnings", warnings, "yellow")
    show_notes(
        screen, "Assumed", tuple(dict.fromkeys(scale.text(note) for _, answer in each for note in answer.assumptions))
    )


def _value(answer: InverseAnswer, scale: Scale) -> str:
    if answer.unit != "m":
        return db_text(answer.value, answer.unit, digits=2)
    return scale.distance_text(answer.value) if answer.value >= 1000.0 else scale.height_text(answer.value, 2)


def _alike(found: dict[str, InverseAnswer]) -> list[dict[str, InverseAnswer]]:
    """Put the directions side by side where their lines have the same names, else one after the other."""
    names = [[seen_from(line.name, way) for line in answer.lines] for way, answer in found.items()]
    return [found] if names.count(names[0]) == len(names) else [{way: answer} for way, answer in found.items()]


def _sum_table(name: str, found: dict[str, InverseAnswer], scale: Scale) -> Table:
    """Tabulate the terms of an answer, and below them what they add up to."""
    table = lines_table(name, {way: answer.lines for way, answer in found.items()}, scale)
    way, answer = next(iter(found.items()))
    sums = (minus(f"{math.fsum(line.value for line in each.lines):.2f}") for each in found.values())
    unit = "dBi" if "gain" in answer.solved_for else "dBm" if answer.unit == "dBm" else "dB"
    table.add_section()
    table.add_row(seen_from(answer.solved_for, way), *sums, unit, "", style="bold")
    return table


def _threshold_table(lines: Sequence[Line], scale: Scale) -> Table:
    table = lines_table("threshold", {"both ways": lines}, scale)
    table.add_section()
    table.add_row("threshold", minus(f"{math.fsum(line.value for line in lines):.2f}"), "dBm", "", style="bold")
    return table
