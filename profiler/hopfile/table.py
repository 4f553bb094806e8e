"""Read one table of a hop file as its class states it, in whichever unit a key is written.

Every error names the file, the key as the user wrote it, its value, what is allowed in the user's own unit, and what
to do.
"""

from __future__ import annotations

import difflib
import math
import re
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from profiler.errors import MISSING, InputError, show
from profiler.hopfile.spot import Spot
from profiler.models import Hop
from profiler.models.key_units import Way, in_unit, stem_of
from profiler.models.stated import Entry, Kind, States, allowed, entries, forms, ways

__all__ = ["Table", "build", "read"]

Builder = Callable[["Table"], Any]

_UNPRINTED = re.compile("[\x00-\x1f\x7f-\x9f\u2028\u2029\u202a-\u202e\u2066-\u2069]")
"""What may steer a terminal, begin a line or turn the writing around."""
_SORTS: Mapping[Any, tuple[type, ...]] = {
    **dict.fromkeys(("table", "named"), (dict,)),
    **dict.fromkeys(("list", "pairs"), (list,)),
    **dict.fromkeys(("choice", Path), (str,)),
    float: (int, float),
}
"""What TOML gives for the sorts that are not a type of TOML's own."""
_PRINTABLE = "text on one line without control characters"


@dataclass(frozen=True, slots=True)
class Table:
    """One table as read: values by field, in the fields' units and with the tables inside it built; keys as written."""

    states: States
    raw: Mapping[str, Any]
    values: dict[str, Any]
    written: Mapping[str, str]
    spot: Spot

    def shown(self, field: str) -> str:
        """Key of a field as the user wrote it, else as the trade writes it."""
        usual = {entry.field: entry.usual.key for entry in entries(self.states)}
        return self.written.get(field, usual.get(field, field))

    def error(self, field: str, allowed: str, remedy: str = "") -> InputError:
        """Build the error about a field."""
        key = self.shown(field)
        return self.spot.error(key, self.raw.get(key, MISSING), allowed, remedy)

    @contextmanager
    def blame(self) -> Iterator[None]:
        """Put file, table and the user's own key and value into an error that a class or a stage raises."""
        try:
            yield
        except InputError as error:
            if error.problem and not error.where:
                error.where = self.spot.reading.where
                error.problem = f"{self.spot.at}: {error.problem}" if self.spot.at else error.problem
            elif not error.where:
                name, rest = re.fullmatch(r"(\w*)(.*)", error.field, re.DOTALL).groups()  # type: ignore[union-attr]
                key = self.shown(name)
                error.where, error.field = self.spot.reading.where, self.spot.key(key) + rest
                if not rest and key in self.raw:
                    error.value = self.raw[key]
                stated = [entry for entry in entries(self.states) if entry.field == name]
                if stated and error.value is MISSING and not error.remedy:
                    error.remedy = stated[0].explained
            raise


def build(states: States, raw: Mapping[str, Any], spot: Spot, special: Mapping[type, Builder]) -> Any:
    """Read a table and build its object, by the special builder of its class if there is one."""
    table = read(states, raw, spot, special)
    with table.blame():
        return special[states](table) if states in special else states(**table.values)


def read(states: States, raw: Mapping[str, Any], spot: Spot, special: Mapping[type, Builder]) -> Table:
    """Read one table.

    Parameters
    ----------
    states
        The class that states its keys.
    raw
        The table as TOML gives it.
    spot
        Where it stands.
    special
        Builders of the classes whose tables do not map field by field.

    Raises
    ------
    InputError
        For the first unknown key, else the first value that is not allowed, else what the keys ask of one another.

    Examples
    --------
    >>> from profiler.hopfile.spot import Reading
    >>> from profiler.models import TowerChoice
    >>> spot = Spot(Reading("hop.toml", Path()), "heights.a")
    >>> read(TowerChoice, {"lowest_ft": 100}, spot, {}).values
    {'lowest_m': 30.48}
    >>> read(TowerChoice, {"lowest_fr": 100}, spot, {})
    Traceback (most recent call last):
    profiler.errors.InputError: hop.toml: heights.a.lowest_fr = 100: must be a known key; did you mean lowest_ft?
    """
    raw = _measured(states, raw, spot)
    known, written = ways(states), dict[str, str]()
    for key, value in raw.items():
        if key not in known:
            raise spot.error(key, value, "a known key", _nearest(states, key, spot))
        field = known[key][0].field
        if field in written:
            raise spot.error(key, value, f"left out beside {written[field]} = {show(raw[written[field]])}", "give one")
        written[field] = key
    table = Table(states, raw, {}, written, spot)
    for entry in entries(states):
        if entry.field in written:
            key = written[entry.field]
            table.values[entry.field] = _Value(entry, known[key][1], table, special).read(entry.kind, raw[key], key)
    for entry in sorted(entries(states), key=lambda entry: entry.kind.sort == "table"):  # what is short is told first
        if entry.required and entry.field not in written:
            raise table.error(entry.field, _expected(entry.kind, entry, entry.usual, spot), entry.key.words)
    with table.blame():
        for each in forms(states):
            each.check(table.values, table.shown)
    return table


