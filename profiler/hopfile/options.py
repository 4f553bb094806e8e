"""The parts of a hop file that say more than the path: radio, air, availability, antenna heights, confidence."""

from __future__ import annotations

from collections.abc import Mapping
from itertools import pairwise
from typing import Any

from profiler.hopfile.check import check, given
from profiler.hopfile.schema import (
    AirTable,
    AvailabilityTable,
    ConfidenceTable,
    DiversityTable,
    HeightsTable,
    ModeTable,
    ObjectiveTable,
    RadioTable,
    SignatureTable,
    Table,
    TerminalTable,
    TowerTable,
)
from profiler.hopfile.spot import MISSING, Spot
from profiler.models import (
    AirChoice,
    AvailabilityChoice,
    ConfidenceChoice,
    DiversityChoice,
    HeightsChoice,
    Objective,
    Radio,
    RadioMode,
    Signature,
    Terminal,
    TowerChoice,
)
from profiler.terrain_error import TERRAIN_ERRORS, sigma_from_le90, sigma_from_rmse
from profiler.units import k_from_gradient

__all__ = ["build_air", "build_availability", "build_confidence", "build_heights", "build_radio", "pick_k"]

Raw = Mapping[str, Any]
_ZERO_CELSIUS_K = 273.15


def pick_k(table: Table, spot: Spot, k_name: str, gradient_name: str) -> float | None:
    """Take k from a table that may give it directly or by the refractivity gradient, but not both."""
    k, gradient = getattr(table, k_name), getattr(table, gradient_name)
    if k is not None and gradient is not None:
        raise spot.error(gradient_name, gradient, f"left out beside {k_name} = {k:g}", "give one")
    return float(k_from_gradient(gradient)) if gradient is not None else k


def _kelvin(values: dict[str, Any], name: str, spot: Spot) -> dict[str, Any]:
    """Turn a temperature given in degrees Celsius into kelvin; both is an error."""
    celsius = values.pop(f"{name}_c", None)
    if celsius is None:
        return values
    if f"{name}_k" in values:
        raise spot.error(f"{name}_c", celsius, f"left out beside {name}_k = {values[f'{name}_k']:g}", "give one")
    return values | {f"{name}_k": celsius + _ZERO_CELSIUS_K}


def build_radio(raw: Raw, spot: Spot) -> Radio:
    """Build both terminals, the modes and the named losses of ``[radio]``."""
    table = check(RadioTable, raw, spot)
    modes = tuple(_mode(mode, spot.into(f"mode[{index}]")) for index, mode in enumerate(table.mode or []))
    names = [mode.name for mode in modes]
    for index, name in enumerate(names):
        if name in names[:index]:
            raise spot.into(f"mode[{index}]").error(
                "name", name, f"another name than that of {spot.at}.mode[{names.index(name)}]"
            )
    terminal_a, terminal_b = _terminal(table.a, spot.into("a")), _terminal(table.b, spot.into("b"))
    with spot.blame():
        return Radio(terminal_a, terminal_b, modes, tuple((table.losses or {}).items()))


def _terminal(raw: Raw, spot: Spot) -> Terminal:
    values = given(check(TerminalTable, raw, spot))
    if "gain_dbi" not in values:
        for name in ("diameter_m", "efficiency"):
            if name not in values:
                raise spot.error("gain_dbi", MISSING, "given, or diameter_m (or diameter_ft) with efficiency")
    with spot.blame():
        return Terminal(**values)


def _mode(raw: Raw, spot: Spot) -> RadioMode:
    values = given(check(ModeTable, raw, spot))
    if "signature" in values:
        inside = spot.into("signature")
        signature = given(check(SignatureTable, values["signature"], inside))
        with inside.blame():
            values["signature"] = Signature(**signature)
    if "objective" in values:
        values["objective"] = _objective(values["objective"], spot.into("objective"))
    with spot.blame():
        return RadioMode(**values)


def _objective(raw: Raw, spot: Spot) -> Objective:
    values = given(check(ObjectiveTable, raw, spot))
    with spot.blame():
        return Objective(**values)


def build_air(raw: Raw, spot: Spot) -> AirChoice:
    """Build ``[air]``."""
    return AirChoice(**_kelvin(given(check(AirTable, raw, spot)), "temperature", spot))


def build_availability(raw: Raw, spot: Spot) -> AvailabilityChoice:
    """Build ``[availability]`` with its objective and diversity."""
    values = _kelvin(given(check(AvailabilityTable, raw, spot)), "annual_temperature", spot)
    if "objective" in values:
        values["objective"] = _objective(values["objective"], spot.into("objective"))
    if "diversity" in values:
        inside = spot.into("diversity")
        diversity = given(check(DiversityTable, values["diversity"], inside))
        with inside.blame():
            values["diversity"] = DiversityChoice(**diversity)
    if "k_percentiles" in values:
        values["k_percentiles"] = _percentiles(values["k_percentiles"], spot)
    with spot.blame():
        return AvailabilityChoice(**values)


