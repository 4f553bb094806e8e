"""A study on the terminal: the verdict first, then compact tables, then what was assumed."""

from __future__ import annotations

from typing import TYPE_CHECKING

from profiler.cli.output import console
from profiler.units import FOOT_M, STATUTE_MILE_M

if TYPE_CHECKING:
    from rich.console import Console
    from rich.table import Table

    from profiler.confidence import Confidence
    from profiler.study import Study

__all__ = ["Scale", "compact_table", "show_notes", "show_study", "show_sure_heights"]


class Scale:
    """Heights and distances as the reader wants them: metres and kilometres, or feet and miles."""

    def __init__(self, *, feet: bool) -> None:
        self.height_unit, self.distance_unit = ("ft", "mi") if feet else ("m", "km")
        self._height_m, self._distance_m = (FOOT_M, STATUTE_MILE_M) if feet else (1.0, 1000.0)

    def height(self, height_m: float, digits: int = 1) -> str:
        """Give a height without its unit."""
        return f"{height_m / self._height_m:.{digits}f}"

    def distance(self, distance_m: float, digits: int = 2) -> str:
        """Give a distance without its unit."""
        return f"{distance_m / self._distance_m:.{digits}f}"


def compact_table(*headers: str, words: tuple[str, ...] = ()) -> Table:
    """Make a table with no frame but a line under its header; columns to the right but the first and those of words."""
    from rich import box
    from rich.table import Table

    table = Table(box=box.SIMPLE_HEAD, pad_edge=False, show_edge=False)
    for number, header in enumerate(headers):
        table.add_column(header, justify="right" if number and header not in words else "left", overflow="fold")
    return table


def show_notes(screen: Console, title: str, notes: tuple[str, ...], style: str = "") -> None:
    """Print a titled list, or nothing if it is empty."""
    if notes:
        screen.print(f"\n{title}", style="bold " + style, markup=False, soft_wrap=True)
        for note in notes:
            screen.print(f"  - {note}", style=style, markup=False, soft_wrap=True)


def show_study(study: Study, *, feet: bool, quiet: bool, color: bool) -> None:
    """Print a study."""
    screen, scale = console(color=color), Scale(feet=feet)
    verdict = study.verdict
    word, style = ("PASSES", "bold green") if verdict.passes else ("DOES NOT PASS", "bold red")
    screen.print(f"{study.hop.name}: {word}", style=style, markup=False, soft_wrap=True)
    screen.print(verdict.headline_feet if feet else verdict.headline, markup=False, soft_wrap=True)
    if quiet:
        return
    screen.print(_sites(study, scale), markup=False, soft_wrap=True)
    screen.print()
    screen.print(_rules(study, scale))
    for k, result in {result.check.rule.k: result for result in study.rules}.items():
        angles = f"A {result.elevation_a_deg:+.3f}°, B {result.elevation_b_deg:+.3f}°"
        screen.print(f"Elevation at k = {k:.3f}: {angles}", markup=False, soft_wrap=True)
    _show_places(screen, study, scale)
    _show_reflections(screen, study, scale)
    if study.budget is not None:
        screen.print()
        screen.print(_budget(study))
    if study.availability is not None:
        _show_availability(screen, study)
    if study.confidence is not None:
        _show_confidence(screen, study, scale)
    show_notes(screen, "Warnings", study.warnings, "yellow")
    show_notes(screen, "Numbers used", _numbers_used(study, scale))
    doubt = () if study.confidence is None else study.confidence.method
    show_notes(screen, "Assumed", (*study.assumptions, *doubt))
    screen.print(
        "\nA screening result, not a certificate: heights, clearances and exposure are for licensed practice and local"
        " codes to confirm.",
        style="dim",
        markup=False,
        soft_wrap=True,
    )


def _numbers_used(study: Study, scale: Scale) -> tuple[str, ...]:
    """Say where the ground is from and by how much a survey differs, and every climate number with its source."""
    terrain, unit = study.terrain, scale.height_unit
    surveys = [
        f"{site.name}: surveyed ground {scale.height(site.surveyed_ground_m or 0.0, 2)} {unit},"
        f" {scale.height(difference, 2)} {unit} above that of the terrain"
        for site, difference in (
            (study.hop.site_a, terrain.surveyed_difference_a_m),
            (study.hop.site_b, terrain.surveyed_difference_b_m),
        )
        if difference is not None
    ]
    climate = () if study.availability is None else study.availability.inputs
    return (
        "ground: " + ", ".join(f"{use.info.path.name} at {use.share:.0%} of the points" for use in terrain.sources),
        *surveys,
        *(each.line for each in climate),
    )