def _measured(states: States, raw: Mapping[str, Any], spot: Spot) -> dict[str, Any]:
    """Put the key with its unit in place of a key without, whose text names the unit: ``antenna = "60 ft"``."""
    bare = {entry.bare: entry for entry in entries(states) if entry.bare}
    found: dict[str, Any] = {}
    for key, value in raw.items():
        entry = bare.get(key) if key not in ways(states) else None
        if entry is not None:
            measure = in_unit(value, entry.ways) if isinstance(value, str) else None
            if measure is None:
                like = f'a number with its unit in quotes, like "{entry.key.example:g} {entry.usual.unit}"'
                raise spot.error(key, value, like, f"or {entry.usual.key} with the number alone")
            if measure[0] in raw:
                raise spot.error(key, value, f"left out beside {measure[0]} = {show(raw[measure[0]])}", "give one")
            found[measure[0]] = measure[1]
        else:
            found[key] = value
    return found


def _nearest(states: States, key: str, spot: Spot) -> str:
    """Offer the key that is meant, by what others call it or by its spelling, or all keys."""
    plain = key.lower().replace("-", "_").replace(" ", "_")
    meant = {name: way.key for name, (_, way) in ways(states).items()}
    for entry in entries(states):
        for name in entry.key.also:
            meant[name] = entry.usual.key
            meant |= {f"{name}_{way.key.rpartition('_')[2]}": way.key for way in entry.ways}
    near = [plain] if plain in meant else difflib.get_close_matches(plain, meant, n=1, cutoff=0.7)
    near = near or difflib.get_close_matches(plain, ways(states), n=1)
    if near:
        entry, way = ways(states)[meant[near[0]]]
        spelled = way.plain and near[0] != plain and stem_of(near[0]) != stem_of(plain)
        return f"did you mean {entry.usual.key if spelled else way.key}?"
    if spot.at and key in ways(Hop):
        return "it belongs at the top of the file, before the first [table]"
    return f"known here: {', '.join(entry.usual.key for entry in entries(states))}"


