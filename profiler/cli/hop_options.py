"""Options that several commands share: the hop, given as a file or in options, and how to speak."""

from __future__ import annotations

import re
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from profiler.cli.number import NUMBER, is_number
from profiler.errors import HopwrightError, InputError

if TYPE_CHECKING:
    from profiler.models import Hop

__all__ = ["hop_options", "named", "read_hop", "speech_options"]

Command = Callable[..., Any]

_COMMAND_LINE = "command line"
_SPELLING = {"position_a": "--a", "position_b": "--b", "rules": "--rule"}
_OPTION_OF = (
    (r"\[\[rules\.rule\]\] tables with k and fresnel_fraction", "--rule"),
    (r"rules\.rule\[\d+\]\.k", "--rule K"),
    (r"rules\.rule\[\d+\]\.fresnel_fraction", "--rule FRACTION"),
    (r"rules\.rule\[\d+\]\.margin_m", "--rule MARGIN_M"),
    (r"rules\.preset|rules(?= = \()", "--preset"),
    (r"rules\.low_k", "--low-k"),
    (r"site_([ab])\.antenna(?:_m|_ft)?", r"--antenna-\1"),
    (r"site_([ab])(?:\.position)?", r"--\1"),
    (r"frequency_ghz", "--frequency-ghz"),
    (r"terrain\.paths\[\d+\]", "--terrain"),
    (r"paths start from the folder of the hop file", "paths start from the folder that you are in"),
)
"""How messages about keys of a hop file read where options stand for them: pattern, replacement."""


def hop_options(command: Command) -> Command:
    """Add the hop file and, for a hop without a file, the options that say the same."""
    options = [
        click.argument("hop_file", required=False, type=click.Path(path_type=Path), metavar="[HOP.toml]"),
        click.option(
            "--a", "position_a", metavar="POSITION", help='Site A without a file: "40.1, -105.2" or DMS text.'
        ),
        click.option("--b", "position_b", metavar="POSITION", help="Site B, likewise."),
        click.option("--antenna-a", metavar="HEIGHT", help='Antenna A above ground: metres, or "98 ft".'),
        click.option("--antenna-b", metavar="HEIGHT", help="Antenna B, likewise."),
        click.option("--frequency-ghz", type=NUMBER, metavar="GHZ", help="Frequency."),
        click.option(
            "--terrain",
            multiple=True,
            metavar="PATH",
            help="Raster or folder of rasters; may be repeated.",
        ),
        click.option("--preset", metavar="NAME", help="Named clearance rules; an unknown name lists them."),
        click.option("--low-k", type=NUMBER, metavar="K", help="Low k for presets that ask for one."),
        click.option(
            "--rule",
            "rules",
            multiple=True,
            type=(NUMBER, NUMBER, NUMBER),
            metavar="K FRACTION MARGIN_M",
            help="A rule of your own: k, fraction of F1, margin in metres; may be repeated.",
        ),
    ]
    for option in reversed(options):
        command = option(command)
    return command


def speech_options(command: Command) -> Command:
    """Add the options that say how much and how to print."""
    for option in (
        click.option("--no-color", is_flag=True, help="Print without color."),
        click.option("-q", "--quiet", is_flag=True, help="Print the verdict only."),
        click.option("--full", is_flag=True, help="Print every table, the numbers used and what was assumed."),
        click.option("--feet", is_flag=True, help="Print (and draw) in feet and miles."),
    ):
        command = option(command)
    return command


def read_hop(hop_file: Path | None, **options: Any) -> Hop:
    """Read the hop from its file, or build it from the options of `hop_options`.

    Raises
    ------
    InputError
        For a file and options together, or options that leave something out.
    """
    from profiler.hopfile import load_hop, quick_hop

    given = [name for name, value in options.items() if value not in (None, ())]
    if hop_file is not None:
        if given:
            raise InputError(
                f"{hop_file}: {_option(given[0])}: must not stand beside a hop file; change the file instead"
            )
        return load_hop(hop_file)
    needed = ("position_a", "position_b", "antenna_a", "antenna_b", "frequency_ghz", "terrain")
    missing = [_option(name) for name in needed if name not in given]
    if missing:
        raise InputError(
            f"{_COMMAND_LINE}: {', '.join(missing)}: must be given for a hop without a file; or name a hop file"
            " (hopwright starter writes one)"
        )
    for end in ("antenna_a", "antenna_b"):
        options[end] = _number_or_text(options[end])
    with named(_COMMAND_LINE):
        return quick_hop(options.pop("position_a"), options.pop("position_b"), **options)


def _option(name: str) -> str:
    """Spell an option as it is typed."""
    return _SPELLING.get(name, "--" + name.replace("_", "-"))


def _number_or_text(text: str) -> float | str:
    """Read a bare number as metres, and leave text with a unit to the hop file's reader."""
    return float(text) if is_number(text) else text


@contextmanager
def named(source: str) -> Iterator[None]:
    """Put the hop file's name before an error that a stage raised without knowing it, or name options for keys."""
    try:
        yield
    except HopwrightError as error:
        text = str(error)
        if not text.startswith(source):
            text = f"{source}: {text}"
        if source == _COMMAND_LINE:
            for key, option in _OPTION_OF:
                text = re.sub(rf"(?<![\w/.'\"-]){key}(?![\w/.])", option, text)
        raise InputError(text) from error
