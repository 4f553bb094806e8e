"""Read hop files, and make a hop from a few values without a file."""

from __future__ import annotations

import hashlib
import re
import tomllib
from collections.abc import Mapping, Sequence
from pathlib import Path
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

from profiler.errors import InputError
from profiler.hopfile.limits import read_limited, require_bounded, require_shallow
from profiler.hopfile.overrides import overridden
from profiler.hopfile.stand_ins import stand_ins

if TYPE_CHECKING:
    from profiler.models import Hop

__all__ = ["COMMAND_LINE", "load_hop", "parse_hop", "parse_tables", "quick_hop"]

_PLACE = re.compile(r"\s*\(at (?:line (?P<line>\d+), column (?P<column>\d+)|end of document)\)$")
NOTHING: Mapping[str, Any] = MappingProxyType({})
COMMAND_LINE = "command line"
"""What messages call the place of what was typed."""


def load_hop(
    path: Path | str | None,
    changes: Mapping[str, Any] = NOTHING,
    *,
    antennas: bool = True,
    steps_in_feet: bool = False,
) -> Hop:
    """Read a hop file, with some of its keys set anew if asked.

    Parameters
    ----------
    path
        A TOML file, UTF-8. Paths in it start from its folder. None for a hop that is in the changes alone.
    changes
        Values by dotted name, like ``{"site_a.antenna": "60 ft", "radio.mode[0].threshold_dbm": -72}``, in place of
        what the file says. Paths in them start from the current folder.
    antennas
        Whether antenna heights must be given; else the highest positions of the towers stand in, and the hop says so.
    steps_in_feet
        Whether a tower without a step of its own has positions at whole feet, not metres.

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
    ways: dict[str, Any] = {"changes": changes, "antennas": antennas, "steps_in_feet": steps_in_feet}
    if path is None:
        return _made({}, COMMAND_LINE, Path(), **ways)
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
    ways["source_sha256"] = hashlib.sha256(content).hexdigest()
    return _made(parse_tables(text, str(path)), str(path), path.parent, **ways)


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
    return _made(parse_tables(text, where), where, Path(base_dir))


def _made(
    raw: Mapping[str, Any],
    where: str,
    base_dir: Path,
    *,
    changes: Mapping[str, Any] = NOTHING,
    antennas: bool = True,
    steps_in_feet: bool = False,
    source_sha256: str | None = None,
) -> Hop:
    """Build the hop, and name the command line where it is to blame."""
    from profiler.hopfile.build import build_hop

    beside = {name: _from_here(name, value) for name, value in changes.items()} if source_sha256 else changes
    require_bounded(beside, COMMAND_LINE)
    try:
        tables, overrides = overridden(raw, beside)
        notes = stand_ins(tables, antennas=antennas, steps_in_feet=steps_in_feet)
        set_beside = overrides if source_sha256 else ()
        return build_hop(tables, where, base_dir, source_sha256=source_sha256, overrides=set_beside, notes=notes)
    except RecursionError:
        raise InputError(f"{where}: must be TOML that is nested a few levels deep; it is nested too deeply") from None
    except InputError as error:
        if not error.where or any(error.field.startswith(name.rpartition("_")[0] or name) for name in changes):
            error.where = COMMAND_LINE
        raise


def _from_here(name: str, value: Any) -> Any:
    """Let paths that are set beside a file start from the current folder."""
    if name not in ("terrain.paths", "cover.canopy", "cover.landcover"):
        return value
    return [str(Path(each).absolute()) for each in value] if isinstance(value, list) else str(Path(value).absolute())


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
    except RecursionError:
        raise InputError(f"{where}: must be TOML that is nested a few levels deep; it is nested too deeply") from None
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
    where: str = COMMAND_LINE,
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
    own = [{"k": k, "fresnel_fraction": fraction, "margin_m": margin_m} for k, fraction, margin_m in rules]
    stated: dict[str, Any] = {"name": name, "frequency_ghz": frequency_ghz}
    for end, position, antenna in (("site_a", position_a, antenna_a), ("site_b", position_b, antenna_b)):
        stated[end] = {"position": position, "antenna" if isinstance(antenna, str) else "antenna_m": antenna}
    asked = {"preset": preset, "low_k": low_k, "rule": own or None}
    stated["terrain"] = {"paths": [str(path) for path in terrain]}
    stated["rules"] = {key: value for key, value in asked.items() if value is not None}
    raw = {key: value for key, value in stated.items() if value is not None}
    require_bounded(raw, where)
    return _made(raw, where, Path(base_dir))
