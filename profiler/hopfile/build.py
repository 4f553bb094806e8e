"""From the tables of a hop file to `profiler.models.Hop`."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any

from profiler.hopfile.check import check, given
from profiler.hopfile.options import (
    build_air,
    build_availability,
    build_confidence,
    build_heights,
    build_radio,
    pick_k,
)
from profiler.hopfile.placed import build_obstacle, build_site
from profiler.hopfile.presets import PRESETS, expand_preset
from profiler.hopfile.schema import CoverTable, DiffractionTable, HopTable, RulesTable, RuleTable, TerrainTable
from profiler.hopfile.spot import MISSING, Spot
from profiler.models import CoverChoice, Hop, Rule, Site, TerrainChoice
from profiler.path import geodesic
from profiler.units import K_MEDIAN

__all__ = ["build_hop"]

Raw = Mapping[str, Any]
Notes = tuple[str, ...]


def build_hop(raw: Raw, where: str, base_dir: Path, *, source_sha256: str | None = None) -> Hop:
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

    Returns
    -------
    Hop

    Raises
    ------
    InputError
        For the first thing that is wrong, in one line.
    """
    spot = Spot(where)
    top = check(HopTable, raw, spot)
    sites = build_site(top.site_a, spot.into("site_a"), "A"), build_site(top.site_b, spot.into("site_b"), "B")
    _check_sites(*sites, spot)
    rules, median_k, rule_notes = _rules(top.rules, spot, sites)
    terrain = _terrain(top.terrain, spot.into("terrain"), base_dir)
    cover, cover_notes = _cover(top.cover, spot.into("cover"), base_dir, sites)
    notes = (*_datum_notes(top.site_a, top.site_b), *rule_notes, *cover_notes)
    values = _diffraction(top.diffraction, spot.into("diffraction"))
    if top.polarization is None:
        notes += ("polarization: none is given, vertical is taken",)
    else:
        values["polarization"] = top.polarization
    builders: dict[str, Callable[[Raw, Spot], object]] = {
        "radio": build_radio,
        "air": build_air,
        "availability": build_availability,
        "heights": build_heights,
    }
    values |= {name: build(raw[name], spot.into(name)) for name, build in builders.items() if name in raw}
    if top.confidence is not None:
        values["confidence"] = build_confidence(top.confidence, spot.into("confidence"), values.get("availability"))
    with spot.blame():
        return Hop(
            name=top.name or f"{sites[0].name} to {sites[1].name}",
            site_a=sites[0],
            site_b=sites[1],
            frequency_hz=top.frequency_hz,
            rules=rules,
            terrain=terrain,
            median_k=median_k,
            cover=cover,
            assumptions=notes,
            source=where,
            source_sha256=source_sha256,
            **values,
        )


def _check_sites(site_a: Site, site_b: Site, spot: Spot) -> None:
    """Two sites at one place are a slip; the longer slips are for `profiler.path.trace` to find."""
    turn = (site_a.longitude - site_b.longitude + 180.0) % 360.0 - 180.0
    if abs(turn) < 1e-5 and abs(site_a.latitude - site_b.latitude) < 1e-5:
        place = f"{site_b.latitude:.6f}, {site_b.longitude:.6f}"
        raise spot.error("site_b", place, "another place than site_a", "the two positions are within a metre")
    if site_a.name == site_b.name:
        raise spot.error("site_b.name", site_b.name, "another name than that of site_a")


def _datum_notes(*sites: Raw) -> Notes:
    """Say that WGS 84 was taken where a file names no datum."""
    silent = [name for name, site in zip("AB", sites, strict=True) if not {"datum", "epsg"} & site.keys()]
    return (f"positions: no datum is given for {' and '.join(silent)}, WGS 84 is taken",) if silent else ()


def _terrain(raw: Raw, spot: Spot, base_dir: Path) -> TerrainChoice:
    values = given(check(TerrainTable, raw, spot))
    values["paths"] = tuple(
        _path(path, f"paths[{index}]", spot, base_dir) for index, path in enumerate(values["paths"])
    )
    with spot.blame():
        return TerrainChoice(**values)


def _path(text: str, name: str, spot: Spot, base_dir: Path) -> Path:
    """Path of a raster or a folder, relative to the file's folder; it must be there."""
    path = base_dir / text
    if not path.exists():
        remedy = "paths start from the folder of the hop file"
        raise spot.error(name, text, "a raster or a folder of rasters that is there", remedy)
    return path


