"""The root command: gathers the subcommands, and turns errors into one line and exit code 2."""

from __future__ import annotations

import os
import sys
from contextlib import suppress
from difflib import get_close_matches
from typing import Any, NoReturn

import click

from profiler import __version__
from profiler.cli import (
    compare_command,
    heights_command,
    losses_command,
    reach_command,
    screen_command,
    starter_command,
    study_command,
    terrain_command,
)
from profiler.cli.process import drop_unwritten
from profiler.errors import HopwrightError
from profiler.printable import printable

__all__ = ["root", "run"]

_FAULT = 70
"""Exit code for a fault of the program: EX_SOFTWARE of BSD's sysexits.h."""

_SHOW_TRACEBACK = "HOPWRIGHT_TRACEBACK"
_LONGEST_LINE = 2000


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

    Exit codes: 0 done and the hop passes; 1 done and it does not pass; 2 the input is wrong; 70 a fault of hopwright
    itself.

    hopwright screens and documents; it does not certify. Towers, radio exposure and aircraft hazards are matters of
    local codes and licensed practice.
    """


for _module in (
    study_command,
    heights_command,
    losses_command,
    reach_command,
    screen_command,
    compare_command,
    terrain_command,
    starter_command,
):  # each loads what it needs when it runs
    root.add_command(_module.command)


def run(words: list[str]) -> NoReturn:
    """Run one command and leave with its exit code; the only place where an error becomes text and a code."""
    try:
        outcome: Any = root.main(words or ["--help"], prog_name="hopwright", standalone_mode=False)
        sys.stdout.flush()
    except click.ClickException as error:
        _stop(error.format_message())
    except HopwrightError as error:
        _stop(str(error))
    except (click.Abort, KeyboardInterrupt):
        sys.exit(130)
    except MemoryError:
        _stop("not enough memory: must be a smaller task; give coarser spacing_m or step_m, or fewer draws")
    except Exception as error:
        if isinstance(error, OSError) and error.errno is not None:
            where = error.filename or "standard output"
            _stop(f"{where}: {error.strerror}: must be a file that can be read or written here")
        if os.environ.get(_SHOW_TRACEBACK):
            raise
        _stop(
            f"a fault of hopwright {__version__} itself, not of your input ({type(error).__name__}: {error}): please "
            f"report it with the command and the hop file; {_SHOW_TRACEBACK}=1 before the command shows where it is",
            _FAULT,
        )
    sys.exit(outcome if isinstance(outcome, int) else 0)


def _stop(message: str, code: int = 2) -> NoReturn:
    """Print one line on standard error and leave."""
    line = printable(" ".join(message.split()))
    if len(line) > _LONGEST_LINE:
        line = f"{line[: _LONGEST_LINE // 2]} … {line[-_LONGEST_LINE // 2 :]}"
    with suppress(OSError):  # where standard error is full too, the code says it
        click.echo(f"hopwright: {line}", err=True)
    drop_unwritten()
    sys.exit(code)
