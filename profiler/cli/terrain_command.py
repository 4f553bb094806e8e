"""`hopwright terrain`: what files and folders of rasters hold, and whether a hop lies on them."""

from __future__ import annotations

import math
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

import click

from profiler.cli.hop_options import named
from profiler.cli.output import check_targets, json_text, put
from profiler.errors import HopwrightError
from profiler.printable import printable

if TYPE_CHECKING:
    from rich.console import Console

    from profiler.models import Hop
    from profiler.terrain import Bounds, FolderSurvey, RasterSurvey

__all__ = ["command"]

_MOST_LISTED = 12


@click.command("terrain")
@click.argument("paths", nargs=-1, required=True, type=click.Path(path_type=Path), metavar="PATH...")
@click.option(
    "--hop",
    "hop_file",
    type=click.Path(path_type=Path),
    metavar="HOP.toml",
    help="Say whether this hop lies on it, by the datum, unit and method of its [terrain].",
)
@click.option("--metadata-only", is_flag=True, help="Do not read the cells: no voids and heights, but fast.")
@click.option("--all", "list_all", is_flag=True, help=f"List every raster, though more than {_MOST_LISTED}.")
@click.option("--json", "json_to", metavar="FILE", help="Write what was found as JSON; - for standard output.")
@click.option("--no-color", is_flag=True, help="Print without color.")
def command(
    paths: tuple[Path, ...],
    hop_file: Path | None,
    metadata_only: bool,
    list_all: bool,
    json_to: str | None,
    no_color: bool,
) -> int:
    """Show what rasters hold, and whether a hop lies on them.

    Exit code 1: a raster would stop a study, or the hop cannot be studied on them.
    """
    from profiler.document import plain
    from profiler.hopfile import load_hop
    from profiler.terrain import as_reading, survey

    hop = None if hop_file is None else load_hop(hop_file)
    check_targets(json_to, reads=(paths, hop))
    choice = None if hop is None else hop.terrain
    datum, unit = (None, None) if choice is None else (choice.vertical_datum, choice.height_unit)
    with named("command line" if hop is None else hop.source):
        as_reading(datum, unit)  # what a hop file says must be right before it is used on rasters named elsewhere
    found = survey(
        paths,
        read_heights=not metadata_only,
        vertical_datum=datum,
        height_unit=unit,
        allow_network=choice is not None and choice.allow_network,
    )
    usable = list(dict.fromkeys(raster.info.path for raster in found.rasters))
    share, stop = (None, None) if hop is None or not usable else _hop_on(hop, usable)
    if json_to is not None:
        document = {"hop_inside_share": share, "hop_stops": stop}
        put(json_to, json_text({"schema": "hopwright-terrain/1", **plain(found), **document}))
    if json_to != "-":
        _show(found, hop, share, stop, list_all=list_all, color=not no_color)
    return 0 if found.rasters and not found.problems and stop is None else 1


def _hop_on(hop: Hop, paths: Sequence[Path]) -> tuple[float | None, str | None]:
    """Share of the hop's path that has ground, and what would stop a study of it on this terrain: the study says so."""
    from dataclasses import replace

    import numpy as np

    from profiler.path import geodesic, trace
    from profiler.study import open_hop_terrain, read_ground
    from profiler.terrain import require_inside

    here = replace(hop, terrain=replace(hop.terrain, paths=tuple(paths)))
    share = None
    line = trace(*hop.ends, spacing_m=float(geodesic(*hop.ends)[0]) / 1000.0)
    try:
        with open_hop_terrain(here) as terrain:
            ground_m = terrain.sample(line.longitude, line.latitude, allow_mixed_datums=True).ground_m
            share = float(1.0 - np.isnan(ground_m).mean())
            for site in (hop.site_a, hop.site_b):
                require_inside(terrain, site.name, site.longitude, site.latitude)
            read_ground(here, terrain)
    except HopwrightError as error:
        return share, str(error)
    return share, None


def _show(
    found: FolderSurvey, hop: Hop | None, share: float | None, stop: str | None, *, list_all: bool, color: bool
) -> None:
    """Print each raster or each kind, then the whole, what cannot be used, and the hop."""
    from profiler.cli.screen import console, say, show_notes
    from profiler.study import gathered

    screen = console(color=color)
    if list_all or len(found.rasters) <= _MOST_LISTED:
        groups = [(raster.info.name, [raster]) for raster in found.rasters]
    else:
        groups = _kinds(found.rasters)
    for title, rasters in groups:
        _show_group(screen, title, rasters)
    _show_whole(screen, found)
    left_out = gathered(((each.name, each.reason) for each in found.skipped), "files")
    show_notes(screen, "Left out", left_out)
    show_notes(screen, "Cannot be used: a study on this terrain stops", found.problems, "red")
    if hop is None or not found.rasters:
        return
    ground = "" if share is None else f"{share:.1%} of the path has ground"
    if stop is None:
        filled = "" if share == 1.0 else ", the rest is interpolated, as the hop file allows"
        say(screen, f"\n{printable(hop.source)}: {ground}{filled}", "bold")
    else:
        say(
            screen, f"\n{printable(hop.source)}: cannot be studied on this terrain{ground and ': '}{ground}", "bold red"
        )
        say(screen, stop, "red")