def _cover(raw: Raw | None, spot: Spot, base_dir: Path, sites: tuple[Site, Site]) -> tuple[CoverChoice, Notes]:
    if raw is None:
        return CoverChoice(), ()
    table = check(CoverTable, raw, spot)
    obstacles = [
        build_obstacle(obstacle, spot.into(f"obstacle[{index}]"), sites)
        for index, obstacle in enumerate(table.obstacle or [])
    ]
    canopy = (_path(path, f"canopy[{index}]", spot, base_dir) for index, path in enumerate(table.canopy or []))
    landcover = None
    if table.landcover is not None:
        landcover = _path(table.landcover, "landcover", spot, base_dir)
    if (landcover is None) != (table.class_heights_m is None):
        name, other = ("class_heights_m", "landcover") if landcover else ("landcover", "class_heights_m")
        raise spot.error(name, MISSING, f"given together with {other}", "the heights of its classes, like 41 = 18")
    choice = CoverChoice(
        canopy=tuple(canopy),
        landcover=landcover,
        class_heights_m=_class_heights(table.class_heights_m or {}, spot.into("class_heights_m")),
        obstacles=tuple(obstacle for obstacle, _ in obstacles),
    )
    return choice, tuple(note for _, notes in obstacles for note in notes)


def _class_heights(heights: Mapping[str, float], spot: Spot) -> tuple[tuple[int, float], ...]:
    """Heights by class number, which TOML can only write as a text key."""
    for name, height in heights.items():
        if not name.isdecimal():
            raise spot.error(name, height, "keyed by the whole number of a land-cover class, like 41 = 18")
    return tuple(sorted((int(name), height) for name, height in heights.items()))


def _diffraction(raw: Raw | None, spot: Spot) -> dict[str, Any]:
    if raw is None:
        return {}
    values = given(check(DiffractionTable, raw, spot))
    if "method" in values:
        values["diffraction_method"] = values.pop("method")
    return values


def _rules(raw: Raw | None, spot: Spot, sites: tuple[Site, Site]) -> tuple[tuple[Rule, ...], float | None, Notes]:
    """Rules of the preset and the file's own, the median k if given, and what was taken."""
    names = ", ".join(f"{name} ({preset.label})" for name, preset in PRESETS.items())
    wanted = ("given: rules.preset, or [[rules.rule]] tables with k and fresnel_fraction", f"presets: {names}")
    if raw is None:
        raise spot.error("rules", MISSING, *wanted)
    spot = spot.into("rules")
    table = check(RulesTable, raw, spot)
    if table.preset is None and not table.rule:
        raise spot.error("preset", MISSING, *wanted)
    median_k = pick_k(table, spot, "median_k", "median_gradient_n_km")
    low_k = pick_k(table, spot, "low_k", "low_gradient_n_km")
    rules: tuple[Rule, ...] = ()
    notes: Notes = ()
    if table.preset is not None:
        with spot.blame():
            rules = expand_preset(table.preset, median_k=median_k or K_MEDIAN, low_k=low_k)
        notes += _preset_notes(table.preset, rules, sites)
    elif low_k is not None:
        raise spot.error("low_k", low_k, "left out without a preset that uses it")
    own = tuple(_rule(rule, spot.into(f"rule[{index}]")) for index, rule in enumerate(table.rule or []))
    return rules + own, median_k, notes


def _preset_notes(name: str, rules: tuple[Rule, ...], sites: tuple[Site, Site]) -> Notes:
    """Spell out a preset: its rules, its source, and whether the path is of the length it is for."""
    preset = PRESETS[name]
    spelled = "; ".join(
        f"{rule.fresnel_fraction:g} F1" + (f" + {rule.margin_m:g} m" if rule.margin_m else "") + f" at k = {rule.k:.4g}"
        for rule in rules
    )
    notes: Notes = (f"rules of preset {name} ({preset.label}): {spelled}; {preset.source}",)
    if preset.shortest_m:
        a, b = sites
        length_km = float(geodesic(a.longitude, a.latitude, b.longitude, b.latitude)[0]) / 1e3
        if length_km < preset.shortest_m / 1e3:
            notes += (
                f"preset {name} is for paths over {preset.shortest_m / 1e3:g} km; this one has {length_km:.1f} km",
            )
    return notes


def _rule(raw: Raw, spot: Spot) -> Rule:
    table = check(RuleTable, raw, spot)
    k = pick_k(table, spot, "k", "gradient_n_km")
    if k is None:
        raise spot.error("k", MISSING, "given, or gradient_n_km", "the median atmosphere has k = 1.333")
    with spot.blame():
        return Rule(
            k=k,
            fresnel_fraction=table.fresnel_fraction,
            margin_m=table.margin_m or 0.0,
            label=table.label or "",
        )
