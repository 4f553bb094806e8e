"""Check one table of a hop file against its schema, in whichever unit a key is written, and word what is wrong.

Every message is one line that names the file, the key as the user wrote it, its value, what is allowed in the user's
own unit, and what to do.
"""

from __future__ import annotations

import difflib
import math
import types
from collections.abc import Mapping
from typing import Annotated, Any, Literal, TypeVar, Union, get_args, get_origin

from pydantic import ValidationError
from pydantic.fields import FieldInfo

from profiler.errors import InputError
from profiler.hopfile.keys import printed_unit, usual, ways
from profiler.hopfile.schema import HopTable, Table
from profiler.hopfile.spot import MISSING, Spot, show

__all__ = ["check", "given"]

_PRINTABLE = "text on one line without control characters"
_RANGE_ERRORS = frozenset({"greater_than", "greater_than_equal", "less_than", "less_than_equal"})

TableT = TypeVar("TableT", bound=Table)


def given(table: Table) -> dict[str, Any]:
    """Keys of a checked table that were given, with their values."""
    return {key: value for key, value in table if value is not None}


def _ways(model: type[Table]) -> Mapping[str, tuple[str, float]]:
    return ways(tuple(model.model_fields))


def _scaled(value: Any, factor: float) -> Any:
    """Turn numbers, alone or in lists and tables, into the schema's unit; leave all else for the schema to refuse."""
    if isinstance(value, list):
        return [_scaled(each, factor) for each in value]
    if isinstance(value, dict):
        return {key: _scaled(each, factor) for key, each in value.items()}
    if isinstance(value, bool) or not isinstance(value, int | float):
        return value
    try:
        return value * factor
    except OverflowError:  # an integer beyond floating point; the schema refuses infinity
        return math.inf


def check(model: type[TableT], raw: Mapping[str, Any], spot: Spot) -> TableT:
    """Check one table.

    Parameters
    ----------
    model
        Its schema.
    raw
        The table as TOML gives it.
    spot
        Where it stands.

    Returns
    -------
    Table
        In the units of the schema.

    Raises
    ------
    InputError
        For the first unknown key, else the first value that is not allowed.

    Examples
    --------
    >>> from profiler.hopfile.schema import TowerTable
    >>> check(TowerTable, {"lowest_ft": 100}, Spot("hop.toml", "heights.a")).lowest_m
    30.48
    >>> check(TowerTable, {"lowest_fr": 100}, Spot("hop.toml", "heights.a"))
    Traceback (most recent call last):
    profiler.errors.InputError: hop.toml: heights.a.lowest_fr = 100: must be a known key; did you mean lowest_ft?
    """
    known = _ways(model)
    values: dict[str, Any] = {}
    written: dict[str, str] = {}
    for key, value in raw.items():
        if key not in known:
            raise _unknown(model, key, value, spot)
        field, factor = known[key]
        if field in written:
            raise spot.error(key, value, f"left out beside {written[field]} = {show(raw[written[field]])}", "give one")
        values[field], written[field] = _scaled(value, factor) if key != field else value, key
    try:
        return model.model_validate(values)
    except ValidationError as error:
        first = error.errors(include_url=False, include_context=False, include_input=False)[0]
        raise _reworded(model, raw, written, first["type"], first["loc"], spot) from None


def _unknown(model: type[Table], key: str, value: object, spot: Spot) -> InputError:
    """Offer the nearest known key, or all of them."""
    near = difflib.get_close_matches(key.lower(), _ways(model), n=1)
    if near:
        remedy = f"did you mean {usual(near[0])}?"
    elif spot.at and key in _ways(HopTable):
        remedy = "it belongs at the top of the file, before the first [table]"
    else:
        remedy = f"known here: {', '.join(map(usual, model.model_fields))}"
    return spot.error(key, value, "a known key", remedy)