def _kinds(rasters: Sequence[RasterSurvey]) -> list[tuple[str, list[RasterSurvey]]]:
    """Group rasters that are alike and lie in one folder or archive, with a title for each group."""
    groups: dict[tuple[Path, str, str, str | None, str, int], list[RasterSurvey]] = {}
    for raster in rasters:
        info = raster.info
        place = info.path if info.member else info.path.parent
        size = round(math.log2(info.cell_y_m))  # cells of one kind in degrees differ a little on the ground
        groups.setdefault((place, info.driver, info.crs, info.vertical_datum, info.unit, size), []).append(raster)
    return [
        (f"{place}: {len(group)} rasters ({driver})" if len(group) > 1 else group[0].info.name, group)
        for (place, driver, *_), group in groups.items()
    ]


def _show_group(screen: Console, title: str, rasters: Sequence[RasterSurvey]) -> None:
    """Print what one raster, or several that are alike, declare and hold, and the notes about them."""
    from profiler.cli.screen import say
    from profiler.study import gathered
    from profiler.terrain import bounds_around

    infos = [raster.info for raster in rasters]
    first = infos[0]
    count = f"{first.width} x {first.height} cells" if len(infos) == 1 else "cells"
    size = f"{_span([info.cell_x_m for info in infos])} x {_span([info.cell_y_m for info in infos])} m"
    say(screen, title, "bold", hang=2)
    say(screen, f"  {count} of {size}, {first.crs}, vertical datum {first.vertical_datum or 'not stated'}", hang=2)
    say(screen, f"  {_edges(bounds_around([info.bounds for info in infos]))}{_held(rasters)}", hang=2)
    common = [note for note in rasters[0].notes if all(note in raster.notes for raster in rasters)]
    others = ((raster.info.name, note) for raster in rasters for note in raster.notes if note not in common)
    for note in (*common, *gathered(others)):
        say(screen, f"  - {note}", hang=4)


def _show_whole(screen: Console, found: FolderSurvey) -> None:
    """Print what all rasters make together, and whether their heights count from one datum."""
    from profiler.cli.screen import say
    from profiler.terrain import datum_key

    if len(found.rasters) > 1 and found.bounds is not None:
        say(
            screen,
            f"\n{len(found.rasters)} rasters, {found.size_bytes / 1e6:.1f} MB: {_edges(found.bounds)}, of which"
            f" {found.covered_share:.0%} is covered; cells"
            f" {_span([found.finest_cell_m or 0.0, found.coarsest_cell_m or 0.0])} m{_held(found.rasters)}",
        )
    datums = {datum_key(datum): datum for datum in found.vertical_datums if datum is not None}
    silent = sum(raster.info.vertical_datum is None for raster in found.rasters)
    if len(datums) > 1 or (datums and silent):
        kind = "MIXED" if len(datums) > 1 else "in part not stated"
        unstated = [f"{silent} not stated"] if silent else []
        say(screen, f"Vertical datums {kind}: {', '.join([*datums.values(), *unstated])}", "yellow")
    if len(datums) > 1:
        say(screen, "A study stops where they meet on its path, unless terrain.allow_mixed_datums is true.", "yellow")


def _held(rasters: Sequence[RasterSurvey]) -> str:
    """Say what the cells hold, if they were read."""
    read = [(raster.info.width * raster.info.height, raster.void_share) for raster in rasters]
    known = [(cells, share) for cells, share in read if share is not None]
    if not known:
        return ""
    void = sum(cells * share for cells, share in known) / sum(cells for cells, _ in known)
    lows = [raster.min_m for raster in rasters if raster.min_m is not None]
    highs = [raster.max_m for raster in rasters if raster.max_m is not None]
    if not lows or not highs:
        return "; every cell is void"
    voids = "no voids" if void == 0.0 else f"voids {void:.2%}" if void >= 5e-5 else "voids under 0.01%"
    return f"; heights {min(lows):.0f} to {max(highs):.0f} m, {voids}"


def _edges(bounds: Bounds) -> str:
    return f"longitude {bounds.west:.3f} to {bounds.east:.3f}, latitude {bounds.south:.3f} to {bounds.north:.3f}"


def _span(values: Sequence[float]) -> str:
    """Write one value, or from the least to the greatest where they differ as written."""
    low, high = f"{min(values):.1f}", f"{max(values):.1f}"
    return low if low == high else f"{low} to {high}"
