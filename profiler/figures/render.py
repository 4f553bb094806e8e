"""A figure as the bytes of a PNG, SVG or PDF file, the same bytes each time."""

from __future__ import annotations

import io
import struct
import warnings
import zlib
from collections.abc import Iterator
from contextlib import contextmanager
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from profiler.errors import InputError
from profiler.figures import style
from profiler.figures.page import LEADING

if TYPE_CHECKING:
    from matplotlib.figure import Figure
    from matplotlib.text import Text
    from PIL.Image import Image

__all__ = ["FORMATS", "render"]

FORMATS = (".png", ".svg", ".pdf")
"""File endings that `render` knows."""


def render(figure: Figure, path_suffix: str) -> bytes:
    """Write a figure in the format of a file ending; no clock time goes into the file.

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
    if suffix == ".png":
        return _png(figure)
    stream = io.BytesIO()
    dateless: dict[str, str | None] = {"Date": None} if suffix == ".svg" else {"CreationDate": None}
    with style.defaults(), _quiet():
        figure.savefig(stream, format=suffix[1:], metadata=dateless)
    return stream.getvalue()


def _png(figure: Figure) -> bytes:
    """Draw shapes and axes with the canvas, set the words of the page apart, and pack lightly.

    A page holds some two thousand letters, which the drawing library lays out and draws one by one; Pillow, which it
    brings along, sets whole lines from the same font ten times faster. Together with the light packing this takes a
    third of the time of the general way.
    """
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from PIL import Image, features

    words = [each for each in figure.texts if each.get_visible()] if features.check("raqm") else []
    with style.defaults(), _quiet():
        canvas: Any = FigureCanvasAgg(figure)
        for each in words:
            each.set_visible(False)
        try:
            canvas.draw()
        finally:
            for each in words:
                each.set_visible(True)
        image = Image.fromarray(np.asarray(canvas.buffer_rgba()))
    _set_words(image, words, figure.dpi)
    return _packed(np.asarray(image)[..., :3], figure.dpi)


def _set_words(image: Image, words: list[Text], dpi: float) -> None:
    """Set the lines of texts into an image, each on its baseline."""
    from matplotlib.colors import to_rgb
    from PIL import ImageDraw, ImageFont

    draw = ImageDraw.Draw(image)
    fonts: dict[tuple[str, float], Any] = {}
    for each in words:
        look = each.get_fontproperties()
        size = look.get_size_in_points() * dpi / 72.0
        key = (str(look.get_file()), size)
        if key not in fonts:
            fonts[key] = ImageFont.truetype(*key, layout_engine=ImageFont.Layout.RAQM)
        x, y = each.get_transform().transform(each.get_position())
        color = tuple(round(255 * part) for part in to_rgb(each.get_color()))
        anchor = {"left": "ls", "center": "ms", "right": "rs"}[each.get_horizontalalignment()]
        for above, line in enumerate(reversed(each.get_text().split("\n"))):
            baseline = image.height - y - above * LEADING * size
            draw.text((x, round(baseline)), line, fill=color, font=fonts[key], anchor=anchor)


def _packed(pixels: NDArray[np.uint8], dpi: float) -> bytes:
    """Pack RGB pixels as a PNG file (ISO/IEC 15948) of unfiltered rows: flat colors pack as well, and much faster."""
    height, width, _ = pixels.shape
    rows = np.zeros((height, 1 + 3 * width), dtype=np.uint8)
    rows[:, 1:] = pixels.reshape(height, 3 * width)
    per_metre = round(dpi / 0.0254)
    chunks = (
        (b"IHDR", struct.pack(">IIBBBBB", width, height, 8, 2, 0, 0, 0)),
        (b"pHYs", struct.pack(">IIB", per_metre, per_metre, 1)),
        (b"IDAT", zlib.compress(rows.tobytes(), 3)),
        (b"IEND", b""),
    )
    body = (
        struct.pack(">I", len(data)) + kind + data + struct.pack(">I", zlib.crc32(kind + data)) for kind, data in chunks
    )
    return b"\x89PNG\r\n\x1a\n" + b"".join(body)


@contextmanager
def _quiet() -> Iterator[None]:
    """Keep quiet about letters that the font lacks: the figure itself says so."""
    with warnings.catch_warnings():
        warnings.filterwarnings("ignore", message="Glyph .* missing from")
        yield