@dataclass(frozen=True, slots=True)
class _Value:
    """Reads the value of one key."""

    entry: Entry
    way: Way
    table: Table
    special: Mapping[type, Builder]

    def read(self, kind: Kind, value: Any, name: str) -> Any:
        """Read a value, or one inside it; ``name`` is the key with the places of what it is inside of."""
        if not isinstance(value, _SORTS.get(kind.sort, (kind.sort,))) or (
            isinstance(value, bool) and kind.sort is not bool
        ):
            raise self.wrong(kind, value, name)
        match kind.sort:
            case "table":
                found = build(kind.of, value, self.table.spot.into(name), self.special)
            case "list":
                found = self.items(kind, value, name)
            case "named":
                found = tuple((self.name(kind.of, each, value, name), self.number(each, value, name)) for each in value)
            case "pairs":
                found = tuple(self.pair(each, f"{name}[{index}]") for index, each in enumerate(value))
            case "choice" if value not in kind.of:
                raise self.wrong(kind, value, name)
            case sort if sort in (float, int):
                found = self.measured(kind, value, name)
            case sort if sort in (str, Path):
                found = self.text(kind, value, name)
            case _:
                found = value
        return found

    def items(self, kind: Kind, value: list[Any], name: str) -> tuple[Any, ...]:
        """Read a list; one that has to be there has something in it."""
        tables = kind.of.sort == "table"
        if (self.entry.required and not value) or (tables and not all(isinstance(each, dict) for each in value)):
            raise self.wrong(kind, value, name)
        return tuple(self.read(kind.of, each, f"{name}[{index}]") for index, each in enumerate(value))

    def wrong(self, kind: Kind, value: Any, name: str) -> InputError:
        """Build the error about a value of the wrong sort."""
        near: list[str] = []
        if kind.sort == "choice" and isinstance(value, str):
            if value in (former := dict(self.entry.key.former)):
                return self.table.spot.error(name, value, f"written as {former[value]!r}, which it is called now")
            near = difflib.get_close_matches(value.lower(), kind.of, n=1)
        expected = _expected(kind, self.entry, self.way, self.table.spot)
        return self.table.spot.error(name, value, expected, f"did you mean {near[0]!r}?" if near else "")

    def measured(self, kind: Kind, value: Any, name: str) -> Any:
        """Read a number in the unit of the key, into that of the field."""
        try:
            number = kind.sort(self.way.into(value))
            fits = self.entry.key.hold(float(number))
        except OverflowError:  # a whole number beyond floating point
            number, fits = math.inf, False
        if not fits:
            said = allowed(kind, self.entry.key, self.way, sort=isinstance(value, float) and not math.isfinite(value))
            remedy = self.entry.owner.remedy(self.entry.field, self.table.raw)
            raise self.table.spot.error(name, value, said, remedy)
        return number

    def number(self, key: str, values: Mapping[str, Any], name: str) -> Any:
        """Read a number that stands in a table by a name of the user's own."""
        return self.read(Kind(float), values[key], f"{name}.{key}")

    def name(self, sort: type, key: str, values: Mapping[str, Any], name: str) -> Any:
        """Read the name of a number: text, or a whole number that TOML can only write as text."""
        if sort is int:
            if not key.isdecimal():
                raise self.table.spot.error(f"{name}.{key}", values[key], "keyed by a whole number, like 41 = 18")
            return int(key)
        if _UNPRINTED.search(key) or not key:
            raise self.table.spot.error(name, key, f"a table of keys that are {_PRINTABLE}")
        return key

    def pair(self, value: Any, name: str) -> tuple[Any, ...]:
        """Read two numbers."""
        if not isinstance(value, list) or len(value) != 2:
            raise self.wrong(Kind("pairs"), value, name)
        return tuple(self.read(Kind(float), each, f"{name}[{index}]") for index, each in enumerate(value))

    def text(self, kind: Kind, value: str, name: str) -> str | Path:
        """Read text that can be printed as it stands, or a path from the file's folder to something that is there."""
        if not value:
            raise self.wrong(kind, value, name)
        if _UNPRINTED.search(value) and not self.entry.key.parsed:
            raise self.table.spot.error(name, value, _PRINTABLE)
        if kind.sort is str:
            return value
        path = self.table.spot.reading.base_dir / value
        if not path.exists():
            remedy = "paths start from the folder of the hop file"
            raise self.table.spot.error(name, value, "a raster or a folder of rasters that is there", remedy)
        return path


def _expected(kind: Kind, entry: Entry, way: Way, spot: Spot) -> str:
    """Say what sort of value a key holds."""
    if kind.sort in (float, int, "choice"):
        return allowed(kind, entry.key, way, sort=True)
    if kind.sort == "list":
        of = "list of tables" if kind.of.sort == "table" else kind.of.sort
        return {
            "list of tables": f"a list of tables, each headed [[{spot.key(way.key)}]]",
            Path: 'a list with at least one text, like ["a.tif"]',
        }.get(of, f"a list of numbers in {way.unit}" if way.unit else "a list of numbers")
    table = f"a table, headed [{spot.key(way.key)}]"
    pairs = "pairs of numbers, like [[0.1, 0.8], [50, 1.3333]]"
    found = {"table": table, "named": table, "pairs": pairs, bool: "true or false"}
    return found.get(kind.sort, "text in quotes, not empty")
