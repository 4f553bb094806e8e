"""When the signals that end a program may do so: at any moment but one. Loads next to nothing, since it comes first."""

from __future__ import annotations

import signal
from collections.abc import Iterator
from contextlib import contextmanager

__all__ = ["end_by_signals", "signals_held"]


def end_by_signals() -> None:
    """Let Ctrl-C, and whoever stops reading, end the process at once and quietly, with no exit code of ours.

    Python would raise an error instead: not before a raster library returns from its work, and with a traceback while
    modules load.
    """
    for name in ("SIGINT", "SIGPIPE"):
        number = getattr(signal, name, None)
        ignored = name == "SIGINT" and signal.getsignal(signal.SIGINT) is signal.SIG_IGN  # by nohup and the like
        if number is not None and not ignored:
            signal.signal(number, signal.SIG_DFL)


@contextmanager
def signals_held() -> Iterator[None]:
    """Let no signal that ends a program come between; those that came act right after."""
    import threading

    if threading.current_thread() is not threading.main_thread():  # signals go to the main thread
        yield
        return
    came: list[int] = []
    ending = [getattr(signal, name) for name in ("SIGINT", "SIGTERM", "SIGHUP") if hasattr(signal, name)]
    before = {
        number: signal.signal(number, lambda number, _: came.append(number))
        for number in ending
        if signal.getsignal(number) not in (signal.SIG_IGN, None)
    }
    try:
        yield
    finally:
        for number, handler in before.items():
            signal.signal(number, handler)
        for number in dict.fromkeys(came):
            signal.raise_signal(number)