def _sites(study: Study, scale: Scale) -> str:
    hop, line = study.hop, study.line
    lines = []
    for letter, site, centre_m, azimuth in (
        ("A", hop.site_a, study.centre_a_m, line.azimuth_a_deg),
        ("B", hop.site_b, study.centre_b_m, line.azimuth_b_deg),
    ):
        ground_m = centre_m - site.antenna_m
        lines.append(
            f"{letter}  {site.name}  {site.latitude:.6f}, {site.longitude:.6f}  ground {scale.height(ground_m)}"
            f"  antenna {scale.height(site.antenna_m)} above ground = {scale.height(centre_m)} {scale.height_unit}"
            f"  azimuth {azimuth:.2f}° true"
        )
    lines.append(
        f"{scale.distance(line.distance_m, 3)} {scale.distance_unit}, {hop.frequency_hz / 1e9:g} GHz,"
        f" {hop.polarization} polarization, {line.points} points {line.spacing_m:.1f} m apart"
    )
    return "\n".join(lines)


def _rules(study: Study, scale: Scale) -> Table:
    height = scale.height_unit
    table = compact_table(
        "rule", "k", "needs", "verdict", f"surplus {height}", f"at {scale.distance_unit}", f"F1 {height}", "clear/F1",
        "sight", "loss dB",
    )  # fmt: skip
    losses = {loss.k: loss.loss_db for loss in study.diffraction}
    for result in study.rules:
        rule, place = result.check.rule, result.critical
        table.add_row(
            rule.label or "-",
            f"{rule.k:.3f}",
            f"{rule.fresnel_fraction:g} F1" + (f" + {scale.height(rule.margin_m)} {height}" if rule.margin_m else ""),
            "pass" if result.passes else "FAIL beside" if result.check.passes else "FAIL",
            scale.height(place.surplus_m),
            scale.distance(place.distance_m),
            scale.height(place.f1_m),
            f"{place.ratio:.2f}",
            "yes" if result.check.line_of_sight else "no",
            f"{losses[rule.k]:.1f}",
            style="" if result.passes else "red",
        )
    return table


def _show_places(screen: Console, study: Study, scale: Scale) -> None:
    """Print the tight places of the governing rule, on the path or beside it, and how wide each rule was checked."""
    governing = study.governing
    table = compact_table(
        "tight place", f"at {scale.distance_unit}", "aside", "latitude, longitude", f"ground {scale.height_unit}",
        "cover", "clearance", "needs", "surplus",
    )  # fmt: skip
    for number, place in enumerate(governing.places, start=1):
        heights = (place.ground_m, place.cover_m, place.clearance_m, place.required_m, place.surplus_m)
        table.add_row(
            f"{number}",
            scale.distance(place.distance_m),
            f"{scale.height(abs(place.offset_m), 0)} {place.side}" if round(place.offset_m) else "-",
            f"{place.latitude:.5f}, {place.longitude:.5f}",
            *(scale.height(height) for height in heights),
        )
    rule = governing.check.rule
    screen.print(f"\nTight places, rule {rule.label or '-'} at k = {rule.k:.3f}", style="bold", soft_wrap=True)
    screen.print(table)
    for corridor in (result.corridor for result in study.rules):
        if corridor is not None:
            width = f"{scale.height(corridor.half_width_m)} {scale.height_unit} to each side"
            seen = corridor.need.missing_share
            unseen = f", {seen:.0%} of it without ground" if seen else ""
            screen.print(f"Checked across the path too: {width}{unseen}.", soft_wrap=True)
            break


def _show_reflections(screen: Console, study: Study, scale: Scale) -> None:
    """Print the specular points at the k of each rule, screened ones only in number."""
    lines = []
    for k, result in {result.check.rule.k: result for result in study.rules}.items():
        open_places = [place for place in result.reflections if not place.screened]
        hidden = len(result.reflections) - len(open_places)
        for place in open_places[:3]:
            kind = "rough" if place.rough else "smooth enough to mirror"
            lines.append(
                f"  k = {k:.3f}: {scale.distance(place.distance_m)} {scale.distance_unit}, grazing"
                f" {place.grazing_deg:.2f}°, {place.delay_s * 1e9:.2f} ns late, {kind}"
            )
        more = len(open_places) - 3
        lines.append(f"  k = {k:.3f}: {hidden} screened" + (f", {more} more in view" if more > 0 else ""))
    screen.print("\nReflection points", style="bold")
    screen.print("\n".join(lines), markup=False, soft_wrap=True)


def _budget(study: Study) -> Table:
    """Tabulate the budget of the first mode line by line both ways, then a row for every further mode."""
    assert study.budget is not None
    there, back = study.budget.a_to_b, study.budget.b_to_a
    title = f"budget, mode {there.modes[0].name}"
    table = compact_table(title, "A to B", "B to A", "unit", "by", words=("unit", "by"))
    ends = {" A": " at the sender", " B": " at the receiver"}
    for one, other in zip(there.modes[0].lines, back.modes[0].lines, strict=True):
        name = one.name[:-2] + ends[one.name[-2:]] if one.name[-2:] in ends else one.name
        note = one.note if one.note == other.note else f"A to B {one.note}; B to A {other.note}"
        table.add_row(name, f"{one.value:.2f}", f"{other.value:.2f}", one.unit, note)
    table.add_section()
    for name, part in (("received level", "received_dbm"), ("threshold", "threshold_dbm")):
        table.add_row(name, *(_number(getattr(way, part)) for way in (there, back)), "dBm", "")
    table.add_row("fade margin", *(_number(way.fade_margin_db) for way in (there, back)), "dB", "", style="bold")
    for one_mode, other_mode in zip(there.modes[1:], back.modes[1:], strict=True):
        margins = (_number(mode.fade_margin_db) for mode in (one_mode, other_mode))
        table.add_row(f"fade margin, {one_mode.name}", *margins, "dB", "")
    return table