def _reworded(
    model: type[Table],
    raw: Mapping[str, Any],
    written: Mapping[str, str],
    kind: str,
    location: tuple[int | str, ...],
    spot: Spot,
) -> InputError:
    """Word a complaint of the schema for the person who wrote the file."""
    field, steps = str(location[0]), location[1:]
    key = written.get(field, usual(field))
    if steps and steps[-1] == "[key]":
        return spot.error(key, str(steps[-2]), f"a table of keys that are {_PRINTABLE}")
    annotation, bounds = _inner(model.model_fields[field], len(steps))
    allowed = _allowed(annotation, bounds, key, _ways(model)[key][1], kind, spot)
    if kind == "missing":
        return spot.error(key, MISSING, allowed)
    value: Any = raw[key]
    for step in steps:
        value = value[step]
    name = key + "".join(f"[{step}]" if isinstance(step, int) else f".{step}" for step in steps)
    choices = [each for each in get_args(annotation) if isinstance(each, str)]
    near = difflib.get_close_matches(value.lower(), choices, n=1) if isinstance(value, str) and choices else []
    return spot.error(name, value, allowed, f"did you mean {near[0]!r}?" if near else "")


def _inner(field: FieldInfo, depth: int) -> tuple[Any, dict[str, float]]:
    """Type and bounds of a field, or of what stands ``depth`` lists or tables inside it."""
    annotation, notes = _plain(field.annotation)
    notes += field.metadata
    for _ in range(depth):
        annotation, notes = _plain(get_args(annotation)[-1])
    bounds = {name: getattr(note, name) for note in notes for name in ("gt", "ge", "lt", "le") if hasattr(note, name)}
    return annotation, bounds


def _plain(annotation: Any) -> tuple[Any, list[Any]]:
    """Take the None out of an optional type, and its notes out of an annotated one."""
    if get_origin(annotation) in (Union, types.UnionType):
        annotation = next(each for each in get_args(annotation) if each is not type(None))
    if get_origin(annotation) is not Annotated:
        return annotation, []
    annotation, *extra = get_args(annotation)
    return annotation, [note for each in extra for note in each.metadata]


def _allowed(annotation: Any, bounds: Mapping[str, float], key: str, factor: float, kind: str, spot: Spot) -> str:
    """Say what a key may hold, its bounds in the unit that the user writes."""
    unit, origin = printed_unit(key), get_origin(annotation)
    if annotation in (float, int):
        limits = _range({name: bound / factor for name, bound in bounds.items()}, unit)
        sort = ("a number" if annotation is float else "a whole number") + (
            f" of {unit}" if unit and not limits else ""
        )
        return limits if kind in _RANGE_ERRORS else ", ".join(filter(None, (sort, limits)))
    if origin is Literal:
        return f"one of {', '.join(map(repr, get_args(annotation)))}"
    if origin is list:
        inner, _ = _plain(get_args(annotation)[0])
        if get_origin(inner) is dict:
            return f"a list of tables, each headed [[{spot.key(key)}]]"
        numbers = f"a list of numbers in {unit}" if unit else "pairs of numbers, like [[0.1, 0.8], [50, 1.3333]]"
        return 'a list with at least one text, like ["a.tif"]' if inner is str else numbers
    if origin is dict:
        return f"a table, headed [{spot.key(key)}]"
    text = _PRINTABLE if kind == "string_pattern_mismatch" else "text in quotes, not empty"
    return "true or false" if annotation is bool else text


def _number(value: float) -> str:
    """Write a bound to seven digits, whole numbers in full.

    Examples
    --------
    >>> _number(1e9), _number(6561.67979), _number(0.1)
    ('1000000000', '6561.68', '0.1')
    """
    return f"{value:.0f}" if float(f"{value:.7g}").is_integer() and abs(value) < 1e15 else f"{value:.7g}"


def _range(bounds: Mapping[str, float], unit: str) -> str:
    """Word bounds.

    Examples
    --------
    >>> _range({"gt": 0, "le": 1}, ""), _range({"ge": -90, "le": 90}, "degrees"), _range({"ge": 0}, "dB")
    ('more than 0 and at most 1', '-90 to 90 degrees', '0 dB or more')
    """
    low = bounds.get("ge", bounds.get("gt", -math.inf))
    high = bounds.get("le", bounds.get("lt", math.inf))
    end = f" {unit}" if unit else ""
    lowest, highest = _number(low), _number(high)
    if math.isinf(low) and math.isinf(high):
        return ""
    if math.isinf(high):
        return f"more than {lowest}{end}" if "gt" in bounds else f"{lowest}{end} or more"
    under = "under " if "lt" in bounds else ""
    if "gt" in bounds:
        return f"more than {lowest} and {under or 'at most '}{highest}{end}"
    return f"{lowest} to {under}{highest}{end}"
