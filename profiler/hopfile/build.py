"""From the tables of a hop file to `profiler.models.Hop`: what does not map field by field."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from profiler.hopfile.placed import build_obstacle, build_site
from profiler.hopfile.presets import PRESETS, expand_preset
from profiler.hopfile.spot import Reading, Spot
from profiler.hopfile.table import Table, build
from profiler.models import ConfidenceChoice, Hop, Obstacle, Override, Rule, Site, TowerChoice
from profiler.models.rules import RulesTable
from profiler.models.stated import ways
from profiler.path import geodesic
from profiler.remarks import k_text
from profiler.terrain_error import TERRAIN_ERRORS, sigma_from_le90, sigma_from_rmse, split_le90
from profiler.units import K_MEDIAN

__all__ = ["build_hop"]


def build_hop(
    raw: Mapping[str, Any],
    where: str,
    base_dir: Path,
    *,
    source_sha256: str | None = None,
    overrides: tuple[Override, ...] = (),
    notes: Sequence[str] = (),
) -> Hop:
    """Build a hop from the tables of a file.

    Parameters
    ----------
    raw
        The file as TOML gives it.
    where
        What messages call the file, and the hop its source.
    base_dir
        Folder that paths in the file start from.
    source_sha256
        Hash of the file, for the provenance.
    overrides
        What was set beside the file, and is in the tables already.
    notes
        What was assumed before.

    Returns
    -------
    Hop

    Raises
    ------
    InputError
        For the first thing that is wrong, in one line.
    """

    def whole(table: Table) -> Hop:
        return _hop(table, source_sha256, overrides)

    special = {
        Hop: whole,
        Site: build_site,
        Obstacle: build_obstacle,
        RulesTable: _rules,
        ConfidenceChoice: _confidence,
    }
    hop: Hop = build(Hop, raw, Spot(Reading(where, base_dir, notes=list(notes))), special)
    return hop


def _hop(table: Table, source_sha256: str | None, overrides: tuple[Override, ...]) -> Hop:
    values, reading = dict(table.values), table.spot.reading
    site_a, site_b = values["site_a"], values["site_b"]
    _check_sites(site_a, site_b, table)
    values["rules"], values["median_k"] = values["rules"]
    values.setdefault("name", f"{site_a.name} to {site_b.name}")
    availability, confidence = values.get("availability"), values.get("confidence")
    percentiles = () if availability is None else availability.k_percentiles
    by_maps = availability is not None and availability.use_maps and not percentiles
    if confidence is not None and confidence.vary_k and len(percentiles) < 2 and not by_maps:
        remedy = "give two or more availability.k_percentiles, or availability.use_maps = true"
        raise table.spot.error("confidence.vary_k", True, "false where nothing says how k varies", remedy)
    silent = [name[-1].upper() for name in ("site_a", "site_b") if not {"datum", "epsg"} & table.raw[name].keys()]
    if silent:
        reading.notes.insert(0, f"positions: no datum is given for {' and '.join(silent)}, WGS 84 is taken")
    if "polarization" not in values:
        reading.notes.append("polarization: none is given, vertical is taken")
    reading.notes += _cost_notes(table.raw.get("heights", {}))
    if (back_hz := values.pop("return_frequency_hz", None)) is not None:
        values["two_frequencies_hz"] = (values["frequency_hz"], back_hz)
        values["frequency_hz"] = min(values["two_frequencies_hz"])
        reading.notes.append(
            "two frequencies: clearance and diffraction at the k of the rules are held at the lower, the outage at the"
            " higher, the budget at each"
        )
    reading.notes += [_set_beside(each) for each in overrides]
    values |= {"assumptions": tuple(reading.notes), "overrides": overrides}
    return Hop(**values, source=reading.where, source_sha256=source_sha256)


def _set_beside(override: Override) -> str:
    """Say what was set in place of what the file says."""
    before = f", in place of {override.instead_of}" if override.instead_of else ", which the file leaves out"
    return f"set beside the hop file: {override.key} = {override.value}{before}"


def _cost_notes(heights: Mapping[str, Any]) -> list[str]:
    """Say what the costs of two towers have in common, where they are not both given per metre."""
    stated = {end: [key for key in heights.get(end, {}) if key.startswith("cost_per_")] for end in ("a", "b")}
    notes = []
    for end, other in (("a", "b"), ("b", "a")):
        for key in stated[end]:
            way = ways(TowerChoice)[key][1]
            if not way.plain:
                unit, cost = key.removeprefix("cost_per_"), heights[end][key]
                notes.append(f"cost at {end.upper()}: {cost:g} per {unit} is {way.into(cost):.4g} per m")
        if stated[other] and not stated[end]:
            notes.append(f"cost at {end.upper()}: none is given, 1 per m is taken")
    return notes


def _check_sites(site_a: Site, site_b: Site, table: Table) -> None:
    """Two sites at one place are a slip; the longer slips are for `profiler.path.trace` to find."""
    turn = (site_a.longitude - site_b.longitude + 180.0) % 360.0 - 180.0
    if abs(turn) < 1e-5 and abs(site_a.latitude - site_b.latitude) < 1e-5:
        place = f"{site_b.latitude:.6f}, {site_b.longitude:.6f}"
        raise table.spot.error("site_b", place, "another place than site_a", "the two positions are within a metre")
    if site_a.name == site_b.name:
        raise table.spot.error("site_b.name", site_b.name, "another name than that of site_a")


def _rules(table: Table) -> tuple[tuple[Rule, ...], float | None]:
    """Rules of the preset and the file's own, and the median k if given."""
    preset, median_k, low_k = (table.values.get(name) for name in ("preset", "median_k", "low_k"))
    rules: tuple[Rule, ...] = ()
    if preset is not None:
        rules = expand_preset(preset, median_k=median_k or K_MEDIAN, low_k=low_k)
        table.spot.reading.notes += _preset_notes(preset, rules, table.spot.reading.sites)
    elif low_k is not None:
        raise table.error("low_k", "left out without a preset that uses it")
    return rules + table.values.get("rule", ()), median_k


