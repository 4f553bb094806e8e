"""Whatever is printed on the terminal, made safe on its way: the last thing before the escapes of color are added."""

from __future__ import annotations

from typing import TYPE_CHECKING

from profiler.printable import printable
from profiler.remarks import without_signs

if TYPE_CHECKING:
    from rich.console import RenderHook

__all__ = ["safe_hook"]


def safe_hook() -> RenderHook:
    """Give what `rich.console.Console.push_render_hook` takes, to escape all text but the line feeds of the layout."""
    from rich.console import Console, ConsoleOptions, ConsoleRenderable, RenderHook, RenderResult
    from rich.segment import Segment

    class Safe:
        def __init__(self, inner: ConsoleRenderable) -> None:
            self._inner = inner

        def __rich_console__(self, console: Console, options: ConsoleOptions) -> RenderResult:
            for text, style, control in console.render(self._inner, options):
                safe = text if control else "\n".join(map(printable, text.split("\n")))
                if not options.encoding.startswith("utf"):  # a minus that turns into a question mark is no minus
                    safe = without_signs(safe)
                yield Segment(safe, style, control)

    class SafeHook(RenderHook):
        def process_renderables(self, renderables: list[ConsoleRenderable]) -> list[ConsoleRenderable]:
            return [Safe(each) for each in renderables]

    return SafeHook()
