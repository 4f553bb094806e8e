"""How a class states what a user may say: one statement for each field, from which everything else follows.

A field of a frozen dataclass is annotated with a `Key`: its words, bounds, unit and example. The reader of hop files,
their JSON Schema, the starter file, the page of keys, the check of the class itself and every message about the field
are made from that. A field without a `Key` is nothing that a user states: it is derived from what is stated. `Bounds`
beside or in place of a `Key` are what code may give, where that is more than a file may.
"""

from __future__ import annotations

import math
import types
from collections.abc import Callable, Iterable, Iterator, Mapping
from dataclasses import MISSING as NO_DEFAULT
from dataclasses import dataclass, fields, is_dataclass
from functools import cache
from typing import Any, ClassVar, Literal, NamedTuple, Union, get_args, get_origin, get_type_hints

from profiler.errors import MISSING, InputError
from profiler.models.key_units import Way, stem_of, unit_ways

__all__ = [
    "Bounds",
    "Entry",
    "Form",
    "Forms",
    "Key",
    "Kind",
    "Stated",
    "States",
    "allowed",
    "entries",
    "forms",
    "listed",
    "require",
    "ways",
]


States = Any
"""A class with `Stated` for its base; mypy knows no type for it that is also hashable and a dataclass."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Bounds:
    """Bounds of a number in its field's own unit: ``least`` and ``most`` are allowed, ``above`` and ``below`` not."""

    least: float | None = None
    above: float | None = None
    most: float | None = None
    below: float | None = None
    infinite: bool = False

    def hold(self, value: float) -> bool:
        """Whether a number lies within, and is finite unless infinity is allowed."""
        return (
            (self.least is None or value >= self.least)
            and (self.above is None or value > self.above)
            and (self.most is None or value <= self.most)
            and (self.below is None or value < self.below)
            and (math.isfinite(value) or (self.infinite and value == math.inf))
        )

    def ends(self, way: Way) -> tuple[float | None, float | None, bool, bool]:
        """Both bounds in the unit of one way, and whether each is itself outside."""
        low, high = (
            (self.least if self.above is None else self.above),
            (self.most if self.below is None else self.below),
        )
        first = None if low is None else way.out(low), self.above is not None
        last = None if high is None else way.out(high), self.below is not None
        if first[0] is not None and last[0] is not None and first[0] > last[0]:  # a gradient falls where k rises
            first, last = last, first
        return first[0], last[0], first[1], last[1]

    def within(self, way: Way) -> str:
        """Word the bounds in the unit of one way; empty where there is none.

        Examples
        --------
        >>> metres, feet, *_ = unit_ways("lowest_m")
        >>> Bounds(above=0, below=2000).within(feet), Bounds(least=0).within(metres), Bounds(most=5).within(metres)
        ('more than 0 and under 6561.68 ft', '0 m or more', 'at most 5 m')
        >>> Bounds(least=0.1, most=100).within(unit_ways("low_k")[1])
        '-155.43 to 1413 N/km'
        """
        low, high, over, under = self.ends(way)
        unit = f" {way.unit}" if way.unit else ""
        last = "" if high is None else f"{'under' if under else 'at most'} {_number(high)}{unit}"
        if low is None:
            return last
        if high is None:
            return f"more than {_number(low)}{unit}" if over else f"{_number(low)}{unit} or more"
        if over:
            return f"more than {_number(low)} and {last}"
        return f"{_number(low)} to {'under ' if under else ''}{_number(high)}{unit}"


@dataclass(frozen=True, slots=True)
class Key(Bounds):
    """The statement of one field: what it is, what is allowed, and how it is written in a hop file.

    ``words`` say what it is. ``left_out`` says what is taken where the key is not given, if that is not simply the
    field's default. ``name`` is the key in the file, where it is not the field's name; ``usual`` the ending that the
    trade writes (``"ghz"``); ``example`` a value in that unit. ``percent`` is for shares, written in percent, and
    ``parsed`` for text that is taken apart and not shown. ``also`` has what others call it,
    without a unit, for the offer beside a wrong key. ``former`` has the names that choices had before, each with
    its successor. ``kind`` is the class that stands in the file in place of the field's own.
    """

    words: str
    example: Any = None
    left_out: str = ""
    name: str = ""
    usual: str = ""
    percent: bool = False
    parsed: bool = False
    also: tuple[str, ...] = ()
    former: tuple[tuple[str, str], ...] = ()
    kind: States | None = None


@dataclass(frozen=True, slots=True)
class Form:
    """On a field that is derived: the keys of this class stand in its place in the file."""

    states: States


