"""A figure as the bytes of a PNG, SVG or PDF file, the same bytes each time."""

from __future__ import annotations

import io
import warnings
from typing import TYPE_CHECKING, Any

from profiler.errors import InputError
from profiler.figures import style
from profiler.printable import printable

if TYPE_CHECKING:
    from matplotlib.figure import Figure

__all__ = ["FORMATS", "render"]

_OPTIONS: dict[str, dict[str, Any]] = {
    ".png": {"pil_kwargs": {"compress_level": 1}},  # the usual level takes three times as long for as many bytes
    ".svg": {"metadata": {"Date": None}},
    ".pdf": {"metadata": {"CreationDate": None}},
}
FORMATS = tuple(_OPTIONS)
"""File endings that `render` knows."""


def render(figure: Figure, path_suffix: str) -> bytes:
    """Write a figure in the format of a file ending; no clock time and no character that XML forbids goes into it.

    Parameters
    ----------
    figure
        From one of this package's figure functions.
    path_suffix
        One of `FORMATS`, in capital or small letters.

    Returns
    -------
    bytes

    Raises
    ------
    InputError
        For another ending.

    Examples
    --------
    >>> from matplotlib.figure import Figure
    >>> render(Figure(figsize=(1, 1)), ".PNG")[1:4]
    b'PNG'
    """
    suffix = path_suffix.lower()
    if suffix not in FORMATS:
        raise InputError(f"figure file ending {path_suffix or 'none'}: must be one of {', '.join(FORMATS)}")
    from matplotlib.text import Text

    for words in figure.findobj(Text):
        words.set_text("\n".join(map(printable, words.get_text().split("\n"))))
    stream = io.BytesIO()
    with style.defaults(), warnings.catch_warnings():
        # letters that the font lacks: the figure itself says so
        warnings.filterwarnings("ignore", message="Glyph .* missing from")
        figure.savefig(stream, format=suffix[1:], **_OPTIONS[suffix])
    return stream.getvalue()