def _preset_notes(name: str, rules: tuple[Rule, ...], sites: list[Site]) -> list[str]:
    """Spell out a preset: its rules, its source, and whether the path is of the length it is for."""
    preset = PRESETS[name]
    spelled = "; ".join(
        f"{rule.fresnel_fraction:g} F1"
        + (f" + {rule.margin_m:g} m" if rule.margin_m else "")
        + f" at k = {k_text(rule.k)}"
        for rule in rules
    )
    notes = [f"rules of preset {name} ({preset.label}): {spelled}; {preset.source}"]
    if len(sites) < 2:  # the site that is missing is told next
        return notes
    a, b = sites
    length_km = float(geodesic(a.longitude, a.latitude, b.longitude, b.latitude)[0]) / 1e3
    if length_km < preset.shortest_m / 1e3:
        notes.append(f"preset {name} is for paths over {preset.shortest_m / 1e3:g} km; this one has {length_km:.1f} km")
    return notes


def _confidence(table: Table) -> ConfidenceChoice:
    """Take the terrain's error by kind of model, sigma, RMSE or LE90."""
    values = dict(table.values)
    stated = values.pop("terrain_source", "hop file")
    if kind_name := values.pop("terrain_kind", None):
        kind = TERRAIN_ERRORS[kind_name]
        sigma_m, source = kind.sigma_m, kind.source
        values["terrain_offset_sigma_m"] = kind.offset_sigma_m
        if "correlation_m" not in values:
            values["correlation_m"] = kind.correlation_m
            source += f"; correlated over {kind.correlation_m:g} m: {kind.correlation_source}"
    elif (rmse_m := values.pop("terrain_rmse_m", None)) is not None:
        sigma_m, source = sigma_from_rmse(rmse_m), f"RMSE {rmse_m:g} m ({stated})"
    elif (relative_m := values.pop("terrain_relative_le90_m", None)) is not None:
        absolute_m = values.pop("terrain_absolute_le90_m")
        sigma_m, values["terrain_offset_sigma_m"] = split_le90(absolute_m, relative_m)
        source = f"LE90 {absolute_m:g} m absolute, {relative_m:g} m relative ({stated})"
    elif (le90_m := values.pop("terrain_le90_m", None)) is not None:
        sigma_m, source = sigma_from_le90(le90_m), f"LE90 {le90_m:g} m / 1.645 ({stated})"
    else:
        sigma_m = values["terrain_sigma_m"]
        source = f"sigma {sigma_m:g} m ({stated})"
    if "terrain_offset_sigma_m" not in values:
        source += "; all of it local, as no error common to a neighbourhood is given: the cautious way"
    return ConfidenceChoice(**values | {"terrain_sigma_m": sigma_m, "terrain_source": source})
