"""Read hop files, and make a hop from a few values without a file."""

from __future__ import annotations

import hashlib
import re
import tomllib
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any

from profiler.errors import InputError
from profiler.hopfile.limits import read_limited, require_bounded, require_shallow

if TYPE_CHECKING:
    from profiler.models import Hop

__all__ = ["load_hop", "parse_hop", "parse_tables", "quick_hop"]

_PLACE = re.compile(r"\s*\(at (?:line (?P<line>\d+), column (?P<column>\d+)|end of document)\)$")
_HEIGHT = re.compile(r"\s*(-?\d+(?:\.\d*)?)\s*(m|ft)?\s*", re.IGNORECASE)


def load_hop(path: Path | str) -> Hop:
    """Read a hop file.

    Parameters
    ----------
    path
        A TOML file, UTF-8. Paths in it start from its folder.

    Returns
    -------
    Hop
        With the file as named here for its ``source``, and the hash of its bytes.

    Raises
    ------
    InputError
        In one line: the file cannot be read, is not TOML, or the first thing in it that is not allowed.

    Examples
    --------
    >>> load_hop("no/such/hop.toml")
    Traceback (most recent call last):
    profiler.errors.InputError: no/such/hop.toml: No such file or directory: must be a hop file that can be read
    """
    path = Path(path)
    try:
        content = read_limited(path)
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        line = content[: error.start].count(b"\n") + 1
        raise InputError(
            f"{path}: line {line}: byte {content[error.start]:#04x}: must be UTF-8 text; save it so"
        ) from None
    except OSError as error:
        raise InputError(f"{path}: {error.strerror}: must be a hop file that can be read") from None
    return _hop(text, str(path), path.parent, source_sha256=hashlib.sha256(content).hexdigest())


def parse_hop(text: str, where: str = "hop file", base_dir: Path | str = ".") -> Hop:
    r"""Read a hop from the text of a hop file.

    Parameters
    ----------
    text
        TOML.
    where
        What messages call it.
    base_dir
        Folder that paths in it start from.

    Returns
    -------
    Hop

    Raises
    ------
    InputError
        In one line, for the first thing that is not allowed.

    Examples
    --------
    >>> parse_hop("frequency_ghz = 7.5\nsite_a = 5")
    Traceback (most recent call last):
    profiler.errors.InputError: hop file: site_a = 5: must be a table, headed [site_a]
    """
    return _hop(text, where, Path(base_dir))


def _hop(text: str, where: str, base_dir: Path, *, source_sha256: str | None = None) -> Hop:
    from profiler.hopfile.build import build_hop

    try:
        return build_hop(parse_tables(text, where), where, base_dir, source_sha256=source_sha256)
    except RecursionError:
        raise InputError(f"{where}: must be TOML that is nested a few levels deep; it is nested too deeply") from None


def parse_tables(text: str, where: str) -> dict[str, Any]:
    """Read TOML, with one line that says where it breaks.

    Parameters
    ----------
    text
        TOML.
    where
        What messages call it.

    Raises
    ------
    InputError
        Naming the line and column.

    Examples
    --------
    >>> parse_tables("[site_a", "hop.toml")
    Traceback (most recent call last):
    profiler.errors.InputError: hop.toml: line 1, column 8: must be TOML: expected "]" at the end of a table \
declaration; text needs quotes, decimals a point
    """
    require_shallow(text, where)
    try:
        tables = tomllib.loads(text.removeprefix("\ufeff"))
    except ValueError as error:  # TOMLDecodeError, or Python's refusal of a whole number of thousands of digits
        message = str(error)
        place = _PLACE.search(message)
        line, column = text.count("\n") + 1, len(text) - (text.rfind("\n") + 1) + 1
        if place and place["line"]:
            line, column = int(place["line"]), int(place["column"])
        reason = _PLACE.sub("", message)
        reason = reason[:1].lower() + reason[1:].replace("'", '"')
        once = "overwrite" in reason or "twice" in reason
        remedy = "give each key and each [table] once" if once else "text needs quotes, decimals a point"
        raise InputError(
            f"{where}: line {line}, column {column}: must be TOML: {' '.join(reason.split())}; {remedy}"
        ) from None
    require_bounded(tables, where)
    return tables


def quick_hop(
    position_a: str,
    position_b: str,
    *,
    antenna_a: float | str,
    antenna_b: float | str,
    frequency_ghz: float,
    terrain: Sequence[Path | str],
    preset: str | None = None,
    low_k: float | None = None,
    rules: Sequence[tuple[float, float, float]] = (),
    name: str | None = None,
    where: str = "command line",
    base_dir: Path | str = ".",
) -> Hop:
    """Make a hop from a few values, by the same checks as a hop file.

    Parameters
    ----------
    position_a, position_b
        WGS 84 positions as text in any of the ways of `profiler.hopfile.positions`.
    antenna_a, antenna_b
        Antenna heights above ground: metres as a number, or text with its unit (``"30 m"``, ``"98.4 ft"``).
    frequency_ghz
        Frequency, 0.01 to 1000 GHz.
    terrain
        Rasters or folders of rasters.
    preset, low_k
        Name of a preset of clearance rules, and the low k that some of them need.
    rules
        Rules of one's own: (k, fraction of F1, margin in metres) each.
    name
        Name of the hop.
    where, base_dir
        What messages call the place these values come from; the folder that terrain paths start from.

    Returns
    -------
    Hop

    Raises
    ------
    InputError
        In one line, for the first value that is not allowed; also where there is neither preset nor rule.

    Examples
    --------
    >>> hop = quick_hop("46.05N 39.15W", "46.05N 38.87W", antenna_a="100 ft", antenna_b=25, frequency_ghz=7.5,
    ...     terrain=["."], preset="0.6-f1-plus-3m")
    >>> hop.site_a.antenna_m, hop.rules[0].fresnel_fraction, hop.rules[0].margin_m
    (30.48, 0.6, 3.0)
    """
    from profiler.hopfile.build import build_hop

    own = [{"k": k, "fresnel_fraction": fraction, "margin_m": margin_m} for k, fraction, margin_m in rules]
    asked = {"preset": preset, "low_k": low_k, "rule": own or None}
    raw: dict[str, Any] = {
        "frequency_ghz": frequency_ghz,
        "site_a": {"position": position_a, **_height(antenna_a, "site_a", where)},
        "site_b": {"position": position_b, **_height(antenna_b, "site_b", where)},
        "terrain": {"paths": [str(path) for path in terrain]},
        "rules": {key: value for key, value in asked.items() if value is not None},
    }
    if name is not None:
        raw["name"] = name
    require_bounded(raw, where)
    return build_hop(raw, where, Path(base_dir))


def _height(value: float | str, table: str, where: str) -> dict[str, float]:
    """Antenna height as the key and number of a hop file."""
    if not isinstance(value, str):
        return {"antenna_m": value}
    match = _HEIGHT.fullmatch(value)
    if match is None:
        raise InputError(f"{where}: {table}.antenna = {value!r}: must be a height like 30 m or 98.4 ft")
    return {f"antenna_{(match[2] or 'm').lower()}": float(match[1])}
