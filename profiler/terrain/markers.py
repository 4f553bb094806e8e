"""The marker of missing cells that a raster declares though its cells cannot hold it: GDAL keeps silent about it."""

from __future__ import annotations

import re
import struct
from pathlib import Path

from profiler.terrain.files import open_stream

__all__ = ["declared_marker"]

_GDAL_NODATA = 42113
"""The tag in which GDAL writes a GeoTIFF's marker, as text."""


def declared_marker(source: str) -> float | None:
    """Find the marker that a raster declares beside it (.aux.xml) or in a GeoTIFF's tag; None for none."""
    beside = Path(source + ".aux.xml")
    if not source.startswith("/vsi") and beside.is_file():
        found = re.search(r"<NoDataValue[^>]*>([^<]*)<", beside.read_text("utf-8", "replace"))
        if found:
            return _number(found[1])
    try:
        with open_stream(source) as stream:
            head = stream.read(16)
            order = {b"II": "<", b"MM": ">"}.get(head[:2])
            if order is None or head[2:4] not in (b"*\0", b"\0*"):
                return None  # no GeoTIFF, or one so large that none would keep whole numbers in it
            stream.seek(struct.unpack(f"{order}I", head[4:8])[0])
            (count,) = struct.unpack(f"{order}H", stream.read(2))
            entries = stream.read(12 * count)
            for at in range(0, len(entries) - 11, 12):
                tag, _, length, place = struct.unpack(f"{order}HHII", entries[at : at + 12])
                if tag == _GDAL_NODATA:
                    if length > 4:
                        stream.seek(place)
                    text = stream.read(min(length, 64)) if length > 4 else entries[at + 8 : at + 12]
                    return _number(text.partition(b"\0")[0].decode("ascii", "replace"))
    except (OSError, EOFError, ValueError, struct.error):
        return None
    return None


def _number(text: str) -> float | None:
    try:
        return float(text)
    except ValueError:
        return None