def _percentiles(pairs: list[list[float]], spot: Spot) -> tuple[tuple[float, float], ...]:
    """Check pairs of percent of the time and the k not exceeded in it."""
    like = "pairs of percent and k, both ascending, like [[0.1, 0.6], [50, 1.33], [99.9, 3.0]]"
    whole = bool(pairs) and all(len(pair) == 2 and 0 < pair[0] < 100 and pair[1] > 0 for pair in pairs)
    steps = pairwise(pairs)
    if not (whole and all(low[0] < high[0] and low[1] <= high[1] for low, high in steps)):
        raise spot.error(
            "k_percentiles", pairs, like, "percent is of the time that k is not exceeded, above 0, below 100"
        )
    return tuple((percent, k) for percent, k in pairs)


def build_heights(raw: Raw, spot: Spot) -> HeightsChoice:
    """Build ``[heights]`` with what each tower allows."""
    table = check(HeightsTable, raw, spot)
    values = given(table)
    loss_k = pick_k(table, spot, "loss_k", "loss_gradient_n_km")
    values.pop("loss_gradient_n_km", None)
    if loss_k is not None:
        values["loss_k"] = loss_k
    for end in ("a", "b"):
        if end in values:
            inside = spot.into(end)
            tower = given(check(TowerTable, values.pop(end), inside))
            with inside.blame():
                values[f"tower_{end}"] = TowerChoice(**tower | {"taken_m": tuple(tower.get("taken_m", ()))})
    with spot.blame():
        return HeightsChoice(**values)


def build_confidence(raw: Raw, spot: Spot, availability: AvailabilityChoice | None) -> ConfidenceChoice:
    """Build ``[confidence]``: the terrain's error by kind of source, sigma, RMSE or LE90, and how it is drawn."""
    table = check(ConfidenceTable, raw, spot)
    sigma_m, source = _terrain_sigma(table, spot)
    values = given(table)
    for name in ("terrain_kind", "terrain_rmse_m", "terrain_le90_m"):
        values.pop(name, None)
    values |= {"terrain_sigma_m": sigma_m, "terrain_source": source}
    if table.terrain_kind is not None:
        values["terrain_offset_sigma_m"] = TERRAIN_ERRORS[table.terrain_kind].offset_sigma_m
    elif table.terrain_offset_sigma_m is None:
        values["terrain_source"] += "; all of it local, as no terrain_offset_sigma_m is given: the cautious way"
    if table.minimum_chance_percent is not None:
        values["minimum_chance"] = values.pop("minimum_chance_percent") / 100.0
    if table.correlation_m is None:
        if table.terrain_kind is None:
            remedy = "0 is error without correlation, inf one error for the whole path; common models: 30 to 300 m"
            raise spot.error("correlation_m", MISSING, "given beside an error of your own, 0 m or more", remedy)
        kind = TERRAIN_ERRORS[table.terrain_kind]
        values["correlation_m"] = kind.correlation_m
        values["terrain_source"] += f"; correlated over {kind.correlation_m:g} m: {kind.correlation_source}"
    percentiles = () if availability is None else availability.k_percentiles
    by_maps = availability is not None and availability.use_maps and not percentiles
    if table.vary_k and len(percentiles) < 2 and not by_maps:
        remedy = "give two or more availability.k_percentiles, or availability.use_maps = true"
        raise spot.error("vary_k", True, "false where nothing says how k varies", remedy)
    with spot.blame():
        return ConfidenceChoice(**values)


def _terrain_sigma(table: ConfidenceTable, spot: Spot) -> tuple[float, str]:
    """Sigma of the terrain's error and where it comes from, from the one way in which it is given."""
    ways = ("terrain_kind", "terrain_sigma_m", "terrain_rmse_m", "terrain_le90_m")
    used = [name for name in ways if getattr(table, name) is not None]
    kinds = ", ".join(TERRAIN_ERRORS)
    if len(used) != 1:
        name = used[1] if used else "terrain_kind"
        value = getattr(table, used[1]) if used else MISSING
        raise spot.error(name, value, f"the one statement of the terrain's error: one of {', '.join(ways)}")
    if table.terrain_kind is not None:
        if table.terrain_kind not in TERRAIN_ERRORS:
            raise spot.error("terrain_kind", table.terrain_kind, f"one of {kinds}", "or give terrain_rmse_m")
        for name in ("terrain_source", "terrain_offset_sigma_m"):
            if (value := getattr(table, name)) is not None:
                raise spot.error(name, value, "left out beside terrain_kind, which has its own")
        kind = TERRAIN_ERRORS[table.terrain_kind]
        return kind.sigma_m, kind.source
    stated = table.terrain_source or "hop file"
    if table.terrain_rmse_m is not None:
        return sigma_from_rmse(table.terrain_rmse_m), f"RMSE {table.terrain_rmse_m:g} m ({stated})"
    if table.terrain_le90_m is not None:
        return sigma_from_le90(table.terrain_le90_m), f"LE90 {table.terrain_le90_m:g} m / 1.645 ({stated})"
    assert table.terrain_sigma_m is not None
    return table.terrain_sigma_m, f"sigma {table.terrain_sigma_m:g} m ({stated})"
