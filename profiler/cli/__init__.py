"""The `hopwright` command: one subcommand a module, each of which parses, runs, writes and sets the exit code."""

from profiler.cli.app import main

__all__ = ["main"]
