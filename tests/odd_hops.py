"""Hop files that went wrong, made by mutation of good ones, and what may come of running the program on them.

A mutation is a kind of `KINDS`, a place in the text (a share of its length) and a number that chooses among what is
put there; hypothesis shrinks lists of them, `scripts/fuzz` draws thousands.
"""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence
from pathlib import Path

from profiler.hopfile import starter

ROOT = Path(__file__).resolve().parent.parent
SAMPLES = ROOT / "sample_dem"

Mutation = tuple[str, float, int]

VALUES = (
    "0", "-1", "1", "0.5", "1_0", "1e308", "-1e308", "5e-324", "nan", "inf", "-inf", "1" + "0" * 400, "0x10", "1e400",
    "true", '""', '" "', '"x"', '"' + "x" * 1001 + '"', '"' + "1 " * 400 + '"', "[]", "[[]]", "{}", "[1, 2]",
    "[nan, nan]", '["."]', '["/dev/null"]', '["/dev/zero"]', '["country.tif"]', '["canopy.tif", "country.tif"]', '[""]',
    "1979-05-27", "07:32:00", "'''\nmany\nlines'''", '"\\u001b[2J\\u202e\\u0007"', '"\\ufeff\\ufffe\\U0001fffe"',
    '"a\\nhopwright: all is well"', "{a.b.c = 1}", "[[0.1, 0.5], [50, 1.3], [99, 2]]", '"46.1, -39.1"', '"90, 180"',
    '"-90N"', '"0, 0"', "4326", "32624", '"EPSG:5773"', '"ft"', "2000", "1999.999", "0.01", "1000", "1e-9", "1000000",
)  # fmt: skip
KEYS = (
    "x", "name", "k", "position", "latitude", "longitude", "easting", "epsg", "antenna_m", "antenna_ft", "ground_m",
    '""', '"\\u001b[2J"', '"a\\nb"', "a.b.c", "x" * 1001, "a." * 40 + "a", "'[site_a]'", "frequency_hz", "spacing_m",
    "missing", "vary_k", "draws", "seed", "preset", "low_k", "obstacle", "canopy", "threshold_dbm", "use_maps",
)  # fmt: skip
PIECES = (
    "\x00", "\x1b[2J", "\r", "\r\n", "\n\n", "\t", "#", '"', "'", '"""', "[", "]", "{", "}", "=", ".", ",", "\\",
    "\ufeff", "\ufffe", "\u202e", "é", "[[", "]]", "[" * 500, "{a=" * 100, "0", "-", "e9", "_", "[site_a]",
)  # fmt: skip
BYTES = (b"\xff", b"\xfe\xff", b"\xc3", b"\x80", b"\xed\xa0\x80", b"\x00\x00", b"\xf4\x90\x80\x80")


def _line(change: Callable[[list[str], int, int], list[str]]) -> Callable[[str, float, int], str]:
    """Make a mutation of a text out of one of its lines."""

    def mutate(text: str, place: float, number: int) -> str:
        lines = text.split("\n")
        return "\n".join(change(lines, int(place * (len(lines) - 1)), number))

    return mutate


def _value(lines: list[str], at: int, number: int) -> list[str]:
    return [*lines[:at], re.sub(r"=.*", lambda _: f"= {VALUES[number % len(VALUES)]}", lines[at]), *lines[at + 1 :]]


def _key(lines: list[str], at: int, number: int) -> list[str]:
    return [*lines[:at], re.sub(r"^[^=\[]*=", lambda _: f"{KEYS[number % len(KEYS)]} =", lines[at]), *lines[at + 1 :]]


def _new(lines: list[str], at: int, number: int) -> list[str]:
    extra = f"{KEYS[number % len(KEYS)]} = {VALUES[number // len(KEYS) % len(VALUES)]}"
    return [*lines[:at], extra, *lines[at:]]


def _uncommented(lines: list[str], at: int, _: int) -> list[str]:
    return [*lines[:at], lines[at].removeprefix("#"), *lines[at + 1 :]]


def _moved(lines: list[str], at: int, number: int) -> list[str]:
    rest = [*lines[:at], *lines[at + 3 :]]
    to = number % (len(rest) + 1)
    return [*rest[:to], *lines[at : at + 3], *rest[to:]]


def _number(text: str, place: float, number: int) -> str:
    found = list(re.finditer(r"(?<![\w.])-?\d+(?:\.\d+)?", text))
    if not found:
        return text
    match = found[int(place * (len(found) - 1))]
    new = ("0", "-1", "1e308", "nan", "inf", "5e-324", "1e9", "-0.0", f"{float(match[0]) * 1.001:g}", "3", "0.3")[
        number % 11
    ]
    return text[: match.start()] + new + text[match.end() :]


def _put(text: str, place: float, number: int) -> str:
    at = int(place * len(text))
    return text[:at] + PIECES[number % len(PIECES)] + text[at:]


KINDS: dict[str, Callable[[str, float, int], str]] = {
    "value": _line(_value),
    "key": _line(_key),
    "new line": _line(_new),
    "line gone": _line(lambda lines, at, _: lines[:at] + lines[at + 1 :]),
    "line twice": _line(lambda lines, at, _: lines[: at + 1] + lines[at:]),
    "lines moved": _line(_moved),
    "comment opened": _line(_uncommented),
    "number": _number,
    "piece": _put,
    "cut": lambda text, place, _: text[: int(place * len(text))],
}
"""What can be done to a text; a byte that is no UTF-8 comes on top, in `mutated`."""


def good_hops() -> list[str]:
    """Texts of hop files to start from, all over the sample country, with few draws so that each takes a moment."""
    texts = [path.read_text(encoding="utf-8") for path in sorted(SAMPLES.glob("*.toml"))]
    texts.append(starter().replace('"terrain/"', '"country.tif"'))
    return [re.sub(r"(?m)^draws = \d+", "draws = 100", text) for text in texts]


def mutated(text: str, mutations: Sequence[Mutation], stray: int | None = None) -> bytes:
    """Apply mutations one after the other, then put a stray sequence of bytes somewhere if a number asks for it."""
    for kind, place, number in mutations:
        text = KINDS[kind](text, place, number)
    data = text.encode("utf-8", "replace")
    if stray is None:
        return data
    at = stray % (len(data) + 1)
    return data[:at] + BYTES[stray % len(BYTES)] + data[at:]


def fault(code: int, out: str, err: str, seconds: float = 0.0, *, longest_s: float = 10.0) -> str | None:
    """Say what is wrong with an outcome; the program may answer (0, 1) or refuse in one line (2), and nothing else."""
    lines = err.splitlines()
    if code not in (0, 1, 2):
        return f"exit code {code}: {lines[-1] if lines else ''}"
    if code == 2 and (out or len(lines) != 1 or not err.startswith("hopwright: ") or not err.endswith("\n")):
        return f"refused in {len(lines)} lines on standard error and {len(out)} letters on standard output: {err[:300]}"
    if code < 2 and [line for line in lines if ": not written, since " not in line]:
        return f"a line beside an answer: {err[:300]}"
    if bad := sorted({letter for letter in out + err if not letter.isprintable() and letter != "\n"}):
        return f"letters that do not print: {bad}"
    if len(err) > 2100:
        return f"a line of {len(err)} letters"
    limit_s = 2.0 if code == 2 else longest_s
    return f"took {seconds:.1f} s with exit code {code}" if seconds > limit_s else None
