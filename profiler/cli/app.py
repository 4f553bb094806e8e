"""The root command: loads a subcommand only when it is asked for, and turns errors into one line and exit code 2."""

from __future__ import annotations

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
    try:
        outcome: Any = root.main(words or ["--help"], prog_name="hopwright", standalone_mode=False)
    except click.ClickException as error:
        _stop(error.format_message())
    except HopwrightError as error:
        _stop(str(error))
    except (click.Abort, KeyboardInterrupt):
        sys.exit(130)
    except BrokenPipeError:
        sys.exit(0)
    except OSError as error:
        if error.filename is None:
            raise
        _stop(f"{error.filename}: {error.strerror}: must be a file that can be read or written here")
    sys.exit(outcome if isinstance(outcome, int) else 0)


def _stop(message: str) -> NoReturn:
    """Print one line on standard error and leave with exit code 2."""
    click.echo("hopwright: " + " ".join(message.split()), err=True)
    sys.exit(2)
