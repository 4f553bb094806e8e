"""The process of one command: fit for small arrays, deaf to what surrounds it, quick to end when it is told to."""

from __future__ import annotations

import atexit
import gc
import importlib
import io
import logging
import os
import sys
import warnings
from contextlib import suppress
from pathlib import Path

from profiler.surroundings import forget_surroundings

__all__ = ["drop_unwritten", "load_matplotlib", "settle_process"]


def settle_process() -> None:
    """Fit the process to one command that lives to its end, at a pipe or on any terminal, whoever calls it.

    The shares are of the processor time of a study with its figure, each setting alone, by medians of 25 runs; the
    three together save 27 %.
    """
    gc.set_threshold(500_000)  # 5 %: loading and figures make 250 000, to stay; every 700 it would look through them
    atexit.register(gc.freeze)  # 14 %: the last look for garbage, at the very end
    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")  # 10 %; before numpy loads: over so little, threads only wait
    forget_surroundings()
    _open_streams()
    # what a library has to say about itself is no line of ours, and PYTHONWARNINGS=error must not stop a study
    warnings.simplefilter("ignore")
    logging.disable(logging.CRITICAL)


def _open_streams() -> None:
    """Take what standard output cannot show for a question mark; a stream that is closed becomes one to nowhere.

    Else the next file to be opened would get its number, and what a library writes to standard error would go there.
    """
    for number in (0, 1, 2):
        try:
            os.fstat(number)
        except OSError:
            os.open(os.devnull, os.O_RDWR)  # the lowest free number is this one
    if sys.stdout is None:
        if sys.stderr is not None:
            sys.stderr.write("hopwright: standard output: is closed: must be open; send it to a file\n")
        drop_unwritten()
        sys.exit(2)
    if isinstance(sys.stdout, io.TextIOWrapper):
        sys.stdout.reconfigure(errors="replace")


def load_matplotlib() -> None:
    """Load the drawing library with its own settings, before `profiler.figures` does.

    As it loads, it reads a settings file in the folder that one is in, whatever lies there, then one that MATPLOTLIBRC
    names, and the backend of MPLBACKEND, which a notebook sets for its children and which stops it where it is unknown.
    """
    os.environ.pop("MPLBACKEND", None)
    os.environ["MATPLOTLIBRC"] = os.devnull
    if not Path("matplotlibrc").exists():
        importlib.import_module("matplotlib")
        return
    here = os.open(".", getattr(os, "O_PATH", os.O_RDONLY))
    try:
        os.chdir(Path(os.__file__).parent)
        importlib.import_module("matplotlib")
    finally:
        os.fchdir(here)
        os.close(here)


def drop_unwritten() -> None:
    """Forget what standard output or standard error did not take, or Python would try again at its end and complain."""
    for stream in (sys.stdout, sys.stderr):
        if stream is None:
            continue
        try:
            stream.flush()
        except (OSError, ValueError):
            with suppress(OSError, ValueError):
                nowhere = os.open(os.devnull, os.O_WRONLY)
                os.dup2(nowhere, stream.fileno())
                os.close(nowhere)
