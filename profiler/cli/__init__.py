"""The `hopwright` command: one subcommand a module, each of which parses, runs, writes and sets the exit code."""

from __future__ import annotations

import sys

TYPE_CHECKING = False  # typing takes longer to load than all else that comes before Ctrl-C is settled
if TYPE_CHECKING:
    from typing import NoReturn

__all__ = ["main"]


def main(arguments: list[str] | None = None) -> NoReturn:
    """Run the command line.

    Parameters
    ----------
    arguments
        The words after ``hopwright``. By default those of the process, which is then fitted to the one command before
        anything else is loaded.

    Raises
    ------
    SystemExit
        Always, with the exit code.
    """
    if arguments is None:
        from profiler.cli.signals import end_by_signals

        end_by_signals()
        from profiler.cli.process import settle_process

        settle_process()
    from profiler.cli.app import run

    run(sys.argv[1:] if arguments is None else arguments)
