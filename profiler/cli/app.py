"""The root command: loads a subcommand only when it is asked for, and turns errors into one line and exit code 2."""

from __future__ import annotations

import atexit
import gc
import io
import os
import signal
import sys
from importlib import import_module
from typing import Any, NoReturn

import click

from profiler import __version__
from profiler.errors import HopwrightError

__all__ = ["main"]

COMMANDS = {
    "study": "Study one hop: does it clear, what does it lose, does it meet its objective?",
    "heights": "Find the antenna heights that clear, cheapest under limits, and how sure they are.",
    "losses": "List every diffraction method side by side for one hop.",
    "reach": "Answer the inverse questions: longest range, smallest dish, least power.",
    "terrain": "Show what terrain a file or folder holds, and whether a hop lies inside.",
    "starter": "Write a commented hop file to start from.",
}

_YOUNG_OBJECTS = 200_000
"""New objects between two rounds of the garbage collector. Loading the libraries makes as many, all to stay; after
every 700, as is usual, it would look through them some 250 times."""


class LazyGroup(click.Group):
    """A group that imports the module of a subcommand when that subcommand runs, so that each starts fast."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """Name the subcommands in the order of the work."""
        del ctx
        return list(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        """Import one subcommand."""
        del ctx
        if cmd_name not in COMMANDS:
            return None
        command: click.Command = import_module(f"profiler.cli.{cmd_name}").command
        return command

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        """List the subcommands without importing any of them."""
        del ctx
        with formatter.section("Commands"):
            formatter.write_dl(list(COMMANDS.items()))


@click.group(cls=LazyGroup, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.version_option(__version__, prog_name="hopwright")
def root() -> None:
    """Study fixed microwave hops: clearance, antenna heights, loss, margin and availability.

    Exit codes: 0 done and the hop passes; 1 done and it does not pass; 2 the input is wrong. hopwright screens and
    documents; it does not certify. Towers, radio exposure and aircraft hazards are matters of local codes and
    licensed practice.
    """


def main(arguments: list[str] | None = None) -> NoReturn:
    """Run the command line; the only place where an error becomes text and an exit code.

    Parameters
    ----------
    arguments
        The words after ``hopwright``; the process's own by default.

    Raises
    ------
    SystemExit
        Always, with the exit code.
    """
    words = sys.argv[1:] if arguments is None else arguments
    if arguments is None:
        _settle_process()
    try:
        outcome: Any = root.main(words or ["--help"], prog_name="hopwright", standalone_mode=False)
    except click.ClickException as error:
        _stop(error.format_message())
    except HopwrightError as error:
        _stop(str(error))
    except (click.Abort, KeyboardInterrupt):
        sys.exit(130)
    except OSError as error:
        where = "standard output" if error.filename is None else error.filename
        _stop(f"{where}: {error.strerror or error}: must be a file that can be read or written here")
    except MemoryError:
        _stop("not enough memory: must be a smaller task; give coarser spacing_m or step_m, or fewer draws")
    sys.exit(outcome if isinstance(outcome, int) else 0)


def _settle_process() -> None:
    """Fit the process to one command of small arrays that live to its end, at a pipe or on any terminal."""
    gc.set_threshold(_YOUNG_OBJECTS)
    atexit.register(gc.freeze)  # the last look for garbage, at the very end, takes as long as the analysis
    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")  # before numpy loads: over so little, threads only wait
    if hasattr(signal, "SIGPIPE"):
        signal.signal(
            signal.SIGPIPE, signal.SIG_DFL
        )  # whoever stops reading ends the command, with no exit code of ours
    if sys.stdout is None:
        _stop("standard output: is closed: must be open; send it to a file")
    if isinstance(sys.stdout, io.TextIOWrapper):
        sys.stdout.reconfigure(errors="replace")


def _stop(message: str) -> NoReturn:
    """Print one line on standard error and leave with exit code 2."""
    click.echo("hopwright: " + " ".join(message.split()), err=True)
    sys.exit(2)