def _number(value: float | None) -> str:
    return "-" if value is None else f"{value:.2f}"


def _percent(value: float | None) -> str:
    return "-" if value is None else f"{value:.3g}"


def _span(value: float | None, most: float | None) -> str:
    """Write an outage, with what it could be at most where that is more."""
    return _percent(value) if value == most else f"{_percent(value)} to {_percent(most)}"


def _show_availability(screen: Console, study: Study) -> None:
    """Print outage by mechanism, the objective, and the total of every mode."""
    found = study.availability
    assert found is not None
    table = compact_table("outage %", "multipath", "selective", "rain", "obstruction", "total")
    for period, outages in (("worst month", found.worst_month_percent), ("year", found.year_percent)):
        parts = (_percent(part) for part in (outages.multipath, outages.selective, outages.rain))
        obstruction = _span(outages.obstruction, outages.obstruction_up_to)
        table.add_row(period, *parts, obstruction, _span(outages.total, outages.total_up_to))
    screen.print(f"\nAvailability ({found.method}), fade margin {found.fade_margin_db:.1f} dB", style="bold")
    screen.print(table)
    screen.print(
        f"Out of service {found.year_minutes:.3g} minutes a year, limited by {found.limited_by}.", markup=False
    )
    for target in found.objective.targets if found.objective is not None else ():
        margin = "no" if target.required_margin_db is None else f"{target.required_margin_db:.1f} dB of"
        outcome = {True: "met", False: "MISSED", None: "undecided"}[target.met]
        unit = "" if target.unit == "ratio" else f" {target.unit}"
        screen.print(
            f"Objective {target.name} {target.required:g}{unit}: {outcome} at"
            f" {_span(target.achieved, target.achieved_up_to)}{unit}; {margin} fade margin is sure to meet it"
            f" (set by {target.margin_set_by}).",
            style={True: "", False: "red", None: "yellow"}[target.met],
            markup=False,
            soft_wrap=True,
        )
    if len(study.mode_outages) > 1:
        modes = compact_table("mode", "weaker way", "fade margin dB", "worst month %", "year %", "objective")
        for mode in study.mode_outages:
            met = "-" if mode.met is None else "met" if mode.met else "missed"
            modes.add_row(
                mode.mode,
                mode.direction,
                f"{mode.fade_margin_db:.2f}",
                _percent(mode.worst_month_percent),
                _percent(mode.year_percent),
                met,
            )
        screen.print(modes)


def _show_confidence(screen: Console, study: Study, scale: Scale) -> None:
    """Print how sure the clearance is, the sure heights and what to survey."""
    found = study.confidence
    assert found is not None
    screen.print(
        f"\nConfidence: all rules met with {found.chance.value:.1%} chance"
        f" ({found.chance.low:.1%} to {found.chance.high:.1%} by {found.draws} draws, seed {found.seed})",
        style="bold",
        markup=False,
        soft_wrap=True,
    )
    table = compact_table(
        "rule", "chance", "of time", "least surplus 5 %", "50 %", "95 %", "doubt: terrain", "cover", "k"
    )
    for doubt in found.rules:
        table.add_row(
            doubt.rule.label or f"k = {doubt.rule.k:.3f}",
            f"{doubt.chance.value:.1%}",
            "-" if doubt.chance_with_k is None else f"{doubt.chance_with_k.value:.1%}",
            *(scale.height(value) for value in (doubt.least_low_m, doubt.least_median_m, doubt.least_high_m)),
            *(f"{share:.0%}" for share in (doubt.shares.terrain, doubt.shares.cover, doubt.shares.k)),
        )
    screen.print(table)
    show_sure_heights(screen, found, scale)
    places = ", ".join(
        f"{scale.distance(point.distance_m)} {scale.distance_unit} ({point.share_of_doubt:.0%} of the doubt)"
        for point in found.survey
    )
    if places:
        screen.print(f"Survey first: {places}", markup=False, soft_wrap=True)


def show_sure_heights(screen: Console, found: Confidence, scale: Scale) -> None:
    """Print the antenna heights that are sure enough, by raising both or one."""
    for sure in found.sure:
        alone = [
            f"{end} alone {scale.height(height)}"
            for end, height in (("A", sure.a_only_m), ("B", sure.b_only_m))
            if height is not None
        ]
        change = f"{scale.height(abs(sure.raise_m))} {scale.height_unit} {'higher' if sure.raise_m > 0 else 'lower'}"
        screen.print(
            f"{sure.chance:.0%} sure: both antennas {change}"
            f" (A {scale.height(sure.equal_m[0])}, B {scale.height(sure.equal_m[1])})"
            + (f", or {', or '.join(alone)}" if alone else ""),
            markup=False,
            soft_wrap=True,
        )
