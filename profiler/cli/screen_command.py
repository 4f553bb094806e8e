"""`hopwright screen`: many pairs of sites with one hop file as their template."""

from __future__ import annotations

import sys
import time
from collections import Counter
from pathlib import Path
from typing import TYPE_CHECKING

import click

from profiler.cli.files import write_all
from profiler.cli.hop_options import read_hop
from profiler.cli.number import NUMBER
from profiler.cli.output import check_targets, tell
from profiler.errors import InputError

if TYPE_CHECKING:
    from profiler.screen.rows import Rows

__all__ = ["command"]

_MOST_REASONS = 8
_EVERY_S = 1.0


@click.command("screen")
@click.argument("pairs_file", type=click.Path(path_type=Path), metavar="PAIRS")
@click.option(
    "--template",
    type=click.Path(path_type=Path),
    required=True,
    metavar="HOP.toml",
    help="Rules, frequency, heights, terrain and all else that the pairs share; its sites are replaced.",
)
@click.option(
    "-o",
    "--output",
    "results",
    type=click.Path(path_type=Path),
    required=True,
    metavar="RESULTS",
    help="Where the rows go: .csv, .parquet, .geojson or .gpkg.",
)
@click.option(
    "--within-km",
    nargs=2,
    type=NUMBER,
    metavar="LEAST GREATEST",
    help="PAIRS is a list of sites: pair every two of them this far apart.",
)
@click.option("--epsg", type=click.IntRange(1), metavar="CODE", help="System of the positions, if not WGS 84 degrees.")
@click.option("--no-beside", is_flag=True, help="Look along the path only, not at the ground beside it; quicker.")
@click.option(
    "--workers", type=click.IntRange(1, 256), default=1, show_default=True, help="Processes to share the work."
)
@click.option("--force", is_flag=True, help="Replace RESULTS if it is there.")
@click.option("-q", "--quiet", is_flag=True, help="No progress and no summary.")
def command(
    pairs_file: Path,
    template: Path,
    results: Path,
    within_km: tuple[float, float] | None,
    epsg: int | None,
    no_beside: bool,
    workers: int,
    force: bool,
    quiet: bool,
) -> int:
    """Screen many pairs of sites.

    PAIRS has the columns id, latitude_a, longitude_a, latitude_b, longitude_b and, if wanted, antenna_a_m,
    antenna_b_m and frequency_ghz; a list of sites id, latitude, longitude and, if wanted, antenna_m. CSV, GeoJSON,
    GeoPackage and Parquet are read.

    Every pair has its row, in the order of PAIRS; status is ok or says why the pair could not be screened. A screening
    that was stopped goes on where it was when the same command is given again.

    Exit code 0: every pair was screened, whether it passes or not; 1: some could not be; 2: the input is wrong.
    """
    from profiler.screen.chunk import Template
    from profiler.screen.pairs import read_pairs
    from profiler.screen.results import check_kind, results_file
    from profiler.screen.run import remove_chunks, screen

    hop = read_hop(template)
    check_targets(results, reads=hop)
    check_kind(results)
    if results.exists() and pairs_file.exists() and results.samefile(pairs_file):
        raise InputError(f"{results}: must not be the table of pairs too; name another file")
    if results.exists() and not force:
        raise InputError(f"{results}: is there already: must be a new file, or give --force to replace it")
    if within_km is not None and not 0.0 <= within_km[0] < within_km[1]:
        raise InputError(f"--within-km = {within_km[0]:g} {within_km[1]:g}: must be two distances, the lesser first")
    within_m = None if within_km is None else (1e3 * within_km[0], 1e3 * within_km[1])
    pairs = read_pairs(pairs_file, epsg=epsg, within_m=within_m)
    if not len(pairs):
        raise InputError(f"{pairs_file}: gives no pair: must hold one or more")
    chunks = results.with_name(f"{results.name}.chunks")
    progress = None if quiet else _Progress()
    rows = screen(Template(hop, beside=not no_beside), pairs, chunks, workers=workers, progress=progress)
    write_all([(results, results_file(pairs, rows, results))])
    remove_chunks(chunks)
    if not quiet:
        _show(rows, results)
    return 0 if all(status == "ok" for status in rows.status) else 1


class _Progress:
    """Tell how far the work is on standard error: in place on a terminal, else a line now and then."""

    def __init__(self) -> None:
        self.started_s, self.told_s, self.at_first = time.monotonic(), -60.0, -1

    def __call__(self, done: int, count: int) -> None:
        now_s, on_terminal = time.monotonic(), sys.stderr.isatty()
        if self.at_first < 0:
            self.at_first = done
            if done:
                tell(f"{done} of {count} pairs were screened before", err=True)
        rate = (done - self.at_first) / max(now_s - self.started_s, 1e-3)
        if rate == 0.0 or (done < count and now_s - self.told_s < (_EVERY_S if on_terminal else 10.0 * _EVERY_S)):
            return
        self.told_s = now_s
        left = "" if done == count else f", {_duration((count - done) / rate)} left"
        line = f"{done} of {count} pairs, {rate:.3g} a second{left}"
        click.echo(f"\r{line:<70}" if on_terminal else line, err=True, nl=not on_terminal or done == count)


def _duration(seconds: float) -> str:
    minutes = round(seconds / 60.0)
    return f"{seconds:.0f} s" if seconds < 100.0 else f"{minutes} min" if minutes < 120 else f"{minutes / 60.0:.1f} h"


def _show(rows: Rows, results: Path) -> None:
    """Print how many pass, fail, are not sure and could not be screened, and why."""
    outcomes = Counter(rows.outcome)
    words = {"passes": "pass", "not_sure": "are not sure", "fails": "fail"}
    told = [f"{outcomes[name]} {verb}" for name, verb in words.items() if outcomes[name] or name != "not_sure"]
    failed = Counter(status for status in rows.status if status != "ok")
    tell(f"{len(rows)} pairs: {', '.join(told)}, {failed.total()} could not be screened.")
    for reason, count in failed.most_common(_MOST_REASONS):
        tell(f"  {count} x {reason}")
    if len(failed) > _MOST_REASONS:
        tell(f"  and {len(failed) - _MOST_REASONS} more reasons, in the column status")
    studied = int((rows.studied == 1.0).sum())
    if studied:
        tell(f"{studied} were studied in full, since they need more than bare ground from one grid.")
    tell(f"Written to {results}")
