"""What the directory of a TIFF file says of its cells: where its blocks end, whether all were written, its marker.

GDAL tells these block by block, or, of a marker that the cells cannot hold, not at all.
"""

from __future__ import annotations

import struct
from dataclasses import dataclass
from typing import IO, Literal

import numpy as np
from numpy.typing import NDArray

from profiler.terrain.files import open_stream

__all__ = ["TiffDirectory", "read_directory"]

_OFFSETS, _COUNTS = (273, 324), (279, 325)
"""Places and sizes of strips, and of tiles (TIFF 6.0, sections 8 and 15)."""

_GDAL_NODATA = 42113
_MOST_BLOCKS = 50_000_000
_ITEM = {2: "S1", 3: "u2", 4: "u4", 16: "u8"}
"""Types of the entries that are read: text, and unsigned numbers (16 only in a BigTIFF)."""


@dataclass(frozen=True, slots=True)
class TiffDirectory:
    """Byte after the last block, whether every block has a place in the file, and the marker that is declared."""

    end: int
    all_written: bool
    marker: float | None


def read_directory(source: str) -> TiffDirectory | None:
    """Read the first directory of a TIFF, the one of its full resolution; None for what is none, or is damaged."""
    try:
        with open_stream(source) as stream:
            values = _entries(stream)
    except (OSError, EOFError, ValueError, struct.error, OverflowError):
        return None
    if values is None:
        return None
    starts, sizes = (next((values[tag] for tag in tags if tag in values), None) for tags in (_OFFSETS, _COUNTS))
    marker = _number(values[_GDAL_NODATA].tobytes()) if _GDAL_NODATA in values else None
    if starts is None or sizes is None or starts.size != sizes.size or not starts.size:
        return None
    # either of the two may be 0 for a block that was never written
    written = (starts != 0) & (sizes != 0)
    end = int((starts.astype(np.uint64) + sizes.astype(np.uint64))[written].max(initial=0))
    return TiffDirectory(end, bool(written.all()), marker)


def _entries(stream: IO[bytes]) -> dict[int, NDArray[np.generic]] | None:
    """Values of the entries wanted, by tag; entries that are too small to hold theirs say where they are."""
    head = stream.read(16)
    order: Literal["<", ">"] = "<" if head[:2] == b"II" else ">"
    if head[:2] not in (b"II", b"MM"):
        return None
    (version,) = struct.unpack(f"{order}H", head[2:4])
    if version not in (42, 43):
        return None
    big = version == 43
    place, count, wide = ("Q", "Q", 8) if big else ("I", "H", 4)
    stream.seek(struct.unpack(f"{order}{place}", head[8:16] if big else head[4:8])[0])
    (entries,) = struct.unpack(f"{order}{count}", stream.read(struct.calcsize(count)))
    size = 4 + 2 * wide
    table = stream.read(min(entries, 4096) * size)
    found: dict[int, NDArray[np.generic]] = {}
    for at in range(0, len(table) - size + 1, size):
        tag, kind, length = struct.unpack_from(f"{order}HH{place}", table, at)
        if tag not in (*_OFFSETS, *_COUNTS, _GDAL_NODATA) or kind not in _ITEM:
            continue
        if length > _MOST_BLOCKS:
            raise ValueError(length)
        item = np.dtype(_ITEM[kind]).newbyteorder(order)
        data = table[at + 4 + wide : at + size]
        if length * item.itemsize > wide:
            stream.seek(struct.unpack(f"{order}{place}", data)[0])
            data = stream.read(length * item.itemsize)
        found[tag] = np.frombuffer(data[: length * item.itemsize], item)
    return found


def _number(text: bytes) -> float | None:
    try:
        return float(text.partition(b"\0")[0])
    except ValueError:
        return None
