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
_KEYS = {
    "position_a": "site_a.position",
    "position_b": "site_b.position",
    "name_a": "site_a.name",
    "name_b": "site_b.name",
    "antenna_a": "site_a.antenna",
    "antenna_b": "site_b.antenna",
    "frequency_ghz": "frequency_ghz",
    "terrain": "terrain.paths",
    "preset": "rules.preset",
    "low_k": "rules.low_k",
    "rules": "rules.rule",
}
"""The key of a hop file for each option; that of an antenna takes its unit from the value."""
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
    (r"or antenna_m with the number alone", "or metres as a number alone"),
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
        click.option("--name-a", metavar="NAME", help="What site A is called."),
        click.option("--name-b", metavar="NAME", help="What site B is called."),
        click.option("--low-k", type=NUMBER, metavar="K", help="Low k for presets that ask for one."),
        click.option(
            "--rule",
            "rules",
            multiple=True,
            type=(NUMBER, NUMBER, NUMBER),
            metavar="K FRACTION MARGIN_M",
            help="A rule of your own: k, fraction of F1, margin in metres; may be repeated.",
        ),
        click.option(
            "--set",
            "settings",
            multiple=True,
            metavar="KEY=VALUE",
            help="Any key of a hop file by its dotted name, like radio.a.power_dbm=24; may be repeated.",
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


def read_hop(hop_file: Path | None, *, antennas: bool = True, steps_in_feet: bool = False, **options: Any) -> Hop:
    """Read the hop from its file, from the options of `hop_options`, or from the file with the options over it.

    Raises
    ------
    InputError
        For options that leave something out, or anything that is not allowed.
    """
    from profiler.hopfile import load_hop

    changes = _changes(options)
    if hop_file is None:
        needed = ("position_a", "position_b", "antenna_a", "antenna_b", "frequency_ghz", "terrain")
        keys = set(changes) | {name.rpartition("_")[0] for name in changes}
        missing = [
            _option(name) for name in needed if _KEYS[name] not in keys and (antennas or not name.startswith("antenna"))
        ]
        if missing:
            raise InputError(
                f"{_COMMAND_LINE}: {', '.join(missing)}: must be given for a hop without a file; or name a hop file"
                " (hopwright starter writes one)"
            )
    with named(_COMMAND_LINE if hop_file is None else str(hop_file)):
        return load_hop(hop_file, changes, antennas=antennas, steps_in_feet=steps_in_feet)


def _changes(options: dict[str, Any]) -> dict[str, Any]:
    """Keys of a hop file that the options set, with their values; ``--set`` has the last word."""
    from profiler.hopfile import value_of

    given = {name: value for name, value in options.items() if value not in (None, ())}
    changes: dict[str, Any] = {}
    for name, value in given.items():
        if name == "rules":
            changes[_KEYS[name]] = [{"k": k, "fresnel_fraction": share, "margin_m": m} for k, share, m in value]
        elif name.startswith("antenna"):
            metres = is_number(value)
            changes[_KEYS[name] + ("_m" if metres else "")] = float(value) if metres else value
        elif name != "settings":
            changes[_KEYS[name]] = list(value) if isinstance(value, tuple) else value
    for setting in given.get("settings", ()):
        key, equals, text = setting.partition("=")
        if not equals or not key.strip():
            raise InputError(where=_COMMAND_LINE, field="--set", value=setting, allowed="KEY=VALUE")
        changes[key.strip()] = value_of(text.strip())
    return changes


def _option(name: str) -> str:
    """Spell an option as it is typed."""
    return _SPELLING.get(name, "--" + name.replace("_", "-"))


@contextmanager
def named(source: str) -> Iterator[None]:
    """Put the hop file's name before an error that a stage raised without knowing it, or name options for keys."""
    try:
        yield
    except HopwrightError as error:
        if not error.where and not str(error).startswith(source):
            error.where = source
        text = str(error)
        if not text.startswith(_COMMAND_LINE):
            raise
        for key, option in _OPTION_OF:
            text = re.sub(rf"(?<![\w/.'\"-]){key}(?![\w/.])", option, text)
        raise InputError(text) from error
