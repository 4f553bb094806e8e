"""The outage of one hop at its fade margin, complete with what was used, assumed and left out; and its curve."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from profiler.availability.missing_inputs import obstruction_notes
from profiler.availability.model import OutageModel
from profiler.availability.multipath import fade_percent
from profiler.availability.notes import InputUsed, Notes
from profiler.availability.objective import LARGEST_MARGIN_DB, Limit, ObjectiveResult, judge, limit_of
from profiler.availability.outages import MECHANISMS, Mechanism, Outages, outages_at
from profiler.availability.rain_outage import PERCENT_RANGE
from profiler.checks import finite
from profiler.models import MultipathMethod, frozen_array
from profiler.remarks import Remark, db_text, outage_text, target_text
from profiler.units import MINUTES_PER_YEAR, Float

__all__ = ["Availability", "MultipathEstimate", "OutageCurve", "outage_curve", "predict"]


_WIDE_SPREAD = 3.0
"""Multipath methods that differ by more than this factor are worth a warning."""


@dataclass(frozen=True, slots=True)
class MultipathEstimate:
    """Outage by flat multipath at the hop's fade margin, without diversity, by one method.

    ``chosen`` is the method that decides; ``outside_fit`` says where it is used outside the data it was fitted to.
    """

    method: MultipathMethod
    chosen: bool
    worst_month_percent: float
    year_percent: float
    outside_fit: tuple[Remark, ...]


@dataclass(frozen=True, slots=True, eq=False)
class Availability:
    """Outage of one hop, one direction, at its fade margin.

    Attributes
    ----------
    fade_margin_db
        The margin it is for. Below 0 dB the totals are 100 and no mechanism has a share.
    method
        Multipath method by name.
    worst_month_percent, year_percent
        Outage by mechanism and together.
    missing
        Mechanisms that were not computed, as nothing was given for them; the totals do not hold them.
    low_k_blocks
        Whether diffraction at the low k of the rules takes more than the margin; None if it was not given. The time of
        it is counted only where the statistics of k reach that k.
    objective
        The targets judged, or None if none was set.
    multipath
        Flat fading by every multipath method whose numbers are known, without diversity; the chosen one, which decides,
        stands first.
    outside_fit
        Lines that say where a formula of the outage is used outside the data it was fitted to; empty where none is.
        They are among the warnings too.
    limited_by
        What limits the hop: of the objective, or without one the mechanism with the most outage in the year.
    inputs, assumptions, warnings
        Every number used with its source; what was assumed; what to beware of.
    """

    fade_margin_db: float
    method: MultipathMethod
    worst_month_percent: Outages[float]
    year_percent: Outages[float]
    missing: tuple[Mechanism, ...]
    low_k_blocks: bool | None
    objective: ObjectiveResult | None
    limited_by: Limit
    multipath: tuple[MultipathEstimate, ...]
    outside_fit: tuple[Remark, ...]
    inputs: tuple[InputUsed, ...]
    assumptions: tuple[Remark, ...]
    warnings: tuple[Remark, ...]

    @property
    def year_minutes(self) -> float:
        """Total outage in minutes of an average year of 365.25 days."""
        return self.year_percent.total * MINUTES_PER_YEAR / 100.0


@dataclass(frozen=True, slots=True, eq=False)
class OutageCurve:
    """Outage over the fade margin: arrays of the shape of ``margin_db``, by mechanism and together."""

    margin_db: Float
    worst_month_percent: Outages[Float]
    year_percent: Outages[Float]


def outage_curve(model: OutageModel, margin_db: ArrayLike) -> OutageCurve:
    """Outage at many fade margins, for a figure; the same forward model as `predict`.

    Parameters
    ----------
    model
        From `outage_model`.
    margin_db
        Fade margins, 0 dB or more, any shape.

    Returns
    -------
    OutageCurve
        Worst month and year, percent.

    Raises
    ------
    InputError
        If a margin is below 0 dB.

    Examples
    --------
    >>> from profiler.availability import PathFacts, outage_model
    >>> from profiler.models import AvailabilityChoice
    >>> choice = AvailabilityChoice("vigants-barnett", climate_factor=1.0)
    >>> model = outage_model(PathFacts(48.28e3, 6e9, 300.0, 400.0, latitude=45.0), choice)
    >>> outage_curve(model, [30.0, 40.0]).worst_month_percent.total.round(5).tolist()
    [0.04051, 0.00405]
    """
    month, year = outages_at(model, margin_db)
    return OutageCurve(frozen_array(margin_db), month, year)


def _point(outages: Outages[Float], down: bool) -> Outages[float]:
    """Outages at one margin as plain floats; with no margin at all the hop is always down, by no mechanism."""

    def number(part: Float | None) -> float | None:
        return None if part is None or down else float(part)

    return Outages(
        multipath=number(outages.multipath),
        selective=number(outages.selective),
        rain=number(outages.rain),
        obstruction=number(outages.obstruction),
        clear_air=number(outages.clear_air),
        total=100.0 if down else float(outages.total),
        obstruction_up_to=number(outages.obstruction_up_to),
        total_up_to=100.0 if down else float(outages.total_up_to),
    )


def _side_by_side(model: OutageModel, fade_margin_db: float) -> tuple[MultipathEstimate, ...]:
    """Flat multipath by every method whose numbers are known, the chosen one first."""
    rows = []
    for method, fading in model.fadings.items():
        p0 = fading.occurrence_percent
        month, year = fade_percent([p0, p0 * fading.year_share], max(fade_margin_db, 0.0)).tolist()
        chosen = method == model.choice.multipath_method
        rows.append(MultipathEstimate(method, chosen, month, year, fading.notes.outside_fit))
    return tuple(rows)


def _spread_notes(rows: tuple[MultipathEstimate, ...]) -> Notes:
    """Warn where the multipath methods differ by more than a factor of three, naming both ends."""
    least, most = (end(rows, key=lambda row: row.worst_month_percent) for end in (min, max))
    if most.worst_month_percent <= _WIDE_SPREAD * least.worst_month_percent:
        return Notes()
    factor = most.worst_month_percent / least.worst_month_percent
    ends = " to ".join(f"{outage_text(row.worst_month_percent)} ({row.method})" for row in (least, most))
    line = (
        f"multipath methods differ by a factor of {factor:.2g}, {ends} of the worst month without diversity; "
        f"{rows[0].method} is the one that was chosen, and decides"
    )
    return Notes(warnings=(line,))


def _rain_notes(year: Outages[Float]) -> Notes:
    """Whether the rain outage left the percentages that its method is published for."""
    if year.rain is None or float(year.rain) == 0.0:
        return Notes()
    rarest, most = PERCENT_RANGE
    law = "Rec. ITU-R P.530-18 §2.4.1; its curve was carried on along the tangent"
    span = f"outside the {rarest:g} to {most:g} % of {law}"
    if float(year.rain) < rarest:
        return Notes(assumptions=(f"rain outage {outage_text(float(year.rain))} of the year: {span}",))
    if float(year.rain) > most:
        return Notes(outside_fit=(f"rain outage {outage_text(float(year.rain))} of the year: {span}",))
    return Notes()


def _other_notes(fade_margin_db: float, missing: tuple[Mechanism, ...], objective: ObjectiveResult | None) -> Notes:
    """Note no margin, what is not counted, and targets that no margin meets."""
    warnings: list[Remark] = []
    if fade_margin_db < 0.0:
        warnings.append(f"fade margin {db_text(fade_margin_db)}: the hop is below its threshold without any fading")
    for target in () if objective is None else objective.targets:
        if target.required_margin_db is None:
            asked = f"objective of {target_text(target.name, target.required)}"
            warnings.append(
                f"{asked}: no fade margin up to {LARGEST_MARGIN_DB:g} dB is sure to meet it; most of what is left, or "
                f"may be, is {target.margin_set_by}"
            )
    warnings += [] if objective is None else list(objective.undecided)
    assumptions = (f"not counted, as nothing was given for it: {', '.join(missing)}",) if missing else ()
    return Notes(assumptions=assumptions, warnings=tuple(warnings))


def predict(model: OutageModel, fade_margin_db: float) -> Availability:
    """Outage of a hop in the worst month and in the year, and whether that meets its objective.

    Parameters
    ----------
    model
        From `outage_model`.
    fade_margin_db
        Flat fade margin of the direction, dB. Below 0 dB the hop is down without fading: totals are 100 %, no error.

    Returns
    -------
    Availability
        By mechanism and together, the objective judged, and every number used.

    Raises
    ------
    InputError
        If the margin is not finite.

    Examples
    --------
    >>> from profiler.availability import PathFacts, outage_model
    >>> from profiler.models import AvailabilityChoice, Objective
    >>> path = PathFacts(25e3, 18e9, 300.0, 400.0, latitude=45.0)
    >>> objective = Objective(minutes_per_year=53.0)
    >>> choice = AvailabilityChoice("p530-17-quick", objective, dn1_n_km=-300.0, rain_rate_mm_h=35.0)
    >>> hop = predict(outage_model(path, choice), 38.0)
    >>> round(hop.year_percent.rain, 4), round(hop.year_minutes, 1), hop.objective.met, hop.limited_by, hop.missing
    (0.0072, 38.5, True, 'rain', ('selective', 'obstruction'))

    Notes
    -----
    Source: Rec. ITU-R P.530-17 and -18, P.838-3, P.841-6; each number's own source is in ``inputs``.
    """
    finite("fade_margin_db", fade_margin_db, "dB")
    down = fade_margin_db < 0.0
    month, year = outages_at(model, np.maximum(fade_margin_db, 0.0))
    missing = tuple(mechanism for mechanism in MECHANISMS if year.part(mechanism) is None)
    objective = judge(model, fade_margin_db)
    limited_by: Limit = "no margin" if down else limit_of(year)
    notes = model.notes + _other_notes(fade_margin_db, missing, objective)
    multipath = _side_by_side(model, fade_margin_db)
    if not down:
        notes += _spread_notes(multipath) + _rain_notes(year) + obstruction_notes(model, fade_margin_db)
    return Availability(
        fade_margin_db=float(fade_margin_db),
        method=model.choice.multipath_method,
        worst_month_percent=_point(month, down),
        year_percent=_point(year, down),
        missing=missing,
        low_k_blocks=None if model.low_k_excess_db is None else model.low_k_excess_db > fade_margin_db,
        objective=objective,
        limited_by=limited_by if objective is None else objective.limited_by,
        multipath=multipath,
        outside_fit=notes.outside_fit,
        inputs=notes.inputs,
        assumptions=notes.assumptions,
        warnings=(*notes.outside_fit, *notes.warnings),
    )
