"""The pairs of sites to screen: a table of pairs, or every pair of a list of sites within a range of distances.

A row that cannot be used keeps its place, with words that say why; what is wrong with the whole table stops it.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from profiler.errors import InputError
from profiler.path import geodesic, to_wgs84
from profiler.screen.lines import Ints
from profiler.screen.tables import Columns, read_table
from profiler.units import FOOT_M, MEAN_EARTH_RADIUS_M, Float

__all__ = ["Pairs", "read_pairs"]

_ENDS = ("longitude_a", "latitude_a", "longitude_b", "latitude_b")
_HEIGHT = (0.0, 2000.0, "more than 0 and under 2000 m")
_EXTRAS = {"antenna_a_m": _HEIGHT, "antenna_b_m": _HEIGHT, "frequency_ghz": (0.01, 1000.0, "0.01 to 1000 GHz")}
_LIMITS = {**_EXTRAS, "antenna_m": _HEIGHT}
_MOST_PAIRS = 20_000_000
_SHORTEST_M, _LONGEST_M = 1.0, 1_000_000.0


@dataclass(frozen=True, slots=True, eq=False)
class Pairs:
    """Pairs of sites; arrays are (pairs,), WGS 84 degrees. NaN in an antenna or frequency means the template's.

    ``problem`` is empty for a pair that can be screened, else the words that say why not.
    """

    ids: Sequence[str]
    problem: Sequence[str]
    longitude_a: Float
    latitude_a: Float
    longitude_b: Float
    latitude_b: Float
    antenna_a_m: Float
    antenna_b_m: Float
    frequency_ghz: Float

    def __len__(self) -> int:
        return int(self.longitude_a.size)

    def take(self, which: Ints) -> Pairs:
        """Return some pairs, in the order given."""
        arrays = (getattr(self, name)[which] for name in (*_ENDS, *_EXTRAS))
        ids, problem = ([texts[i] for i in which.tolist()] for texts in (self.ids, self.problem))
        return Pairs(ids, problem, *arrays)


@dataclass(frozen=True, slots=True, eq=False)
class _Rows:
    """Checked rows: ids, numbers by column, and what is wrong with each row."""

    ids: list[str]
    numbers: dict[str, Float]
    problem: list[str]


def read_pairs(path: Path, *, epsg: int | None = None, within_m: tuple[float, float] | None = None) -> Pairs:
    r"""Read pairs of sites, or sites to be paired, from a table.

    Parameters
    ----------
    path
        A CSV file (commas, semicolons or tabs), GeoJSON, GeoPackage or Parquet. A table of pairs has the columns
        ``id, latitude_a, longitude_a, latitude_b, longitude_b`` and, if wanted, ``antenna_a_m, antenna_b_m`` and
        ``frequency_ghz``; a list of sites ``id, latitude, longitude`` and, if wanted, ``antenna_m``. Heights may stand
        in columns that end in ``_ft``.
    epsg
        Coordinate system of the positions where they are not WGS 84 degrees; longitudes are then eastings.
    within_m
        Least and greatest distance between the sites of a pair, for a list of sites to be paired.

    Returns
    -------
    Pairs
        In the order of the table; of sites each pair once, A before B in the list.

    Raises
    ------
    InputError
        For a file that cannot be read, a column that is missing, or two rows of one id.

    Examples
    --------
    >>> import tempfile
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     file = Path(folder, "pairs.csv")
    ...     _ = file.write_text("id,latitude_a,longitude_a,latitude_b,longitude_b\n1,46,8,46.1,8.1\n2,46,8,x,8\n")
    ...     pairs = read_pairs(file)
    >>> pairs.latitude_b.tolist(), pairs.problem
    ([46.1, nan], ['', "latitude_b = 'x': must be a number"])
    """
    columns = {}
    for name, values in read_table(path).items():
        feet = name.endswith("_ft") and f"{name.removesuffix('_ft')}_m" in _LIMITS
        columns[f"{name.removesuffix('_ft')}_m" if feet else name] = _scaled(values, FOOT_M) if feet else values
    if {"latitude", "longitude"} & columns.keys():
        if within_m is None:
            raise InputError(f"{path}: is a list of sites: must come with --within-km LEAST GREATEST to be paired")
        return _paired(path, _rows(path, columns, ("longitude", "latitude"), ("antenna_m",), epsg), within_m)
    if within_m is not None:
        raise InputError(f"{path}: is a table of pairs: must come without --within-km, which pairs a list of sites")
    rows = _rows(path, columns, _ENDS, tuple(_EXTRAS), epsg)
    _require_apart(rows)
    return Pairs(rows.ids, rows.problem, *(rows.numbers[name] for name in (*_ENDS, *_EXTRAS)))


def _rows(path: Path, columns: Columns, places: tuple[str, ...], extras: tuple[str, ...], epsg: int | None) -> _Rows:
    """Check a table: every position and number, row by row."""
    missing = [name for name in ("id", *places) if name not in columns]
    if missing:
        raise InputError(f"{path}: {missing[0]}: must be a column of the table; it has {', '.join(columns) or 'none'}")
    ids = [str(value).strip() for value in columns["id"]]
    seen: dict[str, int] = {}
    for number, name in enumerate(ids, start=1):
        if seen.setdefault(name, number) != number:
            raise InputError(f"{path}: id = {name!r}: must be different in every row; rows {seen[name]} and {number}")
    problem = [""] * len(ids)
    numbers = {name: _numbers(name, columns[name], problem, wanted=True) for name in places}
    for name in extras:
        numbers[name] = _numbers(name, columns.get(name, [None] * len(ids)), problem, wanted=False)
    for east, north in zip(places[::2], places[1::2], strict=True):
        if epsg is not None:
            numbers[east], numbers[north] = _to_degrees(numbers[east], numbers[north], epsg, problem)
        for name, most in ((east, 180.0), (north, 90.0)):
            beyond = ~(np.abs(numbers[name]) <= most)
            _blame(
                problem,
                beyond,
                lambda i, name=name, most=most: f"{name} = {numbers[name][i]:g}: must be -{most:g} to {most:g} degrees",
            )
    return _Rows(ids, numbers, problem)


def _numbers(name: str, values: list[Any], problem: list[str], *, wanted: bool) -> Float:
    """Read a column as numbers within their limits, NaN where there is none; say so in the rows that need one."""
    low, high, allowed = _LIMITS.get(name, (-np.inf, np.inf, "a number"))
    found = np.full(len(values), np.nan)
    for i, value in enumerate(values):
        if value is None or value == "" or (isinstance(value, float) and np.isnan(value)):
            problem[i] = problem[i] or (f"{name} is missing" if wanted else "")
            continue
        number = _number(value)
        good = number is not None and low < number < high
        if not good:
            problem[i] = problem[i] or f"{name} = {value!r}: must be {allowed}"
        found[i] = number if good and number is not None else np.nan
    return found


def _number(value: Any) -> float | None:
    """Read a number as people and programs write it; None where it is none."""
    try:
        return None if "_" in str(value) or isinstance(value, bool) else float(value)
    except (TypeError, ValueError):
        return None


def _scaled(values: list[Any], factor: float) -> list[Any]:
    """Multiply what are numbers; the rest stays, to be refused where it stands."""
    return [each if (number := _number(each)) is None else number * factor for each in values]


def _blame(problem: list[str], wrong: np.ndarray, words: Any) -> None:
    """Put words into the rows that have none yet."""
    for i in np.flatnonzero(wrong).tolist():
        problem[i] = problem[i] or words(i)


def _to_degrees(east: Float, north: Float, epsg: int, problem: list[str]) -> tuple[Float, Float]:
    """Turn positions in another system into WGS 84 degrees; NaN, and words in the row, where they lie nowhere."""
    found = np.full((2, east.size), np.nan)
    known: dict[tuple[float, float], tuple[float, float]] = {}
    for i in np.flatnonzero(np.isfinite(east) & np.isfinite(north)).tolist():
        place = float(east[i]), float(north[i])
        try:
            if place not in known:
                known[place] = to_wgs84(*place, epsg)[:2]
            found[:, i] = known[place]
        except InputError as error:
            problem[i] = problem[i] or str(error)
    return found[0], found[1]


def _require_apart(rows: _Rows) -> None:
    """Say which rows have sites that are no hop: at one place, or on two continents."""
    good = np.array([not each for each in rows.problem], dtype=bool)
    ends = [rows.numbers[name][good] for name in _ENDS]
    length_m = np.full(good.size, np.nan)
    length_m[good] = geodesic(*ends)[0]
    _blame(rows.problem, length_m < _SHORTEST_M, lambda i: f"the sites are {length_m[i]:.2f} m apart")
    _blame(rows.problem, length_m > _LONGEST_M, lambda i: f"the sites are {length_m[i] / 1e3:.0f} km apart")


def _paired(path: Path, sites: _Rows, within_m: tuple[float, float]) -> Pairs:
    """Pair every two sites whose distance is in range; a site with a problem is in no pair, and stops the list."""
    from scipy.spatial import cKDTree

    wrong = next((i for i, problem in enumerate(sites.problem) if problem), None)
    if wrong is not None:
        raise InputError(f"{path}: site {sites.ids[wrong]}: {sites.problem[wrong]}")
    longitude, latitude, antenna_m = (sites.numbers[name] for name in ("longitude", "latitude", "antenna_m"))
    east, north = np.radians(longitude), np.radians(latitude)
    on_sphere = np.stack([np.cos(north) * np.cos(east), np.cos(north) * np.sin(east), np.sin(north)], axis=1)
    # the sphere picks generously, the ellipsoid decides
    chord = 2.0 * np.sin(min(0.505 * within_m[1] / MEAN_EARTH_RADIUS_M, np.pi / 2.0))
    one, other = np.sort(cKDTree(on_sphere).query_pairs(chord, output_type="ndarray").astype(np.int64), axis=1).T
    if one.size > _MOST_PAIRS:
        raise InputError(f"{path}: {one.size} pairs within {within_m[1] / 1e3:g} km: must be at most {_MOST_PAIRS}")
    length_m = geodesic(longitude[one], latitude[one], longitude[other], latitude[other])[0]
    kept = np.flatnonzero((length_m >= max(within_m[0], _SHORTEST_M)) & (length_m <= within_m[1]))
    kept = kept[np.lexsort((other[kept], one[kept]))]
    one, other = one[kept], other[kept]
    return Pairs(
        ids=[f"{sites.ids[a]} - {sites.ids[b]}" for a, b in zip(one.tolist(), other.tolist(), strict=True)],
        longitude_a=longitude[one],
        latitude_a=latitude[one],
        longitude_b=longitude[other],
        latitude_b=latitude[other],
        antenna_a_m=antenna_m[one],
        antenna_b_m=antenna_m[other],
        frequency_ghz=np.full(one.size, np.nan),
        problem=[""] * one.size,
    )