@dataclass(frozen=True, slots=True)
class Forms:
    """Ways to state one thing, each a set of fields: one is given and whole, or at least one if not ``only``.

    A name that ends in ``?`` may go with its way and need not. With ``needed`` False all may be left out.
    """

    ways: tuple[tuple[str, ...], ...]
    needed: bool = True
    only: bool = True

    def required(self) -> list[tuple[str, ...]]:
        """Fields that make each way whole."""
        return [tuple(name for name in way if not name.endswith("?")) for way in self.ways]

    def check(self, given: Mapping[str, Any], shown: Callable[[str], str]) -> None:
        """Hold what is given to the forms; ``shown`` turns a field's name into that of its key."""
        required = self.required()
        every = [name for way in required for name in way]
        telling = [[name for name in way if every.count(name) == 1] for way in required]
        used = [index for index, names in enumerate(telling) if any(name in given for name in names)]
        offer = ", or ".join(listed(map(shown, way)) for way in required)
        if not used:
            if self.needed:
                raise InputError(field=required[0][0], value=MISSING, allowed=f"given: {offer}")
            return
        lead = next(name for name in telling[used[0]] if name in given)
        if self.only and len(used) > 1:
            extra = next(name for name in telling[used[1]] if name in given)
            raise _beside(extra, given, shown(lead), f"give one of {offer}")
        gaps = [[name for name in required[index] if name not in given] for index in used]
        if all(gaps):
            remedy = "" if self.only else f"or give {', or '.join(listed(map(shown, way)) for way in required[:1])}"
            field, beside = gaps[0][0], f"given beside {shown(lead)}"
            raise InputError(field=field, value=MISSING, allowed=beside, remedy=remedy)
        here = {name.rstrip("?") for name in self.ways[used[0]]}
        for name in dict.fromkeys(name.rstrip("?") for way in self.ways for name in way):
            if self.only and name in given and name not in here:
                raise _beside(name, given, shown(lead), f"it goes with {offer_of(self, name, shown)}")


def offer_of(forms: Forms, name: str, shown: Callable[[str], str]) -> str:
    """Name the ways that a field goes with."""
    return " or ".join(dict.fromkeys(shown(way[0]) for way in forms.ways if {name, f"{name}?"} & set(way)))


def _beside(name: str, given: Mapping[str, Any], lead: str, remedy: str) -> InputError:
    return InputError(field=name, value=given[name], allowed=f"left out beside {lead}", remedy=remedy)


def listed(names: Iterable[str]) -> str:
    """List names as a sentence does.

    Examples
    --------
    >>> listed(["easting", "northing", "epsg"])
    'easting, northing and epsg'
    """
    *most, last = names
    return f"{', '.join(most)} and {last}" if most else last


class Kind(NamedTuple):
    """What a field holds: the sort of its value, and what is inside it.

    Sorts are float, int, bool, str, Path; ``"choice"``, of the choices; ``"table"``, of a class; ``"list"``, of the
    kind of its items; ``"named"``, a table of numbers by names of the type ``of``; and ``"pairs"``, of numbers.
    """

    sort: Any
    of: Any = None


@dataclass(frozen=True, slots=True)
class Entry:
    """One field as its class states it, with every way to write it; the first is the usual one."""

    owner: States
    field: str
    kind: Kind
    key: Key
    default: Any
    ways: tuple[Way, ...]

    @property
    def required(self) -> bool:
        """Whether there is nothing to take where it is left out."""
        return self.default is NO_DEFAULT and not self.key.left_out

    @property
    def bare(self) -> str:
        """The key without its unit, which stands for text that names the unit: ``antenna = "60 ft"``."""
        return "" if self.key.percent or self.kind.sort is not float else stem_of(self.ways[0].key)

    @property
    def usual(self) -> Way:
        """The way that the trade writes."""
        return self.ways[0]

    @property
    def explained(self) -> str:
        """What a key is, what it may be where it is one of a few, and what is taken where it is left out."""
        words = self.key.words + (f": {', '.join(self.kind.of)}" if self.kind.sort == "choice" else "")
        return words + (f"; if left out, {self.key.left_out}" if self.key.left_out else "")


class Stated:
    """Base of the classes whose fields are stated: each value is held to its statement when an object is made."""

    __slots__ = ()
    FORMS: ClassVar[tuple[Forms, ...]] = ()
    """What the fields ask of one another."""

    def __post_init__(self) -> None:
        """Hold every number and choice to its statement, then the fields to one another."""
        states: States = type(self)
        for field, kind, bounds in _checked(states):
            for place, each in _inside(getattr(self, field), kind.sort):
                if not (each in kind.of if kind.sort == "choice" else bounds.hold(each)):
                    plain = next(way for way in unit_ways(field) if way.plain)
                    raise InputError(field=field + place, value=each, allowed=allowed(kind, bounds, plain))
        for forms in self.FORMS:
            if not forms.needed:  # what a file has to say, code may leave open
                self._together(forms)
        self._agree()

    def _together(self, forms: Forms) -> None:
        """Hold what is not at its default to a form."""
        states: States = type(self)
        values = {each.name: (getattr(self, each.name), each.default) for each in fields(states)}
        forms.check({name: value for name, (value, default) in values.items() if value != default}, str)

    @classmethod
    def remedy(cls, field: str, raw: Mapping[str, Any]) -> str:
        """Say what to do about a number that is out of its bounds, seeing the table that it stands in."""
        del field, raw
        return ""

    def _agree(self) -> None:
        """Hold the fields to one another in ways that no form states; a class with something to say says it here."""


