"""`hopwright terrain`: what a file or folder of rasters holds, and whether a hop lies inside."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import click

from profiler.cli.output import check_targets, console, json_text, put

if TYPE_CHECKING:
    from profiler.terrain import FolderSurvey

__all__ = ["command"]


@click.command("terrain")
@click.argument("paths", nargs=-1, required=True, type=click.Path(path_type=Path), metavar="PATH...")
@click.option(
    "--hop", "hop_file", type=click.Path(path_type=Path), metavar="HOP.toml", help="Say whether this hop lies inside."
)
@click.option("--metadata-only", is_flag=True, help="Do not read the cells: no voids and heights, but fast.")
@click.option("--json", "json_to", metavar="FILE", help="Write what was found as JSON; - for standard output.")
@click.option("--no-color", is_flag=True, help="Print without color.")
def command(
    paths: tuple[Path, ...], hop_file: Path | None, metadata_only: bool, json_to: str | None, no_color: bool
) -> int:
    """Show what rasters hold, and whether a hop lies on them.

    Exit code 1: the hop does not lie on them.
    """
    from profiler.study import plain
    from profiler.terrain import survey

    check_targets(json_to, hop_file=hop_file)
    found = survey(paths, read_heights=not metadata_only)
    shares = None if hop_file is None else _hop_inside(hop_file, paths)
    if json_to is not None:
        document = {"schema": "hopwright-terrain/1", **plain(found), "hop_inside_share": shares}
        put(json_to, json_text(document))
    if json_to != "-":
        _show(found, color=not no_color)
        if shares is not None:
            click.echo(f"{hop_file}: {shares:.1%} of the path has ground" + ("" if shares == 1.0 else ": NOT inside"))
    return 0 if shares in (None, 1.0) and found.rasters else 1


def _hop_inside(hop_file: Path, paths: tuple[Path, ...]) -> float:
    """Share of the hop's path on which the terrain has ground."""
    import numpy as np

    from profiler.hopfile import load_hop
    from profiler.path import geodesic, trace
    from profiler.terrain import open_terrain

    hop = load_hop(hop_file)
    line = trace(*hop.ends, spacing_m=float(geodesic(*hop.ends)[0]) / 1000.0)
    with open_terrain(paths, allow_mixed_datums=True) as terrain:
        ground_m = terrain.sample(line.longitude, line.latitude).ground_m
    return float(1.0 - np.isnan(ground_m).mean())


def _show(found: FolderSurvey, *, color: bool) -> None:
    """Print a row for each raster, then the whole, then what cannot be used."""
    from profiler.cli.show import compact_table, show_notes

    screen = console(color=color)
    table = compact_table("raster", "cells", "cell m", "west, south, east, north", "CRS", "vertical datum", "heights m",
                          "voids")  # fmt: skip
    for raster in found.rasters:
        info = raster.info
        heights = "-" if raster.min_m is None or raster.max_m is None else f"{raster.min_m:.0f} to {raster.max_m:.0f}"
        table.add_row(
            info.path.name if not info.member else f"{info.path.name}/{info.member}",
            f"{info.width} x {info.height}",
            f"{info.cell_x_m:.1f} x {info.cell_y_m:.1f}",
            ", ".join(f"{edge:.3f}" for edge in info.bounds),
            info.crs,
            info.vertical_datum or "not stated",
            heights,
            "-" if raster.void_share is None else f"{raster.void_share:.2%}",
        )
    screen.print(table)
    if found.bounds is not None and found.covered_share is not None:
        screen.print(
            f"{len(found.rasters)} rasters, {found.size_bytes / 1e6:.1f} MB; together"
            f" {', '.join(f'{edge:.3f}' for edge in found.bounds)}, of which {found.covered_share:.0%} is covered;"
            f" cells {found.finest_cell_m:.1f} to {found.coarsest_cell_m:.1f} m",
            markup=False,
        )
    notes = {note: None for raster in found.rasters for note in raster.info.notes}
    show_notes(screen, "Noted", tuple(notes))
    show_notes(screen, "Left out: not heights", tuple(f"{each.name}: {each.reason}" for each in found.skipped))
    show_notes(screen, "Cannot be used", found.problems, "red")