def require(ok: bool, field: str, value: object, allowed: str) -> None:
    """Stop with the error of a field unless ``ok``."""
    if not ok:
        raise InputError(field=field, value=value, allowed=allowed)


def _inside(value: Any, sort: Any) -> Iterator[tuple[str, Any]]:
    """Give each number (or the choice) in a value, with its place behind the field's name."""
    if sort == "list":
        yield from ((f"[{index}]", each) for index, each in enumerate(value))
    elif sort == "named":
        yield from ((f".{name}", number) for name, number in value)
    elif value is not None:
        yield "", value


@cache
def _checked(states: States) -> tuple[tuple[str, Kind, Bounds], ...]:
    """Fields of a class that have something to be held to: bounds for code, or else those of the key."""
    notes = [(each, _kind(hint), note) for each, hint, note in _notes(states) if isinstance(note, Bounds)]
    for_code = {each for each, _, note in notes if type(note) is Bounds}
    found = [(each, kind, note) for each, kind, note in notes if each not in for_code or type(note) is Bounds]
    return tuple(
        (field, kind, bounds)
        for field, kind, bounds in found
        if kind.sort in (float, int, "choice", "named") or kind == Kind("list", Kind(float))
    )


def _notes(states: States) -> Iterator[tuple[str, Any, Any]]:
    """Each note on each field of a class, with the field's name and type."""
    hints = get_type_hints(states, include_extras=True)
    for each in fields(states):
        for note in getattr(hints[each.name], "__metadata__", ()):
            yield each.name, get_args(hints[each.name])[0], note


@cache
def entries(states: States) -> tuple[Entry, ...]:
    """Every key of a class in the order of its fields, those of its forms among them.

    Examples
    --------
    >>> from profiler.models import Site
    >>> [entry.usual.key for entry in entries(Site)][:4]
    ['name', 'position', 'latitude', 'longitude']
    """
    defaults = {each.name: each.default for each in fields(states)}
    found: list[Entry] = []
    for field, hint, note in _notes(states):
        if isinstance(note, Key):
            kind = _kind(hint) if note.kind is None else Kind("table", note.kind)
            written = unit_ways(note.name or field, note.usual, percent=note.percent)
            found.append(Entry(states, field, kind, note, defaults[field], written))
        elif isinstance(note, Form):
            found += entries(note.states)
    return tuple(found)


@cache
def forms(states: States) -> tuple[Forms, ...]:
    """Forms of a class and of the classes whose keys stand in it."""
    inner = [each for _, _, note in _notes(states) if isinstance(note, Form) for each in forms(note.states)]
    return (*inner, *states.FORMS)


@cache
def ways(states: States) -> Mapping[str, tuple[Entry, Way]]:
    """Every key that a table of this class may hold, in every unit, with its statement.

    Examples
    --------
    >>> from profiler.models import TowerChoice
    >>> ways(TowerChoice)["step_km"][1].into(0.005), ways(TowerChoice)["cost_per_km"][1].into(2000)
    (5.0, 2.0)
    """
    return {way.key: (entry, way) for entry in entries(states) for way in entry.ways}


def _kind(hint: Any) -> Kind:
    """Sort out a type hint; that it may be None says nothing here."""
    outer, inner = get_origin(hint), get_args(hint)
    if outer in (Union, types.UnionType):
        return _kind(next(each for each in inner if each is not type(None)))
    if outer is Literal:
        return Kind("choice", inner)
    if outer is tuple:
        pair = get_args(inner[0])
        if not pair:
            return Kind("list", _kind(inner[0]))
        return Kind("pairs") if pair[0] is float else Kind("named", pair[0])
    return Kind("table", hint) if is_dataclass(hint) else Kind(hint)


def allowed(kind: Kind, bounds: Bounds, way: Way, *, sort: bool = False) -> str:
    """Say which numbers or choices a field takes, in the unit of one way; with ``sort`` also that it is a number."""
    if kind.sort == "choice":
        return f"one of {', '.join(map(repr, kind.of))}"
    limits = bounds.within(way)
    if limits and not sort:
        return limits
    what = "a whole number" if kind.sort is int else "a number"
    if limits:
        return f"{what}, {limits}"
    return f"a finite number of {way.unit}" if way.unit else what


def _number(value: float) -> str:
    """Write a bound to seven digits, whole numbers in full.

    Examples
    --------
    >>> _number(1e9), _number(6561.67979), _number(0.1)
    ('1000000000', '6561.68', '0.1')
    """
    return f"{value:.0f}" if float(f"{value:.7g}").is_integer() and abs(value) < 1e15 else f"{value:.7g}"
